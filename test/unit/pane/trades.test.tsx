/** The view Trades as it is drawn over a workbook of plain arrays. Every block here is typed for its test. */
import fc from 'fast-check'
import { Apply } from '../../../src/pane/apply'
import { BeforeAfter } from '../../../src/pane/before-after'
import { digitsApart, pointsText } from '../../../src/pane/measure'
import { TradeList } from '../../../src/pane/trade-list'
import { around, TextFaultMessage } from '../../../src/pane/typed-text'
import type { Books, Breakdown, CellValue, Comparison, TradeChange, TradesState } from '../../../src/sheet'
import { addressOf, openBooks } from '../../../src/sheet'
import { plainWorkbook } from '../sheet/plain-workbook'
import { draw } from './drawing'

const SERIES = ['Meadow', 'Orchard', 'Mill', 'Quarry', 'Ferry']
const RETURNS: CellValue[][] = [
  SERIES,
  ...Array.from({ length: 40 }, (_, t) =>
    SERIES.map((_, i) =>
      Number((0.02 * Math.sin(1 + 1.7 * t + 2.3 * i * i) + 0.005 * ((t * i) % 3)).toFixed(5)),
    ),
  ),
]
const HOLDINGS: CellValue[][] = [
  ['Holding', 'Class', 'Weight', 'Limit on weight'],
  ['Meadow', 'Land', 0.4, 0.35],
  ['Orchard', 'Land', 0.3, 0.5],
  ['Mill', 'Works', 0.2, 0.5],
  ['Quarry', 'Works', 0.1, 0.5],
]

const running: Books[] = []
afterEach(async () => {
  for (const books of running.splice(0)) await books.close()
})

async function book(holdings: CellValue[][] = HOLDINGS, returns: CellValue[][] = RETURNS) {
  const workbook = plainWorkbook({ Book: holdings.map((row) => [...row]), Returns: returns })
  const books = await openBooks(workbook.port)
  running.push(books)
  workbook.select(`Book!A1:D${holdings.length}`)
  await books.takeSelection('holdings')
  const width = returns[0]?.length ?? 1
  workbook.select(addressOf({ sheet: 'Returns', row: 0, column: 0, rows: returns.length, columns: width }))
  await books.takeSelection('returns')
  await books.compute()
  const trades = (): TradesState => {
    const state = books.state().trades
    if (!state) throw new Error('no trades')
    return state
  }
  const breakdown = (): Breakdown => {
    const found = books.state().breakdown
    if (!found) throw new Error('no figures')
    return found
  }
  const comparison = (): Comparison => {
    const found = trades().comparison
    if (typeof found === 'string') throw new Error(found)
    return found
  }
  const trade = async (...changes: TradeChange[]): Promise<void> => {
    for (const change of changes) books.trade(change)
    while (trades().loading) await new Promise((resolve) => setTimeout(resolve, 5))
  }
  const list = () => draw(<TradeList trades={trades()} fault={undefined} asked={() => undefined} />)
  const sides = (compared: Comparison | string = trades().comparison) =>
    draw(<BeforeAfter comparison={compared} trades={trades()} breakdown={breakdown()} />)
  const writing = (fault?: string) =>
    draw(<Apply trades={trades()} busy={false} fault={fault} asked={() => undefined} />)
  return { ...workbook, books, trades, comparison, trade, list, sides, writing }
}

const becomes = (key: string, text: string): TradeChange => ({ line: { key, entry: 'new weight', text } })
const changes = (key: string, text: string): TradeChange => ({ line: { key, entry: 'change', text } })

/** What the two fields of a line say: the text typed into them, or else the figure they show. */
const fields = (markup: string, key: string): readonly string[] =>
  ['Change of weight', 'New weight'].map((label) => {
    const input = new RegExp(`<input[^>]*aria-label="${label}: ${key}"[^>]*>`).exec(markup)?.[0] ?? ''
    const attribute = (name: string) => new RegExp(`${name}="([^"]*)"`).exec(input)?.[1] ?? ''
    return attribute('value') || attribute('placeholder')
  })
