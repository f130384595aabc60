/** The occasions of a ladder over time, as they are filled in. Pure. */
import type { StudyView } from '../../src-main/operations/contract.ts'
import { candidateOf } from '../state/look-up.ts'

export interface Occasion {
  name: string
  /** In the order of the first occasion's; empty text where none is chosen yet. */
  indicators: string[]
}

/** What the candidate's factors are measured by, its parents' included, in their order: the indicators of the first occasion. */
export function indicatorsOf(view: StudyView, name: string): string[] {
  let entry = candidateOf(view, name)
  for (let depth = 0; entry !== null && depth <= view.candidates.length; depth += 1) {
    const { factors, from } = entry.candidate
    if (factors !== null) {
      const measured = new Set(factors.flatMap(({ measures }) => measures))
      return view.data.indicators.filter((indicator) => measured.has(indicator))
    }
    entry = from === null ? null : candidateOf(view, from)
  }
  return []
}

/** Whether the data have room for a second occasion of what the candidate describes. */
export function canRepeat(view: StudyView, name: string): boolean {
  const own = indicatorsOf(view, name).length
  return own > 0 && view.data.indicators.length >= 2 * own
}

/** Two occasions, the second proposed from the indicators that follow the first's in the data. */
export function firstOccasions(view: StudyView, name: string): Occasion[] {
  const own = indicatorsOf(view, name)
  return withOccasion([{ name: 'first', indicators: own }], view.data.indicators)
}

const ordinals = ['first', 'second', 'third', 'fourth', 'fifth', 'sixth']

/** One occasion more, proposed from what no other has, in the order of the data. */
export function withOccasion(occasions: readonly Occasion[], all: readonly string[]): Occasion[] {
  const size = occasions[0]?.indicators.length ?? 0
  const taken = new Set(occasions.flatMap(({ indicators }) => indicators))
  const left = all.filter((indicator) => !taken.has(indicator)).slice(0, size)
  const name = ordinals[occasions.length] ?? `occasion ${occasions.length + 1}`
  return [...occasions, { name, indicators: Array.from({ length: size }, (_, i) => left[i] ?? '') }]
}

/** Every occasion is named, by a name of its own, and every indicator chosen, once. */
export function areComplete(occasions: readonly Occasion[]): boolean {
  const chosen = occasions.flatMap(({ indicators }) => indicators)
  const names = occasions.map(({ name }) => name.trim())
  const distinct = (list: readonly string[]) => new Set(list).size === list.length && !list.includes('')
  return occasions.length > 1 && distinct(chosen) && distinct(names)
}
