import type { Breakdown } from './breakdown'
import type { BacktestStudy, ErrorStudy } from './studies'
import type { Mark, PageSetup, Table, TableCell } from './table'
import { numberCell as number, setIn, textCell as text } from './table'
import { BAND, bandText, CAUTION, confidenceText, countOf, dateText, percentText } from './wording'

const PERCENT = '0.00%'
const FINE = '0.000%'
const RATIO = '0.00'
const DATE = 'dd mmm yyyy'

/** Cells row by row, each row filled up to one width. */
class Rows {
  readonly cells: TableCell[][] = []
  constructor(readonly width: number) {}

  add(...row: TableCell[]): void {
    const mark = row[0]?.mark
    const rest = text('', mark === 'section' || mark === 'head' ? mark : undefined)
    this.cells.push([...row, ...Array.from({ length: this.width - row.length }, () => rest)])
  }

  section(heading: string): void {
    this.add()
    this.add(text(heading, 'section'))
  }

  heads(...labels: string[]): void {
    this.add(...labels.map((label) => text(label, 'head')))
  }
}

/** Long tables: as many pages as it takes. */
const pageOf = (header: string): PageSetup => ({
  paper: 'A4',
  orientation: 'portrait',
  onePage: false,
  header: { left: header, right: '' },
  footer: CAUTION,
})

const BACKTEST_WIDTHS = [37, 18, 18, 18, 37]

/**
 * Lays a back-test out as a table to be written: what was forecast how, the tests in words, a chart, and every date with what was forecast and what
 * came, so that exceptions can be counted again.
 *
 * @param breakdown whose settings are printed; null for forecasts made elsewhere, which do not rest on them
 * @param today     as a workbook counts days
 */
export function backtestTable(
  title: string,
  study: BacktestStudy,
  breakdown: Breakdown | null,
  today: number,
): Table {
  const { result, dates } = study
  const { returns, valueAtRisk, exceptions, confidence, tests } = result
  const count = returns.length
  const rows = new Rows(BACKTEST_WIDTHS.length)
  rows.add(text(`Back-test: ${title}`, 'title'))
  const span =
    dates && dates.length > 0 ? `, ${dateText(dates[0] ?? 0)} to ${dateText(dates.at(-1) ?? 0)}` : ''
  rows.add(
    text(
      `${countOf(tests.exceptions, 'exception')} in ${countOf(count, 'date')}${span}; value at risk of one period at ${confidenceText(confidence)} confidence. Written on ${dateText(today)}; the table does not follow.`,
    ),
  )
  rows.add(text(CAUTION, 'note'))
  rows.add(text('How it was made'), text(`${study.method}.`))

  rows.section('Tests')
  // over texts, which begin at the left
  rows.add(...['Test', 'Figure', 'What it says'].map((label) => text(label, 'section')))
  for (const [label, figure, meaning] of study.lines) rows.add(text(label), text(figure), text(meaning))

  if (study.of === 'this book' && breakdown) {
    rows.section('Settings')
    for (const [label, value] of breakdown.settings) rows.add(text(label), text(value))
  }

  rows.section('Through time')
  const chartRow = rows.cells.length
  for (let k = 0; k < CHART_ROWS; k++) rows.add()

  rows.section('Date by date')
  rows.add(
    text(
      'Fractions of capital per period. The forecast is drawn as the loss it stands for: an exception is a return below it.',
      'note',
    ),
  )
  rows.heads('Date', 'Return', 'Value at risk forecast', 'As a return', 'Exception')
  const first = rows.cells.length
  for (let t = 0; t < count; t++) {
    const date = dates?.[t]
    const forecast = valueAtRisk[t] ?? NaN
    rows.add(
      date === undefined ? number(t + 1, '0') : number(date, DATE),
      number(returns[t], PERCENT),
      number(forecast, PERCENT),
      number(-forecast, PERCENT),
      text(exceptions[t] ? 'exception' : ''),
    )
  }
  const column = (k: number) => ({ row: first, column: k, rows: count, columns: 1 })
  return {
    cells: setIn(rows.cells),
    widths: BACKTEST_WIDTHS,
    numeric: [false, true, true, true, false],
    charts: [
      {
        kind: 'line',
        title: 'Returns and the value at risk forecast for them',
        alt: `Line chart of the returns of ${countOf(count, 'date')}${span} and the value at risk forecast for them, drawn as a loss: ${countOf(tests.exceptions, 'return')} below it, ${tests.expected.toFixed(1)} expected.`,
        over: { row: chartRow, column: 0, rows: CHART_ROWS, columns: BACKTEST_WIDTHS.length },
        categories: column(0),
        series: [
          { name: 'Return', values: column(1) },
          { name: 'Value at risk forecast, as a return', values: column(3) },
        ],
        format: '0.0%',
      },
    ],
    page: pageOf(`Back-test: ${title}`),
  }
}

