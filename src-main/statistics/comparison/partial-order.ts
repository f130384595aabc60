/**
 * How all models of a family stand to each other: nested, equivalent or neither, for every pair, without refitting them all.
 *
 * "a in b" says that b can be what a is, at a's solution and at another point of a. Cheapest first:
 *
 *     degrees of freedom    a model is never in one with more
 *     constraints           the syntactic proof of relation.ts
 *     order of fit          a model in another never fits better than that one, so whoever fits better is not in it
 *     refitting             only where nothing above and nothing that follows from it has settled the pair
 *
 * What follows from what: constraints prove "all of a is in b", and so a in b and b wholly in c make a in c, and a not in c
 * and b wholly in c keep a out of b. Refitting proves less: equivalence and nesting found by it hold around the solution and
 * may fail on a thin part of a model. (Three correlated factors are equivalent to a second order over them, yet three factors
 * of which one pair is uncorrelated are nested in the first and not in the second.) So nothing is chained on a refit but
 * this: equivalent models imply the same moments, so whatever reproduces one reproduces the other.
 */
import type { ModelCells } from '../model/cells.ts'
import { type PreparedModel, prepareModel, relationByConstraints, withinByRefit } from './relation.ts'

/** One model of the family with its solution; all are fitted to the same moments. */
export interface FamilyMember {
  cells: ModelCells
  gamma: number[]
  /** The unscaled statistic at the solution. */
  T: number
}

/** What is known of a pair from earlier work. */
export interface KnownPair {
  general: number
  restricted: number
  relation: 'nested' | 'equivalent' | 'not nested'
  proof: 'constraints' | 'refit'
}

export interface FamilyInput {
  members: FamilyMember[]
  /** Cases per group. */
  sizes: number[]
  known: KnownPair[]
}

export type PairProof = 'constraints' | 'refit' | 'order of fit' | 'other pairs'

/** One pair of members by their places: `general` has no more degrees of freedom than `restricted`; nested with equal df, only bounds differ. */
export interface FamilyPair {
  general: number
  restricted: number
  relation: 'nested' | 'equivalent' | 'not nested'
  proof: PairProof
}

export interface FamilyOrder {
  /** Every pair once. */
  pairs: FamilyPair[]
  /** Pairs settled by refitting just now. */
  refits: number
}

/**
 * Throws a plain Error for members of different moments. The result does not depend on the order of the members but for
 * which proof is named where a pair has several.
 */
export function familyOrder({ members, sizes, known }: FamilyInput): FamilyOrder {
  const prepared = members.map(({ cells, gamma }) => prepareModel(cells, gamma, sizes))
  if (prepared.some((one) => one.frame !== prepared[0]!.frame)) throw new Error('models of different moments have no order')
  const order = new Order(members.length)
  const df = prepared.map((one) => one.model.df)
  eachPair(df, (general, restricted) => {
    if (df[general]! < df[restricted]!) order.learn(general, restricted, false, 'constraints')
  })
  for (const pair of known) learnKnown(order, pair, df)
  learnConstraints(order, prepared, df)
  learnFits(order, members, df)
  const refits = learnRefits(order, prepared, df)
  return { pairs: pairsOf(order, df), refits }
}

/** Calls `visit` once a pair; where df are equal, the earlier member is taken as the general one. */
function eachPair(df: readonly number[], visit: (general: number, restricted: number) => void): void {
  for (let a = 0; a < df.length; a++) {
    for (let b = a + 1; b < df.length; b++) {
      if (df[b]! < df[a]!) visit(b, a)
      else visit(a, b)
    }
  }
}

function learnKnown(order: Order, { general, restricted, relation, proof }: KnownPair, df: readonly number[]): void {
  order.learn(restricted, general, relation !== 'not nested', proof)
  if (df[general] === df[restricted]) order.learn(general, restricted, relation === 'equivalent', proof)
}

function learnConstraints(order: Order, prepared: readonly PreparedModel[], df: readonly number[]): void {
  eachPair(df, (general, restricted) => {
    if (order.isWholly(restricted, general)) return
    const proved = relationByConstraints(prepared[general]!, prepared[restricted]!)
    if (proved === null) return
    order.learn(restricted, general, proved !== 'reversed', 'constraints')
    if (df[general] === df[restricted]) order.learn(general, restricted, proved !== 'nested', 'constraints')
  })
}

/** By how much one T must be below another before it counts as a better fit: minima are found to a relative 1e-8 or better. */
function fitTolerance(T: number): number {
  return 1e-4 * (1 + Math.abs(T))
}

function learnFits(order: Order, members: readonly FamilyMember[], df: readonly number[]): void {
  const better = (a: number, b: number) => members[a]!.T < members[b]!.T - fitTolerance(members[b]!.T)
  eachPair(df, (general, restricted) => {
    const sameDf = df[general] === df[restricted]
    if (!better(restricted, general) && !(sameDf && better(general, restricted))) return
    order.learn(restricted, general, false, 'order of fit')
    if (sameDf) order.learn(general, restricted, false, 'order of fit')
  })
}

