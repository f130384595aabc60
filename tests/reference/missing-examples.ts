/** Reads the worked examples with missing answers (fixtures/reference/03*): rows, patterns and expected values. */
import { splitByPattern } from '../../src-main/statistics/moments/missing-patterns.ts'
import type { SampleMoments } from '../../src-main/statistics/moments/sample-moments.ts'
import { saturatedMoments } from '../../src-main/statistics/moments/saturated-em.ts'
import type { Example } from './examples.ts'

interface MissingExpected {
  T: number
  df: number
  p: number
  loglik: number
  loglik_unrestricted: number
  AIC: number
  BIC: number
  SABIC: number
  cfi: number
  tli: number
  rmsea: number
  ci90_lower: number
  ci90_upper: number
  p_close_05: number
  srmr_without_means_against_EM_moments: number
  srmr_with_means_against_EM_moments: number
  n_free_parameters: number
  estimates: Record<string, { est: number; se_observed: number; se_sandwich: number }>
  yuan_bentler_scaling_factors: Record<string, number>
  yuan_bentler_scaled_T: Record<string, { T: number; p: number }>
}
export interface MissingExample {
  data: { variables: string[]; raw?: (number | null)[][]; groups?: { name: string; raw: (number | null)[][] }[] }
  models: Example['models']
  expected: Record<string, MissingExpected> & { baseline: { T: number; df: number } }
}

export function rowsOf({ data }: MissingExample): { name: string | null; values: Float64Array }[] {
  const groups = data.groups ?? [{ name: null, raw: data.raw! }]
  return groups.map(({ name, raw }) => ({ name, values: Float64Array.from(raw.flatMap((row) => row.map((x) => x ?? Number.NaN))) }))
}

export function momentsWithPatterns(example: MissingExample): SampleMoments {
  const p = example.data.variables.length
  return {
    indicators: example.data.variables,
    groups: rowsOf(example).map(({ name, values }) => {
      const { patterns, n } = splitByPattern(values, p)
      const { mean, covariance } = saturatedMoments(patterns, p)
      return { name, n, patterns, mean, covariance }
    })
  }
}
