import type { Area, Mark, Table } from '../sheet'
import { rangeOf } from './reading'
import type { Request } from './requests'

/**
 * How written tables look, and what stood there before. The look is weight, slant, rules and alignment only: without colours of
 * our own it stays readable on every theme of the host, and a user's own fills stay.
 */
interface Face {
  readonly bold: boolean
  readonly italic: boolean
  readonly align: string
  readonly vertical: string
  readonly wrap: boolean
  readonly indent: number
  readonly top: Rule
  readonly bottom: Rule
}

/** A line along an edge; rules of ours have the weight and the colour the host gives them. */
interface Rule {
  readonly style: string
  readonly weight?: string
  readonly color?: string
}

const NONE: Rule = { style: 'None' }
const LINE: Rule = { style: 'Continuous' }
const PLAIN: Face = {
  bold: false,
  italic: false,
  align: 'General',
  vertical: 'Bottom',
  wrap: false,
  indent: 0,
  top: NONE,
  bottom: NONE,
}

const FACES: { readonly [mark in Mark]: Face } = {
  title: { ...PLAIN, bold: true },
  section: { ...PLAIN, bold: true, bottom: LINE },
  head: { ...PLAIN, bold: true, wrap: true, bottom: LINE },
  total: { ...PLAIN, bold: true, top: LINE },
  note: { ...PLAIN, italic: true },
  alert: { ...PLAIN, bold: true, italic: true },
  wrapped: { ...PLAIN, wrap: true },
}

/** A face and the cells that have it. */
export interface Look extends Face {
  readonly area: Area
}

type Edge = 'EdgeTop' | 'EdgeBottom' | 'InsideHorizontal'

function rule(range: Excel.Range, edge: Edge, { style, weight, color }: Rule): void {
  const border = range.format.borders.getItem(edge)
  border.style = style as Excel.BorderLineStyle
  if (color !== undefined) border.color = color
  // last: a weight that does not go with a style changes it, and the style is there by then
  if (weight !== undefined) border.weight = weight as Excel.BorderWeight
}

/** Makes an area plain. Its outer rules stay: neighbours share them. */
export function undress(context: Excel.RequestContext, area: Area): void {
  const range = rangeOf(context, area)
  range.format.font.bold = PLAIN.bold
  range.format.font.italic = PLAIN.italic
  range.format.horizontalAlignment = PLAIN.align as Excel.HorizontalAlignment
  range.format.verticalAlignment = PLAIN.vertical as Excel.VerticalAlignment
  range.format.wrapText = PLAIN.wrap
  range.format.indentLevel = PLAIN.indent
  if (area.rows > 1) rule(range, 'InsideHorizontal', PLAIN.top)
}

/** Takes away the rule an earlier table of ours drew over an area, unless the area begins it: then the rule belongs to a neighbour. */
export function unrule(context: Excel.RequestContext, area: Area, ours: Area): void {
  if (area.row > ours.row) rule(rangeOf(context, { ...area, row: area.row - 1 }), 'EdgeBottom', PLAIN.bottom)
}

/** Sets a run of cells in one row off, in a table made plain before. */
export function dress(
  context: Excel.RequestContext,
  { area, bold, italic, align, vertical, wrap, indent, top, bottom }: Look,
): void {
  const range = rangeOf(context, area)
  if (bold) range.format.font.bold = true
  if (italic) range.format.font.italic = true
  if (align !== PLAIN.align) range.format.horizontalAlignment = align as Excel.HorizontalAlignment
  if (vertical !== PLAIN.vertical) range.format.verticalAlignment = vertical as Excel.VerticalAlignment
  if (wrap) range.format.wrapText = true
  // after the alignment, which an indent goes by
  if (indent > 0) range.format.indentLevel = indent
  if (bottom !== PLAIN.bottom) rule(range, 'EdgeBottom', bottom)
  // a rule above is kept with the row above: taking away the rules inside a table finds it there on every host
  if (top !== PLAIN.top) rule(rangeOf(context, { ...area, row: area.row - 1 }), 'EdgeBottom', top)
}

/** Gives an area the look it had, as it was surveyed. */
export function putBack(context: Excel.RequestContext, look: Look): void {
  const range = rangeOf(context, look.area)
  range.format.font.bold = look.bold
  range.format.font.italic = look.italic
  range.format.horizontalAlignment = look.align as Excel.HorizontalAlignment
  range.format.verticalAlignment = look.vertical as Excel.VerticalAlignment
  range.format.wrapText = look.wrap
  range.format.indentLevel = look.indent
  if (look.area.rows > 1) rule(range, 'InsideHorizontal', PLAIN.top)
  rule(range, 'EdgeTop', look.top)
  rule(range, 'EdgeBottom', look.bottom)
}

