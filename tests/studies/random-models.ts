/**
 * Random but identified measurement models with data drawn near them, for the property tests and the convergence study.
 *
 * A model is drawn as its cells; a population in the model's own scaling, with its fixed cells and equalities, and often
 * some misfit; and rows from that population. Everything follows from the generator passed in.
 */
import type { Generator } from '../../src-main/statistics/distributions/generator.ts'
import type { Cell, GroupCells, LinearConstraint, ModelCells } from '../../src-main/statistics/model/cells.ts'
import { splitByPattern } from '../../src-main/statistics/moments/missing-patterns.ts'
import { completeCaseMoments, type SampleMoments } from '../../src-main/statistics/moments/sample-moments.ts'
import { saturatedMoments } from '../../src-main/statistics/moments/saturated-em.ts'

export type Scaling = 'first loading' | 'factor variance' | 'effects coding'
export type Level = 'same pattern' | 'equal loadings' | 'equal intercepts' | 'equal residual variances'
export type Kind = 'simple structure' | 'cross-loadings' | 'residual covariances' | 'second-order factor'

export interface ModelDesign {
  kind: Kind
  factors: number
  indicators: number
  groups: number
  level: Level
  scaling: Scaling
  /** Size of what the population has and the model leaves out; 0 for a model that holds. */
  misfit: number
}

export interface DataDesign {
  /** Cases of all groups together; no group has fewer than 50, nor fewer than ten more than indicators (thrice the indicators with missing answers). */
  total: number
  /** Missingness patterns a group; 1 for complete data. */
  patterns: number
}

export interface RandomModel {
  design: ModelDesign
  cells: ModelCells
  /** Population values of the labels, in the model's scaling. */
  truth: Map<string, number>
  groups: Population[]
}

/** One group's population, indicators in a unit of their own. */
interface Population {
  /** p x p lower factor of the covariance matrix. */
  factor: Float64Array
  mean: Float64Array
}

export function pick<T>(generator: Generator, from: readonly T[]): T {
  return from[Math.floor(generator.uniform() * from.length)]!
}

export function between(generator: Generator, low: number, high: number): number {
  return low + (high - low) * generator.uniform()
}

/** Log-uniform whole number. */
export function sizeBetween(generator: Generator, low: number, high: number): number {
  return Math.round(Math.exp(between(generator, Math.log(low), Math.log(high))))
}

/** Numbers of one group before scaling: factors with unit variance in the first group. */
interface Values {
  /** The factors' loadings on the second-order factor, where there is one. */
  second: number[] | null
  lambda: number[][]
  phi: number[][]
  alpha: number[]
  nu: number[]
  theta: number[]
}

const rank: Record<Level, number> = { 'same pattern': 0, 'equal loadings': 1, 'equal intercepts': 2, 'equal residual variances': 3 }

/** Draws the model and its population. With a second-order factor intercepts and residual variances stay free. */
export function randomModel(wanted: ModelDesign, generator: Generator): RandomModel {
  const capped = wanted.kind === 'second-order factor' && rank[wanted.level] > 1
  const design: ModelDesign = capped ? { ...wanted, level: 'equal loadings' } : wanted
  const { indicators: p, factors: m, kind } = design
  const home = homes(p, m)
  const cross = kind === 'cross-loadings' ? crossCells(p, m, home, generator) : []
  const pairs = kind === 'residual covariances' ? residualPairs(p, home, generator) : []
  const secondOrder = kind === 'second-order factor'
  const base = baseValues(m, home, cross, secondOrder, generator)
  const unit = Array.from({ length: p }, () => Math.exp(0.7 * generator.normal()))
  const draft: Draft = { design, home, cross, pairs, secondOrder, truth: new Map(), constraints: [], first: null }
  const groups: Population[] = []
  const cells: GroupCells[] = []
  for (let g = 0; g < design.groups; g++) {
    const values = g === 0 ? base : groupValues(base, design, secondOrder, generator)
    const residual = pairs.map(([i, j]) => between(generator, -0.25, 0.35) * Math.sqrt(values.theta[i]! * values.theta[j]!))
    groups.push(population(values, residual, draft, unit, generator))
    cells.push(groupCells(g, inUnits(values, unit), residual, draft, unit))
  }
  const factors = Array.from({ length: m }, (_, k) => `F${k + 1}`)
  return {
    design,
    cells: {
      indicators: Array.from({ length: p }, (_, i) => `y${i + 1}`),
      factors: secondOrder ? [...factors, 'G'] : factors,
      groups: cells,
      constraints: draft.constraints
    },
    truth: draft.truth,
    groups
  }
}

/** The factor of each indicator: as even as can be, at least three to a factor. */
function homes(p: number, m: number): number[] {
  return Array.from({ length: p }, (_, i) => Math.floor((i * m) / p))
}

