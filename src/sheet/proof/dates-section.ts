import type { TableCell } from '../table'
import { formulaCell, numberCell as number, textCell as text } from '../table'
import type { DateKey } from './columns'
import { COUNT, DATE, PERCENT, PLAIN, RATIO, SMALL } from './columns'
import type { Late } from './draft'
import type { ProofSheet } from './proof-sheet'

/** Weights in the order of the returns, one row for each series. */
export function laySeries(sheet: ProofSheet): void {
  const { cells } = sheet.reach
  if (cells === null || sheet.seriesColumns.length === 0) return
  const { blocks, breakdown } = sheet.input
  const { match } = blocks
  const products = sheet.reach.estimation.kind === 'matrix' ? sheet.groupReturns : []
  sheet.draft.add()
  sheet.draft.add({ 0: text('In the order of the returns', 'section') }, 'section')
  const c = sheet.labels
  const heads: { [column: number]: Late } = { 0: text('Series', 'head') }
  sheet.seriesColumns.forEach(({ head }, k) => (heads[c + k] = text(head, 'head')))
  products.forEach(
    ({ label }, k) => (heads[c + sheet.seriesColumns.length + k] = text(`Covariance with ${label}`, 'head')),
  )
  sheet.draft.add(heads, 'head')
  sheet.placeSeries(cells.series.length)
  for (const series of cells.series) {
    const held = [...match.seriesOf.keys()].filter((i) => series >= 0 && match.seriesOf[i] === series)
    const row: { [column: number]: Late } = {
      0: text(
        held.length > 0
          ? held.map((i) => breakdown.names[i] ?? '').join(', ')
          : series < 0
            ? 'no series'
            : `${blocks.returns.names?.[series] ?? ''} (not held)`,
      ),
    }
    sheet.seriesColumns.forEach(({ name, of }, k) => {
      row[c + k] = () => {
        const parts = held.map(of).filter((part) => part !== '')
        const format = name === 'standardised' || name === 'count' ? PLAIN : PERCENT
        return parts.length === 0 ? number(0, format) : formulaCell(`=${parts.join('+')}`, format)
      }
    })
    products.forEach(({ header, group }, k) => {
      row[c + sheet.seriesColumns.length + k] =
        held.length === 0
          ? number(0, SMALL)
          : () =>
              formulaCell(
                `=${cells.alongSeries(series, (from, count) => sheet.draft.range(sheet.seriesColumn(`group ${header} ${group}`), from, count)) ?? ''}`,
                SMALL,
              )
    })
    sheet.draft.add(row)
  }
}

/** The table of dates: one row for each of the sheet, whether used or not. */
export function layDates(sheet: ProofSheet): void {
  const { cells, rows, estimation } = sheet.reach
  if (cells === null || rows === null) return
  const c = sheet.labels
  const decay = estimation.kind === 'dates' ? estimation.decay : null
  sheet.draft.add()
  sheet.draft.add({ 0: text('Dates', 'section') }, 'section')
  if (sheet.dateKeys.includes('multiplier'))
    sheet.note(
      sheet.lags > 0
        ? 'Multiplier: the return less its mean, and weights of the lags times those of the dates beside it, over the divisor. Its products with a holding’s returns, less the mean times the sum of multipliers, add up to the covariance.'
        : 'Multiplier: weight of the date times the return less its mean, over the divisor. Its products with a holding’s returns add up to the covariance.',
    )
  sheet.note(
    'In the order of the sheet, one row for each of its rows (or columns) from the first date used to the last; a date that is not used has a weight of 0.',
  )
  const heads: { readonly [K in DateKey]: string } = {
    weight: 'Weight of the date',
    return: 'Return of the portfolio',
    centred: 'Less its mean',
    multiplier: 'Multiplier',
    tail: 'Weight in the tail',
    standardised: 'Sum of standard scores',
    length: 'Sum of squared deviations',
    active: 'Active return',
    'active centred': 'Less its mean',
    'active multiplier': 'Multiplier, active',
  }
  const row: { [column: number]: Late } = { 0: text('Date', 'head') }
  sheet.dateKeys.forEach((key, k) => (row[c + k] = text(heads[key], 'head')))
  sheet.groupReturns.forEach(
    ({ label }, k) => (row[c + sheet.dateKeys.length + k] = text(`Return, ${label}`, 'head')),
  )
  sheet.draft.add(row, 'head')
  sheet.placeDates(cells.dates.length)
  /** place of each row that is used, by time */
  const placeOf = new Map(cells.dates.map((t, k) => [t, k]))
  const inTime = rows.map((t) => placeOf.get(t) ?? 0)
  const orderOf = new Map(inTime.map((place, order) => [place, order]))
  cells.dates.forEach((t, place) => {
    const order = orderOf.get(place)
    const dateCell = t < 0 ? null : cells.dateCell(t)
    const label: TableCell =
      t < 0 ? text('no date') : dateCell === null ? number(t + 1, COUNT) : formulaCell(`=${dateCell}`, DATE)
    const next: { [column: number]: Late } = { 0: label }
    sheet.dateKeys.forEach((key, k) => {
      next[c + k] = cellOfDate(sheet, key, order, place, t, inTime, decay)
    })
    sheet.groupReturns.forEach(({ header, group }, k) => {
      next[c + sheet.dateKeys.length + k] =
        order === undefined
          ? text('')
          : () => formulaCell(`=${returnOf(sheet, t, `group ${header} ${group}`)}`, '0.0000%')
    })
    sheet.draft.add(next)
  })
}

