import { Fault } from '../core'

/** A batch under way: what is queued on the context goes to the host at the next `sync`. */
export interface Request {
  readonly context: Excel.RequestContext
  sync(): Promise<void>
}

interface RunOptions {
  /** a context to go on with: a handler can be removed only in the one that added it */
  readonly context?: OfficeExtension.ClientRequestContext
  /** whether one undo of the user's takes back all of it, where the host can do that */
  readonly oneUndo?: boolean
}

/** The one road to the host. */
export interface Requests {
  /**
   * @param place what the batch is about, as a fault should name it
   * @throws Fault and nothing else
   */
  run<T>(place: string, batch: (request: Request) => Promise<T>, options?: RunOptions): Promise<T>
  /** Tells when an answer keeps us waiting and when it has come. */
  onWaiting(listener: (waiting: boolean) => void): () => void
}

/** An answer that takes longer than this most likely waits for the user to leave a cell. */
const PATIENCE_MS = 400

/** Bytes sent or asked for in one request; the host's limit on the web is 5 MB, and our sizes are estimates. */
export const REQUEST_BYTES = 2_000_000

export function openRequests(): Requests {
  const listeners = new Set<(waiting: boolean) => void>()
  let held = 0
  const tell = (step: 1 | -1) => {
    const before = held > 0
    held += step
    if (held > 0 !== before) for (const listener of [...listeners]) listener(held > 0)
  }

  async function patiently<T>(answer: Promise<T>): Promise<T> {
    let late = false
    const timer = setTimeout(() => {
      late = true
      tell(1)
    }, PATIENCE_MS)
    try {
      return await answer
    } finally {
      clearTimeout(timer)
      if (late) tell(-1)
    }
  }

  return {
    async run(place, batch, { context: known, oneUndo = false } = {}) {
      const work = (context: Excel.RequestContext) =>
        batch({ context, sync: () => patiently(context.sync()) })
      try {
        if (known) return await Excel.run(known, work)
        const merged = oneUndo && offers('1.20')
        return await Excel.run({ delayForCellEdit: true, ...(merged && { mergeUndoGroup: true }) }, work)
      } catch (error) {
        throw faultOf(error, place)
      }
    },
    onWaiting(listener) {
      listeners.add(listener)
      return () => void listeners.delete(listener)
    },
  }
}

/** Whether the host knows a version of the Excel API newer than the manifest asks for. */
export const offers = (version: string): boolean =>
  Office.context.requirements.isSetSupported('ExcelApi', version)

const codeOf = (error: unknown): string =>
  typeof error === 'object' && error !== null && 'code' in error ? String(error.code) : ''

/** Whether a request failed for its size alone, so that a smaller one may pass. */
export const isTooLarge = (error: unknown): boolean =>
  error instanceof Fault ? isTooLarge(error.cause) : /PayloadSizeLimitExceeded$/.test(codeOf(error))

/** Whether a request failed because something in it cannot be undone together with the rest, so that it may pass by itself. */
export const isUndoRefused = (error: unknown): boolean =>
  error instanceof Fault ? isUndoRefused(error.cause) : codeOf(error) === 'UndoNotSupported'

/** Puts an error of the host into the words of a Fault; a Fault passes through. */
export function faultOf(error: unknown, place: string): Fault {
  if (error instanceof Fault) return error
  const fault = translate(codeOf(error), error instanceof Error ? error.message : String(error), place)
  fault.cause = error
  return fault
}

function translate(code: string, message: string, place: string): Fault {
  switch (code) {
    case 'AccessDenied':
      return new Fault('protected', `${place} is protected`, PROTECTED_NEEDS)
    case 'ItemNotFound':
    case 'InvalidReference':
    case 'InvalidObjectPath':
      return new Fault('missing', `${place} is no longer there`, 'an existing sheet and cells are needed')
    case 'InvalidOperationInCellEditMode':
      return new Fault(
        'editing',
        'a cell is being edited',
        'leave the cell with Enter or Esc, then try again',
      )
    case 'InvalidSelection':
      return new Fault(
        'selection',
        'several areas, a chart or a drawing are selected',
        'select one block of cells',
      )
    case 'MergedRangeConflict':
    case 'PivotTableRangeConflict':
    case 'FilteredRangeConflict':
    case 'InsertDeleteConflict':
      return new Fault('occupied', `${place}: ${message}`, 'choose another place')
    case 'RequestPayloadSizeLimitExceeded':
    case 'ResponsePayloadSizeLimitExceeded':
      return new Fault(
        'host',
        `${place} is too large for one request to the workbook`,
        'choose a smaller block',
      )
    default:
      return new Fault(
        'host',
        `the workbook could not be worked with at ${place}: ${message}${code ? ` (${code})` : ''}`,
        'try again; if it stays so, save, close and reopen the workbook',
      )
  }
}

/** What a user can do about protection, wherever it is met. */
export const PROTECTED_NEEDS = 'take the protection off (Review, Unprotect Sheet) or choose another sheet'
