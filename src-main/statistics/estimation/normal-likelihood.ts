/**
 * The normal-theory discrepancy, of complete data or by missingness patterns (full information), with its gradient and its
 * expected or observed second derivatives (methods: sections 2 and 3; Arbuckle 1996).
 *
 *     F = sum_g (n_g / N) F_g      F_g = sum_k (n_k / n_g) [ln|Sigma_k| + tr(D_k W_k)] - h_g
 *     D_k = S_k + d_k d_k'   d_k = ybar_k - mu_k   W_k = Sigma_k^-1, all over the indicators observed in pattern k
 *
 * h_g is the same sum at the unrestricted moments, so that F is 0 for a saturated model and T = N F; complete data are one
 * pattern, and h_g = ln|S| + p. With W~ the W_k padded by zeros to p x p, and likewise Q~ of Q = W D W and z~ of z = W d,
 *
 *     dF_g/d cell = 2 c H[u,v] - 2 w (z' s)     H = B' Omega B   Omega = sum_k (n_k / n_g) (W~ - Q~)   z = sum_k (n_k / n_g) z~
 *
 * in the columns of cell-columns.ts, so no derivative matrix is ever formed. The information of gamma is (N/2) times the
 * second derivatives (curvature.ts). Convention: N = sum n_g, or sum (n_g - 1) under Wishart.
 */
import { mirrorLower, multiply } from '../matrix/symmetric.ts'
import type { CompiledGroup, CompiledModel } from '../model/compile.ts'
import { type GroupState, groupState, impliedMoments } from '../model/implied-moments.ts'
import type { GroupMoments, Pattern, SampleMoments } from '../moments/sample-moments.ts'
import { cellColumns, columnDot, formEntry, sideBySide } from './cell-columns.ts'
import { addExpectedCurvature, addObservedCurvature } from './curvature.ts'
import { patternValue, prepareDerivatives, prepareStructure } from './pattern-value.ts'
import type { GroupWork, PatternWork, StructureWork } from './work.ts'

export type Convention = 'normal' | 'wishart'
export type CurvatureKind = 'expected' | 'observed'

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
   * @param curvature d2F (q x q, lower triangle), written when given: expected unless `kind` says observed
   */
  derive(gradient: Float64Array, curvature?: Float64Array, kind?: CurvatureKind): void
  /** The matrices of each group at the last gamma evaluated. */
  states: readonly GroupState[]
  /** F of the baseline: all covariances zero, means and variances free (T_b / N). */
  baseline: number
  /** Log-likelihood at the unrestricted moments. */
  unrestrictedLogLikelihood: number
}

/** Effective size of a group under a convention. */
export function effectiveSize(n: number, convention: Convention): number {
  return convention === 'wishart' ? n - 1 : n
}

/**
 * Builds the objective; `twin` keeps to the dense way everywhere, for tests of the short one (pattern-value.ts). Throws a plain Error when S is not positive definite (the data were to be checked before).
 */
export function normalObjective(model: CompiledModel, moments: SampleMoments, convention: Convention, twin?: 'dense'): Objective {
  const total = moments.groups.reduce((sum, g) => sum + effectiveSize(g.n, convention), 0)
  const groups = model.groups.map((group, g) => {
    const sample = moments.groups[g]!
    return groupWork(model, group, sample, effectiveSize(sample.n, convention) / total, twin)
  })
  return {
    parameters: model.parameters,
    total,
    states: groups.map((g) => g.state),
    baseline: groups.reduce((sum, work) => sum + work.weight * baselineDiscrepancy(work), 0),
    unrestrictedLogLikelihood: groups.reduce((sum, work) => sum + unrestrictedLogLikelihood(work, total), 0),
    evaluate(gamma) {
      let value = 0
      for (const work of groups) {
        value += work.weight * groupDiscrepancy(work, gamma, model.hasRegressions)
        if (Number.isNaN(value)) return Number.NaN
      }
      return value
    },
    derive(gradient, curvature, kind = 'expected') {
      gradient.fill(0)
      for (const work of groups) addGradient(work, gradient)
      if (curvature === undefined) return
      curvature.fill(0)
      const add = kind === 'expected' ? addExpectedCurvature : addObservedCurvature
      for (const work of groups) add(work, curvature, model.parameters)
    }
  }
}

function groupWork(
  model: CompiledModel,
  group: CompiledGroup,
  sample: GroupMoments,
  weight: number,
  twin: 'dense' | undefined
): GroupWork {
  const p = model.indicators.length
  const m = model.factors.length
  const size = p + 2 * m
  const array = (length: number) => new Float64Array(length)
  const patterns = patternsOf(sample, p).map((pattern) => patternWork(pattern, p, m, sample.n, model.meanStructure))
  const work: GroupWork = {
    group,
    state: groupState(p, m),
    weight,
    p,
    size,
    patterns,
    unrestricted: 0,
    omega: array(p * p),
    padded: array(p * p),
    z: array(p),
    columns: array(p * 2 * m),
    product: array(p * 2 * m),
    form: array(size * size),
    ...cellColumns(group, p, m, model.meanStructure),
    meanWeight: array(group.free.length),
    plain: group.free.every((cell) => cell.gammas.length === 1 && cell.weights[0] === 1),
    gamma: Int32Array.from(group.free, (cell) => cell.gammas[0] ?? -1),
    pairs: null,
    structure: twin === 'dense' ? null : structureWork(group, p, m),
    scratch: { chol: array(p * p), first: new Int32Array(p), projection: array(m) }
  }
  work.unrestricted = patternSum(work, sample.covariance, sample.mean, false)
  if (Number.isNaN(work.unrestricted)) throw new Error('a sample covariance matrix is not positive definite')
  return work
}

