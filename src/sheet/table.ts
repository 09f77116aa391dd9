import type { Area, CellValue } from './cells'

/**
 * How a cell of a written table is set off ('section': the heading of a part, on one line; 'head': a heading of columns; 'wrapped': running
 * text over several lines); a host maps it to fonts, fills and rules of its own.
 */
export type Mark = 'title' | 'section' | 'head' | 'total' | 'note' | 'alert' | 'wrapped'

/** One cell to be written. Text always goes in as text, whatever it begins with. */
export interface TableCell {
  readonly value: CellValue
  /** number format in the en-US notation; text cells carry '@' */
  readonly format: string
  readonly mark?: Mark
  /** where a press on the cell leads */
  readonly link?: Area
}

/** A rectangle of cells as plain data: what is written to a sheet, shown in the pane or copied. */
export interface Table {
  /** rows of equal length */
  readonly cells: readonly (readonly TableCell[])[]
  /** width of each column in characters of the body font */
  readonly widths: readonly number[]
  /** columns (from 0) whose numbers line up right; headings follow them */
  readonly numeric: readonly boolean[]
  /** whether cells are read from their top on, where rows hold running text of several lines */
  readonly fromTop?: boolean
  /** how far each row is folded under those before it, 0 outermost; absent where nothing folds */
  readonly levels?: readonly number[]
}
