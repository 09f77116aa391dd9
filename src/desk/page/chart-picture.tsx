/** A chart of a sheet as a picture: the four kinds the desk knows, told apart as in the saved file by solid and outlined, whole and broken. */
import { numfmt } from '@univerjs/core'
import { scaleBand, scaleLinear } from '@visx/scale'
import type { ReactNode } from 'react'
import type { SheetChart } from '../office'

/** A chart with what stands in its cells. */
export interface DrawnChart extends Pick<
  SheetChart,
  'name' | 'kind' | 'title' | 'format' | 'reversed' | 'legend' | 'minimum'
> {
  readonly categories: readonly string[]
  readonly series: readonly Series[]
}

interface Series {
  readonly name: string
  readonly look: SheetChart['series'][number]['look']
  /** as many as categories; null where nothing is drawn */
  readonly values: readonly (number | null)[]
}

interface Room {
  readonly left: number
  readonly right: number
  readonly top: number
  readonly bottom: number
}

/** Height of a line of small letters, width of one of them and of one in a title, near enough to leave room by. */
const LINE = 15
const LETTER = 6
const HEADING = 8
const GAP = 8
/** The part of the width that names of categories may take. */
const NAMES = 0.38

/** @param width, height  in pixels */
export function ChartPicture({ chart, width, height }: { chart: DrawnChart; width: number; height: number }) {
  const room: Room = {
    left: GAP,
    right: width - 2 * GAP,
    top: GAP + (chart.title ? LINE + GAP : 0),
    bottom: height - GAP - (chart.legend ? LINE + GAP : 0),
  }
  const Plot = chart.kind === 'bars' ? Across : Upright
  return (
    <svg
      className="desk-chart"
      role="img"
      aria-label={chart.name || chart.title || 'Chart'}
      width={width}
      height={height}
    >
      {chart.title && (
        <text className="desk-chart-title" x={width / 2} y={GAP + LINE - 3} textAnchor="middle">
          {shortened(chart.title, width - 2 * GAP, HEADING)}
        </text>
      )}
      {room.right - room.left > 60 && room.bottom - room.top > 40 && <Plot chart={chart} room={room} />}
      {chart.legend && <Key chart={chart} middle={width / 2} y={height - GAP} />}
    </svg>
  )
}

/** Bars that lie across, with the categories' names at the left. */
function Across({ chart, room }: { chart: DrawnChart; room: Room }) {
  const names = Math.min(longest(chart.categories) * LETTER, (room.right - room.left) * NAMES)
  const [left, bottom] = [room.left + names + 6, room.bottom - LINE]
  const { scale, ticks } = valueAxis(chart, [left, room.right], 70)
  const { bands, every } = categoryAxis(chart, [room.top, bottom], LINE)
  return (
    <>
      {ticks.map((tick) => (
        <g key={tick}>
          <line className="desk-chart-rule" x1={scale(tick)} x2={scale(tick)} y1={room.top} y2={bottom} />
          <text x={scale(tick)} y={bottom + LINE - 2} textAnchor="middle">
            {figure(chart, tick)}
          </text>
        </g>
      ))}
      {chart.categories.map(
        (name, k) =>
          k % every === 0 && (
            <text key={k} x={left - 6} y={bands(k) + bands.width / 2 + 4} textAnchor="end">
              {shortened(name, names)}
            </text>
          ),
      )}
      {barsOf(chart).map(({ key, category, from, to, place, places, look }) => (
        <rect
          key={key}
          className={look}
          x={Math.min(scale(from), scale(to))}
          width={Math.abs(scale(to) - scale(from))}
          // along with the categories, series run from the bottom up unless reversed
          y={bands(category) + (bands.width / places) * (chart.reversed ? place : places - 1 - place)}
          height={bands.width / places}
        />
      ))}
      <line className="desk-chart-axis" x1={scale(0)} x2={scale(0)} y1={room.top} y2={bottom} />
    </>
  )
}

