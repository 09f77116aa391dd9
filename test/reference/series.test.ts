import {
  autocorrelation,
  laggedCrossCorrelation,
  ljungBox,
  logReturns,
  outliers,
  robustScale,
  scalingFactor,
  unsmoothedVolatility,
} from '../../src/core'
import { absoluteGap, relativeGap } from '../closeness'
import { readCsv, readJson } from './data'

// Expected: series.json, computed with numpy 2.4.6 and scipy 1.17.1 by other routes than here (its `about`). Tolerance 1e-11: of correlations and
// probabilities absolute, else relative.
const tolerance = 1e-11

const set = readJson<{
  readonly series: Record<
    string,
    {
      readonly autocorrelation: number[]
      readonly robust_band: number[]
      readonly band: number
      readonly ljung_box: Record<string, [number, number]>
      readonly median: number
      readonly scale: number
      readonly beyond_6: number[]
      readonly sd: number
      readonly unsmoothed: number | null
    }
  >
  readonly cross: { readonly x: string; readonly y: string; readonly lag: number; readonly value: number }[]
}>('series.json')

const { names, rows } = readCsv('eustockmarkets_close.csv')
const returnsOf = (name: string) =>
  logReturns(
    Float64Array.from(rows, (row) => row[names.indexOf(name)]!),
    rows.length,
    1,
  )

describe.each(Object.entries(set.series))('daily returns of %s', (name, expected) => {
  const x = returnsOf(name)

  test('autocorrelations with both bands', () => {
    expected.autocorrelation.forEach((r, k) => {
      const actual = autocorrelation(x, k + 1)!
      expect(absoluteGap(actual.value, r)).toBeLessThan(tolerance)
      expect(absoluteGap(actual.band, expected.band)).toBeLessThan(tolerance)
      expect(absoluteGap(actual.robustBand, expected.robust_band[k]!)).toBeLessThan(tolerance)
      expect(actual.pairs).toBe(x.length - k - 1)
    })
  })

  test('Ljung-Box', () => {
    for (const [lags, [statistic, pValue]] of Object.entries(expected.ljung_box)) {
      const actual = ljungBox(x, Number(lags))!
      // the statistic of a correlation of 4e-4 carries that correlation's absolute error
      expect(absoluteGap(actual.statistic, statistic)).toBeLessThan(1e-9)
      expect(absoluteGap(actual.pValue, pValue)).toBeLessThan(1e-9)
    }
  })

  test('robust scale and what lies beyond six of them', () => {
    const scale = robustScale(x)!
    expect(relativeGap([scale.median, scale.scale], [expected.median, expected.scale])).toBeLessThan(
      tolerance,
    )
    expect(Array.from(outliers(x, 6).rows)).toEqual(expected.beyond_6)
  })

  test('volatility with and without smoothing', () => {
    const actual = unsmoothedVolatility(x)!
    expect(relativeGap(actual.volatility, expected.sd)).toBeLessThan(tolerance)
    if (expected.unsmoothed === null) expect(actual.unsmoothed).toBeNull()
    else expect(relativeGap(actual.unsmoothed!, expected.unsmoothed)).toBeLessThan(tolerance)
  })
})

test.each(set.cross)('$x with $y $lag dates later', ({ x, y, lag, value }) => {
  expect(absoluteGap(laggedCrossCorrelation(returnsOf(x), returnsOf(y), lag)!.value, value)).toBeLessThan(
    tolerance,
  )
})

// NIST/ITL Statistical Reference Datasets, univariate, https://www.itl.nist.gov/div898/strd/: certified lag-1 autocorrelations to 15 digits (read).
const nist = readJson<{
  readonly sets: Record<
    string,
    {
      readonly certified: { readonly lag1_autocorrelation: string }
      readonly double_precision_digits: { readonly input_rounding_limit: number | null }
    }
  >
}>('nist_univariate.json').sets

test.each(Object.entries(nist))(
  'NIST %s: the certified autocorrelation to the digits doubles allow',
  (name, { certified, double_precision_digits }) => {
    const values = Float64Array.from(readCsv(`nist_${name}.csv`).rows, ([y]) => y!)
    // NumAcc3 and 4 lose digits when their data are stored, and the exact value of what is stored is known for sd only
    const digits = Math.min(double_precision_digits.input_rounding_limit ?? 14, 14) - 1
    expect(
      absoluteGap(autocorrelation(values, 1)!.value, Number(certified.lag1_autocorrelation)),
    ).toBeLessThan(10 ** -digits)
  },
)

test('Lo (2002): scaling to 12 periods under AR(1) autocorrelation (formula memory, figures derived)', () => {
  const {
    inputs,
    outputs,
    tolerance: printed,
  } = readJson<{
    readonly checks: readonly {
      readonly id: string
      readonly inputs: { readonly q: number; readonly rho: number[] }
      readonly outputs: { readonly volFactor: number[] }
      readonly tolerance: { readonly volFactor: number }
    }[]
  }>('published.json').checks.find(({ id }) => id === 'lo-scaling-ar1')!
  const factors = inputs.rho.map((rho) =>
    scalingFactor(
      Float64Array.from({ length: inputs.q - 1 }, (_, k) => rho ** (k + 1)),
      inputs.q,
    ),
  )
  expect(absoluteGap(factors, outputs.volFactor)).toBeLessThan(printed.volFactor)
})
