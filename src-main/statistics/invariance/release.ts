/**
 * One round of the search for the equalities that a failed step should not have asked for (partial invariance: Byrne,
 * Shavelson & Muthén 1989; methods: section 7). The stated rule:
 *
 *     the equalities that the step added, one group's cell at a time, by their score tests (Sörbom 1989);
 *     only those that leave every two groups at least two indicators of each factor concerned that are kept equal;
 *     adjusted over these (Holm), the largest significant one is let go. The model is then refitted, and so on.
 *
 * Score tests by the expected information do not depend on how factors are scaled, so neither does the rule, as long
 * as a reference indicator's loading, which is fixed for the sake of the scale alone, is tested beside the free ones.
 */
import type { ScoreTest } from '../estimation/score-tests.ts'
import { cellWords } from '../model/cell-words.ts'
import type { Cell, CellPart, GroupCells, ModelCells } from '../model/cells.ts'
import { type Alike, anchors } from './anchors.ts'

/** How many of a factor's indicators must stay equal between any two groups. */
export const keptAnchors = 2

/** One group's cell that the step ties to the other groups', and what letting it go would do. */
export interface ReleaseCandidate {
  part: CellPart
  of: string[]
  group: string
  /** The cell in words. */
  words: string
  statistic: number
  p: number
  /** Over the candidates that may be let go; null for one that may not. */
  adjustedP: number | null
  /** Expected distance from the value of the other groups, once it is let go. */
  change: number
  standardizedChange: number | null
  /** Why it may not be let go; null when it may. */
  kept: string | null
}

export interface ReleaseRound {
  /** Largest statistic first. */
  candidates: ReleaseCandidate[]
  /** The one to let go; null when none that may be let go is significant. */
  chosen: ReleaseCandidate | null
}

export interface ReleaseRule {
  alpha: number
  /** Adjusted p-values in the order given. */
  adjust: (pValues: readonly number[]) => number[]
}

/**
 * @param lower the model below the step, @param upper the model that the tests are of: above it, with what was let go already
 * @param tests all score tests of `upper`
 */
export function releaseRound(
  lower: ModelCells,
  upper: ModelCells,
  tests: readonly ScoreTest[],
  { alpha, adjust }: ReleaseRule
): ReleaseRound {
  const added = stepTests(lower, upper, tests).sort((a, b) => b.statistic - a.statistic)
  const kept = added.map((test) => reasonToKeep(upper, test))
  const open = added.filter((_, i) => kept[i] === null)
  const adjusted = adjust(open.map((test) => test.p))
  const candidates = added.map((test, i): ReleaseCandidate => {
    const { part, of, statistic, p, change, standardizedChange } = test
    const group = test.group!
    const adjustedP = kept[i] === null ? adjusted[open.indexOf(test)]! : null
    return {
      part,
      of,
      group,
      words: cellWords(part, of, group),
      statistic,
      p,
      adjustedP,
      change,
      standardizedChange,
      kept: kept[i]!
    }
  })
  return { candidates, chosen: candidates.find(({ adjustedP }) => adjustedP !== null && adjustedP < alpha) ?? null }
}

/**
 * The tests of what the step ties across groups: equalities that it added; cells that it fixed at one number in all groups,
 * because one group's was fixed for the sake of the scale; and reference loadings of factors whose loadings it made equal.
 */
function stepTests(lower: ModelCells, upper: ModelCells, tests: readonly ScoreTest[]): ScoreTest[] {
  const equalities = tests.filter((test) => {
    if (test.kind !== 'equality' || test.group === null) return false
    return isTied(upper, test) && !isTied(lower, test)
  })
  const tied = new Set(equalities.filter(({ part }) => isLoading(part)).map(({ of }) => of[1]))
  const fixed = tests.filter((test) => {
    if (test.kind !== 'fixed cell' || !isFixedAlike(upper, test)) return false
    return isLoading(test.part) ? tied.has(test.of[1]) && isReference(upper, test) : isFreeSomewhere(lower, test)
  })
  return [...equalities, ...fixed]
}

