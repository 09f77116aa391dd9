/** Ranges, their formats and areas: what each member of the API reads from the cells or does to them. */
import {
  BooleanNumber,
  BorderStyleTypes,
  HorizontalAlign,
  VerticalAlign,
  WrapStrategy,
  type IStyleData,
} from '@univerjs/core'
import {
  COLUMNS,
  ROWS,
  bounding,
  columnName,
  formatRect,
  height,
  intersect,
  isEntireColumn,
  isEntireRow,
  isUnbounded,
  parseRect,
  quoteSheet,
  rectAt,
  splitAddress,
  width,
  type Rect,
} from './addresses'
import { NO_CONTENT, type Sheet, type StoredCell } from './book'
import { entered, shown } from './cells'
import { FORMATS } from './conditional-formats'
import { DEEPEST } from './custom-data'
import { OfficeError } from './error'
import type { Find, Kind, Scalar, Shift } from './request-context'
import { WORKSHEET } from './worksheet'

/** What a range object stands for. */
export interface Place {
  readonly sheet: Sheet
  readonly rect: Rect
}

/** Several blocks of one sheet. */
export interface Places {
  readonly sheet: Sheet
  readonly rects: readonly Rect[]
}

/** The host refuses to read more cells at once. */
const MOST_CELLS = 5_000_000
/** Points of a screen pixel; the host measures columns and rows in points, the grid in pixels. */
const POINTS = 0.75

export const fullAddress = ({ sheet, rect }: Place, absolute = false): string =>
  `${quoteSheet(sheet.name)}!${formatRect(rect, absolute)}`

/** The place an address or a name on `sheet` means. @throws OfficeError InvalidArgument */
export function placeAt(sheet: Sheet, address: string): Place {
  const { sheet: named, cells } = splitAddress(address)
  const rect = parseRect(cells)
  if (rect && (named === null || named.toLowerCase() === sheet.name.toLowerCase())) return { sheet, rect }
  const record = rect ? null : sheet.book.name(address)
  const place = record && placeOfReference(sheet, record.formulaOrRefString)
  if (!place)
    throw new OfficeError('InvalidArgument', `"${address}" is no address on the sheet "${sheet.name}"`)
  return place
}

/** The block a workbook name's reference means; null when it means no block (a constant, a formula, a lost reference). */
export function placeOfReference({ book }: Pick<Sheet, 'book'>, reference: string): Place | null {
  const { sheet: named, cells } = splitAddress(reference.replace(/^=/, ''))
  const rect = parseRect(cells)
  const sheet = named === null ? null : book.sheet(named)
  return rect && sheet ? { sheet, rect } : null
}

const at = (place: Place, rect: Rect | null): Place | null => rect && { sheet: place.sheet, rect }

/** A block moved and stretched, inside the sheet or not at all. */
const moved = ({ sheet, rect }: Place, down: number, right: number, taller = 0, wider = 0): Place => ({
  sheet,
  rect: rectAt(rect.top + down, rect.left + right, height(rect) + taller, width(rect) + wider),
})

function readable({ rect }: Place): void {
  if (height(rect) * width(rect) > MOST_CELLS) throw new OfficeError('RangeExceedsLimit')
}

/** Reads something of every cell; null for whole rows and columns, as in the host. */
function ofCells<R>(of: (cell: StoredCell, place: Place) => R) {
  return (place: Place): R[][] | null => {
    if (isUnbounded(place.rect)) return null
    readable(place)
    return place.sheet.map(place.rect, (cell) => of(cell, place))
  }
}

/** Gives the value for each cell: one for all, or a matrix of the range's own shape. */
function spread(place: Place, value: unknown): (row: number, column: number) => unknown {
  if (isUnbounded(place.rect))
    throw new OfficeError('InvalidArgument', 'cells of whole rows or columns cannot be set one by one')
  if (!Array.isArray(value)) return () => value
  const rows: readonly unknown[] = value
  const [high, wide] = [height(place.rect), width(place.rect)]
  const fits = rows.length === high && rows.every((row) => Array.isArray(row) && row.length === wide)
  if (!fits) {
    const first: unknown = rows[0]
    const found = `${rows.length} x ${Array.isArray(first) ? first.length : '?'}`
    throw new OfficeError('InvalidArgument', `${found} values do not fit a range of ${high} x ${wide} cells`)
  }
  return (row, column) => (rows as readonly (readonly unknown[])[])[row]?.[column]
}

function writeCells(place: Place, value: unknown): void {
  const valueAt = spread(place, value)
  const patterns = place.sheet.map(place.rect, (cell) => cell.pattern)
  place.sheet.write(place.rect, (row, column) =>
    entered(valueAt(row, column), patterns[row]?.[column] ?? 'General'),
  )
}

