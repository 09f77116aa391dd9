/** The grid's workbook as a workbook file. */
import {
  Workbook,
  type CellErrorValue,
  type CellValue,
  type Style,
  type Worksheet,
} from '@cj-tech-master/excelts/browser'
import {
  BooleanNumber,
  CellValueType,
  type ICellData,
  type IRange,
  type IWorksheetData,
  type Nullable,
} from '@univerjs/core'
import {
  FormulaDataModel,
  FunctionType,
  IDefinedNamesService,
  IFunctionService,
} from '@univerjs/engine-formula'
import { figuresAt } from '../figures'
import type { Grid } from '../grid'
import { barOf, chartsOf, levelOf, linkOf, pageOf, type DataBar, type Line, type SheetChart } from '../office'
import { markSpilling, pack, putLinks, putNames, unpack, type StoredLink, type StoredName } from './archive'
import { fileStyle } from './cell-style'
import { putCharts } from './charts'
import { fileRule } from './data-bars'
import { filePage, pageNames } from './page-setup'
import { needsArray, storedFormula } from './formula-text'
import {
  CELL_LIMIT,
  DEFAULT_HEIGHT,
  DEFAULT_WIDTH,
  PIXELS,
  SETTINGS_SHEET,
  addressOf,
  widthOf,
  type Settings,
} from './measures'

const WHOLE_WORKBOOK = 'AllDefaultWorkbook'
/** The errors a file can hold as a formula's last result; the others are stored as #VALUE! and found again at the next calculation. */
const FILE_ERRORS: ReadonlySet<string> = new Set([
  '#N/A',
  '#REF!',
  '#NAME?',
  '#DIV/0!',
  '#NULL!',
  '#VALUE!',
  '#NUM!',
])
const ANY_ERROR = /^#[A-Z/\d]+[!?]?$/

export async function writeFile(grid: Grid, settings: Settings): Promise<ArrayBuffer> {
  const book = grid.api.getActiveWorkbook()
  if (!book) throw new Error('There is no workbook to save.')
  const injector = grid.univer.__getInjector()
  const functions = injector.get(IFunctionService)
  const addIn = (name: string): boolean => functions.getDescription(name)?.functionType === FunctionType.User
  const formulas = injector.get(FormulaDataModel)
  const data = book.save()

  const workbook = new Workbook()
  // Another program's engine has the last word on every result.
  workbook.calcProperties.fullCalcOnLoad = true
  const activeTab = Math.max(0, data.sheetOrder.indexOf(book.getActiveSheet().getSheetId()))
  workbook.views = [
    { x: 0, y: 0, width: 24_000, height: 14_000, firstSheet: 0, activeTab, visibility: 'visible' },
  ]
  const looks = new Map<string, Partial<Style>>()
  const lookOf = (cell: ICellData): Partial<Style> | undefined => {
    const style = typeof cell.s === 'string' ? data.styles[cell.s] : cell.s
    if (!style) return undefined
    const key = typeof cell.s === 'string' ? cell.s : JSON.stringify(style)
    const look = looks.get(key) ?? fileStyle(style)
    looks.set(key, look)
    return look
  }

  const links = new Map<string, StoredLink[]>()
  const charts = new Map<string, readonly SheetChart[]>()
  const printed: StoredName[] = []
  for (const id of data.sheetOrder) {
    const sheet = data.sheets[id]
    if (!sheet) continue
    const target = workbook.addWorksheet(sheet.name ?? id, { state: visibilityOf(sheet) })
    const cells = withSpills(sheet.cellData ?? {}, formulas.getArrayFormulaCellData()?.[data.id]?.[id])
    const linked: StoredLink[] = []
    links.set(target.name, linked)
    charts.set(target.name, chartsOf(sheet))
    printed.push(...pageNames(pageOf(sheet), target.name, workbook.worksheets.length - 1))
    const arrays = formulas.getArrayFormulaRange()?.[data.id]?.[id]
    const content = (row: number, column: number): CellValue =>
      contentOf(cells[row]?.[column], addressOf(arrays?.[row]?.[column] ?? at(row, column)), addIn)

    for (const table of book.getTableList().filter(({ subUnitId }) => subUnitId === id)) {
      writeTable(target, table, content)
    }
    eachCell(cells, (cell, row, column) => {
      const cellThere = target.getCell(row + 1, column + 1)
      const value = content(row, column)
      if (value !== null) cellThere.value = value
      const look = lookOf(cell)
      if (look) cellThere.style = look
      const link = linkOf(cell)
      if (link) linked.push({ ref: addressOf(at(row, column)), ...link })
    })
    writeBars(target, cells)
    writeShape(target, sheet)
  }
  writeSettings(workbook, settings)

  const parts = await unpack(new Uint8Array(await workbook.xlsx.writeBuffer()))
  putLinks(parts, links)
  putNames(parts, [
    ...namesOf(data.id, data.sheetOrder, injector.get(IDefinedNamesService), addIn),
    ...printed,
  ])
  putCharts(parts, charts, (reference) => figuresAt(grid, reference))
  markSpilling(parts)
  return pack(parts)
}

