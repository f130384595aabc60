/**
 * Writing files for the user: the project itself, its plan, its result. Each is written whole under another name first.
 */
import { randomUUID } from 'node:crypto'
import { renameSync, rmSync, statSync, writeFileSync } from 'node:fs'
import { basename, dirname, extname, join, relative, resolve } from 'node:path'
import { refusedBySystem } from '../project/database.ts'
import { sentences } from '../project/sentences.ts'
import { resultJson } from '../reporting/result-json.ts'
import { InputError } from '../study/input-error.ts'
import { writePlan } from '../study/plan-file.ts'
import type { Plan } from '../study/study.ts'
import type { Bench } from './bench.ts'
import type { Operations, StudyView } from './contract.ts'

/** Saves to a file of its own and goes on working in that file. In the file that is open everything is saved already. */
export async function saveProject(bench: Bench, { path }: Operations['saveProject']['input']): Promise<StudyView> {
  const project = bench.requireProject()
  bench.requireRest()
  requireEnding(path, ['.rungwise'], 'a project file')
  if (project.file === resolve(path)) return bench.view()
  return bench.replace(project.saveAs(resolve(path)))
}

/** Writes the plan with the data file named from the plan's new folder. */
export function exportPlan(bench: Bench, { path }: Operations['exportPlan']['input']): { path: string } {
  const project = bench.requireProject()
  requireEnding(path, ['.yaml', '.yml'], 'a plan')
  const target = resolve(path)
  writeWhole(target, writePlan(movedPlan(project.plan(), project.folder(), dirname(target))))
  project.note({ what: 'plan exported', sentence: sentences.planExported(basename(target)), detail: { file: basename(target) } })
  return { path: target }
}

export async function exportResult(bench: Bench, { path }: Operations['exportResult']['input']): Promise<{ path: string }> {
  const project = bench.requireProject()
  requireEnding(path, ['.json'], 'a result')
  const target = resolve(path)
  const { result } = await bench.view()
  if (result.candidates.length === 0)
    throw new InputError('Nothing is fitted yet, so there is no result to write.', { remedy: 'Fit the candidates first.' })
  writeWhole(target, resultJson(result))
  project.note({
    what: 'result exported',
    sentence: sentences.resultExported(basename(target)),
    detail: { file: basename(target) }
  })
  return { path: target }
}

/** The same plan for a file in `to`, when it was read from one in `from`. */
function movedPlan(plan: Plan, from: string | null, to: string): Plan {
  if (plan.data.kind !== 'file' || from === null) return plan
  const file = relative(to, resolve(from, plan.data.file)).replaceAll('\\', '/')
  return { ...plan, data: { ...plan.data, file } }
}

/** So that a slip of the hand does not write a plan over the data. */
function requireEnding(path: string, endings: readonly string[], what: string): void {
  if (endings.includes(extname(path).toLowerCase())) return
  throw new InputError(`The name of ${what} ends in ${endings.join(' or ')}.`, {
    where: path,
    remedy: `Add ${endings[0]} to the name.`
  })
}

function writeWhole(path: string, text: string): void {
  const folder = dirname(path)
  if (!statSync(folder, { throwIfNoEntry: false })?.isDirectory())
    throw new InputError('There is no such folder.', { where: folder })
  if (statSync(path, { throwIfNoEntry: false })?.isDirectory())
    throw new InputError('There is a folder of this name.', { where: path })
  const draft = join(folder, `.${basename(path)}.${randomUUID()}`)
  refusedBySystem(path, () => {
    try {
      writeFileSync(draft, text, { flag: 'wx' })
      renameSync(draft, path)
    } finally {
      rmSync(draft, { force: true })
    }
  })
}
