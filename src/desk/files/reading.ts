/** A workbook file as the grid's own description of a workbook, and what of the file that description has no place for. */
import { Workbook, type Cell, type CellFormulaValue, type Worksheet } from '@cj-tech-master/excelts/browser'
import {
  BooleanNumber,
  CellValueType,
  LocaleType,
  type ICellData,
  type IColumnData,
  type IObjectArrayPrimitiveType,
  type IRange,
  type IRowData,
  type IWorkbookData,
  type IWorksheetData,
} from '@univerjs/core'
import type { IDefinedNamesServiceParam } from '@univerjs/engine-formula'
import { withBar, withDrawn, withLevel, withLink, type SheetChart, type SheetPage } from '../office'
import {
  namesIn,
  sheetPaths,
  takeLinks,
  textOf,
  unpack,
  type Parts,
  type StoredLink,
  type StoredName,
} from './archive'
import { gridStyle, paletteOf, type Palette } from './cell-style'
import { chartsIn } from './charts'
import { barLooksIn, gridBar, type BarLooks } from './data-bars'
import { shownFormula } from './formula-text'
import { pageIn } from './page-setup'
import {
  DEFAULT_HEIGHT,
  DEFAULT_WIDTH,
  PIXELS,
  SETTINGS_SHEET,
  pixelsOf,
  rangeOf,
  type Settings,
} from './measures'

export interface Opened {
  readonly data: IWorkbookData & { readonly sheetOrder: string[] }
  readonly tables: readonly {
    readonly sheetId: string
    readonly name: string
    readonly range: IRange
    readonly header: boolean
  }[]
  readonly settings: Settings
  readonly activeSheet: number
  /** Phrases such as "2 charts". */
  readonly notKept: readonly string[]
}

/** Room to work beyond what the file uses; writing outside the sheet is an error in the grid. */
const SPARE_ROWS = 500
const SPARE_COLUMNS = 30
/** Serial number of 1 January 1970. */
const EPOCH = 25_569
const DAY = 86_400_000
const NAMES_RESOURCE = 'SHEET_DEFINED_NAME_PLUGIN'
const WHOLE_WORKBOOK = 'AllDefaultWorkbook'

export async function readFile(
  bytes: ArrayBuffer | Uint8Array,
  unitId: string,
  name: string,
): Promise<Opened> {
  const { parts, workbook, links } = await parse(bytes)
  const sheets = workbook.worksheets.filter((sheet) => sheet.name !== SETTINGS_SHEET)
  if (sheets.length === 0) throw new Error('The file holds no worksheet.')
  const losses = new Losses(parts)
  const barLooks = barLooksIn(parts)
  const palette = paletteOf(textOf(parts, 'xl/theme/theme1.xml'))
  const ids = sheets.map((_, i) => `sheet-${i + 1}`)
  const stored = namesIn(parts)
  const drawn = drawnIn(parts, workbook, stored, losses)
  const converted = sheets.map((sheet, i): [string, Partial<IWorksheetData>] => {
    const made = gridSheet(sheet, ids[i] ?? '', links.get(sheet.name) ?? [], palette, barLooks, losses)
    const { charts, page } = drawn(sheet.name)
    // a chart may lie beyond the cells that are used
    const rowCount = Math.max(made.rowCount ?? 0, ...charts.map(({ to }) => to.row + 1))
    const columnCount = Math.max(made.columnCount ?? 0, ...charts.map(({ to }) => to.column + 1))
    return [ids[i] ?? '', { ...made, rowCount, columnCount, ...withDrawn({ charts, page }, made) }]
  })
  const names = gridNames(
    stored,
    workbook,
    new Map(sheets.map((sheet, i) => [sheet.name, ids[i] ?? ''])),
    losses,
  )
  if (workbook.properties.date1904)
    losses.add('dates counted from 1904 (shown four years early where they are computed)')
  return {
    data: {
      id: unitId,
      name,
      appVersion: '',
      locale: LocaleType.EN_US,
      styles: {},
      sheetOrder: ids,
      sheets: Object.fromEntries(converted),
      resources: [{ name: NAMES_RESOURCE, data: JSON.stringify(names) }],
    },
    tables: sheets.flatMap((sheet, i) =>
      sheet.getTables().map(({ model }) => ({
        sheetId: ids[i] ?? '',
        name: model.name,
        range: rangeOf(model.tableRef ?? model.ref),
        header: model.headerRow !== false,
      })),
    ),
    settings: settingsIn(workbook.getWorksheet(SETTINGS_SHEET), losses),
    activeSheet: workbook.views?.[0]?.activeTab ?? 0,
    notKept: losses.phrases(),
  }
}

