import type { Blocks } from '../book-model'
import type { Area } from '../cells'
import { currencySeries } from '../currency'
import { plainName } from '../names'
import type { ReturnsReading } from '../returns'
import type { Settings } from '../settings'
import { dateText } from '../wording'
import type { SeriesFact, SeriesFacts } from './series-facts'

/** A series that is held, the benchmark, or what a currency of the holdings returns. */
export interface Held {
  readonly series: number
  readonly name: string
  readonly fact: SeriesFact
}

/** What the checks look at: the series that are in the figures, over the dates of the look-back. Rows count from 0 in the whole block. */
export interface Evidence {
  readonly returns: ReturnsReading
  readonly settings: Settings
  readonly facts: SeriesFacts
  /** in the order of the block */
  readonly held: readonly Held[]
  /** dates of the look-back, those on which every held series has a return, and those that the figures rest on */
  readonly inView: number
  readonly common: number
  readonly counted: number
  /** the last row of the dates common to all, -1 where there is none */
  readonly lastCommon: number
  /** one period as a word, such as 'week' */
  readonly period: string
  /** robust scale of a return, the middle one of the series that move; NaN where none does */
  readonly usualScale: number
}

const PERIOD_WORDS: { readonly [frequency: string]: string } = {
  daily: 'day',
  weekly: 'week',
  monthly: 'month',
  quarterly: 'quarter',
  yearly: 'year',
}

/** One period of a frequency as a word; null for a frequency without a name. */
export const periodWord = (frequency: string | undefined): string | null =>
  PERIOD_WORDS[frequency ?? ''] ?? null

/** @param facts of the same returns and look-back */
export function evidenceOf(blocks: Blocks, settings: Settings, facts: SeriesFacts): Evidence {
  const { returns } = blocks
  const held = heldSeries(blocks, settings, facts)
  const inView = returns.rows - facts.from
  const common = commonRows(returns, facts.from, held)
  return {
    returns,
    settings,
    facts,
    held,
    inView,
    common: common.length,
    counted: settings.gaps === 'common dates' ? common.length : inView,
    lastCommon: common.at(-1) ?? -1,
    period: periodWord(facts.steps?.usual) ?? 'date',
    usualScale: upperMiddle(held.map(({ fact }) => fact.scale).filter((scale) => scale > 0)),
  }
}

function heldSeries(
  { match, holdings, returns }: Blocks,
  { benchmark }: Settings,
  facts: SeriesFacts,
): readonly Held[] {
  const names = new Map<number, string>()
  holdings.holdings.forEach(({ name }, k) => {
    const series = match.seriesOf[k] ?? -1
    if (series >= 0) names.set(series, name)
  })
  const ownName = (series: number): string => returns.names?.[series] ?? ''
  // a currency's series is in the figures as those of the holdings are
  for (const series of match.currencies ? currencySeries(match.currencies) : [])
    names.set(series, ownName(series))
  if (benchmark.kind === 'series') {
    const series = returns.names?.findIndex((name) => plainName(name) === plainName(benchmark.name)) ?? -1
    if (series >= 0 && !names.has(series)) names.set(series, ownName(series))
  }
  return [...names]
    .sort(([a], [b]) => a - b)
    .flatMap(([series, name]) => {
      const fact = facts.series[series]
      return fact ? [{ series, name, fact }] : []
    })
}

/** Rows of the look-back on which every held series has a return. */
function commonRows(
  { values, rows, columns }: ReturnsReading,
  from: number,
  held: readonly Held[],
): readonly number[] {
  // plain loops over plain numbers: this looks at every return there is
  const series = Int32Array.from(held, (one) => one.series)
  const common: number[] = []
  for (let t = from; t < rows; t++) {
    let k = 0
    while (k < series.length && !Number.isNaN(values[t * columns + series[k]!]!)) k++
    if (k === series.length) common.push(t)
  }
  return common
}

/** A series that moves less than this beside the others usually do, such as cash, carries no risk to speak of. Our own convention. */
const LEAST_MOVE = 0.02

export const isQuiet = ({ usualScale }: Evidence, { fact }: Held): boolean =>
  fact.scale < LEAST_MOVE * usualScale

/** "on 27 Nov 2026", or where the block has no dates "in return 12". */
export const whenOf = (evidence: Evidence, row: number): string =>
  `${evidence.returns.dates ? 'on' : 'in'} ${dayOf(evidence, row)}`

/** "27 Nov 2026", or where the block has no dates "return 12". */
export function dayOf({ returns: { dates } }: Evidence, row: number): string {
  return dates ? dateText(dates[row] ?? 0) : `return ${row + 1}`
}

/** Cells of one series, or of the dates for series -1; those that touch are one area. */
export const cellsOf = ({ returns }: Evidence, series: number, rows: readonly number[]): readonly Area[] =>
  joined(rows.map((row) => returns.cell(row, series)))

/** The heading of a series and its cells from the first return to the last. */
export const wholeSeries = (evidence: Evidence, { series, fact }: Held): readonly Area[] => [
  evidence.returns.seriesCell(series),
  ...cellsOf(evidence, series, range(fact.first, fact.last + 1)),
]

/** Cells in reading order that touch, in a column or a row, as one area. */
function joined(cells: readonly Area[]): readonly Area[] {
  const areas: Area[] = []
  for (const cell of cells) {
    const last = areas.at(-1)
    const isNext = last?.sheet === cell.sheet
    if (isNext && last.column === cell.column && last.columns === 1 && cell.row === last.row + last.rows)
      areas[areas.length - 1] = { ...last, rows: last.rows + 1 }
    else if (isNext && last.row === cell.row && last.rows === 1 && cell.column === last.column + last.columns)
      areas[areas.length - 1] = { ...last, columns: last.columns + 1 }
    else areas.push(cell)
  }
  return areas
}

export const range = (from: number, end: number): readonly number[] =>
  Array.from({ length: Math.max(0, end - from) }, (_, k) => from + k)

const sorted = (values: readonly number[]): readonly number[] => [...values].sort((a, b) => a - b)

/** The number in the middle, of two the lower; NaN where there is none. */
export const lowerMiddle = (values: readonly number[]): number =>
  sorted(values)[(values.length - 1) >> 1] ?? NaN

/** The number in the middle, of two the upper; NaN where there is none. */
export const upperMiddle = (values: readonly number[]): number => sorted(values)[values.length >> 1] ?? NaN
