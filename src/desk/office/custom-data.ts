/**
 * What a cell, a row or a column has in the host and the grid has no notion of: links, data bars and outline levels. Kept in the custom data of the
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

/** The custom data of a cell with one thing in it changed, or taken out. */
function withKept(key: string, kept: object | null, cell: Nullable<ICellData>): Pick<ICellData, 'custom'> {
  const { [key]: _, ...others } = cell?.custom ?? {}
  const custom = kept ? { ...others, [key]: kept } : others
  return { custom: Object.keys(custom).length > 0 ? custom : null }
}

export const withLink = (link: Link | null, cell?: Nullable<ICellData>): Pick<ICellData, 'custom'> =>
  withKept('link', link, cell)

/** A data bar behind cells, which are those that hold the same one. */
export interface DataBar {
  readonly id: string
  readonly lower: BarEnd
  readonly upper: BarEnd
  readonly fill: string
  readonly border: string
  readonly gradient: boolean
  readonly direction: string
}

/** Where a bar ends: a kind of rule and what it is worked out from. */
export interface BarEnd {
  readonly type: string
  readonly formula?: string
}

export const barOf = (cell: Nullable<ICellData>): DataBar | null =>
  (cell?.custom?.['bar'] as DataBar | undefined) ?? null

export const withBar = (bar: DataBar | null, cell?: Nullable<ICellData>): Pick<ICellData, 'custom'> =>
  withKept('bar', bar, cell)

/** How deep a row or column is folded, 0 outermost. */
export const levelOf = (line: Nullable<Line>): number =>
  (line?.custom?.['outlineLevel'] as number | undefined) ?? 0

export const withLevel = (outlineLevel: number): Pick<Line, 'custom'> => ({
  custom: outlineLevel > 0 ? { outlineLevel } : null,
})
