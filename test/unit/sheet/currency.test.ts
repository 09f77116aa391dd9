/**
 * Holdings in several currencies, over plain blocks and through the books. Returns are typed for these tests. Expected figures were computed
 * with NumPy 2.4.6 from the same numbers (covariance of base-currency returns and currencies, then the parts as defined); tolerance 1e-12.
 */
import type { Block, Books, Breakdown, CellValue, Settings } from '../../../src/sheet'
import {
  breakDown,
  breakdownTable,
  DEFAULT_SETTINGS,
  explain,
  matchHoldings,
  openBooks,
  readHoldings,
  readReturns,
} from '../../../src/sheet'
import { Fault } from '../../../src/core'
import { inBaseCurrency } from '../../../src/sheet/currency'
import { absoluteGap, relativeGap } from '../../closeness'
import { blockOf, ENGLISH, modelFor } from './blocks-of-cells'
import { plainWorkbook } from './plain-workbook'

const HOLDINGS: CellValue[][] = [
  ['Holding', 'Currency', 'Weight'],
  ['Harbour', '', 0.4],
  ['Prairie', 'USD', 0.35],
  ['Moor', ' gbp', 0.25],
  ['Dollar deposit', 'usd ', 0.1],
]
/** In the holdings' own currencies; the last two are what one unit of the currency returns in EUR. */
const OWN: number[][] = [
  [0.01, 0.021, -0.004, 0.006, -0.003],
  [-0.014, -0.008, 0.012, -0.009, 0.002],
  [0.022, 0.015, 0.003, 0.012, -0.007],
  [-0.006, -0.027, -0.011, 0.004, 0.01],
  [0.008, 0.004, 0.019, -0.015, -0.006],
  [0.017, 0.03, 0.007, 0.008, 0.001],
  [-0.021, -0.012, -0.016, 0.011, 0.008],
  [0.003, 0.009, -0.002, -0.005, -0.012],
  [-0.009, -0.018, 0.014, 0.013, 0.005],
  [0.012, 0.011, -0.008, -0.01, 0.004],
]
const NAMES = ['Harbour', 'Prairie', 'Moor', 'USD', 'GBP']
const IN_OWN: CellValue[][] = [NAMES, ...OWN]
const IN_EUR: CellValue[][] = [
  NAMES,
  ...OWN.map(([home = 0, dollars = 0, pounds = 0, usd = 0, gbp = 0]) => [
    home,
    (1 + dollars) * (1 + usd) - 1,
    (1 + pounds) * (1 + gbp) - 1,
    usd,
    gbp,
  ]),
]
const EXPECTED = {
  sample: {
    volatility: 0.011730830114537457,
    local: [0.004873709731593297, 0.0054699071100744135, 0.0007096123315751407, 0],
    currency: [0, 0.0011207237452717528, -0.0007633295883405014, 0.00032020678436335797],
  },
  exponential: {
    volatility: 0.01040813642732893,
    local: [0.0043646268251547665, 0.004867761279014084, 0.0008291966069380425, 0],
    currency: [0, 0.0007385404582336508, -0.0006030003015069455, 0.00021101155949532883],
  },
  lagged: {
    volatility: 0.005281458205841305,
    local: [0.00245309612895748, 0.003183616629901939, 0.0003473752600063266, 0],
    currency: [0, -0.0003469770664800873, -0.00025651644183575666, -0.0000991363047085964],
  },
}

const chosen = (returnsIn: 'base' | 'local', change: Partial<Settings> = {}): Settings => ({
  ...DEFAULT_SETTINGS,
  riskless: ['Dollar deposit'],
  periodsPerYear: 1,
  currency: { base: 'EUR', returnsIn },
  ...change,
})

function read(settings: Settings, returnRows = IN_OWN, holdingRows = HOLDINGS) {
  const holdings = readHoldings(blockOf(holdingRows), settings, ENGLISH)
  const returns = readReturns(blockOf(returnRows, 'Returns'), settings, ENGLISH)
  const match = matchHoldings(holdings, returns, settings.riskless, settings.currency)
  return { holdings, returns, match, factors: null }
}

