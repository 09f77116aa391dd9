import { addressOf, cellOf, overlap, type Area, type Table } from '../sheet'
import type { Step, Survey } from './journal'
import { rangeOf } from './reading'
import type { Fill } from './writing'

/**
 * Links behind cells. Setting one, the host gives the cell the font of its style for links (underlined, coloured, whatever size the
 * style has) and fills it where it was empty; clearing one leaves that font behind. So a link is set before the cell's format and value are
 * written, the font it had comes back at once, and only the underline says that a press leads somewhere: no colour of ours.
 */
export type Target = Pick<Excel.RangeHyperlink, 'address' | 'documentReference' | 'screenTip'>

/** What the style for links takes over of a cell's look. */
interface Font {
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

/** The steps that set the links of a table and take away those that stood where it goes. They come before its values. */
export function linkSteps(
  cells: readonly LinkedCell[],
  { patch: { table, ours }, target, leftovers }: Fill,
  plainFont: (() => Font) | null,
): Step[] {
  const known = new Map(cells.map((cell) => [addressOf(cell.area), cell]))
  const links = linksOf(table, target)
  const linked = new Set(links.map(({ area }) => addressOf(area)))
  const gone = cells.filter(
    ({ area, target: led }) =>
      led !== null &&
      !linked.has(addressOf(area)) &&
      [target, ...leftovers].some((place) => overlap(place, area) !== null),
  )
  const setting = (area: Area, to: Target | null): Step => ({
    bytes: 600,
    // an empty cell is filled with where its link leads, for a moment
    ...(to && { touches: area }),
    run(context) {
      const cell = known.get(addressOf(area))
      // on a sheet of its own nothing stood there: the cell looks as nobody has formatted it
      const font = cell?.font ?? plainFont?.()
      if (!font) return
      put(context, area, to, {
        ...font,
        color: cell ? ownColour(cell, ours) : font.color,
        underline: to ? 'Single' : 'None',
      })
    },
  })
  return [...gone.map(({ area }) => setting(area, null)), ...links.map(({ area, to }) => setting(area, to))]
}

/** Gives a cell the link and the font it had; its value is to be written afterwards. */
export const putLinkBack = (context: Excel.RequestContext, { area, target, font }: LinkedCell): void =>
  put(context, area, target, font)

function put(context: Excel.RequestContext, area: Area, target: Target | null, font: Font): void {
  const range = rangeOf(context, area)
  if (target) range.hyperlink = target
  else range.clear('Hyperlinks')
  Object.assign(range.format.font, font)
}
