import {
  decompose,
  inOneGo,
  LIMIT_MARGIN,
  matrixModel,
  roundToLots,
  smallestChange,
  type ChangeLimit,
  type ChangeProblem,
  type RiskModel,
} from '../../../src/core'
import { leastCost } from '../../../src/core/linear-program'
import { absoluteGap } from '../../closeness'
import { faultOf } from '../../fault-of'

// Expected weights are worked out by hand beside each case. Limits are aimed at from 1e-9 below and positions move until they are met, so
// that weights agree to a few 1e-9; 1e-8 is allowed.
const tolerance = 1e-8

const diagonal = (...deviations: number[]): RiskModel => {
  const n = deviations.length
  const matrix = new Float64Array(n * n)
  deviations.forEach((sigma, i) => (matrix[i * n + i] = sigma * sigma))
  return matrixModel(matrix, n)
}
const share = (most: number, ...members: number[]): ChangeLimit => ({
  measure: 'share',
  members: Int32Array.from(members),
  most,
})
const weight = (most: number, ...members: number[]): ChangeLimit => ({
  measure: 'weight',
  members: Int32Array.from(members),
  most,
})
const volatility = (most: number): ChangeLimit => ({ measure: 'volatility', members: null, most })
const problemOf = (
  weights: number[],
  limits: readonly ChangeLimit[],
  kind: 'book' | 'cash' = 'cash',
  more: Partial<ChangeProblem> = {},
): ChangeProblem => ({ weights: Float64Array.from(weights), limits, financing: { kind }, ...more })
const change = (model: RiskModel, problem: ChangeProblem) => inOneGo(smallestChange(model, problem))

