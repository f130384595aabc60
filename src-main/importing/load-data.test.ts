import { describe, expect, it } from 'vitest'
import { loadData } from './load-data.ts'

const PLAN = { kind: 'file' as const, file: 'a.csv', indicators: ['a'], group: null, missingCodes: [''] }

describe('loading the data of a plan', () => {
  it("asks for the file by the plan's own path", () => {
    const asked: string[] = []
    const data = loadData(PLAN, (path) => {
      asked.push(path)
      return new TextEncoder().encode('a\n1\n2\n4\n')
    })
    expect(asked).toEqual(['a.csv'])
    expect(data.kind === 'rows' && [...data.groups[0]!.values]).toEqual([1, 2, 4])
  })

  it('says that there is no such file', () => {
    const missing = () => {
      throw Object.assign(new Error('ENOENT: no such file'), { code: 'ENOENT' })
    }
    expect(() => loadData(PLAN, missing)).toThrow('a.csv: There is no such file. The path is taken relative to the plan file.')
  })

  it('lets a bug be a bug', () => {
    const bug = () => {
      throw new TypeError('of ours')
    }
    expect(() => loadData(PLAN, bug)).toThrow(TypeError)
  })
})