function crossCells(p: number, m: number, home: number[], generator: Generator): [number, number][] {
  if (m < 2) return []
  const found: [number, number][] = []
  for (let i = 0; i < p; i++) {
    // The first two indicators of a factor stay pure, so that every factor keeps its meaning.
    const pure = home.indexOf(home[i]!) >= i - 1
    if (pure || generator.uniform() > 0.15) continue
    found.push([i, (home[i]! + 1 + Math.floor(generator.uniform() * (m - 1))) % m])
  }
  return found
}

/** Pairs of indicators of different factors, each indicator at most once; with one factor, of that factor if it has five. */
function residualPairs(p: number, home: number[], generator: Generator): [number, number][] {
  const m = home[p - 1]! + 1
  if (m === 1 && p < 6) return []
  const found: [number, number][] = []
  const used = new Set<number>()
  for (let tries = 0; tries < Math.ceil(p / 8); tries++) {
    const i = Math.floor(generator.uniform() * p)
    const j = Math.floor(generator.uniform() * p)
    if (i === j || used.has(i) || used.has(j) || (m > 1 && home[i] === home[j])) continue
    used.add(i).add(j)
    found.push(i > j ? [i, j] : [j, i])
  }
  return found
}

function baseValues(m: number, home: number[], cross: [number, number][], secondOrder: boolean, generator: Generator): Values {
  const lambda = home.map((k) => Array.from({ length: m }, (_, f) => (f === k ? between(generator, 0.5, 0.9) : 0)))
  const theta = lambda.map((row) => 1 - row.reduce((sum, x) => sum + x * x, 0))
  for (const [i, k] of cross) lambda[i]![k] = between(generator, 0.15, 0.35)
  const load = Array.from({ length: m }, () =>
    secondOrder ? between(generator, 0.6, 0.9) : Math.sqrt(between(generator, 0.05, 0.6))
  )
  const phi = load.map((a, k) => load.map((b, l) => (k === l ? 1 : a * b)))
  return {
    second: secondOrder ? load : null,
    lambda,
    phi,
    alpha: load.map(() => 0),
    nu: home.map(() => between(generator, -1, 3)),
    theta
  }
}

/** A further group: what the level leaves free differs, the factors differ in variance and mean. */
function groupValues(base: Values, { level }: ModelDesign, secondOrder: boolean, generator: Generator): Values {
  const held = rank[level]
  const jitter = (x: number, size: number) => x * Math.exp(size * generator.normal())
  const d = base.alpha.map(() => (secondOrder ? 1 : Math.exp(0.2 * generator.normal())))
  return {
    second: base.second,
    lambda: held >= 1 ? base.lambda : base.lambda.map((row) => row.map((x) => jitter(x, 0.1))),
    phi: base.phi.map((row, k) => row.map((x, l) => x * d[k]! * d[l]!)),
    alpha: held >= 2 ? base.alpha.map(() => 0.4 * generator.normal()) : base.alpha,
    nu: held >= 2 ? base.nu : base.nu.map((x) => x + 0.2 * generator.normal()),
    theta: held >= 3 ? base.theta : base.theta.map((x) => jitter(x, 0.15))
  }
}

function inUnits(values: Values, unit: number[]): Values {
  return {
    ...values,
    lambda: values.lambda.map((row, i) => row.map((x) => x * unit[i]!)),
    nu: values.nu.map((x, i) => x * unit[i]!),
    theta: values.theta.map((x, i) => x * unit[i]! ** 2)
  }
}

/** Sigma = Lambda Phi Lambda' + Theta and some misfit: a minor factor that the model leaves out. */
function population(values: Values, residual: number[], draft: Draft, unit: number[], generator: Generator): Population {
  const p = unit.length
  const sigma = new Float64Array(p * p)
  const minor = unit.map(() => draft.design.misfit * generator.normal())
  for (let i = 0; i < p; i++) {
    for (let j = 0; j < p; j++) {
      let sum = minor[i]! * minor[j]! + (i === j ? values.theta[i]! : 0)
      values.phi.forEach((row, k) => {
        row.forEach((phi, l) => {
          sum += values.lambda[i]![k]! * phi * values.lambda[j]![l]!
        })
      })
      sigma[i * p + j] = sum
    }
  }
  draft.pairs.forEach(([i, j], at) => {
    sigma[i * p + j]! += residual[at]!
    sigma[j * p + i]! += residual[at]!
  })
  const mean = Float64Array.from(
    unit,
    (u, i) => u * (values.nu[i]! + values.lambda[i]!.reduce((sum, x, k) => sum + x * values.alpha[k]!, 0))
  )
  for (let i = 0; i < p; i++) for (let j = 0; j < p; j++) sigma[i * p + j]! *= unit[i]! * unit[j]!
  return { factor: lowerFactor(sigma, p), mean }
}

