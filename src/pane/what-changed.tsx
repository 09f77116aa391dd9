import { Button, makeStyles, mergeClasses, tokens } from '@fluentui/react-components'
import {
  CAUTION,
  NOW,
  percentText,
  type BooksState,
  type ChangeLine,
  type RiskChange,
  type SnapshotHead,
} from '../sheet'
import { changeOf, changeSentence, digitsOf, sideText } from './change-words'
import { Choice, Disclosure, Section } from './controls'
import { SavePicture } from './handing-over'
import { Remark } from './headline'
import { pointsText } from './measure'
import { changePicture } from './picture-file'
import { NONE } from './positions'
import { FaultLine, useStepStyles } from './step'
import { useBooks, useKept } from './store'
import { FigureTable, Pairs, useTableStyles, type Sorting, type TableColumn } from './table'
import Waterfall from './waterfall'

const useStyles = makeStyles({
  fields: { display: 'grid', rowGap: tokens.spacingVerticalS, minWidth: 0 },
  headline: {
    margin: 0,
    fontSize: tokens.fontSizeBase300,
    lineHeight: tokens.lineHeightBase300,
    fontWeight: tokens.fontWeightSemibold,
    fontVariantNumeric: 'tabular-nums',
    overflowWrap: 'anywhere',
  },
  notes: {
    margin: 0,
    paddingLeft: tokens.spacingHorizontalL,
    fontSize: tokens.fontSizeBase200,
    lineHeight: tokens.lineHeightBase200,
  },
})

// ---- line by line

/** Soft hyphens: the two long words stand over narrow figures. */
const COLUMNS = {
  change: { head: 'Change, points', width: 50 },
  settings: { head: 'Settings', width: 50 },
  positions: { head: 'Positions', width: 60 },
  volatilities: { head: 'Volatil\u00adities', width: 50 },
  correlations: { head: 'Correl\u00adations', width: 50 },
} as const

type Key = keyof typeof COLUMNS

const valueOf = (line: ChangeLine, key: Key): number => (key === 'change' ? changeOf(line) : line[key])

const PRESENCE: { readonly [P in ChangeLine['presence']]: string } = {
  both: '',
  new: ', new',
  gone: ', gone',
}

function Details({ line, digits, isSplit }: { line: ChangeLine; digits: number; isSplit: boolean }) {
  const both = (from: number | null, to: number | null): string =>
    from === null || to === null ? NONE : `${percentText(from, 2)} → ${percentText(to, 2)}`
  const { drift, trades } = line
  return (
    <Pairs
      pairs={[
        ['Weight', both(line.weightFrom, line.weightTo)],
        ...(line.volatilityFrom === null && line.volatilityTo === null
          ? []
          : [['Volatility', both(line.volatilityFrom, line.volatilityTo)] as const]),
        [
          'Contribution to risk',
          `${percentText(line.contributionFrom, digits)} → ${percentText(line.contributionTo, digits)}`,
        ],
        ...(!isSplit || drift === null || trades === null
          ? []
          : [
              ['Positions: drift of weights, points', pointsText(drift, digits)] as const,
              ['Positions: trades, points', pointsText(trades, digits)] as const,
            ]),
      ]}
    />
  )
}

/** What each holding, or group, adds to the change and to its parts. */
function Lines({ change, digits }: { change: RiskChange; digits: number }) {
  const [by, setBy] = useKept('change by', '')
  const [sorting, setSorting] = useKept<Sorting>('change sorted', { column: 1, descending: true })
  const [opened, setOpened] = useKept<ReadonlySet<string>>('change open', new Set())
  const group = change.groups.find(({ header }) => header === by)
  const lines = group?.lines ?? change.holdings
  const isSplit = typeof change.total !== 'string'
  const keys: readonly Key[] = [
    'change',
    ...(isSplit && change.settings ? (['settings'] as const) : []),
    ...(isSplit ? (['positions', 'volatilities', 'correlations'] as const) : []),
  ]
  const columns: readonly TableColumn[] = [
    { head: group?.header ?? 'Holding', width: null },
    ...keys.map((key) => COLUMNS[key]),
  ]
  const key = keys[sorting.column - 1]
  const compare = (a: ChangeLine, b: ChangeLine): number =>
    key === undefined
      ? a.label.localeCompare(b.label, undefined, { numeric: true })
      : Math.abs(valueOf(a, key)) - Math.abs(valueOf(b, key))
  const sorted = [...lines].sort((a, b) => (sorting.descending ? compare(b, a) : compare(a, b)))
  return (
    <Section title={isSplit ? 'Where the change comes from' : 'Change of contributions'} level={3}>
      {change.groups.length > 0 && (
        <Choice
          label="By"
          value={group?.header ?? ''}
          choices={[
            ['', 'Holding'] as const,
            ...change.groups.map(({ header }) => [header, header] as const),
          ]}
          choose={setBy}
        />
      )}
      <FigureTable
        label={`Change of contributions to risk by ${(group?.header ?? 'holding').toLowerCase()}`}
        columns={columns}
        sorting={sorting}
        sortBy={(column) =>
          setSorting({
            column,
            descending: sorting.column === column ? !sorting.descending : column !== 0,
          })
        }
        toggle={(label) => {
          const next = new Set(opened)
          if (!next.delete(String(label))) next.add(String(label))
          setOpened(next)
        }}
        rows={sorted.map((line) => ({
          key: line.label,
          name: line.label,
          mark: PRESENCE[line.presence],
          cells: keys.map((part) => pointsText(valueOf(line, part), digits)),
          open: opened.has(line.label),
          details: () => <Details line={line} digits={digits} isSplit={isSplit} />,
        }))}
        totals={[
          [
            'Total',
            ...keys.map((part) =>
              pointsText(
                lines.reduce((sum, line) => sum + valueOf(line, part), 0),
                digits,
              ),
            ),
          ],
        ]}
      />
    </Section>
  )
}

