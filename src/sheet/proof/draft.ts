import type { Area } from '../cells'
import { columnLetters } from '../cells'
import type { Mark, TableCell } from '../table'
import { textCell } from '../table'

/** A cell, or how to make it once all rows have their places: formulas refer to rows further down. */
export type Late = TableCell | (() => TableCell)

/** A part of one column of the draft. */
export interface Column {
  readonly column: number
  readonly row: number
  readonly rows: number
}

/** A table in the making that lies at a known place, so that its formulas can say where its own cells are. */
export class Draft {
  readonly #at: Area
  readonly #rows: Late[][] = []
  readonly #marks: (Mark | undefined)[] = []

  constructor(at: Area) {
    this.#at = at
  }

  /** The number of the row that comes next. */
  get next(): number {
    return this.#rows.length
  }

  /** Adds a row with cells by column, under the mark of a heading or a total to its end. */
  add(cells: { readonly [column: number]: Late } = {}, mark?: Mark): number {
    const row: Late[] = []
    for (const [column, cell] of Object.entries(cells)) row[Number(column)] = cell
    this.#marks.push(mark)
    return this.#rows.push(row) - 1
  }

  put(row: number, column: number, cell: Late): void {
    this.#rows[row]![column] = cell
  }

  /**
   * One cell, held fast in formulas also where they stand in its own row. From some hundred rows on LibreOffice Calc works out columns of
   * formulas that are alike as a whole, in several threads, and takes a total that some of them hang on and others lead to for a circle
   * (Err:522); formulas that refer to fixed cells are not alike to it.
   */
  cell(row: number, column: number): string {
    return `$${columnLetters(this.#at.column + column)}$${this.#at.row + row + 1}`
  }

  /** All of a part of a column, or some of its cells. */
  range({ column, row, rows }: Column, from = 0, count = rows): string {
    const first = this.cell(row + from, column)
    return count === 1 ? first : `${first}:${this.cell(row + from + count - 1, column)}`
  }

  /** A rectangle of the draft. */
  rectangle(first: number, last: number, columns: number): string {
    return `${this.cell(first, 0)}:${this.cell(last, columns - 1)}`
  }

  finish(width: number): TableCell[][] {
    return this.#rows.map((row, r) => {
      const mark = this.#marks[r]
      const blank = textCell('', mark)
      return Array.from({ length: width }, (_, c) => {
        const cell = row[c]
        return cell === undefined ? blank : typeof cell === 'function' ? cell() : cell
      })
    })
  }
}
