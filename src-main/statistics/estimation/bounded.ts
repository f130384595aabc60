/**
 * Minimisation within bounds: an active set on top of the ordinary scoring (Nocedal & Wright 2006, section 16.5, for the idea).
 *
 * The unbounded minimum is taken where it lies within the bounds. Else the parameters beyond theirs are put on them and held
 * there while the others are minimised; the path to each such minimum stops at the next bound, which is held too. At a
 * minimum the slope of F says of each held parameter whether F still falls into the allowed side (Karush, Kuhn & Tucker):
 * the one where it falls fastest is let go, until none is left. No randomness: the same start gives the same solution.
 */
import { submatrix } from '../matrix/symmetric.ts'
import type { GammaBounds } from '../model/compile.ts'
import type { Objective } from './normal-likelihood.ts'
import { type Minimum, minimise, ordinaryScoring, type ScoringSettings } from './scoring.ts'

/** A held parameter is let go where F falls inwards faster than this, in the parameter's own unit as in scoring.ts. */
const releaseSlope = 1e-7
/** More turns than this of holding and letting go mean that the search goes round in circles. */
const mostRounds = 60

/**
 * As `minimise`, within bounds. Parameters on a bound at the solution stand exactly there (heldAtBounds finds them); gradient
 * and curvature are of all q, the largest gradient is of those not held.
 *
 * @param bounds null when there are none
 */
export function minimiseWithin(
  objective: Objective,
  start: Float64Array,
  bounds: GammaBounds | null,
  settings: ScoringSettings = ordinaryScoring
): Minimum {
  const open = minimise(objective, start, settings)
  const ended = open.stop === 'converged' || open.stop === 'iteration limit'
  if (bounds === null || (ended && isWithin(open.gamma, bounds))) return open
  const from = [open.gamma, start].map((point) => clipped(point, bounds)).find((point) => !Number.isNaN(objective.evaluate(point)))
  if (from === undefined) return { ...open, stop: 'bad start', value: Number.NaN }
  return activeSet({ objective, bounds, settings }, from, open.iterations)
}

/** Indices of the gammas that stand on one of their bounds. */
export function heldAtBounds(bounds: GammaBounds | null, gamma: ArrayLike<number>): number[] {
  if (bounds === null) return []
  const held: number[] = []
  for (let k = 0; k < gamma.length; k++) if (gamma[k] === bounds.least[k] || gamma[k] === bounds.most[k]) held.push(k)
  return held
}

interface Problem {
  objective: Objective
  bounds: GammaBounds
  settings: ScoringSettings
}

function activeSet(problem: Problem, from: Float64Array, before: number): Minimum {
  const { bounds } = problem
  const held = new Set(heldAtBounds(bounds, from))
  const judged = new Set<string>()
  let point = from
  let iterations = before
  for (let round = 0; round < mostRounds; round++) {
    const minimum = minimiseOthers(problem, point, held)
    iterations += minimum.iterations
    const stopped = wayStop(point, minimum.gamma, bounds)
    if (stopped !== null) {
      point = feasiblePoint(problem, stopped.point, minimum.gamma)
      for (const k of stopped.hit) held.add(k)
      continue
    }
    point = minimum.gamma
    const result = { ...minimum, iterations }
    const release = steepestInward(minimum, held, bounds)
    if (release === null || minimum.stop !== 'converged') return result
    const key = [...held].sort((a, b) => a - b).join(' ')
    if (judged.has(key)) return { ...result, stop: 'no descent' }
    judged.add(key)
    held.delete(release)
  }
  return { ...minimiseOthers(problem, point, held), iterations, stop: 'iteration limit' }
}

