/** Worksheets and what hangs on one: protection, panes, the page. */
import { COLUMNS, ROWS, formatRect, isEntireColumn, isEntireRow, rectAt } from './addresses'
import type { Sheet } from './book'
import { CHARTS } from './charts'
import type { SheetPage } from './custom-data'
import { OfficeError } from './error'
import { RANGE, RANGE_AREAS, placeAt, shifted, type Place, type Places } from './range'
import type { Find, Kind, Scalar, Shift } from './request-context'

const range = () => RANGE

const whole = { top: 0, left: 0, bottom: ROWS - 1, right: COLUMNS - 1 }

const mustExist = (sheet: Sheet): void => {
  if (!sheet.exists) throw new OfficeError('ItemNotFound', 'the sheet was deleted')
}

const PROTECTION: Kind<Sheet> = {
  name: 'WorksheetProtection',
  scalars: { protected: { read: (sheet) => sheet.extras.protected } },
  acts: {
    protect: (sheet) => {
      if (sheet.extras.protected) throw new OfficeError('InvalidOperation', 'the sheet is protected already')
      sheet.extras.protected = true
    },
    unprotect: (sheet) => {
      sheet.extras.protected = false
    },
  },
}

const FREEZE_PANES: Kind<Sheet> = {
  name: 'WorksheetFreezePanes',
  acts: {
    freezeRows: (sheet, count = 1) => void sheet.facade.setFrozenRows(count),
    freezeColumns: (sheet, count = 1) => void sheet.facade.setFrozenColumns(count),
    unfreeze: (sheet) => void sheet.facade.cancelFreeze(),
  },
}

/** A property of the page, kept as it is set. */
const kept = <K extends keyof SheetPage>(
  key: K,
  usual: SheetPage[K],
  accepts: (value: SheetPage[K]) => boolean,
): Scalar<Sheet> => ({
  read: (sheet) => sheet.page[key] ?? usual,
  write: (sheet: Sheet, value: SheetPage[K]) => {
    if (!accepts(value)) throw new OfficeError('InvalidArgument', `${key} of a page`)
    sheet.page = { ...sheet.page, [key]: value }
  },
})

const isTruth = (value: unknown): boolean => typeof value === 'boolean'

const text = (key: keyof NonNullable<SheetPage['texts']>): Scalar<Sheet> => ({
  read: (sheet) => sheet.page.texts?.[key] ?? '',
  write: (sheet: Sheet, value: string) => {
    // a file holds the three parts of a header in 255 characters (from memory)
    if (typeof value !== 'string' || value.length > 255)
      throw new OfficeError('InvalidArgument', 'a header or footer has at most 255 characters')
    sheet.page = { ...sheet.page, texts: { ...sheet.page.texts, [key]: value } }
  },
})

const HEADER_FOOTER: Kind<Sheet> = {
  name: 'HeaderFooter',
  scalars: {
    leftHeader: text('leftHeader'),
    centerHeader: text('centerHeader'),
    rightHeader: text('rightHeader'),
    leftFooter: text('leftFooter'),
    centerFooter: text('centerFooter'),
    rightFooter: text('rightFooter'),
  },
}

const HEADERS_FOOTERS: Kind<Sheet> = {
  name: 'HeaderFooterGroup',
  parts: { defaultForAllPages: { kind: () => HEADER_FOOTER, find: (sheet) => sheet } },
}

/** The host's usual margins, in points (from memory). */
const MARGINS = { top: 54, bottom: 54, left: 50.4, right: 50.4, header: 21.6, footer: 21.6 }

const margin = (side: keyof typeof MARGINS): Scalar<Sheet> => ({
  read: (sheet) => sheet.page.margins?.[side] ?? MARGINS[side],
  write: (sheet: Sheet, points: number) => {
    if (!(points >= 0)) throw new OfficeError('InvalidArgument', `${points} points are no margin`)
    sheet.page = { ...sheet.page, margins: { ...sheet.page.margins, [side]: points } }
  },
})

/** Excel.PageLayoutZoomOptions: a scale of 10 to 400 percent, or pages; the one is null where the other is given. */
function isZoom({
  scale,
  horizontalFitToPages: wide,
  verticalFitToPages: tall,
}: NonNullable<SheetPage['zoom']>) {
  const fits = [wide, tall].filter((pages) => pages !== null && pages !== undefined)
  if (scale !== null && scale !== undefined) return fits.length === 0 && scale >= 10 && scale <= 400
  return fits.length > 0 && fits.every((pages) => Number.isInteger(pages) && pages > 0)
}

const NO_ZOOM = { scale: null, horizontalFitToPages: null, verticalFitToPages: null }

type Printed = 'printArea' | 'titleRows' | 'titleColumns'

const isWhole = { printArea: () => true, titleRows: isEntireRow, titleColumns: isEntireColumn }

