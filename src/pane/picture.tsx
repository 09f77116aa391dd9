import { memo, useId, useMemo, useState, type KeyboardEvent } from 'react'
import { makeStyles, mergeClasses, tokens } from '@fluentui/react-components'
// Fluent's own charts draw one bar a category along a horizontal axis and have no hatching; these primitives over d3's scales draw
// the pair of signed bars and the pattern, and leave the text to the page, where it wraps and is read aloud.
import { scaleLinear } from '@visx/scale'
import { Bar } from '@visx/shape'
import { bandOf, percentText, type Breakdown } from '../sheet'
import { Hatch } from './drawing'
import { digitsFor, type Measure } from './measure'
import { useWidth } from './width'

const useStyles = makeStyles({
  picture: { position: 'relative', minWidth: 0 },
  head: {
    display: 'grid',
    gridTemplateColumns: 'minmax(0, 1fr) 48px 60px',
    columnGap: tokens.spacingHorizontalS,
    alignItems: 'end',
    position: 'sticky',
    top: `calc(-1 * ${tokens.spacingVerticalL})`,
    zIndex: 1,
    backgroundColor: tokens.colorNeutralBackground1,
    padding: `${tokens.spacingVerticalXS} ${tokens.spacingHorizontalXS}`,
    fontSize: tokens.fontSizeBase200,
    lineHeight: tokens.lineHeightBase200,
    color: tokens.colorNeutralForeground2,
    textAlign: 'right',
  },
  key: {
    display: 'flex',
    flexDirection: 'column',
    alignItems: 'flex-end',
    rowGap: tokens.spacingVerticalXXS,
  },
  bandKey: {
    display: 'flex',
    alignItems: 'center',
    justifyContent: 'flex-end',
    columnGap: tokens.spacingHorizontalXS,
    padding: `0 ${tokens.spacingHorizontalXS}`,
    fontSize: tokens.fontSizeBase200,
    lineHeight: tokens.lineHeightBase200,
    color: tokens.colorNeutralForeground2,
  },
  row: {
    display: 'grid',
    gridTemplateColumns: 'minmax(0, 1fr) 48px 60px',
    columnGap: tokens.spacingHorizontalS,
    padding: `${tokens.spacingVerticalXXS} ${tokens.spacingHorizontalXS} ${tokens.spacingVerticalXS}`,
    borderRadius: tokens.borderRadiusSmall,
    fontSize: tokens.fontSizeBase200,
    lineHeight: tokens.lineHeightBase200,
    cursor: 'pointer',
    ':hover': { backgroundColor: tokens.colorNeutralBackground3 },
    ':focus-visible': { outline: `2px solid ${tokens.colorStrokeFocus2}`, outlineOffset: '-2px' },
  },
  selected: {
    backgroundColor: tokens.colorNeutralBackground3,
    boxShadow: `inset 3px 0 0 ${tokens.colorBrandStroke1}`,
    '@media (forced-colors: active)': { outline: '1px solid Highlight' },
  },
  name: { overflowWrap: 'anywhere' },
  number: { textAlign: 'right', fontVariantNumeric: 'tabular-nums' },
  // The words that the columns' headings say to the eye.
  unseen: { position: 'absolute', width: '1px', height: '1px', overflow: 'hidden', clipPath: 'inset(50%)' },
  leading: { fontWeight: tokens.fontWeightSemibold },
  drawing: { gridColumn: '1 / -1', display: 'block', marginTop: '2px', overflow: 'visible' },
  heading: {
    display: 'flex',
    alignItems: 'center',
    columnGap: tokens.spacingHorizontalS,
    padding: `${tokens.spacingVerticalS} ${tokens.spacingHorizontalXS} ${tokens.spacingVerticalXXS}`,
    fontSize: tokens.fontSizeBase200,
    lineHeight: tokens.lineHeightBase200,
    fontWeight: tokens.fontWeightSemibold,
    color: tokens.colorNeutralForeground2,
  },
  others: {
    width: '100%',
    border: 'none',
    background: 'none',
    color: tokens.colorNeutralForeground2,
    fontFamily: 'inherit',
    textAlign: 'left',
    borderTop: `1px dashed ${tokens.colorNeutralStroke1}`,
    borderBottom: `1px dashed ${tokens.colorNeutralStroke1}`,
  },
  more: { color: tokens.colorBrandForegroundLink, textDecorationLine: 'underline' },
  zero: {
    stroke: tokens.colorNeutralStrokeAccessible,
    '@media (forced-colors: active)': { stroke: 'CanvasText' },
  },
  weight: {
    // Hollow against solid against hatched: the three are told apart where a theme draws all of them in one colour.
    fill: 'transparent',
    stroke: tokens.colorNeutralStrokeAccessible,
    '@media (forced-colors: active)': { stroke: 'CanvasText' },
  },
  bandOnBar: {
    fill: 'none',
    stroke: tokens.colorNeutralBackground1,
    '@media (forced-colors: active)': { stroke: 'Canvas' },
  },
  band: {
    fill: 'none',
    stroke: tokens.colorNeutralForeground1,
    '@media (forced-colors: active)': { stroke: 'CanvasText' },
  },
  share: {
    fill: tokens.colorBrandForeground1,
    stroke: tokens.colorBrandForeground1,
    '@media (forced-colors: active)': { fill: 'Highlight', stroke: 'Highlight' },
  },
  reducing: {
    stroke: tokens.colorBrandForeground1,
    '@media (forced-colors: active)': { stroke: 'Highlight' },
  },
})

