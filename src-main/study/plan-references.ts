/**
 * Does a plan agree with itself? Every name looked up, every derivation followed, every request possible.
 *
 * Works on plain values, so that a plan from a file and a candidate from the window meet the same checks. `placeOf` turns
 * a path in the plan ("candidates.0.from") into the place to name in a message.
 */
import { InputError } from './input-error.ts'
import { didYouMean, listed } from './nearest.ts'
import type {
  Candidate,
  CellName,
  CellPart,
  Change,
  DataPlan,
  DataSet,
  EqualSet,
  Factor,
  LadderPlan,
  Plan,
  Release
} from './study.ts'

export type PlaceOf = (path: string) => string | null

/** The set of `equal across groups` that each kind of cell belongs to; a factor's regressions are its loadings of second order. */
export const setOfPart: Readonly<Record<CellPart, EqualSet>> = {
  loading: 'loadings',
  'factor regression': 'loadings',
  intercept: 'intercepts',
  'residual variance': 'residual variances',
  'residual covariance': 'residual covariances',
  'factor variance': 'factor variances',
  'factor covariance': 'factor covariances',
  'factor mean': 'factor means'
}

/** What the checks of one candidate need to know. */
interface Context {
  plan: Plan
  byName: ReadonlyMap<string, Candidate>
  /** The candidate and its ancestors, root first. */
  lineage: Candidate[]
  factors: Factor[]
  across: string | null
  fail: (path: string, what: string, remedy?: string | null) => never
}

/**
 * @throws InputError for the first thing found wrong, data first, then candidates in order, ladders, rules
 */
export function checkPlan(plan: Plan, placeOf: PlaceOf = () => null): void {
  const fail = (path: string, what: string, remedy: string | null = null): never => {
    throw new InputError(what, { where: placeOf(path), remedy })
  }
  checkData(plan, fail)
  const byName = new Map<string, Candidate>()
  plan.candidates.forEach((candidate, i) => {
    if (byName.has(candidate.name)) fail(`candidates.${i}`, `The candidate "${candidate.name}" stands twice.`, 'Rename one.')
    byName.set(candidate.name, candidate)
  })
  plan.candidates.forEach((candidate, i) => {
    checkCandidate(plan, byName, candidate, (path, what, remedy) => fail(`candidates.${i}${path}`, what, remedy))
  })
  plan.ladders.forEach((ladder, i) => {
    if (plan.ladders.findIndex((other) => other.name === ladder.name) < i)
      fail(`ladders.${i}`, `The ladder "${ladder.name}" stands twice.`, 'Rename one.')
    checkLadder(plan, ladder, (path, what, remedy) => fail(`ladders.${i}${path}`, what, remedy))
  })
  checkRules(plan, fail)
}

/**
 * Group names of changes, and groupings, against data that were read.
 *
 * @throws InputError naming the candidate
 */
export function checkPlanAgainstData(
  plan: Plan,
  data: Pick<DataSet, 'grouping'> & { groups: readonly { name: string | null }[] }
): void {
  const groups = data.groups.map((group) => group.name).filter((name) => name !== null)
  const byName = new Map(plan.candidates.map((candidate) => [candidate.name, candidate]))
  for (const candidate of plan.candidates) {
    if (acrossOf(lineageOf(candidate, byName)) !== null && groups.length < 2) {
      throw new InputError(oneGroup(data.grouping), { where: `candidate "${candidate.name}"`, remedy: 'Remove "across".' })
    }
    for (const item of [...candidate.except, ...candidate.change]) {
      if (item.group !== null && !groups.includes(item.group)) {
        throw new InputError(`There is no group "${item.group}" in the data.`, {
          where: `candidate "${candidate.name}"`,
          remedy: didYouMean(item.group, groups, 'groups')
        })
      }
    }
  }
  for (const ladder of plan.ladders) {
    if ('invarianceOf' in ladder && groups.length < 2)
      throw new InputError(oneGroup(data.grouping), { where: `ladder "${ladder.name}"` })
  }
}

function oneGroup(grouping: string | null): string {
  return grouping === null
    ? 'The data have no groups to compare.'
    : `"${grouping}" holds one group only, so there is nothing to compare across it.`
}

/** The candidate and its ancestors, root first. Parents must be known and must not run in a circle. */
export function lineageOf(candidate: Candidate, byName: ReadonlyMap<string, Candidate>): Candidate[] {
  const lineage = [candidate]
  for (let from = candidate.from; from !== null; from = lineage[0]!.from) {
    const parent = byName.get(from)
    if (parent === undefined || lineage.includes(parent)) throw new Error(`The parents of "${candidate.name}" were not checked`)
    lineage.unshift(parent)
  }
  return lineage
}

