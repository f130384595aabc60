/**
 * The scaling factor of the mean-scaled statistic with missing answers (Yuan & Bentler 2000; methods: section 4).
 *
 *     c = tr(U Gamma) / df = { tr(A^-1 B) - tr[(Delta'A Delta)^-1 Delta'B Delta] } / df
 *
 * A is the observed information and B the cross-product information of the unrestricted model's p + p(p+1)/2 moments per
 * group, Delta the derivatives of the moments at the fitted model. Forms in use differ in where A and B are taken, and in
 * finite samples: here at the unrestricted estimates, form (a) of fixtures/reference/03a. At the model-implied moments, form
 * (b), A need not be positive definite when a model is far from the data, c moves with the misfit, and true models are
 * rejected more often (the study of error rates in DEVELOPERS.md). Whichever it is, the form is named where c is printed.
 *
 * A is of the order of the moments, so unlike complete data this needs a matrix of that size a group.
 */
import { cholesky, choleskySolve, mirrorLower, multiply, submatrix } from '../matrix/symmetric.ts'
import type { ModelCells } from '../model/cells.ts'
import { type CompiledModel, compileModel } from '../model/compile.ts'
import type { GroupState } from '../model/implied-moments.ts'
import type { SampleMoments } from '../moments/sample-moments.ts'
import { scoreCrossProducts } from './casewise.ts'
import { cellColumns, sideBySide } from './cell-columns.ts'
import { normalObjective, type Objective } from './normal-likelihood.ts'

/** Where the two informations are taken. */
export type InformationsAt = 'the unrestricted estimates' | 'the model-implied moments'

export function missingScalingForm(at: InformationsAt): string {
  return `Yuan & Bentler 2000, both informations at ${at}`
}

/**
 * c of a fitted model; null without degrees of freedom or with a singular information.
 *
 * @param objective of the model, standing at its solution
 * @param rows per group n x p row-major, NaN where missing
 */
export function missingScalingFactor(
  model: CompiledModel,
  objective: Objective,
  moments: SampleMoments,
  rows: readonly Float64Array[],
  at: InformationsAt = 'the unrestricted estimates'
): number | null {
  if (model.df <= 0) return null
  const q = model.parameters
  const information = new Float64Array(q * q)
  const cross = new Float64Array(q * q)
  let trace = 0
  for (let g = 0; g < rows.length; g++) {
    const state = objective.states[g]!
    const { covariance, mean } = moments.groups[g]!
    const place = at === 'the model-implied moments' ? state : { p: state.p, sigma: covariance, mu: mean! }
    const whole = unrestrictedInformation(moments, g, place)
    const size = whole.model.parameters
    const meat = scoreCrossProducts(whole.model, whole.objective.states, [rows[g]!])
    const jacobian = momentJacobian(model, g, state, whole.model.gammaLabels)
    addQuadratic(whole.information, jacobian, size, q, information)
    addQuadratic(meat, jacobian, size, q, cross)
    const part = traceOfSolved(whole.information, meat, size)
    if (part === null) return null
    trace += part
  }
  const own = traceOfSolved(information, cross, q)
  return own === null ? null : (trace - own) / model.df
}

/** d(moments)/d gamma of one group at its state, moments x q, rows in the order of the unrestricted model's labels. */
function momentJacobian(model: CompiledModel, g: number, state: GroupState, labels: readonly string[]): Float64Array {
  const { p, m } = state
  const q = model.parameters
  const group = model.groups[g]!
  const { u, v, c, s, meanFactor } = cellColumns(group, p, m, model.meanStructure)
  const wide = 2 * m
  const columns = new Float64Array(p * wide)
  sideBySide(state, columns)
  const at = (i: number, column: number) => (column < p ? (column === i ? 1 : 0) : columns[i * wide + column - p]!)
  const places = labels.map((label) => label.split(' '))
  const out = new Float64Array(labels.length * q)
  group.free.forEach(({ gammas, weights }, cell) => {
    places.forEach(([kind, first, second], row) => {
      const [i, j] = [Number(first), Number(second)]
      let slope = 0
      if (kind === 'm' && s[cell]! >= 0)
        slope = (meanFactor[cell]! < 0 ? 1 : state.factorMean[meanFactor[cell]!]!) * at(i, s[cell]!)
      if (kind === 's' && u[cell]! >= 0) {
        slope = c[cell]! * (at(i, u[cell]!) * at(j, v[cell]!) + at(i, v[cell]!) * at(j, u[cell]!))
      }
      if (slope !== 0) for (let k = 0; k < gammas.length; k++) out[row * q + gammas[k]!]! += weights[k]! * slope
    })
  })
  return out
}

