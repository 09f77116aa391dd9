import { memo, useId, useMemo, useState, type KeyboardEvent, type PointerEvent } from 'react'
import { Button, makeStyles, mergeClasses, tokens } from '@fluentui/react-components'
import { scaleLinear } from '@visx/scale'
import {
  CAUTION,
  countOf,
  LOWERING_READING,
  percentText,
  TURNOVER_READING,
  type Breakdown,
  type RiskLowering,
  type Sizing,
  type SizingMark,
  type SizingPoint,
  type TradesState,
} from '../sheet'
import { Choice, Disclosure, PercentEntry, Section, typedPercentText } from './controls'
import { useDrawingStyles } from './drawing'
import { Remark } from './headline'
import { pointsText } from './measure'
import { NONE } from './positions'
import { useStepStyles } from './step'
import { useBooks, useKept } from './store'
import { Facts, FigureTable, useTableStyles } from './table'
import { useWidth } from './width'

const useStyles = makeStyles({
  // room for the outline of the focus between the key and the drawing
  figure: { margin: 0, minWidth: 0, display: 'grid', rowGap: tokens.spacingVerticalS },
  slider: {
    touchAction: 'pan-y',
    cursor: 'crosshair',
    borderRadius: tokens.borderRadiusSmall,
    ':focus-visible': { outline: `2px solid ${tokens.colorStrokeFocus2}`, outlineOffset: '2px' },
  },
  drawing: { display: 'block', overflow: 'visible' },
  curve: {
    fill: 'none',
    stroke: tokens.colorBrandForeground1,
    strokeWidth: '2px',
    '@media (forced-colors: active)': { stroke: 'Highlight' },
  },
  ground: {
    fill: 'none',
    stroke: tokens.colorNeutralStroke1,
    '@media (forced-colors: active)': { stroke: 'GrayText' },
  },
  limit: {
    fill: 'none',
    stroke: tokens.colorNeutralForeground1,
    strokeWidth: '1.5px',
    '@media (forced-colors: active)': { stroke: 'CanvasText' },
  },
  soft: { strokeDasharray: '3 2' },
  chosen: {
    fill: 'none',
    stroke: tokens.colorNeutralForeground3,
    strokeDasharray: '1 3',
    '@media (forced-colors: active)': { stroke: 'CanvasText' },
  },
  mark: {
    fill: tokens.colorNeutralForeground1,
    stroke: tokens.colorNeutralBackground1,
    '@media (forced-colors: active)': { fill: 'CanvasText', stroke: 'Canvas' },
  },
  hollow: {
    fill: tokens.colorNeutralBackground1,
    stroke: tokens.colorNeutralForeground1,
    strokeWidth: '1.5px',
    '@media (forced-colors: active)': { fill: 'Canvas', stroke: 'CanvasText' },
  },
  unseen: { position: 'absolute', width: '1px', height: '1px', overflow: 'hidden', clipPath: 'inset(50%)' },
  choose: {
    border: 'none',
    background: 'none',
    padding: 0,
    font: 'inherit',
    textAlign: 'left',
    cursor: 'pointer',
    color: tokens.colorBrandForegroundLink,
    textDecorationLine: 'underline',
    overflowWrap: 'anywhere',
    ':focus-visible': { outline: `2px solid ${tokens.colorStrokeFocus2}`, outlineOffset: '1px' },
    '@media (forced-colors: active)': { color: 'LinkText' },
  },
  putting: {
    display: 'grid',
    gridTemplateColumns: 'minmax(0, 1fr) minmax(0, 1.4fr)',
    columnGap: tokens.spacingHorizontalM,
    alignItems: 'start',
  },
  put: { marginTop: '24px' },
})

const HEIGHT = 184
/** Room for the figures of the axes. */
const MARGIN = { left: 40, right: 8, top: 22, bottom: 30 } as const
/** Weights the arrow keys stop at, about. */
const STOPS = 100

type Shape = 'full circle' | 'diamond' | 'hollow circle'

const SHAPES: { readonly [K in SizingMark['kind']]: Shape | 'hard' | 'soft' } = {
  today: 'full circle',
  'least risk': 'diamond',
  removed: 'hollow circle',
  'soft limit': 'soft',
  'hard limit': 'hard',
}

