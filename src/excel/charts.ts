import { overlap, type Area, type Json, type Span, type TableChart } from '../sheet'
import type { Step } from './journal'
import { rangeOf } from './reading'
import type { Fill } from './writing'

/**
 * Charts of the host's own over a table. The host has no word for what a chart shows to one who does not see it: what it reads out is the
 * chart's name, so the sentence is the name, and names differ on a sheet. Which charts are ours is remembered in a setting, by name, with
 * what they draw of which table: so one that still draws the same stays as it is, with whatever its user did to it; another is replaced.
 */
export interface DrawnChart {
  readonly name: string
  readonly chart: TableChart
  /** the table it draws, as it lay when it was last written */
  readonly of: Area
}

/** The charts on a sheet, by name. */
export type ChartsThere = ReadonlyMap<string, readonly string[]>

/** Asks for the names of a sheet's charts. The answer is there after the next sync. */
export function askCharts(context: Excel.RequestContext, sheet: string): () => string[] {
  const charts = context.workbook.worksheets.getItemOrNullObject(sheet).charts.load('items/name')
  return () => (charts.isNullObject ? [] : charts.items.map(({ name }) => name))
}

/** What a write does about charts. */
export interface Redrawing {
  /** they go; one that an undone write took away comes back drawn anew: colours, fonts and a place that its user gave it do not, and it lies over others */
  readonly gone: readonly DrawnChart[]
  readonly made: readonly DrawnChart[]
  readonly renamed: readonly { readonly sheet: string; readonly from: string; readonly to: string }[]
  /** all charts of the sheets concerned, as they were named before */
  readonly before: readonly { readonly sheet: string; readonly names: readonly string[] }[]
}

export const NO_REDRAWING: Redrawing = { gone: [], made: [], renamed: [], before: [] }

/** What a setting says of our charts: anyone may have edited it, and what cannot be read is no chart of ours. */
export const drawnIn = (setting: unknown): DrawnChart[] =>
  (Array.isArray(setting) ? (setting as Partial<DrawnChart>[]) : []).filter(
    (entry): entry is DrawnChart =>
      typeof entry?.name === 'string' &&
      typeof entry.of?.sheet === 'string' &&
      Array.isArray(entry.chart?.series),
  )

export const asSetting = (drawn: readonly DrawnChart[]): Json =>
  drawn.length > 0 ? (drawn as unknown as Json) : null

/**
 * Works out which charts come, go and stay.
 *
 * @param there charts of the sheets concerned; a sheet that is not there is left out
 * @param known whether there is a sheet of a name
 * @returns what is to be done, and the list as it is then; null when nothing changes
 */
export function redrawing(
  fills: readonly Fill[],
  drawn: readonly DrawnChart[],
  there: ChartsThere,
  known: (sheet: string) => boolean,
): { readonly work: Redrawing; readonly drawn: readonly DrawnChart[] } | null {
  const gone: DrawnChart[] = []
  const made: DrawnChart[] = []
  const renamed: Redrawing['renamed'][number][] = []
  // one that its user has deleted is ours no more
  let list = drawn.filter(({ name, of }) => there.get(of.sheet)?.includes(name) ?? true)
  for (const fill of fills) {
    const { sheet } = fill.target
    const names = new Set(there.get(sheet))
    const own = list.filter((entry) => belongs(entry, fill, names, known))
    list = list.filter((entry) => !own.includes(entry))
    // a chart has one entry, unless its sheet has got the name of an earlier one
    const entries = new Map(own.map((entry) => [entry.name, entry]))
    const left = [...entries.values()].map((entry) => ({ ...entry, of: fill.patch.ours ?? entry.of }))
    const taken = new Set([...names, ...made.flatMap(({ name, of }) => (of.sheet === sheet ? [name] : []))])
    const freeName = (alt: string): string => {
      let name = alt
      for (let k = 2; taken.has(name); k++) name = `${alt} (${k})`
      taken.add(name)
      return name
    }
    for (const chart of fill.patch.table.charts ?? []) {
      const at = left.findIndex((entry) => drawsSame(entry, chart, fill))
      const [same] = at < 0 ? [] : left.splice(at, 1)
      if (!same) {
        const entry = { name: freeName(chart.alt), chart, of: fill.target }
        made.push(entry)
        list.push(entry)
      } else {
        const name = isNamed(same.name, chart.alt) ? same.name : freeName(chart.alt)
        if (name !== same.name) renamed.push({ sheet, from: same.name, to: name })
        list.push({ name, chart, of: fill.target })
      }
    }
    gone.push(...left)
  }
  const idle = gone.length + made.length + renamed.length === 0
  if (idle && JSON.stringify(list) === JSON.stringify(drawn)) return null
  const before = [...there].map(([sheet, names]) => ({ sheet, names }))
  return { work: { gone, made, renamed, before }, drawn: list }
}

