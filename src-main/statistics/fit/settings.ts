/** What the plan decides about a fit. */
import type { Convention } from '../estimation/normal-likelihood.ts'

/** Where standard errors come from: covariance.ts says which matrices. */
export type StandardErrorKind = 'expected' | 'observed' | 'robust'

export interface FitSettings {
  convention: Convention
  /** "expected" when left out. */
  standardErrors?: StandardErrorKind
  /** "normal theory" when left out. */
  statistic?: 'normal theory' | 'mean-scaled'
}
