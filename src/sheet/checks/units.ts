import { changesOf } from '../returns'
import { numberText, percentText, quote } from '../wording'
import { withReturns } from './corrections'
import type { Correction } from './corrections'
import type { Evidence, Held } from './evidence'
import { lowerMiddle } from './evidence'
import type { Found } from './telling'
import { lineOf, suspect, told } from './telling'

// Prices among returns, and returns typed as percentages without the sign. The thresholds are our own conventions.

/** No return is so large on average that never is a loss. */
const LEAST_PRICE = 0.5
/** An average return of this size is hardly a fraction; a smaller one when the others' are so many times smaller. */
const PERCENTS = 0.2
const LIKELY_PERCENTS = 0.1
const TIMES_THE_OTHERS = 10

export function pricesAmongReturns(evidence: Evidence): Found {
  const prices = evidence.held.filter(
    ({ fact }) => fact.count > 2 && fact.isPositive && fact.size > LEAST_PRICE,
  )
  return {
    explains: prices,
    checks: told(
      'prices among returns',
      prices.map((held) =>
        suspect(
          evidence,
          held,
          `${quote(held.name)} looks like prices among returns: always above 0, ${numberText(held.fact.size)} on average.`,
        ),
      ),
      (about) => ({
        effect: 'Levels are taken for returns: no figure that it enters means anything.',
        remedy:
          'Put its returns in the place of its prices (POISE.RETURNS makes them), or select prices for all.',
        corrections: [
          withReturns(evidence, 'With returns made of its prices', about, (x) =>
            Float64Array.of(NaN, ...changesOf(x, x.length, 1, 'simple')),
          ),
        ],
      }),
    ),
  }
}

export function percents(evidence: Evidence, open: readonly Held[]): Found {
  const others = open.filter(({ fact }) => fact.size > 0)
  const sizes = others.map(({ fact }) => fact.size)
  const usual = lowerMiddle(sizes)
  const suspected = others.filter(
    ({ fact: { size } }) => size > PERCENTS || (size > LIKELY_PERCENTS && size > TIMES_THE_OTHERS * usual),
  )
  const inHundredths = (label: string, about: readonly { readonly held: Held }[]): readonly Correction[] => [
    withReturns(evidence, label, about, (x) => x.map((value) => value / 100)),
  ]
  if (suspected.length * 2 > others.length) {
    const { area } = evidence.returns
    const average = sizes.reduce((sum, size) => sum + size, 0) / sizes.length
    const all = others.map((held) => ({ held }))
    return {
      checks: [
        lineOf({
          kind: 'percents',
          weight: 'warns',
          areas: [area],
          text: `the average size of a return is ${percentText(average, 0)}: are these percentages typed without a percent sign? They are used as fractions.`,
          effect:
            'If they are percentages, every risk in units of return is a hundred times too large; shares of risk are not changed.',
          remedy: 'Divide the cells by 100, or type them with a percent sign.',
          corrections: inHundredths('With all returns divided by 100', all),
        }),
      ],
    }
  }
  return {
    checks: told(
      'percents',
      suspected.map((held) =>
        suspect(
          evidence,
          held,
          `the returns of ${quote(held.name)} are ${percentText(held.fact.size, 0)} in size on average, the others’ around ${percentText(usual)}: percentages typed without a percent sign? They are used as fractions.`,
        ),
      ),
      (about) => ({
        effect:
          'If so, its risk is a hundred times too large and it seems to carry nearly all the risk of the book.',
        remedy: 'Divide the cells of the series by 100, or type them with a percent sign.',
        corrections: inHundredths('With the series divided by 100', about),
      }),
    ),
  }
}
