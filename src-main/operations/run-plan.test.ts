import { createHash } from 'node:crypto'
import { existsSync, readdirSync, readFileSync, rmSync, writeFileSync } from 'node:fs'
import { join } from 'node:path'
import { afterEach, beforeEach, describe, expect, it } from 'vitest'
import { openProjectFile } from '../project/project.ts'
import { tickingClock } from '../project/test-study.ts'
import { InputError } from '../study/input-error.ts'
import { inlineCrew } from '../workers/inline-crew.ts'
import type { Crew } from '../workers/jobs.ts'
import { type PlanToRun, runPlan } from './run-plan.ts'
import { done, gatedCrew, noiseFolder, noisePlan, readFile, startBench } from './test-bench.ts'

let folder: string
let project: string
const clock = tickingClock()

beforeEach(() => {
  folder = noiseFolder()
  project = join(folder, 'noise.rungwise')
})
afterEach(() => rmSync(folder, { recursive: true, force: true }))

function run(more: Partial<PlanToRun> = {}) {
  return runPlan({
    planPath: join(folder, 'plan.yaml'),
    projectPath: project,
    readFile,
    crew: inlineCrew,
    version: '0.1.0',
    clock,
    ...more
  })
}

function writePlan(text: string): void {
  writeFileSync(join(folder, 'plan.yaml'), text)
}

function trail(): string[] {
  const opened = openProjectFile(project, clock)
  const rows = opened.trail().map((row) => `${row.what}: ${row.sentence}`)
  expect(opened.trailBreak).toBeNull()
  opened.close()
  return rows
}

const digest = (path: string) => createHash('sha256').update(readFileSync(path)).digest('hex')

/** The run must be refused, with everything in the folder as it was. */
async function expectRefused(message: RegExp, more: Partial<PlanToRun> = {}): Promise<void> {
  const before = readdirSync(folder).map((name) => [name, digest(join(folder, name))])
  const error = await run(more).catch((thrown: unknown) => thrown)
  expect(error).toBeInstanceOf(InputError)
  expect((error as InputError).message).toMatch(message)
  expect(readdirSync(folder).map((name) => [name, digest(join(folder, name))])).toEqual(before)
}

/** A crew that must not be asked to fit. */
const idle: Crew = { ...inlineCrew, fit: () => Promise.reject(new Error('a fit was asked for')) }

const withThird = noisePlan.replace(
  'ladders:',
  '  Thud apart:\n    from: Two noises\n    change:\n      - free: { residual covariance: [hum, thud] }\nladders:'
)

