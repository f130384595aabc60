import { readFileSync } from 'node:fs'
import { describe, expect, it } from 'vitest'
import type { DataSet } from '../study/study.ts'
import { type DelimitedOptions, previewDelimited, readDelimited } from './delimited.ts'

const ROWS = ['1,2.5,north', '2,3,south', '4,1e0,north', '3,-0.5,south', '6,2,north', '5,+4,south', '9,3.25,north', '2,1,south']

function read(text: string | Uint8Array, options: Partial<DelimitedOptions> = {}): DataSet & { kind: 'rows' } {
  const data = readDelimited(text, { fileName: 'a.csv', indicators: ['a', 'b'], group: null, missingCodes: ['', 'NA'], ...options })
  if (data.kind !== 'rows') throw new Error('rows are wanted')
  return data
}

function file(rows: readonly string[] = ROWS, header = 'a,b,site', newline = '\n'): string {
  return [header, ...rows, ''].join(newline)
}

const codes = (data: DataSet): string[] => data.cautions.map((caution) => caution.code)

describe('reading a CSV file', () => {
  it('keeps the values in the order of the file, row-major', () => {
    const data = read(file())
    expect(data.groups).toHaveLength(1)
    expect([...data.groups[0]!.values.slice(0, 6)]).toEqual([1, 2.5, 2, 3, 4, 1])
    expect(data).toMatchObject({ kind: 'rows', indicators: ['a', 'b'], grouping: null, source: 'a.csv' })
  })

  it('makes groups in order of first appearance', () => {
    const data = read(file(), { group: 'site' })
    expect(data.groups.map(({ name, n }) => [name, n])).toEqual([
      ['north', 4],
      ['south', 4]
    ])
    expect([...data.groups[1]!.values]).toEqual([2, 3, 3, -0.5, 5, 4, 2, 1])
  })

  it('reads the same from bytes with a mark, CRLF, quotes, blanks and tabs', () => {
    const digest = read(file()).digest
    const bytes = new TextEncoder().encode(`\uFEFF${file(ROWS, 'a,b,site', '\r\n')}`)
    expect(read(bytes).digest).toBe(digest)
    expect(
      read(
        file(
          ROWS.map((row) =>
            row
              .split(',')
              .map((cell) => `" ${cell}"`)
              .join(',')
          )
        )
      ).digest
    ).toBe(digest)
    expect(read(file(ROWS, 'a,b,site').replaceAll(',', '\t')).digest).toBe(digest)
  })

  it('keeps commas, quotes and line breaks inside quoted cells out of the way', () => {
    const rows = ROWS.map((row, i) => `${row},"note ""${i}"",\nsecond line"`)
    expect(read(file(rows, 'a,b,site,note')).digest).toBe(read(file()).digest)
    const broken = [...rows.slice(0, 3), 'x,1,north,plain', ...rows.slice(4)]
    expect(() => read(file(broken, 'a,b,site,note'))).toThrow('a.csv, line 8, column "a": "x" is not a number.')
  })

  it('reads missing codes as missing, blanks around them ignored', () => {
    const data = read(file([...ROWS, ' NA ,2,north', '3,-99,south']), { missingCodes: ['NA', ' -99 '] })
    expect([...data.groups[0]!.values.slice(-4)]).toEqual([Number.NaN, 2, 3, Number.NaN])
    expect(data.cautions.find((caution) => caution.code === 'incomplete-rows')?.message).toBe(
      '2 of 10 rows lack an answer on some indicator; complete-case estimation leaves them out, full information uses what they answered.'
    )
  })

  it('counts the rows it leaves out', () => {
    const data = read(file([...ROWS, '1,2,', '3,4,NA', ',NA,north', '', '2,2,south']), { group: 'site' })
    expect(data.groups.map((group) => group.n)).toEqual([4, 5])
    expect(codes(data)).toEqual(['blank-lines', 'group-missing', 'all-missing', 'small-sample', 'small-sample'])
    expect(data.cautions[1]?.message).toBe('2 rows without a value in "site" left out.')
  })

  it('says when the grouping holds one group', () => {
    expect(codes(read(file(ROWS.map((row) => row.replace('south', 'north'))), { group: 'site' }))).toContain('one-group')
  })

  it('says no small sample for a hundred cases', () => {
    const rows = Array.from({ length: 100 }, (_, i) => `${i % 7},${i % 11},x`)
    expect(codes(read(file(rows)))).toEqual([])
  })

  it('passes over a column without a name, with a caution', () => {
    expect(
      codes(
        read(
          file(
            ROWS.map((row) => `${row},`),
            'a,b,site,'
          )
        )
      )
    ).toContain('unnamed-columns')
  })

  it('tells two indicators that determine each other apart from two that nearly do', () => {
    const rows = (noise: number) => Array.from({ length: 30 }, (_, i) => `${i},${2 * i + (i === 3 ? noise : 0)},x`)
    expect(() => read(file(rows(0)))).toThrow('"a" and "b" determine each other exactly')
    expect(() => read(file(rows(0.1)))).not.toThrow()
  })
})

describe('the digest', () => {
  it('changes with any value, name or group, and with nothing else', () => {
    const of = (text: string, options: Partial<DelimitedOptions> = {}) => read(text, options).digest
    const digest = of(file())
    expect(digest).toMatch(/^sha256:[0-9a-f]{64}$/)
    expect(of(file(), { fileName: 'other.csv' })).toBe(digest)
    expect(of(file().replace('2.5', '2.50'))).toBe(digest)
    expect(of(file().replace('2.5', '2.6'))).not.toBe(digest)
    expect(of(file(ROWS, 'a,c,site'), { indicators: ['a', 'c'] })).not.toBe(digest)
    expect(of(file(), { group: 'site' })).not.toBe(digest)
    expect(of(file([...ROWS].reverse()))).not.toBe(digest)
  })

  it('of the sample study is what it has always been', () => {
    const bytes = readFileSync(new URL('../../fixtures/sample/first-visit.csv', import.meta.url))
    const indicators = ['jars', 'bags', 'taps', 'tingling', 'numbness', 'coldness', 'driving', 'cooking', 'handshake']
    const data = read(bytes, { fileName: 'first-visit.csv', indicators, group: 'clinic', missingCodes: [''] })
    expect(data.digest).toBe('sha256:781755801b843ccd46a333c4f17ffc11b40ad53776ed9b00ff671db57cf83a8f')
    expect(codes(data)).toEqual(['incomplete-rows'])
  })
})

describe('a first look', () => {
  it('says of each column what it holds', () => {
    const look = previewDelimited(file([...ROWS, 'NA,2,north']), 'a.csv', ['NA'])
    expect(look.rows).toBe(9)
    expect(look.columns).toEqual([
      { name: 'a', kind: 'numeric', missing: 1, distinct: 7, sample: ['1', '2', '4', '3', '6'] },
      { name: 'b', kind: 'numeric', missing: 0, distinct: 8, sample: ['2.5', '3', '1e0', '-0.5', '2'] },
      { name: 'site', kind: 'text', missing: 0, distinct: 2, sample: ['north', 'south', 'north', 'south', 'north'] }
    ])
  })

  it('points out decimal commas', () => {
    const look = previewDelimited('a\tb\n1,5\t2\n2,25\t3\n', 'a.tsv', [])
    expect(look.columns[0]?.kind).toBe('text')
    expect(look.cautions.map(({ code, cell }) => [code, cell])).toEqual([['decimal-comma', ['a']]])
  })
})
