/**
 * Builds the program before the tests that start it, unless what is in out/ is newer than every source.
 *
 * Several test runs may start at once: a folder that only one of them can make keeps them from building over each other.
 */
import { spawnSync } from 'node:child_process'
import { existsSync, globSync, mkdirSync, rmSync, statSync } from 'node:fs'
import { join } from 'node:path'
import { setTimeout as wait } from 'node:timers/promises'

const root = join(import.meta.dirname, '..', '..')
const lock = join(root, 'out', '.building')
const outputs = ['out/main/cli.cjs', 'out/main/electron.cjs', 'out/preload/preload.cjs', 'out/renderer/index.html']
const sources = ['src-main/**/*.ts', 'src-renderer/**/*.*', 'electron.config.ts', 'package.json']

/** A lock older than this was left by a run that was killed; a build takes a few seconds. */
const staleAfter = 90_000

export default async function setup(): Promise<void> {
  mkdirSync(join(root, 'out'), { recursive: true })
  await takeLock()
  try {
    if (!isFresh()) build()
  } finally {
    rmSync(lock, { recursive: true, force: true })
  }
}

async function takeLock(): Promise<void> {
  for (;;) {
    try {
      mkdirSync(lock)
      return
    } catch {
      const made = statSync(lock, { throwIfNoEntry: false })?.mtimeMs ?? 0
      if (Date.now() - made > staleAfter) rmSync(lock, { recursive: true, force: true })
      await wait(200)
    }
  }
}

function isFresh(): boolean {
  const built = outputs.map((file) => join(root, file))
  if (!built.every((file) => existsSync(file))) return false
  const newestSource = Math.max(
    ...globSync(sources, { cwd: root, exclude: ['**/*.test.ts'] }).map((file) => statSync(join(root, file)).mtimeMs)
  )
  return Math.min(...built.map((file) => statSync(file).mtimeMs)) > newestSource
}

function build(): void {
  const script = join(root, 'node_modules', 'electron-vite', 'bin', 'electron-vite.js')
  const words = [script, 'build', '--config', 'electron.config.ts', '--logLevel', 'warn']
  const { status, stdout, stderr } = spawnSync(process.execPath, words, { cwd: root, encoding: 'utf8' })
  if (status !== 0) throw new Error(`The program could not be built:\n${stdout}${stderr}`)
}
