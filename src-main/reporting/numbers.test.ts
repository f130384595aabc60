import { describe, expect, test } from 'vitest'
import { criterion, fixed, index, pIs, pValue, signedCriterion, signedIndex, statistic } from './numbers.ts'

describe('numbers for people', () => {
  test('zero is never negative, whatever it was rounded from', () => {
    expect(fixed(-0, 2)).toBe('0.00')
    expect(fixed(-0.004, 2)).toBe('0.00')
    expect(signedIndex(-0.0004)).toBe('.000')
    expect(signedCriterion(-0.04)).toBe('0.0')
    expect(fixed(-0.006, 2)).toBe('-0.01')
  })

  test('an index has three decimals and no leading zero', () => {
    expect(index(0.95749)).toBe('.957')
    expect(index(1)).toBe('1.000')
    expect(index(-0.0123)).toBe('-.012')
  })

  test('a statistic has two decimals, a criterion one', () => {
    expect(statistic(37.3349)).toBe('37.33')
    expect(statistic(12_345_678.9)).toBe('12345679')
    expect(criterion(21_406.34)).toBe('21406.3')
  })

  test('a p-value is written as .042, and as a bound where three decimals would hide it', () => {
    expect(pValue(0.0424)).toBe('.042')
    expect(pValue(0.00099)).toBe('< .001')
    expect(pValue(0.001)).toBe('.001')
    expect(pValue(0.99996)).toBe('> .999')
    expect(pIs('p', 0.0424)).toBe('p = .042')
    expect(pIs('Holm p', 1e-300)).toBe('Holm p < .001')
  })

  test('a difference carries its sign unless it is nothing', () => {
    expect(signedIndex(0.0036)).toBe('+.004')
    expect(signedIndex(-0.0222)).toBe('-.022')
    expect(signedCriterion(31.48)).toBe('+31.5')
  })

  test('what does not apply is a dash', () => {
    for (const text of [fixed(null, 2), index(null), statistic(null), pValue(null), signedIndex(null)]) expect(text).toBe('–')
  })
})
