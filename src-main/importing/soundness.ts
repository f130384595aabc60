/**
 * Can models be fitted to these data at all? Sizes, constants and singular covariances, and what the user should know.
 */
import { EigenvalueDecomposition, Matrix } from 'ml-matrix'
import { splitByPattern, unseenPair } from '../statistics/moments/missing-patterns.ts'
import { completeCaseMoments } from '../statistics/moments/sample-moments.ts'
import { saturatedMoments } from '../statistics/moments/saturated-em.ts'
import { InputError } from '../study/input-error.ts'
import { listed } from '../study/nearest.ts'
import type { Caution, Estimation, RowGroup } from '../study/study.ts'

/** Smallest eigenvalue of a correlation matrix that still counts as positive: far above rounding, far below any real data. */
export const SINGULAR = 1e-10
/** Below about this many cases the size of the exact-fit test is off (common practice). */
const FEW_CASES = 100

/**
 * What estimation will use of each group: its complete cases, or with full information every answer.
 *
 * @throws InputError naming the indicator and group for too few cases, a constant, or an exact linear dependence
 */
export function checkRows(
  indicators: readonly string[],
  groups: readonly RowGroup[],
  fileName: string,
  missing: Estimation['missing'] = 'complete cases'
): Caution[] {
  const p = indicators.length
  indicators.forEach((name, j) => {
    const answers = groups.flatMap((group) => answersOf(group, p, j))
    const where = `${fileName}, column "${name}"`
    if (answers.length === 0)
      throw new InputError(`"${name}" has no answers at all.`, { where, remedy: 'Leave it out of the indicators.' })
    if (answers.every((value) => value === answers[0])) {
      throw new InputError(`"${name}" is constant: every answer is ${answers[0]}.`, {
        where,
        remedy: 'Leave it out of the indicators.'
      })
    }
  })
  const check = missing === 'complete cases' ? checkGroup : checkAnswers
  return groups.flatMap((group) => check(indicators, group, fileName))
}

function checkGroup(indicators: readonly string[], group: RowGroup, fileName: string): Caution[] {
  const p = indicators.length
  const { n, covariance } = completeCaseMoments(group.values, p)
  checkSize(n, p, group.name, fileName)
  const constant = indicators.findIndex((_, j) => isConstant(group, p, j))
  if (constant >= 0) {
    throw constantIn(indicators[constant]!, 'complete cases', group.name, fileName)
  }
  checkRank(indicators, covariance, group.name, fileName)
  return smallSample(n, group.name)
}

/** Every answer of a group counts: enough cases, none constant, every pair answered together, unrestricted moments sound. */
function checkAnswers(indicators: readonly string[], group: RowGroup, fileName: string): Caution[] {
  const p = indicators.length
  checkSize(group.n, p, group.name, fileName)
  const { patterns } = splitByPattern(group.values, p)
  const pair = unseenPair(patterns, p)
  if (pair !== null) {
    const names = [...new Set(pair.map((i) => indicators[i]!))]
    throw new InputError(
      `${listed(names)} ${names.length === 1 ? 'has' : 'are answered together by'} fewer than two cases${inGroup(group.name)}.`,
      {
        where: `${fileName}, column "${names[0]}"`,
        remedy: 'No covariance can be estimated from that: leave one of them out of the indicators.'
      }
    )
  }
  const constant = indicators.findIndex((_, j) => new Set(answersOf(group, p, j)).size < 2)
  if (constant >= 0) throw constantIn(indicators[constant]!, 'answers', group.name, fileName)
  checkRank(indicators, saturatedMoments(patterns, p).covariance, group.name, fileName)
  return smallSample(group.n, group.name)
}

function constantIn(indicator: string, among: string, group: string | null, fileName: string): InputError {
  return new InputError(`"${indicator}" is constant among the ${among}${inGroup(group)}.`, {
    where: `${fileName}, column "${indicator}"`,
    remedy: 'Its covariances are zero there, so no model can be fitted: leave out the indicator or the group.'
  })
}

/** @throws InputError naming the indicators that determine each other exactly */
function checkRank(indicators: readonly string[], covariance: Float64Array, group: string | null, fileName: string): void {
  const { smallest, vector } = smallestEigenvalue(covariance, indicators.length)
  if (smallest <= SINGULAR) {
    const most = Math.max(...vector.map(Math.abs))
    const involved = indicators.filter((_, j) => Math.abs(vector[j]!) > 1e-6 * most)
    throw new InputError(
      `${listed(involved)} determine each other exactly${inGroup(group)}: one is a linear combination of the rest.`,
      {
        where: `${fileName}, column "${involved.at(-1)}"`,
        remedy: 'Leave one of them out of the indicators.'
      }
    )
  }
}

/** @throws InputError unless there are more cases than indicators */
export function checkSize(n: number, p: number, group: string | null, where: string): void {
  if (n > p) return
  throw new InputError(`Too few cases${inGroup(group)}: ${n} for ${p} indicators.`, {
    where,
    remedy: 'More complete cases than indicators are needed in every group.'
  })
}

export function smallSample(n: number, group: string | null): Caution[] {
  if (n >= FEW_CASES) return []
  const message = `Only ${n} cases${inGroup(group)}: tests and standard errors lean on theory for large samples, so read them with care below about ${FEW_CASES}.`
  return [{ code: 'small-sample', message, cell: null }]
}

/**
 * Smallest eigenvalue, with its vector, of a covariance matrix scaled to correlations (so that units do not matter).
 *
 * @param covariance p x p row-major with positive diagonal
 */
export function smallestEigenvalue(covariance: Float64Array, p: number): { smallest: number; vector: number[] } {
  const correlation = new Matrix(p, p)
  for (let i = 0; i < p; i++) {
    for (let j = 0; j < p; j++) {
      correlation.set(i, j, covariance[i * p + j]! / Math.sqrt(covariance[i * p + i]! * covariance[j * p + j]!))
    }
  }
  const { realEigenvalues, eigenvectorMatrix } = new EigenvalueDecomposition(correlation, { assumeSymmetric: true })
  const at = realEigenvalues.indexOf(Math.min(...realEigenvalues))
  return { smallest: realEigenvalues[at]!, vector: eigenvectorMatrix.getColumn(at) }
}

export function inGroup(group: string | null): string {
  return group === null ? '' : ` in group "${group}"`
}

function answersOf({ values, n }: RowGroup, p: number, j: number): number[] {
  return Array.from({ length: n }, (_, row) => values[row * p + j]!).filter((value) => !Number.isNaN(value))
}

/** Whether indicator j takes one value over all complete cases. */
function isConstant({ values, n }: RowGroup, p: number, j: number): boolean {
  const seen = new Set<number>()
  for (let row = 0; row < n && seen.size < 2; row++) {
    const answers = values.subarray(row * p, (row + 1) * p)
    if (!answers.some(Number.isNaN)) seen.add(answers[j]!)
  }
  return seen.size < 2
}
