import fc from 'fast-check'
import {
  annualise,
  correlation,
  covariance,
  decompose,
  groupDecomposition,
  matrixModel,
  returnsModel,
  type RiskModel,
} from '../../src/core'
import { openBlock } from '../../src/core/kernel/block'
import { absoluteGap, relativeGap } from '../closeness'
import { textbookCovariance, textbookDecomposition } from '../textbook'

// Invariants of a risk decomposition. The source is beside each; a bound on rounding, where no source gives one, is
// stated as multiples of the sum of stand-alone risks, which is what the digits of a hedged book are lost to.

/**
 * In steps of 1e-12: finer than any return or weight in a workbook. Numbers whose squares are no longer ordinary
 * doubles are left to the test of the kernel.
 */
const real = (largest: number) =>
  fc.double({ min: -largest, max: largest, noNaN: true }).map((x) => Math.round(x * 1e12) / 1e12)

/** A block of returns with weights: any size from 1 position and 2 dates, shorts and leverage included. */
const book = fc
  .record({ size: fc.integer({ min: 1, max: 13 }), dates: fc.integer({ min: 2, max: 23 }) })
  .chain(({ size, dates }) =>
    fc.record({
      size: fc.constant(size),
      dates: fc.constant(dates),
      returns: fc.array(real(0.3), { minLength: size * dates, maxLength: size * dates }),
      weights: fc.array(real(2), { minLength: size, maxLength: size }),
      decay: fc.option(fc.double({ min: 0.5, max: 0.999, noNaN: true }), { nil: undefined }),
    }),
  )
  .map(({ size, dates, returns, weights, decay }) => ({
    size,
    dates,
    weights: Float64Array.from(weights),
    returns: Float64Array.from(returns),
    rows: Array.from({ length: dates }, (_, t) => returns.slice(t * size, (t + 1) * size)),
    decay,
    model: returnsModel(
      Float64Array.from(returns),
      dates,
      size,
      decay === undefined ? { kind: 'sample' } : { kind: 'exponential', decay },
    ),
  }))

/** Books with risk worth splitting: a total that is not rounding beside the sum of its parts. */
const risky = book
  .map((b) => ({ ...b, d: decompose(b.model, b.weights) }))
  .map((b) => ({ ...b, gross: b.d.standAlone.reduce((a, x) => a + x, 0) }))
  .filter(({ d, gross }) => gross > 1e-9 && d.volatility > 1e-4 * gross)

const sum = (values: Float64Array) => values.reduce((a, x) => a + x, 0)

