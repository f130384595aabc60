/**
 * The geometry of a step's gauge, in percent of its width: a scale from 0 to twice the critical value, a tick at the
 * critical value, a bar for the cost. Beyond the scale the bar fills it and is marked as cut off. Pure.
 */
import type { DifferenceResult } from '../../src-main/operations/contract.ts'

export interface GaugeDrawing {
  /** 0 to 100. */
  bar: number
  /** Where the tick stands. */
  tick: number
  /** The cost is larger than the scale. */
  beyond: boolean
  /** Where the label of the cost stands, and how it hangs on that place. */
  label: { at: number; anchor: 'start' | 'middle' | 'end' }
}

/** Null where the difference has no scale (no positive critical value). */
export function drawGauge(difference: Pick<DifferenceResult, 'T' | 'critical'>): GaugeDrawing | null {
  if (!(difference.critical > 0)) return null
  const share = (100 * Math.max(0, difference.T)) / (2 * difference.critical)
  const bar = Math.min(100, share)
  return { bar, tick: 50, beyond: share > 100, label: labelPlace(bar) }
}

function labelPlace(bar: number): GaugeDrawing['label'] {
  if (bar > 88) return { at: 100, anchor: 'end' }
  return bar < 10 ? { at: 0, anchor: 'start' } : { at: bar, anchor: 'middle' }
}
