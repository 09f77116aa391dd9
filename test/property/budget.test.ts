import fc from 'fast-check'
import {
  decompose,
  Fault,
  inOneGo,
  leastRiskWeights,
  leastVariance,
  matrixModel,
  returnsModel,
  riskBudgetWeights,
  type RiskModel,
} from '../../src/core'
import { absoluteGap, relativeGap } from '../closeness'
import { cyclicalBudgetWeights } from '../cyclical-descent'
import { textbookCovariance } from '../textbook'

// Invariants of weights that are searched for. Bounds on rounding grow with how much of the stand-alone risks the weights hedge away:
// shares and gradients are differences of terms that large.

/** In steps of 1e-12, as returns in a workbook at their finest. */
const real = (largest: number) =>
  fc.double({ min: -largest, max: largest, noNaN: true }).map((x) => Math.round(x * 1e12) / 1e12)

interface Block {
  readonly size: number
  readonly dates: number
  readonly rows: number[][]
  readonly model: RiskModel
  readonly budgets: number[]
}

/** Any block of returns, more positions than dates included, of which every position moves, with budgets from 1 to 1e-4 of each other. */
const block: fc.Arbitrary<Block> = fc
  .record({
    size: fc.integer({ min: 1, max: 9 }),
    dates: fc.integer({ min: 2, max: 17 }),
    common: fc.boolean(),
  })
  .chain(({ size, dates, common }) =>
    fc.record({
      size: fc.constant(size),
      dates: fc.constant(dates),
      returns: fc.array(real(0.3), { minLength: size * dates, maxLength: size * dates }),
      market: fc.array(real(common ? 0.3 : 0), { minLength: dates, maxLength: dates }),
      exponents: fc.array(fc.double({ min: -4, max: 0, noNaN: true }), { minLength: size, maxLength: size }),
    }),
  )
  .map(({ size, dates, returns, market, exponents }) => {
    const values = Float64Array.from(returns, (r, k) => r + market[Math.floor(k / size)]!)
    const raw = exponents.map((e) => 10 ** e)
    const total = raw.reduce((a, b) => a + b, 0)
    return {
      size,
      dates,
      rows: Array.from({ length: dates }, (_, t) => Array.from(values.subarray(t * size, (t + 1) * size))),
      model: returnsModel(values, dates, size),
      budgets: raw.map((b) => b / total),
    }
  })
  .filter(({ model }) => model.variances().every((v) => v > 1e-9))

const equal = (n: number) => Array.from({ length: n }, () => 1 / n)
const budgeted = (model: RiskModel, budgets: readonly number[]) =>
  inOneGo(riskBudgetWeights(model, Float64Array.from(budgets)))
/** Stand-alone risks over risk. */
const hedging = (model: RiskModel, weights: Float64Array) =>
  decompose(model, weights).diversificationRatio ?? Infinity
/** Blocks whose long-only mixes keep at least a thousandth of their stand-alone risks. */
const solid = block
  .map((b) => ({ ...b, result: budgeted(b.model, b.budgets) }))
  .filter(({ model, result }) => hedging(model, result.weights) < 1e3)

