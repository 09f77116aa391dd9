/**
 * A list of trades from the first key to the cells, over a workbook of plain arrays. Figures are held against the definition worked out loop by
 * loop, from numbers made here for these tests alone.
 */
import type { Books, CellValue, Comparison, Settings, TradesState } from '../../../src/sheet'
import { openBooks, steppingCalculator } from '../../../src/sheet'
import { plainWorkbook } from './plain-workbook'

const NAMES = ['Meadow', 'Orchard', 'Mill', 'Quarry', 'Ferry']
const WEEKS = 120
const value = (t: number, i: number): number =>
  Number((0.02 * Math.sin(1 + 1.7 * t + 2.3 * i * i + 0.1 * t * i) + 0.01 * Math.sin(t * t)).toFixed(6))
const ROWS = Array.from({ length: WEEKS }, (_, t) => NAMES.map((_, i) => value(t, i)))
const RETURNS: CellValue[][] = [
  ['Week', ...NAMES],
  ...ROWS.map((row, t): CellValue[] => [45000 + 7 * t, ...row]),
]
const HOLDINGS: CellValue[][] = [
  ['Holding', 'Class', 'Weight', 'Limit on share of risk'],
  ['Meadow', 'Land', 0.4, 0.3],
  ['Orchard', 'Land', 0.3, 0.5],
  ['Mill', 'Works', 0.2, 0.5],
  ['Quarry', 'Works', 0.1, 0.5],
]
const LIMITS: CellValue[][] = [
  ['Scope', 'Name', 'Measure', 'Soft', 'Hard'],
  ['Class', 'Land', 'Weight', 0.5, 0.6],
  ['Total', '', 'Volatility', '', 0.5],
]

/** The oracle: volatility a year and contributions by the definition, divisor T - 1. */
function riskOf(weights: readonly number[]): { volatility: number; contributions: number[] } {
  const means = NAMES.map((_, i) => ROWS.reduce((sum, row) => sum + (row[i] ?? 0), 0) / WEEKS)
  const covariance = (i: number, j: number): number =>
    ROWS.reduce((sum, row) => sum + ((row[i] ?? 0) - means[i]!) * ((row[j] ?? 0) - means[j]!), 0) /
    (WEEKS - 1)
  const marginals = weights.map((_, i) => weights.reduce((sum, w, j) => sum + w * covariance(i, j), 0))
  const variance = weights.reduce((sum, w, i) => sum + w * marginals[i]!, 0) * 52
  return {
    volatility: Math.sqrt(variance),
    contributions: weights.map((w, i) => (w * marginals[i]! * 52) / Math.sqrt(variance)),
  }
}

const running: Books[] = []
afterEach(async () => {
  for (const books of running.splice(0)) await books.close()
})

async function desk(
  holdings: CellValue[][] = HOLDINGS,
  {
    returns = RETURNS,
    limits = LIMITS,
    settings = {},
  }: { returns?: CellValue[][]; limits?: CellValue[][]; settings?: Partial<Settings> } = {},
) {
  const sheets = {
    Book: holdings.map((row) => [...row]),
    Returns: returns.map((row) => [...row]),
    Limits: limits.map((row) => [...row]),
  }
  const workbook = plainWorkbook(sheets)
  const books = await openBooks(workbook.port)
  running.push(books)
  const take = async (
    field: 'holdings' | 'returns' | 'limits' | 'capital',
    address: string,
  ): Promise<void> => {
    workbook.select(address)
    await books.takeSelection(field)
  }
  await take('holdings', `Book!A1:D${holdings.length}`)
  await take('returns', `Returns!A1:${'ABCDEFGH'.charAt((returns[0]?.length ?? 1) - 1)}${WEEKS + 1}`)
  await books.choose(settings)
  await books.compute()
  const quiet = async () => {
    do await new Promise((resolve) => setTimeout(resolve, 150))
    while (books.state().working)
    return books.state()
  }
  const trades = (): TradesState => {
    const state = books.state().trades
    if (!state) throw new Error('no trades')
    return state
  }
  const comparison = (): Comparison => {
    const found = trades().comparison
    if (typeof found === 'string') throw new Error(found)
    return found
  }
  /** Types an expression, and waits for what reads it. */
  const settled = async (): Promise<TradesState> => {
    while (trades().loading) await new Promise((resolve) => setTimeout(resolve, 5))
    return trades()
  }
  const line = (key: string, text: string, entry: 'new weight' | 'change' = 'new weight'): void => {
    books.trade({ line: { key, entry, text } })
  }
  const after = (): number[] => trades().lines.map((each) => each.after)
  const weights = (): CellValue[] => workbook.cells('Book!C2:C5').flat()
  const limitRow = (row: CellValue[]): void => void sheets.Limits.push(row)
  /** A user inserts a row at the top of the sheet; the names follow. */
  const insertRowAbove = (): void => {
    sheets.Book.unshift(['', '', '', ''])
    for (const [name, area] of workbook.names)
      if (area.sheet === 'Book') workbook.names.set(name, { ...area, row: area.row + 1 })
    workbook.tell({ kind: 'moved', sheet: 'Book' })
  }
  return {
    ...workbook,
    insertRowAbove,
    books,
    take,
    quiet,
    trades,
    comparison,
    settled,
    line,
    after,
    weights,
    limitRow,
  }
}

const closeTo = (actual: ArrayLike<number>, expected: readonly number[], digits = 12): void => {
  expect(actual).toHaveLength(expected.length)
  expected.forEach((each, i) => {
    expect(actual[i]).toBeCloseTo(each, digits)
  })
}

