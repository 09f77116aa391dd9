import { Fault } from '../core'
import {
  addressOf,
  cellOf,
  countOf,
  isFormula,
  overlap,
  quote,
  type Area,
  type CellEntry,
  type CellValue,
} from '../sheet'
import { areasIn, SHEET_COLUMNS, SHEET_ROWS } from './addresses'
import { asText, surveyGrounds, typedText, type Ground, type Step, type Survey } from './journal'
import { rangeOf } from './reading'
import { offers, type Request } from './requests'

/**
 * New values in single cells of the user's own. Cells that lie together are filled in one assignment, and nothing but what was typed
 * changes: a text goes in behind an apostrophe, which the host takes for its own mark, so that no number format is needed to keep it text.
 */
export interface Run {
  readonly area: Area
  /** one for each cell of the area, row by row */
  readonly entries: readonly (readonly CellEntry[])[]
}

/** A run with what stands in its cells. */
export interface SurveyedRun extends Run {
  readonly survey: Survey
}

/**
 * Gathers entries into blocks, each as tall as its cells lie under one another and then as wide as equal ones lie side by side.
 *
 * @throws Fault "selection" for what is no cell, "not-a-number", "twice" where one cell is named twice
 */
export function runsOf(entries: readonly CellEntry[]): Run[] {
  for (const { at, value } of entries) {
    if (at.rows !== 1 || at.columns !== 1 || at.row >= SHEET_ROWS || at.column >= SHEET_COLUMNS) {
      throw new Fault('selection', `${addressOf(at)} is not one cell`, 'single cells of a sheet are needed')
    }
    if (typeof value === 'number' && !Number.isFinite(value)) {
      throw new Fault(
        'not-a-number',
        `${addressOf(at)} would hold ${value}`,
        'a finite number or text is needed',
      )
    }
  }
  const sorted = [...entries].sort(
    ({ at: a }, { at: b }) =>
      (a.sheet < b.sheet ? -1 : a.sheet > b.sheet ? 1 : 0) || a.column - b.column || a.row - b.row,
  )
  const tall: Run[] = []
  for (const entry of sorted) {
    const { at } = entry
    const last = tall.at(-1)
    const end = last && last.area.row + last.area.rows
    const below = last?.area.sheet === at.sheet && last.area.column === at.column
    if (last && end !== undefined && below && at.row < end) {
      throw new Fault('twice', `${addressOf(at)} would be written twice`, 'one value for each cell is needed')
    }
    if (last && end !== undefined && below && at.row === end) {
      tall[tall.length - 1] = {
        area: { ...last.area, rows: last.area.rows + 1 },
        entries: [...last.entries, [entry]],
      }
    } else tall.push({ area: at, entries: [[entry]] })
  }
  // a block that ends where the next of equal height begins takes it in; found by the place it would begin at
  const wide = new Map<string, Run>()
  const edge = ({ sheet, row, rows }: Area, column: number): string =>
    JSON.stringify([sheet, row, rows, column])
  for (const run of tall) {
    const key = edge(run.area, run.area.column)
    const left = wide.get(key)
    wide.delete(key)
    const grown = left
      ? {
          area: { ...left.area, columns: left.area.columns + 1 },
          entries: left.entries.map((row, r) => [...row, ...(run.entries[r] ?? [])]),
        }
      : run
    wide.set(edge(grown.area, grown.area.column + grown.area.columns), grown)
  }
  return [...wide.values()]
}

/**
 * Looks at the cells and refuses what must not be written over: what is no longer as it was seen, what a formula fills together with
 * other cells, and cells that a merged one covers.
 *
 * @throws Fault "changed", naming the first cell of the entries in their own order, or "occupied"
 */
export async function surveyRuns(
  request: Request,
  runs: readonly Run[],
  entries: readonly CellEntry[],
): Promise<SurveyedRun[]> {
  const { context, sync } = request
  const asked = runs.map(({ area }) => {
    const range = rangeOf(context, area).load('hasSpill')
    const merged = offers('1.13') ? range.getMergedAreasOrNullObject() : null
    merged?.load('address')
    return { range, merged }
  })
  const surveys = await surveyGrounds(
    request,
    runs.map(({ area }) => area),
  )
  const surveyed = runs.flatMap((run, k): SurveyedRun[] => {
    const survey = surveys[k]
    return survey ? [{ ...run, survey }] : []
  })
  refuseChanged(surveyed, entries)

  runs.forEach(({ area }, k) => {
    const merged = asked[k]?.merged
    if (!merged || merged.isNullObject) return
    for (const block of areasIn(merged.address, area.sheet)) {
      const covered = block && cellsOf(area).find((cell) => overlap(cell, block) && !isCorner(cell, block))
      if (covered) {
        throw new Fault(
          'occupied',
          `${addressOf(covered)} is covered by the merged cells ${addressOf(block)}`,
          'unmerge them to give the cell a value of its own',
        )
      }
    }
  })

  // `hasSpill` is null where some cells have it
  const spilling = runs
    .filter((_, k) => asked[k]?.range.hasSpill !== false)
    .flatMap(({ area }) => cellsOf(area))
    .map((cell) => {
      const range = rangeOf(context, cell).load('hasSpill')
      const parent = range.getSpillParentOrNullObject()
      parent.load('address')
      return { cell, range, parent }
    })
  if (spilling.length === 0) return surveyed
  await sync()
  for (const { cell, range, parent } of spilling) {
    if (!range.hasSpill) continue
    const anchor = parent.isNullObject ? null : areasIn(parent.address, cell.sheet)[0]
    throw new Fault(
      'occupied',
      anchor && addressOf(anchor) !== addressOf(cell)
        ? `${addressOf(cell)} shows a result of the formula in ${addressOf(anchor)}`
        : `the formula in ${addressOf(cell)} fills other cells as well`,
      'cells with entries of their own are needed',
    )
  }
  return surveyed
}

