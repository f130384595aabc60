/**
 * Models that are not nested: fixtures/reference/09, by the definitions of Vuong (1989). Judges (Hartigan 1977) for two
 * structures that can be told apart; attitudes (Chatterjee & Price 1977) for two that overlap and cannot.
 */
import { readFileSync } from 'node:fs'
import { join } from 'node:path'
import { fileURLToPath } from 'node:url'
import { describe, expect, it } from 'vitest'
import { compareStudy } from '../../src-main/operations/compare-study.ts'
import { readPlanFile } from '../../src-main/operations/open-study.ts'
import { type FittedModel, notNestedTests } from '../../src-main/statistics/comparison/not-nested.ts'
import { casewiseLogLikelihoods } from '../../src-main/statistics/estimation/casewise-likelihood.ts'
import { normalObjective } from '../../src-main/statistics/estimation/normal-likelihood.ts'
import { fitModel } from '../../src-main/statistics/fit/fit.ts'
import type { FitResult } from '../../src-main/statistics/fit/fit-result.ts'
import { compileModel } from '../../src-main/statistics/model/compile.ts'
import type { LadderPlan } from '../../src-main/study/study.ts'
import { inlineCrew } from '../../src-main/workers/inline-crew.ts'
import { type Example, exampleCells, exampleMoments, readExample } from './examples.ts'

interface Side {
  T: number
  df: number
  n_free_parameters: number
  loglik: number
  AIC: number
  BIC: number
  casewise_loglik: number[]
}
interface Nonnested {
  LR_loglikA_minus_loglikB: number
  omega2_divisor_n: number
  z_divisor_n: number
  p_one_sided_A_better: number
  p_one_sided_B_better: number
  p_two_sided: number
  z_AIC_corrected: number
  z_BIC_corrected: number
  BIC_difference_normal_ci95: [number, number]
}
interface Vuong extends Omit<Example, 'expected'> {
  expected: Record<string, Side> & {
    vuong_nonnested: Nonnested
    vuong_distinguishability: { observed_information: { statistic_n_omega2: number; p_imhof: number } }
  }
  tolerance: { casewise_loglik: number; omega2: number; z: number; p_imhof: number }
}

interface SideFit extends FittedModel {
  fit: FitResult
  expected: Side
}

function near(actual: number, expected: number, tolerance: number, what: string) {
  expect(Math.abs(actual - expected), `${what}: ${actual} for ${expected}`).toBeLessThanOrEqual(
    tolerance * (1 + Math.abs(expected))
  )
}