/** The minimum over the parameters not held, with gamma, gradient and curvature of all. */
function minimiseOthers({ objective, settings }: Problem, point: Float64Array, held: ReadonlySet<number>): Minimum {
  if (held.size === 0) return minimise(objective, point, settings)
  const q = objective.parameters
  const free = Array.from(point.keys()).filter((k) => !held.has(k))
  const reduced = heldObjective(objective, point, free)
  const minimum = minimise(
    reduced,
    Float64Array.from(free, (k) => point[k]!),
    settings
  )
  const gamma = Float64Array.from(point)
  free.forEach((k, at) => {
    gamma[k] = minimum.gamma[at]!
  })
  const whole = { ...minimum, gamma, gradient: new Float64Array(q), curvature: new Float64Array(q * q) }
  if (!Number.isNaN(objective.evaluate(gamma))) objective.derive(whole.gradient, whole.curvature)
  return whole
}

/** The same F as a function of the gammas `free` alone; the others stay as in `point`. */
function heldObjective(objective: Objective, point: Float64Array, free: readonly number[]): Objective {
  const q = objective.parameters
  const whole = Float64Array.from(point)
  const gradientOfAll = new Float64Array(q)
  const curvatureOfAll = new Float64Array(q * q)
  return {
    ...objective,
    parameters: free.length,
    evaluate(gamma) {
      free.forEach((k, at) => {
        whole[k] = gamma[at]!
      })
      return objective.evaluate(whole)
    },
    derive(gradient, curvature, kind) {
      if (curvature === undefined) objective.derive(gradientOfAll)
      else {
        objective.derive(gradientOfAll, curvatureOfAll, kind)
        curvature.set(submatrix(curvatureOfAll, q, free))
      }
      free.forEach((k, at) => {
        gradient[at] = gradientOfAll[k]!
      })
    }
  }
}

function isWithin(gamma: Float64Array, { least, most }: GammaBounds): boolean {
  return gamma.every((value, k) => value >= least[k]! && value <= most[k]!)
}

function clipped(gamma: Float64Array, { least, most }: GammaBounds): Float64Array {
  return gamma.map((value, k) => Math.min(Math.max(value, least[k]!), most[k]!))
}

/** Where the straight way from a point within the bounds meets the first of them; null when it meets none. */
function wayStop(from: Float64Array, to: Float64Array, bounds: GammaBounds): { point: Float64Array; hit: number[] } | null {
  if (isWithin(to, bounds)) return null
  const shares = Array.from(to, (value, k) => {
    const bound = value < bounds.least[k]! ? bounds.least[k]! : value > bounds.most[k]! ? bounds.most[k]! : null
    return bound === null ? 1 : (bound - from[k]!) / (value - from[k]!)
  })
  const share = Math.min(...shares)
  const point = clipped(
    from.map((value, k) => value + share * (to[k]! - value)),
    bounds
  )
  const hit = shares.flatMap((one, k) => (one === share && !(to[k]! >= bounds.least[k]! && to[k]! <= bounds.most[k]!) ? [k] : []))
  for (const k of hit) point[k] = to[k]! < bounds.least[k]! ? bounds.least[k]! : bounds.most[k]!
  return { point, hit }
}

/** On the way Sigma may lose its positive definiteness, where it has it at both ends; the far end is taken then. */
function feasiblePoint({ objective, bounds }: Problem, point: Float64Array, far: Float64Array): Float64Array {
  return Number.isNaN(objective.evaluate(point)) ? clipped(far, bounds) : point
}

/** The held parameter along which F falls fastest into what its bound allows; null when F falls along none. */
function steepestInward({ gamma, gradient, curvature }: Minimum, held: ReadonlySet<number>, { least }: GammaBounds): number | null {
  const q = gamma.length
  let steepest: number | null = null
  let slope = releaseSlope
  for (const k of held) {
    const h = curvature[k * q + k]!
    const fall = ((gamma[k] === least[k] ? -1 : 1) * gradient[k]!) / (h > 0 ? Math.sqrt(h) : 1)
    if (fall > slope) {
      steepest = k
      slope = fall
    }
  }
  return steepest
}
