/** What must hold of score tests whatever the data: they foretell refits, and do not depend on how factors are scaled. */
import { describe, expect, it } from 'vitest'
import { simulate } from '../../../tests/bench/simulate.ts'
import { wholeMatrix } from '../../../tests/reference/examples.ts'
import { seededGenerator } from '../distributions/generator.ts'
import { fitModel } from '../fit/fit.ts'
import type { Cell, GroupCells, ModelCells } from '../model/cells.ts'
import { compileModel } from '../model/compile.ts'
import { splitByPattern } from '../moments/missing-patterns.ts'
import type { SampleMoments } from '../moments/sample-moments.ts'
import { saturatedMoments } from '../moments/saturated-em.ts'
import { normalObjective } from './normal-likelihood.ts'
import { type ScoreTest, type ScoreTests, scoreTests } from './score-tests.ts'
import { releaseScores } from './score-tests-information.ts'
import { possibleReleases } from './score-tests-releases.ts'

type Scaling = 'first loading' | 'factor variance' | 'effects coding'

interface Wish {
  scaling?: Scaling
  /** Equal across groups. */
  loadings?: boolean
  intercepts?: boolean
  means?: boolean
}

/** p indicators on m factors, p/m to each in order, scaled and held equal as wished. */
function simpleStructure(moments: SampleMoments, m: number, wish: Wish = {}): ModelCells {
  const { scaling = 'first loading', loadings = false, intercepts = false, means = true } = wish
  const p = moments.indicators.length
  const per = p / m
  const range = (n: number) => Array.from({ length: n }, (_, i) => i)
  const group = (name: string | null, g: number): GroupCells => ({
    name,
    loadings: range(p).map((i) =>
      range(m).map((k): Cell => {
        if (Math.floor(i / per) !== k) return 0
        return scaling === 'first loading' && i % per === 0 ? 1 : `l${i}${loadings ? '' : `_${g}`}`
      })
    ),
    regressions: range(m).map(() => range(m).map(() => 0)),
    factorCovariances: range(m).map((k) =>
      range(m).map((l): Cell => {
        if (k === l && scaling === 'factor variance' && !(loadings && g > 0)) return 1
        return `f${Math.max(k, l)}_${Math.min(k, l)}_${g}`
      })
    ),
    residualCovariances: range(p).map((i) => range(p).map((j): Cell => (i === j ? `e${i}_${g}` : 0))),
    intercepts: means ? range(p).map((i) => `n${i}${intercepts ? '' : `_${g}`}`) : null,
    factorMeans: means ? range(m).map((k): Cell => (intercepts && g > 0 ? `k${k}_${g}` : 0)) : null
  })
  const groups = moments.groups.map((sample, g) => group(sample.name, g))
  const effects = loadings ? [groups[0]!] : groups
  return {
    indicators: moments.indicators,
    factors: range(m).map((k) => `F${k + 1}`),
    groups,
    constraints:
      scaling !== 'effects coding'
        ? []
        : effects.flatMap((of) =>
            range(m).map((k) => ({
              terms: range(per).map((i) => ({ label: of.loadings[k * per + i]![k] as string, weight: 1 })),
              equals: per
            }))
          )
  }
}

function fitted(cells: ModelCells, moments: SampleMoments): { T: number; gamma: number[] } {
  const { fit, gamma } = fitModel(cells, moments, { convention: 'normal' })
  expect(fit.state, fit.reason ?? '').toBe('fitted')
  return { T: fit.T!, gamma: gamma! }
}

function tested(cells: ModelCells, moments: SampleMoments): ScoreTests {
  return scoreTests(cells, moments, 'normal', fitted(cells, moments).gamma)
}

