/**
 * One ladder from fitted candidates: for every pair of adjacent rungs the proof of how they stand to each other, and what
 * its test needs to know; then the judgement (ladder-result.ts).
 */
import type { MixturePart } from '../statistics/distributions/mixtures.ts'
import { chiBarSquareWeights } from '../statistics/distributions/mixtures.ts'
import { cellCorrelations } from '../statistics/fit/cell-correlations.ts'
import { type Boundary, type BoundaryParameter, boundaryOf } from '../study/boundary.ts'
import { resolveCandidate } from '../study/candidate-model.ts'
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
  const rungs = ladderRungs(ladder, input.plan.candidates)
  const grounds: StepGround[] = []
  for (let i = 1; i < rungs.length; i++) grounds.push(await stepGround(rungs[i - 1]!, rungs[i]!, input, crew, signal))
  return ladderResult(ladder.name, rungs, grounds, input.plan.rules)
}

async function stepGround(from: string, to: string, input: ClimbInput, crew: Crew, signal?: AbortSignal): Promise<StepGround> {
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
    addsLoadings: upperCandidate.equal.includes('loadings') && !lowerCandidate.equal.includes('loadings')
  }
  if (relation?.relation !== 'nested' || lower?.state !== 'fitted' || upper?.state !== 'fitted') return ground
  const boundary = boundaryOf(general.cells, restricted.cells, lowerCandidate, upperCandidate)
  return {
    ...ground,
    boundary: boundary === null ? null : boundaryGround(boundary, general, lower, upper, input),
    scalingAtUpper: needsScalingAtUpper(lower, upper, plan.rules)
      ? await scalingAtUpper(general, restricted, input.memory, crew, signal)
      : null
  }
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

function solutions(lower: Entry, upper: Entry, memory: StudyMemory) {
  const general = memory.fits.get(lower.digest)
  const restricted = memory.fits.get(upper.digest)
  if (general?.gamma == null || restricted?.gamma == null) return null
  return { general: lower.cells, generalGamma: general.gamma, restricted: upper.cells, restrictedGamma: restricted.gamma }
}

/** The mixture that a step on the boundary is referred to: weights for k parameters at their bounds, the others' df added. */
function boundaryGround(
  { parameters, words }: Boundary,
  general: Entry,
  lower: CandidateResult,
  upper: CandidateResult,
  { memory, plan }: ClimbInput
): BoundaryGround {
  const beyond = parameters.filter((parameter) => isBeyond(parameter, lower)).length
  const k = parameters.length
  // With several bounds and an estimate beyond one of them, the bounded fit is another one altogether.
  if (k > 3 || (k > 1 && beyond > 0)) return { words, parts: null, beyond: false }
  const weights = k === 1 ? half : severalWeights(parameters, general, memory, plan)
  const interior = upper.df - lower.df - k
  const parts = weights === null || interior < 0 ? null : weights.map(({ df, weight }) => ({ df: df + interior, weight }))
  return { words, parts, beyond: beyond > 0 }
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

/** Whether the lower rung's own estimate lies beyond the bound. A covariance is judged by its correlation. */
function isBeyond({ part, of, group, at, side }: BoundaryParameter, lower: CandidateResult): boolean {
  const cell = lower.estimates.find(
    (e) => e.part === part && e.group === group && JSON.stringify([...e.of].sort()) === JSON.stringify([...of].sort())
  )
  const value = part === 'factor covariance' ? cell?.standardized : cell?.estimate
  if (value == null) return false
  return side === 'below' ? value >= at : value <= at
}
