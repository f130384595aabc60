/** Estimates laid out for reading: by part, loadings by factor, with the scale of the small pictures. Formatting only. */
import type { CandidateResult, CellPart, EstimateResult } from '../../src-main/operations/contract.ts'
import { partTitles } from '../state/words.ts'

export interface EstimateRow {
  name: string
  estimate: EstimateResult
  /** The 95% interval; null for a fixed cell or where no standard error could be had. */
  interval: { lower: number; upper: number } | null
}
export interface EstimateBlock {
  /** The factor, for loadings and regressions; else null. */
  of: string | null
  rows: EstimateRow[]
}
export interface EstimateSection {
  part: CellPart
  title: string
  blocks: EstimateBlock[]
  /** What the pictures' width stands for; null when no row has an interval. */
  scale: { from: number; to: number } | null
}

const order: readonly CellPart[] = [
  'loading',
  'factor regression',
  'factor covariance',
  'factor variance',
  'factor mean',
  'intercept',
  'residual variance',
  'residual covariance'
]

/** The sections of one group (null: of a study without groups). */
export function estimateSections(estimates: readonly EstimateResult[], group: string | null): EstimateSection[] {
  const own = estimates.filter((estimate) => estimate.group === group)
  return order
    .map((part) =>
      section(
        part,
        own.filter((estimate) => estimate.part === part)
      )
    )
    .filter((one) => one.blocks.length > 0)
}

/** Where the standard errors come from, in words. */
export function errorsInWords(kind: NonNullable<CandidateResult['standardErrors']>): string {
  switch (kind) {
    case 'expected':
      return 'from the expected information'
    case 'observed':
      return 'from the observed information'
    case 'robust':
      return 'robust (sandwich), valid without normality'
  }
}

/** Groups that estimates speak of, in order. */
export function estimateGroups(estimates: readonly EstimateResult[]): (string | null)[] {
  return [...new Set(estimates.map((estimate) => estimate.group))]
}

function section(part: CellPart, estimates: readonly EstimateResult[]): EstimateSection {
  const blocks = new Map<string | null, EstimateRow[]>()
  for (const estimate of estimates) {
    const of = part === 'loading' ? (estimate.of[1] ?? null) : null
    blocks.set(of, [...(blocks.get(of) ?? []), { name: rowName(part, estimate.of), estimate, interval: interval(estimate) }])
  }
  const rows = [...blocks.values()].flat()
  return { part, title: partTitles[part], blocks: [...blocks].map(([of, list]) => ({ of, rows: list })), scale: scaleOf(rows) }
}

function rowName(part: CellPart, of: readonly string[]): string {
  if (part === 'loading') return of[0] ?? ''
  if (part === 'factor regression') return `${of[0]} on ${of[1]}`
  return of.join(' with ')
}

function interval({ free, lower, upper }: EstimateResult): EstimateRow['interval'] {
  return !free || lower === null || upper === null ? null : { lower, upper }
}

function scaleOf(rows: readonly EstimateRow[]): EstimateSection['scale'] {
  const ends = rows.flatMap((row) => (row.interval === null ? [] : [row.interval.lower, row.interval.upper]))
  if (ends.length === 0) return null
  const [from, to] = [Math.min(...ends), Math.max(...ends)]
  return to > from ? { from, to } : null
}
