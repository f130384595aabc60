/**
 * The mean-scaled statistic, robust standard errors and robust indices against fixtures/reference/02 (attitude ratings of
 * Chatterjee & Price 1977; iris of Anderson 1935 and Fisher 1936; ratings of judges, Hartigan 1977; simulated groups),
 * and against the plain twin that forms Gamma and V.
 */
import { inverse, Matrix } from 'ml-matrix'
import { describe, expect, it } from 'vitest'
import { type Example, exampleCells, exampleMoments, readExample } from '../../../tests/reference/examples.ts'
import { seededGenerator } from '../distributions/generator.ts'
import { estimateCovariance } from '../fit/covariance.ts'
import { fitModel } from '../fit/fit.ts'
import { robustIndices } from '../fit/robust-indices.ts'
import { type CompiledModel, compileModel } from '../model/compile.ts'
import { groupState, impliedMoments } from '../model/implied-moments.ts'
import { completeCaseMoments, type SampleMoments } from '../moments/sample-moments.ts'
import { normalObjective } from './normal-likelihood.ts'
import type { CaseGroup } from './robust-scores.ts'
import { baselineScaling, scaledStatistic, scalingFactor } from './scaling.ts'

interface Robust {
  satorra_bentler: {
    trace_UGamma: number
    c: number
    T_scaled: number
    p_scaled: number
    baseline: { trace_UGamma: number; c: number; T_scaled: number; df: number }
    scaled_indices: { cfi: number; tli: number; rmsea: number; ci90_lower: number; ci90_upper: number; p_close_05: number }
  }
  robust_indices_Brosseau_Liard_Savalei: { cfi: number; tli: number; rmsea: number }
  standard_errors: Record<
    string,
    {
      est: number
      se_sandwich_expected_information_with_Gamma: number
      se_sandwich_observed_information_casewise_scores: number
      se_sandwich_expected_information_casewise_scores: number
    }
  >
}
type RobustExample = Example & {
  data: { rows_of?: string }
  expected: Record<string, { T: number; df: number; baseline: { T: number; df: number }; robust: Robust }>
  tolerance: { T: number; c: number }
}

/** An example with its rows, which two of the files share with another. */
function robustExample(file: string): RobustExample {
  const example = readExample<RobustExample>(file)
  const { rows_of } = example.data
  return rows_of === undefined ? example : { ...example, data: readExample(rows_of).data }
}

function casesOf(example: Example): CaseGroup[] {
  return example.data.groups!.map((g) => ({ rows: Float64Array.from(g.raw.flat()), size: g.n }))
}

/** Everything at the solution of one model. */
function solved(model: CompiledModel, moments: SampleMoments, gamma: Float64Array, groups: CaseGroup[]) {
  const q = model.parameters
  const objective = normalObjective(model, moments, 'normal')
  const value = objective.evaluate(gamma)
  const curvature = new Float64Array(q * q)
  const observed = new Float64Array(q * q)
  const gradient = new Float64Array(q)
  objective.derive(gradient, observed, 'observed')
  objective.derive(gradient, curvature)
  return { model, states: objective.states, groups, curvature, observed, gamma, total: objective.total, T: objective.total * value }
}

function fitted(example: Example, name: string) {
  const cells = exampleCells(example, name)
  const moments = exampleMoments(example)
  const { fit, gamma } = fitModel(cells, moments, { convention: 'normal' })
  expect(fit.state, fit.reason ?? '').toBe('fitted')
  return { fit, ...solved(compileModel(cells), moments, Float64Array.from(gamma!), casesOf(example)) }
}

function relative(actual: number | null | undefined, expected: number, tolerance: number, what: string) {
  expect(actual, what).toBeTypeOf('number')
  expect(Math.abs(actual! - expected), `${what}: ${actual} for ${expected}`).toBeLessThanOrEqual(
    tolerance * Math.max(Math.abs(expected), 1e-3)
  )
}

const files = [
  '02a_attitude_one_factor_robust.json',
  '02c_iris_multigroup_robust_difference.json',
  '02e_judges_hard_case_heywood.json',
  '02f_simulated_scaled_difference_ladder.json'
]

