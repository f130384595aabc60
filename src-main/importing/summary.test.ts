import { describe, expect, it } from 'vitest'
import type { DataPlan } from '../study/study.ts'
import { summaryDataSet } from './summary.ts'

type SummaryPlan = Extract<DataPlan, { kind: 'summary' }>
type Group = SummaryPlan['groups'][number]

function plan(groups: Partial<Group>[]): SummaryPlan {
  const base: Group = { name: null, n: 200, lower: [[4], [1, 9]], sd: null, mean: null }
  return {
    kind: 'summary',
    indicators: ['a', 'b'],
    divisor: 'n-1',
    group: 'site',
    groups: groups.map((group) => ({ ...base, ...group }))
  }
}

describe('published figures', () => {
  it('become a whole symmetric matrix', () => {
    const data = summaryDataSet(plan([{ mean: [5, 6] }]))
    expect(data).toMatchObject({ kind: 'summary', divisor: 'n-1', grouping: null, source: 'published summary', cautions: [] })
    expect(data.kind === 'summary' && [...data.groups[0]!.covariance]).toEqual([4, 1, 1, 9])
    expect(data.kind === 'summary' && [...data.groups[0]!.mean!]).toEqual([5, 6])
  })

  it('scale correlations by their standard deviations', () => {
    const data = summaryDataSet(plan([{ lower: [[1], [0.5, 1]], sd: [2, 3] }]))
    expect(data.kind === 'summary' && [...data.groups[0]!.covariance]).toEqual([4, 3, 3, 9])
  })

  it('have a grouping when there are several groups', () => {
    const data = summaryDataSet(plan([{ name: 'north' }, { name: 'south', n: 60 }]))
    expect(data.grouping).toBe('site')
    expect(data.cautions.map((caution) => caution.code)).toEqual(['small-sample'])
  })

  it('carry a caution when every variance is one', () => {
    expect(summaryDataSet(plan([{ lower: [[1], [0.5, 1]] }])).cautions[0]?.code).toBe('unit-variances')
    expect(summaryDataSet(plan([{ lower: [[1], [0.5, 1]], sd: [1, 1] }])).cautions[0]?.code).toBe('unit-variances')
  })

  it('that are not positive definite are refused with the smallest eigenvalue and the group', () => {
    expect(() => summaryDataSet(plan([{ name: 'north' }, { name: 'south', lower: [[1], [2, 1]] }]))).toThrow(
      'The matrix in group "south" is not positive definite: the smallest eigenvalue of its correlations is -1.'
    )
  })

  it('have a digest that knows the divisor, the sizes and every value', () => {
    const digests = [
      plan([{}]),
      { ...plan([{}]), divisor: 'n' as const },
      plan([{ n: 201 }]),
      plan([{ mean: [0, 0] }]),
      plan([{ lower: [[4], [1.5, 9]] }])
    ].map((one) => summaryDataSet(one).digest)
    expect(new Set(digests).size).toBe(5)
    expect(summaryDataSet(plan([{}])).digest).toBe(digests[0])
  })

  it('that did not come from a plan file are checked for shape all the same', () => {
    expect(() => summaryDataSet(plan([{ lower: [[4], [1]] }]))).toThrow('is not a lower triangle for 2 indicators')
    expect(() => summaryDataSet(plan([{ mean: [1] }]))).toThrow('There are 1 means')
    expect(() => summaryDataSet(plan([{ lower: [[0], [0, 1]] }]))).toThrow('The variance of "a" is not positive')
  })
})
