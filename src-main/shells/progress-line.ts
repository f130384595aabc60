/**
 * One line on a terminal that tells how far the fits are, written over itself; nothing at all in a pipe or a file.
 */
import type { WorkEvent } from '../operations/contract.ts'
import { plainName } from '../reporting/text-lines.ts'
import type { Output } from './surroundings.ts'

export interface ProgressLine {
  show(event: WorkEvent): void
  /** Takes the line away, so that what follows starts on a clean one. */
  clear(): void
}

export function progressLine(output: Output): ProgressLine {
  if (output.isTTY !== true) return { show() {}, clear() {} }
  let shown = 0
  const clear = () => {
    if (shown > 0) output.write(`\r${' '.repeat(shown)}\r`)
    shown = 0
  }
  return {
    clear,
    show(event) {
      const text = progressText(event)
      if (text === null) return clear()
      const line = text.slice(0, (output.columns ?? 80) - 1)
      output.write(`\r${line.padEnd(shown)}`)
      shown = Math.max(shown, line.length)
    }
  }
}

/** Null when there is nothing more to wait for. */
function progressText(event: WorkEvent): string | null {
  switch (event.kind) {
    case 'started':
      return `fitting 0 of ${event.total}`
    case 'fitted':
      return `fitting ${event.done} of ${event.total}${timeLeft(event.secondsLeft)}, last: ${plainName(event.candidate)}`
    case 'resampled':
      return `resampling ${event.done} of ${event.total}${timeLeft(event.secondsLeft)}`
    case 'finished':
      return null
  }
}

function timeLeft(seconds: number | null): string {
  return seconds === null || seconds < 2 ? '' : `, about ${Math.round(seconds)} s left`
}
