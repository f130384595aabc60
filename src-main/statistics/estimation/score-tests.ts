/**
 * Score tests (Lagrange multipliers) of every restriction of a fitted model, with the expected change of what it holds
 * (methods: section 7; Sörbom 1989; Saris, Satorra & Sörbom 1987):
 *
 *     LM_j = s_j^2 / (I_jj - I_jg I_gg^-1 I_gj)      expected change = s_j / (same denominator)
 *
 * with s_j = -(N/2) dF/d delta_j and I = (N/2) E d2F. LM_j approximates the drop in T when restriction j alone is let go.
 * One looks at thousands of such tests after the fact, so every one of them is exploratory and says so.
 */
import { chiSquareUpper } from '../distributions/chi-square.ts'
import type { CellPart, ModelCells } from '../model/cells.ts'
import { type CompiledModel, compileModel } from '../model/compile.ts'
import { holdAtBounds } from '../model/hold.ts'
import type { GroupState } from '../model/implied-moments.ts'
import { standardisation } from '../model/standardisation.ts'
import type { SampleMoments } from '../moments/sample-moments.ts'
import { type Convention, normalObjective } from './normal-likelihood.ts'
import { isDetermined, jointReleaseScore, type MakeObjective, type ReleaseScore, releaseScores } from './score-tests-information.ts'
import { placeKey, possibleReleases, type Release } from './score-tests-releases.ts'

/**
 * How readily a restriction can be doubted on grounds of substance; the order of the list.
 *
 * - stated: one that somebody chose. Equalities and equations, cells fixed at a number other than 0, and whatever is
 *   fixed of factors' variances, covariances and means, of residual variances and of intercepts.
 * - near: what is often overlooked. An indicator's loading on a second measured factor, a residual covariance of two
 *   indicators of one factor (shared wording), a regression or disturbance covariance of factors that others explain.
 * - far: the rest (residual covariances across factors, loadings on a factor without indicators), and near ones whose
 *   expected value could not be: a standardised loading or residual correlation of 1 or more in absolute value.
 */
export type Plausibility = 'stated' | 'near' | 'far'

export interface ScoreTest {
  kind: Release['kind']
  part: CellPart
  /** Names as in the estimates: [indicator, factor], [outcome, predictor], a pair, or one name. */
  of: string[]
  group: string | null
  /** The shared label of an equality, the equation of a constraint, null for a fixed cell. */
  label: string | null
  statistic: number
  df: 1
  p: number
  /**
   * Expected change: of a fixed cell, from its fixed value; of a cell let go from an equality, the distance from the value
   * that the others then have in common; of a constraint, that of its left side from its right.
   */
  change: number
  /** What the estimate of the cell is expected to be once free; null for a constraint. */
  expectedValue: number | null
  /** `change` times the multiplier of the completely standardised solution; null for a constraint or where that is not defined. */
  standardizedChange: number | null
  /** Of a residual covariance: `change` over the root of both residual variances; else, or where one is not positive, null. */
  residualCorrelationChange: number | null
  plausibility: Plausibility
  /** Never a planned test: chosen among many after seeing the data. */
  exploratory: true
}

/** A restriction without a test, and why. */
export interface UntestedRestriction extends Pick<ScoreTest, 'kind' | 'part' | 'of' | 'group' | 'label'> {
  reason: 'the model would not be identified without it'
}

export interface ScoreTests {
  /** Plausible ones first (see Plausibility); within a kind of plausibility the largest statistic first. */
  tests: ScoreTest[]
  untested: UntestedRestriction[]
  /** Why there are no tests at all: the information of the model's own parameters is singular. Null when there are. */
  unavailable: string | null
}

/**
 * @param cells the fitted model
 * @param gamma its solution in the compiled model's order, at which the gradient of F is zero but for those on a bound: they are taken as fixed
 * @param makeObjective F of a compiled model on the same data; left out: normal theory, complete data
 */
export function scoreTests(
  cells: ModelCells,
  moments: SampleMoments,
  convention: Convention,
  gamma: readonly number[],
  makeObjective: MakeObjective = (model) => normalObjective(model, moments, convention)
): ScoreTests {
  const held = holdAtBounds(cells, gamma)
  const model = compileModel(held.cells)
  const releases = possibleReleases(model, held.cells.constraints)
  const solution = Float64Array.from(held.gamma)
  const scores = releaseScores(model, releases, solution, makeObjective)
  if (scores === null) return { tests: [], untested: [], unavailable: 'The information is singular at the solution.' }
  const fitted = makeObjective(model)
  fitted.evaluate(solution)
  const frame = { total: fitted.total, states: fitted.states, patterns: patterns(model, fitted.states) }
  const tests: ScoreTest[] = []
  const untested: UntestedRestriction[] = []
  releases.forEach((release, j) => {
    const { kind, part, of, group, label } = release
    if (isDetermined(scores[j]!)) tests.push(scoreTest(release, scores[j]!, frame))
    else untested.push({ kind, part, of, group, label, reason: 'the model would not be identified without it' })
  })
  const rank = (test: ScoreTest) => order.indexOf(test.plausibility)
  tests.sort((a, b) => rank(a) - rank(b) || b.statistic - a.statistic)
  return { tests, untested, unavailable: null }
}

