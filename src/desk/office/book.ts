/**
 * The workbook as the grid holds it: the only place of the stand-in that knows the grid's own services. It says what is in the cells
 * (full doubles, spilled cells included), changes them, and knows when the formulas have been worked out again.
 */
import {
  BooleanNumber,
  CellValueType,
  CommandType,
  Dimension,
  Tools,
  ICommandService,
  IUndoRedoService,
  IUniverInstanceService,
  UniverInstanceType,
  type IBorderData,
  type ICellData,
  type ICommandInfo,
  type IExecutionOptions,
  type IMutationInfo,
  type Injector,
  type IRange,
  type IStyleData,
  type IUndoRedoItem,
  type Nullable,
  type Workbook,
  type Worksheet,
} from '@univerjs/core'
import type { FUniver } from '@univerjs/core/facade'
import {
  FormulaDataModel,
  IActiveDirtyManagerService,
  IDefinedNamesService,
  RemoveDefinedNameMutation,
  SetFormulaCalculationNotificationMutation,
  SetFormulaCalculationStartMutation,
  SetDefinedNameMutation,
  type IDefinedNamesServiceParam,
  type ISetFormulaCalculationNotificationMutation,
} from '@univerjs/engine-formula'
import {
  ClearSelectionFormatCommand,
  SetBorderCommand,
  SetColDataMutation,
  SetColDataMutationFactory,
  SetRangeValuesMutation,
  SetRangeValuesUndoMutationFactory,
  SetRowDataMutation,
  SetRowDataMutationFactory,
  SetSelectionsOperation,
  SetStyleCommand,
  SetWorksheetColumnCountMutation,
  SetWorksheetRowCountMutation,
  SheetsSelectionsService,
  type ISetRangeValuesMutationParams,
} from '@univerjs/sheets'
import type { FWorkbook, FWorksheet } from '@univerjs/sheets/facade'
import { FormulaCalculationSessionService } from '@univerjs/sheets-formula'
import type { Grid } from '../grid'
import {
  COLUMNS,
  ROWS,
  blocksOf,
  height,
  intersect,
  isEntireColumn,
  isEntireRow,
  rectAt,
  width,
  type Rect,
} from './addresses'
import {
  barOf,
  chartsOf,
  levelOf,
  linkOf,
  pageOf,
  withBar,
  withDrawn,
  withLevel,
  withLink,
  type DataBar,
  type Line,
  type Link,
  type SheetChart,
  type SheetPage,
} from './custom-data'
import { OfficeError } from './error'

export type CellValue = string | number | boolean

/** One cell as it stands, spilled cells and merged areas accounted for. */
export interface StoredCell {
  readonly value: CellValue
  readonly kind: 'Empty' | 'String' | 'Double' | 'Boolean' | 'Error'
  readonly formula: string
  readonly pattern: string
}

/** What a sheet carries beside its cells and the grid has no place for. */
export interface SheetExtras {
  protected: boolean
}

/** A table as the grid's table plug-in describes it. */
interface GridTable {
  readonly id: string
  readonly name: string
  readonly subUnitId: string
  readonly range: IRange
}

/** How the user's machine writes numbers and dates. */
export interface Culture {
  readonly name: string
  readonly numberDecimalSeparator: string
  readonly numberGroupSeparator: string
  readonly dateSeparator: string
  readonly shortDatePattern: string
}

export const ENGLISH: Culture = {
  name: 'en-US',
  numberDecimalSeparator: '.',
  numberGroupSeparator: ',',
  dateSeparator: '/',
  shortDatePattern: 'm/d/yyyy',
}

export type NameRecord = Readonly<IDefinedNamesServiceParam>

/** The scope of names that belong to the whole workbook, in the grid's words. */
const WHOLE_WORKBOOK = 'AllDefaultWorkbook'

const ERROR_VALUE =
  /^#(N\/A|VALUE!|REF!|DIV\/0!|NUM!|NAME\?|NULL!|SPILL!|CALC!|BUSY!|CYCLE!|ERROR!|GETTING_DATA|CONNECT!|BLOCKED!|UNKNOWN!|FIELD!)$/

/**
 * The grid looks for formulas in every cell of the workbook at each change and each calculation, and asks of each whether it is text in a
 * slow way (by its class name, `Object.prototype.toString`). Asked plainly, one cell changed beside 400,000 others takes a third of the
 * time. The grid never makes String objects, the only values for which the answers differ.
 */
