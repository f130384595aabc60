/** dMACS (Nye & Drasgow 2011) and latent mean differences against fixtures/reference/13, on the simulated groups of 01d. */
import { describe, expect, it } from 'vitest'
import { type Example, exampleCells, exampleMoments, readExample } from '../../../tests/reference/examples.ts'
import { normalObjective } from '../estimation/normal-likelihood.ts'
import { estimateCovariance } from '../fit/covariance.ts'
import { fitModel } from '../fit/fit.ts'
import type { ModelCells } from '../model/cells.ts'
import { compileModel } from '../model/compile.ts'
import type { GroupMoments } from '../moments/sample-moments.ts'
import { groupPairs } from './anchors.ts'
import { effectSizes, type MeasuredGroup } from './effect-sizes.ts'
import { type MeanDifference, meanDifferences } from './latent-means.ts'

interface ExpectedSize {
  delta_intercept_reference_minus_focal: number
  delta_loading_reference_minus_focal: number
  root_mean_square_difference: number
  dMACS_weighted_mean_of_sds: number
  dMACS_root_of_pooled_variance: number
  signed_mean_difference_over_sd_weighted_mean_of_sds: number
  item_mean_difference_due_to_noninvariance_focal_density: number
  pooled_sd_weighted_mean_of_sds: number
}
interface ExpectedDifference {
  est: number
  se_expected: number
  se_observed: number
  se_robust: number
  z_expected: number
}
interface Sizes {
  models: Example['models']
  expected: Record<string, { T: number; dMACS: Record<string, ExpectedSize> }> & {
    latent_mean_differences_scalar_model: Record<
      string,
      { raw_difference: ExpectedDifference; standardised_by_pooled_factor_sd: ExpectedDifference }
    >
  }
}

const rows = readExample('01d_simulated_two_factor_invariance.json')
const sizes = readExample<Sizes>('13_dmacs_latent_means.json')
const moments = exampleMoments(rows)
const convention = 'normal' as const

function solved(cells: ModelCells) {
  const { fit, gamma } = fitModel(cells, moments, { convention })
  const model = compileModel(cells)
  const objective = normalObjective(model, moments, convention)
  objective.evaluate(Float64Array.from(gamma!))
  return { fit, model, objective }
}

function sampleSds({ covariance, n }: GroupMoments, p: number): Float64Array {
  return Float64Array.from({ length: p }, (_, i) => Math.sqrt((covariance[i * p + i]! * n) / (n - 1)))
}

const released = Object.keys(sizes.expected).filter((name) => name.startsWith('partial'))

describe('dMACS', () => {
  it.each(released)('is that of the worked example %s, in every pair of groups', (name) => {
    const cells = exampleCells({ ...rows, models: sizes.models }, name)
    const { fit, objective } = solved(cells)
    expect(Math.abs(fit.T! - sizes.expected[name]!.T)).toBeLessThan(1e-6)
    const groups = objective.states.map(
      ({ lambda, nu, factorMean, c, p }, g): MeasuredGroup => ({
        name: cells.groups[g]!.name,
        n: moments.groups[g]!.n,
        lambda,
        nu,
        factorMean,
        factorCovariance: c,
        sd: sampleSds(moments.groups[g]!, p)
      })
    )
    const found = effectSizes(cells.indicators, cells.factors, groups)
    expect(found).toHaveLength(18)
    for (const [key, expected] of Object.entries(sizes.expected[name]!.dMACS)) {
      const [indicator, , reference, , focal] = key.split('_')
      const one = found.find((size) => size.indicator === indicator && size.reference === reference && size.focal === focal)!
      const pairs: [number | null, number][] = [
        [one.interceptDifference, expected.delta_intercept_reference_minus_focal],
        [one.loadingDifferences[0]!.difference, expected.delta_loading_reference_minus_focal],
        [one.rootMeanSquare, expected.root_mean_square_difference],
        [one.dmacs, expected.dMACS_weighted_mean_of_sds],
        [one.dmacsPooledVariance, expected.dMACS_root_of_pooled_variance],
        [one.signed, expected.signed_mean_difference_over_sd_weighted_mean_of_sds],
        [one.expectedDifference, expected.item_mean_difference_due_to_noninvariance_focal_density],
        [one.pooledSd, expected.pooled_sd_weighted_mean_of_sds]
      ]
      for (const [value, wanted] of pairs) expect(Math.abs(value! - wanted), key).toBeLessThan(1e-6)
    }
  })

  it('sums over the factors of an indicator that loads on two, and is not known where the focal variances are improper', () => {
    const group = (intercept: number, second: number, covariance: number[]): MeasuredGroup => ({
      name: String(intercept),
      n: 11,
      lambda: Float64Array.of(1, second),
      nu: Float64Array.of(intercept),
      factorMean: Float64Array.of(0.5, 2),
      factorCovariance: Float64Array.from(covariance),
      sd: Float64Array.of(2)
    })
    const [one] = effectSizes(['x'], ['A', 'B'], [group(1, 0.5, [1, 0, 0, 1]), group(0, 0.2, [1, 0.5, 0.5, 4])])
    // d(eta) = 1 + 0.3 eta_B; its mean 1.6 and variance 0.36 by hand
    expect(one!.expectedDifference).toBeCloseTo(1.6, 12)
    expect(one!.rootMeanSquare).toBeCloseTo(Math.sqrt(1.6 ** 2 + 0.36), 12)
    expect(one!.dmacs).toBeCloseTo(Math.sqrt(1.6 ** 2 + 0.36) / 2, 12)
    const [other] = effectSizes(['x'], ['A', 'B'], [group(-0.6, 0.5, [1, 0, 0, 1]), group(0, 0.2, [1, 0, 0, -1])])
    expect(other!.dmacs).toBeNull()
    expect(other!.expectedDifference).toBeCloseTo(0, 12)
  })
})

