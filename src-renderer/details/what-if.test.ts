import { describe, expect, test } from 'vitest'
import type { ScoreTestView } from '../../src-main/operations/contract.ts'
import { harbourStudy } from '../../tests/window/mock/harbour.ts'
import { freed, whatIfGroups, whatIfSections } from './what-if.ts'

const study = harbourStudy()
const result = study.result.candidates.find((one) => one.name === 'Loadings equal')!
const equality: ScoreTestView = {
  kind: 'equality',
  part: 'loading',
  of: ['fatigue', 'Rest'],
  group: 'Quay',
  label: 'a1',
  words: 'the loading of fatigue on Rest in Quay',
  statistic: 4.2,
  p: 0.04,
  change: 0.1,
  expectedValue: 1.02,
  standardizedChange: 0.06,
  plausibility: 'stated'
}
const fixed: ScoreTestView = {
  ...equality,
  kind: 'fixed cell',
  part: 'residual covariance',
  of: ['sleep', 'worry'],
  group: 'Meadow',
  label: null,
  words: 'the residual covariance of sleep with worry in Meadow',
  plausibility: 'far'
}

describe('what letting a restriction go would do', () => {
  test('an equality across groups becomes a release of the cell in its group', () => {
    expect(freed(equality, result)).toEqual({
      name: 'Loadings equal, but for the loading of fatigue on Rest in Quay',
      changes: [],
      releases: [{ cell: { part: 'loading', of: ['fatigue', 'Rest'] }, group: 'Quay' }]
    })
  })

  test('an equality within a group and a fixed cell become freed cells', () => {
    const within = {
      ...result,
      estimates: result.estimates.map((estimate) => ({ ...estimate, label: estimate.group === 'Quay' ? 'k' : null }))
    }
    expect(freed({ ...equality, label: 'k' }, within)).toMatchObject({
      changes: [{ do: 'free', cell: { part: 'loading', of: ['fatigue', 'Rest'] }, group: 'Quay' }],
      releases: []
    })
    expect(freed(fixed, result)?.changes).toEqual([
      { do: 'free', cell: { part: 'residual covariance', of: ['sleep', 'worry'] }, group: 'Meadow' }
    ])
  })

  test('an equation is no single cell and derives nothing', () => {
    expect(freed({ ...equality, kind: 'constraint' }, result)).toBeNull()
  })

  test('plausible ones come first, of the chosen group and of none', () => {
    const everywhere = { ...fixed, group: null, plausibility: 'near' as const }
    expect(whatIfSections([equality, everywhere, fixed], 'Quay').map(({ plausibility, tests }) => [plausibility, tests])).toEqual([
      ['stated', [equality]],
      ['near', [everywhere]]
    ])
    expect(whatIfGroups([fixed, equality], ['Harbour', 'Meadow', 'Quay'])).toEqual(['Meadow', 'Quay'])
  })
})
