import { memo, useRef, useState } from 'react'
import { Button, makeStyles, mergeClasses, tokens } from '@fluentui/react-components'
import {
  CAUTION,
  countOf,
  numberText,
  percentText,
  type Breakdown,
  type Scenario,
  type StressCase,
  type StressComparison,
  type StressFigures,
  type TradesState,
  type VolatilityFactor,
} from '../sheet'
import { Choice, Entry, PercentEntry, Section, typedNumber } from './controls'
import { Remark } from './headline'
import { digitsFor, pointsText } from './measure'
import { Sentence } from './place'
import { NONE } from './positions'
import { FaultLine, useStepStyles } from './step'
import { useBooks, useKept } from './store'
import { FigureTable, Pairs, type TableColumn } from './table'

const useStyles = makeStyles({
  details: { display: 'grid', rowGap: tokens.spacingVerticalS },
  head: { margin: 0, fontWeight: tokens.fontWeightSemibold },
  add: {
    display: 'grid',
    rowGap: tokens.spacingVerticalS,
    minWidth: 0,
  },
})

/** What the list begins with: it stands there, each can be taken off. */
const FIRST: readonly Scenario[] = [
  { kind: 'volatilities', factor: 1.5 },
  { kind: 'correlations', theta: 0.5 },
  { kind: 'both', factor: 1.5, theta: 0.5 },
]

// ---- adding one

type Kind = 'volatilities' | 'correlations' | 'both' | 'stretch' | 'worst'

const KINDS: readonly (readonly [Kind, string])[] = [
  ['volatilities', 'Volatilities larger or smaller'],
  ['correlations', 'Correlations moved toward 1'],
  ['both', 'Volatilities and correlations'],
  ['stretch', 'A stretch of the past, by its dates'],
  ['worst', 'The stretch with the largest loss'],
]

interface Draft {
  readonly kind: Kind
  readonly factor: number
  /** heading of the group column that factors go by; null: one for all */
  readonly header: string | null
  /** by label; those that are absent are 1 */
  readonly factors: ReadonlyMap<string, number>
  readonly theta: number
  /** serial numbers, or rows of returns without dates */
  readonly from: number | null
  readonly to: number | null
  readonly dates: number
}

const DRAFT: Draft = {
  kind: 'volatilities',
  factor: 2,
  header: null,
  factors: new Map(),
  theta: 0.5,
  from: null,
  to: null,
  dates: 13,
}

/** Days of a workbook's calendar before the browser's begins. */
const EPOCH = 25569
const DAY = 86_400_000

const dayOf = (serial: number): string => new Date((serial - EPOCH) * DAY).toISOString().slice(0, 10)

const serialOf = (day: string): number | null => {
  const time = Date.parse(`${day}T00:00:00Z`)
  return Number.isNaN(time) ? null : time / DAY + EPOCH
}

const factorRead = (text: string): { readonly value: number } | { readonly needed: string } => {
  const value = typedNumber(text)
  return value !== null && value > 0 ? { value } : { needed: 'A number above 0 is needed.' }
}

function FactorFields({
  draft,
  change,
  groups,
}: {
  draft: Draft
  change: (part: Partial<Draft>) => void
  groups: Breakdown['byGroup']
}) {
  const classes = useStepStyles()
  const group = groups.find(({ header }) => header === draft.header)
  return (
    <div className={classes.pairs}>
      {groups.length > 0 && (
        <div className={group && classes.wide}>
          <Choice<string>
            label="Volatilities of"
            value={group?.header ?? ''}
            choices={[
              ['', 'All holdings'],
              ...groups.map(({ header }) => [header, `Each ${header}`] as const),
            ]}
            choose={(header) => change({ header: header === '' ? null : header, factors: new Map() })}
          />
        </div>
      )}
      {group ? (
        group.labels.map((label) => (
          <Entry
            key={label}
            label={`${label}, times`}
            shown={String(draft.factors.get(label) ?? 1)}
            read={factorRead}
            commit={(factor) => change({ factors: new Map(draft.factors).set(label, factor) })}
          />
        ))
      ) : (
        <Entry
          label="Times"
          shown={String(draft.factor)}
          read={factorRead}
          commit={(factor) => change({ factor })}
        />
      )}
    </div>
  )
}

