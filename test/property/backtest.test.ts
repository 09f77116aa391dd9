import fc from 'fast-check'
import {
  autocorrelation,
  backtest,
  exceptionTests,
  laggedCrossCorrelation,
  outliers,
  robustScale,
  scalingFactor,
  type Backtest,
  type Estimator,
} from '../../src/core'

function finish(...inputs: Parameters<typeof backtest>): Backtest {
  const steps = backtest(...inputs)
  for (;;) {
    const step = steps.next()
    if (step.done) return step.value
  }
}

/** In steps of 1e-6, so that no square leaves the ordinary doubles. */
const real = (largest: number) =>
  fc.double({ min: -largest, max: largest, noNaN: true }).map((x) => Math.round(x * 1e6) / 1e6)
const vector = (length: number, largest: number) =>
  fc.array(real(largest), { minLength: length, maxLength: length }).map((x) => Float64Array.from(x))

const estimator = fc.constantFrom<Estimator>(
  { kind: 'sample' },
  { kind: 'exponential', decay: 0.9 },
  { kind: 'lagged', lags: 2 },
  { kind: 'shrinkage', target: 'identity' },
  { kind: 'shrinkage', target: 'correlation' },
)

const history = fc
  .record({ size: fc.integer({ min: 1, max: 4 }), dates: fc.integer({ min: 12, max: 40 }) })
  .chain(({ size, dates }) =>
    fc.record({
      size: fc.constant(size),
      dates: fc.constant(dates),
      returns: vector(size * dates, 0.1),
      weights: vector(size, 2),
      cut: fc.integer({ min: 10, max: dates - 1 }),
      settings: fc.record({
        estimator,
        window: fc.constantFrom(null, 4, 10),
        first: fc.constant(10),
        confidence: fc.constantFrom(0.8, 0.95),
        method: fc.constantFrom('normal' as const, 'historical' as const),
        every: fc.constantFrom(1, 3),
      }),
    }),
  )

describe('a back-test of any history', () => {
  test('knows nothing of what comes: other returns from a date on change no forecast up to it', () => {
    fc.assert(
      fc.property(history, fc.double({ min: -0.5, max: 0.5, noNaN: true }), (h, shock) => {
        const { size, dates, returns, weights, cut, settings } = h
        const other = returns.map((r, k) => (k >= cut * size ? r + shock : r))
        const before = finish(returns, dates, size, weights, settings)
        const after = finish(other, dates, size, weights, settings)
        const known = cut - settings.first
        expect(after.volatility!.slice(0, known + 1)).toEqual(before.volatility!.slice(0, known + 1))
        expect(after.valueAtRisk.slice(0, known + 1)).toEqual(before.valueAtRisk.slice(0, known + 1))
        expect(after.exceptions.slice(0, known)).toEqual(before.exceptions.slice(0, known))
      }),
    )
  })

  test('a book twice as large has twice the forecasts and the same exceptions and scores', () => {
    fc.assert(
      fc.property(history, ({ size, dates, returns, weights, settings }) => {
        const once = finish(returns, dates, size, weights, settings)
        const twice = finish(
          returns,
          dates,
          size,
          weights.map((w) => 2 * w),
          settings,
        )
        // doubling is exact in binary
        expect(twice.volatility).toEqual(once.volatility!.map((s) => 2 * s))
        expect(twice.exceptions).toEqual(once.exceptions)
        expect(twice.bias).toEqual(once.bias)
      }),
    )
  })

  test('a higher confidence has no more exceptions', () => {
    fc.assert(
      fc.property(history, ({ size, dates, returns, weights, settings }) => {
        const at = (confidence: number) =>
          finish(returns, dates, size, weights, { ...settings, confidence }).exceptions
        const [low, high] = [at(0.8), at(0.95)]
        high.forEach((exception, k) => {
          expect(exception).toBeLessThanOrEqual(low[k]!)
        })
      }),
    )
  })
})

const record = fc
  .record({
    exceptions: fc
      .array(fc.constantFrom(0, 0, 0, 1), { minLength: 2, maxLength: 120 })
      .map((x) => Uint8Array.from(x)),
    confidence: fc.constantFrom(0.9, 0.95, 0.975, 0.99),
  })
  .map((r) => ({ ...r, tests: exceptionTests(r.exceptions, r.confidence) }))

