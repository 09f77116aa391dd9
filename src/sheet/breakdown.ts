import { annualise, decompose, groupDecomposition } from '../core'
import type { Decomposition, GroupDecomposition } from '../core'
import { addressOf } from './cells'
import type { Finding } from './findings'
import { byGravity } from './findings'
import type { HoldingsReading } from './holdings'
import type { BookModel, Match } from './matching'
import { groupsOf, plainName, UNASSIGNED } from './names'
import type { ReturnsReading } from './returns'
import type { Settings } from './settings'
import { countOf, dateText, listOf, numberText, percentText, quote } from './wording'

export interface GroupSection {
  readonly header: string
  readonly labels: readonly string[]
  readonly parts: GroupDecomposition
}

/** Everything known about a book's risk at one moment, as the pane shows it and the table prints it. */
export interface Breakdown {
  readonly names: readonly string[]
  /** a holding's labels, one a group column */
  readonly groups: readonly (readonly string[])[]
  readonly groupHeaders: readonly string[]
  /** scaled to a year where the periods per year are known */
  readonly decomposition: Decomposition
  readonly byGroup: readonly GroupSection[]
  readonly net: number
  readonly gross: number
  /** by the year where it is the user's own, whatever the risk is scaled to */
  readonly expectedReturn: {
    readonly value: number
    readonly label: string
    readonly horizon: 'a year' | 'per period'
  } | null
  /** 'a year', or 'per period' while nobody has said how many make a year */
  readonly horizon: 'a year' | 'per period'
  /** settings and conventions as label and value, as printed */
  readonly settings: readonly (readonly [string, string])[]
  /** the warnings of both readings, and all that was found in matching and computing */
  readonly findings: readonly Finding[]
  /** why shares are not shown, or null */
  readonly sharesWithheld: string | null
  /** why the effective number of positions is not shown, or null */
  readonly effectiveWithheld: string | null
  readonly dates: {
    readonly used: number
    readonly dropped: number
    readonly first: number | null
    readonly last: number | null
  } | null
}

/** Shares of a total that nearly cancels explode; beyond this many times the total they are withheld. A convention of our own. */
const MOST_GROSS_CONTRIBUTION = 5

export const CAUTION =
  'An estimate from past returns, not advice. Local rules and licensed practice come first.'

const ESTIMATORS = {
  sample: () => 'Sample covariance: every date counts alike, divisor T \u2212 1',
  exponential: (decay: number) =>
    `Exponential weighting, decay factor ${decay} (half-life ${numberText(Math.log(0.5) / Math.log(decay), 1)} dates); weighted means taken off, weights sum to 1`,
}

/**
 * Computes the breakdown of a book.
 *
 *   s = sqrt(w'Cw),   contribution c_i = w_i (Cw)_i / s,   sum of c_i = s,   share p_i = c_i / s
 *
 * A share is also an elasticity: a position 1% larger (of itself) moves volatility by p_i percent (of itself), first order.
 *
 * @throws Fault  what core's decompose throws
 * @cost          one pass of the model, and one for every group
 */
export function breakDown(
  holdings: HoldingsReading,
  returns: ReturnsReading,
  match: Match,
  book: BookModel,
  settings: Settings,
): Breakdown {
  const weights = Float64Array.from(holdings.holdings, ({ weight }) => weight)
  const periods = settings.periodsPerYear ?? returns.proposedPeriodsPerYear
  // what was odd in the reading changes what the figures mean, so it goes with them wherever they are written
  const odd = [...holdings.findings, ...returns.findings].filter(({ weight }) => weight === 'warns')
  const findings: Finding[] = [...odd, ...match.findings, ...book.findings]
  const perPeriod = decompose(book.model, weights)
  const decomposition = annualise(perPeriod, periods ?? 1)
  if (periods === null)
    findings.push({
      weight: 'warns',
      sentence:
        returns.content === 'covariance'
          ? 'Figures are in the period of the covariance matrix: set the periods per year to scale them.'
          : `Figures are per period: the dates do not tell how many make a year (${returns.frequency}). Set the periods per year.`,
      area: null,
    })

  const byGroup = holdings.groupHeaders.map((header, k): GroupSection => {
    const { groupOf, labels } = groupsOf(holdings.holdings.map(({ groups }) => groups[k]))
    const unassigned = holdings.holdings.filter(({ groups }) => plainName(groups[k] ?? '') === '').length
    if (unassigned > 0)
      findings.push({
        weight: 'notes',
        sentence: `${header}: ${countOf(unassigned, 'holding')} without a label ${unassigned === 1 ? 'stands' : 'stand'} under ${UNASSIGNED}.`,
        area: null,
      })
    return { header, labels, parts: groupDecomposition(book.model, decomposition, groupOf, labels.length) }
  })

  const grossContribution = decomposition.contribution.reduce((sum, c) => sum + Math.abs(c), 0)
  const ratio = grossContribution / decomposition.volatility
  const sharesWithheld =
    decomposition.share === null
      ? 'Shares of risk are not defined: the total risk is 0.'
      : ratio > MOST_GROSS_CONTRIBUTION
        ? `Shares of risk are withheld: contributions nearly cancel (without their signs they are ${numberText(ratio, 1)} times the total), so shares of the total say little. Read the contributions.`
        : null
  const negative = decomposition.share?.some((share) => share < 0) ?? false
  return {
    names: holdings.holdings.map(({ name }) => name),
    groups: holdings.holdings.map(({ groups }) => groups.map((label) => (label === '' ? UNASSIGNED : label))),
    groupHeaders: holdings.groupHeaders,
    decomposition,
    byGroup,
    net: holdings.net,
    gross: holdings.gross,
    expectedReturn: expectedReturnOf(holdings, match, book, periods, findings),
    horizon: periods === null ? 'per period' : 'a year',
    settings: settingLines(holdings, returns, book, settings, periods),
    findings: byGravity(findings),
    sharesWithheld,
    effectiveWithheld:
      sharesWithheld !== null
        ? 'withheld with the shares of risk'
        : negative
          ? 'withheld while a share of risk is negative'
          : null,
    dates: book.window,
  }
}

