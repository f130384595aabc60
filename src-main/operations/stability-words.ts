/**
 * What resampling a ladder showed, in sentences that can stand in a paper.
 */
import type { Verdict } from '../study/result.ts'

/** "1,000" */
export function whole(count: number): string {
  return String(count).replace(/\B(?=(\d{3})+$)/g, ',')
}

/** "94.2%"; what is not quite all or nothing is never rounded to it. */
export function percent(count: number, total: number): string {
  if (total === 0) return '0%'
  if (count === 0 || count === total) return `${(100 * count) / total}%`
  return `${Math.min(99.9, Math.max(0.1, (100 * count) / total)).toFixed(1)}%`
}

const otherVerdicts: [Verdict, string][] = [
  ['does not hold', 'did not hold in'],
  ['criteria disagree', 'left the criteria of the rules in disagreement in'],
  ['no test', 'could not be judged in']
]

const inTheData: Record<Verdict, string> = {
  holds: 'it holds',
  'does not hold': 'it does not hold',
  'criteria disagree': 'the criteria of the rules disagree',
  'no test': 'it cannot be judged'
}

export function stepSentence(
  step: {
    from: string
    to: string
    verdict: Verdict
    counts: Record<Verdict, number>
    expectedWhenExact: number | null
    expectedInNewSamples: number | null
  },
  resamples: number
): string {
  const others = otherVerdicts
    .filter(([verdict]) => step.counts[verdict] > 0)
    .map(([verdict, words]) => `${words} ${percent(step.counts[verdict], resamples)}`)
  const held = `The step from ${step.from} to ${step.to} held in ${percent(step.counts.holds, resamples)} of ${whole(resamples)} resamples`
  const rest = others.length === 0 ? '' : `, ${[...others.slice(0, -1), `and ${others.at(-1)!}`].join(', ')}`
  const yardstick =
    step.expectedWhenExact === null || step.expectedInNewSamples === null
      ? ''
      : ` A step that is exactly true would hold in ${about(step.expectedWhenExact)} of such resamples; with the misfit estimated from these data, it would hold in ${about(step.expectedInNewSamples)} of new samples of this size.`
  return `${held}${rest}; in the data themselves ${inTheData[step.verdict]}.${yardstick}`
}

/** "about 43%", "less than 1%", "more than 99%" */
function about(share: number): string {
  if (share < 0.01) return 'less than 1%'
  return share > 0.99 ? 'more than 99%' : `about ${Math.round(100 * share)}%`
}

export function rungSentence(
  rung: { rung: string; stands: number; unsolved: number; standsInData: boolean },
  resamples: number
): string {
  const stands = `${rung.rung} was the rung to stand on in ${percent(rung.stands, resamples)} of ${whole(resamples)} resamples`
  const data = rung.standsInData ? ', as it is in the data themselves' : ''
  const unsolved = rung.unsolved === 0 ? '' : `; it had no solution in ${whole(rung.unsolved)} of them`
  return `${stands}${data}${unsolved}.`
}

/** What the shares mean, and what they do not. */
export const stabilityNote =
  'Every resample draws as many cases as there are, with replacement (within each group where groups are compared), and refits every rung. It carries ' +
  'sampling error twice, that of the data and that of the draw, so that a step holds less often in resamples than in new ' +
  'samples from the same population. The shares say how far the verdicts hang on these very cases; they are no p-values.'

export function trailSentence(
  ladder: string,
  { resamples, asked, seed }: { resamples: number; asked: number; seed: number },
  rungs: readonly { rung: string; stands: number }[]
): string {
  const stood = rungs.filter(({ stands }) => stands > 0).map(({ rung, stands }) => `“${rung}” in ${percent(stands, resamples)}`)
  const stopped = resamples < asked ? `, of ${whole(asked)} asked for` : ''
  const where = stood.length === 0 ? 'no rung could be stood on in any' : `the rung to stand on was ${stood.join(', ')}`
  return `The verdicts of the ladder “${ladder}” were tried on ${whole(resamples)} resamples of the cases (seed ${seed})${stopped}: ${where}.`
}
