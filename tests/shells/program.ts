/** Starts the built program as a user would, for the tests of the shells. */
import { type ChildProcess, spawn } from 'node:child_process'
import { existsSync, mkdtempSync, rmSync } from 'node:fs'
import { tmpdir } from 'node:os'
import { delimiter, join } from 'node:path'
import { findRuntime } from '../../src-main/shells/electron-runtime.ts'
import type { Surroundings } from '../../src-main/shells/surroundings.ts'
import type { StudyResult } from '../../src-main/study/result.ts'

export const root = join(import.meta.dirname, '..', '..')
export const launcher = join(root, 'bin', 'rungwise.cjs')

const runtime = findRuntime(root, process.env)
const hasDisplay = process.platform !== 'linux' || Boolean(process.env['DISPLAY']) || Boolean(process.env['WAYLAND_DISPLAY'])

/** Electron's executable where a desktop window can be tested, else null, and then why. */
export const desktop = hasDisplay ? runtime : null
export const whyNoDesktop = runtime === null ? "Electron's runtime is not here" : 'there is no display'

export interface Ended {
  status: number | null
  stdout: string
  stderr: string
}

export interface StartOptions {
  node?: string
  folder?: string
  environment?: NodeJS.ProcessEnv
}

export function start(words: readonly string[], options: StartOptions = {}): ChildProcess {
  const environment = options.environment ?? process.env
  return spawn(options.node ?? process.execPath, [launcher, ...words], { cwd: options.folder ?? root, env: environment })
}

/** Runs a command to its end. */
export function rungwise(words: readonly string[], options: StartOptions = {}): Promise<Ended> {
  const child = start(words, options)
  const ended: Ended = { status: null, stdout: '', stderr: '' }
  child.stdout!.setEncoding('utf8').on('data', (text: string) => (ended.stdout += text))
  child.stderr!.setEncoding('utf8').on('data', (text: string) => (ended.stderr += text))
  return new Promise((done, fail) => {
    child.once('error', fail)
    child.once('close', (status) => done({ ...ended, status }))
  })
}

/** What the command line says of a plan, as JSON. */
export async function resultOf(plan: string): Promise<StudyResult> {
  const { status, stdout, stderr } = await rungwise(['compare', plan, '--json', '-'])
  if (status !== 0) throw new Error(`compare ended with ${status}: ${stderr}`)
  return JSON.parse(stdout)
}

/** The Node on PATH that does not come from node_modules: what a user types is started by it, old or new. */
export function machineNode(): string {
  const folders = (process.env['PATH'] ?? '').split(delimiter).filter((folder) => !folder.includes('node_modules'))
  return folders.map((folder) => join(folder, 'node')).find((file) => existsSync(file)) ?? process.execPath
}

/** Surroundings that collect what a command in this process prints. */
export function collecting(
  folder: string,
  signal: AbortSignal = new AbortController().signal
): Surroundings & { printed: { stdout: string; stderr: string } } {
  const printed = { stdout: '', stderr: '' }
  const into = (name: 'stdout' | 'stderr') => ({
    write(text: string) {
      printed[name] += text
    }
  })
  return { root, folder, environment: {}, stdout: into('stdout'), stderr: into('stderr'), signal, printed }
}

export function temporaryFolder(): { path: string; remove: () => void } {
  const path = mkdtempSync(join(tmpdir(), 'rungwise-test-'))
  return { path, remove: () => rmSync(path, { recursive: true, force: true }) }
}
