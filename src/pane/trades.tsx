import { useDeferredValue, useEffect, useState, type CSSProperties } from 'react'
import { makeStyles, tokens } from '@fluentui/react-components'
import {
  percentText,
  type BooksState,
  type Breakdown,
  type Comparison,
  type LimitState,
  type TradesState,
} from '../sheet'
import { Apply } from './apply'
import { BeforeAfter } from './before-after'
import { Remark } from './headline'
import { digitsApart, pointsText } from './measure'
import { useBooksState, useKept, useLasting } from './store'
import { Aims, Questions } from './trade-sections'
import { TradeList } from './trade-list'

const useStyles = makeStyles({
  view: { display: 'grid', rowGap: tokens.spacingVerticalXXL, minWidth: 0 },
  quiet: { margin: 0, color: tokens.colorNeutralForeground2 },
  // What the trades come to stays in sight while a long list is typed into.
  outcome: {
    position: 'sticky',
    top: `calc(-1 * ${tokens.spacingVerticalL})`,
    zIndex: 2,
    display: 'grid',
    alignContent: 'center',
    boxSizing: 'border-box',
    height: '52px',
    margin: `calc(-1 * ${tokens.spacingVerticalL}) calc(-1 * ${tokens.spacingHorizontalS}) 0 calc(-1 * ${tokens.spacingHorizontalL})`,
    padding: `0 ${tokens.spacingHorizontalS} 0 ${tokens.spacingHorizontalL}`,
    backgroundColor: tokens.colorNeutralBackground1,
    borderBottom: `1px solid ${tokens.colorNeutralStroke2}`,
    fontSize: tokens.fontSizeBase200,
    lineHeight: tokens.lineHeightBase300,
    fontVariantNumeric: 'tabular-nums',
  },
  row: {
    display: 'flex',
    justifyContent: 'space-between',
    columnGap: tokens.spacingHorizontalM,
    whiteSpace: 'nowrap',
  },
  label: { minWidth: 0, overflow: 'hidden', textOverflow: 'ellipsis' },
  figure: { fontWeight: tokens.fontWeightSemibold },
  unseen: { position: 'absolute', width: '1px', height: '1px', overflow: 'hidden', clipPath: 'inset(50%)' },
})

/** The height of the outcome, for what sticks below it. */
const BELOW_OUTCOME = { '--kept-in-sight': '52px' } as CSSProperties

/** How long a text that cannot be read yet is taken for one that is still being typed. */
const TYPING_MS = 400

/** Whether something that is asked for keeps the trades from being worked out. */
const isHindered = ({ comparison, preview }: TradesState): boolean =>
  typeof comparison === 'string' && preview.refusals.includes(comparison)

/** The comparison; while a text is half typed, the last that there was. */
function useComparison(trades: TradesState): Comparison | string {
  const { comparison } = trades
  const unread = isHindered(trades)
  const lasting = useLasting(unread, TYPING_MS)
  const [last, setLast] = useState<Comparison | null>(null)
  const keep = typeof comparison !== 'string' ? comparison : unread ? last : null
  if (keep !== last) setLast(keep)
  return unread && !lasting && last ? last : comparison
}

const overOf = (limits: readonly LimitState[]): readonly [hard: number, soft: number] => [
  limits.filter(({ status }) => status === 'breach').length,
  limits.filter(({ status }) => status === 'over soft').length,
]

const arrow = (before: string | number, after: string | number): string =>
  before === after ? String(after) : `${before} → ${after}`

/** A text once it has stood still for a moment: what follows every key would talk without end. */
function useSettled(text: string): string {
  const [settled, setSettled] = useState(text)
  useEffect(() => {
    const timer = setTimeout(() => setSettled(text), 800)
    return () => clearTimeout(timer)
  }, [text])
  return settled
}

