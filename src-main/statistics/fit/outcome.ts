/**
 * What a fit yields, failed or not: the same fields, filled as far as they apply.
 */
import { heldAtBounds } from '../estimation/bounded.ts'
import { type Convention, effectiveSize, type Objective } from '../estimation/normal-likelihood.ts'
import type { Minimum } from '../estimation/scoring.ts'
import type { CompiledModel } from '../model/compile.ts'
import type { SampleMoments } from '../moments/sample-moments.ts'
import { boundCautions, boundResults, isActive } from './bounds.ts'
import { improperCautions, sampleSizeCautions, standardErrorCautions } from './cautions.ts'
import { estimateCovariance } from './covariance.ts'
import { cellEstimates } from './estimates.ts'
import type { Caution, FitOutcome, FitResult, FitState } from './fit-result.ts'
import { fitIndices, standardisedResidual } from './indices.ts'
import { scaledParts } from './scaled.ts'
import type { FitSettings } from './settings.ts'

type Convergence = FitResult['convergence']

export function failedFit(
  model: CompiledModel,
  moments: SampleMoments,
  convention: Convention,
  state: Exclude<FitState, 'fitted'>,
  reason: string,
  convergence: Convergence
): FitOutcome {
  return { fit: { ...blank(model, totalSize(moments, convention), convergence), state, reason }, gamma: null }
}

export interface FittedInput {
  model: CompiledModel
  moments: SampleMoments
  /** Standing at the solution. */
  objective: Objective
  minimum: Minimum
  settings: FitSettings
  rows: Float64Array[] | null
  convergence: Convergence
}

export function fittedResult({ model, moments, objective, minimum, settings, rows, convergence }: FittedInput): FitResult {
  const { convention, standardErrors = 'expected' } = settings
  const p = model.indicators.length
  const n = totalSize(moments, convention)
  const T = Math.max(0, n * minimum.value)
  const covariance = estimateCovariance(model, objective, standardErrors, rows, heldAtBounds(model.bounds, minimum.gamma))
  const estimates = cellEstimates(model, objective.states, minimum.gamma, covariance)
  const unrestricted = objective.unrestrictedLogLikelihood
  const logLikelihood = unrestricted - T / 2
  const baseline = { T: n * objective.baseline, df: (model.groups.length * p * (p - 1)) / 2 }
  const residual = residualSize(model, moments, objective, convention)
  const scaled =
    settings.statistic === 'mean-scaled' && rows !== null ? scaledParts({ model, moments, objective, rows, T, baseline }) : null
  const bounds = boundResults(model, minimum.gamma)
  return {
    ...blank(model, n, convergence),
    state: 'fitted',
    T,
    minimum: minimum.value,
    logLikelihood,
    unrestrictedLogLikelihood: unrestricted,
    baseline,
    ...fitIndices({
      T,
      df: model.df,
      n,
      groups: model.groups.length,
      indicators: p,
      baseline,
      logLikelihood,
      parameters: model.parameters
    }),
    ...scaled?.indices,
    scaled: scaled?.scaled ?? null,
    plugIn: scaled?.plugIn ?? null,
    ...residual,
    standardErrors,
    estimates,
    residuals: objective.states.map((state, g) => ({
      group: model.groups[g]!.name,
      lower: standardisedResiduals(moments.groups[g]!.covariance, state.sigma, p)
    })),
    bounds,
    cautions: [
      ...improperCautions(model, objective.states),
      ...boundCautions(bounds, heldAtBounds(model.bounds, minimum.gamma).length, { T: scaled?.scaled.T ?? T, df: model.df }),
      ...standardErrorCautions(estimates.filter((estimate) => !isActive(bounds, estimate))),
      ...minimaCaution(convergence.minima),
      ...sampleSizeCautions(n, model.df)
    ]
  }
}

/** N of every formula. */
function totalSize(moments: SampleMoments, convention: Convention): number {
  return moments.groups.reduce((sum, g) => sum + effectiveSize(g.n, convention), 0)
}

function blank(model: CompiledModel, n: number, convergence: Convergence): FitResult {
  return {
    state: 'failed',
    reason: null,
    T: null,
    df: model.df,
    p: null,
    scaled: null,
    parameters: model.parameters,
    n,
    groups: model.groups.length,
    minimum: null,
    logLikelihood: null,
    unrestrictedLogLikelihood: null,
    baseline: null,
    aic: null,
    bic: null,
    adjustedBic: null,
    ecvi: null,
    cfi: null,
    tli: null,
    mcdonald: null,
    gammaHat: null,
    rmsea: { estimate: null, lower: null, upper: null, closeFitP: null, notCloseFitP: null },
    srmr: null,
    srmrWithMeans: null,
    plugIn: null,
    standardErrors: null,
    estimates: [],
    residuals: null,
    bounds: [],
    cautions: [],
    convergence
  }
}

function residualSize(model: CompiledModel, moments: SampleMoments, objective: Objective, convention: Convention) {
  return standardisedResidual(
    objective.states.map((state, g) => {
      const { covariance, mean, n } = moments.groups[g]!
      return {
        sample: covariance,
        implied: state.sigma,
        sampleMean: model.meanStructure ? mean : null,
        impliedMean: state.mu,
        weight: effectiveSize(n, convention) / objective.total
      }
    }),
    model.indicators.length
  )
}

function standardisedResiduals(sample: Float64Array, implied: Float64Array, p: number): number[][] {
  return Array.from({ length: p }, (_, i) =>
    Array.from(
      { length: i + 1 },
      (_, j) => (sample[i * p + j]! - implied[i * p + j]!) / Math.sqrt(sample[i * p + i]! * sample[j * p + j]!)
    )
  )
}

function minimaCaution(minima: number): Caution[] {
  if (minima < 2) return []
  const message = `${minima} different minima were met from different starts; the smallest is reported. Others may exist.`
  return [{ code: 'several-minima', message, cell: null }]
}
