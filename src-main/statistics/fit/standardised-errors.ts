/**
 * Delta-method standard errors of completely standardised values. A standardised cell is
 *
 *     value * product of roots: C_kk (variance of a factor) and sigma_aa (of an indicator), to powers of +-1/2
 *
 * so its gradient in gamma is that of the cell plus half the relative gradients of those variances, which in the notation of
 * cell-columns.ts are dsigma_aa = 2 c B[a,u] B[a,v] and, with B replaced by [., A, C], dC_kk likewise.
 */
import { cellColumns } from '../estimation/cell-columns.ts'
import type { CompiledGroup, CompiledModel, FreeCell } from '../model/compile.ts'
import type { GroupState } from '../model/implied-moments.ts'
import { standardisation, standardisationScales } from '../model/standardisation.ts'

/** A sparse gradient in gamma. */
type Gradient = Map<number, number>

export class StandardisedErrors {
  private readonly state: GroupState
  private readonly covariance: Float64Array
  private readonly q: number
  private readonly indicators: Gradient[]
  private readonly factors: Gradient[]

  /** @param covariance of the estimates of gamma, q x q */
  constructor(model: CompiledModel, group: CompiledGroup, state: GroupState, covariance: Float64Array) {
    this.state = state
    this.covariance = covariance
    this.q = model.parameters
    const { p, m } = state
    this.indicators = Array.from({ length: p }, () => new Map())
    this.factors = Array.from({ length: m }, () => new Map())
    const { u, v, c } = cellColumns(group, p, m, false)
    group.free.forEach((cell, i) => {
      if (u[i]! < 0) return
      for (let a = 0; a < p; a++) add(this.indicators[a]!, cell, 2 * c[i]! * this.column(a, u[i]!) * this.column(a, v[i]!))
      if (u[i]! < p) return
      for (let k = 0; k < m; k++) add(this.factors[k]!, cell, 2 * c[i]! * this.factorColumn(k, u[i]!) * this.factorColumn(k, v[i]!))
    })
  }

  /** B[a, column], B = [I, E, L] */
  private column(a: number, column: number): number {
    const { p, m, e, l } = this.state
    if (column < p) return column === a ? 1 : 0
    return column < p + m ? e[a * m + column - p]! : l[a * m + column - p - m]!
  }

  /** The same for factors: [A, C] */
  private factorColumn(k: number, column: number): number {
    const { p, m, a, c } = this.state
    return column < p + m ? a[k * m + column - p]! : c[k * m + column - p - m]!
  }

  /**
   * Standard error of the standardised value of the cell at `place`.
   *
   * @param cell the free cell; undefined for a fixed one, whose standardised value still varies with its scales
   * @returns null when it is zero or not a number
   */
  of(place: Pick<FreeCell, 'matrix' | 'row' | 'column'>, cell: FreeCell | undefined, value: number): number | null {
    const { p, m, sigma, c } = this.state
    const factor = standardisation(place, this.state)
    const gradient: Gradient = new Map()
    if (cell !== undefined) add(gradient, cell, factor)
    for (const { of, index, power } of standardisationScales(place)) {
      const variance = of === 'indicator' ? sigma[index * p + index]! : c[index * m + index]!
      const own = of === 'indicator' ? this.indicators[index]! : this.factors[index]!
      for (const [gamma, slope] of own)
        gradient.set(gamma, (gradient.get(gamma) ?? 0) + (power * value * factor * slope) / variance)
    }
    let sum = 0
    for (const [i, gi] of gradient) for (const [j, gj] of gradient) sum += gi * gj * this.covariance[i * this.q + j]!
    // A value that its scaling holds still (a marker's own factor alone, say) leaves rounding behind, not variance.
    return sum > 1e-20 * (1 + value * value) ? Math.sqrt(sum) : null
  }
}

function add(gradient: Gradient, { gammas, weights }: FreeCell, slope: number): void {
  if (slope === 0) return
  for (let k = 0; k < gammas.length; k++) gradient.set(gammas[k]!, (gradient.get(gammas[k]!) ?? 0) + weights[k]! * slope)
}