const CHART_ROWS = 16

const BOOTSTRAP_WIDTHS = [34, 16, 16, 16, 14, 14]

/**
 * Lays the errors found by drawing dates anew out as a table to be written, beside those in closed form.
 *
 * @param breakdown the figures they are the errors of
 * @param today     as a workbook counts days
 */
export function bootstrapTable(title: string, study: ErrorStudy, breakdown: Breakdown, today: number): Table {
  const { decomposition: d, names, bands: closed, horizon } = breakdown
  const bands = typeof closed === 'string' ? null : closed
  const { result } = study
  const rows = new Rows(BOOTSTRAP_WIDTHS.length)
  rows.add(text(`Standard errors by the bootstrap: ${title}`, 'title'))
  rows.add(
    text(
      `Volatility ${percentText(d.volatility, 2)} ${horizon}; 95% of the replications from ${percentText(result.volatility.lower, 2)} to ${percentText(result.volatility.upper, 2)}${bands ? `, band in closed form ${bandText(d.volatility, bands.volatility, 2)}` : ''}. Written on ${dateText(today)}; the table does not follow.`,
    ),
  )
  rows.add(text(CAUTION, 'note'))
  rows.add(text('How it was made'), text(`${study.method}.`))
  rows.add(text('Agreement'), text(study.agreement))

  const part = (
    heading: string,
    note: string,
    figures: ArrayLike<number>,
    errors: ArrayLike<number> | null | undefined,
    spread: ErrorStudy['result']['contribution'],
    formats: { readonly figure: string; readonly error: string },
    total: readonly [figure: number, error: number | null, deviation: number | null] | null,
  ): void => {
    const line = (
      label: string,
      mark: Mark | undefined,
      figure: number | undefined,
      error: number | null | undefined,
      deviation: number | null | undefined,
      ends: readonly [number | null | undefined, number | null | undefined],
    ): void =>
      rows.add(
        text(label, mark),
        number(figure, formats.figure, mark),
        number(error, formats.error, mark),
        number(deviation, formats.error, mark),
        number(ends[0], formats.figure, mark),
        number(ends[1], formats.figure, mark),
      )
    rows.section(heading)
    rows.add(text(note, 'note'))
    rows.heads(
      'Holding',
      'Figure',
      'Standard error, closed form',
      'Standard error, bootstrap',
      '95% of replications, from',
      '95% of replications, to',
    )
    names.forEach((name, i) =>
      line(name, undefined, figures[i], errors?.[i], spread.deviation[i], [spread.lower[i], spread.upper[i]]),
    )
    if (total)
      line('Volatility', 'total', total[0], total[1], total[2], [
        result.volatility.lower,
        result.volatility.upper,
      ])
  }

  part(
    'Contribution to risk',
    `Volatility ${horizon}, fractions of capital; contributions add up to it, their errors do not.`,
    d.contribution,
    bands?.contribution,
    result.contribution,
    { figure: PERCENT, error: FINE },
    [d.volatility, bands?.volatility ?? null, result.volatility.deviation],
  )
  if (d.share && result.share && breakdown.sharesWithheld === null)
    part(
      'Share of risk',
      'Fractions of the volatility.',
      d.share,
      bands?.share,
      result.share,
      { figure: '0.0%', error: PERCENT },
      null,
    )
  else {
    rows.section('Share of risk')
    rows.add(text(breakdown.sharesWithheld ?? 'Not defined: there is no risk to share.'))
  }

  if (bands) {
    const ratios = [...d.contribution.keys()]
      .filter((i) => (bands.contribution[i] ?? 0) > 0)
      .map((i) => (result.contribution.deviation[i] ?? NaN) / (bands.contribution[i] ?? NaN))
      .sort((a, b) => a - b)
    const middle = ratios[Math.floor(ratios.length / 2)]
    rows.section('Bootstrap over closed form')
    rows.add(text('Volatility'), number(result.volatility.deviation / bands.volatility, RATIO))
    rows.add(text('Contributions, the middle one'), number(middle, RATIO))
    rows.add(
      text('Reading'),
      text(`Both are standard errors; a 95% band reaches ${BAND.toFixed(2)} of them either way.`),
    )
  }

  rows.section('Settings')
  for (const [label, value] of breakdown.settings) rows.add(text(label), text(value))
  return {
    cells: setIn(rows.cells),
    widths: BOOTSTRAP_WIDTHS,
    numeric: [false, true, true, true, true, true],
    page: pageOf(`Standard errors by the bootstrap: ${title}`),
  }
}
