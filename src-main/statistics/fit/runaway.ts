/**
 * Why a search may go on for ever: in small samples F can fall without end as a variance runs off to minus infinity, so that
 * there is no minimum to find, from any start (van Driel 1978, on the causes of improper solutions).
 */
import type { Objective } from '../estimation/normal-likelihood.ts'
import { cellWords, listed } from '../model/cell-words.ts'
import type { CompiledModel } from '../model/compile.ts'

/** A sentence on the variances that were negative where the search stopped, with what to do; "" when there are none. */
export function runawaySentence(model: CompiledModel, objective: Objective, gamma: Float64Array): string {
  if (Number.isNaN(objective.evaluate(gamma))) return ''
  const found = model.groups.flatMap((group, g) => {
    const { theta, psi, p, m } = objective.states[g]!
    const indicators = model.indicators.map(
      (name, i) => [cellWords('residual variance', [name], group.name), theta[i * p + i]!] as const
    )
    const factors = model.factors.map((name, k) => [cellWords('factor variance', [name], group.name), psi[k * m + k]!] as const)
    return [...indicators, ...factors]
      .filter(([, value]) => value < 0)
      .map(([words, value]) => `${words} (${value.toPrecision(3)})`)
  })
  if (found.length === 0) return ''
  return ` Negative where the search stopped: ${listed(found)}. F may fall without end there and have no minimum; a bound at 0 gives it one.`
}
