import { mkdirSync, readdirSync, readFileSync, rmSync, symlinkSync, writeFileSync } from 'node:fs'
import { join } from 'node:path'
import fc from 'fast-check'
import { afterEach, beforeEach, describe, expect, it } from 'vitest'
import { parsePlan } from '../study/plan-file.ts'
import { candidateSchema, estimationSchema, type LadderPlan, rulesSchema } from '../study/study.ts'
import { inlineCrew } from '../workers/inline-crew.ts'
import type { StudyView } from './contract.ts'
import type { Workbench } from './index.ts'
import { done, gatedCrew, noiseFolder, refused, startBench } from './test-bench.ts'

let folder: string
let plan: { path: string }
let file: string

beforeEach(() => {
  folder = noiseFolder()
  plan = { path: join(folder, 'plan.yaml') }
  file = join(folder, 'noise.rungwise')
})
afterEach(() => rmSync(folder, { recursive: true, force: true }))

const crossed = candidateSchema.parse({
  name: 'Two noises, echo in both',
  from: 'Two noises',
  change: [{ do: 'free', cell: { part: 'loading', of: ['echo', 'Low'] } }]
})
const houses: LadderPlan = { name: 'Houses', invarianceOf: 'Two noises', across: 'house', through: 'scalar' }

const states = (view: StudyView) => Object.fromEntries(view.candidates.map(({ candidate, state }) => [candidate.name, state]))
const codes = (view: StudyView) => view.trail.entries.map((entry) => entry.what)

describe('opening', () => {
  it('shows a plan as drafts with their counts, and nothing fitted', async () => {
    const { workbench } = startBench(folder)
    expect(await done(workbench, 'currentStudy', null)).toBeNull()
    const view = await done(workbench, 'openPlan', plan)
    expect(view).toMatchObject({ study: 'Evening noise', file: null, rulesOpen: true, decisions: [], trail: { intact: true } })
    expect(view.data).toMatchObject({ source: 'noise.csv', grouping: 'house', missing: 1 })
    expect(view.candidates.map(({ candidate, state, parameters, df }) => [candidate.name, state, parameters, df])).toEqual([
      ['Two noises', 'draft', 19, 8],
      ['Apart', 'draft', 18, 9],
      ['One noise', 'draft', 18, 9]
    ])
    expect(view.result.candidates).toEqual([])
    expect(codes(view)).toEqual([
      'study started',
      'data read',
      'candidate added',
      'candidate added',
      'candidate added',
      'ladder added'
    ])
    expect(await done(workbench, 'currentStudy', null)).toEqual(view)
    await workbench.close()
  })

  it('opens the sample from where it was told the sample is', async () => {
    const { workbench } = startBench(folder)
    expect((await done(workbench, 'openSample', null)).study).toBe('Evening noise')
    await workbench.close()
  })

  it('keeps the open study when another cannot be opened', async () => {
    const { workbench } = startBench(folder)
    const view = await done(workbench, 'openPlan', plan)
    writeFileSync(join(folder, 'bad.yaml'), 'study: Nothing\n')
    expect(await refused(workbench, 'openPlan', { path: join(folder, 'bad.yaml') })).toMatch(/data/)
    expect(await refused(workbench, 'openPlan', { path: join(folder, 'none.yaml') })).toMatch(/There is no such file/)
    expect(await refused(workbench, 'openProject', { path: join(folder, 'noise.csv') })).toMatch(/not a Rungwise project file/)
    expect(await done(workbench, 'currentStudy', null)).toEqual(view)
    await workbench.close()
  })

  it('refuses a plan whose candidate makes no model, naming the candidate', async () => {
    const { workbench } = startBench(folder)
    writeFileSync(
      plan.path,
      readFileSync(plan.path, 'utf8').replace('factor covariance: [Low, High]', 'factor covariance: [Low, Hihg]')
    )
    expect(await refused(workbench, 'openPlan', plan)).toMatch(/Hihg/)
    await workbench.close()
  })

  it('starts a study on a data file without candidates', async () => {
    const { workbench } = startBench(folder)
    const input = {
      study: 'Two ears',
      path: join(folder, 'noise.csv'),
      indicators: ['hum', 'rattle', 'thud'],
      group: null,
      missingCodes: ['NA'],
      estimation: estimationSchema.parse({}),
      rules: rulesSchema.parse({ alpha: 0.01 })
    }
    const view = await done(workbench, 'newStudy', input)
    expect(view).toMatchObject({ study: 'Two ears', candidates: [], ladders: [], rules: { alpha: 0.01 } })
    expect(await refused(workbench, 'newStudy', { ...input, indicators: ['hum', 'buzz'] })).toMatch(/buzz/)
    expect(await refused(workbench, 'newStudy', { ...input, estimation: { ...input.estimation, convention: 'wishart' } })).toMatch(
      /wishart/
    )
    await workbench.close()
  })
})

