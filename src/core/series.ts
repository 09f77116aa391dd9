import gammainc from '@stdlib/math-base-special-gammainc'
import normalQuantile from '@stdlib/stats-base-dists-normal-quantile'
import { RISK_BAND } from './band'
import { Fault } from './fault'
import type { Run } from './runs'

// Statistics of one series at a time, for looking at data before anything is computed from them. NaN marks a gap. What a series does
// not define (a correlation of something that never moves) is null: looking at bad data must not stop at the first bad series.

/** A correlation over time, with what chance alone makes of one. */
export interface SerialCorrelation {
  readonly value: number
  /** Pairs of dates it was taken over. */
  readonly pairs: number
  /** Of independent series 95 in 100 stay within this of 0: 1.96 / sqrt(observations). */
  readonly band: number
  /** The same for returns whose volatility comes and goes, which independence at one volatility takes for correlation. */
  readonly robustBand: number
}

/**
 * Autocorrelation of a series.
 *
 *   r_k = sum_t (x_t - m)(x_(t-k) - m) / sum_t (x_t - m)^2,   both sums undivided (the divisor T of both cancels)
 *   band 1.96 / sqrt(N);  robust band 1.96 sqrt( sum_t (x_t - m)^2 (x_(t-k) - m)^2 ) / sum_t (x_t - m)^2
 *
 * A pair with a gap in it counts as no deviation, which pulls r_k toward 0 by about the share of gaps and keeps it within 1.
 *
 * @param x      T; NaN where there is a gap
 * @param lag    whole number from 1
 * @returns      null where nothing moves or no pair is left
 * @throws Fault "out-of-range" (lag) | "not-a-number" (an infinite number, with its row)
 * @source       Box & Jenkins (1976), Time Series Analysis, section 2.1.5; gaps: Parzen (1963), Sankhya A 25(4), 383-392; band: Bartlett
 *               (1946), JRSS Supplement 8(1), 27-41; robust: Lo & MacKinlay (1988), RFS 1(1), 41-66, the delta of section 1.2 (all from memory)
 * @cost         O(T)
 * @example      autocorrelation(Float64Array.of(1, 2, 3, 4, 5), 1) // {"value": 0.4, "pairs": 4, "band": 0.8765}
 * @example      autocorrelation(Float64Array.of(1, 1, 1), 1) // null
 */
export function autocorrelation(x: Float64Array, lag: number): SerialCorrelation | null {
  checkLag(lag, 1)
  return laggedCorrelation(x, x, lag)
}

/**
 * Correlation of one series with another one `lag` dates later. Markets that close at different times show it at lag 1 in one of the two
 * directions, and their correlation on the same date is then understated.
 *
 *   r_k = sum_t (x_t - m_x)(y_(t+k) - m_y) / sqrt( sum_t (x_t - m_x)^2 sum_t (y_t - m_y)^2 )
 *
 * Over the dates from where both series have begun to where one of them ends; gaps within, and the bands, as for `autocorrelation`.
 *
 * @param x      T; NaN where there is a gap
 * @param y      T; likewise
 * @param lag    whole number; above 0: x leads, below 0: y leads
 * @returns      null where one of them does not move or no pair is left
 * @throws Fault "shape" | "out-of-range" (lag) | "not-a-number" (an infinite number, with its row)
 * @source       Box & Jenkins (1976), Time Series Analysis, section 11.1.2; band: Haugh (1976), JASA 71, 378-385 (from memory); that closing times
 *               show so: Burns, Engle & Mezrich (1998), Correlations and Volatilities of Asynchronous Data, J. of Derivatives 5(4)
 * @cost         O(T)
 * @example      laggedCrossCorrelation(Float64Array.of(1, -1, 2, 0), Float64Array.of(0, 1, -1, 2), 1).value // 0.95
 */
export function laggedCrossCorrelation(
  x: Float64Array,
  y: Float64Array,
  lag: number,
): SerialCorrelation | null {
  if (x.length !== y.length) {
    throw new Fault(
      'shape',
      `series of ${x.length} and of ${y.length} dates`,
      'two series on the same dates are needed',
      { argument: 'returns' },
    )
  }
  checkLag(lag, -Infinity)
  return laggedCorrelation(x, y, lag)
}

