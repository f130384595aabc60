/**
 * The trail: an append-only record with one row for everything that happened to a study.
 *
 * A row's digest is the SHA-256 of the digest before it (empty for the first row), a line feed, and the canonical JSON
 * of { at, detail, number, sentence, what }. Changing, inserting or leaving out a row breaks every digest after it.
 * `detail` holds the digests and settings involved; `detail.content` is the digest of the row that was written with it.
 */
import type Database from 'better-sqlite3'
import { canonicalJson, digestOf } from './canonical-json.ts'
import { schemaOf, schemaVersion } from './schema.ts'

export interface TrailRow {
  number: number
  /** ISO time, UTC. */
  at: string
  /** Stable code of what happened, e.g. "candidate added". */
  what: string
  /** One sentence for people. */
  sentence: string
  /** Digests and settings involved. */
  detail: Readonly<Record<string, unknown>>
  digest: string
}
export type TrailEvent = Pick<TrailRow, 'what' | 'sentence' | 'detail'>

/** The first place where the record does not agree with itself. `number` is null when no single row can be named. */
export interface TrailBreak {
  number: number | null
  why: string
}

type StoredRow = Omit<TrailRow, 'detail'> & { detail: string }

/** Appends one row. Call it inside the transaction of the change it describes. Returns the row's number. */
export function appendTrail(database: Database.Database, at: string, event: TrailEvent): number {
  const last = database.prepare<[], StoredRow>('SELECT * FROM trail ORDER BY number DESC LIMIT 1').get()
  const number = (last?.number ?? 0) + 1
  const detail = canonicalJson(event.detail)
  const row = { number, at, what: event.what, sentence: event.sentence, detail }
  database
    .prepare(
      'INSERT INTO trail (number, at, what, sentence, detail, digest) VALUES (@number, @at, @what, @sentence, @detail, @digest)'
    )
    .run({ ...row, digest: chained(last?.digest ?? '', row) })
  return number
}

export function readTrail(database: Database.Database): TrailRow[] {
  return stored(database).map((row) => ({ ...row, detail: JSON.parse(row.detail) as Record<string, unknown> }))
}

/**
 * Goes through the whole record: the guards against change, the chain of digests, and what each row says about the
 * row that was written with it. Null when everything agrees.
 */
export function verifyTrail(database: Database.Database): TrailBreak | null {
  return brokenGuard(database) ?? brokenChain(database) ?? brokenContent(database)
}

function stored(database: Database.Database): StoredRow[] {
  return database.prepare<[], StoredRow>('SELECT number, at, what, sentence, detail, digest FROM trail ORDER BY number').all()
}

function chained(before: string, row: Omit<StoredRow, 'digest'>): string {
  const { number, at, what, sentence } = row
  return digestOf(`${before}\n${canonicalJson({ number, at, what, sentence, detail: JSON.parse(row.detail) as unknown })}`)
}

function brokenChain(database: Database.Database): TrailBreak | null {
  let before = ''
  let expected = 1
  for (const row of stored(database)) {
    if (row.number !== expected) return { number: expected, why: `row ${expected} is missing` }
    if (!agrees(before, row)) return { number: row.number, why: `row ${row.number} does not match its digest` }
    before = row.digest
    expected++
  }
  return null
}

function agrees(before: string, row: StoredRow): boolean {
  try {
    return chained(before, row) === row.digest
  } catch (error) {
    if (error instanceof SyntaxError) return false // a detail that is no JSON was not written by us
    throw error
  }
}

/**
 * Tables whose rows are described in the trail: the text that `detail.content` is the digest of, and the columns that
 * `detail` repeats under their own names.
 */
const described: readonly { table: string; content: string; repeated: readonly string[] }[] = [
  { table: 'study', content: 'plan', repeated: ['data_digest'] },
  { table: 'candidate', content: 'candidate', repeated: ['name', 'origin'] },
  { table: 'ladder', content: 'ladder', repeated: ['name', 'origin'] },
  { table: 'fit', content: 'outcome', repeated: ['digest', 'candidate', 'data_digest', 'settings', 'version', 'state'] },
  { table: 'relation', content: 'outcome', repeated: ['digest', 'version'] },
  { table: 'decision', content: 'decision', repeated: [] }
]

function brokenContent(database: Database.Database): TrailBreak | null {
  const details = new Map(stored(database).map((row) => [row.number, JSON.parse(row.detail) as Record<string, unknown>]))
  for (const { table, content, repeated } of described) {
    const rows = database.prepare<[], Record<string, unknown>>(`SELECT * FROM ${table} ORDER BY trail_number`).all()
    for (const row of rows) {
      const number = Number(row['trail_number'])
      const detail = details.get(number)
      if (detail === undefined) return { number, why: `row ${number} is missing` }
      const same =
        detail['content'] === digestOf(String(row[content])) && repeated.every((column) => detail[column] === row[column])
      if (!same) return { number, why: `the ${table} that row ${number} tells of has been changed since` }
    }
  }
  return null
}

function brokenGuard(database: Database.Database): TrailBreak | null {
  const present = new Set(
    schemaOf(database)
      .filter((part) => part.type === 'trigger')
      .map((part) => part.name)
  )
  const missing = guards.find((name) => !present.has(name))
  return missing === undefined
    ? null
    : { number: null, why: `the guard "${missing}" of schema version ${schemaVersion} was removed` }
}

/** Names of the triggers that keep what is recorded. */
const guards = [
  'trail_in_order',
  ...['trail', 'data_set', 'data_group', 'fit', 'relation', 'decision'].flatMap((table) => [
    `${table}_no_update`,
    `${table}_no_delete`
  ])
]