// ---- all of it

function Outcome({ state, change, asked }: { state: BooksState; change: RiskChange; asked: () => void }) {
  const books = useBooks()
  const classes = { ...useStepStyles(), ...useTableStyles(), ...useStyles() }
  const { breakdown, title, working } = state
  const digits = digitsOf(change)
  const isSplit = typeof change.total !== 'string'
  const hasMoved = change.to.isNow && breakdown?.decomposition.volatility !== change.to.volatility
  return (
    <>
      <p className={classes.headline} role="status">
        Volatility {change.horizon}: {changeSentence(change)}
      </p>
      <p className={mergeClasses(classes.small, classes.quiet)}>
        From: {sideText(change.from)}. To: {sideText(change.to)}.
      </p>
      {hasMoved && <Remark text="The figures have changed since. Compare again for those that stand now." />}
      {typeof change.total === 'string' && <Remark text={change.total} />}
      <Waterfall change={change} />
      {isSplit && (
        <p className={classes.tie}>
          {change.settings ? 'Settings and parts' : 'Parts'} add up to {pointsText(change.sum, 4)}, the change
          is {pointsText(change.change, 4)}, difference {pointsText(change.difference, 4)} points.
        </p>
      )}
      {change.holdings.length > 0 && <Lines change={change} digits={digits} />}
      {change.settings && (
        <Section title="Settings that changed" level={3}>
          <p className={classes.small}>{change.settings.sentence}</p>
          <Pairs
            pairs={change.settings.changed.map(({ label, from, to }) => [label, `${from} → ${to}`] as const)}
          />
        </Section>
      )}
      {change.notes.length > 0 && (
        <ul className={classes.notes} aria-label="Notes">
          {change.notes.map((note) => (
            <li key={note}>{note}</li>
          ))}
        </ul>
      )}
      <div className={classes.buttons}>
        <Button
          size="small"
          disabledFocusable={working !== null}
          onClick={() => {
            asked()
            void books.writeChange()
          }}
        >
          Write comparison
        </Button>
      </div>
      <SavePicture what="Picture of what changed" picture={() => changePicture(title, change)} />
      <Disclosure summary="How the change is split" open={false}>
        <p className={classes.small}>
          Each of positions, volatilities and correlations is changed alone, before, between and after the
          others; its part is the mean over all six orders (Shapley value; Shorrocks 2013), so that the parts
          add up. Changed settings come before them. {CAUTION}
        </p>
      </Disclosure>
    </>
  )
}

const choiceOf = (head: SnapshotHead): readonly [string, string] => [head.id, sideText(head)]

/** Two results side by side, and where the change of risk between them comes from. */
export default function WhatChanged({
  state,
  fault,
  asked,
}: {
  state: BooksState
  fault: string | undefined
  asked: () => void
}) {
  const books = useBooks()
  const classes = { ...useStepStyles(), ...useStyles() }
  const { reporting, breakdown, working, current } = state
  const { kept, change } = reporting
  const [wantedFrom, setFrom] = useKept<string | null>(`compared from, ${current}`, null)
  const [wantedTo, setTo] = useKept<string | null>(`compared to, ${current}`, null)
  const newestFirst = [...kept].reverse()
  const ids = newestFirst.map(({ id }) => id)
  const sides = [...(breakdown ? [NOW] : []), ...ids]
  const to = wantedTo !== null && sides.includes(wantedTo) ? wantedTo : sides[0]
  const from = wantedFrom !== null && ids.includes(wantedFrom) ? wantedFrom : ids.find((id) => id !== to)
  if (from === undefined || to === undefined)
    return (
      <Remark
        text={
          kept.length === 0
            ? 'A comparison needs a kept result: keep one above, and compare it later.'
            : 'A comparison needs another kept result, or the figures computed now.'
        }
      />
    )
  const kepts = newestFirst.map(choiceOf)
  return (
    <>
      <div className={classes.fields}>
        <Choice label="From" value={from} choices={kepts} choose={setFrom} />
        <Choice
          label="To"
          value={to}
          choices={[
            ...(breakdown
              ? [[NOW, `Now, ${percentText(breakdown.decomposition.volatility, 2)}`] as const]
              : []),
            ...kepts,
          ]}
          choose={setTo}
        />
      </div>
      <FaultLine text={fault} />
      <div className={classes.buttons}>
        <Button
          size="small"
          disabledFocusable={working !== null}
          onClick={() => {
            asked()
            void books.compareResults(from, to)
          }}
        >
          Compare
        </Button>
      </div>
      {change && <Outcome state={state} change={change} asked={asked} />}
    </>
  )
}
