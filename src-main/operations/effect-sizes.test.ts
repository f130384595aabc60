/** Effect sizes and latent means of fitted candidates, from plan to words, against fixtures/reference/13. */
import { mkdtempSync, readFileSync, rmSync, writeFileSync } from 'node:fs'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { fileURLToPath } from 'node:url'
import { afterEach, beforeEach, describe, expect, it } from 'vitest'
import { readExample } from '../../tests/reference/examples.ts'
import { done, refused, startBench } from './test-bench.ts'

const rows = fileURLToPath(new URL('../../fixtures/two-factors/two-factors.csv', import.meta.url))

interface Figures {
  expected: {
    partial_intercept_and_loading_y2_free_in_g2_and_g3: {
      dMACS: Record<string, { dMACS_weighted_mean_of_sds: number; item_mean_difference_due_to_noninvariance_focal_density: number }>
    }
    latent_mean_differences_scalar_model: Record<
      string,
      {
        raw_difference: { est: number; se_expected: number }
        standardised_by_pooled_factor_sd: { est: number; se_expected: number }
      }
    >
  }
}
const { expected } = readExample<Figures>('13_dmacs_latent_means.json')

const plan = `study: Two factors in three groups
data: { file: rows.csv, indicators: [y1, y2, y3, y4, y5, y6], group: group }
candidates:
  Two factors:
    factors: { First: [y1, y2, y3], Second: [y4, y5, y6] }
  y2 let go:
    from: Two factors
    across: group
    equal across groups: [loadings, intercepts]
    except:
      - { loading: [y2, First] }
      - { intercept: y2 }
  First not compared:
    from: Two factors
    across: group
    equal across groups: [loadings, intercepts]
    except: [{ intercept: y1 }, { intercept: y2 }, { intercept: y3 }]
  Over both:
    factors: { First: [y1, y2, y3], Second: [y4, y5, y6], Both: [First, Second] }
    change:
      - equal: { factor regression: [[First, Both], [Second, Both]] }
ladders:
  Groups: { invariance of: Two factors, across: group, through: scalar, and: [factor means] }
  Both: { invariance of: Over both, across: group, through: scalar }
`

let folder: string
beforeEach(() => {
  folder = mkdtempSync(join(tmpdir(), 'rungwise-sizes-'))
  writeFileSync(join(folder, 'rows.csv'), readFileSync(rows))
  writeFileSync(join(folder, 'plan.yaml'), plan)
})
afterEach(() => rmSync(folder, { recursive: true, force: true }))

async function fitted() {
  const { workbench } = startBench(folder)
  await done(workbench, 'openPlan', { path: join(folder, 'plan.yaml') })
  await done(workbench, 'fitCandidates', { names: null })
  return workbench
}

describe('effect sizes', () => {
  it('are those of the worked example for an indicator that is let go in every group, in words too', async () => {
    const workbench = await fitted()
    const { sizes, refused: left, sentence } = await done(workbench, 'effectSizes', { candidate: 'y2 let go' })
    expect(left).toEqual([])
    expect(sizes).toHaveLength(18)
    for (const [key, figures] of Object.entries(expected.partial_intercept_and_loading_y2_free_in_g2_and_g3.dMACS)) {
      const [indicator, , reference, , focal] = key.split('_')
      const size = sizes.find((one) => one.indicator === indicator && one.reference === reference && one.focal === focal)!
      expect(Math.abs(size.dmacs! - figures.dMACS_weighted_mean_of_sds)).toBeLessThan(1e-6)
      expect(Math.abs(size.expectedDifference - figures.item_mean_difference_due_to_noninvariance_focal_density)).toBeLessThan(1e-6)
    }
    expect(sizes.filter(({ dmacs }) => dmacs !== 0).map(({ indicator }) => indicator)).toEqual(['y2', 'y2', 'y2'])
    expect(sizes.find(({ indicator, focal }) => indicator === 'y2' && focal === 'g2')!.sentence).toMatch(
      /^At the same standing on what it measures, people in g2 answer y2 \d\.\d\d (higher|lower) on average, on its own scale, than people in g1 would \(dMACS = \.\d{3}; the difference varies with the standing, with a root mean square of 0\.30\)\.$/
    )
    expect(sentence).toMatch(
      /^y2 let go lets indicators differ in 3 comparisons of two groups\. The largest difference: At the same standing/
    )
    await workbench.close()
  })

  it('are all zero, and said to be, where everything is held equal', async () => {
    const workbench = await fitted()
    const { sizes, sentence } = await done(workbench, 'effectSizes', { candidate: 'Two factors, scalar' })
    expect(sizes.every(({ dmacs }) => dmacs === 0)).toBe(true)
    expect(sizes[0]!.sentence).toBe('y1 is held to be measured alike in g1 and g2.')
    expect(sentence).toMatch(/^Two factors, scalar holds every indicator to be measured alike in all groups/)
    await workbench.close()
  })

  it('leave out the indicators of a factor on which the groups have nothing in common', async () => {
    const workbench = await fitted()
    const { sizes, refused: left } = await done(workbench, 'effectSizes', { candidate: 'First not compared' })
    expect(new Set(sizes.map(({ indicator }) => indicator))).toEqual(new Set(['y4', 'y5', 'y6']))
    expect(left).toHaveLength(3)
    expect(left[0]).toEqual({
      factor: 'First',
      from: 'g1',
      group: 'g2',
      reason: 'none of its indicators has both its loading and its intercept held equal in the two groups'
    })
    await workbench.close()
  })
})

