/**
 * The `candidates` part of a plan file: factors, derivations and changes as written, names not yet looked up.
 */
import { cellParts } from '../statistics/model/cells.ts'
import type { PlanNodes, Spot } from './plan-nodes.ts'
import {
  type Candidate,
  type CellName,
  type CellPart,
  type Change,
  type ConstraintTerm,
  equalSets,
  namesOfPart,
  type Release,
  scalings
} from './study.ts'

const KEYS = ['from', 'factors', 'scaling', 'factor covariances', 'across', 'equal across groups', 'except', 'change']
const CELL_EXAMPLE: Readonly<Record<1 | 2, string>> = {
  1: '{ residual variance: sleep }',
  2: '{ loading: [sleep, Body] }'
}

export function readCandidates(nodes: PlanNodes, spot: Spot): Candidate[] {
  return nodes.mapping(spot, 'The candidates').map(({ key, keySpot, value }, i) => {
    nodes.mark(`candidates.${i}`, keySpot)
    return readCandidate(nodes, key, value, `candidates.${i}`)
  })
}

function readCandidate(nodes: PlanNodes, name: string, spot: Spot, path: string): Candidate {
  const fields = nodes.fields(spot, `"${name}"`, KEYS)
  for (const [key, value] of fields) nodes.mark(`${path}.${key}`, value)
  const read = <T>(key: string, reader: (value: Spot) => T): T | null => {
    const value = fields.get(key)
    return value === undefined ? null : reader(value)
  }
  return {
    name,
    from: read('from', (value) => nodes.name(value, 'The parent')),
    factors: read('factors', (value) => readFactors(nodes, value, `${path}.factors`)),
    scaling: read('scaling', (value) => nodes.word(value, 'The scaling', scalings)),
    factorCovariances: read('factor covariances', (value) =>
      nodes.word(value, 'The factor covariances', ['free', 'zero'] as const)
    ),
    across: read('across', (value) => nodes.name(value, 'The grouping')),
    equalAcrossGroups: read('equal across groups', (value) =>
      nodes
        .list(value, 'What is equal across groups', '[loadings, intercepts]')
        .map((item) => nodes.word(item, 'What is equal across groups', equalSets))
    ),
    except: read('except', (value) => readReleases(nodes, value, `${path}.except`)) ?? [],
    change: read('change', (value) => readChanges(nodes, value, `${path}.change`)) ?? []
  }
}

function readFactors(nodes: PlanNodes, spot: Spot, path: string): { name: string; measures: string[] }[] {
  const entries = nodes.mapping(spot, 'The factors')
  if (entries.length === 0) nodes.fail(spot, 'There are no factors.', 'Write at least one, like "Body: [sleep, pain]".')
  return entries.map(({ key, keySpot, value }, i) => {
    nodes.mark(`${path}.${i}`, keySpot)
    const items = nodes.list(value, `The indicators of "${key}"`, '[sleep, pain]')
    if (items.length === 0) nodes.fail(value, `The factor "${key}" measures nothing.`, 'List its indicators.')
    items.forEach((item, j) => {
      nodes.mark(`${path}.${i}.${j}`, item)
    })
    return { name: key, measures: items.map((item) => nodes.name(item, `An indicator of "${key}"`)) }
  })
}

function readReleases(nodes: PlanNodes, spot: Spot, path: string): Release[] {
  return nodes.list(spot, 'The exceptions', '[{ loading: [pain, Body] }]').map((item, i) => {
    nodes.mark(`${path}.${i}`, item)
    const fields = nodes.fields(item, 'An exception', [...cellParts, 'group'])
    return { cell: onlyCell(nodes, item, fields, 'An exception'), group: readGroup(nodes, fields) }
  })
}

function readChanges(nodes: PlanNodes, spot: Spot, path: string): Change[] {
  return nodes.list(spot, 'The changes', '[{ free: { residual covariance: [sleep, worry] } }]').map((item, i) => {
    nodes.mark(`${path}.${i}`, item)
    return readChange(nodes, item)
  })
}

const CHANGE_KINDS = ['free', 'fix', 'equal', 'constrain', 'bound'] as const
/** Which kind of change each further key goes with. */
const KEY_OF_KIND = { at: 'fix', to: 'constrain', 'at least': 'bound', 'at most': 'bound' } as const

function readChange(nodes: PlanNodes, spot: Spot): Change {
  const fields = nodes.fields(spot, 'A change', [...CHANGE_KINDS, ...Object.keys(KEY_OF_KIND), 'group'])
  const kinds = CHANGE_KINDS.filter((kind) => fields.has(kind))
  const kind = kinds[0]
  if (kind === undefined)
    nodes.fail(
      spot,
      'This change says neither free, fix, equal, constrain nor bound.',
      'Write "free:", "fix:", "equal:", "constrain:" or "bound:" and a cell.'
    )
  if (kinds.length > 1)
    nodes.fail(spot, `One change cannot ${kinds.join(' and ')} at once.`, 'Write them as two changes, each with its own dash.')
  for (const [key, of] of Object.entries(KEY_OF_KIND)) {
    const field = fields.get(key)
    if (field !== undefined && kind !== of) nodes.fail(field, `"${key}" goes with "${of}", not with "${kind}".`, 'Remove it.')
  }
  const group = readGroup(nodes, fields)
  const value = fields.get(kind)!
  switch (kind) {
    case 'equal':
      return { do: kind, cells: readEqualCells(nodes, value), group }
    case 'constrain':
      return { do: kind, terms: readTerms(nodes, value), to: readTotal(nodes, spot, fields), group }
    case 'bound':
      return { do: kind, cell: wholeCell(nodes, value), ...readLimits(nodes, spot, fields), group }
    case 'free':
      return { do: kind, cell: wholeCell(nodes, value), group }
    case 'fix':
      return { do: kind, cell: wholeCell(nodes, value), at: readFixedValue(nodes, spot, fields), group }
  }
}

