/**
 * What the books make of events at awkward moments, over a workbook of plain arrays whose answers can be held back. Figures are compared
 * with each other, never with a number of their own.
 */
import { Fault } from '../../../src/core'
import type { Books, CellValue } from '../../../src/sheet'
import { openBooks } from '../../../src/sheet'
import { areaAt, plainWorkbook } from './plain-workbook'

const HOLDINGS: CellValue[][] = [
  ['Holding', 'Weight'],
  ['Meadow', 0.6],
  ['Orchard', 0.4],
]
const RETURNS: CellValue[][] = [
  ['Meadow', 'Orchard'],
  [0.01, 0.02],
  [-0.02, 0.01],
  [0.03, -0.01],
  [0.01, 0.01],
]
const copyOf = (cells: CellValue[][]): CellValue[][] => cells.map((row) => [...row])

const running: Books[] = []
afterEach(async () => {
  for (const books of running.splice(0)) await books.close()
})

/** Books over "Book" (holdings in A1:B3, a capital in D1) and "Returns" (A1:B5). */
async function desk(holdings = HOLDINGS, returns = RETURNS) {
  const workbook = plainWorkbook({
    Book: copyOf(holdings).map((row, k) => (k === 0 ? [...row, '', 2000] : row)),
    Returns: copyOf(returns),
  })
  const books = await openBooks(workbook.port)
  running.push(books)
  const take = async (field: 'holdings' | 'returns' | 'capital', address: string): Promise<void> => {
    workbook.select(address)
    await books.takeSelection(field)
  }
  const compute = async (block = 'Book!A1:B3'): Promise<void> => {
    await take('holdings', block)
    await take('returns', `Returns!A1:${returns[0]?.length === 3 ? 'C' : 'B'}5`)
    await books.compute()
  }
  /** Until edits have settled and what they set off is done. */
  const quiet = async () => {
    do await new Promise((resolve) => setTimeout(resolve, 150))
    while (books.state().working)
    return books.state()
  }
  const volatility = (): number => books.state().breakdown?.decomposition.volatility ?? NaN
  return { ...workbook, books, take, compute, quiet, volatility }
}

const soon = (): Promise<void> => new Promise((resolve) => setTimeout(resolve, 10))

describe('Edits that come while something else is going on', () => {
  test('a return edited while the returns are being read is in the figures in the end', async () => {
    const { books, compute, hold, type, quiet, volatility, tell } = await desk()
    await compute()
    const before = volatility()
    const release = hold('read')
    tell({ kind: 'moved', sheet: 'Returns' })
    await new Promise((resolve) => setTimeout(resolve, 150))
    expect(books.state().working?.what).toBeDefined()
    type('Returns!A3', -0.2)
    release()
    await quiet()
    expect(volatility()).toBeGreaterThan(2 * before)
    expect(books.state().status).toEqual({ kind: 'up to date' })
  })

  test('a return edited while a workbook opens is in the figures in the end', async () => {
    const { compute, port, hold, type, volatility } = await desk()
    await compute()
    const before = volatility()
    const release = hold('read')
    const opening = openBooks(port)
    await soon()
    type('Returns!A3', -0.2)
    release()
    const again = await opening
    running.push(again)
    await new Promise((resolve) => setTimeout(resolve, 200))
    expect(again.state().breakdown?.decomposition.volatility).toBeGreaterThan(2 * before)
  })

  test('figures are not called up to date after an edit that they do not know', async () => {
    const { books, compute, hold, type, quiet } = await desk()
    await compute()
    const release = hold('look')
    const computing = books.compute()
    await soon()
    type('Book!B2', 0.9)
    release()
    await computing
    expect(books.state().status).toMatchObject({ kind: 'stale', sentence: 'Stale since Book!B2 was edited.' })
    expect((await quiet()).status).toEqual({ kind: 'up to date' })
    expect(books.state().breakdown?.decomposition.weights[0]).toBe(0.9)
  })

  test('numbers that moved into the place of others within the returns are read again', async () => {
    const { compute, put, tell, quiet, volatility } = await desk()
    await compute()
    const before = volatility()
    put('Returns!A3', -0.2)
    tell({ kind: 'moved', sheet: 'Returns' })
    await quiet()
    expect(volatility()).toBeGreaterThan(2 * before)
  })

  test('a book removed while a refresh is due is left alone', async () => {
    const { books, compute, type, calls, names, settings, quiet } = await desk()
    await compute()
    type('Book!B2', 0.9)
    await books.removeBook()
    calls.length = 0
    await quiet()
    expect(calls).toEqual([])
    expect([names.size, settings.size]).toEqual([0, 0])
  })
})