function Shape({ shape, x, y }: { shape: Shape; x: number; y: number }) {
  const classes = useStyles()
  switch (shape) {
    case 'full circle':
      return <circle className={classes.mark} cx={x} cy={y} r={5} />
    case 'hollow circle':
      return <circle className={classes.hollow} cx={x} cy={y} r={4} />
    case 'diamond':
      return <path className={classes.mark} d={`M${x} ${y - 6}l5.5 6l-5.5 6l-5.5 -6z`} />
  }
}

const KEYS: readonly (readonly [SizingMark['kind'], string])[] = [
  ['today', 'Today'],
  ['least risk', 'Least-risk weight'],
  ['removed', 'Removed'],
  ['soft limit', 'At a soft limit'],
  ['hard limit', 'At a hard limit'],
]

/** What the shapes are, of those that are drawn. */
function Key({ marks }: { marks: readonly SizingMark[] }) {
  const classes = { ...useDrawingStyles(), ...useStyles() }
  return (
    <div className={classes.key} aria-hidden>
      {KEYS.filter(([kind]) => marks.some((mark) => mark.kind === kind && mark.shown)).map(([kind, text]) => {
        const shape = SHAPES[kind]
        return (
          <span key={kind} className={classes.keyed}>
            <svg width="14" height="14">
              {shape === 'hard' || shape === 'soft' ? (
                <path className={mergeClasses(classes.limit, shape === 'soft' && classes.soft)} d="M7 0v14" />
              ) : (
                <Shape shape={shape} x={7} y={7} />
              )}
            </svg>
            {kind === 'today' ? (marks.find((mark) => mark.kind === kind)?.label ?? text) : text}
          </span>
        )
      })}
      <span className={classes.keyed}>
        <svg width="14" height="14">
          <path className={classes.chosen} d="M7 0v14" />
        </svg>
        Chosen
      </span>
    </div>
  )
}

/**
 * The volatility at any weight: its square is a quadratic in the weight, so that three points of the curve say it all. Written around their
 * middle, where what is interpolated is smallest.
 */
export function volatilityAt(curve: readonly SizingPoint[], weight: number): number {
  const [a, b, c] = [curve[0], curve[curve.length >> 1], curve.at(-1)]
  if (!a || !b || !c) return NaN
  const point = curve.find((one) => one.weight === weight)
  if (point) return point.volatility
  const square = ({ volatility }: SizingPoint): number => volatility * volatility
  const part = (at: SizingPoint, one: SizingPoint, other: SizingPoint): number =>
    (square(at) * ((weight - one.weight) * (weight - other.weight))) /
    ((at.weight - one.weight) * (at.weight - other.weight))
  return Math.sqrt(Math.max(0, part(a, b, c) + part(b, a, c) + part(c, a, b)))
}

