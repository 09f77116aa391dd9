import { addressOf, type Area, type Table } from '../sheet'
import { areasIn } from './addresses'
import { rangeOf } from './reading'

/**
 * Bars behind the numbers of a table, as long as the number's share of a whole. The host has no word for whose a conditional format is, so
 * ours are known by their kind and colour: a grey that stays quiet under black and white figures alike and means nothing by itself.
 */
export interface Bar {
  readonly area: Area
  /** the number at which a bar fills its cell */
  readonly full: number
}

const COLOUR = '#A6ACB5'

/** The bars of a table that fills `target`. */
export const barsOf = (table: Table, target: Area): Bar[] =>
  (table.bars ?? []).map(({ column, row, rows, full }) => ({
    area: { ...target, row: target.row + row, rows, column: target.column + column, columns: 1 },
    full,
  }))

/** What was found of bars of ours. */
export interface FoundBars {
  readonly found: readonly Bar[]
  /** Takes them away; to be called in the context they were found in. */
  remove(): void
}

/** Asks for conditional formats in some areas; the first answer is there after the next sync, and tells what more to ask. */
export function askBars(
  context: Excel.RequestContext,
  areas: readonly Area[],
): (sync: () => Promise<void>) => Promise<FoundBars> {
  const asked = areas.map((area) => ({
    area,
    formats: rangeOf(context, area).conditionalFormats.load('items/type'),
  }))
  return async (sync) => {
    const found = asked.flatMap(({ area, formats }) =>
      formats.items
        .filter(({ type }) => type === 'DataBar')
        .map((format) => {
          const { dataBar } = format
          dataBar.load('upperBoundRule')
          dataBar.positiveFormat.load('fillColor')
          return { area, format, dataBar, cells: format.getRanges().load('address') }
        }),
    )
    if (found.length > 0) await sync()
    // one that reaches over two of the areas is found in both
    const ours = new Map<string, (typeof found)[number]>()
    for (const bar of found) {
      if (bar.dataBar.positiveFormat.fillColor.toUpperCase() === COLOUR)
        ours.set(JSON.stringify([bar.area.sheet, bar.cells.address]), bar)
    }
    return {
      found: [...ours.values()].flatMap(({ area, dataBar, cells }) =>
        areasIn(cells.address, area.sheet).flatMap((place) =>
          place ? [{ area: place, full: Number(dataBar.upperBoundRule.formula) }] : [],
        ),
      ),
      remove: () => {
        // the last first: should the host count formats rather than name them, those before keep their number
        for (const { format } of [...ours.values()].reverse()) format.delete()
      },
    }
  }
}

/** Lays a bar behind each number of an area. */
export function drawBar(context: Excel.RequestContext, { area, full }: Bar): void {
  const { dataBar } = rangeOf(context, area).conditionalFormats.add('DataBar')
  dataBar.lowerBoundRule = { type: 'Number', formula: '0' }
  dataBar.upperBoundRule = { type: 'Number', formula: String(full) }
  dataBar.positiveFormat.fillColor = COLOUR
  dataBar.positiveFormat.borderColor = ''
  dataBar.positiveFormat.gradientFill = false
}

/** Whether two sets of bars are the same ones. */
export function sameBars(a: readonly Bar[], b: readonly Bar[]): boolean {
  const keys = (bars: readonly Bar[]) => bars.map(({ area, full }) => `${addressOf(area)} ${full}`).sort()
  return JSON.stringify(keys(a)) === JSON.stringify(keys(b))
}
