import { describe, expect, test } from 'vitest'
import { stabilityInput } from '../../../tests/bench/stability.ts'
import { scalingAtRestricted } from '../comparison/scaled-difference.ts'
import { seededGenerator } from '../distributions/generator.ts'
import { fitModel } from '../fit/fit.ts'
import { splitByPattern } from '../moments/missing-patterns.ts'
import { completeCaseMoments } from '../moments/sample-moments.ts'
import { saturatedMoments } from '../moments/saturated-em.ts'
import { drawWeights, resampleGenerator } from './case-weights.ts'
import { type ResampleInput, resampleLadder as resampled } from './ladder-resamples.ts'
import { drawnRows, weightedMoments } from './weighted-moments.ts'

/** 60 rows of three correlated columns far from zero; about one answer in eight missing when asked for. */
function someRows(missing: boolean): Float64Array {
  const generator = seededGenerator(5)
  const rows = new Float64Array(180)
  for (let i = 0; i < 60; i++) {
    const common = generator.normal()
    for (let j = 0; j < 3; j++) rows[i * 3 + j] = 1e5 + common + generator.normal()
    if (missing && generator.uniform() < 0.3) rows[i * 3 + (i % 3)] = Number.NaN
  }
  return rows
}

const resampleLadder = (input: ResampleInput) => resampled(input, scalingAtRestricted)

function drawn(strata: number[], seed = 3, index = 0): Int32Array {
  const weights = new Int32Array(strata.reduce((sum, size) => sum + size, 0))
  drawWeights(strata, resampleGenerator(seed, index), weights)
  return weights
}

function closeTo(actual: ArrayLike<number>, expected: ArrayLike<number>, tolerance: number): void {
  expect(actual.length).toBe(expected.length)
  for (let i = 0; i < expected.length; i++) expect(Math.abs(actual[i]! - expected[i]!)).toBeLessThan(tolerance)
}

describe('drawing cases', () => {
  test('keeps the size of every stratum and draws some cases twice, others never', () => {
    const weights = drawn([40, 20])
    expect(weights.subarray(0, 40).reduce((a, b) => a + b)).toBe(40)
    expect(weights.subarray(40).reduce((a, b) => a + b)).toBe(20)
    expect(weights).toContain(0)
    expect(weights).toContain(2)
  })

  test('gives every case the same chance: weights average one over many resamples', () => {
    const sums = new Float64Array(10)
    for (let i = 0; i < 4000; i++) for (const [at, weight] of drawn([10], 8, i).entries()) sums[at]! += weight / 4000
    // A weight has variance 0.9; five standard errors of a mean of 4,000.
    closeTo(sums, new Float64Array(10).fill(1), 5 * Math.sqrt(0.9 / 4000))
  })

  test('repeats itself for a seed and a number, and for no other', () => {
    expect(drawn([50], 1, 4)).toEqual(drawn([50], 1, 4))
    expect(drawn([50], 1, 4)).not.toEqual(drawn([50], 1, 5))
    expect(drawn([50], 1, 4)).not.toEqual(drawn([50], 2, 4))
    expect(drawn([50], 1, 1)).not.toEqual(drawn([50], 2, 0))
  })
})

