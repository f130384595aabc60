/** The real loopback host, started as `rungwise open` starts it where there is no display. */
import type { ChildProcess } from 'node:child_process'
import { once } from 'node:events'
import type { Answer, OperationName, Operations } from '../../src-main/operations/contract.ts'
import { start } from '../shells/program.ts'

export interface Host {
  link: string
  /** Asks the program behind the window directly. */
  ask<N extends OperationName>(name: N, input: Operations[N]['input']): Promise<Operations[N]['result']>
  stop(): Promise<void>
}

export async function startHost(words: readonly string[] = []): Promise<Host> {
  const { DISPLAY: _x, WAYLAND_DISPLAY: _wayland, ...environment } = process.env
  const child = start(['open', ...words], { environment })
  const link = await linkOf(child)
  return { link: link.href, ask: (name, input) => ask(link, name, input), stop: () => stop(child) }
}

async function linkOf(child: ChildProcess): Promise<URL> {
  let said = ''
  for await (const chunk of child.stdout!.setEncoding('utf8')) {
    said += chunk
    const found = /http:\S+token=\S+(?=\n)/.exec(said)
    if (found !== null) return new URL(found[0])
  }
  throw new Error(`The host ended without a link: ${said}`)
}

async function ask<N extends OperationName>(link: URL, name: N, input: Operations[N]['input']): Promise<Operations[N]['result']> {
  const headers = { 'content-type': 'application/json', 'x-rungwise-token': link.searchParams.get('token')! }
  const response = await fetch(new URL(`/call/${name}`, link), { method: 'POST', headers, body: JSON.stringify(input) })
  const answer = (await response.json()) as Answer<Operations[N]['result']>
  if (!answer.ok) throw new Error(`${name} was refused: ${answer.problem.what}`)
  return answer.value
}

async function stop(child: ChildProcess): Promise<void> {
  const ended = once(child, 'exit')
  child.kill('SIGINT')
  await ended
}
