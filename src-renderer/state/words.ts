/** Cells and changes as people say them. Pure. */
import type { CandidateView, CellName, CellPart, Change, Release } from '../../src-main/operations/contract.ts'

/** "loading of sleep on Rest", "covariance of Rest and Mood". */
export function cellInWords(cell: CellName): string {
  const [first = '', second = ''] = cell.of
  switch (cell.part) {
    case 'loading':
      return `loading of ${first} on ${second}`
    case 'residual covariance':
    case 'factor covariance':
      return `${cell.part} of ${first} and ${second}`
    case 'factor regression':
      return `regression of ${first} on ${second}`
    default:
      return `${cell.part} of ${first}`
  }
}

export function changeInWords(change: Change): string {
  const where = change.group === null ? '' : ` in ${change.group}`
  switch (change.do) {
    case 'free':
      return `free the ${cellInWords(change.cell)}${where}`
    case 'fix':
      return `fix the ${cellInWords(change.cell)} at ${change.at}${where}`
    case 'equal':
      return `hold equal: ${change.cells.map(cellInWords).join(', ')}${where}`
    case 'constrain':
      return `constrain: ${change.terms.map(termInWords).join(' + ')} = ${change.to}${where}`
    case 'bound': {
      const limits = [
        change.atLeast === null ? null : `at least ${change.atLeast}`,
        change.atMost === null ? null : `at most ${change.atMost}`
      ]
      return `keep the ${cellInWords(change.cell)} ${limits.filter((limit) => limit !== null).join(' and ')}${where}`
    }
  }
}

/** "-2 x loading of pain on Rest in north" */
function termInWords({ cell, times, group }: Extract<Change, { do: 'constrain' }>['terms'][number]): string {
  return `${times === 1 ? '' : `${times} × `}${cellInWords(cell)}${group === null ? '' : ` in ${group}`}`
}

export function releaseInWords(release: Release): string {
  const where = release.group === null ? 'in every group' : `in ${release.group} only`
  return `let the ${cellInWords(release.cell)} differ ${where}`
}

export const partTitles: Readonly<Record<CellPart, string>> = {
  loading: 'Loadings',
  'factor regression': 'Factor regressions',
  'factor variance': 'Factor variances',
  'factor covariance': 'Factor covariances',
  'residual variance': 'Residual variances',
  'residual covariance': 'Residual covariances',
  intercept: 'Intercepts',
  'factor mean': 'Factor means'
}

/** The state of a candidate in two words at most; a solution with cautions says so. */
export function stateInWords(entry: CandidateView, cautions: number): string {
  if (entry.state === 'fitted' && cautions > 0) return cautions === 1 ? '1 caution' : `${cautions} cautions`
  return entry.state
}
