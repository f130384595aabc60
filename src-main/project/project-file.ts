/**
 * Project files on disk: making, opening and copying them, and refusing what cannot be trusted without touching it.
 *
 * A file is judged twice before it is opened for writing: its first 100 bytes are read as plain bytes, then a copy in
 * the system's temporary folder is checked by SQLite. Only a file that passes both is opened, so that a refused file
 * keeps every byte and gets no companion files.
 */
import { closeSync, copyFileSync, existsSync, mkdtempSync, openSync, readSync, renameSync, rmSync, statSync } from 'node:fs'
import { tmpdir } from 'node:os'
import { basename, dirname, join, resolve } from 'node:path'
import Database from 'better-sqlite3'
import { InputError } from '../study/input-error.ts'
import { codeOf, openDatabase, refusedBySystem } from './database.ts'
import { applicationId, migrate, schemaOf, schemaVersion } from './schema.ts'

/** A new, empty project in memory: a study that is not saved yet. */
export function createInMemory(): Database.Database {
  const database = openDatabase(':memory:')
  migrate(database)
  return database
}

/**
 * A new, empty project file.
 *
 * @throws InputError when something is there already or the folder cannot be written.
 */
export function createFile(path: string): Database.Database {
  if (existsSync(path))
    throw new InputError('There is already a file of this name.', { where: path, remedy: 'Choose another name.' })
  requireFolder(path)
  return refusedBySystem(path, () => {
    const database = new Database(path)
    migrate(database) // before the write-ahead log is on, so that the file's own first bytes say what it is
    database.close()
    return openDatabase(path)
  })
}

/**
 * Opens a project file for reading and writing, after `examineFile` found nothing against it.
 *
 * @throws InputError as `examineFile` and `check`, or when another program keeps it locked.
 */
export function openFile(path: string, check: (copy: Database.Database) => void): Database.Database {
  examineFile(path, check)
  return refusedBySystem(path, () => {
    const database = openDatabase(path)
    migrate(database)
    return database
  })
}

/**
 * Judges a file without touching it. Returns the digests of its trail, first row first.
 *
 * @param check what else to look at, on a copy that has had all migrations
 * @throws InputError: no such file, not a project, of a newer version, damaged.
 */
function examineFile(path: string, check: (copy: Database.Database) => void = () => {}): string[] {
  judgeHeader(path)
  return onCopy(path, (copy) => {
    judgeVersion(path, Number(copy.pragma('user_version', { simple: true })))
    const findings = copy.prepare<[], string>('PRAGMA quick_check(1)').pluck().all()
    if (findings.length !== 1 || findings[0] !== 'ok') throw damaged(path)
    if (!hasOurTables(copy)) throw damaged(path)
    if (copy.prepare('PRAGMA foreign_key_check').all().length > 0) throw damaged(path)
    migrate(copy)
    check(copy)
    return copy.prepare<[], string>('SELECT digest FROM trail ORDER BY number').pluck().all()
  })
}

/**
 * Writes a database to a new file at `path`. A project file that is already there is replaced only when the new one
 * continues its trail, so that no record is lost. `finish` may add to the new file before it takes its place.
 *
 * @throws InputError when the place is taken by anything else or cannot be written.
 */
export function copyInto(database: Database.Database, path: string, finish: (copy: Database.Database) => void): void {
  requireFolder(path)
  if (existsSync(path)) requireContinued(database, path)
  const part = `${path}.${process.pid}.part`
  try {
    refusedBySystem(path, () => {
      rmSync(part, { force: true })
      database.exec(`VACUUM INTO '${part.replaceAll("'", "''")}'`)
      const copy = new Database(part)
      try {
        copy.pragma('foreign_keys = ON')
        finish(copy)
      } finally {
        copy.close()
      }
      renameSync(part, path)
    })
  } finally {
    rmSync(part, { force: true })
  }
}

function requireContinued(database: Database.Database, path: string): void {
  const there = examineFile(path)
  const ours = database.prepare<[], string>('SELECT digest FROM trail ORDER BY number').pluck().all()
  if (there.some((digest, k) => ours[k] !== digest)) {
    throw new InputError('This project file holds records that the open study does not have, so it is not replaced.', {
      where: path,
      remedy: 'Choose another name.'
    })
  }
  if (existsSync(`${path}-wal`)) {
    throw new InputError('This project file is open elsewhere.', { where: path, remedy: 'Close it there, or choose another name.' })
  }
}

