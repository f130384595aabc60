import { readFileSync } from 'node:fs'
import fc from 'fast-check'
import { describe, expect, it } from 'vitest'
import { parsePlan, writePlan } from './plan-file.ts'
import {
  type Candidate,
  type Change,
  cellPartSchema,
  type DataPlan,
  equalSets,
  estimationSchema,
  type Plan,
  rulesSchema
} from './study.ts'

const SMALL = 'study: s\ndata: { file: a.csv, indicators: [a, b, c] }\ncandidates:\n  One:\n    factors: { F: [a, b, c] }\n'

function fixture(name: string): Plan {
  return parsePlan(readFileSync(new URL(`../../fixtures/${name}/plan.yaml`, import.meta.url), 'utf8'), 'plan.yaml')
}

/** What a plan's candidate is when everything in it is left out. */
const PLAIN: Omit<Candidate, 'name'> = {
  from: null,
  factors: null,
  scaling: null,
  factorCovariances: null,
  across: null,
  equalAcrossGroups: null,
  except: [],
  change: []
}

describe('reading a plan', () => {
  it('takes the defaults of what is left out', () => {
    expect(parsePlan(SMALL, 'plan.yaml')).toEqual({
      study: 's',
      data: { kind: 'file', file: 'a.csv', indicators: ['a', 'b', 'c'], group: null, missingCodes: ['', 'NA'] },
      estimation: {
        method: 'maximum likelihood',
        convention: 'normal',
        statistic: 'normal theory',
        missing: 'complete cases',
        standardErrors: 'expected'
      },
      candidates: [{ ...PLAIN, name: 'One', factors: [{ name: 'F', measures: ['a', 'b', 'c'] }] }],
      ladders: [],
      rules: rulesSchema.parse({})
    })
  })

  it('keeps names as they are written where YAML would read another type', () => {
    const text = SMALL.replaceAll('[a, b, c]', '[01, yes, 1.50]').replace(
      'file: a.csv',
      'file: a.csv, missing codes: [NA, -99, null, ""]'
    )
    const { data } = parsePlan(text, 'plan.yaml')
    expect(data).toMatchObject({ indicators: ['01', 'yes', '1.50'], missingCodes: ['NA', '-99', 'null', ''] })
  })

  it('reads an optional key written as null as left out', () => {
    expect(parsePlan(SMALL.replace('file: a.csv', 'file: a.csv, group: null'), 'p').data).toMatchObject({ group: null })
  })

  it('follows an alias to what it stands for', () => {
    const text = SMALL.replace('[a, b, c] }', '&all [a, b, c] }').replace('F: [a, b, c]', 'F: *all')
    expect(parsePlan(text, 'p').candidates[0]?.factors).toEqual([{ name: 'F', measures: ['a', 'b', 'c'] }])
  })

  it('reads every form of change and exception', () => {
    const text = `study: s
data: { file: a.csv, indicators: [a, b, c, d], group: site }
candidates:
  Two:
    factors: { F: [a, b], G: [c, d] }
    across: site
    equal across groups: [loadings, intercepts]
    except:
      - { loading: [b, F], group: north }
      - { intercept: a }
    change:
      - free: { residual covariance: [a, c] }
        group: north
      - fix: { factor covariance: [F, G] }
        at: -0.5
      - equal: { residual variance: [a, b] }
      - equal: { loading: [[a, F], [b, F]] }
      - constrain:
          - { loading: [b, F] }
          - { loading: [d, G], times: -2 }
        to: 0.5
        group: north
      - constrain:
          - { intercept: b, times: 1, group: north }
          - { intercept: b, times: -1, group: south }
        to: 0
      - bound: { residual variance: a }
        at least: 0
      - bound: { factor covariance: [F, G] }
        at least: -1
        at most: 1
        group: south
`
    expect(parsePlan(text, 'p').candidates[0]).toMatchObject({
      except: [
        { cell: { part: 'loading', of: ['b', 'F'] }, group: 'north' },
        { cell: { part: 'intercept', of: ['a'] }, group: null }
      ],
      change: [
        { do: 'free', cell: { part: 'residual covariance', of: ['a', 'c'] }, group: 'north' },
        { do: 'fix', cell: { part: 'factor covariance', of: ['F', 'G'] }, at: -0.5, group: null },
        {
          do: 'equal',
          cells: [
            { part: 'residual variance', of: ['a'] },
            { part: 'residual variance', of: ['b'] }
          ],
          group: null
        },
        {
          do: 'equal',
          cells: [
            { part: 'loading', of: ['a', 'F'] },
            { part: 'loading', of: ['b', 'F'] }
          ],
          group: null
        },
        {
          do: 'constrain',
          terms: [
            { cell: { part: 'loading', of: ['b', 'F'] }, times: 1, group: null },
            { cell: { part: 'loading', of: ['d', 'G'] }, times: -2, group: null }
          ],
          to: 0.5,
          group: 'north'
        },
        {
          do: 'constrain',
          terms: [
            { cell: { part: 'intercept', of: ['b'] }, times: 1, group: 'north' },
            { cell: { part: 'intercept', of: ['b'] }, times: -1, group: 'south' }
          ],
          to: 0,
          group: null
        },
        { do: 'bound', cell: { part: 'residual variance', of: ['a'] }, atLeast: 0, atMost: null, group: null },
        { do: 'bound', cell: { part: 'factor covariance', of: ['F', 'G'] }, atLeast: -1, atMost: 1, group: 'south' }
      ]
    })
  })

  it('reads factors that measure factors', () => {
    const text = SMALL.replace('{ F: [a, b, c] }', '{ General: [F, G], F: [a, b], G: [b, c] }')
    expect(parsePlan(text, 'p').candidates[0]?.factors?.[0]).toEqual({ name: 'General', measures: ['F', 'G'] })
  })

  it('names line and column also for a name that is looked up later', () => {
    expect(() => parsePlan(`${SMALL}  Two:\n    from: Onne\n`, 'plan.yaml')).toThrow(
      'plan.yaml, line 7, column 11: "Two" is derived from "Onne", which is not a candidate. Did you mean "One"? The candidates are "One" and "Two".'
    )
  })

  it('takes errors from the observed information with full information, unless told otherwise', () => {
    const errors = (estimation: string) => parsePlan(`${SMALL}estimation: ${estimation}\n`, 'p').estimation.standardErrors
    expect(errors('{ missing: full information }')).toBe('observed')
    expect(errors('{ missing: full information, standard errors: expected }')).toBe('expected')
    expect(errors('{ statistic: mean-scaled }')).toBe('expected')
  })
})

