import { Fault } from '../../../src/core'
import type { Settings } from '../../../src/sheet'
import { DEFAULT_SETTINGS, matchHoldings } from '../../../src/sheet'
import { held, modelFor, returnsOf, series, told } from './blocks-of-cells'

// Every block here is typed for its test.

test('a holding marked riskless has zero variance and needs no series', async () => {
  const holdings = held('A', 'Cash')
  const returns = series('A', 'B')
  const { model } = await modelFor(
    { match: matchHoldings(holdings, returns, ['cash']), holdings, returns },
    DEFAULT_SETTINGS,
  )
  expect(model.variances()[1]).toBe(0)
  expect(model.variances()[0]).toBeGreaterThan(0)
})

test('a series that never moves counts as riskless, with a warning at its heading', async () => {
  const holdings = held('A', 'Cash')
  const returns = returnsOf([['A', 'Cash'], [0.01, 0], [-0.02, 0], [0.03, 0]]) // prettier-ignore
  const book = await modelFor(
    { match: matchHoldings(holdings, returns, []), holdings, returns },
    DEFAULT_SETTINGS,
  )
  expect(told(book, 'warns')).toEqual([
    'Returns!B1: the returns of “Cash” never change, so it counts as riskless.',
  ])
})

test('as many holdings as dates is warned of', async () => {
  const holdings = held('A', 'B', 'C', 'D', 'E')
  const returns = series('A', 'B', 'C', 'D', 'E')
  const book = await modelFor(
    { match: matchHoldings(holdings, returns, []), holdings, returns },
    DEFAULT_SETTINGS,
  )
  expect(told(book, 'warns')[0]).toMatch(
    /^4 dates for 5 holdings: too few to tell all the correlations apart/,
  )
})

test('a look-back by date wants dates, one longer than the data is told', async () => {
  const [holdings, returns] = [held('A', 'B'), series('A', 'B')]
  const match = matchHoldings(holdings, returns, [])
  const since = { ...DEFAULT_SETTINGS, lookBack: { kind: 'since', date: 46000 } } as const
  await expect(modelFor({ match, holdings, returns }, since)).rejects.toThrow(Fault)
  const longer = { ...DEFAULT_SETTINGS, lookBack: { kind: 'last', dates: 99 } } as const
  expect(told(await modelFor({ match, holdings, returns }, longer), 'warns')[0]).toBe(
    'The look-back of 99 dates reaches further than the 4 there are.',
  )
})

test('a look-back that leaves no returns says so at its own field, with the dates there are', async () => {
  const holdings = held('A', 'B')
  const returns = returnsOf([
    ['Month', 'A', 'B'],
    [46022, 0.01, 0.02],
    [46053, -0.02, 0.01],
    [46081, 0.03, -0.01],
  ])
  const settings = { ...DEFAULT_SETTINGS, lookBack: { kind: 'since', date: 47484 } } as const
  const compute = () => modelFor({ match: matchHoldings(holdings, returns, []), holdings, returns }, settings)
  await expect(compute()).rejects.toThrow(
    expect.objectContaining({
      found: 'found 0 dates of returns within the look-back',
      needed: 'at least 2 of the 3 there are, 31 Dec 2025 to 28 Feb 2026, are needed',
      where: { argument: 'look-back' },
    }),
  )
})

// ---- rules for gaps, estimators, factors, benchmark

const wave = (t: number, i: number): number => 0.02 * Math.sin(1 + 1.7 * t + 2.3 * i * i + 0.1 * t * i)
const DAY = 46000
/** A dated block of waves under the names; `gap` says where there is none. */
const dated = (names: string[], rows: number, gap: (t: number, i: number) => boolean = () => false) =>
  returnsOf([
    ['Date', ...names],
    ...Array.from({ length: rows }, (_, t) => [
      DAY + 7 * t,
      ...names.map((_, i) => (gap(t, i) ? '' : wave(t, i))),
    ]),
  ])
const bookOf = (returns: ReturnType<typeof dated>, change: Partial<Settings>, names = ['A', 'B', 'C']) => {
  const holdings = held(...names)
  return modelFor(
    { match: matchHoldings(holdings, returns, []), holdings, returns },
    { ...DEFAULT_SETTINGS, ...change },
  )
}
const line = (book: { quality: readonly (readonly [string, string])[] }, label: string) =>
  book.quality.find(([name]) => name === label)?.[1]

