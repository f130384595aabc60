/**
 * The rungs of one ladder, refitted to resamples of the cases: what a verdict needs of each fit, and no more.
 *
 * A fit starts at the rung's solution in the whole sample, which lies near that of a resample; where the search does not
 * converge from there, it starts as an ordinary fit does. A rung that cannot be fitted is told with its reason.
 */
import { minimiseWithin } from '../estimation/bounded.ts'
import { normalObjective, type Objective } from '../estimation/normal-likelihood.ts'
import type { Minimum, ScoringSettings } from '../estimation/scoring.ts'
import { undetermined } from '../fit/fit.ts'
import type { FitResult } from '../fit/fit-result.ts'
import { pointIndices, standardisedResidual } from '../fit/indices.ts'
import { scaledParts } from '../fit/scaled.ts'
import { smallestMinimum } from '../fit/search.ts'
import type { CellPart, ModelCells } from '../model/cells.ts'
import { type CompiledModel, compileModel } from '../model/compile.ts'
import type { SampleMoments } from '../moments/sample-moments.ts'
import { drawWeights, resampleGenerator } from './case-weights.ts'
import { type CaseSample, drawnRows, type WeightedMoments, weightedMoments } from './weighted-moments.ts'

/** T is off by about N q tolerance^2 / 2 where the search ends: some 1e-8 at most. */
const resampleScoring: ScoringSettings = Object.freeze({ tolerance: 1e-6, iterations: 200 })

export interface ResampledRung {
  cells: ModelCells
  /** Which of the samples it is fitted to. */
  sample: number
  /** Its solution in the whole sample; null where it has none. */
  gamma: number[] | null
  /** True where it is nested in the rung below, so that it cannot fit better. */
  nested: boolean
  /** Cells whose estimates are wanted: those that the rung above puts on their bounds. */
  watched: WatchedCell[]
}

/** A cell by its names, in one group; a factor covariance is told as a correlation. */
export interface WatchedCell {
  part: CellPart
  of: string[]
  group: string | null
}

export interface ResampleInput {
  /** Bottom first. */
  rungs: ResampledRung[]
  samples: CaseSample[]
  /** Cases in each stratum that is resampled within; all samples hold the same cases in the same order. */
  strata: number[]
  statistic: 'normal theory' | 'mean-scaled'
  /** always: the strictly positive difference is asked for; else its scaling is made where the ordinary one is not defined. */
  scalingAtUpper: 'always' | 'where needed'
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
  /** The scaling of the rung below at this one's estimates; null where it is not needed. */
  scalingOfLower: number | null
  /** Of the cells watched, in their order. */
  watched: number[]
}

export interface ResampleOutcome {
  /** Degrees of freedom of each rung. */
  df: number[]
  /** Per resample, per rung. */
  fits: ResampledFit[][]
}

/** The scaling factor of a general model at a restricted one's estimates, or null (methods: section 6). */
export type ScalingAtRestricted = (input: {
  general: ModelCells
  generalGamma: number[]
  restricted: ModelCells
  restrictedGamma: number[]
  moments: SampleMoments
  rows: Float64Array[]
}) => number | null

/** Pure: the same input gives the same outcome, and chunks of one run give what the whole run gives. */
export function resampleLadder(input: ResampleInput, scalingAtRestricted: ScalingAtRestricted): ResampleOutcome {
  const models = input.rungs.map(({ cells }) => compileModel(cells))
  const moments = input.samples.map((sample) => weightedMoments(sample))
  const weights = new Int32Array(input.strata.reduce((sum, size) => sum + size, 0))
  const fits = Array.from({ length: input.count }, (_, at) => {
    drawWeights(input.strata, resampleGenerator(input.seed, input.first + at), weights)
    return fitResample({ ...input, models, makers: moments, scalingAtRestricted }, weights)
  })
  return { df: models.map((model) => model.df), fits }
}

interface Fitting {
  model: CompiledModel
  moments: SampleMoments
  objective: Objective
  minimum: Minimum
  /** Converged, with every parameter determined. */
  solved: boolean
}

interface Setting extends ResampleInput {
  models: readonly CompiledModel[]
  makers: readonly WeightedMoments[]
  scalingAtRestricted: ScalingAtRestricted
}

function fitResample(input: Setting, weights: Int32Array): ResampledFit[] {
  const samples = input.makers.map((make) => make(weights))
  const fittings = input.rungs.map((rung, i): Fitting | null => {
    const moments = samples[rung.sample]!
    return moments === null ? null : fitRung(input.models[i]!, moments, rung.gamma)
  })
  input.rungs.forEach(({ nested }, i) => {
    if (nested && isBelow(fittings[i], fittings[i - 1])) fittings[i - 1] = searched(fittings[i - 1]!)
  })
  const rows = input.statistic === 'mean-scaled' ? input.samples.map((sample) => drawnRows(sample, weights)) : null
  const fits = fittings.map((fitting, i): ResampledFit => {
    if (fitting === null) return { ...blank, state: 'no moments' }
    if (!fitting.solved) return blank
    const { sample, watched } = input.rungs[i]!
    return resampledFit(fitting, rows === null ? null : rows[sample]!, watched)
  })
  if (rows === null) return fits
  return fits.map((fit, i) => ({ ...fit, scalingOfLower: scalingOfLower(input, i, fits, fittings, rows) }))
}

