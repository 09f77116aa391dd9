/**
 * Worksheet functions of an add-in, evaluated by the grid's own formula engine with the semantics the host documents: what an
 * argument looks like when it arrives, what a return value becomes in the cell, and what the user reads when it fails.
 *
 * The engine's own registration of functions is not used: a throw inside one ends the process, an omitted argument arrives as 0, one
 * cell as a matrix, an error as text, and a promise holds the whole calculation up. Here every function is an executor of its own that
 * never throws into the engine.
 */
import { BooleanNumber, ICommandService, numberToABC } from '@univerjs/core'
import {
  ArrayValueObject,
  BaseFunction,
  BooleanValueObject,
  ERROR_TYPE_SET,
  ErrorValueObject,
  FunctionType,
  IFunctionService,
  NumberValueObject,
  SetFormulaCalculationResultMutation,
  SetTriggerFormulaCalculationStartMutation,
  StringValueObject,
  quoteSheetName,
  type BaseValueObject,
  type ErrorType,
} from '@univerjs/engine-formula'
import type { Grid } from './grid'

/** The part of the functions' metadata file that decides how a call is made. */
export interface FunctionsMetadata {
  readonly functions: readonly FunctionMetadata[]
}

export interface FunctionMetadata {
  readonly id: string
  readonly name: string
  readonly description?: string
  readonly parameters: readonly ParameterMetadata[]
  readonly options?: {
    readonly requiresAddress?: boolean
    readonly stream?: boolean
    readonly cancelable?: boolean
  }
}

export interface ParameterMetadata {
  readonly name: string
  readonly description?: string
  readonly type?: string
  readonly dimensionality?: string
  readonly optional?: boolean
  readonly repeating?: boolean
}

/** The global `CustomFunctions` of the host, and what the desk itself asks. */
export interface CustomFunctionsStandIn {
  associate(id: string, implementation: Implementation): void
  associate(implementations: Record<string, Implementation>): void
  readonly Error: typeof CustomFunctionError
  readonly ErrorCode: typeof ErrorCode
  /** Makes the described functions known to the grid under `NAMESPACE.NAME`; until their code is associated, cells show #BUSY!. */
  register(metadata: FunctionsMetadata, namespace: string): void
  /** The sentence behind an error value in a cell, when the function that failed gave one. */
  messageAt(unitId: string, sheetId: string, row: number, column: number): string | undefined
  dispose(): void
}

export type Implementation = (...args: never[]) => unknown

export const ErrorCode = {
  invalidValue: '#VALUE!',
  notAvailable: '#N/A',
  divisionByZero: '#DIV/0!',
  invalidNumber: '#NUM!',
  nullReference: '#NULL!',
  invalidName: '#NAME?',
  invalidReference: '#REF!',
} as const

export type ErrorCodeValue = (typeof ErrorCode)[keyof typeof ErrorCode]

export class CustomFunctionError extends Error {
  constructor(
    readonly code: ErrorCodeValue,
    message?: string,
  ) {
    super(message ?? '')
  }
}

type Scalar = number | string | boolean
type Argument = Scalar | Scalar[][] | null

const INVALID = ErrorCode.invalidValue
const BUSY = '#BUSY!'
// Only these two reach the user with a sentence; a bad name or reference may come in but never goes out.
const WITH_MESSAGE: ReadonlySet<string> = new Set([ErrorCode.invalidValue, ErrorCode.notAvailable])
const OUTGOING: ReadonlySet<string> = new Set(
  Object.values(ErrorCode).filter(
    (code) => code !== ErrorCode.invalidName && code !== ErrorCode.invalidReference,
  ),
)
// The engine does not know this error; without it a cell that waits would be read as text by the cells below it.
ERROR_TYPE_SET.add(BUSY as ErrorType)

