/**
 * The proof of books that lie in every way a book may lie, worked out by two engines that are not ours: the one under the desk's grid, and
 * LibreOffice Calc. Tolerance: 1e-10, relative to the largest figure of the column.
 */
import { expectAgreement } from '../proof-reading'
import { proofsOf } from '../proofs'
import { awkwardBooks, takenOverBooks } from './proof-books'

jest.setTimeout(300_000)

const tolerance = 1e-10
const takenOver = takenOverBooks()
const books = [...awkwardBooks(), ...takenOver]

const proofs = proofsOf(books)

describe.each(books.map((book) => [book.name, book] as const))('The proof of the book “%s”', (_, book) => {
  proofs.inBoth('agrees in every line, worked out by', book, (proof) => {
    expectAgreement(proof, tolerance)
  })
})

describe.each(takenOver.map((book) => [book.name, book] as const))(
  'The proof of the book “%s”, whose covariances formulas do not reach,',
  (_, book) => {
    it('says at its head that they are constants taken over', () => {
      const { texts } = proofs.reading(book)
      expect(texts.slice(0, 8).join(' ')).toMatch(/NOT recomputed: the covariances/)
    })
  },
)

it('says so of no other book', () => {
  const loud = books.filter((book) => JSON.stringify(proofs.table(book).cells).includes('NOT recomputed'))
  // returns typed as text are no numbers to a formula
  expect(loud.map(({ name }) => name).sort()).toEqual(
    ['Text returns', ...takenOver.map(({ name }) => name)].sort(),
  )
})
