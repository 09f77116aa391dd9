import { Fault } from './fault'
import type { ReturnsModel, RiskModel } from './risk-model'

/** More lags than this say more about noise than about slow prices. */
export const MOST_LAGS = 10

/**
 * The risk model of returns with covariances across dates (long-run covariance): where holdings react late, or prices
 * close at different hours, part of what moves them together falls on the dates next to each other.
 *
 *   C = G_0 + sum_(k=1..L) (1 - k/(L+1)) (G_k + G_k'),   G_k = sum_(t>k) z_t z_(t-k)' / T
 *
 * These weights make C a mean of squares over windows of L+1 dates, which is how it is computed: with
 * s_p = y_p + ... + y_(p-L) of the portfolio's y = Z w (0 before the first date and after the last),
 *
 *   w'C w = sum_p s_p^2 / (T (L+1)),   C w = Z'u / T,   u_t = (s_t + ... + s_(t+L)) / (L+1)
 *
 * @param returns  of equally weighted dates; divisor T is taken whichever it has
 * @param lags     L; a whole number, 1 to 10, below T
 * @throws Fault   "out-of-range" (lags) | "unknown-choice" (dates weighted unequally)
 * @source         Newey & West (1987), A Simple, Positive Semi-Definite, Heteroskedasticity and Autocorrelation Consistent
 *                 Covariance Matrix, Econometrica 55(3), 703-708 (weights read in notes quoting it; rest from memory)
 * @cost           O(T n L) once; two readings of the block a question, O(T n)
 */
export function laggedModel(returns: ReturnsModel, lags: number): RiskModel {
  const { size, dates: T } = returns
  if (!Number.isInteger(lags) || lags < 1 || lags > MOST_LAGS || lags >= T) {
    throw new Fault(
      'out-of-range',
      `${lags} lags for ${T} dates`,
      `a whole number from 1 to ${MOST_LAGS} is needed, and more dates than lags`,
      { argument: 'lags' },
    )
  }
  if (returns.weighting.kind === 'exponential') {
    throw new Fault(
      'unknown-choice',
      'lagged terms of exponentially weighted returns',
      'equally weighted dates are needed',
    )
  }
  const span = lags + 1
  const variances = laggedVariances(returns, span)

  // s_p is a sum of L+1 roundings of y, each in proportion to volatilities without lags, which may be the larger ones
  const plain = returns.variances()
  const excess = variances.reduce(
    (most, variance, i) => (variance > 0 ? Math.max(most, plain[i]! / variance) : most),
    1,
  )
  const padded = new Float64Array(T + 2 * lags)
  const apply = (weights: Float64Array, into?: Float64Array) => {
    padded.set(returns.portfolioReturns(weights), lags)
    const sums = windowSums(padded, span)
    let squares = 0
    for (let p = 0; p < sums.length; p++) squares += sums[p]! * sums[p]!
    const spread = windowSums(sums, span)
    for (let t = 0; t < T; t++) spread[t] = spread[t]! / (span * T)
    return { marginals: returns.weigh(spread, into), variance: squares / (span * T) }
  }
  return {
    size,
    rounding: returns.rounding * span * excess,
    apply,
    variances: () => variances.slice(),
    matrix() {
      const matrix = new Float64Array(size * size)
      const unit = new Float64Array(size)
      for (let i = 0; i < size; i++) {
        unit[i] = 1
        const { marginals } = apply(unit)
        unit[i] = 0
        matrix[i * size + i] = variances[i]!
        for (let j = i + 1; j < size; j++) matrix[i * size + j] = matrix[j * size + i] = marginals[j]!
      }
      return matrix
    },
  }
}

/**
 * How many lagged terms suit so many dates: floor( 4 (T / 100)^(2/9) ).
 *
 * @param dates  T, from 0
 * @source       Newey & West (1994), Automatic Lag Selection in Covariance Matrix Estimation, REStud 61(4), 631-653 (from memory)
 * @example      usualLags(260) // 4
 */
export const usualLags = (dates: number): number => Math.floor(4 * (dates / 100) ** (2 / 9))

/**
 * How much of its covariance with others lagged terms bring back, where a series shows every k dates what happened in all of them: a share 1/k
 * falls on each of the lags 0 to k - 1, and a lag counts with its weight 1 - lag/(L + 1).
 *
 * @param every  k; whole number from 1
 * @param lags   L; whole number from 0
 * @returns      above 0, at most 1
 * @throws Fault "out-of-range"
 * @source       derived here from the weights of `laggedModel`
 * @example      shareBroughtBack(4, 7) // 0.8125
 * @example      shareBroughtBack(4, 0) // 0.25
 */
export function shareBroughtBack(every: number, lags: number): number {
  if (!Number.isInteger(every) || every < 1 || !Number.isInteger(lags) || lags < 0) {
    throw new Fault(
      'out-of-range',
      `${lags} lags for a series shown every ${every} dates`,
      'whole numbers are needed, from 0 and from 1',
      { argument: Number.isInteger(every) && every >= 1 ? 'lags' : 'every' },
    )
  }
  let sum = 0
  for (let lag = 0; lag < Math.min(every, lags + 1); lag++) sum += 1 - lag / (lags + 1)
  return sum / every
}

/**
 * The sum of every `span` neighbours. A window is the end of one block of `span` numbers and the beginning of the next:
 * summing both from the border between them takes three additions a window, and none is taken back, which would carry
 * roundings along.
 */
function windowSums(values: Float64Array, span: number): Float64Array {
  const sums = new Float64Array(values.length - span + 1)
  for (let start = 0; start < sums.length; start += span) {
    let end = 0
    for (let k = span - 1; k >= 0; k--) {
      end += values[start + k]!
      if (start + k < sums.length) sums[start + k] = end
    }
    let beginning = 0
    for (let k = 1; k < span && start + k < sums.length; k++) {
      beginning += values[start + span + k - 1]!
      sums[start + k] = sums[start + k]! + beginning
    }
  }
  return sums
}

/** The diagonal of C: window sums of every position at once. */
function laggedVariances(returns: ReturnsModel, span: number): Float64Array {
  const { size, dates: T } = returns
  const window = Array.from({ length: span }, () => new Float64Array(size))
  const sum = new Float64Array(size)
  const variances = new Float64Array(size)
  for (let p = 0; p < T + span - 1; p++) {
    const newest = window[p % span]!
    if (p < T) returns.centredRow(p, newest)
    else newest.fill(0)
    sum.fill(0)
    for (const row of window) for (let i = 0; i < size; i++) sum[i] = sum[i]! + row[i]!
    for (let i = 0; i < size; i++) variances[i] = variances[i]! + sum[i]! * sum[i]!
  }
  return variances.map((squares) => squares / (span * T))
}
