import type { Key } from './columns'
import { COUNT, PERCENT, RATIO, SMALL } from './columns'
import { rootOf } from './moments'
import type { ProofSheet } from './proof-sheet'

/** The figures of the book as a whole. */
export function layBook(sheet: ProofSheet): void {
  const { breakdown } = sheet.input
  const { decomposition: d, horizon } = breakdown
  const scaled = `SQRT(${sheet.at('periods')})`
  const covariance: Key = sheet.shrinkage ? 'shrunk covariance' : 'covariance'
  sheet.section('The book')
  sheet.step(
    'gross per period',
    'Sum of stand-alone risks, per period',
    () => `${sheet.at('gross risk')}/${scaled}`,
    PERCENT,
  )
  sheet.step(
    'variance',
    'Variance of the portfolio, per period',
    () => `SUMPRODUCT(${sheet.all('weight')},${sheet.all(covariance)})`,
    SMALL,
    'Sum of weights times covariances with the portfolio',
  )
  sheet.step(
    'volatility per period',
    'Volatility of the portfolio, per period',
    () => rootOf(sheet, 'variance'),
    PERCENT,
  )
  sheet.line(
    'volatility',
    `Volatility ${horizon}`,
    () => `${sheet.at('volatility per period')}*${scaled}`,
    d.volatility,
    PERCENT,
    'Root of the variance, times the root of the periods per year',
  )
  const own = ownVolatility(sheet)
  if (own !== null)
    sheet.line(
      'own volatility',
      `Volatility ${horizon}, from the dates`,
      own,
      d.volatility,
      PERCENT,
      'From the portfolio’s own return on every date: another way to the same figure',
    )
  sheet.line(
    'gross risk',
    'Sum of stand-alone risks',
    () => `SUM(${sheet.all('stand-alone')})`,
    d.standAlone.reduce((sum, value) => sum + value, 0),
    PERCENT,
    'Sum of the column below',
  )
  sheet.line(
    'benefit',
    'Diversification benefit',
    () => `${sheet.at('gross risk')}-${sheet.at('volatility')}`,
    d.diversificationBenefit,
    PERCENT,
    'Sum of stand-alone risks less the volatility',
  )
  if (d.diversificationRatio === null)
    sheet.step('ratio scale', 'Diversification ratio', 1, RATIO, 'Not defined: the book has no risk')
  else
    sheet.line(
      'ratio scale',
      'Diversification ratio',
      () => `${sheet.at('gross risk')}/${sheet.at('volatility')}`,
      d.diversificationRatio,
      RATIO,
      'Sum of stand-alone risks over the volatility',
      'ratio',
    )
  if (d.effectiveNumber !== null && breakdown.effectiveWithheld === null)
    sheet.line(
      'effective',
      'Effective number of positions (by risk)',
      () => `1/SUMSQ(${sheet.all('share')})`,
      d.effectiveNumber,
      RATIO,
      'One over the sum of squared shares of risk',
      'ratio',
    )
  sheet.line(
    'net',
    'Net weight',
    () => `SUM(${sheet.all('weight')})`,
    breakdown.net,
    PERCENT,
    'Sum of weights',
    'ratio',
  )
  sheet.line(
    'gross',
    'Gross weight',
    () => `SUMPRODUCT(ABS(${sheet.all('weight')}))`,
    breakdown.gross,
    PERCENT,
    'Sum of weights without their signs',
    'ratio',
  )
  const { expectedReturn } = breakdown
  if (sheet.isDated && expectedReturn?.label.startsWith('Average past return'))
    sheet.line(
      'average',
      `${expectedReturn.label}, ${expectedReturn.horizon}`,
      () => `AVERAGE(${sheet.allDates('return')})*${sheet.at('periods')}`,
      expectedReturn.value,
      PERCENT,
      'Mean of the portfolio’s returns on the dates used, times the periods per year',
    )
  const count = sheet.reach.cells?.count() ?? null
  if (count)
    sheet.line(
      'numbers',
      'Numbers in the cells of the returns',
      () => count.formula,
      count.found,
      COUNT,
      'Cells that hold a number, against those that held one when they were read',
      'count',
    )
}

/** The volatility straight from the portfolio's returns; null where the estimator makes another one of them. */
function ownVolatility(sheet: ProofSheet): (() => string) | null {
  const { estimation } = sheet.reach
  if (estimation.kind !== 'dates' || estimation.shrinkage) return null
  const scaled = `SQRT(${sheet.at('periods')})`
  if (sheet.isCovariance)
    return () =>
      `${estimation.divisor === 'less one' ? 'STDEV.S' : 'STDEV.P'}(${sheet.allDates('return')})*${scaled}`
  return () => {
    const product = `SUMPRODUCT(${sheet.allDates('return')},${sheet.allDates('multiplier')})`
    const off = sheet.lags > 0 ? `-${sheet.at('mean')}*${sheet.at('sum of multipliers')}` : ''
    return `SQRT(MAX(0,${product}${off}))*${scaled}`
  }
}
