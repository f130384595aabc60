import { describe, expect, test } from 'vitest'
import type { CandidateResult } from '../../src-main/operations/contract.ts'
import { indexColumns, sortedResults, tableAsText } from './index-table.ts'

function result(name: string, T: number | null): CandidateResult {
  const rmsea = { estimate: null, lower: null, upper: null, closeFitP: null, notCloseFitP: null }
  return { name, state: 'fitted', T, df: 24, scaled: null, rmsea } as CandidateResult
}
const results = [result('b', 31.42), result('a', null), result('c', 2.5)]
const names = (column: string | null, rising: boolean) => sortedResults(results, column, rising).map((one) => one.name)

describe('the table of indices', () => {
  test('keeps the order of the study until a column is asked for', () => {
    expect(names(null, true)).toEqual(['b', 'a', 'c'])
  })

  test('sorts both ways, and what has no value stands last either way', () => {
    expect([names('T', true), names('T', false)]).toEqual([
      ['c', 'b', 'a'],
      ['b', 'c', 'a']
    ])
    expect([names('candidate', true), names('candidate', false)]).toEqual([
      ['a', 'b', 'c'],
      ['c', 'b', 'a']
    ])
  })

  test('is copied tab-separated at full precision, with empty fields where nothing applies', () => {
    const [head, first, second] = tableAsText([result('one\ttwo', -1 / 3), result('a', null)]).split('\n')
    expect(head?.split('\t')).toHaveLength(indexColumns.length + 2)
    expect(first?.split('\t').slice(0, 4)).toEqual(['one two', 'fitted', String(-1 / 3), '24'])
    expect(second?.split('\t').slice(0, 4)).toEqual(['a', 'fitted', '', '24'])
  })
})
