import { describe, expect, it } from 'vitest'
import type { CandidateResult } from '../study/result.ts'
import { type Rules, rulesSchema } from '../study/study.ts'
import { ladderResult, type StepGround } from './ladder-result.ts'

function side(name: string, T: number, df: number, more: Partial<CandidateResult> = {}): CandidateResult {
  return {
    name,
    origin: 'planned',
    from: null,
    sentence: '',
    sameAs: [],
    aicWeight: null,
    bicWeight: null,
    state: 'fitted',
    reason: null,
    T,
    df,
    p: 0.5,
    scaled: null,
    parameters: 50 - df,
    n: 500,
    groups: 1,
    minimum: T / 500,
    logLikelihood: -T / 2,
    unrestrictedLogLikelihood: 0,
    baseline: { T: 1000, df: 36 },
    aic: T + 2 * (50 - df),
    bic: T + 6 * (50 - df),
    adjustedBic: null,
    ecvi: null,
    cfi: 1 - Math.max(T - df, 0) / 964,
    tli: null,
    mcdonald: null,
    gammaHat: null,
    rmsea: { estimate: Math.sqrt(Math.max(0, T - df) / (df * 500)), lower: null, upper: null, closeFitP: null, notCloseFitP: null },
    srmr: 0.02 + T / 5000,
    srmrWithMeans: null,
    plugIn: null,
    standardErrors: 'expected',
    estimates: [],
    residuals: null,
    cautions: [],
    convergence: { iterations: 5, largestGradient: 1e-10, starts: 1, minima: 1, tried: [] },
    ...more
  }
}

function ground(lower: CandidateResult | null, upper: CandidateResult | null, more: Partial<StepGround> = {}): StepGround {
  return {
    from: lower?.name ?? 'lower',
    to: upper?.name ?? 'upper',
    lower,
    upper,
    adds: 'something',
    sameMoments: true,
    relation: { relation: 'nested', proof: 'constraints' },
    ...more
  }
}

const rules = (over: object = {}): Rules => rulesSchema.parse(over)
const cleared = side('a', 20, 20)

function step(upper: CandidateResult, over: object = {}, more: Partial<StepGround> = {}) {
  return ladderResult('l', ['a', 'b'], [ground(cleared, upper, more)], rules(over)).steps[0]!
}

describe('a verdict', () => {
  it('holds when the difference is not significant, and one then stands above', () => {
    const result = ladderResult('l', ['a', 'b'], [ground(cleared, side('b', 24, 22))], rules())
    expect(result.steps[0]).toMatchObject({ verdict: 'holds', noTest: null, relation: 'nested', proof: 'constraints' })
    expect(result.steps[0]!.because).toBe(
      'The chi-square difference is 4.00 on 2 df, p = .135, Holm p = .135: not significant at alpha = .05.'
    )
    expect(result.standHere).toBe('b')
  })

  it('does not hold when it is, and one stays below', () => {
    const result = ladderResult('l', ['a', 'b'], [ground(cleared, side('b', 40, 22))], rules())
    expect(result.steps[0]!.verdict).toBe('does not hold')
    expect(result.standHere).toBe('a')
  })

  it('follows the change in fit where the rules say so, whatever the test', () => {
    const upper = side('b', 28, 22)
    const changeInFit = { cfi: -0.01, rmsea: 0.03 }
    expect(step(upper, { decideBy: 'difference test', changeInFit }).verdict).toBe('does not hold')
    const byFit = step(upper, { decideBy: 'change in fit', changeInFit })
    expect(byFit.verdict).toBe('holds')
    expect(byFit.because).toContain("within the rules' thresholds")
    expect(step(upper, { decideBy: 'change in fit', changeInFit: { cfi: -0.001 } }).verdict).toBe('does not hold')
  })

  it('says that criteria disagree where both are asked and differ', () => {
    const disagreeing = step(side('b', 28, 22), { decideBy: 'both', changeInFit: { cfi: -0.01 } })
    expect(disagreeing.verdict).toBe('criteria disagree')
    expect(step(side('b', 80, 22), { decideBy: 'both', changeInFit: { cfi: -0.01 } }).verdict).toBe('does not hold')
    expect(step(side('b', 22, 22), { decideBy: 'both', changeInFit: { cfi: -0.01 } }).verdict).toBe('holds')
  })

  it('uses the adjusted p: a step significant alone may hold among several', () => {
    const a = side('a', 20, 20)
    const b = side('b', 24.4, 21)
    const c = side('c', 25, 22)
    const grounds = [ground(a, b), ground(b, c)]
    expect(ladderResult('l', ['a', 'b', 'c'], grounds, rules({ adjust: 'none' })).steps[0]!.verdict).toBe('does not hold')
    const adjusted = ladderResult('l', ['a', 'b', 'c'], grounds, rules({ adjust: 'holm' })).steps[0]!
    expect(adjusted.verdict).toBe('holds')
    expect(adjusted.difference!.T).toBeLessThan(adjusted.difference!.critical)
  })

  it('holds between equivalent candidates, without a test', () => {
    const result = step(side('b', 20, 20), {}, { relation: { relation: 'equivalent', proof: 'refit' } })
    expect(result).toMatchObject({ verdict: 'holds', difference: null, relation: 'equivalent', proof: 'refit' })
    expect(result.because).toContain('equivalent')
  })
})

