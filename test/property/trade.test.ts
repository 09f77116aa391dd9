import fc from 'fast-check'
import {
  courseOf,
  decompose,
  financed,
  firstOrder,
  impliedReturns,
  LEAST_NET_SHARE,
  loweringPairs,
  loweringTrades,
  matrixModel,
  covariance,
  removals,
  returnPerMarginal,
  returnsModel,
  turnover,
  type Financing,
  type RiskModel,
} from '../../src/core'
import { Fault } from '../../src/core'
import { absoluteGap } from '../closeness'

// Each figure in closed form against the plainest computation of it: move the weights, ask the model. Rounding is measured beside the sum of
// stand-alone risks of the weights at hand, which is what the digits of a hedged book are lost to.

/** Weights, changes and returns in steps, as people type them: exact hedges and equal positions come up. */
const real = (largest: number, steps = 1e6) =>
  fc.integer({ min: -largest * steps, max: largest * steps }).map((x) => x / steps)

const returnsOf = (size: number, dates: number) =>
  fc.oneof(
    fc.array(real(0.3), { minLength: size * dates, maxLength: size * dates }),
    // twins and riskless positions: every position one of three series, the last of them constant
    fc
      .tuple(
        fc.array(real(0.3), { minLength: 2 * dates, maxLength: 2 * dates }),
        fc.array(fc.integer({ min: 0, max: 2 }), { minLength: size, maxLength: size }),
      )
      .map(([series, kinds]) =>
        Array.from({ length: dates }, (_, t) =>
          kinds.map((kind) => (kind === 2 ? 0.01 : series[2 * t + kind]!)),
        ).flat(),
      ),
  )

const book = fc
  .record({
    size: fc.integer({ min: 1, max: 9 }),
    dates: fc.integer({ min: 2, max: 19 }),
    asMatrix: fc.boolean(),
  })
  .chain(({ size, dates, asMatrix }) =>
    fc.record({
      size: fc.constant(size),
      asMatrix: fc.constant(asMatrix),
      returns: returnsOf(size, dates),
      weights: fc.array(fc.oneof(real(2), real(1, 4)), { minLength: size, maxLength: size }),
      changes: fc.array(fc.oneof(real(1), real(1, 4)), { minLength: size, maxLength: size }),
      dates: fc.constant(dates),
    }),
  )
  .map(({ size, dates, asMatrix, returns, weights, changes }) => {
    const model = returnsModel(Float64Array.from(returns), dates, size)
    return {
      size,
      model: asMatrix ? matrixModel(covariance(model), size) : model,
      weights: Float64Array.from(weights),
      changes: Float64Array.from(changes),
    }
  })

const sum = (values: ArrayLike<number>) => Array.from(values).reduce((a, x) => a + x, 0)
const at = (weights: Float64Array, direction: Float64Array, t: number) =>
  weights.map((weight, i) => weight + t * direction[i]!)
const grossOf = (model: RiskModel, weights: Float64Array) => {
  const variances = model.variances()
  return sum(weights.map((weight, i) => Math.abs(weight) * Math.sqrt(variances[i]!)))
}
/** What a volatility by closed form may be off: 1e-12 of it, or what the model itself cannot tell from 0. */
const slack = (model: RiskModel, volatility: number, gross: number) => {
  const untold = 3 * Math.sqrt(model.rounding) * gross
  // the same error of the variance is smaller in a volatility well above it
  // the last digits of the weights themselves, then what the model cannot tell from 0:
  return (
    1e-12 * volatility +
    1e-15 * gross +
    (volatility > untold ? (3 * model.rounding * gross ** 2) / volatility : untold)
  )
}
const volatilityOf = (model: RiskModel, weights: Float64Array) => decompose(model, weights).volatility

const somewhere = real(3)

