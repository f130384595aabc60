import fc from 'fast-check'
import { inverse, Matrix } from 'ml-matrix'
import { describe, expect, it } from 'vitest'
import { cholesky, choleskyInverse, choleskySolve, dotRows, envelope, isPositiveDefinite, logDeterminant } from './symmetric.ts'

/** A positive definite matrix: a Gram matrix of random rows plus a little on the diagonal. */
const positiveDefinite = fc.integer({ min: 1, max: 14 }).chain((n) =>
  fc.array(fc.double({ min: -2, max: 2, noNaN: true }), { minLength: n * n, maxLength: n * n }).map((x) => {
    const b = Matrix.from1DArray(n, n, x)
    return { n, a: b.mmul(b.transpose()).add(Matrix.eye(n, n).mul(0.5)) }
  })
)

describe('positive definite kernels, against the general-purpose library ml-matrix', () => {
  it('inverts what ml-matrix inverts', () => {
    fc.assert(
      fc.property(positiveDefinite, ({ n, a }) => {
        const factor = Float64Array.from(a.to1DArray())
        expect(cholesky(factor, n, factor)).toBe(true)
        const own = new Float64Array(n * n)
        choleskyInverse(factor, n, own, new Int32Array(n))
        inverse(a)
          .to1DArray()
          .forEach((value, k) => {
            expect(own[k]).toBeCloseTo(value, 8)
          })
      }),
      { numRuns: 100 }
    )
  })

  it('solves and gives the log-determinant of ml-matrix', () => {
    fc.assert(
      fc.property(positiveDefinite, ({ n, a }) => {
        const factor = new Float64Array(n * n)
        cholesky(Float64Array.from(a.to1DArray()), n, factor)
        const x = Float64Array.from({ length: n }, (_, i) => i + 1)
        choleskySolve(factor, n, x)
        const back = a.mmul(Matrix.columnVector([...x])).to1DArray()
        back.forEach((value, i) => {
          expect(value).toBeCloseTo(i + 1, 7)
        })
        const product = 2 * Array.from({ length: n }, (_, i) => Math.log(factor[i * n + i]!)).reduce((s, v) => s + v, 0)
        expect(logDeterminant(factor, n)).toBeCloseTo(product, 12)
      }),
      { numRuns: 100 }
    )
  })

  it('gives the same factor within an envelope as without one', () => {
    const n = 6
    const a = new Float64Array(n * n)
    const block = (from: number, to: number) => {
      for (let i = from; i < to; i++) for (let j = from; j < to; j++) a[i * n + j] = i === j ? 4 : 1 / (1 + i + j)
    }
    block(0, 2)
    block(2, 4)
    for (let i = 4; i < n; i++) for (let j = 0; j < n; j++) a[i * n + j] = a[j * n + i] = i === j ? 5 : 0.3
    const first = new Int32Array(n)
    envelope(a, n, first)
    expect([...first]).toEqual([0, 0, 2, 2, 0, 0])
    const dense = new Float64Array(n * n)
    const sparse = new Float64Array(n * n)
    cholesky(a, n, dense)
    cholesky(a, n, sparse, first)
    dense.forEach((value, k) => {
      expect(sparse[k]).toBeCloseTo(value, 14)
    })
  })

  it('refuses a matrix that is not positive definite', () => {
    expect(isPositiveDefinite(Float64Array.of(1, 2, 2, 1), 2)).toBe(false)
    expect(isPositiveDefinite(Float64Array.of(1, 0.5, 0.5, 1), 2)).toBe(true)
    expect(isPositiveDefinite(Float64Array.of(Number.NaN), 1)).toBe(false)
  })

  it('adds up rows of every length', () => {
    for (let length = 0; length < 12; length++) {
      const a = Float64Array.from({ length: 14 }, (_, i) => i + 1)
      let plain = 0
      for (let k = 0; k < length; k++) plain += a[1 + k]! * a[2 + k]!
      expect(dotRows(a, 1, a, 2, length)).toBe(plain)
    }
  })
})
