/** What tests of the window do to look at a page. */
import { mkdirSync } from 'node:fs'
import { join } from 'node:path'
import axe from 'axe-core'
import type { Locator, Page } from 'playwright-core'
import { root } from '../shells/program.ts'

const pictures = join(root, 'artifacts')

/** What an element says, its line breaks and indentation as single spaces. */
export async function textOf(locator: Locator): Promise<string> {
  return ((await locator.textContent()) ?? '').replace(/[ \n]+/g, ' ')
}

/** One picture in light colours and one in dark, kept in artifacts/. */
export async function takePictures(page: Page, name: string): Promise<void> {
  mkdirSync(pictures, { recursive: true })
  for (const colorScheme of ['dark', 'light'] as const) {
    await page.emulateMedia({ colorScheme })
    await page.screenshot({ path: join(pictures, `${name}-${colorScheme}.png`) })
  }
}

/** Violations of WCAG A and AA that hinder seriously, in light colours and in dark, each with where it is. */
export async function seriousProblems(page: Page): Promise<string[]> {
  const problems: string[] = []
  for (const colorScheme of ['dark', 'light'] as const) {
    await page.emulateMedia({ colorScheme })
    await page.evaluate(axe.source)
    const found = (await page.evaluate(
      "axe.run({ runOnly: ['wcag2a', 'wcag2aa', 'wcag21a', 'wcag21aa', 'wcag22aa', 'best-practice'] })"
    )) as axe.AxeResults
    const serious = found.violations.filter(({ impact }) => impact === 'serious' || impact === 'critical')
    for (const { id, nodes } of serious) {
      problems.push(...nodes.map((node) => `${id}: ${node.target.join(' ')}: ${node.failureSummary ?? ''}`))
    }
  }
  return problems
}

/** Gathers what a sound window never has: errors, warnings, requests to another machine. */
export function watchFaults(page: Page, faults: string[]): void {
  page.on('pageerror', (error) => faults.push(error.message))
  page.on('console', (message) => {
    if (['error', 'warning'].includes(message.type())) faults.push(message.text())
  })
  page.on('request', (request) => {
    if (!/^(http:\/\/127\.0\.0\.1:|data:)/.test(request.url())) faults.push(`asked ${request.url()}`)
  })
}
