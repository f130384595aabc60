/**
 * The difference test of two nested models under the mean-scaled statistic (methods: section 6). A difference of scaled
 * statistics is no chi-square: the unscaled difference is divided by a factor of its own,
 *
 *     c_d = (df0 c0 - df1 c1) / (df0 - df1)      T_d = (T0 - T1) / c_d
 *
 * 0 the restricted model, 1 the general one (Satorra & Bentler 2001). It may turn out negative; the strictly positive
 * form (Satorra & Bentler 2010) puts c10, the scaling of the general model at the restricted model's estimates, for c1.
 */
import { chiSquareUpper } from '../distributions/chi-square.ts'
import { normalObjective } from '../estimation/normal-likelihood.ts'
import { scalingFactor } from '../estimation/scaling.ts'
import { missingScalingFactor } from '../estimation/scaling-missing.ts'
import { minimise } from '../estimation/scoring.ts'
import { startingValues } from '../estimation/starts.ts'
import type { ModelCells } from '../model/cells.ts'
import { type CompiledModel, compileModel } from '../model/compile.ts'
import { groupState, impliedMoments } from '../model/implied-moments.ts'
import type { SampleMoments } from '../moments/sample-moments.ts'
import type { DifferenceTest } from './difference-test.ts'

/** One side: T unscaled. `scaling` is not used where df is 0. */
export interface ScaledSide {
  T: number
  df: number
  scaling: number
}

export interface ScaledDifference extends DifferenceTest {
  /** c_d */
  scaling: number
  method: 'scaled' | 'strictly positive scaled'
}

/** Satorra & Bentler (2001); null when c_d is not positive, or the df do not differ. */
export function scaledDifference(restricted: ScaledSide, general: ScaledSide): ScaledDifference | null {
  return difference('scaled', restricted, general, general.scaling)
}

/**
 * Satorra & Bentler (2010).
 *
 * @param scalingAtRestricted c10, from `scalingAtRestricted`; not used where the general model has no df
 * @returns null when c_d is not positive, which theory excludes and only rounding can bring about
 */
export function strictlyPositiveDifference(
  restricted: ScaledSide,
  general: { T: number; df: number },
  scalingAtRestricted: number
): ScaledDifference | null {
  return difference('strictly positive scaled', restricted, general, scalingAtRestricted)
}

function difference(
  method: ScaledDifference['method'],
  restricted: ScaledSide,
  general: { T: number; df: number },
  generalScaling: number
): ScaledDifference | null {
  const df = restricted.df - general.df
  if (df <= 0) return null
  const own = general.df > 0 ? general.df * generalScaling : 0
  const scaling = (restricted.df * restricted.scaling - own) / df
  if (!(scaling > 0)) return null
  // Equal fits differ by rounding; a negative difference of that size is zero.
  const T = Math.max(0, restricted.T - general.T) / scaling
  return { T, df, p: chiSquareUpper(T, df), scaling, method }
}

/** A discrepancy below this is a perfect fit. */
const perfectFit = 1e-8

export interface ScalingAtRestrictedInput {
  general: ModelCells
  /** The general model's own solution, tried before its ordinary starting values. */
  generalGamma: number[]
  restricted: ModelCells
  restrictedGamma: number[]
  /** What both were fitted to. */
  moments: SampleMoments
  /** Per group n x p row-major, NaN where missing. */
  rows: Float64Array[]
}

/**
 * c10: the scaling factor of the general model at the point where it implies the restricted model's moments. The point is
 * found by fitting the general model to those moments, so that identification may shift between the two (factor means
 * freed where intercepts become equal): c depends on the moments and on the directions free there, not on the parameters.
 *
 * @returns null when the general model does not reproduce those moments (not nested), is singular there, or has no df
 */
export function scalingAtRestricted(input: ScalingAtRestrictedInput): number | null {
  const general = compileModel(input.general)
  if (general.df === 0) return null
  const gamma = reproducing(general, input)
  if (gamma === null) return null
  const { moments, rows } = input
  const objective = normalObjective(general, moments, 'normal')
  objective.evaluate(gamma)
  if (moments.groups.some((g) => (g.patterns?.length ?? 0) > 1)) return missingScalingFactor(general, objective, moments, rows)
  const q = general.parameters
  const curvature = new Float64Array(q * q)
  objective.derive(new Float64Array(q), curvature)
  const groups = rows.map((values) => ({ rows: values, size: values.length / general.indicators.length }))
  return scalingFactor({ model: general, states: objective.states, groups, curvature })?.scaling ?? null
}

/** The general model's gamma that implies the restricted model's moments; null when there is none. */
function reproducing(
  general: CompiledModel,
  { restricted, restrictedGamma, moments, generalGamma }: ScalingAtRestrictedInput
): Float64Array | null {
  const model = compileModel(restricted)
  const implied: SampleMoments = {
    indicators: general.indicators,
    groups: model.groups.map((group, g) => {
      const state = groupState(model.indicators.length, model.factors.length)
      impliedMoments(group, Float64Array.from(restrictedGamma), model.hasRegressions, state)
      return { name: group.name, n: moments.groups[g]!.n, covariance: state.sigma, mean: general.meanStructure ? state.mu : null }
    })
  }
  const objective = normalObjective(general, implied, 'normal')
  for (const from of [Float64Array.from(generalGamma), startingValues(general, implied)]) {
    const { gamma, value } = minimise(objective, from)
    if (value < perfectFit) return gamma
  }
  return null
}
