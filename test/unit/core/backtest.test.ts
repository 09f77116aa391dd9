import {
  backtest,
  backtestGiven,
  biasStatistic,
  decompose,
  estimateModel,
  exceptionTests,
  type Backtest,
  type BacktestSettings,
  type Estimator,
} from '../../../src/core'
import { relativeGap } from '../../closeness'
import { generatedReturns } from '../../reference/data'

const sample: Estimator = { kind: 'sample' }
const settings: BacktestSettings = {
  estimator: sample,
  window: 30,
  first: 30,
  confidence: 0.95,
  method: 'normal',
  every: 1,
}

/** To the end in one go, with what was reported on the way. */
function run(...inputs: Parameters<typeof backtest>): Backtest & { readonly progress: number[] } {
  const progress: number[] = []
  const steps = backtest(...inputs)
  for (;;) {
    const step = steps.next()
    if (step.done) return { ...step.value, progress }
    progress.push(step.value)
  }
}

/** Returns of 5 holdings on 90 dates, by the generator that the reference sets describe; seed 20. */
const [T, n] = [90, 5]
const { returns } = generatedReturns(20, n, T)
const weights = Float64Array.of(0.5, -0.2, 0.4, 0.1, 0.3)
const book = Float64Array.from({ length: T }, (_, t) =>
  weights.reduce((sum, w, i) => sum + w * returns[t * n + i]!, 0),
)

