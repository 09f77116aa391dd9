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
 * The table as HTML: sentences as paragraphs, figures as tables in the format they are shown in. Programs for sheets find each number with
 * all its digits, and its format, in attributes of its cell.
 */
export function htmlOf({ cells, numeric }: Table): string {
  const parts: string[] = []
  for (let at = 0; at < cells.length;) {
    const row = cells[at] ?? []
    const isTable = row.some((cell, k) => k > 0 && !isBlank(cell))
    if (!isTable) {
      const [first] = row
      if (!isBlank(first)) parts.push(paragraph(first!))
      at++
      continue
    }
    let end = at
    while (end < cells.length && cells[end]!.some((cell) => !isBlank(cell))) end++
    parts.push(tableOf(cells.slice(at, end), numeric))
    at = end
  }
  return `<html xmlns:x="urn:schemas-microsoft-com:office:excel"><head><meta charset="utf-8"></head><body style="font-family:Arial,sans-serif;font-size:10pt">${parts.join('')}</body></html>`
}

const styled = (mark: Mark | undefined, more: string): string => {
  const style = [mark ? LOOK[mark] : '', more].filter((part) => part !== '').join(';')
  return style === '' ? '' : ` style="${escaped(style)}"`
}

const paragraph = ({ value, mark }: TableCell): string =>
  `<p${styled(mark, '')}>${escaped(String(value))}</p>`

function tableOf(rows: readonly (readonly TableCell[])[], numeric: readonly boolean[]): string {
  const columns = Math.max(
    ...rows.map((row) => row.reduce((last, cell, k) => (isBlank(cell) ? last : k + 1), 0)),
  )
  const cell = (of: TableCell, k: number): string => {
    const { value, format, mark } = of
    const aligned = typeof value === 'number' || (mark === 'head' && numeric[k]) ? ' align="right"' : ''
    if (typeof value === 'number')
      return `<td nowrap${aligned}${styled(mark, `mso-number-format:"${format}"`)} x:num="${value}" sdval="${value}" sdnum="1033;0;${format}">${shownNumber(value, format)}</td>`
    // said to be text, whatever it looks like
    return `<td nowrap${aligned}${styled(mark, isBlank(of) ? '' : 'mso-number-format:"\\@"')}>${escaped(String(value))}</td>`
  }
  const lines = rows.map((row) => `<tr>${row.slice(0, columns).map(cell).join('')}</tr>`)
  return `<table cellpadding="3" style="border-collapse:collapse">${lines.join('')}</table>`
}
