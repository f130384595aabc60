/**
 * Partial invariance: what to let go where a step fails, found by a stated rule or chosen by hand. Every release is a candidate
 * of its own, recorded, fitted, and marked as added after results.
 */
import { canonicalJson } from '../project/canonical-json.ts'
import type { Project } from '../project/project.ts'
import type { ReleaseCandidate } from '../statistics/invariance/release.ts'
import { listed } from '../statistics/model/cell-words.ts'
import { resolveCandidate } from '../study/candidate-model.ts'
import { InputError } from '../study/input-error.ts'
import { ladderRungs, standingLadders } from '../study/ladders.ts'
import { didYouMean } from '../study/nearest.ts'
import type { StepResult } from '../study/result.ts'
import type { Candidate, LadderPlan, Plan } from '../study/study.ts'
import type { Bench } from './bench.ts'
import { addCandidate } from './change-study.ts'
import { compareStudy } from './compare-study.ts'
import type { Operations, ReleaseRoundView, ReleaseSearchView, ReleaseTestView, StudyView } from './contract.ts'
import type { StudyMemory } from './entries.ts'
import { familyOf } from './family.ts'
import { partialCandidate } from './partial-candidate.ts'
import { compareRecorded, noteStopped, recordJudgements } from './recorded-work.ts'
import { climbOn, type FailedStep, type Search, type SearchPlace, type SearchRound, searchReleases } from './release-rounds.ts'
import { otherReferenceWords, roundWords, ruleWords, sameReleases, searchWords } from './release-words.ts'

type ReleaseSearch = Operations['releaseSearch']

/** @throws InputError for an unknown candidate, or cells that it does not hold equal across groups */
export async function releaseByHand(
  bench: Bench,
  { candidate, releases }: Operations['releaseByHand']['input']
): Promise<StudyView> {
  const project = bench.requireProject()
  const family = familyOf(project.plan())
  const base = family.candidates.find(({ name }) => name === candidate)
  if (base === undefined) {
    const names = family.candidates.map(({ name }) => name)
    throw new InputError(`There is no candidate "${candidate}".`, {
      where: 'candidate',
      remedy: didYouMean(candidate, names, 'candidates')
    })
  }
  return addCandidate(bench, { candidate: partialCandidate(base, releases, family) })
}

/** @throws InputError for a step that is not there, that holds, that was not tested, or that adds no equality across groups */
export async function releaseSearch(bench: Bench, { ladder, rung }: ReleaseSearch['input']): Promise<ReleaseSearch['result']> {
  const project = bench.requireProject()
  const plan = project.plan()
  const failed = stepTo(rung, ladder, plan)
  return bench.work(async (signal) => {
    const finish = endOnce(bench)
    try {
      const place = recordedPlace(bench, project, signal, finish.pass)
      const search = await searchedStep(plan, ladder, failed, place)
      const otherReference = signal.aborted ? null : await repeated(plan, failed, search, place)
      const partialLadder = search.ladder === null ? null : keptLadder(project, search.ladder)
      const onward = await onFromThere(project, failed, search, place)
      if (signal.aborted) noteStopped(project)
      const found: ReleaseSearchView = {
        ladder,
        from: failed.lower,
        to: failed.upper,
        rule: ruleWords(plan.rules.alpha, plan.estimation.statistic === 'mean-scaled'),
        rounds: search.rounds.map(roundView),
        released: search.released.map(testView),
        ended: search.ended,
        partialLadder,
        onwardLadder: onward,
        otherReference,
        sentence: searchWords(failed, search)
      }
      project.note({
        what: 'releases searched',
        sentence: found.sentence,
        detail: asDetail({ ...found, rounds: found.rounds.length })
      })
      const view = await bench.view()
      recordJudgements(project, view.result, project.plan())
      return { search: found, view: await bench.view() }
    } finally {
      finish.ensure(signal.aborted)
    }
  })
}

function stepTo(rung: string, name: string, plan: Plan): FailedStep {
  const ladders = standingLadders(plan.ladders)
  const ladder = ladders.find((one) => one.name === name)
  if (ladder === undefined) {
    const names = ladders.map((one) => one.name)
    throw new InputError(`There is no ladder "${name}".`, { where: 'ladder', remedy: didYouMean(name, names, 'ladders') })
  }
  const rungs = ladderRungs(ladder, plan.candidates)
  const at = rungs.indexOf(rung)
  if (at < 1) {
    const what = at === 0 ? `"${rung}" is the lowest rung of the ladder "${name}".` : `The ladder "${name}" has no rung "${rung}".`
    throw new InputError(what, { where: 'rung', remedy: 'Name the rung above the step that does not hold.' })
  }
  // A rung that the ladder made is named after its candidate and its level: the level is enough.
  const level = 'invarianceOf' in ladder ? rung.slice(ladder.invarianceOf.length + 2) : rung
  return {
    lower: rungs[at - 1]!,
    upper: rung,
    below: rungs.slice(0, at),
    above: rungs.slice(at + 1),
    partialLadder: `${name}, partial ${level}`,
    onwardLadder: `${name}, on from partial ${level}`
  }
}

/** The ladder that climbs on, kept in the project; null where there is none or the work was stopped. */
async function onFromThere(project: Project, failed: FailedStep, search: Search, place: SearchPlace): Promise<string | null> {
  try {
    const ladder = await climbOn(project.plan(), failed, search, place)
    return ladder === null ? null : keptLadder(project, ladder)
  } catch (error) {
    if (!place.signal.aborted || error instanceof InputError) throw error
    return null
  }
}

