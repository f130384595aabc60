/** The command line as a user meets it: the launcher on the built program, and (where a test has to hold the reins) in this process. */
import { existsSync, readdirSync, readFileSync, writeFileSync } from 'node:fs'
import { join } from 'node:path'
import { afterEach, beforeEach, describe, expect, test } from 'vitest'
import { main } from '../../src-main/shells/cli.ts'
import { inlineCrew } from '../../src-main/workers/inline-crew.ts'
import type { Crew } from '../../src-main/workers/jobs.ts'
import { collecting, machineNode, root, rungwise, temporaryFolder } from './program.ts'

const congeneric = join(root, 'fixtures', 'congeneric', 'plan.yaml')
const { version } = JSON.parse(readFileSync(join(root, 'package.json'), 'utf8')) as { version: string }

let folder = temporaryFolder()
beforeEach(() => {
  folder = temporaryFolder()
})
afterEach(() => folder.remove())

describe('npx rungwise', () => {
  test('starts under whatever Node the machine has', async () => {
    expect(await rungwise(['--version'], { node: machineNode() })).toEqual({ status: 0, stdout: `${version}\n`, stderr: '' })
  })

  test('says how it is used', async () => {
    const { status, stdout } = await rungwise(['--help'])
    expect(status).toBe(0)
    for (const words of ['compare PLAN.yaml [--project FILE] [--json FILE]', 'open [FILE]', 'Exit status'])
      expect(stdout).toContain(words)
    expect(Math.max(...stdout.split('\n').map((line) => line.length))).toBeLessThanOrEqual(80)
  })

  test('refuses an unknown option with the nearest one and status 2', async () => {
    const { status, stdout, stderr } = await rungwise(['compare', congeneric, '--jsn', '-'], { node: machineNode() })
    expect({ status, stdout }).toEqual({ status: 2, stdout: '' })
    expect(stderr).toBe(
      'There is no option "--jsn". Did you mean "--json"? The options are "--project", "--json", "--resamples", "--seed", "--inspect", "--help" and "--version".\n'
    )
  })

  test('refuses a file that is not there, naming it, from open as well', async () => {
    for (const command of ['compare', 'open']) {
      const { status, stderr } = await rungwise([command, 'nowhere.yaml'], { folder: folder.path })
      expect({ command, status }).toEqual({ command, status: 2 })
      expect(stderr).toBe(`${join(folder.path, 'nowhere.yaml')}: There is no such file.\n`)
    }
  })
})