describe('the decomposition of any book', () => {
  test('contributions add up to the volatility (Tasche 2008; Litterman 1996)', () => {
    fc.assert(
      fc.property(risky, ({ d, gross }) => {
        expect(Math.abs(sum(d.contribution) - d.volatility)).toBeLessThanOrEqual(1e-14 * gross)
        // the bound of the literature, for books that are not almost perfectly hedged
        if (d.volatility > 0.01 * gross)
          expect(Math.abs(d.difference)).toBeLessThanOrEqual(1e-12 * d.volatility)
        expect(sum(d.share!)).toBeCloseTo(1, 9)
      }),
    )
  })

  test('agrees with the textbook form that forms the matrix (Maillard, Roncalli & Teiletche 2010)', () => {
    fc.assert(
      fc.property(risky, ({ d, gross, rows, decay, weights }) => {
        const expected = textbookDecomposition(textbookCovariance(rows, decay), Array.from(weights))
        // the matrix form loses the square of what hedging cancels
        const tolerance = 1e-13 * (gross / d.volatility) ** 2
        expect(relativeGap(d.volatility, expected.volatility)).toBeLessThanOrEqual(tolerance)
        expect(relativeGap(d.contribution, expected.contribution)).toBeLessThanOrEqual(tolerance)
        expect(relativeGap(d.standAlone, expected.standAlone)).toBeLessThanOrEqual(1e-12)
      }),
    )
  })

  test('scaling the weights scales risk and contributions, not shares, marginals or betas (Tasche 2008)', () => {
    fc.assert(
      fc.property(
        risky,
        fc.double({ min: 0.01, max: 50, noNaN: true }),
        ({ model, weights, d, gross }, c) => {
          const scaled = decompose(
            model,
            weights.map((w) => w * c),
          )
          const tolerance = (1e-13 * gross) / d.volatility
          expect(relativeGap(scaled.volatility, d.volatility * c)).toBeLessThanOrEqual(tolerance)
          expect(
            relativeGap(
              scaled.contribution,
              d.contribution.map((x) => x * c),
            ),
          ).toBeLessThanOrEqual(tolerance)
          expect(relativeGap(scaled.share!, d.share!)).toBeLessThanOrEqual(tolerance)
          expect(relativeGap(scaled.marginal!, d.marginal!)).toBeLessThanOrEqual(tolerance)
        },
      ),
    )
  })

  test('the marginal contribution is the slope of risk (definition; central difference, relative error 1e-6)', () => {
    const clearlyRisky = risky.filter(({ d, gross }) => d.volatility > 0.1 * gross)
    fc.assert(
      fc.property(clearlyRisky, fc.nat(), ({ model, weights, d, size }, pick) => {
        const i = pick % size
        const deviation = Math.sqrt(model.variances()[i]!)
        fc.pre(deviation > 0)
        // a step whose own risk is a hundred-thousandth of the total: truncation and rounding both below 1e-9
        const step = (1e-5 * d.volatility) / deviation
        const at = (change: number) =>
          decompose(
            model,
            weights.map((w, j) => (j === i ? w + change : w)),
          ).volatility
        const slope = (at(step) - at(-step)) / (2 * step)
        expect(Math.abs(slope - d.marginal![i]!)).toBeLessThanOrEqual(1e-6 * deviation)
      }),
    )
  })

  test('marginal = volatility x correlation with the portfolio, and no larger (Menchero & Davis 2011)', () => {
    fc.assert(
      fc.property(risky, ({ model, d }) => {
        model.variances().forEach((variance, i) => {
          if (variance === 0) return expect(d.correlation![i]).toBeNaN()
          const deviation = Math.sqrt(variance)
          expect(Math.abs(d.marginal![i]! - deviation * d.correlation![i]!)).toBeLessThanOrEqual(
            1e-15 * deviation,
          )
          expect(Math.abs(d.marginal![i]!)).toBeLessThanOrEqual(deviation * (1 + 1e-12))
        })
      }),
    )
  })

  test('share = weight x beta, and weighted betas add up to 1 (Qian 2006; Maillard et al. 2010)', () => {
    fc.assert(
      fc.property(risky, ({ weights, d }) => {
        const products = weights.map((w, i) => w * d.beta![i]!)
        expect(relativeGap(products, d.share!)).toBeLessThanOrEqual(1e-14)
        expect(sum(products)).toBeCloseTo(1, 9)
      }),
    )
  })

  test('a contribution is at most the stand-alone risk, at least the risk lost by removal (Tasche 2008)', () => {
    fc.assert(
      fc.property(risky, fc.nat(), ({ model, weights, d, size, gross }, pick) => {
        const i = pick % size
        const without = decompose(
          model,
          weights.map((w, j) => (j === i ? 0 : w)),
        )
        const rounding = 1e-12 * gross
        expect(d.contribution[i]!).toBeLessThanOrEqual(d.standAlone[i]! + rounding)
        expect(d.volatility - without.volatility).toBeLessThanOrEqual(d.contribution[i]! + rounding)
      }),
    )
  })

  test('contributions of groups are those of their members, in any nesting (Coleman & Litterman 2012)', () => {
    fc.assert(
      fc.property(
        risky,
        fc.array(fc.nat(3), { minLength: 13, maxLength: 13 }),
        ({ model, d, size, gross }, labels) => {
          const fine = Int32Array.from(labels.slice(0, size))
          const coarse = fine.map((label) => label >> 1)
          const inner = groupDecomposition(model, d, fine, 4)
          const outer = groupDecomposition(model, d, coarse, 2)
          for (const k of [0, 1]) {
            const members = inner.contribution[2 * k]! + inner.contribution[2 * k + 1]!
            expect(Math.abs(outer.contribution[k]! - members)).toBeLessThanOrEqual(1e-14 * gross)
            const bound = inner.standAlone[2 * k]! + inner.standAlone[2 * k + 1]!
            expect(outer.standAlone[k]!).toBeLessThanOrEqual(bound + 1e-12 * gross)
          }
          expect(Math.abs(sum(outer.contribution) - d.volatility)).toBeLessThanOrEqual(1e-13 * gross)
        },
      ),
    )
  })

  test('reordering positions reorders the figures; splitting one in halves leaves totals alone (property)', () => {
    fc.assert(
      fc.property(risky, ({ rows, weights, d, size, dates, model, gross }) => {
        const order = Array.from({ length: size }, (_, i) => (i * 5 + 3) % size)
        fc.pre(new Set(order).size === size)
        const reordered = decompose(
          returnsModel(
            Float64Array.from(rows.flatMap((row) => order.map((i) => row[i]!))),
            dates,
            size,
            model.weighting,
          ),
          Float64Array.from(order, (i) => weights[i]!),
        )
        const tolerance = 1e-13 * (gross / d.volatility)
        expect(relativeGap(reordered.volatility, d.volatility)).toBeLessThanOrEqual(tolerance)
        const moved = order.map((i) => d.contribution[i]!)
        expect(relativeGap(reordered.contribution, moved)).toBeLessThanOrEqual(tolerance)

        const halved = decompose(
          returnsModel(
            Float64Array.from(rows.flatMap((row) => [...row, row[0]!])),
            dates,
            size + 1,
            model.weighting,
          ),
          Float64Array.of(weights[0]! / 2, ...weights.subarray(1), weights[0]! / 2),
        )
        expect(relativeGap(halved.volatility, d.volatility)).toBeLessThanOrEqual(tolerance)
        const rejoined = halved.contribution[0]! + halved.contribution[size]!
        expect(Math.abs(rejoined - d.contribution[0]!)).toBeLessThanOrEqual(1e-13 * gross)
      }),
    )
  })

  test('cash adds nothing, at any weight (Denault 2001)', () => {
    fc.assert(
      fc.property(risky, real(0.1), real(5), ({ rows, weights, d, size, dates, model }, rate, held) => {
        const withCash = decompose(
          returnsModel(
            Float64Array.from(rows.flatMap((row) => [...row, rate])),
            dates,
            size + 1,
            model.weighting,
          ),
          Float64Array.of(...weights, held),
        )
        expect(Math.abs(withCash.contribution[size]!)).toBe(0)
        expect(Math.abs(withCash.marginal![size]!)).toBe(0)
        expect(relativeGap(withCash.volatility, d.volatility)).toBeLessThanOrEqual(1e-10)
      }),
    )
  })

  test('no weights at all is no risk, and nothing is NaN (definition)', () => {
    fc.assert(
      fc.property(book, ({ model, size }) => {
        const d = decompose(model, new Float64Array(size))
        expect([d.volatility, d.variance, d.diversificationBenefit]).toEqual([0, 0, 0])
        expect([d.share, d.beta, d.correlation, d.marginal]).toEqual([null, null, null, null])
        expect(Array.from(d.contribution)).toEqual(Array(size).fill(0))
      }),
    )
  })

  test('diversification ratio >= 1 and benefit >= 0 (triangle inequality)', () => {
    fc.assert(
      fc.property(risky, ({ d, gross }) => {
        expect(d.diversificationRatio!).toBeGreaterThanOrEqual(1 - 1e-12)
        expect(d.diversificationBenefit).toBeGreaterThanOrEqual(-1e-12 * gross)
      }),
    )
  })

  test('minimum variance of two positions: equal marginals, shares equal to weights (Maillard et al. 2010)', () => {
    const positive = fc.double({ min: 0.01, max: 1, noNaN: true })
    fc.assert(
      fc.property(positive, positive, fc.double({ min: -0.95, max: 0.95, noNaN: true }), (a, b, rho) => {
        const c = rho * a * b
        // closed form, weights summing to 1: proportional to (b^2 - c, a^2 - c)
        const total = a * a + b * b - 2 * c
        fc.pre(total > 1e-6)
        const weights = Float64Array.of((b * b - c) / total, (a * a - c) / total)
        const d = decompose(matrixModel(Float64Array.of(a * a, c, c, b * b), 2), weights)
        fc.pre(d.volatility > 1e-3 * Math.max(a, b))
        expect(d.marginal![0]).toBeCloseTo(d.marginal![1]!, 8)
        expect(relativeGap(d.share!, weights)).toBeLessThanOrEqual(1e-8)
      }),
    )
  })

  test('minimum variance <= equal contributions <= equal weights, for two positions (Maillard et al. 2010)', () => {
    const positive = fc.double({ min: 0.01, max: 1, noNaN: true })
    fc.assert(
      fc.property(positive, positive, fc.double({ min: -0.95, max: 0.95, noNaN: true }), (a, b, rho) => {
        const c = rho * a * b
        const model = matrixModel(Float64Array.of(a * a, c, c, b * b), 2)
        const risk = (first: number) => decompose(model, Float64Array.of(first, 1 - first)).volatility
        const total = a * a + b * b - 2 * c
        const minimum = risk(Math.min(1, Math.max(0, (b * b - c) / total)))
        const equalRisk = risk(b / (a + b))
        expect(minimum).toBeLessThanOrEqual(equalRisk * (1 + 1e-9))
        expect(equalRisk).toBeLessThanOrEqual(risk(0.5) * (1 + 1e-9))
      }),
    )
  })
})