/** Adds J' M J, M the n x n lower triangle of a symmetric matrix and J n x q, into the lower triangle of `sum`. */
function addQuadratic(lower: Float64Array, jacobian: Float64Array, n: number, q: number, sum: Float64Array): void {
  const whole = Float64Array.from(lower)
  mirrorLower(whole, n)
  const half = new Float64Array(n * q)
  multiply(whole, jacobian, n, n, q, half)
  for (let row = 0; row < n; row++) {
    for (let i = 0; i < q; i++) {
      const value = jacobian[row * q + i]!
      if (value === 0) continue
      for (let j = 0; j <= i; j++) sum[i * q + j]! += value * half[row * q + j]!
    }
  }
}

/**
 * c of the baseline (independent indicators with their own means and variances), with both informations at the
 * unrestricted estimates: at the baseline's own moments, far from the data, A need not be positive definite. Its Delta only
 * selects means and variances, so that tr(U Gamma) is tr(A^-1 B) less the same trace over those rows and columns.
 *
 * @returns null where A is not positive definite, or for one indicator
 */
export function missingBaselineScaling(moments: SampleMoments, rows: readonly Float64Array[]): number | null {
  const p = moments.indicators.length
  let trace = 0
  for (let g = 0; g < moments.groups.length; g++) {
    const { covariance, mean } = moments.groups[g]!
    const { model, objective, information } = unrestrictedInformation(moments, g, { p, sigma: covariance, mu: mean! })
    const cross = scoreCrossProducts(model, objective.states, [rows[g]!])
    const selected = model.gammaLabels.flatMap((label, k) => (isMeanOrVariance(label) ? [k] : []))
    const part = (matrix: Float64Array) => submatrix(matrix, model.parameters, selected)
    const own = traceOfSolved(part(information), part(cross), selected.length)
    const whole = traceOfSolved(information, cross, model.parameters)
    if (whole === null || own === null) return null
    trace += whole - own
  }
  const df = (moments.groups.length * p * (p - 1)) / 2
  return df > 0 ? trace / df : null
}

function isMeanOrVariance(label: string): boolean {
  const [kind, i, j] = label.split(' ')
  return kind === 'm' || i === j
}

/** tr(A^-1 B) of two lower triangles; null when A is not positive definite. A is overwritten. */
function traceOfSolved(a: Float64Array, b: Float64Array, n: number): number | null {
  if (!cholesky(a, n, a)) return null
  let trace = 0
  const column = new Float64Array(n)
  for (let j = 0; j < n; j++) {
    for (let i = 0; i < n; i++) column[i] = b[Math.max(i, j) * n + Math.min(i, j)]!
    choleskySolve(a, n, column)
    trace += column[j]!
  }
  return trace
}

type Moments = Pick<GroupState, 'p' | 'sigma' | 'mu'>

/** The unrestricted model of one group standing at the given moments, and A there (sum over the cases, lower triangle). */
function unrestrictedInformation(
  moments: SampleMoments,
  g: number,
  at: Moments
): { model: CompiledModel; objective: Objective; information: Float64Array } {
  const sample = moments.groups[g]!
  const model = compileModel(saturatedCells(moments.indicators))
  const objective = normalObjective(model, { indicators: moments.indicators, groups: [{ ...sample, name: null }] }, 'normal')
  objective.evaluate(Float64Array.from(model.gammaLabels, (label) => momentAt(label, at)))
  const q = model.parameters
  const information = new Float64Array(q * q)
  objective.derive(new Float64Array(q), information, 'observed')
  for (let k = 0; k < information.length; k++) information[k]! *= sample.n / 2
  return { model, objective, information }
}

/** No factors: every covariance and mean is a parameter, named by its place. */
function saturatedCells(indicators: string[]): ModelCells {
  const p = indicators.length
  const place = (i: number, j: number) => `s ${Math.max(i, j)} ${Math.min(i, j)}`
  return {
    indicators,
    factors: [],
    groups: [
      {
        name: null,
        loadings: indicators.map(() => []),
        regressions: [],
        factorCovariances: [],
        residualCovariances: Array.from({ length: p }, (_, i) => Array.from({ length: p }, (_, j) => place(i, j))),
        intercepts: indicators.map((_, i) => `m ${i}`),
        factorMeans: []
      }
    ],
    constraints: []
  }
}

function momentAt(label: string, { p, sigma, mu }: Moments): number {
  const [kind, i, j] = label.split(' ')
  return kind === 'm' ? mu[Number(i)]! : sigma[Number(i) * p + Number(j)]!
}
