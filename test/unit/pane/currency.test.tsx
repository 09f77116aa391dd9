import Currencies from '../../../src/pane/currencies'
import { Currency } from '../../../src/pane/currency'
import { Figures } from '../../../src/pane/figures'
import type { BooksState, Breakdown, CellValue, Settings } from '../../../src/sheet'
import { breakDown, DEFAULT_SETTINGS, matchHoldings, readHoldings, readReturns } from '../../../src/sheet'
import { blockOf, ENGLISH, modelFor } from '../sheet/blocks-of-cells'
import { draw } from './drawing'

// Every block here is typed for its test.

const HOLDINGS: CellValue[][] = [
  ['Holding', 'Currency', 'Weight'],
  ['Meadow', 'EUR', 0.5],
  ['Prairie', 'USD', 0.5],
]
const RETURNS: CellValue[][] = [
  ['Meadow', 'Prairie', 'USD'],
  [0.01, 0.02, -0.01],
  [-0.02, 0.01, 0.03],
  [0.03, -0.01, 0.01],
  [-0.01, -0.02, 0.02],
]
const CURRENCY = { base: 'EUR', returnsIn: 'base' } as const

function read(change: Partial<Settings>, holdingRows = HOLDINGS) {
  const settings = { ...DEFAULT_SETTINGS, ...change }
  const holdings = readHoldings(blockOf(holdingRows), settings, ENGLISH)
  const returns = readReturns(blockOf(RETURNS, 'Returns'), settings, ENGLISH)
  return { settings, holdings, returns }
}

async function breakdownOf(change: Partial<Settings>): Promise<Breakdown> {
  const { settings, holdings, returns } = read(change)
  const match = matchHoldings(holdings, returns, [], settings.currency)
  const blocks = { holdings, returns, match, factors: null }
  return breakDown(blocks, await modelFor(blocks, settings), settings)
}

/** The figure in a cell such as "12.3%". */
const figure = (cell: string | undefined): number => Number(cell?.replace('\u2212', '-').replace('%', ''))

test('both tables add up across, and down to the volatility', async () => {
  const breakdown = await breakdownOf({ currency: CURRENCY })
  const { rows, said } = draw(<Currencies breakdown={breakdown} currency={breakdown.currency!} />)
  const figures = rows.filter(([, first]) => first?.endsWith('%'))
  expect(figures.map(([name]) => name)).toEqual([
    'EUR',
    'USD',
    'Total',
    // the dollar moves against the book, so that it has a part below 0
    'Meadow (EUR)',
    'Prairie (USD)',
    'Total',
  ])
  for (const row of figures) {
    const [local, currency, contribution] = row.slice(-3).map(figure)
    // each is shown to two decimals of a percent
    expect(Math.abs(local! + currency! - contribution!)).toBeLessThanOrEqual(0.0151)
  }
  for (const row of figures.filter(([name]) => name === 'Total'))
    expect(figure(row.at(-1))).toBeCloseTo(breakdown.decomposition.volatility * 100, 1)
  expect(said).toContain('difference 0.0000%')
})

test('where risk cannot be split the reason stands in the place of the tables', async () => {
  const breakdown = await breakdownOf({
    currency: CURRENCY,
    estimator: { kind: 'shrinkage', target: 'identity' },
  })
  const { rows, said } = draw(<Currencies breakdown={breakdown} currency={breakdown.currency!} />)
  expect(rows).toEqual([])
  expect(said).toMatch(/^The split by currency goes with the sample covariance/)
})

test('the base currency stands beside the volatility once it is chosen', async () => {
  const said = async (change: Partial<Settings>) =>
    draw(<Figures breakdown={await breakdownOf(change)} checks={null} />).said
  expect(await said({ currency: CURRENCY })).toContain('Volatility per period in EUR')
  expect(await said({})).not.toContain('in EUR')
})

describe('the choice', () => {
  const drawn = (change: Partial<Settings>, holdingRows = HOLDINGS, faults = {}) =>
    draw(<Currency state={{ ...read(change, holdingRows), faults } as unknown as BooksState} />).said

  test('is there only where a column names currencies', () => {
    const plain = HOLDINGS.map(([name, , weight]) => [name!, weight!])
    expect(drawn({}, plain)).toBe('')
    expect(drawn({})).toContain('In the holdings: EUR and USD.')
    expect(drawn({})).not.toContain('Blank cells')
    const blank = HOLDINGS.map(([name, label, weight]) => [name!, label === 'EUR' ? '' : label!, weight!])
    expect(drawn({}, blank)).toContain('In the holdings: USD. Blank cells count as in the base currency.')
  })

  test('asks what foreign returns stand in once there is a base currency, and shows its fault', () => {
    expect(drawn({})).not.toContain('Returns of foreign holdings')
    expect(drawn({ currency: CURRENCY }, HOLDINGS, { currency: 'No series “USD”.' })).toMatch(
      /Returns of foreign holdings stand in.*No series “USD”\./,
    )
  })
})
