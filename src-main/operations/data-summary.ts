/**
 * Counts of a data set for people: cases per group, complete ones among them, missing answers.
 */
import type { DataSet } from '../study/study.ts'

/** Per group: rows (or published n), and those without a missing answer. */
export function completeCases(data: DataSet): { name: string | null; n: number; complete: number }[] {
  if (data.kind === 'summary') return data.groups.map(({ name, n }) => ({ name, n, complete: n }))
  const p = data.indicators.length
  return data.groups.map(({ name, n, values }) => {
    let complete = 0
    for (let row = 0; row < n; row++) if (!values.subarray(row * p, (row + 1) * p).some(Number.isNaN)) complete++
    return { name, n, complete }
  })
}
