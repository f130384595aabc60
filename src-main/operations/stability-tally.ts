/**
 * Judges a ladder on every resample by the study's own rules, and counts.
 *
 * A resample takes the place of the data in what a step is judged by (ladder-result.ts); what the models are, and so how
 * they stand to each other, does not change with the data.
 */
import { chiSquareUpper } from '../statistics/distributions/chi-square.ts'
import { noncentralChiSquareLower } from '../statistics/distributions/noncentral-chi-square.ts'
import type { ResampledFit } from '../statistics/resampling/ladder-resamples.ts'
import type { CandidateResult, LadderResult, StabilityResult, StepResult, Verdict } from '../study/result.ts'
import type { Rules } from '../study/study.ts'
import type { LadderStep } from './climb.ts'
import { ladderResult, type StepGround } from './ladder-result.ts'
import { rungSentence, stabilityNote, stepSentence } from './stability-words.ts'

type StabilityStep = StabilityResult['steps'][number]

export interface ResampledLadder {
  name: string
  rungs: string[]
  steps: LadderStep[]
  /** Per rung, as fitted to the data. */
  results: CandidateResult[]
  rules: Rules
  /** As judged on the data themselves. */
  judged: LadderResult
}

export class StabilityTally {
  readonly #ladder: ResampledLadder
  readonly #verdicts: Record<Verdict, number>[]
  readonly #stands: number[]
  readonly #unsolved: number[]
  #resamples = 0
  #incomplete = 0
  #nowhere = 0

  constructor(ladder: ResampledLadder) {
    this.#ladder = ladder
    this.#verdicts = ladder.steps.map(() => ({ holds: 0, 'does not hold': 0, 'criteria disagree': 0, 'no test': 0 }))
    this.#stands = ladder.rungs.map(() => 0)
    this.#unsolved = ladder.rungs.map(() => 0)
  }

  get resamples(): number {
    return this.#resamples
  }

  /** @param fits one resample's, rung by rung */
  add(fits: readonly ResampledFit[]): void {
    const { name, rungs, rules } = this.#ladder
    const { steps, standHere } = ladderResult(name, rungs, this.#grounds(fits), rules)
    this.#resamples++
    for (const [i, step] of steps.entries()) this.#verdicts[i]![step.verdict]++
    if (fits.some((fit) => fit.state !== 'fitted')) this.#incomplete++
    for (const [i, fit] of fits.entries()) if (fit.state !== 'fitted') this.#unsolved[i]!++
    if (standHere === null) this.#nowhere++
    else this.#stands[rungs.indexOf(standHere)]!++
  }

  #grounds(fits: readonly ResampledFit[]): StepGround[] {
    const sides = this.#ladder.results.map((result, i) => onResample(result, fits[i]!))
    return this.#ladder.steps.map(({ ground, boundary }, i) => ({
      ...ground,
      lower: sides[i]!,
      upper: sides[i + 1]!,
      scalingAtUpper: fits[i + 1]!.scalingOfLower,
      boundary: boundary?.at(fits[i]!.watched) ?? null
    }))
  }

  result(asked: number, seed: number): StabilityResult {
    const { name, rungs, judged, rules } = this.#ladder
    const resamples = this.#resamples
    return {
      ladder: name,
      asked,
      resamples,
      seed,
      incomplete: this.#incomplete,
      nowhere: this.#nowhere,
      steps: judged.steps.map((step, i) => {
        const counts = this.#verdicts[i]!
        const own = {
          from: step.from,
          to: step.to,
          verdict: step.verdict,
          counts,
          ...expectedShares(step, rules)
        }
        return { ...own, share: share(counts.holds, resamples), sentence: stepSentence(own, resamples) }
      }),
      rungs: rungs.map((rung, i) => {
        const own = { rung, stands: this.#stands[i]!, unsolved: this.#unsolved[i]!, standsInData: judged.standHere === rung }
        return { ...own, share: share(own.stands, resamples), sentence: rungSentence(own, resamples) }
      }),
      note: stabilityNote
    }
  }
}

function share(count: number, resamples: number): number {
  return resamples === 0 ? 0 : count / resamples
}

/** The candidate as it would have come out of the resample: only what verdicts look at. */
function onResample(result: CandidateResult, fit: ResampledFit): CandidateResult {
  return {
    ...result,
    state: fit.state === 'fitted' ? 'fitted' : 'not converged',
    reason: fit.state === 'fitted' ? null : 'no solution on this resample',
    T: fit.T,
    scaled: fit.scaled,
    cfi: fit.cfi,
    rmsea: { ...result.rmsea, estimate: fit.rmsea },
    srmr: fit.srmr,
    mcdonald: fit.mcdonald,
    gammaHat: fit.gammaHat
  }
}

/**
 * What a share of resamples can be held against; null where the test alone does not decide, or its reference is no plain
 * chi-square.
 *
 * Of a step that is exactly true, the difference T in the data is the squared length of a standard normal vector; that of a
 * resample adds a second, independent one, so that it is distributed as twice a chi-square. In new samples from a
 * population with noncentrality T - df (its estimate, at least 0) the difference is a noncentral chi-square.
 */
function expectedShares(
  { difference }: StepResult,
  rules: Rules
): Pick<StabilityStep, 'expectedWhenExact' | 'expectedInNewSamples'> {
  if (difference === null || rules.decideBy !== 'difference test' || difference.method === 'boundary mixture')
    return { expectedWhenExact: null, expectedInNewSamples: null }
  const { T, df, critical } = difference
  return {
    expectedWhenExact: 1 - chiSquareUpper(critical / 2, df),
    expectedInNewSamples: noncentralChiSquareLower(critical, df, Math.max(0, T - df))
  }
}
