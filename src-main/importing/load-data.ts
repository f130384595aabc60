/**
 * The data a plan speaks of, as a checked data set.
 */
import { InputError } from '../study/input-error.ts'
import type { DataPlan, DataSet, Estimation } from '../study/study.ts'
import { readDelimited } from './delimited.ts'
import { summaryDataSet } from './summary.ts'

/**
 * @param readFile bytes of a file; the path is the plan's own word, relative to the plan
 * @param missing what estimation will do about missing answers: the data must be sound for that
 * @throws InputError when there is no such file, or its content cannot be worked with
 */
export function loadData(
  plan: DataPlan,
  readFile: (path: string) => Uint8Array,
  missing: Estimation['missing'] = 'complete cases'
): DataSet {
  if (plan.kind === 'summary') return summaryDataSet(plan)
  const { file, indicators, group, missingCodes } = plan
  return readDelimited(readBytes(file, readFile), { fileName: file, indicators, group, missingCodes, missing })
}

const REASONS: Readonly<Record<string, string>> = {
  ENOENT: 'There is no such file.',
  ENOTDIR: 'There is no such file.',
  EISDIR: 'This is a folder, not a file.',
  EACCES: 'The file may not be read.',
  EPERM: 'The file may not be read.'
}

function readBytes(path: string, readFile: (path: string) => Uint8Array): Uint8Array {
  try {
    return readFile(path)
  } catch (error) {
    const code = error instanceof Error && 'code' in error ? String(error.code) : ''
    const reason = REASONS[code]
    if (reason === undefined) throw error
    throw new InputError(reason, { where: path, remedy: 'The path is taken relative to the plan file.' })
  }
}
