/** A workbook without a screen, the port over it, and a portrait of all it holds. */
import { CellValueType } from '@univerjs/core'
import { VerticalAlign, WrapStrategy } from '@univerjs/core'
import { headlessGrid } from '../../src/desk/grid'
import {
  barOf,
  chartsOf,
  createOffice,
  levelOf,
  linkOf,
  pageOf,
  userOf,
  type OfficeOptions,
  type SheetPage,
} from '../../src/desk/office'
import { excelWorkbook } from '../../src/excel'
import type { Table, TableCell, Workbook } from '../../src/sheet'

const opened: { dispose(): void }[] = []

export function closeAll(): void {
  for (const grid of opened.splice(0)) grid.dispose()
}

/** Opens a workbook with one sheet, "Sheet1", empty or filled from A1 on, and makes it the host that code under test speaks to. */
export function open(options?: OfficeOptions, filled?: readonly (readonly (number | string)[])[]) {
  const grid = headlessGrid(filled && workbookOf(filled))
  opened.push(grid)
  const office = createOffice(grid, options)
  Object.assign(globalThis, {
    Office: office.Office,
    Excel: office.Excel,
    OfficeExtension: office.OfficeExtension,
  })
  const book: Workbook = excelWorkbook()
  const user = userOf(grid)
  const settle = () => office.settled()

  /** Everything the workbook holds, cell by cell with its look and link, groups of rows, names and settings: nothing in it that an undone write may change. */
  function portrait() {
    const workbook = grid.api.getActiveWorkbook()
    const sheets = workbook?.getSheets().map((sheet) => {
      const cells: Record<string, unknown> = {}
      const rules: Record<string, unknown> = {}
      const inner = sheet.getSheet()
      inner.getCellMatrix().forValue((row, column, cell) => {
        const { n, bl, it, ht, vt, tb, ul, cl, ff, fs, pd } = inner.getComposedCellStyle(row, column)
        // neighbours share a rule, whichever of them the grid keeps it with: it is told as the one under the upper row
        const { t: over, b: under } = inner.getComposedCellStyle(row, column).bd ?? {}
        if (over) rules[`R${row}C${column + 1}`] = over
        if (under) rules[`R${row + 1}C${column + 1}`] = under
        const kept = bare({
          v: cell?.v,
          t: cell?.t,
          f: cell?.f,
          n,
          bl: bl || null,
          it: it || null,
          ht: ht || null,
          // the bottom is where cells without a word of their own stand
          vt: vt === VerticalAlign.BOTTOM ? null : vt || null,
          wrapped: tb === WrapStrategy.WRAP || null,
          link: linkOf(cell),
          // the name the host gives a bar says nothing
          bar: barOf(cell) && { ...barOf(cell), id: null },
          indent: pd?.l,
          // what a cell looks like without a style of its own says nothing
          underlined: ul?.s || null,
          colour: cl?.rgb === '#000000' ? null : cl?.rgb,
          font: ff === 'Calibri' ? null : ff,
          size: fs === 11 ? null : fs,
        })
        if (kept) cells[`R${row + 1}C${column + 1}`] = kept
      })
      const widths = Array.from({ length: 12 }, (_, column) => sheet.getColumnWidth(column))
      const { rowData } = inner.getConfig()
      const levels = Array.from({ length: 30 }, (_, row) => levelOf(rowData[row]))
      const config = inner.getConfig()
      return {
        name: sheet.getSheetName(),
        cells,
        rules,
        widths,
        levels,
        // which of them lies over another is not put back
        charts: [...chartsOf(config)].sort((a, b) => (a.name < b.name ? -1 : 1)),
        page: pageSaid(pageOf(config)),
        visibility: config.custom?.['visibility'] ?? config.hidden,
      }
    })
    const names = workbook
      ?.getDefinedNames()
      .map((name) => [name.getName(), name.getFormulaOrRefString()])
      .sort()
    return { sheets, names, settings: Object.fromEntries([...office.settings].sort()) }
  }

  /** What the API says of some cells. */
  const cells = (sheet: string, address: string) =>
    office.Excel.run(async (context) => {
      const range = context.workbook.worksheets.getItem(sheet).getRange(address)
      range.load('values,formulas,valueTypes,numberFormat')
      await context.sync()
      const { values, formulas, valueTypes, numberFormat } = range
      return { values, formulas, valueTypes, numberFormat } as Record<string, unknown[][]>
    })

  return { office, grid, user, book, settle, portrait, cells }
}

