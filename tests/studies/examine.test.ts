import { describe, expect, it } from 'vitest'
import { examine } from './examine.ts'

describe('the first models of another convergence study', () => {
  it('all converge, truly, and to a minimum that no further start beats', () => {
    for (let index = 0; index < 24; index++) {
      const { state, beatenBy, wronglyTold, others } = examine(index, 77)
      expect({ index, state, beatenBy, wronglyTold }).toEqual({ index, state: 'fitted', beatenBy: 0, wronglyTold: false })
      expect(others).toBeGreaterThan(0)
    }
  })
})
