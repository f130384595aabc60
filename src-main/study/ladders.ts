/**
 * Ladders as they are planned: listed rungs, or the invariance steps of one candidate, which generate their own
 * (methods: section 7): same pattern, equal loadings, equal intercepts, equal residual variances.
 */
import { InputError } from './input-error.ts'
import { type Candidate, type EqualSet, type InvarianceLevel, invarianceLevels, type LadderPlan } from './study.ts'

const heldAt: Record<InvarianceLevel, EqualSet[]> = {
  configural: [],
  metric: ['loadings'],
  scalar: ['loadings', 'intercepts'],
  strict: ['loadings', 'intercepts', 'residual variances']
}

/** The candidates an invariance ladder brings with it, bottom first; none for a listed ladder. */
export function ladderCandidates(ladder: LadderPlan, family: readonly Candidate[]): Candidate[] {
  if ('rungs' in ladder) return []
  if (!family.some((c) => c.name === ladder.invarianceOf)) {
    throw new InputError(`there is no candidate "${ladder.invarianceOf}"`, { where: `ladder "${ladder.name}"` })
  }
  const levels = invarianceLevels.slice(0, invarianceLevels.indexOf(ladder.through) + 1)
  return levels.map((level) => ({
    name: rungName(ladder.invarianceOf, level),
    from: ladder.invarianceOf,
    factors: null,
    scaling: null,
    factorCovariances: null,
    across: ladder.across,
    equalAcrossGroups: heldAt[level],
    except: [],
    change: []
  }))
}

function rungName(base: string, level: InvarianceLevel): string {
  return `${base}, ${level}`
}

/** Names of a ladder's rungs, bottom first. */
export function ladderRungs(ladder: LadderPlan, family: readonly Candidate[]): string[] {
  return 'rungs' in ladder ? ladder.rungs : ladderCandidates(ladder, family).map((c) => c.name)
}