describe('the smallest change by hand', () => {
  const two = diagonal(0.2, 0.2)

  test('sells a holding whose share is over its limit when that moves less than buying the other', () => {
    // shares w0^2 : w1^2, so 20% is w0 = w1 / 2: from (0.6, 0.4) a sale of 0.4, or a purchase of 0.8
    const result = change(two, problemOf([0.6, 0.4], [share(0.2, 0)]))
    expect(absoluteGap(result.weights, [0.2, 0.4])).toBeLessThan(tolerance)
    expect(result.status).toBe('met')
    expect(result.change).toBeCloseTo(0.4, 8)
  })

  test('keeps the sum of weights when it is financed within the book', () => {
    const result = change(two, problemOf([0.6, 0.4], [share(0.2, 0)], 'book'))
    expect(absoluteGap(result.weights, [1 / 3, 2 / 3])).toBeLessThan(tolerance)
    expect(result.sumError).toBeLessThan(1e-15)
  })

  test('brings volatility down where a unit lowers it most, until the next holding is as risky', () => {
    // equal marginal contributions are equal weights here: 1 falls to 0.5 alone, then both fall to 0.4
    const result = change(two, problemOf([1, 0.5], [volatility(0.4 * 0.2 * Math.SQRT2)]))
    expect(absoluteGap(result.weights, [0.4, 0.4])).toBeLessThan(tolerance)
    expect([result.status, result.proven]).toEqual(['met', true])
    expect(result.leastPossible).toBeCloseTo(0.7, 7)
    const first = change(two, problemOf([1, 0.5], [volatility(0.2 * Math.hypot(0.75, 0.5))]))
    expect(absoluteGap(first.weights, [0.75, 0.5])).toBeLessThan(tolerance)
    expect(first.weights[1]).toBe(0.5)
  })

  test('says what a limit costs: the change saved by a unit more of it', () => {
    // at (0.75, 0.5) the volatility falls by 0.04 x 0.75 / s for each unit sold
    const s = 0.2 * Math.hypot(0.75, 0.5)
    const { savings } = change(two, problemOf([1, 0.5], [volatility(s), volatility(1)]))
    expect(savings[0]).toBeCloseTo(s / (0.04 * 0.75), 6)
    expect(savings[1]).toBe(0)
  })

  test('brings a contribution, a stand-alone risk and a weight down to their limits', () => {
    // held alone: contribution = stand-alone risk = 0.2 w
    const one = diagonal(0.2)
    const limit = (measure: ChangeLimit['measure'], most: number): ChangeLimit => ({
      measure,
      members: Int32Array.of(0),
      most,
    })
    for (const [l, w] of [
      [limit('contribution', 0.1), 0.5],
      [limit('stand-alone', 0.08), 0.4],
      [limit('weight', 0.3), 0.3],
    ] as const)
      expect(absoluteGap(change(one, problemOf([1], [l])).weights, [w])).toBeLessThan(tolerance)
  })

  test('takes the stand-alone risk of a group from its members alone', () => {
    // 0.2 sqrt(w0^2 + w1^2) <= 0.2: from (0.6, 1) the larger one falls to 0.8, which is all it takes
    const group: ChangeLimit = { measure: 'stand-alone', members: Int32Array.of(0, 1), most: 0.2 }
    const result = change(diagonal(0.2, 0.2, 0.9), problemOf([0.6, 1, 3], [group]))
    expect(absoluteGap(result.weights, [0.6, 0.8, 3])).toBeLessThan(tolerance)
  })

  test('moves toward the benchmark where the tracking error is over its limit', () => {
    // active weights (0.3, 0); a fifth of the risk of 0.2 x 0.3 is left at an active weight of 0.06
    const result = change(
      two,
      problemOf([0.8, 0.5], [{ measure: 'tracking error', members: null, most: 0.012 }], 'cash', {
        benchmark: Float64Array.of(0.5, 0.5),
      }),
    )
    expect(absoluteGap(result.weights, [0.56, 0.5])).toBeLessThan(tolerance)
  })

  test('covers a short holding that is over its limit, the absolute weight of one holding being what counts', () => {
    const result = change(two, problemOf([0.6, -0.4], [weight(0.25, 1)]))
    expect(absoluteGap(result.weights, [0.6, -0.25])).toBeLessThan(tolerance)
  })

  test('leaves the change of a chosen financing position out of what is minimised', () => {
    // sold into the third position, which has no risk: 0.4 as with cash; 0.8 with both sides counted
    const model = diagonal(0.2, 0.2, 0)
    const problem = problemOf([0.6, 0.4, 0], [share(0.2, 0)])
    const result = change(model, { ...problem, financing: { kind: 'position', position: 2 } })
    expect(absoluteGap(result.weights, [0.2, 0.4, 0.4])).toBeLessThan(tolerance)
    expect(result.minimised).toBeCloseTo(0.4, 8)
    expect(result.change).toBeCloseTo(0.8, 8)
    expect(result.turnover).toBeCloseTo(0.4, 8)
  })

  test('buys what is not held only where bounds ask for it', () => {
    // 10% of a third holding is room for the share of the first: (0.5, 0, 0.5) has shares of 1/2 each
    const limits = [share(0.5, 0)]
    expect(change(diagonal(0.2, 0.2), problemOf([1, 0], limits, 'book')).status).toBe('not found')
    const result = change(
      diagonal(0.2, 0.2),
      problemOf([1, 0], limits, 'book', { upper: Float64Array.of(1, 1) }),
    )
    expect(absoluteGap(result.weights, [0.5, 0.5])).toBeLessThan(tolerance)
  })

  test('leaves what is frozen where it is', () => {
    // only the second may move: w0^2 / (w0^2 + w1^2) = 0.5 at w1 = 0.6
    const result = change(
      two,
      problemOf([0.6, 0.4], [share(0.5, 0)], 'cash', {
        lower: Float64Array.of(0.6, 0),
        upper: Float64Array.of(0.6, 1),
      }),
    )
    expect(result.weights[0]).toBe(0.6)
    expect(result.weights[1]).toBeCloseTo(0.6, 8)
  })

  test('goes to bounds that today is outside of, limits or none', () => {
    const result = change(
      two,
      problemOf([0.6, 0.4], [], 'book', { lower: Float64Array.of(0, 0), upper: Float64Array.of(0.5, 1) }),
    )
    expect(Array.from(result.weights)).toEqual([0.5, 0.5])
  })

  test('holds the limits by a margin, so that weights with ten digits hold them too', () => {
    const problem = problemOf([0.6, 0.4], [share(0.2, 0)], 'book')
    const { weights, residuals } = change(two, problem)
    expect(residuals[0]!.excess).toBeLessThan(-0.2 * LIMIT_MARGIN * 0.8)
    expect(residuals[0]!.excess).toBeGreaterThan(-0.2 * LIMIT_MARGIN * 1.2)
    const shown = weights.map((w) => Number(w.toFixed(10)))
    expect(decompose(two, shown).share![0]).toBeLessThanOrEqual(0.2)
  })

  test('changes nothing, to the last bit, where all limits hold today', () => {
    const weights = [0.1 + 0.2, 0.7]
    const result = change(two, problemOf(weights, [share(0.9, 1), volatility(1)], 'book'))
    expect(Array.from(result.weights)).toEqual(weights)
    expect(result).toMatchObject({ status: 'met', proven: true, change: 0, iterations: 0 })
  })
})

