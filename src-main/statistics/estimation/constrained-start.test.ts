import { describe, expect, it } from 'vitest'
import type { LinearConstraint, ModelCells } from '../model/cells.ts'
import { cellValue, compileModel } from '../model/compile.ts'
import { backWithin, startWithin } from './constrained-start.ts'

/** One factor of three indicators with the constraints given; labels l1..l3, t1..t3, phi. */
function model(constraints: LinearConstraint[]) {
  const cells: ModelCells = {
    indicators: ['a', 'b', 'c'],
    factors: ['F'],
    groups: [
      {
        name: null,
        loadings: [['l1'], ['l2'], ['l3']],
        regressions: [[0]],
        factorCovariances: [['phi']],
        residualCovariances: [
          ['t1', 0, 0],
          [0, 't2', 0],
          [0, 0, 't3']
        ],
        intercepts: null,
        factorMeans: null
      }
    ],
    constraints
  }
  return compileModel(cells)
}

const constraint = (weights: Record<string, number>, equals: number): LinearConstraint => ({
  terms: Object.entries(weights).map(([label, weight]) => ({ label, weight })),
  equals
})

function values(compiled: ReturnType<typeof model>, gamma: Float64Array): Record<string, number> {
  return Object.fromEntries(compiled.groups[0]!.free.map((cell) => [cell.label, cellValue(cell, gamma)]))
}

const wanted: Record<string, number> = { l1: 1, l2: 2, l3: 3, t1: 4, t2: 5, t3: 6, phi: 1 }
const target = (label: string) => wanted[label]!

describe('starting values under linear constraints', () => {
  it('are those wanted where there are no constraints', () => {
    const compiled = model([])
    expect(values(compiled, startWithin(compiled, target))).toEqual(wanted)
  })

  it('of variances stay positive however far the constraint is from what was wanted', () => {
    const compiled = model([constraint({ t1: 1, t2: 1 }, 0.001), constraint({ t2: 1, t3: -50 }, 0)])
    const start = values(compiled, startWithin(compiled, target))
    expect(start['t1']! + start['t2']!).toBeCloseTo(0.001, 10)
    expect(start['t2']! - 50 * start['t3']!).toBeCloseTo(0, 10)
    for (const label of ['t1', 't2', 't3']) expect(start[label]).toBeGreaterThan(0)
    expect(start['l2']).toBe(2)
  })

  it('of two variances with a sum share it as they were wanted to', () => {
    const compiled = model([constraint({ t1: 1, t2: 1 }, 18)])
    const start = values(compiled, startWithin(compiled, target))
    expect([start['t1']!.toFixed(9), start['t2']!.toFixed(9)]).toEqual(['8.000000000', '10.000000000'])
  })

  it('of anything else are the nearest in their own units', () => {
    const compiled = model([constraint({ l1: 1, l2: 1 }, 8)])
    const start = values(compiled, startWithin(compiled, target))
    expect([start['l1']!.toFixed(9), start['l2']!.toFixed(9)]).toEqual(['2.000000000', '6.000000000'])
  })

  it('moved away are brought back', () => {
    const compiled = model([constraint({ t1: 1, t2: 1 }, 9)])
    const start = startWithin(compiled, target)
    const moved = backWithin(
      compiled,
      start,
      start.map((value) => 4 * value)
    )
    const found = values(compiled, moved)
    expect(found['t1']! + found['t2']!).toBeCloseTo(9, 10)
    expect(Math.min(found['t1']!, found['t2']!)).toBeGreaterThan(0)
    expect(found['t3']).toBe(24)
  })
})
