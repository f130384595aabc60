/**
 * The workbench as both window shells start it: a pool of fit workers, the wall clock, the user's files.
 */
import { extname } from 'node:path'
import { createWorkbench, type Workbench } from '../operations/index.ts'
import { InputError } from '../study/input-error.ts'
import { createPool } from '../workers/pool.ts'
import { type ProgramFiles, readUserFile } from './files.ts'

/** The caller closes it; that ends its workers too. */
export function startWorkbench(files: ProgramFiles): Workbench {
  return createWorkbench({
    crew: createPool({ folder: files.bundles }),
    clock: () => new Date(),
    samplePlanPath: files.samplePlan,
    readFile: readUserFile,
    version: files.version
  })
}

/** Opens the plan (.yaml, .yml) or project file the user named. @throws InputError with the operation's own words when it cannot. */
export async function openInWorkbench(workbench: Workbench, path: string): Promise<void> {
  const isPlan = ['.yaml', '.yml'].includes(extname(path).toLowerCase())
  const answer = await workbench.call(isPlan ? 'openPlan' : 'openProject', { path })
  if (!answer.ok) throw new InputError(answer.problem.what, answer.problem)
}
