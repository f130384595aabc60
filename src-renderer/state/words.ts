/** Cells and changes as people say them. Pure. */
import type { CandidateView, Caution, CellName, CellPart, Change, Release } from '../../src-main/operations/contract.ts'

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

/** Codes of cautions that say a solution is one that no population can have. */
const improper: readonly string[] = [
  'negative-residual-variance',
  'negative-factor-variance',
  'factor-correlation-beyond-one',
  'factor-covariances-not-positive',
  'residual-covariances-not-positive'
]

/** The findings that make a solution improper; empty when it is a proper one. */
export function improperFindings(cautions: readonly Caution[]): Caution[] {
  return cautions.filter(({ code }) => improper.includes(code))
}

/** Bounds at zero for the variances that findings say are negative, in every group. */
export function boundsFor(findings: readonly Caution[]): Change[] {
  const parts: Readonly<Record<string, CellPart>> = {
    'negative-residual-variance': 'residual variance',
    'negative-factor-variance': 'factor variance'
  }
  const cells = findings.flatMap(({ code, cell }) => {
    const part = parts[code]
    return part === undefined || cell === null ? [] : [{ part, of: cell }]
  })
  return cells
    .filter((one, at) => cells.findIndex((other) => other.part === one.part && other.of.join() === one.of.join()) === at)
    .map((cell) => ({ do: 'bound', cell, atLeast: 0, atMost: null, group: null }))
}

/** The state of a candidate in two words at most; a solution that is improper or has cautions says so. */
export function stateInWords(state: CandidateView['state'], cautions: readonly Caution[]): string {
  if (state !== 'fitted' || cautions.length === 0) return state
  if (improperFindings(cautions).length > 0) return 'improper solution'
  return cautions.length === 1 ? '1 caution' : `${cautions.length} cautions`
}
