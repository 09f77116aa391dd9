import type { Bands } from './bands'
import type { Active } from './benchmark'
import type { Breakdown, FactorSplit } from './breakdown'
import type { CurrencyRisk } from './currency'
import { CURRENCY_READING } from './currency'
import type { LimitState } from './limits'
import { LIMIT_MEASURES, LIMIT_STATUS, limitOn, limitsSummary } from './limits'
import type { NestedGroup } from './nesting'
import type { Mark, Table, TableBars, TableCell } from './table'
import { textCell as text, numberCell as number, setIn } from './table'
import type { Tails } from './tail-section'
import { BAND, bandText, CAUTION, countOf, dateText, percentText, POSITION_HEADS, quote } from './wording'

const PERCENT = '0.00%'
const SHARE = '0.0%'
const RATIO = '0.00'
const ROUNDING = '0.0E+00'

const capital = (sentence: string): string => sentence.charAt(0).toUpperCase() + sentence.slice(1)

const sumOf = (values: Float64Array): number => values.reduce((sum, value) => sum + value, 0)

/** What the figures were estimated from, as a part of a sentence. */
function dataOf({ dates }: Breakdown): string {
  if (!dates) return ', from a covariance matrix as given'
  const span =
    dates.first === null || dates.last === null ? '' : `, ${dateText(dates.first)} to ${dateText(dates.last)}`
  return `, from ${countOf(dates.used, 'date')} of returns${span}`
}

/** Columns of figures that stand behind the labels of a row; the same in every section, so that one set of widths serves them all. */
type Column =
  | 'weight'
  | 'stand-alone'
  | 'marginal'
  | 'contribution'
  | 'contribution low'
  | 'contribution high'
  | 'share'
  | 'share low'
  | 'share high'
  | 'beta'
  | 'correlation'

const [WEIGHT, STAND_ALONE, MARGINAL, CONTRIBUTION, SHARE_HEAD, BETA, CORRELATION] = POSITION_HEADS
const HEADS: readonly (readonly [Column, string, number])[] = [
  ['weight', WEIGHT, 11],
  ['stand-alone', STAND_ALONE, 16],
  ['marginal', MARGINAL, 16],
  ['contribution', CONTRIBUTION, 16],
  ['contribution low', '95% band, from', 11],
  ['contribution high', '95% band, to', 11],
  ['share', SHARE_HEAD, 11],
  ['share low', '95% band, from', 11],
  ['share high', '95% band, to', 11],
  ['beta', BETA, 13],
  ['correlation', CORRELATION, 15],
]

/** Rows of one width: labels at the left, figures by their column, a note at the right. */
class Rows {
  readonly cells: TableCell[][] = []
  /** how far each row is folded under those before it: 0 outermost */
  readonly levels: number[] = []
  readonly bars: TableBars[] = []
  readonly columns: readonly Column[]
  readonly labels: number

  constructor(labels: number, columns: readonly Column[]) {
    this.labels = labels
    this.columns = columns
  }

  get width(): number {
    return this.labels + this.columns.length + 1
  }

  /** Cells from the left on; the rest of the row is blank, under the mark of a heading or a total. */
  add(cells: readonly TableCell[], level = 0): void {
    const mark = cells[0]?.mark
    const rest = text('', mark === 'section' || mark === 'head' || mark === 'total' ? mark : undefined)
    this.cells.push([...cells, ...Array.from({ length: this.width - cells.length }, () => rest)])
    this.levels.push(level)
  }

  blank(): void {
    this.add([])
  }

  /** A row by column: what is not given is blank. */
  row(
    labels: readonly TableCell[],
    figures: { readonly [C in Column]?: TableCell | string },
    note: string,
    mark?: Mark,
    level = 0,
  ): void {
    const cell = (value: TableCell | string | undefined): TableCell =>
      value === undefined ? text('', mark) : typeof value === 'string' ? text(value, mark) : value
    const gaps = Array.from({ length: this.labels - labels.length }, () => text('', mark))
    this.add(
      [...labels, ...gaps, ...this.columns.map((column) => cell(figures[column])), text(note, mark)],
      level,
    )
  }

