/**
 * A CSV or TSV file as a data set of rows. What cannot be read is refused with line, column and value; what is left
 * out is counted in a caution.
 */
import { InputError } from '../study/input-error.ts'
import { didYouMean } from '../study/nearest.ts'
import type { Caution, DataSet, Estimation, RowGroup } from '../study/study.ts'
import { digestOf } from './digest.ts'
import { isDecimalComma, readNumber, whyNoNumber } from './numbers.ts'
import { checkRows } from './soundness.ts'
import { readTable, type Table } from './table.ts'

export interface DelimitedOptions {
  /** What messages call the file; its ending helps to tell CSV from TSV. */
  fileName: string
  indicators: readonly string[]
  /** The grouping column, or null. */
  group: string | null
  /** Texts that stand for a missing answer, blanks around them ignored. */
  missingCodes: readonly string[]
  /** What estimation will do about missing answers: complete cases unless said otherwise. */
  missing?: Estimation['missing']
}

/** A first look at the columns, without saying yet which are indicators. */
export interface Preview {
  rows: number
  columns: { name: string; kind: 'numeric' | 'text'; missing: number; distinct: number; sample: string[] }[]
  cautions: Caution[]
}

/** One kept row: its group (null without a grouping) and its answers, NaN where missing. */
interface Answered {
  group: string | null
  answers: number[]
}

/**
 * @throws InputError for whatever cannot be read, or cannot be analysed (soundness.ts)
 */
export function readDelimited(input: Uint8Array | string, options: DelimitedOptions): DataSet {
  const { fileName, indicators, group } = options
  const table = readTable(input, fileName)
  if (group !== null && indicators.includes(group)) {
    throw new InputError(`"${group}" is an indicator and the grouping.`, {
      where: fileName,
      remedy: 'A column can be one of the two.'
    })
  }
  const { kept, cautions } = keepRows(table, options)
  const groups = splitByGroup(kept, indicators.length)
  if (groups.length === 0) throw new InputError('No row has an answer on any indicator.', { where: fileName })
  if (group !== null && groups.length === 1) {
    const message = `The column "${group}" holds one group only ("${groups[0]!.name}"), so there is nothing to compare across it.`
    cautions.push({ code: 'one-group', message, cell: [group] })
  }
  const unsound = checkRows(indicators, groups, fileName, options.missing)
  const content = { kind: 'rows' as const, indicators: [...indicators], grouping: group, groups }
  return { ...content, digest: digestOf(content), source: fileName, cautions: [...cautions, ...incomplete(kept), ...unsound] }
}

/** @throws InputError when the file is no table */
export function previewDelimited(input: Uint8Array | string, fileName: string, missingCodes: readonly string[]): Preview {
  const table = readTable(input, fileName)
  const missing = codesOf(missingCodes)
  const cautions = tableCautions(table)
  const columns = table.header.map((name, at) => {
    const answers = table.rows.map((row) => row.cells[at]!).filter((text) => !missing.has(text))
    if (
      answers.length > 0 &&
      answers.some(isDecimalComma) &&
      answers.every((text) => isDecimalComma(text) || readNumber(text) !== null)
    ) {
      const message = `"${name}" is written with decimal commas; write decimals with a point to use it as an indicator.`
      cautions.push({ code: 'decimal-comma', message, cell: [name] })
    }
    return {
      name,
      kind: answers.every((text) => readNumber(text) !== null) ? ('numeric' as const) : ('text' as const),
      missing: table.rows.length - answers.length,
      distinct: new Set(answers).size,
      sample: answers.slice(0, 5)
    }
  })
  return { rows: table.rows.length, columns, cautions }
}

/** The rows with a group and at least one answer, and what was left out. */
function keepRows(table: Table, options: DelimitedOptions): { kept: Answered[]; cautions: Caution[] } {
  const columns = options.indicators.map((name) => columnOf(table, name, 'indicator', options.fileName))
  const groupColumn = options.group === null ? null : columnOf(table, options.group, 'grouping', options.fileName)
  const missing = codesOf(options.missingCodes)
  const kept: Answered[] = []
  let [withoutGroup, withoutAnswer] = [0, 0]
  for (const { line, cells } of table.rows) {
    const group = groupColumn === null ? null : cells[groupColumn]!
    const answers = columns.map((at, j) =>
      readAnswer(cells[at]!, missing, () => `${options.fileName}, line ${line}, column "${options.indicators[j]}"`)
    )
    if (group !== null && (group === '' || missing.has(group))) withoutGroup++
    else if (answers.every(Number.isNaN)) withoutAnswer++
    else kept.push({ group, answers })
  }
  const cautions = tableCautions(table)
  if (withoutGroup > 0) {
    const message = `${rowsWord(withoutGroup)} without a value in "${options.group}" left out.`
    cautions.push({ code: 'group-missing', message, cell: [options.group!] })
  }
  if (withoutAnswer > 0) {
    cautions.push({
      code: 'all-missing',
      message: `${rowsWord(withoutAnswer)} without an answer on any indicator left out.`,
      cell: null
    })
  }
  return { kept, cautions }
}

function columnOf(table: Table, name: string, role: string, fileName: string): number {
  const at = table.header.indexOf(name)
  if (at >= 0) return at
  throw new InputError(`There is no column "${name}" (wanted as ${role}).`, {
    where: `${fileName}, line ${table.headerLine}`,
    remedy: didYouMean(
      name,
      table.header.filter((column) => column !== ''),
      'columns'
    )
  })
}

function codesOf(missingCodes: readonly string[]): Set<string> {
  return new Set(missingCodes.map((code) => code.trim()))
}

function readAnswer(text: string, missing: ReadonlySet<string>, where: () => string): number {
  if (missing.has(text)) return Number.NaN
  const number = readNumber(text)
  if (number !== null) return number
  const { what, remedy } = whyNoNumber(text)
  throw new InputError(what, { where: where(), remedy })
}

/** In order of first appearance. */
function splitByGroup(kept: readonly Answered[], p: number): RowGroup[] {
  const rows = new Map<string | null, Answered[]>()
  for (const row of kept) {
    const members = rows.get(row.group)
    if (members === undefined) rows.set(row.group, [row])
    else members.push(row)
  }
  return [...rows].map(([name, members]) => {
    const values = new Float64Array(members.length * p)
    members.forEach((row, i) => {
      values.set(row.answers, i * p)
    })
    return { name, n: members.length, values }
  })
}

function incomplete(kept: readonly Answered[]): Caution[] {
  const lost = kept.filter((row) => row.answers.some(Number.isNaN)).length
  if (lost === 0) return []
  const message = `${lost} of ${kept.length} rows lack an answer on some indicator; complete-case estimation leaves them out, full information uses what they answered.`
  return [{ code: 'incomplete-rows', message, cell: null }]
}

function tableCautions(table: Table): Caution[] {
  const unnamed = table.header.filter((name) => name === '').length
  const cautions: Caution[] = []
  if (table.blankLines > 0)
    cautions.push({ code: 'blank-lines', message: `${table.blankLines} blank line(s) between rows passed over.`, cell: null })
  if (unnamed > 0)
    cautions.push({ code: 'unnamed-columns', message: `${unnamed} column(s) without a name passed over.`, cell: null })
  return cautions
}

function rowsWord(count: number): string {
  return count === 1 ? '1 row' : `${count} rows`
}