/** Excel.PageLayout: the range of titles has to span whole rows, or whole columns. */
const setPrinted = (key: Printed) => (sheet: Sheet, given: Place | string) => {
  const { rect, sheet: on } = typeof given === 'string' ? placeAt(sheet, given) : given
  if (on.id !== sheet.id || !isWhole[key](rect))
    throw new OfficeError('InvalidArgument', 'titles of a page are whole rows or columns of its sheet')
  sheet.page = { ...sheet.page, [key]: formatRect(rect, true) }
}

const findPrinted = (sheet: Sheet, key: Printed): Place | null => {
  const address = sheet.page[key]
  return address === undefined ? null : placeAt(sheet, address)
}

/** The two ways to ask for a part of the page that may not be set. */
const printed = (name: string, key: Printed): Record<string, Find<Sheet>> => {
  const found: Pick<Find<Sheet>, 'kind' | 'find'> = key === 'printArea'
    ? {
        kind: () => RANGE_AREAS,
        find: (sheet): Places | null => {
          const place = findPrinted(sheet, key)
          return place && { sheet, rects: [place.rect] }
        },
      }
    : { kind: range, find: (sheet) => findPrinted(sheet, key) }
  return { [`get${name}`]: found, [`get${name}OrNullObject`]: { ...found, orNull: true } }
}

const PAGE_LAYOUT: Kind<Sheet> = {
  name: 'PageLayout',
  scalars: {
    orientation: kept('orientation', 'Portrait', (value) => value === 'Portrait' || value === 'Landscape'),
    paperSize: kept('paper', 'A4', (value) =>
      ['A3', 'A4', 'A5', 'Letter', 'Legal', 'Tabloid'].includes(value ?? ''),
    ),
    zoom: {
      read: (sheet) => ({ ...NO_ZOOM, ...(sheet.page.zoom ?? { scale: 100 }) }),
      write: (sheet: Sheet, zoom: NonNullable<SheetPage['zoom']>) => {
        if (typeof zoom !== 'object' || !isZoom(zoom))
          throw new OfficeError('InvalidArgument', 'zoom of a page')
        sheet.page = { ...sheet.page, zoom: { ...NO_ZOOM, ...zoom } }
      },
    },
    centerHorizontally: kept('centerHorizontally', false, isTruth),
    centerVertically: kept('centerVertically', false, isTruth),
    printGridlines: kept('printGridlines', false, isTruth),
    printHeadings: kept('printHeadings', false, isTruth),
    topMargin: margin('top'),
    bottomMargin: margin('bottom'),
    leftMargin: margin('left'),
    rightMargin: margin('right'),
    headerMargin: margin('header'),
    footerMargin: margin('footer'),
  },
  parts: { headersFooters: { kind: () => HEADERS_FOOTERS, find: (sheet) => sheet } },
  finds: {
    ...printed('PrintArea', 'printArea'),
    ...printed('PrintTitleRows', 'titleRows'),
    ...printed('PrintTitleColumns', 'titleColumns'),
  },
  acts: {
    setPrintArea: setPrinted('printArea'),
    setPrintTitleRows: setPrinted('titleRows'),
    setPrintTitleColumns: setPrinted('titleColumns'),
  },
}

const pageWithout = (page: SheetPage, keys: readonly Printed[]): SheetPage =>
  Object.fromEntries(Object.entries(page).filter(([key]) => !keys.some((known) => known === key)))

/** A name of one sheet. Of those the desk has only the host's own for what is printed (from memory: it lists them, and deleting one unsets it). */
interface PrintName {
  readonly sheet: Sheet
  readonly name: string
}

const PRINT_NAMES: Readonly<Record<string, readonly Printed[]>> = {
  Print_Area: ['printArea'],
  Print_Titles: ['titleRows', 'titleColumns'],
}

const isSet = ({ sheet, name }: PrintName): boolean =>
  (PRINT_NAMES[name] ?? []).some((key) => sheet.page[key] !== undefined)

const PRINT_NAME: Kind<PrintName> = {
  name: 'NamedItem',
  check: (name) => {
    if (!isSet(name)) throw new OfficeError('ItemNotFound', `there is no name "${name.name}"`)
  },
  scalars: { name: { read: ({ name }) => name }, scope: { read: () => 'Worksheet' } },
  acts: {
    delete: ({ sheet, name }) => {
      sheet.page = pageWithout(sheet.page, PRINT_NAMES[name] ?? [])
    },
  },
}

const findPrintName = (sheet: Sheet, name: string): PrintName | null =>
  isSet({ sheet, name }) ? { sheet, name } : null

const SHEET_NAMES: Kind<Sheet> = {
  name: 'NamedItemCollection',
  list: {
    kind: () => PRINT_NAME,
    read: (sheet) => Object.keys(PRINT_NAMES).flatMap((name) => findPrintName(sheet, name) ?? []),
  },
  finds: {
    getItem: { kind: () => PRINT_NAME, find: findPrintName },
    getItemOrNullObject: { kind: () => PRINT_NAME, orNull: true, find: findPrintName },
  },
}

