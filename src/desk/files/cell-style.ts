/** The look of a cell, between the file's vocabulary and the grid's. What neither side can say is left out, not approximated. */
import type { Alignment, Borders, Color, Style } from '@cj-tech-master/excelts/browser'
import {
  BooleanNumber,
  BorderStyleTypes,
  HorizontalAlign,
  VerticalAlign,
  WrapStrategy,
  type IBorderData,
  type IStyleData,
  type Nullable,
} from '@univerjs/core'

/** The colours of the workbook's theme in the order the format numbers them. */
export type Palette = readonly string[]

const OFFICE_PALETTE: Palette =
  // The theme a file without one is read with: ECMA-376 part 1, 20.1.6.2 (from memory), in the order of 18.8.3 (light and dark swapped).
  [
    'FFFFFF',
    '000000',
    'EEECE1',
    '1F497D',
    '4F81BD',
    'C0504D',
    '9BBB59',
    '8064A2',
    '4BACC6',
    'F79646',
    '0000FF',
    '800080',
  ]

export function paletteOf(themeXml: string | undefined): Palette {
  const order = [
    'lt1',
    'dk1',
    'lt2',
    'dk2',
    'accent1',
    'accent2',
    'accent3',
    'accent4',
    'accent5',
    'accent6',
    'hlink',
    'folHlink',
  ]
  return order.map((name, i) => {
    const entry = new RegExp(`<a:${name}>.*?(?:lastClr|srgbClr val)="([\\dA-Fa-f]{6})"`, 's').exec(
      themeXml ?? '',
    )
    return entry?.[1] ?? OFFICE_PALETTE[i] ?? '000000'
  })
}

const BORDERS = {
  thin: BorderStyleTypes.THIN,
  hair: BorderStyleTypes.HAIR,
  dotted: BorderStyleTypes.DOTTED,
  dashed: BorderStyleTypes.DASHED,
  dashDot: BorderStyleTypes.DASH_DOT,
  dashDotDot: BorderStyleTypes.DASH_DOT_DOT,
  double: BorderStyleTypes.DOUBLE,
  medium: BorderStyleTypes.MEDIUM,
  mediumDashed: BorderStyleTypes.MEDIUM_DASHED,
  mediumDashDot: BorderStyleTypes.MEDIUM_DASH_DOT,
  mediumDashDotDot: BorderStyleTypes.MEDIUM_DASH_DOT_DOT,
  slantDashDot: BorderStyleTypes.SLANT_DASH_DOT,
  thick: BorderStyleTypes.THICK,
} as const
const HORIZONTAL = {
  left: HorizontalAlign.LEFT,
  center: HorizontalAlign.CENTER,
  right: HorizontalAlign.RIGHT,
  justify: HorizontalAlign.JUSTIFIED,
  distributed: HorizontalAlign.DISTRIBUTED,
} as const
const VERTICAL = {
  top: VerticalAlign.TOP,
  middle: VerticalAlign.MIDDLE,
  bottom: VerticalAlign.BOTTOM,
} as const
const SIDES = { top: 't', bottom: 'b', left: 'l', right: 'r' } as const
/** Pixels a step of indent takes. */
const INDENT = 9

const keyOf = <Key extends string, Value>(table: Record<Key, Value>, value: Value): Key | undefined =>
  (Object.keys(table) as Key[]).find((key) => table[key] === value)

export function gridStyle(style: Partial<Style>, palette: Palette): IStyleData | undefined {
  const { font, alignment, border, fill, numFmt } = style
  const result: IStyleData = {}
  const pattern = typeof numFmt === 'string' ? numFmt : numFmt?.formatCode
  if (pattern && pattern !== 'General') result.n = { pattern }
  if (font?.bold) result.bl = BooleanNumber.TRUE
  if (font?.italic) result.it = BooleanNumber.TRUE
  if (font?.underline && font.underline !== 'none') result.ul = { s: BooleanNumber.TRUE }
  if (font?.strike) result.st = { s: BooleanNumber.TRUE }
  if (font?.size && font.size !== 11) result.fs = font.size
  if (font?.name && !['Calibri', 'Aptos Narrow'].includes(font.name)) result.ff = font.name
  const ink = colour(font?.color, palette)
  if (ink && ink !== '#000000') result.cl = { rgb: ink }
  const paper =
    fill?.type === 'pattern' && fill.pattern === 'solid' ? colour(fill.fgColor, palette) : undefined
  if (paper) result.bg = { rgb: paper }
  const lines = gridBorders(border, palette)
  if (lines) result.bd = lines
  const horizontal = alignment?.horizontal && HORIZONTAL[alignment.horizontal as keyof typeof HORIZONTAL]
  if (horizontal) result.ht = horizontal
  const vertical = alignment?.vertical && VERTICAL[alignment.vertical as keyof typeof VERTICAL]
  if (vertical) result.vt = vertical
  if (alignment?.wrapText) result.tb = WrapStrategy.WRAP
  if (alignment?.indent) result.pd = { l: alignment.indent * INDENT }
  return Object.keys(result).length > 0 ? result : undefined
}