function writePatterns(place: Place, value: unknown): void {
  const valueAt = spread(place, value)
  place.sheet.restyle(place.rect, (row, column) => {
    const pattern = valueAt(row, column)
    if (pattern === null) return undefined
    if (typeof pattern !== 'string') throw new OfficeError('InvalidArgument', 'a number format is text')
    return { n: pattern === 'General' ? null : { pattern } }
  })
}

/** The one value all cells or lines of a range share; null when they differ. */
function common<R>(values: Iterable<R>): R | null {
  let found: R | undefined
  for (const value of values) {
    if (found !== undefined && found !== value) return null
    found = value
  }
  return found ?? null
}

function* lines({ sheet, rect }: Place, axis: 'row' | 'column'): Generator<number> {
  const { startRow, endRow, startColumn, endColumn } = sheet.rangeOf(rect)
  const [from, to] = axis === 'row' ? [startRow, endRow] : [startColumn, endColumn]
  for (let line = from; line <= to; line++) yield line
}

function* styles(place: Place): Generator<IStyleData> {
  for (const row of lines(place, 'row'))
    for (const column of lines(place, 'column')) yield place.sheet.style(row, column)
}

/** A property of format that is the same in every cell or null, kept in one field of the grid's style. */
function styled<R>(read: (style: IStyleData) => R, write: (value: R) => IStyleData): Scalar<Place> {
  return {
    read: (place) => common(mapped(styles(place), read)),
    write: (place: Place, value: never) => {
      const style = write(value)
      const { sheet, rect } = place
      // cells that have it already are left alone: to change one takes the grid far longer than to look
      sheet.restyle(rect, (row, column) =>
        read(sheet.style(rect.top + row, rect.left + column)) === value ? undefined : style,
      )
    },
  }
}

function* mapped<A, B>(values: Iterable<A>, of: (value: A) => B): Generator<B> {
  for (const value of values) yield of(value)
}

/** A property whose values are words here and numbers in the grid. */
function worded(
  field: 'ht' | 'vt',
  words: Readonly<Record<string, number>>,
  otherwise: string,
): Scalar<Place> {
  return styled(
    (style) => Object.keys(words).find((word) => words[word] === style[field]) ?? otherwise,
    (word) => {
      const value = words[word]
      if (value === undefined) throw new OfficeError('InvalidArgument', `"${word}" is no alignment`)
      return { [field]: value }
    },
  )
}

export function colour(value: string): { rgb: string } {
  const named = /^#[0-9a-f]{6}$/i.test(value) ? value : NAMED_COLOURS[value.toLowerCase()]
  if (!named) throw new OfficeError('InvalidArgument', `"${value}" is no colour`)
  return { rgb: named.toUpperCase() }
}

/** The few HTML colour names that read better than their numbers. */
const NAMED_COLOURS: Readonly<Record<string, string>> = {
  black: '#000000',
  white: '#FFFFFF',
  red: '#FF0000',
  green: '#008000',
  blue: '#0000FF',
  gray: '#808080',
  yellow: '#FFFF00',
}

const FONT: Kind<Place> = {
  name: 'RangeFont',
  scalars: {
    bold: styled(
      (style) => style.bl === BooleanNumber.TRUE,
      (on) => ({ bl: on ? BooleanNumber.TRUE : BooleanNumber.FALSE }),
    ),
    italic: styled(
      (style) => style.it === BooleanNumber.TRUE,
      (on) => ({ it: on ? BooleanNumber.TRUE : BooleanNumber.FALSE }),
    ),
    color: styled(
      (style) => style.cl?.rgb?.toUpperCase() ?? '#000000',
      (value) => ({ cl: colour(value) }),
    ),
    size: styled(
      (style) => style.fs ?? 11,
      (fs) => ({ fs }),
    ),
    name: styled(
      (style) => style.ff ?? 'Calibri',
      (ff) => ({ ff }),
    ),
    underline: styled(
      (style) => (style.ul?.s === BooleanNumber.TRUE ? 'Single' : 'None'),
      (underline) => ({ ul: underlined(underline) }),
    ),
  },
}

function underlined(underline: string): { s: BooleanNumber } {
  if (underline !== 'None' && underline !== 'Single')
    throw new OfficeError('NotImplemented', `the desk does not underline "${underline}"`)
  return { s: underline === 'Single' ? BooleanNumber.TRUE : BooleanNumber.FALSE }
}

const FILL: Kind<Place> = {
  name: 'RangeFill',
  scalars: {
    color: styled(
      (style) => style.bg?.rgb?.toUpperCase() ?? '#FFFFFF',
      (value) => ({ bg: colour(value) }),
    ),
  },
  acts: { clear: ({ sheet, rect }) => sheet.restyle(rect, () => ({ bg: null })) },
}

type Side = 't' | 'b' | 'l' | 'r'

