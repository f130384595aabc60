/**
 * Finds, and if need be fetches, the Electron runtime without importing it (importing would download it on its own terms).
 */
import { spawn } from 'node:child_process'
import { existsSync, readFileSync } from 'node:fs'
import { join } from 'node:path'

export type RuntimeSearch = { found: true; executable: string } | { found: false; why: string }

/** Milliseconds the one attempt to fetch the runtime may take. */
const fetchLimit = 60_000

/** The runtime to start, fetched when it is not there; `found` false says in a few words why there is none. */
export async function findOrFetchRuntime(root: string, environment: NodeJS.ProcessEnv): Promise<RuntimeSearch> {
  if (!hasDisplay(environment)) return { found: false, why: 'there is no display' }
  const here = findRuntime(root, environment)
  if (here !== null) return { found: true, executable: here }
  await fetchRuntime(root, environment)
  const fetched = findRuntime(root, environment)
  return fetched === null
    ? { found: false, why: "Electron's runtime is not here and could not be fetched" }
    : { found: true, executable: fetched }
}

/** The executable of an Electron runtime on this machine, or null. */
export function findRuntime(root: string, environment: NodeJS.ProcessEnv): string | null {
  const override = environment['ELECTRON_OVERRIDE_DIST_PATH']
  const folder = override === undefined || override === '' ? join(root, 'node_modules', 'electron', 'dist') : override
  const executable = join(folder, executableName(root))
  return existsSync(executable) ? executable : null
}

/** The arguments that start the program in `folder` on `file`. As root the browser's outer sandbox cannot start; the page's own stays on. */
export function runtimeArguments(folder: string, file: string | null): string[] {
  const asRoot = process.platform === 'linux' && process.getuid?.() === 0
  return [...(asRoot ? ['--no-sandbox'] : []), folder, ...(file === null ? [] : [file])]
}

function hasDisplay(environment: NodeJS.ProcessEnv): boolean {
  return process.platform !== 'linux' || Boolean(environment['DISPLAY']) || Boolean(environment['WAYLAND_DISPLAY'])
}

function executableName(root: string): string {
  const named = join(root, 'node_modules', 'electron', 'path.txt')
  if (existsSync(named)) return readFileSync(named, 'utf8').trim()
  if (process.platform === 'darwin') return join('Electron.app', 'Contents', 'MacOS', 'Electron')
  return process.platform === 'win32' ? 'electron.exe' : 'electron'
}

/** One attempt, within the time limit; whether it worked shows in what is there afterwards. */
function fetchRuntime(root: string, environment: NodeJS.ProcessEnv): Promise<void> {
  const script = join(root, 'node_modules', 'electron', 'install.js')
  if (!existsSync(script)) return Promise.resolve()
  return new Promise((resolve) => {
    const child = spawn(process.execPath, [script], { stdio: 'ignore', env: environment, timeout: fetchLimit })
    child.once('error', () => resolve())
    child.once('exit', () => resolve())
  })
}
