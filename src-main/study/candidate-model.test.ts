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

const loading = (indicator: string, factor = 'F') => ({ part: 'loading', of: [indicator, factor] })
const residual = (indicator: string) => ({ part: 'residual variance', of: [indicator] })
const twice = { do: 'constrain', terms: [{ cell: loading('b') }, { cell: loading('c'), times: -2 }], to: 0 }

describe('linear constraints', () => {
  it('are equations among the labels, each worth a degree of freedom', () => {
    const model = cells({ change: [twice] })
    const [b, c] = [1, 2].map((i) => model.groups[0]!.loadings[i]![0] as string)
    expect(model.constraints).toEqual([
      {
        terms: [
          { label: b, weight: 1 },
          { label: c, weight: -2 }
        ],
        equals: 0
      }
    ])
    expect(compileModel(model).df).toBe(9)
  })

  it('move fixed cells to the other side, and fix what is left no choice', () => {
    const sum = { do: 'constrain', terms: ['a', 'b', 'c'].map((i) => ({ cell: loading(i) })), to: 3 }
    const model = cells({ change: [sum] })
    expect(model.constraints[0]!.terms.map((term) => term.weight)).toEqual([1, 1])
    expect(model.constraints[0]!.equals).toBe(2)
    const settled = cells({ change: [sum, twice] })
    expect(settled.constraints).toEqual([])
    expect(settled.groups[0]!.loadings.slice(0, 3).map((row) => (row[0] as number).toFixed(9))).toEqual([
      '1.000000000',
      '1.333333333',
      '0.666666667'
    ])
  })

  it('say the same in any scaling: the sum of the loadings under effects coding is already 3', () => {
    const sum = { do: 'constrain', terms: ['a', 'b', 'c'].map((i) => ({ cell: loading(i) })), to: 3 }
    expect(df({ scaling: 'effects coding', change: [sum] })).toBe(8)
  })

  it('hold for cells that are equal to others', () => {
    const equal = { do: 'equal', cells: [residual('a'), residual('b')] }
    const weighted = { do: 'constrain', terms: [{ cell: residual('b') }, { cell: residual('d'), times: -3 }], to: 0 }
    const model = cells({ change: [equal, weighted] })
    expect(model.constraints[0]!.terms[0]!.label).toBe(model.groups[0]!.residualCovariances[0]![0])
    expect(compileModel(model).df).toBe(10)
  })

  it('stand within each group, in one group, or across groups', () => {
    const across = { across: 'site', equalAcrossGroups: [] }
    expect(df({ ...across, change: [twice] }, twoPlaces)).toBe(18)
    expect(df({ ...across, change: [{ ...twice, group: 'south' }] }, twoPlaces)).toBe(17)
    const terms = [
      { cell: loading('b'), group: 'north' },
      { cell: loading('b'), times: -2, group: 'south' }
    ]
    const model = cells({ ...across, change: [{ do: 'constrain', terms, to: 0 }] }, twoPlaces)
    expect(model.constraints[0]!.terms.map((term) => term.label)).toEqual(model.groups.map((g) => g.loadings[1]![0]))
    expect(compileModel(model).df).toBe(17)
  })

  it('that groups held equal imply of each other count once', () => {
    const model = cells({ across: 'site', equalAcrossGroups: ['loadings'], change: [twice] }, twoPlaces)
    expect(model.constraints.length).toBe(1)
    expect(compileModel(model).df).toBe(21)
  })

  it('go when a later change frees one of their cells', () => {
    const model = cells({ change: [twice, { do: 'free', cell: loading('c') }] })
    expect(model.constraints).toEqual([])
    expect(compileModel(model).df).toBe(8)
  })
})

