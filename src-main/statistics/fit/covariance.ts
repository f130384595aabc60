/**
 * The covariance matrix of the estimates (q x q), from the information the plan asks for (methods: sections 2 to 4).
 */

import { scoreCrossProducts } from '../estimation/casewise.ts'
import type { Objective } from '../estimation/normal-likelihood.ts'
import { mirrorLower, multiply, positiveInverse, submatrix } from '../matrix/symmetric.ts'
import type { CompiledModel } from '../model/compile.ts'
import type { StandardErrorKind } from './settings.ts'

/**
 * expected: (N/2 E[d2F])^-1. observed: (N/2 d2F)^-1. robust: A^-1 B A^-1 with A the observed information and B the
 * cross-products of the casewise scores (Huber 1967; White 1982). The objective must stand at the solution.
 *
 * @param rows per group, n x p with NaN where missing; needed for "robust"
 * @param held indices of the gammas on a bound: taken as fixed, their rows and columns are zero
 * @returns null when the information is not positive definite
 */
export function estimateCovariance(
  model: CompiledModel,
  objective: Objective,
  kind: StandardErrorKind,
  rows: readonly Float64Array[] | null,
  held: readonly number[] = []
): Float64Array | null {
  const q = model.parameters
  const information = new Float64Array(q * q)
  objective.derive(new Float64Array(q), information, kind === 'expected' ? 'expected' : 'observed')
  for (let k = 0; k < information.length; k++) information[k]! *= objective.total / 2
  const inverse = invertFree(information, q, held)
  if (inverse === null || kind !== 'robust') return inverse
  if (rows === null) throw new Error('robust standard errors need the rows')
  const cross = scoreCrossProducts(model, objective.states, rows)
  mirrorLower(cross, q)
  const half = new Float64Array(q * q)
  const sandwich = new Float64Array(q * q)
  multiply(inverse, cross, q, q, q, half)
  multiply(half, inverse, q, q, q, sandwich)
  return sandwich
}

/** The inverse over the gammas not held, with zeros for the held ones. */
function invertFree(information: Float64Array, q: number, held: readonly number[]): Float64Array | null {
  if (held.length === 0) return positiveInverse(information, q)
  const free = Array.from({ length: q }, (_, k) => k).filter((k) => !held.includes(k))
  const small = positiveInverse(submatrix(information, q, free), free.length)
  if (small === null) return null
  const inverse = new Float64Array(q * q)
  free.forEach((k, i) => {
    free.forEach((l, j) => {
      inverse[k * q + l] = small[i * free.length + j]!
    })
  })
  return inverse
}
