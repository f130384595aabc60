/**
 * Indices of fit under the mean-scaled statistic, in two kinds (methods: sections 4 and 5):
 *
 *     plug-in      the formulas of indices.ts with T / c and T_b / c_b in place of T and T_b; what they estimate changes
 *                  with the distribution of the data
 *     consistent   T - c df and T_b - c_b df_b as the estimates of misfit (Brosseau-Liard, Savalei & Li 2012 for RMSEA;
 *                  Brosseau-Liard & Savalei 2014 for CFI and TLI): the same population values as with normal data
 *
 * The centrality index and gamma-hat take the same estimate of misfit. Information criteria and ECVI are not scaled.
 */
import { fitIndices, type Indices, rmsea } from './indices.ts'

export type RobustKind = 'consistent' | 'plug-in'

export interface RobustIndexInput {
  /** Unscaled, with its df and scaling factor c. */
  T: number
  df: number
  scaling: number
  /** N of every formula. */
  n: number
  groups: number
  /** p, indicators per group. */
  indicators: number
  /** Unscaled, with its own c_b. */
  baseline: { T: number; df: number; scaling: number }
}

export type RobustIndices = Pick<Indices, 'cfi' | 'tli' | 'rmsea' | 'mcdonald' | 'gammaHat'>

export function robustIndices(kind: RobustKind, input: RobustIndexInput): RobustIndices {
  return kind === 'consistent' ? consistentIndices(input) : plugInIndices(input)
}

function plugInIndices({ T, scaling, baseline, ...rest }: RobustIndexInput): RobustIndices {
  const scaledBaseline = { T: baseline.T / baseline.scaling, df: baseline.df }
  const { cfi, tli, rmsea, mcdonald, gammaHat } = fitIndices({
    ...rest,
    T: T / scaling,
    baseline: scaledBaseline,
    logLikelihood: 0,
    parameters: 0
  })
  return { cfi, tli, rmsea, mcdonald, gammaHat }
}

function consistentIndices({ T, df, scaling, n, groups, indicators, baseline }: RobustIndexInput): RobustIndices {
  const excess = T - scaling * df
  const baselineExcess = baseline.T - baseline.scaling * baseline.df
  const worst = Math.max(baselineExcess, excess, 0)
  const size = indicators * groups
  return {
    cfi: worst > 0 ? 1 - Math.max(excess, 0) / worst : 1,
    tli: df > 0 && baselineExcess !== 0 ? 1 - (excess / df) * (baseline.df / baselineExcess) : null,
    // T / c has noncentrality lambda / c: the root of c carries the estimate, its interval and its tests over.
    rmsea: rmsea(T / scaling, df, n / scaling, groups),
    mcdonald: Math.exp(-excess / (2 * n)),
    gammaHat: size / (size + (2 * excess) / n)
  }
}
