/**
 * Worked examples through the command line, from a plan file to the printed JSON, against values from outside:
 * published figures where there are any, else those of fixtures/reference (whose files name the data's source).
 */
import { join } from 'node:path'
import { describe, expect, test } from 'vitest'
import type { Inspection } from '../../src-main/operations/inspect.ts'
import type { StudyResult } from '../../src-main/study/result.ts'
import { readExample } from '../reference/examples.ts'
import { root, rungwise } from './program.ts'

async function compare(folder: string, plan = 'plan.yaml'): Promise<StudyResult> {
  const { status, stdout, stderr } = await rungwise(['compare', join(root, 'fixtures', folder, plan), '--json', '-'])
  expect(stderr).toBe('')
  expect(status).toBe(0)
  return JSON.parse(stdout) as StudyResult
}

const candidate = (result: StudyResult, name: string) => result.candidates.find((c) => c.name === name)!
const step = (result: StudyResult, ladder: string, to: string) =>
  result.ladders.find((l) => l.name === ladder)!.steps.find((s) => s.to === to)!

describe('four vocabulary tests, congeneric and parallel', () => {
  /** Published: Jöreskog (1971), Psychometrika 36, 109-133, on data of Lord (1957); T and df typed from memory, T = (n - 1) F. */
  const published = {
    'two factors': [0.7, 1],
    'two factors, parallel pairs': [1.93, 5],
    'one factor': [36.21, 2],
    'one factor, parallel pairs': [37.33, 6]
  }

  test('give the published T on the published df', async () => {
    const result = await compare('congeneric')
    for (const [name, [T, df]] of Object.entries(published)) {
      expect(Number(candidate(result, name).T!.toFixed(2)), name).toBe(T)
      expect(candidate(result, name).df, name).toBe(df)
    }
  })

  test('give every figure of the recomputed example', async () => {
    interface Figures {
      T: number
      p: number
      cfi: number
      tli: number
      srmr: number
      logLikelihood: number
      rmsea: { estimate: number; lower: number; upper: number; closeFitP: number }
      withoutMeans: { parameters: number; aic: number; bic: number; adjustedBic: number }
      estimates: Record<string, number>
      standardErrors: Record<string, number>
    }
    const { expected, tolerance } = readExample<{ expected: Record<string, Figures>; tolerance: Record<string, number> }>(
      'congeneric-tests.json'
    )
    const result = await compare('congeneric')
    for (const [name, figures] of Object.entries(expected)) {
      const own = candidate(result, name)
      expect(Math.abs(own.T! - figures.T)).toBeLessThan(tolerance['T']!)
      for (const index of ['p', 'cfi', 'tli', 'srmr'] as const)
        expect(Math.abs(own[index]! - figures[index]), index).toBeLessThan(1e-5)
      for (const part of ['estimate', 'lower', 'upper', 'closeFitP'] as const)
        expect(Math.abs(own.rmsea[part]! - figures.rmsea[part]), part).toBeLessThan(1e-5)
      for (const index of ['aic', 'bic', 'adjustedBic'] as const)
        expect(Math.abs(own[index]! - figures.withoutMeans[index]), index).toBeLessThan(1e-3)
      expect(Math.abs(own.logLikelihood! - figures.logLikelihood)).toBeLessThan(1e-3)
      expect(own.parameters).toBe(figures.withoutMeans.parameters)
      for (const [parameter, value] of Object.entries(figures.estimates)) {
        const estimate = own.estimates.find(
          (e) => e.free && Math.abs(e.estimate! - value) < tolerance['estimates']! * Math.max(1, Math.abs(value))
        )
        expect(estimate, `${name}: ${parameter}`).toBeDefined()
        expect(
          Math.abs(estimate!.standardError! - figures.standardErrors[parameter]!),
          `${name}: error of ${parameter}`
        ).toBeLessThan(1e-4 * 3)
      }
    }
  })

  test('stand on two factors with parallel pairs: one factor is a step too far', async () => {
    const result = await compare('congeneric')
    const [ladder] = result.ladders
    expect(ladder!.standHere).toBe('two factors, parallel pairs')
    expect(ladder!.steps.map((s) => [s.relation, s.proof, s.verdict])).toEqual([
      ['nested', 'constraints', 'holds'],
      ['nested', 'constraints', 'does not hold']
    ])
    // 37.33 - 1.93 on one degree of freedom, from the published values.
    expect(step(result, ladder!.name, 'one factor, parallel pairs').difference!.T).toBeCloseTo(35.4, 1)
  })
})