describe('A list of trades', () => {
  test('says that nothing differs before anything is typed, and writes nothing', async () => {
    const { trades, books } = await desk()
    expect(trades().comparison).toMatch(/No weight differs/)
    expect(trades().preview).toEqual({ lines: [], refusals: [], unit: 'weight' })
    expect(trades().pending).toBe(false)
    await books.applyTrades({ replaceFormulas: false })
    expect(books.state().faults.trades).toMatch(/no weight differs from the sheet/i)
  })

  test('compares exact figures with those of the definition, and the first-order estimate with the sensitivities', async () => {
    const { line, comparison, after } = await desk()
    line('Meadow', '30%')
    expect(after()).toEqual([0.3, 0.3, 0.2, 0.1])
    const { before, after: then, firstOrder, turnover, netChange } = comparison()
    const [was, is] = [riskOf([0.4, 0.3, 0.2, 0.1]), riskOf([0.3, 0.3, 0.2, 0.1])]
    expect(before.decomposition.volatility).toBeCloseTo(was.volatility, 12)
    expect(then.decomposition.volatility).toBeCloseTo(is.volatility, 12)
    closeTo(then.decomposition.contribution, is.contributions)
    // s + m'δ, the marginal contribution being contribution over weight
    expect(firstOrder?.volatility).toBeCloseTo(was.volatility - (0.1 * (was.contributions[0] ?? 0)) / 0.4, 12)
    expect(turnover).toBeCloseTo(0.1, 12)
    expect(netChange).toBeCloseTo(-0.1, 12)
    const land = then.groups[0]
    expect(land?.contribution[0]).toBeCloseTo((is.contributions[0] ?? 0) + (is.contributions[1] ?? 0), 12)
  })

  test('takes a change as well as a new weight, and percentages as parts of a hundred', async () => {
    const { line, after } = await desk()
    line('Orchard', '-2%', 'change')
    closeTo(after(), [0.4, 0.28, 0.2, 0.1])
    line('Orchard', '0.25')
    closeTo(after(), [0.4, 0.25, 0.2, 0.1])
    line('Orchard', '')
    closeTo(after(), [0.4, 0.3, 0.2, 0.1])
  })

  test('asks what a bare number of 1 or more means', async () => {
    const { line, trades } = await desk()
    line('Mill', '5')
    expect(trades().lines[2]?.fault?.sentence).toMatch(/write 5%.*or 500%/)
    expect(trades().comparison).toMatch(/cannot be read yet/)
    expect(trades().preview.refusals).toHaveLength(1)
  })

  test('is paid for by the rest in proportion, or by one holding, as the user says', async () => {
    const { books, line, after, trades } = await desk()
    line('Quarry', '20%')
    books.trade({ financing: { kind: 'pro rata' } })
    // the others give up 10 points of 90
    closeTo(after(), [0.4 * (8 / 9), 0.3 * (8 / 9), 0.2 * (8 / 9), 0.2])
    expect(trades().lines.map(({ origin }) => origin)).toEqual([
      'financing',
      'financing',
      'financing',
      'typed',
    ])
    // a weight that is typed stays, even where it is that of the sheet
    line('Meadow', '40%')
    closeTo(after(), [0.4, 0.3 * (4 / 5), 0.2 * (4 / 5), 0.2])
    line('Meadow', '')
    books.trade({ financing: { kind: 'position', key: 'Meadow' } })
    closeTo(after(), [0.3, 0.3, 0.2, 0.2])
    line('Meadow', '1%')
    expect(trades().financingFault).not.toBeNull()
    expect(trades().comparison).toBe(trades().financingFault)
  })

  test('works a rule out line by line, at the figures in the sheet, before anything is written', async () => {
    const { books, settled, after, trades, calls } = await desk()
    const before = calls.length
    books.trade({ rule: 'risk_share > 30% ? weight * 30% / risk_share : weight' })
    expect(trades().loading).toBe(true)
    const { lines } = await settled()
    const { volatility, contributions } = riskOf([0.4, 0.3, 0.2, 0.1])
    closeTo(
      after(),
      [0.4, 0.3, 0.2, 0.1].map((w, i) => {
        const share = contributions[i]! / volatility
        return share > 0.3 ? (w * 0.3) / share : w
      }),
    )
    expect(lines.filter(({ origin }) => origin === 'rule').length).toBeGreaterThan(0)
    expect(calls.slice(before)).toEqual([])
  })

  test('points at the place in a rule that does not read, and at a line whose names have no value', async () => {
    const { books, settled } = await desk()
    books.trade({ rule: 'weight * size' })
    const { rule } = await settled()
    expect(rule.fault?.column).toBe(9)
    books.trade({ rule: 'benchmark + 1%' })
    const { lines, comparison } = await settled()
    expect(lines.every(({ fault }) => fault !== null)).toBe(true)
    expect(comparison).toMatch(/cannot be read yet/)
  })

  test('says so where no holding is in the group a rule names', async () => {
    const { books, settled, after } = await desk()
    books.trade({ rule: 'group == "Lnad" ? 0 : weight' })
    expect((await settled()).rule.fault).toEqual({
      sentence: 'No holding is in a group “Lnad”.',
      column: 9,
    })
    books.trade({ rule: 'group == "land" ? 0 : weight' })
    expect((await settled()).rule.fault).toBeNull()
    expect(after()).toEqual([0, 0, 0.2, 0.1])
  })

  test('discarded, leaves no trace', async () => {
    const { books, line, trades, cells } = await desk()
    const [state, sheet] = [trades(), JSON.stringify(cells('Book!A1:D5'))]
    line('Meadow', '30%')
    books.trade({ rule: 'weight' })
    books.discardTrades()
    expect(trades()).toEqual(state)
    expect(JSON.stringify(cells('Book!A1:D5'))).toBe(sheet)
  })

  test('has the tracking error against one series before and after', async () => {
    const { line, comparison } = await desk(HOLDINGS, {
      settings: { benchmark: { kind: 'series', name: 'Ferry' } },
    })
    line('Meadow', '30%')
    const { before, after } = comparison()
    expect(before.trackingError).toBeCloseTo(riskOf([0.4, 0.3, 0.2, 0.1, -1]).volatility, 12)
    expect(after.trackingError).toBeCloseTo(riskOf([0.3, 0.3, 0.2, 0.1, -1]).volatility, 12)
  })

  test('counts turnover, and holds limits before, from the weights the comparison began at', async () => {
    const { books, type, quiet, take, line, comparison } = await desk()
    await take('limits', 'Limits!A1:E3')
    type('Book!C2', 0.25)
    await quiet()
    line('Orchard', '25%')
    const figures = (): unknown => {
      const { turnover, limitsBefore, limitsAfter, before } = comparison()
      const land = [limitsBefore, limitsAfter].map(
        (states) => states.find(({ limit }) => limit.header === 'Class')?.figure,
      )
      return [turnover, ...land, before.decomposition.volatility].map((figure) => Number(figure?.toFixed(12)))
    }
    const volatilityOf = (weights: readonly number[]): number =>
      Number(riskOf(weights).volatility.toFixed(12))
    expect(figures()).toEqual([0.2, 0.7, 0.5, volatilityOf([0.4, 0.3, 0.2, 0.1])])
    books.compareFromHere()
    expect(figures()).toEqual([0.05, 0.55, 0.5, volatilityOf([0.25, 0.3, 0.2, 0.1])])
  })

  test('has the weights that were edited in the sheet in it, and begins anew where the user says', async () => {
    const { books, type, quiet, trades, comparison } = await desk()
    type('Book!C2', 0.35)
    await quiet()
    expect(trades().lines[0]).toMatchObject({ before: 0.4, sheet: 0.35, after: 0.35, origin: 'sheet' })
    expect(comparison().after.decomposition.volatility).toBeCloseTo(
      riskOf([0.35, 0.3, 0.2, 0.1]).volatility,
      12,
    )
    expect(trades().pending).toBe(false)
    books.compareFromHere()
    expect(trades().comparison).toMatch(/No weight differs/)
  })
})

