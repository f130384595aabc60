/**
 * Does a step put its hypothesis on the boundary of what is possible? A variance fixed at 0, a correlation fixed at 1 or -1,
 * or two factors merged into one (their correlation is 1 then): estimates cannot lie beyond, so that the chi-square on the
 * difference in df is not the reference of the test (Stoel, Garre, Dolan & van den Wittenboer 2006; methods: section 6).
 */
import { cellWords, listed } from '../statistics/model/cell-words.ts'
import type { Cell, ModelCells } from '../statistics/model/cells.ts'
import type { ResolvedCandidate } from './candidate-model.ts'
import type { CellPart } from './study.ts'

/** One parameter that the upper rung puts at its bound. */
export interface BoundaryParameter {
  part: CellPart
  of: string[]
  group: string | null
  /** The bound, and on which side of it estimates may lie. */
  at: number
  side: 'above' | 'below'
}

export interface Boundary {
  parameters: BoundaryParameter[]
  /** What lies on the boundary, as a clause. */
  words: string
}

/** null when nothing that the step adds lies on the boundary, as far as can be told from the two models. */
export function boundaryOf(
  lower: ModelCells,
  upper: ModelCells,
  lowerCandidate: ResolvedCandidate,
  upperCandidate: ResolvedCandidate
): Boundary | null {
  const merged = mergedPair(lowerCandidate, upperCandidate)
  if (merged !== null) {
    const parameters = lower.groups.map((group) => ({
      part: 'factor covariance' as const,
      of: merged,
      group: group.name,
      at: 1,
      side: 'below' as const
    }))
    return { parameters, words: `${merged[0]} and ${merged[1]} become one factor, which puts their correlation at 1` }
  }
  if (JSON.stringify(lower.factors) !== JSON.stringify(upper.factors)) return null
  const parameters = lower.groups.flatMap((group, g) => fixedAtBound(lower, group, upper.groups[g]!))
  if (parameters.length === 0) return null
  const cells = parameters.map(({ part, of, group, at }) => `${cellWords(part, of, group)} is fixed at ${at}`)
  return { parameters, words: listed(cells) }
}

type Group = ModelCells['groups'][number]

/** Cells free in the lower group and fixed at their bound in the upper one. */
function fixedAtBound({ indicators, factors }: ModelCells, lower: Group, upper: Group): BoundaryParameter[] {
  const found: BoundaryParameter[] = []
  const freed = (before: Cell, after: Cell, at: number) => typeof before === 'string' && after === at
  const add = (part: CellPart, of: string[], at: number, side: 'above' | 'below') =>
    found.push({ part, of, group: lower.name, at, side })
  indicators.forEach((name, i) => {
    if (freed(lower.residualCovariances[i]![i]!, upper.residualCovariances[i]![i]!, 0)) add('residual variance', [name], 0, 'above')
  })
  factors.forEach((name, k) => {
    if (freed(lower.factorCovariances[k]![k]!, upper.factorCovariances[k]![k]!, 0)) add('factor variance', [name], 0, 'above')
    for (let l = 0; l < k; l++) {
      const unit = [lower, upper].every((group) => group.factorCovariances[k]![k] === 1 && group.factorCovariances[l]![l] === 1)
      if (!unit) continue
      for (const at of [1, -1]) {
        const [before, after] = [lower.factorCovariances[k]![l]!, upper.factorCovariances[k]![l]!]
        if (freed(before, after, at)) add('factor covariance', [factors[l]!, name], at, at > 0 ? 'below' : 'above')
      }
    }
  })
  return found
}

/** The two factors of the lower candidate that the upper has as one; null for any other change of factors. */
function mergedPair(lower: ResolvedCandidate, upper: ResolvedCandidate): [string, string] | null {
  if (lower.factors.length !== upper.factors.length + 1) return null
  const set = (names: readonly string[]) => JSON.stringify([...names].sort())
  const gone = lower.factors.filter((f) => !upper.factors.some((other) => set(other.measures) === set(f.measures)))
  const come = upper.factors.filter((f) => !lower.factors.some((other) => set(other.measures) === set(f.measures)))
  if (gone.length !== 2 || come.length !== 1) return null
  const [first, second] = gone
  return set([...first!.measures, ...second!.measures]) === set(come[0]!.measures) ? [first!.name, second!.name] : null
}
