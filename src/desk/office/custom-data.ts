/**
 * What a cell, a row, a column or a sheet has in the host and the grid has no notion of: links, data bars and outline levels; charts and the
 * page. Kept in the custom data of the grid's own cells, lines and sheets. What is kept with cells and lines moves with them, is undone with them
 * and reaches the file; what is kept with a sheet reaches the file, and is moved on by `book.ts` when lines come or go.
 */
import type { ICellData, IColumnData, IRowData, IWorksheetData, Nullable } from '@univerjs/core'

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

/** A corner of a chart: a cell, and how far within it from its top left, in pixels. */
export interface Corner {
  readonly row: number
  readonly column: number
  readonly x?: number
  readonly y?: number
}

/** A chart that lies over a sheet. References name their sheet and are absolute: `'My book'!$B$5:$B$9`. */
export interface SheetChart {
  /** no two charts of a sheet share one */
  readonly name: string
  readonly kind: 'bars' | 'columns' | 'stacked columns' | 'line'
  /** '' where none is shown */
  readonly title: string
  readonly from: Corner
  /** where the first cell lies that it leaves free, when it ends at the edge of one */
  readonly to: Corner
  readonly categories: string
  readonly series: readonly ChartSeries[]
  /** number format of the axis of values */
  readonly format: string
  /** whether categories run from the far end of their axis: for bars, the first one on top */
  readonly reversed: boolean
  readonly legend: boolean
  /** where the axis of values begins; absent: where whoever draws sees fit */
  readonly minimum?: number
}

export interface ChartSeries {
  readonly name: string
  readonly values: string
  /** filled (an unbroken line), an outline only (a broken line), or taking up room without being drawn */
  readonly look: 'solid' | 'outline' | 'unseen'
}

/** How a sheet is printed; what is absent is as the host has it. */
export interface SheetPage {
  /** the host's name of it, such as A4 */
  readonly paper?: string
  readonly orientation?: 'Portrait' | 'Landscape'
  /** a scale in percent, or how many pages wide and tall; null or absent where that is free */
  readonly zoom?: {
    readonly scale?: number | null
    readonly horizontalFitToPages?: number | null
    readonly verticalFitToPages?: number | null
  }
  /** in points */
  readonly margins?: { readonly [side in 'top' | 'bottom' | 'left' | 'right' | 'header' | 'footer']?: number }
  /** in the host's codes: `&P` for the number of the page, `&&` for the sign itself */
  readonly texts?: {
    readonly [
      place in 'leftHeader' | 'centerHeader' | 'rightHeader' | 'leftFooter' | 'centerFooter' | 'rightFooter'
    ]?: string
  }
  /** references of this sheet, absolute and without its name: `$A$1:$L$90`, `$1:$3`, `$A:$B` */
  readonly printArea?: string
  readonly titleRows?: string
  readonly titleColumns?: string
  readonly centerHorizontally?: boolean
  readonly centerVertically?: boolean
  readonly printGridlines?: boolean
  readonly printHeadings?: boolean
}

/** What the grid keeps of a sheet. */
export type SheetData = Pick<Partial<IWorksheetData>, 'custom'>

/** The charts of a sheet, those behind first. */
export const chartsOf = (sheet: SheetData): readonly SheetChart[] =>
  (sheet.custom?.['charts'] as readonly SheetChart[] | undefined) ?? []

export const pageOf = (sheet: SheetData): SheetPage => (sheet.custom?.['page'] as SheetPage | undefined) ?? {}

/** The custom data of a sheet with other charts or another page. */
export function withDrawn(
  { charts, page }: { readonly charts?: readonly SheetChart[]; readonly page?: SheetPage },
  sheet: SheetData = {},
): SheetData {
  const custom = { ...sheet.custom, ...(charts && { charts }), ...(page && { page }) }
  if (chartsOf({ custom }).length === 0) delete custom['charts']
  if (Object.keys(pageOf({ custom })).length === 0) delete custom['page']
  return { custom }
}
