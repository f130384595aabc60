/**
 * What the Electron window sees of the program: `window.rungwise`, the contract's Client, and nothing else.
 *
 * Runs sandboxed, in a world of its own beside the page. Inputs and results are plain values (structured clone).
 */
import { contextBridge, ipcRenderer } from 'electron'
import type { Client, WorkEvent } from '../operations/contract.ts'

const client: Client = {
  call: (name, input) => ipcRenderer.invoke('call', name, input),
  onWork(listener) {
    const hear = (_event: unknown, work: WorkEvent) => listener(work)
    ipcRenderer.on('work', hear)
    return () => void ipcRenderer.removeListener('work', hear)
  }
}

contextBridge.exposeInMainWorld('rungwise', client)