describe('fitting', () => {
  it('fits the drafts, tells of each, records each and how the ladder stands', async () => {
    const { workbench, events } = startBench(folder)
    await done(workbench, 'openPlan', plan)
    const view = await done(workbench, 'fitCandidates', { names: null })
    expect(states(view)).toEqual({ 'Two noises': 'fitted', Apart: 'fitted', 'One noise': 'fitted' })
    expect(view.rulesOpen).toBe(false)
    expect(view.result.ladders[0]?.steps[0]).toMatchObject({ relation: 'nested', proof: 'constraints' })
    expect(events[0]).toEqual({ kind: 'started', total: 3 })
    expect(events.filter((event) => event.kind === 'fitted').map((event) => event.done)).toEqual([1, 2, 3])
    expect(events.slice(4)).toEqual([{ kind: 'finished', cancelled: false }])
    expect(codes(view).slice(6)).toEqual([
      'candidate fitted',
      'candidate fitted',
      'candidate fitted',
      'relation settled',
      'ladder judged'
    ])
    expect(view.trail.entries.at(-2)?.sentence).toBe('“Apart” is nested in “Two noises”, as shown by their constraints.')
    await workbench.close()
  })

  it('fits only what was asked for, and nothing twice', async () => {
    const { crew, fits } = gatedCrew()
    const { workbench } = startBench(folder, crew)
    await done(workbench, 'openPlan', plan)
    const first = await done(workbench, 'fitCandidates', { names: ['Apart'] })
    expect(states(first)).toEqual({ 'Two noises': 'draft', Apart: 'fitted', 'One noise': 'draft' })
    await done(workbench, 'fitCandidates', { names: null })
    await done(workbench, 'fitCandidates', { names: null })
    expect(fits()).toBe(3)
    expect(await refused(workbench, 'fitCandidates', { names: ['Aprat'] })).toBe(
      'names | There is no candidate "Aprat". | Did you mean "Apart"?'
    )
    await workbench.close()
  })

  it('keeps what was finished when it is stopped, and takes the work up again', async () => {
    const { crew, fits, reached } = gatedCrew(2)
    const { workbench, events } = startBench(folder, crew)
    await done(workbench, 'openPlan', plan)
    const work = done(workbench, 'fitCandidates', { names: null })
    await reached
    expect(await refused(workbench, 'fitCandidates', { names: null })).toMatch(/Candidates are being fitted/)
    expect(await refused(workbench, 'openPlan', plan)).toMatch(/Candidates are being fitted/)
    expect(await refused(workbench, 'saveProject', { path: file })).toMatch(/Candidates are being fitted/)
    await done(workbench, 'cancelWork', null)
    const view = await work
    expect(Object.values(states(view)).filter((state) => state === 'fitted')).toHaveLength(2)
    expect(events.at(-1)).toEqual({ kind: 'finished', cancelled: true })
    expect(events.filter((event) => event.kind === 'finished')).toHaveLength(1)
    expect(codes(view)).toContain('fitting stopped')
    expect(fits()).toBe(3)
    await workbench.close()
  })

  it('closes in the middle of the work with everything finished in the file', async () => {
    const { crew, reached } = gatedCrew(1)
    const { workbench } = startBench(folder, crew)
    await done(workbench, 'openPlan', plan)
    await done(workbench, 'saveProject', { path: file })
    const work = workbench.call('fitCandidates', { names: null })
    await reached
    await workbench.close()
    expect((await work).ok).toBe(true)
    expect(readdirSync(folder).sort()).toEqual(['noise.csv', 'noise.rungwise', 'plan.yaml'])
    const other = startBench(folder).workbench
    const view = await done(other, 'openProject', { path: file })
    expect(view.result.candidates).toHaveLength(1)
    expect(codes(view).at(-1)).toBe('fitting stopped')
    await other.close()
  })

  it('answers calls that come while another study is being opened', async () => {
    const { workbench } = startBench(folder)
    await done(workbench, 'openPlan', plan)
    await done(workbench, 'fitCandidates', { names: null })
    const answers = await Promise.all([
      done(workbench, 'addLadder', { ladder: { name: 'Other', rungs: ['Two noises', 'One noise'] } }),
      done(workbench, 'openPlan', plan),
      done(workbench, 'currentStudy', null),
      done(workbench, 'saveProject', { path: file }),
      done(workbench, 'openPlan', plan)
    ])
    expect(answers.map((view) => view?.ladders.length)).toEqual([2, 1, 2, 2, 1])
    await workbench.close()
    expect(readdirSync(folder).sort()).toEqual(['noise.csv', 'noise.rungwise', 'plan.yaml'])
  })

  it('lets a fault of the crew through as a fault, with what was finished kept', async () => {
    let count = 0
    const faulty = {
      ...inlineCrew,
      fit: async (...job: Parameters<typeof inlineCrew.fit>) =>
        count++ === 1 ? Promise.reject(new Error('a wire is loose')) : inlineCrew.fit(...job)
    }
    const { workbench, events } = startBench(folder, faulty)
    await done(workbench, 'openPlan', plan)
    await expect(workbench.call('fitCandidates', { names: null })).rejects.toThrow('a wire is loose')
    expect(events.at(-1)?.kind).toBe('finished')
    const view = await done(workbench, 'currentStudy', null)
    expect(view?.candidates.map(({ state }) => state)).toContain('fitted')
    await workbench.close()
  })

  it('records a model that cannot be estimated like any other', async () => {
    const { workbench } = startBench(folder)
    await done(workbench, 'openPlan', plan)
    const tangled = candidateSchema.parse({
      name: 'Tangled',
      from: 'Two noises',
      change: ['rattle', 'thud', 'echo', 'whistle', 'hiss'].flatMap((name) => [
        { do: 'free', cell: { part: 'loading', of: [name, name === 'rattle' || name === 'thud' ? 'High' : 'Low'] } },
        { do: 'free', cell: { part: 'residual covariance', of: ['hum', name] } }
      ])
    })
    await done(workbench, 'addCandidate', { candidate: tangled })
    const view = await done(workbench, 'fitCandidates', { names: ['Tangled'] })
    expect(view.candidates.at(-1)?.state).not.toBe('fitted')
    expect(view.candidates.at(-1)?.state).not.toBe('draft')
    expect(view.trail.entries.find((entry) => entry.what === 'candidate fitted')?.sentence).toMatch(
      /“Tangled” was tried and has no usable solution/
    )
    await workbench.close()
  })
})

