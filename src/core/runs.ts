// Rows of one series in which nothing moves. NaN marks a gap.

/** Rows that follow one another; length 0 where there are none. */
export interface Run {
  /** Row of its first date. */
  readonly start: number
  readonly length: number
}

/**
 * The longest run of one and the same number, the earliest of several. A gap ends a run. Returns of exactly 0 in a row mean a price that
 * was not renewed.
 *
 * @param x     T; NaN where there is a gap
 * @param value default 0
 * @source      common practice, no source
 * @cost        O(T)
 * @example     longestRun(Float64Array.of(.01, 0, 0, 0, -.02, 0)) // {"start": 1, "length": 3}
 */
export function longestRun(x: Float64Array, value = 0): Run {
  return runsOf(x, value).reduce((longest, run) => (run.length > longest.length ? run : longest), {
    start: 0,
    length: 0,
  })
}

/**
 * The share of observations that stand in runs of one and the same number.
 *
 * @param x     T; NaN where there is a gap, which is no observation
 * @param value default 0
 * @param least the shortest run that counts; default 2
 * @returns     0 to 1; 0 where there are no observations
 * @source      common practice, no source
 * @cost        O(T)
 * @example     shareInRuns(Float64Array.of(.01, 0, 0, 0, -.02, 0, .01, .02, .01, .03)) // 0.3
 */
export function shareInRuns(x: Float64Array, value = 0, least = 2): number {
  const count = x.reduce((sum, entry) => sum + (Number.isNaN(entry) ? 0 : 1), 0)
  const inRuns = runsOf(x, value).reduce((sum, { length }) => sum + (length >= least ? length : 0), 0)
  return count === 0 ? 0 : inRuns / count
}

/**
 * A series with the longer of its runs of one and the same number as gaps.
 *
 * @param x     T; NaN where there is a gap
 * @param least the shortest run that becomes a gap
 * @param value default 0
 * @returns     T; a copy
 * @source      common practice, no source
 * @cost        O(T)
 * @example     withoutRuns(Float64Array.of(0, .01, 0, 0, 0, .02), 3) // [0, 0.01, NaN, NaN, NaN, 0.02]
 */
export function withoutRuns(x: Float64Array, least: number, value = 0): Float64Array {
  const left = x.slice()
  for (const { start, length } of runsOf(x, value)) if (length >= least) left.fill(NaN, start, start + length)
  return left
}

function runsOf(x: Float64Array, value: number): Run[] {
  const runs: Run[] = []
  for (let t = 0; t < x.length; t++) {
    if (x[t] !== value) continue
    const start = t
    while (t + 1 < x.length && x[t + 1] === value) t++
    runs.push({ start, length: t + 1 - start })
  }
  return runs
}

/** Moves that a rhythm needs to be seen in, and the share of them that keep to it. */
const FEWEST_MOVES = 6
const KEPT = 0.8

/**
 * The k of a series that moves every k-th date, with zeros or gaps in between, in at least four of five cases: a price that is renewed once in so
 * many dates.
 *
 * @param x  T; NaN where there is a gap
 * @returns  2 or more; null for a series that moves at any date, has no one rhythm or fewer than 6 moves
 * @source   common practice, no source
 * @cost     O(T)
 * @example  rhythm(Float64Array.of(0, .01, 0, .02, 0, -.01, 0, .03, 0, .01, 0, .02)) // 2
 * @example  rhythm(Float64Array.of(.01, .02, -.01, .03, .01, .02)) // null
 */
export function rhythm(x: Float64Array): number | null {
  const steps: number[] = []
  let previous = -1
  x.forEach((value, t) => {
    if (value === 0 || Number.isNaN(value)) return
    if (previous >= 0) steps.push(t - previous)
    previous = t
  })
  if (steps.length < FEWEST_MOVES - 1) return null
  const counts = new Map<number, number>()
  for (const step of steps) counts.set(step, (counts.get(step) ?? 0) + 1)
  const [every, times] = [...counts].reduce((most, next) => (next[1] > most[1] ? next : most))
  return every > 1 && times >= KEPT * steps.length ? every : null
}
