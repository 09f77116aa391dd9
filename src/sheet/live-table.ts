import type { Estimator, TailMethod } from '../core'
import { Fault } from '../core'
import type { Area } from './cells'
import { addressOf, columnLetters, referenceOf } from './cells'
import { attempt, explain } from './explain'
import { worksheetFunctions } from './functions'
import type { Holding } from './holdings'
import type { ProofInput } from './proof'
import type { ReturnsReading } from './returns'
import type { EstimatorChoice } from './settings'
import type { Mark, Table, TableCell } from './table'
import { formulaCell as formula, textCell as text } from './table'
import { CAUTION, listOf, POSITION_HEADS, quote } from './wording'

const PERCENT = '0.00%'
const SHARE = '0.0%'
const RATIO = '0.00'
const ROUNDING = '0.0E+00'
const DATE = 'd mmm yyyy'
const PLAIN = 'General'

/** Columns of BREAKDOWN and of GROUPED by their formats; the first is text, which the format of a cell with a formula must not say. */
const BREAKDOWN_FORMATS = [PLAIN, PERCENT, PERCENT, PERCENT, PERCENT, SHARE, RATIO, RATIO] as const
const GROUPED_FORMATS = [PLAIN, PERCENT, PERCENT, PERCENT, SHARE] as const
/** Heads that functions spill have room on one line in any usual font: a row does not grow with what is calculated. */
const WIDTHS = [36, 13, 21, 37, 25, 16, 22, 33] as const

/** Rows kept free below a table by group, for labels that come to be. Our own convention. */
const SPARE = 3

/** Why cells cannot do it: becomes a sentence. */
class Refusal extends Error {}

const refuse = (reason: string): never => {
  throw new Refusal(reason)
}

/**
 * Lays a table of worksheet functions out, live by the workbook's own calculation: the figures of the book, its positions and its groups from the
 * user's own cells, and the settings as constants that may be changed. Where names, weights or groups do not lie as the functions take them
 * (amounts, rows of totals in between, another order than the returns), they are brought into that order by formulas at the end of the table.
 *
 * Before anything is laid out the functions are asked for the volatility, with what the cells hold: a table that would not give the
 * figures of the breakdown is refused.
 *
 * @param at where its top-left cell will lie
 * @returns  or the sentence why cells cannot do it
 * @cost     as two models of the returns
 */
export function liveTable(input: ProofInput, at: Area): Table | string {
  try {
    const risk = riskOf(input)
    const positions = positionsOf(input, risk)
    const settings = functionSettings(input)
    refuseOtherFigures(input, risk, settings)
    return laidOut(input, at, risk, positions, settings)
  } catch (error) {
    if (error instanceof Refusal) return error.message
    throw error
  }
}

// ---- the block of returns, prices or covariances

interface RiskCells {
  /** the argument "risk" */
  readonly reference: string
  /** the series of each of its columns */
  readonly series: readonly number[]
  /** dates it holds, as they are used; none for a covariance matrix */
  readonly rows: readonly number[]
  /** where the first and the last date stand; null where there are none */
  readonly dates: readonly [Area, Area] | null
  /** what it is and where, in words */
  readonly words: string
}

/** A place along dates and across series, whichever way the block lies. */
interface Spot {
  readonly along: number
  readonly across: number
}

class Layout {
  readonly #across: boolean

  constructor(readonly returns: ReturnsReading) {
    this.#across = returns.orientation === 'dates across'
  }

  spot({ row, column }: Area): Spot {
    return this.#across ? { along: column, across: row } : { along: row, across: column }
  }

  area(from: Spot, to: Spot): Area {
    const [row, column] = this.#across ? [from.across, from.along] : [from.along, from.across]
    const [lastRow, lastColumn] = this.#across ? [to.across, to.along] : [to.along, to.across]
    return {
      sheet: this.returns.area.sheet,
      row,
      column,
      rows: lastRow - row + 1,
      columns: lastColumn - column + 1,
    }
  }