describe('changing the study', () => {
  it('calls what comes after the first fit "added after results" and keeps the rules', async () => {
    const { workbench } = startBench(folder)
    await done(workbench, 'openPlan', plan)
    await done(workbench, 'changeRules', { rules: rulesSchema.parse({ alpha: 0.01 }) })
    await done(workbench, 'fitCandidates', { names: ['Apart'] })
    await done(workbench, 'addCandidate', { candidate: crossed })
    const view = await done(workbench, 'addLadder', { ladder: houses })
    const origins = Object.fromEntries(
      view.candidates.map(({ candidate, origin, generated }) => [candidate.name, `${origin}, ${generated}`])
    )
    expect(origins).toMatchObject({ 'Two noises': 'planned, false', [crossed.name]: 'added after results, false' })
    const rungs = view.candidates.filter(({ generated }) => generated)
    expect(rungs).toHaveLength(3)
    expect(rungs.every(({ origin, state }) => origin === 'added after results' && state === 'draft')).toBe(true)
    expect(await refused(workbench, 'changeRules', { rules: rulesSchema.parse({}) })).toMatch(
      /The rules stand since the first candidate was fitted/
    )
    expect((await done(workbench, 'currentStudy', null))?.rules.alpha).toBe(0.01)
    await workbench.close()
  })

  it('fits the rungs that an invariance ladder makes', async () => {
    const { workbench } = startBench(folder)
    await done(workbench, 'openPlan', plan)
    const planned = await done(workbench, 'addLadder', { ladder: houses })
    const view = await done(workbench, 'fitCandidates', { names: null })
    const ladder = view.result.ladders.find(({ name }) => name === 'Houses')
    expect(ladder?.rungs).toEqual(planned.candidates.filter(({ generated }) => generated).map(({ candidate }) => candidate.name))
    expect(ladder?.steps.map(({ relation }) => relation)).toEqual(['nested', 'nested'])
    await workbench.close()
  })

  it('shows while typing what a candidate would be, without keeping it', async () => {
    const { workbench } = startBench(folder)
    const view = await done(workbench, 'openPlan', plan)
    const check = await done(workbench, 'checkCandidate', { candidate: crossed })
    expect(check).toMatchObject({ parameters: 20, df: 7, identified: true, unidentified: [] })
    expect(check.sentence).toMatch(/echo/)
    const cells = check.cells[0]
    expect(cells?.loadings[0]).toEqual([1, null])
    expect(typeof cells?.loadings[3]?.[0]).toBe('string')
    const loose = candidateSchema.parse({ name: 'Loose', factors: [{ name: 'Pair', measures: ['hum', 'rattle'] }] })
    const alone = await done(workbench, 'checkCandidate', { candidate: loose })
    expect(alone.identified).toBe(false)
    expect(alone.unidentified.length).toBeGreaterThan(0)
    expect(await done(workbench, 'currentStudy', null)).toEqual(view)
    await workbench.close()
  })

  it('records a decision on a rung of a ladder, and the next one beside it', async () => {
    const { workbench } = startBench(folder)
    await done(workbench, 'openPlan', plan)
    await done(workbench, 'fitCandidates', { names: null })
    await done(workbench, 'recordDecision', { ladder: 'Structure', rung: 'Apart', reason: 'Simple' })
    const view = await done(workbench, 'recordDecision', { ladder: 'Structure', rung: 'Two noises', reason: 'They go together.' })
    expect(view.decisions.map(({ rung, reason }) => [rung, reason])).toEqual([
      ['Apart', 'Simple'],
      ['Two noises', 'They go together.']
    ])
    expect(view.trail.entries.at(-1)?.sentence).toBe(
      'On the ladder “Structure” it was decided to stand on “Two noises”. The reason given: They go together.'
    )
    await workbench.close()
  })
})