describe('tests of any record of exceptions', () => {
  test('the order of dates matters to independence alone', () => {
    fc.assert(
      fc.property(record, ({ exceptions, confidence, tests }) => {
        const sorted = exceptionTests(exceptions.slice().sort(), confidence)
        expect(sorted.coverage).toEqual(tests.coverage)
        expect(sorted.zone).toEqual(tests.zone)
        // Backwards, steps run the other way: a likelihood ratio of a two-way table does not mind
        const back = exceptionTests(exceptions.slice().reverse(), confidence)
        expect(back.independence.statistic).toBeCloseTo(tests.independence.statistic, 9)
      }),
    )
  })

  test('counts are accepted exactly where the p-value is above 5%, and one more exception than expected weighs against', () => {
    fc.assert(
      fc.property(record, ({ exceptions, confidence, tests }) => {
        const { accepted, coverage, dates, expected } = tests
        const inside = tests.exceptions >= accepted.fewest && tests.exceptions <= accepted.most
        expect(inside).toBe(coverage.pValue >= 0.05)
        const quiet = exceptions.indexOf(0)
        if (quiet < 0 || tests.exceptions < expected) return
        const more = exceptionTests(
          exceptions.map((x, k) => (k === quiet ? 1 : x)),
          confidence,
        )
        expect(more.coverage.statistic).toBeGreaterThan(coverage.statistic)
        expect(more.dates).toBe(dates)
      }),
    )
  })

  test('steps add up, probabilities are probabilities, zones follow one another', () => {
    fc.assert(
      fc.property(record, ({ tests }) => {
        const { quietToQuiet, quietToException, exceptionToQuiet, exceptionToException } = tests.steps
        expect(quietToQuiet + quietToException + exceptionToQuiet + exceptionToException).toBe(
          tests.dates - 1,
        )
        for (const p of [
          tests.coverage.pValue,
          tests.independence.pValue,
          tests.conditionalCoverage.pValue,
          tests.power.detected,
          tests.zone.cumulative,
        ]) {
          expect(p).toBeGreaterThanOrEqual(0)
          expect(p).toBeLessThanOrEqual(1)
        }
        expect(tests.zone.amberFrom).toBeLessThanOrEqual(tests.zone.redFrom)
      }),
    )
  })
})

const gappy = fc
  .array(fc.oneof({ weight: 6, arbitrary: real(1) }, { weight: 1, arbitrary: fc.constant(NaN) }), {
    minLength: 3,
    maxLength: 60,
  })
  .map((x) => Float64Array.from(x))
const lag = fc.integer({ min: 1, max: 5 })

describe('statistics of any series, gaps included', () => {
  test('an autocorrelation lies within 1, and neither level nor unit matters', () => {
    fc.assert(
      fc.property(gappy, lag, real(1), (x, k, level) => {
        const r = autocorrelation(x, k)
        const moved = autocorrelation(
          x.map((value) => 8 * value + level),
          k,
        )
        if (r === null) return expect(moved).toBeNull()
        expect(Math.abs(r.value)).toBeLessThanOrEqual(1 + 1e-12)
        expect(moved!.value).toBeCloseTo(r.value, 6)
        expect(moved!.robustBand).toBeCloseTo(r.robustBand, 6)
      }),
    )
  })

  test('a series with itself is its autocorrelation; two series with their places changed are the other lag', () => {
    fc.assert(
      fc.property(gappy, gappy, lag, (a, b, k) => {
        const length = Math.min(a.length, b.length)
        const [x, y] = [a.slice(0, length), b.slice(0, length)]
        expect(laggedCrossCorrelation(x, x.slice(), k)).toEqual(autocorrelation(x, k))
        const [there, back] = [laggedCrossCorrelation(x, y, k), laggedCrossCorrelation(y, x, -k)]
        expect(there?.pairs).toBe(back?.pairs)
        if (there && back) expect(there.value).toBeCloseTo(back.value, 12)
      }),
    )
  })

  test('scaling by all autocorrelations of a series is the root of the sum over its correlation matrix', () => {
    fc.assert(
      fc.property(gappy, fc.integer({ min: 1, max: 8 }), (x, q) => {
        const rho = Float64Array.from({ length: q - 1 }, (_, k) => autocorrelation(x, k + 1)?.value ?? 0)
        let sum = 0
        for (let i = 0; i < q; i++) for (let j = 0; j < q; j++) sum += i === j ? 1 : rho[Math.abs(i - j) - 1]!
        expect(scalingFactor(rho, q)).toBeCloseTo(Math.sqrt(Math.max(0, sum)), 6)
      }),
    )
  })

  test('half of the observations lie within the median distance, and multiples are distances in scales', () => {
    fc.assert(
      fc.property(gappy, (x) => {
        const scale = robustScale(x)
        if (scale?.basis !== 'all') return
        const observed = Array.from(x).filter((value) => !Number.isNaN(value))
        // 0.6744897501960817: normal quantile at 75%, scipy 1.10.1
        const reach = scale.scale * 0.6744897501960817
        const within = observed.filter(
          (value) => Math.abs(value - scale.median) <= reach * (1 + 1e-9) + 1e-15,
        ).length
        expect(2 * within).toBeGreaterThanOrEqual(observed.length)
        const { rows, multiples } = outliers(x, 2)
        rows.forEach((row, k) => {
          expect(scale.median + multiples[k]! * scale.scale).toBeCloseTo(x[row]!, 9)
        })
        if (scale.scale > 0)
          expect(rows.length).toBe(
            observed.filter((v) => Math.abs((v - scale.median) / scale.scale) > 2).length,
          )
      }),
    )
  })
})