  /** A label and what it says, further right where the labels end. */
  figure(label: string, cell: TableCell, remark = ''): void {
    this.add([text(label), ...Array.from({ length: this.labels - 1 }, () => text('')), cell, text(remark)])
  }
}

/**
 * Lays a breakdown out as a table to be written: title and data dates, positions with a total row, the sum of parts and its
 * difference from the total, groups, limits, large losses, the benchmark, factors, the book's figures, settings, warnings, caution. Rows that may
 * vary in number stand last, so that a refresh of the same holdings fills the same cells.
 *
 * @returns rows of equal length; positions in the order of the holdings
 * @cost    O(positions + groups)
 */
export function breakdownTable(title: string, breakdown: Breakdown): Table {
  const {
    decomposition: d,
    groupHeaders,
    settings,
    findings,
    sharesWithheld,
    tails,
    active,
    currency,
  } = breakdown
  const bands = typeof breakdown.bands === 'string' ? null : breakdown.bands
  const columns = HEADS.map(([column]) => column).filter(
    (column) => bands !== null || !(column.endsWith(' low') || column.endsWith(' high')),
  )
  const rows = new Rows(1 + groupHeaders.length, columns)
  const told = findings.filter(({ weight }) => weight !== 'notes').map(({ sentence }) => sentence)
  const warnings = sharesWithheld === null ? told : [sharesWithheld, ...told]
  const exceeded = breakdown.limits.some(({ status }) => status === 'breach' || status === 'over soft')

  rows.add([text(`Contributions to risk: ${title}`, 'title')])
  const band = bands ? ` (95% band ${bandText(d.volatility, bands.volatility, 2)})` : ''
  rows.add([
    text(
      `Volatility ${percentText(d.volatility, 2)} ${breakdown.horizon}${currency ? ` in ${currency.base}` : ''}${band}${dataOf(breakdown)}.`,
    ),
  ])
  rows.add([text(CAUTION, 'note')])
  // one row whatever it says: a new weight must not move the rows below
  const alerts = [
    exceeded ? `${limitsSummary(breakdown.limits)}.` : '',
    warnings.length > 0 ? `${countOf(warnings.length, 'warning')}, at the end of this table.` : '',
  ].filter((sentence) => sentence !== '')
  if (alerts.length > 0) rows.add([text(alerts.join(' '), 'alert')])
  else rows.blank()
  rows.blank()

  addPositions(rows, breakdown, bands)
  addGroups(rows, breakdown)
  if (breakdown.limits.length > 0) addLimits(rows, breakdown)
  if (typeof tails !== 'string') addTails(rows, breakdown, tails)
  if (active) addActive(rows, active, breakdown.horizon)
  if (currency) addCurrency(rows, breakdown, currency)
  if (breakdown.factors) addFactors(rows, breakdown, breakdown.factors)
  addBook(rows, breakdown, bands)

  rows.blank()
  rows.add([text('Settings', 'section')])
  for (const [label, value] of settings) rows.add([text(label), text(value)])
  rows.add([
    text('Reading'),
    text(
      'Contributions add up to the volatility. A position 1% larger (of itself) changes it by its share of risk in percent (of itself), first order.',
    ),
  ])
  if (typeof breakdown.bands === 'string') rows.add([text('Error bands'), text(breakdown.bands)])
  else
    rows.add([
      text('Error bands'),
      text(
        `The figure and 1.96 standard errors either way, from what each date adds to it; no normal distribution is assumed. ${breakdown.bands.note ?? ''}`.trim(),
      ),
    ])
  if (typeof tails === 'string') rows.add([text('Large losses'), text(`Not shown. ${tails}`)])
  if (breakdown.normality) rows.add([text('Normality'), text(breakdown.normality.sentence)])
  rows.blank()
  rows.add([text('Warnings', 'section')])
  for (const sentence of warnings) rows.add([text(sentence, 'alert')])
  if (warnings.length === 0) rows.add([text('None')])

  const widthOf = new Map(HEADS.map(([column, , width]) => [column, width]))
  return {
    cells: setIn(rows.cells),
    widths: [
      30,
      ...groupHeaders.map(() => (breakdown.limits.length > 0 ? 20 : 16)),
      ...columns.map((column) => widthOf.get(column) ?? 12),
      30,
    ],
    numeric: [false, ...groupHeaders.map(() => false), ...columns.map(() => true), false],
    ...(rows.levels.some((level) => level > 0) ? { levels: rows.levels } : {}),
    ...(rows.bars.length > 0 ? { bars: rows.bars } : {}),
  }
}