function wholeCell(nodes: PlanNodes, spot: Spot): CellName {
  return onlyCell(nodes, spot, nodes.fields(spot, 'A cell', cellParts), 'A cell')
}

function readFixedValue(nodes: PlanNodes, spot: Spot, fields: Map<string, Spot>): number {
  const at = fields.get('at')
  if (at === undefined) nodes.fail(spot, 'A fixed cell needs its value.', 'Add "at: 0", say.')
  return nodes.number(at, 'The value of a fixed cell')
}

const TERMS_EXAMPLE = '[{ loading: [sleep, Body], times: 1 }, { loading: [pain, Body], times: -2 }]'

/** `- { loading: [pain, Body], times: -2 }`, one a line: a cell, how many times (1 when left out), and maybe its group. */
function readTerms(nodes: PlanNodes, spot: Spot): ConstraintTerm[] {
  const items = nodes.list(spot, 'The terms of a constraint', TERMS_EXAMPLE)
  if (items.length < 2)
    nodes.fail(spot, 'A constraint needs at least two terms.', 'Use "fix:" and "at:" for one cell, or write a second term.')
  return items.map((item) => {
    const fields = nodes.fields(item, 'A term', [...cellParts, 'times', 'group'])
    const cell = onlyCell(nodes, item, fields, 'A term')
    const written = fields.get('times')
    const times = written === undefined ? 1 : nodes.number(written, 'How many times a cell is taken')
    if (written !== undefined && times === 0) nodes.fail(written, 'A cell taken 0 times constrains nothing.', 'Remove this term.')
    return { cell, times, group: readGroup(nodes, fields) }
  })
}

function readTotal(nodes: PlanNodes, spot: Spot, fields: Map<string, Spot>): number {
  const to = fields.get('to')
  if (to === undefined) nodes.fail(spot, 'A constraint needs the value that its terms sum to.', 'Add "to: 0", say.')
  return nodes.number(to, 'The value that a constraint sums to')
}

function readLimits(nodes: PlanNodes, spot: Spot, fields: Map<string, Spot>): { atLeast: number | null; atMost: number | null } {
  const limit = (key: 'at least' | 'at most') => {
    const field = fields.get(key)
    return field === undefined ? null : nodes.number(field, `The bound "${key}"`)
  }
  const atLeast = limit('at least')
  const atMost = limit('at most')
  if (atLeast === null && atMost === null) nodes.fail(spot, 'A bounded cell needs its bound.', 'Add "at least: 0", say.')
  return { atLeast, atMost }
}

function readGroup(nodes: PlanNodes, fields: Map<string, Spot>): string | null {
  const group = fields.get('group')
  return group === undefined ? null : nodes.name(group, 'The group')
}

/** The one cell that a mapping of part and names stands for. */
function onlyCell(nodes: PlanNodes, spot: Spot, fields: Map<string, Spot>, what: string): CellName {
  const [part, names] = onlyPart(nodes, spot, fields, what)
  return readCell(nodes, part, names)
}

function onlyPart(nodes: PlanNodes, spot: Spot, fields: Map<string, Spot>, what: string): [CellPart, Spot] {
  const parts = cellParts.filter((part) => fields.has(part))
  const part = parts[0]
  if (part === undefined) nodes.fail(spot, `${what} names no part of the model.`, `Write it like ${CELL_EXAMPLE[2]}.`)
  if (parts.length > 1)
    nodes.fail(spot, `${what} names ${parts.length} parts of the model (${parts.join(', ')}).`, 'Write one cell each.')
  return [part, fields.get(part)!]
}

function readCell(nodes: PlanNodes, part: CellPart, spot: Spot): CellName {
  const wanted = namesOfPart[part]
  if (!nodes.has(spot, 'list') && wanted === 1) return { part, of: [nodes.name(spot, `The ${part}`)] }
  const of = nodes.names(spot, `The names of a ${part}`, `A name of a ${part}`, CELL_EXAMPLE[wanted])
  if (of.length !== wanted) {
    nodes.fail(
      spot,
      `A ${part} takes ${wanted === 1 ? 'one name' : 'two names'}, but ${of.length} stand here.`,
      `Write it like ${CELL_EXAMPLE[wanted]}.`
    )
  }
  return { part, of }
}

/** `{ loading: [[sleep, Body], [pain, Body]] }` or `{ residual variance: [sleep, pain] }`: at least two cells of one part. */
function readEqualCells(nodes: PlanNodes, spot: Spot): CellName[] {
  const [part, list] = onlyPart(nodes, spot, nodes.fields(spot, 'An equality', cellParts), 'An equality')
  const example = namesOfPart[part] === 1 ? '{ residual variance: [sleep, pain] }' : '{ loading: [[sleep, Body], [pain, Body]] }'
  const items = nodes.list(list, 'The cells of an equality', example)
  if (items.length < 2) nodes.fail(list, 'An equality needs at least two cells.', `Write it like ${example}.`)
  return items.map((item) => readCell(nodes, part, item))
}
