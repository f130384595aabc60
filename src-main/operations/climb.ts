/**
 * One ladder from fitted candidates: for every pair of adjacent rungs the proof of how they stand to each other, and what
 * its test needs to know; then the judgement (ladder-result.ts).
 */
import type { MixturePart } from '../statistics/distributions/mixtures.ts'
import { chiBarSquareWeights } from '../statistics/distributions/mixtures.ts'
import { cellCorrelations } from '../statistics/fit/cell-correlations.ts'
import { type Boundary, type BoundaryParameter, boundaryOf } from '../study/boundary.ts'
import { type ResolvedCandidate, resolveCandidate } from '../study/candidate-model.ts'
import { ladderRungs } from '../study/ladders.ts'
import type { CandidateResult, LadderResult } from '../study/result.ts'
import { addsWords } from '../study/sentences.ts'
import type { Candidate, LadderPlan, Plan } from '../study/study.ts'
import type { Crew, RelationOutcome } from '../workers/jobs.ts'
import { digestOf, type Entry, type StudyMemory } from './entries.ts'
import { type BoundaryGround, ladderResult, needsScalingAtUpper, type StepGround } from './ladder-result.ts'

export interface ClimbInput {
  plan: Plan
  memory: StudyMemory
  entries: Entry[]
  results: CandidateResult[]
  family: Candidate[]
}

export async function climb(ladder: LadderPlan, input: ClimbInput, crew: Crew, signal?: AbortSignal): Promise<LadderResult> {
  const { rungs, steps } = await ladderSteps(ladder, input, crew, signal)
  return ladderResult(
    ladder.name,
    rungs,
    steps.map((step) => step.ground),
    input.plan.rules,
    input.results.find((result) => result.name === rungs[0]) ?? null
  )
}

/** A step before it is judged, and what it puts on the boundary. */
export interface LadderStep {
  ground: StepGround
  boundary: StepBoundary | null
}

/** The parameters that a step puts at their bounds, and what its test is for given estimates of them in the lower rung. */
export interface StepBoundary {
  parameters: BoundaryParameter[]
  at: (estimates: readonly (number | null)[]) => BoundaryGround
}

/** The rungs of a ladder and its steps, bottom first; all that is known of them but the judgement. */
export async function ladderSteps(
  ladder: LadderPlan,
  input: ClimbInput,
  crew: Crew,
  signal?: AbortSignal
): Promise<{ rungs: string[]; steps: LadderStep[] }> {
  const rungs = ladderRungs(ladder, input.plan.candidates)
  const steps: LadderStep[] = []
  for (let i = 1; i < rungs.length; i++) steps.push(await ladderStep(rungs[i - 1]!, rungs[i]!, input, crew, signal))
  return { rungs, steps }
}

async function ladderStep(from: string, to: string, input: ClimbInput, crew: Crew, signal?: AbortSignal): Promise<LadderStep> {
  const { entries, results, family, plan } = input
  const [general, restricted] = [from, to].map((name) => entries.find((e) => e.candidate.name === name)!) as [Entry, Entry]
  const [lower, upper] = [from, to].map((name) => results.find((r) => r.name === name) ?? null) as [
    CandidateResult | null,
    CandidateResult | null
  ]
  const sameMoments = momentsKey(general) === momentsKey(restricted)
  const relation = sameMoments ? await relate(general, restricted, input.memory, crew, signal) : null
  const constraints = lower !== null && upper !== null ? upper.df - lower.df : null
  const [lowerCandidate, upperCandidate] = [resolveCandidate(from, family), resolveCandidate(to, family)]
  const ground: StepGround = {
    from,
    to,
    lower,
    upper,
    adds: addsWords(from, to, family, constraints),
    sameMoments,
    relation,
    sizes: general.sample.moments.groups.map((g) => g.n),
    addsLoadings: addsEqualLoadings(lowerCandidate, upperCandidate)
  }
  if (relation?.relation === 'not nested' && lower?.state === 'fitted' && upper?.state === 'fitted') {
    ground.notNested = await casewiseTests(general, restricted, input.memory, crew, signal)
  }
  if (relation?.relation !== 'nested' || lower?.state !== 'fitted' || upper?.state !== 'fitted') return { ground, boundary: null }
  const found = boundaryOf(general.cells, restricted.cells, lowerCandidate, upperCandidate)
  const boundary = found === null ? null : stepBoundary(found, general, upper.df - lower.df, input)
  return {
    ground: {
      ...ground,
      boundary: boundary?.at(boundary.parameters.map((parameter) => estimateOf(parameter, lower))) ?? null,
      scalingAtUpper: needsScalingAtUpper(lower, upper, plan.rules)
        ? await scalingAtUpper(general, restricted, input.memory, crew, signal)
        : null
    },
    boundary
  }
}