describe('the two forms of the kernel', () => {
  /** Everything a form says of a book, for comparison to the last bit. */
  const answers = (model: RiskModel, weights: Float64Array) => ({
    ...model.apply(weights),
    variances: model.variances(),
    matrix: model.matrix(),
  })

  test('give the same bits, odd sizes and single positions included', () => {
    fc.assert(
      fc.property(book, ({ returns, dates, size, weights, model }) => {
        const plain = returnsModel(returns, dates, size, model.weighting, 'plain')
        expect([model.form, plain.form]).toEqual(['simd', 'plain'])
        expect(answers(model, weights)).toEqual(answers(plain, weights))
        expect(model.portfolioReturns(weights)).toEqual(plain.portfolioReturns(weights))
        expect(model.centredRow(dates - 1)).toEqual(plain.centredRow(dates - 1))
      }),
    )
  })

  test('give the same bits for numbers of any size: denormal, tiny, huge', () => {
    const anySize = fc.oneof(
      fc.double({ noNaN: true, noDefaultInfinity: true }),
      fc.double({ min: -1e-300, max: 1e-300, noNaN: true }),
      fc.constantFrom(0, -0, 5e-324, -5e-324, 2.2250738585072014e-308),
    )
    fc.assert(
      fc.property(
        fc.integer({ min: 1, max: 9 }),
        fc.integer({ min: 1, max: 9 }),
        fc.array(anySize, { minLength: 90, maxLength: 90 }),
        (size, dates, numbers) => {
          const [simd, plain] = (['simd', 'plain'] as const).map((form) => {
            const block = openBlock(dates, size, form)
            for (let t = 0; t < dates; t++) {
              block.write(t, Float64Array.from(numbers.slice(t * size, (t + 1) * size)), 1 / (t + 1))
            }
            return block
          })
          const weights = Float64Array.from(numbers.slice(81, 81 + size))
          expect(simd!.pass(weights)).toEqual(plain!.pass(weights))
          expect(simd!.portfolio(weights)).toEqual(plain!.portfolio(weights))
          expect(simd!.read(dates - 1)).toEqual(plain!.read(dates - 1))
          const q = Float64Array.from(numbers.slice(0, dates))
          const a = Float64Array.from(numbers.slice(81, 81 + dates))
          expect(simd!.weigh(a)).toEqual(plain!.weigh(a))
          expect(simd!.squares(q, a)).toEqual(plain!.squares(q, a))
        },
      ),
    )
  })

  test('sum over dates as a plain double loop does, whatever was asked before', () => {
    fc.assert(
      fc.property(book, fc.constantFrom('simd' as const, 'plain' as const), fc.nat(), (b, form, seed) => {
        const { returns, dates, size, weights, rows, model } = b
        const perDate = (salt: number) =>
          Float64Array.from({ length: dates }, (_, t) => Math.sin((t + 1) * (salt + (seed % 1000))))
        const q = perDate(1)
        const a = perDate(2)
        const sum = (i: number, term: (z: number, t: number) => number) =>
          rows.reduce((total, _, t) => total + term(model.centredRow(t)[i]!, t), 0)
        const positions = Array.from({ length: size }, (_, i) => i)
        const expectedSums = positions.map((i) => sum(i, (z, t) => a[t]! * z))
        const expectedSquares = positions.map((i) => sum(i, (z, t) => q[t]! * z * z))

        const asked = returnsModel(returns, dates, size, model.weighting, form)
        for (let turn = 0; turn < 2; turn++) {
          const { squares, sums } = asked.squares(q, a)
          // returns up to 0.3: sums of at most 23 terms, each good to a few 1e-17
          expect(absoluteGap(squares, expectedSquares)).toBeLessThan(1e-14)
          expect(absoluteGap(sums, expectedSums)).toBeLessThan(1e-14)
          expect(asked.weigh(a)).toEqual(sums)
          expect(asked.apply(weights)).toEqual(model.apply(weights))
        }
      }),
    )
  })

  test("take a date's own number for Cw: weigh(correction omega y) is C w (definition)", () => {
    fc.assert(
      fc.property(risky, ({ model, weights, gross }) => {
        const y = model.portfolioReturns(weights)
        const Cw = model.weigh(y.map((value, t) => value * model.rowWeights[t]! * model.correction))
        const { marginals } = model.apply(weights)
        expect(absoluteGap(Cw, marginals)).toBeLessThanOrEqual(1e-14 * gross)
      }),
    )
  })

  test('take one row (T = 1), which the model above them refuses', () => {
    for (const form of ['simd', 'plain'] as const) {
      const block = openBlock(1, 3, form)
      block.write(0, Float64Array.of(1, 2, 3), 0.5)
      // y = 1 - 2 + 6 = 5: v = 12.5, g = 2.5 z
      expect(block.pass(Float64Array.of(1, -1, 2))).toEqual({
        variance: 12.5,
        marginals: Float64Array.of(2.5, 5, 7.5),
      })
      expect(block.portfolio(Float64Array.of(1, -1, 2))).toEqual(Float64Array.of(5))
      expect(block.weigh(Float64Array.of(3))).toEqual(Float64Array.of(3, 6, 9))
      expect(block.squares(Float64Array.of(2), Float64Array.of(-1))).toEqual({
        squares: Float64Array.of(2, 8, 18),
        sums: Float64Array.of(-1, -2, -3),
      })
    }
  })
})

