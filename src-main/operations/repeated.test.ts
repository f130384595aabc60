import { mkdtempSync, readFileSync, writeFileSync } from 'node:fs'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { afterAll, beforeAll, describe, expect, test } from 'vitest'
import { seededGenerator } from '../statistics/distributions/generator.ts'
import { parsePlan } from '../study/plan-file.ts'
import type { StudyView } from './contract.ts'
import type { Workbench } from './index.ts'
import { done, refused, startBench } from './test-bench.ts'

/** 400 cases asked the same three questions in May and June; the third is answered .6 higher in June than the factor says. */
function repeatedFolder(): string {
  const folder = mkdtempSync(join(tmpdir(), 'rungwise-repeated-'))
  const generator = seededGenerator(77)
  const rows = Array.from({ length: 400 }, () => {
    const may = generator.normal()
    const june = 0.4 + 0.7 * may + 0.7 * generator.normal()
    const own = [0, 1, 2].map(() => 0.4 * generator.normal())
    const answers = [may, june].flatMap((factor, t) =>
      own.map((residual, j) => (1 - 0.1 * j) * factor + residual + 0.5 * generator.normal() + (t === 1 && j === 2 ? 0.6 : 0))
    )
    return answers.map((answer) => answer.toFixed(4)).join(',')
  })
  writeFileSync(join(folder, 'repeated.csv'), ['sleep1,calm1,joy1,sleep2,calm2,joy2', ...rows, ''].join('\n'))
  writeFileSync(
    join(folder, 'plan.yaml'),
    `study: Twice asked
data: { file: repeated.csv, indicators: [sleep1, calm1, joy1, sleep2, calm2, joy2] }
candidates:
  Wellbeing: { factors: { Ease: [sleep1, calm1, joy1] } }
ladders:
  Over time:
    invariance of: Wellbeing
    over: { May: [sleep1, calm1, joy1], June: [sleep2, calm2, joy2] }
    through: strict
rules: { change in fit: Chen 2007, decide by: both }
`
  )
  return folder
}

describe('a study of repeated measurements', () => {
  let workbench: Workbench
  let view: StudyView
  beforeAll(async () => {
    ;({ workbench } = startBench(repeatedFolder()))
    await done(workbench, 'openSample', null)
    view = await done(workbench, 'fitCandidates', { names: ['Wellbeing'] })
  })
  afterAll(() => workbench.close())

  test('fits the rungs of the ladder with the candidate they are made from', () => {
    expect(view.candidates.map(({ candidate, generated, state }) => [candidate.name, generated, state])).toEqual([
      ['Wellbeing', false, 'fitted'],
      ['Wellbeing, configural over time', true, 'fitted'],
      ['Wellbeing, metric over time', true, 'fitted'],
      ['Wellbeing, scalar over time', true, 'fitted'],
      ['Wellbeing, strict over time', true, 'fitted']
    ])
    expect(view.candidates[1]!.sentence).toBe(
      'Ease at May (sleep1, calm1, joy1) and Ease at June (sleep2, calm2, joy2), correlated; free residual covariances (sleep1 with sleep2; calm1 with calm2; joy1 with joy2).'
    )
  })

  test('stands on equal loadings where an intercept has shifted', () => {
    const [ladder] = view.result.ladders
    expect(ladder!.standHere).toBe('Wellbeing, metric over time')
    expect(ladder!.steps.map(({ verdict, relation }) => [verdict, relation])).toEqual([
      ['holds', 'nested'],
      ['does not hold', 'nested'],
      [expect.any(String), 'nested']
    ])
    expect(ladder!.steps.map(({ difference }) => difference!.df)).toEqual([2, 2, 3])
    expect(ladder!.steps[0]!.because).toContain('SRMR changes by')
    expect(ladder!.steps[0]!.because).toContain('(at most +.030 asked)')
    expect(ladder!.steps[1]!.because).toContain('(at most +.010 asked)')
  })

  test('lets two ladders over the same occasions share their rungs', async () => {
    const added = await done(workbench, 'addLadder', {
      ladder: {
        name: 'Again',
        invarianceOf: 'Wellbeing',
        over: view.ladders.flatMap((l) => ('over' in l ? l.over : [])),
        through: 'metric'
      }
    })
    expect(added.result.ladders[1]!.standHere).toBe('Wellbeing, metric over time')
  })

  test('lets a candidate derive from a rung, with the shifted intercept let go', async () => {
    const candidate = {
      ...view.candidates[0]!.candidate,
      name: 'But for joy',
      from: 'Wellbeing, scalar over time',
      factors: null,
      change: [{ do: 'free' as const, cell: { part: 'intercept' as const, of: ['joy2'] }, group: null }]
    }
    await done(workbench, 'addCandidate', { candidate })
    await done(workbench, 'addLadder', { ladder: { name: 'Partly', rungs: ['Wellbeing, metric over time', 'But for joy'] } })
    const fitted = await done(workbench, 'fitCandidates', { names: null })
    expect(fitted.result.ladders.find(({ name }) => name === 'Partly')).toMatchObject({
      standHere: 'But for joy',
      steps: [{ verdict: 'holds', relation: 'nested', difference: { df: 1 } }]
    })
    const path = join(repeatedFolder(), 'again.yaml')
    await done(workbench, 'exportPlan', { path })
    expect(parsePlan(readFileSync(path, 'utf8'), 'again.yaml').candidates[1]).toEqual(candidate)
  })

  test('is resampled like any other ladder', async () => {
    const { steps } = await done(workbench, 'stability', { ladder: 'Over time', resamples: 10, seed: 1 })
    expect(steps[1]!.share).toBe(0)
  })

  test('refuses a search across groups on it', async () => {
    const answer = await refused(workbench, 'releaseSearch', { ladder: 'Over time', rung: 'Wellbeing, scalar over time' })
    expect(answer).toContain('group')
  })
})
