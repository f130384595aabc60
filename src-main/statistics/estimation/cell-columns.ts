/**
 * How each free cell moves a group's moments, as columns of B = [I, E, L] (p x P, P = p + 2m; E = Lambda A, L = Lambda C):
 *
 *     dSigma = c (u v' + v u')        dmu = w s
 *
 * with u, v, s columns of B and w either 1 or the mean of a factor. All derivatives are entries of B' M B for some p x p M.
 */
import { multiply } from '../matrix/symmetric.ts'
import type { CompiledGroup } from '../model/compile.ts'
import type { GroupState } from '../model/implied-moments.ts'

/** Per free cell of a group. */
export interface CellColumns {
  /** Indices into B; -1 for a cell that does not move Sigma. */
  u: Int32Array
  v: Int32Array
  /** c; 0 for a cell that does not move Sigma. */
  c: Float64Array
  /** Index into B; -1 for a cell that does not move mu. */
  s: Int32Array
  /** The factor whose mean is w; -1 where w = 1. */
  meanFactor: Int32Array
}

export function cellColumns(group: CompiledGroup, p: number, m: number, means: boolean): CellColumns {
  const count = group.free.length
  const out: CellColumns = {
    u: new Int32Array(count).fill(-1),
    v: new Int32Array(count).fill(-1),
    c: new Float64Array(count),
    s: new Int32Array(count).fill(-1),
    meanFactor: new Int32Array(count).fill(-1)
  }
  group.free.forEach(({ matrix, row, column }, i) => {
    const set = (u: number, v: number, c: number) => {
      out.u[i] = u
      out.v[i] = v
      out.c[i] = c
    }
    const symmetric = row === column ? 0.5 : 1
    if (matrix === 'lambda') set(row, p + m + column, 1)
    if (matrix === 'beta') set(p + row, p + m + column, 1)
    if (matrix === 'psi') set(p + row, p + column, symmetric)
    if (matrix === 'theta') set(row, column, symmetric)
    if (means && matrix !== 'psi' && matrix !== 'theta') {
      out.s[i] = matrix === 'lambda' || matrix === 'nu' ? row : p + row
      if (matrix === 'lambda' || matrix === 'beta') out.meanFactor[i] = column
    }
  })
  return out
}

/** columns = [E, L], p x 2m */
export function sideBySide(state: GroupState, columns: Float64Array): void {
  const { p, m, e, l } = state
  for (let i = 0; i < p; i++) {
    for (let k = 0; k < m; k++) {
      columns[i * 2 * m + k] = e[i * m + k]!
      columns[i * 2 * m + m + k] = l[i * m + k]!
    }
  }
}

/**
 * The whole form B' M B (P x P) of a symmetric p x p matrix M.
 *
 * @param columns [E, L], p x 2m
 * @param product work space p x 2m; holds M [E, L] afterwards
 */
export function wholeForm(
  m: Float64Array,
  columns: Float64Array,
  p: number,
  size: number,
  product: Float64Array,
  form: Float64Array
): void {
  const wide = size - p
  multiply(m, columns, p, p, wide, product)
  for (let i = 0; i < p; i++) {
    for (let j = 0; j < p; j++) form[i * size + j] = m[i * p + j]!
    for (let k = 0; k < wide; k++) {
      form[i * size + p + k] = product[i * wide + k]!
      form[(p + k) * size + i] = product[i * wide + k]!
    }
  }
  for (let k = 0; k < wide; k++) {
    for (let l = 0; l <= k; l++) {
      let sum = 0
      for (let i = 0; i < p; i++) sum += columns[i * wide + k]! * product[i * wide + l]!
      form[(p + k) * size + p + l] = sum
      form[(p + l) * size + p + k] = sum
    }
  }
}

/** (B' M B)[u, v] alone; `product` = M [E, L]. */
export function formEntry(
  m: Float64Array,
  columns: Float64Array,
  product: Float64Array,
  p: number,
  wide: number,
  u: number,
  v: number
): number {
  if (u < p && v < p) return m[u * p + v]!
  if (u < p) return product[u * wide + v - p]!
  if (v < p) return product[v * wide + u - p]!
  let sum = 0
  for (let i = 0; i < p; i++) sum += columns[i * wide + u - p]! * product[i * wide + v - p]!
  return sum
}

/** x' B[:, s] */
export function columnDot(x: Float64Array, columns: Float64Array, p: number, wide: number, s: number): number {
  if (s < p) return x[s]!
  let sum = 0
  for (let i = 0; i < p; i++) sum += x[i]! * columns[i * wide + s - p]!
  return sum
}
