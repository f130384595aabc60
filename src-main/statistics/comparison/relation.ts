/**
 * How two models stand to each other, by computation and not by anyone's word (methods: section 6).
 *
 * First the syntactic proof: every cell of the restricted model is what the general model would make of it. Else by
 * refitting (Bentler & Satorra 2010): the general model must reproduce the restricted model's implied moments perfectly,
 * at its solution and at a second, perturbed parameter point, so that a chance fit cannot pass.
 */
import { seededGenerator } from '../distributions/generator.ts'
import { normalObjective } from '../estimation/normal-likelihood.ts'
import { minimise } from '../estimation/scoring.ts'
import { perturbedStart, startingValues } from '../estimation/starts.ts'
import { isPositiveDefinite } from '../matrix/symmetric.ts'
import type { ModelCells } from '../model/cells.ts'
import { type CompiledGroup, type CompiledModel, compileModel, type FreeCell, type MatrixName } from '../model/compile.ts'
import { groupState, impliedMoments } from '../model/implied-moments.ts'
import type { SampleMoments } from '../moments/sample-moments.ts'

export interface RelationInput {
  /** The model with fewer degrees of freedom (the lower rung), with its solution. */
  general: ModelCells
  generalGamma: number[]
  restricted: ModelCells
  restrictedGamma: number[]
  /** Cases per group, for weighting. */
  sizes: number[]
}

export interface RelationOutcome {
  /** "reversed": the model given as general is the one that is nested in the other. */
  relation: 'nested' | 'equivalent' | 'not nested' | 'reversed'
  proof: 'constraints' | 'refit'
}

/** A discrepancy below this is a perfect fit; a singular but perfect solution is approached slowly, hence not smaller. */
const perfectFit = 1e-8
const seed = 20_260_102
/** Perturbed starts before "does not fit" is believed. */
const furtherStarts = 4

export function relationOf(input: RelationInput): RelationOutcome {
  const general = compileModel(input.general)
  const restricted = compileModel(input.restricted)
  if (!sameMoments(general, restricted)) return { relation: 'not nested', proof: 'constraints' }
  if (general.df > restricted.df) {
    const turned = relationOf({
      ...input,
      general: input.restricted,
      generalGamma: input.restrictedGamma,
      restricted: input.general,
      restrictedGamma: input.generalGamma
    })
    return turned.relation === 'nested' ? { ...turned, relation: 'reversed' } : turned
  }
  const relation = general.df === restricted.df ? 'equivalent' : 'nested'
  if (contains(general, restricted)) return { relation, proof: 'constraints' }
  const fits = reproduces(general, input.generalGamma, restricted, input.restrictedGamma, input.sizes)
  const fitsBack = relation === 'nested' || reproduces(restricted, input.restrictedGamma, general, input.generalGamma, input.sizes)
  return { relation: fits && fitsBack ? relation : 'not nested', proof: 'refit' }
}

/** Both describe the same indicators, in the same groups, with means or without. */
function sameMoments(a: CompiledModel, b: CompiledModel): boolean {
  const frame = (m: CompiledModel) => JSON.stringify([m.indicators, m.groups.map((g) => g.name), m.meanStructure])
  return frame(a) === frame(b)
}

/** Affine form of a cell in the gammas: constant + sum of weights, canonical as text for comparison. */
type Form = { constant: number; weights: Map<number, number> }

/**
 * Whether every parameter value of `restricted` is one of `general`, cell by cell: general's gammas are read off the cells
 * they are named after, and then every other cell of general must come out as restricted has it.
 */
function contains(general: CompiledModel, restricted: CompiledModel): boolean {
  if (JSON.stringify(general.factors) !== JSON.stringify(restricted.factors)) return false
  const groups = general.groups.map((group, g) => ({ general: cellMap(group), restricted: cellMap(restricted.groups[g]!) }))
  const gamma: (Form | undefined)[] = []
  general.groups.forEach((group, g) => {
    for (const cell of group.free) {
      const k = cell.gammas.length === 1 && cell.constant === 0 && cell.weights[0] === 1 ? cell.gammas[0]! : -1
      if (k >= 0 && gamma[k] === undefined)
        gamma[k] = formAt(restricted.groups[g]!, groups[g]!.restricted, cell.matrix, cell.row, cell.column)
    }
  })
  return general.groups.every((group, g) =>
    places(group).every(([matrix, row, column]) => {
      const wanted = formAt(restricted.groups[g]!, groups[g]!.restricted, matrix, row, column)
      const own = formAt(group, groups[g]!.general, matrix, row, column)
      const substituted = substitute(own, gamma)
      return substituted !== null && sameForm(wanted, substituted)
    })
  )
}