describe('bad input', () => {
  it.each([
    ['addCandidate', { candidate: { ...crossed, name: 'Apart' } }, /There is a candidate "Apart" already/],
    ['addCandidate', { candidate: { ...crossed, from: 'Apatr' } }, /Apatr/],
    ['addCandidate', { candidate: { ...crossed, name: '  ' } }, /candidate\.name/],
    ['addCandidate', { candidate: { ...crossed, colour: 'blue' } }, /colour/],
    [
      'addCandidate',
      { candidate: { ...crossed, change: [{ do: 'free', cell: { part: 'loading', of: ['buzz', 'Low'] } }] } },
      /buzz/
    ],
    ['addCandidate', null, /expected object/],
    ['addLadder', { ladder: { name: 'Structure', rungs: ['Apart'] } }, /There is a ladder "Structure" already/],
    ['addLadder', { ladder: { name: 'New', rungs: ['Nobody'] } }, /Nobody/],
    ['addLadder', { ladder: { ...houses, across: 'street' } }, /street/],
    ['changeRules', { rules: { alpha: 2 } }, /rules\.alpha/],
    ['changeRules', { rules: { decideBy: 'change in fit' } }, /threshold/],
    ['recordDecision', { ladder: 'Nowhere', rung: 'Apart', reason: 'x' }, /There is no ladder "Nowhere"/],
    [
      'recordDecision',
      { ladder: 'Structure', rung: 'One noise', reason: 'x' },
      /has no rung "One noise"\. \| Its rungs are "Two noises", "Apart"/
    ],
    ['recordDecision', { ladder: 'Structure', rung: 'Apart', reason: ' ' }, /reason/],
    ['checkCandidate', { candidate: { ...crossed, factors: [{ name: 'F', measures: ['buzz'] }] } }, /buzz/],
    ['fitCandidates', { names: 'all' }, /names/],
    ['exportPlan', { path: '/tmp/noise.csv' }, /ends in \.yaml or \.yml/],
    ['exportResult', { path: 'result.txt' }, /ends in \.json/],
    ['exportResult', { path: 'result.json' }, /Nothing is fitted yet/],
    ['saveProject', { path: 'noise.csv' }, /ends in \.rungwise/],
    ['listFolder', { path: '/no/such/folder' }, /There is no such folder/],
    ['openSample', {}, /expected null/]
  ] as const)('to %s is answered with the problem and changes nothing: %j', async (name, input, message) => {
    const { workbench } = startBench(folder)
    const view = await done(workbench, 'openPlan', plan)
    expect(await refused(workbench, name, input)).toMatch(message)
    expect(await done(workbench, 'currentStudy', null)).toEqual(view)
    expect(readdirSync(folder).sort()).toEqual(['noise.csv', 'plan.yaml'])
    await workbench.close()
  })

  it('needs an open study for what is done to one', async () => {
    const { workbench } = startBench(folder)
    for (const [name, input] of [
      ['addCandidate', { candidate: crossed }],
      ['fitCandidates', { names: null }],
      ['saveProject', { path: file }]
    ] as const) {
      expect(await refused(workbench, name, input)).toMatch(/No study is open/)
    }
    await workbench.close()
  })

  it('does not take an unknown name for bad input', async () => {
    const { workbench } = startBench(folder)
    await expect(workbench.call('toString', null)).rejects.toThrow('there is no operation "toString"')
    await workbench.close()
  })
})

