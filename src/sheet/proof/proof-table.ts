import type { Area } from '../cells'
import type { Table } from '../table'
import { CAUTION, dateText } from '../wording'
import { layBenchmark } from './benchmark-section'
import { layBook } from './book-section'
import { HEADS } from './columns'
import { layDates, laySeries } from './dates-section'
import { layGroups } from './groups-section'
import { layHead, laySettings } from './head-section'
import { layHoldings } from './holdings-section'
import { layIntensity } from './intensity-section'
import type { ProofInput } from './proof-sheet'
import { ProofSheet } from './proof-sheet'
import { layRemarks } from './remarks-section'
import { layTails } from './tails-section'

/**
 * Lays out formulas that recompute a book's figures from the user's own cells, each beside the figure as it was computed, with the difference
 * and whether it lies within a stated tolerance. What formulas cannot recompute stands as a labelled constant, and the sheet says so at
 * its head.
 *
 * @param at  where its top-left cell will lie, since formulas refer to their own sheet by address
 * @cost      O(dates + holdings) formulas; some 13,000 for 500 holdings and 1260 dates
 */
export function proofTable(input: ProofInput, at: Area): Table {
  const sheet = new ProofSheet(input, at)
  layHead(sheet)
  laySettings(sheet)
  const from = sheet.draft.next
  layBook(sheet)
  layHoldings(sheet)
  if (sheet.derivesIntensity) layIntensity(sheet)
  layGroups(sheet)
  layTails(sheet)
  layBenchmark(sheet)
  sheet.judge(from)
  layRemarks(sheet)
  laySeries(sheet)
  layDates(sheet)
  const { breakdown, title } = input
  const width = Math.max(
    sheet.labels + sheet.keys.length,
    sheet.labels + sheet.dateKeys.length + sheet.groupReturns.length,
    sheet.labels + sheet.seriesColumns.length + sheet.groupReturns.length,
  )
  const widths = Array.from({ length: width }, (_, c) =>
    c === 0 ? 36 : c < sheet.labels ? 16 : (HEADS[sheet.keys[c - sheet.labels]!] ?? ['', 12])[1],
  )
  const { dates } = breakdown
  return {
    cells: sheet.draft.finish(width),
    widths,
    numeric: widths.map((_, c) => {
      const key = sheet.keys[c - sheet.labels]
      return c >= sheet.labels && key !== 'mark' && key !== 'note'
    }),
    page: {
      paper: 'A4',
      orientation: 'landscape',
      onePage: false,
      header: {
        left: `Recomputed by formulas: ${title}`,
        right: dates?.last === null || dates?.last === undefined ? '' : `Data to ${dateText(dates.last)}`,
      },
      footer: CAUTION,
    },
  }
}
