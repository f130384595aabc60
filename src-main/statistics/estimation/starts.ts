/**
 * Starting values, in the model's own scaling: principal-factor loadings factor by factor, composite-based factor
 * covariances, what is left over as residual variance; means by regression on the loadings.
 *
 * They need only be good enough that scoring converges from the first try for ordinary models; nothing else depends on them.
 */

import type { Generator } from '../distributions/generator.ts'
import type { CompiledGroup, CompiledModel, FreeCell, MatrixName } from '../model/compile.ts'
import type { GroupMoments, SampleMoments } from '../moments/sample-moments.ts'
import { backWithin, startWithin } from './constrained-start.ts'

/** gamma (q) to start from. `constrained` are the labels bound by linear constraints (effects coding). */
export function startingValues(model: CompiledModel, moments: SampleMoments): Float64Array {
  const targets = new Targets()
  const bound = new Set(model.groups.flatMap((g) => g.free.filter((c) => c.gammas.length > 1).flatMap((c) => siblings(g, c))))
  model.groups.forEach((group, g) => {
    startGroup(model, group, moments.groups[g]!, targets, bound)
  })
  return startWithin(model, (label) => targets.of(label))
}

/** Labels that share a linear constraint with a pivot cell: those of its column and matrix. */
function siblings(group: CompiledGroup, pivot: FreeCell): string[] {
  const gammas = new Set(pivot.gammas)
  return [
    pivot.label,
    ...group.free.filter((c) => c.matrix === pivot.matrix && c.gammas.length === 1 && gammas.has(c.gammas[0]!)).map((c) => c.label)
  ]
}

/** A seeded perturbation of a start: every gamma by some tens of percent, and now and then a sign; constraints kept. */
export function perturbedStart(model: CompiledModel, start: Float64Array, generator: Generator): Float64Array {
  const matrixOf = new Map<string, MatrixName>()
  for (const group of model.groups) for (const cell of group.free) matrixOf.set(cell.label, cell.matrix)
  const moved = start.map((value, k) => {
    const matrix = matrixOf.get(model.gammaLabels[k]!)
    const z = generator.normal()
    if (matrix === 'theta') return value * Math.exp(0.5 * z)
    if (matrix === 'psi') return value > 0 ? value * Math.exp(0.5 * z) : value + 0.2 * z * Math.abs(value)
    if (matrix === 'lambda' || matrix === 'beta') return value * (1 + 0.6 * z)
    return value + 0.1 * z * (Math.abs(value) + 0.1)
  })
  return backWithin(model, start, moved)
}

/** Averages of the values wanted for each label so far. */
class Targets {
  private readonly sums = new Map<string, { sum: number; count: number }>()

  add(label: string, value: number): void {
    const entry = this.sums.get(label) ?? { sum: 0, count: 0 }
    this.sums.set(label, { sum: entry.sum + value, count: entry.count + 1 })
  }

  of(label: string): number | null {
    const entry = this.sums.get(label)
    return entry === undefined ? null : entry.sum / entry.count
  }
}

/** One group's matrices with cells looked up by place. */
class Sheet {
  readonly group: CompiledGroup
  private readonly cells = new Map<string, FreeCell>()

  constructor(group: CompiledGroup) {
    this.group = group
    for (const cell of group.free) this.cells.set(`${cell.matrix} ${cell.row} ${cell.column}`, cell)
  }

  free(matrix: MatrixName, row: number, column: number): FreeCell | undefined {
    return this.cells.get(`${matrix} ${row} ${column}`)
  }
}

function startGroup(model: CompiledModel, group: CompiledGroup, sample: GroupMoments, targets: Targets, bound: Set<string>): void {
  const p = model.indicators.length
  const m = model.factors.length
  const sheet = new Sheet(group)
  const s = sample.covariance
  const lambda = new Float64Array(p * m)
  const variance = new Float64Array(m)
  const residual = Float64Array.from(s)
  const shared = new Float64Array(p)
  const order = factorOrder(sheet, p, m)
  for (const { factor, members } of order) {
    const raw = principalFactor(residual, p, members)
    const fixedAt = group.psi[factor * m + factor]!
    const unit = sheet.free('psi', factor, factor) === undefined && fixedAt > 0 ? Math.sqrt(fixedAt) : null
    const scale = loadingScale(sheet, 'lambda', m, factor, members, raw, unit, targets, bound)
    variance[factor] = scale * scale
    members.forEach((i, k) => {
      lambda[i * m + factor] = raw[k]! / scale
      shared[i]! += raw[k]! * raw[k]!
    })
    // What the factor explains is taken out before a smaller factor on the same indicators (bifactor) is started.
    for (let a = 0; a < members.length; a++) {
      for (let b = 0; b < members.length; b++) residual[members[a]! * p + members[b]!]! -= raw[a]! * raw[b]!
    }
  }
  const phi = compositeCovariances(s, lambda, variance, p, m, order)
  startHigherOrder(sheet, m, phi, order, targets, bound)
  for (const cell of group.free) {
    if (cell.matrix === 'lambda') targets.add(cell.label, lambda[cell.row * m + cell.column]!)
    if (cell.matrix === 'theta')
      targets.add(cell.label, cell.row === cell.column ? leftOver(s[cell.row * p + cell.row]!, shared[cell.row]!) : 0)
  }
  if (sample.mean !== null) startMeans(sheet, p, m, lambda, sample.mean, order, targets, bound)
}

