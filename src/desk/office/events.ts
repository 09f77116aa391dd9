/** Turns what happens in the grid into the host's events, and hands them out one task later, as the host does. */
import {
  type ICellData,
  type ICommandInfo,
  type IExecutionOptions,
  type IRange,
  type Nullable,
} from '@univerjs/core'
import {
  SetFormulaCalculationResultMutation,
  type ISetFormulaCalculationResultMutation,
} from '@univerjs/engine-formula'
import {
  InsertColMutation,
  InsertRangeMoveDownCommand,
  InsertRangeMoveRightCommand,
  InsertRowMutation,
  InsertSheetMutation,
  MoveRangeMutation,
  RemoveColMutation,
  RemoveRowMutation,
  RemoveSheetMutation,
  SetRangeValuesMutation,
  SetSelectionsOperation,
  SetWorksheetActiveOperation,
  SetWorksheetNameMutation,
  type IMoveRangeMutationParams,
  type ISetRangeValuesMutationParams,
} from '@univerjs/sheets'
import { blocksOf, bounding, formatRect, rectAt, type Rect } from './addresses'
import { Sheet, type Book, type StoredCell } from './book'
import type { Listener, RequestContext, Shift } from './request-context'

type Event = Readonly<Record<string, unknown>>

interface SheetParams {
  readonly subUnitId: string
  readonly range: IRange
  readonly trigger?: string
}

const STRUCTURE: Readonly<Record<string, { axis: Shift['axis']; sign: 1 | -1; changeType: string }>> = {
  [InsertRowMutation.id]: { axis: 'row', sign: 1, changeType: 'RowInserted' },
  [InsertColMutation.id]: { axis: 'column', sign: 1, changeType: 'ColumnInserted' },
  [RemoveRowMutation.id]: { axis: 'row', sign: -1, changeType: 'RowDeleted' },
  [RemoveColMutation.id]: { axis: 'column', sign: -1, changeType: 'ColumnDeleted' },
}

/** More scattered cells than this are told as the one block that holds them. */
const MOST_AREAS = 50

/** Whether a change is one of content: the grid also writes results of formulas, moved references and styles this way. */
const isContent = (cell: Nullable<ICellData>): boolean => !cell || 'v' in cell || 'p' in cell

const touchedBlocks = (cellValue: ISetRangeValuesMutationParams['cellValue']): Rect[] =>
  blocksOf(
    Object.entries(cellValue ?? {}).map(([row, line]) => [
      Number(row),
      Object.entries(line ?? {})
        .filter(([, cell]) => isContent(cell as Nullable<ICellData>))
        .map(([column]) => Number(column)),
    ]),
  )

export class Events {
  #listeners: Listener[] = []
  #active: string | undefined
  /** The single cell about to change, as it was. */
  #before: StoredCell | undefined
  #queue: Promise<void> = Promise.resolve()

  constructor(
    readonly book: Book,
    /** Told at once when rows or columns come or go, so that open objects follow. */
    readonly onShift: (change: Shift) => void,
  ) {
    book.commands.beforeCommandExecuted((command, options) => {
      if (command.id === SetRangeValuesMutation.id) this.#before = this.#cellBefore(command.params, options)
    })
    book.commands.onCommandExecuted((command, options) => this.#executed(command, options))
  }

  listen(listener: Listener): void {
    this.#listeners.push(listener)
  }

  unlisten({ topic, handler, context }: Pick<Listener, 'topic' | 'handler' | 'context'>): boolean {
    const at = this.#listeners.findIndex(
      (l) => l.topic === topic && l.handler === handler && l.context === context,
    )
    if (at >= 0) this.#listeners.splice(at, 1)
    return at >= 0
  }

  /** Forgets every listener. */
  forget(): void {
    this.#listeners = []
  }

