/**
 * The worksheet functions against published worked examples and reference computations. Beside each example stands its source and
 * whether its printed figures were read or are from memory; tolerances are absolute and follow the digits the source prints.
 */
import { readFileSync } from 'node:fs'
import path from 'node:path'
import { worksheetFunctions } from '../../src/sheet/functions'

const call = (id: string, ...args: unknown[]): unknown =>
  (worksheetFunctions[id] as (...given: unknown[]) => unknown)(...args)
const number = (id: string, ...args: unknown[]): number => call(id, ...args) as number
const vector = (id: string, ...args: unknown[]): number[] => (call(id, ...args) as number[][]).flat()

function near(found: number | number[], expected: number | number[], tolerance: number): void {
  const [values, wanted] = [[found].flat(), [expected].flat()]
  expect(values).toHaveLength(wanted.length)
  wanted.forEach((value, k) => expect(Math.abs(values[k]! - value)).toBeLessThanOrEqual(tolerance))
}

const column = (values: number[]): number[][] => values.map((value) => [value])
const covariances = (vol: number[], corr: number[][]): number[][] =>
  vol.map((s, i) => vol.map((r, j) => s * r * corr[i]![j]!))
const constant = (n: number, rho: number): number[][] =>
  Array.from({ length: n }, (_, i) => Array.from({ length: n }, (_, j) => (i === j ? 1 : rho)))
/** A column of the table below its headings, without the total. */
const tableColumn = (table: unknown, heading: string): number[] => {
  const rows = table as (string | number)[][]
  return rows.slice(1, -1).map((row) => row[rows[0]!.indexOf(heading)] as number)
}
const times = (values: number[], factor: number): number[] => values.map((value) => value * factor)

/** Quantile of the standard normal at 95%: 1.6448536269514722 (R 4.2.2, qnorm(0.95)). */
const Z95 = 1.6448536269514722

describe('Jorion, Value at Risk, 3rd ed. (2007), chapter 7, two currencies: 2m at 5%, 1m at 12%, uncorrelated', () => {
  const risk = covariances([0.05, 0.12], constant(2, 0))
  const money = column([2e6, 1e6])

  it('component figures at the book’s z of 1.65 (figures from memory)', () => {
    near(number('VOLATILITY', money, risk), 156205, 0.5)
    near(1.65 * number('VOLATILITY', money, risk), 257738, 0.5)
    near(times(vector('STANDALONE', money, risk), 1.65), [165000, 198000], 0.5)
    near(1.65 * number('DIVERSIFICATION', money, risk) * number('VOLATILITY', money, risk), 363000, 0.5)
    near(times(vector('MARGINAL', money, risk), 1.65), [0.0528, 0.1521], 5e-5)
    near(times(vector('CONTRIBUTION', money, risk), 1.65), [105630, 152108], 0.6)
    near(vector('RISKSHARE', money, risk), [0.41, 0.59], 0.005)
    near(vector('BETA', column([2 / 3, 1 / 3]), risk), [0.615, 1.77], 5e-4)
  })

  it('totals at z of 1.644854, with and without each position (read in public study notes to the chapter)', () => {
    const thousands = [2000, 1000]
    const total = Z95 * number('VOLATILITY', column(thousands), risk)
    near(total, 256.9, 0.05)
    near(times(vector('STANDALONE', column(thousands), risk), Z95), [164.49, 197.38], 0.006)
    near(total - Z95 * number('VOLATILITY', column([2000, 0]), risk), 92.45, 0.006)
    near(total - Z95 * number('VOLATILITY', column([0, 1000]), risk), 59.55, 0.005)
  })
})

it('public exam-preparation question 2.6 (read): 6m at 10% and 4m at 20%, uncorrelated', () => {
  const risk = covariances([0.1, 0.2], constant(2, 0))
  const weights = column([6000, 4000])
  near(Z95 * vector('STANDALONE', weights, risk)[0]!, 986.91, 0.005)
  near(
    tableColumn(call('BREAKDOWN', [['A'], ['B']], weights, risk), 'Correlation with portfolio')[0]!,
    0.6,
    1e-9,
  )
  near(Z95 * vector('CONTRIBUTION', weights, risk)[0]!, 592.147, 6e-4)
  near(Z95 * (number('VOLATILITY', weights, risk) - number('VOLATILITY', column([0, 4000]), risk)), 329, 0.5)
})

it('public instructor’s note on component figures (read): 50/50 at 30% and 40%, uncorrelated', () => {
  const risk = covariances([0.3, 0.4], constant(2, 0))
  near(number('VOLATILITY', [[0.5, 0.5]], risk), 0.25, 1e-12)
  near(times(vector('STANDALONE', [[50, 50]], risk), Z95), [24.67, 32.9], 0.005)
  near(Z95 * number('VOLATILITY', [[50, 50]], risk), 41.1, 0.05)
})

