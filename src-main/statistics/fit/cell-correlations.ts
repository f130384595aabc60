/**
 * Correlations of the estimates of some cells, from the expected information at a solution.
 */

import type { Convention } from '../estimation/normal-likelihood.ts'
import { normalObjective } from '../estimation/normal-likelihood.ts'
import { positiveInverse } from '../matrix/symmetric.ts'
import type { CellPart, ModelCells } from '../model/cells.ts'
import { compileModel, type FreeCell } from '../model/compile.ts'
import type { SampleMoments } from '../moments/sample-moments.ts'
import { partOfCell } from './label-words.ts'

/**
 * @param cells named by part, names and group
 * @returns k x k; null when the information is singular or a cell is not a free one with an error of its own
 */
export function cellCorrelations(
  model: ModelCells,
  moments: SampleMoments,
  convention: Convention,
  gamma: readonly number[],
  cells: readonly { part: CellPart; of: readonly string[]; group: string | null }[]
): number[][] | null {
  const compiled = compileModel(model)
  const objective = normalObjective(compiled, moments, convention)
  if (Number.isNaN(objective.evaluate(Float64Array.from(gamma)))) return null
  const q = compiled.parameters
  const curvature = new Float64Array(q * q)
  objective.derive(new Float64Array(q), curvature)
  const inverse = positiveInverse(curvature, q)
  if (inverse === null) return null
  const found = cells.map(({ part, of, group }) =>
    compiled.groups
      .find((g) => g.name === group)
      ?.free.find((cell) => {
        const own = partOfCell(compiled, cell)
        return own.part === part && JSON.stringify([...own.of].sort()) === JSON.stringify([...of].sort())
      })
  )
  if (found.some((cell) => cell === undefined)) return null
  const covariance = (a: FreeCell, b: FreeCell) => {
    let sum = 0
    a.gammas.forEach((i, k) => {
      b.gammas.forEach((j, l) => {
        sum += a.weights[k]! * b.weights[l]! * inverse[i * q + j]!
      })
    })
    return sum
  }
  const known = found as FreeCell[]
  return known.map((a) => known.map((b) => covariance(a, b) / Math.sqrt(covariance(a, a) * covariance(b, b))))
}
