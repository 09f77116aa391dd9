import { uniformInt } from 'pure-rand/distribution/uniformInt'
import { mersenne } from 'pure-rand/generator/mersenne'
import { Fault } from './fault'
import { roundingOfVariance, type ReturnsModel } from './risk-model'

export interface BootstrapChoice {
  /** How many times the history is drawn anew; 40 or more, so that one lies beyond each percentile. */
  readonly replicates: number
  /** Of the generator: a whole number from 0 to 2^32 - 1. The same seed gives the same figures everywhere. */
  readonly seed: number
  /** Dates drawn together: 1 draws each by itself, more keeps what neighbouring dates have to do with each other. */
  readonly blockLength: number
}

/** How one figure, or one for each position, varies over the replicates. */
export interface Spread<Figure> {
  /** Standard deviation over the replicates, divisor their number less 1. */
  readonly deviation: Figure
  /** 2.5th percentile */
  readonly lower: Figure
  /** 97.5th percentile */
  readonly upper: Figure
}

export interface BootstrapResult extends BootstrapChoice {
  readonly volatility: Spread<number>
  /** n each */
  readonly contribution: Spread<Float64Array>
  /** n each; null where the portfolio has no risk to share, in the history or in all but one replicate. */
  readonly share: Spread<Float64Array> | null
  /** Replicates without any risk (short histories only): their volatility and contributions are 0, shares they have none. */
  readonly withoutRisk: number
}

/** What the draws come from, for whoever wants to draw them again. */
export const BOOTSTRAP_GENERATOR = 'Mersenne Twister MT19937'

/**
 * Draws the dates of the history anew, many times, with replacement, and takes volatility, contributions and shares
 * of each: how much they vary is how sure they are. A check of `standardErrors` that shares no formula with it.
 *
 * A date drawn k_t times counts k_t times, at the weight it has in the model: with mu_t = omega_t k_t / sum omega k,
 *
 *   y* = sum_t mu_t y_t,   (C* w)_i = correction sum_t mu_t (y_t - y*) z_ti,   s*^2 = w'C* w
 *
 * so that means are taken anew as well, and exponential weights stay with their dates.
 *
 * Blocks are circular: each starts at any of the T dates alike and the first date follows the last; the last block is
 * cut where T dates are drawn. Starts are whole numbers of MT19937 (Matsumoto & Nishimura 1998, seeded by its
 * init_genrand): x, 32 bits with the highest turned over, is start x mod T, x beyond the last whole multiple of T
 * passed over.
 *
 * The figures are those without lagged terms. Where returns are autocorrelated, blocks of many dates show what that
 * does to the errors.
 *
 * @param model    a block of returns
 * @param weights  n; decimals of capital
 * @yields         the share done, 0 to 1
 * @returns        per period, as the model
 * @throws Fault   "shape" | "not-a-number" | "out-of-range" (a choice, or more figures than memory is taken for)
 * @source         Efron & Tibshirani (1993), An Introduction to the Bootstrap, chapters 6 and 13 (from memory); circular blocks:
 *                 Politis & Romano (1992), in LePage & Billard (eds.), Exploring the Limits of Bootstrap, 263-270 (from memory);
 *                 percentiles: Hyndman & Fan (1996), The American Statistician 50(4), 361-365, type 7 (from memory)
 * @cost           one streaming pass a replicate, O(T n), and a sort of the replicates for each figure
 * @example        [...bootstrap(returnsModel(Float64Array.of(.01, 0, -.02, .01, .01, -.01), 3, 2), Float64Array.of(.5, .5), { replicates: 40, seed: 1, blockLength: 1 })].at(-1) // 1
 */
