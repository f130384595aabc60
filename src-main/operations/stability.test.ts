import { existsSync, mkdtempSync, writeFileSync } from 'node:fs'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { afterAll, beforeAll, describe, expect, test } from 'vitest'
import { tickingClock } from '../project/test-study.ts'
import { resultJson } from '../reporting/result-json.ts'
import { seededGenerator } from '../statistics/distributions/generator.ts'
import { inlineCrew } from '../workers/inline-crew.ts'
import type { Crew } from '../workers/jobs.ts'
import type { StabilityResult, WorkEvent } from './contract.ts'
import type { Workbench } from './index.ts'
import { runPlan } from './run-plan.ts'
import { stepSentence } from './stability-words.ts'
import { done, gatedCrew, noiseFolder, readFile, refused, startBench } from './test-bench.ts'

/** The noise study with one factor on the ladder too, and any lines put in place of its rules. */
function noiseBench(rules = 'rules: { alpha: 0.05 }', crew: Crew = inlineCrew): { workbench: Workbench; events: WorkEvent[] } {
  const folder = noiseFolder()
  writeFileSync(
    join(folder, 'plan.yaml'),
    `study: Evening noise
data: { file: noise.csv, indicators: [hum, rattle, thud, echo, whistle, hiss], group: house }
candidates:
  Two noises: { factors: { Low: [hum, rattle, thud], High: [echo, whistle, hiss] } }
  Apart:
    from: Two noises
    change: [{ fix: { factor covariance: [Low, High] }, at: 0 }]
  One noise: { factors: { Noise: [hum, rattle, thud, echo, whistle, hiss] } }
ladders:
  Structure: [Two noises, Apart]
  Fewer: [Two noises, One noise]
  Houses: { invariance of: Two noises, across: house, through: strict }
${rules}
`
  )
  return startBench(folder, crew)
}

const input = { ladder: 'Structure', resamples: 60, seed: 7 }

async function fittedBench(rules?: string, crew?: Crew) {
  const bench = noiseBench(rules, crew)
  await done(bench.workbench, 'openSample', null)
  await done(bench.workbench, 'fitCandidates', { names: null })
  return bench
}

describe('the stability of a ladder', () => {
  let bench: Awaited<ReturnType<typeof fittedBench>>
  let result: StabilityResult
  beforeAll(async () => {
    bench = await fittedBench()
    bench.events.length = 0
    result = await done(bench.workbench, 'stability', input)
  })
  afterAll(() => bench.workbench.close())

  test('counts every resample once, for every step and for the rung to stand on', () => {
    expect(result).toMatchObject({ ladder: 'Structure', asked: 60, resamples: 60, seed: 7, incomplete: 0, nowhere: 0 })
    for (const { counts } of result.steps) expect(Object.values(counts).reduce((a, b) => a + b)).toBe(60)
    expect(result.rungs.reduce((sum, rung) => sum + rung.stands, 0)).toBe(60)
    expect(result.rungs.map((rung) => rung.rung)).toEqual(['Two noises', 'Apart'])
  })

  test('finds correlated factors apart in nearly every resample, and says so in words', () => {
    const [step] = result.steps
    expect(step!.verdict).toBe('does not hold')
    expect(step!.share).toBeLessThan(0.2)
    expect(result.rungs[0]!.standsInData).toBe(true)
    // Twice a chi-square on 1 df stays below 3.84 with the probability that a chi-square stays below 1.92.
    expect(step!.expectedWhenExact).toBeCloseTo(0.8342, 3)
    expect(step!.sentence).toMatch(
      /^The step from Two noises to Apart held in [\d.]+% of 60 resamples, and did not hold in [\d.]+%; in the data themselves it does not hold\. A step that is exactly true would hold in about 83% of such resamples; with the misfit estimated from these data, it would hold in (about \d+%|less than 1%) of new samples of this size\.$/
    )
    expect(step!.expectedInNewSamples!).toBeLessThan(step!.share + 0.1)
    expect(result.rungs[0]!.sentence).toMatch(
      /^Two noises was the rung to stand on in [\d.]+% of 60 resamples, as it is in the data themselves\.$/
    )
  })

  test('tells progress until all are done', () => {
    expect(bench.events[0]).toEqual({ kind: 'started', total: 60 })
    expect(bench.events.at(-1)).toEqual({ kind: 'finished', cancelled: false })
    const steps = bench.events.filter((event) => event.kind === 'resampled')
    expect(steps.length).toBeGreaterThan(1)
    expect(steps.at(-1)).toMatchObject({ ladder: 'Structure', done: 60, total: 60 })
  })

  test('is the same for the same seed, and another for another', async () => {
    expect(await done(bench.workbench, 'stability', input)).toEqual(result)
    expect((await done(bench.workbench, 'stability', { ...input, seed: 8 })).steps).not.toEqual(result.steps)
  })

  test('writes itself into the trail with its seed', async () => {
    const { trail } = (await done(bench.workbench, 'currentStudy', null))!
    const entry = trail.entries.find(({ what }) => what === 'ladder resampled')!
    expect(entry.sentence).toMatch(
      /^The verdicts of the ladder “Structure” were tried on 60 resamples of the cases \(seed 7\): the rung to stand on was “Two noises” in/
    )
    expect(trail.intact).toBe(true)
  })

  test('goes through invariance ladders within their groups', async () => {
    const houses = await done(bench.workbench, 'stability', { ladder: 'Houses', resamples: 20, seed: 1 })
    expect(houses.steps).toHaveLength(3)
    expect(houses.rungs.reduce((sum, rung) => sum + rung.stands, 0) + houses.nowhere).toBe(20)
  })

  test('refers one factor in place of two to a mixture on every resample', async () => {
    const fewer = await done(bench.workbench, 'stability', { ladder: 'Fewer', resamples: 10, seed: 1 })
    expect(fewer.steps[0]).toMatchObject({ verdict: 'does not hold', expectedWhenExact: null })
    expect(fewer.steps[0]!.counts['no test']).toBe(0)
  })
})

