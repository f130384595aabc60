import { describe, expect, test } from 'vitest'
import { type Estimation, type Rules, rulesSchema } from '../study/study.ts'
import { handMadeResult } from './testing/hand-made-result.ts'
import { studyText } from './text-ladder.ts'
import { textWidth } from './text-lines.ts'

const estimation: Estimation = {
  method: 'maximum likelihood',
  convention: 'normal',
  statistic: 'normal theory',
  missing: 'complete cases',
  standardErrors: 'expected'
}
const rules: Rules = rulesSchema.parse({ changeInFit: { cfi: -0.01 }, decideBy: 'both' })

function text(change: (result: ReturnType<typeof handMadeResult>) => void = () => {}, width?: number): string {
  const result = handMadeResult()
  change(result)
  return studyText({ result, estimation, rules, ...(width === undefined ? {} : { width }) })
}

/** The part of `whole` from the first line that contains `start`. */
function from(whole: string, start: string): string {
  return whole.slice(whole.indexOf(start))
}

describe('the printed ladder', () => {
  test('stands top rung first, with its steps between', () => {
    const order = ['Intercepts equal', 'intercepts equal across', 'Loadings equal', 'loadings equal across', 'Same pattern']
    const places = order.map((words) => text().indexOf(words))
    expect(places).toEqual([...places].sort((a, b) => a - b))
    expect(places).not.toContain(-1)
  })

  test('says N, the groups and the cases lost before anything else', () => {
    expect(text()).toContain('N = 601 (304 Bow, 297 Stern), 3 indicators; 6 cases of 607 lost to missing')
  })

  test('states the rules that decide', () => {
    expect(text()).toContain('Rules: alpha .05, Holm over a ladder, decided by both; change in fit: CFI -.01.')
  })

  test('marks the rung to stand on, and no other', () => {
    const marked = text()
      .split('\n')
      .filter((line) => line.startsWith(' stand'))
    expect(marked).toEqual([' stand ┣━━━ Loadings equal (planned)'])
  })

  test('marks nothing when the bottom rung has no solution', () => {
    expect(text((result) => (result.ladders[0]!.standHere = null))).not.toContain('stand ')
  })

  test('gives a step its verdict, cost, critical value, both p-values and differences', () => {
    const step = from(text(), 'step: intercepts')
    expect(step).toContain('Verdict: does not hold')
    expect(step).toMatch(/Delta T 51\.73 on 12 df\s+critical 23\.34\s+p < \.001\s+Holm p < \.001/)
    expect(step).toContain('Delta CFI -.022')
    expect(step).toContain('Delta T 51.73 on 12 df exceeds 23.34')
  })

  test('draws the cost on a scale whose middle is the critical value', () => {
    const gauges = text()
      .split('\n')
      .filter((line) => line.includes(' 0 '))
      .map((line) => from(line, '0 '))
    expect(gauges).toEqual([`0 ${'='.repeat(20)}|${'='.repeat(20)}>`, `0 ${'='.repeat(11)}${'·'.repeat(9)}|${'·'.repeat(20)}`])
  })

  test('says why there is no test', () => {
    const words = text((result) => {
      Object.assign(result.ladders[0]!.steps[1]!, {
        verdict: 'no test',
        noTest: 'not nested',
        relation: 'not nested',
        proof: 'refit',
        difference: null
      })
    })
    expect(words).toContain('Verdict: no test: not nested   (not nested, shown by refitting)')
  })

  test('puts a candidate that is on no ladder beside them, with why it has no numbers', () => {
    const beside = from(text(), 'Beside the ladders')
    expect(beside).toContain('One worry (added after results)')
    expect(beside).toMatch(/Not converged: the largest gradient/)
    expect(beside).not.toContain('Same pattern')
  })

  test('prints the weights of information criteria with every fitted candidate', () => {
    expect(text().match(/AIC 21406\.3 \(weight \.250\)/g)).toHaveLength(3)
    expect(text().match(/\(weight < \.001\)/g)).toHaveLength(3)
  })

  test('prints the cautions of the data and of each fit', () => {
    expect(text()).toContain('! 6 cases in Bow have a missing answer.')
    expect(text().replace(/\n\s*┃\s*/g, ' ')).toContain('! The residual variance of queue is negative (-0.31) in Bow.')
  })

  test('warns of tests of exact fit at both ends of the sample size, and is quiet between', () => {
    const sized = (n: number) => text((result) => (result.data.groups = [{ name: null, n, complete: n }]))
    expect(sized(5000)).toContain('nearly every test of exact fit')
    expect(sized(80)).toContain('N under about 100')
    expect(sized(500)).not.toMatch(/nearly every|under about/)
  })

  test.each([80, 72, 60])('never leaves %i columns, whatever the names', (width) => {
    const words = text((result) => {
      const long =
        'Überlange Bezeichnung mit sehr vielen Worten und-einem-Wort-das-kein-Ende-nehmen-will-und-weitergeht 測定モデル'.repeat(2)
      result.study = long
      result.candidates[1]!.name = long
      result.ladders[0]!.rungs[1] = long
      result.ladders[0]!.steps[0]!.because = long
    }, width)
    expect(Math.max(...words.split('\n').map(textWidth))).toBeLessThanOrEqual(width)
  })

  test('lets no control character of a name through to the terminal', () => {
    const words = text((result) => (result.study = 'Red \u001b[31m and \u0007 bell\nnext'))
    expect(words.replaceAll('\n', '')).not.toMatch(/\p{Cc}/u)
  })
})