describe('What is followed without an edit', () => {
  test('weights that are formulas are followed however often the user changes what they rest on', async () => {
    const { books, compute, put, tell, type, quiet } = await desk()
    put('Book!B2', 0.6, '=D1/1000')
    await compute()
    for (let k = 1; k <= 6; k++) {
      put('Book!B2', k / 10, '=D1/1000')
      type('Book!D1', k * 100)
      tell({ kind: 'calculated', sheet: 'Book' })
      await quiet()
      expect(books.state().breakdown?.decomposition.weights[0]).toBe(k / 10)
    }
    expect(books.state().status).toEqual({ kind: 'up to date' })
  })

  test('a capital that is a formula is followed', async () => {
    const { books, compute, take, put, tell, quiet } = await desk([
      ['Holding', 'Amount'],
      ['Meadow', 600],
      ['Orchard', 400],
    ])
    put('Book!D1', 2000, '=SUM(F1:F9)')
    await compute()
    await take('capital', 'Book!D1')
    put('Book!D1', 4000, '=SUM(F1:F9)')
    tell({ kind: 'calculated', sheet: 'Book' })
    await quiet()
    expect(books.state().breakdown?.decomposition.weights[0]).toBe(0.15)
  })
})

describe('The capital', () => {
  const amounts: CellValue[][] = [
    ['Holding', 'Amount'],
    ['Meadow', 600],
    ['Orchard', 400],
  ]

  test('pointed at, typed and taken back again, each is in the figures at once and saved', async () => {
    const { books, compute, take, names, settings } = await desk(amounts)
    const weight = (): number | undefined => books.state().breakdown?.decomposition.weights[0]
    await compute()
    expect(weight()).toBe(0.6)
    await take('capital', 'Book!D1')
    expect(weight()).toBe(0.3)
    expect(names.get('1_capital')).toEqual(areaAt('Book!D1'))
    expect(settings.get('book.1')).toMatchObject({ settings: { capital: 2000 } })
    await books.choose({ capital: 1200 })
    expect(weight()).toBe(0.5)
    expect(names.has('1_capital')).toBe(false)
    await books.choose({ capital: null })
    expect(weight()).toBe(0.6)
  })

  test('when its cell is gone that is said, and typing it mends it', async () => {
    const { books, compute, take, names } = await desk(amounts)
    await compute()
    await take('capital', 'Book!D1')
    names.delete('1_capital')
    await books.compute()
    expect(books.state().faults.capital).toBe(
      'The cell of the capital, Book!D1, is gone; point at another cell or type the capital.',
    )
    await books.choose({ capital: 1200 })
    expect(books.state()).toMatchObject({ faults: {}, status: { kind: 'up to date' } })
  })
})

describe('The written table', () => {
  test('when the user types into it, it is no longer called up to date and what was typed stays', async () => {
    const { books, compute, type, quiet, valueAt } = await desk()
    await compute()
    await books.writeTable({ kind: 'new sheet' })
    type('Risk!B7', 0.77)
    const { status } = await quiet()
    expect(status).toMatchObject({
      kind: 'stale',
      sentence: expect.stringMatching(/^The table in Risk!A1:\w+ differs from the figures/) as string,
    })
    expect(valueAt('Risk!B7')).toBe(0.77)
    await books.compute()
    expect(valueAt('Risk!B7')).toBe(0.6)
    expect(books.state().status).toEqual({ kind: 'up to date' })
  })

  test('a question about foreign cells that was declined is asked again with the next command', async () => {
    const { books, compute, select, type, valueAt } = await desk()
    await compute()
    type('Book!H1', 'mine')
    select('Book!H1')
    await books.writeTable({ kind: 'selection' })
    books.state().offers[0]?.decline()
    expect(books.state().offers).toEqual([])
    await books.writeTable({ kind: 'selection' })
    expect(books.state().offers.map(({ button }) => button)).toEqual(['Write over it'])
    expect(valueAt('Book!H1')).toBe('mine')
  })

  test('on a new sheet it is not written to a hidden one of that name', async () => {
    const { books, compute, hideSheet } = await desk()
    await compute()
    hideSheet('Risk')
    await books.writeTable({ kind: 'new sheet' })
    expect(books.state().table?.sheet).toBe('Risk 2')
  })

  test('it is written from figures that know the newest edit', async () => {
    const { books, compute, type, valueAt } = await desk()
    await compute()
    type('Book!B2', 0.9)
    await books.writeTable({ kind: 'new sheet' })
    expect(valueAt('Risk!B7')).toBe(0.9)
  })

  test('it is not written from the last good figures while a weight is no number', async () => {
    const { books, compute, type, names } = await desk()
    await compute()
    type('Book!B2', 'lots')
    await books.writeTable({ kind: 'new sheet' })
    expect(names.has('1_table')).toBe(false)
    expect(books.state().faults.holdings).toBe('Book!B2: found “lots”; a weight is needed.')
  })

  test('refused where it was, it can still be written elsewhere, which ends the fault', async () => {
    const { books, compute, refused, type, quiet } = await desk()
    await compute()
    await books.writeTable({ kind: 'new sheet' })
    refused.set('write', new Fault('protected', 'Risk is protected', 'take the protection off'))
    type('Book!B2', 0.9)
    expect((await quiet()).status).toMatchObject({
      kind: 'failed',
      sentence: 'Risk is protected; take the protection off.',
    })
    refused.clear()
    await books.writeTable({ kind: 'new sheet' })
    expect(books.state()).toMatchObject({ faults: {}, status: { kind: 'up to date' } })
  })

  test('a book whose table another book is written over lets go of it', async () => {
    const { books, compute, select, names, type, quiet, valueAt } = await desk()
    await compute()
    await books.writeTable({ kind: 'new sheet' })
    await books.addBook()
    await compute()
    await books.rename('Second')
    select('Risk!A1')
    await books.writeTable({ kind: 'selection' })
    expect(books.state().faults.table).toMatch(/is in the way/)
    await books.state().offers[0]?.accept()
    expect(books.state().faults).toEqual({})
    expect(names.get('1_table')).toBeUndefined()
    expect(books.state().notice).toBe('The table of “Book” was written over and no longer follows its book.')
    type('Book!B2', 0.9)
    await quiet()
    expect(valueAt('Risk!A1')).toBe('Contributions to risk: Second')
    expect(valueAt('Risk!B7')).toBe(0.9)
  })
})

