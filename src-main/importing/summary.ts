/**
 * Published figures as a data set: covariances, or correlations with standard deviations, of one or more groups.
 */
import { InputError } from '../study/input-error.ts'
import type { Caution, DataPlan, DataSet, SummaryGroup } from '../study/study.ts'
import { digestOf } from './digest.ts'
import { checkSize, inGroup, SINGULAR, smallestEigenvalue, smallSample } from './soundness.ts'

type SummaryPlan = Extract<DataPlan, { kind: 'summary' }>

/**
 * @param where what messages call the place of the figures
 * @throws InputError for a matrix of the wrong size, one that is not positive definite, or too few cases
 */
export function summaryDataSet(plan: SummaryPlan, where = 'published summary'): DataSet {
  const p = plan.indicators.length
  const cautions: Caution[] = []
  const groups = plan.groups.map((group): SummaryGroup => {
    checkShape(group, plan.indicators, where)
    checkSize(group.n, p, group.name, where)
    const covariance = fullCovariance(group.lower, group.sd)
    checkPositiveDefinite(covariance, p, group.name, where)
    cautions.push(...unitVariances(covariance, p, group.name), ...smallSample(group.n, group.name))
    return { name: group.name, n: group.n, covariance, mean: group.mean === null ? null : Float64Array.from(group.mean) }
  })
  const grouping = groups.length > 1 ? plan.group : null
  const content = { kind: 'summary' as const, divisor: plan.divisor, indicators: [...plan.indicators], grouping, groups }
  return { ...content, digest: digestOf(content), source: 'published summary', cautions }
}

/** A plan need not come from a file, where each of these has a line of its own. */
function checkShape(group: SummaryPlan['groups'][number], indicators: readonly string[], where: string): void {
  const p = indicators.length
  const rightRows = group.lower.length === p && group.lower.every((row, i) => row.length === i + 1)
  if (!rightRows) throw new InputError(`The matrix${inGroup(group.name)} is not a lower triangle for ${p} indicators.`, { where })
  for (const [what, row] of [
    ['standard deviations', group.sd],
    ['means', group.mean]
  ] as const) {
    if (row !== null && row.length !== p) {
      throw new InputError(`There are ${row.length} ${what}${inGroup(group.name)}, but ${p} indicators.`, { where })
    }
  }
  indicators.forEach((name, i) => {
    if (!(group.lower[i]![i]! > 0))
      throw new InputError(`The variance of "${name}"${inGroup(group.name)} is not positive.`, { where })
  })
}

/** p x p row-major from the lower triangle; s_ij = r_ij sd_i sd_j where standard deviations are given. */
function fullCovariance(lower: readonly (readonly number[])[], sd: readonly number[] | null): Float64Array {
  const p = lower.length
  const covariance = new Float64Array(p * p)
  lower.forEach((row, i) => {
    row.forEach((value, j) => {
      const scaled = sd === null ? value : value * sd[i]! * sd[j]!
      covariance[i * p + j] = scaled
      covariance[j * p + i] = scaled
    })
  })
  return covariance
}

function checkPositiveDefinite(covariance: Float64Array, p: number, group: string | null, where: string): void {
  const { smallest } = smallestEigenvalue(covariance, p)
  if (smallest > SINGULAR) return
  const shown = Math.abs(smallest) < SINGULAR ? '0' : Number(smallest.toPrecision(3)).toString()
  throw new InputError(
    `The matrix${inGroup(group)} is not positive definite: the smallest eigenvalue of its correlations is ${shown}.`,
    {
      where,
      remedy: 'Look for a misprint, or for an indicator that is a combination of others.'
    }
  )
}

function unitVariances(covariance: Float64Array, p: number, group: string | null): Caution[] {
  for (let i = 0; i < p; i++) if (covariance[i * p + i] !== 1) return []
  const message =
    `Every variance${inGroup(group)} is 1, so this looks like a correlation matrix analysed as covariances: ` +
    'standard errors and tests then rest on the assumption that the indicators were not standardised.'
  return [{ code: 'unit-variances', message, cell: null }]
}