describe.each(['09a_vuong_judges.json', '09b_vuong_attitude_overlapping.json'])('the tests of %s', (file) => {
  const example = readExample<Vuong>(file)
  const source = example as unknown as Example
  const { tolerance } = example
  const moments = exampleMoments(source)
  const rows = source.data.groups!.map((g) => Float64Array.from(g.raw.flat()))
  const [first, second] = Object.keys(example.models).map((name) => {
    const cells = exampleCells(source, name)
    const { fit, gamma } = fitModel(cells, moments, { convention: 'normal' })
    return { cells, gamma: gamma!, fit, expected: example.expected[name]! }
  }) as [SideFit, SideFit]
  const tests = notNestedTests({ first, second, moments, rows })!
  const wanted = example.expected.vuong_nonnested

  it('have the casewise log-likelihoods of both models, which sum to those of the fits', () => {
    for (const { cells, gamma, fit, expected } of [first, second]) {
      const model = compileModel(cells)
      const objective = normalObjective(model, moments, 'normal')
      objective.evaluate(Float64Array.from(gamma))
      const values = casewiseLogLikelihoods(objective.states, rows)[0]!
      expected.casewise_loglik.forEach((value, i) => {
        near(values[i]!, value, tolerance.casewise_loglik, `case ${i + 1}`)
      })
      near(
        values.reduce((sum, value) => sum + value, 0),
        fit.logLikelihood!,
        1e-10,
        'their sum'
      )
    }
  })

  it('tell whether the two can be told apart, with observed information', () => {
    const { statistic_n_omega2, p_imhof } = example.expected.vuong_distinguishability.observed_information
    near(tests.omega2, wanted.omega2_divisor_n, tolerance.omega2, 'omega^2')
    near(tests.distinguishable!.statistic, statistic_n_omega2, tolerance.omega2 * 10, 'n omega^2')
    near(tests.distinguishable!.p, p_imhof, tolerance.p_imhof, 'p')
  })

  it('test which fits better, with and without a correction for parsimony', () => {
    near(tests.logLikelihoodRatio, wanted.LR_loglikA_minus_loglikB, 1e-6, 'LR')
    near(tests.z!.z, wanted.z_divisor_n, tolerance.z, 'z')
    near(tests.z!.p, wanted.p_two_sided, tolerance.z, 'p')
    near(tests.z!.firstBetter, wanted.p_one_sided_A_better, tolerance.z, 'p of A')
    near(tests.z!.secondBetter, wanted.p_one_sided_B_better, tolerance.z, 'p of B')
    near(tests.corrected!.aic.z, wanted.z_AIC_corrected, tolerance.z, 'z after AIC')
    near(tests.corrected!.bic.z, wanted.z_BIC_corrected, tolerance.z, 'z after BIC')
    near(tests.bicInterval.lower, wanted.BIC_difference_normal_ci95[0], 1e-5, 'lower end')
    near(tests.bicInterval.upper, wanted.BIC_difference_normal_ci95[1], 1e-5, 'upper end')
  })

  it('turn their signs with the order of the models', () => {
    const turned = notNestedTests({ first: second, second: first, moments, rows })!
    near(turned.z!.z, -tests.z!.z, 1e-9, 'z')
    near(turned.z!.firstBetter, tests.z!.secondBetter, 1e-9, 'p')
    near(turned.distinguishable!.p, tests.distinguishable!.p, 1e-9, 'p of being told apart')
  })
})

/** The first step of a fixture's plan; `ladder` takes the place of its own ladders. */
async function firstStep(path: string, ladder?: LadderPlan) {
  const file = join(fileURLToPath(new URL('../../fixtures/', import.meta.url)), path)
  const { plan, data } = await readPlanFile(file, async (name) => readFileSync(name))
  const { ladders } = await compareStudy(
    {
      plan: { ...plan, ladders: ladder === undefined ? plan.ladders : [ladder] },
      data,
      origins: new Map(),
      names: null,
      memory: { fits: new Map(), relations: new Map() },
      version: '0.1.0'
    },
    inlineCrew
  )
  return ladders[0]!.steps[0]!
}

describe('a step of a plan between candidates that are not nested', () => {
  it('has the casewise tests in place of a chi-square difference, signed as the other differences are', async () => {
    const { expected } = readExample<Vuong>('09a_vuong_judges.json')
    const step = await firstStep('judges/not-nested.yaml')
    expect(step).toMatchObject({ relation: 'not nested', verdict: 'no test', noTest: 'not nested', difference: null })
    expect(step.notNested).toMatchObject({ favours: 'Structure A' })
    near(step.notNested!.z!, -expected.vuong_nonnested.z_divisor_n, 1e-5, 'z')
    near(step.notNested!.pFrom!, expected.vuong_nonnested.p_one_sided_A_better, 1e-5, 'p of A')
    expect(step.deltaBic).toBeGreaterThan(step.notNested!.bicInterval.lower)
    expect(step.deltaBic).toBeLessThan(step.notNested!.bicInterval.upper)
    expect(step.because).toMatch(
      /^Structure B is not nested in Structure A, so no chi-square difference .* Structure A fits better/
    )
  })

  it('has none on published summaries, and says why', async () => {
    const step = await firstStep('congeneric/plan.yaml', { name: 'Aslant', rungs: ['one factor', 'two factors, parallel pairs'] })
    expect(step).toMatchObject({ relation: 'not nested', notNested: null })
    expect(step.because).toMatch(/Compare their AIC and BIC; Vuong's \(1989\) tests need the answers of each case/)
  })
})