describe('The link', () => {
  test('a book that was given other blocks and then removed does not come back', async () => {
    const { books, compute, take, names, settings, port } = await desk()
    await compute()
    await take('holdings', 'Book!A1:B3')
    await books.removeBook()
    expect([names.size, settings.size]).toEqual([0, 0])
    const again = await openBooks(port)
    running.push(again)
    expect(again.state().status.kind).toBe('nothing linked')
  })

  test('saved settings that cannot be read are told at opening', async () => {
    const { compute, settings, port } = await desk()
    await compute()
    settings.set('book.1', { title: 'Mine', settings: { estimator: { kind: 'magic' }, riskless: 'Cash' } })
    const again = await openBooks(port)
    running.push(again)
    expect(again.state().notice).toBe(
      'Mine: settings saved with this workbook could not be read and stand at their defaults: estimator and riskless.',
    )
  })

  test('a workbook that cannot be asked for its books is not taken for one without any', async () => {
    const { compute, refused, port } = await desk()
    await compute()
    refused.set('recall', new Fault('host', 'the workbook could not be worked with', 'try again'))
    await expect(openBooks(port)).rejects.toBeInstanceOf(Fault)
  })

  test('reading that is cancelled while a workbook opens does not leave it without a link', async () => {
    const { compute, refused, port } = await desk()
    await compute()
    refused.set('read', new Fault('cancelled', 'reading was cancelled', 'start it again'))
    const again = await openBooks(port)
    running.push(again)
    expect(again.state().status).toMatchObject({ kind: 'stale' })
    refused.clear()
    await again.compute()
    expect(again.state().status).toEqual({ kind: 'up to date' })
  })
})

test('sheets that get other names are followed under them', async () => {
  const { books, compute, renameSheet, type, quiet, volatility } = await desk()
  await compute()
  const before = volatility()
  renameSheet('Book', 'Holdings 2026')
  renameSheet('Returns', 'Weeks')
  await quiet()
  type("'Holdings 2026'!B2", 0.9)
  expect((await quiet()).breakdown?.decomposition.weights[0]).toBe(0.9)
  type('Weeks!A3', -0.2)
  await quiet()
  expect(volatility()).toBeGreaterThan(2 * before)
  expect(books.state().holdings?.area.sheet).toBe('Holdings 2026')
})

describe('What the pane is told', () => {
  test('dates appended below a block that runs from newest to oldest are not called newer', async () => {
    const dated = RETURNS.map((row, t) => [t === 0 ? 'Week' : 46353 - 7 * t, ...row])
    const { books, compute } = await desk(HOLDINGS, [...dated, [46353 - 35, 0.01, 0.01]])
    await compute()
    expect(books.state().offers.map(({ sentence }) => sentence)).toEqual([
      '1 further date to 23 Oct 2026 found beside Returns!A1:C5.',
    ])
  })

  test('a wait for the workbook does not wipe what was said before it', async () => {
    const { books, compute, tell } = await desk()
    await compute()
    await books.writeTable({ kind: 'new sheet' })
    const said = books.state().notice
    expect(said).toMatch(/^Table written to Risk!/)
    tell({ kind: 'waiting', waiting: true })
    expect(books.state().notice).toMatch(/^Waiting for the workbook/)
    tell({ kind: 'waiting', waiting: false })
    expect(books.state().notice).toBe(said)
  })

  test('a place that cannot be shown says so and leaves the figures as good as they were', async () => {
    const { books, compute, refused } = await desk()
    await compute()
    refused.set('reveal', new Fault('missing', 'Old!A1 is no longer there', 'an existing sheet is needed'))
    await books.reveal(areaAt('Old!A1'))
    expect(books.state()).toMatchObject({
      notice: 'Old!A1 is no longer there; an existing sheet is needed.',
      status: { kind: 'up to date' },
    })
  })

  test('a column whose heading is a word of the language has the role its content suggests', async () => {
    const { books, compute } = await desk([
      ['constructor', '__proto__'],
      ['Meadow', 0.6],
      ['Orchard', 0.4],
    ])
    await compute()
    expect(books.state().holdings?.columns.map(({ role }) => role)).toEqual(['name', 'weight'])
    await books.assignRole('__proto__', 'benchmark weight')
    expect(books.state().holdings?.columns[1]?.role).toBe('benchmark weight')
  })
})
