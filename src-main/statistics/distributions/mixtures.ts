import { chiSquareLower, chiSquareUpper } from './chi-square.ts'
import { logGamma } from './gamma.ts'
import { monotoneRoot } from './root.ts'

/** One part of a boundary mixture: a chi-square on df (0 = a point mass at 0) with its probability. */
export interface MixturePart {
  df: number
  weight: number
}

/** One term of a weighted sum: weight times a chi-square on df with the given noncentrality. */
export interface WeightedTerm {
  weight: number
  df: number
  /** 0 where omitted */
  noncentrality?: number
}

/**
 * P(Q > x) for Q a mixture of chi-squares (chi-bar-square), 1 at x <= 0. Weights must be non-negative and sum to 1 within 1e-8.
 * The reference of a test with parameters on the boundary (Chernoff 1954; Shapiro 1985; Stoel, Garre, Dolan & van den
 * Wittenboer 2006). Throws RangeError for other weights.
 */
export function chiBarSquareUpper(x: number, parts: readonly MixturePart[]): number {
  requireMixture(parts)
  return parts.reduce((sum, { df, weight }) => (weight === 0 ? sum : sum + weight * chiSquareUpper(x, df)), 0)
}

/**
 * The critical value of the mixture: the x > 0 with P(Q > x) = upperTail. 0 where upperTail is not below the mass beyond 0, since
 * then every x > 0 has a smaller tail. Throws RangeError for an upperTail not strictly between 0 and 1.
 */
export function chiBarSquareQuantile(upperTail: number, parts: readonly MixturePart[]): number {
  requireMixture(parts)
  if (!(upperTail > 0 && upperTail < 1)) throw new RangeError(`a tail probability between 0 and 1 is needed, not ${upperTail}`)
  const beyondZero = parts.filter(({ df, weight }) => df > 0 && weight > 0)
  const mass = beyondZero.reduce((sum, { weight }) => sum + weight, 0)
  if (upperTail >= mass) return 0
  const share = upperTail / mass
  const largest = Math.max(...beyondZero.map(({ df }) => df))
  const bound = largest + 2 * Math.sqrt(-largest * Math.log(share)) - 2 * Math.log(share)
  return Math.exp(
    monotoneRoot((logX) => logTailOfMixture(logX, upperTail, beyondZero), {
      start: Math.log(Math.min(largest, bound) * 0.9),
      low: Number.NEGATIVE_INFINITY,
      high: Math.log(bound),
      rising: false,
      noise: 1e-15
    })
  )
}

/**
 * Weights of the mixture for k = 1, 2 or 3 parameters at their bounds, none restricted otherwise; parts with df = 0..k.
 * `correlations` is the k x k correlation matrix of the UNRESTRICTED estimates (from their asymptotic covariance matrix, not from
 * the information). Closed forms of Kudô (1963) and Shapiro (1985). Throws RangeError for another size.
 */
export function chiBarSquareWeights(correlations: readonly (readonly number[])[]): MixturePart[] {
  const weights = weightsByCount(correlations)
  if (!weights.every((weight) => weight >= 0 && weight <= 1))
    throw new RangeError('weights need the correlation matrix of the bounded estimates')
  return weights.map((weight, df) => ({ df, weight }))
}

/**
 * P(sum_i weight_i chi-square_{df_i}(noncentrality_i) > x), weights of either sign, independent terms; df real and > 0.
 * Relative error about 1e-10 in either tail, down to 1e-300.
 *
 * The inversion integral of Imhof (1961, Biometrika 48, 419). His integrand along the real line decays slowly and gives absolute
 * accuracy only; the same integral is taken here through the saddle point along a hyperbola around the branch cut (Rice 1980,
 * SIAM J. Sci. Stat. Comput. 1, 438), where it decays fast and without cancellation, and the trapezoidal rule converges
 * geometrically (Trefethen & Weideman 2014, SIAM Review 56, 385).
 */
export function weightedChiSquareUpper(x: number, terms: readonly WeightedTerm[]): number {
  return weightedTails(x, terms).upper
}

/** P(sum_i weight_i chi-square_i <= x), with the same accuracy in its own tail. */
export function weightedChiSquareLower(x: number, terms: readonly WeightedTerm[]): number {
  return weightedTails(x, terms).lower
}

interface Tails {
  upper: number
  lower: number
}

type Term = Required<WeightedTerm>

function logTailOfMixture(logX: number, upperTail: number, parts: readonly MixturePart[]): { value: number; slope: number } {
  const x = Math.exp(logX)
  let tail = 0
  let density = 0
  for (const { df, weight } of parts) {
    const upper = chiSquareUpper(x, df)
    tail += weight * upper
    // x f(x) = df (F_df - F_{df+2}) / 2, taken from whichever tail is smaller
    const drop = upper < 0.5 ? chiSquareUpper(x, df + 2) - upper : chiSquareLower(x, df) - chiSquareLower(x, df + 2)
    density += (weight * df * drop) / 2
  }
  return { value: Math.log(tail / upperTail), slope: -density / tail }
}