Tools.isString = (value): value is string => typeof value === 'string'

/** The grid begins to calculate 100 ms after a change, so one that has not begun by then has nothing to do. */
const START_WITHIN_MS = 250

const isEndOfCalculation = ({ id, params }: Readonly<ICommandInfo>): boolean =>
  id === SetFormulaCalculationNotificationMutation.id &&
  (params as ISetFormulaCalculationNotificationMutation).functionsExecutedState !== undefined

export const isErrorValue = (text: string): boolean => ERROR_VALUE.test(text)

/** Everything a cell holds beside its style, taken away. */
export const NO_CONTENT: ICellData = { v: null, t: null, f: null, si: null, p: null }

export class Book {
  /** Whether the add-in is to be told of what happens. */
  eventsEnabled = true
  /** Formulas are not worked out between the operations of the request under way. */
  calculationSuspended = false
  /** True while an operation of the add-in's own is being carried out. */
  applying = false
  /** The block an operation of the add-in's own fills, whatever it leaves as it was. */
  filling: Rect | null = null
  readonly api: FUniver
  readonly injector: Injector
  readonly commands: ICommandService
  readonly #extras = new WeakMap<Worksheet, SheetExtras>()
  readonly #dirtying: IActiveDirtyManagerService
  #dirty = false
  #calculating = false
  /** Changes of the request under way, to be one step of the user's undo; the newest is undone first. */
  #step: { readonly undo: IMutationInfo[]; readonly redo: IMutationInfo[] } = { undo: [], redo: [] }
  /** Batches under way that are to be one step each. */
  #groups = 0
  /** The step that lies on top of the grid's own before a command of the group's. */
  #topmost: Nullable<IUndoRedoItem> = null

