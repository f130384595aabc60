/**
 * The `data` part of a plan file: a file's columns, or figures from a publication.
 */
import type { PlanNodes, Spot } from './plan-nodes.ts'
import type { DataPlan } from './study.ts'

type SummaryPlan = Extract<DataPlan, { kind: 'summary' }>
type SummaryGroupPlan = SummaryPlan['groups'][number]

const FILE_KEYS = ['file', 'indicators', 'group', 'missing codes']
const SUMMARY_KEYS = ['summary', 'indicators', 'divisor', 'group']
const GROUP_KEYS = ['group', 'n', 'covariance', 'correlation', 'sd', 'mean']

export function readData(nodes: PlanNodes, spot: Spot): DataPlan {
  const fields = nodes.fields(spot, 'The data', [...new Set([...FILE_KEYS, ...SUMMARY_KEYS])], ['indicators'])
  const [file, summary] = [fields.get('file'), fields.get('summary')]
  if (file !== undefined && summary !== undefined)
    nodes.fail(summary, 'The data name a file and a summary.', 'Keep one of the two.')
  if (file === undefined && summary === undefined) {
    nodes.fail(spot, 'The data name neither a file nor a summary.', 'Add "file: NAME.csv", or "summary:" with published figures.')
  }
  const keys = file === undefined ? SUMMARY_KEYS : FILE_KEYS
  for (const [key, value] of fields) {
    if (!keys.includes(key))
      nodes.fail(value, `"${key}" does not go with "${file === undefined ? 'summary' : 'file'}".`, 'Remove it.')
  }
  const indicators = readIndicators(nodes, fields.get('indicators')!)
  const group = fields.get('group')
  if (group !== undefined) nodes.mark('data.group', group)
  const groupName = group === undefined ? null : nodes.name(group, 'The grouping')
  if (file === undefined) return readSummary(nodes, fields, indicators, groupName ?? 'group')
  const codes = fields.get('missing codes')
  const missingCodes =
    codes === undefined
      ? ['', 'NA']
      : nodes.list(codes, 'The missing codes', '["", NA, "-99"]').map((item) => nodes.text(item, 'A missing code'))
  return { kind: 'file', file: nodes.name(file, 'The file'), indicators, group: groupName, missingCodes }
}

function readIndicators(nodes: PlanNodes, spot: Spot): string[] {
  const items = nodes.list(spot, 'The indicators', '[sleep, pain, worry]')
  if (items.length === 0) nodes.fail(spot, 'There are no indicators.', 'List the columns the models are about.')
  nodes.mark('data.indicators', spot)
  const indicators: string[] = []
  for (const item of items) {
    const name = nodes.name(item, 'An indicator')
    if (indicators.includes(name)) nodes.fail(item, `The indicator "${name}" is listed twice.`, 'Remove one.')
    indicators.push(name)
  }
  return indicators
}

function readSummary(nodes: PlanNodes, fields: Map<string, Spot>, indicators: string[], group: string): SummaryPlan {
  const spot = fields.get('summary')!
  const divisor = fields.get('divisor')
  if (divisor === undefined) {
    nodes.fail(spot, 'The divisor of the covariances is not given.', 'Add "divisor: n" or "divisor: n-1", as the publication says.')
  }
  const items = nodes.list(spot, 'The summary', 'a list with one entry ("- n: 649 ...") a group')
  if (items.length === 0) nodes.fail(spot, 'The summary has no group.', 'Add an entry with n and the covariances.')
  const groups = items.map((item, g) => {
    nodes.mark(`data.groups.${g}`, item)
    return readGroup(nodes, item, indicators, items.length > 1)
  })
  groups.forEach((one, g) => {
    if (groups.findIndex((other) => other.name === one.name) < g)
      nodes.fail(items[g]!, `The group "${one.name}" stands twice.`, 'Rename one.')
    if ((one.mean === null) !== (groups[0]!.mean === null)) {
      nodes.fail(items[g]!, 'Means are given for some groups only.', 'Give means in every group or in none.')
    }
  })
  return { kind: 'summary', indicators, divisor: nodes.word(divisor, 'The divisor', ['n', 'n-1'] as const), group, groups }
}

