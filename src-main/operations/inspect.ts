/**
 * A closer look at one fitted candidate, as the command line gives it: what letting a restriction go would do, how much
 * non-invariance matters, and the differences of factor means. The same operations as the window's.
 */
import { pIs, statistic } from '../reporting/numbers.ts'
import { plainName, wrap } from '../reporting/text-lines.ts'
import { InputError } from '../study/input-error.ts'
import type { OpenStudy } from './bench.ts'
import type { Operations } from './contract.ts'
import { effectSizes } from './effect-sizes.ts'
import { latentMeans } from './latent-means.ts'
import { scoreTests } from './score-tests.ts'

/** What a candidate does not license is null, with the reason in `refused`. */
export interface Inspection {
  candidate: string
  scoreTests: Operations['scoreTests']['result'] | null
  effectSizes: Operations['effectSizes']['result'] | null
  latentMeans: Operations['latentMeans']['result'] | null
  refused: string[]
}

export async function inspect(study: OpenStudy, candidate: string): Promise<Inspection> {
  const refused: string[] = []
  const unlessRefused = async <Result>(work: Promise<Result>): Promise<Result | null> => {
    try {
      return await work
    } catch (error) {
      if (!(error instanceof InputError)) throw error
      if (!refused.includes(error.message)) refused.push(error.message)
      return null
    }
  }
  return {
    candidate,
    scoreTests: await unlessRefused(scoreTests(study, { candidate })),
    effectSizes: await unlessRefused(effectSizes(study, { candidate })),
    latentMeans: await unlessRefused(latentMeans(study, { candidate })),
    refused
  }
}

/** Score tests beyond these are in the JSON only. */
const shownTests = 10

/** Ending in a line end. */
export function inspectionText(
  { candidate, scoreTests: scores, effectSizes: sizes, latentMeans: means, refused }: Inspection,
  width = 80
): string {
  const item = (text: string) =>
    wrap(plainName(text), width, '    ').map((line, i) => (i === 0 ? line.replace('    ', '  - ') : line))
  const tests = (scores?.tests ?? []).slice(0, shownTests)
  const different = (sizes?.sizes ?? []).filter((size) => size.expectedDifference !== 0 || size.dmacs !== 0)
  const lines = [
    '',
    ...wrap(`A closer look at ${plainName(candidate)}`, width),
    ...(tests.length === 0
      ? []
      : wrap('If one restriction were let go (exploratory: these look at the results, many at once):', width, '  ')),
    ...tests.flatMap((test) => item(`${test.words}: T would drop by about ${statistic(test.statistic)}, ${pIs('p', test.p)}`)),
    ...(sizes === null ? [] : wrap(plainName(sizes.sentence), width, '  ')),
    ...different.flatMap((size) => item(size.sentence)),
    ...(means === null
      ? []
      : [...wrap(plainName(means.sentence), width, '  '), ...means.differences.flatMap((one) => item(one.sentence))]),
    ...refused.flatMap((reason) => item(reason))
  ]
  return lines.map((line) => line.trimEnd()).join('\n') + '\n'
}
