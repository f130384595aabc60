/** What a step holds equal that the rung below does not, and what may be let go of it by hand. Pure. */
import type { CellPart, EqualSet, Release, ScoreTestView, StepResult, StudyView } from '../../src-main/operations/contract.ts'
import { candidateOf, newLadderName, resultOf } from '../state/look-up.ts'

const partsOf: Readonly<Record<EqualSet, readonly CellPart[]>> = {
  loadings: ['loading', 'factor regression'],
  intercepts: ['intercept'],
  'residual variances': ['residual variance'],
  'residual covariances': ['residual covariance'],
  'factor variances': ['factor variance'],
  'factor covariances': ['factor covariance'],
  'factor means': ['factor mean']
}

/** Parts that the step made equal across groups; empty where it made none, or the candidates do not say. */
export function partsAdded(view: StudyView, { from, to }: StepResult): CellPart[] {
  const below = candidateOf(view, from)?.candidate.equalAcrossGroups ?? []
  const above = candidateOf(view, to)?.candidate.equalAcrossGroups ?? []
  return above.filter((set) => !below.includes(set)).flatMap((set) => partsOf[set])
}

/** Whether something can be looked for: the step failed, and it is one of several groups that adds an equality across them. */
export function canRelease(view: StudyView, step: StepResult): boolean {
  const failed = step.verdict === 'does not hold' || step.verdict === 'criteria disagree'
  return failed && (resultOf(view, step.to)?.groups ?? 1) > 1 && partsAdded(view, step).length > 0
}

/** Of the rung's score tests, those of equalities that the step added, largest first. */
export function choices(tests: readonly ScoreTestView[], parts: readonly CellPart[]): ScoreTestView[] {
  return tests
    .filter((test) => test.kind === 'equality' && test.group !== null && parts.includes(test.part))
    .sort((a, b) => b.statistic - a.statistic)
}

export function releaseOf({ part, of, group }: ScoreTestView): Release {
  return { cell: { part, of }, group }
}

/** "Across clinics, scalar but for bags in Old Mill": without what both rungs of the step are called; counted on where it is taken. */
export function ladderNameFor(view: StudyView, ladder: string, { from, to }: StepResult, made: string): string {
  const words = to.split(', ')
  const shared = words.findIndex((word, index) => word !== from.split(', ')[index])
  const prefix = words.slice(0, Math.max(0, shared)).join(', ')
  const own = prefix !== '' && made.startsWith(`${prefix}, `) ? made.slice(prefix.length + 2) : made
  return newLadderName(view, `${ladder}, ${own}`)
}
