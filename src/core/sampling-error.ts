import { checkBlock, Fault } from './fault'
import { returnsModel, roundingOfVariance, type ReturnsModel } from './risk-model'

/** How sure the figures of a decomposition are, in the unit of each: per period, as the figures are. */
export interface StandardErrors {
  /** of the volatility s */
  readonly volatility: number
  /** of each contribution c_i; n */
  readonly contribution: Float64Array
  /** of each share p_i; n. Null where there is no risk to share. */
  readonly share: Float64Array | null
  /** 1 / sum of omega_t^2: as many equally weighted dates would tell as much; T where they are. */
  readonly effectiveDates: number
}

/**
 * Standard errors of volatility, contributions and shares, from how far each date moves each figure (its influence
 * value u_t). No normality is assumed: fat tails widen the bands as they should.
 *
 *   v = sum_t omega_t y_t^2,   s^2 = correction v,   se = sqrt(sum_t omega_t^2 u_t^2)
 *   share:         u_t = (w_i z_ti y_t - p_i y_t^2) / v
 *   volatility:    u_t = s (y_t^2 / v - 1) / 2
 *   contribution:  u_t = s (u_t of the share) + p_i (u_t of the volatility)
 *
 * With lags L > 0 the figures are those with lagged terms and divisor T, s^2 = sum over |k| <= L of kappa_k sum_t y_t
 * y_(t-k) / T, kappa_k = 1 - |k| / (L+1). A product of two dates counts at the later one, so that returns without
 * autocorrelation have influence values without; se is the long-run one with the same kappa:
 *
 *   y_t^2     becomes  y_t^2 + 2 y_t F y_t,                          F x_t = sum_(k=1..L) kappa_k x_(t-k)
 *   z_ti y_t  becomes  z_ti y_t + z_ti F y_t + y_t F z_ti
 *   se^2 = sum over |k| <= L of kappa_k sum_t (omega u)_t (omega u)_(t-k)
 *
 * Errors that rounding alone could have made are 0: the share of an only position is certain.
 *
 * @param model    a block of returns; equally weighted dates where lags are given
 * @param weights  n; decimals of capital
 * @param lags     L, a whole number from 0 to T-1; 0 takes no lagged terms
 * @returns        per period; estimates that hold for many dates and run small for few: at T = 500 hardly without lags,
 *                 by about a tenth with ten of them (simulated)
 * @throws Fault   "shape" | "not-a-number" | "out-of-range" (lags; a variance too large for a double) |
 *                 "unknown-choice" (lags with exponential weights)
 * @source         influence values: Hampel (1974), The Influence Curve and Its Role in Robust Estimation, JASA 69(346)
 *                 (from memory); the error of a share is White's (1980), Econometrica 48(4), 817-838, of the slope of
 *                 w_i r_i on the portfolio; lags: Newey & West (1987), Econometrica 55(3), 703-708 (from memory)
 * @cost           O(T n): two streaming passes, three with exponential weights; O(T n L) with lags
 * @example        standardErrors(returnsModel(Float64Array.of(.01, 0, -.02, .01, .01, -.01), 3, 2), Float64Array.of(.5, .5)).share // [0.35355, 0.35355]
 */
export function standardErrors(model: ReturnsModel, weights: Float64Array, lags = 0): StandardErrors {
  const effectiveDates = 1 / sumOfSquares(model.rowWeights)
  const portfolio = scaledPortfolio(model, weights, lags)
  if (!portfolio) {
    return { volatility: 0, contribution: new Float64Array(model.size), share: null, effectiveDates }
  }
  const { volatility } = portfolio
  const { variance, contribution, share } =
    lags === 0 ? squaresBySums(model, portfolio) : squaresByDates(model, portfolio, eachAlone(model.size))
  for (let i = 0; i < model.size; i++) {
    contribution[i] = volatility * Math.sqrt(contribution[i]!)
    share[i] = Math.sqrt(share[i]!)
  }
  return { volatility: (volatility / 2) * Math.sqrt(variance), contribution, share, effectiveDates }
}

