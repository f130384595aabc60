/**
 * A Plan as the text of a plan file. What takes its default by being left out of a candidate stays left out.
 */
import { Document, isCollection, isMap, isScalar, type Node, type YAMLMap } from 'yaml'
import { InputError } from './input-error.ts'
import type { Candidate, CellName, Change, ConstraintTerm, DataPlan, LadderPlan, Plan, Release, Rules } from './study.ts'

type Plain = string | number | Plain[] | { [key: string]: Plain } | Map<string, Plain>

/** @throws InputError when an equality ties cells of several parts, for which the file has no words */
export function writePlan(plan: Plan): string {
  const document = new Document(asMap(planFields(plan)), { version: '1.2' })
  flowWhereShort(document.contents as Node, 0)
  spaceSections(document.contents as YAMLMap<{ spaceBefore?: boolean }, unknown>)
  return document.toString({ lineWidth: 0, flowCollectionPadding: true })
}

function planFields(plan: Plan): [string, Plain][] {
  const { estimation, rules } = plan
  return [
    ['study', plan.study],
    ['data', asMap(dataFields(plan.data))],
    [
      'estimation',
      {
        method: estimation.method,
        convention: estimation.convention,
        statistic: estimation.statistic,
        missing: estimation.missing,
        'standard errors': estimation.standardErrors
      }
    ],
    ['candidates', new Map(plan.candidates.map((candidate) => [candidate.name, asMap(candidateFields(candidate))]))],
    ['ladders', new Map(plan.ladders.map((ladder) => [ladder.name, ladderValue(ladder)]))],
    [
      'rules',
      asMap([
        ['alpha', rules.alpha],
        ['adjust', rules.adjust],
        ...given('change in fit', rules.changeInFit, changeInFitValue),
        ['decide by', rules.decideBy],
        ['scaled difference', rules.scaledDifference]
      ])
    ]
  ]
}

/** A published rule by its name, or the thresholds given. */
function changeInFitValue({ preset, gammaHat, ...thresholds }: NonNullable<Rules['changeInFit']>): Plain {
  if (preset !== null) return preset
  const entries = Object.entries({ ...thresholds, 'gamma-hat': gammaHat })
  return asMap(entries.filter((entry): entry is [string, number] => entry[1] !== null))
}

function dataFields(data: DataPlan): [string, Plain][] {
  if (data.kind === 'file') {
    return [
      ['file', data.file],
      ['indicators', data.indicators],
      ...given('group', data.group, (group) => group),
      ['missing codes', data.missingCodes]
    ]
  }
  return [
    ['indicators', data.indicators],
    ['divisor', data.divisor],
    ...given('group', data.group === 'group' ? null : data.group, (group) => group),
    [
      'summary',
      data.groups.map((group) =>
        asMap([
          ...given('group', group.name, (name) => name),
          ['n', group.n],
          [group.sd === null ? 'covariance' : 'correlation', group.lower],
          ...given('sd', group.sd, (sd) => sd),
          ...given('mean', group.mean, (mean) => mean)
        ])
      )
    ]
  ]
}

function candidateFields(candidate: Candidate): [string, Plain][] {
  return [
    ...given('from', candidate.from, (from) => from),
    ...given('factors', candidate.factors, (factors) => new Map(factors.map((factor) => [factor.name, factor.measures]))),
    ...given('scaling', candidate.scaling, (scaling) => scaling),
    ...given('factor covariances', candidate.factorCovariances, (word) => word),
    ...given('across', candidate.across, (across) => across),
    ...given('equal across groups', candidate.equalAcrossGroups, (sets) => sets),
    ...given('except', candidate.except.length > 0 ? candidate.except : null, (except) => except.map(releaseValue)),
    ...given('change', candidate.change.length > 0 ? candidate.change : null, (change) => change.map(changeValue))
  ]
}

function releaseValue(release: Release): Plain {
  return asMap([[release.cell.part, cellNames(release.cell)], ...given('group', release.group, (group) => group)])
}

function changeValue(change: Change): Plain {
  return asMap([
    [change.do, changedCells(change)],
    ...given('at', change.do === 'fix' ? change.at : null, (at) => at),
    ...given('to', change.do === 'constrain' ? change.to : null, (to) => to),
    ...given('at least', change.do === 'bound' ? change.atLeast : null, (atLeast) => atLeast),
    ...given('at most', change.do === 'bound' ? change.atMost : null, (atMost) => atMost),
    ...given('group', change.group, (group) => group)
  ])
}

function changedCells(change: Change): Plain {
  if (change.do === 'equal') return equalCells(change.cells)
  if (change.do === 'constrain') return change.terms.map(termValue)
  return { [change.cell.part]: cellNames(change.cell) }
}

function termValue({ cell, times, group }: ConstraintTerm): Plain {
  return asMap([[cell.part, cellNames(cell)], ['times', times], ...given('group', group, (name) => name)])
}

function equalCells(cells: readonly CellName[]): Plain {
  const part = cells[0]!.part
  if (cells.some((cell) => cell.part !== part)) throw new InputError('An equality ties cells of one part of the model.')
  return { [part]: cells.map(cellNames) }
}

function cellNames(cell: CellName): Plain {
  return cell.of.length === 1 ? cell.of[0]! : cell.of
}

function ladderValue(ladder: LadderPlan): Plain {
  if ('rungs' in ladder) return ladder.rungs
  if ('over' in ladder) {
    const over = new Map(ladder.over.map((occasion) => [occasion.name, occasion.indicators]))
    return { 'invariance of': ladder.invarianceOf, over, through: ladder.through }
  }
  return asMap([
    ['invariance of', ladder.invarianceOf],
    ['across', ladder.across],
    ['through', ladder.through],
    ...given('and', ladder.and ?? null, (sets) => sets)
  ])
}

/** One entry, or none where the value is null. */
function given<T>(key: string, value: T | null, plain: (value: T) => Plain): [string, Plain][] {
  return value === null ? [] : [[key, plain(value)]]
}

function asMap(entries: [string, Plain][]): Map<string, Plain> {
  return new Map(entries)
}

/** Lists of names and numbers, and the cells of changes, on one line each; the larger structure in blocks. */
function flowWhereShort(node: Node | null, depth: number): void {
  if (!isCollection(node)) return
  const values = node.items.map((item) => (isMap(node) ? (item as { value: Node | null }).value : item) as Node | null)
  const leaf = values.every((value) => !isCollection(value))
  const isCell = isMap(node) && depth >= 4 && node.items.length === 1 && !isMap(values[0])
  const isThresholds =
    isMap(node) && depth === 2 && leaf && values.every((value) => isScalar(value) && typeof value.value === 'number')
  const isTerm = isMap(node) && depth >= 4 && node.has('times')
  if (node.items.length === 0 || isCell || isTerm || isThresholds || (leaf && !isMap(node))) node.flow = true
  else for (const value of values) flowWhereShort(value, depth + 1)
}

function spaceSections(map: YAMLMap<{ spaceBefore?: boolean }, unknown>): void {
  map.items.forEach((pair, i) => {
    if (i > 0) pair.key.spaceBefore = true
  })
}
