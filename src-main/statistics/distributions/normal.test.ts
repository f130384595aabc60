import fc from 'fast-check'
import { expect, test } from 'vitest'
import reference from '../../../fixtures/distributions.json' with { type: 'json' }
import { normalLower, normalQuantile, normalUpper } from './normal.ts'
import { relativeError, worst } from './relative-error.ts'

// a fixed seed: a failure must be seen again by whoever looks
fc.configureGlobal({ seed: 1931, numRuns: 300 })

test('normal upper tails hold a relative 1e-10 down to 1e-300', () => {
  expect(Math.min(...reference.normal.map(([, upper]) => upper!))).toBeLessThan(1e-299)
  expect(worst(reference.normal, ([z, upper]) => relativeError(normalUpper(z!), upper!))).toBeLessThan(reference.tolerance)
  expect(worst(reference.normal, ([z, upper]) => relativeError(normalLower(-z!), upper!))).toBeLessThan(reference.tolerance)
})

test('familiar quantiles', () => {
  expect(normalQuantile(0.5)).toBe(0)
  expect(relativeError(normalQuantile(0.975), 1.959963984540054)).toBeLessThan(1e-14)
  expect(relativeError(normalQuantile(0.05), -1.6448536269514722)).toBeLessThan(1e-14)
})

test('the quantile inverts the lower tail, far out and near the middle', () => {
  const probability = fc.oneof(
    fc.double({ min: 1e-6, max: 0.999999, noNaN: true }),
    fc.integer({ min: 7, max: 300 }).map((power) => 10 ** -power),
    fc.integer({ min: 3, max: 16 }).map((power) => 0.5 - 10 ** -power)
  )
  fc.assert(
    fc.property(probability, (p) => {
      expect(relativeError(normalLower(normalQuantile(p)), p)).toBeLessThan(1e-11)
    })
  )
})

test('the quantile is odd around one half and rises', () => {
  fc.assert(
    fc.property(fc.double({ min: 1e-3, max: 0.499, noNaN: true }), (p) => {
      expect(relativeError(normalQuantile(1 - p), -normalQuantile(p))).toBeLessThan(1e-11)
      expect(normalQuantile(p + 1e-4)).toBeGreaterThan(normalQuantile(p))
    })
  )
})

test('the two tails add up to one', () => {
  fc.assert(
    fc.property(fc.double({ min: -10, max: 10, noNaN: true }), (z) => {
      expect(Math.abs(normalUpper(z) + normalLower(z) - 1)).toBeLessThan(1e-15)
    })
  )
})

test('probabilities outside (0, 1) have no quantile', () => {
  for (const p of [0, 1, -0.1, Number.NaN]) expect(() => normalQuantile(p)).toThrow(RangeError)
})