describe('weights of any risk budgets', () => {
  test('have these shares of risk, are above 0 and add up to 1 (Bruder & Roncalli 2012, definition)', () => {
    fc.assert(
      fc.property(solid, ({ model, budgets, result }) => {
        expect(result.converged).toBe(true)
        const d = decompose(model, result.weights)
        expect(absoluteGap(d.share!, budgets)).toBeLessThanOrEqual(1e-10)
        expect(Math.min(...result.weights)).toBeGreaterThan(0)
        expect(result.weights.reduce((a, w) => a + w, 0)).toBeCloseTo(1, 14)
      }),
    )
  })

  test('or say that they do not, whatever the book', () => {
    fc.assert(
      fc.property(block, ({ model, budgets }) => {
        const { shares, residual, converged, stopped, weights, passes } = budgeted(model, budgets)
        expect(passes).toBeLessThanOrEqual(10_000)
        expect(converged).toBe(residual <= 1e-10)
        expect(stopped === null).toBe(converged)
        if (shares)
          expect(residual).toBe(
            absoluteGap(
              shares,
              budgets.map((b) => b / budgets.reduce((x, y) => x + y, 0)),
            ),
          )
        expect(weights.every((w) => w >= 0)).toBe(true)
        // less than 1e-7 of its stand-alone risks, as the bound says; less rounding of this second computation
        if (stopped === 'riskless-mix') expect(hedging(model, weights)).toBeGreaterThan(1e6)
      }),
    )
  })

  test('are those of cyclical coordinate descent (Griveau-Billion, Richard & Roncalli 2013)', () => {
    const mild = solid.filter(({ model, result }) => hedging(model, result.weights) < 10)
    fc.assert(
      fc.property(mild, ({ rows, budgets, result }) => {
        expect(
          absoluteGap(result.weights, cyclicalBudgetWeights(textbookCovariance(rows), budgets)),
        ).toBeLessThanOrEqual(1e-8)
      }),
    )
  })

  test('do not change with the scale of C, and go by inverse factors with the scale of one position (definition)', () => {
    fc.assert(
      fc.property(
        solid,
        fc.double({ min: 1e-3, max: 1e3, noNaN: true }),
        fc.nat(),
        ({ model, budgets, result, size }, factor, pick) => {
          const C = model.matrix()
          const tolerance = 1e-12 * hedging(model, result.weights) ** 2
          const whole = budgeted(
            matrixModel(
              C.map((c) => c * factor),
              size,
            ),
            budgets,
          )
          expect(absoluteGap(whole.weights, result.weights)).toBeLessThanOrEqual(tolerance + 1e-9)
          const k = pick % size
          const one = C.map((c, at) => {
            const times = (Math.floor(at / size) === k ? factor : 1) * (at % size === k ? factor : 1)
            return c * times
          })
          const expected = result.weights.map((w, i) => (i === k ? w / factor : w))
          const total = expected.reduce((a, w) => a + w, 0)
          expect(
            absoluteGap(
              budgeted(matrixModel(one, size), budgets).weights,
              expected.map((w) => w / total),
            ),
          ).toBeLessThanOrEqual(tolerance + 1e-9)
        },
      ),
    )
  })

  test('follow their positions into any other order (definition)', () => {
    fc.assert(
      fc.property(
        solid,
        fc.infiniteStream(fc.nat()),
        ({ rows, dates, size, budgets, model, result }, keys) => {
          const order = equal(size)
            .map((_, i) => [keys.next().value as number, i] as const)
            .sort(([a], [b]) => a - b)
            .map(([, i]) => i)
          const turned = returnsModel(
            Float64Array.from(rows.flatMap((row) => order.map((i) => row[i]!))),
            dates,
            size,
          )
          const { weights } = budgeted(
            turned,
            order.map((i) => budgets[i]!),
          )
          expect(
            absoluteGap(
              weights,
              order.map((i) => result.weights[i]!),
            ),
          ).toBeLessThanOrEqual(1e-9 + 1e-12 * hedging(model, result.weights) ** 2)
        },
      ),
    )
  })

  test('at equal budgets: least variance <= equal risk <= equal weights in volatility (Maillard, Roncalli & Teiletche 2010)', () => {
    fc.assert(
      fc.property(block, ({ model, size }) => {
        const risk = budgeted(model, equal(size))
        fc.pre(risk.converged)
        const volatility = (weights: Float64Array) => decompose(model, weights).volatility
        const least = inOneGo(
          leastVariance(model, {
            lower: new Float64Array(size),
            upper: new Float64Array(size).fill(1),
            sum: 1,
          }),
        )
        if (!least.feasible) throw new Error('a sum of 1 lies between 0 and 1 for each')
        const [a, b, c] = [least.weights, risk.weights, Float64Array.from(equal(size))].map(volatility)
        expect(a).toBeLessThanOrEqual(b! * (1 + 1e-9))
        expect(b).toBeLessThanOrEqual(c! * (1 + 1e-9))
      }),
    )
  })
})

