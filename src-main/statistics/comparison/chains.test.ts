import fc from 'fast-check'
import { describe, expect, it } from 'vitest'
import { familyChains } from './chains.ts'
import type { FamilyPair } from './partial-order.ts'

const pair = (general: number, restricted: number, relation: FamilyPair['relation'] = 'nested'): FamilyPair => ({
  general,
  restricted,
  relation,
  proof: 'constraints'
})

describe('the ladders in a family', () => {
  it('are the longest chains, then those through what is not on one yet', () => {
    // 0 holds 1 holds 2; 3 is nested in 0 only; 4 stands alone.
    const pairs = [pair(0, 1), pair(1, 2), pair(0, 2), pair(0, 3), pair(3, 1, 'not nested')]
    expect(familyChains(5, pairs)).toEqual({
      chains: [
        [0, 1, 2],
        [0, 3]
      ],
      equivalent: [],
      off: [4]
    })
  })

  it('have one of several equivalent candidates on them, the first in the plan where it can be', () => {
    const pairs = [pair(0, 1, 'equivalent'), pair(0, 2), pair(1, 2), pair(2, 3), pair(0, 3), pair(1, 3)]
    expect(familyChains(4, pairs)).toEqual({ chains: [[0, 2, 3]], equivalent: [[0, 1]], off: [] })
  })

  it('pass through the equivalent candidate that is truly nested with its neighbours', () => {
    const pairs = [pair(0, 1, 'equivalent'), pair(0, 2, 'not nested'), pair(1, 2)]
    expect(familyChains(3, pairs)).toEqual({ chains: [[1, 2]], equivalent: [[0, 1]], off: [] })
  })

  it('are none in a family without nesting', () => {
    expect(familyChains(3, [pair(0, 1, 'not nested'), pair(0, 2, 'not nested'), pair(1, 2, 'equivalent')])).toEqual({
      chains: [],
      equivalent: [[1, 2]],
      off: [0, 1, 2]
    })
  })

  it('have only nested neighbours, the longest first, and leave off just what is nested with nothing', () => {
    const families = fc.integer({ min: 1, max: 9 }).chain((n) =>
      fc.array(fc.tuple(fc.nat(n - 1), fc.nat(n - 1)), { maxLength: 14 }).map((edges) => ({
        n,
        pairs: [...new Map(edges.filter(([a, b]) => a < b).map(([a, b]) => [`${a} ${b}`, pair(a, b)])).values()]
      }))
    )
    fc.assert(
      fc.property(families, ({ n, pairs }) => {
        const { chains, off } = familyChains(n, pairs)
        const nested = new Set(pairs.map(({ general, restricted }) => `${general} ${restricted}`))
        for (const chain of chains) {
          expect(chain.length).toBeGreaterThan(1)
          chain.slice(1).forEach((member, k) => {
            expect(nested.has(`${chain[k]} ${member}`)).toBe(true)
          })
        }
        expect(chains.map((chain) => chain.length)).toEqual(chains.map((chain) => chain.length).sort((a, b) => b - a))
        const related = new Set(pairs.flatMap(({ general, restricted }) => [general, restricted]))
        expect(off).toEqual(Array.from({ length: n }, (_, i) => i).filter((i) => !related.has(i)))
      })
    )
  })
})