interface Border {
  readonly place: Place
  readonly edge: keyof typeof EDGES
}

/** For each edge of a range: the side of its cells it lies on, and the block of those cells. */
const EDGES = {
  EdgeTop: { side: 't', cells: (rect: Rect) => ({ ...rect, bottom: rect.top }) },
  EdgeBottom: { side: 'b', cells: (rect: Rect) => ({ ...rect, top: rect.bottom }) },
  EdgeLeft: { side: 'l', cells: (rect: Rect) => ({ ...rect, right: rect.left }) },
  EdgeRight: { side: 'r', cells: (rect: Rect) => ({ ...rect, left: rect.right }) },
  InsideHorizontal: { side: 'b', cells: (rect: Rect) => ({ ...rect, bottom: rect.bottom - 1 }) },
  InsideVertical: { side: 'r', cells: (rect: Rect) => ({ ...rect, right: rect.right - 1 }) },
} satisfies Record<string, { side: Side; cells(rect: Rect): Rect }>

/** Two neighbours share the line between them: where the other one keeps it. */
const ACROSS: Readonly<Record<Side, { side: Side; down: number; right: number }>> = {
  t: { side: 'b', down: -1, right: 0 },
  b: { side: 't', down: 1, right: 0 },
  l: { side: 'r', down: 0, right: -1 },
  r: { side: 'l', down: 0, right: 1 },
}

const LINES: readonly { readonly style: string; readonly weight: string; readonly line: BorderStyleTypes }[] =
  [
    { style: 'None', weight: 'Thin', line: BorderStyleTypes.NONE },
    { style: 'Continuous', weight: 'Thin', line: BorderStyleTypes.THIN },
    { style: 'Continuous', weight: 'Hairline', line: BorderStyleTypes.HAIR },
    { style: 'Continuous', weight: 'Medium', line: BorderStyleTypes.MEDIUM },
    { style: 'Continuous', weight: 'Thick', line: BorderStyleTypes.THICK },
    { style: 'Dot', weight: 'Thin', line: BorderStyleTypes.DOTTED },
    { style: 'Dash', weight: 'Thin', line: BorderStyleTypes.DASHED },
    { style: 'Double', weight: 'Thick', line: BorderStyleTypes.DOUBLE },
  ]

interface Line {
  readonly line: BorderStyleTypes
  readonly rgb: string
}

/** What all cells along an edge share of their line; null when they differ. */
function along<R>({ place, edge }: Border, of: (line: Line) => R): R | null {
  const { side, cells } = EDGES[edge]
  const across = ACROSS[side]
  const { sheet } = place
  const strip: Place = { sheet, rect: cells(place.rect) }
  function* drawn(): Generator<R> {
    for (const row of lines(strip, 'row'))
      for (const column of lines(strip, 'column')) {
        const beyond = { row: row + across.down, column: column + across.right }
        const line =
          sheet.border(row, column)[side] ??
          (beyond.row < 0 || beyond.column < 0 ? null : sheet.border(beyond.row, beyond.column)[across.side])
        yield of({ line: line?.s ?? BorderStyleTypes.NONE, rgb: line?.cl.rgb ?? '#000000' })
      }
  }
  return common(drawn())
}

/** Draws along an edge, each cell from the line it has; the neighbour's share of the same line goes, so that one truth is left. */
function draw({ place, edge }: Border, of: (line: Line) => Line): void {
  const { side, cells } = EDGES[edge]
  const across = ACROSS[side]
  const { sheet } = place
  const rect = cells(place.rect)
  if (height(rect) < 1 || width(rect) < 1) return
  const beyond = {
    top: Math.max(0, rect.top + across.down),
    bottom: rect.bottom + across.down,
    left: Math.max(0, rect.left + across.right),
    right: rect.right + across.right,
  }
  sheet.restyle(rect, (row, column) => {
    const one = rectAt(rect.top + row, rect.left + column, 1, 1)
    const whole: Border = { place: { sheet, rect: one }, edge: SIDE_EDGE[side] }
    const { line, rgb } = of(
      along(whole, (known) => known) ?? { line: BorderStyleTypes.NONE, rgb: '#000000' },
    )
    if (line !== BorderStyleTypes.NONE) return { bd: { [side]: { s: line, cl: { rgb } } } }
    return sheet.border(one.top, one.left)[side] ? { bd: { [side]: null } } : undefined
  })
  if (beyond.top > beyond.bottom || beyond.left > beyond.right) return
  sheet.restyle(beyond, (row, column) =>
    sheet.border(beyond.top + row, beyond.left + column)[across.side]
      ? { bd: { [across.side]: null } }
      : undefined,
  )
}

const SIDE_EDGE = { t: 'EdgeTop', b: 'EdgeBottom', l: 'EdgeLeft', r: 'EdgeRight' } as const