describe('a course', () => {
  test('has at any t the volatility of the weights there (definition)', () => {
    fc.assert(
      fc.property(book, somewhere, ({ model, weights, changes }, t) => {
        const course = courseOf(model, weights, changes)
        const expected = volatilityOf(model, at(weights, changes, t))
        const gross = grossOf(model, weights) + Math.abs(t) * grossOf(model, changes)
        expect(absoluteGap(course.volatilityAt(t), expected)).toBeLessThanOrEqual(
          slack(model, expected, gross),
        )
      }),
    )
  })

  test('has nowhere less risk than at its least', () => {
    fc.assert(
      fc.property(book, somewhere, ({ model, weights, changes }, t) => {
        const { leastAt } = courseOf(model, weights, changes)
        const gross = grossOf(model, weights) + Math.abs(t) * grossOf(model, changes)
        const there = volatilityOf(model, at(weights, changes, t))
        const least = leastAt === null ? there : volatilityOf(model, at(weights, changes, leastAt))
        const today = volatilityOf(model, weights)
        const rounding = 1e-12 * today + 3 * Math.sqrt(model.rounding) * gross
        expect(least).toBeLessThanOrEqual(there + rounding)
        if (leastAt === null) expect(Math.abs(there - today)).toBeLessThanOrEqual(rounding * 10)
      }),
    )
  })

  test('gives a set of positions the share it has at the weights there (definition)', () => {
    fc.assert(
      fc.property(book, somewhere, fc.nat(), ({ model, weights, changes, size }, t, pick) => {
        const members = Array.from({ length: size }, (_, i) => i).filter((i) => (pick >> i) & 1)
        const d = decompose(model, at(weights, changes, t))
        const gross = grossOf(model, weights) + Math.abs(t) * grossOf(model, changes)
        fc.pre(d.volatility > 1e-3 * gross)
        const course = courseOf(model, weights, changes)
        const share = sum(members.map((i) => d.share![i]!))
        const tolerance = 1e-14 * (gross / d.volatility) ** 2 * size
        expect(absoluteGap(course.shareAt(members, t)!, share)).toBeLessThanOrEqual(tolerance)
        expect(absoluteGap(course.contributionAt(members, t), share * d.volatility)).toBeLessThanOrEqual(
          tolerance * d.volatility,
        )
      }),
    )
  })

  test('finds every t at which a set reaches a share: those it gives have it, and no crossing is missed', () => {
    fc.assert(
      fc.property(book, real(1.5, 1e3), fc.nat(), ({ model, weights, changes, size }, share, pick) => {
        const members = Array.from({ length: size }, (_, i) => i).filter((i) => (pick >> i) & 1)
        const course = courseOf(model, weights, changes)
        const reach = course.sharesReach(members, share)
        const shareOf = (t: number) => {
          const d = decompose(model, at(weights, changes, t))
          const gross = grossOf(model, at(weights, changes, t))
          if (!d.share) return { share: null, error: 0 }
          return {
            share: sum(members.map((i) => d.share![i]!)) - share,
            error: 1e-10 * Math.max(1, gross / d.volatility) * (1 + Math.abs(share)),
          }
        }
        for (const t of reach.at) {
          const there = shareOf(t)
          expect(Math.abs(there.share!)).toBeLessThanOrEqual(there.error)
        }
        if (reach.everywhere) {
          expect(reach.at).toEqual([])
          const there = shareOf(0.3)
          const gross = grossOf(model, at(weights, changes, 0.3))
          const s = volatilityOf(model, at(weights, changes, 0.3))
          if (there.share !== null && s > 1e-3 * gross)
            expect(Math.abs(there.share)).toBeLessThanOrEqual(there.error)
          return
        }
        // a change of sign between two points of a grid, well beyond rounding, has a root between them
        let before: number | null = null
        for (let k = -60; k <= 60; k++) {
          const t = k / 20 + 0.00123
          const { share: missed, error } = shareOf(t)
          if (missed === null || Math.abs(missed) <= 1e3 * error) before = null
          else {
            if (before !== null && before * missed < 0) {
              const found = reach.at.some((root) => root >= t - 0.05 && root <= t)
              // or the share jumps where risk vanishes between the two
              const vanishes =
                course.leastAt !== null &&
                course.leastAt > t - 0.05 &&
                course.leastAt < t &&
                course.volatilityAt(course.leastAt) <
                  1e-6 * grossOf(model, at(weights, changes, course.leastAt))
              expect(found || vanishes).toBe(true)
            }
            before = missed
          }
        }
      }),
    )
  })

  test('finds the t at which a volatility is reached, on both sides of the least', () => {
    fc.assert(
      fc.property(book, somewhere, ({ model, weights, changes }, t) => {
        const course = courseOf(model, weights, changes)
        const wanted = volatilityOf(model, at(weights, changes, t))
        const { at: found, everywhere } = course.volatilityReach(wanted)
        const grossDirection = grossOf(model, changes)
        const gross = grossOf(model, weights) + Math.abs(t) * grossDirection
        fc.pre(wanted > 1e-5 * gross)
        if (course.leastAt === null) {
          expect(everywhere || found.length === 0).toBe(true)
          return
        }
        for (const root of found) {
          const there = volatilityOf(model, at(weights, changes, root))
          const size = grossOf(model, at(weights, changes, root))
          expect(Math.abs(there - wanted)).toBeLessThanOrEqual(
            1e-10 * wanted + 3 * Math.sqrt(model.rounding) * size,
          )
        }
        // at the least itself a root is known to half the digits
        const slope = Math.sqrt(decompose(model, changes).variance)
        fc.pre(slope > 1e-5 * grossDirection)
        const near = found.some((root) => Math.abs(root - t) <= (1e-6 * gross) / slope)
        expect(near).toBe(true)
        expect(found.length).toBeLessThanOrEqual(2)
        const below = course.volatilityAt(course.leastAt) * (1 - 1e-9)
        // relative rounding of a variance is that of the terms it is left of
        fc.pre(below > 0.05 * (grossOf(model, weights) + Math.abs(course.leastAt) * grossDirection))
        expect(course.volatilityReach(below).at).toEqual([])
      }),
    )
  })
})

