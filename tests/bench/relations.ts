/**
 * The relations of all pairs in two families of 40 candidates: structures of nine indicators in one group, and partial
 * invariance of six indicators in three groups. The fits themselves are made before and not counted.
 */
import { type FamilyInput, familyOrder } from '../../src-main/statistics/comparison/partial-order.ts'
import { seededGenerator } from '../../src-main/statistics/distributions/generator.ts'
import { fitModel } from '../../src-main/statistics/fit/fit.ts'
import type { SampleMoments } from '../../src-main/statistics/moments/sample-moments.ts'
import { candidateCells, type ModelFrame, resolveCandidate } from '../../src-main/study/candidate-model.ts'
import { type Candidate, candidateSchema } from '../../src-main/study/study.ts'
import { simulate } from './simulate.ts'

export interface RelationsTiming {
  name: string
  /** Milliseconds for all pairs. */
  median: number
  repeats: number
  target: number
  /** Pairs in all, and how many of them had to be refitted. */
  pairs: number
  refits: number
}

/** Both families, each as often as `repeats` says after one round to warm up. */
export function relationsTiming(repeats = 5): RelationsTiming[] {
  return [
    timed('relations of all pairs in a family of 40 structures, 9 indicators', structureFamily(), repeats),
    timed('relations of all pairs in a family of 40 across 3 groups, 6 indicators with means', invarianceFamily(), repeats)
  ]
}

function timed(name: string, family: FamilyInput, repeats: number): RelationsTiming {
  const { pairs, refits } = familyOrder(family)
  const times = Array.from({ length: repeats }, () => {
    const start = performance.now()
    familyOrder(family)
    return performance.now() - start
  }).sort((a, b) => a - b)
  return { name, median: times[Math.floor(repeats / 2)]!, repeats, target: 2000, pairs: pairs.length, refits }
}

type Stated = Parameters<typeof candidateSchema.parse>[0]

const y = (...numbers: number[]) => numbers.map((n) => `y${n}`)
const cell = (part: string, ...of: string[]) => ({ part, of })
const free = (part: string, ...of: string[]) => ({ do: 'free', cell: cell(part, ...of) })
const fix = (at: number, part: string, ...of: string[]) => ({ do: 'fix', cell: cell(part, ...of), at })

/** Forty models of nine indicators: one to three factors, second order, bifactor, cross-loadings, residual covariances, equal cells. */
export function structureFamily(): FamilyInput {
  const three = ['A', 'B', 'C'].map((name, k) => ({ name, measures: y(3 * k + 1, 3 * k + 2, 3 * k + 3) }))
  const equalLoadings = (k: number) => ({
    do: 'equal',
    cells: [1, 2, 3].map((i) => cell('loading', `y${3 * k + i}`, 'ABC'[k]!))
  })
  const equalResiduals = (k: number) => ({ do: 'equal', cells: [1, 2, 3].map((i) => cell('residual variance', `y${3 * k + i}`)) })
  const from = (name: string, parent: string, ...change: object[]): Stated => ({ name, from: parent, change })
  const stated: Stated[] = [
    { name: 'three', factors: three, scaling: 'factor variance' },
    { name: 'three marked', factors: three },
    { name: 'one', factors: [{ name: 'G', measures: y(1, 2, 3, 4, 5, 6, 7, 8, 9) }] },
    { name: 'AB C', factors: [{ name: 'D', measures: y(1, 2, 3, 4, 5, 6) }, three[2]] },
    { name: 'AC B', factors: [{ name: 'D', measures: y(1, 2, 3, 7, 8, 9) }, three[1]] },
    { name: 'BC A', factors: [{ name: 'D', measures: y(4, 5, 6, 7, 8, 9) }, three[0]] },
    { name: 'second order', factors: [...three, { name: 'G', measures: ['A', 'B', 'C'] }] },
    { name: 'other three', factors: [0, 1, 2].map((k) => ({ name: `O${k}`, measures: y(k + 1, k + 4, k + 7) })) }
  ]
  for (const [a, b] of [
    ['A', 'B'],
    ['A', 'C'],
    ['B', 'C']
  ] as const) {
    stated.push(from(`${a}${b} apart`, 'three', fix(0, 'factor covariance', a, b)))
    stated.push(from(`${a}${b} one`, 'three', fix(1, 'factor covariance', a, b)))
  }
  stated.push(from('all apart', 'AB apart', fix(0, 'factor covariance', 'A', 'C'), fix(0, 'factor covariance', 'B', 'C')))
  for (const k of [0, 1, 2]) stated.push(from(`equal loadings ${k}`, 'three', equalLoadings(k)))
  stated.push(from('equal loadings', 'three', equalLoadings(0), equalLoadings(1), equalLoadings(2)))
  for (const k of [0, 1, 2]) stated.push(from(`parallel ${k}`, `equal loadings ${k}`, equalResiduals(k)))
  stated.push(from('parallel', 'equal loadings', equalResiduals(0), equalResiduals(1), equalResiduals(2)))
  for (const i of [1, 2, 3, 4, 5])
    stated.push(from(`y${i} with y${i + 3}`, 'three', free('residual covariance', `y${i}`, `y${i + 3}`)))
  for (const i of [4, 5, 6, 7]) stated.push(from(`y${i} on A`, 'three', free('loading', `y${i}`, 'A')))
  for (const i of [1, 2, 4])
    stated.push(from(`one, y${i} with y${i + 1}`, 'one', free('residual covariance', `y${i}`, `y${i + 1}`)))
  stated.push(from('y4 on A, y1 with y4', 'y4 on A', free('residual covariance', 'y1', 'y4')))
  stated.push(from('marked, y1 with y4', 'three marked', free('residual covariance', 'y1', 'y4')))
  stated.push(from('AB C apart', 'AB C', fix(0, 'factor covariance', 'D', 'C')))
  stated.push(from('AB C, y1 with y2', 'AB C', free('residual covariance', 'y1', 'y2')))
  stated.push(from('second order, y1 with y4', 'second order', free('residual covariance', 'y1', 'y4')))
  return familyInput(stated.slice(0, 40), 9, [500])
}

