import { useMemo } from 'react'
import { makeStyles, mergeClasses, tokens } from '@fluentui/react-components'
import {
  CAUTION,
  LIMIT_STATUS,
  limitsSummary,
  limitText,
  percentText,
  quote,
  sharesWithheldOf,
  type Breakdown,
  type Comparison,
  type LimitState,
  type Profile,
  type TradesState,
} from '../sheet'
import { Choice, Folded, Section } from './controls'
import { Remark } from './headline'
import { digitsApart, digitsFor, pointsText } from './measure'
import { NONE } from './positions'
import { useStepStyles } from './step'
import { useKept } from './store'
import { FigureTable, Pairs, TieOut, type Sorting, type TableColumn, type TableRow } from './table'

const useStyles = makeStyles({
  sections: { minWidth: 0, borderBottom: `1px solid ${tokens.colorNeutralStroke2}` },
  limits: {
    listStyleType: 'none',
    margin: 0,
    padding: 0,
    display: 'grid',
    rowGap: tokens.spacingVerticalXXS,
  },
  mark: { fontWeight: tokens.fontWeightSemibold },
})

/** What takes the difference that trades leave; a proposal says it of itself, and of weights in the sheet nobody knows. */
function paidBy({ financing, proposal, pending }: TradesState): string {
  if (proposal) return ''
  if (!pending) return 'All changes are in the sheet already. '
  return `Paid for by: ${
    financing.kind === 'cash'
      ? 'cash beyond the holdings; nothing else moves'
      : financing.kind === 'pro rata'
        ? 'the rest of the book, in proportion to its weights'
        : `the holding ${quote(financing.key)}`
  }. `
}

// ---- the figures of the whole book

const columns = (first: string): readonly TableColumn[] => [
  { head: first, width: null },
  { head: 'Before', width: 62 },
  { head: 'After', width: 62 },
  { head: 'Change, points', width: 62 },
]

const figureRow = (name: string, before: number | null, after: number | null): TableRow => ({
  key: name,
  name,
  cells: [
    before === null ? NONE : percentText(before, 2),
    after === null ? NONE : percentText(after, 2),
    before === null || after === null ? NONE : pointsText(after - before, 2),
  ],
})

function totalRows(
  { before, after, turnover }: Comparison,
  { horizon, tails }: Breakdown,
): readonly TableRow[] {
  const [tailBefore, tailAfter] = [before.tails(), after.tails()]
  const label = typeof tails === 'string' ? '' : `, ${tails.label}`
  return [
    figureRow(`Volatility ${horizon}`, before.decomposition.volatility, after.decomposition.volatility),
    ...(before.trackingError === null && after.trackingError === null
      ? []
      : [figureRow(`Tracking error (ex ante) ${horizon}`, before.trackingError, after.trackingError)]),
    ...(tailBefore || tailAfter
      ? [figureRow(`Value at risk${label}`, tailBefore?.valueAtRisk ?? null, tailAfter?.valueAtRisk ?? null)]
      : []),
    ...(tailBefore?.shortfall == null && tailAfter?.shortfall == null
      ? []
      : [
          figureRow(
            `Expected shortfall${label}`,
            tailBefore?.shortfall ?? null,
            tailAfter?.shortfall ?? null,
          ),
        ]),
    figureRow('Net weight', before.net, after.net),
    figureRow('Gross weight', before.gross, after.gross),
    { key: 'Turnover', name: 'Turnover, one way', cells: ['', percentText(turnover, 2), ''] },
  ]
}

/** How good the sensitivities were, in as many decimals as tell the two apart. */
function foretold({ before, after, firstOrder }: Comparison): string {
  if (firstOrder === null) return 'Sensitivities foretell nothing here: there was no risk before.'
  const exact = after.decomposition.volatility
  const digits = percentText(firstOrder.volatility, 2) === percentText(exact, 2) ? 4 : 2
  return `Sensitivities foretell a volatility of ${percentText(firstOrder.volatility, digits)}, exact ${percentText(exact, digits)}; before the trades ${percentText(before.decomposition.volatility, digits)}.`
}

