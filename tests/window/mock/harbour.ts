/** A hand-made study for looking at the window without the program behind it; every figure is invented. */
import type {
  Candidate,
  CandidateResult,
  CandidateView,
  EstimateResult,
  LadderResult,
  Origin,
  ScoreTestView,
  StepResult,
  StudyView
} from '../../../src-main/operations/contract.ts'

const indicators = ['sleep', 'fatigue', 'appetite', 'worry', 'low spirits', 'irritability', 'calls', 'visits', 'outings']
const clinics = ['Harbour', 'Meadow', 'Quay']
const burdens = [
  { name: 'Rest', measures: indicators.slice(0, 3) },
  { name: 'Mood', measures: indicators.slice(3, 6) },
  { name: 'Company', measures: indicators.slice(6, 9) }
]

function candidate(name: string, over: Partial<Candidate>): Candidate {
  return {
    name,
    from: null,
    factors: null,
    scaling: null,
    factorCovariances: null,
    across: null,
    equalAcrossGroups: null,
    except: [],
    change: [],
    ...over
  }
}

interface Figures {
  T: number
  df: number
  p: number
  cfi: number
  rmsea: [number, number, number]
  srmr: number
  aic: number
  bic: number
  q: number
}

function entry(
  value: Candidate,
  sentence: string,
  figures: Figures | null,
  origin: Origin = 'planned',
  generated = false
): CandidateView {
  return {
    candidate: value,
    state: figures === null ? 'draft' : 'fitted',
    origin,
    generated,
    sentence,
    parameters: figures?.q ?? 30,
    df: figures?.df ?? 26
  }
}

function estimates(groups: (string | null)[]): EstimateResult[] {
  const loadings = [1, 0.914, 0.702, 1, 1.127, 0.861, 1, 0.755, 0.948]
  return groups.flatMap((group, g) => [
    ...indicators.map((name, i): EstimateResult => {
      const free = i % 3 !== 0
      const of = [name, burdens[Math.floor(i / 3)]!.name]
      const value = loadings[i]! + (free ? 0.012 * g : 0)
      return {
        part: 'loading',
        group,
        of,
        free,
        label: free && groups.length > 1 ? 'a' + i : null,
        estimate: value,
        standardError: free ? 0.043 + 0.003 * i : null,
        lower: free ? value - 0.1 : null,
        upper: free ? value + 0.1 : null,
        standardized: 0.62 + 0.03 * (i % 4),
        standardizedError: 0.03
      }
    }),
    ...indicators.map((name, i): EstimateResult => {
      const value = 0.41 + 0.07 * ((i * 5) % 4)
      return {
        part: 'residual variance',
        group,
        of: [name],
        free: true,
        label: null,
        estimate: value,
        standardError: 0.031,
        lower: value - 0.06,
        upper: value + 0.06,
        standardized: 0.5,
        standardizedError: 0.03
      }
    }),
    ...[0, 1, 2].map((k): EstimateResult => {
      const of = [burdens[k]!.name, burdens[(k + 1) % 3]!.name]
      return {
        part: 'factor covariance',
        group,
        of,
        free: true,
        label: null,
        estimate: 0.22 - 0.17 * k,
        standardError: 0.041,
        lower: 0.14 - 0.17 * k,
        upper: 0.3 - 0.17 * k,
        standardized: 0.41 - 0.3 * k,
        standardizedError: 0.06
      }
    })
  ])
}

function result(view: CandidateView, f: Figures, weight: number): CandidateResult {
  const groups = view.candidate.across === null ? [null] : clinics
  const lower = (g: number): number[][] =>
    indicators.map((_, i) => Array.from({ length: i + 1 }, (__, j) => (i === j ? 0 : (((i * 7 + j * 13 + g * 5) % 19) - 9) / 70)))
  return {
    name: view.candidate.name,
    origin: view.origin,
    from: view.candidate.from,
    sentence: view.sentence,
    sameAs: [],
    aicWeight: weight,
    bicWeight: weight,
    state: 'fitted',
    reason: null,
    T: f.T,
    df: f.df,
    p: f.p,
    scaled: null,
    parameters: f.q,
    n: 912,
    groups: groups.length,
    minimum: f.T / 912,
    logLikelihood: -f.aic / 2 + f.q,
    unrestrictedLogLikelihood: -f.aic / 2 + f.q + f.T / 2,
    baseline: { T: 2671.4, df: 36 * groups.length },
    aic: f.aic,
    bic: f.bic,
    adjustedBic: f.bic - 90,
    ecvi: 0.143,
    cfi: f.cfi,
    tli: f.cfi - 0.004,
    mcdonald: 0.981,
    gammaHat: 0.988,
    rmsea: { estimate: f.rmsea[0], lower: f.rmsea[1], upper: f.rmsea[2], closeFitP: 0.871, notCloseFitP: 0.00002 },
    srmr: f.srmr,
    srmrWithMeans: f.srmr,
    plugIn: null,
    bounds: [],
    standardErrors: 'expected',
    estimates: estimates(groups),
    residuals: groups.map((group, g) => ({ group, lower: lower(g) })),
    cautions:
      view.candidate.name === 'One burden'
        ? [
            {
              code: 'x',
              message: 'The residual variance of worry is negative (−0.021): the solution is improper.',
              cell: ['worry']
            }
          ]
        : [],
    convergence: {
      iterations: 9,
      largestGradient: 2e-10,
      starts: 1,
      minima: 1,
      tried: [{ start: 'ordinary', stop: 'converged', minimum: f.T / 912, iterations: 9 }]
    }
  }
}

