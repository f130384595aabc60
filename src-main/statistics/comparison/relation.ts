/**
 * How two models stand to each other, by computation and not by anyone's word (methods: section 6).
 *
 * First the syntactic proof: every cell of the restricted model is what the general model would make of it. Else by
 * refitting (Bentler & Satorra 2010): the general model must reproduce the restricted model's implied moments perfectly,
 * at its solution and at a second, perturbed parameter point, so that a chance fit cannot pass.
 */
import { seededGenerator } from '../distributions/generator.ts'
import { normalObjective, type Objective } from '../estimation/normal-likelihood.ts'
import { type Minimum, minimise, ordinaryScoring } from '../estimation/scoring.ts'
import { perturbedStart, startingValues } from '../estimation/starts.ts'
import { isPositiveDefinite } from '../matrix/symmetric.ts'
import type { ModelCells } from '../model/cells.ts'
import { type CompiledGroup, type CompiledModel, compileModel, type GammaBounds, type MatrixName } from '../model/compile.ts'
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
  /** "nested" with equal df: only bounds differ. "reversed": the model given as general is the one that is nested in the other. */
  relation: 'nested' | 'equivalent' | 'not nested' | 'reversed'
  proof: 'constraints' | 'refit'
}

/** A discrepancy below this is a perfect fit; a singular but perfect solution is approached slowly, hence not smaller. */
const perfectFit = 1e-8
/** A minimum above this is no perfect fit that was merely not finished. */
const clearlyFar = 1e-4
const seed = 20_260_102
/** Perturbed starts before "does not fit" is believed where the first two starts do not agree on it. */
const furtherStarts = 4

export function relationOf(input: RelationInput): RelationOutcome {
  const general = prepareModel(input.general, input.generalGamma, input.sizes)
  const restricted = prepareModel(input.restricted, input.restrictedGamma, input.sizes)
  return general.model.df > restricted.model.df ? reversed(relate(restricted, general)) : relate(general, restricted)
}

function reversed(outcome: RelationOutcome): RelationOutcome {
  return outcome.relation === 'nested' ? { ...outcome, relation: 'reversed' } : outcome
}

function relate(general: PreparedModel, restricted: PreparedModel): RelationOutcome {
  if (general.frame !== restricted.frame) return { relation: 'not nested', proof: 'constraints' }
  const proved = relationByConstraints(general, restricted)
  if (proved !== null) return { relation: proved, proof: 'constraints' }
  if (!withinByRefit(general, restricted)) return { relation: 'not nested', proof: 'refit' }
  return { relation: general.model.df === restricted.model.df ? 'equivalent' : 'nested', proof: 'refit' }
}

/**
 * What constraints prove of two models of which `general` has no more degrees of freedom; null when nothing. A set within
 * another of the same dimension is that other, but for bounds: with equal df "nested" says that only bounds differ.
 */
export function relationByConstraints(
  general: PreparedModel,
  restricted: PreparedModel
): 'nested' | 'equivalent' | 'reversed' | null {
  const within = contains(general, restricted)
  if (general.model.df < restricted.model.df) return within ? 'nested' : null
  if (general.model.bounds === null && restricted.model.bounds === null) return within ? 'equivalent' : null
  const holds = contains(restricted, general)
  if (within && holds) return 'equivalent'
  return within ? 'nested' : holds ? 'reversed' : null
}

/** Whether refitting proves `restricted` nested in `general`, or with equal df equivalent to it. */
export function withinByRefit(general: PreparedModel, restricted: PreparedModel): boolean {
  const sameDf = general.model.df === restricted.model.df
  return reproduces(general, restricted) && (!sameDf || reproduces(restricted, general))
}

/** A model with its solution, and what is made of them at most once however many models it is compared with. */
export interface PreparedModel {
  model: CompiledModel
  gamma: Float64Array
  /** The same text for models of the same indicators, groups and treatment of means. */
  frame: string
  /** Per group every cell, by place. */
  forms: CellForms[]
  /** Implied moments at the solution, and at a second point; null where Sigma is not positive definite. */
  solution: () => SampleMoments | null
  second: () => SampleMoments | null
}

