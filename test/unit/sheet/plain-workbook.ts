import { Fault } from '../../../src/core'
import type { Area, CellValue, Json, Seen, Want, Workbook, WorkbookEvent } from '../../../src/sheet'
import { addressOf, overlap, parseAddress } from '../../../src/sheet'

export const areaAt = (address: string): Area => {
  const area = parseAddress(address)
  if (!area) throw new Error(`"${address}" is no address`)
  return area
}

/** A workbook of plain arrays whose answers can be held back. Formulas are kept as typed beside the value they show. */
export function plainWorkbook(sheets: { [name: string]: CellValue[][] }) {
  const formulas = new Map<string, string>()
  /** what each formula shows, as it was given */
  const values = new Map<string, CellValue>()
  const names = new Map<string, Area>()
  const settings = new Map<string, Json>()
  const listeners = new Set<(event: WorkbookEvent) => void>()
  const held = new Map<string, Promise<void>>()
  const refused = new Map<string, Fault>()
  const hidden = new Set<string>()
  const calls: string[] = []
  let selected = areaAt('Book!A1')

  const cellsOf = (area: Area): CellValue[][] =>
    Array.from({ length: area.rows }, (_, r) =>
      Array.from(
        { length: area.columns },
        (__, c) => sheets[area.sheet]?.[area.row + r]?.[area.column + c] ?? '',
      ),
    )
  const typedOf = (area: Area): CellValue[][] =>
    cellsOf(area).map((row, r) =>
      row.map((value, c) => formulas.get(`${area.sheet}/${area.row + r}/${area.column + c}`) ?? value),
    )
  const step = async (what: string): Promise<void> => {
    calls.push(what)
    await held.get(what)
    const fault = refused.get(what)
    if (fault) throw fault
  }
  const seen = (want: Want): Seen | null => {
    const area = 'kept' in want.at ? names.get(want.at.kept) : want.at
    if (!area || !sheets[area.sheet]) return null
    // whatever is filled below belongs to the region
    const region = { ...area, rows: Math.max(area.rows, (sheets[area.sheet]?.length ?? 0) - area.row) }
    return { area, values: cellsOf(area), formulas: typedOf(area), region, protected: false }
  }
  const put = (address: string, value: CellValue, formula?: string): void => {
    const { sheet, row, column } = areaAt(address)
    const cells = sheets[sheet]?.[row]
    if (!cells) throw new Error(`no row at ${address}`)
    cells[column] = value
    if (formula === undefined) formulas.delete(`${sheet}/${row}/${column}`)
    else {
      formulas.set(`${sheet}/${row}/${column}`, formula)
      values.set(formula, value)
    }
  }
  const port: Workbook = {
    culture: () => Promise.resolve({ decimal: '.', group: ',', dateOrder: 'ymd' }),
    selection: () => Promise.resolve(selected),
    async read(wanted) {
      // whole columns come back cut to the rows in use
      const isEndless = wanted.rows >= 1_048_576
      const rows = isEndless ? (sheets[wanted.sheet]?.length ?? 0) - wanted.row : wanted.rows
      const area = { ...wanted, rows }
      const values = cellsOf(area)
      await step('read')
      if (rows < 1) throw new Fault('selection', 'nothing is filled', 'filled cells are needed')
      return { area, values }
    },
    async look(wants) {
      const found = wants.map(seen)
      await step('look')
      return found
    },
    async write({ patches, entries = [], keep = {}, remember = {} }) {
      await step('write')
      for (const { at, seen: expected } of entries) {
        const typed = typedOf(at)[0]?.[0]
        if (typed !== expected)
          throw new Fault(
            'changed',
            `${addressOf(at)} holds ${String(typed)}`,
            `${String(expected)} was expected`,
          )
      }
      for (const { at, table, over, ours } of patches) {
        const target = { ...at, rows: table.cells.length, columns: table.widths.length }
        const foreign = cellsOf(target).some((row, r) =>
          row.some(
            (value, c) =>
              value !== '' &&
              !(
                ours && overlap(ours, { ...at, row: at.row + r, column: at.column + c, rows: 1, columns: 1 })
              ),
          ),
        )
        if (over === 'blank' && foreign)
          throw new Fault('occupied', `${addressOf(target)} is in the way`, 'an empty place is needed')
      }
      for (const { at, value } of entries)
        if (typeof value === 'string' && value.startsWith('='))
          put(addressOf(at), values.get(value) ?? '', value)
        else put(addressOf(at), value)
      for (const { at, table } of patches)
        table.cells.forEach((row, r) =>
          row.forEach(({ value }, c) => {
            const sheet = (sheets[at.sheet] ??= [])
            const cells = (sheet[at.row + r] ??= [])
            cells[at.column + c] = value
          }),
        )
      for (const [name, area] of Object.entries(keep))
        if (area) names.set(name, area)
        else names.delete(name)
      for (const [key, value] of Object.entries(remember))
        if (value === null) settings.delete(key)
        else settings.set(key, value)
      return patches.map(({ at, table }) => ({
        ...at,
        rows: table.cells.length,
        columns: table.widths.length,
      }))
    },
    async recall() {
      await step('recall')
      return Object.fromEntries(settings)
    },
    recover: () => Promise.resolve(null),
    reveal: () => step('reveal'),
    sheets: () => Promise.resolve(Object.keys(sheets).filter((name) => !hidden.has(name))),
    watch(listener) {
      listeners.add(listener)
      return Promise.resolve(() => {
        listeners.delete(listener)
        return Promise.resolve()
      })
    },
  }
  const tell = (event: WorkbookEvent): void => {
    for (const listener of listeners) listener(event)
  }
  return {
    port,
    names,
    settings,
    calls,
    refused,
    hideSheet(name: string) {
      sheets[name] ??= []
      hidden.add(name)
    },
    tell,
    put,
    renameSheet(before: string, after: string) {
      sheets[after] = sheets[before] ?? []
      Reflect.deleteProperty(sheets, before)
      for (const [name, area] of names) if (area.sheet === before) names.set(name, { ...area, sheet: after })
      tell({ kind: 'moved', sheet: before })
    },
    select: (address: string) => void (selected = areaAt(address)),
    /** A user types a value. */
    type(address: string, value: CellValue) {
      put(address, value)
      const area = areaAt(address)
      tell({ kind: 'edited', sheet: area.sheet, area, ours: false })
    },
    /** Keeps the answers to a method back, taken at the time of the question, until the returned function is called. */
    hold(what: string): () => void {
      let release = (): void => undefined
      held.set(what, new Promise((resolve) => (release = resolve)))
      return () => {
        held.delete(what)
        release()
      }
    },
    /** what cells show */
    cells: (address: string) => cellsOf(areaAt(address)),
    /** what was typed in cells: formulas where there are some */
    typed: (address: string) => typedOf(areaAt(address)),
    valueAt: (address: string) => cellsOf(areaAt(address))[0]?.[0],
  }
}
