import { annualise, decompose, groupDecomposition, jarqueBera, NORMALITY_LEVEL } from '../core'
import type { BlockNormality, Decomposition, GroupDecomposition, SeriesNormality } from '../core'
import type { Bands } from './bands'
import { bandsOf } from './bands'
import type { Active } from './benchmark'
import { activeOf, sharesWithheldOf } from './benchmark'
import type { Blocks, BookModel } from './book-model'
import type { CurrencyRisk } from './currency'
import { currencyRiskOf } from './currency'
import type { Check, CheckKind } from './checks'
import type { Finding } from './findings'
import { byGravity } from './findings'
import type { HoldingsReading } from './holdings'
import type { LimitsReading, LimitState } from './limits'
import { judgeLimits, limitsOf } from './limits'
import type { Match } from './matching'
import { groupsOf, plainName, UNASSIGNED } from './names'
import type { NestedGroup } from './nesting'
import { nestedGroups } from './nesting'
import { profileBasis } from './profile'
import { settingLines } from './setting-lines'
import type { Settings } from './settings'
import type { Tails } from './tail-section'
import { tailsOf } from './tail-section'
import { countOf, listOf, numberText, quote } from './wording'

export interface GroupSection {
  readonly header: string
  readonly labels: readonly string[]
  readonly parts: GroupDecomposition
}

/** Contributions to risk by factor and, of what the factors leave, by holding; they add up to the volatility. */
export interface FactorSplit {
  readonly names: readonly string[]
  readonly systematic: Float64Array
  readonly specific: Float64Array
  /** share of each holding's variance that the factors explain; NaN for a riskless one */
  readonly explained: Float64Array
}

