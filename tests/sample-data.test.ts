import { readFileSync } from 'node:fs'
import { expect, it } from 'vitest'
import { sampleCsv } from '../fixtures/sample/generate.ts'

it('the sample study is what its generator draws', () => {
  expect(sampleCsv()).toBe(readFileSync(new URL('../fixtures/sample/first-visit.csv', import.meta.url), 'utf8'))
})
