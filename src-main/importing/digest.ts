/**
 * The address of a data set: SHA-256 over one canonical byte form, the same on every machine.
 *
 * The form is a line of JSON (kind, indicators, grouping, divisor, names and sizes of groups), then every value as an
 * IEEE 754 double, little-endian, group by group: rows, or covariances and means. A missing answer is the one NaN
 * 0x7ff8000000000000, and minus zero is written as zero.
 */
import { createHash } from 'node:crypto'
import type { DataSet, RowGroup, SummaryGroup } from '../study/study.ts'

type Undigested<T> = T extends DataSet ? Omit<T, 'digest' | 'source' | 'cautions'> : never

/** @returns "sha256:" and 64 hex digits */
export function digestOf(data: Undigested<DataSet>): string {
  const head = {
    kind: data.kind,
    indicators: data.indicators,
    grouping: data.grouping,
    divisor: data.kind === 'summary' ? data.divisor : null,
    groups: data.groups.map((group) => ({ name: group.name, n: group.n, values: valuesOf(group).map((values) => values.length) }))
  }
  const hash = createHash('sha256').update(`${JSON.stringify(head)}\n`)
  for (const group of data.groups) for (const values of valuesOf(group)) hash.update(littleEndian(values))
  return `sha256:${hash.digest('hex')}`
}

function valuesOf(group: RowGroup | SummaryGroup): Float64Array[] {
  if ('values' in group) return [group.values]
  return group.mean === null ? [group.covariance] : [group.covariance, group.mean]
}

function littleEndian(values: Float64Array): Uint8Array {
  const view = new DataView(new ArrayBuffer(values.length * 8))
  values.forEach((value, i) => {
    // a missing answer has one fixed bit pattern, whatever NaN it came as
    if (Number.isNaN(value)) view.setUint32(i * 8 + 4, 0x7ff80000, true)
    else view.setFloat64(i * 8, value === 0 ? 0 : value, true)
  })
  return new Uint8Array(view.buffer)
}
