/** A family's relations laid out for reading. Pure. */
import type { CandidateResult, FamilyRelation, FamilyRelations, StudyView } from '../../src-main/operations/contract.ts'
import { newLadderName, resultOf } from '../state/look-up.ts'

/** The sentences apart: what is said first, and what stands beside the ladders. Those of the ladders are drawn instead. */
export function partsOf({ sentences, chains, equivalent, off, without }: FamilyRelations): { lead: string[]; beside: string[] } {
  const beside = equivalent.length + off.length + (without.length > 0 ? 1 : 0)
  const lead = sentences.length - chains.length - beside
  return { lead: sentences.slice(0, lead), beside: sentences.slice(lead + chains.length) }
}

/** The ladder that stands with just these rungs; null where there is none. */
export function standingAs(view: StudyView, chain: readonly string[]): string | null {
  const rungs = JSON.stringify(chain)
  const listed = view.ladders.find((ladder) => 'rungs' in ladder && JSON.stringify(ladder.rungs) === rungs)
  const climbed = view.result.ladders.find((ladder) => JSON.stringify(ladder.rungs) === rungs)
  return listed?.name ?? climbed?.name ?? null
}

/** "Three factors to One factor" */
export function nameFor(view: StudyView, chain: readonly string[]): string {
  return newLadderName(view, `${chain[0]} to ${chain.at(-1)}`)
}

export interface UnnestedPair {
  /** The one with the larger AIC weight first. */
  favoured: string
  other: string
  /** How many times the weight of the favoured one is that of the other, by AIC and by BIC; null where it has none. */
  aic: number | null
  bic: number | null
}

/** Pairs that no difference test compares, the closest first. */
export function unnestedPairs(view: StudyView, relations: readonly FamilyRelation[]): UnnestedPair[] {
  return relations
    .filter(({ relation }) => relation === 'not nested')
    .flatMap(({ lower, upper }) => {
      const [a, b] = [resultOf(view, lower), resultOf(view, upper)]
      if (a === null || b === null) return []
      const [favoured, other] = (a.aic ?? 0) <= (b.aic ?? 0) ? [a, b] : [b, a]
      return [
        { favoured: favoured.name, other: other.name, aic: ratio(favoured, other, 'aic'), bic: ratio(favoured, other, 'bic') }
      ]
    })
    .sort((a, b) => (a.aic ?? Infinity) - (b.aic ?? Infinity))
}

/** The ratio of their weights, taken from the criteria themselves: a weight may be too small for a number. */
function ratio(favoured: CandidateResult, other: CandidateResult, criterion: 'aic' | 'bic'): number | null {
  const [a, b] = [favoured[criterion], other[criterion]]
  return a === null || b === null ? null : Math.exp((b - a) / 2)
}
