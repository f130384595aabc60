/**
 * Relations of models by refitting: fixtures/reference/10, the procedure of Bentler & Satorra (2010) on nine ability
 * tests (Holzinger & Swineford 1939, as in Harman 1976) and on the iris measurements (Anderson 1935; Fisher 1936).
 */
import { describe, expect, it } from 'vitest'
import { relationOf } from '../../src-main/statistics/comparison/relation.ts'
import { fitModel } from '../../src-main/statistics/fit/fit.ts'
import type { SampleMoments } from '../../src-main/statistics/moments/sample-moments.ts'
import { type Example, exampleCells, exampleMoments, readExample } from './examples.ts'

interface Pair {
  restricted_M0: string
  df0: number
  df1: number
  conclusion: string
  M1_refitted_to_implied_moments_of_M0?: string
  M1?: string
}
type Nesting = Example & { expected: { pairs: Pair[]; with_means_iris: { pairs: Pair[]; models: Example['models'] } } }

const example = readExample<Nesting>('10_nesting_checks.json')
const iris = { ...readExample('01a_iris_invariance.json'), models: example.expected.with_means_iris.models }

function related(source: Example, moments: SampleMoments, general: string, restricted: string) {
  const [lower, upper] = [general, restricted].map((name) => {
    const cells = exampleCells(source, name)
    const { gamma, fit } = fitModel(cells, moments, { convention: 'normal' })
    expect(gamma, `${name}: ${fit.reason}`).not.toBeNull()
    return { cells, gamma: gamma! }
  })
  return relationOf({
    general: lower!.cells,
    generalGamma: lower!.gamma,
    restricted: upper!.cells,
    restrictedGamma: upper!.gamma,
    sizes: moments.groups.map((g) => g.n)
  })
}

describe('the relation of two models', () => {
  for (const { restricted_M0, M1_refitted_to_implied_moments_of_M0, df0, df1, conclusion } of example.expected.pairs) {
    const general = M1_refitted_to_implied_moments_of_M0!
    it(`finds ${restricted_M0} (${df0} df) against ${general} (${df1} df): ${conclusion}`, () => {
      const { relation, proof } = related(example, exampleMoments(example), general, restricted_M0)
      expect(relation).toBe(df0 < df1 ? 'not nested' : expectedRelation(conclusion, df0 === df1))
      if (relation === 'not nested') expect(proof).toBe('refit')
    })
  }

  for (const { restricted_M0, M1, conclusion } of example.expected.with_means_iris.pairs) {
    it(`finds ${restricted_M0} with means ${conclusion} in ${M1}`, () => {
      expect(related(iris, exampleMoments(iris), M1!, restricted_M0).relation).toBe(conclusion)
    })
  }

  it("says which proof was used: constraints where every cell is the general model's, refitting where scaling shifts", () => {
    const moments = exampleMoments(iris)
    expect(related(iris, moments, 'configural', 'equal_loadings')).toEqual({ relation: 'nested', proof: 'constraints' })
    expect(related(iris, moments, 'equal_loadings', 'equal_loadings_intercepts')).toEqual({ relation: 'nested', proof: 'refit' })
  })

  it('tells when the pair was given upside down', () => {
    expect(related(iris, exampleMoments(iris), 'equal_loadings', 'configural').relation).toBe('reversed')
  })
})

function expectedRelation(conclusion: string, sameDf: boolean): string {
  if (/equivalent/.test(conclusion)) return 'equivalent'
  if (conclusion === 'nested') return sameDf ? 'equivalent' : 'nested'
  return 'not nested'
}
