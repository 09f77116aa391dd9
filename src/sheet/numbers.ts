import type { CellValue, Culture } from './cells'

const SPACES = /[\s\u00a0\u202f\u2009]/g
const MINUSES = /[\u2212\u2013\u2010\u2011]/g

const escaped = (text: string): string => text.replace(/[.*+?^${}()|[\]\\]/g, '\\$&')

/**
 * Reads a number typed as text the way the workbook's language writes it: separators of the culture, a percent sign, a currency
 * sign, parentheses or a trailing minus for negatives. Anything else, a wrongly placed group separator included, is null: "1,5" is
 * not a number where the comma groups thousands.
 *
 * @example numberFromText('(3.0%)', { decimal: '.', group: ',', dateOrder: 'mdy' }) // -0.03
 */
export function numberFromText(text: string, culture: Culture): number | null {
  let left = text.replace(SPACES, '').replace(MINUSES, '-')
  let sign = 1
  const percent = /^%|%$|%\)$/.test(left)
  if (percent) left = left.replace('%', '')
  left = left.replace(/^(-?\(?-?)\p{Sc}/u, '$1').replace(/\p{Sc}(\)?-?)$/u, '$1')
  if (/^\(.*\)$/.test(left)) {
    sign = -1
    left = left.slice(1, -1)
  } else if (left.startsWith('-')) {
    sign = -1
    left = left.slice(1)
  } else if (left.endsWith('-')) {
    sign = -1
    left = left.slice(0, -1)
  } else if (left.startsWith('+')) left = left.slice(1)
  // spaces have gone already, so a culture that groups by space groups by nothing here
  const group = culture.group.replace(SPACES, '')
  const whole = group === '' ? '\\d+' : `(?:\\d{1,3}(?:${escaped(group)}\\d{3})+|\\d+)`
  const point = escaped(culture.decimal)
  if (!new RegExp(`^(?:${whole}(?:${point}\\d*)?|${point}\\d+)(?:[eE][-+]?\\d+)?$`).test(left)) return null
  const plain = (group === '' ? left : left.replaceAll(group, '')).replace(culture.decimal, '.')
  const value = Number(plain)
  return Number.isFinite(value) ? (sign * value) / (percent ? 100 : 1) : null
}

/** The number in a cell: a number as it stands, text by the culture, anything else null. */
export const numberInCell = (value: CellValue, culture: Culture): number | null =>
  typeof value === 'number' ? value : typeof value === 'string' ? numberFromText(value, culture) : null

const MONTH_NAMES = ['jan', 'feb', 'mar', 'apr', 'may', 'jun', 'jul', 'aug', 'sep', 'oct', 'nov', 'dec']

/** Serial number of a calendar day, or null when there is no such day. */
function serialOf(year: number, month: number, day: number): number | null {
  const time = Date.UTC(year, month - 1, day)
  const date = new Date(time)
  // a year below 100 would be taken for one of the twentieth century
  return date.getUTCFullYear() === year && date.getUTCMonth() === month - 1 && date.getUTCDate() === day
    ? time / 86400000 + 25569
    : null
}

/**
 * Reads a date typed as text: ISO first, then day, month and year in the culture's order, then a month as an English word.
 * Two-digit years are not guessed.
 *
 * @example dateFromText('27/11/2026', { decimal: ',', group: '.', dateOrder: 'dmy' }) // 46353
 */
export function dateFromText(text: string, culture: Culture): number | null {
  const trimmed = text.trim()
  const iso = /^(\d{4})[-/.](\d{1,2})[-/.](\d{1,2})(?:[T ].*)?$/.exec(trimmed)
  if (iso) return serialOf(Number(iso[1]), Number(iso[2]), Number(iso[3]))
  const digits = /^(\d{1,2})[-/. ](\d{1,2})[-/. ](\d{4})$/.exec(trimmed)
  if (digits && culture.dateOrder !== 'ymd') {
    const [first, second, year] = [Number(digits[1]), Number(digits[2]), Number(digits[3])]
    return culture.dateOrder === 'dmy' ? serialOf(year, second, first) : serialOf(year, first, second)
  }
  const word = /^(\d{1,2})[- ]?([a-z]{3})[a-z]*\.?,?[- ]?(\d{4})$/i.exec(trimmed)
  if (word)
    return serialOf(Number(word[3]), MONTH_NAMES.indexOf((word[2] ?? '').toLowerCase()) + 1, Number(word[1]))
  return null
}

/** The day in a cell, with its time of day where it has one: a number from 1 Jan 1920 to 31 Dec 2119, or text that reads as a date. */
export function dateInCell(value: CellValue, culture: Culture): number | null {
  if (typeof value === 'number') return value >= 7306 && value < 80355 ? value : null
  return typeof value === 'string' ? dateFromText(value, culture) : null
}
