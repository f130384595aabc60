/**
 * Two models that are not nested, compared case by case (Vuong 1989; Merkle, You & Preacher 2016; methods: section 6).
 *
 * With l_i and m_i the log-likelihoods of case i under the first model and the second, d_i = l_i - m_i:
 *
 *     LR = sum d_i      omega^2 = 1/n sum (d_i - LR/n)^2      z = LR / sqrt(n omega^2)
 *
 * First whether the two can be told apart at all, omega^2 > 0: under H0 n omega^2 is a weighted sum of chi-squares on one
 * df each, the weights the squared eigenvalues of
 *
 *     [ -B_f A_f^-1    -B_fg A_g^-1 ]
 *     [  B_gf A_f^-1    B_g  A_g^-1 ]
 *
 * A the mean second derivatives of the log-likelihood at each solution (observed), B the mean cross-products of the
 * scores. Then z, standard normal where both fit equally well; corrected for parsimony it is LR - (q_f - q_g) in the
 * manner of AIC, LR - (q_f - q_g) ln(n) / 2 in that of BIC, over the same root.
 */
import { EigenvalueDecomposition, Matrix } from 'ml-matrix'
import { weightedChiSquareUpper } from '../distributions/mixtures.ts'
import { normalUpper } from '../distributions/normal.ts'
import { casewiseScores } from '../estimation/casewise.ts'
import { casewiseLogLikelihoods } from '../estimation/casewise-likelihood.ts'
import { normalObjective } from '../estimation/normal-likelihood.ts'
import { mirrorLower, multiply, positiveInverse } from '../matrix/symmetric.ts'
import type { ModelCells } from '../model/cells.ts'
import { type CompiledModel, compileModel } from '../model/compile.ts'
import type { GroupState } from '../model/implied-moments.ts'
import type { SampleMoments } from '../moments/sample-moments.ts'

export interface FittedModel {
  cells: ModelCells
  /** The solution, in the compiled model's order. */
  gamma: number[]
}

export interface NotNestedInput {
  first: FittedModel
  second: FittedModel
  moments: SampleMoments
  /** Per group n x p row-major, NaN where missing: the very cases of the moments. */
  rows: Float64Array[]
}

/** Signs: positive where the first model fits better. */
export interface NotNestedTests {
  /** Cases with an answer. */
  n: number
  /** LR: log-likelihood of the first model less that of the second. */
  logLikelihoodRatio: number
  /** Divisor n. */
  omega2: number
  /** n omega^2 and its p; null where the second derivatives of a model are singular at its solution. */
  distinguishable: { statistic: number; p: number } | null
  /** Null where omega^2 is zero: every case is as likely under one as under the other. */
  z: ZTest | null
  /** z corrected for the number of parameters. */
  corrected: { aic: ZTest; bic: ZTest } | null
  /** 95% interval of BIC(first) - BIC(second). */
  bicInterval: { lower: number; upper: number }
}

export interface ZTest {
  z: number
  /** Two-sided. */
  p: number
  /** One-sided, of the alternatives that the first fits better, and that the second does. */
  firstBetter: number
  secondBetter: number
}

/** Returns null where means are not modelled: a case then has no likelihood of its own. */
export function notNestedTests({ first, second, moments, rows }: NotNestedInput): NotNestedTests | null {
  const sides = [first, second].map((side) => solved(side, moments))
  const [f, g] = [sides[0]!, sides[1]!]
  if (!f.model.meanStructure || !g.model.meanStructure) return null
  const answered = answeredRows(rows, f.model.indicators.length)
  const differences = caseDifferences(f, g, rows, answered)
  const n = differences.length
  const ratio = differences.reduce((sum, d) => sum + d, 0)
  const omega2 = differences.reduce((sum, d) => sum + (d - ratio / n) ** 2, 0) / n
  const spread = Math.sqrt(n * omega2)
  const extra = f.model.parameters - g.model.parameters
  const test = (value: number) => zTest(value / spread)
  const alike = omega2 <= negligible * (1 + (ratio / n) ** 2)
  const bicHalf = (extra / 2) * Math.log(n)
  return {
    n,
    logLikelihoodRatio: ratio,
    omega2,
    distinguishable: alike ? { statistic: n * omega2, p: 1 } : distinguishability(f, g, rows, answered, n * omega2),
    z: alike ? null : test(ratio),
    corrected: alike ? null : { aic: test(ratio - extra), bic: test(ratio - bicHalf) },
    bicInterval: { lower: -2 * (ratio - bicHalf) - 2 * normal975 * spread, upper: -2 * (ratio - bicHalf) + 2 * normal975 * spread }
  }
}

/** Casewise differences below this (squared) are rounding. */
const negligible = 1e-14
const normal975 = 1.959963984540054

interface Solved {
  model: CompiledModel
  states: readonly GroupState[]
  /** -A^-1, q x q: inverse of the mean observed information; null where that is singular. */
  inverse: Float64Array | null
}

