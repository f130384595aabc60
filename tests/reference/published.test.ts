/**
 * Published examples from covariances and correlations: nine ability tests (Holzinger & Swineford 1939, 301 pupils) and
 * two traits (Brown 2006, ch. 4: chi-square 13.285 on 19 df). Figures of fixtures/reference; published values from memory.
 */
import { describe, expect, it } from 'vitest'
import { fitModel } from '../../src-main/statistics/fit/fit.ts'
import type { SampleMoments } from '../../src-main/statistics/moments/sample-moments.ts'
import { candidateCells, resolveCandidate } from '../../src-main/study/candidate-model.ts'
import { candidateSchema } from '../../src-main/study/study.ts'
import { readExample, wholeMatrix } from './examples.ts'

interface Figures {
  T: number
  df: number
  p: number
  cfi: number
  tli: number
  srmr: number
  baselineT: number
  logLikelihood: number
  rmsea: { estimate: number; lower: number; upper: number; closeFitP: number }
  withoutMeans: { parameters: number; aic: number; bic: number; adjustedBic: number }
  estimates: Record<string, number>
  standardErrors: Record<string, number>
}
interface Published {
  data: { indicators: string[]; n: number; covariance?: number[][]; correlation?: number[][]; sd?: number[] }
  expected: Record<string, Figures>
}

function momentsOf({ data }: Published): SampleMoments {
  const { indicators, n, covariance, correlation, sd } = data
  const p = indicators.length
  const given = wholeMatrix(covariance ?? correlation!)
  const matrix = covariance !== undefined ? given : given.map((r, at) => r * sd![Math.floor(at / p)]! * sd![at % p]!)
  return { indicators, groups: [{ name: null, n, covariance: matrix, mean: null }] }
}

/** The files' names of parameters (l<i>_<j>, c<a>_<b>, e<i>, e<i>_<k>; 0-based) as cells of a candidate. */
function cellOf(key: string, indicators: string[], factors: string[]): { part: string; of: string[] } {
  const [, kind, first, second] = /^([lce])(\d+)(?:_(\d+))?$/.exec(key)!
  const names = kind === 'c' ? factors : indicators
  if (kind === 'l') return { part: 'loading', of: [indicators[Number(first)]!, factors[Number(second)]!] }
  if (kind === 'c') return { part: 'factor covariance', of: [names[Number(first)]!, names[Number(second)]!] }
  if (second === undefined) return { part: 'residual variance', of: [indicators[Number(first)]!] }
  return { part: 'residual covariance', of: [names[Number(first)]!, names[Number(second)]!] }
}

/** The candidate whose free parameters are those the file lists; factor variances are fixed at 1 there. */
function candidateOf(figures: Figures, indicators: string[]) {
  const keys = Object.keys(figures.estimates)
  const loadings = keys.flatMap((key) => /^l(\d+)_(\d+)$/.exec(key) ?? []).length / 3
  expect(loadings).toBeGreaterThanOrEqual(indicators.length)
  const count = 1 + Math.max(...keys.map((key) => Number(/^l\d+_(\d+)$/.exec(key)?.[1] ?? 0)))
  const names = Array.from({ length: count }, (_, j) => `F${j}`)
  const factors = names.map((name, j) => ({
    name,
    measures: indicators.filter((_, i) => keys.includes(`l${i}_${j}`))
  }))
  const extra = keys.filter((key) => /^e\d+_\d+$/.test(key)).map((key) => ({ do: 'free', cell: cellOf(key, indicators, names) }))
  const factorCovariances = keys.some((key) => key.startsWith('c')) ? 'free' : 'zero'
  return {
    names,
    candidate: candidateSchema.parse({ name: 'own', scaling: 'factor variance', factors, factorCovariances, change: extra })
  }
}

for (const file of ['nine-ability-tests.json', 'two-traits.json']) {
  const example = readExample<Published>(file)
  const moments = momentsOf(example)
  describe(file, () => {
    for (const [name, figures] of Object.entries(example.expected)) {
      it(`${name}: T = ${figures.T.toFixed(3)} on ${figures.df} df, with indices, estimates and standard errors`, () => {
        const { names, candidate } = candidateOf(figures, moments.indicators)
        const frame = { indicators: moments.indicators, grouping: null, groups: [null], means: false }
        const { fit } = fitModel(candidateCells(resolveCandidate('own', [candidate]), frame), moments, { convention: 'normal' })
        expect(fit.df).toBe(figures.df)
        expect(Math.abs(fit.T! - figures.T)).toBeLessThan(1e-3)
        expect(Math.abs(fit.baseline!.T - figures.baselineT)).toBeLessThan(1e-3)
        expect(Math.abs(fit.logLikelihood! - figures.logLikelihood)).toBeLessThan(1e-3)
        for (const index of ['cfi', 'tli', 'srmr'] as const)
          expect(Math.abs(fit[index]! - figures[index]), index).toBeLessThan(1e-5)
        for (const part of ['estimate', 'lower', 'upper'] as const)
          expect(Math.abs(fit.rmsea[part]! - figures.rmsea[part]), part).toBeLessThan(1e-5)
        expect(Math.abs(fit.rmsea.closeFitP! / figures.rmsea.closeFitP - 1)).toBeLessThan(1e-3)
        expect(Math.abs(fit.p! / figures.p - 1)).toBeLessThan(1e-3)
        expect(fit.parameters).toBe(figures.withoutMeans.parameters)
        for (const index of ['aic', 'bic', 'adjustedBic'] as const)
          expect(Math.abs(fit[index]! - figures.withoutMeans[index]), index).toBeLessThan(1e-3)
        for (const [key, value] of Object.entries(figures.estimates)) {
          const cell = cellOf(key, moments.indicators, names)
          const own = fit.estimates.find(
            (e) => e.part === cell.part && JSON.stringify([...e.of].sort()) === JSON.stringify([...cell.of].sort())
          )
          expect(Math.abs(own!.estimate! - value), key).toBeLessThan(1e-4 * Math.max(1, Math.abs(value)))
          expect(Math.abs(own!.standardError! - figures.standardErrors[key]!), `error of ${key}`).toBeLessThan(1e-4)
        }
      })
    }
  })
}

it('two factors for two traits give the printed chi-square, 13.285 on 19 df', () => {
  const example = readExample<Published>('two-traits.json')
  expect(example.expected['two factors']!.T).toBeCloseTo(13.285, 3)
})
