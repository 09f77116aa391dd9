import { countOf, listOf, numberText, percentText } from '../wording'
import { withEstimator } from './corrections'
import type { Evidence } from './evidence'
import type { Found } from './telling'
import { lineOf } from './telling'

// Whether the dates are enough: for the holdings, and for rules on how much history figures must rest on.

/** Dates a holding below which the covariance is told to be poor. Our own convention. */
const FEWEST_DATES_A_HOLDING = 2

export function fewDates(evidence: Evidence): Found {
  const { counted: dates } = evidence
  const { estimator } = evidence.settings
  const moving = evidence.held.filter(({ fact }) => !fact.isConstant).length
  if (moving < 2 || dates >= FEWEST_DATES_A_HOLDING * moving || estimator.kind === 'factors')
    return { checks: [] }
  const isShrunk = estimator.kind === 'shrinkage'
  return {
    checks: [
      lineOf({
        kind: 'few dates',
        weight: isShrunk ? 'notes' : 'warns',
        text: `${countOf(dates, 'date')} for ${countOf(moving, 'series', 'series')} that move: ${numberText(dates / moving, 1)} dates a series.`,
        areas: [],
        // seen in the data it was chosen from, the least variance of any mix is on average (T - n)/(T - 1) of its true one for normal returns:
        // Muirhead (1982), Aspects of Multivariate Statistical Theory, theorem 3.2.12 (from memory)
        effect:
          dates <= moving
            ? 'Some mixes of these holdings seem to have no risk at all, and no trade that relies on them can be trusted.'
            : `Correlations are told apart poorly: the calmest mix of these holdings would look as if it had ${percentText(Math.sqrt((dates - moving) / (dates - 1)), 0)} of its volatility.`,
        remedy: isShrunk
          ? 'Shrinkage, which is chosen, helps; more dates or fewer holdings help more.'
          : 'Use more dates (a longer look-back, a higher frequency), or shrinkage.',
        corrections: isShrunk
          ? []
          : [
              withEstimator(evidence, 'With shrinkage to constant correlation', {
                kind: 'shrinkage',
                target: 'correlation',
              }),
            ],
      }),
    ],
  }
}

/** How much history rules ask for, by frequency, in periods; told for information alone. */
const RULES: readonly {
  readonly name: string
  readonly asks: { readonly [frequency: string]: readonly [periods: number, words: string] }
}[] = [
  {
    name: 'CESR/10-788 of 2010',
    asks: { daily: [250, '1 year'] },
  },
  {
    name: 'Regulation (EU) 2017/653, Annex II',
    asks: { daily: [500, '2 years of daily prices'], weekly: [208, '4 years of weekly prices'], monthly: [60, '5 years of monthly prices'] },
  },
  {
    name: 'US Rule 18f-4 of 2020',
    asks: { daily: [750, '3 years'], weekly: [156, '3 years'], monthly: [36, '3 years'] },
  },
  {
    name: 'CESR/10-673 of 2010',
    asks: { weekly: [260, '5 years of weekly returns'], monthly: [60, '5 years of monthly returns'] },
  },
] // prettier-ignore

export function rulesOnHistory({ facts, counted: dates }: Evidence): Found {
  const frequency = facts.steps?.usual ?? ''
  const short = RULES.flatMap(({ name, asks }) => {
    const [periods, words] = asks[frequency] ?? [0, '']
    // prices are one more than returns
    return dates + 1 < periods ? [`${words} (${name})`] : []
  })
  if (short.length === 0) return { checks: [] }
  return {
    checks: [
      lineOf({
        kind: 'rules on history',
        weight: 'notes',
        text: `The figures rest on ${countOf(dates, `${frequency} return`)}; some rules ask for more: ${listOf(short, RULES.length)}.`,
        areas: [],
        effect:
          'The figures stand as they are; whether they may be reported under such a rule is another question.',
        remedy:
          'Find out what the rules that hold for this book ask: these are examples, and local rules come first.',
      }),
    ],
  }
}
