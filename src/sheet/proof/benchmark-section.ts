import { referenceOf } from '../cells'
import { formulaCell, numberCell as number, textCell as text } from '../table'
import type { Key } from './columns'
import { GAP, PERCENT, RATIO, SHARE, SMALL } from './columns'
import type { Late } from './draft'
import { covarianceAtTarget, covarianceWith, rootOf } from './moments'
import type { ProofSheet } from './proof-sheet'

/** Tracking error and its parts, or why they are not recomputed. */
export function layBenchmark(sheet: ProofSheet): void {
  const { breakdown, settings } = sheet.input
  const { active } = breakdown
  if (!active) return
  if (!sheet.provesActive) {
    sheet.notProven.push(
      settings.benchmark.kind === 'series'
        ? 'Figures against the benchmark: it is one series, with a model of its own.'
        : sheet.reach.estimation.kind === 'taken over'
          ? 'Figures against the benchmark: they need covariances that are not recomputed here.'
          : 'Figures against the benchmark: they would make this sheet too long.',
    )
    return
  }
  const { risk } = active
  const { estimation } = sheet.reach
  const relative = risk.convention === 'benchmark-relative returns'
  const scaled = (): string => `SQRT(${sheet.at('periods')})`
  const c = sheet.labels
  /** the row of the first holding, known once the lines above the table are laid */
  let first = 0
  const column = (k: number) => (): string =>
    sheet.draft.range({ column: c + k, row: first, rows: sheet.size })
  const [weights, , covariances] = [column(0), column(1), column(2)]
  sheet.section(`Against the benchmark: ${active.label}`)
  if (estimation.kind === 'dates' && !sheet.isCovariance) {
    sheet.step(
      'active mean',
      'Mean active return, per period',
      () =>
        `SUMPRODUCT(${sheet.allDates('active')},${sheet.allDates('weight')})/${sheet.at('sum of weights')}`,
      '0.000000%',
    )
    if (sheet.lags > 0)
      sheet.step(
        'sum of active multipliers',
        'Sum of the multipliers',
        () => `SUM(${sheet.allDates('active multiplier')})`,
        SMALL,
      )
  }
  if (sheet.shrinkage?.target === 'correlation')
    sheet.step(
      'weighted active volatility',
      'Sum of active weights times volatilities, per period',
      () => `SUMPRODUCT(SQRT(${sheet.all('variance')}),${weights()})`,
      PERCENT,
    )
  sheet.step(
    'active variance',
    'Variance of the active return, per period',
    () => `SUMPRODUCT(${weights()},${covariances()})`,
    SMALL,
    'Sum of active weights times covariances with the active return',
  )
  sheet.step(
    'active volatility',
    'Tracking error, per period',
    () => rootOf(sheet, 'active variance'),
    PERCENT,
  )
  sheet.line(
    'tracking error',
    `Tracking error (ex ante) ${breakdown.horizon}`,
    () => `${sheet.at('active volatility')}*${scaled()}`,
    risk.trackingError,
    PERCENT,
    `Parts by ${risk.convention}`,
  )
  const covariance: Key = sheet.shrinkage ? 'shrunk covariance' : 'covariance'
  sheet.step(
    'benchmark variance',
    'Variance of the benchmark, per period',
    () => `SUMPRODUCT(${column(1)()},${sheet.all(covariance)}-${covariances()})`,
    SMALL,
    'Covariances with the benchmark are those with the portfolio less those with the active return',
  )
  sheet.line(
    'benchmark volatility',
    'Volatility of the benchmark',
    () => `SQRT(MAX(0,${sheet.at('benchmark variance')}))*${scaled()}`,
    risk.benchmarkVolatility,
    PERCENT,
    'Root of its variance, times the root of the periods per year',
  )
  if (risk.beta !== null)
    sheet.line(
      'benchmark beta',
      'Beta to the benchmark',
      () => `SUMPRODUCT(${column(1)()},${sheet.all(covariance)})/${sheet.at('benchmark variance')}`,
      risk.beta,
      RATIO,
      'Covariance of portfolio and benchmark over the variance of the benchmark',
      'ratio',
    )
  if (risk.beta !== null && risk.correlation !== null)
    sheet.line(
      'benchmark correlation',
      'Correlation with the benchmark',
      () => `${sheet.at('benchmark beta')}*${sheet.at('benchmark volatility')}/${sheet.at('volatility')}`,
      risk.correlation,
      RATIO,
      'Beta times the volatility of the benchmark over that of the portfolio',
      'ratio',
    )
  if (relative)
    sheet.step(
      'common',
      'Marginal contribution of the benchmark itself',
      () =>
        risk.share === null
          ? '0'
          : `SUMPRODUCT(${column(1)()},${covariances()})/${sheet.at('active volatility')}*${scaled()}`,
      PERCENT,
      'Taken off every holding, and put on the line of the net active weight',
    )
  const shares = active.sharesWithheld === null && risk.share !== null
  const heads = [
    'Active weight',
    'Benchmark weight',
    'Covariance, active',
    'Contribution to tracking error',
    'Share of tracking error',
    'Contribution to tracking error, Counterpoise',
    'Share of tracking error, Counterpoise',
    'Difference, contribution',
    'Difference, share',
  ]
  if (active.sharesWithheld !== null) sheet.note(active.sharesWithheld)
  sheet.draft.add(
    {
      0: text('Holding', 'head'),
      ...Object.fromEntries(heads.map((head, k) => [c + k, text(head, 'head')])),
      [c + heads.length]: { ...text('Result', 'head'), indent: 1 },
    },
    'head',
  )
  first = sheet.draft.next
  for (let i = 0; i < sheet.size; i++) layActiveHolding(sheet, i, relative, shares)
  if (relative) layNetWeight(sheet, first, shares)
  const count = sheet.draft.next - first
  sheet.draft.add(
    {
      0: text('Total', 'total'),
      ...Object.fromEntries(
        [0, 3].map((k) => [
          c + k,
          formulaCell(
            `=SUM(${sheet.draft.range({ column: c + k, row: first, rows: k === 0 ? sheet.size : count })})`,
            PERCENT,
            'total',
          ),
        ]),
      ),
    },
    'total',
  )
}

