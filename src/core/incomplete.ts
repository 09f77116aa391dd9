import { checkBlock, Fault } from './fault'
import { inOneGo } from './steps'

/**
 * Returns with gaps (NaN): what each series has, the covariance of each pair's own overlap, and the moments that
 * maximum likelihood gives where series start at different dates.
 */

/** What each column of a block holds; every list has n entries. */
export interface HistoryLengths {
  /** Row of the first return, counted from 0; -1 where a column has none. */
  readonly first: Int32Array
  /** Row of the last return; -1 where a column has none. */
  readonly last: Int32Array
  /** Returns in the column. */
  readonly counts: Int32Array
  /** Gaps between the first and the last return. */
  readonly gaps: Int32Array
}

/**
 * First and last date, count and inner gaps of every series.
 *
 * @param returns  T x n row-major, NaN marks a gap
 * @param dates    T
 * @param size     n
 * @throws Fault   "shape" | "not-a-number" (an infinite return, with row and column)
 * @cost           O(T n)
 * @example        historyLengths(Float64Array.of(NaN, .01, NaN, NaN, .02, .03, .01, .02), 4, 2) // {"first": [2, 0], "last": [3, 3], "counts": [2, 3], "gaps": [0, 1]}
 */
export function historyLengths(returns: Float64Array, dates: number, size: number): HistoryLengths {
  checkGappyBlock(returns, dates, size)
  const first = new Int32Array(size).fill(-1)
  const last = new Int32Array(size).fill(-1)
  const counts = new Int32Array(size)
  for (let t = 0, k = 0; t < dates; t++) {
    for (let i = 0; i < size; i++, k++) {
      if (Number.isNaN(returns[k])) continue
      if (first[i] === -1) first[i] = t
      last[i] = t
      counts[i] = counts[i]! + 1
    }
  }
  const gaps = counts.map((count, i) => (count === 0 ? 0 : last[i]! - first[i]! + 1 - count))
  return { first, last, counts, gaps }
}

export interface PairwiseCovariance {
  /** n x n row-major. Symmetric; it need not be positive semidefinite: see `repairCovariance`. */
  readonly matrix: Float64Array
  /** Dates each pair has in common, n x n; a series' own on the diagonal. */
  readonly overlaps: Int32Array
  /** The pair with the fewest dates in common; a single series is its own pair. */
  readonly smallestOverlap: { readonly i: number; readonly j: number; readonly dates: number }
  /** Mean of each series over all its own dates; n. */
  readonly means: Float64Array
}

/**
 * The covariance of every pair over the dates on which both have a return.
 *
 *   c_ij = sum_t (r_ti - m_i)(r_tj - m_j) / (T_ij - 1),   t and both means over the T_ij common dates
 *
 * A variance uses all dates of its own series. Entries that come from different dates need not fit together: the
 * result may have negative eigenvalues.
 *
 * @param returns  T x n row-major, NaN marks a gap
 * @param dates    T
 * @param size     n
 * @param least    common dates a pair must have; at least 2
 * @returns        yields the share done
 * @throws Fault   "shape" | "not-a-number" | "out-of-range" (least) | "missing-data" naming the pair with the fewest common dates; `column` is
 *                 the shorter of the two
 * @source         common practice, no source
 * @cost           O(T n^2); three products a date for a pair in which neither series covers the dates of the other, else one
 * @example        inOneGo(pairwiseCovariance(Float64Array.of(.01, .03, .02, NaN, .03, .01), 3, 2)).matrix // [0.0001, -0.0002, -0.0002, 0.0002]
 */
