/**
 * A model of cells, compiled: every free cell of every group knows where it stands and which gammas make it.
 *
 * theta (one entry a label) obeys theta = K gamma + c (methods: section 1). Without linear constraints K is the identity;
 * with them the pivots are eliminated, so that gamma is a subset of theta and the q gammas are independent.
 */
import type { Cell, CellBound, GroupCells, LinearConstraint, ModelCells } from './cells.ts'
import { eliminate } from './constraints.ts'

export type MatrixName = 'lambda' | 'beta' | 'psi' | 'theta' | 'nu' | 'alpha'

/** One free cell: where it stands and its row of K. A symmetric pair is one cell with row >= column. */
export interface FreeCell {
  matrix: MatrixName
  row: number
  column: number
  label: string
  /** Index into theta. */
  theta: number
  /** value = constant + sum_k weights[k] gamma[gammas[k]] */
  constant: number
  gammas: Int32Array
  weights: Float64Array
}

export interface CompiledGroup {
  name: string | null
  /** Values of the fixed cells, 0 where free: p x m, m x m, m x m, p x p, p, m. */
  lambda: Float64Array
  beta: Float64Array
  psi: Float64Array
  theta: Float64Array
  nu: Float64Array
  alpha: Float64Array
  free: FreeCell[]
}

export interface GammaBounds {
  least: Float64Array
  most: Float64Array
}

export interface CompiledModel {
  indicators: string[]
  factors: string[]
  groups: CompiledGroup[]
  /** Labels of theta: group by group those of that group alone, intercepts first; then the shared ones. */
  labels: string[]
  /** The label each gamma is named after. */
  gammaLabels: string[]
  /** q = length of gamma. */
  parameters: number
  /** Limits of the gammas, q each, infinite where a side is open; null when no gamma has any. */
  bounds: GammaBounds | null
  meanStructure: boolean
  /** True when some factor has predictors, i.e. B is not zero. */
  hasRegressions: boolean
  /** sum_g [p(p+1)/2 (+ p)] - q; may be negative for a model with too many parameters. */
  df: number
}

/** Compiles; throws a plain Error on cells of wrong shape or contradictory constraints (a bug of the caller). */
export function compileModel(model: ModelCells): CompiledModel {
  const p = model.indicators.length
  const meanStructure = model.groups[0]?.intercepts != null
  const theta = new Map<string, number>()
  const groups = model.groups.map((cells) => compileGroup(cells, p, model.factors.length, theta))
  const labels = sharedLast(groups)
  labels.forEach((label, at) => {
    theta.set(label, at)
  })
  for (const group of groups) for (const cell of group.free) cell.theta = theta.get(cell.label)!
  const boundOf = new Map((model.bounds ?? []).map((bound) => [bound.label, bound]))
  const rows = reduce(labels, model.constraints, new Set(boundOf.keys()))
  for (const group of groups) for (const cell of group.free) Object.assign(cell, rows.cells[cell.theta])
  const moments = groups.length * ((p * (p + 1)) / 2 + (meanStructure ? p : 0))
  return {
    indicators: model.indicators,
    factors: model.factors,
    groups,
    labels,
    gammaLabels: rows.gammaLabels,
    parameters: rows.gammaLabels.length,
    bounds: gammaBounds(rows.gammaLabels, boundOf),
    meanStructure,
    hasRegressions: groups.some((g) => g.beta.some((v) => v !== 0) || g.free.some((c) => c.matrix === 'beta')),
    df: moments - rows.gammaLabels.length
  }
}

/** Throws a plain Error on a bound of what is no gamma: a label that is not in the model, or that the constraints give away. */
function gammaBounds(gammaLabels: readonly string[], boundOf: ReadonlyMap<string, CellBound>): GammaBounds | null {
  if (boundOf.size === 0) return null
  for (const label of boundOf.keys())
    if (!gammaLabels.includes(label)) throw new Error(`the bounded label ${label} is no parameter`)
  return {
    least: Float64Array.from(gammaLabels, (label) => boundOf.get(label)?.least ?? Number.NEGATIVE_INFINITY),
    most: Float64Array.from(gammaLabels, (label) => boundOf.get(label)?.most ?? Number.POSITIVE_INFINITY)
  }
}

/**
 * Labels in the order that keeps the information sparse: parameters of different groups never meet, and a saturated mean
 * structure does not meet the covariance structure, so each stands in a block of its own, with the shared ones last.
 */
