/** Books over the stand-in for the host's API, without a screen: a user's workbook, the add-in's own port, and what the books make of it. */
import type { Books, BooksState, CellValue } from '../../src/sheet'
import { openBooks } from '../../src/sheet'
import { closeAll, open } from './workbook-fixture'

export const FRIDAY = 46353

/** Returns between -2% and 2% from a linear congruential generator (constants of Numerical Recipes, from memory), five digits each. */
export function returnsOf(names: readonly string[], weeks: number): CellValue[][] {
  let state = 12345
  const next = (): number => {
    state = (Math.imul(state, 1664525) + 1013904223) >>> 0
    return Math.round((state / 2 ** 32 - 0.5) * 4000) / 100000
  }
  return [
    ['Week ending', ...names],
    ...Array.from({ length: weeks }, (_, t) => {
      const moves = names.map(next)
      // the hedge goes with the first series, so that being short of it lowers risk
      return [
        FRIDAY - 7 * (weeks - 1 - t),
        ...moves.map((move, i) => (names[i] === 'Index hedge' ? (moves[0] ?? 0) + move / 10 : move)),
      ]
    }),
  ]
}

export const NAMES = ['Northern shares', 'Southern shares', 'Harbour bonds', 'Index hedge']
export const HOLDINGS: CellValue[][] = [
  ['Holding', 'Class', 'Weight'],
  ['Northern shares', 'Shares', 0.5],
  ['Southern shares', 'Shares', 0.3],
  ['Harbour bonds', 'Bonds', 0.4],
  ['Index hedge', 'Shares', -0.2],
]
export const RETURNS = returnsOf(NAMES, 60)

const running: Books[] = []
let settleLast = (): Promise<void> => Promise.resolve()
/** Ends what was opened; for `afterEach`. */
export async function closeBooks(): Promise<void> {
  await settleLast()
  for (const books of running.splice(0)) await books.close()
  closeAll()
}

/** A workbook with holdings from A3 of "Sheet1" and returns from A1 of "Returns", and the books over it. */
export async function desk({ holdings = HOLDINGS, returns = RETURNS } = {}) {
  const host = open()
  const { user, office, settle } = host
  settleLast = settle
  user.type('Sheet1', 'A3', holdings)
  await office.Excel.run(async (context) => {
    context.workbook.worksheets.add('Returns')
    await context.sync()
  })
  user.type('Returns', 'A1', returns)
  await settle()
  /** As when the pane is closed and opened again. */
  const reopen = async (): Promise<Books> => {
    const opened = await openBooks(host.book)
    running.push(opened)
    return opened
  }
  const books = await reopen()
  /** Waits until edits have settled and what they set off is done. */
  const quiet = async (): Promise<BooksState> => {
    await settle()
    await new Promise((resolve) => setTimeout(resolve, 200))
    await settle()
    while (books.state().working) await new Promise((resolve) => setTimeout(resolve, 10))
    return books.state()
  }
  const select = (sheet: string, ...addresses: string[]): void => {
    user.select(sheet, ...addresses)
  }
  const compute = async (): Promise<BooksState> => {
    select('Sheet1', `A3:C${2 + holdings.length}`)
    await books.takeSelection('holdings')
    select('Returns', `A1:${'ABCDEFGH'[(returns[0]?.length ?? 1) - 1] ?? 'A'}${returns.length}`)
    await books.takeSelection('returns')
    await books.compute()
    return quiet()
  }
  const writeTable = async (): Promise<BooksState> => {
    await books.writeTable({ kind: 'new sheet' })
    return quiet()
  }
  const valuesAt = async (sheet: string, address: string): Promise<unknown[][]> =>
    (await host.cells(sheet, address))['values'] ?? []
  return { ...host, books, reopen, quiet, select, compute, writeTable, valuesAt }
}
