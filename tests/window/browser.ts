/** Finds a Chromium on this machine for the tests of the window; none is ever fetched. */
import { accessSync, constants } from 'node:fs'
import { delimiter, join } from 'node:path'
import { type Browser, chromium } from 'playwright-core'

const names = ['chromium', 'chromium-browser', 'google-chrome', 'google-chrome-stable', 'microsoft-edge', 'chrome']
const elsewhere = [
  '/Applications/Google Chrome.app/Contents/MacOS/Google Chrome',
  '/Applications/Chromium.app/Contents/MacOS/Chromium',
  'C:\\Program Files\\Google\\Chrome\\Application\\chrome.exe',
  'C:\\Program Files (x86)\\Microsoft\\Edge\\Application\\msedge.exe'
]

/** $CHROMIUM, then /usr/bin, the rest of PATH and the usual places of other systems; null where there is none. */
export function findBrowser(environment: NodeJS.ProcessEnv): string | null {
  const given = environment['CHROMIUM']
  if (given !== undefined && given !== '') return isRunnable(given) ? given : null
  const folders = ['/usr/bin', ...(environment['PATH'] ?? '').split(delimiter)].filter((folder) => folder !== '')
  const candidates = [...folders.flatMap((folder) => names.map((name) => join(folder, name))), ...elsewhere]
  return candidates.find(isRunnable) ?? null
}

/** A quiet browser: as root it cannot have its sandbox, and it asks nothing of the network. */
export function launchBrowser(executablePath: string): Promise<Browser> {
  const args = ['--no-sandbox', '--disable-gpu', '--disable-dev-shm-usage', '--disable-background-networking', '--disable-sync']
  return chromium.launch({ executablePath, args: [...args, '--disable-component-update', '--no-first-run'] })
}

function isRunnable(file: string): boolean {
  try {
    accessSync(file, constants.X_OK)
    return true
  } catch {
    return false
  }
}
