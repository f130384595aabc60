import { describe, expect, it } from 'vitest'
import { relationOf } from '../statistics/comparison/relation.ts'
import { seededGenerator } from '../statistics/distributions/generator.ts'
import { fitModel } from '../statistics/fit/fit.ts'
import type { FitOutcome } from '../statistics/fit/fit-result.ts'
import type { ModelCells } from '../statistics/model/cells.ts'
import { completeCaseMoments, type SampleMoments } from '../statistics/moments/sample-moments.ts'
import { candidateCells, resolveCandidate } from './candidate-model.ts'
import { ladderCandidates } from './ladders.ts'
import { parsePlan, writePlan } from './plan-file.ts'
import type { RepeatedLadder } from './repeated.ts'
import { addsWords, candidateSentence } from './sentences.ts'
import { type Candidate, candidateSchema, type Scaling, scalings } from './study.ts'

const occasions = ['spring', 'autumn', 'winter']
const stems = ['a', 'b', 'c', 'd', 'e', 'f']
const listAt = (t: number) => stems.map((stem) => `${stem}${t + 1}`)
const over = (count: number) => occasions.slice(0, count).map((name, t) => ({ name, indicators: listAt(t) }))

function ladderOver(count: number): RepeatedLadder {
  return { name: 'Over time', invarianceOf: 'Base', over: over(count), through: 'strict' }
}

function base(scaling: Scaling, more: object = {}): Candidate {
  return candidateSchema.parse({
    name: 'Base',
    factors: [
      { name: 'F', measures: ['a1', 'b1', 'c1'] },
      { name: 'G', measures: ['d1', 'e1', 'f1'] }
    ],
    scaling,
    ...more
  })
}

/** The cells of the rungs, bottom first. */
function rungCells(candidate: Candidate, count: number): ModelCells[] {
  const rungs = ladderCandidates(ladderOver(count), [candidate])
  const frame = { indicators: occasions.slice(0, count).flatMap((_, t) => listAt(t)), grouping: null, groups: [null], means: true }
  return rungs.map((rung) => candidateCells(resolveCandidate(rung.name, [candidate, ...rungs]), frame))
}

/** What the factors gain in mean from one occasion to the next. */
const gain = { F: 0.5, G: -0.3 }

/**
 * 1,500 cases at two occasions, loadings and intercepts the same at both, factors that correlate .6 with themselves, and
 * residuals of an indicator that share half their variance. The first loading of each factor is 1, variances 1 and 1.44.
 */
function simulated(): SampleMoments {
  const generator = seededGenerator(11)
  const loadings = [1, 0.8, 1.2, 1, 0.9, 0.7]
  const n = 1500
  const values = new Float64Array(n * 12)
  for (let row = 0; row < n; row++) {
    const both = generator.normal()
    const factors = ['F', 'G'].map(() => {
      const first = Math.sqrt(0.3) * both + Math.sqrt(0.7) * generator.normal()
      return [first, 1.2 * (0.6 * first + 0.8 * generator.normal())]
    })
    stems.forEach((_, j) => {
      const own = generator.normal()
      for (let t = 0; t < 2; t++) {
        const factor = j < 3 ? 0 : 1
        const mean = t === 0 ? 0 : factor === 0 ? gain.F : gain.G
        const residual = Math.sqrt(0.5) * own + Math.sqrt(0.5) * generator.normal()
        values[row * 12 + t * 6 + j] = 2 + 0.1 * j + loadings[j]! * (factors[factor]![t]! + mean) + 0.7 * residual
      }
    })
  }
  return { indicators: [...listAt(0), ...listAt(1)], groups: [{ name: null, ...completeCaseMoments(values, 12) }] }
}

/** 1,500 cases of three factors, two indicators each, under one that correlates .6 with itself over the two occasions. */
function secondOrderSample(): SampleMoments {
  const generator = seededGenerator(12)
  const n = 1500
  const values = new Float64Array(n * 12)
  for (let row = 0; row < n; row++) {
    const first = generator.normal()
    const above = [first, 0.6 * first + 0.8 * generator.normal()]
    for (let k = 0; k < 3; k++) {
      const lasting = generator.normal()
      for (let t = 0; t < 2; t++) {
        const factor = 0.8 * above[t]! + 0.6 * (Math.sqrt(0.4) * lasting + Math.sqrt(0.6) * generator.normal())
        for (let j = 0; j < 2; j++) values[row * 12 + t * 6 + 2 * k + j] = 1 + (1 - 0.2 * j) * factor + 0.6 * generator.normal()
      }
    }
  }
  return { indicators: [...listAt(0), ...listAt(1)], groups: [{ name: null, ...completeCaseMoments(values, 12) }] }
}

const moments = simulated()
const fits = new Map<Scaling, { cells: ModelCells[]; outcomes: FitOutcome[] }>(
  scalings.map((scaling) => {
    const cells = rungCells(base(scaling), 2)
    return [scaling, { cells, outcomes: cells.map((c) => fitModel(c, moments, { convention: 'normal' })) }]
  })
)

