import { Fault, logReturns, simpleReturns } from '../core'
import { classifySquare } from './blocks'
import type { Area, Block, CellValue, Culture } from './cells'
import { addressOf, cellOf, isBlank, isCellError, overlap } from './cells'
import { explain } from './explain'
import type { Finding } from './findings'
import { byGravity, firstAndCount } from './findings'
import { dateInCell, numberInCell } from './numbers'
import type { Settings } from './settings'
import { countOf, dateText, quote } from './wording'

export interface ReturnsReading {
  readonly area: Area
  readonly content: 'returns' | 'prices' | 'covariance'
  readonly orientation: 'dates down' | 'dates across'
  /** how returns were formed from prices; those that were typed count as simple */
  readonly returnKind: Settings['returnKind']
  readonly names: readonly string[] | null
  /** serial numbers, oldest first, one a row of `values`; null when the block has no dates */
  readonly dates: readonly number[] | null
  /** "daily", "weekly", …, "uneven" or "no dates" */
  readonly frequency: string
  readonly proposedPeriodsPerYear: number | null
  readonly summary: string
  readonly findings: readonly Finding[]
  /** returns per period (prices already turned into returns), row a date, or the covariance matrix; NaN where there is a gap */
  readonly values: Float64Array
  readonly rows: number
  readonly columns: number
  /** the heading of a series, or its first cell: where faults about it point */
  readonly seriesCell: (series: number) => Area
  /** the cell of a return, or of the later of the two prices it comes from; series -1 is the date's */
  readonly cell: (row: number, series: number) => Area
  /** the cell of the earlier of the two prices; null where a return stands in one cell */
  readonly before: (row: number, series: number) => Area | null
  /** whether formulas find the number there: no gap, and no number typed as text, in either of two prices */
  readonly isNumber: (row: number, series: number) => boolean
}

/** Calendar spacing and how many such periods make a year: common practice, no source. */
const FREQUENCIES = [
  { name: 'daily', from: 0.9, to: 1.6, perYear: 252 },
  { name: 'weekly', from: 6.5, to: 7.5, perYear: 52 },
  { name: 'monthly', from: 27.5, to: 31.5, perYear: 12 },
  { name: 'quarterly', from: 88, to: 93, perYear: 4 },
  { name: 'yearly', from: 360, to: 370, perYear: 1 },
] as const

function frequencyOf(dates: readonly number[]): { name: string; perYear: number | null } {
  const steps = dates
    .slice(1)
    .map((date, k) => date - (dates[k] ?? 0))
    .sort((a, b) => a - b)
  const median = steps[Math.floor(steps.length / 2)]
  if (median === undefined) return { name: 'uneven', perYear: null }
  const found = FREQUENCIES.find(({ from, to }) => median >= from && median <= to)
  if (!found) return { name: 'uneven', perYear: null }
  // every day of the week traded: no weekend in a fortnight of dates
  if (found.name === 'daily' && dates.length > 14 && (steps[Math.floor(steps.length * 0.95)] ?? 0) <= 1)
    return { name: 'daily, weekends included', perYear: 365 }
  return { name: found.name, perYear: found.perYear }
}

/** The block seen with dates running down, whichever way they lie in the sheet. */
interface View {
  readonly rows: number
  readonly columns: number
  readonly at: (row: number, column: number) => CellValue
  readonly cell: (row: number, column: number) => Area
}

function viewOf(block: Block, across: boolean): View {
  const { area, values } = block
  return across
    ? {
        rows: area.columns,
        columns: area.rows,
        at: (row, column) => values[column]?.[row] ?? '',
        cell: (row, column) => cellOf(area, column, row),
      }
    : {
        rows: area.rows,
        columns: area.columns,
        at: (row, column) => values[row]?.[column] ?? '',
        cell: (row, column) => cellOf(area, row, column),
      }
}

