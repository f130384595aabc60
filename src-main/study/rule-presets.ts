/**
 * Published rules of thumb for the change in fit across an invariance step, by their citation (methods: section 7).
 */
import type { Rules } from './study.ts'

/** How far an index may change and the step still hold; null where an index is not judged. */
export interface Thresholds {
  /** Lowest change that holds, zero or negative. */
  cfi: number | null
  /** Highest change that holds. */
  rmsea: number | null
  srmr: number | null
  /** Lowest change that holds, zero or negative. */
  mcdonald: number | null
  gammaHat: number | null
}

/** What a preset may look at in a step. */
export interface StepFacts {
  /** N over all groups. */
  n: number
  /** Cases per group. */
  sizes: readonly number[]
  /** Whether the step adds equal loadings. */
  loadings: boolean
}

const none: Thresholds = { cfi: null, rmsea: null, srmr: null, mcdonald: null, gammaHat: null }

/**
 * The thresholds of the rules for one step; null when the rules give none.
 *
 * Cheung & Rensvold (2002): CFI -.01, with McDonald's index -.02 and gamma-hat -.001. Chen (2007): CFI -.010 with RMSEA
 * .015 and SRMR .030 (loadings) or .010 (intercepts, residuals) for N above 300 and groups of about equal size, else
 * -.005, .010 and .025 or .005. Meade, Johnson & Braddy (2008): CFI -.002.
 */
export function thresholdsFor(rules: Rules, facts: StepFacts): Thresholds | null {
  const rule = rules.changeInFit
  if (rule === null) return null
  if (rule.preset === null)
    return { ...none, cfi: rule.cfi, rmsea: rule.rmsea, srmr: rule.srmr, mcdonald: rule.mcdonald, gammaHat: rule.gammaHat }
  switch (rule.preset) {
    case 'Cheung & Rensvold 2002':
      return { ...none, cfi: -0.01, mcdonald: -0.02, gammaHat: -0.001 }
    case 'Chen 2007':
      return chen(facts)
    case 'Meade, Johnson & Braddy 2008':
      return { ...none, cfi: -0.002 }
  }
}

/** "About equal" is taken as the largest group less than twice the smallest: the article gives no number. */
function chen({ n, sizes, loadings }: StepFacts): Thresholds {
  const large = n > 300 && Math.max(...sizes) < 2 * Math.min(...sizes)
  if (large) return { ...none, cfi: -0.01, rmsea: 0.015, srmr: loadings ? 0.03 : 0.01 }
  return { ...none, cfi: -0.005, rmsea: 0.01, srmr: loadings ? 0.025 : 0.005 }
}

/** The change-in-fit part of the rules in words: a published rule's name, or each threshold. */
export function changeInFitWords(rules: Rules): string[] {
  const rule = rules.changeInFit
  if (rule === null) return []
  if (rule.preset !== null) return [rule.preset]
  const names = { cfi: 'CFI', rmsea: 'RMSEA', srmr: 'SRMR', mcdonald: 'McDonald', gammaHat: 'gamma-hat' }
  return Object.entries(names).flatMap(([key, name]) => {
    const limit = rule[key as keyof typeof names]
    return limit === null ? [] : [`${name} ${limit > 0 ? '+' : ''}${String(limit).replace(/^(-?)0\./, '$1.')}`]
  })
}