/** Whether the step makes loadings equal across groups, or several of them over time. */
function addsEqualLoadings(lower: ResolvedCandidate, upper: ResolvedCandidate): boolean {
  const equalities = ({ changes }: ResolvedCandidate) =>
    changes.filter((change) => change.do === 'equal' && change.cells.every((cell) => cell.part === 'loading')).length
  if (upper.equal.includes('loadings') && !lower.equal.includes('loadings')) return true
  return equalities(upper) > equalities(lower) + 1
}

/** Candidates of one key were fitted to the same moments: the same indicators, by the same groups or pooled. */
export function momentsKey({ cells }: Entry): string {
  return JSON.stringify([cells.indicators, cells.groups.map((g) => g.name)])
}

/** The proved relation of two candidates with solutions; null when one has none. Remembered by both digests. */
async function relate(
  lower: Entry,
  upper: Entry,
  memory: StudyMemory,
  crew: Crew,
  signal?: AbortSignal
): Promise<RelationOutcome | null> {
  const pair = solutions(lower, upper, memory)
  if (pair === null) return null
  const digest = digestOf({ general: lower.digest, restricted: upper.digest })
  const known = memory.relations.get(digest)
  if (known !== undefined) return known
  const outcome = await crew.relation({ kind: 'relation', ...pair, sizes: lower.sample.moments.groups.map((g) => g.n) }, signal)
  memory.relations.set(digest, outcome)
  return outcome
}

async function scalingAtUpper(
  lower: Entry,
  upper: Entry,
  memory: StudyMemory,
  crew: Crew,
  signal?: AbortSignal
): Promise<number | null> {
  const pair = solutions(lower, upper, memory)
  const { moments, rows } = lower.sample
  if (pair === null || rows === null) return null
  return crew.restrictedScaling({ kind: 'restricted scaling', ...pair, moments, rows }, signal)
}

/** The casewise tests of a pair that is not nested, the upper rung as the first model. Remembered by both digests. */
async function casewiseTests(
  lower: Entry,
  upper: Entry,
  { fits, notNested: known }: StudyMemory,
  crew: Crew,
  signal?: AbortSignal
): Promise<NonNullable<StepGround['notNested']>> {
  const { moments, rows } = lower.sample
  const [first, second] = [upper, lower].map(({ cells, digest }) => ({ cells, gamma: fits.get(digest)!.gamma! }))
  if (rows === null) return 'no rows'
  const digest = digestOf({ first: upper.digest, second: lower.digest })
  const tests =
    known?.get(digest) ?? (await crew.notNested({ kind: 'not nested', first: first!, second: second!, moments, rows }, signal))
  known?.set(digest, tests)
  return tests ?? 'no rows'
}

function solutions(lower: Entry, upper: Entry, memory: StudyMemory) {
  const general = memory.fits.get(lower.digest)
  const restricted = memory.fits.get(upper.digest)
  if (general?.gamma == null || restricted?.gamma == null) return null
  return { general: lower.cells, generalGamma: general.gamma, restricted: upper.cells, restrictedGamma: restricted.gamma }
}

/** The mixture that a step on the boundary is referred to: weights for k parameters at their bounds, the others' df added. */
function stepBoundary({ parameters, words }: Boundary, general: Entry, df: number, { memory, plan }: ClimbInput): StepBoundary {
  const k = parameters.length
  const weights = k === 1 ? half : k > 3 ? null : severalWeights(parameters, general, memory, plan)
  const interior = df - k
  const parts = weights === null || interior < 0 ? null : weights.map((part) => ({ df: part.df + interior, weight: part.weight }))
  return {
    parameters,
    at: (estimates) => {
      const beyond = parameters.some((parameter, i) => isBeyond(parameter, estimates[i] ?? null))
      // With several bounds and an estimate beyond one of them, the bounded fit is another one altogether.
      if (k > 3 || (k > 1 && beyond)) return { words, parts: null, beyond: false }
      return { words, parts, beyond }
    }
  }
}

const half: MixturePart[] = [
  { df: 0, weight: 0.5 },
  { df: 1, weight: 0.5 }
]

function severalWeights(
  parameters: readonly BoundaryParameter[],
  { cells, sample, digest }: Entry,
  memory: StudyMemory,
  plan: Plan
): MixturePart[] | null {
  const gamma = memory.fits.get(digest)?.gamma
  if (gamma == null) return null
  const correlations = cellCorrelations(cells, sample.moments, plan.estimation.convention, gamma, parameters)
  return correlations === null ? null : chiBarSquareWeights(correlations)
}

/** The lower rung's own estimate; of a covariance, the correlation. */
function estimateOf({ part, of, group }: BoundaryParameter, lower: CandidateResult): number | null {
  const cell = lower.estimates.find(
    (e) => e.part === part && e.group === group && JSON.stringify([...e.of].sort()) === JSON.stringify([...of].sort())
  )
  return (part === 'factor covariance' ? cell?.standardized : cell?.estimate) ?? null
}

function isBeyond({ at, side }: BoundaryParameter, estimate: number | null): boolean {
  if (estimate === null) return false
  return side === 'below' ? estimate >= at : estimate <= at
}
