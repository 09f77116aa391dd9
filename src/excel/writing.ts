import { Fault } from '../core'
import {
  addressOf,
  cellOf,
  countOf,
  isBlank,
  isFormula,
  overlap,
  quote,
  sameArea,
  sameFormula,
  type Area,
  type CellValue,
  type Json,
  type Patch,
  type Recovery,
  type Table,
  type TableCell,
  type WritePlan,
} from '../sheet'
import { askBars, barsOf, drawBar, sameBars } from './bars'
import { asSetting, askCharts, chartSteps, drawnIn, NO_REDRAWING, redrawing } from './charts'
import { entryStep, groundOf, runsOf, surveyRuns, type Run } from './entries'
import { absoluteReference, areasIn, SHEET_COLUMNS, SHEET_ROWS, without } from './addresses'
import {
  asText,
  bytesOf,
  DRAWN_KEY,
  JOURNAL_KEY,
  nameSteps,
  perform,
  restore,
  resultsOf,
  SETTING_PREFIX,
  settingSteps,
  slabs,
  step,
  surveyGrounds,
  type Ground,
  type Journal,
  type Step,
  type Survey,
  typedText,
} from './journal'
import { askLinkedCells, askPlainFont, linkSteps, linksOf } from './links'
import { dress, looksOf, pointsOf, surveyLooks, undress, unrule } from './looks'
import { askRefolding, fold, rememberedFolds, unfold, type Folding } from './outline'
import { askPage, pagesOf, pageStep } from './page'
import { askSpills, NAME_PREFIX, rangeOf } from './reading'
import {
  faultOf,
  isUndoRefused,
  offers,
  PROTECTED_NEEDS,
  REQUEST_BYTES,
  type Request,
  type Requests,
} from './requests'

/** Writes to the workbook: every plan happens whole or not at all. */
export interface Writer {
  write(plan: WritePlan): Promise<readonly Area[]>
  recall(): Promise<{ readonly [key: string]: Json }>
  recover(): Promise<Recovery | null>
}

/** A patch with the area it fills and what it clears of an earlier table. */
export interface Fill {
  readonly patch: Patch
  readonly target: Area
  readonly leftovers: readonly Area[]
}

