import { mkdirSync, mkdtempSync, readdirSync, readFileSync, rmSync, writeFileSync } from 'node:fs'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { afterEach, beforeEach, describe, expect, test } from 'vitest'
import { InputError } from '../study/input-error.ts'
import { assertWritablePlace, readUserFile, writeWhole } from './files.ts'

let folder = ''
beforeEach(() => {
  folder = mkdtempSync(join(tmpdir(), 'rungwise-files-'))
})
afterEach(() => rmSync(folder, { recursive: true, force: true }))

describe('files of the user', () => {
  test('a result replaces an older one whole, and leaves no draft behind', async () => {
    const file = join(folder, 'result.json')
    writeFileSync(file, 'older and longer')
    await writeWhole(file, 'new')
    expect(readFileSync(file, 'utf8')).toBe('new')
    expect(readdirSync(folder)).toEqual(['result.json'])
  })

  test('a result that cannot take its place leaves no draft behind either', async () => {
    mkdirSync(join(folder, 'taken'))
    await expect(writeWhole(join(folder, 'taken'), 'new')).rejects.toThrow()
    expect(readdirSync(folder)).toEqual(['taken'])
  })

  test('a file that is not there, or is a folder, is bad input with its path', async () => {
    await expect(readUserFile(join(folder, 'none.yaml'))).rejects.toThrow(
      new InputError('There is no such file.', { where: join(folder, 'none.yaml') })
    )
    await expect(readUserFile(folder)).rejects.toThrow('This is a folder')
  })

  test('a place that cannot be written to is refused beforehand', async () => {
    writeFileSync(join(folder, 'file'), '')
    await expect(assertWritablePlace(join(folder, 'none', 'r.json'))).rejects.toThrow('does not exist')
    await expect(assertWritablePlace(join(folder, 'file', 'r.json'))).rejects.toThrow('This is a file')
    await expect(assertWritablePlace(folder)).rejects.toThrow('This is a folder')
    await expect(assertWritablePlace(join(folder, 'r.json'))).resolves.toBeUndefined()
  })
})
