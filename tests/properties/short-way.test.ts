/** The short way through diagonal residual variances (estimation/pattern-value.ts) against its dense twin, on random models. */
import { describe, expect, it } from 'vitest'
import { seededGenerator } from '../../src-main/statistics/distributions/generator.ts'
import { type CurvatureKind, normalObjective } from '../../src-main/statistics/estimation/normal-likelihood.ts'
import { type CompiledModel, compileModel } from '../../src-main/statistics/model/compile.ts'
import type { SampleMoments } from '../../src-main/statistics/moments/sample-moments.ts'
import { randomData, randomModel } from '../studies/random-models.ts'

const kinds = ['simple structure', 'cross-loadings', 'second-order factor'] as const

interface Case {
  name: string
  model: CompiledModel
  moments: SampleMoments
  gamma: Float64Array
}

const cases: Case[] = kinds.flatMap((kind, at) =>
  [1, 5].map((patterns) => {
    const generator = seededGenerator(80 + at)
    const drawn = randomModel(
      { kind, factors: 4, indicators: 16, groups: 2, level: 'equal intercepts', scaling: 'first loading', misfit: 0.1 },
      generator
    )
    const model = compileModel(drawn.cells)
    const { moments } = randomData(drawn, { total: 600, patterns }, generator)
    const gamma = Float64Array.from(model.gammaLabels, (label) => drawn.truth.get(label)! * (1 + 0.05 * generator.normal()))
    return { name: `${kind}${patterns > 1 ? ', missing answers' : ''}`, model, moments, gamma }
  })
)

/** Largest difference relative to the largest number. */
function apart(a: Float64Array, b: Float64Array): number {
  const size = Math.max(...b.map(Math.abs))
  return Math.max(...a.map((value, k) => Math.abs(value - b[k]!))) / size
}

function compare({ model, moments }: Case, gamma: Float64Array, kind: CurvatureKind) {
  const both = [normalObjective(model, moments, 'normal'), normalObjective(model, moments, 'normal', 'dense')].map((objective) => {
    const value = objective.evaluate(gamma)
    const gradient = new Float64Array(model.parameters)
    const curvature = new Float64Array(model.parameters ** 2)
    objective.derive(gradient, curvature, kind)
    return { value, gradient, curvature }
  })
  const [short, dense] = [both[0]!, both[1]!]
  return {
    value: Math.abs(short.value - dense.value) / dense.value,
    gradient: apart(short.gradient, dense.gradient),
    curvature: apart(short.curvature, dense.curvature)
  }
}

describe.each(cases)('the short way: $name', (one) => {
  it.each(['expected', 'observed'] as const)('gives the F, gradient and %s second derivatives of the dense way', (kind) => {
    const { value, gradient, curvature } = compare(one, one.gamma, kind)
    expect(value).toBeLessThan(1e-12)
    expect(gradient).toBeLessThan(1e-11)
    expect(curvature).toBeLessThan(1e-11)
  })

  it('is left for the dense way, to the same numbers, where a residual variance is next to nothing or negative', () => {
    for (const share of [0.021, 0.019, 1e-9, -0.001]) {
      const gamma = one.gamma.slice()
      const k = one.model.gammaLabels.indexOf('t 3 g1')
      gamma[k] = share * one.moments.groups[0]!.covariance[3 * 16 + 3]!
      const { value, gradient } = compare(one, gamma, 'expected')
      expect(value).toBeLessThan(1e-11)
      expect(gradient).toBeLessThan(1e-9)
    }
  })
})
