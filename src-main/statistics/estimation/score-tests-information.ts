/**
 * Scores of releases and what information is left of each beside the model's own parameters:
 *
 *     score_j = dF/d delta_j      left_j = H_jj - H_jg H_gg^-1 H_gj      H = expected d2F
 *
 * H_gg is factored once. The releases join the model in batches of about q, so that no matrix much larger than 2q x 2q
 * exists however many thousand releases there are, and each costs one triangular solve.
 */
import { cholesky, dotRows, envelope } from '../matrix/symmetric.ts'
import type { CompiledModel, FreeCell } from '../model/compile.ts'
import type { Objective } from './normal-likelihood.ts'
import { type CellPlace, placeKey, type Release } from './score-tests-releases.ts'

/** The objective of a compiled model on the data at hand, whatever their kind. */
export type MakeObjective = (model: CompiledModel) => Objective

export interface ReleaseScore {
  /** dF/d delta */
  score: number
  /** H_jj */
  information: number
  /** H_jj - H_jg H_gg^-1 H_gj; rounding may leave it a little below zero where nothing is left. */
  left: number
  /** Change, for a unit of delta, that the model's own parameters bring to the cell let go: -K_j H_gg^-1 H_gj; 0 for a fixed cell. */
  drift: number
}

/** A share of H_jj below this counts as nothing left: the release would not be identified. */
const nothingLeft = 1e-8

export function isDetermined({ information, left }: Pick<ReleaseScore, 'information' | 'left'>): boolean {
  return information > 0 && left > nothingLeft * information
}

const smallestBatch = 64
const largestBatch = 1024

/**
 * @param gamma the model's solution (q)
 * @returns one entry a release; null when H_gg is not positive definite there
 */
export function releaseScores(
  model: CompiledModel,
  releases: readonly Release[],
  gamma: Float64Array,
  makeObjective: MakeObjective
): ReleaseScore[] | null {
  const q = model.parameters
  const batch = Math.min(Math.max(q, smallestBatch), largestBatch)
  const out: ReleaseScore[] = []
  let factor: Factor | null = null
  for (let start = 0; start < releases.length; start += batch) {
    const { gradient, curvature, size } = derivatives(model, releases.slice(start, start + batch), gamma, makeObjective)
    factor ??= factored(curvature, size, q)
    if (factor === null) return null
    const row = new Float64Array(q)
    for (let j = q; j < size; j++) {
      row.set(curvature.subarray(j * size, j * size + q))
      forwardSolve(factor, row)
      const information = curvature[j * size + j]!
      const left = information - dotRows(row, 0, row, 0, q)
      out.push({ score: gradient[j]!, information, left, drift: drift(model, releases[start + j - q]!, factor, row) })
    }
  }
  return out
}

/** `row` = L^-1 H_gj, H_gg = L L'. */
function drift(model: CompiledModel, { kind, place }: Release, factor: Factor, row: Float64Array): number {
  if (kind === 'fixed cell') return 0
  const key = placeKey(place)
  const cell = model.groups[place.group]!.free.find((c) => placeKey(c) === key)!
  const k = new Float64Array(factor.q)
  cell.gammas.forEach((gamma, i) => {
    k[gamma]! += cell.weights[i]!
  })
  forwardSolve(factor, k)
  return -dotRows(k, 0, row, 0, factor.q)
}

/**
 * All releases at once: s' M^-1 s with M = H_jj - H_jg H_gg^-1 H_gj over the releases that add something to those before
 * them, and how many those are. For tens of releases, not thousands. Null as above.
 */
export function jointReleaseScore(
  model: CompiledModel,
  releases: readonly Release[],
  gamma: Float64Array,
  makeObjective: MakeObjective
): { value: number; rank: number } | null {
  const q = model.parameters
  const { gradient, curvature, size } = derivatives(model, releases, gamma, makeObjective)
  const factor = factored(curvature, size, q)
  if (factor === null) return null
  const solved = releases.map((_, j) => {
    const row = curvature.slice((q + j) * size, (q + j) * size + q)
    forwardSolve(factor, row)
    return row
  })
  // Cholesky of M with the solution of L z = s alongside; a release with no pivot left is passed over.
  const rows: { at: number; l: number[]; z: number }[] = []
  let value = 0
  for (let j = 0; j < releases.length; j++) {
    const entry = (k: number) => curvature[(q + j) * size + q + k]! - dotRows(solved[j]!, 0, solved[k]!, 0, q)
    const l: number[] = []
    for (const other of rows) l.push((entry(other.at) - dot(l, other.l)) / other.l.at(-1)!)
    const left = entry(j) - dot(l, l)
    if (!isDetermined({ information: curvature[(q + j) * size + q + j]!, left })) continue
    const z = (gradient[q + j]! - rows.reduce((sum, other, k) => sum + l[k]! * other.z, 0)) / Math.sqrt(left)
    rows.push({ at: j, l: [...l, Math.sqrt(left)], z })
    value += z * z
  }
  return { value, rank: rows.length }
}