/**
 * The same for groups of positions. A group's contribution is the sum of its members' and so are its influence values, which makes the group
 * one position whose return is what its members earn together.
 *
 * @param groupOf  n; the group of each position, 0 .. groups-1
 * @returns        as `standardErrors`, with one entry for each group; a group without members has errors of 0
 * @throws Fault   as `standardErrors` | "out-of-range" (with the row of the position)
 * @source         as `standardErrors`
 * @cost           one streaming pass for each group, and O(T groups), O(T groups L) with lags
 * @example        groupErrors(returnsModel(Float64Array.of(.01, 0, -.02, .01, .01, -.01), 3, 2), Float64Array.of(.5, .5), Int32Array.of(0, 0), 1).share // [0]
 */
export function groupErrors(
  model: ReturnsModel,
  weights: Float64Array,
  groupOf: Int32Array,
  groups: number,
  lags = 0,
): StandardErrors {
  checkBlock(Float64Array.from(groupOf), model.size, 1, 'groups')
  const stray = groupOf.findIndex((group) => group < 0 || group >= groups)
  if (stray >= 0) {
    throw new Fault(
      'out-of-range',
      `groups: number ${groupOf[stray]}`,
      `a number from 0 to ${groups - 1} is needed`,
      { argument: 'groups', row: stray },
    )
  }
  const earned = new Float64Array(model.dates * groups)
  for (let group = 0; group < groups; group++) {
    const returns = model.portfolioReturns(weights.map((weight, i) => (groupOf[i] === group ? weight : 0)))
    for (let t = 0; t < model.dates; t++) earned[t * groups + group] = returns[t]!
  }
  const whole = new Float64Array(groups).fill(1)
  return standardErrors(returnsModel(earned, model.dates, groups, model.weighting), whole, lags)
}

/**
 * Standard errors of stand-alone risks |w_i| sigma_i: of the volatility of each position held alone, as `standardErrors` gives it.
 *
 * @returns        n; per period
 * @throws Fault   as `standardErrors`
 * @source         as `standardErrors`
 * @cost           O(T n), O(T n L) with lags
 * @example        standAloneErrors(returnsModel(Float64Array.of(.01, 0, -.02, .01, .01, -.01), 3, 2), Float64Array.of(.5, -.5)) // [0.00177, 0.00102]
 */
export function standAloneErrors(model: ReturnsModel, weights: Float64Array, lags = 0): Float64Array {
  checkBlock(weights, model.size, 1, 'weights')
  const { dates, size, weighting } = model
  const columns = new Float64Array(size * dates)
  const row = new Float64Array(size)
  for (let t = 0; t < dates; t++) {
    model.centredRow(t, row)
    for (let i = 0; i < size; i++) columns[i * dates + t] = row[i]!
  }
  const one = Float64Array.of(1)
  return weights.map((weight, i) => {
    const alone = returnsModel(columns.subarray(i * dates, (i + 1) * dates), dates, 1, weighting, 'plain')
    return Math.abs(weight) * standardErrors(alone, one, lags).volatility
  })
}

/**
 * Standard errors of differences between two shares of risk: shares whose difference is within RISK_BAND of its own
 * error cannot be told apart. The two move together, so their own errors do not give it.
 *
 *   u_t of the difference = u_t of p_i - u_t of p_j, as in `standardErrors`
 *
 * @param pairs   2 k; positions i and j of each pair, one pair after another
 * @returns       k, of p_i - p_j; null where there is no risk to share
 * @throws Fault  as `standardErrors` | "out-of-range" (a position that is not there)
 * @source        as `standardErrors`
 * @cost          O(T n) once and O(T) a pair, O(T L) with lags
 * @example       shareDifferences(returnsModel(Float64Array.of(.01, 0, -.02, .01, .01, -.01), 3, 2), Float64Array.of(.5, .5), Int32Array.of(0, 1)) // [0.70711]
 */
