/**
 * How stable the verdicts of a ladder are: its rungs are refitted to resamples of the cases, spread over the crew, and
 * every resample is judged by the study's rules. Stopped work keeps what was done.
 */
import { availableParallelism } from 'node:os'
import type { Project } from '../project/project.ts'
import type { CaseSample } from '../statistics/resampling/weighted-moments.ts'
import { InputError } from '../study/input-error.ts'
import type { StabilityResult, StudyResult } from '../study/result.ts'
import type { DataSet, LadderPlan, Plan } from '../study/study.ts'
import type { Crew, ResampleJob } from '../workers/jobs.ts'
import { type ClimbInput, ladderSteps, momentsKey } from './climb.ts'
import type { CompareOptions } from './compare-study.ts'
import { type Entry, entriesOf } from './entries.ts'
import { familyOf } from './family.ts'
import { type ResampledLadder, StabilityTally } from './stability-tally.ts'
import { trailSentence } from './stability-words.ts'

/** The study whose ladder is resampled: as fitted, in `result`, and the project that its trail is kept in. */
export interface StabilityWork {
  project: Project
  plan: Plan
  result: StudyResult
  crew: Crew
  version: string
}

export interface Resampling {
  resamples: number
  seed: number
}

/** A chunk of resamples is meant to keep a thread busy for about so long: often enough to tell progress. */
const chunkMilliseconds = 300
const firstChunk = 5
const largestChunk = 100

/** @throws InputError where there are no cases to resample */
export function requireCases(data: DataSet): void {
  if (data.kind === 'rows') return
  throw new InputError('Published covariances cannot be resampled: that takes the cases themselves.', {
    where: data.source,
    remedy: 'Give the data as a file of cases.'
  })
}

/** @throws InputError where a rung was not fitted, or the work was stopped before any resample was done */
export async function ladderStability(
  work: StabilityWork,
  ladder: LadderPlan,
  resampling: Resampling,
  options: CompareOptions = {}
): Promise<StabilityResult> {
  requireCases(work.project.data())
  const { entries, resampled } = await groundOf(work, ladder)
  const tally = new StabilityTally(resampled)
  await resampleAll(work.crew, jobOf(work, resampled, entries, resampling), tally, ladder.name, options)
  if (tally.resamples === 0) throw new InputError('Resampling was stopped before any resample was done.', { where: 'ladder' })
  const stable = tally.result(resampling.resamples, resampling.seed)
  note(work.project, stable)
  return stable
}

function note(project: Project, stable: StabilityResult): void {
  const { ladder, seed, asked, resamples, incomplete } = stable
  project.note({
    what: 'ladder resampled',
    sentence: trailSentence(ladder, stable, stable.rungs),
    detail: {
      ladder,
      seed,
      asked,
      resamples,
      incomplete,
      steps: stable.steps.map(({ from, to, counts }) => ({ from, to, ...counts })),
      stands: stable.rungs.map(({ rung, stands, unsolved }) => ({ rung, stands, unsolved }))
    }
  })
}

/** The ladder with its steps as the data leave them, and its rungs made ready. */
async function groundOf(
  { project, plan, result, crew, version }: StabilityWork,
  ladder: LadderPlan
): Promise<{ entries: Entry[]; resampled: ResampledLadder }> {
  const family = familyOf(plan)
  const entries = entriesOf(plan, project.data(), version, family)
  const memory = { fits: new Map(project.fits()), relations: new Map(project.relations()) }
  const input: ClimbInput = { plan, memory, entries, results: result.candidates, family: family.candidates }
  const { rungs, steps } = await ladderSteps(ladder, input, crew)
  const results = rungs.map((rung) => {
    const own = result.candidates.find((candidate) => candidate.name === rung)
    if (own === undefined) {
      throw new InputError(`"${rung}" has not been fitted yet.`, { where: 'ladder', remedy: 'Fit the ladder first.' })
    }
    return own
  })
  const judged = result.ladders.find((one) => one.name === ladder.name)!
  return {
    entries: rungs.map((rung) => entries.find((entry) => entry.candidate.name === rung)!),
    resampled: { name: ladder.name, rungs, steps, results, rules: plan.rules, judged }
  }
}

/** All resamples as one job, of which chunks are taken. Groups are strata where any rung tells them apart. */
function jobOf(
  { project, plan }: StabilityWork,
  ladder: ResampledLadder,
  entries: readonly Entry[],
  { seed, resamples }: Resampling
): ResampleJob {
  const keys = [...new Set(entries.map(momentsKey))]
  const samples = keys.map((key): CaseSample => {
    const { cells, sample } = entries.find((entry) => momentsKey(entry) === key)!
    return {
      indicators: cells.indicators,
      groups: sample.moments.groups.map(({ name }, g) => ({ name, rows: sample.rows![g]! })),
      patterns: plan.estimation.missing === 'full information'
    }
  })
  const finest = samples.reduce((a, b) => (b.groups.length > a.groups.length ? b : a))
  const fits = project.fits()
  return {
    kind: 'resample',
    rungs: entries.map((entry, i) => ({
      cells: entry.cells,
      sample: keys.indexOf(momentsKey(entry)),
      gamma: fits.get(entry.digest)?.gamma ?? null,
      nested: i > 0 && ladder.steps[i - 1]!.ground.relation?.relation === 'nested',
      watched: (ladder.steps[i]?.boundary?.parameters ?? []).map(({ part, of, group }) => ({ part, of, group }))
    })),
    samples,
    strata: finest.groups.map(({ rows }) => rows.length / finest.indicators.length),
    statistic: plan.estimation.statistic,
    scalingAtUpper: plan.rules.scaledDifference === 'strictly positive' ? 'always' : 'where needed',
    seed,
    first: 0,
    count: resamples
  }
}

/** As many chunks at a time as there are cores, each as large as the last ones allow. Ends early, without an error, when stopped. */
async function resampleAll(
  crew: Crew,
  job: ResampleJob,
  tally: StabilityTally,
  ladder: string,
  { onWork, signal }: CompareOptions
): Promise<void> {
  const started = performance.now()
  const resamples = job.count
  const stopped = () => signal?.aborted ?? false
  let next = 0
  let size = firstChunk
  onWork?.({ kind: 'started', total: resamples })
  const lane = async () => {
    while (next < resamples && !stopped()) {
      const first = next
      const count = Math.min(size, resamples - first)
      next += count
      const begun = performance.now()
      const { fits } = await crew.resample({ ...job, first, count }, signal)
      size = Math.max(1, Math.min(largestChunk, Math.round((count * chunkMilliseconds) / (performance.now() - begun))))
      for (const fit of fits) tally.add(fit)
      const done = tally.resamples
      const secondsLeft = (((performance.now() - started) / done) * (resamples - done)) / 1000
      onWork?.({ kind: 'resampled', ladder, done, total: resamples, secondsLeft })
    }
  }
  const ends = await Promise.allSettled(Array.from({ length: availableParallelism() }, lane))
  onWork?.({ kind: 'finished', cancelled: stopped() })
  for (const end of ends) if (end.status === 'rejected' && !stopped()) throw end.reason
}
