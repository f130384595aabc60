/**
 * Differences of factor means between groups, with intervals, raw and in pooled factor standard deviations (methods: section 7).
 *
 *     raw = kappa_2 - kappa_1      standardised = raw / sqrt( (n_1 phi_1 + n_2 phi_2) / (n_1 + n_2) )
 *
 * kappa = A alpha and phi = (A Psi A')_kk of the fitted model, n the cases; standard errors by the delta method from the
 * covariance matrix of the estimates. With dA = A dB A:
 *
 *     d kappa = A dalpha + A dB kappa      d phi_kk = (A dPsi A')_kk + 2 (A dB C)_kk
 */
import { normalUpper } from '../distributions/normal.ts'
import type { CompiledGroup, CompiledModel, FreeCell } from '../model/compile.ts'
import type { GroupState } from '../model/implied-moments.ts'

/** An estimate with its standard error, normal-theory 95% interval and z; null where the covariance of the estimates is not known. */
export interface Difference {
  estimate: number
  standardError: number | null
  lower: number | null
  upper: number | null
  z: number | null
  /** Two-sided. */
  p: number | null
}

export interface MeanDifference {
  factor: string
  /** The difference is that of `group` minus `from`. */
  from: string | null
  group: string | null
  raw: Difference
  /** Null where the pooled factor variance is not positive. */
  standardised: Difference | null
  pooledSd: number | null
}

/** Of a 95% interval in standard errors: the upper .975 quantile of the standard normal. */
const halfWidth = 1.959963984540054

/** A sparse gradient in gamma. */
type Gradient = Map<number, number>

interface Moment {
  value: number
  gradient: Gradient
}

/**
 * @param states the groups' matrices at the solution @param covariance of the estimates of gamma (q x q), null when not known
 * @param sizes cases of each group @param wanted factor and pair of groups by their places
 */
export function meanDifferences(
  model: CompiledModel,
  states: readonly GroupState[],
  covariance: Float64Array | null,
  sizes: readonly number[],
  wanted: readonly { factor: number; pair: readonly [number, number] }[]
): MeanDifference[] {
  const withError = (value: number, gradient: Gradient) => difference(value, gradient, covariance, model.parameters)
  return wanted.map(({ factor, pair: [g, h] }) => {
    const [group1, group2] = [model.groups[g]!, model.groups[h]!]
    const mean1 = factorMean(group1, states[g]!, factor)
    const mean2 = factorMean(group2, states[h]!, factor)
    const value = mean2.value - mean1.value
    const gradient = combined([mean2.gradient, 1], [mean1.gradient, -1])
    const weight = sizes[g]! / (sizes[g]! + sizes[h]!)
    const [phi1, phi2] = [factorVariance(group1, states[g]!, factor), factorVariance(group2, states[h]!, factor)]
    const pooled = weight * phi1.value + (1 - weight) * phi2.value
    const sd = pooled > 0 ? Math.sqrt(pooled) : null
    const slope = -value / (2 * pooled)
    return {
      factor: model.factors[factor]!,
      from: group1.name,
      group: group2.name,
      raw: withError(value, gradient),
      standardised:
        sd === null
          ? null
          : withError(
              value / sd,
              combined([gradient, 1 / sd], [phi1.gradient, (slope * weight) / sd], [phi2.gradient, (slope * (1 - weight)) / sd])
            ),
      pooledSd: sd
    }
  })
}

function factorMean(group: CompiledGroup, { a, m, factorMean: kappa }: GroupState, factor: number): Moment {
  const gradient: Gradient = new Map()
  for (const cell of group.free) {
    if (cell.matrix === 'alpha') add(gradient, cell, a[factor * m + cell.row]!)
    if (cell.matrix === 'beta') add(gradient, cell, a[factor * m + cell.row]! * kappa[cell.column]!)
  }
  return { value: kappa[factor]!, gradient }
}

function factorVariance(group: CompiledGroup, { a, c, m }: GroupState, factor: number): Moment {
  const gradient: Gradient = new Map()
  for (const cell of group.free) {
    const { row, column } = cell
    if (cell.matrix === 'psi') add(gradient, cell, (row === column ? 1 : 2) * a[factor * m + row]! * a[factor * m + column]!)
    if (cell.matrix === 'beta') add(gradient, cell, 2 * a[factor * m + row]! * c[column * m + factor]!)
  }
  return { value: c[factor * m + factor]!, gradient }
}

function add(gradient: Gradient, { gammas, weights }: FreeCell, slope: number): void {
  for (let k = 0; k < gammas.length; k++) gradient.set(gammas[k]!, (gradient.get(gammas[k]!) ?? 0) + weights[k]! * slope)
}

function combined(...terms: readonly [Gradient, number][]): Gradient {
  const sum: Gradient = new Map()
  for (const [gradient, factor] of terms) for (const [k, slope] of gradient) sum.set(k, (sum.get(k) ?? 0) + factor * slope)
  return sum
}

function difference(estimate: number, gradient: Gradient, covariance: Float64Array | null, q: number): Difference {
  let variance = 0
  if (covariance !== null)
    for (const [i, gi] of gradient) for (const [j, gj] of gradient) variance += gi * gj * covariance[i * q + j]!
  if (!(variance > 0)) return { estimate, standardError: null, lower: null, upper: null, z: null, p: null }
  const standardError = Math.sqrt(variance)
  const z = estimate / standardError
  return {
    estimate,
    standardError,
    lower: estimate - halfWidth * standardError,
    upper: estimate + halfWidth * standardError,
    z,
    p: 2 * normalUpper(Math.abs(z))
  }
}
