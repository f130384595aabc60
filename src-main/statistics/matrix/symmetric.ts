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
  const whole = n - (n % 4)
  for (let i = 0; i < whole; i += 4) {
    let from = 0
    if (first !== undefined) from = Math.min(first[i]!, first[i + 1]!, first[i + 2]!, first[i + 3]!)
    fourRows(a, n, l, i, Math.min(from, i), first)
    for (let row = i; row < i + 4; row++) if (!finishRow(a, n, l, row, Math.min(from, i), i)) return false
  }
  for (let i = whole; i < n; i++) {
    const from = first === undefined ? 0 : first[i]!
    if (!finishRow(a, n, l, i, from, from, first)) return false
  }
  return true
}

/** Rows i to i + 3 of the factor, columns `from` to i - 1, two at a time: six numbers read serve eight products. */
function fourRows(a: Float64Array, n: number, l: Float64Array, i: number, from: number, first?: Int32Array): void {
  const r0 = i * n
  const r1 = r0 + n
  const r2 = r1 + n
  const r3 = r2 + n
  for (let j = from; j < i; j += 2) {
    const rj = j * n
    // An odd last column is done with itself as its own neighbour.
    const next = j + 1 < i ? j + 1 : j
    const rn = next * n
    let s0 = a[r0 + j]!
    let s1 = a[r1 + j]!
    let s2 = a[r2 + j]!
    let s3 = a[r3 + j]!
    let t0 = a[r0 + next]!
    let t1 = a[r1 + next]!
    let t2 = a[r2 + next]!
    let t3 = a[r3 + next]!
    for (let k = first === undefined ? from : Math.max(from, Math.min(first[j]!, first[next]!)); k < j; k++) {
      const x = l[rj + k]!
      const y = l[rn + k]!
      const l0 = l[r0 + k]!
      const l1 = l[r1 + k]!
      const l2 = l[r2 + k]!
      const l3 = l[r3 + k]!
      s0 -= l0 * x
      s1 -= l1 * x
      s2 -= l2 * x
      s3 -= l3 * x
      t0 -= l0 * y
      t1 -= l1 * y
      t2 -= l2 * y
      t3 -= l3 * y
    }
    const pivot = l[rj + j]!
    l[r0 + j] = s0 /= pivot
    l[r1 + j] = s1 /= pivot
    l[r2 + j] = s2 /= pivot
    l[r3 + j] = s3 /= pivot
    if (next === j) continue
    const below = l[rn + j]!
    const second = l[rn + next]!
    l[r0 + next] = (t0 - s0 * below) / second
    l[r1 + next] = (t1 - s1 * below) / second
    l[r2 + next] = (t2 - s2 * below) / second
    l[r3 + next] = (t3 - s3 * below) / second
  }
}

/** Columns `start` to i of row i, whose first nonzero is at `from` or later; false when the pivot is not positive. */
function finishRow(
  a: Float64Array,
  n: number,
  l: Float64Array,
  i: number,
  from: number,
  start: number,
  first?: Int32Array
): boolean {
  const ri = i * n
  for (let j = start; j < i; j++) {
    const rj = j * n
    const k = first === undefined ? from : Math.max(from, first[j]!)
    l[ri + j] = (a[ri + j]! - dotRows(l, ri + k, l, rj + k, j - k)) / l[rj + j]!
  }
  const pivot = a[ri + i]! - dotRows(l, ri + from, l, ri + from, i - from)
  if (!(pivot > 0) || pivot === Infinity) return false
  l[ri + i] = Math.sqrt(pivot)
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
  inverse.fill(0, 0, n * n)
  const whole = n - (n % 4)
  for (let k = 0; k < whole; k += 4) {
    addFourOuter(l, n, k, Math.min(first[k]!, first[k + 1]!, first[k + 2]!, first[k + 3]!), inverse)
  }
  for (let k = whole; k < n; k++) addOuter(l, n, k, first[k]!, k, inverse)
  mirrorLower(inverse, n)
}

/** Adds the outer products of rows k to k + 3 of l, each with itself, to the lower triangle of `sum`. */
function addFourOuter(l: Float64Array, n: number, k: number, from: number, sum: Float64Array): void {
  const r0 = k * n
  const r1 = r0 + n
  const r2 = r1 + n
  const r3 = r2 + n
  for (let i = from; i <= k; i++) {
    const l0 = l[r0 + i]!
    const l1 = l[r1 + i]!
    const l2 = l[r2 + i]!
    const l3 = l[r3 + i]!
    if (l0 === 0 && l1 === 0 && l2 === 0 && l3 === 0) continue
    const ri = i * n
    for (let j = from; j <= i; j++) {
      sum[ri + j]! += l0 * l[r0 + j]! + l1 * l[r1 + j]! + l2 * l[r2 + j]! + l3 * l[r3 + j]!
    }
  }
  for (let row = k + 1; row < k + 4; row++) {
    // What is left of the later rows: their own columns beyond k.
    for (let i = k + 1; i <= row; i++) {
      const value = l[row * n + i]!
      for (let j = from; j <= i; j++) sum[i * n + j]! += value * l[row * n + j]!
    }
  }
}