  /** as an argument, dates down */
  reference(area: Area): string {
    return this.#across ? `TRANSPOSE(${referenceOf(area)})` : referenceOf(area)
  }
}

function riskOf({ blocks, book, settings }: ProofInput): RiskCells {
  const { returns, match } = blocks
  if (settings.estimator.kind === 'factors' || book.factors)
    return refuse('The factor model has no worksheet function.')
  if (book.rule !== 'common dates')
    return refuse(
      'Worksheet functions take dates that all holdings share: the rule chosen for gaps has no part in them.',
    )
  if (match.currencies?.returnsIn === 'local')
    return refuse(
      `Returns are brought to ${match.currencies.base} from local currencies first, for which there is no worksheet function.`,
    )
  const held = [...match.seriesOf].filter((series) => series >= 0)
  if (held.length === 0) return refuse('No holding has returns.')
  if (new Set(held).size < held.length)
    return refuse(
      'Two holdings go with one series of the returns, and worksheet functions take one column each.',
    )
  const layout = new Layout(returns)
  return returns.content === 'covariance'
    ? matrixCells(layout, held)
    : returnCells(layout, held, book.data?.rows ?? [], settings.estimator)
}

/** The series of every place from the first held one to the last. */
function seriesBetween(
  layout: Layout,
  held: readonly number[],
): { readonly first: number; readonly series: readonly number[] } {
  const { returns } = layout
  const seriesAt = new Map(
    Array.from({ length: returns.columns }, (_, i) => [layout.spot(returns.seriesCell(i)).across, i]),
  )
  const places = held.map((i) => layout.spot(returns.seriesCell(i)).across)
  const first = Math.min(...places)
  const series = Array.from(
    { length: Math.max(...places) - first + 1 },
    (_, k) => seriesAt.get(first + k) ?? -1,
  )
  if (series.includes(-1))
    return refuse(
      `${addressOf(returns.area)}: an empty column lies between the series, and worksheet functions take a block without gaps.`,
    )
  return { first, series }
}

function matrixCells(layout: Layout, held: readonly number[]): RiskCells {
  const { returns } = layout
  const { first, series } = seriesBetween(layout, held)
  const lines = series.map((i) => layout.spot(returns.cell(i, series[0]!)).along)
  if (lines.some((line, k) => line !== lines[0]! + k))
    return refuse('The rows of the covariance matrix lie in another order than its columns.')
  const area = layout.area(
    { along: lines[0]!, across: first },
    { along: lines.at(-1)!, across: first + series.length - 1 },
  )
  return {
    reference: layout.reference(area),
    series,
    rows: [],
    dates: null,
    words: `Covariance matrix in ${addressOf(area)}`,
  }
}

