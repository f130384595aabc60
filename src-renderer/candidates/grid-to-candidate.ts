/**
 * What is typed into the grid and the lists beside it, as a Candidate of the contract. Pure.
 *
 * Rows are the indicators and, below them, the factors (a factor measured by a factor is second order); columns are
 * the factors. A cell is empty, "free", a number (fixed there) or a letter (held equal to the cells of that letter).
 */
import type { Candidate, CellName, Change, EqualSet, Factor, Release, Scaling } from '../../src-main/operations/contract.ts'

export type CellEntry =
  | { kind: 'empty' }
  | { kind: 'free' }
  | { kind: 'fixed'; at: number }
  | { kind: 'equal'; letter: string }
  | { kind: 'unreadable'; text: string }

/** A covariance the user set: `entry` as in a cell, never empty. */
export interface PairEntry {
  first: string
  second: string
  entry: string
}

export interface GridModel {
  name: string
  indicators: string[]
  factors: string[]
  /** (indicators + factors) x factors, as typed. */
  cells: string[][]
  scaling: Scaling
  factorCovariances: 'free' | 'zero'
  factorPairs: PairEntry[]
  residualPairs: PairEntry[]
  across: string | null
  equalAcrossGroups: EqualSet[]
  except: Release[]
}

export interface GridProblem {
  what: string
  /** The cell, or null when the whole is meant. */
  row: number | null
  column: number | null
  remedy: string | null
}

export type GridReading = { candidate: Candidate; problems: [] } | { candidate: null; problems: GridProblem[] }

/** Reads one cell; surrounding space and case do not matter. */
export function readCell(text: string): CellEntry {
  const typed = text.trim().toLowerCase()
  if (typed === '') return { kind: 'empty' }
  if (typed === 'free') return { kind: 'free' }
  if (/^[-\u2212+]?(\d+\.?\d*|\.\d+)$/.test(typed)) return { kind: 'fixed', at: Number(typed.replace('\u2212', '-')) }
  if (/^[a-z]\d{0,2}$/.test(typed)) return { kind: 'equal', letter: typed }
  return { kind: 'unreadable', text: text.trim() }
}

/** The candidate, or every reason why the grid is not one yet. */
export function gridToCandidate(grid: GridModel): GridReading {
  const problems = [...nameProblems(grid), ...cellProblems(grid)]
  if (problems.length > 0) return { candidate: null, problems }
  const factors = grid.factors.map((name, column): Factor => ({ name: name.trim(), measures: measuredBy(grid, column) }))
  const candidate: Candidate = {
    name: grid.name.trim(),
    from: null,
    factors,
    scaling: grid.scaling,
    factorCovariances: grid.factorCovariances,
    across: grid.across,
    equalAcrossGroups: grid.across === null || grid.equalAcrossGroups.length === 0 ? null : grid.equalAcrossGroups,
    except: grid.across === null ? [] : grid.except,
    change: [
      ...cellChanges(grid),
      ...pairChanges('residual covariance', grid.residualPairs),
      ...pairChanges('factor covariance', grid.factorPairs)
    ]
  }
  return { candidate, problems: [] }
}

/** Names of the rows: indicators, then factors. */
export function rowNames(grid: Pick<GridModel, 'indicators' | 'factors'>): string[] {
  return [...grid.indicators, ...grid.factors.map((name) => name.trim())]
}

/** The contract's name of the cell in a row and column. */
function cellName(grid: GridModel, row: number, column: number): CellName {
  const part = row < grid.indicators.length ? 'loading' : 'factor regression'
  return { part, of: [rowNames(grid)[row] ?? '', (grid.factors[column] ?? '').trim()] }
}

function measuredBy(grid: GridModel, column: number): string[] {
  return rowNames(grid).filter((_, row) => readCell(grid.cells[row]?.[column] ?? '').kind !== 'empty')
}

