/**
 * Opens and saves the desk's workbook as .xlsx.
 *
 * Kept both ways: values, formulas with their results, spills, number formats, fonts' weight, slant and colour, fills, borders,
 * alignment, column widths and row heights, merged cells, frozen panes, hidden rows, columns and sheets, links, how deep rows and columns
 * are folded, charts of the kinds the desk draws, how a sheet is printed, defined names, tables, and the add-in's settings. Whatever else a file holds is named in the report, never dropped in silence.
 */
import { ObjectMatrix } from '@univerjs/core'
import type { Grid } from '../grid'
import type { Settings } from './measures'
import { counted, readFile, type Opened } from './reading'
import { writeFile } from './writing'

export type { Settings } from './measures'

export interface Report {
  readonly sheets: number
  /** What the file holds and the desk does not keep, as short phrases; empty when everything is kept. */
  readonly notKept: readonly string[]
  /** Addresses of formulas that had a value in the file and have an error here. */
  readonly notCalculated: readonly string[]
}

/** The report in a sentence or three. */
export function sentenceOf({ sheets, notKept, notCalculated }: Report): string {
  const kept = notKept.length === 0 ? '' : ` Not kept here: ${notKept.join(', ')}.`
  const failed = counted(notCalculated.length, 'formula')
  const calculated =
    notCalculated.length === 0 ? '' : ` ${failed} cannot be calculated here, first ${notCalculated[0]}.`
  return `Opened ${counted(sheets, 'sheet')}.${kept}${calculated}`
}

let opened = 0

/**
 * Replaces the grid's workbook by the one in the file, and the settings by those in it.
 *
 * @param name  the file's name, which becomes the workbook's
 * @throws Error when the bytes are no .xlsx workbook; the grid then still holds what it held
 */
export async function openWorkbook(
  grid: Grid,
  bytes: ArrayBuffer | Uint8Array,
  settings: Settings,
  name = 'Workbook.xlsx',
): Promise<Report> {
  const file = await readFile(bytes, `workbook-${(opened += 1)}`, name)
  const notKept = [...file.notKept]

  const former = grid.api.getActiveWorkbook()
  if (former) grid.api.disposeUnit(former.getId())
  settings.clear()
  for (const [key, value] of file.settings) settings.set(key, value)
  const book = grid.api.createWorkbook(file.data)
  for (const { sheetId, name, range, header } of file.tables) {
    if (!(await book.addTable(sheetId, name, range, `table-${name}`, { showHeader: header })))
      notKept.push(`table ${name}`)
  }
  const sheets = book.getSheets()
  const shown = sheets.find((sheet, i) => i >= file.activeSheet && !sheet.isSheetHidden()) ?? sheets[0]
  if (shown) book.setActiveSheet(shown)
  const formulas = formulasIn(file)
  // Every formula is calculated anew: only so does the engine know which cells it spills into.
  grid.api.getFormula().executeCalculation()
  if (formulas.length > 0) await grid.api.getFormula().onCalculationResultApplied()
  const notCalculated = formulas
    .filter(({ failed }) => !failed)
    .filter(({ sheetId, row, column }) =>
      isError(book.getSheetBySheetId(sheetId)?.getSheet().getCellMatrix().getValue(row, column)?.v),
    )
    .map(({ sheetId, row, column }) => {
      const sheet = book.getSheetBySheetId(sheetId)
      return `${sheet?.getSheetName()}!${sheet?.getRange(row, column).getA1Notation()}`
    })
  return { sheets: sheets.length, notKept, notCalculated }
}

/** The grid's workbook as the bytes of an .xlsx file, with the add-in's settings inside. */
export const saveWorkbook = (grid: Grid, settings: Settings): Promise<ArrayBuffer> =>
  writeFile(grid, settings)

function formulasIn({ data }: Opened): { sheetId: string; row: number; column: number; failed: boolean }[] {
  const formulas: { sheetId: string; row: number; column: number; failed: boolean }[] = []
  for (const [sheetId, { cellData }] of Object.entries(data.sheets)) {
    new ObjectMatrix(cellData).forValue((row, column, cell) => {
      if (cell?.f) formulas.push({ sheetId, row, column, failed: isError(cell.v) })
    })
  }
  return formulas
}

const isError = (value: unknown): boolean =>
  typeof value === 'string' && /^#(?:[A-Z/\d]+[!?]?)$/.test(value) && value !== '#BUSY!'
