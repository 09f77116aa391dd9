import type { ChangeLine, ChangeParts, RiskChange } from './risk-change'
import type { SnapshotHead } from './snapshot'
import type { ChartSeries, Mark, PageSetup, Span, Table, TableCell, TableChart } from './table'
import { numberCell, setIn, textCell as text } from './table'
import { CAUTION, countOf, dateText, percentText } from './wording'

/** One step on the way from one volatility to the other. */
export interface ChangeStep {
  readonly label: string
  /** where it begins and ends, as volatilities; equal for a level */
  readonly start: number
  readonly end: number
  /** one of the two volatilities, and no part */
  readonly isLevel: boolean
}

/**
 * From one volatility to the other, cause by cause: settings, drift and trades or else positions, volatilities, correlations; what is not split is
 * one step.
 *
 * @example changeSteps({ from: { volatility: .1 }, to: { volatility: .12 }, settings: null, total: 'no data', change: .02 }).map(({ label }) => label) // ["From", "Not split", "To"]
 */
export function changeSteps(
  change: Pick<RiskChange, 'settings' | 'total' | 'change'> & {
    readonly from: Pick<SnapshotHead, 'volatility'>
    readonly to: Pick<SnapshotHead, 'volatility'>
  },
): readonly ChangeStep[] {
  const { from, to, settings, total } = change
  const effect = settings?.effect ?? null
  const parts: readonly (readonly [label: string, by: number])[] = [
    ...(effect === null ? [] : [['Settings', effect] as const]),
    ...(typeof total === 'string'
      ? [['Not split', change.change - (effect ?? 0)] as const]
      : partsOf(total).map(([key, label]) => [label, total[key] ?? 0] as const)),
  ]
  const level = (label: string, at: number): ChangeStep => ({ label, start: at, end: at, isLevel: true })
  let at = from.volatility
  return [
    level('From', at),
    ...parts.map(([label, by]): ChangeStep => ({ label, start: at, end: (at += by), isLevel: false })),
    level('To', to.volatility),
  ]
}

/** Parts in the order they are told; positions by what moved them, where that is known. */
const partsOf = ({ drift, trades }: Pick<ChangeParts, 'drift' | 'trades'>) =>
  [
    ...(drift === null || trades === null
      ? [['positions', 'Positions'] as const]
      : [['drift', 'Drift of weights'] as const, ['trades', 'Trades'] as const]),
    ['volatilities', 'Volatilities'] as const,
    ['correlations', 'Correlations'] as const,
  ] satisfies readonly (readonly [keyof ChangeParts, string])[]

const WEIGHT = '0.00%'
const ROUNDING = '0.0E+00'
const DATE = 'd mmm yyyy'

/** Decimals that show parts of a volatility by the year as well as those of a volatility per day. */
const digitsOf = ({ from, to }: RiskChange): number => {
  const larger = Math.max(from.volatility, to.volatility)
  return larger >= 0.02 ? 2 : larger >= 0.002 ? 3 : 4
}

interface Formats {
  readonly level: string
  readonly change: string
}

const formatsOf = (digits: number): Formats => {
  const level = `0.${'0'.repeat(digits)}%`
  return { level, change: `+${level};-${level};${level}` }
}

/** The columns of figures of a holding or group. */
interface Column {
  readonly head: string
  readonly format: string
  readonly of: (line: ChangeLine) => number | null
  /** whether the column adds up */
  readonly adds: boolean
}

function columnsOf(change: RiskChange, { level, change: signed }: Formats): readonly Column[] {
  const { total, settings } = change
  const adds = true
  const moved = (line: ChangeLine): number => line.contributionTo - line.contributionFrom
  const facts: readonly Column[] = [
    { head: 'Weight, from', format: WEIGHT, of: ({ weightFrom }) => weightFrom, adds },
    { head: 'Weight, to', format: WEIGHT, of: ({ weightTo }) => weightTo, adds },
    { head: 'Volatility, from', format: level, of: ({ volatilityFrom }) => volatilityFrom, adds: false },
    { head: 'Volatility, to', format: level, of: ({ volatilityTo }) => volatilityTo, adds: false },
    { head: 'Contribution, from', format: level, of: ({ contributionFrom }) => contributionFrom, adds },
    { head: 'Contribution, to', format: level, of: ({ contributionTo }) => contributionTo, adds },
    { head: 'Change of contribution', format: signed, of: moved, adds },
  ]
  if (typeof total === 'string') return facts
  const effect: readonly Column[] =
    settings === null ? [] : [{ head: 'Settings', format: signed, of: ({ settings: part }) => part, adds }]
  const parts = partsOf(total).map(([key, head]): Column => ({
    head,
    format: signed,
    of: (line) => line[key],
    adds,
  }))
  const rest = (line: ChangeLine): number =>
    line.settings + line.positions + line.volatilities + line.correlations - moved(line)
  return [
    ...facts,
    ...effect,
    ...parts,
    { head: 'Sum of parts less change', format: ROUNDING, of: rest, adds },
  ]
}