const order: readonly Plausibility[] = ['stated', 'near', 'far']

/**
 * All equalities let go at once (of one part of the model, where one is given): does the whole set of them hold?
 *
 * @returns null when there is none that could be tested
 */
export function jointEqualityTest(
  cells: ModelCells,
  moments: SampleMoments,
  convention: Convention,
  gamma: readonly number[],
  part: CellPart | null = null,
  makeObjective: MakeObjective = (model) => normalObjective(model, moments, convention)
): { statistic: number; df: number; p: number } | null {
  const held = holdAtBounds(cells, gamma)
  const model = compileModel(held.cells)
  const releases = possibleReleases(model, []).filter((r) => r.kind === 'equality' && (part === null || r.part === part))
  const joint = jointReleaseScore(model, releases, Float64Array.from(held.gamma), makeObjective)
  if (joint === null || joint.rank === 0) return null
  const statistic = (makeObjective(model).total / 2) * joint.value
  return { statistic, df: joint.rank, p: chiSquareUpper(statistic, joint.rank) }
}

/** What all tests of one fit share. */
interface Frame {
  /** N */
  total: number
  states: readonly GroupState[]
  patterns: readonly Pattern[]
}

/** What hangs together in one group. */
interface Pattern {
  /** loads[factor][indicator]: the indicator loads on the factor. */
  loads: boolean[][]
  /** explained[factor]: the factor is regressed on others. */
  explained: boolean[]
}

function scoreTest(release: Release, { score, left, drift }: ReleaseScore, { total, states, patterns }: Frame): ScoreTest {
  const { kind, part, of, group, label, place } = release
  const state = states[place.group]!
  const statistic = ((total / 2) * score * score) / left
  const change = -score / left
  const standardised = kind === 'constraint' ? null : finite(change * standardisation(place, state))
  const correlation = part === 'residual covariance' && kind !== 'constraint' ? residualCorrelation(change, place, state) : null
  const test = { kind, part, of, group, label, statistic, df: 1, p: chiSquareUpper(statistic, 1), change } as const
  return {
    ...test,
    expectedValue: kind === 'constraint' ? null : cellOf(place, state) + change * (1 + drift),
    standardizedChange: standardised,
    residualCorrelationChange: correlation,
    plausibility: plausibility(release, standardised, correlation, patterns[place.group]!),
    exploratory: true
  }
}

/** The value of a cell in the groups' matrices. */
function cellOf({ matrix, row, column }: Release['place'], state: GroupState): number {
  const columns = matrix === 'nu' || matrix === 'alpha' ? 1 : matrix === 'theta' ? state.p : state.m
  return state[matrix][row * columns + column]!
}

function residualCorrelation(change: number, { row, column }: Release['place'], { theta, p }: GroupState): number | null {
  const product = theta[row * p + row]! * theta[column * p + column]!
  return theta[row * p + row]! > 0 && product > 0 ? change / Math.sqrt(product) : null
}

function finite(value: number): number | null {
  return Number.isFinite(value) ? value : null
}

function patterns(model: CompiledModel, states: readonly GroupState[]): Pattern[] {
  const m = model.factors.length
  return states.map(({ lambda, beta }, g) => {
    const free = new Set(model.groups[g]!.free.map(placeKey))
    const loads = model.factors.map((_, k) =>
      model.indicators.map((_, i) => lambda[i * m + k] !== 0 || free.has(placeKey({ matrix: 'lambda', row: i, column: k })))
    )
    const explained = model.factors.map((_, k) =>
      model.factors.some((_, l) => beta[k * m + l] !== 0 || free.has(placeKey({ matrix: 'beta', row: k, column: l })))
    )
    return { loads, explained }
  })
}

/** See the type. */
function plausibility(
  { kind, fixedAt, place }: Release,
  standardised: number | null,
  correlation: number | null,
  { loads, explained }: Pattern
): Plausibility {
  if (kind !== 'fixed cell' || fixedAt !== 0) return 'stated'
  const { matrix, row, column } = place
  if (matrix === 'lambda') return loads[column]!.some(Boolean) && possible(standardised) ? 'near' : 'far'
  if (matrix === 'theta' && row !== column) {
    return loads.some((on) => on[row] && on[column]) && possible(correlation) ? 'near' : 'far'
  }
  if (matrix === 'psi' && row !== column && (explained[row] || explained[column])) return 'near'
  return matrix === 'beta' ? 'near' : 'stated'
}

function possible(value: number | null): boolean {
  return value !== null && Math.abs(value) < 1
}
