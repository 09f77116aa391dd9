/**
 * Sheets of formulas worked out by two engines that are not ours: the one under the desk's grid, and LibreOffice Calc from the file that
 * the desk saves. Many books go in one workbook, since either engine takes longer to start than to calculate.
 */
import { CellValueType, type ICellData, type IWorkbookData } from '@univerjs/core'
import { saveWorkbook } from '../src/desk/files'
import { headlessGrid, type Grid } from '../src/desk/grid'
import { breakDown } from '../src/sheet/breakdown'
import { modelOf, type Blocks } from '../src/sheet/book-model'
import { steppingCalculator } from '../src/sheet/calculator'
import { columnLetters, PLAIN_CULTURE, type Area, type CellValue } from '../src/sheet/cells'
import { readHoldings } from '../src/sheet/holdings'
import { matchHoldings } from '../src/sheet/matching'
import type { ProofInput } from '../src/sheet/proof'
import { readReturns } from '../src/sheet/returns'
import { DEFAULT_SETTINGS, type Settings } from '../src/sheet/settings'
import type { Table } from '../src/sheet/table'
import { recalculated } from './calc'

type Cells = readonly (readonly CellValue[])[]

/** A book as its user has it in cells, on two sheets that carry its name. */
export interface BookCells {
  /** short, as sheets are named by it; any signs a sheet's name may have */
  readonly name: string
  readonly holdings: Cells
  readonly returns: Cells
  /** of the sheet of returns, where books share one; else the book's own name */
  readonly data?: string
  readonly factors?: Cells
  readonly settings?: Partial<Settings>
}

/** Where the blocks of a book lie: off the corner, so that a reference that counts from the wrong cell is seen. */
const placeOf = (sheet: string, cells: Cells, row: number, column: number): Area => ({
  sheet,
  row,
  column,
  rows: cells.length,
  columns: cells[0]?.length ?? 0,
})
const placesOf = ({ name, holdings, returns, data, factors }: BookCells) => ({
  holdings: placeOf(`${name} book`, holdings, 3, 1),
  returns: placeOf(`${data ?? name} data`, returns, 1, 2),
  factors: factors && placeOf(`${name} factors`, factors, 0, 0),
})

/** What the add-in makes of a book: everything a table of it is laid out from. */
export async function computed(book: BookCells): Promise<ProofInput> {
  const settings: Settings = { ...DEFAULT_SETTINGS, ...book.settings }
  const places = placesOf(book)
  const holdings = readHoldings({ area: places.holdings, values: book.holdings }, settings, PLAIN_CULTURE)
  const returns = readReturns({ area: places.returns, values: book.returns }, settings, PLAIN_CULTURE)
  const factors =
    places.factors && book.factors
      ? readReturns(
          { area: places.factors, values: book.factors },
          { content: null, orientation: null, returnKind: 'simple' },
          PLAIN_CULTURE,
        )
      : null
  const stops = [...holdings.findings, ...returns.findings].filter(({ weight }) => weight === 'stops')
  if (stops.length > 0) throw new Error(`${book.name}: ${stops.map(({ sentence }) => sentence).join(' ')}`)
  const match = matchHoldings(holdings, returns, settings.riskless, settings.currency)
  const blocks: Blocks = { holdings, returns, factors, match }
  const work = { signal: new AbortController().signal, progress: () => undefined }
  const model = await modelOf(blocks, settings, steppingCalculator, work)
  return { title: book.name, blocks, book: model, settings, breakdown: breakDown(blocks, model, settings) }
}

/** A table that is to be worked out, on a sheet of its own beside the book's. */
export interface Laid {
  readonly book: BookCells
  readonly table: Table
}

/** Where a table of a book goes: an area of one cell, its corner. */
export const cornerOf = ({ name }: BookCells): Area => ({
  sheet: `${name} proof`,
  row: 2,
  column: 1,
  rows: 1,
  columns: 1,
})

/** What a cell of a table shows, counted from 0 within it: errors as their text, blanks as ''. */
export type Shown = (row: number, column: number) => CellValue

