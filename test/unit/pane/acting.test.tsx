/** Limits, targets, sizing, implied returns and scenarios as they are drawn over a workbook of plain arrays. Every block here is typed for its test. */
import fc from 'fast-check'
import { typedPercent, typedPercentText } from '../../../src/pane/controls'
import { Figures } from '../../../src/pane/figures'
import ImpliedReturns from '../../../src/pane/implied-returns'
import Limits, { byUrgency } from '../../../src/pane/limits'
import { LimitsTable } from '../../../src/pane/limits-table'
import Sizing, { volatilityAt } from '../../../src/pane/sizing'
import Stress from '../../../src/pane/stress'
import Targets from '../../../src/pane/targets'
import type { Books, Breakdown, CellValue, LimitState, TradesState } from '../../../src/sheet'
import { addressOf, openBooks } from '../../../src/sheet'
import { plainWorkbook } from '../sheet/plain-workbook'
import { draw } from './drawing'

const SERIES = ['Meadow', 'Orchard', 'Mill', 'Quarry']
const RETURNS: CellValue[][] = [
  [...SERIES, 'Ferry'],
  ...Array.from({ length: 40 }, (_, t) =>
    [...SERIES, 'Ferry'].map((_, i) =>
      Number((0.02 * Math.sin(1 + 1.7 * t + 2.3 * i * i) + 0.005 * ((t * (i + 1)) % 3)).toFixed(5)),
    ),
  ),
]
const WEIGHTS = [0.4, 0.3, 0.2, 0.1]
const HOLDINGS: CellValue[][] = [
  ['Holding', 'Class', 'Weight', 'Expected return'],
  ['Meadow', 'Land', 0.4, 0.004],
  ['Orchard', 'Land', 0.3, 0.003],
  ['Mill', 'Works', 0.2, 0.002],
  ['Quarry', 'Works', 0.1, 0.001],
]
const LIMITS: CellValue[][] = [
  ['Scope', 'Name', 'Measure', 'Soft', 'Hard'],
  ['Holding', 'Mill', 'Weight', '', 0.5],
  ['Holding', 'Meadow', 'Weight', 0.3, 0.35],
  ['Holding', 'Orchard', 'Weight', 0.25, 0.35],
  ['Total', '', 'Tracking error', '', 0.05],
]

const running: Books[] = []
afterEach(async () => {
  for (const books of running.splice(0)) await books.close()
})

async function book({ holdings = HOLDINGS, limits = LIMITS as CellValue[][] | null } = {}) {
  const workbook = plainWorkbook({
    Book: holdings.map((row) => [...row]),
    Returns: RETURNS,
    ...(limits ? { Limits: limits } : {}),
  })
  const books = await openBooks(workbook.port)
  running.push(books)
  const take = async (field: 'holdings' | 'returns' | 'limits', sheet: string, block: CellValue[][]) => {
    const columns = block[0]?.length ?? 1
    workbook.select(addressOf({ sheet, row: 0, column: 0, rows: block.length, columns }))
    await books.takeSelection(field)
  }
  await take('holdings', 'Book', holdings)
  await take('returns', 'Returns', RETURNS)
  if (limits) await take('limits', 'Limits', limits)
  await books.compute()
  const breakdown = (): Breakdown => {
    const found = books.state().breakdown
    if (!found) throw new Error('no figures')
    return found
  }
  const trades = (): TradesState => {
    const found = books.state().trades
    if (!found) throw new Error('no trades')
    return found
  }
  const asked = () => undefined
  return {
    books,
    breakdown,
    trades,
    limits: () => {
      const { comparison } = trades()
      const after = typeof comparison === 'string' ? null : comparison.limitsAfter
      return draw(<Limits states={breakdown().limits} after={after} fault={undefined} />, books)
    },
    targets: (fault?: string) =>
      draw(
        <Targets
          state={books.state()}
          breakdown={breakdown()}
          trades={trades()}
          fault={fault}
          asked={asked}
        />,
        books,
      ),
    sizing: () =>
      draw(<Sizing trades={trades()} breakdown={breakdown()} decimal={books.state().decimal} />, books),
    implied: () => draw(<ImpliedReturns state={books.state()} breakdown={breakdown()} />, books),
    stress: () =>
      draw(
        <Stress breakdown={breakdown()} trades={trades()} busy={false} fault={undefined} asked={asked} />,
        books,
      ),
  }
}

/** The figure in a cell such as "12.3%". */
const figure = (cell: string | undefined): number =>
  Number(cell?.replace('\u2212', '-').replaceAll(/[%,+]/g, ''))