describe('latent means', () => {
  it('and their intervals are those of the worked example, raw and in pooled standard deviations', async () => {
    const workbench = await fitted()
    const { differences } = await done(workbench, 'latentMeans', { candidate: 'Two factors, scalar' })
    expect(differences).toHaveLength(6)
    for (const { factor, from, group, raw, standardised, allHeld, restsOn } of differences) {
      const figures = expected.latent_mean_differences_scalar_model[`factor${factor === 'First' ? 1 : 2}_${group}_minus_${from}`]!
      expect(Math.abs(raw.estimate - figures.raw_difference.est)).toBeLessThan(1e-6)
      expect(Math.abs(raw.standardError! - figures.raw_difference.se_expected)).toBeLessThan(1e-6)
      expect(Math.abs(standardised!.estimate - figures.standardised_by_pooled_factor_sd.est)).toBeLessThan(1e-6)
      expect(Math.abs(standardised!.standardError! - figures.standardised_by_pooled_factor_sd.se_expected)).toBeLessThan(1e-6)
      expect(raw.upper! - raw.lower!).toBeCloseTo(2 * 1.959963984540054 * raw.standardError!, 9)
      expect(allHeld).toBeNull()
      expect(restsOn).toHaveLength(3)
    }
    expect(differences[0]!.sentence).toBe(
      'The mean of First in g2 is 0.56 (95% interval 0.24 to 0.89) above that in g1, which is 0.55 (95% interval 0.23 to 0.87) pooled factor standard deviations.'
    )
    await workbench.close()
  })

  it('stand beside what they would be had nothing been let go', async () => {
    const workbench = await fitted()
    const { differences } = await done(workbench, 'latentMeans', { candidate: 'y2 let go' })
    const held = (await done(workbench, 'latentMeans', { candidate: 'Two factors, scalar' })).differences
    expect(differences.map(({ allHeld }) => allHeld?.raw.estimate)).toEqual(held.map(({ raw }) => raw.estimate))
    expect(differences[0]!.restsOn).toEqual(['y1', 'y3'])
    expect(differences[0]!.raw.estimate).not.toBeCloseTo(held[0]!.raw.estimate, 3)
    expect(differences[0]!.sentence).toContain('Had nothing been let go, it would be 0.55 standard deviations.')
    await workbench.close()
  })

  it('are refused below the rung that licenses them, with the reason', async () => {
    const workbench = await fitted()
    for (const [candidate, reason] of [
      ['Two factors, metric', 'no indicator has both its loading and its intercept held equal across groups'],
      ['Two factors, configural', 'no indicator has both its loading and its intercept held equal across groups'],
      ['Two factors', 'it is not modelled across groups'],
      ['Two factor', 'There is no candidate "Two factor".']
    ] as const) {
      expect(await refused(workbench, 'latentMeans', { candidate })).toContain(reason)
      expect(await refused(workbench, 'effectSizes', { candidate })).toContain(reason)
    }
    await workbench.close()
  })

  it('are refused before the candidate is fitted', async () => {
    const { workbench } = startBench(folder)
    await done(workbench, 'openPlan', { path: join(folder, 'plan.yaml') })
    expect(await refused(workbench, 'latentMeans', { candidate: 'Two factors, scalar' })).toContain('Fit it first')
    await workbench.close()
  })

  it('are not told where the candidate itself holds them equal, nor of a second-order factor whose factors have means of their own', async () => {
    const workbench = await fitted()
    const means = await done(workbench, 'latentMeans', { candidate: 'Two factors, scalar, equal factor means' })
    expect(means.differences).toEqual([])
    expect(means.refused.map(({ reason }) => reason)).toEqual(
      Array.from({ length: 6 }, () => 'the candidate holds its means equal in the two groups')
    )
    const second = await done(workbench, 'latentMeans', { candidate: 'Over both, scalar' })
    expect(new Set(second.differences.map(({ factor }) => factor))).toEqual(new Set(['First', 'Second']))
    expect(new Set(second.refused.map(({ factor }) => factor))).toEqual(new Set(['Both']))
    await workbench.close()
  })
})