const financingOf = (kind: number, position: number): Financing =>
  kind === 0 ? { kind: 'cash' } : kind === 1 ? { kind: 'pro rata' } : { kind: 'position', position }

/** One unit of a position with its financing, or null where that is refused. */
function directionOf(weights: Float64Array, i: number, financing: Financing): Float64Array | null {
  const unit = new Float64Array(weights.length)
  unit[i] = 1
  try {
    return financed(weights, unit, financing).changes
  } catch (error) {
    if (error instanceof Fault) return null
    throw error
  }
}

const withFinancing = fc
  .tuple(book, fc.integer({ min: 0, max: 2 }), fc.nat())
  .map(([b, kind, pick]) => ({ ...b, financing: financingOf(kind, pick % b.size) }))

describe('financing', () => {
  test('adds up to nothing but with cash, leaves what was wanted alone and keeps the rest in proportion (definition)', () => {
    fc.assert(
      fc.property(withFinancing, fc.nat(), ({ weights, changes, financing, size }, pick) => {
        const wanted = changes.map((change, i) =>
          ((pick >> i) & 1) === 1 || (financing.kind === 'position' && i === financing.position) ? 0 : change,
        )
        const rest = Array.from(weights.keys()).filter((i) => wanted[i] === 0)
        const net = sum(rest.map((i) => weights[i]!))
        const gross = sum(rest.map((i) => Math.abs(weights[i]!)))
        const moved = sum(wanted.map(Math.abs))
        let result
        try {
          result = financed(weights, wanted, financing)
        } catch (error) {
          expect(error).toBeInstanceOf(Fault)
          expect(financing.kind).toBe('pro rata')
          expect(gross === 0 || Math.abs(net) < LEAST_NET_SHARE * gross * (1 + 1e-12)).toBe(true)
          return
        }
        const all = result.changes
        const scale = moved * (1 + gross / Math.max(Math.abs(net), LEAST_NET_SHARE * gross || 1))
        expect(Math.abs(sum(all) + result.cash)).toBeLessThanOrEqual(1e-14 * size * scale)
        if (financing.kind !== 'cash') expect(result.cash).toBe(0)
        wanted.forEach((change, i) => {
          if (change !== 0) expect(all[i]).toBe(change)
        })
        for (const i of rest) {
          const expected =
            financing.kind === 'pro rata'
              ? weights[i]! * (result.factor! - 1)
              : i === (financing as { position?: number }).position
                ? -sum(wanted)
                : 0
          expect(Math.abs(all[i]! - expected)).toBeLessThanOrEqual(
            1e-14 * size * (moved + Math.abs(weights[i]!) * (1 + Math.abs(result.factor ?? 1))),
          )
        }
      }),
    )
  })
})

describe('removing each position', () => {
  test('is what removing it by hand gives, with every financing (Tasche 2008, with-and-without)', () => {
    fc.assert(
      fc.property(withFinancing, ({ model, weights, financing, size }) => {
        const { volatility, change } = removals(model, weights, financing)
        const today = volatilityOf(model, weights)
        for (let i = 0; i < size; i++) {
          const direction = directionOf(weights, i, financing)
          if (direction === null) {
            expect(volatility[i]).toBeNaN()
            expect(change[i]).toBeNaN()
            continue
          }
          const without = at(weights, direction, -weights[i]!)
          without[i] = 0
          const expected = volatilityOf(model, without)
          const gross = grossOf(model, weights) + Math.abs(weights[i]!) * grossOf(model, direction)
          const tolerance = 10 * slack(model, expected, gross)
          expect(absoluteGap(volatility[i]!, expected)).toBeLessThanOrEqual(tolerance)
          expect(absoluteGap(change[i]!, expected - today)).toBeLessThanOrEqual(
            tolerance + 10 * slack(model, today, gross),
          )
        }
      }),
    )
  })

  test('never lowers risk by more than the contribution, with cash (Tasche 2008)', () => {
    fc.assert(
      fc.property(book, ({ model, weights }) => {
        const { change } = removals(model, weights, { kind: 'cash' })
        const d = decompose(model, weights)
        const rounding = 1e-12 * d.volatility + 3 * Math.sqrt(model.rounding) * grossOf(model, weights)
        change.forEach((c, i) => expect(-c).toBeLessThanOrEqual(d.contribution[i]! + rounding))
      }),
    )
  })
})