function laggedCorrelation(x: Float64Array, y: Float64Array, lag: number): SerialCorrelation | null {
  const [from, to] = commonSpan(x, y)
  const a = deviations(x.subarray(from, to))
  const b = x === y ? a : deviations(y.subarray(from, to))
  return a && b && correlationOf(a, b, lag)
}

function correlationOf(a: Deviations, b: Deviations, lag: number): SerialCorrelation | null {
  let products = 0
  let squares = 0
  let pairs = 0
  for (let t = Math.max(0, -lag); t + Math.max(0, lag) < a.values.length; t++) {
    const product = a.values[t]! * b.values[t + lag]!
    if (Number.isNaN(product)) continue
    products += product
    squares += product * product
    pairs++
  }
  if (pairs === 0) return null
  const scale = Math.sqrt(a.squares) * Math.sqrt(b.squares)
  return {
    value: products / scale,
    pairs,
    band: RISK_BAND / Math.sqrt(Math.sqrt(a.count * b.count)),
    robustBand: (RISK_BAND * Math.sqrt(squares)) / scale,
  }
}

/** First row, and the row after the last, where both series have an observation on or before and on or after. */
function commonSpan(x: Float64Array, y: Float64Array): [number, number] {
  checkFinite(x)
  checkFinite(y)
  let from = 0
  let to = x.length
  for (const series of [x, y]) {
    let first = 0
    let end = series.length
    while (first < end && Number.isNaN(series[first])) first++
    while (end > first && Number.isNaN(series[end - 1])) end--
    from = Math.max(from, first)
    to = Math.min(to, end)
  }
  return [from, Math.max(from, to)]
}

interface Deviations {
  /** x_t - m; NaN at gaps */
  readonly values: Float64Array
  readonly count: number
  /** Sum of squares */
  readonly squares: number
}

/** Deviations from the mean; null where there are none. */
function deviations(x: Float64Array): Deviations | null {
  const observed = x.filter((value) => !Number.isNaN(value))
  // not left to the sum of squares: the mean of equal numbers may round to another one
  if (observed.every((value) => value === observed[0])) return null
  // the mean, then the mean of what is left, which rounding hid from the first
  let mean = 0
  let rest = 0
  for (const value of observed) mean += value / observed.length
  for (const value of observed) rest += (value - mean) / observed.length
  const values = x.map((value) => value - mean - rest)
  let squares = 0
  for (const value of values) if (!Number.isNaN(value)) squares += value * value
  return { values, count: observed.length, squares }
}

/**
 * The standard error of a correlation over time by whichever of its two bands is the wider: both allow for chance, and the wider one is the careful
 * one.
 *
 * @example carefulError({ value: .3, pairs: 99, band: .196, robustBand: .294 }) // 0.15
 */
export const carefulError = ({ band, robustBand }: SerialCorrelation): number =>
  Math.max(band, robustBand) / RISK_BAND

/**
 * How many standard errors from 0 so many normal estimates all stay within, with a probability of at least 1 - chance: each gets an equal part of
 * the chance, whatever ties the estimates together.
 *
 *   the normal quantile at 1 - chance / (2 count)
 *
 * @param count    whole number from 1
 * @param chance   above 0, below 1
 * @throws Fault   "out-of-range"
 * @source         the inequality of Bonferroni; Dunn (1961), Multiple Comparisons Among Means, JASA 56, 52-64 (from memory)
 * @example        jointLimit(1, .05) // 1.959964
 * @example        jointLimit(6, .01) // 3.1440
 */
export function jointLimit(count: number, chance: number): number {
  checkWhole(count, 1, 'count', 'such as 10')
  if (!(chance > 0 && chance < 1)) {
    throw new Fault('out-of-range', `chance ${chance}`, 'a number between 0 and 1 is needed, such as 0.01', {
      argument: 'chance',
    })
  }
  return normalQuantile(1 - chance / 2 / count, 0, 1)
}

/** The outcome of a test: what was measured, and how often chance alone reaches that. */
export interface TestResult {
  readonly statistic: number
  /** Probability of a statistic this large or larger where what is tested holds. */
  readonly pValue: number
}

/**
 * Whether the first autocorrelations together are more than chance: Q = N (N + 2) sum_k r_k^2 / (N - k), chi-square with `lags` degrees.
 *
 * @param x      T; NaN where there is a gap (see `autocorrelation`)
 * @param lags   whole number from 1; how many autocorrelations are tested together
 * @returns      null where the series does not move or has no more than `lags` observations
 * @throws Fault "out-of-range" (lags) | "not-a-number" (an infinite number, with its row)
 * @source       Ljung & Box (1978), On a Measure of Lack of Fit in Time Series Models, Biometrika 65(2), 297-303 (from memory)
 * @cost         O(T lags)
 * @example      ljungBox(Float64Array.of(1, 2, 3, 4, 5), 1) // {"statistic": 1.4, "pValue": 0.2367}
 */