const cellsOf = (area: Area): Area[] =>
  Array.from({ length: area.rows * area.columns }, (_, k) =>
    cellOf(area, Math.floor(k / area.columns), k % area.columns),
  )

const isCorner = (cell: Area, block: Area): boolean => cell.row === block.row && cell.column === block.column

/** Whether a cell holds what was seen; one formatted as text may hold the digits of a number that was written. */
const isSame = (found: CellValue, seen: CellValue, format: string): boolean =>
  found === seen || (format === '@' && typeof seen === 'number' && found === String(seen))

function refuseChanged(runs: readonly SurveyedRun[], entries: readonly CellEntry[]): void {
  const changed = new Map<CellEntry, string>()
  for (const { entries: rows, survey } of runs)
    rows.forEach((row, r) =>
      row.forEach((entry, c) => {
        const typed = survey.typed[r]?.[c] ?? ''
        const found = typeof typed === 'string' && typed.startsWith("'") ? typed.slice(1) : typed
        const format = survey.formats[r]?.[c] ?? ''
        if (isSame(found, entry.seen, format)) return
        changed.set(
          entry,
          `${addressOf(entry.at)} was edited meanwhile: found ${entryText(found, format)}, ${entryText(entry.seen, format)} was expected`,
        )
      }),
    )
  const first = entries.find((entry) => changed.has(entry))
  if (!first) return
  const others = changed.size - 1
  throw new Fault(
    'changed',
    `${changed.get(first) ?? ''}${others > 0 ? ` (and ${countOf(others, 'more cell')} changed)` : ''}`,
    'nothing was written; start again from what stands there now',
  )
}

/** An entry as the cell would show it, as far as a percentage goes. */
function entryText(value: CellValue, format: string): string {
  if (value === '') return 'nothing'
  if (typeof value === 'string') return quote(value)
  if (typeof value === 'number' && format.includes('%')) return `${Number((100 * value).toPrecision(12))}%`
  return String(value).toUpperCase()
}

/** A value in the notation of a journal: text behind an apostrophe. */
function typedOf(value: CellValue): CellValue {
  if (typeof value !== 'string' || isFormula(value)) return value
  return typedText(value.startsWith("'") ? value.slice(1) : value)
}

/** What a journal keeps of a run. */
export const groundOf = ({ area, entries, survey }: SurveyedRun): Ground => ({
  area,
  typed: survey.typed,
  formats: survey.formats,
  after: entries.map((row) => row.map(({ value }) => typedOf(value))),
})

/** The step that fills a run. */
export function entryStep({ area, entries, survey: { formats } }: SurveyedRun): Step {
  const typed = entries.map((row) => row.map(({ value }) => typedOf(value)))
  const isTextCell = (r: number, c: number): boolean => formats[r]?.[c] === '@'
  const isText = (entry: CellValue): entry is string => typeof entry === 'string' && entry.startsWith("'")
  // a cell formatted as text makes text of whatever comes in: for the moment of the entry it is not
  const lifted = typed.map((row, r) =>
    row.map((entry, c) => (isTextCell(r, c) && entry !== '' && !isText(entry) ? '@' : null)),
  )
  const lifts = lifted.some((row) => row.some((format) => format !== null))
  return {
    bytes:
      200 + typed.reduce((sum, row) => sum + row.reduce<number>((all, entry) => all + bytesOf(entry), 0), 0),
    touches: area,
    run(context) {
      const range = rangeOf(context, area)
      if (lifts) range.numberFormat = lifted.map((row) => row.map((format) => format && 'General'))
      range.formulas = typed.map((row, r) =>
        row.map((entry, c) => (isText(entry) && isTextCell(r, c) ? asText(entry.slice(1)) : entry)),
      )
      if (lifts) range.numberFormat = lifted
    },
  }
}

const bytesOf = (entry: CellValue): number => (typeof entry === 'string' ? 8 + 3 * entry.length : 20)
