import fc from 'fast-check'
import { describe, expect, test } from 'vitest'
import reference from '../../../fixtures/mixtures.json' with { type: 'json' }
import { chiSquareLower, chiSquareQuantile, chiSquareUpper } from './chi-square.ts'
import {
  chiBarSquareQuantile,
  chiBarSquareUpper,
  chiBarSquareWeights,
  type WeightedTerm,
  weightedChiSquareLower,
  weightedChiSquareUpper
} from './mixtures.ts'
import { noncentralChiSquareLower, noncentralChiSquareUpper } from './noncentral-chi-square.ts'
import { relativeError, worst } from './relative-error.ts'

// a fixed seed: a failure must be seen again by whoever looks
fc.configureGlobal({ seed: 1931, numRuns: 300 })

const asTerms = (rows: readonly (readonly number[])[]): WeightedTerm[] =>
  rows.map(([weight, df, noncentrality]) => ({ weight: weight!, df: df!, noncentrality: noncentrality! }))

describe('boundary mixtures', () => {
  test.each(reference.mixtures)('tails and critical values: $name', ({ parts, upper, critical }) => {
    expect(worst(upper, ([x, p]) => relativeError(chiBarSquareUpper(x!, parts), p!))).toBeLessThan(reference.mixtureTolerance)
    expect(worst(critical, ([p, x]) => relativeError(chiBarSquareQuantile(p!, parts), x!))).toBeLessThan(reference.mixtureTolerance)
  })

  test.each(reference.mixtures.filter(({ correlations }) => correlations !== null))('weights from correlations: $name', (row) => {
    const weights = chiBarSquareWeights(row.correlations!)
    expect(weights).toHaveLength(row.parts.length)
    expect(worst(weights, ({ df, weight }) => relativeError(weight, row.parts[df]!.weight))).toBeLessThan(1e-13)
  })

  test('one boundary parameter halves the usual p', () => {
    const parts = [
      { df: 0, weight: 0.5 },
      { df: 1, weight: 0.5 }
    ]
    expect(chiBarSquareUpper(2.7, parts)).toBe(chiSquareUpper(2.7, 1) / 2)
    expect(relativeError(chiBarSquareUpper(1200, parts), chiSquareUpper(1200, 1) / 2)).toBeLessThan(1e-15)
    expect(chiBarSquareUpper(0, parts)).toBe(1)
    expect(chiBarSquareQuantile(0.6, parts)).toBe(0)
  })

  test('the critical value inverts the tail', () => {
    const part = fc.record({ df: fc.integer({ min: 0, max: 40 }), weight: fc.double({ min: 0.01, max: 1, noNaN: true }) })
    const tail = fc.oneof(
      fc.double({ min: 1e-6, max: 0.9, noNaN: true }),
      fc.integer({ min: 7, max: 280 }).map((power) => 10 ** -power)
    )
    fc.assert(
      fc.property(fc.array(part, { minLength: 1, maxLength: 5 }), tail, (raw, p) => {
        const total = raw.reduce((sum, { weight }) => sum + weight, 0)
        const parts = raw.map(({ df, weight }) => ({ df, weight: weight / total }))
        const x = chiBarSquareQuantile(p, parts)
        if (x === 0) expect(parts.reduce((sum, { df, weight }) => sum + (df > 0 ? weight : 0), 0)).toBeLessThanOrEqual(p)
        else expect(relativeError(chiBarSquareUpper(x, parts), p)).toBeLessThan(1e-10)
      })
    )
  })

  test('a mixture of one part is that chi-square', () => {
    expect(relativeError(chiBarSquareQuantile(1e-12, [{ df: 7, weight: 1 }]), chiSquareQuantile(1e-12, 7))).toBeLessThan(1e-13)
  })

  test('weights that are no probabilities are refused', () => {
    expect(() => chiBarSquareUpper(1, [{ df: 1, weight: 0.5 }])).toThrow(RangeError)
    expect(() => chiBarSquareUpper(1, [])).toThrow(RangeError)
    expect(() =>
      chiBarSquareUpper(1, [
        { df: 1, weight: 1.5 },
        { df: 0, weight: -0.5 }
      ])
    ).toThrow(RangeError)
    expect(() => chiBarSquareQuantile(1, [{ df: 1, weight: 1 }])).toThrow(RangeError)
    expect(() => chiBarSquareWeights([])).toThrow(RangeError)
    expect(() => chiBarSquareWeights([[1], [0.2]])).toThrow(RangeError)
  })
})

