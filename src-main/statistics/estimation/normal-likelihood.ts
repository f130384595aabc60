/**
 * The normal-theory discrepancy of complete data, its gradient and its expected second derivatives (methods: section 2).
 *
 *     F = sum_g (n_g / N) F_g      F_g = ln|Sigma| - ln|S| + tr(D W) - p      D = S + d d'   d = ybar - mu   W = Sigma^-1
 *
 * Every free cell changes Sigma by c (u v' + v u') and mu by w s, where u, v and s are columns of B = [I, E, L]
 * (p x P, P = p + 2m; E = Lambda A, L = Lambda C). With G = B' W B and H = B' Omega B, Omega = W (Sigma - D) W:
 *
 *     dF_g/d cell          = 2 c H[u,v] - 2 w (W d)' s
 *     E d2F_g/d cell1 cell2 = 2 c1 c2 (G[u1,u2] G[v1,v2] + G[u1,v2] G[v1,u2]) + 2 w1 w2 G[s1,s2]
 *
 * so the information costs O(1) a pair of cells and no derivative matrix is ever formed. The information matrix of
 * gamma is (N/2) times the second derivatives. Convention: N = sum n_g, or sum (n_g - 1) under Wishart.
 */
import { cholesky, choleskyInverse, dotRows, logDeterminant, mirrorLower, multiply } from '../matrix/symmetric.ts'
import type { CompiledGroup, CompiledModel } from '../model/compile.ts'
import { type GroupState, groupState, impliedMoments } from '../model/implied-moments.ts'
import type { SampleMoments } from '../moments/sample-moments.ts'

export type Convention = 'normal' | 'wishart'

/** F of one model on one set of moments, as the optimiser sees it. Not re-entrant: its work space is shared by all calls. */
export interface Objective {
  /** q */
  parameters: number
  /** N of every formula. */
  total: number
  /** F at gamma, NaN where Sigma is not positive definite. */
  evaluate(gamma: Float64Array): number
  /**
   * Derivatives at the gamma last evaluated (which must not have given NaN).
   *
   * @param gradient dF/dgamma (q), written
   * @param curvature expected d2F (q x q, lower triangle), written when given
   */
  derive(gradient: Float64Array, curvature?: Float64Array): void
  /** The matrices of each group at the last gamma evaluated. */
  states: readonly GroupState[]
}

/** Effective size of a group under a convention. */
export function effectiveSize(n: number, convention: Convention): number {
  return convention === 'wishart' ? n - 1 : n
}

/** Builds the objective; throws a plain Error when S is not positive definite (the data were to be checked before). */
export function normalObjective(model: CompiledModel, moments: SampleMoments, convention: Convention): Objective {
  const total = moments.groups.reduce((sum, g) => sum + effectiveSize(g.n, convention), 0)
  const groups = model.groups.map((group, g) => {
    const sample = moments.groups[g]!
    return groupWork(
      model,
      group,
      sample.covariance,
      model.meanStructure ? sample.mean : null,
      effectiveSize(sample.n, convention) / total
    )
  })
  return {
    parameters: model.parameters,
    total,
    states: groups.map((g) => g.state),
    evaluate(gamma) {
      let value = 0
      for (const work of groups) {
        value += work.weight * groupDiscrepancy(work, gamma, model.hasRegressions)
        if (Number.isNaN(value)) return Number.NaN
      }
      return value
    },
    derive(gradient, curvature) {
      gradient.fill(0)
      for (const work of groups) addGradient(work, gradient)
      if (curvature === undefined) return
      curvature.fill(0)
      for (const work of groups) addCurvature(work, curvature, model.parameters)
    }
  }
}

interface GroupWork {
  group: CompiledGroup
  state: GroupState
  weight: number
  p: number
  /** P = p + 2m */
  size: number
  sample: Float64Array
  sampleMean: Float64Array | null
  sampleLogDeterminant: number
  d: Float64Array
  data: Float64Array
  w: Float64Array
  chol: Float64Array
  wd: Float64Array
  omega: Float64Array
  wMean: Float64Array
  first: Int32Array
  /** P x P: G, with W as its first p rows and columns. */
  gram: Float64Array
  columns: Float64Array
  product: Float64Array
  /** Per free cell: u, v (indices into B; -1 for a mean cell), c, s (-1 when mu does not move), factor whose mean is w (-1: w = 1). */
  u: Int32Array
  v: Int32Array
  c: Float64Array
  s: Int32Array
  meanFactor: Int32Array
  meanWeight: Float64Array
  /** True when every cell is one gamma with weight 1. */
  plain: boolean
  gamma: Int32Array
}

