/**
 * Candidates and what separates them, in words.
 */
import { cellWords, listed } from '../statistics/model/cell-words.ts'
import { type ResolvedCandidate, resolveCandidate } from './candidate-model.ts'
import { changesWords, changeWords } from './change-words.ts'
import type { Candidate, Change, EqualSet, Factor, Release } from './study.ts'

/** What a candidate is, in one sentence: its factors, or what differs from its parent. */
export function candidateSentence(candidate: Candidate): string {
  const parts = ownParts(candidate)
  if (candidate.from !== null) {
    return parts.length === 0 ? `The same as ${candidate.from}.` : `From ${candidate.from}: ${parts.join('; ')}.`
  }
  return `${[factorsWords(candidate), ...parts].join('; ')}.`
}

/**
 * "F (a, b) and G (c, d), correlated"; where factors measure factors, those come after: "..., with General over F and G".
 * Whether factors are correlated is said of those that no other factor measures, where there are several.
 */
function factorsWords({ factors, factorCovariances }: Candidate): string {
  const all = factors ?? []
  const names = new Set(all.map((f) => f.name))
  const measured = new Set(all.flatMap((f) => f.measures.filter((name) => names.has(name))))
  const isHigher = (f: Factor) => f.measures.some((name) => names.has(name))
  const lower = all.filter((f) => !isHigher(f)).map((f) => `${f.name} (${f.measures.join(', ')})`)
  const higher = all.filter(isHigher).map((f) => `${f.name} over ${listed(f.measures, f.measures.length)}`)
  const words = [listed(lower, lower.length), higher.length === 0 ? null : `with ${listed(higher, higher.length)}`]
  const top = all.filter((f) => !measured.has(f.name)).map((f) => f.name)
  if (top.length > 1) {
    const who = higher.length === 0 ? '' : `${listed(top, top.length)} `
    words.push(`${who}${factorCovariances === 'zero' ? 'uncorrelated' : 'correlated'}`)
  }
  return words.filter((part) => part !== null && part !== '').join(', ')
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
  return [...parts, ...changesWords(candidate.change)]
}

function acrossWords(across: string | null, equal: readonly EqualSet[]): string {
  const where = across === null ? 'across groups' : `across ${across}`
  return equal.length === 0 ? `the same pattern ${where}` : `equal ${listed(equal, equal.length)} ${where}`
}

function releaseWords({ cell, group }: Release): string {
  return cellWords(cell.part, cell.of, group)
}

/** What the upper rung adds to the lower, in words; `constraints` is the difference in df where it is known. */
export function addsWords(lower: string, upper: string, family: readonly Candidate[], constraints: number | null): string {
  const from = resolveCandidate(lower, family)
  const to = resolveCandidate(upper, family)
  const parts = sameContent(from.factors, to.factors)
    ? [...scaleWords(from, to), ...equalityWords(from, to), ...changedWords(from.changes, to.changes)]
    : [factorWords(from, to)]
  if (parts.length > 0) return parts.join('; ')
  if (constraints === null || constraints <= 0) return 'another candidate'
  return constraints === 1 ? 'one constraint' : `${constraints} constraints`
}

function sameContent(a: unknown, b: unknown): boolean {
  return JSON.stringify(a) === JSON.stringify(b)
}

/** Items of `list` that `other` does not hold. */
function notIn<T>(list: readonly T[], other: readonly T[]): T[] {
  return list.filter((item) => !other.some((known) => sameContent(item, known)))
}

function scaleWords(from: ResolvedCandidate, to: ResolvedCandidate): string[] {
  return from.factorCovariances === to.factorCovariances ? [] : [`factor covariances ${to.factorCovariances}`]
}

/** More held equal across groups, fewer exceptions, or the reverse. */
function equalityWords(from: ResolvedCandidate, to: ResolvedCandidate): string[] {
  const parts: string[] = []
  if (from.across !== to.across) parts.push(to.across === null ? 'groups pooled' : `by ${to.across}`)
  const more = notIn(to.equal, from.equal)
  const fewer = notIn(from.equal, to.equal)
  const released = notIn(to.except, from.except).map(releaseWords)
  const kept = notIn(from.except, to.except).map(releaseWords)
  if (more.length > 0) parts.push(`equal ${listed(more, more.length)} across ${to.across ?? 'groups'}`)
  if (fewer.length > 0) parts.push(`${listed(fewer, fewer.length)} no longer equal`)
  if (released.length > 0) parts.push(`${more.length > 0 ? 'except' : 'released:'} ${listed(released, released.length)}`)
  if (kept.length > 0) parts.push(`no longer released: ${listed(kept, kept.length)}`)
  return parts
}

/** Changes that upper makes and lower does not; those of lower alone are undone. */
function changedWords(lower: readonly Change[], upper: readonly Change[]): string[] {
  const undone = notIn(lower, upper).map((change) => {
    if (change.do === 'free') return `without ${cellWords(change.cell.part, change.cell.of, change.group)}`
    if (change.do === 'fix') return `${cellWords(change.cell.part, change.cell.of, change.group)} is no longer fixed`
    if (change.do === 'bound') return `${cellWords(change.cell.part, change.cell.of, change.group)} is no longer bounded`
    if (change.do === 'constrain') return `no longer: ${changeWords(change)}`
    return changeWords(change).replace(/ are equal/, ' are no longer equal')
  })
  return [...undone, ...changesWords(notIn(upper, lower))]
}

function factorWords(from: ResolvedCandidate, to: ResolvedCandidate): string {
  const before = from.factors.map((f) => f.name)
  const after = to.factors.map((f) => f.name)
  const gone = notIn(before, after)
  const come = notIn(after, before)
  if (gone.length > 0 && come.length > 0) return `${listed(come)} in place of ${listed(gone)}`
  if (gone.length > 0) return `without ${listed(gone)}`
  if (come.length > 0) return `with ${listed(come)}`
  return 'indicators assigned to factors otherwise'
}
