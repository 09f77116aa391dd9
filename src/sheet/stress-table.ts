import type { Breakdown } from './breakdown'
import type { Parts, Scenario, StressCase, StressComparison, StressFigures } from './stress'
import type { Mark, Table, TableCell } from './table'
import { textCell as text, numberCell as number, setIn } from './table'
import { CAUTION, countOf, dateText, percentText } from './wording'

const PERCENT = '0.00%'
const ROUNDING = '0.0E+00'

const sumOf = (values: Float64Array): number => values.reduce((sum, value) => sum + value, 0)

const READING: readonly (readonly [string, string])[] = [
  [
    'Volatilities',
    'The volatility of each position is multiplied; correlations stay as they are: D C D with D the factors.',
  ],
  [
    'Correlations',
    'Every correlation r becomes (1 − θ) r + θ, with θ the part of the way toward 1; volatilities stay. (1 − θ) C + θ s s′ with s the volatilities is a mix of two positive semidefinite matrices and so positive semidefinite itself.',
  ],
  [
    'Replayed stretch',
    'Past returns of these dates at constant weights. Their sum adds up by position; compounded, gains and losses stay in the book. Volatility and contributions are the sample covariance’s of these dates alone, every date counting alike, whatever the other figures are estimated by.',
  ],
]

const HAS = {
  volatilities: ['Volatilities'],
  correlations: ['Correlations'],
  both: ['Volatilities', 'Correlations'],
  stretch: ['Replayed stretch'],
} as const satisfies { readonly [K in Scenario['kind']]: readonly string[] }

/**
 * Lays scenarios out side by side as a table to be written: volatility, contributions to risk by holding and by group, what replayed
 * stretches return, each with a total, the sum of parts and its difference; notes, settings and data dates, caution. Before and after
 * trades stand next to each other.
 *
 * @param breakdown  whose settings and dates are printed
 * @param trades     the trades and what finances them, as one line; null while there are none
 * @returns          rows of equal length; positions in the order of the holdings
 * @cost             O(positions x scenarios)
 */
export function stressTable(
  title: string,
  comparison: StressComparison,
  breakdown: Pick<Breakdown, 'settings' | 'findings'>,
  trades: string | null = null,
): Table {
  const rows = new StressRows(comparison)
  const { cases, after } = comparison
  const scenarios = cases.slice(1)
  const warnings = warningsOf(comparison, breakdown)

  rows.add([text(`Stress: ${title}`, 'title')])
  rows.add([text(headline(comparison))])
  rows.add([text(CAUTION, 'note')])
  rows.add(
    warnings.length > 0
      ? [text(`${countOf(warnings.length, 'warning')}, at the end of this table.`, 'alert')]
      : [],
  )
  rows.add([])

  addVolatility(rows, comparison)
  addParts(rows, comparison, 'Contribution to risk', ({ volatility }) => volatility)
  if (cases.some(({ dates }) => dates !== null)) addStretches(rows, comparison)

  rows.section('Settings')
  if (after && trades !== null) rows.add([text('Trades'), text(trades)])
  for (const [label, value] of breakdown.settings) rows.add([text(label), text(value)])
  const present = new Set<string>(scenarios.flatMap(({ scenario }) => (scenario ? HAS[scenario.kind] : [])))
  for (const [label, value] of READING) if (present.has(label)) rows.add([text(label), text(value)])
  rows.section('Notes')
  const notes = scenarios.flatMap(({ name, notes: own }) => own.map((note) => [name, note] as const))
  for (const [name, note] of notes) rows.add([text(name), text(note)])
  if (notes.length === 0) rows.add([text('None')])
  rows.section('Warnings')
  for (const sentence of warnings) rows.add([text(sentence, 'alert')])
  if (warnings.length === 0) rows.add([text('None')])

  return { cells: setIn(rows.cells), widths: rows.widths, numeric: rows.numeric }
}

function headline({ cases, horizon, window }: StressComparison): string {
  const [base, ...scenarios] = cases
  const figures = typeof base?.figures === 'string' ? undefined : base?.figures
  const before = percentText(figures?.before.volatility?.total ?? 0, 2)
  const after = figures?.after?.volatility
  const trades = after ? ` before the trades and ${percentText(after.total, 2)} after them` : ''
  const span =
    window === null || window.first === null || window.last === null
      ? ''
      : `, ${dateText(window.first)} to ${dateText(window.last)}`
  const data = window === null ? 'a covariance matrix as given' : `${countOf(window.used, 'date')}${span}`
  return `Volatility as estimated ${before} ${horizon}${trades}, from ${data}; ${countOf(scenarios.length, 'scenario')} beside it.`
}

/** The scenarios that could not be made, and what was found about the data. */
const warningsOf = ({ cases }: StressComparison, { findings }: Pick<Breakdown, 'findings'>): string[] => [
  ...cases.flatMap(({ name, figures }) =>
    typeof figures === 'string' ? [`${name}: not shown. ${figures}`] : [],
  ),
  ...findings.filter(({ weight }) => weight !== 'notes').map(({ sentence }) => sentence),
]

/** Rows of one width: a label, the weights, then the cases, each at its weights before and, where there are trades, after. */
class StressRows {
  readonly cells: TableCell[][] = []
  readonly #comparison: StressComparison
  /** columns of each case */
  readonly #sides: readonly ('before' | 'after')[]

  constructor(comparison: StressComparison) {
    this.#comparison = comparison
    this.#sides = comparison.after ? ['before', 'after'] : ['before']
  }

