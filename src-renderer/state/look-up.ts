/** Looking things up in a StudyView by name. Pure. */
import type { CandidateResult, CandidateView, DecisionView, LadderResult, StudyView } from '../../src-main/operations/contract.ts'

export function resultOf(view: StudyView, name: string): CandidateResult | null {
  return view.result.candidates.find((candidate) => candidate.name === name) ?? null
}

export function candidateOf(view: StudyView, name: string): CandidateView | null {
  return view.candidates.find((entry) => entry.candidate.name === name) ?? null
}

/** The ladder as it was climbed; before any fit, its planned rungs with no step between them. */
export function ladderOf(view: StudyView, name: string | null): LadderResult | null {
  const climbed = view.result.ladders.find((ladder) => ladder.name === name)
  if (climbed !== undefined) return climbed
  const plan = view.ladders.find((ladder) => ladder.name === name)
  if (plan === undefined) return null
  return { name: plan.name, rungs: 'rungs' in plan ? plan.rungs : [], standHere: null, steps: [] }
}

/** The name, counted on where a ladder has it. */
export function newLadderName(view: StudyView, wanted: string): string {
  const taken = new Set(view.ladders.map(({ name }) => name))
  for (let count = 1; ; count += 1) {
    const name = count === 1 ? wanted : `${wanted} (${count})`
    if (!taken.has(name)) return name
  }
}

/** The latest decision on a ladder. */
export function decisionOn(view: StudyView, ladder: string): DecisionView | null {
  return view.decisions.filter((decision) => decision.ladder === ladder).at(-1) ?? null
}

export function ladderHasRung(view: StudyView, ladder: string | null, rung: string): boolean {
  return ladderOf(view, ladder)?.rungs.includes(rung) ?? false
}

/** Every factor a candidate has, its parents' included. */
export function factorsOf(view: StudyView, name: string): string[] {
  const seen = new Set<string>()
  let current = candidateOf(view, name)
  while (current !== null && !seen.has(current.candidate.name)) {
    if (current.candidate.factors !== null) return current.candidate.factors.map((factor) => factor.name)
    seen.add(current.candidate.name)
    current = current.candidate.from === null ? null : candidateOf(view, current.candidate.from)
  }
  return []
}