function layActiveHolding(sheet: ProofSheet, i: number, relative: boolean, shares: boolean): void {
  const { breakdown, blocks } = sheet.input
  const { risk, names } = breakdown.active!
  const { estimation, cells } = sheet.reach
  const c = sheet.labels
  const row = sheet.draft.next
  const near = (k: number): string => sheet.draft.cell(row, c + k)
  const holding = blocks.holdings.holdings[i]
  const benchmark = holding?.cells?.benchmark
  const series = blocks.match.seriesOf[i] ?? -1
  const covariance = (): string => {
    if (!sheet.moves(i)) return '0'
    if (estimation.kind === 'matrix')
      return (
        cells!.alongSeries(series, (from, count) =>
          sheet.draft.range(sheet.seriesColumn('active'), from, count),
        ) ?? ''
      )
    const plain = covarianceWith(sheet, series, sheet.cell('mean', i), 'active', 'active multiplier')
    const shrinkage = sheet.shrinkage
    if (!shrinkage) return plain
    const d = sheet.at('intensity')
    return shrinkage.target === 'correlation'
      ? `(1-${d})*${plain === '' ? '0' : `(${plain})`}+${d}*${covarianceAtTarget(sheet, sheet.cell('variance', i), near(0), sheet.at('weighted active volatility'))}`
      : `(1-${d})*(${plain})+${d}*${sheet.at('mean variance')}*${near(0)}`
  }
  const s = (): string => sheet.at('active volatility')
  const product = (): string =>
    `${near(0)}*(${near(2)}/${s()}*SQRT(${sheet.at('periods')})${relative ? `-${sheet.at('common')}` : ''})`
  sheet.draft.add({
    0: text(names[i] ?? ''),
    [c]: formulaCell(`=${sheet.cell('weight', i)}-${near(1)}`, PERCENT),
    [c + 1]: benchmark
      ? formulaCell(`=${referenceOf(benchmark)}`, PERCENT)
      : number(holding?.benchmark ?? 0, PERCENT),
    [c + 2]: sheet.moves(i) ? () => formulaCell(`=${covariance()}`, SMALL) : number(0, SMALL),
    [c + 3]: () =>
      formulaCell(risk.share === null ? `=IF(${s()}=0,0,${product()})` : `=${product()}`, PERCENT),
    [c + 4]: shares
      ? () => formulaCell(`=${near(3)}/${sheet.at('tracking error')}`, SHARE)
      : text('withheld'),
    [c + 5]: number(risk.contribution[i], PERCENT),
    [c + 6]: shares ? number(risk.share?.[i], SHARE) : text(''),
    ...activeGaps(sheet, near, shares),
  })
}

function layNetWeight(sheet: ProofSheet, first: number, shares: boolean): void {
  const { risk } = sheet.input.breakdown.active!
  const c = sheet.labels
  const row = sheet.draft.next
  const near = (k: number): string => sheet.draft.cell(row, c + k)
  sheet.draft.add({
    0: text('Net active weight'),
    [c]: formulaCell(`=SUM(${sheet.draft.range({ column: c, row: first, rows: sheet.size })})`, PERCENT),
    [c + 3]: formulaCell(`=${near(0)}*${sheet.at('common')}`, PERCENT),
    [c + 4]: shares
      ? () => formulaCell(`=${near(3)}/${sheet.at('tracking error')}`, SHARE)
      : text('withheld'),
    [c + 5]: number(risk.netContribution, PERCENT),
    [c + 6]: shares ? number(risk.netShare, SHARE) : text(''),
    ...activeGaps(sheet, near, shares),
  })
}

function activeGaps(
  sheet: ProofSheet,
  near: (k: number) => string,
  shares: boolean,
): { readonly [column: number]: Late } {
  const c = sheet.labels
  const gaps: (readonly [string, string])[] = []
  return {
    [c + 7]: formulaCell(`=${near(3)}-${near(5)}`, GAP),
    [c + 8]: shares ? formulaCell(`=${near(4)}-${near(6)}`, GAP) : text(''),
    [c + 9]: () => {
      gaps.push([`ABS(${near(7)})`, sheet.allowed('risk')])
      // shares of a small tracking error carry the rounding of the whole book
      if (shares)
        gaps.push([
          `ABS(${near(8)})`,
          `${sheet.at('tolerance')}*MAX(1,${sheet.at('gross risk')}/${sheet.at('tracking error')})`,
        ])
      return sheet.mark(gaps)
    },
  }
}
