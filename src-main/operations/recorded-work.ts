/**
 * Comparing with a project as the memory: what it holds is not fitted again, and every new outcome is written to it the
 * moment it is there, so that stopping or a crash loses nothing that was finished.
 */
import { canonicalJson } from '../project/canonical-json.ts'
import type { Project } from '../project/project.ts'
import { sentences } from '../project/sentences.ts'
import type { ModelCells } from '../statistics/model/cells.ts'
import type { StudyResult } from '../study/result.ts'
import type { Origin, Plan } from '../study/study.ts'
import type { Crew, FitJob, FitOutcome, RelationJob, RelationOutcome } from '../workers/jobs.ts'
import { type CompareOptions, compareStudy } from './compare-study.ts'
import type { StudyMemory } from './entries.ts'
import { cellsOf, familyOf } from './family.ts'

export interface RecordedWork {
  project: Project
  /** What to compare: the project's own plan, or the part of it that a plan file names. */
  plan: Plan
  origins: ReadonlyMap<string, Origin>
  /** Candidates to fit; null for all, empty to look only at what is there. */
  names: string[] | null
  version: string
}

/** @throws the signal's reason when it aborts; what was finished by then is recorded */
export async function compareRecorded(work: RecordedWork, crew: Crew, options: CompareOptions = {}): Promise<StudyResult> {
  const { plan, origins, names, project } = work
  const seen = watchedCrew(crew)
  const memory = recordingMemory(work, seen)
  return compareStudy({ plan, data: project.data(), origins, names, memory, version: work.version }, seen.crew, options)
}

/** Notes in the trail how every ladder stands on which a step could be judged: both its sides were tried. */
export function recordJudgements(project: Project, result: StudyResult, plan: Plan): void {
  const fitted = new Set(result.candidates.map((candidate) => candidate.name))
  for (const ladder of result.ladders) {
    if (ladder.steps.some(({ from, to }) => fitted.has(from) && fitted.has(to))) project.recordJudgement(ladder, plan.rules)
  }
}

export function noteStopped(project: Project): void {
  project.note({ what: 'fitting stopped', sentence: sentences.fittingStopped(), detail: {} })
}

interface WatchedCrew {
  crew: Crew
  fitJobs: WeakMap<FitOutcome, FitJob>
  relationJobs: WeakMap<RelationOutcome, RelationJob>
}

/** The same crew, remembering which job each outcome answered. */
function watchedCrew(crew: Crew): WatchedCrew {
  const fitJobs = new WeakMap<FitOutcome, FitJob>()
  const relationJobs = new WeakMap<RelationOutcome, RelationJob>()
  return {
    fitJobs,
    relationJobs,
    crew: {
      fit: async (job, signal) => {
        const outcome = await crew.fit(job, signal)
        fitJobs.set(outcome, job)
        return outcome
      },
      relation: async (job, signal) => {
        const outcome = await crew.relation(job, signal)
        relationJobs.set(outcome, job)
        return outcome
      },
      restrictedScaling: (job, signal) => crew.restrictedScaling(job, signal),
      notNested: (job, signal) => crew.notNested(job, signal),
      familyOrder: (job, signal) => crew.familyOrder(job, signal),
      resample: (job, signal) => crew.resample(job, signal),
      scoreTests: (job, signal) => crew.scoreTests(job, signal),
      close: () => crew.close()
    }
  }
}

function recordingMemory({ project, plan, version }: RecordedWork, seen: WatchedCrew): StudyMemory {
  const nameOf = namesByCells(plan, project)
  const keepFit = (digest: string, outcome: FitOutcome): FitOutcome => {
    const job = seen.fitJobs.get(outcome)
    if (job === undefined) throw new Error('an outcome is kept that no job of this crew gave')
    return project.recordFit({
      digest,
      candidate: job.candidate,
      settings: { ...plan.estimation, ...job.settings },
      version,
      outcome
    })
  }
  const keepRelation = (digest: string, outcome: RelationOutcome): RelationOutcome => {
    const job = seen.relationJobs.get(outcome)
    const [restricted, general] = [nameOf(job?.restricted), nameOf(job?.general)]
    project.recordRelation({ digest, restricted, general, version, outcome })
    return outcome
  }
  return {
    fits: new RecordingMap(project.fits(), keepFit),
    relations: new RecordingMap(project.relations(), keepRelation),
    notNested: casewiseTests(project)
  }
}

/** Casewise tests of a project's pairs, kept while it is open: they are made anew from what is recorded. */
function casewiseTests(project: Project): NonNullable<StudyMemory['notNested']> {
  const known = openTests.get(project) ?? new Map()
  openTests.set(project, known)
  return known
}

const openTests = new WeakMap<Project, NonNullable<StudyMemory['notNested']>>()

/** Which candidate has these cells; null for cells that no candidate has. Compiles the family at the first question only. */
function namesByCells(plan: Plan, project: Project): (cells: ModelCells | undefined) => string | null {
  let names: Map<string, string> | null = null
  return (cells) => {
    if (cells === undefined) return null
    const { candidates } = familyOf(plan)
    names ??= new Map(candidates.map(({ name }) => [canonicalJson(cellsOf(name, candidates, plan, project.data())), name]))
    return names.get(canonicalJson(cells)) ?? null
  }
}

/** A map that hands every new entry to `keep` first and holds what it returns. */
class RecordingMap<Value> extends Map<string, Value> {
  readonly #keep: (digest: string, value: Value) => Value

  constructor(known: ReadonlyMap<string, Value>, keep: (digest: string, value: Value) => Value) {
    super()
    for (const [digest, value] of known) super.set(digest, value)
    this.#keep = keep
  }

  override set(digest: string, value: Value): this {
    return super.set(digest, this.#keep(digest, value))
  }
}
