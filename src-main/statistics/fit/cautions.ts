/**
 * The checks after every fit (methods: section 2): each finding is a stated caution with the cell's names.
 */
import { EigenvalueDecomposition, Matrix } from 'ml-matrix'
import { cellWords } from '../model/cell-words.ts'
import type { CompiledModel } from '../model/compile.ts'
import type { GroupState } from '../model/implied-moments.ts'
import type { Caution, EstimateResult } from './fit-result.ts'

/** Negative residual variances, factor correlations of 1 or more, matrices that are no covariance matrices. */
export function improperCautions(model: CompiledModel, states: readonly GroupState[]): Caution[] {
  return model.groups.flatMap((group, g) => {
    const state = states[g]!
    const found = [...negativeVariances(model, state, group.name), ...extremeCorrelations(model, state, group.name)]
    const where = group.name === null ? '' : ` in ${group.name}`
    if (found.length === 0 && !positiveSemidefinite(state.psi, state.m)) {
      found.push({
        code: 'factor-covariances-not-positive',
        message: `The factor covariance matrix${where} is not positive semi-definite: no set of factors can have it.`,
        cell: null
      })
    }
    if (!found.some((c) => c.code === 'negative-residual-variance') && !positiveSemidefinite(state.theta, state.p)) {
      found.push({
        code: 'residual-covariances-not-positive',
        message: `The residual covariance matrix${where} is not positive semi-definite: no set of residuals can have it.`,
        cell: null
      })
    }
    return found
  })
}

function negativeVariances(model: CompiledModel, state: GroupState, group: string | null): Caution[] {
  const found: Caution[] = []
  model.indicators.forEach((indicator, i) => {
    const value = state.theta[i * state.p + i]!
    if (value < 0) {
      found.push({
        code: 'negative-residual-variance',
        message: `${sentence(cellWords('residual variance', [indicator], group))} is negative (${value.toPrecision(3)}), which no variance can be: the solution is improper. A candidate derived with a bound on it (at least 0) keeps it proper.`,
        cell: [indicator]
      })
    }
  })
  model.factors.forEach((factor, k) => {
    const value = state.psi[k * state.m + k]!
    if (value < 0) {
      found.push({
        code: 'negative-factor-variance',
        message: `${sentence(cellWords('factor variance', [factor], group))} is negative (${value.toPrecision(3)}), which no variance can be: the solution is improper. A candidate derived with a bound on it (at least 0) keeps it proper.`,
        cell: [factor]
      })
    }
  })
  return found
}

/** A correlation of exactly 1 by the user's own constraint is no finding, so the limit is passed by rounding only. */
function extremeCorrelations(model: CompiledModel, state: GroupState, group: string | null): Caution[] {
  const found: Caution[] = []
  const { m, c } = state
  for (let k = 0; k < m; k++) {
    for (let l = 0; l < k; l++) {
      const r = c[k * m + l]! / Math.sqrt(c[k * m + k]! * c[l * m + l]!)
      const fixed = !model.groups.some((g) => g.free.some((cell) => cell.matrix === 'psi' && cell.row === k && cell.column === l))
      if (Math.abs(r) >= 1 && !(fixed && Math.abs(r) < 1 + 1e-9)) {
        const of = [model.factors[l]!, model.factors[k]!]
        found.push({
          code: 'factor-correlation-beyond-one',
          message: `The correlation of ${of[0]} with ${of[1]}${group === null ? '' : ` in ${group}`} is ${r.toFixed(3)}: the two are not told apart, and the solution is improper.`,
          cell: of
        })
      }
    }
  }
  return found
}

function positiveSemidefinite(a: Float64Array, n: number): boolean {
  let off = false
  for (let i = 0; i < n && !off; i++) for (let j = 0; j < i && !off; j++) off = a[i * n + j] !== 0
  if (!off) return true
  const matrix = Matrix.from1DArray(n, n, [...a])
  const values = new EigenvalueDecomposition(matrix, { assumeSymmetric: true }).realEigenvalues
  return Math.min(...values) > -1e-9 * Math.max(...values.map(Math.abs))
}

/** Free cells without a standard error. */
export function standardErrorCautions(estimates: readonly EstimateResult[]): Caution[] {
  const missing = estimates.filter((e) => e.free && e.standardError === null)
  return missing.map((e) => ({
    code: 'no-standard-error',
    message: `No standard error could be computed for ${cellWords(e.part, e.of, e.group)}.`,
    cell: e.of
  }))
}

/** What the size of the sample does to the exact-fit test (common practice, no source). */
export function sampleSizeCautions(n: number, df: number): Caution[] {
  if (df <= 0) return []
  if (n >= 2000) {
    const message = `With N = ${n} nearly every exact-fit test rejects: judge the size of the misfit, not its p alone (common practice).`
    return [{ code: 'large-sample', message, cell: null }]
  }
  if (n < 100) {
    const message = `With N = ${n} the exact-fit test is off its nominal size, mostly rejecting too often (common practice).`
    return [{ code: 'small-sample', message, cell: null }]
  }
  return []
}

function sentence(words: string): string {
  return words.charAt(0).toUpperCase() + words.slice(1)
}