const kindOfLine = (line: BorderStyleTypes) =>
  LINES.find((known) => known.line === line) ?? { style: 'Continuous', weight: 'Thin' }

function lineOf(style: string, weight: string): BorderStyleTypes {
  const line =
    LINES.find((known) => known.style === style && known.weight === weight) ??
    LINES.find((known) => known.style === style)
  if (!line) throw new OfficeError('InvalidArgument', `"${style}" is no line style`)
  return line.line
}

const BORDER: Kind<Border> = {
  name: 'RangeBorder',
  scalars: {
    sideIndex: { read: ({ edge }) => edge },
    style: {
      read: (border) => along(border, ({ line }) => kindOfLine(line).style),
      write: (border: Border, style: string) =>
        draw(border, ({ line, rgb }) => ({ line: lineOf(style, kindOfLine(line).weight), rgb })),
    },
    weight: {
      read: (border) => along(border, ({ line }) => kindOfLine(line).weight),
      // A weight or a colour on an edge without a line draws one, as in the host.
      write: (border: Border, weight: string) =>
        draw(border, ({ line, rgb }) => {
          const { style } = kindOfLine(line)
          return { line: lineOf(style === 'None' ? 'Continuous' : style, weight), rgb }
        }),
    },
    color: {
      read: (border) => along(border, ({ rgb }) => rgb),
      write: (border: Border, value: string) =>
        draw(border, ({ line }) => ({
          line: line === BorderStyleTypes.NONE ? BorderStyleTypes.THIN : line,
          rgb: colour(value).rgb,
        })),
    },
  },
}

const BORDERS: Kind<Place> = {
  name: 'RangeBorderCollection',
  finds: {
    getItem: {
      kind: () => BORDER,
      find: (place, edge: string): Border => {
        if (!Object.hasOwn(EDGES, edge))
          throw new OfficeError('InvalidArgument', `the desk draws no border "${edge}"`)
        return { place, edge: edge as Border['edge'] }
      },
    },
  },
}

/** Widens columns to their longest text, by an average width of a character: the grid cannot measure text without a screen. */
function autofitColumns(place: Place): void {
  const { sheet, rect } = place
  sheet.guard()
  const used = sheet.used(true, rect)
  if (!used) return
  const texts = sheet.map(used, (cell) => shown(cell, sheet.book.culture.name).length)
  for (let column = used.left; column <= used.right; column++) {
    const longest = Math.max(...texts.map((row) => row[column - used.left] ?? 0))
    sheet.facade.setColumnWidth(column, Math.min(420, Math.max(40, 12 + 7.5 * longest)))
  }
}

const FORMAT: Kind<Place> = {
  name: 'RangeFormat',
  parts: {
    font: { kind: () => FONT, find: (place) => place },
    fill: { kind: () => FILL, find: (place) => place },
    borders: { kind: () => BORDERS, find: (place) => place },
  },
  scalars: {
    horizontalAlignment: worded(
      'ht',
      {
        General: HorizontalAlign.UNSPECIFIED,
        Left: HorizontalAlign.LEFT,
        Center: HorizontalAlign.CENTER,
        Right: HorizontalAlign.RIGHT,
        Justify: HorizontalAlign.JUSTIFIED,
      },
      'General',
    ),
    verticalAlignment: worded(
      'vt',
      { Top: VerticalAlign.TOP, Center: VerticalAlign.MIDDLE, Bottom: VerticalAlign.BOTTOM },
      'Bottom',
    ),
    wrapText: styled(
      (style) => style.tb === WrapStrategy.WRAP,
      (on) => ({ tb: on ? WrapStrategy.WRAP : WrapStrategy.OVERFLOW }),
    ),
    // The grid indents by padding; one step is about three characters, as in the host.
    indentLevel: styled(
      (style) => Math.round((style.pd?.l ?? 0) / 9),
      (steps) => ({ pd: steps > 0 ? { l: 9 * steps } : null }),
    ),
    columnWidth: {
      read: (place) =>
        common(
          mapped(lines(place, 'column'), (column) => place.sheet.facade.getColumnWidth(column) * POINTS),
        ),
      write: (place: Place, points: number) => {
        place.sheet.guard()
        place.sheet.hold(place.rect)
        const { startColumn, endColumn } = place.sheet.rangeOf(place.rect)
        place.sheet.facade.setColumnWidths(startColumn, endColumn - startColumn + 1, points / POINTS)
      },
    },
    rowHeight: {
      read: (place) =>
        common(mapped(lines(place, 'row'), (row) => place.sheet.facade.getRowHeight(row) * POINTS)),
      write: (place: Place, points: number) => {
        place.sheet.guard()
        place.sheet.hold(place.rect)
        const { startRow, endRow } = place.sheet.rangeOf(place.rect)
        place.sheet.facade.setRowHeights(startRow, endRow - startRow + 1, points / POINTS)
      },
    },
  },
  acts: {
    autofitColumns,
    autofitRows: ({ sheet, rect }) => {
      sheet.guard()
      const { startRow, endRow } = sheet.rangeOf(rect)
      sheet.facade.setRowAutoHeight(startRow, endRow - startRow + 1)
    },
  },
}

