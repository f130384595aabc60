/** The indices of one candidate with their names, and plain notes on when to trust them. Pure; nothing is computed. */
import type { CandidateResult } from '../../src-main/operations/contract.ts'
import { bounded, count, fixed, plural, precise, probability } from '../state/format.ts'

export interface FitLine {
  name: string
  text: string
  title: string | undefined
  aside: string | null
}
export interface FitSection {
  title: string
  /** What its lines have in common; null where they are of the usual kind. */
  note: string | null
  lines: FitLine[]
}

export function fitSections(r: CandidateResult): FitSection[] {
  return [
    {
      title: 'Exact fit',
      note: r.scaled === null ? null : `Scaling factor after ${r.scaled.form}.`,
      lines: [
        ...exactFit(r),
        line('Minimum F', r.minimum, fixed(r.minimum, 5), `T = F × N, N = ${count(r.n)}`),
        line(
          'Baseline T',
          r.baseline?.T ?? null,
          fixed(r.baseline?.T ?? null, 2),
          r.baseline === null ? null : `on ${count(r.baseline.df)} df`
        )
      ]
    },
    {
      title: 'Approximate fit',
      note: r.plugIn === null ? null : consistentNote,
      lines: [
        line('RMSEA', r.rmsea.estimate, bounded(r.rmsea.estimate), interval(r)),
        line('p, close fit (≤ .05)', r.rmsea.closeFitP, probability(r.rmsea.closeFitP)),
        line('p, not-close (≥ .08)', r.rmsea.notCloseFitP, probability(r.rmsea.notCloseFitP)),
        line('CFI', r.cfi, bounded(r.cfi)),
        line('TLI', r.tli, bounded(r.tli)),
        line('SRMR', r.srmr, bounded(r.srmr), 'covariances'),
        line('SRMR with means', r.srmrWithMeans, bounded(r.srmrWithMeans)),
        ...plugInLines(r),
        line("McDonald's centrality", r.mcdonald, bounded(r.mcdonald)),
        line('Gamma-hat', r.gammaHat, bounded(r.gammaHat))
      ]
    },
    {
      title: 'For comparing candidates',
      note: null,
      lines: [
        line('Free parameters', r.parameters, count(r.parameters)),
        line('Log-likelihood', r.logLikelihood, fixed(r.logLikelihood, 2)),
        line('AIC', r.aic, fixed(r.aic, 2), weight(r.aicWeight)),
        line('BIC', r.bic, fixed(r.bic, 2), weight(r.bicWeight)),
        line('Adjusted BIC', r.adjustedBic, fixed(r.adjustedBic, 2)),
        line('ECVI', r.ecvi, fixed(r.ecvi, 4))
      ]
    }
  ]
}

const consistentNote =
  'RMSEA, CFI and TLI are of the population-consistent kind (Brosseau-Liard, Savalei & Li 2012; Brosseau-Liard & Savalei 2014); plug-in: the scaled statistic put into the usual formula.'

/** The statistic that counts first; of a scaled one also its factor and the statistic before scaling. */
function exactFit(r: CandidateResult): FitLine[] {
  const df = `on ${count(r.df)} df`
  if (r.scaled === null) return [line('T', r.T, fixed(r.T, 2), df), line('p', r.p, probability(r.p))]
  return [
    line('T, mean-scaled', r.scaled.T, fixed(r.scaled.T, 2), df),
    line('p', r.scaled.p, probability(r.scaled.p)),
    line('Scaling factor c', r.scaled.scaling, fixed(r.scaled.scaling, 4)),
    line('T before scaling', r.T, fixed(r.T, 2), `p ${probability(r.p)}`)
  ]
}

function plugInLines({ plugIn }: CandidateResult): FitLine[] {
  if (plugIn === null) return []
  return [
    line('RMSEA, plug-in', plugIn.rmsea, bounded(plugIn.rmsea)),
    line('CFI, plug-in', plugIn.cfi, bounded(plugIn.cfi)),
    line('TLI, plug-in', plugIn.tli, bounded(plugIn.tli))
  ]
}

/** How the search for the smallest minimum went, in a sentence. */
export function searchInWords({ convergence }: CandidateResult): string {
  const { iterations, starts, minima } = convergence
  const went = `${plural(iterations, 'iteration')} from ${starts === 1 ? 'one start' : `${count(starts)} starts`}`
  if (minima > 1) return `${went}; ${count(minima)} distinct minima were seen, the smallest is shown.`
  return starts > 1 && minima === 1 ? `${went}, all that converged ending in the same minimum.` : `${went}.`
}

/** When N is such that the exact-fit test needs a word of caution (methods: section 5). */
export function sizeNotes(r: CandidateResult): string[] {
  const notes: string[] = []
  if (r.n >= 2000)
    notes.push(
      `With N = ${count(r.n)} nearly every exact-fit test rejects, however small the misfit. Look at the size of the misfit too.`
    )
  if (r.n < 100)
    notes.push(`With N = ${count(r.n)} the size of the exact-fit test is not what it claims: read its p-value with reserve.`)
  if (r.df === 0)
    notes.push('With no degrees of freedom the candidate reproduces the data whatever they are; its fit says nothing.')
  return notes
}

function line(name: string, value: number | null, text: string, aside: string | null = null): FitLine {
  return { name, text, title: precise(value), aside }
}

function interval(r: CandidateResult): string | null {
  return r.rmsea.lower === null || r.rmsea.upper === null ? null : `90% [${bounded(r.rmsea.lower)}, ${bounded(r.rmsea.upper)}]`
}

function weight(value: number | null): string | null {
  return value === null ? null : `weight ${value < 0.001 ? '< .001' : bounded(value)}`
}