/**
 * The looks of a table that fills `target`: each run of cells with one mark. */
export function looksOf(table: Table, target: Area): Look[] {
  const looks: Look[] = []
  table.cells.forEach((cells, row) => {
    let from = 0
    while (from < cells.length) {
      const face = faceOf(table, row, from)
      let to = from + 1
      while (to < cells.length && sameFace(faceOf(table, row, to), face)) to++
      if (!sameFace(face, PLAIN)) {
        looks.push({
          ...face,
          area: {
            ...target,
            row: target.row + row,
            rows: 1,
            column: target.column + from,
            columns: to - from,
          },
        })
      }
      from = to
    }
  })
  return looks
}

function faceOf(table: Table, row: number, column: number): Face {
  const face = markedFace(table, row, column)
  const indent = table.cells[row]?.[column]?.indent ?? 0
  return {
    ...face,
    ...(table.fromTop && { vertical: 'Top' }),
    // only what begins at an edge can keep off it
    ...(indent > 0 && { indent, align: 'Left' }),
  }
}

function markedFace(table: Table, row: number, column: number): Face {
  const mark = table.cells[row]?.[column]?.mark
  if (!mark) return PLAIN
  // over a first row there is nothing of ours to be parted from
  if (row === 0) return { ...FACES[mark], top: NONE }
  return mark === 'head' && table.numeric[column] ? { ...FACES.head, align: 'Right' } : FACES[mark]
}

const sameFace = (a: Face, b: Face): boolean =>
  a.bold === b.bold &&
  a.italic === b.italic &&
  a.align === b.align &&
  a.vertical === b.vertical &&
  a.wrap === b.wrap &&
  a.indent === b.indent &&
  a.top === b.top &&
  a.bottom === b.bottom

/** An area with mixed looks is asked again in at most so many strips. */
const STRIPS = 16

/**
 * Finds out how areas look now, so that it can be put back. The host answers "mixed" with null: such an area is cut into strips of
 * rows and in the end into cells, so a plain place costs one request and a table a few.
 */
export async function surveyLooks({ context, sync }: Request, areas: readonly Area[]): Promise<Look[]> {
  const looks: Look[] = []
  let open = areas
  while (open.length > 0) {
    const asked = open.map((area) => {
      const { format } = rangeOf(context, area)
      format.load('horizontalAlignment,verticalAlignment,wrapText,indentLevel')
      format.font.load('bold,italic')
      const edges = (
        ['EdgeTop', 'EdgeBottom', ...(area.rows > 1 ? ['InsideHorizontal' as const] : [])] as const
      ).map((edge) => format.borders.getItem(edge).load('style,weight,color'))
      return { area, format, edges }
    })
    await sync()
    open = asked.flatMap(({ area, format, edges }) => {
      const [top = null, bottom = null, inside] = edges.map(ruleOf)
      const { font } = format
      const look = {
        area,
        bold: font.bold as boolean | null,
        italic: font.italic as boolean | null,
        align: format.horizontalAlignment as string | null,
        vertical: format.verticalAlignment as string | null,
        wrap: format.wrapText as boolean | null,
        indent: format.indentLevel as number | null,
        top,
        bottom,
      }
      const ruled = area.rows > 1 && [top, bottom, inside].some((found) => found !== NONE)
      if (!ruled && isUniform(look)) {
        looks.push(look)
        return []
      }
      return strips(area)
    })
  }
  return looks
}

/** The line all of an edge has, or null when it is mixed. */
function ruleOf({
  style,
  weight,
  color,
}: { [key in 'style' | 'weight' | 'color']: string | null }): Rule | null {
  if (style === 'None') return NONE
  return style !== null && weight !== null && color !== null ? { style, weight, color } : null
}

const isUniform = (look: { [key in keyof Look]: Look[key] | null }): look is Look =>
  Object.values(look).every((value) => value !== null)

function strips(area: Area): Area[] {
  if (area.rows > 1) {
    const rows = Math.ceil(area.rows / STRIPS)
    return Array.from({ length: Math.ceil(area.rows / rows) }, (_, k) => ({
      ...area,
      row: area.row + k * rows,
      rows: Math.min(rows, area.rows - k * rows),
    }))
  }
  // a single cell cannot be mixed; should a host say so, there is nothing finer to ask
  if (area.columns === 1) return []
  return Array.from({ length: area.columns }, (_, k) => ({ ...area, column: area.column + k, columns: 1 }))
}

/** Width in points of a column that shows so many characters of the body font. */
export const pointsOf = (characters: number): number => (characters * 7 + 5) * 0.75