export function ljungBox(x: Float64Array, lags: number): TestResult | null {
  checkLag(lags, 1)
  const [from, to] = commonSpan(x, x)
  const moved = deviations(x.subarray(from, to))
  if (moved === null || moved.count <= lags) return null
  const { count } = moved
  let sum = 0
  for (let lag = 1; lag <= lags; lag++) {
    const r = correlationOf(moved, moved, lag)
    if (r === null) return null
    sum += r.value ** 2 / (count - lag)
  }
  const statistic = count * (count + 2) * sum
  return { statistic, pValue: gammainc(statistic / 2, lags / 2, true, true) }
}

/** Centre and width of a series that single wild values cannot move. */
export interface RobustScale {
  readonly median: number
  /** 1.4826 x the median distance from the median: the standard deviation, were the series normal. 0 where nothing moves. */
  readonly scale: number
  /** Observations. */
  readonly count: number
  /**
   * What the scale was taken over: "all" observations, or only the "moving" ones, those that are not the median itself. The latter where more
   * than half of a series is one number (a stale price), which leaves the usual scale at 0.
   */
  readonly basis: 'all' | 'moving'
}

/** 1 / normal quantile at 75%: makes the median distance of a normal series its standard deviation. */
const PER_MEDIAN_DISTANCE = 1 / normalQuantile(0.75, 0, 1)

/**
 * Median and scaled median absolute deviation.
 *
 * @param x      T; NaN where there is a gap
 * @returns      null where there are no observations
 * @throws Fault "not-a-number" (an infinite number, with its row)
 * @source       Hampel (1974), The Influence Curve and its Role in Robust Estimation, JASA 69, 383-393 (from memory); the fallback to moving
 *               observations: common practice, no source
 * @cost         O(T log T)
 * @example      robustScale(Float64Array.of(1, 2, 3, 4, 100)) // {"median": 3, "scale": 1.4826, "count": 5, "basis": "all"}
 * @example      robustScale(Float64Array.of(0, 0, 0, 0, .1, -.2)) // {"median": 0, "scale": 0.2224, "basis": "moving"}
 */
export function robustScale(x: Float64Array): RobustScale | null {
  checkFinite(x)
  const observed = x.filter((value) => !Number.isNaN(value))
  if (observed.length === 0) return null
  const median = medianOf(observed)
  const distances = observed.map((value) => Math.abs(value - median))
  const usual = medianOf(distances)
  const moving = distances.filter((distance) => distance > 0)
  const basis = usual === 0 && moving.length > 0 ? 'moving' : 'all'
  const distance = basis === 'moving' ? medianOf(moving) : usual
  return { median, scale: distance * PER_MEDIAN_DISTANCE, count: observed.length, basis }
}

function medianOf(values: Float64Array): number {
  const sorted = values.slice().sort()
  const middle = sorted.length >> 1
  // halves before the sum: two numbers near the largest double
  return sorted.length % 2 === 1 ? sorted[middle]! : sorted[middle - 1]! / 2 + sorted[middle]! / 2
}

/** Observations far out, by rows in order. */
export interface Outliers {
  /** null where there are no observations. */
  readonly scale: RobustScale | null
  readonly rows: Int32Array
  /** How many scales each lies from the median, with its sign. */
  readonly multiples: Float64Array
}

/**
 * Observations that lie more than so many robust scales from the median. Finds; removes nothing.
 *
 * @param x        T; NaN where there is a gap
 * @param multiple above 0; of the scale
 * @returns        none where the scale is 0
 * @throws Fault   "out-of-range" (multiple) | "not-a-number" (an infinite number, with its row)
 * @source         Iglewicz & Hoaglin (1993), How to Detect and Handle Outliers (from memory)
 * @cost           O(T log T)
 * @example        outliers(Float64Array.of(1, 2, 3, 4, 100), 10) // {"rows": [4], "multiples": [65.43]}
 */