function isLoading(part: CellPart): boolean {
  return part === 'loading' || part === 'factor regression'
}

type Place = Pick<ScoreTest, 'part' | 'of' | 'group'>

/** Whether the cell shares its parameter with the same cell of another group. */
function isTied(cells: ModelCells, { part, of, group }: Place): boolean {
  const own = cells.groups.find(({ name }) => name === group)
  const cell = own === undefined ? undefined : cellAt(cells, own, part, of)
  return typeof cell === 'string' && cells.groups.some((other) => other !== own && cellAt(cells, other, part, of) === cell)
}

/**
 * Fixed at the same number in all groups. Of two groups the later one stands for both: it is one equality, whichever side
 * is let go.
 */
function isFixedAlike(cells: ModelCells, { part, of, group }: Place): boolean {
  const values = valuesAt(cells, part, of)
  const alike = values.every((value) => typeof value === 'number' && value === values[0])
  return alike && (cells.groups.length > 2 || group === cells.groups.at(-1)!.name)
}

function isFreeSomewhere(cells: ModelCells, { part, of }: Place): boolean {
  return valuesAt(cells, part, of).some((value) => typeof value === 'string')
}

function isReference(cells: ModelCells, { part, of }: Place): boolean {
  return valuesAt(cells, part, of)[0] !== 0
}

function valuesAt(cells: ModelCells, part: CellPart, of: readonly string[]): (Cell | undefined)[] {
  return cells.groups.map((group) => cellAt(cells, group, part, of))
}

function cellAt({ indicators, factors }: ModelCells, group: GroupCells, part: CellPart, of: readonly string[]): Cell | undefined {
  const indicator = (k: number) => indicators.indexOf(of[k]!)
  const factor = (k: number) => factors.indexOf(of[k]!)
  switch (part) {
    case 'loading':
      return group.loadings[indicator(0)]?.[factor(1)]
    case 'factor regression':
      return group.regressions[factor(0)]?.[factor(1)]
    case 'factor variance':
      return group.factorCovariances[factor(0)]?.[factor(0)]
    case 'factor covariance':
      return group.factorCovariances[factor(0)]?.[factor(1)]
    case 'residual variance':
      return group.residualCovariances[indicator(0)]?.[indicator(0)]
    case 'residual covariance':
      return group.residualCovariances[indicator(0)]?.[indicator(1)]
    case 'intercept':
      return group.intercepts?.[indicator(0)]
    case 'factor mean':
      return group.factorMeans?.[factor(0)]
  }
}

/** Null when every two groups keep enough anchors of each factor that the cell's indicator measures. */
function reasonToKeep(cells: ModelCells, { part, of, group }: Place): string | null {
  const alike = alikeFor(part)
  if (alike === null) return null
  const g = cells.groups.findIndex(({ name }) => name === group)
  for (const [k, factor] of cells.factors.entries()) {
    if (!measures(cells, k, of[0]!) || (isLoading(part) && of[1] !== factor)) continue
    for (const [h, other] of cells.groups.entries()) {
      if (h === g) continue
      const before = anchors(cells, k, [g, h], alike)
      const left = before.filter((name) => name !== of[0]).length
      if (left >= keptAnchors || left === before.length) continue
      return `it would leave ${factor} ${left === 0 ? 'no indicator' : 'one indicator only'} that ${group} and ${other.name} have in common`
    }
  }
  return null
}

/** What must stay alike when a cell of this part is let go; null for parts that anchor nothing. */
function alikeFor(part: CellPart): Alike | null {
  if (isLoading(part)) return 'loadings'
  if (part === 'intercept') return 'intercepts'
  return part === 'residual variance' ? 'residual variances' : null
}

function measures({ indicators, factors, groups }: ModelCells, factor: number, name: string): boolean {
  const [i, k] = [indicators.indexOf(name), factors.indexOf(name)]
  return groups.some((group) => (i >= 0 ? group.loadings[i]![factor] !== 0 : k >= 0 && group.regressions[k]![factor] !== 0))
}
