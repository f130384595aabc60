import { inverse, Matrix } from 'ml-matrix'
import { describe, expect, it } from 'vitest'
import { readExample } from '../../../tests/reference/examples.ts'
import { type Generator, seededGenerator } from '../distributions/generator.ts'
import { mardia, mardiaSentence, skewnessByMoments, skewnessByPairs } from './mardia.ts'

function draw(n: number, p: number, generator: Generator, shape: (z: number) => number = (z) => z): Float64Array {
  const rows = new Float64Array(n * p)
  for (let i = 0; i < n; i++) {
    const common = generator.normal()
    for (let j = 0; j < p; j++) rows[i * p + j] = shape(common + generator.normal())
  }
  return rows
}

/** b1 and b2 as defined, from whole matrices. */
function twin(rows: Float64Array, p: number): { b1: number; b2: number } {
  const n = rows.length / p
  const y = Matrix.from1DArray(n, p, [...rows])
  const e = y.subRowVector(y.mean('column'))
  const r = e.mmul(inverse(e.transpose().mmul(e).div(n))).mmul(e.transpose())
  let b1 = 0
  for (let i = 0; i < n; i++) for (let j = 0; j < n; j++) b1 += r.get(i, j) ** 3 / n ** 2
  return { b1, b2: r.diagonal().reduce((sum, d) => sum + d * d, 0) / n }
}

describe("Mardia's skewness and kurtosis", () => {
  it('are those of the definition, on the ratings of Chatterjee & Price (1977) and on the iris groups of Anderson (1935)', () => {
    const attitude = readExample('02a_attitude_one_factor_robust.json').data.groups!
    const iris = readExample('01a_iris_invariance.json').data.groups!
    for (const { raw } of [...attitude, ...iris]) {
      const rows = Float64Array.from(raw.flat())
      const p = raw[0]!.length
      const { b1, b2 } = twin(rows, p)
      const result = mardia(rows, p)!
      expect(result.skewness.value).toBeCloseTo(b1, 9)
      expect(result.kurtosis.value).toBeCloseTo(b2, 9)
      expect(result.skewness.df).toBe((p * (p + 1) * (p + 2)) / 6)
      expect(result.kurtosis.largeSample.z).toBeCloseTo((b2 - p * (p + 2)) / Math.sqrt((8 * p * (p + 2)) / raw.length), 8)
      expect(result.skewness.largeSample.chiSquare).toBeCloseTo((raw.length * b1) / 6, 8)
    }
  })

  it('come out the same by pairs of rows and by third moments', () => {
    for (const [n, p] of [
      [200, 5],
      [70, 12],
      [64, 1]
    ] as const) {
      const rows = draw(n, p, seededGenerator(n), (z) => z + z * z)
      expect(skewnessByMoments(rows, p, n) / skewnessByPairs(rows, p, n)).toBeCloseTo(1, 10)
    }
  })

  it('do not change under a linear transformation of the indicators', () => {
    const p = 3
    const rows = draw(150, p, seededGenerator(3), Math.exp)
    const turned = rows.map((_, at) => {
      const start = at - (at % p)
      return at % p === 0
        ? 40 * rows[at]! - 7
        : at % p === 1
          ? rows[start]! + rows[at]!
          : 0.01 * rows[at]! - 0.02 * rows[start + 1]!
    })
    const [before, after] = [mardia(rows, p)!, mardia(turned, p)!]
    expect(after.skewness.value / before.skewness.value).toBeCloseTo(1, 9)
    expect(after.kurtosis.value / before.kurtosis.value).toBeCloseTo(1, 9)
  })

  it('of one indicator are the squared skewness and the kurtosis of that indicator', () => {
    const result = mardia(draw(80, 1, seededGenerator(9), Math.exp), 1)!
    expect(result.skewness.value).toBeCloseTo(result.indicators[0]!.skewness ** 2, 10)
    expect(result.kurtosis.value).toBeCloseTo(result.indicators[0]!.kurtosis + 3, 10)
  })

  it('average what is expected of normal samples of 25 rows, and kurtosis varies as expected (Mardia 1974)', () => {
    const generator = seededGenerator(41)
    const replications = 4000
    let [b1, b2, chiSquare, z2] = [0, 0, 0, 0]
    let expected = { b1: 0, b2: 0 }
    for (let r = 0; r < replications; r++) {
      const { skewness, kurtosis } = mardia(draw(25, 3, generator), 3)!
      b1 += skewness.value / replications
      b2 += kurtosis.value / replications
      chiSquare += skewness.chiSquare / replications
      z2 += kurtosis.z ** 2 / replications
      expected = { b1: skewness.expected, b2: kurtosis.expected }
    }
    expect(Math.abs(b1 / expected.b1 - 1)).toBeLessThan(0.03)
    expect(Math.abs(b2 / expected.b2 - 1)).toBeLessThan(0.01)
    expect(Math.abs(chiSquare / 10 - 1)).toBeLessThan(0.03)
    expect(Math.abs(z2 - 1)).toBeLessThan(0.12)
  })

  it('leave incomplete rows out', () => {
    const rows = draw(60, 3, seededGenerator(4))
    const holed = Float64Array.from([...rows.slice(0, 30), 1, Number.NaN, 2, ...rows.slice(30)])
    expect(mardia(holed, 3)).toEqual(mardia(rows, 3))
  })

  it('are not computed from too few rows or a singular covariance matrix', () => {
    expect(mardia(draw(5, 3, seededGenerator(4)), 3)).toBeNull()
    expect(mardia(new Float64Array(60).fill(2), 3)).toBeNull()
  })
})

describe('the sentence about skewness and kurtosis', () => {
  const one = (name: string | null, rows: Float64Array) => ({ name, result: mardia(rows, 3) })

  it('recommends the scaled statistic where tails are heavy', () => {
    const sentence = mardiaSentence([
      one(
        null,
        draw(400, 3, seededGenerator(2), (z) => z ** 3)
      )
    ])!
    expect(sentence).toMatch(
      /^Tails are heavier than those of normal data \(kurtosis [\d.]+ where normal data have 14\.9 on average, p < \.001\)/
    )
    expect(sentence).toContain('The mean-scaled statistic with robust standard errors is recommended')
  })

  it('says so where tails are light', () => {
    const sentence = mardiaSentence([one(null, draw(400, 3, seededGenerator(2), Math.tanh))])!
    expect(sentence).toMatch(/^Tails are lighter than those of normal data.*reject too seldom.*recommended/)
  })

  it('is content with normal data, and names the groups that depart', () => {
    const normal = one('first', draw(300, 3, seededGenerator(6)))
    expect(mardiaSentence([{ ...normal, name: null }])).toMatch(/^Multivariate kurtosis does not depart detectably/)
    const sentence = mardiaSentence([
      normal,
      one(
        'second',
        draw(300, 3, seededGenerator(2), (z) => z ** 3)
      )
    ])!
    expect(sentence).toMatch(/^Tails are heavier than those of normal data in second \(/)
    expect(sentence).not.toContain('first')
  })

  it('is not there where nothing could be computed', () => {
    expect(mardiaSentence([{ name: null, result: null }])).toBeNull()
  })
})
