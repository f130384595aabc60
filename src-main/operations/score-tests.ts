/**
 * What releasing a cell of a fitted candidate would do. Exploratory by nature: it looks at the results.
 */
import { cellWords } from '../statistics/model/cell-words.ts'
import { InputError } from '../study/input-error.ts'
import type { Bench } from './bench.ts'
import type { Operations } from './contract.ts'
import { entriesOf } from './entries.ts'
import { familyOf } from './family.ts'

type ScoreTests = Operations['scoreTests']

/** Computed from the recorded solution. Throws InputError for a candidate that is unknown or has no solution. */
export async function scoreTests(bench: Bench, { candidate }: ScoreTests['input']): Promise<ScoreTests['result']> {
  const project = bench.requireProject()
  const plan = project.plan()
  const entry = entriesOf(plan, project.data(), bench.parts.version, familyOf(plan)).find((e) => e.candidate.name === candidate)
  if (entry === undefined) throw new InputError(`There is no candidate "${candidate}".`)
  const gamma = project.fits().get(entry.digest)?.gamma ?? null
  if (gamma === null) {
    throw new InputError(`"${candidate}" has no solution to test.`, { remedy: 'Fit it first; a fit that failed has none.' })
  }
  const { cells, sample } = entry
  const settings = { convention: plan.estimation.convention }
  const { tests, untested, unavailable } = await bench.parts.crew.scoreTests({
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
      words: test.kind === 'constraint' ? `the equation ${test.label}` : cellWords(test.part, test.of, test.group)
    }))
  }
}