export function* pairwiseCovariance(
  returns: Float64Array,
  dates: number,
  size: number,
  least = 2,
): Generator<number, PairwiseCovariance> {
  if (!Number.isInteger(least) || least < 2) {
    throw new Fault('out-of-range', `least common dates ${least}`, 'a whole number of at least 2 is needed', {
      argument: 'least',
    })
  }
  const { counts } = historyLengths(returns, dates, size)
  yield 0
  const overlaps = commonDates(returns, dates, size)
  const smallestOverlap = fewest(overlaps, size)
  if (smallestOverlap.dates < least) throw tooFewCommon(smallestOverlap, counts, least)

  // one series after the other: deviations from its own mean, 0 in the gaps; and 1 where there is a return
  const means = new Float64Array(size)
  const deviations = new Float64Array(size * dates)
  const present = new Float64Array(size * dates)
  for (let i = 0; i < size; i++) {
    const series = deviations.subarray(i * dates, (i + 1) * dates)
    for (let t = 0; t < dates; t++) series[t] = returns[t * size + i]!
    const mean = meanOf(series, counts[i]!)
    for (let t = 0; t < dates; t++) series[t] = series[t]! - mean
    // the mean of what is left, which rounding hid from the first; 0 for a series that never changes
    const remainder = meanOf(series, counts[i]!)
    means[i] = mean + remainder
    for (let t = 0; t < dates; t++) {
      if (Number.isNaN(series[t])) series[t] = 0
      else {
        series[t] = series[t]! - remainder
        present[i * dates + t] = 1
      }
    }
    yield (0.1 * (i + 1)) / size
  }

  const rowsOf = (all: Float64Array) => Array.from(counts, (_, i) => all.subarray(i * dates, (i + 1) * dates))
  const series = rowsOf(deviations)
  const there = rowsOf(present)
  const matrix = new Float64Array(size * size)
  for (let i = 0; i < size; i++) {
    for (let j = 0; j <= i; j++) {
      const overlap = overlaps[i * size + j]!
      // Deviations from a series' own mean sum to zero over its dates. Where the other series has all of them, the
      // other's mean multiplies zero and need not be known.
      const nested = overlap === counts[i] || overlap === counts[j]
      const sum = nested
        ? product(series[i]!, series[j]!, 0, dates)
        : commonProducts(series[i]!, there[i]!, series[j]!, there[j]!, overlap)
      matrix[i * size + j] = matrix[j * size + i] = sum / (overlap - 1)
    }
    yield 0.1 + 0.9 * ((i + 1) / size) ** 2
  }
  return { matrix, overlaps, smallestOverlap, means }
}

/** Mean of the numbers in a series, exact for one that never changes. */
function meanOf(series: Float64Array, count: number): number {
  let sum = 0
  let only = NaN
  let constant = true
  for (const value of series) {
    if (Number.isNaN(value)) continue
    sum += value
    if (Number.isNaN(only)) only = value
    else if (value !== only) constant = false
  }
  return constant ? only : sum / count
}

/**
 * Sum of products of deviations from the means over the common dates, in one pass without a branch. Deviations from
 * the own means go in, and a mean over T_ij of T_i dates lies within sqrt(T_i / T_ij) standard deviations of those: what
 * the subtraction loses is at most sqrt(T_i T_j) / T_ij roundings of the product of the standard deviations.
 */
function commonProducts(
  x: Float64Array,
  inX: Float64Array,
  y: Float64Array,
  inY: Float64Array,
  overlap: number,
): number {
  let sum = 0
  let sumX = 0
  let sumY = 0
  for (let t = 0; t < x.length; t++) {
    sum += x[t]! * y[t]!
    sumX += x[t]! * inY[t]!
    sumY += y[t]! * inX[t]!
  }
  return sum - (sumX * sumY) / overlap
}

/** Counted on bits, 32 dates at a time: the whole table costs less than one percent of the covariances. */
function commonDates(returns: Float64Array, dates: number, size: number): Int32Array {
  const words = Math.ceil(dates / 32)
  const present = new Int32Array(size * words)
  for (let t = 0, k = 0; t < dates; t++) {
    for (let i = 0; i < size; i++, k++) {
      if (!Number.isNaN(returns[k])) present[i * words + (t >> 5)]! |= 1 << (t & 31)
    }
  }
  const overlaps = new Int32Array(size * size)
  for (let i = 0; i < size; i++) {
    for (let j = 0; j <= i; j++) {
      let count = 0
      for (let k = 0; k < words; k++) count += bitCount(present[i * words + k]! & present[j * words + k]!)
      overlaps[i * size + j] = overlaps[j * size + i] = count
    }
  }
  return overlaps
}

