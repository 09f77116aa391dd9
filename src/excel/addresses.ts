import { addressOf, parseAddress, type Area } from '../sheet'

/** The size of a worksheet. */
export const SHEET_ROWS = 1_048_576
export const SHEET_COLUMNS = 16_384

/**
 * Reads an address as events and merged areas carry it: one or several areas, with or without a sheet, whole rows and columns
 * included. What cannot be read is null.
 * @example areasIn('B2:C3,E:E', 'Book').map((area) => area?.rows) // [2, 1048576]
 */
export function areasIn(list: string, sheet: string): (Area | null)[] {
  const parts = list.match(/(?:'(?:[^']|'')*'|[^,'])+/g) ?? []
  return parts.map((part) => {
    const bang = part.lastIndexOf('!') + 1
    const cells = part
      .slice(bang)
      .replaceAll('$', '')
      .replace(/^([A-Za-z]{1,3}):([A-Za-z]{1,3})$/, `$11:$2${SHEET_ROWS}`)
      .replace(/^(\d+):(\d+)$/, 'A$1:XFD$2')
    return parseAddress(part.slice(0, bang) + cells, sheet)
  })
}

/**
 * An area as a name refers to it: it must not move with the cell the name is used in.
 * @example absoluteReference({ sheet: 'Book', row: 4, column: 1, rows: 2, columns: 1 }) // '=Book!$B$5:$B$6'
 */
export function absoluteReference(area: Area): string {
  const address = addressOf(area)
  const bang = address.lastIndexOf('!') + 1
  return `=${address.slice(0, bang)}${address.slice(bang).replace(/([A-Z]+)(\d+)/g, '$$$1$$$2')}`
}

/** The parts of an area that another one leaves uncovered: up to four rectangles. */
export function without(area: Area, cover: Area | null): Area[] {
  if (!cover || cover.sheet !== area.sheet) return [area]
  const top = Math.max(area.row, cover.row)
  const bottom = Math.min(area.row + area.rows, cover.row + cover.rows)
  const left = Math.max(area.column, cover.column)
  const right = Math.min(area.column + area.columns, cover.column + cover.columns)
  if (top >= bottom || left >= right) return [area]
  const rows = { row: top, rows: bottom - top }
  return [
    { ...area, rows: top - area.row },
    { ...area, row: bottom, rows: area.row + area.rows - bottom },
    { ...area, ...rows, columns: left - area.column },
    { ...area, ...rows, column: right, columns: area.column + area.columns - right },
  ].filter((part) => part.rows > 0 && part.columns > 0)
}
