import type { Breakdown } from './breakdown'
import type { Area } from './cells'
import { addressOf } from './cells'
import type { CheckLine } from './inspection'
import type { Table, TableCell } from './table'
import { textCell as text } from './table'
import { CAUTION, countOf, dateText } from './wording'

const HEADS: readonly (readonly [head: string, width: number])[] = [
  ['Severity', 10],
  ['What was found', 58],
  ['Cells', 24],
  ['What it does to the figures', 46],
  ['What can be done', 46],
  ['Correction', 34],
  ['Volatility as it is', 12],
  ['Volatility corrected', 12],
]

const SEVERITIES = { stops: 'Stops', warns: 'Warning', notes: 'Note' } as const

/** Of one fault this many cells are listed; the rest is counted. */
const MOST_CELLS = 25

/**
 * Lays what was found about the data out as a table to be written: one row a fault and further rows for its other cells and corrections.
 * Cells are links.
 *
 * @param breakdown the figures as they are; null while none are computed
 */
export function checksTable(
  title: string,
  lines: readonly CheckLine[],
  breakdown: Breakdown | null,
  today: number,
): Table {
  const cells: TableCell[][] = []
  const add = (...row: TableCell[]): void => {
    const mark = row[0]?.mark
    const rest = text('', mark === 'head' ? mark : undefined)
    cells.push([...row, ...Array.from({ length: HEADS.length - row.length }, () => rest)])
  }
  const link = (area: Area): TableCell => ({ ...text(addressOf(area)), link: area })

  add(text(`Data checks: ${title}`, 'title'))
  add(
    text(
      `${lines.length === 0 ? 'Nothing was found' : `${countOf(lines.length, 'finding')}`}, looked over on ${dateText(today)}. Nothing was changed by it.`,
    ),
  )
  add(text(CAUTION, 'note'))
  add()
  add(...HEADS.map(([head]) => text(head, 'head')))
  const now = breakdown?.decomposition.volatility
  for (const { check, corrections } of lines) {
    const listed = check.areas.slice(0, MOST_CELLS)
    const more = check.areas.length - listed.length
    const places = [...listed.map(link), ...(more > 0 ? [text(`and ${more} more`)] : [])]
    const rows = Math.max(1, places.length, corrections.length)
    for (let k = 0; k < rows; k++) {
      const correction = corrections[k]
      const first = k === 0
      const corrected = correction?.volatility
      add(
        text(first ? SEVERITIES[check.weight] : '', check.weight !== 'notes' && first ? 'alert' : undefined),
        text(first ? check.sentence : '', 'wrapped'),
        places[k] ?? text(''),
        text(first ? check.effect : '', 'wrapped'),
        text(first ? check.remedy : '', 'wrapped'),
        text(correction?.label ?? '', 'wrapped'),
        correction && now !== undefined ? { value: now, format: '0.00%' } : text(''),
        corrected === undefined
          ? text('')
          : typeof corrected === 'number'
            ? { value: corrected, format: '0.00%' }
            : text(corrected, 'wrapped'),
      )
    }
  }
  return {
    cells,
    widths: HEADS.map(([, width]) => width),
    fromTop: true,
    numeric: HEADS.map((_, k) => k >= 6),
  }
}
