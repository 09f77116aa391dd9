/** What reading and writing a file must agree on. */
import { numberToABC, type IRange } from '@univerjs/core'

/** Settings travel in a sheet, since the file library keeps a very hidden one and drops a web extension's own part. */
export const SETTINGS_SHEET = 'Counterpoise settings'
/** A cell holds 32,767 characters: longer values go on in the next cell. */
export const CELL_LIMIT = 32_000
/** Pixels to a point. */
export const PIXELS = 4 / 3
/** A column's width in a file counts digits of the default font; these are its pixels and the padding around them. */
const DIGIT = 7
const PADDING = 5
export const DEFAULT_WIDTH = 64
export const DEFAULT_HEIGHT = 20

export const pixelsOf = (width: number): number => Math.round(width * DIGIT + PADDING)
export const widthOf = (pixels: number): number => (pixels - PADDING) / DIGIT

/** The add-in's settings, as the stand-in for the Office JavaScript API keeps them: JSON values. */
export type Settings = Map<string, unknown>

/** An address without a sheet; signs of what is fixed are passed over. */
export function rangeOf(address: string): IRange {
  const [first = [0, 0], last = first] = address
    .replaceAll('$', '')
    .split(':')
    .map((corner): [number, number] => {
      const [, letters = '', digits = ''] = /^([A-Z]+)(\d+)$/.exec(corner) ?? []
      return [
        Number(digits) - 1,
        [...letters].reduce((column, letter) => column * 26 + letter.charCodeAt(0) - 64, 0) - 1,
      ]
    })
  return { startRow: first[0], startColumn: first[1], endRow: last[0], endColumn: last[1] }
}

export function addressOf({ startRow, endRow, startColumn, endColumn }: IRange): string {
  const corner = (row: number, column: number): string => `${numberToABC(column)}${row + 1}`
  const first = corner(startRow, startColumn)
  return startRow === endRow && startColumn === endColumn ? first : `${first}:${corner(endRow, endColumn)}`
}