/** Plain Cholesky; throws when the population is no population. */
function lowerFactor(sigma: Float64Array, p: number): Float64Array {
  const l = new Float64Array(p * p)
  for (let i = 0; i < p; i++) {
    for (let j = 0; j <= i; j++) {
      let sum = sigma[i * p + j]!
      for (let k = 0; k < j; k++) sum -= l[i * p + k]! * l[j * p + k]!
      if (i === j && !(sum > 0)) throw new Error('the population covariance matrix is not positive definite')
      l[i * p + j] = i === j ? Math.sqrt(sum) : sum / l[j * p + j]!
    }
  }
  return l
}

/** What is collected while the groups' cells are written. */
interface Draft {
  design: ModelDesign
  home: number[]
  cross: [number, number][]
  pairs: [number, number][]
  secondOrder: boolean
  truth: Map<string, number>
  constraints: LinearConstraint[]
  /** Scale and origin of each factor in the first group: later groups with equal loadings or intercepts follow them. */
  first: { scale: number[]; origin: number[] } | null
}

/** The cells of a group, with the truth of each label noted. Factor k is measured in units of scale[k] about origin[k]. */
function groupCells(g: number, values: Values, residual: number[], draft: Draft, unit: number[]): GroupCells {
  const { design, home, cross, pairs, secondOrder, truth } = draft
  const { indicators: p, factors: m } = design
  const held = rank[design.level]
  const free = (name: string, shared: boolean, value: number): string => {
    const label = shared ? name : `${name} g${g + 1}`
    if (!truth.has(label)) truth.set(label, value)
    return label
  }
  const frame = held >= 1 && draft.first !== null ? draft.first : measure(values, draft)
  const followed = held >= 2 && g > 0
  const scale = frame.scale
  const origin = followed ? frame.origin : measure(values, draft).origin
  draft.first ??= { scale, origin }
  const fixVariance = design.scaling === 'factor variance' && (held === 0 || g === 0)
  const factors = secondOrder ? m + 1 : m

  const loadings: Cell[][] = Array.from({ length: p }, () => Array.from({ length: factors }, () => 0))
  for (let i = 0; i < p; i++) {
    const k = home[i]!
    const marker = design.scaling === 'first loading' && home.indexOf(k) === i
    loadings[i]![k] = marker ? 1 : free(`l ${i} ${k}`, held >= 1, values.lambda[i]![k]! * scale[k]!)
  }
  for (const [i, k] of cross) loadings[i]![k] = free(`l ${i} ${k}`, held >= 1, values.lambda[i]![k]! * scale[k]!)

  const residualCovariances: Cell[][] = Array.from({ length: p }, (_, i) =>
    Array.from({ length: p }, (_, j) => (i === j ? free(`t ${i}`, held >= 3, values.theta[i]!) : 0))
  )
  pairs.forEach(([i, j], at) => {
    const label = free(`t ${i} ${j}`, false, residual[at]! * unit[i]! * unit[j]!)
    residualCovariances[i]![j] = label
    residualCovariances[j]![i] = label
  })

  const regressions: Cell[][] = Array.from({ length: factors }, () => Array.from({ length: factors }, () => 0))
  const factorCovariances: Cell[][] = Array.from({ length: factors }, () => Array.from({ length: factors }, () => 0))
  for (let k = 0; k < m; k++) {
    for (let l = 0; l <= k; l++) {
      const above = values.second === null ? 0 : values.second[k]! * values.second[l]!
      if (secondOrder && k !== l) continue
      const cell = k === l && fixVariance ? 1 : free(`f ${k} ${l}`, false, (values.phi[k]![l]! - above) / (scale[k]! * scale[l]!))
      factorCovariances[k]![l] = cell
      factorCovariances[l]![k] = cell
    }
  }
  if (values.second !== null) {
    factorCovariances[m]![m] = 1
    for (let k = 0; k < m; k++) regressions[k]![m] = free(`b ${k}`, false, values.second[k]! / scale[k]!)
  }

  const meansFree = held >= 2 && (g > 0 || design.scaling === 'effects coding')
  const codedMeans = design.scaling === 'effects coding' && !secondOrder
  const intercepts = home.map((_, i) => {
    const shift = values.lambda[i]!.reduce((sum, x, k) => sum + x * origin[k]!, 0)
    return free(`n ${i}`, held >= 2, values.nu[i]! + shift)
  })
  const factorMeans: Cell[] = Array.from({ length: factors }, (_, k) =>
    k < m && (meansFree || codedMeans) ? free(`a ${k}`, false, (values.alpha[k]! - origin[k]!) / scale[k]!) : 0
  )
  if (design.scaling === 'effects coding') effectsCoding(g, loadings, intercepts, codedMeans, draft)
  return {
    name: design.groups > 1 ? `g${g + 1}` : null,
    loadings,
    regressions,
    factorCovariances,
    residualCovariances,
    intercepts,
    factorMeans
  }
}

