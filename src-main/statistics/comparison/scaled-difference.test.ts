/** Scaled difference tests against fixtures/reference/02: iris (Anderson 1935; Fisher 1936), judges (Hartigan 1977), simulated groups. */
import { describe, expect, it } from 'vitest'
import { type Example, exampleCells, exampleMoments, readExample } from '../../../tests/reference/examples.ts'
import { normalObjective } from '../estimation/normal-likelihood.ts'
import { scalingFactor } from '../estimation/scaling.ts'
import { fitModel } from '../fit/fit.ts'
import { compileModel } from '../model/compile.ts'
import { scaledDifference, scalingAtRestricted, strictlyPositiveDifference } from './scaled-difference.ts'

interface ExpectedDifference {
  delta_T: number
  delta_df: number
  SB2001: { c_d: number; T_d: number; df: number; p: number }
  SB2010_strictly_positive: { c10: number; c_d: number; T_d: number; df: number; p: number }
}

const steps: { file: string; general: string; restricted: string; key: string[] }[] = [
  {
    file: '02c_iris_multigroup_robust_difference.json',
    general: 'configural',
    restricted: 'equal_loadings',
    key: ['difference_equal_loadings_vs_configural']
  },
  {
    file: '02e_judges_hard_case_heywood.json',
    general: 'two_factor',
    restricted: 'one_factor',
    key: ['difference_one_factor_vs_two_factor']
  },
  ...['configural', 'equal_loadings', 'equal_loadings_intercepts'].map((general, i) => {
    const restricted = ['equal_loadings', 'equal_loadings_intercepts', 'equal_loadings_intercepts_residual_variances'][i]!
    return {
      file: '02f_simulated_scaled_difference_ladder.json',
      general,
      restricted,
      key: ['differences', `${restricted}_vs_${general}`]
    }
  })
]

function readSteps(file: string): Example {
  const example = readExample<Example & { data: { rows_of?: string } }>(file)
  const { rows_of } = example.data
  return rows_of === undefined ? example : { ...example, data: readExample(rows_of).data }
}

function casesOf(example: Example) {
  return example.data.groups!.map((g) => ({ rows: Float64Array.from(g.raw.flat()), size: g.n }))
}

function side(example: Example, name: string) {
  const cells = exampleCells(example, name)
  const moments = exampleMoments(example)
  const { fit, gamma } = fitModel(cells, moments, { convention: 'normal' })
  const model = compileModel(cells)
  const objective = normalObjective(model, moments, 'normal')
  const solution = Float64Array.from(gamma!)
  objective.evaluate(solution)
  const curvature = new Float64Array(model.parameters ** 2)
  objective.derive(new Float64Array(model.parameters), curvature)
  const groups = casesOf(example)
  const { scaling } = scalingFactor({ model, states: objective.states, groups, curvature })!
  return { T: fit.T!, df: fit.df, scaling, cells, gamma: gamma!, moments, rows: groups.map((g) => g.rows) }
}

type Side = ReturnType<typeof side>

function scalingAt(general: Side, restricted: Side): number | null {
  const { moments, rows } = general
  return scalingAtRestricted({
    general: general.cells,
    generalGamma: general.gamma,
    restricted: restricted.cells,
    restrictedGamma: restricted.gamma,
    moments,
    rows
  })
}

function relative(actual: number, expected: number, tolerance: number, what: string) {
  expect(Math.abs(actual - expected), `${what}: ${actual} for ${expected}`).toBeLessThanOrEqual(tolerance * Math.abs(expected))
}

describe('the scaled difference test', () => {
  for (const { file, general, restricted, key } of steps) {
    const example = readSteps(file)
    const found = key.reduce<unknown>((at, name) => (at as Record<string, unknown>)[name], example.expected)
    const expected = found as ExpectedDifference

    it(`of ${restricted} against ${general} in ${file}: T_d = ${expected.SB2001.T_d.toFixed(3)} (2001), ${expected.SB2010_strictly_positive.T_d.toFixed(3)} (2010)`, () => {
      const [upper, lower] = [side(example, restricted), side(example, general)]
      const ordinary = scaledDifference(upper, lower)!
      relative(ordinary.scaling, expected.SB2001.c_d, 1e-5, 'c_d')
      relative(ordinary.T, expected.SB2001.T_d, 1e-5, 'T_d')
      relative(ordinary.p, expected.SB2001.p, 1e-4, 'p')
      expect(ordinary.df).toBe(expected.SB2001.df)
      expect(ordinary.method).toBe('scaled')

      const c10 = scalingAt(lower, upper)!
      relative(c10, expected.SB2010_strictly_positive.c10, 1e-5, 'c10')
      const positive = strictlyPositiveDifference(upper, lower, c10)!
      relative(positive.scaling, expected.SB2010_strictly_positive.c_d, 1e-5, 'c_d')
      relative(positive.T, expected.SB2010_strictly_positive.T_d, 1e-5, 'T_d')
      relative(positive.p, expected.SB2010_strictly_positive.p, 1e-4, 'p')
      expect(positive.method).toBe('strictly positive scaled')
    })
  }

  it('declines the first form where its factor is not positive', () => {
    expect(scaledDifference({ T: 30, df: 10, scaling: 1 }, { T: 10, df: 8, scaling: 1.3 })).toBeNull()
    expect(strictlyPositiveDifference({ T: 30, df: 10, scaling: 1 }, { T: 10, df: 8 }, 1.1)?.scaling).toBeCloseTo(0.6, 12)
  })

  it('needs no scaling of a general model without degrees of freedom', () => {
    expect(scaledDifference({ T: 12, df: 4, scaling: 1.5 }, { T: 0, df: 0, scaling: 1 })).toMatchObject({
      T: 8,
      df: 4,
      scaling: 1.5
    })
  })

  it('declines a pair without a difference in degrees of freedom', () => {
    expect(scaledDifference({ T: 12, df: 4, scaling: 1.5 }, { T: 12, df: 4, scaling: 1.5 })).toBeNull()
  })

  it('has no c10 where the general model cannot imply the moments of the other, which is then not nested in it', () => {
    const example = readSteps('02e_judges_hard_case_heywood.json')
    const [general, other] = [side(example, 'one_factor'), side(example, 'two_factor')]
    expect(scalingAt(general, other)).toBeNull()
  })
})
