/**
 * Fitting what is still a draft, with progress and a way to stop; every finished fit is in the project at once.
 */

import { InputError } from '../study/input-error.ts'
import { nearestWord } from '../study/nearest.ts'
import type { Bench } from './bench.ts'
import type { Operations, StudyView, WorkEvent } from './contract.ts'
import { familyOf } from './family.ts'
import { compareRecorded, noteStopped, recordJudgements } from './recorded-work.ts'

/** Stopped work is no error: the view then shows what was finished. */
export async function fitCandidates(bench: Bench, { names }: Operations['fitCandidates']['input']): Promise<StudyView> {
  const project = bench.requireProject()
  const plan = project.plan()
  const family = familyOf(plan, project.candidateOrigins(), project.ladderOrigins())
  requireKnown(
    names,
    family.candidates.map((candidate) => candidate.name)
  )
  return bench.work(async (signal) => {
    const { crew, version } = bench.parts
    const work = { project, plan, origins: family.origins, names, version }
    const finish = announced(bench)
    try {
      await compareRecorded(work, crew, { signal, onWork: finish.pass })
    } catch (error) {
      if (!signal.aborted) throw error
    } finally {
      finish.ensure(signal.aborted)
    }
    if (signal.aborted) noteStopped(project)
    const view = await bench.view()
    recordJudgements(project, view.result, plan)
    return bench.view()
  })
}

export function cancelWork(bench: Bench): null {
  bench.stopWork()
  return null
}

/** Passes progress on and sees to it that "finished" is said exactly once, whatever ended the work. */
function announced(bench: Bench): { pass: (event: WorkEvent) => void; ensure: (cancelled: boolean) => void } {
  let finished = false
  const pass = (event: WorkEvent) => {
    if (event.kind === 'finished' && finished) return
    finished ||= event.kind === 'finished'
    bench.tell(event)
  }
  return { pass, ensure: (cancelled) => pass({ kind: 'finished', cancelled }) }
}

function requireKnown(names: string[] | null, known: string[]): void {
  const unknown = names?.find((name) => !known.includes(name))
  if (unknown === undefined) return
  const nearest = nearestWord(unknown, known)
  throw new InputError(`There is no candidate "${unknown}".`, {
    where: 'names',
    remedy: nearest === null ? null : `Did you mean "${nearest}"?`
  })
}
