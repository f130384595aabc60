/**
 * One study, three shells: the command line, the loopback page and (where a runtime is there) the Electron window give the
 * same result, and the window shows it.
 */
import { type ChildProcess, spawn } from 'node:child_process'
import { once } from 'node:events'
import { join } from 'node:path'
import { _electron, type ElectronApplication } from 'playwright-core'
import { afterAll, beforeAll, describe, expect, test } from 'vitest'
import type { Answer, Client, OperationName, Operations, WorkEvent } from '../../src-main/operations/contract.ts'
import { statistic } from '../../src-main/reporting/numbers.ts'
import { runtimeArguments } from '../../src-main/shells/electron-runtime.ts'
import type { StudyResult } from '../../src-main/study/result.ts'
import { desktop, launcher, machineNode, resultOf, root, temporaryFolder, whyNoDesktop } from './program.ts'

/** What the tests touch inside the page. */
interface Page {
  rungwise: Client
  open(url: string): unknown
  fetch(url: string): Promise<unknown>
  location: { assign(url: string): void }
  document: { addEventListener(name: string, listener: (event: { effectiveDirective: string }) => void): void }
}

const samplePlan = join(root, 'fixtures', 'sample', 'plan.yaml')
let fromCommandLine: StudyResult
beforeAll(async () => {
  fromCommandLine = await resultOf(samplePlan)
})

function accepted<T>(answer: Answer<T>): T {
  if (!answer.ok) throw new Error(`refused: ${answer.problem.what}`)
  return answer.value
}

describe('the loopback page, as `rungwise open` serves it where there is no display', () => {
  let child: ChildProcess
  let link: URL
  let said = ''

  beforeAll(async () => {
    const { DISPLAY: _x, WAYLAND_DISPLAY: _wayland, ...environment } = process.env
    child = spawn(machineNode(), [launcher, 'open'], { cwd: root, env: environment })
    for await (const chunk of child.stdout!.setEncoding('utf8')) {
      said += chunk
      if (/token=\S+\n/.test(said)) break
    }
    link = new URL(said.trim().split('\n').at(-1)!)
  })
  afterAll(() => child.kill('SIGKILL'))

  async function call<N extends OperationName>(name: N, input: Operations[N]['input']): Promise<Operations[N]['result']> {
    const headers = { 'content-type': 'application/json', 'x-rungwise-token': link.searchParams.get('token')! }
    const answer = await fetch(new URL(`/call/${name}`, link), { method: 'POST', headers, body: JSON.stringify(input) })
    return accepted((await answer.json()) as Answer<Operations[N]['result']>)
  }

  test('says in one line why, and prints the link', () => {
    expect(said).toMatch(
      /^No desktop window: there is no display\. The same window is served here, until Ctrl-C:\nhttp:\/\/127\.0\.0\.1:\d+\/\?token=\S+\n$/
    )
  })

  test('serves the built page', async () => {
    const headers = { 'x-rungwise-token': link.searchParams.get('token')! }
    const page = await (await fetch(new URL('/', link), { headers })).text()
    const script = /<script[^>]*src="([^"]+)"/.exec(page)?.[1]
    expect((await fetch(new URL(script!, link), { headers })).headers.get('content-type')).toContain('javascript')
  })

  test('fits the sample study to the same numbers, and tells how far it is', async () => {
    const leave = new AbortController()
    const headers = { 'x-rungwise-token': link.searchParams.get('token')! }
    const stream = await fetch(new URL('/work', link), { headers, signal: leave.signal })
    const finished = eventsUntilFinished(stream)
    await call('openSample', null)
    const view = await call('fitCandidates', { names: null })
    expect(view.result).toEqual(fromCommandLine)
    const events = await finished
    expect(events[0]).toMatchObject({ kind: 'started' })
    expect(events.filter((event) => event.kind === 'fitted')).toHaveLength(fromCommandLine.candidates.length)
    leave.abort()
  })

  test('ends with status 0 on an interrupt', async () => {
    child.kill('SIGINT')
    const [status] = await once(child, 'exit')
    expect(status).toBe(0)
  })
})

async function eventsUntilFinished(stream: Response): Promise<WorkEvent[]> {
  let text = ''
  for await (const chunk of stream.body!.pipeThrough(new TextDecoderStream())) {
    text += chunk
    if (text.includes('"finished"')) break
  }
  return [...text.matchAll(/^data: (.*)$/gm)].map((match) => JSON.parse(match[1]!) as WorkEvent)
}