/** Half the height of the caps at the ends of a band. */
const CAP = 3

/**
 * The 95% band of a bar as a line with caps: dark on the ground, light where it lies on the bar.
 * @param bar where the bar begins and ends; both alike where the line shows on it anyway
 */
function Band({
  from,
  to,
  bar: [start, end],
  y,
}: {
  from: number
  to: number
  bar: readonly [start: number, end: number]
  y: number
}) {
  const classes = useStyles()
  const cap = (x: number): string => `M${x} ${y - CAP}v${2 * CAP}`
  const line = (a: number, b: number): string => (b > a ? `M${a} ${y}H${b}` : '')
  const [inFrom, inTo] = [Math.max(from, start), Math.min(to, end)]
  const isIn = (x: number): boolean => x > start && x < end
  const within = line(inFrom, inTo) + [from, to].filter(isIn).map(cap).join('')
  const beyond =
    (inTo > inFrom ? line(from, inFrom) + line(inTo, to) : line(from, to)) +
    [from, to]
      .filter((x) => !isIn(x))
      .map(cap)
      .join('')
  return (
    <>
      {within !== '' && <path className={classes.bandOnBar} d={within} />}
      {beyond !== '' && <path className={classes.band} d={beyond} />}
    </>
  )
}

/** Positions that are all drawn without folding the middle away. */
const ALL = 18
const TOP = 10
const BOTTOM = 5
const STEP = 200

interface RowProps {
  readonly id: string
  readonly position: number
  readonly name: string
  readonly weight: number
  readonly risk: number
  /** the ends of the 95% band of `risk`; equal where there is none */
  readonly low: number
  readonly high: number
  readonly weightText: string
  readonly riskText: string
  readonly label: string
  readonly comparable: boolean
  readonly across: (value: number) => number
  /** id of the pattern of risk-reducing positions */
  readonly hatch: string
  readonly selected: boolean
  readonly reachable: boolean
  readonly select: (position: number) => void
}

/** Remembered between drawings: moving the selection through hundreds of rows draws two of them. */
const Row = memo(function Row(row: RowProps) {
  const classes = useStyles()
  const { weight, risk, comparable, across } = row
  const from = (value: number) => Math.min(across(0), across(value))
  const length = (value: number) => Math.abs(across(value) - across(0))
  const height = comparable ? 14 : 8
  return (
    <div
      id={row.id}
      role="option"
      aria-selected={row.selected}
      tabIndex={row.reachable ? 0 : -1}
      className={mergeClasses(classes.row, row.selected && classes.selected)}
      onClick={() => row.select(row.position)}
      onFocus={() => row.select(row.position)}
    >
      <span className={classes.name}>{row.name}</span>
      <span className={classes.number}>
        <span className={classes.unseen}>, weight </span>
        {row.weightText}
      </span>
      <span className={mergeClasses(classes.number, classes.leading)}>
        <span className={classes.unseen}>, {row.label.toLowerCase()} </span>
        {row.riskText}
      </span>
      <svg className={classes.drawing} width="100%" height={height} aria-hidden focusable="false">
        {comparable && (
          <Bar className={classes.weight} x={from(weight)} width={length(weight)} y={0.5} height={4} />
        )}
        <Bar
          className={risk < 0 ? classes.reducing : classes.share}
          {...(risk < 0 ? { fill: `url(#${row.hatch})` } : {})}
          x={from(risk)}
          width={length(risk)}
          y={height - 7.5}
          height={7}
        />
        <line className={classes.zero} x1={across(0)} x2={across(0)} y1={-1} y2={height + 1} />
        {row.high > row.low && (
          <Band
            from={across(row.low)}
            to={across(row.high)}
            // the line shows on the hatching of a risk-reducing position
            bar={risk < 0 ? [0, 0] : [across(0), across(risk)]}
            y={height - 4}
          />
        )}
      </svg>
    </div>
  )
})

/**
 * Weight against share of risk (or, where shares are withheld, contribution to risk), one row a position, largest risk first; the
 * risk-reducing ones stand under their own heading and are hatched. A list box: arrows move, the selected position is told in full
 * by whoever holds the selection.
 */
