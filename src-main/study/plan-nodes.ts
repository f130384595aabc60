/**
 * Reads YAML 1.2 node by node, so that whatever is wrong can be named with file, line and column.
 *
 * Nothing here knows what a plan is. A scalar that is wanted as a name is taken as it was written, so that NA, yes,
 * 01 and -99 stay text; a number is taken only where YAML itself reads one.
 */
import { isAlias, isMap, isScalar, isSeq, LineCounter, type Node, type Pair, parseDocument, type Scalar } from 'yaml'
import { InputError } from './input-error.ts'
import { didYouMean, nearestWord } from './nearest.ts'

/** A node, or the place where one is missing: `node` is null there and `offset` is where it should have been. */
export interface Spot {
  node: Node | null
  offset: number
}

/** One entry of a mapping. */
export interface Entry {
  key: string
  keySpot: Spot
  value: Spot
}

export class PlanNodes {
  readonly root: Spot
  private readonly fileName: string
  private readonly lines = new LineCounter()
  private readonly document: ReturnType<typeof parseDocument>
  /** Where each value of the plan was written, by its path in the plan ("candidates.0.from"). */
  private readonly places = new Map<string, string>()

  /** @throws InputError when the text is not one document of YAML */
  constructor(text: string, fileName: string) {
    this.fileName = fileName
    this.document = parseDocument(text, { lineCounter: this.lines, prettyErrors: false, uniqueKeys: false, version: '1.2' })
    const problem = [...this.document.errors, ...this.document.warnings].sort((a, b) => a.pos[0] - b.pos[0])[0]
    if (problem !== undefined) {
      const what = problem.code === 'MULTIPLE_DOCS' ? 'a second document starts here.' : problem.message.trim().replace(/\.?$/, '.')
      throw new InputError(`This is not one document of valid YAML: ${what}`, { where: this.at(problem.pos[0]) })
    }
    this.root = { node: this.document.contents as Node | null, offset: 0 }
  }

  /** @throws InputError always */
  fail(spot: Spot, what: string, remedy: string | null = null): never {
    throw new InputError(what, { where: this.place(spot), remedy })
  }

  place(spot: Spot): string {
    return this.at(spot.node?.range?.[0] ?? spot.offset)
  }

  /** Remembers where the value at `path` of the plan was written. */
  mark(path: string, spot: Spot): void {
    this.places.set(path, this.place(spot))
  }

  /** Where the value at `path`, or the nearest part around it, was written. */
  placeOf(path: string): string {
    for (let end = path.length; end > 0; end = path.lastIndexOf('.', end - 1)) {
      const place = this.places.get(path.slice(0, end))
      if (place !== undefined) return place
    }
    return this.fileName
  }

  has(spot: Spot, kind: 'mapping' | 'list' | 'scalar'): boolean {
    const node = this.resolved(spot)
    return kind === 'mapping' ? isMap(node) : kind === 'list' ? isSeq(node) : isScalar(node) && scalarText(node) !== ''
  }

  /** The entries of a mapping in order. A key may stand once. */
  mapping(spot: Spot, what: string): Entry[] {
    const node = this.resolved(spot)
    if (!isMap(node)) this.fail(spot, `${what} must be a mapping ("key: value"), but ${this.kindOf(spot)} stands here.`)
    const entries = (node.items as Pair<Node, Node | null>[]).map((pair) => this.entry(pair, what))
    const seen = new Map<string, Spot>()
    for (const { key, keySpot } of entries) {
      const first = seen.get(key)
      if (first !== undefined)
        this.fail(keySpot, `"${key}" stands twice in ${inSentence(what)}, first in line ${this.line(first)}.`)
      seen.set(key, keySpot)
    }
    return entries
  }

  /** A mapping of which every key is known; what is left out, or written as null, is not in the map. */
  fields(spot: Spot, what: string, known: readonly string[], required: readonly string[] = []): Map<string, Spot> {
    const fields = new Map<string, Spot>()
    for (const { key, keySpot, value } of this.mapping(spot, what)) {
      if (!known.includes(key)) {
        const nearest = nearestWord(key, known)
        this.fail(
          keySpot,
          `Unknown key "${key}" in ${inSentence(what)}.`,
          `The nearest known key is "${nearest}"; known are ${known.join(', ')}.`
        )
      }
      if (required.includes(key) || !isWrittenNull(this.resolved(value))) fields.set(key, value)
    }
    const missing = required.find((key) => !fields.has(key))
    if (missing !== undefined) this.fail(spot, `${what} has no "${missing}".`, `Add "${missing}:".`)
    return fields
  }