/** The model with the test's cell free on its own. */
function released(cells: ModelCells, test: ScoreTest): ModelCells {
  const copy = structuredClone(cells)
  const group = copy.groups.find((g) => g.name === test.group)!
  const at = (names: string[], i: number) => names.indexOf(test.of[i]!)
  const { indicators, factors } = copy
  const pair = (sheet: Cell[][], names: string[]) => {
    const [a, b] = [at(names, 0), at(names, test.of.length - 1)]
    sheet[a]![b] = 'own'
    sheet[b]![a] = 'own'
  }
  if (test.part === 'loading') group.loadings[at(indicators, 0)]![at(factors, 1)] = 'own'
  else if (test.part === 'factor regression') group.regressions[at(factors, 0)]![at(factors, 1)] = 'own'
  else if (test.part.startsWith('residual')) pair(group.residualCovariances, indicators)
  else if (test.part === 'intercept') group.intercepts![at(indicators, 0)] = 'own'
  else if (test.part === 'factor mean') group.factorMeans![at(factors, 0)] = 'own'
  else pair(group.factorCovariances, factors)
  return copy
}

/** Refits with the cell free: the drop in T, and the estimate. */
function refit(cells: ModelCells, moments: SampleMoments, test: ScoreTest, T: number): { drop: number; estimate: number } {
  const free = released(cells, test)
  const after = fitted(free, moments)
  return { drop: T - after.T, estimate: after.gamma[compileModel(free).gammaLabels.indexOf('own')]! }
}

/** Every `step`-th test against its refit, where the misfit is small. */
function compareWithRefits(cells: ModelCells, moments: SampleMoments, step: number, tests?: ScoreTest[]): void {
  const { T, gamma } = fitted(cells, moments)
  const all = tests ?? scoreTests(cells, moments, 'normal', gamma).tests
  const chosen = all.filter((_, i) => i % step === 0)
  expect(chosen.length).toBeGreaterThan(5)
  for (const test of chosen) {
    const { drop, estimate } = refit(cells, moments, test, T)
    const name = `${test.kind} ${test.part} ${test.of.join(' ')} ${test.group}`
    expect(Math.abs(test.statistic - drop), name).toBeLessThan(0.02 + 0.1 * drop)
    const error = Math.abs(test.change) / Math.sqrt(test.statistic)
    expect(Math.abs(test.expectedValue! - estimate), name).toBeLessThan(0.15 * error + 0.1 * Math.abs(test.change))
  }
}

describe('score tests and refits', () => {
  it('agree for cross-loadings and residual covariances', () => {
    for (const seed of [1, 2, 3]) {
      const moments = simulate(9, 3, [1500], seededGenerator(seed))
      compareWithRefits(simpleStructure(moments, 3), moments, 6)
    }
  })

  it('agree for equal loadings and intercepts across three groups, and for the fixed cells that carry the scale there', () => {
    const moments = simulate(8, 2, [900, 700, 800], seededGenerator(4))
    const cells = simpleStructure(moments, 2, { loadings: true, intercepts: true })
    const { tests } = tested(cells, moments)
    compareWithRefits(
      cells,
      moments,
      4,
      tests.filter((t) => t.plausibility === 'stated')
    )
  })

  it('agree for covariances fixed at zero and for cells fixed at another number', () => {
    const moments = simulate(6, 2, [1200], seededGenerator(6))
    const cells = simpleStructure(moments, 2)
    cells.groups[0]!.loadings[1]![0] = 1.05
    cells.groups[0]!.residualCovariances[4]![4] = 0.45
    const { T, gamma } = fitted(cells, moments)
    const { tests } = scoreTests(cells, moments, 'normal', gamma)
    for (const [part, of, tolerance] of [
      ['loading', 'y2 F1', 0.1],
      ['residual variance', 'y5', 0.1]
    ] as const) {
      const test = tests.find((t) => t.part === part && t.of.join(' ') === of)!
      const { drop, estimate } = refit(cells, moments, test, T)
      expect(test.plausibility).toBe('stated')
      expect(Math.abs(test.statistic - drop), of).toBeLessThan(0.02 + tolerance * drop)
      expect(Math.abs(test.expectedValue! - estimate), of).toBeLessThan(0.02)
    }
  })

  it('agree with missing answers, by pattern', () => {
    const moments = withMissing(6, 1400, 7)
    const cells = simpleStructure(moments, 2)
    compareWithRefits(cells, moments, 3)
  })

  it('agree for a linear equation between loadings', () => {
    const moments = simulate(6, 2, [1000, 1000], seededGenerator(8))
    const cells = simpleStructure(moments, 2)
    const terms = [
      { label: 'l1_0', weight: 1 },
      { label: 'l1_1', weight: 2 },
      { label: 'l2_0', weight: -1 }
    ]
    const bound = { ...cells, constraints: [{ terms, equals: 2.1 }] }
    const { tests } = tested(bound, moments)
    const test = tests.find((t) => t.kind === 'constraint')!
    expect(test.label).toBe('l1_0 + 2 l1_1 - l2_0 = 2.1')
    const free = fitted(cells, moments)
    const drop = fitted(bound, moments).T - free.T
    expect(Math.abs(test.statistic - drop)).toBeLessThan(0.02 + 0.1 * drop)
    const labels = compileModel(cells).gammaLabels
    const side = terms.reduce((sum, { label, weight }) => sum + weight * free.gamma[labels.indexOf(label)]!, 0)
    expect(Math.abs(2.1 + test.change - side)).toBeLessThan(0.15 * Math.abs(test.change) + 0.01)
    expect(test.expectedValue).toBeNull()
  })
})

