/**
 * The window in a real Chromium, on the real loopback host: what a user does from the first look to a recorded decision.
 *
 * Where there is no browser these tests say so in one line; under CI=true that is a failure. Pictures are kept in artifacts/.
 */
import { mkdirSync, writeFileSync } from 'node:fs'
import { join } from 'node:path'
import axe from 'axe-core'
import type { Browser, Locator, Page } from 'playwright-core'
import { afterAll, beforeAll, describe, expect, test } from 'vitest'
import { bounded, fixed, probability } from '../../src-renderer/state/format.ts'
import { root, temporaryFolder } from '../shells/program.ts'
import { findBrowser, launchBrowser } from './browser.ts'
import { type Host, startHost } from './host.ts'

const pictures = join(root, 'artifacts')
const sampleData = join(root, 'fixtures', 'sample', 'first-visit.csv')
/** Correlations that one factor reproduces only with a negative residual variance of a; and two unrelated pairs. */
const troubledPlan = `study: Four in trouble
data:
  indicators: [a, b, c, d]
  divisor: n-1
  summary:
    - n: 300
      correlation: [[1], [0.8, 1], [0.8, 0.5, 1], [0.8, 0.5, 0.5, 1]]
      sd: [1, 1, 1, 1]
candidates:
  All four:
    factors: { All: [a, b, c, d] }
  Two by two:
    factors: { First: [a, b], Second: [c, d] }
    factor covariances: zero
`
/** How long a click may wait for its target, in ms: well over what a busy machine needs. */
const patience = 20_000
const executable = findBrowser(process.env)