function returnCells(
  layout: Layout,
  held: readonly number[],
  rows: readonly number[],
  estimator: EstimatorChoice,
): RiskCells {
  const { returns } = layout
  const { first, series } = seriesBetween(layout, held)
  const isPrices = returns.content === 'prices'
  for (const i of series)
    for (const t of rows)
      if (!returns.isNumber(t, i)) {
        const where = `${addressOf(returns.cell(t, i))}: `
        return refuse(
          held.includes(i)
            ? `${where}worksheet functions read no number typed as text.`
            : `${where}a series that is not held lies between the others and has a gap, which worksheet functions do not pass over.`,
        )
      }
  if (estimator.kind === 'shrinkage' && series.length > held.length)
    return refuse(
      `${listOf(series.filter((i) => !held.includes(i)).map((i) => quote(returns.names?.[i] ?? `series ${i + 1}`)))} lies between the series that are held, and would have a part in the shrinkage.`,
    )

  const some = series[0]!
  const start = isPrices ? returns.before(rows[0]!, some) : null
  const places = [...(start ? [start] : []), ...rows.map((t) => returns.cell(t, some))].map(
    (area) => layout.spot(area).along,
  )
  const step = places.length > 1 ? Math.sign(places[1]! - places[0]!) : 1
  const gap = places.findIndex((place, k) => place !== places[0]! + k * step)
  if (gap >= 0) {
    const area = returns.cell(rows[Math.max(0, gap - (start ? 1 : 0))]!, some)
    return refuse(
      `${addressOf(area)}: dates before it are left out or lie elsewhere, and worksheet functions take rows without gaps.`,
    )
  }
  const top = Math.min(places[0]!, places.at(-1)!)
  const end = { along: Math.max(places[0]!, places.at(-1)!), across: first + series.length - 1 }
  const dated = returns.dates !== null
  const newestFirst = step < 0
  const needsOrder =
    newestFirst && (isPrices || estimator.kind === 'exponential' || estimator.kind === 'lagged')
  const side = dated ? layout.spot(returns.cell(rows[0]!, -1)).across : -1
  // names and dates together tell the functions the order of the rows
  const all = series[0] === 0 && side === first - 1
  if (needsOrder && !(dated && all && returns.names && layout.spot(returns.seriesCell(0)).along === top - 1))
    return refuse(
      'The dates run from the newest to the oldest, and their names and dates do not lie right beside them: worksheet functions would take the oldest for the newest.',
    )
  const area = needsOrder
    ? layout.area({ along: top - 1, across: side }, end)
    : layout.area({ along: top, across: first }, end)
  const reference = layout.reference(area)
  return {
    reference: isPrices
      ? `POISE.RETURNS(${reference}${returns.returnKind === 'log' ? ',"log"' : ''})`
      : reference,
    series,
    rows,
    dates: dated ? [returns.cell(rows[0]!, -1), returns.cell(rows.at(-1)!, -1)] : null,
    words: `${isPrices ? 'Prices' : 'Returns'} in ${addressOf(area)}`,
  }
}

// ---- holdings

/** One row for each column of the risk, in its order. */
interface Position {
  /** null for a series that is not held */
  readonly holding: Holding | null
  readonly name: string
}

interface Positions {
  readonly list: readonly Position[]
  readonly riskless: readonly Holding[]
  /** the cells of names, weights and groups where the functions can take them as they lie; null where they are brought into order first */
  readonly direct: { readonly names: Area; readonly weights: Area; readonly groups: readonly Area[] } | null
}

function positionsOf({ blocks }: ProofInput, { series }: RiskCells): Positions {
  const { holdings, match, returns } = blocks
  const held = holdings.holdings
  const holdingOf = new Map([...match.seriesOf].map((s, i) => [s, held[i]!]))
  const list = series.map((s): Position => {
    const holding = holdingOf.get(s) ?? null
    return { holding, name: holding?.name ?? returns.names?.[s] ?? `Series ${s + 1}` }
  })
  for (const { name, cells } of held)
    if (!cells?.measure)
      return refuse(
        `The weight of ${quote(name)} is typed as text or stands in no cell, so that no formula can read it.`,
      )
  const riskless = held.filter((_, i) => (match.seriesOf[i] ?? -1) < 0)
  return { list, riskless, direct: directCells(list, riskless, holdings) }
}

function directCells(
  list: readonly Position[],
  riskless: readonly Holding[],
  { capital, groupHeaders }: ProofInput['blocks']['holdings'],
): Positions['direct'] {
  if (riskless.length > 0 || capital !== null) return null
  const column = (cellAt: (holding: Holding) => Area | null | undefined): Area | null => {
    const cells = list.map(({ holding }) => holding && cellAt(holding))
    const first = cells[0]
    if (!first) return null
    const runs = cells.every(
      (cell, k) =>
        cell && cell.sheet === first.sheet && cell.column === first.column && cell.row === first.row + k,
    )
    return runs ? { ...first, rows: cells.length } : null
  }
  const names = column(({ cells }) => cells?.name)
  const weights = column(({ cells }) => cells?.measure)
  const groups = groupHeaders.map((_, k) => column(({ cells }) => cells?.groups[k]))
  return names && weights && groups.every((area) => area !== null)
    ? { names, weights, groups: groups as readonly Area[] }
    : null
}

