/**
 * The file a worker thread runs: one job in, one outcome out. Built as a bundle of its own (out/main/fit-worker.cjs).
 */
import { doJob } from './inline-crew.ts'
import type { Job, Outcome } from './jobs.ts'

export default function answer(job: Job): Outcome {
  return doJob(job)
}