if (executable === null) {
  process.stderr.write('The tests of the window in a browser did not run: no Chromium was found; set CHROMIUM to its path.\n')
  test('a browser is there where CI is true', () => {
    expect(process.env['CI']).not.toBe('true')
  })
} else {
  describe('the window in a browser', () => {
    let browser: Browser
    let host: Host
    beforeAll(async () => {
      mkdirSync(pictures, { recursive: true })
      browser = await launchBrowser(executable)
      host = await startHost()
    })
    afterAll(async () => {
      await browser?.close()
      await host?.stop()
    })

    describe('on the sample study', () => {
      let page: Page
      const faults: string[] = []
      beforeAll(async () => {
        page = await browser.newPage({ viewport: { width: 1600, height: 1000 }, colorScheme: 'light' })
        page.setDefaultTimeout(patience)
        watchFaults(page, faults)
        await page.goto(host.link)
        await page.getByTestId('stand-here').waitFor()
      })
      afterAll(() => page.close())

      test('fits it at once and shows its ladder, top rung first, with the numbers of the program', async () => {
        const view = (await host.ask('currentStudy', null))!
        const ladder = view.result.ladders.at(-1)!
        await expect.poll(() => rungNames(page)).toEqual([...ladder.rungs].reverse())
        for (const name of ladder.rungs) {
          const result = view.result.candidates.find((candidate) => candidate.name === name)!
          const text = await textOf(page.locator(`[data-testid=rung][data-name="${name}"]`))
          for (const shown of [fixed(result.T, 2), bounded(result.cfi), fixed(result.bic, 1)]) expect(text).toContain(shown)
        }
        expect(await standing(page)).toBe(ladder.standHere)
        expect(await page.getByTestId('step').count()).toBe(ladder.steps.length)
      })

      test('says why on the focus of a verdict, and hides it again on Escape', async () => {
        const view = (await host.ask('currentStudy', null))!
        const verdict = page.getByTestId('verdict').first()
        const because = page.getByText(view.result.ladders.at(-1)!.steps.at(-1)!.because)
        expect(await because.isVisible()).toBe(false)
        await verdict.focus()
        await because.waitFor({ state: 'visible' })
        await page.keyboard.press('Escape')
        await because.waitFor({ state: 'hidden' })
      })

      test('has its pictures taken, light and dark', async () => {
        await page.mouse.move(0, 0)
        await page.evaluate('document.activeElement.blur()')
        await page.screenshot({ path: join(pictures, 'window-light.png') })
        await page.emulateMedia({ colorScheme: 'dark' })
        expect(await seriousProblems(page)).toEqual([])
        await page.screenshot({ path: join(pictures, 'window-dark.png') })
        await page.emulateMedia({ colorScheme: 'light' })
      })

      test('has no serious fault of accessibility in any of its places', async () => {
        expect(await seriousProblems(page)).toEqual([])
        for (const tab of ['Fit', 'Cautions', 'Residuals', 'What if', 'Table', 'Data']) {
          await page.getByRole('tab', { name: tab, exact: true }).click()
          await page.getByRole('status').filter({ hasText: 'Working out' }).waitFor({ state: 'detached' })
          expect(await seriousProblems(page)).toEqual([])
        }
        for (const name of ['Open…', 'Import data…', 'Save…', 'Export…', /^Rules:/, 'New candidate', 'Derive', 'New ladder']) {
          await page.getByRole('button', { name, ...(typeof name === 'string' ? { exact: true } : {}) }).click()
          await page.getByRole('dialog').waitFor()
          expect(await seriousProblems(page)).toEqual([])
          await page.keyboard.press('Escape')
          await page.getByRole('dialog').waitFor({ state: 'detached' })
        }
        await page.getByRole('tab', { name: 'Ladder', exact: true }).click()
      })

      test('shows the data: who answered what, what complete cases cost, how far from normal', async () => {
        const { data } = (await host.ask('currentStudy', null))!.result
        await page.getByRole('button', { name: /^9 items, N = 905/ }).click()
        expect(await page.getByRole('tab', { name: 'Data', exact: true }).getAttribute('aria-selected')).toBe('true')
        expect(await textOf(page.getByTestId('missing'))).toContain(`drops these ${data.missing.cases} cases`)
        const rows = page.getByTestId('pattern')
        expect(await rows.count()).toBe(data.missing.patterns.length)
        expect(await textOf(rows.first())).toContain(`${data.missing.patterns[0]!.n} `)
        expect(await rows.locator('.square:not(.answered)').count()).toBe(
          data.missing.patterns.flatMap(({ answered }) => data.indicators.filter((name) => !answered.includes(name))).length
        )
        expect(await textOf(page.getByTestId('normality'))).toBe(data.normality!.sentence)
        await takePictures(page, 'window-data')
        await page.getByRole('tab', { name: 'Ladder', exact: true }).click()
      })

      test('shows intervals and errors as the program gives them, of the group chosen once for every list', async () => {
        const { result } = (await host.ask('currentStudy', null))!
        await candidate(page, 'Three factors, scalar').click()
        await page.getByRole('tab', { name: 'Estimates', exact: true }).click()
        await page.getByLabel('Group').selectOption('Old Mill')
        const bags = result.candidates
          .find(({ name }) => name === 'Three factors, scalar')!
          .estimates.find(({ part, of, group }) => part === 'loading' && of[0] === 'bags' && group === 'Old Mill')!
        const row = await textOf(page.getByRole('row', { name: /^bags/ }).first())
        expect(row).toContain(`${fixed(bags.lower, 2)}, ${fixed(bags.upper, 2)}`)
        expect(row).toContain(bounded(bags.standardized, 2) + bounded(bags.standardizedError, 2))
        await page.getByText('Standard errors from the expected information').waitFor()
        for (const tab of ['Residuals', 'What if']) {
          await page.getByRole('tab', { name: tab, exact: true }).click()
          await expect.poll(() => page.getByLabel('Group').inputValue()).toBe('Old Mill')
        }
        await page.getByRole('tab', { name: 'Fit', exact: true }).click()
        expect(await textOf(page.getByTestId('search'))).toMatch(/iterations? from/)
        expect(await page.getByRole('table', { name: 'Starts tried, in order' }).getByRole('row').count()).toBeGreaterThan(1)
      })

      test('says what letting a restriction go would do, and derives the candidate without it', async () => {
        const { tests, leftOut } = await host.ask('scoreTests', { candidate: 'Three factors, scalar' })
        await page.getByRole('tab', { name: 'What if', exact: true }).click()
        await page.getByText('A change chosen by looking must be justified by content and checked on new data').waitFor()
        await page.getByLabel('Group').selectOption('Weir Lane')
        const first = tests.find(({ plausibility, group }) => plausibility === 'stated' && group === 'Weir Lane')!
        const shown = page.getByTestId('what-if').first()
        await expect.poll(() => textOf(shown)).toContain(first.words)
        for (const text of [fixed(first.statistic, 2), probability(first.p), fixed(first.expectedValue, 3)])
          expect(await textOf(shown)).toContain(text)
        expect(await textOf(page.getByRole('tabpanel', { name: 'What if' }))).toMatch(
          leftOut > 0 ? new RegExp(`${leftOut} restrictions? left out`) : /./
        )
        await takePictures(page, 'window-what-if')
        await shown.getByRole('button', { name: `Derive with this free…: ${first.words}` }).click()
        const dialog = page.getByRole('dialog')
        await dialog.getByText(/^Let the .* differ in Weir Lane only$/i).waitFor()
        await expect.poll(() => textOf(dialog.getByTestId('check'))).toMatch(/95 df, identified/)
        await page.keyboard.press('Escape')
        await dialog.waitFor({ state: 'detached' })
      })

      test('derives a candidate by a sentence, fits it and sets it on a ladder', async () => {
        await page.getByRole('tab', { name: 'Structure' }).click()
        await candidate(page, 'Two factors').click()
        await page.getByRole('button', { name: 'Derive', exact: true }).click()
        const dialog = page.getByRole('dialog')
        await dialog.getByTestId('candidate-name').fill('Two factors, jars with taps')
        await dialog.getByLabel('First name').selectOption('jars')
        await dialog.getByLabel('Second name').selectOption('taps')
        await dialog.getByRole('button', { name: 'Add change' }).click()
        await dialog.getByText('free the residual covariance of jars and taps').waitFor()
        await expect.poll(() => textOf(dialog.getByTestId('check'))).toMatch(/25 df, identified/)
        await dialog.getByRole('button', { name: 'Add candidate' }).click()
        await dialog.waitFor({ state: 'detached' })

        const added = candidate(page, 'Two factors, jars with taps')
        expect(await added.getAttribute('data-state')).toBe('draft')
        expect(await textOf(added)).toContain('added after results')
        await page.getByRole('button', { name: 'Fit 1 draft' }).click()
        await expect.poll(() => added.getAttribute('data-state')).toBe('fitted')

        await page.getByRole('button', { name: 'Set it on a ladder…' }).click()
        await page.getByRole('dialog').getByLabel('Name', { exact: true }).fill('Structure, once more')
        await page.getByRole('dialog').getByRole('button', { name: 'Add ladder' }).click()
        await expect
          .poll(() => rungNames(page))
          .toEqual([
            'One factor',
            'Two factors',
            'Two factors, jars with taps',
            'Three factors',
            'Three factors, bags with driving'
          ])
        expect(await standing(page)).toBe('Three factors')
      })

      test('records a decision only with its reason, and pins it to the rung', async () => {
        await page.locator('[data-testid=rung]').getByRole('button', { name: 'Three factors', exact: true }).click()
        await page.getByRole('button', { name: 'Stand on this rung…' }).click()
        await page.getByRole('button', { name: 'Record decision' }).click()
        await page.getByRole('alert').getByText('A decision needs its reason').waitFor()
        await page.getByLabel('Why stand on Three factors?').fill('The residual covariance adds nothing that could be named.')
        await page.getByRole('button', { name: 'Record decision' }).click()
        const rung = page.locator('[data-testid=rung][data-name="Three factors"]')
        await rung.getByText('adds nothing that could be named').waitFor()
        expect((await host.ask('currentStudy', null))?.decisions.at(-1)).toMatchObject({ rung: 'Three factors' })
        await page.screenshot({ path: join(pictures, 'window-decision.png') })
      })

      test('lets one intercept go from a rung that the ladder made, and stands the result between its rungs', async () => {
        await page.getByRole('tab', { name: 'Across clinics' }).click()
        await candidate(page, 'Three factors, scalar').click()
        await page.getByRole('button', { name: 'Derive', exact: true }).click()
        const dialog = page.getByRole('dialog')
        await dialog.getByTestId('candidate-name').fill('Scalar but for bags')
        await dialog.getByLabel('What to do').selectOption('release')
        await dialog.getByLabel('Part').selectOption('intercept')
        await dialog.getByLabel('First name').selectOption('bags')
        await dialog.getByRole('button', { name: 'Add change' }).click()
        await expect.poll(() => textOf(dialog.getByTestId('check'))).toMatch(/94 df, identified/)
        await dialog.getByRole('button', { name: 'Add candidate' }).click()
        await page.getByRole('button', { name: 'Fit 1 draft' }).click()
        await expect.poll(() => candidate(page, 'Scalar but for bags').getAttribute('data-state')).toBe('fitted')
        await page.getByRole('button', { name: 'Set it on a ladder…' }).click()
        await dialog.getByRole('button', { name: 'Add ladder' }).click()
        await dialog.waitFor({ state: 'detached' })
        const levels = ['strict', 'scalar', 'metric', 'configural'].map((level) => `Three factors, ${level}`)
        await expect.poll(() => rungNames(page)).toEqual(levels.toSpliced(2, 0, 'Scalar but for bags'))
        await expect.poll(() => page.getByTestId('step').count()).toBe(4)
      })

      test('tells the whole story in its trail, with the chain verified', async () => {
        const { trail } = (await host.ask('currentStudy', null))!
        await page.getByRole('button', { name: /^Trail/ }).click()
        const region = page.getByRole('region', { name: 'Trail entries, newest first' })
        expect(await region.getByRole('row').count()).toBe(trail.entries.length + 1)
        expect(await textOf(page.getByRole('button', { name: /^Trail/ }))).toContain('chain verified')
        expect(await seriousProblems(page)).toEqual([])
        await page.getByRole('button', { name: /^Trail/ }).click()
      })

      test('stacks its places on a narrow screen and with text twice as large, without scrolling sideways', async () => {
        for (const [width, size] of [
          [390, '100%'],
          [760, '100%'],
          [1280, '200%']
        ] as const) {
          await page.setViewportSize({ width, height: 900 })
          await page.evaluate(`document.documentElement.style.fontSize = '${size}'`)
          for (const tab of ['Data', 'Fit', 'What if', 'Estimates', 'Ladder']) {
            await page.getByRole('tab', { name: tab, exact: true }).click()
            const overflow = await page.evaluate('document.documentElement.scrollWidth - document.documentElement.clientWidth')
            expect({ width, size, tab, overflow }).toEqual({ width, size, tab, overflow: 0 })
          }
          const [left, middle] = await Promise.all([
            boxOf(page.getByTestId('candidate').first()),
            boxOf(page.getByTestId('rung').first())
          ])
          expect(middle.y).toBeGreaterThan(left.y)
          expect(middle.width).toBeGreaterThan(0.7 * width)
          await page.screenshot({ path: join(pictures, `window-${width}.png`) })
        }
        await page.evaluate("document.documentElement.style.fontSize = ''")
        await page.setViewportSize({ width: 1600, height: 1000 })
      })

      test('saw no fault, no warning and no request to another machine', () => {
        expect(faults).toEqual([])
      })
    })

    describe('on solutions that are none, or none that could be', () => {
      let page: Page
      const folder = temporaryFolder()
      beforeAll(async () => {
        page = await browser.newPage({ viewport: { width: 1440, height: 900 }, colorScheme: 'light' })
        page.setDefaultTimeout(patience)
        await page.goto(host.link)
        const plan = join(folder.path, 'plan.yaml')
        writeFileSync(plan, troubledPlan)
        await fillAndPress(page, 'Open…', plan, 'Open')
        await page.getByRole('button', { name: 'Fit 2 drafts' }).click()
      })
      afterAll(async () => {
        await page.close()
        folder.remove()
      })

      test('an improper solution is told in the list, on the candidate and in words', async () => {
        await expect.poll(() => textOf(candidate(page, 'All four'))).toContain('improper solution')
        await candidate(page, 'All four').click()
        expect(await textOf(page.getByTestId('improper'))).toMatch(/residual variance of a is negative/)
        expect(await seriousProblems(page)).toEqual([])
        await takePictures(page, 'window-improper')
        await page.getByRole('button', { name: 'Derive with it kept from falling below 0…' }).click()
        const dialog = page.getByRole('dialog')
        await dialog.getByText('keep the residual variance of a at least 0').waitFor()
        await dialog.getByRole('button', { name: 'Add candidate' }).click()
        await page.getByRole('button', { name: 'Fit 1 draft' }).click()
        const bounded = candidate(page, 'All four, no variance below 0')
        await expect.poll(() => bounded.getAttribute('data-state'), { timeout: patience }).toBe('fitted')
        expect(await textOf(bounded)).not.toContain('improper')
      })

      test('a candidate without a solution says why, and what was tried', async () => {
        const { result } = (await host.ask('currentStudy', null))!
        const { reason, state } = result.candidates.find(({ name }) => name === 'Two by two')!
        expect(state).toBe('not identified')
        await candidate(page, 'Two by two').click()
        await page.getByRole('tab', { name: 'Fit', exact: true }).click()
        await page.getByRole('tabpanel', { name: 'Fit' }).getByText(reason!).waitFor()
        await page.getByRole('tab', { name: 'What if', exact: true }).click()
        await page.getByRole('alert').getByText('has no solution to test').waitFor()
      })
    })

    describe('on data of one’s own', () => {
      let page: Page
      const faults: string[] = []
      beforeAll(async () => {
        page = await browser.newPage({ viewport: { width: 1440, height: 900 }, colorScheme: 'light' })
        page.setDefaultTimeout(patience)
        watchFaults(page, faults)
        await page.goto(host.link)
        await page.getByRole('button', { name: 'Import data…' }).click()
      })
      afterAll(() => page.close())

      test('says beside the field what is wrong with a file', async () => {
        await page.getByLabel(/^Data file/).fill(join(root, 'fixtures', 'sample', 'not-there.csv'))
        await page.getByRole('alert').waitFor()
        expect(await textOf(page.getByRole('alert'))).toContain('not-there.csv')
      })

      test('imports a data file, proposes how to estimate, and shows the data and what to do next', async () => {
        const dialog = page.getByRole('dialog')
        await dialog.getByLabel(/^Data file/).fill(sampleData)
        await dialog.getByLabel('Name of the study').fill('My own study')
        await dialog.getByLabel('Group column').selectOption('clinic')
        await dialog.getByRole('button', { name: 'Choose all numeric' }).click()
        expect(await dialog.getByLabel('full information').isChecked()).toBe(true)
        expect(await dialog.getByLabel('observed').isChecked()).toBe(true)
        await dialog.getByLabel('mean-scaled').check()
        expect(await dialog.getByLabel('robust').isChecked()).toBe(true)
        expect(await seriousProblems(page)).toEqual([])
        await takePictures(page, 'window-import')
        await dialog.getByLabel('Change in fit that holds').selectOption('Chen 2007')
        await dialog.getByText('CFI may fall by .010').waitFor()
        await dialog.getByText('CFI may fall by .010').scrollIntoViewIfNeeded()
        await page.screenshot({ path: join(pictures, 'window-rules.png') })
        await dialog.getByRole('button', { name: 'Make the study' }).click()
        await page.getByRole('heading', { name: 'My own study' }).waitFor()
        expect((await host.ask('currentStudy', null))?.estimation).toMatchObject({
          statistic: 'mean-scaled',
          missing: 'full information',
          standardErrors: 'robust'
        })
        expect((await host.ask('currentStudy', null))?.rules.changeInFit?.preset).toBe('Chen 2007')
        await page.getByText('Then start with a candidate').waitFor()
        expect(await textOf(page.getByTestId('missing'))).toContain('this study keeps every answer given')
        expect(await seriousProblems(page)).toEqual([])
      })

      test('writes a candidate into the grid with the keyboard alone, blocks copied and pasted', async () => {
        await page.getByRole('button', { name: 'New candidate' }).first().click()
        const dialog = page.getByRole('dialog')
        await dialog.getByTestId('candidate-name').fill('Hand and life')
        await dialog.getByRole('button', { name: 'Add factor' }).click()
        await dialog.getByLabel('Name of factor 1').fill('Hand')
        await dialog.getByLabel('Name of factor 2').fill('Life')
        await gridCell(dialog, 0, 0).focus()
        for (const key of ['Space', 'ArrowDown', 'Space', 'ArrowDown', 'Space', 'ArrowUp', 'ArrowUp'])
          await page.keyboard.press(key)
        for (const key of ['Shift+ArrowDown', 'Shift+ArrowDown', 'Control+c', 'ArrowDown']) await page.keyboard.press(key)
        await expect.poll(() => gridText(dialog, 0)).toEqual(['free', 'free', 'free', '', '', '', '', '', ''])
        await page.keyboard.press('Control+v')
        for (const key of ['Home', 'ArrowRight', 'ArrowDown', 'ArrowDown', 'ArrowDown', 'Control+v']) await page.keyboard.press(key)
        await expect.poll(() => gridText(dialog, 0)).toEqual(['free', 'free', 'free', 'free', 'free', 'free', '', '', ''])
        expect(await gridText(dialog, 1)).toEqual(['', '', '', '', '', '', 'free', 'free', 'free'])
        await expect.poll(() => textOf(dialog.getByTestId('check'))).toMatch(/26 df, identified/)
        await gridCell(dialog, 4, 0).focus()
        await page.keyboard.type('0,5')
        await page.keyboard.press('Enter')
        await expect.poll(() => textOf(dialog.getByTestId('check'))).toContain('decimal point')
        await page.keyboard.press('ArrowUp')
        await page.keyboard.type('free')
        await page.keyboard.press('Enter')
        await expect.poll(() => textOf(dialog.getByTestId('check'))).toMatch(/26 df, identified/)
        expect(await seriousProblems(page)).toEqual([])
        await page.screenshot({ path: join(pictures, 'window-grid.png') })
        await dialog.getByRole('button', { name: 'Add candidate' }).click()
        await dialog.waitFor({ state: 'detached' })
        expect((await host.ask('currentStudy', null))?.candidates[0]?.candidate.factors).toEqual([
          { name: 'Hand', measures: ['jars', 'bags', 'taps', 'tingling', 'numbness', 'coldness'] },
          { name: 'Life', measures: ['driving', 'cooking', 'handshake'] }
        ])
      })

      test('makes an invariance ladder of it and climbs it', async () => {
        await page.getByRole('button', { name: 'New ladder' }).first().click()
        const dialog = page.getByRole('dialog')
        await dialog.getByLabel('Name', { exact: true }).fill('Between clinics')
        await dialog.getByLabel('Invariance across clinic').check()
        await dialog.getByRole('button', { name: 'Add ladder' }).click()
        await dialog.waitFor({ state: 'detached' })
        await page.getByRole('button', { name: /^Fit \d+ drafts$/ }).click()
        await expect
          .poll(async () => (await host.ask('currentStudy', null))?.candidates.every((one) => one.state === 'fitted'), {
            timeout: patience
          })
          .toBe(true)
        await expect.poll(() => page.getByTestId('step').count(), { timeout: patience }).toBe(2)
        expect(await textOf(page.getByRole('button', { name: /^Rules:/ }))).toContain('Rules fixed')
      })

      test('names the scaled statistic, its factor and the kind of its indices', async () => {
        const { result } = (await host.ask('currentStudy', null))!
        const ladder = result.ladders.at(-1)!
        const base = result.candidates.find(({ name }) => name === ladder.rungs[0])!
        const rung = await textOf(page.locator(`[data-testid=rung][data-name="${base.name}"]`))
        for (const text of [fixed(base.scaled!.T, 2), `c\u00a0=\u00a0${fixed(base.scaled!.scaling, 3)}`])
          expect(rung).toContain(text)
        expect(await textOf(page.getByTestId('scaling'))).toContain(base.scaled!.form)
        expect(await textOf(page.getByTestId('scaling'))).toContain('population-consistent')
        await candidate(page, base.name).click()
        await page.getByRole('tab', { name: 'Fit', exact: true }).click()
        const details = await textOf(page.getByRole('tabpanel', { name: 'Fit' }))
        expect(details).toContain(`T before scaling ${fixed(base.T, 2)}`)
        expect(details).toContain(`CFI, plug-in ${bounded(base.plugIn!.cfi)}`)
        expect(await seriousProblems(page)).toEqual([])
        await takePictures(page, 'window-scaled')
        await page.getByRole('tab', { name: 'Estimates', exact: true }).click()
        await page.getByText('Standard errors robust').waitFor()
      })

      test('saves the study, opens another and finds everything again in the saved file', async () => {
        const folder = temporaryFolder()
        try {
          const file = join(folder.path, 'mine.rungwise')
          await fillAndPress(page, 'Save…', file, 'Save')
          await page.getByText('saved in mine.rungwise').waitFor()
          const before = (await host.ask('currentStudy', null))!
          await fillAndPress(page, 'Open…', join(root, 'fixtures', 'sample', 'plan.yaml'), 'Open')
          await page.getByRole('heading', { name: 'Hand therapy, first visit' }).waitFor()
          await fillAndPress(page, 'Open…', file, 'Open')
          await page.getByRole('heading', { name: 'My own study' }).waitFor()
          await expect.poll(() => page.getByTestId('step').count()).toBe(2)
          expect((await host.ask('currentStudy', null))?.result).toEqual(before.result)
          await host.ask('openSample', null)
        } finally {
          folder.remove()
        }
      })

      test('saw no fault, no warning and no request to another machine', () => {
        expect(faults).toEqual([])
      })
    })
  })
}