/** A column of dates: nearly all its cells below the heading read as days, no two alike in a row, and they do not look like levels. */
function isDateColumn(view: View, column: number, firstRow: number, culture: Culture): boolean {
  let days = 0
  let filled = 0
  let whole = 0
  let steps = 0
  let previous: number | null = null
  let direction = 0
  for (let row = firstRow; row < view.rows; row++) {
    const value = view.at(row, column)
    if (isBlank(value)) continue
    filled++
    const day = dateInCell(value, culture)
    if (day === null) continue
    days++
    if (typeof value === 'string' || Number.isInteger(value)) whole++
    if (previous !== null && day !== previous) {
      steps++
      direction += Math.sign(day - previous)
    }
    previous = day
  }
  // levels go up and down; dates go one way, at most a few out of order
  return filled > 0 && days >= 0.9 * filled && whole >= 0.9 * days && Math.abs(direction) >= 0.8 * steps
}

const isText = (value: CellValue, culture: Culture): boolean =>
  typeof value === 'string' && !isBlank(value) && !isCellError(value) && numberInCell(value, culture) === null

/** Whether most of the filled cells of a row are names rather than numbers; dates typed as text are not names. */
function isHeading(view: View, row: number, culture: Culture): boolean {
  let texts = 0
  let others = 0
  for (let column = 0; column < view.columns; column++) {
    const value = view.at(row, column)
    if (isBlank(value)) continue
    if (isText(value, culture) && dateInCell(value, culture) === null) texts++
    else others++
  }
  return texts > 0 && texts >= others
}

/** Leading rows that hold nothing or a lone text. */
function titleRows(view: View, culture: Culture): number {
  let row = 0
  for (; row < view.rows - 1; row++) {
    let filled = 0
    let lone: CellValue = ''
    for (let column = 0; column < view.columns && filled < 2; column++) {
      const value = view.at(row, column)
      if (isBlank(value)) continue
      filled++
      lone = value
    }
    if (filled > 1 || (filled === 1 && (view.columns === 1 || !isText(lone, culture)))) break
  }
  return row
}

/** Finds out which way the dates run: by the dates, else by the names, else the longer side. */
function orientationOf(block: Block, culture: Culture): { across: boolean; certain: boolean } {
  const down = viewOf(block, false)
  const across = viewOf(block, true)
  const signs = [down, across].map((view) => {
    const first = titleRows(view, culture)
    return isDateColumn(view, 0, isHeading(view, first, culture) ? first + 1 : first, culture)
  })
  if (signs[0] !== signs[1]) return { across: signs[1] === true, certain: true }
  const [namesOnTop, namesAtLeft] = [down, across].map((view) =>
    isHeading(view, titleRows(view, culture), culture),
  )
  if (namesOnTop !== namesAtLeft) return { across: namesAtLeft === true, certain: true }
  return { across: block.area.columns > block.area.rows, certain: false }
}

/**
 * Reads a returns, prices or covariance block: which way it lies, its names and dates, what it holds, and every cell that is not what
 * it should be. Prices become returns here. Blank cells are gaps (NaN), counted and told; nothing is filled or dropped.
 *
 * @param block    as selected; hiddenRows and merged areas where known
 * @param settings what the user has said about the block; null entries are found out
 * @returns        findings that stop are told instead of thrown
 * @cost           O(cells); the numbers are copied once
 */
