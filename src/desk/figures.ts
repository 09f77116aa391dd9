/** What stands in the cells that a chart draws. */
import { CellValueType } from '@univerjs/core'
import { FormulaDataModel, deserializeRangeWithSheet } from '@univerjs/engine-formula'
import type { Grid } from './grid'

export interface Figure {
  /** null where nothing stands that could be drawn: blank, an error */
  readonly value: string | number | null
  readonly format: string
}

/** @returns the cells of a reference with its sheet, row by row; none where the reference leads nowhere any more */
export function figuresAt({ univer, api }: Grid, reference: string): Figure[] {
  const { sheetName, range } = deserializeRangeWithSheet(reference)
  const book = api.getActiveWorkbook()
  const sheet = book?.getSheetByName(sheetName)?.getSheet()
  if (!book || !sheet || !(range.startRow >= 0 && range.startColumn >= 0)) return []
  const spills = univer.__getInjector().get(FormulaDataModel).getArrayFormulaCellData()
  const spilled = spills[book.getId()]?.[sheet.getSheetId()]
  const figures: Figure[] = []
  for (let row = range.startRow; row <= range.endRow; row++)
    for (let column = range.startColumn; column <= range.endColumn; column++) {
      const own = sheet.getCellMatrix().getValue(row, column)
      const { v, t } = (own?.v == null ? spilled?.[row]?.[column] : own) ?? {}
      const format = sheet.getComposedCellStyle(row, column).n?.pattern ?? 'General'
      const isText = t === CellValueType.STRING || t === CellValueType.FORCE_STRING
      const value =
        v == null || v === '' || (typeof v === 'string' && /^#[A-Z/\d]+[!?]?$/.test(v))
          ? null
          : t === CellValueType.BOOLEAN
            ? v
              ? 'TRUE'
              : 'FALSE'
            : !isText && Number.isFinite(Number(v))
              ? Number(v)
              : String(v)
      figures.push({ value, format })
    }
  return figures
}
