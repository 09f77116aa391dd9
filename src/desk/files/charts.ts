/**
 * Charts, which the file library leaves out: written into the parts of the .xlsx package and read from them.
 *
 * The figures of a chart come from cells; the file keeps a copy of them for programs that draw before they calculate. The look is meant for
 * a print in black and white: series differ by solid and outlined bars, whole and broken lines.
 *
 * Source, from memory: ECMA-376 part 1, 21.2 (charts; the order of elements is that of its schema) and 20.5 (drawings of a sheet).
 */
import { DOMParser, ParseError, type Document, type Element } from '@xmldom/xmldom'
import type { Figure } from '../figures'
import type { Corner, SheetChart } from '../office'
import {
  XML,
  addPart,
  marked,
  partsBehind,
  putIntoSheet,
  relate,
  sheetPaths,
  textOf,
  type Parts,
} from './archive'

const CHART = 'http://schemas.openxmlformats.org/drawingml/2006/chart'
const DRAWING = 'http://schemas.openxmlformats.org/drawingml/2006/main'
const SHEET_DRAWING = 'http://schemas.openxmlformats.org/drawingml/2006/spreadsheetDrawing'
const RELATIONSHIPS = 'http://schemas.openxmlformats.org/officeDocument/2006/relationships'
/** What lengths in a drawing are counted in, English metric units, to a pixel: 914,400 to an inch of 96 pixels. */
const EMU = 9525

/**
 * Puts charts over the cells of sheets, by the sheets' names.
 *
 * @param figures  what stands in the cells of a reference, for the copy in the file
 */
export function putCharts(
  parts: Parts,
  charts: ReadonlyMap<string, readonly SheetChart[]>,
  figures: (reference: string) => readonly Figure[],
): void {
  const paths = sheetPaths(parts)
  let [drawings, written] = [0, 0]
  for (const [name, list] of charts) {
    const sheet = paths.get(name)
    if (sheet === undefined || list.length === 0) continue
    const drawing = `xl/drawings/drawing${(drawings += 1)}.xml`
    const anchors = list.map((chart, k) => anchorOf(chart, k + 1)).join('')
    const namespaces = `xmlns:xdr="${SHEET_DRAWING}" xmlns:a="${DRAWING}" xmlns:c="${CHART}" xmlns:r="${RELATIONSHIPS}"`
    addPart(parts, drawing, `${XML}<xdr:wsDr ${namespaces}>${anchors}</xdr:wsDr>`, 'drawing')
    putIntoSheet(parts, sheet, 'drawing', `<drawing xmlns:r="${RELATIONSHIPS}" r:id="rIdDrawing"/>`)
    relate(parts, sheet, [
      { id: 'rIdDrawing', type: 'drawing', target: `../drawings/drawing${drawings}.xml` },
    ])
    const targets = list.map((chart, k) => {
      const target = `charts/chart${(written += 1)}.xml`
      addPart(parts, `xl/${target}`, chartXml(chart, figures), 'drawingml.chart')
      return { id: `rId${k + 1}`, type: 'chart', target: `../${target}` }
    })
    relate(parts, drawing, targets)
  }
}

const cornerXml = ({ row, column, x = 0, y = 0 }: Corner): string =>
  `<xdr:col>${column}</xdr:col><xdr:colOff>${Math.round(x * EMU)}</xdr:colOff>` +
  `<xdr:row>${row}</xdr:row><xdr:rowOff>${Math.round(y * EMU)}</xdr:rowOff>`

/** The frame of a chart. Its name says what it shows; programs that know of alternative text read the same there. */
function anchorOf({ name, from, to }: SheetChart, k: number): string {
  return (
    `<xdr:twoCellAnchor editAs="oneCell"><xdr:from>${cornerXml(from)}</xdr:from><xdr:to>${cornerXml(to)}</xdr:to>` +
    `<xdr:graphicFrame macro=""><xdr:nvGraphicFramePr><xdr:cNvPr id="${k + 1}" name="${marked(name)}" descr="${marked(name)}"/>` +
    `<xdr:cNvGraphicFramePr/></xdr:nvGraphicFramePr><xdr:xfrm><a:off x="0" y="0"/><a:ext cx="0" cy="0"/></xdr:xfrm>` +
    `<a:graphic><a:graphicData uri="${CHART}"><c:chart r:id="rId${k}"/></a:graphicData></a:graphic></xdr:graphicFrame>` +
    `<xdr:clientData/></xdr:twoCellAnchor>`
  )
}

