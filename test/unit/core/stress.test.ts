import {
  matrixModel,
  moveCorrelations,
  replay,
  returnsModel,
  scaleVolatilities,
  worstStretch,
} from '../../../src/core'
import { faultOf } from '../../fault-of'

// Two positions of volatility 20% and 30%, correlation 1/6, typed for these tests; what follows from them is by hand.
const TWO = matrixModel(Float64Array.of(0.04, 0.01, 0.01, 0.09), 2)

test('a riskless position stays riskless however correlations move', () => {
  const model = moveCorrelations(matrixModel(Float64Array.of(0.04, 0, 0, 0), 2), 0.7)
  expect(model.matrix()).toEqual(Float64Array.of(0.04, 0, 0, 0))
  expect(model.apply(Float64Array.of(0, 1))).toEqual({ marginals: Float64Array.of(0, 0), variance: 0 })
})

test('a factor of 0 makes a position riskless, and its marginal contribution 0', () => {
  const { marginals, variance } = scaleVolatilities(TWO, Float64Array.of(0, 1)).apply(Float64Array.of(5, 0.5))
  expect(marginals[0]).toBe(0)
  // 0.25 x 0.09
  expect(variance).toBeCloseTo(0.0225, 15)
})

test('a hedge that cancels when all correlations are 1 has a volatility of 0 there', () => {
  const hedged = moveCorrelations(TWO, 1).apply(Float64Array.of(0.3, -0.2))
  expect(hedged.variance).toBeLessThanOrEqual(1e-32)
})

test('C w goes where the caller has room, and weights are left as they are', () => {
  const weights = Float64Array.of(0.5, 0.5)
  const into = new Float64Array(2)
  const model = moveCorrelations(scaleVolatilities(TWO, Float64Array.of(2, 1)), 0.5)
  expect(model.apply(weights, into).marginals).toBe(into)
  expect(into).toEqual(model.apply(weights).marginals)
  expect(weights).toEqual(Float64Array.of(0.5, 0.5))
})

test('factors are taken as they were: later changes of the array change nothing', () => {
  const factors = Float64Array.of(1, 1)
  const model = scaleVolatilities(TWO, factors)
  factors[0] = 9
  expect(model.variances()).toEqual(TWO.variances())
})

test('of the weights of a bent model it is told which is not a number, as typed', () => {
  const fault = faultOf(() => scaleVolatilities(TWO, Float64Array.of(0, 1)).apply(Float64Array.of(1, NaN)))
  expect([fault.code, fault.where]).toEqual(['not-a-number', { argument: 'weights', row: 1, column: 0 }])
})

test.each([
  ['a negative factor', () => scaleVolatilities(TWO, Float64Array.of(1, -0.5)), 'out-of-range'],
  ['a factor that is no number', () => scaleVolatilities(TWO, Float64Array.of(NaN, 1)), 'not-a-number'],
  ['one factor for two positions', () => scaleVolatilities(TWO, Float64Array.of(2)), 'shape'],
  ['correlations moved beyond 1', () => moveCorrelations(TWO, 1.01), 'out-of-range'],
  ['correlations moved away from 1', () => moveCorrelations(TWO, -0.01), 'out-of-range'],
  ['correlations moved by no number', () => moveCorrelations(TWO, NaN), 'out-of-range'],
  ['returns of another size', () => replay(Float64Array.of(1, 2, 3), 2, 2, Float64Array.of(1, 1)), 'shape'],
  ['returns with a gap', () => replay(Float64Array.of(0.1, NaN), 2, 1, Float64Array.of(1)), 'not-a-number'],
  [
    'a return too large for a double',
    () => replay(Float64Array.of(1e300), 1, 1, Float64Array.of(1e300)),
    'out-of-range',
  ],
  [
    'a value too large for a double',
    () => replay(new Float64Array(400).fill(9), 400, 1, Float64Array.of(1)),
    'out-of-range',
  ],
  [
    'a stretch of half a date',
    () => worstStretch(Float64Array.of(0.1, 0.2), 2, 1, Float64Array.of(1), 0.5),
    'out-of-range',
  ],
  [
    'a stretch of no dates',
    () => worstStretch(Float64Array.of(0.1, 0.2), 2, 1, Float64Array.of(1), 0),
    'out-of-range',
  ],
])('%s is a fault', (_, work, code) => {
  expect(faultOf(work).code).toBe(code)
})

test('a book that only gains has a worst fall of 0 with no peak or trough', () => {
  const { worstFall } = replay(Float64Array.of(0.1, 0, 0.2), 3, 1, Float64Array.of(1))
  expect(worstFall).toEqual({ share: 0, peak: -1, trough: -1 })
})

test('a fall that begins with the first date has its peak before it', () => {
  const { worstFall } = replay(Float64Array.of(-0.1, -0.1, 0.5), 3, 1, Float64Array.of(1))
  // 1 - 0.9 x 0.9
  expect(worstFall!.share).toBeCloseTo(0.19, 12)
  expect([worstFall!.peak, worstFall!.trough]).toEqual([-1, 1])
})

test('a date that takes all the book has leaves its sum but nothing to compound', () => {
  const { total, compounded, worstFall } = replay(Float64Array.of(0.1, -0.5, 0.2), 3, 1, Float64Array.of(2))
  expect(total).toBeCloseTo(-0.4, 12)
  expect([compounded, worstFall]).toEqual([null, null])
})

test('of two stretches that lose alike the earlier is found, whatever rounding says of their running sums', () => {
  // a running sum makes -0.3000000000000003 of the later one
  const returns = Float64Array.of(-0.1, -0.2, 0.7, 0.8, -0.1, -0.2)
  expect(worstStretch(returns, 6, 1, Float64Array.of(1), 2).start).toBe(0)
})

test('no question about weights forms the matrix', () => {
  const asked = {
    ...returnsModel(Float64Array.of(0.01, 0.02, 0.03, -0.02), 2, 2),
    matrix: () => {
      throw new Error('the matrix was formed')
    },
  }
  const bent = moveCorrelations(scaleVolatilities(asked, Float64Array.of(2, 1)), 0.5)
  expect(bent.apply(Float64Array.of(0.5, 0.5)).variance).toBeGreaterThan(0)
  expect(bent.variances()).toHaveLength(2)
  expect(() => bent.matrix()).toThrow('the matrix was formed')
})
