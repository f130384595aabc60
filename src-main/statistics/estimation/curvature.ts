/**
 * Second derivatives of one group's F, by index, into the lower triangle of a q x q matrix.
 *
 * With G = B' W~ B of a pattern, expected (methods: section 2):
 *
 *     2 c1 c2 (G[u1,u2] G[v1,v2] + G[u1,v2] G[v1,u2]) + 2 w1 w2 G[s1,s2]
 *
 * Observed, with R = B' Q~ B, Q = W D W, y = B' z~ and the derivatives of Sigma and mu of second order:
 *
 *     2 tr(dSigma1 W dSigma2 Q) - tr(W dSigma1 W dSigma2) + tr(Omega d2Sigma)
 *       + 2 [dmu2' W dSigma1 z + dmu1' W dSigma2 z + dmu1' W dmu2 - d2mu' z]
 */
import type { CompiledGroup } from '../model/compile.ts'
import { columnDot, wholeForm } from './cell-columns.ts'
import { addSecondOrder } from './second-order.ts'
import type { GroupWork, PatternWork } from './work.ts'

/** Adds this group's expected second derivatives; the gradient must have been made before (it leaves W, [E, L] and the mean weights). */
export function addExpectedCurvature(work: GroupWork, curvature: Float64Array, q: number): void {
  const { form: gram, size, c, s, meanWeight } = work
  const count = c.length
  work.pairs ??= new Float64Array(count * count)
  const pairs = work.pairs.fill(0)
  const moving = indicesWhere(count, (i) => c[i]! !== 0)
  const shifting = indicesWhere(count, (i) => s[i]! >= 0 && meanWeight[i]! !== 0)
  for (const pattern of work.patterns) {
    pad(pattern, pattern.w, work.p, work.padded)
    wholeForm(work.padded, work.columns, work.p, size, work.product, gram)
    const weight = 2 * work.weight * pattern.share
    addCovariancePairs(work, moving, weight, pairs)
    for (let x = 0; x < shifting.length; x++) {
      const i = shifting[x]!
      const row = s[i]! * size
      const factor = weight * meanWeight[i]!
      for (let y = 0; y <= x; y++) {
        const j = shifting[y]!
        pairs[i * count + j]! += factor * meanWeight[j]! * gram[row + s[j]!]!
      }
    }
  }
  for (let i = 0; i < count; i++) {
    for (let j = 0; j <= i; j++) {
      const value = pairs[i * count + j]!
      if (value !== 0) addPair(work, curvature, q, i, j, value)
    }
  }
}

/** pairs (lower triangle) += weight c1 c2 (G[u1,u2] G[v1,v2] + G[u1,v2] G[v1,u2]) over the cells that move Sigma. */
function addCovariancePairs(
  { form: gram, size, u, v, c }: GroupWork,
  moving: Int32Array,
  weight: number,
  pairs: Float64Array
): void {
  const count = c.length
  for (let x = 0; x < moving.length; x++) {
    const i = moving[x]!
    const ui = u[i]! * size
    const vi = v[i]! * size
    const factor = weight * c[i]!
    const row = i * count
    for (let y = 0; y <= x; y++) {
      const j = moving[y]!
      const uj = u[j]!
      const vj = v[j]!
      pairs[row + j]! += factor * c[j]! * (gram[ui + uj]! * gram[vi + vj]! + gram[ui + vj]! * gram[vi + uj]!)
    }
  }
}

function indicesWhere(count: number, holds: (i: number) => boolean): Int32Array {
  const found: number[] = []
  for (let i = 0; i < count; i++) if (holds(i)) found.push(i)
  return Int32Array.from(found)
}

