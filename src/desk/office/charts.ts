/**
 * Charts of a sheet: what the API says of those that are kept with it and does to them. The desk knows bars, columns, stacked columns and
 * lines over one row of categories; it tells series apart by filled and outlined bars, whole and broken lines, so colours, fonts and weights
 * of lines are checked and not kept.
 *
 * What a new chart begins with (a legend, no title, filled series without borders) is from memory; the members are those of the host's
 * declarations (Excel.Chart, ChartCollection, ChartSeries, ChartAxis, ChartLegend).
 */
import { height, quoteSheet, splitAddress, width, type Rect } from './addresses'
import type { Sheet } from './book'
import { colour, fullAddress, placeAt, placeOfReference, shifted, type Place } from './range'
import type { ChartSeries, Corner, SheetChart } from './custom-data'
import { OfficeError } from './error'
import type { Kind, Scalar, Shift } from './request-context'
import { WORKSHEET } from './worksheet'

/** A chart is known by its name, and the object that renames it follows. */
interface Chart {
  readonly sheet: Sheet
  name: string
}

interface Series {
  readonly chart: Chart
  readonly index: number
}

const TYPES: readonly (readonly [type: string, kind: SheetChart['kind']])[] = [
  ['BarClustered', 'bars'],
  ['ColumnClustered', 'columns'],
  ['ColumnStacked', 'stacked columns'],
  ['Line', 'line'],
  ['LineMarkers', 'line'],
]

function kindOf(type: string): SheetChart['kind'] {
  const found = TYPES.find(([known]) => known === type)
  if (!found) throw new OfficeError('NotImplemented', `the desk draws no chart of the type ${type}`)
  return found[1]
}

function found({ sheet, name }: Chart): SheetChart {
  const chart = sheet.charts.find((known) => known.name === name)
  if (!chart) throw new OfficeError('ItemNotFound', `there is no chart "${name}"`)
  return chart
}

function change({ sheet, name }: Chart, changes: Partial<SheetChart>): void {
  sheet.charts = sheet.charts.map((known) => (known.name === name ? { ...known, ...changes } : known))
}

function oneSeries({ chart, index }: Series): ChartSeries {
  const series = found(chart).series[index]
  if (!series) throw new OfficeError('ItemNotFound', `there is no series ${index}`)
  return series
}

function changeSeries(target: Series, changes: Partial<ChartSeries>): void {
  oneSeries(target)
  change(target.chart, {
    series: found(target.chart).series.map((known, k) =>
      k === target.index ? { ...known, ...changes } : known,
    ),
  })
}

/** A property of a chart that is kept as it is set. */
const kept = <K extends keyof SheetChart>(
  key: K,
  accepts: (value: SheetChart[K]) => boolean = () => true,
): Scalar<Chart> => ({
  read: (chart) => found(chart)[key],
  write: (chart: Chart, value: SheetChart[K]) => {
    if (!accepts(value)) throw new OfficeError('InvalidArgument', `${key} of a chart`)
    change(chart, { [key]: value })
  },
})

/** A property that the desk has one value for. */
const fixed = (value: unknown): Scalar<unknown> => ({
  read: () => value,
  write: (_: unknown, given: unknown) => {
    if (given !== value)
      throw new OfficeError('NotImplemented', `the desk has ${String(value)} here, not ${String(given)}`)
  },
})

const isText = (value: unknown): value is string => typeof value === 'string'
const isTruth = (value: unknown): value is boolean => typeof value === 'boolean'

const FONT: Kind<Chart> = {
  name: 'ChartFont',
  scalars: { size: fixed(10), bold: fixed(true) },
}

const TITLE_FORMAT: Kind<Chart> = {
  name: 'ChartTitleFormat',
  parts: { font: { kind: () => FONT, find: (chart) => chart } },
}

const TITLE: Kind<Chart> = {
  name: 'ChartTitle',
  scalars: { text: kept('title', isText), visible: { read: (chart) => found(chart).title !== '' } },
  parts: { format: { kind: () => TITLE_FORMAT, find: (chart) => chart } },
}

const ENTRY: Kind<Series> = {
  name: 'ChartLegendEntry',
  scalars: {
    visible: {
      read: (series) => oneSeries(series).look !== 'unseen',
      write: (series: Series, visible: boolean) => {
        if (visible !== (oneSeries(series).look !== 'unseen'))
          throw new OfficeError(
            'NotImplemented',
            'the legend of the desk names just the series that are drawn',
          )
      },
    },
  },
}

