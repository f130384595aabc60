/**
 * A crew of worker threads, one per core, so that the thread that serves the window never fits a model itself.
 */
import { existsSync } from 'node:fs'
import { availableParallelism } from 'node:os'
import { join } from 'node:path'
import { Piscina } from 'piscina'
import type { Crew, Job } from './jobs.ts'

export interface PoolOptions {
  /** The folder of the running bundle; the worker's bundle lies in it, or one folder up when the code was split off into chunks/. */
  folder: string
  /** Threads at most; as many as there are cores unless given. */
  threads?: number
}

/**
 * Starts the pool; threads come up with the first jobs.
 *
 * Aborting a job's signal stops its thread at once (the pool replaces it) and rejects the job with the signal's reason.
 * Throws when the worker's bundle is not there: the program was not built.
 */
export function createPool(options: PoolOptions): Crew {
  const pool = new Piscina({
    filename: workerFile(options.folder),
    minThreads: 1,
    maxThreads: options.threads ?? availableParallelism(),
    idleTimeout: 30_000
  })
  return {
    fit: (job, signal) => run(pool, job, signal),
    relation: (job, signal) => run(pool, job, signal),
    restrictedScaling: (job, signal) => run(pool, job, signal),
    notNested: (job, signal) => run(pool, job, signal),
    familyOrder: (job, signal) => run(pool, job, signal),
    resample: (job, signal) => run(pool, job, signal),
    scoreTests: (job, signal) => run(pool, job, signal),
    close: () => pool.destroy()
  }
}

async function run<Outcome>(pool: Piscina, job: Job, signal: AbortSignal | undefined): Promise<Outcome> {
  signal?.throwIfAborted()
  try {
    return await pool.run(job, signal === undefined ? {} : { signal })
  } catch (error) {
    signal?.throwIfAborted()
    throw error
  }
}

function workerFile(folder: string): string {
  const candidates = [join(folder, 'fit-worker.cjs'), join(folder, '..', 'fit-worker.cjs')]
  const found = candidates.find((file) => existsSync(file))
  if (found === undefined) throw new Error(`The fit worker is missing: neither ${candidates.join(' nor ')} exists.`)
  return found
}
