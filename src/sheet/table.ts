import type { Area, CellValue } from './cells'

/**
 * How a cell of a written table is set off ('section': the heading of a part, on one line; 'head': a heading of columns; 'wrapped': running
 * text over several lines); a host maps it to fonts, fills and rules of its own.
 */
export type Mark = 'title' | 'section' | 'head' | 'total' | 'note' | 'alert' | 'wrapped'

/** One cell to be written. Text always goes in as text, whatever it begins with. */
export interface TableCell {
  /** of a formula: the last value known, or '' */
  readonly value: CellValue
  /** written in place of the value: en-US notation from the equals sign on, references in A1 style to where they lie for good */
  readonly formula?: string
  /** number format in the en-US notation; text cells carry '@' */
  readonly format: string
  readonly mark?: Mark
  /** steps the text stands in from the left edge, each about as wide as a character or two, so that it keeps off a number before it */
  readonly indent?: number
  /** where a press on the cell leads */
  readonly link?: Area
}

/** A cell of text; a text that looks like a number or a formula stays one. */
export const textCell = (value: string, mark?: Mark): TableCell => ({
  value,
  format: '@',
  ...(mark ? { mark } : {}),
})

/** A cell of a number; blank where there is none. */
export const numberCell = (value: number | null | undefined, format: string, mark?: Mark): TableCell => ({
  value: value === null || value === undefined || !Number.isFinite(value) ? '' : value,
  format,
  ...(mark ? { mark } : {}),
})

/** A cell of a formula. */
export const formulaCell = (formula: string, format: string, mark?: Mark): TableCell => ({
  value: '',
  formula,
  format,
  ...(mark ? { mark } : {}),
})

/** The rows with every text that stands right of a number set in a little, so that the two do not touch, and the headings over such texts with them. */
export function setIn(rows: readonly (readonly TableCell[])[]): readonly (readonly TableCell[])[] {
  /** columns that hold such texts in the rows from here to the next blank one */
  let columns = new Set<number>()
  return [...rows]
    .reverse()
    .map((row) => {
      if (row.every(({ value }) => value === '')) columns = new Set()
      return row.map((cell, k) => {
        const isText = typeof cell.value === 'string' && cell.value !== ''
        if (cell.mark === 'head') return isText && columns.has(k) ? { ...cell, indent: 1 } : cell
        if (!isText || typeof row[k - 1]?.value !== 'number') return cell
        columns.add(k)
        return { ...cell, indent: 1 }
      })
    })
    .reverse()
}

/** Bars behind the numbers of a part of a column, as long as each is of a whole: nothing at 0 or less, the cell full from `full` on. */
export interface TableBars {
  /** all counted from 0 within the table */
  readonly column: number
  readonly row: number
  readonly rows: number
  /** above 0 */
  readonly full: number
}

/** Some cells of a table, counted from 0 within it. */
export interface Span {
  readonly row: number
  readonly column: number
  readonly rows: number
  readonly columns: number
}

/** One row of values in a chart: a part of one column or one row of the table. */
export interface ChartSeries {
  readonly name: string
  readonly values: Span
  /** what lies under the parts of a waterfall: takes up room and is not drawn */
  readonly unseen?: boolean
}

/** A chart of the host's own that lies over cells of a table and draws figures of it. */
export interface TableChart {
  /** 'bars' lie across, first category on top; stacked columns stand on one another */
  readonly kind: 'bars' | 'columns' | 'stacked columns' | 'line'
  readonly title: string
  /** what it shows, as a sentence, for whoever does not see it */
  readonly alt: string
  readonly over: Span
  /** as many cells as each series has */
  readonly categories: Span
  readonly series: readonly ChartSeries[]
  /** of the axis of values */
  readonly format: string
  /** where the axis of values begins, for changes that are small beside the levels they lead between; absent: at 0, or as the host sees fit */
  readonly begins?: number
}

/** How the sheet of a table is printed; the table's cells are the print area. Texts are plain: a host's codes are made from them. */
export interface PageSetup {
  readonly paper: 'A4' | 'Letter'
  readonly orientation: 'portrait' | 'landscape'
  /** all of it on one page; otherwise one page wide and as long as it gets */
  readonly onePage: boolean
  /** rows at the top that every page repeats */
  readonly repeatedRows?: number
  readonly header: { readonly left: string; readonly right: string }
  /** stands left; the number of the page and of pages stands right */
  readonly footer: string
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
  readonly bars?: readonly TableBars[]
  readonly charts?: readonly TableChart[]
  /** for a table that has its sheet to itself */
  readonly page?: PageSetup
}
