/**
 * The desktop shell: Electron's main process. Opens one window on the built page and carries the contract's calls to it.
 *
 * The page is sandboxed and isolated, is served from a scheme of its own (no file access), and can go nowhere else. Everything
 * large (data, moments) stays on this side; only the contract's plain values cross.
 */
import { resolve } from 'node:path'
import { app, BrowserWindow, ipcMain, protocol, session } from 'electron'
import type { Workbench } from '../operations/index.ts'
import { InputError } from '../study/input-error.ts'
import { type ProgramFiles, programFiles } from './files.ts'
import { windowFile } from './window-files.ts'
import { openInWorkbench, startWorkbench } from './workbench.ts'

const scheme = 'rungwise'
const page = `${scheme}://window/`

protocol.registerSchemesAsPrivileged([{ scheme, privileges: { standard: true, secure: true, supportFetchAPI: true } }])
start().catch(fail)

async function start(): Promise<void> {
  await app.whenReady()
  const files = programFiles(app.getAppPath())
  const workbench = startWorkbench(files)
  const file = fileToOpen()
  if (file !== null) await openInWorkbench(workbench, file)
  closeWithApp(workbench)
  guardSession(files)
  carryCalls(workbench)
  openWindow(files, workbench)
  app.on('activate', () => {
    if (BrowserWindow.getAllWindows().length === 0) openWindow(files, workbench)
  })
  app.on('window-all-closed', () => app.quit())
}

/** The file named on the command line; the first plain word is the program's own folder while it is not packaged. */
function fileToOpen(): string | null {
  const words = process.argv.slice(1).filter((word) => !word.startsWith('-'))
  const file = app.isPackaged ? words[0] : words[1]
  return file === undefined ? null : resolve(file)
}

/** Serves the page's scheme and refuses every permission a page can ask for. */
function guardSession(files: ProgramFiles): void {
  protocol.handle(scheme, (request) => windowFile(files.window, new URL(request.url).pathname))
  session.defaultSession.setPermissionRequestHandler((_contents, _permission, answer) => answer(false))
}

/** `call` answers only the page itself; `name` and `input` are checked by the operation. */
function carryCalls(workbench: Workbench): void {
  ipcMain.handle('call', (event, name: unknown, input: unknown) => {
    if (event.senderFrame?.url.startsWith(page) !== true) throw new Error('Only the window may call.')
    return workbench.call(String(name), input)
  })
}

function openWindow(files: ProgramFiles, workbench: Workbench): void {
  const window = new BrowserWindow({
    width: 1600,
    height: 1000,
    minWidth: 480,
    minHeight: 400,
    show: false,
    title: 'Rungwise',
    webPreferences: { preload: files.preload, contextIsolation: true, sandbox: true, nodeIntegration: false, webviewTag: false }
  })
  window.removeMenu()
  window.webContents.setWindowOpenHandler(() => ({ action: 'deny' }))
  window.webContents.on('will-navigate', (event) => event.preventDefault())
  window.once('ready-to-show', () => window.show())
  const stop = workbench.onWork((event) => window.webContents.send('work', event))
  window.once('closed', stop)
  window.loadURL(page).catch(fail)
}

/** Lets running fits end and the project file close before the process goes. */
function closeWithApp(workbench: Workbench): void {
  let closed = false
  app.on('will-quit', (event) => {
    if (closed) return
    event.preventDefault()
    closed = true
    workbench
      .close()
      .catch(fail)
      .finally(() => app.quit())
  })
}

/** Bad input ends with its message and status 2, as on the command line; anything else is a bug and says so. */
function fail(error: unknown): void {
  if (error instanceof InputError) {
    process.stderr.write(`${error.message}\n`)
    app.exit(2)
  } else {
    process.stderr.write(`A fault in rungwise: ${error instanceof Error ? error.stack : String(error)}\n`)
    app.exit(1)
  }
}