/** Ones in a 32-bit word, summed in pairs, fours, bytes. */
function bitCount(word: number): number {
  const pairs = word - ((word >>> 1) & 0x55555555)
  const fours = (pairs & 0x33333333) + ((pairs >>> 2) & 0x33333333)
  return Math.imul((fours + (fours >>> 4)) & 0x0f0f0f0f, 0x01010101) >>> 24
}

function fewest(overlaps: Int32Array, size: number): PairwiseCovariance['smallestOverlap'] {
  let smallest = size > 1 ? { i: 0, j: 1, dates: overlaps[1]! } : { i: 0, j: 0, dates: overlaps[0]! }
  for (let i = 0; i < size; i++) {
    for (let j = i + 1; j < size; j++) {
      const dates = overlaps[i * size + j]!
      if (dates < smallest.dates) smallest = { i, j, dates }
    }
  }
  return smallest
}

function tooFewCommon(
  { i, j, dates }: PairwiseCovariance['smallestOverlap'],
  counts: Int32Array,
  least: number,
): Fault {
  const shorter = counts[j]! < counts[i]! ? j : i
  const inCommon = `${dates === 1 ? '1 date' : `${dates} dates`} in common`
  return new Fault(
    'missing-data',
    i === j
      ? `returns: column ${i + 1} has ${dates === 1 ? '1 return' : `${dates} returns`}`
      : `returns: columns ${i + 1} and ${j + 1} have ${inCommon}`,
    `at least ${least} are needed`,
    { argument: 'returns', column: shorter },
  )
}

export interface CompletedMoments {
  /** n */
  readonly means: Float64Array
  /** Covariance, n x n row-major; positive semidefinite by construction. */
  readonly matrix: Float64Array
  /** Row of each series' first return; n. */
  readonly starts: Int32Array
  /** Variance of each series that the longer ones leave unexplained, over its own dates; n. Of the longest: all of it. */
  readonly residualVariances: Float64Array
  /** Series that start together, the longest first. */
  readonly groups: readonly HistoryGroup[]
}

export interface HistoryGroup {
  /** Row of the first return. */
  readonly start: number
  /** Dates from there on: what the regression on the longer series had, and its divisor. */
  readonly dates: number
  /** Columns, in their order in the block. */
  readonly columns: Int32Array
  /** How many longer series there are. */
  readonly longer: number
  /** Longer columns that say nothing beyond the others over these dates, and were left out of the regression. */
  readonly redundant: Int32Array
}

/**
 * Means and covariance by maximum likelihood under normal returns, where series start at different dates and then
 * have no gap: every series is regressed on all longer ones over its own dates, and the regression carries what the
 * longer series did before. Nothing is cut to the common dates.
 *
 *   longest series:  m = mean, V = sum z z' / T
 *   a shorter group: r = a + B l + e over its T_g dates (least squares; l: all longer series), S = sum e e' / T_g
 *                    m_g = a + B m_l,   V_gl = B V_l,   V_gg = S + B V_l B'
 *
 * Divisors are numbers of dates, as the likelihood has it, not one less: with the same T, variances are (T - 1)/T
 * of those of a sample covariance.
 *
 * All regressions come from one triangular factor of (1, series by length): rows are added from the last date
 * backwards by Householder reflections, and where a series begins its regression stands in the columns before it.
 *
 * A series that never changes has no covariance with any other and takes no part in a regression.
 *
 * @param returns  T x n row-major, decimals per period, oldest row first; NaN before a series' first return only
 * @param dates    T
 * @param size     n
 * @returns        yields the share done
 * @throws Fault   "shape" | "not-a-number" | "missing-data" (the first column with a gap after its start, and the row) | "too-few" (a
 *                 series with no more dates than longer series and one)
 * @source         Stambaugh (1997), Analyzing investments whose histories differ in length, Journal of Financial Economics 45, 285-331
 *                 (method from memory); Anderson (1957), Journal of the American Statistical Association 52, 200-203 (from memory)
 * @cost           O(T n^2) for the factor, O(n^3) for the recursion
 * @example        inOneGo(completedMoments(Float64Array.of(.01, NaN, -.02, NaN, .03, .02, .02, .01, .01, -.01), 5, 2)).means // [0.01, -0.00833]
 */