function requireFolder(path: string): void {
  const folder = dirname(resolve(path))
  const found = statSync(folder, { throwIfNoEntry: false })
  if (!found?.isDirectory())
    throw new InputError('There is no such folder.', { where: folder, remedy: 'Make it first, or choose another place.' })
}

/** The database header: magic text at 0, user_version at 60, application_id at 68, both big-endian (SQLite file format, section 1.3). */
const headerLength = 100
const magic = 'SQLite format 3\0'

function judgeHeader(path: string): void {
  const header = firstBytes(path)
  if (header.length < headerLength || header.toString('latin1', 0, magic.length) !== magic) {
    throw new InputError(`This is not a Rungwise project file.`, {
      where: path,
      remedy: 'Open a file that was saved by Rungwise; its name usually ends in .rungwise.'
    })
  }
  if (header.readUInt32BE(68) !== applicationId) {
    throw new InputError('This is a database of another program, not a Rungwise project file.', {
      where: path,
      remedy: 'Open a file that was saved by Rungwise; its name usually ends in .rungwise.'
    })
  }
  judgeVersion(path, header.readUInt32BE(60))
}

function firstBytes(path: string): Buffer {
  const found = statSync(path, { throwIfNoEntry: false })
  if (found === undefined) throw new InputError('There is no such file.', { where: path })
  if (!found.isFile()) throw new InputError('This is not a file.', { where: path })
  return refusedBySystem(path, () => {
    const file = openSync(path, 'r')
    try {
      const header = Buffer.alloc(headerLength)
      return header.subarray(0, readSync(file, header, 0, headerLength, 0))
    } finally {
      closeSync(file)
    }
  })
}

function judgeVersion(path: string, version: number): void {
  if (version > schemaVersion) {
    throw new InputError(
      `This project file was written by a newer Rungwise (file version ${version}; this program reads up to ${schemaVersion}).`,
      {
        where: path,
        remedy: 'Open it with the newer program.'
      }
    )
  }
  if (version < 1) throw damaged(path)
}

/** Runs `look` on a copy of the file, its companions included (a crash may have left the last changes there). */
function onCopy<T>(path: string, look: (copy: Database.Database) => T): T {
  const folder = mkdtempSync(join(tmpdir(), 'rungwise-check-'))
  try {
    const place = join(folder, basename(path))
    refusedBySystem(path, () => {
      copyFileSync(path, place)
      for (const companion of ['-wal', '-journal'])
        if (existsSync(path + companion)) copyFileSync(path + companion, place + companion)
    })
    return lookAt(path, place, look)
  } finally {
    rmSync(folder, { recursive: true, force: true })
  }
}

function lookAt<T>(path: string, place: string, look: (copy: Database.Database) => T): T {
  let copy: Database.Database | null = null
  try {
    copy = new Database(place)
    return look(copy)
  } catch (error) {
    if (error instanceof InputError) throw error
    if (isUnreadable(error)) throw damaged(path)
    throw error
  } finally {
    copy?.close()
  }
}

/** What SQLite says of a file whose pages do not hold together. */
function isUnreadable(error: unknown): boolean {
  return (
    /^SQLITE_(CORRUPT|NOTADB|IOERR|CANTOPEN)/.test(codeOf(error)) ||
    (error instanceof Error && /malformed|not a database/.test(error.message))
  )
}

function hasOurTables(copy: Database.Database): boolean {
  const ours = new Database(':memory:')
  migrate(ours, Number(copy.pragma('user_version', { simple: true })))
  const tables = (database: Database.Database) => JSON.stringify(schemaOf(database).filter((part) => part.type === 'table'))
  const same = tables(ours) === tables(copy)
  ours.close()
  return same
}

function damaged(path: string): InputError {
  return new InputError('This project file is damaged and was left as it is.', {
    where: path,
    remedy: 'Open a copy of it from before.'
  })
}
