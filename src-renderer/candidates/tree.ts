/** The family as a tree by derivation, flattened in reading order. Pure. */
import type { CandidateView } from '../../src-main/operations/contract.ts'

export interface TreeRow {
  entry: CandidateView
  depth: number
}

/** Parents before their children, in the study's order; one whose parent is unknown or in a circle stands at the root. */
export function treeRows(candidates: readonly CandidateView[]): TreeRow[] {
  const names = new Set(candidates.map((entry) => entry.candidate.name))
  const children = new Map<string | null, CandidateView[]>()
  for (const entry of candidates) {
    const parent = entry.candidate.from !== null && names.has(entry.candidate.from) ? entry.candidate.from : null
    children.set(parent, [...(children.get(parent) ?? []), entry])
  }
  const rows: TreeRow[] = []
  const placed = new Set<string>()
  const place = (entry: CandidateView, depth: number): void => {
    if (placed.has(entry.candidate.name)) return
    placed.add(entry.candidate.name)
    rows.push({ entry, depth })
    for (const child of children.get(entry.candidate.name) ?? []) place(child, depth + 1)
  }
  for (const root of children.get(null) ?? []) place(root, 0)
  for (const entry of candidates) place(entry, 0)
  return rows
}
