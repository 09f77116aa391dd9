import type { Blocks, BookModel } from '../book-model'
import type { Breakdown } from '../breakdown'
import type { Area } from '../cells'
import { referenceOf } from '../cells'
import { groupsOf } from '../names'
import type { Settings } from '../settings'
import type { Mark, TableCell } from '../table'
import { formulaCell, numberCell as number, textCell as text } from '../table'
import type { DateKey, Key } from './columns'
import { GAP, PLAIN, WEIGHT } from './columns'
import type { Column } from './draft'
import { Draft } from './draft'
import type { Reach } from './estimation'
import { reachOf } from './estimation'

/** A book as it was computed, with the settings it was computed under. */
export interface ProofInput {
  readonly title: string
  readonly blocks: Blocks
  readonly book: BookModel
  readonly settings: Settings
  readonly breakdown: Breakdown
  /** the cell that the capital is followed in; absent or null where it was typed, or is the sum of the amounts */
  readonly capital?: Area | null
}

export const AGREES = '✓ agrees'
export const DIFFERS = '≠ differs'

/** How far a figure may lie from ours before it counts as another one, as a part of the sum of stand-alone risks. */
export const TOLERANCE = 1e-10

/** A quantile is held against its probability: some engines have the beta function behind it to eight digits only. */
export const QUANTILE_TOLERANCE = 1e-8

/** Cells that returns per date of groups may take; of the benchmark, and rows of holdings with it. */
const MOST_GROUP_CELLS = 3000
const MOST_BENCHMARK_CELLS = 5000

/** Up to so many holdings the intensity of a shrinkage is derived: its formula runs over all their pairs. */
const MOST_IN_PAIRS = 12

type Groups = ReturnType<typeof groupsOf>

/** A number as a formula has it. */
export const literal = (value: number): string => String(value).replace('e', 'E')

/**
 * The sheet of a proof while it is laid out: which columns there will be, where each figure stands, and the kinds of lines that the
 * sections are made of. A section may ask for a place before its row is laid, as long as it asks from within a formula.
 */
export class ProofSheet {
  /** what the sheet is laid out from */
  readonly input: ProofInput
  /** the rows laid so far */
  readonly draft: Draft
  /** what of the book formulas can take from its cells */
  readonly reach: Reach
  /** columns of labels: the name of a holding and its groups */
  readonly labels: number
  /** columns of the table of holdings, behind its labels */
  readonly keys: readonly Key[]
  /** number of holdings */
  readonly size: number
  /** variances as the model has them, per period: 0 where nothing moves */
  readonly variances: Float64Array
  /** the first row of the table of holdings */
  #first = 0
  /** single cells by what they hold, once they are placed */
  readonly #known = new Map<string, string>()
  /** columns of the table of dates, behind the date */
  readonly dateKeys: DateKey[] = []
  #dates: Column | null = null
  /** columns of the table of series: weights, and others that go with the order of the sheet */
  readonly seriesColumns: {
    readonly name: string
    readonly head: string
    readonly of: (i: number) => string
  }[] = []
  #seriesRows: Column | null = null
  /** groups with a return per date of their own, by column */
  readonly groupReturns: { readonly header: number; readonly group: number; readonly label: string }[] = []
  /** rows whose results count, from and to */
  #judged: readonly [number, number] = [0, 0]
  /** what is not recomputed, a sentence for each */
  readonly notProven: string[] = []

  constructor(input: ProofInput, at: Area) {
    const { blocks, book, settings, breakdown } = input
    this.input = input
    this.draft = new Draft(at)
    this.reach = reachOf(blocks, book, settings)
    this.labels = 1 + breakdown.groupHeaders.length
    this.size = breakdown.names.length
    this.variances = book.model.variances()
    this.keys = this.#columns()
    this.#plan()
  }

  // ---- what there will be

  #columns(): readonly Key[] {
    const { holdings } = this.input.blocks
    const { kind } = this.reach.estimation
    const shrinks = this.shrinkage !== null
    const fromAmounts = holdings.capital !== null
    return [
      ...(fromAmounts ? (['measure'] as const) : []),
      ...(fromAmounts && this.sumsOtherAmounts ? (['base'] as const) : []),
      'weight',
      ...(kind === 'dates' && this.#needsMeans ? (['mean'] as const) : []),
      'variance',
      'covariance',
      ...(shrinks ? (['shrunk variance', 'shrunk covariance'] as const) : []),
      'stand-alone',
      'marginal',
      'contribution',
      'share',
      'beta',
      'correlation',
      'our weight',
      'our stand-alone',
      'our marginal',
      'our contribution',
      'our share',
      'our beta',
      'our correlation',
      'risk gap',
      'ratio gap',
      'mark',
      'note',
    ]
  }

