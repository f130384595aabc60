/**
 * The rungs of one ladder, refitted to resamples of the cases: what a verdict needs of each fit, and no more.
 *
 * A fit starts at the rung's solution in the whole sample, which lies near that of a resample; where the search does not
 * converge from there, it starts as an ordinary fit does. A rung that cannot be fitted is told with its reason.
 */
import { nullSpaceParameters } from '../estimation/identification.ts'
import { normalObjective, type Objective } from '../estimation/normal-likelihood.ts'
import { type Minimum, minimise, type ScoringSettings } from '../estimation/scoring.ts'
import type { FitResult } from '../fit/fit-result.ts'
import { pointIndices, standardisedResidual } from '../fit/indices.ts'
import { scaledParts } from '../fit/scaled.ts'
import { smallestMinimum } from '../fit/search.ts'
import type { ModelCells } from '../model/cells.ts'
import { type CompiledModel, compileModel } from '../model/compile.ts'
import type { SampleMoments } from '../moments/sample-moments.ts'
import { drawWeights, resampleGenerator } from './case-weights.ts'
import { type CaseSample, drawnRows, type WeightedMoments, weightedMoments } from './weighted-moments.ts'

/** T is off by about N tolerance^2 / 2 where the search ends: some 1e-12. */
const resampleScoring: ScoringSettings = Object.freeze({ tolerance: 1e-7, iterations: 200 })

export interface ResampledRung {
  cells: ModelCells
  /** Which of the samples it is fitted to. */
  sample: number
  /** Its solution in the whole sample; null where it has none. */
  gamma: number[] | null
  /** True where it is nested in the rung below, so that it cannot fit better. */
  nested: boolean
}

export interface ResampleInput {
  /** Bottom first. */
  rungs: ResampledRung[]
  samples: CaseSample[]
  /** Cases in each stratum that is resampled within; all samples hold the same cases in the same order. */
  strata: number[]
  statistic: 'normal theory' | 'mean-scaled'
  seed: number
  /** Resamples number first .. first + count - 1 of those that the seed stands for. */
  first: number
  count: number
}

/** One rung on one resample. */
export interface ResampledFit {
  /** no moments: the resample itself makes no positive definite covariance matrix, so nothing can be fitted. */
  state: 'fitted' | 'not converged' | 'no moments'
  T: number | null
  cfi: number | null
  rmsea: number | null
  srmr: number | null
  mcdonald: number | null
  gammaHat: number | null
  scaled: FitResult['scaled']
}

export interface ResampleOutcome {
  /** Degrees of freedom of each rung. */
  df: number[]
  /** Per resample, per rung. */
  fits: ResampledFit[][]
}

/** Pure: the same input gives the same outcome, and chunks of one run give what the whole run gives. */
export function resampleLadder(input: ResampleInput): ResampleOutcome {
  const models = input.rungs.map(({ cells }) => compileModel(cells))
  const moments = input.samples.map((sample) => weightedMoments(sample))
  const weights = new Int32Array(input.strata.reduce((sum, size) => sum + size, 0))
  const fits = Array.from({ length: input.count }, (_, at) => {
    drawWeights(input.strata, resampleGenerator(input.seed, input.first + at), weights)
    return fitResample(input, models, moments, weights)
  })
  return { df: models.map((model) => model.df), fits }
}

interface Fitting {
  model: CompiledModel
  moments: SampleMoments
  objective: Objective
  minimum: Minimum
}

function fitResample(
  input: ResampleInput,
  models: readonly CompiledModel[],
  makers: readonly WeightedMoments[],
  weights: Int32Array
): ResampledFit[] {
  const samples = makers.map((make) => make(weights))
  const fittings = input.rungs.map((rung, i): Fitting | null => {
    const moments = samples[rung.sample]!
    return moments === null ? null : fitRung(models[i]!, moments, rung.gamma)
  })
  input.rungs.forEach(({ nested }, i) => {
    if (nested && isBelow(fittings[i], fittings[i - 1])) fittings[i - 1] = searched(fittings[i - 1]!)
  })
  return fittings.map((fitting, i) => {
    if (fitting === null) return { ...blank, state: 'no moments' }
    if (!hasSolution(fitting)) return blank
    const rows = input.statistic === 'mean-scaled' ? drawnRows(input.samples[input.rungs[i]!.sample]!, weights) : null
    return resampledFit(fitting, rows)
  })
}

const blank: ResampledFit = {
  state: 'not converged',
  T: null,
  cfi: null,
  rmsea: null,
  srmr: null,
  mcdonald: null,
  gammaHat: null,
  scaled: null
}

function fitRung(model: CompiledModel, moments: SampleMoments, gamma: number[] | null): Fitting {
  const objective = normalObjective(model, moments, 'normal')
  if (gamma !== null) {
    const minimum = minimise(objective, Float64Array.from(gamma), resampleScoring)
    const fitting = { model, moments, objective, minimum }
    if (hasSolution(fitting)) return fitting
  }
  return { model, moments, objective, minimum: smallestMinimum(model, moments, objective).best }
}

function hasSolution({ minimum, model }: Fitting): boolean {
  return minimum.stop === 'converged' && nullSpaceParameters(minimum.curvature, model.parameters).length === 0
}

/** The restricted model fits better than the one it is nested in: the search for the latter ended too high. */
function isBelow(restricted: Fitting | null | undefined, general: Fitting | null | undefined): boolean {
  if (restricted == null || general == null || !hasSolution(restricted) || !hasSolution(general)) return false
  return restricted.minimum.value < general.minimum.value - 1e-7
}

function searched(fitting: Fitting): Fitting {
  const { best } = smallestMinimum(fitting.model, fitting.moments, fitting.objective)
  return best.value < fitting.minimum.value ? { ...fitting, minimum: best } : fitting
}

/** @param rows the drawn cases, where the statistic is to be scaled */
function resampledFit({ model, moments, objective, minimum }: Fitting, rows: Float64Array[] | null): ResampledFit {
  objective.evaluate(minimum.gamma)
  const p = model.indicators.length
  const n = objective.total
  const T = Math.max(0, n * minimum.value)
  const baseline = { T: n * objective.baseline, df: (model.groups.length * p * (p - 1)) / 2 }
  const scaled = rows === null ? null : scaledParts({ model, moments, objective, rows, T, baseline })
  const ordinary = pointIndices({ T, df: model.df, n, groups: model.groups.length, indicators: p, baseline })
  const { cfi, mcdonald, gammaHat } = scaled?.indices ?? ordinary
  return {
    state: 'fitted',
    T,
    cfi,
    mcdonald,
    gammaHat,
    rmsea: scaled?.indices?.rmsea.estimate ?? ordinary.rmsea,
    srmr: residualSize(objective, moments, model),
    scaled: scaled?.scaled ?? null
  }
}

function residualSize(objective: Objective, moments: SampleMoments, model: CompiledModel): number {
  const groups = objective.states.map(({ sigma, mu }, g) => {
    const { covariance, mean, n } = moments.groups[g]!
    return { sample: covariance, implied: sigma, sampleMean: mean, impliedMean: mu, weight: n / objective.total }
  })
  return standardisedResidual(groups, model.indicators.length).srmr
}