/** What `clear` takes away, by its argument: a link stays behind contents and formats that go. */
const CLEARED: Readonly<Record<string, readonly ('contents' | 'formats' | 'links')[]>> = {
  All: ['contents', 'formats', 'links'],
  Contents: ['contents'],
  Formats: ['formats'],
  Hyperlinks: ['links'],
  RemoveHyperlinks: ['links', 'formats'],
}

function clear({ sheet, rect }: Place, applyTo = 'All'): void {
  const cleared = CLEARED[applyTo]
  if (!cleared) throw new OfficeError('InvalidArgument', `clear("${applyTo}")`)
  sheet.guard()
  const stored = intersect(rect, sheet.used(false, rect) ?? rectAt(rect.top, rect.left, 1, 1))
  if (applyTo === 'All' || applyTo === 'Formats')
    for (const merge of sheet.merges(rect)) sheet.facade.getRange(sheet.rangeOf(merge)).breakApart()
  if (!stored) return
  if (cleared.includes('contents')) sheet.write(stored, () => NO_CONTENT)
  if (cleared.includes('formats')) sheet.restyle(stored, () => null)
  if (cleared.includes('links')) sheet.setLink(stored, null)
}

const textOfCell = (value: unknown): string =>
  typeof value === 'boolean' ? String(value).toUpperCase() : String(value)

/** The link behind a cell as the host describes it; null where there is none. */
function hyperlinkAt(sheet: Sheet, row: number, column: number): Excel.RangeHyperlink | null {
  const link = sheet.link(row, column)
  const value = sheet.map(rectAt(row, column, 1, 1), (cell) => cell.value)[0]?.[0]
  return link && { ...link, textToDisplay: textOfCell(value) }
}

/**
 * Lays a link over a range. What the host does beside it undoes careless code, so it is done here: the text to display goes into the
 * top-left cell as an entry of its own, an empty cell shows where it leads, and every cell takes on the font of the host's style for
 * links, whatever it had before.
 */
function setHyperlink({ sheet, rect }: Place, given: unknown): void {
  const { address, documentReference, screenTip, textToDisplay } = (given ?? {}) as Excel.RangeHyperlink
  const target = documentReference ?? address
  if (!target || (documentReference && address))
    throw new OfficeError('InvalidArgument', 'a link needs an address or a place in the document')
  const [first] = sheet.map(rectAt(rect.top, rect.left, 1, 1), (cell) => cell)[0] ?? []
  const text = textToDisplay ?? (first?.kind === 'Empty' ? target : undefined)
  sheet.setLink(rect, {
    ...(documentReference ? { documentReference } : { address: target }),
    ...(screenTip ? { screenTip } : {}),
  })
  sheet.restyle(rect, () => LINK_FONT)
  if (text === undefined) return
  sheet.write(rectAt(rect.top, rect.left, 1, 1), () => entered(text, first?.pattern ?? 'General'))
}

const LINK_FONT: IStyleData = {
  ul: { s: BooleanNumber.TRUE },
  cl: { rgb: '#0563C1' },
  ff: 'Calibri',
  fs: 11,
  bl: BooleanNumber.FALSE,
  it: BooleanNumber.FALSE,
}

/** Of every cell the properties asked for. */
function cellProperties(place: Place, wanted: Excel.CellPropertiesLoadOptions): Excel.CellProperties[][] {
  const { hyperlink, ...others } = wanted
  const [other] = Object.keys(others)
  if (other !== undefined)
    throw new OfficeError('NotImplemented', `the desk has no Range.getCellProperties with ${other}`)
  readable(place)
  return [...lines(place, 'row')].map((row) =>
    [...lines(place, 'column')].map((column) =>
      // the host's own types have no word for a cell without a link
      hyperlink ? { hyperlink: hyperlinkAt(place.sheet, row, column) as Excel.RangeHyperlink } : {},
    ),
  )
}