export function* completedMoments(
  returns: Float64Array,
  dates: number,
  size: number,
): Generator<number, CompletedMoments> {
  const { first: starts, last, counts, gaps } = historyLengths(returns, dates, size)
  for (let i = 0; i < size; i++) {
    if (counts[i] === 0 || gaps[i]! > 0 || last[i] !== dates - 1) {
      throw brokenHistory(returns, dates, size, i, starts[i]!)
    }
  }
  yield 0
  const groups = byLength(starts, dates)
  const short = groups.find(({ dates: own, longer }) => own <= longer + 1)
  if (short) throw shortHistory(short)

  const constant = constantColumns(returns, dates, size, starts)
  // columns of the factor: 1, then the series that move, the longest first
  const order = groups.flatMap(({ columns }) => Array.from(columns).filter((column) => !constant[column]))
  const width = order.length + 1
  const factor = new Float64Array(width * width)
  const steps = groups.map(({ start, columns }, g) => ({
    start,
    end: groups[g + 1]?.start ?? dates,
    moving: Array.from(columns).filter((column) => !constant[column]).length,
  }))
  const regressions: Regression[] = []
  let active = width
  for (let g = groups.length - 1; g >= 0; g--) {
    const { start, end, moving } = steps[g]!
    for (let t = end - 1; t >= start; t -= ROWS_AT_ONCE) {
      const rows = Math.min(ROWS_AT_ONCE, t - start + 1)
      const block = new Float64Array(rows * active)
      for (let r = 0; r < rows; r++) {
        block[r * active] = 1
        for (let c = 1; c < active; c++) block[r * active + c] = returns[(t - r) * size + order[c - 1]!]!
      }
      yield* addRowsInPlace(factor, width, active, block, rows, 0.8 * (1 - (t + 1) / dates))
    }
    const before = active - moving
    regressions[g] = regressionOf(factor, width, before, moving, groups[g]!.dates)
    active = before
  }

  const moving = order.length
  const ordered = yield* carriedForward(regressions, moving)
  const means = Float64Array.from(constant, (never, i) => (never ? returns[(dates - 1) * size + i]! : 0))
  const matrix = new Float64Array(size * size)
  const residualVariances = new Float64Array(size)
  for (const [a, i] of order.entries()) {
    means[i] = ordered.means[a]!
    residualVariances[i] = ordered.residualVariances[a]!
    for (const [b, j] of order.entries()) matrix[i * size + j] = ordered.matrix[a * moving + b]!
  }
  return {
    means,
    matrix,
    starts,
    residualVariances,
    groups: groups.map((group, g) => ({
      ...group,
      redundant: Int32Array.from(regressions[g]!.redundant, (c) => order[c - 1]!).sort(),
    })),
  }
}

/** Moments of the series in the order of their regressions, each group from those before it. */
function* carriedForward(
  regressions: readonly Regression[],
  size: number,
): Generator<number, Pick<CompletedMoments, 'means' | 'matrix' | 'residualVariances'>> {
  const means = new Float64Array(size)
  const matrix = new Float64Array(size * size)
  const residualVariances = new Float64Array(size)
  let known = 0
  for (const { slopes, residuals, size: added } of regressions) {
    for (let a = 0; a < added; a++) {
      // the intercept stands before the slopes
      const slopesOfA = slopes.subarray(a * (known + 1) + 1, (a + 1) * (known + 1))
      const row = matrix.subarray((known + a) * size, (known + a + 1) * size)
      means[known + a] = slopes[a * (known + 1)]! + product(slopesOfA, means, 0, known)
      residualVariances[known + a] = residuals[a * added + a]!
      for (let l = 0; l < known; l++) row[l] = product(slopesOfA, matrix, l * size, known)
      for (let l = 0; l < known; l++) matrix[l * size + known + a] = row[l]!
      for (let b = 0; b <= a; b++) {
        const slopesOfB = slopes.subarray(b * (known + 1) + 1, (b + 1) * (known + 1))
        row[known + b] = matrix[(known + b) * size + known + a] =
          residuals[a * added + b]! + product(slopesOfB, row, 0, known)
      }
      yield 0.8 + (0.2 * (known + a + 1)) / size
    }
    known += added
  }
  return { means, matrix, residualVariances }
}