describe('invariance over two occasions', () => {
  const { cells, outcomes } = fits.get('first loading')!

  it('counts its degrees of freedom by formula', () => {
    // 12 indicators: 78 covariances and 12 means. Configural: 8 loadings, 12 residual variances, 6 covariances over time,
    // 4 factor variances, 6 factor covariances, 12 intercepts. Metric ties 4 loadings; scalar 6 intercepts and frees
    // 2 means; strict ties 6 residual variances.
    const configural = 90 - (8 + 12 + 6 + 4 + 6 + 12)
    const expected = [configural, configural + 4, configural + 8, configural + 14]
    for (const scaling of scalings) expect(fits.get(scaling)!.outcomes.map(({ fit }) => fit.df)).toEqual(expected)
  })

  it('gives the same T whatever sets the scale', () => {
    for (const scaling of scalings) {
      fits.get(scaling)!.outcomes.forEach(({ fit }, i) => {
        expect(fit.state).toBe('fitted')
        expect(Math.abs(fit.T! / outcomes[i]!.fit.T! - 1)).toBeLessThan(1e-6)
      })
    }
  })

  it('nests every rung in the one below', () => {
    for (const scaling of scalings) {
      const own = fits.get(scaling)!
      for (let i = 1; i < own.cells.length; i++) {
        const relation = relationOf({
          general: own.cells[i - 1]!,
          generalGamma: own.outcomes[i - 1]!.gamma!,
          restricted: own.cells[i]!,
          restrictedGamma: own.outcomes[i]!.gamma!,
          sizes: [1500]
        })
        expect(relation.relation).toBe('nested')
      }
    }
  })

  it('holds where the population is strictly invariant', () => {
    for (const { fit } of outcomes) expect(fit.p!).toBeGreaterThan(0.001)
  })

  it('recovers the change of the factor means from the rung that licenses it', () => {
    for (const [factor, change] of Object.entries(gain)) {
      const find = (level: number, t: number) =>
        outcomes[level]!.fit.estimates.find((e) => e.part === 'factor mean' && e.of[0] === `${factor} at ${occasions[t]}`)!
      expect(find(2, 0)).toMatchObject({ free: false, estimate: 0 })
      const { estimate, standardError } = find(2, 1)
      expect(Math.abs(estimate! - change)).toBeLessThan(3 * standardError!)
      expect(standardError!).toBeLessThan(0.05)
      expect(find(1, 1)).toMatchObject({ free: false, estimate: 0 })
    }
  })

  it('lets an indicator covary with itself over time and with no other', () => {
    const { residualCovariances } = cells[0]!.groups[0]!
    residualCovariances.forEach((row, i) => {
      row.forEach((cell, j) => {
        expect(typeof cell === 'string').toBe(i % 6 === j % 6)
      })
    })
  })

  it('fits worse by the step whose equality is broken', () => {
    const shifted = structuredClone(moments)
    shifted.groups[0]!.mean![8]! += 0.4 // c at the second occasion
    const T = cells.map((c) => fitModel(c, shifted, { convention: 'normal' }).fit.T!)
    expect(T[1]! - T[0]!).toBeLessThan(20)
    expect(T[2]! - T[1]!).toBeGreaterThan(100)
  })
})