test('each rule for gaps uses the dates it says, and only common dates leave some out', async () => {
  // C begins after 20 of 60 dates
  const returns = dated(['A', 'B', 'C'], 60, (t, i) => i === 2 && t < 20)
  const common = await bookOf(returns, {})
  expect(common.window).toMatchObject({ used: 40, dropped: 20 })
  expect(told(common, 'warns')[0]).toMatch(/^20 of 60 dates left out, where a holding has no return; “C”/)
  for (const gaps of ['own overlap', 'completed'] as const) {
    const other = await bookOf(returns, { gaps })
    expect(other.window).toMatchObject({ used: 60, dropped: 0 })
    expect(told(other, 'warns')).toEqual([])
    // series without gaps keep every date they have
    const alone = await bookOf(returns, {}, ['A', 'B'])
    const divisor = gaps === 'completed' ? 59 / 60 : 1
    expect(other.model.variances()[0]! / (alone.model.variances()[0]! * divisor)).toBeCloseTo(1, 10)
    expect(other.precision).toMatch(/has no error bands here/)
    // histories stay those of the dates all share
    expect(other.history?.dates).toBe(40)
  }
})

test('without gaps a rule for them changes nothing', async () => {
  const returns = dated(['A', 'B', 'C'], 30)
  const [common, overlap] = await Promise.all([
    bookOf(returns, {}),
    bookOf(returns, { gaps: 'own overlap', estimator: { kind: 'lagged', lags: 2 } }),
  ])
  expect(overlap.window).toEqual(common.window)
})

test('a rule for gaps that the estimator has no part in is refused', async () => {
  const returns = dated(['A', 'B', 'C'], 30, (t, i) => i === 1 && t < 5)
  await expect(
    bookOf(returns, { gaps: 'completed', estimator: { kind: 'exponential', decay: 0.97 } }),
  ).rejects.toMatchObject({ code: 'unknown-choice', where: { argument: 'estimator' } })
})

test('a pair without dates in common is named', async () => {
  const returns = dated(['A', 'B', 'C'], 30, (t, i) => (i === 1 && t < 15) || (i === 2 && t >= 15))
  await expect(bookOf(returns, { gaps: 'own overlap' })).rejects.toMatchObject({ code: 'missing-data' })
})

test('correlations that do not hold together are mended, told and printed', async () => {
  const x = [0.01, -0.02, 0.03, -0.01]
  const returns = returnsOf([
    ['A', 'B', 'C'],
    ...x.map((r) => [r, r, '']),
    ...x.map((r) => ['', r, r]),
    ...x.map((r) => [r, '', -r]),
  ])
  for (const repair of ['nearest', 'shrunk'] as const) {
    const book = await bookOf(returns, { gaps: 'own overlap', repair })
    expect(told(book, 'warns')[0]).toMatch(
      /^Correlations from each pair’s own overlap do not hold together and were .*; the largest change is from /,
    )
    expect(line(book, 'Eigenvalue check')).toMatch(/^Smallest eigenvalue of the correlations −\d\.\d+; /)
    expect(line(book, 'Shortest overlap')).toMatch(/^4 dates: “A” and “B”$/)
    // what is left of the variance of any mix is not below 0
    for (const w of [
      [1, -1, 1],
      [1, 1, -1],
      [-1, 1, 1],
    ])
      // prettier-ignore
      expect(book.model.apply(Float64Array.from(w)).variance).toBeGreaterThanOrEqual(0)
  }
})

test('shrinkage prints its intensity, and warns of volatilities that lie far apart', async () => {
  const rows = Array.from({ length: 40 }, (_, t) => [wave(t, 0), 10 * wave(t, 1), wave(t, 2)])
  const returns = returnsOf([['A', 'B', 'C'], ...rows])
  const toIdentity = await bookOf(returns, { estimator: { kind: 'shrinkage', target: 'identity' } })
  expect(Number(line(toIdentity, 'Shrinkage intensity'))).toBeGreaterThan(0)
  expect(told(toIdentity, 'warns')[0]).toMatch(/^The volatilities of the holdings differ \d+\.\d-fold/)
  const toCorrelation = await bookOf(returns, { estimator: { kind: 'shrinkage', target: 'correlation' } })
  expect(told(toCorrelation, 'warns')).toEqual([])
  expect(toCorrelation.precision).toMatchObject({
    lags: 0,
    note: expect.stringContaining('before shrinkage'),
  })
})

