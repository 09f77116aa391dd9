import type { CellValue, Settings } from '../../../src/sheet'
import {
  breakDown,
  breakdownTable,
  DEFAULT_SETTINGS,
  matchHoldings,
  readHoldings,
  readReturns,
} from '../../../src/sheet'
import { blockOf, ENGLISH, modelFor } from './blocks-of-cells'

// Every block here is typed for its test.

const RETURNS: CellValue[][] = [
  ['Meadow', 'Orchard'],
  [0.01, 0.02],
  [-0.02, 0.01],
  [0.03, -0.01],
]

/** The written table, a line for each row: its filled cells. */
async function printed(
  rows: CellValue[][],
  change: Partial<Settings> = {},
  given: CellValue[][] = RETURNS,
): Promise<string[]> {
  const settings = { ...DEFAULT_SETTINGS, ...change }
  const holdings = readHoldings(blockOf(rows), settings, ENGLISH)
  const returns = readReturns(blockOf(given, 'Returns'), settings, ENGLISH)
  const match = matchHoldings(holdings, returns, settings.riskless)
  const blocks = { holdings, returns, match, factors: null }
  const model = await modelFor(blocks, settings)
  return breakdownTable('Book', breakDown(blocks, model, settings)).cells.map((row) =>
    row
      .map(({ value }) => value)
      .filter((value) => value !== '')
      .join(' | '),
  )
}

const AMOUNTS: CellValue[][] = [
  ['Holding', 'Amount'],
  ['Meadow', 600],
  ['Orchard', 400],
]

test('what amounts are divided by is printed with the settings', async () => {
  expect(await printed(AMOUNTS)).toContain(
    'Capital | Weights are amounts divided by 1,000.00 (their sum): net 100.00%, gross 100.00%',
  )
  expect(await printed(AMOUNTS, { capital: 2000 })).toContain(
    'Capital | Weights are amounts divided by 2,000.00: net 50.00%, gross 50.00%',
  )
  expect(
    await printed([
      ['Holding', 'Weight'],
      ['Meadow', 0.6],
      ['Orchard', 0.3],
    ]),
  ).toContain('Capital | Weights are used as they stand: net 90.00%, gross 90.00%')
})

test('an expected return of the user’s own is by the year, whatever the risk is scaled to', async () => {
  const rows: CellValue[][] = [
    ['Holding', 'Weight', 'Expected return'],
    ['Meadow', 0.5, 0.06],
    ['Orchard', 0.5, 0.04],
  ]
  const line = /^Expected return .* \| Expected return \(column “Expected return”\)$/
  expect((await printed(rows)).find((row) => line.test(row))).toMatch(/^Expected return a year \| 0\.05 /)
  expect((await printed(rows, { periodsPerYear: 12 })).find((row) => line.test(row))).toMatch(
    /^Expected return a year \| 0\.05 /,
  )
})

test('an average of past returns is per period until the periods per year are known', async () => {
  const rows: CellValue[][] = [
    ['Holding', 'Weight'],
    ['Meadow', 0.5],
    ['Orchard', 0.5],
  ]
  const last = (lines: string[]) => lines.find((row) => row.endsWith('| Average past return, not a forecast'))
  expect(last(await printed(rows))).toMatch(/^Expected return per period \| /)
  expect(last(await printed(rows, { periodsPerYear: 12 }))).toMatch(/^Expected return a year \| /)
})

test('a warning from reading the blocks stands in the table as well', async () => {
  const lines = await printed([
    ['Holding', 'Weight'],
    ['Meadow', 60],
    ['Orchard', 40],
  ])
  expect(lines.slice(lines.indexOf('Warnings') + 1)).toContain(
    'Weights sum to 100.00: do they stand in percent points? They are used as they stand, as multiples of capital.',
  )
})

// T (1 - confidence) = 40 x 0.3 = 12 dates in the tail, by hand: enough for parts
const LONG_TAIL = { method: { kind: 'historical' }, confidence: 0.7, periods: 1 } as const
const forty = (row: (t: number) => CellValue[]): CellValue[][] => [
  ['Meadow', 'Orchard'],
  ...Array.from({ length: 40 }, (_, t) => row(t)),
]

test('parts of a shortfall that is a gain, or in which they nearly cancel, are withheld with the reason', async () => {
  const gains = await printed(
    AMOUNTS,
    { tails: LONG_TAIL },
    forty((t) => [0.01 + 0.0001 * t, 0.02 + 0.0001 * ((7 * t) % 40)]),
  )
  expect(gains).toContain(
    'Parts are not shown: there is no loss to share, as the expected shortfall is not above 0.',
  )
  // long and short of much the same drift, and each with moves of its own
  const cancelling = await printed(
    [
      ['Holding', 'Weight'],
      ['Meadow', 1],
      ['Orchard', -1],
    ],
    { tails: LONG_TAIL },
    forty((t) => [-0.5 + 0.01 * Math.sin(t), -0.5 + 0.01 * Math.cos(3 * t)]),
  )
  expect(cancelling.some((line) => /^Parts are withheld: they nearly cancel/.test(line))).toBe(true)
  expect(cancelling.some((line) => /^Meadow \| 1 \| withheld \| withheld/.test(line))).toBe(true)
})

test('past returns of common dates are told apart from a model that rests on more', async () => {
  const gaps = forty((t) => [t < 10 ? '' : 0.01 * Math.sin(3 * t), 0.02 * Math.cos(t * t)])
  const method = async (change: Partial<Settings>) =>
    (await printed(AMOUNTS, change, gaps)).find((line) => line.startsWith('Value at risk'))
  expect(await method({ gaps: 'own overlap', tails: LONG_TAIL })).toMatch(
    /9\.0 dates in the tail; from the 30 dates common to all holdings alone\.$/,
  )
  expect(await method({ gaps: 'common dates', tails: LONG_TAIL })).not.toMatch(/alone/)
  expect(
    await method({ gaps: 'completed', tails: { ...LONG_TAIL, method: { kind: 'normal' } } }),
  ).not.toMatch(/alone/)
})

test('what is said of a normal distribution says no more than its tests can see', async () => {
  // normal scores of a permutation, one for each series: nothing to be seen in either, by construction
  const scores = (order: number): number[] =>
    Array.from({ length: 40 }, (_, t) => {
      const u = (((t * order) % 41) + 0.5) / 41
      return 0.01 * (u ** 0.135 - (1 - u) ** 0.135) * 5.06
    })
  const [a, b] = [scores(7), scores(16)]
  const line = async (given: CellValue[][]) =>
    (await printed(AMOUNTS, {}, given)).find((text) => text.startsWith('Normality'))
  expect(await line(forty((t) => [a[t]!, b[t]!]))).toMatch(
    /nor do its parts together: as far as these dates tell,.* With 40 dates these tests see strong departures only\.$/,
  )
  // one series is twice the other
  expect(await line(forty((t) => [a[t]!, 2 * a[t]!]))).toMatch(
    /its parts were not tested together.* as one of them follows from the others/,
  )
})

test('the square root of time is said to hold as far as the estimator lets it', async () => {
  const scaling = async (change: Partial<Settings>) =>
    (await printed(AMOUNTS, { periodsPerYear: 52, ...change })).find((text) => text.startsWith('Scaling'))
  expect(await scaling({})).toMatch(/holds for returns without autocorrelation$/)
  expect(await scaling({ estimator: { kind: 'lagged', lags: 1 } })).toMatch(
    /autocorrelation beyond the lagged terms is not allowed for$/,
  )
})
