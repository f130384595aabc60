/**
 * Case by case: the gradient of each row's log-likelihood, complete or with missing answers, for sandwich errors, scaled
 * statistics and tests of models that are not nested. With x = B' z~, z = W_k (y_k - mu_k), in the columns of
 * cell-columns.ts:
 *
 *     d l_i / d cell = c (x_u x_v - G[u,v]) + w x_s
 */
import { cholesky, choleskyInverse, dotRows, multiply } from '../matrix/symmetric.ts'
import type { CompiledModel } from '../model/compile.ts'
import type { GroupState } from '../model/implied-moments.ts'
import { cellColumns, sideBySide, wholeForm } from './cell-columns.ts'

/**
 * Calls `visit` once a row with the row's score (q, reused between calls).
 *
 * @param states the groups' matrices at the gamma wanted
 * @param rows per group n x p row-major, NaN where missing; a row without any answer has a score of zero
 */
export function casewiseScores(
  model: CompiledModel,
  states: readonly GroupState[],
  rows: readonly Float64Array[],
  visit: (score: Float64Array, group: number, row: number) => void
): void {
  const score = new Float64Array(model.parameters)
  model.groups.forEach((_, g) => {
    const scorer = groupScorer(model, g, states[g]!)
    const p = model.indicators.length
    for (const { observed, starts } of rowsByPattern(rows[g]!, p)) {
      scorer.prepare(observed)
      for (const start of starts) {
        scorer.score(rows[g]!, start, score)
        visit(score, g, start / p)
      }
    }
  })
}

/** sum over all rows of score score' (q x q, lower triangle): the cross-product information B. Four rows are added at once. */
export function scoreCrossProducts(
  model: CompiledModel,
  states: readonly GroupState[],
  rows: readonly Float64Array[]
): Float64Array {
  const q = model.parameters
  const sum = new Float64Array(q * q)
  const four = [new Float64Array(q), new Float64Array(q), new Float64Array(q), new Float64Array(q)] as const
  let kept = 0
  casewiseScores(model, states, rows, (score) => {
    four[kept]!.set(score)
    kept = (kept + 1) % 4
    if (kept === 0) addOuterProducts(four, q, sum)
  })
  for (let k = kept; k < 4; k++) four[k]!.fill(0)
  if (kept > 0) addOuterProducts(four, q, sum)
  return sum
}

type Four = readonly [Float64Array, Float64Array, Float64Array, Float64Array]

function addOuterProducts([a, b, c, d]: Four, q: number, sum: Float64Array): void {
  for (let i = 0; i < q; i++) {
    const ai = a[i]!
    const bi = b[i]!
    const ci = c[i]!
    const di = d[i]!
    if (ai === 0 && bi === 0 && ci === 0 && di === 0) continue
    const row = i * q
    for (let j = 0; j <= i; j++) sum[row + j]! += ai * a[j]! + bi * b[j]! + ci * c[j]! + di * d[j]!
  }
}

/** Row offsets by answered indicators, so that rows of one pattern share one factorisation. */
export function rowsByPattern(values: Float64Array, p: number): { observed: Int32Array; starts: number[] }[] {
  const found = new Map<string, number[]>()
  for (let start = 0; start + p <= values.length; start += p) {
    let key = ''
    for (let j = 0; j < p; j++) key += Number.isNaN(values[start + j]!) ? '0' : '1'
    const starts = found.get(key)
    if (starts === undefined) found.set(key, [start])
    else starts.push(start)
  }
  return [...found].map(([key, starts]) => ({
    observed: Int32Array.from([...key].flatMap((bit, j) => (bit === '1' ? [j] : []))),
    starts
  }))
}

interface Scorer {
  prepare(observed: Int32Array): void
  score(values: Float64Array, start: number, score: Float64Array): void
}

function groupScorer(model: CompiledModel, g: number, state: GroupState): Scorer {
  const { p, m } = state
  const size = p + 2 * m
  const group = model.groups[g]!
  const { u, v, c, s, meanFactor } = cellColumns(group, p, m, model.meanStructure)
  const columns = new Float64Array(p * 2 * m)
  sideBySide(state, columns)
  const padded = new Float64Array(p * p)
  const gram = new Float64Array(size * size)
  const product = new Float64Array(p * 2 * m)
  const d = new Float64Array(p)
  const z = new Float64Array(p)
  const x = new Float64Array(size)
  const weight = Float64Array.from(meanFactor, (k) => (k < 0 ? 1 : state.factorMean[k]!))
  const expected = new Float64Array(u.length)
  // By columns, so that a column of B stands along memory.
  const byColumn = new Float64Array(p * 2 * m)
  for (let i = 0; i < p; i++) for (let k = 0; k < 2 * m; k++) byColumn[k * p + i] = columns[i * 2 * m + k]!
  let seen = new Int32Array()
  return {
    prepare(observed) {
      seen = Int32Array.from(observed)
      paddedInverse(state.sigma, p, observed, padded)
      wholeForm(padded, columns, p, size, product, gram)
      for (let i = 0; i < u.length; i++) expected[i] = u[i]! < 0 ? 0 : c[i]! * gram[u[i]! * size + v[i]!]!
    },
    score(values, start, score) {
      d.fill(0)
      for (const i of seen) d[i] = values[start + i]! - state.mu[i]!
      multiply(padded, d, p, p, 1, z)
      x.set(z)
      for (let k = 0; k < 2 * m; k++) x[p + k] = dotRows(byColumn, k * p, z, 0, p)
      score.fill(0)
      for (let i = 0; i < u.length; i++) {
        let value = u[i]! < 0 ? 0 : c[i]! * x[u[i]!]! * x[v[i]!]! - expected[i]!
        if (s[i]! >= 0) value += weight[i]! * x[s[i]!]!
        const { gammas, weights } = group.free[i]!
        for (let k = 0; k < gammas.length; k++) score[gammas[k]!]! += weights[k]! * value
      }
    }
  }
}

/** (Sigma of the observed)^-1, padded by zeros to p x p. */
function paddedInverse(sigma: Float64Array, p: number, observed: Int32Array, padded: Float64Array): void {
  const k = observed.length
  padded.fill(0)
  if (k === 0) return
  const factor = new Float64Array(k * k)
  for (let a = 0; a < k; a++) for (let b = 0; b <= a; b++) factor[a * k + b] = sigma[observed[a]! * p + observed[b]!]!
  if (!cholesky(factor, k, factor)) throw new Error('an implied covariance matrix is not positive definite')
  const inverse = new Float64Array(k * k)
  choleskyInverse(factor, k, inverse, new Int32Array(k))
  for (let a = 0; a < k; a++) for (let b = 0; b < k; b++) padded[observed[a]! * p + observed[b]!] = inverse[a * k + b]!
}
