import type { Blocks, BookModel } from '../book-model'
import type { Breakdown } from '../breakdown'
import type { Area } from '../cells'
import { addressOf, referenceOf } from '../cells'
import type { HoldingCells } from '../holdings'
import { groupsOf } from '../names'
import type { Settings } from '../settings'
import type { Mark, Table, TableCell } from '../table'
import { formulaCell, numberCell as number, textCell as text } from '../table'
import type { Tails } from '../tail-section'
import { CAUTION, countOf, dateText, POSITION_HEADS } from '../wording'
import type { Column, Late } from './draft'
import { Draft } from './draft'
import type { Estimation, Reach } from './estimation'
import { reachOf } from './estimation'

export interface ProofInput {
  readonly title: string
  readonly blocks: Blocks
  readonly book: BookModel
  readonly settings: Settings
  readonly breakdown: Breakdown
  /** the cell that the capital is followed in; absent or null where it was typed, or is the sum of the amounts */
  readonly capital?: Area | null
}

const PERCENT = '0.0000%'
const SHARE = '0.0000%'
const RATIO = '0.0000'
const SMALL = '0.0000E+00'
const GAP = '0.0E+00'
const COUNT = '#,##0'
const PLAIN = 'General'
const DATE = 'd mmm yyyy'

const AGREES = '✓ agrees'
const DIFFERS = '≠ differs'

/** How far a figure may lie from ours before it counts as another one, as a part of the sum of stand-alone risks. */
const TOLERANCE = 1e-10

/** A quantile is held against its probability: some engines have the beta function behind it to eight digits only. */
const QUANTILE_TOLERANCE = 1e-8

/** Cells that returns per date of groups may take; of the benchmark, and rows of holdings with it. */
const MOST_GROUP_CELLS = 3000
const MOST_BENCHMARK_CELLS = 5000

/** Up to so many holdings the intensity of a shrinkage is derived: its formula runs over all their pairs. */
const MOST_IN_PAIRS = 12

/** The columns of the table of holdings, behind its labels. */
type Key =
  | 'measure'
  | 'base'
  | 'weight'
  | 'mean'
  | 'variance'
  | 'covariance'
  | 'shrunk variance'
  | 'shrunk covariance'
  | 'stand-alone'
  | 'marginal'
  | 'contribution'
  | 'share'
  | 'beta'
  | 'correlation'
  | 'our weight'
  | 'our stand-alone'
  | 'our marginal'
  | 'our contribution'
  | 'our share'
  | 'our beta'
  | 'our correlation'
  | 'risk gap'
  | 'ratio gap'
  | 'mark'
  | 'note'

/** The columns of the table of dates, behind the date. */
type DateKey =
  | 'weight'
  | 'return'
  | 'centred'
  | 'multiplier'
  | 'tail'
  | 'standardised'
  | 'length'
  | 'active'
  | 'active centred'
  | 'active multiplier'

const [WEIGHT, STAND_ALONE, MARGINAL, CONTRIBUTION, SHARE_HEAD, BETA, CORRELATION] = POSITION_HEADS

const HEADS: { readonly [K in Key]: readonly [head: string, width: number] } = {
  measure: ['Amount', 16],
  base: ['Amount', 16],
  weight: [WEIGHT, 16],
  mean: ['Mean return', 16],
  variance: ['Variance', 16],
  covariance: ['Covariance with portfolio', 16],
  'shrunk variance': ['Variance after shrinkage', 16],
  'shrunk covariance': ['Covariance after shrinkage', 16],
  'stand-alone': [STAND_ALONE, 16],
  marginal: [MARGINAL, 20],
  contribution: [CONTRIBUTION, 16],
  share: [SHARE_HEAD, 16],
  beta: [BETA, 16],
  correlation: [CORRELATION, 16],
  'our weight': [`${WEIGHT}, Counterpoise`, 16],
  'our stand-alone': [`${STAND_ALONE}, Counterpoise`, 20],
  'our marginal': [`${MARGINAL}, Counterpoise`, 24],
  'our contribution': [`${CONTRIBUTION}, Counterpoise`, 20],
  'our share': [`${SHARE_HEAD}, Counterpoise`, 16],
  'our beta': [`${BETA}, Counterpoise`, 18],
  'our correlation': [`${CORRELATION}, Counterpoise`, 22],
  'risk gap': ['Difference, risks', 16],
  'ratio gap': ['Difference, ratios', 16],
  mark: ['Result', 12],
  note: ['Note', 36],
}

type Groups = ReturnType<typeof groupsOf>

/** A number as a formula has it. */
const literal = (value: number): string => String(value).replace('e', 'E')

/**
 * Lays out formulas that recompute a book's figures from the user's own cells, each beside the figure as it was computed, with the difference
 * and whether it lies within a stated tolerance. What formulas cannot recompute stands as a labelled constant, and the sheet says so at
 * its head.
 *
 * @param at  where its top-left cell will lie, since formulas refer to their own sheet by address
 * @cost      O(dates + holdings) formulas; some 13,000 for 500 holdings and 1260 dates
 */
export function proofTable(input: ProofInput, at: Area): Table {
  return new Proof(input, at).table()
}