describe('where no weights meet all limits', () => {
  const two = diagonal(0.2, 0.2)

  test.each([
    ['shares that add up to less than 1', problemOf([0.6, 0.4], [share(0.5, 0), share(0.4, 1)])],
    ['a share of the whole book below 1', problemOf([0.6, 0.4], [{ ...share(0.9), members: null }])],
    [
      'a volatility below the least there is at this sum',
      problemOf([0.6, 0.4], [volatility(0.2 * Math.SQRT1_2 * 0.99)], 'book'),
    ],
    ['a negative volatility', problemOf([0.6, 0.4], [volatility(-0.1)])],
    [
      'weights that add up to less than the sum kept',
      problemOf([0.6, 0.4], [weight(0.5, 0), weight(0.4, 1)], 'book'),
    ],
    [
      'bounds that do not allow the sum kept',
      problemOf([0.6, 0.4], [], 'book', { upper: Float64Array.of(0.5, 0.4) }),
    ],
    [
      'weights that are frozen',
      problemOf([0.6, 0.4], [volatility(0.1)], 'cash', {
        lower: Float64Array.of(0.6, 0.4),
        upper: Float64Array.of(0.6, 0.4),
      }),
    ],
    ['a turnover that is too small', problemOf([0.6, 0.4], [volatility(0.1)], 'cash', { turnover: 0.01 })],
  ])('%s: not found, and proven', (_, problem) => {
    const result = change(two, problem)
    expect([result.status, result.proven]).toEqual(['not found', true])
    expect(result.leastPossible).toBe(Infinity)
    expect(result.note).not.toBe('')
  })

  test('gives the best point it found, and what is over there', () => {
    // within a turnover of 0.1 the share falls furthest by selling 0.1 of the first: 0.25 / 0.41
    const { status, residuals, weights, turnover } = change(
      two,
      problemOf([0.6, 0.4], [share(0.2, 0)], 'cash', { turnover: 0.1 }),
    )
    expect(status).toBe('not found')
    expect(turnover).toBeLessThanOrEqual(0.1 + 1e-12)
    // buying as much of the second as well takes it down to a half: both sides count once
    expect(absoluteGap(weights, [0.5, 0.5])).toBeLessThan(tolerance)
    expect(residuals[0]!.excess).toBeCloseTo(0.3, 8)
  })

  test('says of shares that cannot be met that none were found, without proof', () => {
    // frozen but for a riskless third holding
    const result = change(
      diagonal(0.2, 0.2, 0),
      problemOf([0.6, 0.4, 0.1], [share(0.5, 0)], 'cash', {
        lower: Float64Array.of(0.6, 0.4, 0),
        upper: Float64Array.of(0.6, 0.4, 1),
      }),
    )
    expect([result.status, result.proven]).toEqual(['not found', false])
    expect(result.residuals[0]!.excess).toBeCloseTo(0.36 / 0.52 - 0.5, 9)
  })
})