async function breakdownOf(
  settings: Settings,
  returnRows = IN_OWN,
  holdingRows = HOLDINGS,
): Promise<Breakdown> {
  const blocks = read(settings, returnRows, holdingRows)
  return breakDown(blocks, await modelFor(blocks, settings), settings)
}

const partsOf = ({ currency }: Breakdown) => {
  if (currency === null || typeof currency.parts === 'string') throw new Error('no split')
  return currency.parts
}
const told = (found: readonly { weight: string; sentence: string }[], weight: string): string[] =>
  found.filter((finding) => finding.weight === weight).map(({ sentence }) => sentence)

describe('The column of the currency', () => {
  test('is found by its heading and groups the holdings as well', () => {
    const { columns, groupHeaders, currencyHeader, holdings } = read(chosen('base')).holdings
    expect(columns.map(({ role }) => role)).toEqual(['name', 'currency', 'weight'])
    expect([groupHeaders, currencyHeader]).toEqual([['Currency'], 'Currency'])
    expect(holdings.map(({ currency }) => currency)).toEqual(['', 'USD', 'gbp', 'usd'])
    expect(holdings.map(({ groups }) => groups)).toEqual([[''], ['USD'], ['gbp'], ['usd']])
  })

  test('a second one only groups', () => {
    const rows = HOLDINGS.map((row, k) => [...row, k === 0 ? 'Trading currency' : 'USD'])
    const { columns, groupHeaders } = read(chosen('base'), IN_OWN, rows).holdings
    expect(columns.map(({ role }) => role)).toEqual(['name', 'currency', 'weight', 'group'])
    expect(groupHeaders).toEqual(['Currency', 'Trading currency'])
  })

  test('a label in merged cells counts for all their rows', () => {
    const block: Block = blockOf(
      [['Holding', 'Currency', 'Weight'], ['Prairie', 'USD', 0.5], ['Ranch', '', 0.5]],
      'Book',
      { merged: [{ sheet: 'Book', row: 1, column: 1, rows: 2, columns: 1 }] },
    ) // prettier-ignore
    const { holdings } = readHoldings(block, { roles: {}, capital: null }, ENGLISH)
    expect(holdings.map(({ currency }) => currency)).toEqual(['USD', 'USD'])
  })
})

describe('Matching', () => {
  test('finds the series of a currency by its label whatever its case; a blank is the base currency, and it is told', () => {
    const { currencies, seriesOf } = read(chosen('base')).match
    expect(currencies?.labels).toEqual(['EUR', 'USD', 'gbp', 'USD'])
    expect([...(currencies?.seriesOf ?? [])]).toEqual([-1, 3, 4, 3])
    expect(told(currencies?.findings ?? [], 'notes')).toEqual([
      'Currency: 1 holding without a label counts as in EUR, the base currency.',
    ])
    // at home it has no risk, abroad it moves with its currency
    expect([...seriesOf]).toEqual([0, 1, 2, 3])
    expect(told(currencies?.findings ?? [], 'warns')).toEqual([
      'Book!C5: “Dollar deposit” is marked as riskless and stands in USD: it moves with that currency against EUR.',
    ])
  })

  test('a currency without a series is named once, with what is needed', () => {
    const without = IN_OWN.map((row) => row.slice(0, 3))
    expect(told(read(chosen('base'), without).match.currencies?.findings ?? [], 'stops')).toEqual([
      'Book!C3: “Prairie” stands in USD, and Returns!A1:C11 has no series of that name; one series “USD” with what one USD returns in EUR is needed, or choose no split by currency.',
      'Book!C4: “Moor” stands in gbp, and Returns!A1:C11 has no series of that name; one series “gbp” with what one gbp returns in EUR is needed, or choose no split by currency.',
    ])
  })

  test('without a column of currencies that is told and nothing is foreign', async () => {
    const breakdown = await breakdownOf(
      chosen('local', { riskless: [] }),
      IN_OWN,
      [['Holding', 'Weight'], ['Harbour', 0.5], ['Prairie', 0.5]], // prettier-ignore
    )
    expect(told(breakdown.findings, 'warns')).toContain(
      'The base currency is EUR, but no column of the holdings has the role currency: all of them count as holdings in EUR.',
    )
    expect(breakdown.currency?.parts).toBe(
      'Every holding stands in EUR, the base currency: there is nothing to split.',
    )
  })
})

