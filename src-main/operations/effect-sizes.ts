/**
 * How much it matters that indicators are not measured alike: dMACS and the score difference to expect, in words too.
 */
import { fixed, index } from '../reporting/numbers.ts'
import { type EffectSize, type MeasuredGroup, effectSizes as sizesOf } from '../statistics/invariance/effect-sizes.ts'
import type { ModelCells } from '../statistics/model/cells.ts'
import type { GroupMoments } from '../statistics/moments/sample-moments.ts'
import type { OpenStudy } from './bench.ts'
import { type Comparison, comparableFactors } from './comparable-factors.ts'
import type { EffectSizeView, Operations } from './contract.ts'
import { fittedEntry, solutionOf } from './solved-candidate.ts'

type EffectSizes = Operations['effectSizes']

/** @throws InputError for a candidate that has no solution, or that does not license a comparison of groups */
export async function effectSizes(study: OpenStudy, { candidate }: EffectSizes['input']): Promise<EffectSizes['result']> {
  const { plan, entry, gamma } = fittedEntry(study, candidate)
  const { cells, sample } = entry
  const { comparisons, refused } = comparableFactors(candidate, cells)
  const { states } = solutionOf(entry, gamma, plan)
  const groups = states.map(({ lambda, nu, factorMean, c }, g): MeasuredGroup => {
    const moments = sample.moments.groups[g]!
    return { name: moments.name, n: moments.n, lambda, nu, factorMean, factorCovariance: c, sd: sampleSds(moments) }
  })
  const licensed = sizesOf(cells.indicators, cells.factors, groups).filter((size) => isLicensed(size, cells, comparisons))
  const sizes = licensed.map(effectSizeView)
  return { sizes, refused, sentence: summary(candidate, sizes) }
}

/** Standard deviations with divisor n - 1; the sample's covariances have divisor n. */
function sampleSds({ covariance, n }: GroupMoments): Float64Array {
  const p = Math.sqrt(covariance.length)
  return Float64Array.from({ length: p }, (_, i) => Math.sqrt((covariance[i * p + i]! * n) / (n - 1)))
}

/** Every factor that the indicator loads on must be comparable in the two groups. */
function isLicensed(
  { loadingDifferences, reference, focal }: EffectSize,
  cells: ModelCells,
  comparisons: readonly Comparison[]
): boolean {
  return loadingDifferences.every(({ factor }) =>
    comparisons.some(
      ({ factor: k, pair: [g, h] }) =>
        cells.factors[k] === factor && cells.groups[g]!.name === reference && cells.groups[h]!.name === focal
    )
  )
}

function effectSizeView(size: EffectSize): EffectSizeView {
  const { reference, focal } = size
  return { ...size, reference: reference!, focal: focal!, sentence: sizeWords(size) }
}

function sizeWords(size: EffectSize): string {
  const { indicator, reference, focal, expectedDifference, dmacs } = size
  if (isAlike(size)) return `${indicator} is held to be measured alike in ${reference} and ${focal}.`
  const amount = fixed(Math.abs(expectedDifference), 2)
  const direction = expectedDifference > 0 ? 'lower' : 'higher'
  const inSds = dmacs === null ? 'dMACS is not defined, for factor variances are improper' : `dMACS = ${index(dmacs)}`
  const varying = size.loadingDifferences.some(({ difference }) => difference !== 0)
    ? `; the difference varies with the standing, with a root mean square of ${fixed(size.rootMeanSquare, 2)}`
    : ''
  return `At the same standing on what it measures, people in ${focal} answer ${indicator} ${amount} ${direction} on average, on its own scale, than people in ${reference} would (${inSds}${varying}).`
}

function isAlike({ interceptDifference, loadingDifferences }: EffectSize): boolean {
  return interceptDifference === 0 && loadingDifferences.every(({ difference }) => difference === 0)
}

function summary(candidate: string, sizes: readonly EffectSizeView[]): string {
  const apart = sizes.filter((size) => !isAlike(size))
  const [largest] = [...apart].sort((a, b) => (b.dmacs ?? 0) - (a.dmacs ?? 0))
  if (largest === undefined) {
    return `${candidate} holds every indicator to be measured alike in all groups, so there is no difference whose size could be told. Look at a candidate in which something was let go.`
  }
  return `${candidate} lets ${apart.length === 1 ? 'one indicator differ in one pair of groups' : `indicators differ in ${apart.length} comparisons of two groups`}. The largest difference: ${largest.sentence}`
}
