import { mkdirSync, mkdtempSync, rmSync, writeFileSync } from 'node:fs'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { afterAll, beforeAll, describe, expect, test } from 'vitest'
import type { Crew, FitJob } from './jobs.ts'
import { createPool } from './pool.ts'

/** Stands in for the worker's bundle: tells its thread, or never ends, or breaks, as the candidate's name says. */
const stubWorker = `
const { threadId } = require('node:worker_threads')
module.exports = (job) => {
  if (job.candidate === 'endless') for (;;) {}
  if (job.candidate === 'broken') throw new TypeError('a bug')
  return { kind: job.kind, threadId, mean: job.moments.groups[0].covariance }
}
`
let folder = ''
let crew: Crew
beforeAll(() => {
  folder = mkdtempSync(join(tmpdir(), 'rungwise-pool-'))
  mkdirSync(join(folder, 'chunks'))
  writeFileSync(join(folder, 'fit-worker.cjs'), stubWorker)
  crew = createPool({ folder, threads: 2 })
})
afterAll(async () => {
  await crew.close()
  rmSync(folder, { recursive: true, force: true })
})

function job(candidate: string): FitJob {
  const moments = { indicators: ['a'], groups: [{ name: null, n: 9, covariance: Float64Array.of(2), mean: null }] }
  return {
    kind: 'fit',
    candidate,
    cells: { indicators: ['a'], factors: [], groups: [], constraints: [] },
    moments,
    settings: { convention: 'normal' },
    rows: null
  }
}

describe('the pool of fit workers', () => {
  test('does a job on another thread, typed arrays and all', async () => {
    const outcome = await crew.fit(job('plain'))
    expect(outcome).toMatchObject({ kind: 'fit', mean: Float64Array.of(2) })
    expect(outcome).not.toMatchObject({ threadId: 0 })
  })

  test('stops a running job at once when its signal aborts, and goes on working', async () => {
    const stop = new AbortController()
    const endless = crew.fit(job('endless'), stop.signal)
    setTimeout(() => stop.abort(new Error('enough')), 50)
    await expect(endless).rejects.toThrow('enough')
    expect(await crew.fit(job('plain'))).toMatchObject({ kind: 'fit' })
  })

  test('does not start a job whose signal has aborted', async () => {
    await expect(crew.fit(job('endless'), AbortSignal.abort(new Error('before')))).rejects.toThrow('before')
  })

  test('passes a bug on as it is', async () => {
    await expect(crew.fit(job('broken'))).rejects.toThrow('a bug')
  })

  test('finds its worker from a bundle that was split off into chunks/', async () => {
    const other = createPool({ folder: join(folder, 'chunks'), threads: 1 })
    expect(await other.fit(job('plain'))).toMatchObject({ kind: 'fit' })
    await other.close()
  })

  test('says what is missing when the program was not built', () => {
    expect(() => createPool({ folder: join(folder, 'chunks', 'none') })).toThrow('The fit worker is missing')
  })
})
