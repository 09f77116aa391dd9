import {
  cellOf,
  isFormula,
  overlap,
  sameArea,
  sameFormula,
  type Area,
  type CellValue,
  type Json,
} from '../sheet'
import { askBars, drawBar, sameBars, type Bar } from './bars'
import { askCharts, chartUndoing, type ChartsThere, type Redrawing } from './charts'
import { putLinkBack, targetOf, type LinkedCell, type Target } from './links'
import { putBack, type Look } from './looks'
import { FOLD_PREFIX, refold, type Folding } from './outline'
import { pageUndoing, type SheetPage } from './page'
import { askSpills, rangeOf } from './reading'
import { REQUEST_BYTES, type Request, type Requests } from './requests'

/** Settings of ours begin so; the journal of a write under way is one of them. */
export const SETTING_PREFIX = 'counterpoise.'
export const JOURNAL_KEY = `${SETTING_PREFIX}journal`
/** What charts of ours there are, by name; like the journal no setting of the books'. */
export const DRAWN_KEY = `${SETTING_PREFIX}drawn`

/** What stands in some cells, so that it can be put back to the letter. */
export interface Ground {
  readonly area: Area
  /** what was typed: text behind an apostrophe, so that it cannot be taken for a formula; blanks and spilled results as '' */
  readonly typed: readonly (readonly CellValue[])[]
  /** number formats; null where the write sets none but '@' under text of its own */
  readonly formats: readonly (readonly string[])[] | null
  /** what the write puts there, in the notation of `typed`; null where it only clears */
  readonly after: readonly (readonly CellValue[])[] | null
}

/** What stands in some cells as found, with the values that show. */
export interface Survey extends Pick<Ground, 'area' | 'typed'> {
  readonly formats: readonly (readonly string[])[]
  readonly values: readonly (readonly CellValue[])[]
  /** the cells of the area, counted from its corner, that have a link behind them */
  readonly links: readonly { readonly row: number; readonly column: number; readonly target: Target }[]
}

/** All that a write is about to change, as it stands before. */
export interface Journal {
  /** the sheet the write makes, and what it fills there */
  readonly created: {
    readonly sheet: string
    readonly filled: readonly Area[]
    readonly outOfSight: boolean
  } | null
  readonly grounds: readonly Ground[]
  readonly looks: readonly Look[]
  readonly links: readonly LinkedCell[]
  /** the bars of ours in the areas a write changes */
  readonly bars: { readonly areas: readonly Area[]; readonly before: readonly Bar[] }
  readonly charts: Redrawing
  /** of the sheets whose page the write sets up */
  readonly pages: readonly SheetPage[]
  /** null where the write groups no rows and ungroups none */
  readonly folding: Folding | null
  readonly widths: readonly { readonly area: Area; readonly points: number }[]
  /** full names and what they refer to; null where there was no such name */
  readonly names: { readonly [name: string]: string | null }
  /** full keys and values; null where there was no such setting */
  readonly settings: { readonly [key: string]: Json }
}

/** One thing to do, with its size in a request and the cells whose change will be echoed by an event. */
export interface Step {
  readonly bytes: number
  readonly touches?: Area
  run(context: Excel.RequestContext): void
}

/** Does steps in order, in as few requests as their size allows. */
export async function perform(
  { context, sync }: Request,
  steps: readonly Step[],
  expectEcho: (area: Area) => void,
): Promise<void> {
  const application = context.workbook.application
  let at = 0
  while (at < steps.length) {
    application.suspendScreenUpdatingUntilNextSync()
    application.suspendApiCalculationUntilNextSync()
    let bytes = 0
    for (let step = steps[at]; step; step = steps[++at]) {
      if (bytes > 0 && bytes + step.bytes > REQUEST_BYTES) break
      bytes += step.bytes
      if (step.touches) expectEcho(step.touches)
      step.run(context)
    }
    await sync()
  }
}

/** A little step, whose bytes do not matter. */
export const step = (run: (context: Excel.RequestContext) => void, touches?: Area): Step => ({
  bytes: 200,
  run,
  ...(touches && { touches }),
})

