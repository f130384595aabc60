/**
 * Dense symmetric positive definite kernels on row-major Float64Array, for the hot loops of estimation.
 *
 * Every function takes its sizes and writes into arrays it is given; none allocates. Cholesky follows Golub & Van Loan
 * (2013), algorithm 4.2.1, by rows, so that both inner loops run along memory.
 */

/**
 * Lower Cholesky factor: a = l l'.
 *
 * @param a n x n, lower triangle read
 * @param l n x n, lower triangle written (may be `a` itself); the upper triangle is left alone
 * @returns false when a pivot is not positive, i.e. `a` is not positive definite; `l` is then undefined
 */
export function cholesky(a: Float64Array, n: number, l: Float64Array): boolean {
  for (let i = 0; i < n; i++) {
    const ri = i * n
    for (let j = 0; j < i; j++) {
      const rj = j * n
      let sum = a[ri + j]!
      for (let k = 0; k < j; k++) sum -= l[ri + k]! * l[rj + k]!
      l[ri + j] = sum / l[rj + j]!
    }
    let pivot = a[ri + i]!
    for (let k = 0; k < i; k++) pivot -= l[ri + k]! * l[ri + k]!
    if (!(pivot > 0) || pivot === Infinity) return false
    l[ri + i] = Math.sqrt(pivot)
  }
  return true
}

/** ln|a| from its Cholesky factor. */
export function logDeterminant(l: Float64Array, n: number): number {
  let sum = 0
  for (let i = 0; i < n; i++) sum += Math.log(l[i * n + i]!)
  return 2 * sum
}

/** Solves l l' x = b in place of `x` (length n). */
export function choleskySolve(l: Float64Array, n: number, x: Float64Array): void {
  for (let i = 0; i < n; i++) {
    let sum = x[i]!
    for (let k = 0; k < i; k++) sum -= l[i * n + k]! * x[k]!
    x[i] = sum / l[i * n + i]!
  }
  for (let i = n - 1; i >= 0; i--) {
    const value = x[i]! / l[i * n + i]!
    x[i] = value
    for (let k = 0; k < i; k++) x[k]! -= l[i * n + k]! * value
  }
}

/**
 * Inverse from the Cholesky factor: inverse = (l l')^-1, whole symmetric matrix written.
 *
 * @param l n x n lower factor, overwritten by its own inverse (lower triangle)
 * @param inverse n x n
 */
export function choleskyInverse(l: Float64Array, n: number, inverse: Float64Array): void {
  invertLower(l, n)
  inverse.fill(0, 0, n * n)
  for (let k = 0; k < n; k++) {
    const rk = k * n
    for (let i = 0; i <= k; i++) {
      const lki = l[rk + i]!
      const ri = i * n
      for (let j = 0; j <= i; j++) inverse[ri + j]! += lki * l[rk + j]!
    }
  }
  mirrorLower(inverse, n)
}

/** Replaces a lower triangular matrix by its inverse. */
function invertLower(l: Float64Array, n: number): void {
  for (let i = 0; i < n; i++) {
    const ri = i * n
    const diagonal = 1 / l[ri + i]!
    for (let j = 0; j < i; j++) {
      let sum = 0
      for (let k = j; k < i; k++) sum += l[ri + k]! * l[k * n + j]!
      l[ri + j] = -sum * diagonal
    }
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