describe('writing a plan', () => {
  it.each(['congeneric', 'iris', 'crabs', 'two-factors', 'sample'])('gives the plan of %s back', (name) => {
    const plan = fixture(name)
    expect(parsePlan(writePlan(plan), 'again.yaml')).toEqual(plan)
  })

  it('reads as a person would have written it', () => {
    expect(writePlan(fixture('congeneric'))).toContain(
      '      - fix: { factor covariance: [ Unhurried, Speeded ] }\n        at: 1\n'
    )
  })

  it('keeps each term of a constraint on a line', () => {
    const change = 'constrain: [{ loading: [b, F], times: 2 }, { loading: [c, F] }], to: 3'
    const text = `${SMALL}  Two: { from: One, change: [{ ${change} }, { bound: { residual variance: a }, at least: 0 }] }\n`
    expect(writePlan(parsePlan(text, 'p'))).toContain(
      [
        '      - constrain:',
        '          - { loading: [ b, F ], times: 2 }',
        '          - { loading: [ c, F ], times: 1 }',
        '        to: 3',
        '      - bound: { residual variance: a }',
        '        at least: 0\n'
      ].join('\n')
    )
  })

  it('gives any plan back', () => {
    fc.assert(
      fc.property(anyPlan(), (plan) => {
        expect(parsePlan(writePlan(plan), 'again.yaml')).toEqual(plan)
      }),
      { numRuns: 200, seed: 7 }
    )
  })
})

/** Names that YAML might trip over, and any other text. */
function names(count: number): fc.Arbitrary<string[]> {
  const tricky = fc.constantFrom(
    'NA',
    'yes',
    'null',
    '~',
    '1',
    '-99',
    '1e3',
    '0x1f',
    'a: b',
    '#x',
    '[x',
    '- y',
    '"q"',
    "it's",
    '<<',
    '*a',
    '&a',
    '!t',
    'é',
    'true',
    '.inf'
  )
  const name = fc.oneof(tricky, fc.string({ minLength: 1, maxLength: 12, unit: 'grapheme' })).map((text) => text.trim())
  return fc.uniqueArray(
    name.filter((text) => text !== ''),
    { minLength: count, maxLength: count }
  )
}