const ENTRIES: Kind<Chart> = {
  name: 'ChartLegendEntryCollection',
  finds: {
    getItemAt: {
      kind: () => ENTRY,
      find: (chart, index: number): Series | null => (found(chart).series[index] ? { chart, index } : null),
    },
  },
}

const LEGEND: Kind<Chart> = {
  name: 'ChartLegend',
  scalars: { visible: kept('legend', isTruth), position: fixed('Bottom') },
  parts: { legendEntries: { kind: () => ENTRIES, find: (chart) => chart } },
}

const CATEGORY_AXIS: Kind<Chart> = {
  name: 'ChartAxis',
  scalars: {
    reversePlotOrder: kept('reversed', isTruth),
    tickLabelPosition: fixed('Low'),
    position: {
      read: (chart) => (found(chart).reversed ? 'Maximum' : 'Automatic'),
      write: (chart: Chart, position: string) => {
        if ((position === 'Maximum') !== found(chart).reversed)
          throw new OfficeError('NotImplemented', 'the desk draws the axis of values below, or at the left')
      },
    },
  },
}

const VALUE_AXIS: Kind<Chart> = {
  name: 'ChartAxis',
  scalars: {
    numberFormat: kept('format', isText),
    // a host that was not told where it begins says where it put it, which the desk leaves to whoever draws
    minimum: {
      read: (chart) => found(chart).minimum ?? 0,
      write: (chart: Chart, minimum: unknown) => {
        if (typeof minimum !== 'number')
          throw new OfficeError('InvalidArgument', 'an axis begins at a number')
        change(chart, { minimum })
      },
    },
  },
}

const AXES: Kind<Chart> = {
  name: 'ChartAxes',
  parts: {
    categoryAxis: { kind: () => CATEGORY_AXIS, find: (chart) => chart },
    valueAxis: { kind: () => VALUE_AXIS, find: (chart) => chart },
  },
}

const isLine = ({ chart }: Series): boolean => found(chart).kind === 'line'

const SERIES_FILL: Kind<Series> = {
  name: 'ChartFill',
  acts: {
    setSolidColor: (series, given: string) => {
      colour(given)
      if (isLine(series)) throw new OfficeError('NotImplemented', 'the desk fills no lines')
      changeSeries(series, { look: 'solid' })
    },
    clear: (series) => {
      if (isLine(series)) throw new OfficeError('NotImplemented', 'the desk fills no lines')
      // a bar has no border until it is given one
      if (oneSeries(series).look === 'solid') changeSeries(series, { look: 'unseen' })
    },
  },
}

/** Gives a line or the border of a bar its look. */
function drawLine(series: Series, look: ChartSeries['look']): void {
  if (!isLine(series) && oneSeries(series).look === 'solid')
    throw new OfficeError(
      'NotImplemented',
      'the desk draws no border around filled bars: clear the fill first',
    )
  changeSeries(series, { look: look === 'solid' && !isLine(series) ? 'outline' : look })
}

const LINE_STYLES = ['Continuous', 'Dash', 'DashDot', 'DashDotDot', 'Dot', 'RoundDot', 'Automatic', 'None']

const SERIES_LINE: Kind<Series> = {
  name: 'ChartLineFormat',
  scalars: {
    color: {
      read: () => '#000000',
      write: (series: Series, given: string) => {
        colour(given)
        if (oneSeries(series).look === 'unseen') drawLine(series, 'solid')
      },
    },
    weight: {
      read: () => 1,
      write: (series: Series, points: number) => {
        if (!(points > 0)) throw new OfficeError('InvalidArgument', `${points} is no weight of a line`)
      },
    },
    lineStyle: {
      read: (series) => ({ solid: 'Continuous', outline: 'Dash', unseen: 'None' })[oneSeries(series).look],
      write: (series: Series, style: string) => {
        if (!LINE_STYLES.includes(style))
          throw new OfficeError('InvalidArgument', `"${style}" is no line style`)
        const whole = style === 'Continuous' || style === 'Automatic'
        drawLine(series, style === 'None' ? 'unseen' : whole ? 'solid' : 'outline')
      },
    },
  },
  acts: { clear: (series) => drawLine(series, 'unseen') },
}

const SERIES_FORMAT: Kind<Series> = {
  name: 'ChartSeriesFormat',
  parts: {
    fill: { kind: () => SERIES_FILL, find: (series) => series },
    line: { kind: () => SERIES_LINE, find: (series) => series },
  },
}