describe('Roncalli, Introduction to Risk Parity and Budgeting (2013), Table 2.2', () => {
  // inputs from memory: they reproduce every printed figure
  const weights = [0.5, 0.2, 0.3]
  const risk = covariances(
    [0.3, 0.2, 0.15],
    [
      [1, 0.8, 0.5],
      [0.8, 1, 0.3],
      [0.5, 0.3, 1],
    ],
  )

  it('the decomposition of volatility, in percent (read in the author’s slides)', () => {
    near(100 * number('VOLATILITY', column(weights), risk), 20.87, 0.005)
    near(times(vector('MARGINAL', column(weights), risk), 100), [29.4, 16.63, 9.49], 0.005)
    near(times(vector('CONTRIBUTION', column(weights), risk), 100), [14.7, 3.33, 2.85], 0.005)
    near(times(vector('RISKSHARE', column(weights), risk), 100), [70.43, 15.93, 13.64], 0.005)
  })

  it('with and without <= contribution <= stand-alone, Tasche (2008), arXiv:0708.2542 (inequalities read, figures derived)', () => {
    const total = number('VOLATILITY', column(weights), risk)
    const without = weights.map((_, i) =>
      number('VOLATILITY', column(weights.map((w, j) => (i === j ? 0 : w))), risk),
    )
    near(
      without.map((s) => total - s),
      [0.140105, 0.031851, 0.025123],
      1e-6,
    )
    near(vector('CONTRIBUTION', column(weights), risk), [0.146982, 0.033254, 0.028462], 1e-6)
    near(vector('STANDALONE', column(weights), risk), [0.15, 0.04, 0.045], 1e-9)
    near(1 / number('DIVERSIFICATION', column(weights), risk), 0.888078, 1e-6)
  })

  it('contribution = exposure x volatility x correlation, Menchero & Davis (2011), JPM 37(2) (identity read, figures derived)', () => {
    const table = call('BREAKDOWN', [['A'], ['B'], ['C']], column(weights), risk)
    const correlations = tableColumn(table, 'Correlation with portfolio')
    near(correlations, [0.979883, 0.831343, 0.632492], 1e-6)
    const alone = tableColumn(table, 'Stand-alone risk')
    near(
      alone.map((s, i) => s * correlations[i]!),
      tableColumn(table, 'Contribution to risk'),
      1e-15,
    )
  })

  it('a riskless position contributes nothing and leverage scales, Denault (2001), Journal of Risk 4(1) (axiom read, figures derived)', () => {
    const withCash = [...risk.map((row) => [...row, 0]), [0, 0, 0, 0]]
    const levered = column([0.8, 0.32, 0.48, -0.6])
    expect(vector('CONTRIBUTION', levered, withCash)[3]).toBeCloseTo(0, 15)
    near(number('VOLATILITY', levered, withCash), 0.333917, 1e-6)
    near(vector('RISKSHARE', levered, withCash).slice(0, 3), [0.704282, 0.159339, 0.136379], 1e-6)
    expect((call('BREAKDOWN', [['A', 'B', 'C', 'Cash']], levered, withCash) as unknown[][])[4]![7]).toBe('')
  })
})

