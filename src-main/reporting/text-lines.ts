/**
 * Plain text in columns: width, wrapping, and names made safe for a terminal. No statistics, no colour.
 */

/** Columns a text takes on a terminal: wide (East Asian) characters two, combining marks none. */
export function textWidth(text: string): number {
  let width = 0
  for (const character of text) {
    if (/\p{Mark}/u.test(character)) continue
    width +=
      /[\u1100-\u115f\u2e80-\ua4cf\uac00-\ud7a3\uf900-\ufaff\ufe30-\ufe6f\uff00-\uff60\uffe0-\uffe6]|\p{Emoji_Presentation}/u.test(
        character
      )
        ? 2
        : 1
  }
  return width
}

/** A user's own words without line ends or control characters, which a terminal would obey. */
export function plainName(text: string): string {
  return text.replace(/[\p{Cc}\p{Cf}\u2028\u2029]+/gu, ' ').trim()
}

/**
 * Breaks `text` at spaces into lines of at most `width` columns, each behind `indent`; a longer word is cut where it must be.
 * Two or more spaces in a row are kept inside a line (they set values apart).
 */
export function wrap(text: string, width: number, indent = ''): string[] {
  const room = Math.max(8, width - textWidth(indent))
  const lines: string[] = []
  let line = ''
  for (const [, gap, word] of text.matchAll(/( *)([^ ]+)/g)) {
    const longer = line === '' ? word! : line + gap! + word!
    if (textWidth(longer) <= room) {
      line = longer
      continue
    }
    if (line !== '') lines.push(line)
    line = word!
    while (textWidth(line) > room) {
      const head = cut(line, room)
      lines.push(head)
      line = line.slice(head.length)
    }
  }
  if (line !== '') lines.push(line)
  return lines.map((each) => indent + each)
}

/** `wrap` for a sentence with numbers: "p < .001" and "Delta T = 5" are never broken at their sign. */
export function wrapSentence(text: string, width: number, indent = ''): string[] {
  const glued = text.replace(/ ([<>=]) /g, '\u00a0$1\u00a0')
  return wrap(glued, width, indent).map((line) => line.replaceAll('\u00a0', ' '))
}

/** Puts groups of words on as few lines as they need, three spaces apart; a group is broken only when it is wider than a line. */
export function flow(groups: readonly string[], width: number, indent = ''): string[] {
  const lines: string[] = []
  let line = ''
  for (const group of groups) {
    const longer = line === '' ? group : `${line}   ${group}`
    if (textWidth(indent + longer) <= width) {
      line = longer
    } else {
      if (line !== '') lines.push(line)
      line = group
    }
  }
  if (line !== '') lines.push(line)
  return lines.flatMap((each) => wrap(each, width, indent))
}

/** The longest head of `text` that takes at most `width` columns; at least one character. */
function cut(text: string, width: number): string {
  let head = ''
  for (const character of text) {
    if (head !== '' && textWidth(head + character) > width) break
    head += character
  }
  return head
}
