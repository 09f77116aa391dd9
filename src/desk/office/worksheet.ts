/** Worksheets and what hangs on one: protection, panes, the page. */
import { COLUMNS, ROWS, rectAt } from './addresses'
import type { Sheet } from './book'
import { OfficeError } from './error'
import { RANGE, fullAddress, placeAt, type Place } from './range'
import type { Find, Kind, Scalar } from './request-context'

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

/** Properties the grid does not draw: kept as they are set, for the file. */
const kept = (prefix: string, defaults: Readonly<Record<string, unknown>>): Record<string, Scalar<Sheet>> =>
  Object.fromEntries(
    Object.entries(defaults).map(([key, value]) => [
      key,
      {
        read: (sheet: Sheet) => sheet.extras.page.get(prefix + key) ?? value,
        write: (sheet: Sheet, given: unknown) => {
          sheet.guard()
          sheet.extras.page.set(prefix + key, given)
        },
      },
    ]),
  )

const HEADER_FOOTER: Kind<Sheet> = {
  name: 'HeaderFooter',
  scalars: kept('headersFooters.', {
    leftHeader: '',
    centerHeader: '',
    rightHeader: '',
    leftFooter: '',
    centerFooter: '',
    rightFooter: '',
  }),
}

const HEADERS_FOOTERS: Kind<Sheet> = {
  name: 'HeaderFooterGroup',
  parts: { defaultForAllPages: { kind: () => HEADER_FOOTER, find: (sheet) => sheet } },
}

const printed = (key: string) => (sheet: Sheet, given: Place | string) => {
  sheet.guard()
  sheet.extras.page.set(key, fullAddress(typeof given === 'string' ? placeAt(sheet, given) : given))
}

const PAGE_LAYOUT: Kind<Sheet> = {
  name: 'PageLayout',
  scalars: kept('', {
    orientation: 'Portrait',
    paperSize: 'A4',
    zoom: { scale: 100 },
    centerHorizontally: false,
    centerVertically: false,
    printGridlines: false,
    printHeadings: false,
    topMargin: 54,
    bottomMargin: 54,
    leftMargin: 50.4,
    rightMargin: 50.4,
    headerMargin: 21.6,
    footerMargin: 21.6,
  }),
  parts: { headersFooters: { kind: () => HEADERS_FOOTERS, find: (sheet) => sheet } },
  acts: {
    setPrintArea: printed('printArea'),
    setPrintTitleRows: printed('printTitleRows'),
    setPrintTitleColumns: printed('printTitleColumns'),
  },
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