/** The volatility and the limits, before and after, in two lines. */
function Outcome({ breakdown, comparison }: { breakdown: Breakdown; comparison: Comparison | string }) {
  const classes = useStyles()
  const compared = typeof comparison === 'string' ? null : comparison
  const now = breakdown.decomposition.volatility
  const before = compared?.before.decomposition.volatility ?? now
  const after = compared?.after.decomposition.volatility ?? now
  const digits = digitsApart(before, after)
  const change = digitsApart(after - before, 0)
  const [hardBefore, softBefore] = overOf(compared?.limitsBefore ?? breakdown.limits)
  const [hardAfter, softAfter] = overOf(compared?.limitsAfter ?? breakdown.limits)
  const rows: (readonly [name: string, value: string])[] = [
    [
      `Volatility ${breakdown.horizon}`,
      `${arrow(percentText(before, digits), percentText(after, digits))}${compared ? `\u2002${pointsText(after - before, change)} points` : ''}`,
    ],
    breakdown.limits.length > 0
      ? [
          'Limits',
          `${arrow(hardBefore, hardAfter)} breached${softBefore + softAfter > 0 ? `, ${arrow(softBefore, softAfter)} over soft` : ''}`,
        ]
      : ['Turnover, one way', percentText(compared?.turnover ?? 0, 2)],
  ]
  const said = useSettled(
    compared ? rows.map(([name, value]) => `${name}: ${value}`).join('; ') : String(comparison),
  )
  return (
    <div className={classes.outcome}>
      {rows.map(([name, value]) => (
        <div key={name} className={classes.row}>
          <span className={classes.label}>{name}</span>
          <span className={classes.figure}>{value}</span>
        </div>
      ))}
      <span role="status" className={classes.unseen}>
        {said}
      </span>
    </div>
  )
}

function View({
  state,
  breakdown,
  trades,
}: {
  state: BooksState
  breakdown: Breakdown
  trades: TradesState
}) {
  const classes = useStyles()
  // one field of faults: the sentence stands where it was asked for
  const [asked, setAsked] = useKept<'candidate' | 'cells' | 'target' | 'scenarios'>('trades asked', 'cells')
  const faultOf = (which: typeof asked): string | undefined =>
    asked === which ? state.faults.trades : undefined
  const comparison = useComparison(trades)
  // The outcome is drawn at once; the long tables follow when no further key waits.
  const later = useDeferredValue(trades)
  const compared = useDeferredValue(comparison)
  return (
    <div className={classes.view} style={BELOW_OUTCOME}>
      <Outcome breakdown={breakdown} comparison={comparison} />
      {state.status.kind === 'failed' && (
        <Remark text="Trades of the figures as last computed, before the failure told above." />
      )}
      <Aims
        breakdown={breakdown}
        trades={later}
        comparison={compared}
        state={state}
        faultOf={faultOf}
        asked={setAsked}
      />
      <TradeList trades={later} fault={faultOf('candidate')} asked={() => setAsked('candidate')} />
      <BeforeAfter
        comparison={
          typeof compared !== 'string' || !isHindered(later)
            ? compared
            : later.loading
              ? 'Loading what reads expressions…'
              : 'Nothing is compared while what is asked for above cannot be read or paid for.'
        }
        trades={later}
        breakdown={breakdown}
      />
      <Apply
        trades={later}
        busy={state.working !== null}
        fault={faultOf('cells')}
        asked={() => setAsked('cells')}
      />
      <Questions breakdown={breakdown} trades={later} faultOf={faultOf} asked={setAsked} />
    </div>
  )
}

/** What changes of weights would do, before any is written: the list, both sides of it, and writing it. */
export default function TradesView() {
  const classes = useStyles()
  const state = useBooksState()
  const { breakdown, trades, status } = state
  return breakdown && trades ? (
    <View state={state} breakdown={breakdown} trades={trades} />
  ) : (
    <p className={classes.quiet}>
      {status.kind === 'nothing linked'
        ? 'Trades can be tried here once holdings and returns are read, under Data.'
        : 'Press Compute (Ctrl+Enter) for the figures that trades are compared with.'}
    </p>
  )
}
