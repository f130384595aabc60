/**
 * Does a plan agree with itself, and with data that were read? Every name looked up, every request possible.
 *
 * Works on plain values, so that a plan from a file and a candidate from the window meet the same checks. `placeOf` turns
 * a path in the plan ("candidates.0.from") into the place to name in a message.
 */
import { InputError } from './input-error.ts'
import { generatedNames, ladderCandidates, standingLadders } from './ladders.ts'
import { didYouMean } from './nearest.ts'
import { checkCandidate } from './plan-candidate-checks.ts'
import { acrossOf, checkGrouping, type Fail, hasMeans, lineageOf } from './plan-context.ts'
import { checkOccasions } from './repeated.ts'
import type { Candidate, DataSet, Estimation, LadderPlan, Plan } from './study.ts'

export type PlaceOf = (path: string) => string | null

/**
 * @throws InputError for the first thing found wrong: data, candidates in order, ladders, candidates derived from rungs of these, rules
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
  const checkThose = (fromRungs: boolean, names: ReadonlyMap<string, Candidate>) =>
    plan.candidates.forEach((candidate, i) => {
      if (derivesFromRung(candidate, plan) === fromRungs)
        checkCandidate(plan, names, candidate, (path, what, remedy) => fail(`candidates.${i}${path}`, what, remedy))
    })
  checkThose(false, byName)
  plan.ladders.forEach((ladder, i) => {
    const before = standingLadders(plan.ladders.slice(0, i)).map((other) => other.name)
    const twice = standingLadders([ladder]).find((one) => before.includes(one.name))
    if (twice !== undefined) fail(`ladders.${i}`, `The ladder "${twice.name}" stands twice.`, 'Rename one.')
    checkLadder(plan, ladder, (path, what, remedy) => fail(`ladders.${i}${path}`, what, remedy))
  })
  checkThose(true, familyByName(plan))
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
  const byName = familyByName(plan)
  for (const candidate of plan.candidates) {
    if (acrossOf(lineageOf(candidate, byName)) !== null && groups.length < 2) {
      throw new InputError(oneGroup(data.grouping), { where: `candidate "${candidate.name}"`, remedy: 'Remove "across".' })
    }
    const terms = candidate.change.flatMap((change) => (change.do === 'constrain' ? change.terms : []))
    for (const item of [...candidate.except, ...candidate.change, ...terms]) {
      if (item.group !== null && !groups.includes(item.group)) {
        throw new InputError(`There is no group "${item.group}" in the data.`, {
          where: `candidate "${candidate.name}"`,
          remedy: didYouMean(item.group, groups, 'groups')
        })
      }
    }
  }
  for (const ladder of plan.ladders) {
    if ('across' in ladder && groups.length < 2) throw new InputError(oneGroup(data.grouping), { where: `ladder "${ladder.name}"` })
  }
}

function oneGroup(grouping: string | null): string {
  return grouping === null
    ? 'The data have no groups to compare.'
    : `"${grouping}" holds one group only, so there is nothing to compare across it.`
}

function checkData(plan: Plan, fail: Fail): void {
  const { data, estimation } = plan
  const repeated = data.indicators.find((name, i) => data.indicators.indexOf(name) < i)
  if (repeated !== undefined) fail('data.indicators', `The indicator "${repeated}" is listed twice.`, 'Remove one.')
  if (data.kind === 'file' && data.group !== null && data.indicators.includes(data.group)) {
    fail('data.group', `"${data.group}" is an indicator and the grouping.`, 'A column can be one of the two.')
  }
  if (data.kind === 'summary') checkSummaryEstimation(estimation, fail)
  if (estimation.convention !== 'wishart') return
  const remedy = 'It is for published covariances without means (covariances only); use "convention: normal" here.'
  if (data.kind === 'file') fail('estimation.convention', 'The wishart convention does not go with a file of raw data.', remedy)
  if (data.kind === 'summary' && data.groups.some((group) => group.mean !== null)) {
    fail('estimation.convention', 'The wishart convention does not go with means.', remedy)
  }
}

/** Published covariances say nothing case by case. */
function checkSummaryEstimation(estimation: Estimation, fail: Fail): void {
  const refuse = (key: string, value: string, instead: string) =>
    fail(
      `estimation.${key}`,
      `"${key}: ${value}" needs the answers themselves, and published covariances have none.`,
      `Use "${instead}".`
    )
  if (estimation.statistic !== 'normal theory') refuse('statistic', estimation.statistic, 'normal theory')
  if (estimation.missing !== 'complete cases') refuse('missing', estimation.missing, 'complete cases')
  if (estimation.standardErrors === 'robust') refuse('standard errors', estimation.standardErrors, 'expected')
}