/** Whether a name is a sentence of ours, with or without the number that tells it from another. */
const isNamed = (name: string, alt: string): boolean =>
  name === alt || (/^ \(\d+\)$/.test(name.slice(alt.length)) && name.startsWith(alt))

/** Whether a chart is one of the table that a fill takes the place of. A sheet that got another name takes its charts along. */
function belongs(
  { name, of }: DrawnChart,
  fill: Fill,
  names: ReadonlySet<string>,
  known: (sheet: string) => boolean,
) {
  const { sheet } = fill.target
  if (!names.has(name)) return false
  if (of.sheet !== sheet) return fill.patch.ours !== undefined && !known(of.sheet)
  return [fill.target, fill.patch.ours].some((place) => place && overlap(place, of) !== null)
}

/** Whether a chart draws the same of the same cells: they may have moved, and the chart with them. */
function drawsSame({ chart, of }: DrawnChart, wanted: TableChart, { target }: Fill): boolean {
  const cellsOnly = ({ alt: _, ...others }: TableChart) => JSON.stringify(others)
  return of.row === target.row && of.column === target.column && cellsOnly(chart) === cellsOnly(wanted)
}

/** The steps that do it; to be done after values and widths, since a chart takes its place from the cells it covers. */
export const chartSteps = ({ gone, made, renamed }: Redrawing): Step[] => [
  ...gone.map(({ name, of }) => removal(of.sheet, name)),
  ...renamed.map(({ sheet, from, to }) => renaming(sheet, from, to)),
  ...made.map(drawing),
]

/**
 * The steps that undo it, wherever it stopped.
 *
 * @param there   the charts of the sheets that are there now
 * @param careful when time has passed: then a chart of another name is its user's. It may be one of ours that the write had no time to name,
 *   and stays as well
 */
export function chartUndoing(
  { gone, made, renamed, before }: Redrawing,
  there: ChartsThere,
  careful: boolean,
): Step[] {
  const stands = (sheet: string, name: string) => there.get(sheet)?.includes(name) === true
  const others = before.flatMap(({ sheet, names }) => {
    const known = new Set([...names, ...renamed.flatMap((one) => (one.sheet === sheet ? [one.to] : []))])
    const ours = new Set(made.flatMap(({ name, of }) => (of.sheet === sheet ? [name] : [])))
    return (there.get(sheet) ?? [])
      .filter((name) => !known.has(name) && (ours.has(name) || !careful))
      .map((name) => removal(sheet, name))
  })
  return [
    ...others,
    ...renamed
      .filter(({ sheet, to }) => stands(sheet, to))
      .map(({ sheet, from, to }) => renaming(sheet, to, from)),
    ...gone.filter(({ of, name }) => there.has(of.sheet) && !stands(of.sheet, name)).map(drawing),
  ]
}

const removal = (sheet: string, name: string): Step => ({
  bytes: 1000,
  run: ({ workbook }) => workbook.worksheets.getItem(sheet).charts.getItem(name).delete(),
})

const renaming = (sheet: string, from: string, to: string): Step => ({
  bytes: 2000,
  run: ({ workbook }) => void (workbook.worksheets.getItem(sheet).charts.getItem(from).name = to),
})