/** Volatility a period by the definition: the square root of w'Cw, C with divisor T - 1. */
function naiveVolatility(weights: readonly number[]): number {
  const rows = RETURNS.slice(1).map((row) =>
    weights.reduce((sum, weight, i) => sum + weight * Number(row[i]), 0),
  )
  const mean = rows.reduce((sum, y) => sum + y, 0) / rows.length
  return Math.sqrt(rows.reduce((sum, y) => sum + (y - mean) ** 2, 0) / (rows.length - 1))
}

describe('limits', () => {
  test('stand with the breach first, then what is over its soft limit, and the headroom of each', async () => {
    const { limits } = await book()
    const { said, markup } = limits()
    const items = [...markup.matchAll(/<li\b.*?<\/li>/gs)].map(([item]) => item.replace(/<[^>]*>/g, ' '))
    expect(items.map((item) => item.replace(/\s+/g, ' ').trim().slice(0, 20))).toEqual([
      expect.stringContaining('● Breach 40.00%'),
      expect.stringContaining('◐ Over soft limit'),
      expect.stringContaining('– Not measured –'),
      expect.stringContaining('○ Within 20.00%'),
    ])
    // by hand: 35 - 40 and 40/35; 35 - 30 and 30/35
    expect(said).toContain('Hard limit 35.00%, soft limit 30.00%; headroom −5.00 points; 114% used')
    expect(said).toContain('Hard limit 35.00%, soft limit 25.00%; headroom +5.00 points; 86% used')
    expect(said).toContain('There is no benchmark.')
    expect(said).toContain('Limits!E3')
    expect(said).not.toContain('NaN')
  })

  test('show a small figure in as many decimals as show that it is over its limit', async () => {
    const { limits } = await book({ limits: [...LIMITS, ['Holding', 'Quarry', 'Weight', '', 0.09998]] })
    expect(limits().said).toMatch(
      /Breach 10\.000% Weight of “Quarry” Hard limit 9\.998%; headroom \u22120\.002 points/,
    )
  })

  test('say what they come to with the trades, where that is another figure or status', async () => {
    const { books, limits } = await book()
    expect(limits().said).not.toContain('With the trades')
    books.trade({ line: { key: 'Meadow', entry: 'new weight', text: '32%' } })
    const { said } = limits()
    expect(said).toContain('With the trades: 32.00%, ◐ over soft limit.')
    expect(said.match(/With the trades/g)).toHaveLength(1)
  })

  test('tell a figure whose band holds a limit, and keep its status', async () => {
    const { breakdown } = await book()
    const [state] = breakdown().limits
    if (!state) throw new Error('no limit')
    const near: LimitState = {
      ...state,
      figure: 0.49,
      headroom: 0.01,
      used: 0.98,
      error: 0.01,
      withinError: true,
      errorWhy: null,
    }
    const drawn = (states: readonly LimitState[]) =>
      draw(<Limits states={states} after={null} fault={undefined} />).said
    // by hand: 49% and 1.96 standard errors of 1%; the quantile from NIST's e-Handbook, section 1.3.6.7.1 (from memory)
    expect(drawn([near])).toContain(
      '○ Within 49.00% Weight of “Mill” Hard limit 50.00%; headroom +1.00 points; 98% used; Limits!E2 Within estimation error: the 95% band, 47.04% to 50.96%, holds a limit.',
    )
    expect(drawn([{ ...near, withinError: false }])).not.toContain('estimation error')
  })

  test('are put in an order that never sets one that is kept before one that is not', () => {
    const status = fc.constantFrom('within', 'over soft', 'breach', 'not measured')
    const used = fc.option(fc.double({ min: -2, max: 3, noNaN: true }))
    fc.assert(
      fc.property(fc.array(fc.record({ status, used }), { maxLength: 12 }), (drawn) => {
        const states = drawn as unknown as readonly LimitState[]
        const order = byUrgency(states)
        expect([...order].sort((a, b) => a - b)).toEqual(states.map((_, k) => k))
        const words = order.map((k) => states[k]!.status)
        const first = (word: string) => words.indexOf(word as (typeof words)[number])
        for (const word of ['within', 'not measured', 'over soft'])
          if (first(word) >= 0) expect(words.lastIndexOf('breach')).toBeLessThan(first(word))
      }),
    )
  })

  test('that there are none says how they come to a book', async () => {
    const { limits } = await book({ limits: null })
    expect(limits().said).toMatch(
      /^There are no limits yet\..*Scope, Name, Measure, Soft and Hard.*Use selection/,
    )
  })

  test('are counted in one line with the figures of the book', async () => {
    const { breakdown } = await book()
    const said = (part: Breakdown) => draw(<Figures breakdown={part} checks={null} />).said
    expect(said(breakdown())).toContain('Limits (under Trades) 1 breached, 1 over soft, 1 not measured')
    const kept = breakdown().limits.filter(({ status }) => status === 'within')
    expect(said({ ...breakdown(), limits: kept })).toContain('Limits (under Trades) all 1 within')
    expect(said({ ...breakdown(), limits: [] })).not.toContain('Limits')
  })

  test('have their step under Data: folded while there is no table, then its line and the way out', async () => {
    const without = await book({ limits: null })
    expect(draw(<LimitsTable state={without.books.state()} />).said).toMatch(/^Table of limits \(optional\)/)
    const { books } = await book()
    const { said } = draw(<LimitsTable state={books.state()} />)
    expect(said).toContain('Limits!A1:E5')
    expect(said).toContain('4 limits: 1 on the total and 3 on holdings')
    expect(said).toContain('Do without the table')
  })
})