/** Volatility against weight as a slider: the arrow keys, or the pointer, choose a weight on it. */
function Curve({
  sizing,
  weight,
  choose,
}: {
  sizing: Sizing
  weight: number
  choose: (weight: number) => void
}) {
  const classes = { ...useDrawingStyles(), ...useStyles() }
  const id = useId()
  const { element, width } = useWidth<HTMLDivElement>()
  const { curve, marks, name } = sizing
  const drawn = useMemo(() => {
    const [first, last] = [curve[0]?.weight ?? 0, curve.at(-1)?.weight ?? 1]
    const volatilities = curve.map(({ volatility }) => volatility)
    const [low, high] = [Math.min(...volatilities), Math.max(...volatilities)]
    const flat = high - low < 1e-6
    const across = scaleLinear<number>({
      domain: [first, last],
      range: [MARGIN.left, Math.max(MARGIN.left + 1, width - MARGIN.right)],
    })
    const up = scaleLinear<number>({
      domain: flat ? [low - 0.001, high + 0.001] : [low - 0.06 * (high - low), high],
      range: [HEIGHT - MARGIN.bottom, MARGIN.top],
    })
    const path = curve.map(
      (point, k) =>
        `${k === 0 ? 'M' : 'L'}${across(point.weight).toFixed(1)} ${up(point.volatility).toFixed(1)}`,
    )
    return { across, up, path: path.join(''), first, last, stops: across.ticks(STOPS), low, high }
  }, [curve, width])
  const { across, up, first, last, stops } = drawn
  const at = Math.min(Math.max(weight, first), last)
  const digits = last - first < 0.02 ? 2 : last - first < 0.1 ? 1 : 0
  const least = curve.reduce<SizingPoint | undefined>(
    (best, point) => (best && best.volatility <= point.volatility ? best : point),
    undefined,
  )

  const press = (event: KeyboardEvent): void => {
    const next = stops.findIndex((stop) => stop > at + 1e-12)
    const past = stops.filter((stop) => stop < at - 1e-12).length - 1
    const up1 = next < 0 ? stops.length - 1 : next
    const down1 = Math.max(0, past)
    const places: { readonly [key: string]: number } = {
      ArrowRight: up1,
      ArrowUp: up1,
      ArrowLeft: down1,
      ArrowDown: down1,
      PageUp: Math.min(stops.length - 1, up1 + 9),
      PageDown: Math.max(0, down1 - 9),
      Home: 0,
      End: stops.length - 1,
    }
    const stop = stops[places[event.key] ?? -1]
    if (stop === undefined) return
    event.preventDefault()
    choose(stop)
  }
  const point = ({ clientX, currentTarget, buttons, type }: PointerEvent<HTMLDivElement>): void => {
    if (type === 'pointermove' && buttons !== 1) return
    const x = across.invert(clientX - currentTarget.getBoundingClientRect().left)
    const nearest = stops.reduce(
      (best, stop) => (Math.abs(stop - x) < Math.abs(best - x) ? stop : best),
      stops[0] ?? 0,
    )
    choose(nearest)
  }
  return (
    <figure className={classes.figure}>
      <Key marks={marks} />
      <div
        ref={element}
        className={classes.slider}
        role="slider"
        tabIndex={0}
        aria-label={`Weight of ${name}`}
        aria-describedby={id}
        aria-valuemin={Number((first * 100).toFixed(2))}
        aria-valuemax={Number((last * 100).toFixed(2))}
        aria-valuenow={Number((at * 100).toFixed(2))}
        aria-valuetext={`${percentText(weight, 2)}, volatility ${percentText(volatilityAt(curve, weight), 2)}`}
        onKeyDown={press}
        onPointerDown={point}
        onPointerMove={point}
      >
        <svg className={classes.drawing} width="100%" height={HEIGHT} aria-hidden focusable="false">
          <g className={classes.axis} textAnchor="end">
            {up.ticks(4).map((tick) => (
              <g key={tick}>
                <path className={classes.ground} d={`M${MARGIN.left} ${up(tick)}H${width - MARGIN.right}`} />
                <text x={MARGIN.left - 4} y={up(tick) + 3} stroke="none">
                  {percentText(tick, drawn.high - drawn.low < 0.02 ? 2 : 1)}
                </text>
              </g>
            ))}
          </g>
          <g className={classes.axis} textAnchor="middle">
            {across.ticks(5).map((tick) => (
              <text key={tick} x={across(tick)} y={HEIGHT - MARGIN.bottom + 13}>
                {percentText(tick, digits)}
              </text>
            ))}
            <text x={width - MARGIN.right} y={HEIGHT - 2} textAnchor="end">
              Weight
            </text>
            <text x={0} y={10} textAnchor="start">
              Volatility
            </text>
          </g>
          {marks
            .filter(({ kind, shown }) => shown && kind.endsWith('limit'))
            .map((mark, k) => (
              <path
                key={k}
                className={mergeClasses(classes.limit, mark.kind === 'soft limit' && classes.soft)}
                d={`M${across(mark.weight)} ${MARGIN.top}V${HEIGHT - MARGIN.bottom}`}
              />
            ))}
          <path className={classes.curve} d={drawn.path} />
          <path
            className={classes.chosen}
            d={`M${across(at)} ${MARGIN.top}V${HEIGHT - MARGIN.bottom}M${MARGIN.left} ${up(volatilityAt(curve, at))}H${width - MARGIN.right}`}
          />
          {marks.map((mark, k) => {
            const shape = SHAPES[mark.kind]
            return (
              mark.shown &&
              shape !== 'hard' &&
              shape !== 'soft' && (
                <Shape key={k} shape={shape} x={across(mark.weight)} y={up(mark.volatility)} />
              )
            )
          })}
        </svg>
      </div>
      <figcaption id={id} className={classes.unseen}>
        Volatility of the book against the weight of {name}, from {percentText(first, 1)} to{' '}
        {percentText(last, 1)}
        {least && `; lowest ${percentText(least.volatility, 2)} at ${percentText(least.weight, 2)}`}. The
        points with a name are in the table below.
      </figcaption>
    </figure>
  )
}

