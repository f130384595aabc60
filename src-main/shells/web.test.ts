import { mkdtempSync, rmSync, writeFileSync } from 'node:fs'
import { request } from 'node:http'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { afterAll, beforeAll, describe, expect, test, vi } from 'vitest'
import type { WorkEvent } from '../operations/contract.ts'
import type { Workbench } from '../operations/index.ts'
import { startWebHost, type WebHost } from './web.ts'

const listeners = new Set<(event: WorkEvent) => void>()
const calls: unknown[] = []
/** Answers with what it was asked; `fault` behaves like a bug. */
const workbench = {
  async call(name: string, input: unknown) {
    calls.push([name, input])
    if (name === 'fault') throw new Error('a bug')
    return { ok: true, value: { name, input } }
  },
  onWork(listener: (event: WorkEvent) => void) {
    listeners.add(listener)
    return () => void listeners.delete(listener)
  },
  async close() {}
} as unknown as Workbench

let folder = ''
let host: WebHost
beforeAll(async () => {
  folder = mkdtempSync(join(tmpdir(), 'rungwise-window-'))
  writeFileSync(join(folder, 'index.html'), '<!doctype html><title>Rungwise</title>')
  writeFileSync(`${folder}-secret.txt`, 'not for the page')
  host = await startWebHost(workbench, folder)
})
afterAll(async () => {
  await host.close()
  rmSync(folder, { recursive: true, force: true })
  rmSync(`${folder}-secret.txt`)
})

function call(name: string, init: RequestInit = {}): Promise<Response> {
  const headers = { 'content-type': 'application/json', 'x-rungwise-token': host.token, ...init.headers }
  return fetch(`${host.origin}/call/${name}`, { method: 'POST', body: 'null', ...init, headers })
}

/** A request with headers that fetch does not let one set; answers its status. */
function rawStatus(headers: Record<string, string>, path = '/'): Promise<number> {
  return new Promise((done, fail) => {
    request(`${host.origin}${path}`, { headers }, (response) => {
      response.resume()
      done(response.statusCode ?? 0)
    })
      .on('error', fail)
      .end()
  })
}

describe('the loopback host', () => {
  test('listens on 127.0.0.1 and nowhere else', () => {
    expect(host.link).toMatch(/^http:\/\/127\.0\.0\.1:\d+\/\?token=[\w-]{32}$/)
  })

  test('gives the page to the printed link, by way of a cookie that scripts cannot read', async () => {
    const first = await fetch(host.link, { redirect: 'manual' })
    expect(first.status).toBe(302)
    expect(first.headers.get('location')).toBe('/')
    const cookie = first.headers.get('set-cookie') ?? ''
    expect(cookie).toMatch(/HttpOnly/i)
    expect(cookie).toMatch(/SameSite=Strict/i)
    const page = await fetch(host.origin, { headers: { cookie: cookie.split(';')[0]! } })
    expect(await page.text()).toContain('<title>Rungwise</title>')
    expect(page.headers.get('content-security-policy')).toContain("default-src 'none'")
  })

  test.each(['/', '/index.html', '/work', '/?token=wrong'])('answers %s with 401 to whoever has no token', async (path) => {
    expect((await fetch(`${host.origin}${path}`)).status).toBe(401)
  })

  test('refuses a call without the token before the operation sees it', async () => {
    const before = calls.length
    expect((await call('currentStudy', { headers: { 'x-rungwise-token': 'wrong' } })).status).toBe(401)
    expect(calls).toHaveLength(before)
  })

  test('refuses another host name, as after a rebound address, even with the token', async () => {
    expect(await rawStatus({ host: 'example.test', 'x-rungwise-token': host.token })).toBe(403)
    expect(await rawStatus({ host: new URL(host.origin).host, 'x-rungwise-token': host.token })).toBe(200)
  })

  test('refuses a page of another origin, even with the token', async () => {
    expect(await rawStatus({ origin: 'http://example.test', 'x-rungwise-token': host.token })).toBe(403)
    expect(await rawStatus({ origin: host.origin, 'x-rungwise-token': host.token })).toBe(200)
  })

  test('carries a call and its answer', async () => {
    const answer = await call('openPlan', { body: JSON.stringify({ path: '/a.yaml' }) })
    expect(await answer.json()).toEqual({ ok: true, value: { name: 'openPlan', input: { path: '/a.yaml' } } })
  })

  test('answers a bug with 500 and no answer that could be taken for a result', async () => {
    const told = vi.spyOn(process.stderr, 'write').mockReturnValue(true)
    const answer = await call('fault')
    expect(told.mock.calls.join()).toContain('A fault in rungwise: Error: a bug')
    told.mockRestore()
    expect(answer.status).toBe(500)
    expect(answer.headers.get('content-type')).not.toContain('json')
  })

  test('refuses what is not JSON, which a form of another page could send', async () => {
    expect((await call('openSample', { headers: { 'content-type': 'text/plain' } })).status).toBe(415)
    expect((await call('openSample', { body: '{' })).status).toBe(400)
  })

  test.each(['/..%2f..%2fetc/passwd', '/%2e%2e/package.json', '/%00', '/%', '/missing.js'])(
    'serves nothing outside the window: %s',
    async (path) => {
      const status = await rawStatus({ 'x-rungwise-token': host.token }, path)
      expect(status).toBe(404)
    }
  )

  test('does not serve a neighbour folder whose name begins alike', async () => {
    const name = folder.split('/').at(-1)!
    expect(await rawStatus({ 'x-rungwise-token': host.token }, `/..%2f${name}-secret.txt`)).toBe(404)
  })

  test('sends progress as events until the page goes away, then forgets it', async () => {
    const leave = new AbortController()
    const answer = await fetch(`${host.origin}/work`, { headers: { 'x-rungwise-token': host.token }, signal: leave.signal })
    const reader = answer.body!.pipeThrough(new TextDecoderStream()).getReader()
    expect((await reader.read()).value).toContain(': listening')
    const event: WorkEvent = { kind: 'started', total: 3 }
    for (const listener of listeners) listener(event)
    expect((await reader.read()).value).toBe(`data: ${JSON.stringify(event)}\n\n`)
    leave.abort()
    await expect.poll(() => listeners.size).toBe(0)
  })
})
