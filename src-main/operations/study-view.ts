/**
 * The open study as the window shows it: plain values gathered from the project and its recorded outcomes.
 */
import type { Project } from '../project/project.ts'
import { compileModel } from '../statistics/model/compile.ts'
import { standingLadders } from '../study/ladders.ts'
import type { CandidateResult } from '../study/result.ts'
import { candidateSentence } from '../study/sentences.ts'
import type { Candidate, DataSet, Plan } from '../study/study.ts'
import type { Crew } from '../workers/jobs.ts'
import type { CandidateView, StudyView } from './contract.ts'
import { cellsOf, type Family, familyOf } from './family.ts'
import { compareRecorded } from './recorded-work.ts'

/** Fits nothing; a relation that a ladder lacks is settled on the way and recorded. */
export async function studyView(project: Project, crew: Crew, version: string): Promise<StudyView> {
  const plan = project.plan()
  const data = project.data()
  const family = familyOf(plan, project.candidateOrigins(), project.ladderOrigins())
  const result = await compareRecorded({ project, plan, origins: family.origins, names: [], version }, crew)
  const fitted = new Map(result.candidates.map((candidate) => [candidate.name, candidate]))
  return {
    study: plan.study,
    file: project.file,
    rulesOpen: !project.hasFits,
    estimation: plan.estimation,
    rules: plan.rules,
    data: {
      source: data.source,
      indicators: data.indicators,
      grouping: data.grouping,
      groups: result.data.groups,
      missing: result.data.missing.values,
      cautions: result.data.cautions
    },
    candidates: family.candidates.map((candidate) => candidateView(candidate, fitted.get(candidate.name), family, plan, data)),
    ladders: standingLadders(plan.ladders),
    result,
    decisions: project.decisions(),
    trail: { entries: project.trail().map(({ detail: _detail, ...entry }) => entry), intact: project.trailBreak === null }
  }
}

function candidateView(
  candidate: Candidate,
  fitted: CandidateResult | undefined,
  family: Family,
  plan: Plan,
  data: DataSet
): CandidateView {
  const { parameters, df } = fitted ?? draftCounts(candidate.name, family, plan, data)
  return {
    candidate,
    state: fitted?.state ?? 'draft',
    origin: family.origins.get(candidate.name) ?? 'planned',
    generated: family.generated.has(candidate.name),
    sentence: fitted?.sentence ?? candidateSentence(candidate),
    parameters,
    df
  }
}

function draftCounts(name: string, family: Family, plan: Plan, data: DataSet): { parameters: number; df: number } {
  const model = compileModel(cellsOf(name, family.candidates, plan, data))
  return { parameters: model.parameters, df: model.df }
}