/** A page without what is as the host has it anyway (its usual values, from memory). */
function pageSaid({ margins, texts, zoom, paper, orientation, ...printed }: SheetPage): unknown {
  const usual = { top: 54, bottom: 54, left: 50.4, right: 50.4, header: 21.6, footer: 21.6 }
  return bare({
    ...printed,
    margins: { ...usual, ...margins },
    texts,
    zoom: zoom ?? { scale: 100 },
    paper: paper ?? 'A4',
    orientation: orientation ?? 'Portrait',
  })
}

/** Typing large blocks takes long; a workbook opened with them does not. */
function workbookOf(filled: readonly (readonly (number | string)[])[]) {
  const cellData = Object.fromEntries(
    filled.map((row, r) => [
      r,
      Object.fromEntries(
        row.map((v, c) => [c, { v, t: typeof v === 'number' ? CellValueType.NUMBER : CellValueType.STRING }]),
      ),
    ]),
  )
  const sheet = {
    id: 'sheet-1',
    name: 'Sheet1',
    rowCount: filled.length + 100,
    columnCount: (filled[0]?.length ?? 0) + 40,
    cellData,
  }
  return { id: 'workbook', name: 'Book1', sheetOrder: ['sheet-1'], sheets: { 'sheet-1': sheet } }
}

/** An object without the members that say nothing; undefined when none is left. */
function bare(value: unknown): unknown {
  if (value === null || value === undefined || value === '') return undefined
  if (typeof value !== 'object') return value
  const members = Object.entries(value)
    .map(([key, inner]) => [key, bare(inner)] as const)
    .filter(([, inner]) => inner !== undefined)
  return members.length > 0 ? Object.fromEntries(members) : undefined
}

export const text = (value: string, mark?: TableCell['mark']): TableCell => ({
  value,
  format: '@',
  ...(mark && { mark }),
})
export const number = (value: number, format = '0.0%', mark?: TableCell['mark']): TableCell => ({
  value,
  format,
  ...(mark && { mark }),
})
export const blank: TableCell = { value: '', format: 'General' }

export const tableOf = (cells: readonly (readonly TableCell[])[]): Table => ({
  cells,
  widths: cells[0]?.map((_, column) => (column === 0 ? 24 : 12)) ?? [],
  numeric: cells[0]?.map((_, column) => column > 0) ?? [],
})

/** A breakdown in small: a title, heads, positions whose names look like formulas, a total. */
export const breakdown = (shares: readonly number[] = [0.7, -0.1, 0.4]): Table =>
  tableOf([
    [text('Risk of the book', 'title'), blank],
    [text('Position', 'head'), text('Share of risk', 'head')],
    ...shares.map((share, k) => [
      text(['=1+1', '@name', '-Larch', "'Alder'"][k] ?? `+Beech ${k}`),
      number(share),
    ]),
    [text('Total', 'total'), number(1, '0.0%', 'total')],
  ])

/** A table that folds, `levels` rows below one another, each with a label that leads to a cell of Sheet1. */
export const folding = (...levels: readonly number[]): Table => ({
  ...tableOf(
    levels.map((level, k) => [
      { ...text(`=Group ${level}`), link: { sheet: 'Sheet1', row: k, column: 7, rows: 1, columns: 1 } },
      number(1 / (k + 1)),
    ]),
  ),
  levels,
})

/** The values a table shows. */
export const valuesOf = (table: Table) => table.cells.map((row) => row.map(({ value }) => value))

/** What a promise was rejected with, or a failure when it was not. */
export async function refusal(promise: Promise<unknown>): Promise<{ code: string; message: string }> {
  try {
    await promise
  } catch (error) {
    const { code, message } = error as { code: string; message: string }
    return { code, message }
  }
  throw new Error('it was not refused')
}
