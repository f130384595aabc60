import { describe, expect, test } from 'vitest'
import { drawGauge } from './gauge.ts'

describe('the gauge of a step', () => {
  test('runs from zero to twice the critical value, with its tick in the middle', () => {
    expect(drawGauge({ T: 3.84, critical: 3.84 })).toMatchObject({ bar: 50, tick: 50, beyond: false })
    expect(drawGauge({ T: 0, critical: 3.84 })).toMatchObject({ bar: 0, beyond: false })
  })

  test('is filled and marked when the cost is beyond it', () => {
    expect(drawGauge({ T: 42.46, critical: 5.99 })).toEqual({ bar: 100, tick: 50, beyond: true, label: { at: 100, anchor: 'end' } })
  })

  test('keeps the label of the cost inside its width', () => {
    expect(drawGauge({ T: 0.1, critical: 5.99 })?.label.anchor).toBe('start')
    expect(drawGauge({ T: 5, critical: 5.99 })?.label.anchor).toBe('middle')
  })

  test('is not drawn where there is no critical value, nor with a negative bar', () => {
    expect(drawGauge({ T: 1, critical: 0 })).toBeNull()
    expect(drawGauge({ T: 1, critical: Number.NaN })).toBeNull()
    expect(drawGauge({ T: -1e-9, critical: 4 })?.bar).toBe(0)
  })
})
