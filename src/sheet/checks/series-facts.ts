import {
  autocorrelation,
  carefulError,
  frequencySteps,
  laggedCrossCorrelation,
  longestRun,
  outliers,
  rhythm,
  shareInRuns,
} from '../../core'
import type { FrequencySteps, Run, SerialCorrelation } from '../../core'
import type { ReturnsReading } from '../returns'
import type { Settings } from '../settings'

/** What goes in: plain data, as it may cross to a worker. Rows before `from` lie before the look-back and are not looked at. */
export interface FactsInput {
  readonly values: Float64Array
  readonly rows: number
  readonly columns: number
  readonly dates: readonly number[] | null
  readonly perYear: number | null
  readonly from: number
}

/** A return far from the middle of its series. */
export interface FarReturn {
  readonly row: number
  readonly value: number
  /** robust scales from the median, with its sign */
  readonly multiple: number
  /** of the sum of squared distances from the mean: what this one return makes up of the variance */
  readonly share: number
}

/** A correlation over time, in standard errors that hold for fat tails and changing volatility. */
export interface TimeCorrelation {
  readonly value: number
  readonly standardError: number
}

/** What one series shows; rows count from 0 in the whole block. */
export interface SeriesFact {
  /** first and last row with a return, -1 where there is none */
  readonly first: number
  readonly last: number
  readonly count: number
  /** rows without a return between the first and the last */
  readonly gaps: Int32Array
  readonly isConstant: boolean
  /** mean size of a return, and whether all are above 0 */
  readonly size: number
  readonly isPositive: boolean
  /** of its returns, or of those that are not 0 where many are */
  readonly median: number
  readonly scale: number
  /** beyond NEAREST_FAR robust scales */
  readonly far: readonly FarReturn[]
  /** the longest run of zeros, the share of zeros that stand together, and k where the series moves every k-th date only */
  readonly still: Run
  readonly stillShare: number
  readonly every: number | null
  /** with its own last return */
  readonly serial: TimeCorrelation | null
  /** daily returns only: with the average of the others one date before, and one date after */
  readonly follows: TimeCorrelation | null
  readonly leads: TimeCorrelation | null
}

export interface SeriesFacts {
  readonly series: readonly SeriesFact[]
  readonly steps: FrequencySteps | null
  readonly from: number
}

/** The lowest robust multiple anything asks about. */
export const NEAREST_FAR = 6

/** So many dates a year at least are daily returns. */
const DAILY = 200

/** Share of zeros that a median distance bears. */
const MOST_ZEROS = 0.25

/** Distances a series may weigh with in the average of all, in robust scales: one wild value must not become everyone's. */
const MOST_IN_AVERAGE = 5

/** The first row of the look-back; the number of rows where it reaches no return. */
function firstRow(returns: ReturnsReading, lookBack: Settings['lookBack']): number {
  if (lookBack.kind === 'last') return Math.max(0, returns.rows - Math.floor(lookBack.dates))
  if (lookBack.kind === 'all' || !returns.dates) return 0
  const row = returns.dates.findIndex((date) => date >= lookBack.date)
  return row < 0 ? returns.rows : row
}

/** What `seriesFacts` needs of a block of returns; null where there is no series to look at, as in a covariance matrix. */
export function factsInput(
  returns: ReturnsReading,
  settings: Pick<Settings, 'lookBack' | 'periodsPerYear'>,
): FactsInput | null {
  const from = firstRow(returns, settings.lookBack)
  if (returns.content === 'covariance' || returns.rows - from < 2 || returns.columns === 0) return null
  return {
    values: returns.values,
    rows: returns.rows,
    columns: returns.columns,
    dates: returns.dates,
    perYear: settings.periodsPerYear ?? returns.proposedPeriodsPerYear,
    from,
  }
}

/**
 * Looks at every series once, for the checks of the data.
 *
 * @returns      yields the share done, once a series
 * @throws Fault what the statistics of a series throw: "not-a-number" for an infinite return
 * @cost         O(T n log T)
 */