describe('files', () => {
  it('lists folders first, then what can be opened, each with its kind', async () => {
    for (const name of ['zebra', 'Alps', '.hidden']) mkdirSync(join(folder, name))
    for (const name of ['b.csv', 'A.TSV', 'x.rungwise', 'notes.txt', 'item 10.yml', 'item 9.yml'])
      writeFileSync(join(folder, name), '')
    symlinkSync(join(folder, 'gone'), join(folder, 'broken.csv'))
    const { workbench } = startBench(folder)
    const listing = await done(workbench, 'listFolder', { path: folder })
    expect(listing.entries.map(({ name, kind }) => `${name}: ${kind}`)).toEqual([
      'Alps: folder',
      'zebra: folder',
      'A.TSV: data',
      'b.csv: data',
      'item 9.yml: plan',
      'item 10.yml: plan',
      'noise.csv: data',
      'plan.yaml: plan',
      'x.rungwise: project'
    ])
    expect(listing.path).toBe(folder)
    expect((await done(workbench, 'listFolder', { path: '/' })).parent).toBeNull()
    expect((await done(workbench, 'listFolder', { path: null })).path).not.toBe('')
    await workbench.close()
  })

  it('gives a first look at a data file', async () => {
    const { workbench } = startBench(folder)
    const preview = await done(workbench, 'previewData', { path: join(folder, 'noise.csv'), missingCodes: ['NA'] })
    expect(preview).toMatchObject({ path: join(folder, 'noise.csv'), rows: 120 })
    expect(preview.columns.map(({ name, kind, missing }) => [name, kind, missing]).slice(0, 4)).toEqual([
      ['house', 'text', 0],
      ['hum', 'numeric', 0],
      ['rattle', 'numeric', 0],
      ['thud', 'numeric', 1]
    ])
    await workbench.close()
  })

  it('writes a plan that opens as the same study, from another folder too', async () => {
    const { workbench } = startBench(folder)
    const view = await done(workbench, 'openPlan', plan)
    mkdirSync(join(folder, 'elsewhere'))
    const target = join(folder, 'elsewhere', 'copy.yaml')
    expect(await done(workbench, 'exportPlan', { path: target })).toEqual({ path: target })
    expect(parsePlan(readFileSync(target, 'utf8'), target).data).toMatchObject({ file: '../noise.csv' })
    const again = await done(workbench, 'openPlan', { path: target })
    expect({ ...again, trail: null, data: { ...again.data, source: null } }).toEqual({
      ...view,
      trail: null,
      data: { ...view.data, source: null }
    })
    await workbench.close()
  })

  it('writes the result that the window shows', async () => {
    const { workbench } = startBench(folder)
    await done(workbench, 'openPlan', plan)
    const view = await done(workbench, 'fitCandidates', { names: null })
    const target = join(folder, 'result.json')
    await done(workbench, 'exportResult', { path: target })
    expect(JSON.parse(readFileSync(target, 'utf8'))).toEqual(JSON.parse(JSON.stringify(view.result)))
    expect(codes((await done(workbench, 'currentStudy', null))!).at(-1)).toBe('result exported')
    await workbench.close()
  })

  it('saves, goes on in the saved file, and saves there by itself', async () => {
    const { workbench } = startBench(folder)
    await done(workbench, 'openPlan', plan)
    const saved = await done(workbench, 'saveProject', { path: file })
    expect(saved.file).toBe(file)
    expect(codes(saved).at(-1)).toBe('project saved')
    expect(await done(workbench, 'saveProject', { path: file })).toEqual(saved)
    const later = await done(workbench, 'addCandidate', { candidate: crossed })
    await workbench.close()
    const other = startBench(folder).workbench
    expect(await done(other, 'openProject', { path: file })).toEqual(later)
    await other.close()
  })
})

