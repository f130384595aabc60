import { describe, expect, test } from 'vitest'
import type { Candidate, StudyView } from '../../src-main/operations/contract.ts'
import { areComplete, canRepeat, firstOccasions, indicatorsOf, withOccasion } from './occasions.ts'

const indicators = ['a1', 'b1', 'a2', 'b2', 'a3', 'b3', 'age']
const view = {
  data: { indicators },
  candidates: [
    { candidate: { name: 'One', from: null, factors: [{ name: 'F', measures: ['b1', 'a1'] }] } as Partial<Candidate> },
    { candidate: { name: 'Two', from: 'One', factors: null } as Partial<Candidate> },
    { candidate: { name: 'All', from: null, factors: [{ name: 'F', measures: indicators }] } as Partial<Candidate> }
  ]
} as StudyView

describe('the occasions of a ladder over time', () => {
  test('start with what the candidate or its parent measures, in the order of the data, and propose what follows', () => {
    expect(indicatorsOf(view, 'Two')).toEqual(['a1', 'b1'])
    expect(firstOccasions(view, 'Two')).toEqual([
      { name: 'first', indicators: ['a1', 'b1'] },
      { name: 'second', indicators: ['a2', 'b2'] }
    ])
  })

  test('are offered only where the data have room for a second one', () => {
    expect([canRepeat(view, 'One'), canRepeat(view, 'All'), canRepeat(view, 'None')]).toEqual([true, false, false])
  })

  test('are complete once every name and indicator is there, and none twice', () => {
    const three = withOccasion(firstOccasions(view, 'One'), indicators)
    expect(areComplete(three)).toBe(true)
    expect(areComplete(withOccasion(three, indicators))).toBe(false)
    expect(areComplete(three.map((one) => ({ ...one, name: 'same' })))).toBe(false)
    expect(areComplete(three.map((one) => ({ ...one, indicators: ['a1', 'b1'] })))).toBe(false)
  })
})
