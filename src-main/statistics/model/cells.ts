/**
 * A model as cells: what each number of its matrices is, in each group (methods: section 1).
 *
 * p indicators, m factors. A number is a fixed value; a string is the label of a free parameter, and the same label in
 * two cells or groups is an equality constraint. `constraints` adds linear equations among labels (effects coding, and any
 * other), `bounds` limits of single labels.
 */

/** The kinds of cell a model is made of; the words of the trade. */
export const cellParts = [
  'loading',
  'residual variance',
  'residual covariance',
  'factor variance',
  'factor covariance',
  'intercept',
  'factor mean',
  'factor regression'
] as const
export type CellPart = (typeof cellParts)[number]

/** A number is fixed, a string a free parameter's label. */
export type Cell = number | string

/** One group's matrices. Symmetric ones are given whole and must be symmetric. */
export interface GroupCells {
  name: string | null
  /** p x m */
  loadings: Cell[][]
  /** m x m, row = outcome, column = predictor */
  regressions: Cell[][]
  /** m x m symmetric: Psi, of factors without predictors the covariances, of others the disturbances' */
  factorCovariances: Cell[][]
  /** p x p symmetric: Theta */
  residualCovariances: Cell[][]
  /** p; null where only covariances are modelled */
  intercepts: Cell[] | null
  /** m; null where only covariances are modelled */
  factorMeans: Cell[] | null
}

/** sum_i weight_i theta_i = equals */
export interface LinearConstraint {
  terms: { label: string; weight: number }[]
  equals: number
}

/** least <= theta <= most; null where that side is open. */
export interface CellBound {
  label: string
  least: number | null
  most: number | null
}

export interface ModelCells {
  indicators: string[]
  factors: string[]
  groups: GroupCells[]
  constraints: LinearConstraint[]
  /** Limits of free cells, at most one a label; none when left out. They leave the degrees of freedom as they are. */
  bounds?: CellBound[]
}
