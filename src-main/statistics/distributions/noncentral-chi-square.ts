import { chiSquareLower, chiSquareUpper } from './chi-square.ts'
import { logLowerGamma, logPoissonTerm, logUpperGamma } from './gamma.ts'
import { roughUpperQuantile } from './normal.ts'
import { monotoneRoot } from './root.ts'

/** Terms this much below the largest one are left out on the far side of the sum. */
const NEGLIGIBLE = 1e-20
const ROUNDING = 2 ** -53
/** Beyond this a sum would take seconds; no test statistic of ours comes near. */
const LARGEST = 1e10

/** One tail on the log scale, with d ln(tail) / d lambda, which the same sum yields. */
interface Tail {
  log: number
  slope: number
}

/**
 * P(chi-square_df(lambda) > x), df > 0 and real, lambda >= 0; 1 for x <= 0. Relative error below 1e-10 down to 1e-300 for x and
 * lambda up to 1e5. Throws RangeError for arguments outside.
 *
 * The Poisson mixture of central tails (Patnaik 1949, Biometrika 36, 202; Johnson, Kotz & Balakrishnan 1995, ch. 29), summed
 * over the stretch of terms that matter, in the direction in which the recurrence of the central tail only adds.
 */
export function noncentralChiSquareUpper(x: number, df: number, lambda: number): number {
  requireArguments(x, df, lambda)
  if (lambda === 0 || x <= 0 || x === Number.POSITIVE_INFINITY) return chiSquareUpper(x, df)
  return Math.min(1, Math.exp(upperTail(x, df, lambda).log))
}

/** P(chi-square_df(lambda) <= x), the same accuracy in its own tail; 0 for x <= 0. */
export function noncentralChiSquareLower(x: number, df: number, lambda: number): number {
  requireArguments(x, df, lambda)
  if (lambda === 0 || x <= 0 || x === Number.POSITIVE_INFINITY) return chiSquareLower(x, df)
  return Math.min(1, Math.exp(lowerTail(x, df, lambda).log))
}

/**
 * The lambda >= 0 with P(chi-square_df(lambda) <= x) = lowerTailProbability; 0 where the central distribution is already at or
 * below it. With .95 and .05 the limits of a 90% interval for lambda, and so for the RMSEA (Steiger & Lind 1980; Browne &
 * Cudeck 1993). Newton on the log of the smaller tail inside a bracket; dP/dlambda = -1/2 the sum of Poisson times gamma terms.
 * Throws RangeError for a probability not strictly between 0 and 1.
 */
export function noncentralityFor(x: number, df: number, lowerTailProbability: number): number {
  requireArguments(x, df, 0)
  if (x === Number.POSITIVE_INFINITY) throw new RangeError('a finite chi-square value is needed')
  if (!(lowerTailProbability > 0 && lowerTailProbability < 1)) {
    throw new RangeError(`a tail probability between 0 and 1 is needed, not ${lowerTailProbability}`)
  }
  if (chiSquareLower(x, df) <= lowerTailProbability) return 0
  const useLower = lowerTailProbability <= 0.5
  const logTarget = useLower ? Math.log(lowerTailProbability) : Math.log1p(-lowerTailProbability)
  return monotoneRoot(
    (lambda) => {
      const tail = useLower ? lowerTail(x, df, lambda) : upperTail(x, df, lambda)
      return { value: tail.log - logTarget, slope: tail.slope }
    },
    {
      start: roughNoncentrality(x, df, lowerTailProbability),
      low: 0,
      high: Number.POSITIVE_INFINITY,
      rising: !useLower,
      noise: ROUNDING * Math.max(1, -logTarget)
    }
  )
}

/**
 * ln of sum_j p_j Q(a + j, h), a = df/2, h = x/2, p_j Poisson with mean m = lambda/2.
 * Q(a + j + 1, h) = Q(a + j, h) + g_j, g_j = e^-h h^(a+j) / Gamma(a + j + 1): upwards in j nothing cancels. Everything is scaled
 * by the first term, so that no factor leaves the range of doubles.
 */
