/** Limits: read from a table or a column of the holdings, and held against the figures of a book. Every block here is typed for its test. */
import type { CellValue, Culture, HoldingsReading, LimitsReading, Settings } from '../../../src/sheet'
import {
  addressOf,
  breakDown,
  columnLimits,
  DEFAULT_SETTINGS,
  judgeLimits,
  limitOn,
  limitsOf,
  limitsSummary,
  limitText,
  matchHoldings,
  readHoldings,
  readLimits,
  readReturns,
} from '../../../src/sheet'
import type { Limit } from '../../../src/sheet'
import { profileBasis } from '../../../src/sheet/profile'
import { absoluteGap } from '../../closeness'
import { textbookCovariance, textbookDecomposition } from '../../textbook'
import { blockOf, ENGLISH, GERMAN, modelFor, told } from './blocks-of-cells'

const BOOK: CellValue[][] = [
  ['Holding', 'Asset class', 'Region', 'Weight', 'Benchmark weight'],
  ['Meadow', 'Shares', 'North', 0.5, 0.4],
  ['Orchard', 'Shares', 'South', 0.3, 0.3],
  ['Heath', 'Bonds', 'North', 0.4, 0.3],
  ['Marsh', 'Bonds', '', -0.2, 0],
]
const holdingsFrom = (rows: CellValue[][]): HoldingsReading =>
  readHoldings(blockOf(rows), DEFAULT_SETTINGS, ENGLISH)
const HELD = holdingsFrom(BOOK)

const HEADS = ['Scope', 'Name', 'Measure', 'Soft limit', 'Hard limit']
const read = (rows: CellValue[][], held = HELD, culture: Culture = ENGLISH): LimitsReading =>
  readLimits(blockOf(rows, 'Limits'), held, culture)
const rowOf = (...row: CellValue[]): LimitsReading => read([HEADS, row])
/** What was read, a line each, such as "Region: North | weight | soft 0.1 | hard 0.2". */
const lines = ({ limits }: { readonly limits: readonly Limit[] }): string[] =>
  limits.map((limit) =>
    [
      limitOn(limit),
      limit.measure,
      ...(['soft', 'hard'] as const).flatMap((kind) =>
        limit[kind] === null ? [] : `${kind} ${limit[kind]}`,
      ),
    ].join(' | '),
  )

