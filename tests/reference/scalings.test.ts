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

describe('the three scalings by group, with parts of the model let go or bound', () => {
  const example = readExample('01d_simulated_two_factor_invariance.json')
  const moments = exampleMoments(example)
  const y = moments.indicators
  const last = moments.groups.at(-1)!.name
  /** Groups that are compared with the first. */
  const further = moments.groups.length - 1
  const factors = [
    { name: 'A', measures: y.slice(0, 3) },
    { name: 'B', measures: y.slice(3, 6) }
  ]
  const loading = (i: number, factor: string) => ({ part: 'loading', of: [y[i]!, factor] })
  const intercept = (i: number) => ({ part: 'intercept', of: [y[i]!] })
  const metric = { across: 'group', equalAcrossGroups: ['loadings'] }
  const scalar = { across: 'group', equalAcrossGroups: ['loadings', 'intercepts'] }
  const fits = (rest: object, all = factors) =>
    fitAll([candidateSchema.parse({ name: 'own', factors: all, ...rest })], 'own', moments)
  const [equalLoadings, equalIntercepts] = [example.expected['equal_loadings']!, example.expected['equal_loadings_intercepts']!]

  for (const [i, factor] of [
    [0, 'A'],
    [1, 'A'],
    [5, 'B']
  ] as const) {
    it(`give one T where all loadings but that of ${y[i]} are equal, with fewer df and a smaller T than where all are`, () => {
      const released = fits({ ...metric, except: [{ cell: loading(i, factor) }] })
      agree(released, null, equalLoadings.df - further)
      expect(released[0]!.T).toBeLessThan(equalLoadings.T)
    })

    it(`give one T where all intercepts but that of ${y[i]} are equal, with fewer df and a smaller T than where all are`, () => {
      const released = fits({ ...scalar, except: [{ cell: intercept(i) }] })
      agree(released, null, equalIntercepts.df - further)
      expect(released[0]!.T).toBeLessThan(equalIntercepts.T)
    })
  }

  it('give one T where a loading and its intercept are let go in one group', () => {
    const except = [loading(1, 'A'), intercept(1)].map((cell) => ({ cell, group: last }))
    agree(fits({ ...scalar, except }), null, equalIntercepts.df - 2)
  })

  it('give one T where all but two loadings of each factor differ, the fewest that can be compared', () => {
    agree(fits({ ...metric, except: [{ cell: loading(2, 'A') }, { cell: loading(5, 'B') }] }), null, equalLoadings.df - 2 * further)
  })

  it('give one T where one loading is a multiple of another, in every group', () => {
    const constrain = { do: 'constrain', terms: [{ cell: loading(1, 'A') }, { cell: loading(2, 'A'), times: -1.5 }], to: 0 }
    agree(fits({ ...metric, change: [constrain] }), null, equalLoadings.df + 1)
    agree(fits({ across: 'group', change: [constrain] }), null, example.expected['configural']!.df + 1 + further)
  })

  it('give one T where residual variances obey an equation across groups', () => {
    const cell = { part: 'residual variance', of: [y[0]!] }
    const [one, two] = moments.groups.map((g) => g.name)
    const terms = [
      { cell, group: one },
      { cell, times: -2, group: two }
    ]
    const change = [{ do: 'constrain', terms, to: 0.1 }]
    const constrained = fits({ ...metric, change })
    agree(constrained, null, equalLoadings.df + 1)
    for (const fit of constrained) {
      const [first, second] = fit.estimates.filter((e) => e.part === 'residual variance' && e.of[0] === y[0])
      expect(first!.estimate! - 2 * second!.estimate!).toBeCloseTo(0.1, 10)
      expect(first!.standardError! / second!.standardError!).toBeCloseTo(2, 8)
    }
  })

  it('give one T where a structural path stands in the place of the covariance, equal across groups or not', () => {
    const path = { do: 'free', cell: { part: 'factor regression', of: ['B', 'A'] } }
    agree(
      fits({ across: 'group', equalAcrossGroups: [], change: [path] }),
      example.expected['configural']!.T,
      example.expected['configural']!.df
    )
    const held = fits({ ...metric, change: [path] })
    // With loadings the path is held equal too, in the metric that the first group's scaling sets.
    agree(held, null, equalLoadings.df + further)
  })

  it('keep a cell fixed at a number that is not zero, in every group', () => {
    const cell = { part: 'residual covariance', of: [y[0]!, y[3]!] }
    const fixed = fits({ ...scalar, change: [{ do: 'fix', cell, at: 0.05 }] })
    agree(fixed, null, equalIntercepts.df)
    for (const fit of fixed) {
      const cells = fit.estimates.filter((e) => e.part === 'residual covariance')
      expect(cells.map((e) => [e.free, e.estimate, e.standardError])).toEqual(moments.groups.map(() => [false, 0.05, null]))
    }
  })
})