const levels = ['configural', 'equal_loadings', 'equal_loadings_intercepts', 'equal_loadings_intercepts_residual_variances']

for (const [folder, file] of [
  ['iris', '01a_iris_invariance.json'],
  ['crabs', '01c_crabs_species_by_sex_invariance.json'],
  ['two-factors', '01d_simulated_two_factor_invariance.json']
] as const) {
  test(`the invariance ladder of ${folder} gives T, df and differences of ${file}`, async () => {
    const result = await compare(folder)
    const example = readExample(file)
    const ladder = result.ladders.find((l) => l.rungs.length === 4)!
    ladder.rungs.forEach((rung, i) => {
      const expected = example.expected[levels[i]!]!
      expect(candidate(result, rung).df).toBe(expected.df)
      expect(Math.abs(candidate(result, rung).T! - expected.T)).toBeLessThan(1e-6 * (1 + expected.T))
      expect(Math.abs(candidate(result, rung).cfi! - expected.cfi)).toBeLessThan(1e-6)
      if (i === 0) return
      const below = example.expected[levels[i - 1]!]!
      const { difference, deltaCfi } = ladder.steps[i - 1]!
      expect(Math.abs(difference!.T - (expected.T - below.T))).toBeLessThan(1e-5 * (1 + expected.T))
      expect(difference!.df).toBe(expected.df - below.df)
      expect(Math.abs(deltaCfi! - (expected.cfi - below.cfi))).toBeLessThan(2e-6)
    })
  })
}

interface Scaled {
  SB2001: { c_d: number; T_d: number; df: number; p: number }
}

test('the ladder of scaled differences is that of 02f (Satorra & Bentler 2001), simulated data', async () => {
  const { expected } = readExample<{ expected: { differences: Record<string, Scaled> } }>(
    '02f_simulated_scaled_difference_ladder.json'
  )
  const [ladder] = (await compare('two-factors', 'scaled.yaml')).ladders
  ladder!.steps.forEach(({ difference }, i) => {
    const { c_d, T_d, df, p } = expected.differences[`${levels[i + 1]}_vs_${levels[i]}`]!.SB2001
    expect(difference).toMatchObject({ method: 'scaled', df })
    expect(Math.abs(difference!.scaling! - c_d)).toBeLessThan(1e-6)
    expect(Math.abs(difference!.T - T_d)).toBeLessThan(1e-5)
    expect(Math.abs(difference!.p - p)).toBeLessThan(1e-6)
  })
})

test('ratings of judges (Hartigan 1977): the smallest minimum with its negative variance told, a bound that costs, and a mixture at the boundary', async () => {
  const result = await compare('judges')
  const two = candidate(result, 'Two factors')
  // Figures of 02e: T = 48.669502 on 8 df, c = 1.278057; one factor 118.831140 on 9 df.
  expect(two.T).toBeCloseTo(48.669502, 5)
  expect(two.scaled!.scaling).toBeCloseTo(1.278057, 5)
  expect(two.cautions.map((c) => [c.code, c.cell])).toContainEqual(['negative-residual-variance', ['PREP']])
  expect(candidate(result, 'Two factors, bounded').T!).toBeGreaterThan(two.T!)
  const { difference, because } = step(result, 'Factors', 'One factor')
  const { SB2001 } = readExample<{ expected: Record<string, Scaled> }>('02e_judges_hard_case_heywood.json').expected[
    'difference_one_factor_vs_two_factor'
  ]!
  expect(difference!.T).toBeCloseTo(SB2001.T_d, 4)
  expect(difference!.method).toBe('boundary mixture')
  expect(Math.abs(difference!.p / (SB2001.p / 2) - 1)).toBeLessThan(1e-5)
  expect(because).toContain('correlation at 1')
})