describe('a table of limits', () => {
  test('is read by its headings, with members and the cell of each limit', () => {
    const reading = read([
      HEADS,
      ['Total', '', 'Volatility', 0.09, 0.1],
      ['Holding', 'Orchard', 'Share of risk', '', 0.3],
      ['Region', 'North', 'Weight', 0.8, ''],
    ])
    expect(reading.findings).toEqual([])
    expect(lines(reading)).toEqual([
      'Total | volatility | soft 0.09 | hard 0.1',
      'Orchard | share of risk | hard 0.3',
      'Region: North | weight | soft 0.8',
    ])
    expect(reading.limits.map(({ members }) => members && [...members])).toEqual([null, [1], [0, 2]])
    expect(reading.limits.map(({ cell }) => cell && addressOf(cell))).toEqual([
      'Limits!E2',
      'Limits!E3',
      'Limits!D4',
    ])
    expect(reading.summary).toBe('3 limits: 1 on the total, 1 on holdings and 1 on groups')
  })

  test('may have its headings in any order and other words, under titles, with blank rows and percent texts', () => {
    const reading = read([
      ['Limits of the book'],
      [],
      ['Maximum', 'Risk measure', 'Early warning', 'Limit on', 'Holding or group'],
      ['30%', 'risk share', '25.5%', 'position', 'orchard '],
      [],
      ['(5%)', 'Contribution', '', 'ASSET  class', 'bonds'],
    ])
    expect(lines(reading)).toEqual([
      'Orchard | share of risk | soft 0.255 | hard 0.3',
      'Asset class: Bonds | contribution to risk | hard -0.05',
    ])
    expect(told(reading, 'notes')).toEqual([
      '3 limits typed as text read as numbers (Limits!C4, Limits!A4 and 1 more).',
    ])
  })

  test('reads percent texts by the language of the workbook', () => {
    const typed = [HEADS, ['Total', '', 'Volatility', '', '12,5 %']]
    expect(lines(read(typed, HELD, GERMAN))).toEqual(['Total | volatility | hard 0.125'])
    expect(told(read(typed), 'stops')).toEqual([
      'Limits!E2: found “12,5 %”; a hard limit is needed, or a blank.',
    ])
  })

  test.each<[string, string, string]>([
    ['Holding', 'Meadow', 'Weight'],
    ['Holding', 'Meadow', 'Share of risk'],
    ['Holding', 'Meadow', '% contribution to risk'],
    ['Holding', 'Meadow', 'Contribution to risk'],
    ['Holding', 'Meadow', 'Stand-alone risk'],
    ['Holding', 'Meadow', 'STANDALONE risk'],
    ['Asset class', 'Shares', 'net weight'],
    ['Asset class', 'Shares', 'Percent contribution'],
    ['group', 'Shares', 'risk contribution'],
    ['group', 'Bonds', 'stand\u2011alone'],
    ['Region', 'Unassigned', 'weight'],
    ['Total', '', 'Volatility (a year)'],
    ['Book', '', 'Tracking error (ex ante)'],
    ['portfolio', 'Total', 'Value-at-risk'],
    ['whole book', '', 'Expected  shortfall'],
  ])('takes for %s %s the measure “%s”', (...row) => {
    const reading = rowOf(...row, '', 0.2)
    expect(told(reading, 'stops')).toEqual([])
    expect(reading.limits).toHaveLength(1)
  })

  test.each<[string, CellValue[], string]>([
    [
      'a scope it does not know',
      ['Sector', 'Shares', 'Weight', '', 0.2],
      'Limits!A2: found “Sector”; total, holding, “Asset class” or “Region” is needed.',
    ],
    [
      'no scope',
      ['', '', 'Volatility', '', 0.2],
      'Limits!A2: found a blank; total, holding, “Asset class” or “Region” is needed.',
    ],
    [
      'a name beside the total',
      ['Total', 'Meadow', 'Volatility', '', 0.2],
      'Limits!B2: found “Meadow” beside the scope “Total”; a blank is needed, or another scope.',
    ],
    [
      'a name spelt nearly like one',
      ['Holding', 'Orchad', 'Weight', '', 0.2],
      'Limits!B2: found “Orchad”; the name of a holding in Book!A1:E5 is needed: “Orchard” is spelt nearly like it.',
    ],
    [
      'a name like none',
      ['Holding', 'Quarry', 'Weight', '', 0.2],
      'Limits!B2: found “Quarry”; the name of a holding in Book!A1:E5 is needed.',
    ],
    [
      'no name',
      ['Holding', '', 'Weight', '', 0.2],
      'Limits!B2: found a blank; the name of a holding in Book!A1:E5 is needed.',
    ],
    [
      'a label of another column',
      ['Region', 'Shares', 'Weight', '', 0.2],
      'Limits!B2: found “Shares”; a label of “Region” is needed.',
    ],
    [
      'a label of no column',
      ['Group', 'Bond', 'Weight', '', 0.2],
      'Limits!B2: found “Bond”; a label of “Asset class” and “Region” is needed: “Bonds” is spelt nearly like it.',
    ],
    [
      'a measure it does not know',
      ['Total', '', 'Duration', '', 0.2],
      'Limits!C2: found “Duration”; one of these is needed: volatility, tracking error, value at risk, expected shortfall.',
    ],
    [
      'no measure',
      ['Holding', 'Meadow', '', '', 0.2],
      'Limits!C2: found a blank; one of these is needed: weight, share of risk, contribution to risk, stand-alone risk.',
    ],
    [
      'a measure of another scope',
      ['Holding', 'Meadow', 'Volatility', '', 0.2],
      'Limits!C2: found “Volatility” for one holding; one of these is needed: weight, share of risk, contribution to risk, stand-alone risk.',
    ],
    [
      'a confidence that is not the book’s',
      ['Total', '', 'Value at risk (99%)', '', 0.2],
      'Limits!C2: found “Value at risk (99%)”; one of these is needed, without figures beside it: volatility, tracking error, value at risk, expected shortfall. Large losses are measured at the book’s own confidence and horizon.',
    ],
    [
      'a cell error',
      ['Total', '', 'Volatility', '', '#N/A'],
      'Limits!E2: found the error #N/A; a hard limit is needed, or a blank.',
    ],
    [
      'a word',
      ['Total', '', 'Volatility', 'low', 0.2],
      'Limits!D2: found “low”; a soft limit is needed, or a blank.',
    ],
    [
      'a limit below 0 on what cannot be below 0',
      ['Total', '', 'Volatility', '', -0.2],
      'Limits!E2: found −20.00%; a limit on volatility of 0 or more is needed.',
    ],
    [
      'a soft limit above the hard one',
      ['Total', '', 'Volatility', 0.3, 0.2],
      'Limits!D2: found a soft limit of 30.00% above the hard one of 20.00%; one at or below it is needed.',
    ],
  ])('tells %s at its cell, and takes no limit from the row', (_what, row, sentence) => {
    const reading = rowOf(...row)
    expect(told(reading, 'stops')).toEqual([sentence])
    expect(reading.findings[0]?.area && addressOf(reading.findings[0].area)).toBe(sentence.split(':')[0])
    expect(reading.limits).toEqual([])
  })

  test('tells every cell of a row that does not read, and still takes the others', () => {
    const reading = read([
      HEADS,
      ['Sector', '', 'Weightiness', 'low', 'high'],
      ['Total', '', 'Volatility', '', 0.1],
    ])
    expect(told(reading, 'stops')).toHaveLength(4)
    expect(lines(reading)).toEqual(['Total | volatility | hard 0.1'])
  })

  test('a label of two columns, or a name like two holdings, is asked about', () => {
    const rows = BOOK.map((row) => [...row])
    rows[1]![2] = 'Bonds'
    rows[2]![0] = 'MEADOW'
    const held = holdingsFrom(rows)
    const group = read([HEADS, ['Group', 'Bonds', 'Weight', '', 0.2]], held)
    expect(told(group, 'stops')).toEqual([
      'Limits!A2: found “Group”, and “Bonds” is a label of “Asset class” and “Region”; the heading of one of them is needed as the scope.',
    ])
    expect(lines(read([HEADS, ['Holding', 'MEADOW', 'Weight', '', 0.2]], held))).toEqual([
      'MEADOW | weight | hard 0.2',
    ])
    expect(told(read([HEADS, ['Holding', 'meadow', 'Weight', '', 0.2]], held), 'stops')).toEqual([
      'Limits!B2: “meadow” is like 2 holdings in Book!A1:E5; one is needed: spell it as it stands there.',
    ])
  })

  test('without group columns the scope “group” says so', () => {
    const held = holdingsFrom(BOOK.map(([name, , , weight]) => [name!, weight!]))
    expect(told(read([HEADS, ['Group', 'North', 'Weight', '', 0.2]], held), 'stops')).toEqual([
      'Limits!A2: found “Group”, but the holdings have no group column; total or holding is needed.',
    ])
  })

  test('headings that are missing, doubled or of no use are told', () => {
    expect(told(read([['Total', '', 'Volatility', '', 0.2]]), 'stops')).toEqual([
      'Limits!A1:E1: found no headings of a table of limits; scope, name, measure, soft and hard are needed in one row.',
    ])
    expect(
      told(
        read([
          ['Name', 'Measure'],
          ['Meadow', 'Weight'],
        ]),
        'stops',
      ),
    ).toEqual([
      'Limits!A1:B1: found no heading for the scope and the hard limit; scope, measure and a hard or a soft limit are needed.',
    ])
    const doubled = read([
      [...HEADS, 'Maximum', 'Owner'],
      ['Total', '', 'Volatility', '', 0.2, 0.3, 'R.'],
    ])
    expect(told(doubled, 'stops')).toEqual([
      'Limits!F1: found “Maximum” beside “Hard limit”; one column for the hard limit is needed.',
    ])
    expect(told(doubled, 'notes')).toEqual(['“Owner” is no part of a limit: its column is left out.'])
  })

  test('a row without a limit is noted, a table without any and limits in percent points are warned of', () => {
    const empty = rowOf('Total', '', 'Volatility', '', '')
    expect(told(empty, 'notes')).toEqual(['Row 2 has neither a soft nor a hard limit and is left out.'])
    expect(told(read([HEADS]), 'warns')).toEqual(['Limits!A1:E1: found no limits below the headings.'])
    const points = rowOf('Total', '', 'Volatility', '', 15)
    expect(told(points, 'warns')).toEqual([
      'Limits!E2: a limit of 15.00 is 1500%: does it stand in percent points? It is used as it stands.',
    ])
    expect(lines(points)).toEqual(['Total | volatility | hard 15'])
  })

  test('a second limit on one figure is told, and both stand', () => {
    const reading = read([
      HEADS,
      ['Region', 'North', 'Weight', '', 0.5],
      ['Group', 'north', 'Weight', 0.4, ''],
    ])
    expect(told(reading, 'warns')).toEqual([
      'Limits!D3: a second limit on the weight of “Region: North” (first in Limits!E2): both are judged.',
    ])
    expect(reading.limits).toHaveLength(2)
  })
})