function groupWork(
  model: CompiledModel,
  group: CompiledGroup,
  sample: Float64Array,
  sampleMean: Float64Array | null,
  weight: number
): GroupWork {
  const p = model.indicators.length
  const m = model.factors.length
  const size = p + 2 * m
  const array = (length: number) => new Float64Array(length)
  const chol = array(p * p)
  if (!cholesky(sample, p, chol)) throw new Error('a sample covariance matrix is not positive definite')
  const cells = cellColumns(group, p, m, model.meanStructure)
  return {
    group,
    state: groupState(p, m),
    weight,
    p,
    size,
    sample,
    sampleMean,
    sampleLogDeterminant: logDeterminant(chol, p),
    d: array(p),
    data: array(p * p),
    w: array(p * p),
    chol,
    wd: array(p * p),
    omega: array(p * p),
    wMean: array(p),
    first: new Int32Array(p),
    gram: array(size * size),
    columns: array(p * 2 * m),
    product: array(p * 2 * m),
    ...cells,
    meanWeight: array(group.free.length),
    plain: group.free.every((cell) => cell.gammas.length === 1 && cell.weights[0] === 1),
    gamma: Int32Array.from(group.free, (cell) => cell.gammas[0] ?? -1)
  }
}

/** Per free cell of a group: u, v, c, s and the factor whose mean weighs s (see the head of this file). */
export type CellColumns = Pick<GroupWork, 'u' | 'v' | 'c' | 's' | 'meanFactor'>

/** The columns of B that each free cell moves Sigma and mu along (see the head of this file). */
export function cellColumns(group: CompiledGroup, p: number, m: number, means: boolean): CellColumns {
  const count = group.free.length
  const out: CellColumns = {
    u: new Int32Array(count).fill(-1),
    v: new Int32Array(count).fill(-1),
    c: new Float64Array(count),
    s: new Int32Array(count).fill(-1),
    meanFactor: new Int32Array(count).fill(-1)
  }
  group.free.forEach(({ matrix, row, column }, i) => {
    const set = (u: number, v: number, c: number) => {
      out.u[i] = u
      out.v[i] = v
      out.c[i] = c
    }
    const symmetric = row === column ? 0.5 : 1
    if (matrix === 'lambda') set(row, p + m + column, 1)
    if (matrix === 'beta') set(p + row, p + m + column, 1)
    if (matrix === 'psi') set(p + row, p + column, symmetric)
    if (matrix === 'theta') set(row, column, symmetric)
    if (means && matrix !== 'psi' && matrix !== 'theta') {
      out.s[i] = matrix === 'lambda' || matrix === 'nu' ? row : p + row
      if (matrix === 'lambda' || matrix === 'beta') out.meanFactor[i] = column
    }
  })
  return out
}

/** F_g, leaving W, D, W D and W d in the work space. */
function groupDiscrepancy(work: GroupWork, gamma: Float64Array, regressions: boolean): number {
  const { p, state, sample, sampleMean, chol, w, data, wd, d } = work
  if (!impliedMoments(work.group, gamma, regressions, state)) return Number.NaN
  if (!cholesky(state.sigma, p, chol)) return Number.NaN
  const logDet = logDeterminant(chol, p)
  choleskyInverse(chol, p, w, work.first)
  data.set(sample)
  if (sampleMean !== null) {
    for (let i = 0; i < p; i++) d[i] = sampleMean[i]! - state.mu[i]!
    for (let i = 0; i < p; i++) for (let j = 0; j < p; j++) data[i * p + j]! += d[i]! * d[j]!
  }
  multiply(w, data, p, p, p, wd)
  let trace = 0
  for (let i = 0; i < p; i++) trace += wd[i * p + i]!
  return logDet - work.sampleLogDeterminant + trace - p
}

