/**
 * JSON with one spelling per value: keys sorted, no spaces, numbers as JSON writes them (shortest text that reads back
 * to the same double). Digests are taken over this text, so that equal values have equal digests.
 */
import { createHash } from 'node:crypto'

/** @param value plain data (objects, arrays, text, finite numbers, booleans, null). Keys with `undefined` are left out. */
export function canonicalJson(value: unknown): string {
  return JSON.stringify(sorted(value))
}

/** "sha256:" and 64 hex digits of a text's UTF-8 bytes. */
export function digestOf(text: string): string {
  return `sha256:${createHash('sha256').update(text, 'utf8').digest('hex')}`
}

function sorted(value: unknown): unknown {
  if (Array.isArray(value)) return value.map(sorted)
  if (typeof value === 'number' && !Number.isFinite(value)) throw new Error(`not a finite number: ${value}`)
  if (value === null || typeof value !== 'object') return value
  const entries = Object.entries(value).filter(([, inner]) => inner !== undefined)
  entries.sort(([a], [b]) => (a < b ? -1 : a > b ? 1 : 0))
  return Object.fromEntries(entries.map(([key, inner]) => [key, sorted(inner)]))
}