/** Bytes of a text in a request, as JSON in UTF-8. */
export function bytesOf(text: string): number {
  let bytes = 2
  for (let k = 0; k < text.length; k++) {
    const code = text.charCodeAt(k)
    bytes += code < 32 ? 6 : code === 34 || code === 92 ? 2 : code < 128 ? 1 : code < 2048 ? 2 : 3
  }
  return bytes
}

const cellBytes = (value: CellValue | null): number =>
  typeof value === 'string' ? 2 + bytesOf(value) : value === null ? 5 : 20

/**
 * Cuts rows of cells into slabs that fit a request: [first row, rows, bytes].
 * @param formats sent with the cells, where there are some
 */
export function slabs(
  cells: readonly (readonly (CellValue | null)[])[],
  formats: readonly (readonly (string | null)[])[] = [],
): [number, number, number][] {
  const found: [number, number, number][] = []
  let from = 0
  let bytes = 0
  const sizeOf = (row: readonly (CellValue | null)[] = []) =>
    row.reduce((sum: number, value) => sum + cellBytes(value), 0)
  cells.forEach((row, k) => {
    const more = sizeOf(row) + sizeOf(formats[k])
    if (k > from && bytes + more > REQUEST_BYTES / 2) {
      found.push([from, k - from, bytes])
      from = k
      bytes = 0
    }
    bytes += more
  })
  if (cells.length > from) found.push([from, cells.length - from, bytes])
  return found
}

const rowsOf = (area: Area, from: number, rows: number): Area => ({ ...area, row: area.row + from, rows })

/**
 * What an entry that is text must be sent as, into a cell of the format '@': there it stays what it is, but for one apostrophe in front,
 * which the host takes for its own mark.
 */
export const asText = (text: string): string => (text.startsWith("'") ? `'${text}` : text)

/** A value to be written, in the notation of a journal. */
export const typedText = (text: string): string => (text === '' ? '' : `'${text}`)

const isText = (typed: CellValue | null): typed is string =>
  typeof typed === 'string' && typed.startsWith("'")

/** Cells to put back; null leaves one as it is. */
interface Mending {
  readonly area: Area
  readonly typed: readonly (readonly (CellValue | null)[])[]
  readonly formats: readonly (readonly (string | null)[])[] | null
}

/** The steps that put cells back. The formats an entry needs to be taken rightly come first, its own at last. */
function mendSteps({ area, typed, formats }: Mending): Step[] {
  return slabs(typed).map(([from, rows, bytes]) => {
    const part = typed.slice(from, from + rows)
    const place = rowsOf(area, from, rows)
    return {
      bytes: 3 * bytes,
      touches: place,
      run(context) {
        const range = rangeOf(context, place)
        range.numberFormat = part.map((row) =>
          row.map((entry) => (isText(entry) ? '@' : entry !== null && formats ? 'General' : null)),
        )
        range.formulas = part.map((row) =>
          row.map((entry) => (isText(entry) ? asText(entry.slice(1)) : entry)),
        )
        if (formats) range.numberFormat = formats.slice(from, from + rows).map((row) => [...row])
      },
    }
  })
}

/** Values, formulas, kinds, formats and links of a cell take about this much of an answer. */
const SURVEY_BYTES = 100

