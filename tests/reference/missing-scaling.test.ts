/** Scaling factors of Yuan & Bentler (2000), forms a and b of fixtures/reference/03a and 03b. */
import { expect, it } from 'vitest'
import { normalObjective } from '../../src-main/statistics/estimation/normal-likelihood.ts'
import { missingScalingFactor } from '../../src-main/statistics/estimation/scaling-missing.ts'
import { fitModel } from '../../src-main/statistics/fit/fit.ts'
import { compileModel } from '../../src-main/statistics/model/compile.ts'
import { type Example, exampleCells, readExample } from './examples.ts'
import { type MissingExample, momentsWithPatterns, rowsOf } from './missing-examples.ts'

const forms = {
  atModel: 'b_U_Gamma_A_and_B_at_model_implied_moments_observed_information',
  atUnrestricted: 'a_YuanBentler2000_U_Gamma_saturated_observed_information'
}

for (const file of ['03a_airquality_fiml_one_factor.json', '03b_simulated_missing_multigroup.json']) {
  const example = readExample<MissingExample>(file)
  const moments = momentsWithPatterns(example)
  const rows = rowsOf(example).map((g) => g.values)
  for (const name of Object.keys(example.models)) {
    it(`${file}: ${name} has the scaling factor ${example.expected[name]!.yuan_bentler_scaling_factors[forms.atUnrestricted]!.toFixed(4)}`, () => {
      const cells = exampleCells(example as unknown as Example, name)
      const model = compileModel(cells)
      const { gamma } = fitModel(cells, moments, { convention: 'normal', standardErrors: 'observed' })
      const objective = normalObjective(model, moments, 'normal')
      objective.evaluate(Float64Array.from(gamma!))
      const factors = example.expected[name]!.yuan_bentler_scaling_factors
      const atModel = missingScalingFactor(model, objective, moments, rows, 'the model-implied moments')!
      const atUnrestricted = missingScalingFactor(model, objective, moments, rows)!
      expect(Math.abs(atModel / factors[forms.atModel]! - 1)).toBeLessThan(1e-5)
      expect(Math.abs(atUnrestricted / factors[forms.atUnrestricted]! - 1)).toBeLessThan(1e-5)
    })
  }
}
