import { inverse, Matrix } from 'ml-matrix'
import { describe, expect, it } from 'vitest'
import { simulate } from '../../../tests/bench/simulate.ts'
import { seededGenerator } from '../distributions/generator.ts'
import type { Cell, ModelCells } from '../model/cells.ts'
import { type CompiledModel, compileModel } from '../model/compile.ts'
import { groupState, impliedMoments } from '../model/implied-moments.ts'
import type { SampleMoments } from '../moments/sample-moments.ts'
import { normalObjective } from './normal-likelihood.ts'
import { perturbedStart, startingValues } from './starts.ts'

/** A model with everything in it: two groups, a second-order factor, a structural path, a cross-loading, means, equalities. */
function everything(): ModelCells {
  const sheet = (rows: number, columns: number, at: Record<string, Cell>): Cell[][] =>
    Array.from({ length: rows }, (_, i) =>
      Array.from({ length: columns }, (_, j) => at[`${i},${j}`] ?? (rows === columns ? at[`${j},${i}`] : undefined) ?? 0)
    )
  const group = (g: string) => ({
    name: g,
    loadings: sheet(6, 4, {
      '0,0': 1,
      '1,0': 'l1',
      '2,0': `l2${g}`,
      '2,1': `x${g}`,
      '2,2': 0,
      '3,1': 1,
      '4,1': 'l4',
      '5,2': 1,
      '3,2': `x2${g}`,
      '4,2': 0.3
    }),
    regressions: [0, 1, 2, 3].map((k) =>
      [0, 1, 2, 3].map((l): Cell => (l === 3 && k < 2 ? `b${k}${g}` : k === 2 && l === 0 ? 'path' : 0))
    ),
    factorCovariances: sheet(4, 4, { '0,0': `v0${g}`, '1,1': `v1${g}`, '2,2': `v2${g}`, '3,3': 1, '2,1': `c${g}` }),
    residualCovariances: sheet(6, 6, {
      ...Object.fromEntries([0, 1, 2, 3, 4, 5].map((i) => [`${i},${i}`, i === 3 ? 'shared' : `e${i}${g}`])),
      '4,1': `r${g}`
    }),
    intercepts: [0, 1, 2, 3, 4, 5].map((i): Cell => (i < 3 ? `n${i}` : `n${i}${g}`)),
    factorMeans: [g === 'a' ? 0 : 'k0', 0, 0, 0.2] as Cell[]
  })
  return {
    indicators: ['y1', 'y2', 'y3', 'y4', 'y5', 'y6'],
    factors: ['F', 'G', 'H', 'S'],
    groups: [group('a'), group('b')],
    constraints: [
      {
        terms: [
          { label: 'l2a', weight: 1 },
          { label: 'l2b', weight: 2 }
        ],
        equals: 2.4
      }
    ]
  }
}

function setting(): { model: CompiledModel; moments: SampleMoments; gamma: Float64Array } {
  const model = compileModel(everything())
  const moments = simulate(6, 2, [150, 220], seededGenerator(5))
  const gamma = perturbedStart(model, startingValues(model, moments), seededGenerator(8)).map((value, k) =>
    /^[rcx]/.test(model.gammaLabels[k]!) ? 0.05 : value
  )
  return { model, moments, gamma }
}