/** One picture in light colours and one in dark. */
async function takePictures(page: Page, name: string): Promise<void> {
  await page.mouse.move(0, 0)
  for (const colorScheme of ['dark', 'light'] as const) {
    await page.emulateMedia({ colorScheme })
    await page.screenshot({ path: join(pictures, `${name}-${colorScheme}.png`) })
  }
}

/** Opens a dialog from the header, writes a path into it and presses its last button. */
async function fillAndPress(page: Page, opener: string, path: string, action: string): Promise<void> {
  await page.getByRole('button', { name: opener, exact: true }).click()
  const dialog = page.getByRole('dialog')
  await dialog.getByLabel(/^File/).fill(path)
  await dialog.getByRole('button', { name: action, exact: true }).click()
  await dialog.waitFor({ state: 'detached' }).catch(async (cause: unknown) => {
    throw new Error(`The dialog stayed: ${await textOf(dialog)}`, { cause })
  })
}

function rungNames(page: Page): Promise<(string | null)[]> {
  return page.getByTestId('rung').evaluateAll((all) => all.map((rung) => rung.getAttribute('data-name')))
}

async function boxOf(locator: Locator): Promise<{ y: number; width: number }> {
  const box = await locator.boundingBox()
  if (box === null) throw new Error('not shown')
  return box
}