describe('hostile problems', () => {
  test('a turnover that is just enough is enough, and one below it is not', () => {
    const model = diagonal(0.2, 0.2)
    const with_ = (turnover: number) =>
      change(model, problemOf([0.6, 0.4], [share(0.2, 0)], 'book', { turnover })).status
    expect(with_(0.6 - 1 / 3 + 1e-6)).toBe('met')
    expect(with_(0.6 - 1 / 3 - 1e-6)).toBe('not found')
  })

  test('positions without variance do no harm', () => {
    const result = change(diagonal(0.2, 0, 0.1), problemOf([0.5, 0.3, 0.2], [volatility(0.05)], 'book'))
    expect(result.status).toBe('met')
    // the third alone has 0.02: 0.2 w <= sqrt(0.05^2 - 0.02^2)
    expect(result.weights[0]).toBeCloseTo(Math.sqrt(0.05 ** 2 - 0.02 ** 2) / 0.2, 7)
  })

  test('limits of 0 are reached, at a bound or at the benchmark to the last bit', () => {
    // uncorrelated: a share or contribution of 0 is a weight of 0, to which the figure falls as a square
    for (const measure of ['share', 'contribution', 'stand-alone', 'weight'] as const) {
      const result = change(diagonal(0.2, 0.3), problemOf([0.5, 0.5], [{ ...share(0, 0), measure }], 'book'))
      expect(result.status).toBe('met')
      expect(Array.from(result.weights)).toEqual([0, 1])
    }
    const none: ChangeLimit = { measure: 'tracking error', members: null, most: 0 }
    const benchmark = Float64Array.of(0.3, 0.7)
    const result = change(diagonal(0.2, 0.3), problemOf([0.5, 0.5], [none], 'book', { benchmark }))
    expect([result.status, Array.from(result.weights)]).toEqual(['met', [0.3, 0.7]])
  })

  test('a matrix of rank one, of tiny and of huge numbers', () => {
    for (const scale of [1e-12, 1, 1e12]) {
      const model = matrixModel(Float64Array.of(scale, scale, scale, scale), 2)
      const result = change(model, problemOf([0.6, 0.4], [volatility(0.5 * Math.sqrt(scale))]))
      expect(result.status).toBe('met')
      expect(result.change).toBeCloseTo(0.5, 7)
    }
  })

  test('members named twice count once, none count nothing', () => {
    const model = diagonal(0.2, 0.2)
    expect(change(model, problemOf([0.6, 0.4], [weight(0.7, 0, 0)])).change).toBe(0)
    expect(change(model, problemOf([0.6, 0.4], [weight(0, ...[]), share(0.1, ...[])])).change).toBe(0)
  })

  test('progress runs from 0 towards 1 and never back', () => {
    const steps = smallestChange(
      diagonal(0.2, 0.2, 0.3),
      problemOf([0.5, 0.3, 0.2], [share(0.3, 0), share(0.25, 2)], 'book'),
    )
    let before = 0
    for (let step = steps.next(); !step.done; step = steps.next()) {
      expect(step.value).toBeGreaterThanOrEqual(before)
      expect(step.value).toBeLessThanOrEqual(1)
      before = step.value
    }
    expect(before).toBeGreaterThan(0)
  })

  const model = diagonal(0.2, 0.2)
  test.each([
    ['shape', { weights: Float64Array.of(1) }],
    ['not-a-number', { weights: Float64Array.of(1, NaN) }],
    ['shape', { lower: Float64Array.of(1) }],
    ['out-of-range', { lower: Float64Array.of(1, 0), upper: Float64Array.of(0.5, 1) }],
    ['out-of-range', { lower: Float64Array.of(NaN, 0) }],
    ['out-of-range', { turnover: -1 }],
    ['out-of-range', { limits: [share(0.5, 2)] }],
    ['not-a-number', { limits: [share(NaN, 0)] }],
    ['missing-data', { limits: [{ measure: 'tracking error', members: null, most: 0.1 }] }],
    ['unknown-choice', { limits: [{ measure: 'size' as 'weight', members: null, most: 0.1 }] }],
    ['unknown-choice', { financing: { kind: 'credit' as 'cash' } }],
    ['out-of-range', { financing: { kind: 'position', position: 2 } }],
    ['zero-risk', { weights: Float64Array.of(0, 0), limits: [share(0.5, 0)] }],
  ] as const satisfies readonly (readonly [string, Partial<ChangeProblem>])[])('%s for %j', (code, wrong) => {
    expect(faultOf(() => change(model, { ...problemOf([0.6, 0.4], []), ...wrong })).code).toBe(code)
  })
})

