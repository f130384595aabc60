/**
 * What the trail says of each kind of event, in one place: a stable code, one sentence for people.
 */
import type { FitResult, LadderResult, Relation } from '../study/result.ts'
import { changeInFitWords } from '../study/rule-presets.ts'
import type { DataSet, Origin, Rules } from '../study/study.ts'

export const quoted = (name: string): string => `\u201c${name}\u201d`

export const sentences = {
  studyStarted: (study: string) => `The study ${quoted(study)} was started.`,
  planChanged: (study: string) => `The plan of ${quoted(study)} was changed before anything was fitted.`,
  dataImported: (data: DataSet) => {
    const cases = data.groups.reduce((sum, group) => sum + group.n, 0)
    const groups = data.groups.length > 1 ? ` in ${data.groups.length} groups` : ''
    return `The data ${quoted(data.source)} were read: ${data.indicators.length} indicators, ${cases} cases${groups}.`
  },
  candidateAdded: (name: string, origin: Origin) => `The candidate ${quoted(name)} was ${addedAs(origin)}.`,
  ladderAdded: (name: string, origin: Origin) => `The ladder ${quoted(name)} was ${addedAs(origin)}.`,
  rulesChanged: (rules: Rules) => `The rules were changed before anything was fitted. They now say: ${rulesInWords(rules)}.`,
  candidateFitted: (name: string, fit: FitResult) => {
    if (fit.state !== 'fitted' || fit.T === null) {
      return `The candidate ${quoted(name)} was tried and has no usable solution (${fit.state})${fit.reason === null ? '.' : `: ${ended(fit.reason)}`}`
    }
    const p = fit.p === null ? '' : `, p ${probability(fit.p)}`
    return `The candidate ${quoted(name)} was fitted: T = ${fit.T.toFixed(2)} on ${counted(fit.df, 'degree')} of freedom${p}.`
  },
  relationSettled: (
    restricted: string | null,
    general: string | null,
    relation: Relation | 'reversed',
    proof: 'constraints' | 'refit'
  ) => {
    const upper = restricted === null ? 'One candidate' : quoted(restricted)
    const lower = general === null ? 'another' : quoted(general)
    return `${upper} ${relationInWords[relation]} ${lower}, as shown by ${proof === 'constraints' ? 'their constraints' : 'refitting one to the other'}.`
  },
  ladderJudged: (ladder: LadderResult) => {
    const steps = ladder.steps.map((step) => `the step to ${quoted(step.to)}: ${step.verdict}`).join('; ')
    const stand =
      ladder.standHere === null ? 'its lowest rung has no solution' : `the data let one stand on ${quoted(ladder.standHere)}`
    return `The ladder ${quoted(ladder.name)} was judged: ${stand}${steps === '' ? '' : ` (${steps})`}.`
  },
  decisionRecorded: (ladder: string, rung: string, reason: string) =>
    `On the ladder ${quoted(ladder)} it was decided to stand on ${quoted(rung)}. The reason given: ${ended(reason)}`,
  fittingStopped: () => 'Fitting was stopped before all candidates were done; what was finished is kept.',
  projectSaved: (name: string) => `The study was saved as ${quoted(name)}.`,
  planExported: (name: string) => `The plan was written to ${quoted(name)}.`,
  resultExported: (name: string) => `The result was written to ${quoted(name)}.`
} as const

const relationInWords: Record<Relation | 'reversed', string> = {
  nested: 'is nested in',
  equivalent: 'is equivalent to',
  'not nested': 'is not nested in',
  reversed: 'is the more general one and contains'
}

function addedAs(origin: Origin): string {
  return origin === 'planned' ? 'added to the plan' : 'added after results had been seen'
}

/** The rules as a clause, e.g. "a step holds by its difference test at alpha .05, adjusted over the ladder (Holm)". */
function rulesInWords(rules: Rules): string {
  const test = `its difference test at alpha ${String(rules.alpha).replace(/^0/, '')}${rules.adjust === 'holm' ? ', adjusted over the ladder (Holm)' : ''}`
  const limits = changeInFitWords(rules)
  const change = `its change in fit (${limits.length === 0 ? 'no limits given' : limits.join(', ')})`
  const by = { 'difference test': test, 'change in fit': change, both: `${test}, and by ${change}` }
  return `a step holds by ${by[rules.decideBy]}`
}

/** "= .042", or "< .001". */
function probability(p: number): string {
  return p < 0.0005 ? '< .001' : `= ${p.toFixed(3).replace(/^0/, '')}`
}

function counted(count: number, word: string): string {
  return `${count} ${word}${count === 1 ? '' : 's'}`
}

function ended(sentence: string): string {
  return /[.!?]$/.test(sentence) ? sentence : `${sentence}.`
}
