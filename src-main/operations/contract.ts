/**
 * The contract between the window and the program: what a user can do, as names, inputs and plain results.
 *
 * Types only cross this line. Both shells (Electron over IPC, loopback page over HTTP) carry exactly these calls, so
 * no feature can live in one of them only. Inputs are validated by the operation's own schema on the other side.
 */

import type { FitState, Relation, StabilityResult, StudyResult, Verdict } from '../study/result.ts'
import type { Candidate, Caution, CellPart, Estimation, LadderPlan, Origin, Release, Rules } from '../study/study.ts'

export type * from '../study/result.ts'
export type * from '../study/study.ts'

/** A file or folder as the in-window chooser lists it. */
export interface FolderEntry {
  name: string
  path: string
  kind: 'folder' | 'plan' | 'data' | 'project'
}
export interface FolderListing {
  path: string
  parent: string | null
  /** Folders first, then the files Rungwise can open (.yaml .yml .csv .tsv .rungwise), by name. */
  entries: FolderEntry[]
}

/** A first look at a data file, before any study exists. */
export interface DataPreview {
  path: string
  rows: number
  columns: {
    name: string
    /** numeric: every answer is a number or a missing code; else what it holds instead. */
    kind: 'numeric' | 'text'
    missing: number
    distinct: number
    /** First few values as text. */
    sample: string[]
  }[]
  cautions: Caution[]
}

/** A candidate as the list at the left shows it; numbers come from the result once it is fitted. */
export interface CandidateView {
  candidate: Candidate
  state: 'draft' | FitState
  origin: Origin
  /** Made by an invariance ladder rather than written by the user. */
  generated: boolean
  sentence: string
  parameters: number | null
  df: number | null
}

/** What the grid shows while typing. */
export interface CandidateCheck {
  parameters: number
  df: number
  identified: boolean
  /** Parameters in the null space of the information at a generic point, in words; empty when identified. */
  unidentified: string[]
  sentence: string
  /** The candidate with its derivation resolved, group by group, for display in the grid. */
  cells: GroupCellsView[]
}

/** A cell of the grid: a number is fixed, a string a parameter's label (the same label twice is an equality), null is empty. */
export type CellView = number | string | null
export interface GroupCellsView {
  group: string | null
  indicators: string[]
  factors: string[]
  /** indicators x factors */
  loadings: CellView[][]
  /** factors x factors, row = outcome */
  regressions: CellView[][]
  /** factors x factors, symmetric */
  factorCovariances: CellView[][]
  /** indicators x indicators, symmetric */
  residualCovariances: CellView[][]
  intercepts: CellView[] | null
  factorMeans: CellView[] | null
}

export interface DecisionView {
  ladder: string
  rung: string
  reason: string
  /** ISO time. */
  at: string
}

/** One row of the append-only trail. */
export interface TrailEntry {
  number: number
  /** ISO time. */
  at: string
  /** Stable code of what happened, e.g. "candidate added". */
  what: string
  /** One sentence for people. */
  sentence: string
  /** SHA-256 chained over the row before. */
  digest: string
}

/** Everything the window shows of the open study. */
export interface StudyView {
  study: string
  /** Path of the project file, null while the study is not saved. */
  file: string | null
  /** True when nothing was fitted yet, so that rules may still be changed. */
  rulesOpen: boolean
  estimation: Estimation
  rules: Rules
  data: {
    source: string
    indicators: string[]
    grouping: string | null
    groups: { name: string | null; n: number; complete: number }[]
    /** Missing answers among the indicators. */
    missing: number
    cautions: Caution[]
  }
  candidates: CandidateView[]
  ladders: LadderPlan[]
  /** Fitted candidates and ladders so far; drafts are not in it, and a step next to a draft is "no test". */
  result: StudyResult
  decisions: DecisionView[]
  trail: { entries: TrailEntry[]; intact: boolean }
}

/** Progress of running work. `done` of `total` candidates are finished. */
export type WorkEvent =
  | { kind: 'started'; total: number }
  | { kind: 'fitted'; candidate: string; state: FitState; done: number; total: number; secondsLeft: number | null }
  | { kind: 'resampled'; ladder: string; done: number; total: number; secondsLeft: number | null }
  | { kind: 'finished'; cancelled: boolean }