export interface Workout {
  readonly grid: Grid
  /** What the table of a book shows now. */
  shown(book: BookCells): Shown
  /** Types a number into a cell, or empties it, by its place within one of the book's blocks, and waits for the engine. */
  change(
    book: BookCells,
    block: 'holdings' | 'returns',
    row: number,
    column: number,
    value: number | '',
  ): Promise<void>
  /** The workbook as a file. */
  saved(): Promise<Uint8Array>
  dispose(): void
}

const cellDataOf = (value: CellValue, formula?: string): ICellData => {
  if (formula !== undefined) return { f: formula }
  if (typeof value === 'boolean') return { v: value ? 1 : 0, t: CellValueType.BOOLEAN }
  return { v: value, t: typeof value === 'number' ? CellValueType.NUMBER : CellValueType.STRING }
}

function sheetOf(
  id: string,
  name: string,
  corner: { row: number; column: number },
  rows: readonly (readonly ICellData[])[],
) {
  const cellData = Object.fromEntries(
    rows.map((row, r) => [
      corner.row + r,
      Object.fromEntries(
        row.flatMap((cell, c) => (cell.v === '' && !cell.f ? [] : [[corner.column + c, cell]])),
      ),
    ]),
  )
  return {
    id,
    name,
    rowCount: corner.row + rows.length + 50,
    columnCount: corner.column + (rows[0]?.length ?? 0) + 10,
    cellData,
  }
}

/** Puts books and their tables into one workbook of the desk and has its engine work out every formula. */
export async function workedOut(laid: readonly Laid[]): Promise<Workout> {
  /** by name: the sheet of returns that books share is there once */
  const sheets = new Map<string, ReturnType<typeof sheetOf>>()
  const add = (place: Area, cells: readonly (readonly ICellData[])[]): void => {
    if (!sheets.has(place.sheet))
      sheets.set(place.sheet, sheetOf(`sheet-${sheets.size}`, place.sheet, place, cells))
  }
  const plain = (cells: Cells) => cells.map((row) => row.map((value) => cellDataOf(value)))
  for (const { book, table } of laid) {
    const places = placesOf(book)
    add(places.holdings, plain(book.holdings))
    add(places.returns, plain(book.returns))
    if (places.factors && book.factors) add(places.factors, plain(book.factors))
    add(
      cornerOf(book),
      table.cells.map((row) => row.map(({ value, formula }) => cellDataOf(value, formula))),
    )
  }
  const workbook: Partial<IWorkbookData> = {
    id: 'workbook',
    name: 'Books',
    sheetOrder: [...sheets.values()].map(({ id }) => id),
    sheets: Object.fromEntries([...sheets.values()].map((sheet) => [sheet.id, sheet])),
  }
  const grid = headlessGrid(workbook)
  const calculated = () => grid.api.getFormula().onCalculationResultApplied()
  grid.api.getFormula().executeCalculation()
  await calculated()
  const sheetNamed = (name: string) => {
    const sheet = grid.api.getActiveWorkbook()?.getSheetByName(name)
    if (!sheet) throw new Error(`no sheet ${name}`)
    return sheet
  }
  return {
    grid,
    shown(book) {
      const corner = cornerOf(book)
      const matrix = sheetNamed(corner.sheet).getSheet().getCellMatrix()
      return (row, column) => {
        const cell = matrix.getValue(corner.row + row, corner.column + column)
        if (cell?.t === CellValueType.BOOLEAN) return Boolean(cell.v)
        return cell?.v ?? ''
      }
    },
    async change(book, block, row, column, value) {
      const place = placesOf(book)[block]
      const cell = sheetNamed(place.sheet).getRange(place.row + row, place.column + column)
      if (value === '') cell.clearContent()
      else cell.setValue(value)
      await calculated()
    },
    saved: async () => new Uint8Array(await saveWorkbook(grid, new Map())),
    dispose: () => grid.dispose(),
  }
}

/** The same workbook opened and worked out by LibreOffice Calc. */
export async function workedOutByCalc(saved: Uint8Array): Promise<(book: BookCells) => Shown> {
  const reading = await recalculated(saved)
  return (book) => {
    const corner = cornerOf(book)
    return (row, column) => {
      const found = reading.value(
        corner.sheet,
        `${columnLetters(corner.column + column)}${corner.row + row + 1}`,
      )
      if (found === null) return ''
      return typeof found === 'object' ? found.error : found
    }
  }
}
