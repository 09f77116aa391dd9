import { checkBlock, Fault } from './fault'
import type { RiskModel } from './risk-model'

// Other worlds for a book: its covariance bent, or a stretch of its past once more. Nothing here forms a matrix.

/**
 * The model with the volatility of each position multiplied; correlations stay.
 *
 *   C' = D C D,   D = diag(factors)
 *
 * Positive semidefinite whenever C is: w'C'w is the variance of the weights D w.
 *
 * @param factors  n; 0 or more; 1 leaves a position as it is, 0 makes it riskless
 * @returns        a model of the same unit, per period; it asks the one given
 * @throws Fault   "shape" | "not-a-number" | "out-of-range" (with the row of the position)
 * @source         common practice, no source
 * @cost           O(n) more than a question to the model itself
 * @example        scaleVolatilities(matrixModel(Float64Array.of(.04, .01, .01, .09), 2), Float64Array.of(2, 1)).apply(Float64Array.of(.5, .5)).variance // 0.0725
 * @example        scaleVolatilities(matrixModel(Float64Array.of(.04), 1), Float64Array.of(-1)) // Fault "out-of-range"
 */
export function scaleVolatilities(model: RiskModel, factors: Float64Array): RiskModel {
  const { size } = model
  checkBlock(factors, size, 1, 'factors')
  const row = factors.findIndex((factor) => factor < 0)
  if (row >= 0) {
    throw new Fault('out-of-range', `factor ${factors[row]}`, 'a number of 0 or more is needed', {
      argument: 'factors',
      row,
    })
  }
  const kept = factors.slice()
  return {
    size,
    // of the sum of stand-alone volatilities, which grows with them
    rounding: model.rounding,
    apply(weights, into) {
      checkBlock(weights, size, 1, 'weights')
      const { marginals, variance } = model.apply(
        weights.map((w, i) => w * kept[i]!),
        into,
      )
      for (let i = 0; i < size; i++) marginals[i] = marginals[i]! * kept[i]!
      return { marginals, variance }
    },
    variances: () => model.variances().map((variance, i) => variance * kept[i]! * kept[i]!),
    matrix() {
      const matrix = model.matrix()
      for (let i = 0, k = 0; i < size; i++) {
        for (let j = 0; j < size; j++, k++) matrix[k] = matrix[k]! * kept[i]! * kept[j]!
      }
      return matrix
    },
  }
}

/**
 * The model with the correlation of every pair moved toward 1; volatilities stay.
 *
 *   C' = (1 - theta) C + theta s s',   s the volatilities, so that a correlation r becomes (1 - theta) r + theta
 *
 * Positive semidefinite whenever C is, for theta from 0 to 1: s s' is so, as w's s'w = (s'w)^2, and covariance matrices are a convex
 * cone. At 1 the volatility of a book is |s'w|: with weights of both signs that may be less than before.
 *
 * @param theta    0 (as it is) to 1 (every correlation is 1)
 * @returns        a model of the same unit, per period; a riskless position stays riskless. It asks the one given
 * @throws Fault   "out-of-range"
 * @source         the cone: Boyd & Vandenberghe (2004), Convex Optimization, section 2.2.5; mixing with a fixed matrix: Higham, Strabić & Šego
 *                 (2016), Restoring Definiteness via Shrinking, SIAM Review 58(2), 245-263 (both from memory); one as the target under
 *                 stress: common practice, no source
 * @cost           O(n) more than a question to the model itself
 * @example        moveCorrelations(matrixModel(Float64Array.of(.04, 0, 0, .09), 2), .5).matrix() // [0.04, 0.03, 0.03, 0.09]
 * @example        moveCorrelations(matrixModel(Float64Array.of(.04, 0, 0, .09), 2), 1).apply(Float64Array.of(.5, .5)).variance // 0.0625
 * @example        moveCorrelations(matrixModel(Float64Array.of(.04), 1), 1.2) // Fault "out-of-range"
 */
