/**
 * What the grid shows while a candidate is being typed: its counts, whether it is identified, and its resolved cells.
 */
import { seededGenerator } from '../statistics/distributions/generator.ts'
import { unidentifiedLabels } from '../statistics/estimation/identification.ts'
import { labelWords } from '../statistics/fit/label-words.ts'
import type { Cell, GroupCells, ModelCells } from '../statistics/model/cells.ts'
import { compileModel } from '../statistics/model/compile.ts'
import { candidateSentence } from '../study/sentences.ts'
import type { Bench } from './bench.ts'
import { sampleSource } from './candidate-moments.ts'
import type { CandidateCheck, CellView, GroupCellsView, Operations } from './contract.ts'
import { cellsOf, familyOf, sampleOf } from './family.ts'

/** Of the generic points at which identification is judged: the same answer for the same candidate. */
const seed = 20_260_103

/** The candidate need not be in the study yet; one of the same name is looked past. */
export function checkCandidate(bench: Bench, { candidate }: Operations['checkCandidate']['input']): CandidateCheck {
  const project = bench.requireProject()
  const plan = project.plan()
  const others = plan.candidates.filter(({ name }) => name !== candidate.name)
  const { candidates } = familyOf({ ...plan, candidates: [...others, candidate] })
  const cells = cellsOf(candidate.name, candidates, plan, project.data())
  const model = compileModel(cells)
  const { parameters, df } = model
  const { moments } = sampleOf(cells, sampleSource(project.data(), plan.estimation))
  const unidentified = unidentifiedLabels(model, moments, seededGenerator(seed)).map((label) => labelWords(model, label))
  return {
    parameters,
    df,
    identified: df >= 0 && unidentified.length === 0,
    unidentified,
    sentence: candidateSentence(candidate),
    cells: cells.groups.map((group) => groupView(group, cells))
  }
}

function groupView(group: GroupCells, { indicators, factors }: ModelCells): GroupCellsView {
  return {
    group: group.name,
    indicators,
    factors,
    loadings: group.loadings.map((row) => row.map(emptyIfZero)),
    regressions: group.regressions.map((row) => row.map(emptyIfZero)),
    factorCovariances: group.factorCovariances.map(emptyOffDiagonal),
    residualCovariances: group.residualCovariances.map(emptyOffDiagonal),
    intercepts: group.intercepts,
    factorMeans: group.factorMeans
  }
}

/** Fixed at zero is an empty cell of the grid, except for variances. */
function emptyIfZero(cell: Cell): CellView {
  return cell === 0 ? null : cell
}

function emptyOffDiagonal(row: Cell[], i: number): CellView[] {
  return row.map((cell, j) => (i === j ? cell : emptyIfZero(cell)))
}
