import { rmSync } from 'node:fs'
import { join } from 'node:path'
import { afterEach, beforeEach, describe, expect, it } from 'vitest'
import { type Candidate, candidateSchema } from '../study/study.ts'
import { inlineCrew } from '../workers/inline-crew.ts'
import type { FamilyOrderJob } from '../workers/jobs.ts'
import type { FamilyRelations } from './contract.ts'
import type { Workbench } from './index.ts'
import { done, noiseFolder, refused, startBench } from './test-bench.ts'

let folder: string
beforeEach(() => {
  folder = noiseFolder()
})
afterEach(() => rmSync(folder, { recursive: true, force: true }))

const derived = (name: string, change: unknown[], more: object = {}): Candidate =>
  candidateSchema.parse({ name, from: 'Two noises', change, ...more })
const added: Candidate[] = [
  derived('Two noises again', [], { scaling: 'factor variance' }),
  derived('Apart, hum as loud as rattle', [
    { do: 'fix', cell: { part: 'factor covariance', of: ['Low', 'High'] }, at: 0 },
    { do: 'equal', cells: ['hum', 'rattle'].map((of) => ({ part: 'residual variance', of: [of] })) }
  ]),
  candidateSchema.parse({
    name: 'Other two',
    factors: [
      { name: 'Odd', measures: ['hum', 'thud', 'whistle'] },
      { name: 'Even', measures: ['rattle', 'echo', 'hiss'] }
    ]
  }),
  candidateSchema.parse({ name: 'Half', factors: [{ name: 'Low', measures: ['hum', 'rattle', 'thud'] }] })
]

async function study(crew = inlineCrew): Promise<Workbench> {
  const { workbench } = startBench(folder, crew)
  await done(workbench, 'openPlan', { path: join(folder, 'plan.yaml') })
  for (const candidate of added) await done(workbench, 'addCandidate', { candidate })
  return workbench
}

function relation({ relations }: FamilyRelations, a: string, b: string) {
  return relations.find((pair) => [pair.lower, pair.upper].includes(a) && [pair.lower, pair.upper].includes(b))
}

describe('the relations of a family', () => {
  it('are those of every pair on the same data, with ladders through all that is nested', async () => {
    const workbench = await study()
    await done(workbench, 'fitCandidates', { names: null })
    const found = await done(workbench, 'familyRelations', null)
    expect(found.relations).toHaveLength(15)
    expect(relation(found, 'Two noises', 'Apart')).toEqual({
      lower: 'Two noises',
      upper: 'Apart',
      relation: 'nested',
      proof: 'constraints'
    })
    expect(relation(found, 'Two noises', 'Two noises again')).toMatchObject({ relation: 'equivalent', proof: 'refit' })
    expect(relation(found, 'Two noises', 'One noise')).toMatchObject({ lower: 'Two noises', relation: 'nested', proof: 'refit' })
    expect(relation(found, 'Apart', 'One noise')?.relation).toBe('not nested')
    expect(relation(found, 'Half', 'Two noises')).toBeUndefined()
    expect(found.chains).toEqual([
      ['Two noises', 'Apart', 'Apart, hum as loud as rattle'],
      ['Two noises', 'One noise'],
      ['Other two', 'One noise']
    ])
    expect(found).toMatchObject({ equivalent: [['Two noises', 'Two noises again']], off: ['Half'], without: [] })
    expect(found.sentences).toContain(
      'A ladder, least restrictive first: “Two noises”, “Apart”, “Apart, hum as loud as rattle”; each is nested in the one before it.'
    )
    expect(found.sentences).toContain(
      '“Two noises” and “Two noises again” are equivalent: the same degrees of freedom and the same fit, so no data can tell them apart; on a ladder one stands for both.'
    )
    expect(found.sentences).toContain('“Half” is off every ladder: it is nested in no other candidate, and none is nested in it.')
    expect(found.sentences[1]).toMatch(/fall into 2 sets/)
    await workbench.close()
  })

  it('name what has no solution yet', async () => {
    const workbench = await study()
    await done(workbench, 'fitCandidates', { names: ['Two noises', 'Apart'] })
    const found = await done(workbench, 'familyRelations', null)
    expect(found.relations).toHaveLength(1)
    expect(found.without).toEqual(['One noise', ...added.map(({ name }) => name)])
    expect(found.sentences[0]).toBe(
      'Of 1 pair of fitted candidates on the same data, 1 is nested, 0 are equivalent and 0 are neither.'
    )
    expect(found.sentences.at(-1)).toMatch(
      /^How “One noise”, .* and “Half” stand to the others is not known, for want of a solution\.$/
    )
    await workbench.close()
  })

  it('are none before anything is fitted', async () => {
    const workbench = await study()
    const found = await done(workbench, 'familyRelations', null)
    expect(found).toMatchObject({ relations: [], chains: [], off: [] })
    expect(found.sentences[0]).toMatch(/^No two fitted candidates/)
    await workbench.close()
  })

  it('keep what refitting has proved, and use what was recorded of a step', async () => {
    const jobs: FamilyOrderJob[] = []
    const crew = {
      ...inlineCrew,
      familyOrder: (...call: Parameters<typeof inlineCrew.familyOrder>) => {
        jobs.push(call[0])
        return inlineCrew.familyOrder(...call)
      }
    }
    const workbench = await study(crew)
    await done(workbench, 'fitCandidates', { names: null })
    const first = await done(workbench, 'familyRelations', null)
    expect(jobs[0]?.known).toMatchObject([{ relation: 'nested', proof: 'constraints' }])
    expect(await done(workbench, 'familyRelations', null)).toEqual(first)
    const again = jobs.findLast((job) => job.members.length > 1)!
    expect((await inlineCrew.familyOrder(again)).refits).toBe(0)
    await workbench.close()
  })

  it('need an open study', async () => {
    const { workbench } = startBench(folder)
    expect(await refused(workbench, 'familyRelations', null)).toMatch(/No study is open/)
    await workbench.close()
  })
})