export function* seriesFacts(input: FactsInput): Generator<number, SeriesFacts> {
  const { values, rows, columns, dates, perYear, from } = input
  const length = rows - from
  const isDaily = perYear !== null && perYear >= DAILY && columns > 1
  const facts: SeriesFact[] = []
  const levelled: Float64Array[] = []
  for (let i = 0; i < columns; i++) {
    const x = new Float64Array(length)
    for (let t = 0; t < length; t++) x[t] = values[(from + t) * columns + i]!
    const fact = factOf(x, from)
    facts.push(fact)
    if (isDaily) levelled.push(x.map((value) => levelOf(value, fact)))
    yield (isDaily ? 0.5 : 1) * ((i + 1) / columns)
  }
  if (isDaily) {
    const sums = new Float64Array(length)
    const counts = new Float64Array(length)
    for (const x of levelled)
      x.forEach((value, t) => {
        if (Number.isNaN(value)) return
        sums[t] = sums[t]! + value
        counts[t] = counts[t]! + 1
      })
    for (const [i, x] of levelled.entries()) {
      const others = sums.map((sum, t) =>
        Number.isNaN(x[t]) ? sum / counts[t]! : (sum - x[t]!) / (counts[t]! - 1),
      )
      facts[i] = {
        ...facts[i]!,
        follows: inErrors(laggedCrossCorrelation(others, x, 1)),
        leads: inErrors(laggedCrossCorrelation(others, x, -1)),
      }
      yield 0.5 + (0.5 * (i + 1)) / columns
    }
  }
  return {
    series: facts,
    steps: dates && length > 1 ? frequencySteps(Float64Array.from(dates.slice(from))) : null,
    from,
  }
}

const levelOf = (value: number, { median, scale }: SeriesFact): number =>
  scale > 0 ? Math.max(-MOST_IN_AVERAGE, Math.min(MOST_IN_AVERAGE, (value - median) / scale)) : NaN

const inErrors = (found: SerialCorrelation | null): TimeCorrelation | null =>
  found && { value: found.value, standardError: carefulError(found) }

function factOf(x: Float64Array, from: number): SeriesFact {
  const first = x.findIndex((value) => !Number.isNaN(value))
  let last = x.length - 1
  while (last >= 0 && Number.isNaN(x[last])) last--
  const gaps: number[] = []
  let count = 0
  let sum = 0
  let size = 0
  let zeros = 0
  let isPositive = true
  let isConstant = true
  for (let t = Math.max(first, 0); t <= last; t++) {
    const value = x[t]!
    if (Number.isNaN(value)) {
      gaps.push(from + t)
      continue
    }
    count++
    sum += value
    size += Math.abs(value)
    if (value === 0) zeros++
    if (value <= 0) isPositive = false
    if (value !== x[first]) isConstant = false
  }
  const mean = sum / count
  let squares = 0
  for (const value of x) if (!Number.isNaN(value)) squares += (value - mean) ** 2

  // where a price is often not renewed, how far it moves is seen in the moves alone
  const isStill = zeros < count && zeros > MOST_ZEROS * count
  const { scale, rows, multiples } = outliers(
    isStill ? x.map((value) => (value === 0 ? NaN : value)) : x,
    NEAREST_FAR,
  )
  const still = longestRun(x)
  return {
    first: first < 0 ? -1 : from + first,
    last: last < 0 ? -1 : from + last,
    count,
    gaps: Int32Array.from(gaps),
    isConstant,
    size: count > 0 ? size / count : 0,
    isPositive,
    median: scale?.median ?? NaN,
    scale: scale?.scale ?? 0,
    far: Array.from(rows, (t, k) => ({
      row: from + t,
      value: x[t]!,
      multiple: multiples[k]!,
      share: (x[t]! - mean) ** 2 / squares,
    })),
    still: { ...still, start: from + still.start },
    stillShare: shareInRuns(x),
    every: rhythm(x),
    serial: inErrors(autocorrelation(x, 1)),
    follows: null,
    leads: null,
  }
}
