import { readFileSync } from 'node:fs'
import { describe, expect, it } from 'vitest'
import { seededGenerator } from '../distributions/generator.ts'
import { splitByPattern, unseenPair } from './missing-patterns.ts'
import { completeCaseMoments } from './sample-moments.ts'
import { saturatedMoments } from './saturated-em.ts'

interface AirQuality {
  data: { raw: (number | null)[][]; patterns: { observed: string[]; n: number }[]; variables: string[] }
  expected: { saturated: { mean: number[]; covariance_lower: number[][] } }
}

const airQuality = JSON.parse(
  readFileSync(new URL('../../../fixtures/reference/03a_airquality_fiml_one_factor.json', import.meta.url), 'utf8')
) as AirQuality
const rows = Float64Array.from(airQuality.data.raw.flatMap((row) => row.map((value) => value ?? Number.NaN)))

describe('missingness patterns', () => {
  it('are those of the air quality data (Chambers et al. 1983), most frequent first', () => {
    const { patterns, n, empty } = splitByPattern(rows, 4)
    expect([n, empty]).toEqual([153, 0])
    const found = patterns.map((pattern) => ({
      observed: [...pattern.observed].map((i) => airQuality.data.variables[i]),
      n: pattern.n
    }))
    expect(found).toEqual([...airQuality.data.patterns].sort((a, b) => b.n - a.n))
  })

  it('count a row without any answer apart', () => {
    const { patterns, n, empty } = splitByPattern(Float64Array.of(1, 2, Number.NaN, Number.NaN, 3, Number.NaN), 2)
    expect([patterns.length, n, empty]).toEqual([2, 2, 1])
  })

  it('name a pair of indicators that nobody answered together', () => {
    const { patterns } = splitByPattern(Float64Array.of(1, 2, Number.NaN, 2, 1, Number.NaN, 3, Number.NaN, 4, 5, Number.NaN, 6), 3)
    expect(unseenPair(patterns, 3)).toEqual([1, 2])
    expect(unseenPair(splitByPattern(rows, 4).patterns, 4)).toBeNull()
  })
})

describe('unrestricted moments by EM', () => {
  it('are those of the worked example 03a to 1e-7', () => {
    const { mean, covariance, converged } = saturatedMoments(splitByPattern(rows, 4).patterns, 4)
    expect(converged).toBe(true)
    airQuality.expected.saturated.mean.forEach((value, i) => {
      expect(Math.abs(mean[i]! / value - 1)).toBeLessThan(1e-7)
    })
    airQuality.expected.saturated.covariance_lower.forEach((line, i) => {
      line.forEach((value, j) => {
        expect(Math.abs(covariance[i * 4 + j]! / value - 1), `${i},${j}`).toBeLessThan(1e-6)
      })
    })
  })

  it('are the ordinary moments when nothing is missing, after one map', () => {
    const generator = seededGenerator(3)
    const values = Float64Array.from({ length: 5 * 40 }, () => generator.normal())
    const plain = completeCaseMoments(values, 5)
    const em = saturatedMoments(splitByPattern(values, 5).patterns, 5)
    em.covariance.forEach((value, k) => {
      expect(value).toBeCloseTo(plain.covariance[k]!, 12)
    })
    expect(em.maps).toBeLessThanOrEqual(4)
  })
})
