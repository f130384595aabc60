/**
 * Invariance over repeated measurements in wide data (methods: section 7): the same indicators stand in one row once for
 * every occasion, and one candidate says how they measure the factors at the first.
 *
 * Each rung has every factor once for each occasion, all within one group. Factors covary freely over time, and so do the
 * residuals of an indicator with itself (and of a factor that another measures). What makes a rung is written out as
 * ordinary changes: equalities over the occasions, and the identification shifts that follow from them, so that no choice
 * of scaling changes T. At equal loadings the factor variances after the first occasion are freed where they carried the
 * scale; at equal intercepts the factor means after the first.
 */
import type { Cell, GroupCells } from '../statistics/model/cells.ts'
import { candidateCells, type ResolvedCandidate, resolveCandidate } from './candidate-model.ts'
import { didYouMean } from './nearest.ts'
import { acrossOf, type Fail, lineageOf } from './plan-context.ts'
import {
  type Candidate,
  type CellName,
  type CellPart,
  type Change,
  candidateSchema,
  type InvarianceLevel,
  invarianceLevels,
  type LadderPlan,
  type Plan
} from './study.ts'

export type RepeatedLadder = Extract<LadderPlan, { over: unknown }>

/** The rungs of a ladder over time, bottom first: each derived from the one below, the lowest with factors of its own. */
export function repeatedCandidates(ladder: RepeatedLadder, family: readonly Candidate[]): Candidate[] {
  const base = baseModel(ladder, family)
  const held: Record<InvarianceLevel, () => Change[]> = {
    configural: () => configuralChanges(base),
    metric: () => [...equalLoadings(base), ...freedVariances(base)],
    scalar: () => [...equalOver(base, 'intercept', base.cells.intercepts ?? []), ...freedMeans(base)],
    strict: () =>
      equalOver(
        base,
        'residual variance',
        base.indicators.map((_, i) => base.cells.residualCovariances[i]![i]!)
      )
  }
  const levels = levelsThrough(ladder.through)
  return levels.map((level, i) => {
    const own =
      i === 0
        ? { factors: factorsOverTime(base), scaling: base.resolved.scaling, factorCovariances: base.resolved.factorCovariances }
        : { from: repeatedName(ladder.invarianceOf, levels[i - 1]!) }
    return candidateSchema.parse({ name: repeatedName(ladder.invarianceOf, level), ...own, change: held[level]() })
  })
}

/** Names of the rungs, bottom first, whether or not they can be made. */
export function repeatedNames({ invarianceOf, through }: RepeatedLadder): string[] {
  return levelsThrough(through).map((level) => repeatedName(invarianceOf, level))
}

function levelsThrough(through: InvarianceLevel): InvarianceLevel[] {
  return invarianceLevels.slice(0, invarianceLevels.indexOf(through) + 1)
}

function repeatedName(base: string, level: InvarianceLevel): string {
  return `${base}, ${level} over time`
}

/** The candidate at its first occasion, and the names of everything at the others. */
interface BaseModel {
  resolved: ResolvedCandidate
  /** Of the first occasion, in the order of the cells. */
  indicators: string[]
  factors: string[]
  cells: GroupCells
  occasions: string[]
  /** The name of an indicator or factor of the first occasion at occasion t. */
  at: (name: string, t: number) => string
}

function baseModel({ invarianceOf, over }: RepeatedLadder, family: readonly Candidate[]): BaseModel {
  const resolved = resolveCandidate(invarianceOf, family)
  const first = over[0]!.indicators
  const model = candidateCells(resolved, { indicators: first, grouping: null, groups: [null], means: true })
  return {
    resolved,
    indicators: model.indicators,
    factors: model.factors,
    cells: model.groups[0]!,
    occasions: over.map((occasion) => occasion.name),
    at: (name, t) => {
      const place = first.indexOf(name)
      return place >= 0 ? over[t]!.indicators[place]! : factorAt(name, over[t]!.name)
    }
  }
}

function factorAt(factor: string, occasion: string): string {
  return `${factor} at ${occasion}`
}

function factorsOverTime({ resolved, occasions, at }: BaseModel): Candidate['factors'] {
  return occasions.flatMap((_, t) =>
    resolved.factors.map(({ name, measures }) => ({ name: at(name, t), measures: measures.map((measure) => at(measure, t)) }))
  )
}

