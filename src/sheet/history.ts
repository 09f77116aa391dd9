import { Fault } from '../core'
import type { Area, CellValue } from './cells'
import { addressOf } from './cells'
import { historyBlock } from './history-block'
import { recordHash, recordTable, snapshotFrom } from './history-record'
import type { Snapshot, SnapshotHead } from './snapshot'
import { headOf } from './snapshot'
import type { Table } from './table'
import { textCell } from './table'
import type { Json, Patch, Seen, Want, Workbook, WritePlan } from './workbook'
import { countOf, dateText, listOf, quote } from './wording'

export { growthBetween, remakeFrom } from './history-data'
export { MOST_KEPT, snapshotOf } from './snapshot'

/** What a new sheet of dated blocks is called; of further books "Kept results 2" and so on. (The host keeps the name "History" to itself.) */
const SHEET = 'Kept results'

interface Entry {
  readonly head: SnapshotHead
  /** of the cells of its record */
  readonly hash: string
}

/**
 * The results of one book that are kept with its workbook. Each lies in two places, found again by names that follow inserted rows and renamed
 * sheets: as a block to be read on a sheet of the book's own, and as a record, which alone is read back, on a sheet out of sight. The list of them
 * stands in the workbook's settings with a hash of each record, so that an edited record is refused instead of read.
 *
 * A block is a print of its time and is never read. Where a user has typed into one it is left standing, whatever becomes of its result.
 */
export class History {
  /** what of the saved list could not be read, as a sentence */
  unread: string | null = null
  /** what the last `keep` or `remove` left standing of an earlier block, as a sentence */
  left: string | null = null
  readonly #workbook: Workbook
  readonly #book: string
  #kept: readonly Entry[] = []
  #next = 1
  /** where the blocks lay last, for the case that all of them are gone */
  #sheet: string | null = null

  /** @param book its id */
  constructor(workbook: Workbook, book: string) {
    this.#workbook = workbook
    this.#book = book
  }

  /** What is kept, oldest first; one that took the place of another stands in its place. */
  get heads(): readonly SnapshotHead[] {
    return this.#kept.map(({ head }) => head)
  }

