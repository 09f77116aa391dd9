import fc from 'fast-check'
import {
  conditionOf,
  decompose,
  estimateModel,
  factorModel,
  inOneGo,
  returnsModel,
  shrinkageOf,
  type Estimator,
  type RiskModel,
} from '../../src/core'
import { openBlock } from '../../src/core/kernel/block'
import { relativeGap } from '../closeness'
import { textbookLagged, textbookShrinkage } from '../textbook'

// Invariants of every estimator. Bounds on rounding are multiples of the sum of stand-alone risks, squared for variances.

/** In steps of 1e-12, as returns in a workbook at their finest. */
const real = (largest: number) =>
  fc.double({ min: -largest, max: largest, noNaN: true }).map((x) => Math.round(x * 1e12) / 1e12)

const estimators: fc.Arbitrary<Estimator> = fc.oneof(
  fc.constant<Estimator>({ kind: 'sample' }),
  fc.constant<Estimator>({ kind: 'population' }),
  fc
    .double({ min: 0.5, max: 0.999, noNaN: true })
    .map((decay): Estimator => ({ kind: 'exponential', decay })),
  fc
    .constantFrom('identity', 'correlation', 'oas')
    .map((target): Estimator => ({ kind: 'shrinkage', target })),
  fc.integer({ min: 1, max: 10 }).map((lags): Estimator => ({ kind: 'lagged', lags })),
)

/** Any size from 1 position and 2 dates, more positions than dates included; some columns may never change, if asked for. */
const blocks = (riskless: number) =>
  fc
    .record({ size: fc.integer({ min: 1, max: 9 }), dates: fc.integer({ min: 2, max: 17 }) })
    .chain(({ size, dates }) =>
      fc.record({
        size: fc.constant(size),
        dates: fc.constant(dates),
        returns: fc.array(real(0.3), { minLength: size * dates, maxLength: size * dates }),
        weights: fc.array(real(2), { minLength: size, maxLength: size }),
        riskless: fc.array(fc.nat(size - 1), { maxLength: riskless }),
      }),
    )
    .map(({ size, dates, returns, weights, riskless }) => {
      const values = Float64Array.from(returns)
      for (const i of riskless) for (let t = 1; t < dates; t++) values[t * size + i] = values[i]!
      return {
        size,
        dates,
        returns: values,
        weights: Float64Array.from(weights),
        rows: Array.from({ length: dates }, (_, t) => Array.from(values.subarray(t * size, (t + 1) * size))),
      }
    })

const block = blocks(2)

const estimated = fc
  .tuple(block, estimators)
  .filter(([{ dates }, estimator]) => estimator.kind !== 'lagged' || estimator.lags < dates)
  .map(([b, estimator]) => ({ ...b, estimator, model: estimateModel(b.returns, b.dates, b.size, estimator) }))

const grossOf = (model: RiskModel, weights: Float64Array) =>
  model.variances().reduce((sum, variance, i) => sum + Math.abs(weights[i]!) * Math.sqrt(variance), 0)

describe('the operator of any estimator', () => {
  test('is its own matrix (definition)', () => {
    fc.assert(
      fc.property(estimated, ({ model, size, weights }) => {
        const matrix = model.matrix()
        const { marginals, variance } = model.apply(weights)
        const gross = grossOf(model, weights)
        const deviations = model.variances().map(Math.sqrt)
        let expected = 0
        for (let i = 0; i < size; i++) {
          let sum = 0
          for (let j = 0; j < size; j++) sum += matrix[i * size + j]! * weights[j]!
          expected += weights[i]! * sum
          expect(Math.abs(marginals[i]! - sum)).toBeLessThanOrEqual(1e-13 * gross * deviations[i]! + 1e-300)
        }
        expect(Math.abs(variance - expected)).toBeLessThanOrEqual(1e-13 * gross * gross + 1e-300)
      }),
    )
  })

  test('is positive semidefinite: no weights have a negative variance, no eigenvalue lies below rounding', () => {
    fc.assert(
      fc.property(estimated, ({ model, weights }) => {
        expect(model.apply(weights).variance).toBeGreaterThanOrEqual(0)
        expect(inOneGo(conditionOf(model)).smallest).toBeGreaterThanOrEqual(0)
      }),
    )
  })

  test('leaves columns that never change riskless, and decomposes without a fault', () => {
    fc.assert(
      fc.property(estimated, ({ model, size, dates, returns, weights }) => {
        const plain = returnsModel(returns, dates, size).variances()
        const variances = model.variances()
        const d = decompose(model, weights)
        plain.forEach((variance, i) => {
          if (variance !== 0) return
          expect(variances[i]).toBe(0)
          expect(Math.abs(d.contribution[i]!)).toBe(0)
        })
        expect(Math.abs(d.difference)).toBeLessThanOrEqual(1e-12 * grossOf(model, weights))
      }),
    )
  })

  test('does not see that the block rides on a constant: means are taken off (definition)', () => {
    fc.assert(
      fc.property(estimated, ({ model, estimator, size, dates, returns, weights }) => {
        // a power of two above the returns costs a few of their digits, no more
        const lifted = estimateModel(
          returns.map((r) => r + 0.5),
          dates,
          size,
          estimator,
          model.shrinkage ?? undefined,
        )
        const gap = Math.abs(lifted.apply(weights).variance - model.apply(weights).variance)
        const scale = weights.reduce((sum, w) => sum + Math.abs(w), 0)
        expect(gap).toBeLessThanOrEqual(1e-14 * scale * scale)
      }),
    )
  })
})

