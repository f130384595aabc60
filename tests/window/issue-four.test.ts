/**
 * The window where a step fails: why, what to let go, how much it matters, how candidates stand to each other, how stable a ladder is.
 *
 * In a real Chromium on the real loopback host; where there is no browser, window.test.ts says so.
 */
import { writeFileSync } from 'node:fs'
import { join } from 'node:path'
import type { Browser, Locator, Page } from 'playwright-core'
import { afterAll, beforeAll, describe, expect, test } from 'vitest'
import { shareInWords } from '../../src-renderer/stability/shares.ts'
import { bounded, fixed } from '../../src-renderer/state/format.ts'
import { temporaryFolder } from '../shells/program.ts'
import { findBrowser, launchBrowser } from './browser.ts'
import { type Host, startHost } from './host.ts'
import { seriousProblems, takePictures, textOf, watchFaults } from './looking.ts'

/** How long a click may wait for its target, in ms: well over what a busy machine needs. */
const patience = 40_000
const executable = findBrowser(process.env)
const overTime = `study: Calm, twice
data:
  file: calm.csv
  indicators: [sit, walk, read, sit again, walk again, read again]
candidates:
  Calm:
    factors: { Calm: [sit, walk, read] }
`
/** Three answers of 300 people at two occasions, drawn from one factor a time with a fixed generator. */
function twoOccasions(): string {
  let state = 20_240
  const uniform = () => {
    state = (state * 48_271) % 2_147_483_647
    return state / 2_147_483_647
  }
  const normal = () => Math.sqrt(-2 * Math.log(uniform())) * Math.cos(2 * Math.PI * uniform())
  const rows = Array.from({ length: 300 }, () => {
    const first = normal()
    const second = 0.6 * first + 0.8 * normal() + 0.3
    return [first, second].flatMap((factor) => [1, 0.8, 0.9].map((loading) => (loading * factor + 0.6 * normal()).toFixed(4)))
  })
  return ['sit,walk,read,sit again,walk again,read again', ...rows.map((row) => row.join(','))].join('\n')
}
const partial = 'Three factors, scalar but for coldness and taps in Weir Lane'

