import { expect, it } from 'vitest'
import { didYouMean, listed, nearest, nearestWord } from './nearest.ts'

it('finds the word with the fewest edits, letter case ignored', () => {
  expect(nearestWord('indicatr', ['file', 'indicators', 'group'])).toBe('indicators')
  expect(nearestWord('GROUP', ['file', 'group'])).toBe('group')
  expect(nearestWord('anything', [])).toBeNull()
})

it('counts two swapped letters as one edit', () => {
  expect(nearest('nroth', ['south', 'north'])).toBe('Did you mean "north"?')
})

it('suggests nothing that shares too little', () => {
  expect(nearest('d', ['a', 'b'])).toBeNull()
  expect(nearest('weight', ['mood', 'sleep'])).toBeNull()
})

it('always says what is known', () => {
  expect(didYouMean('slep', ['mood', 'sleep'], 'columns')).toBe('Did you mean "sleep"? The columns are "mood" and "sleep".')
  expect(didYouMean('weight', ['mood', 'sleep'], 'columns')).toBe('The columns are "mood" and "sleep".')
  expect(didYouMean('weight', [], 'columns')).toBe('There are no columns.')
})

it('cuts a long list', () => {
  expect(listed(Array.from({ length: 14 }, (_, i) => `x${i}`))).toMatch(/"x11" and 2 more$/)
})
