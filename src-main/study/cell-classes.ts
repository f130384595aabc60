/**
 * The cells of a model while it is being built, in classes of equal ones (a disjoint-set forest), and what binds the
 * classes beyond equality: linear equations and bounds.
 */
import type { CellBound, LinearConstraint } from '../statistics/model/cells.ts'
import { eliminate } from '../statistics/model/constraints.ts'
import type { CellPart } from './study.ts'

/** One cell; `leader` makes the classes of equal cells. */
export interface Node {
  part: CellPart
  of: string[]
  group: number
  /** null while free. */
  fixed: number | null
  leader: Node | null
  /** Limits of the cell while it is free; null where a side is open. */
  atLeast: number | null
  atMost: number | null
}

/** sum of times x cell = total. `words` is null for an equation of the scaling, which no user wrote. */
export interface Equation {
  terms: { node: Node; times: number }[]
  total: number
  words: string | null
}

/** What cannot be, as a clause with a remedy. */
export class Contradiction extends Error {
  readonly remedy: string | null

  constructor(what: string, remedy: string | null = null) {
    super(what)
    this.remedy = remedy
  }
}

export class CellClasses {
  private readonly nodes = new Map<string, Node>()

  key(part: CellPart, of: readonly string[], group: number): string {
    const names = part === 'residual covariance' || part === 'factor covariance' ? [...of].sort() : of
    return JSON.stringify([part, group, ...names])
  }

  find(part: CellPart, of: readonly string[], group: number): Node | undefined {
    return this.nodes.get(this.key(part, of, group))
  }

  put(part: CellPart, of: string[], group: number, fixed: number | null): Node {
    const node: Node = { part, of, group, fixed, leader: null, atLeast: null, atMost: null }
    this.nodes.set(this.key(part, of, group), node)
    return node
  }

  all(): Node[] {
    return [...this.nodes.values()]
  }

  /** The node that stands for its class. */
  top(node: Node): Node {
    return node.leader === null ? node : this.top(node.leader)
  }

  /** Makes two cells equal; a fixed one fixes both. False when both are fixed, at different numbers. */
  tie(a: Node, b: Node): boolean {
    const first = this.top(a)
    const second = this.top(b)
    if (first === second) return true
    if (first.fixed !== null && second.fixed !== null && first.fixed !== second.fixed) return false
    first.fixed = first.fixed ?? second.fixed
    second.leader = first
    return true
  }

  /** Takes a cell out of its class, which keeps its value for the others. Its bounds go. */
  leave(node: Node): void {
    const followers = this.all().filter((n) => n !== node && this.top(n) === this.top(node))
    const { fixed } = this.top(node)
    node.leader = null
    node.atLeast = null
    node.atMost = null
    const [head, ...rest] = followers
    if (head === undefined) return
    head.leader = null
    head.fixed = fixed
    for (const follower of rest) {
      follower.leader = head
      follower.fixed = null
    }
  }

  /** A label for each class of free cells: a letter for those that are shared, words of its own for the rest. */
  labels(): Map<Node, string> {
    const members = new Map<Node, number>()
    for (const node of this.nodes.values()) {
      const top = this.top(node)
      if (top.fixed === null) members.set(top, (members.get(top) ?? 0) + 1)
    }
    const labels = new Map<Node, string>()
    let shared = 0
    for (const [top, count] of members) {
      labels.set(top, count > 1 ? letters(shared++) : this.key(top.part, top.of, top.group))
    }
    return labels
  }