/** The named points; pressing one chooses its weight. */
function Points({
  label,
  marks,
  choose,
}: {
  label: string
  marks: readonly SizingMark[]
  choose: (weight: number) => void
}) {
  const classes = { ...useTableStyles(), ...useStyles() }
  const heads = ['Weight', 'Volatility', 'Share of risk']
  return (
    <table className={classes.table} aria-label={label}>
      <colgroup>
        <col />
        {heads.map((head) => (
          <col key={head} style={{ width: '60px' }} />
        ))}
      </colgroup>
      <thead>
        <tr>
          <th scope="col" className={mergeClasses(classes.head, classes.plainHead, classes.left)}>
            Point
          </th>
          {heads.map((head) => (
            <th key={head} scope="col" className={mergeClasses(classes.head, classes.plainHead)}>
              {head}
            </th>
          ))}
        </tr>
      </thead>
      <tbody>
        {marks.map(({ label, weight, volatility, share }, k) => (
          <tr key={k}>
            <th scope="row" className={mergeClasses(classes.cell, classes.name)}>
              <button type="button" className={classes.choose} onClick={() => choose(weight)}>
                {label}
              </button>
            </th>
            <td className={classes.cell}>{percentText(weight, 2)}</td>
            <td className={classes.cell}>{percentText(volatility, 2)}</td>
            <td className={classes.cell}>{share === null ? NONE : percentText(share, 1)}</td>
          </tr>
        ))}
      </tbody>
    </table>
  )
}

/** What a weight of the position would do, in lines. */
function factsOf({
  name,
  marks,
  changeIfRemoved,
  slope,
  financing,
}: Sizing): readonly (readonly [string, string, string])[] {
  const today = marks.find(({ kind }) => kind === 'today')
  const least = marks.find(({ kind }) => kind === 'least risk')
  const held = today !== undefined && today.weight !== 0
  return [
    ...(slope === null
      ? []
      : [
          [
            'Marginal contribution to risk, net of financing',
            percentText(slope, 2),
            `One point of weight more, paid for by ${financing}, changes volatility by about ${pointsText(slope / 100, 3)} points.`,
          ] as const,
        ]),
    ...(held
      ? [
          [
            'Change in risk if removed',
            `${pointsText(changeIfRemoved, 2)} points`,
            `At a weight of 0%, the proceeds going to ${financing}.`,
          ] as const,
        ]
      : []),
    [
      'Least-risk weight',
      least ? percentText(least.weight, 2) : NONE,
      least
        ? `Volatility there ${percentText(least.volatility, 2)}, ${pointsText(least.volatility - (today?.volatility ?? 0), 2)} points from ${held ? 'today' : 'the book without it'}.`
        : `No weight of ${name} has least risk.`,
    ],
  ]
}

/** One position: the picture of its weight, and a weight of it for the list. */
function One({ sizing, position, decimal }: { sizing: Sizing; position: string; decimal: string }) {
  const books = useBooks()
  const classes = { ...useStepStyles(), ...useStyles() }
  const today = sizing.marks.find(({ kind }) => kind === 'today')
  const inside = sizing.marks.filter(({ shown }) => shown)
  const beyond = sizing.marks.filter(({ shown }) => !shown)
  const [chosen, setChosen] = useState<number | null>(null)
  const weight = chosen ?? today?.weight ?? 0
  const volatility = volatilityAt(sizing.curve, weight)
  // what the list is given is what the field shows
  const typed = Number(weight.toFixed(6))
  return (
    <>
      <Curve sizing={sizing} weight={weight} choose={setChosen} />
      <p className={classes.small} role="status">
        At {percentText(typed, 2)}: volatility {percentText(volatility, 2)}
        {today &&
          `, ${pointsText(volatility - today.volatility, 2)} points from ${today.label.toLowerCase()}`}
        .
      </p>
      <div className={classes.putting}>
        <PercentEntry label="Weight, %" value={typed} commit={setChosen} />
        <Button
          size="small"
          className={classes.put}
          onClick={() =>
            books.trade({
              line: {
                key: position,
                entry: 'new weight',
                text: `${typedPercentText(typed).replace('.', decimal)}%`,
              },
            })
          }
        >
          Put this weight in the list
        </Button>
      </div>
      <Points label="Points of the curve" marks={inside} choose={setChosen} />
      {beyond.length > 0 && (
        <Disclosure summary={`${countOf(beyond.length, 'point')} beyond the picture`} open={false}>
          <Points label="Points beyond the picture" marks={beyond} choose={setChosen} />
        </Disclosure>
      )}
      <Facts lines={factsOf(sizing)} />
      {sizing.notes.map((note) => (
        <p key={note} className={mergeClasses(classes.small, classes.quiet)}>
          {note}
        </p>
      ))}
    </>
  )
}

