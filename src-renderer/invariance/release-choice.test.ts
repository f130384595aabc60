import { describe, expect, test } from 'vitest'
import type { ScoreTestView, StepResult, StudyView } from '../../src-main/operations/contract.ts'
import { canRelease, choices, ladderNameFor, partsAdded } from './release-choice.ts'

const view = {
  candidates: [
    { candidate: { name: 'One, metric', equalAcrossGroups: ['loadings'] } },
    { candidate: { name: 'One, scalar', equalAcrossGroups: ['loadings', 'intercepts'] } }
  ],
  ladders: [{ name: 'Places, scalar but for a in far', rungs: ['One, scalar'] }],
  result: { candidates: [{ name: 'One, scalar', groups: 2 }] }
} as unknown as StudyView
const step = { from: 'One, metric', to: 'One, scalar', verdict: 'does not hold' } as StepResult

describe('what may be let go of a step', () => {
  test('is what its upper rung holds equal and the lower one does not, where the step fails', () => {
    expect(partsAdded(view, step)).toEqual(['intercept'])
    expect(canRelease(view, step)).toBe(true)
    expect(canRelease(view, { ...step, verdict: 'holds' })).toBe(false)
    expect(canRelease(view, { ...step, from: 'One, scalar' })).toBe(false)
  })

  test('is listed largest first, other parts and other kinds left out', () => {
    const test = (kind: string, part: string, statistic: number) => ({ kind, part, statistic, group: 'far' }) as ScoreTestView
    const tests = [test('equality', 'intercept', 1), test('equality', 'loading', 9), test('fixed cell', 'intercept', 8)]
    const larger = test('equality', 'intercept', 2)
    expect(choices([...tests, larger], ['intercept'])).toEqual([larger, tests[0]])
  })

  test('makes a ladder named by what differs, counted on where that name is taken', () => {
    expect(ladderNameFor(view, 'Places', step, 'One, scalar but for b in far')).toBe('Places, scalar but for b in far')
    expect(ladderNameFor(view, 'Places', step, 'One, scalar but for a in far')).toBe('Places, scalar but for a in far (2)')
    expect(ladderNameFor(view, 'Places', step, 'Another')).toBe('Places, Another')
  })
})
