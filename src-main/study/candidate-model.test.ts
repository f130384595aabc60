import { describe, expect, it } from 'vitest'
import { compileModel } from '../statistics/model/compile.ts'
import { candidateCells, type ModelFrame, resolveCandidate } from './candidate-model.ts'
import { type Candidate, candidateSchema } from './study.ts'

const onePlace: ModelFrame = { indicators: ['a', 'b', 'c', 'd', 'e', 'f'], grouping: null, groups: [null], means: true }
const twoPlaces: ModelFrame = { ...onePlace, grouping: 'site', groups: ['north', 'south'] }
const factors = [
  { name: 'F', measures: ['a', 'b', 'c'] },
  { name: 'G', measures: ['d', 'e', 'f'] }
]
const base = candidateSchema.parse({ name: 'base', factors })

function derived(rest: object): Candidate {
  return candidateSchema.parse({ name: 'own', from: 'base', ...rest })
}

function cells(candidate: object, frame = onePlace, root = base) {
  const family = [root, derived(candidate)]
  return candidateCells(resolveCandidate('own', family), frame)
}

function df(candidate: object, frame = onePlace, root = base): number {
  return compileModel(cells(candidate, frame, root)).df
}

describe('degrees of freedom, common practice, no source', () => {
  it('of two factors with three indicators each are 8, whatever the scaling', () => {
    for (const scaling of ['first loading', 'factor variance', 'effects coding']) expect(df({ scaling })).toBe(8)
  })

  it('grow by one with a factor covariance fixed and shrink by one with a residual covariance freed', () => {
    expect(df({ change: [{ do: 'fix', cell: { part: 'factor covariance', of: ['F', 'G'] }, at: 0 }] })).toBe(9)
    expect(df({ factorCovariances: 'zero' })).toBe(9)
    expect(df({ change: [{ do: 'free', cell: { part: 'residual covariance', of: ['a', 'd'] } }] })).toBe(7)
  })

  it('of the invariance steps in two groups grow by loadings less markers, intercepts less factor means, residual variances', () => {
    for (const scaling of ['first loading', 'factor variance', 'effects coding']) {
      const across = { scaling, across: 'site' }
      expect(df({ ...across, equalAcrossGroups: [] }, twoPlaces)).toBe(16)
      expect(df({ ...across, equalAcrossGroups: ['loadings'] }, twoPlaces)).toBe(20)
      expect(df({ ...across, equalAcrossGroups: ['loadings', 'intercepts'] }, twoPlaces)).toBe(24)
      expect(df({ ...across, equalAcrossGroups: ['loadings', 'intercepts', 'residual variances'] }, twoPlaces)).toBe(30)
      expect(df({ ...across, equalAcrossGroups: ['loadings', 'intercepts', 'factor means'] }, twoPlaces)).toBe(26)
      expect(df({ ...across, equalAcrossGroups: ['loadings', 'factor variances', 'factor covariances'] }, twoPlaces)).toBe(23)
    }
  })
})

describe('identification shifts across groups', () => {
  it('frees factor variances in the other groups once loadings are equal', () => {
    const model = cells({ scaling: 'factor variance', across: 'site', equalAcrossGroups: ['loadings'] }, twoPlaces)
    expect(model.groups[0]!.factorCovariances[0]![0]).toBe(1)
    expect(model.groups[1]!.factorCovariances[0]![0]).toBeTypeOf('string')
  })

  it('frees factor means in the other groups once intercepts are equal', () => {
    const model = cells({ across: 'site', equalAcrossGroups: ['loadings', 'intercepts'] }, twoPlaces)
    expect(model.groups.map((g) => g.factorMeans!.map((c) => typeof c))).toEqual([
      ['number', 'number'],
      ['string', 'string']
    ])
  })

  it('keeps a factor mean at zero where every intercept of its factor is released', () => {
    const except = ['a', 'b', 'c'].map((i) => ({ cell: { part: 'intercept', of: [i] } }))
    const model = cells({ across: 'site', equalAcrossGroups: ['loadings', 'intercepts'], except }, twoPlaces)
    expect(model.groups[1]!.factorMeans![0]).toBe(0)
    expect(model.groups[1]!.factorMeans![1]).toBeTypeOf('string')
  })

  it('moves the reference indicator off a released loading, so that the release frees something', () => {
    const except = [{ cell: { part: 'loading', of: ['a', 'F'] } }]
    const model = cells({ across: 'site', equalAcrossGroups: ['loadings'], except }, twoPlaces)
    const column = model.groups.map((g) => g.loadings.slice(0, 3).map((row) => row[0]))
    expect(column.map((c) => c[1])).toEqual([1, 1])
    expect(column[0]![0]).toBeTypeOf('string')
    expect(column[0]![0]).not.toBe(column[1]![0])
    expect(compileModel(model).df).toBe(19)
  })

  it('releases a cell in one group only where the group is named', () => {
    const frame = { ...twoPlaces, groups: ['north', 'south', 'west'] }
    const except = [{ cell: { part: 'intercept', of: ['b'] }, group: 'west' }]
    const model = cells({ across: 'site', equalAcrossGroups: ['loadings', 'intercepts'], except }, frame)
    const [north, south, west] = model.groups.map((g) => g.intercepts![1])
    expect(north).toBe(south)
    expect(west).not.toBe(north)
  })
})

