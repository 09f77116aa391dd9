/**
 * No number here is from outside: series are drawn with a fixed seed or typed, and what is expected follows from how they are made.
 * Thresholds are the program's own conventions and are stated in src/sheet/checks.
 */
import { Matrix, solve } from 'ml-matrix'
import { uniformInt } from 'pure-rand/distribution/uniformInt'
import { mersenne } from 'pure-rand/generator/mersenne'
import type { CellValue, Settings } from '../../../src/sheet'
import { addressOf } from '../../../src/sheet'
import type { Check, CheckKind } from '../../../src/sheet/checks'
import { seriesFacts } from '../../../src/sheet/checks'
import { absoluteGap } from '../../closeness'
import { textbookCovariance } from '../../textbook'
import { blockOf } from './blocks-of-cells'
import { factsOf, lookAt } from './look-at-data'

/** Friday 27 November 2026 as a workbook counts days. */
const FRIDAY = 46353

/** Normal numbers by Box and Muller, from the Mersenne Twister. */
function normals(seed: number): () => number {
  const generator = mersenne(seed)
  const uniform = () => (uniformInt(generator, 0, 0xfffffffe) + 1) / 2 ** 32
  return () => Math.sqrt(-2 * Math.log(uniform())) * Math.cos(2 * Math.PI * uniform())
}

/** Student t with so many degrees of freedom, scaled to unit variance. */
function fatTailed(seed: number, degrees: number): () => number {
  const normal = normals(seed)
  return () => {
    const z = normal()
    let squares = 0
    for (let k = 0; k < degrees; k++) squares += normal() ** 2
    return (z / Math.sqrt(squares / degrees)) * Math.sqrt((degrees - 2) / degrees)
  }
}

type Rows = number[][]
const NAN = Number.NaN

/** T x n; each series half its own, half of what all share. */
function drawn(draw: () => number, rows: number, columns: number, size = 0.02): Rows {
  return Array.from({ length: rows }, () => {
    const shared = draw()
    return Array.from({ length: columns }, () => (size * (shared + draw())) / Math.SQRT2)
  })
}

const nameOf = (i: number): string => `Holding ${String.fromCharCode(65 + i)}`

/** Looks at series that are all held in equal parts; NaN is a blank cell. Series 0 stands in column B, the first date in row 2. */
function look(
  rows: Rows,
  {
    step = 7,
    settings = {},
    dated = true,
  }: { step?: number; settings?: Partial<Settings>; dated?: boolean } = {},
) {
  const n = rows[0]?.length ?? 0
  const dates =
    step === 1
      ? rows.map((_, t) => {
          const back = rows.length - 1 - t
          return FRIDAY - 7 * Math.floor(back / 5) - (back % 5)
        })
      : rows.map((_, t) => FRIDAY - step * (rows.length - 1 - t))
  const cells: CellValue[][] = [
    ['Date', ...Array.from({ length: n }, (_, i) => nameOf(i))],
    ...rows.map((row, t): CellValue[] => [
      dates[t] ?? 0,
      ...row.map((value) => (Number.isNaN(value) ? '' : value)),
    ]),
  ]
  const book: CellValue[][] = [
    ['Holding', 'Weight'],
    ...Array.from({ length: n }, (_, i) => [nameOf(i), 1 / n]),
  ]
  return lookAt(blockOf(book), blockOf(dated ? cells : cells.map((row) => row.slice(1)), 'Returns'), settings)
}

const kinds = ({ checks }: { checks: readonly Check[] }): readonly CheckKind[] =>
  checks.map(({ kind }) => kind)
const suspected = (looked: { checks: readonly Check[] }): readonly CheckKind[] =>
  looked.checks.filter(({ weight }) => weight !== 'notes').map(({ kind }) => kind)

/** The series of the returns a correction would compute from. */
function corrected(check: Check | undefined, series: number, which = 0): number[] {
  const reading = check?.corrections.filter(({ returns }) => returns !== null)[which]?.returns?.()
  if (!reading) throw new Error('a correction of the returns was to be offered')
  return Array.from({ length: reading.rows }, (_, t) => reading.values[t * reading.columns + series] ?? NaN)
}