describe('Maillard, Roncalli & Teiletche, JPM 36(4) (2010), numerical illustration', () => {
  const vol = [0.1, 0.2, 0.3, 0.4]
  const risk = covariances(vol, [
    [1, 0.8, 0, 0],
    [0.8, 1, 0, 0],
    [0, 0, 1, -0.5],
    [0, 0, -0.5, 1],
  ])

  it('equal weights (inputs, 11.5% and 47.2% read in reading notes; the rest from memory)', () => {
    const weights = column([0.25, 0.25, 0.25, 0.25])
    near(number('VOLATILITY', weights, risk), 0.115, 5e-4)
    near(vector('RISKSHARE', weights, risk), [0.123, 0.264, 0.141, 0.472], 6e-4)
    near(vector('MARGINAL', weights, risk), [0.056, 0.122, 0.065, 0.217], 6e-4)
    near(vector('CONTRIBUTION', weights, risk), [0.014, 0.03, 0.016, 0.054], 6e-4)
    // inverse sum of squared shares: derived in double precision with numpy 1.24.2
    near(number('EFFECTIVE', weights, risk), 3.054921, 1e-6)
  })

  it('minimum variance: equal marginals where held (8.6% and 74.5% read in reading notes; the rest from memory)', () => {
    // the printed weights have three digits, and so have the figures that follow from them
    const weights = column([0.745, 0, 0.152, 0.103])
    near(number('VOLATILITY', weights, risk), 0.086, 5e-4)
    near(vector('RISKSHARE', weights, risk), [0.745, 0, 0.152, 0.103], 3e-3)
    near(vector('MARGINAL', weights, risk), [0.086, 0.138, 0.086, 0.086], 1e-3)
  })

  it('equal contributions (weights, 10.3% and 25% read in reading notes; marginals from memory)', () => {
    // .384 .192 .243 .182 in print; five digits were computed with numpy 1.24.2
    const weights = column([0.38361, 0.19181, 0.24262, 0.18196])
    near(number('VOLATILITY', weights, risk), 0.103, 5e-4)
    near(vector('RISKSHARE', weights, risk), [0.25, 0.25, 0.25, 0.25], 5e-5)
    near(vector('MARGINAL', weights, risk), [0.067, 0.134, 0.106, 0.141], 6e-4)
  })

  it('with one correlation for all, weights of .48 .24 .16 .12 contribute alike (from memory)', () => {
    const weights = column([0.48, 0.24, 0.16, 0.12])
    near(vector('RISKSHARE', weights, covariances(vol, constant(4, 0.3))), [0.25, 0.25, 0.25, 0.25], 1e-9)
  })

  it.each([-0.5, 0, 0.2, 0.9])(
    'two assets at 15% and 5% contribute alike at weights 1/4 and 3/4, correlation %d (read)',
    (rho) => {
      near(vector('RISKSHARE', [[0.25, 0.75]], covariances([0.15, 0.05], constant(2, rho))), [0.5, 0.5], 1e-9)
    },
  )
})

it('Qian, Risk Parity Portfolios (2005): 60/40 at 15.1% and 4.6%, correlation .2 (read in reading notes)', () => {
  const risk = covariances([0.151, 0.046], constant(2, 0.2))
  near(number('VOLATILITY', [[0.6, 0.4]], risk), 0.096, 5e-4)
  near(vector('RISKSHARE', [[0.6, 0.4]], risk), [0.93, 0.07], 0.005)
})

it('a risk-reducing position, after Bruder & Roncalli (2012) (discussion read, figures derived with numpy 1.24.2)', () => {
  const risk = covariances([0.2, 0.15], constant(2, -0.6))
  near(number('VOLATILITY', [[1, 0.5]], risk), 0.166208, 1e-6)
  near(vector('CONTRIBUTION', [[1, 0.5]], risk), [0.186514, -0.020306], 1e-6)
  near(vector('RISKSHARE', [[1, 0.5]], risk), [1.122172, -0.122172], 1e-6)
})

it.each([
  [0.99, 0.028271, 0.550023],
  [0.999, 0.008942, 1],
  [0.9999, 0.002834, 5.47759],
])('shares explode as a hedge closes in, correlation %d (derived with numpy 1.24.2)', (rho, risk, share) => {
  const matrix = covariances([0.2, 0.2], constant(2, rho))
  near(number('VOLATILITY', [[1, -0.999]], matrix), risk, 1e-6)
  near(vector('RISKSHARE', [[1, -0.999]], matrix)[0]!, share, 1e-6)
})

const data = (file: string): string => readFileSync(path.join(__dirname, 'data', file), 'utf8')

interface Figure {
  readonly value: number | number[] | number[][]
}
interface ReferenceSet {
  readonly about: { readonly weights: Record<string, number[]>; readonly groups: string[] }
  readonly estimators: Record<string, Figure>
  readonly portfolios: Record<
    string,
    Record<'decomposition' | 'groups' | 'by_estimator', Record<string, Figure>>
  >
}

/**
 * Daily closes of four indices, 1860 days: EuStockMarkets of base R. Expected values: numpy 1.24.2, each computed a second time in
 * R 4.2.2, agreeing to 12 digits and more. Tolerance: 1e-11 of the largest entry.
 */