describe('the moments of drawn cases', () => {
  const sample = (missing: boolean) => ({
    indicators: ['a', 'b', 'c'],
    groups: [
      { name: 'one', rows: someRows(missing).slice(0, 105) },
      { name: 'two', rows: someRows(missing).slice(105) }
    ],
    patterns: missing
  })
  const weights = drawn([35, 25])

  test('are those of the rows written out as often as they were drawn', () => {
    const moments = weightedMoments(sample(false))(weights)!
    drawnRows(sample(false), weights).forEach((rows, g) => {
      const plain = completeCaseMoments(rows, 3)
      expect(moments.groups[g]!.n).toBe(plain.n)
      closeTo(moments.groups[g]!.mean!, plain.mean, 1e-9)
      closeTo(moments.groups[g]!.covariance, plain.covariance, 1e-9)
    })
  })

  test('with missing answers, too, pattern by pattern and unrestricted', () => {
    const moments = weightedMoments(sample(true))(weights)!
    drawnRows(sample(true), weights).forEach((rows, g) => {
      const { patterns } = splitByPattern(rows, 3)
      const own = moments.groups[g]!
      expect(own.patterns!.map(({ n }) => n).sort()).toEqual(patterns.map(({ n }) => n).sort())
      for (const pattern of patterns) {
        const twin = own.patterns!.find((other) => other.observed.join() === pattern.observed.join())!
        closeTo(twin.mean!, pattern.mean!, 1e-9)
        closeTo(twin.covariance, pattern.covariance, 1e-9)
      }
      closeTo(own.covariance, saturatedMoments(patterns, 3).covariance, 1e-5)
    })
  })

  test('are none where too few different cases were drawn', () => {
    const all = new Int32Array(60)
    all.set([12, 12, 11], 0)
    all.set([25], 35)
    expect(weightedMoments(sample(false))(all)).toBeNull()
  })
})

