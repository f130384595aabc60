/**
 * The scaling factor of the mean-scaled statistic for complete data (Satorra & Bentler 1994; methods: section 4):
 *
 *     c = tr(U Gamma) / df      T_scaled = T / c
 *     tr(U Gamma) = tr(V Gamma) - tr[(Delta'V Delta)^-1 Delta'V Gamma V Delta]
 *
 * at the model-implied moments. Neither Gamma nor V is formed: with e = y - ybar and W = Sigma^-1, in each group
 *
 *     tr(V Gamma) = tr(W S) + 1/2 [ mean (e'We)^2 - tr(W S W S) ]
 *
 * and Delta'V Gamma V Delta is the covariance matrix of the casewise derivatives (robust-scores.ts). Groups: V is weighted
 * by n_g / N and Gamma by N / n_g. tr(W S) is of the means and is counted only where means are modelled. Gamma has
 * divisor n. Time O(n (p^2 + q^2) + p^3 + q^3).
 */
import { chiSquareUpper } from '../distributions/chi-square.ts'
import { multiply, positiveInverse } from '../matrix/symmetric.ts'
import type { CompiledModel } from '../model/compile.ts'
import type { GroupState } from '../model/implied-moments.ts'
import { completeCaseMoments } from '../moments/sample-moments.ts'
import { addCross, type CaseGroup, type MomentSums, momentSums } from './robust-scores.ts'

export interface ScalingInput {
  model: CompiledModel
  /** Per group, the matrices at the solution. */
  states: readonly GroupState[]
  /** Per group, the cases that the model was fitted to. */
  groups: readonly CaseGroup[]
  /** Expected second derivatives of F at the solution, q x q, lower triangle: 2 Delta'V Delta. */
  curvature: Float64Array
}

/** What difference tests need of a model beside its T. */
export interface Scaling {
  /** tr(U Gamma) */
  trace: number
  df: number
  /** c; above 1 where tails are heavier than normal */
  scaling: number
}

export interface ScaledStatistic extends Scaling {
  /** T / c */
  T: number
  /** P(chi2_df >= T / c) */
  p: number
}

/** T / c with its p; null where c is not defined (see `scalingFactor`). */
export function scaledStatistic(T: number, input: ScalingInput): ScaledStatistic | null {
  const scaling = scalingFactor(input)
  if (scaling === null) return null
  const scaled = T / scaling.scaling
  return { ...scaling, T: scaled, p: chiSquareUpper(scaled, scaling.df) }
}

/** c of a model; null without degrees of freedom, with a singular information, or where no variation is left (c not above 0). */
export function scalingFactor({ model, states, groups, curvature }: ScalingInput): Scaling | null {
  const q = model.parameters
  if (model.df <= 0) return null
  const inverse = positiveInverse(curvature, q)
  if (inverse === null) return null
  const total = groups.reduce((sum, group) => sum + group.size, 0)
  const meat = new Float64Array(q * q)
  let trace = 0
  groups.forEach(({ rows, size }, g) => {
    const sums = momentSums(model, g, states[g]!, rows)
    trace += traceOfGroup(sums, states[g]!.p, model.meanStructure)
    addCross(sums, size / total, meat, q)
  })
  // (Delta'V Delta)^-1 is twice the inverse of the curvature.
  for (let i = 0; i < q; i++) {
    for (let j = 0; j <= i; j++) trace -= (i === j ? 2 : 4) * inverse[i * q + j]! * meat[i * q + j]!
  }
  return scalingOf(trace, model.df)
}

/**
 * c of the baseline, all covariances zero and variances and means free. Its tr(U Gamma) has a closed form, the sum over
 * groups and pairs of indicators of the variance of the product of the two standardised indicators.
 *
 * @returns null where c is not above 0, or for one indicator (no degrees of freedom)
 */
export function baselineScaling(groups: readonly CaseGroup[], p: number): Scaling | null {
  let trace = 0
  for (const { rows } of groups) trace += variancesOfProducts(rows, p)
  return scalingOf(trace, (groups.length * p * (p - 1)) / 2)
}

function scalingOf(trace: number, df: number): Scaling | null {
  return df > 0 && trace > 1e-12 * df ? { trace, df, scaling: trace / df } : null
}

/** tr(V Gamma) of one group. */
function traceOfGroup({ w, covariance, distance, distanceSquared }: MomentSums, p: number, means: boolean): number {
  const ws = new Float64Array(p * p)
  multiply(w, covariance, p, p, p, ws)
  let square = 0
  for (let i = 0; i < p; i++) for (let j = 0; j < p; j++) square += ws[i * p + j]! * ws[j * p + i]!
  return (means ? distance : 0) + (distanceSquared - square) / 2
}

/**
 * sum over j < k of mean(z_j^2 z_k^2) - r_jk^2, z the standardised indicators. By cases: sum over j < k of z_j^2 z_k^2 is
 * half of (sum z^2)^2 - sum z^4, so that only r needs the pairs.
 */
function variancesOfProducts(rows: Float64Array, p: number): number {
  const { n, mean, covariance: s } = completeCaseMoments(rows, p)
  let products = 0
  for (let start = 0; start < rows.length; start += p) {
    let squares = 0
    let fourths = 0
    for (let j = 0; j < p; j++) {
      const z2 = (rows[start + j]! - mean[j]!) ** 2 / s[j * p + j]!
      squares += z2
      fourths += z2 * z2
    }
    products += (squares * squares - fourths) / 2
  }
  let correlations = 0
  for (let j = 0; j < p; j++) for (let k = 0; k < j; k++) correlations += s[j * p + k]! ** 2 / (s[j * p + j]! * s[k * p + k]!)
  return products / n - correlations
}
