/**
 * How numbers and times read in the window: formatting only, no number is computed here.
 *
 * Indices have three decimals and, where bounded by one, no leading zero; T has two; thousands are set off by a thin
 * space; minus is the true minus sign and zero is never negative; what does not apply is an en dash.
 */

const minus = '\u2212'
/** A sixth of an em; the font's own thin space is too thin to be seen. */
const thinSpace = '\u2006'
export const notApplicable = '\u2013'

/** Fixed decimals with thin-space thousands from 10 000 up: 21 406.3, 141.77, −0.12. */
export function fixed(value: number | null, decimals: number): string {
  if (value === null) return notApplicable
  const text = Math.abs(value).toFixed(decimals)
  const [whole = '', part] = text.split('.')
  const grouped = whole.length > 4 ? whole.replace(/\B(?=(\d{3})+$)/g, thinSpace) : whole
  return sign(value, text) + grouped + (part === undefined ? '' : `.${part}`)
}

/** A value bounded by one: .972, 1.000, −.022. */
export function bounded(value: number | null, decimals = 3): string {
  return fixed(value, decimals).replace(/^(\u2212?)0\./, '$1.')
}

/** A difference of bounded values, with its sign: +.001, −.022, .000. */
export function signedBounded(value: number | null): string {
  if (value === null) return notApplicable
  const text = bounded(value)
  return value > 0 && /[1-9]/.test(text) ? `+${text}` : text
}

/** A change of a parameter, with its sign unless it rounds to zero: +0.163, −0.191, 0.000. */
export function signedFixed(value: number | null, decimals: number): string {
  const text = fixed(value, decimals)
  return value !== null && value > 0 && /[1-9]/.test(text) ? `+${text}` : text
}

/** A probability alone: .042, < .001, > .999. */
export function probability(p: number | null): string {
  if (p === null) return notApplicable
  if (p < 0.001) return '< .001'
  return p > 0.999 ? '> .999' : bounded(p)
}

/** A probability in a sentence: p = .042, p < .001. */
export function probabilityPhrase(p: number | null, symbol = 'p'): string {
  const text = probability(p)
  return /^[<>]/.test(text) ? `${symbol} ${text}` : `${symbol} = ${text}`
}

export function count(value: number): string {
  return fixed(value, 0)
}

/** Full precision for a title; undefined (no title) where there is no number. */
export function precise(value: number | null): string | undefined {
  return value === null ? undefined : String(value)
}

/** One word or many: plural(1, 'item') is "1 item". */
export function plural(number: number, one: string, many = `${one}s`): string {
  return `${count(number)} ${number === 1 ? one : many}`
}

const dayAndTime = new Intl.DateTimeFormat('en-GB', { day: 'numeric', month: 'short', hour: '2-digit', minute: '2-digit' })
const timeOnly = new Intl.DateTimeFormat('en-GB', { hour: '2-digit', minute: '2-digit' })

export function moment(iso: string): string {
  return dayAndTime.format(new Date(iso))
}

export function clock(iso: string): string {
  return timeOnly.format(new Date(iso))
}

/** "about 2 s left"; null while nothing can be said. */
export function timeLeft(seconds: number | null): string | null {
  if (seconds === null) return null
  if (seconds < 1) return 'less than 1 s left'
  return seconds < 90 ? `about ${Math.round(seconds)} s left` : `about ${Math.round(seconds / 60)} min left`
}

/** A minus only where a digit other than zero is left to carry it. */
function sign(value: number, text: string): string {
  return value < 0 && /[1-9]/.test(text) ? minus : ''
}