  /** The id of the next result. */
  get nextId(): string {
    return String(this.#next)
  }

  /** Takes the list as it was saved with the workbook; an entry that does not read is left out, and `unread` says so. */
  open(saved: Json | undefined): void {
    const { next, sheet, kept } = listFrom(saved)
    this.#kept = kept.filter((entry) => entry !== null)
    const lost = kept.length - this.#kept.length
    this.unread =
      lost > 0
        ? `${countOf(lost, 'kept result')} of book ${this.#book} could not be read from the settings saved with this workbook and ${lost === 1 ? 'is' : 'are'} left out of the list.`
        : null
    this.#sheet = sheet
    // an id is not used twice, whatever has become of the count
    this.#next = Math.max(next, 1, ...this.#kept.map(({ head }) => Number(head.id) + 1))
  }

  /** The latest kept result of the same data date; null where there is none, or no date. */
  sameDate(dataDate: number | null): SnapshotHead | null {
    return dataDate === null ? null : (this.heads.filter((head) => head.dataDate === dataDate).at(-1) ?? null)
  }

  /**
   * Keeps a result: its block below all that is on the sheet, its record, and the list, in one write that happens whole or not at all. (Before the
   * first, a write of its own makes the sheet out of sight; where the first fails that sheet stays, with nothing on it.)
   *
   * One that takes the place of another is laid where that lay, where it finds room, and else below all; the block of the other is cleared unless
   * a user typed into it.
   *
   * @param replaces id of the result whose place it takes
   * @returns        where its block lies
   * @throws Fault   what writing throws; "missing" where there is no result to be replaced
   * @cost           O(holdings), with correlations O(holdings^2) / 2 numbers; earlier blocks are not written again
   */
  async keep(snapshot: Snapshot, replaces: string | null): Promise<Area> {
    const old = replaces === null ? null : this.#entry(replaces)
    if (this.#kept.some(({ head }) => head.id === snapshot.id))
      throw new Error(`there is a kept result ${snapshot.id} already`)
    const [block, record] = [historyBlock(snapshot), recordTable(snapshot)]
    const entry = { head: headOf(snapshot), hash: await recordHash(valuesOf(record)) }
    const place = await this.#place(old)
    const kept = old ? this.#kept.map((other) => (other === old ? entry : other)) : [...this.#kept, entry]
    const next = Math.max(this.#next, Number(snapshot.id) + 1)
    const plan = (patches: readonly Patch[], blockAt: Area, recordAt: Area): WritePlan => ({
      ...(place.isNew ? { sheet: place.sheet } : {}),
      patches,
      keep: {
        ...(old ? this.#names(old.head.id, null, null) : {}),
        ...this.#names(snapshot.id, filled(blockAt, block), filled(recordAt, record)),
      },
      remember: { [this.#key]: listToJson(next, place.sheet, kept) },
    })
    const patch = (at: Area, table: Table, ours: Area | null): Patch => ({
      at,
      table,
      over: 'blank',
      ...(ours ? { ours } : {}),
    })
    const areas = await this.#firstThatFits([
      // where the other one lay
      ...((place.oldBlock ?? place.oldRecord)
        ? [
            () => {
              const [at, from] = [place.oldBlock ?? place.blockEnd, place.oldRecord ?? place.recordEnd]
              return plan([patch(at, block, place.oldBlock), patch(from, record, place.oldRecord)], at, from)
            },
          ]
        : []),
      () =>
        plan(
          [
            patch(place.blockEnd, block, null),
            patch(place.recordEnd, record, null),
            ...[place.oldBlock, place.oldRecord].flatMap((area) => (area ? [clearing(area)] : [])),
          ],
          place.blockEnd,
          place.recordEnd,
        ),
    ])
    this.#kept = kept
    this.#next = next
    this.#sheet = place.sheet
    this.left = place.left
    return areas[0]!
  }

  /**
   * Reads a kept result back, to the last bit.
   *
   * @throws Fault "missing" where its record is gone, "changed" where it was edited
   */
  async read(id: string): Promise<Snapshot> {
    const entry = this.#entry(id)
    const [seen = null] = await this.#workbook.look([{ at: { kept: this.#recordName(id) } }])
    return this.#readAt(entry, seen)
  }

  /**
   * Takes a result out of the list and its record away. Its block is cleared, unless something else was typed into it.
   *
   * @returns what was left standing, as a sentence, or null
   */
  async remove(id: string): Promise<string | null> {
    const entry = this.#entry(id)
    const [block = null, record = null] = await this.#workbook.look(this.#wants(id))
    const own = await this.#untouched(entry, block, record)
    const kept = this.#kept.filter((other) => other !== entry)
    await this.#workbook.write({
      patches: [own, record?.area].flatMap((area) => (area ? [clearing(area)] : [])),
      keep: this.#names(id, null, null),
      remember: { [this.#key]: listToJson(this.#next, this.#sheet, kept) },
    })
    this.#kept = kept
    this.left = leftOf(entry, block, own)
    return this.left
  }

  /** What of the kept results is not in the workbook any more, as sentences. */
  async check(): Promise<readonly string[]> {
    if (this.#kept.length === 0) return []
    const seen = await this.#workbook.look(this.#kept.flatMap(({ head }) => this.#wants(head.id)))
    const lost = (which: 0 | 1): readonly string[] =>
      this.#kept.flatMap(({ head }, k) => (seen[2 * k + which] ? [] : [titleOf(head)]))
    const [blocks, records] = [lost(0), lost(1)]
    return [
      ...(blocks.length > 0
        ? [
            `${capital(listOf(blocks))}: the rows on the sheet of kept results were deleted, or the sheet with them; what is compared lies elsewhere and is ${records.length > 0 ? 'told of apart' : 'still there'}.`,
          ]
        : []),
      ...(records.length > 0
        ? [
            `${listOf(records)}: the record is not in this workbook any more, so nothing can be compared with it.`,
          ]
        : []),
    ]
  }

  /** What takes all records, names and the list away; blocks stay, as they are the user's to read. */
  async forget(): Promise<WritePlan> {
    const seen = await this.#workbook.look(
      this.#kept.map(({ head }) => ({ at: { kept: this.#recordName(head.id) } })),
    )
    return {
      patches: seen.flatMap((found) => (found ? [clearing(found.area)] : [])),
      keep: Object.assign(
        {},
        ...this.#kept.map(({ head }) => this.#names(head.id, null, null)),
      ) as NonNullable<WritePlan['keep']>,
      remember: { [this.#key]: null },
    }
  }

  get #key(): string {
    return `history.${this.#book}`
  }

  #recordName(id: string): string {
    return `${this.#book}_record_${id}`
  }

  #blockName(id: string): string {
    return `${this.#book}_kept_${id}`
  }

  #names(id: string, block: Area | null, record: Area | null): NonNullable<WritePlan['keep']> {
    return { [this.#blockName(id)]: block, [this.#recordName(id)]: record }
  }

  /** The block, with what stands in it, and the record of a result. */
  #wants(id: string): readonly [block: Want, record: Want] {
    return [{ at: { kept: this.#blockName(id) }, formulas: true }, { at: { kept: this.#recordName(id) } }]
  }

  #entry(id: string): Entry {
    const entry = this.#kept.find(({ head }) => head.id === id)
    if (entry) return entry
    throw new Fault('missing', `there is no kept result ${id}`, 'choose one of those listed', {
      argument: 'history',
    })
  }

  async #readAt({ head, hash }: Entry, seen: Seen | null): Promise<Snapshot> {
    if (!seen)
      throw new Fault(
        'missing',
        `the record of ${titleOf(head)} is not in this workbook any more`,
        'choose another result, or remove this one',
        { argument: 'history' },
      )
    const { values } = await this.#workbook.read(seen.area)
    const snapshot = (await recordHash(values)) === hash ? snapshotFrom(values) : null
    if (snapshot) return snapshot
    throw new Fault(
      'changed',
      `the record of ${titleOf(head)} in ${addressOf(seen.area)} is not as it was kept`,
      'choose another result, or remove this one',
      { argument: 'history' },
    )
  }

  /** Where a block lies that holds what was written and nothing else; null where it does not, or nobody can tell. */
  async #untouched(entry: Entry, block: Seen | null, record: Seen | null): Promise<Area | null> {
    if (!block) return null
    try {
      return standsIn(block, historyBlock(await this.#readAt(entry, record))) ? block.area : null
    } catch (fault) {
      if (!(fault instanceof Fault) || (fault.code !== 'missing' && fault.code !== 'changed')) throw fault
      return null
    }
  }

  /** Where a result can go: the sheet of blocks, the first free rows there and among the records, and what it may be laid over. */
  async #place(old: Entry | null): Promise<{
    readonly sheet: string
    readonly isNew: boolean
    readonly blockEnd: Area
    readonly recordEnd: Area
    readonly oldBlock: Area | null
    readonly oldRecord: Area | null
    readonly left: string | null
  }> {
    const records = `Counterpoise results ${this.#book}`
    const [recordsSheet = null, lastSheet = null, ...seen] = await this.#workbook.look([
      { at: cornerOf(records) },
      { at: cornerOf(this.#sheet ?? SHEET) },
      ...this.#kept.flatMap(({ head }) => this.#wants(head.id)),
    ])
    const located = (which: 0 | 1): Seen | null =>
      seen.filter((found, k) => k % 2 === which && found !== null).at(-1) ?? null
    const known = located(0) ?? (this.#sheet === null ? null : lastSheet)
    const sheet = known?.area.sheet ?? (await this.#freeSheet())
    const ofRecords = located(1)?.area.sheet ?? records
    if (known?.protected)
      throw new Fault(
        'protected',
        `the sheet ${quote(sheet)} is protected`,
        'take its protection off, or choose to keep it later',
      )
    if (ofRecords === records && !recordsSheet)
      await this.#workbook.write({ sheet: records, outOfSight: true, patches: [] })
    const at = old ? 2 * this.#kept.indexOf(old) : -2
    const [oldBlock, oldRecord] = [seen[at] ?? null, seen[at + 1] ?? null]
    const own = old && (await this.#untouched(old, oldBlock, oldRecord))
    return {
      sheet,
      isNew: known === null,
      // a block ends in two blank rows, which nothing fills
      blockEnd: await this.#endOf(sheet, known === null ? null : 2),
      recordEnd: await this.#endOf(ofRecords, recordsSheet || ofRecords !== records ? 1 : null),
      oldBlock: own,
      oldRecord: oldRecord?.area ?? null,
      left: old && leftOf(old, oldBlock, own),
    }
  }

  /** The corner so many rows below all that is filled on a sheet; its first cell where nothing is. */
  async #endOf(sheet: string, apart: number | null): Promise<Area> {
    const corner = cornerOf(sheet)
    if (apart === null) return corner
    try {
      // a whole column comes back cut to the rows in use, whichever columns they are used in
      const { area } = await this.#workbook.read({ ...corner, rows: ROWS })
      return { ...corner, row: area.row + area.rows + apart }
    } catch (fault) {
      if (fault instanceof Fault && fault.code === 'selection') return corner
      throw fault
    }
  }

  async #freeSheet(): Promise<string> {
    for (let k = 1; ; k++) {
      const sheet = k === 1 ? SHEET : `${SHEET} ${k}`
      const [there] = await this.#workbook.look([{ at: cornerOf(sheet) }])
      if (!there) return sheet
    }
  }

  /** Writes the first plan that meets no cells of others. */
  async #firstThatFits(plans: readonly (() => WritePlan)[]): Promise<readonly Area[]> {
    for (const [k, plan] of plans.entries())
      try {
        return await this.#workbook.write(plan())
      } catch (fault) {
        const isLast = k === plans.length - 1
        if (isLast || !(fault instanceof Fault) || fault.code !== 'occupied') throw fault
      }
    return []
  }
}

/** Rows of a worksheet. */
const ROWS = 1_048_576

const cornerOf = (sheet: string): Area => ({ sheet, row: 0, column: 0, rows: 1, columns: 1 })

const filled = (at: Area, { cells, widths }: Table): Area => ({
  ...at,
  rows: cells.length,
  columns: widths.length,
})

const valuesOf = ({ cells }: Table) => cells.map((row) => row.map(({ value }) => value))

/** Takes away what stands in an area of ours. */
const clearing = (area: Area): Patch => ({
  at: area,
  table: { cells: [[textCell('')]], widths: [0], numeric: [false] },
  over: 'blank',
  ours: area,
})

const titleOf = ({ keptOn, dataDate, title }: SnapshotHead): string =>
  `the result of ${quote(title)} kept on ${dateText(keptOn)}${dataDate === null ? '' : ` (data to ${dateText(dataDate)})`}`

/** @param own where its block may be written over */
const leftOf = ({ head }: Entry, block: Seen | null, own: Area | null): string | null =>
  block && !own
    ? `What stands in ${addressOf(block.area)} of ${titleOf(head)} is left there: it is not as it was written.`
    : null

const capital = (sentence: string): string => sentence.charAt(0).toUpperCase() + sentence.slice(1)

/** Whether a table stands in what a look saw; rows that are blank at the end do not count, as more may have been inserted there. */
function standsIn({ formulas = [], area }: Seen, table: Table): boolean {
  const theirs = withoutBlankEnd(formulas)
  const ours = withoutBlankEnd(valuesOf(table))
  return (
    area.columns === table.widths.length &&
    theirs.length === ours.length &&
    theirs.every((row, r) =>
      row.every((typed, c) => {
        const value = ours[r]?.[c]
        // a text that begins like a formula may come back behind an apostrophe
        return typed === value || (typeof value === 'string' && typed === `'${value}`)
      }),
    )
  )
}

function withoutBlankEnd(rows: readonly (readonly CellValue[])[]): readonly (readonly CellValue[])[] {
  let end = rows.length
  while (end > 0 && rows[end - 1]?.every((value) => value === '')) end--
  return rows.slice(0, end)
}

// ---- the list as it is saved

const listToJson = (next: number, sheet: string | null, kept: readonly Entry[]): Json => ({
  next,
  sheet,
  kept: kept.map(({ head, hash }) => ({ ...head, hash })),
})

/** The list as saved; null stands for an entry that does not read, as anyone may have edited it. */
function listFrom(saved: Json | undefined): {
  readonly next: number
  readonly sheet: string | null
  readonly kept: readonly (Entry | null)[]
} {
  const { next, sheet, kept } = treeOf(saved)
  return {
    next: typeof next === 'number' && Number.isInteger(next) ? next : 1,
    sheet: typeof sheet === 'string' && sheet !== '' ? sheet : null,
    kept: Array.isArray(kept) ? (kept as readonly Json[]).map(entryFrom) : [],
  }
}

function entryFrom(saved: Json): Entry | null {
  const tree = treeOf(saved)
  const { id, title, note, hash, inputsHash, keptOn, volatility, periodsPerYear, positions } = tree
  const { dataDate, trackingError } = tree
  const isNumber = (value: Json | undefined): value is number =>
    typeof value === 'number' && Number.isFinite(value)
  const isText = (value: Json | undefined): value is string => typeof value === 'string'
  if (!isText(id) || !/^[1-9]\d*$/.test(id)) return null
  if (!isText(title) || !isText(note) || !isText(hash) || !isText(inputsHash)) return null
  if (!isNumber(keptOn) || !isNumber(volatility) || !isNumber(positions)) return null
  if (!isNumber(periodsPerYear) || periodsPerYear <= 0) return null
  if (dataDate !== null && !isNumber(dataDate)) return null
  if (trackingError !== null && !isNumber(trackingError)) return null
  const head = { id, title, note, keptOn, dataDate, volatility, trackingError, periodsPerYear, positions, inputsHash } // prettier-ignore
  return { head, hash }
}

const treeOf = (json: Json | undefined): { readonly [key: string]: Json } =>
  typeof json === 'object' && json !== null && !Array.isArray(json)
    ? (json as { readonly [key: string]: Json })
    : {}