/** Fixed cells one by one, then one equality for each letter, in the order of the alphabet. */
function cellChanges(grid: GridModel): Change[] {
  const fixes: Change[] = []
  const letters = new Map<string, CellName[]>()
  eachCell(grid, (text, row, column) => {
    const entry = readCell(text)
    const cell = cellName(grid, row, column)
    if (entry.kind === 'fixed') fixes.push({ do: 'fix', cell, at: entry.at, group: null })
    if (entry.kind === 'equal') letters.set(entry.letter, [...(letters.get(entry.letter) ?? []), cell])
  })
  return [...fixes, ...equalities(letters)]
}

function pairChanges(part: 'residual covariance' | 'factor covariance', pairs: readonly PairEntry[]): Change[] {
  const changes: Change[] = []
  const letters = new Map<string, CellName[]>()
  for (const pair of pairs) {
    const entry = readCell(pair.entry)
    const cell: CellName = { part, of: [pair.first, pair.second] }
    if (entry.kind === 'fixed') changes.push({ do: 'fix', cell, at: entry.at, group: null })
    else if (entry.kind !== 'empty') changes.push({ do: 'free', cell, group: null })
    if (entry.kind === 'equal') letters.set(entry.letter, [...(letters.get(entry.letter) ?? []), cell])
  }
  return [...changes, ...equalities(letters)]
}

function equalities(letters: ReadonlyMap<string, CellName[]>): Change[] {
  return [...letters]
    .filter(([, cells]) => cells.length > 1)
    .sort(([a], [b]) => a.localeCompare(b))
    .map(([, cells]) => ({ do: 'equal', cells, group: null }))
}

function nameProblems(grid: GridModel): GridProblem[] {
  const problems: GridProblem[] = []
  const add = (what: string, remedy: string | null, column: number | null = null): void => {
    problems.push({ what, row: null, column, remedy })
  }
  if (grid.name.trim() === '') add('The candidate has no name', 'Give it one; it is how the ladder and the trail speak of it.')
  if (grid.factors.length === 0) add('There is no factor', 'Add one and mark the indicators it is measured by.')
  const names = grid.factors.map((name) => name.trim())
  names.forEach((name, column) => {
    if (name === '') add(`Factor ${column + 1} has no name`, null, column)
    else if (names.indexOf(name) < column) add(`Two factors are called ${name}`, 'Rename one of them.', column)
    else if (grid.indicators.includes(name)) add(`${name} is an indicator's name`, 'Call the factor something else.', column)
    if (name !== '' && measuredBy(grid, column).length === 0) {
      add(`${name} is not measured by anything`, 'Mark a cell of its column as free, or remove it.', column)
    }
  })
  return problems
}

function cellProblems(grid: GridModel): GridProblem[] {
  const problems: GridProblem[] = []
  const letters = new Map<string, number>()
  eachCell(grid, (text, row, column) => {
    const entry = readCell(text)
    if (entry.kind === 'equal') letters.set(entry.letter, (letters.get(entry.letter) ?? 0) + 1)
    if (entry.kind === 'unreadable') problems.push(unreadable(entry.text, row, column))
    const itself = row === grid.indicators.length + column
    if (itself && entry.kind !== 'empty')
      problems.push({ what: 'A factor cannot measure itself', row, column, remedy: 'Empty this cell.' })
  })
  eachCell(grid, (text, row, column) => {
    const entry = readCell(text)
    if (entry.kind !== 'equal' || letters.get(entry.letter) !== 1) return
    problems.push({
      what: `No other cell has the letter ${entry.letter}`,
      row,
      column,
      remedy: 'Put it in a second cell, or write free.'
    })
  })
  return problems
}

function unreadable(text: string, row: number, column: number): GridProblem {
  const comma = /^[-+]?\d*,\d+$/.test(text)
  const remedy = comma ? 'Write the number with a decimal point.' : 'Write free, a number, a single letter, or leave it empty.'
  return { what: `"${text}" is not a cell's content`, row, column, remedy }
}

function eachCell(grid: GridModel, visit: (text: string, row: number, column: number) => void): void {
  grid.cells.forEach((line, row) => {
    line.forEach((text, column) => {
      visit(text, row, column)
    })
  })
}
