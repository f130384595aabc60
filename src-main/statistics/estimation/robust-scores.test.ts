import { describe, expect, it } from 'vitest'
import { simulate } from '../../../tests/bench/simulate.ts'
import { seededGenerator } from '../distributions/generator.ts'
import { cholesky, choleskySolve, logDeterminant } from '../matrix/symmetric.ts'
import type { Cell, ModelCells } from '../model/cells.ts'
import { type CompiledModel, compileModel } from '../model/compile.ts'
import { groupState, impliedMoments } from '../model/implied-moments.ts'
import { completeCaseMoments } from '../moments/sample-moments.ts'
import { scoreCrossProducts } from './casewise.ts'
import { addCross, caseSums, momentSums } from './robust-scores.ts'
import { perturbedStart, startingValues } from './starts.ts'

/** Two groups with a second-order factor, a path between factors, a residual covariance, means, equalities, a linear constraint. */
function manyKinds(): ModelCells {
  const sheet = (rows: number, columns: number, at: Record<string, Cell>): Cell[][] =>
    Array.from({ length: rows }, (_, i) => Array.from({ length: columns }, (__, j) => at[`${i},${j}`] ?? 0))
  const group = (g: string) => ({
    name: g,
    loadings: sheet(6, 3, { '0,0': 1, '1,0': `a${g}`, '2,0': 'b', '3,1': 1, '4,1': 'c', '5,1': `d${g}` }),
    regressions: sheet(3, 3, { '0,2': `s0${g}`, '1,2': 's1', '1,0': `path${g}` }),
    factorCovariances: sheet(3, 3, { '0,0': `v0${g}`, '1,1': `v1${g}`, '2,2': 1 }),
    residualCovariances: sheet(6, 6, {
      ...Object.fromEntries([0, 1, 2, 3, 4, 5].map((i) => [`${i},${i}`, i === 3 ? 'shared' : `e${i}${g}`])),
      '4,1': `r${g}`,
      '1,4': `r${g}`
    }),
    intercepts: [0, 1, 2, 3, 4, 5].map((i): Cell => (i < 3 ? `n${i}` : `n${i}${g}`)),
    factorMeans: ['k0', 0, g === 'x' ? 0 : 'k2'] as Cell[]
  })
  return {
    indicators: ['y1', 'y2', 'y3', 'y4', 'y5', 'y6'],
    factors: ['F', 'G', 'S'],
    groups: [group('x'), group('y')],
    constraints: [
      {
        terms: [
          { label: 'ax', weight: 1 },
          { label: 'ay', weight: 2 }
        ],
        equals: 2.4
      }
    ]
  }
}

function setting() {
  const model = compileModel(manyKinds())
  const moments = simulate(6, 2, [150, 220], seededGenerator(5))
  const gamma = perturbedStart(model, startingValues(model, moments), seededGenerator(8)).map((value, k) =>
    /^(r|s|path|k)/.test(model.gammaLabels[k]!) ? 0.1 : value
  )
  const generator = seededGenerator(19)
  const rows = [70, 130].map((n) => Float64Array.from({ length: n * 6 }, () => generator.normal() ** 3))
  return { model, gamma, rows, states: statesAt(model, gamma) }
}

function statesAt(model: CompiledModel, gamma: Float64Array) {
  return model.groups.map((group) => {
    const state = groupState(model.indicators.length, model.factors.length)
    expect(impliedMoments(group, gamma, model.hasRegressions, state)).toBe(true)
    return state
  })
}

/** ln of the normal density of one row, but for the constant. */
function logDensity(model: CompiledModel, g: number, gamma: Float64Array, row: Float64Array): number {
  const { sigma, mu, p } = statesAt(model, gamma)[g]!
  const factor = new Float64Array(p * p)
  expect(cholesky(sigma, p, factor)).toBe(true)
  const e = row.map((value, j) => value - mu[j]!)
  const solved = Float64Array.from(e)
  choleskySolve(factor, p, solved)
  return -0.5 * (logDeterminant(factor, p) + e.reduce((sum, value, j) => sum + value * solved[j]!, 0))
}

describe('the casewise derivatives', () => {
  it('are the score of a case that central differences of its log-density give, in every kind of cell', () => {
    const { model, gamma, rows, states } = setting()
    model.groups.forEach((_, g) => {
      const row = rows[g]!.slice(12, 18)
      const { gammas, mean } = caseSums(model, g, states[g]!, row, states[g]!.mu)
      const own = new Float64Array(model.parameters)
      gammas.forEach((k, at) => {
        own[k] = mean[at]!
      })
      for (let k = 0; k < model.parameters; k++) {
        const at = (shift: number) =>
          logDensity(
            model,
            g,
            gamma.map((value, j) => (j === k ? value + shift : value)),
            row
          )
        const step = 1e-4
        const numeric = (at(-2 * step) - 8 * at(-step) + 8 * at(step) - at(2 * step)) / (12 * step)
        expect(Math.abs(own[k]! - numeric), model.gammaLabels[k]).toBeLessThan(1e-8 * (1 + Math.abs(numeric)))
      }
    })
  })

  it('have the cross-products that summing row by row gives, whole blocks and remainders alike', () => {
    const { model, rows, states } = setting()
    const q = model.parameters
    const own = new Float64Array(q * q)
    rows.forEach((values, g) => {
      addCross(caseSums(model, g, states[g]!, values, states[g]!.mu), values.length / 6, own, q)
    })
    const twin = scoreCrossProducts(model, states, rows)
    for (let at = 0; at < q * q; at++) {
      expect(Math.abs(own[at]! - twin[at]!)).toBeLessThan(1e-9 * (1 + Math.abs(twin[at]!)))
    }
  })

  it('taken from the sample mean have the covariance matrix of the cases one by one', () => {
    const { model, rows, states } = setting()
    const { cross, gammas, n } = momentSums(model, 1, states[1]!, rows[1]!)
    const { mean } = completeCaseMoments(rows[1]!, 6)
    const cases = Array.from({ length: n }, (_, i) => caseSums(model, 1, states[1]!, rows[1]!.slice(6 * i, 6 * i + 6), mean).mean)
    const centre = Float64Array.from(gammas, (_, a) => cases.reduce((sum, h) => sum + h[a]!, 0) / n)
    for (let a = 0; a < centre.length; a++) {
      for (let b = 0; b <= a; b++) {
        const twin = cases.reduce((sum, h) => sum + (h[a]! - centre[a]!) * (h[b]! - centre[b]!), 0) / n
        expect(Math.abs(cross[a * gammas.length + b]! - twin)).toBeLessThan(1e-9 * (1 + Math.abs(twin)))
      }
    }
  })

  it('are refused where the implied covariance matrix is no covariance matrix, which is a bug of the caller', () => {
    const { model, rows, states } = setting()
    states[0]!.sigma.fill(1)
    expect(() => caseSums(model, 0, states[0]!, rows[0]!, states[0]!.mu)).toThrow('not positive definite')
  })
})