function leftOver(total: number, explained: number): number {
  return Math.max(total - explained, 0.2 * total)
}

interface FactorMembers {
  factor: number
  members: number[]
}

/** Factors with indicators, the ones with most indicators first. */
function factorOrder(sheet: Sheet, p: number, m: number): FactorMembers[] {
  const order: FactorMembers[] = []
  for (let factor = 0; factor < m; factor++) {
    const members: number[] = []
    for (let i = 0; i < p; i++)
      if (sheet.free('lambda', i, factor) !== undefined || sheet.group.lambda[i * m + factor] !== 0) members.push(i)
    if (members.length > 0) order.push({ factor, members })
  }
  return order.sort((a, b) => b.members.length - a.members.length)
}

/** Loadings of one unit-variance factor on `members`: power iteration on the block with communalities on its diagonal. */
function principalFactor(s: Float64Array, p: number, members: number[]): Float64Array {
  const k = members.length
  const deviation = members.map((i) => Math.sqrt(Math.max(s[i * p + i]!, 1e-12)))
  const block = new Float64Array(k * k)
  for (let a = 0; a < k; a++) {
    let communality = k === 1 ? 0.7 : 0
    for (let b = 0; b < k; b++) {
      if (a === b) continue
      const r = Math.max(-0.99, Math.min(0.99, s[members[a]! * p + members[b]!]! / (deviation[a]! * deviation[b]!)))
      block[a * k + b] = r
      communality = Math.max(communality, Math.abs(r))
    }
    block[a * k + a] = Math.max(communality, 0.05)
  }
  const vector = new Float64Array(k).fill(1)
  // Signs first: follow the indicator with the largest row sum of absolute correlations.
  let lead = 0
  let best = -1
  for (let a = 0; a < k; a++) {
    let sum = 0
    for (let b = 0; b < k; b++) sum += Math.abs(block[a * k + b]!)
    if (sum > best) {
      best = sum
      lead = a
    }
  }
  for (let a = 0; a < k; a++) vector[a] = block[lead * k + a]! < 0 ? -1 : 1
  let size = 1
  for (let iteration = 0; iteration < 12; iteration++) {
    const next = new Float64Array(k)
    for (let a = 0; a < k; a++) for (let b = 0; b < k; b++) next[a]! += block[a * k + b]! * vector[b]!
    size = Math.hypot(...next)
    for (let a = 0; a < k; a++) vector[a] = next[a]! / size
  }
  const root = Math.sqrt(size)
  let total = 0
  for (let a = 0; a < k; a++) total += vector[a]!
  const sign = total < 0 ? -1 : 1
  return vector.map((value, a) => sign * root * Math.max(-0.95, Math.min(0.95, value)) * deviation[a]!)
}

/** What raw (unit-variance) loadings are divided by to stand in the model's scaling; its square is the factor variance. */
function loadingScale(
  sheet: Sheet,
  matrix: 'lambda' | 'beta',
  m: number,
  factor: number,
  members: number[],
  raw: Float64Array,
  unit: number | null,
  targets: Targets,
  bound: Set<string>
): number {
  const fixed = members.findIndex((i) => sheet.free(matrix, i, factor) === undefined)
  if (unit !== null) return unit
  if (fixed >= 0) {
    const value = sheet.group[matrix][members[fixed]! * m + factor]!
    return awayFromZero(raw[fixed]! / value, largest(raw) / Math.abs(value))
  }
  let across = 0
  let within = 0
  let inConstraint = false
  members.forEach((i, k) => {
    const label = sheet.free(matrix, i, factor)!.label
    const target = targets.of(label)
    if (bound.has(label)) inConstraint = true
    if (target !== null) {
      across += raw[k]! * target
      within += target * target
    }
  })
  if (within > 0) return awayFromZero(across / within, largest(raw) / Math.sqrt(within))
  if (inConstraint) return awayFromZero(raw.reduce((sum, x) => sum + x, 0) / raw.length, largest(raw))
  return 1
}

function largest(x: Float64Array): number {
  return x.reduce((most, value) => Math.max(most, Math.abs(value)), 1e-6)
}

