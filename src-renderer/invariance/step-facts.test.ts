import { describe, expect, test } from 'vitest'
import type { StepResult } from '../../src-main/operations/contract.ts'
import { stepFacts } from './step-facts.ts'

const difference: NonNullable<StepResult['difference']> = {
  T: 12.3,
  df: 4,
  p: 0.015,
  holmP: null,
  method: 'scaled',
  scaling: 1.2346,
  rmsea: { estimate: 0.012, lower: 0.004, upper: 0.02 },
  critical: 9.49
}
const step = { difference, notNested: null, relation: 'nested', proof: 'constraints', because: 'It is significant.' } as StepResult

describe('what a verdict rests on', () => {
  test('names the test by its source, the scaling, the size of the step and how the relation was shown', () => {
    expect(stepFacts(step).map(({ name, text }) => `${name}: ${text}`)).toEqual([
      'Test: scaled chi-square difference (Satorra & Bentler 2001)',
      'Scaling: 1.235',
      'Size of the step: RMSEA of the difference .012 [.004, .020]',
      'Relation: nested, shown by what each constrains'
    ])
  })

  test('leaves out what the sentence of the verdict says already', () => {
    const because = 'The scaled chi-square difference (Satorra & Bentler 2001) is 12.30. RMSEA of the difference .012 [.004, .020].'
    expect(stepFacts({ ...step, because }).map(({ name }) => name)).toEqual(['Scaling', 'Relation'])
  })
})