const INK = '262626'
const QUIET = 'BFBFBF'

const solid = (colour: string): string => `<a:solidFill><a:srgbClr val="${colour}"/></a:solidFill>`
const line = (points: number, fill: string, dash = ''): string =>
  `<a:ln w="${Math.round(points * 12_700)}">${fill}${dash}</a:ln>`
const NO_LINE = '<a:ln><a:noFill/></a:ln>'

/** The look of one series. Those of one kind in a chart grow lighter, or more broken, from one to the next. */
function look(kind: SheetChart['kind'], of: SheetChart['series'][number]['look'], k: number): string {
  if (of === 'unseen') return `<c:spPr><a:noFill/>${NO_LINE}</c:spPr>`
  if (kind === 'line') {
    const dash = of === 'outline' ? '<a:prstDash val="sysDash"/>' : ''
    return `<c:spPr>${line(1.75, solid(shade(k)), `${dash}<a:round/>`)}</c:spPr>`
  }
  return of === 'outline'
    ? `<c:spPr><a:noFill/>${line(1, solid(INK))}</c:spPr>`
    : `<c:spPr>${solid(shade(k))}${line(1, solid(shade(k)))}</c:spPr>`
}
const SHADES = ['404040', '8C8C8C', 'B3B3B3', '6B6B6B']
const shade = (k: number): string => SHADES[k % SHADES.length] ?? INK

/** Small letters that a print keeps readable. */
const letters = (points: number, bold: boolean): string =>
  `<a:defRPr sz="${points * 100}" b="${bold ? 1 : 0}">${solid(INK)}</a:defRPr>`
const LETTERS = `<c:txPr><a:bodyPr/><a:lstStyle/><a:p><a:pPr>${letters(9, false)}</a:pPr><a:endParaRPr lang="en-US"/></a:p></c:txPr>`

function chartXml(chart: SheetChart, figures: (reference: string) => readonly Figure[]): string {
  const { kind, title, legend, series } = chart
  const unseen = series.flatMap((one, k) => (one.look === 'unseen' ? [k] : []))
  const entries = unseen.map((k) => `<c:legendEntry><c:idx val="${k}"/><c:delete val="1"/></c:legendEntry>`)
  const heading =
    title === ''
      ? '<c:autoTitleDeleted val="1"/>'
      : '<c:title><c:tx><c:rich><a:bodyPr/><a:lstStyle/><a:p>' +
        `<a:pPr>${letters(10, true)}</a:pPr><a:r><a:rPr lang="en-US" sz="1000" b="1">${solid(INK)}</a:rPr><a:t>${marked(title)}</a:t></a:r></a:p></c:rich></c:tx>` +
        '<c:overlay val="0"/></c:title><c:autoTitleDeleted val="0"/>'
  const key = legend
    ? `<c:legend><c:legendPos val="b"/>${entries.join('')}<c:overlay val="0"/>${LETTERS}</c:legend>`
    : ''
  const plot = kind === 'line' ? linesXml(chart, figures) : barsXml(chart, figures)
  return (
    `${XML}<c:chartSpace xmlns:c="${CHART}" xmlns:a="${DRAWING}" xmlns:r="${RELATIONSHIPS}"><c:roundedCorners val="0"/>` +
    `<c:chart>${heading}<c:plotArea><c:layout/>${plot}${axesXml(chart, figures)}<c:spPr><a:noFill/>${NO_LINE}</c:spPr></c:plotArea>${key}` +
    `<c:plotVisOnly val="0"/><c:dispBlanksAs val="gap"/></c:chart>` +
    `<c:spPr>${solid('FFFFFF')}${line(0.75, solid(QUIET))}</c:spPr></c:chartSpace>`
  )
}

const AXES = { category: 111_111_111, value: 222_222_222 } as const
const axisIds = `<c:axId val="${AXES.category}"/><c:axId val="${AXES.value}"/>`

