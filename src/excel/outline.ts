import { Fault } from '../core'
import { addressOf, overlap, parseAddress, type Area, type Table } from '../sheet'
import { SHEET_COLUMNS } from './addresses'
import { NAME_PREFIX, rangeOf } from './reading'
import type { Requests } from './requests'
import type { Fill } from './writing'

/**
 * Rows that fold under those before them. The host groups whole rows and counts: each grouping makes them one level deeper, each
 * ungrouping one less deep, and nothing tells how deep they are. So the groups we make are remembered in hidden names, one for each run of
 * rows, which follow inserted rows and renamed sheets as the groups themselves do.
 *
 * The host draws the control that folds a run at the row below it, as its sheets do unless their user says otherwise; the add-in's
 * interface has no word about that.
 */
export const FOLD_PREFIX = `${NAME_PREFIX}fold_`

/** The host shows eight levels, of which the outermost is no fold: rows deeper than that fold with those above them. */
const DEEPEST = 7

/** Runs of rows grouped before a write and after it, the outer ones first. */
export interface Folding {
  readonly before: readonly Area[]
  readonly after: readonly Area[]
}

/** What a write does about groups of rows. */
export interface Refolding extends Folding {
  /** the names that remember them, by what they refer to before and after; null where there is none */
  readonly names: readonly { readonly name: string; readonly was: string | null; readonly is: Area | null }[]
}

/** A run of ours by the name that remembers it; null when its rows were deleted. */
export interface Fold {
  readonly name: string
  readonly refersTo: string
  readonly area: Area | null
}

/** The runs remembered in a workbook, of all its names. */
export const rememberedFolds = (names: readonly Excel.NamedItem[]): Fold[] =>
  names
    .filter(({ name }) => name.startsWith(FOLD_PREFIX))
    .map(({ name, formula }) => {
      const refersTo = String(formula)
      return { name, refersTo, area: parseAddress(refersTo.replace(/^=/, '')) }
    })

/**
 * The runs in which a table that fills `target` folds.
 */
function foldsOf({ levels = [] }: Table, target: Area): Area[] {
  const folds: Area[] = []
  for (let depth = 1; depth <= DEEPEST; depth++) {
    let from = 0
    levels.forEach((level, row) => {
      if (level < depth) from = row + 1
      else if ((levels[row + 1] ?? 0) < depth)
        folds.push({ ...target, row: target.row + from, rows: row + 1 - from })
    })
  }
  return folds
}

/**
 * Asks whether anything but a table stands in its rows that fold: those cells would be folded away with it. The answer is there after the
 * next sync.
 * @param table the columns that are the table's, now or before
 */
function askNeighbours(context: Excel.RequestContext, folds: readonly Area[], table: Area): () => boolean {
  const row = Math.min(...folds.map((fold) => fold.row))
  const rows = Math.max(...folds.map((fold) => fold.row + fold.rows)) - row
  const right = table.column + table.columns
  const sheet = context.workbook.worksheets.getItem(table.sheet)
  const beside = [
    ...(table.column > 0 ? [sheet.getRangeByIndexes(row, 0, rows, table.column)] : []),
    ...(right < SHEET_COLUMNS ? [sheet.getRangeByIndexes(row, right, rows, SHEET_COLUMNS - right)] : []),
  ].map((range) => {
    const used = range.getUsedRangeOrNullObject(true)
    used.load('address')
    return used
  })
  return () => beside.some((used) => !used.isNullObject)
}

/**
 * Asks what is to be done about groups of rows: those remembered under a table go, and its own come where nothing but the table stands in
 * the rows that fold. The answer is there after the next sync; null when groups stay as they are.
 */
export function askRefolding(
  context: Excel.RequestContext,
  fills: readonly Fill[],
  there: (sheet: string) => boolean,
  remembered: readonly Fold[],
): () => Refolding | null {
  const touched = fills.flatMap(({ target, leftovers }) => [target, ...leftovers])
  const old = remembered.filter(
    ({ area }) =>
      area === null || (there(area.sheet) && touched.some((place) => overlap(place, area) !== null)),
  )
  const wanted = fills.flatMap(({ patch: { table, ours }, target }) => {
    const folds = foldsOf(table, target)
    if (folds.length === 0) return []
    const others = fills.some(
      (fill) => fill.target !== target && folds.some((area) => meet(area, fill.target)),
    )
    if (others) return []
    return [
      { folds, crowded: there(target.sheet) ? askNeighbours(context, folds, spanOf(target, ours)) : null },
    ]
  })
  return () => {
    const after = wanted.flatMap(({ folds, crowded }) => (crowded?.() ? [] : folds))
    const before = old.flatMap(({ area }) => area ?? []).sort((a, b) => b.rows - a.rows)
    const listed = (areas: readonly Area[]) => areas.map(addressOf).sort().join()
    if (old.length === before.length && listed(before) === listed(after)) return null
    const kept = new Set(remembered.filter((known) => !old.includes(known)).map(({ name }) => name))
    const fresh: string[] = []
    for (let k = 1; fresh.length < after.length; k++)
      if (!kept.has(FOLD_PREFIX + k)) fresh.push(FOLD_PREFIX + k)
    const is = new Map(after.map((area, k) => [fresh[k] ?? '', area]))
    const was = new Map(old.map(({ name, refersTo }) => [name, refersTo]))
    return {
      before,
      after,
      names: [...new Set([...was.keys(), ...is.keys()])].map((name) => ({
        name,
        was: was.get(name) ?? null,
        is: is.get(name) ?? null,
      })),
    }
  }
}