function product(left: Float64Array, right: Float64Array, at: number, length: number): number {
  let sum = 0
  for (let k = 0; k < length; k++) sum += left[k]! * right[at + k]!
  return sum
}

/** Enough rows for a reflection to be worth its overhead, few enough to stay in the cache beside the factor. */
const ROWS_AT_ONCE = 32

function byLength(starts: Int32Array, dates: number): Omit<HistoryGroup, 'redundant'>[] {
  const distinct = [...new Set(starts)].sort((a, b) => a - b)
  let longer = 0
  return distinct.map((start) => {
    const columns = Int32Array.from(starts.keys()).filter((column) => starts[column] === start)
    const group = { start, dates: dates - start, columns, longer }
    longer += columns.length
    return group
  })
}

function constantColumns(returns: Float64Array, dates: number, size: number, starts: Int32Array): boolean[] {
  return Array.from(starts, (start, i) => {
    for (let t = start + 1; t < dates; t++)
      if (returns[t * size + i] !== returns[start * size + i]) return false
    return true
  })
}

/**
 * Rows appended below an upper triangle, and the whole made triangular again by one reflection a column; `block`
 * is used up. Golub & Van Loan (2013), Matrix Computations, 4th ed., sections 5.1-5.2 (from memory).
 */
function* addRowsInPlace(
  factor: Float64Array,
  width: number,
  active: number,
  block: Float64Array,
  rows: number,
  share: number,
): Generator<number, void> {
  const scaled = new Float64Array(active)
  let work = 0
  for (let j = 0; j < active; j++) {
    let tail = 0
    for (let r = 0; r < rows; r++) tail += block[r * active + j]! ** 2
    // rounding of rounding, as in the first rows, which are fewer than columns: its squares leave the range of doubles
    if (tail < 1e-200) continue
    const pivot = factor[j * width + j]!
    const length = Math.sqrt(pivot * pivot + tail)
    const reflected = pivot > 0 ? -length : length
    // reflection 1 - v v' / (-reflected * v_0), v = (pivot - reflected, the block's column)
    const head = pivot - reflected
    const scale = -1 / (reflected * head)
    for (let c = j; c < active; c++) scaled[c] = head * factor[j * width + c]!
    for (let r = 0; r < rows; r++) {
      const v = block[r * active + j]!
      for (let c = j, k = r * active + j; c < active; c++, k++) scaled[c] = scaled[c]! + v * block[k]!
    }
    for (let c = j; c < active; c++) {
      scaled[c] = scaled[c]! * scale
      factor[j * width + c] = factor[j * width + c]! - head * scaled[c]!
    }
    for (let r = 0; r < rows; r++) {
      const v = block[r * active + j]!
      for (let c = j, k = r * active + j; c < active; c++, k++) block[k] = block[k]! - v * scaled[c]!
    }
    work += rows * (active - j)
    if (work > WORK_BETWEEN_YIELDS) {
      yield share
      work = 0
    }
  }
  yield share
}

/** Entries reflected; a few milliseconds. */
const WORK_BETWEEN_YIELDS = 1e6

interface Regression {
  /** m */
  readonly size: number
  /** m x k: a row per series of the group; the intercept, then the slope on each longer series. */
  readonly slopes: Float64Array
  /** m x m: residual covariance, on and below the diagonal. */
  readonly residuals: Float64Array
  /** Columns of the factor that were left out. */
  readonly redundant: readonly number[]
}

