import { describe, expect, it } from 'vitest'
import { eliminate } from './constraints.ts'

const equation = (weights: Record<string, number>, equals: number) => ({
  terms: Object.entries(weights).map(([label, weight]) => ({ label, weight })),
  equals
})

describe('linear equations among parameters', () => {
  it('give away the label of the largest coefficient, and say its value in the others', () => {
    const { pivots, standing } = eliminate(['a', 'b', 'c'], [equation({ a: 1, b: -2 }, 4)])
    expect(standing).toEqual(['independent'])
    expect([...pivots]).toEqual([[1, Float64Array.of(-0.5, 1, 0, -2)]])
  })

  it('leave a label that is to be kept, where another can be given away', () => {
    const keep = new Set(['b'])
    expect([...eliminate(['a', 'b'], [equation({ a: 1, b: -2 }, 0)], keep).pivots.keys()]).toEqual([0])
    expect([...eliminate(['a', 'b'], [equation({ b: -2 }, 0)], keep).pivots.keys()]).toEqual([1])
  })

  it('are implied, contradictory or independent of those before', () => {
    const { standing } = eliminate(
      ['a', 'b', 'c'],
      [
        equation({ a: 1, b: 1 }, 1),
        equation({ b: 1, c: -1 }, 0.1),
        equation({ a: 3, c: 3 }, 2.7),
        equation({ a: 1, c: 1 }, 1),
        equation({ a: 1, b: -1 }, 0)
      ]
    )
    expect(standing).toEqual(['independent', 'independent', 'implied', 'contradictory', 'independent'])
  })

  it('are judged whatever their units', () => {
    const { standing } = eliminate(['a', 'b'], [equation({ a: 1e-9, b: 3e-9 }, 1e6), equation({ a: 1e9, b: 3e9 }, 1e24)])
    expect(standing).toEqual(['independent', 'implied'])
  })

  it('that name an unknown label are a bug', () => {
    expect(() => eliminate(['a'], [equation({ z: 1 }, 0)])).toThrow('unknown label z')
  })
})