export function readReturns(
  block: Block,
  settings: Pick<Settings, 'content' | 'orientation' | 'returnKind'>,
  culture: Culture,
): ReturnsReading {
  const { area } = block
  const findings: Finding[] = []
  const find = (weight: Finding['weight'], sentence: string, place: Area | null = area): void => {
    findings.push({ weight, sentence, area: place })
  }

  const guess = orientationOf(block, culture)
  const isAcross = settings.orientation === null ? guess.across : settings.orientation === 'dates across'
  const view = viewOf(block, isAcross)
  const top = titleRows(view, culture)
  const named = isHeading(view, top, culture)
  const firstRow = named ? top + 1 : top
  const datedByContent = isDateColumn(view, 0, firstRow, culture) && view.columns > 1
  // a covariance matrix may carry its names at the left as well as on top
  const namesAtLeft =
    !datedByContent && named && view.columns > 1 && isHeading(viewOf(block, !isAcross), 0, culture)
  const firstColumn = datedByContent || namesAtLeft ? 1 : 0

  const series: number[] = []
  let emptyColumns = 0
  for (let column = firstColumn; column < view.columns; column++) {
    let filled = named && !isBlank(view.at(top, column))
    for (let row = firstRow; row < view.rows && !filled; row++) filled = !isBlank(view.at(row, column))
    if (filled) series.push(column)
    else emptyColumns++
  }
  let periods: number[] = []
  let emptyRows = 0
  for (let row = firstRow; row < view.rows; row++) {
    let filled = datedByContent && !isBlank(view.at(row, 0))
    for (let k = 0; k < series.length && !filled; k++) filled = !isBlank(view.at(row, series[k] ?? 0))
    if (filled) periods.push(row)
    else emptyRows++
  }

  for (const merged of block.merged ?? []) {
    const shared = overlap(merged, area)
    if (!shared) continue
    const row =
      (isAcross ? shared.column - area.column + shared.columns : shared.row - area.row + shared.rows) - 1
    if (row < firstRow) continue
    find(
      'stops',
      `${addressOf(shared)}: found merged cells among the numbers; one cell a number is needed: unmerge them.`,
      shared,
    )
  }

  // dates, oldest first
  let dates: number[] | null = null
  if (datedByContent) {
    const dated = periods.map((row) => ({ row, day: dateInCell(view.at(row, 0), culture) }))
    for (const { row, day } of dated)
      if (day === null) {
        const value = view.at(row, 0)
        find(
          'stops',
          `${addressOf(view.cell(row, 0))}: found ${isBlank(value) ? 'a blank' : quote(value)}; a date is needed.`,
          view.cell(row, 0),
        )
      }
    // a cell that holds no date counts as its neighbour's here, so that it does not upset order and span as well
    let last = dated.find(({ day }) => day !== null)?.day ?? 0
    const known = dated.map(({ row, day }) => ({ row, day: (last = day ?? last), isRead: day !== null }))
    const sorted = known.every(({ day }, k) => k === 0 || day >= (known[k - 1]?.day ?? 0))
    if (!sorted) {
      const reversed = known.every(({ day }, k) => k === 0 || day <= (known[k - 1]?.day ?? 0))
      known.sort((a, b) => a.day - b.day)
      find(
        'notes',
        reversed
          ? 'Dates run from newest to oldest; read in order of time.'
          : 'Dates are not in order; read in order of time.',
      )
    }
    periods = known.map(({ row }) => row)
    dates = known.map(({ day }) => day)
    const twice = known.findIndex(
      ({ day, isRead }, k) => isRead && known[k - 1]?.isRead === true && day === known[k - 1]?.day,
    )
    if (twice > 0) {
      const cell = view.cell(known[twice]?.row ?? 0, 0)
      find(
        'stops',
        `${addressOf(cell)}: found ${dateText(dates[twice] ?? 0)} a second time; one row a date is needed.`,
        cell,
      )
    }
  }

  // numbers
  const [rows, columns] = [periods.length, series.length]
  let values: Float64Array = new Float64Array(rows * columns)
  const faults: Finding[] = []
  let gaps = 0
  let firstGap: Area | null = null
  let texts = 0
  let firstText = ''
  for (let t = 0; t < rows; t++) {
    const row = periods[t] ?? 0
    for (let i = 0; i < columns; i++) {
      const column = series[i] ?? 0
      const value = view.at(row, column)
      if (typeof value === 'number') {
        values[t * columns + i] = value
        continue
      }
      values[t * columns + i] = NaN
      const cell = view.cell(row, column)
      if (isBlank(value)) {
        gaps++
        firstGap ??= cell
        continue
      }
      const number = isCellError(value) ? null : numberInCell(value, culture)
      if (number !== null) {
        values[t * columns + i] = number
        texts++
        if (firstText === '') firstText = addressOf(cell)
        continue
      }
      faults.push({
        weight: 'stops',
        sentence: `${addressOf(cell)}: found ${isCellError(value) ? `the error ${String(value)}` : typeof value === 'boolean' ? String(value).toUpperCase() : quote(value)}; a number is needed, or a blank cell for a gap.`,
        area: cell,
      })
    }
  }
  findings.push(...firstAndCount(faults, 'cells'))

  const names = named
    ? series.map((column) => {
        const heading = view.at(top, column)
        return isBlank(heading) ? '' : String(heading).trim()
      })
    : null
  if (names) {
    const placeOf = new Map<string, number>()
    names.forEach((name, i) => {
      const cell = view.cell(top, series[i] ?? 0)
      if (name === '')
        find(
          'stops',
          `${addressOf(cell)}: found a blank heading; the name of the series below is needed.`,
          cell,
        )
      else if (placeOf.has(name))
        find(
          'stops',
          `${addressOf(cell)}: found ${quote(name)} a second time (first in ${addressOf(view.cell(top, series[placeOf.get(name) ?? 0] ?? 0))}); one column a series is needed.`,
          cell,
        )
      else placeOf.set(name, i)
    })
  } else find('notes', 'No names found: series match the holdings by place.')

  const content =
    settings.content ?? contentOf(values, rows, columns, dates === null, findings, view, periods, series)
  let frequency = { name: 'no dates', perYear: null as number | null }
  let kept = dates
  let outRows = rows
  if (content === 'covariance') {
    if (rows !== columns)
      find(
        'stops',
        `${addressOf(area)}: found ${rows} rows of ${columns} numbers; a covariance matrix has as many rows as columns.`,
      )
    kept = null
  } else {
    if (settings.orientation === null && !guess.certain && dates === null)
      find(
        'warns',
        `Neither dates nor names tell which way the block lies; read with dates ${isAcross ? 'across' : 'down'}.`,
      )
    if (dates) frequency = frequencyOf(dates)
    else find('notes', `No dates found: the last ${isAcross ? 'column' : 'row'} counts as the newest.`)
    if (content === 'prices') {
      const bad = values.findIndex((value) => value <= 0)
      if (bad >= 0) {
        const cell = view.cell(periods[Math.floor(bad / columns)] ?? 0, series[bad % columns] ?? 0)
        find(
          'stops',
          `${addressOf(cell)}: found ${String(values[bad])} among prices; a price above 0 is needed.`,
          cell,
        )
      } else if (rows < 3) {
        find('stops', `${addressOf(area)}: found ${countOf(rows, 'date')} of prices; at least 3 are needed.`)
      } else {
        values = changesOf(values, rows, columns, settings.returnKind)
        outRows = rows - 1
        kept = dates?.slice(1) ?? null
      }
    }
  }
  if (columns === 0 || rows === 0)
    find('stops', `${addressOf(area)}: found no numbers; returns, prices or a covariance matrix are needed.`)
  if (gaps > 0 && content === 'covariance')
    find(
      'stops',
      `${addressOf(firstGap ?? area)}: found a blank among the covariances; a number is needed in every cell.`,
      firstGap,
    )
  else if (gaps > 0)
    find(
      'notes',
      `${countOf(gaps, 'blank cell')} among the ${content} (first in ${addressOf(firstGap ?? area)}): gaps, for which there is a rule among the choices.`,
      firstGap,
    )
  if (texts > 0)
    find('notes', `${countOf(texts, 'number')} typed as text read as numbers (first in ${firstText}).`)
  if (top > 0) find('notes', `${countOf(top, isAcross ? 'column' : 'row')} before the headings left out.`)
  if (emptyColumns > 0) find('notes', `${countOf(emptyColumns, 'empty series', 'empty series')} left out.`)
  if (emptyRows > 0) find('notes', `${countOf(emptyRows, 'empty period')} left out.`)
  const hidden = isAcross ? 0 : periods.filter((row) => block.hiddenRows?.has(row)).length
  if (hidden > 0)
    find(
      'warns',
      `${countOf(hidden, 'hidden row')} of the ${content} ${hidden === 1 ? 'is' : 'are'} counted like the others.`,
    )

  const span = kept && kept.length > 0 ? `, ${dateText(kept[0] ?? 0)} to ${dateText(kept.at(-1) ?? 0)}` : ''
  const rhythm = frequency.perYear === null ? '' : `${frequency.name.split(',')[0] ?? ''} `
  return {
    area,
    content,
    orientation: isAcross ? 'dates across' : 'dates down',
    returnKind: content === 'prices' ? settings.returnKind : 'simple',
    names,
    dates: kept,
    frequency: content === 'covariance' ? 'no dates' : frequency.name,
    proposedPeriodsPerYear: frequency.perYear,
    summary:
      content === 'covariance'
        ? `Covariance matrix of ${countOf(columns, 'series', 'series')}`
        : `${countOf(outRows, `${rhythm}return`)} of ${countOf(columns, 'series', 'series')}${content === 'prices' ? ` from prices (${settings.returnKind})` : ''}${span}`,
    findings: byGravity(findings),
    values,
    rows: outRows,
    columns,
    seriesCell: (i) => view.cell(named ? top : firstRow, series[i] ?? 0),
    cell: (t, i) => view.cell(periods[t + rows - outRows] ?? firstRow, i < 0 ? 0 : (series[i] ?? 0)),
    before: (t, i) => (outRows < rows ? view.cell(periods[t] ?? firstRow, series[i] ?? 0) : null),
    isNumber: (t, i) => {
      const stands = (row: number): boolean => typeof view.at(periods[row] ?? -1, series[i] ?? 0) === 'number'
      return stands(t + rows - outRows) && (outRows === rows || stands(t))
    },
  }
}

