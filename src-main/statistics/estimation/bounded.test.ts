import fc from 'fast-check'
import { describe, expect, it } from 'vitest'
import { heldAtBounds, minimiseWithin } from './bounded.ts'
import type { Objective } from './normal-likelihood.ts'

/** F = 1/2 x' H x - b' x, H = A'A + I/10, whose one minimum within bounds has a known test (Karush, Kuhn & Tucker). */
function quadratic(a: number[][], b: number[]): { objective: Objective; slope: (x: Float64Array) => number[]; h: number[][] } {
  const q = b.length
  const h = b.map((_, i) => b.map((_, j) => a.reduce((sum, row) => sum + row[i]! * row[j]!, i === j ? 0.1 : 0)))
  const slope = (x: Float64Array) => h.map((row, i) => row.reduce((sum, value, j) => sum + value * x[j]!, -b[i]!))
  let at = new Float64Array(q)
  const objective: Objective = {
    parameters: q,
    total: 1,
    states: [],
    baseline: 0,
    unrestrictedLogLikelihood: 0,
    evaluate(x) {
      at = Float64Array.from(x)
      return slope(x).reduce((sum, g, i) => sum + (x[i]! * (g - b[i]!)) / 2, 0)
    },
    derive(gradient, curvature) {
      gradient.set(slope(at))
      curvature?.set(h.flat())
    }
  }
  return { objective, slope, h }
}

const size = 5
const number = fc.double({ min: -2, max: 2, noNaN: true })
const numbers = (length: number) => fc.array(number, { minLength: length, maxLength: length })

describe('the minimum within bounds', () => {
  it('of any convex quadratic meets the conditions for a minimum: within, and falling into no allowed side', () => {
    fc.assert(
      fc.property(
        fc.array(numbers(size), { minLength: size, maxLength: size }),
        numbers(size),
        numbers(size),
        numbers(size),
        (a, b, one, two) => {
          const { objective, slope, h } = quadratic(a, b)
          // The last parameter is open on both sides.
          const least = Float64Array.from(one, (v, k) => (k === size - 1 ? Number.NEGATIVE_INFINITY : Math.min(v, two[k]!)))
          const most = Float64Array.from(one, (v, k) => (k === size - 1 ? Number.POSITIVE_INFINITY : Math.max(v, two[k]!) + 0.01))
          const { gamma, stop } = minimiseWithin(objective, new Float64Array(size).fill(9), { least, most })
          expect(stop).toBe('converged')
          slope(gamma).forEach((g, k) => {
            expect(gamma[k]).toBeGreaterThanOrEqual(least[k]!)
            expect(gamma[k]).toBeLessThanOrEqual(most[k]!)
            const unit = 1e-6 * Math.sqrt(h[k]![k]!)
            if (gamma[k]! > least[k]!) expect(g).toBeLessThan(unit)
            if (gamma[k]! < most[k]!) expect(g).toBeGreaterThan(-unit)
          })
        }
      ),
      { numRuns: 300, seed: 3 }
    )
  })

  it('is the unbounded one, to the bit, where that lies within', () => {
    const { objective } = quadratic([[1, 0.5]], [0.3, 0.2])
    const start = Float64Array.of(1, 1)
    const open = minimiseWithin(objective, start, null)
    const wide = { least: Float64Array.of(-9, -9), most: Float64Array.of(9, 9) }
    expect(minimiseWithin(objective, start, wide)).toEqual(open)
    expect(heldAtBounds(wide, open.gamma)).toEqual([])
  })

  it('holds a parameter exactly on its bound, and leaves its slope in the gradient', () => {
    const { objective } = quadratic([], [-1, 1])
    const { gamma, gradient, largestGradient } = minimiseWithin(objective, Float64Array.of(3, 3), {
      least: Float64Array.of(0, 0),
      most: Float64Array.of(1, 4)
    })
    expect([...gamma]).toEqual([0, 4])
    expect(gradient[0]).toBeCloseTo(1, 12)
    expect(gradient[1]).toBeCloseTo(-0.6, 12)
    expect(largestGradient).toBe(0)
    expect(heldAtBounds({ least: Float64Array.of(0, 0), most: Float64Array.of(1, 4) }, gamma)).toEqual([0, 1])
  })

  it('lets a parameter go that was held too soon', () => {
    // The unbounded minimum (-1.02, 2.13) puts both on a bound; with the second at 0.5 the first belongs inside, at 0.45.
    const { objective, slope } = quadratic([[1, 1]], [1, 1.315])
    const bounds = { least: Float64Array.of(0, 0), most: Float64Array.of(9, 0.5) }
    const { gamma } = minimiseWithin(objective, Float64Array.of(0, 0), bounds)
    expect(gamma[1]).toBe(0.5)
    expect(gamma[0]).toBeCloseTo(0.5 / 1.1, 8)
    expect(Math.abs(slope(gamma)[0]!)).toBeLessThan(1e-8)
  })
})