describe('the normal-theory discrepancy', () => {
  it('has the gradient that central differences of F give, in every kind of cell', () => {
    const { model, moments, gamma } = setting()
    const objective = normalObjective(model, moments, 'normal')
    const gradient = new Float64Array(model.parameters)
    expect(objective.evaluate(gamma)).not.toBeNaN()
    objective.derive(gradient)
    for (let k = 0; k < gamma.length; k++) {
      const step = 1e-5
      const at = (shift: number) => objective.evaluate(gamma.map((value, j) => (j === k ? value + shift : value)))
      const numeric = (at(-2 * step) - 8 * at(-step) + 8 * at(step) - at(2 * step)) / (12 * step)
      expect(Math.abs(gradient[k]! - numeric), model.gammaLabels[k]).toBeLessThan(1e-8 * (1 + Math.abs(numeric)))
    }
  })

  it("has the expected second derivatives of the plain twin: tr(W Si W Sj) + 2 mi' W mj from whole derivative matrices", () => {
    const { model, moments, gamma } = setting()
    const objective = normalObjective(model, moments, 'normal')
    const q = model.parameters
    const curvature = new Float64Array(q * q)
    objective.evaluate(gamma)
    objective.derive(new Float64Array(q), curvature)
    const twin = denseCurvature(model, moments, gamma)
    for (let i = 0; i < q; i++) {
      for (let j = 0; j <= i; j++) {
        const what = `${model.gammaLabels[i]} with ${model.gammaLabels[j]}`
        expect(Math.abs(curvature[i * q + j]! - twin.get(i, j)), what).toBeLessThan(1e-7 * (1 + Math.abs(twin.get(i, j))))
      }
    }
  })

  for (const kind of ['complete', 'missing'] as const) {
    it(`has the observed second derivatives that central differences of the gradient give, ${kind} data`, () => {
      const { model, moments, gamma } = setting()
      const objective = normalObjective(model, kind === 'complete' ? moments : withHoles(moments), 'normal')
      const q = model.parameters
      const curvature = new Float64Array(q * q)
      objective.evaluate(gamma)
      objective.derive(new Float64Array(q), curvature, 'observed')
      const gradientAt = (k: number, shift: number) => {
        const out = new Float64Array(q)
        objective.evaluate(gamma.map((value, j) => (j === k ? value + shift : value)))
        objective.derive(out)
        return out
      }
      for (let k = 0; k < q; k++) {
        const step = 1e-5
        const [a, b, c, d] = [gradientAt(k, -2 * step), gradientAt(k, -step), gradientAt(k, step), gradientAt(k, 2 * step)]
        for (let j = 0; j < q; j++) {
          const numeric = (a[j]! - 8 * b[j]! + 8 * c[j]! - d[j]!) / (12 * step)
          const own = curvature[Math.max(j, k) * q + Math.min(j, k)]!
          expect(Math.abs(own - numeric), `${model.gammaLabels[k]} with ${model.gammaLabels[j]}`).toBeLessThan(
            1e-7 * (1 + Math.abs(numeric))
          )
        }
      }
    })
  }

  it('has the gradient that central differences of F give with missing answers', () => {
    const { model, moments, gamma } = setting()
    const objective = normalObjective(model, withHoles(moments), 'normal')
    const gradient = new Float64Array(model.parameters)
    objective.evaluate(gamma)
    objective.derive(gradient)
    for (let k = 0; k < gamma.length; k++) {
      const step = 1e-5
      const at = (shift: number) => objective.evaluate(gamma.map((value, j) => (j === k ? value + shift : value)))
      const numeric = (at(-2 * step) - 8 * at(-step) + 8 * at(step) - at(2 * step)) / (12 * step)
      expect(Math.abs(gradient[k]! - numeric), model.gammaLabels[k]).toBeLessThan(1e-8 * (1 + Math.abs(numeric)))
    }
  })

  it('is not defined where the implied covariance matrix is not positive definite', () => {
    const { model, moments, gamma } = setting()
    const objective = normalObjective(model, moments, 'normal')
    expect(objective.evaluate(gamma.map((value, k) => (model.gammaLabels[k] === 'e0a' ? -50 : value)))).toBeNaN()
  })
})

/** Three patterns a group: complete, without the second and fifth indicator, the first three alone. */
function withHoles(moments: SampleMoments): SampleMoments {
  const kept = [
    [0, 1, 2, 3, 4, 5],
    [0, 2, 3, 5],
    [0, 1, 2]
  ]
  const groups = moments.groups.map((group, g) => ({
    ...group,
    patterns: kept.map((observed, k) => ({
      observed: Int32Array.from(observed),
      n: group.n / 3,
      mean: Float64Array.from(observed, (i) => group.mean![i]! + 0.03 * (k - g)),
      covariance: Float64Array.from(
        observed.flatMap((i) => observed.map((j) => group.covariance[i * 6 + j]! * (i === j ? 1 + 0.1 * k : 1)))
      )
    }))
  }))
  return { ...moments, groups }
}

/** Derivatives of Sigma and mu by central differences, multiplied out with a general-purpose matrix library. */
function denseCurvature(model: CompiledModel, moments: SampleMoments, gamma: Float64Array): Matrix {
  const p = model.indicators.length
  const q = model.parameters
  const total = moments.groups.reduce((sum, g) => sum + g.n, 0)
  const out = Matrix.zeros(q, q)
  model.groups.forEach((group, g) => {
    const implied = (x: Float64Array) => {
      const state = groupState(p, model.factors.length)
      impliedMoments(group, x, model.hasRegressions, state)
      return { sigma: Matrix.from1DArray(p, p, [...state.sigma]), mu: Matrix.columnVector([...state.mu]) }
    }
    const w = inverse(implied(gamma).sigma)
    const step = 1e-5
    const slopes = Array.from({ length: q }, (_, k) => {
      const up = implied(gamma.map((value, j) => (j === k ? value + step : value)))
      const down = implied(gamma.map((value, j) => (j === k ? value - step : value)))
      return { sigma: up.sigma.sub(down.sigma).div(2 * step), mu: up.mu.sub(down.mu).div(2 * step) }
    })
    for (let i = 0; i < q; i++) {
      for (let j = 0; j <= i; j++) {
        const covariance = w.mmul(slopes[i]!.sigma).mmul(w).mmul(slopes[j]!.sigma).trace()
        const mean = slopes[i]!.mu.transpose().mmul(w).mmul(slopes[j]!.mu).get(0, 0)
        out.set(i, j, out.get(i, j) + (moments.groups[g]!.n / total) * (covariance + 2 * mean))
      }
    }
  })
  return out
}