describe('changes', () => {
  it('act in order: a cell freed after an equality is a parameter of its own', () => {
    const equal = {
      do: 'equal',
      cells: [
        { part: 'loading', of: ['b', 'F'] },
        { part: 'loading', of: ['c', 'F'] }
      ]
    }
    const tied = cells({ change: [equal] })
    expect(tied.groups[0]!.loadings[1]![0]).toBe(tied.groups[0]!.loadings[2]![0])
    const freed = cells({ change: [equal, { do: 'free', cell: { part: 'loading', of: ['b', 'F'] } }] })
    expect(freed.groups[0]!.loadings[1]![0]).not.toBe(freed.groups[0]!.loadings[2]![0])
  })

  it('make a cell equal to a fixed one by fixing it', () => {
    const change = [
      {
        do: 'equal',
        cells: [
          { part: 'loading', of: ['a', 'F'] },
          { part: 'loading', of: ['b', 'F'] }
        ]
      }
    ]
    expect(cells({ change }).groups[0]!.loadings[1]![0]).toBe(1)
  })

  it('hold a newly freed cross-loading equal across groups where loadings are', () => {
    const change = [{ do: 'free', cell: { part: 'loading', of: ['a', 'G'] } }]
    const model = cells({ across: 'site', equalAcrossGroups: ['loadings'], change }, twoPlaces)
    expect(model.groups[0]!.loadings[0]![1]).toBe(model.groups[1]!.loadings[0]![1])
  })

  it('put a factor regression in the place of the covariance of its two factors', () => {
    const change = [{ do: 'free', cell: { part: 'factor regression', of: ['G', 'F'] } }]
    const model = cells({ change })
    expect(model.groups[0]!.regressions[1]![0]).toBeTypeOf('string')
    expect(model.groups[0]!.factorCovariances[1]![0]).toBe(0)
    expect(compileModel(model).df).toBe(8)
  })

  it('leave the factors measured by another factor without covariances of their own', () => {
    const second = candidateSchema.parse({ name: 'base', factors: [...factors, { name: 'H', measures: ['F', 'G'] }] })
    const model = cells({}, onePlace, second)
    expect(model.groups[0]!.factorCovariances[1]![0]).toBe(0)
    expect(model.groups[0]!.regressions[0]![2]).toBe(1)
  })
})

describe('a candidate that makes no model is refused, naming it and the cell', () => {
  const refusals: [string, object, ModelFrame, RegExp][] = [
    [
      'an unknown indicator',
      { factors: [{ name: 'F', measures: ['a', 'q'] }], from: null },
      onePlace,
      /"q".*neither an indicator nor a factor/
    ],
    ['an unknown group column', { across: 'clinic' }, twoPlaces, /grouped by "site"/],
    ['groups where there are none', { across: 'site' }, onePlace, /have no groups/],
    ['equal parts without groups', { equalAcrossGroups: ['loadings'] }, onePlace, /not modelled across any/],
    [
      'an equality of two fixed numbers',
      {
        scaling: 'factor variance',
        change: [
          { do: 'fix', cell: { part: 'loading', of: ['a', 'F'] }, at: 0.5 },
          {
            do: 'equal',
            cells: [
              { part: 'loading', of: ['a', 'F'] },
              { part: 'factor variance', of: ['F'] }
            ]
          }
        ]
      },
      onePlace,
      /cannot be equal/
    ],
    [
      'an equality with an empty cell',
      {
        change: [
          {
            do: 'equal',
            cells: [
              { part: 'loading', of: ['a', 'F'] },
              { part: 'loading', of: ['a', 'G'] }
            ]
          }
        ]
      },
      onePlace,
      /not in the model/
    ],
    [
      'a release of what is not held',
      { across: 'site', equalAcrossGroups: ['loadings'], except: [{ cell: { part: 'intercept', of: ['a'] } }] },
      twoPlaces,
      /intercepts are not held equal/
    ],
    [
      'a residual covariance of an indicator with itself',
      { change: [{ do: 'free', cell: { part: 'residual covariance', of: ['a', 'a'] } }] },
      onePlace,
      /twice/
    ],
    [
      'an intercept where no means are known',
      { change: [{ do: 'fix', cell: { part: 'intercept', of: ['a'] }, at: 0 }] },
      { ...onePlace, means: false },
      /no means/
    ],
    [
      'an unknown group of a change',
      { across: 'site', change: [{ do: 'free', cell: { part: 'loading', of: ['a', 'G'] }, group: 'west' }] },
      twoPlaces,
      /no group "west"/
    ]
  ]
  for (const [what, candidate, frame, message] of refusals) {
    it(what, () => {
      expect(() => cells(candidate, frame)).toThrow(message)
      expect(() => cells(candidate, frame)).toThrow(/candidate "own"/)
    })
  }

  it('a derivation in a circle, and an unknown parent', () => {
    const one = candidateSchema.parse({ name: 'one', from: 'two' })
    const two = candidateSchema.parse({ name: 'two', from: 'one' })
    expect(() => resolveCandidate('one', [one, two])).toThrow(/derived from itself/)
    expect(() => resolveCandidate('own', [derived({ from: 'bose' }), base])).toThrow(/no candidate "bose".*Did you mean "base"/)
  })
})
