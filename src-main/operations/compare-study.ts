/**
 * Fits the candidates of a study and lays them out as ladders: the main job, as one call. The walk, top to bottom:
 *
 *     family -> cells and moments of each candidate -> fits (by the crew) -> relations of adjacent rungs -> result
 */
import { informationWeights } from '../statistics/comparison/difference-test.ts'
import { standingLadders } from '../study/ladders.ts'
import type { CandidateResult, LadderResult, StudyResult } from '../study/result.ts'
import { candidateSentence } from '../study/sentences.ts'
import type { Candidate, DataSet, Origin, Plan } from '../study/study.ts'
import type { Crew } from '../workers/jobs.ts'
import { climb, momentsKey } from './climb.ts'
import type { WorkEvent } from './contract.ts'
import { dataSummary } from './data-summary.ts'
import { type Entry, entriesOf, type StudyMemory } from './entries.ts'
import { familyOf } from './family.ts'

export interface CompareInput {
  plan: Plan
  data: DataSet
  /** By candidate name; a name left out is planned. */
  origins: ReadonlyMap<string, Origin>
  /** Candidates to fit now (with what ladders generate from them); null for all. What is neither fitted nor in `memory` is left out of the result. */
  names: string[] | null
  memory: StudyMemory
  version: string
}

export interface CompareOptions {
  onWork?: (event: WorkEvent) => void
  signal?: AbortSignal
}

/** Throws InputError for a candidate that makes no model, and the signal's reason when it aborts; finished fits are in `memory` by then. */
export async function compareStudy(input: CompareInput, crew: Crew, options: CompareOptions = {}): Promise<StudyResult> {
  const family = familyOf(input.plan, input.origins)
  const entries = entriesOf(input.plan, input.data, input.version, family)
  await fitAll(
    input,
    entries.filter((entry) => isWanted(entry.candidate, input.names, family.bases)),
    crew,
    options
  )
  const results = candidateResults(entries, input.memory)
  const ladders: LadderResult[] = []
  for (const ladder of standingLadders(input.plan.ladders))
    ladders.push(await climb(ladder, { ...input, entries, results, family: family.candidates }, crew, options.signal))
  return {
    study: input.plan.study,
    program: { name: 'rungwise', version: input.version },
    data: dataSummary(input.data, input.plan.estimation),
    candidates: results,
    ladders
  }
}

function isWanted({ name }: Candidate, names: string[] | null, bases: ReadonlyMap<string, string>): boolean {
  if (names === null || names.includes(name)) return true
  const base = bases.get(name)
  return base !== undefined && names.includes(base)
}

async function fitAll(input: CompareInput, entries: Entry[], crew: Crew, { onWork, signal }: CompareOptions): Promise<void> {
  const { memory, plan } = input
  const { convention, standardErrors, statistic } = plan.estimation
  const casewise = standardErrors === 'robust' || statistic === 'mean-scaled'
  const open = new Map(entries.filter((e) => !memory.fits.has(e.digest)).map((e) => [e.digest, e]))
  const total = open.size
  let done = 0
  const started = performance.now()
  onWork?.({ kind: 'started', total })
  const work = [...open.values()].map(async ({ candidate, cells, sample, digest }) => {
    const job = {
      kind: 'fit' as const,
      candidate: candidate.name,
      cells,
      moments: sample.moments,
      settings: { convention, standardErrors, statistic },
      rows: casewise ? sample.rows : null
    }
    const outcome = await crew.fit(job, signal)
    memory.fits.set(digest, outcome)
    done++
    const secondsLeft = (((performance.now() - started) / done) * (total - done)) / 1000
    onWork?.({ kind: 'fitted', candidate: candidate.name, state: outcome.fit.state, done, total, secondsLeft })
  })
  const ends = await Promise.allSettled(work)
  onWork?.({ kind: 'finished', cancelled: signal?.aborted ?? false })
  signal?.throwIfAborted()
  for (const end of ends) if (end.status === 'rejected') throw end.reason
}

function candidateResults(entries: Entry[], memory: StudyMemory): CandidateResult[] {
  const fitted = entries.flatMap((entry) => {
    const outcome = memory.fits.get(entry.digest)
    return outcome === undefined ? [] : [{ entry, fit: outcome.fit }]
  })
  const results: CandidateResult[] = fitted.map(({ entry, fit }) => ({
    name: entry.candidate.name,
    origin: entry.origin,
    from: entry.candidate.from,
    sentence: candidateSentence(entry.candidate),
    sameAs: entries.filter((other) => other !== entry && other.digest === entry.digest).map((other) => other.candidate.name),
    aicWeight: null,
    bicWeight: null,
    ...fit
  }))
  weigh(
    fitted.map(({ entry }) => entry),
    results
  )
  return results
}

/** Akaike and BIC weights within each set of candidates fitted to the same moments; one content counts once under all its names. */
function weigh(entries: Entry[], results: CandidateResult[]): void {
  const sets = new Map<string, Map<string, CandidateResult[]>>()
  entries.forEach((entry, i) => {
    if (results[i]!.state !== 'fitted') return
    const key = momentsKey(entry)
    const set = sets.get(key) ?? new Map<string, CandidateResult[]>()
    sets.set(key, set)
    set.set(entry.digest, [...(set.get(entry.digest) ?? []), results[i]!])
  })
  for (const set of sets.values()) {
    const models = [...set.values()]
    const aic = informationWeights(models.map(([one]) => one!.aic!))
    const bic = informationWeights(models.map(([one]) => one!.bic!))
    models.forEach((names, k) => {
      for (const result of names) Object.assign(result, { aicWeight: aic[k], bicWeight: bic[k] })
    })
  }
}