describe('a column of limits', () => {
  const withColumn = (heading: string, values: readonly CellValue[] = [0.3, '', 0.2, 0]): HoldingsReading =>
    holdingsFrom(BOOK.map((row, k) => [...row, k === 0 ? heading : (values[k - 1] ?? '')]))

  test.each<[string, string, 'soft' | 'hard']>([
    ['Limit on share of risk', 'share of risk', 'hard'],
    ['Limit on\nshare of risk (%)', 'share of risk', 'hard'],
    ['Maximum weight', 'weight', 'hard'],
    ['Max. weight', 'weight', 'hard'],
    ['Weight limit %', 'weight', 'hard'],
    ['Contribution limit', 'contribution to risk', 'hard'],
    ['Hard limit on contribution to risk', 'contribution to risk', 'hard'],
    ['Soft limit on stand-alone risk', 'stand-alone risk', 'soft'],
    ['Cap on the risk share', 'share of risk', 'hard'],
  ])('“%s” limits the %s', (heading, measure, kind) => {
    const { limits, findings } = columnLimits(withColumn(heading))
    expect(findings).toEqual([])
    expect(lines({ limits })).toEqual([
      `Meadow | ${measure} | ${kind} 0.3`,
      `Heath | ${measure} | ${kind} 0.2`,
      `Marsh | ${measure} | ${kind} 0`,
    ])
    expect(limits.map(({ cell, members }) => [cell && addressOf(cell), ...members!])).toEqual([
      ['Book!F2', 0],
      ['Book!F4', 2],
      ['Book!F5', 3],
    ])
  })

  test.each<[string, RegExp]>([
    [
      'Limit',
      /^“Limit” of the holdings says no measure, so nothing is judged by it; a heading with one of these is needed: weight, share of risk, contribution to risk, stand-alone risk \(such as “Limit on share of risk”\)\.$/,
    ],
    ['Risk limit', /says no measure/],
    ['Limit on volatility', /speaks of volatility, which one holding has no limit on/],
  ])('“%s” is asked about, not guessed', (heading, sentence) => {
    const { limits, findings } = columnLimits(withColumn(heading))
    expect(limits).toEqual([])
    expect(findings).toMatchObject([{ weight: 'warns', sentence: expect.stringMatching(sentence) as string }])
    expect(findings[0]?.area && addressOf(findings[0].area)).toBe('Book!F1:F5')
  })

  test('without one, or with a blank one, there are no limits and nothing is told', () => {
    expect(columnLimits(HELD)).toEqual({ limits: [], findings: [] })
    expect(columnLimits(withColumn('Limit', []))).toEqual({ limits: [], findings: [] })
  })

  test('a limit below 0 on a weight is told, and percent points are asked about', () => {
    expect(told(columnLimits(withColumn('Maximum weight', [-0.1, 0.2])), 'stops')).toEqual([
      'Book!F2: found −10.00%; a limit on weight of 0 or more is needed.',
    ])
    expect(told(columnLimits(withColumn('Maximum weight', [30, 20])), 'warns')).toEqual([
      'Book!F2: a limit of 30.00 is 3000%: does it stand in percent points? It is used as it stands. 1 more like it.',
    ])
  })

  test('stands beside the table; a figure that both limit is told', () => {
    const held = withColumn('Maximum weight')
    const table = read([HEADS, ['Holding', 'Heath', 'Weight', '', 0.5]], held)
    const { limits, findings } = limitsOf(held, table)
    expect(lines({ limits })).toEqual([
      'Heath | weight | hard 0.5',
      'Meadow | weight | hard 0.3',
      'Heath | weight | hard 0.2',
      'Marsh | weight | hard 0',
    ])
    expect(findings.map(({ sentence }) => sentence)).toEqual([
      'Book!F4: a second limit on the weight of “Heath” (first in Limits!E2): both are judged.',
    ])
  })
})

