/**
 * Differences of factor means between groups, with and without what was let go.
 */
import { fixed } from '../reporting/numbers.ts'
import { type Difference, type MeanDifference, meanDifferences } from '../statistics/invariance/latent-means.ts'
import { listed } from '../statistics/model/cell-words.ts'
import { resolveCandidate } from '../study/candidate-model.ts'
import type { Candidate } from '../study/study.ts'
import type { OpenStudy } from './bench.ts'
import { type Comparison, comparableFactors } from './comparable-factors.ts'
import type { LatentMeanView, Operations, RefusedComparison } from './contract.ts'
import { entriesOf } from './entries.ts'
import { familyOf } from './family.ts'
import { type FittedEntry, fittedEntry, type Solution, solutionOf } from './solved-candidate.ts'

type LatentMeans = Operations['latentMeans']

/** @throws InputError for a candidate that has no solution, or that does not license a comparison of groups */
export async function latentMeans(study: OpenStudy, { candidate }: LatentMeans['input']): Promise<LatentMeans['result']> {
  const fitted = fittedEntry(study, candidate)
  const { comparisons, refused } = comparableFactors(candidate, fitted.entry.cells)
  const [open, heldEqual] = apartFromHeldMeans(comparisons, fitted)
  const own = differences(solutionOf(fitted.entry, fitted.gamma, fitted.plan), open)
  const held = await withNothingLetGo(study, fitted)
  const others = held === null ? null : differences(held, open)
  const views = own.map((one, i) => meanView(one, open[i]!.restsOn, others?.[i] ?? null))
  return { differences: views, refused: [...refused, ...heldEqual], sentence: summary(candidate, views) }
}

function differences({ model, states, covariance, sizes }: Solution, wanted: readonly Comparison[]): MeanDifference[] {
  return meanDifferences(model, states, covariance, sizes, wanted)
}

/** Means that the candidate itself makes equal say nothing of how the groups differ. */
function apartFromHeldMeans(comparisons: readonly Comparison[], { entry }: FittedEntry): [Comparison[], RefusedComparison[]] {
  const { factors, groups } = entry.cells
  const isHeld = ({ factor, pair: [g, h] }: Comparison) => {
    const explained = groups.some(({ regressions }) => regressions[factor]!.some((cell) => cell !== 0))
    return !explained && groups[g]!.factorMeans![factor] === groups[h]!.factorMeans![factor]
  }
  const refused = comparisons.filter(isHeld).map(({ factor, pair: [g, h] }) => ({
    factor: factors[factor]!,
    from: groups[g]!.name!,
    group: groups[h]!.name!,
    reason: 'the candidate holds its means equal in the two groups'
  }))
  return [comparisons.filter((one) => !isHeld(one)), refused]
}

/** The solution of the same model with every release taken back: the recorded one, else fitted here. Null when there is none. */
async function withNothingLetGo(study: OpenStudy, { plan, family, entry }: FittedEntry): Promise<Solution | null> {
  const { name, factors, scaling, factorCovariances, across, equal, except, changes } = resolveCandidate(
    entry.candidate.name,
    family.candidates
  )
  if (except.length === 0) return null
  const strict: Candidate = {
    name,
    from: null,
    factors,
    scaling,
    factorCovariances,
    across,
    equalAcrossGroups: equal,
    except: [],
    change: changes
  }
  const project = study.requireProject()
  const alone = familyOf({ ...plan, candidates: [strict], ladders: [] })
  const [other] = entriesOf(plan, project.data(), study.parts.version, alone)
  const { cells, sample, digest } = other!
  const { convention } = plan.estimation
  const outcome =
    project.fits().get(digest) ??
    (await study.parts.crew.fit({
      kind: 'fit',
      candidate: name,
      cells,
      moments: sample.moments,
      settings: { convention },
      rows: null
    }))
  return outcome.gamma === null ? null : solutionOf(other!, outcome.gamma, plan)
}

function meanView(one: MeanDifference, restsOn: string[], held: MeanDifference | null): LatentMeanView {
  const { factor, from, group, raw, standardised, pooledSd } = one
  const allHeld = held === null ? null : { raw: held.raw, standardised: held.standardised }
  return {
    factor,
    from: from!,
    group: group!,
    raw,
    standardised,
    pooledSd,
    restsOn,
    allHeld,
    sentence: meanWords(one, restsOn, held)
  }
}

function meanWords(
  { factor, from, group, raw, standardised }: MeanDifference,
  restsOn: readonly string[],
  held: MeanDifference | null
): string {
  const direction = raw.estimate < 0 ? 'below' : 'above'
  const sign = raw.estimate < 0 ? -1 : 1
  const size = amount(raw, sign)
  const inSds = standardised === null ? '' : `, which is ${amount(standardised, sign)} pooled factor standard deviations`
  const one = restsOn.length === 1 ? ` The comparison rests on ${restsOn[0]} alone, whose equality cannot be tested.` : ''
  const other =
    held?.standardised == null || standardised === null
      ? ''
      : ` Had nothing been let go, it would be ${fixed(held.standardised.estimate * sign, 2)} standard deviations.`
  return `The mean of ${factor} in ${group} is ${size} ${direction} that in ${from}${inSds}.${other}${one}`
}

/** "0.31 (95% interval 0.12 to 0.50)", turned to be positive. */
function amount({ estimate, lower, upper }: Difference, sign: number): string {
  const ends = [lower, upper].map((end) => (end === null ? null : end * sign))
  const [low, high] = sign < 0 ? [ends[1]!, ends[0]!] : [ends[0]!, ends[1]!]
  const interval = low === null ? '' : ` (95% interval ${fixed(low, 2)} to ${fixed(high, 2)})`
  return `${fixed(estimate * sign, 2)}${interval}`
}

function summary(candidate: string, views: readonly LatentMeanView[]): string {
  const clear = views.filter(({ raw }) => raw.lower !== null && (raw.lower > 0 || raw.upper! < 0))
  const all = views.length === 1 ? 'one difference of factor means' : `${views.length} differences of factor means`
  if (clear.length === 0) return `${candidate} allows ${all}; every 95% interval includes zero.`
  const words = clear.map(({ factor, from, group }) => `${factor} between ${from} and ${group}`)
  return `${candidate} allows ${all}; the 95% interval excludes zero for ${listed(words, 6)}.`
}