/** The book's expected return: from the user's own column where it is complete, else the average of past returns, said which. */
function expectedReturnOf(
  holdings: HoldingsReading,
  match: Match,
  book: BookModel,
  periods: number | null,
  findings: Finding[],
): Breakdown['expectedReturn'] {
  const held = holdings.holdings
  const column = holdings.columns.find(({ role }) => role === 'expected return')
  const blank = held.filter(({ expected, weight }) => expected === null && weight !== 0)
  if (column && blank.length === 0)
    return {
      value: held.reduce((sum, { weight, expected }) => sum + weight * (expected ?? 0), 0),
      label: `Expected return (column ${quote(column.header)})`,
      horizon: 'a year',
    }
  if (column && blank.length < held.length)
    findings.push({
      weight: 'notes',
      sentence: `${quote(column.header)} is blank for ${listOf(blank.map(({ name }) => quote(name)))}: the average past return is shown instead.`,
      area: blank[0]?.cell ?? null,
    })
  if (!book.returnsModel) return null
  const { means } = book.returnsModel
  const riskless = held.filter(({ weight }, i) => weight !== 0 && (match.seriesOf[i] ?? -1) < 0)
  if (riskless.length > 0)
    findings.push({
      weight: 'notes',
      sentence: `The average past return counts ${listOf(riskless.map(({ name }) => quote(name)))} at 0: marked riskless, without returns.`,
      area: null,
    })
  return {
    value: held.reduce((sum, { weight }, i) => sum + weight * (means[i] ?? 0), 0) * (periods ?? 1),
    label: 'Average past return, not a forecast',
    horizon: periods === null ? 'per period' : 'a year',
  }
}

/** The settings and conventions that the figures depend on, in words. */
function settingLines(
  holdings: HoldingsReading,
  returns: ReturnsReading,
  book: BookModel,
  settings: Settings,
  periods: number | null,
): readonly (readonly [string, string])[] {
  const { estimator, lookBack } = settings
  const lines: [string, string][] = [
    ['Holdings', `${addressOf(holdings.area)}: ${holdings.summary}`],
    [
      returns.content === 'covariance' ? 'Covariance' : 'Returns',
      `${addressOf(returns.area)}: ${returns.summary}`,
    ],
  ]
  const { window } = book
  if (window) {
    const span =
      window.first === null || window.last === null
        ? ''
        : `, ${dateText(window.first)} to ${dateText(window.last)}`
    lines.push(
      [
        'Dates used',
        `${window.used}${span}; ${window.dropped} left out for gaps (dates common to all holdings)`,
      ],
      [
        'Look-back',
        lookBack.kind === 'all'
          ? 'All dates'
          : lookBack.kind === 'last'
            ? `Last ${countOf(lookBack.dates, 'date')}`
            : `Since ${dateText(lookBack.date)}`,
      ],
      [
        'Estimator',
        estimator.kind === 'sample' ? ESTIMATORS.sample() : ESTIMATORS.exponential(estimator.decay),
      ],
    )
  }
  lines.push([
    'Scaling',
    periods === null
      ? 'Per period, not scaled'
      : `Per period times the square root of ${numberText(periods, Number.isInteger(periods) ? 0 : 2)} periods a year${settings.periodsPerYear === null ? ' (from the dates)' : ''}; holds for returns without autocorrelation`,
  ])
  if (settings.riskless.length > 0)
    lines.push(['Riskless', `${settings.riskless.join(', ')} (marked by the user)`])
  const sums = `net ${percentText(holdings.net, 2)}, gross ${percentText(holdings.gross, 2)}`
  lines.push([
    'Capital',
    holdings.capital === null
      ? `Weights are used as they stand: ${sums}`
      : `Weights are amounts divided by ${numberText(holdings.capital, 2)}${settings.capital === null ? ' (their sum)' : ''}: ${sums}`,
  ])
  return lines
}
