/**
 * What a desk does to its workbook between one look and the next, and what becomes of the proof, of kept results and of their comparison: edits while a
 * question stands, sheets renamed, deleted, protected or written into. Over the stand-in, with the desk's own formula engine; numbers come from the
 * small generator of the fixture.
 */
import type { CellValue } from '../../src/sheet'
import { closeBooks, desk, FRIDAY, NAMES, RETURNS } from './books-fixture'

afterEach(closeBooks)

type Desk = Awaited<ReturnType<typeof desk>>

const AMOUNTS: CellValue[][] = [
  ['Holding', 'Amount', 'Benchmark weight'],
  ...NAMES.map((name, i) => [name, [500, 300, 400, -200][i] ?? 0, 0.25]),
]

const shown = async ({ valuesAt }: Desk, sheet: string): Promise<string[]> =>
  (await valuesAt(sheet, 'A1:AZ140')).flat().map(String)

const differing = async (host: Desk): Promise<number> =>
  (await shown(host, 'Proof')).filter((text) => text.startsWith('≠')).length

/** A week more of returns, taken into the book. */
async function nextWeek({ user, quiet, books }: Desk): Promise<void> {
  user.type('Returns', `A${RETURNS.length + 1}`, [[FRIDAY + 7, 0.012, -0.02, 0.001, 0.013]])
  await quiet()
  await books
    .state()
    .offers.find(({ button }) => button === 'Include')
    ?.accept()
  await quiet()
}

test('capital that stands in a cell is read from there by the proof and by live functions', async () => {
  const host = await desk({ holdings: AMOUNTS })
  const { books, compute, user, quiet, select } = host
  user.type('Sheet1', 'H1', 1250)
  select('Sheet1', 'H1')
  await books.takeSelection('capital')
  await compute()
  await books.writeProof()
  await books.writeLive({ kind: 'new sheet' })
  await quiet()
  expect(books.state().faults).toEqual({})
  for (const sheet of ['Proof', 'Risk, live']) {
    const typed = (await host.cells(sheet, 'A1:H60'))['formulas'] ?? []
    expect(typed.find(([label]) => label === 'Capital')).toContain('=Sheet1!$H$1')
  }
  expect(await differing(host)).toBe(0)
  // the formulas follow the cell before anything is written again
  user.type('Sheet1', 'H1', 2500)
  await quiet()
  expect(await differing(host)).toBeGreaterThan(4)
}, 120_000)

test('a benchmark weight that changes leaves the proof behind the figures, and it is said', async () => {
  const weights = NAMES.map((name, i) => [name, [0.5, 0.3, 0.4, -0.2][i] ?? 0, 0.25])
  const host = await desk({ holdings: [['Holding', 'Weight', 'Benchmark weight'], ...weights] })
  const { books, compute, user, quiet } = host
  await compute()
  expect(books.state().breakdown?.active).not.toBeNull()
  await books.writeProof()
  expect(books.state().reporting.proof?.isCurrent).toBe(true)
  user.type('Sheet1', 'C4', 0.3)
  await quiet()
  expect(books.state().reporting.proof?.isCurrent).toBe(false)
}, 120_000)

test('a proof is found again on a renamed sheet and after rows came before it, and goes to a new sheet where its own was deleted', async () => {
  const host = await desk()
  const { books, compute, quiet, office } = host
  await compute()
  await books.writeProof()
  await office.Excel.run(async (context) => {
    const sheet = context.workbook.worksheets.getItem('Proof')
    sheet.name = 'For the validator'
    sheet.getRange('1:3').insert('Down' as never)
    context.workbook.worksheets.getItem('Returns').name = 'Weekly returns'
    await context.sync()
  })
  await quiet()
  await books.writeProof()
  await quiet()
  expect(books.state().faults).toEqual({})
  expect(books.state().reporting.proof?.area).toMatchObject({ sheet: 'For the validator', row: 3 })
  const texts = await shown(host, 'For the validator')
  expect(texts).toContain('All lines agree within the tolerance')

  await office.Excel.run(async (context) => {
    context.workbook.worksheets.getItem('For the validator').delete()
    await context.sync()
  })
  await quiet()
  expect(books.state().reporting.proof).toBeNull()
  await books.writeProof()
  expect(books.state().reporting.proof?.area).toMatchObject({ sheet: 'Proof', row: 0 })
}, 120_000)