type Cells = Record<number, Nullable<Record<number, Nullable<ICellData>>>>

function eachCell(cells: Cells, visit: (cell: ICellData, row: number, column: number) => void): void {
  for (const [row, line] of Object.entries(cells)) {
    for (const [column, cell] of Object.entries(line ?? {})) {
      if (cell) visit(cell, Number(row), Number(column))
    }
  }
}

/** The cells with the values that formulas spill into them, which the sheet itself does not hold. */
function withSpills(own: Cells, spills: Cells | undefined): Cells {
  const cells: Record<number, Record<number, ICellData>> = {}
  eachCell(own, (cell, row, column) => ((cells[row] ??= {})[column] = cell))
  eachCell(spills ?? {}, ({ v, t }, row, column) => {
    const line = (cells[row] ??= {})
    const cell = line[column]
    if (cell?.v === undefined || cell.v === null)
      line[column] = { ...cell, ...(v === undefined ? {} : { v }), ...(t === undefined ? {} : { t }) }
  })
  return cells
}

function contentOf(cell: Nullable<ICellData>, ref: string, addIn: (name: string) => boolean): CellValue {
  if (!cell) return null
  const value = valueOf(cell)
  if (!cell.f) return value
  const formula = storedFormula(cell.f, addIn)
  const result = value === null ? {} : { result: value as string | number | boolean | CellErrorValue }
  return ref.includes(':') || needsArray(cell.f, addIn)
    ? { formula, ...result, shareType: 'array', ref }
    : { formula, ...result }
}

function valueOf({ v, t, f, p }: ICellData): string | number | boolean | CellErrorValue | null {
  const value = v ?? p?.body?.dataStream.replace(/\r\n$/, '')
  if (value === undefined || value === null) return null
  if (t === CellValueType.BOOLEAN) return Boolean(value)
  if (
    typeof value === 'string' &&
    ANY_ERROR.test(value) &&
    t !== CellValueType.FORCE_STRING &&
    (f || FILE_ERRORS.has(value))
  ) {
    return { error: (FILE_ERRORS.has(value) ? value : '#VALUE!') as CellErrorValue['error'] }
  }
  if (
    t === CellValueType.NUMBER &&
    typeof value === 'string' &&
    value !== '' &&
    Number.isFinite(Number(value))
  )
    return Number(value)
  return value
}

function writeShape(target: Worksheet, sheet: Partial<IWorksheetData>): void {
  const defaultWidth = sheet.defaultColumnWidth ?? DEFAULT_WIDTH
  target.properties.defaultColWidth = widthOf(defaultWidth)
  if (sheet.tabColor)
    target.properties.tabColor = { argb: `FF${sheet.tabColor.replace('#', '').toUpperCase()}` }
  for (const [column, { w, hd }] of entries(sheet.columnData)) {
    if (w !== undefined && w !== defaultWidth) target.getColumn(column + 1).width = widthOf(w)
    if (hd === BooleanNumber.TRUE) target.getColumn(column + 1).hidden = true
  }
  target.properties.outlineLevelCol = writeLevels(sheet.columnData, (column) => target.getColumn(column + 1))
  const defaultHeight = sheet.defaultRowHeight ?? DEFAULT_HEIGHT
  for (const [row, { h, hd, ah, ia }] of entries(sheet.rowData)) {
    // The library forgets a hidden row without cells unless it has a height.
    if (hd === BooleanNumber.TRUE)
      Object.assign(target.getRow(row + 1), { hidden: true, height: (h ?? defaultHeight) / PIXELS })
    else if (ah !== undefined && ia !== BooleanNumber.FALSE)
      // as its texts ask for; not every program finds that out by itself, and lines would lie over those of the row above
      Object.assign(target.getRow(row + 1), { height: ah / PIXELS, customHeight: false })
    else if (h !== undefined && h !== defaultHeight) target.getRow(row + 1).height = h / PIXELS
  }
  target.properties.outlineLevelRow = writeLevels(sheet.rowData, (row) => {
    const line = target.getRow(row + 1)
    // nor does it keep the level of such a row
    if (!line.hasValues) line.height ??= defaultHeight / PIXELS
    return line
  })
  Object.assign(target, filePage(pageOf(sheet)))
  if (sheet.custom?.['outline']) target.properties.outlineProperties = sheet.custom['outline'] as Outline
  for (const range of sheet.mergeData ?? []) target.mergeCellsWithoutStyle(addressOf(range))
  const { xSplit = 0, ySplit = 0 } = sheet.freeze ?? {}
  const common = {
    showGridLines: sheet.showGridlines !== BooleanNumber.FALSE,
    ...(sheet.zoomRatio && sheet.zoomRatio !== 1 ? { zoomScale: Math.round(sheet.zoomRatio * 100) } : {}),
  }
  target.views = [
    xSplit > 0 || ySplit > 0
      ? { ...common, state: 'frozen', xSplit, ySplit }
      : { ...common, state: 'normal' },
  ]
}

