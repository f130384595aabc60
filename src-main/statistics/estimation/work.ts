/**
 * The work space of one group's discrepancy: what an evaluation leaves for the derivatives (normal-likelihood.ts).
 */
import type { CompiledGroup } from '../model/compile.ts'
import type { GroupState } from '../model/implied-moments.ts'
import type { CellColumns } from './cell-columns.ts'

/** One missingness pattern of a group: its sufficient statistics and the work space that `evaluate` leaves for `derive`. */
export interface PatternWork {
  /** k, indicators observed */
  k: number
  /** Indices of the observed indicators, ascending. */
  observed: Int32Array
  complete: boolean
  /** n_k / n_g */
  share: number
  sample: Float64Array
  sampleMean: Float64Array | null
  /** k x k each, at the gamma last evaluated: W and Q = W D W, whole once `ready`. */
  w: Float64Array
  q: Float64Array
  ready: boolean
  /** Which way the last evaluation went (pattern-value.ts): dense, or by P and H or X (k x m each) and T^-1 (k). */
  dense: boolean
  half: Float64Array
  image: Float64Array
  precision: Float64Array
  /** k: ybar_k - mu_k, and W d */
  d: Float64Array
  z: Float64Array
}

/** What the patterns of a group with diagonal Theta share: R and K (m x m), Lambda R (p x m). */
export interface StructureWork {
  root: Float64Array
  kernel: Float64Array
  load: Float64Array
}

export interface GroupWork extends CellColumns {
  group: CompiledGroup
  state: GroupState
  /** n_g / N */
  weight: number
  p: number
  /** P = p + 2m */
  size: number
  patterns: PatternWork[]
  /** h_g */
  unrestricted: number
  /** p x p each: sum over patterns of W~ - Q~; a padded matrix. */
  omega: Float64Array
  padded: Float64Array
  /** p: sum over patterns of z~ */
  z: Float64Array
  /** p x 2m: [E, L]; and a product with it */
  columns: Float64Array
  product: Float64Array
  /** P x P */
  form: Float64Array
  /** Per free cell: w. */
  meanWeight: Float64Array
  /** True when every cell is one gamma with weight 1, and then that gamma. */
  plain: boolean
  gamma: Int32Array
  /** Second derivatives by pairs of free cells, made when first wanted. */
  pairs: Float64Array | null
  /** null where some residual covariance is free or fixed at another value than 0, or factors are many. */
  structure: StructureWork | null
  scratch: { chol: Float64Array; first: Int32Array; projection: Float64Array }
}
