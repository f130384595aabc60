/** Effect sizes laid out by pair of groups. Pure. */
import type { EffectSizeView, RefusedComparison } from '../../src-main/operations/contract.ts'

export interface PairOfGroups {
  reference: string
  focal: string
  /** Those that differ, largest dMACS first. */
  apart: EffectSizeView[]
  /** Those that the candidate holds to be measured alike. */
  alike: string[]
}

export function byPair(sizes: readonly EffectSizeView[]): PairOfGroups[] {
  const pairs = new Map<string, EffectSizeView[]>()
  for (const size of sizes) {
    const key = JSON.stringify([size.reference, size.focal])
    pairs.set(key, [...(pairs.get(key) ?? []), size])
  }
  return [...pairs.values()].map((list) => ({
    reference: list[0]?.reference ?? '',
    focal: list[0]?.focal ?? '',
    apart: list.filter(differs).sort((a, b) => (b.dmacs ?? 0) - (a.dmacs ?? 0)),
    alike: list.filter((size) => !differs(size)).map(({ indicator }) => indicator)
  }))
}

function differs({ interceptDifference, loadingDifferences }: EffectSizeView): boolean {
  return interceptDifference !== 0 || loadingDifferences.some(({ difference }) => difference !== 0)
}

/** "Force in Larch Hill and Weir Lane: no intercepts are held equal." */
export function refusalInWords({ factor, from, group, reason }: RefusedComparison): string {
  return `${factor} in ${from} and ${group} cannot be compared: ${reason.replace(/[.]?$/, '.')}`
}