/** Whether a button can be pressed. */
const isLive = (markup: string, name: string): boolean => {
  const button = new RegExp(`<button(?:(?!<button)[^>])*>(?:(?!</button>).)*${name}</button>`).exec(
    markup,
  )?.[0]
  if (button === undefined) throw new Error(`no button ${name}`)
  return !button.includes('aria-disabled="true"')
}

describe('the list of trades', () => {
  test('has every holding with its weight, and nothing changed until something is typed', async () => {
    const { list } = await book()
    const { rows, markup } = list()
    expect(rows.slice(1).map(([name, before]) => [name, before])).toEqual([
      ['Meadow', '40.00%'],
      ['Orchard', '30.00%'],
      ['Mill', '20.00%'],
      ['Quarry', '10.00%'],
    ])
    expect(fields(markup, 'Meadow')).toEqual(['–', '40.00%'])
  })

  test('shows a new weight as the change it is, and a change as the weight it leads to', async () => {
    const { list, trade } = await book()
    await trade(becomes('Meadow', '35%'), changes('Mill', '0.5%'), changes('Quarry', '-2%'))
    const { markup, said } = list()
    // by hand: 35 - 40, 20 + 0.5, 10 - 2
    expect(fields(markup, 'Meadow')).toEqual(['\u22125.00%', '35%'])
    expect(fields(markup, 'Mill')).toEqual(['0.5%', '20.50%'])
    expect(fields(markup, 'Quarry')).toEqual(['-2%', '8.00%'])
    expect(said).toContain('3 of 4 weights changed.')
  })

  test('shows the effect of a rule line by line, with the word for who moved it', async () => {
    const { list, trade } = await book()
    await trade(
      { rule: 'weight > 25% ? weight * 0.9 : weight' },
      { financing: { kind: 'position', key: 'Quarry' } },
    )
    const { markup, rows } = list()
    // by hand: 40% and 30% lose a tenth, 7% in all, and Quarry takes it
    expect(SERIES.slice(0, 4).map((key) => fields(markup, key)[1])).toEqual([
      '36.00%',
      '27.00%',
      '20.00%',
      '17.00%',
    ])
    expect(rows.slice(1).map(([name]) => name)).toEqual([
      'Meadow by the rule',
      'Orchard by the rule',
      'Mill',
      'Quarry pays for the trades',
    ])
  })

  test('shows a longer text in full below its line, and a fault with a caret below its place', async () => {
    const { list, trade } = await book()
    await trade(becomes('Meadow', 'min(weight, 5%)'))
    expect(list().markup).toMatch(/<pre[^>]*>min\(weight, 5%\)<\/pre>/)
    await trade(becomes('Meadow', 'weight * wieght'))
    const { markup, said } = list()
    expect(said).toContain('wieght')
    // by hand: the ninth character after the first
    expect(markup).toMatch(/<pre[^>]*>weight \* wieght\n<span[^>]*> {9}\^<\/span><\/pre>/)
    expect(/<input[^>]*aria-label="New weight: Meadow"[^>]*>/.exec(markup)?.[0]).toContain(
      'aria-invalid="true"',
    )
  })

  test('tells a rule that has no weight for some holdings once, with the rule, and marks their lines', async () => {
    const { list, trade, trades } = await book()
    await trade({ rule: 'weight / (weight - 20%) - benchmark' })
    const { said, rows } = list()
    const [first] = trades().lines.flatMap(({ fault }) => fault ?? [])
    expect(said.split(first?.sentence ?? '?')).toHaveLength(2)
    expect(said).toContain('So it is for 3 more holdings.')
    expect(rows.slice(1).map(([name]) => name)).toEqual(
      SERIES.slice(0, 4).map((name) => `${name} no weight by the rule`),
    )
  })

  test('says of a group that no holding is in that it is none, and the rule counts all the same', async () => {
    const { list, trade, sides } = await book()
    await trade({ rule: 'group == "Lnad" ? 0% : weight * 0.5' })
    expect(list().said).toContain('No holding is in a group “Lnad”.')
    expect(fields(list().markup, 'Meadow')[1]).toBe('20.00%')
    expect(sides().said).toContain('Net weight 100.00% 50.00%')
  })

  test('marks a weight edited in the sheet since the comparison began', async () => {
    const { list, type, books, trades } = await book()
    type('Book!C2', 0.38)
    while (trades().lines[0]?.sheet !== 0.38) await new Promise((resolve) => setTimeout(resolve, 50))
    expect(list().rows[1]?.[0]).toBe('Meadow edited in the sheet: 38.00%')
    books.compareFromHere()
    expect(list().rows[1]?.slice(0, 2)).toEqual(['Meadow', '38.00%'])
  })

  test('of a long book holds only what moves: what was asked for first, then what pays for it', async () => {
    const names = Array.from({ length: 48 }, (_, i) => `Field ${i + 1}`)
    const { list, trade } = await book(
      [
        ['Holding', 'Class', 'Weight', 'Limit on weight'],
        ...names.map((name, i): CellValue[] => [name, `Class ${i % 3}`, 1 / 48, 0.5]),
      ],
      [names, ...Array.from({ length: 12 }, (_, t) => names.map((_, i) => 0.01 * Math.sin(t + i * i)))],
    )
    expect(list().rows).toEqual([])
    expect(list().said).toContain('Find a holding first, or show all.')
    await trade(becomes('Field 40', '1%'), { financing: { kind: 'position', key: 'Field 3' } })
    expect(
      list()
        .rows.slice(1)
        .map(([name]) => name),
    ).toEqual(['Field 40', 'Field 3 pays for the trades'])
  })

  test('of a large book shows weights in three decimals, since its changes are small', async () => {
    const names = Array.from({ length: 61 }, (_, i) => `Field ${i + 1}`)
    const { list, trade } = await book(
      [
        ['Holding', 'Class', 'Weight', 'Limit on weight'],
        ...names.map((name, i): CellValue[] => [name, `Class ${i % 3}`, 0.016, 0.5]),
      ],
      [names, ...Array.from({ length: 12 }, (_, t) => names.map((_, i) => 0.01 * Math.sin(t + i * i)))],
    )
    await trade(becomes('Field 40', '1.24%'), { financing: { kind: 'pro rata' } })
    const { rows, markup } = list()
    expect(rows[1]?.[1]).toBe('1.600%')
    // by hand: 0.36% sold, a sixtieth of it to each of the others
    expect(fields(markup, 'Field 40')[0]).toBe('\u22120.360%')
    expect(fields(markup, 'Field 1')).toEqual(['+0.006%', '1.606%'])
  })

  test('names a series that is not held, which can be added and taken off', async () => {
    const { list, books } = await book()
    expect(list().said).toContain('Series that are not held (1)')
    await books.addCandidate('Ferry')
    const { rows, markup } = list()
    expect(rows.at(-1)?.slice(0, 2)).toEqual(['Ferry not held', '0.00%'])
    expect(markup).toContain('aria-label="Take Ferry off the list"')
  })
})