const NOT_DEFINED = 'not defined'
const WITHHELD = 'withheld'

/** A share, or the word why it is not shown. */
const shareCell = (
  share: number | null | undefined,
  reason: string | null,
  isDefined: boolean,
  mark?: Mark,
): TableCell =>
  reason === null ? number(share, SHARE, mark) : text(isDefined ? WITHHELD : NOT_DEFINED, mark)

function addPositions(rows: Rows, breakdown: Breakdown, bands: Bands | null): void {
  const { decomposition: d, groupHeaders, sharesWithheld } = breakdown
  const share = (value: number | undefined, mark?: Mark): TableCell =>
    shareCell(value, sharesWithheld, d.share !== null, mark)
  const heads = Object.fromEntries(HEADS.map(([column, head]) => [column, text(head, 'head')]))
  rows.row(
    ['Holding', ...groupHeaders].map((head) => text(head, 'head')),
    heads,
    'Note',
    'head',
  )
  const notes = notesOf(breakdown, bands)
  const around = (value: number | undefined, error: number | undefined, side: 1 | -1, format: string) =>
    number(value === undefined || error === undefined ? null : value + side * BAND * error, format)
  breakdown.names.forEach((name, i) => {
    const contribution = d.contribution[i] ?? 0
    const shares = sharesWithheld === null ? d.share : null
    rows.row(
      [text(name), ...(breakdown.groups[i] ?? []).map((label) => text(label))],
      {
        weight: number(d.weights[i], PERCENT),
        'stand-alone': number(d.standAlone[i], PERCENT),
        marginal: number(d.marginal?.[i], PERCENT),
        contribution: number(contribution, PERCENT),
        'contribution low': around(contribution, bands?.contribution[i], -1, PERCENT),
        'contribution high': around(contribution, bands?.contribution[i], 1, PERCENT),
        share: share(d.share?.[i]),
        'share low': around(shares?.[i], bands?.share?.[i], -1, SHARE),
        'share high': around(shares?.[i], bands?.share?.[i], 1, SHARE),
        beta: number(d.beta?.[i], RATIO),
        correlation: number(d.correlation?.[i], RATIO),
      },
      notes[i] ?? '',
    )
  })
  rows.row(
    [text('Total', 'total')],
    {
      weight: number(breakdown.net, PERCENT, 'total'),
      'stand-alone': number(sumOf(d.standAlone), PERCENT, 'total'),
      contribution: number(d.volatility, PERCENT, 'total'),
      'contribution low': number(bands && d.volatility - BAND * bands.volatility, PERCENT, 'total'),
      'contribution high': number(bands && d.volatility + BAND * bands.volatility, PERCENT, 'total'),
      share: share(d.share ? 1 : undefined, 'total'),
    },
    '',
    'total',
  )
  rows.row([text('Sum of parts')], { contribution: number(d.sumOfContributions, PERCENT) }, '')
  rows.row([text('Difference')], { contribution: number(d.difference, ROUNDING) }, '')
}

/** A share of risk nearer to 0 than this shows as 0 and has no sign worth a word. */
const LEAST_SHARE = 0.0005

/** Whether a part is so far below 0 that it shows. */
export const reducesRisk = (contribution: number, total: number): boolean =>
  contribution < -LEAST_SHARE * total