/** Folds rows or columns one level deeper, or less deep. */
function regroup({ sheet, rect }: Place, option: string, by: 1 | -1): void {
  if (option !== 'ByRows' && option !== 'ByColumns')
    throw new OfficeError('InvalidArgument', `"${option}" is no way to group`)
  if (option === 'ByRows' ? isEntireColumn(rect) : isEntireRow(rect))
    throw new OfficeError(
      'InvalidArgument',
      'whole columns are not grouped by rows, nor whole rows by columns',
    )
  sheet.guard()
  const axis = option === 'ByRows' ? 'row' : 'column'
  sheet.hold(rect)
  const before = [...lines({ sheet, rect }, axis)].map((line) => [line, sheet.level(axis, line)] as const)
  if (by > 0 && before.some(([, level]) => level >= DEEPEST))
    throw new OfficeError('InvalidOperation', `more than ${DEEPEST} groups within each other`)
  const changed = before.filter(([, level]) => level + by >= 0)
  if (changed.length === 0) throw new OfficeError('InvalidOperation', 'nothing is grouped there')
  sheet.setLevels(axis, new Map(changed.map(([line, level]) => [line, level + by])))
}

function hiddenLines(axis: 'row' | 'column'): Scalar<Place> {
  return {
    read: (place) => common(mapped(lines(place, axis), (line) => place.sheet.isHidden(axis, line))),
    write: (place: Place, hidden: boolean) => place.sheet.hide(axis, place.rect, hidden),
  }
}

/** Grows a block until the cells around it are blank. */
function surroundingRegion({ sheet, rect }: Place): Place {
  const used = sheet.used(true, { top: 0, left: 0, bottom: ROWS - 1, right: COLUMNS - 1 })
  let region = rect
  while (used) {
    const ring = {
      top: Math.max(0, region.top - 1),
      left: Math.max(0, region.left - 1),
      bottom: Math.min(ROWS - 1, region.bottom + 1),
      right: Math.min(COLUMNS - 1, region.right + 1),
    }
    const near = sheet.used(true, intersect(ring, used) ?? rect)
    const grown = near ? bounding(region, near) : region
    if (formatRect(grown) === formatRect(region)) break
    region = grown
  }
  return { sheet, rect: region }
}

type View = Place

const RANGE_VIEW: Kind<View> = {
  name: 'RangeView',
  scalars: {
    values: visible((cell) => cell.value),
    formulas: visible((cell) => cell.formula || cell.value),
    text: visible((cell, { sheet }) => shown(cell, sheet.book.culture.name)),
    valueTypes: visible((cell) => cell.kind),
    numberFormat: visible((cell) => cell.pattern),
    cellAddresses: {
      read: (view) =>
        shownLines(view, 'row').map((row) =>
          shownLines(view, 'column').map(
            (column) => `${quoteSheet(view.sheet.name)}!${columnName(column)}${row + 1}`,
          ),
        ),
    },
    rowCount: { read: (view) => shownLines(view, 'row').length },
    columnCount: { read: (view) => shownLines(view, 'column').length },
    index: { read: () => 0 },
  },
}

const shownLines = (view: View, axis: 'row' | 'column') =>
  [...lines(view, axis)].filter((line) => !view.sheet.isHidden(axis, line))

function visible(of: (cell: StoredCell, view: View) => unknown): Scalar<View> {
  return {
    read: (view) => {
      readable(view)
      const cells = view.sheet.map(view.rect, (cell) => of(cell, view))
      const columns = shownLines(view, 'column')
      return shownLines(view, 'row').map((row) =>
        columns.map((column) => cells[row - view.rect.top]?.[column - view.rect.left]),
      )
    },
  }
}

/** A method that finds a range, in its two forms: one fails when there is none, the other gives a null object. */
function orNull<T>(
  name: string,
  kind: () => Kind<never>,
  find: (target: T, ...args: never[]) => unknown,
): Record<string, Find<T>> {
  return { [name]: { kind, find }, [`${name}OrNullObject`]: { kind, find, orNull: true } }
}

const range = () => RANGE

const other = (place: Place, given: Place | string): Place =>
  typeof given === 'string' ? placeAt(place.sheet, given) : given

/** Where a block lies after lines came or went; a block that loses some of its lines shrinks, one that loses all is gone. */
export function shifted(rect: Rect, { axis, at: line, count }: Shift): Rect | null {
  const [first, last] = axis === 'row' ? [rect.top, rect.bottom] : [rect.left, rect.right]
  if ((axis === 'row' && isEntireColumn(rect)) || (axis === 'column' && isEntireRow(rect))) return rect
  const gone = (edge: number) => Math.max(0, Math.min(edge - line, -count))
  const from = count > 0 ? first + (line <= first ? count : 0) : first - gone(first)
  const to = count > 0 ? last + (line <= last ? count : 0) : last - gone(last + 1)
  if (from > to) return null
  return axis === 'row' ? { ...rect, top: from, bottom: to } : { ...rect, left: from, right: to }
}

const spill = ({ sheet, rect }: Place) => sheet.spillAt(rect.top, rect.left)

