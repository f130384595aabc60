/**
 * The test of one step, and what goes with a family of them (methods: section 6).
 */
import { chiSquareUpper } from '../distributions/chi-square.ts'

export interface DifferenceTest {
  T: number
  df: number
  p: number
}

/** Normal theory: T0 - T1 on df0 - df1 degrees of freedom, of a restricted model (0) against a general one (1) it is nested in. */
export function normalDifference(restricted: { T: number; df: number }, general: { T: number; df: number }): DifferenceTest {
  // Equal fits differ by rounding; a negative difference of that size is zero.
  const T = Math.max(0, restricted.T - general.T)
  const df = restricted.df - general.df
  return { T, df, p: chiSquareUpper(T, df) }
}

/** Adjusted p-values in the order given (Holm 1979): step-down, made monotone, never above 1. */
export function holm(pValues: readonly number[]): number[] {
  const order = pValues.map((_, i) => i).sort((a, b) => pValues[a]! - pValues[b]!)
  const adjusted = new Array<number>(pValues.length)
  let running = 0
  order.forEach((i, rank) => {
    running = Math.min(1, Math.max(running, pValues[i]! * (pValues.length - rank)))
    adjusted[i] = running
  })
  return adjusted
}

/**
 * The level that the adjustment left to one test, alpha p / adjusted p: at the quantile of this level the statistic would
 * stop holding, for it exceeds that quantile exactly when the adjusted p is below alpha.
 */
export function criticalLevel(p: number, adjustedP: number, alpha: number): number {
  return alpha * (adjustedP > 0 && p > 0 ? p / adjustedP : 1)
}

/**
 * Weights of evidence from an information criterion: exp(-Delta/2), scaled to sum to one
 * (Burnham & Anderson 2002; Wagenmakers & Farrell 2004).
 */
export function informationWeights(criteria: readonly number[]): number[] {
  const least = Math.min(...criteria)
  const raw = criteria.map((value) => Math.exp(-(value - least) / 2))
  const sum = raw.reduce((a, b) => a + b, 0)
  return raw.map((value) => value / sum)
}
