/**
 * Casewise derivatives of the normal log-likelihood and their cross-products, case by case and never as moment matrices.
 *
 * For one case with deviation e from the centre, and B = [I, E, L], W = Sigma^-1, x = B'We, G = B'WB (the notation of
 * cell-columns.ts), the derivative with respect to a free cell is
 *
 *     h = c (x_u x_v - G_uv) + w x_s
 *
 * Centred at the model's mean mu this is the score of the case; centred at the sample mean, and less its own average, it
 * is Delta' V z of the case, z the deviations of first and second moments from the sample's (methods: section 4).
 */
import { dotRows, positiveInverse } from '../matrix/symmetric.ts'
import type { CompiledGroup, CompiledModel } from '../model/compile.ts'
import type { GroupState } from '../model/implied-moments.ts'
import { completeCaseMoments } from '../moments/sample-moments.ts'
import { type CellColumns, cellColumns, sideBySide, wholeForm } from './cell-columns.ts'

/** The cases of one group: complete rows only. */
export interface CaseGroup {
  /** n x p row-major, without NaN */
  rows: Float64Array
  /** The group's part of N in every formula: n, or n - 1 under the Wishart convention. */
  size: number
}

export interface CaseSums {
  n: number
  /** The gammas that this group's cells are made of, q_g of them. */
  gammas: Int32Array
  /** Average of h over cases (q_g). */
  mean: Float64Array
  /** Average of h h' over cases, q_g x q_g, lower triangle. */
  cross: Float64Array
  /** Averages of e'We and of its square. */
  distance: number
  distanceSquared: number
  /** Sigma^-1, p x p */
  w: Float64Array
}

/** Cases handled at once, so that cross-products run along memory. */
const block = 64

/**
 * Sums over the cases of group `g`. O(n (p^2 + q_g^2)) time; memory O(p^2 + q_g^2), whatever n.
 *
 * @param centre p, what deviations are taken from
 * Throws a plain Error when Sigma is not positive definite: `state` must be a solution.
 */
export function caseSums(model: CompiledModel, g: number, state: GroupState, rows: Float64Array, centre: Float64Array): CaseSums {
  const { p } = state
  const n = rows.length / p
  const scores = new CaseScores(model, g, state)
  const q = scores.gammas.length
  const mean = new Float64Array(q)
  const cross = new Float64Array(q * q)
  const h = new Float64Array(q * block)
  let distance = 0
  let distanceSquared = 0
  for (let start = 0; start < n; start += block) {
    const count = Math.min(block, n - start)
    h.fill(0)
    for (let k = 0; k < count; k++) {
      const d = scores.write(rows, (start + k) * p, centre, h, k)
      distance += d
      distanceSquared += d * d
    }
    for (let a = 0; a < q; a++) {
      for (let k = 0; k < count; k++) mean[a]! += h[a * block + k]!
      for (let b = 0; b <= a; b++) cross[a * q + b]! += dotRows(h, a * block, h, b * block, count)
    }
  }
  for (let a = 0; a < q; a++) mean[a]! /= n
  for (let at = 0; at < cross.length; at++) cross[at]! /= n
  return { n, gammas: scores.gammas, mean, cross, distance: distance / n, distanceSquared: distanceSquared / n, w: scores.w }
}

/** `cross` is the covariance matrix of the derivatives, Delta'V Gamma V Delta of the group. */
export interface MomentSums extends CaseSums {
  /** S, p x p, divisor n */
  covariance: Float64Array
}

/** The sums of group `g` centred at its sample mean. */
export function momentSums(model: CompiledModel, g: number, state: GroupState, rows: Float64Array): MomentSums {
  const { mean, covariance } = completeCaseMoments(rows, state.p)
  const sums = caseSums(model, g, state, rows, mean)
  const q = sums.gammas.length
  for (let a = 0; a < q; a++) for (let b = 0; b <= a; b++) sums.cross[a * q + b]! -= sums.mean[a]! * sums.mean[b]!
  return { ...sums, covariance }
}

