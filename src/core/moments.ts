import { checkBlock } from './fault'

/** Central moments of one series, every observation weighing the same. */
export interface Moments {
  readonly mean: number
  /** Divisor T. */
  readonly variance: number
  /** m3 / m2^1.5 with divisor T; null where the series never moves. */
  readonly skewness: number | null
  /** m4 / m2^2 - 3 with divisor T; null where the series never moves. */
  readonly excessKurtosis: number | null
}

/**
 * Mean, variance, skewness and excess kurtosis of one series.
 *
 * A spread that rounding alone could have made of equal numbers counts as none: its shape would be noise.
 *
 * @param values  T
 * @throws Fault  "shape" | "not-a-number"
 * @source        moment coefficients with divisor T: NIST/SEMATECH e-Handbook of Statistical Methods, section 1.3.5.11 (from memory)
 * @cost          O(T), three passes
 * @example       momentsOf(Float64Array.of(1, 2, 3)).excessKurtosis // -1.5
 * @example       momentsOf(Float64Array.of(0, 0, 0, 1)).skewness // 1.1547
 * @example       momentsOf(Float64Array.of(.1, .1, .1)).skewness // null
 */
export function momentsOf(values: Float64Array): Moments {
  checkBlock(values, values.length, 1, 'values')
  const count = values.length
  let first = 0
  let largest = 0
  for (const value of values) {
    first += value / count
    largest = Math.max(largest, Math.abs(value))
  }
  // what rounding hid from the first pass
  let mean = 0
  for (const value of values) mean += (value - first) / count
  mean += first
  let second = 0
  let third = 0
  let fourth = 0
  for (const value of values) {
    const z = value - mean
    const square = z * z
    second += square
    third += square * z
    fourth += square * square
  }
  const variance = second / count
  if (variance <= (8 * Number.EPSILON * largest) ** 2) {
    return { mean, variance: 0, skewness: null, excessKurtosis: null }
  }
  return {
    mean,
    variance,
    skewness: third / count / variance ** 1.5,
    excessKurtosis: fourth / count / variance ** 2 - 3,
  }
}