for (const file of files) {
  const example = robustExample(file)
  describe(file, () => {
    for (const name of Object.keys(example.models)) {
      const expected = example.expected[name]!
      const { satorra_bentler: scaled, standard_errors } = expected.robust

      it(`${name}: c = ${scaled.c.toFixed(4)} and T / c = ${scaled.T_scaled.toFixed(3)} (Satorra & Bentler 1994)`, () => {
        const solution = fitted(example, name)
        const statistic = scaledStatistic(solution.T, solution)!
        relative(statistic.trace, scaled.trace_UGamma, 1e-6, 'trace')
        relative(statistic.scaling, scaled.c, 1e-6, 'c')
        relative(statistic.T, scaled.T_scaled, 1e-6, 'T')
        relative(statistic.p / scaled.p_scaled, 1, 1e-4, 'p')
        expect(statistic.df).toBe(expected.df)
      })

      it(`${name}: the baseline's own c, and indices of both kinds`, () => {
        const { fit, T, ...solution } = fitted(example, name)
        const p = example.data.variables.length
        const baseline = baselineScaling(solution.groups, p)!
        relative(baseline.scaling, scaled.baseline.c, 1e-10, 'baseline c')
        relative(fit.baseline!.T / baseline.scaling, scaled.baseline.T_scaled, 1e-9, 'baseline T')
        expect(baseline.df).toBe(scaled.baseline.df)
        const { scaling } = scalingFactor(solution)!
        const input = {
          T,
          df: fit.df,
          scaling,
          n: fit.n,
          groups: solution.groups.length,
          indicators: p,
          baseline: { ...fit.baseline!, scaling: baseline.scaling }
        }
        const plugIn = robustIndices('plug-in', input)
        const consistent = robustIndices('consistent', input)
        for (const index of ['cfi', 'tli'] as const) {
          relative(plugIn[index], scaled.scaled_indices[index], 1e-6, `plug-in ${index}`)
          relative(consistent[index], expected.robust.robust_indices_Brosseau_Liard_Savalei[index], 1e-6, `consistent ${index}`)
        }
        relative(plugIn.rmsea.estimate, scaled.scaled_indices.rmsea, 1e-6, 'plug-in rmsea')
        relative(plugIn.rmsea.lower, scaled.scaled_indices.ci90_lower, 1e-5, 'lower')
        relative(plugIn.rmsea.upper, scaled.scaled_indices.ci90_upper, 1e-5, 'upper')
        relative(plugIn.rmsea.closeFitP! / scaled.scaled_indices.p_close_05, 1, 1e-4, 'close fit')
        relative(consistent.rmsea.estimate, expected.robust.robust_indices_Brosseau_Liard_Savalei.rmsea, 1e-6, 'consistent rmsea')
      })

      it(`${name}: robust standard errors from casewise scores and the observed information (Huber 1967; White 1982)`, () => {
        const { model, groups, gamma } = fitted(example, name)
        const objective = normalObjective(model, exampleMoments(example), 'normal')
        objective.evaluate(Float64Array.from(gamma))
        const rows = groups.map((g) => g.rows)
        const covariance = estimateCovariance(model, objective, 'robust', rows)!
        const q = model.parameters
        expect(Object.keys(standard_errors).sort()).toEqual([...model.gammaLabels].sort())
        model.gammaLabels.forEach((label, k) => {
          const { est, se_sandwich_observed_information_casewise_scores: error } = standard_errors[label]!
          // The sign of a factor is open: its loadings, covariances and mean may all turn.
          relative(Math.abs(gamma[k]!), Math.abs(est), 1e-5, label)
          relative(Math.sqrt(covariance[k * q + k]!), error, 1e-4, label)
        })
      })
    }
  })
}

