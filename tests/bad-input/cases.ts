/**
 * Broken plans, data files and matrices, each with the distinctive part of the message a user must see.
 *
 * A case is a folder: plan.yaml and the files beside it. The table is walked by bad-input.test.ts.
 */
import { dataCases, SUMMARY } from './data-cases.ts'
import { planCases } from './plan-cases.ts'
import { type BadInput, GOOD, GOOD_PLAN } from './sound.ts'

export type { BadInput } from './sound.ts'

export const badInputs: readonly BadInput[] = [...planCases, ...dataCases]

/** The same folder without a fault, to show that it is the fault that is refused. */
export const soundInputs: Omit<BadInput, 'message'>[] = [
  { name: 'the plan the cases break', files: GOOD, plan: GOOD_PLAN },
  { name: 'the summary the cases break', files: {}, plan: SUMMARY }
]
