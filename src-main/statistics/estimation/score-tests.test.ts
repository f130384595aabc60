import { describe, expect, it } from 'vitest'
import { type Example, exampleCells, exampleMoments, readExample, wholeMatrix } from '../../../tests/reference/examples.ts'
import { fitModel } from '../fit/fit.ts'
import type { ModelCells } from '../model/cells.ts'
import type { SampleMoments } from '../moments/sample-moments.ts'
import { jointEqualityTest, type ScoreTest, type ScoreTests, scoreTests } from './score-tests.ts'

interface NineTests extends Omit<Example, 'expected'> {
  tolerance: { LM: number; EPC_relative: number }
  expected: Record<string, { T: number; score_tests: ExpectedTest[] }>
}

interface ExpectedTest {
  parameter: string
  matrix: 'loadings' | 'residualCovariances'
  /** From 1. */
  row: number
  column: number
  LM: number
  p: number
  EPC: number
  EPC_standardised: number
}

interface IrisRelease {
  released: string
  LM: number
  change_from_the_others: number
  change_from_common_value: number
  common_value: number
  refit_LR: number
  /** s_j^2 [I^-1]_jj and s_j [I^-1]_jj of the freed model; see the file's notes. */
  own_term: number
  own_term_change: number
}

interface Iris extends Omit<Example, 'data' | 'expected'> {
  data: { variables: string[]; groups: { name: string; n: number; mean: number[]; covariance_lower: number[][] }[] }
  tolerance: { LM: number }
  expected: {
    equal_loadings: {
      single_releases: IrisRelease[]
      'joint_release_of_all_equalities_(configural)': { LM: number; df: number; p: number }
    }
  }
}

function fitted(cells: ModelCells, moments: SampleMoments): { gamma: number[]; T: number; result: ScoreTests } {
  const { fit, gamma } = fitModel(cells, moments, { convention: 'normal' })
  expect(fit.state).toBe('fitted')
  return { gamma: gamma!, T: fit.T!, result: scoreTests(cells, moments, 'normal', gamma!) }
}

const nine = readExample<NineTests>('08a_harman74_score_tests.json')
const nineExample = nine as unknown as Example

describe('score tests of nine ability tests on three factors', () => {
  for (const name of ['three_factor_unit', 'three_factor_marker']) {
    it(`give all 54 statistics and expected changes of ${name}`, () => {
      const { T, result } = fitted(exampleCells(nineExample, name), exampleMoments(nineExample))
      const expected = nine.expected[name]!
      expect(Math.abs(T - expected.T)).toBeLessThan(1e-6 * T)
      expect(result.tests).toHaveLength(54)
      for (const one of expected.score_tests) {
        const test = result.tests.find((t) => sameCell(t, one))!
        expect(Math.abs(test.statistic - one.LM), one.parameter).toBeLessThan(nine.tolerance.LM)
        expect(Math.abs(test.p / one.p - 1), one.parameter).toBeLessThan(1e-4)
        expect(Math.abs(test.change / one.EPC - 1), one.parameter).toBeLessThan(nine.tolerance.EPC_relative)
        const standardised = test.part === 'loading' ? test.standardizedChange! : test.residualCorrelationChange!
        expect(Math.abs(standardised / one.EPC_standardised - 1), one.parameter).toBeLessThan(nine.tolerance.EPC_relative)
      }
    })
  }
})

function sameCell(test: ScoreTest, { matrix, row, column }: ExpectedTest): boolean {
  const names = nineExample.data.variables
  const of = matrix === 'loadings' ? [names[row - 1], `F${column}`] : [names[column - 1], names[row - 1]]
  return test.part === (matrix === 'loadings' ? 'loading' : 'residual covariance') && test.of.join() === of.join()
}

describe('score tests of equal loadings across three species', () => {
  const iris = readExample<Iris>('08b_iris_equality_constraint_score_tests.json')
  const cells = exampleCells(iris as unknown as Example, 'equal_loadings')
  const moments: SampleMoments = {
    indicators: iris.data.variables,
    groups: iris.data.groups.map((g) => ({
      name: g.name,
      n: g.n,
      mean: Float64Array.from(g.mean),
      covariance: wholeMatrix(g.covariance_lower)
    }))
  }
  const expected = iris.expected.equal_loadings

  const { gamma, result } = fitted(cells, moments)
  const equalities = result.tests.filter((t) => t.kind === 'equality')
  const released = (one: IrisRelease) => equalities.find((t) => `loading of ${t.of[0]} in ${t.group}` === one.released)!

  it('give the nine single releases', () => {
    expect(equalities).toHaveLength(9)
    for (const one of expected.single_releases) {
      const test = released(one)
      expect(Math.abs(test.statistic - one.LM), one.released).toBeLessThan(iris.tolerance.LM)
      expect(Math.abs(test.change / one.change_from_the_others - 1), one.released).toBeLessThan(1e-5)
      expect(Math.abs(test.expectedValue! - one.common_value - one.change_from_common_value), one.released).toBeLessThan(1e-6)
    }
  })

  it('have the scores of the single releases that were computed apart', () => {
    for (const one of expected.single_releases) {
      const test = released(one)
      expect(Math.abs((test.statistic / test.change) * (one.own_term_change / one.own_term) - 1), one.released).toBeLessThan(1e-5)
    }
  })

  it('come close to the drop in T on freeing a loading, where that is small', () => {
    for (const one of expected.single_releases.filter((r) => r.refit_LR < 4)) {
      expect(Math.abs(released(one).statistic - one.refit_LR), one.released).toBeLessThan(0.11 * one.refit_LR)
    }
  })

  it('give the release of all of them at once', () => {
    const joint = jointEqualityTest(cells, moments, 'normal', gamma)!
    const configural = expected['joint_release_of_all_equalities_(configural)']
    expect(joint.df).toBe(configural.df)
    expect(Math.abs(joint.statistic - configural.LM)).toBeLessThan(iris.tolerance.LM)
    expect(jointEqualityTest(cells, moments, 'normal', gamma, 'intercept')).toBeNull()
  })
})