export function moveCorrelations(model: RiskModel, theta: number): RiskModel {
  if (!(theta >= 0 && theta <= 1)) {
    throw new Fault('out-of-range', `correlations moved by ${theta}`, 'a share from 0 to 1 is needed', {
      argument: 'theta',
    })
  }
  const { size } = model
  const deviations = model.variances().map(Math.sqrt)
  return {
    size,
    // s'w is a sum of n terms, each good to one rounding of its stand-alone volatility
    rounding: Math.max(model.rounding, (size * Number.EPSILON) ** 2),
    apply(weights, into) {
      const { marginals, variance } = model.apply(weights, into)
      let inStep = 0
      for (let i = 0; i < size; i++) inStep += deviations[i]! * weights[i]!
      for (let i = 0; i < size; i++) {
        marginals[i] = (1 - theta) * marginals[i]! + theta * inStep * deviations[i]!
      }
      return { marginals, variance: (1 - theta) * variance + theta * inStep * inStep }
    },
    variances: () => model.variances(),
    matrix() {
      const matrix = model.matrix()
      for (let i = 0, k = 0; i < size; i++) {
        for (let j = 0; j < size; j++, k++) {
          // the diagonal is that of the model to the last bit
          if (i !== j) matrix[k] = (1 - theta) * matrix[k]! + theta * deviations[i]! * deviations[j]!
        }
      }
      return matrix
    },
  }
}

/** What some dates of returns make of a book held at constant weights. */
export interface Replay {
  /** y_t = w'r_t, the book's return of each date; T */
  readonly portfolio: Float64Array
  /** sum of y_t: the book's gain in terms of a capital that is the same on every date. */
  readonly total: number
  /** w_i times the sum of r_ti; n; adds up to the total. */
  readonly parts: Float64Array
  /** product of (1 + y_t), less 1: with gains and losses left in the book. Null where a date takes all it has: nothing is left to compound. */
  readonly compounded: number | null
  /** the largest, along the compounded value; null as above */
  readonly worstFall: Fall | null
}

/** A fall of value from a peak to a later trough. */
export interface Fall {
  /** of the value at the peak; 0 where it never falls */
  readonly share: number
  /** the date of the peak, from 0; -1: the start, before the first date */
  readonly peak: number
  /** the date of the trough, from 0; -1 where it never falls */
  readonly trough: number
}

/**
 * Replays dates of returns with a book held at constant weights, as if it were brought back to them after each date.
 *
 * @param returns  T x n row-major, simple returns, decimals per period; raw, means kept
 * @param dates    T, at least 1
 * @param size     n
 * @param weights  n; decimals of capital, of any sign and sum; what they leave to 1 counts as cash at 0
 * @throws Fault   "shape" | "not-a-number" (with row and column) | "out-of-range" (a return too large to be a number)
 * @source         definitions; constant weights and their sum, which adds up by position: common practice, no source
 * @cost           O(T n)
 * @example        replay(Float64Array.of(.1, 0, -.2, .1), 2, 2, Float64Array.of(.5, .5)).parts // [-0.05, 0.05]
 * @example        replay(Float64Array.of(.1, -.2, .05), 3, 1, Float64Array.of(1)).compounded // -0.076
 * @example        replay(Float64Array.of(.1, -.2, .05), 3, 1, Float64Array.of(1)).worstFall // {"share": 0.2, "peak": 0, "trough": 1}
 */
export function replay(returns: Float64Array, dates: number, size: number, weights: Float64Array): Replay {
  const { portfolio, sums } = portfolioReturns(returns, dates, size, weights)
  let total = 0
  for (let t = 0; t < dates; t++) total += portfolio[t]!
  const parts = sums.map((sum, i) => sum * weights[i]!)
  if (!Number.isFinite(total) || !parts.every(Number.isFinite)) throw tooLarge()
  return { portfolio, total, parts, ...compound(portfolio) }
}

