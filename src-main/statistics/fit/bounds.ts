/**
 * What the bounds of a model did to its fit: which cells lie on one, and what that means for the test.
 */
import { chiSquareUpper } from '../distributions/chi-square.ts'
import { cellWords, listed } from '../model/cell-words.ts'
import type { CompiledModel } from '../model/compile.ts'
import type { BoundResult, Caution, EstimateResult } from './fit-result.ts'
import { partOfCell } from './label-words.ts'

/** Every cell of a bounded label, group by group, named as the estimates name it. */
export function boundResults(model: CompiledModel, gamma: Float64Array): BoundResult[] {
  const { bounds, gammaLabels } = model
  if (bounds === null) return []
  const gammaOf = new Map(gammaLabels.map((label, k) => [label, k]))
  return model.groups.flatMap((group) =>
    group.free.flatMap((cell): BoundResult[] => {
      const k = gammaOf.get(cell.label)
      if (k === undefined) return []
      const [atLeast, atMost] = [finite(bounds.least[k]!), finite(bounds.most[k]!)]
      if (atLeast === null && atMost === null) return []
      const active = gamma[k] === atLeast ? 'at least' : gamma[k] === atMost ? 'at most' : null
      const { part, of } = partOfCell(model, cell)
      return [{ part, of: part.endsWith('covariance') ? [...of].reverse() : of, group: group.name, atLeast, atMost, active }]
    })
  )
}

/** Whether an estimate is one that lies on its bound. */
export function isActive(bounds: readonly BoundResult[], { part, of, group }: EstimateResult): boolean {
  const same = (bound: BoundResult) =>
    bound.part === part && bound.group === group && JSON.stringify(bound.of) === JSON.stringify(of)
  return bounds.some((bound) => bound.active !== null && same(bound))
}

/**
 * The solution on the boundary: T then follows a mixture of chi-square distributions, between df and df plus the number of
 * parameters on a bound (Stoel, Garre, Dolan & van den Wittenboer 2006), and so p lies between two values.
 *
 * @param held number of parameters on a bound
 * @param test the statistic that is judged
 */
export function boundCautions(bounds: readonly BoundResult[], held: number, test: { T: number; df: number }): Caution[] {
  const active = bounds.filter((bound) => bound.active !== null)
  if (active.length === 0) return []
  const cells = listed(
    active.map((bound) => `${cellWords(bound.part, bound.of, bound.group)} (${bound.active} ${bound[limitOf(bound)]})`)
  )
  const one = active.length === 1
  const message = [
    `${cells.charAt(0).toUpperCase()}${cells.slice(1)} ${one ? 'lies on its bound' : 'lie on their bounds'}, beyond which the model would fit better still.`,
    `The degrees of freedom (${test.df}) count ${one ? 'it' : 'them'} as free all the same; ${one ? 'it has' : 'they have'} no standard error.`,
    referenceWords(test, held),
    'A difference test with this candidate on one side can be affected likewise.'
  ].join(' ')
  return [{ code: 'bound-active', message, cell: one ? active[0]!.of : null }]
}

function limitOf({ active }: BoundResult): 'atLeast' | 'atMost' {
  return active === 'at least' ? 'atLeast' : 'atMost'
}

function referenceWords({ T, df }: { T: number; df: number }, held: number): string {
  const mixture = `a mixture of chi-square distributions on ${df} ${held === 1 ? 'and' : 'to'} ${df + held} df (Stoel, Garre, Dolan & van den Wittenboer 2006)`
  const low = df === 0 ? null : pText(chiSquareUpper(T, df))
  const high = pText(chiSquareUpper(T, df + held))
  const between =
    low === high
      ? `p is ${high} by either`
      : low === null
        ? `p is at most ${high}`
        : `the p printed (${low}) is the smallest and ${high} the largest it can be`
  return `The chi-square reference of the exact-fit test no longer holds exactly: where a true value lies on its bound, T follows ${mixture}, so that ${between}.`
}

/** ".042"; below what three decimals show, "below .001". */
function pText(p: number): string {
  return p < 0.001 ? 'below .001' : p.toFixed(3).replace(/^0/, '')
}

function finite(value: number): number | null {
  return Number.isFinite(value) ? value : null
}