function StretchFields({
  draft,
  change,
  dates,
}: {
  draft: Draft
  change: (part: Partial<Draft>) => void
  dates: NonNullable<Breakdown['dates']>
}) {
  const classes = useStepStyles()
  const dated = typeof dates.first === 'number'
  const ends = [
    ['from', 'First date', draft.from ?? startOf(dates)],
    ['to', 'Last date', draft.to ?? endOf(dates)],
  ] as const
  return (
    <div className={classes.pairs}>
      {ends.map(([end, label, value]) =>
        dated ? (
          <Entry
            key={end}
            label={label}
            type="date"
            shown={dayOf(value)}
            read={(text) => {
              const serial = serialOf(text)
              return serial === null ? { needed: 'A date is needed.' } : { value: serial }
            }}
            commit={(serial) => change({ [end]: serial })}
          />
        ) : (
          <Entry
            key={end}
            label={`${label}, counted from the oldest`}
            shown={String(value)}
            read={(text) => {
              const row = typedNumber(text)
              return row !== null && Number.isInteger(row) && row > 0
                ? { value: row }
                : { needed: 'A whole number of 1 or more is needed.' }
            }}
            commit={(row) => change({ [end]: row })}
          />
        ),
      )}
    </div>
  )
}

type Dates = NonNullable<Breakdown['dates']>

const startOf = ({ first }: Dates): number => (typeof first === 'number' ? Math.floor(first) : 1)
const endOf = ({ last, used, dropped }: Dates): number =>
  typeof last === 'number' ? Math.floor(last) : used + dropped

/** What the fields say; null where they say nothing that could be added. */
function scenarioOf(draft: Draft, groups: Breakdown['byGroup'], dates: Dates | null): Scenario | null {
  const group = groups.find(({ header }) => header === draft.header)
  const factors = [...draft.factors].filter(
    ([label, factor]) => factor !== 1 && group?.labels.includes(label),
  )
  const factor: VolatilityFactor | null = !group
    ? draft.factor
    : factors.length === 0
      ? null
      : { header: group.header, factors }
  switch (draft.kind) {
    case 'volatilities':
      return factor === null ? null : { kind: 'volatilities', factor }
    case 'correlations':
      return { kind: 'correlations', theta: draft.theta }
    case 'both':
      return factor === null ? null : { kind: 'both', factor, theta: draft.theta }
    case 'stretch':
      return (
        dates && {
          kind: 'stretch',
          by: typeof dates.first === 'number' ? 'dates' : 'rows',
          from: draft.from ?? startOf(dates),
          to: draft.to ?? endOf(dates),
        }
      )
    case 'worst':
      return null
  }
}

