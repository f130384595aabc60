/**
 * Changes to the open study's plan: candidates and ladders are added, never taken away; rules change before the first fit.
 */
import { InputError } from '../study/input-error.ts'
import type { Plan } from '../study/study.ts'
import type { Bench } from './bench.ts'
import type { Operations, StudyView } from './contract.ts'
import { checkFamily, familyOf } from './family.ts'

export async function addCandidate(bench: Bench, { candidate }: Operations['addCandidate']['input']): Promise<StudyView> {
  const project = bench.requireProject()
  const plan = project.plan()
  if (familyOf(plan).candidates.some(({ name }) => name === candidate.name)) {
    throw new InputError(`There is a candidate "${candidate.name}" already.`, {
      where: 'name',
      remedy: 'Give this one another name.'
    })
  }
  checkFamily({ ...plan, candidates: [...plan.candidates, candidate] }, project.data())
  project.addCandidate(candidate)
  return bench.view()
}

export async function addLadder(bench: Bench, { ladder }: Operations['addLadder']['input']): Promise<StudyView> {
  const project = bench.requireProject()
  const plan = project.plan()
  if (plan.ladders.some(({ name }) => name === ladder.name)) {
    throw new InputError(`There is a ladder "${ladder.name}" already.`, { where: 'name', remedy: 'Give this one another name.' })
  }
  checkFamily({ ...plan, ladders: [...plan.ladders, ladder] }, project.data())
  project.addLadder(ladder)
  return bench.view()
}

export async function changeRules(bench: Bench, { rules }: Operations['changeRules']['input']): Promise<StudyView> {
  const project = bench.requireProject()
  bench.requireRest()
  const plan: Plan = { ...project.plan(), rules }
  checkFamily(plan, project.data())
  project.changeRules(rules)
  return bench.view()
}
