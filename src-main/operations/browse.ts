/**
 * Looking before opening: the folders and files of this machine, and the first look at a data file.
 */
import { readdirSync, statSync } from 'node:fs'
import { homedir } from 'node:os'
import { basename, dirname, extname, join, resolve } from 'node:path'
import { previewDelimited } from '../importing/delimited.ts'
import { refusedBySystem } from '../project/database.ts'
import { InputError } from '../study/input-error.ts'
import type { Bench } from './bench.ts'
import type { DataPreview, FolderEntry, FolderListing, Operations } from './contract.ts'

const kinds: Readonly<Record<string, FolderEntry['kind']>> = {
  '.yaml': 'plan',
  '.yml': 'plan',
  '.csv': 'data',
  '.tsv': 'data',
  '.rungwise': 'project'
}

/** Lists a folder, the user's own (null) to begin with. Hidden entries and what cannot be opened are left out. */
export function listFolder(_bench: Bench, input: Operations['listFolder']['input']): FolderListing {
  const path = resolve(input.path ?? homedir())
  const found = statSync(path, { throwIfNoEntry: false })
  if (!found?.isDirectory()) throw new InputError('There is no such folder.', { where: path })
  const names = refusedBySystem(path, () => readdirSync(path)).filter((name) => !name.startsWith('.'))
  const entries = names.map((name) => entryOf(path, name)).filter((entry) => entry !== null)
  entries.sort(foldersFirst)
  const parent = dirname(path)
  return { path, parent: parent === path ? null : parent, entries }
}

export async function previewData(bench: Bench, { path, missingCodes }: Operations['previewData']['input']): Promise<DataPreview> {
  const bytes = await bench.parts.readFile(path)
  return { path, ...previewDelimited(bytes, basename(path), missingCodes) }
}

/** Null for what is neither a folder nor a file that can be opened, a link to nothing included. */
function entryOf(folder: string, name: string): FolderEntry | null {
  const path = join(folder, name)
  const found = statSync(path, { throwIfNoEntry: false })
  if (found?.isDirectory()) return { name, path, kind: 'folder' }
  const kind = kinds[extname(name).toLowerCase()]
  return found?.isFile() && kind !== undefined ? { name, path, kind } : null
}

const byName = new Intl.Collator(undefined, { numeric: true, sensitivity: 'base' })

function foldersFirst(a: FolderEntry, b: FolderEntry): number {
  return Number(b.kind === 'folder') - Number(a.kind === 'folder') || byName.compare(a.name, b.name)
}
