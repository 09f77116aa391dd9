import fc from 'fast-check'
import { decompose, returnsModel, shareDifferences, standardErrors, type Weighting } from '../../src/core'
import { absoluteGap, relativeGap } from '../closeness'
import { errorOf, influences } from '../influences'

// Invariants of the standard errors. Bounds on rounding are multiples of what squares of returns lose to hedging.

const real = (largest: number) =>
  fc.double({ min: -largest, max: largest, noNaN: true }).map((x) => Math.round(x * 1e9) / 1e9)

const weighting: fc.Arbitrary<Weighting> = fc.oneof(
  fc.constant<Weighting>({ kind: 'sample' }),
  fc.constant<Weighting>({ kind: 'population' }),
  fc.double({ min: 0.5, max: 0.99, noNaN: true }).map((decay): Weighting => ({ kind: 'exponential', decay })),
)

/** A block of returns with weights, and lags where dates weigh alike. */
const book = fc
  .record({ size: fc.integer({ min: 1, max: 7 }), dates: fc.integer({ min: 3, max: 19 }), weighting })
  .chain(({ size, dates, weighting }) =>
    fc.record({
      size: fc.constant(size),
      dates: fc.constant(dates),
      weighting: fc.constant(weighting),
      lags: weighting.kind === 'exponential' ? fc.constant(0) : fc.oneof(fc.constant(0), fc.nat(dates - 1)),
      returns: fc.array(real(0.3), { minLength: size * dates, maxLength: size * dates }),
      weights: fc.array(real(2), { minLength: size, maxLength: size }).map((w) => Float64Array.from(w)),
    }),
  )
  .map((b) => {
    const model = returnsModel(Float64Array.from(b.returns), b.dates, b.size, b.weighting)
    const rows = Array.from({ length: b.dates }, (_, t) => b.returns.slice(t * b.size, (t + 1) * b.size))
    return {
      ...b,
      model,
      rows,
      errors: standardErrors(model, b.weights, b.lags),
      d: decompose(model, b.weights),
    }
  })
  // a total that is not rounding beside the sum of its parts
  .filter(({ d }) => d.volatility > 1e-3 * d.standAlone.reduce((a, x) => a + x, 1e-6))