describe('a back-test', () => {
  // The oracle: a model of the whole block for every window, and its decomposition. Tolerance 1e-12 relative.
  describe.each<Estimator>([
    sample,
    { kind: 'population' },
    { kind: 'exponential', decay: 0.9 },
    { kind: 'lagged', lags: 3 },
    { kind: 'shrinkage', target: 'identity' },
    { kind: 'shrinkage', target: 'correlation' },
    { kind: 'shrinkage', target: 'oas' },
  ])('with the estimator %j', (estimator) => {
    test.each([
      { window: 25, every: 1 },
      { window: null, every: 1 },
      { window: 25, every: 7 },
    ])('forecasts as a model of each window does: %j', ({ window, every }) => {
      const first = 30
      const { volatility, valueAtRisk } = run(returns, T, n, weights, {
        ...settings,
        estimator,
        window,
        first,
        every,
      })
      const expected = Array.from({ length: T - first }, (_, k) => {
        const t = first + k - (k % every)
        const from = window === null ? 0 : t - window
        const block = returns.slice(from * n, t * n)
        return decompose(estimateModel(block, t - from, n, estimator), weights).volatility
      })
      expect(relativeGap(volatility!, expected)).toBeLessThan(1e-12)
      // 1.6448536269514722: scipy 1.10.1, norm.ppf(0.95)
      expect(
        relativeGap(
          valueAtRisk,
          expected.map((sigma) => 1.6448536269514722 * sigma),
        ),
      ).toBeLessThan(1e-12)
    })
  })

  test.each([
    { window: 40, confidence: 0.95, rank: (_dates: number) => 2 },
    { window: 40, confidence: 0.99, rank: (_dates: number) => 1 },
    { window: null, confidence: 0.9, rank: (dates: number) => Math.ceil(dates / 10) },
  ])('takes the historical loss from a window sorted anew: %j', ({ window, confidence, rank }) => {
    const first = 40
    const { valueAtRisk } = run(returns, T, n, weights, {
      ...settings,
      window,
      first,
      confidence,
      method: 'historical',
    })
    const expected = Array.from({ length: T - first }, (_, k) => {
      const past = Array.from(book.subarray(window === null ? 0 : k, first + k), (y) => -y)
      return past.sort((a, b) => b - a)[rank(past.length) - 1]!
    })
    expect(relativeGap(valueAtRisk, expected)).toBeLessThan(1e-12)
  })

  test('compares each date with its own forecast', () => {
    const result = run(returns, T, n, weights, { ...settings, confidence: 0.8 })
    expect(relativeGap(result.returns, book.subarray(30))).toBeLessThan(1e-12)
    const expected = Array.from(result.returns, (y, k) => Number(-y > result.valueAtRisk[k]!))
    expect(Array.from(result.exceptions)).toEqual(expected)
    expect(result).toMatchObject({ first: 30, confidence: 0.8, missingDates: 'exception' })
    expect(result.tests).toEqual(exceptionTests(result.exceptions, 0.8))
    expect(result.tests.exceptions).toBeGreaterThan(3)
    expect(result.bias).toEqual(biasStatistic(result.returns.map((y, k) => y / result.volatility![k]!)))
  })

  test('leaves what it was given as it was', () => {
    const before = returns.slice()
    run(returns, T, n, weights, { ...settings, method: 'historical' })
    expect(returns).toEqual(before)
  })

  test('a hedge that cancels to rounding has a risk of 0, no exceptions and no scores', () => {
    // the second holding is thrice the first
    const pair = Float64Array.from(book, (y) => y).reduce<number[]>((all, y) => [...all, y, 3 * y], [])
    const result = run(Float64Array.from(pair), T, 2, Float64Array.of(0.3, -0.1), settings)
    expect(Math.max(...result.volatility!)).toBe(0)
    expect(result.tests.exceptions).toBe(0)
    expect(result.bias).toBeNull()
  })

  test('a first loss after nothing moved is an exception without a score', () => {
    const quiet = new Float64Array(T)
    quiet[50] = -0.01
    const result = run(quiet, T, 1, Float64Array.of(1), settings)
    expect(Array.from(result.exceptions.keys()).filter((k) => result.exceptions[k])).toEqual([20])
    expect(result.bias!.omitted).toBeGreaterThanOrEqual(21)
  })

  test('returns that never change are forecast no volatility at all, whatever rounding makes of their mean', () => {
    for (const estimator of [
      { kind: 'sample' },
      { kind: 'exponential', decay: 0.94 },
      { kind: 'lagged', lags: 2 },
    ] as const) {
      const { volatility, bias } = run(new Float64Array(T).fill(0.1), T, 1, Float64Array.of(1), {
        ...settings,
        estimator,
      })
      expect(new Set(volatility)).toEqual(new Set([0]))
      expect(bias).toBeNull()
    }
  })

  test('a historical forecast at any confidence is one of the losses of the window', () => {
    const losses = [0.01, -0.02, 0.03, 0, 0.02, 0.01]
    const forecast = (confidence: number) =>
      run(
        Float64Array.from(losses, (loss) => -loss),
        6,
        1,
        Float64Array.of(1),
        {
          ...settings,
          method: 'historical',
          window: 5,
          first: 5,
          confidence,
        },
      ).valueAtRisk
    // 5 x 0.2 = 1 and 5 x 0.4 = 2, by hand; far below one date it is the largest
    expect([...forecast(0.8)]).toEqual([0.03])
    expect([...forecast(0.6)]).toEqual([0.02])
    expect([...forecast(1 - 1e-10)]).toEqual([0.03])
  })

  test('reports how far it is, rising and below 1', () => {
    const long = generatedReturns(7, 40, 2000).returns
    const { progress } = run(long, 2000, 40, new Float64Array(40).fill(1 / 40), { ...settings, window: null })
    const shrunk = run(long.subarray(0, 300 * 40), 300, 40, new Float64Array(40).fill(1 / 40), {
      ...settings,
      estimator: { kind: 'shrinkage', target: 'identity' },
      window: 250,
      first: 250,
      every: 10,
    }).progress
    // the last forecast stands for fewer dates than the others
    const uneven = run(long.subarray(0, 300 * 40), 300, 40, new Float64Array(40).fill(1 / 40), {
      ...settings,
      estimator: { kind: 'shrinkage', target: 'correlation' },
      window: 250,
      first: 250,
      every: 49,
    }).progress
    for (const reports of [progress, shrunk, uneven]) {
      expect(reports.length).toBeGreaterThan(1)
      expect(reports).toEqual(reports.slice().sort((a, b) => a - b))
      expect(reports[0]).toBeGreaterThanOrEqual(0)
      expect(reports.at(-1)).toBeLessThanOrEqual(1)
    }
  })

  test.each<[string, Partial<BacktestSettings>, object]>([
    ['a window of one date', { window: 1 }, { code: 'out-of-range', where: { argument: 'window' } }],
    ['a first date inside the window', { first: 29 }, { code: 'out-of-range', where: { argument: 'first' } }],
    [
      'one date before the first',
      { window: null, first: 1 },
      { code: 'out-of-range', where: { argument: 'first' } },
    ],
    [
      'no date after the window',
      { window: 90, first: 90 },
      { code: 'too-few', where: { argument: 'returns' } },
    ],
    ['half a date', { every: 0.5 }, { code: 'out-of-range', where: { argument: 'every' } }],
    [
      'a confidence of a half',
      { confidence: 0.5 },
      { code: 'out-of-range', where: { argument: 'confidence' } },
    ],
    [
      'a decay of 1',
      { estimator: { kind: 'exponential', decay: 1 } },
      { code: 'out-of-range', where: { argument: 'decay' } },
    ],
    [
      'more lags than dates',
      { estimator: { kind: 'lagged', lags: 4 }, window: 4 },
      { code: 'out-of-range', where: { argument: 'lags' } },
    ],
  ])('refuses %s', (_name, wrong, fault) => {
    expect(() => run(returns, T, n, weights, { ...settings, ...wrong })).toThrow(
      expect.objectContaining(fault),
    )
  })

  test('refuses a gap with its place', () => {
    const gappy = returns.slice()
    gappy[7] = NaN
    expect(() => run(gappy, T, n, weights, settings)).toThrow(
      expect.objectContaining({ code: 'not-a-number', where: { argument: 'returns', row: 1, column: 2 } }),
    )
  })
})

