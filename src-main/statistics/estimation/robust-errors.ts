/**
 * Covariance matrix of the estimates that does not rest on normal data: the "sandwich" A^-1 B A^-1
 * (Huber 1967; White 1982; methods: section 4), for complete data.
 *
 * A is the information of the sample (expected by default; the observed one may be given instead), B the sum of
 * cross-products of casewise derivatives, of which there are two kinds:
 *
 *     cases     the scores of the cases, centred at the model's means: the sandwich of the sources above, the default
 *     moments   N Delta'V Gamma V Delta, centred at the sample means (Satorra & Bentler 1994). It equals the first where
 *               means are saturated and differs in small samples where they are restricted
 */
import { positiveInverse } from '../matrix/symmetric.ts'
import type { CompiledModel } from '../model/compile.ts'
import type { GroupState } from '../model/implied-moments.ts'
import { addCross, type CaseGroup, caseSums, momentSums } from './robust-scores.ts'

export interface RobustInput {
  model: CompiledModel
  /** Per group, the matrices at the solution. */
  states: readonly GroupState[]
  /** Per group, the cases that the model was fitted to. */
  groups: readonly CaseGroup[]
  /** A, q x q, lower triangle: (N/2) times the second derivatives of F, expected or observed. */
  information: Float64Array
  derivatives?: 'cases' | 'moments'
}

/** q x q, whole; null when the information is not positive definite. */
export function robustCovariance(input: RobustInput): Float64Array | null {
  const q = input.model.parameters
  const inverse = positiveInverse(input.information, q)
  return inverse === null ? null : between(inverse, crossProducts(input), q)
}

/** B, q x q, lower triangle. */
function crossProducts({ model, states, groups, derivatives = 'cases' }: RobustInput): Float64Array {
  const q = model.parameters
  const meat = new Float64Array(q * q)
  groups.forEach(({ rows, size }, g) => {
    const state = states[g]!
    // Without modelled means there is nothing but the sample mean to take deviations from.
    const atModel = derivatives === 'cases' && model.meanStructure
    const sums = atModel ? caseSums(model, g, state, rows, state.mu) : momentSums(model, g, state, rows)
    addCross(sums, size, meat, q)
  })
  return meat
}

/** outer * inner * outer, outer whole and symmetric, inner a lower triangle; O(q^3). */
function between(outer: Float64Array, inner: Float64Array, q: number): Float64Array {
  const half = new Float64Array(q * q)
  for (let i = 0; i < q; i++) {
    for (let k = 0; k < q; k++) {
      const value = outer[i * q + k]!
      if (value === 0) continue
      for (let j = 0; j < q; j++) half[i * q + j]! += value * inner[Math.max(k, j) * q + Math.min(k, j)]!
    }
  }
  const out = new Float64Array(q * q)
  for (let i = 0; i < q; i++) {
    for (let j = 0; j <= i; j++) {
      let sum = 0
      for (let k = 0; k < q; k++) sum += half[i * q + k]! * outer[j * q + k]!
      out[i * q + j] = sum
      out[j * q + i] = sum
    }
  }
  return out
}