  #executed({ id, params }: Readonly<ICommandInfo>, options?: IExecutionOptions): void {
    if (!params) return
    if (id === SetRangeValuesMutation.id) this.#valuesSet(params as ISetRangeValuesMutationParams, options)
    else if (STRUCTURE[id]) this.#structureChanged(id, params as SheetParams)
    else if (id === MoveRangeMutation.id) this.#moved(params as IMoveRangeMutationParams)
    else if (id === SetFormulaCalculationResultMutation.id)
      this.#calculated(params as ISetFormulaCalculationResultMutation)
    else if (id === SetSelectionsOperation.id) this.#selected((params as { subUnitId: string }).subUnitId)
    else if (id === SetWorksheetActiveOperation.id)
      this.#activated((params as { subUnitId: string }).subUnitId)
    else if (id === InsertSheetMutation.id)
      this.#sheet('added', 'WorksheetAdded', (params as { sheet: { id: string } }).sheet.id)
    else if (id === RemoveSheetMutation.id)
      this.#sheet('deleted', 'WorksheetDeleted', (params as { subUnitId: string }).subUnitId)
    else if (id === SetWorksheetNameMutation.id) {
      const { subUnitId, name } = params as { subUnitId: string; name: string }
      this.#sheet('renamed', 'WorksheetNameChanged', subUnitId, { nameAfter: name })
    }
  }

  /** Publishes an event a task later; `late` fills in what is only known then. */
  #publish(topic: string, sheet: string | undefined, event: Event, late?: () => Promise<Event>): void {
    if (!this.book.eventsEnabled) return
    const heard = () =>
      this.#listeners.filter((l) => l.topic === topic && (l.sheet === undefined || l.sheet === sheet))
    if (!heard().length) return
    this.#queue = this.#queue.then(async () => {
      await new Promise((resolve) => setTimeout(resolve))
      const args = { ...event, ...(await late?.()) }
      for (const { handler } of heard()) void Promise.resolve(args).then(handler)
    })
  }

  /** Resolves when every event so far has been handed out. */
  async delivered(): Promise<void> {
    await this.#queue
    await new Promise((resolve) => setTimeout(resolve))
  }

  #source(): Event {
    return { source: 'Local', triggerSource: this.book.applying ? 'ThisLocalAddin' : 'Unknown' }
  }

  #changed(sheet: string, address: string, changeType: string, late?: () => Promise<Event>): void {
    const inContext = (context: RequestContext) => {
      const { worksheets } = context.workbook as Excel.Workbook
      return worksheets.getItem(sheet).getRange(address)
    }
    const event = {
      type: 'WorksheetChanged',
      worksheetId: sheet,
      address,
      changeType,
      ...this.#source(),
      getRange: inContext,
    }
    this.#publish('changed', sheet, event, late)
  }

  #cellBefore(params: unknown, options?: IExecutionOptions): StoredCell | undefined {
    if (options?.onlyLocal) return undefined
    const { subUnitId, cellValue } = params as ISetRangeValuesMutationParams
    const rows = Object.entries(cellValue ?? {})
    const [row, line] = rows[0] ?? []
    const columns = Object.keys(line ?? {})
    if (rows.length !== 1 || columns.length !== 1) return undefined
    const sheet = new Sheet(this.book, subUnitId)
    return sheet.map(rectAt(Number(row), Number(columns[0]), 1, 1), (cell) => cell)[0]?.[0]
  }

  #valuesSet({ subUnitId, cellValue }: ISetRangeValuesMutationParams, options?: IExecutionOptions): void {
    if (options?.onlyLocal) return
    if (!this.#listeners.some(({ topic }) => topic === 'changed')) return
    // What the add-in fills is one range; a user's change of scattered cells is told as such, within reason.
    const touched = this.book.filling ? [this.book.filling] : touchedBlocks(cellValue)
    const [rect] = touched
    if (!rect) return
    const told = touched.length > MOST_AREAS ? [touched.reduce(bounding)] : touched
    const before = this.#before
    const single = before && told.length === 1 && rect.top === rect.bottom && rect.left === rect.right
    const details = async () => {
      // A formula's value is not there before it has been worked out.
      await this.book.calculated()
      const sheet = new Sheet(this.book, subUnitId)
      const after = sheet.exists ? sheet.map(rect, (cell) => cell)[0]?.[0] : undefined
      return {
        details: {
          valueBefore: before?.value,
          valueAfter: after?.value,
          valueTypeBefore: before?.kind,
          valueTypeAfter: after?.kind,
        },
      }
    }
    const address = told.map((part) => formatRect(part)).join(',')
    this.#changed(subUnitId, address, 'RangeEdited', single ? details : undefined)
  }

  #structureChanged(id: string, { subUnitId, range, trigger }: SheetParams): void {
    // To push cells aside, the grid first lengthens the sheet at its end: nothing came into being there.
    if (trigger === InsertRangeMoveDownCommand.id || trigger === InsertRangeMoveRightCommand.id) return
    const kind = STRUCTURE[id]
    if (!kind) return
    const [from, to] =
      kind.axis === 'row' ? [range.startRow, range.endRow] : [range.startColumn, range.endColumn]
    this.onShift({ sheet: subUnitId, axis: kind.axis, at: from, count: kind.sign * (to - from + 1) })
    const { rectOf } = { rectOf: (part: IRange) => new Sheet(this.book, subUnitId).rectOf(part) }
    const lines =
      kind.axis === 'row'
        ? { ...range, startColumn: NaN, endColumn: NaN }
        : { ...range, startRow: NaN, endRow: NaN }
    this.#changed(subUnitId, formatRect(rectOf(lines)), kind.changeType)
  }

  #moved({ from, to, fromRange, toRange }: IMoveRangeMutationParams): void {
    const plain = ({ startRow, startColumn, endRow, endColumn }: IRange) =>
      formatRect({ top: startRow, left: startColumn, bottom: endRow, right: endColumn })
    this.#changed(from.subUnitId, plain(fromRange), 'RangeEdited')
    this.#changed(to.subUnitId, plain(toRange), 'RangeEdited')
  }

  #calculated({ unitData }: ISetFormulaCalculationResultMutation): void {
    for (const [sheet, rows] of Object.entries(unitData[this.book.id] ?? {})) {
      let touched: Rect | undefined
      for (const [row, line] of Object.entries(rows ?? {}))
        for (const column of Object.keys((line ?? {}) as object)) {
          const rect = { top: Number(row), left: Number(column), bottom: Number(row), right: Number(column) }
          touched = touched ? bounding(touched, rect) : rect
        }
      if (touched)
        this.#publish('calculated', sheet, {
          type: 'WorksheetCalculated',
          worksheetId: sheet,
          address: formatRect(touched),
        })
    }
  }

  #selected(sheet: string): void {
    const address = () =>
      this.book
        .selection()
        .map((rect) => formatRect(rect))
        .join(',')
    this.#publish('selection', sheet, { type: 'SelectionChanged' })
    const event = { type: 'WorksheetSelectionChanged', worksheetId: sheet }
    this.#publish('sheetSelection', sheet, event, () => Promise.resolve({ address: address() }))
  }

  #activated(sheet: string): void {
    if (this.#active && this.#active !== sheet)
      this.#publish('deactivated', this.#active, { type: 'WorksheetDeactivated', worksheetId: this.#active })
    this.#active = sheet
    this.#publish('activated', sheet, { type: 'WorksheetActivated', worksheetId: sheet })
  }

  #sheet(topic: string, type: string, sheet: string, more: Event = {}): void {
    this.#publish(topic, sheet, { type, worksheetId: sheet, ...this.#source(), ...more })
  }
}