function sharedLast(groups: readonly CompiledGroup[]): string[] {
  const owner = new Map<string, number>()
  groups.forEach((group, g) => {
    for (const { label } of group.free) owner.set(label, (owner.get(label) ?? g) === g ? g : groups.length)
  })
  const rank = new Map<string, number>()
  for (const { free } of groups) {
    for (const { label, matrix } of free) if (!rank.has(label)) rank.set(label, 2 * owner.get(label)! + (matrix === 'nu' ? 0 : 1))
  }
  return [...rank.keys()].sort((a, b) => rank.get(a)! - rank.get(b)!)
}

/** Where a matrix's cells stand: its name, its source and whether only the lower triangle counts. */
function compileGroup(cells: GroupCells, p: number, m: number, theta: Map<string, number>): CompiledGroup {
  const group: CompiledGroup = {
    name: cells.name,
    lambda: new Float64Array(p * m),
    beta: new Float64Array(m * m),
    psi: new Float64Array(m * m),
    theta: new Float64Array(p * p),
    nu: new Float64Array(p),
    alpha: new Float64Array(m),
    free: []
  }
  const place = (matrix: MatrixName, row: number, column: number, columns: number, cell: Cell, symmetric: boolean) => {
    if (typeof cell === 'number') {
      group[matrix][row * columns + column] = cell
      return
    }
    if (symmetric && column > row) return
    if (!theta.has(cell)) theta.set(cell, theta.size)
    group.free.push(freeCell(matrix, row, column, cell, theta.get(cell)!))
  }
  const sheet = (matrix: MatrixName, rows: Cell[][], columns: number, symmetric = false) => {
    rows.forEach((line, row) => {
      if (line.length !== columns) throw new Error(`${matrix} has a row of ${line.length} cells, not ${columns}`)
      line.forEach((cell, column) => {
        place(matrix, row, column, columns, cell, symmetric)
      })
    })
  }
  sheet('lambda', cells.loadings, m)
  sheet('beta', cells.regressions, m)
  sheet('psi', cells.factorCovariances, m, true)
  sheet('theta', cells.residualCovariances, p, true)
  cells.intercepts?.forEach((cell, row) => {
    place('nu', row, 0, 1, cell, false)
  })
  cells.factorMeans?.forEach((cell, row) => {
    place('alpha', row, 0, 1, cell, false)
  })
  return group
}

function freeCell(matrix: MatrixName, row: number, column: number, label: string, theta: number): FreeCell {
  return { matrix, row, column, label, theta, constant: 0, gammas: new Int32Array(), weights: new Float64Array() }
}

interface ReducedRow {
  constant: number
  gammas: Int32Array
  weights: Float64Array
}

/** A theta = b solved for its pivots, so that the labels left over are the gammas. */
function reduce(
  labels: string[],
  constraints: readonly LinearConstraint[],
  bounded: ReadonlySet<string>
): { cells: ReducedRow[]; gammaLabels: string[] } {
  const t = labels.length
  const { pivots, standing } = eliminate(labels, constraints, bounded)
  if (standing.includes('contradictory')) throw new Error('the constraints contradict each other')
  const gammaOf = new Map<number, number>()
  for (let i = 0; i < t; i++) if (!pivots.has(i)) gammaOf.set(i, gammaOf.size)
  const cells = labels.map((_, i) => reducedRow(i, t, pivots.get(i), gammaOf))
  return { cells, gammaLabels: labels.filter((_, i) => gammaOf.has(i)) }
}

function reducedRow(i: number, t: number, equation: Float64Array | undefined, gammaOf: Map<number, number>): ReducedRow {
  if (equation === undefined) return { constant: 0, gammas: Int32Array.of(gammaOf.get(i)!), weights: Float64Array.of(1) }
  const gammas: number[] = []
  const weights: number[] = []
  for (const [column, gamma] of gammaOf) {
    if (equation[column] === 0) continue
    gammas.push(gamma)
    weights.push(-equation[column]!)
  }
  return { constant: equation[t]!, gammas: Int32Array.from(gammas), weights: Float64Array.from(weights) }
}

/** The value of a free cell at gamma. */
export function cellValue(cell: FreeCell, gamma: Float64Array): number {
  let value = cell.constant
  for (let k = 0; k < cell.gammas.length; k++) value += cell.weights[k]! * gamma[cell.gammas[k]!]!
  return value
}