describe('compare', () => {
  test('prints the ladder of the four hypotheses on two test forms in 80 columns, without colour or a progress line', async () => {
    const { status, stdout, stderr } = await rungwise(['compare', congeneric])
    expect({ status, stderr }).toEqual({ status: 0, stderr: '' })
    expect(Math.max(...stdout.split('\n').map((line) => line.length))).toBeLessThanOrEqual(80)
    expect(stdout).not.toContain('\u001b')
    expect(stdout).not.toContain('\r')
    // Lord's vocabulary tests, N = 649: Joreskog (1971), table of the four hypotheses.
    for (const [T, df] of [
      ['37.33', 6],
      ['1.93', 5],
      ['36.21', 2],
      ['0.70', 1]
    ])
      expect(stdout).toContain(`T ${T} on ${df} df`)
  })

  test('with --json - prints JSON and nothing else', async () => {
    const { status, stdout, stderr } = await rungwise(['compare', congeneric, '--json', '-'])
    expect({ status, stderr }).toEqual({ status: 0, stderr: '' })
    const result = JSON.parse(stdout)
    expect(result.program).toEqual({ name: 'rungwise', version })
    expect(result.candidates.length).toBeGreaterThanOrEqual(4)
  })

  test('with --json FILE writes the same JSON and prints the ladder', async () => {
    const { stdout } = await rungwise(['compare', congeneric, '--json', 'r.json'], { folder: folder.path })
    expect(stdout).toContain('on 6 df')
    expect(readdirSync(folder.path)).toEqual(['r.json'])
    const direct = await rungwise(['compare', congeneric, '--json', '-'])
    expect(readFileSync(join(folder.path, 'r.json'), 'utf8')).toBe(direct.stdout)
  })

  test('with --project keeps what it found, and a second run finds the same', async () => {
    const words = ['compare', congeneric, '--project', 's.rungwise', '--json', '-']
    const first = await rungwise(words, { folder: folder.path })
    expect(first).toMatchObject({ status: 0, stderr: '' })
    expect(existsSync(join(folder.path, 's.rungwise'))).toBe(true)
    const second = await rungwise(words, { folder: folder.path })
    expect(second).toEqual(first)
  })

  test('on a worker pool and on one thread gives the same JSON', async () => {
    const around = collecting(root)
    expect(await main(['compare', congeneric, '--json', '-'], around, () => inlineCrew)).toBe(0)
    expect(around.printed.stdout).toBe((await rungwise(['compare', congeneric, '--json', '-'])).stdout)
  })

  test('shows progress on a terminal, on standard error alone, and takes it away', async () => {
    const around = collecting(root)
    around.stderr.isTTY = true
    expect(await main(['compare', congeneric], around, () => inlineCrew)).toBe(0)
    expect(around.printed.stderr).toMatch(/\rfitting 0 of \d+/)
    expect(around.printed.stderr).toMatch(/\r +\r$/)
    expect(around.printed.stdout).not.toContain('fitting')
  })

  test('stops when interrupted, with status 130 and nothing printed or written', async () => {
    const stop = new AbortController()
    const around = collecting(folder.path, stop.signal)
    const waiting = main(['compare', congeneric, '--json', 'r.json'], around, () => endlessCrew(() => stop.abort()))
    expect(await waiting).toBe(130)
    expect(around.printed).toEqual({ stdout: '', stderr: 'Stopped.\n' })
    expect(readdirSync(folder.path)).toEqual([])
  })

  test('says that a bug is a bug, with status 1', async () => {
    const around = collecting(folder.path)
    const crew: Crew = { ...inlineCrew, fit: () => Promise.reject(new TypeError('boom')) }
    expect(await main(['compare', congeneric, '--json', 'r.json'], around, () => crew)).toBe(1)
    expect(around.printed.stdout).toBe('')
    expect(around.printed.stderr).toContain('A fault in rungwise, please report it:\nTypeError: boom')
    expect(readdirSync(folder.path)).toEqual([])
  })

  test.each([
    { name: 'a folder that is not there', words: ['--json', 'none/r.json'] },
    { name: 'a folder in place of the file', words: ['--json', '.'] },
    { name: 'the plan itself', words: ['--json', congeneric] },
    { name: 'the plan itself as a project', words: ['--project', congeneric] },
    { name: 'one file for both', words: ['--json', 'same', '--project', 'same'] }
  ])('refuses to write to $name before anything is fitted', async ({ words }) => {
    const around = collecting(folder.path)
    const crew: Crew = { ...inlineCrew, fit: () => Promise.reject(new Error('must not be asked')) }
    expect(await main(['compare', congeneric, ...words], around, () => crew)).toBe(2)
    expect(around.printed.stderr.trim().split('\n')).toHaveLength(1)
    expect(readdirSync(folder.path)).toEqual([])
  })

  test('leaves a file that is not a project as it was', async () => {
    const file = join(folder.path, 'notes.rungwise')
    writeFileSync(file, 'dear diary')
    const around = collecting(folder.path)
    expect(await main(['compare', congeneric, '--project', 'notes.rungwise'], around, () => inlineCrew)).toBe(2)
    expect(readFileSync(file, 'utf8')).toBe('dear diary')
    expect(readdirSync(folder.path)).toEqual(['notes.rungwise'])
  })
})

/** Fits that never end; `onFirst` is called when the first is asked for. They reject as the pool's do when the signal aborts. */
function endlessCrew(onFirst: () => void): Crew {
  const wait = (signal: AbortSignal | undefined) =>
    new Promise<never>((_done, fail) => {
      signal?.addEventListener('abort', () => fail(signal.reason))
      setImmediate(onFirst)
    })
  return {
    fit: (_job, signal) => wait(signal),
    relation: (_job, signal) => wait(signal),
    restrictedScaling: (_job, signal) => wait(signal),
    resample: (_job, signal) => wait(signal),
    notNested: (_job, signal) => wait(signal),
    familyOrder: (_job, signal) => wait(signal),
    scoreTests: (_job, signal) => wait(signal),
    close: async () => {}
  }
}
