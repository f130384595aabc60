/** A first proposal for a new ladder. Pure. */
import type { LadderResult, StudyView } from '../../src-main/operations/contract.ts'
import { candidateOf } from '../state/look-up.ts'

export interface LadderStart {
  name: string
  /** Bottom first. */
  rungs: string[]
}

export const emptyStart: LadderStart = { name: '', rungs: [] }

/** The rungs of a ladder with one candidate more, put by its degrees of freedom: the more there are, the higher it stands. */
export function ladderWith(view: StudyView, ladder: LadderResult, candidate: string): LadderStart {
  const added = candidateOf(view, candidate)?.df ?? 0
  const above = ladder.rungs.findIndex((rung) => (candidateOf(view, rung)?.df ?? 0) > added)
  const at = above === -1 ? ladder.rungs.length : above
  return { name: `${ladder.name}, with ${candidate}`, rungs: ladder.rungs.toSpliced(at, 0, candidate) }
}
