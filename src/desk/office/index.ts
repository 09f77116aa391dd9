/**
 * A strict stand-in for the Office JavaScript API over a grid: the same objects, the same queue, the same refusals. Where the host's
 * documentation leaves room, the stand-in takes the side that breaks careless code; what it does not have, it says it has not.
 */
import { SetWorksheetNameMutation } from '@univerjs/sheets'
import type { Grid } from '../grid'
import { Book, ENGLISH, type Culture, type SheetExtras } from './book'
import { renameInCharts, shiftCharts } from './charts'
import { OfficeError } from './error'
import { Events } from './events'
import { officeGlobal, type Theme } from './office'
import { placeOfReference } from './range'
import { RequestContext, payloadSize, run, type Kind, type Operation, type Runtime } from './request-context'
import { ROOT } from './workbook'
import { shiftPage } from './worksheet'

export type { Culture, SheetExtras } from './book'
export {
  barOf,
  chartsOf,
  levelOf,
  linkOf,
  pageOf,
  withBar,
  withDrawn,
  withLevel,
  withLink,
  type ChartSeries,
  type Corner,
  type DataBar,
  type Line,
  type Link,
  type SheetChart,
  type SheetData,
  type SheetPage,
} from './custom-data'
export type { Theme } from './office'
export { userOf, type User } from './user'

export interface OfficeOptions {
  readonly culture?: Culture
  /** Settings the workbook came with; the same map is kept up to date. */
  readonly settings?: Map<string, unknown>
  readonly officeTheme?: Theme
  /** Most bytes of a request or a response. */
  readonly payloadLimit?: number
  /** Told when the add-in shows or hides its pane. */
  onPane?(shown: boolean): void
}

/** What was asked of the workbook, counted so that a test can hold the add-in to it. */
export interface Counts {
  /** Requests sent; a sync with nothing queued sends none. */
  syncs: number
  /** Requests that read something. */
  reads: number
  /** Requests that changed something. */
  writes: number
  /** Operations carried out, of every sort. */
  operations: number
  reset(): void
}

export interface Faults {
  /** Makes the n-th operation from now on fail, counted from 1 across syncs, and again those of any further numbers; null takes it back. */
  beforeOperation(...numbers: readonly (number | null)[]): void
  /** The next request with operations is carried out, but its answer is lost. */
  loseAnswer(): void
}

export interface OfficeStandIn {
  readonly Office: typeof Office
  readonly Excel: typeof Excel
  readonly OfficeExtension: typeof OfficeExtension
  readonly faults: Faults
  readonly counts: Counts
  /** The add-in's settings, as they are saved with the workbook. */
  readonly settings: Map<string, unknown>
  /** Whether the user is in the middle of editing a cell. */
  editing: boolean
  protect(sheet: string, on: boolean): void
  /** What the grid cannot keep of a sheet, by name or id: its protection. */
  extras(sheet: string): SheetExtras
  /** Does what a press on a cell does: goes where its link leads in this workbook. Links out of it are not followed. */
  press(sheet: string, row: number, column: number): void
  /** Changes the theme and tells who asked to be told. */
  setOfficeTheme(theme: Theme | undefined): void
  /** Does what the ribbon button of an action does. */
  runAction(id: string): Promise<void>
  /** Forgets handlers, actions and open contexts: the pane that made them is gone. */
  reset(): void
  /** Resolves when formulas are worked out and events handed out. */
  settled(): Promise<void>
}

/** What of the members here the host cannot undo on every platform: it refuses them in a group of undo. */
const NOT_UNDONE: ReadonlySet<string> = new Set([
  'NamedItem.comment',
  'Worksheet.delete',
  'Worksheet.name',
  'Worksheet.position',
  'Worksheet.visibility',
  'WorksheetProtection.protect',
  'WorksheetProtection.unprotect',
])

const MEGABYTE = 1024 * 1024

