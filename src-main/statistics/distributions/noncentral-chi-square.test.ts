import fc from 'fast-check'
import { describe, expect, test } from 'vitest'
import reference from '../../../fixtures/distributions.json' with { type: 'json' }
import { chiSquareLower, chiSquareUpper } from './chi-square.ts'
import { noncentralChiSquareLower, noncentralChiSquareUpper, noncentralityFor } from './noncentral-chi-square.ts'
import { normalLower, normalUpper } from './normal.ts'
import { relativeError, worst } from './relative-error.ts'

// a fixed seed: a failure must be seen again by whoever looks
fc.configureGlobal({ seed: 1931, numRuns: 300 })

const TOLERANCE = reference.tolerance
const df = fc.double({ min: 0.5, max: 2000, noNaN: true })
const lambda = fc.oneof(fc.double({ min: 1e-6, max: 200, noNaN: true }), fc.double({ min: 200, max: 20_000, noNaN: true }))
/** x as a number of standard deviations from the mean */
const deviations = fc.double({ min: -6, max: 12, noNaN: true })
const place = (f: number, l: number, z: number): number => Math.max(1e-3, f + l + z * Math.sqrt(2 * (f + 2 * l)))

describe('noncentral chi-square against high-precision values', () => {
  const far = reference.noncentralFar

  test('both tails over the usual range', () => {
    const rows = reference.noncentral
    expect(worst(rows, ([f, l, x, p]) => relativeError(noncentralChiSquareUpper(x!, f!, l!), p!))).toBeLessThan(TOLERANCE)
    expect(worst(rows, ([f, l, x, , p]) => relativeError(noncentralChiSquareLower(x!, f!, l!), p!))).toBeLessThan(TOLERANCE)
  })

  test('upper tails down to 1e-294, noncentralities up to 1e5, thousands of degrees of freedom', () => {
    const rows = far.filter(([, , , upper]) => upper !== null)
    expect(Math.min(...rows.map(([, , , upper]) => upper!))).toBeLessThan(1e-290)
    expect(worst(rows, ([f, l, x, p]) => relativeError(noncentralChiSquareUpper(x!, f!, l!), p!))).toBeLessThan(TOLERANCE)
  })

  test('lower tails likewise', () => {
    const rows = far.filter(([, , , , lower]) => lower !== null)
    expect(Math.min(...rows.map(([, , , , lower]) => lower!))).toBeLessThan(1e-150)
    expect(worst(rows, ([f, l, x, , p]) => relativeError(noncentralChiSquareLower(x!, f!, l!), p!))).toBeLessThan(TOLERANCE)
  })

  test('quantiles of the noncentral distribution come back', () => {
    expect(
      worst(reference.noncentralQuantiles, ([f, l, p, x]) => relativeError(noncentralChiSquareLower(x!, f!, l!), p!))
    ).toBeLessThan(TOLERANCE)
  })

  test('limits for the noncentrality, to 1e-12', () => {
    const rows = reference.noncentralities
    expect(worst(rows, ([x, f, p, l]) => relativeError(noncentralityFor(x!, f!, p!), l!))).toBeLessThan(1e-12)
    expect(rows.filter(([, , , l]) => l === 0)).toHaveLength(2)
  })
})

