/** Relations and ratios as people say them. Pure. */
import type { FamilyRelation } from '../../src-main/operations/contract.ts'
import { fixed, notApplicable } from '../state/format.ts'

export function proofInWords(proof: FamilyRelation['proof']): string {
  switch (proof) {
    case 'constraints':
      return 'what each constrains'
    case 'refit':
      return 'fitting one to what the other implies'
    case 'order of fit':
      return 'the more restricted one fitting better'
    case 'other pairs':
      return 'other pairs, from which it follows'
  }
}

/** How many times; below one it speaks against the pair's order, beyond a million only that it is more. */
export function ratioInWords(ratio: number | null): string {
  if (ratio === null) return notApplicable
  if (ratio > 1e6) return '> 1 000 000'
  if (ratio < 1e-6) return '< 1/1 000 000'
  if (ratio < 1) return `1/${timesText(1 / ratio)}`
  return timesText(ratio)
}

function timesText(ratio: number): string {
  return fixed(ratio, ratio < 100 ? 1 : 0)
}
