/**
 * How numbers are written for people: the one place that rounds (the window has its own twin for hover and copy).
 *
 * Indices have three decimals, T two, a p-value no leading zero (".042", "< .001"). Zero is never negative, and what does
 * not apply is a dash. Nothing here computes: a number goes in, text comes out.
 */

/** What stands where a number does not apply. */
export const noValue = '–'

/** `value` with `decimals` decimals; "–" for null. -0.0004 with three decimals is "0.000", not "-0.000". */
export function fixed(value: number | null, decimals: number): string {
  if (value === null) return noValue
  const text = value.toFixed(decimals)
  return /^-0(\.0*)?$/.test(text) ? text.slice(1) : text
}

/** A test statistic: two decimals, none from a million on. */
export function statistic(value: number | null): string {
  return fixed(value, value !== null && Math.abs(value) >= 1e6 ? 0 : 2)
}

/** An information criterion: one decimal, since only differences of whole units are ever read. */
export function criterion(value: number | null): string {
  return fixed(value, 1)
}

/** An index such as CFI or RMSEA: three decimals, with the leading zero dropped as the trade prints it (".957", "1.000"). */
export function index(value: number | null): string {
  return withoutLeadingZero(fixed(value, 3))
}

/** A difference of an index, always with its sign ("+.004", "-.012", ".000"). */
export function signedIndex(value: number | null): string {
  return withSign(index(value))
}

/** A difference of an information criterion, always with its sign ("+31.5", "-2.1", "0.0"). */
export function signedCriterion(value: number | null): string {
  return withSign(criterion(value))
}

/** A p-value: ".042", "< .001", "> .999". Ready to stand after "p": see `pIs`. */
export function pValue(value: number | null): string {
  if (value === null) return noValue
  if (value < 0.001) return '< .001'
  return value > 0.999 ? '> .999' : withoutLeadingZero(fixed(value, 3))
}

/** A p-value with its letter and relation: "p = .042", "p < .001"; `letter` is "p" or "Holm p". */
export function pIs(letter: string, value: number | null): string {
  const text = pValue(value)
  return /^[<>]/.test(text) ? `${letter} ${text}` : `${letter} = ${text}`
}

/** "1 case", "2 cases". */
export function counted(value: number, one: string, many: string): string {
  return `${value} ${value === 1 ? one : many}`
}

function withoutLeadingZero(text: string): string {
  return text.replace(/^(-?)0\./, '$1.')
}

function withSign(text: string): string {
  return /^[.\d]/.test(text) && Number(text) !== 0 ? `+${text}` : text
}