function barsXml(chart: SheetChart, figures: (reference: string) => readonly Figure[]): string {
  const { kind, series } = chart
  const stacked = kind === 'stacked columns'
  return (
    `<c:barChart><c:barDir val="${kind === 'bars' ? 'bar' : 'col'}"/><c:grouping val="${stacked ? 'stacked' : 'clustered'}"/><c:varyColors val="0"/>` +
    series.map((_, k) => seriesXml(chart, k, '<c:invertIfNegative val="0"/>', '', figures)).join('') +
    `<c:gapWidth val="${stacked ? 40 : 60}"/><c:overlap val="${stacked ? 100 : 0}"/>${axisIds}</c:barChart>`
  )
}

function linesXml(chart: SheetChart, figures: (reference: string) => readonly Figure[]): string {
  const marker = (k: number): string =>
    `<c:marker><c:symbol val="${k === 0 ? 'circle' : 'diamond'}"/><c:size val="5"/><c:spPr>${solid(shade(k))}${line(0.75, solid(shade(k)))}</c:spPr></c:marker>`
  return (
    '<c:lineChart><c:grouping val="standard"/><c:varyColors val="0"/>' +
    chart.series.map((_, k) => seriesXml(chart, k, marker(k), '<c:smooth val="0"/>', figures)).join('') +
    `<c:marker val="1"/>${axisIds}</c:lineChart>`
  )
}

function seriesXml(
  { kind, series, categories }: SheetChart,
  k: number,
  before: string,
  after: string,
  figures: (reference: string) => readonly Figure[],
): string {
  const one = series[k]
  if (!one) return ''
  const alike = series.slice(0, k).filter((other) => other.look === one.look).length
  return (
    `<c:ser><c:idx val="${k}"/><c:order val="${k}"/><c:tx><c:v>${marked(one.name)}</c:v></c:tx>${look(kind, one.look, alike)}${before}` +
    `<c:cat>${copyOf(categories, figures(categories), 'text')}</c:cat><c:val>${copyOf(one.values, figures(one.values), 'numbers')}</c:val>${after}</c:ser>`
  )
}

/** A reference with a copy of what stands there; categories are numbers where all of them are. */
function copyOf(reference: string, cells: readonly Figure[], as: 'text' | 'numbers'): string {
  const isNumeric = as === 'numbers' || areNumbers(cells)
  const points = cells.map(({ value }, k) =>
    value === null || (isNumeric && typeof value !== 'number')
      ? ''
      : `<c:pt idx="${k}"><c:v>${marked(String(value))}</c:v></c:pt>`,
  )
  const copy = `<c:ptCount val="${cells.length}"/>${points.join('')}`
  const formula = `<c:f>${marked(reference)}</c:f>`
  const format = marked(formatOf(cells))
  return isNumeric
    ? `<c:numRef>${formula}<c:numCache><c:formatCode>${format}</c:formatCode>${copy}</c:numCache></c:numRef>`
    : `<c:strRef>${formula}<c:strCache>${copy}</c:strCache></c:strRef>`
}

const formatOf = (cells: readonly Figure[]): string =>
  cells.find(({ value }) => value !== null)?.format ?? 'General'

const areNumbers = (cells: readonly Figure[]): boolean =>
  cells.length > 0 && cells.every(({ value }) => typeof value === 'number')

