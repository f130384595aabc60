/**
 * A fitted candidate of the open study with its solution at hand: the groups' matrices and the covariance of the estimates.
 */
import { normalObjective } from '../statistics/estimation/normal-likelihood.ts'
import { estimateCovariance } from '../statistics/fit/covariance.ts'
import { type CompiledModel, compileModel } from '../statistics/model/compile.ts'
import type { GroupState } from '../statistics/model/implied-moments.ts'
import { InputError } from '../study/input-error.ts'
import { didYouMean } from '../study/nearest.ts'
import type { Plan } from '../study/study.ts'
import type { OpenStudy } from './bench.ts'
import { type Entry, entriesOf } from './entries.ts'
import { type Family, familyOf } from './family.ts'

export interface FittedEntry {
  plan: Plan
  family: Family
  entry: Entry
  gamma: number[]
}

/**
 * @param purpose what the solution is wanted for, as the message has it: "to test"
 * @throws InputError for a candidate that is unknown or has no solution
 */
export function fittedEntry(study: OpenStudy, candidate: string, purpose: string | null = null): FittedEntry {
  const project = study.requireProject()
  const plan = project.plan()
  const family = familyOf(plan)
  const entry = entriesOf(plan, project.data(), study.parts.version, family).find((e) => e.candidate.name === candidate)
  if (entry === undefined) {
    const names = family.candidates.map(({ name }) => name)
    throw new InputError(`There is no candidate "${candidate}".`, {
      where: 'candidate',
      remedy: didYouMean(candidate, names, 'candidates')
    })
  }
  const gamma = project.fits().get(entry.digest)?.gamma ?? null
  if (gamma === null) {
    throw new InputError(`"${candidate}" has no solution${purpose === null ? '' : ` ${purpose}`}.`, {
      where: 'candidate',
      remedy: 'Fit it first; a fit that failed has none.'
    })
  }
  return { plan, family, entry, gamma }
}

export interface Solution {
  model: CompiledModel
  /** The groups' matrices at the solution. */
  states: readonly GroupState[]
  /** Of the estimates, as the plan's standard errors ask for; null when it cannot be computed. */
  covariance: Float64Array | null
  /** Cases of each group. */
  sizes: number[]
}

export function solutionOf({ cells, sample }: Entry, gamma: readonly number[], { estimation }: Plan): Solution {
  const model = compileModel(cells)
  const objective = normalObjective(model, sample.moments, estimation.convention)
  objective.evaluate(Float64Array.from(gamma))
  return {
    model,
    states: objective.states,
    covariance: estimateCovariance(model, objective, estimation.standardErrors, sample.rows),
    sizes: sample.moments.groups.map(({ n }) => n)
  }
}