/** The fields of a scenario to be added. */
function Adding({ breakdown, add }: { breakdown: Breakdown; add: (scenario: Scenario) => void }) {
  const books = useBooks()
  const classes = { ...useStepStyles(), ...useStyles() }
  const [draft, setDraft] = useKept<Draft>('scenario', DRAFT)
  const change = (part: Partial<Draft>): void => setDraft({ ...draft, ...part })
  const { byGroup, dates } = breakdown
  const { kind } = draft
  const bends = kind === 'volatilities' || kind === 'both'
  const worst = kind === 'worst' ? books.worstStretch(draft.dates) : null
  const found = worst !== null && typeof worst !== 'string' ? worst.scenario : null
  const scenario = found ?? scenarioOf(draft, byGroup, dates)
  return (
    <Section title="Add a scenario" level={3}>
      <div className={classes.add}>
        <Choice label="Scenario" value={kind} choices={KINDS} choose={(next) => change({ kind: next })} />
        {bends && <FactorFields draft={draft} change={change} groups={byGroup} />}
        {(kind === 'correlations' || kind === 'both') && (
          <PercentEntry
            label="Part of the way to 1, %"
            value={draft.theta}
            from={0}
            to={1}
            hint="Every correlation goes this part of the way; the matrix stays a covariance matrix."
            commit={(theta) => change({ theta })}
          />
        )}
        {kind === 'stretch' && dates && <StretchFields draft={draft} change={change} dates={dates} />}
        {kind === 'worst' && (
          <Entry
            label="Dates"
            shown={String(draft.dates)}
            read={(text) => {
              const value = typedNumber(text)
              return value !== null && Number.isInteger(value) && value >= 1
                ? { value }
                : { needed: 'A whole number of 1 or more is needed.' }
            }}
            commit={(count) => change({ dates: count })}
          />
        )}
        {worst !== null && (
          <p className={classes.small} role="status">
            <Sentence text={typeof worst === 'string' ? worst : worst.sentence} />
          </p>
        )}
        {(kind === 'stretch' || kind === 'worst') && !dates && worst === null && (
          <p className={classes.small}>A covariance matrix holds no dates to replay.</p>
        )}
        {bends && scenario === null && (
          <p className={mergeClasses(classes.small, classes.quiet)}>
            All factors are 1, as estimated: a scenario needs another one.
          </p>
        )}
        <div>
          <Button
            size="small"
            disabledFocusable={scenario === null}
            onClick={() => scenario && add(scenario)}
          >
            Add to the scenarios
          </Button>
        </div>
      </div>
    </Section>
  )
}

// ---- what comes out

const volatilityOf = (figures: StressFigures | null): string =>
  figures?.volatility ? percentText(figures.volatility.total, 2) : NONE

const returnOf = (figures: StressFigures | null): string =>
  figures?.stretch && figures.stretch.compounded !== null ? percentText(figures.stretch.compounded, 2) : NONE

/** Parts shown of one scenario before the others are counted. */
const MOST = 10

type Parts = NonNullable<StressFigures['volatility']>

/** Contributions of holdings or groups, the largest first, before and after. */
function partPairs(
  names: readonly string[],
  before: ArrayLike<number>,
  after: ArrayLike<number> | null,
  digits: number,
): readonly (readonly [string, string])[] {
  const size = (i: number): number => Math.abs(before[i] ?? 0) + Math.abs(after?.[i] ?? 0)
  const order = names.map((_, i) => i).sort((a, b) => size(b) - size(a) || a - b)
  const shown = order.slice(0, MOST)
  const rest = order.slice(MOST)
  const sum = (values: ArrayLike<number>): number => rest.reduce((total, i) => total + (values[i] ?? 0), 0)
  const text = (one: number, other: number | null): string =>
    other === null ? percentText(one, digits) : `${percentText(one, digits)} → ${percentText(other, digits)}`
  return [
    ...shown.map((i) => [names[i]!, text(before[i] ?? 0, after ? (after[i] ?? 0) : null)] as const),
    ...(rest.length > 0
      ? [[`${countOf(rest.length, 'other')}`, text(sum(before), after ? sum(after) : null)] as const]
      : []),
  ]
}