const drawing = (entry: DrawnChart): Step => ({
  bytes: 4000 + 3 * JSON.stringify(entry).length,
  run: (context) => draw(context, entry),
})

const TYPES = {
  bars: 'BarClustered',
  columns: 'ColumnClustered',
  'stacked columns': 'ColumnStacked',
} as const

/** Dots along a line of more points would run into each other. */
const MOST_DOTS = 40

/** For a print in black and white: filled bars of these, hollow ones with a border, whole lines and broken ones. */
const INK = '#262626'
const SHADES = ['#404040', '#8C8C8C', '#B3B3B3', '#6B6B6B']

function draw(context: Excel.RequestContext, { name, chart, of }: DrawnChart): void {
  const { kind, series, categories } = chart
  const within = ({ row, column, rows, columns }: Span) =>
    rangeOf(context, { sheet: of.sheet, row: of.row + row, column: of.column + column, rows, columns })
  const [first] = series
  if (!first) return
  const points = first.values.rows * first.values.columns
  const line = points > MOST_DOTS ? 'Line' : 'LineMarkers'
  const made = context.workbook.worksheets
    .getItem(of.sheet)
    .charts.add(
      kind === 'line' ? line : TYPES[kind],
      within(first.values),
      first.values.columns > 1 ? 'Rows' : 'Columns',
    )
  made.name = name
  const place = within(chart.over)
  made.setPosition(place.getCell(0, 0), place.getLastCell())
  // rows of the table may be folded away, and its figures are drawn all the same
  made.plotVisibleOnly = false
  made.title.text = chart.title
  made.title.format.font.size = 10
  made.title.format.font.bold = true

  const looks = looksOf(chart)
  series.forEach((one, k) => {
    const item = k === 0 ? made.series.getItemAt(0) : made.series.add(one.name)
    item.name = one.name
    item.setValues(within(one.values))
    item.setXAxisValues(within(categories))
    const look = looks[k]
    const alike = looks.slice(0, k).filter((other) => other === look).length
    dressSeries(item, kind, look ?? 'solid', SHADES[alike % SHADES.length] ?? INK)
  })

  const { categoryAxis, valueAxis } = made.axes
  // names of categories keep to the edge, off bars that lie on the other side of zero
  categoryAxis.tickLabelPosition = 'Low'
  valueAxis.numberFormat = chart.format
  if (chart.begins !== undefined) valueAxis.minimum = chart.begins
  if (kind === 'bars') {
    // the first category on top, and the axis of values at the bottom all the same
    categoryAxis.reversePlotOrder = true
    categoryAxis.position = 'Maximum'
  }
  const seen = series.filter(({ unseen }) => !unseen)
  if (seen.length < 2) {
    made.legend.visible = false
    return
  }
  made.legend.visible = true
  made.legend.position = 'Bottom'
  series.forEach(({ unseen }, k) => {
    if (unseen) made.legend.legendEntries.getItemAt(k).visible = false
  })
}

type Look = 'solid' | 'hollow' | 'unseen'

/** Of bars side by side the first is hollow when there are several, as a weight is beside its share of risk; otherwise every second one is. */
function looksOf({ kind, series }: TableChart): Look[] {
  const several = series.filter(({ unseen }) => !unseen).length > 1
  const hollow = kind === 'bars' || kind === 'columns' ? 0 : 1
  let k = 0
  return series.map(({ unseen }) => {
    if (unseen) return 'unseen'
    return several && k++ % 2 === hollow ? 'hollow' : 'solid'
  })
}

function dressSeries(
  { format: { fill, line } }: Excel.ChartSeries,
  kind: TableChart['kind'],
  look: Look,
  shade: string,
): void {
  if (kind === 'line') {
    line.color = shade
    line.weight = 1.75
    line.lineStyle = look === 'unseen' ? 'None' : look === 'hollow' ? 'Dash' : 'Continuous'
    return
  }
  if (look === 'solid') {
    fill.setSolidColor(shade)
    return
  }
  fill.clear()
  if (look === 'unseen') {
    line.clear()
    return
  }
  line.lineStyle = 'Continuous'
  line.color = INK
  line.weight = 1
}
