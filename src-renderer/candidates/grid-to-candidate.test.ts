import { describe, expect, test } from 'vitest'
import { candidateSchema } from '../../src-main/study/study.ts'
import { type GridModel, gridToCandidate, readCell } from './grid-to-candidate.ts'

function grid(over: Partial<GridModel> = {}): GridModel {
  return {
    name: 'Two burdens',
    indicators: ['a1', 'a2', 'b1', 'b2'],
    factors: ['A', 'B'],
    cells: [
      ['free', ''],
      ['free', ''],
      ['', 'free'],
      ['', 'free'],
      ['', ''],
      ['', '']
    ],
    scaling: 'first loading',
    factorCovariances: 'free',
    factorPairs: [],
    residualPairs: [],
    across: null,
    equalAcrossGroups: [],
    except: [],
    ...over
  }
}

function cellsWith(...changes: [row: number, column: number, text: string][]): string[][] {
  const cells = grid().cells.map((line) => [...line])
  for (const [row, column, text] of changes) cells[row]![column] = text
  return cells
}

describe('reading one cell', () => {
  test('knows empty, free, numbers and letters, whatever their case and spaces', () => {
    expect(['', ' ', 'Free', '1', '-.5', '\u22120.25', '+2.', 'A', 'b12'].map((text) => readCell(text))).toEqual([
      { kind: 'empty' },
      { kind: 'empty' },
      { kind: 'free' },
      { kind: 'fixed', at: 1 },
      { kind: 'fixed', at: -0.5 },
      { kind: 'fixed', at: -0.25 },
      { kind: 'fixed', at: 2 },
      { kind: 'equal', letter: 'a' },
      { kind: 'equal', letter: 'b12' }
    ])
  })

  test('reads nothing into what it does not know', () => {
    expect(['0,5', '1e3', 'ab', '?', '1 2'].map((text) => readCell(text).kind)).toEqual(Array(5).fill('unreadable'))
  })
})

describe('a grid as a candidate', () => {
  test('a factor measures the rows that are marked in its column, in their order', () => {
    const { candidate } = gridToCandidate(grid())
    expect(candidate?.factors).toEqual([
      { name: 'A', measures: ['a1', 'a2'] },
      { name: 'B', measures: ['b1', 'b2'] }
    ])
    expect(candidate?.change).toEqual([])
  })

  test('what it yields is what the contract accepts, unchanged', () => {
    const full = grid({
      cells: cellsWith([0, 0, '1'], [1, 0, 'k'], [3, 1, 'k'], [1, 1, 'free']),
      residualPairs: [{ first: 'a1', second: 'b1', entry: 'free' }],
      across: 'site',
      equalAcrossGroups: ['loadings'],
      except: [{ cell: { part: 'loading', of: ['a2', 'A'] }, group: null }]
    })
    const { candidate } = gridToCandidate(full)
    expect(candidateSchema.parse(candidate)).toEqual(candidate)
  })

  test('a number fixes its cell and a letter ties its cells together', () => {
    const { candidate } = gridToCandidate(grid({ cells: cellsWith([0, 0, 'x'], [1, 0, 'x'], [2, 1, '0.8']) }))
    expect(candidate?.change).toEqual([
      { do: 'fix', cell: { part: 'loading', of: ['b1', 'B'] }, at: 0.8, group: null },
      {
        do: 'equal',
        cells: [
          { part: 'loading', of: ['a1', 'A'] },
          { part: 'loading', of: ['a2', 'A'] }
        ],
        group: null
      }
    ])
    expect(candidate?.factors?.[1]?.measures).toEqual(['b1', 'b2'])
  })

  test('an indicator may be measured by several factors', () => {
    const { candidate } = gridToCandidate(grid({ cells: cellsWith([0, 1, 'free']) }))
    expect(candidate?.factors?.map((factor) => factor.measures.includes('a1'))).toEqual([true, true])
  })

  test('a factor in a row is measured by the factor of its column, and its cell is a regression', () => {
    const second = grid({
      factors: ['A', 'B', 'G'],
      cells: [
        ...cellsWith()
          .map((line) => [...line, ''])
          .slice(0, 4),
        ['', '', 'free'],
        ['', '', '0.9'],
        ['', '', '']
      ]
    })
    const { candidate } = gridToCandidate(second)
    expect(candidate?.factors?.[2]).toEqual({ name: 'G', measures: ['A', 'B'] })
    expect(candidate?.change).toEqual([{ do: 'fix', cell: { part: 'factor regression', of: ['B', 'G'] }, at: 0.9, group: null }])
  })

  test('covariances set one by one come after the cells: free, fixed, or equal by a letter', () => {
    const pair = (first: string, second: string, entry: string) => ({ first, second, entry })
    const { candidate } = gridToCandidate(
      grid({ residualPairs: [pair('a1', 'b1', 'e'), pair('a2', 'b2', 'e')], factorPairs: [pair('A', 'B', '0')] })
    )
    const of = (first: string, second: string) => ({ part: 'residual covariance', of: [first, second] })
    expect(candidate?.change).toEqual([
      { do: 'free', cell: of('a1', 'b1'), group: null },
      { do: 'free', cell: of('a2', 'b2'), group: null },
      { do: 'equal', cells: [of('a1', 'b1'), of('a2', 'b2')], group: null },
      { do: 'fix', cell: { part: 'factor covariance', of: ['A', 'B'] }, at: 0, group: null }
    ])
  })

  test('what is equal between groups is only said where there are groups', () => {
    const { candidate } = gridToCandidate(grid({ equalAcrossGroups: ['loadings'] }))
    expect(candidate).toMatchObject({ across: null, equalAcrossGroups: null })
  })
})

describe('a grid that is not a candidate yet', () => {
  const cases: [string, Partial<GridModel>, string][] = [
    ['no name', { name: ' ' }, 'The candidate has no name'],
    ['no factor', { factors: [], cells: [[], [], [], []] }, 'There is no factor'],
    ['a factor without a name', { factors: ['A', ' '] }, 'Factor 2 has no name'],
    ['two factors of one name', { factors: ['A', 'A'] }, 'Two factors are called A'],
    ['a factor called like an indicator', { factors: ['A', 'a1'] }, "a1 is an indicator's name"],
    ['a factor that measures nothing', { cells: cellsWith([2, 1, ''], [3, 1, '']) }, 'B is not measured by anything'],
    ['a decimal comma', { cells: cellsWith([0, 0, '0,5']) }, '"0,5" is not a cell\'s content'],
    ['a letter that stands alone', { cells: cellsWith([0, 0, 'q']) }, 'No other cell has the letter q'],
    ['a factor that measures itself', { cells: cellsWith([4, 0, 'free']) }, 'A factor cannot measure itself']
  ]
  test.each(cases)('says so: %s', (_, over, what) => {
    const reading = gridToCandidate(grid(over))
    expect(reading.candidate).toBeNull()
    expect(reading.problems.map((problem) => problem.what)).toContain(what)
  })

  test('a decimal comma is answered with what to write', () => {
    const reading = gridToCandidate(grid({ cells: cellsWith([1, 0, '0,5']) }))
    expect(reading.problems).toEqual([
      { what: '"0,5" is not a cell\'s content', row: 1, column: 0, remedy: 'Write the number with a decimal point.' }
    ])
  })
})
