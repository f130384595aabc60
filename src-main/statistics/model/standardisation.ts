/** The completely standardised solution: indicators and factors of unit implied variance (Bollen 1989, p. 349). */
import type { FreeCell } from './compile.ts'
import type { GroupState } from './implied-moments.ts'

type Where = Pick<FreeCell, 'matrix' | 'row' | 'column'>

/** A variance that a cell is scaled by, an indicator's or a factor's, and the power it enters with. */
export interface Scale {
  of: 'indicator' | 'factor'
  index: number
  power: 0.5 | -0.5
}

export function standardisationScales({ matrix, row, column }: Where): Scale[] {
  const indicator = (index: number): Scale => ({ of: 'indicator', index, power: -0.5 })
  const factor = (index: number, power: 0.5 | -0.5 = -0.5): Scale => ({ of: 'factor', index, power })
  switch (matrix) {
    case 'lambda':
      return [factor(column, 0.5), indicator(row)]
    case 'beta':
      return [factor(column, 0.5), factor(row)]
    case 'psi':
      return [factor(row), factor(column)]
    case 'theta':
      return [indicator(row), indicator(column)]
    case 'nu':
      return [indicator(row)]
    case 'alpha':
      return [factor(row)]
  }
}

/** What a cell is multiplied by at the moments of `state`; not finite where a variance is not positive. */
export function standardisation(where: Where, { p, m, sigma, c }: GroupState): number {
  let product = 1
  for (const { of, index, power } of standardisationScales(where)) {
    product *= (of === 'indicator' ? sigma[index * p + index]! : c[index * m + index]!) ** power
  }
  return product
}
