/**
 * Structural steps on equal loadings and intercepts: the equality of all factor means against fixtures/reference/13, and
 * every step's T and df under each scaling of the factors.
 */
import { describe, expect, it } from 'vitest'
import { fitModel } from '../../src-main/statistics/fit/fit.ts'
import { candidateCells, resolveCandidate } from '../../src-main/study/candidate-model.ts'
import { ladderCandidates } from '../../src-main/study/ladders.ts'
import { candidateSchema, type Scaling, scalings, structuralSets } from '../../src-main/study/study.ts'
import { exampleMoments, readExample } from './examples.ts'

interface Figures {
  expected: { scalar: { T: number; df: number }; latent_means_all_equal_zero: { T: number; df: number } }
}

const moments = exampleMoments(readExample('01d_simulated_two_factor_invariance.json'))
const { expected } = readExample<Figures>('13_dmacs_latent_means.json')
const frame = { indicators: moments.indicators, grouping: 'group', groups: moments.groups.map((g) => g.name), means: true }

function fitted(name: string, scaling: Scaling): { T: number; df: number } {
  const base = candidateSchema.parse({
    name: 'base',
    factors: [
      { name: 'A', measures: ['y1', 'y2', 'y3'] },
      { name: 'B', measures: ['y4', 'y5', 'y6'] }
    ],
    scaling
  })
  const ladder = { name: 'l', invarianceOf: 'base', across: 'group', through: 'scalar' as const, and: [...structuralSets] }
  const family = [base, ...ladderCandidates(ladder, [base])]
  const { fit } = fitModel(candidateCells(resolveCandidate(name, family), frame), moments, { convention: 'normal' })
  expect(fit.state, `${name} by ${scaling}: ${fit.reason}`).toBe('fitted')
  return { T: fit.T!, df: fit.df }
}

describe('structural steps', () => {
  it('give the T and df of the worked example when all factor means are equal', () => {
    const { T, df } = fitted('base, scalar, equal factor means', 'first loading')
    expect(df).toBe(expected.latent_means_all_equal_zero.df)
    expect(Math.abs(T - expected.latent_means_all_equal_zero.T)).toBeLessThan(1e-6)
  })

  it.each([
    ['factor variances', 4],
    ['factor covariances', 2],
    ['factor means', 4]
  ] as const)('of equal %s add the constraints of two further groups, whatever the scaling', (set, constraints) => {
    const fits = scalings.map((scaling) => fitted(`base, scalar, equal ${set}`, scaling))
    for (const { T, df } of fits) {
      expect(df).toBe(expected.scalar.df + constraints)
      expect(Math.abs(T - fits[0]!.T)).toBeLessThan(1e-6 * T)
    }
  })
})
