import { mkdtempSync, rmSync, writeFileSync } from 'node:fs'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { fileURLToPath } from 'node:url'
import { afterEach, beforeEach, describe, expect, it } from 'vitest'
import { seededGenerator } from '../statistics/distributions/generator.ts'
import { parsePlan } from '../study/plan-file.ts'
import { inlineCrew } from '../workers/inline-crew.ts'
import type { Crew } from '../workers/jobs.ts'
import type { StudyView } from './contract.ts'
import { done, gatedCrew, readFile, refused, startBench } from './test-bench.ts'

const sample = fileURLToPath(new URL('../../fixtures/sample/plan.yaml', import.meta.url))
const rung = { ladder: 'Across clinics', rung: 'Three factors, scalar' }
const one = 'Three factors, scalar but for coldness in Weir Lane'
const two = 'Three factors, scalar but for coldness and taps in Weir Lane'

let folder: string
beforeEach(() => {
  folder = mkdtempSync(join(tmpdir(), 'rungwise-release-'))
})
afterEach(() => rmSync(folder, { recursive: true, force: true }))

async function openSample(crew: Crew = inlineCrew) {
  const bench = startBench(folder, crew)
  await done(bench.workbench, 'openPlan', { path: sample })
  return bench
}

const originOf = (view: StudyView, name: string) => view.candidates.find(({ candidate }) => candidate.name === name)?.origin