function weightsByCount(r: readonly (readonly number[])[]): number[] {
  const at = (i: number, j: number): number => r[i]?.[j] ?? Number.NaN
  if (r.length === 1) return [0.5, 0.5]
  if (r.length === 2) {
    const none = Math.acos(at(0, 1)) / (2 * Math.PI)
    return [none, 0.5, 0.5 - none]
  }
  if (r.length !== 3) throw new RangeError(`closed-form weights exist for 1 to 3 bounded parameters, not ${r.length}`)
  const angles = Math.acos(at(0, 1)) + Math.acos(at(0, 2)) + Math.acos(at(1, 2))
  const partial = (i: number, j: number, k: number): number =>
    Math.acos((at(i, j) - at(i, k) * at(j, k)) / Math.sqrt((1 - at(i, k) ** 2) * (1 - at(j, k) ** 2)))
  const all = (2 * Math.PI - angles) / (4 * Math.PI)
  const two = (3 * Math.PI - partial(0, 1, 2) - partial(0, 2, 1) - partial(1, 2, 0)) / (4 * Math.PI)
  return [0.5 - two, 0.5 - all, two, all]
}

function weightedTails(x: number, terms: readonly WeightedTerm[]): Tails {
  const used = requireTerms(x, terms)
  const mirrored = x < 0
  // in units of the largest weight, and turned to x >= 0
  const unit = Math.max(...used.map(({ weight }) => Math.abs(weight))) * (mirrored ? -1 : 1)
  const { upper, lower } = tailsAtPositive(
    Math.abs(x / unit),
    used.map((term) => ({ ...term, weight: term.weight / unit }))
  )
  return mirrored ? { upper: lower, lower: upper } : { upper, lower }
}

/** Both tails at x >= 0. */
function tailsAtPositive(x: number, terms: readonly Term[]): Tails {
  const low = -1 / (2 * Math.max(0, ...terms.map(({ weight }) => -weight)))
  const high = 1 / (2 * Math.max(0, ...terms.map(({ weight }) => weight)))
  if (high === Number.POSITIVE_INFINITY) return { upper: 0, lower: 1 }
  if (x === Number.POSITIVE_INFINITY) return { upper: 0, lower: 1 }
  if (low === Number.NEGATIVE_INFINITY && x <= NEAR_ZERO * Math.min(...terms.map(({ weight }) => weight))) {
    const lower = lowerTailNearZero(x, terms)
    return { upper: 1 - lower, lower }
  }
  const scale = 1 / Math.sqrt(cumulant(0, terms).second)
  const saddle = saddlePoint(x, terms, low, high)
  // too near the pole at 0 the crossing is moved off it: both tails are large there
  const least = Math.min(scale / 2, high / 2)
  if (saddle < -least) {
    const lower = tailIntegral(x, terms, saddle, low, 0)
    return { upper: 1 - lower, lower }
  }
  const upper = tailIntegral(x, terms, Math.max(saddle, least), 0, high)
  return { upper, lower: 1 - upper }
}

/** Below this times the smallest weight (and for sensible df) the leading term is the lower tail to a relative 1e-12. */
const NEAR_ZERO = 1e-16

/** The leading term at 0 of the lower tail of a sum with positive weights: chi-square on all df, scaled by the weights' geometric mean. */
function lowerTailNearZero(x: number, terms: readonly Term[]): number {
  const half = terms.reduce((sum, { df }) => sum + df / 2, 0)
  const logScale = terms.reduce((sum, { weight, df, noncentrality }) => sum + (df * Math.log(weight) + noncentrality) / 2, 0)
  return Math.exp(half * Math.log(x / 2) - logScale - logGamma(half + 1))
}

interface Cumulant {
  /** K(s) = ln E exp(sQ) */
  value: number
  first: number
  second: number
}

/** The cumulant generating function and two derivatives at a real s inside its strip. */
function cumulant(s: number, terms: readonly Term[]): Cumulant {
  let value = 0
  let first = 0
  let second = 0
  for (const { weight, df, noncentrality } of terms) {
    const inner = 1 - 2 * weight * s
    const ratio = weight / inner
    value += -0.5 * df * Math.log(inner) + noncentrality * ratio * s
    first += ratio * (df + noncentrality / inner)
    second += 2 * ratio * ratio * (df + (2 * noncentrality) / inner)
  }
  return { value, first, second }
}

/** The real s between low and high with K'(s) = x, roughly: the answer does not depend on it, only the work. */
function saddlePoint(x: number, terms: readonly Term[], low: number, high: number): number {
  let below = low
  let above = high
  if (below === Number.NEGATIVE_INFINITY) {
    below = -high
    while (cumulant(below, terms).first > x) below *= 4
  }
  for (let step = 0; step < 60; step++) {
    const s = (below + above) / 2
    if (cumulant(s, terms).first < x) below = s
    else above = s
  }
  return (below + above) / 2
}

