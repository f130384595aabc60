import { describe, expect, test } from 'vitest'
import type { CandidateResult, EstimateResult } from '../../src-main/operations/contract.ts'
import { groupPicture, shapeOf } from './group-pictures.ts'

function intercept(of: string, group: string | null, estimate: number, rest: Partial<EstimateResult> = {}): EstimateResult {
  const own = { free: true, label: null, standardError: 0.1, lower: estimate - 0.2, upper: estimate + 0.2 }
  return { part: 'intercept', group, of: [of], estimate, standardized: null, standardizedError: null, ...own, ...rest }
}
const resultWith = (estimates: EstimateResult[]) => ({ estimates }) as CandidateResult
const twoGroups = [
  intercept('a', 'near', 3, { label: 'k' }),
  intercept('a', 'mid', 3, { label: 'k' }),
  intercept('a', 'far', 3.5),
  intercept('b', 'near', 3.2, { label: 'l' }),
  intercept('b', 'mid', 3.2, { label: 'l' }),
  intercept('b', 'far', 3.2, { label: 'l' })
]

describe('the picture of a part by group', () => {
  test('says of every cell whether it is equal, free in some group, free or fixed', () => {
    const picture = groupPicture(resultWith(twoGroups), 'intercept')!
    expect(picture.rows.map(({ name, held }) => [name, held])).toEqual([
      ['a', 'free in far'],
      ['b', 'equal']
    ])
    const apart = groupPicture(resultWith([intercept('a', 'near', 1), intercept('a', 'far', 2)]), 'intercept')!
    expect(apart.rows[0]?.held).toBe('free')
    const fixed = ['near', 'far'].map((group) => intercept('a', group, 1, { free: false, lower: null, upper: null }))
    expect(groupPicture(resultWith(fixed), 'intercept')?.rows[0]).toMatchObject({
      held: 'fixed',
      words: 'a, fixed: near 1.00, far 1.00'
    })
  })

  test('places every end of an interval within the width, in the order of its values', () => {
    const picture = groupPicture(resultWith(twoGroups), 'intercept')!
    const ends = picture.rows.flatMap((row) =>
      row.marks.flatMap(({ interval }) => [picture.place(row, interval!.lower), picture.place(row, interval!.upper)])
    )
    expect(Math.min(...ends)).toBeCloseTo(4, 10)
    expect(Math.max(...ends)).toBeCloseTo(96, 10)
    expect(picture.ticks.map(({ text }) => text)).toEqual(['2.8', '3', '3.2', '3.4', '3.6'])
  })

  test('centres rows that lie far apart, and their distances still compare', () => {
    const far = ['near', 'far'].flatMap((group, i) => [intercept('a', group, 3 + 0.1 * i), intercept('b', group, 90 + 0.2 * i)])
    const picture = groupPicture(resultWith(far), 'intercept')!
    const [a, b] = picture.rows
    expect(picture.centred).toBe(true)
    expect(picture.place(b!, 90.2) - picture.place(b!, 90)).toBeCloseTo(2 * (picture.place(a!, 3.1) - picture.place(a!, 3)), 8)
    expect(picture.ticks.some(({ text }) => text.startsWith('+'))).toBe(true)
  })

  test('is not drawn for a candidate without groups, or without that part', () => {
    expect(groupPicture(resultWith([intercept('a', null, 3)]), 'intercept')).toBeNull()
    expect(groupPicture(resultWith(twoGroups), 'loading')).toBeNull()
  })

  test('gives the first eight groups a mark of their own', () => {
    const marks = Array.from({ length: 8 }, (_, i) => JSON.stringify(shapeOf(i)))
    expect(new Set(marks).size).toBe(8)
    expect(shapeOf(8)).toEqual(shapeOf(0))
  })
})