/** Things a user may do, in any order; some are refused in some orders, which is part of the game. */
const moves: ((workbench: Workbench) => Promise<unknown>)[] = [
  (workbench) => workbench.call('fitCandidates', { names: null }),
  (workbench) => workbench.call('fitCandidates', { names: ['Apart', 'Two noises'] }),
  (workbench) => workbench.call('addCandidate', { candidate: crossed }),
  (workbench) => workbench.call('addLadder', { ladder: houses }),
  (workbench) => workbench.call('addLadder', { ladder: { name: 'Odd', rungs: ['One noise', 'Apart', 'Two noises'] } }),
  (workbench) => workbench.call('changeRules', { rules: rulesSchema.parse({ decideBy: 'both', changeInFit: { cfi: -0.01 } }) }),
  (workbench) => workbench.call('recordDecision', { ladder: 'Structure', rung: 'Apart', reason: 'Why not?' })
]

it('shows a saved and re-opened study exactly as it was, whatever was done to it before', async () => {
  let count = 0
  await fc.assert(
    fc.asyncProperty(fc.array(fc.integer({ min: 0, max: moves.length - 1 }), { maxLength: 6 }), async (chosen) => {
      const target = join(folder, `study ${count++}.rungwise`)
      const one = startBench(folder).workbench
      await done(one, 'openPlan', plan)
      for (const move of chosen) await moves[move]!(one)
      const saved = await done(one, 'saveProject', { path: target })
      await one.close()
      const two = startBench(folder).workbench
      const opened = await done(two, 'openProject', { path: target })
      await two.close()
      expect(opened).toEqual(saved)
      expect(opened.trail.intact).toBe(true)
    }),
    { numRuns: 15, seed: 7 }
  )
})
