/**
 * A second opinion on a fit, sharing nothing with the program but the cells: dense matrices of ml-matrix and a plain BFGS
 * (Nocedal & Wright 2006, algorithm 6.1). Slow and simple on purpose.
 */
import { CholeskyDecomposition, inverse, Matrix } from 'ml-matrix'
import type { Cell, GroupCells, ModelCells } from '../../src-main/statistics/model/cells.ts'
import type { GroupMoments, SampleMoments } from '../../src-main/statistics/moments/sample-moments.ts'

interface Part {
  observed: number[]
  weight: number
  mean: Matrix
  covariance: Matrix
}

interface Group {
  cells: GroupCells
  parts: Part[]
}

/**
 * N F at the minimum found from `start`, one value a label; labels bound by a linear constraint are worked out from the
 * others.
 */
export function independentT(model: ModelCells, moments: SampleMoments, start: Map<string, number>): number {
  const total = moments.groups.reduce((sum, group) => sum + group.n, 0)
  const groups = model.groups.map((cells, g) => ({ cells, parts: partsOf(moments.groups[g]!, total) }))
  const floor = groups.reduce((sum, { parts }, g) => sum + unrestricted(parts, moments.groups[g]!), 0)
  const bound = new Set(model.constraints.map((constraint) => constraint.terms.at(-1)!.label))
  const free = [...start.keys()].filter((label) => !bound.has(label))
  const unit = free.map((label) => Math.abs(start.get(label)!) + 0.1)
  const values = (x: number[]): Map<string, number> => {
    const found = new Map(free.map((label, k) => [label, unit[k]! * x[k]!]))
    for (const { terms, equals } of model.constraints) {
      const own = terms.at(-1)!
      const rest = terms.slice(0, -1).reduce((sum, term) => sum + term.weight * found.get(term.label)!, 0)
      found.set(own.label, (equals - rest) / own.weight)
    }
    return found
  }
  const objective = (x: number[]): Evaluation | null => {
    const at = valueAndSlope(groups, values(x), floor)
    if (at === null) return null
    for (const { terms } of model.constraints) {
      const own = terms.at(-1)!
      const slope = at.slope.get(own.label)! / own.weight
      for (const { label, weight } of terms.slice(0, -1)) at.slope.set(label, at.slope.get(label)! - weight * slope)
    }
    return { value: at.value, gradient: free.map((label, k) => unit[k]! * at.slope.get(label)!) }
  }
  return (
    total *
    bfgs(
      objective,
      free.map((label, k) => start.get(label)! / unit[k]!)
    )
  )
}

function partsOf(group: GroupMoments, total: number): Part[] {
  const p = group.mean!.length
  const whole = {
    observed: Int32Array.from({ length: p }, (_, i) => i),
    n: group.n,
    mean: group.mean,
    covariance: group.covariance
  }
  return (group.patterns ?? [whole]).map(({ observed, n, mean, covariance }) => ({
    observed: [...observed],
    weight: n / total,
    mean: Matrix.columnVector([...mean!]),
    covariance: Matrix.from1DArray(observed.length, observed.length, [...covariance])
  }))
}

function unrestricted(parts: Part[], { mean, covariance }: GroupMoments): number {
  const sigma = Matrix.from1DArray(mean!.length, mean!.length, [...covariance])
  return parts.reduce((sum, part) => sum + partValue(part, sigma, Matrix.columnVector([...mean!]))!.value, 0)
}

/** Sigma and mu as the literature writes them, with what their derivatives need. */
function implied(cells: GroupCells, of: Map<string, number>) {
  const number = (cell: Cell) => (typeof cell === 'number' ? cell : of.get(cell)!)
  const sheet = (rows: Cell[][]) => new Matrix(rows.map((row) => row.map(number)))
  const column = (cell: Cell[]) => Matrix.columnVector(cell.map(number))
  const lambda = sheet(cells.loadings)
  const a = inverse(Matrix.sub(Matrix.eye(cells.regressions.length), sheet(cells.regressions)))
  const c = a.mmul(sheet(cells.factorCovariances)).mmul(a.transpose())
  const factorMean = a.mmul(column(cells.factorMeans!))
  return {
    lambda,
    c,
    e: lambda.mmul(a),
    factorMean,
    sigma: Matrix.add(lambda.mmul(c).mmul(lambda.transpose()), sheet(cells.residualCovariances)),
    mu: Matrix.add(column(cells.intercepts!), lambda.mmul(factorMean))
  }
}

