/** A question to the program that is asked anew whenever its input changes; called while a component is set up. */
import type { OperationName, Operations } from '../../src-main/operations/contract.ts'
import type { Problem, StudyStore } from './study-store.svelte.ts'

export interface Asked<T> {
  /** null while the program works on it, and where it is refused. */
  readonly answer: T | null
  /** Why it is refused. */
  readonly problem: Problem | null
}

/** `input` must read what it depends on; an answer that comes after the next question is dropped. */
export function asked<N extends OperationName>(
  store: StudyStore,
  name: N,
  input: () => Operations[N]['input']
): Asked<Operations[N]['result']> {
  let answer = $state.raw<Operations[N]['result'] | null>(null)
  let problem = $state.raw<Problem | null>(null)
  $effect(() => {
    let current = true
    answer = null
    problem = null
    void store.ask(name, input()).then((got) => {
      if (!current) return
      if (got.ok) answer = got.value
      else problem = got.problem
    })
    return () => {
      current = false
    }
  })
  return {
    get answer() {
      return answer
    },
    get problem() {
      return problem
    }
  }
}
