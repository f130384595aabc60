/**
 * Linear equations among the parameters of a model, A theta = b: eliminated, and each judged against those before it.
 */
import type { LinearConstraint } from './cells.ts'

/** Coefficients this small beside the largest of their equation are what rounding left over. */
const zero = 1e-11

/** What an equation is beside those before it. */
export type ConstraintStanding = 'independent' | 'implied' | 'contradictory'

/** t labels; every row is of length t + 1 and ends in the right-hand side. */
export interface Elimination {
  /** By the index of the label that its equation gives away: the row with 1 there, and 0 at every other pivot. */
  pivots: Map<number, Float64Array>
  /** One an equation, in order. */
  standing: ConstraintStanding[]
}

/**
 * Gauss-Jordan elimination; the largest coefficient of each equation is its pivot, among the labels that may be given away
 * where there is one.
 *
 * @param keep labels that should stay parameters of their own (bounded ones)
 * @throws Error for a label that is not among `labels` (a bug of the caller)
 */
export function eliminate(
  labels: readonly string[],
  constraints: readonly LinearConstraint[],
  keep: ReadonlySet<string> = new Set()
): Elimination {
  const t = labels.length
  const index = new Map(labels.map((label, i) => [label, i]))
  const kept = labels.map((label) => keep.has(label))
  const pivots = new Map<number, Float64Array>()
  const standing = constraints.map((constraint): ConstraintStanding => {
    const row = equationRow(constraint, index, t)
    const size = largest(row)
    const total = Math.max(size, Math.abs(row[t]!))
    for (const [pivot, other] of pivots) subtract(row, other, pivot)
    if (largest(row) <= zero * size) return Math.abs(row[t]!) <= 1e-9 * total ? 'implied' : 'contradictory'
    const pivot = choosePivot(row, kept, zero * size)
    const by = row[pivot]!
    for (let i = 0; i <= t; i++) row[i] = i < t && Math.abs(row[i]!) <= zero * size ? 0 : row[i]! / by
    for (const other of pivots.values()) subtract(other, row, pivot)
    pivots.set(pivot, row)
    return 'independent'
  })
  return { pivots, standing }
}

function equationRow({ terms, equals }: LinearConstraint, index: ReadonlyMap<string, number>, t: number): Float64Array {
  const row = new Float64Array(t + 1)
  for (const { label, weight } of terms) {
    const at = index.get(label)
    if (at === undefined) throw new Error(`constraint names the unknown label ${label}`)
    row[at]! += weight
  }
  row[t] = equals
  return row
}

function largest(row: Float64Array): number {
  let size = 0
  for (let i = 0; i < row.length - 1; i++) size = Math.max(size, Math.abs(row[i]!))
  return size
}

/** The largest coefficient among those not kept; among all where only kept ones are left. */
function choosePivot(row: Float64Array, kept: readonly boolean[], least: number): number {
  let free = -1
  let any = 0
  for (let i = 0; i < kept.length; i++) {
    const size = Math.abs(row[i]!)
    if (size > Math.abs(row[any]!)) any = i
    if (!kept[i] && size > least && (free < 0 || size > Math.abs(row[free]!))) free = i
  }
  return free >= 0 ? free : any
}

/** row -= row[pivot] * other, where other has 1 at the pivot. */
function subtract(row: Float64Array, other: Float64Array, pivot: number): void {
  const factor = row[pivot]!
  if (factor === 0) return
  for (let i = 0; i < row.length; i++) row[i]! -= factor * other[i]!
  row[pivot] = 0
}