  get #width(): number {
    return 1 + this.#sides.length * (1 + this.#comparison.cases.length)
  }

  get widths(): readonly number[] {
    return Array.from({ length: this.#width }, (_, k) => (k === 0 ? 34 : k <= this.#sides.length ? 11 : 15))
  }

  get numeric(): readonly boolean[] {
    return Array.from({ length: this.#width }, (_, k) => k > 0)
  }

  /** Cells from the left on; the rest of the row is blank, under the mark of a heading. */
  add(cells: readonly TableCell[]): void {
    const mark = cells[0]?.mark
    const rest = text('', mark === 'section' || mark === 'head' || mark === 'total' ? mark : undefined)
    this.cells.push([...cells, ...Array.from({ length: this.#width - cells.length }, () => rest)])
  }

  section(heading: string): void {
    this.add([])
    this.add([text(heading, 'section')])
  }

  /** The headings of columns: the cases by name, and under them which weights. */
  heads(label: string): void {
    const { cases, after } = this.#comparison
    const titles = ['Weight', ...cases.map(({ name }) => name)]
    const blanks = this.#sides.slice(1).map(() => '')
    const first = titles.flatMap((title) => [title, ...blanks])
    this.add([text(label, 'head'), ...first.map((title) => text(title, 'head'))])
    if (!after) return
    this.add([text('', 'head'), ...titles.flatMap(() => [text('Before', 'head'), text('After', 'head')])])
  }

  /** One row across all cases; what a case does not have is blank. */
  across(
    label: string,
    weight: ((weights: Float64Array) => number) | null,
    cell: (figures: StressFigures, of: StressCase, side: 'before' | 'after') => TableCell,
    mark?: Mark,
  ): void {
    const { before, after, cases } = this.#comparison
    const weights = { before, after }
    const blank = text('', mark)
    this.add([
      text(label, mark),
      ...this.#sides.map((side) =>
        weight && weights[side] ? number(weight(weights[side]), PERCENT, mark) : blank,
      ),
      ...cases.flatMap((one) =>
        this.#sides.map((side) => {
          const figures = typeof one.figures === 'string' ? null : one.figures[side]
          return figures ? cell(figures, one, side) : text('not shown', mark)
        }),
      ),
    ])
  }
}

function addVolatility(rows: StressRows, { cases, horizon }: StressComparison): void {
  rows.heads(`Volatility ${horizon}`)
  const [base] = cases
  const estimated = typeof base?.figures === 'string' ? undefined : base?.figures
  rows.across('Volatility', sumOf, ({ volatility }) => number(volatility?.total, PERCENT))
  rows.across('Change from as estimated', null, ({ volatility }, one, side) => {
    const from = estimated?.[side]?.volatility
    return one.scenario === null || !volatility || !from
      ? text('')
      : number(volatility.total - from.total, PERCENT)
  })
}

/** What adds up by position: by holding, then by each group column. */
function addParts(
  rows: StressRows,
  { names, groups, before }: StressComparison,
  heading: string,
  partsOf: (figures: StressFigures) => Parts | null,
): void {
  rows.section(`${heading} by holding`)
  rows.heads('Holding')
  names.forEach((name, i) =>
    rows.across(
      name,
      (weights) => weights[i]!,
      (figures) => number(partsOf(figures)?.parts[i], PERCENT),
    ),
  )
  rows.across('Total', sumOf, (figures) => number(partsOf(figures)?.total, PERCENT, 'total'), 'total')
  rows.across('Sum of parts', null, (figures) => number(sumOfParts(partsOf(figures)), PERCENT))
  rows.across('Difference', null, (figures) => number(partsOf(figures)?.difference, ROUNDING))
  groups.forEach(({ header, labels, groupOf }, column) => {
    rows.section(`${heading} by ${header}`)
    rows.heads(header)
    labels.forEach((label, group) =>
      rows.across(
        label,
        (weights) => before.reduce((sum, _, i) => sum + (groupOf[i] === group ? weights[i]! : 0), 0),
        (figures) => number(partsOf(figures)?.byGroup[column]?.[group], PERCENT),
      ),
    )
    rows.across(
      'Total',
      sumOf,
      (figures) => {
        const sums = partsOf(figures)?.byGroup[column]
        return number(sums && sumOf(sums), PERCENT, 'total')
      },
      'total',
    )
  })
}

const sumOfParts = (parts: Parts | null): number | null => parts && parts.total + parts.difference

function addStretches(rows: StressRows, comparison: StressComparison): void {
  rows.section('Return over the replayed dates')
  rows.heads('Not scaled to the year')
  const label = (name: string, of: (one: StressCase) => string | undefined): void =>
    rows.across(name, null, (_, one) => text(of(one) ?? ''))
  label('First date', ({ dates }) => dates?.first)
  label('Last date', ({ dates }) => dates?.last)
  label('Dates', ({ dates }) => dates?.used.toLocaleString('en-US'))
  rows.across('Sum of returns', null, ({ stretch }) => number(stretch?.total, PERCENT))
  rows.across('Compounded return', null, ({ stretch }) => number(stretch?.compounded, PERCENT))
  rows.across('Worst fall from peak to trough', null, ({ stretch }) =>
    number(stretch?.worstFall?.share, PERCENT),
  )
  rows.across('Peak', null, ({ stretch }) => text(stretch?.worstFall?.between?.[0] ?? ''))
  rows.across('Trough', null, ({ stretch }) => text(stretch?.worstFall?.between?.[1] ?? ''))
  addParts(rows, comparison, 'Part of the sum of returns', ({ stretch }) => stretch)
}
