/**
 * One change of a candidate in words: a clause for sentences about candidates and about what is wrong with one.
 */
import { cellWords, listed } from '../statistics/model/cell-words.ts'
import type { CellName, Change } from './study.ts'

/** One change as a clause: "the residual covariance of a with b is free". */
export function changeWords(change: Change): string {
  switch (change.do) {
    case 'free':
      return `${cellWords(change.cell.part, change.cell.of, change.group)} is free`
    case 'fix':
      return `${cellWords(change.cell.part, change.cell.of, change.group)} is fixed at ${change.at}`
    case 'equal':
      return `${cellsWords(change.cells)} are equal${change.group === null ? '' : ` in ${change.group}`}`
    case 'constrain':
      return constraintWords(change)
    case 'bound':
      return `${cellWords(change.cell.part, change.cell.of, change.group)} is ${limitWords(change.atLeast, change.atMost)}`
  }
}

/** Neighbouring changes of one kind are gathered from this many on. */
const gathered = 3

/** Changes as clauses, in order; a run of the same kind as one: "equal loadings (a on F and b on G; c on F and d on G; ...)". */
export function changesWords(changes: readonly Change[]): string[] {
  const clauses: string[] = []
  for (let start = 0, end = 0; start < changes.length; start = end) {
    const kind = kindOf(changes[start]!)
    end = start + 1
    while (kind !== null && end < changes.length && kindOf(changes[end]!) === kind) end++
    const run = changes.slice(start, end)
    clauses.push(...(run.length < gathered ? run.map(changeWords) : [`${kind} (${run.map(shortCells).join('; ')})`]))
  }
  return clauses
}

/** "equal loadings", "free factor means"; null for what is always said by itself. */
function kindOf(change: Change): string | null {
  if ((change.do !== 'equal' && change.do !== 'free') || change.group !== null) return null
  const parts = new Set(change.do === 'equal' ? change.cells.map((cell) => cell.part) : [change.cell.part])
  return parts.size > 1 ? null : `${change.do} ${plural([...parts][0]!)}`
}

function shortCells(change: Change): string {
  const cells = change.do === 'equal' ? change.cells : change.do === 'free' ? [change.cell] : []
  return listed(cells.map(shortCell), cells.length)
}

/** The names alone: what they are names of is said once for the whole run. */
function shortCell({ part, of }: CellName): string {
  return of.join(part.endsWith('covariance') ? ' with ' : ' on ')
}

function plural(part: CellName['part']): string {
  return part.replace(/variance$/, 'variances').replace(/(loading|intercept|mean|regression)$/, '$1s')
}

/** "at least 0", "between -1 and 1" */
export function limitWords(atLeast: number | null, atMost: number | null): string {
  if (atLeast !== null && atMost !== null) return `between ${atLeast} and ${atMost}`
  return atLeast !== null ? `at least ${atLeast}` : `at most ${atMost}`
}

export type Constraint = Extract<Change, { do: 'constrain' }>

export function constraintWords({ terms, to, group }: Constraint): string {
  const words = terms.map(({ cell, times, group: own }) => ({ times, words: cellWords(cell.part, cell.of, own) }))
  return `${equationWords(words, to)}${group === null ? '' : ` in ${group}`}`
}

/** "the loading of a on F equals twice the loading of b on F"; beyond two opposite terms, "a plus 3 times b is 2". */
export function equationWords(terms: readonly { times: number; words: string }[], to: number): string {
  const [first, second] = terms
  if (terms.length === 2 && to === 0 && first!.times * second!.times < 0) {
    // The one taken less often is the larger: one x a = many x b.
    const [one, many] = Math.abs(first!.times) <= Math.abs(second!.times) ? [first!, second!] : [second!, first!]
    return `${one.words} equals ${timesWords(Math.abs(many.times / one.times))}${many.words}`
  }
  const sum = terms.map(({ times, words }, i) => {
    const sign = i === 0 ? (times < 0 ? 'minus ' : '') : times < 0 ? ' minus ' : ' plus '
    return `${sign}${timesWords(Math.abs(times))}${words}`
  })
  return `${sum.join('')} is ${to}`
}

function timesWords(times: number): string {
  if (times === 1) return ''
  return times === 2 ? 'twice ' : `${Number(times.toPrecision(6))} times `
}

/** "the loadings of a and b on F" where only the first name differs; else one by one. */
function cellsWords(cells: readonly CellName[]): string {
  const [first] = cells
  const alike = first !== undefined && cells.every((cell) => cell.part === first.part && cell.of[1] === first.of[1])
  if (!alike || first.part === 'residual covariance' || first.part === 'factor covariance') {
    const words = cells.map((cell) => cellWords(cell.part, cell.of))
    return listed(words, words.length)
  }
  const names = cells.map((cell) => cell.of[0]!)
  return `the ${plural(first.part)} of ${listed(names, names.length)}${first.of[1] === undefined ? '' : ` on ${first.of[1]}`}`
}
