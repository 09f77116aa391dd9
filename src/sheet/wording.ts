import { RISK_BAND } from '../core'

/** How numbers, dates, names and counts read in a sentence: en-US digits, day before month as a word, curly quotes. */

const MONTHS = ['Jan', 'Feb', 'Mar', 'Apr', 'May', 'Jun', 'Jul', 'Aug', 'Sep', 'Oct', 'Nov', 'Dec']

const MINUS = '\u2212'

/**
 * The day a workbook's serial number stands for (1900 date system, days from 1 March 1900 on).
 * @example dateText(46351) // '25 Nov 2026'
 */
export function dateText(serial: number): string {
  const day = new Date((Math.floor(serial) - 25569) * 86400000)
  return `${day.getUTCDate()} ${MONTHS[day.getUTCMonth()] ?? ''} ${day.getUTCFullYear()}`
}

/**
 * A fraction as a percentage with a true minus sign.
 * @example percentText(-0.0213, 1) // '−2.1%'
 */
export function percentText(fraction: number, digits = 1): string {
  const shown = (Math.abs(fraction) * 100).toFixed(digits)
  return `${fraction < 0 && Number(shown) !== 0 ? MINUS : ''}${shown}%`
}

/**
 * A confidence level as it is typed.
 * @example confidenceText(0.975) // '97.5%'
 */
export const confidenceText = (confidence: number): string => `${Number((confidence * 100).toFixed(6))}%`

/**
 * A plain number, thousands parted by commas.
 * @example numberText(-12345.678, 2) // '−12,345.68'
 */
export function numberText(value: number, digits = 2): string {
  const shown = Math.abs(value).toLocaleString('en-US', {
    minimumFractionDigits: digits,
    maximumFractionDigits: digits,
  })
  return `${value < 0 && Number(shown.replaceAll(',', '')) !== 0 ? MINUS : ''}${shown}`
}

/**
 * A count with its noun.
 * @example countOf(2, 'holding') // '2 holdings'
 */
export const countOf = (count: number, noun: string, plural = `${noun}s`): string =>
  `${count.toLocaleString('en-US')} ${count === 1 ? noun : plural}`

const ENDINGS: { readonly [lastDigit: number]: string } = { 1: 'st', 2: 'nd', 3: 'rd' }

/**
 * Which one of a row of things.
 * @example ordinal(2) // 'second'
 * @example ordinal(21) // '21st'
 * @example ordinal(112) // '112th'
 */
export function ordinal(k: number): string {
  if (k === 2) return 'second'
  if (k === 3) return 'third'
  const isTeen = Math.floor(k / 10) % 10 === 1
  return `${k}${isTeen ? 'th' : (ENDINGS[k % 10] ?? 'th')}`
}

/** What a user typed, in quotes and cut to a readable length. */
export function quote(text: unknown): string {
  const shown = String(text)
  return `\u201c${shown.length > 40 ? `${shown.slice(0, 38)}\u2026` : shown}\u201d`
}

/**
 * A list read aloud, cut after `most`.
 * @example listOf(['a', 'b', 'c', 'd'], 2) // 'a, b and 2 more'
 */
export function listOf(items: readonly string[], most = 3): string {
  if (items.length > most) return `${items.slice(0, most).join(', ')} and ${items.length - most} more`
  return items.length < 2 ? (items[0] ?? '') : `${items.slice(0, -1).join(', ')} and ${items.at(-1) ?? ''}`
}

/** The columns of figures that a table of positions has, in their order. */
export const POSITION_HEADS = [
  'Weight',
  'Stand-alone risk',
  'Marginal contribution to risk',
  'Contribution to risk',
  'Share of risk',
  'Beta to portfolio',
  'Correlation with portfolio',
] as const

/** What stands beside all figures, wherever they are shown. */
export const CAUTION =
  'An estimate from past returns, not advice. Local rules and licensed practice come first.'

/** How many standard errors a 95% band reaches to either side. */
export const BAND = RISK_BAND

/** Both ends of the 95% band of a figure. */
export const bandOf = (value: number, error: number): readonly [from: number, to: number] => [
  value - BAND * error,
  value + BAND * error,
]

/** The same as a part of a sentence. */
export function bandText(value: number, error: number, digits: number): string {
  const [from, to] = bandOf(value, error)
  return `${percentText(from, digits)} to ${percentText(to, digits)}`
}
