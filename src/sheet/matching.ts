import { Fault, matrixModel, returnsModel } from '../core'
import type { ReturnsModel, RiskModel } from '../core'
import { addressOf } from './cells'
import type { Finding } from './findings'
import { firstAndCount } from './findings'
import type { HoldingsReading } from './holdings'
import { plainName } from './names'
import type { ReturnsReading } from './returns'
import type { Settings } from './settings'
import { countOf, dateText, quote } from './wording'

/** Which series each holding goes with: a column of the returns, or -1 for a holding marked riskless. */
export interface Match {
  readonly seriesOf: Int32Array
  readonly findings: readonly Finding[]
}

/**
 * Matches holdings to series by name: exactly, else but for case and spacing; by place only where there are no names on one side.
 * A holding without a series is told by name unless the user has marked it riskless.
 */
export function matchHoldings(
  holdings: HoldingsReading,
  returns: ReturnsReading,
  riskless: Settings['riskless'],
): Match {
  const findings: Finding[] = []
  const names = returns.names
  const free = new Set(riskless.map(plainName))
  const isRiskless = (name: string): boolean => free.has(plainName(name))
  if (!names || !holdings.named) {
    const risky = holdings.holdings.filter(({ name }) => !isRiskless(name))
    if (risky.length !== returns.columns)
      findings.push({
        weight: 'stops',
        sentence: `${addressOf(returns.area)}: found ${countOf(returns.columns, 'series', 'series')} for ${countOf(risky.length, 'holding')}; without names on both sides as many are needed, in the same order.`,
        area: returns.area,
      })
    else if (risky.length > 0)
      findings.push({
        weight: 'warns',
        sentence: `No names on ${holdings.named ? 'the returns' : names ? 'the holdings' : 'either block'}: holdings and series are matched by their place.`,
        area: null,
      })
    let series = 0
    return {
      seriesOf: Int32Array.from(holdings.holdings, ({ name }) => (isRiskless(name) ? -1 : series++)),
      findings,
    }
  }
  const exact = new Map(names.map((name, i) => [name, i]))
  const loose = new Map<string, number[]>()
  names.forEach((name, i) => loose.set(plainName(name), [...(loose.get(plainName(name)) ?? []), i]))
  const missing: Finding[] = []
  const near: string[] = []
  const seriesOf = Int32Array.from(holdings.holdings, ({ name, cell }) => {
    if (isRiskless(name)) return -1
    const found = exact.get(name)
    if (found !== undefined) return found
    const candidates = loose.get(plainName(name)) ?? []
    if (candidates.length === 1) {
      near.push(quote(name))
      return candidates[0] ?? -1
    }
    missing.push({
      weight: 'stops',
      sentence:
        candidates.length > 1
          ? `${addressOf(cell)}: ${quote(name)} is like ${countOf(candidates.length, 'series', 'series')} in ${addressOf(returns.area)}; one is needed: spell one of them alike.`
          : `${addressOf(cell)}: found no returns for ${quote(name)} in ${addressOf(returns.area)}; a series of that name is needed, or mark the holding as riskless.`,
      area: cell,
    })
    return -1
  })
  findings.push(...(missing.length > 4 ? firstAndCount(missing, 'holdings') : missing))
  if (near.length > 0)
    findings.push({
      weight: 'notes',
      sentence: `${countOf(near.length, 'name')} matched but for case or spacing (first ${near[0] ?? ''}).`,
      area: null,
    })
  const holders = new Map<number, string>()
  holdings.holdings.forEach(({ name, cell }, k) => {
    const series = seriesOf[k] ?? -1
    if (series < 0) return
    const earlier = holders.get(series)
    if (earlier !== undefined && earlier !== name)
      findings.push({
        weight: 'stops',
        sentence: `${addressOf(cell)}: ${quote(name)} and ${quote(earlier)} both match the series ${quote(names[series] ?? '')}; one holding a series is needed.`,
        area: cell,
      })
    holders.set(series, name)
  })
  return { seriesOf, findings }
}

/** The dates a model rests on. */
export interface Window {
  /** dates with a return for every holding */
  readonly used: number
  /** dates within the look-back left out because some holding has a gap there */
  readonly dropped: number
  readonly first: number | null
  readonly last: number | null
}

export interface BookModel {
  /** over the holdings, in their order; riskless ones have zero variance */
  readonly model: RiskModel
  /** the same, where it comes from returns */
  readonly returnsModel: ReturnsModel | null
  readonly window: Window | null
  readonly findings: readonly Finding[]
}

/**
 * Builds the risk model of a book's holdings: the look-back, then the dates all holdings share.
 *
 * @throws Fault "too-few" when fewer than 2 dates are left, naming the series that leaves the fewest; "zero-risk" when nothing moves
 * @cost         O(T n) once; later weight changes cost one pass
 */