const column = (rows: Rows, i: number): number[] => rows.map((row) => row[i] ?? NaN)
const withColumn = (rows: Rows, i: number, values: readonly number[]): Rows =>
  rows.map((row, t) => row.map((value, k) => (k === i ? (values[t] ?? NaN) : value)))
const changed = (rows: Rows, t: number, i: number, value: number): Rows =>
  rows.map((row, k) => (k === t ? row.map((old, j) => (j === i ? value : old)) : row))

describe('clean data', () => {
  test.each<[string, (seed: number) => () => number, number]>([
    ['independent normal returns', normals, 7],
    ['daily normal returns', normals, 1],
    // 5 degrees of freedom are fatter than most weekly returns
    ['weekly returns with fat tails', (seed) => fatTailed(seed, 5), 7],
  ])('of %s raise no suspicion in 15 books of 8 series', (_, draw, step) => {
    const told = Array.from({ length: 15 }, (_, seed) =>
      look(drawn(draw(seed + 1), 500, 8), { step }).checks.filter(({ kind }) => kind !== 'rules on history'),
    )
    // beyond 10 robust scales lie about 1 in 8,400 of t with 5 degrees, which is less than one a book: they are there, and told
    const far = told.flat().filter(({ kind }) => kind === 'outlier' || kind === 'missed split')
    const others = told.flat().filter((check) => !far.includes(check))
    // a serial correlation that is not there is told of one book in a hundred at most: more than one in 15 would be odd
    expect(others.filter(({ kind }) => kind !== 'serial correlation')).toEqual([])
    expect(others.length).toBeLessThanOrEqual(1)
    expect(far.filter(({ kind, weight }) => kind === 'outlier' && weight !== 'notes')).toEqual([])
    expect(far.length).toBeLessThanOrEqual(draw === normals ? 0 : 10)
  })

  test('of volatility that comes and goes is not taken for smoothing', () => {
    const draw = normals(11)
    let variance = 1
    // GARCH(1,1) with 0.25 and 0.7: 0.05 + 0.25 z² + 0.7 h
    const rows = Array.from({ length: 1000 }, () => {
      const values = Array.from({ length: 6 }, () => 0.01 * Math.sqrt(variance) * draw())
      variance = 0.05 + 0.25 * ((values[0] ?? 0) / 0.01) ** 2 + 0.7 * variance
      return values
    })
    expect(kinds(look(rows)).filter((kind) => kind === 'serial correlation')).toEqual([])
  })

  test('of cash, which accrues evenly and moves next to nothing, is no smoothing and no old price', () => {
    const rows = drawn(normals(3), 300, 5).map((row, t) => [...row, 0.0004 + 0.0001 * Math.sin(t / 20)])
    expect(kinds(look(rows))).toEqual([])
    const zeros = rows.map((row, t) => [...row.slice(0, 5), t % 10 === 0 ? 0.0001 : 0])
    expect(kinds(look(zeros))).toEqual([])
  })
})

