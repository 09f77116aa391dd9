import { formulaCell, numberCell as number, textCell as text } from '../table'
import type { Tails } from '../tail-section'
import { COUNT, GAP, PERCENT, PLAIN, RATIO, SMALL } from './columns'
import type { ProofSheet } from './proof-sheet'
import { literal, QUANTILE_TOLERANCE } from './proof-sheet'

/** Value at risk and expected shortfall, by the method chosen. */
export function layTails(sheet: ProofSheet): void {
  const { breakdown, settings } = sheet.input
  const { tails } = breakdown
  if (typeof tails === 'string') return
  const { method } = tails.risk
  if ((method.kind === 'historical' || method.kind === 'cornish-fisher') && !sheet.isDated) {
    sheet.notProven.push(
      `Value at risk and expected shortfall: ${sheet.reach.why ?? 'there are no returns'}.`,
    )
    return
  }
  if (method.kind === 'cornish-fisher' && tails.risk.skewness === null) {
    sheet.notProven.push('Value at risk: the book has no risk.')
    return
  }
  sheet.section(`Large losses: ${tails.label}`)
  sheet.step('confidence', 'Confidence', settings.tails.confidence, '0.0###%')
  switch (method.kind) {
    case 'historical':
      layHistorical(sheet, tails)
      break
    case 'cornish-fisher':
      layCornishFisher(sheet, tails)
      break
    case 'normal':
    case 'student':
      layElliptical(sheet, tails)
  }
}

function layElliptical(sheet: ProofSheet, tails: Tails): void {
  const { risk } = tails
  const degrees = risk.degrees === Infinity ? null : risk.degrees
  const multiple = (): string => `${sheet.at('volatility per period')}*SQRT(${sheet.at('horizon')})`
  sheet.step(
    'horizon',
    'Horizon in periods',
    risk.periods,
    PLAIN,
    'Scaled by its square root; the mean is taken as 0',
  )
  sheet.step(
    'tail',
    'Tail probability',
    () => `1-${sheet.at('confidence')}`,
    PLAIN,
    'One less the confidence',
  )
  if (degrees === null) {
    sheet.step(
      'quantile',
      'Quantile of the normal distribution',
      () => `-NORM.S.INV(${sheet.at('tail')})`,
      PLAIN,
    )
    sheet.step(
      'beyond',
      'Mean of the normal distribution beyond it',
      () => `NORM.S.DIST(${sheet.at('quantile')},FALSE)/${sheet.at('tail')}`,
      PLAIN,
      'Density at the quantile over the tail probability',
    )
  } else layStudent(sheet, tails, degrees)
  sheet.line(
    'value at risk',
    'Value at risk',
    () => `${sheet.at('quantile')}*${multiple()}`,
    risk.valueAtRisk,
    PERCENT,
    'Quantile times the volatility of the horizon',
  )
  if (risk.shortfall !== null)
    sheet.line(
      'shortfall',
      'Expected shortfall',
      () => `${sheet.at('beyond')}*${multiple()}`,
      risk.shortfall,
      PERCENT,
      'Mean beyond the quantile times the volatility of the horizon; its parts are in proportion to the contributions above',
    )
}

function layStudent(sheet: ProofSheet, { risk }: Tails, degrees: number): void {
  const v = (): string => sheet.at('degrees')
  // the quantile of a distribution with mean 0 and variance 1, brought back to Student's own scale
  const perVolatility =
    sheet.input.breakdown.decomposition.volatility /
    Math.sqrt(sheet.input.breakdown.decomposition.periodsPerYear)
  const unit = Math.sqrt((degrees - 2) / degrees)
  const quantile =
    perVolatility === 0 ? 0 : risk.valueAtRisk / (perVolatility * Math.sqrt(risk.periods) * unit)
  sheet.step(
    'degrees',
    'Degrees of freedom',
    degrees,
    PLAIN,
    risk.method.kind === 'student' && risk.method.degrees === null
      ? 'Fitted to the portfolio’s returns by maximum likelihood: taken over from Counterpoise'
      : 'As chosen',
  )
  sheet.step(
    'student quantile',
    'Quantile of Student’s t distribution',
    quantile,
    PLAIN,
    'Taken over from Counterpoise and held against its probability in the next line: the workbook’s own quantile takes whole degrees of freedom only',
  )
  if (perVolatility > 0)
    sheet.line(
      'student probability',
      'Probability beyond the quantile',
      () => `BETA.DIST(${v()}/(${v()}+${sheet.at('student quantile')}^2),${v()}/2,0.5,TRUE)/2`,
      1 - risk.confidence,
      PLAIN,
      `Half the incomplete beta function at v/(v + q²); agrees within ${literal(QUANTILE_TOLERANCE).toUpperCase()}, as workbooks have that function to fewer digits`,
      'quantile',
    )
  sheet.step('unit', 'Scale for a variance of 1', () => `SQRT((${v()}-2)/${v()})`, PLAIN)
  sheet.step(
    'quantile',
    'Quantile at a volatility of 1',
    () => `${sheet.at('unit')}*${sheet.at('student quantile')}`,
    PLAIN,
  )
  sheet.step(
    'beyond',
    'Mean beyond it at a volatility of 1',
    () =>
      `${sheet.at('unit')}*EXP(GAMMALN((${v()}+1)/2)-GAMMALN(${v()}/2))/SQRT(${v()}*PI())*(1+${sheet.at('student quantile')}^2/${v()})^(-(${v()}+1)/2)/${sheet.at('tail')}*(${v()}+${sheet.at('student quantile')}^2)/(${v()}-1)`,
    PLAIN,
    'Density over the tail probability, times (v + q²)/(v − 1)',
  )
}

