import {
  backtestGiven,
  biasStatistic,
  exceptionTests,
  logReturns,
  type ExceptionTests,
  type TestResult,
} from '../../src/core'
import { absoluteGap, relativeGap } from '../closeness'
import { readCsv, readJson } from './data'

// Expected: backtests.json, computed with numpy 1.24.2 / scipy 1.10.1 and a second time with R 4.2.2. Tolerance 1e-11 relative, as README.md
// says; statistics are compared relative to themselves, so a small p-value has to have its digits too.
const tolerance = 1e-11

interface Case {
  readonly description: string
  readonly exception_days_1based: number[]
  readonly result: Record<string, number>
}
interface Forecast {
  readonly first_sigma: number
  readonly last_sigma: number
  readonly bias_std: number
  readonly interval95_sqrt_2_over_T: number[]
  readonly interval95_normal_1_96_over_sqrt_2T: number[]
  readonly z_mean: number
  readonly z_kurt: number
}
const set = readJson<{
  readonly cases: Record<string, Case>
  readonly bias_statistic: {
    readonly cases: {
      readonly eu_log_long: {
        readonly window: number
        readonly lambda_: number
        readonly rolling_equal: Forecast
        readonly ewma: Forecast
      }
    }
  }
  readonly binomial_table: { readonly cdf: number[] }
}>('backtests.json')

const recordOf = (T: number, days: readonly number[]) => {
  const exceptions = new Uint8Array(T)
  for (const day of days) exceptions[day - 1] = 1
  return exceptions
}

const figuresOf = (tests: ExceptionTests) => ({
  exceptions: tests.exceptions,
  rate: tests.rate,
  n00: tests.steps.quietToQuiet,
  n01: tests.steps.quietToException,
  n10: tests.steps.exceptionToQuiet,
  n11: tests.steps.exceptionToException,
  lr_pof: tests.coverage.statistic,
  p_pof: tests.coverage.pValue,
  lr_ind: tests.independence.statistic,
  p_ind: tests.independence.pValue,
  lr_cc: tests.conditionalCoverage.statistic,
  p_cc: tests.conditionalCoverage.pValue,
  binom_cdf_x: tests.zone.cumulative,
})

test.each(Object.entries(set.cases))('exceptions %s', (_name, { exception_days_1based, result }) => {
  const tests = exceptionTests(recordOf(result['T']!, exception_days_1based), 1 - result['p']!)
  for (const [figure, actual] of Object.entries(figuresOf(tests)))
    expect({ figure, gap: relativeGap(actual, result[figure]!) }).toEqual({
      figure,
      gap: expect.closeTo(0, 11) as number,
    })
})

describe('forecasts of the European indices by the rule of the set', () => {
  const { window, lambda_, ...forecasts } = set.bias_statistic.cases.eu_log_long
  const { names, rows } = readCsv('eustockmarkets_close.csv')
  const first = names.indexOf('DAX')
  const block = logReturns(Float64Array.from(rows.flatMap((row) => row.slice(first, first + 4))), 1860, 4)
  const book = Float64Array.from({ length: 1859 }, (_, t) =>
    [0.4, 0.3, 0.2, 0.1].reduce((sum, w, i) => sum + w * block[4 * t + i]!, 0),
  )
  const returns = book.slice(window)
  const meanSquare = (values: Float64Array) => values.reduce((sum, y) => sum + y * y, 0) / values.length
  const volatilities = {
    rolling_equal: returns.map((_, k) => Math.sqrt(meanSquare(book.subarray(k, k + window)))),
    ewma: (() => {
      let variance = meanSquare(book.subarray(0, window))
      return returns.map((y) => {
        const sigma = Math.sqrt(variance)
        variance = lambda_ * variance + (1 - lambda_) * y * y
        return sigma
      })
    })(),
  }

  test.each(['rolling_equal', 'ewma'] as const)('%s: exceptions and tests at 95% and 99%', (kind) => {
    for (const confidence of [0.95, 0.99]) {
      const { exception_days_1based, result } = set.cases[`eu_log_long_${kind}_${confidence}`]!
      const back = backtestGiven(returns, { volatility: volatilities[kind], valueAtRisk: null }, confidence)
      expect(Array.from(back.exceptions.keys()).filter((k) => back.exceptions[k])).toEqual(
        exception_days_1based.map((day) => day - 1),
      )
      expect(relativeGap(back.tests.conditionalCoverage.pValue, result['p_cc']!)).toBeLessThan(tolerance)
      expect(back.missing).toHaveLength(0)
    }
  })

  test.each(['rolling_equal', 'ewma'] as const)('%s: bias statistic with its bands', (kind) => {
    const expected = forecasts[kind]
    const sigma = volatilities[kind]
    expect(relativeGap([sigma[0]!, sigma.at(-1)!], [expected.first_sigma, expected.last_sigma])).toBeLessThan(
      tolerance,
    )
    const { bias } = backtestGiven(returns, { volatility: sigma, valueAtRisk: null }, 0.99)
    expect(bias).toMatchObject({ dates: 1609, omitted: 0 })
    expect(relativeGap(bias!.value, expected.bias_std)).toBeLessThan(tolerance)
    expect(relativeGap(bias!.mean, expected.z_mean)).toBeLessThan(tolerance)
    expect(relativeGap(bias!.kurtosis!, expected.z_kurt)).toBeLessThan(tolerance)
    expect(relativeGap(bias!.band, expected.interval95_sqrt_2_over_T)).toBeLessThan(tolerance)
    // at a kurtosis of 3 the robust band is the normal one; the set rounds 1.959964 to 1.96
    const [, normal] = expected.interval95_normal_1_96_over_sqrt_2T
    const wider = Math.sqrt((expected.z_kurt - 1) / 2)
    expect((bias!.robustBand![1] - 1) / wider).toBeCloseTo(normal! - 1, 5)
  })
})

