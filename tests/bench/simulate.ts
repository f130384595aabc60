/** Sample moments of normal data drawn from a simple-structure population, for benchmarks and property tests. */
import type { Generator } from '../../src-main/statistics/distributions/generator.ts'
import { completeCaseMoments, type SampleMoments } from '../../src-main/statistics/moments/sample-moments.ts'

/**
 * p indicators, p/m to a factor, loadings .6 to .9, factor correlations .3, unit variances; the same in every group but
 * for a factor mean that rises by .2 a group, so that strict invariance holds.
 */
export function simulate(p: number, m: number, sizes: readonly number[], generator: Generator): SampleMoments {
  const groups = simulateRows(p, m, sizes, generator).map((values, g) => ({
    name: sizes.length > 1 ? `g${g + 1}` : null,
    ...completeCaseMoments(values, p)
  }))
  return { indicators: Array.from({ length: p }, (_, i) => `y${i + 1}`), groups }
}

/** The cases behind them: per group n x p row-major. */
export function simulateRows(p: number, m: number, sizes: readonly number[], generator: Generator): Float64Array[] {
  const per = p / m
  return sizes.map((n, g) => {
    const values = new Float64Array(n * p)
    const eta = new Float64Array(m)
    for (let row = 0; row < n; row++) {
      const common = generator.normal()
      for (let k = 0; k < m; k++) eta[k] = 0.2 * g + Math.sqrt(0.3) * common + Math.sqrt(0.7) * generator.normal()
      for (let i = 0; i < p; i++) {
        const loading = 0.6 + 0.3 * ((i % per) / per)
        values[row * p + i] = loading * eta[Math.floor(i / per)]! + Math.sqrt(1 - loading * loading) * generator.normal()
      }
    }
    return values
  })
}
