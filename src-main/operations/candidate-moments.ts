/**
 * The sample moments a candidate is fitted to: the cases complete on every indicator of the study (so that all candidates
 * see the same cases), by group or pooled, reduced to the indicators it uses.
 */
import { completeCaseMoments, type GroupMoments, type SampleMoments } from '../statistics/moments/sample-moments.ts'
import { InputError } from '../study/input-error.ts'
import type { DataSet, Estimation, RowGroup, SummaryGroup } from '../study/study.ts'

type Convention = Estimation['convention']

/** Moments of one data set under one convention, made once and cut to size for each candidate. */
export function momentsSource(
  data: DataSet,
  convention: Convention
): (byGroup: boolean, indicators: readonly string[]) => SampleMoments {
  const made = new Map<boolean, GroupMoments[]>()
  return (byGroup, indicators) => {
    const whole = made.get(byGroup) ?? wholeMoments(data, convention, byGroup)
    made.set(byGroup, whole)
    const at = indicators.map((name) => data.indicators.indexOf(name))
    return { indicators: [...indicators], groups: whole.map((group) => reduced(group, at, data.indicators.length)) }
  }
}

function wholeMoments(data: DataSet, convention: Convention, byGroup: boolean): GroupMoments[] {
  if (data.kind === 'rows')
    return byGroup
      ? data.groups.map((g) => rowMoments(g, data.indicators.length))
      : [pooledRows(data.groups, data.indicators.length)]
  const groups = data.groups.map((g) => summaryMoments(g, data.divisor, convention))
  if (byGroup || groups.length === 1) return groups.map((g) => ({ ...g, name: byGroup ? g.name : null }))
  return [pooledSummaries(groups, data)]
}

function rowMoments(group: RowGroup, p: number): GroupMoments {
  return { name: group.name, ...completeCaseMoments(group.values, p) }
}

function pooledRows(groups: readonly RowGroup[], p: number): GroupMoments {
  const all = new Float64Array(groups.reduce((sum, g) => sum + g.values.length, 0))
  let at = 0
  for (const group of groups) {
    all.set(group.values, at)
    at += group.values.length
  }
  return { name: null, ...completeCaseMoments(all, p) }
}

/** Brings published covariances to the divisor of the convention: n for normal, n - 1 for Wishart. */
function summaryMoments(group: SummaryGroup, divisor: 'n' | 'n-1', convention: Convention): GroupMoments {
  const { n } = group
  const given = divisor === 'n' ? n : n - 1
  const wanted = convention === 'normal' ? n : n - 1
  const mean = convention === 'normal' ? group.mean : null
  return { name: group.name, n, covariance: group.covariance.map((value) => (value * given) / wanted), mean }
}

/** Total covariance = within + between, which needs the means. */
function pooledSummaries(groups: readonly GroupMoments[], data: DataSet): GroupMoments {
  const p = data.indicators.length
  const n = groups.reduce((sum, g) => sum + g.n, 0)
  const mean = new Float64Array(p)
  const covariance = new Float64Array(p * p)
  for (const group of groups) {
    if (group.mean === null) {
      throw new InputError('groups of published covariances without means cannot be pooled', {
        where: data.source,
        remedy: `Model every candidate across "${data.grouping}", or give the means.`
      })
    }
    for (let i = 0; i < p; i++) mean[i]! += (group.n / n) * group.mean[i]!
  }
  for (const { n: size, covariance: within, mean: own } of groups) {
    for (let i = 0; i < p; i++) {
      for (let j = 0; j < p; j++) {
        covariance[i * p + j]! += (size / n) * (within[i * p + j]! + (own![i]! - mean[i]!) * (own![j]! - mean[j]!))
      }
    }
  }
  return { name: null, n, covariance, mean }
}

function reduced(group: GroupMoments, at: readonly number[], p: number): GroupMoments {
  const k = at.length
  const covariance = new Float64Array(k * k)
  at.forEach((i, a) => {
    at.forEach((j, b) => {
      covariance[a * k + b] = group.covariance[i * p + j]!
    })
  })
  return { ...group, covariance, mean: group.mean === null ? null : Float64Array.from(at, (i) => group.mean![i]!) }
}
