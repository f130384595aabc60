import { describe, expect, it } from 'vitest'
import type { ModelCells } from '../model/cells.ts'
import { fitModel } from './fit.ts'

/** One factor on indicators that hang together only through the first: as y2 and y3 go apart, its loading grows without end. */
const cells: ModelCells = {
  indicators: ['y1', 'y2', 'y3', 'y4'],
  factors: ['F'],
  constraints: [],
  groups: [
    {
      name: null,
      loadings: ['a', 'b', 'c', 'd'].map((label) => [label]),
      regressions: [[0]],
      factorCovariances: [[1]],
      residualCovariances: ['r1', 'r2', 'r3', 'r4'].map((label, i) => [0, 1, 2, 3].map((j) => (i === j ? label : 0))),
      intercepts: null,
      factorMeans: null
    }
  ]
}
const covariance = Float64Array.from([1, 0.5, 0.5, 0.3, 0.5, 1, -0.05, 0, 0.5, -0.05, 1, 0, 0.3, 0, 0, 1])

const moments = { indicators: cells.indicators, groups: [{ name: null, n: 60, covariance, mean: null }] }

describe('a fit whose F falls without end', () => {
  it('names the variance that runs away, and what to do', () => {
    const { fit } = fitModel(cells, moments, { convention: 'normal' })
    expect(fit.state).toBe('not converged')
    expect(fit.reason).toMatch(
      /Negative where the search stopped: the residual variance of y1 \(-\d[\d.e+]+\)\. F may fall without end/
    )
  })

  it('is fitted once that variance is bounded at 0', () => {
    const { fit } = fitModel({ ...cells, bounds: [{ label: 'r1', least: 0, most: null }] }, moments, { convention: 'normal' })
    expect(fit.state).toBe('fitted')
    expect(fit.estimates.find((e) => e.part === 'residual variance' && e.of[0] === 'y1')!.estimate).toBe(0)
  })
})