/** A tenth of the answers taken away at random. */
function withMissing(p: number, n: number, seed: number): SampleMoments {
  const generator = seededGenerator(seed)
  const values = new Float64Array(n * p)
  for (let row = 0; row < n; row++) {
    const common = generator.normal()
    const eta = [0, 1].map(() => 0.6 * common + 0.8 * generator.normal())
    for (let i = 0; i < p; i++) {
      const value = 0.75 * eta[Math.floor((2 * i) / p)]! + 0.65 * generator.normal()
      values[row * p + i] = Math.abs(generator.normal()) < 0.126 ? Number.NaN : value
    }
  }
  const { patterns, n: cases } = splitByPattern(values, p)
  expect(patterns.length).toBeGreaterThan(10)
  const { mean, covariance } = saturatedMoments(patterns, p)
  return {
    indicators: Array.from({ length: p }, (_, i) => `y${i + 1}`),
    groups: [{ name: null, n: cases, mean, covariance, patterns }]
  }
}

describe('score tests', () => {
  const moments = simulate(9, 3, [300, 260], seededGenerator(11))
  const wish = { loadings: true, intercepts: true }

  it('do not depend on how the factors are scaled', () => {
    const scalings: Scaling[] = ['first loading', 'factor variance', 'effects coding']
    const statistics = scalings.map((scaling) => {
      const { tests } = tested(simpleStructure(moments, 3, { ...wish, scaling }), moments)
      return new Map(tests.map((t) => [`${t.part} ${t.of.join(' ')} ${t.group}`, t]))
    })
    const [reference, ...others] = statistics
    let compared = 0
    for (const [name, test] of reference!) {
      // Released as a fixed cell, a reference loading of either group is the same test; elsewhere it is an equality of the second.
      if (test.part === 'loading' && test.group === 'g1' && test.plausibility === 'stated') continue
      if (test.part === 'factor mean') continue
      for (const other of others) {
        const same = other.get(name)!
        expect(Math.abs(same.statistic - test.statistic), name).toBeLessThan(1e-5 * (1 + test.statistic))
        // Cells that no scaling touches change by the same amount too, and standardised amounts are the same for all.
        if (test.part === 'residual covariance') expect(Math.abs(same.change - test.change), name).toBeLessThan(1e-6)
        if (test.kind === 'fixed cell' && test.part === 'loading' && test.plausibility !== 'stated')
          expect(Math.abs(same.standardizedChange! - test.standardizedChange!), name).toBeLessThan(1e-5)
      }
      compared++
    }
    expect(compared).toBeGreaterThan(100)
  })

  it('list one test where two cells are held equal, and one a cell where three are', () => {
    const count = (sizes: number[]) => {
      const data = simulate(6, 2, sizes, seededGenerator(12))
      return tested(simpleStructure(data, 2, { loadings: true }), data).tests.filter((t) => t.kind === 'equality')
    }
    const two = count([200, 200])
    expect(two).toHaveLength(4)
    expect(two.every((t) => t.group === 'g2')).toBe(true)
    expect(count([200, 200, 200])).toHaveLength(12)
  })

  it('find no score and nothing left in a cell that is free already', () => {
    const cells = simpleStructure(moments, 3, wish)
    const model = compileModel(cells)
    const { gamma } = fitted(cells, moments)
    const [pattern] = possibleReleases(model, [])
    const free = model.groups[1]!.free.filter((cell) => cell.label.endsWith('_1'))
    const releases = free.map(({ matrix, row, column }) => {
      const place = { matrix, row, column, group: 1 }
      return { ...pattern!, place, shifts: [{ place, weight: 1 }] }
    })
    const scores = releaseScores(model, releases, Float64Array.from(gamma), (m) => normalObjective(m, moments, 'normal'))!
    expect(scores.length).toBeGreaterThan(15)
    for (const { score, information, left } of scores) {
      expect(Math.abs(score)).toBeLessThan(1e-7)
      expect(Math.abs(left)).toBeLessThan(1e-10 * information)
    }
    const { tests } = scoreTests(cells, moments, 'normal', gamma)
    expect(tests.some((t) => t.part === 'residual variance')).toBe(false)
  })

  it('name the restrictions that cannot be tested, because they set the scale', () => {
    const cells = simpleStructure(moments, 3)
    const { tests, untested } = tested(cells, moments)
    expect(tests.every((t) => t.kind === 'fixed cell' && t.plausibility !== 'stated')).toBe(true)
    const names = untested.map((u) => `${u.part} ${u.of.join(' ')} ${u.group}`)
    expect(names.sort()).toEqual(
      ['g1', 'g2'].flatMap((g) => [1, 2, 3].flatMap((k) => [`loading y${3 * k - 2} F${k} ${g}`, `factor mean F${k} ${g}`])).sort()
    )
    const effects = tested(simpleStructure(moments, 3, { scaling: 'effects coding', means: false }), moments)
    expect(effects.untested.map((u) => u.kind)).toEqual(new Array(6).fill('constraint'))
  })

  it('put what somebody stated first, then what is near, then the rest, the largest first in each', () => {
    const { tests } = tested(simpleStructure(moments, 3, wish), moments)
    const order = ['stated', 'near', 'far']
    const rank = tests.map((t) => order.indexOf(t.plausibility))
    expect(rank).toEqual([...rank].sort())
    for (let i = 1; i < tests.length; i++) {
      if (rank[i] === rank[i - 1]) expect(tests[i]!.statistic).toBeLessThanOrEqual(tests[i - 1]!.statistic)
    }
    const of = (part: string, names: string) => tests.find((t) => t.part === part && t.of.join(' ') === names)!.plausibility
    expect(of('residual covariance', 'y1 y2')).toBe('near')
    expect(of('residual covariance', 'y1 y4')).toBe('far')
    expect(of('loading', 'y1 F2')).toBe('near')
    expect(of('intercept', 'y2')).toBe('stated')
  })

  it('call a cross-loading far whose standardised value would be 1 or more', () => {
    // y6 correlates .8 with both indicators of F2, which correlate .3 with each other: a loading of .8 / sqrt(.3).
    const lower = [[1], [0.5, 1], [0.5, 0.5, 1], [0.2, 0.2, 0.2, 1], [0.2, 0.2, 0.2, 0.3, 1], [0.2, 0.2, 0.2, 0.8, 0.8, 1]]
    const group = { name: null, n: 400, covariance: wholeMatrix(lower), mean: null }
    const data: SampleMoments = { indicators: ['y1', 'y2', 'y3', 'y4', 'y5', 'y6'], groups: [group] }
    const cells = simpleStructure(data, 2, { means: false })
    cells.groups[0]!.loadings[5]![1] = 0
    const test = tested(cells, data).tests.find((t) => t.part === 'loading' && t.of.join(' ') === 'y6 F2')!
    expect(Math.abs(test.standardizedChange!)).toBeGreaterThanOrEqual(1)
    expect(test.plausibility).toBe('far')
  })

  it('are plain values without a number that JSON cannot hold, each marked as exploratory', () => {
    const result = tested(simpleStructure(moments, 3, wish), moments)
    expect(JSON.parse(JSON.stringify(result))).toEqual(result)
    expect(result.tests.every((t) => t.exploratory && t.df === 1 && t.statistic >= 0 && t.p >= 0 && t.p <= 1)).toBe(true)
  })

  it('count N as the convention says', () => {
    const cells = simpleStructure(moments, 3, { means: false })
    const { gamma } = fitModel(cells, moments, { convention: 'wishart' })
    const wishart = scoreTests(cells, moments, 'wishart', gamma!)
    const normal = scoreTests(cells, moments, 'normal', gamma!)
    const one = wishart.tests[0]!
    const same = normal.tests.find((t) => t.of.join() === one.of.join() && t.part === one.part && t.group === one.group)!
    expect(Math.abs(one.statistic / same.statistic - 299 / 300)).toBeLessThan(0.01)
    expect(one.statistic).not.toBe(same.statistic)
  })

  it('are not given where the model itself is not determined', () => {
    const cells = simpleStructure(moments, 3)
    cells.groups[0]!.loadings[0]![0] = 'extra'
    const model = compileModel(cells)
    const { gamma } = fitted(simpleStructure(moments, 3), moments)
    const known = compileModel(simpleStructure(moments, 3)).gammaLabels
    const point = model.gammaLabels.map((label) => (label === 'extra' ? 1 : gamma[known.indexOf(label)]!))
    const result = scoreTests(cells, moments, 'normal', point)
    expect(result.unavailable).not.toBeNull()
    expect(result.tests).toEqual([])
  })

  it('of a second-order model offer no path that closes a circle and none into a factor that nothing explains', () => {
    const data = simulate(12, 4, [500], seededGenerator(14))
    const cells = simpleStructure(data, 4)
    const plain = cells.groups[0]!
    const wider = (rows: Cell[][]) => rows.map((row) => [...row, 0])
    plain.loadings = wider(plain.loadings)
    plain.regressions = [...wider(plain.regressions), [0, 0, 0, 0, 0]].map((row, k) => (k < 4 ? [0, 0, 0, 0, `b${k}`] : row))
    plain.factorCovariances = [0, 1, 2, 3, 4].map((k) => [0, 1, 2, 3, 4].map((l) => (k !== l ? 0 : k === 4 ? 1 : `d${k}`)))
    plain.factorMeans = [0, 0, 0, 0, 0]
    const second: ModelCells = { ...cells, factors: [...cells.factors, 'S'] }
    const { tests, untested } = tested(second, data)
    const paths = [...tests, ...untested].filter((t) => t.part === 'factor regression')
    expect(paths.map((t) => t.of.join('<')).sort()).toEqual(
      ['F1', 'F2', 'F3', 'F4'].flatMap((a) => ['F1', 'F2', 'F3', 'F4'].filter((b) => b !== a).map((b) => `${a}<${b}`))
    )
    expect([...tests, ...untested].some((t) => t.part === 'factor covariance' && t.of.includes('S'))).toBe(false)
    const disturbances = tests.filter((t) => t.part === 'factor covariance')
    expect(disturbances).toHaveLength(6)
    expect(disturbances.every((t) => t.plausibility === 'near')).toBe(true)
    const { T } = fitted(second, data)
    const { drop, estimate } = refit(second, data, disturbances[0]!, T)
    expect(Math.abs(disturbances[0]!.statistic - drop)).toBeLessThan(0.02 + 0.15 * drop)
    expect(Math.abs(disturbances[0]!.expectedValue! - estimate)).toBeLessThan(0.02)
  })

  it('take less than a second for two thousand cells', () => {
    const data = simulate(60, 6, [800], seededGenerator(15))
    const cells = simpleStructure(data, 6)
    const { gamma } = fitted(cells, data)
    const start = performance.now()
    const { tests } = scoreTests(cells, data, 'normal', gamma)
    expect(performance.now() - start).toBeLessThan(1000)
    expect(tests).toHaveLength(60 * 5 + (60 * 59) / 2)
  })
})