/** The candidate's own changes at every occasion, then what covaries with itself over time. */
function configuralChanges(base: BaseModel): Change[] {
  const { resolved, occasions, indicators, factors, cells } = base
  const own = occasions.flatMap((_, t) => resolved.changes.map((change) => changeAt(base, change, t)))
  const measured = new Set(resolved.factors.flatMap((factor) => factor.measures))
  const joined = factors.filter((factor) => measured.has(factor) || resolved.factorCovariances === 'zero')
  const varying = indicators.filter((_, i) => cells.residualCovariances[i]![i] !== 0)
  return [
    ...own,
    ...joined.flatMap((factor) => freeWithItself(base, 'factor covariance', factor)),
    ...varying.flatMap((indicator) => freeWithItself(base, 'residual covariance', indicator))
  ]
}

/** A change of the candidate, said of occasion t. */
function changeAt({ at }: BaseModel, change: Change, t: number): Change {
  const move = (cell: CellName): CellName => ({ part: cell.part, of: cell.of.map((name) => at(name, t)) })
  switch (change.do) {
    case 'equal':
      return { ...change, cells: change.cells.map(move) }
    case 'constrain':
      return { ...change, terms: change.terms.map((term) => ({ ...term, cell: move(term.cell) })) }
    default:
      return { ...change, cell: move(change.cell) }
  }
}

/** Free covariances of one name over every pair of occasions. */
function freeWithItself({ occasions, at }: BaseModel, part: CellPart, name: string): Change[] {
  return occasions.flatMap((_, t) =>
    occasions.slice(0, t).map((_, s) => ({ do: 'free' as const, cell: { part, of: [at(name, s), at(name, t)] }, group: null }))
  )
}

/** Every loading the candidate leaves free, of indicators and of factors that others measure. */
function equalLoadings(base: BaseModel): Change[] {
  const { indicators, factors, cells } = base
  const free = (part: CellPart, rows: string[], sheet: Cell[][]) =>
    rows.flatMap((row, i) =>
      factors.flatMap((column, k) => (typeof sheet[i]![k] === 'string' ? [tie(base, part, [row, column])] : []))
    )
  return [...free('loading', indicators, cells.loadings), ...free('factor regression', factors, cells.regressions)]
}

/** Equalities of one-name cells of the indicators, where they are free. */
function equalOver(base: BaseModel, part: CellPart, cells: readonly Cell[]): Change[] {
  return base.indicators.flatMap((indicator, i) => (typeof cells[i] === 'string' ? [tie(base, part, [indicator])] : []))
}

function tie({ occasions, at }: BaseModel, part: CellPart, of: string[]): Change {
  return { do: 'equal', cells: occasions.map((_, t) => ({ part, of: of.map((name) => at(name, t)) })), group: null }
}

/** Where a fixed variance sets a factor's scale, equal loadings set it for the later occasions. */
function freedVariances(base: BaseModel): Change[] {
  const { factors, cells } = base
  return factors.flatMap((factor, k) => {
    const variance = cells.factorCovariances[k]![k]!
    const loadings = [...cells.loadings, ...cells.regressions].map((row) => row[k]!)
    const carriesScale =
      typeof variance === 'number' && variance !== 0 && loadings.every((cell) => cell === 0 || typeof cell === 'string')
    return carriesScale ? freedLater(base, 'factor variance', factor) : []
  })
}

/** With equal intercepts the means of the factors that indicators measure are estimable at every later occasion. */
function freedMeans(base: BaseModel): Change[] {
  const { factors, cells, resolved, indicators } = base
  return factors.flatMap((factor, k) => {
    const ownIndicators = resolved.factors[k]!.measures.some((measure) => indicators.includes(measure))
    return typeof cells.factorMeans?.[k] === 'number' && ownIndicators ? freedLater(base, 'factor mean', factor) : []
  })
}

function freedLater({ occasions, at }: BaseModel, part: CellPart, factor: string): Change[] {
  return occasions.slice(1).map((_, t) => ({ do: 'free', cell: { part, of: [at(factor, t + 1)] }, group: null }))
}