describe('corrections', () => {
  const rows = drawn(normals(5), 260, 6)

  test('a far return is replaced by the median of its series, in a copy', () => {
    const planted = changed(rows, 100, 2, 0.6)
    const { checks, returns } = look(planted)
    expect(kinds({ checks })).toEqual(['outlier'])
    const sorted = column(planted, 2).sort((a, b) => a - b)
    const median = ((sorted[129] ?? 0) + (sorted[130] ?? 0)) / 2
    expect(corrected(checks[0], 2)).toEqual(column(changed(planted, 100, 2, median), 2))
    expect(corrected(checks[0], 3)).toEqual(column(rows, 3))
    expect(returns.values[100 * 6 + 2]).toBe(0.6)
  })

  test('what one far return makes up of the variance is its squared distance over the sum of all', () => {
    const x = column(changed(rows, 100, 2, 0.6), 2)
    const mean = x.reduce((sum, value) => sum + value, 0) / x.length
    const share = (0.6 - mean) ** 2 / x.reduce((sum, value) => sum + (value - mean) ** 2, 0)
    expect(look(changed(rows, 100, 2, 0.6)).checks[0]?.effect).toContain(
      `makes up ${Math.round(100 * share)}% of the variance of “Holding C”`,
    )
  })

  test('smoothing is undone: the series before it comes back but for its first return', () => {
    const own = column(rows, 2)
    const rho = 0.5
    let last = 0
    const smooth = own.map((value) => (last = (1 - rho) * value + rho * last))
    const { checks } = look(withColumn(rows, 2, smooth))
    expect(kinds({ checks })).toEqual(['serial correlation'])
    expect(checks[0]?.corrections[0]?.change).toEqual({ estimator: { kind: 'lagged', lags: 4 } })
    const undone = corrected(checks[0], 2)
    expect(undone[0]).toBeNaN()
    const mean = smooth.reduce((sum, value) => sum + value, 0) / 260
    const products = (lag: number): number =>
      smooth.slice(lag).reduce((sum, value, t) => sum + (value - mean) * ((smooth[t] ?? 0) - mean), 0)
    const found = products(1) / products(0)
    const expected = smooth.slice(1).map((value, t) => (value - found * (smooth[t] ?? 0)) / (1 - found))
    expect(absoluteGap(undone.slice(1), expected)).toBeLessThan(1e-14)
    const spread = (x: readonly number[]): number =>
      Math.sqrt(x.reduce((sum, value) => sum + value * value, 0) / x.length)
    // the error of the 0.5 found is about sqrt((1 - 0.5²)/260) = 0.054, which moves the deviation by 7%; three of these
    expect(Math.abs(spread(undone.slice(1)) / spread(own) - 1)).toBeLessThan(0.22)
    expect(spread(smooth) / spread(own)).toBeLessThan(0.7)
  })

  test('a series in percent points is divided by 100, the others are left', () => {
    const planted = withColumn(
      rows,
      1,
      column(rows, 1).map((value) => 100 * value),
    )
    const { checks } = look(planted)
    expect(kinds({ checks })).toEqual(['percents'])
    expect(absoluteGap(corrected(checks[0], 1), column(rows, 1))).toBeLessThan(1e-15)
    expect(corrected(checks[0], 0)).toEqual(column(rows, 0))
  })

  test('prices among returns become returns, the first one a gap', () => {
    let price = 50
    const { checks } = look(
      withColumn(
        rows,
        1,
        column(rows, 1).map((value) => (price *= 1 + value)),
      ),
    )
    expect(kinds({ checks })).toEqual(['prices among returns'])
    const made = corrected(checks[0], 1)
    expect(made[0]).toBeNaN()
    expect(absoluteGap(made.slice(1), column(rows, 1).slice(1))).toBeLessThan(1e-14)
  })

  test('zeros in a row become gaps, single ones stay returns', () => {
    const still = column(rows, 4).map((value, t) => (t === 10 || (t >= 50 && t < 65) ? 0 : value))
    const { checks } = look(withColumn(rows, 4, still))
    expect(checks.map(({ areas }) => areas.map(addressOf))).toEqual([['Returns!F52:F66']])
    expect(corrected(checks[0], 4)).toEqual(still.map((value, t) => (t >= 50 && t < 65 ? NAN : value)))
    // fifteen lagged terms are more than there may be
    expect(checks[0]?.corrections.map(({ change }) => change)).toEqual([null])
  })

  test('a choice already made is not offered again', () => {
    const short = withColumn(
      rows,
      0,
      column(rows, 0).map((value, t) => (t < 150 ? NAN : value)),
    )
    expect(look(short).checks[0]?.corrections.map(({ change }) => change?.gaps)).toEqual([
      'own overlap',
      'completed',
    ])
    const paired = look(short, { settings: { gaps: 'own overlap' } }).checks[0]
    expect(paired?.corrections.map(({ change }) => change?.gaps)).toEqual(['completed'])
    expect(paired?.effect).toMatch(/^Each pair of holdings rests on the dates it shares/)
  })

  test('a rule for gaps goes with the sample covariance and an estimator with common dates: both are changed together', () => {
    const short = withColumn(
      rows,
      0,
      column(rows, 0).map((value, t) => (t < 150 ? NAN : value)),
    )
    const shrunk = { estimator: { kind: 'shrinkage', target: 'oas' } } as const
    expect(look(short, { settings: shrunk }).checks[0]?.corrections[0]?.change).toEqual({
      gaps: 'own overlap',
      estimator: { kind: 'sample' },
    })
    const monthly = withColumn(
      short,
      1,
      column(rows, 1).map((value, t) => (t % 4 === 3 ? 2 * value : 0)),
    )
    const stale = look(monthly, { settings: { gaps: 'completed' } }).checks.find(
      ({ kind }) => kind === 'stale prices',
    )
    expect(stale?.corrections[0]?.change).toEqual({
      estimator: { kind: 'lagged', lags: 7 },
      gaps: 'common dates',
    })
  })

  test('completion is not offered where it cannot be computed: a gap inside, an early end', () => {
    const short = withColumn(
      rows,
      0,
      column(rows, 0).map((value, t) => (t < 150 ? NAN : value)),
    )
    for (const planted of [changed(short, 200, 3, NAN), changed(short, 259, 3, NAN)])
      for (const { corrections, kind } of look(planted).checks)
        if (kind !== 'rules on history')
          expect(corrections.map(({ change }) => change?.gaps)).toEqual(['own overlap'])
  })
})