function standing(page: Page): Promise<string | null> {
  return page
    .locator('li', { has: page.getByTestId('stand-here') })
    .getByTestId('rung')
    .getAttribute('data-name')
}

/** The candidate of exactly this name in the list at the left. */
function candidate(page: Page, name: string): Locator {
  return page.getByTestId('candidate').filter({ has: page.getByText(name, { exact: true }) })
}

function gridCell(dialog: Locator, row: number, column: number): Locator {
  return dialog.locator(`[data-place="${row}-${column}"]`)
}

/** A column of the grid as typed. */
function gridText(dialog: Locator, column: number): Promise<string[]> {
  return dialog.locator(`[data-place$="-${column}"] > span`).allTextContents()
}

/** What an element says, its line breaks and indentation as single spaces. */
async function textOf(locator: Locator): Promise<string> {
  return ((await locator.textContent()) ?? '').replace(/[ \n]+/g, ' ')
}

/** Violations of WCAG A and AA that hinder seriously, each with where it is. */
async function seriousProblems(page: Page): Promise<string[]> {
  await page.evaluate(axe.source)
  const found = (await page.evaluate(
    "axe.run({ runOnly: ['wcag2a', 'wcag2aa', 'wcag21a', 'wcag21aa', 'wcag22aa', 'best-practice'] })"
  )) as axe.AxeResults
  return found.violations
    .filter(({ impact }) => impact === 'serious' || impact === 'critical')
    .flatMap(({ id, nodes }) => nodes.map((node) => `${id}: ${node.target.join(' ')}: ${node.failureSummary ?? ''}`))
}

function watchFaults(page: Page, faults: string[]): void {
  page.on('pageerror', (error) => faults.push(error.message))
  page.on('console', (message) => {
    if (['error', 'warning'].includes(message.type())) faults.push(message.text())
  })
  page.on('request', (request) => {
    if (!/^(http:\/\/127\.0\.0\.1:|data:)/.test(request.url())) faults.push(`asked ${request.url()}`)
  })
}
