/**
 * What fitting one model yields: the same fields whether it was fitted or failed; what does not apply is null, never NaN.
 */
import type { CellPart } from '../model/cells.ts'

/** A stated caution: a stable code, a sentence for the user, and the cell (names) it is about, or null. */
export interface Caution {
  code: string
  message: string
  cell: string[] | null
}

export type FitState = 'fitted' | 'not converged' | 'not identified' | 'failed'

export interface RmseaResult {
  estimate: number | null
  /** 90% interval. */
  lower: number | null
  upper: number | null
  /** p of the hypothesis RMSEA <= .05. */
  closeFitP: number | null
  /** p of the hypothesis RMSEA >= .08. */
  notCloseFitP: number | null
}

export interface EstimateResult {
  part: CellPart
  group: string | null
  of: string[]
  free: boolean
  /** The shared letter of an equality, null for a parameter of its own. */
  label: string | null
  estimate: number | null
  standardError: number | null
  /** Normal-theory 95% interval of the estimate. */
  lower: number | null
  upper: number | null
  /** Completely standardised: indicators and factors of unit model-implied variance in their group. */
  standardized: number | null
  /** Delta-method standard error of the standardised value. */
  standardizedError: number | null
}

/** A bounded cell: its limits (null where open), and on which of them the estimate lies. */
export interface BoundResult {
  part: CellPart
  group: string | null
  of: string[]
  atLeast: number | null
  atMost: number | null
  /** null where the estimate lies within. */
  active: 'at least' | 'at most' | null
}

export interface ScaledResult {
  /** T / c */
  T: number
  p: number
  /** c */
  scaling: number
  form: string
}

/** One start of the search for the smallest minimum. */
export interface StartRecord {
  start: 'ordinary' | 'perturbed'
  stop: 'converged' | 'iteration limit' | 'no descent' | 'bad start'
  /** F where it ended. */
  minimum: number | null
  iterations: number
}

/** One candidate's fit: the same fields whether it was fitted or failed. */
export interface FitResult {
  state: FitState
  /** Why it is not "fitted", one sentence; null when it is. */
  reason: string | null
  T: number | null
  df: number
  p: number | null
  /** The mean-scaled statistic, where the plan asks for it; `form` names the source of the scaling factor. */
  scaled: ScaledResult | null
  /** Free parameters, counted as in AIC and BIC (saturated means included where means are modelled). */
  parameters: number
  /** N of every formula: sum n_g, or sum (n_g - 1) under the Wishart convention. */
  n: number
  groups: number
  /** Smallest value of the discrepancy function F = T / N. */
  minimum: number | null
  logLikelihood: number | null
  unrestrictedLogLikelihood: number | null
  baseline: { T: number; df: number } | null
  aic: number | null
  bic: number | null
  adjustedBic: number | null
  ecvi: number | null
  cfi: number | null
  tli: number | null
  mcdonald: number | null
  gammaHat: number | null
  rmsea: RmseaResult
  srmr: number | null
  srmrWithMeans: number | null
  /**
   * cfi, tli and rmsea rest on T unless the statistic is scaled: then they are of the population-consistent kind
   * (Brosseau-Liard, Savalei & Li 2012; Brosseau-Liard & Savalei 2014), and the plain use of T_scaled stands here.
   */
  plugIn: { cfi: number | null; tli: number | null; rmsea: number | null } | null
  /** Which information the standard errors come from; null when there is no solution. */
  standardErrors: 'expected' | 'observed' | 'robust' | null
  estimates: EstimateResult[]
  /** Per group, observed minus implied over sqrt(s_ii s_jj), lower triangle by rows; null when there is no solution. */
  residuals: { group: string | null; lower: number[][] }[] | null
  /** Every cell that the candidate bounds; empty when there is no solution. df counts a cell on its bound as free. */
  bounds: BoundResult[]
  cautions: Caution[]
  convergence: {
    iterations: number
    /** max |dF/dgamma_k| times the parameter's typical size; null when no step could be made. */
    largestGradient: number | null
    /** Starting points tried and distinct minima seen among the converged ones. */
    starts: number
    minima: number
    /** Every start tried, in order. */
    tried: StartRecord[]
  }
}

/** `gamma` is the solution in the model's own parameter order, null when there is none. */
export interface FitOutcome {
  fit: FitResult
  gamma: number[] | null
}
