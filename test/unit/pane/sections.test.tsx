import AgainstBenchmark from '../../../src/pane/against-benchmark'
import { Checks } from '../../../src/pane/checks'
import { decayOf, halfLifeOf } from '../../../src/pane/estimator'
import Factors from '../../../src/pane/factors'
import { Figures } from '../../../src/pane/figures'
import Groups from '../../../src/pane/groups'
import HowSure from '../../../src/pane/how-sure'
import LargeLosses from '../../../src/pane/large-losses'
import { Positions } from '../../../src/pane/positions'
import { untold } from '../../../src/pane/returns'
import type { Area, Breakdown, BooksState, CellValue, CheckLine, Finding, Settings } from '../../../src/sheet'
import {
  bandText,
  breakDown,
  confidenceText,
  DEFAULT_SETTINGS,
  matchHoldings,
  readHoldings,
  readReturns,
} from '../../../src/sheet'
import { blockOf, ENGLISH, modelFor } from '../sheet/blocks-of-cells'
import { draw } from './drawing'

// Every block here is typed for its test.

const HOLDINGS: CellValue[][] = [
  ['Holding', 'Weight', 'Kind', 'Region', 'Benchmark weight'],
  ['Meadow', 0.5, 'Land', 'North', 0.3],
  ['Orchard', 0.4, 'Land', 'South', 0.3],
  ['Ferry', 0.2, 'Water', 'North', 0.2],
]
const RETURNS: CellValue[][] = [
  ['Meadow', 'Orchard', 'Ferry'],
  [0.01, 0.02, -0.01],
  [-0.02, 0.01, 0.03],
  [0.03, -0.01, 0.01],
  [-0.01, -0.02, 0.02],
  [0.02, 0.03, -0.02],
  [0.0, 0.01, 0.01],
]

async function breakdownOf(change: Partial<Settings> = {}, holdingRows = HOLDINGS): Promise<Breakdown> {
  const settings = { ...DEFAULT_SETTINGS, ...change }
  const holdings = readHoldings(blockOf(holdingRows), settings, ENGLISH)
  const returns = readReturns(blockOf(RETURNS, 'Returns'), settings, ENGLISH)
  const factorRows = RETURNS.map((row, t) => [t === 0 ? 'Weather' : Number(row[0]) + Number(row[1])])
  const factors = readReturns(blockOf(factorRows, 'Factors'), settings, ENGLISH)
  const blocks = { holdings, returns, match: matchHoldings(holdings, returns, []), factors }
  return breakDown(blocks, await modelFor(blocks, settings), settings)
}

/** The figure in a cell such as "12.3%". */
const figure = (cell: string | undefined): number => Number(cell?.replace('\u2212', '-').replace('%', ''))

describe('error bands', () => {
  test('are the figure and 1.96 standard errors either way', () => {
    // by hand: 10% and 1.959964 x 2%; the quantile from NIST's e-Handbook, section 1.3.6.7.1 (from memory)
    expect(bandText(0.1, 0.02, 2)).toBe('6.08% to 13.92%')
    expect(bandText(-0.01, 0.02, 1)).toBe('\u22124.9% to 2.9%')
  })

  test('stand under the volatility, and where there are none the reason does', async () => {
    const breakdown = await breakdownOf()
    expect(draw(<Figures breakdown={breakdown} checks={null} />).said).toMatch(
      /95% band \d+\.\d\d% to \d+\.\d\d%, standard error \d+\.\d\d%/,
    )
    const none = { ...breakdown, bands: 'Too few dates.' }
    expect(draw(<Figures breakdown={none} checks={null} />).said).toContain('No error band: too few dates.')
  })

  test('mark a rank that is not told apart from the next, with its words, and only those', async () => {
    const breakdown = await breakdownOf()
    const { bands } = breakdown
    if (typeof bands === 'string') throw new Error(bands)
    const marked = (tied: boolean[]) =>
      draw(<Positions breakdown={{ ...breakdown, bands: { ...bands, tied } }} />)
    const one = marked([false, true, false])
    const words = 'order not told apart from the next smaller one'
    const names = one.rows.slice(1, 4).map(([name]) => name)
    expect(names.map((name) => name?.includes(words))).toEqual([false, true, false])
    expect(names[1]).toContain('≈')
    expect(one.said).toContain('the 95% band of the difference of their shares holds 0')
    expect(marked([false, false, false]).said).not.toContain('≈')
  })
})

