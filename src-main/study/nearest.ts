/**
 * The known word a mistyped one most likely stood for. Used in the remedies of bad-input messages.
 */

/** The word of `known` with the fewest edits from `word`, letter case ignored; null only when `known` is empty. */
export function nearestWord(word: string, known: readonly string[]): string | null {
  let best: string | null = null
  let fewest = Number.POSITIVE_INFINITY
  for (const candidate of known) {
    const edits = editDistance(word.toLowerCase(), candidate.toLowerCase())
    if (edits < fewest) {
      fewest = edits
      best = candidate
    }
  }
  return best
}

/** 'Did you mean "x"?', or null when no known word is close enough to have been meant. */
export function nearest(word: string, known: readonly string[]): string | null {
  const found = nearestWord(word, known)
  return found !== null && isClose(word, found) ? `Did you mean "${found}"?` : null
}

/** 'Did you mean "x"?' when some word is close enough to have been meant, and always what is known. */
export function didYouMean(word: string, known: readonly string[], what: string): string {
  if (known.length === 0) return `There are no ${what}.`
  const meant = nearest(word, known)
  return `${meant === null ? '' : `${meant} `}The ${what} are ${listed(known)}.`
}

/** "a, b and c", cut after a dozen. */
export function listed(words: readonly string[]): string {
  const shown = words.slice(0, 12).map((word) => `"${word}"`)
  if (words.length > 12) return `${shown.join(', ')} and ${words.length - 12} more`
  return shown.length < 2 ? shown.join('') : `${shown.slice(0, -1).join(', ')} and ${shown.at(-1)}`
}

function isClose(word: string, known: string): boolean {
  const edits = editDistance(word.toLowerCase(), known.toLowerCase())
  return edits < word.length && edits <= Math.max(1, Math.floor(word.length / 3))
}

/** Insertions, deletions, replacements and swaps of neighbours that turn one word into the other (optimal string alignment). */
function editDistance(a: string, b: string): number {
  let before: number[] = []
  let last = Array.from({ length: b.length + 1 }, (_, j) => j)
  for (let i = 1; i <= a.length; i++) {
    const row = [i]
    for (let j = 1; j <= b.length; j++) {
      const replace = last[j - 1]! + (a[i - 1] === b[j - 1] ? 0 : 1)
      let edits = Math.min(row[j - 1]! + 1, last[j]! + 1, replace)
      if (i > 1 && j > 1 && a[i - 1] === b[j - 2] && a[i - 2] === b[j - 1]) edits = Math.min(edits, before[j - 2]! + 1)
      row.push(edits)
    }
    before = last
    last = row
  }
  return last[b.length]!
}
