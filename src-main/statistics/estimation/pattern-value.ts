/**
 * One missingness pattern's part of the discrepancy, and the matrices its derivatives need:
 *
 *     ln|Sigma| + tr(D W)      W = Sigma^-1      Q = W D W      z = W d      D = S + d d'      d = ybar - mu
 *
 * all k x k over the indicators observed. Dense: by the Cholesky factor of Sigma, O(k^3). Where Theta is diagonal and well
 * away from zero, with C = R R', T = Theta and Lambda the observed rows (Woodbury 1950; methods: section 2), O(k^2 m):
 *
 *     K = I + R' Lambda' T^-1 Lambda R = M M'      P = T^-1 Lambda R M'^-1      H = S P      X = T^-1 H - P (P'H) / 2
 *     ln|Sigma| = ln|T| + ln|K|      W = T^-1 - P P'      Q = T^-1 S T^-1 - X P' - P X' + z z'
 */
import { cholesky, choleskyInverse, dotRows, logDeterminant, lowerOfProduct, mirrorLower, multiply } from '../matrix/symmetric.ts'
import type { GroupState } from '../model/implied-moments.ts'
import type { GroupWork, PatternWork } from './work.ts'

/** T^-1 and P P' cancel where a residual variance is small: below this share of the indicator's variance the dense way is taken. */
const leastShare = 0.02

/** Prepares Lambda R of a group at the gamma just set; whether the short way is open there (C positive definite). */
export function prepareStructure({ structure }: GroupWork, { p, m, c, lambda }: GroupState): boolean {
  if (structure === null) return false
  const { root, load } = structure
  root.set(c)
  if (!cholesky(root, m, root)) return false
  for (let i = 0; i < p; i++) {
    for (let k = 0; k < m; k++) {
      let sum = 0
      for (let l = k; l < m; l++) sum += lambda[i * m + l]! * root[l * m + k]!
      load[i * m + k] = sum
    }
  }
  return true
}

/**
 * ln|Sigma| + tr(D W) at the given moments; NaN where Sigma is not positive definite. Leaves what `prepareDerivatives` needs.
 *
 * @param mu null where d is to count as zero
 * @param structured whether sigma is the group's own, prepared by `prepareStructure`
 */
export function patternValue(
  work: GroupWork,
  pattern: PatternWork,
  sigma: Float64Array,
  mu: Float64Array | null,
  structured: boolean
): number {
  const { k, observed, d, sampleMean } = pattern
  pattern.ready = false
  if (sampleMean !== null && mu !== null) for (let i = 0; i < k; i++) d[i] = sampleMean[i]! - mu[observed[i]!]!
  else d.fill(0)
  if (structured) {
    const value = structuredValue(work, pattern, sigma)
    if (value !== null) return value
  }
  return denseValue(work, pattern, sigma)
}

function denseValue({ p, scratch }: GroupWork, pattern: PatternWork, sigma: Float64Array): number {
  const { k, observed, w, d, z, sample } = pattern
  const { chol, first } = scratch
  pattern.dense = true
  for (let i = 0; i < k; i++) {
    const row = observed[i]! * p
    for (let j = 0; j <= i; j++) chol[i * k + j] = sigma[row + observed[j]!]!
    for (let j = i + 1; j < k; j++) chol[i * k + j] = 0
  }
  if (!cholesky(chol, k, chol)) return Number.NaN
  const logDet = logDeterminant(chol, k)
  choleskyInverse(chol, k, w, first)
  multiply(w, d, k, k, 1, z)
  return logDet + dotRows(w, 0, sample, 0, k * k) + dotRows(z, 0, d, 0, k)
}

/** null where the short way would lose digits. */
function structuredValue({ p, state, structure, scratch }: GroupWork, pattern: PatternWork, sigma: Float64Array): number | null {
  const { k, observed, d, z, sample, half, image, precision } = pattern
  const { m, theta } = state
  const { load, kernel } = structure!
  const { projection } = scratch
  let value = 0
  for (let a = 0; a < k; a++) {
    const at = observed[a]! * (p + 1)
    const t = theta[at]!
    if (!(t > leastShare * sigma[at]!)) return null
    precision[a] = 1 / t
    value += Math.log(t)
  }
  kernel.fill(0)
  for (let r = 0; r < m; r++) kernel[r * m + r] = 1
  for (let a = 0; a < k; a++) {
    const row = observed[a]! * m
    for (let r = 0; r < m; r++) {
      const u = precision[a]! * load[row + r]!
      half[a * m + r] = u
      if (u !== 0) for (let s = 0; s <= r; s++) kernel[r * m + s]! += u * load[row + s]!
    }
  }
  if (!cholesky(kernel, m, kernel)) return null
  value += logDeterminant(kernel, m)
  for (let a = 0; a < k; a++) {
    for (let r = 0; r < m; r++) {
      half[a * m + r] = (half[a * m + r]! - dotRows(kernel, r * m, half, a * m, r)) / kernel[r * m + r]!
    }
  }
  multiply(sample, half, k, k, m, image)
  projection.fill(0)
  for (let a = 0; a < k; a++) {
    value += precision[a]! * sample[a * k + a]! - dotRows(half, a * m, image, a * m, m)
    for (let r = 0; r < m; r++) projection[r]! += half[a * m + r]! * d[a]!
  }
  for (let a = 0; a < k; a++) {
    z[a] = precision[a]! * d[a]! - dotRows(half, a * m, projection, 0, m)
    value += d[a]! * z[a]!
  }
  pattern.dense = false
  return value
}

/** Fills W and Q (k x k, whole) of the pattern at the gamma last evaluated. */
export function prepareDerivatives(work: GroupWork, pattern: PatternWork): void {
  if (pattern.ready) return
  if (pattern.dense) denseSquare(work, pattern)
  else structuredSquare(work, pattern)
  mirrorLower(pattern.q, pattern.k)
  pattern.ready = true
}

function denseSquare({ scratch }: GroupWork, { k, w, q, z, sample }: PatternWork): void {
  const { chol } = scratch
  multiply(w, sample, k, k, k, chol)
  lowerOfProduct(chol, w, k, q)
  for (let i = 0; i < k; i++) for (let j = 0; j <= i; j++) q[i * k + j]! += z[i]! * z[j]!
}

function structuredSquare({ state, structure }: GroupWork, { k, w, q, z, sample, half, image, precision }: PatternWork): void {
  const { m } = state
  const { kernel } = structure!
  for (let r = 0; r < m; r++) {
    for (let s = 0; s < m; s++) {
      let sum = 0
      for (let a = 0; a < k; a++) sum += half[a * m + r]! * image[a * m + s]!
      kernel[r * m + s] = sum / 2
    }
  }
  for (let a = 0; a < k; a++) {
    for (let r = 0; r < m; r++) image[a * m + r] = precision[a]! * image[a * m + r]! - dotRows(half, a * m, kernel, r * m, m)
  }
  for (let i = 0; i < k; i++) {
    const ti = precision[i]!
    for (let j = 0; j <= i; j++) {
      let overlap = 0
      let cross = z[i]! * z[j]! + ti * precision[j]! * sample[i * k + j]!
      for (let r = 0; r < m; r++) {
        const pi = half[i * m + r]!
        const pj = half[j * m + r]!
        overlap += pi * pj
        cross -= image[i * m + r]! * pj + pi * image[j * m + r]!
      }
      w[i * k + j] = -overlap
      q[i * k + j] = cross
    }
    w[i * k + i]! += ti
  }
  mirrorLower(w, k)
}