  constructor(
    grid: Grid,
    readonly culture: Culture,
    /** The add-in's settings, JSON values, saved with the workbook. */
    readonly settings: Map<string, unknown>,
  ) {
    this.api = grid.api
    this.injector = grid.univer.__getInjector()
    this.commands = this.injector.get(ICommandService)
    this.#dirtying = this.injector.get(IActiveDirtyManagerService)
    this.commands.beforeCommandExecuted(({ id, type }) => {
      // the text in the formula bar is a document of the grid's own, brought along after every change
      if (type !== CommandType.COMMAND || id.startsWith('doc.')) return
      if (this.#isGrouping) this.#topmost = this.injector.get(IUndoRedoService).pitchTopUndoElement()
      else this.endUndoStep()
    })
    this.commands.onCommandExecuted((command, options) => {
      if (command.type === CommandType.COMMAND && this.#isGrouping) this.#adoptStep()
      if (this.#makesDirty(command, options)) this.#dirty = true
      else if (command.id === SetFormulaCalculationStartMutation.id) {
        this.#dirty = false
        this.#calculating = true
      } else if (isEndOfCalculation(command)) this.#calculating = false
    })
  }

  /** The grid recalculates after these, by the same rule: not after results of formulas, not after changes of style only. */
  #makesDirty({ id, params }: Readonly<ICommandInfo>, options?: IExecutionOptions): boolean {
    if (!this.#dirtying.get(id)) return false
    if (id !== SetRangeValuesMutation.id) return true
    const { trigger } = params as ISetRangeValuesMutationParams
    const ofStyle = [SetStyleCommand.id, SetBorderCommand.id, ClearSelectionFormatCommand.id].includes(
      trigger ?? '',
    )
    return !options?.onlyLocal && !ofStyle
  }

  /** Resolves when every formula has been worked out after the changes made so far, the user's included. */
  async calculated(): Promise<void> {
    if (this.#groups === 0) this.endUndoStep()
    const session = this.injector.get(FormulaCalculationSessionService)
    // A calculation under way when a change came does not count for that change: the next one has to begin first. One that has not
    // begun after so many waits is not going to (the grid found nothing to do).
    for (let waits = 0; this.#dirty && waits < 5; waits++)
      await session.waitForLatestApplied(undefined, START_WITHIN_MS)
    this.#dirty = false
    if (this.#calculating) await session.waitForLatestApplied(undefined, START_WITHIN_MS)
  }

  /** Works every formula out anew. */
  recalculate(): void {
    this.api.getFormula().executeCalculation()
    this.#dirty = true
  }

  /**
   * The grid's own model of the workbook, for everything that reads: facades are dear to make. Asked for anew each time, since the page
   * may have opened another file.
   */
  get model(): Workbook {
    const model = this.injector
      .get(IUniverInstanceService)
      .getCurrentUnitOfType<Workbook>(UniverInstanceType.UNIVER_SHEET)
    if (!model) throw new OfficeError('GeneralException', 'no workbook is open')
    return model
  }

  get workbook(): FWorkbook {
    const workbook = this.api.getActiveWorkbook()
    if (!workbook) throw new OfficeError('GeneralException', 'no workbook is open')
    return workbook
  }

  get id(): string {
    return this.model.getUnitId()
  }

  sheets(): Sheet[] {
    return this.model.getSheets().map((sheet) => new Sheet(this, sheet.getSheetId()))
  }

  /** By name, as the host compares names, or by id. */
  sheet(nameOrId: string): Sheet | null {
    const wanted = nameOrId.toLowerCase()
    return this.sheets().find((sheet) => sheet.id === nameOrId || sheet.name.toLowerCase() === wanted) ?? null
  }

  get activeSheet(): Sheet {
    return new Sheet(this, this.model.getActiveSheet().getSheetId())
  }

  /** Adds a sheet at the end, without showing it. */
  addSheet(name: string | undefined): Sheet {
    const active = this.workbook.getActiveSheet()
    let made = name
    for (let i = 1; made === undefined || (name === undefined && this.sheet(made)); i++) made = `Sheet${i}`
    this.checkSheetName(made)
    const sheet = this.workbook.create(made, 1000, 40)
    if (this.workbook.getActiveSheet().getSheetId() !== active.getSheetId())
      this.workbook.setActiveSheet(active)
    return new Sheet(this, sheet.getSheetId())
  }

  checkSheetName(name: string): void {
    if (!/^[^[\]:*?/\\]{1,31}$/.test(name) || /^'|'$/.test(name))
      throw new OfficeError('InvalidArgument', `"${name}" is no name for a sheet`)
    if (this.sheet(name)) throw new OfficeError('ItemAlreadyExists', `a sheet named "${name}" exists`)
  }

  /** Kept with the grid's own object, so that a sheet of the next file does not inherit it. */
  extras(sheet: Worksheet): SheetExtras {
    const known = this.#extras.get(sheet)
    if (known) return known
    const made: SheetExtras = { protected: false }
    this.#extras.set(sheet, made)
    return made
  }

  names(): NameRecord[] {
    return Object.values(this.injector.get(IDefinedNamesService).getDefinedNameMap(this.id) ?? {})
  }

  name(name: string): NameRecord | null {
    return this.names().find((known) => known.name.toLowerCase() === name.toLowerCase()) ?? null
  }

  /** The grid's own command refuses names that are also functions, which the host allows; so the change is made beneath it. */
  setName(record: NameRecord): void {
    const scope = record.localSheetId ?? WHOLE_WORKBOOK
    this.commands.syncExecuteCommand(SetDefinedNameMutation.id, {
      ...record,
      localSheetId: scope,
      unitId: this.id,
    })
  }

  removeName(record: NameRecord): void {
    this.commands.syncExecuteCommand(RemoveDefinedNameMutation.id, { ...record, unitId: this.id })
  }

  tables(): { id: string; name: string; sheet: Sheet; rect: Rect }[] {
    const { workbook } = this
    const list =
      'getTableList' in workbook ? (workbook as { getTableList(): GridTable[] }).getTableList() : []
    return list.map(({ id, name, subUnitId, range }) => {
      const sheet = new Sheet(this, subUnitId)
      return { id, name, sheet, rect: sheet.rectOf(range) }
    })
  }

  /** The selected areas of the active sheet, in the order they were selected. */
  selection(): Rect[] {
    const sheet = this.activeSheet
    const selections = this.injector.get(SheetsSelectionsService).getCurrentSelections()
    return selections.length ? selections.map(({ range }) => sheet.rectOf(range)) : [rectAt(0, 0, 1, 1)]
  }

  select(sheet: Sheet, rects: readonly Rect[]): void {
    if (this.activeSheet.id !== sheet.id) sheet.facade.activate()
    const selections = rects.map((rect) => {
      const { startRow, startColumn } = sheet.rangeOf(rect)
      const corner = { startRow, startColumn, endRow: startRow, endColumn: startColumn }
      const primary = {
        ...corner,
        actualRow: startRow,
        actualColumn: startColumn,
        isMerged: false,
        isMergedMainCell: false,
      }
      return { range: sheet.rangeOf(rect), primary, style: null }
    })
    this.commands.syncExecuteCommand(SetSelectionsOperation.id, {
      unitId: this.id,
      subUnitId: sheet.id,
      selections,
    })
  }

  /** Changes cells in one step of the grid, which a later undo takes back together with the rest of the request. */
  changeCells(sheet: Sheet, cellValue: Record<number, Record<number, ICellData>>, styleOnly: boolean): void {
    const trigger = styleOnly ? { trigger: SetStyleCommand.id } : {}
    const params: ISetRangeValuesMutationParams = {
      unitId: this.id,
      subUnitId: sheet.id,
      cellValue,
      ...trigger,
    }
    const before = styleOnly
      ? SetRangeValuesUndoMutationFactory(this.injector, params)
      : this.#before(sheet, params)
    this.commands.syncExecuteCommand(SetRangeValuesMutation.id, params)
    this.#step.redo.push({ id: SetRangeValuesMutation.id, params })
    this.#step.undo.unshift({ id: SetRangeValuesMutation.id, params: { ...before, ...trigger } })
  }

  /** Changes the custom data of rows or columns, in the same step of undo. */
  changeLines(sheet: Sheet, axis: 'row' | 'column', lines: Readonly<Record<number, Line>>): void {
    const model = this.model.getSheetBySheetId(sheet.id)
    const ids = { unitId: this.id, subUnitId: sheet.id }
    if (!model) return
    const [id, params, before] =
      axis === 'row'
        ? [
            SetRowDataMutation.id,
            { ...ids, rowData: lines },
            SetRowDataMutationFactory({ ...ids, rowData: lines }, model),
          ]
        : [
            SetColDataMutation.id,
            { ...ids, columnData: lines },
            SetColDataMutationFactory({ ...ids, columnData: lines }, model),
          ]
    this.commands.syncExecuteCommand(id, params)
    this.#step.redo.push({ id, params })
    this.#step.undo.unshift({ id, params: before })
  }

  /** What takes a change of cells back: the grid's own way copies every cell deeply, which is slow for a large block of new ones. */
  #before(sheet: Sheet, params: ISetRangeValuesMutationParams): ISetRangeValuesMutationParams {
    const matrix = this.model.getSheetBySheetId(sheet.id)?.getCellMatrix()
    const cellValue: Record<number, Record<number, ICellData>> = {}
    for (const [row, line] of Object.entries(params.cellValue ?? {})) {
      const old: Record<number, ICellData> = {}
      for (const [column, cell] of Object.entries(line as Record<number, ICellData>)) {
        if (cell.s) return SetRangeValuesUndoMutationFactory(this.injector, params)
        const { s: _, ...stood } = matrix?.getValue(Number(row), Number(column)) ?? {}
        old[Number(column)] = { ...NO_CONTENT, ...('custom' in cell && withLink(null)), ...stood }
      }
      cellValue[Number(row)] = old
    }
    return { ...params, cellValue }
  }

  get #isGrouping(): boolean {
    return this.#groups > 0 && this.applying
  }

  /** Makes one step of all that the add-in changes until the function returned is called; a user's command in between parts it. */
  groupUndo(): () => void {
    this.endUndoStep()
    // the grid knows steps of the workbook in focus only, and without a screen none is
    const units = this.injector.get(IUniverInstanceService)
    if (!units.getFocusedUnit()) units.focusUnit(this.id)
    this.#groups++
    return () => {
      this.#groups--
      this.endUndoStep()
    }
  }

  /**
   * Takes the step that a command of the grid's own has handed over during a group into the group's. The grid can gather steps by itself,
   * but then undoes them in the order they were done.
   */
  #adoptStep(): void {
    const steps = this.injector.get(IUndoRedoService)
    const step = steps.pitchTopUndoElement()
    if (!step || step === this.#topmost || step.unitID !== this.id) return
    // to the redone ones, which the group's own step clears when it comes
    steps.popUndoToRedo()
    this.#step.undo.unshift(...step.undoMutations)
    this.#step.redo.push(...step.redoMutations)
  }

  /** Hands the changes so far over as one step of undo; commands of the grid's own make steps of theirs, in between. */
  endUndoStep(): void {
    const { undo: undoMutations, redo: redoMutations } = this.#step
    if (!redoMutations.length) return
    this.#step = { undo: [], redo: [] }
    this.injector.get(IUndoRedoService).pushUndoRedo({ unitID: this.id, undoMutations, redoMutations })
  }
}

/** One sheet, named by its id, so that it stays the same when it is renamed or moved. */
export class Sheet {
  constructor(
    readonly book: Book,
    readonly id: string,
  ) {}

  get exists(): boolean {
    return Boolean(this.book.model.getSheetBySheetId(this.id))
  }

  get facade(): FWorksheet {
    const sheet = this.book.workbook.getSheetBySheetId(this.id)
    if (!sheet) throw new OfficeError('ItemNotFound', 'the sheet was deleted')
    return sheet
  }

  get name(): string {
    return this.#grid.getName()
  }

  get extras(): SheetExtras {
    return this.book.extras(this.#grid)
  }

  get #grid(): Worksheet {
    const sheet = this.book.model.getSheetBySheetId(this.id)
    if (!sheet) throw new OfficeError('ItemNotFound', 'the sheet was deleted')
    return sheet
  }

  /** Called by everything that changes the sheet. @throws OfficeError AccessDenied on a protected sheet */
  guard(): void {
    if (this.extras.protected) throw new OfficeError('AccessDenied', `the sheet "${this.name}" is protected`)
  }

  /** The grid's range of a block: cut to what the grid has stored. */
  rangeOf(rect: Rect): IRange {
    const { startRow, endRow, startColumn, endColumn } = {
      startRow: rect.top,
      startColumn: rect.left,
      endRow: isEntireColumn(rect) ? this.#grid.getRowCount() - 1 : rect.bottom,
      endColumn: isEntireRow(rect) ? this.#grid.getColumnCount() - 1 : rect.right,
    }
    return { startRow, startColumn, endRow, endColumn }
  }

  /** The block of a grid's range. A range from edge to edge of the grid's sheet means whole rows or columns. */
  rectOf(range: Readonly<IRange>): Rect {
    const known = (value: number, otherwise: number) => (Number.isFinite(value) ? value : otherwise)
    const [rows, columns] = [this.#grid.getRowCount(), this.#grid.getColumnCount()]
    const top = known(range.startRow, 0)
    const left = known(range.startColumn, 0)
    const bottom = known(range.endRow, rows - 1)
    const right = known(range.endColumn, columns - 1)
    return {
      top,
      left,
      bottom: top === 0 && bottom >= rows - 1 ? ROWS - 1 : bottom,
      right: left === 0 && right >= columns - 1 ? COLUMNS - 1 : right,
    }
  }

  /** Makes the grid's sheet large enough to hold the block. */
  hold(rect: Rect): void {
    const ids = { unitId: this.book.id, subUnitId: this.id }
    const { endRow, endColumn } = this.rangeOf(rect)
    if (endRow >= this.#grid.getRowCount())
      this.book.commands.syncExecuteCommand(SetWorksheetRowCountMutation.id, {
        ...ids,
        rowCount: endRow + 200,
      })
    if (endColumn >= this.#grid.getColumnCount())
      this.book.commands.syncExecuteCommand(SetWorksheetColumnCountMutation.id, {
        ...ids,
        columnCount: endColumn + 20,
      })
  }

  /** Reads a block, cell by cell, through one pass over the grid's own storage. */
  map<R>(rect: Rect, of: (cell: StoredCell) => R): R[][] {
    const grid = this.#grid
    const matrix = grid.getCellMatrix()
    const formulas = this.book.injector.get(FormulaDataModel)
    const spilled = formulas.getArrayFormulaCellData()[this.book.id]?.[this.id]
    const covered = this.#coveredCells(rect)
    const ofColumns = new Map<number, string | undefined>()
    const ofStyles = new Map<unknown, string | undefined>()
    const once = <K>(known: Map<K, string | undefined>, key: K, find: () => string | undefined) => {
      if (!known.has(key)) known.set(key, find())
      return known.get(key)
    }
    const out: R[][] = []
    for (let row = rect.top; row <= rect.bottom; row++) {
      const line: R[] = []
      const ofRow = grid.getRowStyle(row)?.n?.pattern
      for (let column = rect.left; column <= rect.right; column++) {
        const cell = matrix.getValue(row, column)
        const spill = spilled?.[row]?.[column]
        const pattern =
          (cell?.s ? once(ofStyles, cell.s, () => grid.getCellStyle(row, column)?.n?.pattern) : undefined) ??
          ofRow ??
          once(ofColumns, column, () => grid.getColumnStyle(column)?.n?.pattern) ??
          'General'
        const blank = (!cell && !spill) || covered?.has(row * COLUMNS + column)
        line.push(
          of(
            blank
              ? { value: '', kind: 'Empty', formula: '', pattern }
              : this.#stored(cell, spill, row, column, pattern),
          ),
        )
      }
      out.push(line)
    }
    return out
  }

  #stored(
    cell: Nullable<ICellData>,
    spill: Nullable<ICellData>,
    row: number,
    column: number,
    pattern: string,
  ): StoredCell {
    const formula =
      cell?.f ??
      (cell?.si
        ? this.book.injector.get(FormulaDataModel).getFormulaStringByCell(row, column, this.id, this.book.id)
        : '')
    const rich = cell?.p?.body?.dataStream.replace(/\r\n$/, '')
    const from = cell?.v === undefined || cell.v === null ? spill : cell
    const stored = rich ?? from?.v ?? ''
    const base = { formula: formula ?? '', pattern }
    if (from?.t === CellValueType.BOOLEAN) return { ...base, value: Boolean(stored), kind: 'Boolean' }
    if (typeof stored === 'boolean') return { ...base, value: stored, kind: 'Boolean' }
    if (typeof stored === 'number') return { ...base, value: stored, kind: 'Double' }
    if (isErrorValue(stored) && from?.t !== CellValueType.FORCE_STRING)
      return { ...base, value: stored, kind: 'Error' }
    return { ...base, value: stored, kind: stored === '' && !formula ? 'Empty' : 'String' }
  }

  /** Cells of merged areas that their top-left cell covers. */
  #coveredCells(rect: Rect): Set<number> | null {
    const merges = this.merges(rect)
    if (!merges.length) return null
    const covered = new Set<number>()
    for (const merge of merges)
      for (let row = merge.top; row <= merge.bottom; row++)
        for (let column = merge.left; column <= merge.right; column++)
          if (row !== merge.top || column !== merge.left) covered.add(row * COLUMNS + column)
    return covered
  }

  merges(within: Rect): Rect[] {
    return this.#grid
      .getMergeData()
      .map((range) => ({
        top: range.startRow,
        left: range.startColumn,
        bottom: range.endRow,
        right: range.endColumn,
      }))
      .filter((merge) => intersect(merge, within))
  }

  /** Writes what `cellAt` gives, by place in the block; undefined leaves a cell as it is. Covered cells of merged areas take nothing. */
  write(rect: Rect, cellAt: (row: number, column: number) => ICellData | undefined): void {
    this.guard()
    this.hold(rect)
    const covered = this.#coveredCells(rect)
    this.book.filling = rect
    try {
      this.#change(
        rect,
        (row, column) => {
          if (covered?.has((rect.top + row) * COLUMNS + rect.left + column)) return undefined
          return cellAt(row, column)
        },
        false,
      )
    } finally {
      this.book.filling = null
    }
  }

  /** Lays a style over every cell of a block; null takes all style away. */
  restyle(rect: Rect, styleAt: (row: number, column: number) => IStyleData | null | undefined): void {
    this.guard()
    this.hold(rect)
    this.#change(
      rect,
      (row, column) => {
        const s = styleAt(row, column)
        return s === undefined ? undefined : { s }
      },
      true,
    )
  }

  #change(
    rect: Rect,
    cellAt: (row: number, column: number) => ICellData | undefined,
    styleOnly: boolean,
  ): void {
    const { startRow, endRow, startColumn, endColumn } = this.rangeOf(rect)
    const cells: Record<number, Record<number, ICellData>> = {}
    let any = false
    for (let row = startRow; row <= endRow; row++) {
      const line: Record<number, ICellData> = {}
      for (let column = startColumn; column <= endColumn; column++) {
        const cell = cellAt(row - startRow, column - startColumn)
        if (!cell) continue
        line[column] = cell
        any = true
      }
      cells[row] = line
    }
    if (any) this.book.changeCells(this, cells, styleOnly)
  }

  style(row: number, column: number): IStyleData {
    if (row >= this.#grid.getRowCount() || column >= this.#grid.getColumnCount()) return {}
    return this.#grid.getComposedCellStyle(row, column)
  }

  border(row: number, column: number): IBorderData {
    return this.style(row, column).bd ?? {}
  }

  /** The smallest block that holds every used cell, within `within`; null when there is none. */
  used(valuesOnly: boolean, within: Rect): Rect | null {
    let found: Rect | null = null
    const meet = (row: number, column: number) => {
      if (row < within.top || row > within.bottom || column < within.left || column > within.right) return
      found = found
        ? {
            top: Math.min(found.top, row),
            left: Math.min(found.left, column),
            bottom: Math.max(found.bottom, row),
            right: Math.max(found.right, column),
          }
        : { top: row, left: column, bottom: row, right: column }
    }
    this.#grid.getCellMatrix().forValue((row, column, cell) => {
      if (cell && (hasContent(cell) || (!valuesOnly && cell.s))) meet(row, column)
    })
    const spilled =
      this.book.injector.get(FormulaDataModel).getArrayFormulaCellData()[this.book.id]?.[this.id] ?? {}
    for (const [row, line] of Object.entries(spilled))
      for (const column of Object.keys(line ?? {})) meet(Number(row), Number(column))
    return found
  }

  /** The block a spilling formula fills, for its anchor or any cell of it. */
  spillAt(row: number, column: number): { anchor: Rect; area: Rect } | null {
    const areas =
      this.book.injector.get(FormulaDataModel).getArrayFormulaRange()[this.book.id]?.[this.id] ?? {}
    for (const [top, line] of Object.entries(areas))
      for (const [left, range] of Object.entries(line ?? {})) {
        if (!range) continue
        const { startRow, startColumn, endRow, endColumn } = range as IRange
        if (row < startRow || row > endRow || column < startColumn || column > endColumn) continue
        // An area of one cell is an array formula that spills nowhere; one that is blocked keeps its area in the grid.
        if (startRow === endRow && startColumn === endColumn) continue
        if (this.#cell(Number(top), Number(left))?.v === '#SPILL!') continue
        return {
          anchor: rectAt(Number(top), Number(left), 1, 1),
          area: { top: startRow, left: startColumn, bottom: endRow, right: endColumn },
        }
      }
    return null
  }

  link(row: number, column: number): Link | null {
    return linkOf(this.#grid.getCellMatrix().getValue(row, column))
  }

  /** Lays one link over every cell of a block, or takes the links of all away. */
  setLink(rect: Rect, link: Link | null): void {
    this.guard()
    this.hold(rect)
    this.#change(
      rect,
      (row, column) => {
        const cell = this.#cell(rect.top + row, rect.left + column)
        return link || linkOf(cell) ? withLink(link, cell) : undefined
      },
      false,
    )
  }

  #cell(row: number, column: number): Nullable<ICellData> {
    return this.#grid.getCellMatrix().getValue(row, column)
  }

  /** The data bars in a block, each once. */
  bars(within: Rect): DataBar[] {
    const found = new Map<string, DataBar>()
    const { startRow, endRow, startColumn, endColumn } = this.rangeOf(within)
    for (let row = startRow; row <= endRow; row++)
      for (let column = startColumn; column <= endColumn; column++) {
        const bar = barOf(this.#cell(row, column))
        if (bar) found.set(bar.id, bar)
      }
    return [...found.values()]
  }

  /** The cells a data bar lies behind, and what it is; null when there is none of that id. */
  bar(id: string): { readonly bar: DataBar; readonly rects: Rect[] } | null {
    let bar: DataBar | null = null
    const cells = new Map<number, number[]>()
    this.#grid.getCellMatrix().forValue((row, column, cell) => {
      const found = barOf(cell)
      if (found?.id !== id) return
      bar = found
      cells.set(row, [...(cells.get(row) ?? []), column])
    })
    const rows = [...cells].sort(([a], [b]) => a - b)
    return bar && { bar, rects: blocksOf(rows) }
  }

