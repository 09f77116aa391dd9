import { checkBlock, Fault } from './fault'

/**
 * Simple returns p_t / p_(t-1) - 1: what weights multiply exactly.
 *
 * @param prices  T x n row-major, above 0, oldest row first
 * @param dates   T, at least 2
 * @param size    n
 * @returns       (T-1) x n row-major
 * @throws Fault  "shape" | "not-a-number" | "out-of-range" (a price of 0 or less, with row and column) | "too-few"
 * @source        common practice, no source
 * @cost          O(T n)
 * @example       simpleReturns(Float64Array.of(100, 110, 99), 3, 1) // [0.1, -0.1]
 */
export function simpleReturns(prices: Float64Array, dates: number, size: number): Float64Array {
  // (p - q) / q keeps the digits of small returns that p / q - 1 loses
  return changes(prices, dates, size, (price, before) => (price - before) / before)
}

/**
 * Logarithmic returns ln(p_t / p_(t-1)): they add up over time; a portfolio's is only nearly their weighted sum.
 *
 * @param prices  T x n row-major, above 0, oldest row first
 * @param dates   T, at least 2
 * @param size    n
 * @returns       (T-1) x n row-major
 * @throws Fault  "shape" | "not-a-number" | "out-of-range" (a price of 0 or less, with row and column) | "too-few"
 * @source        common practice, no source
 * @cost          O(T n)
 * @example       logReturns(Float64Array.of(100, 110, 99), 3, 1) // [0.09531, -0.10536]
 */
export function logReturns(prices: Float64Array, dates: number, size: number): Float64Array {
  return changes(prices, dates, size, (price, before) => Math.log1p((price - before) / before))
}

function changes(
  prices: Float64Array,
  dates: number,
  size: number,
  change: (price: number, before: number) => number,
): Float64Array {
  checkBlock(prices, dates, size, 'prices')
  if (dates < 2) {
    throw new Fault('too-few', `prices: ${dates} date`, 'at least 2 dates are needed', { argument: 'prices' })
  }
  const bad = prices.findIndex((price) => price <= 0)
  if (bad >= 0) {
    throw new Fault('out-of-range', `prices: ${prices[bad]}`, 'a price above 0 is needed', {
      argument: 'prices',
      row: Math.floor(bad / size),
      column: bad % size,
    })
  }
  return Float64Array.from({ length: (dates - 1) * size }, (_, k) => change(prices[k + size]!, prices[k]!))
}
