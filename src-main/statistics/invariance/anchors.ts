/**
 * What two groups measure alike: the anchors on which any comparison of their factors rests (Byrne, Shavelson & Muthén 1989).
 *
 * An anchor of a factor is something it measures whose cells are the same in both groups: the same fixed number, or
 * the same parameter. Groups and factors are given by their place in the cells.
 */
import type { Cell, GroupCells, ModelCells } from '../model/cells.ts'

/** Up to where alike: loadings only; intercepts as well, so that means can be compared; residual variances beside the loadings. */
export type Alike = 'loadings' | 'intercepts' | 'residual variances'

/** Names of the indicators (or factors, of a second-order one) that `factor` measures alike in the two groups. */
export function anchors(cells: ModelCells, factor: number, pair: readonly [number, number], alike: Alike): string[] {
  const [one, other] = [cells.groups[pair[0]]!, cells.groups[pair[1]]!]
  const indicators = cells.indicators.filter((_, i) => {
    if (!sameLoading(one.loadings, other.loadings, i, factor)) return false
    if (alike === 'intercepts') return one.intercepts !== null && one.intercepts[i] === other.intercepts![i]
    return alike === 'loadings' || one.residualCovariances[i]![i] === other.residualCovariances[i]![i]
  })
  const measured = cells.factors.filter((_, k) => {
    if (!sameLoading(one.regressions, other.regressions, k, factor)) return false
    if (alike === 'intercepts') return sameMean(one, other, k) && anchors(cells, k, pair, alike).length > 0
    return alike === 'loadings' || one.factorCovariances[k]![k] === other.factorCovariances[k]![k]
  })
  return [...indicators, ...measured]
}

function sameLoading(one: readonly Cell[][], other: readonly Cell[][], row: number, column: number): boolean {
  const [a, b] = [one[row]![column]!, other[row]![column]!]
  return a === b && a !== 0
}

function sameMean(one: GroupCells, other: GroupCells, factor: number): boolean {
  return one.factorMeans !== null && one.factorMeans[factor] === other.factorMeans![factor]
}

/** Every pair of groups, earlier first. */
export function groupPairs(groups: number): [number, number][] {
  return Array.from({ length: groups }, (_, g) => g).flatMap((g) =>
    Array.from({ length: groups - g - 1 }, (_, k): [number, number] => [g, g + 1 + k])
  )
}