describe('the search on the sample study', () => {
  it('lets go exactly the two intercepts that the generator made different at Weir Lane', async () => {
    const { workbench } = await openSample()
    const { search } = await done(workbench, 'releaseSearch', rung)
    expect(search.released.map(({ part, of, group }) => [part, of, group])).toEqual([
      ['intercept', ['coldness'], 'Weir Lane'],
      ['intercept', ['taps'], 'Weir Lane']
    ])
    expect(search.ended).toBe('the step holds')
    expect(search.rounds.map(({ candidate, verdict }) => [candidate, verdict])).toEqual([
      [one, 'does not hold'],
      [two, 'holds']
    ])
    // The directions and sizes that were drawn: taps + 0.55, coldness - 0.60, within sampling error.
    expect(search.released[0]!.change).toBeLessThan(-0.3)
    expect(search.released[1]!.change).toBeGreaterThan(0.3)
    expect(search.otherReference).toEqual({
      agrees: true,
      released: ['the intercept of coldness in Weir Lane', 'the intercept of taps in Weir Lane'],
      sentence: 'Repeated with bags, numbness and cooking as reference indicators, the search lets go of the same.'
    })
    expect(search.sentence).toMatch(
      /^The step from Three factors, metric to Three factors, scalar does not hold by the study's rules\. Two equalities across groups were let go, found by score tests after seeing the results: the intercept of coldness in Weir Lane and the intercept of taps in Weir Lane\. Without them the step holds\. The chi-square difference is 9\.83 on 10 df, p = \.456/
    )
    expect(search.rounds[0]!.sentence).toMatch(
      /^Of 27 equalities the one let go is the intercept of coldness in Weir Lane \(score test 44\.95 on 1 df, Holm p < \.001\)\. /
    )
    await workbench.close()
  })

  it('adds each release as a rung of its own after results, and a ladder that climbs on with the same let go', async () => {
    const { workbench, events } = await openSample()
    const { search, view } = await done(workbench, 'releaseSearch', rung)
    expect([originOf(view, one), originOf(view, two)]).toEqual(['added after results', 'added after results'])
    const partial = view.result.ladders.find(({ name }) => name === search.partialLadder)!
    expect(partial.name).toBe('Across clinics, partial scalar')
    expect(partial.rungs).toEqual(['Three factors, metric', two, one, 'Three factors, scalar'])
    expect(partial.standHere).toBe(two)
    expect(partial.steps.map(({ verdict, relation }) => [verdict, relation])).toEqual([
      ['holds', 'nested'],
      ['does not hold', 'nested'],
      ['does not hold', 'nested']
    ])
    const onward = view.result.ladders.find(({ name }) => name === search.onwardLadder)!
    const strict = 'Three factors, strict but for the intercepts of coldness and taps in Weir Lane'
    expect(onward.rungs).toEqual(['Three factors, configural', 'Three factors, metric', two, strict])
    expect(onward.standHere).toBe(strict)
    expect(view.candidates.find(({ candidate }) => candidate.name === two)!.candidate).toMatchObject({
      from: 'Three factors',
      equalAcrossGroups: ['loadings', 'intercepts'],
      except: [
        { cell: { part: 'intercept', of: ['coldness'] }, group: 'Weir Lane' },
        { cell: { part: 'intercept', of: ['taps'] }, group: 'Weir Lane' }
      ]
    })
    const told = view.trail.entries.map(({ what, sentence }) => `${what}: ${sentence}`)
    const order = [
      `The candidate “${one}” was added after`,
      `The candidate “${one}” was fitted`,
      `The candidate “${two}” was added after`
    ]
    const places = order.map((start) => told.findIndex((line) => line.includes(start)))
    expect(places).toEqual([...places].sort((a, b) => a - b))
    expect(places[0]).toBeGreaterThan(0)
    expect(told.find((line) => line.startsWith('releases searched: '))).toContain(search.sentence)
    expect(view.trail.intact).toBe(true)
    expect(events.filter(({ kind }) => kind === 'finished')).toEqual([{ kind: 'finished', cancelled: false }])
    await workbench.close()
  })

  it('finds the same again and adds nothing, and its candidates survive the plan file', async () => {
    const { workbench } = await openSample()
    const first = await done(workbench, 'releaseSearch', rung)
    const second = await done(workbench, 'releaseSearch', rung)
    expect(second.search).toEqual(first.search)
    expect(second.view.candidates).toEqual(first.view.candidates)
    expect(second.view.ladders).toEqual(first.view.ladders)
    const path = join(folder, 'again.yaml')
    await done(workbench, 'exportPlan', { path })
    const plan = parsePlan(new TextDecoder().decode(await readFile(path)), path)
    expect(plan.candidates.map(({ name }) => name)).toEqual(expect.arrayContaining([one, two]))
    expect(plan.ladders.map(({ name }) => name)).toContain('Across clinics, partial scalar')
    await workbench.close()
  })

  it('keeps what was found when it is stopped', async () => {
    // The two rungs, then the first partial one; the second one is never fitted.
    const { crew, reached } = gatedCrew(3)
    const { workbench } = await openSample(crew)
    const work = done(workbench, 'releaseSearch', rung)
    await reached
    await done(workbench, 'cancelWork', null)
    const { search, view } = await work
    expect(search).toMatchObject({ ended: 'stopped', otherReference: null, onwardLadder: null })
    expect(search.released.map(({ of }) => of[0])).toEqual(['coldness'])
    expect(search.sentence).toMatch(/The search was stopped before it ended\.$/)
    expect(view.result.ladders.find(({ name }) => name === search.partialLadder)!.rungs).toContain(one)
    expect(view.trail.entries.map(({ what }) => what)).toContain('fitting stopped')
    await workbench.close()
  })

  it.each([
    [
      { ladder: 'Across clinics', rung: 'Three factors, metric' },
      'rung | The step to Three factors, metric holds, so there is nothing to let go.'
    ],
    [{ ladder: 'Across clinics', rung: 'Three factors, configural' }, 'is the lowest rung of the ladder "Across clinics"'],
    [{ ladder: 'Across clinics', rung: 'One factor' }, 'The ladder "Across clinics" has no rung "One factor".'],
    [{ ladder: 'Across clinic', rung: 'Three factors, scalar' }, 'Did you mean "Across clinics"?'],
    [{ ladder: 'Structure', rung: 'Two factors' }, 'The step to Two factors adds no equality across groups that could be let go.']
  ])('is refused for %j', async (input, message) => {
    const { workbench } = await openSample()
    expect(await refused(workbench, 'releaseSearch', input)).toContain(message)
    await workbench.close()
  })
})

describe('a release by hand', () => {
  it('derives a candidate from a rung that a ladder made', async () => {
    const { workbench } = await openSample()
    await done(workbench, 'fitCandidates', { names: null })
    const releases = [{ cell: { part: 'intercept' as const, of: ['taps'] }, group: 'Weir Lane' }]
    const name = 'Three factors, scalar but for taps in Weir Lane'
    const view = await done(workbench, 'releaseByHand', { candidate: 'Three factors, scalar', releases })
    expect(view.candidates.find(({ candidate }) => candidate.name === name)).toMatchObject({
      state: 'draft',
      origin: 'added after results',
      sentence: 'From Three factors: equal loadings and intercepts across clinic; except the intercept of taps in Weir Lane.'
    })
    const fitted = await done(workbench, 'fitCandidates', { names: [name] })
    expect(fitted.candidates.find(({ candidate }) => candidate.name === name)!.state).toBe('fitted')
    expect(await refused(workbench, 'releaseByHand', { candidate: 'Three factors, scalar', releases })).toContain('already')
    await workbench.close()
  })

  it('is refused for a cell that is not held equal, and for an unknown candidate or group', async () => {
    const { workbench } = await openSample()
    const releases = (part: 'intercept', group: string) => [{ cell: { part, of: ['taps'] }, group }]
    const hand = (candidate: string, group = 'Weir Lane') =>
      refused(workbench, 'releaseByHand', { candidate, releases: releases('intercept', group) })
    expect(await hand('Three factors, metric')).toMatch(/intercept/)
    expect(await hand('Three factors, scala')).toContain('Did you mean "Three factors, scalar"?')
    expect(await hand('Three factors, scalar', 'Weir Lan')).toContain('Weir Lan')
    await workbench.close()
  })
})