/** What is to be said of a position: that it reduces risk, and where its rank is not certain. */
function notesOf({ decomposition: d, names }: Breakdown, bands: Bands | null): readonly string[] {
  const notes = [...d.contribution].map((contribution, i) => {
    if (!reducesRisk(contribution, d.volatility)) return []
    const upper = bands ? contribution + BAND * (bands.contribution[i] ?? 0) : -1
    return [
      upper < 0 ? 'Risk-reducing position' : 'Risk-reducing position, not for certain: its band holds 0',
    ]
  })
  bands?.order.forEach((position, k) => {
    const next = names[bands.order[k + 1] ?? -1]
    if (bands.tied[k] && next !== undefined)
      notes[position]?.push(`Rank ${k + 1}, not told apart from rank ${k + 2}, ${quote(next)}`)
  })
  return notes.map((list) => list.join('; '))
}

const GROUP_HEADS = {
  weight: WEIGHT,
  'stand-alone': STAND_ALONE,
  contribution: CONTRIBUTION,
  share: SHARE_HEAD,
}

function addGroups(rows: Rows, breakdown: Breakdown): void {
  const { decomposition: d, sharesWithheld } = breakdown
  const share = (value: number | null | undefined, mark?: Mark): TableCell =>
    shareCell(value, sharesWithheld, d.share !== null, mark)
  const total = (weight: number, standAlone: number | null, contribution: number): void =>
    rows.row(
      [text('Total', 'total')],
      {
        weight: number(weight, PERCENT, 'total'),
        'stand-alone': number(standAlone, PERCENT, 'total'),
        contribution: number(contribution, PERCENT, 'total'),
        share: share(d.share ? 1 : undefined, 'total'),
      },
      '',
      'total',
    )

  for (const { header, labels, parts } of breakdown.byGroup) {
    rows.blank()
    rows.row([text(header, 'head')], GROUP_HEADS, '', 'head')
    labels.forEach((label, g) => {
      const contribution = parts.contribution[g] ?? 0
      rows.row(
        [text(label)],
        {
          weight: number(parts.weight[g], PERCENT),
          'stand-alone': number(parts.standAlone[g], PERCENT),
          contribution: number(contribution, PERCENT),
          share: share(parts.share?.[g]),
        },
        reducesRisk(contribution, d.volatility) ? 'Risk-reducing group' : '',
      )
    })
    total(sumOf(parts.weight), sumOf(parts.standAlone), sumOf(parts.contribution))
  }

  const { nested, names } = breakdown
  if (nested.length === 0) return
  rows.blank()
  rows.row([text(nestingOf(nested).join(', then '), 'head')], GROUP_HEADS, '', 'head')
  const add = (group: NestedGroup, depth: number): void => {
    rows.row(
      [text(indented(group.label, depth))],
      {
        weight: number(group.weight, PERCENT),
        'stand-alone': number(group.standAlone, PERCENT),
        contribution: number(group.contribution, PERCENT),
        share: share(group.share),
      },
      reducesRisk(group.contribution, d.volatility) ? 'Risk-reducing group' : '',
      undefined,
      depth,
    )
    for (const child of group.children) add(child, depth + 1)
    for (const i of group.positions)
      rows.row(
        [text(indented(names[i] ?? '', depth + 1))],
        {
          weight: number(d.weights[i], PERCENT),
          'stand-alone': number(d.standAlone[i], PERCENT),
          contribution: number(d.contribution[i], PERCENT),
          share: share(d.share?.[i]),
        },
        '',
        undefined,
        depth + 1,
      )
  }
  for (const group of nested) add(group, 0)
  const all = (of: (group: NestedGroup) => number): number =>
    nested.reduce((sum, group) => sum + of(group), 0)
  total(
    all(({ weight }) => weight),
    all(({ standAlone }) => standAlone),
    all(({ contribution }) => contribution),
  )
}

/** The columns of a nesting, outermost first. */
function nestingOf(groups: readonly NestedGroup[]): readonly string[] {
  const first = groups[0]
  return first ? [first.header, ...nestingOf(first.children)] : []
}

const indented = (label: string, depth: number): string => `${'\u2003'.repeat(depth)}${label}`

/** What a limit's columns of figures hold, in their order: these rows have fewer than those of positions, and stand close together. */
const LIMIT_HEADS = [
  'Figure',
  'Soft limit',
  'Hard limit',
  'Status',
  'Headroom',
  'Used',
  'Within estimation error',
] as const

