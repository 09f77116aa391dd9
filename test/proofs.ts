/** Proofs of many books in one workbook, worked out by the engine under the desk and by LibreOffice Calc. */
import { proofTable, type ProofInput } from '../src/sheet/proof'
import type { Table } from '../src/sheet/table'
import { itInCalc } from './calc'
import { readProof, type ProofReading } from './proof-reading'
import {
  computed,
  cornerOf,
  workedOut,
  workedOutByCalc,
  type BookCells,
  type Shown,
  type Workout,
} from './recalculation'

export interface Proofs {
  /** As it was laid out. */
  table(book: BookCells): Table
  /** As the engine under the desk has worked it out. */
  reading(book: BookCells): ProofReading
  /** A test in each engine; what it says ends before "the engine under the desk" or "LibreOffice Calc". */
  inBoth(says: string, book: BookCells, check: (proof: ProofReading) => void): void
}

/**
 * Lays the proofs out before the tests of the `describe` it is called in, and lets the workbook go after them.
 *
 * @param inputOf what the add-in makes of a book, for whoever plants faults in it
 */
export function proofsOf(
  books: readonly BookCells[],
  inputOf: (book: BookCells) => Promise<ProofInput> = computed,
): Proofs {
  const tables = new Map<string, Table>()
  let desk: Workout
  let inCalc: Promise<(book: BookCells) => Shown> | null = null
  const table = ({ name }: BookCells): Table => tables.get(name)!
  beforeAll(async () => {
    for (const book of books) tables.set(book.name, proofTable(await inputOf(book), cornerOf(book)))
    desk = await workedOut(books.map((book) => ({ book, table: table(book) })))
  })
  afterAll(() => {
    desk.dispose()
  })
  const reading = (book: BookCells): ProofReading => readProof(table(book), desk.shown(book))
  return {
    table,
    reading,
    inBoth(says, book, check) {
      it(`${says} the engine under the desk`, () => {
        check(reading(book))
      })
      itInCalc(
        `${says} LibreOffice Calc`,
        async () => {
          inCalc ??= desk.saved().then(workedOutByCalc)
          check(readProof(table(book), (await inCalc)(book)))
        },
        300_000,
      )
    },
  }
}