/** Two groups of 400 with one factor of four indicators; the loading of the first is 0.6 higher in the second group. */
function unequalReference(scaling: string): string {
  const generator = seededGenerator(7)
  const rows = Array.from({ length: 800 }, (_, i) => {
    const far = i >= 400
    const factor = generator.normal() * (far ? 1.2 : 1)
    const loadings = [far ? 1.6 : 1, 0.9, 1.1, 0.8]
    return [far ? 'far' : 'near', ...loadings.map((loading) => (loading * factor + 0.7 * generator.normal()).toFixed(4))].join(',')
  })
  writeFileSync(join(folder, 'rows.csv'), `place,a,b,c,d\n${rows.join('\n')}\n`)
  const path = join(folder, 'plan.yaml')
  writeFileSync(
    path,
    `study: A reference that differs
data: { file: rows.csv, indicators: [a, b, c, d], group: place }
candidates:
  One:
    factors: { F: [a, b, c, d] }
    scaling: ${scaling}
ladders:
  Places: { invariance of: One, across: place, through: metric }
`
  )
  return path
}

describe('the search where the reference indicator itself differs', () => {
  it.each([
    ['first loading', 'with b as reference indicator'],
    ['factor variance', 'with a as reference indicator'],
    ['effects coding', 'with a as reference indicator']
  ])('lets go of its loading whatever sets the scale: %s', async (scaling, how) => {
    const { workbench } = startBench(folder)
    await done(workbench, 'openPlan', { path: unequalReference(scaling) })
    const { search, view } = await done(workbench, 'releaseSearch', { ladder: 'Places', rung: 'One, metric' })
    expect(search.released.map(({ part, of, group }) => [part, of, group])).toEqual([['loading', ['a', 'F'], 'far']])
    expect(search.ended).toBe('the step holds')
    expect(search.otherReference).toMatchObject({
      agrees: true,
      sentence: `Repeated ${how}, the search lets go of the same.`
    })
    const partial = view.result.candidates.find(({ name }) => name === 'One, metric but for a in far')!
    const loading = (group: string) => partial.estimates.find((e) => e.part === 'loading' && e.of[0] === 'a' && e.group === group)!
    expect(loading('far').estimate! / loading('near').estimate!).toBeCloseTo(1.6, 0)
    expect(search.onwardLadder).toBeNull()
    await workbench.close()
  })
})

describe('the search among structural equalities', () => {
  const rows = fileURLToPath(new URL('../../fixtures/two-factors/two-factors.csv', import.meta.url))
  const released = async (set: string, scaling: string) => {
    const path = join(folder, 'structure.yaml')
    writeFileSync(
      path,
      `study: Structure
data: { file: '${rows}', indicators: [y1, y2, y3, y4, y5, y6], group: group }
candidates:
  Two:
    factors: { First: [y1, y2, y3], Second: [y4, y5, y6] }
    scaling: ${scaling}
ladders:
  Groups: { invariance of: Two, across: group, through: scalar, and: [${set}] }
`
    )
    const { workbench } = startBench(folder)
    await done(workbench, 'openPlan', { path })
    const input = { ladder: `Groups, ${set}`, rung: `Two, scalar, equal ${set}` }
    const { search } = await done(workbench, 'releaseSearch', input)
    await workbench.close()
    return search
  }

  it.each(['factor means', 'factor variances'])(
    'lets go of the same %s whatever sets the scale, and the step then holds',
    async (set) => {
      const searches = []
      for (const scaling of ['first loading', 'factor variance', 'effects coding']) searches.push(await released(set, scaling))
      for (const search of searches) {
        expect(search.ended).toBe('the step holds')
        expect(search.released.length).toBeGreaterThan(0)
        expect(search.released.map(({ words }) => words)).toEqual(searches[0]!.released.map(({ words }) => words))
        expect(search.otherReference?.agrees).toBe(true)
      }
    }
  )
})