/** Reads what stands in some areas, as many of them a request as its size allows and a bounded piece of a large one. */
export async function surveyGrounds({ context, sync }: Request, areas: readonly Area[]): Promise<Survey[]> {
  const grounds = areas.map((area) => ({
    area,
    typed: [] as CellValue[][],
    formats: [] as string[][],
    values: [] as CellValue[][],
    links: [] as { row: number; column: number; target: Target }[],
  }))
  const most = REQUEST_BYTES / SURVEY_BYTES
  const pieces = grounds.flatMap((ground) => {
    const { area } = ground
    const rows = Math.max(1, Math.floor(most / area.columns))
    return Array.from({ length: Math.ceil(area.rows / rows) }, (_, k) => ({
      ground,
      from: k * rows,
      part: rowsOf(area, k * rows, Math.min(rows, area.rows - k * rows)),
    }))
  })
  let at = 0
  while (at < pieces.length) {
    const asked = []
    let cells = 0
    for (let piece = pieces[at]; piece; piece = pieces[++at]) {
      const more = piece.part.rows * piece.part.columns
      if (cells > 0 && cells + more > most) break
      cells += more
      const range = rangeOf(context, piece.part)
      range.load('values,formulas,valueTypes,numberFormat')
      asked.push({ ...piece, range, properties: range.getCellProperties({ hyperlink: true }) })
    }
    await sync()
    for (const { ground, from, range, properties } of asked) {
      ;(range.formulas as CellValue[][]).forEach((row, r) => {
        ground.values.push(range.values[r] as CellValue[])
        ground.formats.push(range.numberFormat[r] as string[])
        ground.typed.push(
          row.map((entry, c) =>
            // a formula that gives its own text does not exist, so an entry equal to its value was typed as it reads
            range.valueTypes[r]?.[c] === 'String' && entry === range.values[r]?.[c] ? `'${entry}` : entry,
          ),
        )
      })
      properties.value.forEach((row, r) =>
        row.forEach(({ hyperlink }, column) => {
          const target = targetOf(hyperlink)
          if (target) ground.links.push({ row: from + r, column, target })
        }),
      )
      range.untrack()
    }
  }
  return grounds
}

/** What stands in some cells with results that formulas among them fill into others as blanks: they come and go with the formula. */
async function withoutResults(
  { context, sync }: Request,
  surveyed: readonly Survey[],
): Promise<readonly Survey[]> {
  // only formulas can fill others, and asking is as long as there are cells
  const asked = surveyed
    .filter(({ typed }) => typed.some((row) => row.some(isFormula)))
    .map(({ area, typed }) => ({ area, typed, range: rangeOf(context, area).load('hasSpill') }))
  if (asked.length === 0) return surveyed
  await sync()
  const spilling = asked
    .filter(({ range }) => range.hasSpill !== false)
    .map(({ area, typed }) => askSpills(context, area, typed))
  if (spilling.length === 0) return surveyed
  await sync()
  const results = resultsOf(spilling.flatMap((answer) => answer()))
  return surveyed.map((ground) => ({
    ...ground,
    typed: ground.typed.map((row, r) => row.map((entry, c) => (results(ground.area, r, c) ? '' : entry))),
  }))
}

/** Whether a cell of an area shows a result of a formula in another cell. */
export const resultsOf =
  (spills: readonly { readonly from: Area; readonly over: Area }[]) =>
  (area: Area, row: number, column: number): boolean => {
    const cell = cellOf(area, row, column)
    return spills.some(({ from, over }) => overlap(over, cell) !== null && !sameArea(from, cell))
  }

/**
 * Puts back what a journal holds: the cells that differ from it, links, looks, groups, widths, names and settings; a sheet the write made goes again,
 * unless something else has come to stand on it. May be done twice. The journal is saved anew at the head of the work and goes with its end,
 * so that this can be interrupted as well.
 *
 * @param careful when time has passed since the write: what a user typed there meanwhile stays
 */
