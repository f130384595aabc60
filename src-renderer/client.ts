/**
 * The window's way to the program: what the desktop shell's preload exposes, else the loopback host over HTTP.
 *
 * Both are the contract's Client; nothing else in the window knows which one it talks to.
 */
import type { Answer, Client, OperationName, Operations, WorkEvent } from '../src-main/operations/contract.ts'

declare global {
  interface Window {
    rungwise?: Client
  }
}

/** Chooses the client this page was given. */
export function connect(): Client {
  if (window.rungwise !== undefined) return window.rungwise
  return httpClient()
}

/**
 * POST /call/NAME carries a call, /work is the stream of server-sent progress events. The host turned the
 * link's token into a cookie before it served the page. A call rejects when the host is gone or answers with anything but an Answer.
 */
function httpClient(): Client {
  return {
    async call<N extends OperationName>(name: N, input: Operations[N]['input']): Promise<Answer<Operations[N]['result']>> {
      const response = await fetch(`/call/${name}`, {
        method: 'POST',
        headers: { 'content-type': 'application/json' },
        body: JSON.stringify(input)
      })
      if (!response.headers.get('content-type')?.includes('json')) {
        throw new Error(`${name}: ${response.status} ${await response.text()}`)
      }
      return (await response.json()) as Answer<Operations[N]['result']>
    },
    onWork(listener) {
      const source = new EventSource('/work')
      source.onmessage = (message) => listener(JSON.parse(message.data as string) as WorkEvent)
      return () => source.close()
    }
  }
}