export function openWriter(requests: Requests, expectEcho: (area: Area) => void): Writer {
  /** settings as last seen or set by us, by full key: lets a refresh journal them without asking */
  const known = new Map<string, Json>()
  /** a write could not be undone: its journal is still in the workbook and comes first */
  let unsettled = false
  /** whether the host may be asked to make each write one step of the user's undo */
  let oneUndo = true
  let last: Promise<unknown> = Promise.resolve()
  /** one write at a time: a second one would overwrite the first one's journal */
  const inTurn = <T>(work: () => Promise<T>): Promise<T> => {
    const turn = last.then(work, work)
    last = turn.catch(() => undefined)
    return turn
  }

  /** Does the steps, and puts everything back when that fails. */
  async function commit(
    request: Request,
    place: string,
    journal: Journal,
    steps: readonly Step[],
  ): Promise<void> {
    const { folding } = journal
    const head: Step = {
      bytes: bytesOf(JSON.stringify(journal)),
      run: ({ workbook }) => void workbook.settings.add(JOURNAL_KEY, journal),
    }
    const tail = step(({ workbook }) => workbook.settings.getItem(JOURNAL_KEY).delete())
    try {
      if (folding && folding.before.length > 0) {
        await perform(request, [head, ...steps], expectEcho)
        await unfold(requests, folding.before)
        await perform(request, [...foldSteps(folding), tail], expectEcho)
      } else {
        await perform(request, [head, ...steps, ...(folding ? foldSteps(folding) : []), tail], expectEcho)
      }
    } catch (error) {
      const fault = faultOf(error, place)
      unsettled = true
      try {
        // a failed batch may leave its context unusable, so this is a batch of its own
        await requests.run(place, (fresh) => restore(fresh, requests, journal, expectEcho, false))
      } catch (second) {
        throw withCause(
          new Fault(
            fault.code,
            `${fault.found}; putting back what stood there failed too (${faultOf(second, place).found})`,
            'close and reopen this workbook: what is left to put back is kept in it and is put back then',
          ),
          fault,
        )
      }
      unsettled = false
      throw withCause(
        new Fault(fault.code, `${fault.found} (nothing was changed)`, fault.needed, fault.where),
        fault,
      )
    }
  }

  function remembered(plan: WritePlan): void {
    for (const [key, value] of Object.entries(plan.remember ?? {})) known.set(SETTING_PREFIX + key, value)
  }

  async function refresh(plan: WritePlan, fills: readonly Fill[], place: string): Promise<void> {
    const remember = prefixed(SETTING_PREFIX, plan.remember)
    const journal: Journal = {
      created: null,
      grounds: fills.map(({ patch, target }) => ({
        area: target,
        typed: typedOf(patch.table, patch.seen ?? []),
        formats: null,
        after: afterOf(patch.table),
      })),
      looks: [],
      links: [],
      bars: { areas: [], before: [] },
      charts: NO_REDRAWING,
      pages: [],
      folding: null,
      widths: [],
      names: {},
      settings: Object.fromEntries(Object.keys(remember).map((key) => [key, known.get(key) ?? null])),
    }
    const steps = [
      ...fills.flatMap(({ patch, target }) => valueSteps(patch.table, target, patch.seen)),
      ...Object.entries(remember).flatMap(([key, value]) =>
        settingSteps(key, value, (known.get(key) ?? null) !== null),
      ),
    ]
    await requests.run(place, (request) => commit(request, place, journal, steps), { oneUndo })
  }

  async function lay(
    request: Request,
    plan: WritePlan,
    fills: readonly Fill[],
    runs: readonly Run[],
    place: string,
  ): Promise<void> {
    const { context, sync } = request
    const { worksheets, names, settings } = context.workbook
    const keep = prefixed(NAME_PREFIX, plan.keep)
    const remember = prefixed(SETTING_PREFIX, plan.remember)

    const sheetNames = new Set(
      fills.flatMap(({ target, leftovers }) => [target, ...leftovers].map(({ sheet }) => sheet)),
    )
    for (const { area } of runs) sheetNames.add(area.sheet)
    if (plan.sheet !== undefined) sheetNames.add(plan.sheet)
    const sheets = new Map(
      [...sheetNames].map((name) => {
        const sheet = worksheets.getItemOrNullObject(name)
        sheet.load('name')
        sheet.protection.load('protected')
        return [name, sheet]
      }),
    )
    const nameItems = Object.keys(keep).map(
      (name) => [name, names.getItemOrNullObject(name).load('formula')] as const,
    )
    const settingItems = Object.keys(remember).map(
      (key) => [key, settings.getItemOrNullObject(key).load('value')] as const,
    )
    names.load('items/name,items/formula')
    worksheets.load('items/name')
    const drawnItem = settings.getItemOrNullObject(DRAWN_KEY).load('value')
    const drawnOn = [...new Set(fills.map(({ target }) => target.sheet))].map(
      (sheet) => [sheet, askCharts(context, sheet)] as const,
    )
    const linked = fills.flatMap(({ patch, target }) => linksOf(patch.table, target).map(({ area }) => area))
    const plainFont = linked.length > 0 ? askPlainFont(context) : null
    await sync()

    const there = (sheet: string) => sheets.get(sheet)?.isNullObject === false
    const known = new Set(worksheets.items.map(({ name }) => name))
    const drawn = drawnIn(drawnItem.isNullObject ? null : drawnItem.value)
    const redrawn = redrawing(
      fills,
      drawn,
      new Map(drawnOn.map(([sheet, charts]) => [sheet, charts()])),
      (sheet) => known.has(sheet),
    )
    for (const { sheet } of [
      ...fills.map(({ target }) => target).filter((target) => target.sheet !== plan.sheet),
      ...runs.map(({ area }) => area),
    ]) {
      if (!there(sheet)) {
        throw new Fault('missing', `there is no sheet "${sheet}"`, 'choose a sheet of this workbook')
      }
    }
    for (const name of sheetNames) {
      if (there(name) && sheets.get(name)?.protection.protected) {
        throw new Fault('protected', `the sheet "${name}" is protected`, PROTECTED_NEEDS)
      }
    }
    const entered = await surveyRuns(request, runs, plan.entries ?? [])

    const onOld = fills
      .map(({ patch, target, leftovers }) => ({
        patch,
        target,
        areas: [target, ...leftovers].filter(({ sheet }) => there(sheet)),
      }))
      .filter(({ areas }) => areas.length > 0)
    const afterAt = (area: Area) => {
      const fill = fills.find(({ target }) => target === area)
      return fill ? afterOf(fill.patch.table) : null
    }
    const areas = onOld.flatMap((fill) => fill.areas)
    const askedBars = askBars(context, areas)
    const surveyed = await surveyGrounds(request, areas)
    const bars = await askedBars(sync)
    const refolding = askRefolding(context, fills, there, rememberedFolds(names.items))
    const spilled = await refuseObstacles(request, onOld, surveyed)
    const grounds = surveyed.map(({ area, typed, formats }): Ground => ({
      area,
      formats,
      after: afterAt(area),
      typed: typed.map((row, r) => row.map((entry, c) => (spilled(area, r, c) ? '' : entry))),
    }))
    const askedLinks = askLinkedCells(
      context,
      surveyed,
      linked.filter(({ sheet }) => there(sheet)),
    )
    const looks = await surveyLooks(request, areas)
    const links = askedLinks()
    const folding = refolding()

    const columns = fills.flatMap(({ patch, target }) =>
      patch.table.widths.map((characters, c) => {
        const area = { ...target, column: target.column + c, columns: 1 }
        const format = there(target.sheet) ? rangeOf(context, area).format.load('columnWidth') : null
        return { area, points: pointsOf(characters), format }
      }),
    )
    const pages = pagesOf(fills)
    const askedPages = pages
      .filter(({ area }) => there(area.sheet))
      .map(({ area }) => askPage(context, area.sheet))
    if (askedPages.length > 0 || columns.some(({ format }) => format)) await sync()
    // columns are only made wider: others may have cells in them
    const wider = columns.filter(({ format, points }) => !format || format.columnWidth < points)

    const makes = plan.sheet !== undefined && !there(plan.sheet) ? plan.sheet : null
    const journal: Journal = {
      created:
        makes === null
          ? null
          : {
              sheet: makes,
              filled: fills.filter(({ target }) => target.sheet === makes).map(({ target }) => target),
              outOfSight: plan.outOfSight === true,
            },
      grounds: [...entered.map(groundOf), ...grounds],
      looks,
      links,
      bars: { areas, before: bars.found },
      charts: redrawn?.work ?? NO_REDRAWING,
      pages: askedPages.map((page) => page()),
      folding: folding && { before: folding.before, after: folding.after },
      widths: wider.flatMap(({ area, format }) => (format ? [{ area, points: format.columnWidth }] : [])),
      names: Object.fromEntries([
        ...nameItems.map(([name, item]) => [name, item.isNullObject ? null : String(item.formula)] as const),
        ...(folding?.names ?? []).map(({ name, was }) => [name, was] as const),
      ]),
      settings: Object.fromEntries(
        [...settingItems, ...(redrawn ? [[DRAWN_KEY, drawnItem] as const] : [])].map(([key, item]) => [
          key,
          item.isNullObject ? null : (item.value as Json),
        ]),
      ),
    }

    const wanted = fills.flatMap(({ patch, target }) => barsOf(patch.table, target))
    const redraws = !sameBars(bars.found, wanted)
    const steps: Step[] = [
      ...entered.map(entryStep),
      ...(makes === null
        ? []
        : [
            step(({ workbook }) => {
              const sheet = workbook.worksheets.add(makes)
              if (plan.outOfSight) sheet.visibility = 'VeryHidden'
            }),
          ]),
      ...fills.flatMap(({ patch, target, leftovers }) => [
        ...leftovers
          .filter(({ sheet }) => there(sheet))
          .flatMap((area) => clearSteps(area, patch.ours ?? area)),
        ...linkSteps(links, { patch, target, leftovers }, plainFont),
        ...valueSteps(patch.table, target),
        step((queue) => undress(queue, target)),
        ...looksOf(patch.table, target).map((look) => step((queue) => dress(queue, look))),
      ]),
      ...(redraws ? [step(bars.remove), ...wanted.map((bar) => step((queue) => drawBar(queue, bar)))] : []),
      ...wider.map(({ area, points }) =>
        step((queue) => void (rangeOf(queue, area).format.columnWidth = points)),
      ),
      ...(redrawn ? chartSteps(redrawn.work) : []),
      ...pages.map(pageStep),
      ...nameItems.flatMap(([name, item]) => {
        const area = keep[name] ?? null
        return nameSteps(name, area && absoluteReference(area), !item.isNullObject)
      }),
      ...(folding?.names ?? []).flatMap(({ name, was, is }) =>
        nameSteps(name, is && absoluteReference(is), was !== null),
      ),
      ...settingItems.flatMap(([key, item]) => settingSteps(key, remember[key] ?? null, !item.isNullObject)),
      ...(redrawn ? settingSteps(DRAWN_KEY, asSetting(redrawn.drawn), !drawnItem.isNullObject) : []),
    ]
    await commit(request, place, journal, steps)
  }

  async function change(plan: WritePlan, fills: readonly Fill[], runs: readonly Run[]): Promise<void> {
    const [first] = [...fills.map(({ target }) => target), ...runs.map(({ area }) => area)]
    const place = first ? addressOf(first) : 'this workbook'
    if (!unsettled && runs.length === 0 && isRefresh(plan, fills, known)) return refresh(plan, fills, place)
    await requests.run(
      place,
      async (request) => {
        if (unsettled && (await settle(request))?.outcome === 'failed') {
          throw new Fault(
            'host',
            'an earlier write stopped half way and what stood there could not be put back yet',
            'close and reopen this workbook, then try again',
          )
        }
        await lay(request, plan, fills, runs, place)
      },
      // a host that cannot undo a change of visibility would refuse the whole
      { oneUndo: oneUndo && !plan.outOfSight },
    )
  }

  async function settle(request: Request): Promise<Recovery | null> {
    const item = request.context.workbook.settings.getItemOrNullObject(JOURNAL_KEY).load('value')
    await request.sync()
    if (item.isNullObject) return null
    let areas: Area[] = []
    try {
      // anyone may have edited it: what cannot be read as a journal is one that cannot be put back
      const journal = item.value as Journal
      areas = [...journal.grounds.map(({ area }) => area), ...(journal.created?.filled ?? [])]
      await restore(request, requests, journal, expectEcho, true)
    } catch {
      unsettled = true
      return { outcome: 'failed', areas }
    }
    unsettled = false
    known.clear()
    return { outcome: 'restored', areas }
  }

  return {
    write: (plan) =>
      inTurn(async () => {
        const fills = plan.patches.map(fillOf)
        const runs = runsOf(plan.entries ?? [])
        refuseMeeting(fills, runs)
        try {
          await change(plan, fills, runs)
        } catch (fault) {
          if (!oneUndo || !isUndoRefused(fault)) throw fault
          // nothing was changed: the same again, in as many steps of undo as the host makes of it
          oneUndo = false
          await change(plan, fills, runs)
        }
        remembered(plan)
        return fills.map(({ target }) => target)
      }),

    recall: () =>
      requests.run('the settings of this workbook', async ({ context, sync }) => {
        const { settings } = context.workbook
        settings.load('items/key,items/value')
        await sync()
        known.clear()
        for (const { key, value } of settings.items) {
          if (key.startsWith(SETTING_PREFIX) && key !== JOURNAL_KEY && key !== DRAWN_KEY)
            known.set(key, value as Json)
        }
        return Object.fromEntries([...known].map(([key, value]) => [key.slice(SETTING_PREFIX.length), value]))
      }),

    recover: () => inTurn(() => requests.run('this workbook', settle)),
  }
}