const PRESENCE: { readonly [P in ChangeLine['presence']]: string } = {
  both: '',
  new: 'new',
  gone: 'gone',
}

/** Rows that the picture takes up, and columns. */
const PICTURE = { rows: 16, columns: 8 } as const

/**
 * Lays a comparison out as a table to be written: both results, the way from one volatility to the other with its sum, difference and picture, holdings,
 * groups, settings that changed, notes, settings of both, caution. Figures are those of the moment: the table does not follow.
 *
 * @returns holdings in their order in the later result, those that are gone after them
 * @cost    O(holdings + groups)
 */
export function changeTable(title: string, change: RiskChange, paper: PageSetup['paper'] = 'A4'): Table {
  const { from, to, total, settings, horizon, notes } = change
  const digits = digitsOf(change)
  const formats = formatsOf(digits)
  const columns = columnsOf(change, formats)
  const width = 2 + Math.max(columns.length, 9)
  const cells: TableCell[][] = []
  const add = (...row: readonly TableCell[]): void => {
    const mark = row[0]?.mark
    const rest = text('', mark === 'section' || mark === 'head' || mark === 'total' ? mark : undefined)
    cells.push([...row, ...Array.from({ length: width - row.length }, () => rest)])
  }
  const section = (heading: string): void => {
    add()
    add(text(heading, 'section'))
  }
  const number = (value: number | null, format: string, mark?: Mark): TableCell =>
    numberCell(value, format, mark)
  const widths = [28, ...Array.from({ length: width - 2 }, () => 13), 10]
  const room = widths.reduce((sum, characters) => sum + characters, 0)
  /** running text, in as many rows as it takes */
  const say = (sentence: string, mark?: Mark): void => {
    for (const line of linesWithin(room, sentence)) add(text(line, mark))
  }
  const tell = (label: string, value: string): void => {
    linesWithin(room - 28, value).forEach((line, k) => {
      add(text(k === 0 ? label : ''), text(line))
    })
  }

  add(text(`What changed: ${title}`, 'title'))
  say(`${summaryOf(change, digits)} Volatilities and contributions are ${horizonText(horizon)}.`)
  add(text(CAUTION, 'note'))
  if (typeof total === 'string') say(`Not split by cause. ${total}`, 'alert')

  section('Results compared')
  add(
    ...['', 'Volatility', 'Holdings', 'Kept on', 'Data to'].map((label) => text(label, 'head')),
    // over texts, which begin at the left; the notes stand a little in, as they follow dates
    { ...text('Note', 'section'), indent: 1 },
    ...['', '', 'Title'].map((label) => text(label, 'section')),
    ...Array.from({ length: width - 9 }, () => text('', 'head')),
  )
  for (const [label, side] of [
    ['From', from],
    ['To', to],
  ] as const)
    // prettier-ignore
    add(
      text(label),
      number(side.volatility, formats.level),
      number(side.positions, '0'),
      'isNow' in side && side.isNow ? text('not kept') : number(side.keptOn, DATE),
      side.dataDate === null ? text('no dates') : number(side.dataDate, DATE),
      text(side.note === '' ? 'None' : side.note),
      ...['', ''].map((gap) => text(gap)),
      text(side.title),
    )

  const charts = [addSteps(change, formats, horizon, cells, { add, section, number })]

  section('Holdings')
  addLines('Holding', change.holdings, columns, { add, number })
  for (const { header, lines } of change.groups) {
    section(`By ${header}`)
    addLines(header, lines, columns, { add, number })
  }

  if (settings) {
    section('Settings that changed')
    say(settings.sentence)
    for (const { label, from: was, to: is } of settings.changed) {
      tell(label, `From: ${was}`)
      tell('', `To: ${is}`)
    }
  }
  section('Notes')
  for (const note of notes) say(note)
  if (notes.length === 0) add(text('None'))
  section('Reading')
  for (const sentence of readingOf(change)) say(sentence)
  section('Settings of the result compared to')
  for (const [label, value] of change.settingLines.to) tell(label, value)
  const later = new Map(change.settingLines.to)
  const others = change.settingLines.from.filter(([label, value]) => later.get(label) !== value)
  section('Settings of the result compared from, where they read otherwise')
  for (const [label, value] of others) tell(label, value)
  if (others.length === 0) add(text('None'))

  return {
    cells: setIn(cells),
    widths,
    numeric: Array.from({ length: width }, (_, k) => k > 0 && k < width - 1),
    charts,
    page: {
      paper,
      orientation: 'landscape',
      onePage: false,
      header: { left: `What changed: ${title}`, right: datesText(change) },
      footer: CAUTION,
    },
  }
}

