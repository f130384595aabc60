/**
 * A ladder from its fits and proofs: tests, differences of indices, verdicts by the rules, and where one can stand.
 *
 * A comparison that is not valid is refused before it is computed, with the reason.
 */
import { pIs, signedIndex, statistic } from '../reporting/numbers.ts'
import { criticalValue, type DifferenceTest, holm, normalDifference } from '../statistics/comparison/difference-test.ts'
import type { CandidateResult, LadderResult, StepResult, Verdict } from '../study/result.ts'
import type { Rules } from '../study/study.ts'
import type { RelationOutcome } from '../workers/jobs.ts'

/** One step before it is judged: its sides (null where not fitted yet), what it adds, and how its models stand to each other. */
export interface StepGround {
  from: string
  to: string
  lower: CandidateResult | null
  upper: CandidateResult | null
  adds: string
  /** Same indicators, same groups, same treatment of means. */
  sameMoments: boolean
  /** null where it was not asked, because a side has no solution. */
  relation: RelationOutcome | null
}

export function ladderResult(name: string, rungs: string[], grounds: readonly StepGround[], rules: Rules): LadderResult {
  const tests = grounds.map(testOf)
  const pValues = tests.filter((test) => test !== null).map((test) => test.p)
  const adjusted = holm(pValues)
  let at = 0
  const steps = grounds.map((ground, i) => {
    const test = tests[i]!
    return stepResult(ground, test, test === null || rules.adjust === 'none' ? null : adjusted[at++]!, rules)
  })
  return { name, rungs, standHere: standHere(rungs, grounds, steps), steps }
}

/** The chi-square difference, where it is licensed. */
function testOf(ground: StepGround): DifferenceTest | null {
  if (refusal(ground) !== null || ground.relation?.relation !== 'nested') return null
  const { lower, upper } = ground
  return normalDifference({ T: upper!.T!, df: upper!.df }, { T: lower!.T!, df: lower!.df })
}

interface Refusal {
  short: string
  sentence: string
}

/** Why this pair cannot be tested; null when it can. */
function refusal({ from, to, lower, upper, sameMoments, relation }: StepGround): Refusal | null {
  if (lower === null || upper === null) {
    const missing = lower === null ? from : to
    return { short: 'not fitted yet', sentence: `${missing} has not been fitted yet.` }
  }
  for (const side of [lower, upper]) {
    if (side.state !== 'fitted') {
      const short = side.state === 'not identified' ? 'a side is not identified' : 'a side did not converge'
      return { short, sentence: `${side.name} has no solution to compare: ${side.reason ?? side.state}` }
    }
  }
  if (!sameMoments) {
    return {
      short: 'not the same data',
      sentence: `${from} and ${to} do not describe the same indicators in the same groups, so their fits cannot be compared.`
    }
  }
  switch (relation?.relation) {
    case 'nested':
      return upper.T! < lower.T! - 1e-4 * (1 + lower.T!) ? localMinimum(from, to) : null
    case 'equivalent':
      return null
    case 'reversed':
      return {
        short: 'upside down',
        sentence: `${from} is the more restricted of the two: it is nested in ${to}, not the other way round. List the least restrictive candidate first.`
      }
    default:
      return {
        short: 'not nested',
        sentence: `${to} is not nested in ${from}, so no chi-square difference between them has a known distribution; compare their AIC and BIC.`
      }
  }
}

/** A restricted model cannot fit better than what it is nested in: the search for the latter ended too high. */
function localMinimum(from: string, to: string): Refusal {
  return {
    short: 'a side stopped at a local minimum',
    sentence: `${to} is nested in ${from} and yet fits better, so the smallest minimum of ${from} was not found.`
  }
}