/** Columns and lines, with the categories' names below. */
function Upright({ chart, room }: { chart: DrawnChart; room: Room }) {
  const needed = Math.min(longest(chart.categories), 14) * LETTER + GAP
  // steps that explain something all keep their names, by turns on two lines where they are long; points in time can do without some
  const isTight = chart.kind !== 'line' && needed * chart.categories.length > room.right - room.left - 40
  const lines = isTight ? 2 : 1
  const bottom = room.bottom - lines * LINE
  const { scale, ticks } = valueAxis(chart, [bottom, room.top], 36)
  const left = room.left + longest(ticks.map((tick) => figure(chart, tick))) * LETTER + 2 * GAP
  const { bands, every } = categoryAxis(chart, [left, room.right], needed / lines)
  return (
    <>
      {ticks.map((tick) => (
        <g key={tick}>
          <line className="desk-chart-rule" x1={left} x2={room.right} y1={scale(tick)} y2={scale(tick)} />
          <text x={left - 6} y={scale(tick) + 4} textAnchor="end">
            {figure(chart, tick)}
          </text>
        </g>
      ))}
      {chart.categories.map(
        (name, k) =>
          k % every === 0 && (
            <text
              key={k}
              x={bands(k) + bands.width / 2}
              y={bottom + LINE * (1 + ((k / every) % lines)) - 2}
              textAnchor="middle"
            >
              {shortened(name, Math.max(bands.step * every * lines - GAP, 3 * LETTER))}
            </text>
          ),
      )}
      {chart.kind === 'line'
        ? chart.series.map((series, s) => (
            <Line
              key={s}
              series={series}
              look={lookOf(chart.series, s)}
              x={(k) => bands(k) + bands.width / 2}
              y={scale}
            />
          ))
        : barsOf(chart).map(({ key, category, from, to, place, places, look }) => (
            <rect
              key={key}
              className={look}
              x={bands(category) + (bands.width / places) * (chart.reversed ? places - 1 - place : place)}
              width={bands.width / places}
              y={Math.min(scale(from), scale(to))}
              height={Math.abs(scale(to) - scale(from))}
            />
          ))}
      {ticks[0] !== undefined && (
        <line
          className="desk-chart-axis"
          x1={left}
          x2={room.right}
          y1={scale(Math.max(0, ticks[0]))}
          y2={scale(Math.max(0, ticks[0]))}
        />
      )}
    </>
  )
}

/** A line with a mark at each figure; it breaks where there is none. */
function Line({
  series,
  look,
  x,
  y,
}: {
  series: Series
  look: string
  x: (k: number) => number
  y: (value: number) => number
}) {
  const path = series.values
    .map((value, k) =>
      value === null ? '' : `${series.values[k - 1] == null ? 'M' : 'L'}${x(k)},${y(value)}`,
    )
    .join('')
  return (
    <g className={`desk-chart-line ${look}`}>
      <path d={path} />
      {series.values.map((value, k) => value !== null && <circle key={k} cx={x(k)} cy={y(value)} r={2.5} />)}
    </g>
  )
}

/** What the marks mean, of the series that are seen. */
function Key({ chart, middle, y }: { chart: DrawnChart; middle: number; y: number }) {
  const seen = chart.series.flatMap((series, s) =>
    series.look === 'unseen' ? [] : [{ name: series.name, look: lookOf(chart.series, s) }],
  )
  const widths = seen.map(({ name }) => name.length * LETTER + 32)
  const total = widths.reduce((sum, width) => sum + width, 0)
  const starts = widths.map(
    (_, k) => middle - total / 2 + widths.slice(0, k).reduce((sum, width) => sum + width, 0),
  )
  return (
    <g aria-hidden>
      {seen.map(({ name, look }, k) => {
        const x = starts[k] ?? 0
        const mark: ReactNode =
          chart.kind === 'line' ? (
            <g className={`desk-chart-line ${look}`}>
              <path d={`M${x},${y - 8}h12`} />
            </g>
          ) : (
            <rect className={look} x={x + 1} y={y - 12} width={9} height={9} />
          )
        return (
          <g key={k}>
            {mark}
            <text x={x + 16} y={y - 4}>
              {name}
            </text>
          </g>
        )
      })}
    </g>
  )
}

