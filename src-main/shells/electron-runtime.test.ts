import { chmodSync, mkdirSync, mkdtempSync, rmSync, writeFileSync } from 'node:fs'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { afterEach, beforeEach, describe, expect, test } from 'vitest'
import { findOrFetchRuntime, findRuntime } from './electron-runtime.ts'

let root = ''
beforeEach(() => {
  root = mkdtempSync(join(tmpdir(), 'rungwise-runtime-'))
  mkdirSync(join(root, 'node_modules', 'electron', 'dist'), { recursive: true })
})
afterEach(() => rmSync(root, { recursive: true, force: true }))

function putRuntime(folder: string): string {
  writeFileSync(join(root, 'node_modules', 'electron', 'path.txt'), 'electron')
  mkdirSync(folder, { recursive: true })
  const file = join(folder, 'electron')
  writeFileSync(file, '')
  chmodSync(file, 0o755)
  return file
}

describe("Electron's runtime", () => {
  test('is found where its package unpacks it', () => {
    const file = putRuntime(join(root, 'node_modules', 'electron', 'dist'))
    expect(findRuntime(root, {})).toBe(file)
  })

  test('is taken from ELECTRON_OVERRIDE_DIST_PATH before that', () => {
    putRuntime(join(root, 'node_modules', 'electron', 'dist'))
    const other = putRuntime(join(root, 'other'))
    expect(findRuntime(root, { ELECTRON_OVERRIDE_DIST_PATH: join(root, 'other') })).toBe(other)
  })

  test('is not there while nothing is unpacked', () => {
    expect(findRuntime(root, {})).toBeNull()
  })

  test('is fetched once when it is missing and a window could be shown', async () => {
    const file = join(root, 'node_modules', 'electron', 'dist', 'electron')
    const script = `require('node:fs').writeFileSync(${JSON.stringify(join(root, 'node_modules/electron/path.txt'))}, 'electron');require('node:fs').writeFileSync(${JSON.stringify(file)}, '')`
    writeFileSync(join(root, 'node_modules', 'electron', 'install.js'), script)
    expect(await findOrFetchRuntime(root, { DISPLAY: ':0' })).toEqual({ found: true, executable: file })
  })

  test('says why it is missing when the fetch fails', async () => {
    writeFileSync(join(root, 'node_modules', 'electron', 'install.js'), 'process.exit(1)')
    expect(await findOrFetchRuntime(root, { DISPLAY: ':0' })).toEqual({
      found: false,
      why: "Electron's runtime is not here and could not be fetched"
    })
  })

  if (process.platform === 'linux')
    test('is not even looked for without a display', async () => {
      putRuntime(join(root, 'node_modules', 'electron', 'dist'))
      expect(await findOrFetchRuntime(root, {})).toEqual({ found: false, why: 'there is no display' })
    })
})