  list(spot: Spot, what: string, example: string): Spot[] {
    const node = this.resolved(spot)
    if (!isSeq(node)) this.fail(spot, `${what} must be a list, but ${this.kindOf(spot)} stands here.`, `Write it like ${example}.`)
    return (node.items as (Node | null)[]).map((item) => ({ node: item, offset: node.range?.[0] ?? spot.offset }))
  }

  /** A scalar as text, exactly as written where it is not quoted. May be empty. */
  text(spot: Spot, what: string): string {
    const node = this.resolved(spot)
    if (node === null) return ''
    if (!isScalar(node)) this.fail(spot, `${what} must be a name, but ${this.kindOf(spot)} stands here.`)
    return scalarText(node)
  }

  name(spot: Spot, what: string): string {
    const name = this.text(spot, what).trim()
    if (name === '') this.fail(spot, `${what} is empty.`, 'A name is wanted here.')
    return name
  }

  names(spot: Spot, what: string, each: string, example: string): string[] {
    return this.list(spot, what, example).map((item) => this.name(item, each))
  }

  word<T extends string>(spot: Spot, what: string, words: readonly T[]): T {
    const text = this.text(spot, what).trim()
    const word = words.find((candidate) => candidate === text)
    if (word === undefined) this.fail(spot, `${what} cannot be "${text}".`, didYouMean(text, words, 'words it can be'))
    return word
  }

  number(spot: Spot, what: string): number {
    const node = this.resolved(spot)
    if (isScalar(node) && typeof node.value === 'number' && Number.isFinite(node.value)) return node.value
    const shown = isScalar(node) && scalarText(node) !== '' ? `"${scalarText(node)}"` : this.kindOf(spot)
    const comma = isScalar(node) && /^[+-]?\d+,\d+$/.test(scalarText(node).trim())
    this.fail(spot, `${what} must be a number, but ${shown} stands here.`, comma ? 'Write decimals with a point.' : null)
  }

  /** What stands there, in words. */
  private kindOf(spot: Spot): string {
    const node = this.resolved(spot)
    if (isMap(node)) return 'a mapping'
    if (isSeq(node)) return 'a list'
    return isScalar(node) && scalarText(node) !== '' ? `"${scalarText(node)}"` : 'nothing'
  }

  private entry(pair: Pair<Node, Node | null>, what: string): Entry {
    const keySpot = { node: pair.key, offset: 0 }
    const key = this.name(keySpot, `A key in ${inSentence(what)}`)
    return { key, keySpot, value: { node: pair.value, offset: pair.key?.range?.[0] ?? 0 } }
  }

  /** The node itself, or what an alias stands for. */
  private resolved(spot: Spot): Node | null {
    if (!isAlias(spot.node)) return spot.node
    return (
      spot.node.resolve(this.document) ??
      this.fail(spot, `"*${spot.node.source}" stands for nothing: there is no "&${spot.node.source}" before it.`)
    )
  }

  private line(spot: Spot): number {
    return this.lines.linePos(spot.node?.range?.[0] ?? spot.offset).line
  }

  private at(offset: number): string {
    const { line, col } = this.lines.linePos(offset)
    return `${this.fileName}, line ${Math.max(line, 1)}, column ${Math.max(col, 1)}`
  }
}

/** A plain scalar's text is its source: "01" and "yes" stay what was written. */
function scalarText(node: Scalar): string {
  if (typeof node.value === 'string') return node.value
  return node.source ?? (node.value === null || node.value === undefined ? '' : String(node.value))
}

/** null or ~ in so many letters, which says "left out"; an empty value does not. */
function isWrittenNull(node: Node | null): boolean {
  return isScalar(node) && node.value === null && /^(null|~)$/i.test(node.source ?? '')
}

/** "The plan" in the middle of a sentence; a name in quotes stays as it is. */
function inSentence(what: string): string {
  return /^(The|A|An|Each|Its) /.test(what) ? what.charAt(0).toLowerCase() + what.slice(1) : what
}
