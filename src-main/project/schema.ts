/**
 * The project file's schema: numbered migrations, only ever added to. A file's `user_version` is the number of
 * migrations it has had, its `application_id` says that it is ours.
 *
 * Every row of a table that records an event names the row of the trail that was written with it, so that no data
 * can appear without its trace. What was fitted, decided or written in the trail can neither be changed nor deleted.
 */
import type Database from 'better-sqlite3'

/** "RnGw" as four bytes, big-endian at offset 68 of the file. */
export const applicationId = 0x526e4777

const first = `
CREATE TABLE trail (
  number INTEGER PRIMARY KEY,
  at TEXT NOT NULL,
  what TEXT NOT NULL,
  sentence TEXT NOT NULL,
  detail TEXT NOT NULL,
  digest TEXT NOT NULL UNIQUE
) STRICT;

CREATE TABLE data_set (
  digest TEXT PRIMARY KEY,
  kind TEXT NOT NULL CHECK (kind IN ('rows', 'summary')),
  source TEXT NOT NULL,
  indicators TEXT NOT NULL,
  grouping TEXT,
  divisor TEXT CHECK (divisor IN ('n', 'n-1')),
  cautions TEXT NOT NULL,
  trail_number INTEGER NOT NULL REFERENCES trail (number)
) STRICT;

CREATE TABLE data_group (
  data_digest TEXT NOT NULL REFERENCES data_set (digest),
  position INTEGER NOT NULL,
  name TEXT,
  n INTEGER NOT NULL,
  matrix BLOB NOT NULL,
  mean BLOB,
  PRIMARY KEY (data_digest, position)
) STRICT;

CREATE TABLE study (
  id INTEGER PRIMARY KEY CHECK (id = 1),
  plan TEXT NOT NULL,
  folder TEXT,
  data_digest TEXT NOT NULL REFERENCES data_set (digest),
  trail_number INTEGER NOT NULL REFERENCES trail (number)
) STRICT;

CREATE TABLE candidate (
  position INTEGER PRIMARY KEY,
  name TEXT NOT NULL UNIQUE,
  origin TEXT NOT NULL CHECK (origin IN ('planned', 'added after results')),
  candidate TEXT NOT NULL,
  trail_number INTEGER NOT NULL REFERENCES trail (number)
) STRICT;

CREATE TABLE ladder (
  position INTEGER PRIMARY KEY,
  name TEXT NOT NULL UNIQUE,
  origin TEXT NOT NULL CHECK (origin IN ('planned', 'added after results')),
  ladder TEXT NOT NULL,
  trail_number INTEGER NOT NULL REFERENCES trail (number)
) STRICT;

CREATE TABLE fit (
  number INTEGER PRIMARY KEY,
  digest TEXT NOT NULL UNIQUE,
  candidate TEXT NOT NULL,
  data_digest TEXT NOT NULL REFERENCES data_set (digest),
  settings TEXT NOT NULL,
  version TEXT NOT NULL,
  state TEXT NOT NULL CHECK (state IN ('fitted', 'not converged', 'not identified', 'failed')),
  outcome TEXT NOT NULL,
  at TEXT NOT NULL,
  trail_number INTEGER NOT NULL REFERENCES trail (number)
) STRICT;
CREATE INDEX fit_by_candidate ON fit (candidate);

CREATE TABLE relation (
  digest TEXT PRIMARY KEY,
  outcome TEXT NOT NULL,
  version TEXT NOT NULL,
  trail_number INTEGER NOT NULL REFERENCES trail (number)
) STRICT;

CREATE TABLE decision (
  number INTEGER PRIMARY KEY,
  decision TEXT NOT NULL,
  at TEXT NOT NULL,
  trail_number INTEGER NOT NULL REFERENCES trail (number)
) STRICT;

CREATE TRIGGER trail_in_order BEFORE INSERT ON trail
WHEN NEW.number IS NOT (SELECT coalesce(max(number), 0) + 1 FROM trail)
BEGIN SELECT RAISE(ABORT, 'the trail only grows at its end'); END;
${['trail', 'data_set', 'data_group', 'fit', 'relation', 'decision'].map(kept).join('')}`

/** Two triggers that refuse to change or delete a row of `table`. */
function kept(table: string): string {
  return ['UPDATE', 'DELETE']
    .map(
      (verb) => `
CREATE TRIGGER ${table}_no_${verb.toLowerCase()} BEFORE ${verb} ON ${table}
BEGIN SELECT RAISE(ABORT, 'what is recorded in ${table} stays as it is'); END;`
    )
    .join('')
}

/** Migration k (counted from 1) takes a file of version k - 1 to version k. Add at the end; never edit one that was released. */
const migrations: readonly string[] = [first]

/** The version this program writes and the newest it reads. */
export const schemaVersion = migrations.length

/** Takes a database from its own version to the newest; all of it or nothing. */
export function migrate(database: Database.Database, through: number = schemaVersion): void {
  const from = Number(database.pragma('user_version', { simple: true }))
  if (from >= through) return
  database.transaction(() => {
    for (let version = from; version < through; version++) database.exec(migrations[version]!)
    database.pragma(`application_id = ${applicationId}`)
    database.pragma(`user_version = ${through}`)
  })()
}

/** The statements that made tables, indices and triggers, by kind and name. */
export function schemaOf(database: Database.Database): { type: string; name: string; sql: string }[] {
  return database
    .prepare<[], { type: string; name: string; sql: string }>(
      "SELECT type, name, sql FROM sqlite_master WHERE sql IS NOT NULL AND name NOT LIKE 'sqlite_%' ORDER BY type, name"
    )
    .all()
}
