/** Least variance within bounds: by hand, at the edges of what bounds allow, and where rounding or a singular covariance could mislead. */
import {
  decompose,
  inOneGo,
  leastVariance,
  matrixModel,
  returnsModel,
  type RiskModel,
} from '../../../src/core'
import { absoluteGap } from '../../closeness'
import { faultOf } from '../../fault-of'
import { covarianceOf } from '../../textbook'

const filled = (n: number, value: number) => new Float64Array(n).fill(value)
const search = (model: RiskModel, lower: number | number[], upper: number | number[], sum: number) =>
  inOneGo(
    leastVariance(model, {
      lower: typeof lower === 'number' ? filled(model.size, lower) : Float64Array.from(lower),
      upper: typeof upper === 'number' ? filled(model.size, upper) : Float64Array.from(upper),
      sum,
    }),
  )
const found = (...args: Parameters<typeof search>) => {
  const result = search(...args)
  if (!result.feasible) throw new Error('no weights lie within the bounds')
  expect(result).toMatchObject({ converged: true, stopped: null, method: 'active-set' })
  return result
}
const constant = (n: number, rho: number) =>
  Array.from({ length: n }, (_, i) => Array.from({ length: n }, (__, j) => (i === j ? 1 : rho)))
const model = (deviations: number[], rho: number) =>
  matrixModel(covarianceOf(deviations, constant(deviations.length, rho)), deviations.length)

let state = 1
const uniform = () => (state = (state * 16807) % 2147483647) / 2147483647 - 0.5

describe('by hand', () => {
  // uncorrelated: C_ii w_i equal, so weights go by inverse variance (from the conditions of the minimum)
  const three = model([0.1, 0.2, 0.2], 0)

  test('uncorrelated positions go by inverse variance', () => {
    const { weights, variance, multiplier, at, residual } = found(three, 0, 1, 1)
    expect(absoluteGap(weights, [2 / 3, 1 / 6, 1 / 6])).toBeLessThan(1e-15)
    expect(variance).toBeCloseTo(0.01 * (4 / 9) + 0.04 * (2 / 36), 16)
    expect(multiplier).toBeCloseTo(0.01 * (2 / 3), 16)
    expect(Array.from(at)).toEqual([0, 0, 0])
    expect(residual).toBeLessThan(1e-14)
  })

  test('an upper bound is met to the bit, and the rest goes on by inverse variance', () => {
    const { weights, at, multiplier } = found(three, 0, [0.3, 1, 1], 1)
    expect(weights[0]).toBe(0.3)
    expect(absoluteGap(weights, [0.3, 0.35, 0.35])).toBeLessThan(1e-15)
    expect(Array.from(at)).toEqual([1, 0, 0])
    expect(multiplier).toBeCloseTo(0.04 * 0.35, 16)
  })

  test('so is a lower one', () => {
    const { weights, at } = found(three, [0, 0.4, 0], 1, 1)
    expect(weights[1]).toBe(0.4)
    expect(absoluteGap(weights, [0.48, 0.4, 0.12])).toBeLessThan(1e-15)
    expect(Array.from(at)).toEqual([0, -1, 0])
  })

  test('two positions without bounds: the first has (v2 - c) / (v1 + v2 - 2c), short where the correlation is high', () => {
    // minimum of a parabola in one weight (common practice, no source)
    const [v1, v2, c] = [0.09, 0.01, 0.9 * 0.3 * 0.1]
    const { weights } = found(model([0.3, 0.1], 0.9), -Infinity, Infinity, 1)
    expect(weights[0]).toBeCloseTo((v2 - c) / (v1 + v2 - 2 * c), 14)
    expect(weights[0]).toBeLessThan(0)
  })

  test('a riskless position takes everything it may', () => {
    const cash = matrixModel(Float64Array.of(0.04, 0, 0, 0), 2)
    expect(Array.from(found(cash, 0, 1, 1).weights)).toEqual([0, 1])
    const capped = found(cash, 0, [1, 0.6], 1)
    expect(absoluteGap(capped.weights, [0.4, 0.6])).toBeLessThan(1e-16)
    expect(capped.variance).toBeCloseTo(0.04 * 0.16, 16)
  })

  test('a sum of 0 within bounds around 0 holds nothing', () => {
    const { weights, variance } = found(model([0.2, 0.3, 0.1], -0.2), -0.5, 0.5, 0)
    expect(absoluteGap(weights, [0, 0, 0])).toBeLessThan(1e-15)
    expect(variance).toBeLessThan(1e-30)
  })

  test('a sum below 0 is the same with all signs turned', () => {
    const book = model([0.2, 0.3, 0.1], 0.4)
    const up = found(book, 0, 0.6, 1).weights
    expect(
      absoluteGap(
        found(book, -0.6, 0, -1).weights.map((w) => -w),
        up,
      ),
    ).toBeLessThan(1e-15)
  })
})