export async function restore(
  request: Request,
  requests: Requests,
  journal: Journal,
  expectEcho: (area: Area) => void,
  careful: boolean,
): Promise<void> {
  const { context, sync } = request
  const { names, settings, worksheets } = context.workbook
  const nameItems = Object.keys(journal.names).map((name) => ({
    name,
    item: names.getItemOrNullObject(name).load('formula'),
  }))
  const settingItems = Object.keys(journal.settings).map((key) => ({
    key,
    item: settings.getItemOrNullObject(key).load('key'),
  }))
  const sheets = worksheets.load('items/name')
  await sync()

  const there = new Set(sheets.items.map(({ name }) => name))
  // a sheet that is gone took its cells along: there is nothing left to put back
  const grounds = journal.grounds.filter(({ area }) => there.has(area.sheet))
  const askedBars = askBars(
    context,
    journal.bars.areas.filter(({ sheet }) => there.has(sheet)),
  )
  const now = await withoutResults(
    request,
    await surveyGrounds(
      request,
      grounds.map(({ area }) => area),
    ),
  )
  const bars = await askedBars(sync)
  const drawn = await chartsThere(request, journal.charts, there)
  const pages = await pagesThere(request, journal.pages, there)
  const barsBefore = journal.bars.before.filter(({ area }) => there.has(area.sheet))
  // setting a link may change what stands in its cell
  const links = journal.links.filter(({ area }) =>
    grounds.some((ground, k) => {
      const at = overlap(ground.area, area)
      return (
        at && !userCame(ground, now[k], at.row - ground.area.row, at.column - ground.area.column, careful)
      )
    }),
  )
  const changed = grounds.flatMap((ground, k) => difference(ground, now[k], careful, links))
  const { created } = journal
  const discard = created !== null && there.has(created.sheet) && (await holdsOnly(request, created))

  // the names that remember groups are changed before the groups, so groups are as they were while those names are
  const { folding } = journal
  const refolded =
    folding !== null &&
    nameItems.some(
      ({ name, item }) =>
        name.startsWith(FOLD_PREFIX) && (item.isNullObject ? null : item.formula) !== journal.names[name],
    )
  if (refolded) {
    const stand = (areas: readonly Area[]) => areas.filter(({ sheet }) => there.has(sheet))
    await refold(requests, { before: stand(folding.before), after: stand(folding.after) })
  }

  const steps: Step[] = [
    { bytes: bytesOf(JSON.stringify(journal)), run: () => settings.add(JOURNAL_KEY, journal) },
    ...links.map((cell) => ({
      bytes: 600,
      touches: cell.area,
      run: (context: Excel.RequestContext) => putLinkBack(context, cell),
    })),
    ...changed.flatMap(mendSteps),
    ...(sameBars(bars.found, barsBefore)
      ? []
      : [step(bars.remove), ...barsBefore.map((bar) => step((context) => drawBar(context, bar)))]),
    ...pages.flatMap(({ page, named }) => pageUndoing(page, named)),
    ...journal.looks
      .filter(({ area }) => there.has(area.sheet))
      .map((look) => step((context) => putBack(context, look))),
    ...journal.widths
      .filter(({ area }) => there.has(area.sheet))
      .map(({ area, points }) =>
        step((context) => void (rangeOf(context, area).format.columnWidth = points)),
      ),
    // over cells as wide as they were
    ...chartUndoing(journal.charts, drawn, careful),
    ...nameItems.flatMap(({ name, item }) =>
      nameSteps(name, journal.names[name] ?? null, !item.isNullObject),
    ),
    ...settingItems.flatMap(({ key, item }) =>
      settingSteps(key, journal.settings[key] ?? null, !item.isNullObject),
    ),
    ...(discard ? discarding(created) : []),
    step((context) => context.workbook.settings.getItem(JOURNAL_KEY).delete()),
  ]
  await perform(request, steps, expectEcho)
}

/** The charts of the sheets that a write drew on. */
async function chartsThere(
  { context, sync }: Request,
  { before }: Redrawing,
  there: ReadonlySet<string>,
): Promise<ChartsThere> {
  const asked = before
    .filter(({ sheet }) => there.has(sheet))
    .map(({ sheet }) => ({ sheet, charts: askCharts(context, sheet) }))
  if (asked.length > 0) await sync()
  return new Map(asked.map(({ sheet, charts }) => [sheet, charts()]))
}

/** The pages a write set up, with the names of what is printed there now. */
async function pagesThere(
  { context, sync }: Request,
  pages: readonly SheetPage[],
  there: ReadonlySet<string>,
): Promise<{ readonly page: SheetPage; readonly named: ReadonlySet<string> }[]> {
  const asked = pages
    .filter(({ sheet }) => there.has(sheet))
    .map((page) => ({
      page,
      names: context.workbook.worksheets.getItem(page.sheet).names.load('items/name'),
    }))
  if (asked.length > 0) await sync()
  return asked.map(({ page, names }) => ({ page, named: new Set(names.items.map(({ name }) => name)) }))
}

/** The steps that take a sheet away again. */
const discarding = ({ sheet, outOfSight }: NonNullable<Journal['created']>): Step[] => [
  ...(outOfSight
    ? [
        // the host deletes none that is kept out of its lists
        step(({ workbook }) => void (workbook.worksheets.getItem(sheet).visibility = 'Hidden')),
      ]
    : []),
  step(({ workbook }) => workbook.worksheets.getItem(sheet).delete()),
]

