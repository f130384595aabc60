/**
 * The published form of a result: JSON at full double precision, null for what does not apply.
 *
 * JSON has no NaN or Infinity and would write them as null without a word; here they are a bug and stop the writing.
 */
import type { StudyResult } from '../study/result.ts'

/** The result as JSON text, two spaces deep, with a line end. Throws when a number in it is not finite or a field undefined. */
export function resultJson(result: StudyResult & { inspections?: readonly object[] }): string {
  assertPlain(result, 'result')
  return JSON.stringify(result, positiveZero, 2) + '\n'
}

/** Throws, naming the path, where a value cannot be said in JSON exactly. */
function assertPlain(value: unknown, path: string): void {
  if (typeof value === 'number' && !Number.isFinite(value))
    throw new Error(`${path} is ${value}; a result holds finite numbers or null.`)
  if (value === undefined) throw new Error(`${path} is undefined; a result says null where nothing applies.`)
  if (Array.isArray(value)) {
    for (const [index, item] of value.entries()) assertPlain(item, `${path}[${index}]`)
  } else if (value !== null && typeof value === 'object') {
    for (const [key, item] of Object.entries(value)) assertPlain(item, `${path}.${key}`)
  }
}

function positiveZero(_key: string, value: unknown): unknown {
  return Object.is(value, -0) ? 0 : value
}