test('the probabilities of so many exceptions in 250 dates at 99%', () => {
  const cumulative = set.binomial_table.cdf.map(
    (_, x) =>
      exceptionTests(
        recordOf(
          250,
          Array.from({ length: x }, (_, k) => 10 * k + 1),
        ),
        0.99,
      ).zone.cumulative,
  )
  expect(relativeGap(cumulative, set.binomial_table.cdf)).toBeLessThan(tolerance)
})

describe('what the test of the coverage accepts and detects', () => {
  // Computed with scipy 1.17.1 by trying every count: series.json, `detection`. Tolerance 1e-11 absolute, of a probability.
  const { detection } = readJson<{
    readonly detection: {
      readonly T: number
      readonly p: number
      readonly fewest: number
      readonly most: number
      readonly detected: number
      readonly amber_from: number
      readonly red_from: number
    }[]
  }>('series.json')
  test.each(detection)('$T dates, p = $p', ({ T, p, fewest, most, detected, amber_from, red_from }) => {
    const tests = exceptionTests(new Uint8Array(T), 1 - p)
    expect(tests.accepted).toEqual({ fewest, most })
    expect(tests.zone).toMatchObject({ amberFrom: amber_from, redFrom: red_from })
    expect(tests.power.rate).toBeCloseTo(2 * p, 12)
    expect(absoluteGap(tests.power.detected, detected)).toBeLessThan(1e-11)
    expect(tests.power.detected + tests.power.missed).toBeCloseTo(1, 12)
  })
})

// Citation, status (read or memory), tolerance and notes stand beside each example in published.json.
interface Example<Inputs, Outputs> {
  readonly id: string
  readonly inputs: Inputs
  readonly outputs: Outputs
  readonly tolerance: Record<string, number>
}
const published = <Inputs, Outputs>(id: string) =>
  readJson<{ readonly checks: readonly Example<Inputs, Outputs>[] }>('published.json').checks.find(
    (example) => example.id === id,
  )!

const statistic = (x: number, T: number, p: number) =>
  exceptionTests(
    recordOf(
      T,
      Array.from({ length: x }, (_, k) => k + 1),
    ),
    1 - p,
  ).coverage.statistic