/** weight [ln|Sigma| + tr(D W)] of the observed part, with dF/dSigma and dF/dmu; null where Sigma is not positive definite. */
function partValue({ observed, weight, mean, covariance }: Part, sigma: Matrix, mu: Matrix) {
  const selected = sigma.selection(observed, observed)
  // Symmetric to the last bit, which the decomposition asks for.
  const cholesky = new CholeskyDecomposition(Matrix.add(selected, selected.transpose()).div(2))
  if (!cholesky.isPositiveDefinite()) return null
  const w = cholesky.solve(Matrix.eye(observed.length))
  const d = Matrix.sub(mean, mu.selection(observed, [0]))
  const data = Matrix.add(covariance, d.mmul(d.transpose()))
  const logDeterminant = 2 * cholesky.lowerTriangularMatrix.diagonal().reduce((sum, x) => sum + Math.log(x), 0)
  return {
    value: weight * (logDeterminant + w.mmul(data).trace()),
    bySigma: Matrix.mul(Matrix.sub(w, w.mmul(data).mmul(w)), weight),
    byMu: Matrix.mul(w.mmul(d), -2 * weight)
  }
}

/** F and its slope along every label, both halves of a symmetric matrix counted (methods: section 2). */
function valueAndSlope(groups: Group[], of: Map<string, number>, floor: number) {
  let value = -floor
  const slope = new Map<string, number>()
  for (const { cells, parts } of groups) {
    const { sigma, mu, lambda, c, e, factorMean } = implied(cells, of)
    const bySigma = Matrix.zeros(sigma.rows, sigma.rows)
    const byMu = Matrix.zeros(sigma.rows, 1)
    for (const part of parts) {
      const found = partValue(part, sigma, mu)
      if (found === null) return null
      value += found.value
      part.observed.forEach((i, a) => {
        byMu.set(i, 0, byMu.get(i, 0) + found.byMu.get(a, 0))
        part.observed.forEach((j, b) => {
          bySigma.set(i, j, bySigma.get(i, j) + found.bySigma.get(a, b))
        })
      })
    }
    const byLambda = Matrix.add(bySigma.mmul(lambda).mmul(c).mul(2), byMu.mmul(factorMean.transpose()))
    const sheets: [Cell[][], Matrix][] = [
      [cells.loadings, byLambda],
      [cells.regressions, e.transpose().mmul(byLambda)],
      [cells.factorCovariances, e.transpose().mmul(bySigma).mmul(e)],
      [cells.residualCovariances, bySigma],
      [cells.intercepts!.map((cell) => [cell]), byMu],
      [cells.factorMeans!.map((cell) => [cell]), e.transpose().mmul(byMu)]
    ]
    for (const [sheet, by] of sheets) {
      sheet.forEach((row, i) => {
        row.forEach((cell, j) => {
          if (typeof cell === 'string') slope.set(cell, (slope.get(cell) ?? 0) + by.get(i, j))
        })
      })
    }
  }
  return { value, slope }
}

interface Evaluation {
  value: number
  gradient: number[]
}

/** The smallest value met from `start`. */
function bfgs(objective: (x: number[]) => Evaluation | null, start: number[]): number {
  let x = start
  let here = objective(x)
  if (here === null) throw new Error('the start is no model')
  let h = Matrix.eye(x.length).mul(0.1)
  for (let iteration = 0; iteration < 2000; iteration++) {
    const g = Matrix.columnVector(here.gradient)
    if (g.norm() < 1e-7) break
    const step = h.mmul(g).mul(-1)
    const next = descend(objective, x, here, step)
    if (next === null) break
    const s = Matrix.columnVector(next.x.map((value, k) => value - x[k]!))
    const y = Matrix.columnVector(next.at.gradient.map((value, k) => value - here!.gradient[k]!))
    h = updated(h, s, y)
    x = next.x
    here = next.at
  }
  return here.value
}

function descend(objective: (x: number[]) => Evaluation | null, x: number[], here: Evaluation, step: Matrix) {
  const slope = step.dot(Matrix.columnVector(here.gradient))
  for (let length = 1; length > 1e-10; length /= 2) {
    const trial = x.map((value, k) => value + length * step.get(k, 0))
    const at = objective(trial)
    if (at !== null && at.value <= here.value + 1e-4 * length * slope) return { x: trial, at }
  }
  return null
}

/** H (I - s y'/s'y) on both sides plus s s'/s'y, multiplied out; unchanged where the curvature is not positive. */
function updated(h: Matrix, s: Matrix, y: Matrix): Matrix {
  const sy = s.dot(y)
  if (!(sy > 1e-12 * s.norm() * y.norm())) return h
  const hy = h.mmul(y)
  const cross = hy.mmul(s.transpose())
  const outer = s.mmul(s.transpose()).mul((1 + y.dot(hy) / sy) / sy)
  return Matrix.add(h, outer).sub(Matrix.add(cross, cross.transpose()).div(sy))
}