export function outliers(x: Float64Array, multiple: number): Outliers {
  if (!(multiple > 0)) {
    throw new Fault('out-of-range', `multiple ${multiple}`, 'a number above 0 is needed, such as 8', {
      argument: 'multiple',
    })
  }
  const scale = robustScale(x)
  if (scale === null || scale.scale === 0) {
    return { scale, rows: new Int32Array(0), multiples: new Float64Array(0) }
  }
  const all = x.map((value) => (value - scale.median) / scale.scale)
  const rows = Array.from(all.keys()).filter((t) => Math.abs(all[t]!) > multiple)
  return { scale, rows: Int32Array.from(rows), multiples: Float64Array.from(rows, (t) => all[t]!) }
}

/**
 * By how much a volatility grows over so many periods when returns are autocorrelated: sqrt(q) where they are not.
 *
 *   sqrt( q + 2 sum_(k=1..q-1) (q - k) rho_k )
 *
 * @param autocorrelations rho_1, rho_2, …; those beyond the last one given are taken as 0, those from q on do not count
 * @param periods          q; whole number from 1
 * @returns                volatility over q periods / volatility over one, for returns that add up (logarithmic)
 * @throws Fault           "out-of-range" (periods; an autocorrelation beyond 1) | "negative-variance" (autocorrelations no series can have)
 * @source                 Lo (2002), The Statistics of Sharpe Ratios, FAJ 58(4), 36-52 (formula from memory)
 * @cost                   O(q)
 * @example                scalingFactor(Float64Array.of(.2, .04, .008), 4) // 2.3186
 */
export function scalingFactor(autocorrelations: Float64Array, periods: number): number {
  checkWhole(periods, 1, 'periods', 'such as 12')
  let variance = periods
  for (let k = 1; k < Math.min(periods, autocorrelations.length + 1); k++) {
    const rho = autocorrelations[k - 1]!
    if (!(Math.abs(rho) <= 1)) {
      throw new Fault('out-of-range', `autocorrelation ${rho}`, 'a number from -1 to 1 is needed', {
        argument: 'autocorrelations',
        row: k - 1,
      })
    }
    variance += 2 * (periods - k) * rho
  }
  // below 0 by no more than rounding is 0
  if (variance < -(periods ** 2) * Number.EPSILON) {
    throw new Fault(
      'negative-variance',
      `over ${periods} periods these autocorrelations would give a variance of ${variance.toPrecision(3)}`,
      'autocorrelations of one series are needed',
      { argument: 'autocorrelations' },
    )
  }
  return Math.sqrt(Math.max(0, variance))
}

/**
 * The volatility behind smoothed returns over that of the returns themselves (see `unsmoothedVolatility`): sqrt( (1 + rho) / (1 - rho) ).
 *
 * @param rho    the share of the last reported return in each; above -1, below 1
 * @throws Fault "out-of-range"
 * @source       as for `unsmoothedVolatility`
 * @example      unsmoothingFactor(.6) // 2
 */
export function unsmoothingFactor(rho: number): number {
  checkSmoothing(rho)
  return Math.sqrt((1 + rho) / (1 - rho))
}

/**
 * Returns without smoothing, where each reported one takes a share rho of the one reported before.
 *
 *   u_t = (r_t - rho r_(t-1)) / (1 - rho)
 *
 * @param x      T; NaN where there is a gap
 * @param rho    above -1, below 1
 * @returns      T; NaN for the first one, at gaps and on the date after one
 * @throws Fault "out-of-range" (rho)
 * @source       Geltner (1993), J. of Real Estate Research 8(3), 325-345 (from memory)
 * @cost         O(T)
 * @example      unsmoothedReturns(Float64Array.of(.02, .01, .03), .5) // [NaN, 0, 0.05]
 */
export function unsmoothedReturns(x: Float64Array, rho: number): Float64Array {
  checkSmoothing(rho)
  return x.map((value, t) => (t === 0 ? NaN : (value - rho * x[t - 1]!) / (1 - rho)))
}

function checkSmoothing(rho: number): void {
  if (Math.abs(rho) < 1) return
  throw new Fault('out-of-range', `rho ${rho}`, 'a number between -1 and 1 is needed, such as 0.3', {
    argument: 'rho',
  })
}

/** A volatility per period as it is reported and as it would be without smoothing. */
export interface UnsmoothedVolatility {
  /** Standard deviation as reported, divisor N - 1. */
  readonly volatility: number
  /** Without the smoothing; null where the first autocorrelation is not above 0, so that nothing looks smoothed. */
  readonly unsmoothed: number | null
  /** unsmoothed / volatility */
  readonly factor: number | null
  readonly autocorrelation: SerialCorrelation
}