/** The two axes. Names of categories keep to the edge, off bars that lie on the other side of zero. */
function axesXml(
  { kind, categories, format, reversed, minimum }: SheetChart,
  figures: (reference: string) => readonly Figure[],
): string {
  const across = kind === 'bars'
  const cells = figures(categories)
  const names = areNumbers(cells)
    ? `<c:numFmt formatCode="${marked(formatOf(cells))}" sourceLinked="1"/>`
    : '<c:numFmt formatCode="General" sourceLinked="0"/>'
  return (
    `<c:catAx><c:axId val="${AXES.category}"/><c:scaling><c:orientation val="${reversed ? 'maxMin' : 'minMax'}"/></c:scaling><c:delete val="0"/>` +
    `<c:axPos val="${across ? 'l' : 'b'}"/>${names}` +
    `<c:majorTickMark val="none"/><c:minorTickMark val="none"/><c:tickLblPos val="low"/><c:spPr>${line(0.75, solid(INK))}</c:spPr>${LETTERS}` +
    `<c:crossAx val="${AXES.value}"/><c:crosses val="autoZero"/><c:auto val="0"/><c:lblAlgn val="ctr"/><c:lblOffset val="100"/><c:noMultiLvlLbl val="1"/></c:catAx>` +
    `<c:valAx><c:axId val="${AXES.value}"/><c:scaling><c:orientation val="minMax"/>${minimum === undefined ? '' : `<c:min val="${minimum}"/>`}</c:scaling><c:delete val="0"/>` +
    `<c:axPos val="${across ? 'b' : 'l'}"/><c:majorGridlines><c:spPr>${line(0.5, solid(QUIET))}</c:spPr></c:majorGridlines>` +
    `<c:numFmt formatCode="${marked(format)}" sourceLinked="0"/><c:majorTickMark val="none"/><c:minorTickMark val="none"/><c:tickLblPos val="nextTo"/>` +
    `<c:spPr>${NO_LINE}</c:spPr>${LETTERS}<c:crossAx val="${AXES.category}"/>` +
    // where categories run from the top down, the far end of their axis is the bottom
    `<c:crosses val="${reversed && across ? 'max' : 'autoZero'}"/><c:crossBetween val="between"/></c:valAx>`
  )
}

export interface ChartsRead {
  /** by the sheets' names */
  readonly charts: ReadonlyMap<string, readonly SheetChart[]>
  /** charts of kinds that are not drawn here */
  readonly left: number
  /** charts of which only figures, title and place are kept */
  readonly inPart: number
}

/** The charts of every sheet, as far as they are drawn here. */
export function chartsIn(parts: Parts): ChartsRead {
  const charts = new Map<string, readonly SheetChart[]>()
  let [left, inPart] = [0, 0]
  for (const [name, sheet] of sheetPaths(parts)) {
    const kept: SheetChart[] = []
    const drawings = [...partsBehind(parts, sheet).values()].filter((path) =>
      /\/drawings\/[^/]+\.xml$/.test(path),
    )
    for (const drawing of drawings) {
      const targets = partsBehind(parts, drawing)
      const root = parsed(textOf(parts, drawing))?.documentElement
      if (!root) left += 1
      for (const anchor of root ? children(root) : []) {
        for (const frame of all(anchor, 'graphicFrame')) {
          const path = targets.get(all(frame, 'chart')[0]?.getAttributeNS(RELATIONSHIPS, 'id') ?? '')
          if (path === undefined) continue
          const xml = textOf(parts, path)
          const chart = chartOf(anchor, parsed(xml))
          if (!chart) left += 1
          else {
            kept.push(chart)
            const { name: title, descr } = attributesOf(all(frame, 'cNvPr')[0])
            if (title !== descr || bare(xml) !== bare(chartXml(chart, () => []))) inPart += 1
          }
        }
      }
    }
    charts.set(name, kept)
  }
  return { charts, left, inPart }
}

/** A chart as it is written here, but for the copy of its figures. */
const bare = (xml: string): string =>
  xml
    .replace(/<c:(str|num)Cache>.*?<\/c:\1Cache>/gs, '')
    .replace(/<(\/?)c:(?:str|num)Ref>/g, '<$1c:ref>')
    .replace(/(<c:axPos val="\w"\/>)<c:numFmt [^>]*>/, '$1')

/** A single block of cells on a named sheet. */
const REFERENCE = /^(?:'(?:[^']|'')+'|[\p{L}\p{N}_.]+)!\$?[A-Z]+\$?\d+(?::\$?[A-Z]+\$?\d+)?$/u

