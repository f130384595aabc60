/**
 * Cases by missingness pattern: those who answered the same indicators share one factorisation in the likelihood, and
 * count only through their means and covariances (methods: section 3).
 */
import type { Pattern } from './sample-moments.ts'

export interface PatternSplit {
  /** Most frequent first. */
  patterns: Pattern[]
  /** Cases with an answer. */
  n: number
  /** Cases without any answer on these indicators, left out. */
  empty: number
}

/** @param values rows x p row-major, NaN where missing */
export function splitByPattern(values: Float64Array, p: number): PatternSplit {
  const rowsOf = new Map<string, number[]>()
  let empty = 0
  for (let start = 0; start + p <= values.length; start += p) {
    let key = ''
    for (let j = 0; j < p; j++) key += Number.isNaN(values[start + j]!) ? '0' : '1'
    if (!key.includes('1')) {
      empty++
      continue
    }
    const rows = rowsOf.get(key)
    if (rows === undefined) rowsOf.set(key, [start])
    else rows.push(start)
  }
  const patterns = [...rowsOf].map(([key, rows]) => patternMoments(values, key, rows)).sort((a, b) => b.n - a.n)
  return { patterns, n: patterns.reduce((sum, pattern) => sum + pattern.n, 0), empty }
}

function patternMoments(values: Float64Array, key: string, rows: number[]): Pattern {
  const observed = Int32Array.from([...key].flatMap((bit, j) => (bit === '1' ? [j] : [])))
  const k = observed.length
  const n = rows.length
  const mean = new Float64Array(k)
  const covariance = new Float64Array(k * k)
  for (const start of rows) for (let a = 0; a < k; a++) mean[a]! += values[start + observed[a]!]! / n
  const d = new Float64Array(k)
  for (const start of rows) {
    for (let a = 0; a < k; a++) d[a] = values[start + observed[a]!]! - mean[a]!
    for (let a = 0; a < k; a++) for (let b = 0; b <= a; b++) covariance[a * k + b]! += (d[a]! * d[b]!) / n
  }
  for (let a = 0; a < k; a++) for (let b = 0; b < a; b++) covariance[b * k + a] = covariance[a * k + b]!
  return { observed, n, mean, covariance }
}

/**
 * The first pair of indicators that no case has answered together (their covariance cannot be estimated), or a single
 * one answered by fewer than two cases; null when there is none.
 */
export function unseenPair(patterns: readonly Pattern[], p: number): [number, number] | null {
  const together = new Float64Array(p * p)
  for (const { observed, n } of patterns) for (const a of observed) for (const b of observed) together[a * p + b]! += n
  for (let a = 0; a < p; a++) for (let b = 0; b <= a; b++) if (together[a * p + b]! < 2) return [b, a]
  return null
}