/** Whether the band of a figure holds one of its limits; blank where there is no band. */
const WITHIN_ERROR = { true: 'yes', false: 'no', null: '' } as const

function addLimits(rows: Rows, breakdown: Breakdown): void {
  const { limits, bands } = breakdown
  const add = (
    labels: readonly TableCell[],
    figures: readonly TableCell[],
    note: string,
    mark?: Mark,
  ): void =>
    rows.row(
      labels,
      Object.fromEntries(figures.map((cell, k) => [rows.columns[k]!, cell])) as { [C in Column]?: TableCell },
      note,
      mark,
    )
  // with no group column beside it the measure stands behind what it is a measure of
  const labels = (on: string, measure: string, mark?: Mark): readonly TableCell[] =>
    rows.labels > 1 ? [text(on, mark), text(measure, mark)] : [text(`${on}: ${measure}`, mark)]
  rows.blank()
  rows.add([text('Limits', 'section')])
  rows.add([text(`${limitsSummary(limits)}.`, 'note')])
  for (const sentence of readingOfLimits(breakdown)) rows.add([text(sentence, 'note')])
  add(
    labels('Limit on', 'Measure', 'head'),
    LIMIT_HEADS.map((head) => text(head, 'head')),
    'Note',
    'head',
  )
  // as long as the limit is used; full from the limit on
  rows.bars.push({
    column: rows.labels + LIMIT_HEADS.indexOf('Used'),
    row: rows.cells.length,
    rows: limits.length,
    full: 1,
  })
  for (const { limit, figure, headroom, used, status, why, withinError, errorWhy } of limits) {
    const format = limit.measure === 'share of risk' ? SHARE : PERCENT
    const { word, mark } = LIMIT_STATUS[status]
    const [on, ...measure] = labels(limitOn(limit), LIMIT_MEASURES[limit.measure].label)
    add(
      [{ ...on!, ...(limit.cell ? { link: limit.cell } : {}) }, ...measure],
      [
        number(figure, format),
        number(limit.soft, format),
        number(limit.hard, format),
        text(`${mark} ${word}`, status === 'breach' ? 'alert' : undefined),
        number(headroom, format),
        number(used, '0%'),
        text(WITHIN_ERROR[`${withinError}`]),
      ],
      why ?? (typeof bands === 'string' || limit.measure === 'weight' ? '' : (errorWhy ?? '')),
    )
  }
}

/** What has to be known to read the limits: what is counted how, and of what kind the figures are. */
function readingOfLimits({ limits, horizon, bands, tails }: Breakdown): readonly string[] {
  const has = (...measures: readonly LimitState['limit']['measure'][]): boolean =>
    limits.some(({ limit }) => measures.includes(limit.measure))
  return [
    'The status follows the figure alone. Headroom and use are counted to the hard limit, or to the soft one where there is no other.',
    typeof bands === 'string'
      ? ''
      : 'Within estimation error: the 95% band of the figure holds one of its limits, so that the status might be another.',
    has('weight') ? 'Weights are taken without their signs; that of a group is its net weight.' : '',
    has('volatility', 'tracking error', 'contribution to risk', 'stand-alone risk')
      ? `Volatility, tracking error, contributions and stand-alone risk are ${horizon === 'a year' ? 'by the year' : 'per period'}.`
      : '',
    has('value at risk', 'expected shortfall') && typeof tails !== 'string'
      ? `Value at risk and expected shortfall: ${tails.label}.`
      : '',
  ].filter((sentence) => sentence !== '')
}

