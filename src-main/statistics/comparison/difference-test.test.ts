import fc from 'fast-check'
import { describe, expect, it } from 'vitest'
import { chiSquareQuantile } from '../distributions/chi-square.ts'
import { criticalLevel, type DifferenceTest, holm, informationWeights, normalDifference } from './difference-test.ts'

const criticalValue = (test: DifferenceTest, adjustedP: number, alpha: number) =>
  chiSquareQuantile(criticalLevel(test.p, adjustedP, alpha), test.df)

describe('the chi-square difference', () => {
  it('is the published step from two factors to parallel pairs: 1.93 - 0.70 on 4 df (Jöreskog 1971, typed from memory)', () => {
    const test = normalDifference({ T: 1.93, df: 5 }, { T: 0.7, df: 1 })
    expect(test.T).toBeCloseTo(1.23, 10)
    expect(test.df).toBe(4)
    expect(test.p).toBeGreaterThan(0.8)
  })

  it('never turns negative by rounding', () => {
    expect(normalDifference({ T: 5, df: 4 }, { T: 5 + 1e-12, df: 3 })).toEqual({ T: 0, df: 1, p: 1 })
  })
})

describe("Holm's adjustment (1979)", () => {
  it('multiplies the smallest p by the number of tests, the next by one less, and never falls', () => {
    // Step-down arithmetic of the method: .01 x 4, .02 x 3, .03 x 2 raised to .06, .04 x 1 raised to .06.
    expect(holm([0.01, 0.04, 0.03, 0.02])).toEqual([0.04, 0.06, 0.06, 0.06])
    expect(holm([0.6, 0.7])).toEqual([1, 1])
    expect(holm([])).toEqual([])
  })

  it('is never below the raw p, never above Bonferroni, and keeps the order', () => {
    fc.assert(
      fc.property(fc.array(fc.double({ min: 0, max: 1, noNaN: true }), { minLength: 1, maxLength: 8 }), (p) => {
        const adjusted = holm(p)
        p.forEach((value, i) => {
          expect(adjusted[i]!).toBeGreaterThanOrEqual(value)
          expect(adjusted[i]!).toBeLessThanOrEqual(Math.min(1, value * p.length) + Math.max(...p))
          p.forEach((other, j) => {
            if (value < other) expect(adjusted[i]!).toBeLessThanOrEqual(adjusted[j]!)
          })
        })
      })
    )
  })
})

describe('the critical value of a step', () => {
  it('is the chi-square quantile: 3.841 on 1 df and 5.991 on 2 df at .05 (any table)', () => {
    expect(criticalValue({ T: 1, df: 1, p: 0.3 }, 0.3, 0.05)).toBeCloseTo(3.841, 3)
    expect(criticalValue({ T: 1, df: 2, p: 0.6 }, 0.6, 0.05)).toBeCloseTo(5.991, 3)
  })

  it('is passed by T exactly when the adjusted p is below alpha', () => {
    fc.assert(
      fc.property(
        fc.array(fc.tuple(fc.double({ min: 0.01, max: 60, noNaN: true }), fc.integer({ min: 1, max: 12 })), {
          minLength: 1,
          maxLength: 6
        }),
        (steps) => {
          const tests = steps.map(([T, df]) => normalDifference({ T, df }, { T: 0, df: 0 }))
          const adjusted = holm(tests.map((t) => t.p))
          tests.forEach((test, i) => {
            if (Math.abs(adjusted[i]! - 0.05) < 1e-9) return
            expect(test.T > criticalValue(test, adjusted[i]!, 0.05)).toBe(adjusted[i]! < 0.05)
          })
        }
      )
    )
  })
})

describe('weights of evidence', () => {
  it('for AIC differences of 0, 1.4 and 2.8 are .58, .29 and .14 (exp(-Delta/2) over its sum)', () => {
    const weights = informationWeights([202, 203.4, 204.8])
    expect(weights.map((w) => Number(w.toFixed(2)))).toEqual([0.57, 0.28, 0.14])
    expect(weights.reduce((a, b) => a + b, 0)).toBeCloseTo(1, 12)
  })

  it('do not overflow for criteria in the millions', () => {
    expect(informationWeights([5e6, 5e6 + 5000])).toEqual([1, 0])
  })
})
