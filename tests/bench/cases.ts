/** The models and data that the benchmarks share. */
import { seededGenerator } from '../../src-main/statistics/distributions/generator.ts'
import type { ModelCells } from '../../src-main/statistics/model/cells.ts'
import { splitByPattern } from '../../src-main/statistics/moments/missing-patterns.ts'
import type { SampleMoments } from '../../src-main/statistics/moments/sample-moments.ts'
import { saturatedMoments } from '../../src-main/statistics/moments/saturated-em.ts'
import { candidateCells, type ModelFrame, resolveCandidate } from '../../src-main/study/candidate-model.ts'
import { ladderCandidates } from '../../src-main/study/ladders.ts'
import { type Candidate, candidateSchema } from '../../src-main/study/study.ts'
import { simulateRows } from './simulate.ts'

/** p indicators, p/m to each of m factors. */
export function simpleStructure(p: number, m: number): Candidate {
  const per = p / m
  const factors = Array.from({ length: m }, (_, k) => ({
    name: `F${k + 1}`,
    measures: Array.from({ length: per }, (_, i) => `y${k * per + i + 1}`)
  }))
  return candidateSchema.parse({ name: 'base', factors })
}

function frameOf(p: number, groups: (string | null)[]): ModelFrame {
  return {
    indicators: Array.from({ length: p }, (_, i) => `y${i + 1}`),
    grouping: groups.length > 1 ? 'group' : null,
    groups,
    means: true
  }
}

export function groupNames(groups: number): string[] {
  return Array.from({ length: groups }, (_, g) => `g${g + 1}`)
}

export function oneGroupCells(p: number, m: number): ModelCells {
  return candidateCells(resolveCandidate('base', [simpleStructure(p, m)]), frameOf(p, [null]))
}

/** The rungs of an invariance ladder, loosest first: same pattern, equal loadings, equal intercepts, equal residual variances. */
export function ladderCells(p: number, m: number, groups: number): ModelCells[] {
  const base = simpleStructure(p, m)
  const rungs = ladderCandidates({ name: 'ladder', invarianceOf: 'base', across: 'group', through: 'strict' }, [base])
  const family = [base, ...rungs]
  return rungs.map((rung) => candidateCells(resolveCandidate(rung.name, family), frameOf(p, groupNames(groups))))
}

/** n rows of p answers in about `patterns` missingness patterns: the complete one, and others that miss a fifth. */
export function rowsWithHoles(n: number, p: number, m: number, patterns: number): Float64Array {
  const generator = seededGenerator(n + p + patterns)
  const values = simulateRows(p, m, n, 0, generator)
  const holes = Array.from({ length: patterns }, (_, at) =>
    Uint8Array.from({ length: p }, () => (at > 0 && generator.uniform() < 0.2 ? 1 : 0))
  )
  for (let row = 0; row < n; row++) {
    const hole = holes[generator.uniform() < 0.5 ? 0 : Math.floor(generator.uniform() * patterns)]!
    for (let j = 0; j < p; j++) if (hole[j] === 1) values[row * p + j] = Number.NaN
  }
  return values
}

/** What full information needs of one group's rows: its patterns and the unrestricted estimates. */
export function patternMoments(values: Float64Array, p: number): SampleMoments {
  const { patterns, n } = splitByPattern(values, p)
  const { mean, covariance } = saturatedMoments(patterns, p)
  const indicators = Array.from({ length: p }, (_, i) => `y${i + 1}`)
  return { indicators, groups: [{ name: null, n, patterns, mean, covariance }] }
}