/** In the project: every candidate, fit and proof is recorded as it comes. */
function recordedPlace(bench: Bench, project: Project, signal: AbortSignal, onWork: Bench['tell']): SearchPlace {
  const { crew, version } = bench.parts
  return {
    data: project.data(),
    version,
    crew,
    signal,
    fits: () => project.fits(),
    add: (candidate) => project.addCandidate(candidate),
    compare: (plan, names) => {
      const { origins } = familyOf(plan, project.candidateOrigins(), project.ladderOrigins())
      return compareRecorded({ project, plan, origins, names, version }, crew, { signal, onWork })
    }
  }
}

/** Stopped work is no error here either. @throws InputError where there is nothing to search */
async function searchedStep(plan: Plan, ladder: string, failed: FailedStep, place: SearchPlace): Promise<Search> {
  try {
    const result = await place.compare(plan, [failed.lower, failed.upper])
    const steps = result.ladders.find((one) => one.name === ladder)!.steps
    requireFailure(steps.find(({ to }) => to === failed.upper)!)
  } catch (error) {
    if (!place.signal.aborted || error instanceof InputError) throw error
    return { rounds: [], released: [], ended: 'stopped', ladder: null }
  }
  const search = await searchReleases(plan, failed, place)
  if (search.rounds[0]?.candidates.length !== 0) return search
  throw new InputError(`The step to ${failed.upper} adds no equality across groups that could be let go.`, { where: 'rung' })
}

function requireFailure({ to, verdict, because }: StepResult): void {
  if (verdict === 'holds') throw new InputError(`The step to ${to} holds, so there is nothing to let go.`, { where: 'rung' })
  if (verdict === 'no test') throw new InputError(`The step to ${to} was not tested.`, { where: 'rung', remedy: because })
}

/** The same search aside from the project, with other reference indicators. */
async function repeated(
  plan: Plan,
  failed: FailedStep,
  found: Search,
  place: SearchPlace
): Promise<ReleaseSearchView['otherReference']> {
  const other = withOtherReferences(plan, failed.upper)
  const memory: StudyMemory = { fits: new Map(), relations: new Map() }
  const { data, version, crew, signal } = place
  const aside: SearchPlace = {
    ...place,
    fits: () => memory.fits,
    add: () => {},
    compare: (all, names) => compareStudy({ plan: all, data, origins: new Map(), names, memory, version }, crew, { signal })
  }
  try {
    await aside.compare(other.plan, [failed.lower, failed.upper])
    const again = await searchReleases(other.plan, failed, aside)
    if (again.ended === 'stopped') return null
    return {
      agrees: again.ended === 'no solution' ? null : sameReleases(found.released, again.released),
      released: again.released.map(({ words }) => words),
      sentence: otherReferenceWords(other.how, found, again)
    }
  } catch (error) {
    if (signal.aborted) return null
    if (!(error instanceof InputError)) throw error
    return { agrees: null, released: [], sentence: `The search could not be repeated ${other.how}: ${error.message}` }
  }
}

/** The same family scaled otherwise: each factor by its second indicator where the rung's are scaled by the first, else by the first. */
function withOtherReferences(plan: Plan, rung: string): { plan: Plan; how: string } {
  const { scaling, factors } = resolveCandidate(rung, familyOf(plan).candidates)
  const turn = (names: string[]) => (scaling === 'first loading' ? [...names.slice(1), names[0]!] : names)
  const candidates = plan.candidates.map(
    (candidate): Candidate => ({
      ...candidate,
      factors: candidate.factors?.map((factor) => ({ ...factor, measures: turn(factor.measures) })) ?? null,
      scaling: candidate.from === null ? 'first loading' : null
    })
  )
  const references = factors.map(({ measures }) => turn(measures)[0]!)
  const many = references.length === 1 ? 'reference indicator' : 'reference indicators'
  return { plan: { ...plan, candidates }, how: `with ${listed(references, 6)} as ${many}` }
}

/** Adds the ladder of the partial rungs, unless it stands already; another one of its name makes it count on. Returns its name. */
function keptLadder(project: Project, ladder: LadderPlan): string {
  const standing = standingLadders(project.plan().ladders)
  for (let count = 1; ; count++) {
    const named = count === 1 ? ladder : { ...ladder, name: `${ladder.name} (${count})` }
    const there = standing.find(({ name }) => name === named.name)
    if (there === undefined) project.addLadder(named)
    if (there === undefined || canonicalJson(there) === canonicalJson(named)) return named.name
  }
}

function roundView(round: SearchRound): ReleaseRoundView {
  return {
    tests: round.candidates.map(testView),
    released: round.chosen === null ? null : testView(round.chosen),
    candidate: round.candidate?.name ?? null,
    verdict: round.step?.verdict ?? null,
    sentence: roundWords(round)
  }
}

function testView({ adjustedP, ...test }: ReleaseCandidate): ReleaseTestView {
  return { ...test, holmP: adjustedP }
}

function asDetail(value: object): Record<string, unknown> {
  return JSON.parse(JSON.stringify(value)) as Record<string, unknown>
}

/** Passes progress of each round on, and one end for them all. */
function endOnce(bench: Bench): { pass: Bench['tell']; ensure: (cancelled: boolean) => void } {
  return {
    pass: (event) => {
      if (event.kind !== 'finished') bench.tell(event)
    },
    ensure: (cancelled) => bench.tell({ kind: 'finished', cancelled })
  }
}
