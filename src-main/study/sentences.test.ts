import { describe, expect, it } from 'vitest'
import { addsWords, candidateSentence } from './sentences.ts'
import { candidateSchema } from './study.ts'

const two = [
  { name: 'F', measures: ['a', 'b'] },
  { name: 'G', measures: ['c', 'd'] }
]
const sentence = (rest: object) => candidateSentence(candidateSchema.parse({ name: 'own', ...rest }))
const change = (...changes: object[]) => sentence({ from: 'base', change: changes })
const loading = (indicator: string, factor = 'F') => ({ part: 'loading', of: [indicator, factor] })

describe('what a candidate is', () => {
  it('says its factors and whether they are correlated', () => {
    expect(sentence({ factors: two })).toBe('F (a, b) and G (c, d), correlated.')
    expect(sentence({ factors: two, factorCovariances: 'zero' })).toBe('F (a, b) and G (c, d), uncorrelated.')
    expect(sentence({ factors: two.slice(0, 1) })).toBe('F (a, b).')
  })

  it('says which factor stands over which, and of correlation only what is left of it', () => {
    const third = { name: 'H', measures: ['e', 'f'] }
    const general = { name: 'General', measures: ['F', 'G', 'H'] }
    expect(sentence({ factors: [general, ...two, third] })).toBe('F (a, b), G (c, d) and H (e, f), with General over F, G and H.')
    expect(sentence({ factors: [...two, third, { name: 'General', measures: ['F', 'G'] }] })).toBe(
      'F (a, b), G (c, d) and H (e, f), with General over F and G, H and General correlated.'
    )
  })
})

describe('a linear constraint', () => {
  const constrain = (terms: object[], to: number, group: string | null = null) => change({ do: 'constrain', terms, to, group })

  it('of two cells in proportion says how many times one is the other', () => {
    expect(constrain([{ cell: loading('a') }, { cell: loading('b'), times: -2 }], 0)).toBe(
      'From base: the loading of a on F equals twice the loading of b on F.'
    )
    expect(
      constrain(
        [
          { cell: loading('a'), times: -3 },
          { cell: loading('b'), times: 1 }
        ],
        0,
        'north'
      )
    ).toBe('From base: the loading of b on F equals 3 times the loading of a on F in north.')
    const across = [
      { cell: loading('a'), group: 'north' },
      { cell: loading('a'), times: -1, group: 'south' }
    ]
    expect(constrain(across, 0)).toBe('From base: the loading of a on F in north equals the loading of a on F in south.')
  })

  it('in general says the sum', () => {
    const terms = [{ cell: loading('a') }, { cell: loading('b'), times: -0.5 }, { cell: loading('c', 'G'), times: 2 }]
    expect(constrain(terms, 3)).toBe(
      'From base: the loading of a on F minus 0.5 times the loading of b on F plus twice the loading of c on G is 3.'
    )
  })
})

describe('a bound', () => {
  it('says its limits', () => {
    const bound = { do: 'bound', cell: { part: 'residual variance', of: ['a'] } }
    expect(change({ ...bound, atLeast: 0 })).toBe('From base: the residual variance of a is at least 0.')
    expect(change({ ...bound, atMost: 2, group: 'north' })).toBe('From base: the residual variance of a in north is at most 2.')
    expect(change({ ...bound, atLeast: 0, atMost: 2 })).toBe('From base: the residual variance of a is between 0 and 2.')
  })

  it('and a constraint that a step takes back are said to be no longer there', () => {
    const base = candidateSchema.parse({ name: 'base', factors: two })
    const changes = [
      { do: 'bound', cell: { part: 'residual variance', of: ['a'] }, atLeast: 0 },
      { do: 'constrain', terms: [{ cell: loading('a') }, { cell: loading('b'), times: -2 }], to: 0 }
    ]
    const lower = candidateSchema.parse({ name: 'lower', from: 'base', change: changes })
    expect(addsWords('lower', 'base', [base, lower], null)).toBe(
      'the residual variance of a is no longer bounded; no longer: the loading of a on F equals twice the loading of b on F'
    )
  })
})