describe('bounds', () => {
  const above = { do: 'bound', cell: residual('a'), atLeast: 0 }

  it('are limits of labels, and leave the degrees of freedom as they are', () => {
    const model = cells({ change: [above] })
    expect(model.bounds).toEqual([{ label: model.groups[0]!.residualCovariances[0]![0], least: 0, most: null }])
    expect(compileModel(model)).toMatchObject({ df: 8, parameters: 19 })
    expect(cells({}).bounds).toBeUndefined()
  })

  it('of cells made equal hold all together', () => {
    const change = [
      above,
      { do: 'bound', cell: residual('b'), atLeast: -1, atMost: 2 },
      { do: 'equal', cells: [residual('a'), residual('b')] }
    ]
    expect(cells({ change }).bounds).toMatchObject([{ least: 0, most: 2 }])
  })

  it('stand in every group where the cell is free, once where groups are equal', () => {
    const change = [{ do: 'bound', cell: { part: 'factor variance', of: ['F'] }, atLeast: 0.1 }]
    const some = cells({ scaling: 'factor variance', across: 'site', equalAcrossGroups: ['loadings'], change }, twoPlaces)
    expect(some.bounds!.map((bound) => bound.label)).toEqual([some.groups[1]!.factorCovariances[0]![0]])
    const equal = { across: 'site', equalAcrossGroups: ['residual variances'], change: [above] }
    expect(cells(equal, twoPlaces).bounds!.length).toBe(1)
  })

  it('go when a later change frees or fixes the cell', () => {
    expect(cells({ change: [above, { do: 'free', cell: residual('a') }] }).bounds).toBeUndefined()
    expect(cells({ change: [above, { do: 'fix', cell: residual('a'), at: 0.5 }] }).bounds).toBeUndefined()
  })

  it('stay with their parameter where a constraint could give it away', () => {
    const weighted = { do: 'constrain', terms: [{ cell: residual('a'), times: 5 }, { cell: residual('b') }], to: 1 }
    const model = cells({ change: [above, weighted] })
    const compiled = compileModel(model)
    expect(compiled.gammaLabels).toContain(model.bounds![0]!.label)
    expect(compiled.bounds!.least[compiled.gammaLabels.indexOf(model.bounds![0]!.label)]).toBe(0)
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
      'a constraint on a cell that is not in the model',
      { change: [{ ...twice, terms: [{ cell: loading('b') }, { cell: loading('a', 'G') }] }] },
      onePlace,
      /loading of a on G is not in the model, so it cannot be constrained/
    ],
    [
      'a constraint on fixed cells only',
      { change: [{ ...twice, terms: [{ cell: loading('a') }, { cell: loading('d', 'G'), times: -1 }] }] },
      onePlace,
      /the loading of a on F equals the loading of d on G: every cell of this constraint is fixed/
    ],
    [
      'constraints that contradict each other',
      { change: [twice, { ...twice, to: 1 }] },
      onePlace,
      /the loading of b on F minus twice the loading of c on F is 1 contradicts/
    ],
    [
      'a constraint that a cell fixed later breaks',
      {
        change: [twice, { do: 'fix', cell: loading('b'), at: 1 }, { do: 'fix', cell: loading('c'), at: 1 }]
      },
      onePlace,
      /that the loading of b on F equals twice the loading of c on F contradicts/
    ],
    [
      'constraints that leave a negative variance',
      {
        change: [
          { do: 'constrain', terms: [{ cell: residual('a') }, { cell: residual('b') }], to: 1 },
          { do: 'fix', cell: residual('b'), at: 2 }
        ]
      },
      onePlace,
      /put the residual variance of a at -1/
    ],
    [
      'a constraint against the scaling',
      {
        scaling: 'effects coding',
        change: [{ do: 'constrain', terms: ['a', 'b', 'c'].map((i) => ({ cell: loading(i) })), to: 4 }]
      },
      onePlace,
      /plus the loading of c on F is 4 contradicts/
    ],
    [
      'a bound of a fixed cell',
      { change: [{ do: 'bound', cell: loading('a'), atLeast: 0 }] },
      onePlace,
      /is fixed at 1, so it cannot/
    ],
    ['a bound of an empty cell', { change: [{ do: 'bound', cell: loading('a', 'G'), atLeast: 0 }] }, onePlace, /cannot be bounded/],
    [
      'bounds that leave nothing in between',
      {
        change: [
          { do: 'bound', cell: residual('a'), atLeast: 2 },
          { do: 'bound', cell: residual('b'), atMost: 1 },
          { do: 'equal', cells: [residual('a'), residual('b')] }
        ]
      },
      onePlace,
      /nothing lies between the bounds.*at least 2 and at most 1/
    ],
    [
      'a bound beyond which an equality holds the cell',
      {
        change: [
          { do: 'bound', cell: loading('b'), atMost: 0.5 },
          { do: 'equal', cells: [loading('a'), loading('b')] }
        ]
      },
      onePlace,
      /loading of b on F is held at 1, which is beyond its bound/
    ],
    [
      'a constraint on bounded cells only',
      {
        change: [
          { do: 'bound', cell: residual('a'), atLeast: 0 },
          { do: 'bound', cell: residual('b'), atLeast: 0 },
          { do: 'constrain', terms: [{ cell: residual('a') }, { cell: residual('b') }], to: 1 }
        ]
      },
      onePlace,
      /binds bounded cells only/
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
