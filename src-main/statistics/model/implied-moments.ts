/**
 * Model-implied moments of one group (methods: section 1):
 *
 *     A = (I - B)^-1   C = A Psi A'   Sigma = Lambda C Lambda' + Theta   mu = nu + Lambda A alpha
 *
 * and the columns that all derivatives are made of: E = Lambda A and L = Lambda C.
 */
import { multiply } from '../matrix/symmetric.ts'
import { type CompiledGroup, cellValue } from './compile.ts'

/** The matrices of one group at one gamma, with their work space; everything row-major, allocated once and reused. */
export interface GroupState {
  p: number
  m: number
  lambda: Float64Array
  beta: Float64Array
  psi: Float64Array
  theta: Float64Array
  nu: Float64Array
  alpha: Float64Array
  /** m x m; stays the identity where no factor has predictors */
  a: Float64Array
  /** m x m: Var(eta) */
  c: Float64Array
  /** p x m: E = Lambda A */
  e: Float64Array
  /** p x m: L = Lambda C */
  l: Float64Array
  /** m: E(eta) = A alpha */
  factorMean: Float64Array
  /** p x p */
  sigma: Float64Array
  /** p */
  mu: Float64Array
  work: Float64Array
}

export function groupState(p: number, m: number): GroupState {
  const array = (size: number) => new Float64Array(size)
  return {
    p,
    m,
    lambda: array(p * m),
    beta: array(m * m),
    psi: array(m * m),
    theta: array(p * p),
    nu: array(p),
    alpha: array(m),
    a: Float64Array.from({ length: m * m }, (_, at) => (at % (m + 1) === 0 ? 1 : 0)),
    c: array(m * m),
    e: array(p * m),
    l: array(p * m),
    factorMean: array(m),
    sigma: array(p * p),
    mu: array(p),
    work: array(2 * m * m + p * m)
  }
}

/**
 * Fills `state` with the group's matrices and moments at gamma.
 *
 * @returns false when I - B is singular there (a trial point to be rejected)
 */
export function impliedMoments(group: CompiledGroup, gamma: Float64Array, regressions: boolean, state: GroupState): boolean {
  fillMatrices(group, gamma, state)
  const { p, m, lambda, psi, a, c, e, l, sigma, mu, work } = state
  if (regressions) {
    if (!invertPathMatrix(state)) return false
    multiply(a, psi, m, m, m, work)
    for (let i = 0; i < m; i++) {
      for (let j = 0; j < m; j++) {
        let sum = 0
        for (let k = 0; k < m; k++) sum += work[i * m + k]! * a[j * m + k]!
        c[i * m + j] = sum
      }
    }
    multiply(lambda, a, p, m, m, e)
    multiply(a, state.alpha, m, m, 1, state.factorMean)
  } else {
    c.set(psi)
    e.set(lambda)
    state.factorMean.set(state.alpha)
  }
  multiply(lambda, c, p, m, m, l)
  for (let i = 0; i < p; i++) {
    for (let j = 0; j <= i; j++) {
      let sum = state.theta[i * p + j]!
      for (let k = 0; k < m; k++) sum += l[i * m + k]! * lambda[j * m + k]!
      sigma[i * p + j] = sum
      sigma[j * p + i] = sum
    }
    let mean = state.nu[i]!
    for (let k = 0; k < m; k++) mean += lambda[i * m + k]! * state.factorMean[k]!
    mu[i] = mean
  }
  return true
}

function fillMatrices(group: CompiledGroup, gamma: Float64Array, state: GroupState): void {
  const { p, m } = state
  state.lambda.set(group.lambda)
  state.beta.set(group.beta)
  state.psi.set(group.psi)
  state.theta.set(group.theta)
  state.nu.set(group.nu)
  state.alpha.set(group.alpha)
  for (const cell of group.free) {
    const value = cellValue(cell, gamma)
    const { row, column } = cell
    switch (cell.matrix) {
      case 'lambda':
        state.lambda[row * m + column] = value
        break
      case 'beta':
        state.beta[row * m + column] = value
        break
      case 'psi':
        state.psi[row * m + column] = value
        state.psi[column * m + row] = value
        break
      case 'theta':
        state.theta[row * p + column] = value
        state.theta[column * p + row] = value
        break
      case 'nu':
        state.nu[row] = value
        break
      case 'alpha':
        state.alpha[row] = value
        break
    }
  }
}

/** a = (I - B)^-1 by Gauss-Jordan with row pivoting; m is small. */
function invertPathMatrix({ m, beta, a, work }: GroupState): boolean {
  for (let i = 0; i < m; i++) {
    for (let j = 0; j < m; j++) {
      work[i * m + j] = (i === j ? 1 : 0) - beta[i * m + j]!
      a[i * m + j] = i === j ? 1 : 0
    }
  }
  for (let k = 0; k < m; k++) {
    let pivot = k
    for (let i = k + 1; i < m; i++) if (Math.abs(work[i * m + k]!) > Math.abs(work[pivot * m + k]!)) pivot = i
    const size = work[pivot * m + k]!
    if (!(Math.abs(size) > 1e-12)) return false
    for (let j = 0; j < m; j++) {
      const w = work[pivot * m + j]! / size
      const v = a[pivot * m + j]! / size
      work[pivot * m + j] = work[k * m + j]!
      a[pivot * m + j] = a[k * m + j]!
      work[k * m + j] = w
      a[k * m + j] = v
    }
    for (let i = 0; i < m; i++) {
      const factor = i === k ? 0 : work[i * m + k]!
      if (factor === 0) continue
      for (let j = 0; j < m; j++) {
        work[i * m + j]! -= factor * work[k * m + j]!
        a[i * m + j]! -= factor * a[k * m + j]!
      }
    }
  }
  return true
}