function Details({
  one,
  comparison,
  remove,
}: {
  one: StressCase
  comparison: StressComparison
  remove: (() => void) | null
}) {
  const classes = { ...useStepStyles(), ...useStyles() }
  const { figures, dates, notes } = one
  const { names, groups } = comparison
  const digits = digitsFor(names.length) + 1
  const takeOff = remove && (
    <div>
      <Button size="small" onClick={remove} aria-label={`Take off: ${one.name}`}>
        Take off
      </Button>
    </div>
  )
  if (typeof figures === 'string') return <div className={classes.details}>{takeOff}</div>
  const { before, after } = figures
  const tables = (
    title: string,
    of: (side: StressFigures) => Parts | null,
  ): readonly (readonly [string, readonly (readonly [string, string])[]])[] => {
    const [one_, other] = [of(before), after && of(after)]
    if (!one_) return []
    return [
      ...groups.map(
        ({ header, labels }, k) =>
          [
            `${title} by ${header}`,
            partPairs(labels, one_.byGroup[k]!, other?.byGroup[k] ?? null, digits),
          ] as const,
      ),
      [`${title} by holding`, partPairs(names, one_.parts, other?.parts ?? null, digits)],
    ]
  }
  const stretchLines = (title: string, side: StressFigures | null): readonly (readonly [string, string])[] =>
    side?.stretch
      ? [
          [`Sum of returns${title}`, percentText(side.stretch.total, 2)],
          [`Compounded${title}`, returnOf(side)],
          ...(side.stretch.worstFall
            ? [
                [`Largest fall${title}`, percentText(side.stretch.worstFall.share, 2)] as const,
                ...(side.stretch.worstFall.between
                  ? [[`From peak to trough${title}`, side.stretch.worstFall.between.join(' to ')] as const]
                  : []),
              ]
            : []),
        ]
      : []
  const lines = [
    ...stretchLines(after ? ', before' : '', before),
    ...(after ? stretchLines(', after', after) : []),
  ]
  return (
    <div className={classes.details}>
      {takeOff}
      {dates && (
        <p className={classes.small}>
          {countOf(dates.used, 'date')}, {dates.first} to {dates.last}. Weights are held at every date.
        </p>
      )}
      {notes.map((note) => (
        <p key={note} className={classes.small}>
          {note}
        </p>
      ))}
      {lines.length > 0 && <Pairs pairs={lines} />}
      {[
        ...tables('Contribution to the return', ({ stretch }) => stretch),
        ...tables('Contribution to risk', ({ volatility }) => volatility),
      ].map(([title, pairs]) => (
        <div key={title}>
          <p className={classes.head}>{title}</p>
          <Pairs pairs={pairs} />
        </div>
      ))}
    </div>
  )
}

interface Compared {
  readonly scenarios: readonly Scenario[]
  readonly remove: (place: number) => void
  readonly breakdown: Breakdown
  readonly comparison: TradesState['comparison']
}

