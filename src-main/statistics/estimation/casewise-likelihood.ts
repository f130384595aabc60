/**
 * Each case's own log-likelihood under a fitted model, complete or with missing answers:
 *
 *     l_i = -1/2 [ k ln(2 pi) + ln|Sigma_k| + d' Sigma_k^-1 d ]     d = y_i - mu, over the k indicators that the case answered
 */
import { cholesky, dotRows, logDeterminant } from '../matrix/symmetric.ts'
import type { GroupState } from '../model/implied-moments.ts'
import { rowsByPattern } from './casewise.ts'

/**
 * Per group n values in the order of the rows; 0 for a case without any answer.
 *
 * @param states the groups' matrices at the gamma wanted; mu must be modelled
 * @param rows per group n x p row-major, NaN where missing
 * Throws a plain Error when Sigma is not positive definite: `states` must be a solution.
 */
export function casewiseLogLikelihoods(states: readonly GroupState[], rows: readonly Float64Array[]): Float64Array[] {
  return states.map((state, g) => groupLogLikelihoods(state, rows[g]!))
}

function groupLogLikelihoods({ p, sigma, mu }: GroupState, rows: Float64Array): Float64Array {
  const values = new Float64Array(rows.length / p)
  for (const { observed, starts } of rowsByPattern(rows, p)) {
    const k = observed.length
    if (k === 0) continue
    const factor = new Float64Array(k * k)
    for (let a = 0; a < k; a++) for (let b = 0; b <= a; b++) factor[a * k + b] = sigma[observed[a]! * p + observed[b]!]!
    if (!cholesky(factor, k, factor)) throw new Error('an implied covariance matrix is not positive definite')
    const constant = k * Math.log(2 * Math.PI) + logDeterminant(factor, k)
    const e = new Float64Array(k)
    for (const start of starts) {
      // e = L^-1 d, so that e'e is the distance
      for (let a = 0; a < k; a++) {
        const d = rows[start + observed[a]!]! - mu[observed[a]!]!
        e[a] = (d - dotRows(factor, a * k, e, 0, a)) / factor[a * k + a]!
      }
      values[start / p] = -(constant + dotRows(e, 0, e, 0, k)) / 2
    }
  }
  return values
}