describe('before and after', () => {
  test('net, gross and turnover stand as the trades make them, and who pays is said', async () => {
    const { sides, trade } = await book()
    await trade(becomes('Meadow', '35%'), changes('Mill', '2%'))
    const { rows, said } = sides()
    const row = (name: string) => rows.find(([first]) => first === name)?.slice(1)
    // by hand: 5 sold, 2 bought
    expect(row('Net weight')).toEqual(['100.00%', '97.00%', '\u22123.00'])
    expect(row('Gross weight')).toEqual(['100.00%', '97.00%', '\u22123.00'])
    expect(row('Turnover, one way')).toEqual(['', '5.00%', ''])
    expect(said).toContain('Paid for by: cash beyond the holdings; nothing else moves.')
    await trade({ financing: { kind: 'position', key: 'Quarry' } })
    expect(sides().said).toContain('Paid for by: the holding “Quarry”.')
    // by hand: 5 sold, 2 bought and 3 more by Quarry
    expect(sides().rows.find(([first]) => first === 'Net weight')).toEqual([
      'Net weight',
      '100.00%',
      '100.00%',
      '0.00',
    ])
  })

  test('the estimate from sensitivities stands beside the exact figure, in decimals that tell them apart', async () => {
    const { sides, trade, comparison } = await book()
    await trade(becomes('Meadow', '35%'))
    const now = comparison()
    const told = (foretold: number, exact: number): string =>
      sides({
        ...now,
        firstOrder: { volatility: foretold, contribution: new Float64Array(4) },
        after: { ...now.after, decomposition: { ...now.after.decomposition, volatility: exact } },
        before: { ...now.before, decomposition: { ...now.before.decomposition, volatility: 0.09 } },
      }).said
    expect(told(0.0821, 0.0819)).toContain(
      'Sensitivities foretell a volatility of 8.21%, exact 8.19%; before the trades 9.00%.',
    )
    expect(told(0.08191, 0.08192)).toContain('a volatility of 8.1910%, exact 8.1920%;')
    expect(sides({ ...now, firstOrder: null }).said).toContain('there was no risk before')
  })

  test('a limit over on either side is told with its mark and word on both', async () => {
    const { sides, trade } = await book()
    await trade(becomes('Meadow', '34%'))
    const { said } = sides()
    expect(said).toContain('Before: 4 limits: 1 breached and 3 within. After: 4 limits: 4 within.')
    expect(said).toContain('● Breach → ○ Within : weight of “Meadow”, 40.00% → 34.00%; hard limit 35.00%')
  })

  test('groups and holdings are headed by what changes most', async () => {
    const { sides, trade, comparison } = await book()
    await trade(becomes('Meadow', '20%'))
    const { before, after } = comparison()
    const share = (i: number) =>
      [before, after].map(({ decomposition }) => (decomposition.share?.[i] ?? 0) * 100)
    const moves = [0, 1, 2, 3].map((i) => Math.abs(share(i)[1]! - share(i)[0]!))
    const most = moves.indexOf(Math.max(...moves))
    expect(sides().said).toContain(
      `Holdings before and after Share of risk, largest change: ${SERIES[most]}: ${share(most)
        .map((figure) => `${figure.toFixed(1).replace('-', '\u2212')}%`)
        .join(' → ')}`,
    )
  })

  test('groups are headed by what changes most in any of their columns', async () => {
    const { sides, trade } = await book([
      ['Holding', 'Class', 'Weight', 'Place'],
      ['Meadow', 'All', 0.4, 'Hill'],
      ['Orchard', 'All', 0.3, 'Vale'],
      ['Mill', 'All', 0.2, 'Vale'],
      ['Quarry', 'All', 0.1, 'Vale'],
    ])
    await trade(becomes('Meadow', '0%'))
    // the one class has all of the risk before and after
    expect(sides().said).toMatch(
      /Groups before and after Share of risk, largest change: (Hill: \S+% → 0.0%|Vale: \S+% → 100.0%)/,
    )
  })

  test('who pays is said of what is typed, not of a proposal, which says it itself, nor of what is in the sheet already', async () => {
    const { sides, books, trade, trades } = await book()
    await books.propose({ kind: 'smallest change', turnover: null, lot: null, net: 'kept', against: 'hard' })
    expect(trades().proposal?.met).toBe(true)
    expect(sides().said).not.toContain('Paid for by')
    books.discardTrades()
    await trade(becomes('Meadow', '35%'))
    expect(sides().said).toContain('Paid for by: cash')
    await books.applyTrades({ replaceFormulas: false })
    while (trades().lines[0]?.sheet !== 0.35) await new Promise((resolve) => setTimeout(resolve, 50))
    expect(sides().said).toContain('All changes are in the sheet already. Turnover')
    expect(sides().said).not.toContain('Paid for by')
  })

  test('figures and their limits are told apart however small they are, and as far as four decimals can', () => {
    // by hand
    expect(digitsApart(0.159, 0.15)).toBe(2)
    expect(digitsApart(0.000523, 0.0005)).toBe(3)
    expect(digitsApart(0.050001, null, 0.05)).toBe(4)
    expect(digitsApart(0.05, 0.05 + 1e-9, 0.1)).toBe(2)
  })

  test('where nothing can be compared the reason stands alone', async () => {
    const { sides } = await book()
    expect(sides().rows).toEqual([])
    expect(sides().said).toBe('Before and after No weight differs from those compared from.')
  })

  test('differences read in points, with a sign unless they round to nothing', () => {
    expect([0.0234, -0.0234, 0.00001, -0.00001].map((difference) => pointsText(difference, 2))).toEqual([
      '+2.34',
      '\u22122.34',
      '0.00',
      '0.00',
    ])
  })
})

