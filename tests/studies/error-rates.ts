/**
 * `npm run study:error-rates`: how often a step that holds in the population is rejected at .05.
 *
 * Four designs, each at N = 200 and N = 1,000, 2,000 replications: the normal-theory difference on normal data; the same on
 * heavy-tailed data, where it is known to fail; the scaled differences (Satorra & Bentler 2001, 2010) on those data; and a
 * factor correlation of 1, where the chi-square on one df is too conservative and the mixture is due (Stoel, Garre, Dolan &
 * van den Wittenboer 2006). A rate is compared with .05 in units of its Monte Carlo standard error.
 */
import { normalDifference } from '../../src-main/statistics/comparison/difference-test.ts'
import {
  scaledDifference,
  scalingAtRestricted,
  strictlyPositiveDifference
} from '../../src-main/statistics/comparison/scaled-difference.ts'
import { chiSquareUpper } from '../../src-main/statistics/distributions/chi-square.ts'
import { type Generator, seededGenerator } from '../../src-main/statistics/distributions/generator.ts'
import { chiBarSquareUpper } from '../../src-main/statistics/distributions/mixtures.ts'
import { normalObjective } from '../../src-main/statistics/estimation/normal-likelihood.ts'
import { type InformationsAt, missingScalingFactor } from '../../src-main/statistics/estimation/scaling-missing.ts'
import { fitModel } from '../../src-main/statistics/fit/fit.ts'
import type { ModelCells } from '../../src-main/statistics/model/cells.ts'
import { compileModel } from '../../src-main/statistics/model/compile.ts'
import { splitByPattern } from '../../src-main/statistics/moments/missing-patterns.ts'
import { completeCaseMoments } from '../../src-main/statistics/moments/sample-moments.ts'
import { saturatedMoments } from '../../src-main/statistics/moments/saturated-em.ts'
import { candidateCells, resolveCandidate } from '../../src-main/study/candidate-model.ts'
import { candidateSchema } from '../../src-main/study/study.ts'

const replications = Number(process.argv[2] ?? 2000)
const seed = 20_261_201
const sizes = [200, 1000]
const indicators = ['y1', 'y2', 'y3', 'y4', 'y5', 'y6']
const loadings = [0.8, 0.7, 0.6, 0.8, 0.7, 0.6]
const half = [
  { df: 0, weight: 0.5 },
  { df: 1, weight: 0.5 }
]

const two = candidateSchema.parse({
  name: 'two',
  scaling: 'factor variance',
  factors: [
    { name: 'F', measures: indicators.slice(0, 3) },
    { name: 'G', measures: indicators.slice(3) }
  ]
})
/** Tau-equivalent pairs across the factors: four loadings equal to their counterparts, true in the population. */
const pairs = candidateSchema.parse({
  name: 'pairs',
  from: 'two',
  change: [0, 1, 2].map((i) => ({
    do: 'equal',
    cells: [
      { part: 'loading', of: [indicators[i], 'F'] },
      { part: 'loading', of: [indicators[i + 3], 'G'] }
    ]
  }))
})
const one = candidateSchema.parse({
  name: 'one',
  from: 'two',
  change: [{ do: 'fix', cell: { part: 'factor covariance', of: ['F', 'G'] }, at: 1 }]
})

function cellsOf(name: string): ModelCells {
  return candidateCells(resolveCandidate(name, [two, pairs, one]), { indicators, grouping: null, groups: [null], means: true })
}
const cells = { two: cellsOf('two'), pairs: cellsOf('pairs'), one: cellsOf('one') }

/** Rows of two factors; `heavy` divides each case by the root of a chi-square on 6 df over 6 (multivariate t). */
function draw(n: number, correlation: number, heavy: boolean, generator: Generator): Float64Array {
  const values = new Float64Array(n * 6)
  for (let row = 0; row < n; row++) {
    const f = generator.normal()
    const g = correlation * f + Math.sqrt(1 - correlation * correlation) * generator.normal()
    let square = 0
    if (heavy) for (let k = 0; k < 6; k++) square += generator.normal() ** 2
    const stretch = heavy ? Math.sqrt(6 / square) : 1
    for (let i = 0; i < 6; i++) {
      const unique = Math.sqrt(1 - loadings[i]! ** 2) * generator.normal()
      values[row * 6 + i] = stretch * (loadings[i]! * (i < 3 ? f : g) + unique)
    }
  }
  return values
}

interface Pair {
  restricted: ReturnType<typeof fitModel>
  general: ReturnType<typeof fitModel>
  rows: Float64Array[]
  moments: Parameters<typeof fitModel>[1]
}

function fitPair(restricted: ModelCells, values: Float64Array, scaled: boolean): Pair | null {
  const moments = { indicators, groups: [{ name: null, ...completeCaseMoments(values, 6) }] }
  const rows = [values]
  const settings = { convention: 'normal' as const, statistic: scaled ? ('mean-scaled' as const) : ('normal theory' as const) }
  const fits = [restricted, cells.two].map((model) => fitModel(model, moments, settings, rows))
  return fits.every((fit) => fit.fit.state === 'fitted') ? { restricted: fits[0]!, general: fits[1]!, rows, moments } : null
}

const sides = ({ restricted, general }: Pair) =>
  [restricted, general].map(({ fit }) => ({ T: fit.T!, df: fit.df, scaling: fit.scaled?.scaling ?? Number.NaN })) as [
    { T: number; df: number; scaling: number },
    { T: number; df: number; scaling: number }
  ]

/** p of each test on one pair; null where a test is not defined. */
type Tests = Record<string, (pair: Pair) => number | null>

