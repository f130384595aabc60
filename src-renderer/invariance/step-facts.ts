/** What a step's verdict rests on, line by line. Pure; formatting only. */
import type { DifferenceResult, NotNestedResult, StepResult } from '../../src-main/operations/contract.ts'
import { bounded, fixed, precise, probabilityPhrase } from '../state/format.ts'

export interface Fact {
  name: string
  text: string
  /** Full precision. */
  title?: string | undefined
}

/** What the verdict's own sentence says already is not said again. */
export function stepFacts(step: StepResult): Fact[] {
  return allFacts(step).filter(({ text }) => !step.because.includes(text))
}

function allFacts({ difference, notNested, proof, relation }: StepResult): Fact[] {
  return [
    ...(difference === null ? [] : differenceFacts(difference)),
    ...(notNested === null ? [] : notNestedFacts(notNested)),
    ...(relation === null || proof === null ? [] : [{ name: 'Relation', text: relationInWords(relation, proof) }])
  ]
}

function differenceFacts({ method, scaling, rmsea }: DifferenceResult): Fact[] {
  const { estimate, lower, upper } = rmsea
  const size =
    estimate === null
      ? []
      : [
          {
            name: 'Size of the step',
            text: `RMSEA of the difference ${bounded(estimate)} [${bounded(lower)}, ${bounded(upper)}]`,
            title: `${precise(estimate)} [${precise(lower)}, ${precise(upper)}], 90% interval`
          }
        ]
  const factor = scaling === null ? [] : [{ name: 'Scaling', text: fixed(scaling, 3), title: precise(scaling) }]
  return [{ name: 'Test', text: testInWords(method) }, ...factor, ...size]
}

function testInWords(method: DifferenceResult['method']): string {
  switch (method) {
    case 'normal theory':
      return 'chi-square difference, normal theory'
    case 'scaled':
      return 'scaled chi-square difference (Satorra & Bentler 2001)'
    case 'strictly positive scaled':
      return 'scaled chi-square difference, strictly positive form (Satorra & Bentler 2010)'
    case 'boundary mixture':
      return 'chi-square difference, referred to a mixture'
  }
}

/** What the sentence leaves out: the statistic of the first test, and how sure the difference in BIC is. */
function notNestedFacts({ distinguishable, bicInterval }: NotNestedResult): Fact[] {
  const { lower, upper } = bicInterval
  return [
    ...(distinguishable === null
      ? []
      : [
          {
            name: 'Told apart?',
            text: `n\u00a0ω² = ${fixed(distinguishable.statistic, 2)}, ${probabilityPhrase(distinguishable.p)}`,
            title: precise(distinguishable.p)
          }
        ]),
    { name: 'ΔBIC', text: `95% interval ${fixed(lower, 1)} to ${fixed(upper, 1)}`, title: `${precise(lower)} to ${precise(upper)}` }
  ]
}

function relationInWords(relation: NonNullable<StepResult['relation']>, proof: NonNullable<StepResult['proof']>): string {
  return `${relation}, shown by ${proof === 'constraints' ? 'what each constrains' : 'fitting one to what the other implies'}`
}
