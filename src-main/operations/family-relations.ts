/**
 * How all fitted candidates of the study stand to each other, and the ladders that are in that order. Settled off the
 * calling thread; what refitting proved is kept while the project is open.
 */
import type { Project } from '../project/project.ts'
import { quoted } from '../project/sentences.ts'
import { counted } from '../reporting/numbers.ts'
import { familyChains } from '../statistics/comparison/chains.ts'
import type { FamilyMember, FamilyOrder, KnownPair } from '../statistics/comparison/partial-order.ts'
import { listed } from '../statistics/model/cell-words.ts'
import type { RelationOutcome } from '../workers/jobs.ts'
import type { Bench } from './bench.ts'
import { momentsKey } from './climb.ts'
import type { FamilyRelations, Operations } from './contract.ts'
import { digestOf, type Entry, entriesOf } from './entries.ts'
import { familyOf } from './family.ts'

/** Candidates without a solution are named and left out. Those on different indicators or groups have no order among them. */
export async function familyRelations(
  bench: Bench,
  _input: Operations['familyRelations']['input']
): Promise<Operations['familyRelations']['result']> {
  const project = bench.requireProject()
  const plan = project.plan()
  const entries = entriesOf(plan, project.data(), bench.parts.version, familyOf(plan))
  const solved = entries.flatMap((entry) => {
    const member = memberOf(entry, project)
    return member === null ? [] : [{ entry, member }]
  })
  const parts: FamilyRelations[] = []
  for (const set of setsOf(solved)) parts.push(await relationsOf(set, project, bench))
  const without = entries.filter((entry) => !solved.some((one) => one.entry === entry)).map((entry) => entry.candidate.name)
  return merged(parts, without)
}

interface Solved {
  entry: Entry
  member: FamilyMember
}

function memberOf({ cells, digest }: Entry, project: Project): FamilyMember | null {
  const outcome = project.fits().get(digest)
  if (outcome?.gamma == null || outcome.fit.state !== 'fitted' || outcome.fit.T === null) return null
  return { cells, gamma: outcome.gamma, T: outcome.fit.T }
}

/** Candidates on the same indicators and groups, in the order of the family. */
function setsOf(solved: readonly Solved[]): Solved[][] {
  const sets = new Map<string, Solved[]>()
  for (const one of solved) {
    const key = momentsKey(one.entry)
    sets.set(key, [...(sets.get(key) ?? []), one])
  }
  return [...sets.values()]
}

async function relationsOf(set: readonly Solved[], project: Project, bench: Bench): Promise<FamilyRelations> {
  const name = (at: number) => set[at]!.entry.candidate.name
  const order = await bench.parts.crew.familyOrder({
    kind: 'family order',
    members: set.map(({ member }) => member),
    sizes: set[0]!.entry.sample.moments.groups.map((g) => g.n),
    known: knownPairs(set, project)
  })
  remember(order, set, project)
  const { chains, equivalent, off } = familyChains(set.length, order.pairs)
  return {
    relations: order.pairs.map(({ general, restricted, relation, proof }) => ({
      lower: name(general),
      upper: name(restricted),
      relation,
      proof
    })),
    chains: chains.map((chain) => chain.map(name)),
    equivalent: equivalent.map((members) => members.map(name)),
    off: off.map(name),
    without: [],
    sentences: []
  }
}

/** What refitting has settled, by the digests of both candidates, for each open project. */
const settled = new WeakMap<Project, Map<string, RelationOutcome>>()

function settledIn(project: Project): Map<string, RelationOutcome> {
  const known = settled.get(project) ?? new Map<string, RelationOutcome>()
  settled.set(project, known)
  return known
}

/** The same digest as a ladder's step has, so that what is recorded of steps is known here. */
function pairDigest(general: Entry, restricted: Entry): string {
  return digestOf({ general: general.digest, restricted: restricted.digest })
}

function knownPairs(set: readonly Solved[], project: Project): KnownPair[] {
  const recorded = project.relations()
  const known = settledIn(project)
  return set.flatMap(({ entry: lower }, general) =>
    set.flatMap(({ entry: upper }, restricted): KnownPair[] => {
      if (general === restricted) return []
      const digest = pairDigest(lower, upper)
      const outcome = known.get(digest) ?? recorded.get(digest)
      if (outcome === undefined) return []
      const { relation, proof } = outcome
      return relation === 'reversed'
        ? [{ general: restricted, restricted: general, relation: 'nested', proof }]
        : [{ general, restricted, relation, proof }]
    })
  )
}

function remember({ pairs }: FamilyOrder, set: readonly Solved[], project: Project): void {
  const known = settledIn(project)
  for (const { general, restricted, relation, proof } of pairs) {
    if (proof === 'refit') known.set(pairDigest(set[general]!.entry, set[restricted]!.entry), { relation, proof })
  }
}

function merged(parts: readonly FamilyRelations[], without: string[]): FamilyRelations {
  const found = {
    relations: parts.flatMap((part) => part.relations),
    chains: parts.flatMap((part) => part.chains).sort((a, b) => b.length - a.length),
    equivalent: parts.flatMap((part) => part.equivalent),
    off: parts.flatMap((part) => part.off),
    without
  }
  return { ...found, sentences: sentencesOf(found, parts.length) }
}

function quotedList(names: readonly string[]): string {
  return listed(names.map(quoted), names.length)
}

/** What was found, in whole sentences: the count, then the ladders, then what stands beside them. */
function sentencesOf({ relations, chains, equivalent, off, without }: Omit<FamilyRelations, 'sentences'>, sets: number): string[] {
  const count = (relation: string) => relations.filter((pair) => pair.relation === relation).length
  const pairs = `Of ${counted(relations.length, 'pair', 'pairs')} of fitted candidates on the same data, ${counted(count('nested'), 'is', 'are')} nested, ${counted(count('equivalent'), 'is', 'are')} equivalent and ${counted(count('not nested'), 'is', 'are')} neither.`
  return [
    ...(relations.length === 0 ? ['No two fitted candidates describe the same data, so none can be nested in another.'] : [pairs]),
    ...(sets > 1
      ? [`The candidates fall into ${sets} sets by the indicators and groups they describe; nothing can be nested across them.`]
      : []),
    ...chains.map(
      (chain) => `A ladder, least restrictive first: ${chain.map(quoted).join(', ')}; each is nested in the one before it.`
    ),
    ...equivalent.map(
      (names) =>
        `${quotedList(names)} are equivalent: the same degrees of freedom and the same fit, so no data can tell them apart; on a ladder one stands for ${names.length === 2 ? 'both' : 'all'}.`
    ),
    ...off.map((name) => `${quoted(name)} is off every ladder: it is nested in no other candidate, and none is nested in it.`),
    ...(without.length > 0
      ? [
          `How ${quotedList(without)} ${without.length === 1 ? 'stands' : 'stand'} to the others is not known, for want of a solution.`
        ]
      : [])
  ]
}