describe('given forecasts', () => {
  const realised = Float64Array.of(-0.03, 0.01, NaN, -0.05, 0.02, -0.01)
  const volatility = Float64Array.of(0.01, 0.01, 0.01, 0.01, NaN, 0.01)

  test('a date without a return or a forecast counts as an exception', () => {
    const result = backtestGiven(realised, { volatility, valueAtRisk: null }, 0.99)
    expect(Array.from(result.exceptions)).toEqual([1, 0, 1, 1, 1, 0])
    expect(Array.from(result.missing)).toEqual([2, 4])
    expect(result.tests.dates).toBe(6)
    expect(result.bias).toMatchObject({ dates: 4, omitted: 2 })
  })

  test('or is left out, when that is wanted', () => {
    const result = backtestGiven(realised, { volatility, valueAtRisk: null }, 0.99, 'left out')
    expect(Array.from(result.exceptions)).toEqual([1, 0, 0, 1, 0, 0])
    expect(result).toMatchObject({ missingDates: 'left out', tests: { dates: 4, exceptions: 2 } })
    expect(result.tests.steps).toEqual({
      quietToQuiet: 0,
      quietToException: 1,
      exceptionToQuiet: 2,
      exceptionToException: 0,
    })
  })

  test('a value at risk that is given goes before one from the volatility, and needs none', () => {
    const valueAtRisk = Float64Array.of(0.03, 0.03, 0.03, 0.03, 0.03, 0.03)
    const both = backtestGiven(realised, { volatility, valueAtRisk }, 0.99)
    // the loss of 3% is as large as the value at risk, not larger; only the return of the third date is missing
    expect(Array.from(both.exceptions)).toEqual([0, 0, 1, 1, 0, 0])
    expect(both.bias).not.toBeNull()
    const alone = backtestGiven(realised, { volatility: null, valueAtRisk }, 0.99)
    expect(alone.exceptions).toEqual(both.exceptions)
    expect(alone).toMatchObject({ volatility: null, bias: null })
  })

  test.each<[string, () => unknown, object]>([
    [
      'no forecast',
      () => backtestGiven(realised, { volatility: null, valueAtRisk: null }, 0.99),
      { code: 'too-few', where: { argument: 'forecasts' } },
    ],
    [
      'too many of them',
      () => backtestGiven(realised, { volatility: new Float64Array(7), valueAtRisk: null }, 0.99),
      { code: 'shape', where: { argument: 'volatility' } },
    ],
    [
      'a volatility below 0',
      () =>
        backtestGiven(Float64Array.of(0, 0), { volatility: Float64Array.of(1, -1), valueAtRisk: null }, 0.99),
      { code: 'out-of-range', where: { argument: 'volatility', row: 1 } },
    ],
    [
      'an infinite return',
      () =>
        backtestGiven(
          Float64Array.of(0, Infinity),
          { volatility: Float64Array.of(1, 1), valueAtRisk: null },
          0.99,
        ),
      { code: 'not-a-number', where: { argument: 'returns', row: 1 } },
    ],
    [
      'nothing left but missing dates',
      () =>
        backtestGiven(
          Float64Array.of(NaN),
          { volatility: Float64Array.of(1), valueAtRisk: null },
          0.99,
          'left out',
        ),
      { code: 'too-few', where: { argument: 'exceptions' } },
    ],
  ])('refuses %s', (_name, attempt, fault) => {
    expect(attempt).toThrow(expect.objectContaining(fault))
  })
})

