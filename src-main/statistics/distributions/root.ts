/** A function's value and slope at one point. */
export interface ValueAndSlope {
  value: number
  slope: number
}

export interface RootSearch {
  /** First point tried, strictly inside (low, high). */
  start: number
  /** The root lies in [low, high]; either may be infinite when Newton's steps are known to be tame there. */
  low: number
  high: number
  rising: boolean
  /** Rounding error of the value: below it no better point can be told apart. */
  noise: number
}

const MOST_STEPS = 300
/** A Newton step this small relative to its point leaves an error of its square. */
const SMALL_STEP = 1e-9

/**
 * The root of a monotone function by Newton's method kept inside a bracket, bisecting where a step leaves it
 * (Dahlquist & Björck 1974, section 6.3). Throws Error when it does not settle, which is a bug.
 */
export function monotoneRoot(evaluate: (point: number) => ValueAndSlope, search: RootSearch): number {
  let { start: point, low, high } = search
  for (let step = 0; step < MOST_STEPS; step++) {
    const { value, slope } = evaluate(point)
    const below = value < 0 === search.rising
    if (below) low = point
    else high = point
    const newton = point - value / slope
    const inside = newton >= low && newton <= high
    if (Math.abs(value) <= search.noise) return inside ? newton : point
    if (inside && Math.abs(newton - point) <= SMALL_STEP * Math.abs(newton)) return newton
    const next = inside ? newton : middle(low, high)
    if (next === point || high - low <= Number.EPSILON * Math.abs(next)) return next
    point = next
  }
  throw new Error(`no root found between ${search.low} and ${search.high}`)
}

/** Half-way, or a doubling (of the distance from 1) where one end is open. */
function middle(low: number, high: number): number {
  if (high === Number.POSITIVE_INFINITY) return low + Math.max(1, Math.abs(low))
  if (low === Number.NEGATIVE_INFINITY) return high - Math.max(1, Math.abs(high))
  return low + (high - low) / 2
}
