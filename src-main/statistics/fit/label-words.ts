/** A parameter in words: the first cell that has its label. */
import { cellWords, partAt } from '../model/cell-words.ts'
import type { CellPart } from '../model/cells.ts'
import type { CompiledModel, FreeCell } from '../model/compile.ts'

export function labelWords(model: CompiledModel, label: string): string {
  for (const group of model.groups) {
    const cell = group.free.find((c) => c.label === label)
    if (cell === undefined) continue
    const { part, of } = partOfCell(model, cell)
    return cellWords(part, of, group.name)
  }
  return label
}

/** What a free cell is called in plans and estimates. */
export function partOfCell(model: CompiledModel, { matrix, row, column }: FreeCell): { part: CellPart; of: string[] } {
  const rows = matrix === 'lambda' || matrix === 'theta' || matrix === 'nu' ? model.indicators : model.factors
  const columns = matrix === 'theta' ? model.indicators : model.factors
  const single = matrix === 'nu' || matrix === 'alpha' || (row === column && (matrix === 'psi' || matrix === 'theta'))
  return { part: partAt({ matrix, row, column }), of: single ? [rows[row]!] : [rows[row]!, columns[column]!] }
}