function stepResult(ground: StepGround, test: DifferenceTest | null, holmP: number | null, rules: Rules): StepResult {
  const { from, to, lower, upper, adds, relation } = ground
  const refused = refusal(ground)
  const named = relation === null || relation.relation === 'reversed' ? null : relation.relation
  const comparable = refused === null || refused.short === 'not nested'
  const delta = (pick: (side: CandidateResult) => number | null) => {
    const a = comparable && lower !== null ? pick(lower) : null
    const b = comparable && upper !== null ? pick(upper) : null
    return a === null || b === null ? null : b - a
  }
  const step: StepResult = {
    from,
    to,
    adds,
    relation: relation?.relation === 'reversed' ? 'nested' : named,
    proof: relation?.proof ?? null,
    difference: null,
    deltaCfi: delta((s) => s.cfi),
    deltaRmsea: delta((s) => s.rmsea.estimate),
    deltaSrmr: delta((s) => s.srmr),
    deltaAic: delta((s) => s.aic),
    deltaBic: delta((s) => s.bic),
    verdict: 'no test',
    noTest: refused?.short ?? null,
    because: refused?.sentence ?? ''
  }
  if (refused !== null) return step
  if (test === null) return { ...step, verdict: 'holds', because: equivalentSentence(from, to) }
  const difference = {
    ...test,
    holmP,
    method: 'normal theory' as const,
    critical: criticalValue(test, holmP ?? test.p, rules.alpha)
  }
  return { ...step, difference, ...judge({ ...step, difference }, rules) }
}

function equivalentSentence(from: string, to: string): string {
  return `${to} and ${from} are equivalent: the same degrees of freedom and, whatever the data, the same fit; nothing is given up, and no data can tell them apart.`
}

function judge(step: StepResult, rules: Rules): { verdict: Verdict; because: string } {
  const test = testCriterion(step, rules)
  const change = changeCriterion(step, rules)
  if (rules.decideBy === 'difference test') return { verdict: verdictOf(test.holds), because: `${test.sentence}.` }
  if (change === null)
    return { verdict: 'no test', because: 'The rules decide by change in fit, but none of its thresholds applies to this step.' }
  if (rules.decideBy === 'change in fit') return { verdict: verdictOf(change.holds), because: `${change.sentence}.` }
  const because = `${test.sentence}; ${change.sentence}.`
  if (test.holds === change.holds) return { verdict: verdictOf(test.holds), because }
  return { verdict: 'criteria disagree', because: `${because} The rules ask for both, and they disagree.` }
}

function verdictOf(holds: boolean): Verdict {
  return holds ? 'holds' : 'does not hold'
}

interface Criterion {
  holds: boolean
  sentence: string
}

function testCriterion({ difference }: StepResult, { alpha }: Rules): Criterion {
  const { T, df, p, holmP } = difference!
  const holds = (holmP ?? p) >= alpha
  const adjusted = holmP === null ? '' : `, ${pIs('Holm p', holmP)}`
  const significant = holds ? 'not significant' : 'significant'
  const numbers = `The chi-square difference is ${statistic(T)} on ${df} df, ${pIs('p', p)}${adjusted}`
  return { holds, sentence: `${numbers}: ${significant} at alpha = ${levelText(alpha)}` }
}

/** alpha as the user wrote it, without the leading zero. */
function levelText(alpha: number): string {
  return String(alpha).replace(/^0\./, '.')
}

/** Every threshold the rules give and the step has; null when none applies. */
function changeCriterion(step: StepResult, { changeInFit }: Rules): Criterion | null {
  const checks = [
    { name: 'CFI', delta: step.deltaCfi, limit: changeInFit?.cfi ?? null, ok: (d: number, l: number) => d >= l, words: 'at least' },
    {
      name: 'RMSEA',
      delta: step.deltaRmsea,
      limit: changeInFit?.rmsea ?? null,
      ok: (d: number, l: number) => d <= l,
      words: 'at most'
    },
    {
      name: 'SRMR',
      delta: step.deltaSrmr,
      limit: changeInFit?.srmr ?? null,
      ok: (d: number, l: number) => d <= l,
      words: 'at most'
    }
  ].flatMap(({ name, delta, limit, ok, words }) =>
    delta === null || limit === null
      ? []
      : [{ holds: ok(delta, limit), text: `${name} changes by ${signedIndex(delta)} (${words} ${signedIndex(limit)} asked)` }]
  )
  if (checks.length === 0) return null
  const holds = checks.every((check) => check.holds)
  return {
    holds,
    sentence: `${checks.map((check) => check.text).join(', ')}: ${holds ? 'within' : 'beyond'} the rules' thresholds`
  }
}

/** Climbs from the bottom while steps hold. */
function standHere(rungs: string[], grounds: readonly StepGround[], steps: readonly StepResult[]): string | null {
  const bottom = grounds[0]?.lower ?? null
  if (grounds.length > 0 && bottom?.state !== 'fitted') return null
  const stop = steps.findIndex((step) => step.verdict !== 'holds')
  return rungs[stop < 0 ? steps.length : stop] ?? null
}