export function modelOf(
  match: Match,
  holdings: HoldingsReading,
  returns: ReturnsReading,
  settings: Pick<Settings, 'estimator' | 'lookBack'>,
): BookModel {
  const size = match.seriesOf.length
  const risky = [...match.seriesOf.keys()].filter((i) => (match.seriesOf[i] ?? -1) >= 0)
  const findings: Finding[] = []
  if (returns.content === 'covariance') {
    const matrix = new Float64Array(size * size)
    for (const i of risky)
      for (const j of risky)
        matrix[i * size + j] =
          returns.values[(match.seriesOf[i] ?? 0) * returns.columns + (match.seriesOf[j] ?? 0)] ?? NaN
    if (settings.estimator.kind !== 'sample')
      findings.push({
        weight: 'notes',
        sentence: 'The estimator has no part here: the covariance matrix is taken as given.',
        area: null,
      })
    return { model: matrixModel(matrix, size), returnsModel: null, window: null, findings }
  }

  const firstRow = lookBackStart(returns, settings.lookBack, findings)
  const rows: number[] = []
  const gapsOf = new Map<number, number>()
  for (let t = firstRow; t < returns.rows; t++) {
    let complete = true
    for (const i of risky) {
      if (!Number.isNaN(returns.values[t * returns.columns + (match.seriesOf[i] ?? 0)])) continue
      complete = false
      gapsOf.set(i, (gapsOf.get(i) ?? 0) + 1)
    }
    if (complete) rows.push(t)
  }
  const inView = returns.rows - firstRow
  const dropped = inView - rows.length
  const shortest = [...gapsOf].sort((a, b) => b[1] - a[1])[0]
  const shortestText = shortest
    ? `${quote(holdings.holdings[shortest[0]]?.name ?? '')} has the most gaps: ${shortest[1]} of ${inView} dates`
    : ''
  if (inView < 2 && returns.rows >= 2)
    throw new Fault(
      'too-few',
      `found ${countOf(inView, 'date')} of returns within the look-back`,
      `at least 2 of the ${returns.rows} there are${spanText(returns.dates)} are needed`,
      { argument: 'look-back' },
    )
  if (rows.length < 2)
    throw new Fault(
      'too-few',
      `found ${countOf(rows.length, 'date')} with a return for every holding${shortestText ? ` (${shortestText})` : ''}`,
      'at least 2 are needed',
      { argument: 'returns' },
    )
  if (dropped > 0 && shortest)
    findings.push({
      weight: 'warns',
      sentence: `${dropped} of ${inView} dates left out, where a holding has no return; ${shortestText}.`,
      area: returns.seriesCell(match.seriesOf[shortest[0]] ?? 0),
    })
  if (rows.length <= risky.length)
    findings.push({
      weight: 'warns',
      sentence: `${countOf(rows.length, 'date')} for ${countOf(risky.length, 'holding')}: too few to tell all the correlations apart; some mixes of these holdings look riskless without being so.`,
      area: null,
    })

  const block = new Float64Array(rows.length * size)
  rows.forEach((t, k) => {
    for (const i of risky)
      block[k * size + i] = returns.values[t * returns.columns + (match.seriesOf[i] ?? 0)] ?? NaN
  })
  const model = returnsModel(block, rows.length, size, settings.estimator)
  const variances = model.variances()
  const still = risky.filter((i) => variances[i] === 0)
  if (risky.length > 0 && still.length === risky.length)
    throw new Fault(
      'zero-risk',
      'found returns that never change in any series',
      'at least one series that moves is needed',
      {
        argument: 'returns',
      },
    )
  for (const i of still) {
    const cell = returns.seriesCell(match.seriesOf[i] ?? 0)
    findings.push({
      weight: 'warns',
      sentence: `${addressOf(cell)}: the returns of ${quote(holdings.holdings[i]?.name ?? '')} never change, so it counts as riskless.`,
      area: cell,
    })
  }
  return {
    model,
    returnsModel: model,
    window: {
      used: rows.length,
      dropped,
      first: returns.dates?.[rows[0] ?? 0] ?? null,
      last: returns.dates?.[rows.at(-1) ?? 0] ?? null,
    },
    findings,
  }
}

const spanText = (dates: readonly number[] | null): string =>
  dates && dates.length > 0 ? `, ${dateText(dates[0] ?? 0)} to ${dateText(dates.at(-1) ?? 0)},` : ''

/** The first row of the look-back. */
function lookBackStart(returns: ReturnsReading, lookBack: Settings['lookBack'], findings: Finding[]): number {
  if (lookBack.kind === 'all') return 0
  if (lookBack.kind === 'last') {
    if (lookBack.dates > returns.rows)
      findings.push({
        weight: 'warns',
        sentence: `The look-back of ${countOf(lookBack.dates, 'date')} reaches further than the ${returns.rows} there are.`,
        area: null,
      })
    return Math.max(0, returns.rows - Math.floor(lookBack.dates))
  }
  if (!returns.dates)
    throw new Fault(
      'blank',
      `the look-back starts at ${dateText(lookBack.date)} but the returns carry no dates`,
      'a number of dates is needed instead',
      {
        argument: 'look-back',
      },
    )
  const start = returns.dates.findIndex((date) => date >= lookBack.date)
  return start < 0 ? returns.rows : start
}