/** The grouping that a candidate is across: its own word, or the nearest ancestor's. */
function acrossOf(lineage: readonly Candidate[]): string | null {
  return lineage.findLast((candidate) => candidate.across !== null)?.across ?? null
}

/** The grouping of the data, null when there is none to compare across. */
function groupingOf(data: DataPlan): string | null {
  return data.kind === 'file' ? data.group : data.groups.length > 1 ? data.group : null
}

function hasMeans(plan: Plan): boolean {
  if (plan.estimation.convention === 'wishart') return false
  return plan.data.kind === 'file' || plan.data.groups.every((group) => group.mean !== null)
}

function checkData(plan: Plan, fail: Context['fail']): void {
  const { data, estimation } = plan
  const repeated = data.indicators.find((name, i) => data.indicators.indexOf(name) < i)
  if (repeated !== undefined) fail('data.indicators', `The indicator "${repeated}" is listed twice.`, 'Remove one.')
  if (data.kind === 'file' && data.group !== null && data.indicators.includes(data.group)) {
    fail('data.group', `"${data.group}" is an indicator and the grouping.`, 'A column can be one of the two.')
  }
  if (estimation.convention !== 'wishart') return
  const remedy = 'It is for published covariances without means (covariances only); use "convention: normal" here.'
  if (data.kind === 'file') fail('estimation.convention', 'The wishart convention does not go with a file of raw data.', remedy)
  if (data.kind === 'summary' && data.groups.some((group) => group.mean !== null)) {
    fail('estimation.convention', 'The wishart convention does not go with means.', remedy)
  }
}

function checkCandidate(plan: Plan, byName: ReadonlyMap<string, Candidate>, candidate: Candidate, fail: Context['fail']): void {
  checkOrigin(candidate, byName, fail)
  const lineage = lineageOf(candidate, byName)
  const factors = lineage[0]!.factors!
  const context: Context = { plan, byName, lineage, factors, across: acrossOf(lineage), fail }
  if (candidate.factors !== null) checkFactors(plan, candidate.factors, fail)
  checkAcross(context, candidate)
  candidate.except.forEach((release, i) => {
    checkRelease(context, release, `.except.${i}`)
  })
  candidate.change.forEach((change, i) => {
    checkChange(context, change, `.change.${i}`)
  })
}

/** Factors of its own or a parent, never both; parents known and not in a circle. */
function checkOrigin(candidate: Candidate, byName: ReadonlyMap<string, Candidate>, fail: Context['fail']): void {
  const { name, from, factors } = candidate
  if (from === null) {
    if (factors === null)
      fail('', `"${name}" has neither factors nor a parent.`, 'Add "factors:", or "from:" with another candidate.')
    return
  }
  if (factors !== null)
    fail('.factors', `"${name}" is derived from "${from}", so it cannot list factors of its own.`, 'Remove "from" or "factors".')
  const path = [name]
  for (let next: string | null = from; next !== null; next = byName.get(next)!.from) {
    const child = path.at(-1)!
    if (!byName.has(next)) {
      fail(
        child === name ? '.from' : '',
        `"${child}" is derived from "${next}", which is not a candidate.`,
        didYouMean(next, [...byName.keys()], 'candidates')
      )
    }
    if (path.includes(next))
      fail(
        '.from',
        `The derivation runs in a circle: ${[...path, next].map((one) => `"${one}"`).join(' from ')}.`,
        'Give one of them factors of its own.'
      )
    path.push(next)
  }
  if (byName.get(path.at(-1)!)!.factors === null) {
    fail('', `"${name}" is derived from "${path.at(-1)}", which has no factors.`, `Add "factors:" to "${path.at(-1)}".`)
  }
}

function checkFactors(plan: Plan, factors: readonly Factor[], fail: Context['fail']): void {
  const names = factors.map((factor) => factor.name)
  const known = [...plan.data.indicators, ...names]
  factors.forEach((factor, i) => {
    const path = `.factors.${i}`
    if (names.indexOf(factor.name) < i) fail(path, `The factor "${factor.name}" stands twice.`, 'Rename one.')
    if (plan.data.indicators.includes(factor.name))
      fail(path, `"${factor.name}" is an indicator and a factor.`, 'Rename the factor.')
    factor.measures.forEach((measured, j) => {
      if (!known.includes(measured)) {
        fail(
          `${path}.${j}`,
          `The factor "${factor.name}" measures "${measured}", which is neither an indicator nor a factor.`,
          didYouMean(measured, known, 'known names')
        )
      }
      if (measured === factor.name)
        fail(`${path}.${j}`, `The factor "${factor.name}" measures itself.`, 'Remove it from its own list.')
      if (factor.measures.indexOf(measured) < j)
        fail(`${path}.${j}`, `"${measured}" stands twice under "${factor.name}".`, 'Remove one.')
    })
  })
  const circle = findCircle(factors)
  if (circle !== null) {
    const at = names.indexOf(circle[0]!)
    fail(
      `.factors.${at}`,
      `Factors measure each other in a circle: ${circle.map((one) => `"${one}"`).join(' measures ')}.`,
      'Remove one of these lines.'
    )
  }
}