describe('large losses', () => {
  const drawn = (breakdown: Breakdown, capital: number | null = null, choice = DEFAULT_SETTINGS.tails) =>
    draw(<LargeLosses breakdown={breakdown} choice={choice} fault={undefined} capital={capital} />)
  const parametric = { method: { kind: 'normal' }, confidence: 0.99, periods: 1 } as const

  test('show shares of the shortfall beside shares of risk; under a normal distribution they are the same', async () => {
    // identity: the contributions of an elliptical distribution are in proportion to those of its volatility
    const { rows } = drawn(await breakdownOf({ tails: parametric }))
    const positions = rows.slice(1, 4)
    expect(positions).toHaveLength(3)
    for (const [, share, ofShortfall, difference] of positions) {
      expect(ofShortfall).toBe(share)
      expect(difference).toBe('0.0')
    }
    expect(rows[4]?.slice(1, 3)).toEqual(['100.0%', '100.0%'])
  })

  test('say in place why parts are withheld, and show no table of them', async () => {
    // six dates at 95% confidence: a third of a date in the tail
    const breakdown = await breakdownOf()
    const { tails } = breakdown
    if (typeof tails === 'string') throw new Error(tails)
    const { said, rows } = drawn({ ...breakdown, tails: { ...tails, difference: 'Ferry has more of it.' } })
    expect(said).toContain('Parts are withheld')
    expect(said).not.toContain('Ferry')
    expect(rows).toEqual([])
  })

  test('are told in money too where the holdings are amounts', async () => {
    const breakdown = await breakdownOf()
    const { tails } = breakdown
    if (typeof tails === 'string') throw new Error(tails)
    const risk = { ...tails.risk, valueAtRisk: 0.02, shortfall: 0.03 }
    // by hand: 2% and 3% of 1,500
    expect(drawn({ ...breakdown, tails: { ...tails, risk } }, 1500).said).toContain(
      'Of the capital of 1,500: value at risk 30, expected shortfall 45.',
    )
    expect(drawn(breakdown).said).not.toContain('Of the capital')
  })

  test.each([
    ['historical', 'past returns tell the losses of one period alone'],
    ['cornish-fisher', 'skewness and kurtosis are those of one period alone'],
  ] as const)('of %s ask for a horizon of 1 at that very field, and keep the others', async (kind, why) => {
    const choice = { method: { kind }, confidence: 0.95, periods: 5 } as const
    const breakdown = await breakdownOf({ tails: choice })
    const { said } = drawn(breakdown, null, choice)
    expect(breakdown.tails).toMatch(/^The horizon is 5 periods: .* Choose a horizon of 1, or the normal/)
    expect(breakdown.tails).toContain(why)
    const fields = ['Method', 'Confidence level', 'Horizon, periods', String(breakdown.tails)]
    const places = fields.map((field) => said.indexOf(field))
    expect(Math.min(...places)).toBeGreaterThanOrEqual(0)
    expect([...places].sort((a, b) => a - b)).toEqual(places)
    expect(said).not.toContain('NaN')
  })
})

describe('the benchmark', () => {
  const drawn = (breakdown: Breakdown) => {
    if (!breakdown.active) throw new Error('no benchmark')
    return draw(<AgainstBenchmark active={breakdown.active} breakdown={breakdown} />)
  }

  test.each(['own returns', 'benchmark-relative returns'] as const)(
    'split by %s, parts of the tracking error add up to it in the table',
    async (convention) => {
      const { rows, said } = drawn(await breakdownOf({ convention }))
      const body = rows.slice(1, -1)
      expect(body.some(([name]) => name === 'Net active weight')).toBe(
        convention === 'benchmark-relative returns',
      )
      const parts = body.reduce((sum, [, , part]) => sum + figure(part), 0)
      // each row is rounded to two decimals of a percent
      expect(Math.abs(parts - figure(rows.at(-1)?.[2]))).toBeLessThanOrEqual(0.005 * (body.length + 1))
      expect(said).toContain(`Split by ${convention}.`)
      expect(said).toContain('difference 0.0000%')
    },
  )

  test('that is one series has a row of its own, told from the holding of that name', async () => {
    const { rows } = drawn(await breakdownOf({ benchmark: { kind: 'series', name: 'Ferry' } }))
    const weights = new Map(rows.map(([name, weight]) => [name, weight]))
    expect(weights.get('Ferry')).toBe('20.0%')
    expect(weights.get('Ferry (the benchmark)')).toBe('\u2212100.0%')
  })

  test('equal to the book gives a tracking error of 0 and shares that are not defined', async () => {
    const same = HOLDINGS.map((row, k) => (k === 0 ? row : [...row.slice(0, 4), row[1]!]))
    const { said } = drawn(await breakdownOf({}, same))
    expect(said).toContain('Tracking error (ex ante) per period 0.00%')
    expect(said).toContain('Shares are not defined')
    expect(said).not.toContain('NaN')
  })
})