export function createCustomFunctions(grid: Grid): CustomFunctionsStandIn {
  const injector = grid.univer.__getInjector()
  const functions = injector.get(IFunctionService)
  const commands = injector.get(ICommandService)
  const implementations = new Map<string, Implementation>()
  const executors = new Map<string, OfficeFunction>()
  const messages = new Messages()

  const recalculate = (cells?: readonly Cell[]): void => {
    if (grid.api.getActiveWorkbook() === null) return
    void commands.executeCommand(
      SetTriggerFormulaCalculationStartMutation.id,
      {
        commands: [],
        dirtyRanges: (cells ?? []).map(({ unitId, sheetId, row, column }) => ({
          unitId,
          sheetId,
          range: { startRow: row, endRow: row, startColumn: column, endColumn: column },
        })),
        dirtyNameMap: {},
        dirtyDefinedNameMap: {},
        dirtyUnitFeatureMap: {},
        dirtyUnitOtherFormulaMap: {},
        clearDependencyTreeCache: {},
        forceCalculation: cells === undefined,
      },
      { onlyLocal: true },
    )
  }

  const roundEnds = commands.onCommandExecuted((command) => {
    if (command.id !== SetFormulaCalculationResultMutation.id) return
    for (const executor of executors.values()) executor.endRound()
    messages.endRound()
  })

  const associateOne = (id: string, implementation: Implementation): void => {
    const known = implementations.has(id)
    implementations.set(id, implementation)
    // Code that replaces code (a reloaded pane) changes no value, so nothing is recalculated for it.
    const waiting = known ? [] : (executors.get(id)?.takeWaiting() ?? [])
    if (waiting.length > 0) recalculate(waiting)
  }

  const register = (metadata: FunctionsMetadata, namespace: string): void => {
    for (const description of metadata.functions) {
      const name = `${namespace}.${description.name}`.toUpperCase()
      refuseUnsupported(name, description)
      const executor = new OfficeFunction(name, description, {
        implementation: () => implementations.get(description.id),
        addressOf: (cell) => addressOf(grid, cell),
        recalculate,
        messages,
      })
      executors.set(description.id, executor)
      functions.registerExecutors(executor)
      describe(name, description)
    }
    // The engine keeps parsed formulas, with unknown functions parsed as errors, under the text as typed (any case): forget every call.
    functions.deleteFormulaAstCacheKey('(')
    recalculate()
  }

  const describe = (name: string, { description = '', parameters }: FunctionMetadata): void => {
    const entry = {
      functionName: name,
      functionType: FunctionType.User,
      description,
      abstract: description,
      functionParameter: parameters.map((parameter) => ({
        name: parameter.name,
        detail: parameter.description ?? '',
        example: '',
        require: parameter.optional ? BooleanNumber.FALSE : BooleanNumber.TRUE,
        repeat: BooleanNumber.FALSE,
      })),
    }
    functions.registerDescriptions(entry)
  }

  return {
    associate(ids: string | Record<string, Implementation>, implementation?: Implementation) {
      if (typeof ids !== 'string') for (const [id, body] of Object.entries(ids)) associateOne(id, body)
      else if (typeof implementation === 'function') associateOne(ids, implementation)
      else
        throw new TypeError(
          `CustomFunctions.associate("${ids}"): expected a function, got ${typeof implementation}`,
        )
    },
    Error: CustomFunctionError,
    ErrorCode,
    register,
    messageAt(unitId, sheetId, row, column) {
      const sheet = grid.api.getWorkbook(unitId)?.getSheetBySheetId(sheetId)
      return messages.get({ unitId, sheetId, row, column }, sheet?.getRange(row, column).getFormula() ?? '')
    },
    dispose() {
      roundEnds.dispose()
      functions.unregisterExecutors(...[...executors.values()].map((executor) => executor.name))
    },
  }
}

interface Cell {
  readonly unitId: string
  readonly sheetId: string
  readonly row: number
  readonly column: number
}

/** The sentences of failed calls, by calling cell and function: one cell may call several. They are those of its latest calculation. */
class Messages {
  private readonly byCell = new Map<string, { round: number; readonly sentences: Map<string, string> }>()
  private round = 0

  endRound(): void {
    this.round++
  }

  set(cell: Cell, functionName: string, message: string | undefined): void {
    const key = keyOf(cell)
    const ofCell = this.byCell.get(key) ?? { round: this.round, sentences: new Map<string, string>() }
    if (ofCell.round !== this.round) ofCell.sentences.clear()
    ofCell.round = this.round
    if (message) ofCell.sentences.set(functionName, message)
    else ofCell.sentences.delete(functionName)
    if (ofCell.sentences.size > 0) this.byCell.set(key, ofCell)
    else this.byCell.delete(key)
  }

  /** A formula typed over another may call none of our functions, and so leaves what that one said behind. */
  get(cell: Cell, formula: string): string | undefined {
    const called = formula.toUpperCase()
    const told = [...(this.byCell.get(keyOf(cell))?.sentences ?? [])].filter(([name]) =>
      called.includes(name),
    )
    return told.length > 0 ? told.map(([, sentence]) => sentence).join(' ') : undefined
  }
}

interface Call {
  readonly args: readonly Argument[]
  outcome?: { readonly value: unknown } | { readonly fault: unknown }
  /** In this round of calculation. */
  asked: boolean
  delivered: boolean
}

interface Surroundings {
  implementation(): Implementation | undefined
  addressOf(cell: Cell): string
  recalculate(cells: readonly Cell[]): void
  readonly messages: Messages
}