  /** The shrinkage of the estimator; null where it has none. */
  get shrinkage() {
    const { estimation } = this.reach
    return estimation.kind === 'dates' ? estimation.shrinkage : null
  }

  /** How many lagged terms the estimator has. */
  get lags(): number {
    const { estimation } = this.reach
    return estimation.kind === 'dates' ? estimation.lags : 0
  }

  /** Whether ranges of whole series go into functions of the workbook's own that take off the mean themselves. */
  get isPlain(): boolean {
    const { estimation, isWhole } = this.reach
    return (
      estimation.kind === 'dates' &&
      estimation.decay === null &&
      estimation.lags === 0 &&
      isWhole &&
      this.input.blocks.returns.content === 'returns'
    )
  }

  /** Whether the covariance with the portfolio is one such function too: it takes ranges that lie alike. */
  get isCovariance(): boolean {
    return this.isPlain && !this.reach.cells!.isAcross
  }

  get #needsMeans(): boolean {
    return !this.isPlain
  }

  /** Whether the capital is a sum of amounts while something else is divided by it. */
  get sumsOtherAmounts(): boolean {
    const { holdings, capital } = { ...this.input.blocks, capital: this.input.settings.capital }
    return capital === null && holdings.columns.some(({ role }) => role === 'exposure')
  }

  /** Whether the portfolio has a return on every date. */
  get isDated(): boolean {
    return this.reach.rows !== null
  }

  /** Decides which columns dates and series need before any row is laid. */
  #plan(): void {
    const { breakdown, settings } = this.input
    const { estimation, cells, rows } = this.reach
    const { tails, active, byGroup } = breakdown
    const estimated = estimation.kind === 'dates'
    if (this.isDated) {
      this.dateKeys.push('weight', 'return')
      if (this.lags > 0) this.dateKeys.push('centred')
      if (estimated && !this.isCovariance) this.dateKeys.push('multiplier')
      if (typeof tails !== 'string' && settings.tails.method.kind === 'historical') this.dateKeys.push('tail')
    }
    if (this.shrinkage?.target === 'correlation') {
      this.dateKeys.push('standardised')
      this.seriesColumns.push({
        name: 'standardised',
        head: 'One over the volatility',
        of: (i) => (this.moves(i) ? `1/SQRT(${this.cell('variance', i)})` : ''),
      })
    }
    if (this.derivesIntensity && this.shrinkage?.target === 'identity') {
      this.dateKeys.push('length')
      this.seriesColumns.push(
        { name: 'count', head: 'Holdings that move', of: (i) => (this.moves(i) ? '1' : '') },
        {
          name: 'mean',
          head: 'Mean return',
          of: (i) => (this.moves(i) ? `AVERAGE(${this.returnsOf(i)})` : ''),
        },
      )
    }
    if (active && this.provesActive) {
      this.seriesColumns.push({ name: 'active', head: 'Active weight', of: (i) => this.#activeWeight(i) })
      if (estimated) {
        this.dateKeys.push('active')
        if (this.lags > 0) this.dateKeys.push('active centred')
        if (!this.isCovariance) this.dateKeys.push('active multiplier')
      }
    }
    const groups = byGroup.flatMap(({ labels }, header) =>
      labels.map((label, group) => ({ header, group, label })),
    )
    const lies = (cells?.dates.length ?? 0) * groups.length
    const canSplit =
      estimation.kind === 'matrix' ||
      (estimated && lies <= MOST_GROUP_CELLS && (this.lags === 0 || this.reach.isWhole))
    if (groups.length > 0 && canSplit && (rows !== null || estimation.kind === 'matrix')) {
      this.groupReturns.push(...groups)
      for (const { header, group, label } of groups)
        this.seriesColumns.push({
          name: `group ${header} ${group}`,
          head: `Weight, ${label}`,
          of: (i) => (this.groupsOf(header).groupOf[i] === group ? this.cell('weight', i) : ''),
        })
    } else if (groups.length > 0)
      this.notProven.push(
        `Stand-alone risk of groups: ${
          estimated && lies > MOST_GROUP_CELLS
            ? 'a column of returns for each group would make this sheet too long'
            : 'it needs covariances that are not recomputed here'
        }.`,
      )
    // the weights themselves, unless the holdings stand in the order of the sheet already
    if (this.seriesColumns.length > 0 || !this.#isInOrder)
      this.seriesColumns.unshift({ name: 'weight', head: WEIGHT, of: (i) => this.cell('weight', i) })
  }

  /** Whether the intensity of the shrinkage is short enough to be derived. */
  get derivesIntensity(): boolean {
    const shrinkage = this.shrinkage
    return (
      shrinkage !== null &&
      shrinkage.target !== 'correlation' &&
      shrinkage.moving > 1 &&
      shrinkage.moving <= MOST_IN_PAIRS &&
      this.isPlain &&
      this.#areApart
    )
  }

  /** Whether no two holdings share a series, as those that are riskless in one foreign currency do. */
  get #areApart(): boolean {
    const held = [...this.input.blocks.match.seriesOf].filter((series) => series >= 0)
    return new Set(held).size === held.length
  }

  /** All returns of one holding. */
  returnsOf(i: number): string {
    return this.reach.cells!.over(this.input.blocks.match.seriesOf[i] ?? 0)
  }

  /** Whether holdings stand next to each other in the order of their series. */
  get #isInOrder(): boolean {
    const { seriesOf } = this.input.blocks.match
    const { cells } = this.reach
    return (
      cells !== null &&
      cells.series.length === seriesOf.length &&
      cells.series.every((series, k) => series === seriesOf[k])
    )
  }

  /** Whether figures against the benchmark are recomputed. */
  get provesActive(): boolean {
    const { breakdown, settings, blocks } = this.input
    const { estimation, cells } = this.reach
    if (!breakdown.active || settings.benchmark.kind !== 'column' || estimation.kind === 'taken over')
      return false
    return (
      blocks.holdings.columns.some(({ role }) => role === 'benchmark weight') &&
      (estimation.kind === 'matrix' || 2 * (cells?.dates.length ?? 0) + 6 * this.size <= MOST_BENCHMARK_CELLS)
    )
  }

  /** The groups under one heading of the holdings. */
  groupsOf(header: number): Groups {
    return (this.#grouped[header] ??= groupsOf(
      this.input.blocks.holdings.holdings.map(({ groups }) => groups[header]),
    ))
  }

  readonly #grouped: Groups[] = []

  /** Whether a holding has a series that is not the same on all dates. */
  moves(i: number): boolean {
    return (this.input.blocks.match.seriesOf[i] ?? -1) >= 0 && this.variances[i] !== 0
  }

  /** C w of the model, per period, where it stands for formulas. */
  get covariances(): Float64Array {
    this.#applied ??= this.input.book.model.apply(this.input.breakdown.decomposition.weights).marginals
    return this.#applied
  }

  #applied: Float64Array | null = null

  /** A holding's weight less its weight in the benchmark, from the user's own cells where it has them. */
  #activeWeight(i: number): string {
    const holding = this.input.blocks.holdings.holdings[i]
    const cell = holding?.cells?.benchmark
    const benchmark = cell ? referenceOf(cell) : literal(holding?.benchmark ?? 0)
    return `${this.cell('weight', i)}-${benchmark}`
  }

  // ---- places

  /** Keeps the next rows for the table of holdings. */
  placeHoldings(): void {
    this.#first = this.draft.next
    for (let i = 0; i < this.size; i++) this.draft.add()
  }

  /** Says that the table of series begins with the next row. */
  placeSeries(rows: number): void {
    this.#seriesRows = { column: this.labels, row: this.draft.next, rows }
  }

  /** Says that the table of dates begins with the next row. */
  placeDates(rows: number): void {
    this.#dates = { column: this.labels, row: this.draft.next, rows }
  }

  /** Has the results of all rows from this one to the last one laid count at the head. */
  judge(from: number): void {
    this.#judged = [from, this.draft.next - 1]
  }

  /** The rows whose results count, as formulas have them. */
  judged(): string {
    return this.draft.rectangle(...this.#judged, this.labels + this.keys.length)
  }

  /** The row of a holding in their table. */
  rowOf(i: number): number {
    return this.#first + i
  }

  /** The place of a column of the table of holdings. */
  column(key: Key): number {
    return this.labels + this.keys.indexOf(key)
  }

  /** A cell of the table of holdings. */
  cell(key: Key, i: number): string {
    return this.draft.cell(this.#first + i, this.column(key))
  }

  /** A column of the table of holdings. */
  all(key: Key): string {
    return this.draft.range({ column: this.column(key), row: this.#first, rows: this.size })
  }

  /** A cell that holds one figure by name. */
  at(name: string): string {
    const cell = this.#known.get(name)
    if (cell === undefined) throw new Error(`no cell of the proof holds ${name}`)
    return cell
  }

  /** A column of the table of dates. */
  dateColumn(key: DateKey): Column {
    return { ...this.#dates!, column: this.labels + this.dateKeys.indexOf(key) }
  }

  /** The returns per date of a group, by its place among those that have some. */
  groupColumn(k: number): Column {
    return { ...this.#dates!, column: this.labels + this.dateKeys.length + k }
  }

  /** A column of the table of dates, as formulas have it. */
  allDates(key: DateKey): string {
    return this.draft.range(this.dateColumn(key))
  }

  /** A column of the table of series; that of the holdings’ weights where there is none. */
  seriesColumn(name: string): Column {
    const k = this.seriesColumns.findIndex((column) => column.name === name)
    if (k < 0) return { column: this.column('weight'), row: this.#first, rows: this.size }
    return { ...this.#seriesRows!, column: this.labels + k }
  }

  // ---- lines of one figure

  /** The head of a section, with the heads of its lines unless it has a table of its own. */
  section(title: string, heads = true): void {
    this.draft.add()
    const c = this.labels
    this.draft.add({ 0: text(title, 'section') }, 'section')
    if (heads)
      this.draft.add(
        {
          0: text('Figure', 'head'),
          [c]: text('Recomputed', 'head'),
          [c + 1]: text('Counterpoise', 'head'),
          [c + 2]: text('Difference', 'head'),
          [c + 3]: { ...text('Result', 'head'), indent: 1 },
          [c + 4]: { ...text('How', 'head'), indent: 1 },
        },
        'head',
      )
  }

  /** A figure that stands for itself: a setting, or a step on the way. */
  step(name: string, label: string, value: number | (() => string), format: string, how = ''): void {
    const row = this.draft.next
    const c = this.labels
    this.#known.set(name, this.draft.cell(row, c))
    this.draft.add({
      0: text(label),
      [c]: typeof value === 'number' ? number(value, format) : () => formulaCell(`=${value()}`, format),
      [c + 1]: { ...text(how), indent: 1 },
    })
  }

  /** A figure that is held against ours. */
  line(
    name: string,
    label: string,
    formula: () => string,
    ours: number,
    format: string,
    how: string,
    scale: 'risk' | 'ratio' | 'quantile' | 'count' = 'risk',
  ): void {
    const row = this.draft.next
    const c = this.labels
    this.#known.set(name, this.draft.cell(row, c))
    const near = (k: number): string => this.draft.cell(row, c + k)
    this.draft.add({
      0: text(label),
      [c]: () => formulaCell(`=${formula()}`, format),
      [c + 1]: number(ours, format),
      [c + 2]: formulaCell(`=${near(0)}-${near(1)}`, GAP),
      [c + 3]: () => this.mark([[`ABS(${near(2)})`, this.allowed(scale)]]),
      [c + 4]: { ...text(how), indent: 1 },
    })
  }

  /** What a difference may be, by what it is a difference of. */
  allowed(scale: 'risk' | 'ratio' | 'quantile' | 'count'): string {
    const tolerance = this.at('tolerance')
    switch (scale) {
      case 'risk':
        return `${tolerance}*${this.at('gross risk')}`
      case 'ratio':
        return `${tolerance}*MAX(1,${this.at('ratio scale')})`
      case 'quantile':
        return literal(QUANTILE_TOLERANCE)
      case 'count':
        return '0'
    }
  }

  /** Whether differences lie within what is allowed; where one of them or what is allowed is no number they do not. */
  mark(gaps: readonly (readonly [gap: string, allowed: string])[]): TableCell {
    const numbers = gaps.flat().join('+')
    const held = gaps.map(([gap, allowed]) => `${gap}<=${allowed}`)
    const all = held.length === 1 ? held[0]! : `AND(${held.join(',')})`
    return {
      ...formulaCell(`=IF(ISNUMBER(${numbers}),IF(${all},"${AGREES}","${DIFFERS}"),"${DIFFERS}")`, PLAIN),
      indent: 1,
    }
  }

  /** A sentence over the whole width. */
  note(sentence: string, mark: Mark = 'note'): void {
    this.draft.add({ 0: text(sentence, mark) })
  }
}
