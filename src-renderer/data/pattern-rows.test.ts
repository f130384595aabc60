import { describe, expect, test } from 'vitest'
import { harbourStudy } from '../../tests/window/mock/harbour.ts'
import { missingInWords, patternRows } from './pattern-rows.ts'

const indicators = ['a', 'b', 'c', 'd', 'e', 'f']
const missing = {
  values: 9,
  cases: 3,
  patterns: [
    { answered: indicators, n: 20 },
    { answered: ['a', 'b', 'c', 'd', 'e'], n: 5 },
    { answered: ['c', 'd', 'f'], n: 2 },
    { answered: ['e'], n: 1 }
  ]
}

describe('the patterns of missing answers', () => {
  test('each is said by what is missing, or by what is there where that is shorter', () => {
    expect(patternRows(missing, indicators).map((row) => row.words)).toEqual([
      'every indicator answered',
      'without f',
      'without a, b and e',
      'only e'
    ])
  })

  test('long lists end in a count', () => {
    const names = Array.from({ length: 12 }, (_, i) => `i${i}`)
    const rows = patternRows({ ...missing, patterns: [{ answered: names.slice(6), n: 1 }] }, names)
    expect(rows[0]?.words).toBe('without i0, i1, i2 and 3 others')
  })

  test('the picture has a place for each indicator and a bar against the most frequent pattern', () => {
    const rows = patternRows(missing, indicators)
    expect(rows[2]).toMatchObject({ answered: [false, false, true, true, false, true], bar: 10 })
  })

  test('the sentence says what complete cases cost, and what this study does instead', () => {
    const view = harbourStudy()
    view.result.data.missing = missing
    view.estimation.missing = 'complete cases'
    expect(missingInWords(view)).toBe(
      '9 answers missing, in 3 cases. This study drops these 3 cases (complete cases); full information would keep the answers given.'
    )
    view.estimation.missing = 'full information'
    expect(missingInWords(view)).toContain('Complete-case analysis would drop these 3 cases; this study keeps every answer given')
  })
})
