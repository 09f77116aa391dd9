import { activeRisk, annualise } from '../core'
import type { ActiveRisk, Decomposition } from '../core'
import type { BookModel } from './book-model'
import type { Finding } from './findings'
import type { HoldingsReading } from './holdings'
import type { Settings } from './settings'
import { countOf, numberText, percentText, quote } from './wording'

/** The book against its benchmark, scaled as the other figures are. */
export interface Active {
  /** where the benchmark comes from */
  readonly label: string
  /** one a position: the holdings, and after them the benchmark's series where it is one */
  readonly names: readonly string[]
  readonly weights: Float64Array
  readonly benchmark: Float64Array
  readonly risk: ActiveRisk
  /** why shares are not shown, or null */
  readonly sharesWithheld: string | null
}

/** Beyond this many times the total, parts without their signs say that shares of it mean little. A convention of our own. */
export const MOST_GROSS_CONTRIBUTION = 5

/** How many times the total its parts are without their signs. */
export const grossRatio = (parts: Float64Array, total: number): number =>
  parts.reduce((sum, part) => sum + Math.abs(part), 0) / total

/** Why shares of risk are not shown, or null. */
export const sharesWithheldOf = ({ share, contribution, volatility }: Decomposition): string | null => {
  if (share === null) return 'Shares of risk are not defined: the total risk is 0.'
  const ratio = grossRatio(contribution, volatility)
  return ratio > MOST_GROSS_CONTRIBUTION
    ? `Shares of risk are withheld: contributions nearly cancel (without their signs they are ${numberText(ratio, 1)} times the total), so shares of the total say little. Read the contributions.`
    : null
}

/**
 * Risk against the benchmark that was chosen: a column of benchmark weights, or one series of returns.
 *
 * @returns null where no benchmark is chosen or there is none
 */
export function activeOf(
  holdings: HoldingsReading,
  book: BookModel,
  { benchmark: choice, convention }: Pick<Settings, 'benchmark' | 'convention'>,
  periods: number | null,
  findings: Finding[],
): Active | null {
  if (choice.kind === 'none') return null
  const held = holdings.holdings
  const own = Float64Array.from(held, ({ weight }) => weight)
  const names = held.map(({ name }) => name)
  if (choice.kind === 'series') {
    if (!book.benchmark) return null
    const weights = Float64Array.of(...own, 0)
    const benchmark = new Float64Array(weights.length)
    benchmark[own.length] = 1
    return scaled(
      activeRisk(book.benchmark.model, weights, benchmark, convention),
      {
        label: `Series ${quote(book.benchmark.name)} of the returns`,
        // it may be held as well
        names: [...names, `${book.benchmark.name} (the benchmark)`],
        weights,
        benchmark,
      },
      periods,
    )
  }
  const column = holdings.columns.find(({ role }) => role === 'benchmark weight')
  if (!column) return null
  const benchmark = Float64Array.from(held, (holding) => holding.benchmark ?? 0)
  const total = benchmark.reduce((sum, weight) => sum + weight, 0)
  if (benchmark.every((weight) => weight === 0)) {
    findings.push({
      weight: 'notes',
      sentence: `${quote(column.header)} holds no benchmark weight: there are no figures against a benchmark.`,
      area: null,
    })
    return null
  }
  const blank = held.filter((holding) => holding.benchmark === null && holding.weight !== 0).length
  if (blank > 0)
    findings.push({
      weight: 'notes',
      sentence: `${countOf(blank, 'holding')} without a benchmark weight ${blank === 1 ? 'counts' : 'count'} as not in the benchmark.`,
      area: null,
    })
  if (Math.abs(total - 1) > 0.005)
    findings.push({
      weight: 'warns',
      sentence: `Benchmark weights add up to ${percentText(total, 1)}, not 100%: they are used as they stand.`,
      area: null,
    })
  return scaled(
    activeRisk(book.model, own, benchmark, convention),
    { label: `Column ${quote(column.header)} of the holdings`, names, weights: own, benchmark },
    periods,
  )
}

function scaled(
  risk: ActiveRisk,
  rest: Pick<Active, 'label' | 'names' | 'weights' | 'benchmark'>,
  periods: number | null,
): Active {
  const factor = Math.sqrt(periods ?? 1)
  const { trackingError } = risk
  const parts = Float64Array.of(...risk.contribution, risk.netContribution)
  const ratio = grossRatio(parts, trackingError)
  return {
    ...rest,
    risk: {
      ...risk,
      decomposition: annualise(risk.decomposition, periods ?? 1),
      trackingError: trackingError * factor,
      contribution: risk.contribution.map((part) => part * factor),
      netContribution: risk.netContribution * factor,
      benchmarkVolatility: risk.benchmarkVolatility * factor,
    },
    sharesWithheld:
      risk.share === null
        ? 'Shares are not defined: the book is its benchmark, and the tracking error is 0.'
        : ratio > MOST_GROSS_CONTRIBUTION
          ? `Shares of the tracking error are withheld: its parts nearly cancel (without their signs they are ${numberText(ratio, 1)} times the total). Read the contributions.`
          : null,
  }
}
