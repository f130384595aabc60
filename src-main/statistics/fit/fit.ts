/**
 * One model on one set of moments, from start to Fit. The walk, top to bottom:
 *
 *     cells -> compiled model -> starts -> smallest minimum -> rank of the information -> estimates, indices, cautions
 *
 * A fit that fails is a value with its reason, never an exception.
 */
import { seededGenerator } from '../distributions/generator.ts'
import { heldAtBounds } from '../estimation/bounded.ts'
import { nullSpaceParameters, unidentifiedLabels } from '../estimation/identification.ts'
import { normalObjective } from '../estimation/normal-likelihood.ts'
import { type Minimum, ordinaryScoring } from '../estimation/scoring.ts'
import { submatrix } from '../matrix/symmetric.ts'
import { listed } from '../model/cell-words.ts'
import type { ModelCells } from '../model/cells.ts'
import { type CompiledModel, compileModel } from '../model/compile.ts'
import type { SampleMoments } from '../moments/sample-moments.ts'
import type { FitOutcome, FitState } from './fit-result.ts'
import { labelWords } from './label-words.ts'
import { failedFit, fittedResult } from './outcome.ts'
import { runawaySentence } from './runaway.ts'
import { smallestMinimum, startSeed } from './search.ts'
import type { FitSettings } from './settings.ts'

/**
 * @param rows per group n x p row-major, NaN where missing: needed where standard errors are robust or the statistic is scaled
 */
export function fitModel(
  cells: ModelCells,
  moments: SampleMoments,
  settings: FitSettings,
  rows: Float64Array[] | null = null
): FitOutcome {
  const model = compileModel(cells)
  const none = { iterations: 0, largestGradient: null, starts: 0, minima: 0, tried: [] }
  const fail = (state: Exclude<FitState, 'fitted'>, reason: string, convergence: FitOutcome['fit']['convergence'] = none) =>
    failedFit(model, moments, settings.convention, state, reason, convergence)
  if (model.df < 0)
    return fail('not identified', `It has ${model.parameters} free parameters for ${model.parameters + model.df} moments.`)

  const objective = normalObjective(model, moments, settings.convention)
  const { best, tried, minima } = smallestMinimum(model, moments, objective)
  const convergence = {
    iterations: best.iterations,
    largestGradient: Number.isFinite(best.largestGradient) ? best.largestGradient : null,
    starts: tried.length,
    minima,
    tried
  }

  const unknown = Number.isNaN(best.value) ? [] : undetermined(model, best)
  if (unknown.length > 0 || best.stop !== 'converged') {
    const generic = unidentifiedLabels(model, moments, seededGenerator(startSeed))
    const labels = generic.length > 0 ? generic : unknown
    const runaway = generic.length > 0 ? '' : runawaySentence(model, objective, best.gamma)
    const drifts = best.stop !== 'converged' && runaway !== ''
    if (labels.length > 0 && !drifts)
      return fail('not identified', notIdentifiedReason(model, labels, generic.length > 0) + runaway, convergence)
    return fail('not converged', stopReasons[best.stop] + runaway, convergence)
  }

  objective.evaluate(best.gamma)
  return { fit: fittedResult({ model, moments, objective, minimum: best, settings, rows, convergence }), gamma: [...best.gamma] }
}

const stopReasons: Record<Minimum['stop'], string> = {
  converged: 'The information is singular at the solution.',
  'iteration limit': `No minimum was reached within ${ordinaryScoring.iterations} iterations from any start.`,
  'no descent': 'The search stopped where no step leads down, without meeting the convergence criterion.',
  'bad start': 'No start gave a positive definite covariance matrix.'
}

/** Labels of the parameters that the information leaves open at the solution; one held at its bound is settled by that. */
export function undetermined(model: CompiledModel, { gamma, curvature }: Minimum): string[] {
  const held = heldAtBounds(model.bounds, gamma)
  const free = Array.from(gamma.keys()).filter((k) => !held.includes(k))
  const information = held.length === 0 ? curvature : submatrix(curvature, gamma.length, free)
  return nullSpaceParameters(information, free.length).map((k) => model.gammaLabels[free[k]!]!)
}

function notIdentifiedReason(model: CompiledModel, labels: string[], always: boolean): string {
  const cells = listed(labels.map((label) => labelWords(model, label)))
  return always
    ? `Whatever the data, these are not determined: ${cells}.`
    : `These data do not determine ${cells}: the information is singular at the solution.`
}