describe('Returns in the holdings’ own currencies', () => {
  // Eun & Resnick, International Financial Management, 9th ed., chapter 15 (read): a share up 15% in pounds while the pound loses 5%
  // against the dollar returns 9.25% in dollars.
  const block = (rows: CellValue[][], change: Partial<Settings> = {}) => {
    const settings = {
      ...DEFAULT_SETTINGS,
      currency: { base: 'USD', returnsIn: 'local' },
      ...change,
    } as const
    const { returns, match } = read(
      settings,
      [['Oil share', 'GBP'], ...rows],
      [['Holding', 'Currency', 'Weight'], ['Oil share', 'GBP', 1]], // prettier-ignore
    )
    return inBaseCurrency(returns, match.seriesOf, match.currencies)
  }

  test('become returns in the base currency, product term and all; the currency stays as it is', () => {
    const { values } = block([[0.15, -0.05], [0, 0.1], [-0.2, 0]]) // prettier-ignore
    expect(absoluteGap(values, [0.0925, -0.05, 0.1, 0.1, -0.2, 0])).toBeLessThan(1e-15)
  })

  test('a gap of the currency is a gap of what stands in it', () => {
    const { values } = block([[0.15, ''], [0.1, 0.1], ['', 0.1], [0.2, 0.1]]) // prettier-ignore
    expect([...values].map(Number.isNaN)).toEqual([true, true, false, false, true, false, false, false])
  })

  test('prices give the same as returns, and log returns of prices add', () => {
    const prices: CellValue[][] = [[100, 2], [115, 1.9], [115, 2.09], [92, 2.09]] // prettier-ignore
    expect(absoluteGap(block(prices).values, [0.0925, -0.05, 0.1, 0.1, -0.2, 0])).toBeLessThan(1e-14)
    const log = block(prices, { returnKind: 'log' }).values
    expect(absoluteGap([log[0]!, log[2]!, log[4]!], [1.0925, 1.1, 0.8].map(Math.log))).toBeLessThan(1e-14)
  })

  test('a holding that is the currency itself stands in the base currency already', async () => {
    const rows = [...HOLDINGS.slice(0, 4), ['USD', 'USD', -0.35]]
    const settings = chosen('local', { riskless: [] })
    const { match, returns } = read(settings, IN_OWN, rows)
    const { values } = inBaseCurrency(returns, match.seriesOf, match.currencies)
    expect(OWN.map((_, t) => values[t * 5 + 3])).toEqual(OWN.map((row) => row[3]))
    // and such a hedge of all that stands in the currency takes its part away
    const { byCurrency, local } = partsOf(await breakdownOf(settings, IN_OWN, rows))
    expect(local[3]).toBe(0)
    const dollars = byCurrency.find(({ label }) => label === 'USD')
    expect(dollars?.exposure).toBe(0)
    expect(Math.abs(dollars?.currency ?? NaN)).toBeLessThan(1e-17)
  })

  test('of a covariance matrix cannot be brought anywhere', async () => {
    const matrix: CellValue[][] = [['Oil share', 'GBP'], [0.04, 0.01], [0.01, 0.02]] // prettier-ignore
    const settings = { ...DEFAULT_SETTINGS, currency: { base: 'USD', returnsIn: 'local' } } as const
    const blocks = read(settings, matrix, [['Holding', 'Currency', 'Weight'], ['Oil share', 'GBP', 1]]) // prettier-ignore
    const fault = await modelFor(blocks, settings).catch((error: unknown) => error)
    expect(fault).toBeInstanceOf(Fault)
    expect(explain(fault as Fault, () => '')).toBe(
      'A covariance matrix cannot be brought from the holdings’ own currencies to the base currency; returns are needed, or a matrix of returns in USD.',
    )
  })
})

