/**
 * The search for releases in sentences that can stand in a paper.
 */
import { pIs, statistic } from '../reporting/numbers.ts'
import { keptAnchors, type ReleaseCandidate } from '../statistics/invariance/release.ts'
import { cellWords, listed } from '../statistics/model/cell-words.ts'
import type { FailedStep, Search, SearchRound } from './release-rounds.ts'

/** @param scaled the difference tests are scaled for answers that are not normal, which score tests are not */
export function ruleWords(alpha: number, scaled: boolean): string {
  const unscaled = scaled ? ' The score tests are those of normal theory, without scaling.' : ''
  const level = String(alpha).replace(/^0\./, '.')
  return (
    'In each round, every equality across groups that the step added is tested by itself, one group at a time (score test). ' +
    `Of those that leave every two groups at least ${keptAnchors === 2 ? 'two' : keptAnchors} indicators of each factor in common, the one with the largest ` +
    `statistic is let go if it is significant at alpha = ${level} after Holm's adjustment over the round; the model is then fitted again. ` +
    "The search ends when the step holds by the study's rules, or when no such equality is significant." +
    unscaled
  )
}

export function roundWords({ candidates, chosen, candidate, step }: SearchRound): string {
  const open = candidates.filter(({ kept }) => kept === null)
  const kept = candidates.length - open.length
  const held =
    kept === 0 ? '' : ` ${kept === 1 ? 'One more' : `${kept} more`} must be kept, for too little would be left in common.`
  if (chosen === null) {
    const largest = open[0]
    if (largest === undefined) return 'Every equality that is left must be kept, for too little would be left in common.'
    return `None of ${open.length} equalities is significant any more; the largest is ${testWords(largest)}.${held}`
  }
  const judged = candidate === null || step === null ? '' : ` ${step.because}`
  return `Of ${open.length} equalities the one let go is ${testWords(chosen)}.${held}${judged}`
}

function testWords({ words, statistic: value, adjustedP }: ReleaseCandidate): string {
  return `${words} (score test ${statistic(value)} on 1 df, ${pIs('Holm p', adjustedP)})`
}

export function searchWords({ lower, upper }: FailedStep, { rounds, released, ended }: Search): string {
  if (ended === 'stopped' && rounds.length === 0) return 'The search was stopped before anything was let go.'
  const start = `The step from ${lower} to ${upper} does not hold by the study's rules.`
  const last = rounds.findLast(({ step }) => step !== null)?.step ?? null
  const lettingGo =
    released.length === 0
      ? 'Nothing was let go.'
      : `${released.length === 1 ? 'One equality across groups was' : `${counts[released.length] ?? released.length} equalities across groups were`} let go, found by score tests after seeing the results: ${wordsOf(released)}.`
  const after = released.length === 1 ? 'Without it the step holds.' : 'Without them the step holds.'
  switch (ended) {
    case 'the step holds':
      return `${start} ${lettingGo} ${after} ${last!.because}`
    case 'nothing significant is left':
      return `${start} ${lettingGo} No further equality is significant${last === null ? '' : ', and the step still does not hold'}.`
    case 'nothing more may be let go':
      return `${start} ${lettingGo} No more may be let go, for too little would be left in common between the groups.`
    case 'no solution':
      return `${start} ${lettingGo} The search ended there, for the last model has no solution that could be tested.`
    case 'stopped':
      return `${start} ${lettingGo} The search was stopped before it ended.`
  }
}

/** How a sentence begins with a count. */
const counts: Readonly<Record<number, string>> = {
  2: 'Two',
  3: 'Three',
  4: 'Four',
  5: 'Five',
  6: 'Six',
  7: 'Seven',
  8: 'Eight',
  9: 'Nine'
}

function wordsOf(released: readonly ReleaseCandidate[]): string {
  return listed(
    released.map(({ part, of, group }) => cellWords(part, of, group)),
    released.length
  )
}

/** @param how what set the scales the second time, as a clause: "with bags and numbness as reference indicators" */
export function otherReferenceWords(how: string, found: Search, other: Search): string {
  if (other.ended === 'no solution') return `The search could not be repeated ${how}: a model has no solution.`
  const same = sameReleases(found.released, other.released)
  const cells = other.released.length === 0 ? 'nothing' : wordsOf(other.released)
  if (same) return `Repeated ${how}, the search lets go ${other.released.length === 0 ? 'of nothing either' : 'of the same'}.`
  return `Repeated ${how}, the search lets go of ${cells} instead: which indicators differ depends on the reference indicator.`
}

/** The same cells, in whichever order. */
export function sameReleases(one: readonly ReleaseCandidate[], other: readonly ReleaseCandidate[]): boolean {
  const keys = (list: readonly ReleaseCandidate[]) => list.map(({ part, of, group }) => JSON.stringify([part, of, group])).sort()
  return JSON.stringify(keys(one)) === JSON.stringify(keys(other))
}
