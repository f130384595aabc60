/**
 * The files of this program and of the user, as the shells hand them to the operations.
 */
import { randomUUID } from 'node:crypto'
import { readFileSync } from 'node:fs'
import { readFile, rename, rm, stat, writeFile } from 'node:fs/promises'
import { basename, dirname, join } from 'node:path'
import { InputError } from '../study/input-error.ts'

/** Where the parts of the built program lie, from its top folder (the one that holds package.json). */
export interface ProgramFiles {
  version: string
  bundles: string
  window: string
  preload: string
  samplePlan: string
}

export function programFiles(root: string): ProgramFiles {
  const manifest: { version: string } = JSON.parse(readFileSync(join(root, 'package.json'), 'utf8'))
  return {
    version: manifest.version,
    bundles: join(root, 'out', 'main'),
    window: join(root, 'out', 'renderer'),
    preload: join(root, 'out', 'preload', 'preload.cjs'),
    samplePlan: join(root, 'fixtures', 'sample', 'plan.yaml')
  }
}

/** The bytes of a file the user named. @throws InputError when it is not there, is a folder, or may not be read. */
export async function readUserFile(path: string): Promise<Uint8Array> {
  try {
    return await readFile(path)
  } catch (error) {
    throw asInputError(error, path)
  }
}

/** @throws InputError unless `path` is an existing file. */
export async function assertFile(path: string): Promise<void> {
  const found = await stat(path).catch((error: unknown) => {
    throw asInputError(error, path)
  })
  if (found.isDirectory()) throw new InputError('This is a folder, not a file.', { where: path })
}

/** @throws InputError when a file could not be written at `path`: its folder is missing, or a folder stands in its place. */
export async function assertWritablePlace(path: string): Promise<void> {
  const folder = dirname(path)
  const place = await stat(folder).catch(() => null)
  if (place === null) throw new InputError('The folder to write to does not exist.', { where: folder, remedy: 'Make it first.' })
  if (!place.isDirectory()) throw new InputError('This is a file, and a folder is needed to write into.', { where: folder })
  const there = await stat(path).catch(() => null)
  if (there?.isDirectory()) throw new InputError('This is a folder, and a file is to be written.', { where: path })
}

/** Writes beside `path` first and then takes its name, so that no reader ever sees half a file. */
export async function writeWhole(path: string, text: string): Promise<void> {
  const draft = join(dirname(path), `.${basename(path)}.${randomUUID()}`)
  try {
    await writeFile(draft, text, { flag: 'wx' })
    await rename(draft, path)
  } catch (error) {
    await rm(draft, { force: true })
    throw asInputError(error, path)
  }
}

const causes: Readonly<Record<string, string>> = {
  ENOENT: 'There is no such file.',
  ENOTDIR: 'There is no such file.',
  EISDIR: 'This is a folder, not a file.',
  EACCES: 'Permission is denied.',
  EPERM: 'Permission is denied.',
  EROFS: 'The disk is read-only.',
  ENOSPC: 'The disk is full.',
  ENAMETOOLONG: 'The name is too long.'
}

/** A refusal of the file system as bad input; anything else comes back as it is. */
function asInputError(error: unknown, path: string): unknown {
  const code = error instanceof Error && 'code' in error ? String(error.code) : ''
  const what = causes[code]
  return what === undefined ? error : new InputError(what, { where: path })
}
