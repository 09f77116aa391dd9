/** What a cell holds as a host hands it over: '' is a blank, error cells arrive as their text ("#N/A"), dates as serial numbers. */
export type CellValue = number | string | boolean

/** A rectangle of one worksheet; row and column count from 0. */
export interface Area {
  readonly sheet: string
  readonly row: number
  readonly column: number
  readonly rows: number
  readonly columns: number
}

/** A rectangle and what stands in it, row by row. */
export interface Block {
  readonly area: Area
  readonly values: readonly (readonly CellValue[])[]
  /** rows of the block (from 0) that the user has hidden or filtered away; absent where nobody asked */
  readonly hiddenRows?: ReadonlySet<number>
  /** merged areas that meet the block: only their top-left cell holds a value; absent where nobody asked */
  readonly merged?: readonly Area[]
}

/** How numbers and dates are typed in the workbook's own language. */
export interface Culture {
  readonly decimal: string
  readonly group: string
  readonly dateOrder: 'dmy' | 'mdy' | 'ymd'
}

export const PLAIN_CULTURE: Culture = { decimal: '.', group: ',', dateOrder: 'ymd' }

/** Cell errors a workbook can hold, as they arrive among values. */
const CELL_ERRORS = new Set([
  '#NULL!', '#DIV/0!', '#VALUE!', '#REF!', '#NAME?', '#NUM!', '#N/A', '#GETTING_DATA', '#SPILL!', '#CALC!',
  '#BLOCKED!', '#CONNECT!', '#FIELD!', '#UNKNOWN!', '#BUSY!', '#EXTERNAL!', '#PYTHON!', '#TIMEOUT!',
]) // prettier-ignore

export const isBlank = (value: CellValue | null | undefined): boolean =>
  value === null || value === undefined || (typeof value === 'string' && value.trim() === '')

/** Whether what was typed in a cell is a formula. */
export const isFormula = (typed: CellValue | null | undefined): boolean =>
  typeof typed === 'string' && typed.startsWith('=') && typed.length > 1

/** A formula without what a host may write otherwise: spaces and case outside of quoted text. */
const plainFormula = (formula: string): string =>
  formula
    .split('"')
    .map((part, k) => (k % 2 === 0 ? part.replace(/\s+/g, '').toUpperCase() : part))
    .join('"')

/**
 * Whether two formulas are the same one, however a host spaces and capitalises it.
 * @example sameFormula('=sum(A1, B1)', '=SUM(A1,B1)') // true
 */
export const sameFormula = (a: string, b: string): boolean => a === b || plainFormula(a) === plainFormula(b)

export const isCellError = (value: CellValue | null | undefined): boolean =>
  typeof value === 'string' && CELL_ERRORS.has(value)

/**
 * Column letters of a column counted from 0.
 * @example columnLetters(27) // 'AB'
 */
export function columnLetters(column: number): string {
  let letters = ''
  for (let left = column + 1; left > 0; left = Math.floor((left - 1) / 26))
    letters = String.fromCharCode(65 + ((left - 1) % 26)) + letters
  return letters
}

/** Column counted from 0 of its letters, in either case. */
export function columnIndex(letters: string): number {
  let column = 0
  for (const letter of letters.toUpperCase()) column = column * 26 + letter.charCodeAt(0) - 64
  return column - 1
}

/** Sheet names that stand in quotes because they would pass for a cell, a row or a column, in either notation. */
const LIKE_A_REFERENCE = /^(?:[A-Za-z]{1,3}\d+|[Rr]\d*|[Cc]\d*|[Rr]\d*[Cc]\d*)$/

const quoted = (sheet: string): string =>
  /^[\p{L}_][\p{L}\p{N}_.]*$/u.test(sheet) && !LIKE_A_REFERENCE.test(sheet)
    ? sheet
    : `'${sheet.replaceAll("'", "''")}'`

/**
 * The address a user knows: sheet, and first to last cell.
 * @example addressOf({ sheet: 'My book', row: 4, column: 1, rows: 2, columns: 1 }) // "'My book'!B5:B6"
 */
export function addressOf(area: Area): string {
  const first = columnLetters(area.column) + (area.row + 1)
  const last = columnLetters(area.column + area.columns - 1) + (area.row + area.rows)
  return `${quoted(area.sheet)}!${first === last ? first : `${first}:${last}`}`
}

/**
 * The same as a formula takes it: columns and rows held fast.
 * @example referenceOf({ sheet: 'My book', row: 4, column: 1, rows: 2, columns: 1 }) // "'My book'!$B$5:$B$6"
 */
export function referenceOf(area: Area): string {
  const first = `$${columnLetters(area.column)}$${area.row + 1}`
  const last = `$${columnLetters(area.column + area.columns - 1)}$${area.row + area.rows}`
  return `${quoted(area.sheet)}!${first === last ? first : `${first}:${last}`}`
}

/**
 * Reads an address of cells ("Book!B5:F20", "'My book'!$B$5"). Whole rows or columns and lists of areas are not areas: null.
 * @param sheet the sheet meant when the address names none
 */
export function parseAddress(address: string, sheet = ''): Area | null {
  const match =
    /^(?:(?:'((?:[^']|'')+)'|([^'!]+))!)?\$?([A-Za-z]{1,3})\$?(\d+)(?::\$?([A-Za-z]{1,3})\$?(\d+))?$/.exec(
      address.trim(),
    )
  if (!match) return null
  const [, inQuotes, bare, left, top, right = left, bottom = top] = match as unknown as [
    string,
    string?,
    ...string[],
  ]
  const columns = [columnIndex(left as string), columnIndex(right as string)]
  const rows = [Number(top) - 1, Number(bottom) - 1]
  const [row, column] = [Math.min(...rows), Math.min(...columns)]
  return {
    sheet: inQuotes?.replaceAll("''", "'") ?? bare ?? sheet,
    row,
    column,
    rows: Math.max(...rows) - row + 1,
    columns: Math.max(...columns) - column + 1,
  }
}

/** One cell of an area, as an area. */
export const cellOf = (area: Area, row: number, column: number): Area => ({
  sheet: area.sheet,
  row: area.row + row,
  column: area.column + column,
  rows: 1,
  columns: 1,
})

/** The cells two areas share, or null. */
export function overlap(a: Area, b: Area): Area | null {
  if (a.sheet !== b.sheet) return null
  const row = Math.max(a.row, b.row)
  const column = Math.max(a.column, b.column)
  const rows = Math.min(a.row + a.rows, b.row + b.rows) - row
  const columns = Math.min(a.column + a.columns, b.column + b.columns) - column
  return rows > 0 && columns > 0 ? { sheet: a.sheet, row, column, rows, columns } : null
}

export const sameArea = (a: Area | null, b: Area | null): boolean =>
  a !== null &&
  b !== null &&
  a.sheet === b.sheet &&
  a.row === b.row &&
  a.column === b.column &&
  a.rows === b.rows &&
  a.columns === b.columns
