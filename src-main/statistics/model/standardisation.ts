/** The multiplier of the completely standardised solution: indicators and factors of unit implied variance (Bollen 1989, p. 349). */
import type { FreeCell } from './compile.ts'
import type { GroupState } from './implied-moments.ts'

/** What a cell is multiplied by at the moments of `state`; not finite where a variance is not positive. */
export function standardisation({ matrix, row, column }: Pick<FreeCell, 'matrix' | 'row' | 'column'>, state: GroupState): number {
  const { p, m, sigma, c } = state
  const indicator = (i: number) => Math.sqrt(sigma[i * p + i]!)
  const factor = (k: number) => Math.sqrt(c[k * m + k]!)
  switch (matrix) {
    case 'lambda':
      return factor(column) / indicator(row)
    case 'beta':
      return factor(column) / factor(row)
    case 'psi':
      return 1 / (factor(row) * factor(column))
    case 'theta':
      return 1 / (indicator(row) * indicator(column))
    case 'nu':
      return 1 / indicator(row)
    case 'alpha':
      return 1 / factor(row)
  }
}