class Proof {
  readonly #input: ProofInput
  readonly #draft: Draft
  readonly #reach: Reach
  readonly #labels: number
  readonly #keys: readonly Key[]
  readonly #size: number
  /** variances as the model has them, per period: 0 where nothing moves */
  readonly #variances: Float64Array
  /** the first row of the table of holdings */
  #first = 0
  /** single cells by what they hold, once they are placed */
  readonly #known = new Map<string, string>()
  readonly #dateKeys: DateKey[] = []
  #dates: Column | null = null
  /** columns of the table of series: weights, and others that go with the order of the sheet */
  readonly #seriesColumns: {
    readonly name: string
    readonly head: string
    readonly of: (i: number) => string
  }[] = []
  #seriesRows: Column | null = null
  /** groups with a return per date of their own, by column */
  readonly #groupReturns: { readonly header: number; readonly group: number; readonly label: string }[] = []
  /** rows whose results count, from and to */
  #judged: readonly [number, number] = [0, 0]
  readonly #notProven: string[] = []

  constructor(input: ProofInput, at: Area) {
    const { blocks, book, settings, breakdown } = input
    this.#input = input
    this.#draft = new Draft(at)
    this.#reach = reachOf(blocks, book, settings)
    this.#labels = 1 + breakdown.groupHeaders.length
    this.#size = breakdown.names.length
    this.#variances = book.model.variances()
    this.#keys = this.#columns()
    this.#plan()
  }

  // ---- what there will be

  #columns(): readonly Key[] {
    const { holdings } = this.#input.blocks
    const { kind } = this.#reach.estimation
    const shrinks = this.#shrinkage !== null
    const fromAmounts = holdings.capital !== null
    return [
      ...(fromAmounts ? (['measure'] as const) : []),
      ...(fromAmounts && this.#sumsOtherAmounts ? (['base'] as const) : []),
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

  get #estimation(): Estimation {
    return this.#reach.estimation
  }

  get #shrinkage() {
    const { estimation } = this.#reach
    return estimation.kind === 'dates' ? estimation.shrinkage : null
  }

  get #lags(): number {
    const { estimation } = this.#reach
    return estimation.kind === 'dates' ? estimation.lags : 0
  }

  /** Whether ranges of whole series go into functions of the workbook's own that take off the mean themselves. */
  get #isPlain(): boolean {
    const { estimation, isWhole } = this.#reach
    return (
      estimation.kind === 'dates' &&
      estimation.decay === null &&
      estimation.lags === 0 &&
      isWhole &&
      this.#input.blocks.returns.content === 'returns'
    )
  }

  /** Whether the covariance with the portfolio is one such function too: it takes ranges that lie alike. */
  get #isCovariance(): boolean {
    return this.#isPlain && !this.#reach.cells!.isAcross
  }

  get #needsMeans(): boolean {
    return !this.#isPlain
  }

  /** Whether the capital is a sum of amounts while something else is divided by it. */
  get #sumsOtherAmounts(): boolean {
    const { holdings, capital } = { ...this.#input.blocks, capital: this.#input.settings.capital }
    return capital === null && holdings.columns.some(({ role }) => role === 'exposure')
  }

  get #isDated(): boolean {
    return this.#reach.rows !== null
  }

  /** Decides which columns dates and series need before any row is laid. */
  #plan(): void {
    const { breakdown, settings } = this.#input
    const { estimation, cells, rows } = this.#reach
    const { tails, active, byGroup } = breakdown
    const estimated = estimation.kind === 'dates'
    if (this.#isDated) {
      this.#dateKeys.push('weight', 'return')
      if (this.#lags > 0) this.#dateKeys.push('centred')
      if (estimated && !this.#isCovariance) this.#dateKeys.push('multiplier')
      if (typeof tails !== 'string' && settings.tails.method.kind === 'historical')
        this.#dateKeys.push('tail')
    }
    if (this.#shrinkage?.target === 'correlation') {
      this.#dateKeys.push('standardised')
      this.#seriesColumns.push({
        name: 'standardised',
        head: 'One over the volatility',
        of: (i) => (this.#moves(i) ? `1/SQRT(${this.#cell('variance', i)})` : ''),
      })
    }
    if (this.#derivesIntensity && this.#shrinkage?.target === 'identity') {
      this.#dateKeys.push('length')
      this.#seriesColumns.push(
        { name: 'count', head: 'Holdings that move', of: (i) => (this.#moves(i) ? '1' : '') },
        {
          name: 'mean',
          head: 'Mean return',
          of: (i) => (this.#moves(i) ? `AVERAGE(${this.#returnsOf(i)})` : ''),
        },
      )
    }
    if (active && this.#provesActive) {
      this.#seriesColumns.push({ name: 'active', head: 'Active weight', of: (i) => this.#activeWeight(i) })
      if (estimated) {
        this.#dateKeys.push('active')
        if (this.#lags > 0) this.#dateKeys.push('active centred')
        if (!this.#isCovariance) this.#dateKeys.push('active multiplier')
      }
    }
    const groups = byGroup.flatMap(({ labels }, header) =>
      labels.map((label, group) => ({ header, group, label })),
    )
    const lies = (cells?.dates.length ?? 0) * groups.length
    const canSplit =
      estimation.kind === 'matrix' ||
      (estimated && lies <= MOST_GROUP_CELLS && (this.#lags === 0 || this.#reach.isWhole))
    if (groups.length > 0 && canSplit && (rows !== null || estimation.kind === 'matrix')) {
      this.#groupReturns.push(...groups)
      for (const { header, group, label } of groups)
        this.#seriesColumns.push({
          name: `group ${header} ${group}`,
          head: `Weight, ${label}`,
          of: (i) => (this.#groupsOf(header).groupOf[i] === group ? this.#cell('weight', i) : ''),
        })
    } else if (groups.length > 0)
      this.#notProven.push(
        `Stand-alone risk of groups: ${
          estimated && lies > MOST_GROUP_CELLS
            ? 'a column of returns for each group would make this sheet too long'
            : 'it needs covariances that are not recomputed here'
        }.`,
      )
    // the weights themselves, unless the holdings stand in the order of the sheet already
    if (this.#seriesColumns.length > 0 || !this.#isInOrder)
      this.#seriesColumns.unshift({ name: 'weight', head: WEIGHT, of: (i) => this.#cell('weight', i) })
  }

  /** Whether the intensity of the shrinkage is short enough to be derived. */
  get #derivesIntensity(): boolean {
    const shrinkage = this.#shrinkage
    return (
      shrinkage !== null &&
      shrinkage.target !== 'correlation' &&
      shrinkage.moving > 1 &&
      shrinkage.moving <= MOST_IN_PAIRS &&
      this.#isPlain &&
      this.#areApart
    )
  }

  /** Whether no two holdings share a series, as those that are riskless in one foreign currency do. */
  get #areApart(): boolean {
    const held = [...this.#input.blocks.match.seriesOf].filter((series) => series >= 0)
    return new Set(held).size === held.length
  }

  /** All returns of one holding. */
  #returnsOf(i: number): string {
    return this.#reach.cells!.over(this.#input.blocks.match.seriesOf[i] ?? 0)
  }

  /** Whether holdings stand next to each other in the order of their series. */
  get #isInOrder(): boolean {
    const { seriesOf } = this.#input.blocks.match
    const { cells } = this.#reach
    return (
      cells !== null &&
      cells.series.length === seriesOf.length &&
      cells.series.every((series, k) => series === seriesOf[k])
    )
  }

  get #provesActive(): boolean {
    const { breakdown, settings, blocks } = this.#input
    const { estimation, cells } = this.#reach
    if (!breakdown.active || settings.benchmark.kind !== 'column' || estimation.kind === 'taken over')
      return false
    return (
      blocks.holdings.columns.some(({ role }) => role === 'benchmark weight') &&
      (estimation.kind === 'matrix' ||
        2 * (cells?.dates.length ?? 0) + 6 * this.#size <= MOST_BENCHMARK_CELLS)
    )
  }

  #groupsOf(header: number): Groups {
    return (this.#grouped[header] ??= groupsOf(
      this.#input.blocks.holdings.holdings.map(({ groups }) => groups[header]),
    ))
  }
  readonly #grouped: Groups[] = []

  #moves(i: number): boolean {
    return (this.#input.blocks.match.seriesOf[i] ?? -1) >= 0 && this.#variances[i] !== 0
  }

  // ---- places

  #column(key: Key): number {
    return this.#labels + this.#keys.indexOf(key)
  }

  /** A cell of the table of holdings. */
  #cell(key: Key, i: number): string {
    return this.#draft.cell(this.#first + i, this.#column(key))
  }

  /** A column of the table of holdings. */
  #all(key: Key): string {
    return this.#draft.range({ column: this.#column(key), row: this.#first, rows: this.#size })
  }

  /** A cell that holds one figure by name. */
  #at(name: string): string {
    const cell = this.#known.get(name)
    if (cell === undefined) throw new Error(`no cell of the proof holds ${name}`)
    return cell
  }

  #dateColumn(key: DateKey): Column {
    return { ...this.#dates!, column: this.#labels + this.#dateKeys.indexOf(key) }
  }

  #groupColumn(k: number): Column {
    return { ...this.#dates!, column: this.#labels + this.#dateKeys.length + k }
  }

  #allDates(key: DateKey): string {
    return this.#draft.range(this.#dateColumn(key))
  }

  #seriesColumn(name: string): Column {
    const k = this.#seriesColumns.findIndex((column) => column.name === name)
    if (k < 0) return { column: this.#column('weight'), row: this.#first, rows: this.#size }
    return { ...this.#seriesRows!, column: this.#labels + k }
  }

  // ---- the whole

  table(): Table {
    this.#head()
    this.#settings()
    const from = this.#draft.next
    this.#book()
    this.#holdings()
    if (this.#derivesIntensity) this.#intensity()
    this.#groups()
    this.#tails()
    this.#active()
    this.#judged = [from, this.#draft.next - 1]
    this.#remarks()
    this.#series()
    this.#datesTable()
    const { breakdown, title } = this.#input
    const width = Math.max(
      this.#labels + this.#keys.length,
      this.#labels + this.#dateKeys.length + this.#groupReturns.length,
      this.#labels + this.#seriesColumns.length + this.#groupReturns.length,
    )
    const widths = Array.from({ length: width }, (_, c) =>
      c === 0 ? 36 : c < this.#labels ? 16 : (HEADS[this.#keys[c - this.#labels]!] ?? ['', 12])[1],
    )
    const { dates } = breakdown
    return {
      cells: this.#draft.finish(width),
      widths,
      numeric: widths.map((_, c) => {
        const key = this.#keys[c - this.#labels]
        return c >= this.#labels && key !== 'mark' && key !== 'note'
      }),
      page: {
        paper: 'A4',
        orientation: 'landscape',
        onePage: false,
        header: {
          left: `Recomputed by formulas: ${title}`,
          right: dates?.last === null || dates?.last === undefined ? '' : `Data to ${dateText(dates.last)}`,
        },
        footer: CAUTION,
      },
    }
  }

  // ---- lines of one figure

  #section(title: string, heads = true): void {
    this.#draft.add()
    const c = this.#labels
    this.#draft.add({ 0: text(title, 'section') }, 'section')
    if (heads)
      this.#draft.add(
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
  #step(name: string, label: string, value: number | (() => string), format: string, how = ''): void {
    const row = this.#draft.next
    const c = this.#labels
    this.#known.set(name, this.#draft.cell(row, c))
    this.#draft.add({
      0: text(label),
      [c]: typeof value === 'number' ? number(value, format) : () => formulaCell(`=${value()}`, format),
      [c + 1]: { ...text(how), indent: 1 },
    })
  }

  /** A figure that is held against ours. */
  #line(
    name: string,
    label: string,
    formula: () => string,
    ours: number,
    format: string,
    how: string,
    scale: 'risk' | 'ratio' | 'quantile' | 'count' = 'risk',
  ): void {
    const row = this.#draft.next
    const c = this.#labels
    this.#known.set(name, this.#draft.cell(row, c))
    const near = (k: number): string => this.#draft.cell(row, c + k)
    this.#draft.add({
      0: text(label),
      [c]: () => formulaCell(`=${formula()}`, format),
      [c + 1]: number(ours, format),
      [c + 2]: formulaCell(`=${near(0)}-${near(1)}`, GAP),
      [c + 3]: () => this.#mark([[`ABS(${near(2)})`, this.#allowed(scale)]]),
      [c + 4]: { ...text(how), indent: 1 },
    })
  }

  #allowed(scale: 'risk' | 'ratio' | 'quantile' | 'count'): string {
    const tolerance = this.#at('tolerance')
    switch (scale) {
      case 'risk':
        return `${tolerance}*${this.#at('gross risk')}`
      case 'ratio':
        return `${tolerance}*MAX(1,${this.#at('ratio scale')})`
      case 'quantile':
        return literal(QUANTILE_TOLERANCE)
      case 'count':
        return '0'
    }
  }

  /** Whether differences lie within what is allowed; where one of them or what is allowed is no number they do not. */
  #mark(gaps: readonly (readonly [gap: string, allowed: string])[]): TableCell {
    const numbers = gaps.flat().join('+')
    const held = gaps.map(([gap, allowed]) => `${gap}<=${allowed}`)
    const all = held.length === 1 ? held[0]! : `AND(${held.join(',')})`
    return {
      ...formulaCell(`=IF(ISNUMBER(${numbers}),IF(${all},"${AGREES}","${DIFFERS}"),"${DIFFERS}")`, PLAIN),
      indent: 1,
    }
  }

  #note(sentence: string, mark: Mark = 'note'): void {
    this.#draft.add({ 0: text(sentence, mark) })
  }

  // ---- head

  #head(): void {
    const { title, breakdown } = this.#input
    const { estimation } = this.#reach
    const { dates } = breakdown
    this.#draft.add({ 0: text(`Recomputed by formulas: ${title}`, 'title') })
    const span =
      dates === null
        ? 'a covariance matrix as given'
        : `${countOf(dates.used, 'date')}${dates.first === null || dates.last === null ? '' : `, ${dateText(dates.first)} to ${dateText(dates.last)}`}`
    this.#note(
      `Formulas of the workbook’s own compute the book’s risk from the cells of its holdings and returns (${span}). No function of an add-in is used.`,
    )
    const c = this.#labels
    const range = (): string =>
      this.#draft.rectangle(this.#judged[0], this.#judged[1], this.#labels + this.#keys.length)
    const row = this.#draft.next
    const near = (k: number): string => this.#draft.cell(row, k)
    this.#draft.add(
      {
        0: () =>
          formulaCell(
            `=IF(${near(c + 2)}=0,"All lines agree within the tolerance","Some lines differ by more than the tolerance")`,
            PLAIN,
            'total',
          ),
        [c]: () => formulaCell(`=COUNTIF(${range()},"${AGREES}")`, COUNT, 'total'),
        [c + 1]: { ...text('lines agree', 'total'), indent: 1 },
        [c + 2]: () => formulaCell(`=COUNTIF(${range()},"${DIFFERS}")`, COUNT, 'total'),
        [c + 3]: { ...text('lines differ', 'total'), indent: 1 },
      },
      'total',
    )
    if (estimation.kind === 'taken over')
      this.#note(
        `NOT recomputed: the covariances. They stand as constants taken over from Counterpoise, because ${estimation.why}. What follows from them is recomputed.`,
        'alert',
      )
    else this.#draft.add()
    this.#note(
      '“Recomputed” holds formulas; “Counterpoise” holds the figures as they were computed, as constants. A cell of the book that changes moves the formulas and not the constants: the lines then differ until this sheet is written again.',
    )
    this.#note(
      'Volatility s is the root of the sum of weights times covariances with the portfolio. Marginal contribution: covariance over s. Contribution: weight times marginal; contributions add up to s. Share: contribution over s.',
    )
    this.#note(CAUTION)
  }

  // ---- settings

  #settings(): void {
    const { blocks, settings, breakdown, book, capital: cell } = this.#input
    const { holdings, returns } = blocks
    const { decomposition: d } = breakdown
    const { estimation } = this.#reach
    this.#section('Settings', false)
    this.#step(
      'tolerance',
      'Tolerance',
      TOLERANCE,
      '0E+00',
      'A risk agrees within this part of the sum of stand-alone risks; a weight, share, beta or correlation within this, times the diversification ratio where that is above 1.',
    )
    this.#step(
      'periods',
      'Periods per year',
      d.periodsPerYear,
      PLAIN,
      breakdown.horizon === 'a year'
        ? 'Risks are scaled to a year by its square root.'
        : 'Not known: risks are per period.',
    )
    this.#step(
      'rounding',
      'Rounding',
      Math.max(book.model.rounding, 1e-24),
      GAP,
      'A variance up to this part of the squared sum of stand-alone risks counts as 0.',
    )
    if (holdings.capital !== null) {
      const sum = this.#sumsOtherAmounts ? 'base' : 'measure'
      this.#step(
        'capital',
        'Capital',
        settings.capital === null
          ? () => `SUM(${this.#all(sum)})`
          : cell
            ? () => referenceOf(cell)
            : settings.capital,
        '#,##0.00',
        settings.capital === null ? 'The sum of the amounts' : cell ? 'From its own cell' : 'As it was given',
      )
    }
    if (this.#isDated) {
      this.#step(
        'dates',
        'Dates used',
        () => `COUNT(${this.#allDates('return')})`,
        COUNT,
        `Rows of ${addressOf(returns.area)} that have a return of every holding, within the look-back`,
      )
    }
    if (estimation.kind === 'dates') {
      const { decay, divisor, shrinkage, lags } = estimation
      if (decay !== null)
        this.#step(
          'decay',
          'Decay factor',
          decay,
          PLAIN,
          'The weight of a date is this times the weight of the next newer one.',
        )
      this.#step(
        'sum of weights',
        'Sum of the weights of the dates',
        () => `SUM(${this.#allDates('weight')})`,
        PLAIN,
        decay === null ? 'Every date counts alike.' : '',
      )
      this.#step(
        'divisor',
        'Divisor of variances and covariances',
        () => `${this.#at('sum of weights')}${divisor === 'less one' ? '-1' : ''}`,
        PLAIN,
        divisor === 'less one' ? 'Dates less one' : 'The sum of the weights of the dates',
      )
      if (!this.#isCovariance)
        this.#step(
          'mean',
          'Mean return of the portfolio, per period',
          () =>
            `SUMPRODUCT(${this.#allDates('return')},${this.#allDates('weight')})/${this.#at('sum of weights')}`,
          '0.000000%',
        )
      for (let lag = 1; lag <= lags; lag++)
        this.#step(
          `lag ${lag}`,
          `Weight of lag ${lag}`,
          () => `1-${lag}/${lags + 1}`,
          PLAIN,
          lag === 1 ? 'Newey & West (1987): 1 less the lag over the number of lags and 1' : '',
        )
      if (lags > 0)
        this.#step(
          'sum of multipliers',
          'Sum of the multipliers',
          () => `SUM(${this.#allDates('multiplier')})`,
          SMALL,
        )
      if (shrinkage) {
        this.#step(
          'intensity',
          'Shrinkage intensity',
          shrinkage.intensity,
          PLAIN,
          `Taken over from Counterpoise${this.#derivesIntensity ? ' and derived further down' : ': its formula runs over all pairs of holdings'}`,
        )
        if (shrinkage.target === 'correlation') {
          this.#step('moving', 'Holdings that move', shrinkage.moving, COUNT)
          this.#step(
            'mean correlation',
            'Mean correlation',
            () =>
              shrinkage.moving < 2
                ? '0'
                : `(VAR.P(${this.#allDates('standardised')})-${this.#at('moving')})/(${this.#at('moving')}*(${this.#at('moving')}-1))`,
            RATIO,
            'The variance of the sum of the returns, each over its own volatility, is the sum of all correlations.',
          )
          this.#step(
            'weighted volatility',
            'Sum of weights times volatilities, per period',
            () => `SUMPRODUCT(SQRT(${this.#all('variance')}),${this.#all('weight')})`,
            PERCENT,
          )
        } else {
          this.#step('moving', 'Holdings that move', shrinkage.moving, COUNT)
          this.#step(
            'mean variance',
            'Mean variance of the holdings that move, per period',
            () => `SUM(${this.#all('variance')})/${this.#at('moving')}`,
            SMALL,
            'The target: this variance for each of them, and no correlation',
          )
        }
      }
    }
  }

  // ---- the book as a whole

  #book(): void {
    const { breakdown } = this.#input
    const { decomposition: d, horizon } = breakdown
    const scaled = `SQRT(${this.#at('periods')})`
    const covariance: Key = this.#shrinkage ? 'shrunk covariance' : 'covariance'
    this.#section('The book')
    this.#step(
      'gross per period',
      'Sum of stand-alone risks, per period',
      () => `${this.#at('gross risk')}/${scaled}`,
      PERCENT,
    )
    this.#step(
      'variance',
      'Variance of the portfolio, per period',
      () => `SUMPRODUCT(${this.#all('weight')},${this.#all(covariance)})`,
      SMALL,
      'Sum of weights times covariances with the portfolio',
    )
    this.#step(
      'volatility per period',
      'Volatility of the portfolio, per period',
      () => this.#rootOf('variance'),
      PERCENT,
    )
    this.#line(
      'volatility',
      `Volatility ${horizon}`,
      () => `${this.#at('volatility per period')}*${scaled}`,
      d.volatility,
      PERCENT,
      'Root of the variance, times the root of the periods per year',
    )
    const own = this.#ownVolatility()
    if (own !== null)
      this.#line(
        'own volatility',
        `Volatility ${horizon}, from the dates`,
        own,
        d.volatility,
        PERCENT,
        'From the portfolio’s own return on every date: another way to the same figure',
      )
    this.#line(
      'gross risk',
      'Sum of stand-alone risks',
      () => `SUM(${this.#all('stand-alone')})`,
      d.standAlone.reduce((sum, value) => sum + value, 0),
      PERCENT,
      'Sum of the column below',
    )
    this.#line(
      'benefit',
      'Diversification benefit',
      () => `${this.#at('gross risk')}-${this.#at('volatility')}`,
      d.diversificationBenefit,
      PERCENT,
      'Sum of stand-alone risks less the volatility',
    )
    if (d.diversificationRatio === null)
      this.#step('ratio scale', 'Diversification ratio', 1, RATIO, 'Not defined: the book has no risk')
    else
      this.#line(
        'ratio scale',
        'Diversification ratio',
        () => `${this.#at('gross risk')}/${this.#at('volatility')}`,
        d.diversificationRatio,
        RATIO,
        'Sum of stand-alone risks over the volatility',
        'ratio',
      )
    if (d.effectiveNumber !== null && breakdown.effectiveWithheld === null)
      this.#line(
        'effective',
        'Effective number of positions (by risk)',
        () => `1/SUMSQ(${this.#all('share')})`,
        d.effectiveNumber,
        RATIO,
        'One over the sum of squared shares of risk',
        'ratio',
      )
    this.#line(
      'net',
      'Net weight',
      () => `SUM(${this.#all('weight')})`,
      breakdown.net,
      PERCENT,
      'Sum of weights',
      'ratio',
    )
    this.#line(
      'gross',
      'Gross weight',
      () => `SUMPRODUCT(ABS(${this.#all('weight')}))`,
      breakdown.gross,
      PERCENT,
      'Sum of weights without their signs',
      'ratio',
    )
    const { expectedReturn } = breakdown
    if (this.#isDated && expectedReturn?.label.startsWith('Average past return'))
      this.#line(
        'average',
        `${expectedReturn.label}, ${expectedReturn.horizon}`,
        () => `AVERAGE(${this.#allDates('return')})*${this.#at('periods')}`,
        expectedReturn.value,
        PERCENT,
        'Mean of the portfolio’s returns on the dates used, times the periods per year',
      )
    const count = this.#reach.cells?.count() ?? null
    if (count)
      this.#line(
        'numbers',
        'Numbers in the cells of the returns',
        () => count.formula,
        count.found,
        COUNT,
        'Cells that hold a number, against those that held one when they were read',
        'count',
      )
  }

  /** The root of a variance, or 0 where it is no more than rounding; one further below 0 than that has none, and shows as an error. */
  #rootOf(name: string): string {
    const variance = this.#at(name)
    return `SQRT(${variance}*(ABS(${variance})>${this.#at('rounding')}*${this.#at('gross per period')}^2))`
  }

  /** The volatility straight from the portfolio's returns; null where the estimator makes another one of them. */
  #ownVolatility(): (() => string) | null {
    const { estimation } = this.#reach
    if (estimation.kind !== 'dates' || estimation.shrinkage) return null
    const scaled = `SQRT(${this.#at('periods')})`
    if (this.#isCovariance)
      return () =>
        `${estimation.divisor === 'less one' ? 'STDEV.S' : 'STDEV.P'}(${this.#allDates('return')})*${scaled}`
    return () => {
      const product = `SUMPRODUCT(${this.#allDates('return')},${this.#allDates('multiplier')})`
      const off = this.#lags > 0 ? `-${this.#at('mean')}*${this.#at('sum of multipliers')}` : ''
      return `SQRT(MAX(0,${product}${off}))*${scaled}`
    }
  }

  // ---- holdings

  #holdings(): void {
    const { breakdown } = this.#input
    const { decomposition: d, groupHeaders, sharesWithheld } = breakdown
    this.#section('Holdings', false)
    this.#note(
      'Means, variances and covariances are per period. Differences are the largest in a row: of stand-alone risk, marginal contribution and contribution; of weight, share, beta and correlation.',
    )
    if (sharesWithheld !== null) this.#note(sharesWithheld)
    const heads: { [column: number]: Late } = {}
    ;['Holding', ...groupHeaders].forEach((head, c) => (heads[c] = text(head, 'head')))
    this.#keys.forEach((key, k) => {
      const head = text(this.#headOf(key), 'head')
      heads[this.#labels + k] = key === 'mark' ? { ...head, indent: 1 } : head
    })
    this.#draft.add(heads, 'head')
    this.#first = this.#draft.next
    for (let i = 0; i < this.#size; i++) this.#draft.add()
    for (let i = 0; i < this.#size; i++) this.#holding(i)

    const total = (key: Key, format: string): Late => formulaCell(`=SUM(${this.#all(key)})`, format, 'total')
    const shares = sharesWithheld === null
    this.#draft.add(
      {
        0: text('Total', 'total'),
        [this.#column('weight')]: total('weight', PERCENT),
        [this.#column('stand-alone')]: total('stand-alone', PERCENT),
        [this.#column('contribution')]: () => formulaCell(`=${this.#at('volatility')}`, PERCENT, 'total'),
        ...(shares ? { [this.#column('share')]: total('share', SHARE) } : {}),
      },
      'total',
    )
    const sum = this.#draft.add({
      0: text('Sum of parts'),
      [this.#column('contribution')]: formulaCell(`=SUM(${this.#all('contribution')})`, PERCENT),
      [this.#column('our contribution')]: number(d.sumOfContributions, PERCENT),
    })
    const c = this.#column('contribution')
    this.#draft.add({
      0: text('Difference'),
      [c]: formulaCell(`=${this.#draft.cell(sum, c)}-${this.#draft.cell(sum - 1, c)}`, GAP),
      [this.#column('risk gap')]: formulaCell(
        `=ABS(${this.#draft.cell(sum, c)}-${this.#draft.cell(sum - 1, c)})`,
        GAP,
      ),
      [this.#column('mark')]: () =>
        this.#mark([[this.#draft.cell(sum + 1, this.#column('risk gap')), this.#allowed('risk')]]),
      [this.#column('note')]: text('Contributions add up to the volatility'),
    })
  }

  #headOf(key: Key): string {
    const { holdings } = this.#input.blocks
    const isExposure = holdings.columns.some(({ role }) => role === 'exposure')
    if (key === 'measure' && isExposure) return 'Exposure'
    return HEADS[key][0]
  }

  #holding(i: number): void {
    const { blocks, breakdown } = this.#input
    const { decomposition: d, sharesWithheld } = breakdown
    const holding = blocks.holdings.holdings[i]!
    const row = this.#first + i
    const notes: string[] = []
    const put = (key: Key, cell: Late): void => this.#draft.put(row, this.#column(key), cell)
    const at = (key: Key): string => this.#cell(key, i)
    const formula = (key: Key, format: string, of: () => string): void =>
      put(key, () => formulaCell(`=${of()}`, format))

    const cells: Partial<HoldingCells> = holding.cells ?? {}
    const name = cells.name ?? null
    this.#draft.put(row, 0, name ? formulaCell(`=${referenceOf(name)}`, PLAIN) : text(holding.name))
    breakdown.groupHeaders.forEach((_, header) => {
      const { groupOf, labels } = this.#groupsOf(header)
      const label = labels[groupOf[i]!] ?? ''
      const cell = cells.groups?.[header] ?? null
      const isSpeltSo = cell !== null && holding.groups[header]?.toLowerCase() === label.toLowerCase()
      this.#draft.put(row, 1 + header, isSpeltSo ? formulaCell(`=${referenceOf(cell)}`, PLAIN) : text(label))
    })

    // the weight, from the user's own cell
    const isText = cells.measure === null || cells.measure === undefined
    if (isText) notes.push('typed as text: a constant here')
    const { capital } = blocks.holdings
    if (capital === null)
      put(
        'weight',
        isText ? number(holding.weight, PERCENT) : formulaCell(`=${referenceOf(cells.measure!)}`, PERCENT),
      )
    else {
      put(
        'measure',
        isText
          ? number(holding.weight * capital, '#,##0.00')
          : formulaCell(`=${referenceOf(cells.measure!)}`, '#,##0.00'),
      )
      if (this.#keys.includes('base'))
        put(
          'base',
          cells.amount
            ? formulaCell(`=${referenceOf(cells.amount)}`, '#,##0.00')
            : number(holding.amount ?? 0, '#,##0.00'),
        )
      formula('weight', PERCENT, () => `${at('measure')}/${this.#at('capital')}`)
    }
    put('our weight', number(d.weights[i], PERCENT))

    this.#moments(i, put, formula, notes)
    const covariance = at(this.#shrinkage ? 'shrunk covariance' : 'covariance')
    const variance = at(this.#shrinkage ? 'shrunk variance' : 'variance')
    const s = (): string => this.#at('volatility per period')
    const scaled = (): string => `SQRT(${this.#at('periods')})`
    formula('stand-alone', PERCENT, () => `ABS(${at('weight')})*SQRT(${variance})*${scaled()}`)
    put('our stand-alone', number(d.standAlone[i], PERCENT))
    const risks: Key[] = ['stand-alone', 'contribution']
    const ratios: Key[] = ['weight']
    if (d.marginal === null) {
      formula(
        'contribution',
        PERCENT,
        () => `IF(${s()}=0,0,${at('weight')}*${covariance}/${s()}*${scaled()})`,
      )
      for (const key of ['marginal', 'share', 'beta', 'correlation'] as const) put(key, text('not defined'))
    } else {
      formula('marginal', PERCENT, () => `${covariance}/${s()}*${scaled()}`)
      formula('contribution', PERCENT, () => `${at('weight')}*${at('marginal')}`)
      formula('beta', RATIO, () => `${covariance}/${s()}^2`)
      put('our marginal', number(d.marginal[i], PERCENT))
      put('our beta', number(d.beta?.[i], RATIO))
      risks.push('marginal')
      ratios.push('beta')
      if (sharesWithheld === null) {
        formula('share', SHARE, () => `${at('contribution')}/${this.#at('volatility')}`)
        put('our share', number(d.share?.[i], SHARE))
        ratios.push('share')
      } else put('share', text('withheld'))
      if (this.#moves(i) && Number.isFinite(d.correlation?.[i])) {
        formula('correlation', RATIO, () => `${covariance}/(SQRT(${variance})*${s()})`)
        put('our correlation', number(d.correlation?.[i], RATIO))
        ratios.push('correlation')
      } else put('correlation', text('not defined'))
    }
    put('our contribution', number(d.contribution[i], PERCENT))
    const gap = (keys: readonly Key[]) => (): string =>
      `MAX(${keys.map((key) => `ABS(${at(key)}-${at(`our ${key}` as Key)})`).join(',')})`
    formula('risk gap', GAP, gap(risks))
    formula('ratio gap', GAP, gap(ratios))
    put('mark', () =>
      this.#mark([
        [at('risk gap'), this.#allowed('risk')],
        [at('ratio gap'), this.#allowed('ratio')],
      ]),
    )
    put('note', text(notes.join('; ')))
  }

  /** Variance, and covariance with the portfolio, of one holding per period. */
  #moments(
    i: number,
    put: (key: Key, cell: Late) => void,
    formula: (key: Key, format: string, of: () => string) => void,
    notes: string[],
  ): void {
    const { blocks } = this.#input
    const { estimation, cells } = this.#reach
    const series = blocks.match.seriesOf[i] ?? -1
    if (!this.#moves(i)) {
      notes.push(series < 0 ? 'riskless: covariance 0' : 'never moves, counts as riskless: covariance 0')
      if (this.#keys.includes('mean')) put('mean', text(''))
      for (const key of ['variance', 'covariance', 'shrunk variance', 'shrunk covariance'] as const)
        if (this.#keys.includes(key)) put(key, number(0, SMALL))
      return
    }
    if (estimation.kind === 'taken over' || cells === null) {
      put('variance', number(this.#variances[i], SMALL))
      put('covariance', number(this.#covariances[i], SMALL))
      notes.push('covariances taken over')
      return
    }
    if (estimation.kind === 'matrix') {
      const weights = (from: number, count: number): string =>
        this.#draft.range(this.#seriesColumn('weight'), from, count)
      formula('variance', SMALL, () => referenceOf(blocks.returns.cell(series, series)))
      formula('covariance', SMALL, () => cells.alongSeries(series, weights) ?? '')
      return
    }
    const mean = this.#cell('mean', i)
    const dateWeights = (from: number, count: number): string =>
      this.#draft.range(this.#dateColumn('weight'), from, count)
    if (this.#keys.includes('mean'))
      formula(
        'mean',
        '0.000000%',
        () => `(${cells.alongDates(series, dateWeights) ?? ''})/${this.#at('sum of weights')}`,
      )
    const variance = this.#varianceOf(series, mean, dateWeights)
    if (variance === null) {
      put('variance', number(this.#variances[i], SMALL))
      notes.push('variance taken over')
    } else formula('variance', SMALL, variance)
    formula('covariance', SMALL, () => this.#covarianceWith(series, mean, 'return', 'multiplier'))

    if (!estimation.shrinkage) return
    const [own, shared, w] = [this.#cell('variance', i), this.#cell('covariance', i), this.#cell('weight', i)]
    const d = (): string => this.#at('intensity')
    if (estimation.shrinkage.target === 'correlation') {
      formula('shrunk variance', SMALL, () => own)
      formula(
        'shrunk covariance',
        SMALL,
        () => `(1-${d()})*${shared}+${d()}*${this.#toCorrelation(own, w, this.#at('weighted volatility'))}`,
      )
    } else {
      formula('shrunk variance', SMALL, () => `(1-${d()})*${own}+${d()}*${this.#at('mean variance')}`)
      formula(
        'shrunk covariance',
        SMALL,
        () => `(1-${d()})*${shared}+${d()}*${this.#at('mean variance')}*${w}`,
      )
    }
  }

  /** What the target of constant correlation makes of a holding's covariance with some weights. */
  #toCorrelation(variance: string, weight: string, weighted: string): string {
    const r = this.#at('mean correlation')
    return `(${r}*SQRT(${variance})*${weighted}+(1-${r})*${variance}*${weight})`
  }

  /** The covariance of one series with a column of returns per date. */
  #covarianceWith(series: number, mean: string, returns: DateKey, multiplier: DateKey): string {
    const cells = this.#reach.cells!
    const { estimation } = this.#reach
    if (this.#isCovariance)
      return `${estimation.kind === 'dates' && estimation.divisor === 'less one' ? 'COVARIANCE.S' : 'COVARIANCE.P'}(${cells.over(series)},${this.#allDates(returns)})`
    const sum = cells.alongDates(series, (from, count) =>
      this.#draft.range(this.#dateColumn(multiplier), from, count),
    )
    const off = returns === 'active' ? 'sum of active multipliers' : 'sum of multipliers'
    return `${sum ?? ''}${this.#lags > 0 ? `-${mean}*${this.#at(off)}` : ''}`
  }

  /** The variance of one series; null where only a constant can stand for it. */
  #varianceOf(
    series: number,
    mean: string,
    weights: (from: number, count: number) => string,
  ): (() => string) | null {
    const cells = this.#reach.cells!
    const { estimation, isWhole } = this.#reach
    if (estimation.kind !== 'dates') return null
    if (this.#isPlain)
      return () => `${estimation.divisor === 'less one' ? 'VAR.S' : 'VAR.P'}(${cells.over(series)})`
    const divisor = (): string => this.#at('divisor')
    if (estimation.lags > 0) {
      if (!isWhole) return null
      const all = cells.dates.length
      return () =>
        this.#laggedVariance(
          (from, count) =>
            `${cells.over(series, { from, count, shift: cells.stretchesOf(series)[0]!.shift })}-${mean}`,
          all,
        )
    }
    if (cells.takesBlanks && cells.stretchesOf(series).length > 1)
      return () =>
        `(SUMPRODUCT(${weights(0, cells.dates.length)},${cells.over(series)},${cells.over(series)})-${this.#at('sum of weights')}*${mean}^2)/${divisor()}`
    return () =>
      `(${cells.alongDates(series, weights, (returns) => `(${returns}-${mean})^2`) ?? ''})/${divisor()}`
  }

  /** Variance with lagged terms of what stands in neighbouring cells. */
  #laggedVariance(centred: (from: number, count: number) => string, dates: number): string {
    const lagged = Array.from({ length: this.#lags }, (_, k) => {
      const lag = k + 1
      return `${this.#at(`lag ${lag}`)}*SUMPRODUCT((${centred(0, dates - lag)})*(${centred(lag, dates - lag)}))`
    })
    return `(SUMPRODUCT((${centred(0, dates)})^2)+2*(${lagged.join('+')}))/${this.#at('divisor')}`
  }

  /** C w of the model, per period, where it stands for formulas. */
  get #covariances(): Float64Array {
    this.#applied ??= this.#input.book.model.apply(this.#input.breakdown.decomposition.weights).marginals
    return this.#applied
  }
  #applied: Float64Array | null = null

  // ---- the intensity of a shrinkage toward one variance for all

  #intensity(): void {
    const { target, intensity } = this.#shrinkage!
    this.#section('Shrinkage intensity')
    const c = this.#labels
    const moving = this.#input.breakdown.names.flatMap((name, i) => (this.#moves(i) ? [{ name, i }] : []))
    const rows: Column = { column: c, row: this.#draft.next, rows: moving.length }
    for (const { name, i } of moving)
      this.#step(
        `squares ${i}`,
        name,
        () =>
          moving
            .map((other) => `COVARIANCE.P(${this.#returnsOf(i)},${this.#returnsOf(other.i)})^2`)
            .join('+'),
        SMALL,
        i === moving[0]?.i ? 'Sum of its squared covariances with all holdings, divisor T' : '',
      )
    const n = (): string => this.#at('moving')
    const T = (): string => this.#at('dates')
    const trace = (): string => `SUM(${this.#all('variance')})`
    this.#step('squares', 'Sum of squared covariances', () => `SUM(${this.#draft.range(rows)})`, SMALL)
    this.#step(
      'distance',
      'Squared distance from the target',
      () => `${this.#at('squares')}-${trace()}^2/${n()}`,
      SMALL,
      'The sum of squares less the squared sum of variances over their number',
    )
    if (target === 'identity')
      this.#step(
        'noise',
        'Squared error of the covariances',
        () => `(SUMSQ(${this.#allDates('length')})/${T()}-${this.#at('squares')})/${T()}`,
        SMALL,
        'Mean of the squared products of the dates less the sum of squares, over the number of dates',
      )
    this.#line(
      'derived intensity',
      'Shrinkage intensity',
      () =>
        target === 'identity'
          ? `MIN(1,MAX(0,${this.#at('noise')})/${this.#at('distance')})`
          : `MIN(1,((1-2/${n()})*${this.#at('squares')}+${trace()}^2)/((${T()}+1-2/${n()})*${this.#at('distance')}))`,
      intensity,
      '0.000000',
      target === 'identity'
        ? 'Error over distance, 1 at most'
        : 'Chen et al. (2010), equation 23 (from memory); 1 at most',
      'ratio',
    )
  }

  // ---- groups

  #groups(): void {
    const { breakdown } = this.#input
    const { decomposition: d, sharesWithheld } = breakdown
    breakdown.byGroup.forEach(({ header, labels, parts }, h) => {
      const { groupOf } = this.#groupsOf(h)
      const labelled = this.#draft.range({ column: 1 + h, row: this.#first, rows: this.#size })
      const c = this.#labels
      const splits = this.#groupReturns.length > 0
      const shares = sharesWithheld === null && d.share !== null
      const figures = [
        { head: WEIGHT, format: PERCENT, scale: 'ratio' },
        { head: CONTRIBUTION, format: PERCENT, scale: 'risk' },
        ...(shares ? [{ head: SHARE_HEAD, format: SHARE, scale: 'ratio' } as const] : []),
        ...(splits ? [{ head: STAND_ALONE, format: PERCENT, scale: 'risk' } as const] : []),
      ] as const
      const k = figures.length
      this.#draft.add()
      const heads: { [column: number]: Late } = { 0: text(header, 'head') }
      figures.forEach(({ head }, f) => {
        heads[c + f] = text(head, 'head')
        heads[c + k + f] = text(`${head}, Counterpoise`, 'head')
      })
      heads[c + 2 * k] = text('Difference, risks', 'head')
      heads[c + 2 * k + 1] = text('Difference, ratios', 'head')
      heads[c + 2 * k + 2] = { ...text('Result', 'head'), indent: 1 }
      this.#draft.add(heads, 'head')
      const first = this.#draft.next
      labels.forEach((_, g) => {
        const row = this.#draft.next
        const near = (column: number): string => this.#draft.cell(row, column)
        const member = groupOf.indexOf(g)
        const sum = (key: Key): string =>
          `SUMPRODUCT((${labelled}=${this.#draft.cell(row, 0)})*${this.#all(key)})`
        const formulas = [
          sum('weight'),
          sum('contribution'),
          ...(shares ? [`${near(c + 1)}/${this.#at('volatility')}`] : []),
        ]
        const ours = [
          parts.weight[g],
          parts.contribution[g],
          ...(shares ? [parts.share?.[g]] : []),
          ...(splits ? [parts.standAlone[g]] : []),
        ]
        const cells: { [column: number]: Late } = {
          0: formulaCell(`=${this.#draft.cell(this.#first + member, 1 + h)}`, PLAIN),
        }
        formulas.forEach((formula, f) => (cells[c + f] = formulaCell(`=${formula}`, figures[f]!.format)))
        if (splits)
          cells[c + k - 1] = () =>
            formulaCell(
              `=SQRT(MAX(0,${this.#groupVariance(h, g, row)}))*SQRT(${this.#at('periods')})`,
              PERCENT,
            )
        ours.forEach((value, f) => (cells[c + k + f] = number(value, figures[f]!.format)))
        const gap = (scale: 'risk' | 'ratio'): string =>
          `MAX(${figures
            .flatMap((figure, f) =>
              figure.scale === scale ? [`ABS(${near(c + f)}-${near(c + k + f)})`] : [],
            )
            .join(',')})`
        cells[c + 2 * k] = formulaCell(`=${gap('risk')}`, GAP)
        cells[c + 2 * k + 1] = formulaCell(`=${gap('ratio')}`, GAP)
        cells[c + 2 * k + 2] = () =>
          this.#mark([
            [near(c + 2 * k), this.#allowed('risk')],
            [near(c + 2 * k + 1), this.#allowed('ratio')],
          ])
        this.#draft.add(cells)
      })
      const total: { [column: number]: Late } = { 0: text('Total', 'total') }
      figures.forEach(({ head, format }, f) => {
        if (head !== STAND_ALONE)
          total[c + f] = formulaCell(
            `=SUM(${this.#draft.range({ column: c + f, row: first, rows: labels.length })})`,
            format,
            'total',
          )
      })
      this.#draft.add(total, 'total')
    })
  }

  /** The variance of a group's positions held alone, per period. */
  #groupVariance(header: number, group: number, row: number): string {
    const { estimation } = this.#reach
    const name = `group ${header} ${group}`
    if (estimation.kind !== 'dates') {
      const column = this.#seriesColumn(name)
      const weights = this.#draft.range(column)
      return `SUMPRODUCT(${weights},${this.#draft.range({ ...column, column: this.#labels + this.#seriesColumns.length + this.#groupIndex(header, group) })})`
    }
    const column = this.#groupColumn(this.#groupIndex(header, group))
    const returns = this.#draft.range(column)
    const weights = this.#allDates('weight')
    const sum = this.#at('sum of weights')
    const mean = `SUMPRODUCT(${returns},${weights})/${sum}`
    if (estimation.lags > 0)
      return this.#laggedVariance(
        (from, count) => `${this.#draft.range(column, from, count)}-${mean}`,
        column.rows,
      )
    const plain = `SUMPRODUCT((${returns}-${mean})^2,${weights})/${this.#at('divisor')}`
    const { shrinkage } = estimation
    if (!shrinkage) return plain
    const d = this.#at('intensity')
    const labelled = this.#draft.range({ column: 1 + header, row: this.#first, rows: this.#size })
    const of = `(${labelled}=${this.#draft.cell(row, 0)})`
    const [variance, weight] = [this.#all('variance'), this.#all('weight')]
    if (shrinkage.target !== 'correlation')
      return `(1-${d})*${plain}+${d}*${this.#at('mean variance')}*SUMPRODUCT(${of}*(${variance}>0)*${weight}^2)`
    const r = this.#at('mean correlation')
    return `(1-${d})*${plain}+${d}*(${r}*SUMPRODUCT(${of}*SQRT(${variance})*${weight})^2+(1-${r})*SUMPRODUCT(${of}*${variance}*${weight}^2))`
  }

  #groupIndex(header: number, group: number): number {
    return this.#groupReturns.findIndex((one) => one.header === header && one.group === group)
  }

  // ---- large losses

  #tails(): void {
    const { breakdown, settings } = this.#input
    const { tails } = breakdown
    if (typeof tails === 'string') return
    const { method } = tails.risk
    if ((method.kind === 'historical' || method.kind === 'cornish-fisher') && !this.#isDated) {
      this.#notProven.push(
        `Value at risk and expected shortfall: ${this.#reach.why ?? 'there are no returns'}.`,
      )
      return
    }
    if (method.kind === 'cornish-fisher' && tails.risk.skewness === null) {
      this.#notProven.push('Value at risk: the book has no risk.')
      return
    }
    this.#section(`Large losses: ${tails.label}`)
    this.#step('confidence', 'Confidence', settings.tails.confidence, '0.0###%')
    switch (method.kind) {
      case 'historical':
        this.#historical(tails)
        break
      case 'cornish-fisher':
        this.#cornishFisher(tails)
        break
      case 'normal':
      case 'student':
        this.#elliptical(tails)
    }
  }

  #elliptical(tails: Tails): void {
    const { risk } = tails
    const degrees = risk.degrees === Infinity ? null : risk.degrees
    const multiple = (): string => `${this.#at('volatility per period')}*SQRT(${this.#at('horizon')})`
    this.#step(
      'horizon',
      'Horizon in periods',
      risk.periods,
      PLAIN,
      'Scaled by its square root; the mean is taken as 0',
    )
    this.#step(
      'tail',
      'Tail probability',
      () => `1-${this.#at('confidence')}`,
      PLAIN,
      'One less the confidence',
    )
    if (degrees === null) {
      this.#step(
        'quantile',
        'Quantile of the normal distribution',
        () => `-NORM.S.INV(${this.#at('tail')})`,
        PLAIN,
      )
      this.#step(
        'beyond',
        'Mean of the normal distribution beyond it',
        () => `NORM.S.DIST(${this.#at('quantile')},FALSE)/${this.#at('tail')}`,
        PLAIN,
        'Density at the quantile over the tail probability',
      )
    } else this.#student(tails, degrees)
    this.#line(
      'value at risk',
      'Value at risk',
      () => `${this.#at('quantile')}*${multiple()}`,
      risk.valueAtRisk,
      PERCENT,
      'Quantile times the volatility of the horizon',
    )
    if (risk.shortfall !== null)
      this.#line(
        'shortfall',
        'Expected shortfall',
        () => `${this.#at('beyond')}*${multiple()}`,
        risk.shortfall,
        PERCENT,
        'Mean beyond the quantile times the volatility of the horizon; its parts are in proportion to the contributions above',
      )
  }

  #student({ risk }: Tails, degrees: number): void {
    const v = (): string => this.#at('degrees')
    // the quantile of a distribution with mean 0 and variance 1, brought back to Student's own scale
    const perVolatility =
      this.#input.breakdown.decomposition.volatility /
      Math.sqrt(this.#input.breakdown.decomposition.periodsPerYear)
    const unit = Math.sqrt((degrees - 2) / degrees)
    const quantile =
      perVolatility === 0 ? 0 : risk.valueAtRisk / (perVolatility * Math.sqrt(risk.periods) * unit)
    this.#step(
      'degrees',
      'Degrees of freedom',
      degrees,
      PLAIN,
      risk.method.kind === 'student' && risk.method.degrees === null
        ? 'Fitted to the portfolio’s returns by maximum likelihood: taken over from Counterpoise'
        : 'As chosen',
    )
    this.#step(
      'student quantile',
      'Quantile of Student’s t distribution',
      quantile,
      PLAIN,
      'Taken over from Counterpoise and held against its probability in the next line: the workbook’s own quantile takes whole degrees of freedom only',
    )
    if (perVolatility > 0)
      this.#line(
        'student probability',
        'Probability beyond the quantile',
        () => `BETA.DIST(${v()}/(${v()}+${this.#at('student quantile')}^2),${v()}/2,0.5,TRUE)/2`,
        1 - risk.confidence,
        PLAIN,
        `Half the incomplete beta function at v/(v + q²); agrees within ${literal(QUANTILE_TOLERANCE).toUpperCase()}, as workbooks have that function to fewer digits`,
        'quantile',
      )
    this.#step('unit', 'Scale for a variance of 1', () => `SQRT((${v()}-2)/${v()})`, PLAIN)
    this.#step(
      'quantile',
      'Quantile at a volatility of 1',
      () => `${this.#at('unit')}*${this.#at('student quantile')}`,
      PLAIN,
    )
    this.#step(
      'beyond',
      'Mean beyond it at a volatility of 1',
      () =>
        `${this.#at('unit')}*EXP(GAMMALN((${v()}+1)/2)-GAMMALN(${v()}/2))/SQRT(${v()}*PI())*(1+${this.#at('student quantile')}^2/${v()})^(-(${v()}+1)/2)/${this.#at('tail')}*(${v()}+${this.#at('student quantile')}^2)/(${v()}-1)`,
      PLAIN,
      'Density over the tail probability, times (v + q²)/(v − 1)',
    )
  }

  #cornishFisher({ risk }: Tails): void {
    const y = (): string => this.#allDates('return')
    const moment = (power: number): string =>
      `SUMPRODUCT(${this.#used()}*(${y()}-${this.#at('plain mean')})^${power})/${this.#at('dates')}`
    this.#step('plain mean', 'Mean return, every date alike', () => `AVERAGE(${y()})`, '0.000000%')
    this.#step(
      'skewness',
      'Skewness',
      () => `(${moment(3)})/(${moment(2)})^1.5`,
      RATIO,
      'Third central moment over the variance to the power 1.5; divisor T',
    )
    this.#step(
      'kurtosis',
      'Excess kurtosis',
      () => `(${moment(4)})/(${moment(2)})^2-3`,
      RATIO,
      'Fourth central moment over the squared variance, less 3; divisor T',
    )
    this.#step(
      'quantile',
      'Quantile of the normal distribution',
      () => `NORM.S.INV(1-${this.#at('confidence')})`,
      PLAIN,
    )
    const z = (): string => this.#at('quantile')
    const [skew, kurt] = ['skewness', 'kurtosis'].map((name) => () => this.#at(name)) as [
      () => string,
      () => string,
    ]
    this.#step(
      'corrected',
      'Quantile corrected',
      () =>
        `${z()}+(${z()}^2-1)*${skew()}/6+(${z()}^3-3*${z()})*${kurt()}/24-(2*${z()}^3-5*${z()})*${skew()}^2/36`,
      PLAIN,
      'Cornish & Fisher (1937)',
    )
    this.#line(
      'value at risk',
      'Value at risk',
      () => `-${this.#at('corrected')}*${this.#at('volatility per period')}`,
      risk.valueAtRisk,
      PERCENT,
      'Corrected quantile times the volatility, mean taken as 0',
    )
  }

  /** One for each date used, nothing for others. */
  #used(): string {
    return `ISNUMBER(${this.#allDates('return')})`
  }

  #historical({ risk, partsWithheld }: Tails): void {
    const { breakdown, blocks } = this.#input
    const y = (): string => this.#allDates('return')
    this.#step(
      'tail',
      'Tail probability',
      () => `ROUND(1-${this.#at('confidence')},10)`,
      PLAIN,
      'One less the confidence',
    )
    this.#step(
      'observations',
      'Dates in the tail',
      () => `ROUND(${this.#at('dates')}*${this.#at('tail')},9)`,
      PLAIN,
      'Dates used times the tail probability',
    )
    this.#line(
      'value at risk',
      'Value at risk',
      () => `-SMALL(${y()},ROUNDUP(${this.#at('observations')},0))`,
      risk.valueAtRisk,
      PERCENT,
      'The largest losses counted from the worst, up to the dates in the tail, rounded up',
    )
    this.#step(
      'alike',
      'Losses this close count as equal',
      () => `1E-12*MAX(ABS(MAX(${y()})),ABS(MIN(${y()})))`,
      SMALL,
    )
    this.#step(
      'above',
      'Dates with a loss above the value at risk',
      () => `SUMPRODUCT(${this.#used()}*(${y()}<-${this.#at('value at risk')}-${this.#at('alike')}))`,
      COUNT,
    )
    this.#step(
      'tied',
      'Dates with a loss equal to it',
      () =>
        `SUMPRODUCT(${this.#used()}*(${y()}<=-${this.#at('value at risk')}+${this.#at('alike')}))-${this.#at('above')}`,
      COUNT,
      'They share the weight that is left',
    )
    this.#line(
      'shortfall',
      'Expected shortfall',
      () => `-SUMPRODUCT(${y()},${this.#allDates('tail')})`,
      risk.shortfall ?? 0,
      PERCENT,
      'Mean of the losses in the tail, the last date in part (Acerbi & Tasche 2002)',
    )
    if (partsWithheld !== null) this.#note(partsWithheld)
    const { parts } = risk
    if (parts === null || partsWithheld !== null) return
    const c = this.#labels
    this.#draft.add(
      {
        0: text('Holding', 'head'),
        [c]: text('Part of shortfall', 'head'),
        [c + 1]: text('Counterpoise', 'head'),
        [c + 2]: text('Difference', 'head'),
        [c + 3]: { ...text('Result', 'head'), indent: 1 },
      },
      'head',
    )
    const first = this.#draft.next
    const cells = this.#reach.cells!
    breakdown.names.forEach((name, i) => {
      const row = this.#draft.next
      const near = (k: number): string => this.#draft.cell(row, c + k)
      const series = blocks.match.seriesOf[i] ?? -1
      const tail = (from: number, count: number): string =>
        this.#draft.range(this.#dateColumn('tail'), from, count)
      this.#draft.add({
        0: text(name),
        [c]:
          series < 0
            ? number(0, PERCENT)
            : () =>
                formulaCell(
                  `=-${this.#cell('weight', i)}*(${cells.alongDates(series, tail) ?? ''})`,
                  PERCENT,
                ),
        [c + 1]: number(parts[i], PERCENT),
        [c + 2]: formulaCell(`=${near(0)}-${near(1)}`, GAP),
        [c + 3]: () => this.#mark([[`ABS(${near(2)})`, this.#allowed('risk')]]),
        ...(series < 0 ? { [c + 4]: { ...text('riskless: no part'), indent: 1 } } : {}),
      })
    })
    this.#draft.add(
      {
        0: text('Total', 'total'),
        [c]: formulaCell(
          `=SUM(${this.#draft.range({ column: c, row: first, rows: this.#size })})`,
          PERCENT,
          'total',
        ),
      },
      'total',
    )
  }

  // ---- against the benchmark

  #activeWeight(i: number): string {
    const holding = this.#input.blocks.holdings.holdings[i]
    const cell = holding?.cells?.benchmark
    const benchmark = cell ? referenceOf(cell) : literal(holding?.benchmark ?? 0)
    return `${this.#cell('weight', i)}-${benchmark}`
  }

  #active(): void {
    const { breakdown, settings } = this.#input
    const { active } = breakdown
    if (!active) return
    if (!this.#provesActive) {
      this.#notProven.push(
        settings.benchmark.kind === 'series'
          ? 'Figures against the benchmark: it is one series, with a model of its own.'
          : this.#estimation.kind === 'taken over'
            ? 'Figures against the benchmark: they need covariances that are not recomputed here.'
            : 'Figures against the benchmark: they would make this sheet too long.',
      )
      return
    }
    const { risk } = active
    const { estimation } = this.#reach
    const relative = risk.convention === 'benchmark-relative returns'
    const scaled = (): string => `SQRT(${this.#at('periods')})`
    const c = this.#labels
    const column = (k: number) => (): string =>
      this.#draft.range({ column: c + k, row: this.#activeFirst, rows: this.#size })
    const [weights, , covariances] = [column(0), column(1), column(2)]
    this.#section(`Against the benchmark: ${active.label}`)
    if (estimation.kind === 'dates' && !this.#isCovariance) {
      this.#step(
        'active mean',
        'Mean active return, per period',
        () =>
          `SUMPRODUCT(${this.#allDates('active')},${this.#allDates('weight')})/${this.#at('sum of weights')}`,
        '0.000000%',
      )
      if (this.#lags > 0)
        this.#step(
          'sum of active multipliers',
          'Sum of the multipliers',
          () => `SUM(${this.#allDates('active multiplier')})`,
          SMALL,
        )
    }
    if (this.#shrinkage?.target === 'correlation')
      this.#step(
        'weighted active volatility',
        'Sum of active weights times volatilities, per period',
        () => `SUMPRODUCT(SQRT(${this.#all('variance')}),${weights()})`,
        PERCENT,
      )
    this.#step(
      'active variance',
      'Variance of the active return, per period',
      () => `SUMPRODUCT(${weights()},${covariances()})`,
      SMALL,
      'Sum of active weights times covariances with the active return',
    )
    this.#step(
      'active volatility',
      'Tracking error, per period',
      () => this.#rootOf('active variance'),
      PERCENT,
    )
    this.#line(
      'tracking error',
      `Tracking error (ex ante) ${breakdown.horizon}`,
      () => `${this.#at('active volatility')}*${scaled()}`,
      risk.trackingError,
      PERCENT,
      `Parts by ${risk.convention}`,
    )
    const covariance: Key = this.#shrinkage ? 'shrunk covariance' : 'covariance'
    this.#step(
      'benchmark variance',
      'Variance of the benchmark, per period',
      () => `SUMPRODUCT(${column(1)()},${this.#all(covariance)}-${covariances()})`,
      SMALL,
      'Covariances with the benchmark are those with the portfolio less those with the active return',
    )
    this.#line(
      'benchmark volatility',
      'Volatility of the benchmark',
      () => `SQRT(MAX(0,${this.#at('benchmark variance')}))*${scaled()}`,
      risk.benchmarkVolatility,
      PERCENT,
      'Root of its variance, times the root of the periods per year',
    )
    if (risk.beta !== null)
      this.#line(
        'benchmark beta',
        'Beta to the benchmark',
        () => `SUMPRODUCT(${column(1)()},${this.#all(covariance)})/${this.#at('benchmark variance')}`,
        risk.beta,
        RATIO,
        'Covariance of portfolio and benchmark over the variance of the benchmark',
        'ratio',
      )
    if (risk.beta !== null && risk.correlation !== null)
      this.#line(
        'benchmark correlation',
        'Correlation with the benchmark',
        () => `${this.#at('benchmark beta')}*${this.#at('benchmark volatility')}/${this.#at('volatility')}`,
        risk.correlation,
        RATIO,
        'Beta times the volatility of the benchmark over that of the portfolio',
        'ratio',
      )
    if (relative)
      this.#step(
        'common',
        'Marginal contribution of the benchmark itself',
        () =>
          risk.share === null
            ? '0'
            : `SUMPRODUCT(${column(1)()},${covariances()})/${this.#at('active volatility')}*${scaled()}`,
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
    if (active.sharesWithheld !== null) this.#note(active.sharesWithheld)
    this.#draft.add(
      {
        0: text('Holding', 'head'),
        ...Object.fromEntries(heads.map((head, k) => [c + k, text(head, 'head')])),
        [c + heads.length]: { ...text('Result', 'head'), indent: 1 },
      },
      'head',
    )
    this.#activeFirst = this.#draft.next
    for (let i = 0; i < this.#size; i++) this.#activeRow(i, relative, shares)
    if (relative) this.#netRow(shares)
    const count = this.#draft.next - this.#activeFirst
    this.#draft.add(
      {
        0: text('Total', 'total'),
        ...Object.fromEntries(
          [0, 3].map((k) => [
            c + k,
            formulaCell(
              `=SUM(${this.#draft.range({ column: c + k, row: this.#activeFirst, rows: k === 0 ? this.#size : count })})`,
              PERCENT,
              'total',
            ),
          ]),
        ),
      },
      'total',
    )
  }
  #activeFirst = 0

  #activeRow(i: number, relative: boolean, shares: boolean): void {
    const { breakdown, blocks } = this.#input
    const { risk, names } = breakdown.active!
    const { estimation, cells } = this.#reach
    const c = this.#labels
    const row = this.#draft.next
    const near = (k: number): string => this.#draft.cell(row, c + k)
    const holding = blocks.holdings.holdings[i]
    const benchmark = holding?.cells?.benchmark
    const series = blocks.match.seriesOf[i] ?? -1
    const covariance = (): string => {
      if (!this.#moves(i)) return '0'
      if (estimation.kind === 'matrix')
        return (
          cells!.alongSeries(series, (from, count) =>
            this.#draft.range(this.#seriesColumn('active'), from, count),
          ) ?? ''
        )
      const plain = this.#covarianceWith(series, this.#cell('mean', i), 'active', 'active multiplier')
      const shrinkage = this.#shrinkage
      if (!shrinkage) return plain
      const d = this.#at('intensity')
      return shrinkage.target === 'correlation'
        ? `(1-${d})*${plain === '' ? '0' : `(${plain})`}+${d}*${this.#toCorrelation(this.#cell('variance', i), near(0), this.#at('weighted active volatility'))}`
        : `(1-${d})*(${plain})+${d}*${this.#at('mean variance')}*${near(0)}`
    }
    const s = (): string => this.#at('active volatility')
    const product = (): string =>
      `${near(0)}*(${near(2)}/${s()}*SQRT(${this.#at('periods')})${relative ? `-${this.#at('common')}` : ''})`
    this.#draft.add({
      0: text(names[i] ?? ''),
      [c]: formulaCell(`=${this.#cell('weight', i)}-${near(1)}`, PERCENT),
      [c + 1]: benchmark
        ? formulaCell(`=${referenceOf(benchmark)}`, PERCENT)
        : number(holding?.benchmark ?? 0, PERCENT),
      [c + 2]: this.#moves(i) ? () => formulaCell(`=${covariance()}`, SMALL) : number(0, SMALL),
      [c + 3]: () =>
        formulaCell(risk.share === null ? `=IF(${s()}=0,0,${product()})` : `=${product()}`, PERCENT),
      [c + 4]: shares
        ? () => formulaCell(`=${near(3)}/${this.#at('tracking error')}`, SHARE)
        : text('withheld'),
      [c + 5]: number(risk.contribution[i], PERCENT),
      [c + 6]: shares ? number(risk.share?.[i], SHARE) : text(''),
      ...this.#activeGaps(near, shares),
    })
  }

  #netRow(shares: boolean): void {
    const { risk } = this.#input.breakdown.active!
    const c = this.#labels
    const row = this.#draft.next
    const near = (k: number): string => this.#draft.cell(row, c + k)
    this.#draft.add({
      0: text('Net active weight'),
      [c]: formulaCell(
        `=SUM(${this.#draft.range({ column: c, row: this.#activeFirst, rows: this.#size })})`,
        PERCENT,
      ),
      [c + 3]: formulaCell(`=${near(0)}*${this.#at('common')}`, PERCENT),
      [c + 4]: shares
        ? () => formulaCell(`=${near(3)}/${this.#at('tracking error')}`, SHARE)
        : text('withheld'),
      [c + 5]: number(risk.netContribution, PERCENT),
      [c + 6]: shares ? number(risk.netShare, SHARE) : text(''),
      ...this.#activeGaps(near, shares),
    })
  }

  #activeGaps(near: (k: number) => string, shares: boolean): { readonly [column: number]: Late } {
    const c = this.#labels
    const gaps: (readonly [string, string])[] = []
    return {
      [c + 7]: formulaCell(`=${near(3)}-${near(5)}`, GAP),
      [c + 8]: shares ? formulaCell(`=${near(4)}-${near(6)}`, GAP) : text(''),
      [c + 9]: () => {
        gaps.push([`ABS(${near(7)})`, this.#allowed('risk')])
        // shares of a small tracking error carry the rounding of the whole book
        if (shares)
          gaps.push([
            `ABS(${near(8)})`,
            `${this.#at('tolerance')}*MAX(1,${this.#at('gross risk')}/${this.#at('tracking error')})`,
          ])
        return this.#mark(gaps)
      },
    }
  }

  // ---- what is said about it

  #remarks(): void {
    const { breakdown, book } = this.#input
    const { estimation } = this.#reach
    if (estimation.kind === 'taken over') this.#notProven.unshift(`Covariances: ${estimation.why}.`)
    if (this.#shrinkage && !this.#derivesIntensity)
      this.#notProven.push('The shrinkage intensity: a constant here.')
    this.#notProven.push(...this.#takenOverOfTails())
    if (breakdown.nested.length > 0)
      this.#notProven.push('Groups within groups: they are sums of the contributions above.')
    if (breakdown.limits.length > 0)
      this.#notProven.push('The status of limits: compare the figures above with the limits themselves.')
    if (breakdown.currency) this.#notProven.push('The split by currency.')
    if (breakdown.factors) this.#notProven.push('The split by factors.')
    if (typeof breakdown.bands !== 'string') this.#notProven.push('Error bands and standard errors.')
    if (book.normality) this.#notProven.push('Tests of normality and the condition number.')
    this.#draft.add()
    this.#draft.add({ 0: text('What is not recomputed here', 'section') }, 'section')
    for (const sentence of this.#notProven) this.#note(sentence)
    if (this.#notProven.length === 0) this.#note('Nothing is left out.')
    this.#draft.add()
    this.#draft.add({ 0: text('Methods and their sources', 'section') }, 'section')
    for (const [label, source] of this.#sources())
      this.#draft.add({ 0: text(label), [this.#labels]: text(source) })
    for (const [label, value] of breakdown.settings)
      this.#draft.add({ 0: text(label), [this.#labels]: text(value) })
  }

  /** What of large losses stands as a constant, or not at all, under methods that are a multiple of the volatility. */
  #takenOverOfTails(): readonly string[] {
    const { tails } = this.#input.breakdown
    if (typeof tails === 'string') return []
    const { method } = tails.risk
    const parts =
      'Parts of the large losses: each is the contribution above times one figure for all holdings.'
    if (method.kind === 'normal') return [parts]
    if (method.kind !== 'student') return []
    const fitted = method.degrees === null ? 'The degrees of freedom, and the' : 'The'
    return [
      `${fitted} quantile of Student’s t distribution, on which the large losses rest: taken over. Its probability alone is recomputed.`,
      parts,
    ]
  }

  #sources(): readonly (readonly [string, string])[] {
    const { breakdown } = this.#input
    const { estimation } = this.#reach
    const lines: (readonly [string, string])[] = [
      [
        'Contributions to risk',
        'Euler allocation: Tasche (2008), Capital Allocation to Business Units and Sub-Portfolios: the Euler Principle, arXiv:0708.2542',
      ],
      [
        'Covariance with the portfolio',
        'The covariance of a holding with a weighted sum is the weighted sum of its covariances, so that one figure for each holding takes the place of a matrix. General.',
      ],
    ]
    if (estimation.kind === 'dates') {
      if (estimation.decay !== null)
        lines.push([
          'Exponential weighting',
          'Weighted means taken off, weights over their sum. Common practice.',
        ])
      if (estimation.lags > 0)
        lines.push([
          'Lagged terms',
          'Newey & West (1987), A Simple, Positive Semi-Definite, Heteroskedasticity and Autocorrelation Consistent Covariance Matrix, Econometrica 55(3), 703-708',
        ])
      if (estimation.shrinkage)
        lines.push([
          'Shrinkage',
          {
            identity:
              'Ledoit & Wolf (2004), A Well-Conditioned Estimator for Large-Dimensional Covariance Matrices, Journal of Multivariate Analysis 88(2), 365-411',
            correlation:
              'Ledoit & Wolf (2004), Honey, I Shrunk the Sample Covariance Matrix, Journal of Portfolio Management 30(4)',
            oas: 'Chen, Wiesel, Eldar & Hero (2010), Shrinkage Algorithms for MMSE Covariance Estimation, IEEE Transactions on Signal Processing 58(10)',
          }[estimation.shrinkage.target],
        ])
    }
    if (typeof breakdown.tails !== 'string')
      lines.push([
        'Expected shortfall',
        'Acerbi & Tasche (2002), On the Coherence of Expected Shortfall, Journal of Banking & Finance 26(7); its parts: Tasche (2008)',
      ])
    return lines
  }

  // ---- series and dates

  #series(): void {
    const { cells } = this.#reach
    if (cells === null || this.#seriesColumns.length === 0) return
    const { blocks, breakdown } = this.#input
    const { match } = blocks
    const products = this.#estimation.kind === 'matrix' ? this.#groupReturns : []
    this.#draft.add()
    this.#draft.add({ 0: text('In the order of the returns', 'section') }, 'section')
    const c = this.#labels
    const heads: { [column: number]: Late } = { 0: text('Series', 'head') }
    this.#seriesColumns.forEach(({ head }, k) => (heads[c + k] = text(head, 'head')))
    products.forEach(
      ({ label }, k) =>
        (heads[c + this.#seriesColumns.length + k] = text(`Covariance with ${label}`, 'head')),
    )
    this.#draft.add(heads, 'head')
    this.#seriesRows = { column: c, row: this.#draft.next, rows: cells.series.length }
    for (const series of cells.series) {
      const held = [...match.seriesOf.keys()].filter((i) => series >= 0 && match.seriesOf[i] === series)
      const row: { [column: number]: Late } = {
        0: text(
          held.length > 0
            ? held.map((i) => breakdown.names[i] ?? '').join(', ')
            : series < 0
              ? 'no series'
              : `${blocks.returns.names?.[series] ?? ''} (not held)`,
        ),
      }
      this.#seriesColumns.forEach(({ name, of }, k) => {
        row[c + k] = () => {
          const parts = held.map(of).filter((part) => part !== '')
          const format = name === 'standardised' || name === 'count' ? PLAIN : PERCENT
          return parts.length === 0 ? number(0, format) : formulaCell(`=${parts.join('+')}`, format)
        }
      })
      products.forEach(({ header, group }, k) => {
        row[c + this.#seriesColumns.length + k] =
          held.length === 0
            ? number(0, SMALL)
            : () =>
                formulaCell(
                  `=${cells.alongSeries(series, (from, count) => this.#draft.range(this.#seriesColumn(`group ${header} ${group}`), from, count)) ?? ''}`,
                  SMALL,
                )
      })
      this.#draft.add(row)
    }
  }

  #datesTable(): void {
    const { cells, rows, estimation } = this.#reach
    if (cells === null || rows === null) return
    const c = this.#labels
    const decay = estimation.kind === 'dates' ? estimation.decay : null
    this.#draft.add()
    this.#draft.add({ 0: text('Dates', 'section') }, 'section')
    if (this.#dateKeys.includes('multiplier'))
      this.#note(
        this.#lags > 0
          ? 'Multiplier: the return less its mean, and weights of the lags times those of the dates beside it, over the divisor. Its products with a holding’s returns, less the mean times the sum of multipliers, add up to the covariance.'
          : 'Multiplier: weight of the date times the return less its mean, over the divisor. Its products with a holding’s returns add up to the covariance.',
      )
    this.#note(
      'In the order of the sheet, one row for each of its rows (or columns) from the first date used to the last; a date that is not used has a weight of 0.',
    )
    const heads: { readonly [K in DateKey]: string } = {
      weight: 'Weight of the date',
      return: 'Return of the portfolio',
      centred: 'Less its mean',
      multiplier: 'Multiplier',
      tail: 'Weight in the tail',
      standardised: 'Sum of standard scores',
      length: 'Sum of squared deviations',
      active: 'Active return',
      'active centred': 'Less its mean',
      'active multiplier': 'Multiplier, active',
    }
    const row: { [column: number]: Late } = { 0: text('Date', 'head') }
    this.#dateKeys.forEach((key, k) => (row[c + k] = text(heads[key], 'head')))
    this.#groupReturns.forEach(
      ({ label }, k) => (row[c + this.#dateKeys.length + k] = text(`Return, ${label}`, 'head')),
    )
    this.#draft.add(row, 'head')
    const first = this.#draft.next
    this.#dates = { column: c, row: first, rows: cells.dates.length }
    /** place of each row that is used, by time */
    const placeOf = new Map(cells.dates.map((t, k) => [t, k]))
    const inTime = rows.map((t) => placeOf.get(t) ?? 0)
    const orderOf = new Map(inTime.map((place, order) => [place, order]))
    cells.dates.forEach((t, place) => {
      const order = orderOf.get(place)
      const dateCell = t < 0 ? null : cells.dateCell(t)
      const label: TableCell =
        t < 0 ? text('no date') : dateCell === null ? number(t + 1, COUNT) : formulaCell(`=${dateCell}`, DATE)
      const next: { [column: number]: Late } = { 0: label }
      this.#dateKeys.forEach((key, k) => {
        next[c + k] = this.#dateCell(key, order, place, t, inTime, decay)
      })
      this.#groupReturns.forEach(({ header, group }, k) => {
        next[c + this.#dateKeys.length + k] =
          order === undefined
            ? text('')
            : () => formulaCell(`=${this.#returnOf(t, `group ${header} ${group}`)}`, '0.0000%')
      })
      this.#draft.add(next)
    })
  }

  /** The return on one date at the weights of a column of the table of series. */
  #returnOf(t: number, name: string): string {
    const column = this.#seriesColumn(name)
    return this.#reach.cells!.alongSeries(t, (from, count) => this.#draft.range(column, from, count)) ?? ''
  }

  #dateCell(
    key: DateKey,
    order: number | undefined,
    place: number,
    t: number,
    inTime: readonly number[],
    decay: number | null,
  ): Late {
    const near = (of: DateKey, at = place): string => {
      const { column, row } = this.#dateColumn(of)
      return this.#draft.cell(row + at, column)
    }
    const isActive = key.startsWith('active')
    const mean = (): string => this.#at(isActive ? 'active mean' : 'mean')
    switch (key) {
      case 'weight': {
        if (order === undefined) return number(0, PLAIN)
        const newer = inTime[order + 1]
        return decay === null || newer === undefined
          ? number(1, PLAIN)
          : () => formulaCell(`=${this.#at('decay')}*${near('weight', newer)}`, '0.000000')
      }
      case 'return':
      case 'active':
      case 'standardised':
        if (order === undefined) return text('')
        return () =>
          formulaCell(
            `=${this.#returnOf(t, key === 'return' ? 'weight' : key)}`,
            key === 'standardised' ? RATIO : '0.0000%',
          )
      case 'length':
        if (order === undefined) return number(0, SMALL)
        return () => {
          const [count, mean] = [this.#seriesColumn('count'), this.#seriesColumn('mean')]
          const squares = this.#reach.cells!.alongSeries(
            t,
            (from, some) => this.#draft.range(count, from, some),
            (returns) => `${returns}^2`,
          )
          return formulaCell(
            `=${squares ?? ''}-2*(${this.#returnOf(t, 'mean')})+SUMSQ(${this.#draft.range(mean)})`,
            SMALL,
          )
        }
      case 'centred':
      case 'active centred':
        if (order === undefined) return number(0, '0.0000%')
        return () => formulaCell(`=${near(isActive ? 'active' : 'return')}-${mean()}`, '0.0000%')
      case 'multiplier':
      case 'active multiplier': {
        if (order === undefined) return number(0, SMALL)
        if (this.#lags === 0)
          return () =>
            formulaCell(
              `=${near('weight')}*(${near(isActive ? 'active' : 'return')}-${mean()})/${this.#at('divisor')}`,
              SMALL,
            )
        const of: DateKey = isActive ? 'active centred' : 'centred'
        return () => {
          const lagged = Array.from({ length: this.#lags }, (_, k) => {
            const beside = [inTime[order - k - 1], inTime[order + k + 1]].filter(
              (other) => other !== undefined,
            )
            return beside.length === 0
              ? []
              : [`${this.#at(`lag ${k + 1}`)}*(${beside.map((other) => near(of, other)).join('+')})`]
          }).flat()
          return formulaCell(`=(${[near(of), ...lagged].join('+')})/${this.#at('divisor')}`, SMALL)
        }
      }
      case 'tail':
        if (order === undefined) return number(0, PLAIN)
        return () => {
          const [var_, alike] = [this.#at('value at risk'), this.#at('alike')]
          const y = near('return')
          return formulaCell(
            `=IF(${y}<-${var_}-${alike},1,IF(${y}<=-${var_}+${alike},(${this.#at('observations')}-${this.#at('above')})/${this.#at('tied')},0))/${this.#at('observations')}`,
            PLAIN,
          )
        }
    }
  }
}