test('groups one within the other show the outermost first, and wait for a second column', async () => {
  const nesting = ['Region', 'Kind']
  const { said, rows } = draw(<Groups breakdown={await breakdownOf({ nesting })} nesting={nesting} />)
  expect(said).toContain('1. Region')
  expect(said).toContain('2. Kind')
  const tree = rows.slice(rows.findIndex(([first]) => first === 'Region, Kind') + 1)
  expect(tree.map(([name]) => name)).toEqual(expect.arrayContaining(['North', 'South', 'Total']))
  expect(tree).toHaveLength(3)
  // weights of North by hand: 50% + 20%
  expect(tree.find(([name]) => name === 'North')?.[1]).toBe('70.0%')
  expect(draw(<Groups breakdown={await breakdownOf()} nesting={[]} />).said).toContain('Press two columns')
})

test('factors and specific parts add up to the volatility in the table', async () => {
  const { rows, said } = draw(<Factors breakdown={await breakdownOf({ estimator: { kind: 'factors' } })} />)
  const [, weather, specific, total] = rows
  expect([weather?.[0], specific?.[0], total?.[0]]).toEqual(['Weather', 'Specific to holdings', 'Total'])
  // each of the three is rounded to two decimals of a percent
  expect(Math.abs(figure(weather?.[1]) + figure(specific?.[1]) - figure(total?.[1]))).toBeLessThanOrEqual(
    0.015,
  )
  expect(said).toContain('difference 0.0000%')
})

describe('data checks', () => {
  const cell: Area = { sheet: 'Returns', row: 1, column: 2, rows: 1, columns: 1 }
  const found: CheckLine = {
    check: {
      kind: 'gaps',
      weight: 'warns',
      sentence: 'Returns!C2: “Ferry” has no return.',
      area: cell,
      effect: 'One date is left out.',
      remedy: 'Put in the return.',
      corrections: [],
      areas: [cell],
      names: ['Ferry'],
    },
    corrections: [
      { label: 'With each pair’s own overlap', change: { gaps: 'own overlap' }, volatility: 0.091 },
      { label: 'Completed', change: null, volatility: 'It cannot be computed.' },
    ],
  }
  const state = async (checks: readonly CheckLine[] | null): Promise<BooksState> => {
    const breakdown = await breakdownOf()
    const given = {
      holdings: readHoldings(blockOf(HOLDINGS), DEFAULT_SETTINGS, ENGLISH),
      returns: readReturns(blockOf(RETURNS, 'Returns'), DEFAULT_SETTINGS, ENGLISH),
      breakdown: { ...breakdown, decomposition: { ...breakdown.decomposition, volatility: 0.083 } },
      checks,
    }
    return given as unknown as BooksState
  }

  test('tell what it does, what can be done, and the volatility before and after', async () => {
    const { said } = draw(<Checks state={await state([found, found])} />)
    expect(said).toContain('2 warnings')
    expect(said).toContain('One date is left out.')
    expect(said).toContain('Put in the return.')
    expect(said).toContain('Volatility 8.30% → 9.10%')
    expect(said).toContain('It cannot be computed.')
    // one button for the correction that a choice makes, in each of the two
    expect(said.match(/Apply/g)).toHaveLength(2)
  })

  test('say so when nothing was found, and that they are still to come', async () => {
    expect(draw(<Checks state={await state([])} />).said).toContain('Nothing found')
    expect(draw(<Checks state={await state(null)} />).said).toContain('Not looked over yet')
  })

  test('take the place of a note on the same cells, never of what stops', () => {
    const finding = (weight: Finding['weight'], area: Area): Finding => ({ weight, sentence: '', area })
    const other = { ...cell, row: 7 }
    const findings = [finding('notes', cell), finding('stops', cell), finding('notes', other)]
    expect(untold(findings, [found])).toEqual([finding('stops', cell), finding('notes', other)])
    expect(untold(findings, null)).toEqual(findings)
  })
})

test('decay factor and half-life say the same', () => {
  // after one half-life the weight is a half
  expect(0.94 ** halfLifeOf(0.94)).toBeCloseTo(0.5, 14)
  expect(decayOf(1)).toBe(0.5)
  expect(decayOf(halfLifeOf(0.97))).toBeCloseTo(0.97, 14)
})

test('a confidence level reads as it was typed', () => {
  expect([0.99, 0.975, 0.9995].map(confidenceText)).toEqual(['99%', '97.5%', '99.95%'])
})

test('where there are no error bands the reason stands in their place, and no study is offered', async () => {
  const breakdown = { ...(await breakdownOf()), bands: 'Too few dates.' }
  const state = {
    working: null,
    studies: { bootstrap: null, backtest: null, outdated: {} },
  } as unknown as BooksState
  const { said } = draw(
    <HowSure breakdown={breakdown} state={state} fault={undefined} asked={() => undefined} />,
  )
  expect(said).toBe('Too few dates.')
})