describe.each([
  ['sample', { kind: 'sample' }],
  ['exponential', { kind: 'exponential', decay: 0.9 }],
  ['lagged', { kind: 'lagged', lags: 2 }],
] as const)('The split with the estimator %s', (name, estimator) => {
  const { volatility, local, currency } = EXPECTED[name]

  test.each([
    ['local', IN_OWN],
    ['base', IN_EUR],
  ] as const)('is the reference’s from returns in the %s currency', async (returnsIn, rows) => {
    const breakdown = await breakdownOf(chosen(returnsIn, { estimator }), rows)
    const parts = partsOf(breakdown)
    expect(relativeGap(breakdown.decomposition.volatility, volatility)).toBeLessThan(1e-12)
    expect(relativeGap(parts.local, local)).toBeLessThan(1e-12)
    expect(relativeGap(parts.currency, currency)).toBeLessThan(1e-12)
  })

  test('adds up to the figures beside it, scaled as they are', async () => {
    const breakdown = await breakdownOf(chosen('local', { estimator, periodsPerYear: 52 }))
    const { decomposition: d } = breakdown
    const parts = partsOf(breakdown)
    const both = parts.local.map((part, i) => part + parts.currency[i]!)
    expect(relativeGap(both, d.contribution)).toBeLessThan(1e-14)
    const sum = (of: (row: (typeof parts.byCurrency)[number]) => number): number =>
      parts.byCurrency.reduce((total, row) => total + of(row), 0)
    expect(sum((row) => row.local) + sum((row) => row.currency)).toBeCloseTo(d.volatility, 14)
    expect(sum((row) => row.contribution)).toBeCloseTo(d.volatility, 14)
    expect(parts.byCurrency.map(({ label, exposure }) => [label, Number(exposure.toFixed(12))])).toEqual([
      ['EUR', 0.4],
      ['USD', 0.45],
      ['gbp', 0.25],
    ])
  })
})

test('a covariance matrix with the currencies in it is split as the returns behind it', async () => {
  // the sample covariance of the returns in EUR, formed here the long way
  const columns = NAMES.map((_, i) => IN_EUR.slice(1).map((row) => Number(row[i])))
  const mean = (values: readonly number[]): number => values.reduce((a, x) => a + x, 0) / values.length
  const matrix: CellValue[][] = columns.map((a) =>
    columns.map((b) => a.reduce((sum, x, t) => sum + (x - mean(a)) * (b[t]! - mean(b)), 0) / (a.length - 1)),
  )
  const parts = partsOf(await breakdownOf(chosen('base'), [NAMES, ...matrix]))
  expect(relativeGap(parts.currency, EXPECTED.sample.currency)).toBeLessThan(1e-12)
  expect(relativeGap(parts.local, EXPECTED.sample.local)).toBeLessThan(1e-12)
})