/** A text in lines of so many characters, broken between words: print ends where the table does. */
function linesWithin(most: number, sentence: string): readonly string[] {
  const lines: string[] = []
  for (const word of sentence.split(' ')) {
    const last = lines.at(-1)
    if (last === undefined || last.length + 1 + word.length > most) lines.push(word)
    else lines[lines.length - 1] = `${last} ${word}`
  }
  return lines
}

interface Writing {
  readonly add: (...row: readonly TableCell[]) => void
  readonly section: (heading: string) => void
  readonly number: (value: number | null, format: string, mark?: Mark) => TableCell
}

const horizonText = (horizon: RiskChange['horizon']): string =>
  horizon === 'a year' ? 'by the year' : 'per period of the data'

const pointsText = (value: number, digits: number): string =>
  `${value > 0 ? '+' : ''}${percentText(value, digits)}`

function summaryOf(change: RiskChange, digits: number): string {
  const { from, to } = change
  return `Volatility ${change.horizon} from ${percentText(from.volatility, digits)} to ${percentText(to.volatility, digits)}: ${pointsText(change.change, digits)} in points of volatility.`
}

function datesText({ from, to }: RiskChange): string {
  const day = ({ dataDate }: SnapshotHead): string => (dataDate === null ? 'no dates' : dateText(dataDate))
  return `Data to ${day(from)} and ${day(to)}`
}

/** What a step takes up in a stacked column: room under it that is not drawn, and its part above and below 0. */
interface Drawn {
  readonly under: number
  readonly level: number
  readonly rise: number
  readonly fall: number
  readonly riseBelow: number
  readonly fallBelow: number
}

function drawnOf({ start, end, isLevel }: ChangeStep): Drawn {
  const none: Drawn = { under: 0, level: 0, rise: 0, fall: 0, riseBelow: 0, fallBelow: 0 }
  if (isLevel) return { ...none, level: end }
  const [low, high] = start < end ? [start, end] : [end, start]
  const under = low > 0 ? low : high < 0 ? high : 0
  const above = Math.max(high, 0) - Math.max(low, 0)
  const below = Math.min(low, 0) - Math.min(high, 0)
  return end >= start
    ? { ...none, under, rise: above, riseBelow: below }
    : { ...none, under, fall: above, fallBelow: below }
}

const DRAWN: readonly (readonly [key: keyof Drawn, head: string])[] = [
  ['under', 'Not drawn'],
  ['level', 'Volatility'],
  ['rise', 'Rise'],
  ['fall', 'Fall'],
]

const DRAWN_BELOW: typeof DRAWN = [
  ['riseBelow', 'Rise, below 0'],
  ['fallBelow', 'Fall, below 0'],
]

