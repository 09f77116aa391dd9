import { Fault } from '../core'
import {
  addressOf,
  cellOf,
  isFormula,
  overlap,
  type Area,
  type Block,
  type CellValue,
  type ReadOptions,
  type Seen,
  type Want,
} from '../sheet'
import { areasIn, SHEET_COLUMNS, SHEET_ROWS } from './addresses'
import { isTooLarge, offers, REQUEST_BYTES, type Request } from './requests'

/** A number takes about this much of an answer. */
const CELL_BYTES = 20

/** More cells than this are surely not one book's data, and would fill the memory of the pane. */
const MOST_CELLS = 20_000_000

/** Workbook names of ours begin so. */
export const NAME_PREFIX = 'Poise_'

const PLACE = 'rowIndex,columnIndex,rowCount,columnCount'

export const rangeOf = (context: Excel.RequestContext, area: Area): Excel.Range =>
  context.workbook.worksheets
    .getItem(area.sheet)
    .getRangeByIndexes(area.row, area.column, area.rows, area.columns)

const areaOf = (sheet: string, range: Excel.Range): Area => ({
  sheet,
  row: range.rowIndex,
  column: range.columnIndex,
  rows: range.rowCount,
  columns: range.columnCount,
})

/** Whether an area runs over whole rows or columns, as a click on their heads selects them. */
const isEndless = (area: Area): boolean => area.rows >= SHEET_ROWS || area.columns >= SHEET_COLUMNS

/** Cuts an area of whole rows or columns to what is used of the sheet. */
function cut(area: Area, used: Area | null): Area {
  const shared = used && overlap(area, used)
  if (shared) return shared
  throw new Fault(
    'selection',
    `nothing is filled in ${addressOf(area)}`,
    'select the cells that hold the data',
  )
}

/** The block of cells the user has selected. */
export async function selection({ context, sync }: Request): Promise<Area> {
  const chosen = context.workbook.getSelectedRanges()
  chosen.load('areaCount,address')
  const areas = chosen.areas
  areas.load(`items/${PLACE.replaceAll(',', ',items/')},items/isEntireRow,items/isEntireColumn`)
  const sheet = chosen.worksheet
  sheet.load('name')
  const used = sheet.getUsedRangeOrNullObject(true)
  used.load(PLACE)
  await sync()
  const [first, second] = areas.items
  if (!first || second) {
    throw new Fault(
      'selection',
      `${chosen.areaCount} areas are selected (${chosen.address})`,
      'select one block of cells',
    )
  }
  const area = areaOf(sheet.name, first)
  if (!first.isEntireRow && !first.isEntireColumn) return area
  return cut(area, used.isNullObject ? null : areaOf(sheet.name, used))
}

interface Shape {
  readonly hiddenRows?: ReadonlySet<number>
  readonly merged?: readonly Area[]
}

/**
 * Asks which rows of a range are hidden and which of its cells merged; the answer can be read after the next sync. What the host cannot
 * tell is left out: merged areas before ExcelApi 1.13, single hidden rows when the first and the last column are hidden too.
 */
function askShape(range: Excel.Range): (area: Area) => Shape {
  range.load('rowHidden')
  const merged = offers('1.13') ? range.getMergedAreasOrNullObject() : null
  merged?.load('address')
  // the addresses of one column name the rows that show, at little cost; but a hidden column shows no row
  const views = [range.getColumn(0), range.getLastColumn()].map((column) => {
    const view = column.getVisibleView()
    view.load('cellAddresses')
    return view
  })
  return (area) => ({
    ...hiddenRows(area, range.rowHidden as boolean | null, views),
    ...(merged && {
      merged: merged.isNullObject
        ? []
        : areasIn(merged.address, area.sheet).filter((found) => found !== null),
    }),
  })
}

function hiddenRows(area: Area, all: boolean | null, views: readonly Excel.RangeView[]): Shape {
  const rows = new Set(Array.from({ length: area.rows }, (_, k) => k))
  if (all === false) return { hiddenRows: new Set() }
  if (all) return { hiddenRows: rows }
  const shown = views
    .map((view) => view.cellAddresses as string[][])
    .find((addresses) => addresses.length > 0)
  if (!shown) return {}
  for (const [address = ''] of shown) rows.delete((areasIn(address, area.sheet)[0]?.row ?? NaN) - area.row)
  return { hiddenRows: rows }
}

/**
 * Reads an area of any size, a bounded block of rows a request. Whole rows and columns are cut to what is used.
 *
 * @throws Fault "selection" when nothing is used there or it is beyond all measure, "missing", "cancelled", "host"
 */
