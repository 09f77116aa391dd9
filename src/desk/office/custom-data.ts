/**
 * What a cell, a row or a column has in the host and the grid has no notion of: links and outline levels. Kept in the custom data of the
 * grid's own cells and lines, so it moves with them, is undone with them and reaches the file.
 */
import type { ICellData, IColumnData, IRowData, Nullable } from '@univerjs/core'

/** A link behind a cell: to an address outside the workbook or to a place in it. */
export interface Link {
  readonly address?: string
  readonly documentReference?: string
  readonly screenTip?: string
}

/** What the grid keeps of a row or a column. */
export type Line = Partial<IRowData & IColumnData>

/** The deepest a row or column can be folded: the host shows eight levels, of which the outermost is no fold. */
export const DEEPEST = 7

export const linkOf = (cell: Nullable<ICellData>): Link | null =>
  (cell?.custom?.['link'] as Link | undefined) ?? null

export const withLink = (link: Link | null): Pick<ICellData, 'custom'> => ({ custom: link && { link } })

/** How deep a row or column is folded, 0 outermost. */
export const levelOf = (line: Nullable<Line>): number =>
  (line?.custom?.['outlineLevel'] as number | undefined) ?? 0

export const withLevel = (outlineLevel: number): Pick<Line, 'custom'> => ({
  custom: outlineLevel > 0 ? { outlineLevel } : null,
})
