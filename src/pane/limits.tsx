import { useId, useState } from 'react'
import { Button, makeStyles, mergeClasses, tokens } from '@fluentui/react-components'
import { scaleLinear } from '@visx/scale'
import {
  BAND,
  bandText,
  CAUTION,
  LIMIT_STATUS,
  limitText,
  percentText,
  type LimitState,
  type LimitStatus,
} from '../sheet'
import { Hatch, useDrawingStyles } from './drawing'
import { HOW_LIMITS_COME } from './limits-table'
import { digitsApart, pointsText } from './measure'
import { PlaceLink, Sentence } from './place'
import { NONE } from './positions'
import { FaultLine, TakeButton, useStepStyles } from './step'
import { useWidth } from './width'

const useStyles = makeStyles({
  list: { listStyleType: 'none', margin: 0, padding: 0, display: 'grid', minWidth: 0 },
  limit: {
    display: 'grid',
    gridTemplateColumns: 'minmax(0, 1fr) auto',
    columnGap: tokens.spacingHorizontalM,
    padding: `${tokens.spacingVerticalS} 0`,
    borderTop: `1px solid ${tokens.colorNeutralStroke2}`,
    fontSize: tokens.fontSizeBase200,
    lineHeight: tokens.lineHeightBase200,
    fontVariantNumeric: 'tabular-nums',
    overflowWrap: 'anywhere',
  },
  status: { display: 'flex', columnGap: tokens.spacingHorizontalXS, fontWeight: tokens.fontWeightSemibold },
  mark: { width: '12px', textAlign: 'center', flexShrink: 0 },
  breach: { color: tokens.colorStatusDangerForeground3 },
  figure: { textAlign: 'right', fontWeight: tokens.fontWeightSemibold },
  wide: { gridColumn: '1 / -1' },
  drawing: { gridColumn: '1 / -1', display: 'block', margin: '3px 0', overflow: 'visible' },
  quiet: { color: tokens.colorNeutralForeground2 },
  ground: {
    stroke: tokens.colorNeutralStroke1,
    '@media (forced-colors: active)': { stroke: 'GrayText' },
  },
  used: {
    fill: tokens.colorBrandForeground1,
    stroke: tokens.colorBrandForeground1,
    '@media (forced-colors: active)': { fill: 'Highlight', stroke: 'Highlight' },
  },
  over: {
    stroke: tokens.colorStatusDangerForeground1,
    '@media (forced-colors: active)': { stroke: 'CanvasText' },
  },
  edge: {
    fill: 'none',
    stroke: tokens.colorNeutralForeground1,
    strokeWidth: '2px',
    '@media (forced-colors: active)': { stroke: 'CanvasText' },
  },
  soft: { strokeDasharray: '3 2', strokeWidth: '1.5px' },
  band: {
    fill: 'none',
    stroke: tokens.colorNeutralForeground1,
    '@media (forced-colors: active)': { stroke: 'CanvasText' },
  },
  more: { justifySelf: 'start' },
})

const HEIGHT = 19
/** Where the bar lies, and the band below it. */
const MIDDLE = 7
const BAND_AT = 17
/** Half the height of the bar. */
const BAR = 4
/** Height of the caps at the ends of a band. */
const CAP = 3
/** Rows drawn at first, and at each press for more. */
const STEP = 20
/** Room beyond the largest of figure and limits. */
const ROOM = 1.06
/** A band that reaches farther than this many times figure and limits is cut at the end of the drawing. */
const FARTHEST = 1.5

