/**
 * One random model of the convergence study: drawn, fitted as the program fits it, and checked against further starts (the
 * population's own values, and three seeded perturbations of them). A fit is
 *
 *     beaten         when a further start ends lower by more than 1e-7 (1 + F)
 *     wrongly told   when it is said to have converged, but F has a slope there or curves downwards
 */
import { seededGenerator } from '../../src-main/statistics/distributions/generator.ts'
import { normalObjective, type Objective } from '../../src-main/statistics/estimation/normal-likelihood.ts'
import { minimise, ordinaryScoring } from '../../src-main/statistics/estimation/scoring.ts'
import { perturbedStart } from '../../src-main/statistics/estimation/starts.ts'
import { fitModel } from '../../src-main/statistics/fit/fit.ts'
import { isPositiveDefinite } from '../../src-main/statistics/matrix/symmetric.ts'
import { type CompiledModel, compileModel } from '../../src-main/statistics/model/compile.ts'
import { type DataDesign, type ModelDesign, pick, type RandomModel, randomData, randomModel, sizeBetween } from './random-models.ts'

export const furtherStarts = 4

export interface Finding {
  index: number
  design: ModelDesign & DataDesign
  n: number
  state: string
  reason: string | null
  firstStart: boolean
  starts: number
  iterations: number
  milliseconds: number
  improper: boolean
  /** F here less the smallest F of the further starts, when positive. */
  beatenBy: number
  wronglyTold: boolean
  /** Further starts that converged. */
  others: number
}

/** The design of model `index`; all of it follows from the seed. */
function drawStudy(
  index: number,
  seed: number
): { model: RandomModel; data: DataDesign; generator: ReturnType<typeof seededGenerator> } {
  const generator = seededGenerator(seed + 7919 * index)
  const indicators = sizeBetween(generator, 6, 60)
  const factors = 1 + Math.floor(generator.uniform() * Math.min(8, Math.floor(indicators / 3)))
  const kinds = ['simple structure', 'simple structure', 'cross-loadings', 'residual covariances'] as const
  const design: ModelDesign = {
    kind: factors >= 4 && generator.uniform() < 0.2 ? 'second-order factor' : pick(generator, kinds),
    factors,
    indicators,
    groups: 1 + Math.floor(generator.uniform() * 4),
    level: pick(generator, ['same pattern', 'equal loadings', 'equal intercepts', 'equal residual variances']),
    scaling: pick(generator, ['first loading', 'factor variance', 'effects coding']),
    misfit: pick(generator, [0, 0.1, 0.2])
  }
  const data: DataDesign = {
    total: sizeBetween(generator, 60, 5000),
    patterns: generator.uniform() < 1 / 3 ? 2 + Math.floor(generator.uniform() * 7) : 1
  }
  return { model: randomModel(design, generator), data, generator }
}

export function examine(index: number, seed: number): Finding {
  const { model, data, generator } = drawStudy(index, seed)
  const { moments } = randomData(model, data, generator)
  // Processor time of this thread, which other work on the machine does not stretch as it does the clock's.
  const before = process.threadCpuUsage()
  const { fit, gamma } = fitModel(model.cells, moments, { convention: 'normal' })
  const spent = process.threadCpuUsage(before)
  const milliseconds = (spent.user + spent.system) / 1000
  const compiled = compileModel(model.cells)
  const objective = normalObjective(compiled, moments, 'normal')
  const ends = furtherEnds(compiled, objective, model, seed + index)
  const smallest = Math.min(...ends)
  const value = fit.minimum ?? Number.POSITIVE_INFINITY
  const improper = ['negative-residual-variance', 'negative-factor-variance', 'factor-correlation-beyond-one', 'not-positive']
  return {
    index,
    design: { ...model.design, ...data },
    n: moments.groups.reduce((sum, g) => sum + g.n, 0),
    state: fit.state,
    reason: fit.reason,
    firstStart: fit.convergence.tried[0]?.stop === 'converged',
    starts: fit.convergence.starts,
    iterations: fit.convergence.iterations,
    milliseconds,
    improper: fit.cautions.some((caution) => improper.some((code) => caution.code.includes(code))),
    beatenBy: value - smallest > 1e-7 * (1 + Math.abs(smallest)) ? value - smallest : 0,
    wronglyTold: gamma !== null && !isMinimum(objective, Float64Array.from(gamma), seed + index),
    others: ends.length
  }
}

/** F where further starts end, of those that converge: the population's values, then perturbations of them that are feasible. */
function furtherEnds(model: CompiledModel, objective: Objective, { truth }: RandomModel, seed: number): number[] {
  const generator = seededGenerator(seed)
  const population = Float64Array.from(model.gammaLabels, (label) => truth.get(label)!)
  const ends: number[] = []
  for (let at = 0; at < furtherStarts; at++) {
    let start: Float64Array = population
    for (let draws = 0; at > 0 && draws < 30; draws++) {
      start = perturbedStart(model, population, generator)
      if (!Number.isNaN(objective.evaluate(start))) break
    }
    const { stop, value } = minimise(objective, start, { ...ordinaryScoring, iterations: 200 })
    if (stop === 'converged') ends.push(value)
  }
  return ends
}

/** No slope along random directions (central differences of F), and observed second derivatives that do not curve downwards. */
function isMinimum(objective: Objective, gamma: Float64Array, seed: number): boolean {
  const q = objective.parameters
  const generator = seededGenerator(seed)
  objective.evaluate(gamma)
  const expected = new Float64Array(q * q)
  objective.derive(new Float64Array(q), expected)
  const observed = new Float64Array(q * q)
  objective.derive(new Float64Array(q), observed, 'observed')
  for (let k = 0; k < q; k++) observed[k * q + k]! += 1e-8 * expected[k * q + k]!
  if (!isPositiveDefinite(observed, q)) return false
  for (let round = 0; round < 4; round++) {
    const direction = gamma.map((_, k) => generator.normal() / Math.sqrt(q * expected[k * q + k]!))
    const at = (step: number) => objective.evaluate(gamma.map((value, k) => value + step * direction[k]!))
    if (!(Math.abs(at(1e-4) - at(-1e-4)) / 2e-4 < 1e-6)) return false
  }
  return true
}