/** Adds weight times a group's `cross` into the lower triangle of `target` (q x q). */
export function addCross({ gammas, cross }: CaseSums, weight: number, target: Float64Array, q: number): void {
  const own = gammas.length
  // `gammas` ascends, so a lower triangle lands in a lower triangle.
  for (let a = 0; a < own; a++) {
    for (let b = 0; b <= a; b++) target[gammas[a]! * q + gammas[b]!]! += weight * cross[a * own + b]!
  }
}

/** What does not change from case to case, and the work space of one case. */
class CaseScores {
  readonly gammas: Int32Array
  readonly w: Float64Array
  private readonly p: number
  private readonly wide: number
  private readonly cells: CellColumns
  private readonly group: CompiledGroup
  /** Position of each cell's gammas in `gammas`. */
  private readonly places: Int32Array[]
  /** [E, L], 2m x p: a column of B stands along memory */
  private readonly columns: Float64Array
  /** Per cell c G_uv, and w. */
  private readonly expected: Float64Array
  private readonly meanWeight: Float64Array
  private readonly e: Float64Array
  private readonly x: Float64Array

  constructor(model: CompiledModel, g: number, state: GroupState) {
    const { p, m } = state
    this.p = p
    this.wide = 2 * m
    this.group = model.groups[g]!
    this.cells = cellColumns(this.group, p, m, model.meanStructure)
    this.gammas = Int32Array.from(new Set(this.group.free.flatMap((cell) => [...cell.gammas]))).sort()
    const place = new Map([...this.gammas].map((gamma, at) => [gamma, at]))
    this.places = this.group.free.map((cell) => cell.gammas.map((gamma) => place.get(gamma)!))
    const w = positiveInverse(state.sigma, p)
    if (w === null) throw new Error('an implied covariance matrix is not positive definite')
    this.w = w
    this.columns = new Float64Array(2 * m * p)
    for (let i = 0; i < p; i++) {
      for (let k = 0; k < m; k++) {
        this.columns[k * p + i] = state.e[i * m + k]!
        this.columns[(m + k) * p + i] = state.l[i * m + k]!
      }
    }
    this.expected = this.expectedProducts(state)
    this.meanWeight = Float64Array.from(this.cells.meanFactor, (factor) => (factor < 0 ? 1 : state.factorMean[factor]!))
    this.e = new Float64Array(p)
    this.x = new Float64Array(p + 2 * m)
  }

  /** Adds h of the case at rows[offset...] into column k of `h` (q_g x block, zero there before); returns e'We. */
  write(rows: Float64Array, offset: number, centre: Float64Array, h: Float64Array, k: number): number {
    const { p, e, x, w, wide, columns, cells, expected, meanWeight, places } = this
    for (let i = 0; i < p; i++) e[i] = rows[offset + i]! - centre[i]!
    for (let i = 0; i < p; i++) x[i] = dotRows(w, i * p, e, 0, p)
    for (let i = 0; i < wide; i++) x[p + i] = dotRows(columns, i * p, x, 0, p)
    const { u, v, c, s } = cells
    const { free } = this.group
    for (let i = 0; i < free.length; i++) {
      let value = u[i]! < 0 ? 0 : c[i]! * x[u[i]!]! * x[v[i]!]! - expected[i]!
      if (s[i]! >= 0) value += meanWeight[i]! * x[s[i]!]!
      const { weights } = free[i]!
      const at = places[i]!
      for (let j = 0; j < at.length; j++) h[at[j]! * block + k]! += weights[j]! * value
    }
    return dotRows(e, 0, x, 0, p)
  }

  /** c G_uv of every cell that moves Sigma; 0 of the others. */
  private expectedProducts(state: GroupState): Float64Array {
    const { p, wide, w, cells } = this
    const size = p + wide
    const columns = new Float64Array(p * wide)
    sideBySide(state, columns)
    const form = new Float64Array(size * size)
    wholeForm(w, columns, p, size, new Float64Array(p * wide), form)
    return cells.c.map((c, i) => (cells.u[i]! < 0 ? 0 : c * form[cells.u[i]! * size + cells.v[i]!]!))
  }
}