describe('What cannot be split so that it adds up', () => {
  const reason = async (settings: Settings, rows = IN_OWN): Promise<string> => {
    const { currency, decomposition } = await breakdownOf(settings, rows)
    expect(decomposition.volatility).toBeGreaterThan(0)
    return String(currency?.parts)
  }
  const holed = IN_OWN.map((row, t) => row.map((value, i) => (t === 2 && i === 1 ? '' : value)))

  test('says so under shrinkage and other rules for gaps, while the figures stand', async () => {
    expect(await reason(chosen('local', { estimator: { kind: 'shrinkage', target: 'identity' } }))).toMatch(
      /^The split by currency goes with .* With shrinkage the parts would not add up to the figures shown\.$/,
    )
    expect(await reason(chosen('local', { gaps: 'own overlap' }), holed)).toMatch(
      /Under the rule for gaps “each pair’s own overlap” the parts would not add up/,
    )
    // without gaps the rule has no part in the figures
    expect(partsOf(await breakdownOf(chosen('local', { gaps: 'own overlap' }))).currency).toHaveLength(4)
  })

  test('says so in a factor model', async () => {
    const settings = chosen('local', { estimator: { kind: 'factors' } })
    const factors = readReturns(
      blockOf([['Weather'], ...OWN.map(([home = 0, dollars = 0]) => [home + dollars])], 'Factors'),
      settings,
      ENGLISH,
    )
    const blocks = { ...read(settings), factors }
    const { currency } = breakDown(blocks, await modelFor(blocks, settings), settings)
    expect(currency?.parts).toMatch(/ In a factor model the parts would not add up to the figures shown\.$/)
  })

  test('says which currency has no return on how many dates, where the holdings have theirs', async () => {
    const gap = IN_EUR.map((row, t) => row.map((value, i) => (t === 2 && i === 4 ? '' : value)))
    expect(await reason(chosen('base'), gap)).toBe(
      'The split by currency needs a return of every currency on every date used: “GBP” has none on 1 of 10 dates.',
    )
    // in their own currencies the holdings lose that date, and it is told why
    const breakdown = await breakdownOf(
      chosen('local'),
      IN_OWN.map((row, t) => row.map((value, i) => (t === 2 && i === 4 ? '' : value))),
    )
    expect(breakdown.dates).toMatchObject({ used: 9, dropped: 1 })
    expect(told(breakdown.findings, 'warns')).toContain(
      '“gbp” has no return on 1 of 10 dates: holdings in gbp have none in EUR there.',
    )
    expect(partsOf(breakdown).currency).toHaveLength(4)
  })
})

test('the written table states the base currency and both parts, which add up in every row', async () => {
  const { cells } = breakdownTable('Book', await breakdownOf(chosen('local')))
  const rows = cells.map((row) => row.map(({ value }) => value).filter((value) => value !== ''))
  expect(rows[1]?.[0]).toMatch(/^Volatility 1\.17% a year in EUR \(95% band .*\), from 10 dates/)
  const at = rows.findIndex(([first]) => first === 'Currency: base EUR')
  const section = rows.slice(at + 3, at + 14)
  expect(section.map((row) => row.filter((value) => typeof value === 'string'))).toEqual([
    ['Holding', 'Currency', 'Weight', 'Local part', 'Currency part', 'Contribution to risk'],
    ['Harbour', 'EUR'],
    ['Prairie', 'USD'],
    ['Moor', 'gbp'],
    ['Dollar deposit', 'USD'],
    ['Total'],
    [],
    ['Currency', 'Weight', 'Local part', 'Currency part', 'Contribution to risk'],
    ['EUR'],
    ['USD'],
    ['gbp'],
  ])
  for (const row of section) {
    const [, local, currency, contribution] = row.filter((value) => typeof value === 'number')
    if (contribution !== undefined) expect(local! + currency!).toBeCloseTo(contribution, 15)
  }
  expect(rows.find(([label]) => label === 'Base currency')?.[1]).toBe(
    'EUR; returns of foreign holdings stand in their own currencies and are brought to it before anything is estimated, r = (1 + l)(1 + f) − 1 with l the return in the own currency and f that of the currency; series that are not held, a benchmark’s too, count as in EUR',
  )
})