/** Complete data are one pattern with every indicator. */
function patternsOf(sample: GroupMoments, p: number): Pattern[] {
  if (sample.patterns !== undefined) return sample.patterns
  return [{ observed: Int32Array.from({ length: p }, (_, i) => i), n: sample.n, mean: sample.mean, covariance: sample.covariance }]
}

/** Theta diagonal whatever gamma, and few enough factors that the short way is shorter. */
function structureWork(group: CompiledGroup, p: number, m: number): StructureWork | null {
  const covaries = group.free.some((cell) => cell.matrix === 'theta' && cell.row !== cell.column)
  const fixed = group.theta.some((value, at) => value !== 0 && at % (p + 1) !== 0)
  if (covaries || fixed || m === 0 || 2 * m > p) return null
  return { root: new Float64Array(m * m), kernel: new Float64Array(m * m), load: new Float64Array(p * m) }
}

function patternWork(pattern: Pattern, p: number, m: number, total: number, means: boolean): PatternWork {
  const { observed, n, mean, covariance } = pattern
  const k = observed.length
  return {
    k,
    observed,
    complete: k === p,
    share: n / total,
    sample: covariance,
    sampleMean: means ? mean : null,
    w: new Float64Array(k * k),
    q: new Float64Array(k * k),
    ready: false,
    dense: true,
    half: new Float64Array(k * m),
    image: new Float64Array(k * m),
    precision: new Float64Array(k),
    d: new Float64Array(k),
    z: new Float64Array(k)
  }
}

/** F_g at independent indicators: each one's own mean and variance (divisor n) over those who answered it. */
function baselineDiscrepancy(work: GroupWork): number {
  const { p, patterns } = work
  const n = new Float64Array(p)
  const mean = new Float64Array(p)
  const sigma = new Float64Array(p * p)
  const means = patterns.every((pattern) => pattern.sampleMean !== null)
  const each = (add: (pattern: PatternWork, i: number, a: number) => void) => {
    for (const pattern of patterns) for (let a = 0; a < pattern.k; a++) add(pattern, pattern.observed[a]!, a)
  }
  each(({ share }, i) => {
    n[i]! += share
  })
  if (means) {
    each(({ share, sampleMean }, i, a) => {
      mean[i]! += (share * sampleMean![a]!) / n[i]!
    })
  }
  each(({ share, sample, sampleMean, k }, i, a) => {
    const d = means ? sampleMean![a]! - mean[i]! : 0
    sigma[i * p + i]! += (share * (sample[a * k + a]! + d * d)) / n[i]!
  })
  return patternSum(work, sigma, means ? mean : null, false) - work.unrestricted
}

/** -1/2 n_g [answers a case ln(2 pi) + h_g] */
function unrestrictedLogLikelihood({ weight, patterns, unrestricted }: GroupWork, total: number): number {
  const answers = patterns.reduce((sum, { share, k }) => sum + share * k, 0)
  return -((weight * total) / 2) * (answers * Math.log(2 * Math.PI) + unrestricted)
}

/** F_g, leaving in the work space what the derivatives need. */
function groupDiscrepancy(work: GroupWork, gamma: Float64Array, regressions: boolean): number {
  if (!impliedMoments(work.group, gamma, regressions, work.state)) return Number.NaN
  return patternSum(work, work.state.sigma, work.state.mu, prepareStructure(work, work.state)) - work.unrestricted
}

/** sum_k (n_k / n_g) [ln|Sigma_k| + tr(D_k W_k)] at the given moments; NaN where Sigma_k is not positive definite. */
function patternSum(work: GroupWork, sigma: Float64Array, mu: Float64Array | null, structured: boolean): number {
  let sum = 0
  for (const pattern of work.patterns) {
    sum += pattern.share * patternValue(work, pattern, sigma, mu, structured)
    if (Number.isNaN(sum)) return Number.NaN
  }
  return sum
}

/** Sums Omega and z over the patterns, then takes the entries of B' Omega B that the free cells need. */
function addGradient(work: GroupWork, gradient: Float64Array): void {
  sumPatterns(work)
  const { p, state, omega, z, size, columns, product, u, v, c, s } = work
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
      value -= 2 * weight * columnDot(z, columns, p, wide, s[i]!)
    }
    const { gammas, weights } = free[i]!
    for (let k = 0; k < gammas.length; k++) gradient[gammas[k]!]! += work.weight * value * weights[k]!
  }
}

function sumPatterns(work: GroupWork): void {
  const { p, patterns, omega, z } = work
  omega.fill(0)
  z.fill(0)
  for (const pattern of patterns) {
    prepareDerivatives(work, pattern)
    const { k, observed, w, q, share } = pattern
    for (let i = 0; i < k; i++) {
      const row = observed[i]! * p
      for (let j = 0; j <= i; j++) omega[row + observed[j]!]! += share * (w[i * k + j]! - q[i * k + j]!)
      z[observed[i]!]! += share * pattern.z[i]!
    }
  }
  mirrorLower(omega, p)
}
