import { describe, expect, test } from 'vitest'
import { boundsFor, stateInWords } from './words.ts'

const negative = { code: 'negative-residual-variance', message: 'The residual variance of sleep is negative.', cell: ['sleep'] }
const small = { code: 'small-sample', message: 'Few cases.', cell: null }

describe('the state of a candidate', () => {
  test('an improper solution is named before other cautions are counted', () => {
    expect(stateInWords('fitted', [small, negative])).toBe('improper solution')
    expect(stateInWords('fitted', [small])).toBe('1 caution')
    expect(stateInWords('fitted', [])).toBe('fitted')
    expect(stateInWords('not converged', [small])).toBe('not converged')
  })

  test('a variance found negative in several groups is bounded once', () => {
    expect(boundsFor([negative, small, negative])).toEqual([
      { do: 'bound', cell: { part: 'residual variance', of: ['sleep'] }, atLeast: 0, atMost: null, group: null }
    ])
  })
})
