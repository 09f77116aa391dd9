import { addressOf, type Area, type PageSetup } from '../sheet'
import { areasIn } from './addresses'
import type { Step } from './journal'
import { rangeOf } from './reading'
import { offers } from './requests'
import type { Fill } from './writing'

/** What of the set-up of a sheet's page a write may change, as the host tells it. */
export interface SheetPage {
  readonly sheet: string
  readonly layout: Pick<Excel.Interfaces.PageLayoutData, (typeof LAYOUT)[number]>
  readonly texts: { readonly [place in (typeof TEXTS)[number]]: string }
  /** null where there is none */
  readonly printArea: readonly Area[] | null
  readonly titleRows: Area | null
  readonly titleColumns: Area | null
}

const LAYOUT = [
  'orientation',
  'paperSize',
  'zoom',
  'topMargin',
  'bottomMargin',
  'leftMargin',
  'rightMargin',
  'headerMargin',
  'footerMargin',
] as const

const TEXTS = [
  'leftHeader',
  'centerHeader',
  'rightHeader',
  'leftFooter',
  'centerFooter',
  'rightFooter',
] as const

/** The pages that a plan sets up, each with the area that is printed. */
export const pagesOf = (fills: readonly Fill[]): { readonly area: Area; readonly page: PageSetup }[] =>
  offers('1.9')
    ? fills.flatMap(({ patch: { table }, target }) =>
        table.page ? [{ area: target, page: table.page }] : [],
      )
    : []

/** Asks how the page of a sheet is set up. The answer is there after the next sync. */
export function askPage(context: Excel.RequestContext, sheet: string): () => SheetPage {
  const { pageLayout } = context.workbook.worksheets.getItem(sheet)
  pageLayout.load(LAYOUT.join())
  const texts = pageLayout.headersFooters.defaultForAllPages
  texts.load(TEXTS.join())
  const area = pageLayout.getPrintAreaOrNullObject()
  area.load('address')
  const titles = [
    pageLayout.getPrintTitleRowsOrNullObject(),
    pageLayout.getPrintTitleColumnsOrNullObject(),
  ] as const
  for (const lines of titles) lines.load('address')
  return () => {
    const [titleRows = null, titleColumns = null] = titles.map((lines) =>
      lines.isNullObject ? null : (areasIn(lines.address, sheet)[0] ?? null),
    )
    return {
      sheet,
      layout: Object.fromEntries(LAYOUT.map((key) => [key, pageLayout[key]])) as SheetPage['layout'],
      texts: Object.fromEntries(TEXTS.map((key) => [key, texts[key]])) as SheetPage['texts'],
      printArea: area.isNullObject ? null : areasIn(area.address, sheet).filter((found) => found !== null),
      titleRows,
      titleColumns,
    }
  }
}

/** In a header an ampersand begins a code, and a doubled one is the sign itself. */
const plain = (text: string): string => text.replaceAll('&', '&&')

const MARGINS = {
  topMargin: 54,
  bottomMargin: 54,
  leftMargin: 36,
  rightMargin: 36,
  headerMargin: 22,
  footerMargin: 22,
}

/** Sets the page of a table's sheet up: the table is what is printed. */
export const pageStep = ({ area, page }: { readonly area: Area; readonly page: PageSetup }): Step => ({
  bytes: 2000,
  run(context) {
    const { pageLayout } = context.workbook.worksheets.getItem(area.sheet)
    Object.assign(pageLayout, {
      ...MARGINS,
      orientation: page.orientation === 'landscape' ? 'Landscape' : 'Portrait',
      paperSize: page.paper,
      zoom: { horizontalFitToPages: 1, ...(page.onePage && { verticalFitToPages: 1 }) },
    })
    pageLayout.setPrintArea(rangeOf(context, area))
    if (page.repeatedRows)
      pageLayout.setPrintTitleRows(rangeOf(context, { ...area, rows: page.repeatedRows }).getEntireRow())
    Object.assign(pageLayout.headersFooters.defaultForAllPages, {
      leftHeader: plain(page.header.left),
      centerHeader: '',
      rightHeader: plain(page.header.right),
      leftFooter: plain(page.footer),
      centerFooter: '',
      rightFooter: 'Page &P of &N',
    })
  },
})

/**
 * The steps that set a page up as it was. The interface has no word for "no print area": the host keeps what is printed in names of the sheet,
 * which go instead; one that does not list them goes on printing the table's cells.
 *
 * @param named of those names, which are there
 */
export const pageUndoing = (
  { sheet, layout, texts, printArea, titleRows, titleColumns }: SheetPage,
  named: ReadonlySet<string>,
): Step[] => [
  ...(printArea === null && named.has('Print_Area') ? [unset(sheet, 'Print_Area')] : []),
  ...(titleRows === null && named.has('Print_Titles') ? [unset(sheet, 'Print_Titles')] : []),
  {
    bytes: 2000,
    run(context) {
      const { pageLayout } = context.workbook.worksheets.getItem(sheet)
      // of scale and pages, the one that does not hold is null, and is no value to be set
      const zoom = Object.fromEntries(Object.entries(layout.zoom ?? {}).filter(([, value]) => value !== null))
      Object.assign(pageLayout, { ...layout, zoom })
      Object.assign(pageLayout.headersFooters.defaultForAllPages, texts)
      const [first, second] = printArea ?? []
      // several areas are named by their addresses
      if (first && !second) pageLayout.setPrintArea(rangeOf(context, first))
      else if (first) pageLayout.setPrintArea((printArea ?? []).map(addressOf).join())
      if (titleRows) pageLayout.setPrintTitleRows(rangeOf(context, titleRows).getEntireRow())
      if (titleColumns) pageLayout.setPrintTitleColumns(rangeOf(context, titleColumns).getEntireColumn())
    },
  },
]

const unset = (sheet: string, name: string): Step => ({
  bytes: 500,
  run: ({ workbook }) => workbook.worksheets.getItem(sheet).names.getItem(name).delete(),
})
