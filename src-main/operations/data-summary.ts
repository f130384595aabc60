/**
 * A data set for people: cases per group, what is missing and in which patterns, how far from normal, what to mind.
 */

import { mardia, mardiaSentence } from '../statistics/moments/mardia.ts'
import { splitByPattern } from '../statistics/moments/missing-patterns.ts'
import type { MissingResult, NormalityResult, StudyResult } from '../study/result.ts'
import type { Caution, DataSet, Estimation } from '../study/study.ts'

type Counts = Pick<StudyResult['data'], 'groups' | 'missing' | 'normality'>

/** Counted once a data set: the window shows them with every call. */
const counts = new WeakMap<DataSet, Counts>()

export function dataSummary(data: DataSet, estimation: Estimation): StudyResult['data'] {
  const { groups, missing, normality } = counts.get(data) ?? countsOf(data)
  const cautions = [...data.cautions, ...missingCautions(missing, estimation)]
  return { digest: data.digest, indicators: data.indicators, groups, missing, normality, cautions }
}

function countsOf(data: DataSet): Counts {
  const made = { groups: completeCases(data), missing: missingAnswers(data), normality: normality(data) }
  counts.set(data, made)
  return made
}

/** Per group: rows (or published n), and those without a missing answer. */
function completeCases(data: DataSet): { name: string | null; n: number; complete: number }[] {
  if (data.kind === 'summary') return data.groups.map(({ name, n }) => ({ name, n, complete: n }))
  const p = data.indicators.length
  return data.groups.map(({ name, n, values }) => {
    const { patterns } = splitByPattern(values, p)
    return { name, n, complete: patterns.find((pattern) => pattern.observed.length === p)?.n ?? 0 }
  })
}

function missingAnswers(data: DataSet): MissingResult {
  if (data.kind === 'summary') return { values: 0, cases: 0, patterns: [] }
  const p = data.indicators.length
  const all = new Float64Array(data.groups.reduce((sum, g) => sum + g.values.length, 0))
  let at = 0
  for (const { values } of data.groups) {
    all.set(values, at)
    at += values.length
  }
  const patterns = splitByPattern(all, p).patterns.map(({ observed, n }) => ({
    answered: [...observed].map((i) => data.indicators[i]!),
    n
  }))
  const incomplete = patterns.filter(({ answered }) => answered.length < p)
  return {
    values: incomplete.reduce((sum, { answered, n }) => sum + n * (p - answered.length), 0),
    cases: incomplete.reduce((sum, { n }) => sum + n, 0),
    patterns
  }
}

function normality(data: DataSet): NormalityResult | null {
  if (data.kind === 'summary') return null
  const groups = data.groups.map(({ name, values }) => ({ name, result: mardia(values, data.indicators.length) }))
  return {
    sentence: mardiaSentence(groups),
    groups: groups.flatMap(({ name, result }) => {
      if (result === null) return []
      const { n, skewness, kurtosis, indicators } = result
      return [
        {
          group: name,
          n,
          skewness: { value: skewness.value, chiSquare: skewness.chiSquare, df: skewness.df, p: skewness.p },
          kurtosis: { value: kurtosis.value, expected: kurtosis.expected, z: kurtosis.z, p: kurtosis.p },
          indicators: indicators.map((own, i) => ({ name: data.indicators[i]!, ...own }))
        }
      ]
    })
  }
}

/** What full information rests on, and what its expected information asks beyond that. */
function missingCautions({ cases }: MissingResult, estimation: Estimation): Caution[] {
  if (cases === 0 || estimation.missing !== 'full information') return []
  const found: Caution[] = [
    {
      code: 'missing-at-random',
      message:
        'Full information is right when what is missing depends only on answers that were given (missing at random); the data cannot show that.',
      cell: null
    }
  ]
  if (estimation.standardErrors === 'expected') {
    const message =
      'With missing answers, standard errors from the expected information also need the answers to be missing completely at random; the observed information does not.'
    found.push({ code: 'expected-information-with-missing', message, cell: null })
  }
  return found
}