/** Whether a cell holds neither its old entry nor the write's although time has passed: a user came in between, and it stays. */
function userCame(
  { typed, after }: Ground,
  now: Survey | undefined,
  r: number,
  c: number,
  careful: boolean,
): boolean {
  const found = now?.typed[r]?.[c]
  const written = after ? after[r]?.[c] : ''
  if (!careful || found === typed[r]?.[c] || found === written) return false
  if (isFormula(found) && isFormula(written) && sameFormula(String(found), String(written))) return false
  // a link just set shows where it leads until the cell's text is written over it
  const link = now?.links.find(({ row, column }) => row === r && column === c)?.target
  return !link || found !== typedText(link.documentReference ?? link.address ?? '')
}

/**
 * The cells of a ground that no longer hold what they held, in the rows from the first such to the last.
 * @param careful leaves alone what is neither the old entry nor the write's
 * @param links   cells to be put back in any case
 */
function difference(
  ground: Ground,
  now: Survey | undefined,
  careful: boolean,
  links: readonly LinkedCell[],
): Mending[] {
  const { typed, formats, area } = ground
  const linked = new Set(
    links.flatMap((cell) => {
      const at = overlap(area, cell.area)
      return at ? [at.row - area.row] : []
    }),
  )
  const stays = (r: number, c: number) => userCame(ground, now, r, c, careful)
  const alters = typed.map(
    (row, r) =>
      linked.has(r) ||
      row.some(
        (entry, c) =>
          !stays(r, c) &&
          (entry !== now?.typed[r]?.[c] || (formats !== null && formats[r]?.[c] !== now.formats[r]?.[c])),
      ),
  )
  const from = alters.indexOf(true)
  if (from < 0) return []
  const to = alters.lastIndexOf(true) + 1
  const mended = <T>(cells: readonly (readonly T[])[]) =>
    cells.slice(from, to).map((row, k) => row.map((cell, c) => (stays(from + k, c) ? null : cell)))
  return [{ area: rowsOf(area, from, to - from), typed: mended(typed), formats: formats && mended(formats) }]
}

/** Whether a sheet the write made holds nothing but what the write put there. */
async function holdsOnly(
  { context, sync }: Request,
  { sheet, filled }: { readonly sheet: string; readonly filled: readonly Area[] },
): Promise<boolean> {
  const used = context.workbook.worksheets.getItem(sheet).getUsedRangeOrNullObject(true)
  used.load('rowIndex,columnIndex,rowCount,columnCount')
  await sync()
  if (used.isNullObject) return true
  const bottom = used.rowIndex + used.rowCount
  const right = used.columnIndex + used.columnCount
  // one frame around all that was filled is close enough: the write began on an empty sheet
  return (
    filled.length > 0 &&
    used.rowIndex >= Math.min(...filled.map(({ row }) => row)) &&
    used.columnIndex >= Math.min(...filled.map(({ column }) => column)) &&
    bottom <= Math.max(...filled.map(({ row, rows }) => row + rows)) &&
    right <= Math.max(...filled.map(({ column, columns }) => column + columns))
  )
}

/** The steps that make a name refer to something, or to be gone. */
export function nameSteps(name: string, refersTo: string | null, exists: boolean): Step[] {
  if (!exists) {
    if (refersTo === null) return []
    return [
      step(({ workbook }) => {
        const item = workbook.names.add(name, refersTo)
        // the user's list of names is for those that say something to a user
        if (name.startsWith(FOLD_PREFIX)) item.visible = false
      }),
    ]
  }
  return [
    step(({ workbook }) => {
      const item = workbook.names.getItem(name)
      if (refersTo === null) item.delete()
      else item.formula = refersTo
    }),
  ]
}

/** The steps that give a setting a value, or remove it. */
export function settingSteps(key: string, value: Json, exists: boolean): Step[] {
  if (value === null) {
    return exists ? [step(({ workbook }) => workbook.settings.getItem(key).delete())] : []
  }
  return [
    { bytes: JSON.stringify(value).length, run: ({ workbook }) => void workbook.settings.add(key, value) },
  ]
}