// ---- limits

/** Limits told line by line before the rest is counted. */
const MOST_LIMITS = 8

const isOver = ({ status }: LimitState): boolean => status === 'breach' || status === 'over soft'

/** "15.90% → 15.00%; soft limit 13.00%, hard limit 15.00%" */
function limitFigures(then: LimitState, now: LimitState): string {
  const { soft, hard } = now.limit
  const digits = Math.max(digitsApart(then.figure, soft, hard), digitsApart(now.figure, soft, hard))
  const orNone = (figure: number | null): string => (figure === null ? NONE : percentText(figure, digits))
  const edges = [
    ...(soft === null ? [] : [`soft limit ${percentText(soft, digits)}`]),
    ...(hard === null ? [] : [`hard limit ${percentText(hard, digits)}`]),
  ]
  return `${orNone(then.figure)} → ${orNone(now.figure)}; ${edges.join(', ')}`
}

function Limits({ before, after }: { before: readonly LimitState[]; after: readonly LimitState[] }) {
  const classes = { ...useStepStyles(), ...useStyles() }
  if (after.length === 0) return null
  const over = after.flatMap((now, k) => {
    const then = before[k]
    return then && (isOver(now) || isOver(then)) ? [{ then, now }] : []
  })
  const word = ({ status }: LimitState): string => `${LIMIT_STATUS[status].mark} ${LIMIT_STATUS[status].word}`
  return (
    <Section title="Limits over, before and after" level={3}>
      <p className={classes.small}>
        Before: {limitsSummary(before)}. After: {limitsSummary(after)}.
      </p>
      {over.length > 0 && (
        <ul className={mergeClasses(classes.small, classes.limits)} aria-label="Limits over before or after">
          {over.slice(0, MOST_LIMITS).map(({ then, now }, k) => (
            <li key={k}>
              <span className={classes.mark}>
                {then.status === now.status ? word(now) : `${word(then)} → ${word(now)}`}
              </span>
              : {limitText(now.limit)}, {limitFigures(then, now)}
            </li>
          ))}
        </ul>
      )}
      {over.length > MOST_LIMITS && <p className={classes.small}>And {over.length - MOST_LIMITS} more.</p>}
    </Section>
  )
}

// ---- groups and holdings

const MEASURES = [
  ['share', 'Share of risk'],
  ['contribution', 'Contribution to risk'],
  ['weight', 'Weight'],
] as const
type Measured = (typeof MEASURES)[number][0]

/** One measure of the rows of a table, on both sides. */
interface Sides {
  readonly before: ArrayLike<number> | null
  readonly after: ArrayLike<number> | null
}

const difference = ({ before, after }: Sides, i: number): number => (after?.[i] ?? NaN) - (before?.[i] ?? NaN)

/** Shares as they may be shown. */
const sharesOf = (profile: Profile, share: Float64Array | null): Float64Array | null =>
  sharesWithheldOf(profile.decomposition) === null ? share : null

const positionSides = ({ before, after }: Comparison, measured: Measured): Sides => {
  const side = (profile: Profile): ArrayLike<number> | null => {
    const { decomposition: d } = profile
    return measured === 'weight'
      ? d.weights
      : measured === 'contribution'
        ? d.contribution
        : sharesOf(profile, d.share)
  }
  return { before: side(before), after: side(after) }
}

const groupSides = ({ before, after }: Comparison, k: number, measured: Measured): Sides => {
  const side = (profile: Profile): ArrayLike<number> | null => {
    const group = profile.groups[k]
    if (!group) return null
    return measured === 'share' ? sharesOf(profile, group.share) : group[measured]
  }
  return { before: side(before), after: side(after) }
}

const figureOf = (values: ArrayLike<number> | null, i: number, digits: number): string => {
  const value = values?.[i]
  return value === undefined || Number.isNaN(value) ? NONE : percentText(value, digits)
}

const changeOf = (sides: Sides, i: number, digits: number): string => {
  const change = difference(sides, i)
  return Number.isNaN(change) ? NONE : pointsText(change, digits)
}

const CHANGE = 3