  /** Lays a data bar behind a block, or takes those behind it away. */
  setBar(rect: Rect, bar: DataBar | null): void {
    this.guard()
    this.hold(rect)
    this.#change(
      rect,
      (row, column) => {
        const cell = this.#cell(rect.top + row, rect.left + column)
        return bar || barOf(cell) ? withBar(bar, cell) : undefined
      },
      false,
    )
  }

  get charts(): readonly SheetChart[] {
    return chartsOf(this.#grid.getConfig())
  }

  set charts(charts: readonly SheetChart[]) {
    this.guard()
    this.keep({ charts })
  }

  get page(): SheetPage {
    return pageOf(this.#grid.getConfig())
  }

  set page(page: SheetPage) {
    this.guard()
    this.keep({ page })
  }

  /** Keeps charts or the page with the sheet, protected or not. The grid knows neither, so its undo passes them by. */
  keep(drawn: { readonly charts?: readonly SheetChart[]; readonly page?: SheetPage }): void {
    const config = this.#grid.getConfig()
    config.custom = withDrawn(drawn, config).custom
  }

  /** How deep a row or column is folded, 0 outermost. */
  level(axis: 'row' | 'column', line: number): number {
    const { rowData, columnData } = this.#grid.getConfig()
    return levelOf((axis === 'row' ? rowData : columnData)[line])
  }

  setLevels(axis: 'row' | 'column', levels: ReadonlyMap<number, number>): void {
    const lines = [...levels].map(([line, level]) => [line, withLevel(level)] as const)
    this.book.changeLines(this, axis, Object.fromEntries(lines))
  }

  isHidden(axis: 'row' | 'column', line: number): boolean {
    return axis === 'row' ? !this.#grid.getRowVisible(line) : !this.#grid.getColVisible(line)
  }

  hide(axis: 'row' | 'column', rect: Rect, hidden: boolean): void {
    this.guard()
    const { startRow, endRow, startColumn, endColumn } = this.rangeOf(rect)
    const { facade } = this
    if (axis === 'row') {
      if (hidden) facade.hideRows(startRow, endRow - startRow + 1)
      else facade.showRows(startRow, endRow - startRow + 1)
    } else if (hidden) facade.hideColumns(startColumn, endColumn - startColumn + 1)
    else facade.showColumns(startColumn, endColumn - startColumn + 1)
  }

  /** Makes room at a block by pushing what is there down or right. */
  insert(rect: Rect, shift: 'Down' | 'Right'): void {
    this.guard()
    this.hold(rect)
    const { facade } = this
    if (isEntireRow(rect)) facade.insertRowsBefore(rect.top, height(rect))
    else if (isEntireColumn(rect)) facade.insertColumnsBefore(rect.left, width(rect))
    else
      facade.getRange(this.rangeOf(rect)).insertCells(shift === 'Down' ? Dimension.ROWS : Dimension.COLUMNS)
  }

  /** Takes a block out and closes the gap. */
  remove(rect: Rect, shift: 'Up' | 'Left'): void {
    this.guard()
    const { facade } = this
    if (isEntireRow(rect)) facade.deleteRows(rect.top, height(rect))
    else if (isEntireColumn(rect)) facade.deleteColumns(rect.left, width(rect))
    else facade.getRange(this.rangeOf(rect)).deleteCells(shift === 'Up' ? Dimension.ROWS : Dimension.COLUMNS)
  }

  /** Hidden so that the user cannot show it again. The grid knows no such state; it is kept in the sheet's own data, for the file. */
  get isVeryHidden(): boolean {
    return this.#grid.getConfig().custom?.['visibility'] === 'veryHidden'
  }

  set isVeryHidden(on: boolean) {
    const config = this.#grid.getConfig()
    const { visibility: _, ...custom } = config.custom ?? {}
    config.custom = on ? { ...custom, visibility: 'veryHidden' } : custom
  }

  get isShown(): boolean {
    return this.#grid.isSheetHidden() !== BooleanNumber.TRUE
  }
}

export const hasContent = (cell: ICellData): boolean =>
  (cell.v !== undefined && cell.v !== null && cell.v !== '') || Boolean(cell.f ?? cell.si ?? cell.p)
