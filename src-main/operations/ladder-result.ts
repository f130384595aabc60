/**
 * A ladder from its fits and proofs: tests, differences of indices, verdicts by the rules, and where one can stand.
 *
 * A comparison that is not valid is refused before it is computed, with the reason.
 */
import { index, pIs, signedIndex, statistic } from '../reporting/numbers.ts'
import { criticalLevel, type DifferenceTest, holm, normalDifference } from '../statistics/comparison/difference-test.ts'
import type { NotNestedTests } from '../statistics/comparison/not-nested.ts'
import { type ScaledSide, scaledDifference, strictlyPositiveDifference } from '../statistics/comparison/scaled-difference.ts'
import { chiBarSquareQuantile, chiBarSquareUpper, type MixturePart } from '../statistics/distributions/mixtures.ts'
import { rmsea } from '../statistics/fit/indices.ts'
import type { CandidateResult, DifferenceResult, LadderResult, StepResult, Verdict } from '../study/result.ts'
import { thresholdsFor } from '../study/rule-presets.ts'
import type { Rules } from '../study/study.ts'
import type { RelationOutcome } from '../workers/jobs.ts'
import { notNestedResult } from './not-nested-result.ts'

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
  /** Scaled statistics: the scaling of the lower rung at the upper's estimates, where the strictly positive form is needed. */
  scalingAtUpper?: number | null
  /** The parameters that the upper rung puts on their boundary; null when there are none. */
  boundary?: BoundaryGround | null
  /** Of a pair that is not nested: the casewise tests with `to` as the first model, or that there are no cases to test on. */
  notNested?: NotNestedTests | 'no rows'
  /** Cases per group, and whether the step adds equal loadings: what published rules look at. */
  sizes?: readonly number[]
  addsLoadings?: boolean
}

export interface BoundaryGround {
  words: string
  /** Parts of the mixture on the df of the step; null where more parameters lie on the boundary than weights are known for. */
  parts: MixturePart[] | null
  /** True when the lower rung's estimate lies beyond the bound: within it, the upper rung fits as well. */
  beyond: boolean
}

/** @param bottom the lowest rung's fit; needed where there is no step that brings it */
export function ladderResult(
  name: string,
  rungs: string[],
  grounds: readonly StepGround[],
  rules: Rules,
  bottom: CandidateResult | null = grounds[0]?.lower ?? null
): LadderResult {
  const tests = grounds.map((ground) => testOf(ground, rules))
  const pValues = tests.filter((test) => test !== null).map((test) => test.p)
  const adjusted = holm(pValues)
  let at = 0
  const steps = grounds.map((ground, i) => {
    const test = tests[i]!
    return stepResult(ground, test, test === null || rules.adjust === 'none' ? null : adjusted[at++]!, rules)
  })
  return { name, rungs, standHere: bottom?.state === 'fitted' ? standHere(rungs, steps) : null, steps }
}

type StepTest = DifferenceTest & Pick<DifferenceResult, 'method' | 'scaling'> & { reference: MixturePart[] }

/** The test that is valid for this very pair; null where none is. */
function testOf(ground: StepGround, rules: Rules): StepTest | null {
  if (refusal(ground) !== null || ground.relation?.relation !== 'nested' || onlyBoundsDiffer(ground)) return null
  const plain = anyScaled(ground)
    ? scaledTest(ground, rules)
    : { ...normalDifference(sideOf(ground.upper!), sideOf(ground.lower!)), scaling: null, method: 'normal theory' as const }
  if (plain === null) return null
  const chiSquare = [{ df: plain.df, weight: 1 }]
  const { boundary } = ground
  if (boundary?.parts == null) return { ...plain, reference: chiSquare }
  const T = boundary.beyond ? 0 : plain.T
  return { ...plain, T, p: chiBarSquareUpper(T, boundary.parts), method: 'boundary mixture', reference: boundary.parts }
}

function sideOf({ T, df, scaled }: CandidateResult): ScaledSide {
  return { T: T!, df, scaling: scaled?.scaling ?? Number.NaN }
}

/** A scaled statistic on either side: the plain difference is then not the one to test. */
function anyScaled({ lower, upper }: StepGround): boolean {
  return lower?.scaled != null || upper?.scaled != null
}

/** Both sides carry a scaled statistic (or have no df to scale). */
function bothScaled(lower: CandidateResult, upper: CandidateResult): boolean {
  return upper.scaled !== null && (lower.scaled !== null || lower.df === 0)
}

/** Satorra & Bentler 2001 where it is defined and the rules leave it the choice, else the strictly positive form of 2010. */
function scaledTest({ lower, upper, scalingAtUpper }: StepGround, rules: Rules) {
  if (!bothScaled(lower!, upper!)) return null
  const [general, restricted] = [sideOf(lower!), sideOf(upper!)]
  const ordinary = rules.scaledDifference === 'ordinary' ? scaledDifference(restricted, general) : null
  if (ordinary !== null) return ordinary
  return scalingAtUpper == null && lower!.df > 0 ? null : strictlyPositiveDifference(restricted, general, scalingAtUpper ?? 0)
}

