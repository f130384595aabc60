/** Blocks of cells as a spreadsheet copies and pastes them: rows by line, columns by tab. Pure. */

/** A rectangle between two corners, both inside. */
export interface Block {
  top: number
  left: number
  bottom: number
  right: number
}

export function blockBetween(a: { row: number; column: number }, b: { row: number; column: number }): Block {
  return {
    top: Math.min(a.row, b.row),
    left: Math.min(a.column, b.column),
    bottom: Math.max(a.row, b.row),
    right: Math.max(a.column, b.column)
  }
}

export function blockAsText(cells: readonly (readonly string[])[], block: Block): string {
  return cells
    .slice(block.top, block.bottom + 1)
    .map((row) => row.slice(block.left, block.right + 1).join('\t'))
    .join('\n')
}

/** The cells with the text written from the block's upper left corner; one value fills the whole block, what does not fit is left out. */
export function withText(cells: readonly (readonly string[])[], block: Block, text: string): string[][] {
  const pasted = text
    .replace(/\r?\n$/, '')
    .split(/\r?\n/)
    .map((line) => line.split('\t'))
  const single = pasted.length === 1 && pasted[0]?.length === 1
  return cells.map((line, row) =>
    line.map((old, column) => {
      const inside = row >= block.top && row <= block.bottom && column >= block.left && column <= block.right
      if (single) return inside ? (pasted[0]?.[0]?.trim() ?? old) : old
      return pasted[row - block.top]?.[column - block.left]?.trim() ?? old
    })
  )
}