/** Angle of the hyperbola's arms to the real axis at infinity. */
const ANGLE = Math.PI / 4
const FIRST_STEP = 0.25
const MOST_HALVINGS = 9
/** Two successive step lengths agreeing to this leave the finer one good to about its square. */
const AGREEMENT = 1e-8
/** Nodes are left out once they have fallen this far below the sum. */
const NEGLIGIBLE = 1e-18

/**
 * The size of (1/2 pi i) times the integral of exp(K(s) - s x)/s over a curve crossing the real axis at c, where
 * left < c < right are the singularities either side: the upper tail for c > 0, minus the lower one for c < 0.
 * s(v) = c + r (cosh(v + i ANGLE) - cos ANGLE); by symmetry only v >= 0 is walked.
 */
function tailIntegral(x: number, terms: readonly Term[], c: number, left: number, right: number): number {
  const { value, second } = cumulant(c, terms)
  const r = Math.min(2 / Math.sqrt(second), c - left, 2 * (right - c))
  const logFactor = value - c * x
  const node = (v: number): number => integrand(v, x, terms, c, r, logFactor)
  let step = FIRST_STEP
  let sum = 0.5 * node(0) + walk(node, step, step)
  let estimate = sum * step
  for (let halving = 0; halving < MOST_HALVINGS; halving++) {
    sum += walk(node, step / 2, step)
    step /= 2
    const finer = sum * step
    if (Math.abs(finer - estimate) <= AGREEMENT * Math.abs(finer)) {
      return Math.min(1, Math.max(0, (Math.exp(logFactor) * Math.abs(finer)) / Math.PI))
    }
    estimate = finer
  }
  throw new Error(`the integral for a weighted sum of chi-squares did not settle at ${x}`)
}

/** Sum of the nodes at from, from + step, ... until they stay negligible. */
function walk(node: (v: number) => number, from: number, step: number): number {
  let sum = 0
  let largest = 0
  let quiet = 0
  for (let v = from; quiet < 4 && v < 700; v += step) {
    const value = node(v)
    sum += value
    largest = Math.max(largest, Math.abs(value))
    quiet = Math.abs(value) <= NEGLIGIBLE * largest ? quiet + 1 : 0
  }
  return sum
}

/** Im[exp(K(s) - s x - logFactor) s'(v) / s] at one node. */
function integrand(v: number, x: number, terms: readonly Term[], c: number, r: number, logFactor: number): number {
  const cosine = Math.cos(ANGLE)
  const sine = Math.sin(ANGLE)
  const re = c + r * (Math.cosh(v) * cosine - cosine)
  const im = r * Math.sinh(v) * sine
  let logSize = -re * x - logFactor
  let phase = -im * x
  for (const { weight, df, noncentrality } of terms) {
    const innerRe = 1 - 2 * weight * re
    const innerIm = -2 * weight * im
    const squared = innerRe * innerRe + innerIm * innerIm
    logSize -= 0.25 * df * Math.log(squared)
    phase -= 0.5 * df * Math.atan2(innerIm, innerRe)
    if (noncentrality > 0) {
      // w s / (1 - 2 w s) = (1/(1 - 2 w s) - 1) / 2
      logSize += 0.5 * noncentrality * (innerRe / squared - 1)
      phase -= (0.5 * noncentrality * innerIm) / squared
    }
  }
  // s'(v) / s
  const slopeRe = r * Math.sinh(v) * cosine
  const slopeIm = r * Math.cosh(v) * sine
  const size = re * re + im * im
  const quotientRe = (slopeRe * re + slopeIm * im) / size
  const quotientIm = (slopeIm * re - slopeRe * im) / size
  const scale = Math.exp(logSize)
  return scale === 0 ? 0 : scale * (quotientRe * Math.sin(phase) + quotientIm * Math.cos(phase))
}

function requireTerms(x: number, terms: readonly WeightedTerm[]): Term[] {
  if (Number.isNaN(x)) throw new RangeError('a value that is not a number has no tail')
  for (const { weight, df, noncentrality = 0 } of terms) {
    if (!Number.isFinite(weight) || !(df > 0 && Number.isFinite(df)) || !(noncentrality >= 0 && Number.isFinite(noncentrality))) {
      throw new RangeError(`a term needs a finite weight, df > 0 and noncentrality >= 0, not ${weight}, ${df}, ${noncentrality}`)
    }
  }
  const used = terms.filter(({ weight }) => weight !== 0).map(({ noncentrality = 0, ...rest }) => ({ ...rest, noncentrality }))
  if (used.length === 0) throw new RangeError('a weighted sum of chi-squares needs a weight that is not 0')
  return used
}

function requireMixture(parts: readonly MixturePart[]): void {
  const total = parts.reduce((sum, { weight }) => sum + weight, 0)
  if (!(Math.abs(total - 1) <= 1e-8) || parts.some(({ weight }) => weight < 0)) {
    throw new RangeError(`mixture weights must be non-negative and sum to 1, not ${total}`)
  }
}
