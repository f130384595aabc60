/**
 * The text of one answer as a number. Strict: only what every locale and program would read the same way.
 */

/** Digits with at most one decimal point, an optional sign and exponent; surrounding blanks are no part of it. */
const NUMBER = /^[+-]?(\d+\.?\d*|\.\d+)([eE][+-]?\d+)?$/

/** @returns the number, or null when the text is not one (see `whyNoNumber`) */
export function readNumber(text: string): number | null {
  if (!NUMBER.test(text)) return null
  const value = Number(text)
  if (!Number.isFinite(value)) return null
  return value === 0 ? 0 : value
}

/** What stands in the way of reading `text` as a number, and what to do about it. */
export function whyNoNumber(text: string): { what: string; remedy: string | null } {
  const shown = `"${text.length > 40 ? `${text.slice(0, 40)}…` : text}"`
  if (text === '')
    return { what: 'The answer is empty.', remedy: 'Add "" to the missing codes if an empty cell means a missing answer.' }
  if (isDecimalComma(text)) return { what: `${shown} is written with a decimal comma.`, remedy: 'Write decimals with a point.' }
  if (/^[+-]?\d{1,3}([, '.\u00a0\u202f]\d{3})+([.,]\d+)?$/.test(text)) {
    return { what: `${shown} is written with thousands separators.`, remedy: 'Write numbers without them.' }
  }
  if (/^[+-]?(inf|infinity)$/i.test(text) || NUMBER.test(text)) return { what: `${shown} is not a finite number.`, remedy: null }
  if (/^[+-]?0[xob][\da-f]+$/i.test(text)) return { what: `${shown} is not a decimal number.`, remedy: null }
  return { what: `${shown} is not a number.`, remedy: `If it stands for a missing answer, add it to the missing codes.` }
}

/** 3,5 and 0,25; what has just three digits behind one comma could be thousands and is not told apart here. */
export function isDecimalComma(text: string): boolean {
  return /^[+-]?\d*,\d+([eE][+-]?\d+)?$/.test(text) && !/^[+-]?[1-9]\d{0,2},\d{3}$/.test(text)
}
