/**
 * The scaling factor of the mean-scaled statistic with missing answers (Yuan & Bentler 2000; methods: section 4).
 *
 *     c = tr(U Gamma) / df = { tr(A^-1 B) - tr[(Delta'A Delta)^-1 Delta'B Delta] } / df
 *
 * A is the observed information and B the cross-product information of the unrestricted model's p + p(p+1)/2 moments per
 * group, both taken at the model-implied moments: of the forms in use, which differ in finite samples, this is form (b) of
 * fixtures/reference/03a, and it is named wherever c is printed. Delta'B Delta are the cross-products of the model's own
 * casewise scores. A is of the order of the moments, so unlike complete data this needs a matrix of that size a group.
 */
import { cholesky, choleskySolve } from '../matrix/symmetric.ts'
import type { ModelCells } from '../model/cells.ts'
import { type CompiledModel, compileModel } from '../model/compile.ts'
import type { GroupState } from '../model/implied-moments.ts'
import type { SampleMoments } from '../moments/sample-moments.ts'
import { casewiseScores, scoreCrossProducts } from './casewise.ts'
import { normalObjective, type Objective } from './normal-likelihood.ts'

export const missingScalingForm = 'Yuan & Bentler 2000, both informations at the model-implied moments'

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
  rows: readonly Float64Array[]
): number | null {
  if (model.df <= 0) return null
  const whole = unrestrictedTrace(model, objective.states, moments, rows)
  const own = modelTrace(model, objective, rows)
  return whole === null || own === null ? null : (whole - own) / model.df
}

/** tr[(Delta'A Delta)^-1 Delta'B Delta] */
function modelTrace(model: CompiledModel, objective: Objective, rows: readonly Float64Array[]): number | null {
  const q = model.parameters
  const information = new Float64Array(q * q)
  objective.derive(new Float64Array(q), information, 'tangent')
  for (let k = 0; k < information.length; k++) information[k]! *= objective.total / 2
  if (!cholesky(information, q, information)) return null
  const cross = scoreCrossProducts(model, objective.states, rows)
  let trace = 0
  const column = new Float64Array(q)
  for (let j = 0; j < q; j++) {
    for (let i = 0; i < q; i++) column[i] = cross[Math.max(i, j) * q + Math.min(i, j)]!
    choleskySolve(information, q, column)
    trace += column[j]!
  }
  return trace
}

/** tr(A^-1 B) = sum over the cases of s' A^-1 s, group by group. */
function unrestrictedTrace(
  model: CompiledModel,
  states: readonly GroupState[],
  moments: SampleMoments,
  rows: readonly Float64Array[]
): number | null {
  let trace = 0
  for (let g = 0; g < states.length; g++) {
    const part = groupTrace(model, states[g]!, moments, rows[g]!, g)
    if (part === null) return null
    trace += part
  }
  return trace
}

function groupTrace(model: CompiledModel, state: GroupState, moments: SampleMoments, rows: Float64Array, g: number): number | null {
  const sample = moments.groups[g]!
  const saturated = compileModel(saturatedCells(model.indicators))
  const objective = normalObjective(saturated, { indicators: moments.indicators, groups: [{ ...sample, name: null }] }, 'normal')
  objective.evaluate(Float64Array.from(saturated.gammaLabels, (label) => momentAt(label, state)))
  const q = saturated.parameters
  const information = new Float64Array(q * q)
  objective.derive(new Float64Array(q), information, 'observed')
  for (let k = 0; k < information.length; k++) information[k]! *= sample.n / 2
  if (!cholesky(information, q, information)) return null
  let trace = 0
  const solved = new Float64Array(q)
  casewiseScores(saturated, objective.states, [rows], (score) => {
    solved.set(score)
    choleskySolve(information, q, solved)
    for (let k = 0; k < q; k++) trace += score[k]! * solved[k]!
  })
  return trace
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

function momentAt(label: string, { p, sigma, mu }: GroupState): number {
  const [kind, i, j] = label.split(' ')
  return kind === 'm' ? mu[Number(i)]! : sigma[Number(i) * p + Number(j)]!
}
