/**
 * Which factors two groups can be compared on: those of whose indicators some are measured alike, loadings and intercepts.
 */
import { anchors, groupPairs } from '../statistics/invariance/anchors.ts'
import type { ModelCells } from '../statistics/model/cells.ts'
import { InputError } from '../study/input-error.ts'
import type { RefusedComparison } from './contract.ts'

export interface Comparison {
  /** Places in the cells. */
  factor: number
  pair: readonly [number, number]
  /** What the groups have in common. */
  restsOn: string[]
}

/** @throws InputError where no factor can be compared in any pair of groups, with the reason */
export function comparableFactors(
  candidate: string,
  cells: ModelCells
): { comparisons: Comparison[]; refused: RefusedComparison[] } {
  if (cells.groups.length < 2) refuse(candidate, 'it is not modelled across groups')
  if (cells.groups[0]!.intercepts === null) refuse(candidate, 'no means are modelled')
  const comparisons: Comparison[] = []
  const refused: RefusedComparison[] = []
  for (const [factor, name] of cells.factors.entries()) {
    for (const pair of groupPairs(cells.groups.length)) {
      const restsOn = anchors(cells, factor, pair, 'intercepts')
      if (restsOn.length > 0) comparisons.push({ factor, pair, restsOn })
      else refused.push({ factor: name, from: cells.groups[pair[0]]!.name!, group: cells.groups[pair[1]]!.name!, reason })
    }
  }
  if (comparisons.length === 0) refuse(candidate, reason)
  return { comparisons, refused }
}

const reason = 'none of its indicators has both its loading and its intercept held equal in the two groups'

function refuse(candidate: string, why: string): never {
  const told = why === reason ? 'no indicator has both its loading and its intercept held equal across groups' : why
  throw new InputError(`"${candidate}" does not license a comparison of groups: ${told}.`, {
    where: 'candidate',
    remedy: 'Look at a rung on which loadings and intercepts are held equal, at least for some indicators.'
  })
}
