/** The grid with its screen: the same engine as without one, and what the user sees and touches. */
import { LocaleType, LogLevel, Univer, mergeLocales } from '@univerjs/core'
import { FUniver } from '@univerjs/core/facade'
import { UniverSheetsCorePreset } from '@univerjs/preset-sheets-core'
import coreEnglish from '@univerjs/preset-sheets-core/locales/en-US'
import '@univerjs/preset-sheets-core/lib/index.css'
import { UniverSheetsDrawingPreset } from '@univerjs/preset-sheets-drawing'
import drawingEnglish from '@univerjs/preset-sheets-drawing/locales/en-US'
import '@univerjs/preset-sheets-drawing/lib/index.css'
import { UniverSheetsTablePreset } from '@univerjs/preset-sheets-table'
import tableEnglish from '@univerjs/preset-sheets-table/locales/en-US'
import '@univerjs/preset-sheets-table/lib/index.css'
import type { Grid } from '../grid'
import { followNames } from '../names'

export function openGridView(container: HTMLElement, dark: boolean): Grid {
  const univer = new Univer({
    locale: LocaleType.EN_US,
    locales: { [LocaleType.EN_US]: mergeLocales(coreEnglish, drawingEnglish, tableEnglish) },
    logLevel: LogLevel.ERROR,
    darkMode: dark,
  })
  const presets = [
    UniverSheetsCorePreset({
      container,
      ribbonType: 'simple',
      disableAutoFocus: true,
      sheets: { disableForceStringAlert: true },
    }),
    UniverSheetsDrawingPreset(),
    UniverSheetsTablePreset(),
  ]
  for (const plugin of presets.flatMap(({ plugins }) => plugins)) {
    if (Array.isArray(plugin)) univer.registerPlugin(plugin[0], plugin[1])
    else univer.registerPlugin(plugin)
  }
  const api = FUniver.newAPI(univer)
  followNames(univer, api)
  return { univer, api, dispose: () => univer.dispose() }
}