describe('what the sentences claim', () => {
  test('lagged terms bring back about 81% of what a series valued every fourth date shares with another', () => {
    const draw = normals(17)
    const T = 40_000
    const x = Array.from({ length: T }, draw)
    const late = x.map((_, t) => (t % 4 === 3 ? x.slice(t - 3, t + 1).reduce((sum, v) => sum + v, 0) : 0))
    const lagged = (lag: number): number =>
      x.reduce((sum, v, t) => sum + (t + lag < T ? v * (late[t + lag] ?? 0) : 0), 0) / T
    let covariance = lagged(0)
    for (let lag = 1; lag <= 7; lag++) covariance += (1 - lag / 8) * (lagged(lag) + lagged(-lag))
    // var x = 1 is what it would be at once. Standard errors: about 0.01 for one lag, 0.03 for the sum
    expect(lagged(0)).toBeCloseTo(0.25, 1)
    expect(Math.abs(covariance - 0.8125)).toBeLessThan(0.1)
    const rows = drawn(draw, 260, 4).map((row, t) => [...row, t % 4 === 3 ? 0.04 * draw() : 0])
    const [check] = look(rows).checks
    expect(check?.effect).toContain('about 25% of what it shares')
    expect(check?.remedy).toContain('7 lagged terms bring back about 81% of what it shares')
  })

  test('with 20 dates for 12 series the calmest mix looks as if it had about 65% of its volatility', () => {
    // sqrt((20 - 12)/(20 - 1)) = 0.649; here by drawing: 1/(1'S⁻¹1) of the sample over that of the identity, by solving S x = 1
    const draw = normals(19)
    let sum = 0
    const draws = 400
    for (let k = 0; k < draws; k++) {
      const rows = Array.from({ length: 20 }, () => Array.from({ length: 12 }, draw))
      const weights = solve(new Matrix(textbookCovariance(rows)), Matrix.ones(12, 1))
      sum += 12 / weights.sum()
    }
    // a mean of 400 chi-squares of 8 degrees over 19: standard error 0.42 sqrt(2/8)/20 = 0.0105
    expect(Math.abs(sum / draws - 8 / 19)).toBeLessThan(0.04)
    const [check] = look(drawn(draw, 20, 12)).checks
    expect(check).toMatchObject({ kind: 'few dates', weight: 'warns' })
    expect(check?.sentence).toBe('20 dates for 12 series that move: 1.7 dates a series.')
    expect(check?.effect).toContain('65% of its volatility')
    expect(check?.corrections.map(({ change }) => change)).toEqual([
      { estimator: { kind: 'shrinkage', target: 'correlation' } },
    ])
  })

  test('with no more dates than series some mixes seem to have no risk; under shrinkage it is a note', () => {
    const rows = drawn(normals(23), 12, 12)
    expect(look(rows).checks[0]?.effect).toMatch(/^Some mixes of these holdings seem to have no risk at all/)
    const shrunk = look(rows, { settings: { estimator: { kind: 'shrinkage', target: 'correlation' } } })
    expect(shrunk.checks[0]).toMatchObject({ kind: 'few dates', weight: 'notes', corrections: [] })
  })

  test('the band of chance is that of all series together', () => {
    const rows = drawn(normals(5), 260, 6)
    let last = 0
    const smooth = column(rows, 2).map((value) => (last = 0.4 * value + 0.6 * last))
    const [check] = look(withColumn(rows, 2, smooth)).checks
    expect(check?.sentence).toMatch(
      /^Returns!D1: the returns of “Holding C” go on as the last one went: autocorrelation 0\.\d\d, where by chance all 6 series would stay within 0\.\d\d of 0 in at least 99% of cases\.$/,
    )
    const band = Number(/within (0\.\d\d)/.exec(check?.sentence ?? '')?.[1])
    // normal quantile at 1 - 0.01/2/6 is 3.14 (any table of the normal distribution); 3.14/sqrt(260) = 0.195 or more, as the band is robust
    expect(band).toBeGreaterThanOrEqual(0.19)
    expect(band).toBeLessThan(0.3)
  })
})

