/**
 * The grid and formula engine under the desk. Here it is started without any user interface, for Node; the page starts the same engine
 * with one and hands over the same three things.
 */
import { LocaleType, LogLevel, Univer, type IWorkbookData } from '@univerjs/core'
import { FUniver } from '@univerjs/core/facade'
import { UniverFormulaEnginePlugin } from '@univerjs/engine-formula'
import '@univerjs/engine-formula/facade'
import { UniverSheetsPlugin } from '@univerjs/sheets'
import '@univerjs/sheets/facade'
import { UniverSheetsFormulaPlugin } from '@univerjs/sheets-formula'
import '@univerjs/sheets-formula/facade'
import { UniverSheetsNumfmtPlugin } from '@univerjs/sheets-numfmt'
import '@univerjs/sheets-numfmt/facade'
import { UniverSheetsTablePlugin } from '@univerjs/sheets-table'
import '@univerjs/sheets-table/facade'
import { followNames } from './names'

export interface Grid {
  readonly univer: Univer
  readonly api: FUniver
  dispose(): void
}

/** An empty workbook as a new one looks: one sheet, named as the host names it. */
export function emptyWorkbook(): Partial<IWorkbookData> {
  return {
    id: 'workbook',
    name: 'Book1',
    sheetOrder: ['sheet-1'],
    sheets: { 'sheet-1': { id: 'sheet-1', name: 'Sheet1', rowCount: 1000, columnCount: 40 } },
  }
}

/** A grid without a screen, holding `workbook`. */
export function headlessGrid(workbook: Partial<IWorkbookData> = emptyWorkbook()): Grid {
  const univer = new Univer({
    locale: LocaleType.EN_US,
    locales: { [LocaleType.EN_US]: {} },
    logLevel: LogLevel.WARN,
  })
  univer.registerPlugin(UniverFormulaEnginePlugin, {})
  univer.registerPlugin(UniverSheetsPlugin, {})
  univer.registerPlugin(UniverSheetsFormulaPlugin, {})
  univer.registerPlugin(UniverSheetsNumfmtPlugin, {})
  univer.registerPlugin(UniverSheetsTablePlugin, {})
  const api = FUniver.newAPI(univer)
  followNames(univer, api)
  api.createWorkbook(workbook)
  return { univer, api, dispose: () => univer.dispose() }
}
