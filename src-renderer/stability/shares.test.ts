import { describe, expect, test } from 'vitest'
import { shareInWords, wholeNumber } from './shares.ts'

describe('shares of resamples', () => {
  test('are never rounded to none or all', () => {
    expect([0, 0.001, 0.944, 0.9999, 1].map(shareInWords)).toEqual(['0%', '< 1%', '94%', '> 99%', '100%'])
  })
})

describe('a whole number in a field', () => {
  test('may have its thousands set off, and is refused outside its limits', () => {
    expect(['1000', '1,000', '1 000', ' 50 '].map((text) => wholeNumber(text, 1, 100_000))).toEqual([1000, 1000, 1000, 50])
    expect(['0', '1e3', '2.5', '', '100001'].map((text) => wholeNumber(text, 1, 100_000))).toEqual([null, null, null, null, null])
  })
})