/** Whether the test of this pair needs the lower rung's scaling at the upper rung's estimates. */
export function needsScalingAtUpper(lower: CandidateResult, upper: CandidateResult, rules: Rules): boolean {
  if (!bothScaled(lower, upper) || lower.df === 0) return false
  return rules.scaledDifference === 'strictly positive' || scaledDifference(sideOf(upper), sideOf(lower)) === null
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
      if (upper.T! < lower.T! - fitTolerance(lower.T!)) return localMinimum(from, to)
      return onlyBoundsDiffer({ lower, upper }) && !sameFit(lower, upper) ? boundsReached(from, to, upper.T! - lower.T!) : null
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
        sentence: `${to} is not nested in ${from}, so no chi-square difference between them has a known distribution.`
      }
  }
}

/** Fits closer than this are the same: minima are found to a relative 1e-8 or better. */
function fitTolerance(T: number): number {
  return 1e-4 * (1 + T)
}

function sameFit(lower: CandidateResult, upper: CandidateResult): boolean {
  return Math.abs(upper.T! - lower.T!) <= fitTolerance(lower.T!)
}

/** Nested with equal df (relation.ts). */
function onlyBoundsDiffer({ lower, upper }: Pick<StepGround, 'lower' | 'upper'>): boolean {
  return lower!.df === upper!.df
}

function boundsReached(from: string, to: string, rise: number): Refusal {
  return {
    short: 'only bounds differ',
    sentence: `${to} differs from ${from} by bounds alone: they take no degrees of freedom and raise T by ${statistic(rise)}, a difference that no chi-square difference test applies to.`
  }
}

/** A restricted model cannot fit better than what it is nested in: the search for the latter ended too high. */
function localMinimum(from: string, to: string): Refusal {
  return {
    short: 'a side stopped at a local minimum',
    sentence: `${to} is nested in ${from} and yet fits better, so the smallest minimum of ${from} was not found.`
  }
}

function stepResult(ground: StepGround, test: StepTest | null, holmP: number | null, rules: Rules): StepResult {
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
    notNested: null,
    deltaCfi: delta((s) => s.cfi),
    deltaRmsea: delta((s) => s.rmsea.estimate),
    deltaSrmr: delta((s) => s.srmr),
    deltaMcdonald: delta((s) => s.mcdonald),
    deltaGammaHat: delta((s) => s.gammaHat),
    deltaAic: delta((s) => s.aic),
    deltaBic: delta((s) => s.bic),
    verdict: 'no test',
    noTest: refused?.short ?? null,
    because: refused?.sentence ?? ''
  }
  if (refused?.short === 'not nested') return { ...step, ...casewise(ground, rules) }
  if (refused !== null) return step
  if (relation?.relation === 'equivalent') return { ...step, verdict: 'holds', because: equivalentSentence(from, to) }
  if (onlyBoundsDiffer(ground)) return { ...step, verdict: 'holds', because: boundsNotReached(from, to) }
  if (test === null) return { ...step, noTest: 'the scaling of the difference is not defined', because: undefinedScaling }
  const difference = differenceResult(test, holmP, rules, upper!)
  return { ...step, difference, ...judge({ ...step, difference }, ground, rules) }
}

/** What can be said of a pair that is not nested, after the refusal of the difference test. */
function casewise(ground: StepGround, { alpha }: Rules): Pick<StepResult, 'notNested' | 'because'> {
  const { notNested: tests, lower, upper } = ground
  const refused = refusal(ground)!.sentence
  if (tests === undefined) return { notNested: null, because: `${refused} Compare their AIC and BIC.` }
  if (tests === 'no rows') {
    const why = "Vuong's (1989) tests need the answers of each case, which published summaries do not give"
    return { notNested: null, because: `${refused} Compare their AIC and BIC; ${why}.` }
  }
  const notNested = notNestedResult(tests, lower!, upper!, alpha)
  return { notNested, because: `${refused} ${notNested.sentence}` }
}

const undefinedScaling =
  'No scaling factor of the difference could be computed from these data, so the scaled statistics of the two cannot be compared by a test.'

function differenceResult(
  { T, df, p, method, scaling, reference }: StepTest,
  holmP: number | null,
  rules: Rules,
  upper: CandidateResult
): DifferenceResult {
  const level = criticalLevel(p, holmP ?? p, rules.alpha)
  const { estimate, lower, upper: top } = rmsea(T, df, upper.n, upper.groups)
  return {
    T,
    df,
    p,
    holmP,
    method,
    scaling,
    critical: chiBarSquareQuantile(level, reference),
    rmsea: { estimate, lower, upper: top }
  }
}

function boundsNotReached(from: string, to: string): string {
  return `${to} differs from ${from} by bounds alone, and these data do not press against them: both have the same fit, so nothing is given up.`
}

function equivalentSentence(from: string, to: string): string {
  return `${to} and ${from} are equivalent: the same degrees of freedom and, whatever the data, the same fit; nothing is given up, and no data can tell them apart.`
}

