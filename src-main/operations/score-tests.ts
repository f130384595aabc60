/**
 * What releasing a cell of a fitted candidate would do. Exploratory by nature: it looks at the results.
 */
import { equation } from '../statistics/estimation/score-tests-releases.ts'
import { labelWords } from '../statistics/fit/label-words.ts'
import { cellWords } from '../statistics/model/cell-words.ts'
import type { ModelCells } from '../statistics/model/cells.ts'
import { compileModel } from '../statistics/model/compile.ts'
import { equationWords } from '../study/change-words.ts'
import { InputError } from '../study/input-error.ts'
import type { OpenStudy } from './bench.ts'
import type { Operations } from './contract.ts'
import { fittedEntry } from './solved-candidate.ts'

type ScoreTests = Operations['scoreTests']

/** Computed from the recorded solution. Throws InputError for a candidate that is unknown or has no solution. */
export async function scoreTests(study: OpenStudy, { candidate }: ScoreTests['input']): Promise<ScoreTests['result']> {
  const { plan, entry, gamma } = fittedEntry(study, candidate, 'to test')
  const { cells, sample } = entry
  const settings = { convention: plan.estimation.convention }
  const { tests, untested, unavailable } = await study.parts.crew.scoreTests({
    kind: 'score tests',
    cells,
    moments: sample.moments,
    settings,
    gamma
  })
  if (unavailable !== null) throw new InputError(`No score test can be computed for "${candidate}".`, { remedy: unavailable })
  return {
    leftOut: untested.length,
    tests: tests.map(({ df: _df, exploratory: _exploratory, residualCorrelationChange: _other, ...test }) => ({
      ...test,
      words: test.kind === 'constraint' ? constraintWords(cells, test.label ?? '') : cellWords(test.part, test.of, test.group)
    }))
  }
}

/** The equation with cells in place of labels: "the loading of a on F plus the loading of b on F is 2". */
function constraintWords(cells: ModelCells, text: string): string {
  const constraint = cells.constraints.find((one) => equation(one) === text)
  if (constraint === undefined) return `the equation ${text}`
  const model = compileModel(cells)
  const terms = constraint.terms.map(({ label, weight }) => ({ times: weight, words: labelWords(model, label) }))
  return `${equationWords(terms, constraint.equals)}`
}
