/** One round of the search, on populations whose only departure from equality is known: their moments serve as the sample. */
import { describe, expect, it } from 'vitest'
import { scoreTests } from '../estimation/score-tests.ts'
import { fitModel } from '../fit/fit.ts'
import type { Cell, GroupCells, ModelCells } from '../model/cells.ts'
import type { SampleMoments } from '../moments/sample-moments.ts'
import { anchors, groupPairs } from './anchors.ts'
import { releaseRound } from './release.ts'

interface Population {
  name: string
  loadings: number[]
  intercepts: number[]
  mean: number
  variance: number
}

const same: Population[] = ['east', 'west', 'north'].map((name, g) => ({
  name,
  loadings: [1, 0.8, 1.2, 0.9],
  intercepts: [3, 4, 2, 5],
  mean: [0, 0.4, -0.3][g]!,
  variance: [1, 1.4, 0.7][g]!
}))

/** The same with one number of one group changed. */
function changed(g: number, part: 'loadings' | 'intercepts', i: number, by: number): Population[] {
  return same.map((population, h) =>
    h === g ? { ...population, [part]: population[part].map((value, k) => (k === i ? value + by : value)) } : population
  )
}

const indicators = ['a', 'b', 'c', 'd']

/** Exact moments of the populations, with residual variances of 0.6 and 300 cases each. */
function momentsOf(populations: readonly Population[]): SampleMoments {
  return {
    indicators,
    groups: populations.map(({ name, loadings, intercepts, mean, variance }) => ({
      name,
      n: 300,
      mean: Float64Array.from(intercepts, (nu, i) => nu + loadings[i]! * mean),
      covariance: Float64Array.from(
        { length: 16 },
        (_, at) => loadings[Math.floor(at / 4)]! * loadings[at % 4]! * variance + (at % 5 === 0 ? 0.6 : 0)
      )
    }))
  }
}

type Scaling = 'reference' | 'variance'

/** One factor; loadings and intercepts equal across groups as asked. */
function oneFactor(
  groups: readonly string[],
  held: { loadings: boolean; intercepts: boolean },
  scaling: Scaling,
  reference = 0
): ModelCells {
  return {
    indicators,
    factors: ['F'],
    groups: groups.map((name, g): GroupCells => {
      const of = (part: string, i: number, equal: boolean) => `${part} ${indicators[i]}${equal ? '' : ` ${name}`}`
      const loading = (i: number): Cell => (scaling === 'reference' && i === reference ? 1 : of('loading', i, held.loadings))
      const free = held.loadings && g > 0
      return {
        name,
        loadings: indicators.map((_, i) => [loading(i)]),
        regressions: [[0]],
        factorCovariances: [[scaling === 'variance' && !free ? 1 : `variance ${name}`]],
        residualCovariances: indicators.map((_, i) => indicators.map((__, j) => (i === j ? `residual ${i} ${name}` : 0))),
        intercepts: indicators.map((_, i) => of('intercept', i, held.intercepts)),
        factorMeans: [held.intercepts && g > 0 ? `mean ${name}` : 0]
      }
    }),
    constraints: []
  }
}

const names = (populations: readonly Population[]) => populations.map(({ name }) => name)
const bonferroni = (p: readonly number[]) => p.map((value) => Math.min(1, value * p.length))

function round(populations: readonly Population[], step: 'metric' | 'scalar', scaling: Scaling = 'reference', reference = 0) {
  const moments = momentsOf(populations)
  const held = { loadings: true, intercepts: step === 'scalar' }
  const lower = oneFactor(names(populations), { loadings: step === 'scalar', intercepts: false }, scaling, reference)
  const upper = oneFactor(names(populations), held, scaling, reference)
  const { gamma } = fitModel(upper, moments, { convention: 'normal' })
  const { tests } = scoreTests(upper, moments, 'normal', gamma!)
  return releaseRound(lower, upper, tests, { alpha: 0.05, adjust: bonferroni })
}

