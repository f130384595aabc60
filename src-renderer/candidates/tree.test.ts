import { describe, expect, test } from 'vitest'
import type { CandidateView } from '../../src-main/operations/contract.ts'
import { treeRows } from './tree.ts'

function family(...pairs: [name: string, from: string | null][]): CandidateView[] {
  return pairs.map(([name, from]) => ({ candidate: { name, from } }) as CandidateView)
}
const drawn = (views: CandidateView[]) => treeRows(views).map(({ entry, depth }) => `${depth} ${entry.candidate.name}`)

describe('the family as a tree', () => {
  test('puts children under their parent, in the order of the study', () => {
    expect(drawn(family(['b', 'a'], ['a', null], ['c', null], ['d', 'b']))).toEqual(['0 a', '1 b', '2 d', '0 c'])
  })

  test('shows everyone once, even where a parent is missing or a circle is stated', () => {
    expect(drawn(family(['a', 'gone'], ['b', 'c'], ['c', 'b'])).sort()).toEqual(['0 a', '0 b', '1 c'])
  })
})
