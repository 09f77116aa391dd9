/**
 * Committee pages of many books: none is printed small, and those written over the port, saved by the desk and printed by LibreOffice are one page
 * each. The books are made up.
 */
import { saveWorkbook } from '../../src/desk/files'
import type { Breakdown, Table } from '../../src/sheet'
import { committeePage } from '../../src/sheet/committee-page'
import { itInCalc, pagesOf } from '../calc'
import { changeSince, demoBook, inputOf, keptResults, madeBook } from '../committee-books'
import { closeAll, open } from './workbook-fixture'

afterAll(closeAll)

type Kind = { readonly name: string; readonly paper: 'A4' | 'Letter'; readonly kept?: number; readonly book: () => Promise<Breakdown> } // prettier-ignore
const demo = () => demoBook(true)
const KINDS: readonly Kind[] = [
  { name: 'demo on A4', paper: 'A4', kept: 9, book: demo },
  { name: 'demo on Letter', paper: 'Letter', kept: 9, book: demo },
  { name: 'demo without limits', paper: 'A4', book: () => demoBook(false) },
  { name: '5 positions', paper: 'Letter', book: () => madeBook({ positions: 5, weight: () => 0.2 }) },
  { name: '500 positions', paper: 'Letter', kept: 4, book: () => madeBook({ positions: 500, weight: (k) => (k % 7 === 3 ? -0.001 : 0.0025), groups: 2 }) },
  { name: 'market-neutral', paper: 'A4', book: () => madeBook({ positions: 20, weight: (k) => (k % 2 ? -0.1 : 0.1), groups: 1 }) },
  { name: 'covariance matrix', paper: 'A4', book: () => madeBook({ positions: 12, weight: () => 1 / 12, groups: 2, isMatrix: true }) },
  { name: 'long names', paper: 'Letter', kept: 12, book: () => madeBook({ positions: 30, weight: (k) => (k % 9 === 2 ? -0.05 : 0.05), groups: 6, areNamesLong: true }) },
] // prettier-ignore

/** those that fill their page most, and the one with least of a book: printing takes seconds for each */
const FULLEST = KINDS.filter(({ kept, name }) => kept !== undefined || name === 'covariance matrix')

const pages = new Map<Kind, Promise<Table>>()
function pageOf(kind: Kind): Promise<Table> {
  const known = pages.get(kind) ?? laidOut(kind)
  pages.set(kind, known)
  return known
}

async function laidOut({ paper, kept = 0, book }: Kind): Promise<Table> {
  const breakdown = await book()
  const history = keptResults(kept, breakdown.decomposition.volatility, breakdown.active?.risk.trackingError ?? null)
  const last = history.at(-1)
  return committeePage(inputOf(breakdown, { paper, history, change: last ? changeSince(last, breakdown) : null }))
} // prettier-ignore

/** Points of paper between margins of half an inch at the sides, and three quarters at the top and the bottom. */
const SPACE = { A4: [595.3 - 72, 841.9 - 108], Letter: [612 - 72, 792 - 108] } as const

/** How much the page is made smaller to fit, from widths of columns in characters and plain rows of 15 points. */
function scaleOf({ cells, widths, page }: Table): number {
  const [width, height] = SPACE[page!.paper]
  const across = widths.reduce((sum, characters) => sum + (7 * characters + 5) * 0.75, 0)
  return Math.min(width / across, height / (15 * cells.length))
}

test.each(KINDS)(
  'the page of $name is printed at 71% of its size or more',
  async (kind) => {
    expect(scaleOf(await pageOf(kind))).toBeGreaterThan(0.71)
  },
  60_000,
)

test('a page is written in one request that changes the workbook', async () => {
  const { office, book } = open()
  const table = await pageOf(KINDS[0]!)
  office.counts.reset()
  await book.write({
    sheet: 'Committee page',
    patches: [{ at: { sheet: 'Committee page', row: 0, column: 0 }, table, over: 'blank' }],
  })
  expect(office.counts.writes).toBe(1)
})

itInCalc(
  'the fullest of them are one page each, with their charts',
  async () => {
    const { grid, book } = open()
    for (const kind of FULLEST)
      await book.write({
        sheet: kind.name,
        patches: [{ at: { sheet: kind.name, row: 0, column: 0 }, table: await pageOf(kind), over: 'blank' }],
      })
    const { count } = await pagesOf(new Uint8Array(await saveWorkbook(grid, new Map())))
    expect(count).toBe(FULLEST.length)
  },
  180_000,
)
