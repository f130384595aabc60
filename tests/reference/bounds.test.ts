/**
 * Bounds, shown on a hard case: ratings of judges (New Haven Register, 14 January 1977, as in Hartigan 1977), where the
 * residual variance of PREP is negative. A bounded fit must be the fit with that cell fixed at its bound, and say so.
 */
import { describe, expect, it } from 'vitest'
import { seededGenerator } from '../../src-main/statistics/distributions/generator.ts'
import { scoreTests } from '../../src-main/statistics/estimation/score-tests.ts'
import { fitModel } from '../../src-main/statistics/fit/fit.ts'
import type { FitResult } from '../../src-main/statistics/fit/fit-result.ts'
import type { CellBound, ModelCells } from '../../src-main/statistics/model/cells.ts'
import { completeCaseMoments, type SampleMoments } from '../../src-main/statistics/moments/sample-moments.ts'
import { candidateCells, resolveCandidate } from '../../src-main/study/candidate-model.ts'
import { candidateSchema, scalings } from '../../src-main/study/study.ts'
import { exampleCells, exampleMoments, readExample } from './examples.ts'

const example = readExample('02e_judges_hard_case_heywood.json')
const moments = exampleMoments(example)
const rows = example.data.groups!.map((group) => Float64Array.from(group.raw.flat()))
const cells = exampleCells(example, 'two_factor')
const everyResidual = example.data.variables.map((name): CellBound => ({ label: `theta_${name}`, least: 0, most: null }))
const prep = example.data.variables.indexOf('PREP')
const free = fitModel(cells, moments, { convention: 'normal' })
const bounded = fitModel({ ...cells, bounds: everyResidual }, moments, { convention: 'normal' })
const fixedCells = withFixed((group) => {
  group.residualCovariances[prep]![prep] = 0
})
const fixed = fitModel(fixedCells, moments, { convention: 'normal' })

function withFixed(change: (group: ModelCells['groups'][number]) => void): ModelCells {
  const copy = structuredClone(cells)
  for (const group of copy.groups) change(group)
  return copy
}

function residual(fit: FitResult, name: string) {
  return fit.estimates.find((e) => e.part === 'residual variance' && e.of[0] === name)!
}

function near(actual: number | null, expected: number | null, tolerance: number) {
  expect(Math.abs(actual! - expected!)).toBeLessThan(tolerance * (1 + Math.abs(expected!)))
}

