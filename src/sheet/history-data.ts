import { annualise, decompose, Fault } from '../core'
import type { Blocks, BookModel } from './book-model'
import { modelChoices, modelOf } from './book-model'
import type { Calculator, Work } from './calculator'
import { addressOf } from './cells'
import { currencySeries, inBaseCurrency } from './currency'
import { PlacedFault, sentenceOf } from './findings'
import { sortedJson } from './history-hash'
import type { HoldingsReading } from './holdings'
import { matchHoldings } from './matching'
import { plainName } from './names'
import type { ReturnsReading } from './returns'
import { settingLines } from './setting-lines'
import type { Settings } from './settings'
import type { Snapshot } from './snapshot'
import { snapshotOf } from './snapshot'
import type { Json } from './workbook'
import { countOf, dateText, quote } from './wording'

/**
 * What one unit of each holding has become between two dates, as the returns block tells it now:
 *
 *   g = product of (1 + r) over the dates after `fromDate` up to `toDate`;   for log returns g = exp(sum of r)
 *
 * in the base currency. Riskless holdings stay at 1.
 *
 * @param names    held now, or series of the returns
 * @param fromDate serial number; both dates have to be among those of the returns
 * @returns        one a name; or the sentence why not
 * @cost           O(dates between x names)
 */
export function growthBetween(
  { holdings, returns: read, match }: Blocks,
  names: readonly string[],
  fromDate: number,
  toDate: number,
): Float64Array | string {
  if (read.content === 'covariance') return 'A covariance matrix does not tell what prices have done.'
  if (!read.dates) return 'The returns carry no dates.'
  if (!(toDate > fromDate))
    return `There is no time between ${dateText(fromDate)} and ${dateText(toDate)} for prices to move in.`
  const days = read.dates.map(Math.floor)
  const [from, to] = [fromDate, toDate].map((date) => days.indexOf(Math.floor(date))) as [number, number]
  const missing = from < 0 ? fromDate : to < 0 ? toDate : null
  if (missing !== null)
    return `${dateText(missing)} is not among the dates of the returns in ${addressOf(read.area)}.`

  const { currencies } = match
  const isConverted = currencies?.returnsIn === 'local' && currencySeries(currencies).length > 0
  const returns = inBaseCurrency(read, match.seriesOf, currencies)
  const find = seriesFinder(holdings, read, match.seriesOf)
  const growth = new Float64Array(names.length)
  for (const [k, name] of names.entries()) {
    const found = find(name)
    if (found === null) return `There are no returns for ${quote(name)} in ${addressOf(read.area)}.`
    if (isConverted && !found.isHeld)
      return `The returns stand in the holdings’ own currencies, and nobody knows that of ${quote(name)}, which is not held now.`
    const of = (t: number): number => returns.values[t * returns.columns + found.series]!
    let sum = 0
    let product = 1
    let gaps = 0
    if (found.series >= 0)
      for (let t = from + 1; t <= to; t++) {
        const value = of(t)
        if (Number.isNaN(value)) gaps++
        sum += value
        product *= 1 + value
      }
    if (gaps > 0)
      return `${quote(name)} has no return on ${gaps} of ${countOf(to - from, 'date')} after ${dateText(fromDate)} up to ${dateText(toDate)}.`
    growth[k] = returns.returnKind === 'log' ? Math.exp(sum) : product
  }
  return growth
}

/** Finds the series of a holding by its name, or of what is not held; -1 is a riskless one. */
function seriesFinder(
  { holdings }: HoldingsReading,
  { names }: ReturnsReading,
  seriesOf: Int32Array,
): (name: string) => { readonly series: number; readonly isHeld: boolean } | null {
  const held = new Map(holdings.map(({ name }, i) => [plainName(name), seriesOf[i] ?? -1]))
  const series = new Map((names ?? []).map((name, k) => [plainName(name), k]))
  const exact = new Map((names ?? []).map((name, k) => [name, k]))
  return (name) => {
    const own = held.get(plainName(name))
    if (own !== undefined) return { series: own, isHeld: true }
    const found = exact.get(name) ?? series.get(plainName(name))
    return found === undefined ? null : { series: found, isHeld: false }
  }
}

/**
 * A kept result made again from the returns of its own dates, where these are still there, under other settings or under its own: what the settings
 * alone did, and correlations that were too many to be kept. That the returns are the same is known by their hash under its own settings.
 *
 * @param blocks as they are read now
 * @returns      with correlations; or the sentence why not
 * @throws Fault "cancelled"
 * @cost         two models of the book, one where the settings are its own; the correlations O(T n^2)
 */
export async function remakeFrom(
  of: Snapshot,
  under: Settings,
  blocks: Blocks,
  calculator: Calculator,
  work: Work,
): Promise<Snapshot | string> {
  const why = unfit(of, under, blocks)
  if (why !== null) return why
  const { first, last } = of.dates ?? { first: null, last: null }
  const to = of.readTo ?? last ?? Infinity
  // "all dates" were those there were then, though older ones may have come since
  const starts = of.settings.lookBack.kind === 'all' && first !== null ? [-Infinity, first] : [-Infinity]
  try {
    for (const start of starts) {
      const past = { ...blocks, returns: between(blocks.returns, start, to) }
      const own = await made(of, of.settings, past, calculator, work)
      if (own.returnsHash === of.returnsHash)
        return sameModel(of.settings, under) ? own : await made(of, under, past, calculator, work)
    }
  } catch (fault) {
    if (!(fault instanceof Fault) || fault.code === 'cancelled') throw fault
    return sentenceOf(fault)
  }
  const span = first === null || last === null ? '' : ` of ${dateText(first)} to ${dateText(last)}`
  return `The data${span} are not in ${addressOf(blocks.returns.area)} any more as they were when the result was kept on ${dateText(of.keptOn)}.`
}