describe('standard errors of any book', () => {
  test('are those of the influence values worked out date by date', () => {
    fc.assert(
      fc.property(book, ({ rows, weights, model, lags, errors, d }) => {
        const { rowWeights: omega } = model
        const correction = lags > 0 ? 1 : model.correction
        const plain = influences(rows, weights, { omega, correction, lags })
        const expected = (values: number[][]) => values.map((u) => errorOf(u, omega, lags))
        // Squares of influence values that cancel leave the square root of their rounding, beside the figure itself: an error that is none (two
        // dates, or one that is nearly all of the variance) comes out as 1e-8 of it or as 0.
        const ofVolatility = errorOf(plain.volatility, omega, lags)
        const ofContributions = expected(plain.contribution)
        const unit = 1e-6 * Math.max(d.volatility, ofVolatility, ...ofContributions)
        expect(Math.abs(errors.volatility - ofVolatility)).toBeLessThan(unit)
        expect(absoluteGap(errors.contribution, ofContributions)).toBeLessThan(unit)
        const largest = Math.max(1, ...plain.share.flat().map(Math.abs))
        errors.share!.forEach((error, i) => {
          expect(Math.abs(error - errorOf(plain.share[i]!, omega, lags))).toBeLessThan(1e-6 * largest)
        })
      }),
    )
  })

  test('of shares and differences obey the triangle inequality; a pair the other way round has the same', () => {
    fc.assert(
      fc.property(book, fc.nat(), fc.nat(), ({ model, weights, size, lags, errors }, a, b) => {
        const [i, j] = [a % size, b % size]
        const [one, other, same] = shareDifferences(model, weights, Int32Array.of(i, j, j, i, i, i), lags)!
        const [first, second] = [errors.share![i]!, errors.share![j]!]
        const rounding = 1e-6 * (1 + first + second)
        expect(one).toBeLessThanOrEqual(first + second + rounding)
        expect(one).toBeGreaterThanOrEqual(Math.abs(first - second) - rounding)
        expect(other).toBe(one)
        expect(same).toBe(0)
      }),
    )
  })

  test('of two shares that add up to 1 are alike, and that of their difference is twice as large (identity)', () => {
    fc.assert(
      fc.property(
        book.filter(({ size }) => size === 2),
        ({ model, weights, lags, errors }) => {
          const [first, second] = errors.share!
          const difference = shareDifferences(model, weights, Int32Array.of(0, 1), lags)![0]!
          expect(Math.abs(first! - second!)).toBeLessThan(1e-6 * (1 + first!))
          expect(Math.abs(difference - 2 * first!)).toBeLessThan(1e-6 * (1 + first!))
        },
      ),
    )
  })

  test('of contributions add up to that of the volatility or more (triangle inequality)', () => {
    fc.assert(
      fc.property(book, ({ errors, d }) => {
        const sum = errors.contribution.reduce((a, x) => a + x, 0)
        expect(sum).toBeGreaterThanOrEqual(errors.volatility - 1e-6 * d.volatility)
      }),
    )
  })

  test('shrink as 1/sqrt(T): the same history k times over has errors 1/sqrt(k) as large (independent dates)', () => {
    fc.assert(
      fc.property(
        book.filter(({ weighting, lags }) => weighting.kind === 'population' && lags === 0),
        fc.integer({ min: 2, max: 9 }),
        ({ returns, dates, size, weights, weighting, errors, d }, k) => {
          const again = Float64Array.from(Array.from({ length: k }, () => returns).flat())
          const { volatility, contribution, share } = standardErrors(
            returnsModel(again, dates * k, size, weighting),
            weights,
          )
          const root = Math.sqrt(k)
          const tolerance = 1e-6
          // rounding beside the figure itself, as above
          const unit = tolerance * Math.max(d.volatility, errors.volatility, ...errors.contribution)
          expect(Math.abs(volatility * root - errors.volatility)).toBeLessThan(unit)
          expect(
            absoluteGap(
              contribution.map((x) => x * root),
              errors.contribution,
            ),
          ).toBeLessThan(unit)
          share!.forEach((error, i) => {
            expect(Math.abs(error * root - errors.share![i]!)).toBeLessThan(
              tolerance * (1 + errors.share![i]!),
            )
          })
        },
      ),
    )
  })

  test('scale with the weights, and those of shares do not (identity)', () => {
    fc.assert(
      fc.property(book, fc.integer({ min: -30, max: 30 }), ({ model, weights, lags, errors }, power) => {
        // by powers of two: to the last digit
        const factor = 2 ** power
        const scaled = standardErrors(
          model,
          weights.map((w) => w * factor),
          lags,
        )
        expect(scaled.share).toEqual(errors.share)
        expect(scaled.volatility).toBe(errors.volatility * factor)
        expect(scaled.contribution).toEqual(errors.contribution.map((x) => x * factor))
      }),
    )
  })

  test('do not heed the order of dates without lags, nor the order of positions', () => {
    fc.assert(
      fc.property(book, ({ rows, weights, dates, size, weighting, lags, errors, d }) => {
        const turned = returnsModel(
          Float64Array.from(rows.flatMap((row) => row.slice().reverse())),
          dates,
          size,
          weighting,
        )
        const other = standardErrors(turned, weights.slice().reverse(), lags)
        expect(relativeGap(other.contribution.reverse(), errors.contribution)).toBeLessThan(1e-6)
        if (weighting.kind === 'exponential' || lags > 0) return
        const backwards = returnsModel(
          Float64Array.from(rows.slice().reverse().flat()),
          dates,
          size,
          weighting,
        )
        const { volatility } = standardErrors(backwards, weights)
        expect(Math.abs(volatility - errors.volatility)).toBeLessThan(1e-9 * d.volatility)
      }),
    )
  })
})
