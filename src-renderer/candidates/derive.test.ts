import { describe, expect, test } from 'vitest'
import type { CandidateView } from '../../src-main/operations/contract.ts'
import { candidateSchema } from '../../src-main/study/study.ts'
import { derive } from './derive.ts'

function parent(generated: boolean): CandidateView {
  const candidate = candidateSchema.parse({ name: 'Base, metric', from: 'Base', across: 'site', equalAcrossGroups: ['loadings'] })
  return { candidate, generated, state: 'draft', origin: 'planned', sentence: '', parameters: null, df: null }
}
const release = { cell: { part: 'loading' as const, of: ['pain', 'Body'] }, group: null }

describe('deriving a candidate', () => {
  test('says only what differs from a parent that was written', () => {
    const derived = derive(parent(false), { name: 'New', changes: [], releases: [release], across: null })
    expect(derived).toEqual(candidateSchema.parse({ name: 'New', from: 'Base, metric', except: [release] }))
  })

  test('goes back to the candidate behind a rung that a ladder made, and keeps what the rung says', () => {
    const derived = derive(parent(true), { name: 'New', changes: [], releases: [release], across: null })
    expect(derived).toEqual(
      candidateSchema.parse({ name: 'New', from: 'Base', across: 'site', equalAcrossGroups: ['loadings'], except: [release] })
    )
  })

  test('what is held equal between groups can be stated anew', () => {
    const across = { grouping: 'site', equal: ['intercepts' as const] }
    const derived = derive(parent(true), { name: 'New', changes: [], releases: [], across })
    expect(derived.equalAcrossGroups).toEqual(['intercepts'])
  })
})
