import fc from 'fast-check'
import { describe, expect, test } from 'vitest'
import reference from '../../../fixtures/distributions.json' with { type: 'json' }
import { chiSquareLower, chiSquareQuantile, chiSquareUpper, logChiSquareUpper } from './chi-square.ts'
import { logGamma } from './gamma.ts'
import { relativeError, worst } from './relative-error.ts'

// a fixed seed: a failure must be seen again by whoever looks
fc.configureGlobal({ seed: 1931, numRuns: 300 })

const TOLERANCE = reference.tolerance
const df = fc.double({ min: 0.5, max: 3000, noNaN: true })
const spread = fc.double({ min: 0.02, max: 20, noNaN: true })

describe('central chi-square against high-precision values', () => {
  test('upper tails hold a relative 1e-10 down to 1e-300', () => {
    expect(Math.min(...reference.central.map(([, , upper]) => upper!))).toBeLessThan(1e-300)
    expect(worst(reference.central, ([f, x, upper]) => relativeError(chiSquareUpper(x!, f!), upper!))).toBeLessThan(TOLERANCE)
  })

  test('lower tails hold the same in their own tail', () => {
    expect(Math.min(...reference.central.map(([, , , lower]) => lower!))).toBeLessThan(1e-100)
    expect(worst(reference.central, ([f, x, , lower]) => relativeError(chiSquareLower(x!, f!), lower!))).toBeLessThan(TOLERANCE)
  })

  test('log tails go on where doubles end', () => {
    expect(Math.min(...reference.logTails.map(([, , log]) => log!))).toBeLessThan(-30_000)
    expect(worst(reference.logTails, ([f, x, log]) => relativeError(logChiSquareUpper(x!, f!), log!))).toBeLessThan(1e-13)
  })

  test('critical values', () => {
    expect(worst(reference.quantiles, ([f, p, x]) => relativeError(chiSquareQuantile(1 - p!, f!), x!))).toBeLessThan(TOLERANCE)
  })

  test('log-gamma', () => {
    expect(worst(reference.logGamma, ([x, value]) => relativeError(logGamma(x!), value!))).toBeLessThan(1e-13)
  })
})

describe('central chi-square by its own laws', () => {
  test('the two tails add up to one', () => {
    fc.assert(
      fc.property(df, spread, (f, times) => {
        expect(Math.abs(chiSquareUpper(f * times, f) + chiSquareLower(f * times, f) - 1)).toBeLessThan(1e-14)
      })
    )
  })

  test('the upper tail falls with x and rises with df', () => {
    fc.assert(
      fc.property(df, spread, (f, times) => {
        const x = f * times
        const log = logChiSquareUpper(x, f)
        expect(logChiSquareUpper(x * 1.01 + 0.01, f)).toBeLessThan(log + 1e-14)
        expect(logChiSquareUpper(x, f * 1.01 + 0.01)).toBeGreaterThanOrEqual(log - 1e-14)
      })
    )
  })

  test('two more degrees of freedom add one gamma term: Q(a + 1, h) - Q(a, h) = e^-h h^a / Gamma(a + 1)', () => {
    fc.assert(
      fc.property(df, fc.double({ min: 1.2, max: 3, noNaN: true }), (f, times) => {
        const h = (f * times) / 2
        const term = Math.exp((f / 2) * Math.log(h) - h - logGamma(f / 2 + 1))
        fc.pre(term > 1e-290)
        const difference = chiSquareUpper(2 * h, f + 2) - chiSquareUpper(2 * h, f)
        expect(relativeError(difference, term)).toBeLessThan(1e-9)
      })
    )
  })

  test('the critical value inverts the tail, from 1e-300 to nearly one', () => {
    const tail = fc.oneof(
      fc.double({ min: 1e-6, max: 0.999, noNaN: true }),
      fc.integer({ min: 7, max: 300 }).map((power) => 10 ** -power)
    )
    fc.assert(
      fc.property(tail, df, (p, f) => {
        expect(relativeError(chiSquareUpper(chiSquareQuantile(p, f), f), p)).toBeLessThan(1e-11)
      })
    )
  })

  test('with two degrees of freedom the tail is exp(-x/2)', () => {
    for (const x of [0.1, 1, 10, 100, 1000, 1300]) expect(relativeError(chiSquareUpper(x, 2), Math.exp(-x / 2))).toBeLessThan(1e-12)
  })
})

describe('the ends of central chi-square', () => {
  test('nothing lies below zero, and with no degrees of freedom everything lies at zero', () => {
    expect([chiSquareUpper(0, 3), chiSquareUpper(-1e-14, 3), chiSquareLower(0, 3)]).toEqual([1, 1, 0])
    expect([chiSquareUpper(0, 0), chiSquareUpper(0.1, 0), chiSquareLower(0, 0), chiSquareLower(-1, 0)]).toEqual([1, 0, 1, 0])
    expect([chiSquareUpper(Number.POSITIVE_INFINITY, 4), chiSquareLower(Number.POSITIVE_INFINITY, 4)]).toEqual([0, 1])
    expect([logChiSquareUpper(0, 4), logChiSquareUpper(1, 0)]).toEqual([0, Number.NEGATIVE_INFINITY])
  })

  test('senseless arguments are refused, not answered', () => {
    expect(() => chiSquareUpper(Number.NaN, 3)).toThrow(RangeError)
    expect(() => chiSquareLower(3, -1)).toThrow(RangeError)
    expect(() => logChiSquareUpper(3, Number.NaN)).toThrow(RangeError)
    expect(() => chiSquareQuantile(0, 3)).toThrow(RangeError)
    expect(() => chiSquareQuantile(0.05, 0)).toThrow(RangeError)
    expect(() => logGamma(0)).toThrow(RangeError)
  })
})