// ---- settings

interface FunctionSettings {
  readonly periods: number
  readonly estimator: string
  /** null where there are no figures of large losses */
  readonly tails: { readonly confidence: number; readonly periods: number; readonly method: string } | null
}

const methodText = (method: TailMethod): string =>
  method.kind === 'student' && method.degrees !== null ? `student ${method.degrees}` : method.kind

function estimatorWords(estimator: Exclude<EstimatorChoice, { kind: 'factors' }>): string {
  switch (estimator.kind) {
    case 'exponential':
      return `exponential ${estimator.decay}`
    case 'shrinkage':
      return `shrink ${estimator.target}`
    case 'lagged':
      return `lagged ${estimator.lags}`
    case 'sample':
      return 'sample'
    case 'population':
      return refuse('Worksheet functions divide the sample covariance by the number of dates less 1.')
  }
}

function functionSettings({ blocks, settings, breakdown }: ProofInput): FunctionSettings {
  const { estimator } = settings
  const { tails } = breakdown
  return {
    periods: breakdown.decomposition.periodsPerYear,
    // a covariance matrix is taken as given, and factors are refused before
    estimator:
      blocks.returns.content === 'covariance' || estimator.kind === 'factors'
        ? 'sample'
        : estimatorWords(estimator satisfies Estimator),
    tails:
      typeof tails === 'string'
        ? null
        : {
            confidence: settings.tails.confidence,
            periods: settings.tails.periods,
            method: methodText(settings.tails.method),
          },
  }
}

// ---- whether the functions give the same figures

/** Figures that differ by less are the same, summed in another order. */
const SAME = 1e-10

function refuseOtherFigures(
  { blocks, breakdown }: ProofInput,
  risk: RiskCells,
  settings: FunctionSettings,
): void {
  const { returns, match } = blocks
  const { decomposition: d } = breakdown
  const holdingOf = new Map([...match.seriesOf].map((s, i) => [s, i]))
  const lines = returns.content === 'covariance' ? risk.series : risk.rows
  const block = lines.map((t) => risk.series.map((s) => returns.values[t * returns.columns + s]!))
  const weights = risk.series.map((s) => [d.weights[holdingOf.get(s) ?? -1] ?? 0])
  const { value, fault } = attempt(() =>
    (worksheetFunctions['VOLATILITY'] as (...args: unknown[]) => number)(
      weights,
      block,
      settings.periods,
      settings.estimator,
    ),
  )
  if (fault)
    return refuse(`Worksheet functions do not take these cells. ${explain(placed(fault, risk, returns))}`)
  if (Math.abs(value - d.volatility) > SAME * d.volatility)
    return refuse('Worksheet functions would give another volatility than the pane from these cells.')
}

/** A fault of the block, told by its cell. */
function placed(fault: Fault, { rows, series }: RiskCells, returns: ReturnsReading): Fault {
  const { row, column } = fault.where
  const [t, s] = [rows[row ?? -1], series[column ?? -1]]
  if (t === undefined || s === undefined) return fault
  return new Fault(fault.code, `${addressOf(returns.cell(t, s))}: ${fault.found}`, fault.needed)
}

// ---- the table

/** Rows of a table that are made when all of it has its place, as formulas above speak of cells below. */
class Sheet {
  readonly width: number
  readonly #at: Area
  readonly #lines: (() => readonly TableCell[])[] = []

  constructor(at: Area, width: number) {
    this.#at = at
    this.width = width
  }

  /** the row that comes next */
  get next(): number {
    return this.#lines.length
  }

  add(line: () => readonly TableCell[]): void {
    this.#lines.push(line)
  }

  say(...cells: readonly TableCell[]): void {
    this.add(() => cells)
  }

