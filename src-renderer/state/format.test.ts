import { describe, expect, test } from 'vitest'
import { bounded, fixed, plural, precise, probability, probabilityPhrase, signedBounded, signedFixed, timeLeft } from './format.ts'

describe('numbers as the window shows them', () => {
  test('values bounded by one lose their leading zero and keep three decimals', () => {
    expect([0.9724, 1, 0, 0.0004, 1.2].map((value) => bounded(value))).toEqual(['.972', '1.000', '.000', '.000', '1.200'])
  })

  test('minus is a true minus sign, and zero never has one', () => {
    expect([bounded(-0.0224), bounded(-0.0001), fixed(-0.001, 2), fixed(-3.5, 2)]).toEqual([
      '\u2212.022',
      '.000',
      '0.00',
      '\u22123.50'
    ])
  })

  test('thousands are set off by a narrow space from ten thousand on', () => {
    expect([fixed(21406.34, 1), fixed(1234.5, 2), fixed(1234567, 0)]).toEqual(['21\u2006406.3', '1234.50', '1\u2006234\u2006567'])
  })

  test('a probability below or above what three decimals can say is said so', () => {
    expect([0.042, 0.00099, 0.9995, 0.001].map((p) => probability(p))).toEqual(['.042', '< .001', '> .999', '.001'])
    expect(probabilityPhrase(1e-9)).toBe('p < .001')
    expect(probabilityPhrase(0.042, 'Holm p')).toBe('Holm p = .042')
  })

  test('a difference shows its sign unless it rounds to zero', () => {
    expect([0.0014, -0.022, 0.0002, -0.0002].map((value) => signedBounded(value))).toEqual(['+.001', '\u2212.022', '.000', '.000'])
  })

  test('so does the change of a parameter, with as many decimals as asked for', () => {
    expect([0.163, -0.191, 0.0002, null].map((value) => signedFixed(value, 3))).toEqual([
      '+0.163',
      '\u22120.191',
      '0.000',
      '\u2013'
    ])
  })

  test('what does not apply is a dash, without a title', () => {
    expect([fixed(null, 2), bounded(null), probability(null), signedBounded(null)]).toEqual([
      '\u2013',
      '\u2013',
      '\u2013',
      '\u2013'
    ])
    expect(precise(null)).toBeUndefined()
    expect(precise(0.1 + 0.2)).toBe('0.30000000000000004')
  })

  test('words follow their number', () => {
    expect([plural(1, 'entry', 'entries'), plural(2, 'entry', 'entries'), plural(0, 'item')]).toEqual([
      '1 entry',
      '2 entries',
      '0 items'
    ])
  })

  test('the time left is rounded to what one can mean by it', () => {
    expect([timeLeft(null), timeLeft(0.2), timeLeft(2.2), timeLeft(200)]).toEqual([
      null,
      'less than 1 s left',
      'about 2 s left',
      'about 3 min left'
    ])
  })
})