/** Adds the outer product of row k of l with itself, columns `from` to `to`, to the lower triangle of `sum`. */
function addOuter(l: Float64Array, n: number, k: number, from: number, to: number, sum: Float64Array): void {
  const rk = k * n
  for (let i = from; i <= to; i++) {
    const value = l[rk + i]!
    const ri = i * n
    for (let j = from; j <= i; j++) sum[ri + j]! += value * l[rk + j]!
  }
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

/**
 * Replaces a lower triangular matrix by its inverse, row by row: row i of it is -(l_i before i) times the rows above.
 *
 * @param first the envelope of l; becomes that of the inverse
 */
function invertLower(l: Float64Array, n: number, first: Int32Array): void {
  const row = new Float64Array(n)
  for (let i = 0; i < n; i++) {
    const ri = i * n
    const diagonal = 1 / l[ri + i]!
    let from = i
    for (let k = first[i]!; k < i; k++) if (l[ri + k] !== 0) from = Math.min(from, first[k]!)
    row.fill(0, from, i)
    let k = first[i]!
    for (; k + 4 <= i; k += 4) addFourRows(l, n, ri, k, Math.min(first[k]!, first[k + 1]!, first[k + 2]!, first[k + 3]!), row)
    for (; k < i; k++) {
      const lik = l[ri + k]!
      if (lik === 0) continue
      const rk = k * n
      for (let j = first[k]!; j <= k; j++) row[j]! += lik * l[rk + j]!
    }
    for (let j = from; j < i; j++) l[ri + j] = -row[j]! * diagonal
    l[ri + i] = diagonal
    first[i] = from
  }
}

/** row += sum over the four rows from k of l[ri + row] times that row, a lower triangle's. */
function addFourRows(l: Float64Array, n: number, ri: number, k: number, from: number, row: Float64Array): void {
  const l0 = l[ri + k]!
  const l1 = l[ri + k + 1]!
  const l2 = l[ri + k + 2]!
  const l3 = l[ri + k + 3]!
  if (l0 === 0 && l1 === 0 && l2 === 0 && l3 === 0) return
  const r0 = k * n
  const r1 = r0 + n
  const r2 = r1 + n
  const r3 = r2 + n
  for (let j = from; j <= k; j++) row[j]! += l0 * l[r0 + j]! + l1 * l[r1 + j]! + l2 * l[r2 + j]! + l3 * l[r3 + j]!
  row[k + 1]! += l1 * l[r1 + k + 1]! + l2 * l[r2 + k + 1]! + l3 * l[r3 + k + 1]!
  row[k + 2]! += l2 * l[r2 + k + 2]! + l3 * l[r3 + k + 2]!
  row[k + 3]! += l3 * l[r3 + k + 3]!
}

/** The rows and columns `selected` of an n x n matrix; of a lower triangle (their order ascending) the lower triangle. */
export function submatrix(a: Float64Array, n: number, selected: readonly number[]): Float64Array {
  const k = selected.length
  return Float64Array.from({ length: k * k }, (_, at) => a[selected[Math.floor(at / k)]! * n + selected[at % k]!]!)
}

/** Copies the lower triangle onto the upper. */
export function mirrorLower(a: Float64Array, n: number): void {
  for (let i = 1; i < n; i++) for (let j = 0; j < i; j++) a[j * n + i] = a[i * n + j]!
}

/** c = a b for a (rows x inner) and b (inner x columns), row-major; `c` must not share memory with a or b. */
export function multiply(a: Float64Array, b: Float64Array, rows: number, inner: number, columns: number, c: Float64Array): void {
  if (columns === 1) {
    for (let i = 0; i < rows; i++) c[i] = dotRows(a, i * inner, b, 0, inner)
    return
  }
  const whole = inner - (inner % 4)
  for (let i = 0; i < rows; i++) {
    const ri = i * columns
    const ai = i * inner
    for (let j = 0; j < columns; j++) c[ri + j] = 0
    for (let k = 0; k < whole; k += 4) {
      const a0 = a[ai + k]!
      const a1 = a[ai + k + 1]!
      const a2 = a[ai + k + 2]!
      const a3 = a[ai + k + 3]!
      if (a0 === 0 && a1 === 0 && a2 === 0 && a3 === 0) continue
      const b0 = k * columns
      const b1 = b0 + columns
      const b2 = b1 + columns
      const b3 = b2 + columns
      for (let j = 0; j < columns; j++) c[ri + j]! += a0 * b[b0 + j]! + a1 * b[b1 + j]! + a2 * b[b2 + j]! + a3 * b[b3 + j]!
    }
    for (let k = whole; k < inner; k++) {
      const aik = a[ai + k]!
      if (aik === 0) continue
      const rk = k * columns
      for (let j = 0; j < columns; j++) c[ri + j]! += aik * b[rk + j]!
    }
  }
}

/** Lower triangle of c = a b' (n x n) where that is known to be symmetric: four entries of a row at once. */
export function lowerOfProduct(a: Float64Array, b: Float64Array, n: number, c: Float64Array): void {
  for (let i = 0; i < n; i++) {
    const ri = i * n
    let j = 0
    for (; j + 4 <= i + 1; j += 4) {
      const r0 = j * n
      const r1 = r0 + n
      const r2 = r1 + n
      const r3 = r2 + n
      let s0 = 0
      let s1 = 0
      let s2 = 0
      let s3 = 0
      for (let k = 0; k < n; k++) {
        const x = a[ri + k]!
        s0 += x * b[r0 + k]!
        s1 += x * b[r1 + k]!
        s2 += x * b[r2 + k]!
        s3 += x * b[r3 + k]!
      }
      c[ri + j] = s0
      c[ri + j + 1] = s1
      c[ri + j + 2] = s2
      c[ri + j + 3] = s3
    }
    for (; j <= i; j++) c[ri + j] = dotRows(a, ri, b, j * n, n)
  }
}