/** A cell in a table to be written, or in one to be cleared, has no value of its own. */
function refuseMeeting(fills: readonly Fill[], runs: readonly Run[]): void {
  for (const { area } of runs)
    for (const { target, leftovers } of fills) {
      const met = [target, ...leftovers].map((place) => overlap(place, area)).find((found) => found !== null)
      if (met) {
        throw new Fault(
          'occupied',
          `${addressOf(met)} lies where the table goes`,
          'choose another place for the table',
        )
      }
    }
}

const withCause = (fault: Fault, cause: Fault): Fault => Object.assign(fault, { cause })

const prefixed = <T>(prefix: string, record: { readonly [key: string]: T } = {}): { [key: string]: T } =>
  Object.fromEntries(Object.entries(record).map(([key, value]) => [prefix + key, value]))

function fillOf(patch: Patch): Fill {
  const { table, at, ours } = patch
  const target: Area = { ...at, rows: table.cells.length, columns: table.cells[0]?.length ?? 0 }
  if (target.row + target.rows > SHEET_ROWS || target.column + target.columns > SHEET_COLUMNS) {
    throw new Fault(
      'selection',
      `the table of ${target.rows} rows and ${target.columns} columns would reach over the end of the sheet`,
      'choose a place further up or to the left',
    )
  }
  table.cells.forEach((row, r) =>
    row.forEach(({ value }, c) => {
      if (typeof value === 'number' && !Number.isFinite(value)) {
        throw new Fault(
          'not-a-number',
          `${addressOf(cellOf(target, r, c))} would hold ${value}`,
          'a finite number is needed',
        )
      }
    }),
  )
  return { patch, target, leftovers: ours ? without(ours, target) : [] }
}