const SHORT = 5

const WHAT: { readonly [K in RiskLowering['kind']]: string } = {
  buy: 'bought',
  sell: 'sold',
  switch: 'sold',
}

function LoweringTable({ label, trades }: { label: string; trades: readonly RiskLowering[] }) {
  return (
    <FigureTable
      label={label}
      columns={[
        { head: 'Trade', width: null },
        { head: 'Per 1% of turnover, points', width: 68 },
        { head: 'Turnover', width: 58 },
        { head: 'Volatility there', width: 58 },
      ]}
      rows={trades.slice(0, SHORT).map((trade, k) => ({
        key: k,
        name: `${trade.name}, ${WHAT[trade.kind]}${trade.into === null ? '' : ` for ${trade.into}`}`,
        mark: trade.end === 'weight 0' ? ', down to nothing' : '',
        cells: [
          pointsText(trade.perTurnover / 100, 3),
          percentText(trade.turnover, 2),
          percentText(trade.volatility, 2),
        ],
      }))}
    />
  )
}

/** What an answer rests on: it is asked for anew when one of these is another. */
interface Ground {
  readonly financing: TradesState['financing']
  readonly breakdown: Breakdown
  /** every position with its weight in the sheet; what is typed in the list moves none of it */
  readonly places: string
}

/** The trades that lower risk most, as facts. */
const Lowering = memo(function Lowering({ financing }: Ground) {
  const books = useBooks()
  const classes = useStepStyles()
  const found = books.riskLowering(financing)
  if (typeof found === 'string') return <Remark text={found} />
  const { trades, switches, shorting } = found
  return (
    <Section title="Trades that lower risk most" level={3}>
      <p className={classes.small}>
        {LOWERING_READING} Paid for by {found.financing}.
      </p>
      {trades.length === 0 ? (
        <p className={classes.small}>No trade of one holding lowers risk with this financing.</p>
      ) : (
        <LoweringTable label="Trades that lower risk most" trades={trades} />
      )}
      {switches.length > 0 && (
        <>
          <p className={classes.small}>One holding sold for another, whatever pays otherwise:</p>
          <LoweringTable label="Pairs of trades that lower risk most" trades={switches} />
        </>
      )}
      <p className={mergeClasses(classes.small, classes.quiet)}>
        {TURNOVER_READING} Each goes as far as risk falls
        {shorting === 'no shorting' ? ', and no position turns short' : ''}.
      </p>
    </Section>
  )
})

const OfPosition = memo(function OfPosition({
  financing,
  position,
  decimal,
}: Ground & { position: string; decimal: string }) {
  const books = useBooks()
  const sizing = books.sizingOf(position, financing)
  return typeof sizing === 'string' ? (
    <Remark text={sizing} />
  ) : (
    <One sizing={sizing} position={position} decimal={decimal} />
  )
})

/** How much risk each size of one position comes with, and the trades that lower risk most. */
export default function SizingSection({
  trades,
  breakdown,
  decimal,
}: {
  trades: TradesState
  breakdown: Breakdown
  /** the mark before decimals in what the list is given */
  decimal: string
}) {
  const classes = useStepStyles()
  const { lines, financing } = trades
  const [wanted, setWanted] = useKept<string | null>('sized', null)
  const share = breakdown.decomposition.contribution
  const most = share.reduce((best, value, i) => (value > share[best]! ? i : best), 0)
  const position = lines.find(({ key }) => key === wanted)?.key ?? lines[most]?.key
  if (position === undefined) return null
  const named = (candidate: boolean): readonly (readonly [string, string])[] =>
    lines.filter((line) => line.candidate === candidate).map(({ key }) => [key, key])
  const notHeld = named(true)
  const ground: Ground = {
    financing,
    breakdown,
    places: lines.map(({ key, sheet }) => `${key} ${sheet}`).join('\n'),
  }
  return (
    <>
      <Choice<string>
        label="Holding"
        value={position}
        choices={notHeld.length === 0 ? named(false) : []}
        more={
          notHeld.length === 0
            ? []
            : [
                { heading: 'Held', choices: named(false) },
                { heading: 'Not held', choices: notHeld },
              ]
        }
        choose={setWanted}
      />
      <p className={mergeClasses(classes.small, classes.quiet)}>
        At the weights in the sheet; what pays for a change is chosen in the list of trades. {CAUTION}
      </p>
      <OfPosition key={position} {...ground} position={position} decimal={decimal} />
      <Lowering {...ground} />
    </>
  )
}