/** @param sizes cases per group */
export function prepareModel(cells: ModelCells, gamma: readonly number[], sizes: readonly number[]): PreparedModel {
  const model = compileModel(cells)
  const solution = Float64Array.from(gamma)
  return {
    model,
    gamma: solution,
    frame: JSON.stringify([model.indicators, model.groups.map((g) => g.name), model.meanStructure]),
    forms: model.groups.map(cellForms),
    solution: once(() => impliedSample(model, solution, sizes)),
    second: once(() => perturbedSample(model, solution, sizes))
  }
}

function once<T>(make: () => T): () => T {
  let made: { value: T } | null = null
  return () => {
    made ??= { value: make() }
    return made.value
  }
}

/** Affine form of a cell in the gammas: constant + sum of weights. */
interface Form {
  constant: number
  gammas: ArrayLike<number>
  weights: ArrayLike<number>
}

/** A number where the cell is fixed. Places in the order lambda, beta, lower psi, lower theta, nu, alpha. */
type CellForms = (number | Form)[]

const matrices: readonly MatrixName[] = ['lambda', 'beta', 'psi', 'theta', 'nu', 'alpha']

function cellForms(group: CompiledGroup): CellForms {
  const free = new Map(group.free.map((cell) => [`${cell.matrix} ${cell.row} ${cell.column}`, cell]))
  const forms: CellForms = []
  for (const matrix of matrices) {
    const columns = columnsOf[matrix](group)
    const symmetric = matrix === 'psi' || matrix === 'theta'
    group[matrix].forEach((value, at) => {
      const row = Math.floor(at / columns)
      const column = at % columns
      if (!symmetric || column <= row) forms.push(free.get(`${matrix} ${row} ${column}`) ?? value)
    })
  }
  return forms
}

const columnsOf: Record<MatrixName, (group: CompiledGroup) => number> = {
  lambda: (g) => g.alpha.length,
  beta: (g) => g.alpha.length,
  psi: (g) => g.alpha.length,
  theta: (g) => g.nu.length,
  nu: () => 1,
  alpha: () => 1
}

/**
 * The syntactic proof: whether every parameter value of `restricted` is one of `general`, cell by cell. General's gammas are
 * read off the cells they are named after, and then every cell of general must come out as restricted has it.
 */
function contains(general: PreparedModel, restricted: PreparedModel): boolean {
  const { factors } = general.model
  if (factors.length !== restricted.model.factors.length) return false
  if (factors.some((name, k) => name !== restricted.model.factors[k])) return false
  const gamma: (number | Form | undefined)[] = []
  general.forms.forEach((forms, g) => {
    forms.forEach((form, at) => {
      if (typeof form === 'number' || !isPlain(form)) return
      gamma[form.gammas[0]!] ??= restricted.forms[g]![at]!
    })
  })
  return (
    withinBounds(general.model.bounds, gamma, restricted.model.bounds) &&
    general.forms.every((forms, g) => forms.every((form, at) => sameWhenRead(form, restricted.forms[g]![at]!, gamma)))
  )
}

/** Whether what general's gammas are in the restricted model keeps to general's bounds. */
function withinBounds(bounds: GammaBounds | null, gamma: readonly (number | Form | undefined)[], own: GammaBounds | null): boolean {
  if (bounds === null) return true
  return gamma.every((form, k) => {
    const [least, most] = [bounds.least[k]!, bounds.most[k]!]
    if (least === Number.NEGATIVE_INFINITY && most === Number.POSITIVE_INFINITY) return true
    if (typeof form === 'number') return form >= least && form <= most
    if (form === undefined || own === null || !isPlain(form)) return false
    const at = form.gammas[0]!
    return own.least[at]! >= least && own.most[at]! <= most
  })
}

function isPlain({ constant, gammas, weights }: Form): boolean {
  return gammas.length === 1 && constant === 0 && weights[0] === 1
}