/** Whether the figures under two settings are those of one model, scaled alike. */
function sameModel(a: Settings, b: Settings): boolean {
  const of = (settings: Settings): string => {
    const { estimator, gaps, repair, lookBack, periodsPerYear, returnKind, riskless, currency } = settings
    const parts = { estimator, gaps, repair, lookBack, periodsPerYear, returnKind, riskless, currency }
    return sortedJson(JSON.parse(JSON.stringify(parts)) as Json)
  }
  return of(a) === of(b)
}

/** Why blocks as they are read now cannot tell of a result, before anything is computed; null where they may. */
function unfit(of: Snapshot, under: Settings, { returns }: Blocks): string | null {
  const isMatrix = returns.content === 'covariance'
  if (isMatrix !== (of.dates === null))
    return isMatrix
      ? 'The book rests on a covariance matrix now, and rested on returns when the result was kept.'
      : 'The book rests on returns now, and rested on a covariance matrix when the result was kept.'
  if (returns.content === 'prices' && of.settings.returnKind !== returns.returnKind)
    return `Prices are read as ${returns.returnKind} returns now and were read as ${of.settings.returnKind} ones when the result was kept: nobody can tell whether they are the same.`
  if (under.content !== null && under.content !== returns.content)
    return `The block in ${addressOf(returns.area)} is read as ${returns.content} now, not as ${under.content}.`
  return null
}

/** The rows of a block of returns between two dates, both included. */
function between(returns: ReturnsReading, from: number, to: number): ReturnsReading {
  const { dates, columns } = returns
  if (!dates) return returns
  const first = dates.filter((date) => date < from).length
  const end = dates.filter((date) => date <= to).length
  return {
    ...returns,
    dates: dates.slice(first, end),
    values: returns.values.slice(first * columns, end * columns),
    rows: Math.max(0, end - first),
    cell: (row, series) => returns.cell(first + row, series),
  }
}

/** Prices as changes of the other kind: log(1 + r) and exp(r) - 1 lead from one to the other. */
function asKind(returns: ReturnsReading, kind: Settings['returnKind']): ReturnsReading {
  if (returns.content !== 'prices' || returns.returnKind === kind) return returns
  return {
    ...returns,
    returnKind: kind,
    values: returns.values.map(kind === 'log' ? Math.log1p : Math.expm1),
  }
}

/** The holdings and weights of a result, on the data given and under these settings. */
async function made(
  of: Snapshot,
  settings: Settings,
  given: Blocks,
  calculator: Calculator,
  work: Work,
): Promise<Snapshot> {
  const returns = asKind(given.returns, settings.returnKind)
  const holdings = holdingsThen(of, given.holdings)
  const match = matchHoldings(holdings, returns, settings.riskless, settings.currency)
  const stop = [...match.findings, ...(match.currencies?.findings ?? [])].find(
    ({ weight }) => weight === 'stops',
  )
  if (stop) throw new PlacedFault(stop, 'history')
  const blocks = { ...given, returns, holdings, match }
  // the benchmark has no part in what is made again
  const choices = modelChoices({ ...settings, benchmark: { kind: 'none' } })
  const book: BookModel = await modelOf(blocks, choices, calculator, work, 'model alone')
  const periods = settings.periodsPerYear ?? returns.proposedPeriodsPerYear
  const lines = settingLines(blocks, book, settings, periods)
  // where the holdings lie now and what capital they have says nothing of then
  const then = of.settingLines.filter(([label]) => NOT_OF_THE_MODEL.has(label))
  return snapshotOf(
    {
      id: of.id,
      title: of.title,
      note: of.note,
      keptOn: of.keptOn,
      blocks,
      book,
      settings,
      breakdown: {
        names: of.names,
        groups: of.groups,
        groupHeaders: of.groupHeaders,
        decomposition: annualise(decompose(book.model, of.weights), periods ?? 1),
        active: null,
        horizon: periods === null ? 'per period' : 'a year',
        dates: book.window,
        settings: [...then, ...lines.filter(([label]) => !NOT_OF_THE_MODEL.has(label))],
      },
    },
    'whole',
  )
}

const NOT_OF_THE_MODEL: ReadonlySet<string> = new Set(['Holdings', 'Capital'])

/** The holdings of a result as if they had just been read; where a fault about one points is the block that holds them now. */
function holdingsThen(of: Snapshot, now: HoldingsReading): HoldingsReading {
  return {
    ...now,
    groupHeaders: of.groupHeaders,
    holdings: of.names.map((name, i) => ({
      name,
      weight: of.weights[i] ?? NaN,
      amount: null,
      groups: of.groups[i] ?? [],
      currency: of.currencies?.[i] ?? '',
      benchmark: null,
      limit: null,
      expected: null,
      budget: null,
      cell: now.area,
    })),
    net: of.weights.reduce((sum, weight) => sum + weight, 0),
    gross: of.weights.reduce((sum, weight) => sum + Math.abs(weight), 0),
    findings: [],
  }
}