/** @returns null for what is of another kind, or draws what is not in one block of cells a series */
function chartOf(anchor: Element, chart: Document | null): SheetChart | null {
  if (!chart) return null
  const area = all(chart, 'plotArea')[0]
  const plots = area ? children(area).filter(({ localName }) => /Chart$/.test(localName ?? '')) : []
  const [plot] = plots
  const kind = plot && plots.length === 1 ? kindOf(plot) : null
  const [from, to] = [inside(anchor, 'from'), inside(anchor, 'to')]
  if (!plot || !kind || !from || !to) return null
  const read = children(plot)
    .filter(({ localName }) => localName === 'ser')
    .map((one) => ({
      order: Number(val(inside(one, 'order'))),
      name: textIn(inside(one, 'tx')),
      values: referenceIn(inside(one, 'val')),
      categories: referenceIn(inside(one, 'cat')),
      look: lookOf(kind, inside(one, 'spPr')),
    }))
  const categories = read[0]?.categories ?? ''
  if (
    !read.every((one) => REFERENCE.test(one.values) && one.categories === categories) ||
    !REFERENCE.test(categories)
  )
    return null
  const [category] = [...all(chart, 'catAx'), ...all(chart, 'dateAx')]
  const [title] = all(chart, 'title')
  const [begins] = all(chart, 'valAx').flatMap((axis) => {
    const scaling = inside(axis, 'scaling')
    const least = Number(val(scaling && inside(scaling, 'min')) || NaN)
    return Number.isFinite(least) ? [least] : []
  })
  return {
    name: attributesOf(all(anchor, 'cNvPr')[0]).name ?? '',
    kind,
    // a title of an axis is no title of the chart
    title: title?.parentNode?.localName === 'chart' ? textIn(title) : '',
    from: cornerOf(from),
    to: cornerOf(to),
    categories,
    series: read
      .sort((a, b) => a.order - b.order)
      .map(({ name, values, look: of }) => ({ name, values, look: of })),
    format:
      all(chart, 'valAx').flatMap((axis) => attributesOf(inside(axis, 'numFmt'))['formatCode'] ?? [])[0] ??
      'General',
    reversed: category !== undefined && all(category, 'orientation').some((one) => val(one) === 'maxMin'),
    legend: all(chart, 'legend').length > 0,
    ...(begins === undefined ? {} : { minimum: begins }),
  }
}

function kindOf(plot: Element): SheetChart['kind'] | null {
  const grouping = val(inside(plot, 'grouping')) || 'clustered'
  if (plot.localName === 'lineChart') return grouping === 'standard' ? 'line' : null
  if (plot.localName !== 'barChart') return null
  const across = val(inside(plot, 'barDir')) === 'bar'
  if (grouping === 'clustered') return across ? 'bars' : 'columns'
  return grouping === 'stacked' && !across ? 'stacked columns' : null
}

function lookOf(kind: SheetChart['kind'], of: Element | undefined): SheetChart['series'][number]['look'] {
  const edge = of && inside(of, 'ln')
  const isEmpty = of !== undefined && inside(of, 'noFill') !== undefined
  const isBare = edge !== undefined && inside(edge, 'noFill') !== undefined
  if (kind === 'line') return isBare ? 'unseen' : edge && inside(edge, 'prstDash') ? 'outline' : 'solid'
  return !isEmpty ? 'solid' : isBare ? 'unseen' : 'outline'
}

function cornerOf(of: Element): Corner {
  const number = (name: string): number => Number(inside(of, name)?.textContent ?? 0)
  // the unit is far finer than what a screen can show
  const pixels = (name: string): number => Math.round((number(name) / EMU) * 1000) / 1000
  const [x, y] = [pixels('colOff'), pixels('rowOff')]
  return { row: number('row'), column: number('col'), ...(x ? { x } : {}), ...(y ? { y } : {}) }
}

const referenceIn = (of: Element | undefined): string => (of && all(of, 'f')[0]?.textContent) ?? ''

/** The text of a title or of a series' name, whether written there or copied from cells. */
const textIn = (of: Element | undefined): string =>
  (of ? [...all(of, 't'), ...all(of, 'v')] : []).map(({ textContent }) => textContent ?? '').join('')

/** @returns null for what is no XML */
function parsed(xml: string): Document | null {
  try {
    return new DOMParser({ onError: () => undefined }).parseFromString(xml, 'text/xml')
  } catch (error) {
    if (error instanceof ParseError) return null
    throw error
  }
}

const children = (of: Element): Element[] =>
  [...of.childNodes].filter((node): node is Element => node.nodeType === 1)
const all = (of: Document | Element, name: string): Element[] => [...of.getElementsByTagNameNS('*', name)]
const inside = (of: Element, name: string): Element | undefined =>
  children(of).find(({ localName }) => localName === name)
const attributesOf = (of: Element | undefined): Record<string, string> =>
  Object.fromEntries([...(of?.attributes ?? [])].map(({ name, value }) => [name, value]))
const val = (of: Element | undefined): string => attributesOf(of)['val'] ?? ''
