/** A user at the grid, for tests and for the page: edits that are not the add-in's. */
import { ICommandService } from '@univerjs/core'
import { ClearSelectionContentCommand, SetRangeValuesCommand } from '@univerjs/sheets'
import type { Grid } from '../grid'
import { parseRect, type Rect } from './addresses'
import { Book, ENGLISH, type Sheet } from './book'
import { entered } from './cells'

export interface User {
  /** Types into a cell, or pastes a block at it; text as it is typed: "=A1+1", "5%", "'07". */
  type(sheet: string, address: string, value: unknown): void
  select(sheet: string, ...addresses: string[]): void
  insertRows(sheet: string, before: number, count: number): void
  deleteRows(sheet: string, from: number, count: number): void
  insertColumns(sheet: string, before: number, count: number): void
  deleteColumns(sheet: string, from: number, count: number): void
  deleteSheet(sheet: string): void
  renameSheet(sheet: string, name: string): void
  hideRows(sheet: string, from: number, count: number): void
  merge(sheet: string, address: string): void
  /** Empties the selected cells, as the Delete key does. */
  clearSelected(): void
  undo(): void
}

/** Rows and columns are counted from 1, as the user sees them. */
export function userOf(grid: Grid): User {
  const book = new Book(grid, ENGLISH, new Map())
  const commands = grid.univer.__getInjector().get(ICommandService)
  const sheetOf = (name: string): Sheet => {
    const sheet = book.sheet(name)
    if (!sheet) throw new Error(`there is no sheet "${name}"`)
    return sheet
  }
  const rectOf = (address: string): Rect => {
    const rect = parseRect(address)
    if (!rect) throw new Error(`"${address}" is no address`)
    return rect
  }
  return {
    type(name, address, value) {
      const sheet = sheetOf(name)
      const { top, left } = rectOf(address)
      const rows = Array.isArray(value) ? (value as unknown[][]) : [[value]]
      const range = {
        startRow: top,
        startColumn: left,
        endRow: top + rows.length - 1,
        endColumn: left + (rows[0]?.length ?? 1) - 1,
      }
      const patterns = sheet.map(
        { top, left, bottom: range.endRow, right: range.endColumn },
        (cell) => cell.pattern,
      )
      const cells = rows.map((row, i) =>
        row.map((cell, j) => entered(cell, patterns[i]?.[j] ?? 'General') ?? {}),
      )
      const done = commands.syncExecuteCommand(SetRangeValuesCommand.id, {
        unitId: book.id,
        subUnitId: sheet.id,
        range,
        value: cells,
      })
      if (!done) throw new Error(`the grid refused an edit at ${name}!${address}`)
    },
    select: (name, ...addresses) => book.select(sheetOf(name), addresses.map(rectOf)),
    insertRows: (name, before, count) => void sheetOf(name).facade.insertRowsBefore(before - 1, count),
    deleteRows: (name, from, count) => void sheetOf(name).facade.deleteRows(from - 1, count),
    insertColumns: (name, before, count) => void sheetOf(name).facade.insertColumnsBefore(before - 1, count),
    deleteColumns: (name, from, count) => void sheetOf(name).facade.deleteColumns(from - 1, count),
    deleteSheet: (name) => void book.workbook.deleteSheet(sheetOf(name).id),
    renameSheet: (name, to) => void sheetOf(name).facade.setName(to),
    hideRows: (name, from, count) => void sheetOf(name).facade.hideRows(from - 1, count),
    merge: (name, address) =>
      void sheetOf(name)
        .facade.getRange(sheetOf(name).rangeOf(rectOf(address)))
        .merge({ isForceMerge: true }),
    clearSelected: () => void commands.syncExecuteCommand(ClearSelectionContentCommand.id),
    undo: () => void book.workbook.undo(),
  }
}
