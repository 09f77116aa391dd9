import type { Breakdown } from './breakdown'
import type { LimitState } from './limits'
import { LIMIT_MEASURES, LIMIT_STATUS, limitOn } from './limits'
import type { Profile } from './profile'
import type { Mark, Table, TableCell } from './table'
import { textCell as text, numberCell, setIn } from './table'
import type { Comparison, TradeLine, TradesState } from './trades'
import { CAUTION, countOf, percentText, quote } from './wording'

const PERCENT = '0.00%'
const COLUMNS = 10
const WIDTHS = [34, 22, 13, 13, 13, 13, 13, 13, 13, 13]

const number = (value: number | null | undefined, mark?: Mark): TableCell => numberCell(value, PERCENT, mark)

/** What moved a weight, as the sheet says it. */
export const ORIGIN_WORDS: { readonly [O in TradeLine['origin']]: string } = {
  none: '',
  sheet: 'edited in the sheet',
  typed: 'typed',
  rule: 'by the rule',
  proposal: 'proposed',
  financing: 'pays for the others',
}

/**
 * Lays a comparison out as a table to be written: totals with the first-order estimate, limits, every weight that moves with what moved it, contributions
 * by group and by holding, how a proposal was found; settings, caution. Figures are those of the moment: the table does not follow.
 *
 * @param breakdown whose settings are printed
 * @returns null while nothing differs
 */
export function tradesTable(title: string, state: TradesState, breakdown: Breakdown): Table | null {
  const { comparison, lines, proposal, notes } = state
  if (typeof comparison === 'string') return null
  const { before, after } = comparison
  const cells: TableCell[][] = []
  const add = (...row: TableCell[]): void => {
    const mark = row[0]?.mark
    const rest = text('', mark === 'section' || mark === 'head' || mark === 'total' ? mark : undefined)
    cells.push([...row, ...Array.from({ length: COLUMNS - row.length }, () => rest)])
  }
  const section = (heading: string): void => {
    add()
    add(text(heading, 'section'))
  }
  const heads = (...labels: string[]): void => {
    add(...labels.map((label) => text(label, 'head')))
  }
  const moved = lines.filter((line) => line.after !== line.before)

  add(text(`Trades: ${title}`, 'title'))
  add(text(tradesLine(state) ?? ''))
  add(text(CAUTION, 'note'))
  for (const note of notes) add(text(note, 'alert'))

  section('Totals')
  heads('Figure', '', 'Before', 'After', 'Change', 'After, to first order')
  for (const [label, was, is, estimate] of totalsOf(comparison, breakdown))
    add(text(label), text(''), number(was), number(is), number(differenceOf(was, is)), number(estimate))

  if (comparison.limitsAfter.length > 0) addLimits(comparison, section, heads, add)

  section('Weights')
  heads('Holding', 'What moved it', 'Before', 'In the sheet', 'After', 'Change')
  for (const { name, before: was, sheet, after: is, origin } of moved)
    add(text(name), text(ORIGIN_WORDS[origin]), number(was), number(sheet), number(is), number(is - was))
  add(
    text('Sum of all weights', 'total'),
    text('', 'total'),
    number(before.net, 'total'),
    number(
      lines.reduce((sum, { sheet }) => sum + sheet, 0),
      'total',
    ),
    number(after.net, 'total'),
    number(comparison.netChange, 'total'),
  )

  before.groups.forEach((group, k) => {
    const other = after.groups[k]
    section(group.header)
    heads('Group', '', ...PART_HEADS)
    group.labels.forEach((label, g) => {
      add(text(label), text(''), ...partCells(group, other, g))
    })
    add(text('Total', 'total'), text('', 'total'), ...totalCells(before, after))
  })

  section('Holdings')
  heads('Holding', '', ...PART_HEADS)
  const parts = (profile: Profile) => ({
    weight: profile.decomposition.weights,
    contribution: profile.decomposition.contribution,
    share: profile.decomposition.share,
  })
  before.names.forEach((name, i) => {
    add(text(name), text(''), ...partCells(parts(before), parts(after), i))
  })
  add(text('Total', 'total'), text('', 'total'), ...totalCells(before, after))

  if (proposal) {
    section(`Proposal: ${proposal.title}`)
    add(text(proposal.sentence, proposal.met ? undefined : 'alert'))
    add(text(`Method: ${proposal.method}`))
    for (const [label, figure, meaning] of proposal.lines) add(text(label), text(figure), text(meaning))
  }

  section('Settings')
  for (const [label, value] of breakdown.settings) add(text(label), text(value))
  return { cells: setIn(cells), widths: WIDTHS, numeric: WIDTHS.map((_, k) => k >= 2) }
}