/** Bounds of each kind, and a sum that lies within them or a little outside. */
const bounded = block.chain((b) =>
  fc
    .record({
      lower: fc.array(fc.oneof(fc.constant(0), real(1)), { minLength: b.size, maxLength: b.size }),
      room: fc.array(fc.oneof(fc.constant(0), real(1).map(Math.abs), fc.constant(1)), {
        minLength: b.size,
        maxLength: b.size,
      }),
      at: fc.oneof(fc.constant(0), fc.constant(1), fc.double({ min: -0.2, max: 1.2, noNaN: true })),
      riskless: fc.boolean(),
    })
    .map(({ lower, room, at, riskless }) => {
      const upper = lower.map((l, i) => l + room[i]!)
      const lowest = lower.reduce((x, y) => x + y, 0)
      const highest = upper.reduce((x, y) => x + y, 0)
      const C = b.model.matrix()
      // the last position may be cash
      if (riskless)
        for (let k = 0; k < b.size; k++) C[k * b.size + b.size - 1] = C[(b.size - 1) * b.size + k] = 0
      return {
        model: riskless ? matrixModel(C, b.size) : b.model,
        lower: Float64Array.from(lower),
        upper: Float64Array.from(upper),
        sum: at === 0 ? lowest : at === 1 ? highest : lowest + at * (highest - lowest),
        lowest,
        highest,
      }
    }),
)

/** The least g'v over bounds and sum, by filling the cheapest first (common practice, no source). */
function cheapest(
  g: Float64Array,
  { lower, upper, sum }: { lower: Float64Array; upper: Float64Array; sum: number },
) {
  let left = sum - lower.reduce((a, b) => a + b, 0)
  let total = lower.reduce((a, l, i) => a + g[i]! * l, 0)
  for (const i of Array.from(g.keys()).sort((a, b) => g[a]! - g[b]!)) {
    const taken = Math.max(0, Math.min(left, upper[i]! - lower[i]!))
    total += taken * g[i]!
    left -= taken
  }
  return total
}

