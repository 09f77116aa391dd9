import { currencySplit, Fault } from '../core'
import type { Decomposition, RiskModel } from '../core'
import { addressOf } from './cells'
import type { Finding } from './findings'
import type { HoldingsReading } from './holdings'
import { plainName } from './names'
import type { ReturnsReading } from './returns'
import type { CurrencyChoice } from './settings'
import { countOf, quote } from './wording'

/** Which currency each holding stands in, and the series that says what it returns in the base currency. */
export interface CurrencyMatch extends CurrencyChoice {
  /** of each holding, as it is spelt first */
  readonly labels: readonly string[]
  /** the series of each holding's currency; -1 for the base currency, and where none is found, which is told */
  readonly seriesOf: Int32Array
  readonly findings: readonly Finding[]
}

/**
 * Finds the series of each holding's currency by its label. A blank label is the base currency; a foreign one without a series is told with
 * what is needed.
 */
export function matchCurrencies(
  { holdings, currencyHeader }: HoldingsReading,
  { names, area }: ReturnsReading,
  choice: CurrencyChoice,
): CurrencyMatch {
  const { base } = choice
  const findings: Finding[] = []
  if (currencyHeader === null)
    findings.push({
      weight: 'warns',
      sentence: `The base currency is ${base}, but no column of the holdings has the role currency: all of them count as holdings in ${base}.`,
      area: null,
    })
  const blank = holdings.filter(({ currency }) => currency === '').length
  if (currencyHeader !== null && blank > 0)
    findings.push({
      weight: 'notes',
      sentence: `${currencyHeader}: ${countOf(blank, 'holding')} without a label ${blank === 1 ? 'counts' : 'count'} as in ${base}, the base currency.`,
      area: null,
    })
  const known = new Map([[plainName(base), { label: base, series: -1 }]])
  const currencies = holdings.map(({ name, currency, cell }) => {
    const label = currency === '' ? base : currency
    const earlier = known.get(plainName(label))
    if (earlier) return earlier
    const exact = (names ?? []).flatMap((series, k) => (series === label ? [k] : []))
    const like = (names ?? []).flatMap((series, k) => (plainName(series) === plainName(label) ? [k] : []))
    const found = exact.length > 0 ? exact : like
    if (found.length !== 1)
      findings.push({
        weight: 'stops',
        sentence: `${addressOf(cell)}: ${quote(name)} stands in ${label}, and ${addressOf(area)} has ${found.length === 0 ? 'no series' : countOf(found.length, 'series', 'series')} of that name; one series ${quote(label)} with what one ${label} returns in ${base} is needed, or choose no split by currency.`,
        area: cell,
      })
    const entry = { label, series: found.length === 1 ? (found[0] ?? -1) : -1 }
    known.set(plainName(label), entry)
    return entry
  })
  return {
    ...choice,
    labels: currencies.map(({ label }) => label),
    seriesOf: Int32Array.from(currencies, ({ series }) => series),
    findings,
  }
}

/** What of a match a model depends on, as text that differs when it does. */
export const currencyKey = (match: CurrencyMatch | null): string =>
  match ? JSON.stringify([match.base, match.returnsIn, match.labels, [...match.seriesOf]]) : ''

/** The series of the foreign currencies that are held, each once. */
export const currencySeries = (match: CurrencyMatch): readonly number[] =>
  [...new Set(match.seriesOf)].filter((series) => series >= 0)

/**
 * The returns with those of foreign holdings brought from their own currency to the base currency, where that is what they stand in:
 *
 *   r = (1 + l)(1 + f) - 1,   for log returns r = l + f
 *
 * A gap in either is a gap. A series that is a currency itself stands in the base currency already, as does whatever is not held.
 *
 * @param seriesOf the series of each holding
 * @throws Fault   "unknown-choice" for a covariance matrix, which cannot be brought to another currency
 * @cost           O(T n)
 */
