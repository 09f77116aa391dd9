import { decompose, type Decomposition } from './decomposition'
import { checkBlock } from './fault'
import type { RiskModel } from './risk-model'

/**
 * How active risk is attributed. "own returns": each position by its own return; "benchmark-relative returns": by its return less
 * the benchmark's, with what the net active weight earns of the benchmark on a line of its own. Both add up to the tracking error and
 * tell different stories: cash in a fully invested book's place has no part under the first and all of the benchmark's under the second.
 */
export type ActiveConvention = 'own returns' | 'benchmark-relative returns'

/** Risk against a benchmark, per period. Arrays have one entry for each position of the model. */
export interface ActiveRisk {
  readonly convention: ActiveConvention
  /** The active book: a = w - b. Its volatility is the tracking error; its contributions those under "own returns". */
  readonly decomposition: Decomposition
  /** s_A = sqrt(a'C a) */
  readonly trackingError: number
  /** Under the convention; with `netContribution` they add up to the tracking error. */
  readonly contribution: Float64Array
  /** contribution / s_A; null where the tracking error is 0. */
  readonly share: Float64Array | null
  /** The line "Net active weight": (sum of a) cov(r_B, r_A) / s_A; 0 under "own returns". */
  readonly netContribution: number
  readonly netShare: number | null
  /** Sum of a. */
  readonly netWeight: number
  /** w'C b / b'C b; null where the benchmark has no risk. */
  readonly beta: number | null
  /** Correlation of book and benchmark; null where either has no risk. */
  readonly correlation: number | null
  readonly benchmarkVolatility: number
}

/**
 * Weights less those of the benchmark. What is no more than the last digits of the two is 0: amounts over their sum and typed fractions are seldom
 * the same double.
 *
 * @example activeWeights(Float64Array.of(.6, .4), Float64Array.of(.5, .5)) // [0.1, -0.1]
 */
export const activeWeights = (weights: Float64Array, benchmark: Float64Array): Float64Array =>
  weights.map((weight, i) => {
    const difference = weight - benchmark[i]!
    return Math.abs(difference) <= 4 * Number.EPSILON * Math.abs(weight) ? 0 : difference
  })

/**
 * Splits the risk of a book against its benchmark. A benchmark that is one return series is a position of its own in the model, with
 * benchmark weight 1 that the book does not hold.
 *
 *   a = w - b,   s_A = sqrt(a'C a)
 *   own returns:               c_i = a_i (C a)_i / s_A
 *   benchmark-relative returns:  c_i = a_i ((C a)_i - b'C a) / s_A,   net line (sum of a) b'C a / s_A
 *
 * A book equal to its benchmark has tracking error 0, contributions 0, and shares null.
 *
 * @param weights    n; decimals of capital, of any sign and sum
 * @param benchmark  n; likewise
 * @param convention default: own returns
 * @returns          per period, in the unit of the returns
 * @throws Fault     "shape" | "not-a-number" | "negative-variance" | "out-of-range"
 * @source           CFA Institute, Level III, Active Equity Investing: Portfolio Construction (active risk attribution; from
 *                   memory); the split itself: Euler allocation, Tasche (2008), arXiv:0708.2542
 * @cost             three passes of the model
 * @example          activeRisk(matrixModel(Float64Array.of(.04, 0, 0, .01), 2), Float64Array.of(.6, .4), Float64Array.of(.5, .5)).trackingError // 0.02236
 */
export function activeRisk(
  model: RiskModel,
  weights: Float64Array,
  benchmark: Float64Array,
  convention: ActiveConvention = 'own returns',
): ActiveRisk {
  checkBlock(weights, model.size, 1, 'weights')
  checkBlock(benchmark, model.size, 1, 'benchmark')
  const active = activeWeights(weights, benchmark)
  const decomposition = decompose(model, active)
  const trackingError = decomposition.volatility
  const netWeight = active.reduce((sum, weight) => sum + weight, 0)

  const book = decompose(model, weights)
  const reference = decompose(model, benchmark)
  // the betas to the benchmark come with its own decomposition
  const beta = reference.beta && dot(weights, reference.beta)
  const both = {
    convention,
    decomposition,
    trackingError,
    netWeight,
    beta,
    correlation:
      beta === null || book.volatility === 0 ? null : (beta * reference.volatility) / book.volatility,
    benchmarkVolatility: reference.volatility,
  }
  const { marginal, contribution, share } = decomposition
  if (convention === 'own returns' || marginal === null)
    return { ...both, contribution, share, netContribution: 0, netShare: share && 0 }
  const common = dot(benchmark, marginal)
  const relative = contribution.map((c, i) => c - active[i]! * common)
  return {
    ...both,
    contribution: relative,
    share: relative.map((c) => c / trackingError),
    netContribution: netWeight * common,
    netShare: (netWeight * common) / trackingError,
  }
}

function dot(a: Float64Array, b: Float64Array): number {
  return a.reduce((sum, value, i) => sum + value * b[i]!, 0)
}
