/**
 * Fit does not depend on how factors are scaled (methods: section 1; effects coding after Little, Slegers & Card 2006):
 * T and df agree to 1e-6 across first loading, factor variance and effects coding, at every level of invariance, and
 * with the expected values of the worked examples.
 */
import { describe, expect, it } from 'vitest'
import { type Generator, seededGenerator } from '../../src-main/statistics/distributions/generator.ts'
import { fitModel } from '../../src-main/statistics/fit/fit.ts'
import { completeCaseMoments, type SampleMoments } from '../../src-main/statistics/moments/sample-moments.ts'
import { candidateCells, resolveCandidate } from '../../src-main/study/candidate-model.ts'
import { ladderCandidates } from '../../src-main/study/ladders.ts'
import { type Candidate, candidateSchema, invarianceLevels, scalings } from '../../src-main/study/study.ts'
import { exampleMoments, readExample } from './examples.ts'

function fitAll(family: Candidate[], name: string, moments: SampleMoments) {
  return scalings.map((scaling) => {
    const scaled = family.map((c) => (c.from === null ? { ...c, scaling } : c))
    const groups = moments.groups.map((g) => g.name)
    const frame = {
      indicators: moments.indicators,
      grouping: groups.length > 1 ? 'group' : null,
      groups,
      means: moments.groups[0]!.mean !== null
    }
    const { fit } = fitModel(candidateCells(resolveCandidate(name, scaled), frame), moments, { convention: 'normal' })
    expect(fit.state, `${name} by ${scaling}: ${fit.reason}`).toBe('fitted')
    return fit
  })
}

function agree(fits: { T: number | null; df: number }[], T: number | null, df: number) {
  for (const fit of fits) {
    expect(fit.df).toBe(df)
    expect(Math.abs(fit.T! - (T ?? fits[0]!.T!))).toBeLessThan(1e-6 * (1 + fit.T!))
  }
}

/** The names of the worked examples' four levels. */
const levelNames = {
  configural: 'configural',
  metric: 'equal_loadings',
  scalar: 'equal_loadings_intercepts',
  strict: 'equal_loadings_intercepts_residual_variances'
}

describe('the three scalings', () => {
  for (const [file, factors] of [
    ['01a_iris_invariance.json', [{ name: 'Size', measures: ['Sepal.Length', 'Sepal.Width', 'Petal.Length', 'Petal.Width'] }]],
    [
      '01d_simulated_two_factor_invariance.json',
      [
        { name: 'A', measures: ['y1', 'y2', 'y3'] },
        { name: 'B', measures: ['y4', 'y5', 'y6'] }
      ]
    ]
  ] as const) {
    const example = readExample(file)
    const moments = exampleMoments(example)
    const base = candidateSchema.parse({ name: 'base', factors })
    const family = [base, ...ladderCandidates({ name: 'l', invarianceOf: 'base', across: 'group', through: 'strict' }, [base])]
    for (const level of invarianceLevels) {
      it(`give one T for the ${level} step of ${file}, the example's own`, () => {
        const expected = example.expected[levelNames[level]]!
        agree(fitAll(family, `base, ${level}`, moments), expected.T, expected.df)
      })
    }
  }

  const harman = readExample('05_harman74_bifactor_secondorder.json')
  const moments = exampleMoments(harman)
  const nine = moments.indicators
  const three = [
    { name: 'Visual', measures: nine.slice(0, 3) },
    { name: 'Verbal', measures: nine.slice(3, 6) },
    { name: 'Speed', measures: nine.slice(6, 9) }
  ]

  it('give one T for a second-order factor over three, the same as for three correlated factors', () => {
    const base = candidateSchema.parse({
      name: 'second',
      factors: [...three, { name: 'General', measures: ['Visual', 'Verbal', 'Speed'] }]
    })
    agree(fitAll([base], 'second', moments), harman.expected['second_order']!.T, 24)
  })

  it('give one T for a bifactor model that the data determine well', () => {
    const bifactor = drawBifactor(800, seededGenerator(11))
    const y = bifactor.indicators
    const specific = [0, 1, 2].map((k) => ({ name: `S${k + 1}`, measures: y.slice(3 * k, 3 * k + 3) }))
    const base = candidateSchema.parse({
      name: 'bifactor',
      factorCovariances: 'zero',
      factors: [{ name: 'General', measures: y }, ...specific]
    })
    agree(fitAll([base], 'bifactor', bifactor), null, 18)
  })

  it('give one T for a structural path, the same as for the covariance it takes the place of', () => {
    const base = candidateSchema.parse({ name: 'base', factors: three })
    const path = candidateSchema.parse({
      name: 'path',
      from: 'base',
      change: [{ do: 'free', cell: { part: 'factor regression', of: ['Speed', 'Visual'] } }]
    })
    agree(fitAll([base, path], 'path', moments), harman.expected['correlated_three_factor']!.T, 24)
  })

  it('give one T for second-order factors by group at every level', () => {
    const example = readExample('01d_simulated_two_factor_invariance.json')
    const byGroup = exampleMoments(example)
    const y = byGroup.indicators
    const base = candidateSchema.parse({
      name: 'base',
      factors: [
        { name: 'A', measures: y.slice(0, 3) },
        { name: 'B', measures: y.slice(3, 6) },
        { name: 'G', measures: ['A', 'B'] }
      ],
      // Two first-order factors identify a second-order one only with equal loadings.
      change: [
        {
          do: 'equal',
          cells: [
            { part: 'factor regression', of: ['A', 'G'] },
            { part: 'factor regression', of: ['B', 'G'] }
          ]
        }
      ]
    })
    const family = [base, ...ladderCandidates({ name: 'l', invarianceOf: 'base', across: 'group', through: 'strict' }, [base])]
    for (const level of invarianceLevels) {
      const [first] = fitAll(family, `base, ${level}`, byGroup)
      expect(first!.df).toBeGreaterThan(0)
    }
  })
})

/** Nine indicators of a general and three specific factors, with loadings far from proportional. */
function drawBifactor(n: number, generator: Generator): SampleMoments {
  const general = [0.8, 0.6, 0.5, 0.7, 0.8, 0.4, 0.5, 0.7, 0.8]
  const specific = [0.4, 0.6, 0.7, 0.6, 0.3, 0.7, 0.7, 0.5, 0.4]
  const values = new Float64Array(n * 9)
  for (let row = 0; row < n; row++) {
    const g = generator.normal()
    const s = [generator.normal(), generator.normal(), generator.normal()]
    for (let i = 0; i < 9; i++) {
      const unique = Math.sqrt(1 - general[i]! ** 2 - specific[i]! ** 2)
      values[row * 9 + i] = general[i]! * g + specific[i]! * s[Math.floor(i / 3)]! + unique * generator.normal()
    }
  }
  return { indicators: general.map((_, i) => `y${i + 1}`), groups: [{ name: null, ...completeCaseMoments(values, 9) }] }
}