describe('what the rungs are made of', () => {
  it('takes three occasions pair by pair', () => {
    const rungs = ladderCandidates(ladderOver(3), [base('factor variance')])
    expect(rungs.map((rung) => rung.name)).toEqual(
      ['configural', 'metric', 'scalar', 'strict'].map((level) => `Base, ${level} over time`)
    )
    expect(rungs[0]!.change.filter((change) => change.do === 'free')).toHaveLength(18)
    expect(rungs[1]!.change.filter((change) => change.do === 'equal').map((change) => change.cells.length)).toEqual(
      Array(6).fill(3)
    )
    expect(rungs[1]!.change.filter((change) => change.do === 'free').map((change) => change.cell.of[0])).toEqual([
      'F at autumn',
      'F at winter',
      'G at autumn',
      'G at winter'
    ])
    expect(rungs[2]!.change.filter((change) => change.do === 'free')).toHaveLength(4)
  })

  it("repeats the candidate's own changes at every occasion", () => {
    const change = [
      { do: 'free', cell: { part: 'residual covariance', of: ['a1', 'd1'] } },
      {
        do: 'equal',
        cells: [
          { part: 'loading', of: ['b1', 'F'] },
          { part: 'loading', of: ['c1', 'F'] }
        ]
      },
      { do: 'fix', cell: { part: 'factor covariance', of: ['F', 'G'] }, at: 0 }
    ]
    const [configural, metric] = rungCells(base('first loading', { change }), 2)
    const { residualCovariances, loadings, factorCovariances } = configural!.groups[0]!
    expect(typeof residualCovariances[0]![3]).toBe('string')
    expect(typeof residualCovariances[6]![9]).toBe('string')
    expect(loadings[1]![0]).toBe(loadings[2]![0])
    expect(loadings[7]![2]).toBe(loadings[8]![2])
    expect(loadings[1]![0]).not.toBe(loadings[7]![2])
    expect(metric!.groups[0]!.loadings[1]![0]).toBe(metric!.groups[0]!.loadings[8]![2])
    expect(factorCovariances[0]![1]).toBe(0)
    expect(factorCovariances[2]![3]).toBe(0)
    expect(typeof factorCovariances[0]![3]).toBe('string')
  })

  it('lets uncorrelated factors covary with themselves alone', () => {
    const [configural] = rungCells(base('first loading', { factorCovariances: 'zero' }), 2)
    const { factorCovariances } = configural!.groups[0]!
    expect(typeof factorCovariances[0]![2]).toBe('string')
    expect(typeof factorCovariances[1]![3]).toBe('string')
    expect(factorCovariances[0]![1]).toBe(0)
    expect(factorCovariances[0]![3]).toBe(0)
  })

  it('gives a residual that is fixed at zero no covariance over time', () => {
    const change = [{ do: 'fix', cell: { part: 'residual variance', of: ['a1'] }, at: 0 }]
    const [configural] = rungCells(base('first loading', { change }), 2)
    expect(configural!.groups[0]!.residualCovariances[0]![6]).toBe(0)
  })

  it('says what a rung is and what a step adds, each kind of change once', () => {
    const family = [base('factor variance'), ...ladderCandidates(ladderOver(2), [base('factor variance')])]
    const words = (from: string, to: string) => addsWords(`Base, ${from} over time`, `Base, ${to} over time`, family, null)
    expect(words('configural', 'metric')).toBe(
      'equal loadings (a1 on F at spring and a2 on F at autumn; b1 on F at spring and b2 on F at autumn; ' +
        'c1 on F at spring and c2 on F at autumn; d1 on G at spring and d2 on G at autumn; e1 on G at spring and e2 on G at ' +
        'autumn; f1 on G at spring and f2 on G at autumn); the factor variance of F at autumn is free; the factor variance of ' +
        'G at autumn is free'
    )
    expect(words('metric', 'scalar')).toBe(
      'equal intercepts (a1 and a2; b1 and b2; c1 and c2; d1 and d2; e1 and e2; f1 and f2); ' +
        'the factor mean of F at autumn is free; the factor mean of G at autumn is free'
    )
    expect(words('scalar', 'strict')).toBe(
      'equal residual variances (a1 and a2; b1 and b2; c1 and c2; d1 and d2; e1 and e2; f1 and f2)'
    )
    expect(candidateSentence(family[1]!)).toContain(
      'free residual covariances (a1 with a2; b1 with b2; c1 with c2; d1 with d2; e1 with e2; f1 with f2)'
    )
  })
})

describe('a second-order model over two occasions', () => {
  const second = (scaling: Scaling) =>
    base(scaling, {
      factors: [
        { name: 'F', measures: ['a1', 'b1'] },
        { name: 'G', measures: ['c1', 'd1'] },
        { name: 'H', measures: ['e1', 'f1'] },
        { name: 'All', measures: ['F', 'G', 'H'] }
      ]
    })
  const sample = secondOrderSample()
  const outcomes = scalings.map((scaling) =>
    rungCells(second(scaling), 2).map((cells) => fitModel(cells, sample, { convention: 'normal' }))
  )

  it('gives the same T whatever sets the scale', () => {
    for (const own of outcomes) {
      own.forEach(({ fit }, i) => {
        expect(fit.state).toBe('fitted')
        expect(fit.df).toBe(outcomes[0]![i]!.fit.df)
        expect(Math.abs(fit.T! / outcomes[0]![i]!.fit.T! - 1)).toBeLessThan(1e-6)
      })
    }
  })

  it('ties the loadings of both orders and holds in an invariant population', () => {
    // Two free loadings of the second order and three of the first.
    expect(outcomes[0]![1]!.fit.df - outcomes[0]![0]!.fit.df).toBe(5)
    for (const { fit } of outcomes[0]!) expect(fit.p!).toBeGreaterThan(0.001)
  })
})

describe('a ladder over time in a plan file', () => {
  const plan = `study: s
data: { file: a.csv, indicators: [a1, b1, c1, a2, b2, c2] }
candidates:
  One:
    factors: { F: [a1, b1, c1] }
ladders:
  Over time:
    invariance of: One
    over: { spring: [a1, b1, c1], autumn: [a2, b2, c2] }
    through: scalar
`

  it('is read and written back', () => {
    const read = parsePlan(plan, 'plan.yaml')
    expect(read.ladders).toEqual([
      {
        name: 'Over time',
        invarianceOf: 'One',
        over: [
          { name: 'spring', indicators: ['a1', 'b1', 'c1'] },
          { name: 'autumn', indicators: ['a2', 'b2', 'c2'] }
        ],
        through: 'scalar'
      }
    ])
    expect(parsePlan(writePlan(read), 'plan.yaml')).toEqual(read)
  })
})