/** How far a figure goes toward its limits: solid up to the limit, hatched beyond, the limits as lines across and the 95% band as a thin line. */
function Used({ state, width, hatch }: { state: LimitState; width: number; hatch: string }) {
  const classes = useStyles()
  const { figure, limit, error, most } = state
  if (figure === null || width === 0) return null
  const reach = error === null ? 0 : BAND * error
  const largest = Math.max(figure, limit.soft ?? 0, limit.hard ?? 0, Number.EPSILON)
  const least = Math.min(0, figure)
  const across = scaleLinear<number>({
    domain: [
      Math.max(least - reach, least < 0 ? FARTHEST * least : 0),
      ROOM * Math.min(Math.max(largest, figure + reach), FARTHEST * largest),
    ],
    range: [0, width],
    clamp: true,
  })
  const bar = (from: number, to: number) => ({
    x: across(from),
    y: MIDDLE - BAR,
    width: Math.max(0, across(to) - across(from)),
    height: 2 * BAR,
  })
  const edge = (at: number): string => `M${across(at)} 0V${2 * MIDDLE}`
  return (
    <svg className={classes.drawing} width={width} height={HEIGHT} aria-hidden focusable="false">
      <path className={classes.ground} d={`M0 ${MIDDLE + BAR}H${width}`} />
      {/* what stands between 0 and the figure, up to the limit */}
      <rect className={classes.used} {...bar(Math.min(0, figure), Math.max(0, Math.min(figure, most)))} />
      {figure > most && (
        <rect className={classes.over} fill={`url(#${hatch})`} {...bar(Math.max(0, most), figure)} />
      )}
      {limit.soft !== null && (
        <path className={mergeClasses(classes.edge, classes.soft)} d={edge(limit.soft)} />
      )}
      {limit.hard !== null && <path className={classes.edge} d={edge(limit.hard)} />}
      {reach > 0 && (
        <path
          className={classes.band}
          d={`M${across(figure - reach)} ${BAND_AT - CAP}v${CAP}H${across(figure + reach)}v${-CAP}`}
        />
      )}
    </svg>
  )
}

function Key({ hatch }: { hatch: string }) {
  const classes = { ...useDrawingStyles(), ...useStyles() }
  return (
    <div className={classes.key} aria-hidden>
      <span className={classes.keyed}>
        <svg width="22" height="10">
          <rect className={classes.used} x="0.5" y="1.5" width="12" height="7" />
          <rect className={classes.over} fill={`url(#${hatch})`} x="12.5" y="1.5" width="9" height="7" />
        </svg>
        Used, over
      </span>
      <span className={classes.keyed}>
        <svg width="6" height="12">
          <path className={mergeClasses(classes.edge, classes.soft)} d="M3 0v12" />
        </svg>
        Soft limit
      </span>
      <span className={classes.keyed}>
        <svg width="6" height="12">
          <path className={classes.edge} d="M3 0v12" />
        </svg>
        Hard limit
      </span>
      <span className={classes.keyed}>
        <svg width="20" height="8">
          <path className={classes.band} d="M1 6H19M1 3v3M19 3v3" />
        </svg>
        95% band
      </span>
    </div>
  )
}

const capital = (text: string): string => text.charAt(0).toUpperCase() + text.slice(1)

/** "Hard limit 15.00%, soft limit 13.00%" */
const edgesText = ({ limit: { soft, hard } }: LimitState, digits: number): string =>
  capital(
    [
      ...(hard === null ? [] : [`hard limit ${percentText(hard, digits)}`]),
      ...(soft === null ? [] : [`soft limit ${percentText(soft, digits)}`]),
    ].join(', '),
  )

function Status({ status }: { status: LimitStatus }) {
  const classes = useStyles()
  const { mark, word } = LIMIT_STATUS[status]
  return (
    <span className={mergeClasses(classes.status, status === 'breach' && classes.breach)}>
      <span className={classes.mark} aria-hidden>
        {mark}
      </span>
      {word}
    </span>
  )
}

const shownOf = (figure: number | null, digits: number): string =>
  figure === null ? NONE : percentText(figure, digits)

