/**
 * `rungwise compare`: fits a plan's candidates and prints each ladder, or writes the result as JSON, and keeps nothing unless asked.
 */
import { resolve } from 'node:path'
import type { WorkEvent } from '../operations/contract.ts'
import { inspectionText } from '../operations/inspect.ts'
import { type PlanRun, runPlan } from '../operations/run-plan.ts'
import { resultJson } from '../reporting/result-json.ts'
import { studyText } from '../reporting/text-ladder.ts'
import { stabilityText } from '../reporting/text-stability.ts'
import { InputError } from '../study/input-error.ts'
import type { Crew } from '../workers/jobs.ts'
import { createPool } from '../workers/pool.ts'
import { assertWritablePlace, programFiles, readUserFile, writeWhole } from './files.ts'
import { progressLine } from './progress-line.ts'
import type { Surroundings } from './surroundings.ts'

export interface CompareWords {
  plan: string
  project: string | null
  /** A file, or "-" for standard output. */
  json: string | null
  /** Resample every ladder; null for no resampling. */
  resampling: { resamples: number; seed: number } | null
  /** A candidate to look into more closely; null for none. */
  inspect: string | null
}

/** Who fits; a pool of worker threads unless a test brings its own crew. */
export type CrewMaker = (bundles: string) => Crew

/**
 * Everything that can be refused is refused before the first fit, so that bad input leaves nothing behind.
 * @throws InputError for a bad plan, its data or a place that cannot be written to; the signal's reason when interrupted
 */
export async function compare(words: CompareWords, around: Surroundings, crewMaker: CrewMaker = poolOf): Promise<number> {
  const paths = await resolvePaths(words, around.folder)
  const files = programFiles(around.root)
  const crew = crewMaker(files.bundles)
  const progress = progressLine(around.stderr)
  try {
    const run = await runPlan({
      planPath: paths.plan,
      projectPath: paths.project,
      resampling: words.resampling,
      inspect: words.inspect === null ? [] : [words.inspect],
      readFile: readUserFile,
      crew,
      version: files.version,
      clock: () => new Date(),
      onWork: (event: WorkEvent) => progress.show(event),
      signal: around.signal
    })
    around.signal.throwIfAborted()
    progress.clear()
    await print(run, paths.json, around)
    return 0
  } finally {
    progress.clear()
    await crew.close()
  }
}

function poolOf(bundles: string): Crew {
  return createPool({ folder: bundles })
}

/** Absolute paths, checked against each other and for a place to write. */
async function resolvePaths(words: CompareWords, folder: string): Promise<CompareWords> {
  const plan = resolve(folder, words.plan)
  const project = words.project === null ? null : resolve(folder, words.project)
  const json = words.json === null || words.json === '-' ? words.json : resolve(folder, words.json)
  const written = [project, json].filter((path) => path !== null && path !== '-')
  if (written.includes(plan)) throw new InputError('The plan would be written over.', { where: plan, remedy: 'Name another file.' })
  if (project !== null && project === json) throw new InputError('--project and --json name the same file.', { where: project })
  for (const path of written) await assertWritablePlace(path!)
  return { ...words, plan, project, json }
}

/** JSON alone on standard output, or the text there and the JSON in its file. */
async function print(run: PlanRun, json: string | null, around: Surroundings): Promise<void> {
  const { result, inspections } = run
  const text = json === null ? null : resultJson(inspections.length === 0 ? result : { ...result, inspections })
  if (json === '-') {
    around.stdout.write(text!)
    return
  }
  if (text !== null) await writeWhole(json!, text)
  around.stdout.write(studyText({ result: run.result, estimation: run.plan.estimation, rules: run.plan.rules }))
  around.stdout.write(stabilityText(run.result.stability ?? []))
  for (const inspection of inspections) around.stdout.write(inspectionText(inspection))
}
