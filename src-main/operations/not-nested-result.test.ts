import { describe, expect, it } from 'vitest'
import { exampleCells, exampleMoments, readExample } from '../../tests/reference/examples.ts'
import { notNestedTests } from '../statistics/comparison/not-nested.ts'
import { fitModel } from '../statistics/fit/fit.ts'
import type { CandidateResult } from '../study/result.ts'
import { notNestedResult } from './not-nested-result.ts'

/** Both models of an example fitted, as rungs named A (below) and B (above), and the casewise tests of B and A. */
function compared(file: string) {
  const example = readExample(file)
  const moments = exampleMoments(example)
  const rows = example.data.groups!.map((g) => Float64Array.from(g.raw.flat()))
  const [from, to] = Object.keys(example.models).map((model, k) => {
    const cells = exampleCells(example, model)
    const { fit, gamma } = fitModel(cells, moments, { convention: 'normal' })
    const result: CandidateResult = {
      ...fit,
      name: 'AB'[k]!,
      origin: 'planned',
      from: null,
      sentence: '',
      sameAs: [],
      aicWeight: null,
      bicWeight: null
    }
    return { cells, gamma: gamma!, result }
  })
  const tests = notNestedTests({ first: to!, second: from!, moments, rows })!
  return { tests, from: from!.result, to: to!.result }
}

describe('a step between judges sorted in two ways, which are not nested', () => {
  const { tests, from, to } = compared('09a_vuong_judges.json')

  it('says which fits better where both tests say so, with the numbers', () => {
    const result = notNestedResult(tests, from, to, 0.05)
    expect(result.favours).toBe('A')
    expect(result.z).toBeLessThan(0)
    expect(result.sentence).toBe(
      "By Vuong's (1989) tests on casewise log-likelihoods the two can be told apart (variance of the casewise differences 1.34, p = .023), and A fits better than B: z = 2.78, p = .005. The evidence ratio in favour of A is more than a million by AIC and by BIC."
    )
  })

  it('favours neither where they cannot be told apart at the alpha of the rules', () => {
    const result = notNestedResult(tests, from, to, 0.01)
    expect(result.favours).toBeNull()
    expect(result.sentence).toMatch(/^By Vuong's \(1989\) test .* cannot tell the two apart .* neither can be said to fit better\./)
  })

  it('favours neither where they can be told apart and yet fit alike', () => {
    const alike = { ...tests, z: { z: 0.4, p: 0.69, firstBetter: 0.345, secondBetter: 0.655 } }
    const result = notNestedResult(alike, from, to, 0.05)
    expect(result.favours).toBeNull()
    expect(result.sentence).toContain('can be told apart (variance of the casewise differences 1.34, p = .023), but neither fits')
  })

  it('says so where the first test could not be computed', () => {
    const result = notNestedResult({ ...tests, distinguishable: null }, from, to, 0.05)
    expect(result.favours).toBeNull()
    expect(result.sentence).toMatch(/could not be computed/)
  })
})

it('a step between overlapping models of different size tells the corrections for parsimony only where the two can be told apart', () => {
  const { tests, from, to } = compared('09b_vuong_attitude_overlapping.json')
  const result = notNestedResult(tests, from, to, 0.05)
  expect(result).toMatchObject({ favours: null, evidenceAic: { favours: 'A' }, evidenceBic: { favours: 'A' } })
  expect(result.evidenceAic!.ratio).toBeCloseTo(Math.exp(2.2906121655985316 / 2), 5)
  expect(result.bicInterval.lower).toBeCloseTo(-9.054200724417313, 3)
  expect(result.sentence).toBe(
    "By Vuong's (1989) test on casewise log-likelihoods these data cannot tell the two apart (variance of the casewise differences 0.35, p = .485), so neither can be said to fit better. The evidence ratio in favour of A is 3.1 by AIC and 6.3 by BIC."
  )
  expect(notNestedResult(tests, from, to, 0.6).sentence).toContain(
    'Corrected for the number of parameters as AIC does, z = 0.35, p = .725; as BIC does, z = 0.57, p = .570.'
  )
})
