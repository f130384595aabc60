/**
 * A study's result as plain text of a given width, each ladder top rung first, since one climbs.
 *
 * A pure function of plain values: the same result gives the same text, on a terminal and in a pipe. It formats and never computes,
 * apart from the cases lost (n minus complete) and the length of a gauge's bar.
 */
import type { CandidateResult, DifferenceResult, LadderResult, StepResult, StudyResult } from '../study/result.ts'
import { changeInFitWords } from '../study/rule-presets.ts'
import type { Caution, Estimation, Rules } from '../study/study.ts'
import { counted, criterion, index, noValue, pIs, pValue, signedCriterion, signedIndex, statistic } from './numbers.ts'
import { flow, plainName, wrap, wrapSentence } from './text-lines.ts'

export interface TextLadderInput {
  result: StudyResult
  estimation: Estimation
  rules: Rules
  /** Columns at most, 60 at least; 80 unless given. */
  width?: number
}

/** N from which nearly every test of exact fit rejects, and N below which its size is off (common practice; methods: section 5). */
const manyCases = 2000
const fewCases = 100

/** Room at the left for the mark "stand here", then the ladder's upright. */
const margin = '       '
const upright = '┃'

/** The whole report, ending in a line end. */
export function studyText(input: TextLadderInput): string {
  const width = input.width ?? 80
  const { result } = input
  const lines = [
    ...wrap(plainName(result.study), width),
    ...headLines(input, width),
    ...result.ladders.flatMap((ladder) => ['', ...ladderLines(ladder, result, width)]),
    ...besideLines(result, width)
  ]
  return lines.map((line) => line.trimEnd()).join('\n') + '\n'
}

/** Data, method and rules, and the cautions that concern the whole study. */
function headLines({ result, estimation, rules }: TextLadderInput, width: number): string[] {
  const notes = [...sizeNotes(result), ...result.data.cautions.map(cautionText)]
  return [
    ...wrap(dataSentence(result, estimation), width),
    ...(result.data.normality?.sentence == null ? [] : wrap(plainName(result.data.normality.sentence), width)),
    ...wrap(estimationSentence(result, estimation), width),
    ...wrap(rulesSentence(rules), width),
    ...notes.flatMap((note) => hanging('! ', note, width, ''))
  ]
}

/** "912 cases (304 North, ...), 9 indicators; 14 cases lost to missing answers." N is the number used. */
function dataSentence({ data }: StudyResult, estimation: Estimation): string {
  const { groups, indicators, missing } = data
  const everyCase = estimation.missing === 'full information'
  const sizes = groups.map((group) => ({ name: group.name, n: everyCase ? group.n : group.complete }))
  const used = sum(sizes.map(({ n }) => n))
  const parts = sizes.length > 1 ? ` (${sizes.map(({ name, n }) => `${n} ${plainName(name ?? noValue)}`).join(', ')})` : ''
  const lost = sum(groups.map((group) => group.n)) - used
  const answers = `${counted(missing.values, 'answer', 'answers')} missing in ${counted(missing.cases, 'case', 'cases')}`
  const patterns = counted(missing.patterns.length, 'pattern', 'patterns')
  const losing = everyCase
    ? missing.cases === 0
      ? 'no answer missing'
      : `${answers}, ${patterns}; complete cases would be ${used - missing.cases}`
    : lost === 0
      ? 'no case lost'
      : `${counted(lost, 'case', 'cases')} of ${used + lost} lost to missing answers`
  return `N = ${used}${parts}, ${counted(indicators.length, 'indicator', 'indicators')}; ${losing}.`
}

/** How the candidates were fitted, and for scaled statistics by which form and which kind of indices. */
function estimationSentence({ candidates }: StudyResult, estimation: Estimation): string {
  const { method, convention, statistic, missing, standardErrors } = estimation
  const sentence = `${capital(method)}, ${convention} convention, ${statistic} statistic, ${missing}, ${standardErrors} standard errors.`
  const form = candidates.find((candidate) => candidate.scaled !== null)?.scaled?.form
  return form === undefined ? sentence : `${sentence} Scaling: ${form}; CFI, TLI and RMSEA are of the population-consistent kind.`
}

