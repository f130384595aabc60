/**
 * A small invented study for the tests of this folder and of the operations: data, plan, outcomes. No statistics.
 */
import { digestOf } from '../importing/digest.ts'
import { candidateSchema, type DataSet, type Plan, planSchema } from '../study/study.ts'
import type { FitOutcome } from '../workers/jobs.ts'

/** A clock that moves on by one second at every look, from the first of March 2031. */
export function tickingClock(): () => Date {
  let time = Date.UTC(2031, 2, 1, 9)
  return () => {
    time += 1000
    return new Date(time)
  }
}

export function smallPlan(changes: Partial<Plan> = {}): Plan {
  const plan = planSchema.parse({
    study: 'Evening noise',
    data: { kind: 'file', file: 'noise.csv', indicators: ['hum', 'rattle', 'whistle', 'thud'], group: null },
    estimation: {},
    candidates: [
      { name: 'One noise', factors: [{ name: 'Noise', measures: ['hum', 'rattle', 'whistle', 'thud'] }] },
      {
        name: 'One noise, even',
        from: 'One noise',
        change: [
          {
            do: 'equal',
            cells: [
              { part: 'loading', of: ['hum', 'Noise'] },
              { part: 'loading', of: ['rattle', 'Noise'] }
            ]
          }
        ]
      }
    ],
    ladders: [{ name: 'Evenness', rungs: ['One noise', 'One noise, even'] }],
    rules: {}
  })
  return { ...plan, ...changes }
}

export const furtherCandidate = candidateSchema.parse({
  name: 'Two noises',
  factors: [
    { name: 'Low', measures: ['hum', 'thud'] },
    { name: 'High', measures: ['rattle', 'whistle'] }
  ]
})

/** Three rows of four values, one of them missing, one of them a number that decimal text shortens. */
export function smallData(): DataSet {
  const values = Float64Array.from([1, 2.5, 0.1 + 0.2, 4, Number.NaN, 1 / 3, -7e-300, 2, 3, 2, 1, 1e17])
  const content = {
    kind: 'rows' as const,
    indicators: ['hum', 'rattle', 'whistle', 'thud'],
    grouping: null,
    groups: [{ name: null, n: 3, values }]
  }
  return {
    ...content,
    digest: digestOf(content),
    source: 'noise.csv',
    cautions: [{ code: 'some', message: 'A caution.', cell: ['hum'] }]
  }
}

export function smallOutcome(changes: Partial<FitOutcome['fit']> = {}): FitOutcome {
  const none = null
  const fit: FitOutcome['fit'] = {
    state: 'fitted',
    reason: none,
    T: 12.345678901234567,
    df: 2,
    p: 0.1 / 3,
    scaled: none,
    parameters: 12,
    n: 3,
    groups: 1,
    minimum: -0,
    logLikelihood: none,
    unrestrictedLogLikelihood: none,
    baseline: none,
    aic: none,
    bic: none,
    adjustedBic: none,
    ecvi: none,
    cfi: none,
    tli: none,
    mcdonald: none,
    gammaHat: none,
    rmsea: { estimate: none, lower: none, upper: none, closeFitP: none, notCloseFitP: none },
    srmr: none,
    srmrWithMeans: none,
    plugIn: null,
    bounds: [],
    standardErrors: 'expected',
    estimates: [],
    residuals: none,
    cautions: [],
    convergence: { iterations: 4, largestGradient: 1e-12, starts: 1, minima: 1, tried: [] }
  }
  return { fit: { ...fit, ...changes }, gamma: [0.1, 1 / 3] }
}