/**
 * Where two results differ, as paths. The desktop's JavaScript engine need not be Node's, and engines round the last bit of an
 * exponential or logarithm each in its own way; beyond that (1e-13 relative) nothing may differ.
 */
function differences(a: unknown, b: unknown, path = 'result'): string[] {
  if (typeof a === 'number' && typeof b === 'number') {
    return Math.abs(a - b) <= 1e-13 * Math.max(Math.abs(a), Math.abs(b)) ? [] : [`${path}: ${a} and ${b}`]
  }
  if (a === null || b === null || typeof a !== 'object' || typeof b !== 'object') return a === b ? [] : [`${path}: ${a} and ${b}`]
  const [left, right] = [a as Record<string, unknown>, b as Record<string, unknown>]
  const keys = new Set([...Object.keys(left), ...Object.keys(right)])
  return [...keys].flatMap((key) => differences(left[key], right[key], `${path}.${key}`))
}

if (desktop === null) {
  process.stderr.write(`The tests of the desktop window did not run: ${whyNoDesktop}.\n`)
} else {
  const executablePath = desktop
  describe('the desktop window', () => {
    let app: ElectronApplication
    const profile = temporaryFolder()
    beforeAll(async () => {
      const args = ['--disable-gpu', ...runtimeArguments('.', null)]
      const env = { ...process.env, XDG_CONFIG_HOME: profile.path } as Record<string, string>
      app = await _electron.launch({ executablePath, args, cwd: root, env, timeout: 60_000 })
    })
    afterAll(async () => {
      await app.close()
      profile.remove()
    })

    test('opens on the sample study, fits it and shows its ladder, top rung first', async () => {
      const window = await app.firstWindow()
      const rungs = window.getByTestId('rung')
      await window.getByTestId('stand-here').waitFor()
      const shown = (await rungs.evaluateAll((all) => all.map((rung) => rung.getAttribute('data-name')))).reverse()
      const ladder = fromCommandLine.ladders.find(({ rungs: names }) => names.join() === shown.join())
      if (ladder === undefined) throw new Error(`No ladder of the study has the rungs ${shown.join(', ')}.`)
      for (const name of ladder.rungs) {
        const { T } = fromCommandLine.candidates.find((candidate) => candidate.name === name)!
        await window.locator('[data-testid=rung]', { hasText: name }).getByText(statistic(T)).first().waitFor()
      }
      const marked = window.locator('li', { has: window.getByTestId('stand-here') }).getByTestId('rung')
      expect(await marked.getAttribute('data-name')).toBe(ladder.standHere)
    })

    test('has the numbers of the command line', async () => {
      const window = await app.firstWindow()
      const ask = () => window.evaluate(() => (globalThis as unknown as Page).rungwise.call('currentStudy', null))
      await expect.poll(async () => accepted(await ask())?.result.candidates.length).toBe(fromCommandLine.candidates.length)
      expect(differences(accepted(await ask())?.result, fromCommandLine)).toEqual([])
    })

    test('is sandboxed and isolated, and has no Node and nothing of Electron', async () => {
      const window = await app.firstWindow()
      const seen = await window.evaluate(() => ({
        node: 'process' in globalThis || 'require' in globalThis,
        own: Object.keys((globalThis as unknown as Page).rungwise).sort()
      }))
      expect(seen).toEqual({ node: false, own: ['call', 'onWork'] })
      const preferences = await app.evaluate(({ BrowserWindow }) => {
        const contents = BrowserWindow.getAllWindows()[0]!.webContents as unknown as {
          getLastWebPreferences(): Record<string, unknown>
        }
        return contents.getLastWebPreferences()
      })
      expect(preferences).toMatchObject({ sandbox: true, contextIsolation: true, nodeIntegration: false })
    })

    test('cannot be led elsewhere: no other page, no second window, no request that is not its own', async () => {
      const window = await app.firstWindow()
      const opened = await window.evaluate(() => (globalThis as unknown as Page).open('https://example.test/'))
      expect(opened).toBeNull()
      const violated = await window.evaluate(() => {
        const { document, fetch, location } = globalThis as unknown as Page
        const violation = new Promise<string>((done) => {
          document.addEventListener('securitypolicyviolation', (event) => done(event.effectiveDirective))
        })
        fetch('https://example.test/').catch(() => undefined)
        location.assign('https://example.test/')
        return violation
      })
      expect(violated).toBe('connect-src')
      await window.waitForTimeout(300)
      expect(window.url()).toBe('rungwise://window/')
      expect(app.windows()).toHaveLength(1)
    })
  })
}