test('a proof that may not be written or has no room leaves its sheet as it was, with the reason', async () => {
  const host = await desk()
  const { books, compute, quiet, office, user, portrait } = host
  await compute()
  await books.writeProof()
  await quiet()
  const area = books.state().reporting.proof?.area
  // a holding more makes it longer, and something of the user's stands right below
  const below = `A${(area?.rows ?? 0) + 1}`
  user.type('Proof', below, 'my remark')
  user.type('Sheet1', 'A8', [['Harbour bonds 2', 'Bonds', 0]])
  user.type('Returns', 'F1', [['Harbour bonds 2'], ...RETURNS.slice(1).map((row) => [row[3] ?? 0])])
  await quiet()
  for (let k = 0; k < 3; k++) {
    for (const offer of books.state().offers) if (offer.button === 'Include') await offer.accept()
    await quiet()
  }
  expect(books.state().breakdown?.names).toHaveLength(5)
  const before = portrait()
  await books.writeProof()
  expect(books.state().faults.proof).toMatch(new RegExp(`Proof!${below}`))
  expect(portrait()).toEqual(before)

  user.type('Proof', below, '')
  await office.Excel.run(async (context) => {
    context.workbook.worksheets.getItem('Proof').protection.protect()
    await context.sync()
  })
  const locked = portrait()
  await books.writeProof()
  expect(books.state().faults.proof).toMatch(/protected/)
  expect(portrait()).toEqual(locked)
}, 120_000)

test('a question about replacing a result is void once the data have another date', async () => {
  const host = await desk()
  const { books, compute } = host
  await compute()
  await books.keepResult('first')
  await books.keepResult('second')
  const [asked] = books.state().offers
  expect(asked?.button).toBe('Replace it')
  await nextWeek(host)
  await asked?.accept()
  expect(books.state().faults.history).toMatch(
    /^The data of this book are of another date than when it was asked/,
  )
  expect(books.state().reporting.kept.map(({ note }) => note)).toEqual(['first'])
}, 120_000)

test('an answer to that question keeps the figures of the sheet as it is then', async () => {
  const host = await desk()
  const { books, compute, user, settle } = host
  await compute()
  await books.keepResult('first')
  await books.keepResult('second')
  const [asked] = books.state().offers
  const before = books.state().breakdown?.decomposition.volatility
  user.type('Sheet1', 'C4', 0.9)
  await settle()
  expect(books.state().status.kind).toBe('stale')
  await asked?.accept()
  const [kept] = books.state().reporting.kept
  expect(kept?.note).toBe('second')
  expect(kept?.volatility).toBe(books.state().breakdown?.decomposition.volatility)
  expect(kept?.volatility).not.toBe(before)
}, 120_000)

test('a block that was written into is left when its result is replaced, and it is said where', async () => {
  const host = await desk()
  const { books, compute, user, quiet } = host
  await compute()
  await books.keepResult('first')
  await quiet()
  user.type('Kept results', 'B4', 'seen by the board')
  await books.keepResult('second')
  await books.state().offers[0]?.accept()
  expect(books.state().notice).toMatch(
    /^Result kept in .+ What stands in 'Kept results'!A1:G\d+ of the result of “.+” .+ is left there/,
  )
}, 120_000)

test('a comparison with now is made again before it is written, and goes with a result that is replaced', async () => {
  const host = await desk()
  const { books, compute, user, quiet } = host
  await compute()
  await books.keepResult('first')
  await books.compareResults('1', 'now')
  expect(books.state().reporting.change?.change).toBe(0)
  user.type('Sheet1', 'C4', 0.6)
  await quiet()
  await books.writeChange()
  await quiet()
  expect(books.state().faults).toEqual({})
  const { change } = books.state().reporting
  expect(change?.to.volatility).toBe(books.state().breakdown?.decomposition.volatility)
  expect(change?.change).not.toBe(0)
  const numbers = (await host.valuesAt('What changed', 'A1:L30')).flat()
  expect(numbers).toContain(change?.to.volatility)

  await books.keepResult('again')
  await books.state().offers[0]?.accept()
  expect(books.state().reporting.change).toBeNull()
  await books.compareResults('now', books.state().reporting.kept[0]?.id ?? '')
  expect(books.state().faults.history).toBe('It is compared from what stands now; choose a kept result.')
}, 120_000)

test('what is kept with a book goes when the book goes, and it is said', async () => {
  const { books, compute } = await desk()
  await compute()
  await books.keepResult('')
  await books.removeBook()
  expect(books.state().notice).toContain(
    'Its 1 kept result is taken away with it; what is written of it to be read stays.',
  )
  // another book under the same id finds nothing of it
  await compute()
  expect(books.state().current).toBe('1')
  expect(books.state().reporting.kept).toEqual([])
  await books.keepResult('of another book')
  expect(books.state().faults).toEqual({})
  expect(books.state().reporting.kept.map(({ id, note }) => [id, note])).toEqual([['1', 'of another book']])
}, 120_000)
