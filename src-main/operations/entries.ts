/**
 * The candidates of a study made ready: their models, their samples, and the digests their fits are remembered by.
 */
import { createHash } from 'node:crypto'
import type { NotNestedTests } from '../statistics/comparison/not-nested.ts'
import type { ModelCells } from '../statistics/model/cells.ts'
import type { Candidate, DataSet, Origin, Plan } from '../study/study.ts'
import type { FitOutcome, RelationOutcome } from '../workers/jobs.ts'
import { type CandidateSample, sampleSource } from './candidate-moments.ts'
import { cellsOf, type Family, sampleOf } from './family.ts'

/** Fits and proofs already made, by digest; given and added to. A digest covers the model, the data, the settings and the program version. */
export interface StudyMemory {
  fits: Map<string, FitOutcome>
  relations: Map<string, RelationOutcome>
  /** Casewise tests of pairs that are not nested; computed again where the map is left out. */
  notNested?: Map<string, NotNestedTests | null>
}

export interface Entry {
  candidate: Candidate
  origin: Origin
  cells: ModelCells
  sample: CandidateSample
  /** Of the model, the data, the estimation and the program version. */
  digest: string
}

/** Throws InputError for a candidate that makes no model. */
export function entriesOf(
  plan: Plan,
  data: DataSet,
  version: string,
  { candidates, origins }: Pick<Family, 'candidates' | 'origins'>
): Entry[] {
  const samples = sampleSource(data, plan.estimation)
  return candidates.map((candidate) => {
    const cells = cellsOf(candidate.name, candidates, plan, data)
    return {
      candidate,
      origin: origins.get(candidate.name) ?? 'planned',
      cells,
      sample: sampleOf(cells, samples),
      digest: digestOf({ cells, data: data.digest, estimation: plan.estimation, version })
    }
  })
}

/** SHA-256 over the JSON text; keys are written in the order the code makes them, so equal content gives equal text. */
export function digestOf(content: object): string {
  return `sha256:${createHash('sha256').update(JSON.stringify(content)).digest('hex')}`
}
