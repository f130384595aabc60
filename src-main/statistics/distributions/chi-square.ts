import { logGamma, logLowerGamma, logPoissonTerm, logUpperGamma, lowerGamma, upperGamma } from './gamma.ts'
import { roughUpperQuantile } from './normal.ts'
import { monotoneRoot } from './root.ts'

/**
 * P(chi-square_df > x), df >= 0 and real; 1 for x < 0. With df = 0 all the mass is at 0: 0 for x > 0, and 1 at x = 0 so that
 * P(Q >= 0) = 1. Relative error below 1e-12 down to 1e-300. Throws RangeError for a df or x that is not a number or negative df.
 * Abramowitz & Stegun (1964), 26.4.19: Q(df/2, x/2).
 */
export function chiSquareUpper(x: number, df: number): number {
  requireArguments(x, df)
  if (x <= 0) return 1
  if (df === 0 || x === Number.POSITIVE_INFINITY) return 0
  return upperGamma(df / 2, x / 2)
}

/** P(chi-square_df <= x) with the same accuracy in its own tail; 0 for x <= 0 (with df = 0: for x < 0). */
export function chiSquareLower(x: number, df: number): number {
  requireArguments(x, df)
  if (df === 0) return x >= 0 ? 1 : 0
  if (x <= 0) return 0
  if (x === Number.POSITIVE_INFINITY) return 1
  return lowerGamma(df / 2, x / 2)
}

/** ln P(chi-square_df > x), for tails beyond 1e-300; minus infinity where the probability is truly 0. */
export function logChiSquareUpper(x: number, df: number): number {
  requireArguments(x, df)
  if (x <= 0) return 0
  if (df === 0 || x === Number.POSITIVE_INFINITY) return Number.NEGATIVE_INFINITY
  return logUpperGamma(df / 2, x / 2)
}

/**
 * The critical value: the x with P(chi-square_df > x) = upperTail, 0 < upperTail < 1, df > 0; RangeError otherwise.
 * Start from Wilson & Hilferty (1931) or the leading term at 0, then Newton for ln x on the log of the smaller tail; bracketed
 * above by Laurent & Massart (2000, Lemma 1).
 */
export function chiSquareQuantile(upperTail: number, df: number): number {
  if (!(upperTail > 0 && upperTail < 1)) throw new RangeError(`a tail probability between 0 and 1 is needed, not ${upperTail}`)
  if (!(df > 0 && df < Number.POSITIVE_INFINITY)) throw new RangeError(`positive degrees of freedom are needed, not ${df}`)
  return Math.exp(upperTail <= 0.5 ? logUpperQuantile(upperTail, df) : logLowerQuantile(1 - upperTail, df))
}

function logUpperQuantile(upperTail: number, df: number): number {
  const a = df / 2
  const logTail = Math.log(upperTail)
  const bound = df + 2 * Math.sqrt(-df * logTail) - 2 * logTail
  const start = wilsonHilferty(roughUpperQuantile(upperTail), df)
  return monotoneRoot(
    (logX) => {
      const half = Math.exp(logX) / 2
      const logUpper = logUpperGamma(a, half)
      return { value: logUpper - logTail, slope: -a * Math.exp(logPoissonTerm(a, half) - logUpper) }
    },
    {
      start: Math.log(Math.min(Math.max(start, 1e-3 * bound), bound)),
      low: Number.NEGATIVE_INFINITY,
      high: Math.log(bound),
      rising: false,
      noise: 1e-15
    }
  )
}

function logLowerQuantile(lowerTail: number, df: number): number {
  const a = df / 2
  const logTail = Math.log(lowerTail)
  // P(a, x/2) is below its leading term, so this is a point left of the root
  const leading = Math.LN2 + (logTail + logGamma(a + 1)) / a
  const approximate = Math.log(Math.max(wilsonHilferty(-roughUpperQuantile(lowerTail), df), 0))
  return monotoneRoot(
    (logX) => {
      const half = Math.exp(logX) / 2
      const logLower = logLowerGamma(a, half)
      return { value: logLower - logTail, slope: a * Math.exp(logPoissonTerm(a, half) - logLower) }
    },
    {
      start: Math.max(leading, approximate),
      low: Number.NEGATIVE_INFINITY,
      high: Number.POSITIVE_INFINITY,
      rising: true,
      noise: 1e-15
    }
  )
}

/** Wilson & Hilferty (1931): the cube root of chi-square/df is nearly normal. */
function wilsonHilferty(z: number, df: number): number {
  const variance = 2 / (9 * df)
  return df * (1 - variance + z * Math.sqrt(variance)) ** 3
}

function requireArguments(x: number, df: number): void {
  if (Number.isNaN(x)) throw new RangeError('a chi-square value that is not a number has no tail')
  if (!(df >= 0 && df < Number.POSITIVE_INFINITY)) throw new RangeError(`degrees of freedom of at least 0 are needed, not ${df}`)
}
