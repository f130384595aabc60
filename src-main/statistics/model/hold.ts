/**
 * A fitted model with the parameters that lie on a bound taken as fixed there: what holds of its solution (score tests, say)
 * holds of this one, whose gradient is zero.
 */
import type { Cell, GroupCells, ModelCells } from './cells.ts'
import { cellValue, compileModel } from './compile.ts'

/** @param gamma the solution; returned as they were where no parameter lies on a bound */
export function holdAtBounds(cells: ModelCells, gamma: readonly number[]): { cells: ModelCells; gamma: readonly number[] } {
  const model = compileModel(cells)
  const { bounds } = model
  if (bounds === null) return { cells, gamma }
  const held = new Map<string, number>()
  model.gammaLabels.forEach((label, k) => {
    if (gamma[k] === bounds.least[k] || gamma[k] === bounds.most[k]) held.set(label, gamma[k]!)
  })
  if (held.size === 0) return { cells, gamma }
  const values = new Map<string, number>()
  const solution = Float64Array.from(gamma)
  for (const group of model.groups) for (const cell of group.free) values.set(cell.label, cellValue(cell, solution))
  const fixed = withFixed(cells, held)
  return { cells: fixed, gamma: compileModel(fixed).gammaLabels.map((label) => values.get(label)!) }
}

function withFixed(cells: ModelCells, held: ReadonlyMap<string, number>): ModelCells {
  const fix = (cell: Cell): Cell => (typeof cell === 'string' ? (held.get(cell) ?? cell) : cell)
  const sheet = (rows: Cell[][]) => rows.map((row) => row.map(fix))
  return {
    ...cells,
    groups: cells.groups.map(
      (group): GroupCells => ({
        name: group.name,
        loadings: sheet(group.loadings),
        regressions: sheet(group.regressions),
        factorCovariances: sheet(group.factorCovariances),
        residualCovariances: sheet(group.residualCovariances),
        intercepts: group.intercepts?.map(fix) ?? null,
        factorMeans: group.factorMeans?.map(fix) ?? null
      })
    ),
    constraints: cells.constraints.map(({ terms, equals }) => ({
      terms: terms.filter(({ label }) => !held.has(label)),
      equals: terms.reduce((rest, { label, weight }) => rest - weight * (held.get(label) ?? 0), equals)
    })),
    bounds: (cells.bounds ?? []).filter(({ label }) => !held.has(label))
  }
}
