/**
 * What a project is given to record: plain values, and the clock that dates them.
 */
import type { FitOutcome, RelationOutcome } from '../workers/jobs.ts'

/** Where the time in the trail comes from. */
export type Clock = () => Date

export interface RecordedFit {
  /** What the outcome is found by again: covers model, data, settings and program version. */
  digest: string
  candidate: string
  settings: Readonly<Record<string, unknown>>
  version: string
  outcome: FitOutcome
}

export interface RecordedRelation {
  digest: string
  /** The candidates' names where they are known. */
  restricted: string | null
  general: string | null
  version: string
  outcome: RelationOutcome
}

export interface Decision {
  ladder: string
  rung: string
  reason: string
}