/** The scenarios side by side; asked for anew when the figures, the trades or the scenarios are others. */
const SideBySide = memo(
  function SideBySide({ scenarios, remove }: Compared) {
    const books = useBooks()
    const classes = useStepStyles()
    const [opened, setOpened] = useState<ReadonlySet<string | number>>(new Set())
    const within = useRef<HTMLDivElement>(null)
    // the button goes with its scenario: the focus stays in the table
    const takeOff = (place: number): void => {
      remove(place)
      requestAnimationFrame(() => within.current?.querySelector<HTMLElement>('[tabindex="0"]')?.focus())
    }
    const found = books.stressOf(scenarios)
    if (typeof found === 'string') return <Remark text={found} />
    const { cases, after, horizon } = found
    const traded = after !== null
    const [estimated] = cases
    const base =
      estimated && typeof estimated.figures !== 'string'
        ? estimated.figures.before.volatility?.total
        : undefined
    const columns: readonly TableColumn[] = traded
      ? [
          { head: 'Scenario', width: null },
          { head: 'Volatility before', width: 62 },
          { head: 'Volatility after', width: 62 },
          { head: 'Change, points', width: 62 },
        ]
      : [
          { head: 'Scenario', width: null },
          { head: `Volatility ${horizon}`, width: 70 },
          { head: 'Times as estimated', width: 70 },
        ]
    const cellsOf = ({ figures }: StressCase): readonly string[] => {
      if (typeof figures === 'string') return columns.slice(1).map(() => NONE)
      const [one, other] = [figures.before.volatility, figures.after?.volatility]
      return traded
        ? [
            volatilityOf(figures.before),
            volatilityOf(figures.after),
            one && other ? pointsText(other.total - one.total, 2) : NONE,
          ]
        : [volatilityOf(figures.before), one && base ? numberText(one.total / base, 2) : NONE]
    }
    const stretches = cases.filter(({ scenario }) => scenario?.kind === 'stretch')
    const keyOf = (place: number): string => `${place} ${cases[place]?.name ?? ''}`
    return (
      <div className={classes.cell} ref={within}>
        <FigureTable
          label="Scenarios side by side"
          columns={columns}
          rows={cases.map((one, place) => ({
            key: keyOf(place),
            name: one.name,
            ...(typeof one.figures === 'string'
              ? { mark: <div className={classes.small}>{one.figures}</div> }
              : {}),
            cells: cellsOf(one),
            open: opened.has(keyOf(place)),
            details: () => (
              <Details
                one={one}
                comparison={found}
                remove={one.scenario === null ? null : () => takeOff(place - 1)}
              />
            ),
          }))}
          toggle={(key) => {
            const next = new Set(opened)
            if (!next.delete(key)) next.add(key)
            setOpened(next)
          }}
        />
        {stretches.some(({ figures }) => typeof figures !== 'string') && (
          <FigureTable
            label="Returns of the stretches"
            columns={[
              { head: 'Stretch replayed', width: null },
              ...(traded
                ? [
                    { head: 'Return before', width: 68 },
                    { head: 'Return after', width: 68 },
                  ]
                : [{ head: 'Return', width: 68 }]),
            ]}
            rows={stretches.map(({ name, figures }) => ({
              key: name,
              name: name.replace(/ replayed$/, ''),
              cells:
                typeof figures === 'string'
                  ? traded
                    ? [NONE, NONE]
                    : [NONE]
                  : traded
                    ? [returnOf(figures.before), returnOf(figures.after)]
                    : [returnOf(figures.before)],
            }))}
          />
        )}
      </div>
    )
  },
  (a: Compared, b: Compared) =>
    a.scenarios === b.scenarios && a.breakdown === b.breakdown && a.comparison === b.comparison,
)

const sameScenario = (a: Scenario, b: Scenario): boolean => JSON.stringify(a) === JSON.stringify(b)

/** The book in scenarios of the user's own, before and after the trades. */
export default function Stress({
  breakdown,
  trades,
  busy,
  fault,
  asked,
}: {
  breakdown: Breakdown
  trades: TradesState
  /** whether another action is under way */
  busy: boolean
  fault: string | undefined
  /** told when a table is to be written */
  asked: () => void
}) {
  const books = useBooks()
  const classes = useStepStyles()
  const [scenarios, setScenarios] = useKept<readonly Scenario[]>('scenarios', FIRST)
  return (
    <>
      <p className={mergeClasses(classes.small, classes.quiet)}>
        What the estimate would say if its volatilities or correlations were others, and what past dates would
        have done to these weights. A scenario is a question, not a forecast. {CAUTION}
      </p>
      <SideBySide
        scenarios={scenarios}
        breakdown={breakdown}
        comparison={trades.comparison}
        remove={(place) => setScenarios(scenarios.filter((_, k) => k !== place))}
      />
      <p className={mergeClasses(classes.small, classes.quiet)}>
        Open a scenario for its contributions, or to take it off.
      </p>
      <FaultLine text={fault} />
      <div className={classes.buttons}>
        <Button
          size="small"
          disabledFocusable={busy}
          onClick={() => {
            asked()
            void books.writeStress(scenarios)
          }}
        >
          Write to a sheet
        </Button>
      </div>
      <Adding
        breakdown={breakdown}
        add={(scenario) => {
          if (!scenarios.some((other) => sameScenario(other, scenario)))
            setScenarios([...scenarios, scenario])
        }}
      />
    </>
  )
}