/** Omega = W - W D W, then the entries of B' Omega B that the free cells need. */
function addGradient(work: GroupWork, gradient: Float64Array): void {
  const { p, state, w, wd, omega, d, wMean, size, columns, product, u, v, c, s } = work
  for (let i = 0; i < p; i++) {
    for (let j = 0; j <= i; j++) {
      omega[i * p + j] = w[i * p + j]! - dotRows(wd, i * p, w, j * p, p)
    }
  }
  mirrorLower(omega, p)
  multiply(w, d, p, p, 1, wMean)
  sideBySide(state, columns)
  const wide = size - p
  multiply(omega, columns, p, p, wide, product)
  const { free } = work.group
  for (let i = 0; i < free.length; i++) {
    let value = 0
    if (u[i]! >= 0) value = 2 * c[i]! * formEntry(omega, columns, product, p, wide, u[i]!, v[i]!)
    if (s[i]! >= 0) {
      const factor = work.meanFactor[i]!
      const weight = factor < 0 ? 1 : state.factorMean[factor]!
      work.meanWeight[i] = weight
      value -= 2 * weight * columnDot(wMean, columns, p, wide, s[i]!)
    }
    const { gammas, weights } = free[i]!
    for (let k = 0; k < gammas.length; k++) gradient[gammas[k]!]! += work.weight * value * weights[k]!
  }
}

/** columns = [E, L], p x 2m */
function sideBySide(state: GroupState, columns: Float64Array): void {
  const { p, m, e, l } = state
  for (let i = 0; i < p; i++) {
    for (let k = 0; k < m; k++) {
      columns[i * 2 * m + k] = e[i * m + k]!
      columns[i * 2 * m + m + k] = l[i * m + k]!
    }
  }
}

/** (B' M B)[u, v] where M is p x p symmetric, `columns` = [E, L] and `product` = M [E, L]. */
function formEntry(
  m: Float64Array,
  columns: Float64Array,
  product: Float64Array,
  p: number,
  wide: number,
  u: number,
  v: number
): number {
  if (u < p && v < p) return m[u * p + v]!
  if (u < p) return product[u * wide + v - p]!
  if (v < p) return product[v * wide + u - p]!
  let sum = 0
  for (let i = 0; i < p; i++) sum += columns[i * wide + u - p]! * product[i * wide + v - p]!
  return sum
}

/** x' B[:, s] */
function columnDot(x: Float64Array, columns: Float64Array, p: number, wide: number, s: number): number {
  if (s < p) return x[s]!
  let sum = 0
  for (let i = 0; i < p; i++) sum += x[i]! * columns[i * wide + s - p]!
  return sum
}

/** Adds this group's expected second derivatives; addGradient must have run before (it leaves [E, L] and the mean weights). */
function addCurvature(work: GroupWork, curvature: Float64Array, q: number): void {
  fillGram(work)
  const { gram, size, u, v, c, s, meanWeight, plain, gamma, weight } = work
  const { free } = work.group
  for (let i = 0; i < free.length; i++) {
    const ui = u[i]! * size
    const vi = v[i]! * size
    const si = s[i]! * size
    const ci = c[i]!
    for (let j = 0; j <= i; j++) {
      let value = 0
      if (ci !== 0 && c[j]! !== 0) {
        const uj = u[j]!
        const vj = v[j]!
        value = 2 * ci * c[j]! * (gram[ui + uj]! * gram[vi + vj]! + gram[ui + vj]! * gram[vi + uj]!)
      }
      if (si >= 0 && s[j]! >= 0) value += 2 * meanWeight[i]! * meanWeight[j]! * gram[si + s[j]!]!
      if (value === 0) continue
      if (plain) addSymmetric(curvature, q, gamma[i]!, gamma[j]!, i === j, weight * value)
      else spread(curvature, q, work.group, i, j, weight * value)
    }
  }
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

/** G = B' W B with B = [I, E, L]. */
function fillGram(work: GroupWork): void {
  const { p, size, w, gram, columns, product } = work
  const wide = size - p
  multiply(w, columns, p, p, wide, product)
  for (let i = 0; i < p; i++) {
    for (let j = 0; j < p; j++) gram[i * size + j] = w[i * p + j]!
    for (let k = 0; k < wide; k++) {
      gram[i * size + p + k] = product[i * wide + k]!
      gram[(p + k) * size + i] = product[i * wide + k]!
    }
  }
  for (let k = 0; k < wide; k++) {
    for (let l = 0; l <= k; l++) {
      let sum = 0
      for (let i = 0; i < p; i++) sum += columns[i * wide + k]! * product[i * wide + l]!
      gram[(p + k) * size + p + l] = sum
      gram[(p + l) * size + p + k] = sum
    }
  }
}
