/**
 * Cell by cell: estimates with standard errors and 95% intervals, completely standardised values with theirs.
 */
import type { CellPart } from '../model/cells.ts'
import { type CompiledGroup, type CompiledModel, cellValue, type FreeCell, type MatrixName } from '../model/compile.ts'
import type { GroupState } from '../model/implied-moments.ts'
import { standardisation } from '../model/standardisation.ts'
import type { EstimateResult } from './fit-result.ts'
import { StandardisedErrors } from './standardised-errors.ts'

/** Of a 95% interval in standard errors: the upper .975 quantile of the standard normal. */
const halfWidth = 1.959963984540054

/**
 * @param states the groups' matrices at the solution
 * @param covariance of the estimates of gamma (q x q), null when it could not be computed
 */
export function cellEstimates(
  model: CompiledModel,
  states: readonly GroupState[],
  gamma: Float64Array,
  covariance: Float64Array | null
): EstimateResult[] {
  const uses = labelUses(model)
  return model.groups.flatMap((group, g) => groupEstimates(model, group, states[g]!, gamma, covariance, uses))
}

function labelUses(model: CompiledModel): Map<string, number> {
  const uses = new Map<string, number>()
  for (const group of model.groups) for (const cell of group.free) uses.set(cell.label, (uses.get(cell.label) ?? 0) + 1)
  return uses
}

function groupEstimates(
  model: CompiledModel,
  group: CompiledGroup,
  state: GroupState,
  gamma: Float64Array,
  covariance: Float64Array | null,
  uses: Map<string, number>
): EstimateResult[] {
  const free = new Map(group.free.map((cell) => [`${cell.matrix} ${cell.row} ${cell.column}`, cell]))
  const errors = covariance === null ? null : new StandardisedErrors(model, group, state, covariance)
  const out: EstimateResult[] = []
  for (const place of cellPlaces(model, state, free)) {
    const cell = free.get(`${place.matrix} ${place.row} ${place.column}`)
    const estimate = cell === undefined ? place.value : cellValue(cell, gamma)
    const error = cell === undefined || covariance === null ? null : standardError(cell, covariance, model.parameters)
    out.push({
      part: place.part,
      group: group.name,
      of: place.of,
      free: cell !== undefined,
      label: cell !== undefined && (uses.get(cell.label) ?? 0) > 1 ? cell.label : null,
      estimate,
      standardError: error,
      lower: error === null ? null : estimate - halfWidth * error,
      upper: error === null ? null : estimate + halfWidth * error,
      standardized: finite(estimate * standardisation(place, state)),
      standardizedError: errors?.of(place, cell, estimate) ?? null
    })
  }
  return out
}

interface Place {
  part: CellPart
  matrix: MatrixName
  row: number
  column: number
  of: string[]
  /** The value in the state. */
  value: number
}

/** Cells worth a line: free ones, fixed ones that are not zero, and all variances, factor covariances and means. */
function cellPlaces(model: CompiledModel, state: GroupState, free: Map<string, FreeCell>): Place[] {
  const { indicators, factors } = model
  const p = indicators.length
  const m = factors.length
  const places: Place[] = []
  const consider = (
    part: CellPart,
    matrix: MatrixName,
    row: number,
    column: number,
    of: string[],
    value: number,
    always = false
  ) => {
    if (always || value !== 0 || free.has(`${matrix} ${row} ${column}`)) places.push({ part, matrix, row, column, of, value })
  }
  const endogenous = factors.map((_, k) => factors.some((_, l) => free.has(`beta ${k} ${l}`) || state.beta[k * m + l] !== 0))
  for (let k = 0; k < m; k++) {
    for (let i = 0; i < p; i++) consider('loading', 'lambda', i, k, [indicators[i]!, factors[k]!], state.lambda[i * m + k]!)
  }
  for (let l = 0; l < m; l++) {
    for (let k = 0; k < m; k++) consider('factor regression', 'beta', k, l, [factors[k]!, factors[l]!], state.beta[k * m + l]!)
  }
  for (let i = 0; i < p; i++) consider('residual variance', 'theta', i, i, [indicators[i]!], state.theta[i * p + i]!, true)
  for (let i = 0; i < p; i++) {
    for (let j = 0; j < i; j++)
      consider('residual covariance', 'theta', i, j, [indicators[j]!, indicators[i]!], state.theta[i * p + j]!)
  }
  for (let k = 0; k < m; k++) consider('factor variance', 'psi', k, k, [factors[k]!], state.psi[k * m + k]!, true)
  for (let k = 0; k < m; k++) {
    for (let l = 0; l < k; l++) {
      const always = endogenous[k] === false && endogenous[l] === false
      consider('factor covariance', 'psi', k, l, [factors[l]!, factors[k]!], state.psi[k * m + l]!, always)
    }
  }
  if (!model.meanStructure) return places
  for (let i = 0; i < p; i++) consider('intercept', 'nu', i, 0, [indicators[i]!], state.nu[i]!, true)
  for (let k = 0; k < m; k++) consider('factor mean', 'alpha', k, 0, [factors[k]!], state.alpha[k]!, true)
  return places
}

/** sqrt of k' V k for the cell's row k of K; null when V gives no positive variance. */
function standardError(cell: FreeCell, covariance: Float64Array, q: number): number | null {
  let variance = 0
  for (let a = 0; a < cell.gammas.length; a++) {
    for (let b = 0; b < cell.gammas.length; b++) {
      variance += cell.weights[a]! * cell.weights[b]! * covariance[cell.gammas[a]! * q + cell.gammas[b]!]!
    }
  }
  return variance > 0 ? Math.sqrt(variance) : null
}

function finite(value: number): number | null {
  return Number.isFinite(value) ? value : null
}
