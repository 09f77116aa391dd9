/** What the Report view says of tables, the proof, the committee page, kept results and what changed. Every block here is typed for its test. */
import Committee from '../../../src/pane/committee'
import { changeSentence } from '../../../src/pane/change-words'
import CopyAndExport from '../../../src/pane/copy-export'
import KeptResults from '../../../src/pane/kept-results'
import { changePicture, riskPicture } from '../../../src/pane/picture-file'
import Proof from '../../../src/pane/proof'
import { htmlOf, shownNumber, textOf } from '../../../src/pane/table-copy'
import Waterfall from '../../../src/pane/waterfall'
import WhatChanged from '../../../src/pane/what-changed'
import type { Books, BooksState, Breakdown, CellValue, RiskChange, Table } from '../../../src/sheet'
import { addressOf, breakdownTable, changeSteps, openBooks } from '../../../src/sheet'
import { plainWorkbook } from '../sheet/plain-workbook'
import { draw } from './drawing'

// the pane asks the browser for its language; there is none here
beforeAll(() => {
  Object.defineProperty(globalThis, 'navigator', { value: { language: 'en-GB' }, configurable: true })
})
afterAll(() => {
  Reflect.deleteProperty(globalThis, 'navigator')
})

const SERIES = ['Meadow', '=Orchard', 'Mill & Weir', 'Meadow hedge']
const FRIDAY = 46353
const RETURNS: CellValue[][] = [
  ['Week ending', ...SERIES],
  ...Array.from({ length: 40 }, (_, t) => {
    const [meadow, ...rest] = SERIES.slice(0, 3).map((_, i) =>
      Number((0.02 * Math.sin(1 + 1.7 * t + 2.3 * i * i) + 0.005 * ((t * (i + 1)) % 3)).toFixed(5)),
    )
    return [FRIDAY - 7 * (39 - t), meadow!, ...rest, Number((meadow! + 0.001 * (t % 2)).toFixed(5))]
  }),
]
const HOLDINGS: CellValue[][] = [
  ['Holding', 'Class', 'Weight'],
  ['Meadow', 'Land', 0.5],
  ['=Orchard', 'Land', 0.3],
  ['Mill & Weir', 'Works', 0.2],
  ['Meadow hedge', 'Hedges', -0.2],
]

const running: Books[] = []
afterEach(async () => {
  for (const books of running.splice(0)) await books.close()
})

async function book() {
  const workbook = plainWorkbook({ Book: HOLDINGS.map((row) => [...row]), Returns: RETURNS })
  const books = await openBooks(workbook.port)
  running.push(books)
  const take = async (field: 'holdings' | 'returns', sheet: string, block: CellValue[][]) => {
    workbook.select(
      addressOf({ sheet, row: 0, column: 0, rows: block.length, columns: block[0]?.length ?? 1 }),
    )
    await books.takeSelection(field)
  }
  await take('holdings', 'Book', HOLDINGS)
  await take('returns', 'Returns', RETURNS)
  await books.compute()
  const breakdown = (): Breakdown => {
    const found = books.state().breakdown
    if (!found) throw new Error('no figures')
    return found
  }
  const asked = () => undefined
  const changed = () => draw(<WhatChanged state={books.state()} fault={undefined} asked={asked} />, books)
  const kept = () =>
    draw(<KeptResults state={books.state()} canKeep fault={undefined} asked={asked} />, books)
  return { workbook, books, breakdown, changed, kept }
}

/** As `books`, with another state. */
const withState = (books: Books, change: Partial<BooksState>): Books => {
  const state = { ...books.state(), ...change }
  return Object.assign(Object.create(books) as Books, {
    state: () => state,
    subscribe: () => () => undefined,
  })
}

/** A figure such as "+0.12" or "8.3%". */
const figure = (cell: string | undefined): number =>
  Number(cell?.replace('\u2212', '-').replaceAll(/[%,+]/g, '').replace(' points', ''))