/** Gains and losses left in the book, from a value of 1 on. */
function compound(portfolio: Float64Array): Pick<Replay, 'compounded' | 'worstFall'> {
  let value = 1
  let highest = 1
  let highestAt = -1
  let worst: Fall = { share: 0, peak: -1, trough: -1 }
  for (let t = 0; t < portfolio.length; t++) {
    if (portfolio[t]! <= -1) return { compounded: null, worstFall: null }
    value *= 1 + portfolio[t]!
    if (value > highest) {
      highest = value
      highestAt = t
    }
    const share = 1 - value / highest
    if (share > worst.share) worst = { share, peak: highestAt, trough: t }
  }
  if (!Number.isFinite(value)) throw tooLarge()
  return { compounded: value - 1, worstFall: worst }
}

/** Sums of returns nearer to each other than this differ by the rounding of a running sum. */
const ALIKE = 1e-12

/** The dates on end whose returns add up to the least. */
export interface Stretch {
  /** its first date, from 0 */
  readonly start: number
  /** sum of the book's returns over it; above 0 where every stretch of that length was a gain */
  readonly total: number
}

/**
 * The stretch of a given number of dates with the largest loss, by the sum of the returns of a book held at constant weights; the
 * earliest of several.
 *
 * @param returns  T x n row-major, simple returns, decimals per period; raw, means kept
 * @param dates    T
 * @param size     n
 * @param weights  n
 * @param length   dates of the stretch; 1 to T
 * @throws Fault   "shape" | "not-a-number" | "out-of-range" | "too-few" (dates for that length)
 * @source         running sums: common practice, no source
 * @cost           O(T n), whatever the length
 * @example        worstStretch(Float64Array.of(.01, -.02, -.03, .01, -.04), 5, 1, Float64Array.of(1), 2) // {"start": 1, "total": -0.05}
 * @example        worstStretch(Float64Array.of(.01, -.02), 2, 1, Float64Array.of(1), 3) // Fault "too-few"
 */
export function worstStretch(
  returns: Float64Array,
  dates: number,
  size: number,
  weights: Float64Array,
  length: number,
): Stretch {
  if (!Number.isInteger(length) || length < 1) {
    throw new Fault('out-of-range', `a stretch of ${length} dates`, 'a whole number of 1 or more is needed', {
      argument: 'length',
    })
  }
  if (length > dates) {
    throw new Fault('too-few', `a stretch of ${length} dates`, `the returns have ${dates}`, {
      argument: 'length',
    })
  }
  const { portfolio } = portfolioReturns(returns, dates, size, weights)
  let running = 0
  let least = Infinity
  let start = 0
  for (let t = 0; t < dates; t++) {
    running += portfolio[t]!
    if (t >= length) running -= portfolio[t - length]!
    if (t >= length - 1 && running < least - ALIKE) {
      least = running
      start = t + 1 - length
    }
  }
  // what came in and went out again leaves its rounding in a running sum
  let total = 0
  for (let t = start; t < start + length; t++) total += portfolio[t]!
  return { start, total }
}

/** w'r_t of each date, and the sum over dates of each position's returns. */
function portfolioReturns(returns: Float64Array, dates: number, size: number, weights: Float64Array) {
  checkBlock(returns, dates, size, 'returns')
  checkBlock(weights, size, 1, 'weights')
  const portfolio = new Float64Array(dates)
  const sums = new Float64Array(size)
  for (let t = 0, k = 0; t < dates; t++) {
    let sum = 0
    for (let i = 0; i < size; i++, k++) {
      sum += weights[i]! * returns[k]!
      sums[i] = sums[i]! + returns[k]!
    }
    if (!Number.isFinite(sum)) throw tooLarge()
    portfolio[t] = sum
  }
  return { portfolio, sums }
}

const tooLarge = (): Fault =>
  new Fault(
    'out-of-range',
    'the book’s return is too large to be a number',
    'smaller weights or returns are needed (decimals, such as 0.05 for 5%)',
  )