export default function Picture({
  breakdown,
  measure,
  selected,
  select,
}: {
  breakdown: Breakdown
  measure: Measure
  selected: number
  select: (position: number) => void
}) {
  const classes = useStyles()
  const hatch = useId()
  const { element, width } = useWidth<HTMLDivElement>()
  const [middle, setMiddle] = useState(0)
  const { weights } = breakdown.decomposition
  const risk = measure.values
  const digits = digitsFor(weights.length)

  const order = Array.from(risk.keys()).sort((a, b) => risk[b]! - risk[a]!)
  const folds = order.length > ALL
  const reducers = order.filter((i) => risk[i]! < 0)
  const bottom = folds ? Math.min(BOTTOM, reducers.length) : 0
  const end = order.length - bottom
  const shownTop = folds ? Math.min(TOP + middle, end) : order.length
  const shown = [...order.slice(0, shownTop), ...order.slice(Math.max(end, shownTop))]
  const others = order.slice(shownTop, Math.max(end, shownTop))
  const adding = shown.filter((i) => risk[i]! >= 0)
  const reducing = shown.filter((i) => risk[i]! < 0)

  // Weights and shares share one scale, so the two bars can be compared; contributions are in another unit and stand alone.
  const band = (i: number) => bandOf(risk[i]!, measure.errors?.[i] ?? 0)
  const drawn = shown.flatMap((i) => (measure.comparable ? [weights[i]!, ...band(i)] : band(i)))
  const low = Math.min(0, ...drawn)
  const high = Math.max(0, ...drawn)
  const across = useMemo(
    () => scaleLinear<number>({ domain: [low, high], range: [1, Math.max(1, width - 9)] }),
    [low, high, width],
  )

  const rowIds = useId()
  const move = (event: KeyboardEvent): void => {
    const sequence = [...adding, ...reducing]
    const at = sequence.indexOf(selected)
    const steps: { readonly [key: string]: number } = {
      ArrowDown: Math.min(at + 1, sequence.length - 1),
      ArrowUp: Math.max(at - 1, 0),
      Home: 0,
      End: sequence.length - 1,
    }
    const next = sequence[steps[event.key] ?? -1]
    if (next === undefined) return
    event.preventDefault()
    select(next)
    document.getElementById(`${rowIds}${next}`)?.focus()
  }
  /** The one row that Tab reaches: the selected one, or the first when that one is folded away. */
  const reachable = shown.includes(selected) ? selected : (adding[0] ?? reducing[0])
  const rows = (positions: readonly number[]) =>
    positions.map((i) => {
      const [from, to] = band(i)
      return (
        <Row
          key={i}
          id={`${rowIds}${i}`}
          position={i}
          name={breakdown.names[i] ?? ''}
          weight={weights[i]!}
          risk={risk[i]!}
          low={from}
          high={to}
          weightText={percentText(weights[i]!, digits)}
          riskText={percentText(risk[i]!, measure.digits)}
          label={measure.label}
          comparable={measure.comparable}
          across={across}
          hatch={hatch}
          selected={i === selected}
          reachable={i === reachable}
          select={select}
        />
      )
    })
  const sum = (values: Float64Array): number => others.reduce((total, i) => total + values[i]!, 0)

  const reducingHeading = (
    <div className={classes.heading} aria-hidden>
      <svg width="24" height="8">
        <Bar className={classes.reducing} fill={`url(#${hatch})`} x={0.5} y={0.5} width={23} height={7} />
      </svg>
      Risk-reducing positions
    </div>
  )
  return (
    <div className={classes.picture} ref={element}>
      <Hatch id={hatch} className={classes.reducing} />
      <div className={classes.head} aria-hidden>
        <span />
        <span className={classes.key}>
          Weight
          {measure.comparable && (
            <svg width="24" height="8" aria-hidden>
              <Bar className={classes.weight} x={0.5} y={2} width={23} height={4} />
            </svg>
          )}
        </span>
        <span className={classes.key}>
          {measure.label}
          <svg width="24" height="8" aria-hidden>
            <Bar className={classes.share} x={0.5} y={0.5} width={23} height={7} />
          </svg>
        </span>
      </div>
      {measure.errors && (
        <div className={classes.bandKey} aria-hidden>
          <svg width="24" height="8">
            <Band from={1} to={23} bar={[0, 0]} y={4} />
          </svg>
          95% band
        </div>
      )}
      <div
        role="listbox"
        aria-label={`Weight and ${measure.label.toLowerCase()}, by position`}
        onKeyDown={move}
      >
        <div role="group" aria-label="Positions that add to risk">
          {rows(adding)}
        </div>
        {reducing.length > 0 && others.length === 0 && (
          <div role="group" aria-label="Risk-reducing positions">
            {reducingHeading}
            {rows(reducing)}
          </div>
        )}
      </div>
      {others.length > 0 && (
        <>
          <button
            type="button"
            className={mergeClasses(classes.row, classes.others)}
            onClick={() => setMiddle(middle + STEP)}
          >
            <span className={classes.more}>and {others.length.toLocaleString('en-US')} others</span>
            <span className={classes.number}>{percentText(sum(weights), digits)}</span>
            <span className={classes.number}>{percentText(sum(risk), measure.digits)}</span>
          </button>
          {reducing.length > 0 && (
            <div role="listbox" aria-label="Largest risk-reducing positions" onKeyDown={move}>
              {reducingHeading}
              {rows(reducing)}
            </div>
          )}
        </>
      )}
    </div>
  )
}
