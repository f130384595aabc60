/**
 * Unrestricted means and covariances with missing answers, by EM (Little & Rubin 2002, ch. 11), with the squared
 * extrapolation of Varadhan & Roland (2008): a step of two EM maps is stretched along its own curvature and kept only
 * where it stays positive definite and raises the likelihood.
 */
import { cholesky, choleskyInverse, choleskySolve, dotRows, logDeterminant, multiply } from '../matrix/symmetric.ts'
import type { Pattern } from './sample-moments.ts'

export interface SaturatedMoments {
  mean: Float64Array
  /** p x p, divisor n */
  covariance: Float64Array
  /** EM maps made. */
  maps: number
  /** Whether the last map moved nothing by more than the tolerance, in units of the indicators' standard deviations. */
  converged: boolean
}

export interface EmSettings {
  readonly tolerance: number
  readonly maps: number
}

export const ordinaryEm: EmSettings = Object.freeze({ tolerance: 1e-10, maps: 5000 })

/** theta = (mean, covariance) as one vector of p + p^2 numbers. */
type Theta = Float64Array

export function saturatedMoments(patterns: readonly Pattern[], p: number, settings: EmSettings = ordinaryEm): SaturatedMoments {
  let theta = firstGuess(patterns, p)
  let maps = 0
  let converged = false
  while (maps < settings.maps) {
    const one = emMap(patterns, p, theta)
    maps++
    if (distance(one, theta, p) < settings.tolerance) {
      theta = one
      converged = true
      break
    }
    const two = emMap(patterns, p, one)
    maps++
    theta = extrapolated(patterns, p, theta, one, two)
  }
  return { mean: theta.slice(0, p), covariance: theta.slice(p), maps, converged }
}

/** Means and variances of what was answered, no covariance: positive definite whatever the pattern. */
function firstGuess(patterns: readonly Pattern[], p: number): Theta {
  const n = new Float64Array(p)
  const theta = new Float64Array(p + p * p)
  for (const pattern of patterns) {
    pattern.observed.forEach((i, a) => {
      n[i]! += pattern.n
      theta[i]! += pattern.n * pattern.mean![a]!
    })
  }
  for (let i = 0; i < p; i++) theta[i]! /= Math.max(n[i]!, 1)
  for (const pattern of patterns) {
    const k = pattern.observed.length
    pattern.observed.forEach((i, a) => {
      theta[p + i * p + i]! += (pattern.n * (pattern.covariance[a * k + a]! + (pattern.mean![a]! - theta[i]!) ** 2)) / n[i]!
    })
  }
  return theta
}

/** One E and M step: expected sums and squares of the completed data, pattern by pattern. */
function emMap(patterns: readonly Pattern[], p: number, theta: Theta): Theta {
  const next = new Float64Array(p + p * p)
  const total = patterns.reduce((sum, pattern) => sum + pattern.n, 0)
  for (const pattern of patterns) addExpected(pattern, p, theta, pattern.n / total, next)
  for (let i = 0; i < p; i++) for (let j = 0; j < p; j++) next[p + i * p + j]! -= (next[i]! - theta[i]!) * (next[j]! - theta[j]!)
  return next
}

/**
 * Adds share times the completed mean and the completed second moments about the old mean. Observed ones count as they are;
 * with R = Sigma_mo Sigma_oo^-1, missing deviations are R d_o, and missing ones add Sigma_mm - R Sigma_om.
 */
function addExpected(pattern: Pattern, p: number, theta: Theta, share: number, next: Theta): void {
  const { observed, mean, covariance } = pattern
  const k = observed.length
  const d = Float64Array.from(observed, (i, a) => mean![a]! - theta[i]!)
  const second = Float64Array.from(covariance)
  for (let a = 0; a < k; a++) {
    const row = p + observed[a]! * p
    next[observed[a]!]! += share * mean![a]!
    for (let b = 0; b < k; b++) {
      second[a * k + b]! += d[a]! * d[b]!
      next[row + observed[b]!]! += share * second[a * k + b]!
    }
  }
  if (k === p) return
  const missing = missingOf(observed, p)
  const r = regression(theta, p, observed, missing)
  const half = new Float64Array(missing.length * k)
  multiply(r, second, missing.length, k, k, half)
  missing.forEach((i, at) => {
    next[i]! += share * (theta[i]! + dotRows(r, at * k, d, 0, k))
    for (let a = 0; a < k; a++) {
      next[p + i * p + observed[a]!]! += share * half[at * k + a]!
      next[p + observed[a]! * p + i]! += share * half[at * k + a]!
    }
    missing.forEach((j, to) => {
      let value = theta[p + i * p + j]! + dotRows(half, at * k, r, to * k, k)
      for (let a = 0; a < k; a++) value -= r[at * k + a]! * theta[p + observed[a]! * p + j]!
      next[p + i * p + j]! += share * value
    })
  })
}

