import type { Area, WorkbookEvent } from '../sheet'
import { addressOf } from '../sheet'
import { areasIn } from './addresses'
import { offers, type Request, type Requests } from './requests'

/** Names of worksheets by the ids events carry. */
export interface SheetNames {
  /** Notes a name; where the sheet had another one before, tells of that. */
  note(id: string, name: string): void
  onRenamed(listener: (before: string) => void): void
  /** Reads all names anew, in the request given. */
  load(request: Request): Promise<void>
  of(id: string): string | undefined
  forget(id: string): void
}

export function sheetNames(): SheetNames {
  const names = new Map<string, string>()
  let tell: (before: string) => void = () => undefined
  const note = (id: string, name: string): void => {
    const before = names.get(id)
    names.set(id, name)
    if (before !== undefined && before !== name) tell(before)
  }
  return {
    note,
    onRenamed: (listener) => void (tell = listener),
    of: (id) => names.get(id),
    forget: (id) => void names.delete(id),
    async load({ context, sync }) {
      const sheets = context.workbook.worksheets.load('items/id,items/name')
      await sync()
      for (const { id, name } of sheets.items) note(id, name)
    },
  }
}

/** Recognises the echoes of our own writes where the host does not mark them. */
export interface Echoes {
  expect(area: Area): void
  /** Whether a change of these cells is one that was expected; each is used up once. */
  take(area: Area): boolean
}

/** An echo that has not come by then was swallowed, and the next change there is the user's. */
const ECHO_MS = 5_000

export function openEchoes(): Echoes {
  const expected = new Map<string, number[]>()
  return {
    expect(area) {
      const now = Date.now()
      for (const [address, until] of expected) if (until.every((end) => end < now)) expected.delete(address)
      const key = addressOf(area)
      expected.set(key, [...(expected.get(key) ?? []), now + ECHO_MS])
    },
    take(area) {
      const key = addressOf(area)
      const [first, ...rest] = (expected.get(key) ?? []).filter((end) => end >= Date.now())
      if (rest.length > 0) expected.set(key, rest)
      else expected.delete(key)
      return first !== undefined
    },
  }
}

const MOVES: readonly string[] = [
  'RowInserted',
  'RowDeleted',
  'ColumnInserted',
  'ColumnDeleted',
  'CellInserted',
  'CellDeleted',
]

/** Hands the workbook's events on, in our words and in order. */
export async function watch(
  requests: Requests,
  names: SheetNames,
  echoes: Echoes,
  listener: (event: WorkbookEvent) => void,
): Promise<() => Promise<void>> {
  const marked = offers('1.14')
  let turn: Promise<void> = Promise.resolve()
  let ended = false

  /** Events wait in line behind one whose sheet is new to us: its name has to be asked for. */
  const withSheet = (id: string, tell: (sheet: string) => void): Promise<void> => {
    const told = turn.then(async () => {
      if (ended) return
      if (names.of(id) === undefined) {
        // the sheet may be gone again; then there is nothing to tell
        await requests.run('the sheets of this workbook', names.load).catch(() => undefined)
      }
      const sheet = names.of(id)
      if (sheet !== undefined && !ended) tell(sheet)
    })
    // an event that somebody failed to take is the host's to report; those behind it are told all the same
    turn = told.catch(() => undefined)
    return told
  }

  const changed = (args: Excel.WorksheetChangedEventArgs) =>
    withSheet(args.worksheetId, (sheet) => {
      if (MOVES.includes(args.changeType)) return listener({ kind: 'moved', sheet })
      const areas = args.address ? areasIn(args.address, sheet) : [null]
      for (const area of areas) {
        const ours = marked ? args.triggerSource === 'ThisLocalAddin' : area !== null && echoes.take(area)
        listener({ kind: 'edited', sheet, area, ours })
      }
    })

  const handlers = await requests.run('the events of this workbook', async (request) => {
    const { worksheets } = request.context.workbook
    const added: OfficeExtension.EventHandlerResult<never>[] = []
    const keep = <T>(handler: OfficeExtension.EventHandlerResult<T>) =>
      void added.push(handler as unknown as OfficeExtension.EventHandlerResult<never>)
    keep(worksheets.onChanged.add(changed))
    keep(
      worksheets.onCalculated.add(({ worksheetId }) =>
        withSheet(worksheetId, (sheet) => listener({ kind: 'calculated', sheet })),
      ),
    )
    keep(
      worksheets.onDeleted.add(({ worksheetId }) =>
        withSheet(worksheetId, (sheet) => {
          names.forget(worksheetId)
          listener({ kind: 'sheet-removed', sheet })
        }),
      ),
    )
    keep(
      worksheets.onSelectionChanged.add(({ worksheetId, address }) =>
        withSheet(worksheetId, (sheet) => {
          const [area, second] = areasIn(address, sheet)
          listener({ kind: 'selected', area: second === undefined ? (area ?? null) : null })
        }),
      ),
    )
    keep(worksheets.onAdded.add(({ worksheetId }) => withSheet(worksheetId, () => undefined)))
    if (offers('1.17')) {
      keep(
        worksheets.onNameChanged.add(async ({ worksheetId, nameAfter }) =>
          names.note(worksheetId, nameAfter),
        ),
      )
    }
    await names.load(request)
    return added
  })
  // hosts before 1.17 do not announce it: there it comes out when the sheet is looked at next
  names.onRenamed((before) => {
    if (!ended) listener({ kind: 'moved', sheet: before })
  })
  const stopWaiting = requests.onWaiting((waiting) => listener({ kind: 'waiting', waiting }))

  return async () => {
    ended = true
    stopWaiting()
    const [first] = handlers
    if (!first) return
    await requests.run(
      'the events of this workbook',
      async ({ sync }) => {
        for (const handler of handlers) handler.remove()
        await sync()
      },
      { context: first.context },
    )
  }
}