function addTails(
  rows: Rows,
  breakdown: Breakdown,
  { risk, label, method, errorNote, partsWithheld, difference }: Tails,
): void {
  const { decomposition: d, names, sharesWithheld } = breakdown
  rows.blank()
  rows.add([text(`Large losses: ${label}`, 'section')])
  rows.figure('Value at risk', number(risk.valueAtRisk, PERCENT), `${method}.`)
  if (risk.standardError !== null)
    rows.figure('Standard error of value at risk', number(risk.standardError, PERCENT), capital(errorNote))
  if (risk.shortfall !== null) rows.figure('Expected shortfall', number(risk.shortfall, PERCENT))
  // one row whatever it says: a new weight must not move the rows below
  rows.add([text(partsWithheld ?? difference ?? '', 'note')])
  const { parts, shares } = risk
  if (parts === null) return
  rows.row(
    [text('Holding', 'head')],
    {
      weight: WEIGHT,
      'stand-alone': 'Contribution to expected shortfall',
      marginal: 'Share of expected shortfall',
      contribution: 'Share of risk (volatility)',
    },
    '',
    'head',
  )
  const part = (value: number | undefined, format: string): TableCell =>
    partsWithheld === null ? number(value, format) : text(WITHHELD)
  names.forEach((name, i) =>
    rows.row(
      [text(name)],
      {
        weight: number(d.weights[i], PERCENT),
        'stand-alone': part(parts[i], PERCENT),
        marginal: part(shares?.[i], SHARE),
        contribution: shareCell(d.share?.[i], sharesWithheld, d.share !== null),
      },
      '',
    ),
  )
  rows.row(
    [text('Total', 'total')],
    {
      weight: number(breakdown.net, PERCENT, 'total'),
      'stand-alone': number(sumOf(parts), PERCENT, 'total'),
      marginal: number(shares && sumOf(shares), SHARE, 'total'),
      contribution: shareCell(d.share && 1, sharesWithheld, d.share !== null, 'total'),
    },
    '',
    'total',
  )
}

function addActive(rows: Rows, active: Active, horizon: string): void {
  const { risk, names, weights, benchmark, sharesWithheld } = active
  rows.blank()
  rows.add([text(`Against the benchmark: ${active.label}`, 'section')])
  rows.figure(
    `Tracking error (ex ante) ${horizon}`,
    number(risk.trackingError, PERCENT),
    `Parts by ${risk.convention}`,
  )
  rows.figure('Volatility of the benchmark', number(risk.benchmarkVolatility, PERCENT))
  rows.figure('Beta to the benchmark', number(risk.beta, RATIO))
  rows.figure('Correlation with the benchmark', number(risk.correlation, RATIO))
  rows.add([text(sharesWithheld ?? '', 'note')])
  rows.row(
    [text('Holding', 'head')],
    {
      weight: WEIGHT,
      'stand-alone': 'Benchmark weight',
      marginal: 'Active weight',
      contribution: 'Contribution to tracking error',
      share: 'Share of tracking error',
    },
    '',
    'head',
  )
  const share = (value: number | null | undefined, mark?: Mark): TableCell =>
    shareCell(value, sharesWithheld, risk.share !== null, mark)
  names.forEach((name, i) =>
    rows.row(
      [text(name)],
      {
        weight: number(weights[i], PERCENT),
        'stand-alone': number(benchmark[i], PERCENT),
        marginal: number((weights[i] ?? 0) - (benchmark[i] ?? 0), PERCENT),
        contribution: number(risk.contribution[i], PERCENT),
        share: share(risk.share?.[i]),
      },
      '',
    ),
  )
  if (risk.convention === 'benchmark-relative returns')
    rows.row(
      [text('Net active weight')],
      {
        marginal: number(risk.netWeight, PERCENT),
        contribution: number(risk.netContribution, PERCENT),
        share: share(risk.netShare),
      },
      'Sum of active weights at the benchmark’s return',
    )
  rows.row(
    [text('Total', 'total')],
    {
      weight: number(sumOf(weights), PERCENT, 'total'),
      'stand-alone': number(sumOf(benchmark), PERCENT, 'total'),
      marginal: number(risk.netWeight, PERCENT, 'total'),
      contribution: number(sumOf(risk.contribution) + risk.netContribution, PERCENT, 'total'),
      share: share(risk.share && 1, 'total'),
    },
    '',
    'total',
  )
}

