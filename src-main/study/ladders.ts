/**
 * Ladders as they are planned: listed rungs, or the invariance steps of one candidate, which generate their own
 * (methods: section 7): same pattern, equal loadings, equal intercepts, equal residual variances; then, on demand, equal
 * factor variances, covariances or means, each by itself on the highest of these, as ladders of two rungs.
 */
import { InputError } from './input-error.ts'
import { repeatedCandidates, repeatedNames } from './repeated.ts'
import {
  type Candidate,
  type EqualSet,
  type InvarianceLevel,
  invarianceLevels,
  type LadderPlan,
  type StructuralSet
} from './study.ts'

const heldAt: Record<InvarianceLevel, EqualSet[]> = {
  configural: [],
  metric: ['loadings'],
  scalar: ['loadings', 'intercepts'],
  strict: ['loadings', 'intercepts', 'residual variances']
}

/** The candidates an invariance ladder brings with it, bottom first, then what `and` adds; none for a listed ladder. */
export function ladderCandidates(ladder: LadderPlan, family: readonly Candidate[]): Candidate[] {
  if ('rungs' in ladder) return []
  if (!family.some((c) => c.name === ladder.invarianceOf)) {
    throw new InputError(`there is no candidate "${ladder.invarianceOf}"`, { where: `ladder "${ladder.name}"` })
  }
  if ('over' in ladder) return repeatedCandidates(ladder, family)
  const levels = invarianceLevels.slice(0, invarianceLevels.indexOf(ladder.through) + 1)
  const rung = (name: string, equalAcrossGroups: EqualSet[]): Candidate => ({
    name,
    from: ladder.invarianceOf,
    factors: null,
    scaling: null,
    factorCovariances: null,
    across: ladder.across,
    equalAcrossGroups,
    except: [],
    change: []
  })
  return [
    ...levels.map((level) => rung(rungName(ladder.invarianceOf, level), heldAt[level])),
    ...(ladder.and ?? []).map((set) =>
      rung(structuralName(ladder.invarianceOf, ladder.through, set), [...heldAt[ladder.through], set])
    )
  ]
}

function rungName(base: string, level: InvarianceLevel): string {
  return `${base}, ${level}`
}

function structuralName(base: string, level: InvarianceLevel, set: StructuralSet): string {
  return `${rungName(base, level)}, equal ${set}`
}

/** Names of all that a ladder brings with it, whether or not it can be made; none for a listed ladder. */
export function generatedNames(ladder: LadderPlan): string[] {
  if ('rungs' in ladder) return []
  if ('over' in ladder) return repeatedNames(ladder)
  const { invarianceOf, through, and } = ladder
  const levels = invarianceLevels.slice(0, invarianceLevels.indexOf(through) + 1)
  return [
    ...levels.map((level) => rungName(invarianceOf, level)),
    ...(and ?? []).map((set) => structuralName(invarianceOf, through, set))
  ]
}

/** Names of a ladder's own rungs, bottom first. */
export function ladderRungs(ladder: LadderPlan, family: readonly Candidate[]): string[] {
  if ('rungs' in ladder) return ladder.rungs
  return ladderCandidates('across' in ladder ? { ...ladder, and: undefined } : ladder, family).map((c) => c.name)
}

/** The ladders to climb: each one planned, followed by those of two rungs that it asks for with `and`. */
export function standingLadders(ladders: readonly LadderPlan[]): LadderPlan[] {
  return ladders.flatMap((ladder) => ('across' in ladder ? [ladder, ...structuralLadders(ladder)] : [ladder]))
}

function structuralLadders({ name, invarianceOf, through, and }: Extract<LadderPlan, { across: string }>): LadderPlan[] {
  return (and ?? []).map((set) => ({
    name: `${name}, ${set}`,
    rungs: [rungName(invarianceOf, through), structuralName(invarianceOf, through, set)]
  }))
}