describe('targets', () => {
  test('ask for the smallest change first, and say what takes the difference', async () => {
    const { targets } = await book()
    const { said } = targets()
    for (const field of ['Limits to meet', 'Sum of the weights', 'Most turnover, %', 'In steps of, %'])
      expect(said).toContain(field)
    expect(said).not.toContain('Proposal')
    expect(targets('Found no limits.').said).toContain('Found no limits.')
  })

  const smallest = { kind: 'smallest change', net: 'kept', against: 'hard', lot: null } as const

  test('show what was found: that it is met, how, and the caution', async () => {
    const { books, targets } = await book()
    await books.propose({ ...smallest, turnover: null })
    const { said } = targets()
    expect(said).toContain('Proposal: Smallest change that meets all limits ✓ Met.')
    // by hand: the weight of Meadow is 40% and its limit 35%
    expect(said).toContain('turnover 5.00% one way')
    expect(said).toContain('in the list of trades below')
    expect(said).toContain('not advice')
  })

  test('say of what was found that a line was changed since', async () => {
    const { books, targets } = await book()
    await books.propose({ ...smallest, turnover: null })
    expect(targets().said).not.toContain('found before')
    books.trade({ line: { key: 'Meadow', entry: 'new weight', text: '39%' } })
    expect(targets().said).toContain('The proposal was found before lines of the list changed')
  })

  test('say clearly when nothing meets what was asked for', async () => {
    const { books, targets } = await book()
    // 5% of turnover are needed
    await books.propose({ ...smallest, turnover: 0.02 })
    const { said } = targets()
    expect(said).toContain('✗ Not met. No weights that meet all limits were found')
    expect(said).not.toContain('✓')
  })
})

describe('sizing', () => {
  test('the curve between its points is the definition of volatility', async () => {
    const { books } = await book()
    const sizing = books.sizingOf('Mill', { kind: 'cash' })
    if (typeof sizing === 'string') throw new Error(sizing)
    for (const weight of [-0.1, 0.0371, 0.2, 0.377]) {
      const weights = WEIGHTS.map((own, i) => (i === 2 ? weight : own))
      // three points of a quadratic a few percent apart leave about ten of sixteen digits
      expect(Math.abs(volatilityAt(sizing.curve, weight) / naiveVolatility(weights) - 1)).toBeLessThan(1e-9)
    }
  })

  test('the marginal contribution net of its financing is the slope of that curve', async () => {
    const { books } = await book()
    const step = 1e-5
    const moved = (by: number) => [0.4 - by, 0.3, 0.2 + by, 0.1]
    const sizing = books.sizingOf('Mill', { kind: 'position', key: 'Meadow' })
    if (typeof sizing === 'string') throw new Error(sizing)
    const slope = (naiveVolatility(moved(step)) - naiveVolatility(moved(-step))) / (2 * step)
    // a central difference of step 1e-5 is off by about 1e-10 of the curvature, rounding by 1e-11
    expect(Math.abs((sizing.slope ?? NaN) - slope)).toBeLessThan(1e-8)
  })

  test('is told in points with a name, in facts, and beside the trades that lower risk most', async () => {
    const { sizing } = await book()
    const { rows, said, markup } = sizing()
    const points = new Map(rows.map(([name, weight, volatility]) => [name, [weight, volatility] as const]))
    // Orchard contributes most and is offered first
    expect(points.get('Today')).toEqual(['30.00%', `${(naiveVolatility(WEIGHTS) * 100).toFixed(2)}%`])
    expect(points.get('Removed')).toEqual([
      '0.00%',
      `${(naiveVolatility([0.4, 0, 0.2, 0.1]) * 100).toFixed(2)}%`,
    ])
    expect(points.get('Weight, hard limit 35.0%')?.[0]).toBe('35.00%')
    for (const fact of [
      'Marginal contribution to risk, net of financing',
      'Change in risk if removed',
      'Least-risk weight',
      'Trades that lower risk most',
      'not advice',
      'paid for by cash beyond the holdings (nothing else moves)',
    ])
      expect(said).toContain(fact)
    expect(markup).toMatch(/role="slider"[^>]*aria-valuetext="30\.00%, volatility \d\.\d\d%"/)
    expect(said).not.toContain('NaN')
  })

  test('of the holding that pays says that it cannot pay for itself', async () => {
    const { books, sizing } = await book()
    books.trade({ financing: { kind: 'position', key: 'Orchard' } })
    const { said } = sizing()
    expect(said).toContain('The position that finances has')
    expect(said).not.toContain('Least-risk weight')
  })
})

