/**
 * tr(Omega d2Sigma) - 2 d2mu' z for every pair of cells where it is not zero (curvature.ts), from
 *
 *     dE_k/dlambda(a,b) = e_a A[b,k]          dL_b/dlambda(a,d) = e_a C[d,b]
 *     dE_k/dbeta(r,s)   = E_r A[s,k]          dL_b/dbeta(r,s)   = E_r C[s,b] + L_s A[b,r]
 *     da_b/dbeta(k,l)   = A[b,k] a_l          (a = A alpha, the factor means)
 *
 * Omega and z are already summed over the patterns, so this is done once a group.
 */
import type { FreeCell } from '../model/compile.ts'
import { columnDot, wholeForm } from './cell-columns.ts'
import type { GroupWork } from './work.ts'

type Add = (i: number, j: number, value: number) => void

interface Forms {
  p: number
  m: number
  /** (B' Omega B)[u, v] */
  h: (u: number, v: number) => number
  /** z' B[:, s] */
  y: (s: number) => number
  a: (row: number, column: number) => number
  c: (row: number, column: number) => number
  mean: (factor: number) => number
}

export function addSecondOrder(work: GroupWork, add: Add): void {
  const { p, size, state, omega, columns, product, form, z } = work
  const { m } = state
  wholeForm(omega, columns, p, size, product, form)
  const forms: Forms = {
    p,
    m,
    h: (u, v) => form[u * size + v]!,
    y: (s) => columnDot(z, columns, p, size - p, s),
    a: (row, column) => state.a[row * m + column] ?? 0,
    c: (row, column) => state.c[row * m + column]!,
    mean: (factor) => state.factorMean[factor]!
  }
  const means = work.s.some((s) => s >= 0)
  const { free } = work.group
  free.forEach((one, i) => {
    for (let j = 0; j <= i; j++) {
      const value = second(one, free[j]!, forms, means)
      if (value !== 0) add(i, j, value)
    }
  })
}

const order = { lambda: 0, beta: 1, psi: 2, alpha: 3, theta: 4, nu: 5 }

function second(one: FreeCell, other: FreeCell, forms: Forms, means: boolean): number {
  const [first, last] = order[one.matrix] <= order[other.matrix] ? [one, other] : [other, one]
  if (first.matrix === 'lambda') return withLoading(first, last, forms, means)
  if (first.matrix === 'beta') return withRegression(first, last, forms, means)
  return 0
}

function withLoading({ row: a, column: b }: FreeCell, { matrix, row, column }: FreeCell, f: Forms, means: boolean): number {
  const { p, m, h, y } = f
  const e = (k: number) => p + k
  const l = (k: number) => p + m + k
  switch (matrix) {
    case 'lambda':
      return 2 * f.c(b, column) * h(a, row)
    case 'beta':
      return (
        2 * (f.c(column, b) * h(a, e(row)) + f.a(b, row) * h(a, l(column))) - (means ? 2 * f.a(b, row) * f.mean(column) * y(a) : 0)
      )
    case 'psi':
      return (row === column ? 1 : 2) * (f.a(b, row) * h(a, e(column)) + f.a(b, column) * h(a, e(row)))
    case 'alpha':
      return -2 * f.a(b, row) * y(a)
    default:
      return 0
  }
}

function withRegression(
  { row: k, column: l }: FreeCell,
  { matrix, row: r, column: s }: FreeCell,
  f: Forms,
  means: boolean
): number {
  const { p, m, h, y } = f
  const e = (factor: number) => p + factor
  const load = (factor: number) => p + m + factor
  switch (matrix) {
    case 'beta': {
      const covariance = 2 * (f.a(s, k) * h(e(r), load(l)) + f.c(s, l) * h(e(k), e(r)) + f.a(l, r) * h(e(k), load(s)))
      return covariance - (means ? 2 * (f.a(s, k) * f.mean(l) * y(e(r)) + f.a(l, r) * f.mean(s) * y(e(k))) : 0)
    }
    case 'psi':
      return (r === s ? 1 : 2) * (f.a(l, r) * h(e(k), e(s)) + f.a(l, s) * h(e(k), e(r)))
    case 'alpha':
      return -2 * f.a(l, r) * y(e(k))
    default:
      return 0
  }
}
