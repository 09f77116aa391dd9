import gammainc from '@stdlib/math-base-special-gammainc'
import binomialCdf from '@stdlib/stats-base-dists-binomial-cdf'
import normalQuantile from '@stdlib/stats-base-dists-normal-quantile'
import { RISK_BAND } from './band'
import { estimateModel, type Estimator } from './estimate'
import { checkBlock, Fault } from './fault'
import { momentsOf } from './moments'
import { returnsModel } from './risk-model'
import type { TestResult } from './series'
import { shrinkageOf, shrunkModel } from './shrinkage'
import { partOf } from './steps'

/** Days on which a loss went beyond the value at risk, and what that says of the forecasts. */
export interface ExceptionTests {
  /** T */
  readonly dates: number
  readonly confidence: number
  /** x */
  readonly exceptions: number
  /** T p, p = 1 - confidence */
  readonly expected: number
  /** x / T */
  readonly rate: number
  /** Whether the number fits the confidence (Kupiec): chi-square with 1 degree. */
  readonly coverage: TestResult
  /** The numbers of exceptions that `coverage` does not reject at 5%, ends included. */
  readonly accepted: { readonly fewest: number; readonly most: number }
  /** How well `coverage` at 5% sees through forecasts whose exceptions are twice as frequent as they should be. */
  readonly power: {
    /** 2 p */
    readonly rate: number
    /** Probability that the test rejects them. */
    readonly detected: number
    /** Probability that they pass: 1 - detected. */
    readonly missed: number
  }
  /** The T - 1 steps from one date to the next: how many led from quiet to exception, and so on. */
  readonly steps: {
    readonly quietToQuiet: number
    readonly quietToException: number
    readonly exceptionToQuiet: number
    readonly exceptionToException: number
  }
  /** Whether exceptions come independently of one another (Christoffersen): chi-square with 1 degree. */
  readonly independence: TestResult
  /** Both at once: the sum of the statistics, chi-square with 2 degrees. */
  readonly conditionalCoverage: TestResult
  readonly zone: BaselZone
}

/** Where a count of exceptions falls by the rule of the Basel Committee. */
export interface BaselZone {
  readonly zone: 'green' | 'amber' | 'red'
  /** Fewest exceptions of the amber zone: that many or fewer have a probability of 95% or more; at least 1. */
  readonly amberFrom: number
  /** Fewest exceptions of the red zone: that many or fewer have a probability of 99.99% or more. */
  readonly redFrom: number
  /** Probability of so many exceptions or fewer where the confidence holds. */
  readonly cumulative: number
  /** What the standard adds to its multiplier of 1.5; null unless over 250 dates at 99%, where alone it says so. */
  readonly addOn: number | null
}

/**
 * Tests of a record of exceptions.
 *
 *   p = 1 - confidence (rounded to 10 digits),  T dates,  x exceptions,  n_ab steps from state a to b,  0 ln 0 = 0
 *   coverage       -2 ln[ (1-p)^(T-x) p^x / ((1-x/T)^(T-x) (x/T)^x) ]
 *   independence   -2 ln[ (1-q)^(n00+n10) q^(n01+n11) / ((1-q0)^n00 q0^n01 (1-q1)^n10 q1^n11) ],
 *                  q0 = n01/(n00+n01), q1 = n11/(n10+n11), q = (n01+n11)/(T-1); 0 where no step starts from one of the two states
 *   conditional    coverage + independence; coverage is over all T dates, so that the sum is not quite the likelihood ratio of
 *                  the T - 1 steps
 *
 * The test of the coverage is two-sided, also where a table of it prints no lower bound: 0 exceptions in 255 dates at 99% are rejected.
 *
 * @param exceptions T; 1 for an exception, else 0, oldest date first
 * @param confidence in (0.5, 1), such as 0.99
 * @throws Fault     "too-few" (no date) | "out-of-range" (confidence; neither 0 nor 1, with its row)
 * @source           Kupiec (1995), Techniques for Verifying the Accuracy of Risk Measurement Models, J. of Derivatives 3(2), 73-84;
 *                   Christoffersen (1998), Evaluating Interval Forecasts, International Economic Review 39(4), 841-862 (formula read in
 *                   secondary text); Basel Committee, MAR32 (2019), paragraph 32.9, Table 1; zones elsewhere: the same probabilities
 * @cost             O(T)
 * @example          exceptionTests(Uint8Array.of(0, 1, 0, 0, 0, 0, 0, 0, 0, 0), .95).coverage // {"statistic": 0.4131, "pValue": 0.5204}
 */