describe('published figures', () => {
  test('Kupiec (1995) in Jorion, Value at Risk, non-rejection regions (memory)', () => {
    const { inputs, outputs } = published<
      { readonly T: number[]; readonly p: number[] },
      { readonly regions: Record<string, (readonly [number | null, number])[]> }
    >('kupiec-nonrejection-255-510-1000')
    for (const p of inputs.p)
      inputs.T.forEach((T, column) => {
        const { fewest, most } = exceptionTests(new Uint8Array(T), 1 - p).accepted
        const [above, below] = outputs.regions[String(p)]![column]!
        // Where the table prints no lower bound, the statistic still rejects that there is none: 5.13 at 0 of 255.
        expect([fewest - 1, most + 1]).toEqual([above ?? 0, below])
      })
  })

  test('Kupiec (1995), Table 2: the largest sample in which so many failures are rejected (read)', () => {
    const { inputs, outputs } = published<
      { readonly x: number[]; readonly p: number[] },
      { readonly maxN: number[][] }
    >('kupiec-table2')
    inputs.x.forEach((x, row) =>
      inputs.p.forEach((p, column) => {
        const largest = outputs.maxN[row]![column]!
        expect(statistic(x, largest, p)).toBeGreaterThan(3.841)
        expect(statistic(x, largest + 1, p)).toBeLessThan(3.841)
      }),
    )
  })

  test('Kupiec (1995), page 14: the time until the first failure, which is the coverage of one failure in so many dates (read)', () => {
    const { inputs, outputs } = published<{ readonly p: number }, { readonly lastAccepted: number }>(
      'kupiec-tuff-p05',
    )
    expect(statistic(1, outputs.lastAccepted, inputs.p)).toBeLessThan(3.841)
    expect(statistic(1, outputs.lastAccepted + 1, inputs.p)).toBeGreaterThan(3.841)
  })

  test('Basel Committee, MAR32 (2019), 32.9, Table 1: zones and multipliers (read)', () => {
    const { inputs, outputs } = published<
      { readonly exceptions: number[] },
      { readonly zone: string[]; readonly multiplier: number[] }
    >('basel-zones-250-99')
    const zones = inputs.exceptions.map(
      (x) =>
        exceptionTests(
          recordOf(
            250,
            Array.from({ length: x }, (_, k) => 20 * k + 1),
          ),
          0.99,
        ).zone,
    )
    expect(zones.map(({ zone }) => zone)).toEqual(outputs.zone)
    expect(zones.map(({ addOn }) => Number((1.5 + addOn!).toFixed(2)))).toEqual(outputs.multiplier)
  })

  test('Basel Committee (1996), Table 2: cumulative probabilities (memory)', () => {
    const { outputs, tolerance } = published<unknown, { readonly cumulativePct: number[] }>(
      'basel-cumulative',
    )
    const cumulative = outputs.cumulativePct.map(
      (_, x) =>
        100 *
        exceptionTests(
          recordOf(
            250,
            Array.from({ length: x }, (_, k) => k + 1),
          ),
          0.99,
        ).zone.cumulative,
    )
    expect(absoluteGap(cumulative, outputs.cumulativePct)).toBeLessThan(tolerance['cumulativePct']!)
  })

  test('the zones over other dates and at another confidence, a public methodology note (read in an excerpt)', () => {
    const { inputs, outputs } = published<
      { readonly n: number; readonly p: number },
      { readonly yellow: number; readonly red: number }
    >('basel-zone-extension')
    expect(exceptionTests(new Uint8Array(inputs.n), 1 - inputs.p).zone).toMatchObject({
      amberFrom: outputs.yellow,
      redFrom: outputs.red,
      addOn: null,
    })
  })

  test('Christoffersen (1998): critical values, as printed in a 2002 committee paper after Lopez 1999 (read)', () => {
    const { outputs, tolerance } = published<unknown, { readonly df1: number[]; readonly df2: number[] }>(
      'christoffersen-critical',
    )
    // Of many records, those and only those beyond a printed point have a p-value below its 5% or 1%.
    const results = [100, 250, 600].flatMap((T) =>
      Array.from({ length: 40 }, (_, x) => {
        const record = recordOf(
          T,
          Array.from({ length: x }, (_, k) => 2 * k + 1),
        )
        return exceptionTests(record, 0.95)
      }),
    )
    const check = (points: readonly number[], near: number, tested: readonly TestResult[]) => {
      for (const [k, level] of [0.05, 0.01].entries()) {
        const clear = tested.filter(({ statistic }) => Math.abs(statistic - points[k]!) > near)
        expect(clear.filter(({ pValue }) => pValue < level)).toEqual(
          clear.filter(({ statistic }) => statistic > points[k]!),
        )
        expect(clear.some(({ pValue }) => pValue < level) && clear.some(({ pValue }) => pValue > level)).toBe(
          true,
        )
      }
    }
    check(
      outputs.df1,
      tolerance['df1']!,
      results.map(({ coverage }) => coverage),
    )
    check(
      outputs.df2,
      tolerance['df2']!,
      results.map(({ conditionalCoverage }) => conditionalCoverage),
    )
  })

  test('Christoffersen (1998): independence, and coverage of the steps, of 230, 10, 9 and 1 (memory, derived)', () => {
    const { inputs, outputs, tolerance } = published<
      {
        readonly T00: number
        readonly T01: number
        readonly T10: number
        readonly T11: number
        readonly p: number
      },
      { readonly uc: number; readonly ind: number; readonly cc: number }
    >('christoffersen-derived')
    // quiet first, ten exceptions begun from quiet, one of them two dates long, the last at the end: 230, 10, 9, 1
    const pattern = [0, ...Array.from({ length: 8 }, () => [0, 1]).flat(), 0, 1, 1]
    const quiet = Array.from({ length: 251 - pattern.length - 2 }, () => 0)
    const record = Uint8Array.from([...quiet, ...pattern, 0, 1])
    const tests = exceptionTests(record, 1 - inputs.p)
    expect(tests.steps).toEqual({
      quietToQuiet: inputs.T00,
      quietToException: inputs.T01,
      exceptionToQuiet: inputs.T10,
      exceptionToException: inputs.T11,
    })
    expect(absoluteGap(tests.independence.statistic, outputs.ind)).toBeLessThan(tolerance['ind']!)
    // the source counts the steps only: the record without its first date
    const steps = exceptionTests(record.slice(1), 1 - inputs.p).coverage.statistic
    expect(absoluteGap(steps, outputs.uc)).toBeLessThan(tolerance['uc']!)
    expect(absoluteGap(steps + tests.independence.statistic, outputs.cc)).toBeLessThan(2 * tolerance['cc']!)
  })

  test('Kendall & Stuart: the error of a volatility is 1/sqrt(2T) of it, half the reach of the band of the bias statistic (memory)', () => {
    const { inputs, outputs, tolerance } = published<
      { readonly T: number[] },
      { readonly relative: number[] }
    >('vol-standard-error')
    const halves = inputs.T.map((T) => {
      const { band } = biasStatistic(Float64Array.from({ length: T }, (_, t) => (t % 2 ? 1 : -1)))
      return (band[1] - 1) / 2
    })
    expect(absoluteGap(halves, outputs.relative)).toBeLessThan(tolerance['relative']!)
  })
})
