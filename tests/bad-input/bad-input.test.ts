/**
 * Walks the table of broken input through reading the plan, loading its data and making its models.
 */
import { readFileSync } from 'node:fs'
import fc from 'fast-check'
import { describe, expect, it } from 'vitest'
import { readDelimited } from '../../src-main/importing/delimited.ts'
import { loadData } from '../../src-main/importing/load-data.ts'
import { checkFamily } from '../../src-main/operations/family.ts'
import { InputError } from '../../src-main/study/input-error.ts'
import { parsePlan } from '../../src-main/study/plan-file.ts'
import { type BadInput, badInputs, soundInputs } from './cases.ts'

function readStudy({ plan, files }: Pick<BadInput, 'plan' | 'files'>): void {
  const parsed = parsePlan(plan, 'plan.yaml')
  const data = loadData(parsed.data, (path) => {
    const text = files[path]
    if (text === undefined) throw Object.assign(new Error(`no ${path}`), { code: 'ENOENT' })
    return new TextEncoder().encode(text)
  })
  checkFamily(parsed, data)
}

function refusal(work: () => void): unknown {
  try {
    work()
    return null
  } catch (error) {
    return error
  }
}

describe('bad input is refused with its message:', () => {
  it.each(badInputs)('$name', (one) => {
    const error = refusal(() => readStudy(one))
    expect(error).toBeInstanceOf(InputError)
    expect((error as InputError).message).toContain(one.message)
    expect((error as InputError).where).not.toBeNull()
  })
})

describe('the table', () => {
  it('has at least sixty cases, none of them twice', () => {
    expect(badInputs.length).toBeGreaterThanOrEqual(60)
    expect(new Set(badInputs.map((one) => one.name)).size).toBe(badInputs.length)
    expect(new Set(badInputs.map((one) => JSON.stringify([one.plan, one.files]))).size).toBe(badInputs.length)
  })

  it.each(soundInputs)('breaks nothing but what it says: $name is read', (one) => {
    expect(refusal(() => readStudy(one))).toBeNull()
  })
})

describe('bytes that are no text in UTF-8 are refused:', () => {
  const options = { fileName: 'a.csv', indicators: ['a'], group: null, missingCodes: [] }
  it.each([
    { name: 'an older encoding', bytes: [0x61, 0x0a, 0x31, 0x0a, 0xe9, 0x0a], message: 'a.csv, line 3: The file is not in UTF-8.' },
    { name: 'UTF-16', bytes: [0xff, 0xfe, 0x61, 0x00, 0x0a, 0x00], message: 'a.csv: The file is in UTF-16, not in UTF-8.' },
    { name: 'a picture', bytes: [0x89, 0x50, 0x4e, 0x47, 0x00, 0x01], message: 'a.csv: This is not a text file.' }
  ])('$name', ({ bytes, message }) => {
    expect(refusal(() => readDelimited(Uint8Array.from(bytes), options))).toMatchObject({
      name: 'InputError',
      message: expect.stringContaining(message)
    })
  })
})

describe('whatever is done to a plan, it is read or refused with a message', () => {
  const text = readFileSync(new URL('../../fixtures/sample/plan.yaml', import.meta.url), 'utf8')
  const lines = text.split('\n')
  const place = fc.nat(lines.length - 1)

  it.each([
    {
      damage: 'two lines change places',
      damaged: fc.tuple(place, place).map(([i, j]) => lines.with(i, lines[j]!).with(j, lines[i]!).join('\n'))
    },
    { damage: 'a line is lost', damaged: place.map((i) => lines.toSpliced(i, 1).join('\n')) },
    { damage: 'a line stands twice', damaged: place.map((i) => lines.toSpliced(i, 0, lines[i]!).join('\n')) },
    {
      damage: 'a line moves in or out',
      damaged: fc.tuple(place, fc.nat(6)).map(([i, by]) => lines.with(i, ' '.repeat(by) + lines[i]!.trimStart()).join('\n'))
    },
    { damage: 'the end is lost', damaged: fc.nat(text.length).map((end) => text.slice(0, end)) },
    {
      damage: 'signs are put in',
      damaged: fc
        .tuple(fc.nat(text.length), fc.string({ maxLength: 3, unit: fc.constantFrom(...':-[]{},#&*!|>\'"%@\t\n 1a\u0000\uFEFF') }))
        .map(([at, signs]) => text.slice(0, at) + signs + text.slice(at))
    }
  ])('when $damage', ({ damaged }) => {
    fc.assert(
      fc.property(damaged, (plan) => {
        const error = refusal(() => parsePlan(plan, 'plan.yaml'))
        expect(error === null || error instanceof InputError).toBe(true)
      }),
      { numRuns: 150, seed: 11 }
    )
  })
})

it('any bytes at all are read as a table or refused with a message', () => {
  const options = { fileName: 'a.csv', indicators: ['a'], group: null, missingCodes: [''] }
  const scraps = fc
    .array(fc.constantFrom('a', ',', '\n', '"', '1', '2.5', ';', '\t', '\r', 'x', 'é', ' '), { maxLength: 30 })
    .map((parts) => `a${parts.join('')}`)
  fc.assert(
    fc.property(fc.oneof(fc.uint8Array({ maxLength: 40 }), scraps), (input) => {
      const error = refusal(() => readDelimited(input, options))
      expect(error === null || error instanceof InputError).toBe(true)
    }),
    { numRuns: 500, seed: 12 }
  )
})
