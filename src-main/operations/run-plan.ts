/**
 * A plan file from start to result, as the command line runs it: kept nowhere, or recorded in a project file.
 */
import { existsSync, rmSync } from 'node:fs'
import { canonicalJson } from '../project/canonical-json.ts'
import { createInMemoryProject, createProjectFile, openProjectFile, type Project } from '../project/project.ts'
import type { Clock } from '../project/records.ts'
import { InputError } from '../study/input-error.ts'
import { standingLadders } from '../study/ladders.ts'
import { didYouMean } from '../study/nearest.ts'
import type { StabilityResult, StudyResult } from '../study/result.ts'
import type { Candidate, DataSet, LadderPlan, Plan } from '../study/study.ts'
import type { Crew } from '../workers/jobs.ts'
import type { ReadFile } from './bench.ts'
import type { WorkEvent } from './contract.ts'
import { checkFamily, familyOf } from './family.ts'
import { type Inspection, inspect } from './inspect.ts'
import { ladderStability, type Resampling, requireCases } from './ladder-stability.ts'
import { type ReadPlan, readPlanFile } from './open-study.ts'
import { compareRecorded, noteStopped, recordJudgements } from './recorded-work.ts'

export interface PlanToRun {
  planPath: string
  /** Where to record; null to keep nothing. Made when it is not there. */
  projectPath: string | null
  readFile: ReadFile
  crew: Crew
  version: string
  clock: Clock
  /** Resample every ladder too; null for no resampling. */
  resampling?: Resampling | null
  /** Candidates to look into more closely. */
  inspect?: readonly string[]
  onWork?: (event: WorkEvent) => void
  signal?: AbortSignal
}

export interface PlanRun {
  result: StudyResult
  plan: Plan
  data: DataSet
  inspections: Inspection[]
}

/**
 * Everything is checked before anything is written: bad input leaves no file behind and an existing project as it was.
 * What the project holds already is not fitted again; what a changed plan adds to it is "added after results".
 *
 * @throws InputError for bad input; the signal's reason when it aborts (finished fits stay recorded)
 */
export async function runPlan(run: PlanToRun): Promise<PlanRun> {
  const read = await readPlanFile(run.planPath, run.readFile)
  if (run.resampling != null) requireCases(read.data)
  for (const name of run.inspect ?? []) requireCandidate(name, read.plan)
  const project = projectFor(read, run)
  try {
    const { plan, data } = read
    const { origins } = familyOf(plan, project.candidateOrigins(), project.ladderOrigins())
    const work = { project, plan, origins, names: null, version: run.version }
    const options = { ...(run.onWork && { onWork: run.onWork }), ...(run.signal && { signal: run.signal }) }
    const result = await compareRecorded(work, run.crew, options)
    recordJudgements(project, result, plan)
    const inspections: Inspection[] = []
    for (const name of run.inspect ?? []) inspections.push(await inspect({ requireProject: () => project, parts: run }, name))
    if (run.resampling == null) return { result, plan, data, inspections }
    const stability: StabilityResult[] = []
    for (const ladder of standingLadders(plan.ladders)) {
      stability.push(await ladderStability({ project, plan, result, ...run }, ladder, run.resampling, options))
      run.signal?.throwIfAborted()
    }
    return { result: { ...result, stability }, plan, data, inspections }
  } catch (error) {
    if (run.signal?.aborted === true) noteStopped(project)
    throw error
  } finally {
    project.close()
  }
}

function requireCandidate(name: string, plan: Plan): void {
  const names = familyOf(plan).candidates.map((candidate) => candidate.name)
  if (!names.includes(name))
    throw new InputError(`There is no candidate "${name}".`, { remedy: didYouMean(name, names, 'candidates') })
}