function checkLadder(plan: Plan, ladder: LadderPlan, fail: Fail): void {
  const written = plan.candidates.map((candidate) => candidate.name)
  const unknown = (name: string, path: string, names: readonly string[]): void => {
    if (!names.includes(name))
      fail(path, `The ladder "${ladder.name}" names "${name}", which is not a candidate.`, didYouMean(name, names, 'candidates'))
  }
  if ('rungs' in ladder) {
    const names = [...new Set([...written, ...allGenerated(plan)])]
    ladder.rungs.forEach((rung, r) => {
      unknown(rung, `.rungs.${r}`, names)
      if (ladder.rungs.indexOf(rung) < r)
        fail(`.rungs.${r}`, `"${rung}" stands twice on the ladder "${ladder.name}".`, 'Remove one.')
    })
    return
  }
  unknown(ladder.invarianceOf, '.invariance of', written)
  if (derivesFromRung(plan.candidates.find((one) => one.name === ladder.invarianceOf)!, plan)) {
    fail('.invariance of', `"${ladder.invarianceOf}" derives from a rung of a ladder, and cannot carry a ladder itself.`)
  }
  if ('over' in ladder) checkOccasions(plan, ladder, fail)
  else checkGrouping(plan, ladder.across, (what, remedy) => fail('.across', what, remedy))
  if (!hasMeans(plan) && (ladder.through === 'scalar' || ladder.through === 'strict')) {
    fail(
      '.through',
      `There are no means in the data, so the ladder cannot go through ${ladder.through}.`,
      'Write "through: metric", or give means.'
    )
  }
  if ('across' in ladder) checkStructural(ladder, fail)
}

/** Factors' variances and covariances can be compared where loadings are equal, their means where intercepts are too. */
function checkStructural({ name, through, and }: Extract<LadderPlan, { across: string }>, fail: Fail): void {
  and?.forEach((set, k) => {
    if (and.indexOf(set) < k) fail(`.and.${k}`, `"${set}" stands twice on the ladder "${name}".`, 'Remove one.')
    const means = set === 'factor means'
    if (through === 'configural' || (means && through === 'metric')) {
      fail(
        `.and.${k}`,
        `Equal ${set} mean something only where ${means ? 'intercepts' : 'loadings'} are equal.`,
        `Write "through: ${means ? 'scalar' : 'metric'}" or higher, or remove "${set}".`
      )
    }
  })
}

/** What the invariance ladders of the plan bring with them: a listed ladder may stand on it, and candidates derive from it. */
function allGenerated(plan: Plan): string[] {
  return plan.ladders.flatMap(generatedNames)
}

/** Whether a candidate derives, directly or not, from what a ladder brings with it. */
function derivesFromRung(candidate: Candidate, plan: Plan): boolean {
  const generated = allGenerated(plan)
  const seen = new Set<string>()
  for (let next: Candidate | undefined = candidate; next !== undefined && next.from !== null; ) {
    const from: string = next.from
    next = plan.candidates.find((one) => one.name === from)
    if (next === undefined) return generated.includes(from)
    if (seen.has(from)) return false
    seen.add(from)
  }
  return false
}

/** Written and generated candidates by name; of a plan whose ladders were checked. */
function familyByName(plan: Plan): Map<string, Candidate> {
  const generated = plan.ladders.flatMap((ladder) => ladderCandidates(ladder, plan.candidates))
  return new Map([...generated, ...plan.candidates].map((candidate) => [candidate.name, candidate]))
}

function checkRules({ rules }: Plan, fail: Fail): void {
  const thresholds = Object.values(rules.changeInFit ?? {}).filter((value) => value !== null)
  if (rules.decideBy !== 'difference test' && thresholds.length === 0) {
    fail('rules.decide by', `"decide by: ${rules.decideBy}" needs thresholds.`, 'Add "change in fit: { cfi: -0.01 }", say.')
  }
}