export function exceptionTests(exceptions: Uint8Array, confidence: number): ExceptionTests {
  const p = tailOf(confidence)
  const dates = exceptions.length
  if (dates === 0) {
    throw new Fault('too-few', 'exceptions: no date', 'at least 1 date is needed', { argument: 'exceptions' })
  }
  // n[a][b] as n[2 a + b]
  const n = [0, 0, 0, 0]
  let x = 0
  exceptions.forEach((exception, row) => {
    if (exception > 1) {
      throw new Fault('out-of-range', `exceptions: ${exception}`, '1 for an exception, else 0, is needed', {
        argument: 'exceptions',
        row,
      })
    }
    x += exception
    if (row > 0) n[2 * exceptions[row - 1]! + exception]!++
  })
  const [n00, n01, n10, n11] = n as [number, number, number, number]

  const coverage = coverageStatistic(x, dates, p)
  const independence =
    n00 + n01 === 0 || n10 + n11 === 0
      ? 0
      : excess(n01, n00, (n01 + n11) / (dates - 1)) + excess(n11, n10, (n01 + n11) / (dates - 1))

  // the 5% point of chi-square with 1 degree is the square of the normal one
  const critical = RISK_BAND ** 2
  let fewest = Math.round(dates * p)
  let most = fewest
  while (fewest > 0 && coverageStatistic(fewest - 1, dates, p) <= critical) fewest--
  while (most < dates && coverageStatistic(most + 1, dates, p) <= critical) most++
  const missed = binomialCdf(most, dates, 2 * p) - (fewest > 0 ? binomialCdf(fewest - 1, dates, 2 * p) : 0)

  return {
    dates,
    confidence,
    exceptions: x,
    expected: dates * p,
    rate: x / dates,
    coverage: chiSquare(coverage, 1),
    accepted: { fewest, most },
    power: { rate: 2 * p, detected: 1 - missed, missed },
    steps: {
      quietToQuiet: n00,
      quietToException: n01,
      exceptionToQuiet: n10,
      exceptionToException: n11,
    },
    independence: chiSquare(independence, 1),
    conditionalCoverage: chiSquare(coverage + independence, 2),
    zone: zoneOf(x, dates, p),
  }
}

const coverageStatistic = (x: number, dates: number, p: number) => excess(x, dates - x, p)

/**
 * Twice the log likelihood that x hits and y misses gain when their own rate replaces the rate q:
 * 2 x ln(x / (n q)) + 2 y ln(y / (n (1 - q))), n = x + y. Never below 0 but for rounding.
 */
function excess(x: number, y: number, q: number): number {
  const term = (count: number, rate: number) => (count === 0 ? 0 : count * Math.log(count / ((x + y) * rate)))
  return Math.max(0, 2 * (term(x, q) + term(y, 1 - q)))
}

function chiSquare(statistic: number, degrees: number): TestResult {
  return { statistic, pValue: gammainc(statistic / 2, degrees / 2, true, true) }
}

/** MAR32, Table 1: what 5, 6, … exceptions in 250 dates at 99% add. */
const ADD_ONS = [0.2, 0.26, 0.33, 0.38, 0.42, 0.5]

function zoneOf(x: number, dates: number, p: number): BaselZone {
  const first = (probability: number, from: number) => {
    let count = from
    while (binomialCdf(count, dates, p) < probability) count++
    return count
  }
  // below its mean no count is nearly so probable; of a few dates 0 exceptions are, and no zone but the green one starts at none
  const amberFrom = first(0.95, Math.max(1, Math.floor(dates * p)))
  const redFrom = first(0.9999, amberFrom)
  return {
    zone: x >= redFrom ? 'red' : x >= amberFrom ? 'amber' : 'green',
    amberFrom,
    redFrom,
    cumulative: binomialCdf(x, dates, p),
    addOn: dates === 250 && p === 0.01 ? (x < 5 ? 0 : ADD_ONS[Math.min(x, 10) - 5]!) : null,
  }
}