/** Returns between neighbouring dates; one that starts or ends in a gap is a gap. */
export function changesOf(
  prices: Float64Array,
  rows: number,
  columns: number,
  kind: Settings['returnKind'],
): Float64Array {
  const isGap = (k: number): boolean => Number.isNaN(prices[k])
  const filled = prices.map((price) => (Number.isNaN(price) ? 1 : price))
  return (kind === 'log' ? logReturns : simpleReturns)(filled, rows, columns).map((change, k) =>
    isGap(k) || isGap(k + columns) ? NaN : change,
  )
}

/** Tells returns, prices and a covariance matrix apart by their numbers. */
function contentOf(
  values: Float64Array,
  rows: number,
  columns: number,
  undated: boolean,
  findings: Finding[],
  view: View,
  periods: readonly number[],
  series: readonly number[],
): ReturnsReading['content'] {
  if (undated && rows === columns && rows > 1 && values.every(Number.isFinite)) {
    try {
      if (classifySquare(values, rows) === 'covariance') return 'covariance'
    } catch (fault) {
      if (!(fault instanceof Fault)) throw fault
      const { row = 0, column = 0 } = fault.where
      const place = view.cell(periods[row] ?? 0, series[column] ?? 0)
      findings.push({ weight: 'stops', sentence: explain(fault, () => addressOf(place)), area: place })
      return 'covariance'
    }
  }
  // prices are positive throughout, and far from 0 beside how they move; a block of returns has losses
  let positive = 0
  let seen = 0
  let size = 0
  for (const value of values) {
    if (Number.isNaN(value)) continue
    seen++
    if (value > 0) positive++
    size += Math.abs(value)
  }
  return seen > 0 && positive === seen && rows > 2 && size / seen > 0.5 ? 'prices' : 'returns'
}
