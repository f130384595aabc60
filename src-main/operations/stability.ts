/**
 * How stable the verdicts of a ladder are: its rungs are refitted to resamples of the cases, spread over the crew, and
 * every resample is judged by the study's rules. Stopped work keeps what was done.
 */
import { availableParallelism } from 'node:os'
import type { CaseSample } from '../statistics/resampling/weighted-moments.ts'
import { InputError } from '../study/input-error.ts'
import { standingLadders } from '../study/ladders.ts'
import { didYouMean } from '../study/nearest.ts'
import type { StudyResult } from '../study/result.ts'
import type { LadderPlan, Plan } from '../study/study.ts'
import type { ResampleJob } from '../workers/jobs.ts'
import type { Bench } from './bench.ts'
import { type ClimbInput, ladderSteps, momentsKey } from './climb.ts'
import type { Operations, StabilityResult } from './contract.ts'
import { type Entry, entriesOf } from './entries.ts'
import { familyOf } from './family.ts'
import { type ResampledLadder, StabilityTally } from './stability-tally.ts'
import { trailSentence } from './stability-words.ts'

type Input = Operations['stability']['input']

/** A chunk of resamples is meant to keep a thread busy for about so long: often enough to tell progress. */
const chunkMilliseconds = 300
const firstChunk = 5
const largestChunk = 100

/**
 * @throws InputError where there are no cases to resample, the ladder is unknown or not fitted yet, or the work was
 *   stopped before any resample was done
 */
export async function stability(bench: Bench, input: Input): Promise<StabilityResult> {
  const project = bench.requireProject()
  const plan = project.plan()
  const ladder = ladderNamed(input.ladder, plan)
  if (project.data().kind !== 'rows') {
    throw new InputError('Published covariances cannot be resampled: that takes the cases themselves.', {
      where: 'ladder',
      remedy: 'Give the data as a file of cases.'
    })
  }
  return bench.work(async (signal) => {
    const { result } = await bench.view()
    const { entries, resampled } = await groundOf(bench, plan, ladder, result)
    const tally = new StabilityTally(resampled)
    await resampleAll(bench, jobOf(resampled, entries, plan, input, bench), input, tally, signal)
    if (tally.resamples === 0) throw new InputError('Resampling was stopped before any resample was done.', { where: 'ladder' })
    const stable = tally.result(input.resamples, input.seed)
    project.note({
      what: 'ladder resampled',
      sentence: trailSentence(ladder.name, stable, stable.rungs),
      detail: {
        ladder: ladder.name,
        seed: input.seed,
        asked: input.resamples,
        resamples: stable.resamples,
        incomplete: stable.incomplete,
        steps: stable.steps.map(({ from, to, counts }) => ({ from, to, ...counts })),
        stands: stable.rungs.map(({ rung, stands, unsolved }) => ({ rung, stands, unsolved }))
      }
    })
    return stable
  })
}

function ladderNamed(name: string, plan: Plan): LadderPlan {
  const ladders = standingLadders(plan.ladders)
  const ladder = ladders.find((one) => one.name === name)
  if (ladder !== undefined) return ladder
  const names = ladders.map((one) => one.name)
  throw new InputError(`There is no ladder "${name}".`, { where: 'ladder', remedy: didYouMean(name, names, 'ladders') })
}

/** The ladder with its steps as the data leave them, and its rungs made ready. */
async function groundOf(
  bench: Bench,
  plan: Plan,
  ladder: LadderPlan,
  result: StudyResult
): Promise<{ entries: Entry[]; resampled: ResampledLadder }> {
  const { crew, version } = bench.parts
  const project = bench.requireProject()
  const family = familyOf(plan, project.candidateOrigins(), project.ladderOrigins())
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
  ladder: ResampledLadder,
  entries: readonly Entry[],
  plan: Plan,
  { seed, resamples }: Input,
  bench: Bench
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
  const fits = bench.requireProject().fits()
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
  bench: Bench,
  job: ResampleJob,
  { resamples, ladder }: Input,
  tally: StabilityTally,
  signal: AbortSignal
): Promise<void> {
  const started = performance.now()
  let next = 0
  let size = firstChunk
  bench.tell({ kind: 'started', total: resamples })
  const lane = async () => {
    while (next < resamples && !signal.aborted) {
      const first = next
      const count = Math.min(size, resamples - first)
      next += count
      const begun = performance.now()
      const { fits } = await bench.parts.crew.resample({ ...job, first, count }, signal)
      size = Math.max(1, Math.min(largestChunk, Math.round((count * chunkMilliseconds) / (performance.now() - begun))))
      for (const fit of fits) tally.add(fit)
      const done = tally.resamples
      const secondsLeft = (((performance.now() - started) / done) * (resamples - done)) / 1000
      bench.tell({ kind: 'resampled', ladder, done, total: resamples, secondsLeft })
    }
  }
  const ends = await Promise.allSettled(Array.from({ length: availableParallelism() }, lane))
  bench.tell({ kind: 'finished', cancelled: signal.aborted })
  for (const end of ends) if (end.status === 'rejected' && !signal.aborted) throw end.reason
}