/** Smallest gaps in df first, so that equivalent models are found before they are compared with others. */
function learnRefits(order: Order, prepared: readonly PreparedModel[], df: readonly number[]): number {
  const open: [number, number][] = []
  eachPair(df, (general, restricted) => {
    if (!order.known(restricted, general)) open.push([general, restricted])
  })
  open.sort(([a, b], [c, d]) => df[b]! - df[a]! - (df[d]! - df[c]!))
  let refits = 0
  for (const [general, restricted] of open) {
    if (order.known(restricted, general)) continue
    const fits = withinByRefit(prepared[general]!, prepared[restricted]!)
    refits++
    order.learn(restricted, general, fits, 'refit')
    if (df[general] === df[restricted]) order.learn(general, restricted, fits, 'refit')
  }
  return refits
}

function pairsOf(order: Order, df: readonly number[]): FamilyPair[] {
  const pairs: FamilyPair[] = []
  eachPair(df, (general, restricted) => {
    const within = order.contains(restricted, general)
    const holds = order.contains(general, restricted)
    const relation = within && holds ? 'equivalent' : within || holds ? 'nested' : 'not nested'
    if (holds && !within)
      pairs.push({ general: restricted, restricted: general, relation, proof: order.proof(general, restricted) })
    else pairs.push({ general, restricted, relation, proof: order.proof(restricted, general) })
  })
  return pairs
}

/** What is known of "a in b" for every two members, closed under what follows from it. The first finding about a pair stands. */
class Order {
  private readonly n: number
  /** 1: a in b; -1: not; 0: not known */
  private readonly facts: Int8Array
  /** 1: all of a is in b, by constraints alone. */
  private readonly wholly: Int8Array
  private readonly proofs: (PairProof | undefined)[]

  constructor(n: number) {
    this.n = n
    this.facts = new Int8Array(n * n)
    this.wholly = new Int8Array(n * n)
    this.proofs = new Array<PairProof | undefined>(n * n)
  }

  known(a: number, b: number): boolean {
    return this.facts[a * this.n + b] !== 0
  }

  contains(a: number, b: number): boolean {
    return this.facts[a * this.n + b] === 1
  }

  isWholly(a: number, b: number): boolean {
    return this.wholly[a * this.n + b] === 1
  }

  proof(a: number, b: number): PairProof {
    return this.proofs[a * this.n + b]!
  }

  learn(a: number, b: number, within: boolean, proof: PairProof): void {
    const open: Finding[] = [{ a, b, within, wholly: within && proof === 'constraints' }]
    for (let next = open.pop(); next !== undefined; next = open.pop()) {
      const at = next.a * this.n + next.b
      const isNew = this.facts[at] === 0
      if (!isNew && !(next.wholly && this.facts[at] === 1 && this.wholly[at] === 0)) continue
      if (isNew) this.proofs[at] = next.a === a && next.b === b ? proof : 'other pairs'
      this.facts[at] = next.within ? 1 : -1
      if (next.wholly) this.wholly[at] = 1
      for (let c = 0; c < this.n; c++) {
        if (c === next.a || c === next.b) continue
        if (next.within) this.afterWithin(next, c, open)
        else this.afterApart(next, c, open)
      }
    }
  }

  /** x in y: what it says about a third member. */
  private afterWithin({ a: x, b: y, wholly }: Finding, c: number, open: Finding[]): void {
    if (this.isWholly(y, c)) open.push({ a: x, b: c, within: true, wholly })
    if (wholly) {
      if (this.contains(c, x)) open.push({ a: c, b: y, within: true, wholly: this.isWholly(c, x) })
      if (this.isApart(c, y)) open.push({ a: c, b: x, within: false, wholly: false })
    }
    if (this.contains(y, x)) {
      this.share(x, y, c, open)
      this.share(y, x, c, open)
    }
    this.shareWithEquals(x, y, c, true, open)
  }

  /** x not in y: what it says about a third member. */
  private afterApart({ a: x, b: y }: Finding, c: number, open: Finding[]): void {
    if (this.isWholly(c, y)) open.push({ a: x, b: c, within: false, wholly: false })
    this.shareWithEquals(x, y, c, false, open)
  }

  /** x and y have turned out equivalent: what x is in or not in, y is too. */
  private share(x: number, y: number, c: number, open: Finding[]): void {
    if (this.known(x, c)) open.push({ a: y, b: c, within: this.contains(x, c), wholly: false })
  }

  /** c is known to be equivalent to x: it is in y as x is. */
  private shareWithEquals(x: number, y: number, c: number, within: boolean, open: Finding[]): void {
    if (this.contains(x, c) && this.contains(c, x)) open.push({ a: c, b: y, within, wholly: false })
  }

  private isApart(a: number, b: number): boolean {
    return this.facts[a * this.n + b] === -1
  }
}

interface Finding {
  a: number
  b: number
  within: boolean
  wholly: boolean
}