describe('weighted sums of chi-squares', () => {
  // Imhof (1961, table 1) prints four decimals for the first four of these sums' families; the figures here have twelve digits
  test.each(reference.sums)('tails: $name', ({ terms, upper }) => {
    expect(worst(upper, ([x, p]) => relativeError(weightedChiSquareUpper(x!, asTerms(terms)), p!))).toBeLessThan(
      reference.sumTolerance
    )
    expect(worst(upper, ([x, p]) => relativeError(weightedChiSquareLower(x!, asTerms(terms)), 1 - p!))).toBeLessThan(1e-9)
  })

  test('sums of exponentials in closed form, down to 1e-283', () => {
    const rows = reference.closedForm.map(([terms, x, upper, lower]) => ({
      terms: asTerms(terms as number[][]),
      x: x as number,
      upper: upper as number,
      lower: lower as number
    }))
    expect(worst(rows, ({ terms, x, upper }) => relativeError(weightedChiSquareUpper(x, terms), upper))).toBeLessThan(1e-10)
    expect(worst(rows, ({ terms, x, lower }) => relativeError(weightedChiSquareLower(x, terms), lower))).toBeLessThan(1e-10)
  })

  test('a single term is the chi-square itself, central or not, in both far tails', () => {
    for (const df of [0.5, 1, 2, 24, 500]) {
      for (const x of [1e-6, 0.01, 1, 30, 500, 1000]) {
        const central = { weight: 0.25, df }
        expect(relativeError(weightedChiSquareUpper(x / 4, [central]), chiSquareUpper(x, df))).toBeLessThan(1e-10)
        const lower = chiSquareLower(x, df)
        if (lower > 1e-290) expect(relativeError(weightedChiSquareLower(x / 4, [central]), lower)).toBeLessThan(1e-10)
        const shifted = { weight: 0.25, df, noncentrality: 40 }
        const upper = noncentralChiSquareUpper(x, df, 40)
        expect(relativeError(weightedChiSquareUpper(x / 4, [shifted]), upper)).toBeLessThan(1e-10)
        const below = noncentralChiSquareLower(x, df, 40)
        if (below > 1e-290) expect(relativeError(weightedChiSquareLower(x / 4, [shifted]), below)).toBeLessThan(1e-10)
      }
    }
  })

  const term = fc.record({
    weight: fc.oneof(fc.double({ min: 1e-3, max: 3, noNaN: true }), fc.double({ min: -3, max: -1e-3, noNaN: true })),
    df: fc.integer({ min: 1, max: 12 }),
    noncentrality: fc.constantFrom(0, 0, 0.7, 15)
  })
  const terms = fc.array(term, { minLength: 1, maxLength: 8 })
  const point = fc.double({ min: -60, max: 60, noNaN: true })

  test('turning every sign turns the tail', () => {
    fc.assert(
      fc.property(terms, point, (sum, x) => {
        const turned = sum.map((each) => ({ ...each, weight: -each.weight }))
        const upper = weightedChiSquareUpper(x, sum)
        expect(Math.abs(weightedChiSquareLower(-x, turned) - upper)).toBeLessThanOrEqual(1e-10 * upper)
        expect(Math.abs(upper + weightedChiSquareLower(x, sum) - 1)).toBeLessThan(1e-12)
      })
    )
  })

  test('splitting a term, or changing the unit, changes nothing', () => {
    fc.assert(
      fc.property(terms, point, fc.double({ min: 1e-3, max: 1e3, noNaN: true }), (sum, x, unit) => {
        const upper = weightedChiSquareUpper(x, sum)
        // not where the point times the unit leaves the range of doubles
        fc.pre(upper > 1e-290 && (x === 0 || Math.abs(x) > 1e-290))
        const split = sum.flatMap((each) => [
          { ...each, df: each.df * 0.25, noncentrality: 0 },
          { ...each, df: each.df * 0.75 }
        ])
        expect(relativeError(weightedChiSquareUpper(x, split), upper)).toBeLessThan(1e-10)
        const rescaled = sum.map((each) => ({ ...each, weight: each.weight * unit }))
        expect(relativeError(weightedChiSquareUpper(x * unit, rescaled), upper)).toBeLessThan(1e-10)
      })
    )
  })

  test('the upper tail falls as the point rises', () => {
    fc.assert(
      fc.property(terms, point, (sum, x) => {
        expect(weightedChiSquareUpper(x + 0.1, sum)).toBeLessThanOrEqual(weightedChiSquareUpper(x, sum) * (1 + 1e-10))
      })
    )
  })

  test('the ends: one-signed sums stay on their side of zero', () => {
    expect(weightedChiSquareUpper(0, [{ weight: 2, df: 3 }])).toBe(1)
    expect(weightedChiSquareUpper(-1, [{ weight: 2, df: 3 }])).toBe(1)
    expect(weightedChiSquareUpper(0, [{ weight: -2, df: 3 }])).toBe(0)
    expect(weightedChiSquareUpper(Number.POSITIVE_INFINITY, [{ weight: 1, df: 3 }])).toBe(0)
    const evenly = [
      { weight: 1, df: 1 },
      { weight: -1, df: 1 }
    ]
    expect(relativeError(weightedChiSquareUpper(0, evenly), 0.5)).toBeLessThan(1e-12)
  })

  test('senseless arguments are refused, not answered', () => {
    expect(() => weightedChiSquareUpper(1, [])).toThrow(RangeError)
    expect(() => weightedChiSquareUpper(1, [{ weight: 0, df: 1 }])).toThrow(RangeError)
    expect(() => weightedChiSquareUpper(1, [{ weight: 1, df: 0 }])).toThrow(RangeError)
    expect(() => weightedChiSquareUpper(Number.NaN, [{ weight: 1, df: 1 }])).toThrow(RangeError)
    expect(() => weightedChiSquareUpper(1, [{ weight: 1, df: 1, noncentrality: -1 }])).toThrow(RangeError)
  })
})
