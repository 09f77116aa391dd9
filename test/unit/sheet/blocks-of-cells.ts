import type { Area, Block, CellValue } from '../../../src/sheet'

/** A block of cells lying at A1 of a sheet, rows as typed; short rows are filled with blanks. */
export function blockOf(
  rows: readonly (readonly CellValue[])[],
  sheet = 'Book',
  extra: { hiddenRows?: ReadonlySet<number>; merged?: readonly Area[] } = {},
): Block {
  const columns = rows.reduce((most, row) => Math.max(most, row.length), 0)
  return {
    area: { sheet, row: 0, column: 0, rows: rows.length, columns },
    values: rows.map((row) => [...row, ...Array<CellValue>(columns - row.length).fill('')]),
    ...extra,
  }
}

export const ENGLISH = { decimal: '.', group: ',', dateOrder: 'mdy' } as const
export const GERMAN = { decimal: ',', group: '.', dateOrder: 'dmy' } as const