describe.runIf(executable !== null)('a step that does not hold, in the window', () => {
  let browser: Browser
  let host: Host
  let page: Page
  const faults: string[] = []
  beforeAll(async () => {
    browser = await launchBrowser(executable!)
    host = await startHost()
    page = await browser.newPage({ viewport: { width: 1600, height: 1000 }, colorScheme: 'light' })
    page.setDefaultTimeout(patience)
    watchFaults(page, faults)
    await page.goto(host.link)
    await page.getByTestId('stand-here').waitFor()
  })
  afterAll(async () => {
    await browser?.close()
    await host?.stop()
  })

  test('says which test it was and how large the step is, on the focus of its verdict', async () => {
    const { steps } = (await host.ask('currentStudy', null))!.result.ladders.at(-1)!
    const { because, difference } = steps.find(({ to }) => to === 'Three factors, scalar')!
    const verdict = stepTo('Three factors, scalar').getByTestId('verdict')
    await verdict.focus()
    const why = page.getByRole('tooltip').filter({ hasText: because })
    await why.waitFor({ state: 'visible' })
    const { estimate, lower, upper } = difference!.rmsea
    const size = `RMSEA of the difference ${bounded(estimate)} [${bounded(lower)}, ${bounded(upper)}]`
    for (const text of ['chi-square difference, normal theory', size, 'Relation']) expect(await textOf(why)).toContain(text)
    await page.screenshot({ path: 'artifacts/window-verdict.png' })
    await page.keyboard.press('Escape')
    await why.waitFor({ state: 'hidden' })
  })

  test('offers a search only where something can be let go', async () => {
    expect(await page.getByRole('button', { name: /^Find what to release/ }).count()).toBe(1)
    await page.getByRole('tab', { name: 'Structure' }).click()
    expect(await page.getByTestId('step').filter({ hasText: 'Does not hold' }).count()).toBeGreaterThan(0)
    expect(await page.getByRole('button', { name: /^Find what to release/ }).count()).toBe(0)
    await page.getByRole('tab', { name: 'Across clinics' }).click()
  })

  test('lets go one equality by hand, chosen among those of the step', async () => {
    const dialog = await openRelease()
    await dialog.getByRole('tab', { name: 'By hand' }).click()
    const boxes = dialog.getByRole('checkbox')
    await boxes.first().waitFor()
    expect(await boxes.count()).toBe(8)
    await dialog.getByRole('button', { name: 'Show all 27' }).click()
    expect(await boxes.count()).toBe(27)
    expect(await seriousProblems(page)).toEqual([])
    await takePictures(page, 'window-by-hand')
    await dialog.getByRole('checkbox', { name: 'the intercept of bags in Old Mill' }).check()
    await dialog.getByRole('button', { name: 'Let go, fit and set on a ladder' }).click()
    await dialog.waitFor({ state: 'detached' })
    const made = 'Three factors, scalar but for bags in Old Mill'
    await expect.poll(rungNames).toContain(made)
    expect(
      await page.getByRole('tab', { name: 'Across clinics, scalar but for bags in Old Mill' }).getAttribute('aria-selected')
    ).toBe('true')
    expect(await textOf(page.locator(`[data-testid=rung][data-name="${made}"]`))).toContain('added after results')
    await page.getByRole('tab', { name: 'Across clinics', exact: true }).click()
  })

  test('searches by a rule told beforehand, and finds the two intercepts that were made different', async () => {
    const dialog = await openRelease()
    await dialog.getByText('At least two indicators of each factor stay equal').waitFor()
    expect(await seriousProblems(page)).toEqual([])
    await takePictures(page, 'window-search-rule')
    await dialog.getByRole('button', { name: 'Search', exact: true }).focus()
    await page.keyboard.press('Enter')
    await dialog.getByTestId('search-sentence').waitFor()
    expect(await page.evaluate('document.activeElement.dataset.testid')).toBe('search-sentence')
    expect(await dialog.getByTestId('round').getByRole('heading').allTextContents()).toEqual([
      'Round 1: let go the intercept of coldness in Weir Lane',
      'Round 2: let go the intercept of taps in Weir Lane'
    ])
    expect(await textOf(dialog.getByTestId('search-sentence'))).toContain('Without them the step holds.')
    expect(await textOf(dialog.getByTestId('other-reference'))).toContain('the search lets go of the same')
    expect(await seriousProblems(page)).toEqual([])
    await takePictures(page, 'window-search-found')
    await dialog.getByRole('button', { name: 'See the new ladder' }).click()
    await dialog.waitFor({ state: 'detached' })
    await expect.poll(rungNames).toContain(partial)
    const made = page.locator(`[data-testid=rung][data-name="${partial}"]`)
    expect(await textOf(made)).toContain('added after results')
    expect(await textOf(stepTo(partial).getByTestId('verdict'))).toContain('Holds')
    await takePictures(page, 'window-partial')
  })

  test('draws loadings and intercepts by group, and says what the differences amount to', async () => {
    const { sizes } = await host.ask('effectSizes', { candidate: partial })
    const { differences } = await host.ask('latentMeans', { candidate: partial })
    await candidate(partial).click()
    await page.getByRole('tab', { name: 'By group' }).click()
    const taps = page.getByRole('region', { name: 'Intercepts' }).getByTestId('picture-row').filter({ hasText: 'taps' })
    expect(await textOf(taps)).toContain('free in Weir Lane')
    expect(await taps.getByRole('img').getAttribute('aria-label')).toMatch(
      /^taps, free in Weir Lane: Larch Hill .* \[.*\], Old Mill .*, Weir Lane /
    )
    const largest = sizes
      .filter(({ indicator }) => indicator === 'coldness')
      .find(({ reference, focal }) => reference === 'Larch Hill' && focal === 'Weir Lane')!
    const table = page.getByTestId('effect-sizes').getByRole('table', { name: 'Larch Hill and Weir Lane' })
    await table.waitFor()
    expect(await textOf(table.getByRole('row', { name: /^coldness/ }))).toContain(bounded(largest.dmacs))
    await table.scrollIntoViewIfNeeded()
    await takePictures(page, 'window-effect-sizes')
    const means = page.getByTestId('latent-means')
    await means.getByRole('table').waitFor()
    const first = differences[0]!
    for (const value of [first.raw.estimate, first.standardised!.estimate, first.raw.lower!])
      expect(await textOf(means.getByRole('table'))).toContain(fixed(value, 2))
    await means.getByText('In words').click()
    await means.getByText(first.sentence).waitFor()
    expect(await seriousProblems(page)).toEqual([])
    await page.getByRole('region', { name: 'Loadings' }).scrollIntoViewIfNeeded()
    await takePictures(page, 'window-by-group')
    await means.scrollIntoViewIfNeeded()
    await takePictures(page, 'window-by-group-means')
  })

  test('says why groups are not compared where no rung licenses it', async () => {
    await candidate('Three factors, configural').click()
    const refused = page.getByTestId('refused')
    await refused.first().waitFor()
    expect(await refused.count()).toBeGreaterThan(0)
    await expect.poll(() => textOf(page.getByTestId('latent-means').getByTestId('refused').first())).toMatch(/equal|intercepts/)
    await takePictures(page, 'window-refused')
  })

  test('offers no comparison of groups for a candidate of all cases together', async () => {
    await candidate('Three factors').click()
    expect(await page.getByRole('tab', { name: 'By group' }).count()).toBe(0)
    expect(await page.getByRole('tab', { name: 'Estimates', exact: true }).getAttribute('aria-selected')).toBe('true')
  })

  test('tells of a pair that is not nested what the cases say', async () => {
    const two = {
      name: 'One factor, cooking with driving',
      from: 'One factor',
      factors: null,
      scaling: null,
      factorCovariances: null,
      across: null,
      equalAcrossGroups: null,
      except: [],
      change: [{ do: 'free', cell: { part: 'residual covariance', of: ['cooking', 'driving'] }, group: null }]
    } as const
    await host.ask('addCandidate', { candidate: { ...two, except: [], change: [...two.change] } as never })
    await host.ask('addLadder', { ladder: { name: 'Not nested', rungs: ['Two factors', two.name] } })
    await host.ask('fitCandidates', { names: [two.name] })
    await page.reload()
    await page.getByRole('tab', { name: 'Not nested' }).click()
    const verdict = page.getByTestId('verdict')
    expect(await textOf(verdict)).toContain('not nested')
    await verdict.focus()
    const why = page.getByRole('tooltip')
    await why.waitFor({ state: 'visible' })
    const { notNested } = (await host.ask('currentStudy', null))!.result.ladders.find(({ name }) => name === 'Not nested')!
      .steps[0]!
    expect(await textOf(why)).toContain(notNested!.sentence)
    expect(await textOf(why)).toContain('Told apart?')
    await page.screenshot({ path: 'artifacts/window-not-nested.png' })
    await page.keyboard.press('Escape')
  })

  test('shows the ladders in the family, and makes one of them a ladder of the study', async () => {
    const found = await host.ask('familyRelations', null)
    await page.getByRole('tab', { name: 'Family' }).click()
    const chains = page.getByTestId('chain')
    await chains.first().waitFor()
    expect(await chains.count()).toBe(found.chains.length)
    expect(await textOf(page.getByTestId('family'))).toContain(found.sentences[0]!)
    await page.getByRole('table', { name: 'Evidence ratios of pairs that are not nested' }).waitFor()
    expect(await seriousProblems(page)).toEqual([])
    await takePictures(page, 'window-family')
    const free = chains.filter({ has: page.getByRole('button', { name: 'Use this ladder' }) }).first()
    const rungs = await free.getByRole('listitem').allTextContents()
    await free.getByRole('button', { name: 'Use this ladder' }).click()
    await expect.poll(rungNames).toEqual(rungs.map((text) => text.trim()))
    expect((await host.ask('currentStudy', null))!.ladders.at(-1)).toMatchObject({
      rungs: rungs.map((text) => text.trim()).reverse()
    })
  })

  test('resamples a ladder, and says how often each step holds and each rung is stood on', async () => {
    await page.getByRole('tab', { name: 'Across clinics', exact: true }).click()
    await page.getByRole('button', { name: 'How stable?' }).click()
    const dialog = page.getByRole('dialog')
    expect(await dialog.getByRole('textbox', { name: 'Resamples' }).inputValue()).toBe('1000')
    await dialog.getByRole('textbox', { name: 'Resamples' }).fill('many')
    await dialog.getByRole('button', { name: 'Resample', exact: true }).click()
    await dialog.getByRole('alert').getByText('This is no number of resamples').waitFor()
    await dialog.getByRole('textbox', { name: 'Resamples' }).fill('50')
    await dialog.getByRole('button', { name: 'Resample', exact: true }).click()
    await dialog.getByTestId('stable-rung').first().waitFor()
    const again = await host.ask('stability', { ladder: 'Across clinics', resamples: 50, seed: 1 })
    const steps = dialog.getByTestId('stable-step')
    expect(await steps.count()).toBe(again.steps.length)
    for (const [i, step] of [...again.steps].reverse().entries())
      expect(await textOf(steps.nth(i))).toContain(`held in ${shareInWords(step.share)}`)
    for (const [i, rung] of [...again.rungs].reverse().entries())
      expect(await textOf(dialog.getByTestId('stable-rung').nth(i))).toContain(`stood on in ${shareInWords(rung.share)}`)
    expect(await seriousProblems(page)).toEqual([])
    await takePictures(page, 'window-stability')
  })

  test('stops a long resampling and keeps what was done', async () => {
    const dialog = page.getByRole('dialog')
    await dialog.getByRole('textbox', { name: 'Resamples' }).fill('100 000')
    await dialog.getByRole('button', { name: 'Resample again' }).click()
    await dialog
      .getByRole('status')
      .filter({ hasText: /Resampling \d\d+ of 100\u2006000/ })
      .waitFor()
    await takePictures(page, 'window-resampling')
    await dialog.getByRole('button', { name: 'Stop' }).click()
    await dialog.getByText(/of 100\u2006000 resamples, then stopped/).waitFor()
    await page.keyboard.press('Escape')
    await dialog.waitFor({ state: 'detached' })
  })

  test('holds factor variances and means equal on demand, each on a ladder of its own', async () => {
    await page.getByRole('button', { name: 'New ladder' }).click()
    const dialog = page.getByRole('dialog')
    await dialog.getByLabel('Name', { exact: true }).fill('Clinics')
    await dialog.getByLabel('Invariance across clinic').check()
    await dialog.getByRole('combobox', { name: 'Candidate' }).selectOption('Two factors')
    await dialog.getByLabel('Up to').selectOption('metric')
    for (const set of ['factor variances', 'factor covariances']) await dialog.getByLabel(set).check()
    expect(await seriousProblems(page)).toEqual([])
    await takePictures(page, 'window-new-ladder')
    await dialog.getByRole('button', { name: 'Add ladder' }).click()
    await dialog.waitFor({ state: 'detached' })
    await page.getByRole('button', { name: /^Fit \d+ drafts$/ }).click()
    await page.getByRole('tab', { name: 'Clinics, factor variances' }).click()
    await expect.poll(rungNames).toEqual(['Two factors, metric, equal factor variances', 'Two factors, metric'])
    await expect.poll(() => page.getByTestId('step').count(), { timeout: patience }).toBe(1)
  })

  test('fits its panels into a narrow window and text twice as large, without scrolling sideways', async () => {
    await page.getByRole('tab', { name: 'Across clinics, partial scalar' }).click()
    await page.getByRole('button', { name: partial, exact: true }).first().click()
    await page.getByRole('tab', { name: 'By group' }).click()
    await page.getByTestId('latent-means').getByRole('table').waitFor()
    for (const [width, size] of [
      [390, '100%'],
      [1280, '200%']
    ] as const) {
      await page.setViewportSize({ width, height: 900 })
      await page.evaluate(`document.documentElement.style.fontSize = '${size}'`)
      for (const place of ['Ladder', 'Family']) {
        await page.getByRole('tab', { name: place, exact: true }).click()
        await page.getByRole('status').filter({ hasText: 'Working out' }).waitFor({ state: 'detached' })
        const overflow = await page.evaluate('document.documentElement.scrollWidth - document.documentElement.clientWidth')
        await page.screenshot({ path: `artifacts/window-four-${place}-${width}.png` })
        expect({ width, size, place, overflow }).toEqual({ width, size, place, overflow: 0 })
      }
    }
    await page.evaluate("document.documentElement.style.fontSize = ''")
    await page.setViewportSize({ width: 1600, height: 1000 })
  })

  test('climbs a ladder over time, its occasions proposed from the columns that follow', async () => {
    const folder = temporaryFolder()
    try {
      writeFileSync(join(folder.path, 'calm.csv'), twoOccasions())
      writeFileSync(join(folder.path, 'plan.yaml'), overTime)
      await host.ask('openPlan', { path: join(folder.path, 'plan.yaml') })
      await page.reload()
      await page.getByRole('button', { name: 'New ladder' }).first().click()
      const dialog = page.getByRole('dialog')
      await dialog.getByLabel('Name', { exact: true }).fill('Over the winter')
      await dialog.getByLabel('Invariance over time').check()
      expect(await dialog.getByLabel('read at occasion 2').inputValue()).toBe('read again')
      await dialog.getByLabel('Name of occasion 2').fill('winter')
      await dialog.getByLabel('walk at occasion 2').selectOption('')
      expect(await dialog.getByRole('button', { name: 'Add ladder' }).isDisabled()).toBe(true)
      await dialog.getByLabel('walk at occasion 2').selectOption('walk again')
      expect(await seriousProblems(page)).toEqual([])
      await takePictures(page, 'window-over-time')
      await dialog.getByRole('button', { name: 'Add ladder' }).click()
      await dialog.waitFor({ state: 'detached' })
      await page.getByRole('button', { name: /^Fit \d+ drafts$/ }).click()
      await expect.poll(() => page.getByTestId('step').count(), { timeout: patience }).toBe(2)
      expect(await rungNames()).toEqual(['scalar', 'metric', 'configural'].map((level) => `Calm, ${level} over time`))
      await takePictures(page, 'window-over-time-climbed')
    } finally {
      folder.remove()
    }
  })

  test('saw no fault, no warning and no request to another machine', () => {
    expect(faults).toEqual([])
  })

  /** The dialog of the one step that can be searched. */
  async function openRelease(): Promise<Locator> {
    await page.getByRole('button', { name: /^Find what to release/ }).click()
    return page.getByRole('dialog')
  }
  function stepTo(rung: string): Locator {
    return page.getByRole('listitem', { name: new RegExp(`^Step from .* to ${rung}$`) })
  }
  function rungNames(): Promise<(string | null)[]> {
    return page.getByTestId('rung').evaluateAll((all) => all.map((rung) => rung.getAttribute('data-name')))
  }
  function candidate(name: string): Locator {
    return page.getByTestId('candidate').filter({ has: page.getByText(name, { exact: true }) })
  }
})
