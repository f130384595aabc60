/**
 * The optimiser: Fisher scoring with step control, sharpened by quasi-Newton pairs.
 *
 * Each iteration solves with the expected second derivatives at the current point, corrected by up to eight pairs of
 * (step, gradient change) through the two-loop recursion (Nocedal & Wright 2006, algorithm 7.4), so that a badly fitting
 * model, where scoring alone is only linearly convergent, still ends fast. A damped matrix (Levenberg 1944; Marquardt
 * 1963) takes over where the information is singular or a step does not descend, and the observed second derivatives where
 * all that has not ended after many iterations: in the long flat valleys that lead to improper solutions.
 */
import { cholesky, choleskySolve, envelope } from '../matrix/symmetric.ts'
import type { Objective } from './normal-likelihood.ts'

export interface ScoringSettings {
  /** Converged when max |g_k| scale_k is below this; scale_k = 1 / sqrt(curvature_kk), the parameter's own unit. */
  readonly tolerance: number
  readonly iterations: number
  /** Ends as converged at once where F is below this, whatever the gradient: for asking only whether a fit is perfect. */
  readonly enough?: number
}

export const ordinaryScoring: ScoringSettings = Object.freeze({ tolerance: 1e-9, iterations: 500 })

export type StopReason = 'converged' | 'iteration limit' | 'no descent' | 'bad start'

export interface Minimum {
  stop: StopReason
  gamma: Float64Array
  /** F at gamma; NaN after a bad start. */
  value: number
  gradient: Float64Array
  /** Expected second derivatives of F at gamma, q x q, lower triangle. */
  curvature: Float64Array
  iterations: number
  /** max |g_k| scale_k */
  largestGradient: number
}

const pairsKept = 8
const halvings = 10
/** Iterations of scoring before the observed second derivatives take over; ordinary models need some ten. */
const scoringSteps = 60

/** Minimises from `start` (length q, left untouched). Never throws: how it ended is `stop`. */
export function minimise(objective: Objective, start: Float64Array, settings: ScoringSettings = ordinaryScoring): Minimum {
  const q = objective.parameters
  const point: Minimum = {
    stop: 'iteration limit',
    gamma: Float64Array.from(start),
    value: Number.NaN,
    gradient: new Float64Array(q),
    curvature: new Float64Array(q * q),
    iterations: 0,
    largestGradient: Number.NaN
  }
  point.value = objective.evaluate(point.gamma)
  if (Number.isNaN(point.value)) return { ...point, stop: 'bad start' }
  objective.derive(point.gradient, point.curvature)
  const search: Search = {
    objective,
    newton: null,
    pairs: [],
    damping: 0,
    trial: new Float64Array(q),
    direction: new Float64Array(q),
    factor: new Float64Array(q * q),
    first: new Int32Array(q)
  }
  for (; point.iterations < settings.iterations; point.iterations++) {
    if (point.iterations === scoringSteps) turnToNewton(search, point)
    point.largestGradient = scaledGradient(point.gradient, point.curvature)
    const still = point.largestGradient < settings.tolerance && nothingToGain(search, point)
    if (still || point.value < (settings.enough ?? Number.NEGATIVE_INFINITY)) {
      point.stop = 'converged'
      break
    }
    if (!advance(search, point)) {
      point.stop = 'no descent'
      break
    }
  }
  point.largestGradient = scaledGradient(point.gradient, point.curvature)
  return point
}

interface Search {
  objective: Objective
  /** Observed second derivatives at the current point, once scoring has had its turn. */
  newton: Float64Array | null
  pairs: { s: Float64Array; y: Float64Array; rho: number }[]
  damping: number
  trial: Float64Array
  direction: Float64Array
  factor: Float64Array
  first: Int32Array
}

/** max |g_k| / sqrt(h_kk): free of the indicators' units. */
function scaledGradient(gradient: Float64Array, curvature: Float64Array): number {
  const q = gradient.length
  let largest = 0
  for (let k = 0; k < q; k++) {
    const h = curvature[k * q + k]!
    largest = Math.max(largest, Math.abs(gradient[k]!) / (h > 0 ? Math.sqrt(h) : 1))
  }
  return largest
}

/** Where scoring has not ended by now, F is far from what it expects: the observed second derivatives take over. */
function turnToNewton(search: Search, point: Minimum): void {
  search.newton = new Float64Array(point.curvature.length)
  search.pairs = []
  search.damping = 0
  search.objective.evaluate(point.gamma)
  search.objective.derive(new Float64Array(point.gradient.length), search.newton, 'observed')
}

