/** Reads the worked examples of fixtures/reference: cells, moments and expected values. */
import { readFileSync } from 'node:fs'
import type { Cell, GroupCells, ModelCells } from '../../src-main/statistics/model/cells.ts'
import { completeCaseMoments, type SampleMoments } from '../../src-main/statistics/moments/sample-moments.ts'

interface ExampleGroup {
  loadings: Cell[][]
  factorCovariances: Cell[][]
  residualCovariances: Cell[][]
  regressions?: Cell[][]
  intercepts?: Cell[]
  factorMeans?: Cell[]
}

export interface Expected {
  T: number
  df: number
  p: number
  loglik: number
  loglik_unrestricted: number
  AIC: number
  BIC: number
  SABIC: number
  baseline: { T: number; df: number }
  cfi: number
  tli: number
  rmsea: number
  ci90_lower: number
  ci90_upper: number
  p_close_05: number
  srmr_without_means: number
  srmr_with_means?: number
  n_free_parameters: number
  estimates: Record<string, { est: number; se_expected: number }>
}

export interface Example {
  title: string
  source: string
  data: {
    variables: string[]
    n?: number
    covariance_lower?: number[][]
    groups?: { name: string; n: number; raw: number[][] }[]
  }
  models: Record<string, { groups: Record<string, ExampleGroup> }>
  expected: Record<string, Expected>
}

export function readExample<T = Example>(file: string): T {
  return JSON.parse(readFileSync(new URL(`../../fixtures/reference/${file}`, import.meta.url), 'utf8')) as T
}

export function exampleMoments(example: Example): SampleMoments {
  const { variables, groups, covariance_lower, n } = example.data
  const p = variables.length
  if (groups !== undefined) {
    return {
      indicators: variables,
      groups: groups.map((g) => ({ name: g.name, ...completeCaseMoments(Float64Array.from(g.raw.flat()), p) }))
    }
  }
  return { indicators: variables, groups: [{ name: null, n: n!, covariance: wholeMatrix(covariance_lower!), mean: null }] }
}

export function wholeMatrix(lower: number[][]): Float64Array {
  const p = lower.length
  return Float64Array.from({ length: p * p }, (_, at) => {
    const i = Math.floor(at / p)
    const j = at % p
    return lower[Math.max(i, j)]![Math.min(i, j)]!
  })
}

export function exampleCells(example: Example, model: string): ModelCells {
  const groups = Object.entries(example.models[model]!.groups)
  const m = groups[0]![1].factorCovariances.length
  return {
    indicators: example.data.variables,
    factors: Array.from({ length: m }, (_, k) => `F${k + 1}`),
    groups: groups.map(
      ([name, g]): GroupCells => ({
        name: groups.length === 1 ? null : name,
        loadings: g.loadings,
        factorCovariances: g.factorCovariances,
        residualCovariances: g.residualCovariances,
        regressions: g.regressions ?? Array.from({ length: m }, () => new Array<number>(m).fill(0)),
        intercepts: g.intercepts ?? null,
        factorMeans: g.intercepts === undefined ? null : (g.factorMeans ?? new Array<number>(m).fill(0))
      })
    ),
    constraints: []
  }
}
