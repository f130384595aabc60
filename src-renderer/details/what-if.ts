/** Score tests as the window lists them, and how one becomes a derived candidate. Pure; nothing is computed. */
import type { CandidateResult, CellName, ScoreTestView } from '../../src-main/operations/contract.ts'
import type { DerivationStart } from '../candidates/derive.ts'

export interface WhatIfSection {
  plausibility: ScoreTestView['plausibility']
  title: string
  /** What the tests have in common. */
  note: string
  tests: ScoreTestView[]
}

const sections: readonly Omit<WhatIfSection, 'tests'>[] = [
  { plausibility: 'stated', title: 'Stated in this candidate', note: 'Equalities and values that somebody chose.' },
  { plausibility: 'near', title: 'Often overlooked', note: 'Second loadings, and residuals shared within a factor.' },
  { plausibility: 'far', title: 'The rest', note: 'Seldom to be justified by content.' }
]

/** In the order the tests come in; of several groups only those of `group`, and what belongs to no group. */
export function whatIfSections(tests: readonly ScoreTestView[], group: string | null): WhatIfSection[] {
  const own = tests.filter((test) => group === null || test.group === null || test.group === group)
  return sections
    .map((section) => ({ ...section, tests: own.filter((test) => test.plausibility === section.plausibility) }))
    .filter((section) => section.tests.length > 0)
}

/** Groups that the tests speak of, in the candidate's order. */
export function whatIfGroups(tests: readonly ScoreTestView[], groups: readonly (string | null)[]): (string | null)[] {
  return groups.filter((group) => tests.some((test) => test.group === group))
}

/**
 * The candidate without the tested restriction: of an equality across groups a release, of a fixed cell or an equality
 * within groups the cell freed. Null for an equation, which no single cell stands for.
 */
export function freed(test: ScoreTestView, result: CandidateResult): DerivationStart | null {
  if (test.kind === 'constraint') return null
  const cell: CellName = { part: test.part, of: test.of }
  const name = `${result.name}, but for ${test.words}`
  return test.kind === 'equality' && isAcrossGroups(test, result)
    ? { name, changes: [], releases: [{ cell, group: test.group }] }
    : { name, changes: [{ do: 'free', cell, group: test.group }], releases: [] }
}

/** An equality runs across groups when the same cell of another group carries the same letter. */
function isAcrossGroups(test: ScoreTestView, { estimates }: CandidateResult): boolean {
  return estimates.some(
    (other) =>
      other.label === test.label &&
      other.part === test.part &&
      other.group !== test.group &&
      other.of.join('\n') === test.of.join('\n')
  )
}