/** Whether a plan only sends new values into tables seen a moment ago, small enough for one request. */
function isRefresh(plan: WritePlan, fills: readonly Fill[], known: ReadonlyMap<string, Json>): boolean {
  if (plan.sheet !== undefined || Object.keys(plan.keep ?? {}).length > 0 || fills.length === 0) return false
  if (!Object.keys(plan.remember ?? {}).every((key) => known.has(SETTING_PREFIX + key))) return false
  const seen = fills.every(
    ({ patch: { seen, ours }, target }) =>
      seen?.length === target.rows &&
      ours &&
      sameArea(ours, target) &&
      seen.every((row) => row.length === target.columns),
  )
  // new values, and in the journal the old ones
  return seen && 2 * sizeOf(fills.map(({ patch }) => patch.table)) < REQUEST_BYTES
}

const sizeOf = (tables: readonly Table[]): number =>
  tables.reduce(
    (sum, table) => sum + slabs(entriesOf(table)).reduce((inner, [, , bytes]) => inner + bytes, 0),
    0,
  )

/** What is sent for a cell. */
const entryOf = ({ value, formula }: TableCell): CellValue =>
  formula ?? (typeof value === 'string' ? asText(value) : value)

const entriesOf = (table: Table): CellValue[][] => table.cells.map((row) => row.map(entryOf))

