import { addressOf, referenceOf } from '../cells'
import { formulaCell, textCell as text } from '../table'
import { CAUTION, countOf, dateText } from '../wording'
import { COUNT, GAP, PERCENT, PLAIN, RATIO, SMALL } from './columns'
import type { ProofSheet } from './proof-sheet'
import { AGREES, DIFFERS, TOLERANCE } from './proof-sheet'

/** The title, whether all lines agree, and how to read them. */
export function layHead(sheet: ProofSheet): void {
  const { title, breakdown } = sheet.input
  const { estimation } = sheet.reach
  const { dates } = breakdown
  sheet.draft.add({ 0: text(`Recomputed by formulas: ${title}`, 'title') })
  const span =
    dates === null
      ? 'a covariance matrix as given'
      : `${countOf(dates.used, 'date')}${dates.first === null || dates.last === null ? '' : `, ${dateText(dates.first)} to ${dateText(dates.last)}`}`
  sheet.note(
    `Formulas of the workbook’s own compute the book’s risk from the cells of its holdings and returns (${span}). No function of an add-in is used.`,
  )
  const c = sheet.labels
  const row = sheet.draft.next
  const near = (k: number): string => sheet.draft.cell(row, k)
  sheet.draft.add(
    {
      0: () =>
        formulaCell(
          `=IF(${near(c + 2)}=0,"All lines agree within the tolerance","Some lines differ by more than the tolerance")`,
          PLAIN,
          'total',
        ),
      [c]: () => formulaCell(`=COUNTIF(${sheet.judged()},"${AGREES}")`, COUNT, 'total'),
      [c + 1]: { ...text('lines agree', 'total'), indent: 1 },
      [c + 2]: () => formulaCell(`=COUNTIF(${sheet.judged()},"${DIFFERS}")`, COUNT, 'total'),
      [c + 3]: { ...text('lines differ', 'total'), indent: 1 },
    },
    'total',
  )
  if (estimation.kind === 'taken over')
    sheet.note(
      `NOT recomputed: the covariances. They stand as constants taken over from Counterpoise, because ${estimation.why}. What follows from them is recomputed.`,
      'alert',
    )
  else sheet.draft.add()
  sheet.note(
    '“Recomputed” holds formulas; “Counterpoise” holds the figures as they were computed, as constants. A cell of the book that changes moves the formulas and not the constants: the lines then differ until this sheet is written again.',
  )
  sheet.note(
    'Volatility s is the root of the sum of weights times covariances with the portfolio. Marginal contribution: covariance over s. Contribution: weight times marginal; contributions add up to s. Share: contribution over s.',
  )
  sheet.note(CAUTION)
}

/** What the figures rest on: periods, capital, dates, and the estimator’s own. */
export function laySettings(sheet: ProofSheet): void {
  const { blocks, settings, breakdown, book, capital: cell } = sheet.input
  const { holdings, returns } = blocks
  const { decomposition: d } = breakdown
  const { estimation } = sheet.reach
  sheet.section('Settings', false)
  sheet.step(
    'tolerance',
    'Tolerance',
    TOLERANCE,
    '0E+00',
    'A risk agrees within this part of the sum of stand-alone risks; a weight, share, beta or correlation within this, times the diversification ratio where that is above 1.',
  )
  sheet.step(
    'periods',
    'Periods per year',
    d.periodsPerYear,
    PLAIN,
    breakdown.horizon === 'a year'
      ? 'Risks are scaled to a year by its square root.'
      : 'Not known: risks are per period.',
  )
  sheet.step(
    'rounding',
    'Rounding',
    Math.max(book.model.rounding, 1e-24),
    GAP,
    'A variance up to this part of the squared sum of stand-alone risks counts as 0.',
  )
  if (holdings.capital !== null) {
    const sum = sheet.sumsOtherAmounts ? 'base' : 'measure'
    sheet.step(
      'capital',
      'Capital',
      settings.capital === null
        ? () => `SUM(${sheet.all(sum)})`
        : cell
          ? () => referenceOf(cell)
          : settings.capital,
      '#,##0.00',
      settings.capital === null ? 'The sum of the amounts' : cell ? 'From its own cell' : 'As it was given',
    )
  }
  if (sheet.isDated) {
    sheet.step(
      'dates',
      'Dates used',
      () => `COUNT(${sheet.allDates('return')})`,
      COUNT,
      `Rows of ${addressOf(returns.area)} that have a return of every holding, within the look-back`,
    )
  }
  if (estimation.kind === 'dates') {
    const { decay, divisor, shrinkage, lags } = estimation
    if (decay !== null)
      sheet.step(
        'decay',
        'Decay factor',
        decay,
        PLAIN,
        'The weight of a date is this times the weight of the next newer one.',
      )
    sheet.step(
      'sum of weights',
      'Sum of the weights of the dates',
      () => `SUM(${sheet.allDates('weight')})`,
      PLAIN,
      decay === null ? 'Every date counts alike.' : '',
    )
    sheet.step(
      'divisor',
      'Divisor of variances and covariances',
      () => `${sheet.at('sum of weights')}${divisor === 'less one' ? '-1' : ''}`,
      PLAIN,
      divisor === 'less one' ? 'Dates less one' : 'The sum of the weights of the dates',
    )
    if (!sheet.isCovariance)
      sheet.step(
        'mean',
        'Mean return of the portfolio, per period',
        () =>
          `SUMPRODUCT(${sheet.allDates('return')},${sheet.allDates('weight')})/${sheet.at('sum of weights')}`,
        '0.000000%',
      )
    for (let lag = 1; lag <= lags; lag++)
      sheet.step(
        `lag ${lag}`,
        `Weight of lag ${lag}`,
        () => `1-${lag}/${lags + 1}`,
        PLAIN,
        lag === 1 ? 'Newey & West (1987): 1 less the lag over the number of lags and 1' : '',
      )
    if (lags > 0)
      sheet.step(
        'sum of multipliers',
        'Sum of the multipliers',
        () => `SUM(${sheet.allDates('multiplier')})`,
        SMALL,
      )
    if (shrinkage) {
      sheet.step(
        'intensity',
        'Shrinkage intensity',
        shrinkage.intensity,
        PLAIN,
        `Taken over from Counterpoise${sheet.derivesIntensity ? ' and derived further down' : ': its formula runs over all pairs of holdings'}`,
      )
      if (shrinkage.target === 'correlation') {
        sheet.step('moving', 'Holdings that move', shrinkage.moving, COUNT)
        sheet.step(
          'mean correlation',
          'Mean correlation',
          () =>
            shrinkage.moving < 2
              ? '0'
              : `(VAR.P(${sheet.allDates('standardised')})-${sheet.at('moving')})/(${sheet.at('moving')}*(${sheet.at('moving')}-1))`,
          RATIO,
          'The variance of the sum of the returns, each over its own volatility, is the sum of all correlations.',
        )
        sheet.step(
          'weighted volatility',
          'Sum of weights times volatilities, per period',
          () => `SUMPRODUCT(SQRT(${sheet.all('variance')}),${sheet.all('weight')})`,
          PERCENT,
        )
      } else {
        sheet.step('moving', 'Holdings that move', shrinkage.moving, COUNT)
        sheet.step(
          'mean variance',
          'Mean variance of the holdings that move, per period',
          () => `SUM(${sheet.all('variance')})/${sheet.at('moving')}`,
          SMALL,
          'The target: this variance for each of them, and no correlation',
        )
      }
    }
  }
}