/** The way from one volatility to the other, what of it the picture draws, and the picture. */
function addSteps(
  change: RiskChange,
  { level, change: signed }: Formats,
  horizon: RiskChange['horizon'],
  cells: readonly (readonly TableCell[])[],
  { add, section, number }: Writing,
): TableChart {
  const steps = changeSteps(change)
  const drawn = steps.map(drawnOf)
  const series = drawn.some(({ riseBelow, fallBelow }) => riseBelow < 0 || fallBelow < 0)
    ? [...DRAWN, ...DRAWN_BELOW]
    : DRAWN
  section('From one volatility to the other')
  add(
    ...['Step', 'Change', 'Volatility then', ''].map((label) => text(label, 'head')),
    ...series.map(([, head]) => text(`Picture: ${head.charAt(0).toLowerCase()}${head.slice(1)}`, 'head')),
  )
  const first = cells.length
  steps.forEach(({ label, start, end, isLevel }, k) => {
    add(
      text(label),
      number(isLevel ? null : end - start, signed),
      number(end, level),
      text(''),
      // what is not there is a number all the same, but shows nothing
      ...series.map(([key]) => number(drawn[k]![key], `${level};-${level};`)),
    )
  })
  const isSplit = typeof change.total !== 'string'
  if (isSplit) {
    add(text('Sum of parts', 'total'), number(change.sum, signed, 'total'))
    add(text('Change of volatility'), number(change.change, signed))
    add(text('Difference'), number(change.difference, ROUNDING))
    if (typeof change.total !== 'string' && change.total.drift !== null)
      add(text('Drift and trades together: positions'), number(change.total.positions, signed))
  }
  add()
  const top = cells.length
  for (let k = 0; k < PICTURE.rows; k++) add()
  const span = (column: number): Span => ({ row: first, column, rows: steps.length, columns: 1 })
  const begins = series === DRAWN ? beginningOf(steps) : null
  return {
    kind: 'stacked columns',
    title: `Volatility ${horizon}. ${datesText(change)}${begins === null ? '' : `. The axis begins at ${percentText(begins, digitsOf(change))}`}`,
    alt: altOf(change, steps),
    over: { row: top, column: 0, rows: PICTURE.rows, columns: PICTURE.columns },
    categories: span(0),
    series: series.map(([key, name], k): ChartSeries => ({
      name,
      values: span(4 + k),
      ...(key === 'under' ? { unseen: true } : {}),
    })),
    format: level,
    ...(begins === null ? {} : { begins }),
  }
}

/** Where the axis begins so that steps that are small beside the levels can be seen; null where 0 does as well. */
function beginningOf(steps: readonly ChangeStep[]): number | null {
  const places = steps.flatMap(({ start, end, isLevel }) => (isLevel ? [end] : [start, end]))
  const [low, high] = [Math.min(...places), Math.max(...places)]
  const span = high - low
  if (!(span > 0)) return null
  // a round number, about half of what is drawn below the lowest place
  const unit = 10 ** Math.floor(Math.log10(span))
  const begins = Number((Math.floor((low - span / 2) / unit) * unit).toPrecision(12))
  return begins > high / 4 ? begins : null
}

function altOf(change: RiskChange, steps: readonly ChangeStep[]): string {
  const digits = digitsOf(change)
  const parts = steps
    .filter(({ isLevel }) => !isLevel)
    .map(({ label, start, end }) => `${label.toLowerCase()} ${pointsText(end - start, digits)}`)
  return `Columns that lead from one volatility to the other. ${summaryOf(change, digits)} Of that ${parts.join(', ')}.`
}

function addLines(
  label: string,
  lines: readonly ChangeLine[],
  columns: readonly Column[],
  { add, number }: Omit<Writing, 'section'>,
): void {
  add(...[label, ...columns.map(({ head }) => head), 'Held'].map((head) => text(head, 'head')))
  for (const line of lines)
    add(
      text(line.label),
      ...columns.map(({ of, format }) => number(of(line), format)),
      text(PRESENCE[line.presence]),
    )
  const sum = (of: Column['of']): number => lines.reduce((total, line) => total + (of(line) ?? 0), 0)
  add(
    text('Total', 'total'),
    ...columns.map(({ of, format, adds }) => number(adds ? sum(of) : null, format, 'total')),
  )
}

/** How the figures are to be read, and where the way of splitting comes from. */
function readingOf(change: RiskChange): readonly string[] {
  const { total, holdings } = change
  if (typeof total === 'string')
    return ['Contributions to risk add up to the volatility of their side, and their changes to its change.']
  const isParted = total.drift !== null
  return [
    'A volatility is made of weights, volatilities of holdings and their correlations. The part of each is what it does when it is moved from one side to the other first, second or last, averaged over all six orders (Shapley value; Shorrocks 2013, Journal of Economic Inequality 11, 99-126), so that the parts add up to the change.',
    `Parts of ${countOf(holdings.length, 'holding')} are those of the contributions to risk, which add up to the volatility; a holding’s contribution also moves with what the others do.`,
    ...(isParted
      ? [
          'Positions are parted into drift of weights and trades, averaged over which of the two comes first (Owen 1977); a holding that is gone and was sold first has no drift.',
        ]
      : []),
    'A mix without any volatility counts as contributions of 0.',
  ]
}
