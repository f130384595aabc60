/** Shares of resamples as text and as bars. Pure. */

/** "94%"; what is not quite all or nothing is never rounded to it. */
export function shareInWords(share: number): string {
  if (share <= 0) return '0%'
  if (share >= 1) return '100%'
  if (share < 0.01) return '< 1%'
  return share > 0.99 ? '> 99%' : `${Math.round(100 * share)}%`
}

/** A whole number in a field; null for anything else, or what lies outside. */
export function wholeNumber(text: string, least: number, most: number): number | null {
  const plain = text.replace(/[\s,\u2006\u2009]/g, '')
  if (!/^-?\d+$/.test(plain)) return null
  const value = Number(plain)
  return value < least || value > most ? null : value
}