function upperTail(x: number, df: number, lambda: number): Tail {
  const a = df / 2
  const h = x / 2
  const mean = lambda / 2
  const peak = Math.floor(Math.max(mean, jointMode(a, h, mean)))
  let j = firstTerm(peak, a, h, mean)
  const logCentral = logUpperGamma(a + j, h)
  const logScale = logPoissonTerm(j, mean) + logCentral
  let term = 1 // p_j Q(a + j, h)
  let density = Math.exp(logPoissonTerm(a + j, h) - logCentral) // p_j g_j
  let sum = 0
  let densities = 0
  for (;;) {
    sum += term
    densities += density
    j += 1
    const ratio = mean / j
    const next = ratio * (term + density)
    density *= (ratio * h) / (a + j)
    // ratios fall from term to term, so a geometric series bounds what is left
    if (j > peak && next * term <= ROUNDING * 0.1 * sum * (term - next)) break
    term = next
  }
  return { log: logScale + Math.log(sum), slope: (0.5 * densities) / sum }
}

/** ln of sum_j p_j P(a + j, h), downwards in j, where P(a + j - 1, h) = P(a + j, h) + g_(j-1) only adds. */
function lowerTail(x: number, df: number, lambda: number): Tail {
  const a = df / 2
  const h = x / 2
  const mean = lambda / 2
  const peak = Math.floor(Math.min(mean, jointMode(a, h, mean)))
  let j = lastTerm(peak, a, h, mean)
  const logCentral = logLowerGamma(a + j, h)
  const logScale = logPoissonTerm(j, mean) + logCentral
  let term = 1 // p_j P(a + j, h)
  let density = Math.exp(logPoissonTerm(a + j, h) - logCentral) // p_j g_j
  let sum = 0
  let densities = 0
  for (;;) {
    sum += term
    densities += density
    if (j === 0) break
    const ratio = j / mean
    const added = (density * (a + j)) / h
    const next = ratio * (term + added)
    density = ratio * added
    j -= 1
    if (j < peak && next * term <= ROUNDING * 0.1 * sum * (term - next)) break
    term = next
  }
  return { log: logScale + Math.log(sum), slope: (-0.5 * densities) / sum }
}

/** Where p_j g_j is largest: j (a + j) = m h. */
function jointMode(a: number, h: number, mean: number): number {
  const product = mean * h
  return (2 * product) / (a + Math.sqrt(a * a + 4 * product))
}

/**
 * The first j that matters for the upper tail. Below the peak a term falls at least as fast as p_j and as p_j g_j
 * (Q(a, h) and Q(a, h)/g both rise with a).
 */
function firstTerm(peak: number, a: number, h: number, mean: number): number {
  let poisson = 1
  let joint = 1
  let j = peak
  while (j > 0 && poisson > NEGLIGIBLE && joint > NEGLIGIBLE) {
    poisson *= j / mean
    joint *= (j / mean) * ((a + j) / h)
    j -= 1
  }
  return j
}

/** The last j that matters for the lower tail, by the mirrored argument (P(a, h) and P(a, h)/g both fall with a). */
function lastTerm(peak: number, a: number, h: number, mean: number): number {
  let poisson = 1
  let joint = 1
  let j = peak
  while (poisson > NEGLIGIBLE && joint > NEGLIGIBLE) {
    j += 1
    poisson *= mean / j
    joint *= (mean / j) * (h / (a + j))
  }
  return j
}

/** A first guess from the normal approximation with mean df + lambda and variance 2 (df + 2 lambda), kept above 0. */
function roughNoncentrality(x: number, df: number, lowerTailProbability: number): number {
  const z = lowerTailProbability <= 0.5 ? -roughUpperQuantile(lowerTailProbability) : roughUpperQuantile(1 - lowerTailProbability)
  const deviation = 2 * (Math.sqrt(Math.max(z * z + x - df / 2, 0)) - z)
  const guess = (deviation * deviation) / 4 - df / 2
  return Math.max(guess, 0.05 * Math.min(x, df))
}

function requireArguments(x: number, df: number, lambda: number): void {
  if (Number.isNaN(x)) throw new RangeError('a chi-square value that is not a number has no tail')
  if (!(df > 0 && df < Number.POSITIVE_INFINITY)) throw new RangeError(`positive degrees of freedom are needed, not ${df}`)
  if (x > LARGEST && x < Number.POSITIVE_INFINITY) throw new RangeError(`a chi-square value up to ${LARGEST} is needed, not ${x}`)
  if (!(lambda >= 0 && lambda <= LARGEST)) throw new RangeError(`a noncentrality from 0 to ${LARGEST} is needed, not ${lambda}`)
}
