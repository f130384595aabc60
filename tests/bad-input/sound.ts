/**
 * What a case of bad input is, and the sound plan and data file that the cases break.
 */

export interface BadInput {
  /** What is wrong, as a sentence about the input. */
  name: string
  /** By name, the files beside the plan. */
  files: Record<string, string>
  /** Text of plan.yaml. */
  plan: string
  /** Part of the one message; what stands before it is the plan's file name, if anything. */
  message: string
}

const HEADER = 'a,b,c,d,site'
export const ROWS = [
  '1,5,3,6,north',
  '2,3,4,2,north',
  '4,4,1,5,north',
  '6,1,2,3,north',
  '3,6,6,1,north',
  '5,2,5,4,north',
  '2,5,1,4,south',
  '1,2,6,5,south',
  '6,3,3,1,south',
  '4,6,2,2,south',
  '5,1,4,6,south',
  '3,4,5,3,south'
]

export const csv = (rows: readonly string[] = ROWS, header = HEADER): string => [header, ...rows, ''].join('\n')
export const GOOD: Record<string, string> = { 'a.csv': csv() }

export const HEAD = `study: Broken
data:
  file: a.csv
  indicators: [a, b, c, d]
  group: site
`
export const CANDIDATES = `candidates:
  Two:
    factors:
      F: [a, b]
      G: [c, d]
`
export const GOOD_PLAN = HEAD + CANDIDATES

/** A good plan with one part replaced. Throws when the part is not in it, so that no case is broken by accident only. */
export function replaced(part: string, by: string, plan = GOOD_PLAN): string {
  if (!plan.includes(part)) throw new Error(`"${part}" is not in the plan`)
  return plan.replace(part, by)
}
