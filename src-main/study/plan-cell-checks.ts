/**
 * Checks of the changes and exceptions of a candidate: every cell named must be one the model can have.
 */
import { didYouMean, listed } from './nearest.ts'
import { type Context, hasMeans, setOfPart, setsOf } from './plan-context.ts'
import type { CellName, CellPart, Change, Release } from './study.ts'

export function checkRelease(context: Context, release: Release, path: string): void {
  const { lineage, fail } = context
  checkCell(context, release.cell, path)
  checkGroup(context, release.group, path)
  const set = setOfPart[release.cell.part]
  if (!setsOf(lineage).includes(set)) {
    fail(
      path,
      `The ${release.cell.part} is excepted, but ${set} are not held equal across groups.`,
      `Held equal are: ${setsOf(lineage).join(', ')}.`
    )
  }
}

export function checkChange(context: Context, change: Change, path: string): void {
  const { fail } = context
  checkGroup(context, change.group, path)
  const cells = change.do === 'equal' ? change.cells : [change.cell]
  for (const cell of cells) checkCell(context, cell, path)
  if (change.do === 'equal') {
    if (cells.some((cell) => cell.part !== cells[0]!.part)) fail(path, 'An equality ties cells of one part of the model.')
    const seen = cells.map(cellKey)
    const twice = cells.find((_, i) => seen.indexOf(seen[i]!) < i)
    if (twice !== undefined) fail(path, `The ${twice.part} of ${listed(twice.of)} stands twice in one equality.`, 'Remove one.')
  }
  if (change.do === 'fix' && change.at < 0 && change.cell.part.endsWith('variance') && !change.cell.part.endsWith('covariance')) {
    fail(path, `A ${change.cell.part} cannot be fixed at ${change.at}: a variance is never negative.`)
  }
}

function checkGroup({ plan, across, fail }: Context, group: string | null, path: string): void {
  if (group === null) return
  if (across === null)
    fail(path, `The group "${group}" is named, but this candidate is not across groups.`, 'Add "across:" with the grouping.')
  if (plan.data.kind !== 'summary') return
  const groups = plan.data.groups.map((one) => one.name ?? '')
  if (!groups.includes(group)) fail(path, `There is no group "${group}".`, didYouMean(group, groups, 'groups'))
}

/** Which names a cell of each part takes, in order. */
const kindsOfPart: Readonly<Record<CellPart, readonly ('indicator' | 'factor')[]>> = {
  loading: ['indicator', 'factor'],
  'residual variance': ['indicator'],
  'residual covariance': ['indicator', 'indicator'],
  'factor variance': ['factor'],
  'factor covariance': ['factor', 'factor'],
  intercept: ['indicator'],
  'factor mean': ['factor'],
  'factor regression': ['factor', 'factor']
}

function checkCell({ plan, factors, fail }: Context, cell: CellName, path: string): void {
  const known = { indicator: plan.data.indicators, factor: factors.map((factor) => factor.name) }
  const kinds = kindsOfPart[cell.part]
  const order = `A ${cell.part} takes [${kinds.join(', ')}].`
  if (cell.of.length !== kinds.length)
    fail(path, `A ${cell.part} takes ${kinds.length === 1 ? 'one name' : 'two names'}, but ${cell.of.length} stand here.`)
  kinds.forEach((kind, i) => {
    const name = cell.of[i]!
    if (known[kind].includes(name)) return
    const other = kind === 'indicator' ? 'factor' : 'indicator'
    if (known[other].includes(name))
      fail(
        path,
        `"${name}" is ${other === 'factor' ? 'a factor' : 'an indicator'}, but the ${cell.part} wants ${kind === 'factor' ? 'a factor' : 'an indicator'} there.`,
        secondOrderHint(cell, known.factor) ?? order
      )
    fail(path, `There is no ${kind} "${name}".`, didYouMean(name, known[kind], `${kind}s`))
  })
  if (cell.of.length === 2 && cell.of[0] === cell.of[1]) {
    const instead =
      cell.part === 'factor regression' ? null : `Write "${cell.part.replace('covariance', 'variance')}: ${cell.of[0]}".`
    fail(path, `A ${cell.part} joins two different names, not "${cell.of[0]}" with itself.`, instead)
  }
  if ((cell.part === 'intercept' || cell.part === 'factor mean') && !hasMeans(plan)) {
    fail(path, `There are no means in the data, so there is no ${cell.part} to change.`)
  }
}

function secondOrderHint(cell: CellName, factors: readonly string[]): string | null {
  const isSecondOrder = cell.part === 'loading' && cell.of.every((name) => factors.includes(name))
  return isSecondOrder ? `What a factor measures of another is a "factor regression: [${cell.of.join(', ')}]".` : null
}

/** Two names of one cell: order does not matter where the matrix is symmetric. */
function cellKey(cell: CellName): string {
  const symmetric = cell.part === 'residual covariance' || cell.part === 'factor covariance'
  return JSON.stringify([cell.part, ...(symmetric ? [...cell.of].sort() : cell.of)])
}