describe('writing to the sheet', () => {
  test('counts the cells that would change, and can be applied or discarded', async () => {
    const { writing, trade } = await book()
    const idle = writing()
    expect(idle.said).toContain('Nothing to write: the sheet holds these weights.')
    expect(['Apply', 'Discard', 'Undo'].map((name) => isLive(idle.markup, name))).toEqual([
      false,
      false,
      false,
    ])
    await trade(becomes('Meadow', '35%'), changes('Mill', '5%'))
    const { said, markup } = writing()
    expect(said).toContain('2 cells would change')
    expect(['Apply', 'Discard', 'Undo'].map((name) => isLive(markup, name))).toEqual([true, true, false])
  })

  test('waits for a tick where a formula would give way to a number', async () => {
    const { writing, trade, put, books } = await book()
    put('Book!C2', 0.4, '=2/5')
    await books.compute()
    await trade(becomes('Meadow', '35%'))
    const { said, markup } = writing()
    expect(said).toContain('Numbers may take the place of 1 formula')
    expect(isLive(markup, 'Apply')).toBe(false)
  })

  test('says why it cannot be, and not twice what stands with a typed text', async () => {
    const { writing, trade, books } = await book()
    await books.addCandidate('Ferry')
    await trade(becomes('Ferry', '1%'))
    const { said, markup } = writing()
    expect(said).toContain('“Ferry” has no row in Book!A1:D5')
    expect(isLive(markup, 'Apply')).toBe(false)
    await trade(becomes('Ferry', ''), { rule: 'weight +' })
    expect(writing().said).not.toContain('ends here')
    expect(isLive(writing().markup, 'Apply')).toBe(false)
  })

  test('offers to undo what was applied, and to compare from there', async () => {
    const { writing, trade, books, trades } = await book()
    await trade(becomes('Meadow', '35%'))
    await books.applyTrades({ replaceFormulas: false })
    while (trades().lines[0]?.sheet !== 0.35) await new Promise((resolve) => setTimeout(resolve, 50))
    const { said, markup } = writing()
    expect(said).toContain('1 weight written to the sheet by Apply; Undo puts back what stood there.')
    expect(['Apply', 'Undo', 'Compare from here'].map((name) => isLive(markup, name))).toEqual([
      false,
      true,
      true,
    ])
    expect(writing('Book!C2 was edited since.').said).toContain('Book!C2 was edited since.')
  })
})

describe('the place in a typed text', () => {
  test('stands below the very character, also in a text too long for the pane', () => {
    fc.assert(
      fc.property(fc.string({ maxLength: 120 }), fc.nat(120), (text, somewhere) => {
        const place = Math.min(somewhere, text.length)
        const { stretch, at } = around(text, place, 20)
        expect(stretch.length).toBeLessThanOrEqual(20)
        expect(at).toBeGreaterThanOrEqual(0)
        expect(at).toBeLessThanOrEqual(stretch.length)
        // what stands there is the character itself, or nothing behind the end
        expect(stretch.charAt(at)).toBe(text.charAt(place))
      }),
    )
  })

  test('is left out where a fault is about the whole', () => {
    const { said, markup } = draw(
      <TextFaultMessage text="12" fault={{ sentence: 'Found 12: write 12%.', column: null }} />,
    )
    expect(said).toBe('Found 12: write 12%.')
    expect(markup).not.toContain('<pre')
  })
})