function rulesSentence(rules: Rules): string {
  const thresholds = changeInFitWords(rules)
  const adjusted = rules.adjust === 'holm' ? 'Holm over a ladder' : 'not adjusted'
  const limitsText = thresholds.length === 0 ? '' : `; change in fit: ${thresholds.join(', ')}`
  return `Rules: alpha ${String(rules.alpha).replace(/^0/, '')}, ${adjusted}, decided by ${rules.decideBy}${limitsText}.`
}

/** What the size of the sample does to the tests of exact fit; empty for a sample of ordinary size. */
function sizeNotes(result: StudyResult): string[] {
  const used = sum(result.data.groups.map((group) => group.n))
  if (used >= manyCases)
    return [`N is ${used}: with N in the thousands nearly every test of exact fit rejects; read the indices beside it.`]
  if (used < fewCases)
    return [`N is ${used}: with N under about ${fewCases} the tests of exact fit and of differences are off in size.`]
  return []
}

function ladderLines(ladder: LadderResult, result: StudyResult, width: number): string[] {
  const steps = new Map(ladder.steps.map((step) => [step.to, step]))
  const lines = wrap(`${plainName(ladder.name)} (top rung first)`, width)
  for (const [place, name] of [...ladder.rungs.entries()].reverse()) {
    lines.push('', ...rungLines(name, result, ladder.standHere === name, width))
    const step = place === 0 ? undefined : steps.get(name)
    if (step !== undefined) lines.push(`${margin}${upright}`, ...stepLines(step, width))
  }
  return withoutGaps(lines)
}

/** A rung: its name on the bar, its numbers under it, its cautions last. */
function rungLines(name: string, result: StudyResult, stands: boolean, width: number): string[] {
  const fit = result.candidates.find((candidate) => candidate.name === name)
  const indent = `${margin}${upright}  `
  const title = `${plainName(name)} (${fit?.origin ?? 'not fitted yet'})`
  const [first, ...more] = wrap(title, width - margin.length - 5)
  const body =
    fit === undefined
      ? []
      : [...fitLines(fit, width, indent), ...fit.cautions.flatMap((caution) => hanging('! ', cautionText(caution), width, indent))]
  const lines = [`${margin}┣━━━ ${first ?? ''}`, ...more.map((line) => `${margin}${upright}    ${line}`), ...body]
  return stands ? markStand(lines) : lines
}

/** Writes "stand here" into the margin of a rung's first two lines. */
function markStand(lines: string[]): string[] {
  const [first, second = `${margin}${upright}`, ...more] = lines
  return [first!.replace(margin, ' stand '), second.replace(margin, '  here '), ...more]
}

/** Statistic, indices and criteria of a fit, or why there are none. */
function fitLines(fit: CandidateResult, width: number, indent: string): string[] {
  const reason =
    fit.state === 'fitted' ? [] : wrap(`${capital(fit.state)}: ${plainName(fit.reason ?? 'no reason given')}`, width, indent)
  const same = fit.sameAs.length === 0 ? [] : wrap(`The same model as ${fit.sameAs.map(plainName).join(', ')}.`, width, indent)
  return [...reason, ...same, ...(fit.T === null ? [] : numberLines(fit, width, indent))]
}

function numberLines(fit: CandidateResult, width: number, indent: string): string[] {
  return [...flow(fitGroups(fit), width, indent), ...flow(criteriaGroups(fit), width, indent)]
}

function fitGroups(fit: CandidateResult): string[] {
  const interval =
    fit.rmsea.lower === null || fit.rmsea.upper === null ? '' : ` [${index(fit.rmsea.lower)}, ${index(fit.rmsea.upper)}]`
  return [
    `T ${statistic(fit.T)} on ${fit.df} df`,
    pIs('p', fit.p),
    ...(fit.scaled === null
      ? []
      : [`scaled T ${statistic(fit.scaled.T)} (c ${index(fit.scaled.scaling)}), ${pIs('p', fit.scaled.p)}`]),
    `CFI ${index(fit.cfi)}`,
    `TLI ${index(fit.tli)}`,
    `RMSEA ${index(fit.rmsea.estimate)}${interval}`,
    `SRMR ${index(fit.srmr)}`
  ]
}

function criteriaGroups(fit: CandidateResult): string[] {
  return [
    `AIC ${criterion(fit.aic)} (weight ${pValue(fit.aicWeight)})`,
    `BIC ${criterion(fit.bic)} (weight ${pValue(fit.bicWeight)})`
  ]
}

