/**
 * What leaves the pane, over the stand-in for the host's API and with the desk's own formula engine: the proof, the committee page, kept
 * results and what changed between them. Numbers come from the small generator of the fixture.
 */
import type { CellValue } from '../../src/sheet'
import { closeBooks, desk, FRIDAY } from './books-fixture'

afterEach(closeBooks)

type Desk = Awaited<ReturnType<typeof desk>>

/** Everything in an area of ours, as the cells show it. */
async function shown({ books, quiet, valuesAt }: Desk, sheet: string, rows = 200): Promise<CellValue[][]> {
  await quiet()
  expect(books.state().faults).toEqual({})
  return (await valuesAt(sheet, `A1:AZ${rows}`)) as CellValue[][]
}

const marks = (cells: CellValue[][]): { agree: number; differ: number } => {
  const texts = cells.flat().map(String)
  return {
    agree: texts.filter((text) => text.includes('✓')).length,
    differ: texts.filter((text) => text.includes('≠')).length,
  }
}

test('every line of the proof agrees; an edited return moves it and marks our figures until it is written again', async () => {
  const host = await desk()
  const { books, compute, user, quiet } = host
  await compute()
  await books.writeProof()
  const proof = await shown(host, 'Proof')
  const before = marks(proof)
  // four holdings with three figures each, and what is told of the book
  expect(before.agree).toBeGreaterThan(12)
  expect(proof.flat()).toContain('All lines agree within the tolerance')
  expect(before.differ).toBe(0)
  expect(books.state().reporting.proof).toMatchObject({ isCurrent: true })

  user.type('Returns', 'B10', 0.09)
  await quiet()
  const after = marks(await shown(host, 'Proof'))
  expect(after.differ).toBeGreaterThan(5)
  // the figures in the pane have followed, those of the proof have not
  expect(books.state().status).toEqual({ kind: 'up to date' })
  expect(books.state().reporting.proof).toMatchObject({ isCurrent: false })

  await books.writeProof()
  const again = marks(await shown(host, 'Proof'))
  expect(again).toEqual({ agree: before.agree, differ: 0 })
  expect(books.state().reporting.proof).toMatchObject({ isCurrent: true })
}, 120_000)

test('results that are kept survive closing, and the change between them adds up in the sheet as in the pane', async () => {
  const host = await desk()
  const { books, compute, user, quiet, valuesAt, reopen } = host
  const volatility = (): number => books.state().breakdown?.decomposition.volatility ?? NaN
  await compute()
  await books.keepResult('before')
  const [from] = [volatility()]
  user.type('Sheet1', 'C4', 0.35)
  // a week of returns replaced, and a further week come in
  user.type('Returns', 'B40:E40', [[0.02, -0.01, 0.004, 0.021]])
  user.type('Returns', 'A62', [[FRIDAY + 7, 0.012, -0.02, 0.001, 0.013]])
  await quiet()
  const offer = books.state().offers.find(({ button }) => button === 'Include')
  await offer?.accept()
  await quiet()
  await books.keepResult('after')
  expect(books.state().faults).toEqual({})
  expect(books.state().reporting.kept.map(({ note }) => note)).toEqual(['before', 'after'])
  const to = volatility()
  expect(to).not.toBe(from)

  await books.compareResults('1', '2')
  const { change } = books.state().reporting
  if (!change || typeof change.total === 'string') throw new Error('nothing was split')
  const { positions, volatilities, correlations, drift, trades } = change.total
  // each is a sum of a few numbers near 0.1
  expect(Math.abs(positions + volatilities + correlations - (to - from))).toBeLessThan(1e-12 * to)
  expect(change.difference).toBeCloseTo(0, 14)
  expect(Math.abs((drift ?? NaN) + (trades ?? NaN) - positions)).toBeLessThan(1e-12 * to)

  await books.writeChange()
  await quiet()
  const cells = (await valuesAt('What changed', 'A1:L60')) as CellValue[][]
  const numbers = cells.flat().filter((value) => typeof value === 'number')
  for (const part of [drift, trades, volatilities, correlations]) expect(numbers).toContain(part)

  await books.close()
  const again = await reopen()
  while (again.state().working) await new Promise((resolve) => setTimeout(resolve, 10))
  expect(again.state().reporting.kept.map(({ note }) => note)).toEqual(['before', 'after'])
  await again.compareResults('1', '2')
  expect(again.state().reporting.change?.total).toEqual(change.total)
}, 120_000)