export const RANGE: Kind<Place> = {
  name: 'Range',
  transient: true,
  check: ({ sheet }) => {
    if (!sheet.exists) throw new OfficeError('InvalidObjectPath', 'the range lies on a deleted sheet')
  },
  shift: (place, change) =>
    change.sheet === place.sheet.id ? at(place, shifted(place.rect, change)) : place,
  scalars: {
    address: { read: (place) => fullAddress(place) },
    addressLocal: { read: (place) => fullAddress(place) },
    values: { read: ofCells((cell) => cell.value), write: writeCells },
    formulas: { read: ofCells((cell) => cell.formula || cell.value), write: writeCells },
    text: { read: ofCells((cell, { sheet }) => shown(cell, sheet.book.culture.name)) },
    valueTypes: { read: ofCells((cell) => cell.kind) },
    numberFormat: { read: ofCells((cell) => cell.pattern), write: writePatterns },
    numberFormatLocal: { read: ofCells((cell) => cell.pattern), write: writePatterns },
    rowCount: { read: ({ rect }) => height(rect) },
    columnCount: { read: ({ rect }) => width(rect) },
    rowIndex: { read: ({ rect }) => rect.top },
    columnIndex: { read: ({ rect }) => rect.left },
    cellCount: {
      read: ({ rect }) => {
        const count = height(rect) * width(rect)
        return count > 2 ** 31 - 1 ? -1 : count
      },
    },
    isEntireColumn: { read: ({ rect }) => isEntireColumn(rect) },
    isEntireRow: { read: ({ rect }) => isEntireRow(rect) },
    rowHidden: hiddenLines('row'),
    columnHidden: hiddenLines('column'),
    hidden: {
      read: (place) => {
        const hidden = (axis: 'row' | 'column') =>
          [...lines(place, axis)].every((line) => place.sheet.isHidden(axis, line))
        return hidden('row') || hidden('column')
      },
    },
    hyperlink: {
      read: (place) => {
        const { top, left } = place.rect
        const same = common(
          mapped(lines(place, 'row'), (row) =>
            common(mapped(lines(place, 'column'), (column) => JSON.stringify(place.sheet.link(row, column)))),
          ),
        )
        return same === null ? null : hyperlinkAt(place.sheet, top, left)
      },
      write: setHyperlink,
    },
    hasSpill: {
      read: (place) =>
        common(
          mapped(lines(place, 'row'), (row) =>
            common(mapped(lines(place, 'column'), (column) => place.sheet.spillAt(row, column) !== null)),
          ),
        ),
    },
  },
  parts: {
    worksheet: { kind: () => WORKSHEET, find: ({ sheet }) => sheet },
    format: { kind: () => FORMAT, find: (place) => place },
    conditionalFormats: { kind: () => FORMATS, find: (place) => place },
  },
  finds: {
    getCell: {
      kind: range,
      find: ({ sheet, rect }, row: number, column: number) => ({
        sheet,
        rect: rectAt(rect.top + row, rect.left + column, 1, 1),
      }),
    },
    getRow: {
      kind: range,
      find: ({ sheet, rect }, row: number) => ({
        sheet,
        rect: rectAt(rect.top + row, rect.left, 1, width(rect)),
      }),
    },
    getColumn: {
      kind: range,
      find: ({ sheet, rect }, column: number) => ({
        sheet,
        rect: rectAt(rect.top, rect.left + column, height(rect), 1),
      }),
    },
    getLastCell: {
      kind: range,
      find: ({ sheet, rect }) => ({ sheet, rect: rectAt(rect.bottom, rect.right, 1, 1) }),
    },
    getLastRow: { kind: range, find: ({ sheet, rect }) => ({ sheet, rect: { ...rect, top: rect.bottom } }) },
    getLastColumn: {
      kind: range,
      find: ({ sheet, rect }) => ({ sheet, rect: { ...rect, left: rect.right } }),
    },
    getResizedRange: {
      kind: range,
      find: (place, rows: number, columns: number) => moved(place, 0, 0, rows, columns),
    },
    getAbsoluteResizedRange: {
      kind: range,
      find: ({ sheet, rect }, rows: number, columns: number) => ({
        sheet,
        rect: rectAt(rect.top, rect.left, rows, columns),
      }),
    },
    getOffsetRange: {
      kind: range,
      find: (place, rows: number, columns: number) => moved(place, rows, columns),
    },
    getRowsAbove: {
      kind: range,
      find: ({ sheet, rect }, count = 1) => ({
        sheet,
        rect: rectAt(rect.top - count, rect.left, count, width(rect)),
      }),
    },
    getRowsBelow: {
      kind: range,
      find: ({ sheet, rect }, count = 1) => ({
        sheet,
        rect: rectAt(rect.bottom + 1, rect.left, count, width(rect)),
      }),
    },
    getColumnsBefore: {
      kind: range,
      find: ({ sheet, rect }, count = 1) => ({
        sheet,
        rect: rectAt(rect.top, rect.left - count, height(rect), count),
      }),
    },
    getColumnsAfter: {
      kind: range,
      find: ({ sheet, rect }, count = 1) => ({
        sheet,
        rect: rectAt(rect.top, rect.right + 1, height(rect), count),
      }),
    },
    getEntireColumn: {
      kind: range,
      find: ({ sheet, rect }) => ({ sheet, rect: { ...rect, top: 0, bottom: ROWS - 1 } }),
    },
    getEntireRow: {
      kind: range,
      find: ({ sheet, rect }) => ({ sheet, rect: { ...rect, left: 0, right: COLUMNS - 1 } }),
    },
    ...orNull('getIntersection', range, (place: Place, given: Place | string) => {
      const second = other(place, given)
      return second.sheet.id === place.sheet.id ? at(place, intersect(place.rect, second.rect)) : null
    }),
    getBoundingRect: {
      kind: range,
      find: (place, given: Place | string) => {
        const second = other(place, given)
        if (second.sheet.id !== place.sheet.id)
          throw new OfficeError('InvalidArgument', 'the ranges lie on different sheets')
        return { sheet: place.sheet, rect: bounding(place.rect, second.rect) }
      },
    },
    ...orNull('getUsedRange', range, (place: Place, valuesOnly = false) =>
      at(place, place.sheet.used(valuesOnly, place.rect)),
    ),
    getSurroundingRegion: { kind: range, find: surroundingRegion },
    ...orNull('getSpillingToRange', range, (place: Place) => {
      const found = spill(place)
      const isAnchor = found?.anchor.top === place.rect.top && found.anchor.left === place.rect.left
      return isAnchor ? at(place, found.area) : null
    }),
    ...orNull('getSpillParent', range, (place: Place) => at(place, spill(place)?.anchor ?? null)),
    getVisibleView: { kind: () => RANGE_VIEW, find: (place) => place },
    getMergedAreasOrNullObject: {
      kind: () => RANGE_AREAS,
      orNull: true,
      find: ({ sheet, rect }): Places | null => {
        const rects = sheet.merges(rect)
        return rects.length ? { sheet, rects } : null
      },
    },
    insert: {
      kind: range,
      writes: true,
      find: ({ sheet, rect }, shift: 'Down' | 'Right') => {
        sheet.insert(rect, shift)
        return { sheet, rect }
      },
    },
  },
  acts: {
    clear,
    delete: ({ sheet, rect }, shift: 'Up' | 'Left') => sheet.remove(rect, shift),
    merge: ({ sheet, rect }, across = false) => {
      sheet.guard()
      const cells = sheet.facade.getRange(sheet.rangeOf(rect))
      if (across) cells.mergeAcross({ isForceMerge: true })
      else cells.merge({ isForceMerge: true })
    },
    unmerge: ({ sheet, rect }) => {
      sheet.guard()
      sheet.facade.getRange(sheet.rangeOf(rect)).breakApart()
    },
    select: ({ sheet, rect }) => sheet.book.select(sheet, [rect]),
    // The grid folds nothing; how deep a line is folded is kept with it, for the file.
    group: (place, option: string) => regroup(place, option, 1),
    ungroup: (place, option: string) => regroup(place, option, -1),
  },
  answers: { getCellProperties: cellProperties },
}

