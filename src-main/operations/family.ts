/**
 * The whole family of a study: the candidates the user wrote and those that invariance ladders make of them.
 */
import type { ModelCells } from '../statistics/model/cells.ts'
import { compileModel } from '../statistics/model/compile.ts'
import { candidateCells, resolveCandidate } from '../study/candidate-model.ts'
import { ladderCandidates } from '../study/ladders.ts'
import { checkPlan, checkPlanAgainstData } from '../study/plan-references.ts'
import type { Candidate, DataSet, Origin, Plan } from '../study/study.ts'
import { type CandidateSample, type SampleSource, sampleSource } from './candidate-moments.ts'

export interface Family {
  /** Written ones in the plan's order, then generated ones ladder by ladder, bottom first. */
  candidates: Candidate[]
  /** Names of the generated ones. */
  generated: ReadonlySet<string>
  /** Of each generated one, the candidate that its ladder is of. */
  bases: ReadonlyMap<string, string>
  /** By name. A generated candidate is as old as its ladder, unless an origin is given for it by name. */
  origins: ReadonlyMap<string, Origin>
}

/** @param candidateOrigins @param ladderOrigins by name; a name left out is planned */
export function familyOf(
  plan: Plan,
  candidateOrigins: ReadonlyMap<string, Origin> = new Map(),
  ladderOrigins: ReadonlyMap<string, Origin> = new Map()
): Family {
  const candidates = [...plan.candidates]
  const origins = new Map(plan.candidates.map(({ name }) => [name, candidateOrigins.get(name) ?? 'planned']))
  const generated = new Set<string>()
  const bases = new Map<string, string>()
  for (const ladder of plan.ladders) {
    for (const rung of ladderCandidates(ladder, plan.candidates)) {
      if (origins.has(rung.name)) continue // two ladders may share a rung; the first made it
      candidates.push(rung)
      generated.add(rung.name)
      if ('invarianceOf' in ladder) bases.set(rung.name, ladder.invarianceOf)
      origins.set(rung.name, candidateOrigins.get(rung.name) ?? ladderOrigins.get(ladder.name) ?? 'planned')
    }
  }
  return { candidates, generated, bases, origins }
}

/** One candidate of the family as the cells of its model in these data. @throws InputError naming the candidate */
export function cellsOf(name: string, family: readonly Candidate[], plan: Plan, data: DataSet): ModelCells {
  return candidateCells(resolveCandidate(name, family), {
    indicators: data.indicators,
    grouping: data.grouping,
    groups: data.groups.map((group) => group.name),
    means: plan.estimation.convention !== 'wishart' && hasMeans(data)
  })
}

/** The sample that these cells are fitted to: by group where the model has named groups, else of all cases together. */
export function sampleOf(cells: ModelCells, source: SampleSource): CandidateSample {
  return source(
    cells.groups.some((group) => group.name !== null),
    cells.indicators
  )
}

/**
 * Everything that can be wrong with a plan and its data before anything is fitted: names, derivations, groups, and that
 * every candidate, generated ones included, makes a model of moments that these data have.
 *
 * @throws InputError for the first fault
 */
export function checkFamily(plan: Plan, data: DataSet): void {
  checkPlan(plan, placeIn(plan))
  checkPlanAgainstData(plan, data)
  const { candidates } = familyOf(plan)
  const samples = sampleSource(data, plan.estimation)
  for (const { name } of candidates) {
    const cells = cellsOf(name, candidates, plan, data)
    compileModel(cells)
    sampleOf(cells, samples)
  }
}

/** A path in the plan ("candidates.0.from") as words: which candidate, ladder or part is meant. */
function placeIn(plan: Plan): (path: string) => string | null {
  return (path) => {
    const [list, index] = path.split('.')
    if (list === 'candidates') return `candidate "${plan.candidates[Number(index)]?.name ?? index}"`
    if (list === 'ladders') return `ladder "${plan.ladders[Number(index)]?.name ?? index}"`
    return list ?? null
  }
}

function hasMeans(data: DataSet): boolean {
  return data.kind === 'rows' || data.groups.every((group) => group.mean !== null)
}
