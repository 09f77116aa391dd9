import { dateText, type Mark, type Table, type TableCell } from '../sheet'

/**
 * A written table as other programs take it from the clipboard: as text with every digit, for cells, and as HTML that looks like the
 * table, for documents and letters. Both are made from the same cells that are written to a sheet.
 */

/** What a program for sheets would take for the beginning of a formula. */
const LIKE_A_FORMULA = /^[=+\-@]/

const isBlank = (cell: TableCell | undefined): boolean => !cell || cell.value === ''

/**
 * Cells parted by tabs, rows by line ends; numbers as they are, not as they are shown. A text that would become a formula where it is pasted
 * gets an apostrophe before it.
 *
 * @param decimal  the mark before decimals where it will be pasted
 */
export function textOf({ cells }: Table, decimal: string): string {
  const text = ({ value }: TableCell): string => {
    if (typeof value === 'number') return String(value).replace('.', decimal)
    const plain = String(value).replace(/[\t\r\n]+/g, ' ')
    return LIKE_A_FORMULA.test(plain) ? `'${plain}` : plain
  }
  return cells.map((row) => row.map(text).join('\t').replace(/\t+$/, '')).join('\r\n')
}

const FORMAT = /^(#,##)?0(?:\.(0+))?(%|E\+00)?$/

/**
 * A number as a sheet shows it in one of the formats that tables are written with; other formats show all digits.
 * @example shownNumber(-0.08341, '0.00%') // '-8.34%'
 * @example shownNumber(0.0027, '+0.00%;-0.00%;0.00%') // '+0.27%'
 */
export function shownNumber(value: number, format: string): string {
  if (format === 'd mmm yyyy') return dateText(value)
  const [above = '', below, none] = format.split(';')
  // a format of several parts says the sign itself
  const part = value < 0 ? (below ?? `-${above}`) : value === 0 ? (none ?? above) : above
  const [, sign = '', plain = ''] = /^([+-]?)(.*)$/.exec(part) ?? []
  const [matched, thousands, decimals = '', kind] = FORMAT.exec(plain) ?? []
  if (matched === undefined) return String(value)
  const size = Math.abs(value)
  if (kind === 'E+00')
    return (
      sign +
      size
        .toExponential(decimals.length)
        .toUpperCase()
        .replace(/E([+-])(\d)$/, 'E$10$2')
    )
  const shown = (size * (kind === '%' ? 100 : 1)).toLocaleString('en-US', {
    minimumFractionDigits: decimals.length,
    maximumFractionDigits: decimals.length,
    useGrouping: thousands !== undefined,
  })
  return `${/[1-9]/.test(shown) ? sign : ''}${shown}${kind ?? ''}`
}

const escaped = (text: string): string =>
  text.replaceAll('&', '&amp;').replaceAll('<', '&lt;').replaceAll('>', '&gt;').replaceAll('"', '&quot;')

const LOOK: { readonly [M in Mark]: string } = {
  title: 'font-size:14pt;font-weight:bold',
  section: 'font-weight:bold',
  head: 'font-weight:bold;border-bottom:1pt solid #000000;vertical-align:bottom',
  total: 'font-weight:bold;border-top:1pt solid #000000',
  note: 'color:#444444',
  alert: 'font-weight:bold',
  wrapped: '',
}

/**
 * The table as HTML, its figures in the format they are shown in; a sentence takes the whole width. Programs for sheets find each number with
 * all its digits, and its format, in attributes of its cell. One table, so that its columns stay columns where it is pasted into cells.
 */
export function htmlOf({ cells, numeric }: Table): string {
  const used = (row: readonly TableCell[]): number =>
    row.reduce((last, cell, k) => (isBlank(cell) ? last : k + 1), 0)
  const width = Math.max(1, ...cells.map(used))
  const lines = cells.map((row) => {
    const filled = row.slice(0, used(row))
    const [first] = filled
    return filled.length === 1 && typeof first?.value === 'string'
      ? `<td colspan="${width}"${styled(first.mark, AS_TEXT)}>${escaped(first.value)}</td>`
      : filled.map((cell, k) => cellOf(cell, numeric[k] ?? false)).join('')
  })
  const body = lines.map((line) => `<tr>${line === '' ? '<td>&nbsp;</td>' : line}</tr>`).join('')
  return `<html xmlns:x="urn:schemas-microsoft-com:office:excel"><head><meta charset="utf-8"></head><body><table cellpadding="3" style="border-collapse:collapse;font-family:Arial,sans-serif;font-size:10pt">${body}</table></body></html>`
}

/** Said of every text: whatever it looks like, it is no number and no formula. */
const AS_TEXT = 'mso-number-format:"\\@"'

const styled = (mark: Mark | undefined, more: string): string => {
  const style = [mark ? LOOK[mark] : '', more].filter((part) => part !== '').join(';')
  return style === '' ? '' : ` style="${escaped(style)}"`
}

function cellOf({ value, format, mark }: TableCell, isNumeric: boolean): string {
  if (typeof value === 'number')
    return `<td nowrap align="right"${styled(mark, `mso-number-format:"${format}"`)} x:num="${value}" sdval="${value}" sdnum="1033;0;${format}">${shownNumber(value, format)}</td>`
  const aligned = mark === 'head' && isNumeric ? ' align="right"' : ''
  return `<td nowrap${aligned}${styled(mark, value === '' ? '' : AS_TEXT)}>${escaped(String(value))}</td>`
}