export function fileStyle(style: IStyleData): Partial<Style> {
  const result: Partial<Style> = {}
  if (style.n?.pattern) result.numFmt = style.n.pattern
  const ink = argb(style.cl?.rgb)
  const font = {
    ...(style.bl ? { bold: true } : {}),
    ...(style.it ? { italic: true } : {}),
    ...(style.ul?.s ? { underline: true } : {}),
    ...(style.st?.s ? { strike: true } : {}),
    ...(ink ? { color: ink } : {}),
  }
  if (Object.keys(font).length > 0 || style.fs || style.ff) {
    result.font = { name: style.ff ?? 'Calibri', size: style.fs ?? 11, ...font }
  }
  const paper = argb(style.bg?.rgb)
  if (paper) result.fill = { type: 'pattern', pattern: 'solid', fgColor: paper }
  const border = fileBorders(style.bd)
  if (border) result.border = border
  const alignment: Partial<Alignment> = {}
  const horizontal = style.ht
    ? keyOf(HORIZONTAL, style.ht as (typeof HORIZONTAL)[keyof typeof HORIZONTAL])
    : undefined
  if (horizontal) alignment.horizontal = horizontal
  const vertical = style.vt
    ? keyOf(VERTICAL, style.vt as (typeof VERTICAL)[keyof typeof VERTICAL])
    : undefined
  if (vertical) alignment.vertical = vertical
  if (style.tb === WrapStrategy.WRAP) alignment.wrapText = true
  if (style.pd?.l) alignment.indent = Math.round(style.pd.l / INDENT)
  if (Object.keys(alignment).length > 0) result.alignment = alignment
  return result
}

function gridBorders(border: Partial<Borders> | undefined, palette: Palette): IBorderData | undefined {
  const lines: IBorderData = {}
  for (const [side, key] of Object.entries(SIDES) as [keyof typeof SIDES, 't' | 'b' | 'l' | 'r'][]) {
    const line = border?.[side]
    if (line?.style)
      lines[key] = { s: BORDERS[line.style], cl: { rgb: colour(line.color, palette) ?? '#000000' } }
  }
  return Object.keys(lines).length > 0 ? lines : undefined
}

function fileBorders(lines: Nullable<IBorderData>): Partial<Borders> | undefined {
  const border: Partial<Borders> = {}
  for (const [side, key] of Object.entries(SIDES) as [keyof typeof SIDES, 't' | 'b' | 'l' | 'r'][]) {
    const line = lines?.[key]
    const style = line ? keyOf(BORDERS, line.s as (typeof BORDERS)[keyof typeof BORDERS]) : undefined
    if (line && style) border[side] = { style, color: argb(line.cl.rgb) ?? { argb: 'FF000000' } }
  }
  return Object.keys(border).length > 0 ? border : undefined
}

function colour(
  color: (Partial<Color> & { tint?: number }) | undefined,
  palette: Palette,
): string | undefined {
  if (color?.argb) return `#${color.argb.slice(-6).toUpperCase()}`
  const base = color?.theme === undefined ? undefined : palette[color.theme]
  return base === undefined ? undefined : `#${tinted(base, color?.tint ?? 0)}`
}

/** Lightens (tint > 0) or darkens a theme colour by its lightness: ECMA-376 part 1, 18.8.19. */
function tinted(hex: string, tint: number): string {
  if (tint === 0) return hex.toUpperCase()
  const rgb = [0, 2, 4].map((at) => parseInt(hex.slice(at, at + 2), 16) / 255)
  const lightness = (Math.max(...rgb) + Math.min(...rgb)) / 2
  const wanted = tint < 0 ? lightness * (1 + tint) : lightness * (1 - tint) + tint
  // Moves every channel so that the lightness becomes the wanted one while hue and saturation stay.
  const room = (l: number): number => 1 - Math.abs(2 * l - 1)
  const scale = room(lightness) === 0 ? 0 : room(wanted) / room(lightness)
  const channels = rgb.map((channel) => wanted + (channel - lightness) * scale)
  return channels
    .map((channel) =>
      Math.round(Math.min(1, Math.max(0, channel)) * 255)
        .toString(16)
        .padStart(2, '0'),
    )
    .join('')
    .toUpperCase()
}

/** The grid keeps colours as #rrggbb or, from its own palette, as rgb(r,g,b). */
function argb(rgb: Nullable<string>): { argb: string } | undefined {
  const hex = /^#([\dA-Fa-f]{6})$/.exec(rgb ?? '')
  if (hex) return { argb: `FF${(hex[1] ?? '').toUpperCase()}` }
  const numbers = /^rgba?\((\d+),\s*(\d+),\s*(\d+)/.exec(rgb ?? '')
  if (!numbers) return undefined
  const channels = numbers.slice(1, 4).map((channel) => Number(channel).toString(16).padStart(2, '0'))
  return { argb: `FF${channels.join('').toUpperCase()}` }
}