test('factor returns are matched by date, whatever their order, and dates without them are left out', async () => {
  const returns = dated(['A', 'B', 'C'], 40)
  const factor = (t: number): number => wave(t, 0) + wave(t, 1)
  const rows = Array.from({ length: 30 }, (_, t) => [DAY + 7 * (39 - t), factor(39 - t)])
  const factors = returnsOf([['Date', 'Market'], ...rows])
  const holdings = held('A', 'B', 'C')
  const book = await modelFor(
    { match: matchHoldings(holdings, returns, []), holdings, returns, factors },
    { ...DEFAULT_SETTINGS, estimator: { kind: 'factors' } },
  )
  expect(book.window).toMatchObject({ used: 30, dropped: 10, first: DAY + 70 })
  expect(told(book, 'warns')[0]).toBe('10 of 40 dates left out, 10 for want of factor returns.')
  expect(book.factors?.names).toEqual(['Market'])
  // parts by factor and by holding are the whole
  const weights = Float64Array.of(0.5, 0.3, 0.2)
  const { systematic, specific, volatility } = book.factors!.model.split(weights)
  const sum = (values: Float64Array) => values.reduce((total, value) => total + value, 0)
  expect(sum(systematic) + sum(specific)).toBeCloseTo(volatility, 12)
})

test('a factor model without factor returns says where to select them', async () => {
  await expect(bookOf(dated(['A', 'B', 'C'], 30), { estimator: { kind: 'factors' } })).rejects.toMatchObject({
    code: 'missing',
    where: { argument: 'factors' },
  })
})

test('a benchmark series is a position of its own, on the dates it shares', async () => {
  const returns = dated(['A', 'B', 'C', 'Index'], 40, (t, i) => i === 3 && t < 4)
  const book = await bookOf(returns, { benchmark: { kind: 'series', name: 'index' } })
  expect(book.benchmark?.name).toBe('Index')
  expect(book.benchmark?.model.size).toBe(4)
  expect(book.window).toMatchObject({ used: 40 })
  expect(told(book, 'warns')[0]).toMatch(/^Risk against the benchmark rests on 36 of 40 dates/)
  await expect(bookOf(returns, { benchmark: { kind: 'series', name: 'Gold' } })).rejects.toMatchObject({
    code: 'unmatched',
    where: { argument: 'benchmark' },
  })
})

test('a benchmark series is not shrunk toward being one holding among others', async () => {
  const returns = dated(['A', 'B', 'C', 'Index'], 40)
  const benchmark = { kind: 'series', name: 'Index' } as const
  const plain = await bookOf(returns, { benchmark })
  for (const target of ['identity', 'correlation', 'oas'] as const) {
    const shrunk = await bookOf(returns, { benchmark, estimator: { kind: 'shrinkage', target } })
    expect(shrunk.benchmark?.model.matrix()).toEqual(plain.benchmark?.model.matrix())
    expect(told(shrunk, 'warns').at(-1)).toMatch(
      /^Risk against the benchmark series is the sample covariance’s/,
    )
  }
  expect(told(plain, 'warns')).toEqual([])
})

test('a pair with few dates in common, and a regression with few dates to spare, are warned of', async () => {
  const names = ['A', 'B', 'C', 'D', 'E']
  const late = dated(names, 60, (t, i) => i === 4 && t < 52)
  const pairs = await bookOf(late, { gaps: 'own overlap' }, names)
  expect(told(pairs, 'warns').at(-1)).toMatch(/^“A” and “E” have 8 dates in common/)
  // 8 dates, 4 longer series and an intercept: 3 of 8 degrees of freedom, and sqrt(3/8) = 61%, by hand
  const completed = await bookOf(late, { gaps: 'completed' }, names)
  expect(told(completed, 'warns')).toEqual([
    '“E”: 8 dates for a regression on 4 series, which fits the past too well: the risk these do not explain is understated, to some 61% of what it is.',
  ])
})

test('longer series that say nothing of their own are named where a history is completed without them', async () => {
  const rows = Array.from({ length: 40 }, (_, t) => [
    DAY + 7 * t,
    wave(t, 0),
    2 * wave(t, 0),
    t < 10 ? '' : wave(t, 2),
  ])
  const book = await bookOf(returnsOf([['Date', 'A', 'B', 'C'], ...rows]), { gaps: 'completed' })
  expect(line(book, 'Completed')).toMatch(/; left out of it, as the others give them: “B”$/)
})

test('factor returns of another frequency are warned of', async () => {
  const returns = dated(['A', 'B', 'C'], 60)
  // every fourth week, on dates of the holdings
  const rows = Array.from({ length: 15 }, (_, k) => [DAY + 28 * k, wave(4 * k, 7)])
  const factors = returnsOf([['Date', 'Market'], ...rows])
  const holdings = held('A', 'B', 'C')
  const book = await modelFor(
    { match: matchHoldings(holdings, returns, []), holdings, returns, factors },
    { ...DEFAULT_SETTINGS, estimator: { kind: 'factors' } },
  )
  expect(told(book, 'warns')[0]).toMatch(/^Factor returns are monthly, the returns of the holdings weekly/)
})