/** scale: what unit-variance loadings are multiplied by; origin: the factor value at which the means' rule is met. */
function measure(values: Values, { design, home, secondOrder }: Draft): { scale: number[]; origin: number[] } {
  const { factors: m, scaling } = design
  const own = Array.from({ length: m }, (_, k) => home.flatMap((f, i) => (f === k ? [i] : [])))
  const mean = (k: number, of: (i: number) => number) => own[k]!.reduce((sum, i) => sum + of(i), 0) / own[k]!.length
  const loading = own.map((_, k) => mean(k, (i) => values.lambda[i]![k]!))
  if (scaling === 'first loading') return { scale: own.map((of, k) => 1 / values.lambda[of[0]!]![k]!), origin: own.map(() => 0) }
  if (scaling === 'factor variance') {
    return { scale: own.map((_, k) => Math.sqrt(values.phi[k]![k]! - (values.second?.[k] ?? 0) ** 2)), origin: own.map(() => 0) }
  }
  const origin = own.map((_, k) => (secondOrder ? 0 : -mean(k, (i) => values.nu[i]!) / loading[k]!))
  return { scale: loading.map((x) => 1 / x), origin }
}

/** Mean loading 1 and mean intercept 0 of the indicators at home on each factor (Little, Slegers & Card 2006). */
function effectsCoding(
  g: number,
  loadings: Cell[][],
  intercepts: Cell[],
  means: boolean,
  { design, home, constraints }: Draft
): void {
  const held = rank[design.level]
  for (let k = 0; k < design.factors; k++) {
    const own = home.flatMap((f, i) => (f === k ? [i] : []))
    const equation = (labels: Cell[], equals: number) => {
      constraints.push({ terms: labels.map((label) => ({ label: String(label), weight: 1 })), equals })
    }
    if (g === 0 || held < 1)
      equation(
        own.map((i) => loadings[i]![k]!),
        own.length
      )
    if (means && (g === 0 || held < 2))
      equation(
        own.map((i) => intercepts[i]!),
        0
      )
  }
}

export interface RandomData {
  moments: SampleMoments
  /** Per group n x p, NaN where missing. */
  rows: Float64Array[]
}

/** Draws normal rows, groups of nearly equal size; with several patterns, answers are missing by chance, pattern by pattern. */
export function randomData(model: RandomModel, data: DataDesign, generator: Generator): RandomData {
  const p = model.cells.indicators.length
  const rows = model.groups.map((group) => {
    const least = data.patterns > 1 ? 3 * p : p + 10
    const n = Math.max(Math.round(data.total / model.groups.length), least, 50)
    return drawRows(group, n, p, missingPatterns(data.patterns, p, generator), generator)
  })
  const groups = rows.map((values, g) => ({ name: model.cells.groups[g]!.name, ...momentsOf(values, p, data.patterns > 1) }))
  return { moments: { indicators: model.cells.indicators, groups }, rows }
}

/** Which indicators each pattern misses: the first pattern none, the others about a quarter. */
function missingPatterns(count: number, p: number, generator: Generator): Uint8Array[] {
  return Array.from({ length: count }, (_, at) => {
    const missing = Uint8Array.from({ length: p }, () => (at > 0 && generator.uniform() < 0.25 ? 1 : 0))
    missing[Math.floor(generator.uniform() * p)] = 0
    return missing
  })
}

function drawRows({ factor, mean }: Population, n: number, p: number, patterns: Uint8Array[], generator: Generator): Float64Array {
  const values = new Float64Array(n * p)
  const z = new Float64Array(p)
  for (let row = 0; row < n; row++) {
    for (let i = 0; i < p; i++) z[i] = generator.normal()
    const missing = patterns[generator.uniform() < 0.4 ? 0 : Math.floor(generator.uniform() * patterns.length)]!
    for (let i = 0; i < p; i++) {
      let sum = mean[i]!
      for (let k = 0; k <= i; k++) sum += factor[i * p + k]! * z[k]!
      values[row * p + i] = missing[i] === 1 ? Number.NaN : sum
    }
  }
  return values
}

function momentsOf(values: Float64Array, p: number, missing: boolean): Omit<SampleMoments['groups'][number], 'name'> {
  if (!missing) return completeCaseMoments(values, p)
  const { patterns, n } = splitByPattern(values, p)
  const { mean, covariance } = saturatedMoments(patterns, p)
  return { n, patterns, mean, covariance }
}
