import { describe, expect, it } from 'vitest'
import { InputError } from './input-error.ts'
import { ladderCandidates, ladderRungs, standingLadders } from './ladders.ts'
import { parsePlan, writePlan } from './plan-file.ts'

const text = (ladder: string) => `study: s
data: { file: a.csv, indicators: [a, b, c, d], group: site }
candidates:
  Two:
    factors: { F: [a, b], G: [c, d] }
ladders:
  Sites: { invariance of: Two, across: site, ${ladder} }
`

describe('an invariance ladder with structural steps', () => {
  const plan = parsePlan(text('through: scalar, and: [factor variances, factor means]'), 'plan.yaml')
  const [sites] = plan.ladders

  it('is written as it was read', () => {
    expect(sites).toMatchObject({ through: 'scalar', and: ['factor variances', 'factor means'] })
    expect(parsePlan(writePlan(plan), 'again')).toEqual(plan)
  })

  it('brings one candidate more for each set, every set by itself on the highest level', () => {
    expect(ladderCandidates(sites!, plan.candidates).map(({ name, equalAcrossGroups }) => [name, equalAcrossGroups])).toEqual([
      ['Two, configural', []],
      ['Two, metric', ['loadings']],
      ['Two, scalar', ['loadings', 'intercepts']],
      ['Two, scalar, equal factor variances', ['loadings', 'intercepts', 'factor variances']],
      ['Two, scalar, equal factor means', ['loadings', 'intercepts', 'factor means']]
    ])
  })

  it('keeps its own rungs and is followed by a ladder of two rungs for each set', () => {
    expect(ladderRungs(sites!, plan.candidates)).toEqual(['Two, configural', 'Two, metric', 'Two, scalar'])
    expect(standingLadders(plan.ladders)).toEqual([
      sites,
      { name: 'Sites, factor variances', rungs: ['Two, scalar', 'Two, scalar, equal factor variances'] },
      { name: 'Sites, factor means', rungs: ['Two, scalar', 'Two, scalar, equal factor means'] }
    ])
  })

  it.each([
    [
      'through: metric, and: [factor means]',
      'Equal factor means mean something only where intercepts are equal. Write "through: scalar"'
    ],
    ['through: configural, and: [factor variances]', 'Equal factor variances mean something only where loadings are equal.'],
    ['through: strict, and: [factor means, factor means]', '"factor means" stands twice on the ladder "Sites".'],
    ['through: strict, and: []', 'The ladder "Sites" adds nothing.'],
    ['through: strict, and: [factor mean]', 'factor means'],
    ['through: strict, and: factor means', 'What the ladder "Sites" adds']
  ])('is refused, with the place, for %s', (ladder, message) => {
    const read = () => parsePlan(text(ladder), 'plan.yaml')
    expect(read).toThrow(InputError)
    expect(read).toThrow(message)
    expect(read).toThrow(/line 7/)
  })

  it('may not take the name of another ladder for one of its own', () => {
    const both = `${text('through: scalar, and: [factor means]')}  "Sites, factor means": [Two]\n`
    expect(() => parsePlan(both, 'plan.yaml')).toThrow('The ladder "Sites, factor means" stands twice.')
  })
})