const SERIES: Kind<Series> = {
  name: 'ChartSeries',
  check: (series) => void oneSeries(series),
  scalars: {
    name: {
      read: (series) => oneSeries(series).name,
      write: (series: Series, name: string) => {
        if (!isText(name) || name.length > 255)
          throw new OfficeError('InvalidArgument', 'the name of a series has at most 255 characters')
        changeSeries(series, { name })
      },
    },
    chartType: { read: ({ chart }) => typeOf(found(chart).kind) },
  },
  parts: { format: { kind: () => SERIES_FORMAT, find: (series) => series } },
  acts: {
    setValues: (series, place: Place) => changeSeries(series, { values: lineOf(place) }),
    setXAxisValues: (series, place: Place) => {
      const categories = lineOf(place)
      const known = found(series.chart).categories
      if (series.index > 0 && known !== categories)
        throw new OfficeError(
          'NotImplemented',
          'the desk draws the series of a chart over the same categories',
        )
      change(series.chart, { categories })
    },
    delete: (series) =>
      change(series.chart, { series: found(series.chart).series.filter((_, k) => k !== series.index) }),
  },
}

/** The reference to a part of one row or one column. */
function lineOf(place: Place): string {
  if (height(place.rect) > 1 && width(place.rect) > 1)
    throw new OfficeError('InvalidArgument', 'a series is a part of one row or of one column')
  return fullAddress(place, true)
}

const typeOf = (kind: SheetChart['kind']): string => TYPES.find(([, known]) => known === kind)?.[0] ?? ''

const SERIES_LIST: Kind<Chart> = {
  name: 'ChartSeriesCollection',
  list: {
    kind: () => SERIES,
    read: (chart) => found(chart).series.map((_, index): Series => ({ chart, index })),
  },
  scalars: { count: { read: (chart) => found(chart).series.length } },
  answers: { getCount: (chart) => found(chart).series.length },
  finds: {
    getItemAt: {
      kind: () => SERIES,
      find: (chart, index: number): Series | null => (found(chart).series[index] ? { chart, index } : null),
    },
    add: {
      kind: () => SERIES,
      writes: true,
      find: (chart, name = ''): Series => {
        const { series } = found(chart)
        change(chart, { series: [...series, { name, values: '', look: 'solid' }] })
        return { chart, index: series.length }
      },
    },
  },
}

const CHART: Kind<Chart> = {
  name: 'Chart',
  check: (chart) => void found(chart),
  scalars: {
    name: {
      read: ({ name }) => name,
      write: (chart: Chart, name: string) => {
        if (!isText(name) || name === '') throw new OfficeError('InvalidArgument', 'a chart needs a name')
        // the host finds the first of several of one name, so whoever makes two has lost one
        if (name !== chart.name && chart.sheet.charts.some((known) => known.name === name))
          throw new OfficeError('InvalidArgument', `a chart named "${name}" lies on the sheet`)
        change(chart, { name })
        chart.name = name
      },
    },
    chartType: {
      read: (chart) => typeOf(found(chart).kind),
      write: (chart: Chart, type: string) => change(chart, { kind: kindOf(type) }),
    },
    plotVisibleOnly: fixed(false),
  },
  parts: {
    title: { kind: () => TITLE, find: (chart) => chart },
    legend: { kind: () => LEGEND, find: (chart) => chart },
    axes: { kind: () => AXES, find: (chart) => chart },
    series: { kind: () => SERIES_LIST, find: (chart) => chart },
    worksheet: { kind: () => WORKSHEET, find: ({ sheet }) => sheet },
  },
  acts: {
    setPosition: (chart, start: Place | string, end?: Place | string) => {
      const { from, to } = found(chart)
      const first = cellsOf(chart.sheet, start)
      const last = end === undefined ? null : cellsOf(chart.sheet, end)
      change(chart, {
        from: { row: first.top, column: first.left },
        to: last
          ? { row: last.bottom + 1, column: last.right + 1 }
          : { row: first.top + to.row - from.row, column: first.left + to.column - from.column },
      })
    },
    delete: ({ sheet, name }) => {
      sheet.charts = sheet.charts.filter((known) => known.name !== name)
    },
  },
}

function cellsOf(sheet: Sheet, given: Place | string): Rect {
  const place = isText(given) ? placeAt(sheet, given) : given
  if (place.sheet.id !== sheet.id) throw new OfficeError('InvalidArgument', 'the cells lie on another sheet')
  return place.rect
}

/** How many cells a chart covers before it is put somewhere (from memory: about so many). */
const USUAL = { rows: 15, columns: 8 }

