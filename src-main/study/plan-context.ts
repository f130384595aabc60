/**
 * What the checks of a plan share: the way to fail with a place, and a candidate seen with its ancestors.
 */
import type { Candidate, DataPlan, EqualSet, Factor, Plan } from './study.ts'

/** Throws an InputError placed at `path`, a path below what is being checked ("" or ".factors.0"). */
export type Fail = (path: string, what: string, remedy?: string | null) => never

/** What the checks of one candidate need to know. */
export interface Context {
  plan: Plan
  byName: ReadonlyMap<string, Candidate>
  /** The candidate and its ancestors, root first. */
  lineage: Candidate[]
  factors: Factor[]
  across: string | null
  fail: Fail
}

/** The candidate and its ancestors, root first. Parents must be known and must not run in a circle. */
export function lineageOf(candidate: Candidate, byName: ReadonlyMap<string, Candidate>): Candidate[] {
  const lineage = [candidate]
  for (let from = candidate.from; from !== null; from = lineage[0]!.from) {
    const parent = byName.get(from)
    if (parent === undefined || lineage.includes(parent)) throw new Error(`The parents of "${candidate.name}" were not checked`)
    lineage.unshift(parent)
  }
  return lineage
}

/** The grouping that a candidate is across: its own word, or the nearest ancestor's. */
export function acrossOf(lineage: readonly Candidate[]): string | null {
  return lineage.findLast((candidate) => candidate.across !== null)?.across ?? null
}

/** The grouping of the data, null when there is none to compare across. */
export function groupingOf(data: DataPlan): string | null {
  return data.kind === 'file' ? data.group : data.groups.length > 1 ? data.group : null
}

export function hasMeans(plan: Plan): boolean {
  if (plan.estimation.convention === 'wishart') return false
  return plan.data.kind === 'file' || plan.data.groups.every((group) => group.mean !== null)
}

/** What the candidate or its nearest ancestor holds equal across groups. */
export function setsOf(lineage: readonly Candidate[]): EqualSet[] {
  return lineage.findLast((candidate) => candidate.equalAcrossGroups !== null)?.equalAcrossGroups ?? []
}

export function checkGrouping(plan: Plan, across: string, fail: (what: string, remedy: string) => never): void {
  const grouping = groupingOf(plan.data)
  if (grouping === null) {
    const add = plan.data.kind === 'file' ? 'Add "group:" with the column\'s name to the data.' : 'Give the summary of each group.'
    fail(`There are no groups in the data to go across "${across}".`, add)
  }
  if (across !== grouping) fail(`"${across}" is not the grouping of the data.`, `The grouping is "${grouping}".`)
}