/** Whether the occasions of a ladder and its candidate go together, and with the data; the candidate is known to be sound. */
export function checkOccasions(plan: Plan, ladder: RepeatedLadder, fail: Fail): void {
  checkOccasionLists(plan, ladder, fail)
  const { over, invarianceOf } = ladder
  const byName = new Map(plan.candidates.map((candidate) => [candidate.name, candidate]))
  const lineage = lineageOf(byName.get(invarianceOf)!, byName)
  const across = acrossOf(lineage)
  if (across !== null) {
    fail(
      '.invariance of',
      `"${invarianceOf}" is modelled across "${across}", and a ladder over time describes all cases together.`,
      'Name a candidate without "across".'
    )
  }
  const factors = lineage[0]!.factors!
  checkMeasures(invarianceOf, factors, over[0]!, fail)
  for (const [t, occasion] of over.entries()) {
    const taken = factors.map((factor) => factorAt(factor.name, occasion.name)).find((name) => plan.data.indicators.includes(name))
    if (taken !== undefined)
      fail(
        `.over.${t}`,
        `"${taken}" is an indicator, and the factor at this occasion would be called the same.`,
        'Give the occasion another name.'
      )
  }
  const other = plan.ladders.find((one) => one !== ladder && 'over' in one && one.invarianceOf === invarianceOf)
  if (other !== undefined && 'over' in other && JSON.stringify(other.over) !== JSON.stringify(over)) {
    fail(
      '.over',
      `The ladder "${other.name}" takes "${invarianceOf}" over other occasions.`,
      'Derive a candidate of another name for one of the two.'
    )
  }
}

function checkOccasionLists({ data }: Plan, { name, over }: RepeatedLadder, fail: Fail): void {
  const [first, ...later] = over
  if (first === undefined || later.length === 0)
    fail(
      '.over',
      `The ladder "${name}" needs two occasions or more.`,
      'Write them like "over: { first: [a1, b1], second: [a2, b2] }".'
    )
  const seen = new Map<string, string>()
  over.forEach((occasion, t) => {
    if (over.findIndex((one) => one.name === occasion.name) < t)
      fail(`.over.${t}`, `The occasion "${occasion.name}" stands twice.`, 'Rename one.')
    if (occasion.indicators.length !== first.indicators.length) {
      fail(
        `.over.${t}`,
        `"${first.name}" lists ${counted(first.indicators.length)} and "${occasion.name}" lists ${occasion.indicators.length}.`,
        'List the same indicators at every occasion, in the same order.'
      )
    }
    occasion.indicators.forEach((indicator, i) => {
      const path = `.over.${t}.${i}`
      if (!data.indicators.includes(indicator))
        fail(path, `There is no indicator "${indicator}".`, didYouMean(indicator, data.indicators, 'indicators'))
      const before = seen.get(indicator)
      if (before !== undefined) {
        const where = before === occasion.name ? `twice at "${before}"` : `at "${before}" and at "${occasion.name}"`
        fail(path, `The indicator "${indicator}" stands ${where}.`, 'Each occasion has indicators of its own.')
      }
      seen.set(indicator, occasion.name)
    })
  })
}

/** The candidate is stated for the first occasion: it measures by all the indicators listed there and no others. */
function checkMeasures(
  candidate: string,
  factors: NonNullable<Candidate['factors']>,
  first: RepeatedLadder['over'][number],
  fail: Fail
): void {
  const names = factors.map((factor) => factor.name)
  const used = factors.flatMap((factor) => factor.measures).filter((measure) => !names.includes(measure))
  const missing = used.find((indicator) => !first.indicators.includes(indicator))
  if (missing !== undefined) {
    fail(
      '.over.0',
      `"${candidate}" measures by "${missing}", which is not listed at "${first.name}".`,
      'List the indicators of the candidate at the first occasion, and their counterparts at the others.'
    )
  }
  const idle = first.indicators.findIndex((indicator) => !used.includes(indicator))
  if (idle >= 0)
    fail(
      `.over.0.${idle}`,
      `"${first.indicators[idle]}" is listed at "${first.name}", but "${candidate}" does not measure by it.`,
      'Remove it from every occasion.'
    )
}

function counted(indicators: number): string {
  return `${indicators} ${indicators === 1 ? 'indicator' : 'indicators'}`
}