const figures: Record<string, Figures> = {
  'One burden': {
    T: 412.9,
    df: 27,
    p: 1e-70,
    cfi: 0.851,
    rmsea: [0.125, 0.114, 0.136],
    srmr: 0.081,
    aic: 21988.4,
    bic: 22118.4,
    q: 27
  },
  'Two burdens': {
    T: 181.06,
    df: 26,
    p: 1e-25,
    cfi: 0.94,
    rmsea: [0.081, 0.07, 0.092],
    srmr: 0.052,
    aic: 21758.6,
    bic: 21893.4,
    q: 28
  },
  'Three burdens': {
    T: 31.42,
    df: 24,
    p: 0.142,
    cfi: 0.997,
    rmsea: [0.018, 0, 0.035],
    srmr: 0.021,
    aic: 21612.9,
    bic: 21757.4,
    q: 30
  },
  'Same pattern': {
    T: 78.21,
    df: 72,
    p: 0.288,
    cfi: 0.993,
    rmsea: [0.017, 0, 0.037],
    srmr: 0.028,
    aic: 21390.7,
    bic: 21761.4,
    q: 90
  },
  'Loadings equal': {
    T: 90.04,
    df: 84,
    p: 0.306,
    cfi: 0.993,
    rmsea: [0.016, 0, 0.035],
    srmr: 0.036,
    aic: 21378.5,
    bic: 21691.4,
    q: 78
  },
  'Two intercepts released': {
    T: 99.31,
    df: 94,
    p: 0.334,
    cfi: 0.994,
    rmsea: [0.014, 0, 0.033],
    srmr: 0.037,
    aic: 21367.8,
    bic: 21632.6,
    q: 68
  },
  'Intercepts equal': {
    T: 141.77,
    df: 96,
    p: 0.0017,
    cfi: 0.972,
    rmsea: [0.04, 0.024, 0.053],
    srmr: 0.044,
    aic: 21406.3,
    bic: 21661.5,
    q: 66
  }
}

function step(
  from: string,
  to: string,
  adds: string,
  difference: { T: number; df: number; p: number; critical: number },
  deltas: [number, number],
  holds: boolean
): StepResult {
  return {
    from,
    to,
    adds,
    relation: 'nested',
    proof: 'constraints',
    difference: {
      ...difference,
      holmP: Math.min(1, difference.p * 2),
      method: 'normal theory',
      scaling: null,
      rmsea: { estimate: 0.02, lower: 0, upper: 0.05 }
    },
    deltaCfi: deltas[0],
    deltaRmsea: deltas[1],
    deltaSrmr: 0.008,
    deltaMcdonald: null,
    deltaGammaHat: null,
    deltaAic: -12.2,
    deltaBic: -70,
    verdict: holds ? 'holds' : 'does not hold',
    notNested: null,
    noTest: null,
    because: `The difference test gives ${difference.T} on ${difference.df} df, ${holds ? 'below' : 'above'} the critical value ${difference.critical} at alpha .05 after Holm's adjustment.`
  }
}

const ladders: LadderResult[] = [
  {
    name: 'Across clinics',
    rungs: ['Same pattern', 'Loadings equal', 'Two intercepts released', 'Intercepts equal'],
    standHere: 'Two intercepts released',
    steps: [
      step(
        'Same pattern',
        'Loadings equal',
        'loadings, all clinics',
        { T: 11.83, df: 12, p: 0.46, critical: 21.03 },
        [0.0, -0.001],
        true
      ),
      step(
        'Loadings equal',
        'Two intercepts released',
        'the other intercepts, all clinics',
        { T: 9.27, df: 10, p: 0.507, critical: 18.31 },
        [0.001, -0.002],
        true
      ),
      step(
        'Two intercepts released',
        'Intercepts equal',
        'intercepts of sleep and appetite in Quay',
        { T: 42.46, df: 2, p: 6e-10, critical: 5.99 },
        [-0.022, 0.026],
        false
      )
    ]
  },
  {
    name: 'Structure',
    rungs: ['Three burdens', 'Two burdens', 'One burden'],
    standHere: 'Three burdens',
    steps: [
      step(
        'Three burdens',
        'Two burdens',
        'Mood and Company are one factor',
        { T: 149.64, df: 2, p: 1e-30, critical: 5.99 },
        [-0.057, 0.063],
        false
      ),
      {
        ...step('Two burdens', 'One burden', 'Rest joins them', { T: 3.9, df: 1, p: 0.048, critical: 3.84 }, [-0.089, 0.044], true),
        verdict: 'criteria disagree'
      }
    ]
  }
]