/** How a forecast of volatility did: returns in units of what was forecast should have a standard deviation of 1. */
export interface BiasStatistic {
  /** Scores counted. */
  readonly dates: number
  /** Dates left out because they have no score: no return, no forecast, or a forecast of 0. */
  readonly omitted: number
  /** Standard deviation of the scores, divisor n - 1; above 1: risk was understated. */
  readonly value: number
  /** Mean of the scores. */
  readonly mean: number
  /** Fourth moment over the squared variance, divisor n; 3 where normal, null where scores never differ. */
  readonly kurtosis: number | null
  /** Where the value lies 95 times in 100 when forecasts are right and scores normal: 1 -+ sqrt(2/n). */
  readonly band: Band
  /** The same for scores with tails as these have: 1 -+ 1.96 sqrt((kurtosis - 1) / (4 n)). */
  readonly robustBand: Band | null
}

export type Band = readonly [from: number, to: number]

/**
 * The bias statistic of standardised returns z_t = r_t / forecast volatility.
 *
 * Its second band follows from the standard error of a variance, sqrt((m4 - m2^2)/n), by the delta method.
 *
 * @param standardised  T; NaN where a date has no score
 * @throws Fault        "too-few" (fewer than 2 scores) | "not-a-number" (an infinite score, with its row)
 * @source              band sqrt(2/n): common practice, no source; standard error of a variance: Kendall & Stuart, The Advanced Theory of
 *                      Statistics, vol. 1, chapter 10 (from memory)
 * @cost                O(T)
 * @example             biasStatistic(Float64Array.of(1, -1, 2, -2)) // {"value": 1.8257, "mean": 0, "band": [0.2929, 1.7071]}
 */
export function biasStatistic(standardised: Float64Array): BiasStatistic {
  const infinite = standardised.findIndex((score) => Math.abs(score) === Infinity)
  if (infinite >= 0) {
    throw new Fault(
      'not-a-number',
      `standardised returns: ${standardised[infinite]}`,
      'a finite number is needed, or NaN where a date has no score',
      { argument: 'standardised', row: infinite },
    )
  }
  const scores = standardised.filter((score) => !Number.isNaN(score))
  const n = scores.length
  if (n < 2) {
    throw new Fault(
      'too-few',
      `standardised returns: ${n}`,
      'at least 2 dates with a forecast and a return are needed',
      { argument: 'standardised' },
    )
  }
  const { mean, variance, excessKurtosis } = momentsOf(scores)
  const around = (half: number): Band => [1 - half, 1 + half]
  return {
    dates: n,
    omitted: standardised.length - n,
    value: Math.sqrt((variance * n) / (n - 1)),
    mean,
    kurtosis: excessKurtosis === null ? null : excessKurtosis + 3,
    band: around(Math.sqrt(2 / n)),
    robustBand:
      excessKurtosis === null ? null : around(RISK_BAND * Math.sqrt((excessKurtosis + 2) / (4 * n))),
  }
}

/** What to do with a date that lacks its return or its forecast. */
export type MissingDates = 'exception' | 'left out'

/** Forecasts beside what happened. Arrays have one entry for each date forecast, oldest first. */
export interface Backtest {
  readonly confidence: number
  /** Row of the first date forecast, in the returns given. */
  readonly first: number
  /** Realised return of the portfolio; NaN where missing. */
  readonly returns: Float64Array
  /** Forecast volatility of the same date, per period; NaN where missing, null where only values at risk were given. */
  readonly volatility: Float64Array | null
  /** Forecast value at risk, a loss positive; NaN where missing. */
  readonly valueAtRisk: Float64Array
  /** 1 where the loss is larger than the value at risk, and where a date counts as an exception because something is missing. */
  readonly exceptions: Uint8Array
  /** Dates without a return or without a forecast, as places in these arrays. */
  readonly missing: Int32Array
  readonly missingDates: MissingDates
  /** Of all dates, or of all but the missing ones where those are left out. */
  readonly tests: ExceptionTests
  /** null where fewer than 2 dates have a score. */
  readonly bias: BiasStatistic | null
}

