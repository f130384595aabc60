/** Which indicators were answered together, as the rows of a matrix picture. Formatting only. */
import type { MissingResult, StudyView } from '../../src-main/operations/contract.ts'
import { count, plural } from '../state/format.ts'

export interface PatternRow {
  key: string
  n: number
  /** Per indicator, in the study's order: whether it was answered. */
  answered: boolean[]
  /** "every indicator answered", "without bags and taps", "only jars". */
  words: string
  /** Width of the bar, percent of the most frequent pattern's. */
  bar: number
}

/** Names listed before the rest is only counted. */
const listedNames = 4

export function patternRows({ patterns }: MissingResult, indicators: readonly string[]): PatternRow[] {
  const most = Math.max(...patterns.map((pattern) => pattern.n))
  return patterns.map(({ answered, n }) => {
    const given = indicators.map((name) => answered.includes(name))
    return { key: answered.join('\n'), n, answered: given, words: inWords(indicators, given), bar: (100 * n) / most }
  })
}

/** What is missing and what that means for the study, in a sentence or two. */
export function missingInWords({ result, estimation }: StudyView): string {
  const { values, cases } = result.data.missing
  if (values === 0) return 'No answer is missing.'
  const lost = `${plural(values, 'answer')} missing, in ${plural(cases, 'case')}.`
  return estimation.missing === 'full information'
    ? `${lost} Complete-case analysis would drop ${cases === 1 ? 'this case' : `these ${count(cases)} cases`}; this study keeps every answer given (full information).`
    : `${lost} This study drops ${cases === 1 ? 'this case' : `these ${count(cases)} cases`} (complete cases); full information would keep the answers given.`
}

function inWords(indicators: readonly string[], given: readonly boolean[]): string {
  const answered = indicators.filter((_, i) => given[i])
  const absent = indicators.filter((_, i) => !given[i])
  if (absent.length === 0) return 'every indicator answered'
  if (answered.length === 0) return 'none answered'
  return answered.length < absent.length ? `only ${listed(answered)}` : `without ${listed(absent)}`
}

function listed(names: readonly string[]): string {
  if (names.length > listedNames)
    return `${names.slice(0, listedNames - 1).join(', ')} and ${names.length - listedNames + 1} others`
  return names.length === 1 ? (names[0] ?? '') : `${names.slice(0, -1).join(', ')} and ${names.at(-1)}`
}