/** Sum of products over the length of the first. */
function dot(a: readonly number[], b: readonly number[]): number {
  return a.reduce((sum, value, k) => sum + value * b[k]!, 0)
}

interface Derivatives {
  size: number
  gradient: Float64Array
  /** size x size, lower triangle; the model's own q parameters first, then the releases. */
  curvature: Float64Array
}

/** Derivatives of the model with these releases added, at the solution, where each delta is 0. */
function derivatives(
  model: CompiledModel,
  releases: readonly Release[],
  gamma: Float64Array,
  makeObjective: MakeObjective
): Derivatives {
  const size = model.parameters + releases.length
  const objective = makeObjective(withReleases(model, releases))
  const point = new Float64Array(size)
  point.set(gamma)
  if (Number.isNaN(objective.evaluate(point))) throw new Error('the solution given has no positive definite covariance matrix')
  const gradient = new Float64Array(size)
  const curvature = new Float64Array(size * size)
  objective.derive(gradient, curvature)
  return { size, gradient, curvature }
}

/** The compiled model with one more gamma a release, q, q + 1, ... */
function withReleases(model: CompiledModel, releases: readonly Release[]): CompiledModel {
  const groups = model.groups.map((group) => ({ ...group, free: [...group.free] }))
  const at = groups.map(({ free }) => new Map(free.map((cell, i) => [placeKey(cell), i])))
  const names = releases.map((_, j) => `release ${j + 1}`)
  releases.forEach(({ shifts }, j) => {
    for (const { place, weight } of shifts) {
      const { free } = groups[place.group]!
      const known = at[place.group]!
      const i = known.get(placeKey(place)) ?? free.length
      known.set(placeKey(place), i)
      free[i] = shifted(free[i] ?? fixedCell(model, place, names[j]!), model.parameters + j, weight)
    }
  })
  const parameters = model.parameters + releases.length
  return {
    ...model,
    groups,
    labels: [...model.labels, ...names],
    gammaLabels: [...model.gammaLabels, ...names],
    parameters,
    df: model.df - releases.length
  }
}

function shifted(cell: FreeCell, gamma: number, weight: number): FreeCell {
  return { ...cell, gammas: Int32Array.of(...cell.gammas, gamma), weights: Float64Array.of(...cell.weights, weight) }
}

function fixedCell(model: CompiledModel, { matrix, row, column, group }: CellPlace, label: string): FreeCell {
  const columns = matrix === 'nu' || matrix === 'alpha' ? 1 : matrix === 'theta' ? model.indicators.length : model.factors.length
  const constant = model.groups[group]![matrix][row * columns + column]!
  return { matrix, row, column, label, theta: -1, constant, gammas: new Int32Array(), weights: new Float64Array() }
}

interface Factor {
  q: number
  l: Float64Array
  /** The rows' envelope. */
  first: Int32Array
}

/** Cholesky factor of the leading q x q block; null when that is singular to rounding, or not positive definite. */
function factored(curvature: Float64Array, size: number, q: number): Factor | null {
  const l = new Float64Array(q * q)
  for (let i = 0; i < q; i++) l.set(curvature.subarray(i * size, i * size + i + 1), i * q)
  const first = new Int32Array(q)
  envelope(l, q, first)
  if (!cholesky(l, q, l, first)) return null
  for (let i = 0; i < q; i++) if (l[i * q + i]! ** 2 < 1e-12 * curvature[i * size + i]!) return null
  return { q, l, first }
}

/**
 * Solves l x = b in place of `x`. Where b and the solution so far do not reach, nothing is done: a cell of one group meets
 * that group's parameters and the shared ones at the end, so x is zero in one long gap between them.
 */
function forwardSolve({ q, l, first }: Factor, x: Float64Array): void {
  let start = 0
  while (start < q && x[start] === 0) start++
  let last = -1
  let gap = q
  let gapEnd = q
  for (let i = start; i < q; i++) {
    const from = Math.max(first[i]!, start)
    if (last < from && x[i] === 0) continue
    if (i - last - 1 > gapEnd - gap && last >= 0) {
      gap = last + 1
      gapEnd = i
    }
    const at = i * q
    const dot =
      from < gap && gapEnd <= i
        ? dotRows(l, at + from, x, from, gap - from) + dotRows(l, at + gapEnd, x, gapEnd, i - gapEnd)
        : dotRows(l, at + from, x, from, i - from)
    x[i] = (x[i]! - dot) / l[at + i]!
    if (x[i] !== 0) last = i
  }
}