/** Forty dates of four series, the last not moving with the others. */
const RETURNS: CellValue[][] = [
  ['Meadow', 'Orchard', 'Heath', 'Marsh'],
  ...Array.from({ length: 40 }, (_, t) => {
    const common = 0.01 * Math.sin(t * 1.7)
    return [
      common + 0.004 * Math.cos(t * t),
      common + 0.006 * Math.sin(2.3 * t * t),
      common / 5 + 0.002 * Math.cos(t * 2.9),
      0.003 * Math.sin(t * t * t),
    ]
  }),
]

async function bookOf(limits: CellValue[][], change: Partial<Settings> = {}, rows = BOOK, given = RETURNS) {
  const settings = { ...DEFAULT_SETTINGS, periodsPerYear: 12, ...change }
  const holdings = holdingsFrom(rows)
  const returns = readReturns(blockOf(given, 'Returns'), settings, ENGLISH)
  const blocks = {
    holdings,
    returns,
    match: matchHoldings(holdings, returns, settings.riskless),
    factors: null,
    limits: read([HEADS, ...limits], holdings),
  }
  const book = await modelFor(blocks, settings)
  return { breakdown: breakDown(blocks, book, settings), basis: profileBasis(blocks, book, settings), blocks }
}

/** The state of one limit of the book. */
async function stateOf(row: CellValue[], change: Partial<Settings> = {}, rows = BOOK, given = RETURNS) {
  const { breakdown } = await bookOf([row], change, rows, given)
  expect(breakdown.limits).toHaveLength(1)
  return breakdown.limits[0]!
}

