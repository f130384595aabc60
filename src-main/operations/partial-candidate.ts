/**
 * Candidates in which some cells are let go from their equality across groups (partial invariance): derived by hand, or found
 * by the search of release-search.ts.
 */
import { canonicalJson } from '../project/canonical-json.ts'
import { cellWords, listed } from '../statistics/model/cell-words.ts'
import { resolveCandidate } from '../study/candidate-model.ts'
import { type Candidate, type CellPart, type EqualSet, type Release, setOfPart } from '../study/study.ts'
import type { Family } from './family.ts'

/**
 * `base` with these cells let go, under a name that says which. A candidate of the family that says the same is returned as it
 * is; another one that only has the name makes this one count on.
 */
export function partialCandidate(base: Candidate, releases: readonly Release[], family: Family): Candidate {
  const { equal } = resolveCandidate(base.name, family.candidates)
  const content = withReleases(base, releases, family.generated.has(base.name))
  const wanted = `${base.name} but for ${releasesWords(releases, equal.at(-1) ?? null)}`
  for (let count = 1; ; count++) {
    const candidate = { ...content, name: count === 1 ? wanted : `${wanted} (${count})` }
    const there = family.candidates.find(({ name }) => name === candidate.name)
    if (there === undefined || canonicalJson(there) === canonicalJson(candidate)) return there ?? candidate
  }
}

/** What a ladder generated is replaced rather than derived from: its own words are repeated with the releases added. */
function withReleases(base: Candidate, releases: readonly Release[], generated: boolean): Candidate {
  if (generated) return { ...base, except: [...base.except, ...releases] }
  return {
    name: base.name,
    from: base.name,
    factors: null,
    scaling: null,
    factorCovariances: null,
    across: null,
    equalAcrossGroups: null,
    except: [...releases],
    change: []
  }
}

/** Whether the candidate holds the parts of these cells equal across groups, so that they can be let go. */
export function holdsEqual(base: Candidate, releases: readonly Release[], family: Family): boolean {
  const { equal } = resolveCandidate(base.name, family.candidates)
  return releases.every(({ cell }) => equal.includes(setOfPart[cell.part]))
}

/** Parts that an indicator has one of each of (but for cross-loadings): its name says which is meant. */
const pluralOf: Partial<Record<CellPart, string>> = {
  loading: 'loadings',
  intercept: 'intercepts',
  'residual variance': 'residual variances'
}

/** "taps and coldness in Weir Lane" where the part is the one that the candidate holds equal last, else "the intercepts of ...". */
function releasesWords(releases: readonly Release[], last: EqualSet | null): string {
  const heaps = new Map<string, Release[]>()
  for (const release of releases) {
    const key = JSON.stringify([release.cell.part, release.group])
    heaps.set(key, [...(heaps.get(key) ?? []), release])
  }
  return [...heaps.values()].map((heap) => heapWords(heap, last)).join(', ')
}

/** Releases of one part in one group. */
function heapWords(heap: readonly Release[], last: EqualSet | null): string {
  const { cell, group } = heap[0]!
  const plural = pluralOf[cell.part]
  if (plural === undefined || (heap.length === 1 && setOfPart[cell.part] !== last)) {
    return listed(heap.map((release) => cellWords(release.cell.part, release.cell.of, release.group)))
  }
  const names = listed(heap.map((release) => release.cell.of[0]!))
  const what = setOfPart[cell.part] === last ? names : `the ${plural} of ${names}`
  return group === null ? what : `${what} in ${group}`
}