export function inBaseCurrency(
  returns: ReturnsReading,
  seriesOf: Int32Array,
  currencies: CurrencyMatch | null,
): ReturnsReading {
  if (currencies?.returnsIn !== 'local' || currencySeries(currencies).length === 0) return returns
  if (returns.content === 'covariance')
    throw new Fault(
      'unknown-choice',
      'a covariance matrix cannot be brought from the holdings’ own currencies to the base currency',
      `returns are needed, or a matrix of returns in ${currencies.base}`,
      { argument: 'currency' },
    )
  const { columns, rows } = returns
  const values = returns.values.slice()
  seriesOf.forEach((series, i) => {
    const rate = currencies.seriesOf[i] ?? -1
    if (series < 0 || rate < 0 || series === rate) return
    for (let t = 0; t < rows; t++) {
      const local = returns.values[t * columns + series] ?? NaN
      const change = returns.values[t * columns + rate] ?? NaN
      values[t * columns + series] =
        returns.returnKind === 'log' ? local + change : local + change + local * change
    }
  })
  return { ...returns, values }
}

/** A model of the holdings and, after them, the series of their currencies. */
export interface CurrencyModel {
  readonly model: RiskModel
  /** of each position, the position of its currency's series; -1 for the base currency */
  readonly currencyOf: Int32Array
}

/** @param foreign the series that stand after the holdings, in their order */
export function currencyModel(
  model: RiskModel,
  { seriesOf }: CurrencyMatch,
  foreign: readonly number[],
): CurrencyModel {
  const currencyOf = new Int32Array(model.size).fill(-1)
  seriesOf.forEach((series, i) => {
    if (series >= 0) currencyOf[i] = seriesOf.length + foreign.indexOf(series)
  })
  return { model, currencyOf }
}

/** Contributions to risk in local and currency parts, scaled as the other figures are. */
export interface CurrencyRisk {
  readonly base: string
  /** the currency of each holding */
  readonly labels: readonly string[]
  /** or why there are none */
  readonly parts: CurrencyParts | string
}

export interface CurrencyParts {
  /** one a holding; with `currency` they add up to the contributions */
  readonly local: Float64Array
  readonly currency: Float64Array
  /** the base currency first, where anything is held in it, then the others as they come */
  readonly byCurrency: readonly {
    readonly label: string
    /** sum of the weights that stand in it */
    readonly exposure: number
    readonly contribution: number
    readonly local: number
    readonly currency: number
  }[]
}

/**
 * Splits the contributions to risk by currency.
 *
 * @param model null where the book is not split by currency, a sentence where it cannot be
 * @throws Fault what core's currencySplit throws
 * @cost         one pass of the model
 */
export function currencyRiskOf(
  match: CurrencyMatch | null,
  model: CurrencyModel | string | null,
  d: Decomposition,
): CurrencyRisk | null {
  if (match === null || model === null) return null
  const { base, labels } = match
  if (typeof model === 'string') return { base, labels, parts: model }
  const weights = new Float64Array(model.model.size)
  weights.set(d.weights)
  const scale = Math.sqrt(d.periodsPerYear)
  const split = currencySplit(model.model, weights, model.currencyOf)
  const scaled = (parts: Float64Array): Float64Array =>
    parts.slice(0, labels.length).map((part) => part * scale)
  const [local, currency] = [scaled(split.local), scaled(split.currency)]

  const series = [...new Set(match.seriesOf)].sort((a, b) => Number(a >= 0) - Number(b >= 0))
  const byCurrency = series.map((of) => {
    const held = [...labels.keys()].filter((i) => match.seriesOf[i] === of)
    const sum = (values: Float64Array): number => held.reduce((total, i) => total + (values[i] ?? 0), 0)
    return {
      label: labels[held[0] ?? 0] ?? '',
      exposure: sum(d.weights),
      contribution: sum(d.contribution),
      local: sum(local),
      currency: sum(currency),
    }
  })
  return { base, labels, parts: { local, currency, byCurrency } }
}

/** The base currency and what the returns stand in, as printed beside the figures. */
export function currencyText({ base, returnsIn }: CurrencyMatch, { returnKind }: ReturnsReading): string {
  return returnsIn === 'base'
    ? `${base}; returns of foreign holdings stand in it`
    : `${base}; returns of foreign holdings stand in their own currencies and are brought to it before anything is estimated, ${returnKind === 'log' ? 'r = l + f (log returns)' : 'r = (1 + l)(1 + f) − 1'} with l the return in the own currency and f that of the currency; series that are not held, a benchmark’s too, count as in ${base}`
}

/** What the two parts are, beside them. */
export const CURRENCY_READING = [
  'Currency part: weight times the covariance of the currency’s return with the portfolio’s, over the volatility.',
  'Local part: the rest of the contribution, with the small product of local and currency return in it.',
] as const
