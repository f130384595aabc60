/**
 * Bytes of a CSV or TSV file as rows of text, each with the line it begins in. Nothing is guessed beyond the delimiter.
 */
import { CsvError, parse } from 'csv-parse/sync'
import { InputError } from '../study/input-error.ts'
import { readNumber } from './numbers.ts'

export interface Table {
  header: string[]
  rows: { line: number; cells: string[] }[]
  /** Line of the header. */
  headerLine: number
  /** Blank lines between rows, which were passed over. */
  blankLines: number
}

/**
 * @param input bytes in UTF-8, with or without a byte order mark, or text already decoded
 * @throws InputError for another encoding, broken quotes, rows of unequal length, no header, duplicate columns
 */
export function readTable(input: Uint8Array | string, fileName: string): Table {
  const text = (typeof input === 'string' ? input.replace(/^\uFEFF/, '') : decode(input, fileName))
    .replace(/\r\n?/g, '\n')
    .replace(/(\n *)+$/, '')
  if (text.trim() === '')
    throw new InputError('The file is empty.', { where: fileName, remedy: 'A header and at least one row are wanted.' })
  const records = readRecords(text, findDelimiter(text, fileName), fileName)
  const [first, ...rest] = records
  if (first === undefined) throw new InputError('The file is empty.', { where: fileName })
  const header = first.cells
  checkHeader(header, first.line, fileName)
  for (const row of rest) checkLength(row, header.length, fileName)
  if (rest.length === 0) throw new InputError('The file has a header but no rows.', { where: fileName })
  return { header, rows: rest, headerLine: first.line, blankLines: records.at(-1)!.blankLines }
}

function decode(bytes: Uint8Array, fileName: string): string {
  const utf16 = (bytes[0] === 0xff && bytes[1] === 0xfe) || (bytes[0] === 0xfe && bytes[1] === 0xff)
  if (utf16) throw new InputError('The file is in UTF-16, not in UTF-8.', { where: fileName, remedy: 'Save it as "CSV UTF-8".' })
  if (bytes.includes(0))
    throw new InputError('This is not a text file.', { where: fileName, remedy: 'A CSV or TSV file in UTF-8 is wanted.' })
  try {
    return new TextDecoder('utf-8', { fatal: true }).decode(bytes)
  } catch {
    const where = `${fileName}, line ${badLine(bytes)}`
    throw new InputError('The file is not in UTF-8.', { where, remedy: 'Save it as "CSV UTF-8".' })
  }
}

/** The first line that is not UTF-8, counted from 1. */
function badLine(bytes: Uint8Array): number {
  let line = 1
  for (let start = 0; start <= bytes.length; line++) {
    const newline = bytes.indexOf(10, start)
    const end = newline < 0 ? bytes.length : newline
    try {
      new TextDecoder('utf-8', { fatal: true }).decode(bytes.subarray(start, end))
    } catch {
      return line
    }
    start = end + 1
  }
  return 1
}

/** Comma or tab, by the header (quoted parts left aside), then by the file's ending. */
function findDelimiter(text: string, fileName: string): ',' | '\t' {
  const header = text
    .trimStart()
    .split('\n', 1)[0]!
    .replace(/"[^"]*"/g, '')
  const count = (sign: string): number => header.split(sign).length - 1
  const [commas, tabs, semicolons] = [count(','), count('\t'), count(';')]
  if (semicolons > 0 && commas === 0 && tabs === 0) {
    throw new InputError('The columns are separated by semicolons.', {
      where: `${fileName}, line 1`,
      remedy: 'Save the file with commas or tabs between columns, and decimals with a point.'
    })
  }
  if (tabs > commas) return '\t'
  return commas === 0 && /\.(tsv|tab)$/i.test(fileName) ? '\t' : ','
}

type Row = { line: number; cells: string[]; blankLines: number }

function readRecords(text: string, delimiter: string, fileName: string): Row[] {
  try {
    const records = parse(text, { delimiter, info: true, relax_column_count: true, skip_empty_lines: true }) as unknown as {
      record: string[]
      info: { lines: number; empty_lines: number }
    }[]
    return records.map(({ record, info }) => ({
      // `lines` counts to where the record ends; a quoted cell may span several
      line: info.lines - record.reduce((sum, cell) => sum + cell.split('\n').length - 1, 0),
      cells: record.map((cell) => cell.trim()),
      blankLines: info.empty_lines
    }))
  } catch (error) {
    if (!(error instanceof CsvError)) throw error
    const line = error.code === 'CSV_QUOTE_NOT_CLOSED' ? lineOfOpenQuote(text) : error['lines']
    throw new InputError(quoteProblem(error.code), {
      where: `${fileName}, line ${line}`,
      remedy: 'Inside quotes a quote is written twice, and the whole cell stands in quotes.'
    })
  }
}

/** The line of the quote that is still open at the end of the text. */
function lineOfOpenQuote(text: string): number {
  let [line, opened, open] = [1, 1, false]
  for (const sign of text) {
    if (sign === '\n') line++
    if (sign !== '"') continue
    open = !open
    if (open) opened = line
  }
  return opened
}

function quoteProblem(code: string): string {
  if (code === 'CSV_QUOTE_NOT_CLOSED') return 'A quote is opened and never closed.'
  if (code === 'CSV_INVALID_CLOSING_QUOTE') return 'Text follows a closing quote.'
  return 'A quote stands inside a cell that is not quoted.'
}

function checkHeader(header: readonly string[], line: number, fileName: string): void {
  const where = `${fileName}, line ${line}`
  if (header.every((cell) => readNumber(cell) !== null)) {
    throw new InputError('The first row holds numbers, so the header seems to be missing.', {
      where,
      remedy: 'Put the names of the columns in the first row.'
    })
  }
  const repeated = header.findIndex((name, i) => name !== '' && header.indexOf(name) < i)
  if (repeated >= 0) {
    const first = header.indexOf(header[repeated]!)
    throw new InputError(`Columns ${first + 1} and ${repeated + 1} are both called "${header[repeated]}".`, {
      where,
      remedy: 'Rename one.'
    })
  }
}

function checkLength({ line, cells }: Row, wanted: number, fileName: string): void {
  if (cells.length === wanted) return
  const remedy =
    cells.length > wanted
      ? 'A cell that holds the separator must stand in quotes; decimals must be written with a point.'
      : 'Every row needs a cell for every column, even when it is empty.'
  throw new InputError(`The row has ${cells.length} cells, but the header has ${wanted}.`, {
    where: `${fileName}, line ${line}`,
    remedy
  })
}
