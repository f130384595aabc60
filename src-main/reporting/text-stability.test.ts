import { expect, test } from 'vitest'
import type { StabilityResult } from '../study/result.ts'
import { textWidth } from './text-lines.ts'
import { stabilityText } from './text-stability.ts'

const stable: StabilityResult = {
  ladder: 'Structure',
  asked: 1000,
  resamples: 1000,
  seed: 3,
  incomplete: 0,
  nowhere: 0,
  steps: [
    {
      from: 'Two',
      to: 'One',
      verdict: 'holds',
      counts: { holds: 942, 'does not hold': 58, 'criteria disagree': 0, 'no test': 0 },
      share: 0.942,
      expectedWhenExact: null,
      expectedInNewSamples: null,
      sentence:
        'The step from Two to One held in 94.2% of 1,000 resamples, and did not hold in 5.8%; in the data themselves it holds.'
    }
  ],
  rungs: [
    { rung: 'Two', stands: 58, unsolved: 0, share: 0.058, standsInData: false, sentence: 'Two was the rung in 5.8%.' },
    { rung: 'One', stands: 942, unsolved: 0, share: 0.942, standsInData: true, sentence: 'One was the rung in 94.2%.' }
  ],
  note: 'What the shares mean.'
}

test('prints rungs and steps top first, within the width, and says once what the shares mean', () => {
  const text = stabilityText([stable, { ...stable, ladder: 'Other' }], 60)
  expect(text.split('\n').every((line) => textWidth(line) <= 60)).toBe(true)
  expect(text.startsWith('\nStructure: stability over 1000 resamples (seed 3)\n  - One was the rung in 94.2%.\n  - Two was')).toBe(
    true
  )
  expect(text.match(/What the shares mean\./g)).toHaveLength(1)
})

test('prints nothing where nothing was resampled', () => {
  expect(stabilityText([])).toBe('')
})
