/**
 * The sample a candidate is fitted to. With complete cases: the moments of the cases complete on every indicator of the
 * study, so that all candidates see the same cases. With full information: every case that answered any of the candidate's
 * indicators, by missingness pattern. By group or pooled, reduced to the indicators it uses.
 */
import { splitByPattern, unseenPair } from '../statistics/moments/missing-patterns.ts'
import {
  completeCaseMoments,
  completeRowValues,
  type GroupMoments,
  type SampleMoments
} from '../statistics/moments/sample-moments.ts'
import { saturatedMoments } from '../statistics/moments/saturated-em.ts'
import { InputError } from '../study/input-error.ts'
import type { DataSet, Estimation, RowGroup, SummaryGroup } from '../study/study.ts'

export interface CandidateSample {
  moments: SampleMoments
  /** Per group n x p row-major, the very cases of the moments, NaN where missing; null for published summaries. */
  rows: Float64Array[] | null
}

export type SampleSource = (byGroup: boolean, indicators: readonly string[]) => CandidateSample

/** By data set, then by estimation, groups and indicators: the window asks for the same samples with every call. */
const samples = new WeakMap<DataSet, Map<string, CandidateSample>>()

/** Samples of one data set under one estimation; each is made once and shared by all that use it. */
export function sampleSource(data: DataSet, { convention, missing }: Pick<Estimation, 'convention' | 'missing'>): SampleSource {
  const made = samples.get(data) ?? new Map<string, CandidateSample>()
  samples.set(data, made)
  return (byGroup, indicators) => {
    const key = JSON.stringify([convention, missing, byGroup, indicators])
    const sample = made.get(key) ?? makeSample(data, { convention, missing }, byGroup, indicators)
    made.set(key, sample)
    return sample
  }
}

function makeSample(
  data: DataSet,
  { convention, missing }: Pick<Estimation, 'convention' | 'missing'>,
  byGroup: boolean,
  indicators: readonly string[]
): CandidateSample {
  const at = indicators.map((name) => data.indicators.indexOf(name))
  if (data.kind === 'summary') {
    const groups = summaryGroups(data, convention, byGroup).map((group) => reducedMoments(group, at, data.indicators.length))
    return { moments: { indicators: [...indicators], groups }, rows: null }
  }
  const rows = rowGroups(data.groups, byGroup).map(({ name, values }) => {
    const kept = missing === 'complete cases' ? completeRowValues(values, data.indicators.length) : values
    return { name, values: selectColumns(kept, data.indicators.length, at) }
  })
  const groups = rows.map(({ name, values }) => {
    if (missing === 'complete cases') return { name, ...completeCaseMoments(values, at.length) }
    return patternMoments(name, values, indicators, data.source)
  })
  return { moments: { indicators: [...indicators], groups }, rows: rows.map((group) => group.values) }
}

function patternMoments(name: string | null, values: Float64Array, indicators: readonly string[], source: string): GroupMoments {
  const p = indicators.length
  const { patterns, n } = splitByPattern(values, p)
  const pair = unseenPair(patterns, p)
  if (pair !== null) {
    const names = [...new Set(pair.map((i) => `"${indicators[i]}"`))].join(' and ')
    throw new InputError(
      `${names}: fewer than two cases answered ${pair[0] === pair[1] ? 'it' : 'both'}${name === null ? '' : ` in ${name}`}.`,
      {
        where: source,
        remedy: 'No covariance can be estimated from that: leave one of them out.'
      }
    )
  }
  const { mean, covariance, converged } = saturatedMoments(patterns, p)
  if (!converged) {
    throw new InputError(
      `The unrestricted means and covariances could not be estimated${name === null ? '' : ` in ${name}`}: too much is missing.`,
      {
        where: source,
        remedy: 'Use complete cases, or fewer indicators.'
      }
    )
  }
  return { name, n, mean, covariance, patterns }
}

function rowGroups(groups: readonly RowGroup[], byGroup: boolean): { name: string | null; values: Float64Array }[] {
  if (byGroup) return groups.map(({ name, values }) => ({ name, values }))
  const all = new Float64Array(groups.reduce((sum, g) => sum + g.values.length, 0))
  let at = 0
  for (const { values } of groups) {
    all.set(values, at)
    at += values.length
  }
  return [{ name: null, values: all }]
}

function selectColumns(values: Float64Array, p: number, at: readonly number[]): Float64Array {
  const n = values.length / p
  const out = new Float64Array(n * at.length)
  for (let row = 0; row < n; row++) {
    at.forEach((column, k) => {
      out[row * at.length + k] = values[row * p + column]!
    })
  }
  return out
}

type Summary = Extract<DataSet, { kind: 'summary' }>
type Convention = Estimation['convention']

function summaryGroups(data: Summary, convention: Convention, byGroup: boolean): GroupMoments[] {
  const groups = data.groups.map((g) => summaryMoments(g, data.divisor, convention))
  if (byGroup || groups.length === 1) return groups.map((g) => ({ ...g, name: byGroup ? g.name : null }))
  return [pooledSummaries(groups, data)]
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
      throw new InputError('Groups of published covariances without means cannot be pooled.', {
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

function reducedMoments(group: GroupMoments, at: readonly number[], p: number): GroupMoments {
  const k = at.length
  const covariance = new Float64Array(k * k)
  at.forEach((i, a) => {
    at.forEach((j, b) => {
      covariance[a * k + b] = group.covariance[i * p + j]!
    })
  })
  return { ...group, covariance, mean: group.mean === null ? null : Float64Array.from(at, (i) => group.mean![i]!) }
}