describe('a negative residual variance', () => {
  it('stays where it is without a bound: T = 48.669502', () => {
    near(free.fit.T, example.expected['two_factor']!.T, 1e-8)
    expect(residual(free.fit, 'PREP').estimate).toBeLessThan(0)
    expect(free.fit.bounds).toEqual([])
  })

  it('with a bound at 0 is the fit with that cell fixed at 0, T larger and df unchanged', () => {
    expect(bounded.fit.state).toBe('fitted')
    near(bounded.fit.T, fixed.fit.T, 1e-9)
    expect(bounded.fit.T).toBeGreaterThan(free.fit.T! + 4)
    expect([free.fit.df, bounded.fit.df, fixed.fit.df]).toEqual([8, 8, 9])
    expect(residual(bounded.fit, 'PREP')).toMatchObject({ free: true, estimate: 0, standardError: null, lower: null })
    for (const one of bounded.fit.estimates) {
      const other = fixed.fit.estimates.find((e) => e.part === one.part && e.of.join() === one.of.join())!
      near(one.estimate, other.estimate, 1e-6)
      expect(one.standardError === null).toBe(other.standardError === null)
      if (one.standardError !== null) near(one.standardError, other.standardError, 1e-6)
    }
  })

  it('lies on the bound because T rises inwards', () => {
    const inside = withFixed((group) => {
      group.residualCovariances[prep]![prep] = 1e-3
    })
    expect(fitModel(inside, moments, { convention: 'normal' }).fit.T).toBeGreaterThan(bounded.fit.T! + 0.1)
  })

  it('is told: which bound is active, and between which values p lies', () => {
    expect(bounded.fit.bounds.map((bound) => bound.active)).toEqual([null, null, null, null, 'at least', null])
    expect(bounded.fit.bounds[4]).toEqual({
      part: 'residual variance',
      of: ['PREP'],
      group: null,
      atLeast: 0,
      atMost: null,
      active: 'at least'
    })
    const told = bounded.fit.cautions.find((caution) => caution.code === 'bound-active')!
    expect(told.cell).toEqual(['PREP'])
    expect(told.message).toContain('The residual variance of PREP (at least 0) lies on its bound')
    expect(told.message).toContain(
      'a mixture of chi-square distributions on 8 and 9 df (Stoel, Garre, Dolan & van den Wittenboer 2006)'
    )
    expect(bounded.fit.cautions.some((caution) => /negative|no-standard-error/.test(caution.code))).toBe(false)
  })

  it('has the score tests of the model with that cell fixed', () => {
    const ofBounded = scoreTests({ ...cells, bounds: everyResidual }, moments, 'normal', bounded.gamma!)
    const ofFixed = scoreTests(fixedCells, moments, 'normal', fixed.gamma!)
    expect(ofBounded.tests.length).toBe(ofFixed.tests.length)
    // Matched by what they are about: restrictions with equal statistics may stand in either order.
    for (const test of ofBounded.tests) {
      const same = ofFixed.tests.filter((other) => other.part === test.part && other.of.join() === test.of.join())
      expect(same.length).toBe(1)
      near(test.statistic, same[0]!.statistic, 1e-5)
    }
  })

  it('keeps robust errors and the scaled statistic, with the cell on its bound still without an error', () => {
    const settings = { convention: 'normal', statistic: 'mean-scaled', standardErrors: 'robust' } as const
    const { fit } = fitModel({ ...cells, bounds: everyResidual }, moments, settings, rows)
    expect(fit.scaled!.scaling).toBeGreaterThan(0)
    expect(residual(fit, 'PREP').standardError).toBeNull()
    const other = fitModel(fixedCells, moments, settings, rows).fit
    near(residual(fit, 'FAMI').standardError, residual(other, 'FAMI').standardError, 1e-6)
  })

  it('is bounded the same whatever scales the factors', () => {
    const y = example.data.variables
    const factors = [
      { name: 'F', measures: y.slice(0, 3) },
      { name: 'G', measures: y.slice(3) }
    ]
    for (const scaling of scalings) {
      const change = y.map((name) => ({ do: 'bound', cell: { part: 'residual variance', of: [name] }, atLeast: 0 }))
      const candidate = candidateSchema.parse({ name: 'own', factors, scaling, change })
      const frame = { indicators: y, grouping: null, groups: [null], means: true }
      const { fit } = fitModel(candidateCells(resolveCandidate('own', [candidate]), frame), moments, { convention: 'normal' })
      near(fit.T, fixed.fit.T, 1e-8)
      expect(fit.df).toBe(8)
    }
  })
})