function addCurrency(rows: Rows, { names, decomposition: d }: Breakdown, currency: CurrencyRisk): void {
  const { base, labels, parts } = currency
  rows.blank()
  rows.add([text(`Currency: base ${base}`, 'section')])
  if (typeof parts === 'string') {
    rows.add([text(parts, 'note')])
    return
  }
  for (const sentence of CURRENCY_READING) rows.add([text(sentence, 'note')])
  const heads = { 'stand-alone': 'Local part', marginal: 'Currency part', contribution: CONTRIBUTION }
  const row = (
    cells: readonly string[],
    [weight, local, foreign, contribution]: readonly [number, number, number, number],
    mark?: Mark,
  ): void =>
    rows.row(
      cells.map((label) => text(label, mark)),
      {
        weight: number(weight, PERCENT, mark),
        'stand-alone': number(local, PERCENT, mark),
        marginal: number(foreign, PERCENT, mark),
        contribution: number(contribution, PERCENT, mark),
      },
      '',
      mark,
    )
  const sums = [sumOf(d.weights), sumOf(parts.local), sumOf(parts.currency), d.volatility] as const
  rows.row([text('Holding', 'head'), text('Currency', 'head')], { weight: WEIGHT, ...heads }, '', 'head')
  names.forEach((name, i) =>
    row([name, labels[i] ?? ''], [d.weights[i]!, parts.local[i]!, parts.currency[i]!, d.contribution[i]!]),
  )
  row(['Total'], sums, 'total')
  rows.blank()
  rows.row([text('Currency', 'head')], { weight: WEIGHT, ...heads }, '', 'head')
  for (const { label, exposure, local, currency: foreign, contribution } of parts.byCurrency)
    row([label], [exposure, local, foreign, contribution])
  row(['Total'], sums, 'total')
}

function addFactors(
  rows: Rows,
  { names, decomposition: d, sharesWithheld }: Breakdown,
  split: FactorSplit,
): void {
  rows.blank()
  rows.row(
    [text('Factors', 'head')],
    { contribution: CONTRIBUTION, share: SHARE_HEAD, marginal: 'Variance explained' },
    '',
    'head',
  )
  const row = (label: string, contribution: number | undefined, explained?: number, mark?: Mark): void =>
    rows.row(
      [text(label, mark)],
      {
        contribution: number(contribution, PERCENT, mark),
        share: shareCell((contribution ?? 0) / d.volatility, sharesWithheld, d.share !== null, mark),
        marginal: number(explained, SHARE, mark),
      },
      '',
      mark,
    )
  split.names.forEach((name, k) => row(name, split.systematic[k]))
  row('All factors', sumOf(split.systematic), undefined, 'total')
  names.forEach((name, i) => row(`${name}, specific`, split.specific[i], split.explained[i]))
  row('Total', sumOf(split.systematic) + sumOf(split.specific), undefined, 'total')
}

function addBook(rows: Rows, breakdown: Breakdown, bands: Bands | null): void {
  const { decomposition: d } = breakdown
  rows.blank()
  rows.add([text('The book', 'section')])
  rows.figure(
    `Volatility ${breakdown.horizon}`,
    number(d.volatility, PERCENT),
    bands
      ? `Standard error ${percentText(bands.volatility, 2)}, 95% band ${bandText(d.volatility, bands.volatility, 2)}`
      : '',
  )
  if (breakdown.expectedReturn)
    rows.figure(
      `Expected return ${breakdown.expectedReturn.horizon}`,
      number(breakdown.expectedReturn.value, PERCENT),
      breakdown.expectedReturn.label,
    )
  rows.figure(
    'Diversification benefit',
    number(d.diversificationBenefit, PERCENT),
    'Sum of stand-alone risks less total',
  )
  rows.figure(
    'Diversification ratio',
    number(d.diversificationRatio, RATIO),
    'Sum of stand-alone risks over total',
  )
  rows.figure(
    'Effective number of positions (by risk)',
    number(breakdown.effectiveWithheld === null ? d.effectiveNumber : null, '0.0'),
    breakdown.effectiveWithheld ?? 'One over the sum of squared shares of risk',
  )
  rows.figure('Net weight', number(breakdown.net, PERCENT))
  rows.figure('Gross weight', number(breakdown.gross, PERCENT))
}
