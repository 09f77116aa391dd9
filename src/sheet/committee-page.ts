import type { Bands } from './bands'
import type { Breakdown } from './breakdown'
import { reducesRisk } from './breakdown-table'
import type { CheckLine } from './inspection'
import type { LimitState } from './limits'
import { LIMIT_MEASURES, LIMIT_STATUS, limitOn, limitsSummary } from './limits'
import type { ChangeLine, RiskChange } from './risk-change'
import type { SnapshotHead } from './snapshot'
import type { Mark, PageSetup, Table, TableCell, TableChart } from './table'
import { numberCell as number, textCell as text } from './table'
import { BAND, bandText, CAUTION, countOf, dateText, listOf, percentText, quote } from './wording'

/** What one page for a committee is made of. */
export interface CommitteeInput {
  readonly title: string
  /** '' where nobody is named */
  readonly preparedBy: string
  readonly paper: PageSetup['paper']
  /** the day it is made, as a workbook counts days */
  readonly today: number
  readonly breakdown: Breakdown
  /** null while the data have not been looked over */
  readonly checks: readonly CheckLine[] | null
  /** kept results: the risk through time */
  readonly history: readonly SnapshotHead[]
  /** since the last kept result; or why it is not told; null where none is kept */
  readonly change: RiskChange | string | null
}

/**
 * The columns: a label and figures at the left with a text beside them, a label over two columns and figures at the right. All parts of the
 * page use them alike, so that figures line up from its head to its foot.
 */
const WIDTHS = [24.7, 8.5, 12.8, 9, 16, 1.5, 9.5, 9.5, 11.3, 12.2, 9] as const
const [LABEL, WEIGHT, CONTRIBUTION, SHARE, ASIDE, GAP, RIGHT, RIGHT_2, RIGHT_3, RIGHT_4, LAST] = [
  0, 1, 2, 3, 4, 5, 6, 7, 8, 9, 10,
] as const

const widthFrom = (first: number, last: number): number =>
  WIDTHS.slice(first, last + 1).reduce((sum, width) => sum + width, 0)

/** How much of everything is shown; what is left out is counted on the page. */
interface Room {
  readonly positions: number
  readonly reducing: number
  readonly limits: number
  readonly groups: number
  readonly kept: number
  readonly warnings: number
  /** lines of small print */
  readonly settings: number
}

/** From roomy to tight: the first that fits the paper is taken. */
const ROOMS: readonly Room[] = [
  { positions: 12, reducing: 4, limits: 8, groups: 8, kept: 8, warnings: 4, settings: 8 },
  { positions: 10, reducing: 3, limits: 6, groups: 7, kept: 7, warnings: 3, settings: 7 },
  { positions: 9, reducing: 3, limits: 5, groups: 6, kept: 6, warnings: 3, settings: 6 },
  { positions: 8, reducing: 3, limits: 4, groups: 5, kept: 6, warnings: 2, settings: 5 },
  { positions: 7, reducing: 2, limits: 3, groups: 4, kept: 5, warnings: 2, settings: 5 },
  { positions: 7, reducing: 2, limits: 3, groups: 4, kept: 5, warnings: 1, settings: 4 },
  { positions: 6, reducing: 2, limits: 2, groups: 4, kept: 4, warnings: 1, settings: 4 },
]

/** Rows that a page takes while it is reduced to no less than about 72% of its size, as the width alone asks for. */
const MOST_ROWS = { A4: 68, Letter: 63 } as const

const PERCENT = '0.00%'
const SHARE_FORMAT = '0.0%'
const CHANGE = '+0.00%;-0.00%;0.00%'
const RATIO = '0.00'

const WHERE_ALL = 'see the table of contributions to risk'

/** Contributions below this have three decimals. */
const FINE = 0.002

const sumOf = (values: Iterable<number>): number => [...values].reduce((sum, value) => sum + value, 0)

const signed = (value: number): string => `${value > 0 ? '+' : ''}${percentText(value, 2)}`

