/**
 * Bad input: a file, a plan, a model or an argument that cannot be worked with.
 *
 * The one error a shell shows as a message and answers with exit status 2. Anything else that is thrown is a bug.
 */
export class InputError extends Error {
  /** What is wrong, one sentence without a full stop at its end being required. */
  readonly what: string
  /** Where: file, line, column, cell or candidate; null when the whole input is meant. */
  readonly where: string | null
  /** What to do about it; null when `what` already says so. */
  readonly remedy: string | null

  constructor(what: string, place: { where?: string | null; remedy?: string | null } = {}) {
    const where = place.where ?? null
    const remedy = place.remedy ?? null
    const ended = remedy === null || /[.!?]$/.test(what) ? what : `${what}.`
    super([where === null ? ended : `${where}: ${ended}`, remedy].filter((part) => part !== null).join(' '))
    this.name = 'InputError'
    this.what = what
    this.where = where
    this.remedy = remedy
  }
}