describe('at the edge of what the bounds allow', () => {
  const C = model([0.2, 0.3, 0.25], -0.3)

  test.each([
    ['too much', 0, 0.3, 1, { lowest: 0, highest: 0.3 * 3 }],
    ['too little', [0.5, 0.4, 0.2], 1, 1, { lowest: 0.5 + 0.4 + 0.2, highest: 3 }],
  ])('a sum that is %s for them is infeasible, with the sums they allow', (_, lower, upper, sum, sums) => {
    const result = search(C, lower, upper, sum)
    expect(result).toEqual({
      feasible: false,
      lowest: expect.closeTo(sums.lowest, 15),
      highest: expect.closeTo(sums.highest, 15),
    })
  })

  test('ten bounds of a tenth allow a sum of 1, although their sum in doubles misses it', () => {
    expect(filled(10, 0.1).reduce((a, b) => a + b, 0)).not.toBe(1)
    const ten = model(Array.from(filled(10, 0.2)), 0.1)
    expect(Array.from(found(ten, 0, 0.1, 1).weights)).toEqual(Array.from(filled(10, 0.1)))
    // here one of them takes the rounding
    expect(absoluteGap(found(ten, 0.1, 1, 1).weights, filled(10, 0.1))).toBeLessThan(2e-16)
  })

  test('weights that cannot move are given back as they are', () => {
    const { weights, at, multiplier } = found(C, [0.2, 0.3, 0.5], [0.2, 0.3, 0.5], 1)
    expect(Array.from(weights)).toEqual([0.2, 0.3, 0.5])
    expect([Array.from(at), multiplier]).toEqual([[-1, -1, -1], 0])
  })

  test('bounds on one side only serve as well', () => {
    const { weights } = found(C, [-Infinity, 0, 0.1], [0.2, Infinity, Infinity], 1)
    expect(weights[0]).toBeLessThanOrEqual(0.2)
    expect(weights.reduce((a, b) => a + b, 0)).toBeCloseTo(1, 15)
  })
})

describe('where C is singular', () => {
  test('more positions than dates, short ones allowed: a portfolio without variance is found', () => {
    const [T, n] = [15, 40]
    const book = returnsModel(
      Float64Array.from({ length: T * n }, () => 0.04 * uniform()),
      T,
      n,
    )
    const { weights, residual } = found(book, -1, 1, 1)
    expect(decompose(book, weights).volatility).toBe(0)
    expect(residual).toBe(0)
    expect(weights.reduce((a, b) => a + b, 0)).toBeCloseTo(1, 13)
  })

  test('two positions that are one: every split is as good, and the variance is that of either', () => {
    const { variance } = found(model([0.2, 0.2], 1), 0, 1, 1)
    expect(variance).toBeCloseTo(0.04, 16)
  })

  test('nothing moves at all, and all weights within the bounds serve', () => {
    const { weights, variance } = found(matrixModel(filled(9, 0), 3), 0, 0.5, 1)
    expect(variance).toBe(0)
    expect(weights.reduce((a, b) => a + b, 0)).toBe(1)
  })

  test('volatilities a million times apart do not hide each other', () => {
    // uncorrelated, inverse variances within the bounds that hold: the first is held at its bound, the others split 1e6 : 1
    const { weights } = found(model([1e-6, 1e-3, 1], 0), 0, [0.5, 1, 1], 1)
    expect(weights[0]).toBe(0.5)
    expect(weights[2]! / (0.5 / (1 + 1e6))).toBeCloseTo(1, 9)
  })
})

test('it tells how far it is and ends, at 60 positions that are all bounded', () => {
  const [T, n] = [200, 60]
  const book = returnsModel(
    Float64Array.from({ length: T * n }, () => 0.04 * uniform()),
    T,
    n,
  )
  const lower = filled(n, -0.01)
  const upper = filled(n, 0.03)
  const steps = leastVariance(book, { lower, upper, sum: 1 })
  const shares: number[] = []
  let step = steps.next()
  for (; !step.done; step = steps.next()) shares.push(step.value)
  expect(step.value).toMatchObject({ feasible: true, converged: true })
  expect(shares[0]).toBe(0)
  expect(shares).toEqual([...shares].sort((a, b) => a - b))
  expect(shares.at(-1)).toBeLessThan(1)
  expect([Array.from(lower), Array.from(upper)]).toEqual([
    Array.from(filled(n, -0.01)),
    Array.from(filled(n, 0.03)),
  ])
})

describe('what are no bounds is refused', () => {
  const C = model([0.2, 0.3], 0)
  test.each<[string, Parameters<typeof search>, object]>([
    ['too few', [C, [0], 1, 1], { code: 'shape', where: { argument: 'lower' } }],
    [
      'one that is not a number',
      [C, 0, [1, NaN], 1],
      { code: 'not-a-number', where: { argument: 'upper', row: 1, column: 0 } },
    ],
    [
      'a lower one above the upper one, with its row',
      [C, [0, 0.6], [1, 0.5], 1],
      {
        code: 'out-of-range',
        message:
          'lower: 0.6 with an upper bound of 0.5; a lower bound that is no more than the upper one is needed',
        where: { argument: 'lower', row: 1 },
      },
    ],
    ['a lower one of infinity', [C, [0, Infinity], Infinity, 1], { code: 'out-of-range' }],
    ['an upper one of minus infinity', [C, -Infinity, [1, -Infinity], 1], { code: 'out-of-range' }],
    ['a sum that is no number', [C, 0, 1, NaN], { code: 'not-a-number', where: { argument: 'sum' } }],
  ])('%s', (_, args, expected) => {
    expect(faultOf(() => search(...args))).toMatchObject(expected)
  })
})

test('a matrix with a negative eigenvalue that the search meets is refused', () => {
  // three positions at correlations of -0.9: an eigenvalue of 1 - 2 x 0.9
  expect(faultOf(() => search(model([1, 1, 1], -0.9), 0, 1, 1))).toMatchObject({ code: 'negative-variance' })
})
