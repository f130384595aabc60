/**
 * The window on a loopback address, for machines without an Electron runtime or a display.
 *
 * Runs under Node and owns one HTTP server on 127.0.0.1 with a port of the system's choice. Three things are served:
 *   GET  /            the built window and its files
 *   POST /call/NAME   one call of the contract: input as JSON, answer as JSON
 *   GET  /work        progress, as server-sent events, each one WorkEvent as JSON
 * Every start makes a new token. The printed link carries it once, a cookie carries it afterwards (or the header x-rungwise-token);
 * without it, or under another host name or origin, every request is refused.
 */
import { randomBytes, timingSafeEqual } from 'node:crypto'
import { createServer, type Server } from 'node:http'
import type { AddressInfo } from 'node:net'
import { getRequestListener } from '@hono/node-server'
import { type Context, Hono } from 'hono'
import { bodyLimit } from 'hono/body-limit'
import { getCookie, setCookie } from 'hono/cookie'
import { streamSSE } from 'hono/streaming'
import type { Workbench } from '../operations/index.ts'
import { securityHeaders, windowFile } from './window-files.ts'

export interface WebHost {
  /** The address with the token in it: the way in for the user. */
  link: string
  /** The address alone, as in "http://127.0.0.1:40123". */
  origin: string
  token: string
  close(): Promise<void>
}

/** Seconds between the signs of life that keep an idle progress stream open. */
const heartbeat = 20
const largestInput = 16 * 1024 * 1024

/** Serves `workbench` and the window's files in `folder` until closed; the workbench stays the caller's to close. */
export async function startWebHost(workbench: Workbench, folder: string): Promise<WebHost> {
  const token = randomBytes(24).toString('base64url')
  const server = createServer()
  await listen(server)
  const { port } = server.address() as AddressInfo
  const origin = `http://127.0.0.1:${port}`
  const app = createApp({ workbench, folder, token, port })
  server.on('request', getRequestListener(app.fetch))
  return { link: `${origin}/?token=${token}`, origin, token, close: () => closeServer(server) }
}

interface AppParts {
  workbench: Workbench
  folder: string
  token: string
  port: number
}

function createApp({ workbench, folder, token, port }: AppParts): Hono {
  const app = new Hono()
  const cookie = `rungwise-${port}`
  app.use(async (context, next) => {
    const refusal = refuse(context, port)
    if (refusal !== null) return context.text(refusal, 403, securityHeaders)
    const given = context.req.query('token')
    if (context.req.path === '/' && given !== undefined && sameToken(given, token)) {
      setCookie(context, cookie, token, { httpOnly: true, sameSite: 'Strict', path: '/' })
      return context.redirect('/')
    }
    if (!sameToken(context.req.header('x-rungwise-token') ?? getCookie(context, cookie) ?? '', token)) {
      return context.text('This address needs the link that rungwise printed when it started.', 401, securityHeaders)
    }
    return next()
  })
  app.post('/call/:name', bodyLimit({ maxSize: largestInput }), (context) =>
    answerCall(context, workbench, context.req.param('name'))
  )
  app.get('/work', (context) => streamWork(context, workbench))
  app.get('*', (context) => windowFile(folder, context.req.path))
  app.onError((error, context) => {
    process.stderr.write(`A fault in rungwise: ${error.stack ?? error.message}\n`)
    return context.text(error.message, 500, securityHeaders)
  })
  return app
}

/** Why a request is refused before its token is even looked at, or null: another host name (rebinding) or a page of another origin. */
function refuse(context: Context, port: number): string | null {
  const hosts = [`127.0.0.1:${port}`, `localhost:${port}`]
  if (!hosts.includes(context.req.header('host') ?? '')) return 'Unknown host name.'
  const origin = context.req.header('origin')
  if (origin !== undefined && !hosts.some((host) => origin === `http://${host}`))
    return 'Pages of other origins may not call rungwise.'
  return null
}

async function answerCall(context: Context, workbench: Workbench, name: string): Promise<Response> {
  if (!/^application\/json\b/.test(context.req.header('content-type') ?? '')) {
    return context.text('A call sends its input as application/json.', 415, securityHeaders)
  }
  let input: unknown
  try {
    input = await context.req.json()
  } catch {
    return context.text('The input is not JSON.', 400, securityHeaders)
  }
  return context.json(await workbench.call(name, input), 200, { ...securityHeaders, 'cache-control': 'no-store' })
}

/** Sends every WorkEvent until the page goes away. */
function streamWork(context: Context, workbench: Workbench): Response {
  return streamSSE(context, async (stream) => {
    const stop = workbench.onWork((event) => void stream.writeSSE({ data: JSON.stringify(event) }))
    const alive = setInterval(() => void stream.write(': still here\n\n'), heartbeat * 1000)
    await stream.write(': listening\n\n')
    await new Promise<void>((gone) => stream.onAbort(gone))
    clearInterval(alive)
    stop()
  })
}

function sameToken(given: string, token: string): boolean {
  const [a, b] = [Buffer.from(given), Buffer.from(token)]
  return a.length === b.length && timingSafeEqual(a, b)
}

function listen(server: Server): Promise<void> {
  return new Promise((resolve, reject) => {
    server.once('error', reject)
    server.listen(0, '127.0.0.1', () => resolve())
  })
}

function closeServer(server: Server): Promise<void> {
  return new Promise((resolve) => {
    server.close(() => resolve())
    server.closeAllConnections()
  })
}
