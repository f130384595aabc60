/**
 * What the user concludes: where on a ladder to stand, and why. It may differ from what the rules say.
 */

import { InputError } from '../study/input-error.ts'
import { ladderRungs, standingLadders } from '../study/ladders.ts'
import type { Bench } from './bench.ts'
import type { Operations, StudyView } from './contract.ts'

export async function recordDecision(bench: Bench, decision: Operations['recordDecision']['input']): Promise<StudyView> {
  const project = bench.requireProject()
  const plan = project.plan()
  const ladder = standingLadders(plan.ladders).find(({ name }) => name === decision.ladder)
  if (ladder === undefined) throw new InputError(`There is no ladder "${decision.ladder}".`, { where: 'ladder' })
  const rungs = ladderRungs(ladder, plan.candidates)
  if (!rungs.includes(decision.rung)) {
    const remedy = `Its rungs are ${rungs.map((rung) => `"${rung}"`).join(', ')}.`
    throw new InputError(`The ladder "${ladder.name}" has no rung "${decision.rung}".`, { where: 'rung', remedy })
  }
  project.recordDecision(decision)
  return bench.view()
}
