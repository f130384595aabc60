/**
 * Dense symmetric positive definite kernels on row-major Float64Array, for the hot loops of estimation.
 *
 * Every function takes its sizes and writes into arrays it is given. Cholesky follows Golub & Van Loan
 * (2013), algorithm 4.2.1, by rows, so that inner loops run along memory.
 */

/** sum over k of a[x + k] b[y + k], k < length. Four running sums, so that one addition need not wait for the last. */
export function dotRows(a: Float64Array, x: number, b: Float64Array, y: number, length: number): number {
  let s0 = 0
  let s1 = 0
  let s2 = 0
  let s3 = 0
  const whole = length - (length % 4)
  for (let k = 0; k < whole; k += 4) {
    s0 += a[x + k]! * b[y + k]!
    s1 += a[x + k + 1]! * b[y + k + 1]!
    s2 += a[x + k + 2]! * b[y + k + 2]!
    s3 += a[x + k + 3]! * b[y + k + 3]!
  }
  for (let k = whole; k < length; k++) s0 += a[x + k]! * b[y + k]!
  return s0 + s1 + (s2 + s3)
}

/**
 * Column of the first nonzero of each row of a lower triangle. The Cholesky factor keeps this envelope, so that blocks
 * which never meet (parameters of different groups) cost nothing when the shared parameters stand last.
 */
export function envelope(a: Float64Array, n: number, first: Int32Array): void {
  for (let i = 0; i < n; i++) {
    let j = 0
    while (j < i && a[i * n + j] === 0) j++
    first[i] = j
  }
}

/**
 * Lower Cholesky factor: a = l l'.
 *
 * @param a n x n, lower triangle read
 * @param l n x n, lower triangle written (may be `a` itself); the upper triangle is left alone
 * @param first the rows' envelope, where a has one worth using; `l` must then be zero outside it
 * @returns false when a pivot is not positive, i.e. `a` is not positive definite; `l` is then undefined
 */
export function cholesky(a: Float64Array, n: number, l: Float64Array, first?: Int32Array): boolean {
  for (let i = 0; i < n; i++) {
    const ri = i * n
    const fi = first === undefined ? 0 : first[i]!
    for (let j = fi; j < i; j++) {
      const rj = j * n
      const from = first === undefined ? 0 : Math.max(fi, first[j]!)
      l[ri + j] = (a[ri + j]! - dotRows(l, ri + from, l, rj + from, j - from)) / l[rj + j]!
    }
    const pivot = a[ri + i]! - dotRows(l, ri + fi, l, ri + fi, i - fi)
    if (!(pivot > 0) || pivot === Infinity) return false
    l[ri + i] = Math.sqrt(pivot)
  }
  return true
}

/** Whether a (n x n) is positive definite; allocates a factor, for use outside the hot loops. */
export function isPositiveDefinite(a: Float64Array, n: number): boolean {
  return cholesky(a, n, new Float64Array(n * n))
}

/** ln|a| from its Cholesky factor. */
export function logDeterminant(l: Float64Array, n: number): number {
  let sum = 0
  for (let i = 0; i < n; i++) sum += Math.log(l[i * n + i]!)
  return 2 * sum
}

/** Solves l l' x = b in place of `x` (length n), within the rows' envelope where one is given. */
export function choleskySolve(l: Float64Array, n: number, x: Float64Array, first?: Int32Array): void {
  for (let i = 0; i < n; i++) {
    const from = first === undefined ? 0 : first[i]!
    x[i] = (x[i]! - dotRows(l, i * n + from, x, from, i - from)) / l[i * n + i]!
  }
  for (let i = n - 1; i >= 0; i--) {
    const value = x[i]! / l[i * n + i]!
    x[i] = value
    for (let k = first === undefined ? 0 : first[i]!; k < i; k++) x[k]! -= l[i * n + k]! * value
  }
}

/**
 * Inverse from the Cholesky factor: inverse = (l l')^-1, whole symmetric matrix written.
 *
 * @param l n x n lower factor, zero above the diagonal or not read there; overwritten by its own inverse (lower triangle)
 * @param inverse n x n
 * @param first work space of n whole numbers
 */
export function choleskyInverse(l: Float64Array, n: number, inverse: Float64Array, first: Int32Array): void {
  envelope(l, n, first)
  invertLower(l, n, first)
  envelope(l, n, first)
  inverse.fill(0, 0, n * n)
  for (let k = 0; k < n; k++) {
    const rk = k * n
    const from = first[k]!
    for (let i = from; i <= k; i++) {
      const lki = l[rk + i]!
      const ri = i * n
      for (let j = from; j <= i; j++) inverse[ri + j]! += lki * l[rk + j]!
    }
  }
  mirrorLower(inverse, n)
}

/** Inverse of a positive definite matrix (n x n, lower triangle read), whole; null when it is not. Allocates; for use outside the hot loops. */
export function positiveInverse(a: Float64Array, n: number): Float64Array | null {
  const factor = new Float64Array(n * n)
  const first = new Int32Array(n)
  envelope(a, n, first)
  if (!cholesky(a, n, factor, first)) return null
  const inverse = new Float64Array(n * n)
  choleskyInverse(factor, n, inverse, first)
  return inverse
}

/** Replaces a lower triangular matrix by its inverse, row by row: row i of it is -(l_i before i) times the rows above. */
function invertLower(l: Float64Array, n: number, first: Int32Array): void {
  const row = new Float64Array(n)
  for (let i = 0; i < n; i++) {
    const ri = i * n
    const diagonal = 1 / l[ri + i]!
    row.fill(0, 0, i)
    for (let k = first[i]!; k < i; k++) {
      const lik = l[ri + k]!
      if (lik === 0) continue
      const rk = k * n
      for (let j = 0; j <= k; j++) row[j]! += lik * l[rk + j]!
    }
    for (let j = 0; j < i; j++) l[ri + j] = -row[j]! * diagonal
    l[ri + i] = diagonal
  }
}

/** Copies the lower triangle onto the upper. */
export function mirrorLower(a: Float64Array, n: number): void {
  for (let i = 1; i < n; i++) for (let j = 0; j < i; j++) a[j * n + i] = a[i * n + j]!
}

/** c = a b for a (rows x inner) and b (inner x columns), row-major; `c` must not share memory with a or b. */
export function multiply(a: Float64Array, b: Float64Array, rows: number, inner: number, columns: number, c: Float64Array): void {
  for (let i = 0; i < rows; i++) {
    const ri = i * columns
    for (let j = 0; j < columns; j++) c[ri + j] = 0
    for (let k = 0; k < inner; k++) {
      const aik = a[i * inner + k]!
      if (aik === 0) continue
      const rk = k * columns
      for (let j = 0; j < columns; j++) c[ri + j]! += aik * b[rk + j]!
    }
  }
}