describe('one fault, one line', () => {
  const rows = drawn(normals(29), 260, 10)

  test('a day on which the market fell is one note, and no outlier of every holding', () => {
    const crash = rows.map((row, t) => (t === 77 ? row.map((value) => value - 0.3) : row))
    const { checks } = look(crash)
    expect(checks.map(({ kind, weight }) => [kind, weight])).toEqual([['outlier', 'notes']])
    expect(checks[0]?.sentence).toMatch(/^Returns!B79: 10 holdings moved more than 6 robust/)
  })

  test('a smoothed daily series is not told of its closing time as well', () => {
    const daily = drawn(normals(31), 800, 6)
    let last = 0
    const smooth = column(daily, 2).map((value) => (last = 0.5 * value + 0.5 * last))
    expect(kinds(look(withColumn(daily, 2, smooth), { step: 1 }))).toEqual(['serial correlation'])
  })

  test('where half of the book closes a day earlier only that half is told, all in one line', () => {
    const draw = normals(37)
    // the news of the second half of a day reaches the markets that have closed on the next one
    let late = 0
    const daily = Array.from({ length: 800 }, () => {
      const [first, second] = [draw(), draw()]
      const [open, closed] = [first + second, first + late]
      late = second
      return Array.from({ length: 8 }, (_, i) => 0.01 * ((i < 4 ? open : closed) + 0.5 * draw()))
    })
    const { checks } = look(daily, { step: 1 })
    expect(kinds({ checks })).toEqual(['closing times'])
    expect(checks[0]?.names).toEqual(['Holding E', 'Holding F', 'Holding G', 'Holding H'])
    expect(checks[0]?.corrections[0]?.change).toEqual({ estimator: { kind: 'lagged', lags: 1 } })
    // the same returns by weeks have no closing times to speak of
    expect(kinds(look(daily)).filter((kind) => kind === 'closing times')).toEqual([])
  })

  test.each([2, 3])(
    'a daily series valued every %i days is told as that alone, though it lags behind the others',
    (every) => {
      const daily = drawn(normals(67), 800, 6)
      const own = column(daily, 2)
      const late = own.map((_, t) =>
        t % every === every - 1 ? own.slice(t + 1 - every, t + 1).reduce((sum, value) => sum + value, 0) : 0,
      )
      expect(kinds(look(withColumn(daily, 2, late), { step: 1 }))).toEqual(['stale prices'])
    },
  )

  test('a series tied to the others on both neighbouring days has no closing time of its own', () => {
    const draw = normals(71)
    const news = Array.from({ length: 802 }, draw)
    const daily = Array.from({ length: 800 }, (_, t) => [
      0.01 * (news[t + 1] ?? 0),
      ...Array.from({ length: 7 }, () => 0.005 * ((news[t] ?? 0) + (news[t + 2] ?? 0) + draw())),
    ])
    expect(kinds(look(daily, { step: 1 }))).toEqual([])
  })

  test('constant series are told as that alone, and as nothing else', () => {
    for (const value of [0, 0.001])
      expect(
        suspected(
          look(
            withColumn(
              rows,
              3,
              rows.map(() => value),
            ),
          ),
        ),
      ).toEqual(['constant'])
  })

  test('a move that is far out and taken back is one line', () => {
    const planted = changed(changed(rows, 90, 1, 9), 91, 1, -0.9)
    expect(kinds(look(planted))).toEqual(['outlier'])
    // a half up and a third down make an autocorrelation of -0.46 all by themselves
    expect(kinds(look(changed(changed(rows, 90, 1, 0.5), 91, 1, -1 / 3)))).toEqual(['outlier'])
    const [check] = look(planted).checks
    expect(check?.areas.map(addressOf)).toEqual(['Returns!C92', 'Returns!C93'])
    // 10 times and a tenth: nothing is left, so both become 0
    expect(absoluteGap(corrected(check, 1).slice(90, 92), [0, 0])).toBeLessThan(1e-12)
  })

  test('two far returns of one series are two lines, each with a correction of its own', () => {
    const { checks } = look(changed(changed(rows, 50, 1, 0.9), 60, 1, 0.7))
    expect(checks.map(({ corrections }) => corrections[0]?.label)).toEqual([
      'With the median in its place (25 Nov 2022)',
      'With the median in its place (3 Feb 2023)',
    ])
    expect(corrected(checks[0], 1)[60]).toBe(0.7)
    expect(corrected(checks[1], 1)[50]).toBe(0.9)
  })

  test('two faults of one kind are two lines, three are one', () => {
    const two = changed(changed(rows, 50, 1, NAN), 60, 2, NAN)
    expect(kinds(look(two)).filter((kind) => kind === 'gaps')).toHaveLength(2)
    const three = look(changed(two, 70, 3, NAN)).checks.filter(({ kind }) => kind === 'gaps')
    expect(three).toHaveLength(1)
    expect(three[0]?.names).toEqual(['Holding B', 'Holding C', 'Holding D'])
    expect(three[0]?.effect).toContain(
      '3 dates with such a gap are left out for every holding: 257 of 260 count',
    )
  })
})