describe('the scaling factor', () => {
  it('is that of the plain twin, which forms Gamma, V and Delta, in groups of unequal size with restricted means', () => {
    const example = robustExample('02f_simulated_scaled_difference_ladder.json')
    const solution = fitted(example, 'equal_loadings_intercepts')
    relative(scalingFactor(solution)!.trace, denseTrace(solution), 1e-7, 'trace')
  })

  it('is that of the plain twin where only covariances are modelled', () => {
    const example = robustExample('02a_attitude_one_factor_robust.json')
    const cells = exampleCells(example, 'one_factor')
    cells.groups[0]!.intercepts = null
    cells.groups[0]!.factorMeans = null
    const moments = exampleMoments(example)
    moments.groups[0]!.mean = null
    const { gamma } = fitModel(cells, moments, { convention: 'normal' })
    const solution = solved(compileModel(cells), moments, Float64Array.from(gamma!), casesOf(example))
    relative(scalingFactor(solution)!.trace, denseTrace(solution), 1e-7, 'trace')
    relative(scalingFactor(solution)!.scaling, example.expected['one_factor']!.robust.satorra_bentler.c, 1e-6, 'c with means')
  })

  it('is near 1 for a true model in a large normal sample, and 1 + r^2 for a baseline whose indicators correlate by r', () => {
    // Normal z_j, z_k: the variance of their product is 1 + r^2 (Isserlis 1918); here r = .49.
    const { rows, solution } = drawn(20_000, () => 1)
    expect(Math.abs(scalingFactor(solution)!.scaling - 1)).toBeLessThan(0.03)
    expect(Math.abs(baselineScaling([{ rows, size: 20_000 }], 6)!.scaling - (1 + 0.49 ** 2))).toBeLessThan(0.03)
  })

  it('is the kurtosis 1 + kappa of elliptical data: 2 for the scale mixture drawn here (Browne 1984)', () => {
    // y = r x with x normal and r^2 in {0, 2} equally often: E y^4 = 2 * 3 (E y^2)^2, so 1 + kappa = E r^4 / (E r^2)^2 = 2.
    const { solution } = drawn(40_000, (uniform) => (uniform < 0.5 ? 0 : Math.SQRT2))
    expect(Math.abs(scalingFactor(solution)!.scaling - 2)).toBeLessThan(0.08)
  })

  it('does not change with the units of the indicators', () => {
    const example = robustExample('02a_attitude_one_factor_robust.json')
    const before = scalingFactor(fitted(example, 'one_factor'))!.scaling
    for (const group of example.data.groups!) group.raw = group.raw.map((row) => row.map((value, j) => value * 10 ** (j % 3) + j))
    relative(scalingFactor(fitted(example, 'one_factor'))!.scaling, before, 1e-7, 'c')
  })

  it('is not defined without degrees of freedom or with a singular information', () => {
    const example = robustExample('02a_attitude_one_factor_robust.json')
    const solution = fitted(example, 'one_factor')
    expect(scaledStatistic(0, { ...solution, model: { ...solution.model, df: 0 } })).toBeNull()
    expect(scaledStatistic(1, { ...solution, curvature: new Float64Array(solution.curvature.length) })).toBeNull()
    expect(baselineScaling(solution.groups, 1)).toBeNull()
  })
})

describe('indices that need no scaling', () => {
  it('are the ordinary ones where c is 1, in both kinds', () => {
    const input = { T: 40, df: 20, scaling: 1, n: 200, groups: 2, indicators: 6, baseline: { T: 500, df: 30, scaling: 1 } }
    const [one, other] = [robustIndices('consistent', input), robustIndices('plug-in', input)]
    expect(one.cfi).toBeCloseTo(1 - 20 / 470, 12)
    expect(one.rmsea.estimate).toBeCloseTo(Math.sqrt((20 / (20 * 200)) * 2), 12)
    for (const index of ['cfi', 'tli', 'mcdonald', 'gammaHat'] as const) expect(one[index]).toBeCloseTo(other[index]!, 12)
    for (const part of ['lower', 'upper', 'closeFitP'] as const) expect(one.rmsea[part]).toBeCloseTo(other.rmsea[part]!, 12)
  })

  it('stay inside their limits when T is below its expectation, and decline without degrees of freedom', () => {
    const baseline = { T: 500, df: 30, scaling: 1.2 }
    const low = robustIndices('consistent', { T: 10, df: 20, scaling: 1.4, n: 200, groups: 1, indicators: 6, baseline })
    expect(low.cfi).toBe(1)
    expect(low.tli).toBeGreaterThan(1)
    expect(low.rmsea.estimate).toBe(0)
    const saturated = robustIndices('consistent', { T: 0, df: 0, scaling: 1, n: 200, groups: 1, indicators: 6, baseline })
    expect(saturated.tli).toBeNull()
    expect(saturated.rmsea.estimate).toBeNull()
  })
})