describe('a model and its own matrix', () => {
  test('decompose alike (definition)', () => {
    fc.assert(
      fc.property(risky, ({ model, size, weights, d, gross }) => {
        const again = decompose(matrixModel(covariance(model), size), weights)
        const tolerance = 1e-12 * (gross / d.volatility) ** 2
        expect(relativeGap(again.volatility, d.volatility)).toBeLessThanOrEqual(tolerance)
        expect(relativeGap(again.contribution, d.contribution)).toBeLessThanOrEqual(tolerance)
      }),
    )
  })

  test('correlations lie in [-1, 1] and are symmetric (Cauchy-Schwarz)', () => {
    fc.assert(
      fc.property(book, ({ model, size }) => {
        const R = correlation(model)
        R.forEach((r, k) => {
          const mirrored = R[(k % size) * size + Math.floor(k / size)]!
          expect(Object.is(r, mirrored)).toBe(true)
          if (!Number.isNaN(r)) expect(Math.abs(r)).toBeLessThanOrEqual(1 + 1e-9)
        })
      }),
    )
  })
})

test('annualising any book keeps sums and shares (square root of time: common practice, no source)', () => {
  fc.assert(
    fc.property(risky, fc.integer({ min: 1, max: 400 }), ({ d, gross }, periods) => {
      const a = annualise(d, periods)
      expect(Math.abs(sum(a.contribution) - a.volatility)).toBeLessThanOrEqual(
        1e-13 * gross * Math.sqrt(periods),
      )
      expect(a.share).toEqual(d.share)
    }),
  )
})
