import { describe, expect, it } from 'vitest'
import { exampleCells, exampleMoments, readExample } from '../../../tests/reference/examples.ts'
import { seededGenerator } from '../distributions/generator.ts'
import { casewiseLogLikelihoods } from '../estimation/casewise-likelihood.ts'
import { normalObjective } from '../estimation/normal-likelihood.ts'
import { fitModel } from '../fit/fit.ts'
import type { ModelCells } from '../model/cells.ts'
import { compileModel } from '../model/compile.ts'
import { splitByPattern } from '../moments/missing-patterns.ts'
import type { SampleMoments } from '../moments/sample-moments.ts'
import { saturatedMoments } from '../moments/saturated-em.ts'
import { type FittedModel, type NotNestedInput, notNestedTests } from './not-nested.ts'

const judges = readExample('09a_vuong_judges.json')
const names = Object.keys(judges.models)
const complete = exampleMoments(judges)
const rows = judges.data.groups!.map((g) => Float64Array.from(g.raw.flat()))

function fitted(cells: ModelCells, moments: SampleMoments): FittedModel & { logLikelihood: number } {
  const { fit, gamma } = fitModel(cells, moments, { convention: 'normal' })
  return { cells, gamma: gamma!, logLikelihood: fit.logLikelihood! }
}

function pair(moments: SampleMoments, given: Float64Array[]): NotNestedInput {
  const [first, second] = names.map((name) => fitted(exampleCells(judges, name), moments))
  return { first: first!, second: second!, moments, rows: given }
}

describe('models that are not nested', () => {
  it('cannot be told apart from themselves scaled another way, and then have no z', () => {
    const cells = exampleCells(judges, names[0]!)
    const marked = structuredClone(cells)
    marked.groups[0]!.loadings[0]![0] = 1
    marked.groups[0]!.factorCovariances[0]![0] = 'variance'
    const input = { first: fitted(cells, complete), second: fitted(marked, complete), moments: complete, rows }
    expect(notNestedTests(input)).toMatchObject({ distinguishable: { p: 1 }, z: null, corrected: null })
  })

  it('need a likelihood of each case, which covariances alone do not give', () => {
    const { first, second, moments } = pair(complete, rows)
    const without = [first, second].map(({ cells }) => ({
      ...cells,
      groups: cells.groups.map((g) => ({ ...g, intercepts: null, factorMeans: null }))
    }))
    const [a, b] = without.map((cells) => fitted(cells, moments))
    expect(notNestedTests({ first: a!, second: b!, moments, rows })).toBeNull()
  })

  it('give the same tests whatever the order of the rows', () => {
    const p = judges.data.variables.length
    const backwards = rows.map((values) => {
      const cases = Array.from({ length: values.length / p }, (_, row) => [...values.subarray(row * p, (row + 1) * p)])
      return Float64Array.from(cases.reverse().flat())
    })
    const [one, other] = [rows, backwards].map((given) => notNestedTests(pair(complete, given))!)
    expect(other!.omega2).toBeCloseTo(one!.omega2, 10)
    expect(other!.distinguishable!.p).toBeCloseTo(one!.distinguishable!.p, 9)
  })
})

describe('with missing answers', () => {
  const p = judges.data.variables.length
  const generator = seededGenerator(7)
  const holed = rows.map((values) => values.map((value) => (generator.uniform() < 0.12 ? Number.NaN : value)))
  holed[0]!.fill(Number.NaN, 0, p)
  const { patterns, n } = splitByPattern(holed[0]!, p)
  const { mean, covariance } = saturatedMoments(patterns, p)
  const moments: SampleMoments = { ...complete, groups: [{ name: null, n, mean, covariance, patterns }] }

  it('the casewise log-likelihoods sum to that of the fit, and a case without answers adds nothing', () => {
    const { first } = pair(moments, holed)
    const objective = normalObjective(compileModel(first.cells), moments, 'normal')
    objective.evaluate(Float64Array.from(first.gamma))
    const values = casewiseLogLikelihoods(objective.states, holed)[0]!
    expect(values[0]).toBe(0)
    expect(values.reduce((sum, value) => sum + value, 0)).toBeCloseTo((first as ReturnType<typeof fitted>).logLikelihood, 7)
  })

  it('the tests count the cases with an answer and rest on the difference of the two log-likelihoods', () => {
    const input = pair(moments, holed)
    const tests = notNestedTests(input)!
    const [first, second] = [input.first, input.second] as ReturnType<typeof fitted>[]
    expect(tests.n).toBe(rows[0]!.length / p - 1)
    expect(tests.logLikelihoodRatio).toBeCloseTo(first!.logLikelihood - second!.logLikelihood, 7)
    expect(tests.distinguishable!.p).toBeGreaterThan(0)
    expect(tests.distinguishable!.p).toBeLessThan(1)
  })
})
