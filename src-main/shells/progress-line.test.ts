import { expect, test } from 'vitest'
import { progressLine } from './progress-line.ts'

function written(isTTY: boolean): { text: () => string; line: ReturnType<typeof progressLine> } {
  const parts: string[] = []
  const output = { isTTY, columns: 40, write: (text: string) => parts.push(text) }
  return { text: () => parts.join(''), line: progressLine(output) }
}

const fitted = {
  kind: 'fitted',
  candidate: 'A candidate with quite a long name',
  state: 'fitted',
  done: 2,
  total: 5,
  secondsLeft: 12.4
} as const

test('a terminal gets one line, cut to its width and taken away in the end', () => {
  const { text, line } = written(true)
  line.show({ kind: 'started', total: 5 })
  line.show(fitted)
  line.clear()
  const [, first, second, blank] = text().split('\r')
  expect(first).toBe('fitting 0 of 5')
  expect(second).toBe('fitting 2 of 5, about 12 s left, last: A candidate with quite a long name'.slice(0, 39))
  expect(blank).toBe(' '.repeat(39))
})

test('a pipe gets nothing', () => {
  const { text, line } = written(false)
  line.show({ kind: 'started', total: 5 })
  line.show(fitted)
  line.clear()
  expect(text()).toBe('')
})