/** The order of rows: by name, by a side, or by the size of the change whatever its sign. */
function orderOf(names: readonly string[], sides: Sides, { column, descending }: Sorting): readonly number[] {
  const value = (i: number): number => {
    const figure =
      column === CHANGE
        ? Math.abs(difference(sides, i))
        : (sides[column === 1 ? 'before' : 'after']?.[i] ?? NaN)
    return Number.isNaN(figure) ? -Infinity : figure
  }
  const compare = (a: number, b: number): number =>
    column === 0
      ? (names[a] ?? '').localeCompare(names[b] ?? '', undefined, { numeric: true })
      : value(a) === value(b)
        ? 0
        : value(a) - value(b)
  return names.map((_, i) => i).sort((a, b) => (descending ? compare(b, a) : compare(a, b)) || a - b)
}

/** Names and what they are measured by, on both sides. */
type Table = readonly [names: readonly string[], sides: Sides]

/** The row of all tables that moved most, in words. */
function mostMoved(tables: readonly Table[], digits: number): string {
  const rows = tables.flatMap(([names, sides]) =>
    sides.before === null || sides.after === null ? [] : names.map((name, i) => ({ name, sides, i })),
  )
  const [first, ...others] = rows
  if (!first) return 'Shares are withheld'
  const moved = ({ sides, i }: typeof first): number => Math.abs(difference(sides, i))
  const { name, sides, i } = others.reduce((best, row) => (moved(row) > moved(best) ? row : best), first)
  return `${name}: ${figureOf(sides.before, i, digits)} → ${figureOf(sides.after, i, digits)}`
}

type Pair = readonly [label: string, value: string]

function SidesTable({
  label,
  first,
  names,
  sides,
  total,
  digits,
  sorting,
  sortBy,
  details,
}: {
  label: string
  /** head of the column of names */
  first: string
  names: readonly string[]
  sides: Sides
  total: Sides
  digits: number
  sorting: Sorting
  sortBy: (column: number) => void
  /** where a press on a name opens the rest of its figures */
  details?: {
    readonly opened: ReadonlySet<string>
    readonly toggle: (name: string) => void
    readonly of: (i: number) => readonly Pair[]
  }
}) {
  const cells = (of: Sides, i: number): readonly string[] => [
    figureOf(of.before, i, digits),
    figureOf(of.after, i, digits),
    changeOf(of, i, digits),
  ]
  return (
    <FigureTable
      label={label}
      columns={columns(first)}
      sorting={sorting}
      sortBy={sortBy}
      rows={orderOf(names, sides, sorting).map((i) => ({
        key: names[i] ?? i,
        name: names[i] ?? '',
        cells: cells(sides, i),
        ...(details && {
          open: details.opened.has(names[i] ?? ''),
          details: () => <Pairs pairs={details.of(i)} />,
        }),
      }))}
      totals={[['Total', ...cells(total, 0)]]}
      {...(details && { toggle: (key: string | number) => details.toggle(String(key)) })}
    />
  )
}

/** The total of a measure on both sides. */
const totalOf = (comparison: Comparison, measured: Measured): Sides => {
  const side = (profile: Profile): number[] | null =>
    measured === 'weight'
      ? [profile.net]
      : measured === 'contribution'
        ? [profile.decomposition.volatility]
        : sharesOf(profile, profile.decomposition.share) && [1]
  return { before: side(comparison.before), after: side(comparison.after) }
}