/**
 * The volatility behind returns that were smoothed by appraisal or by old prices. Where each reported return takes a share 1 - rho of the
 * true one and rho of the last reported one, r_t = (1 - rho) u_t + rho r_(t-1) with u_t independent, then
 *
 *   var(r) (1 - rho^2) = (1 - rho)^2 var(u),   so   sd(u) = sd(r) sqrt(1 - rho^2) / (1 - rho) = sd(r) sqrt( (1 + rho) / (1 - rho) )
 *
 * with rho the first autocorrelation. It says nothing of whether rho is more than chance: compare it with its band.
 *
 * @param x      T; NaN where there is a gap
 * @returns      null where the series does not move
 * @throws Fault "not-a-number" (an infinite number, with its row)
 * @source       Geltner (1993), Estimating Market Values from Appraised Values without Assuming an Efficient Market, J. of Real Estate
 *               Research 8(3), 325-345; the model of smoothing: Getmansky, Lo & Makarov (2004), JFE 74(3), 529-609 (both from memory; the
 *               ratio of deviations is derived here from the first)
 * @cost         O(T)
 * @example      unsmoothedVolatility(Float64Array.of(1, 2, 3, 4, 5)) // {"volatility": 1.5811, "unsmoothed": 2.4152, "factor": 1.5275}
 */
export function unsmoothedVolatility(x: Float64Array): UnsmoothedVolatility | null {
  const correlation = autocorrelation(x, 1)
  const moved = deviations(x)
  if (correlation === null || moved === null) return null
  const volatility = Math.sqrt(moved.squares / (moved.count - 1))
  const rho = correlation.value
  const factor = rho > 0 && rho < 1 ? unsmoothingFactor(rho) : null
  return { volatility, unsmoothed: factor && factor * volatility, factor, autocorrelation: correlation }
}

/** A ratio at which shares are exchanged. */
export interface SplitRatio {
  /** So many new shares … */
  readonly fresh: number
  /** … for so many old ones. */
  readonly old: number
  /** How far the price is from where the split alone would have put it: a return, with its sign. */
  readonly rest: number
}

const SPLITS: readonly (readonly [fresh: number, old: number])[] = [
  [4, 3],
  [3, 2],
  [5, 2],
  ...[2, 3, 4, 5, 6, 7, 8, 10, 15, 20, 25, 30, 40, 50, 100].map((k) => [k, 1] as const),
]

/**
 * Whether one change of a price looks like a split that was not adjusted for, or like shares put together.
 *
 * @param change    of the price: new / old - 1, above -1
 * @param tolerance how far, as a return, the price may be from what the split alone makes of it; default 0.02
 * @returns         the nearest common ratio; null where none is near
 * @throws Fault    "out-of-range" (a change of -1 or less; a tolerance below 0)
 * @source          common practice, no source
 * @example         splitRatio(-.495) // {"fresh": 2, "old": 1, "rest": 0.01}
 * @example         splitRatio(9) // {"fresh": 1, "old": 10}
 * @example         splitRatio(-.1) // null
 * @example         splitRatio(1 / 3) // null
 */
export function splitRatio(change: number, tolerance = 0.02): SplitRatio | null {
  if (!(change > -1 && Number.isFinite(change))) {
    throw new Fault('out-of-range', `change of ${change}`, 'a change above -1 is needed', {
      argument: 'change',
    })
  }
  if (!(tolerance >= 0)) {
    throw new Fault('out-of-range', `tolerance ${tolerance}`, 'a number from 0 is needed, such as 0.02', {
      argument: 'tolerance',
    })
  }
  const candidates = SPLITS.flatMap(([fresh, old]) => [
    { fresh, old, rest: ((1 + change) * fresh) / old - 1 },
    // shares are put together many for one: a jump of a third is a price, not a merger of four into three
    ...(old === 1 ? [{ fresh: old, old: fresh, rest: ((1 + change) * old) / fresh - 1 }] : []),
  ])
  const nearest = candidates.reduce((best, candidate) =>
    Math.abs(candidate.rest) < Math.abs(best.rest) ? candidate : best,
  )
  return Math.abs(nearest.rest) <= tolerance ? nearest : null
}