test('the gravest come first, what is only good to know last', () => {
  const rows = drawn(normals(41), 200, 5)
  const { checks } = look(changed(changed(rows, 30, 1, 0.9), 60, 2, NAN))
  expect(checks.map(({ kind, weight }) => [kind, weight])).toEqual([
    ['outlier', 'warns'],
    ['gaps', 'notes'],
    ['rules on history', 'notes'],
  ])
})

test('returns without dates are told by their number', () => {
  const rows = drawn(normals(43), 260, 5)
  const looked = look(changed(rows, 30, 1, 0.9), { dated: false })
  expect(looked.checks[0]?.sentence).toMatch(/^Returns!B32: the return of “Holding B” in return 31 is 90\.0%/)
})

test.each<[number, number, readonly string[]]>([
  // periods the rules ask for: daily 250, 500, 750; weekly 156, 208, 260; one is spared where prices make one return fewer
  [1, 200, ['1 year (CESR/10-788 of 2010)', '2 years of daily prices', '3 years (US Rule 18f-4 of 2020)']],
  [1, 500, ['3 years (US Rule 18f-4 of 2020)']],
  [1, 760, []],
  [7, 200, ['4 years of weekly prices', '5 years of weekly returns']],
  [7, 259, []],
  [30, 48, ['5 years of monthly prices', '5 years of monthly returns']],
])('steps of %i days over %i dates: rules that ask for more are named', (step, dates, named) => {
  const note = look(drawn(normals(47), dates, 4), { step }).checks.find(
    ({ kind }) => kind === 'rules on history',
  )
  expect(note?.weight).toBe(named.length > 0 ? 'notes' : undefined)
  for (const name of named) expect(note?.sentence).toContain(name)
  expect((note?.sentence.match(/( of 20\d\d|Annex II)\)/g) ?? []).length).toBe(named.length)
})

