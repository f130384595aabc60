/**
 * Checks of the changes and exceptions of a candidate: every cell named must be one the model can have.
 */
import { didYouMean, listed } from './nearest.ts'
import { type Context, hasMeans, setsOf } from './plan-context.ts'
import { type CellName, type Change, kindsOfPart, type Release, setOfPart } from './study.ts'

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
  const cells = cellsOf(change)
  for (const cell of cells) checkCell(context, cell, path)
  if (change.do === 'equal') {
    if (cells.some((cell) => cell.part !== cells[0]!.part)) fail(path, 'An equality ties cells of one part of the model.')
    const seen = cells.map(cellKey)
    const twice = cells.find((_, i) => seen.indexOf(seen[i]!) < i)
    if (twice !== undefined) fail(path, `The ${twice.part} of ${listed(twice.of)} stands twice in one equality.`, 'Remove one.')
  }
  if (change.do === 'fix' && change.at < 0 && isVariance(change.cell)) {
    fail(path, `A ${change.cell.part} cannot be fixed at ${change.at}: a variance is never negative.`)
  }
  if (change.do === 'constrain') checkTerms(context, change, path)
  if (change.do === 'bound') checkLimits(context, change, path)
}

function cellsOf(change: Change): CellName[] {
  if (change.do === 'equal') return change.cells
  return change.do === 'constrain' ? change.terms.map((term) => term.cell) : [change.cell]
}

function isVariance({ part }: CellName): boolean {
  return part === 'residual variance' || part === 'factor variance'
}

/** Terms name a group all or none, the change then none; no cell twice. */
function checkTerms(context: Context, { terms, group }: Extract<Change, { do: 'constrain' }>, path: string): void {
  const { fail } = context
  for (const term of terms) {
    checkGroup(context, term.group, path)
    if (term.times === 0) fail(path, 'A cell taken 0 times constrains nothing.', 'Remove this term.')
  }
  const placed = terms.filter((term) => term.group !== null).length
  if (placed > 0 && group !== null)
    fail(path, `The constraint stands in "${group}", and its terms name groups too.`, 'Name the group in one place.')
  if (placed > 0 && placed < terms.length)
    fail(path, 'Some terms of this constraint name a group and some do not.', 'Name the group of every term, or of none.')
  const seen = terms.map((term) => JSON.stringify([cellKey(term.cell), term.group]))
  const twice = terms.find((_, i) => seen.indexOf(seen[i]!) < i)
  if (twice !== undefined)
    fail(path, `The ${twice.cell.part} of ${listed(twice.cell.of)} stands twice in one constraint.`, 'Add the two up.')
}

function checkLimits({ fail }: Context, { cell, atLeast, atMost }: Extract<Change, { do: 'bound' }>, path: string): void {
  if (atLeast === null && atMost === null) fail(path, 'A bounded cell needs its bound.', 'Add "at least: 0", say.')
  if (atLeast !== null && atMost !== null && atLeast >= atMost) {
    const remedy = atLeast === atMost ? `Write "fix:" and "at: ${atLeast}".` : 'Exchange the two.'
    fail(path, `Nothing lies between at least ${atLeast} and at most ${atMost}.`, remedy)
  }
  if (atMost !== null && atMost <= 0 && isVariance(cell))
    fail(path, `A ${cell.part} cannot be bounded at most at ${atMost}: a variance is never negative.`)
}

function checkGroup({ plan, across, fail }: Context, group: string | null, path: string): void {
  if (group === null) return
  if (across === null)
    fail(path, `The group "${group}" is named, but this candidate is not across groups.`, 'Add "across:" with the grouping.')
  if (plan.data.kind !== 'summary') return
  const groups = plan.data.groups.map((one) => one.name ?? '')
  if (!groups.includes(group)) fail(path, `There is no group "${group}".`, didYouMean(group, groups, 'groups'))
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