/** What separates two rungs: what is added, the verdict, the cost against the critical value, the differences, the sentence. */
function stepLines(step: StepResult, width: number): string[] {
  const indent = `${margin}${upright}      `
  return [
    ...hanging('step: ', plainName(step.adds), width, indent),
    ...hanging('', verdictText(step), width, indent),
    ...(step.difference === null ? [] : differenceLines(step.difference, width, indent)),
    ...flow(deltaGroups(step), width, indent),
    ...wrapSentence(plainName(step.because), width, indent),
    `${margin}${upright}`
  ]
}

function verdictText(step: StepResult): string {
  const words = step.verdict === 'no test' && step.noTest !== null ? `no test: ${step.noTest}` : step.verdict
  const proof =
    step.relation === null
      ? ''
      : `${step.relation}${step.proof === null ? '' : `, shown by ${step.proof === 'refit' ? 'refitting' : 'the constraints'}`}`
  return `Verdict: ${words}${proof === '' ? '' : `   (${proof})`}`
}

function differenceLines(difference: DifferenceResult, width: number, indent: string): string[] {
  const groups = [
    `Delta T ${statistic(difference.T)} on ${difference.df} df`,
    `critical ${statistic(difference.critical)}`,
    pIs('p', difference.p),
    ...(difference.holmP === null ? [] : [pIs('Holm p', difference.holmP)]),
    ...(difference.method === 'normal theory' ? [] : [`(${difference.method})`])
  ]
  return [`${indent}${gauge(difference)}`, ...flow(groups, width, indent)]
}

/** A scale from 0 to twice the critical value, the critical value in its middle, "=" as far as the cost goes, ">" beyond the scale. */
function gauge({ T, critical }: DifferenceResult): string {
  const half = 20
  const filled = Math.round((Math.max(0, T) / critical) * half)
  const scale = Array.from({ length: 2 * half + 1 }, (_, place) => {
    if (place === half) return '|'
    return place < filled ? '=' : '·'
  })
  return `0 ${scale.join('')}${filled > 2 * half ? '>' : ''}`
}

function deltaGroups(step: StepResult): string[] {
  const indices = [
    { name: 'CFI', text: signedIndex(step.deltaCfi), value: step.deltaCfi },
    { name: 'RMSEA', text: signedIndex(step.deltaRmsea), value: step.deltaRmsea },
    { name: 'SRMR', text: signedIndex(step.deltaSrmr), value: step.deltaSrmr },
    { name: 'AIC', text: signedCriterion(step.deltaAic), value: step.deltaAic },
    { name: 'BIC', text: signedCriterion(step.deltaBic), value: step.deltaBic }
  ].filter((delta) => delta.value !== null)
  return indices.map((delta, place) => `${place === 0 ? 'Delta ' : ''}${delta.name} ${delta.text}`)
}

/** Candidates that stand on no ladder, with their numbers and weights. */
function besideLines(result: StudyResult, width: number): string[] {
  const onLadder = new Set(result.ladders.flatMap((ladder) => ladder.rungs))
  const beside = result.candidates.filter((candidate) => !onLadder.has(candidate.name))
  if (beside.length === 0) return []
  const title = result.ladders.length === 0 ? 'Candidates' : 'Beside the ladders'
  return ['', title, ...beside.flatMap((fit) => candidateLines(fit, width))]
}

function candidateLines(fit: CandidateResult, width: number): string[] {
  return [
    '',
    ...wrap(`${plainName(fit.name)} (${fit.origin})`, width, '  '),
    ...fitLines(fit, width, '    '),
    ...fit.cautions.flatMap((caution) => hanging('! ', cautionText(caution), width, '    '))
  ]
}

function cautionText(caution: Caution): string {
  return plainName(caution.message)
}

/** Wraps `text` behind `mark`, its later lines standing under its first word. */
function hanging(mark: string, text: string, width: number, indent: string): string[] {
  const space = ' '.repeat(mark.length)
  return wrap(text, width - mark.length, indent).map((line, place) => {
    return `${indent}${place === 0 ? mark : space}${line.slice(indent.length)}`
  })
}

/** Removes a blank line that would stand between a step's upright and the rung under it. */
function withoutGaps(lines: string[]): string[] {
  return lines.filter((line, place) => line !== '' || !lines[place - 1]?.endsWith(upright))
}

function capital(text: string): string {
  return text.charAt(0).toUpperCase() + text.slice(1)
}

function sum(values: number[]): number {
  return values.reduce((total, value) => total + value, 0)
}
