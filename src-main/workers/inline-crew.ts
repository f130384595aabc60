/**
 * A crew of one: does each job on the calling thread. For tests and for reading; a window would freeze under it.
 */

import { notNestedTests } from '../statistics/comparison/not-nested.ts'
import { familyOrder } from '../statistics/comparison/partial-order.ts'
import { relationOf } from '../statistics/comparison/relation.ts'
import { scalingAtRestricted } from '../statistics/comparison/scaled-difference.ts'
import { scoreTests } from '../statistics/estimation/score-tests.ts'
import { fitModel } from '../statistics/fit/fit.ts'
import { resampleLadder } from '../statistics/resampling/ladder-resamples.ts'
import type { Crew, Job, Outcome } from './jobs.ts'

export const inlineCrew: Crew = {
  fit: done,
  relation: done,
  restrictedScaling: done,
  notNested: done,
  familyOrder: done,
  resample: done,
  scoreTests: done,
  async close() {}
}

async function done<Result extends Outcome>(job: Job, signal?: AbortSignal): Promise<Result> {
  signal?.throwIfAborted()
  return doJob(job) as Result
}

/** The whole of what a worker knows: which function of the statistics answers which job. */
export function doJob(job: Job): Outcome {
  switch (job.kind) {
    case 'fit':
      return fitModel(job.cells, job.moments, job.settings, job.rows)
    case 'relation':
      return relationOf(job)
    case 'restricted scaling':
      return scalingAtRestricted(job)
    case 'not nested':
      return notNestedTests(job)
    case 'family order':
      return familyOrder(job)
    case 'resample':
      return resampleLadder(job, scalingAtRestricted)
    case 'score tests':
      return scoreTests(job.cells, job.moments, job.settings.convention, job.gamma)
  }
}