/**
 * On the way to infinity slopes vanish too, but a Newton step would still gain something: g'H^-1 g / 2 is about what is left
 * to gain. Asked only after the turn to Newton; scoring does not come that far out.
 */
function nothingToGain(search: Search, point: Minimum): boolean {
  if (search.newton === null) return true
  search.damping = 0
  if (!factorDamped(search, point.curvature)) return false
  search.direction.set(point.gradient)
  choleskySolve(search.factor, search.direction.length, search.direction, search.first)
  return dot(point.gradient, search.direction) / 2 < 1e-12
}

/** One accepted step from `point`, or false when no step descends at any damping. */
function advance(search: Search, point: Minimum): boolean {
  for (let attempt = 0; attempt < 40; attempt++) {
    if (factorDamped(search, point.curvature)) {
      const slope = findDirection(search, point.gradient)
      if (slope < 0 && lineSearch(search, point, slope)) return true
    }
    search.pairs = []
    search.damping = search.damping === 0 ? 1e-4 : search.damping * 5
    if (search.damping > 1e12) return false
  }
  return false
}

/** factor = cholesky(H + damping D), H the second derivatives in use and D the expected ones' diagonal */
function factorDamped(search: Search, curvature: Float64Array): boolean {
  const q = search.direction.length
  search.factor.set(search.newton ?? curvature)
  for (let k = 0; k < q; k++) {
    const d = curvature[k * q + k]!
    search.factor[k * q + k]! += search.damping * (d > 0 ? d : 1)
  }
  envelope(search.factor, q, search.first)
  return cholesky(search.factor, q, search.factor, search.first)
}

/** direction = -(corrected H)^-1 g; returns g' direction. */
function findDirection(search: Search, gradient: Float64Array): number {
  const { direction, pairs, factor, first } = search
  const q = direction.length
  direction.set(gradient)
  const alphas: number[] = []
  for (let i = pairs.length - 1; i >= 0; i--) {
    const { s, y, rho } = pairs[i]!
    const alpha = rho * dot(s, direction)
    alphas[i] = alpha
    for (let k = 0; k < q; k++) direction[k]! -= alpha * y[k]!
  }
  choleskySolve(factor, q, direction, first)
  for (let i = 0; i < pairs.length; i++) {
    const { s, y, rho } = pairs[i]!
    const beta = alphas[i]! - rho * dot(y, direction)
    for (let k = 0; k < q; k++) direction[k]! += beta * s[k]!
  }
  for (let k = 0; k < q; k++) direction[k] = -direction[k]!
  return dot(gradient, direction)
}

/** Takes the longest of 1, 1/2, 1/4 ... that descends enough (Armijo), rounding in F allowed for; false when none does. */
function lineSearch(search: Search, point: Minimum, slope: number): boolean {
  const { trial, direction, objective } = search
  const noise = 1e-13 * (1 + Math.abs(point.value))
  for (let i = 0, length = 1; i < halvings; i++, length /= 2) {
    for (let k = 0; k < trial.length; k++) trial[k] = point.gamma[k]! + length * direction[k]!
    const value = objective.evaluate(trial)
    if (value <= point.value + 1e-4 * length * slope + noise) {
      accept(search, point, value)
      if (length === 1) search.damping = search.damping < 1e-5 ? 0 : search.damping / 10
      return true
    }
  }
  return false
}

/** Moves `point` to the trial point, where F was just evaluated, and remembers the pair. */
function accept(search: Search, point: Minimum, value: number): void {
  const q = search.direction.length
  const s = new Float64Array(q)
  const y = new Float64Array(q)
  for (let k = 0; k < q; k++) {
    s[k] = search.trial[k]! - point.gamma[k]!
    y[k] = -point.gradient[k]!
  }
  point.gamma.set(search.trial)
  point.value = value
  search.objective.derive(point.gradient, point.curvature)
  if (search.newton !== null) {
    search.objective.derive(point.gradient, search.newton, 'observed')
    return
  }
  for (let k = 0; k < q; k++) y[k]! += point.gradient[k]!
  const curvature = dot(s, y)
  if (curvature > 1e-10 * Math.sqrt(dot(s, s) * dot(y, y))) {
    search.pairs.push({ s, y, rho: 1 / curvature })
    if (search.pairs.length > pairsKept) search.pairs.shift()
  }
}

function dot(a: Float64Array, b: Float64Array): number {
  let sum = 0
  for (let k = 0; k < a.length; k++) sum += a[k]! * b[k]!
  return sum
}