/** Forty models of two factors in three groups: equal sets, and each with single cells let go, scaled three ways. */
export function invarianceFamily(): FamilyInput {
  const factors = [
    { name: 'A', measures: y(1, 2, 3) },
    { name: 'B', measures: y(4, 5, 6) }
  ]
  const sets = ['loadings', 'intercepts', 'residual variances', 'factor variances', 'factor covariances'] as const
  const stated: Stated[] = []
  for (const scaling of ['first loading', 'factor variance', 'effects coding'] as const) {
    for (let through = 0; through <= sets.length; through++) {
      stated.push({ name: `${scaling}, ${through}`, factors, scaling, across: 'group', equalAcrossGroups: sets.slice(0, through) })
    }
  }
  const release = (part: string, ...of: string[]) => ({ cell: cell(part, ...of) })
  for (const i of [2, 3, 5, 6]) {
    const factor = i < 4 ? 'A' : 'B'
    for (const through of [1, 2, 3]) {
      stated.push({
        name: `${through}, loading of y${i}`,
        from: `first loading, ${through}`,
        except: [release('loading', `y${i}`, factor)]
      })
    }
    for (const through of [2, 3]) {
      stated.push({
        name: `${through}, intercept of y${i}`,
        from: `first loading, ${through}`,
        except: [release('intercept', `y${i}`)]
      })
    }
    stated.push({ name: `3, residual of y${i}`, from: 'first loading, 3', except: [release('residual variance', `y${i}`)] })
  }
  return familyInput(stated.slice(0, 40), 6, [300, 300, 300])
}

function familyInput(stated: readonly Stated[], p: number, sizes: number[]): FamilyInput {
  const family: Candidate[] = stated.map((one) => candidateSchema.parse(one))
  const names = sizes.length > 1 ? sizes.map((_, g) => `g${g + 1}`) : [null]
  const frame: ModelFrame = {
    indicators: y(...Array.from({ length: p }, (_, i) => i + 1)),
    grouping: names.length > 1 ? 'group' : null,
    groups: names,
    means: true
  }
  const moments: SampleMoments = simulate(p, p / 3, sizes, seededGenerator(40 + p))
  const members = family.map(({ name }) => {
    const cells = candidateCells(resolveCandidate(name, family), frame)
    const { fit, gamma } = fitModel(cells, moments, { convention: 'normal' })
    if (gamma === null || fit.T === null) throw new Error(`${name} has no solution: ${fit.reason}`)
    return { cells, gamma, T: fit.T }
  })
  return { members, sizes, known: [] }
}
