/**
 * The mean-scaled statistic of a fitted model, and the indices that go with it.
 */
import { chiSquareUpper } from '../distributions/chi-square.ts'
import type { Objective } from '../estimation/normal-likelihood.ts'
import type { CaseGroup } from '../estimation/robust-scores.ts'
import { baselineScaling, scalingFactor } from '../estimation/scaling.ts'
import { missingBaselineScaling, missingScalingFactor, missingScalingForm } from '../estimation/scaling-missing.ts'
import type { CompiledModel } from '../model/compile.ts'
import type { SampleMoments } from '../moments/sample-moments.ts'
import type { FitResult, ScaledResult } from './fit-result.ts'
import { type RobustIndices, robustIndices } from './robust-indices.ts'

export interface ScaledParts {
  scaled: ScaledResult
  /** Of the population-consistent kind; null where the baseline has no scaling factor. */
  indices: RobustIndices | null
  plugIn: FitResult['plugIn']
}

export interface ScaledInput {
  model: CompiledModel
  moments: SampleMoments
  /** Standing at the solution. */
  objective: Objective
  rows: readonly Float64Array[]
  T: number
  baseline: { T: number; df: number }
}

/** null where c is not defined: no degrees of freedom, or no variation left. */
export function scaledParts(input: ScaledInput): ScaledParts | null {
  const { model, moments, T, baseline, objective } = input
  const missing = moments.groups.some((g) => (g.patterns?.length ?? 0) > 1)
  const found = missing ? missingScaling(input) : completeScaling(input)
  if (found === null) return null
  const { scaling } = found
  const scaled = { T: T / scaling, p: chiSquareUpper(T / scaling, model.df), ...found }
  const ofBaseline = missing
    ? missingBaselineScaling(moments, input.rows)
    : (baselineScaling(caseGroups(input), model.indicators.length)?.scaling ?? null)
  if (ofBaseline === null) return { scaled, indices: null, plugIn: null }
  const indexInput = {
    T,
    df: model.df,
    scaling,
    n: objective.total,
    groups: model.groups.length,
    indicators: model.indicators.length,
    baseline: { ...baseline, scaling: ofBaseline }
  }
  const plugIn = robustIndices('plug-in', indexInput)
  return {
    scaled,
    indices: robustIndices('consistent', indexInput),
    plugIn: { cfi: plugIn.cfi, tli: plugIn.tli, rmsea: plugIn.rmsea.estimate }
  }
}

function caseGroups({ rows, model }: ScaledInput): CaseGroup[] {
  return rows.map((values) => ({ rows: values, size: values.length / model.indicators.length }))
}

type Scaling = Pick<ScaledResult, 'scaling' | 'form'>

function completeScaling(input: ScaledInput): Scaling | null {
  const { model, objective } = input
  const q = model.parameters
  const curvature = new Float64Array(q * q)
  objective.derive(new Float64Array(q), curvature)
  const scaling = scalingFactor({ model, states: objective.states, groups: caseGroups(input), curvature })?.scaling ?? null
  return scaling === null ? null : { scaling, form: 'Satorra & Bentler 1994' }
}

function missingScaling({ model, objective, moments, rows }: ScaledInput): Scaling | null {
  const scaling = missingScalingFactor(model, objective, moments, rows)
  return scaling === null || !(scaling > 0) ? null : { scaling, form: missingScalingForm('the unrestricted estimates') }
}