describe('a round of the search', () => {
  it('chooses the one intercept that differs, in its group, among those the step added', () => {
    const { candidates, chosen } = round(changed(2, 'intercepts', 1, 0.5), 'scalar')
    expect(candidates).toHaveLength(12)
    expect(candidates.every(({ part }) => part === 'intercept')).toBe(true)
    expect(chosen).toMatchObject({ part: 'intercept', of: ['b'], group: 'north', kept: null, words: 'the intercept of b in north' })
    expect(chosen!.change).toBeGreaterThan(0.3)
    expect(candidates.map(({ statistic }) => statistic)).toEqual(candidates.map(({ statistic }) => statistic).sort((x, y) => y - x))
  })

  it('chooses nothing where everything is equal', () => {
    const { candidates, chosen } = round(same, 'scalar')
    expect(candidates).toHaveLength(12)
    expect(chosen).toBeNull()
  })

  it.each(['a', 'b'])('finds the loading of %s that differs, whichever loading or variance sets the scale', (name) => {
    const populations = changed(1, 'loadings', indicators.indexOf(name), 0.5)
    const rounds = [
      round(populations, 'metric', 'reference', 0),
      round(populations, 'metric', 'reference', 1),
      round(populations, 'metric', 'reference', 3),
      round(populations, 'metric', 'variance')
    ]
    for (const { chosen, candidates } of rounds) {
      expect(chosen).toMatchObject({ part: 'loading', of: [name, 'F'], group: 'west' })
      expect(candidates).toHaveLength(12)
      for (const one of candidates) {
        const twin = rounds[0]!.candidates.find(({ of, group }) => of[0] === one.of[0] && group === one.group)!
        expect(Math.abs(one.statistic - twin.statistic)).toBeLessThan(1e-5 * (1 + twin.statistic))
      }
    }
  })

  it('tests each equality once where there are two groups, the reference loading among them', () => {
    const { candidates, chosen } = round(changed(1, 'loadings', 0, 0.5).slice(0, 2), 'metric')
    expect(candidates.map(({ of, group }) => `${of[0]} ${group}`).sort()).toEqual(['a west', 'b west', 'c west', 'd west'])
    expect(chosen).toMatchObject({ of: ['a', 'F'], group: 'west' })
  })

  it('keeps what would leave two groups fewer than two indicators in common, and adjusts over the rest', () => {
    const populations = changed(2, 'intercepts', 1, 0.5)
    const moments = momentsOf(populations)
    const lower = oneFactor(names(populations), { loadings: true, intercepts: false }, 'reference')
    const upper = oneFactor(names(populations), { loadings: true, intercepts: true }, 'reference')
    // a and d are let go in the north already: b and c are all that it has in common with the others.
    upper.groups[2]!.intercepts![0] = 'intercept a north'
    upper.groups[2]!.intercepts![3] = 'intercept d north'
    const { gamma } = fitModel(upper, moments, { convention: 'normal' })
    const { tests } = scoreTests(upper, moments, 'normal', gamma!)
    const { candidates, chosen } = releaseRound(lower, upper, tests, { alpha: 0.05, adjust: bonferroni })
    const reasons = candidates.filter(({ kept }) => kept !== null)
    expect(reasons.map(({ of, group }) => `${of[0]} ${group}`).sort()).toEqual(
      ['b east', 'b north', 'b west', 'c east', 'c north', 'c west'].sort()
    )
    expect(reasons.find(({ of, group }) => of[0] === 'b' && group === 'north')).toMatchObject({
      adjustedP: null,
      kept: 'it would leave F one indicator only that north and east have in common'
    })
    // Of a and d, still equal in east and west, one test each: neither differs.
    expect(
      candidates.filter(({ kept }) => kept === null).map(({ of, adjustedP, p }) => [of[0], adjustedP === Math.min(1, 2 * p)])
    ).toEqual([
      ['a', true],
      ['d', true]
    ])
    expect(chosen).toBeNull()
  })
})

describe('anchors', () => {
  it('are the indicators whose cells are the same in both groups, as far up as is asked', () => {
    const cells = oneFactor(['one', 'two'], { loadings: true, intercepts: true }, 'reference')
    cells.groups[1]!.intercepts![2] = 'its own'
    cells.groups[1]!.loadings[3]![0] = 'its own too'
    expect(anchors(cells, 0, [0, 1], 'loadings')).toEqual(['a', 'b', 'c'])
    expect(anchors(cells, 0, [0, 1], 'intercepts')).toEqual(['a', 'b'])
    expect(anchors(cells, 0, [0, 1], 'residual variances')).toEqual([])
  })

  it('do not follow from loadings fixed for the scale alone where intercepts are free', () => {
    const cells = oneFactor(['one', 'two'], { loadings: false, intercepts: false }, 'reference')
    expect(anchors(cells, 0, [0, 1], 'intercepts')).toEqual([])
  })

  it('of a second-order factor are the factors whose regressions and means are the same', () => {
    const cells = oneFactor(['one', 'two'], { loadings: true, intercepts: true }, 'reference')
    cells.factors = ['F', 'G']
    for (const group of cells.groups) {
      group.loadings = group.loadings.map(([cell]) => [cell!, 0])
      group.regressions = [
        [0, 1],
        [0, 0]
      ]
      group.factorCovariances = [
        [`f ${group.name}`, 0],
        [0, `g ${group.name}`]
      ]
      group.factorMeans = [0, `mean ${group.name}`]
    }
    expect(anchors(cells, 1, [0, 1], 'intercepts')).toEqual(['F'])
    cells.groups[1]!.factorMeans = ['mean of F', 0]
    expect(anchors(cells, 1, [0, 1], 'intercepts')).toEqual([])
    expect(anchors(cells, 1, [0, 1], 'loadings')).toEqual(['F'])
  })

  it('are looked for in every pair of groups', () => {
    expect(groupPairs(3)).toEqual([
      [0, 1],
      [0, 2],
      [1, 2]
    ])
  })
})
