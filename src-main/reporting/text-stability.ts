/**
 * How stable the verdicts of the ladders are, as plain text: rungs and steps top first, as the ladders are printed.
 */
import type { StabilityResult } from '../study/result.ts'
import { plainName, wrap } from './text-lines.ts'

/** Ending in a line end; nothing where no ladder was resampled. */
export function stabilityText(stability: readonly StabilityResult[], width = 80): string {
  const [first] = stability
  if (first === undefined) return ''
  const lines = stability.flatMap((one) => ['', ...ladderLines(one, width)])
  return [...lines, '', ...wrap(first.note, width)].map((line) => line.trimEnd()).join('\n') + '\n'
}

function ladderLines({ ladder, resamples, seed, steps, rungs }: StabilityResult, width: number): string[] {
  return [
    ...wrap(`${plainName(ladder)}: stability over ${resamples} resamples (seed ${seed})`, width),
    ...[...rungs].reverse().flatMap(({ sentence }) => item(sentence, width)),
    ...[...steps].reverse().flatMap(({ sentence }) => item(sentence, width))
  ]
}

/** Behind a dash, every line as far in as the first. */
function item(sentence: string, width: number): string[] {
  return wrap(plainName(sentence), width, '    ').map((line, i) => (i === 0 ? line.replace('    ', '  - ') : line))
}