/** The return on one date at the weights of a column of the table of series. */
function returnOf(sheet: ProofSheet, t: number, name: string): string {
  const column = sheet.seriesColumn(name)
  return sheet.reach.cells!.alongSeries(t, (from, count) => sheet.draft.range(column, from, count)) ?? ''
}

function cellOfDate(
  sheet: ProofSheet,
  key: DateKey,
  order: number | undefined,
  place: number,
  t: number,
  inTime: readonly number[],
  decay: number | null,
): Late {
  const near = (of: DateKey, at = place): string => {
    const { column, row } = sheet.dateColumn(of)
    return sheet.draft.cell(row + at, column)
  }
  const isActive = key.startsWith('active')
  const mean = (): string => sheet.at(isActive ? 'active mean' : 'mean')
  switch (key) {
    case 'weight': {
      if (order === undefined) return number(0, PLAIN)
      const newer = inTime[order + 1]
      return decay === null || newer === undefined
        ? number(1, PLAIN)
        : () => formulaCell(`=${sheet.at('decay')}*${near('weight', newer)}`, '0.000000')
    }
    case 'return':
    case 'active':
    case 'standardised':
      if (order === undefined) return text('')
      return () =>
        formulaCell(
          `=${returnOf(sheet, t, key === 'return' ? 'weight' : key)}`,
          key === 'standardised' ? RATIO : '0.0000%',
        )
    case 'length':
      if (order === undefined) return number(0, SMALL)
      return () => {
        const [count, mean] = [sheet.seriesColumn('count'), sheet.seriesColumn('mean')]
        const squares = sheet.reach.cells!.alongSeries(
          t,
          (from, some) => sheet.draft.range(count, from, some),
          (returns) => `${returns}^2`,
        )
        return formulaCell(
          `=${squares ?? ''}-2*(${returnOf(sheet, t, 'mean')})+SUMSQ(${sheet.draft.range(mean)})`,
          SMALL,
        )
      }
    case 'centred':
    case 'active centred':
      if (order === undefined) return number(0, '0.0000%')
      return () => formulaCell(`=${near(isActive ? 'active' : 'return')}-${mean()}`, '0.0000%')
    case 'multiplier':
    case 'active multiplier': {
      if (order === undefined) return number(0, SMALL)
      if (sheet.lags === 0)
        return () =>
          formulaCell(
            `=${near('weight')}*(${near(isActive ? 'active' : 'return')}-${mean()})/${sheet.at('divisor')}`,
            SMALL,
          )
      const of: DateKey = isActive ? 'active centred' : 'centred'
      return () => {
        const lagged = Array.from({ length: sheet.lags }, (_, k) => {
          const beside = [inTime[order - k - 1], inTime[order + k + 1]].filter((other) => other !== undefined)
          return beside.length === 0
            ? []
            : [`${sheet.at(`lag ${k + 1}`)}*(${beside.map((other) => near(of, other)).join('+')})`]
        }).flat()
        return formulaCell(`=(${[near(of), ...lagged].join('+')})/${sheet.at('divisor')}`, SMALL)
      }
    }
    case 'tail':
      if (order === undefined) return number(0, PLAIN)
      return () => {
        const [var_, alike] = [sheet.at('value at risk'), sheet.at('alike')]
        const y = near('return')
        return formulaCell(
          `=IF(${y}<-${var_}-${alike},1,IF(${y}<=-${var_}+${alike},(${sheet.at('observations')}-${sheet.at('above')})/${sheet.at('tied')},0))/${sheet.at('observations')}`,
          PLAIN,
        )
      }
  }
}
