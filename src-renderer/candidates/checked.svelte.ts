/** Asks the program, a moment after the last change, what a candidate would be: parameters, df, identified or not. */
import type { Candidate, CandidateCheck } from '../../src-main/operations/contract.ts'
import type { Problem, StudyStore } from '../state/study-store.svelte.ts'

const restMilliseconds = 200

export interface Checked {
  check: CandidateCheck | null
  problem: Problem | null
}

/** Call while a component is set up; `candidate` null means there is nothing to ask about yet. */
export function checkedCandidate(store: StudyStore, candidate: () => Candidate | null): Checked {
  const checked: Checked = $state({ check: null, problem: null })
  $effect(() => {
    const asked = candidate()
    if (asked === null) {
      checked.check = null
      checked.problem = null
      return
    }
    let current = true
    const timer = setTimeout(async () => {
      const answer = await store.ask('checkCandidate', { candidate: asked })
      if (!current) return
      checked.check = answer.ok ? answer.value : null
      checked.problem = answer.ok ? null : answer.problem
    }, restMilliseconds)
    return () => {
      current = false
      clearTimeout(timer)
    }
  })
  return checked
}