describe('shrinkage', () => {
  const targets = fc.constantFrom('identity' as const, 'correlation' as const, 'oas' as const)
  const moving = blocks(0).filter(({ rows, size }) =>
    Array.from({ length: size }, (_, i) => rows.map((row) => row[i]!)).every(
      (column) => Math.max(...column) - Math.min(...column) > 1e-3,
    ),
  )

  test('of intensity 0 is the model with divisor T, of intensity 1 the target (definition)', () => {
    fc.assert(
      fc.property(moving, targets, ({ size, dates, returns, rows, weights }, target) => {
        const { shrinkage } = estimateModel(returns, dates, size, { kind: 'shrinkage', target })
        const at = (intensity: number) =>
          estimateModel(returns, dates, size, { kind: 'shrinkage', target }, { ...shrinkage!, intensity })
        const population = returnsModel(returns, dates, size, { kind: 'population' })
        expect(at(0).apply(weights)).toEqual(population.apply(weights))
        if (size > 1) {
          expect(relativeGap(at(1).matrix(), textbookShrinkage(rows, target).F.flat())).toBeLessThan(1e-12)
        }
      }),
    )
  })

  test('has the intensity of the double loops, and none depends on the unit or the order of positions', () => {
    fc.assert(
      fc.property(moving, targets, fc.double({ min: 0.01, max: 100, noNaN: true }), (b, target, unit) => {
        fc.pre(b.size > 1)
        const { size, dates, returns, rows } = b
        const of = (values: readonly (readonly number[])[]) =>
          estimateModel(Float64Array.from(values.flat()), dates, size, { kind: 'shrinkage', target })
            .shrinkage!
        const { S, F, intensity } = textbookShrinkage(rows, target)
        // where S is nearly its target the quotient is one of small differences
        const near = relativeGap(S.flat(), F.flat())
        fc.pre(near > 1e-3)
        const own = estimateModel(returns, dates, size, { kind: 'shrinkage', target }).shrinkage!
        expect(Math.abs(own.intensity - intensity)).toBeLessThan(1e-9)
        expect(Math.abs(of(rows.map((row) => row.map((x) => x * unit))).intensity - intensity)).toBeLessThan(
          1e-9,
        )
        expect(Math.abs(of(rows.map((row) => [...row].reverse())).intensity - intensity)).toBeLessThan(1e-9)
      }),
    )
  })
})

describe('the products of rows in the kernel', () => {
  test('are the same bits in both forms, and those of the definition to rounding', () => {
    fc.assert(
      fc.property(block, ({ rows, dates, size }) => {
        const [simd, plain] = (['simd', 'plain'] as const).map((form) => {
          const opened = openBlock(dates, size, form)
          expect(opened.form).toBe(form)
          rows.forEach((row, t) => opened.write(t, Float64Array.from(row), 7))
          return opened
        })
        for (let first = 0; 4 * first < dates; first++) {
          for (let second = 0; 4 * second < dates; second++) {
            const products = simd!.products(first, second)
            expect(plain!.products(first, second)).toEqual(products)
            products.forEach((product, k) => {
              const [a, b] = [rows[4 * first + (k >> 2)] ?? [], rows[4 * second + (k & 3)] ?? []]
              const terms = a.map((x, i) => x * (b[i] ?? 0))
              const size = terms.reduce((sum, x) => sum + Math.abs(x), 0)
              expect(Math.abs(product - terms.reduce((sum, x) => sum + x, 0))).toBeLessThanOrEqual(
                4e-15 * size,
              )
            })
          }
        }
      }),
    )
  })

  test('give shrinkage the same intensity in both forms', () => {
    fc.assert(
      fc.property(block, ({ returns, dates, size }) => {
        const [simd, plain] = (['simd', 'plain'] as const).map((form) =>
          inOneGo(shrinkageOf(returnsModel(returns, dates, size, { kind: 'sample' }, form), 'correlation')),
        )
        expect(plain).toEqual(simd)
      }),
    )
  })
})