describe('running a plan', () => {
  it('gives the result and keeps nothing when no project is named', async () => {
    const { result, plan, data } = await run({ projectPath: null })
    expect(result.study).toBe('Evening noise')
    expect(result.candidates.map(({ name, state, origin }) => [name, state, origin])).toEqual([
      ['Two noises', 'fitted', 'planned'],
      ['Apart', 'fitted', 'planned'],
      ['One noise', 'fitted', 'planned']
    ])
    expect(plan.candidates).toHaveLength(3)
    expect(data.digest).toBe(result.data.digest)
    expect(readdirSync(folder).sort()).toEqual(['noise.csv', 'plan.yaml'])
  })

  it('records data, candidates, fits and steps in a project file that the window opens with the same numbers', async () => {
    const { result } = await run()
    expect(trail().map((row) => row.split(':')[0])).toEqual([
      'study started',
      'data read',
      'candidate added',
      'candidate added',
      'candidate added',
      'ladder added',
      'candidate fitted',
      'candidate fitted',
      'candidate fitted',
      'relation settled',
      'ladder judged'
    ])
    const { workbench } = startBench(folder, idle)
    const view = await done(workbench, 'openProject', { path: project })
    expect(JSON.parse(JSON.stringify(view.result))).toEqual(JSON.parse(JSON.stringify(result)))
    await workbench.close()
  })

  it('fits nothing again and writes nothing when the same plan is run again', async () => {
    const first = await run()
    const rows = trail()
    const second = await run({ crew: idle })
    expect(JSON.stringify(second.result)).toBe(JSON.stringify(first.result))
    expect(trail()).toEqual(rows)
  })

  it('fits again under another version of the program, and keeps both', async () => {
    await run()
    await run({ version: '0.2.0' })
    const opened = openProjectFile(project, clock)
    expect(opened.fits().size).toBe(6)
    opened.close()
  })

  it('calls a candidate that a changed plan brings "added after results", and says so in the trail', async () => {
    await run()
    writePlan(withThird)
    const { crew, fits } = gatedCrew()
    const { result } = await run({ crew })
    expect(fits()).toBe(1)
    expect(result.candidates.map(({ name, origin }) => [name, origin]).at(-1)).toEqual(['Thud apart', 'added after results'])
    expect(trail()).toContain('candidate added: The candidate “Thud apart” was added after results had been seen.')
  })

  it('prints what the plan names and keeps what it named before', async () => {
    writePlan(withThird)
    await run()
    writePlan(noisePlan)
    const { result } = await run({ crew: idle })
    expect(result.candidates.map(({ name }) => name)).toEqual(['Two noises', 'Apart', 'One noise'])
    const { workbench } = startBench(folder, idle)
    const view = await done(workbench, 'openProject', { path: project })
    expect(view.candidates).toHaveLength(4)
    await workbench.close()
  })

  it('takes a changed plan as the plan while nothing was fitted', async () => {
    const stopped = new AbortController()
    stopped.abort()
    await expect(run({ signal: stopped.signal })).rejects.toThrow()
    writePlan(withThird.replace('alpha: 0.05', 'alpha: 0.01'))
    const { result } = await run()
    expect(result.candidates.every(({ origin }) => origin === 'planned')).toBe(true)
    expect(trail().filter((row) => row.startsWith('plan changed'))).toHaveLength(1)
  })

  it('keeps finished fits when it is interrupted, and goes on from there', async () => {
    const { crew, reached } = gatedCrew(2)
    const stop = new AbortController()
    const running = run({ crew, signal: stop.signal })
    await reached
    stop.abort()
    await expect(running).rejects.toThrow()
    expect(trail().at(-1)).toBe('fitting stopped: Fitting was stopped before all candidates were done; what was finished is kept.')
    const rest = gatedCrew()
    await run({ crew: rest.crew })
    expect(rest.fits()).toBe(1)
  })
})

describe('a plan that cannot be run', () => {
  it.each([
    ['an unknown key', noisePlan.replace('rules:', 'rulse:'), /rulse/],
    ['a missing data file', noisePlan.replace('noise.csv', 'silence.csv'), /silence\.csv/],
    ['an unknown indicator', noisePlan.replace('hiss]\n  group', 'buzz]\n  group'), /buzz|hiss/],
    ['a cell that no model has', noisePlan.replace('factor covariance: [Low, High]', 'loading: [hum, Higher]'), /Higher/],
    ['not text', '\u0000', /./]
  ])('leaves no project file: %s', async (_case, text, message) => {
    writePlan(text)
    await expectRefused(message)
    expect(existsSync(project)).toBe(false)
  })

  it('leaves a project of another study as it was', async () => {
    await run()
    writePlan(noisePlan.replace('study: Evening noise', 'study: Morning noise'))
    await expectRefused(/This project file holds another study, "Evening noise"/)
  })

  it.each([
    ['its rules are not those', noisePlan.replace('alpha: 0.05', 'alpha: 0.01')],
    ['its data are not those', noisePlan.replace('  group: house\n', '')]
  ])('leaves a fitted study as it was when %s of the plan', async (what, text) => {
    await run()
    writePlan(text)
    await expectRefused(new RegExp(`This study was already fitted and ${what} of the plan`))
  })

  it('leaves a fitted study as it was when its estimation is not the same', async () => {
    const published = (convention: string) => `study: Published
data:
  indicators: [a, b, c]
  divisor: n-1
  summary:
    - n: 200
      covariance: [[2], [1, 2], [0.9, 1.1, 2]]
estimation:
  convention: ${convention}
candidates:
  One:
    factors: { F: [a, b, c] }
`
    writePlan(published('normal'))
    await run()
    writePlan(published('wishart'))
    await expectRefused(/This study was already fitted and its estimation is not that of the plan/)
  })

  it('does not let a changed candidate take the name of a fitted one', async () => {
    await run()
    writePlan(noisePlan.replace('at: 0', 'at: 0.1'))
    await expectRefused(/The candidate "Apart" of the plan is not the one that was recorded/)
  })

  it('leaves a file alone that is no project', async () => {
    writeFileSync(project, 'my notes')
    await expectRefused(/This is not a Rungwise project file/)
  })

  it('says so when the folder of the project is not there', async () => {
    await expectRefused(/There is no such folder/, { projectPath: join(folder, 'nowhere', 'noise.rungwise') })
  })
})