const columnsOf: Record<MatrixName, (group: CompiledGroup) => number> = {
  lambda: (g) => g.alpha.length,
  beta: (g) => g.alpha.length,
  psi: (g) => g.alpha.length,
  theta: (g) => g.nu.length,
  nu: () => 1,
  alpha: () => 1
}

function cellMap(group: CompiledGroup): Map<string, FreeCell> {
  return new Map(group.free.map((cell) => [`${cell.matrix} ${cell.row} ${cell.column}`, cell]))
}

/** Every place of the matrices; of symmetric ones the lower triangle. */
function places(group: CompiledGroup): [MatrixName, number, number][] {
  const out: [MatrixName, number, number][] = []
  for (const matrix of ['lambda', 'beta', 'psi', 'theta', 'nu', 'alpha'] as const) {
    const columns = columnsOf[matrix](group)
    const symmetric = matrix === 'psi' || matrix === 'theta'
    group[matrix].forEach((_, at) => {
      const row = Math.floor(at / columns)
      const column = at % columns
      if (!symmetric || column <= row) out.push([matrix, row, column])
    })
  }
  return out
}

function formAt(group: CompiledGroup, cells: Map<string, FreeCell>, matrix: MatrixName, row: number, column: number): Form {
  const cell = cells.get(`${matrix} ${row} ${column}`)
  if (cell === undefined) return { constant: group[matrix][row * columnsOf[matrix](group) + column]!, weights: new Map() }
  return { constant: cell.constant, weights: new Map([...cell.gammas].map((gamma, k) => [gamma, cell.weights[k]!])) }
}

function substitute(form: Form, gamma: (Form | undefined)[]): Form | null {
  const out: Form = { constant: form.constant, weights: new Map() }
  for (const [k, weight] of form.weights) {
    const inner = gamma[k]
    if (inner === undefined) return null
    out.constant += weight * inner.constant
    for (const [j, w] of inner.weights) out.weights.set(j, (out.weights.get(j) ?? 0) + weight * w)
  }
  return out
}

function sameForm(a: Form, b: Form): boolean {
  if (Math.abs(a.constant - b.constant) > 1e-10) return false
  const keys = new Set([...a.weights.keys(), ...b.weights.keys()])
  return [...keys].every((k) => Math.abs((a.weights.get(k) ?? 0) - (b.weights.get(k) ?? 0)) < 1e-10)
}

/** Whether `general` fits the implied moments of `restricted` perfectly, at its solution and at a perturbed point. */
function reproduces(
  general: CompiledModel,
  generalGamma: number[],
  restricted: CompiledModel,
  gamma: number[],
  sizes: number[]
): boolean {
  const solution = impliedSample(restricted, Float64Array.from(gamma), sizes)
  if (solution === null || !fitsPerfectly(general, generalGamma, solution)) return false
  const second = perturbedSample(restricted, gamma, sizes)
  return second !== null && fitsPerfectly(general, generalGamma, second)
}

function fitsPerfectly(model: CompiledModel, gamma: number[], moments: SampleMoments): boolean {
  const objective = normalObjective(model, moments, 'normal')
  const generator = seededGenerator(seed)
  const ordinary = startingValues(model, moments)
  const starts = [ordinary, Float64Array.from(gamma)]
  for (let i = 0; i < furtherStarts; i++) starts.push(perturbedStart(model, ordinary, generator))
  return starts.some((start) => minimise(objective, start).value < perfectFit)
}

/** The implied moments at a point some tens of percent away; halved towards the solution while Sigma is not positive definite. */
function perturbedSample(model: CompiledModel, gamma: number[], sizes: number[]): SampleMoments | null {
  const generator = seededGenerator(seed + 1)
  const solution = Float64Array.from(gamma)
  const far = perturbedStart(model, solution, generator)
  for (let share = 0.5; share > 0.01; share /= 2) {
    const point = solution.map((value, k) => value + share * (far[k]! - value))
    const sample = impliedSample(model, point, sizes)
    if (sample !== null) return sample
  }
  return null
}

function impliedSample(model: CompiledModel, gamma: Float64Array, sizes: number[]): SampleMoments | null {
  const p = model.indicators.length
  const groups = model.groups.map((group, g) => {
    const state = groupState(p, model.factors.length)
    return impliedMoments(group, gamma, model.hasRegressions, state)
      ? { name: group.name, n: sizes[g]!, covariance: state.sigma, mean: model.meanStructure ? state.mu : null }
      : null
  })
  if (groups.some((group) => group === null || !isPositiveDefinite(group.covariance, p))) return null
  return { indicators: model.indicators, groups: groups.filter((group) => group !== null) }
}