describe('Through the books', () => {
  const running: Books[] = []
  afterEach(async () => {
    for (const books of running.splice(0)) await books.close()
  })

  /** Until edits have settled and what they set off is done. */
  const settled = async (books: Books) => {
    do await new Promise((resolve) => setTimeout(resolve, 150))
    while (books.state().working)
    return books.state()
  }

  async function desk(returns = IN_OWN) {
    const workbook = plainWorkbook({
      Book: HOLDINGS.map((row) => [...row]),
      Returns: returns.map((row) => [...row]),
    })
    const books = await openBooks(workbook.port)
    running.push(books)
    workbook.select('Book!A1:C5')
    await books.takeSelection('holdings')
    workbook.select(`Returns!A1:${'ABCDE'.charAt((returns[0]?.length ?? 1) - 1)}11`)
    await books.takeSelection('returns')
    await books.markRiskless('Dollar deposit', true)
    await books.choose({ periodsPerYear: 1 })
    return { ...workbook, books, quiet: () => settled(books) }
  }

  test('a base currency is chosen, changes the figures at once, is saved, and is there again after reopening', async () => {
    const { books, port, settings } = await desk()
    await books.compute()
    expect(books.state().breakdown?.currency).toBeNull()
    const asTheyStand = books.state().breakdown?.decomposition.volatility ?? NaN
    await books.choose({ currency: { base: 'EUR', returnsIn: 'local' } })
    const { breakdown } = books.state()
    if (!breakdown) throw new Error('no figures')
    expect(breakdown.decomposition.volatility).not.toBeCloseTo(asTheyStand, 4)
    expect(relativeGap(partsOf(breakdown).currency, EXPECTED.sample.currency)).toBeLessThan(1e-12)
    expect(settings.get('book.1')).toMatchObject({
      settings: { currency: { base: 'EUR', returnsIn: 'local' } },
    })
    const again = await openBooks(port)
    running.push(again)
    await settled(again)
    expect(again.state().breakdown?.currency).toEqual(breakdown.currency)
    await books.choose({ currency: null })
    expect(books.state().breakdown?.decomposition.volatility).toBe(asTheyStand)
  })

  test('another label moves a holding to another currency, in the figures and in the written table', async () => {
    const { books, type, quiet, valueAt } = await desk()
    await books.choose({ currency: { base: 'EUR', returnsIn: 'local' } })
    await books.compute()
    await books.writeTable({ kind: 'new sheet' })
    const before = books.state().breakdown?.decomposition.volatility
    type('Book!B4', 'USD')
    const { breakdown, status, table } = await quiet()
    expect(status).toEqual({ kind: 'up to date' })
    expect(breakdown?.currency?.labels).toEqual(['EUR', 'USD', 'USD', 'USD'])
    expect(breakdown?.decomposition.volatility).not.toBe(before)
    const written = Array.from({ length: table?.rows ?? 0 }, (_, k) => valueAt(`Risk!B${k + 1}`))
    expect(written.filter((value) => value === 'USD').length).toBeGreaterThanOrEqual(3)
  })

  test('a missing series is said at the choice, and taking the choice back ends it', async () => {
    const { books } = await desk(IN_OWN.map((row) => row.slice(0, 4)))
    await books.choose({ currency: { base: 'EUR', returnsIn: 'base' } })
    const sentence =
      'Book!C4: “Moor” stands in gbp, and Returns!A1:D11 has no series of that name; one series “gbp” with what one gbp returns in EUR is needed, or choose no split by currency.'
    expect(books.state().faults).toEqual({ currency: sentence })
    await books.compute()
    expect(books.state().faults).toEqual({ currency: sentence })
    expect(books.state().status).toMatchObject({ kind: 'failed' })
    await books.choose({ currency: null })
    await books.compute()
    expect(books.state()).toMatchObject({ faults: {}, status: { kind: 'up to date' } })
  })

  test('the series of a currency is looked over with the data', async () => {
    const far = IN_OWN.map((row, t) => row.map((value, i) => (t === 5 && i === 4 ? -0.5 : value)))
    const { books, quiet } = await desk(far)
    await books.choose({ currency: { base: 'EUR', returnsIn: 'local' } })
    await books.compute()
    const { checks } = await quiet()
    expect(checks?.flatMap(({ check }) => check.names)).toContain('GBP')
  })
})
