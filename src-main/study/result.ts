/**
 * What a study yields: the one object that the window, the report and the command line all print.
 *
 * Full double precision; what does not apply is null, never left out, never NaN. Its keys are those of the published
 * result format, and a few more that the window needs. Fields without a comment mean what their index is called.
 */
import type { Caution, CellPart, Origin } from './study.ts'

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
  /** Completely standardised: indicators and factors of unit model-implied variance in their group. */
  standardized: number | null
}

/** One candidate's fit: the same fields whether it was fitted or failed. */
export interface FitResult {
  state: FitState
  /** Why it is not "fitted", one sentence; null when it is. */
  reason: string | null
  T: number | null
  df: number
  p: number | null
  scaled: { T: number; p: number; scaling: number } | null
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
  estimates: EstimateResult[]
  /** Per group, observed minus implied over sqrt(s_ii s_jj), lower triangle by rows; null when there is no solution. */
  residuals: { group: string | null; lower: number[][] }[] | null
  cautions: Caution[]
  convergence: {
    iterations: number
    /** max |dF/dgamma_k| times the parameter's typical size; null when no step could be made. */
    largestGradient: number | null
    /** Starting points tried and distinct minima seen among the converged ones. */
    starts: number
    minima: number
  }
}

export interface CandidateResult extends FitResult {
  name: string
  origin: Origin
  /** The candidate it was derived from. */
  from: string | null
  /** What it is, in one sentence: its factors, or what differs from its parent. */
  sentence: string
  /** Names of other candidates with the very same content. */
  sameAs: string[]
  /** Akaike and BIC weights over the candidates fitted to the same moments; null when not fitted. */
  aicWeight: number | null
  bicWeight: number | null
}

export type Relation = 'nested' | 'equivalent' | 'not nested'
export type Verdict = 'holds' | 'does not hold' | 'criteria disagree' | 'no test'

export interface DifferenceResult {
  T: number
  df: number
  p: number
  /** Holm over the tests of the ladder; null when the rules do not adjust. */
  holmP: number | null
  method: 'normal theory' | 'scaled' | 'strictly positive scaled' | 'boundary mixture'
  /** The value of T beyond which this step does not hold at the rules' alpha (after the adjustment that applied to it). */
  critical: number
}

export interface StepResult {
  /** The lower rung. */
  from: string
  /** The upper rung: `from` with constraints added. */
  to: string
  adds: string
  relation: Relation | null
  proof: 'constraints' | 'refit' | null
  difference: DifferenceResult | null
  /** All deltas are the value of `to` minus the value of `from`. */
  deltaCfi: number | null
  deltaRmsea: number | null
  deltaSrmr: number | null
  deltaAic: number | null
  deltaBic: number | null
  verdict: Verdict
  /** For "no test": why, in a few words ("not nested", "a side did not converge"); else null. */
  noTest: string | null
  /** One sentence with the numbers and the rule that decided. */
  because: string
}

export interface LadderResult {
  name: string
  /** Bottom first. */
  rungs: string[]
  /** Highest rung reached from the bottom by steps that hold; null when the bottom rung itself has no solution. */
  standHere: string | null
  steps: StepResult[]
}

export interface StudyResult {
  study: string
  program: { name: 'rungwise'; version: string }
  data: {
    digest: string
    indicators: string[]
    groups: { name: string | null; n: number; complete: number }[]
    cautions: Caution[]
  }
  candidates: CandidateResult[]
  ladders: LadderResult[]
}
