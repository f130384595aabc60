/**
 * A folder with a small invented study in it, and a workbench on that folder, for the tests of the operations.
 */
import { mkdtempSync, readFileSync, writeFileSync } from 'node:fs'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { tickingClock } from '../project/test-study.ts'
import { seededGenerator } from '../statistics/distributions/generator.ts'
import { InputError } from '../study/input-error.ts'
import { inlineCrew } from '../workers/inline-crew.ts'
import type { Crew } from '../workers/jobs.ts'
import type { Answer, OperationName, Operations, WorkEvent } from './contract.ts'
import { createWorkbench, type Workbench } from './index.ts'

const indicators = ['hum', 'rattle', 'thud', 'echo', 'whistle', 'hiss'] as const

/** 120 rows of two factors (the first three indicators, the last three) in two houses, from a fixed seed; one answer missing. */
function noiseCsv(): string {
  const generator = seededGenerator(42)
  const rows = Array.from({ length: 120 }, (_, i) => {
    const low = generator.normal()
    const high = 0.4 * low + 0.9 * generator.normal()
    const answers = indicators.map((_name, j) => (3 + (j < 3 ? low : high) * (0.7 + 0.1 * j) + 0.8 * generator.normal()).toFixed(3))
    if (i === 7) answers[2] = 'NA'
    return [i % 2 === 0 ? 'north' : 'south', ...answers].join(',')
  })
  return [`house,${indicators.join(',')}`, ...rows].join('\n') + '\n'
}

export const noisePlan = `study: Evening noise
data:
  file: noise.csv
  indicators: [hum, rattle, thud, echo, whistle, hiss]
  group: house
candidates:
  Two noises:
    factors:
      Low: [hum, rattle, thud]
      High: [echo, whistle, hiss]
  Apart:
    from: Two noises
    change:
      - fix: { factor covariance: [Low, High] }
        at: 0
  One noise:
    factors: { Noise: [hum, rattle, thud, echo, whistle, hiss] }
ladders:
  Structure: [Two noises, Apart]
rules:
  alpha: 0.05
`

/** A fresh folder holding noise.csv and plan.yaml. */
export function noiseFolder(): string {
  const folder = mkdtempSync(join(tmpdir(), 'rungwise-bench-'))
  writeFileSync(join(folder, 'noise.csv'), noiseCsv())
  writeFileSync(join(folder, 'plan.yaml'), noisePlan)
  return folder
}

export async function readFile(path: string): Promise<Uint8Array> {
  try {
    return readFileSync(path)
  } catch {
    throw new InputError('There is no such file.', { where: path })
  }
}

export function startBench(folder: string, crew: Crew = inlineCrew): { workbench: Workbench; events: WorkEvent[] } {
  const workbench = createWorkbench({
    crew,
    clock: tickingClock(),
    samplePlanPath: join(folder, 'plan.yaml'),
    readFile,
    version: '0.1.0'
  })
  const events: WorkEvent[] = []
  workbench.onWork((event) => events.push(event))
  return { workbench, events }
}

/** The value of a call that must succeed. */
export async function done<N extends OperationName>(
  workbench: Workbench,
  name: N,
  input: Operations[N]['input']
): Promise<Operations[N]['result']> {
  const answer: Answer<Operations[N]['result']> = await workbench.call(name, input)
  if (!answer.ok) throw new Error(`${name}: ${JSON.stringify(answer.problem)}`)
  return answer.value
}

/** The problem of a call that must be refused, as one line. */
export async function refused(workbench: Workbench, name: OperationName, input: unknown): Promise<string> {
  const answer = await workbench.call(name, input)
  if (answer.ok) throw new Error(`${name} was not refused`)
  return [answer.problem.where, answer.problem.what, answer.problem.remedy].filter((part) => part !== null).join(' | ')
}

/** The inline crew, counting its fits and stopping before fit number `gate` until `open` is called or the work is aborted. */
export function gatedCrew(gate = Number.POSITIVE_INFINITY): {
  crew: Crew
  fits: () => number
  reached: Promise<void>
  open: () => void
} {
  const { promise: reached, resolve: reach } = Promise.withResolvers<void>()
  const { promise: opened, resolve: open } = Promise.withResolvers<void>()
  let count = 0
  const crew: Crew = {
    ...inlineCrew,
    fit: async (job, signal) => {
      if (count++ >= gate) {
        reach()
        await Promise.race([opened, new Promise<void>((stop) => signal?.addEventListener('abort', () => stop()))])
      }
      return inlineCrew.fit(job, signal)
    }
  }
  return { crew, fits: () => count, reached, open }
}