/** Whether a cell of the general model is that of the restricted one once general's gammas are read as `gamma` says. */
function sameWhenRead(form: number | Form, wanted: number | Form, gamma: readonly (number | Form | undefined)[]): boolean {
  if (typeof form === 'number') return typeof wanted === 'number' && Math.abs(form - wanted) <= formTolerance
  if (isPlain(form) && gamma[form.gammas[0]!] === wanted) return true
  const constant = { value: form.constant - (typeof wanted === 'number' ? wanted : wanted.constant) }
  const weights = new Map<number, number>()
  const add = (part: number | Form, share: number) => {
    if (typeof part === 'number') {
      constant.value += share * part
      return
    }
    constant.value += share * part.constant
    for (let i = 0; i < part.gammas.length; i++) {
      weights.set(part.gammas[i]!, (weights.get(part.gammas[i]!) ?? 0) + share * part.weights[i]!)
    }
  }
  for (let i = 0; i < form.gammas.length; i++) {
    const inner = gamma[form.gammas[i]!]
    if (inner === undefined) return false
    add(inner, form.weights[i]!)
  }
  if (typeof wanted !== 'number') add({ ...wanted, constant: 0 }, -1)
  return Math.abs(constant.value) <= formTolerance && [...weights.values()].every((weight) => Math.abs(weight) < formTolerance)
}

const formTolerance = 1e-10

/** The proof by refitting: whether `general` fits the implied moments of `restricted` perfectly, at its solution and at a perturbed point. */
function reproduces(general: PreparedModel, restricted: PreparedModel): boolean {
  return [restricted.solution, restricted.second].every((point) => {
    const moments = point()
    return moments !== null && fitsPerfectly(general, moments)
  })
}

/**
 * Two starts that end in the same minimum, far from zero, settle that it does not fit; where they disagree or end close,
 * more starts are tried. A perfect fit beyond the model's bounds is none, and a model that can only approach the moments,
 * its parameters growing without end, does not reproduce them: hence few iterations a start, and few starts without end.
 */
function fitsPerfectly({ model, gamma }: PreparedModel, moments: SampleMoments): boolean {
  const objective = normalObjective(model, moments, 'normal')
  const generator = seededGenerator(seed)
  const ordinary = startingValues(model, moments)
  const ends: number[] = []
  let unfinished = 0
  for (let start = 0; start < 2 + furtherStarts; start++) {
    const from = start === 0 ? gamma : start === 1 ? ordinary : perturbedStart(model, ordinary, generator)
    const end = closestFit(objective, from)
    if (end.value < perfectFit && keepsTo(model.bounds, end.gamma)) return true
    ends.push(end.stop === 'converged' && end.value > clearlyFar ? end.value : Number.NaN)
    if (ends.length === 2 && Math.abs(ends[0]! - ends[1]!) < 1e-2 * ends[0]!) return false
    if (end.stop === 'iteration limit' && ++unfinished === mostUnfinished) return false
  }
  return false
}

const iterationsPerStart = 150
const mostUnfinished = 3

/** The minimum from one start: exactly where it comes near zero, roughly where it is far from it. */
function closestFit(objective: Objective, start: Float64Array): Minimum {
  const rough = minimise(objective, start, { tolerance: 1e-4, iterations: iterationsPerStart, enough: perfectFit })
  if (!(rough.value < 10 * clearlyFar) || rough.value < perfectFit) return rough
  return minimise(objective, rough.gamma, { ...ordinaryScoring, iterations: iterationsPerStart, enough: perfectFit })
}

function keepsTo(bounds: GammaBounds | null, gamma: Float64Array): boolean {
  if (bounds === null) return true
  return gamma.every((value, k) => value >= bounds.least[k]! - boundTolerance && value <= bounds.most[k]! + boundTolerance)
}

const boundTolerance = 1e-6

/** The implied moments at a point some tens of percent away; halved towards the solution while Sigma is not positive definite. */
function perturbedSample(model: CompiledModel, solution: Float64Array, sizes: readonly number[]): SampleMoments | null {
  const generator = seededGenerator(seed + 1)
  const far = perturbedStart(model, solution, generator)
  for (let share = 0.5; share > 0.01; share /= 2) {
    const point = solution.map((value, k) => value + share * (far[k]! - value))
    const sample = impliedSample(model, point, sizes)
    if (sample !== null) return sample
  }
  return null
}

function impliedSample(model: CompiledModel, gamma: Float64Array, sizes: readonly number[]): SampleMoments | null {
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
