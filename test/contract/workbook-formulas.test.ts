/** Tables with formulas: what is typed, what comes of it, and what a second write of them does. All numbers are the tests' own. */
import { parseAddress, type Area, type Table } from '../../src/sheet'
import { formulaCell } from '../../src/sheet/table'
import { WrittenTable } from '../../src/sheet/written-table'
import { blank, closeAll, number, open, tableOf, text } from './workbook-fixture'

jest.setTimeout(120_000)
afterEach(closeAll)

const area = (address: string): Area => {
  const found = parseAddress(address, 'Sheet1')
  if (!found) throw new Error(address)
  return found
}
const at = { sheet: 'Sheet1', row: 1, column: 1 }

/** Weights, their squares as formulas and a sum, from B2 on. */
const sums = (weights: readonly number[], from = 2): Table =>
  tableOf([
    [text('=Weight', 'head'), text("'Square", 'head')],
    ...weights.map((weight, k) => [
      number(weight),
      formulaCell(`=Sheet1!$B$${from + 1 + k}*Sheet1!$B$${from + 1 + k}`, '0.00'),
    ]),
    [
      text('@Sum', 'total'),
      formulaCell(`=SUM(Sheet1!$C$${from + 1}:$C$${from + weights.length})`, '0.00', 'total'),
    ],
  ])

/** A formula that fills the two cells below its own, which the table leaves blank. */
const spilling = (first: number): Table =>
  tableOf([
    [text('Steps', 'head'), text('Note', 'head')],
    [formulaCell(`=SEQUENCE(3,1,${first})`, '0'), text('from here down')],
    [blank, text('filled')],
    [blank, text('filled')],
  ])

test('formulas go in as formulas and are worked out; texts beside them stay texts whatever they begin with', async () => {
  const { book, cells } = open()
  await book.write({ patches: [{ at, table: sums([0.5, 0.25]), over: 'blank' }] })
  const { values, formulas, valueTypes, numberFormat } = await cells('Sheet1', 'B2:C5')
  expect(values).toEqual([
    ['=Weight', "'Square"],
    [0.5, 0.25],
    [0.25, 0.0625],
    ['@Sum', 0.3125],
  ])
  expect(formulas?.map((row) => row[1])).toEqual([
    "'Square",
    '=Sheet1!$B$3*Sheet1!$B$3',
    '=Sheet1!$B$4*Sheet1!$B$4',
    '=SUM(Sheet1!$C$3:$C$4)',
  ])
  expect(valueTypes?.[0]).toEqual(['String', 'String'])
  expect(numberFormat).toEqual([
    ['@', '@'],
    ['0.0%', '0.00'],
    ['0.0%', '0.00'],
    ['@', '0.00'],
  ])
})

test('a refresh sends the values that differ and leaves formulas that stand; one that was overtyped comes back', async () => {
  const { book, user, cells, office } = open()
  await book.write({ patches: [{ at, table: sums([0.5, 0.25]), over: 'blank' }] })
  user.type('Sheet1', 'C4', 7)
  const [seen] = await book.look([{ at: area('B2:C5'), formulas: true }])
  office.counts.reset()
  const patch = { at, table: sums([0.5, 0.75]), over: 'blank' as const, ours: area('B2:C5') }
  await book.write({ patches: [{ ...patch, seen: seen?.formulas ?? [] }] })
  expect(office.counts.syncs).toBe(1)
  expect((await cells('Sheet1', 'B3:C5')).values).toEqual([
    [0.5, 0.25],
    [0.75, 0.5625],
    ['@Sum', 0.8125],
  ])
})

describe('A written table with formulas', () => {
  const written = async (table: Table, over: 'blank' | 'replace' = 'blank') => {
    const opened = open()
    const place = new WrittenTable(opened.book, 'table', 'Table')
    await place.write('selection', area('B2'), table, over, [])
    const look = async () => {
      const [seen] = await opened.book.look([{ at: { kept: 'table' }, formulas: true }])
      if (!seen) throw new Error('gone')
      return seen
    }
    return { ...opened, place, look }
  }

  test('stands as long as its formulas do, whatever comes of them', async () => {
    const { place, look, user } = await written(sums([0.5, 0.25]))
    expect(place.stands(await look(), sums([0.5, 0.25]))).toBe(true)
    user.type('Sheet1', 'C4', '= sheet1!$B$4 * sheet1!$b$4')
    expect(place.stands(await look(), sums([0.5, 0.25]))).toBe(true)
    user.type('Sheet1', 'C4', '=Sheet1!$B$4*2')
    expect(place.stands(await look(), sums([0.5, 0.25]))).toBe(false)
    user.type('Sheet1', 'C4', 0.0625)
    expect(place.stands(await look(), sums([0.5, 0.25]))).toBe(false)
  })

  test('stands with what a formula of it fills into its blanks, and not with what is typed there', async () => {
    const { place, look, user } = await written(spilling(1))
    const seen = await look()
    expect(seen.spilled).toEqual([{ from: area('B3'), over: area('B3:B5') }])
    expect(place.stands(seen, spilling(1))).toBe(true)
    user.type('Sheet1', 'B4', 9)
    expect(place.stands(await look(), spilling(1))).toBe(false)
  })

  test('is written anew where it was, over the cells its formula fills', async () => {
    const { place, look, cells, book } = await written(spilling(1))
    expect((await cells('Sheet1', 'B3:B5')).values).toEqual([[1], [2], [3]])
    await place.rewrite(await look(), spilling(5), [])
    expect((await cells('Sheet1', 'B3:B5')).values).toEqual([[5], [6], [7]])
    await book.write({ patches: [{ at, table: spilling(8), over: 'blank', ours: area('B2:C5') }] })
    expect((await cells('Sheet1', 'B3:B5')).values).toEqual([[8], [9], [10]])
  })
})

test('ten thousand formulas of eighty characters go in by at most three requests that change something, each under 4 MB', async () => {
  const sheetName = 'A book of five hundred holdings'
  const cell = (k: number) =>
    formulaCell(`=IF('${sheetName}'!$B$${k + 2}="",0,'${sheetName}'!$B$${k + 2}*2)/1000`, '0.000000000000')
  const table = tableOf(Array.from({ length: 1000 }, (_, r) => Array.from({ length: 10 }, () => cell(r))))
  expect(table.cells[0]?.[0]?.formula?.length).toBeGreaterThan(79)
  const { book, office } = open({ payloadLimit: 4_000_000 })
  await office.Excel.run(async (context) => {
    context.workbook.worksheets.add(sheetName)
    await context.sync()
  })
  office.counts.reset()
  const there = { sheet: 'Proof', row: 0, column: 0 }
  await book.write({ sheet: 'Proof', patches: [{ at: there, table, over: 'blank' }] })
  expect(office.counts.writes).toBeLessThanOrEqual(3)
  const [seen] = await book.look([{ at: { ...there, rows: 1000, columns: 10 }, formulas: true }])
  expect(seen?.formulas).toEqual(table.cells.map((row) => row.map(({ formula }) => formula)))
})