/** Every group and every holding on both sides, by one figure at a time. */
function Parts({ comparison, keys }: { comparison: Comparison; keys: readonly string[] }) {
  const classes = useStyles()
  const [measured, setMeasured] = useKept<Measured>('trades figure', 'share')
  const [sorting, setSorting] = useKept<Sorting>('trades sorted', { column: CHANGE, descending: true })
  const [opened, setOpened] = useKept<ReadonlySet<string>>('trades open', new Set())
  const { before, after, firstOrder } = comparison
  const many = digitsFor(keys.length)
  const digits = measured === 'share' ? many : measured === 'contribution' ? many + 1 : 2
  const label = MEASURES.find(([key]) => key === measured)?.[1] ?? ''
  const headline = (tables: readonly Table[]): string =>
    `${label}, largest change: ${mostMoved(tables, digits)}`
  const sortBy = (column: number): void =>
    setSorting({ column, descending: sorting.column === column ? !sorting.descending : column !== 0 })
  const toggle = (name: string): void => {
    const next = new Set(opened)
    if (!next.delete(name)) next.add(name)
    setOpened(next)
  }
  const pair = (name: string, of: Measured, i: number, decimals: number): Pair => {
    const sides = positionSides(comparison, of)
    return [name, `${figureOf(sides.before, i, decimals)} → ${figureOf(sides.after, i, decimals)}`]
  }
  const details = (i: number): Pair[] => [
    pair('Weight', 'weight', i, 2),
    pair('Contribution to risk', 'contribution', i, many + 1),
    ...(firstOrder
      ? [
          [
            'Contribution foretold by sensitivities',
            percentText(firstOrder.contribution[i] ?? NaN, many + 1),
          ] as const,
        ]
      : []),
    pair('Share of risk', 'share', i, many),
  ]
  const withheld =
    measured === 'share'
      ? (sharesWithheldOf(before.decomposition) ?? sharesWithheldOf(after.decomposition))
      : null
  const shown = { sorting, sortBy, digits, total: totalOf(comparison, measured) }
  const figure = <Choice label="Figure" value={measured} choices={MEASURES} choose={setMeasured} />
  const sides = positionSides(comparison, measured)
  const [firstGroup] = after.groups
  return (
    <div className={classes.sections}>
      {firstGroup && (
        <Folded
          title="Groups before and after"
          headline={headline(
            after.groups.map(({ labels }, k) => [labels, groupSides(comparison, k, measured)]),
          )}
        >
          {figure}
          {withheld !== null && <Remark text={withheld} />}
          {after.groups.map(({ header, labels }, k) => (
            <Section key={k} title={`By ${header}`} level={3}>
              <SidesTable
                {...shown}
                label={`${label} by ${header}, before and after`}
                first={header}
                names={labels}
                sides={groupSides(comparison, k, measured)}
              />
            </Section>
          ))}
        </Folded>
      )}
      <Folded title="Holdings before and after" headline={headline([[keys, sides]])}>
        {figure}
        {withheld !== null && <Remark text={withheld} />}
        <SidesTable
          {...shown}
          label={`${label} by holding, before and after`}
          first="Holding"
          names={keys}
          sides={sides}
          details={{ opened, toggle, of: details }}
        />
        <TieOut
          parts="Contributions after the trades"
          sum={after.decomposition.sumOfContributions}
          total="volatility"
          whole={after.decomposition.volatility}
        />
      </Folded>
    </div>
  )
}

/** What the trades come to: the book before and after, its limits, its groups and its holdings. */
export function BeforeAfter({
  comparison,
  trades,
  breakdown,
}: {
  /** or why there is none */
  comparison: Comparison | string
  trades: TradesState
  breakdown: Breakdown
}) {
  const classes = useStepStyles()
  const rows = useMemo(
    () => (typeof comparison === 'string' ? [] : totalRows(comparison, breakdown)),
    [comparison, breakdown],
  )
  if (typeof comparison === 'string')
    return (
      <Section title="Before and after">
        <p className={mergeClasses(classes.small, classes.quiet)}>{comparison}</p>
      </Section>
    )
  return (
    <>
      <Section title="Before and after">
        <FigureTable label="Before and after" columns={columns('Of the book')} rows={rows} />
        <p className={classes.small}>{foretold(comparison)}</p>
        <p className={classes.small}>
          {paidBy(trades)}Turnover is the larger of what is bought and what is sold.
        </p>
        <p className={mergeClasses(classes.small, classes.quiet)}>{CAUTION}</p>
      </Section>
      <Limits before={comparison.limitsBefore} after={comparison.limitsAfter} />
      <Parts comparison={comparison} keys={trades.lines.map(({ key }) => key)} />
    </>
  )
}
