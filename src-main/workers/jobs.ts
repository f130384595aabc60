/**
 * What a fit worker is asked and what it answers: plain, structured-clonable values. No statistics here.
 */

import type { NotNestedInput, NotNestedTests } from '../statistics/comparison/not-nested.ts'
import type { FamilyInput, FamilyOrder } from '../statistics/comparison/partial-order.ts'
import type { RelationInput, RelationOutcome } from '../statistics/comparison/relation.ts'
import type { ScalingAtRestrictedInput } from '../statistics/comparison/scaled-difference.ts'
import type { ScoreTests } from '../statistics/estimation/score-tests.ts'
import type { FitOutcome } from '../statistics/fit/fit-result.ts'
import type { FitSettings } from '../statistics/fit/settings.ts'
import type { ModelCells } from '../statistics/model/cells.ts'
import type { SampleMoments } from '../statistics/moments/sample-moments.ts'
import type { ResampleInput, ResampleOutcome } from '../statistics/resampling/ladder-resamples.ts'

export interface FitJob {
  kind: 'fit'
  candidate: string
  cells: ModelCells
  moments: SampleMoments
  settings: FitSettings
  /** Per group n x p row-major, NaN where missing; null where nothing casewise is asked. */
  rows: Float64Array[] | null
}

/** Is the model `restricted` (with its solution) nested in `general`? */
export interface RelationJob extends RelationInput {
  kind: 'relation'
}

/** What would releasing each restriction of a fitted model do? */
export interface ScoreJob {
  kind: 'score tests'
  cells: ModelCells
  moments: SampleMoments
  settings: FitSettings
  gamma: number[]
}

/** The scaling of the lower rung at the upper rung's estimates, for the strictly positive difference; null when there is none. */
export interface RestrictedScalingJob extends ScalingAtRestrictedInput {
  kind: 'restricted scaling'
}

/** Which of two models that are not nested fits better, case by case; null where a case has no likelihood of its own. */
export interface NotNestedJob extends NotNestedInput {
  kind: 'not nested'
}

/** How the models of a family stand to each other, every pair. */
export interface FamilyOrderJob extends FamilyInput {
  kind: 'family order'
}

/** The rungs of a ladder on a run of resamples. */
export interface ResampleJob extends ResampleInput {
  kind: 'resample'
}

export type Job = NotNestedJob | FamilyOrderJob | ResampleJob | RestrictedScalingJob | FitJob | RelationJob | ScoreJob
export type Outcome = NotNestedTests | FamilyOrder | ResampleOutcome | number | null | FitOutcome | RelationOutcome | ScoreTests

/** Runs jobs, off the calling thread where it can. A job rejects only on a bug or when `signal` aborts. */
export interface Crew {
  fit(job: FitJob, signal?: AbortSignal): Promise<FitOutcome>
  relation(job: RelationJob, signal?: AbortSignal): Promise<RelationOutcome>
  restrictedScaling(job: RestrictedScalingJob, signal?: AbortSignal): Promise<number | null>
  notNested(job: NotNestedJob, signal?: AbortSignal): Promise<NotNestedTests | null>
  familyOrder(job: FamilyOrderJob, signal?: AbortSignal): Promise<FamilyOrder>
  resample(job: ResampleJob, signal?: AbortSignal): Promise<ResampleOutcome>
  scoreTests(job: ScoreJob, signal?: AbortSignal): Promise<ScoreTests>
  close(): Promise<void>
}

export type { RelationOutcome } from '../statistics/comparison/relation.ts'
export type { FitOutcome } from '../statistics/fit/fit-result.ts'