describe('rounding to lots', () => {
  const two = diagonal(0.2, 0.2)
  const lots = (problem: ChangeProblem, weights: number[], sizes: number[]) =>
    inOneGo(roundToLots(two, problem, Float64Array.from(weights), Float64Array.from(sizes)))

  test('takes the nearest number of lots where limits allow it', () => {
    const result = lots(problemOf([0.6, 0.4], [share(0.5, 0)]), [0.4, 0.4], [0.07, 0.1])
    // 0.2 / 0.07 is 2.86 lots
    expect(Array.from(result.lots)).toEqual([-3, 0])
    expect(result.weights[0]).toBeCloseTo(0.39, 12)
    expect(result.weights[1]).toBe(0.4)
    expect(result).toMatchObject({ holds: true, moved: 0, position: 0 })
    expect(result.toCash).toBeCloseTo(0.01, 12)
  })

  test('goes to the other side where the nearest number would leave a limit breached', () => {
    // 0.2 / 0.09 is 2.22: two lots leave 0.42, a share above one half; three hold it
    const result = lots(problemOf([0.6, 0.4], [share(0.5, 0)]), [0.4, 0.4], [0.09, 0])
    expect(Array.from(result.lots)).toEqual([-3, 0])
    expect(result).toMatchObject({ holds: true, moved: 1 })
  })

  test('says so where no lots hold the limit', () => {
    // one lot would turn the holding short, none leaves it where it is
    const result = lots(problemOf([0.6, 0.4], [share(0.5, 0)]), [0.4, 0.4], [1, 0])
    expect(Array.from(result.weights)).toEqual([0.6, 0.4])
    expect(result.holds).toBe(false)
    expect(result.residuals[0]!.excess).toBeCloseTo(0.36 / 0.52 - 0.5, 12)
    expect(result.largest).toBeCloseTo(0.2, 12)
  })

  test('leaves what may have any size as it is, and what does not change', () => {
    const result = lots(problemOf([0.6, 0.4], []), [0.55, 0.4], [0, 0.3])
    expect(Array.from(result.weights)).toEqual([0.55, 0.4])
    expect(result).toMatchObject({ largest: 0, position: -1, toCash: 0 })
  })

  test('refuses lots below 0', () => {
    expect(faultOf(() => lots(problemOf([0.6, 0.4], []), [0.5, 0.4], [0.1, -0.1])).code).toBe('out-of-range')
  })
})

describe('the linear programs inside', () => {
  const solve = (
    rows: number[][],
    most: number[],
    costs: number[],
    { lower = costs.map(() => 0), upper = costs.map(() => Infinity) } = {},
  ) =>
    inOneGo(
      leastCost({
        rows: rows.length,
        columns: Float64Array.from(costs.flatMap((_, j) => rows.map((row) => row[j]!))),
        costs: Float64Array.from(costs),
        lower: Float64Array.from(lower),
        upper: Float64Array.from(upper),
        most: Float64Array.from(most),
        equal: new Uint8Array(rows.length),
        first: new Uint8Array(rows.length),
      }),
    )

  test('solve the introductory example of Hillier & Lieberman, Introduction to Operations Research (from memory)', () => {
    // two products in three plants: x = (2, 6), profit 36, shadow prices 0, 3/2, 1
    const rows = [
      [1, 0],
      [0, 2],
      [3, 2],
    ]
    const { x, cost, savings } = solve(rows, [4, 12, 18], [-3, -5])
    expect(absoluteGap(x, [2, 6])).toBeLessThan(1e-12)
    expect(cost).toBeCloseTo(-36, 12)
    expect(absoluteGap(savings, [0, 1.5, 1])).toBeLessThan(1e-12)
  })

  test('do not go round in circles in the example of Beale (1955), Naval Research Logistics Quarterly 2, 269-275 (from memory)', () => {
    const rows = [
      [1 / 4, -60, -1 / 25, 9],
      [1 / 2, -90, -1 / 50, 3],
      [0, 0, 1, 0],
    ]
    const { status, cost } = solve(rows, [0, 0, 1], [-3 / 4, 150, -1 / 50, 6])
    expect(status).toBe('optimal')
    expect(cost).toBeCloseTo(-1 / 20, 12)
  })

  test('say when the cost has no least value', () => {
    expect(solve([[1, -1]], [1], [-1, 0]).status).toBe('unbounded')
  })
})