test('missing answers: air quality (03a) and three groups (03b) by full information', async () => {
  const air = candidate(await compare('air-quality'), 'One factor')
  expect(air.T).toBeCloseTo(6.195589, 5)
  expect(air.standardErrors).toBe('observed')
  expect(air.scaled!.scaling).toBeCloseTo(0.959966, 5)
  const groups = await compare('two-factors', 'missing.yaml')
  const [ladder] = groups.ladders
  expect(ladder!.rungs.map((rung) => Number(candidate(groups, rung).T!.toFixed(4)))).toEqual([18.9768, 34.2083, 39.6073])
  expect(ladder!.steps.map((s) => Number(s.difference!.T.toFixed(4)))).toEqual([15.2315, 5.3991])
  expect(groups.data.missing.cases).toBeGreaterThan(0)
})

test('two structures that are not nested get no chi-square difference', async () => {
  const result = await compare('judges', 'not-nested.yaml')
  const { difference, verdict, relation, noTest, deltaAic } = step(result, 'Side by side', 'Structure B')
  expect([difference, verdict, relation, noTest]).toEqual([null, 'no test', 'not nested', 'not nested'])
  // 09a: AIC of A less that of B is -42.20.
  expect(deltaAic).toBeCloseTo(42.201, 3)
})

interface Looked extends StudyResult {
  inspections: Inspection[]
}

async function look(folder: string, plan: string, name: string): Promise<Inspection> {
  const words = ['compare', join(root, 'fixtures', folder, plan), '--inspect', name, '--json', '-']
  const { status, stdout, stderr } = await rungwise(words)
  expect({ status, stderr }).toEqual({ status: 0, stderr: '' })
  return (JSON.parse(stdout) as Looked).inspections[0]!
}

test('score tests of equal loadings are those of 08b, corrected as its notes say (Anderson 1935; Fisher 1936)', async () => {
  interface Release {
    released: string
    LM: number
    change_from_the_others: number
  }
  const { expected } = readExample<{ expected: { equal_loadings: { single_releases: Release[] } } }>(
    '08b_iris_equality_constraint_score_tests.json'
  )
  const { scoreTests, refused } = await look('iris', 'plan.yaml', 'One size factor, metric')
  expect(scoreTests!.tests.length).toBeGreaterThan(0)
  for (const { released, LM, change_from_the_others } of expected.equal_loadings.single_releases) {
    const [, indicator, group] = /^loading of (.+) in (.+)$/.exec(released)!
    const own = scoreTests!.tests.find((t) => t.part === 'loading' && t.of[0] === indicator && t.group === group)!
    expect(Math.abs(own.statistic / LM - 1), released).toBeLessThan(1e-4)
    expect(Math.abs(own.change / change_from_the_others - 1), released).toBeLessThan(1e-4)
  }
  // Equal loadings alone license no comparison of means, and the text says why.
  expect(refused.join(' ')).toContain('One size factor, metric')
})

test('sizes of non-invariance are those of 13 (Nye & Drasgow 2011), with differences of factor means', async () => {
  type Sizes = Record<string, { dMACS_weighted_mean_of_sds: number; delta_intercept_reference_minus_focal: number }>
  const { expected } = readExample<{ expected: Record<string, { T: number; dMACS: Sizes }> }>('13_dmacs_latent_means.json')
  const { dMACS } = expected['partial_intercept_and_loading_y2_free_in_g2_and_g3']!
  const { effectSizes, latentMeans } = await look('two-factors', 'partial.yaml', 'Loading and intercept of y2 let go')
  for (const [reference, focal] of [
    ['g1', 'g2'],
    ['g1', 'g3'],
    ['g2', 'g3']
  ]) {
    const own = effectSizes!.sizes.find((s) => s.indicator === 'y2' && s.reference === reference && s.focal === focal)!
    const { dMACS_weighted_mean_of_sds, delta_intercept_reference_minus_focal } = dMACS[`y2_reference_${reference}_focal_${focal}`]!
    expect(Math.abs(own.dmacs! - dMACS_weighted_mean_of_sds)).toBeLessThan(1e-5)
    expect(Math.abs(own.interceptDifference - delta_intercept_reference_minus_focal)).toBeLessThan(1e-4)
  }
  expect(latentMeans!.differences.length).toBe(6)
})