function scalingOfLower(
  { rungs, models, scalingAtUpper, scalingAtRestricted }: Setting,
  i: number,
  fits: readonly ResampledFit[],
  fittings: readonly (Fitting | null)[],
  rows: readonly Float64Array[][]
): number | null {
  const [general, restricted] = [rungs[i - 1], rungs[i]!]
  if (general === undefined || !restricted.nested || general.sample !== restricted.sample) return null
  const [lower, upper] = [fits[i - 1]!.scaled, fits[i]!.scaled]
  if (lower === null || upper === null) return null
  const ordinary = models[i]!.df * upper.scaling - models[i - 1]!.df * lower.scaling
  if (scalingAtUpper === 'where needed' && ordinary > 0 && lower.form === upper.form) return null
  return scalingAtRestricted({
    general: general.cells,
    generalGamma: [...fittings[i - 1]!.minimum.gamma],
    restricted: restricted.cells,
    restrictedGamma: [...fittings[i]!.minimum.gamma],
    moments: fittings[i]!.moments,
    rows: rows[restricted.sample]!
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
  scaled: null,
  scalingOfLower: null,
  watched: []
}

function fitRung(model: CompiledModel, moments: SampleMoments, gamma: number[] | null): Fitting {
  const objective = normalObjective(model, moments, 'normal')
  if (gamma !== null) {
    const minimum = minimiseWithin(objective, Float64Array.from(gamma), model.bounds, resampleScoring)
    if (isSolved(model, minimum)) return { model, moments, objective, minimum, solved: true }
  }
  const { best } = smallestMinimum(model, moments, objective)
  return { model, moments, objective, minimum: best, solved: isSolved(model, best) }
}

function isSolved(model: CompiledModel, minimum: Minimum): boolean {
  return minimum.stop === 'converged' && undetermined(model, minimum).length === 0
}

/** The restricted model fits better than the one it is nested in: the search for the latter ended too high. */
function isBelow(restricted: Fitting | null | undefined, general: Fitting | null | undefined): boolean {
  if (restricted == null || general == null || !restricted.solved || !general.solved) return false
  return restricted.minimum.value < general.minimum.value - 1e-7
}

function searched(fitting: Fitting): Fitting {
  const { best } = smallestMinimum(fitting.model, fitting.moments, fitting.objective)
  return isSolved(fitting.model, best) && best.value < fitting.minimum.value ? { ...fitting, minimum: best } : fitting
}

/** @param rows the drawn cases, where the statistic is to be scaled */
function resampledFit(
  { model, moments, objective, minimum }: Fitting,
  rows: Float64Array[] | null,
  watched: readonly WatchedCell[]
): ResampledFit {
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
    scaled: scaled?.scaled ?? null,
    scalingOfLower: null,
    watched: watched.map((cell) => watchedValue(cell, model, objective))
  }
}

/** The value of a cell where the objective was last evaluated. */
function watchedValue({ part, of, group }: WatchedCell, model: CompiledModel, { states }: Objective): number {
  const state = states[model.groups.findIndex((one) => one.name === group)]!
  const { p, m } = state
  const [i, j = -1] = of.map((name) => Math.max(model.indicators.indexOf(name), model.factors.indexOf(name))) as [number, number?]
  switch (part) {
    case 'loading':
      return state.lambda[i * m + j]!
    case 'factor regression':
      return state.beta[i * m + j]!
    case 'residual variance':
      return state.theta[i * p + i]!
    case 'residual covariance':
      return state.theta[i * p + j]!
    case 'factor variance':
      return state.psi[i * m + i]!
    case 'factor covariance':
      return state.c[i * m + j]! / Math.sqrt(state.c[i * m + i]! * state.c[j * m + j]!)
    case 'intercept':
      return state.nu[i]!
    case 'factor mean':
      return state.alpha[i]!
  }
}

function residualSize(objective: Objective, moments: SampleMoments, model: CompiledModel): number {
  const groups = objective.states.map(({ sigma, mu }, g) => {
    const { covariance, mean, n } = moments.groups[g]!
    return { sample: covariance, implied: sigma, sampleMean: mean, impliedMean: mu, weight: n / objective.total }
  })
  return standardisedResidual(groups, model.indicators.length).srmr
}