/** One factor, six indicators; a case's whole vector is stretched by `stretch` of a uniform draw. */
function drawn(n: number, stretch: (uniform: number) => number) {
  const generator = seededGenerator(77)
  const rows = new Float64Array(n * 6)
  for (let i = 0; i < n; i++) {
    const r = stretch(generator.uniform())
    const factor = generator.normal()
    for (let j = 0; j < 6; j++) rows[i * 6 + j] = r * (0.7 * factor + Math.sqrt(0.51) * generator.normal())
  }
  const indicators = ['a', 'b', 'c', 'd', 'e', 'f']
  const cells = {
    indicators,
    factors: ['F'],
    groups: [
      {
        name: null,
        loadings: indicators.map((_, i) => [`l${i}`]),
        regressions: [[0]],
        factorCovariances: [[1]],
        residualCovariances: indicators.map((_, i) => indicators.map((__, j) => (i === j ? `e${i}` : 0))),
        intercepts: null,
        factorMeans: null
      }
    ],
    constraints: []
  }
  const { n: cases, covariance } = completeCaseMoments(rows, 6)
  const moments = { indicators, groups: [{ name: null, n: cases, covariance, mean: null }] }
  const { gamma } = fitModel(cells, moments, { convention: 'normal' })
  return { rows, solution: solved(compileModel(cells), moments, Float64Array.from(gamma!), [{ rows, size: n }]) }
}

/**
 * tr(U Gamma) as the definition says: z of every case, Gamma = mean z z', V block-diagonal over groups with elements
 * 1/2 tr(W E_a W E_b) of the covariance part, Delta by central differences.
 */
function denseTrace({
  model,
  states,
  groups,
  gamma
}: Pick<ReturnType<typeof solved>, 'model' | 'states' | 'groups' | 'gamma'>): number {
  const p = model.indicators.length
  const means = model.meanStructure ? p : 0
  const pairs = Array.from({ length: p }, (_, i) => Array.from({ length: i + 1 }, (__, j) => [i, j] as const)).flat()
  const each = means + pairs.length
  const total = groups.reduce((sum, g) => sum + g.size, 0)
  const whole = each * groups.length
  const v = Matrix.zeros(whole, whole)
  const gammaMatrix = Matrix.zeros(whole, whole)
  const delta = Matrix.zeros(whole, model.parameters)
  groups.forEach(({ rows, size }, g) => {
    const at = g * each
    v.setSubMatrix(weightMatrix(Matrix.from1DArray(p, p, [...states[g]!.sigma]), pairs, means).mul(size / total), at, at)
    gammaMatrix.setSubMatrix(fourthMoments(rows, p, pairs, means).mul(total / size), at, at)
    const momentsAt = (point: Float64Array) => {
      const state = groupState(p, model.factors.length)
      impliedMoments(model.groups[g]!, point, model.hasRegressions, state)
      return [...(means > 0 ? state.mu : []), ...pairs.map(([i, j]) => state.sigma[i * p + j]!)]
    }
    for (let k = 0; k < model.parameters; k++) {
      const step = 1e-5 * Math.max(1, Math.abs(gamma[k]!))
      const [up, down] = [1, -1].map((sign) => momentsAt(gamma.map((x, j) => (j === k ? x + sign * step : x))))
      for (const [row, value] of up!.entries()) delta.set(at + row, k, (value - down![row]!) / (2 * step))
    }
  })
  const vd = v.mmul(delta)
  const u = Matrix.sub(v, vd.mmul(inverse(delta.transpose().mmul(vd))).mmul(vd.transpose()))
  return u.mmul(gammaMatrix).trace()
}

function weightMatrix(sigma: Matrix, pairs: (readonly [number, number])[], means: number): Matrix {
  const p = sigma.rows
  const w = inverse(sigma)
  const out = Matrix.zeros(means + pairs.length, means + pairs.length)
  if (means > 0) out.setSubMatrix(w, 0, 0)
  const unit = ([i, j]: readonly [number, number]) => {
    const e = Matrix.zeros(p, p)
    e.set(i, j, 1)
    e.set(j, i, 1)
    return w.mmul(e)
  }
  const products = pairs.map(unit)
  for (const [i, a] of products.entries()) {
    for (const [j, b] of products.entries()) out.set(means + i, means + j, a.mmul(b).trace() / 2)
  }
  return out
}

function fourthMoments(rows: Float64Array, p: number, pairs: (readonly [number, number])[], means: number): Matrix {
  const { n, mean, covariance } = completeCaseMoments(rows, p)
  const z = new Matrix(
    Array.from({ length: n }, (_, i) => {
      const e = mean.map((value, j) => rows[i * p + j]! - value)
      return [...(means > 0 ? e : []), ...pairs.map(([a, b]) => e[a]! * e[b]! - covariance[a * p + b]!)]
    })
  )
  return z.transpose().mmul(z).div(n)
}