/** Arrays made from one range in one calculation are one object to the engine, so each block is converted once however many cells use it. */
const matrices = new WeakMap<BaseValueObject, Scalar[][]>()

class OfficeFunction extends BaseFunction {
  private readonly promised = new Map<string, Call[]>()
  private waiting = new Map<string, Cell>()

  constructor(
    name: string,
    private readonly description: FunctionMetadata,
    private readonly around: Surroundings,
  ) {
    super(name)
  }

  /** Never throws: the engine has no net under its executors. */
  override calculate(...values: BaseValueObject[]): BaseValueObject {
    const cell: Cell = {
      unitId: this.unitId ?? '',
      sheetId: this.subUnitId ?? '',
      row: this.row,
      column: this.column,
    }
    try {
      const result = this.call(cell, values)
      this.around.messages.set(cell, String(this.name), undefined)
      return result
    } catch (fault) {
      const { code, message } = faultOf(fault)
      this.around.messages.set(cell, String(this.name), WITH_MESSAGE.has(code) ? message : undefined)
      return errorValue(code)
    }
  }

  /** The cells that asked before there was an answer. */
  takeWaiting(): Cell[] {
    const cells = [...this.waiting.values()]
    this.waiting = new Map()
    return cells
  }

  /**
   * A round of calculation is over: forgets the answers it delivered and, in cells it went through, the questions no longer asked, so
   * that a late answer to one of those wakes nobody.
   */
  endRound(): void {
    for (const [key, calls] of this.promised) {
      if (!calls.some((call) => call.asked)) continue
      const open = calls.filter((call) => call.asked && !call.delivered)
      for (const call of open) call.asked = false
      if (open.length > 0) this.promised.set(key, open)
      else this.promised.delete(key)
    }
  }

  private call(cell: Cell, values: readonly BaseValueObject[]): BaseValueObject {
    const { parameters, options } = this.description
    // The host refuses such a formula when it is entered; here the cell has to say why it fails.
    if (values.length > parameters.length)
      throw new CustomFunctionError(
        INVALID,
        `found ${values.length} arguments; at most ${parameters.length} are taken.`,
      )
    const args = parameters.map((parameter, i) => incoming(values[i], parameter))
    const missing = parameters.find((parameter, i) => !parameter.optional && args[i] === null)
    if (missing)
      throw new CustomFunctionError(INVALID, `${missing.name}: found nothing; this argument is needed.`)

    const implementation = this.around.implementation()
    if (!implementation) {
      this.waiting.set(keyOf(cell), cell)
      return errorValue(BUSY)
    }
    const key = keyOf(cell)
    const earlier = this.promised.get(key)?.find((call) => same(call.args, args))
    if (earlier) return this.deliver(earlier)

    const address = options?.requiresAddress ? this.around.addressOf(cell) : undefined
    const invocation = { functionName: this.description.name, address }
    const result = (implementation as (...args: unknown[]) => unknown)(...args, invocation)
    if (!isPromise(result)) return outgoing(result)

    const call: Call = { args, asked: true, delivered: false }
    this.promised.set(key, [...(this.promised.get(key) ?? []), call])
    const settle = (outcome: NonNullable<Call['outcome']>): void => {
      call.outcome = outcome
      if (this.promised.get(key)?.includes(call)) this.around.recalculate([cell])
    }
    result.then(
      (value) => settle({ value }),
      (fault: unknown) => settle({ fault }),
    )
    return errorValue(BUSY)
  }

  /** The answer stays until the round of calculation ends: the engine may ask for one cell twice in it. */
  private deliver(call: Call): BaseValueObject {
    call.asked = true
    if (!call.outcome) return errorValue(BUSY)
    call.delivered = true
    if ('fault' in call.outcome) throw call.outcome.fault
    return outgoing(call.outcome.value)
  }
}

function refuseUnsupported(name: string, { parameters, options }: FunctionMetadata): void {
  const found = [
    options?.stream && 'streaming',
    options?.cancelable && 'cancelling',
    parameters.some((parameter) => parameter.repeating) && 'repeating parameters',
  ].filter(Boolean)
  if (found.length > 0)
    throw new Error(`${name}: the desk does not support ${found.join(', ')} in worksheet functions`)
}

