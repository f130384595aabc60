/**
 * The whole fit with a mean-scaled statistic: complete data of fixtures/reference/02 (Satorra & Bentler 1994) and missing
 * answers of 03 (Yuan & Bentler 2000, form a), as the plan's settings give them.
 */
import { expect, it } from 'vitest'
import { fitModel } from '../../src-main/statistics/fit/fit.ts'
import { type Example, exampleCells, exampleMoments, readExample } from './examples.ts'
import { type MissingExample, momentsWithPatterns, rowsOf } from './missing-examples.ts'

interface Robust {
  expected: Record<
    string,
    {
      robust: {
        satorra_bentler: {
          c: number
          T_scaled: number
          p_scaled: number
          scaled_indices: { cfi: number; tli: number; rmsea: number }
        }
        robust_indices_Brosseau_Liard_Savalei: { cfi: number; tli: number; rmsea: number }
      }
    }
  >
}

it('attitude ratings (Chatterjee & Price 1977): T = 29.43, c = 1.3205, with indices of both kinds', () => {
  const example = readExample<Example & Robust>('02a_attitude_one_factor_robust.json')
  const rows = example.data.groups!.map((g) => Float64Array.from(g.raw.flat()))
  const { fit } = fitModel(
    exampleCells(example, 'one_factor'),
    exampleMoments(example),
    { convention: 'normal', statistic: 'mean-scaled' },
    rows
  )
  const { satorra_bentler: scaled, robust_indices_Brosseau_Liard_Savalei: consistent } = example.expected['one_factor']!.robust
  expect(fit.T).toBeCloseTo(29.433731, 5)
  expect(fit.scaled!.scaling).toBeCloseTo(scaled.c, 5)
  expect(fit.scaled!.T).toBeCloseTo(scaled.T_scaled, 4)
  expect(fit.scaled!.p).toBeCloseTo(scaled.p_scaled, 6)
  expect(fit.scaled!.form).toContain('Satorra & Bentler')
  expect([fit.cfi!, fit.tli!, fit.rmsea.estimate!].map((x) => x.toFixed(6))).toEqual(
    [consistent.cfi, consistent.tli, consistent.rmsea].map((x) => x.toFixed(6))
  )
  expect([fit.plugIn!.cfi!, fit.plugIn!.tli!, fit.plugIn!.rmsea!].map((x) => x.toFixed(6))).toEqual(
    [scaled.scaled_indices.cfi, scaled.scaled_indices.tli, scaled.scaled_indices.rmsea].map((x) => x.toFixed(6))
  )
})

it('missing answers in three groups: the scaled T of form a, named as such', () => {
  const example = readExample<MissingExample>('03b_simulated_missing_multigroup.json')
  const { T, p } =
    example.expected['equal_loadings']!.yuan_bentler_scaled_T['a_YuanBentler2000_U_Gamma_saturated_observed_information']!
  const cells = exampleCells(example as unknown as Example, 'equal_loadings')
  const rows = rowsOf(example).map((g) => g.values)
  const { fit } = fitModel(
    cells,
    momentsWithPatterns(example),
    { convention: 'normal', statistic: 'mean-scaled', standardErrors: 'observed' },
    rows
  )
  expect(fit.scaled!.T).toBeCloseTo(T, 4)
  expect(fit.scaled!.p).toBeCloseTo(p, 5)
  expect(fit.scaled!.form).toContain('Yuan & Bentler 2000')
  expect(fit.plugIn).not.toBeNull()
})
