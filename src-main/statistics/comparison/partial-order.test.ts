import { describe, expect, it } from 'vitest'
import { relationsTiming } from '../../../tests/bench/relations.ts'
import { exampleCells, exampleMoments, readExample } from '../../../tests/reference/examples.ts'
import { fitModel } from '../fit/fit.ts'
import type { ModelCells } from '../model/cells.ts'
import { type FamilyInput, type FamilyPair, familyOrder } from './partial-order.ts'
import { relationOf } from './relation.ts'

// Nine ability tests (Holzinger & Swineford 1939, as in Harman 1976).
const example = readExample('10_nesting_checks.json')
const names = [
  'three_factor',
  'three_factor_marker',
  'second_order',
  'bifactor',
  'two_factor_visual_verbal_merged',
  'two_factor_verbal_speed_merged',
  'one_factor',
  'one_factor_with_residual_covariance_4_5'
]
const moments = exampleMoments(example)

function familyOf(models: readonly ModelCells[]): FamilyInput {
  const members = models.map((cells) => {
    const { fit, gamma } = fitModel(cells, moments, { convention: 'normal' })
    return { cells, gamma: gamma!, T: fit.T! }
  })
  return { members, sizes: moments.groups.map((g) => g.n), known: [] }
}

const harman = familyOf(names.map((name) => exampleCells(example, name)))
const { pairs, refits } = familyOrder(harman)

/** "a in b" of every two members, from the pairs. */
function within(found: readonly FamilyPair[], n: number): boolean[][] {
  const table = Array.from({ length: n }, (_, a) => Array.from({ length: n }, (_unused, b) => a === b))
  for (const { general, restricted, relation } of found) {
    table[restricted]![general] = relation !== 'not nested'
    table[general]![restricted] = relation === 'equivalent'
  }
  return table
}

function relationBetween(found: readonly FamilyPair[], a: number, b: number): FamilyPair | undefined {
  return found.find((p) => (p.general === a && p.restricted === b) || (p.general === b && p.restricted === a))
}

describe('the order of nine ability tests', () => {
  it('holds every pair once', () => {
    const keys = new Set(pairs.map(({ general, restricted }) => [general, restricted].sort((a, b) => a - b).join(' ')))
    expect(keys.size).toBe((names.length * (names.length - 1)) / 2)
    expect(pairs).toHaveLength(keys.size)
  })

  it('is transitive, and antisymmetric up to equivalence', () => {
    const table = within(pairs, names.length)
    const all = names.map((_, i) => i)
    for (const a of all) {
      for (const b of all) {
        for (const c of all) if (table[a]![b] && table[b]![c]) expect(table[a]![c], `${names[a]} in ${names[c]}`).toBe(true)
        if (a !== b && table[a]![b] && table[b]![a]) expect(relationBetween(pairs, a, b)?.relation).toBe('equivalent')
      }
    }
  })

  it('says of every pair what the two models alone say', () => {
    for (const { general, restricted, relation } of pairs) {
      const [lower, upper] = [harman.members[general]!, harman.members[restricted]!]
      const alone = relationOf({
        general: lower.cells,
        generalGamma: lower.gamma,
        restricted: upper.cells,
        restrictedGamma: upper.gamma,
        sizes: harman.sizes
      })
      expect(relation, `${names[restricted]} in ${names[general]}`).toBe(alone.relation)
    }
  })

  it('knows three correlated factors, scaled in two ways, and a second order over them as equivalent', () => {
    for (const [a, b] of [
      [0, 1],
      [0, 2],
      [1, 2]
    ] as const)
      expect(relationBetween(pairs, a, b)?.relation).toBe('equivalent')
  })

  it('does not refit every pair, and none that is known already', () => {
    expect(refits).toBeLessThan(pairs.length)
    const known = pairs.flatMap((pair) =>
      pair.proof === 'constraints' || pair.proof === 'refit' ? [{ ...pair, proof: pair.proof }] : []
    )
    const again = familyOrder({ ...harman, known })
    expect(again.refits).toBe(0)
    expect(again.pairs.map(({ relation }) => relation)).toEqual(pairs.map(({ relation }) => relation))
  })

  it('does not depend on the order of the members', () => {
    const backwards = familyOrder({ ...harman, members: [...harman.members].reverse() })
    const last = names.length - 1
    for (const { general, restricted, relation } of pairs)
      expect(relationBetween(backwards.pairs, last - general, last - restricted)?.relation).toBe(relation)
  })
})