describe('limits held against a book', () => {
  const data = RETURNS.slice(1) as number[][]
  const weights = BOOK.slice(1).map((row) => Number(row[3]))
  const C = textbookCovariance(data).map((row) => row.map((c) => 12 * c))
  const plain = textbookDecomposition(C, weights)
  const only = (members: readonly number[]) =>
    textbookDecomposition(
      C,
      weights.map((w, i) => (members.includes(i) ? w : 0)),
    ).volatility
  const sumOver = (values: readonly number[], members: readonly number[]) =>
    members.reduce((sum, i) => sum + values[i]!, 0)
  const active = weights.map((w, i) => w - Number(BOOK[i + 1]![4]))

  test.each<[string, string, string, number]>([
    ['Total', '', 'Volatility', plain.volatility],
    ['Total', '', 'Tracking error', textbookDecomposition(C, active).volatility],
    ['Holding', 'Orchard', 'Weight', 0.3],
    ['Holding', 'Marsh', 'Weight', 0.2],
    ['Holding', 'Orchard', 'Share of risk', plain.share[1]!],
    ['Holding', 'Marsh', 'Contribution to risk', plain.contribution[3]!],
    ['Holding', 'Marsh', 'Stand-alone risk', plain.standAlone[3]!],
    ['Asset class', 'Bonds', 'Weight', 0.2],
    ['Region', 'Unassigned', 'Weight', 0.2],
    ['Asset class', 'Shares', 'Share of risk', sumOver(plain.share, [0, 1])],
    ['Region', 'North', 'Contribution to risk', sumOver(plain.contribution, [0, 2])],
    ['Region', 'North', 'Stand-alone risk', only([0, 2])],
  ])('%s %s: the figure of its %s is the one of the plain formulas', async (scope, name, measure, figure) => {
    const state = await stateOf([scope, name, measure, '', 0.5])
    // two ways of adding the same doubles
    expect(absoluteGap([state.figure!], [figure])).toBeLessThan(1e-12)
    expect(state.headroom).toBeCloseTo(0.5 - figure, 12)
    // a position that reduces risk uses nothing of its limit
    if (figure < 0) expect(state.used).toBeNull()
    else expect(state.used).toBeCloseTo(figure / 0.5, 12)
  })

  test('value at risk and expected shortfall are those of the book’s confidence and horizon', async () => {
    // T (1 - confidence) = 40 x 0.2 = 8 dates: the loss of the eighth worst date, and the mean of the eight, by definition
    const tails = { method: { kind: 'historical' }, confidence: 0.8, periods: 1 } as const
    const losses = data
      .map((row) => -row.reduce((sum, r, i) => sum + r * weights[i]!, 0))
      .sort((a, b) => b - a)
    const atRisk = await stateOf(['Total', '', 'Value at risk', '', 0.1], { tails })
    const shortfall = await stateOf(['Total', '', 'Expected shortfall', '', 0.1], { tails })
    expect(atRisk.figure).toBeCloseTo(losses[7]!, 14)
    expect(shortfall.figure).toBeCloseTo(losses.slice(0, 8).reduce((a, x) => a + x, 0) / 8, 14)
    expect(atRisk.error).toBeGreaterThan(0)
    expect(shortfall).toMatchObject({ withinError: null, errorWhy: 'No standard error is computed for it.' })
  })

  test('the status follows the figure alone: at a limit is within it, beyond it is not', async () => {
    const status = async (soft: CellValue, hard: CellValue) =>
      (await stateOf(['Holding', 'Orchard', 'Weight', soft, hard])).status
    expect(await status(0.3, 0.4)).toBe('within')
    expect(await status(0.29, 0.4)).toBe('over soft')
    expect(await status(0.29, '')).toBe('over soft')
    expect(await status('', 0.3)).toBe('within')
    expect(await status(0.2, 0.29)).toBe('breach')
    // no more than solvers leave, and a little more
    expect(await status('', 0.3 * (1 - 9e-10))).toBe('within')
    expect(await status('', 0.3 * (1 - 2e-9))).toBe('breach')
  })

  test('what adding fractions leaves is no breach: 10% and 20% are no more than 30%, and what cancels is no more than 0', async () => {
    const rows = BOOK.map((row) => [...row])
    rows[1]![3] = 0.1
    rows[2]![3] = 0.2
    expect(0.1 + 0.2).toBeGreaterThan(0.3)
    expect((await stateOf(['Asset class', 'Shares', 'Weight', '', 0.3], {}, rows)).status).toBe('within')
    rows[1]![3] = 0.3
    rows[2]![3] = -(0.1 + 0.2)
    const none = await stateOf(['Asset class', 'Shares', 'Weight', '', 0], {}, rows)
    expect(none).toMatchObject({ status: 'within', used: null })
  })

  test('headroom and use are counted to the hard limit, or to the soft one alone; shares keep their sign', async () => {
    expect(await stateOf(['Holding', 'Orchard', 'Weight', 0.2, 0.4])).toMatchObject({
      most: 0.4,
      headroom: 0.4 - 0.3,
      used: 0.3 / 0.4,
    })
    expect(await stateOf(['Holding', 'Orchard', 'Weight', 0.2, ''])).toMatchObject({
      most: 0.2,
      used: 0.3 / 0.2,
    })
    const marsh = await stateOf(['Holding', 'Marsh', 'Share of risk', '', 0.1])
    expect(marsh.figure).toBeCloseTo(plain.share[3]!, 12)
    expect(marsh.status).toBe('within')
  })

  test('the band is 1.96 standard errors either way; holding a limit it says so whatever the status', async () => {
    const { error, figure } = await stateOf(['Holding', 'Orchard', 'Share of risk', '', 0.5])
    const at = async (soft: CellValue, hard: CellValue) =>
      stateOf(['Holding', 'Orchard', 'Share of risk', soft, hard])
    // a tenth of an error within the edges of the band and beyond them
    const [inside, outside] = [1.86 * error!, 2.06 * error!]
    expect(await at('', figure! + inside)).toMatchObject({ status: 'within', withinError: true })
    expect(await at('', figure! + outside)).toMatchObject({ status: 'within', withinError: false })
    expect(await at('', figure! - inside)).toMatchObject({ status: 'breach', withinError: true })
    expect(await at('', figure! - outside)).toMatchObject({ status: 'breach', withinError: false })
    expect(await at(figure! - inside, 1)).toMatchObject({ status: 'over soft', withinError: true })
  })

  test('errors of groups and of what stands alone come from the same returns, and a weight has none', async () => {
    const error = async (...row: CellValue[]) => (await stateOf([...row, '', 0.5])).error!
    // a group of one is that one: Marsh alone has no region
    for (const measure of ['Share of risk', 'Contribution to risk', 'Stand-alone risk'])
      expect(await error('Region', 'Unassigned', measure)).toBeCloseTo(
        await error('Holding', 'Marsh', measure),
        12,
      )
    expect(await error('Region', 'North', 'Share of risk')).toBeGreaterThan(0)
    expect(await stateOf(['Region', 'North', 'Weight', '', 0.5])).toMatchObject({
      error: null,
      withinError: null,
      errorWhy: 'A weight is known and has no estimation error.',
    })
  })

  test('where there are no bands the reason stands in their place', async () => {
    const { basis, blocks } = await bookOf([['Total', '', 'Volatility', '', 0.5]])
    const profile = basis.profileOf(Float64Array.from(weights))
    expect(judgeLimits(blocks.limits.limits, profile, 'Too few dates.')).toMatchObject([
      { withinError: null, errorWhy: 'Too few dates.' },
    ])
    expect(judgeLimits(blocks.limits.limits, profile, null)).toMatchObject([
      { status: 'within', withinError: null, errorWhy: null },
    ])
  })

  test('what cannot be measured is told and is no breach', async () => {
    // long and short of much the same
    const alike = RETURNS.map(([first, second, ...rest], t) =>
      t === 0 ? [first!, second!, ...rest] : [first!, Number(first) + Number(second) / 50, ...rest],
    )
    const cancelling = BOOK.map((row) => [...row])
    cancelling.slice(1).forEach((row, k) => (row[3] = [1, -1, 0.02, 0][k]!))
    const cancelled = (measure: string) =>
      stateOf(['Holding', 'Meadow', measure, '', 0.1], {}, cancelling, alike)
    expect(await cancelled('Share of risk')).toMatchObject({
      status: 'not measured',
      figure: null,
      headroom: null,
      used: null,
      why: expect.stringMatching(/^Shares of risk are withheld: contributions nearly cancel/) as string,
    })
    // contributions say as much as ever
    expect((await cancelled('Contribution to risk')).why).toBeNull()
    const nothing = BOOK.map((row, k) => (k === 0 ? row : [...row.slice(0, 3), 0, row[4]!]))
    expect((await stateOf(['Region', 'North', 'Share of risk', '', 0.1], {}, nothing)).why).toBe(
      'Shares of risk are not defined: the total risk is 0.',
    )
    expect(
      (await stateOf(['Total', '', 'Tracking error', '', 0.1], { benchmark: { kind: 'none' } })).why,
    ).toBe('There is no benchmark.')
    const monthly = { method: { kind: 'historical' }, confidence: 0.8, periods: 4 } as const
    expect((await stateOf(['Total', '', 'Value at risk', '', 0.1], { tails: monthly })).why).toBe(
      'Large losses are not measured at the present choices; their own section says why.',
    )
    const { basis, blocks } = await bookOf([['Total', '', 'Expected shortfall', '', 0.1]])
    const profile = {
      ...basis.profileOf(Float64Array.from(weights)),
      tails: () => ({ valueAtRisk: 0.1, shortfall: null, standardError: null }),
    }
    expect(judgeLimits(blocks.limits.limits, profile, null)[0]?.why).toBe(
      'The method chosen for large losses gives none.',
    )
  })

  test('the same limits are judged at other weights without reading anything again', async () => {
    const { basis, blocks } = await bookOf([
      ['Holding', 'Orchard', 'Weight', '', 0.4],
      ['Asset class', 'Shares', 'Weight', 0.85, 1],
    ])
    const after = judgeLimits(blocks.limits.limits, basis.profileOf(Float64Array.of(0.4, 0.5, 0.1, 0)), null)
    expect(after.map(({ status }) => status)).toEqual(['breach', 'over soft'])
    expect(limitsSummary(after)).toBe('2 limits: 1 breached and 1 over the soft limit only')
    expect(after.map(({ limit }) => limitText(limit))).toEqual([
      'weight of “Orchard”',
      'weight of “Asset class: Shares”',
    ])
  })

  test('limits that do not read stand with the warnings of the figures, which stop for nothing', async () => {
    const { breakdown } = await bookOf([
      ['Holding', 'Orchad', 'Weight', '', 0.4],
      ['Total', '', 'Volatility', '', 0.4],
    ])
    expect(breakdown.limits).toHaveLength(1)
    expect(told(breakdown, 'warns')).toContain(
      'Not judged: Limits!B2: found “Orchad”; the name of a holding in Book!A1:E5 is needed: “Orchard” is spelt nearly like it.',
    )
  })
})
