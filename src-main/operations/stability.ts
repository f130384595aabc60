/**
 * Resamples a ladder of the open study, with progress and a way to stop.
 */
import { InputError } from '../study/input-error.ts'
import { standingLadders } from '../study/ladders.ts'
import { didYouMean } from '../study/nearest.ts'
import type { LadderPlan, Plan } from '../study/study.ts'
import type { Bench } from './bench.ts'
import type { Operations } from './contract.ts'
import { ladderStability, requireCases } from './ladder-stability.ts'

type Stability = Operations['stability']

/** @throws InputError for a ladder that is unknown or not fitted yet, or data without cases */
export async function stability(bench: Bench, { ladder, ...resampling }: Stability['input']): Promise<Stability['result']> {
  const project = bench.requireProject()
  const plan = project.plan()
  const named = ladderNamed(ladder, plan)
  requireCases(project.data())
  return bench.work(async (signal) => {
    const { result } = await bench.view()
    const work = { project, plan, result, ...bench.parts }
    return ladderStability(work, named, resampling, { signal, onWork: (event) => bench.tell(event) })
  })
}

function ladderNamed(name: string, plan: Plan): LadderPlan {
  const ladders = standingLadders(plan.ladders)
  const ladder = ladders.find((one) => one.name === name)
  if (ladder !== undefined) return ladder
  const names = ladders.map((one) => one.name)
  throw new InputError(`There is no ladder "${name}".`, { where: 'ladder', remedy: didYouMean(name, names, 'ladders') })
}
