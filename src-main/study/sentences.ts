/**
 * Candidates and what separates them, in words.
 */
import { cellWords, listed } from '../statistics/model/cell-words.ts'
import { type ResolvedCandidate, resolveCandidate } from './candidate-model.ts'
import type { Candidate, Change, EqualSet, Release } from './study.ts'

/** What a candidate is, in one sentence: its factors, or what differs from its parent. */
export function candidateSentence(candidate: Candidate): string {
  const parts = ownParts(candidate)
  if (candidate.from !== null) {
    return parts.length === 0 ? `The same as ${candidate.from}.` : `From ${candidate.from}: ${parts.join('; ')}.`
  }
  const factors = (candidate.factors ?? []).map((f) => `${f.name} (${f.measures.join(', ')})`)
  const several = factors.length > 1 ? (candidate.factorCovariances === 'zero' ? ', uncorrelated' : ', correlated') : ''
  return `${[listed(factors, factors.length) + several, ...parts].join('; ')}.`
}

/** What a candidate itself says beside its factors, each part a clause. */
function ownParts(candidate: Candidate): string[] {
  const parts: string[] = []
  if (candidate.from !== null) {
    if (candidate.scaling !== null) parts.push(`scaled by ${candidate.scaling}`)
    if (candidate.factorCovariances !== null) parts.push(`factor covariances ${candidate.factorCovariances}`)
  }
  if (candidate.across !== null || candidate.equalAcrossGroups !== null) {
    parts.push(acrossWords(candidate.across, candidate.equalAcrossGroups ?? []))
  }
  if (candidate.except.length > 0) parts.push(`except ${listed(candidate.except.map(releaseWords), candidate.except.length)}`)
  return [...parts, ...candidate.change.map(changeWords)]
}

function acrossWords(across: string | null, equal: readonly EqualSet[]): string {
  const where = across === null ? 'across groups' : `across ${across}`
  return equal.length === 0 ? `the same pattern ${where}` : `equal ${listed(equal, equal.length)} ${where}`
}

function releaseWords({ cell, group }: Release): string {
  return cellWords(cell.part, cell.of, group)
}

/** One change as a clause: "the residual covariance of a with b is free". */
export function changeWords(change: Change): string {
  switch (change.do) {
    case 'free':
      return `${cellWords(change.cell.part, change.cell.of, change.group)} is free`
    case 'fix':
      return `${cellWords(change.cell.part, change.cell.of, change.group)} is fixed at ${change.at}`
    case 'equal': {
      const cells = change.cells.map((cell) => cellWords(cell.part, cell.of))
      return `${listed(cells, cells.length)} are equal${change.group === null ? '' : ` in ${change.group}`}`
    }
  }
}

/** What the upper rung adds to the lower, in words; `constraints` is the difference in df. */
export function addsWords(lower: string, upper: string, family: readonly Candidate[], constraints: number | null): string {
  const from = resolveCandidate(lower, family)
  const to = resolveCandidate(upper, family)
  const own =
    derivedWords(lower, upper, family) ?? undoneWords(lower, upper, family) ?? equalityWords(from, to) ?? factorWords(from, to)
  if (own !== null) return own
  if (constraints === null || constraints <= 0) return 'another candidate'
  return constraints === 1 ? 'one constraint' : `${constraints} constraints`
}

/** Upper comes from lower by one derivation or more: its clauses. */
function derivedWords(lower: string, upper: string, family: readonly Candidate[]): string | null {
  const parts: string[][] = []
  for (let at = family.find((c) => c.name === upper); at !== undefined; at = family.find((c) => c.name === at?.from)) {
    if (at.name === lower) return parts.length === 0 ? null : parts.reverse().flat().join('; ')
    if (at.factors !== null) return null
    parts.push(ownParts(at))
  }
  return null
}

/** Lower comes from upper by changes alone: each is undone. */
function undoneWords(lower: string, upper: string, family: readonly Candidate[]): string | null {
  const at = family.find((c) => c.name === lower)
  if (at === undefined || at.from !== upper || at.change.length === 0 || at.except.length > 0 || at.equalAcrossGroups !== null)
    return null
  const words = at.change.map((change) =>
    change.do === 'free' ? `without ${cellWords(change.cell.part, change.cell.of, change.group)}` : `not: ${changeWords(change)}`
  )
  return words.join('; ')
}

/** The same model with more held equal across groups, or fewer exceptions. */
function equalityWords(from: ResolvedCandidate, to: ResolvedCandidate): string | null {
  if (JSON.stringify([from.factors, from.changes, from.across]) !== JSON.stringify([to.factors, to.changes, to.across])) return null
  const added = to.equal.filter((set) => !from.equal.includes(set))
  const kept = from.except.filter((r) => !to.except.some((other) => JSON.stringify(other) === JSON.stringify(r)))
  const exceptions = to.except.length > 0 ? ` except ${listed(to.except.map(releaseWords), to.except.length)}` : ''
  if (added.length > 0) return `${acrossWords(to.across, added)}${exceptions}`
  if (kept.length > 0) return `no longer released: ${listed(kept.map(releaseWords), kept.length)}`
  return null
}

function factorWords(from: ResolvedCandidate, to: ResolvedCandidate): string | null {
  if (JSON.stringify(from.factors) === JSON.stringify(to.factors)) return null
  const before = from.factors.map((f) => f.name)
  const after = to.factors.map((f) => f.name)
  const gone = before.filter((name) => !after.includes(name))
  const come = after.filter((name) => !before.includes(name))
  if (gone.length > 0 && come.length > 0) return `${listed(come)} in place of ${listed(gone)}`
  if (gone.length > 0) return `without ${listed(gone)}`
  if (come.length > 0) return `with ${listed(come)}`
  return 'indicators assigned to factors otherwise'
}
