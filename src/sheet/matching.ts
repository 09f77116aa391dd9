import { addressOf } from './cells'
import type { CurrencyMatch } from './currency'
import { matchCurrencies } from './currency'
import type { Finding } from './findings'
import { firstAndCount } from './findings'
import type { HoldingsReading } from './holdings'
import { plainName } from './names'
import type { ReturnsReading } from './returns'
import type { Settings } from './settings'
import { countOf, quote } from './wording'

/** Which series each holding goes with: a column of the returns, or -1 for a holding marked riskless. */
export interface Match {
  readonly seriesOf: Int32Array
  /** null where risk is not split by currency; its findings are apart, as they belong to another choice */
  readonly currencies: CurrencyMatch | null
  readonly findings: readonly Finding[]
}

/**
 * Matches holdings to series by name: exactly, else but for case and spacing; by place only where there are no names on one side.
 * A holding without a series is told by name unless the user has marked it riskless. A riskless one in a foreign currency goes with the series
 * of its currency, as that is what moves it in the base currency.
 *
 * @param currency null: holdings are not told apart by currency
 */
export function matchHoldings(
  holdings: HoldingsReading,
  returns: ReturnsReading,
  riskless: Settings['riskless'],
  currency: Settings['currency'] = null,
): Match {
  const match = matchByName(holdings, returns, riskless)
  if (currency === null) return { ...match, currencies: null }
  const currencies = matchCurrencies(holdings, returns, currency)
  const free = new Set(riskless.map(plainName))
  const moved: Finding[] = []
  const seriesOf = match.seriesOf.map((series, i) => {
    const [rate, holding] = [currencies.seriesOf[i] ?? -1, holdings.holdings[i]]
    if (series >= 0 || rate < 0 || !holding || !free.has(plainName(holding.name))) return series
    moved.push({
      weight: 'warns',
      sentence: `${addressOf(holding.cell)}: ${quote(holding.name)} is marked as riskless and stands in ${currencies.labels[i] ?? ''}: it moves with that currency against ${currency.base}.`,
      area: holding.cell,
    })
    return rate
  })
  return {
    seriesOf,
    currencies: { ...currencies, findings: [...currencies.findings, ...firstAndCount(moved, 'holdings')] },
    findings: match.findings,
  }
}

function matchByName(
  holdings: HoldingsReading,
  returns: ReturnsReading,
  riskless: Settings['riskless'],
): Omit<Match, 'currencies'> {
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