function solved({ cells, gamma }: FittedModel, moments: SampleMoments): Solved {
  const model = compileModel(cells)
  const q = model.parameters
  const objective = normalObjective(model, moments, 'normal')
  objective.evaluate(Float64Array.from(gamma))
  const curvature = new Float64Array(q * q)
  objective.derive(new Float64Array(q), curvature, 'observed')
  // The mean log-likelihood falls by half of F.
  const inverse = positiveInverse(
    curvature.map((value) => value / 2),
    q
  )
  return { model, states: objective.states, inverse }
}

/** Place of every row among the answered ones of all groups, -1 for one without any answer. */
function answeredRows(rows: readonly Float64Array[], p: number): Int32Array[] {
  let at = 0
  return rows.map((values) =>
    Int32Array.from({ length: values.length / p }, (_, row) =>
      values.subarray(row * p, (row + 1) * p).some((value) => !Number.isNaN(value)) ? at++ : -1
    )
  )
}

function caseDifferences(f: Solved, g: Solved, rows: Float64Array[], answered: Int32Array[]): number[] {
  const mine = casewiseLogLikelihoods(f.states, rows)
  const others = casewiseLogLikelihoods(g.states, rows)
  return answered.flatMap((places, group) =>
    [...places].flatMap((place, row) => (place < 0 ? [] : [mine[group]![row]! - others[group]![row]!]))
  )
}

function zTest(z: number): ZTest {
  return { z, p: 2 * normalUpper(Math.abs(z)), firstBetter: normalUpper(z), secondBetter: normalUpper(-z) }
}

/** Weights below this share of the largest move no digit of p. */
const smallestWeight = 1e-11

function distinguishability(
  f: Solved,
  g: Solved,
  rows: Float64Array[],
  answered: Int32Array[],
  statistic: number
): NotNestedTests['distinguishable'] {
  if (f.inverse === null || g.inverse === null) return null
  const weights = distinguishabilityWeights([f, g], rows, answered)
  const largest = Math.max(...weights)
  const terms = weights.filter((weight) => weight > smallestWeight * largest).map((weight) => ({ weight, df: 1 }))
  return { statistic, p: weightedChiSquareUpper(statistic, terms) }
}

/**
 * The squared eigenvalues, from a symmetric matrix with the same ones: with B = R R', those of R' diag(-A_f^-1, A_g^-1) R.
 * B is singular where there are fewer cases than parameters, hence its root by eigenvalues.
 */
function distinguishabilityWeights(sides: readonly Solved[], rows: Float64Array[], answered: Int32Array[]): number[] {
  const [qf, qg] = sides.map((side) => side.model.parameters) as [number, number]
  const q = qf + qg
  const cross = stackedCrossProducts(sides, rows, answered)
  const { realEigenvalues, eigenvectorMatrix } = new EigenvalueDecomposition(squareMatrix(cross, q), { assumeSymmetric: true })
  const root = new Float64Array(q * q)
  for (let i = 0; i < q; i++) {
    for (let k = 0; k < q; k++) root[i * q + k] = eigenvectorMatrix.get(i, k) * Math.sqrt(Math.max(realEigenvalues[k]!, 0))
  }
  const middle = new Float64Array(q * q)
  sides.forEach(({ inverse }, side) => {
    const [size, from, sign] = side === 0 ? [qf, 0, 1] : [qg, qf, -1]
    for (let i = 0; i < size; i++) {
      for (let j = 0; j < size; j++) middle[(from + i) * q + from + j] = sign * inverse![i * size + j]!
    }
  })
  const product = new Float64Array(q * q)
  multiply(middle, root, q, q, q, product)
  const form = new Float64Array(q * q)
  multiply(transposed(root, q), product, q, q, q, form)
  for (let i = 0; i < q; i++) for (let j = 0; j < i; j++) form[i * q + j] = (form[i * q + j]! + form[j * q + i]!) / 2
  mirrorLower(form, q)
  const values = new EigenvalueDecomposition(squareMatrix(form, q), { assumeSymmetric: true }).realEigenvalues
  return values.map((value) => value * value)
}

/** Mean cross-products of the scores of both models, side by side: (q_f + q_g) square, whole. */
function stackedCrossProducts(sides: readonly Solved[], rows: Float64Array[], answered: Int32Array[]): Float64Array {
  const q = sides.reduce((sum, side) => sum + side.model.parameters, 0)
  const n = answered.reduce((sum, places) => sum + places.filter((place) => place >= 0).length, 0)
  const scores = new Float64Array(n * q)
  let column = 0
  for (const { model, states } of sides) {
    const from = column
    casewiseScores(model, states, rows, (score, group, row) => {
      const place = answered[group]![row]!
      if (place >= 0) scores.set(score, place * q + from)
    })
    column += model.parameters
  }
  const cross = new Float64Array(q * q)
  for (let row = 0; row < n; row++) {
    for (let i = 0; i < q; i++) {
      const share = scores[row * q + i]! / n
      if (share === 0) continue
      for (let j = 0; j <= i; j++) cross[i * q + j]! += share * scores[row * q + j]!
    }
  }
  mirrorLower(cross, q)
  return cross
}

function squareMatrix(values: Float64Array, q: number): Matrix {
  return Matrix.from1DArray(q, q, [...values])
}

function transposed(values: Float64Array, q: number): Float64Array {
  return values.map((_, at) => values[(at % q) * q + Math.floor(at / q)]!)
}
