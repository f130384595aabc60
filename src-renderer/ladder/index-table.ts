/** The table of every index: its columns, its order, and its text for copying. Pure. */
import type { CandidateResult } from '../../src-main/operations/contract.ts'
import { bounded, fixed, probability } from '../state/format.ts'

export interface IndexColumn {
  name: string
  value: (result: CandidateResult) => number | null
  show: (value: number | null) => string
}

const two = (value: number | null): string => fixed(value, 2)
const one = (value: number | null): string => fixed(value, 1)
const whole = (value: number | null): string => fixed(value, 0)
const three = (value: number | null): string => bounded(value)

export const indexColumns: readonly IndexColumn[] = [
  { name: 'T', value: (r) => r.scaled?.T ?? r.T, show: two },
  { name: 'df', value: (r) => r.df, show: whole },
  { name: 'p', value: (r) => r.scaled?.p ?? r.p, show: probability },
  { name: 'parameters', value: (r) => r.parameters, show: whole },
  { name: 'CFI', value: (r) => r.cfi, show: three },
  { name: 'TLI', value: (r) => r.tli, show: three },
  { name: 'RMSEA', value: (r) => r.rmsea.estimate, show: three },
  { name: 'lower', value: (r) => r.rmsea.lower, show: three },
  { name: 'upper', value: (r) => r.rmsea.upper, show: three },
  { name: 'close fit p', value: (r) => r.rmsea.closeFitP, show: probability },
  { name: 'SRMR', value: (r) => r.srmr, show: three },
  { name: 'SRMR with means', value: (r) => r.srmrWithMeans, show: three },
  { name: 'centrality', value: (r) => r.mcdonald, show: three },
  { name: 'gamma-hat', value: (r) => r.gammaHat, show: three },
  { name: 'AIC', value: (r) => r.aic, show: one },
  { name: 'AIC weight', value: (r) => r.aicWeight, show: three },
  { name: 'BIC', value: (r) => r.bic, show: one },
  { name: 'BIC weight', value: (r) => r.bicWeight, show: three },
  { name: 'adjusted BIC', value: (r) => r.adjustedBic, show: one },
  { name: 'ECVI', value: (r) => r.ecvi, show: (v) => fixed(v, 3) },
  { name: 'log-likelihood', value: (r) => r.logLikelihood, show: two }
]

/** Sorted by a column, what has no value last; `column` null keeps the study's order. */
export function sortedResults(results: readonly CandidateResult[], column: string | null, rising: boolean): CandidateResult[] {
  if (column === 'candidate') return [...results].sort((a, b) => (rising ? 1 : -1) * a.name.localeCompare(b.name))
  const chosen = indexColumns.find((entry) => entry.name === column)
  if (chosen === undefined) return [...results]
  return [...results].sort((a, b) => {
    const [x, y] = [chosen.value(a), chosen.value(b)]
    if (x === null || y === null) return Number(x === null) - Number(y === null)
    return rising ? x - y : y - x
  })
}

/** Tab-separated, full precision, plain minus; an empty field where nothing applies. */
export function tableAsText(results: readonly CandidateResult[]): string {
  const head = ['candidate', 'state', ...indexColumns.map((column) => column.name)]
  const rows = results.map((r) => [r.name, r.state, ...indexColumns.map((column) => String(column.value(r) ?? ''))])
  return [head, ...rows].map((row) => row.map((field) => field.replace(/[\t\r\n]+/g, ' ')).join('\t')).join('\n')
}