  /** Cells of the table itself, as its formulas call them. */
  own(row: number, column: number, rows = 1): string {
    const letters = columnLetters(this.#at.column + column)
    const cell = (k: number): string => `$${letters}$${this.#at.row + row + k + 1}`
    return rows === 1 ? cell(0) : `${cell(0)}:${cell(rows - 1)}`
  }

  /** A formula that fills so many rows, headings first and a total last, with spare rows below that stay blank. */
  spill(call: () => string, formats: readonly string[], rows: number, spare = 0): void {
    for (let r = 0; r < rows + spare; r++) {
      const mark: Mark | undefined = r === 0 ? 'head' : r === rows - 1 ? 'total' : undefined
      this.add(() =>
        formats.map((format, c) =>
          r === 0 && c === 0
            ? formula(call(), PLAIN, 'head')
            : { value: '', format: r === 0 ? PLAIN : format, ...(mark ? { mark } : {}) },
        ),
      )
    }
  }

  cells(): readonly (readonly TableCell[])[] {
    return this.#lines.map((line) => {
      const cells = line()
      const mark = cells[0]?.mark === 'section' ? cells[0].mark : undefined
      return [...cells, ...Array.from({ length: this.width - cells.length }, () => text('', mark))]
    })
  }
}

/** The rows of the settings, by what formulas call them. */
type SettingKey = 'periods' | 'estimator' | 'confidence' | 'ahead' | 'method' | 'capital'