describe('What a list of trades stands on', () => {
  test('is a holding’s name, and where there are no names its place: a row inserted above moves no trade to another holding', async () => {
    const { books, line, insertRowAbove, quiet, trades, after, cells } = await desk(
      [
        ['Class', 'Weight', '', ''],
        ['a', 0.3, '', ''],
        ['b', 0.3, '', ''],
        ['c', 0.2, '', ''],
        ['d', 0.2, '', ''],
      ],
      { returns: RETURNS.map((row) => row.slice(0, 5)) },
    )
    line(trades().lines[1]!.key, '25%')
    insertRowAbove()
    await quiet()
    expect(after()).toEqual([0.3, 0.25, 0.2, 0.2])
    expect(trades().lines.map(({ before }) => before)).toEqual([0.3, 0.3, 0.2, 0.2])
    await books.applyTrades({ replaceFormulas: false })
    expect(cells('Book!B3:B6').flat()).toEqual([0.3, 0.25, 0.2, 0.2])
    insertRowAbove()
    await quiet()
    await books.undoTrades()
    expect(cells('Book!B4:B7').flat()).toEqual([0.3, 0.3, 0.2, 0.2])
  })

  test('tells of weights beyond any measure in the place of figures, and writes none of them', async () => {
    const { books, line, trades } = await desk()
    line('Meadow', '1e300%')
    expect(trades().comparison).toMatch(/too large to be a number/)
    expect(trades().preview.refusals).toEqual([trades().comparison])
    await books.applyTrades({ replaceFormulas: false })
    expect(books.state().faults.trades).toMatch(/too large to be a number/)
    line('Meadow', '30%')
    expect(trades().preview.refusals).toEqual([])
  })

  test('says for whom something is typed who is not there any more', async () => {
    const { line, type, quiet, trades } = await desk()
    line('Quarry', '5%')
    type('Book!A5', 'Ferry')
    await quiet()
    expect(trades().notes.join(' ')).toMatch(
      /“Quarry” is not in the holdings any more: what the list has for it/,
    )
    type('Book!A5', 'Quarry')
    await quiet()
    expect(trades().notes).toEqual([])
    expect(trades().lines[3]?.after).toBe(0.05)
  })

  test('a rule that is a bare number of 1 or more is asked about, as a line is', async () => {
    const { books, settled, trades } = await desk()
    books.trade({ rule: '5' })
    await settled()
    expect(trades().rule.fault?.sentence).toMatch(/write 5%.*or 500%/)
    expect(trades().preview.refusals).toHaveLength(1)
  })

  test('a rule’s names are the figures of the definition, at the weights in the sheet', async () => {
    const { books, settled, line, trades } = await desk()
    const weights = [0.4, 0.3, 0.2, 0.1]
    const { volatility, contributions } = riskOf(weights)
    const alone = weights.map((_, i) => riskOf(weights.map((__, j) => (i === j ? 1 : 0))).volatility)
    const figures: { readonly [name: string]: readonly number[] } = {
      contribution: contributions,
      risk_share: contributions.map((c) => c / volatility),
      marginal: contributions.map((c, i) => c / weights[i]!),
      beta: contributions.map((c, i) => c / weights[i]! / volatility),
      volatility: alone,
      limit: [0.3, 0.5, 0.5, 0.5],
    }
    for (const [name, expected] of Object.entries(figures)) {
      books.trade({ rule: name })
      closeTo(
        (await settled()).lines.map((each) => each.after),
        expected,
      )
    }
    // a line’s expression has the same names
    books.trade({ rule: '' })
    line('Mill', 'beta / 10')
    expect(trades().lines[2]?.after).toBeCloseTo(figures.beta![2]! / 10, 12)
  })

  test('a rule has no share of risk where shares are withheld, and no target is one', async () => {
    // Ferry is nearly Meadow: a short of it leaves next to nothing of the risk
    const returns = RETURNS.map((row, t): CellValue[] =>
      t === 0 ? row : [...row.slice(0, 5), Number(row[1]) + 1e-2 * value(t, 2)],
    )
    const { books, settled } = await desk(
      [
        ['Holding', 'Class', 'Weight', 'Limit on share of risk'],
        ['Meadow', 'Land', 1, 0.5],
        ['Ferry', 'Land', -1, 0.5],
      ],
      { returns },
    )
    books.trade({ rule: 'risk_share > 50% ? 0 : weight' })
    const { lines } = await settled()
    expect(lines[0]?.fault?.sentence).toMatch(/risk_share of “Meadow” has no value/i)
    await books.propose({ kind: 'share', of: { kind: 'holding', key: 'Meadow' }, share: 0.5 })
    expect(books.state().faults.trades).toMatch(/nearly cancel/)
  })

  test('a rule for all holdings leaves the one that pays to that, and says so', async () => {
    const { books, settled, after, trades } = await desk()
    books.trade({ rule: 'weight * 0.9', financing: { kind: 'position', key: 'Quarry' } })
    await settled()
    closeTo(after(), [0.36, 0.27, 0.18, 0.19])
    expect(trades().notes).toEqual(['The rule leaves “Quarry” alone, which pays for the trades.'])
  })

  test('a proposal whose weights, estimate, limits or lines have changed since says which of them', async () => {
    const { books, take, line, type, quiet, trades } = await desk()
    await take('limits', 'Limits!A1:E3')
    const propose = (): Promise<void> =>
      books.propose({ kind: 'smallest change', turnover: null, net: 'kept', against: 'hard', lot: null })
    await propose()
    expect(trades().notes).toEqual([])
    type('Book!C4', 0.25)
    await quiet()
    expect(trades().notes).toEqual([expect.stringMatching(/before the holdings or their weights changed/)])
    await propose()
    expect(trades().notes).toEqual([])
    await books.choose({ lookBack: { kind: 'last', dates: 60 } })
    expect(trades().notes).toEqual([expect.stringMatching(/before the estimate of risk changed/)])
    await propose()
    type('Limits!E2', 0.55)
    await quiet()
    expect(trades().notes).toEqual([expect.stringMatching(/before limits changed/)])
    await propose()
    const { key, after } = trades().lines.find(({ origin }) => origin === 'proposal')!
    line(key, String(after / 2))
    expect(trades().notes).toEqual([expect.stringMatching(/before lines of the list changed/)])
    // the line that was typed over is that of the sheet again
    line(key, '')
    expect(trades().notes).toEqual([expect.stringMatching(/before lines of the list changed/)])
  })

  test('follows limits that are formulas when they are recalculated', async () => {
    const { books, take, put, tell, quiet } = await desk()
    put('Limits!E2', 0.8, '=2*0.4')
    await take('limits', 'Limits!A1:E3')
    const land = () => books.state().breakdown?.limits.find(({ limit }) => limit.header === 'Class')
    expect(land()).toMatchObject({ most: 0.8, status: 'over soft' })
    put('Limits!E2', 0.6, '=2*0.3')
    tell({ kind: 'calculated', sheet: 'Limits' })
    await quiet()
    expect(land()).toMatchObject({ most: 0.6, status: 'breach' })
  })
})

