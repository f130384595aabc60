/**
 * Sample moments of weighted cases, in one pass over the cases: what a resample needs in place of the sample's own.
 *
 * The cases are moved to their mean once, beforehand, so that sums of squares lose no digits to a large mean.
 */
import { cholesky } from '../matrix/symmetric.ts'
import { splitByPattern, unseenPair } from '../moments/missing-patterns.ts'
import type { GroupMoments, Pattern, SampleMoments } from '../moments/sample-moments.ts'
import { type EmSettings, saturatedMoments } from '../moments/saturated-em.ts'

/** The cases behind one set of moments. */
export interface CaseSample {
  indicators: string[]
  /** Per group n x p row-major, NaN where missing; groups follow each other in the order of the weights. */
  groups: { name: string | null; rows: Float64Array }[]
  /** Missing answers are met pattern by pattern; false: there are none. */
  patterns: boolean
}

/** Moments under weights (one a case, all groups in order); null where they make no positive definite covariance matrix. */
export type WeightedMoments = (weights: Int32Array) => SampleMoments | null

/** Far below what T could show, and a third of the maps that the sample's own moments are given. */
const resampleEm: EmSettings = Object.freeze({ tolerance: 1e-7, maps: 2000 })

export function weightedMoments({ indicators, groups, patterns }: CaseSample): WeightedMoments {
  const p = indicators.length
  const makers = groups.map(({ name, rows }) => (patterns ? patternGroup(name, rows, p) : completeGroup(name, rows, p)))
  const sizes = groups.map(({ rows }) => rows.length / p)
  return (weights) => {
    const made: GroupMoments[] = []
    let start = 0
    for (const [g, maker] of makers.entries()) {
      const group = maker(weights.subarray(start, start + sizes[g]!))
      if (group === null) return null
      made.push(group)
      start += sizes[g]!
    }
    return { indicators, groups: made }
  }
}

type GroupMaker = (weights: Int32Array) => GroupMoments | null

function completeGroup(name: string | null, rows: Float64Array, p: number): GroupMaker {
  const block = centredBlock(
    rows,
    Array.from({ length: rows.length / p }, (_, i) => i),
    Int32Array.from({ length: p }, (_, i) => i),
    p
  )
  return (weights) => {
    const { n, mean, covariance } = blockMoments(block, weights)
    return isPositiveDefinite(covariance, p) ? { name, n, mean, covariance } : null
  }
}

function patternGroup(name: string | null, rows: Float64Array, p: number): GroupMaker {
  const blocks = casesByPattern(rows, p).map(({ observed, cases }) => centredBlock(rows, cases, observed, p))
  return (weights) => {
    const drawn = blocks.map((block) => blockMoments(block, weights)).filter((pattern) => pattern.n > 0)
    if (unseenPair(drawn, p) !== null) return null
    const { mean, covariance, converged } = saturatedMoments(drawn, p, resampleEm)
    if (!converged || !isPositiveDefinite(covariance, p)) return null
    return { name, n: drawn.reduce((sum, pattern) => sum + pattern.n, 0), mean, covariance, patterns: drawn }
  }
}

/** The cases of each pattern, by their place in the group; cases without any answer are in none. */
function casesByPattern(rows: Float64Array, p: number): { observed: Int32Array; cases: number[] }[] {
  return splitByPattern(rows, p).patterns.map(({ observed }) => {
    const answered = new Set(observed)
    const cases: number[] = []
    for (let i = 0; i < rows.length / p; i++) {
      let same = true
      for (let j = 0; j < p && same; j++) same = Number.isNaN(rows[i * p + j]!) !== answered.has(j)
      if (same) cases.push(i)
    }
    return { observed, cases }
  })
}

/** Cases that answered the same k indicators, less their mean: `values` is cases x k. */
interface CentredBlock {
  observed: Int32Array
  cases: Int32Array
  centre: Float64Array
  values: Float64Array
}

function centredBlock(rows: Float64Array, cases: readonly number[], observed: Int32Array, p: number): CentredBlock {
  const k = observed.length
  const centre = new Float64Array(k)
  for (const i of cases) for (let a = 0; a < k; a++) centre[a]! += rows[i * p + observed[a]!]! / cases.length
  const values = new Float64Array(cases.length * k)
  cases.forEach((i, at) => {
    for (let a = 0; a < k; a++) values[at * k + a] = rows[i * p + observed[a]!]! - centre[a]!
  })
  return { observed, cases: Int32Array.from(cases), centre, values }
}

/** n, mean and covariance (divisor n) under the weights; n is 0 where none of these cases was drawn. */
function blockMoments({ observed, cases, centre, values }: CentredBlock, weights: Int32Array): Pattern & { mean: Float64Array } {
  const k = observed.length
  const mean = new Float64Array(k)
  const covariance = new Float64Array(k * k)
  let n = 0
  for (let at = 0; at < cases.length; at++) {
    const weight = weights[cases[at]!]!
    if (weight === 0) continue
    n += weight
    const row = at * k
    for (let a = 0; a < k; a++) {
      const value = weight * values[row + a]!
      mean[a]! += value
      for (let b = 0; b <= a; b++) covariance[a * k + b]! += value * values[row + b]!
    }
  }
  for (let a = 0; a < k; a++) mean[a]! /= Math.max(n, 1)
  for (let a = 0; a < k; a++) {
    for (let b = 0; b <= a; b++) {
      const value = covariance[a * k + b]! / Math.max(n, 1) - mean[a]! * mean[b]!
      covariance[a * k + b] = value
      covariance[b * k + a] = value
    }
  }
  for (let a = 0; a < k; a++) mean[a]! += centre[a]!
  return { observed, n, mean, covariance }
}

/** With room to spare: fewer distinct cases than indicators leave pivots that are zero but for rounding. */
function isPositiveDefinite(covariance: Float64Array, p: number): boolean {
  const scaled = new Float64Array(p * p)
  for (let i = 0; i < p; i++) {
    for (let j = 0; j <= i; j++)
      scaled[i * p + j] = covariance[i * p + j]! / Math.sqrt(covariance[i * p + i]! * covariance[j * p + j]!)
  }
  if (!cholesky(scaled, p, scaled)) return false
  for (let i = 0; i < p; i++) if (!(scaled[i * p + i]! > 1e-5)) return false
  return true
}

/** Each case as often as it was drawn, group by group: n x p row-major. */
export function drawnRows({ indicators, groups }: CaseSample, weights: Int32Array): Float64Array[] {
  const p = indicators.length
  let start = 0
  return groups.map(({ rows }) => {
    const size = rows.length / p
    const own = weights.subarray(start, start + size)
    start += size
    const out = new Float64Array(own.reduce((sum, weight) => sum + weight, 0) * p)
    let at = 0
    for (let i = 0; i < size; i++) {
      for (let copy = 0; copy < own[i]!; copy++, at += p) out.set(rows.subarray(i * p, i * p + p), at)
    }
    return out
  })
}