describe('lagged terms', () => {
  test('are those of the double loops', () => {
    fc.assert(
      fc.property(block, fc.integer({ min: 1, max: 10 }), ({ size, dates, returns, rows }, lags) => {
        fc.pre(lags < dates)
        const model = estimateModel(returns, dates, size, { kind: 'lagged', lags })
        // both are good to rounding of the plain volatilities, the definition's means only to rounding of the returns
        const level = returns.reduce((most, r) => Math.max(most, Math.abs(r)), 0)
        const deviations = model.returns.variances().map((variance) => Math.sqrt(variance) + 0.1 * level)
        const expected = textbookLagged(rows, lags).flat()
        model.matrix().forEach((c, k) => {
          const scale = deviations[Math.floor(k / size)]! * deviations[k % size]!
          expect(Math.abs(c - expected[k]!)).toBeLessThanOrEqual(1e-13 * scale)
        })
      }),
    )
  })

  test('are nothing where returns of neighbouring dates never meet: the model with divisor T', () => {
    fc.assert(
      fc.property(block, ({ size, dates, returns, weights }) => {
        // every date, a date of zeros, the date's reverse, a date of zeros: means and products at lag 1 are 0
        const spaced = new Float64Array(4 * dates * size)
        for (let t = 0; t < dates; t++) {
          for (let i = 0; i < size; i++) {
            const r = returns[t * size + i]!
            spaced[4 * t * size + i] = r
            spaced[(4 * t + 2) * size + i] = -r
          }
        }
        const lagged = estimateModel(spaced, 4 * dates, size, { kind: 'lagged', lags: 1 })
        const plain = lagged.returns.apply(weights)
        const gross = grossOf(lagged.returns, weights)
        const { variance } = lagged.apply(weights)
        expect(Math.abs(variance - plain.variance)).toBeLessThanOrEqual(1e-13 * gross * gross + 1e-300)
      }),
    )
  })
})

describe('a factor model', () => {
  const explained = fc
    .record({
      size: fc.integer({ min: 1, max: 6 }),
      k: fc.integer({ min: 1, max: 3 }),
      over: fc.integer({ min: 2, max: 20 }),
    })
    .chain(({ size, k, over }) => {
      const dates = k + over
      return fc.record({
        size: fc.constant(size),
        k: fc.constant(k),
        dates: fc.constant(dates),
        returns: fc.array(real(0.3), { minLength: size * dates, maxLength: size * dates }),
        factors: fc.array(real(0.3), { minLength: k * dates, maxLength: k * dates }),
        weights: fc.array(real(2), { minLength: size, maxLength: size }),
      })
    })
    .map((b) => ({
      ...b,
      returns: Float64Array.from(b.returns),
      factors: Float64Array.from(b.factors),
      weights: Float64Array.from(b.weights),
    }))
    // factors worth the name: far enough from following from each other
    .filter(({ factors, dates, k }) => {
      const { rank, condition } = inOneGo(conditionOf(returnsModel(factors, dates, k)))
      return rank === k && condition! < 1e4
    })

  test('leaves residuals that have nothing to do with the factors, and explained variance in its bounds', () => {
    fc.assert(
      fc.property(explained, ({ size, k, dates, returns, factors }) => {
        const model = factorModel(returns, dates, size, factors, k)
        for (let i = 0; i < size; i++) {
          const residuals = Float64Array.from({ length: dates }, (_, t) => {
            let e = returns[t * size + i]! - model.intercepts[i]!
            for (let j = 0; j < k; j++) e -= model.exposures[i * k + j]! * factors[t * k + j]!
            return e
          })
          expect(Math.abs(residuals.reduce((a, e) => a + e, 0))).toBeLessThan(1e-10)
          for (let j = 0; j < k; j++) {
            expect(Math.abs(residuals.reduce((a, e, t) => a + e * factors[t * k + j]!, 0))).toBeLessThan(
              1e-10,
            )
          }
          const r = model.rSquared[i]!
          if (!Number.isNaN(r)) {
            expect(r).toBeGreaterThanOrEqual(-1e-12)
            expect(r).toBeLessThanOrEqual(1)
          }
        }
      }),
    )
  })

  test('is its own matrix, and splits the volatility into parts that add up (Tasche 2008)', () => {
    fc.assert(
      fc.property(explained, ({ size, k, dates, returns, factors, weights }) => {
        const model = factorModel(returns, dates, size, factors, k)
        const matrix = model.matrix()
        const { variance } = model.apply(weights)
        const gross = grossOf(model, weights)
        let expected = 0
        for (let i = 0; i < size; i++)
          for (let j = 0; j < size; j++) expected += weights[i]! * matrix[i * size + j]! * weights[j]!
        expect(Math.abs(variance - expected)).toBeLessThanOrEqual(1e-13 * gross * gross + 1e-300)
        const split = model.split(weights)
        const parts = [...split.systematic, ...split.specific].reduce((a, x) => a + x, 0)
        expect(Math.abs(parts - split.volatility)).toBeLessThanOrEqual(1e-10 * gross)
      }),
    )
  })
})