describe('trades that lower risk', () => {
  test('agree with the course of each position taken by itself, and end where no point of a grid has less risk', () => {
    fc.assert(
      fc.property(withFinancing, fc.boolean(), ({ model, weights, financing, size }, mayShort) => {
        const { trades, unfinanced } = loweringTrades(
          model,
          weights,
          financing,
          mayShort ? 'shorting' : 'no shorting',
        )
        const today = volatilityOf(model, weights)
        const byPosition = new Map(trades.map((trade) => [trade.position, trade]))
        expect(byPosition.size).toBe(trades.length)
        for (let i = 0; i < size; i++) {
          if (financing.kind === 'position' && financing.position === i) continue
          const direction = directionOf(weights, i, financing)
          expect(unfinanced.includes(i)).toBe(direction === null)
          const trade = byPosition.get(i)
          if (direction === null) {
            expect(trade).toBeUndefined()
            continue
          }
          const opensShort = (t: number) =>
            at(weights, direction, t).some((weight, k) => weights[k]! >= 0 && weight < -1e-9)
          const gross = grossOf(model, weights) + grossOf(model, direction)
          // pro rata: what the rest does is what the whole does less the position itself, however small the rest is beside it
          const net = sum(weights) - weights[i]!
          const spread = gross + (financing.kind === 'pro rata' ? grossOf(model, weights) / Math.abs(net) : 0)
          const roundingAt = (t: number) =>
            1e-10 * today + 100 * Math.sqrt(model.rounding) * (grossOf(model, weights) + Math.abs(t) * spread)
          if (trade) {
            const course = courseOf(model, weights, direction)
            if (!mayShort) expect(opensShort(trade.change)).toBe(false)
            const expected = volatilityOf(model, at(weights, direction, trade.change))
            const there =
              grossOf(model, weights) + Math.abs(trade.change) * (spread + grossOf(model, direction))
            expect(absoluteGap(trade.volatility, expected)).toBeLessThanOrEqual(
              10 * slack(model, expected, there) + 1e-12 * today,
            )
            expect(absoluteGap(trade.volatilityChange, expected - today)).toBeLessThanOrEqual(
              10 * slack(model, expected, there) + 10 * slack(model, today, there) + 1e-12 * today,
            )
            expect(
              absoluteGap(trade.turnover, Math.abs(trade.change) * turnover(direction)),
            ).toBeLessThanOrEqual(1e-11 * trade.turnover)
            if (today > 1e-6 * spread)
              expect(
                absoluteGap(trade.perTurnover, -Math.abs(course.slope!) / turnover(direction)),
              ).toBeLessThanOrEqual(1e-14 * size * spread * (spread / today) ** 2)
          }
          const reached = trade ? trade.volatility : today
          for (const t of [-2, -0.5, -0.1, -0.01, 0.01, 0.1, 0.5, 2]) {
            if (!mayShort && opensShort(t)) continue
            expect(reached).toBeLessThanOrEqual(
              volatilityOf(model, at(weights, direction, t)) + roundingAt(2 + Math.abs(trade?.change ?? 0)),
            )
          }
        }
        trades.forEach((trade, k) => {
          if (k > 0) expect(trade.perTurnover).toBeGreaterThanOrEqual(trades[k - 1]!.perTurnover)
        })
      }),
    )
  })

  test('as pairs are the steepest of all pairs', () => {
    fc.assert(
      fc.property(
        book,
        fc.boolean(),
        fc.integer({ min: 1, max: 5 }),
        ({ model, weights, size }, mayShort, most) => {
          const { marginal, volatility } = decompose(model, weights)
          const pairs = loweringPairs(model, weights, mayShort ? 'shorting' : 'no shorting', most)
          if (marginal === null) {
            expect(pairs).toEqual([])
            return
          }
          const gross = grossOf(model, weights)
          const slopes: number[] = []
          for (let i = 0; i < size; i++)
            for (let j = 0; j < size; j++)
              if (i !== j && (mayShort || weights[i]! > 0)) slopes.push(marginal[j]! - marginal[i]!)
          slopes.sort((a, b) => a - b)
          const tolerance =
            1e-12 * grossOf(model, new Float64Array(size).fill(1)) * Math.max(1, gross / volatility)
          pairs.forEach((pair, k) => {
            expect(absoluteGap(pair.perTurnover, slopes[k]!)).toBeLessThanOrEqual(tolerance)
            const direction = new Float64Array(size)
            direction[pair.position] = -1
            direction[pair.against!] = 1
            const there = at(weights, direction, pair.turnover)
            const size1 = grossOf(model, weights) + pair.turnover * grossOf(model, direction)
            const expected = volatilityOf(model, there)
            expect(absoluteGap(pair.volatility, expected)).toBeLessThanOrEqual(
              10 * slack(model, expected, size1) + 1e-12 * volatility,
            )
            if (!mayShort) expect(weights[pair.position]! - pair.turnover).toBeGreaterThanOrEqual(-1e-12)
          })
          // none left out that is clearly one
          const clear = slopes.filter((slope) => slope < -tolerance).length
          expect(pairs.length).toBeGreaterThanOrEqual(Math.min(most, clear))
        },
      ),
    )
  })
})