describe('a plan run with resampling', () => {
  const run = (folder: string, crew: Crew) => ({
    planPath: join(folder, 'plan.yaml'),
    projectPath: join(folder, 'study.rungwise'),
    readFile,
    crew,
    version: '0.1.0',
    clock: tickingClock(),
    resampling: { resamples: 15, seed: 3 }
  })

  test('tells the stability of every ladder with its result', async () => {
    const { result } = await runPlan(run(noiseFolder(), inlineCrew))
    expect(result.stability!.map(({ ladder, resamples, seed }) => ({ ladder, resamples, seed }))).toEqual([
      { ladder: 'Structure', resamples: 15, seed: 3 }
    ])
    expect(resultJson(result)).toContain('"stability": [')
  })

  test('is refused before anything is fitted or written where there are no cases', async () => {
    const folder = noiseFolder()
    writeFileSync(
      join(folder, 'plan.yaml'),
      `study: Published
data: { indicators: [a, b, c], divisor: n, summary: [{ n: 100, covariance: [[1], [0.5, 1], [0.5, 0.5, 1]] }] }
candidates: { One: { factors: { F: [a, b, c] } } }
`
    )
    const { crew, fits } = gatedCrew()
    await expect(runPlan(run(folder, crew))).rejects.toThrow('Published covariances cannot be resampled')
    expect(fits()).toBe(0)
    expect(existsSync(join(folder, 'study.rungwise'))).toBe(false)
  })
})

describe('resampling under other rules and statistics', () => {
  test.each([
    ['change in fit', 'rules: { change in fit: { cfi: -0.01, rmsea: 0.015 }, decide by: change in fit }'],
    ['both', 'rules: { change in fit: Chen 2007, decide by: both }'],
    ['a scaled statistic', 'estimation: { statistic: mean-scaled }'],
    ['the strictly positive form', 'estimation: { statistic: mean-scaled }\nrules: { scaled difference: strictly positive }'],
    ['full information', 'estimation: { missing: full information }'],
    ['a scaled statistic with missing answers', 'estimation: { missing: full information, statistic: mean-scaled }']
  ])('judges by %s', async (_name, rules) => {
    const { workbench } = await fittedBench(rules)
    const { steps, resamples, incomplete } = await done(workbench, 'stability', { ...input, resamples: 12 })
    expect({ resamples, incomplete }).toEqual({ resamples: 12, incomplete: 0 })
    expect(steps[0]!.counts['no test']).toBe(0)
    expect(steps[0]!.share).toBeLessThan(0.6)
    await workbench.close()
  })
})