const isText = ({ value, formula }: TableCell): boolean =>
  formula === undefined && typeof value === 'string' && value !== ''

const afterOf = (table: Table): CellValue[][] =>
  table.cells.map((row) =>
    row.map(({ value, formula }) => formula ?? (typeof value === 'string' ? typedText(value) : value)),
  )

/** What stood in a table of ours, as a journal keeps it: under a text of ours stands text, elsewhere a formula may. */
const typedOf = (table: Table, seen: readonly (readonly CellValue[])[]): CellValue[][] =>
  seen.map((row, r) =>
    row.map((entry, c) => {
      if (typeof entry !== 'string' || entry === '') return entry
      const ours = table.cells[r]?.[c]
      return (ours && isText(ours)) || !entry.startsWith('=') ? typedText(entry) : entry
    }),
  )

/**
 * The steps that fill cells. A text goes into a cell made '@' in the same request, just before, so whatever it begins with and whatever
 * the user did to the cell's format, it stays text. A blank among formulas clears its cell, so that one of them may fill it.
 *
 * @param seen what stands there, when only what differs from it is to be sent: then formats stay, but for texts, and so do formulas that stand
 */
function valueSteps(table: Table, target: Area, seen?: readonly (readonly CellValue[])[]): Step[] {
  const hasFormulas = table.cells.some((row) => row.some(({ formula }) => formula !== undefined))
  const entries = table.cells.map((row, r) =>
    row.map((cell, c) => {
      const typed = seen?.[r]?.[c]
      const stands =
        cell.formula !== undefined && isFormula(typed) && sameFormula(cell.formula, String(typed))
      return stands ? null : entryOf(cell)
    }),
  )
  const formats = table.cells.map((row) =>
    row.map((cell) => (isText(cell) ? '@' : seen ? null : cell.format)),
  )
  return slabs(entries, formats).map(([from, rows, bytes]) => {
    const place = { ...target, row: target.row + from, rows }
    return {
      bytes,
      touches: place,
      run(context) {
        const range = rangeOf(context, place)
        range.numberFormat = formats.slice(from, from + rows)
        range[hasFormulas ? 'formulas' : 'values'] = entries.slice(from, from + rows)
      },
    }
  })
}

