import { addressOf, cellOf, overlap, type Area, type Table } from '../sheet'
import type { Survey } from './journal'
import { rangeOf } from './reading'

/**
 * Links behind cells. Setting one, the host gives the cell the font of its style for links (underlined, coloured, whatever size the
 * style has) and fills it where it was empty; clearing one leaves that font behind. So a link is set before the cell's format and value are
 * written, the font it had comes back at once, and only the underline says that a press leads somewhere: no colour of ours.
 */
export type Target = Pick<Excel.RangeHyperlink, 'address' | 'documentReference' | 'screenTip'>

/** What the style for links takes over of a cell's look. */
export interface Font {
  readonly name: string
  readonly size: number
  readonly color: string
  readonly underline: string
}

/** A cell whose link a write sets or takes away, as it stood before. */
export interface LinkedCell {
  readonly area: Area
  /** null where there was no link */
  readonly target: Target | null
  readonly font: Font
}

/** What the host says of one cell's link; it has no word of its own for none. */
export function targetOf(hyperlink: Excel.RangeHyperlink | null | undefined): Target | null {
  const { address, documentReference, screenTip } = hyperlink ?? {}
  if (!address && !documentReference) return null
  return {
    ...(address && { address }),
    ...(documentReference && { documentReference }),
    ...(screenTip && { screenTip }),
  }
}

/** The links of a table that fills `target`. */
export const linksOf = (table: Table, target: Area): { readonly area: Area; readonly to: Target }[] =>
  table.cells.flatMap((row, r) =>
    row.flatMap(({ link }, c) => {
      if (!link) return []
      const place = addressOf(link)
      return [{ area: cellOf(target, r, c), to: { documentReference: place, screenTip: `Go to ${place}` } }]
    }),
  )

function askFont(range: Excel.Range): () => Font {
  const font = range.format.font.load('name,size,color,underline')
  return () => ({ name: font.name, size: font.size, color: font.color, underline: font.underline })
}

/** Asks how cells look that nobody has formatted: the last one of a sheet is such a one. The answer is there after the next sync. */
export const askPlainFont = (context: Excel.RequestContext): (() => Font) =>
  askFont(context.workbook.worksheets.getFirst().getRange('XFD1048576'))

/**
 * Asks for the fonts of the cells whose links are about to change: those that have one among the surveyed and those that get one.
 * The answer is there after the next sync.
 */
export function askLinkedCells(
  context: Excel.RequestContext,
  surveyed: readonly Survey[],
  linked: readonly Area[],
): () => LinkedCell[] {
  const cells = new Map<string, { readonly area: Area; readonly target: Target | null }>()
  for (const area of linked) cells.set(addressOf(area), { area, target: null })
  for (const { area, links } of surveyed)
    for (const { row, column, target } of links) {
      const cell = cellOf(area, row, column)
      cells.set(addressOf(cell), { area: cell, target })
    }
  const asked = [...cells.values()].map((cell) => ({ ...cell, font: askFont(rangeOf(context, cell.area)) }))
  return () => asked.map(({ area, target, font }) => ({ area, target, font: font() }))
}

/** The colour a cell keeps: its own, but for the one that came with a link of the user's that a table takes the place of. */
const ownColour = ({ area, target, font }: LinkedCell, ours: Area | undefined): string =>
  target && !(ours && overlap(area, ours)) ? '#000000' : font.color

/** Takes a link away, and what the host leaves of it. */
export function unlink(context: Excel.RequestContext, cell: LinkedCell, ours: Area | undefined): void {
  const range = rangeOf(context, cell.area)
  range.clear('Hyperlinks')
  dressLink(range, { ...cell.font, color: ownColour(cell, ours), underline: 'None' })
}

/** Sets a link; the cell's value is to be written afterwards. */
export function link(
  context: Excel.RequestContext,
  area: Area,
  to: Target,
  font: Font,
  color = font.color,
): void {
  const range = rangeOf(context, area)
  range.hyperlink = to
  dressLink(range, { ...font, color, underline: 'Single' })
}

/** Sets the link of a table in a cell that was surveyed. */
export const relink = (
  context: Excel.RequestContext,
  cell: LinkedCell,
  to: Target,
  ours: Area | undefined,
): void => link(context, cell.area, to, cell.font, ownColour(cell, ours))

/** Gives a cell the link and the font it had; its value is to be written afterwards. */
export function putLinkBack(context: Excel.RequestContext, { area, target, font }: LinkedCell): void {
  const range = rangeOf(context, area)
  if (target) range.hyperlink = target
  else range.clear('Hyperlinks')
  dressLink(range, font)
}

function dressLink(range: Excel.Range, { name, size, color, underline }: Font): void {
  const { font } = range.format
  font.name = name
  font.size = size
  font.color = color
  font.underline = underline as Excel.RangeUnderlineStyle
}