describe('a table on the clipboard', () => {
  const table: Table = {
    cells: [
      [
        { value: 'Contributions: a < b', format: '@', mark: 'title' },
        { value: '', format: '@' },
      ],
      [
        { value: '', format: '@' },
        { value: '', format: '@' },
      ],
      [
        { value: 'Holding', format: '@', mark: 'head' },
        { value: 'Weight', format: '@', mark: 'head' },
      ],
      [
        { value: '=Orch\tard', format: '@' },
        { value: 0.12345678901234566, format: '0.00%' },
      ],
    ],
    widths: [10, 10],
    numeric: [false, true],
  }

  test('is text with every digit, in the decimals of the workbook, and no text of it becomes a formula', () => {
    expect(textOf(table, ',')).toBe(
      "Contributions: a < b\r\n\r\nHolding\tWeight\r\n'=Orch ard\t0,12345678901234566",
    )
  })

  test('is HTML that shows numbers as the sheet does and keeps their digits for cells', () => {
    const html = htmlOf(table)
    expect(html).toMatch(/<td colspan="2"[^>]*>Contributions: a &lt; b<\/td>/)
    expect(html).toMatch(/<td[^>]* x:num="0.12345678901234566"[^>]*>12.35%<\/td>/)
    expect(html.match(/<tr>/g)).toHaveLength(4)
  })

  test('holds what the breakdown table holds, number by number', async () => {
    const { breakdown } = await book()
    const made = breakdownTable('Harbour', breakdown())
    const numbers = made.cells.flat().filter(({ value }) => typeof value === 'number')
    const pasted = textOf(made, '.')
      .split(/[\t\n\r]+/)
      .map(Number)
    // every double comes back from its own text
    for (const { value } of numbers) expect(pasted).toContain(value)
    expect(htmlOf(made).match(/x:num=/g)).toHaveLength(numbers.length)
  })

  test.each([
    // by hand, after the formats' own rules
    [-0.08341, '0.00%', '-8.34%'],
    [0.0027, '+0.00%;-0.00%;0.00%', '+0.27%'],
    [-0.0027, '+0.00%;-0.00%;0.00%', '-0.27%'],
    [0, '+0.00%;-0.00%;0.00%', '0.00%'],
    [1234567.891, '#,##0.00', '1,234,567.89'],
    [1.5e-17, '0.0E+00', '1.5E-17'],
    [-12, '0.0E+00', '-1.2E+01'],
    [FRIDAY, 'd mmm yyyy', '27 Nov 2026'],
    [0.123456789, 'General', '0.123456789'],
  ])('%d in the format %s shows as %s', (value, format, shown) => {
    expect(shownNumber(value, format)).toBe(shown)
  })
})

describe('the picture of weight and share of risk', () => {
  test('says on its own what it is, of when, and each figure in it; risk-reducing positions are hatched', async () => {
    const { breakdown } = await book()
    const { svg, alt, name } = riskPicture('Harbour <1>', breakdown())
    expect(name).toBe('Harbour 1 weight and risk 2026-11-27')
    for (const text of [
      'Weight and share of risk: Harbour &lt;1&gt;',
      '27 Nov 2026',
      'Mill &amp; Weir',
      'not advice',
      'Total',
    ])
      expect(svg).toContain(text)
    expect(svg.match(/<rect[^>]*fill="url\(#hatch\)"/g)).toHaveLength(2) // the key and the hedge
    expect(alt).toContain('4 positions')
    const { decomposition } = breakdown()
    for (const share of decomposition.share ?? [])
      expect(svg).toContain(
        `>${(Math.abs(share) * 100).toFixed(1)}%`.replace('>', share < 0 ? '>\u2212' : '>'),
      )
  })

  test('of a long book shows the largest and the most risk-reducing, and the others as one row that adds up', async () => {
    const { breakdown } = await book()
    const one = breakdown()
    const n = 60
    const share = Float64Array.from({ length: n }, (_, i) => (i < 50 ? 0.022 : -0.01))
    const weights = new Float64Array(n).fill(1 / n)
    const long: Breakdown = {
      ...one,
      names: Array.from({ length: n }, (_, i) => `Holding ${i + 1}`),
      bands: 'None here.',
      decomposition: { ...one.decomposition, weights, share, contribution: share.map((s) => s * 0.1) },
    }
    const { svg } = riskPicture('Long', long)
    // 20 and 8 are drawn; of the 32 others 30 have 2.2% and 2 have -1%
    expect(svg).toContain('and 32 others, together')
    expect(svg).toContain('>64.0%<')
    expect(svg).toContain('>53.3%<')
  })

  test('shows contributions, and why, where shares are withheld', async () => {
    const { breakdown } = await book()
    const { svg } = riskPicture('Even', { ...breakdown(), sharesWithheld: 'Shares are withheld here.' })
    expect(svg).toContain('Weight and contribution to risk: Even')
    expect(svg).toContain('Shares are withheld here.')
  })
})

describe('kept results', () => {
  test('are listed newest first with their dates, notes and volatility, and none is said to be none', async () => {
    const { books, kept } = await book()
    expect(kept().said).toContain('None is kept yet.')
    await books.keepResult('for the November meeting')
    expect(books.state().faults).toEqual({})
    const { said } = kept()
    expect(said).toContain('Data to 27 Nov 2026')
    expect(said).toContain('for the November meeting')
    expect(said).toContain('4 positions')
  })

  test('can be seen and compared while nothing is computed', async () => {
    const { books } = await book()
    await books.keepResult('')
    const waiting = withState(books, { breakdown: null })
    const shown = draw(
      <KeptResults state={waiting.state()} canKeep={false} fault={undefined} asked={() => undefined} />,
      waiting,
    )
    expect(shown.said).toContain('Data to 27 Nov 2026')
    expect(shown.said).not.toContain('Keep this result')
    expect(
      draw(<WhatChanged state={waiting.state()} fault={undefined} asked={() => undefined} />, waiting).said,
    ).toContain('needs another kept result')
  })
})