describe('what is not chained', () => {
  it('one pair of three factors uncorrelated is nested in three factors but not in the second order equivalent to them', () => {
    const apart = exampleCells(example, 'three_factor')
    apart.groups[0]!.factorCovariances = [
      [1, 0, 'phi_3_1'],
      [0, 1, 'phi_3_2'],
      ['phi_3_1', 'phi_3_2', 1]
    ]
    const family = familyOf([exampleCells(example, 'three_factor'), exampleCells(example, 'second_order'), apart])
    const order = familyOrder(family)
    expect(relationBetween(order.pairs, 0, 1)).toMatchObject({ relation: 'equivalent', proof: 'refit' })
    expect(relationBetween(order.pairs, 0, 2)).toMatchObject({ relation: 'nested', proof: 'constraints' })
    expect(relationBetween(order.pairs, 1, 2)).toMatchObject({ relation: 'not nested', proof: 'refit' })
  })
})

describe('bounds', () => {
  const bounded = (least: number): ModelCells => ({
    ...exampleCells(example, 'three_factor'),
    bounds: [{ label: 'phi_2_1', least, most: null }]
  })

  it('make a model nested in the one without them, with equal df, whichever comes first', () => {
    const family = [exampleCells(example, 'three_factor'), bounded(0)]
    expect(familyOrder(familyOf(family)).pairs).toEqual([{ general: 0, restricted: 1, relation: 'nested', proof: 'constraints' }])
    expect(familyOrder(familyOf([...family].reverse())).pairs).toEqual([
      { general: 1, restricted: 0, relation: 'nested', proof: 'constraints' }
    ])
  })

  it('that are not reached do not stand between models that refitting finds equivalent', () => {
    const order = familyOrder(familyOf([exampleCells(example, 'three_factor_marker'), bounded(0)]))
    expect(order.pairs).toMatchObject([{ relation: 'equivalent', proof: 'refit' }])
  })

  it('keep out a model whose solution lies beyond them', () => {
    const order = familyOrder(familyOf([exampleCells(example, 'second_order'), bounded(0.9)]))
    expect(order.pairs).toMatchObject([{ relation: 'not nested', proof: 'order of fit' }])
    const [free, other] = familyOf([bounded(0.9), exampleCells(example, 'three_factor_marker')]).members
    const alike = familyOrder({
      ...harman,
      members: [
        { ...free!, T: 0, gamma: harman.members[0]!.gamma },
        { ...other!, T: 0 }
      ]
    })
    expect(alike.pairs).toMatchObject([{ relation: 'not nested', proof: 'refit' }])
  })

  it('are passed on to a model that fixes the cell within them', () => {
    const fixed = structuredClone(exampleCells(example, 'three_factor'))
    fixed.groups[0]!.factorCovariances[0]![1] = 0.5
    fixed.groups[0]!.factorCovariances[1]![0] = 0.5
    const order = familyOrder(familyOf([bounded(0), fixed]))
    expect(order.pairs).toMatchObject([{ relation: 'nested', proof: 'constraints' }])
  })
})

it('models of different moments have no order', () => {
  const other = structuredClone(harman.members[0]!)
  other.cells.indicators[0] = 'Another'
  expect(() => familyOrder({ ...harman, members: [harman.members[0]!, other] })).toThrow(/different moments/)
})

it('families of forty are settled with a refit for fewer than one pair in three', () => {
  for (const { pairs: asked, refits: made } of relationsTiming(1)) {
    expect(asked).toBe(780)
    expect(made).toBeLessThan(asked / 3)
  }
})