/** Whether the book's returns look normal, which volatility as the one measure of risk leans on. */
export interface NormalityVerdict {
  readonly sentence: string
  readonly book: SeriesNormality
  /** whether single series, or all together, do not look normal whatever the book does */
  readonly partsDepart: boolean
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
  /** by the chosen nesting of group columns; empty while none is chosen */
  readonly nested: readonly NestedGroup[]
  /** or why there are none */
  readonly bands: Bands | string
  /** or why there are none */
  readonly tails: Tails | string
  /** null while there is no benchmark */
  readonly active: Active | null
  /** null while no base currency is chosen */
  readonly currency: CurrencyRisk | null
  readonly factors: FactorSplit | null
  readonly normality: NormalityVerdict | null
  /** those of the table of limits, then those of the limit column; empty while there are none */
  readonly limits: readonly LimitState[]
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

/** Suspicions about the data that the model tells itself, by what it did about them. Of few dates it tells only where mixes look riskless. */
const TOLD_BY_THE_MODEL: ReadonlySet<CheckKind> = new Set(['constant', 'short history', 'gaps'])

/**
 * Computes the breakdown of a book.
 *
 *   s = sqrt(w'Cw),   contribution c_i = w_i (Cw)_i / s,   sum of c_i = s,   share p_i = c_i / s
 *
 * A share is also an elasticity: a position 1% larger (of itself) moves volatility by p_i percent (of itself), first order.
 *
 * @param checks  of the data: those that warn stand with the figures
 * @throws Fault  what core's decompose throws
 * @cost          one pass of the model, and one for every group
 */
export function breakDown(
  blocks: Blocks & { readonly limits?: LimitsReading | null },
  book: BookModel,
  settings: Settings,
  checks: readonly Check[] = [],
): Breakdown {
  const { holdings, returns, match } = blocks
  const weights = Float64Array.from(holdings.holdings, ({ weight }) => weight)
  const periods = settings.periodsPerYear ?? returns.proposedPeriodsPerYear
  // what was odd in the reading changes what the figures mean, so it goes with them wherever they are written
  const odd = [...holdings.findings, ...returns.findings].filter(({ weight }) => weight === 'warns')
  const findings: Finding[] = [
    ...odd,
    ...match.findings,
    ...(match.currencies?.findings ?? []),
    ...book.findings,
    ...checks.filter(({ weight, kind }) => weight === 'warns' && !TOLD_BY_THE_MODEL.has(kind)),
  ]
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

  const sharesWithheld = sharesWithheldOf(decomposition)
  const negative = decomposition.share?.some((share) => share < 0) ?? false
  const names = holdings.holdings.map(({ name }) => name)
  const active = activeOf(holdings, book, settings, periods, findings)
  const { limits, findings: ofLimits } = limitsOf(holdings, blocks.limits ?? null)
  // a limit that does not read stops nothing but its own verdict
  for (const finding of ofLimits)
    findings.push(
      finding.weight === 'stops'
        ? { ...finding, weight: 'warns', sentence: `Not judged: ${finding.sentence}` }
        : finding,
    )
  const bands = bandsOf(book, decomposition)
  const tails = tailsOf(book, decomposition, settings.tails, names, returns, sharesWithheld, findings)
  return {
    names,
    groups: holdings.holdings.map(({ groups }) => groups.map((label) => (label === '' ? UNASSIGNED : label))),
    groupHeaders: holdings.groupHeaders,
    decomposition,
    byGroup,
    nested: nestedGroups(
      book.model,
      decomposition,
      holdings.holdings,
      holdings.groupHeaders,
      settings.nesting,
    ),
    bands,
    tails,
    active,
    currency: currencyRiskOf(match.currencies, book.currency, decomposition),
    factors: factorSplit(book, decomposition),
    normality: normalityOf(book, weights),
    limits:
      limits.length === 0
        ? []
        : judgeLimits(limits, profileBasis(blocks, book, settings).profileOf(weights), bands),
    net: holdings.net,
    gross: holdings.gross,
    expectedReturn: expectedReturnOf(holdings, match, book, periods, findings),
    horizon: periods === null ? 'per period' : 'a year',
    settings: settingLines(blocks, book, settings, periods),
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
  if (!book.history) return null
  const { means } = book.history
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

/** What the factors make of the volatility, and what is each holding's own. */
function factorSplit({ factors }: BookModel, d: Decomposition): FactorSplit | null {
  if (!factors) return null
  const { systematic, specific } = factors.model.split(d.weights)
  const scale = Math.sqrt(d.periodsPerYear)
  return {
    names: factors.names,
    systematic: systematic.map((part) => part * scale),
    specific: specific.map((part) => part * scale),
    explained: factors.model.rSquared,
  }
}

/** What the test of all series together says, as a part of a sentence, or why it could not be made. */
const TOGETHER: { readonly [V in BlockNormality['verdict']]: string } = {
  consistent: ', and the series together pass the test of Mardia',
  'heavy-tailed': ', and the series together have heavy tails (Mardia)',
  'light-tailed': ', and the series together have light tails (Mardia)',
  asymmetric: ', and the series together lean to one side (Mardia)',
  'too-few-dates': ' (there are too few dates to test them together)',
  'dependent-positions': ' (they are not tested together, as one of them follows from the others)',
}

/** Dates below which the test of Jarque and Bera rejects too seldom to be silent about it. Our own convention. */
const FEW_DATES = 100

/** Whether returns look normal, and what it means for shares of volatility, in plain words. */
function normalityOf({ history, normality }: BookModel, weights: Float64Array): NormalityVerdict | null {
  if (!history || !normality) return null
  const book = jarqueBera(history.portfolioReturns(weights))
  const { observations, statistic, pValue, skewness, excessKurtosis } = book
  if (statistic === null || pValue === null) return null
  const tested = normality.series.flatMap((series) => series.pValue ?? [])
  // with many series some fail by chance, so the level is divided by their number (Bonferroni)
  const failing = tested.filter((p) => p < NORMALITY_LEVEL / tested.length).length
  const others = `${failing} of ${countOf(tested.length, 'series', 'series')} ${failing === 1 ? 'fails' : 'fail'} the same test, at 5% over all of them${normality.block === null ? ' (so many numbers are not tested together)' : TOGETHER[normality.block.verdict]}`
  const figures = `Jarque–Bera ${numberText(statistic, 1)}, ${pValue < 0.001 ? 'p below 0.001' : `p ${numberText(pValue, 3)}`}; skewness ${numberText(skewness ?? 0, 2)}, excess kurtosis ${numberText(excessKurtosis ?? 0, 2)}`
  const few =
    observations < FEW_DATES
      ? ` With ${countOf(observations, 'date')} these tests see strong departures only.`
      : ''
  const block = normality.block?.verdict
  const partsDepart =
    failing > 0 || block === 'heavy-tailed' || block === 'light-tailed' || block === 'asymmetric'
  const meaning = {
    consistent: partsDepart
      ? 'shows no sign against a normal distribution, but the returns of its parts do: shares of volatility need not be shares of large losses'
      : block === 'consistent'
        ? 'shows no sign against a normal distribution, nor do its parts together: as far as these dates tell, shares of volatility can be read as shares of large losses too'
        : 'shows no sign against a normal distribution; its parts were not tested together, so that shares of large losses may still be others',
    'heavy-tailed':
      'has heavier tails than a normal distribution: large losses come more often than its volatility suggests, and shares of volatility need not be shares of large losses',
    'light-tailed':
      'has lighter tails than a normal distribution: large losses come more seldom than its volatility suggests',
    'skewed-to-losses':
      'leans to the side of losses: they are larger than its volatility suggests, and shares of volatility need not be shares of large losses',
    'skewed-to-gains': 'leans to the side of gains: losses are smaller than its volatility suggests',
    'not-tested': 'could not be tested',
  }[book.verdict]
  return {
    book,
    partsDepart,
    sentence: `The book’s past return at today’s weights ${meaning} (${figures}). ${others}.${few}`,
  }
}
