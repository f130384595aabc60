/**
 * Log-gamma and the regularised incomplete gamma functions, on a log scale where tails need it.
 *
 * Our own, because the standard is a relative 1e-10 down to 1e-300: jstat has upper tails as 1 - cdf only, which is nothing below
 * 1e-16, and its log-gamma at 1000 is off by 2e-10, which is the relative error of a tail built from it. `jstat.test.ts` shows both.
 */

const HALF_LOG_TWO_PI = 0.9189385332046728
const ROUNDING = 2 ** -52
/** Enough for a = x = 1e9; running out means a wrong argument slipped through. */
const MOST_TERMS = 1_000_000

/** Bernoulli coefficients B_2k / (2k (2k - 1)) of Stirling's series (Abramowitz & Stegun 1964, 6.1.40). */
const STIRLING = [1 / 12, -1 / 360, 1 / 1260, -1 / 1680, 1 / 1188, -691 / 360360, 1 / 156, -3617 / 122400]
/** From here on eight terms of the series leave less than 1e-17. */
const STIRLING_FROM = 16

/**
 * ln Gamma(x) for x > 0; absolute error about 1e-15 up to x = 10, relative beyond. Throws RangeError otherwise.
 * Stirling's series, after a shift by the recurrence for small x (Abramowitz & Stegun 1964, 6.1.15 and 6.1.40).
 */
export function logGamma(x: number): number {
  if (!(x > 0)) throw new RangeError(`logGamma needs a positive argument, not ${x}`)
  if (x === Number.POSITIVE_INFINITY) return x
  return (x - 0.5) * Math.log(x) - x + HALF_LOG_TWO_PI + stirlingRemainder(x)
}

/**
 * ln of e^-x x^a / Gamma(a + 1) for a >= 0, x >= 0: the Poisson probability of a at mean x, continued to real a.
 * Written as -a phi(x/a - 1) - ln(2 pi a)/2 - remainder, phi(m) = m - ln(1 + m), so that nothing large cancels near x = a
 * (Temme 1979, SIAM J. Math. Anal. 10, 757; Loader 2000, "Fast and accurate computation of binomial probabilities").
 */
export function logPoissonTerm(a: number, x: number): number {
  if (a === 0) return -x
  if (x === 0) return Number.NEGATIVE_INFINITY
  return -deviance(a, x) - HALF_LOG_TWO_PI - 0.5 * Math.log(a) - stirlingRemainder(a)
}

/** P(a, x), the lower regularised incomplete gamma function; a > 0, x >= 0. */
export function lowerGamma(a: number, x: number): number {
  if (x < a + 1) return Math.exp(logPoissonTerm(a, x)) * lowerSeries(a, x)
  return 1 - upperGamma(a, x)
}

/** Q(a, x) = 1 - P(a, x) without the subtraction where Q is small; a > 0, x >= 0. */
export function upperGamma(a: number, x: number): number {
  if (x < a + 1) return 1 - lowerGamma(a, x)
  return Math.exp(logPoissonTerm(a, x)) * a * upperFraction(a, x)
}

/** ln P(a, x); a > 0, x >= 0; minus infinity at x = 0. */
export function logLowerGamma(a: number, x: number): number {
  if (x < a + 1) return logPoissonTerm(a, x) + Math.log(lowerSeries(a, x))
  return Math.log1p(-upperGamma(a, x))
}

/** ln Q(a, x); a > 0, x >= 0; holds far beyond the range of doubles. */
export function logUpperGamma(a: number, x: number): number {
  if (x < a + 1) return Math.log1p(-lowerGamma(a, x))
  return logPoissonTerm(a, x) + Math.log(a * upperFraction(a, x))
}

/** ln Gamma(x) - [(x - 1/2) ln x - x + ln(2 pi)/2]. */
function stirlingRemainder(x: number): number {
  let shifted = x
  let correction = 0
  while (shifted < STIRLING_FROM) {
    correction += (shifted + 0.5) * Math.log1p(1 / shifted) - 1
    shifted += 1
  }
  const inverse = 1 / shifted
  const square = inverse * inverse
  let series = 0
  for (let k = STIRLING.length - 1; k >= 0; k--) series = series * square + STIRLING[k]!
  return correction + series * inverse
}

/** a phi(x/a - 1) = x - a - a ln(x/a), without cancellation near x = a. */
function deviance(a: number, x: number): number {
  const m = (x - a) / a
  if (Math.abs(m) > 0.3) return x - a - a * Math.log(x / a)
  const r = m / (2 + m)
  const square = r * r
  // m - ln(1 + m) = m r - 2 r^3 (1/3 + r^2/5 + r^4/7 + ...), from ln(1 + m) = 2 artanh r
  let power = r * square
  let sum = 0
  for (let k = 3; Math.abs(power) > ROUNDING * 1e-3 * Math.abs(m * r); k += 2) {
    sum += power / k
    power *= square
  }
  return a * (m * r - 2 * sum)
}

/** 1 + x/(a+1) + x^2/((a+1)(a+2)) + ... (Abramowitz & Stegun 1964, 6.5.29). */
function lowerSeries(a: number, x: number): number {
  let term = 1
  let sum = 1
  for (let n = 1; n < MOST_TERMS; n++) {
    term *= x / (a + n)
    sum += term
    if (term < sum * ROUNDING * 0.1 * (1 - x / (a + n + 1))) return sum
  }
  throw new Error(`the incomplete gamma series did not settle at a = ${a}, x = ${x}`)
}

/** Gamma(a, x) e^x x^-a as a continued fraction for x >= a + 1 (Abramowitz & Stegun 1964, 6.5.31; evaluated after Lentz 1976). */
function upperFraction(a: number, x: number): number {
  let b = x + 1 - a
  let c = Number.POSITIVE_INFINITY
  let d = 1 / b
  let value = d
  for (let n = 1; n < MOST_TERMS; n++) {
    const numerator = -n * (n - a)
    b += 2
    d = 1 / (numerator * d + b)
    c = b + numerator / c
    const factor = c * d
    value *= factor
    if (Math.abs(factor - 1) < 2 * ROUNDING) return value
  }
  throw new Error(`the incomplete gamma fraction did not settle at a = ${a}, x = ${x}`)
}