/** How dates follow one another, by the calendar days from one to the next. */
export type Frequency = 'daily' | 'weekly' | 'monthly' | 'quarterly' | 'yearly' | 'other'

/** The steps from date to date. */
export interface FrequencySteps {
  /** Steps that occur, in days, ascending; 0: a date twice, below 0: dates out of order. */
  readonly steps: Float64Array
  /** How often each occurs. */
  readonly counts: Int32Array
  /** Of most steps; the faster one of two that are even. */
  readonly usual: Frequency
  /** The longest run of steps of one other frequency, by the row of the date it starts from: three in a row are no holiday. Null: none. */
  readonly other: (Run & { readonly frequency: Frequency }) | null
}

/** Calendar days up to which a step is of a frequency: bank holidays lengthen a daily step to 4 or 5, a monthly one counts business ends. */
const FREQUENCIES: readonly (readonly [Frequency, from: number, to: number])[] = [
  ['daily', 1, 5],
  ['weekly', 6, 9],
  ['monthly', 25, 36],
  ['quarterly', 85, 98],
  ['yearly', 355, 375],
]

/**
 * The steps between dates, so that dates out of order, dates twice and mixed frequencies show.
 *
 * @param dates  T; serial numbers of days, as they stand
 * @throws Fault "too-few" (fewer than 2) | "not-a-number" (with its row)
 * @source       common practice, no source
 * @cost         O(T + s log s), s the number of different steps
 * @example      frequencySteps(Float64Array.of(1, 2, 5, 6, 7)) // {"steps": [1, 3], "counts": [3, 1], "usual": "daily", "other": null}
 * @example      frequencySteps(Float64Array.of(0, 31, 59, 60, 61, 62, 63)).other // {"frequency": "monthly", "start": 0, "length": 2}
 */
export function frequencySteps(dates: Float64Array): FrequencySteps {
  if (dates.length < 2) {
    throw new Fault(
      'too-few',
      `dates: ${dates.length === 1 ? '1 date' : 'none'}`,
      'at least 2 dates are needed',
      {
        argument: 'dates',
      },
    )
  }
  dates.forEach((date, row) => {
    if (!Number.isFinite(date)) {
      throw new Fault('not-a-number', `dates: ${date}`, 'a date is needed', { argument: 'dates', row })
    }
  })
  const steps = dates.subarray(1).map((date, t) => date - dates[t]!)
  const counts = new Map<number, number>()
  for (const step of steps) counts.set(step, (counts.get(step) ?? 0) + 1)
  const sorted = Float64Array.from(counts.keys()).sort()

  const frequencies = Array.from(steps, frequencyOf)
  const votes = [...FREQUENCIES.map(([name]) => name), 'other' as const].map((name) => ({
    name,
    count: frequencies.filter((frequency) => frequency === name).length,
  }))
  const usual = votes.reduce((most, vote) => (vote.count > most.count ? vote : most)).name
  let other: FrequencySteps['other'] = null
  for (let t = 0; t < frequencies.length; t++) {
    const frequency = frequencies[t]!
    const start = t
    while (t + 1 < frequencies.length && frequencies[t + 1] === frequency) t++
    const length = t + 1 - start
    if (frequency !== usual && length > (other?.length ?? 0)) other = { frequency, start, length }
  }
  return {
    steps: sorted,
    counts: Int32Array.from(sorted, (step) => counts.get(step)!),
    usual,
    other,
  }
}

function frequencyOf(step: number): Frequency {
  return FREQUENCIES.find(([, from, to]) => step >= from && step <= to)?.[0] ?? 'other'
}

function checkLag(lag: number, least: number): void {
  checkWhole(lag, least, 'lag', 'such as 1')
}

function checkWhole(value: number, least: number, argument: string, example: string): void {
  if (Number.isInteger(value) && value >= least) return
  const from = Number.isFinite(least) ? ` from ${least}` : ''
  throw new Fault('out-of-range', `${argument} ${value}`, `a whole number${from} is needed, ${example}`, {
    argument,
  })
}

/** Gaps are fine, infinite numbers are not. */
function checkFinite(x: Float64Array): void {
  const row = x.findIndex((value) => value === Infinity || value === -Infinity)
  if (row >= 0) {
    throw new Fault(
      'not-a-number',
      `returns: ${x[row]}`,
      'a finite number is needed, or NaN where there is a gap',
      {
        argument: 'returns',
        row,
      },
    )
  }
}
