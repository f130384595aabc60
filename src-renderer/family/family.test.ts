import { describe, expect, test } from 'vitest'
import type { FamilyRelations, StudyView } from '../../src-main/operations/contract.ts'
import { nameFor, partsOf, standingAs, unnestedPairs } from './family.ts'
import { ratioInWords } from './words.ts'

const found: FamilyRelations = {
  relations: [
    { lower: 'b', upper: 'a', relation: 'not nested', proof: 'refit' },
    { lower: 'b', upper: 'c', relation: 'nested', proof: 'constraints' }
  ],
  chains: [['b', 'c']],
  equivalent: [],
  off: ['a'],
  without: ['d'],
  sentences: ['Of 2 pairs …', 'A ladder: b, c.', 'a is off.', 'd is not known.']
}
const view = {
  ladders: [
    { name: 'Mine', rungs: ['b', 'c'] },
    { name: 'x to y', rungs: ['x', 'y'] }
  ],
  result: {
    ladders: [{ name: 'Climbed', rungs: ['p', 'q'] }],
    candidates: [
      { name: 'a', aic: 104, bic: 98 },
      { name: 'b', aic: 100, bic: 100 },
      { name: 'c', aic: 90, bic: 90 }
    ]
  }
} as unknown as StudyView

describe('the family', () => {
  test('tells the ladders apart from what is said before and beside them', () => {
    expect(partsOf(found)).toEqual({ lead: ['Of 2 pairs …'], beside: ['a is off.', 'd is not known.'] })
  })

  test('knows a ladder that stands already, listed or generated, and gives a new one a name of its own', () => {
    expect([standingAs(view, ['b', 'c']), standingAs(view, ['p', 'q']), standingAs(view, ['c', 'b'])]).toEqual([
      'Mine',
      'Climbed',
      null
    ])
    expect([nameFor(view, ['b', 'c']), nameFor(view, ['x', 'y'])]).toEqual(['b to c', 'x to y (2)'])
  })

  test('weighs pairs that are not nested, the one favoured by AIC first, and says where BIC turns it round', () => {
    const [pair, ...rest] = unnestedPairs(view, found.relations)
    expect(rest).toEqual([])
    expect(pair).toMatchObject({ favoured: 'b', other: 'a' })
    expect(pair!.aic).toBeCloseTo(Math.exp(2), 12)
    expect([ratioInWords(pair!.aic), ratioInWords(pair!.bic)]).toEqual(['7.4', '1/2.7'])
    expect([ratioInWords(null), ratioInWords(1e9), ratioInWords(234)]).toEqual(['–', '> 1 000 000', '234'])
  })
})