function laidOut(
  { title, blocks, breakdown, settings: chosen, capital: followed }: ProofInput,
  at: Area,
  risk: RiskCells,
  { list, riskless, direct }: Positions,
  settings: FunctionSettings,
): Table {
  const { groupHeaders, capital } = blocks.holdings
  const sheet = new Sheet(at, Math.max(WIDTHS.length, 2 + groupHeaders.length))
  const n = list.length
  const settingRows = new Map<SettingKey, number>()
  let ordered = 0
  const of = (key: SettingKey): string => sheet.own(settingRows.get(key) ?? 0, 1)
  const names = (): string => (direct ? referenceOf(direct.names) : sheet.own(ordered, 0, n))
  const weights = (): string => (direct ? referenceOf(direct.weights) : sheet.own(ordered, 1, n))
  const allWeights = (): string => (direct ? weights() : sheet.own(ordered, 1, n + riskless.length))
  const groups = (k: number): string => {
    const area = direct?.groups[k]
    return area ? referenceOf(area) : sheet.own(ordered, 2 + k, n)
  }
  const call = (name: string, ...given: readonly string[]): string => `=POISE.${name}(${given.join(',')})`
  const section = (heading: string): void => {
    sheet.say()
    sheet.say(text(heading, 'section'))
  }
  const line = (label: string, cell: () => TableCell, remark: () => TableCell = () => text('')): void =>
    sheet.add(() => [text(label), cell(), { ...remark(), indent: 1 }])

  sheet.say(text(`Contributions to risk, live: ${title}`, 'title'))
  sheet.say(
    text(
      'Live: the workbook’s own calculation works these figures out from the cells they come from, with the functions of this add-in (POISE), and needs the add-in for it.',
    ),
  )
  sheet.say(text(CAUTION, 'note'))
  sheet.say(text(breakdown.sharesWithheld ?? '', 'alert'))

  section('The book')
  const horizon = (): TableCell =>
    formula(
      `=IF(${of('periods')}=1,"per period","a year: per period times the square root of the periods a year")`,
      PLAIN,
    )
  const remark = (words: string) => () => text(words)
  line(
    'Volatility',
    () => formula(call('VOLATILITY', weights(), risk.reference, of('periods'), of('estimator')), PERCENT),
    horizon,
  )
  line(
    'Diversification ratio',
    () => formula(call('DIVERSIFICATION', weights(), risk.reference, of('estimator')), RATIO),
    remark('Sum of stand-alone risks over total'),
  )
  line(
    'Effective number of positions',
    () => formula(call('EFFECTIVE', weights(), risk.reference, of('estimator')), '0.0'),
    remark('By risk: one over the sum of squared shares of risk; says little while a share is negative'),
  )
  if (settings.tails) {
    const given = (): readonly string[] => [
      weights(),
      risk.reference,
      of('confidence'),
      of('ahead'),
      of('method'),
      of('estimator'),
    ]
    const loss = remark(
      'A loss, as a part of capital, at the confidence, over the periods and by the method below',
    )
    line('Value at risk', () => formula(call('VALUEATRISK', ...given()), PERCENT), loss)
    if (typeof breakdown.tails !== 'string' && breakdown.tails.risk.shortfall !== null)
      line('Expected shortfall', () => formula(call('SHORTFALL', ...given()), PERCENT), loss)
  }
  line('Net weight', () => formula(`=SUM(${allWeights()})`, PERCENT), remark('of capital'))
  line('Gross weight', () => formula(`=SUMPRODUCT(ABS(${allWeights()}))`, PERCENT), remark('of capital'))

  section('Settings: typed, and may be changed here')
  const setting = (key: SettingKey, label: string, cell: TableCell, words = ''): void => {
    settingRows.set(key, sheet.next)
    line(label, () => cell, remark(words))
  }
  setting('periods', 'Periods a year', { value: settings.periods, format: PLAIN }, '1: figures per period')
  setting('estimator', 'Estimator', { value: settings.estimator, format: PLAIN })
  if (settings.tails) {
    const { confidence, periods, method } = settings.tails
    setting('confidence', 'Confidence', { value: confidence, format: '0.0#%' })
    setting('ahead', 'Periods ahead', { value: periods, format: PLAIN })
    setting('method', 'Method for large losses', { value: method, format: PLAIN })
  }
  if (capital !== null)
    setting(
      'capital',
      'Capital',
      ...(followed
        ? ([formula(`=${referenceOf(followed)}`, '#,##0.00'), 'from its own cell'] as const)
        : capitalCell(blocks.holdings.holdings, capital, chosen.capital !== null)),
    )

  section('Data')
  sheet.say(
    text(
      `${risk.words}. Columns belong to weights by their place; rows added at the end are not taken in by themselves.`,
    ),
  )
  if (risk.dates) {
    const [first, last] = risk.dates
    line('First date', () => formula(`=${referenceOf(first)}`, DATE))
    line('Last date', () => formula(`=${referenceOf(last)}`, DATE))
  }
  const strangers = list.filter(({ holding }) => holding === null).map(({ name }) => quote(name))
  if (strangers.length > 0)
    sheet.say(
      text(
        `${listOf(strangers)} ${strangers.length === 1 ? 'is' : 'are'} not held and ${strangers.length === 1 ? 'stands' : 'stand'} with a weight of 0, as the functions take a block without gaps.`,
      ),
    )
  if (riskless.length > 0)
    sheet.say(
      text(
        `${listOf(riskless.map(({ name }) => quote(name)))} ${riskless.length === 1 ? 'is' : 'are'} riskless by your mark: without a row among the positions, as there are no returns, but part of net and gross weight.`,
      ),
    )
  sheet.say(
    text('Error bands, limits, the benchmark and currencies are in the table of values alone.', 'note'),
  )

  section('Positions')
  const top = sheet.next
  sheet.spill(
    () => call('BREAKDOWN', names(), weights(), risk.reference, of('periods'), of('estimator')),
    BREAKDOWN_FORMATS,
    n + 2,
  )
  const underContribution = (label: string, formulaText: () => string, format: string): void =>
    sheet.add(() => [
      text(label),
      ...Array.from({ length: CONTRIBUTION - 1 }, () => text('')),
      formula(formulaText(), format),
    ])
  const sumOfParts = (): string => `SUM(${sheet.own(top + 1, CONTRIBUTION, n)})`
  underContribution('Sum of parts', () => `=${sumOfParts()}`, PERCENT)
  // from what is spilled itself: a formula of a formula of spilled cells is worked out too soon by some engines
  underContribution('Difference', () => `=${sumOfParts()}-${sheet.own(top + n + 1, CONTRIBUTION)}`, ROUNDING)

  breakdown.byGroup.forEach(({ header, labels }, k) => {
    section(`By ${header}`)
    sheet.spill(
      () => call('GROUPED', groups(k), weights(), risk.reference, of('periods'), of('estimator')),
      GROUPED_FORMATS,
      labels.length + 2,
      SPARE,
    )
  })

  if (!direct) {
    section('Names, weights and groups in the order of the returns, from the cells of the holdings')
    sheet.say(...['Holding', 'Weight', ...groupHeaders].map((heading) => text(heading, 'head')))
    ordered = sheet.next
    const all = [...list, ...riskless.map((holding) => ({ holding, name: holding.name }))]
    for (const position of all)
      sheet.add(() => orderedCells(position, groupHeaders.length, capital === null ? null : of('capital')))
  }
  return {
    cells: sheet.cells(),
    widths: Array.from({ length: sheet.width }, (_, k) => WIDTHS[k] ?? 14),
    numeric: Array.from({ length: sheet.width }, (_, k) => k > 0),
    page: {
      paper: 'A4',
      orientation: 'landscape',
      onePage: false,
      header: { left: `Contributions to risk, live: ${title}`, right: '' },
      footer: CAUTION,
    },
  }
}

