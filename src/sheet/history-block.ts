import { grossRatio, MOST_GROSS_CONTRIBUTION } from './benchmark'
import type { Snapshot } from './snapshot'
import type { Mark, Table, TableCell } from './table'
import { numberCell as number, setIn, textCell as text } from './table'
import { CAUTION, countOf, dateText, percentText, POSITION_HEADS } from './wording'

const PERCENT = '0.00%'
const SHARE = '0.0%'
const ROUNDING = '0.0E+00'

const [WEIGHT, STAND_ALONE, , CONTRIBUTION, SHARE_HEAD] = POSITION_HEADS

/** Columns of figures behind the labels, with their widths. */
const HEADS: readonly (readonly [head: string, width: number])[] = [
  [WEIGHT, 11],
  ['Volatility of one unit', 13],
  [STAND_ALONE, 16],
  [CONTRIBUTION, 16],
  [SHARE_HEAD, 11],
]

const sumOf = (values: Iterable<number>): number => [...values].reduce((sum, value) => sum + value, 0)

/** What a kept result was estimated from. */
export function dataText({ dates }: Pick<Snapshot, 'dates'>): string {
  if (!dates) return 'A covariance matrix as given'
  const span =
    dates.first === null || dates.last === null ? '' : `, ${dateText(dates.first)} to ${dateText(dates.last)}`
  return `${countOf(dates.used, 'date')} of returns${span}`
}

/**
 * Lays a kept result out for whoever reads it in the workbook: what it is and when it was kept, holdings with a total row, the sum of parts and its
 * difference, settings, hashes, caution. Two rows at its end are blank, so that the next one keeps off it.
 *
 * @returns the same for the same result, to the last cell
 */
export function historyBlock(snapshot: Snapshot): Table {
  const { names, groupHeaders, groups, weights, volatilities, contribution, volatility, horizon } = snapshot
  const labels = 1 + groupHeaders.length
  const width = labels + HEADS.length
  const cells: TableCell[][] = []
  const add = (...row: TableCell[]): void => {
    const mark = row[0]?.mark
    const rest = text('', mark === 'section' || mark === 'head' || mark === 'total' ? mark : undefined)
    cells.push([...row, ...Array.from({ length: width - row.length }, () => rest)])
  }
  const beside = (label: string, cell: TableCell, remark = ''): void => {
    add(text(label), ...Array.from({ length: labels - 1 }, () => text('')), cell, text(remark))
  }
  /** a row of figures: weight, volatility, stand-alone, contribution, share */
  const figures = (label: TableCell, groupLabels: readonly string[], row: readonly TableCell[]): void => {
    const { mark } = label
    const places = Array.from({ length: labels - 1 }, (_, k) => text(groupLabels[k] ?? '', mark))
    add(label, ...places, ...row)
  }

  add(text(`Kept result ${snapshot.id}: ${snapshot.title}`, 'title'))
  add(
    text(
      `Volatility ${percentText(volatility, 2)} ${horizon}. ${dataText(snapshot)}. Kept on ${dateText(snapshot.keptOn)}.`,
    ),
  )
  add(text(CAUTION, 'note'))
  add(text('Note'), text(snapshot.note === '' ? 'None' : snapshot.note))
  add()
  beside(`Volatility ${horizon}`, number(volatility, PERCENT))
  if (snapshot.trackingError === null) beside('Tracking error (ex ante)', text('No benchmark'))
  else beside(`Tracking error (ex ante) ${horizon}`, number(snapshot.trackingError, PERCENT))
  add()

  const reason =
    volatility === 0
      ? 'not defined'
      : grossRatio(contribution, volatility) > MOST_GROSS_CONTRIBUTION
        ? 'withheld'
        : null
  const share = (part: number, mark?: Mark): TableCell =>
    reason === null ? number(part / volatility, SHARE, mark) : text(reason, mark)
  add(...['Holding', ...groupHeaders, ...HEADS.map(([head]) => head)].map((head) => text(head, 'head')))
  const standAlone = weights.map((weight, i) => Math.abs(weight) * (volatilities[i] ?? NaN))
  names.forEach((name, i) => {
    const part = contribution[i] ?? NaN
    figures(text(name), groups[i] ?? [], [
      number(weights[i], PERCENT),
      number(volatilities[i], PERCENT),
      number(standAlone[i], PERCENT),
      number(part, PERCENT),
      share(part),
    ])
  })
  const sum = sumOf(contribution)
  figures(
    text('Total', 'total'),
    [],
    [
      number(sumOf(weights), PERCENT, 'total'),
      text('', 'total'),
      number(sumOf(standAlone), PERCENT, 'total'),
      number(volatility, PERCENT, 'total'),
      share(volatility, 'total'),
    ],
  )
  const blank = text('')
  figures(text('Sum of parts'), [], [blank, blank, blank, number(sum, PERCENT)])
  figures(text('Difference'), [], [blank, blank, blank, number(sum - volatility, ROUNDING)])
  add()
  add(text('Settings', 'section'))
  for (const [label, value] of snapshot.settingLines) add(text(label), text(value))
  add(
    text('Reading'),
    text(
      `Volatilities, stand-alone risks and contributions are ${horizon === 'a year' ? 'scaled to a year' : 'per period'}. Contributions add up to the volatility; a share is a contribution over it. The volatility of one unit is a holding’s own at a weight of 100%, and stand-alone risk is that times the weight without its sign.`,
    ),
  )
  if (reason === 'withheld')
    add(
      text('Shares of risk'),
      text('Withheld: contributions nearly cancel, so shares of the total say little.'),
    )
  add(text('Hash of the inputs'), text(snapshot.inputsHash))
  add(text('Hash of the returns'), text(snapshot.returnsHash))
  add(
    text('Correlations'),
    text(
      snapshot.correlations === null
        ? 'Not kept, as the holdings are too many: made again while the returns are still there'
        : 'Kept with the figures on a sheet that is out of sight',
    ),
  )
  add()
  add()
  return {
    cells: setIn(cells),
    widths: [30, ...groupHeaders.map(() => 16), ...HEADS.map(([, characters]) => characters)],
    numeric: [false, ...groupHeaders.map(() => false), ...HEADS.map(() => true)],
  }
}
