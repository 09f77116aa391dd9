/** The working parts of the desk, loaded after the first paint: grid, functions, stand-in, files. */
import { CommandType, ICommandService, numberToABC } from '@univerjs/core'
import { ILayoutService } from '@univerjs/preset-sheets-core'
import { openWorkbook, saveWorkbook, sentenceOf } from '../files'
import { createCustomFunctions, type CustomFunctionsStandIn, type FunctionsMetadata } from '../functions'
import type { Grid } from '../grid'
import { createOffice, type OfficeStandIn } from '../office'
import type { PaneGlobals } from './pane-frame'
import { openGridView } from './grid-view'
import { drawCharts } from './sheet-charts'
import { isDark, officeThemeOf, type ThemeName } from './theme'

export interface Workspace {
  readonly grid: Grid
  readonly office: OfficeStandIn
  readonly functions: CustomFunctionsStandIn
  readonly globals: PaneGlobals
  readonly changed: boolean
  setTheme(theme: ThemeName): void
  /** Gives the keyboard to the grid. */
  focus(): void
  /** Replaces the workbook; returns what to tell the user. */
  open(bytes: ArrayBuffer, name: string): Promise<string>
  save(): Promise<{ readonly bytes: ArrayBuffer; readonly name: string }>
  dispose(): void
}

export interface WorkspaceOptions {
  readonly theme: ThemeName
  readonly metadata: FunctionsMetadata
  readonly namespace: string
  /** The sentence behind the error in the selected cell, null when there is none. */
  onCellMessage(message: string | null): void
  onPane(shown: boolean): void
}

export function createWorkspace(container: HTMLElement, options: WorkspaceOptions): Workspace {
  const grid = openGridView(container, isDark(options.theme))
  const stopDrawing = drawCharts(grid)
  const { api } = grid
  const settings = new Map<string, unknown>()
  const functions = createCustomFunctions(grid)
  functions.register(options.metadata, options.namespace)
  const office = createOffice(grid, {
    settings,
    officeTheme: officeThemeOf(options.theme),
    onPane: options.onPane,
  })

  let changed = false
  let opening = false
  const commands = grid.univer.__getInjector().get(ICommandService)
  let savedSettings = '[]'
  commands.onCommandExecuted(({ id, type }, { applyFormulaCalculationResult, onlyLocal } = {}) => {
    if (opening || onlyLocal || applyFormulaCalculationResult || type !== CommandType.MUTATION) return
    if (id.startsWith('sheet.mutation.') || id.endsWith('-defined-name')) changed = true
  })
  const isChanged = (): boolean => changed || JSON.stringify([...settings]) !== savedSettings
  const kept = (): void => {
    changed = false
    savedSettings = JSON.stringify([...settings])
  }
  addEventListener('beforeunload', (event) => {
    if (isChanged()) event.preventDefault()
  })

  api.addEvent(api.Event.SheetEditStarted, () => {
    office.editing = true
  })
  api.addEvent(api.Event.SheetEditEnded, () => {
    office.editing = false
  })
  // The grid draws no links: a press on the cell is all there is of one.
  api.addEvent(api.Event.CellClicked, ({ worksheet, row, column }) =>
    office.press(worksheet.getSheetId(), row, column),
  )

  const tellMessage = (): void => {
    const book = api.getActiveWorkbook()
    const range = book?.getActiveRange()
    const sheet = book?.getActiveSheet()
    if (!book || !range || !sheet) return
    const [row, column] = [range.getRow(), range.getColumn()]
    const value = sheet.getSheet().getCellMatrix().getValue(row, column)?.v
    const isError = typeof value === 'string' && value.startsWith('#')
    const message = isError ? functions.messageAt(book.getId(), sheet.getSheetId(), row, column) : undefined
    options.onCellMessage(message ? `${numberToABC(column)}${row + 1}: ${message}` : null)
  }
  api.addEvent(api.Event.SelectionChanged, tellMessage)
  commands.onCommandExecuted(({ id }) => {
    if (id === 'formula.mutation.set-formula-calculation-result') setTimeout(tellMessage)
  })

  return {
    grid,
    office,
    functions,
    globals: {
      Office: office.Office,
      Excel: office.Excel,
      OfficeExtension: office.OfficeExtension,
      CustomFunctions: functions,
    },
    get changed() {
      return isChanged()
    },
    setTheme(theme) {
      api.toggleDarkMode(isDark(theme))
      office.setOfficeTheme(officeThemeOf(theme))
    },
    focus: () => grid.univer.__getInjector().get(ILayoutService).focus(),
    async open(bytes, name) {
      await api.getActiveWorkbook()?.endEditingAsync(true)
      opening = true
      try {
        const report = await openWorkbook(grid, bytes, settings, name)
        office.reset()
        kept()
        return sentenceOf(report)
      } finally {
        opening = false
      }
    },
    async save() {
      // What is being typed is part of the workbook the user means to save.
      await api.getActiveWorkbook()?.endEditingAsync(true)
      const bytes = await saveWorkbook(grid, settings)
      kept()
      return { bytes, name: api.getActiveWorkbook()?.getName() ?? 'Workbook.xlsx' }
    },
    dispose() {
      stopDrawing()
      functions.dispose()
      grid.dispose()
    },
  }
}
