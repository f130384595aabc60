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
    bounds: [],
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
      'The chi-square difference is 4.00 on 2 df, p = .135, Holm p = .135: not significant at alpha = .05. RMSEA of the difference .045 [.000, .109].'
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
    expect(byFit.because).toContain('within the thresholds of the rules')
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

  it('holds where the upper rung only adds bounds that are not reached, and is refused where they cost fit', () => {
    const loose = step(side('b', 20, 20))
    expect(loose).toMatchObject({ verdict: 'holds', difference: null, relation: 'nested' })
    expect(loose.because).toBe(
      'b differs from a by bounds alone, and these data do not press against them: both have the same fit, so nothing is given up.'
    )
    const tight = step(side('b', 23.214, 20))
    expect(tight).toMatchObject({ verdict: 'no test', noTest: 'only bounds differ', difference: null })
    expect(tight.because).toBe(
      'b differs from a by bounds alone: they take no degrees of freedom and raise T by 3.21, a difference that no chi-square difference test applies to.'
    )
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

it('one stands on a single rung where it has a solution, and nowhere where it has none', () => {
  const failed = side('a', 0, 20, { state: 'not identified', T: null, reason: 'x' })
  expect(ladderResult('l', ['a'], [], rules(), cleared).standHere).toBe('a')
  expect(ladderResult('l', ['a'], [], rules(), failed).standHere).toBeNull()
  expect(ladderResult('l', ['a'], [], rules()).standHere).toBeNull()
})

it('differences are the upper value less the lower', () => {
  const result = step(side('b', 40, 22))
  expect(result.deltaCfi!).toBeLessThan(0)
  expect(result.deltaRmsea!).toBeGreaterThan(0)
  expect(result.deltaAic!).toBeCloseTo(40 - 20 - 4, 10)
})

describe('the test that is valid for the very pair', () => {
  const scaled = (T: number, scaling: number) => ({
    scaled: { T: T / scaling, p: 0.5, scaling, form: 'Satorra & Bentler 1994' }
  })

  it('is the scaled difference where both statistics are scaled: c_d = (22 x 1.2 - 20 x 1.1) / 2 = 2.2 by hand', () => {
    const lower = side('a', 20, 20, scaled(20, 1.1))
    const upper = side('b', 31, 22, scaled(31, 1.2))
    const { difference } = ladderResult('l', ['a', 'b'], [ground(lower, upper)], rules()).steps[0]!
    expect(difference).toMatchObject({ method: 'scaled', df: 2 })
    expect(difference!.scaling).toBeCloseTo(2.2, 12)
    expect(difference!.T).toBeCloseTo(5, 12)
  })

  it('is the strictly positive form where the first is not defined, or where the rules ask for it', () => {
    const lower = side('a', 20, 20, scaled(20, 1.4))
    const upper = side('b', 31, 22, scaled(31, 1.2))
    const withScaling = ground(lower, upper, { scalingAtUpper: 1.1 })
    expect(ladderResult('l', ['a', 'b'], [withScaling], rules()).steps[0]!.difference).toMatchObject({
      method: 'strictly positive scaled',
      df: 2
    })
    const asked = ladderResult(
      'l',
      ['a', 'b'],
      [ground(side('a', 20, 20, scaled(20, 1.1)), upper, { scalingAtUpper: 1.15 })],
      rules({ scaledDifference: 'strictly positive' })
    )
    expect(asked.steps[0]!.difference!.method).toBe('strictly positive scaled')
    expect(ladderResult('l', ['a', 'b'], [ground(lower, upper)], rules()).steps[0]!.verdict).toBe('no test')
  })

  it('is a mixture on the boundary: half of the usual p for one parameter, said in words', () => {
    const parts = [
      { df: 0, weight: 0.5 },
      { df: 1, weight: 0.5 }
    ]
    const boundary = { words: 'A and B become one factor', parts, beyond: false }
    const upper = side('b', 23, 21)
    const plain = ladderResult('l', ['a', 'b'], [ground(cleared, upper)], rules()).steps[0]!
    const mixed = ladderResult('l', ['a', 'b'], [ground(cleared, upper, { boundary })], rules()).steps[0]!
    expect(mixed.difference!.p).toBeCloseTo(plain.difference!.p / 2, 12)
    expect(mixed.difference!.method).toBe('boundary mixture')
    // 2.706 is the .10 point of chi-square on 1 df (any table).
    expect(mixed.difference!.critical).toBeCloseTo(2.706, 3)
    expect([plain.verdict, mixed.verdict]).toEqual(['holds', 'does not hold'])
    expect(mixed.because).toContain('A and B become one factor')
    const beyond = ladderResult('l', ['a', 'b'], [ground(cleared, upper, { boundary: { ...boundary, beyond: true } })], rules())
      .steps[0]!
    expect([beyond.difference!.T, beyond.difference!.p, beyond.verdict]).toEqual([0, 1, 'holds'])
  })

  it('follows a published rule by its citation: Chen (2007) asks more of small samples and of intercepts', () => {
    const upper = side('b', 25, 22)
    const chen = { decideBy: 'change in fit', changeInFit: { preset: 'Chen 2007' } }
    const verdict = (sizes: number[], n: number) =>
      ladderResult(
        'l',
        ['a', 'b'],
        [ground(cleared, { ...upper, n, srmr: cleared.srmr! + 0.008 }, { sizes, addsLoadings: false })],
        rules(chen)
      ).steps[0]!
    expect(verdict([250, 250], 500).because).toContain('Chen 2007')
    expect(verdict([250, 250], 500).because).toContain('(at most +.010 asked)')
    expect(verdict([100, 100], 200).because).toContain('(at most +.005 asked)')
    expect(verdict([400, 100], 500).because).toContain('(at most +.005 asked)')
  })
})
