import { expect, test } from 'vitest'
import { resultJson } from './result-json.ts'
import { handMadeResult } from './testing/hand-made-result.ts'

test('a result comes back from its JSON digit for digit', () => {
  const result = handMadeResult()
  result.candidates[0]!.T = 37.33491234567891
  expect(JSON.parse(resultJson(result))).toEqual(result)
})

test('NaN and Infinity are a bug, named by their place, and never become null', () => {
  const result = handMadeResult()
  result.candidates[1]!.cfi = Number.NaN
  expect(() => resultJson(result)).toThrow('result.candidates[1].cfi is NaN')
  result.candidates[1]!.cfi = null
  result.ladders[0]!.steps[0]!.deltaAic = Number.NEGATIVE_INFINITY
  expect(() => resultJson(result)).toThrow('result.ladders[0].steps[0].deltaAic is -Infinity')
})

test('a field left out is a bug as well', () => {
  const result = { ...handMadeResult(), data: undefined } as unknown as ReturnType<typeof handMadeResult>
  expect(() => resultJson(result)).toThrow('result.data is undefined')
})

test('negative zero is written as zero', () => {
  const result = handMadeResult()
  result.candidates[0]!.rmsea.lower = -0
  expect(resultJson(result)).not.toMatch(/-0[,\n]/)
})
