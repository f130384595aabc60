/** Properties that hold of every fit, on random models and data; the numbers against an independent optimiser. */
import { describe, expect, it } from 'vitest'
import { seededGenerator } from '../../src-main/statistics/distributions/generator.ts'
import { normalObjective } from '../../src-main/statistics/estimation/normal-likelihood.ts'
import { fitModel } from '../../src-main/statistics/fit/fit.ts'
import type { ModelCells } from '../../src-main/statistics/model/cells.ts'
import { compileModel } from '../../src-main/statistics/model/compile.ts'
import { splitByPattern } from '../../src-main/statistics/moments/missing-patterns.ts'
import { completeCaseMoments, type SampleMoments } from '../../src-main/statistics/moments/sample-moments.ts'
import { saturatedMoments } from '../../src-main/statistics/moments/saturated-em.ts'
import {
  between,
  type ModelDesign,
  pick,
  type RandomModel,
  randomData,
  randomModel,
  type Scaling,
  sizeBetween
} from '../studies/random-models.ts'
import { independentT } from './independent-fit.ts'

const settings = { convention: 'normal' as const }

interface Drawn {
  name: string
  design: ModelDesign
  seed: number
  model: RandomModel
  moments: SampleMoments
  rows: Float64Array[]
}

/** Random models of 1 to 4 factors in 1 to 3 groups; every third with missing answers. */
const drawn: Drawn[] = Array.from({ length: 36 }, (_, at) => {
  const seed = 4_000 + at
  const generator = seededGenerator(seed)
  const factors = 1 + (at % 4)
  const design: ModelDesign = {
    kind: factors === 4 ? 'second-order factor' : pick(generator, ['simple structure', 'cross-loadings', 'residual covariances']),
    factors,
    indicators: Math.max(6, 3 * factors + Math.floor(generator.uniform() * 3)),
    groups: 1 + Math.floor(generator.uniform() * 3),
    level: pick(generator, ['same pattern', 'equal loadings', 'equal intercepts', 'equal residual variances']),
    scaling: pick(generator, ['first loading', 'factor variance', 'effects coding']),
    misfit: pick(generator, [0.05, 0.15])
  }
  const model = randomModel(design, generator)
  const patterns = at % 3 === 2 ? 4 : 1
  const { moments, rows } = randomData(model, { total: sizeBetween(generator, 300, 2000), patterns }, generator)
  const { kind, indicators, groups, level, scaling } = model.design
  const name = `${kind}, ${indicators} indicators on ${factors} in ${groups}, ${level}, by ${scaling}${patterns > 1 ? ', missing answers' : ''}`
  return { name: `${at + 1}: ${name}`, design: model.design, seed, model, moments, rows }
})

function fitted(cells: ModelCells, moments: SampleMoments) {
  const { fit, gamma } = fitModel(cells, moments, settings)
  if (gamma === null || fit.T === null) throw new Error(`not fitted: ${fit.reason}`)
  return { T: fit.T, df: fit.df, gamma: Float64Array.from(gamma) }
}

describe.each(drawn)('random model $name', ({ design, seed, model, moments, rows }) => {
  const { cells } = model
  const { T, df, gamma } = fitted(cells, moments)

  it('has the T of an independent optimiser, to 1e-6', () => {
    const second = independentT(cells, moments, model.truth)
    expect(Math.abs(T - second) / T).toBeLessThan(1e-6)
  })

  it('has no slope left at the optimum', () => {
    const objective = normalObjective(compileModel(cells), moments, 'normal')
    const gradient = new Float64Array(objective.parameters)
    const curvature = new Float64Array(objective.parameters ** 2)
    objective.evaluate(gamma)
    objective.derive(gradient, curvature)
    const units = gradient.map((slope, k) => slope / Math.sqrt(curvature[k * objective.parameters + k]!))
    expect(Math.max(...units.map(Math.abs))).toBeLessThan(1e-7)
  })

  it('has as many degrees of freedom as moments less free labels plus equations', () => {
    const p = cells.indicators.length
    const labels = new Set(
      cells.groups.flatMap((g) =>
        [g.loadings, g.regressions, g.factorCovariances, g.residualCovariances, [g.intercepts!], [g.factorMeans!]].flatMap(
          (sheet) => sheet.flat().filter((cell) => typeof cell === 'string')
        )
      )
    )
    expect(df).toBe(cells.groups.length * ((p * (p + 1)) / 2 + p) - labels.size + cells.constraints.length)
  })

  it('does not change T when indicators are measured in other units from other origins', () => {
    const generator = seededGenerator(seed)
    const p = cells.indicators.length
    const unit = cells.indicators.map(() => Math.exp(between(generator, -2, 2)))
    const origin = cells.indicators.map(() => between(generator, -5, 5))
    // Under effects coding the indicators of one factor share a unit and an origin, or the model is another.
    const coded = design.scaling === 'effects coding'
    const factorOf = (i: number) => cells.groups[0]!.loadings[i]!.findIndex((cell) => cell !== 0)
    const of = (from: number[], i: number) => (coded ? from[factorOf(i)]! : from[i]!)
    const moved = rows.map((values) => values.map((x, at) => of(origin, at % p) + of(unit, at % p) * x))
    const changed = momentsOfRows(cells, moved, moments)
    expect(Math.abs(fitted(cells, changed).T - T) / T).toBeLessThan(1e-6)
  })

  it('has the same T and df under the three scalings', () => {
    for (const scaling of ['first loading', 'factor variance', 'effects coding'] satisfies Scaling[]) {
      if (scaling === design.scaling) continue
      const other = fitted(rescaled(seed, design, scaling), moments)
      expect(other.df).toBe(df)
      expect(Math.abs(other.T - T) / T).toBeLessThan(1e-6)
    }
  })

  it('has a T of 0 once it is saturated', () => {
    expect(fitted(saturated(cells), moments).T).toBeLessThan(1e-7)
  })
})

/** The same model, drawn from the same seed, in another scaling. */
function rescaled(seed: number, design: ModelDesign, scaling: Scaling): ModelCells {
  const generator = seededGenerator(seed)
  // What `drawn` took from the generator before the model.
  if (design.kind !== 'second-order factor') generator.uniform()
  for (let k = 0; k < 5; k++) generator.uniform()
  return randomModel({ ...design, scaling }, generator).cells
}

function momentsOfRows(cells: ModelCells, rows: Float64Array[], like: SampleMoments): SampleMoments {
  const p = cells.indicators.length
  const groups = rows.map((values, g) => {
    const { name, patterns } = like.groups[g]!
    if (patterns === undefined) return { name, ...completeCaseMoments(values, p) }
    const split = splitByPattern(values, p)
    const { mean, covariance } = saturatedMoments(split.patterns, p)
    return { name, n: split.n, patterns: split.patterns, mean, covariance }
  })
  return { indicators: cells.indicators, groups }
}

/** One factor with every loading fixed at 0 and a fixed variance; every residual covariance and intercept free in every group. */
function saturated({ indicators, groups }: ModelCells): ModelCells {
  return {
    indicators,
    factors: ['F'],
    constraints: [],
    groups: groups.map(({ name }, g) => ({
      name,
      loadings: indicators.map(() => [0]),
      regressions: [[0]],
      factorCovariances: [[1]],
      residualCovariances: indicators.map((_, i) => indicators.map((_, j) => `s ${Math.max(i, j)} ${Math.min(i, j)} g${g}`)),
      intercepts: indicators.map((_, i) => `n ${i} g${g}`),
      factorMeans: [0]
    }))
  }
}
