import { logUpperGamma, upperGamma } from './gamma.ts'
import { monotoneRoot } from './root.ts'

const HALF_LOG_TWO_PI = 0.9189385332046728
const LOG_HALF = -Math.LN2

/** P(Z > z) for a standard normal Z; relative error below 1e-12 down to 1e-300. From Q(1/2, z^2/2) (Abramowitz & Stegun 1964, 7.1 and 26.4.19). */
export function normalUpper(z: number): number {
  const half = 0.5 * upperGamma(0.5, 0.5 * z * z)
  return z >= 0 ? half : 1 - half
}

/** P(Z <= z) for a standard normal Z, with the same accuracy in its own tail. */
export function normalLower(z: number): number {
  return normalUpper(-z)
}

/**
 * The z with P(Z <= z) = p, 0 < p < 1; RangeError otherwise. Start from Abramowitz & Stegun (1964, 26.2.23), then Newton on ln P.
 */
export function normalQuantile(p: number): number {
  if (!(p > 0 && p < 1)) throw new RangeError(`a probability between 0 and 1 is needed, not ${p}`)
  if (p === 0.5) return 0
  const tail = Math.min(p, 1 - p)
  const logTail = Math.log(tail)
  const z = monotoneRoot(
    (point) => {
      const logUpper = LOG_HALF + logUpperGamma(0.5, 0.5 * point * point)
      return { value: logUpper - logTail, slope: -Math.exp(-0.5 * point * point - HALF_LOG_TWO_PI - logUpper) }
    },
    { start: Math.max(roughUpperQuantile(tail), 1e-8), low: 0, high: 40, rising: false, noise: 1e-16 }
  )
  return p < 0.5 ? -z : z
}

/** The z >= 0 with P(Z > z) = tail to within 4.5e-4, for 0 < tail <= 1/2 (Hastings 1955; Abramowitz & Stegun 1964, 26.2.23). */
export function roughUpperQuantile(tail: number): number {
  const t = Math.sqrt(-2 * Math.log(tail))
  return t - (2.515517 + t * (0.802853 + t * 0.010328)) / (1 + t * (1.432788 + t * (0.189269 + t * 0.001308)))
}
