/**
 * A result invented by hand, for tests of what prints it: three rungs, one step that holds and one that does not, one candidate
 * that failed and stands beside the ladder. Its numbers only have to look like numbers.
 */
import type { CandidateResult, StepResult, StudyResult } from '../../study/result.ts'

export function handMadeResult(): StudyResult {
  return {
    study: 'Ferry crossing, spring round',
    program: { name: 'rungwise', version: '0.0.0' },
    data: {
      digest: `sha256:${'0'.repeat(64)}`,
      indicators: ['waves', 'queue', 'deck'],
      groups: [
        { name: 'Bow', n: 310, complete: 304 },
        { name: 'Stern', n: 297, complete: 297 }
      ],
      missing: { values: 0, cases: 0, patterns: [] },
      normality: null,
      cautions: [{ code: 'missing', message: '6 cases in Bow have a missing answer.', cell: null }]
    },
    candidates: [
      candidate('Same pattern', { T: 78.21, df: 72, p: 0.288 }),
      candidate('Loadings equal', { T: 90.04, df: 84, p: 0.306 }),
      candidate('Intercepts equal', {
        T: 141.77,
        df: 96,
        p: 0.002,
        cautions: [
          {
            code: 'negative-residual-variance',
            message: 'The residual variance of queue is negative (-0.31) in Bow.',
            cell: ['queue']
          }
        ]
      }),
      candidate('One worry', {
        state: 'not converged',
        reason: 'the largest gradient stayed at 0.02 after 500 steps',
        origin: 'added after results',
        T: null,
        p: null
      })
    ],
    ladders: [
      {
        name: 'Across decks',
        rungs: ['Same pattern', 'Loadings equal', 'Intercepts equal'],
        standHere: 'Loadings equal',
        steps: [
          step('Same pattern', 'Loadings equal', { adds: 'loadings equal across decks' }),
          step('Loadings equal', 'Intercepts equal', {
            adds: 'intercepts equal across decks',
            difference: {
              T: 51.73,
              df: 12,
              p: 7e-7,
              holmP: 1.4e-6,
              method: 'normal theory',
              scaling: null,
              rmsea: { estimate: 0.02, lower: 0, upper: 0.05 },
              critical: 23.34
            },
            deltaCfi: -0.0222,
            verdict: 'does not hold',
            because: 'Delta T 51.73 on 12 df exceeds 23.34 (Holm p < .001, alpha .05).'
          })
        ]
      }
    ]
  }
}

function candidate(name: string, own: Partial<CandidateResult>): CandidateResult {
  return {
    name,
    origin: 'planned',
    from: null,
    sentence: `${name}: a sentence.`,
    sameAs: [],
    aicWeight: 0.25,
    bicWeight: 0.0001,
    state: 'fitted',
    reason: null,
    T: 1,
    df: 1,
    p: 0.5,
    scaled: null,
    parameters: 30,
    n: 601,
    groups: 2,
    minimum: 0.1,
    logLikelihood: -1000,
    unrestrictedLogLikelihood: -990,
    baseline: { T: 500, df: 36 },
    aic: 21_406.34,
    bic: 21_661.5,
    adjustedBic: 21_500,
    ecvi: 0.4,
    cfi: 0.9721,
    tli: 0.966,
    mcdonald: 0.96,
    gammaHat: 0.98,
    rmsea: { estimate: 0.04, lower: 0.024, upper: 0.053, closeFitP: 0.8, notCloseFitP: 0 },
    srmr: 0.031,
    srmrWithMeans: 0.032,
    plugIn: null,
    bounds: [],
    standardErrors: 'expected',
    estimates: [],
    residuals: null,
    cautions: [],
    convergence: { iterations: 9, largestGradient: 1e-10, starts: 1, minima: 1, tried: [] },
    ...own
  }
}

function step(from: string, to: string, own: Partial<StepResult>): StepResult {
  return {
    from,
    to,
    adds: '',
    relation: 'nested',
    proof: 'constraints',
    difference: {
      T: 11.83,
      df: 12,
      p: 0.46,
      holmP: 0.46,
      method: 'normal theory',
      scaling: null,
      rmsea: { estimate: 0.02, lower: 0, upper: 0.05 },
      critical: 21.03
    },
    deltaCfi: 0.0003,
    deltaRmsea: -0.001,
    deltaSrmr: 0.002,
    deltaMcdonald: null,
    deltaGammaHat: null,
    deltaAic: -12.17,
    deltaBic: -60.1,
    verdict: 'holds',
    notNested: null,
    noTest: null,
    because: 'Delta T 11.83 on 12 df stays below 21.03 (Holm p = .460, alpha .05).',
    ...own
  }
}