  /**
   * Fixes the classes that the equations leave no choice, and gives the equations that are left, each independent of those
   * before it, with the bounds of what is still free.
   *
   * @param words a cell for a message
   * @throws Contradiction
   */
  settle(
    equations: readonly Equation[],
    words: (node: Node) => string
  ): { labels: Map<Node, string>; constraints: LinearConstraint[]; bounds: CellBound[] } {
    for (;;) {
      const labels = this.labels()
      const bounds = this.bounds(labels, words)
      const open = equations.flatMap((equation) => {
        const linear = this.linear(equation, labels)
        return linear === null ? [] : [{ equation, linear }]
      })
      const names = [...labels.values()]
      const tops = [...labels.keys()]
      const bounded = new Set(bounds.map((bound) => bound.label))
      const { pivots, standing } = eliminate(
        names,
        open.map((one) => one.linear),
        bounded
      )
      const wrong = standing.indexOf('contradictory')
      if (wrong >= 0) throw contradicts(open[wrong]!.equation)
      const determined = [...pivots].filter(([pivot, row]) => row.slice(0, -1).every((value, i) => i === pivot || value === 0))
      if (determined.length === 0) {
        const tied = [...pivots.keys()].find((pivot) => bounded.has(names[pivot]!))
        if (tied !== undefined)
          throw new Contradiction(
            `the constraint on ${words(tops[tied]!)} binds bounded cells only, and bounds together with such a constraint cannot be kept`,
            'Leave one of its cells without a bound.'
          )
        return { labels, constraints: open.filter((_, i) => standing[i] === 'independent').map((one) => one.linear), bounds }
      }
      for (const [pivot, row] of determined) this.determine(tops[pivot]!, row.at(-1)!, words)
    }
  }

  private determine(top: Node, value: number, words: (node: Node) => string): void {
    if (value < 0 && (top.part === 'residual variance' || top.part === 'factor variance'))
      throw new Contradiction(`its constraints put ${words(top)} at ${value}, and a variance is never negative`)
    top.fixed = value
  }

  /** With fixed cells moved to the right; null when nothing is left to constrain. */
  private linear(equation: Equation, labels: ReadonlyMap<Node, string>): LinearConstraint | null {
    const { terms, total, words } = equation
    const free = terms.filter(({ node }) => this.top(node).fixed === null)
    const rest = terms.reduce((sum, { node, times }) => sum + times * (this.top(node).fixed ?? 0), 0)
    if (free.length === 0) {
      if (words !== null && Math.abs(total - rest) > 1e-9 * (1 + Math.abs(total))) throw contradicts(equation)
      return null
    }
    return { terms: free.map(({ node, times }) => ({ label: labels.get(this.top(node))!, weight: times })), equals: total - rest }
  }

  /** Of every class of free cells the limits of all its members together. */
  private bounds(labels: ReadonlyMap<Node, string>, words: (node: Node) => string): CellBound[] {
    const byLabel = new Map<string, CellBound>()
    for (const node of this.nodes.values()) {
      if (node.atLeast === null && node.atMost === null) continue
      const top = this.top(node)
      if (top.fixed !== null) {
        if (top.fixed < (node.atLeast ?? top.fixed) || top.fixed > (node.atMost ?? top.fixed))
          throw new Contradiction(`${words(node)} is held at ${top.fixed}, which is beyond its bound`)
        continue
      }
      const label = labels.get(top)!
      const known = byLabel.get(label)
      const bound = {
        label,
        least: tightest(Math.max, known?.least ?? null, node.atLeast),
        most: tightest(Math.min, known?.most ?? null, node.atMost)
      }
      if (bound.least !== null && bound.most !== null && bound.least >= bound.most)
        throw new Contradiction(
          `nothing lies between the bounds of ${words(node)}: at least ${bound.least} and at most ${bound.most}`
        )
      byLabel.set(label, bound)
    }
    return [...byLabel.values()]
  }
}

function contradicts({ words }: Equation): Contradiction {
  return words === null
    ? new Contradiction('its constraints leave no scale for a factor', 'Use the scaling by factor variance, or fewer constraints.')
    : new Contradiction(`that ${words} contradicts the fixed cells and constraints before it`, 'Remove one of them.')
}

function tightest(pick: (a: number, b: number) => number, a: number | null, b: number | null): number | null {
  return a === null ? b : b === null ? a : pick(a, b)
}

/** a, b, ... z, aa, ab, ... */
function letters(index: number): string {
  const last = String.fromCharCode(97 + (index % 26))
  return index < 26 ? last : letters(Math.floor(index / 26) - 1) + last
}