function judge(step: StepResult, ground: StepGround, rules: Rules): { verdict: Verdict; because: string } {
  const test = testCriterion(step, ground, rules)
  const change = changeCriterion(step, ground, rules)
  const size = sizeSentence(step.difference!)
  if (rules.decideBy === 'difference test') return { verdict: verdictOf(test.holds), because: `${test.sentence}. ${size}` }
  if (change === null)
    return { verdict: 'no test', because: 'The rules decide by change in fit, but none of its thresholds applies to this step.' }
  if (rules.decideBy === 'change in fit') return { verdict: verdictOf(change.holds), because: `${change.sentence}.` }
  const because = `${test.sentence}; ${change.sentence}. ${size}`
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

const methodWords: Record<DifferenceResult['method'], string> = {
  'normal theory': 'chi-square difference',
  scaled: 'scaled chi-square difference (Satorra & Bentler 2001)',
  'strictly positive scaled': 'scaled chi-square difference in its strictly positive form (Satorra & Bentler 2010)',
  'boundary mixture': 'chi-square difference, referred to a mixture of chi-squares,'
}

/** The test in words; a mixture of a scaled difference says both. */
function testWords({ method, scaling }: DifferenceResult): string {
  return `${method === 'boundary mixture' && scaling !== null ? 'scaled ' : ''}${methodWords[method]}`
}

function testCriterion({ difference }: StepResult, { boundary }: StepGround, { alpha }: Rules): Criterion {
  const { T, df, p, holmP } = difference!
  const holds = (holmP ?? p) >= alpha
  const adjusted = holmP === null ? '' : `, ${pIs('Holm p', holmP)}`
  const significant = holds ? 'not significant' : 'significant'
  const numbers = `The ${testWords(difference!)} is ${statistic(T)} on ${df} df, ${pIs('p', p)}${adjusted}`
  return { holds, sentence: `${numbers}: ${significant} at alpha = ${levelText(alpha)}${boundaryClause(boundary ?? null)}` }
}

/** Why the reference is a mixture, or that it should be one. */
function boundaryClause(boundary: BoundaryGround | null): string {
  if (boundary === null) return ''
  if (boundary.parts === null)
    return `. The p-value is too large, for the hypothesis lies on the boundary in more ways than weights are known for: ${boundary.words}`
  const beyond = boundary.beyond ? '; the estimate lies beyond that bound, and within it the two fit alike' : ''
  return `. The mixture is due because the hypothesis lies on the boundary of what is possible: ${boundary.words}${beyond}`
}

/** How large the step is, whatever its p: with a large N a tiny step is rejected exactly. */
function sizeSentence({ rmsea: { estimate, lower, upper } }: DifferenceResult): string {
  return `RMSEA of the difference ${index(estimate)} [${index(lower)}, ${index(upper)}].`
}

/** alpha as the user wrote it, without the leading zero. */
function levelText(alpha: number): string {
  return String(alpha).replace(/^0\./, '.')
}

/** Every threshold the rules give and the step has; null when none applies. */
function changeCriterion(step: StepResult, { upper, sizes, addsLoadings }: StepGround, rules: Rules): Criterion | null {
  const limits = thresholdsFor(rules, { n: upper!.n, sizes: sizes ?? [upper!.n], loadings: addsLoadings ?? false })
  if (limits === null) return null
  const atLeast = (name: string, delta: number | null, limit: number | null) =>
    check(name, delta, limit, (d, l) => d >= l, 'at least')
  const atMost = (name: string, delta: number | null, limit: number | null) =>
    check(name, delta, limit, (d, l) => d <= l, 'at most')
  const checks = [
    ...atLeast('CFI', step.deltaCfi, limits.cfi),
    ...atMost('RMSEA', step.deltaRmsea, limits.rmsea),
    ...atMost('SRMR', step.deltaSrmr, limits.srmr),
    ...atLeast("McDonald's index", step.deltaMcdonald, limits.mcdonald),
    ...atLeast('gamma-hat', step.deltaGammaHat, limits.gammaHat)
  ]
  if (checks.length === 0) return null
  const holds = checks.every((one) => one.holds)
  const source = rules.changeInFit?.preset ?? 'the rules'
  const within = holds ? 'within' : 'beyond'
  return { holds, sentence: `${checks.map((one) => one.text).join(', ')}: ${within} the thresholds of ${source}` }
}

function check(
  name: string,
  delta: number | null,
  limit: number | null,
  ok: (delta: number, limit: number) => boolean,
  words: string
): { holds: boolean; text: string }[] {
  if (delta === null || limit === null) return []
  return [{ holds: ok(delta, limit), text: `${name} changes by ${signedIndex(delta)} (${words} ${signedIndex(limit)} asked)` }]
}

/** Climbs from the bottom while steps hold. */
function standHere(rungs: string[], steps: readonly StepResult[]): string | null {
  const stop = steps.findIndex((step) => step.verdict !== 'holds')
  return rungs[stop < 0 ? steps.length : stop] ?? null
}