/** The project to record in, holding everything the plan names. */
function projectFor(read: ReadPlan, { projectPath, clock }: PlanToRun): Project {
  if (projectPath === null) return started(createInMemoryProject(clock), read)
  if (!existsSync(projectPath)) return startedFile(projectPath, read, clock)
  const project = openProjectFile(projectPath, clock, (copy) => whatIsNew(copy, read))
  try {
    continueWith(project, read)
    return project
  } catch (error) {
    project.close()
    throw error
  }
}

function started(project: Project, { plan, data, folder }: ReadPlan): Project {
  project.start(plan, data, folder)
  return project
}

/** A new file with the study in it, or no file. */
function startedFile(path: string, read: ReadPlan, clock: Clock): Project {
  const project = createProjectFile(path, clock)
  try {
    return started(project, read)
  } catch (error) {
    project.close()
    rmSync(path, { force: true })
    throw error
  }
}

/** What a plan brings that the project does not hold. */
interface News {
  /** The project holds no study, or one that nothing was fitted in and that the plan words otherwise. */
  whole: boolean
  candidates: Candidate[]
  ladders: LadderPlan[]
}

function continueWith(project: Project, read: ReadPlan): void {
  const { plan, data, folder } = read
  const news = whatIsNew(project, read)
  if (project.isEmpty) project.start(plan, data, folder)
  else if (news.whole) project.replacePlan(plan, data, folder)
  for (const candidate of news.candidates) project.addCandidate(candidate)
  for (const ladder of news.ladders) project.addLadder(ladder)
}

/** @throws InputError when the project and the plan cannot be one study */
function whatIsNew(project: Project, { plan, data }: ReadPlan): News {
  const nothing: News = { whole: false, candidates: [], ladders: [] }
  if (project.isEmpty) return { ...nothing, whole: true }
  const recorded = project.plan()
  if (recorded.study !== plan.study) {
    throw new InputError(`This project file holds another study, "${recorded.study}".`, {
      where: project.file,
      remedy: 'Name another project file for this plan.'
    })
  }
  const sameData = project.data().digest === data.digest
  if (!project.hasFits) return { ...nothing, whole: !sameData || !sameWords(plan, recorded) }
  requireSame(sameData, 'its data are not those', project)
  requireSame(canonicalJson(plan.estimation) === canonicalJson(recorded.estimation), 'its estimation is not that', project)
  requireSame(canonicalJson(plan.rules) === canonicalJson(recorded.rules), 'its rules are not those', project)
  const candidates = newOnes('candidate', recorded.candidates, plan.candidates, project)
  const ladders = newOnes('ladder', recorded.ladders, plan.ladders, project)
  if (candidates.length + ladders.length > 0) {
    const joined = {
      ...recorded,
      candidates: [...recorded.candidates, ...candidates],
      ladders: [...recorded.ladders, ...ladders]
    }
    checkFamily(joined, project.data())
  }
  return { whole: false, candidates, ladders }
}

/** The same plan, wherever its data lie. */
function sameWords(a: Plan, b: Plan): boolean {
  return canonicalJson({ ...a, data: null }) === canonicalJson({ ...b, data: null })
}

function requireSame(same: boolean, what: string, project: Project): void {
  if (same) return
  throw new InputError(`This study was already fitted and ${what} of the plan.`, {
    where: project.file,
    remedy: 'Data, estimation and rules stand since the first fit. Restore them in the plan, or name another project file.'
  })
}

/** Those that are not recorded yet. @throws InputError for one that is recorded otherwise */
function newOnes<T extends { name: string }>(kind: string, recorded: readonly T[], wanted: readonly T[], project: Project): T[] {
  const byName = new Map(recorded.map((one) => [one.name, one]))
  for (const one of wanted) {
    const there = byName.get(one.name)
    if (there === undefined || canonicalJson(there) === canonicalJson(one)) continue
    throw new InputError(`The ${kind} "${one.name}" of the plan is not the one that was recorded when results were seen.`, {
      where: project.file,
      remedy: 'Give the changed one a name of its own; the recorded one stays.'
    })
  }
  return wanted.filter((one) => !byName.has(one.name))
}
