/** What can be chosen about estimation, with a sentence on when to choose it. Words only; nothing is computed. */
import type { DataPreview, Estimation } from '../../src-main/operations/contract.ts'

type Chosen = 'missing' | 'statistic' | 'standardErrors'

export interface EstimationChoice {
  of: Chosen
  title: string
  options: readonly { value: string; when: string }[]
}

export const estimationChoices: readonly EstimationChoice[] = [
  {
    of: 'missing',
    title: 'Missing answers',
    options: [
      {
        value: 'full information',
        when: 'Uses every answer given. Choose it whenever answers are missing, unless their being missing hangs on the missing value itself.'
      },
      {
        value: 'complete cases',
        when: 'Drops every case with a missing answer. Choose it when nothing, or next to nothing, is missing.'
      }
    ]
  },
  {
    of: 'statistic',
    title: 'Test statistic',
    options: [
      {
        value: 'normal theory',
        when: 'The ordinary likelihood-ratio statistic. Choose it when the answers are close to normally distributed.'
      },
      {
        value: 'mean-scaled',
        when: 'Corrects the statistic for kurtosis. Choose it when answers are skewed or heavy-tailed, as with most rating scales.'
      }
    ]
  },
  {
    of: 'standardErrors',
    title: 'Standard errors',
    options: [
      {
        value: 'expected',
        when: 'From the information that the model expects. Choose it with complete and normal data.'
      },
      {
        value: 'observed',
        when: 'From the curvature of the likelihood at the solution. Choose it with missing answers: they need less to be assumed.'
      },
      {
        value: 'robust',
        when: 'Holds although the data are not normal. Choose it together with the mean-scaled statistic.'
      }
    ]
  }
]

/** Full information with observed errors where an indicator has missing answers; with none, both ways give the same. */
export function sensibleEstimation(columns: DataPreview['columns'], indicators: readonly string[]): Estimation {
  const missing = columns.some((column) => indicators.includes(column.name) && column.missing > 0)
  return {
    method: 'maximum likelihood',
    convention: 'normal',
    statistic: 'normal theory',
    missing: missing ? 'full information' : 'complete cases',
    standardErrors: missing ? 'observed' : 'expected'
  }
}

/** The choice taken; errors that the user did not choose by hand follow from the other two. */
export function withChoice(estimation: Estimation, of: Chosen, value: string, errorsChosen: boolean): Estimation {
  const next = { ...estimation, [of]: value } as Estimation
  if (of === 'standardErrors' || errorsChosen) return next
  return { ...next, standardErrors: errorsThatGoWith(next) }
}

function errorsThatGoWith({ statistic, missing }: Estimation): Estimation['standardErrors'] {
  if (statistic === 'mean-scaled') return 'robust'
  return missing === 'full information' ? 'observed' : 'expected'
}
