/**
 * Fits the candidates of a study and lays them out as ladders: the main job, as one call (its walk is in DEVELOPERS.md).
 */
import type { DataSet, Origin, Plan } from '../study/study.ts'
import type { StudyResult } from '../study/result.ts'
import type { Crew, FitOutcome, RelationOutcome } from '../workers/jobs.ts'
import type { WorkEvent } from './contract.ts'

/** Fits and proofs already made, by digest; given and added to. A digest covers the model, the data, the settings and the program version. */
export interface StudyMemory {
  fits: Map<string, FitOutcome>
  relations: Map<string, RelationOutcome>
}

export interface CompareInput {
  plan: Plan
  data: DataSet
  /** By candidate name; a name left out is planned. */
  origins: ReadonlyMap<string, Origin>
  /** Candidates to fit now; null for all. What is not fitted and not in `memory` stays a draft and out of the result. */
  names: string[] | null
  memory: StudyMemory
}

export interface CompareOptions {
  onWork?: (event: WorkEvent) => void
  signal?: AbortSignal
}

export async function compareStudy(_input: CompareInput, _crew: Crew, _options: CompareOptions = {}): Promise<StudyResult> {
  throw new Error('being written')
}