interface Parsed {
  readonly parts: Parts
  readonly workbook: Workbook
  /** by sheet */
  readonly links: ReadonlyMap<string, readonly StoredLink[]>
}

async function parse(bytes: ArrayBuffer | Uint8Array): Promise<Parsed> {
  try {
    const parts = await unpack(bytes)
    if (!parts['xl/workbook.xml']) throw new Error('no workbook part')
    const links = takeLinks(parts)
    const workbook = new Workbook()
    await workbook.xlsx.loadFromFiles(parts)
    return { parts, workbook, links }
  } catch (cause) {
    throw new Error('The file is not an .xlsx workbook that can be read here.', { cause })
  }
}

/** Counts what is left behind and says it in words. */
class Losses {
  private readonly counts = new Map<string, number>()

  constructor(parts: Parts) {
    const count = (pattern: RegExp): number => Object.keys(parts).filter((path) => pattern.test(path)).length
    this.add('picture', count(/^xl\/media\//))
    this.add('pivot table', count(/^xl\/pivotTables\/[^/]+\.xml$/))
    this.add('slicer', count(/^xl\/slicers\/[^/]+\.xml$/))
    this.add('sheet with comments', count(/^xl\/(?:comments\d*|threadedComments\/[^/]+)\.xml$/))
    this.add('link to another workbook', count(/^xl\/externalLinks\/[^/]+\.xml$/))
    this.add('macro project', count(/vbaProject\.bin$/))
    this.add('setting of another add-in', count(/^xl\/webextensions\/webextension\d*\.xml$/))
  }

  add(phrase: string, count = 1): void {
    if (count > 0) this.counts.set(phrase, (this.counts.get(phrase) ?? 0) + count)
  }

  phrases(): string[] {
    return [...this.counts].map(([phrase, count]) =>
      /\(|^dates/.test(phrase) ? phrase : counted(count, phrase),
    )
  }
}

export function counted(count: number, noun: string): string {
  if (count === 1) return `1 ${noun}`
  const [, head = noun, tail = ''] = /^(.*?)( (?:with|to|of|in|on)\b.*)?$/.exec(noun) ?? []
  return `${count} ${head}s${tail}`
}

function gridSheet(
  sheet: Worksheet,
  id: string,
  links: readonly StoredLink[],
  palette: Palette,
  barLooks: BarLooks,
  losses: Losses,
): Partial<IWorksheetData> {
  const spilledInto = new Set<string>()
  const cellData: Record<number, Record<number, ICellData>> = {}
  const rowData: IObjectArrayPrimitiveType<Partial<IRowData>> = {}
  sheet.eachRow({ includeEmpty: true }, (row, number) => {
    const look = {
      ...(row.height ? heightOf(row.height, row.customHeight === true) : {}),
      ...(row.hidden ? { hd: BooleanNumber.TRUE } : {}),
      ...(row.outlineLevel ? withLevel(row.outlineLevel) : {}),
    }
    if (Object.keys(look).length > 0) rowData[number - 1] = look
    row.eachCell({ includeEmpty: true }, (cell, column) => {
      const content = spilledInto.has(`${number},${column}`) ? {} : contentOf(cell, spilledInto, losses)
      const style = gridStyle(cell.style, palette)
      const data: ICellData = style ? { ...content, s: style } : content
      if (Object.keys(data).length > 0) (cellData[number - 1] ??= {})[column - 1] = data
    })
  })
  for (const { ref, ...link } of links) {
    const { startRow, startColumn, endRow, endColumn } = rangeOf(ref)
    // a link may lie on whole rows or columns: what is not used of them stays without
    for (let row = startRow; row <= Math.min(endRow, sheet.rowCount - 1); row++)
      for (let column = startColumn; column <= Math.min(endColumn, sheet.columnCount - 1); column++) {
        const line = (cellData[row] ??= {})
        line[column] = { ...line[column], ...withLink(link, line[column]) }
      }
  }
  const { state, conditionalFormattings, autoFilter, sheetProtection } = sheet
  conditionalFormattings.forEach(({ ref, rules }, k) =>
    rules.forEach((rule, r) => {
      const bar = gridBar(rule, `${id}-bar-${k}-${r}`, barLooks)
      if (!bar) return losses.add('conditional format')
      for (const { startRow, startColumn, endRow, endColumn } of ref.split(' ').map(rangeOf))
        for (let row = startRow; row <= Math.min(endRow, sheet.rowCount - 1); row++)
          for (let column = startColumn; column <= Math.min(endColumn, sheet.columnCount - 1); column++) {
            const line = (cellData[row] ??= {})
            line[column] = { ...line[column], ...withBar(bar, line[column]) }
          }
    }),
  )
  losses.add('filter', autoFilter ? 1 : 0)
  losses.add('protected sheet', sheetProtection ? 1 : 0)
  losses.add('data validation', Object.keys(sheet.model.dataValidations ?? {}).length)

  const view = sheet.model.views?.[0]
  const frozen =
    view?.state === 'frozen'
      ? { xSplit: view.xSplit ?? 0, ySplit: view.ySplit ?? 0 }
      : { xSplit: 0, ySplit: 0 }
  const colour = sheet.properties.tabColor?.argb
  return {
    id,
    name: sheet.name,
    rowCount: Math.max(1000, sheet.rowCount + SPARE_ROWS),
    columnCount: Math.max(40, sheet.columnCount + SPARE_COLUMNS),
    defaultColumnWidth: sheet.properties.defaultColWidth
      ? pixelsOf(sheet.properties.defaultColWidth)
      : DEFAULT_WIDTH,
    defaultRowHeight: DEFAULT_HEIGHT,
    cellData,
    rowData,
    columnData: gridColumns(sheet),
    mergeData: (sheet.model.merges ?? []).map(rangeOf),
    freeze: {
      ...frozen,
      startRow: frozen.ySplit || -1,
      startColumn: frozen.xSplit || -1,
    },
    hidden: state === 'visible' ? BooleanNumber.FALSE : BooleanNumber.TRUE,
    showGridlines: view?.showGridLines === false ? BooleanNumber.FALSE : BooleanNumber.TRUE,
    ...(colour ? { tabColor: `#${colour.slice(-6)}` } : {}),
    ...(view?.zoomScale ? { zoomRatio: view.zoomScale / 100 } : {}),
    custom: {
      // The grid has no third state of its own, and no outlines.
      ...(state === 'veryHidden' ? { visibility: 'veryHidden' } : {}),
      ...(sheet.properties.outlineProperties ? { outline: sheet.properties.outlineProperties } : {}),
    },
  }
}

/** A height that a user chose stays; one that texts asked for goes on following them. */
const heightOf = (points: number, isChosen: boolean): Partial<IRowData> => {
  const pixels = Math.round(points * PIXELS)
  return isChosen ? { h: pixels, ia: BooleanNumber.FALSE } : { ah: pixels }
}

function gridColumns(sheet: Worksheet): IObjectArrayPrimitiveType<Partial<IColumnData>> {
  const columns: IObjectArrayPrimitiveType<Partial<IColumnData>> = {}
  for (const { min, max, width, hidden, outlineLevel } of sheet.model.cols ?? []) {
    const look = {
      ...(width ? { w: pixelsOf(width) } : {}),
      ...(hidden ? { hd: BooleanNumber.TRUE } : {}),
      ...(outlineLevel ? withLevel(outlineLevel) : {}),
    }
    // A file may give a width to all 16,384 columns at once.
    for (let column = min; column <= Math.min(max, sheet.columnCount + SPARE_COLUMNS); column++)
      columns[column - 1] = look
  }
  return columns
}

/** Fills `spilledInto` with the cells a formula covers: in the file they hold its values, in the grid they would be in its way. */
function contentOf(cell: Cell, spilledInto: Set<string>, losses: Losses): ICellData {
  if (cell.isMerged && cell.master !== cell) return {}
  if (cell.note) losses.add('note')
  const { value } = cell
  if (cell.formula) {
    const { shareType, ref } = value as CellFormulaValue & { shareType?: string; ref?: string }
    if (shareType === 'array' && ref) {
      const { startRow, endRow, startColumn, endColumn } = rangeOf(ref)
      for (let row = startRow; row <= endRow; row++) {
        for (let column = startColumn; column <= endColumn; column++)
          spilledInto.add(`${row + 1},${column + 1}`)
      }
    }
    return { f: shownFormula(cell.formula), ...literal(cell.result) }
  }
  if (typeof value === 'object' && value !== null) {
    if ('richText' in value) {
      losses.add('cell with formats on part of its text', value.richText.length > 1 ? 1 : 0)
      return literal(value.richText.map(({ text }) => text).join(''))
    }
    if ('checkbox' in value) return literal(value.checkbox)
  }
  return literal(value)
}

function literal(value: unknown): ICellData {
  if (typeof value === 'number') return { v: value, t: CellValueType.NUMBER }
  if (typeof value === 'boolean') return { v: value ? 1 : 0, t: CellValueType.BOOLEAN }
  if (value instanceof Date) return { v: value.getTime() / DAY + EPOCH, t: CellValueType.NUMBER }
  if (typeof value === 'string') {
    // What would be taken for a formula or a number if it were typed is kept as text explicitly.
    const forced = /^[=+\-@]/.test(value) || (value.trim() !== '' && !Number.isNaN(Number(value)))
    return { v: value, t: forced ? CellValueType.FORCE_STRING : CellValueType.STRING }
  }
  if (typeof value === 'object' && value !== null && 'error' in value)
    return { v: String(value.error), t: CellValueType.STRING }
  return {}
}

/** The charts and the page of a sheet, by its name. */
function drawnIn(
  parts: Parts,
  workbook: Workbook,
  names: readonly StoredName[],
  losses: Losses,
): (sheet: string) => { readonly charts: readonly SheetChart[]; readonly page: SheetPage } {
  const { charts, left, inPart } = chartsIn(parts)
  losses.add('chart', left)
  losses.add('colours, labels and lines of charts (their figures, title and place are kept)', inPart)
  const paths = sheetPaths(parts)
  return (sheet) => {
    const own = names.filter(({ sheet: at }) => at !== undefined && workbook.worksheets[at]?.name === sheet)
    const { page, left: unkept } = pageIn(textOf(parts, paths.get(sheet) ?? ''), own)
    losses.add('print setting', unkept)
    return { charts: charts.get(sheet) ?? [], page }
  }
}

function gridNames(
  stored: readonly StoredName[],
  workbook: Workbook,
  ids: ReadonlyMap<string, string>,
  losses: Losses,
): Record<string, IDefinedNamesServiceParam> {
  const names: Record<string, IDefinedNamesServiceParam> = {}
  for (const [i, { name, formula, comment, hidden, sheet }] of stored.entries()) {
    if (name.startsWith('_xlnm.')) {
      // what is printed is read with the page, and filters are counted where they stand
      if (!/^_xlnm\.(?:Print_|_FilterDatabase)/.test(name)) losses.add('name of an advanced filter')
      continue
    }
    const shown = shownFormula(formula)
    const id = `name-${i + 1}`
    names[id] = {
      id,
      name,
      // A reference stands alone; a constant or a formula keeps its equals sign.
      formulaOrRefString: /^=(?:'(?:[^']|'')+'|[\p{L}\p{N}_.]+)!\$?[A-Z]+\$?\d+(?::\$?[A-Z]+\$?\d+)?$/u.test(
        shown,
      )
        ? shown.slice(1)
        : shown,
      localSheetId:
        (sheet === undefined ? undefined : ids.get(workbook.worksheets[sheet]?.name ?? '')) ?? WHOLE_WORKBOOK,
      ...(comment === undefined ? {} : { comment }),
      ...(hidden ? { hidden } : {}),
    }
  }
  return names
}

function settingsIn(sheet: Worksheet | undefined, losses: Losses): Settings {
  const settings: Settings = new Map()
  sheet?.eachRow((row) => {
    const [key, ...pieces] = (Array.isArray(row.values) ? row.values.slice(1) : []).map(String)
    if (key === undefined) return
    try {
      settings.set(key, JSON.parse(pieces.join('')))
    } catch {
      losses.add(`the add-in's setting (${key}, unreadable)`)
    }
  })
  return settings
}