class Host implements Runtime {
  readonly book: Book
  readonly events: Events
  readonly contexts = new Set<RequestContext>()
  readonly rootKind: Kind<never> = ROOT
  readonly counts: Counts = {
    syncs: 0,
    reads: 0,
    writes: 0,
    operations: 0,
    reset() {
      this.syncs = this.reads = this.writes = this.operations = 0
    },
  }
  #failing: number[] = []
  #answerLost = false
  #editing = false
  #editingEnded: (() => void)[] = []
  /** Requests are served one after the other. */
  #turn: Promise<unknown> = Promise.resolve()

  constructor(
    grid: Grid,
    readonly options: OfficeOptions,
  ) {
    this.book = new Book(grid, options.culture ?? ENGLISH, options.settings ?? new Map<string, unknown>())
    this.events = new Events(this.book, (change) => {
      this.contexts.forEach((context) => context.shift(change))
      const sheets = this.book.sheets()
      shiftCharts(sheets, change)
      for (const sheet of sheets) if (sheet.id === change.sheet) shiftPage(sheet, change)
    })
    this.book.commands.beforeCommandExecuted(({ id, params }) => {
      if (id !== SetWorksheetNameMutation.id) return
      const { subUnitId, name } = params as { subUnitId: string; name: string }
      const before = this.book.sheet(subUnitId)?.name
      if (before !== undefined) renameInCharts(this.book.sheets(), before, name)
    })
  }

  get root(): Book {
    return this.book
  }

  readonly faults: Faults = {
    beforeOperation: (...numbers) => {
      this.#failing = numbers.filter((number) => number !== null)
    },
    loseAnswer: () => {
      this.#answerLost = true
    },
  }

  get editing(): boolean {
    return this.#editing
  }

  set editing(editing: boolean) {
    this.#editing = editing
    if (!editing) this.#editingEnded.splice(0).forEach((go) => go())
  }

  listen: Runtime['listen'] = (listener) => this.events.listen(listener)
  unlisten: Runtime['unlisten'] = (listener) => this.events.unlisten(listener)

  groupUndo = () => this.book.groupUndo()

  execute: Runtime['execute'] = async (operations, { delayForCellEdit, mergeUndoGroup }) => {
    while (this.#editing) {
      if (!delayForCellEdit) throw new OfficeError('InvalidOperationInCellEditMode')
      await new Promise<void>((resolve) => this.#editingEnded.push(resolve))
    }
    const served = this.#turn.then(() => this.#serve(operations, mergeUndoGroup === true))
    this.#turn = served.catch(() => undefined)
    return served
  }

  async #serve(operations: readonly Operation[], grouped: boolean): Promise<void> {
    const { book, counts } = this
    const limit = this.options.payloadLimit ?? 5 * MEGABYTE
    counts.syncs++
    if (operations.some(({ sort }) => sort === 'read')) counts.reads++
    if (operations.some(({ sort }) => sort === 'write')) counts.writes++
    if (operations.reduce((sum, { payload }) => sum + payloadSize(payload), 0) > limit)
      throw new OfficeError('RequestPayloadSizeLimitExceeded')
    const deliveries: (() => void)[] = []
    let size = 0
    const answer = (value: unknown, deliver: () => void) => {
      size += value === null ? 0 : payloadSize(value)
      deliveries.push(deliver)
    }
    try {
      for (const operation of operations) {
        counts.operations++
        this.#strike(operation)
        if (grouped && NOT_UNDONE.has(operation.location))
          throw new OfficeError('UndoNotSupported', operation.location, operation.location)
        if (operation.sort === 'read' && !book.calculationSuspended) await book.calculated()
        this.#carryOut(operation, answer)
      }
    } finally {
      book.calculationSuspended = false
      await book.calculated()
    }
    if (this.#answerLost) {
      this.#answerLost = false
      throw new OfficeError('GeneralException', 'the answer was lost')
    }
    if (size > limit) throw new OfficeError('ResponsePayloadSizeLimitExceeded')
    for (const deliver of deliveries) deliver()
  }