/** How the past is forecast. */
export interface BacktestSettings {
  readonly estimator: Estimator
  /** Dates each forecast looks back on, at least 2; null: all before it. */
  readonly window: number | null
  /** Row of the first date forecast: at least the window, and at least 2. */
  readonly first: number
  /** In (0.5, 1). */
  readonly confidence: number
  /** Value at risk from the forecast volatility with a mean of zero, or the loss at ceil(N p) from the top of the N in the window. */
  readonly method: 'normal' | 'historical'
  /** A forecast is made anew every so many dates and stands in between; 1: every date. */
  readonly every: number
}

/** Numbers read between two reports of progress: a millisecond or two of work. */
const STRETCH = 250_000

/**
 * Forecasts each date from the dates before it, at today's weights, and compares with what happened.
 *
 * With weights fixed, w'C w is the variance of the portfolio's own returns y_t = r_t'w, whichever way dates are weighted or lagged:
 * no forecast but those with shrinkage needs the block again. A return of the portfolio that rounding alone could have made of zero is zero.
 *
 * @param returns  T x n row-major, decimals per period, oldest row first
 * @param dates    T
 * @param size     n
 * @param weights  n; decimals of capital, of any sign and sum
 * @returns        yields the share of dates done
 * @throws Fault   "shape" | "not-a-number" | "out-of-range" (a setting)
 * @source         w'C w: identity; "historical": ceil(N p)-th largest loss, Hyndman & Fan (1996), The American Statistician 50(4), type 1 of the
 *                 losses (from memory)
 * @cost           O(T n) once, then O(N) a forecast of N dates; lagged O(N lags); shrinkage O(N n min(N, n)) a forecast
 * @example        backtest(Float64Array.of(.01, -.01, .01, -.03, .01), 5, 1, Float64Array.of(1), { estimator: { kind: 'sample' }, window: 2, first: 2, confidence: .99, method: 'normal', every: 1 }).next().value.volatility // [0.01414, 0.01414, 0.02828]
 */
export function* backtest(
  returns: Float64Array,
  dates: number,
  size: number,
  weights: Float64Array,
  settings: BacktestSettings,
): Generator<number, Backtest> {
  checkBlock(returns, dates, size, 'returns')
  checkBlock(weights, size, 1, 'weights')
  const { estimator, window, first, confidence, method, every } = settings
  checkSettings(settings, dates)
  // a decay or lags that would not do are refused by the estimator's own door
  if (estimator.kind !== 'shrinkage')
    estimateModel(returns.slice(0, window ?? first), window ?? first, 1, estimator)
  // in units of 1e-10, a whole number: products with numbers of dates are exact
  const share = Math.round(tailOf(confidence) * 1e10)
  const z = normalQuantile(confidence, 0, 1)

  const book = new Float64Array(dates)
  const volatility = new Float64Array(dates - first)
  const valueAtRisk = new Float64Array(dates - first)
  const losses = method === 'historical' ? sortedWindow(window ?? dates) : null
  // the largest sum of |w_i r_ti| so far: what a return of the portfolio is rounded relative to
  let gross = 0
  let work = 0
  for (let t = 0; t < dates; t++) {
    // Everything known here is from before t: nothing can look ahead.
    if (t >= first) {
      const k = t - first
      if (k % every === 0) {
        const from = window === null ? 0 : t - window
        let variance: number
        if (estimator.kind === 'shrinkage') {
          const block = returns.subarray(from * size, t * size)
          const base = returnsModel(block, t - from, size, { kind: 'population' })
          const shrinkage = yield* partOf(
            shrinkageOf(base, estimator.target),
            t / dates,
            Math.min(t + every, dates) / dates,
          )
          variance = shrunkModel(base, shrinkage).apply(weights).variance
        } else {
          variance = varianceOf(book.subarray(from, t), estimator)
        }
        const rounding = size * Number.EPSILON * gross
        volatility[k] = variance <= rounding ** 2 ? 0 : Math.sqrt(variance)
        valueAtRisk[k] = losses ? losses.largest(Math.ceil(((t - from) * share) / 1e10)) : z * volatility[k]
        work += (t - from) * (estimator.kind === 'lagged' ? 2 + estimator.lags : 2)
      } else {
        volatility[k] = volatility[k - 1]!
        valueAtRisk[k] = valueAtRisk[k - 1]!
      }
    }
    let y = 0
    let absolute = 0
    for (let i = 0, at = t * size; i < size; i++, at++) {
      const part = weights[i]! * returns[at]!
      y += part
      absolute += Math.abs(part)
    }
    gross = Math.max(gross, absolute)
    book[t] = Math.abs(y) <= size * Number.EPSILON * absolute ? 0 : y
    // 0 - y: no loss is 0, not -0
    losses?.add(0 - book[t]!)
    work += size
    if (work >= STRETCH) {
      work = 0
      yield t / dates
    }
  }
  return outcome(book.slice(first), volatility, valueAtRisk, { first, confidence, missingDates: 'exception' })
}

