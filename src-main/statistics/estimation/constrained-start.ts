/**
 * Starting values that obey the linear constraints of a model and stay near what was wanted without them.
 *
 * Equations that hang together are met at once. Where they bind variances only, in the sense of relative entropy: theta =
 * target exp(A' lambda), which keeps every variance positive (Csiszár 1975); else by least squares in the targets' own units.
 */
import { cholesky, choleskySolve } from '../matrix/symmetric.ts'
import { type CompiledModel, cellValue, type FreeCell } from '../model/compile.ts'

/** sum of weight x label = total */
interface Equation {
  weights: Map<string, number>
  total: number
}

/**
 * gamma (q) near the targets.
 *
 * @param target the value wanted for a label, null where none is known
 */
export function startWithin(model: CompiledModel, target: (label: string) => number | null): Float64Array {
  const cells = new Map(model.groups.flatMap((group) => group.free.map((cell) => [cell.label, cell] as const)))
  const met = new Map<string, number>()
  for (const component of components(equationsOf(model, cells))) {
    const labels = [...new Set(component.flatMap(({ weights }) => [...weights.keys()]))]
    const wanted = labels.map((label) => target(label) ?? 0)
    const positive = labels.every((label, i) => isVariance(cells.get(label)!) && wanted[i]! > 0)
    const values = (positive ? byEntropy(component, labels, wanted) : null) ?? byLeastSquares(component, labels, wanted)
    labels.forEach((label, i) => {
      met.set(label, values[i]!)
    })
  }
  return Float64Array.from(model.gammaLabels, (label) => met.get(label) ?? target(label) ?? 0)
}

/** A point moved away from one that obeys the constraints, brought back to them; the labels given away are wanted as they were. */
export function backWithin(model: CompiledModel, from: Float64Array, moved: Float64Array): Float64Array {
  const wanted = new Map<string, number>()
  let plain = true
  for (const group of model.groups) {
    for (const cell of group.free) {
      plain &&= isPlain(cell)
      wanted.set(cell.label, cellValue(cell, isPlain(cell) ? moved : from))
    }
  }
  return plain ? moved : startWithin(model, (label) => wanted.get(label) ?? null)
}

function isPlain({ gammas, weights, constant }: FreeCell): boolean {
  return gammas.length === 1 && weights[0] === 1 && constant === 0
}

function isVariance({ matrix, row, column }: FreeCell): boolean {
  return (matrix === 'theta' || matrix === 'psi') && row === column
}

/** theta of each label given away, minus what makes it, = its constant. */
function equationsOf(model: CompiledModel, cells: ReadonlyMap<string, FreeCell>): Equation[] {
  const equations: Equation[] = []
  for (const [label, cell] of cells) {
    if (isPlain(cell) && model.gammaLabels[cell.gammas[0]!] === label) continue
    const weights = new Map([[label, 1]])
    cell.gammas.forEach((gamma, k) => {
      weights.set(model.gammaLabels[gamma]!, -cell.weights[k]!)
    })
    equations.push({ weights, total: cell.constant })
  }
  return equations
}

/** Equations that share labels, directly or through others. */
function components(equations: readonly Equation[]): Equation[][] {
  const found: { labels: Set<string>; members: Equation[] }[] = []
  for (const equation of equations) {
    const own = [...equation.weights.keys()]
    const touching = found.filter(({ labels }) => own.some((label) => labels.has(label)))
    const joined = {
      labels: new Set([...own, ...touching.flatMap(({ labels }) => [...labels])]),
      members: [equation, ...touching.flatMap(({ members }) => members)]
    }
    for (const old of touching) found.splice(found.indexOf(old), 1)
    found.push(joined)
  }
  return found.map(({ members }) => members)
}

/** target + S A' (A S A')^-1 (b - A target), S the squares of the targets' sizes. */
function byLeastSquares(equations: readonly Equation[], labels: readonly string[], target: readonly number[]): number[] {
  const typical = target.reduce((sum, value) => sum + Math.abs(value), 0) / target.length || 1
  const squares = target.map((value) => Math.max(Math.abs(value), 0.1 * typical) ** 2)
  const step = solveDual(equations, labels, squares, misses(equations, labels, target))
  return step === null ? [...target] : target.map((value, i) => value + squares[i]! * step[i]!)
}

/** Newton's method for lambda; null when no positive values obey the equations. */
function byEntropy(equations: readonly Equation[], labels: readonly string[], target: readonly number[]): number[] | null {
  let exponent = target.map(() => 0)
  let values = [...target]
  let miss = misses(equations, labels, values)
  const enough = 1e-10 * target.reduce((sum, value) => sum + value, 0)
  for (let iteration = 0; iteration < 60; iteration++) {
    if (size(miss) < enough) return values
    const step = solveDual(equations, labels, values, miss)
    if (step === null) return null
    let moved = false
    for (let length = 1; length > 1e-4 && !moved; length /= 2) {
      const next = exponent.map((value, i) => value + length * step[i]!)
      const tried = next.map((value, i) => target[i]! * Math.exp(value))
      const missed = misses(equations, labels, tried)
      if (!(size(missed) < size(miss))) continue
      ;[exponent, values, miss, moved] = [next, tried, missed, true]
    }
    if (!moved) return null
  }
  return null
}

/** b - A theta */
function misses(equations: readonly Equation[], labels: readonly string[], theta: readonly number[]): number[] {
  return equations.map(({ weights, total }) =>
    labels.reduce((rest, label, i) => rest - (weights.get(label) ?? 0) * theta[i]!, total)
  )
}

/** A' (A D A')^-1 r for a diagonal D; null when the equations are not independent there. */
function solveDual(
  equations: readonly Equation[],
  labels: readonly string[],
  diagonal: readonly number[],
  r: readonly number[]
): number[] | null {
  const k = equations.length
  const product = new Float64Array(k * k)
  equations.forEach((a, i) => {
    equations.forEach((b, j) => {
      labels.forEach((label, at) => {
        product[i * k + j]! += (a.weights.get(label) ?? 0) * diagonal[at]! * (b.weights.get(label) ?? 0)
      })
    })
  })
  if (!cholesky(product, k, product)) return null
  const lambda = Float64Array.from(r)
  choleskySolve(product, k, lambda)
  return labels.map((label) => equations.reduce((sum, { weights }, i) => sum + (weights.get(label) ?? 0) * lambda[i]!, 0))
}

function size(values: readonly number[]): number {
  return Math.max(...values.map(Math.abs))
}