/** Lets what is printed follow cells when lines of the sheet come or go. */
export function shiftPage(sheet: Sheet, change: Shift): void {
  const { page } = sheet
  const followed = (['printArea', 'titleRows', 'titleColumns'] as const).flatMap((key) => {
    const place = findPrinted(sheet, key)
    const rect = place && shifted(place.rect, change)
    return rect ? [[key, formatRect(rect, true)] as const] : []
  })
  const others = pageWithout(page, ['printArea', 'titleRows', 'titleColumns'])
  if (Object.keys(others).length < Object.keys(page).length)
    sheet.keep({ page: { ...others, ...Object.fromEntries(followed) } })
}

function usedRange(orNull: boolean): Find<Sheet> {
  return {
    kind: range,
    orNull,
    find: (sheet, valuesOnly = false) => {
      const rect = sheet.used(valuesOnly, whole)
      // Of a blank sheet, the plain form gives the top-left cell.
      return rect || !orNull ? { sheet, rect: rect ?? rectAt(0, 0, 1, 1) } : null
    },
  }
}

function setVisibility(sheet: Sheet, visibility: string): void {
  if (!['Visible', 'Hidden', 'VeryHidden'].includes(visibility))
    throw new OfficeError('InvalidArgument', `"${visibility}" is no visibility`)
  if (visibility === 'Visible') {
    if (!sheet.isShown) sheet.facade.showSheet()
  } else if (sheet.isShown) {
    mustLeaveOne(sheet)
    sheet.facade.hideSheet()
  }
  sheet.isVeryHidden = visibility === 'VeryHidden'
}

function mustLeaveOne(sheet: Sheet): void {
  const others = sheet.book.sheets().filter((other) => other.id !== sheet.id && other.isShown)
  if (!others.length) throw new OfficeError('InvalidOperation', 'a workbook needs one visible sheet')
}

const own = ({ id }: Sheet): string => id

export const WORKSHEET: Kind<Sheet> = {
  name: 'Worksheet',
  check: mustExist,
  scalars: {
    id: { read: (sheet) => sheet.id },
    name: {
      read: (sheet) => sheet.name,
      write: (sheet: Sheet, name: string) => {
        if (sheet.name === name) return
        if (sheet.name.toLowerCase() !== name.toLowerCase()) sheet.book.checkSheetName(name)
        sheet.facade.setName(name)
      },
    },
    position: {
      read: (sheet) => sheet.facade.getIndex(),
      write: (sheet: Sheet, position: number) => void sheet.book.workbook.moveSheet(sheet.facade, position),
    },
    visibility: {
      read: (sheet) => (sheet.isShown ? 'Visible' : sheet.isVeryHidden ? 'VeryHidden' : 'Hidden'),
      write: setVisibility,
    },
    tabColor: {
      read: (sheet) => sheet.facade.getTabColor() ?? '',
      write: (sheet: Sheet, colour: string) => void sheet.facade.setTabColor(colour),
    },
    showGridlines: {
      read: (sheet) => !sheet.facade.hasHiddenGridLines(),
      write: (sheet: Sheet, show: boolean) => void sheet.facade.setHiddenGridlines(!show),
    },
  },
  parts: {
    protection: { kind: () => PROTECTION, find: (sheet) => sheet },
    freezePanes: { kind: () => FREEZE_PANES, find: (sheet) => sheet },
    pageLayout: { kind: () => PAGE_LAYOUT, find: (sheet) => sheet },
    charts: { kind: () => CHARTS, find: (sheet) => sheet },
    names: { kind: () => SHEET_NAMES, find: (sheet) => sheet },
  },
  finds: {
    getRange: {
      kind: range,
      find: (sheet, address?: string) =>
        address === undefined ? { sheet, rect: whole } : placeAt(sheet, address),
    },
    getRangeByIndexes: {
      kind: range,
      find: (sheet, row: number, column: number, rows: number, columns: number) => ({
        sheet,
        rect: rectAt(row, column, rows, columns),
      }),
    },
    getCell: {
      kind: range,
      find: (sheet, row: number, column: number) => ({ sheet, rect: rectAt(row, column, 1, 1) }),
    },
    getUsedRange: usedRange(false),
    getUsedRangeOrNullObject: usedRange(true),
  },
  acts: {
    activate: (sheet) => {
      if (!sheet.isShown) throw new OfficeError('InvalidOperation', 'a hidden sheet cannot be activated')
      sheet.facade.activate()
    },
    delete: (sheet) => {
      mustLeaveOne(sheet)
      // Excel.Worksheet.delete: such a sheet has to be made visible or hidden first
      if (sheet.isVeryHidden) throw new OfficeError('InvalidOperation', 'the sheet is very hidden')
      sheet.book.workbook.deleteSheet(sheet.id)
    },
  },
  events: {
    onChanged: { topic: 'changed', sheet: own },
    onCalculated: { topic: 'calculated', sheet: own },
    onSelectionChanged: { topic: 'sheetSelection', sheet: own },
    onActivated: { topic: 'activated', sheet: own },
    onDeactivated: { topic: 'deactivated', sheet: own },
  },
}