/** A marker that hardly loads must not blow the scale up. */
function awayFromZero(value: number, typical: number): number {
  const floor = 0.15 * typical
  return Math.abs(value) >= floor ? value : value < 0 ? -floor : floor
}

/** Factor covariances (m x m) from composites weighted by the loadings; overlapping factors are started uncorrelated. */
function compositeCovariances(
  s: Float64Array,
  lambda: Float64Array,
  variance: Float64Array,
  p: number,
  m: number,
  order: FactorMembers[]
): Float64Array {
  const phi = new Float64Array(m * m)
  for (const { factor, members } of order) {
    phi[factor * m + factor] = variance[factor]!
    for (const other of order) {
      if (other.factor >= factor || members.some((i) => other.members.includes(i))) continue
      let cross = 0
      for (const i of members) {
        for (const j of other.members) cross += lambda[i * m + factor]! * s[i * p + j]! * lambda[j * m + other.factor]!
      }
      const norm = columnSquare(lambda, m, factor, members) * columnSquare(lambda, m, other.factor, other.members)
      const limit = 0.85 * Math.sqrt(variance[factor]! * variance[other.factor]!)
      const value = Math.max(-limit, Math.min(limit, cross / norm))
      phi[factor * m + other.factor] = value
      phi[other.factor * m + factor] = value
    }
  }
  return phi
}

function columnSquare(lambda: Float64Array, m: number, factor: number, members: number[]): number {
  return members.reduce((sum, i) => sum + lambda[i * m + factor]! ** 2, 1e-12)
}

/** Factor regressions, variances and covariances: factors measured by factors are started as one-factor models of `phi`. */
function startHigherOrder(
  sheet: Sheet,
  m: number,
  phi: Float64Array,
  order: FactorMembers[],
  targets: Targets,
  bound: Set<string>
): void {
  const withIndicators = new Set(order.map((o) => o.factor))
  const explained = new Float64Array(m)
  const beta = new Float64Array(m * m)
  for (let factor = 0; factor < m; factor++) {
    if (withIndicators.has(factor)) continue
    const members: number[] = []
    for (let k = 0; k < m; k++)
      if (sheet.free('beta', k, factor) !== undefined || sheet.group.beta[k * m + factor] !== 0) members.push(k)
    if (members.length === 0) continue
    for (const k of members) if (phi[k * m + k] === 0) phi[k * m + k] = 1
    const raw = principalFactor(phi, m, members)
    const fixedAt = sheet.group.psi[factor * m + factor]!
    const unit = sheet.free('psi', factor, factor) === undefined && fixedAt > 0 ? Math.sqrt(fixedAt) : null
    const scale = loadingScale(sheet, 'beta', m, factor, members, raw, unit, targets, bound)
    phi[factor * m + factor] = scale * scale
    members.forEach((k, at) => {
      beta[k * m + factor] = raw[at]! / scale
      explained[k]! += raw[at]! ** 2
    })
  }
  for (const cell of sheet.group.free) {
    const { row, column, label } = cell
    if (cell.matrix === 'beta') targets.add(label, beta[row * m + column]!)
    if (cell.matrix !== 'psi') continue
    const variance = phi[row * m + row]! || 1
    if (row === column) targets.add(label, leftOver(variance, explained[row]!))
    else targets.add(label, explained[row]! > 0 || explained[column]! > 0 ? 0 : phi[row * m + column]!)
  }
}

/** Intercepts and factor means: a free factor mean takes up the difference from the intercepts wanted so far. */
function startMeans(
  sheet: Sheet,
  p: number,
  m: number,
  lambda: Float64Array,
  mean: Float64Array,
  order: FactorMembers[],
  targets: Targets,
  bound: Set<string>
): void {
  const alpha = Float64Array.from(sheet.group.alpha)
  for (const { factor, members } of order) {
    const cell = sheet.free('alpha', factor, 0)
    if (cell === undefined) continue
    let across = 0
    let within = 0
    for (const i of members) {
      const intercept = sheet.free('nu', i, 0)
      const load = lambda[i * m + factor]!
      if (intercept === undefined || bound.has(intercept.label)) {
        across += mean[i]! - sheet.group.nu[i]!
        within += load
      } else {
        const target = targets.of(intercept.label)
        if (target === null) continue
        across += load * (mean[i]! - target)
        within += load * load
      }
    }
    alpha[factor] = Math.abs(within) > 1e-12 ? across / within : 0
    targets.add(cell.label, alpha[factor]!)
  }
  for (let i = 0; i < p; i++) {
    const cell = sheet.free('nu', i, 0)
    if (cell === undefined) continue
    let value = mean[i]!
    for (let k = 0; k < m; k++) value -= lambda[i * m + k]! * alpha[k]!
    targets.add(cell.label, value)
  }
}
