/** Normal data drawn from a simple-structure population, for benchmarks and property tests. */
import type { Generator } from '../../src-main/statistics/distributions/generator.ts'
import { completeCaseMoments, type SampleMoments } from '../../src-main/statistics/moments/sample-moments.ts'

/**
 * Moments of p indicators, p/m to a factor, loadings .6 to .9, factor correlations .3, unit variances; the same in every
 * group but for a factor mean that rises by .2 a group, so that strict invariance holds.
 */
export function simulate(p: number, m: number, sizes: readonly number[], generator: Generator): SampleMoments {
  const indicators = Array.from({ length: p }, (_, i) => `y${i + 1}`)
  const groups = sizes.map((n, g) => {
    const values = simulateRows(p, m, n, 0.2 * g, generator)
    return { name: sizes.length > 1 ? `g${g + 1}` : null, ...completeCaseMoments(values, p) }
  })
  return { indicators, groups }
}

/** n rows of that population, n x p row-major. */
export function simulateRows(p: number, m: number, n: number, factorMean: number, generator: Generator): Float64Array {
  const per = p / m
  const values = new Float64Array(n * p)
  const eta = new Float64Array(m)
  for (let row = 0; row < n; row++) {
    const common = generator.normal()
    for (let k = 0; k < m; k++) eta[k] = factorMean + Math.sqrt(0.3) * common + Math.sqrt(0.7) * generator.normal()
    for (let i = 0; i < p; i++) {
      const loading = 0.6 + 0.3 * ((i % per) / per)
      values[row * p + i] = loading * eta[Math.floor(i / per)]! + Math.sqrt(1 - loading * loading) * generator.normal()
    }
  }
  return values
}