describe.each([
  ['simple', 'eu_simple.json'],
  ['log', 'eu_log.json'],
])('EuStockMarkets, %s returns made by RETURNS', (kind, file) => {
  const reference = JSON.parse(data(file)) as ReferenceSet
  const lines = data('eustockmarkets_close.csv')
    .trim()
    .split('\n')
    .map((line) => line.split(','))
  const prices = lines.slice(1).map((fields) => fields.slice(2).map(Number))
  const names = lines[0]!.slice(2)
  const returns = call('RETURNS', prices, kind) as number[][]
  const days = returns.map((_, t) => 33420 + t)
  const dated = [['Date', ...names], ...returns.map((row, t) => [days[t], ...row])]

  function close(found: unknown, figure: Figure | undefined): void {
    const expected = [figure!.value].flat(2)
    near([found].flat(2) as number[], expected, 1e-11 * Math.max(...expected.map(Math.abs)))
  }

  it('covariance and correlation, sample and exponential', () => {
    close(call('COVARIANCE', returns), reference.estimators.cov)
    close(call('CORRELATION', returns), reference.estimators.cor)
    close(call('COVARIANCE', returns, 1, 'exponential'), reference.estimators['ewma_0.94_demeaned_ml'])
  })

  it('names, dates and prices in any order of days change nothing', () => {
    close(
      call('COVARIANCE', [dated[0], ...dated.slice(1).reverse()], null, 'exponential 0,94'),
      reference.estimators['ewma_0.94_demeaned_ml'],
    )
    const shuffled = [
      ['Date', ...names],
      ...prices.map((row, t) => [33419 + t, ...row]).sort((a, b) => (a[0]! % 7) - (b[0]! % 7)),
    ]
    expect(call('RETURNS', shuffled, kind)).toEqual(returns)
  })

  describe.each(Object.keys(reference.portfolios))('portfolio %s', (portfolio) => {
    const weights = [reference.about.weights[portfolio]!]
    const { decomposition, groups, by_estimator } = reference.portfolios[portfolio]!

    it.each([
      ['returns', returns],
      ['returns with names and dates', dated],
      ['their covariance matrix', call('COVARIANCE', returns)],
    ])('from %s', (_, risk) => {
      close(call('VOLATILITY', weights, risk), decomposition.vol)
      close(call('STANDALONE', weights, risk), decomposition.standalone)
      close(call('MARGINAL', weights, risk), decomposition.marginal)
      close(call('CONTRIBUTION', weights, risk), decomposition.rc)
      close(call('RISKSHARE', weights, risk), decomposition.pct)
      close(call('BETA', weights, risk), decomposition.beta_to_portfolio)
      close(call('DIVERSIFICATION', weights, risk), decomposition.div_ratio_gross)
      close(call('EFFECTIVE', weights, risk), decomposition.enp_risk)
      close(call('VOLATILITY', weights, risk, 252), decomposition.vol_ann252)
      close(call('CONTRIBUTION', weights, risk, 252), decomposition.rc_ann252)
      close(call('CONTRIBUTION', weights, risk, 260), decomposition.rc_ann260)
    })

    it('exponential weighting', () => {
      close(
        call('VOLATILITY', weights, returns, 1, 'exponential'),
        by_estimator['vol__ewma_0.94_demeaned_ml'],
      )
      close(
        call('CONTRIBUTION', weights, returns, 1, 'exponential 0.94'),
        by_estimator['rc__ewma_0.94_demeaned_ml'],
      )
    })

    it('the tables, with holdings in another order than the columns', () => {
      const backwards = [...names].reverse()
      const table = call(
        'BREAKDOWN',
        backwards.map((name) => [name]),
        [[...weights[0]!].reverse()],
        dated,
      )
      close(tableColumn(table, 'Contribution to risk').reverse(), decomposition.rc)
      close(tableColumn(table, 'Correlation with portfolio').reverse(), decomposition.corr_with_portfolio)
      const grouped = call('GROUPED', [reference.about.groups], weights, returns)
      close(tableColumn(grouped, 'Weight'), groups.group_weight)
      close(tableColumn(grouped, 'Stand-alone risk'), groups.group_standalone)
      close(tableColumn(grouped, 'Contribution to risk'), groups.group_rc)
      close(tableColumn(grouped, 'Share of risk'), groups.group_pct)
    })
  })
})

describe('NIST StRD, univariate: VOLATILITY of one series is its certified standard deviation', () => {
  interface Series {
    readonly certified: { readonly sd: string }
    readonly exact_of_stored_doubles: { readonly sd: string }
    readonly double_precision_digits: { readonly input_rounding_limit: number | null }
  }
  const { sets } = JSON.parse(data('nist_univariate.json')) as { sets: Record<string, Series> }

  it.each(Object.keys(sets))('%s', (name) => {
    const series = data(`nist_${name}.csv`)
      .trim()
      .split('\n')
      .slice(1)
      .map((line) => [Number(line)])
    const found = number('VOLATILITY', 1, series)
    // what doubles can hold of the data, by exact arithmetic on the stored doubles: 14 digits of it
    const attainable = Number(sets[name]!.exact_of_stored_doubles.sd)
    near(found, attainable, 1e-14 * attainable)
    // the certified value has 15 digits; storing the data as doubles has cost some of them before we begin
    const certified = Number(sets[name]!.certified.sd)
    const kept = Math.min(14, (sets[name]!.double_precision_digits.input_rounding_limit ?? 15) - 0.1)
    near(found, certified, 10 ** -kept * certified)
  })
})
