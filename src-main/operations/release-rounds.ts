/**
 * The search for equalities that a failed step should not have asked for, round by round (statistics/invariance/release.ts says
 * by which rule): test, let one go, fit, judge the step, until it holds or nothing is left to let go.
 */
import { holm } from '../statistics/comparison/difference-test.ts'
import { type ReleaseCandidate, type ReleaseRound, releaseRound } from '../statistics/invariance/release.ts'
import { InputError } from '../study/input-error.ts'
import type { StepResult, StudyResult } from '../study/result.ts'
import type { Candidate, DataSet, LadderPlan, Plan, Release } from '../study/study.ts'
import type { Crew, FitOutcome } from '../workers/jobs.ts'
import { entriesOf } from './entries.ts'
import { familyOf } from './family.ts'
import { holdsEqual, partialCandidate } from './partial-candidate.ts'

/** Where the search works: in the project, with everything recorded, or aside from it. */
export interface SearchPlace {
  data: DataSet
  version: string
  crew: Crew
  signal: AbortSignal
  /** Fits the named candidates of the plan where they are not fitted yet. */
  compare(plan: Plan, names: string[]): Promise<StudyResult>
  fits(): ReadonlyMap<string, FitOutcome>
  /** Told of a candidate before it is fitted. */
  add(candidate: Candidate): void
}

/** The step that failed: its rungs, those of its ladder below and above it, and what new ladders are called. */
export interface FailedStep {
  lower: string
  upper: string
  /** Bottom first, `lower` the last of them. */
  below: string[]
  above: string[]
  partialLadder: string
  onwardLadder: string
}

export interface SearchRound extends ReleaseRound {
  /** The candidate with all let go so far, and the step to it; null where the round let nothing go. */
  candidate: Candidate | null
  step: StepResult | null
}

export type SearchEnd = 'the step holds' | 'nothing significant is left' | 'nothing more may be let go' | 'no solution' | 'stopped'

export interface Search {
  rounds: SearchRound[]
  released: ReleaseCandidate[]
  ended: SearchEnd
  /** Lower rung, partial ones (the most released first), upper rung; null when nothing was let go. */
  ladder: LadderPlan | null
}

/** Stopped work is no error: what was found by then is the answer. */
export async function searchReleases(plan: Plan, failed: FailedStep, place: SearchPlace): Promise<Search> {
  const search: Search = { rounds: [], released: [], ended: 'the step holds', ladder: null }
  let current = failed.upper
  let known = plan
  try {
    for (;;) {
      const round = await testRound(known, failed.lower, current, place)
      if (round === null) return { ...search, ended: 'no solution' }
      const { chosen } = round
      if (chosen === null) {
        search.rounds.push({ ...round, candidate: null, step: null })
        const open = round.candidates.some(({ kept }) => kept === null)
        return { ...search, ended: open ? 'nothing significant is left' : 'nothing more may be let go' }
      }
      const family = familyOf(known)
      const base = family.candidates.find(({ name }) => name === failed.upper)!
      const candidate = partialCandidate(base, [...search.released, chosen].map(asRelease), family)
      if (!known.candidates.some(({ name }) => name === candidate.name)) {
        place.add(candidate)
        known = { ...known, candidates: [...known.candidates, candidate] }
      }
      const ladder = partialLadder(failed, candidate.name, search)
      const step = bottomStep(await place.compare({ ...known, ladders: [...known.ladders, ladder] }, [candidate.name]))
      search.rounds.push({ ...round, candidate, step })
      search.released.push(chosen)
      search.ladder = ladder
      if (step.verdict === 'holds') return search
      current = candidate.name
    }
  } catch (error) {
    if (!place.signal.aborted || error instanceof InputError) throw error
    return { ...search, ended: 'stopped' }
  }
}

/** The round's tests of the model as it stands; null when that has no solution to test. */
async function testRound(plan: Plan, lower: string, current: string, place: SearchPlace): Promise<ReleaseRound | null> {
  const entries = entriesOf(plan, place.data, place.version, familyOf(plan))
  const [below, above] = [lower, current].map((name) => entries.find((entry) => entry.candidate.name === name)!)
  const gamma = place.fits().get(above!.digest)?.gamma ?? null
  if (gamma === null) return null
  const settings = { convention: plan.estimation.convention }
  const { cells, sample } = above!
  const answer = await place.crew.scoreTests({ kind: 'score tests', cells, moments: sample.moments, settings, gamma }, place.signal)
  if (answer.unavailable !== null) return null
  return releaseRound(below!.cells, cells, answer.tests, { alpha: plan.rules.alpha, adjust: holm })
}

function asRelease({ part, of, group }: ReleaseCandidate): Release {
  return { cell: { part, of }, group }
}

/**
 * The ladder on from a step that holds once something is let go: the rungs above it with the same let go, so that one can
 * climb further. Null where there is none above, or one does not hold these cells equal to begin with.
 */
export async function climbOn(
  plan: Plan,
  failed: FailedStep,
  { released, ended, rounds }: Search,
  place: SearchPlace
): Promise<LadderPlan | null> {
  const partial = rounds.at(-1)?.candidate ?? null
  if (partial === null || ended !== 'the step holds' || failed.above.length === 0) return null
  const releases = released.map(asRelease)
  const family = familyOf(plan)
  const bases = failed.above.map((rung) => family.candidates.find(({ name }) => name === rung)!)
  if (!bases.every((base) => holdsEqual(base, releases, family))) return null
  const candidates = bases.map((base) => partialCandidate(base, releases, family))
  const fresh = candidates.filter((candidate) => !plan.candidates.some(({ name }) => name === candidate.name))
  for (const candidate of fresh) place.add(candidate)
  const names = candidates.map(({ name }) => name)
  const ladder = { name: failed.onwardLadder, rungs: [...failed.below, partial.name, ...names] }
  const known = {
    ...plan,
    candidates: [...plan.candidates, ...(plan.candidates.some((c) => c.name === partial.name) ? [] : [partial]), ...fresh]
  }
  await place.compare({ ...known, ladders: [...known.ladders, ladder] }, ladder.rungs)
  return ladder
}

function partialLadder({ lower, upper, partialLadder: name }: FailedStep, newest: string, { rounds }: Search): LadderPlan {
  const before = rounds.flatMap(({ candidate }) => (candidate === null ? [] : [candidate.name]))
  return { name, rungs: [lower, newest, ...before.reverse(), upper] }
}

/** Of the last ladder, the step from its lowest rung. */
function bottomStep(result: StudyResult): StepResult {
  return result.ladders.at(-1)!.steps[0]!
}