describe('implied returns', () => {
  test('add up by weight to the total, which is risk aversion times variance; the difference is what is expected less', async () => {
    const { implied } = await book()
    const { rows, said } = implied()
    const table = rows.slice(1, 6)
    expect(table.map(([name]) => name)).toEqual([...SERIES, 'Total'])
    const [total] = table.slice(-1)
    const byWeight = WEIGHTS.reduce((sum, weight, i) => sum + weight * figure(table[i]?.[1]), 0)
    // each is shown to two decimals of a percent
    expect(Math.abs(byWeight - figure(total?.[1]))).toBeLessThanOrEqual(0.0101)
    expect(Math.abs(figure(total?.[1]) - 3 * naiveVolatility(WEIGHTS) ** 2 * 100)).toBeLessThanOrEqual(0.0051)
    for (const [, own, expected, difference] of table)
      expect(Math.abs(figure(expected) - figure(own) - figure(difference))).toBeLessThanOrEqual(0.0151)
    // by hand: 0.4 x 0.4% + 0.3 x 0.3% + 0.2 x 0.2% + 0.1 x 0.1%
    expect(total?.[2]).toBe('0.30%')
    expect(said).toContain('not a forecast')
    expect(said).toContain('Riskless rate per period, %')
  })

  test('without expected returns stand alone, and say which column would stand beside them', async () => {
    const { implied } = await book({ holdings: HOLDINGS.map((row) => row.slice(0, 3)) })
    const { rows, said } = implied()
    expect(rows[0]).toEqual(['Holding', 'Weight', 'Implied return'])
    expect(said).toContain('A column of the holdings headed Expected return would stand beside them.')
    expect(said).not.toContain('Riskless rate')
  })
})

describe('stress', () => {
  test('stands beside the estimate, and volatilities times 1.5 are 1.5 times the volatility', async () => {
    const { stress } = await book()
    const { rows, said } = stress()
    const estimated = naiveVolatility(WEIGHTS)
    expect(rows[0]).toEqual(['Scenario', 'Volatility per period', 'Times as estimated'])
    expect(rows[1]).toEqual(['As estimated', `${(estimated * 100).toFixed(2)}%`, '1.00'])
    expect(rows[2]).toEqual(['Volatilities × 1.5', `${(estimated * 150).toFixed(2)}%`, '1.50'])
    // long only: correlations nearer to 1 cannot lower risk
    expect(figure(rows[3]?.[1])).toBeGreaterThanOrEqual(figure(rows[1]?.[1]))
    expect(figure(rows[4]?.[1])).toBeGreaterThanOrEqual(figure(rows[2]?.[1]))
    expect(said).toContain('not a forecast')
  })

  test('shows both sides while there are trades', async () => {
    const { books, stress } = await book()
    books.trade({ line: { key: 'Meadow', entry: 'new weight', text: '10%' } })
    const { rows } = stress()
    expect(rows[0]).toEqual(['Scenario', 'Volatility before', 'Volatility after', 'Change, points'])
    const after = naiveVolatility([0.1, 0.3, 0.2, 0.1])
    expect(rows[1]?.slice(1, 3)).toEqual([
      `${(naiveVolatility(WEIGHTS) * 100).toFixed(2)}%`,
      `${(after * 100).toFixed(2)}%`,
    ])
    expect(figure(rows[2]?.[2])).toBeCloseTo(150 * after, 1)
  })
})

test('a percentage is read with its sign or without, with a point or a comma, and shown as it is typed', () => {
  expect(['12,5 %', '3', '\u22120.25%', '-1'].map(typedPercent)).toEqual([0.125, 0.03, -0.0025, -0.01])
  expect(['', 'x', '1;2', '%'].map(typedPercent)).toEqual([null, null, null, null])
  fc.assert(
    fc.property(fc.integer({ min: -10_000_000, max: 10_000_000 }), (millionths) => {
      const fraction = millionths / 1e8
      expect(typedPercent(typedPercentText(fraction))).toBe(fraction)
    }),
  )
})
