/**
 * Opening and closing a SQLite database the way every project is held, and telling a refusal of the system (a lock, a
 * full disk, missing rights) from a bug. Uses only calls that any synchronous SQLite binding of this shape offers.
 */
import Database from 'better-sqlite3'
import { InputError } from '../study/input-error.ts'

/** Write-ahead log (readers never wait), foreign keys enforced. */
export function openDatabase(path: string): Database.Database {
  const database = new Database(path)
  database.pragma('foreign_keys = ON')
  database.pragma('journal_mode = WAL')
  return database
}

/** Closes it and leaves one file behind, readable from a place that cannot be written. */
export function closeDatabase(database: Database.Database): void {
  try {
    database.pragma('busy_timeout = 0')
    database.pragma('journal_mode = DELETE')
  } catch (error) {
    if (!isLocked(error)) throw error // another window has it open: the log stays until that one closes
  } finally {
    database.close()
  }
}

const refusals: readonly { pattern: RegExp; what: string; remedy: string }[] = [
  {
    pattern: /^(SQLITE_BUSY|SQLITE_LOCKED|EBUSY)/,
    what: 'Another program is using this file.',
    remedy: 'Close it there and try again.'
  },
  {
    pattern: /^(SQLITE_READONLY|SQLITE_PERM|EACCES|EPERM|EROFS)/,
    what: 'This file or its folder cannot be written.',
    remedy: 'Change its rights, or choose another place.'
  },
  { pattern: /^(SQLITE_FULL|ENOSPC|EDQUOT)/, what: 'The disk is full.', remedy: 'Make room and try again.' },
  {
    pattern: /^(SQLITE_CANTOPEN|ENOENT|ENOTDIR|EISDIR|ENAMETOOLONG|EINVAL)/,
    what: 'This file cannot be opened.',
    remedy: 'Check its name and its folder.'
  }
]

/** Runs `work`; what the system refuses becomes an InputError about `path`, everything else passes through. */
export function refusedBySystem<T>(path: string, work: () => T): T {
  try {
    return work()
  } catch (error) {
    const refusal = refusals.find(({ pattern }) => pattern.test(codeOf(error)))
    if (refusal === undefined) throw error
    throw new InputError(refusal.what, { where: path, remedy: refusal.remedy })
  }
}

function isLocked(error: unknown): boolean {
  return /^SQLITE_(BUSY|LOCKED)/.test(codeOf(error))
}

/** The system's or SQLite's name for an error; empty when it has none. */
export function codeOf(error: unknown): string {
  return error instanceof Error && 'code' in error && typeof error.code === 'string' ? error.code : ''
}
