/**
 * Sample moments per group: what normal-theory estimation needs of complete data.
 *
 * A covariance matrix is p x p row-major with the divisor its convention asks for (n_g for "normal", n_g - 1 for
 * "wishart"; methods: section 2). `mean` is null where only covariances are known or modelled.
 */
export interface GroupMoments {
  name: string | null
  /** Cases used, n_g. */
  n: number
  covariance: Float64Array
  mean: Float64Array | null
  /** Full information: the cases by missingness pattern; covariance and mean are then the unrestricted estimates. */
  patterns?: Pattern[]
}

/** The cases that have answered the same indicators: sufficient statistics of what they answered. */
export interface Pattern {
  /** Indices of the answered indicators, ascending; k of them. */
  observed: Int32Array
  n: number
  /** k; null where means are not modelled */
  mean: Float64Array | null
  /** k x k, divisor n */
  covariance: Float64Array
}

export interface SampleMoments {
  indicators: string[]
  groups: GroupMoments[]
}

/**
 * Means and covariances (divisor n) of the rows without a missing value.
 *
 * @param values n x p row-major, NaN where missing
 * @returns cases used, mean (p) and covariance (p x p); a covariance of fewer than two cases is all zero
 * Two passes (deviations from the mean), so that large means cost no digits.
 */
export function completeCaseMoments(values: Float64Array, p: number): { n: number; mean: Float64Array; covariance: Float64Array } {
  const rows = completeRows(values, p)
  const n = rows.length
  const mean = new Float64Array(p)
  for (const start of rows) for (let j = 0; j < p; j++) mean[j]! += values[start + j]! / n
  const covariance = new Float64Array(p * p)
  const deviation = new Float64Array(p)
  for (const start of rows) {
    for (let j = 0; j < p; j++) deviation[j] = values[start + j]! - mean[j]!
    for (let i = 0; i < p; i++) {
      const di = deviation[i]!
      for (let j = 0; j <= i; j++) covariance[i * p + j]! += di * deviation[j]!
    }
  }
  for (let i = 0; i < p; i++) {
    for (let j = 0; j <= i; j++) {
      const value = covariance[i * p + j]! / Math.max(n, 1)
      covariance[i * p + j] = value
      covariance[j * p + i] = value
    }
  }
  return { n, mean, covariance }
}

/** The rows without a missing value, n x p, in order. */
export function completeRowValues(values: Float64Array, p: number): Float64Array {
  const starts = completeRows(values, p)
  const out = new Float64Array(starts.length * p)
  starts.forEach((start, row) => {
    out.set(values.subarray(start, start + p), row * p)
  })
  return out
}

/** Offsets into `values` of the rows without NaN. */
function completeRows(values: Float64Array, p: number): number[] {
  const starts: number[] = []
  for (let start = 0; start + p <= values.length; start += p) {
    let complete = true
    for (let j = 0; j < p && complete; j++) complete = !Number.isNaN(values[start + j]!)
    if (complete) starts.push(start)
  }
  return starts
}
