import { referenceOf } from '../cells'
import { numberCell as number, textCell as text } from '../table'
import type { DateKey, Key } from './columns'
import { SMALL } from './columns'
import type { Late } from './draft'
import type { ProofSheet } from './proof-sheet'

/** Variance, and covariance with the portfolio, of one holding per period. */
export function layMoments(
  sheet: ProofSheet,
  i: number,
  put: (key: Key, cell: Late) => void,
  formula: (key: Key, format: string, of: () => string) => void,
  notes: string[],
): void {
  const { blocks } = sheet.input
  const { estimation, cells } = sheet.reach
  const series = blocks.match.seriesOf[i] ?? -1
  if (!sheet.moves(i)) {
    notes.push(series < 0 ? 'riskless: covariance 0' : 'never moves, counts as riskless: covariance 0')
    if (sheet.keys.includes('mean')) put('mean', text(''))
    for (const key of ['variance', 'covariance', 'shrunk variance', 'shrunk covariance'] as const)
      if (sheet.keys.includes(key)) put(key, number(0, SMALL))
    return
  }
  if (estimation.kind === 'taken over' || cells === null) {
    put('variance', number(sheet.variances[i], SMALL))
    put('covariance', number(sheet.covariances[i], SMALL))
    notes.push('covariances taken over')
    return
  }
  if (estimation.kind === 'matrix') {
    const weights = (from: number, count: number): string =>
      sheet.draft.range(sheet.seriesColumn('weight'), from, count)
    formula('variance', SMALL, () => referenceOf(blocks.returns.cell(series, series)))
    formula('covariance', SMALL, () => cells.alongSeries(series, weights) ?? '')
    return
  }
  const mean = sheet.cell('mean', i)
  const dateWeights = (from: number, count: number): string =>
    sheet.draft.range(sheet.dateColumn('weight'), from, count)
  if (sheet.keys.includes('mean'))
    formula(
      'mean',
      '0.000000%',
      () => `(${cells.alongDates(series, dateWeights) ?? ''})/${sheet.at('sum of weights')}`,
    )
  const variance = varianceOf(sheet, series, mean, dateWeights)
  if (variance === null) {
    put('variance', number(sheet.variances[i], SMALL))
    notes.push('variance taken over')
  } else formula('variance', SMALL, variance)
  formula('covariance', SMALL, () => covarianceWith(sheet, series, mean, 'return', 'multiplier'))

  if (!estimation.shrinkage) return
  const [own, shared, w] = [sheet.cell('variance', i), sheet.cell('covariance', i), sheet.cell('weight', i)]
  const d = (): string => sheet.at('intensity')
  if (estimation.shrinkage.target === 'correlation') {
    formula('shrunk variance', SMALL, () => own)
    formula(
      'shrunk covariance',
      SMALL,
      () =>
        `(1-${d()})*${shared}+${d()}*${covarianceAtTarget(sheet, own, w, sheet.at('weighted volatility'))}`,
    )
  } else {
    formula('shrunk variance', SMALL, () => `(1-${d()})*${own}+${d()}*${sheet.at('mean variance')}`)
    formula('shrunk covariance', SMALL, () => `(1-${d()})*${shared}+${d()}*${sheet.at('mean variance')}*${w}`)
  }
}

/** The covariance of one series with a column of returns per date. */
export function covarianceWith(
  sheet: ProofSheet,
  series: number,
  mean: string,
  returns: DateKey,
  multiplier: DateKey,
): string {
  const cells = sheet.reach.cells!
  const { estimation } = sheet.reach
  if (sheet.isCovariance)
    return `${estimation.kind === 'dates' && estimation.divisor === 'less one' ? 'COVARIANCE.S' : 'COVARIANCE.P'}(${cells.over(series)},${sheet.allDates(returns)})`
  const sum = cells.alongDates(series, (from, count) =>
    sheet.draft.range(sheet.dateColumn(multiplier), from, count),
  )
  const off = returns === 'active' ? 'sum of active multipliers' : 'sum of multipliers'
  return `${sum ?? ''}${sheet.lags > 0 ? `-${mean}*${sheet.at(off)}` : ''}`
}

/** What the target of constant correlation makes of a holding's covariance with some weights. */
export function covarianceAtTarget(
  sheet: ProofSheet,
  variance: string,
  weight: string,
  weighted: string,
): string {
  const r = sheet.at('mean correlation')
  return `(${r}*SQRT(${variance})*${weighted}+(1-${r})*${variance}*${weight})`
}

/** The variance of one series; null where only a constant can stand for it. */
function varianceOf(
  sheet: ProofSheet,
  series: number,
  mean: string,
  weights: (from: number, count: number) => string,
): (() => string) | null {
  const cells = sheet.reach.cells!
  const { estimation, isWhole } = sheet.reach
  if (estimation.kind !== 'dates') return null
  if (sheet.isPlain)
    return () => `${estimation.divisor === 'less one' ? 'VAR.S' : 'VAR.P'}(${cells.over(series)})`
  const divisor = (): string => sheet.at('divisor')
  if (estimation.lags > 0) {
    if (!isWhole) return null
    const all = cells.dates.length
    return () =>
      laggedVariance(
        sheet,
        (from, count) =>
          `${cells.over(series, { from, count, shift: cells.stretchesOf(series)[0]!.shift })}-${mean}`,
        all,
      )
  }
  if (cells.takesBlanks && cells.stretchesOf(series).length > 1)
    return () =>
      `(SUMPRODUCT(${weights(0, cells.dates.length)},${cells.over(series)},${cells.over(series)})-${sheet.at('sum of weights')}*${mean}^2)/${divisor()}`
  return () =>
    `(${cells.alongDates(series, weights, (returns) => `(${returns}-${mean})^2`) ?? ''})/${divisor()}`
}

/** Variance with lagged terms of what stands in neighbouring cells. */
export function laggedVariance(
  sheet: ProofSheet,
  centred: (from: number, count: number) => string,
  dates: number,
): string {
  const lagged = Array.from({ length: sheet.lags }, (_, k) => {
    const lag = k + 1
    return `${sheet.at(`lag ${lag}`)}*SUMPRODUCT((${centred(0, dates - lag)})*(${centred(lag, dates - lag)}))`
  })
  return `(SUMPRODUCT((${centred(0, dates)})^2)+2*(${lagged.join('+')}))/${sheet.at('divisor')}`
}

/** The root of a variance, or 0 where it is no more than rounding; one further below 0 than that has none, and shows as an error. */
export function rootOf(sheet: ProofSheet, name: string): string {
  const variance = sheet.at(name)
  return `SQRT(${variance}*(ABS(${variance})>${sheet.at('rounding')}*${sheet.at('gross per period')}^2))`
}