describe('Applying trades', () => {
  test('writes the weights; figures follow; Undo puts back exactly what stood there', async () => {
    const { books, line, weights, trades, comparison } = await desk()
    line('Meadow', '33.3%')
    line('Mill', '26.7%')
    expect(trades().preview.lines).toMatchObject([
      { name: 'Meadow', from: 0.4, to: 0.333, formula: null },
      { name: 'Mill', from: 0.2, to: 0.267, formula: null },
    ])
    await books.applyTrades({ replaceFormulas: false })
    expect(books.state().faults.trades).toBeUndefined()
    expect(weights()).toEqual([0.333, 0.3, 0.267, 0.1])
    expect(books.state().status).toEqual({ kind: 'up to date' })
    expect(books.state().breakdown?.decomposition.volatility).toBeCloseTo(
      riskOf([0.333, 0.3, 0.267, 0.1]).volatility,
      12,
    )
    // what is in the sheet now is still compared with where the comparison began
    expect(trades().pending).toBe(false)
    expect(comparison().before.decomposition.volatility).toBeCloseTo(
      riskOf([0.4, 0.3, 0.2, 0.1]).volatility,
      12,
    )
    expect(trades().applied).toMatch(/2 weights/)
    await books.undoTrades()
    expect(weights()).toEqual([0.4, 0.3, 0.2, 0.1])
    expect(trades().applied).toBeNull()
    expect(trades().comparison).toMatch(/No weight differs/)
  })

  test('refuses to take back what was edited since, saying which cell, and changes nothing', async () => {
    const { books, line, type, quiet, weights, trades } = await desk()
    line('Meadow', '30%')
    line('Orchard', '40%')
    await books.applyTrades({ replaceFormulas: false })
    type('Book!C3', 0.41)
    await quiet()
    await books.undoTrades()
    expect(books.state().faults.trades).toMatch(/Book!C3/)
    expect(weights()).toEqual([0.3, 0.41, 0.2, 0.1])
    expect(trades().applied).not.toBeNull()
  })

  test('puts a number in the place of a formula on the user’s word alone, and Undo brings the formula back', async () => {
    const { books, line, put, typed, quiet, tell, weights, trades } = await desk()
    put('Book!C2', 0.4, '=1-SUM(C3:C5)')
    tell({ kind: 'edited', sheet: 'Book', area: null, ours: false })
    await quiet()
    line('Meadow', '35%')
    expect(trades().preview.lines[0]?.formula).toBe('=1-SUM(C3:C5)')
    await books.applyTrades({ replaceFormulas: false })
    expect(books.state().faults.trades).toMatch(/Book!C2/)
    expect(weights()[0]).toBe(0.4)
    await books.applyTrades({ replaceFormulas: true })
    expect(weights()[0]).toBe(0.35)
    await books.undoTrades()
    expect(typed('Book!C2')[0]?.[0]).toBe('=1-SUM(C3:C5)')
  })

  test('writes amounts of money where the block holds them, and not where their sum would move', async () => {
    const { books, line, trades, cells } = await desk([
      ['Holding', 'Class', 'Amount', 'Limit on share of risk'],
      ['Meadow', 'Land', 4000, 0.3],
      ['Orchard', 'Land', 3000, 0.5],
      ['Mill', 'Works', 2000, 0.5],
      ['Quarry', 'Works', 1000, 0.5],
    ])
    line('Meadow', '30%')
    expect(trades().preview).toMatchObject({ unit: 'amount', refusals: [/own sum/] })
    books.trade({ financing: { kind: 'position', key: 'Quarry' } })
    expect(trades().preview.refusals).toEqual([])
    await books.applyTrades({ replaceFormulas: false })
    expect(cells('Book!C2:C5').flat()).toEqual([3000, 3000, 2000, 2000])
  })

  test('writes exposures where amounts give the capital: their sum stays whatever is traded', async () => {
    const { books, line, trades, cells } = await desk([
      ['Holding', 'Amount', 'Exposure', ''],
      ['Meadow', 4000, 4000, ''],
      ['Orchard', 3000, 5000, ''],
      ['Mill', 3000, -2000, ''],
    ])
    line('Meadow', '30%')
    expect(trades().preview).toMatchObject({ unit: 'amount', refusals: [] })
    await books.applyTrades({ replaceFormulas: false })
    expect(cells('Book!B2:C4')).toEqual([
      [4000, 3000],
      [3000, 5000],
      [3000, -2000],
    ])
  })

  test('writes nothing where the digits of a cell would stay as they are', async () => {
    const { line, trades } = await desk([
      ['Holding', 'Class', 'Amount', ''],
      ['Meadow', 'Land', 4000.1, ''],
      ['Orchard', 'Land', 3000.7, ''],
      ['Mill', 'Works', 2999.3, ''],
    ])
    // 15 digits of a weight that has more
    line('Meadow', trades().lines[0]!.sheet.toPrecision(15))
    expect(trades().preview.lines).toEqual([])
  })

  test('keeps in the list what is typed while the cells are written', async () => {
    const { books, line, hold, weights, trades } = await desk()
    line('Meadow', '30%')
    line('Mill', '25%')
    const release = hold('write')
    const applied = books.applyTrades({ replaceFormulas: false })
    await new Promise((resolve) => setTimeout(resolve, 20))
    line('Orchard', '20%')
    line('Mill', '28%')
    release()
    await applied
    expect(weights()).toEqual([0.3, 0.3, 0.25, 0.1])
    expect(trades().lines.map(({ typed }) => typed?.text)).toEqual([undefined, '20%', '28%', undefined])
  })

  test('writes nothing that was not shown when it was asked for: an edit read meanwhile moves what the others pay', async () => {
    const { books, line, type, quiet, hold, weights, trades } = await desk()
    books.trade({ financing: { kind: 'pro rata' } })
    line('Quarry', '20%')
    const release = hold('look')
    type('Book!C2', 0.35)
    await new Promise((resolve) => setTimeout(resolve, 200))
    const applied = books.applyTrades({ replaceFormulas: false })
    release()
    await applied
    await quiet()
    expect(weights()).toEqual([0.35, 0.3, 0.2, 0.1])
    expect(books.state().faults.trades).toMatch(/not what it was when it was asked for/)
    expect(trades().lines[3]?.typed?.text).toBe('20%')
    await books.applyTrades({ replaceFormulas: false })
    expect(weights()[3]).toBe(0.2)
  })

  test('waits for rows that were inserted, and Undo finds the cells where they are now', async () => {
    // alike weights, so that what stands in a cell does not tell whose it is
    const { books, line, insertRowAbove, quiet, cells } = await desk([
      HOLDINGS[0]!,
      ...['Meadow', 'Orchard', 'Mill', 'Quarry'].map((name): CellValue[] => [name, 'Land', 0.25, 0.5]),
    ])
    line('Orchard', '20%')
    insertRowAbove()
    await books.applyTrades({ replaceFormulas: false })
    expect(books.state().faults.trades).toMatch(/behind the sheet/)
    await quiet()
    await books.applyTrades({ replaceFormulas: false })
    line('Meadow', '20%')
    await books.applyTrades({ replaceFormulas: false })
    expect(cells('Book!C3:C6').flat()).toEqual([0.2, 0.2, 0.25, 0.25])
    // one row above, the cell of Meadow is now the heading, and that of Orchard has the weight of Meadow
    insertRowAbove()
    await books.undoTrades()
    expect(cells('Book!C4:C7').flat()).toEqual([0.25, 0.2, 0.25, 0.25])
  })

  test('says so where the capital is a formula that may add up what is traded', async () => {
    const { books, line, take, put, trades } = await desk([
      ['Holding', 'Class', 'Amount', ''],
      ['Meadow', 'Land', 4000, ''],
      ['Orchard', 'Land', 6000, ''],
    ])
    put('Limits!H1', 10000, '=SUM(Book!C2:C3)')
    await take('capital', 'Limits!H1')
    line('Meadow', '30%')
    expect(trades().preview.refusals).toEqual([])
    expect(trades().notes).toEqual([
      expect.stringMatching(/capital in Limits!H1 is a formula.*changes it by −10.00%/),
    ])
    books.trade({ financing: { kind: 'position', key: 'Orchard' } })
    expect(trades().notes).toEqual([])
  })

  test('takes nothing back once other holdings are linked', async () => {
    const { books, line, take, weights, trades } = await desk()
    line('Meadow', '30%')
    await books.applyTrades({ replaceFormulas: false })
    await take('holdings', 'Book!A1:D4')
    expect(trades().applied).toBeNull()
    await books.undoTrades()
    expect(books.state().faults.trades).toMatch(/Nothing was applied/)
    expect(weights()[0]).toBe(0.3)
  })

  test('takes back the last Apply alone, and says so of a second Undo', async () => {
    const { books, line, weights } = await desk()
    line('Meadow', '30%')
    await books.applyTrades({ replaceFormulas: false })
    line('Orchard', '20%')
    await books.applyTrades({ replaceFormulas: false })
    await books.undoTrades()
    expect(weights()).toEqual([0.3, 0.3, 0.2, 0.1])
    await books.undoTrades()
    expect(weights()).toEqual([0.3, 0.3, 0.2, 0.1])
    expect(books.state().faults.trades).toMatch(/Nothing was applied/)
  })

  test('changes nothing where the workbook refuses', async () => {
    const { books, line, refused, weights, trades } = await desk()
    const { Fault } = jest.requireActual<typeof import('../../../src/core')>('../../../src/core')
    line('Meadow', '30%')
    refused.set('write', new Fault('protected', 'the sheet is protected', 'unprotect it'))
    await books.applyTrades({ replaceFormulas: false })
    expect(books.state().faults.trades).toMatch(/protected/)
    expect(weights()).toEqual([0.4, 0.3, 0.2, 0.1])
    expect(trades().lines[0]?.typed?.text).toBe('30%')
  })
})

