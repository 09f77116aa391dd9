/**
 * A proof whose tolerance cannot be read agrees with nothing. The text is what a workbook makes of a comma typed under a culture of points.
 */
import { proofTable } from '../../src/sheet/proof'
import { DIFFERS, readProof } from '../proof-reading'
import { computed, cornerOf, workedOut } from '../recalculation'
import { awkwardBooks } from './proof-books'

jest.setTimeout(120_000)

test('a tolerance that is no number makes every line differ, and the first line say so', async () => {
  const [book] = awkwardBooks()
  if (!book) throw new Error('no book')
  const table = proofTable(await computed(book), cornerOf(book))
  const cells = table.cells.map((row) =>
    row[0]?.value === 'Tolerance'
      ? row.map((cell) => (cell.value === 1e-10 ? { ...cell, value: '0,0000000001', format: '@' } : cell))
      : row,
  )
  const laid = { ...table, cells }
  const desk = await workedOut([{ book, table: laid }])
  const { results, headline } = readProof(laid, desk.shown(book))
  desk.dispose()
  const others = results.filter(({ label }) => label !== 'Numbers in the cells of the returns')
  expect(others.length).toBeGreaterThan(10)
  expect(others.map(({ said }) => said)).toEqual(others.map(() => DIFFERS))
  expect(headline.sentence).toBe('Some lines differ by more than the tolerance')
})