function Line({
  state,
  after,
  width,
  hatch,
}: {
  state: LimitState
  /** the same limit at the weights with the trades */
  after: LimitState | undefined
  width: number
  hatch: string
}) {
  const classes = useStyles()
  const { limit, figure, headroom, used, status, why, error, withinError } = state
  // a breach is seen in its figures, however small they are
  const digits = digitsApart(figure, limit.soft, limit.hard)
  const afterDigits = digitsApart(after?.figure ?? null, limit.soft, limit.hard)
  const moved =
    after && (shownOf(after.figure, afterDigits) !== shownOf(figure, afterDigits) || after.status !== status)
  return (
    <li className={classes.limit}>
      <Status status={status} />
      <span className={classes.figure}>{shownOf(figure, digits)}</span>
      <span className={classes.wide}>{capital(limitText(limit))}</span>
      <Used state={state} width={width} hatch={hatch} />
      <span className={mergeClasses(classes.wide, classes.quiet)}>
        {edgesText(state, digits)}
        {headroom !== null && `; headroom ${pointsText(headroom, digits)} points`}
        {used !== null && `; ${percentText(used, 0)} used`}
        {limit.cell && (
          <>
            {'; '}
            <PlaceLink area={limit.cell} />
          </>
        )}
      </span>
      {why !== null && (
        <span className={classes.wide}>
          <Sentence text={why} />
        </span>
      )}
      {withinError === true && figure !== null && error !== null && (
        <span className={classes.wide}>
          Within estimation error: the 95% band, {bandText(figure, error, digits)}, holds a limit.
        </span>
      )}
      {moved && (
        <span className={classes.wide}>
          With the trades: {shownOf(after.figure, afterDigits)}, {LIMIT_STATUS[after.status].mark}{' '}
          {LIMIT_STATUS[after.status].word.toLowerCase()}.
        </span>
      )}
    </li>
  )
}

const GRAVITY: { readonly [S in LimitStatus]: number } = {
  breach: 0,
  'over soft': 1,
  'not measured': 2,
  within: 3,
}

/** Places of the limits, the gravest first and those most used before the others. */
export const byUrgency = (states: readonly LimitState[]): readonly number[] =>
  [...states.keys()].sort((a, b) => {
    const [one, other] = [states[a]!, states[b]!]
    return (
      GRAVITY[one.status] - GRAVITY[other.status] ||
      (other.used ?? -Infinity) - (one.used ?? -Infinity) ||
      a - b
    )
  })

interface Asked {
  readonly states: readonly LimitState[]
  /** in the same order at the weights with the trades; null while there are none */
  readonly after: readonly LimitState[] | null
  readonly fault: string | undefined
}

function List({ states, after, fault }: Asked) {
  const classes = { ...useStepStyles(), ...useStyles() }
  const { element, width } = useWidth<HTMLDivElement>()
  const hatch = useId()
  const [count, setCount] = useState(STEP)
  return (
    <div className={classes.cell} ref={element}>
      <Hatch id={hatch} className={classes.over} />
      <p className={classes.small}>
        At the weights in the sheet. A status follows the figure alone, however sure it is.
      </p>
      <FaultLine text={fault} />
      <Key hatch={hatch} />
      <ul className={classes.list} aria-label="Limits">
        {byUrgency(states)
          .slice(0, count)
          .map((k) => (
            <Line key={k} state={states[k]!} after={after?.[k]} width={width} hatch={hatch} />
          ))}
      </ul>
      {count < states.length && (
        <Button size="small" className={classes.more} onClick={() => setCount(count + STEP)}>
          {`Show ${Math.min(STEP, states.length - count)} more of ${states.length.toLocaleString('en-US')}`}
        </Button>
      )}
      <p className={mergeClasses(classes.small, classes.quiet)}>{CAUTION}</p>
    </div>
  )
}

/** Each limit with the figure it holds, at the weights in the sheet; or how limits come to a book. */
export default function Limits(asked: Asked) {
  const classes = useStepStyles()
  if (asked.states.length > 0) return <List {...asked} />
  return (
    <>
      <p className={classes.small}>There are no limits yet. {HOW_LIMITS_COME}</p>
      <FaultLine text={asked.fault} />
      <div>
        <TakeButton field="limits" />
      </div>
    </>
  )
}
