/**
 * Ladders that a family has in it: the longest chains of nested models, until every model that is nested with another
 * stands on one. Equivalent models share a place, and one of them stands for the others.
 */
import type { FamilyPair } from './partial-order.ts'

export interface FamilyChains {
  /** Bottom (most general) first, at least two, each nested in the one before it; the longest first. */
  chains: number[][]
  /** Sets of two or more equivalent models, in order. */
  equivalent: number[][]
  /** Models nested in no other and holding no other, and not equivalent to one that does. */
  off: number[]
}

/** @param n members, in order of preference where several would do */
export function familyChains(n: number, pairs: readonly FamilyPair[]): FamilyChains {
  const place = placesOf(n, pairs)
  const graph = graphOf(n, pairs)
  const covered = new Set<number>()
  const chains: number[][] = []
  const through = (member: number) => graph.below(member).length + graph.above(member).length
  const candidates = order(n)
    .filter((member) => through(member) > 2)
    .sort((a, b) => through(b) - through(a) || a - b)
  for (const member of candidates) {
    if (covered.has(place[member]!)) continue
    const chain = [...graph.below(member), ...graph.above(member).slice(1)]
    for (const one of chain) covered.add(place[one]!)
    chains.push(chain)
  }
  const equivalent = order(n)
    .map((root) => order(n).filter((member) => place[member] === root))
    .filter((set) => set.length > 1)
  return { chains, equivalent, off: order(n).filter((member) => !covered.has(place[member]!)) }
}

function order(n: number): number[] {
  return Array.from({ length: n }, (_, i) => i)
}

/** For each member the first one it is equivalent to, itself included. */
function placesOf(n: number, pairs: readonly FamilyPair[]): number[] {
  const place = order(n)
  for (const { general, restricted, relation } of pairs) {
    if (relation !== 'equivalent') continue
    const [first, other] = [place[general]!, place[restricted]!].sort((a, b) => a - b) as [number, number]
    for (let i = 0; i < n; i++) if (place[i] === other) place[i] = first
  }
  return place
}

interface Graph {
  /** The longest chain that ends at the member, bottom first, the member last. */
  below: (member: number) => number[]
  /** The longest chain that starts at the member, the member first. */
  above: (member: number) => number[]
}

function graphOf(n: number, pairs: readonly FamilyPair[]): Graph {
  const wider = Array.from({ length: n }, (): number[] => [])
  const narrower = Array.from({ length: n }, (): number[] => [])
  for (const { general, restricted, relation } of pairs) {
    if (relation !== 'nested') continue
    wider[restricted]!.push(general)
    narrower[general]!.push(restricted)
  }
  const below = longest(wider)
  const above = longest(narrower)
  return { below: (member) => [...below(member)].reverse(), above }
}

/** The longest walk from a member along `next`, the member first; of equally long ones that through the earliest member. */
function longest(next: readonly number[][]): (member: number) => number[] {
  const known = new Map<number, number[]>()
  const walk = (member: number): number[] => {
    const found = known.get(member)
    if (found !== undefined) return found
    const onward = [...next[member]!].sort((a, b) => a - b).map(walk)
    const best = onward.reduce<number[]>((a, b) => (b.length > a.length ? b : a), [])
    known.set(member, [member, ...best])
    return known.get(member)!
  }
  return walk
}
