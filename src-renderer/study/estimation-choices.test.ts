import { describe, expect, test } from 'vitest'
import { estimationSchema } from '../../src-main/study/study.ts'
import { estimationChoices, sensibleEstimation, withChoice } from './estimation-choices.ts'

const column = (name: string, missing: number) => ({ name, kind: 'numeric' as const, missing, distinct: 9, sample: [] })

describe('the choices of estimation', () => {
  test('every choice is one that a study takes, and comes with one sentence on when to choose it', () => {
    for (const { of, options } of estimationChoices) {
      for (const { value, when } of options) {
        expect(estimationSchema.parse({ [of]: value })[of]).toBe(value)
        expect(when).toMatch(/Choose it/)
      }
    }
  })

  test('full information with observed errors is proposed where a chosen indicator has missing answers', () => {
    const columns = [column('sleep', 0), column('worry', 3)]
    expect(sensibleEstimation(columns, ['sleep', 'worry'])).toMatchObject({
      missing: 'full information',
      standardErrors: 'observed'
    })
    expect(sensibleEstimation(columns, ['sleep'])).toMatchObject({ missing: 'complete cases', standardErrors: 'expected' })
  })

  test('standard errors follow the statistic until they are chosen by hand', () => {
    const start = sensibleEstimation([], [])
    expect(withChoice(start, 'statistic', 'mean-scaled', false)).toMatchObject({ standardErrors: 'robust' })
    expect(withChoice(start, 'missing', 'full information', false)).toMatchObject({ standardErrors: 'observed' })
    expect(withChoice(start, 'statistic', 'mean-scaled', true)).toMatchObject({ standardErrors: 'expected' })
    expect(withChoice(start, 'standardErrors', 'observed', false)).toMatchObject({ standardErrors: 'observed' })
  })
})
