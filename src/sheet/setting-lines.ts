import type { Blocks, BookModel } from './book-model'
import { GAP_WORDS } from './book-model'
import { addressOf } from './cells'
import { currencyText } from './currency'
import type { EstimatorChoice, Settings } from './settings'
import { countOf, dateText, numberText, percentText } from './wording'

const TARGETS = {
  identity: 'a multiple of the identity (Ledoit & Wolf 2004)',
  correlation: 'constant correlation, variances kept (Ledoit & Wolf 2004)',
  oas: 'a multiple of the identity (Chen, Wiesel, Eldar & Hero 2010)',
} as const

/** What goes with a rule for gaps that leaves no date out. */
const PAIRED = {
  'own overlap': 'Sample covariance of each pair over the dates it shares, divisor those dates \u2212 1',
  completed:
    'Maximum likelihood under normal returns, divisor T: each shorter history by regression on the longer ones (Stambaugh 1997)',
} as const

/** What the covariance is estimated by, as one line. */
export function estimatorText(estimator: EstimatorChoice): string {
  switch (estimator.kind) {
    case 'sample':
      return 'Sample covariance: every date counts alike, divisor T \u2212 1'
    case 'exponential':
      return `Exponential weighting, decay factor ${Number(estimator.decay.toFixed(6))} (half-life ${numberText(Math.log(0.5) / Math.log(estimator.decay), 1)} dates); weighted means taken off, weights sum to 1`
    case 'population':
      return 'Every date counts alike, divisor T'
    case 'shrinkage':
      return `Shrinkage of the covariance (divisor T) toward ${TARGETS[estimator.target]}`
    case 'lagged':
      return `${countOf(estimator.lags, 'lagged term')} with falling weights (Newey & West 1987), divisor T`
    case 'factors':
      return 'Factor model: exposures by least squares, what they leave counts as uncorrelated between holdings'
  }
}

/** The settings and conventions that the figures depend on, as label and value. */
export function settingLines(
  { holdings, returns, match }: Blocks,
  book: BookModel,
  settings: Settings,
  periods: number | null,
): readonly (readonly [string, string])[] {
  const { estimator, lookBack } = settings
  const lines: (readonly [string, string])[] = [
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
        `${window.used}${span}${window.dropped > 0 ? `; ${window.dropped} left out for gaps` : ''}`,
      ],
      ['Rule for gaps', sentenceCase(GAP_WORDS[settings.gaps])],
      [
        'Look-back',
        lookBack.kind === 'all'
          ? 'All dates'
          : lookBack.kind === 'last'
            ? `Last ${countOf(lookBack.dates, 'date')}`
            : `Since ${dateText(lookBack.date)}`,
      ],
      ['Estimator', book.rule === 'common dates' ? estimatorText(estimator) : PAIRED[book.rule]],
      ...book.quality,
    )
  }
  lines.push([
    'Scaling',
    periods === null
      ? 'Per period, not scaled'
      : `Per period times the square root of ${numberText(periods, Number.isInteger(periods) ? 0 : 2)} periods a year${settings.periodsPerYear === null ? ' (from the dates)' : ''}; ${window && estimator.kind === 'lagged' ? 'autocorrelation beyond the lagged terms is not allowed for' : 'holds for returns without autocorrelation'}`,
  ])
  if (settings.riskless.length > 0)
    lines.push(['Riskless', `${settings.riskless.join(', ')} (marked by the user)`])
  if (match.currencies) lines.push(['Base currency', currencyText(match.currencies, returns)])
  const sums = `net ${percentText(holdings.net, 2)}, gross ${percentText(holdings.gross, 2)}`
  lines.push([
    'Capital',
    holdings.capital === null
      ? `Weights are used as they stand: ${sums}`
      : `Weights are amounts divided by ${numberText(holdings.capital, 2)}${settings.capital === null ? ' (their sum)' : ''}: ${sums}`,
  ])
  return lines
}

const sentenceCase = (text: string): string => text.charAt(0).toUpperCase() + text.slice(1)
