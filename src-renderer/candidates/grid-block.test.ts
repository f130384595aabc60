import { describe, expect, test } from 'vitest'
import { blockAsText, blockBetween, withText } from './grid-block.ts'

const cells = [
  ['free', ''],
  ['a', '1'],
  ['', 'a']
]
const at = (row: number, column: number) => ({ row, column })

describe('blocks of the grid', () => {
  test('are the same whichever corner one starts from', () => {
    expect(blockBetween(at(2, 1), at(0, 0))).toEqual(blockBetween(at(0, 0), at(2, 1)))
  })

  test('are copied with tabs between columns and lines between rows', () => {
    expect(blockAsText(cells, blockBetween(at(0, 0), at(1, 1)))).toBe('free\t\na\t1')
  })

  test('are pasted from the upper left corner, and what does not fit is left out', () => {
    expect(withText(cells, blockBetween(at(1, 1), at(1, 1)), 'x\ty\r\nz\tw\r\n')).toEqual([
      ['free', ''],
      ['a', 'x'],
      ['', 'z']
    ])
  })

  test('one value fills the whole block', () => {
    expect(withText(cells, blockBetween(at(0, 0), at(1, 1)), 'free')).toEqual([
      ['free', 'free'],
      ['free', 'free'],
      ['', 'a']
    ])
  })

  test('a copied block pasted where it came from changes nothing', () => {
    const whole = blockBetween(at(0, 0), at(2, 1))
    expect(withText(cells, whole, blockAsText(cells, whole))).toEqual(cells)
  })
})