describe('no test is made', () => {
  const cases: [string, CandidateResult | null, Partial<StepGround>, string][] = [
    [
      'of candidates that are not nested',
      side('b', 30, 22),
      { relation: { relation: 'not nested', proof: 'refit' } },
      'not nested'
    ],
    ['of a pair given upside down', side('b', 30, 22), { relation: { relation: 'reversed', proof: 'constraints' } }, 'upside down'],
    [
      'with a side that did not converge',
      side('b', 30, 22, { state: 'not converged', reason: 'It stopped.' }),
      { relation: null },
      'a side did not converge'
    ],
    [
      'with a side that is not identified',
      side('b', 30, 22, { state: 'not identified', reason: 'x' }),
      { relation: null },
      'a side is not identified'
    ],
    ['with a side not fitted yet', null, { relation: null }, 'not fitted yet'],
    ['across different data', side('b', 30, 22), { sameMoments: false, relation: null }, 'not the same data'],
    ['when the restricted model fits better, a sign of a local minimum', side('b', 10, 22), {}, 'a side stopped at a local minimum']
  ]
  for (const [what, upper, more, short] of cases) {
    it(what, () => {
      const result = ladderResult('l', ['a', 'b'], [ground(cleared, upper, more)], rules())
      expect(result.steps[0]).toMatchObject({ verdict: 'no test', noTest: short, difference: null })
      expect(result.steps[0]!.because.length).toBeGreaterThan(20)
      expect(result.standHere).toBe('a')
    })
  }

  it('still gives the differences of information criteria for a pair that is not nested', () => {
    const result = step(side('b', 30, 22), {}, { relation: { relation: 'not nested', proof: 'refit' } })
    expect(result.deltaAic).toBeCloseTo(6, 10)
  })
})

it('one stands nowhere when the bottom rung has no solution', () => {
  const failed = side('a', 0, 20, { state: 'not converged', T: null, reason: 'It stopped.' })
  expect(ladderResult('l', ['a', 'b'], [ground(failed, cleared, { relation: null })], rules()).standHere).toBeNull()
})

it('differences are the upper value less the lower', () => {
  const result = step(side('b', 40, 22))
  expect(result.deltaCfi!).toBeLessThan(0)
  expect(result.deltaRmsea!).toBeGreaterThan(0)
  expect(result.deltaAic!).toBeCloseTo(40 - 20 - 4, 10)
})
