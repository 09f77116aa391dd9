import type { Breakdown } from './breakdown'
import { CAUTION } from './breakdown'
import type { Mark, Table, TableCell } from './table'
import { countOf, dateText, percentText, POSITION_HEADS } from './wording'

const PERCENT = '0.00%'
const SHARE = '0.0%'
const RATIO = '0.00'
const ROUNDING = '0.0E+00'

const marked = (mark: Mark | undefined): { mark?: Mark } => (mark ? { mark } : {})
const text = (value: string, mark?: Mark): TableCell => ({ value, format: '@', ...marked(mark) })
const number = (value: number | null | undefined, format: string, mark?: Mark): TableCell =>
  value === null || value === undefined || Number.isNaN(value)
    ? { value: '', format, ...marked(mark) }
    : { value, format, ...marked(mark) }

/** What the figures were estimated from, as a part of a sentence. */
function dataOf({ dates }: Breakdown): string {
  if (!dates) return ', from a covariance matrix as given'
  const span =
    dates.first === null || dates.last === null ? '' : `, ${dateText(dates.first)} to ${dateText(dates.last)}`
  return `, from ${countOf(dates.used, 'date')} of returns${span}`
}

/**
 * Lays a breakdown out as a table to be written: title and data dates, positions with a total row, the sum of parts and its
 * difference from the total, groups, the book's figures, settings, warnings, caution. Rows that may vary in number stand last,
 * so that a refresh of the same holdings fills the same cells.
 *
 * @returns rows of equal length; positions in the order of the holdings
 * @cost    O(positions + groups)
 */
export function breakdownTable(title: string, breakdown: Breakdown): Table {
  const { decomposition: d, groupHeaders, byGroup, settings, findings, sharesWithheld } = breakdown
  const labels = 1 + groupHeaders.length
  const width = labels + POSITION_HEADS.length + 1
  const rows: TableCell[][] = []
  const add = (...cells: TableCell[]): void => {
    const mark = cells[0]?.mark
    while (cells.length < width) cells.push(text('', mark === 'head' || mark === 'total' ? mark : undefined))
    rows.push(cells)
  }
  const blank = (): void => add()
  const share = (value: number | undefined, mark?: Mark): TableCell =>
    sharesWithheld === null
      ? number(value, SHARE, mark)
      : text(d.share === null ? 'not defined' : 'withheld', mark)
  /** cells between the name and the figures */
  const gap = (mark?: Mark): TableCell[] => Array.from({ length: labels - 1 }, () => text('', mark))

  const told = findings.filter(({ weight }) => weight !== 'notes').map(({ sentence }) => sentence)
  const warnings = sharesWithheld === null ? told : [sharesWithheld, ...told]
  add(text(`Contributions to risk: ${title}`, 'title'))
  add(text(`Volatility ${percentText(d.volatility, 2)} ${breakdown.horizon}${dataOf(breakdown)}.`))
  add(text(CAUTION, 'note'))
  if (warnings.length > 0)
    add(text(`${countOf(warnings.length, 'warning')}, at the end of this table.`, 'alert'))
  else blank()
  blank()

  add(...['Holding', ...groupHeaders, ...POSITION_HEADS, 'Note'].map((head) => text(head, 'head')))
  breakdown.names.forEach((name, i) => {
    const contribution = d.contribution[i] ?? 0
    add(
      text(name),
      ...(breakdown.groups[i] ?? []).map((label) => text(label)),
      number(d.weights[i], PERCENT),
      number(d.standAlone[i], PERCENT),
      number(d.marginal?.[i], PERCENT),
      number(contribution, PERCENT),
      share(d.share?.[i]),
      number(d.beta?.[i], RATIO),
      number(d.correlation?.[i], RATIO),
      text(contribution < 0 ? 'Risk-reducing position' : ''),
    )
  })
  const sumOf = (values: Float64Array): number => values.reduce((sum, value) => sum + value, 0)
  add(
    text('Total', 'total'),
    ...gap('total'),
    number(breakdown.net, PERCENT, 'total'),
    number(sumOf(d.standAlone), PERCENT, 'total'),
    text('', 'total'),
    number(d.volatility, PERCENT, 'total'),
    share(d.share ? 1 : undefined, 'total'),
    text('', 'total'),
    text('', 'total'),
  )
  add(text('Sum of parts'), ...gap(), text(''), text(''), text(''), number(d.sumOfContributions, PERCENT))
  add(text('Difference'), ...gap(), text(''), text(''), text(''), number(d.difference, ROUNDING))

  for (const { header, labels: groups, parts } of byGroup) {
    blank()
    add(
      text(header, 'head'),
      ...gap('head'),
      text('Weight', 'head'),
      text('Stand-alone risk', 'head'),
      text('', 'head'),
      text('Contribution to risk', 'head'),
      text('Share of risk', 'head'),
    )
    groups.forEach((label, g) => {
      const contribution = parts.contribution[g] ?? 0
      const row = [
        text(label),
        ...gap(),
        number(parts.weight[g], PERCENT),
        number(parts.standAlone[g], PERCENT),
        text(''),
        number(contribution, PERCENT),
        share(parts.share?.[g]),
        text(''),
        text(''),
        text(contribution < 0 ? 'Risk-reducing group' : ''),
      ]
      add(...row)
    })
    add(
      text('Total', 'total'),
      ...gap('total'),
      number(sumOf(parts.weight), PERCENT, 'total'),
      number(sumOf(parts.standAlone), PERCENT, 'total'),
      text('', 'total'),
      number(sumOf(parts.contribution), PERCENT, 'total'),
      share(d.share ? 1 : undefined, 'total'),
    )
  }

  const figure = (label: string, cell: TableCell, remark = ''): void => {
    add(text(label), ...gap(), cell, text(remark))
  }
  blank()
  add(text('The book', 'head'))
  figure(`Volatility ${breakdown.horizon}`, number(d.volatility, PERCENT))
  if (breakdown.expectedReturn)
    figure(
      `Expected return ${breakdown.expectedReturn.horizon}`,
      number(breakdown.expectedReturn.value, PERCENT),
      breakdown.expectedReturn.label,
    )
  figure(
    'Diversification benefit',
    number(d.diversificationBenefit, PERCENT),
    'Sum of stand-alone risks less total',
  )
  figure(
    'Diversification ratio',
    number(d.diversificationRatio, RATIO),
    'Sum of stand-alone risks over total',
  )
  figure(
    'Effective number of positions (by risk)',
    number(breakdown.effectiveWithheld === null ? d.effectiveNumber : null, '0.0'),
    breakdown.effectiveWithheld ?? 'One over the sum of squared shares of risk',
  )
  figure('Net weight', number(breakdown.net, PERCENT))
  figure('Gross weight', number(breakdown.gross, PERCENT))

  blank()
  add(text('Settings', 'head'))
  for (const [label, value] of settings) add(text(label), text(value))
  add(
    text('Reading'),
    text(
      'Contributions add up to the volatility. A position 1% larger (of itself) changes it by its share of risk in percent (of itself), first order.',
    ),
  )
  blank()
  add(text('Warnings', 'head'))
  for (const sentence of warnings) add(text(sentence, 'alert'))
  if (warnings.length === 0) add(text('None'))

  return {
    cells: rows,
    widths: [30, ...groupHeaders.map(() => 16), 11, 14, 16, 16, 11, 13, 15, 22],
    numeric: [false, ...groupHeaders.map(() => false), ...POSITION_HEADS.map(() => true), false],
  }
}