/** Forecasts made elsewhere, T each, NaN where one is missing; at least one of the two. */
export interface GivenForecasts {
  /** Per period; the value at risk is taken from it, normal with a mean of zero, unless that is given too. */
  readonly volatility: Float64Array | null
  /** A loss positive, at the confidence named. */
  readonly valueAtRisk: Float64Array | null
}

/**
 * Compares dated returns of a portfolio with forecasts that were made for the same dates.
 *
 * @param returns       T; NaN where one is missing, oldest first
 * @param confidence    in (0.5, 1)
 * @param missingDates  a date without a return or a forecast counts as an exception (default) or is left out of the tests, its
 *                      neighbours then following one another
 * @throws Fault        "too-few" (no forecasts; no date left) | "shape" | "not-a-number" (an infinite number, with its row) |
 *                      "out-of-range" (confidence; a volatility below 0, with its row)
 * @source              missing dates: Basel Committee, MAR32 (2019) (paragraph from memory); the rest as `exceptionTests`, `biasStatistic`
 * @cost                O(T)
 * @example             backtestGiven(Float64Array.of(-.03, .01, NaN), { volatility: Float64Array.of(.01, .01, .01), valueAtRisk: null }, .99).exceptions // [1, 0, 1]
 */
export function backtestGiven(
  returns: Float64Array,
  forecasts: GivenForecasts,
  confidence: number,
  missingDates: MissingDates = 'exception',
): Backtest {
  tailOf(confidence)
  const { volatility } = forecasts
  const z = normalQuantile(confidence, 0, 1)
  const valueAtRisk = forecasts.valueAtRisk?.slice() ?? volatility?.map((sigma) => z * sigma)
  if (!valueAtRisk) {
    throw new Fault('too-few', 'forecasts: none', 'volatilities or values at risk are needed', {
      argument: 'forecasts',
    })
  }
  checkGiven(returns, returns.length, 'returns')
  if (volatility) {
    checkGiven(volatility, returns.length, 'volatility')
    const row = volatility.findIndex((sigma) => sigma < 0)
    if (row >= 0) {
      throw new Fault(
        'out-of-range',
        `volatility: ${volatility[row]}`,
        'a volatility of 0 or more is needed',
        {
          argument: 'volatility',
          row,
        },
      )
    }
  }
  checkGiven(valueAtRisk, returns.length, 'value_at_risk')
  return outcome(returns.slice(), volatility && volatility.slice(), valueAtRisk, {
    first: 0,
    confidence,
    missingDates,
  })
}

function outcome(
  returns: Float64Array,
  volatility: Float64Array | null,
  valueAtRisk: Float64Array,
  settings: Pick<Backtest, 'first' | 'confidence' | 'missingDates'>,
): Backtest {
  const places = Array.from(returns.keys())
  const lacks = (k: number) => Number.isNaN(returns[k]) || Number.isNaN(valueAtRisk[k])
  const counts = settings.missingDates === 'exception'
  const exceptions = Uint8Array.from(places, (k) =>
    lacks(k) ? Number(counts) : Number(-returns[k]! > valueAtRisk[k]!),
  )
  const scores = volatility?.map((sigma, k) => (sigma > 0 ? returns[k]! / sigma : NaN))
  const scored = scores?.reduce((count, score) => count + (Number.isNaN(score) ? 0 : 1), 0) ?? 0
  return {
    ...settings,
    returns,
    volatility,
    valueAtRisk,
    exceptions,
    missing: Int32Array.from(places.filter(lacks)),
    tests: exceptionTests(counts ? exceptions : exceptions.filter((_, k) => !lacks(k)), settings.confidence),
    bias: scores && scored >= 2 ? biasStatistic(scores) : null,
  }
}