/** How much trades move and what pays for them, in one line; null while nothing differs. */
export function tradesLine(state: TradesState): string | null {
  const { comparison, lines } = state
  if (typeof comparison === 'string') return null
  const moved = lines.filter((line) => line.after !== line.before).length
  return `${countOf(moved, 'weight')} ${moved === 1 ? 'differs' : 'differ'} from those compared from; turnover ${percentText(comparison.turnover, 2)} one way. ${financingText(state)}`
}

const PART_HEADS = [
  'Weight before',
  'Weight after',
  'Contribution before',
  'Contribution after',
  'Change of contribution',
  'Share of risk before',
  'Share of risk after',
]

interface Parts {
  readonly weight: Float64Array
  readonly contribution: Float64Array
  readonly share: Float64Array | null
}

const partCells = (was: Parts, is: Parts | undefined, k: number): TableCell[] => [
  number(was.weight[k]),
  number(is?.weight[k]),
  number(was.contribution[k]),
  number(is?.contribution[k]),
  number((is?.contribution[k] ?? NaN) - (was.contribution[k] ?? NaN)),
  number(was.share?.[k]),
  number(is?.share?.[k]),
]

const totalCells = (before: Profile, after: Profile): TableCell[] =>
  [
    before.net,
    after.net,
    before.decomposition.sumOfContributions,
    after.decomposition.sumOfContributions,
    after.decomposition.sumOfContributions - before.decomposition.sumOfContributions,
    before.decomposition.share && 1,
    after.decomposition.share && 1,
  ].map((value) => number(value, 'total'))

const differenceOf = (was: number | null | undefined, is: number | null | undefined): number | null =>
  was === null || was === undefined || is === null || is === undefined ? null : is - was

/** Label, before, after and, for the volatility, what the sensitivities foretold. */
function totalsOf(
  { before, after, firstOrder }: Comparison,
  { horizon, tails }: Breakdown,
): readonly (readonly [string, number | null, number | null, number | null])[] {
  const label = typeof tails === 'string' ? '' : ` (${tails.label})`
  const [tailBefore, tailAfter] = [before.tails(), after.tails()]
  return [
    [
      `Volatility ${horizon}`,
      before.decomposition.volatility,
      after.decomposition.volatility,
      firstOrder?.volatility ?? null,
    ],
    ...(before.trackingError === null
      ? []
      : ([
          [`Tracking error (ex ante) ${horizon}`, before.trackingError, after.trackingError, null],
        ] as const)),
    ...(tailBefore
      ? ([
          [`Value at risk${label}`, tailBefore.valueAtRisk, tailAfter?.valueAtRisk ?? null, null],
          [`Expected shortfall${label}`, tailBefore.shortfall, tailAfter?.shortfall ?? null, null],
        ] as const)
      : []),
    ['Sum of weights (net)', before.net, after.net, null],
    ['Sum of weights without signs (gross)', before.gross, after.gross, null],
  ]
}

function addLimits(
  { limitsBefore, limitsAfter }: Comparison,
  section: (heading: string) => void,
  heads: (...labels: string[]) => void,
  add: (...row: TableCell[]) => void,
): void {
  section('Limits')
  heads('Limit on', 'Measure', 'Before', 'After', 'Soft limit', 'Hard limit', 'Status before', 'Status after')
  const status = (state: LimitState | undefined): TableCell => {
    if (!state) return text('')
    const { word, mark } = LIMIT_STATUS[state.status]
    return text(`${mark} ${word}`, state.status === 'breach' ? 'alert' : undefined)
  }
  limitsAfter.forEach((state, k) => {
    const was = limitsBefore[k]
    add(
      text(limitOn(state.limit)),
      text(LIMIT_MEASURES[state.limit.measure].label),
      number(was?.figure),
      number(state.figure),
      number(state.limit.soft),
      number(state.limit.hard),
      status(was),
      status(state),
    )
  })
}

function financingText({ financing, lines, proposal }: TradesState): string {
  // a proposal says itself what takes the difference
  if (proposal) return proposal.sentence
  switch (financing.kind) {
    case 'cash':
      return 'Cash beyond the holdings pays for the trades.'
    case 'pro rata':
      return 'The rest of the book pays for the trades, in proportion to its weights.'
    case 'position':
      return `${quote(lines.find(({ key }) => key === financing.key)?.name ?? financing.key)} pays for the trades.`
  }
}