/** The regression of columns k..k+m-1 of what a triangular factor stands for on its columns 0..k-1. */
function regressionOf(factor: Float64Array, width: number, k: number, m: number, dates: number): Regression {
  const kept = Array.from({ length: k }, (_, c) => c)
  const redundant: number[] = []
  let triangle = factor
  let stride = width
  for (let c = 0; c < kept.length;) {
    let squares = 0
    for (let r = 0; r <= c; r++) squares += triangle[r * stride + c]! ** 2
    // what rounding alone leaves of a column that the others span
    if (Math.abs(triangle[c * stride + c]!) > Math.max(dates, k + m) * Number.EPSILON * Math.sqrt(squares)) {
      c++
      continue
    }
    redundant.push(kept[c]!)
    kept.splice(c, 1)
    triangle = withoutColumn(triangle, stride, kept.length + 1 + m, c)
    stride = kept.length + m
  }
  const used = kept.length
  const slopes = new Float64Array(m * k)
  const residuals = new Float64Array(m * m)
  for (let a = 0; a < m; a++) {
    for (let r = used - 1; r >= 0; r--) {
      let rest = triangle[r * stride + used + a]!
      for (let c = r + 1; c < used; c++) rest -= triangle[r * stride + c]! * slopes[a * k + kept[c]!]!
      slopes[a * k + kept[r]!] = rest / triangle[r * stride + r]!
    }
  }
  // row by row of the triangle, as it lies in memory
  for (let r = used; r < used + m; r++) {
    const row = triangle.subarray(r * stride + used, r * stride + used + m)
    for (let a = r - used; a < m; a++) {
      const left = row[a]! / dates
      for (let b = r - used; b <= a; b++) residuals[a * m + b] = residuals[a * m + b]! + left * row[b]!
    }
  }
  return { size: m, slopes, residuals, redundant }
}

/** The triangular factor of the same rows without one column; rare, and so built anew rather than rotated. */
function withoutColumn(
  triangle: Float64Array,
  stride: number,
  columns: number,
  column: number,
): Float64Array {
  const left = columns - 1
  const rows = new Float64Array(columns * left)
  for (let r = 0; r < columns; r++) {
    for (let c = r; c < columns; c++) {
      if (c !== column) rows[r * left + (c < column ? c : c - 1)] = triangle[r * stride + c]!
    }
  }
  const factor = new Float64Array(left * left)
  inOneGo(addRowsInPlace(factor, left, left, rows, columns, 0))
  return factor
}

function brokenHistory(returns: Float64Array, dates: number, size: number, column: number, start: number) {
  const needed = 'a series without gaps from its first return to the last date is needed'
  if (start === -1) {
    return new Fault('missing-data', `returns: column ${column + 1} has no return`, needed, {
      argument: 'returns',
      column,
    })
  }
  let row = start
  while (row < dates && !Number.isNaN(returns[row * size + column])) row++
  return new Fault('missing-data', `returns: a gap after column ${column + 1} has begun`, needed, {
    argument: 'returns',
    row,
    column,
  })
}

function shortHistory({ columns, dates, longer, start }: Omit<HistoryGroup, 'redundant'>): Fault {
  const has = `returns: column ${columns[0]! + 1} has ${dates === 1 ? '1 date' : `${dates} dates`}`
  return longer === 0
    ? new Fault('too-few', has, 'at least 2 dates are needed', { argument: 'returns', column: columns[0]! })
    : new Fault(
        'too-few',
        `${has} and ${longer === 1 ? '1 longer series' : `${longer} longer series`}`,
        `at least ${longer + 2} dates are needed for a regression on them`,
        { argument: 'returns', row: start, column: columns[0]! },
      )
}

/** The check at a numerical door where NaN stands for a gap. */
function checkGappyBlock(returns: Float64Array, dates: number, size: number): void {
  checkBlock(
    returns.map((value) => (Number.isNaN(value) ? 0 : value)),
    dates,
    size,
    'returns',
  )
}