/** The column of contributions in what BREAKDOWN spills. */
const CONTRIBUTION = 1 + POSITION_HEADS.indexOf('Contribution to risk')

/** A holding as formulas that read its cells; what stands in none of its own is typed. */
function orderedCells(
  { holding, name }: Position,
  groups: number,
  capital: string | null,
): readonly TableCell[] {
  const cells = holding?.cells
  const label = (area: Area | null | undefined, typed: string): TableCell =>
    // what is joined to a blank stays blank, where a blank alone would count as 0
    area ? formula(`=${referenceOf(area)}&""`, PLAIN) : text(typed)
  return [
    label(cells?.name, name),
    cells?.measure
      ? formula(`=${referenceOf(cells.measure)}${capital === null ? '' : `/${capital}`}`, PERCENT)
      : { value: 0, format: PERCENT },
    ...Array.from({ length: groups }, (_, k) => label(cells?.groups[k], holding?.groups[k] ?? '')),
  ]
}

/** More cells than this are not listed one by one in a formula. A host takes 255 arguments. */
const MOST_CELLS = 200

/** What amounts are divided by: the sum of their cells where it is that, else a number typed here; and what has to be said beside it. */
function capitalCell(
  holdings: readonly Holding[],
  capital: number,
  isChosen: boolean,
): readonly [TableCell, string] {
  const amounts = holdings.flatMap(({ cells, amount }) =>
    cells?.amount && amount !== null ? [cells.amount] : [],
  )
  const sum = holdings.reduce((total, { amount }) => total + (amount ?? 0), 0)
  const isSum = !isChosen && Math.abs(sum - capital) <= 1e-12 * Math.abs(capital)
  const first = amounts[0]
  if (!isSum || !first || amounts.length < holdings.filter(({ amount }) => amount !== null).length)
    return [{ value: capital, format: '#,##0.00' }, 'typed: as the pane has it']
  const runs = amounts.every(({ column, row }, k) => column === first.column && row === first.row + k)
  if (!runs && amounts.length > MOST_CELLS)
    return [{ value: capital, format: '#,##0.00' }, 'typed: the sum of the amounts']
  const cells = runs ? referenceOf({ ...first, rows: amounts.length }) : amounts.map(referenceOf).join(',')
  return [formula(`=SUM(${cells})`, '#,##0.00'), 'the sum of the amounts']
}