/** An argument as the host hands it over; an error among the inputs ends the call with that error. */
function incoming(
  value: BaseValueObject | undefined,
  { type = 'any', dimensionality }: ParameterMetadata,
): Argument {
  if (value === undefined) return null
  if (value.isError()) throw new InputError(value)
  if (value.isArray()) {
    const matrix = matrixOf(value)
    if (dimensionality !== 'matrix') {
      const [[first] = []] = matrix
      if (matrix.length !== 1 || matrix[0]?.length !== 1 || first === undefined)
        throw new CustomFunctionError(INVALID)
      return typed(first, type)
    }
    return type === 'any' ? matrix : matrix.map((row) => row.map((cell) => typed(cell, type)))
  }
  if (value.isNull()) return null
  const scalar = typed(value.getValue(), type)
  return dimensionality === 'matrix' ? [[scalar]] : scalar
}

function matrixOf(value: BaseValueObject): Scalar[][] {
  const known = matrices.get(value)
  if (known) return known
  const matrix = value
    .getArrayValue()
    .map((row) => row.map((cell) => (cell && !cell.isNull() ? cellValue(cell) : 0)))
  // Shared by all calls of this calculation, so a function that writes into its argument fails instead of spoiling the others'.
  for (const row of matrix) Object.freeze(row)
  Object.freeze(matrix)
  matrices.set(value, matrix)
  return matrix
}

function cellValue(cell: BaseValueObject): Scalar {
  if (cell.isError()) throw new InputError(cell)
  return cell.getValue()
}

/** A value as a parameter of a declared type receives it, or the error of one that cannot be read so. */
function typed(value: Scalar, type: string): Scalar {
  if (type === 'number') {
    const number = typeof value === 'string' && value.trim() === '' ? NaN : Number(value)
    if (Number.isNaN(number)) throw new CustomFunctionError(INVALID)
    return number
  }
  if (type === 'string') return typeof value === 'boolean' ? String(value).toUpperCase() : String(value)
  if (type === 'boolean') {
    if (typeof value === 'string' && !/^(true|false)$/i.test(value)) throw new CustomFunctionError(INVALID)
    return typeof value === 'string' ? /^true$/i.test(value) : Boolean(value)
  }
  return value
}

function outgoing(result: unknown): BaseValueObject {
  if (!Array.isArray(result)) return outgoingScalar(result)
  const rows: unknown[] = result
  const columnCount = Array.isArray(rows[0]) ? rows[0].length : 0
  if (columnCount === 0 || !rows.every((row) => Array.isArray(row) && row.length === columnCount))
    return errorValue(INVALID)
  const cells = (rows as unknown[][]).map((row) => row.map(outgoingScalar))
  const [[only] = []] = cells
  if (cells.length === 1 && columnCount === 1 && only) return only
  return ArrayValueObject.create({
    calculateValueList: cells,
    rowCount: cells.length,
    columnCount,
    unitId: '',
    sheetId: '',
    row: -1,
    column: -1,
  })
}

function outgoingScalar(value: unknown): BaseValueObject {
  if (value === null || value === undefined) return NumberValueObject.create(0)
  if (typeof value === 'number')
    return Number.isFinite(value) ? NumberValueObject.create(value) : errorValue(ErrorCode.invalidNumber)
  if (typeof value === 'boolean') return BooleanValueObject.create(value)
  if (typeof value === 'string') return StringValueObject.create(value)
  return errorValue(value instanceof CustomFunctionError ? faultOf(value).code : INVALID)
}

/** A failure that is not a CustomFunctions.Error reaches the user as a bare #VALUE!, in the host as here. */
function faultOf(fault: unknown): { code: string; message?: string } {
  if (fault instanceof InputError) return { code: fault.code }
  if (fault instanceof CustomFunctionError && OUTGOING.has(fault.code))
    return { code: fault.code, message: fault.message }
  return { code: INVALID }
}

/** An error cell among the inputs, of any kind the engine knows: the function is not called and its cell shows the same error. */
class InputError extends Error {
  readonly code: string
  constructor(value: BaseValueObject) {
    super()
    this.code = String(value.getValue())
  }
}

const errorValue = (code: string): ErrorValueObject => ErrorValueObject.create(code as ErrorType)

const keyOf = ({ unitId, sheetId, row, column }: Cell): string => `${unitId}\n${sheetId}\n${row}\n${column}`

const isPromise = (value: unknown): value is PromiseLike<unknown> =>
  typeof value === 'object' && value !== null && typeof (value as { then?: unknown }).then === 'function'

function same(a: unknown, b: unknown): boolean {
  if (Array.isArray(a) && Array.isArray(b))
    return a.length === b.length && a.every((item, i) => same(item, b[i]))
  return Object.is(a, b)
}

function addressOf(grid: Grid, { unitId, sheetId, row, column }: Cell): string {
  const sheet = grid.api.getWorkbook(unitId)?.getSheetBySheetId(sheetId)
  return `${quoteSheetName(sheet?.getSheetName() ?? '')}!${numberToABC(column)}${row + 1}`
}