const clearSteps = (area: Area, ours: Area): Step[] => [
  step((context) => {
    const range = rangeOf(context, area)
    range.clear('Contents')
    range.numberFormat = Array.from({ length: area.rows }, () => Array<string>(area.columns).fill('General'))
    undress(context, area)
    unrule(context, area, ours)
  }, area),
]

const foldSteps = ({ after }: Folding): Step[] =>
  after.map((area) => step((context) => fold(context, [area])))

/**
 * Refuses to write over what must stay: foreign cells where the user has not agreed, merged cells, results that a formula elsewhere spills.
 *
 * @returns whether a cell of a surveyed area shows a result spilled from another cell of it: putting back the formula brings it back
 */
async function refuseObstacles(
  { context, sync }: Request,
  fills: readonly { readonly patch: Patch; readonly target: Area; readonly areas: readonly Area[] }[],
  surveyed: readonly Survey[],
): Promise<(area: Area, row: number, column: number) => boolean> {
  for (const { patch, target } of fills) {
    const ground = surveyed.find(({ area }) => sameArea(area, target))
    if (patch.over === 'blank' && ground) refuseForeign(ground, patch.ours)
  }

  const asked = surveyed.map((ground) => {
    const range = rangeOf(context, ground.area)
    range.load('hasSpill')
    const merged = offers('1.13') ? range.getMergedAreasOrNullObject() : null
    merged?.load('address')
    return { ground, range, merged }
  })
  await sync()

  for (const { ground, merged } of asked) {
    if (!merged || merged.isNullObject) continue
    const [first] = areasIn(merged.address, ground.area.sheet)
    throw new Fault(
      'occupied',
      `${first ? addressOf(first) : merged.address} is merged and in the way of the table`,
      'unmerge it or choose another place',
    )
  }

  // `hasSpill` is null where some cells have it; a formula spills down and right only, so from outside through the first row or column
  const spilling = asked.flatMap(({ ground, range }) => {
    if (range.hasSpill === false) return []
    const { area } = ground
    const edge = ground.typed.flatMap((row, r) =>
      row.flatMap((_, c) => (r === 0 || c === 0 ? [cellOf(area, r, c)] : [])),
    )
    return [
      {
        area,
        parents: edge.map((cell) => {
          const found = rangeOf(context, cell).getSpillParentOrNullObject()
          found.load('address')
          return { cell, found }
        }),
        spills: askSpills(context, area, ground.typed),
      },
    ]
  })
  if (spilling.length === 0) return () => false
  await sync()

  for (const { area, parents } of spilling) {
    for (const { cell, found } of parents) {
      const parent = found.isNullObject ? null : areasIn(found.address, area.sheet)[0]
      if (parent && !overlap(parent, area)) {
        throw new Fault(
          'occupied',
          `${addressOf(cell)} shows results of the formula in ${addressOf(parent)}`,
          'choose another place',
        )
      }
    }
  }
  return resultsOf(spilling.flatMap(({ spills }) => spills()))
}

function refuseForeign(ground: Survey, ours: Area | undefined): void {
  let first: Area | null = null
  let held: CellValue = ''
  let count = 0
  ground.typed.forEach((row, r) =>
    row.forEach((entry, c) => {
      const cell = cellOf(ground.area, r, c)
      if ((entry === '' && isBlank(ground.values[r]?.[c])) || (ours && overlap(cell, ours))) return
      if (!first) [first, held] = [cell, ground.values[r]?.[c] ?? entry]
      count++
    }),
  )
  if (!first) return
  throw new Fault(
    'occupied',
    `${addressOf(first)} is in the way of the table: it holds ${quote(held)}${count > 1 ? `, and ${countOf(count - 1, 'more cell')} ${count === 2 ? 'holds' : 'hold'} something` : ''}`,
    'an empty place is needed, or your word that it may be replaced',
  )
}