/** Letters by their width in the usual body fonts, in digits; a little more than they take, so that other fonts have room as well. */
const LETTER_WIDTHS: readonly (readonly [RegExp, number])[] = [
  [/[iIjl.,:;'’“”|! ]/, 0.5],
  [/[cfrstz()[\]/-]/, 0.8],
  [/[mwMW%@—●◐○]/, 1.5],
  [/[A-Z+−]/, 1.2],
]

/** Width of a text in characters of the body font, a digit being one. */
const widthOf = (shown: string): number =>
  Array.from(shown).reduce(
    (width, letter) => width + (LETTER_WIDTHS.find(([like]) => like.test(letter))?.[1] ?? 1),
    0,
  )

/** A text in lines of at most so wide, broken between words; a word that is wider than a line has one to itself. */
function brokenAt(width: number, sentence: string): readonly string[] {
  const lines: string[] = []
  for (const word of sentence.split(/\s+/)) {
    const last = lines.at(-1)
    if (last === undefined || widthOf(`${last} ${word}`) > width) lines.push(word)
    else lines[lines.length - 1] = `${last} ${word}`
  }
  return lines
}

const wordsOf = (name: string): readonly string[] => name.split(/\s+/)

/** In how many of some names each word stands. */
function wordCounts(names: readonly string[]): ReadonlyMap<string, number> {
  const counts = new Map<string, number>()
  for (const name of names)
    for (const word of new Set(wordsOf(name))) counts.set(word, (counts.get(word) ?? 0) + 1)
  return counts
}

/**
 * Of a name that is too wide the words that few of its like have, as these tell it from them; then as many of the others as have room, from the
 * first on. Dots stand for what is left out.
 */
function shortened(name: string, width: number, counts: ReadonlyMap<string, number>): string {
  if (widthOf(name) <= width) return name
  const words = wordsOf(name)
  const count = (k: number): number => counts.get(words[k]!) ?? 0
  const withDots = (kept: ReadonlySet<number>): string =>
    words
      .map((word, k) => (kept.has(k) ? word : '…'))
      .filter((word, k, all) => word !== '…' || all[k - 1] !== '…')
      .join(' ')
  let kept = new Set<number>()
  for (const k of [...words.keys()].sort((a, b) => count(a) - count(b) || a - b)) {
    const more = new Set([...kept, k])
    if (widthOf(withDots(more)) <= width) kept = more
    // short words from here and there would say nothing
    else if (kept.size > 0) break
  }
  return kept.size > 0 ? withDots(kept) : `${name.slice(0, Math.floor(width / 1.5) - 1)}…`
}

type Cells = { readonly [column: number]: TableCell }

/** A row with a rule under or over it, from one column to another, whatever of it is filled. */
function ruled(mark: 'section' | 'total', from: number, to: number, cells: Cells): Cells {
  const all: { [column: number]: TableCell } = {}
  for (let column = from; column <= to; column++) all[column] = cells[column] ?? text('', mark)
  return all
}

const head = (label: string): TableCell => text(label, 'head')
/** a heading that begins at the left whatever its column holds elsewhere */
const leftHead = (label: string): TableCell => text(label, 'section')
const aside = (shown: string): TableCell => ({ ...text(shown), indent: 1 })
const asideHead = (label: string): TableCell => ({ ...text(label, 'section'), indent: 1 })

class Page {
  readonly cells: TableCell[][] = []
  readonly charts: TableChart[] = []
  hasCuts = false
  readonly #names: readonly string[]

  constructor(names: readonly string[]) {
    this.#names = names
  }

  add(cells: Cells): void {
    this.cells.push(WIDTHS.map((_, column) => cells[column] ?? text('')))
  }

  blank(): void {
    this.add({})
  }

  /** A sentence over the whole page, in as many rows as it takes. */
  say(sentence: string, mark?: Mark, most = Infinity): void {
    for (const line of this.lines(sentence, widthFrom(LABEL, LAST), most))
      this.add({ [LABEL]: text(line, mark) })
  }

  /**
   * Two parts side by side.
   *
   * @returns the place of their first row
   */
  beside(left: readonly Cells[], right: readonly Cells[] = []): number {
    const first = this.cells.length
    for (let k = 0; k < Math.max(left.length, right.length); k++) this.add({ ...left[k], ...right[k] })
    return first
  }

  /** A sentence in at most so many lines. */
  lines(sentence: string, width: number, most: number): readonly string[] {
    const lines = brokenAt(width, sentence)
    if (lines.length <= most) return lines
    this.hasCuts = true
    return [
      ...lines.slice(0, most - 1),
      ...brokenAt(width - 2, lines.slice(most - 1).join(' ')).slice(0, 1),
    ].map((line, k) => (k === most - 1 ? `${line} …` : line))
  }

  /** A name that may have to be shortened, so that it is still told from others. */
  name(name: string, width: number, others: readonly string[] = this.#names): string {
    if (widthOf(name) <= width) return name
    this.hasCuts = true
    return shortened(name, width, wordCounts(others))
  }
}

/**
 * Lays out one printable page for a committee: total and active risk against their limits with what else is exceeded, what changed, the largest
 * contributors and the risk-reducing positions, groups, concentration, large losses, leverage, risk through time, warnings, settings, caution.
 * What does not fit is counted in rows that add up, or named as left out. Figures are those of the moment: the page does not follow.
 *
 * @returns rows of equal length with its charts and page set-up; as much of everything as the paper takes at 72% of its size or more
 * @cost    O(positions), and two passes of the returns for the bands
 */
export function committeePage(input: CommitteeInput): Table {
  let page = laidOut(input, ROOMS[0]!)
  for (const room of ROOMS) {
    page = laidOut(input, room)
    if (page.cells.length <= MOST_ROWS[input.paper]) break
  }
  return {
    cells: page.cells,
    widths: WIDTHS,
    numeric: WIDTHS.map((_, column) => column !== LABEL),
    charts: page.charts,
    page: {
      paper: input.paper,
      orientation: 'portrait',
      onePage: true,
      header: { left: input.title, right: dataDateOf(input.breakdown) },
      footer: CAUTION,
    },
  }
}

function dataDateOf({ dates }: Breakdown): string {
  return dates?.last == null ? 'Data without dates' : `Data to ${dateText(dates.last)}`
}

function laidOut(input: CommitteeInput, room: Room): Page {
  const { breakdown } = input
  const bands = typeof breakdown.bands === 'string' ? null : breakdown.bands
  const page = new Page(breakdown.names)
  addHead(page, input)
  page.blank()
  addRisk(page, breakdown, bands, room)
  page.blank()
  addChange(page, input)
  page.blank()
  addPositions(page, breakdown, bands, room)
  page.blank()
  addGroups(page, breakdown, room)
  page.blank()
  page.beside(concentrationRows(page, breakdown), lossRows(page, breakdown))
  page.blank()
  addHistory(page, input, room)
  page.blank()
  addWarnings(page, input, room)
  page.blank()
  addSmallPrint(page, breakdown, room)
  page.say(CAUTION, 'note')
  return page
}

function addHead(page: Page, { title, preparedBy, today, breakdown }: CommitteeInput): void {
  const { dates, horizon, currency } = breakdown
  page.say(`Risk report: ${title}`, 'title')
  const span =
    dates === null
      ? 'Data: a covariance matrix as given, without dates.'
      : dates.last === null
        ? `Data: ${countOf(dates.used, 'date')} of returns, without a calendar.`
        : `${dataDateOf(breakdown)}, ${countOf(dates.used, 'date')} of returns${dates.first === null ? '' : ` from ${dateText(dates.first)}`}.`
  page.say(
    [
      span,
      `Risk ${horizon}${currency ? `, in ${currency.base}` : ''}.`,
      preparedBy === '' ? 'Prepared by: not named.' : `Prepared by: ${preparedBy}.`,
      `Page made on ${dateText(today)}.`,
    ].join(' '),
  )
}

// ---- total and active risk, limits

const GRAVITY: readonly LimitState['status'][] = ['breach', 'over soft', 'not measured', 'within']

const byGravity = (states: readonly LimitState[]): readonly LimitState[] =>
  [...states].sort((a, b) => GRAVITY.indexOf(a.status) - GRAVITY.indexOf(b.status))

/** How a figure stands to its limits: a mark that differs by its shape, a word and by how much. */
function statusText({ status, limit, headroom, figure }: LimitState): string {
  const { mark, word } = LIMIT_STATUS[status]
  const format = limit.measure === 'share of risk' ? 1 : 2
  const by = (edge: number): string => percentText(Math.abs(edge - (figure ?? 0)), format)
  switch (status) {
    case 'breach':
      return `${mark} ${word}, ${by(limit.hard ?? 0)} over hard limit`
    case 'over soft':
      return `${mark} ${word} by ${by(limit.soft ?? 0)}`
    case 'within':
      return `${mark} ${word}, ${percentText(headroom ?? 0, format)} below ${limit.hard === null ? 'soft' : 'hard'} limit`
    case 'not measured':
      return `${mark} ${word}`
  }
}

/** What a limit is on, with the horizon of its figure. */
function limitLabel({ limit }: LimitState, { horizon, tails }: Breakdown): string {
  const measure = LIMIT_MEASURES[limit.measure].label
  const over =
    limit.measure === 'weight' || limit.measure === 'share of risk'
      ? ''
      : limit.measure === 'value at risk' || limit.measure === 'expected shortfall'
        ? typeof tails === 'string'
          ? ''
          : `, ${tails.label}`
        : ` ${horizon}`
  return limit.scope === 'total' ? `${measure}${over}` : `${limitOn(limit)}, ${measure.toLowerCase()}${over}`
}

function addRisk(page: Page, breakdown: Breakdown, bands: Bands | null, room: Room): void {
  const { decomposition: d, active, limits, horizon } = breakdown
  page.add(
    ruled('section', LABEL, LAST, {
      [LABEL]: leftHead('Risk and limits'),
      [SHARE]: head('Figure'),
      [ASIDE]: asideHead('95% band'),
      [RIGHT]: head('Soft limit'),
      [RIGHT_2]: head('Hard limit'),
      [RIGHT_3]: asideHead('Status'),
    }),
  )
  const line = (
    label: string,
    figure: number | null,
    error: number | null,
    state: LimitState | null,
  ): void => {
    const isShare = state?.limit.measure === 'share of risk'
    const format = isShare ? SHARE_FORMAT : PERCENT
    page.add({
      [LABEL]: text(page.name(label, widthFrom(LABEL, CONTRIBUTION))),
      [SHARE]: number(figure, format),
      [ASIDE]: aside(figure === null || error === null ? '' : bandText(figure, error, isShare ? 1 : 2)),
      [RIGHT]: number(state?.limit.soft, format),
      [RIGHT_2]: number(state?.limit.hard, format),
      [RIGHT_3]: {
        ...text(
          state ? statusText(state) : 'No limit is set',
          state?.status === 'breach' ? 'alert' : undefined,
        ),
        indent: 1,
      },
    })
  }
  const stateOf = (measure: LimitState['limit']['measure']): LimitState | null =>
    byGravity(limits.filter(({ limit }) => limit.scope === 'total' && limit.measure === measure))[0] ?? null
  const total = stateOf('volatility')
  const shown: LimitState[] = []
  const main = (label: string, figure: number, error: number | null, state: LimitState | null): void => {
    if (state) shown.push(state)
    line(label, figure, error, state)
  }
  main(`Volatility ${horizon}`, d.volatility, bands?.volatility ?? null, total)
  if (active)
    main(
      `Tracking error (ex ante) ${horizon}`,
      active.risk.trackingError,
      activeError(breakdown, bands),
      stateOf('tracking error'),
    )
  else page.add({ [LABEL]: text('Tracking error (ex ante): not shown, as no benchmark is chosen') })

  const exceeded = byGravity(limits).filter(
    (state) => (state.status === 'breach' || state.status === 'over soft') && !shown.includes(state),
  )
  const listed = exceeded.length > room.limits ? exceeded.slice(0, room.limits) : exceeded
  for (const state of listed) line(limitLabel(state, breakdown), state.figure, state.error, state)
  const more = exceeded.slice(listed.length)
  const breached = more.filter(({ status }) => status === 'breach').length
  const rest =
    more.length === 0
      ? ''
      : ` ${more.length} of those exceeded ${more.length === 1 ? 'is' : 'are'} not on this page${breached > 0 ? ` (${breached} breached)` : ''}: ${WHERE_ALL}.`
  page.say(
    limits.length === 0 ? 'No limits are set for this book.' : `${limitsSummary(limits)}.${rest}`,
    'note',
  )
  if (typeof breakdown.bands === 'string') page.say(`No error bands: ${breakdown.bands}`, 'note', 2)
}

/** Standard error of the tracking error: that of the volatility of the active weights. A benchmark that is a series is in no model with bands. */
function activeError({ active, names }: Breakdown, bands: Bands | null): number | null {
  if (!active || !bands || active.names.length !== names.length || active.risk.trackingError === 0)
    return null
  return bands.ofVolatility(active.weights.map((weight, i) => weight - (active.benchmark[i] ?? 0)))
}

/** What sums leave by rounding. */
const roundingText = (difference: number): string =>
  difference === 0 ? '0' : difference.toExponential(1).replaceAll('-', '−')

// ---- what changed

const CAUSES = {
  settings: 'settings',
  positions: 'position',
  volatilities: 'volatility',
  correlations: 'correlations',
} as const

/** How one contribution moved, and the cause that moved it most. */
function moveText(line: ChangeLine): string {
  const move = line.contributionTo - line.contributionFrom
  const kinds = Object.keys(CAUSES) as readonly (keyof typeof CAUSES)[]
  const main = kinds.reduce((a, b) => (Math.abs(line[b]) > Math.abs(line[a]) ? b : a))
  const cause = line.presence === 'both' ? CAUSES[main] : line.presence
  return `${quote(line.label)} ${signed(move)} (${cause})`
}

function addChange(page: Page, { change }: CommitteeInput): void {
  if (change === null || typeof change === 'string') {
    page.add(ruled('section', LABEL, LAST, { [LABEL]: leftHead('Change since the last kept result') }))
    page.say(
      change === null ? 'No result has been kept yet: what changed cannot be told.' : `Not told: ${change}`,
    )
    return
  }
  const { from, to, total, settings } = change
  const dayOf = ({ dataDate, keptOn }: SnapshotHead): string =>
    dataDate === null ? `kept ${dateText(keptOn)}` : dateText(dataDate)
  const heading = `Change since ${dayOf(from)}`
  if (typeof total === 'string') {
    page.add(ruled('section', LABEL, LAST, { [LABEL]: leftHead(heading) }))
    page.say(
      `Volatility ${change.horizon} from ${percentText(from.volatility, 2)} to ${percentText(to.volatility, 2)}: ${signed(change.change)}. Not split by cause: ${total}`,
      undefined,
      2,
    )
    return
  }
  page.add(
    ruled('section', LABEL, LAST, {
      [LABEL]: leftHead(heading),
      [WEIGHT]: head('Before'),
      [CONTRIBUTION]: head('Settings'),
      [SHARE]: head('Positions'),
      [ASIDE]: head(total.drift === null ? '' : 'of which drift'),
      [RIGHT_2]: head(total.trades === null ? '' : 'trades'),
      [RIGHT_3]: head('Volatilities'),
      [RIGHT_4]: head('Correlations'),
      [LAST]: head(to.isNow ? 'Now' : 'After'),
    }),
  )
  page.add({
    [LABEL]: text(`Volatility ${change.horizon}`),
    [WEIGHT]: number(from.volatility, PERCENT),
    [CONTRIBUTION]: number(settings?.effect ?? 0, CHANGE),
    [SHARE]: number(total.positions, CHANGE),
    [ASIDE]: number(total.drift, CHANGE),
    [RIGHT_2]: number(total.trades, CHANGE),
    [RIGHT_3]: number(total.volatilities, CHANGE),
    [RIGHT_4]: number(total.correlations, CHANGE),
    [LAST]: number(to.volatility, PERCENT),
  })
  const moved = [...change.holdings]
    .sort(
      (a, b) =>
        Math.abs(b.contributionTo - b.contributionFrom) - Math.abs(a.contributionTo - a.contributionFrom),
    )
    .filter((line) => Math.abs(line.contributionTo - line.contributionFrom) >= 0.00005)
    .slice(0, 3)
  const notes = [
    `The change of ${signed(change.change)} is the sum of settings, positions, volatilities and correlations (${signed(change.sum)}, difference ${roundingText(change.difference)}), in points of volatility${to.isNow ? '' : `; after: ${dayOf(to)}`}.`,
    ...(moved.length > 0 ? [`Contributions that moved most: ${listOf(moved.map(moveText))}.`] : []),
    ...(settings ? [settings.sentence] : []),
    ...change.notes,
  ]
  page.say(notes.join(' '), 'note', 3)
}

// ---- positions

interface Shown {
  readonly contributors: readonly number[]
  readonly reducing: readonly number[]
  /** those that have no row of their own */
  readonly others: readonly number[]
}

/** The positions with rows of their own: the largest contributions, and the lowest where they reduce risk. */
function shownOf({ decomposition: d }: Breakdown, { positions, reducing }: Room): Shown {
  const order = [...d.contribution.keys()].sort((a, b) => d.contribution[b]! - d.contribution[a]! || a - b)
  const below = order.filter((i) => reducesRisk(d.contribution[i]!, d.volatility)).reverse()
  const above = order.filter((i) => !below.includes(i))
  const low = below.slice(0, Math.max(reducing, positions - above.length))
  const high = above.slice(0, positions - low.length)
  const own = new Set([...low, ...high])
  return { contributors: high, reducing: low, others: order.filter((i) => !own.has(i)) }
}

function addPositions(page: Page, breakdown: Breakdown, bands: Bands | null, room: Room): void {
  const { decomposition: d, names, sharesWithheld } = breakdown
  const { contributors, reducing, others } = shownOf(breakdown, room)
  const shares = sharesWithheld === null ? d.share : null
  // of many holdings each has so little that two decimals would not tell them apart
  const isFine = contributors.every((i) => Math.abs(d.contribution[i]!) < FINE)
  const format = isFine ? '0.000%' : PERCENT
  // with three decimals and a sign on either end, the per cent sign has room once
  const bandWithin = (contribution: number, error: number): string =>
    isFine ? bandText(contribution, error, 3).replace('%', '') : bandText(contribution, error, 2)
  const figures = (
    weight: number,
    contribution: number,
    share: number | null,
    error: number | null,
    mark?: Mark,
  ): Cells => ({
    [WEIGHT]: number(weight, PERCENT, mark),
    [CONTRIBUTION]: number(contribution, format, mark),
    [SHARE]: shares ? number(share, SHARE_FORMAT, mark) : text('', mark),
    [ASIDE]: {
      ...text(error === null ? '' : bandWithin(contribution, error), mark),
      indent: 1,
    },
  })
  const ofOne = (i: number): Cells => ({
    [LABEL]: text(page.name(names[i] ?? '', WIDTHS[LABEL])),
    ...figures(d.weights[i]!, d.contribution[i]!, shares?.[i] ?? null, bands?.contribution[i] ?? null),
  })
  const rows: Cells[] = [
    ruled('section', LABEL, ASIDE, {
      [LABEL]: leftHead('Largest contributors'),
      [WEIGHT]: head('Weight'),
      [CONTRIBUTION]: head('Contribution'),
      [SHARE]: head(shares ? 'Share of risk' : ''),
      [ASIDE]: asideHead(bands ? '95% band' : ''),
    }),
    ...contributors.map(ofOne),
    {
      [LABEL]: text(
        reducing.length > 0 ? 'Risk-reducing positions' : 'Risk-reducing positions: none',
        'note',
      ),
    },
    ...reducing.map(ofOne),
  ]
  const inChart = rows.length - (reducing.length > 0 ? 1 : 2)
  if (others.length > 0) {
    const over = (values: Float64Array): number => sumOf(others.map((i) => values[i]!))
    const isOther = new Int32Array(names.length)
    for (const i of others) isOther[i] = 1
    rows.push({
      [LABEL]: text(`Others (${others.length})`),
      ...figures(
        over(d.weights),
        over(d.contribution),
        shares && over(shares),
        bands?.ofGroups(isOther, 2).contribution[1] ?? null,
      ),
    })
  }
  rows.push(
    ruled('total', LABEL, ASIDE, {
      [LABEL]: text('Total', 'total'),
      ...figures(breakdown.net, d.volatility, 1, bands?.volatility ?? null, 'total'),
    }),
  )
  const first = page.beside(rows)
  page.charts.push(
    positionsChart(breakdown, { first, rows: rows.length, inChart, isShares: shares !== null }, [
      ...contributors,
      ...reducing,
    ]),
  )
  const difference = roundingText(d.difference)
  page.say(
    `Contributions ${breakdown.horizon} add up to the volatility: sum ${percentText(d.sumOfContributions, 2)}, total ${percentText(d.volatility, 2)}, difference ${difference}.${bands ? ' Bands are those of the contributions.' : ''}${sharesWithheld === null ? '' : ` ${sharesWithheld}`}`,
    'note',
  )
}

function positionsChart(
  { decomposition: d, names }: Breakdown,
  place: {
    readonly first: number
    readonly rows: number
    readonly inChart: number
    readonly isShares: boolean
  },
  shown: readonly number[],
): TableChart {
  const { first, rows, inChart, isShares } = place
  const down = (column: number) => ({ row: first + 1, column, rows: inChart, columns: 1 })
  const over = { row: first, column: RIGHT, rows, columns: LAST - RIGHT + 1 }
  const lead = shown[0]
  const leader =
    lead === undefined
      ? ''
      : isShares
        ? ` The largest contributor, ${quote(names[lead])}, has ${percentText(d.weights[lead]!, 1)} of the weight and ${percentText(d.share?.[lead] ?? 0, 1)} of the risk.`
        : ` The largest is ${quote(names[lead])} with ${percentText(d.contribution[lead]!, 2)}.`
  const heavier = shown.filter((i) => (d.share?.[i] ?? 0) > d.weights[i]!).length
  const common = { kind: 'bars', over, categories: down(LABEL) } as const
  return isShares
    ? {
        ...common,
        title: 'Weight and share of risk',
        alt: `Bars of weight and share of risk, side by side, of the ${countOf(shown.length, 'position')} listed at the left.${leader} ${heavier} of them ${heavier === 1 ? 'has' : 'have'} a larger share of the risk than of the weight.`,
        series: [
          { name: 'Weight', values: down(WEIGHT) },
          { name: 'Share of risk', values: down(SHARE) },
        ],
        format: '0%',
      }
    : {
        ...common,
        title: 'Contribution to risk',
        alt: `Bars of the contribution to risk of the ${countOf(shown.length, 'position')} listed at the left.${leader}`,
        series: [{ name: 'Contribution to risk', values: down(CONTRIBUTION) }],
        format: SHARE_FORMAT,
      }
}

// ---- groups

interface GroupColumns {
  readonly from: number
  readonly to: number
  readonly labelWidth: number
  readonly weight: number
  readonly contribution: number
  readonly share: number
}

const LEFT_GROUPS: GroupColumns = {
  from: LABEL,
  to: SHARE,
  labelWidth: WIDTHS[LABEL],
  weight: WEIGHT,
  contribution: CONTRIBUTION,
  share: SHARE,
}
const RIGHT_GROUPS: GroupColumns = {
  from: RIGHT,
  to: LAST,
  labelWidth: widthFrom(RIGHT, RIGHT_2),
  weight: RIGHT_3,
  contribution: RIGHT_4,
  share: LAST,
}

function groupRows(
  page: Page,
  { decomposition: d, sharesWithheld }: Breakdown,
  { header, labels, parts }: Breakdown['byGroup'][number],
  at: GroupColumns,
  most: number,
): readonly Cells[] {
  const shares = sharesWithheld === null ? d.share : null
  const size = (g: number): number => Math.abs(parts.contribution[g]!)
  const bySize = [...labels.keys()].sort((a, b) => size(b) - size(a) || a - b)
  const own = labels.length > most ? bySize.slice(0, most - 1) : bySize
  const rest = bySize.slice(own.length)
  const line = (label: string, weight: number, contribution: number, mark?: 'total'): Cells => ({
    [at.from]: text(label, mark),
    [at.weight]: number(weight, PERCENT, mark),
    [at.contribution]: number(contribution, PERCENT, mark),
    [at.share]: shares ? number(contribution / d.volatility, SHARE_FORMAT, mark) : text('', mark),
  })
  const over = (groups: readonly number[], values: Float64Array): number =>
    sumOf(groups.map((g) => values[g]!))
  return [
    ruled('section', at.from, at.to, {
      [at.from]: leftHead(page.name(`By ${header}`, at.labelWidth)),
      [at.weight]: head('Weight'),
      [at.contribution]: head('Contribution'),
      [at.share]: head(shares ? 'Share of risk' : ''),
    }),
    ...[...own]
      .sort((a, b) => parts.contribution[b]! - parts.contribution[a]! || a - b)
      .map((g) =>
        line(page.name(labels[g] ?? '', at.labelWidth, labels), parts.weight[g]!, parts.contribution[g]!),
      ),
    ...(rest.length > 0
      ? [line(`Others (${rest.length})`, over(rest, parts.weight), over(rest, parts.contribution))]
      : []),
    ruled('total', at.from, at.to, line('Total', sumOf(parts.weight), sumOf(parts.contribution), 'total')),
  ]
}

function addGroups(page: Page, breakdown: Breakdown, room: Room): void {
  const [left, right, ...others] = breakdown.byGroup
  if (!left) {
    page.add(ruled('section', LABEL, LAST, { [LABEL]: leftHead('By group') }))
    page.say('The holdings have no column that groups them.')
    return
  }
  page.beside(
    groupRows(page, breakdown, left, LEFT_GROUPS, room.groups),
    right ? groupRows(page, breakdown, right, RIGHT_GROUPS, room.groups) : [],
  )
  if (others.length > 0)
    page.say(
      `Grouped as well by ${listOf(
        others.map(({ header }) => header),
        others.length,
      )}: ${WHERE_ALL}.`,
      'note',
      1,
    )
}

// ---- concentration, leverage, large losses

function concentrationRows(page: Page, breakdown: Breakdown): readonly Cells[] {
  const { decomposition: d, names, effectiveWithheld, sharesWithheld, net, gross } = breakdown
  const line = (label: string, cell: TableCell, remark = ''): Cells => ({
    [LABEL]: text(label),
    [CONTRIBUTION]: cell,
    [SHARE]: aside(page.name(remark, widthFrom(SHARE, GAP) - 2)),
  })
  const largest = (values: ArrayLike<number>, size: (value: number) => number): number =>
    Array.from(values).reduce((best, value, i, all) => (size(value) > size(all[best]!) ? i : best), 0)
  const heaviest = largest(d.weights, Math.abs)
  const riskiest = largest(d.contribution, (value) => value)
  const held = d.weights.reduce((count, weight) => count + (weight === 0 ? 0 : 1), 0)
  const isEffective = effectiveWithheld === null && d.effectiveNumber !== null
  return [
    ruled('section', LABEL, ASIDE, { [LABEL]: leftHead('Concentration and leverage') }),
    isEffective
      ? line('Effective number of positions', number(d.effectiveNumber, '0.0'), `by risk, of ${held} held`)
      : { [LABEL]: text(`Effective number of positions: ${effectiveWithheld ?? 'not defined'}`) },
    line('Diversification ratio', number(d.diversificationRatio, RATIO), 'stand-alone risks to total'),
    line('Largest weight', number(d.weights[heaviest], PERCENT), names[heaviest]),
    sharesWithheld === null && d.share
      ? line('Largest share of risk', number(d.share[riskiest], SHARE_FORMAT), names[riskiest])
      : line('Largest contribution to risk', number(d.contribution[riskiest], PERCENT), names[riskiest]),
    line('Net weight', number(net, PERCENT), 'of capital'),
    line(
      'Gross weight',
      number(gross, PERCENT),
      `long ${percentText((gross + net) / 2, 1)}, short ${percentText((gross - net) / 2, 1)}`,
    ),
  ]
}

function lossRows(page: Page, { tails }: Breakdown): readonly Cells[] {
  const said = (sentence: string, most: number): readonly Cells[] =>
    page.lines(sentence, widthFrom(RIGHT, LAST), most).map((line) => ({ [RIGHT]: text(line) }))
  const heading = (label: string): Cells => ruled('section', RIGHT, LAST, { [RIGHT]: leftHead(label) })
  if (typeof tails === 'string') return [heading('Large losses'), ...said(`Not shown. ${tails}`, 6)]
  const { risk, label, method } = tails
  const line = (what: string, value: number | null): readonly Cells[] =>
    value === null ? [] : [{ [RIGHT]: text(what), [LAST]: number(value, PERCENT) }]
  return [
    heading(`Large losses: ${label}`),
    ...line('Value at risk, of capital', risk.valueAtRisk),
    ...line('Standard error of value at risk', risk.standardError),
    ...(risk.shortfall === null
      ? said('This method gives no expected shortfall.', 1)
      : line('Expected shortfall, of capital', risk.shortfall)),
    ...said(`${method}.`, 3),
  ]
}

// ---- risk through time

/** Fewer than this show no course of events. Our own convention. */
const FEWEST_KEPT = 3

interface Point {
  readonly day: string
  readonly volatility: number
  readonly trackingError: number | null
  readonly note: string
}

function addHistory(page: Page, { history, breakdown }: CommitteeInput, room: Room): void {
  const { decomposition: d, active, horizon } = breakdown
  if (history.length < FEWEST_KEPT) {
    page.add(ruled('section', LABEL, LAST, { [LABEL]: leftHead('Risk through time') }))
    page.say(
      `${history.length === 0 ? 'No result is' : `${countOf(history.length, 'result')} ${history.length === 1 ? 'is' : 'are'}`} kept: at least ${FEWEST_KEPT} are needed to show a course.`,
    )
    return
  }
  const dated = [...history].sort((a, b) => (a.dataDate ?? a.keptOn) - (b.dataDate ?? b.keptOn))
  const isScaled = dated.some(({ periodsPerYear }) => periodsPerYear !== d.periodsPerYear)
  const points: Point[] = dated.map((head) => {
    const scale = Math.sqrt(d.periodsPerYear / head.periodsPerYear)
    return {
      day: head.dataDate === null ? `kept ${dateText(head.keptOn)}` : dateText(head.dataDate),
      volatility: head.volatility * scale,
      trackingError: head.trackingError && head.trackingError * scale,
      note: head.note,
    }
  })
  // the page's own figures stand at the end of the line unless they are the ones kept last
  const last = points.at(-1)
  if (last && Math.abs(last.volatility - d.volatility) > 1e-9 * d.volatility)
    points.push({
      day: 'This page',
      volatility: d.volatility,
      trackingError: active?.risk.trackingError ?? null,
      note: '',
    })
  const shown = points.slice(-room.kept)
  const isActive = shown.some(({ trackingError }) => trackingError !== null)
  const rows = [
    ruled('section', LABEL, ASIDE, {
      [LABEL]: leftHead('Risk through time'),
      [WEIGHT]: head('Volatility'),
      [CONTRIBUTION]: head(isActive ? 'Tracking error' : ''),
      [SHARE]: asideHead('Note'),
    }),
    ...shown.map(({ day, volatility, trackingError, note }) => ({
      [LABEL]: text(day),
      [WEIGHT]: number(volatility, PERCENT),
      [CONTRIBUTION]: number(trackingError, PERCENT),
      [SHARE]: aside(page.name(note, widthFrom(SHARE, GAP) - 1)),
    })),
  ]
  const left = points.length - shown.length
  const notes = page.lines(
    `Kept results, each under the settings of its day${isScaled ? ' but scaled as this page is' : ''}.${left > 0 ? ` ${countOf(left, 'earlier one')}: see the sheet of kept results.` : ''}`,
    widthFrom(LABEL, ASIDE),
    2,
  )
  const part = [...rows, ...notes.map((line) => ({ [LABEL]: text(line, 'note') }))]
  const first = page.beside(part)
  const down = (column: number) => ({ row: first + 1, column, rows: shown.length, columns: 1 })
  const [from, to] = [shown[0], shown.at(-1)]
  page.charts.push({
    kind: 'line',
    title: `Risk ${horizon} through time`,
    alt: `A line of the volatility at ${countOf(shown.length, 'date')}: from ${percentText(from?.volatility ?? 0, 2)} (${from?.day ?? ''}) to ${percentText(to?.volatility ?? 0, 2)} (${to?.day ?? ''})${isActive ? ', and one of the tracking error' : ''}.`,
    over: { row: first, column: RIGHT, rows: part.length, columns: LAST - RIGHT + 1 },
    categories: down(LABEL),
    series: [
      { name: 'Volatility', values: down(WEIGHT) },
      ...(isActive ? [{ name: 'Tracking error', values: down(CONTRIBUTION) }] : []),
    ],
    format: SHARE_FORMAT,
  })
}

// ---- warnings, small print

function addWarnings(page: Page, { breakdown, checks }: CommitteeInput, room: Room): void {
  const warnings = breakdown.findings.filter(({ weight }) => weight !== 'notes')
  const shown = warnings.slice(0, room.warnings)
  page.add(
    ruled('section', LABEL, LAST, {
      [LABEL]: leftHead(
        warnings.length === 0
          ? 'Data warnings: none'
          : `Data warnings: ${warnings.length}${shown.length < warnings.length ? `, of which ${shown.length} here` : ''}`,
      ),
    }),
  )
  for (const { sentence } of shown) page.say(`– ${sentence}`, undefined, 2)
  const found = (weight: 'warns' | 'notes'): number =>
    checks?.filter(({ check }) => check.weight === weight).length ?? 0
  page.say(
    checks === null
      ? 'The data have not been looked over for further faults.'
      : `Looked over for faults: ${countOf(found('warns'), 'warning')} and ${countOf(found('notes'), 'note')}; cells and what can be done stand in the data checks.`,
    'note',
  )
}

/** What the figures depend on most stands first, as the page may have no room for all of it. */
const FIRST_SETTINGS: readonly string[] = [
  'Estimator',
  'Dates used',
  'Look-back',
  'Rule for gaps',
  'Scaling',
  'Base currency',
  'Riskless',
  'Capital',
  'Holdings',
  'Returns',
  'Covariance',
]

function addSmallPrint(page: Page, breakdown: Breakdown, room: Room): void {
  const { settings, bands } = breakdown
  const place = ([label]: readonly [string, string]): number =>
    FIRST_SETTINGS.includes(label) ? FIRST_SETTINGS.indexOf(label) : FIRST_SETTINGS.length
  const lines = [...settings]
    .sort((a, b) => place(a) - place(b))
    .map(([label, value]) => `${label}: ${value}.`)
  const further = [
    typeof bands === 'string'
      ? ''
      : `95% band: the figure and ${BAND.toFixed(2)} standard errors either way. ${bands.note ?? ''}`.trim(),
    page.hasCuts ? `What has … is shortened here: ${WHERE_ALL}.` : '',
  ].filter((sentence) => sentence !== '')
  page.say(`Settings. ${[...further, ...lines].join(' ')}`, 'note', room.settings)
}
