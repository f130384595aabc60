/** The numbers a rung shows, in order: the same list heads the ladder and fills each rung. Pure. */
import type { CandidateResult } from '../../src-main/operations/contract.ts'
import { bounded, fixed, precise, probability } from '../state/format.ts'

export interface RungNumber {
  name: string
  text: string
  /** A quieter addition, its space included: the degrees of freedom. */
  aside: string | null
  /** A second line: the interval, the scaling factor. */
  under: string | null
  title: string | undefined
}

export const rungColumns = ['T (df)', 'p', 'CFI', 'RMSEA', 'SRMR', 'AIC', 'BIC'] as const

/** One entry a column. T and p are the scaled ones where a scaled statistic was asked for. */
export function rungNumbers(result: CandidateResult): RungNumber[] {
  const { rmsea } = result
  const T = result.scaled?.T ?? result.T
  const p = result.scaled?.p ?? result.p
  const interval = rmsea.lower === null || rmsea.upper === null ? null : `[${bounded(rmsea.lower)}, ${bounded(rmsea.upper)}]`
  return [
    { name: 'T (df)', text: fixed(T, 2), aside: `\u00a0(${result.df})`, under: scalingUnder(result), title: precise(T) },
    { name: 'p', text: probability(p), aside: null, under: null, title: precise(p) },
    { name: 'CFI', text: bounded(result.cfi), aside: null, under: null, title: precise(result.cfi) },
    { name: 'RMSEA', text: bounded(rmsea.estimate), aside: null, under: interval, title: precise(rmsea.estimate) },
    { name: 'SRMR', text: bounded(result.srmr), aside: null, under: null, title: precise(result.srmr) },
    { name: 'AIC', text: fixed(result.aic, 1), aside: null, under: null, title: precise(result.aic) },
    { name: 'BIC', text: fixed(result.bic, 1), aside: null, under: null, title: precise(result.bic) }
  ]
}

function scalingUnder({ scaled }: CandidateResult): string | null {
  return scaled === null ? null : `c\u00a0=\u00a0${fixed(scaled.scaling, 3)}`
}

/** What the figures of these rungs rest on, where that is not the ordinary statistic; null where it is. */
export function scalingInWords(results: readonly CandidateResult[]): string | null {
  const forms = [...new Set(results.flatMap(({ scaled }) => (scaled === null ? [] : [scaled.form])))]
  if (forms.length === 0) return null
  const consistent = results.some(({ plugIn }) => plugIn !== null)
    ? '; CFI and RMSEA are of the population-consistent kind (the plug-in kind stands under Fit)'
    : ''
  return `T and its p are mean-scaled, c after ${forms.join(' and ')}${consistent}.`
}