interface Bar {
  readonly key: string
  readonly category: number
  readonly from: number
  readonly to: number
  /** which of how many that share the room of a category side by side */
  readonly place: number
  readonly places: number
  readonly look: string
}

/** The class of a series; those of one look differ in shade. */
function lookOf(series: readonly Series[], s: number): string {
  const own = series[s]?.look
  const before = series.slice(0, s).filter(({ look }) => look === own).length
  return `desk-chart-${own}${before > 0 ? ' desk-chart-lighter' : ''}`
}

/** Every bar or column, those that stand on one another included: what is below zero hangs down from it. */
function barsOf({ kind, series, categories, minimum = -Infinity }: DrawnChart): Bar[] {
  const stacked = kind === 'stacked columns'
  return categories.flatMap((_, category) => {
    const ends = { up: 0, down: 0 }
    return series.flatMap(({ values }, s) => {
      const value = values[category]
      if (value == null) return []
      const side = value < 0 ? 'down' : 'up'
      const from = stacked ? ends[side] : 0
      ends[side] = from + value
      const place = stacked ? { place: 0, places: 1 } : { place: s, places: series.length }
      // what lies before the beginning of the axis is cut off
      const [begin, end] = [Math.max(from, minimum), Math.max(from + value, minimum)]
      if (begin === end && value !== 0) return []
      return [{ key: `${category}-${s}`, category, from: begin, to: end, look: lookOf(series, s), ...place }]
    })
  })
}

/** Where values lie between two ends in pixels, and the round ones, about `apart` pixels from one another. */
function valueAxis(chart: DrawnChart, range: [number, number], apart: number) {
  const found =
    chart.kind === 'line'
      ? chart.series.flatMap(({ values }) => values.filter((value) => value !== null))
      : barsOf(chart).flatMap(({ from, to }) => [from, to])
  const [low, high] = [Math.min(...found), Math.max(...found)]
  // Bars begin at zero. So do lines, unless they are about one level far from it.
  const span = high - low
  const isFar = chart.kind === 'line' && low * high > 0 && span > 0 && span < Math.max(-low, high) / 6
  const bottom = chart.minimum ?? (isFar ? low : Math.min(0, low))
  const ends = found.length === 0 ? [0, 1] : [bottom, isFar ? high : Math.max(0, high)]
  const wanted = Math.max(2, Math.floor(Math.abs(range[1] - range[0]) / apart))
  const scale = scaleLinear<number>({
    domain: ends[0] === ends[1] ? [ends[0]!, ends[0]! + 1] : ends,
    range,
  }).nice(wanted)
  return { scale: (value: number): number => scale(value), ticks: scale.ticks(wanted) }
}

/** Where categories lie between two ends, and how many of them share one name where all would not fit. */
function categoryAxis({ categories, kind, reversed }: DrawnChart, ends: [number, number], needed: number) {
  // pixels run down, and categories from the axis of values on
  const down = kind === 'bars' ? reversed : !reversed
  const domain = categories.map((_, k) => k)
  const scale = scaleBand<number>({ domain, range: down ? ends : [ends[1], ends[0]], padding: 0.3 })
  const bands = Object.assign((k: number): number => scale(k) ?? 0, {
    width: scale.bandwidth(),
    step: scale.step(),
  })
  return { bands, every: Math.max(1, Math.ceil(needed / Math.max(1, scale.step()))) }
}

const figure = ({ format }: DrawnChart, value: number): string =>
  numfmt.format(format === '' ? 'General' : format, value, { throws: false })

const longest = (texts: readonly string[]): number => Math.max(0, ...texts.map(({ length }) => length))

/** A text cut to a width, by whole letters and with a sign that it was. */
function shortened(text: string, width: number, letter = LETTER): string {
  const letters = Math.max(1, Math.floor(width / letter))
  return text.length <= letters ? text : `${text.slice(0, letters - 1).trimEnd()}…`
}
