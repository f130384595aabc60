/**
 * `rungwise open`: the window in Electron where its runtime is there or can be had, else on a loopback address.
 */
import { spawn } from 'node:child_process'
import { resolve } from 'node:path'
import { findOrFetchRuntime, runtimeArguments } from './electron-runtime.ts'
import { assertFile, programFiles } from './files.ts'
import type { Surroundings } from './surroundings.ts'
import { startWebHost } from './web.ts'
import { openInWorkbench, startWorkbench } from './workbench.ts'

/** A runtime that ends with a fault this soon could not open a window at all (a system library is missing, say). */
const tooSoon = 5_000

/** Returns the exit status once the window is closed, or the loopback page is stopped with Ctrl-C. @throws InputError for a bad file */
export async function open(file: string | null, around: Surroundings): Promise<number> {
  const path = file === null ? null : resolve(around.folder, file)
  if (path !== null) await assertFile(path)
  const runtime = await findOrFetchRuntime(around.root, around.environment)
  if (!runtime.found) return await serve(path, around, runtime.why)
  const { status, lasted } = await runElectron(runtime.executable, runtimeArguments(around.root, path), around)
  if (status === 0 || status === 2 || around.signal.aborted) return status
  return lasted < tooSoon ? await serve(path, around, 'Electron could not open a window') : status
}

function runElectron(executable: string, words: string[], around: Surroundings): Promise<{ status: number; lasted: number }> {
  const started = performance.now()
  return new Promise((done) => {
    const child = spawn(executable, words, { cwd: around.folder, env: around.environment, stdio: 'inherit' })
    const end = (status: number) => done({ status, lasted: performance.now() - started })
    around.signal.addEventListener('abort', () => child.kill())
    child.once('error', () => end(1))
    child.once('exit', (code) => end(code ?? (around.signal.aborted ? 0 : 1)))
  })
}

/** The same window and the same operations, over HTTP on this machine only. */
async function serve(path: string | null, around: Surroundings, why: string): Promise<number> {
  const files = programFiles(around.root)
  const workbench = startWorkbench(files)
  try {
    if (path !== null) await openInWorkbench(workbench, path)
    const host = await startWebHost(workbench, files.window)
    around.stdout.write(`No desktop window: ${why}. The same window is served here, until Ctrl-C:\n${host.link}\n`)
    await aborted(around.signal)
    await host.close()
    return 0
  } finally {
    await workbench.close()
  }
}

function aborted(signal: AbortSignal): Promise<void> {
  return new Promise((done) => {
    if (signal.aborted) done()
    else signal.addEventListener('abort', () => done(), { once: true })
  })
}
