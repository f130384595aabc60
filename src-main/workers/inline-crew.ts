/**
 * A crew of one: does each job on the calling thread. For tests and for reading; a window would freeze under it.
 */
import { relationOf } from '../statistics/comparison/relation.ts'
import { fitModel } from '../statistics/fit/fit.ts'
import type { Crew, FitJob, FitOutcome, RelationJob, RelationOutcome } from './jobs.ts'

export const inlineCrew: Crew = {
  async fit(job, signal) {
    signal?.throwIfAborted()
    return doJob(job)
  },
  async relation(job, signal) {
    signal?.throwIfAborted()
    return doJob(job)
  },
  async close() {}
}

/** The whole of what a worker knows: which function of the statistics answers which job. */
export function doJob(job: FitJob): FitOutcome
export function doJob(job: RelationJob): RelationOutcome
export function doJob(job: FitJob | RelationJob): FitOutcome | RelationOutcome
export function doJob(job: FitJob | RelationJob): FitOutcome | RelationOutcome {
  return job.kind === 'fit' ? fitModel(job.cells, job.moments, job.settings, job.rows) : relationOf(job)
}
