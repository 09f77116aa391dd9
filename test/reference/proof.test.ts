/**
 * The proof of books that lie in every way a book may lie, worked out by two engines that are not ours: the one under the desk's grid, and
 * LibreOffice Calc. Tolerance: 1e-10, relative to the largest figure of the column.
 */
import { proofTable } from '../../src/sheet/proof'
import type { Table } from '../../src/sheet/table'
import { itInCalc } from '../calc'
import { expectAgreement, readProof } from '../proof-reading'
import {
  computed,
  cornerOf,
  workedOut,
  workedOutByCalc,
  type BookCells,
  type Shown,
  type Workout,
} from '../recalculation'
import { awkwardBooks, takenOverBooks } from './proof-books'

jest.setTimeout(300_000)

const tolerance = 1e-10
const takenOver = takenOverBooks()
const books = [...awkwardBooks(), ...takenOver]

let desk: Workout
const tables = new Map<string, Table>()
let inCalc: Promise<(book: BookCells) => Shown> | null = null

beforeAll(async () => {
  for (const book of books) tables.set(book.name, proofTable(await computed(book), cornerOf(book)))
  desk = await workedOut(books.map((book) => ({ book, table: tables.get(book.name)! })))
})
afterAll(() => {
  desk.dispose()
})

describe.each(books.map((book) => [book.name, book] as const))('The proof of the book “%s”', (name, book) => {
  it('agrees in every line, worked out by the engine under the desk', () => {
    expectAgreement(readProof(tables.get(name)!, desk.shown(book)), tolerance)
  })

  itInCalc(
    'agrees in every line, worked out by LibreOffice Calc',
    async () => {
      inCalc ??= desk.saved().then(workedOutByCalc)
      expectAgreement(readProof(tables.get(name)!, (await inCalc)(book)), tolerance)
    },
    300_000,
  )
})

describe.each(takenOver.map((book) => [book.name, book] as const))(
  'The proof of the book “%s”, whose covariances formulas do not reach,',
  (name, book) => {
    it('says at its head that they are constants taken over', () => {
      const { texts } = readProof(tables.get(name)!, desk.shown(book))
      expect(texts.slice(0, 8).join(' ')).toMatch(/NOT recomputed: the covariances/)
    })
  },
)

it('says so of no other book', () => {
  const loud = books.filter(({ name }) => JSON.stringify(tables.get(name)!.cells).includes('NOT recomputed'))
  // returns typed as text are no numbers to a formula
  expect(loud.map(({ name }) => name).sort()).toEqual(
    ['Text returns', ...takenOver.map(({ name }) => name)].sort(),
  )
})
