import { describe, expect, test } from 'vitest'
import { flow, plainName, textWidth, wrap, wrapSentence } from './text-lines.ts'

describe('plain text in columns', () => {
  test('counts a wide character as two columns and a combining mark as none', () => {
    expect(textWidth('測定')).toBe(4)
    expect(textWidth('e\u0301')).toBe(1)
  })

  test('breaks at spaces, and cuts a word only when it has to', () => {
    expect(wrap('one two three', 8)).toEqual(['one two', 'three'])
    expect(wrap('abcdefghijkl mn', 8)).toEqual(['abcdefgh', 'ijkl mn'])
    expect(wrap('one two', 12, '    ')).toEqual(['    one two'])
    expect(wrap('', 8)).toEqual([])
  })

  test('never breaks a relation at its sign', () => {
    expect(wrapSentence('a difference with p < .001 here', 22)).toEqual(['a difference with', 'p < .001 here'])
  })

  test('puts groups on as few lines as they need', () => {
    expect(flow(['CFI .972', 'TLI .966', 'SRMR .031'], 20)).toEqual(['CFI .972   TLI .966', 'SRMR .031'])
  })

  test('takes control and direction characters out of a name', () => {
    expect(plainName('a\u001b[2Jb\u202ec\n')).toBe('a [2Jb c')
  })
})