/** A fresh copy of the study as if just fitted. */
export function harbourStudy(): StudyView {
  const across = { across: 'clinic' }
  const candidates = [
    entry(
      candidate('One burden', { factors: [{ name: 'Burden', measures: indicators }] }),
      'One factor, Burden, of all nine items.',
      figures['One burden']!
    ),
    entry(candidate('Two burdens', { factors: burdens.slice(0, 2) }), 'Two factors.', figures['Two burdens']!),
    entry(
      candidate('Three burdens', { factors: burdens }),
      'Three factors: Rest, Mood, Company, three items each.',
      figures['Three burdens']!
    ),
    entry(
      candidate('Same pattern', { from: 'Three burdens', ...across }),
      'the same pattern in every clinic.',
      figures['Same pattern']!,
      'planned',
      true
    ),
    entry(
      candidate('Loadings equal', { from: 'Same pattern', ...across }),
      'all loadings equal.',
      figures['Loadings equal']!,
      'planned',
      true
    ),
    entry(
      candidate('Two intercepts released', { from: 'Loadings equal', ...across }),
      'all intercepts equal but sleep and appetite in Quay.',
      figures['Two intercepts released']!,
      'added after results'
    ),
    entry(
      candidate('Intercepts equal', { from: 'Loadings equal', ...across }),
      'all intercepts equal.',
      figures['Intercepts equal']!,
      'planned',
      true
    )
  ]
  const groups = [304, 297, 311].map((n, g) => ({ name: clinics[g]!, n, complete: n - 4 }))
  const weights = [0, 0, 0.0002, 0.004, 0.12, 0.88, 0]
  return {
    study: 'Harbour clinics, intake 2031',
    file: null,
    rulesOpen: false,
    estimation: {
      method: 'maximum likelihood',
      convention: 'normal',
      statistic: 'normal theory',
      missing: 'complete cases',
      standardErrors: 'expected'
    },
    rules: { alpha: 0.05, adjust: 'holm', changeInFit: null, decideBy: 'difference test', scaledDifference: 'ordinary' },
    data: { source: 'harbour.csv', indicators, grouping: 'clinic', groups, missing: 14, cautions: [] },
    candidates,
    ladders: [
      { name: 'Structure', rungs: ['Three burdens', 'Two burdens', 'One burden'] },
      { name: 'Across clinics', invarianceOf: 'Three burdens', across: 'clinic', through: 'scalar' }
    ],
    result: {
      study: 'Harbour clinics, intake 2031',
      program: { name: 'rungwise', version: '0.1.0' },
      data: {
        digest: 'sha256:00',
        indicators,
        groups,
        missing: {
          values: 14,
          cases: 12,
          patterns: [
            { answered: indicators, n: 900 },
            { answered: indicators.filter((name) => name !== 'calls'), n: 10 },
            { answered: indicators.slice(0, 7), n: 2 }
          ]
        },
        normality: {
          sentence: 'Multivariate kurtosis does not depart detectably from that of normal data.',
          groups: clinics.map((group, g) => ({
            group,
            n: 300 - g,
            skewness: { value: 3.4 + 0.2 * g, chiSquare: 171.2, df: 165, p: 0.354 },
            kurtosis: { value: 98.1 + 0.3 * g, expected: 98.3, z: -0.12, p: 0.904 },
            indicators: indicators.map((name, i) => ({ name, skewness: 0.1 - 0.05 * (i % 5), kurtosis: -0.2 + 0.07 * (i % 4) }))
          }))
        },
        cautions: []
      },
      candidates: candidates.map((view, i) => result(view, figures[view.candidate.name]!, weights[i]!)),
      ladders
    },
    decisions: [],
    trail: {
      intact: true,
      entries: Array.from({ length: 38 }, (_, i) => ({
        number: i + 1,
        at: `2031-03-12T09:${String(10 + Math.floor(i / 2)).padStart(2, '0')}:00Z`,
        what: 'candidate fitted',
        sentence:
          i === 37 ? 'Candidate derived: Two intercepts released' : `Candidate fitted: ${candidates[i % 7]!.candidate.name}`,
        digest: `sha256:${(i * 7919).toString(16).padStart(12, '4')}`
      }))
    }
  }
}

/** Score tests as invented as the rest: an equality in every clinic, and one residual covariance. */
export function harbourScoreTests(name: string): ScoreTestView[] {
  const base = { p: 0.012, change: 0.21, expectedValue: 1.12, standardizedChange: 0.14 }
  const equalities = clinics.map(
    (group, g): ScoreTestView => ({
      ...base,
      kind: 'equality',
      part: 'loading',
      of: ['fatigue', 'Rest'],
      group,
      label: 'a1',
      words: `the loading of fatigue on Rest in ${group}`,
      statistic: 6.3 - g,
      plausibility: 'stated'
    })
  )
  const fixed: ScoreTestView = {
    ...base,
    kind: 'fixed cell',
    part: 'residual covariance',
    of: ['sleep', 'worry'],
    group: null,
    label: null,
    words: 'the residual covariance of sleep with worry',
    statistic: 11.4,
    plausibility: 'far'
  }
  return ['Loadings equal', 'Intercepts equal'].includes(name) ? [...equalities, fixed] : [fixed]
}