export function shareDifferences(
  model: ReturnsModel,
  weights: Float64Array,
  pairs: Int32Array,
  lags = 0,
): Float64Array | null {
  if (pairs.length % 2 !== 0) {
    throw new Fault('shape', `pairs: ${pairs.length} positions`, 'two are needed for each pair', {
      argument: 'pairs',
    })
  }
  const stray = pairs.findIndex((position) => position < 0 || position >= model.size)
  if (stray >= 0) {
    throw new Fault(
      'out-of-range',
      `pairs: position ${pairs[stray]}`,
      `a position from 0 to ${model.size - 1} is needed`,
      { argument: 'pairs', row: stray >> 1, column: stray & 1 },
    )
  }
  const portfolio = scaledPortfolio(model, weights, lags)
  return portfolio && squaresByDates(model, portfolio, pairs).share.map(Math.sqrt)
}

/** A portfolio scaled to v = 1, so that no power of its returns overflows or vanishes. */
interface ScaledPortfolio {
  readonly lags: number
  readonly omega: Float64Array
  /** s, unscaled */
  readonly volatility: number
  /** y_t / sqrt(v); T */
  readonly returns: Float64Array
  /** F y_t / sqrt(v); T, 0 without lags */
  readonly lagged: Float64Array
  /** w_i / sqrt(v); n */
  readonly scale: Float64Array
  /** (C w)_i / (correction sqrt(v)); n */
  readonly covariances: Float64Array
  /** p_i; n */
  readonly shares: Float64Array
  /** omega_t (u_t of v) / v; T */
  readonly ofVariance: Float64Array
}

/** Sums that are squared errors when multiplied by s^2 (contribution), s^2 / 4 (variance: of the volatility) or 1. */
interface Squares {
  readonly variance: number
  readonly contribution: Float64Array
  readonly share: Float64Array
}

function scaledPortfolio(model: ReturnsModel, weights: Float64Array, lags: number): ScaledPortfolio | null {
  checkLags(model, lags)
  const { rowWeights: omega } = model
  // figures with lagged terms take divisor T
  const correction = lags > 0 ? 1 : model.correction
  const marginals = new Float64Array(model.size)
  const returns = model.portfolioReturns(weights, marginals)
  const lagged = earlier(returns, lags)
  let variance = 0
  for (let t = 0; t < model.dates; t++) variance += omega[t]! * returns[t]! * (returns[t]! + 2 * lagged[t]!)
  // as a decomposition: digits that rounding made carry no information
  if (correction * variance <= roundingOfVariance(model, weights)) return null

  const perRoot = 1 / Math.sqrt(variance)
  const ofVariance = new Float64Array(model.dates)
  for (let t = 0; t < model.dates; t++) {
    const y = (returns[t]! *= perRoot)
    const before = (lagged[t]! *= perRoot)
    ofVariance[t] = omega[t]! * (y * (y + 2 * before) - 1)
  }
  if (lags > 0) {
    const later = earlier(returns.slice().reverse(), lags).reverse()
    model.weigh(
      returns.map((y, t) => omega[t]! * (y + lagged[t]! + later[t]!)),
      marginals,
    )
  } else {
    const perUnit = perRoot / correction
    for (let i = 0; i < marginals.length; i++) marginals[i]! *= perUnit
  }
  const scale = new Float64Array(model.size)
  const shares = new Float64Array(model.size)
  for (let i = 0; i < model.size; i++) {
    scale[i] = weights[i]! * perRoot
    shares[i] = scale[i]! * marginals[i]!
  }
  return {
    lags,
    omega,
    volatility: Math.sqrt(correction * variance),
    returns,
    lagged,
    scale,
    covariances: marginals,
    shares,
    ofVariance,
  }
}