describe('tests of exceptions', () => {
  test('where every date is an exception no step starts from a quiet one, and independence says nothing', () => {
    const tests = exceptionTests(new Uint8Array(20).fill(1), 0.95)
    expect(tests.independence).toEqual({ statistic: 0, pValue: 1 })
    // -2 ln 0.05^20, by hand
    expect(tests.coverage.statistic).toBeCloseTo(40 * Math.log(20), 10)
    expect(tests.zone.zone).toBe('red')
  })

  test('one date alone has no step', () => {
    const tests = exceptionTests(Uint8Array.of(0), 0.99)
    expect(Object.values(tests.steps)).toEqual([0, 0, 0, 0])
    expect(tests.independence).toEqual({ statistic: 0, pValue: 1 })
  })

  test('no record without an exception leaves the green zone, however short', () => {
    // 0.99^5 = 0.951: the rule of 95% alone would put the amber zone at no exception
    expect(exceptionTests(new Uint8Array(5), 0.99).zone).toMatchObject({ zone: 'green', amberFrom: 1 })
    expect(exceptionTests(new Uint8Array(1), 0.99999).zone).toMatchObject({ zone: 'green', redFrom: 1 })
    expect(exceptionTests(Uint8Array.of(1, 0, 0, 0, 0), 0.99).zone.zone).toBe('amber')
  })

  test('an add-on is known for 250 dates at 99% only', () => {
    expect(exceptionTests(new Uint8Array(250), 0.99).zone.addOn).toBe(0)
    expect(exceptionTests(new Uint8Array(250), 0.975).zone.addOn).toBeNull()
    expect(exceptionTests(new Uint8Array(251), 0.99).zone.addOn).toBeNull()
  })

  test.each<[string, Uint8Array, number, object]>([
    ['no date', new Uint8Array(0), 0.99, { code: 'too-few' }],
    ['a count in place of a mark', Uint8Array.of(0, 2), 0.99, { code: 'out-of-range', where: { row: 1 } }],
    ['a tail in place of a confidence', Uint8Array.of(0), 0.01, { code: 'out-of-range' }],
    ['certainty', Uint8Array.of(0), 1, { code: 'out-of-range' }],
    ['a confidence that rounds to certainty', Uint8Array.of(0), 1 - 1e-12, { code: 'out-of-range' }],
    ['no number', Uint8Array.of(0), NaN, { code: 'out-of-range' }],
  ])('refuses %s', (_name, exceptions, confidence, fault) => {
    expect(() => exceptionTests(exceptions, confidence)).toThrow(
      expect.objectContaining({
        ...fault,
        ...('where' in fault ? { where: expect.objectContaining(fault.where as object) as object } : {}),
      }),
    )
  })
})

describe('the bias statistic', () => {
  test('leaves out what has no score and counts it', () => {
    expect(biasStatistic(Float64Array.of(1, NaN, -1, NaN))).toMatchObject({ dates: 2, omitted: 2, mean: 0 })
  })

  test('scores that never differ have no tails to measure', () => {
    expect(biasStatistic(Float64Array.of(1, 1, 1))).toMatchObject({
      value: 0,
      kurtosis: null,
      robustBand: null,
    })
  })

  test('the robust band is as wide as the statistic scatters under fat tails, where the usual one is too narrow', () => {
    // 400 samples of 500 scores, two-sided exponential with variance 1 (kurtosis 6), by the Park-Miller generator, seed 1. The scatter of 400 values
    // is known to 1/sqrt(800) = 3.5%: tolerance 12%, while the usual band is off by sqrt(5/2), 58%.
    let x = 1
    const u = () => (x = (16807 * x) % 2147483647) / 2147483647
    const draw = () => (u() < 0.5 ? 1 : -1) * -Math.log(u()) * Math.SQRT1_2
    const found = Array.from({ length: 400 }, () => biasStatistic(Float64Array.from({ length: 500 }, draw)))
    const mean = (values: number[]) => values.reduce((a, b) => a + b, 0) / values.length
    const centre = mean(found.map(({ value }) => value))
    const scatter = 1.96 * Math.sqrt(mean(found.map(({ value }) => (value - centre) ** 2)))
    expect(Math.abs(mean(found.map(({ robustBand }) => robustBand![1] - 1)) / scatter - 1)).toBeLessThan(0.12)
    expect(mean(found.map(({ band }) => band[1] - 1)) / scatter).toBeLessThan(0.75)
  })

  test.each([
    [Float64Array.of(NaN, 1), { code: 'too-few' }],
    [Float64Array.of(1, 2, -Infinity), { code: 'not-a-number', where: { argument: 'standardised', row: 2 } }],
  ])('refuses %j', (scores, fault) => {
    expect(() => biasStatistic(scores)).toThrow(expect.objectContaining(fault))
  })
})