/** The columns a table takes, with those it took before: they are its own as well. */
function spanOf(target: Area, ours: Area | undefined): Area {
  if (!ours || !overlap(target, ours)) return target
  const column = Math.min(target.column, ours.column)
  return {
    ...target,
    column,
    columns: Math.max(target.column + target.columns, ours.column + ours.columns) - column,
  }
}

const rowsOf = (context: Excel.RequestContext, area: Area): Excel.Range =>
  rangeOf(context, area).getEntireRow()

/** Groups runs, the outer ones first. */
export function fold(context: Excel.RequestContext, folds: readonly Area[]): void {
  for (const area of folds) rowsOf(context, area).group('ByRows' as Excel.GroupOption)
}

const placeOf = ([first]: readonly Area[]): string => (first ? addressOf(first) : 'this workbook')

/**
 * Takes our groups away and shows their rows, which stay hidden otherwise when they were folded. A user may have ungrouped some by hand;
 * the host refuses those then, and that is as good.
 */
export async function unfold(requests: Requests, folds: readonly Area[]): Promise<void> {
  try {
    await requests.run(placeOf(folds), async ({ context, sync }) => {
      for (const area of [...folds].reverse()) rowsOf(context, area).ungroup('ByRows' as Excel.GroupOption)
      await sync()
    })
  } catch (error) {
    if (!isRefusal(error)) throw error
    await flatten(requests, [folds])
  }
  await requests.run(placeOf(folds), async ({ context, sync }) => {
    for (const area of outermost(folds)) rowsOf(context, area).rowHidden = false
    await sync()
  })
}

/**
 * Puts grouping back as it was before a write that stopped anywhere in changing it. May be done twice. How far the write came cannot be
 * told, so a level of the user's own in those very rows may go with ours.
 */
export async function refold(requests: Requests, { before, after }: Folding): Promise<void> {
  await flatten(requests, [before, after])
  if (before.length === 0) return
  await requests.run(placeOf(before), async ({ context, sync }) => {
    fold(context, before)
    await sync()
  })
}

/**
 * Takes as many levels from the rows of runs as they may have of us, in requests of their own: a refusal ends a block of rows.
 * @param states the runs that may be grouped, one list or another
 */
async function flatten(requests: Requests, states: readonly (readonly Area[])[]): Promise<void> {
  for (const block of outermost(states.flat())) {
    const levels = Math.max(...states.map((folds) => deepest(folds.filter((area) => meet(area, block)))))
    for (let level = 0; level < levels; level++) {
      // asked twice, so that a passing fault is not taken for a refusal
      if (!(await ungroups(requests, block)) && !(await ungroups(requests, block))) break
    }
  }
}

async function ungroups(requests: Requests, area: Area): Promise<boolean> {
  try {
    await requests.run(addressOf(area), async ({ context, sync }) => {
      rowsOf(context, area).ungroup('ByRows' as Excel.GroupOption)
      await sync()
    })
    return true
  } catch (error) {
    if (isRefusal(error)) return false
    throw error
  }
}

const isRefusal = (error: unknown): boolean => error instanceof Fault && error.code === 'host'

const entireRow = (area: Area): Area => ({ ...area, column: 0, columns: 1 })

/** Whether two areas share a row. */
const meet = (a: Area, b: Area): boolean => overlap(entireRow(a), entireRow(b)) !== null

/** The rows of runs as blocks that do not overlap. */
function outermost(folds: readonly Area[]): Area[] {
  const blocks: Area[] = []
  for (const area of [...folds].sort((a, b) => a.row - b.row)) {
    const k = blocks.findIndex((block) => meet(block, area))
    const block = blocks[k]
    if (!block) blocks.push(area)
    else blocks[k] = { ...block, rows: Math.max(block.row + block.rows, area.row + area.rows) - block.row }
  }
  return blocks
}

/** The most runs that one row is in. */
const deepest = (folds: readonly Area[]): number =>
  Math.max(0, ...folds.map((area) => folds.filter((other) => meet({ ...area, rows: 1 }, other)).length))