test('keeping a second result of one data date asks, and replaces on yes', async () => {
  const host = await desk()
  const { books, compute, user, quiet } = host
  await compute()
  await books.keepResult('first')
  user.type('Sheet1', 'C4', 0.35)
  await quiet()
  await books.keepResult('second')
  expect(books.state().reporting.kept.map(({ note }) => note)).toEqual(['first'])
  const [offer] = books.state().offers
  expect(offer).toMatchObject({ button: 'Replace it' })
  await offer?.accept()
  const { kept } = books.state().reporting
  expect(kept.map(({ note }) => note)).toEqual(['second'])
  expect(kept[0]?.volatility).toBe(books.state().breakdown?.decomposition.volatility)
  await books.removeResult(kept[0]?.id ?? '')
  expect(books.state().reporting.kept).toEqual([])
}, 120_000)

test('a removed book takes its kept results out of the workbook', async () => {
  const { books, compute, office } = await desk()
  await compute()
  await books.keepResult('')
  const saved = (): string[] => [...office.settings.keys()].filter((key) => /history|book/.test(key))
  expect(saved()).toHaveLength(2)
  await books.removeBook()
  expect(saved()).toEqual([])
}, 60_000)

test('the table of live functions refers to the cells of the book, and says why where cells cannot give the figures', async () => {
  const host = await desk()
  const { books, compute, quiet, cells, user } = host
  await compute()
  await books.writeLive({ kind: 'new sheet' })
  await quiet()
  expect(books.state().faults).toEqual({})
  const { live } = books.state().reporting
  expect(live?.sheet).toBe('Risk, live')
  const typed = (await cells('Risk, live', 'A1:H40'))['formulas']!.flat().map(String)
  const breakdown = typed.find((formula) => formula.startsWith('=POISE.BREAKDOWN('))
  expect(breakdown).toContain('Sheet1!$A$4:$A$7')
  expect(breakdown).toContain('Sheet1!$C$4:$C$7')
  user.type('Returns', 'C20', '')
  await books.choose({ gaps: 'own overlap' })
  await books.writeLive({ kind: 'new sheet' })
  expect(books.state().faults.table).toBe(
    'Worksheet functions take dates that all holdings share: the rule chosen for gaps has no part in them; values, or the proof, can be written.',
  )
}, 120_000)

test('the committee page is written from figures that stand, with what changed since the last kept result', async () => {
  const host = await desk()
  const { books, compute, user, quiet } = host
  await books.writeCommittee({ paper: 'A4', preparedBy: '' })
  expect(books.state().faults.report).toBe('Nothing is computed yet; Compute comes first.')
  await compute()
  await books.keepResult('')
  user.type('Sheet1', 'C4', 0.35)
  await quiet()
  await books.writeCommittee({ paper: 'A4', preparedBy: 'The risk desk' })
  const texts = (await shown(host, 'Committee page', 120)).flat().map(String).join('\n')
  expect(texts).toContain('The risk desk')
  expect(texts).toMatch(/kept/i)
  expect(texts).toMatch(/not advice/)
}, 120_000)

test('a back-test and a bootstrap are written to sheets of their own, the first with a chart', async () => {
  const host = await desk()
  const { books, compute, office } = host
  await compute()
  await books.backtest({ window: 30, confidence: 0.95, method: 'normal' }, 'this book')
  await books.writeStudy('back-test')
  const tests = (await shown(host, 'Back-test', 70)).flat()
  expect(tests).toContain('Unconditional coverage (Kupiec)')
  await books.bootstrap({ replicates: 50, seed: 1, blockLength: 1 })
  await books.writeStudy('bootstrap')
  expect((await shown(host, 'Bootstrap', 40)).flat()).toContain('Harbour bonds')
  const charts = await office.Excel.run(async (context) => {
    const { charts: found } = context.workbook.worksheets.getItem('Back-test')
    found.load('items/name')
    await context.sync()
    return found.items.map(({ name }) => name)
  })
  expect(charts).toHaveLength(1)
  expect(charts[0]).toMatch(/^Line chart of the returns of 30 dates/)
}, 60_000)

test('without figures nothing is kept, compared or proven, and it is said where', async () => {
  const { books } = await desk()
  await books.writeProof()
  await books.keepResult('')
  await books.writeChange()
  const { faults } = books.state()
  expect(faults.proof).toBe('Nothing is computed yet; Compute comes first.')
  expect(faults.history).toBe('Nothing is compared yet; Compare comes first.')
})