/** The variance of a series, oldest first, as the estimator gives it for a portfolio that is one position. */
function varianceOf(y: Float64Array, estimator: Exclude<Estimator, { kind: 'shrinkage' }>): number {
  const decay = estimator.kind === 'exponential' ? estimator.decay : 1
  let total = 0
  let sum = 0
  for (let t = y.length - 1, omega = 1; t >= 0; t--, omega *= decay) {
    total += omega
    sum += omega * y[t]!
  }
  const mean = sum / total
  let squares = 0
  let remainder = 0
  for (let t = y.length - 1, omega = 1; t >= 0; t--, omega *= decay) {
    const deviation = y[t]! - mean
    squares += omega * deviation * deviation
    remainder += omega * deviation
  }
  // what rounding of the mean left
  const rest = remainder / total
  let variance = squares / total - rest * rest
  if (estimator.kind === 'sample') variance *= y.length / (y.length - 1)
  if (estimator.kind === 'lagged') {
    for (let lag = 1; lag <= estimator.lags; lag++) {
      let products = 0
      for (let t = lag; t < y.length; t++) products += (y[t]! - mean - rest) * (y[t - lag]! - mean - rest)
      variance += (2 * (1 - lag / (estimator.lags + 1)) * products) / y.length
    }
  }
  return variance
}

/** The last so many numbers in order of size. A new one costs a search by halves and a shift. */
function sortedWindow(capacity: number) {
  const arrived = new Float64Array(capacity)
  const sorted = new Float64Array(capacity)
  let added = 0
  /** How many of the first `held` are smaller. */
  const placeOf = (value: number, held: number) => {
    let [low, high] = [0, held]
    while (low < high) {
      const middle = (low + high) >> 1
      if (sorted[middle]! < value) low = middle + 1
      else high = middle
    }
    return low
  }
  return {
    add(value: number): void {
      let held = Math.min(added, capacity)
      const slot = added % capacity
      if (held === capacity) {
        const gone = placeOf(arrived[slot]!, held)
        sorted.copyWithin(gone, gone + 1, held)
        held--
      }
      const place = placeOf(value, held)
      sorted.copyWithin(place + 1, place, held)
      sorted[place] = value
      arrived[slot] = value
      added++
    },
    /** The rank-th largest; 1: the largest. */
    largest: (rank: number) => sorted[Math.min(added, capacity) - rank]!,
  }
}

/** 1 - confidence, rounded to 10 digits: 1 - 0.95 is not 0.05 in binary. */
function tailOf(confidence: number): number {
  const p = Number((1 - confidence).toFixed(10))
  if (!(p > 0 && p < 0.5)) {
    throw new Fault(
      'out-of-range',
      `confidence ${confidence}`,
      'a number between 0.5 and 1 is needed, such as 0.99',
      { argument: 'confidence' },
    )
  }
  return p
}

function checkSettings({ window, first, every }: BacktestSettings, dates: number): void {
  const whole = (value: number, least: number, argument: string) => {
    if (Number.isInteger(value) && value >= least) return
    throw new Fault('out-of-range', `${argument}: ${value}`, `a whole number from ${least} is needed`, {
      argument,
    })
  }
  whole(every, 1, 'every')
  if (window !== null) whole(window, 2, 'window')
  whole(first, window ?? 2, 'first')
  if (first >= dates) {
    throw new Fault(
      'too-few',
      `returns: ${dates} dates`,
      `more than the ${first} before the first forecast are needed`,
      {
        argument: 'returns',
      },
    )
  }
}

/** NaN marks what is missing; infinite numbers are no data. */
function checkGiven(values: Float64Array, dates: number, argument: string): void {
  if (values.length !== dates) {
    throw new Fault(
      'shape',
      `${argument}: ${values.length} numbers`,
      `${dates} are needed, one for each date`,
      {
        argument,
      },
    )
  }
  const row = values.findIndex((value) => Math.abs(value) === Infinity)
  if (row >= 0) {
    throw new Fault(
      'not-a-number',
      `${argument}: ${values[row]}`,
      'a finite number is needed, or NaN where it is missing',
      {
        argument,
        row,
      },
    )
  }
}