  #carryOut(operation: Operation, answer: Parameters<Operation['run']>[0]): void {
    this.book.applying = true
    try {
      operation.run(answer)
    } catch (error) {
      throw error instanceof OfficeError ? error.at(operation.location) : error
    } finally {
      this.book.applying = false
    }
  }

  #strike({ location }: Operation): void {
    const struck = this.#failing.includes(1)
    this.#failing = this.#failing.map((number) => number - 1).filter((number) => number > 0)
    if (struck) throw new OfficeError('GeneralException', 'a fault was injected', location)
  }

  /** Whoever opened them is gone: their objects cannot be used again, and nobody is told of anything. */
  reset(): void {
    this.events.forget()
    for (const context of this.contexts) context.expire(() => true)
    this.contexts.clear()
    this.#failing = []
    this.#answerLost = false
  }

  sheet(nameOrId: string) {
    const sheet = this.book.sheet(nameOrId)
    if (!sheet) throw new OfficeError('ItemNotFound', `there is no sheet "${nameOrId}"`)
    return sheet
  }
}

/** The values of the host's enumerations that add-ins name. */
const ENUMERATIONS = {
  EventSource: { local: 'Local', remote: 'Remote' },
  EventTriggerSource: { unknown: 'Unknown', thisLocalAddin: 'ThisLocalAddin' },
  SheetVisibility: { visible: 'Visible', hidden: 'Hidden', veryHidden: 'VeryHidden' },
  RangeValueType: { empty: 'Empty', string: 'String', double: 'Double', boolean: 'Boolean', error: 'Error' },
  ClearApplyTo: {
    all: 'All',
    contents: 'Contents',
    formats: 'Formats',
    hyperlinks: 'Hyperlinks',
    removeHyperlinks: 'RemoveHyperlinks',
  },
  GroupOption: { byRows: 'ByRows', byColumns: 'ByColumns' },
  CalculationMode: {
    automatic: 'Automatic',
    automaticExceptTables: 'AutomaticExceptTables',
    manual: 'Manual',
  },
  CalculationType: { recalculate: 'Recalculate', full: 'Full', fullRebuild: 'FullRebuild' },
  DeleteShiftDirection: { up: 'Up', left: 'Left' },
  InsertShiftDirection: { down: 'Down', right: 'Right' },
  DataChangeType: {
    rangeEdited: 'RangeEdited',
    rowInserted: 'RowInserted',
    rowDeleted: 'RowDeleted',
    columnInserted: 'ColumnInserted',
    columnDeleted: 'ColumnDeleted',
  },
}

/** The stand-in over a grid; its first three members are what a page assigns to its globals. */
export function createOffice(grid: Grid, options: OfficeOptions = {}): OfficeStandIn {
  const host = new Host(grid, options)
  const office = officeGlobal(host.book.culture, options.officeTheme, (shown) => options.onPane?.(shown))
  const excel = {
    ...ENUMERATIONS,
    RequestContext: class extends RequestContext {
      constructor() {
        super(host)
      }
    },
    run: (first: unknown, second?: unknown) => run(host, first, second),
  }
  return {
    // The shapes are checked where they are used: the add-in and the contract tests compile against the host's own declarations.
    Office: office.api as unknown as typeof Office,
    Excel: excel as unknown as typeof Excel,
    OfficeExtension: { Error: OfficeError } as unknown as typeof OfficeExtension,
    faults: host.faults,
    counts: host.counts,
    settings: host.book.settings,
    get editing() {
      return host.editing
    },
    set editing(editing) {
      host.editing = editing
    },
    protect: (sheet, on) => {
      host.sheet(sheet).extras.protected = on
    },
    extras: (sheet) => host.sheet(sheet).extras,
    press: (name, row, column) => {
      const sheet = host.sheet(name)
      const place = placeOfReference(sheet, sheet.link(row, column)?.documentReference ?? '')
      if (place?.sheet.isShown) host.book.select(place.sheet, [place.rect])
    },
    setOfficeTheme: office.setTheme,
    runAction: office.runAction,
    reset: () => {
      host.reset()
      office.forget()
    },
    settled: async () => {
      await host.book.calculated()
      await host.events.delivered()
    },
  }
}