export async function readBlock(request: Request, wanted: Area, options: ReadOptions = {}): Promise<Block> {
  const { context, sync } = request
  const { progress, signal } = options
  const goOn = () => {
    if (signal?.aborted)
      throw new Fault('cancelled', `reading ${addressOf(wanted)} was cancelled`, 'start it again')
  }
  goOn()

  let area = wanted
  if (isEndless(wanted)) {
    const used = context.workbook.worksheets.getItem(wanted.sheet).getUsedRangeOrNullObject(true)
    used.load(PLACE)
    await sync()
    area = cut(wanted, used.isNullObject ? null : areaOf(wanted.sheet, used))
  }
  if (area.rows * area.columns > MOST_CELLS) {
    throw new Fault(
      'selection',
      `${addressOf(area)} holds ${area.rows * area.columns} cells`,
      `a block of at most ${MOST_CELLS} can be read`,
    )
  }

  const values: CellValue[][] = []
  let step = Math.max(1, Math.floor(REQUEST_BYTES / (CELL_BYTES * area.columns)))
  while (values.length < area.rows) {
    goOn()
    const rows = Math.min(step, area.rows - values.length)
    const range = rangeOf(context, { ...area, row: area.row + values.length, rows })
    range.load('values')
    try {
      await sync()
    } catch (error) {
      // long texts can make a block larger than its number of cells lets expect
      if (!isTooLarge(error) || rows === 1) throw error
      step = Math.ceil(rows / 2)
      continue
    }
    for (const row of range.values as CellValue[][]) values.push(row)
    range.untrack()
    goOn()
    progress?.(values.length / area.rows)
  }
  if (!options.shape) return { area, values }
  const shape = askShape(rangeOf(context, area))
  await sync()
  return { area, values, ...shape(area) }
}

/** A formula that fills several cells, its own among them. */
export interface Spill {
  readonly from: Area
  readonly over: Area
}

/** Asks which formulas of an area fill several cells; the answer is there after the next sync. */
export function askSpills(
  context: Excel.RequestContext,
  area: Area,
  formulas: readonly (readonly CellValue[])[],
): () => Spill[] {
  const asked = formulas.flatMap((row, r) =>
    row.flatMap((entry, c) => {
      if (!isFormula(entry)) return []
      const from = cellOf(area, r, c)
      const found = rangeOf(context, from).getSpillingToRangeOrNullObject()
      found.load('address')
      return [{ from, found }]
    }),
  )
  return () =>
    asked.flatMap(({ from, found }) => {
      const over = found.isNullObject ? null : areasIn(found.address, area.sheet)[0]
      return over ? [{ from, over }] : []
    })
}

/** Looks at several ranges in one request; in a second one where formulas were asked for and some fill several cells. */
export async function look(
  { context, sync }: Request,
  wants: readonly Want[],
  noteSheet: (id: string, name: string) => void,
): Promise<(Seen | null)[]> {
  const { names, worksheets } = context.workbook
  const asked = wants.map((want) => {
    const { at } = want
    // what hangs on a null object is null as well, so nothing need be known beforehand
    const range =
      'kept' in at
        ? names.getItemOrNullObject(NAME_PREFIX + at.kept).getRangeOrNullObject()
        : worksheets.getItemOrNullObject(at.sheet).getRangeByIndexes(at.row, at.column, at.rows, at.columns)
    range.load(
      [PLACE, ...(want.values ? ['values'] : []), ...(want.formulas ? ['formulas', 'hasSpill'] : [])].join(),
    )
    const sheet = range.worksheet
    sheet.load('id,name')
    sheet.protection.load('protected')
    const region = want.region ? range.getSurroundingRegion() : null
    region?.load(PLACE)
    return { range, sheet, region, shape: want.shape ? askShape(range) : null }
  })
  await sync()
  const found = asked.map((answer, k) => {
    const { range, sheet } = answer
    if (range.isNullObject) return null
    const area = areaOf(sheet.name, range)
    // `hasSpill` is null where some cells have it
    const spills =
      wants[k]?.formulas && range.hasSpill !== false
        ? askSpills(context, area, range.formulas as CellValue[][])
        : null
    return { ...answer, area, spills }
  })
  if (found.some((answer) => answer?.spills)) await sync()
  return found.map((answer, k) => {
    if (!answer) return null
    const { range, sheet, region, shape, area, spills } = answer
    noteSheet(sheet.id, sheet.name)
    return {
      area,
      protected: sheet.protection.protected,
      ...(wants[k]?.values && { values: range.values as CellValue[][] }),
      ...(wants[k]?.formulas && { formulas: range.formulas as CellValue[][] }),
      ...(spills && { spilled: spills() }),
      ...(region && { region: areaOf(sheet.name, region) }),
      ...shape?.(area),
    }
  })
}