test('a covariance matrix and a look-back without returns have nothing to look at', () => {
  expect(
    look(drawn(normals(53), 60, 3), { settings: { lookBack: { kind: 'since', date: FRIDAY + 7 } } }).checks,
  ).toEqual([])
  const matrix = blockOf([['A', 'B'], [0.04, 0.01], [0.01, 0.09]], 'Returns') // prettier-ignore
  expect(lookAt(blockOf([['Holding', 'Weight'], ['A', 0.5], ['B', 0.5]]), matrix).checks).toEqual([]) // prettier-ignore
})

describe('facts of series', () => {
  test('agree with the definitions, written out plainly', () => {
    const rows = drawn(normals(59), 300, 5)
    const values = Float64Array.from(rows.flat())
    for (const t of [0, 1, 2, 40, 41, 299]) values[t * 5 + 3] = NaN
    const { series, steps } = factsOf({ values, rows: 300, columns: 5, dates: null, perYear: 252, from: 0 })
    expect(steps).toBeNull()
    expect(series[3]).toMatchObject({ first: 3, last: 298, count: 294, isConstant: false, every: null })
    expect([...(series[3]?.gaps ?? [])]).toEqual([40, 41])

    // levels within 5 robust scales, averaged over the others on each date
    const level = (i: number): number[] =>
      column(rows, i).map((_, t) => {
        const { median, scale } = series[i]!
        return Math.max(-5, Math.min(5, (values[t * 5 + i]! - median) / scale))
      })
    const levels = [0, 1, 2, 3, 4].map(level)
    const own = levels[0]!
    const others = own.map((_, t) => {
      const present = levels
        .slice(1)
        .map((x) => x[t]!)
        .filter((v) => !Number.isNaN(v))
      return present.reduce((sum, v) => sum + v, 0) / present.length
    })
    const mean = (x: readonly number[]): number => x.reduce((sum, v) => sum + v, 0) / x.length
    const squares = (x: readonly number[]): number => x.reduce((sum, v) => sum + (v - mean(x)) ** 2, 0)
    const ahead = others
      .slice(0, -1)
      .reduce((sum, v, t) => sum + (v - mean(others)) * (own[t + 1]! - mean(own)), 0)
    const behind = own
      .slice(0, -1)
      .reduce((sum, v, t) => sum + (v - mean(own)) * (others[t + 1]! - mean(others)), 0)
    const scale = Math.sqrt(squares(own) * squares(others))
    // 1e-12: sums in another order
    expect(
      absoluteGap([series[0]!.follows!.value, series[0]!.leads!.value], [ahead / scale, behind / scale]),
    ).toBeLessThan(1e-12)
  })

  test('count rows in the whole block where a look-back leaves some out', () => {
    const values = Float64Array.from({ length: 100 }, (_, t) => (t >= 60 && t < 64 ? 0 : Math.sin(t * t)))
    values[10] = values[70] = NaN
    const [fact] = factsOf({ values, rows: 100, columns: 1, dates: null, perYear: null, from: 50 }).series
    expect(fact).toMatchObject({ first: 50, last: 99, count: 49, still: { start: 60, length: 4 } })
    expect([...(fact?.gaps ?? [])]).toEqual([70])
  })

  test.each([2, 3, 12])(
    'a series that moves every %i-th date is known by it, also with one move missing',
    (every) => {
      const values = Float64Array.from({ length: 200 }, (_, t) =>
        t % every === 0 && t !== 4 * every ? 0.01 + t / 1e4 : 0,
      )
      const [fact] = factsOf({ values, rows: 200, columns: 1, dates: null, perYear: null, from: 0 }).series
      expect(fact?.every).toBe(every)
    },
  )

  test('progress rises to 1', () => {
    const rows = drawn(normals(61), 50, 8)
    const input = {
      values: Float64Array.from(rows.flat()),
      rows: 50,
      columns: 8,
      dates: null,
      perYear: 252,
      from: 0,
    }
    const shares = [...seriesFacts(input)]
    expect(shares).toHaveLength(16)
    expect(shares).toEqual([...shares].sort((a, b) => a - b))
    expect(shares.at(-1)).toBe(1)
  })
})