describe('the first-order estimate', () => {
  test('misses by the square of the trade (Taylor), and its contributions add up to it', () => {
    fc.assert(
      fc.property(book, ({ model, weights, changes, size }) => {
        const before = decompose(model, weights)
        const gross = grossOf(model, weights)
        const span = grossOf(model, changes)
        fc.pre(before.volatility > 0.05 * gross && span > 1e-3 * gross)
        const missedBy = (t: number) => {
          const after = decompose(model, at(weights, changes, t))
          const estimate = firstOrder(before, after)!
          expect(absoluteGap(sum(estimate.contribution), estimate.volatility)).toBeLessThanOrEqual(
            1e-12 * gross,
          )
          return {
            volatility: after.volatility - estimate.volatility,
            contribution: after.contribution.map((c, i) => c - estimate.contribution[i]!),
          }
        }
        // a trade whose own risk is at most a thousandth of the book's
        const t = (1e-3 * before.volatility) / span
        const missed = missedBy(t)
        // the second derivative along d is at most span^2 / s; contributions have three such terms and their own slopes
        const bound = (t * span) ** 2 / before.volatility
        expect(Math.abs(missed.volatility)).toBeLessThanOrEqual(bound)
        const amplified = gross / before.volatility
        missed.contribution.forEach((miss) =>
          expect(Math.abs(miss)).toBeLessThanOrEqual(6 * bound * amplified + 1e-13 * gross),
        )
        expect(missed.contribution).toHaveLength(size)
      }),
    )
  })
})

describe('implied returns', () => {
  test('make the weights the best of all: no other has more return less risk aversion x variance / 2 (Sharpe 1974)', () => {
    fc.assert(
      fc.property(
        book,
        fc.double({ min: 0.1, max: 20, noNaN: true }),
        ({ model, weights, changes }, aversion) => {
          const { implied, total } = impliedReturns(decompose(model, weights), {
            kind: 'risk aversion',
            value: aversion,
          })
          const utility = (w: Float64Array) =>
            sum(w.map((x, i) => x * implied[i]!)) - (aversion / 2) * model.apply(w).variance
          const gross = grossOf(model, weights) + grossOf(model, changes)
          expect(utility(at(weights, changes, 1))).toBeLessThanOrEqual(
            utility(weights) + (1e-13 + 3 * model.rounding) * aversion * gross ** 2,
          )
          expect(absoluteGap(total, sum(weights.map((x, i) => x * implied[i]!)))).toBeLessThanOrEqual(
            (1e-13 + 3 * model.rounding) * aversion * gross ** 2,
          )
        },
      ),
    )
  })

  test('of a stated total add up to it, and earn the same for each unit of marginal contribution', () => {
    fc.assert(
      fc.property(book, fc.double({ min: 0.001, max: 1, noNaN: true }), ({ model, weights }, total) => {
        const d = decompose(model, weights)
        const gross = grossOf(model, weights)
        fc.pre(d.volatility > 1e-3 * gross)
        const { implied, riskAversion } = impliedReturns(d, { kind: 'total', value: total })
        expect(absoluteGap(sum(weights.map((x, i) => x * implied[i]!)), total)).toBeLessThanOrEqual(
          1e-10 * total,
        )
        expect(absoluteGap(riskAversion! * d.variance, total)).toBeLessThanOrEqual(1e-12 * total)
        returnPerMarginal(d, implied).forEach((ratio) => {
          if (!Number.isNaN(ratio))
            expect(absoluteGap(ratio, total / d.volatility)).toBeLessThanOrEqual(
              (1e-12 * total) / d.volatility,
            )
        })
      }),
    )
  })
})
