/**
 * What of a model could be let go, one restriction at a time: each fixed cell, each cell held equal to others, each
 * linear equation. A release is a direction in the cells: it adds weight_i delta to the value of cell i, where delta is 0
 * in the model as it stands. So a cell let go from an equality is its class's common value plus delta.
 */
import { Matrix, pseudoInverse } from 'ml-matrix'
import { partAt } from '../model/cell-words.ts'
import type { CellPart, LinearConstraint } from '../model/cells.ts'
import type { CompiledGroup, CompiledModel, FreeCell, MatrixName } from '../model/compile.ts'

/** Where a cell stands; of a symmetric pair the one with row >= column. */
export type CellPlace = Pick<FreeCell, 'matrix' | 'row' | 'column'> & { group: number }

export interface Release {
  kind: 'fixed cell' | 'equality' | 'constraint'
  part: CellPart
  of: string[]
  group: string | null
  /** The shared label of an equality, the equation of a constraint, null for a fixed cell. */
  label: string | null
  /** The cell whose change is told; of a constraint the first cell of its first term. */
  place: CellPlace
  /** The fixed value of a fixed cell, else null. */
  fixedAt: number | null
  shifts: { place: CellPlace; weight: number }[]
}

/** Every restriction of the model, group by group. Constraints that others imply are no restriction and are not among them. */
export function possibleReleases(model: CompiledModel, constraints: readonly LinearConstraint[]): Release[] {
  return [
    ...equalityReleases(model),
    ...constraintReleases(model, constraints),
    ...model.groups.flatMap((group, g) => fixedCellReleases(model, group, g))
  ]
}

export function placeKey({ matrix, row, column }: Pick<FreeCell, 'matrix' | 'row' | 'column'>): string {
  return `${matrix} ${row} ${column}`
}

function named(model: CompiledModel, { matrix, row, column, group }: CellPlace): Pick<Release, 'part' | 'of' | 'group'> {
  const { indicators, factors } = model
  const part = partAt({ matrix, row, column })
  const name = model.groups[group]!.name
  if (matrix === 'lambda') return { part, of: [indicators[row]!, factors[column]!], group: name }
  if (matrix === 'beta') return { part, of: [factors[row]!, factors[column]!], group: name }
  const names = matrix === 'theta' || matrix === 'nu' ? indicators : factors
  const pair = (matrix === 'theta' || matrix === 'psi') && row !== column
  return { part, of: pair ? [names[column]!, names[row]!] : [names[row]!], group: name }
}

/**
 * One release a cell of every label that stands in several. Two cells have one equality between them, whichever is let
 * go, so of a pair only the later is listed: the group that is compared with the first.
 */
function equalityReleases(model: CompiledModel): Release[] {
  const uses = cellsByLabel(model)
  const out: Release[] = []
  for (const [label, places] of uses) {
    if (places.length < 2) continue
    for (const place of places.length === 2 ? places.slice(1) : places) {
      out.push({
        kind: 'equality',
        ...named(model, place),
        label,
        place,
        fixedAt: null,
        shifts: [{ place, weight: 1 }]
      })
    }
  }
  return out
}

function cellsByLabel(model: CompiledModel): Map<string, CellPlace[]> {
  const uses = new Map<string, CellPlace[]>()
  model.groups.forEach(({ free }, group) => {
    for (const { matrix, row, column, label } of free) {
      const places = uses.get(label) ?? []
      places.push({ matrix, row, column, group })
      uses.set(label, places)
    }
  })
  return uses
}

/**
 * One release an equation of A theta = b: the shift d with A d = e_r, which moves equation r alone. Any such d will do,
 * because those that differ by a free direction give the same test; the shortest is taken.
 */
function constraintReleases(model: CompiledModel, constraints: readonly LinearConstraint[]): Release[] {
  if (constraints.length === 0) return []
  const uses = cellsByLabel(model)
  const labels = [...uses.keys()]
  const a = new Matrix(
    constraints.map(({ terms }) => {
      const row = new Array<number>(labels.length).fill(0)
      for (const { label, weight } of terms) row[labels.indexOf(label)]! += weight
      return row
    })
  )
  const inverse = pseudoInverse(a)
  const reached = a.mmul(inverse)
  return constraints.flatMap((constraint, r): Release[] => {
    if (Math.abs(reached.get(r, r) - 1) > 1e-8) return []
    const shifts = labels.flatMap((label, t) => {
      const weight = inverse.get(t, r)
      return Math.abs(weight) < 1e-12 ? [] : uses.get(label)!.map((place) => ({ place, weight }))
    })
    const place = uses.get(constraint.terms[0]!.label)![0]!
    return [{ kind: 'constraint', ...named(model, place), label: equation(constraint), place, fixedAt: null, shifts }]
  })
}

/** "a + 2 b - c = 3" */
export function equation({ terms, equals }: LinearConstraint): string {
  const left = terms.map(({ label, weight }, i) => {
    const sign = weight < 0 ? (i === 0 ? '-' : ' - ') : i === 0 ? '' : ' + '
    const size = Math.abs(weight)
    return `${sign}${size === 1 ? '' : `${size} `}${label}`
  })
  return `${left.join('')} = ${equals}`
}

/**
 * The fixed cells of a group. Left out without a word are cells that make no sense to free: a regression of a factor that
 * the model explains by nothing, one that would close a circle, and the covariance of a factor with its own cause.
 */
function fixedCellReleases(model: CompiledModel, group: CompiledGroup, g: number): Release[] {
  const p = model.indicators.length
  const m = model.factors.length
  const free = new Set(group.free.map(placeKey))
  const reaches = causes(group, m)
  const endogenous = Array.from({ length: m }, (_, k) => reaches.some((from) => from[k]))
  const out: Release[] = []
  const consider = (matrix: MatrixName, row: number, column: number, columns: number) => {
    const place: CellPlace = { matrix, row, column, group: g }
    if (free.has(placeKey(place))) return
    const fixedAt = group[matrix][row * columns + column]!
    out.push({ kind: 'fixed cell', ...named(model, place), label: null, place, fixedAt, shifts: [{ place, weight: 1 }] })
  }
  for (let k = 0; k < m; k++) for (let i = 0; i < p; i++) consider('lambda', i, k, m)
  for (let k = 0; k < m; k++) {
    for (let l = 0; l < m; l++) if (k !== l && endogenous[k] && !reaches[k]![l]) consider('beta', k, l, m)
  }
  for (let k = 0; k < m; k++) {
    for (let l = 0; l <= k; l++) if (k === l || !(reaches[k]![l] || reaches[l]![k])) consider('psi', k, l, m)
  }
  for (let i = 0; i < p; i++) for (let j = 0; j <= i; j++) consider('theta', i, j, p)
  if (!model.meanStructure) return out
  for (let i = 0; i < p; i++) consider('nu', i, 0, 1)
  for (let k = 0; k < m; k++) consider('alpha', k, 0, 1)
  return out
}

/** reaches[l][k]: factor l is a cause of factor k, directly or through others. */
function causes(group: CompiledGroup, m: number): boolean[][] {
  const reaches = Array.from({ length: m }, (_, l) => Array.from({ length: m }, (_, k) => group.beta[k * m + l] !== 0))
  for (const { matrix, row, column } of group.free) if (matrix === 'beta') reaches[column]![row] = true
  for (let via = 0; via < m; via++) {
    for (const from of reaches) {
      if (from[via]) for (let to = 0; to < m; to++) from[to] ||= reaches[via]![to]!
    }
  }
  return reaches
}