describe('a ladder on resamples', () => {
  const input = stabilityInput(6)
  const whole = resampleLadder(input)

  test('agrees with ordinary fits to the drawn rows, indices included', () => {
    const weights = new Int32Array(900)
    drawWeights(input.strata, resampleGenerator(input.seed, 4), weights)
    const groups = drawnRows(input.samples[0]!, weights).map((rows, g) => ({
      name: input.samples[0]!.groups[g]!.name,
      ...completeCaseMoments(rows, 9)
    }))
    input.rungs.forEach(({ cells }, i) => {
      const { fit } = fitModel(cells, { indicators: input.samples[0]!.indicators, groups }, { convention: 'normal' })
      const resampled = whole.fits[4]![i]!
      expect(whole.df[i]).toBe(fit.df)
      expect(resampled.T!).toBeCloseTo(fit.T!, 6)
      expect(resampled.cfi!).toBeCloseTo(fit.cfi!, 8)
      expect(resampled.rmsea!).toBeCloseTo(fit.rmsea.estimate!, 8)
      expect(resampled.srmr!).toBeCloseTo(fit.srmr!, 6)
      expect(resampled.mcdonald!).toBeCloseTo(fit.mcdonald!, 8)
      expect(resampled.gammaHat!).toBeCloseTo(fit.gammaHat!, 8)
    })
  })

  test('gives the same resamples in chunks as in one run', () => {
    const chunks = [0, 2, 4].flatMap((first) => resampleLadder({ ...input, first, count: 2 }).fits)
    expect(chunks).toEqual(whole.fits)
  })

  test('reaches the same minimum without a solution to start from', () => {
    const cold = { ...input, count: 2, rungs: input.rungs.map((rung) => ({ ...rung, gamma: null })) }
    resampleLadder(cold).fits.forEach((fits, at) => {
      fits.forEach((fit, i) => {
        expect(fit.T!).toBeCloseTo(whole.fits[at]![i]!.T!, 6)
      })
    })
  })

  test('scales the statistic of each resample where the study asks for it', () => {
    const { fits } = resampleLadder({ ...input, count: 2, statistic: 'mean-scaled' })
    for (const rung of fits.flat()) {
      expect(rung.scaled!.scaling).toBeGreaterThan(0.7)
      expect(rung.scaled!.T).toBeCloseTo(rung.T! / rung.scaled!.scaling, 10)
    }
  })

  test('gives the scaling of the strictly positive difference where the study asks for it', () => {
    const scaled = { ...input, count: 1, statistic: 'mean-scaled' as const }
    expect(resampleLadder(scaled).fits[0]!.map((fit) => fit.scalingOfLower)).toEqual([null, null, null, null])
    const always = resampleLadder({ ...scaled, scalingAtUpper: 'always' }).fits[0]!
    expect(always[0]!.scalingOfLower).toBeNull()
    for (const [i, fit] of always.entries()) {
      if (i === 0) continue
      // At the restricted estimates, which are near the general model's own in an invariant population.
      expect(Math.abs(fit.scalingOfLower! / always[i - 1]!.scaled!.scaling - 1)).toBeLessThan(0.2)
    }
  })

  test('tells the cells that are watched, a factor covariance as a correlation', () => {
    const watched = [
      { part: 'factor covariance' as const, of: ['F0', 'F3'], group: 'g2' },
      { part: 'residual variance' as const, of: ['y4'], group: 'g1' }
    ]
    const { fits } = resampleLadder({ ...input, count: 1, rungs: [{ ...input.rungs[0]!, watched }] })
    const weights = drawn(input.strata, input.seed)
    const groups = drawnRows(input.samples[0]!, weights).map((rows, g) => ({ name: `g${g + 1}`, ...completeCaseMoments(rows, 9) }))
    const { estimates } = fitModel(
      input.rungs[0]!.cells,
      { indicators: input.samples[0]!.indicators, groups },
      { convention: 'normal' }
    ).fit
    const find = (part: string, of: string[], group: string) =>
      estimates.find((e) => e.part === part && e.group === group && [...e.of].sort().join() === of.join())!
    expect(fits[0]![0]!.watched[0]).toBeCloseTo(find('factor covariance', ['F0', 'F3'], 'g2').standardized!, 5)
    expect(fits[0]![0]!.watched[1]).toBeCloseTo(find('residual variance', ['y4'], 'g1').estimate!, 5)
  })

  test('carries the sampling error twice: differences of T exceed those of the sample by their df on average', () => {
    const many = resampleLadder({ ...input, count: 150 })
    const moments = {
      indicators: input.samples[0]!.indicators,
      groups: input.samples[0]!.groups.map(({ name, rows }) => ({ name, ...completeCaseMoments(rows, 9) }))
    }
    const sample = input.rungs.map(({ cells }) => fitModel(cells, moments, { convention: 'normal' }).fit)
    for (let i = 1; i < 4; i++) {
      const df = sample[i]!.df - sample[i - 1]!.df
      const T = sample[i]!.T! - sample[i - 1]!.T!
      const mean = many.fits.reduce((sum, fits) => sum + (fits[i]!.T! - fits[i - 1]!.T!) / 150, 0)
      // A noncentral chi-square with noncentrality T has variance 2 df + 4 T; five standard errors of a mean of 150.
      expect(Math.abs(mean - (T + df))).toBeLessThan(5 * Math.sqrt((2 * df + 4 * T) / 150) + 0.1 * df)
    }
  })

  test('tells a resample that makes no moments, and a rung without a solution', () => {
    const few: ResampleInput = {
      ...input,
      count: 3,
      strata: [8, 8, 8],
      samples: [
        {
          ...input.samples[0]!,
          groups: input.samples[0]!.groups.map(({ name, rows }) => ({ name, rows: rows.slice(0, 72) }))
        }
      ]
    }
    for (const rung of resampleLadder(few).fits.flat()) expect(rung).toMatchObject({ state: 'no moments', T: null })
    const loose = structuredClone(input)
    for (const group of loose.rungs[0]!.cells.groups) group.factorCovariances[0]![0] = `${group.name} scale`
    for (const group of loose.rungs[0]!.cells.groups) group.loadings[0]![0] = `${group.name} loading`
    const [bottom, above] = resampleLadder({
      ...loose,
      count: 1,
      rungs: loose.rungs.slice(0, 2).map((r) => ({ ...r, gamma: null }))
    }).fits[0]!
    expect(bottom).toMatchObject({ state: 'not converged', T: null })
    expect(above).toMatchObject({ state: 'fitted' })
  })
})