describe('what changed', () => {
  const change = async (): Promise<Awaited<ReturnType<typeof book>> & { change: RiskChange }> => {
    const made = await book()
    await made.books.keepResult('before')
    made.workbook.type('Book!C2', 0.35)
    await made.books.compute()
    await made.books.compareResults('1', 'now')
    const { change: found } = made.books.state().reporting
    if (!found) throw new Error(JSON.stringify(made.books.state().faults))
    return { ...made, change: found }
  }

  test('needs a kept result, and says so', async () => {
    const { changed } = await book()
    expect(changed().said).toContain('needs a kept result')
  })

  test('tells both volatilities, the parts, and rows that add up to them', async () => {
    const { changed, change: found } = await change()
    const { said, rows } = changed()
    expect(said).toContain(changeSentence(found))
    expect(said).toMatch(/Parts add up to [^,]+, the change is [^,]+, difference 0.0000 points/)
    const [head, ...lines] = rows
    expect(head).toHaveLength(5)
    const total = lines.at(-1)!
    expect(total[0]).toBe('Total')
    for (const column of [1, 2, 3, 4]) {
      const sum = lines.slice(0, -1).reduce((all, line) => all + figure(line[column]), 0)
      // four rows rounded to two decimals
      expect(Math.abs(sum - figure(total[column]))).toBeLessThan(0.0251)
    }
    expect(figure(total[1])).toBe(Number((100 * found.change).toFixed(2)))
  })

  test('draws each step from where the last one ended, falls hatched', async () => {
    const { change: found } = await change()
    const { markup, said } = draw(<Waterfall change={found} />)
    const steps = changeSteps(found)
    for (const { label } of steps) expect(said).toContain(label)
    const falls = steps.filter(({ start, end }) => end < start)
    // one more is in the key
    expect(markup.match(/fill="url\(#/g)).toHaveLength(falls.length + 1)
    const { svg, name } = changePicture('Harbour', found)
    expect(svg.match(/<rect[^>]*fill="url\(#hatch\)"/g)).toHaveLength(falls.length + 1)
    expect(svg).toContain('not advice')
    expect(name).toBe('Harbour what changed 2026-11-27')
  })

  test('that is not split says why, and shows no parts', async () => {
    const { books, change: found } = await change()
    const line = {
      drift: null,
      trades: null,
      positions: NaN,
      volatilities: NaN,
      correlations: NaN,
      settings: NaN,
    }
    const unsplit: RiskChange = {
      ...found,
      total: 'The mixed correlations are no correlation matrix.',
      sum: NaN,
      difference: NaN,
      holdings: found.holdings.map((held) => ({ ...held, ...line })),
      groups: [],
    }
    const reporting = { ...books.state().reporting, change: unsplit }
    const other = withState(books, { reporting })
    const { said, rows } = draw(
      <WhatChanged state={other.state()} fault={undefined} asked={() => undefined} />,
      other,
    )
    expect(said).toContain('The mixed correlations are no correlation matrix.')
    expect(said).not.toContain('add up to')
    expect(said).not.toContain('NaN')
    expect(rows[0]).toHaveLength(2)
  })

  test('against figures that have moved since asks to compare again', async () => {
    const { books, workbook, changed } = await change()
    expect(changed().said).not.toContain('Compare again')
    workbook.type('Book!C2', 0.45)
    await books.compute()
    expect(changed().said).toContain('Compare again')
  })
})

test('the proof says whether our figures in it are those that stand now', async () => {
  const { books, breakdown } = await book()
  const said = (isCurrent: boolean | null): string => {
    const area = { sheet: 'Proof', row: 0, column: 0, rows: 9, columns: 9 }
    const state = { ...books.state(), reporting: { ...books.state().reporting, proof: { area, isCurrent } } }
    return draw(<Proof state={state} breakdown={breakdown()} />, books).said
  }
  expect(draw(<Proof state={books.state()} breakdown={breakdown()} />, books).said).toContain('Write proof')
  expect(said(true)).toContain('are those that stand now.')
  expect(said(false)).toContain('older than those that stand now')
  expect(said(null)).toContain('shows once it is refreshed')
  expect(said(true)).toContain('Refresh proof')
})

test('the committee page says what belongs on it and is not there', async () => {
  const { books, breakdown } = await book()
  const said = () => draw(<Committee state={books.state()} breakdown={breakdown()} />, books).said
  expect(said()).toContain('No limits are set')
  expect(said()).toContain('No result is kept yet')
  await books.keepResult('')
  expect(said()).not.toContain('No result is kept yet')
  expect(said()).toContain('Risk through time needs 3 kept results; 1 is kept.')
})

test('the export names what is drawn', async () => {
  const { books, breakdown } = await book()
  expect(draw(<CopyAndExport state={books.state()} breakdown={breakdown()} />, books).said).toContain(
    'Picture: weight and share of risk',
  )
})