describe('least variance within any bounds', () => {
  test("lies within them with the sum asked for, and no other weights there have less: (Cw)'(v - w) >= 0 for all v (convexity)", () => {
    fc.assert(
      fc.property(bounded, ({ model, lower, upper, sum, lowest, highest }) => {
        const result = inOneGo(leastVariance(model, { lower, upper, sum }))
        const slack = 1e-12 * (1 + Math.abs(lowest) + Math.abs(highest))
        if (!result.feasible) {
          expect([result.lowest, result.highest]).toEqual([lowest, highest])
          return expect(sum < lowest || sum > highest).toBe(true)
        }
        expect(sum >= lowest - slack && sum <= highest + slack).toBe(true)
        expect(result.converged).toBe(true)
        const { weights } = result
        weights.forEach((w, i) => expect(w >= lower[i]! && w <= upper[i]!).toBe(true))
        expect(Math.abs(weights.reduce((a, w) => a + w, 0) - sum)).toBeLessThanOrEqual(slack)
        const { marginals, variance } = model.apply(weights)
        expect(variance).toBe(result.variance)
        const standAlone = model
          .variances()
          .reduce((a, v, i) => a + Math.sqrt(v) * (Math.abs(weights[i]!) + upper[i]! - lower[i]!), 0)
        // beside rounding of the variance, that of the sum, at the price of the dearest position
        const dearest = Math.max(...marginals.map(Math.abs))
        expect(variance - cheapest(marginals, { lower, upper, sum })).toBeLessThanOrEqual(
          1e-12 * standAlone * standAlone + slack * dearest,
        )
      }),
    )
  })

  test('between bounds all have the marginal that is told, below it none at an upper one, above it none at a lower one (KKT)', () => {
    fc.assert(
      fc.property(bounded, ({ model, lower, upper, sum }) => {
        const result = inOneGo(leastVariance(model, { lower, upper, sum }))
        fc.pre(result.feasible)
        if (!result.feasible || lower.every((l, i) => l === upper[i])) return
        const { weights, at, multiplier } = result
        const { marginals } = model.apply(weights)
        const variances = model.variances()
        // a riskless position counts like the least volatile of the others
        const smallest = Math.min(...variances.filter((v) => v > 0))
        const gross = variances.reduce((a, v, i) => a + Math.sqrt(v || smallest) * Math.abs(weights[i]!), 0)
        const largest = Math.sqrt(Math.max(...variances))
        // the residual that counts as none, 1e-7, in units of the most volatile position
        const slack = 1e-7 * largest * Math.max(Math.sqrt(result.variance), 1e-5 * gross)
        // where no variance is left, no multiplier is told from 0
        fc.pre(result.variance > 1e-20 * gross * gross)
        weights.forEach((_, i) => {
          if (lower[i] === upper[i]) return
          if (at[i] === 0) expect(Math.abs(marginals[i]! - multiplier)).toBeLessThanOrEqual(slack)
          if (at[i] === -1) expect(marginals[i]! - multiplier).toBeGreaterThanOrEqual(-slack)
          if (at[i] === 1) expect(marginals[i]! - multiplier).toBeLessThanOrEqual(slack)
        })
      }),
    )
  })

  test('without bounds all marginals are equal, and shares of risk equal weights (Maillard, Roncalli & Teiletche 2010)', () => {
    fc.assert(
      fc.property(block, ({ model, size }) => {
        const none = {
          lower: new Float64Array(size).fill(-Infinity),
          upper: new Float64Array(size).fill(Infinity),
          sum: 1,
        }
        const result = inOneGo(leastVariance(model, none))
        if (!result.feasible) throw new Error('no bounds, no infeasibility')
        const d = decompose(model, result.weights)
        // two positions that are one but for rounding would be held in millions against each other
        fc.pre(d.share !== null && d.diversificationRatio! < 1e3)
        expect(result.converged).toBe(true)
        expect(relativeGap(d.share!, result.weights)).toBeLessThanOrEqual(
          1e-12 * d.diversificationRatio! ** 2,
        )
      }),
    )
  })
})

test('at its least-risk weight a position neither adds nor lowers risk, and every other weight of it gives more (definition)', () => {
  fc.assert(
    fc.property(block, fc.nat(), real(1), ({ model, budgets, size }, pick, change) => {
      const weights = Float64Array.from(budgets)
      const i = pick % size
      const least = leastRiskWeights(model, weights)[i]!
      const at = (w: number) => model.apply(weights.map((x, j) => (j === i ? w : x)))
      const variance = model.variances()[i]!
      // w'Cw is a parabola in w_i with the curvature C_ii
      const gross =
        model.variances().reduce((a, v, j) => a + Math.sqrt(v) * Math.abs(weights[j]!), 0) +
        Math.sqrt(variance) * (Math.abs(least) + 1)
      expect(
        Math.abs(at(least + change).variance - at(least).variance - variance * change * change),
      ).toBeLessThanOrEqual(1e-14 * gross * gross)
    }),
  )
})

test('what is thrown, for any numbers at all, is a Fault', () => {
  fc.assert(
    fc.property(
      fc.array(fc.double(), { minLength: 2, maxLength: 2 }),
      fc.array(fc.double(), { minLength: 5, maxLength: 5 }),
      (budgets, [l0, l1, u0, u1, sum]) => {
        const model = matrixModel(Float64Array.of(0.04, 0.01, 0.01, 0.09), 2)
        for (const run of [
          () => budgeted(model, budgets),
          () =>
            inOneGo(
              leastVariance(model, {
                lower: Float64Array.of(l0!, l1!),
                upper: Float64Array.of(u0!, u1!),
                sum: sum!,
              }),
            ),
        ]) {
          try {
            run()
          } catch (error) {
            expect(error).toBeInstanceOf(Fault)
          }
        }
      },
    ),
  )
})
