import { OfficeError } from './error'

/** A block of cells, counted from 0, both ends included. */
export interface Rect {
  readonly top: number
  readonly left: number
  readonly bottom: number
  readonly right: number
}

/** The host's sheet is this large whatever the grid has stored so far. */
export const ROWS = 1_048_576
export const COLUMNS = 16_384

export const height = (rect: Rect): number => rect.bottom - rect.top + 1
export const width = (rect: Rect): number => rect.right - rect.left + 1
export const isEntireColumn = (rect: Rect): boolean => rect.top === 0 && rect.bottom === ROWS - 1
export const isEntireRow = (rect: Rect): boolean => rect.left === 0 && rect.right === COLUMNS - 1
export const isUnbounded = (rect: Rect): boolean => isEntireColumn(rect) || isEntireRow(rect)

/** A block given by its corner and size. @throws OfficeError InvalidArgument when it is empty or leaves the sheet */
export function rectAt(top: number, left: number, rows: number, columns: number): Rect {
  const rect = { top, left, bottom: top + rows - 1, right: left + columns - 1 }
  const whole = [top, left, rows, columns].every(Number.isInteger)
  if (
    !whole ||
    top < 0 ||
    left < 0 ||
    rows < 1 ||
    columns < 1 ||
    rect.bottom >= ROWS ||
    rect.right >= COLUMNS
  )
    throw new OfficeError(
      'InvalidArgument',
      `no block of ${rows} x ${columns} cells at row ${top}, column ${left}`,
    )
  return rect
}

export function intersect(a: Rect, b: Rect): Rect | null {
  const rect = {
    top: Math.max(a.top, b.top),
    left: Math.max(a.left, b.left),
    bottom: Math.min(a.bottom, b.bottom),
    right: Math.min(a.right, b.right),
  }
  return rect.top > rect.bottom || rect.left > rect.right ? null : rect
}

export const bounding = (a: Rect, b: Rect): Rect => ({
  top: Math.min(a.top, b.top),
  left: Math.min(a.left, b.left),
  bottom: Math.max(a.bottom, b.bottom),
  right: Math.max(a.right, b.right),
})

export function columnName(column: number): string {
  let name = ''
  for (let rest = column + 1; rest > 0; rest = Math.floor((rest - 1) / 26))
    name = String.fromCharCode(65 + ((rest - 1) % 26)) + name
  return name
}

const columnIndex = (name: string): number =>
  [...name.toUpperCase()].reduce((sum, letter) => sum * 26 + letter.charCodeAt(0) - 64, 0) - 1

/** `B2:C5`, `B:C` or `2:5`; with `absolute`, `$B$2:$C$5`. */
export function formatRect(rect: Rect, absolute = false): string {
  const mark = absolute ? '$' : ''
  const from = `${mark}${columnName(rect.left)}`
  const to = `${mark}${columnName(rect.right)}`
  if (isEntireColumn(rect)) return `${from}:${to}`
  if (isEntireRow(rect)) return `${mark}${rect.top + 1}:${mark}${rect.bottom + 1}`
  const first = `${from}${mark}${rect.top + 1}`
  const last = `${to}${mark}${rect.bottom + 1}`
  return first === last ? first : `${first}:${last}`
}

/** The sheet's name as it stands in an address: quoted unless it could not be read as anything else. */
export function quoteSheet(name: string): string {
  const plain =
    /^[\p{L}_][\p{L}\p{N}_.]*$/u.test(name) &&
    !parseRect(name) &&
    !/^(r|c|rc|r\d+c\d*|r?\d*c\d+)$/i.test(name)
  return plain ? name : `'${name.replaceAll("'", "''")}'`
}

/** An address without its sheet, or null where the text is no address. */
export function parseRect(text: string): Rect | null {
  const parts = text.replaceAll('$', '').split(':')
  const [first = '', last = first] = parts
  if (parts.length > 2) return null
  const cell = /^([A-Za-z]{1,3})(\d{1,7})$/
  const [a, b] = [cell.exec(first), cell.exec(last)]
  const row = (digits: string | undefined) => Number(digits) - 1
  if (a && b) return sorted(row(a[2]), columnIndex(a[1] ?? ''), row(b[2]), columnIndex(b[1] ?? ''))
  if (parts.length === 1) return null
  if (/^[A-Za-z]{1,3}$/.test(first) && /^[A-Za-z]{1,3}$/.test(last))
    return sorted(0, columnIndex(first), ROWS - 1, columnIndex(last))
  if (/^\d{1,7}$/.test(first) && /^\d{1,7}$/.test(last)) return sorted(row(first), 0, row(last), COLUMNS - 1)
  return null
}

function sorted(row1: number, column1: number, row2: number, column2: number): Rect | null {
  const rect = {
    top: Math.min(row1, row2),
    left: Math.min(column1, column2),
    bottom: Math.max(row1, row2),
    right: Math.max(column1, column2),
  }
  return rect.top < 0 || rect.bottom >= ROWS || rect.right >= COLUMNS ? null : rect
}

/** Parts an address from its sheet: `'My book'!A1` gives `My book` and `A1`. */
export function splitAddress(address: string): { sheet: string | null; cells: string } {
  const mark = address.lastIndexOf('!')
  if (mark < 0) return { sheet: null, cells: address }
  const name = address.slice(0, mark)
  const sheet = /^'.*'$/.test(name) ? name.slice(1, -1).replaceAll("''", "'") : name
  return { sheet, cells: address.slice(mark + 1) }
}

/** The fewest blocks, row by row, that hold just these cells; `cells` lists each row's columns in ascending order. */
export function blocksOf(cells: Iterable<readonly [row: number, columns: readonly number[]]>): Rect[] {
  const done: Rect[] = []
  let open: Rect[] = []
  for (const [row, columns] of cells) {
    const runs: Rect[] = []
    for (const column of columns) {
      const run = runs.at(-1)
      if (run?.right === column - 1) runs[runs.length - 1] = { ...run, right: column }
      else runs.push({ top: row, left: column, bottom: row, right: column })
    }
    const next = runs.map((run) => {
      const above = open.find(
        ({ left, right, bottom }) => left === run.left && right === run.right && bottom === row - 1,
      )
      return above ? { ...run, top: above.top } : run
    })
    done.push(...open.filter(({ top, left }) => !next.some((run) => run.top === top && run.left === left)))
    open = next
  }
  return [...done, ...open]
}