describe('a resample that cannot be fitted', () => {
  test('is counted, and the step told as one that could not be judged', async () => {
    const folder = mkdtempSync(join(tmpdir(), 'rungwise-few-'))
    const generator = seededGenerator(3)
    // Six cases of three indicators: now and then a draw has too few different cases for a covariance matrix.
    const rows = Array.from({ length: 6 }, () => {
      const common = generator.normal()
      return Array.from({ length: 3 }, () => (common + generator.normal()).toFixed(3)).join(',')
    })
    writeFileSync(join(folder, 'few.csv'), ['a,b,c', ...rows, ''].join('\n'))
    writeFileSync(
      join(folder, 'plan.yaml'),
      `study: Few
data: { file: few.csv, indicators: [a, b, c] }
candidates:
  Own: { factors: { F: [a, b, c] } }
  Alike:
    from: Own
    change: [{ equal: { residual variance: [a, b, c] } }]
ladders:
  Up: [Own, Alike]
`
    )
    const { workbench } = startBench(folder)
    await done(workbench, 'openSample', null)
    await done(workbench, 'fitCandidates', { names: null })
    const result = await done(workbench, 'stability', { ladder: 'Up', resamples: 80, seed: 2 })
    expect(result.incomplete).toBeGreaterThan(0)
    expect(result.incomplete).toBeLessThan(60)
    expect(result.steps[0]!.counts['no test']).toBeGreaterThanOrEqual(result.incomplete)
    expect(result.steps[0]!.sentence).toMatch(/could not be judged in [\d.]+%/)
    expect(result.rungs[0]!.sentence).toMatch(/it had no solution in \d+ of them\.$/)
    expect(result.rungs.reduce((sum, rung) => sum + rung.stands, 0) + result.nowhere).toBe(80)
    await workbench.close()
  })
})

describe('resampling is refused or stopped', () => {
  test('where a rung was not fitted, the ladder is unknown or the number makes no sense', async () => {
    const { workbench } = noiseBench()
    await done(workbench, 'openSample', null)
    expect(await refused(workbench, 'stability', input)).toBe(
      'ladder | "Two noises" has not been fitted yet. | Fit the ladder first.'
    )
    expect(await refused(workbench, 'stability', { ...input, ladder: 'Structures' })).toContain('There is no ladder "Structures".')
    expect(await refused(workbench, 'stability', { ...input, resamples: 0 })).toContain('resamples')
    await workbench.close()
  })

  test('where there are published covariances only', async () => {
    const folder = mkdtempSync(join(tmpdir(), 'rungwise-summary-'))
    writeFileSync(
      join(folder, 'plan.yaml'),
      `study: Published
data:
  indicators: [a, b, c]
  divisor: n
  summary: [{ n: 100, covariance: [[1], [0.5, 1], [0.5, 0.5, 1]] }]
candidates:
  One: { factors: { F: [a, b, c] } }
ladders:
  Up: [One]
`
    )
    const { workbench } = startBench(folder)
    await done(workbench, 'openSample', null)
    expect(await refused(workbench, 'stability', { ...input, ladder: 'Up' })).toContain('Published covariances cannot be resampled')
    await workbench.close()
  })

  test('keeping what was done when it is stopped', async () => {
    let chunks = 0
    const crew: Crew = {
      ...inlineCrew,
      resample: async (job, signal) => {
        if (++chunks > 2) await new Promise<void>((stop) => signal?.addEventListener('abort', () => stop()))
        return inlineCrew.resample(job, signal)
      }
    }
    const { workbench, events } = await fittedBench(undefined, crew)
    const running = done(workbench, 'stability', { ...input, resamples: 5000 })
    while (!events.some((event) => event.kind === 'resampled')) await new Promise((later) => setTimeout(later, 5))
    await workbench.call('cancelWork', null)
    const result = await running
    expect(result.asked).toBe(5000)
    expect(result.resamples).toBeGreaterThan(0)
    expect(result.resamples).toBeLessThan(1000)
    expect(events.at(-1)).toEqual({ kind: 'finished', cancelled: true })
    const { trail } = (await done(workbench, 'currentStudy', null))!
    expect(trail.entries.at(-1)!.sentence).toContain(`${result.resamples} resamples of the cases (seed 7), of 5,000 asked for`)
    await workbench.close()
  })
})

test('a sentence names every verdict that came up, and rounds none of them to all or nothing', () => {
  const counts = { holds: 9997, 'does not hold': 1, 'criteria disagree': 1, 'no test': 1 }
  const step = { from: 'a', to: 'b', verdict: 'holds' as const, counts, expectedWhenExact: null, expectedInNewSamples: null }
  expect(stepSentence(step, 10_000)).toBe(
    'The step from a to b held in 99.9% of 10,000 resamples, did not hold in 0.1%, left the criteria of the rules in ' +
      'disagreement in 0.1%, and could not be judged in 0.1%; in the data themselves it holds.'
  )
})
