/** The picture of loadings and intercepts group by group: where each mark stands. Geometry only; the numbers are the fit's. */
import type { CandidateResult, CellPart, EstimateResult } from '../../src-main/operations/contract.ts'
import { fixed } from '../state/format.ts'
import { partTitles } from '../state/words.ts'

export interface GroupMark {
  group: string
  estimate: number
  /** The 95% interval; null for a fixed cell or where no standard error could be had. */
  interval: { lower: number; upper: number } | null
}
export interface PictureRow {
  name: string
  /** The factor of a loading; null for an intercept. */
  factor: string | null
  marks: GroupMark[]
  /** "equal", "fixed", "free in Weir Lane", "free": what the candidate says of the cell across groups. */
  held: string
  /** Everything the row shows, in words. */
  words: string
}
export interface GroupPicture {
  title: string
  rows: PictureRow[]
  groups: string[]
  /** True where indicators lie so far apart that every row is centred on its own middle; widths compare all the same. */
  centred: boolean
  ticks: { at: number; text: string }[]
  /** Where a value of a row stands, in percent of the width. */
  place: (row: PictureRow, value: number) => number
}

/** Rows that differ by this many times the widest of them are centred, each on its own middle. */
const farApart = 4
/** Room left and right, in percent. */
const margin = 4

/** A picture of the part in every group; null where the candidate has it in fewer than two groups. */
export function groupPicture({ estimates }: CandidateResult, part: 'loading' | 'intercept'): GroupPicture | null {
  const own = estimates.filter((one) => one.part === part && one.group !== null && one.estimate !== null)
  const groups = [...new Set(own.map(({ group }) => group ?? ''))]
  const rows = rowsOf(own, part)
  if (groups.length < 2 || rows.length === 0) return null
  const spans = rows.map(spanOf)
  const [from, to] = [Math.min(...spans.map(([low]) => low)), Math.max(...spans.map(([, high]) => high))]
  const widest = Math.max(...spans.map(([low, high]) => high - low)) || 1
  const centred = to - from > farApart * widest
  const scale = centred ? { from: -widest / 2, to: widest / 2 } : widened(from, to)
  const middle = (row: PictureRow) => (centred ? spanOf(row).reduce((sum, end) => sum + end / 2, 0) : 0)
  const across = (value: number) => margin + ((100 - 2 * margin) * (value - scale.from)) / (scale.to - scale.from)
  return {
    title: partTitles[part],
    rows,
    groups,
    centred,
    ticks: ticksOf(scale.from, scale.to).map((value) => ({ at: across(value), text: tickText(value, centred) })),
    place: (row, value) => across(value - middle(row))
  }
}

function rowsOf(estimates: readonly EstimateResult[], part: CellPart): PictureRow[] {
  const cells = new Map<string, EstimateResult[]>()
  for (const estimate of estimates) {
    const key = estimate.of.join('\n')
    cells.set(key, [...(cells.get(key) ?? []), estimate])
  }
  return [...cells.values()].map((list) => {
    const marks = list.map(markOf)
    const [name = '', factor] = list[0]?.of ?? []
    const held = heldInWords(list)
    const values = marks.map((mark) => `${mark.group} ${markInWords(mark)}`).join(', ')
    return { name, factor: part === 'loading' ? (factor ?? null) : null, marks, held, words: `${name}, ${held}: ${values}` }
  })
}

function markOf({ group, estimate, free, lower, upper }: EstimateResult): GroupMark {
  return {
    group: group ?? '',
    estimate: estimate ?? 0,
    interval: !free || lower === null || upper === null ? null : { lower, upper }
  }
}

export function markInWords({ estimate, interval }: GroupMark): string {
  return interval === null ? fixed(estimate, 2) : `${fixed(estimate, 2)} [${fixed(interval.lower, 2)}, ${fixed(interval.upper, 2)}]`
}

/** What is said of one cell in all groups. */
function heldInWords(list: readonly EstimateResult[]): string {
  if (list.every(({ free }) => !free)) return 'fixed'
  const sharing = (one: EstimateResult) => one.label !== null && list.filter(({ label }) => label === one.label).length > 1
  const apart = list.filter((one) => one.free && !sharing(one))
  if (apart.length === 0) return 'equal'
  if (apart.length === list.length) return 'free'
  return `free in ${apart.map(({ group }) => group).join(' and ')}`
}

function spanOf({ marks }: PictureRow): [number, number] {
  const ends = marks.flatMap(({ estimate, interval }) => (interval === null ? [estimate] : [interval.lower, interval.upper]))
  return [Math.min(...ends), Math.max(...ends)]
}

function widened(from: number, to: number): { from: number; to: number } {
  return to > from ? { from, to } : { from: from - 0.5, to: to + 0.5 }
}

/** Round values, four to eight of them. */
function ticksOf(from: number, to: number): number[] {
  const rough = (to - from) / 6
  const power = 10 ** Math.floor(Math.log10(rough))
  const step = power * ([1, 2, 5, 10].find((one) => one * power >= rough) ?? 10)
  const first = Math.ceil(from / step)
  return Array.from({ length: Math.floor(to / step) - first + 1 }, (_, i) => Number(((first + i) * step).toPrecision(12)))
}

function tickText(value: number, signed: boolean): string {
  const text = fixed(value, 2)
    .replace(/(\.\d*?)0+$/, '$1')
    .replace(/\.$/, '')
  return signed && value > 0 ? `+${text}` : text
}

/** Marks of groups by shape, so that they are told apart in black too: drawn around 0, 0. */
const shapes: readonly { path: string; filled: boolean }[] = [
  { path: 'M-3.2 0a3.2 3.2 0 1 0 6.4 0a3.2 3.2 0 1 0 -6.4 0', filled: true },
  { path: 'M-2.9 -2.9H2.9V2.9H-2.9Z', filled: false },
  { path: 'M0 -3.9L3.7 2.6H-3.7Z', filled: true },
  { path: 'M0 -4.2L4.2 0L0 4.2L-4.2 0Z', filled: false },
  { path: 'M-2.9 -2.9H2.9V2.9H-2.9Z', filled: true },
  { path: 'M-3.2 0a3.2 3.2 0 1 0 6.4 0a3.2 3.2 0 1 0 -6.4 0', filled: false },
  { path: 'M0 -4.2L4.2 0L0 4.2L-4.2 0Z', filled: true },
  { path: 'M0 -3.9L3.7 2.6H-3.7Z', filled: false }
]

/** The shape of the group at this place; after the last they begin anew. */
export function shapeOf(place: number): { path: string; filled: boolean } {
  return shapes[place % shapes.length] ?? { path: '', filled: true }
}