/** Every column or every row of a block as a series. The host takes headings and categories from the block as well; the desk does not guess. */
function seriesOf({ sheet, rect }: Place, by: string): ChartSeries[] {
  if (!['Auto', 'Columns', 'Rows'].includes(by))
    throw new OfficeError('InvalidArgument', `"${by}" is no way to take series`)
  const rows = by === 'Rows' || (by === 'Auto' && width(rect) > height(rect))
  return Array.from({ length: rows ? height(rect) : width(rect) }, (_, k) => ({
    name: `Series${k + 1}`,
    values: lineOf({
      sheet,
      rect: rows
        ? { ...rect, top: rect.top + k, bottom: rect.top + k }
        : { ...rect, left: rect.left + k, right: rect.left + k },
    }),
    look: 'solid',
  }))
}

const byName = (sheet: Sheet, name: string): Chart | null =>
  sheet.charts.some((known) => known.name === name) ? { sheet, name } : null

/** The charts over a sheet, those behind first. */
export const CHARTS: Kind<Sheet> = {
  name: 'ChartCollection',
  list: { kind: () => CHART, read: (sheet) => sheet.charts.map(({ name }): Chart => ({ sheet, name })) },
  scalars: { count: { read: (sheet) => sheet.charts.length } },
  answers: { getCount: (sheet) => sheet.charts.length },
  finds: {
    getItem: { kind: () => CHART, find: byName },
    getItemOrNullObject: { kind: () => CHART, orNull: true, find: byName },
    getItemAt: {
      kind: () => CHART,
      find: (sheet, index: number): Chart | null => {
        const chart = sheet.charts[index]
        return chart ? { sheet, name: chart.name } : null
      },
    },
    add: {
      kind: () => CHART,
      writes: true,
      find: (sheet, type: string, source: Place, by = 'Auto'): Chart => {
        const kind = kindOf(type)
        let count = 1
        while (byName(sheet, `Chart ${count}`)) count++
        const name = `Chart ${count}`
        sheet.charts = [
          ...sheet.charts,
          {
            name,
            kind,
            title: '',
            from: { row: 0, column: 0 },
            to: { row: USUAL.rows, column: USUAL.columns },
            categories: '',
            series: seriesOf(source, by),
            format: 'General',
            reversed: false,
            legend: true,
          },
        ]
        return { sheet, name }
      },
    },
  },
}

/** A reference of a chart after lines of a sheet came or went. */
function follow(sheet: Sheet, reference: string, change: Shift): string {
  const place = placeOfReference(sheet, reference)
  if (place?.sheet.id !== change.sheet) return reference
  const rect = shifted(place.rect, change)
  return rect ? fullAddress({ sheet: place.sheet, rect }, true) : '#REF!'
}

/** The corners of a chart after lines came or went: it moves and stretches with its cells, and keeps one where all of them went. */
function moved({ from, to }: SheetChart, change: Shift): { from: Corner; to: Corner } {
  const axis = change.axis
  const first = from[axis]
  const last = Math.max(first, to[axis] - (to[axis === 'row' ? 'y' : 'x'] ? 0 : 1))
  const rect = shifted(
    axis === 'row'
      ? { top: first, bottom: last, left: 0, right: 0 }
      : { left: first, right: last, top: 0, bottom: 0 },
    change,
  )
  const [start, end] = rect
    ? axis === 'row'
      ? [rect.top, rect.bottom]
      : [rect.left, rect.right]
    : [change.at, change.at]
  return { from: { ...from, [axis]: start }, to: { ...to, [axis]: to[axis] + end - last } }
}

/** Lets charts follow cells when lines come or go. */
export function shiftCharts(sheets: readonly Sheet[], change: Shift): void {
  for (const sheet of sheets) {
    if (sheet.charts.length === 0) continue
    // a protected sheet draws what lies on others, and follows it as well
    sheet.keep({
      charts: sheet.charts.map((chart) => ({
        ...chart,
        ...(sheet.id === change.sheet && moved(chart, change)),
        categories: follow(sheet, chart.categories, change),
        series: chart.series.map((one) => ({ ...one, values: follow(sheet, one.values, change) })),
      })),
    })
  }
}

/** Lets charts follow a sheet that gets another name. */
export function renameInCharts(sheets: readonly Sheet[], before: string, after: string): void {
  const renamed = (reference: string): string => {
    const { sheet, cells } = splitAddress(reference)
    return sheet?.toLowerCase() === before.toLowerCase() ? `${quoteSheet(after)}!${cells}` : reference
  }
  for (const sheet of sheets) {
    if (sheet.charts.length === 0) continue
    sheet.keep({
      charts: sheet.charts.map((chart) => ({
        ...chart,
        categories: renamed(chart.categories),
        series: chart.series.map((one) => ({ ...one, values: renamed(one.values) })),
      })),
    })
  }
}
