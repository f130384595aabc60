/**
 * How much it matters that an indicator is not measured alike: dMACS (Nye & Drasgow 2011) and the score difference to expect.
 *
 *     d(eta) = delta_nu + delta_lambda' eta     delta = reference minus focal
 *     dMACS  = sqrt( E[d(eta)^2] ) / SD = sqrt( (delta_nu + delta_lambda' kappa)^2 + delta_lambda' Phi delta_lambda ) / SD
 *
 * with the focal group's factor means kappa and covariances Phi. SD is pooled over the two groups, each weighted by n - 1:
 * the mean of the two standard deviations as Nye & Drasgow print it, or (`dmacsPooledVariance`) the root of the mean variance.
 */
import { groupPairs } from './anchors.ts'

/** One group of a fitted model, with its indicators' standard deviations in the sample (divisor n - 1). */
export interface MeasuredGroup {
  name: string | null
  /** Cases. */
  n: number
  /** p x m */
  lambda: Float64Array
  /** p */
  nu: Float64Array
  /** m: E(eta) */
  factorMean: Float64Array
  /** m x m: Var(eta) */
  factorCovariance: Float64Array
  /** p */
  sd: Float64Array
}

export interface EffectSize {
  indicator: string
  reference: string | null
  focal: string | null
  /** Reference minus focal. */
  interceptDifference: number
  /** Reference minus focal, for each factor on which it loads in either group. */
  loadingDifferences: { factor: string; difference: number }[]
  /** Null where the focal factor variances are improper. */
  dmacs: number | null
  dmacsPooledVariance: number | null
  /** The expected difference over the pooled SD: dMACS with a sign, in which differences at high and low standings may cancel. */
  signed: number
  /** On the indicator's own scale: what members of the focal group would score more if the reference group's measurement held for them. */
  expectedDifference: number
  /** On the indicator's own scale: root of the mean squared difference. */
  rootMeanSquare: number | null
  pooledSd: number
}

/** Every indicator in every pair of groups; the earlier group is the reference. */
export function effectSizes(
  indicators: readonly string[],
  factors: readonly string[],
  groups: readonly MeasuredGroup[]
): EffectSize[] {
  return groupPairs(groups.length).flatMap(([r, f]) =>
    indicators.map((indicator, i) => effectSize(indicator, i, factors, groups[r]!, groups[f]!))
  )
}

function effectSize(
  indicator: string,
  i: number,
  factors: readonly string[],
  reference: MeasuredGroup,
  focal: MeasuredGroup
): EffectSize {
  const m = factors.length
  const loading = (group: MeasuredGroup, k: number) => group.lambda[i * m + k]!
  const delta = factors.map((_, k) => loading(reference, k) - loading(focal, k))
  const intercept = reference.nu[i]! - focal.nu[i]!
  let expected = intercept
  let spread = 0
  for (let k = 0; k < m; k++) {
    expected += delta[k]! * focal.factorMean[k]!
    for (let l = 0; l < m; l++) spread += delta[k]! * delta[l]! * focal.factorCovariance[k * m + l]!
  }
  const square = expected * expected + spread
  const rootMeanSquare = square >= 0 ? Math.sqrt(square) : null
  const pooledSd = weightedMean(reference, focal, (group) => group.sd[i]!)
  const pooledRoot = Math.sqrt(weightedMean(reference, focal, (group) => group.sd[i]! ** 2))
  return {
    indicator,
    reference: reference.name,
    focal: focal.name,
    interceptDifference: intercept,
    loadingDifferences: factors.flatMap((factor, k) =>
      loading(reference, k) === 0 && loading(focal, k) === 0 ? [] : [{ factor, difference: delta[k]! }]
    ),
    dmacs: rootMeanSquare === null ? null : rootMeanSquare / pooledSd,
    dmacsPooledVariance: rootMeanSquare === null ? null : rootMeanSquare / pooledRoot,
    signed: expected / pooledSd,
    expectedDifference: expected,
    rootMeanSquare,
    pooledSd
  }
}

function weightedMean(one: MeasuredGroup, other: MeasuredGroup, value: (group: MeasuredGroup) => number): number {
  return ((one.n - 1) * value(one) + (other.n - 1) * value(other)) / (one.n + other.n - 2)
}
