/**
 * Is a model locally identified? By the rank of the information (Rothenberg 1971): at a solution, or at generic points,
 * where a deficit means that the model itself, and not these data, leaves parameters undetermined.
 */
import { EigenvalueDecomposition, Matrix } from 'ml-matrix'
import type { Generator } from '../distributions/generator.ts'
import { cholesky, envelope } from '../matrix/symmetric.ts'
import type { CompiledModel } from '../model/compile.ts'
import type { SampleMoments } from '../moments/sample-moments.ts'
import { normalObjective } from './normal-likelihood.ts'
import { perturbedStart, startingValues } from './starts.ts'

/** Eigenvalues of the unit-diagonal information below this count as zero (double precision leaves some 1e-14). */
const rankTolerance = 1e-10

/**
 * gamma indices in the near-null space of `curvature` (q x q, lower triangle read); empty when it has full rank.
 * The matrix is scaled to a unit diagonal first, so that units do not matter.
 */
export function nullSpaceParameters(curvature: Float64Array, q: number): number[] {
  if (q === 0) return []
  const scaled = new Float64Array(q * q)
  const flat: number[] = []
  for (let k = 0; k < q; k++) if (!(curvature[k * q + k]! > 0)) flat.push(k)
  for (let i = 0; i < q; i++) {
    for (let j = 0; j <= i; j++) {
      const scale = Math.sqrt(curvature[i * q + i]! * curvature[j * q + j]!)
      scaled[i * q + j] = i === j ? 1 : scale > 0 ? curvature[i * q + j]! / scale : 0
    }
  }
  const factor = Float64Array.from(scaled)
  const first = new Int32Array(q)
  envelope(factor, q, first)
  if (cholesky(factor, q, factor, first) && smallestPivot(factor, q) > 1e-4) return flat
  const full = new Matrix(q, q)
  for (let i = 0; i < q; i++) {
    for (let j = 0; j <= i; j++) {
      full.set(i, j, scaled[i * q + j]!)
      full.set(j, i, scaled[i * q + j]!)
    }
  }
  const eigen = new EigenvalueDecomposition(full, { assumeSymmetric: true })
  const involved = new Set<number>(flat)
  eigen.realEigenvalues.forEach((value, column) => {
    if (value > rankTolerance) return
    for (let k = 0; k < q; k++) if (Math.abs(eigen.eigenvectorMatrix.get(k, column)) > 0.05) involved.add(k)
  })
  return [...involved].sort((a, b) => a - b)
}

function smallestPivot(factor: Float64Array, q: number): number {
  let smallest = Number.POSITIVE_INFINITY
  for (let k = 0; k < q; k++) smallest = Math.min(smallest, factor[k * q + k]!)
  return smallest
}

/**
 * Labels of the parameters that no data could determine: those in the null space at two generic points.
 * `moments` only give the size of things; their values do not matter.
 */
export function unidentifiedLabels(model: CompiledModel, moments: SampleMoments, generator: Generator): string[] {
  const q = model.parameters
  const start = startingValues(model, moments)
  const objective = normalObjective(model, withoutPatterns(moments), 'normal')
  const gradient = new Float64Array(q)
  const curvature = new Float64Array(q * q)
  let common: Set<number> | null = null
  for (let point = 0, tries = 0; point < 2 && tries < 40; tries++) {
    const gamma = genericPoint(model, start, generator)
    if (Number.isNaN(objective.evaluate(gamma))) continue
    objective.derive(gradient, curvature)
    point++
    const found = nullSpaceParameters(curvature, q)
    common = new Set(found.filter((k) => common === null || common.has(k)))
  }
  return [...(common ?? [])].map((k) => model.gammaLabels[k]!)
}

/** What is missing in these data has no part in whether any data could identify the model. */
function withoutPatterns(moments: SampleMoments): SampleMoments {
  return { ...moments, groups: moments.groups.map(({ name, n, covariance, mean }) => ({ name, n, covariance, mean })) }
}

/** Starting values moved so that nothing is zero or equal by symmetry: residual covariances, cross-loadings and means too. */
function genericPoint(model: CompiledModel, start: Float64Array, generator: Generator): Float64Array {
  const point = perturbedStart(model, start, generator)
  const size = new Map<string, { cell: string; diagonal: boolean }>()
  for (const group of model.groups) {
    for (const cell of group.free) size.set(cell.label, { cell: cell.matrix, diagonal: cell.row === cell.column })
  }
  return point.map((value, k) => {
    const { cell, diagonal } = size.get(model.gammaLabels[k]!)!
    if ((cell === 'theta' || cell === 'psi') && !diagonal)
      return 0.5 * value + 0.02 * generator.normal() * typicalVariance(model, start)
    if (cell === 'alpha' || cell === 'beta') return value + 0.3 * generator.normal()
    return value
  })
}

/** A small variance among those of the start, so that a covariance of its size keeps Sigma positive definite. */
function typicalVariance(model: CompiledModel, start: Float64Array): number {
  let smallest = Number.POSITIVE_INFINITY
  model.gammaLabels.forEach((label, k) => {
    const isVariance = model.groups.some((g) => g.free.some((c) => c.label === label && c.matrix === 'theta' && c.row === c.column))
    if (isVariance) smallest = Math.min(smallest, start[k]!)
  })
  return Number.isFinite(smallest) ? smallest : 1
}