describe('A series that is not held', () => {
  test('can be traded at weight 0, is compared, and asks for a row before it is written', async () => {
    const { books, line, trades, comparison } = await desk()
    expect(trades().candidates).toEqual(['Ferry'])
    await books.addCandidate('Ferry')
    expect(trades().candidates).toEqual([])
    line('Ferry', '10%')
    expect(comparison().after.decomposition.volatility).toBeCloseTo(
      riskOf([0.4, 0.3, 0.2, 0.1, 0.1]).volatility,
      12,
    )
    expect(trades().preview.refusals[0]).toMatch(/“Ferry” has no row/)
    await books.dropCandidate('Ferry')
    expect(trades().lines).toHaveLength(4)
    expect(trades().comparison).toMatch(/No weight differs/)
  })
})

describe('Implied returns of the book', () => {
  test('stand beside the user’s own less the riskless rate they include', async () => {
    const { books } = await desk([
      ['Holding', 'Class', 'Weight', 'Expected return'],
      ['Meadow', 'Land', 0.4, 0.07],
      ['Orchard', 'Land', 0.6, 0.05],
    ])
    const found = books.impliedReturns({ kind: 'total', value: 0.04 }, 0.02)
    if (typeof found === 'string') throw new Error(found)
    const { volatility, contributions } = riskOf([0.4, 0.6])
    closeTo(
      found.rows.map(({ implied }) => implied),
      [0.4, 0.6].map((w, i) => (0.04 * contributions[i]!) / w / volatility),
    )
    closeTo(
      found.rows.map(({ expected }) => expected ?? NaN),
      [0.05, 0.03],
    )
    expect(found.total.expected).toBeCloseTo(0.4 * 0.05 + 0.6 * 0.03, 12)
  })
})

