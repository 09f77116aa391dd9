import { SMALL } from './columns'
import type { Column } from './draft'
import type { ProofSheet } from './proof-sheet'

/** How the intensity of a shrinkage toward one variance for all follows from the returns. */
export function layIntensity(sheet: ProofSheet): void {
  const { target, intensity } = sheet.shrinkage!
  sheet.section('Shrinkage intensity')
  const c = sheet.labels
  const moving = sheet.input.breakdown.names.flatMap((name, i) => (sheet.moves(i) ? [{ name, i }] : []))
  const rows: Column = { column: c, row: sheet.draft.next, rows: moving.length }
  for (const { name, i } of moving)
    sheet.step(
      `squares ${i}`,
      name,
      () =>
        moving.map((other) => `COVARIANCE.P(${sheet.returnsOf(i)},${sheet.returnsOf(other.i)})^2`).join('+'),
      SMALL,
      i === moving[0]?.i ? 'Sum of its squared covariances with all holdings, divisor T' : '',
    )
  const n = (): string => sheet.at('moving')
  const T = (): string => sheet.at('dates')
  const trace = (): string => `SUM(${sheet.all('variance')})`
  sheet.step('squares', 'Sum of squared covariances', () => `SUM(${sheet.draft.range(rows)})`, SMALL)
  sheet.step(
    'distance',
    'Squared distance from the target',
    () => `${sheet.at('squares')}-${trace()}^2/${n()}`,
    SMALL,
    'The sum of squares less the squared sum of variances over their number',
  )
  if (target === 'identity')
    sheet.step(
      'noise',
      'Squared error of the covariances',
      () => `(SUMSQ(${sheet.allDates('length')})/${T()}-${sheet.at('squares')})/${T()}`,
      SMALL,
      'Mean of the squared products of the dates less the sum of squares, over the number of dates',
    )
  sheet.line(
    'derived intensity',
    'Shrinkage intensity',
    () =>
      target === 'identity'
        ? `MIN(1,MAX(0,${sheet.at('noise')})/${sheet.at('distance')})`
        : `MIN(1,((1-2/${n()})*${sheet.at('squares')}+${trace()}^2)/((${T()}+1-2/${n()})*${sheet.at('distance')}))`,
    intensity,
    '0.000000',
    target === 'identity'
      ? 'Error over distance, 1 at most'
      : 'Chen et al. (2010), equation 23 (from memory); 1 at most',
    'ratio',
  )
}