function checkLags({ dates, weighting }: ReturnsModel, lags: number) {
  if (!Number.isInteger(lags) || lags < 0 || lags >= dates) {
    throw new Fault('out-of-range', `lags: ${lags}`, `a whole number from 0 to ${dates - 1} is needed`, {
      argument: 'lags',
    })
  }
  if (lags > 0 && weighting.kind === 'exponential') {
    throw new Fault(
      'unknown-choice',
      'lagged terms with exponentially weighted dates',
      'equally weighted dates are needed for lagged terms',
      { argument: 'lags' },
    )
  }
}

/** F x: the sum of kappa_k x_(t-k) over k = 1..L. */
function earlier(series: Float64Array, lags: number): Float64Array {
  const filtered = new Float64Array(series.length)
  for (let k = 1; k <= lags; k++) {
    const kappa = 1 - k / (lags + 1)
    for (let t = k; t < series.length; t++) filtered[t]! += kappa * series[t - k]!
  }
  return filtered
}

/**
 * Sum over |k| <= L of kappa_k sum_t e_t e_(t-k), as the sum of squares of all windows of L+1 dates, those that reach
 * over either end included, divided by L+1: the same number, never below zero.
 */
function longRunSquares(series: Float64Array, lags: number): number {
  if (lags === 0) return sumOfSquares(series)
  let window = 0
  let total = 0
  for (let t = 0; t < series.length + lags; t++) {
    window += series[t] ?? 0
    total += window * window
    window -= series[t - lags] ?? 0
  }
  return total / (lags + 1)
}

/** Without lags: u_t squared and multiplied out, so that one pass of sums serves all positions. */
function squaresBySums(model: ReturnsModel, portfolio: ScaledPortfolio): Squares {
  const { omega, returns: y, scale, covariances, shares } = portfolio
  // omega^2 times y, y^2 and y^3, and the sums over dates of y^2 and y^4
  const first = new Float64Array(model.dates)
  const second = new Float64Array(model.dates)
  const third = new Float64Array(model.dates)
  let sumOfSecond = 0
  let sumOfFourth = 0
  for (let t = 0; t < model.dates; t++) {
    const y1 = y[t]!
    first[t] = omega[t]! * omega[t]! * y1
    second[t] = first[t]! * y1
    third[t] = second[t]! * y1
    sumOfSecond += second[t]!
    sumOfFourth += third[t]! * y1
  }
  const { squares, sums: cubed } = model.squares(second, third)
  // omega^2 y z adds up to omega times a covariance where all omega are alike
  const alike = model.weighting.kind !== 'exponential'
  const single = alike ? covariances : model.weigh(first)
  const singleFactor = alike ? omega[0]! : 1
  const variance = varianceSquares(portfolio)

  const share = new Float64Array(model.size)
  const contribution = new Float64Array(model.size)
  for (let i = 0; i < model.size; i++) {
    const a = scale[i]!
    const p = shares[i]!
    // sum of (a z y - p y^2)^2 and of (a z y - p y^2)(y^2 - 1), each times omega^2
    const own = a * a * squares[i]! + p * p * sumOfFourth
    const floor = model.dates * Number.EPSILON * own
    const squared = unlessRounding(own - 2 * a * p * cubed[i]!, floor)
    const cross =
      squared === 0 ? 0 : a * (cubed[i]! - singleFactor * single[i]!) - p * (sumOfFourth - sumOfSecond)
    share[i] = squared
    contribution[i] = unlessRounding(squared + p * cross + (p * p * variance) / 4, squared === 0 ? 0 : floor)
  }
  return { variance, contribution, share }
}

/**
 * Influence values formed date by date: with lags the products of dates do not separate into sums, and neither do
 * differences of shares. Each pair of positions is one figure, p_i - p_j; position n is an empty one, of share 0.
 */