describe('latent mean differences', () => {
  const { model, objective } = solved(exampleCells({ ...rows, models: sizes.models }, 'scalar'))
  const n = moments.groups.map((group) => group.n)
  const wanted = [0, 1].flatMap((factor) => groupPairs(3).map((pair) => ({ factor, pair })))

  // The file's robust errors are of another form (expected information on both sides), so they are no figures to meet here.
  it.each(['expected', 'observed'] as const)(
    'and their %s errors are those of the worked example, raw and standardised',
    (kind) => {
      const covariance = estimateCovariance(model, objective, kind, null)
      const found = meanDifferences(model, objective.states, covariance, n, wanted)
      expect(found).toHaveLength(6)
      for (const one of found) {
        const key = `factor${one.factor.slice(1)}_${one.group}_minus_${one.from}`
        const expected = sizes.expected.latent_mean_differences_scalar_model[key]!
        for (const [difference, figures] of [
          [one.raw, expected.raw_difference],
          [one.standardised!, expected.standardised_by_pooled_factor_sd]
        ] as const) {
          expect(Math.abs(difference.estimate - figures.est), key).toBeLessThan(1e-6)
          expect(Math.abs(difference.standardError! - figures[`se_${kind}`]), key).toBeLessThan(1e-6)
          if (kind === 'expected') expect(Math.abs(difference.z! - figures.z_expected), key).toBeLessThan(1e-5)
        }
      }
    }
  )

  it('have no interval where the covariance of the estimates is not known', () => {
    const [one] = meanDifferences(model, objective.states, null, n, wanted.slice(0, 1))
    expect(one!.raw).toMatchObject({ standardError: null, lower: null, upper: null, p: null })
    expect(one!.raw.estimate).toBeCloseTo(0.5646983574, 6)
  })

  it('have the delta-method errors that differences of the function give, with factors explained by others', () => {
    const cells = structuredClone(exampleCells({ ...rows, models: sizes.models }, 'scalar'))
    cells.groups.forEach((group, g) => {
      group.regressions = [
        [0, 0],
        [`path${g}`, 0]
      ]
      group.factorCovariances = [
        [`v${g}`, 0],
        [0, `d${g}`]
      ]
    })
    const second = solved(cells)
    const covariance = estimateCovariance(second.model, second.objective, 'expected', null)!
    const gamma = Float64Array.from(fitModel(cells, moments, { convention }).gamma!)
    const q = gamma.length
    const at = (point: Float64Array): MeanDifference => {
      second.objective.evaluate(point)
      return meanDifferences(second.model, second.objective.states, null, n, [{ factor: 1, pair: [0, 2] }])[0]!
    }
    for (const kind of ['raw', 'standardised'] as const) {
      const slopes = Array.from({ length: q }, (_, k) => {
        const [up, down] = [gamma.slice(), gamma.slice()]
        up[k]! += 1e-5
        down[k]! -= 1e-5
        return (at(up)[kind]!.estimate - at(down)[kind]!.estimate) / 2e-5
      })
      const variance = slopes.reduce((sum, a, i) => sum + slopes.reduce((own, b, j) => own + a * b * covariance[i * q + j]!, 0), 0)
      second.objective.evaluate(gamma)
      const [one] = meanDifferences(second.model, second.objective.states, covariance, n, [{ factor: 1, pair: [0, 2] }])
      expect(one![kind]!.standardError! / Math.sqrt(variance)).toBeCloseTo(1, 6)
    }
  })
})
