/**
 * How long 1,000 resamples of a four-rung ladder take on two threads: 9 indicators on 3 factors, 3 groups of 300 cases.
 */
import { Worker } from 'node:worker_threads'
import { seededGenerator } from '../../src-main/statistics/distributions/generator.ts'
import { fitModel } from '../../src-main/statistics/fit/fit.ts'
import { completeCaseMoments } from '../../src-main/statistics/moments/sample-moments.ts'
import type { ResampleInput, ResampleOutcome } from '../../src-main/statistics/resampling/ladder-resamples.ts'
import { candidateCells, resolveCandidate } from '../../src-main/study/candidate-model.ts'
import { ladderCandidates } from '../../src-main/study/ladders.ts'
import { candidateSchema } from '../../src-main/study/study.ts'
import { simulateRows } from './simulate.ts'

export interface StabilityTiming {
  name: string
  /** Of all resamples, threads started and samples sent included. */
  milliseconds: number
  /** Milliseconds asked for. */
  target: number
  threads: number
  /** Fits that found no solution. */
  failed: number
}

const groups = ['g1', 'g2', 'g3']

/** The ladder of the bench on its simulated cases, as one job of `count` resamples. */
export function stabilityInput(count: number): ResampleInput {
  const [p, m, n] = [9, 3, 300]
  const indicators = Array.from({ length: p }, (_, i) => `y${i + 1}`)
  const generator = seededGenerator(909)
  const rows = groups.map((_, g) => simulateRows(p, m, n, 0.2 * g, generator))
  const base = candidateSchema.parse({
    name: 'base',
    factors: [0, 3, 6].map((first) => ({ name: `F${first}`, measures: indicators.slice(first, first + 3) }))
  })
  const rungs = ladderCandidates({ name: 'ladder', invarianceOf: 'base', across: 'group', through: 'strict' }, [base])
  const moments = { indicators, groups: rows.map((values, g) => ({ name: groups[g]!, ...completeCaseMoments(values, p) })) }
  return {
    rungs: rungs.map(({ name }, i) => {
      const cells = candidateCells(resolveCandidate(name, [base, ...rungs]), { indicators, grouping: 'group', groups, means: true })
      return { cells, sample: 0, gamma: fitModel(cells, moments, { convention: 'normal' }).gamma, nested: i > 0, watched: [] }
    }),
    samples: [{ indicators, groups: rows.map((values, g) => ({ name: groups[g]!, rows: values })), patterns: false }],
    strata: groups.map(() => n),
    statistic: 'normal theory',
    scalingAtUpper: 'where needed',
    seed: 1,
    first: 0,
    count
  }
}

const threadCode = `
const { parentPort, workerData } = require('node:worker_threads')
import(workerData.module).then(({ resampleLadder }) => parentPort.postMessage(resampleLadder(workerData.input, () => null)))
`

/** One thread's share of the resamples. */
function onThread(input: ResampleInput): Promise<ResampleOutcome> {
  const module = new URL('../../src-main/statistics/resampling/ladder-resamples.ts', import.meta.url).href
  return new Promise((resolve, reject) => {
    const worker = new Worker(threadCode, { eval: true, workerData: { module, input } })
    worker.once('message', (outcome: ResampleOutcome) => {
      resolve(outcome)
      void worker.terminate()
    })
    worker.once('error', reject)
  })
}

export async function stabilityTiming(): Promise<StabilityTiming> {
  const [resamples, threads] = [1000, 2]
  const input = stabilityInput(resamples / threads)
  const start = performance.now()
  const outcomes = await Promise.all(
    Array.from({ length: threads }, (_, thread) => onThread({ ...input, first: (thread * resamples) / threads }))
  )
  const milliseconds = performance.now() - start
  const failed = outcomes.flatMap(({ fits }) => fits.flat()).filter((fit) => fit.state !== 'fitted').length
  return {
    name: '1,000 resamples of a four-rung ladder, 9 indicators on 3 factors in 3 groups of 300',
    milliseconds,
    target: 20_000,
    threads,
    failed
  }
}
