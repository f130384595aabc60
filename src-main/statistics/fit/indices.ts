/**
 * Indices of the fit of one model (methods: section 5), from T, df, N, G and the baseline.
 *
 * N is the one of every formula: sum n_g, or sum (n_g - 1) under the Wishart convention. What is undefined is null.
 */
import { chiSquareUpper } from '../distributions/chi-square.ts'
import { noncentralChiSquareLower, noncentralChiSquareUpper, noncentralityFor } from '../distributions/noncentral-chi-square.ts'
import type { RmseaResult } from './fit-result.ts'

export interface IndexInput {
  T: number
  df: number
  n: number
  groups: number
  /** p, indicators per group. */
  indicators: number
  baseline: { T: number; df: number }
  logLikelihood: number
  parameters: number
}

export interface Indices {
  p: number | null
  aic: number
  bic: number
  adjustedBic: number
  ecvi: number
  cfi: number
  tli: number | null
  mcdonald: number
  gammaHat: number
  rmsea: RmseaResult
}

export function fitIndices(input: IndexInput): Indices {
  const { T, df, n, groups, logLikelihood, parameters } = input
  return {
    p: df > 0 ? chiSquareUpper(T, df) : null,
    aic: -2 * logLikelihood + 2 * parameters,
    bic: -2 * logLikelihood + parameters * Math.log(n),
    adjustedBic: -2 * logLikelihood + parameters * Math.log((n + 2) / 24),
    ecvi: T / n + (2 * parameters) / n,
    ...pointIndices(input),
    tli: tuckerLewis(input),
    rmsea: rmsea(T, df, n, groups)
  }
}

/** The indices that rules of change in fit look at, without intervals: cheap enough for thousands of resamples. */
export function pointIndices(input: Omit<IndexInput, 'logLikelihood' | 'parameters'>): {
  cfi: number
  mcdonald: number
  gammaHat: number
  rmsea: number | null
} {
  const { T, df, n, groups, indicators } = input
  const misfit = (T - df) / n
  return {
    cfi: comparativeFit(input),
    mcdonald: Math.exp(-misfit / 2),
    gammaHat: (indicators * groups) / (indicators * groups + 2 * misfit),
    rmsea: df > 0 ? rmseaAt(Math.max(0, T - df), df, n, groups) : null
  }
}

/** CFI (Bentler 1990): 1 - max(T - df, 0) / max(T_b - df_b, T - df, 0); 1 when even the baseline fits. */
function comparativeFit({ T, df, baseline }: Pick<IndexInput, 'T' | 'df' | 'baseline'>): number {
  const noncentrality = Math.max(T - df, 0)
  const worst = Math.max(baseline.T - baseline.df, noncentrality)
  return worst > 0 ? 1 - noncentrality / worst : 1
}

/** TLI (Tucker & Lewis 1973), not truncated; null without degrees of freedom. */
function tuckerLewis({ T, df, baseline }: IndexInput): number | null {
  if (df <= 0 || baseline.df <= 0) return null
  const worst = baseline.T / baseline.df
  return worst === 1 ? null : (worst - T / df) / (worst - 1)
}

/** RMSEA (Steiger & Lind 1980; Steiger 1998) with its 90% interval and the tests of close and not-close fit (Browne & Cudeck 1993). */
export function rmsea(T: number, df: number, n: number, groups: number): RmseaResult {
  if (df <= 0) return { estimate: null, lower: null, upper: null, closeFitP: null, notCloseFitP: null }
  const of = (noncentrality: number) => rmseaAt(noncentrality, df, n, groups)
  const noncentralityAt = (value: number) => (value * value * n * df) / groups
  return {
    estimate: of(Math.max(0, T - df)),
    lower: of(noncentralityFor(T, df, 0.95)),
    upper: of(noncentralityFor(T, df, 0.05)),
    closeFitP: noncentralChiSquareUpper(T, df, noncentralityAt(0.05)),
    notCloseFitP: noncentralChiSquareLower(T, df, noncentralityAt(0.08))
  }
}

function rmseaAt(noncentrality: number, df: number, n: number, groups: number): number {
  return Math.sqrt((noncentrality / (df * n)) * groups)
}

/**
 * SRMR (Bentler 1995) over groups: root of the n_g/N-weighted mean square standardised residual.
 *
 * @param groups per group: S and Sigma (p x p), ybar and mu (p) or null, weight n_g/N
 * @returns without means (over p(p+1)/2 residuals) and, where means are modelled, with them (over p(p+1)/2 + p)
 */
export function standardisedResidual(
  groups: {
    sample: Float64Array
    implied: Float64Array
    sampleMean: Float64Array | null
    impliedMean: Float64Array
    weight: number
  }[],
  p: number
): { srmr: number; srmrWithMeans: number | null } {
  let covariances = 0
  let withMeans = 0
  const count = (p * (p + 1)) / 2
  for (const { sample, implied, sampleMean, impliedMean, weight } of groups) {
    let square = 0
    for (let i = 0; i < p; i++) {
      for (let j = 0; j <= i; j++) {
        const scale = Math.sqrt(sample[i * p + i]! * sample[j * p + j]!)
        square += ((sample[i * p + j]! - implied[i * p + j]!) / scale) ** 2
      }
    }
    let meanSquare = 0
    if (sampleMean !== null) for (let i = 0; i < p; i++) meanSquare += (sampleMean[i]! - impliedMean[i]!) ** 2 / sample[i * p + i]!
    covariances += (weight * square) / count
    withMeans += (weight * (square + meanSquare)) / (count + p)
  }
  const means = groups.every((g) => g.sampleMean !== null)
  return { srmr: Math.sqrt(covariances), srmrWithMeans: means ? Math.sqrt(withMeans) : null }
}
