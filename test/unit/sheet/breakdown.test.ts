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
async function printed(rows: CellValue[][], change: Partial<Settings> = {}): Promise<string[]> {
  const settings = { ...DEFAULT_SETTINGS, ...change }
  const holdings = readHoldings(blockOf(rows), settings, ENGLISH)
  const returns = readReturns(blockOf(RETURNS, 'Returns'), settings, ENGLISH)
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
