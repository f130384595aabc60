/**
 * Full-information maximum likelihood: fixtures/reference/03a (daily air quality in New York 1973; Chambers et al. 1983)
 * and 03b (simulated, missing at random, three groups), within the tolerance the files state.
 */
import { describe, expect, it } from 'vitest'
import { fitModel } from '../../src-main/statistics/fit/fit.ts'
import { compileModel } from '../../src-main/statistics/model/compile.ts'
import { type Example, exampleCells, readExample } from './examples.ts'
import { type MissingExample, momentsWithPatterns, rowsOf } from './missing-examples.ts'

const near = (actual: number | null, expected: number, tolerance: number, what: string) =>
  expect(Math.abs(actual! - expected), `${what}: ${actual} for ${expected}`).toBeLessThanOrEqual(
    tolerance * Math.max(1, Math.abs(expected))
  )

for (const file of ['03a_airquality_fiml_one_factor.json', '03b_simulated_missing_multigroup.json']) {
  const example = readExample<MissingExample>(file)
  const moments = momentsWithPatterns(example)
  const rows = rowsOf(example).map((g) => g.values)
  describe(file, () => {
    for (const name of Object.keys(example.models)) {
      const expected = example.expected[name]!
      const cells = exampleCells(example as unknown as Example, name)
      it(`${name}: T = ${expected.T.toFixed(3)} on ${expected.df} df, with indices and log-likelihoods`, () => {
        const { fit } = fitModel(cells, moments, { convention: 'normal', standardErrors: 'observed' })
        expect(fit.state, fit.reason ?? '').toBe('fitted')
        near(fit.T, expected.T, 1e-6, 'T')
        expect([fit.df, fit.parameters]).toEqual([expected.df, expected.n_free_parameters])
        near(fit.baseline!.T, example.expected.baseline.T, 1e-6, 'baseline T')
        near(fit.logLikelihood, expected.loglik, 1e-6, 'logLikelihood')
        near(fit.unrestrictedLogLikelihood, expected.loglik_unrestricted, 1e-8, 'unrestricted')
        near(fit.p, expected.p, 1e-5, 'p')
        near(fit.aic, expected.AIC, 1e-6, 'aic')
        near(fit.bic, expected.BIC, 1e-6, 'bic')
        near(fit.adjustedBic, expected.SABIC, 1e-6, 'adjusted bic')
        near(fit.cfi, expected.cfi, 1e-5, 'cfi')
        near(fit.tli, expected.tli, 1e-5, 'tli')
        near(fit.rmsea.estimate, expected.rmsea, 1e-5, 'rmsea')
        near(fit.rmsea.lower, expected.ci90_lower, 1e-5, 'lower')
        near(fit.rmsea.upper, expected.ci90_upper, 1e-5, 'upper')
        near(fit.rmsea.closeFitP, expected.p_close_05, 1e-5, 'close fit')
        near(fit.srmr, expected.srmr_without_means_against_EM_moments, 1e-6, 'srmr')
        near(fit.srmrWithMeans, expected.srmr_with_means_against_EM_moments, 1e-6, 'srmr with means')
      })

      it(`${name}: estimates, errors from the observed information and sandwich errors`, () => {
        const labels = compileModel(cells).gammaLabels
        for (const kind of ['observed', 'robust'] as const) {
          const { fit, gamma } = fitModel(cells, moments, { convention: 'normal', standardErrors: kind }, rows)
          labels.forEach((label, k) => {
            const { est, se_observed, se_sandwich } = expected.estimates[label]!
            near(gamma![k]!, est, 1e-5, label)
            const own = fit.estimates.find((e) => e.free && e.estimate === gamma![k])!.standardError!
            const wanted = kind === 'observed' ? se_observed : se_sandwich
            expect(Math.abs(own / wanted - 1), `${kind} error of ${label}: ${own} for ${wanted}`).toBeLessThan(1e-4)
          })
        }
      })
    }
  })
}
