/**
 * What a fit worker is asked and what it answers: plain, structured-clonable values. No statistics here.
 */
import type { ModelCells } from '../statistics/model/cells.ts'
import type { SampleMoments } from '../statistics/moments/sample-moments.ts'
import type { FitResult, Relation } from '../study/result.ts'

export interface FitSettings {
  convention: 'normal' | 'wishart'
}

export interface FitJob {
  kind: 'fit'
  candidate: string
  cells: ModelCells
  moments: SampleMoments
  settings: FitSettings
}

/** `gamma` is the solution in the model's own parameter order, null when there is none. */
export interface FitOutcome {
  fit: FitResult
  gamma: number[] | null
}

/** Is the model `restricted` (with its solution) nested in `general`? */
export interface RelationJob {
  kind: 'relation'
  general: ModelCells
  generalGamma: number[]
  restricted: ModelCells
  restrictedGamma: number[]
  /** Cases per group, for weighting. */
  sizes: number[]
}

export interface RelationOutcome {
  relation: Relation | 'reversed'
  proof: 'constraints' | 'refit'
}

/** Runs jobs, off the calling thread where it can. A job rejects only on a bug or when `signal` aborts. */
export interface Crew {
  fit(job: FitJob, signal?: AbortSignal): Promise<FitOutcome>
  relation(job: RelationJob, signal?: AbortSignal): Promise<RelationOutcome>
  close(): Promise<void>
}