/** One fixed cell or equality of a fitted candidate, and what releasing it would do: exploratory, for it looks at the results. */
export interface ScoreTestView {
  kind: 'fixed cell' | 'equality' | 'constraint'
  part: CellPart
  of: string[]
  group: string | null
  /** The letter of the equality, the equation of a constraint, null for a fixed cell. */
  label: string | null
  /** The cell in words. */
  words: string
  /** Expected drop in T, on one degree of freedom, and its p. */
  statistic: number
  p: number
  /** Expected change of the cell when it is released (from an equality: the distance from the value of the others), raw and completely standardised. */
  change: number
  /** What the estimate is expected to be then; null for a constraint. */
  expectedValue: number | null
  standardizedChange: number | null
  /** stated: somebody chose it; near: what is often overlooked; far: the rest. The order of the list. */
  plausibility: 'stated' | 'near' | 'far'
}

/** One group's cell that a failed step ties to the other groups', in one round of the search. */
export interface ReleaseTestView {
  part: CellPart
  of: string[]
  group: string
  /** The cell in words. */
  words: string
  /** Expected drop in T when it is let go, on one degree of freedom, and its p. */
  statistic: number
  p: number
  /** Adjusted (Holm) over those of the round that may be let go; null for one that may not. */
  holmP: number | null
  /** Expected distance from the other groups' value, raw and completely standardised. */
  change: number
  standardizedChange: number | null
  /** Why it may not be let go; null when it may. */
  kept: string | null
}

/** One round: every equality that the step added tested by itself, one let go, the model fitted again. */
export interface ReleaseRoundView {
  /** Largest statistic first. */
  tests: ReleaseTestView[]
  /** The one let go, and the candidate that was made without it; null when the round let go none. */
  released: ReleaseTestView | null
  candidate: string | null
  /** The step from the lower rung to that candidate, judged by the study's rules on the ladder as it then stands. */
  verdict: Verdict | null
  sentence: string
}

/** The search for equalities that a failed step should not have asked for: found after seeing the results, and marked so. */
export interface ReleaseSearchView {
  ladder: string
  /** The rungs below and above the step. */
  from: string
  to: string
  /** The rule in words, for a paper. */
  rule: string
  rounds: ReleaseRoundView[]
  /** Everything let go, in order. */
  released: ReleaseTestView[]
  ended: 'the step holds' | 'nothing significant is left' | 'nothing more may be let go' | 'no solution' | 'stopped'
  /** Name of the ladder on which the partial rungs stand; null when nothing was let go. */
  partialLadder: string | null
  /** Name of the ladder that climbs on from there, with the same let go on the rungs above; null where there is none. */
  onwardLadder: string | null
  /** Whether the search finds the same with other reference indicators; null when it was stopped before. */
  otherReference: { agrees: boolean | null; released: string[]; sentence: string } | null
  sentence: string
}

/** How much it matters that an indicator is not measured alike in two groups (Nye & Drasgow 2011). Differences are reference minus focal. */
export interface EffectSizeView {
  indicator: string
  reference: string
  focal: string
  interceptDifference: number
  loadingDifferences: { factor: string; difference: number }[]
  /** SD pooled as the mean of both SDs, weighted by n - 1; null where the focal factor variances are improper. */
  dmacs: number | null
  /** The same over the root of the pooled variance. */
  dmacsPooledVariance: number | null
  /** The expected difference over the pooled SD, with its sign. */
  signed: number
  /** On the indicator's own scale, over the focal group's members. */
  expectedDifference: number
  rootMeanSquare: number | null
  pooledSd: number
  sentence: string
}

/** An estimate with its standard error and 95% interval; null where no standard error could be computed. */
export interface DifferenceView {
  estimate: number
  standardError: number | null
  lower: number | null
  upper: number | null
  z: number | null
  p: number | null
}

/** The difference of a factor's mean in `group` from that in `from`. */
export interface LatentMeanView {
  factor: string
  from: string
  group: string
  raw: DifferenceView
  /** In factor standard deviations, pooled over the two groups; null where the pooled variance is not positive. */
  standardised: DifferenceView | null
  pooledSd: number | null
  /** Indicators that both groups have in common: what the comparison rests on. */
  restsOn: string[]
  /** The same with everything that was let go held equal; null when nothing was let go or that model has no solution. */
  allHeld: { raw: DifferenceView; standardised: DifferenceView | null } | null
  sentence: string
}

