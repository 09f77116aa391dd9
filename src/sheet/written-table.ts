import { Fault } from '../core'
import type { Area, CellValue } from './cells'
import { addressOf, cellOf, isFormula, overlap, sameArea, sameFormula } from './cells'
import type { Table, TableCell } from './table'
import type { Seen, Workbook } from './workbook'

/** Where a table is wanted. */
export type Place = 'new sheet' | 'selection' | 'where it was'

/** The cells a table is computed from, by what they hold: it must not cover them. */
export type Sources = readonly (readonly [what: string, area: Area | null | undefined])[]

/**
 * One table of a book in its workbook: where it lies, what stands in it, and the writes that bring it along with the figures. A name in
 * the workbook holds its place, so that it follows inserted rows and is found again after a save.
 */
export class WrittenTable {
  /** null while none is written, or its cells are gone */
  area: Area | null = null
  readonly #workbook: Workbook
  readonly #name: string
  readonly #sheet: string
  #written: Table | null = null

  /**
   * @param name  that holds its place in the workbook
   * @param sheet what a new sheet for it is called
   */
  constructor(workbook: Workbook, name: string, sheet: string) {
    this.#workbook = workbook
    this.#name = name
    this.#sheet = sheet
  }

  /** Whether a table as it is now stands in what a look saw, to the last cell. */
  stands(seen: Seen, table: Table): boolean {
    const standing =
      fits(seen, table) &&
      seen.formulas !== undefined &&
      table.cells.every((row, r) =>
        row.every(
          (cell, c) => sameCell(cell, seen.formulas?.[r]?.[c] ?? '') || isResult(seen, table, cell, r, c),
        ),
      )
    if (standing) this.#written = table
    return standing
  }

  /** Writes it where a look saw it, in one request where only values differ. */
  rewrite(seen: Seen, table: Table, sources: Sources): Promise<Area> {
    // results that a formula fills into other cells are not there to be put back
    const known =
      fits(seen, table) &&
      !seen.spilled?.length &&
      this.#written !== null &&
      sameFormats(this.#written, table)
    return this.#write(seen.area, table, 'blank', sources, {
      ours: seen.area,
      ...(known && seen.formulas ? { seen: seen.formulas } : {}),
    })
  }

  /** Writes it to a place; one of ours that the new one meets gives way, one that lies elsewhere stays as it is. */
  write(
    place: Place,
    target: Area,
    table: Table,
    over: 'blank' | 'replace',
    sources: Sources,
  ): Promise<Area> {
    const meets = this.area && overlap(this.area, areaOfTable(target, table)) ? { ours: this.area } : {}
    return this.#write(target, table, over, sources, meets, place === 'new sheet' ? target.sheet : undefined)
  }

  /** The corner of the place wanted. */
  async corner(place: Place): Promise<Area> {
    if (place === 'selection') return this.#workbook.selection()
    if (place === 'new sheet') return this.#freeSheet()
    if (this.area) return this.area
    throw new Fault('missing', 'no table has been written yet', 'choose a new sheet or a selection', {
      argument: 'table',
    })
  }

  /** Lets go of it; its cells stay. */
  async release(): Promise<void> {
    await this.#workbook.write({ patches: [], keep: { [this.#name]: null } })
    this.area = null
    this.#written = null
  }

  /** The corner of a sheet that is not there yet. */
  async #freeSheet(): Promise<Area> {
    const shown = new Set((await this.#workbook.sheets()).map((name) => name.toLowerCase()))
    for (let k = 1; ; k++) {
      const sheet = k === 1 ? this.#sheet : `${this.#sheet} ${k}`
      if (shown.has(sheet.toLowerCase())) continue
      const corner: Area = { sheet, row: 0, column: 0, rows: 1, columns: 1 }
      // a hidden sheet has its name too, and a table on it would not be seen
      const [hidden] = await this.#workbook.look([{ at: corner }])
      if (!hidden) return corner
    }
  }

  async #write(
    target: Area,
    table: Table,
    over: 'blank' | 'replace',
    sources: Sources,
    ground: { ours?: Area; seen?: readonly (readonly CellValue[])[] },
    sheet?: string,
  ): Promise<Area> {
    const area = areaOfTable(target, table)
    refuseOverSources(area, sources)
    const moved = !sameArea(this.area, area)
    await this.#workbook.write({
      ...(sheet === undefined ? {} : { sheet }),
      patches: [{ at: area, table, over, ...ground }],
      ...(moved ? { keep: { [this.#name]: area } } : {}),
    })
    this.area = area
    this.#written = table
    return area
  }
}

/** What a table fills from its top-left cell on. */
export const areaOfTable = ({ sheet, row, column }: Area, table: Table): Area => ({
  sheet,
  row,
  column,
  rows: table.cells.length,
  columns: table.widths.length,
})

/** Not even the user's word lets a table replace what it is computed from: the next refresh would have nothing to read. */
function refuseOverSources(area: Area, sources: Sources): void {
  for (const [what, source] of sources)
    if (source && overlap(area, source))
      throw new Fault(
        'selection',
        `the table would fill ${addressOf(area)} and cover the ${what} in ${addressOf(source)}, which it is computed from`,
        'choose another place',
        { argument: 'table' },
      )
}

const fits = ({ area }: Seen, table: Table): boolean =>
  area.rows === table.cells.length && area.columns === table.widths.length

/** Text that begins like a formula may come back behind an apostrophe; a formula stands where it is typed, whatever comes of it. */
const sameCell = ({ value, formula }: TableCell, typed: CellValue): boolean =>
  formula === undefined
    ? value === typed || (typeof value === 'string' && typed === `'${value}`)
    : isFormula(typed) && sameFormula(formula, String(typed))

/** Whether a cell that the table leaves blank shows a result of one of its own formulas. */
function isResult(seen: Seen, table: Table, { value, formula }: TableCell, r: number, c: number): boolean {
  if (value !== '' || formula !== undefined) return false
  const cell = cellOf(seen.area, r, c)
  return (seen.spilled ?? []).some(
    ({ from, over }) =>
      overlap(over, cell) !== null &&
      table.cells[from.row - seen.area.row]?.[from.column - seen.area.column]?.formula !== undefined,
  )
}

/** Whether values are all that differs; links, levels, charts and the page count as format. */
const sameFormats = (a: Table, b: Table): boolean =>
  a.cells.length === b.cells.length &&
  a.cells.every((row, r) =>
    row.every((cell, c) => {
      const other = b.cells[r]?.[c]
      return (
        cell.format === other?.format &&
        cell.mark === other.mark &&
        (cell.formula === undefined) === (other.formula === undefined) &&
        (cell.link === other.link || sameArea(cell.link ?? null, other.link ?? null))
      )
    }),
  ) &&
  JSON.stringify([a.levels, a.charts, a.page]) === JSON.stringify([b.levels, b.charts, b.page])
