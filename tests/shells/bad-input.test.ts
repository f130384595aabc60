/**
 * The table of broken input once more, through the whole command line: status 2, one message, and not a byte written.
 *
 * The crew refuses every job, so that a case that were fitted before it is refused would show as a bug.
 */
import { mkdirSync, readdirSync, writeFileSync } from 'node:fs'
import { join } from 'node:path'
import { afterAll, beforeAll, describe, expect, test } from 'vitest'
import { main } from '../../src-main/shells/cli.ts'
import type { Crew } from '../../src-main/workers/jobs.ts'
import { badInputs, soundInputs } from '../bad-input/cases.ts'
import { collecting, rungwise, temporaryFolder } from './program.ts'

const unwilling: Crew = {
  fit: () => Promise.reject(new Error('asked to fit bad input')),
  relation: () => Promise.reject(new Error('asked to compare bad input')),
  restrictedScaling: () => Promise.reject(new Error('asked to scale bad input')),
  resample: () => Promise.reject(new Error('asked to resample bad input')),
  notNested: () => Promise.reject(new Error('asked to compare bad input')),
  familyOrder: () => Promise.reject(new Error('asked to order bad input')),
  scoreTests: () => Promise.reject(new Error('asked to test bad input')),
  close: async () => {}
}
const everything = ['compare', 'plan.yaml', '--project', 'study.rungwise', '--json', 'result.json']

const folder = temporaryFolder()
afterAll(() => folder.remove())

/** Lays a case out as the folder a user would have; answers its path and what is in it. */
function layOut({ plan, files }: { plan: string; files: Record<string, string> }, name: string): { path: string; names: string[] } {
  const path = join(folder.path, name)
  mkdirSync(path)
  writeFileSync(join(path, 'plan.yaml'), plan)
  for (const [file, text] of Object.entries(files)) writeFileSync(join(path, file), text)
  return { path, names: readdirSync(path).sort() }
}

describe('the command line answers bad input with status 2, one message and nothing written:', () => {
  test.each(badInputs.map((one, place) => ({ ...one, place })))('$name', async (one) => {
    const { path, names } = layOut(one, `case-${one.place}`)
    const around = collecting(path)
    const status = await main(everything, around, () => unwilling)
    expect({ status, stdout: around.printed.stdout }).toEqual({ status: 2, stdout: '' })
    expect(around.printed.stderr).toContain(one.message)
    expect(around.printed.stderr.trimEnd()).not.toContain('\n')
    expect(readdirSync(path).sort()).toEqual(names)
  })
})

describe('the launcher does the same from outside:', () => {
  const every = Math.ceil(badInputs.length / 6)
  const some = badInputs.filter((_one, place) => place % every === 0)
  let ended: { stderr: string; status: number | null; stdout: string; left: string[]; names: string[] }[] = []
  beforeAll(async () => {
    ended = []
    for (const [place, one] of some.entries()) {
      const { path, names } = layOut(one, `spawned-${place}`)
      const result = await rungwise(everything, { folder: path })
      ended.push({ ...result, names, left: readdirSync(path).sort() })
    }
  })

  test.each(some.map(({ name, message }, place) => ({ name, message, place })))('$name', ({ message, place }) => {
    const { stderr, names, ...rest } = ended[place]!
    expect(rest).toEqual({ status: 2, stdout: '', left: names })
    expect(stderr).toContain(message)
    expect(stderr.trimEnd()).not.toContain('\n')
  })
})

test.each(soundInputs)('it is the fault that is refused: $name reaches the fits', async (one) => {
  const { path } = layOut(one, `sound-${soundInputs.indexOf(one)}`)
  const around = collecting(path)
  expect(await main(['compare', 'plan.yaml'], around, () => unwilling)).toBe(1)
  expect(around.printed.stderr).toContain('asked to fit bad input')
})