function missingOf(observed: Int32Array, p: number): Int32Array {
  const seen = new Uint8Array(p)
  for (const i of observed) seen[i] = 1
  return Int32Array.from(seen.keys()).filter((i) => seen[i] === 0)
}

/** R = Sigma_mo Sigma_oo^-1, a row for each missing indicator. */
function regression(theta: Theta, p: number, observed: Int32Array, missing: Int32Array): Float64Array {
  const k = observed.length
  const factor = observedFactor(theta, p, observed)
  if (factor === null) throw new Error('an EM step left the positive definite matrices')
  const r = new Float64Array(missing.length * k)
  missing.forEach((i, at) => {
    const row = r.subarray(at * k, (at + 1) * k)
    for (let a = 0; a < k; a++) row[a] = theta[p + i * p + observed[a]!]!
    choleskySolve(factor, k, row)
  })
  return r
}

/** Lower Cholesky factor of Sigma_oo; null where that is not positive definite. */
function observedFactor(theta: Theta, p: number, observed: Int32Array): Float64Array | null {
  const k = observed.length
  const factor = new Float64Array(k * k)
  for (let a = 0; a < k; a++) for (let b = 0; b <= a; b++) factor[a * k + b] = theta[p + observed[a]! * p + observed[b]!]!
  return cholesky(factor, k, factor) ? factor : null
}

/** theta - 2 a r + a^2 v with a = -|r|/|v|, where that is allowed; else the plain second map. */
function extrapolated(patterns: readonly Pattern[], p: number, theta: Theta, one: Theta, two: Theta): Theta {
  let rr = 0
  let vv = 0
  for (let k = 0; k < theta.length; k++) {
    const r = one[k]! - theta[k]!
    const v = two[k]! - one[k]! - r
    rr += r * r
    vv += v * v
  }
  const a = vv > 0 ? -Math.sqrt(rr / vv) : -1
  if (a >= -1) return two
  const stretched = theta.map((value, k) => value - 2 * a * (one[k]! - value) + a * a * (two[k]! - 2 * one[k]! + value))
  return discrepancy(patterns, p, stretched) <= discrepancy(patterns, p, two) ? stretched : two
}

/** sum_k n_k [ln|Sigma_k| + tr(D_k W_k)]; Infinity outside the positive definite matrices. */
function discrepancy(patterns: readonly Pattern[], p: number, theta: Theta): number {
  let sum = 0
  for (const { observed, n, mean, covariance } of patterns) {
    const k = observed.length
    const factor = observedFactor(theta, p, observed)
    if (factor === null) return Number.POSITIVE_INFINITY
    const logDet = logDeterminant(factor, k)
    const inverse = new Float64Array(k * k)
    choleskyInverse(factor, k, inverse, new Int32Array(k))
    const d = Float64Array.from(observed, (i, a) => mean![a]! - theta[i]!)
    let trace = dotRows(inverse, 0, covariance, 0, k * k)
    for (let a = 0; a < k; a++) trace += d[a]! * dotRows(inverse, a * k, d, 0, k)
    sum += n * (logDet + trace)
  }
  return sum
}

/** Largest move of a mean or covariance, in standard deviations. */
function distance(a: Theta, b: Theta, p: number): number {
  let largest = 0
  for (let i = 0; i < p; i++) {
    const si = Math.sqrt(b[p + i * p + i]!)
    largest = Math.max(largest, Math.abs(a[i]! - b[i]!) / si)
    for (let j = 0; j <= i; j++) {
      const at = p + i * p + j
      largest = Math.max(largest, Math.abs(a[at]! - b[at]!) / (si * Math.sqrt(b[p + j * p + j]!)))
    }
  }
  return largest
}
