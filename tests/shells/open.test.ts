/** `rungwise open`: which window it opens, and how it ends. */
import type { ChildProcess } from 'node:child_process'
import { once } from 'node:events'
import { writeFileSync } from 'node:fs'
import { join } from 'node:path'
import { setTimeout as wait } from 'node:timers/promises'
import { afterAll, describe, expect, test } from 'vitest'
import { desktop, root, rungwise, start, temporaryFolder } from './program.ts'

const folder = temporaryFolder()
afterAll(() => folder.remove())
const broken = join(folder.path, 'broken.yaml')
writeFileSync(broken, 'study: Broken\ndata: nothing\n')
const complaint = /broken\.yaml/

const { DISPLAY: _x, WAYLAND_DISPLAY: _wayland, ...noDisplay } = process.env

describe('open without a desktop', () => {
  test('refuses a broken plan with status 2 and one message, and serves nothing', async () => {
    const { status, stdout, stderr } = await rungwise(['open', broken], { environment: noDisplay })
    expect({ status, stdout }).toEqual({ status: 2, stdout: '' })
    expect(stderr).toMatch(complaint)
    expect(stderr.trimEnd()).not.toContain('\n')
  })

  test('opens the plan that is named', async () => {
    const child = start(['open', join(root, 'fixtures', 'congeneric', 'plan.yaml')], { environment: noDisplay })
    try {
      const link = await linkOf(child)
      const headers = { 'content-type': 'application/json', 'x-rungwise-token': link.searchParams.get('token')! }
      const answer = await fetch(new URL('/call/currentStudy', link), { method: 'POST', headers, body: 'null' })
      expect(await answer.json()).toMatchObject({ ok: true, value: { study: 'Four vocabulary tests' } })
    } finally {
      child.kill('SIGKILL')
    }
  })

  test('falls back to the loopback page when the runtime that is there cannot open a window', async () => {
    // A program that ends with a fault at once stands in for a runtime whose system libraries are missing.
    const environment = { ...noDisplay, DISPLAY: ':none', ELECTRON_OVERRIDE_DIST_PATH: folder.path }
    writeFileSync(join(folder.path, 'electron'), '#!/bin/sh\nexit 127\n', { mode: 0o755 })
    const child = start(['open'], { environment })
    try {
      expect((await linkOf(child)).hostname).toBe('127.0.0.1')
    } finally {
      child.kill('SIGKILL')
    }
  })
})

if (desktop !== null) {
  describe('open with a desktop', () => {
    test('opens a window, prints no link, and ends with status 0 on an interrupt', async () => {
      // A profile of its own: two windows at once, each in its own test, must not share one.
      const child = start(['open'], { environment: { ...process.env, XDG_CONFIG_HOME: folder.path } })
      const printed: string[] = []
      child.stdout!.setEncoding('utf8').on('data', (text: string) => printed.push(text))
      await wait(8000)
      expect(child.exitCode).toBeNull()
      child.kill('SIGINT')
      expect((await once(child, 'exit'))[0]).toBe(0)
      expect(printed.join('')).not.toContain('127.0.0.1')
    })

    test('refuses a broken plan with status 2 and its message', async () => {
      const { status, stderr } = await rungwise(['open', broken])
      expect(status).toBe(2)
      expect(stderr).toMatch(complaint)
    })
  })
}

/** Waits for the printed link. */
async function linkOf(child: ChildProcess): Promise<URL> {
  let said = ''
  for await (const chunk of child.stdout!.setEncoding('utf8')) {
    said += chunk
    const link = /http:\S+token=\S+(?=\n)/.exec(said)
    if (link !== null) return new URL(link[0])
  }
  throw new Error(`No link was printed: ${said}`)
}