function layCornishFisher(sheet: ProofSheet, { risk }: Tails): void {
  const y = (): string => sheet.allDates('return')
  const moment = (power: number): string =>
    `SUMPRODUCT(${datesUsed(sheet)}*(${y()}-${sheet.at('plain mean')})^${power})/${sheet.at('dates')}`
  sheet.step('plain mean', 'Mean return, every date alike', () => `AVERAGE(${y()})`, '0.000000%')
  sheet.step(
    'skewness',
    'Skewness',
    () => `(${moment(3)})/(${moment(2)})^1.5`,
    RATIO,
    'Third central moment over the variance to the power 1.5; divisor T',
  )
  sheet.step(
    'kurtosis',
    'Excess kurtosis',
    () => `(${moment(4)})/(${moment(2)})^2-3`,
    RATIO,
    'Fourth central moment over the squared variance, less 3; divisor T',
  )
  sheet.step(
    'quantile',
    'Quantile of the normal distribution',
    () => `NORM.S.INV(1-${sheet.at('confidence')})`,
    PLAIN,
  )
  const z = (): string => sheet.at('quantile')
  const [skew, kurt] = ['skewness', 'kurtosis'].map((name) => () => sheet.at(name)) as [
    () => string,
    () => string,
  ]
  sheet.step(
    'corrected',
    'Quantile corrected',
    () =>
      `${z()}+(${z()}^2-1)*${skew()}/6+(${z()}^3-3*${z()})*${kurt()}/24-(2*${z()}^3-5*${z()})*${skew()}^2/36`,
    PLAIN,
    'Cornish & Fisher (1937)',
  )
  sheet.line(
    'value at risk',
    'Value at risk',
    () => `-${sheet.at('corrected')}*${sheet.at('volatility per period')}`,
    risk.valueAtRisk,
    PERCENT,
    'Corrected quantile times the volatility, mean taken as 0',
  )
}

function layHistorical(sheet: ProofSheet, { risk, partsWithheld }: Tails): void {
  const { breakdown, blocks } = sheet.input
  const y = (): string => sheet.allDates('return')
  sheet.step(
    'tail',
    'Tail probability',
    () => `ROUND(1-${sheet.at('confidence')},10)`,
    PLAIN,
    'One less the confidence',
  )
  sheet.step(
    'observations',
    'Dates in the tail',
    () => `ROUND(${sheet.at('dates')}*${sheet.at('tail')},9)`,
    PLAIN,
    'Dates used times the tail probability',
  )
  sheet.line(
    'value at risk',
    'Value at risk',
    () => `-SMALL(${y()},ROUNDUP(${sheet.at('observations')},0))`,
    risk.valueAtRisk,
    PERCENT,
    'The largest losses counted from the worst, up to the dates in the tail, rounded up',
  )
  sheet.step(
    'alike',
    'Losses this close count as equal',
    () => `1E-12*MAX(ABS(MAX(${y()})),ABS(MIN(${y()})))`,
    SMALL,
  )
  sheet.step(
    'above',
    'Dates with a loss above the value at risk',
    () => `SUMPRODUCT(${datesUsed(sheet)}*(${y()}<-${sheet.at('value at risk')}-${sheet.at('alike')}))`,
    COUNT,
  )
  sheet.step(
    'tied',
    'Dates with a loss equal to it',
    () =>
      `SUMPRODUCT(${datesUsed(sheet)}*(${y()}<=-${sheet.at('value at risk')}+${sheet.at('alike')}))-${sheet.at('above')}`,
    COUNT,
    'They share the weight that is left',
  )
  sheet.line(
    'shortfall',
    'Expected shortfall',
    () => `-SUMPRODUCT(${y()},${sheet.allDates('tail')})`,
    risk.shortfall ?? 0,
    PERCENT,
    'Mean of the losses in the tail, the last date in part (Acerbi & Tasche 2002)',
  )
  if (partsWithheld !== null) sheet.note(partsWithheld)
  const { parts } = risk
  if (parts === null || partsWithheld !== null) return
  const c = sheet.labels
  sheet.draft.add(
    {
      0: text('Holding', 'head'),
      [c]: text('Part of shortfall', 'head'),
      [c + 1]: text('Counterpoise', 'head'),
      [c + 2]: text('Difference', 'head'),
      [c + 3]: { ...text('Result', 'head'), indent: 1 },
    },
    'head',
  )
  const first = sheet.draft.next
  const cells = sheet.reach.cells!
  breakdown.names.forEach((name, i) => {
    const row = sheet.draft.next
    const near = (k: number): string => sheet.draft.cell(row, c + k)
    const series = blocks.match.seriesOf[i] ?? -1
    const tail = (from: number, count: number): string =>
      sheet.draft.range(sheet.dateColumn('tail'), from, count)
    sheet.draft.add({
      0: text(name),
      [c]:
        series < 0
          ? number(0, PERCENT)
          : () =>
              formulaCell(`=-${sheet.cell('weight', i)}*(${cells.alongDates(series, tail) ?? ''})`, PERCENT),
      [c + 1]: number(parts[i], PERCENT),
      [c + 2]: formulaCell(`=${near(0)}-${near(1)}`, GAP),
      [c + 3]: () => sheet.mark([[`ABS(${near(2)})`, sheet.allowed('risk')]]),
      ...(series < 0 ? { [c + 4]: { ...text('riskless: no part'), indent: 1 } } : {}),
    })
  })
  sheet.draft.add(
    {
      0: text('Total', 'total'),
      [c]: formulaCell(
        `=SUM(${sheet.draft.range({ column: c, row: first, rows: sheet.size })})`,
        PERCENT,
        'total',
      ),
    },
    'total',
  )
}

/** One for each date used, nothing for others. */
function datesUsed(sheet: ProofSheet): string {
  return `ISNUMBER(${sheet.allDates('return')})`
}