function squaresByDates(model: ReturnsModel, portfolio: ScaledPortfolio, pairs: Int32Array): Squares {
  const { lags, omega, returns, lagged, scale, shares, ofVariance } = portfolio
  const count = pairs.length / 2
  const column = () => new Float64Array(count)
  const rows = (length: number) => Array.from({ length }, column)
  const first = pairs.filter((_, k) => k % 2 === 0)
  const second = pairs.filter((_, k) => k % 2 === 1)
  const difference = column().map((_, k) => shares[first[k]!]! - (shares[second[k]!] ?? 0))
  const share = column()
  const contribution = column()
  const floor = column()
  const window = column()
  const entering = column()
  const before = column()
  // the last L rows of d and L+1 of influences, each written over when it is that old
  const earlierRows = rows(lags)
  const windowRows = rows(lags + 1)
  const z = new Float64Array(model.size + 1)
  const held = z.subarray(0, model.size)
  const rounding = (lags + 1) * model.dates * Number.EPSILON
  let windowOfVariance = 0

  for (let t = 0; t < model.dates + lags; t++) {
    if (t < model.dates) {
      // d_t = (w_i z_ti - p_i y_t) / sqrt(v), the same for j taken off; influences omega_t (d_t (y_t + F y_t) + y_t F d_t)
      model.centredRow(t, held)
      for (let i = 0; i < held.length; i++) held[i]! *= scale[i]!
      if (lags > 0) before.fill(0)
      for (let lag = 1; lag <= Math.min(lags, t); lag++) {
        const kappa = 1 - lag / (lags + 1)
        const row = earlierRows[(t - lag) % lags]!
        for (let k = 0; k < count; k++) before[k]! += kappa * row[k]!
      }
      const kept = earlierRows[t % lags]
      const y = returns[t]!
      const ofItself = omega[t]! * (y + lagged[t]!)
      const ofEarlier = omega[t]! * y
      const bound = rounding * omega[t]! * (Math.abs(y) + Math.abs(lagged[t]!))
      for (let k = 0; k < count; k++) {
        const a = z[first[k]!]!
        const b = z[second[k]!]!
        const c = difference[k]! * y
        const d = a - b - c
        entering[k] = d * ofItself + before[k]! * ofEarlier
        const noise = bound * (Math.abs(a) + Math.abs(b) + Math.abs(c))
        floor[k]! += noise * noise
        if (kept) kept[k] = d
      }
    } else {
      entering.fill(0)
    }
    const leaving = windowRows[t % (lags + 1)]!
    windowOfVariance = windowOfVariance - (ofVariance[t - lags - 1] ?? 0) + (ofVariance[t] ?? 0)
    for (let k = 0; k < count; k++) {
      const e = (window[k] = window[k]! - leaving[k]! + entering[k]!)
      const ofContribution = e + (difference[k]! / 2) * windowOfVariance
      share[k]! += e * e
      contribution[k]! += ofContribution * ofContribution
      leaving[k] = entering[k]!
    }
  }
  const finished = (sums: Float64Array) => sums.map((sum, k) => unlessRounding(sum / (lags + 1), floor[k]!))
  return {
    variance: varianceSquares(portfolio),
    contribution: finished(contribution),
    share: finished(share),
  }
}

/** Of the variance itself, scaled. */
function varianceSquares({ lags, omega, ofVariance }: ScaledPortfolio): number {
  const rounding = (lags + 1) * omega.length * Number.EPSILON
  let largest = 0
  for (let t = 0; t < omega.length; t++) {
    const bound = Math.abs(ofVariance[t]!) + omega[t]!
    largest += bound * bound
  }
  return unlessRounding(longRunSquares(ofVariance, lags), rounding * rounding * largest)
}

// Written out: beside a streaming pass a callback for every date would show.
function sumOfSquares(values: Float64Array): number {
  let sum = 0
  for (let t = 0; t < values.length; t++) sum += values[t]! * values[t]!
  return sum
}

/** Each position with the empty one. */
const eachAlone = (size: number) => Int32Array.from({ length: 2 * size }, (_, k) => (k & 1 ? size : k >> 1))

const unlessRounding = (square: number, floor: number): number => (square > floor ? square : 0)
