/** Cells by their names and in words, for sentences about them. */
import type { CellPart } from './cells.ts'
import type { FreeCell, MatrixName } from './compile.ts'

const partOf: Record<MatrixName, [off: CellPart, diagonal: CellPart]> = {
  lambda: ['loading', 'loading'],
  beta: ['factor regression', 'factor regression'],
  psi: ['factor covariance', 'factor variance'],
  theta: ['residual covariance', 'residual variance'],
  nu: ['intercept', 'intercept'],
  alpha: ['factor mean', 'factor mean']
}

/** What a cell of the model's matrices is called. */
export function partAt({ matrix, row, column }: Pick<FreeCell, 'matrix' | 'row' | 'column'>): CellPart {
  return partOf[matrix][row === column ? 1 : 0]
}

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
