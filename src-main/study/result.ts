/**
 * What a study yields: the one object that the window, the report and the command line all print.
 *
 * Full double precision; what does not apply is null, never left out, never NaN. Its keys are those of the published
 * result format, and a few more that the window needs. Fields without a comment mean what their index is called.
 */
import type { FitResult } from '../statistics/fit/fit-result.ts'
import type { Caution, Origin } from './study.ts'

export type { EstimateResult, FitResult, FitState } from '../statistics/fit/fit-result.ts'

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
  /** Scaling factor of the difference (T is already divided by it); null for normal theory. */
  scaling: number | null
  /** Size of the step: RMSEA of the difference (Browne & Du Toit 1992) with its 90% interval. */
  rmsea: { estimate: number | null; lower: number | null; upper: number | null }
  /** The value of T beyond which this step does not hold at the rules' alpha (after the adjustment that applied to it). */
  critical: number
}

/** Two models that are not nested, case by case (Vuong 1989). Signs: positive where `to` fits better. */
export interface NotNestedResult {
  /** Log-likelihood of `to` less that of `from`. */
  logLikelihoodRatio: number
  /** Variance of the casewise differences, divisor n. */
  omega2: number
  /** Whether the two can be told apart on these data: n omega^2 and its p; null where it cannot be computed. */
  distinguishable: { statistic: number; p: number } | null
  /** Null where omega^2 is zero. Not to be read where the two cannot be told apart. */
  z: number | null
  /** Two-sided; then one-sided, that `to` fits better, and that `from` does. */
  p: number | null
  pTo: number | null
  pFrom: number | null
  /** z corrected for the number of parameters, in the manner of AIC and of BIC. */
  correctedAic: { z: number; p: number } | null
  correctedBic: { z: number; p: number } | null
  /** 95% interval of the difference in BIC. */
  bicInterval: { lower: number; upper: number }
  evidenceAic: EvidenceRatio | null
  evidenceBic: EvidenceRatio | null
  /** The candidate that fits better at the rules' alpha; null when neither does. */
  favours: string | null
  sentence: string
}

/** How many times the weight of the favoured candidate is that of the other; null beyond what a number can hold. */
export interface EvidenceRatio {
  favours: string
  ratio: number | null
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
  /** Only of a pair that is not nested, where the cases themselves are there; else null. */
  notNested: NotNestedResult | null
  /** All deltas are the value of `to` minus the value of `from`. */
  deltaCfi: number | null
  deltaRmsea: number | null
  deltaSrmr: number | null
  deltaMcdonald: number | null
  deltaGammaHat: number | null
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

/** What is missing among the indicators, all groups together. */
export interface MissingResult {
  /** Answers missing. */
  values: number
  /** Cases with some answer missing: what complete-case analysis would drop. */
  cases: number
  /** Which indicators were answered together, most frequent first. */
  patterns: { answered: string[]; n: number }[]
}

/** Multivariate skewness and kurtosis by group (Mardia 1970), and each indicator's own. */
export interface NormalityResult {
  groups: NormalityGroup[]
  /** What they imply for the statistic, in plain words; null where no group allows the tests. */
  sentence: string | null
}

export interface NormalityGroup {
  group: string | null
  n: number
  skewness: { value: number; chiSquare: number; df: number; p: number }
  kurtosis: { value: number; expected: number; z: number; p: number }
  indicators: { name: string; skewness: number; kurtosis: number }[]
}

/** How often each step of a ladder holds, and each rung is the one to stand on, when the cases are drawn anew. */
export interface StabilityResult {
  ladder: string
  /** Resamples asked for, and done: fewer when the work was stopped. */
  asked: number
  resamples: number
  seed: number
  /** Resamples in which some rung has no solution; they are counted in everything, never left out. */
  incomplete: number
  /** Resamples in which one can stand nowhere: the lowest rung has no solution. */
  nowhere: number
  steps: {
    from: string
    to: string
    /** In the data themselves. */
    verdict: Verdict
    /** Resamples by verdict. */
    counts: Record<Verdict, number>
    /** In which the step held. */
    share: number
    /** The share that a step which is exactly true would have in resamples; null where no plain test decides alone. */
    expectedWhenExact: number | null
    /** The share of new samples of the same size in which it would hold, had the population the misfit estimated here; null likewise. */
    expectedInNewSamples: number | null
    sentence: string
  }[]
  rungs: {
    rung: string
    /** Resamples in which it is the one to stand on, and in which it has no solution. */
    stands: number
    unsolved: number
    share: number
    standsInData: boolean
    sentence: string
  }[]
  /** What the shares mean, and what they do not. */
  note: string
}

export interface StudyResult {
  study: string
  program: { name: 'rungwise'; version: string }
  data: {
    digest: string
    indicators: string[]
    groups: { name: string | null; n: number; complete: number }[]
    missing: MissingResult
    /** How far from normal the answers are, on the cases complete on every indicator; null for published summaries. */
    normality: NormalityResult | null
    cautions: Caution[]
  }
  candidates: CandidateResult[]
  ladders: LadderResult[]
  /** Ladder by ladder, where the command line was asked to resample. */
  stability?: StabilityResult[]
}