/** A circle of factors, its first name repeated at the end, or null. */
function findCircle(factors: readonly Factor[]): string[] | null {
  const measures = new Map(factors.map((factor) => [factor.name, factor.measures]))
  const done = new Set<string>()
  const follow = (name: string, path: string[]): string[] | null => {
    const start = path.indexOf(name)
    if (start >= 0) return [...path.slice(start), name]
    if (done.has(name)) return null
    for (const next of measures.get(name) ?? []) {
      const circle = follow(next, [...path, name])
      if (circle !== null) return circle
    }
    done.add(name)
    return null
  }
  for (const factor of factors) {
    const circle = follow(factor.name, [])
    if (circle !== null) return circle
  }
  return null
}

function checkAcross({ plan, lineage, across, fail }: Context, candidate: Candidate): void {
  if (candidate.across !== null) checkGrouping(plan, candidate.across, (what, remedy) => fail('.across', what, remedy))
  const sets = candidate.equalAcrossGroups ?? []
  if (sets.length > 0 && across === null)
    fail('.equal across groups', `"${candidate.name}" is not across groups.`, 'Add "across:" with the grouping.')
  const repeated = sets.find((set, i) => sets.indexOf(set) < i)
  if (repeated !== undefined) fail('.equal across groups', `"${repeated}" stands twice.`, 'Remove one.')
  const ofMeans = sets.find((set) => set === 'intercepts' || set === 'factor means')
  if (ofMeans !== undefined && !hasMeans(plan))
    fail('.equal across groups', `There are no means in the data, so there are no ${ofMeans} to hold equal.`)
  if (candidate.except.length > 0 && setsOf(lineage).length === 0) {
    fail(
      '.except',
      `"${candidate.name}" holds nothing equal across groups, so nothing can be excepted.`,
      'Add "equal across groups:".'
    )
  }
}

function setsOf(lineage: readonly Candidate[]): EqualSet[] {
  return lineage.findLast((candidate) => candidate.equalAcrossGroups !== null)?.equalAcrossGroups ?? []
}

function checkGrouping(plan: Plan, across: string, fail: (what: string, remedy: string) => never): void {
  const grouping = groupingOf(plan.data)
  if (grouping === null) {
    const add = plan.data.kind === 'file' ? 'Add "group:" with the column\'s name to the data.' : 'Give the summary of each group.'
    fail(`There are no groups in the data to go across "${across}".`, add)
  }
  if (across !== grouping) fail(`"${across}" is not the grouping of the data.`, `The grouping is "${grouping}".`)
}

function checkRelease(context: Context, release: Release, path: string): void {
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

function checkChange(context: Context, change: Change, path: string): void {
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

function checkLadder(plan: Plan, ladder: LadderPlan, fail: Context['fail']): void {
  const names = plan.candidates.map((candidate) => candidate.name)
  const unknown = (name: string, path: string): void => {
    if (!names.includes(name))
      fail(path, `The ladder "${ladder.name}" names "${name}", which is not a candidate.`, didYouMean(name, names, 'candidates'))
  }
  if ('rungs' in ladder) {
    ladder.rungs.forEach((rung, r) => {
      unknown(rung, `.rungs.${r}`)
      if (ladder.rungs.indexOf(rung) < r)
        fail(`.rungs.${r}`, `"${rung}" stands twice on the ladder "${ladder.name}".`, 'Remove one.')
    })
    return
  }
  unknown(ladder.invarianceOf, '.invariance of')
  checkGrouping(plan, ladder.across, (what, remedy) => fail('.across', what, remedy))
  if (!hasMeans(plan) && (ladder.through === 'scalar' || ladder.through === 'strict')) {
    fail(
      '.through',
      `There are no means in the data, so the ladder cannot go through ${ladder.through}.`,
      'Write "through: metric", or give means.'
    )
  }
}

function checkRules({ rules }: Plan, fail: Context['fail']): void {
  const thresholds = Object.values(rules.changeInFit ?? {}).filter((value) => value !== null)
  if (rules.decideBy !== 'difference test' && thresholds.length === 0) {
    fail('rules.decide by', `"decide by: ${rules.decideBy}" needs thresholds.`, 'Add "change in fit: { cfi: -0.01 }", say.')
  }
}