/** Writes each data bar once, over all cells that have it. */
function writeBars(target: Worksheet, cells: Cells): void {
  const bars = new Map<string, { readonly bar: DataBar; readonly places: IRange[] }>()
  eachCell(cells, (cell, row, column) => {
    const bar = barOf(cell)
    if (!bar) return
    const { places } = bars.get(bar.id) ?? { places: [] as IRange[] }
    const above = places.findIndex(({ endRow, startColumn }) => endRow === row - 1 && startColumn === column)
    const place = places[above]
    if (place) places[above] = { ...place, endRow: row }
    else places.push(at(row, column))
    bars.set(bar.id, { bar, places })
  })
  ;[...bars.values()].forEach(({ bar, places }, k) => {
    target.addConditionalFormatting({
      ref: places.map(addressOf).join(' '),
      rules: [fileRule(bar, k + 1)],
    })
  })
}

type Outline = NonNullable<Worksheet['properties']['outlineProperties']>

/**
 * Writes how deep rows or columns are folded. Those that are folded away are hidden ones in the file as well.
 * @returns the deepest
 */
function writeLevels(
  lines: Record<number, Line> | undefined,
  lineAt: (line: number) => { outlineLevel: number | undefined },
): number {
  let deepest = 0
  for (const [at, line] of entries(lines)) {
    const level = levelOf(line)
    if (level === 0) continue
    // the library's own idea of which lines are folded marks the deepest ones, folded or not
    Object.defineProperty(Object.assign(lineAt(at), { outlineLevel: level }), 'collapsed', { value: false })
    deepest = Math.max(deepest, level)
  }
  return deepest
}

function writeTable(
  target: Worksheet,
  {
    name,
    range,
    columns,
    showHeader,
  }: { name: string; range: IRange; columns: readonly { displayName: string }[]; showHeader: boolean },
  content: (row: number, column: number) => CellValue,
): void {
  const { startRow, endRow, startColumn, endColumn } = range
  const first = showHeader ? startRow + 1 : startRow
  target.addTable({
    name,
    ref: addressOf(at(startRow, startColumn)),
    headerRow: showHeader,
    columns: columns.map(({ displayName }, i) => ({
      name: showHeader ? String(content(startRow, startColumn + i) ?? displayName) : displayName,
      filterButton: true,
    })),
    rows: Array.from({ length: endRow - first + 1 }, (_, i) =>
      Array.from({ length: endColumn - startColumn + 1 }, (_, j) => content(first + i, startColumn + j)),
    ),
  })
}

function writeSettings(workbook: Workbook, settings: Settings): void {
  if (settings.size === 0) return
  const sheet = workbook.addWorksheet(SETTINGS_SHEET, { state: 'veryHidden' })
  for (const [key, value] of settings) {
    const json = JSON.stringify(value)
    const pieces = Array.from({ length: Math.ceil(json.length / CELL_LIMIT) }, (_, i) =>
      json.slice(i * CELL_LIMIT, (i + 1) * CELL_LIMIT),
    )
    const row = sheet.addRow([key, ...pieces])
    row.eachCell((cell) => (cell.numFmt = '@'))
  }
}

function namesOf(
  unitId: string,
  sheetOrder: readonly string[],
  service: IDefinedNamesService,
  addIn: (name: string) => boolean,
): StoredName[] {
  return Object.values(service.getDefinedNameMap(unitId) ?? {}).map(
    ({ name, formulaOrRefString, comment, hidden, localSheetId }) => {
      const sheet = localSheetId && localSheetId !== WHOLE_WORKBOOK ? sheetOrder.indexOf(localSheetId) : -1
      return {
        name,
        formula: storedFormula(formulaOrRefString, addIn),
        ...(comment ? { comment } : {}),
        ...(hidden ? { hidden } : {}),
        ...(sheet >= 0 ? { sheet } : {}),
      }
    },
  )
}

function visibilityOf({ hidden, custom }: Partial<IWorksheetData>): 'visible' | 'hidden' | 'veryHidden' {
  if (hidden !== BooleanNumber.TRUE) return 'visible'
  return custom?.['visibility'] === 'veryHidden' ? 'veryHidden' : 'hidden'
}

const entries = <Value>(record: Record<number, Value> | undefined): [number, Value][] =>
  Object.entries(record ?? {}).map(([key, value]) => [Number(key), value])

const at = (row: number, column: number): IRange => ({
  startRow: row,
  endRow: row,
  startColumn: column,
  endColumn: column,
})
