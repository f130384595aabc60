/**
 * Opening: a plan file, a project file, the sample, or a new study on a data file. What is open already stays open when
 * the new one cannot be opened.
 */
import { basename, dirname, resolve } from 'node:path'
import { loadData } from '../importing/load-data.ts'
import { createInMemoryProject, openProjectFile, type Project } from '../project/project.ts'
import { InputError } from '../study/input-error.ts'
import { parsePlan } from '../study/plan-file.ts'
import type { DataSet, Plan } from '../study/study.ts'
import type { Bench, ReadFile } from './bench.ts'
import type { Operations, StudyView } from './contract.ts'
import { checkFamily } from './family.ts'

export interface ReadPlan {
  plan: Plan
  data: DataSet
  /** The folder that the plan's data file is named from. */
  folder: string
}

/**
 * A plan file and its data, read and checked through: whatever passes can be fitted.
 *
 * @throws InputError for the first fault in the plan, the data or a candidate
 */
export async function readPlanFile(path: string, readFile: ReadFile): Promise<ReadPlan> {
  const plan = parsePlan(asText(await readFile(path), path), path)
  const folder = dirname(resolve(path))
  const data = await readData(plan, folder, readFile)
  checkFamily(plan, data)
  return { plan, data, folder }
}

export async function currentStudy(bench: Bench): Promise<StudyView | null> {
  return bench.project === null ? null : bench.view()
}

export function openSample(bench: Bench): Promise<StudyView> {
  return openPlan(bench, { path: bench.parts.samplePlanPath })
}

export async function openPlan(bench: Bench, { path }: Operations['openPlan']['input']): Promise<StudyView> {
  return bench.replace(projectOf(await readPlanFile(path, bench.parts.readFile), bench))
}

export async function openProject(bench: Bench, { path }: Operations['openProject']['input']): Promise<StudyView> {
  return bench.replace(openProjectFile(path, bench.parts.clock, requireStudy))
}

export async function newStudy(bench: Bench, input: Operations['newStudy']['input']): Promise<StudyView> {
  const { study, path, indicators, group, missingCodes, estimation, rules } = input
  const folder = dirname(resolve(path))
  const plan: Plan = {
    study,
    data: { kind: 'file', file: basename(path), indicators, group, missingCodes },
    estimation,
    candidates: [],
    ladders: [],
    rules
  }
  const data = await readData(plan, folder, bench.parts.readFile)
  checkFamily(plan, data)
  return bench.replace(projectOf({ plan, data, folder }, bench))
}

function requireStudy(project: Project): void {
  if (!project.isEmpty) return
  throw new InputError('This project file holds no study yet.', {
    where: project.file,
    remedy: 'Open another one, or start a study.'
  })
}

function projectOf({ plan, data, folder }: ReadPlan, bench: Bench): Project {
  const project = createInMemoryProject(bench.parts.clock)
  project.start(plan, data, folder)
  return project
}

async function readData({ data, estimation }: Plan, folder: string, readFile: ReadFile): Promise<DataSet> {
  const bytes = data.kind === 'file' ? await readFile(resolve(folder, data.file)) : new Uint8Array()
  return loadData(data, () => bytes, estimation.missing)
}

function asText(bytes: Uint8Array, path: string): string {
  try {
    return new TextDecoder('utf-8', { fatal: true }).decode(bytes)
  } catch {
    throw new InputError('This file is not UTF-8 text.', { where: path, remedy: 'Save the plan as UTF-8.' })
  }
}