function readGroup(nodes: PlanNodes, spot: Spot, indicators: readonly string[], several: boolean): SummaryGroupPlan {
  const fields = nodes.fields(spot, 'A group of the summary', GROUP_KEYS, several ? ['group', 'n'] : ['n'])
  const n = fields.get('n')!
  const size = nodes.number(n, 'n')
  if (!Number.isInteger(size) || size < 1) nodes.fail(n, `n must be a whole number of cases, not ${size}.`)
  const name = fields.get('group')
  const mean = fields.get('mean')
  return {
    name: name === undefined ? null : nodes.name(name, 'The group'),
    n: size,
    ...readSpread(nodes, spot, fields, indicators),
    mean: mean === undefined ? null : readRow(nodes, mean, 'The means', indicators)
  }
}

/** Covariances as given, or correlations with their standard deviations. */
function readSpread(
  nodes: PlanNodes,
  spot: Spot,
  fields: Map<string, Spot>,
  indicators: readonly string[]
): Pick<SummaryGroupPlan, 'lower' | 'sd'> {
  const [covariance, correlation, sd] = [fields.get('covariance'), fields.get('correlation'), fields.get('sd')]
  if (covariance !== undefined && correlation !== undefined) {
    nodes.fail(correlation, 'Covariances and correlations are both given.', 'Keep one of the two.')
  }
  if (covariance !== undefined) {
    if (sd !== undefined) nodes.fail(sd, 'Standard deviations go with correlations, not with covariances.', 'Remove "sd".')
    return { lower: readLower(nodes, covariance, 'covariance', indicators), sd: null }
  }
  if (correlation === undefined)
    nodes.fail(spot, 'A group of the summary has neither covariances nor correlations.', 'Add "covariance:".')
  if (sd === undefined) nodes.fail(correlation, 'Correlations need their standard deviations.', 'Add "sd:", or give covariances.')
  const deviations = readRow(nodes, sd, 'The standard deviations', indicators)
  deviations.forEach((value, i) => {
    if (value <= 0) nodes.fail(sd, `The standard deviation of "${indicators[i]}" must be positive, not ${value}.`)
  })
  return { lower: readLower(nodes, correlation, 'correlation', indicators), sd: deviations }
}

function readRow(nodes: PlanNodes, spot: Spot, what: string, indicators: readonly string[]): number[] {
  const values = nodes.list(spot, what, '[1.2, 0.8, 1.1]').map((item) => nodes.number(item, `A number of ${what.toLowerCase()}`))
  if (values.length !== indicators.length) {
    nodes.fail(spot, `${what} are ${values.length}, but there are ${indicators.length} indicators.`)
  }
  return values
}

/** A lower triangle by rows: row i has i + 1 numbers. */
function readLower(nodes: PlanNodes, spot: Spot, kind: 'covariance' | 'correlation', indicators: readonly string[]): number[][] {
  const rows = nodes.list(spot, `The ${kind} matrix`, '[[1.5], [0.4, 2.1]]')
  if (rows.length !== indicators.length) {
    nodes.fail(spot, `The ${kind} matrix has ${rows.length} rows, but there are ${indicators.length} indicators.`)
  }
  return rows.map((row, i) => {
    const values = nodes.list(row, `Row ${i + 1} of the ${kind} matrix`, '[0.4, 2.1]')
    if (values.length !== i + 1) {
      nodes.fail(
        row,
        `Row ${i + 1} of the ${kind} matrix ("${indicators[i]}") has ${values.length} numbers, but ${i + 1} are wanted.`,
        'Give the lower triangle by rows, the diagonal included.'
      )
    }
    return values.map((item, j) => readEntry(nodes, item, kind, indicators, i, j))
  })
}

function readEntry(nodes: PlanNodes, spot: Spot, kind: string, indicators: readonly string[], i: number, j: number): number {
  const cell = i === j ? `"${indicators[i]}"` : `"${indicators[i]}" and "${indicators[j]}"`
  const value = nodes.number(spot, `The ${kind} of ${cell}`)
  if (kind === 'covariance' && i === j && value <= 0) nodes.fail(spot, `The variance of ${cell} must be positive, not ${value}.`)
  if (kind === 'correlation' && i === j && value !== 1) {
    nodes.fail(spot, `The correlation of ${cell} with itself must be 1, not ${value}.`, 'Give covariances under "covariance:".')
  }
  if (kind === 'correlation' && Math.abs(value) > 1) nodes.fail(spot, `The correlation of ${cell} is ${value}, beyond 1.`)
  return value
}
