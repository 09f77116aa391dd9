import { tailRisk } from '../core'
import type { Decomposition, TailRisk } from '../core'
import { grossRatio, MOST_GROSS_CONTRIBUTION } from './benchmark'
import type { BookModel } from './book-model'
import { attempt, explain } from './explain'
import type { Finding } from './findings'
import type { ReturnsReading } from './returns'
import type { TailChoice } from './settings'
import { confidenceText, countOf, numberText, percentText, quote } from './wording'

/** The tail of the book's return, for the horizon and the confidence that were chosen. Losses are positive. */
export interface Tails {
  readonly risk: TailRisk
  /** what the figures are, such as "95% confidence, 1 week, historical" */
  readonly label: string
  /** how they are computed, in words */
  readonly method: string
  /** what has to be said beside the standard error of value at risk */
  readonly errorNote: string
  /** why parts and shares are not shown, or null */
  readonly partsWithheld: string | null
  /** where shares of shortfall and of volatility part most, as a sentence; null where nothing parts them */
  readonly difference: string | null
}

/** Fewer tail observations than this are told beside the figure; fewer than the second withhold its parts. Our own convention. */
const FEW = 10
const TOO_FEW = 5

/** From about this confidence on, fat tails thin the density at the quantile and make its error larger. */
const FAT_FROM = 0.9

/** A share of shortfall this far from the share of volatility is pointed out. Our own convention. */
const FAR = 0.02

/**
 * Value at risk and expected shortfall of a book with their parts.
 *
 * @param d  per period or scaled: shares alone are used
 * @returns  or the sentence why there are none
 */
export function tailsOf(
  book: BookModel,
  d: Decomposition,
  choice: TailChoice,
  names: readonly string[],
  returns: ReturnsReading,
  sharesWithheld: string | null,
  findings: Finding[],
): Tails | string {
  if (choice.periods !== 1 && !scalesWithTime(choice))
    return `The horizon is ${horizonOf(choice.periods, returns)}: ${choice.method.kind === 'historical' ? 'past returns tell the losses' : 'skewness and kurtosis are those'} of one period alone. Choose a horizon of 1, or the normal or Student’s t distribution, which scale with the square root of time.`
  const { method } = choice
  if (
    book.history === null &&
    method.kind !== 'normal' &&
    !(method.kind === 'student' && method.degrees !== null)
  )
    return 'A covariance matrix holds no past returns to find this in. Choose the normal distribution, or Student’s t with its degrees of freedom.'
  const { value: risk, fault } = attempt(() => tailRisk(book.model, d.weights, choice, book.history))
  if (fault) return explain(fault, () => '')
  const few = risk.tailObservations !== null && risk.tailObservations < FEW
  const observations = numberText(risk.tailObservations ?? 0, 1)
  const ratio = risk.parts && risk.shortfall ? grossRatio(risk.parts, Math.abs(risk.shortfall)) : 0
  if (few)
    findings.push({
      weight: 'warns',
      sentence: `The tail figures at ${confidenceText(choice.confidence)} confidence rest on ${observations} dates beyond it: rough figures. A lower confidence or more dates make them surer.`,
      area: null,
    })
  const partsWithheld =
    risk.parts === null
      ? risk.shortfall === null
        ? 'This method gives no expected shortfall, and so no parts of it.'
        : null
      : risk.shares === null
        ? 'Parts are not shown: there is no loss to share, as the expected shortfall is not above 0.'
        : risk.tailObservations !== null && risk.tailObservations < TOO_FEW
          ? `Parts are withheld: ${observations} dates lie in the tail, and each part would be the accident of one or two of them.`
          : ratio > MOST_GROSS_CONTRIBUTION
            ? `Parts are withheld: they nearly cancel (without their signs they are ${numberText(ratio, 1)} times the expected shortfall), so each says little of it.`
            : sharesWithheld
  return {
    risk,
    label: `${confidenceText(choice.confidence)} confidence, ${horizonOf(choice.periods, returns)}`,
    method: `${methodText(risk)}${restsOn(risk, book)}`,
    errorNote:
      choice.confidence >= FAT_FROM
        ? 'at least: fat tails make it larger'
        : 'with the density of a normal distribution',
    partsWithheld,
    difference: partsWithheld === null ? differenceOf(risk, d, names) : null,
  }
}

/** Whether a method can look further ahead than one period. */
export const scalesWithTime = ({ method: { kind } }: TailChoice): boolean =>
  kind === 'normal' || kind === 'student'

const PERIODS: { readonly [frequency: string]: string } = {
  daily: 'day',
  weekly: 'week',
  monthly: 'month',
  quarterly: 'quarter',
  yearly: 'year',
}

/** The horizon in the book's own periods. */
export const horizonOf = (periods: number, returns: ReturnsReading): string =>
  countOf(periods, PERIODS[returns.frequency.split(',')[0] ?? ''] ?? 'period')

function methodText(risk: TailRisk): string {
  switch (risk.method.kind) {
    case 'normal':
      return 'Normal distribution with the volatility of the model, mean taken as zero'
    case 'student':
      return risk.degrees === Infinity
        ? 'Student’s t distribution fitted to the book’s returns: no tails fatter than normal were found, so it is the normal one'
        : `Student’s t distribution with ${numberText(risk.degrees ?? 0, 1)} degrees of freedom${risk.method.degrees === null ? ', fitted to the book’s returns,' : ''} and the volatility of the model, mean taken as zero`
    case 'historical':
      return `Past returns at today’s weights, every date counting alike: ${numberText(risk.tailObservations ?? 0, 1)} dates in the tail`
    case 'cornish-fisher':
      return `Normal distribution corrected for skewness ${numberText(risk.skewness ?? 0, 2)} and excess kurtosis ${numberText(risk.excessKurtosis ?? 0, 2)}, mean taken as zero`
  }
}

/** The dates of past returns, where the model rests on others. */
const restsOn = ({ degrees, method }: TailRisk, { rule, history }: BookModel): string =>
  rule === 'common dates' ||
  history === null ||
  method.kind === 'normal' ||
  (method.kind === 'student' && (method.degrees !== null || degrees === null))
    ? ''
    : `; from the ${countOf(history.dates, 'date')} common to all holdings alone`

function differenceOf(risk: TailRisk, d: Decomposition, names: readonly string[]): string | null {
  const { shares } = risk
  if (shares === null || d.share === null) return null
  const { share } = d
  const gaps = shares.map((value, i) => value - (share[i] ?? 0))
  const most = gaps.reduce((best, gap, i) => (Math.abs(gap) > Math.abs(gaps[best] ?? 0) ? i : best), 0)
  if (Math.abs(gaps[most] ?? 0) < FAR) return null
  return `Shares of large losses are not those of volatility: ${quote(names[most] ?? '')} has ${percentText(share[most] ?? 0, 1)} of the volatility but ${percentText(shares[most] ?? 0, 1)} of the expected shortfall.`
}
