/**
 * Checks of one candidate of a plan: where it comes from, its factors, its groups.
 */
import { didYouMean } from './nearest.ts'
import { checkChange, checkRelease } from './plan-cell-checks.ts'
import { acrossOf, type Context, checkGrouping, type Fail, hasMeans, lineageOf, setsOf } from './plan-context.ts'
import type { Candidate, Factor, Plan } from './study.ts'

export function checkCandidate(plan: Plan, byName: ReadonlyMap<string, Candidate>, candidate: Candidate, fail: Fail): void {
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
function checkOrigin(candidate: Candidate, byName: ReadonlyMap<string, Candidate>, fail: Fail): void {
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

function checkFactors(plan: Plan, factors: readonly Factor[], fail: Fail): void {
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
