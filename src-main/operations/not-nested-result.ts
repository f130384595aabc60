/**
 * What casewise log-likelihoods say about a step whose models are not nested: numbers from statistics/comparison, and the
 * sentence that people paste into a paper.
 */
import { pIs, statistic } from '../reporting/numbers.ts'
import type { NotNestedTests, ZTest } from '../statistics/comparison/not-nested.ts'
import type { CandidateResult, EvidenceRatio, NotNestedResult } from '../study/result.ts'

/**
 * @param tests of `to` as the first model and `from` as the second
 * @param alpha level of both tests: the rules' own, unadjusted, for no ladder of tests is climbed here
 */
export function notNestedResult(tests: NotNestedTests, from: CandidateResult, to: CandidateResult, alpha: number): NotNestedResult {
  const { omega2, distinguishable, z, corrected, bicInterval, logLikelihoodRatio } = tests
  const apart = distinguishable !== null && distinguishable.p < alpha
  const favours = apart && z !== null && z.p < alpha ? (z.z > 0 ? to.name : from.name) : null
  const result = {
    logLikelihoodRatio,
    omega2,
    distinguishable,
    z: z?.z ?? null,
    p: z?.p ?? null,
    pTo: z?.firstBetter ?? null,
    pFrom: z?.secondBetter ?? null,
    correctedAic: short(corrected?.aic),
    correctedBic: short(corrected?.bic),
    bicInterval,
    evidenceAic: evidence(from, to, (side) => side.aic),
    evidenceBic: evidence(from, to, (side) => side.bic),
    favours
  }
  const corrections = apart && from.parameters !== to.parameters ? correctionSentence(result) : ''
  return { ...result, sentence: `${testSentence(result, from.name, to.name, apart)}${corrections} ${evidenceSentence(result)}` }
}

type Numbers = Omit<NotNestedResult, 'sentence'>

function short(test: ZTest | undefined): { z: number; p: number } | null {
  return test === undefined ? null : { z: test.z, p: test.p }
}

/** exp(|difference| / 2), the ratio of the two weights (Burnham & Anderson 2002). */
function evidence(
  from: CandidateResult,
  to: CandidateResult,
  pick: (side: CandidateResult) => number | null
): EvidenceRatio | null {
  const [a, b] = [pick(from), pick(to)]
  if (a === null || b === null) return null
  const ratio = Math.exp(Math.abs(a - b) / 2)
  return { favours: b < a ? to.name : from.name, ratio: Number.isFinite(ratio) ? ratio : null }
}

function testSentence({ omega2, distinguishable, z, p, favours }: Numbers, from: string, to: string, apart: boolean): string {
  if (distinguishable === null)
    return "Vuong's (1989) tests could not be computed, because the second derivatives of a model are singular at its solution."
  const told = `(variance of the casewise differences ${statistic(omega2)}, ${pIs('p', distinguishable.p)})`
  if (!apart) {
    return `By Vuong's (1989) test on casewise log-likelihoods these data cannot tell the two apart ${told}, so neither can be said to fit better.`
  }
  const opening = `By Vuong's (1989) tests on casewise log-likelihoods the two can be told apart ${told}`
  const numbers = `z = ${statistic(Math.abs(z!))}, ${pIs('p', p)}`
  if (favours === null) return `${opening}, but neither fits significantly better: ${numbers}.`
  return `${opening}, and ${favours} fits better than ${favours === to ? from : to}: ${numbers}.`
}

function correctionSentence({ correctedAic, correctedBic }: Numbers): string {
  if (correctedAic === null || correctedBic === null) return ''
  const part = ({ z, p }: { z: number; p: number }) => `z = ${statistic(Math.abs(z))}, ${pIs('p', p)}`
  return ` Corrected for the number of parameters as AIC does, ${part(correctedAic)}; as BIC does, ${part(correctedBic)}.`
}

function evidenceSentence({ evidenceAic: aic, evidenceBic: bic }: Numbers): string {
  if (aic === null || bic === null) return ''
  const [byAic, byBic] = [aic, bic].map(({ ratio }) => ratioText(ratio)) as [string, string]
  if (byAic === '1.0' && byBic === '1.0') return 'AIC and BIC favour neither.'
  if (aic.favours === bic.favours) {
    const both = byAic === byBic ? `${byAic} by AIC and by BIC` : `${byAic} by AIC and ${byBic} by BIC`
    return `The evidence ratio in favour of ${aic.favours} is ${both}.`
  }
  return `The evidence ratio is ${byAic} in favour of ${aic.favours} by AIC, and ${byBic} in favour of ${bic.favours} by BIC.`
}

function ratioText(ratio: number | null): string {
  if (ratio === null || ratio > 1e6) return 'more than a million'
  return ratio >= 100 ? ratio.toFixed(0) : ratio.toFixed(1)
}