describe('Series that are not held and the estimate', () => {
  // one begins half way, one has a single return
  const MORE = RETURNS.map((row, t): CellValue[] => [
    ...row,
    t === 0 ? 'Late' : t <= 60 ? '' : value(t, 7),
    t === 0 ? 'Lone' : t === 80 ? 0.01 : '',
  ])

  test('say so where they shorten the history, with the figure of the Risk view', async () => {
    const { books, trades, line, comparison } = await desk(HOLDINGS, { returns: MORE })
    await books.addCandidate('Ferry')
    expect(trades().notes).toEqual([])
    await books.addCandidate('Late')
    expect(trades().notes).toEqual([
      expect.stringMatching(
        /With “Ferry” and “Late” the estimate is another, from 60 dates instead of 120: .* Risk\./,
      ),
    ])
    line('Late', '5%')
    const here = comparison().before.decomposition.volatility
    const risk = books.state().breakdown!.decomposition.volatility
    expect(Math.abs(here - risk)).toBeGreaterThan(1e-4)
    const percent = (figure: number): string => `${(figure * 100).toFixed(2)}%`
    expect(trades().notes[0]).toContain(`${percent(here)} here and of ${percent(risk)} in the view Risk`)
  })

  test('leave those added before them where no model can be made with one more', async () => {
    const { books, trades } = await desk(HOLDINGS, { returns: MORE })
    await books.addCandidate('Ferry')
    await books.addCandidate('Lone')
    expect(books.state().faults.trades).toBeDefined()
    expect(trades().lines.map(({ name }) => name)).toEqual(['Meadow', 'Orchard', 'Mill', 'Quarry', 'Ferry'])
    expect(trades().candidates).toEqual(['Late', 'Lone'])
  })
})

describe('A table of limits', () => {
  test('that has grown by a row is found, and the row included on the user’s word', async () => {
    const { books, take, quiet, type, limitRow } = await desk()
    await take('limits', 'Limits!A1:E3')
    expect(books.state().limits?.limits).toHaveLength(2)
    limitRow(['Holding', 'Mill', 'Weight', '', 0.15])
    type('Limits!E4', 0.15)
    await quiet()
    const [offer] = books.state().offers
    expect(offer?.sentence).toBe('1 further limit found below Limits!A1:E3.')
    await offer?.accept()
    expect(books.state().breakdown?.limits.find(({ limit }) => limit.name === 'Mill')?.status).toBe('breach')
  })
})