const AREAS: Kind<Places> = {
  name: 'RangeCollection',
  list: { kind: range, read: ({ sheet, rects }) => rects.map((rect) => ({ sheet, rect })) },
  answers: { getCount: ({ rects }) => rects.length },
  finds: {
    getItemAt: {
      kind: range,
      find: ({ sheet, rects }, index: number) => {
        const rect = rects[index]
        if (!rect) throw new OfficeError('InvalidArgument', `there is no area ${index}`)
        return { sheet, rect }
      },
    },
  },
}

export const RANGE_AREAS: Kind<Places> = {
  name: 'RangeAreas',
  transient: true,
  check: ({ sheet }) => {
    if (!sheet.exists) throw new OfficeError('InvalidObjectPath', 'the areas lie on a deleted sheet')
  },
  scalars: {
    address: { read: ({ sheet, rects }) => rects.map((rect) => fullAddress({ sheet, rect })).join(',') },
    areaCount: { read: ({ rects }) => rects.length },
    cellCount: { read: ({ rects }) => rects.reduce((sum, rect) => sum + height(rect) * width(rect), 0) },
    isEntireColumn: { read: ({ rects }) => rects.every(isEntireColumn) },
    isEntireRow: { read: ({ rects }) => rects.every(isEntireRow) },
  },
  parts: {
    areas: { kind: () => AREAS, find: (places) => places },
    worksheet: { kind: () => WORKSHEET, find: ({ sheet }) => sheet },
  },
}