describe('noncentral chi-square by its own laws', () => {
  test('the two tails, summed separately, add up to one', () => {
    fc.assert(
      fc.property(df, lambda, deviations, (f, l, z) => {
        const x = place(f, l, z)
        expect(Math.abs(noncentralChiSquareUpper(x, f, l) + noncentralChiSquareLower(x, f, l) - 1)).toBeLessThan(1e-12)
      })
    )
  })

  test('the upper tail rises with the noncentrality and falls with x', () => {
    fc.assert(
      fc.property(df, lambda, fc.double({ min: 0, max: 12, noNaN: true }), (f, l, z) => {
        const x = place(f, l, z)
        const tail = noncentralChiSquareUpper(x, f, l)
        expect(noncentralChiSquareUpper(x, f, l * 1.01 + 0.01)).toBeGreaterThan(tail)
        expect(noncentralChiSquareUpper(x * 1.01 + 0.01, f, l)).toBeLessThan(tail)
      })
    )
  })

  test('without noncentrality it is the central distribution, and near it nearly so', () => {
    for (const [x, f] of [
      [3, 2],
      [45.3, 24],
      [900, 10]
    ] as const) {
      expect(noncentralChiSquareUpper(x, f, 0)).toBe(chiSquareUpper(x, f))
      expect(noncentralChiSquareLower(x, f, 0)).toBe(chiSquareLower(x, f))
      expect(relativeError(noncentralChiSquareUpper(x, f, 1e-14), chiSquareUpper(x, f))).toBeLessThan(1e-11)
    }
  })

  test('on one degree of freedom it is the square of a shifted normal', () => {
    fc.assert(
      fc.property(fc.double({ min: 0.1, max: 30, noNaN: true }), fc.double({ min: 0.1, max: 20, noNaN: true }), (root, shift) => {
        const upper = normalUpper(root - shift) + normalUpper(root + shift)
        fc.pre(upper > 1e-290)
        expect(relativeError(noncentralChiSquareUpper(root * root, 1, shift * shift), upper)).toBeLessThan(1e-10)
        if (root > shift) return
        const lower = normalLower(root - shift) - normalLower(-root - shift)
        // the difference of two normal tails loses digits when the root is small against the shift
        fc.pre(lower > 1e-290 && root > 0.5)
        expect(relativeError(noncentralChiSquareLower(root * root, 1, shift * shift), lower)).toBeLessThan(1e-10)
      })
    )
  })

  test('the noncentrality found gives the probability asked for, far tails included', () => {
    const probability = fc.oneof(
      fc.double({ min: 1e-4, max: 0.9999, noNaN: true }),
      fc.integer({ min: 5, max: 250 }).map((power) => 10 ** -power)
    )
    fc.assert(
      fc.property(df, fc.double({ min: 0.2, max: 20, noNaN: true }), probability, (f, times, p) => {
        const x = f * times
        const found = noncentralityFor(x, f, p)
        if (found === 0) expect(chiSquareLower(x, f)).toBeLessThanOrEqual(p)
        else expect(relativeError(noncentralChiSquareLower(x, f, found), p)).toBeLessThan(1e-10)
      })
    )
  })

  test('the limit falls with the probability and rises with the statistic', () => {
    fc.assert(
      fc.property(df, fc.double({ min: 1.5, max: 20, noNaN: true }), (f, times) => {
        const x = f * times + 10
        const [low, high] = [noncentralityFor(x, f, 0.95), noncentralityFor(x, f, 0.05)]
        expect(low).toBeLessThan(high)
        expect(noncentralityFor(x * 1.1, f, 0.05)).toBeGreaterThan(high)
      })
    )
  })

  test('a limit just above zero is found', () => {
    const x = 14.2
    const p = chiSquareLower(x, 6)
    expect(noncentralityFor(x, 6, p)).toBe(0)
    const found = noncentralityFor(x, 6, p * (1 - 1e-9))
    expect(found).toBeGreaterThan(0)
    expect(found).toBeLessThan(1e-6)
  })
})

describe('the ends of noncentral chi-square', () => {
  test('nothing lies below zero nor beyond infinity', () => {
    expect([noncentralChiSquareUpper(0, 3, 2), noncentralChiSquareLower(-1, 3, 2), noncentralityFor(0, 3, 0.05)]).toEqual([1, 0, 0])
    expect(noncentralChiSquareUpper(Number.POSITIVE_INFINITY, 3, 2)).toBe(0)
    expect(noncentralChiSquareUpper(1e-300, 3, 1e-300)).toBe(1)
  })

  test('senseless arguments are refused, not answered', () => {
    expect(() => noncentralChiSquareUpper(Number.NaN, 3, 1)).toThrow(RangeError)
    expect(() => noncentralChiSquareUpper(3, 0, 1)).toThrow(RangeError)
    expect(() => noncentralChiSquareLower(3, 3, -1)).toThrow(RangeError)
    expect(() => noncentralChiSquareLower(1e200, 3, 1)).toThrow(RangeError)
    for (const p of [0, 1, Number.NaN]) expect(() => noncentralityFor(3, 3, p)).toThrow(RangeError)
  })
})