describe('Looking for weights', () => {
  test('that finds nothing says so and leaves what is typed', async () => {
    const { books, line, trades, after } = await desk()
    line('Meadow', '30%')
    expect(trades().proposal).toBeNull()
    await books.propose({ kind: 'least variance', lower: 0, upper: 0.1 })
    expect(trades().proposal?.met).toBe(false)
    expect(trades().proposal?.sentence).toMatch(/^No weights within these bounds/)
    expect(trades().lines[0]?.typed?.text).toBe('30%')
    expect(after()[0]).toBe(0.3)
  })

  test('keeps what is typed while the search runs', async () => {
    const { books, line, trades } = await desk()
    line('Mill', '15%')
    const run = steppingCalculator.run.bind(steppingCalculator)
    const searching = jest.spyOn(steppingCalculator, 'run').mockImplementationOnce((...job) => {
      line('Quarry', '12%')
      return run(...job)
    })
    await books.propose({ kind: 'risk budgets', by: 'holding' })
    expect(searching).toHaveBeenCalled()
    searching.mockRestore()
    expect(trades().proposal?.met).toBe(true)
    expect(trades().lines.map(({ typed }) => typed?.text ?? null)).toEqual([null, null, null, '12%'])
  })

  test('of a volatility finds the size of the book that has it', async () => {
    const { books, after, comparison } = await desk()
    await books.propose({ kind: 'volatility', volatility: 0.05 })
    expect(comparison().after.decomposition.volatility).toBeCloseTo(0.05, 12)
    const factor = 0.05 / riskOf([0.4, 0.3, 0.2, 0.1]).volatility
    closeTo(
      after(),
      [0.4, 0.3, 0.2, 0.1].map((w) => w * factor),
    )
  })

  test.each(['cash', 'pro rata'] as const)(
    'of a share of risk trims the holding to it (%s)',
    async (kind) => {
      const { books, after, comparison } = await desk()
      books.trade({ financing: { kind } })
      await books.propose({ kind: 'share', of: { kind: 'holding', key: 'Meadow' }, share: 0.3 })
      const { volatility, contributions } = riskOf(after())
      expect(contributions[0]! / volatility).toBeCloseTo(0.3, 10)
      expect(comparison().after.net).toBeCloseTo(kind === 'cash' ? 0.6 + after()[0]! : 1, 10)
    },
  )

  test('of equal risk contributions, by holding and by group, keeps the sum', async () => {
    const { books, after, trades } = await desk()
    await books.propose({ kind: 'risk budgets', by: 'holding' })
    expect(trades().proposal?.met).toBe(true)
    const each = riskOf(after())
    closeTo(
      each.contributions.map((c) => c / each.volatility),
      [0.25, 0.25, 0.25, 0.25],
      9,
    )
    await books.propose({ kind: 'risk budgets', by: { header: 'Class' } })
    const grouped = riskOf(after())
    closeTo(
      grouped.contributions.map((c) => c / grouped.volatility),
      [0.25, 0.25, 0.25, 0.25],
      9,
    )
    expect(after().reduce((sum, w) => sum + w, 0)).toBeCloseTo(1, 12)
  })

  test('of the risk budgets in a column has those shares of risk, and refuses budgets that are not a whole', async () => {
    const { books, after, trades } = await desk([
      ['Holding', 'Class', 'Weight', 'Risk budget'],
      ['Meadow', 'Land', 0.4, 0.1],
      ['Orchard', 'Land', 0.3, 0.2],
      ['Mill', 'Works', 0.2, 0.3],
      ['Quarry', 'Works', 0.1, 0.4],
    ])
    await books.propose({ kind: 'risk budgets', by: 'column' })
    const { volatility, contributions } = riskOf(after())
    closeTo(
      contributions.map((c) => c / volatility),
      [0.1, 0.2, 0.3, 0.4],
      9,
    )
    expect(trades().proposal?.sentence).toMatch(/“Risk budget”/)
    const { books: other } = await desk([
      ['Holding', 'Class', 'Weight', 'Risk budget'],
      ['Meadow', 'Land', 0.4, 0.1],
      ['Orchard', 'Land', 0.6, 0.2],
    ])
    await other.propose({ kind: 'risk budgets', by: 'column' })
    expect(other.state().faults.trades).toMatch(/add up to 30.0000%.*100% is needed/)
    expect(other.state().status).toEqual({ kind: 'up to date' })
  })

  test('of least variance finds none calmer by small shifts within the bounds', async () => {
    const { books, after } = await desk()
    await books.propose({ kind: 'least variance', lower: 0, upper: 0.45 })
    const least = after()
    const { volatility } = riskOf(least)
    for (let i = 0; i < 4; i++)
      for (let j = 0; j < 4; j++) {
        if (i === j || least[i]! < 1e-3 || least[j]! > 0.449) continue
        const shifted = least.map((w, k) => w + (k === j ? 1e-3 : k === i ? -1e-3 : 0))
        expect(riskOf(shifted).volatility).toBeGreaterThan(volatility)
      }
  })

  test('that meet all limits with the smallest change meets them, and says what it did', async () => {
    const { books, take, after, trades, comparison } = await desk()
    await take('limits', 'Limits!A1:E3')
    expect(books.state().breakdown?.limits.filter(({ status }) => status === 'breach')).toHaveLength(2)
    await books.propose({ kind: 'smallest change', turnover: null, net: 'kept', against: 'hard', lot: null })
    expect(trades().proposal).toMatchObject({ met: true })
    const { volatility, contributions } = riskOf(after())
    expect(contributions[0]! / volatility).toBeLessThanOrEqual(0.3)
    expect(after()[0]! + after()[1]!).toBeLessThanOrEqual(0.6)
    expect(after().reduce((sum, w) => sum + w, 0)).toBeCloseTo(1, 12)
    expect(comparison().limitsAfter.every(({ status }) => status !== 'breach')).toBe(true)
    await books.propose({
      kind: 'smallest change',
      turnover: null,
      net: 'kept',
      against: 'hard',
      lot: 0.005,
    })
    after().forEach((w, i) => {
      const lots = (w - [0.4, 0.3, 0.2, 0.1][i]!) / 0.005
      expect(lots).toBeCloseTo(Math.round(lots), 9)
    })
    expect(trades().proposal?.lines.some(([label]) => label === 'Rounded to lots')).toBe(true)
    expect(trades().proposal?.met).toBe(true)
    await books.applyTrades({ replaceFormulas: false })
    expect(books.state().breakdown?.limits.some(({ status }) => status === 'breach')).toBe(false)
  })

  test('of the smallest change open no short: what is not held stays so', async () => {
    // Ferry is Meadow three times over: a short of it would lower risk with the least change of all
    const returns = RETURNS.map((row, t) => (t === 0 ? row : [...row.slice(0, 5), 3 * Number(row[1])]))
    const held = (last: string): CellValue[][] => [
      ['Holding', 'Class', 'Weight', ''],
      ['Meadow', 'Land', 0.6, ''],
      ['Orchard', 'Land', 0.2, ''],
      [last, 'Works', 0, ''],
    ]
    const limits: CellValue[][] = [LIMITS[0]!, ['Total', '', 'Volatility', '', 0.06]]
    for (const added of [false, true]) {
      const { books, take, after, trades } = await desk(held(added ? 'Mill' : 'Ferry'), { returns, limits })
      if (added) await books.addCandidate('Ferry')
      await take('limits', 'Limits!A1:E2')
      await books.propose({
        kind: 'smallest change',
        turnover: null,
        net: 'free',
        against: 'hard',
        lot: null,
      })
      expect(trades().proposal?.met).toBe(true)
      expect(after().slice(2)).toEqual(added ? [0, 0] : [0])
    }
  })

  test('of the smallest change hold soft limits where asked to', async () => {
    const { books, take, comparison } = await desk(HOLDINGS.map((row) => row.slice(0, 3).concat('')))
    await take('limits', 'Limits!A1:E3')
    const land = async (against: 'hard' | 'soft') => {
      await books.propose({ kind: 'smallest change', turnover: null, net: 'kept', against, lot: null })
      const state = comparison().limitsAfter.find(({ limit }) => limit.header === 'Class')
      return { figure: state?.figure ?? NaN, status: state?.status }
    }
    const [hard, soft] = [await land('hard'), await land('soft')]
    // the search stops where the limit binds
    expect([hard.figure, soft.figure]).toEqual([expect.closeTo(0.6, 8), expect.closeTo(0.5, 8)])
    expect([hard.status, soft.status]).toEqual(['over soft', 'within'])
  })

  // the normal quantile at 95%, 1.6448536…: tables of the normal distribution (from memory)
  const QUANTILE = 1.6448536269514722

  test.each([
    [
      'Holding',
      'Meadow',
      'Contribution to risk',
      (weights: readonly number[]) => riskOf(weights).contributions[0]!,
    ],
    ['Total', '', 'Volatility', (weights: readonly number[]) => riskOf(weights).volatility],
    [
      'Total',
      '',
      'Value at risk',
      (weights: readonly number[]) => (QUANTILE * riskOf(weights).volatility) / Math.sqrt(52),
    ],
    ['Class', 'Land', 'Stand-alone risk', ([a, b]: readonly number[]) => riskOf([a!, b!, 0, 0]).volatility],
  ] as const)(
    'of the smallest change bring a limit on %s %s %s to it',
    async (scope, name, measure, figureOf) => {
      const most = 0.8 * figureOf([0.4, 0.3, 0.2, 0.1])
      const { books, take, after, trades } = await desk(
        HOLDINGS.map((row) => row.slice(0, 3).concat('')),
        {
          limits: [LIMITS[0]!, [scope, name, measure, '', most]],
          settings: { tails: { method: { kind: 'normal' }, confidence: 0.95, periods: 1 } },
        },
      )
      await take('limits', 'Limits!A1:E2')
      await books.propose({
        kind: 'smallest change',
        turnover: null,
        net: 'free',
        against: 'hard',
        lot: null,
      })
      expect(trades().proposal).toMatchObject({ met: true })
      expect(figureOf(after()) / most).toBeCloseTo(1, 7)
      expect(figureOf(after())).toBeLessThanOrEqual(most)
    },
  )

  test('of the smallest change bring a short to its limit on weight, which has no sign', async () => {
    const { books, take, after } = await desk(
      [
        ['Holding', 'Class', 'Weight', ''],
        ['Meadow', 'Land', 0.8, ''],
        ['Orchard', 'Land', 0.5, ''],
        ['Mill', 'Works', -0.3, ''],
      ],
      { limits: [LIMITS[0]!, ['Holding', 'Mill', 'Weight', '', 0.2]] },
    )
    await take('limits', 'Limits!A1:E2')
    await books.propose({ kind: 'smallest change', turnover: null, net: 'free', against: 'hard', lot: null })
    closeTo(after(), [0.8, 0.5, -0.2])
  })

  test('of the size of a short mark its limits on the short side', async () => {
    const alone = riskOf([0, 0, 1, 0]).volatility
    const { books, take } = await desk(
      [
        ['Holding', 'Class', 'Weight', ''],
        ['Meadow', 'Land', 0.8, ''],
        ['Orchard', 'Land', 0.5, ''],
        ['Mill', 'Works', -0.3, ''],
      ],
      {
        limits: [
          LIMITS[0]!,
          ['Holding', 'Mill', 'Weight', '', 0.2],
          ['Holding', 'Mill', 'Stand-alone risk', '', 0.25 * alone],
        ],
      },
    )
    await take('limits', 'Limits!A1:E3')
    const sizing = books.sizingOf('Mill', { kind: 'cash' })
    if (typeof sizing === 'string') throw new Error(sizing)
    closeTo(
      sizing.marks.filter(({ kind }) => kind === 'hard limit').map(({ weight }) => weight),
      [-0.2, -0.25],
    )
  })

  test('of the smallest change in lots count them in the unit of the cells', async () => {
    const { books, take, trades } = await desk(
      HOLDINGS.map(([name, group, weight], k) => [
        name!,
        group!,
        k === 0 ? 'Amount' : 50_000 * Number(weight),
        '',
      ]),
    )
    await take('limits', 'Limits!A1:E3')
    await books.propose({ kind: 'smallest change', turnover: null, net: 'free', against: 'hard', lot: 100 })
    const { lines } = trades().preview
    expect(lines.length).toBeGreaterThan(0)
    for (const { from, to } of lines) expect(((to - from) / 100) % 1).toBeCloseTo(0, 9)
    // 10 points of capital are 5,000: no more than a lot beyond that
    const sold = lines.reduce((sum, { from, to }) => sum + from - to, 0)
    expect(sold).toBeGreaterThanOrEqual(5000 - 1e-6)
    expect(sold).toBeLessThan(5100)
  })

  test('of equal risk contributions leave what never moves as it is', async () => {
    const { books, after } = await desk(
      [
        ['Holding', 'Class', 'Weight', ''],
        ['Meadow', 'Land', 0.5, ''],
        ['Orchard', 'Land', 0.3, ''],
        ['Cash', 'Cash', 0.2, ''],
      ],
      { settings: { riskless: ['Cash'] } },
    )
    await books.propose({ kind: 'risk budgets', by: 'holding' })
    const [meadow = 0, orchard = 0, cash] = after()
    expect(cash).toBe(0.2)
    expect(meadow + orchard).toBeCloseTo(0.8, 12)
    const { contributions } = riskOf([meadow, orchard])
    expect(contributions[0]! / contributions[1]!).toBeCloseTo(1, 9)
  })

  test.each([0.005, 0.03])(
    'of the smallest change in lots of %p say what the lots leave to cash',
    async (lot) => {
      const { books, take, after, trades } = await desk()
      await take('limits', 'Limits!A1:E3')
      await books.propose({ kind: 'smallest change', turnover: null, net: 'kept', against: 'hard', lot })
      const net = after().reduce((sum, w) => sum + w, 0) - 1
      expect(Math.abs(net) > 1e-9).toBe(lot === 0.03)
      const said = /but for ([\d.]+)% that whole lots (leave to|take from) cash/.exec(
        trades().proposal!.sentence,
      )
      expect(said?.slice(1)).toEqual(
        lot === 0.03 ? [(100 * Math.abs(net)).toFixed(2), net < 0 ? 'leave to' : 'take from'] : undefined,
      )
    },
  )

  test.each([NaN, -0.01])('of the smallest change refuse a turnover of %p by its name', async (turnover) => {
    const { books, take } = await desk()
    await take('limits', 'Limits!A1:E3')
    await books.propose({ kind: 'smallest change', turnover, net: 'kept', against: 'hard', lot: null })
    expect(books.state().faults.trades).toMatch(/^A turnover of .*; one of 0% or more is needed/)
  })

  test('of risk budgets name the holding that can have none', async () => {
    const { books } = await desk(
      [
        ['Holding', 'Class', 'Weight', 'Risk budget'],
        ['Meadow', 'Land', 0.8, 0.75],
        ['Cash', 'Land', 0.2, 0.25],
      ],
      { settings: { riskless: ['Cash'] } },
    )
    await books.propose({ kind: 'risk budgets', by: 'column' })
    expect(books.state().faults.trades).toMatch(/risk budget of 25.00% for “Cash”, which never moves/)
  })
})

