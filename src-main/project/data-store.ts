/**
 * Data sets in a project: stored once, addressed by their digest, values as typed bytes (typed-values.ts).
 *
 * A group's `matrix` is its n x p rows (kind "rows") or its p x p covariances (kind "summary"), row-major.
 */
import type Database from 'better-sqlite3'
import type { Caution, DataSet } from '../study/study.ts'
import { fromBytes, toBytes } from './typed-values.ts'

interface SetRow {
  digest: string
  kind: 'rows' | 'summary'
  source: string
  indicators: string
  grouping: string | null
  divisor: 'n' | 'n-1' | null
  cautions: string
}
interface GroupRow {
  name: string | null
  n: number
  matrix: Uint8Array
  mean: Uint8Array | null
}

export function hasData(database: Database.Database, digest: string): boolean {
  return database.prepare('SELECT 1 FROM data_set WHERE digest = @digest').get({ digest }) !== undefined
}

/** Call inside the transaction that wrote row `trailNumber` of the trail. */
export function writeData(database: Database.Database, data: DataSet, trailNumber: number): void {
  database
    .prepare(
      `INSERT INTO data_set (digest, kind, source, indicators, grouping, divisor, cautions, trail_number)
       VALUES (@digest, @kind, @source, @indicators, @grouping, @divisor, @cautions, @trailNumber)`
    )
    .run({
      digest: data.digest,
      kind: data.kind,
      source: data.source,
      indicators: JSON.stringify(data.indicators),
      grouping: data.grouping,
      divisor: data.kind === 'summary' ? data.divisor : null,
      cautions: JSON.stringify(data.cautions),
      trailNumber
    })
  const insert = database.prepare(
    'INSERT INTO data_group (data_digest, position, name, n, matrix, mean) VALUES (@digest, @position, @name, @n, @matrix, @mean)'
  )
  const groups =
    data.kind === 'rows'
      ? data.groups.map((g) => ({ ...g, matrix: g.values, mean: null }))
      : data.groups.map((g) => ({ ...g, matrix: g.covariance }))
  groups.forEach(({ name, n, matrix, mean }, position) => {
    insert.run({ digest: data.digest, position, name, n, matrix: toBytes(matrix), mean: mean === null ? null : toBytes(mean) })
  })
}

/** The stored data set. Throws when there is none of this digest: a foreign key promised it. */
export function readData(database: Database.Database, digest: string): DataSet {
  const set = database.prepare<[{ digest: string }], SetRow>('SELECT * FROM data_set WHERE digest = @digest').get({ digest })
  if (set === undefined) throw new Error(`no data set ${digest}`)
  const groups = database
    .prepare<[{ digest: string }], GroupRow>(
      'SELECT name, n, matrix, mean FROM data_group WHERE data_digest = @digest ORDER BY position'
    )
    .all({ digest })
  const base = {
    digest,
    source: set.source,
    indicators: JSON.parse(set.indicators) as string[],
    grouping: set.grouping,
    cautions: JSON.parse(set.cautions) as Caution[]
  }
  if (set.kind === 'rows') {
    return { ...base, kind: 'rows', groups: groups.map(({ name, n, matrix }) => ({ name, n, values: fromBytes(matrix) })) }
  }
  return {
    ...base,
    kind: 'summary',
    divisor: set.divisor ?? 'n',
    groups: groups.map(({ name, n, matrix, mean }) => ({
      name,
      n,
      covariance: fromBytes(matrix),
      mean: mean === null ? null : fromBytes(mean)
    }))
  }
}
