/** A derived candidate from what is typed in its dialog. Pure. */
import type { Candidate, CandidateView, Change, EqualSet, Release } from '../../src-main/operations/contract.ts'

export interface Derivation {
  name: string
  changes: Change[]
  releases: Release[]
  /** What is held equal across groups, where it differs from the parent's; else null. */
  across: { grouping: string; equal: EqualSet[] } | null
}

/** What the dialog starts with: what is let go of the selected candidate. */
export type DerivationStart = Omit<Derivation, 'across'>

/**
 * The candidate in the contract's words. A rung that an invariance ladder made stands in no plan by itself, so what is
 * derived from it is written as derived from the candidate behind it, with all that the rung says.
 */
export function derive(parent: CandidateView, { name, changes, releases, across }: Derivation): Candidate {
  const base = parent.generated ? parent.candidate : null
  return {
    name,
    from: base === null ? parent.candidate.name : base.from,
    factors: null,
    scaling: null,
    factorCovariances: null,
    across: across?.grouping ?? base?.across ?? null,
    equalAcrossGroups: across?.equal ?? base?.equalAcrossGroups ?? null,
    except: [...(base?.except ?? []), ...releases],
    change: [...(base?.change ?? []), ...changes]
  }
}