describe('Tables of trades and scenarios', () => {
  test('go to sheets of their own, with before, after and change, and give way to the next', async () => {
    const { books, line, cells } = await desk()
    await books.writeTrades()
    expect(books.state().faults.trades).toMatch(/no weight differs/i)
    line('Meadow', '30%')
    await books.writeTrades()
    expect(books.state().notice).toMatch(/Trades!A1/)
    const rows = cells('Trades!A1:J60')
    const row = (label: string, under = '') =>
      rows.slice(rows.findIndex(([first]) => first === under)).find(([first]) => first === label) ?? []
    const [was, is] = [riskOf([0.4, 0.3, 0.2, 0.1]), riskOf([0.3, 0.3, 0.2, 0.1])]
    closeTo(row('Volatility a year', 'Totals').slice(2, 5).map(Number), [
      was.volatility,
      is.volatility,
      is.volatility - was.volatility,
    ])
    expect(row('Meadow', 'Weights').slice(0, 6)).toEqual([
      'Meadow',
      'typed',
      0.4,
      0.4,
      0.3,
      expect.closeTo(-0.1, 12),
    ])
    line('Meadow', '20%')
    await books.writeTrades()
    const again = cells('Trades!A1:J60')
    expect(again.find(([first, origin]) => first === 'Meadow' && origin === 'typed')?.[4]).toBe(0.2)
  })

  test('hold the book in scenarios at the weights before and after', async () => {
    const { books, line, cells } = await desk()
    line('Meadow', '30%')
    const comparison = books.stressOf([{ kind: 'volatilities', factor: 1.5 }])
    if (typeof comparison === 'string') throw new Error(comparison)
    const { figures } = comparison.cases[1] ?? {}
    if (figures === undefined || typeof figures === 'string') throw new Error(figures)
    expect(figures.before.volatility?.total).toBeCloseTo(1.5 * riskOf([0.4, 0.3, 0.2, 0.1]).volatility, 12)
    expect(figures.after?.volatility?.total).toBeCloseTo(1.5 * riskOf([0.3, 0.3, 0.2, 0.1]).volatility, 12)
    await books.writeStress([{ kind: 'volatilities', factor: 1.5 }])
    expect(cells('Stress!A1:A1')[0]?.[0]).toMatch(/^Stress/)
    // what the weights after come from
    expect(cells('Stress!A1:B60').find(([label]) => label === 'Trades')?.[1]).toBe(
      '1 weight differs from those compared from; turnover 10.00% one way. Cash beyond the holdings pays for the trades.',
    )
  })
})