export function* bootstrap(
  model: ReturnsModel,
  weights: Float64Array,
  choice: BootstrapChoice,
): Generator<number, BootstrapResult> {
  checkChoice(choice, model)
  const { replicates, seed, blockLength } = choice
  const { size, dates, rowWeights: omega, correction } = model
  const returns = model.portfolioReturns(weights)
  // as a decomposition: a variance that rounding alone could have made is none
  const floor = roundingOfVariance(model, weights)
  const pace = Math.max(1, Math.floor(NUMBERS_BETWEEN_YIELDS / (dates * size)))
  // sorting takes its part of the time
  const drawing = 0.8

  const draw = dateDraws(dates, seed, blockLength)
  const volatilities = new Float64Array(replicates)
  const contributions = new Float64Array(replicates * size)
  const mu = new Float64Array(dates)
  let withoutRisk = 0
  for (let b = 0; b < replicates; b++) {
    const times = draw()
    let total = 0
    for (let t = 0; t < dates; t++) total += mu[t] = omega[t]! * times[t]!
    let mean = 0
    for (let t = 0; t < dates; t++) mean += (mu[t]! /= total) * returns[t]!
    let variance = 0
    for (let t = 0; t < dates; t++) {
      const y = returns[t]! - mean
      mu[t]! *= correction * y
      variance += mu[t]! * y
    }
    if (variance > floor) {
      const volatility = (volatilities[b] = Math.sqrt(variance))
      const contribution = contributions.subarray(b * size, (b + 1) * size)
      model.weigh(mu, contribution)
      for (let i = 0; i < size; i++) contribution[i]! *= weights[i]! / volatility
    } else {
      withoutRisk++
    }
    if (b % pace === 0) yield (drawing * b) / replicates
  }

  const contribution = emptySpread(size)
  const share = replicates - withoutRisk > 1 ? emptySpread(size) : null
  const values = new Float64Array(replicates)
  const sharesOf = new Float64Array(replicates - withoutRisk)
  const sortingPace = Math.ceil(NUMBERS_BETWEEN_YIELDS / 64 / replicates)
  for (let i = 0; i < size; i++) {
    for (let b = 0, k = 0; b < replicates; b++) {
      values[b] = contributions[b * size + i]!
      if (volatilities[b]! > 0) sharesOf[k++] = values[b]! / volatilities[b]!
    }
    put(contribution, i, spreadOfInPlace(values))
    if (share) put(share, i, spreadOfInPlace(sharesOf))
    if (i % sortingPace === 0) yield drawing + ((1 - drawing) * i) / size
  }
  const volatility = spreadOfInPlace(volatilities)
  yield 1
  return { replicates, seed, blockLength, volatility, contribution, share, withoutRisk }
}

/** Returns read between two yields: a few milliseconds of passes, 64 times as many as can be sorted in that time. */
const NUMBERS_BETWEEN_YIELDS = 4e6

/** Half a gigabyte of contributions. */
const MOST_FIGURES = 2 ** 26

function checkChoice({ replicates, seed, blockLength }: BootstrapChoice, { dates, size }: ReturnsModel) {
  const wholeNumber = (argument: string, value: number, least: number, most: number) => {
    if (Number.isInteger(value) && value >= least && value <= most) return
    throw new Fault(
      'out-of-range',
      `${argument}: ${value}`,
      `a whole number from ${least} to ${most} is needed`,
      { argument },
    )
  }
  wholeNumber('replicates', replicates, 40, Math.max(40, Math.floor(MOST_FIGURES / size)))
  wholeNumber('seed', seed, 0, 2 ** 32 - 1)
  wholeNumber('block length', blockLength, 1, dates)
}

/** Each call draws T dates and says how often each was drawn; the array is the same every time. */
function dateDraws(dates: number, seed: number, blockLength: number): () => Int32Array {
  const generator = mersenne(seed)
  const times = new Int32Array(dates)
  return () => {
    times.fill(0)
    for (let drawn = 0; drawn < dates; drawn += blockLength) {
      const start = uniformInt(generator, 0, dates - 1)
      const length = Math.min(blockLength, dates - drawn)
      for (let k = 0; k < length; k++) times[(start + k) % dates]!++
    }
    return times
  }
}

const emptySpread = (size: number): Spread<Float64Array> => ({
  deviation: new Float64Array(size),
  lower: new Float64Array(size),
  upper: new Float64Array(size),
})

function put(spread: Spread<Float64Array>, position: number, { deviation, lower, upper }: Spread<number>) {
  spread.deviation[position] = deviation
  spread.lower[position] = lower
  spread.upper[position] = upper
}

/** Sorts the values. */
function spreadOfInPlace(values: Float64Array): Spread<number> {
  values.sort()
  const mean = values.reduce((sum, value) => sum + value, 0) / values.length
  const squares = values.reduce((sum, value) => sum + (value - mean) * (value - mean), 0)
  return {
    deviation: Math.sqrt(squares / (values.length - 1)),
    lower: percentile(values, 0.025),
    upper: percentile(values, 0.975),
  }
}

/** Between the order statistics on either side of (m - 1) p, by straight line. */
function percentile(sorted: Float64Array, p: number): number {
  const place = (sorted.length - 1) * p
  const below = Math.floor(place)
  const value = sorted[below]!
  return value + (place - below) * ((sorted[below + 1] ?? value) - value)
}