const plain: Tests = { 'normal theory': (pair) => normalDifference(...sides(pair)).p }
const scaledTests: Tests = {
  'scaled (2001)': (pair) => scaledDifference(...sides(pair))?.p ?? null,
  'strictly positive (2010)': (pair) => {
    const [restricted, general] = sides(pair)
    const { moments, rows } = pair
    const c10 = scalingAtRestricted({
      general: cells.two,
      generalGamma: pair.general.gamma!,
      restricted: cells.pairs,
      restrictedGamma: pair.restricted.gamma!,
      moments,
      rows
    })
    return c10 === null ? null : (strictlyPositiveDifference(restricted, general, c10)?.p ?? null)
  }
}
/** T with the correlation kept within its bound: where the estimate lies beyond 1, the restricted model is the best within it. */
function boundedT(pair: Pair): number {
  const correlation = pair.general.fit.estimates.find((e) => e.part === 'factor covariance')!.estimate!
  return correlation >= 1 ? 0 : normalDifference(...sides(pair)).T
}

const boundaryTests: Tests = {
  'normal theory, correlation unbounded': (pair) => plain['normal theory']!(pair),
  'chi-square on 1 df, correlation at most 1': (pair) => chiSquareUpper(boundedT(pair), 1),
  'boundary mixture, correlation at most 1': (pair) => chiBarSquareUpper(boundedT(pair), half)
}

const designs: { name: string; restricted: ModelCells; correlation: number; heavy: boolean; tests: Tests }[] = [
  {
    name: 'three equalities, normal data',
    restricted: cells.pairs,
    correlation: 0.4,
    heavy: false,
    tests: { ...plain, ...scaledTests }
  },
  {
    name: 'three equalities, heavy tails',
    restricted: cells.pairs,
    correlation: 0.4,
    heavy: true,
    tests: { ...plain, ...scaledTests }
  },
  { name: 'correlation of 1, normal data', restricted: cells.one, correlation: 1, heavy: false, tests: boundaryTests }
]

/** Takes 12% of the answers away at random, and fits the two-factor model, which is true, with full information. */
function exactFitWithHoles(n: number, heavy: boolean, generator: Generator): Record<string, number | null> {
  const values = draw(n, 0.4, heavy, generator).map((value) => (generator.uniform() < 0.12 ? Number.NaN : value))
  const { patterns, n: cases } = splitByPattern(values, 6)
  const { mean, covariance } = saturatedMoments(patterns, 6)
  const moments = { indicators, groups: [{ name: null, n: cases, patterns, mean, covariance }] }
  const { fit, gamma } = fitModel(cells.two, moments, { convention: 'normal', standardErrors: 'observed' })
  if (fit.T === null || gamma === null) return Object.fromEntries(['not scaled', ...places].map((place) => [place, null]))
  const model = compileModel(cells.two)
  const objective = normalObjective(model, moments, 'normal')
  objective.evaluate(Float64Array.from(gamma))
  const scaledP = (place: InformationsAt) => {
    const c = missingScalingFactor(model, objective, moments, [values], place)
    return c === null || !(c > 0) ? null : chiSquareUpper(fit.T! / c, fit.df)
  }
  return { 'not scaled': fit.p, ...Object.fromEntries(places.map((place) => [place, scaledP(place)])) }
}

const places: InformationsAt[] = ['the model-implied moments', 'the unrestricted estimates']

console.log(`seed ${seed}, ${replications} replications a cell\n`)
console.log('| population and data | N | test | rejected at .05 | standard errors from .05 | undefined |')
console.log('| --- | --- | --- | --- | --- | --- |')
for (const { name, restricted, correlation, heavy, tests } of designs) {
  for (const n of sizes) {
    const generator = seededGenerator(seed)
    const counts = new Map(Object.keys(tests).map((test) => [test, { rejected: 0, done: 0, missing: 0 }]))
    for (let r = 0; r < replications; r++) {
      const pair = fitPair(restricted, draw(n, correlation, heavy, generator), heavy || 'scaled (2001)' in tests)
      for (const [test, pOf] of Object.entries(tests)) {
        const count = counts.get(test)!
        const p = pair === null ? null : pOf(pair)
        if (p === null) count.missing++
        else {
          count.done++
          if (p < 0.05) count.rejected++
        }
      }
    }
    for (const [test, { rejected, done, missing }] of counts) {
      const rate = rejected / done
      const error = Math.sqrt((0.05 * 0.95) / done)
      console.log(`| ${name} | ${n} | ${test} | ${rate.toFixed(4)} | ${((rate - 0.05) / error).toFixed(1)} | ${missing} |`)
    }
  }
}

console.log('\nExact fit of a true model with 12% of the answers missing, Yuan & Bentler (2000) with both informations\n')
console.log('| data | N | informations | rejected at .05 | standard errors from .05 | undefined |')
console.log('| --- | --- | --- | --- | --- | --- |')
for (const heavy of [false, true]) {
  for (const n of sizes) {
    const generator = seededGenerator(seed)
    const counts = new Map<string, { rejected: number; done: number; missing: number }>()
    for (let r = 0; r < replications; r++) {
      for (const [form, p] of Object.entries(exactFitWithHoles(n, heavy, generator))) {
        const count = counts.get(form) ?? { rejected: 0, done: 0, missing: 0 }
        counts.set(form, count)
        if (p === null) count.missing++
        else count.done++
        if (p !== null && p < 0.05) count.rejected++
      }
    }
    for (const [form, { rejected, done, missing }] of counts) {
      const rate = rejected / done
      const error = Math.sqrt((0.05 * 0.95) / done)
      console.log(
        `| ${heavy ? 'heavy tails' : 'normal'} | ${n} | ${form} | ${rate.toFixed(4)} | ${((rate - 0.05) / error).toFixed(1)} | ${missing} |`
      )
    }
  }
}