describe('the three scalings of a second-order factor by group', () => {
  const moments = drawSecondOrder([400, 300], seededGenerator(5))
  const y = moments.indicators
  const base = candidateSchema.parse({
    name: 'base',
    factors: [
      ...[0, 1, 2].map((k) => ({ name: `F${k + 1}`, measures: y.slice(3 * k, 3 * k + 3) })),
      { name: 'General', measures: ['F1', 'F2', 'F3'] }
    ]
  })
  const family = [base, ...ladderCandidates({ name: 'l', invarianceOf: 'base', across: 'group', through: 'strict' }, [base])]
  const partial = (level: string, rest: object) => {
    const own = candidateSchema.parse({ name: 'own', from: `base, ${level}`, ...rest })
    return fitAll([...family, own], 'own', moments)
  }
  /** Metric holds 6 loadings and 2 of the second order, scalar 9 intercepts less 3 means, strict 9 residual variances. */
  const df = { configural: 48, metric: 56, scalar: 62, strict: 71 }

  for (const level of invarianceLevels) {
    it(`give one T at the ${level} step`, () => {
      agree(fitAll(family, `base, ${level}`, moments), null, df[level])
    })
  }

  it('give one T with a loading of the second order let go, or its first, which no longer carries the scale', () => {
    for (const of of [
      ['F1', 'General'],
      ['F2', 'General']
    ])
      agree(partial('metric', { except: [{ cell: { part: 'factor regression', of } }] }), null, df.metric - 1)
  })

  // An intercept held where its loading is not would depend on where the factor's zero is put, so both are let go.
  it('give one T with a loading and its intercept, and another intercept, let go', () => {
    const cells = [
      { part: 'loading', of: ['y1', 'F1'] },
      { part: 'intercept', of: ['y1'] },
      { part: 'intercept', of: ['y5'] }
    ]
    agree(partial('scalar', { except: cells.map((cell) => ({ cell })) }), null, df.scalar - 3)
  })

  it('keep the loadings of the second order in proportion, whose meaning is that of the scaling', () => {
    const terms = [
      { cell: { part: 'factor regression', of: ['F2', 'General'] } },
      { cell: { part: 'factor regression', of: ['F3', 'General'] }, times: -0.8 }
    ]
    for (const fit of partial('metric', { change: [{ do: 'constrain', terms, to: 0 }] })) {
      expect(fit.df).toBe(df.metric + 1)
      const [two, three] = ['F2', 'F3'].map((name) =>
        fit.estimates.filter((e) => e.part === 'factor regression' && e.of[0] === name)
      )
      two!.forEach((one, g) => {
        expect(one.estimate).toBeCloseTo(0.8 * three![g]!.estimate!, 10)
        expect(one.standardError).toBeCloseTo(0.8 * three![g]!.standardError!, 10)
      })
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

/** Nine indicators of three factors, which a general one explains in part; the second group differs in means and variances. */
function drawSecondOrder(sizes: number[], generator: Generator): SampleMoments {
  const loadings = [0.8, 0.6, 0.7, 0.9, 0.7, 0.6, 0.8, 0.7, 0.5]
  const general = [0.8, 0.7, 0.6]
  const groups = sizes.map((n, g) => {
    const values = new Float64Array(n * 9)
    for (let row = 0; row < n; row++) {
      const top = (1 + 0.2 * g) * generator.normal()
      const factors = general.map((weight) => weight * top + 0.6 * generator.normal() + 0.3 * g)
      for (let i = 0; i < 9; i++) values[row * 9 + i] = 0.5 + loadings[i]! * factors[Math.floor(i / 3)]! + 0.6 * generator.normal()
    }
    return { name: g === 0 ? 'one' : 'two', ...completeCaseMoments(values, 9) }
  })
  return { indicators: loadings.map((_, i) => `y${i + 1}`), groups }
}