/** A plan of four indicators and two factors with a chain of derived candidates and ladders over them. */
function anyPlan(): fc.Arbitrary<Plan> {
  return fc
    .record({
      names: names(14),
      finite: fc.double({ noNaN: true, noDefaultInfinity: true }),
      variance: fc.double({ min: 0, max: 1e6, noNaN: true }),
      alpha: fc.double({ min: 1e-12, max: 0.999999, noNaN: true }),
      summary: fc.boolean(),
      several: fc.boolean(),
      means: fc.boolean(),
      correlation: fc.boolean(),
      codes: fc.array(fc.string({ maxLength: 5 }), { maxLength: 4 }),
      scaling: fc.constantFrom('first loading', 'factor variance', 'effects coding', null),
      covariances: fc.constantFrom('free', 'zero', null),
      sets: fc.subarray([...equalSets]),
      change: fc.constantFrom(null, {}, { cfi: -0.01 }, { rmsea: 0.015, srmr: 0.03 }),
      rule: fc.constantFrom('holm', 'none')
    })
    .map((draw) => {
      const [a, b, c, d, grouping, north, south, f, g, one, two, three, first, second] = draw.names as [string, ...string[]] &
        string[]
      const indicators = [a, b!, c!, d!]
      const grouped = !draw.summary || draw.several
      const hasMeans = !draw.summary || draw.means
      const sets = grouped ? draw.sets.filter((set) => hasMeans || (set !== 'intercepts' && set !== 'factor means')) : []
      const group = grouped ? north! : null
      const matrix = {
        lower: [[draw.correlation ? 1 : 2], [0.1, 1], [0.2, -0.3, 1], [0.25, 0, 1e-7, 1]],
        sd: draw.correlation ? [1, 2.5, 1e-9, 3] : null,
        mean: draw.means ? [draw.finite, 0, 1, -2] : null
      }
      const data: DataPlan = draw.summary
        ? {
            kind: 'summary',
            indicators,
            divisor: 'n-1',
            group: grouping!,
            groups: draw.several
              ? [north!, south!].map((name) => ({ name, n: 100, ...matrix }))
              : [{ name: null, n: 50, ...matrix }]
          }
        : { kind: 'file', file: first!, indicators, group: grouping!, missingCodes: draw.codes }
      const changes: Change[] = [
        { do: 'free', cell: { part: 'loading', of: [a, g!] }, group },
        { do: 'fix', cell: { part: 'factor covariance', of: [f!, g!] }, at: draw.finite, group: null },
        { do: 'fix', cell: { part: 'residual variance', of: [b!] }, at: draw.variance, group },
        {
          do: 'equal',
          cells: cellPartSchema.options
            .filter((part) => part === 'residual variance')
            .flatMap((part) => indicators.map((name) => ({ part, of: [name] }))),
          group: null
        },
        {
          do: 'equal',
          cells: [
            { part: 'residual covariance', of: [a, b!] },
            { part: 'residual covariance', of: [c!, d!] }
          ],
          group
        },
        {
          do: 'constrain',
          terms: [
            { cell: { part: 'loading', of: [b!, f!] }, times: draw.alpha, group },
            { cell: { part: 'residual covariance', of: [b!, c!] }, times: -1, group }
          ],
          to: draw.finite,
          group: null
        },
        { do: 'bound', cell: { part: 'residual variance', of: [d!] }, atLeast: null, atMost: draw.variance + 1, group },
        { do: 'bound', cell: { part: 'factor variance', of: [g!] }, atLeast: 0, atMost: draw.variance + 1, group: null }
      ]
      return {
        study: one!,
        data,
        estimation: estimationSchema.parse({ convention: draw.summary && !draw.means ? 'wishart' : 'normal' }),
        candidates: [
          {
            ...PLAIN,
            name: one!,
            factors: [
              { name: f!, measures: [a, b!] },
              { name: g!, measures: [c!, d!, a] }
            ],
            scaling: draw.scaling,
            factorCovariances: draw.covariances,
            across: grouped ? grouping! : null
          },
          {
            ...PLAIN,
            name: two!,
            from: one!,
            equalAcrossGroups: sets.length > 0 ? sets : null,
            except: sets.includes('loadings') ? [{ cell: { part: 'loading', of: [b!, f!] }, group }] : []
          },
          { ...PLAIN, name: three!, from: two!, change: changes }
        ],
        ladders: [
          { name: first!, rungs: [one!, two!] },
          grouped ? { name: second!, invarianceOf: one!, across: grouping!, through: 'metric' } : { name: second!, rungs: [three!] }
        ],
        rules: {
          alpha: draw.alpha,
          adjust: draw.rule as 'holm' | 'none',
          changeInFit:
            draw.change === null
              ? null
              : { preset: null, cfi: null, rmsea: null, srmr: null, mcdonald: null, gammaHat: null, ...draw.change },
          scaledDifference: draw.change === null ? ('ordinary' as const) : ('strictly positive' as const),
          decideBy: draw.change !== null && Object.keys(draw.change).length > 0 ? 'both' : 'difference test'
        }
      }
    })
}