/** Adds this group's observed second derivatives; the gradient must have been made before. */
export function addObservedCurvature(work: GroupWork, curvature: Float64Array, q: number): void {
  const { p, size, u, v, c, s, meanWeight, columns } = work
  const gram = new Float64Array(size * size)
  const square = new Float64Array(size * size)
  const y = new Float64Array(size)
  const z = new Float64Array(p)
  for (const pattern of work.patterns) {
    pad(pattern, pattern.w, p, work.padded)
    wholeForm(work.padded, columns, p, size, work.product, gram)
    pad(pattern, pattern.q, p, work.padded)
    wholeForm(work.padded, columns, p, size, work.product, square)
    z.fill(0)
    for (let i = 0; i < pattern.k; i++) z[pattern.observed[i]!] = pattern.z[i]!
    for (let k = 0; k < size; k++) y[k] = columnDot(z, columns, p, size - p, k)
    const weight = work.weight * pattern.share
    for (let i = 0; i < u.length; i++) {
      for (let j = 0; j <= i; j++) {
        let value = 0
        if (c[i]! !== 0 && c[j]! !== 0) value += covariancePair(gram, square, size, u[i]!, v[i]!, c[i]!, u[j]!, v[j]!, c[j]!)
        if (s[j]! >= 0 && c[i]! !== 0) value += 2 * meanWeight[j]! * crossPair(gram, y, size, s[j]!, u[i]!, v[i]!, c[i]!)
        if (s[i]! >= 0 && c[j]! !== 0) value += 2 * meanWeight[i]! * crossPair(gram, y, size, s[i]!, u[j]!, v[j]!, c[j]!)
        if (s[i]! >= 0 && s[j]! >= 0) value += 2 * meanWeight[i]! * meanWeight[j]! * gram[s[i]! * size + s[j]!]!
        if (value !== 0) addPair(work, curvature, q, i, j, weight * value)
      }
    }
  }
  addSecondOrder(work, (i, j, value) => {
    addPair(work, curvature, q, i, j, work.weight * value)
  })
}

/** 2 tr(dSigma1 W dSigma2 Q) - tr(W dSigma1 W dSigma2) */
function covariancePair(
  g: Float64Array,
  r: Float64Array,
  n: number,
  u: number,
  v: number,
  c: number,
  x: number,
  y: number,
  d: number
): number {
  const mixed =
    g[v * n + x]! * r[y * n + u]! + g[v * n + y]! * r[x * n + u]! + g[u * n + x]! * r[y * n + v]! + g[u * n + y]! * r[x * n + v]!
  const plain = 2 * (g[u * n + x]! * g[v * n + y]! + g[u * n + y]! * g[v * n + x]!)
  return c * d * (2 * mixed - plain)
}

/** s' W dSigma z = c (G[s,u] y[v] + G[s,v] y[u]) */
function crossPair(g: Float64Array, y: Float64Array, n: number, s: number, u: number, v: number, c: number): number {
  return c * (g[s * n + u]! * y[v]! + g[s * n + v]! * y[u]!)
}

/** A k x k matrix of the observed indicators as p x p, zero elsewhere. */
function pad({ k, observed, complete }: PatternWork, matrix: Float64Array, p: number, padded: Float64Array): void {
  if (complete) {
    padded.set(matrix)
    return
  }
  padded.fill(0)
  for (let i = 0; i < k; i++) {
    const row = observed[i]! * p
    for (let j = 0; j < k; j++) padded[row + observed[j]!] = matrix[i * k + j]!
  }
}

/** Adds d2F of cells i >= j to their gammas. */
function addPair(work: GroupWork, curvature: Float64Array, q: number, i: number, j: number, value: number): void {
  if (work.plain) addSymmetric(curvature, q, work.gamma[i]!, work.gamma[j]!, i === j, value)
  else spread(curvature, q, work.group, i, j, value)
}

/** Lower triangle; two different cells of one gamma count twice on its diagonal. */
function addSymmetric(curvature: Float64Array, q: number, a: number, b: number, sameCell: boolean, value: number): void {
  if (a === b) curvature[a * q + a]! += sameCell ? value : 2 * value
  else if (a > b) curvature[a * q + b]! += value
  else curvature[b * q + a]! += value
}

function spread(curvature: Float64Array, q: number, group: CompiledGroup, i: number, j: number, value: number): void {
  const a = group.free[i]!
  const b = group.free[j]!
  for (let k = 0; k < a.gammas.length; k++) {
    for (let l = 0; l < b.gammas.length; l++) {
      if (i === j && l > k) break
      addSymmetric(curvature, q, a.gammas[k]!, b.gammas[l]!, i === j, value * a.weights[k]! * b.weights[l]!)
    }
  }
}
