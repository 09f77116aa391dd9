import fc from 'fast-check'
import { currencySplit, decompose, estimateModel, type Estimator } from '../../src/core'

const T = 12
const ESTIMATORS: Estimator[] = [
  { kind: 'sample' },
  { kind: 'exponential', decay: 0.9 },
  { kind: 'lagged', lags: 2 },
]
const numbers = (count: number, size: number) =>
  fc
    .array(fc.integer({ min: -1000, max: 1000 }), { minLength: count, maxLength: count })
    .map((list) => Float64Array.from(list, (k) => (k * size) / 1000))

/** n holdings and after them 2 currencies at weight 0; of each holding its currency. */
const book = fc.integer({ min: 1, max: 5 }).chain((n) =>
  fc.record({
    n: fc.constant(n),
    returns: numbers(T * (n + 2), 0.1),
    weights: numbers(n, 2).map((held) => Float64Array.of(...held, 0, 0)),
    currencyOf: fc
      .array(fc.constantFrom(-1, n, n + 1), { minLength: n, maxLength: n })
      .map((held) => Int32Array.of(...held, -1, -1)),
  }),
)
const sum = (values: Iterable<number>): number => [...values].reduce((a, x) => a + x, 0)

describe.each(ESTIMATORS)('by $kind', (estimator) => {
  test('local and currency parts add up to the contributions, those of the currencies to theirs, all to the volatility', () => {
    fc.assert(
      fc.property(book, ({ n, returns, weights, currencyOf }) => {
        const model = estimateModel(returns, T, n + 2, estimator)
        const d = decompose(model, weights)
        const { local, currency, byCurrency } = currencySplit(model, weights, currencyOf)
        const size = sum([...local, ...currency, ...d.contribution].map(Math.abs)) + d.volatility
        local.forEach((part, i) =>
          expect(Math.abs(part + currency[i]! - d.contribution[i]!)).toBeLessThanOrEqual(1e-15 * size),
        )
        expect(
          Math.abs(sum(byCurrency.map(({ contribution }) => contribution)) - sum(currency)),
        ).toBeLessThanOrEqual(1e-14 * size)
        expect(Math.abs(sum(local) + sum(currency) - d.volatility)).toBeLessThanOrEqual(1e-12 * size)
      }),
    )
  })

  test('a book without foreign holdings has no currency part', () => {
    fc.assert(
      fc.property(book, ({ n, returns, weights }) => {
        const model = estimateModel(returns, T, n + 2, estimator)
        const split = currencySplit(model, weights, new Int32Array(n + 2).fill(-1))
        expect([...split.currency]).toEqual(Array(n + 2).fill(0))
        expect(split.byCurrency).toEqual([])
        expect(split.local).toEqual(decompose(model, weights).contribution)
      }),
    )
  })

  test('minus the exposure held in the currency itself takes the part of that currency away', () => {
    fc.assert(
      fc.property(book, ({ n, returns, weights, currencyOf }) => {
        const model = estimateModel(returns, T, n + 2, estimator)
        const hedged = weights.slice()
        hedged[n] = -sum(weights.filter((_, i) => currencyOf[i] === n))
        const known = currencyOf.slice()
        known[n] = n
        const { local, currency, byCurrency } = currencySplit(model, hedged, known)
        const part = byCurrency.find(({ series }) => series === n)
        const size = sum(currency.map(Math.abs)) + 1e-12
        expect(Math.abs(part?.exposure ?? NaN)).toBeLessThanOrEqual(1e-12)
        expect(Math.abs(part?.contribution ?? NaN)).toBeLessThanOrEqual(1e-12 * size)
        // and what is held in the currency itself has no local part
        expect(local[n]).toBe(0)
      }),
    )
  })
})

test('the currency part is the covariance with the currency as a plain sum over dates gives it', () => {
  fc.assert(
    fc.property(book, ({ n, returns, weights, currencyOf }) => {
      const column = (i: number): number[] => Array.from({ length: T }, (_, t) => returns[t * (n + 2) + i]!)
      const mean = (values: readonly number[]): number => sum(values) / T
      const covariance = (a: readonly number[], b: readonly number[]): number =>
        sum(a.map((x, t) => (x - mean(a)) * (b[t]! - mean(b)))) / (T - 1)
      const total = Array.from({ length: T }, (_, t) => sum(weights.map((w, i) => w * column(i)[t]!)))
      const volatility = Math.sqrt(covariance(total, total))
      // where nearly nothing moves there is nothing to compare
      fc.pre(volatility > 1e-6)
      const { currency } = currencySplit(
        estimateModel(returns, T, n + 2, { kind: 'sample' }),
        weights,
        currencyOf,
      )
      currency.forEach((part, i) => {
        const series = currencyOf[i]!
        const plain = series < 0 ? 0 : (weights[i]! * covariance(column(series), total)) / volatility
        expect(Math.abs(part - plain)).toBeLessThanOrEqual(1e-9)
      })
    }),
  )
})