describe('other bounds', () => {
  it('change nothing, to the bit, where no estimate reaches them', () => {
    const bounds = [
      { label: 'theta_PREP', least: -1, most: null },
      { label: 'phi_2_1', least: -1, most: 1 }
    ]
    const wide = fitModel({ ...cells, bounds }, moments, { convention: 'normal' })
    expect(wide.gamma).toEqual(free.gamma)
    expect({ ...wide.fit, bounds: [] }).toEqual(free.fit)
    expect(wide.fit.bounds.map((bound) => bound.active)).toEqual([null, null])
  })

  it('from above hold a factor correlation, where the factors have unit variance', () => {
    const limits = { label: 'phi_2_1', least: -1, most: 0.9 }
    const below = fitModel({ ...cells, bounds: [...everyResidual, limits] }, moments, { convention: 'normal' }).fit
    const at = withFixed((group) => {
      group.factorCovariances = [
        [1, 0.9],
        [0.9, 1]
      ]
      group.residualCovariances[prep]![prep] = 0
    })
    near(below.T, fitModel(at, moments, { convention: 'normal' }).fit.T, 1e-9)
    const active = below.bounds.filter((bound) => bound.active !== null)
    expect(active.map((bound) => [bound.of, bound.active])).toEqual([
      [['F1', 'F2'], 'at most'],
      [['PREP'], 'at least']
    ])
    const told = below.cautions.find((caution) => caution.code === 'bound-active')!
    expect(told.message).toContain('on 8 to 10 df')
    expect(told.cell).toBeNull()
  })

  it('of a label that is no parameter are a bug', () => {
    expect(() =>
      fitModel({ ...cells, bounds: [{ label: 'none', least: 0, most: null }] }, moments, { convention: 'normal' })
    ).toThrow('none is no parameter')
  })
})

describe('residual variances bounded at 0, in small samples with one large loading a factor', () => {
  const indices = [0, 1, 2, 3, 4, 5]
  const generator = seededGenerator(9)
  const settings = { convention: 'normal' } as const

  function draw(n: number): SampleMoments {
    const values = new Float64Array(n * 6)
    for (let row = 0; row < n; row++) {
      const first = generator.normal()
      const factors = [first, 0.5 * first + 0.85 * generator.normal()]
      for (const i of indices) {
        const loading = i % 3 === 0 ? 0.95 : 0.45
        values[row * 6 + i] = loading * factors[Math.floor(i / 3)]! + Math.sqrt(1 - loading ** 2) * generator.normal()
      }
    }
    return { indicators: indices.map((i) => `y${i}`), groups: [{ name: null, ...completeCaseMoments(values, 6) }] }
  }

  /** Two factors of unit variance; the residual variances named are fixed at 0. */
  function twoFactors(zero: number[]): ModelCells {
    return {
      indicators: indices.map((i) => `y${i}`),
      factors: ['F', 'G'],
      groups: [
        {
          name: null,
          loadings: indices.map((i) => (i < 3 ? [`l${i}`, 0] : [0, `l${i}`])),
          regressions: [
            [0, 0],
            [0, 0]
          ],
          factorCovariances: [
            [1, 'phi'],
            ['phi', 1]
          ],
          residualCovariances: indices.map((i) => indices.map((j) => (i !== j || zero.includes(i) ? 0 : `t${i}`))),
          intercepts: indices.map((i) => `n${i}`),
          factorMeans: [0, 0]
        }
      ],
      constraints: []
    }
  }

  /** The best proper fit with at most one residual variance of each factor fixed at 0: more would leave no Sigma. */
  function bestOfAll(moments: SampleMoments): number {
    const sets = [-1, 0, 1, 2].flatMap((i) => [-1, 3, 4, 5].map((j) => [i, j].filter((k) => k >= 0)))
    const fits = sets.map((zero) => fitModel(twoFactors(zero), moments, settings).fit)
    const proper = fits.filter(
      (fit) => fit.state === 'fitted' && fit.estimates.every((e) => e.part !== 'residual variance' || e.estimate! > -1e-9)
    )
    return Math.min(...proper.map((fit) => fit.T!))
  }

  it('give the best of all the fits with cells fixed at 0', () => {
    const bounds = indices.map((i): CellBound => ({ label: `t${i}`, least: 0, most: null }))
    let active = 0
    for (let sample = 0; sample < 7; sample++) {
      const moments = draw(25 + 5 * sample)
      const { fit } = fitModel({ ...twoFactors([]), bounds }, moments, settings)
      expect(fit.state, fit.reason ?? '').toBe('fitted')
      if (fit.bounds.some((bound) => bound.active !== null)) active++
      near(fit.T, bestOfAll(moments), 1e-6)
    }
    expect(active).toBeGreaterThan(2)
  })
})
