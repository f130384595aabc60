/** A cell in words, for sentences about it. */
import type { CellPart } from './cells.ts'

/** "the loading of sleep on Body", "the residual covariance of sleep with worry", in a group where one is named. */
export function cellWords(part: CellPart, of: readonly string[], group: string | null = null): string {
  const [first = '', second = ''] = of
  const where = group === null ? '' : ` in ${group}`
  switch (part) {
    case 'loading':
      return `the loading of ${first} on ${second}${where}`
    case 'factor regression':
      return `the regression of ${first} on ${second}${where}`
    case 'residual covariance':
    case 'factor covariance':
      return `the ${part} of ${first} with ${second}${where}`
    default:
      return `the ${part} of ${first}${where}`
  }
}

/** "a", "a and b", "a, b and c"; beyond `most` the rest is counted. */
export function listed(items: readonly string[], most = 4): string {
  const shown = items.length > most ? [...items.slice(0, most - 1), `${items.length - most + 1} others`] : [...items]
  const last = shown.pop() ?? ''
  return shown.length === 0 ? last : `${shown.join(', ')} and ${last}`
}