/** A factor whose means cannot be compared in a pair of groups, and why. */
export interface RefusedComparison {
  factor: string
  from: string
  group: string
  reason: string
}

/** Two candidates with solutions on the same data; `lower` has no more degrees of freedom than `upper`. */
export interface FamilyRelation {
  lower: string
  upper: string
  relation: Relation
  /** order of fit: the more restricted one fits better, so it cannot be nested. other pairs: it follows from them. */
  proof: 'constraints' | 'refit' | 'order of fit' | 'other pairs'
}

/** How all fitted candidates stand to each other, and the ladders that are in that order. */
export interface FamilyRelations {
  /** Every pair on the same data once. */
  relations: FamilyRelation[]
  /** Proposed ladders, the longest first, each bottom (least restrictive) first. */
  chains: string[][]
  /** Sets of equivalent candidates; one of them stands on a ladder for the others. */
  equivalent: string[][]
  /** Nested with nothing, and not equivalent to what is. */
  off: string[]
  /** Without a solution so far. */
  without: string[]
  /** All of it in words. */
  sentences: string[]
}

/** Every call: its input and its result. A call without input takes `null`. */
export interface Operations {
  currentStudy: { input: null; result: StudyView | null }
  openSample: { input: null; result: StudyView }
  openPlan: { input: { path: string }; result: StudyView }
  openProject: { input: { path: string }; result: StudyView }
  listFolder: { input: { path: string | null }; result: FolderListing }
  previewData: { input: { path: string; missingCodes: string[] }; result: DataPreview }
  /** A new study on a data file, without candidates. */
  newStudy: {
    input: {
      study: string
      path: string
      indicators: string[]
      group: string | null
      missingCodes: string[]
      estimation: Estimation
      rules: Rules
    }
    result: StudyView
  }
  checkCandidate: { input: { candidate: Candidate }; result: CandidateCheck }
  addCandidate: { input: { candidate: Candidate }; result: StudyView }
  addLadder: { input: { ladder: LadderPlan }; result: StudyView }
  changeRules: { input: { rules: Rules }; result: StudyView }
  /** Fits the named candidates, or (null) all that are drafts, and what their ladders generate. */
  fitCandidates: { input: { names: string[] | null }; result: StudyView }
  cancelWork: { input: null; result: null }
  /** Score tests of a fitted candidate, plausible releases first. */
  scoreTests: { input: { candidate: string }; result: { tests: ScoreTestView[]; leftOut: number } }
  /** Derives a candidate from any other, generated ones included, with these cells let go from their equality across groups. */
  releaseByHand: { input: { candidate: string; releases: Release[] }; result: StudyView }
  /** Searches, by the stated rule, what to let go so that the step to `rung` holds; each release becomes a candidate, fitted and recorded. */
  releaseSearch: { input: { ladder: string; rung: string }; result: { search: ReleaseSearchView; view: StudyView } }
  /** Refused below the rung that licenses it: some intercepts must be held equal. */
  effectSizes: {
    input: { candidate: string }
    result: { sizes: EffectSizeView[]; refused: RefusedComparison[]; sentence: string }
  }
  /** Refused likewise. */
  latentMeans: {
    input: { candidate: string }
    result: { differences: LatentMeanView[]; refused: RefusedComparison[]; sentence: string }
  }
  /** Refits a fitted ladder to resamples of the cases; stopped work gives what was done. */
  stability: { input: { ladder: string; resamples: number; seed: number }; result: StabilityResult }
  /** The relation of every pair of fitted candidates, and the ladders in them. */
  familyRelations: { input: null; result: FamilyRelations }
  recordDecision: { input: { ladder: string; rung: string; reason: string }; result: StudyView }
  saveProject: { input: { path: string }; result: StudyView }
  exportPlan: { input: { path: string }; result: { path: string } }
  exportResult: { input: { path: string }; result: { path: string } }
}
export type OperationName = keyof Operations

/** What a call answers across a process boundary: bad input is a value the window shows beside the field. */
export type Answer<T> =
  | { ok: true; value: T }
  | { ok: false; problem: { what: string; where: string | null; remedy: string | null } }

/** What the window is given by either shell. */
export interface Client {
  call<N extends OperationName>(name: N, input: Operations[N]['input']): Promise<Answer<Operations[N]['result']>>
  /** Subscribes to progress; returns the way to stop. */
  onWork(listener: (event: WorkEvent) => void): () => void
}
