import type { Area, Block, CellValue, Culture } from './cells'
import type { Table } from './table'

/** What can be kept in a workbook's settings. */
export type Json = null | boolean | number | string | readonly Json[] | { readonly [key: string]: Json }

/** A thing to look at: a range kept under a name of ours (it follows inserted rows), or an area as it lies. */
export interface Want {
  readonly at: Area | { readonly kept: string }
  /** its values */
  readonly values?: boolean
  /** which rows are hidden, which cells merged */
  readonly shape?: boolean
  /** what was typed: formulas where there are some, constants elsewhere */
  readonly formulas?: boolean
  /** the filled cells around it without an empty row or column between: how appended rows are found */
  readonly region?: boolean
}

/** What a look found; null stands for a kept range that is gone (its cells or its sheet were deleted) and for a sheet that is not there. */
export interface Seen {
  readonly area: Area
  readonly values?: readonly (readonly CellValue[])[]
  readonly hiddenRows?: ReadonlySet<number>
  readonly merged?: readonly Area[]
  readonly formulas?: readonly (readonly CellValue[])[]
  /** where formulas were asked for: those in the area that fill several cells, and which; absent where there are none */
  readonly spilled?: readonly { readonly from: Area; readonly over: Area }[]
  readonly region?: Area
  /** whether its sheet is protected against writing */
  readonly protected: boolean
}

export interface ReadOptions {
  /** called with the share of cells read so far, 0 to 1 */
  readonly progress?: (share: number) => void
  readonly signal?: AbortSignal
  readonly shape?: boolean
}

/** One area to be filled. */
export interface Patch {
  /** where the top-left cell goes; the table's own size says how far it reaches */
  readonly at: { readonly sheet: string; readonly row: number; readonly column: number }
  readonly table: Table
  /**
   * 'blank': refuse with the Fault "occupied" when a cell in the way holds anything outside `ours`;
   * 'replace': the user has agreed to lose what stands there.
   */
  readonly over: 'blank' | 'replace'
  /** the area an earlier write of ours filled: it may be replaced, and what the new table leaves of it is cleared */
  readonly ours?: Area
  /**
   * what stands in `ours` (formulas where there are some), when it was seen a moment ago and the new table fills exactly that area
   * with the same formats: then only values are sent and nothing is looked at again, so the write is one request
   */
  readonly seen?: readonly (readonly CellValue[])[]
}

/**
 * A new value for one cell of the user's own. What the cell holds besides (number format, font, fill, link) stays as it is; rules of data
 * validation are for what is typed, so none is asked here.
 */
export interface CellEntry {
  /** one cell */
  readonly at: Area
  /**
   * a number or truth value, a text, '' for a blank, or a formula exactly as it was typed; a text that begins with an equals sign is taken for
   * a formula, unless an apostrophe stands before it
   */
  readonly value: CellValue
  /** what was typed there when the cell was last looked at, as `Seen.formulas` has it */
  readonly seen: CellValue
}

/** Everything one write changes: all of it happens or none. */
export interface WritePlan {
  /** a new sheet to make first, when no sheet has that name */
  readonly sheet?: string
  /** whether that new sheet is kept out of sight, also from the list of hidden sheets */
  readonly outOfSight?: boolean
  readonly patches: readonly Patch[]
  /**
   * cells of the user's own, in any order and on any sheets. They are looked at first, and refused with the Fault "changed" when one of
   * them no longer holds what was seen, with "occupied" where a formula fills several cells or cells are merged. Their echo is told as
   * ours, like that of any write: whoever writes them has to have their books look again.
   */
  readonly entries?: readonly CellEntry[]
  /** names to lay over areas; null removes a name */
  readonly keep?: { readonly [name: string]: Area | null }
  /** settings saved with the workbook; null removes one */
  readonly remember?: { readonly [key: string]: Json }
}

export type WorkbookEvent =
  /** cells were edited; `area` is null when the host does not say which; `ours` marks an echo of our own write */
  | { readonly kind: 'edited'; readonly sheet: string; readonly area: Area | null; readonly ours: boolean }
  /** rows, columns or cells were inserted or deleted, or the sheet has got another name: then told under the one it had */
  | { readonly kind: 'moved'; readonly sheet: string }
  | { readonly kind: 'calculated'; readonly sheet: string }
  | { readonly kind: 'sheet-removed'; readonly sheet: string }
  | { readonly kind: 'selected'; readonly area: Area | null }
  /** the host makes us wait while a cell is being edited */
  | { readonly kind: 'waiting'; readonly waiting: boolean }

/** What was done about a write that an earlier run left half way. */
export interface Recovery {
  readonly outcome: 'restored' | 'failed'
  readonly areas: readonly Area[]
}

/**
 * A host's cells, as the sheet folder needs them. Every method may throw a Fault of the codes "host", "editing", "missing",
 * "protected", "occupied", "changed", "selection", "cancelled" or, for what is to be written,
 * "not-a-number" and "twice", and nothing else.
 */
export interface Workbook {
  culture(): Promise<Culture>
  /** @throws Fault "selection" for several areas or a chart; whole rows and columns come back cut to the used range */
  selection(): Promise<Area>
  /** Reads an area of any size in requests of bounded size. */
  read(area: Area, options?: ReadOptions): Promise<Block>
  /** Looks at several ranges in one request. */
  look(wants: readonly Want[]): Promise<readonly (Seen | null)[]>
  /** @returns where each patch lies now */
  write(plan: WritePlan): Promise<readonly Area[]>
  /** All settings of ours, by key without our prefix. */
  recall(): Promise<{ readonly [key: string]: Json }>
  /** Puts right what an interrupted write left; null when there was none. To be called once at start. */
  recover(): Promise<Recovery | null>
  /** Shows and selects an area. */
  reveal(area: Area): Promise<void>
  /** The names of the sheets, visible ones only, in order. */
  sheets(): Promise<readonly string[]>
  /** @returns a function that ends the watch */
  watch(listener: (event: WorkbookEvent) => void): Promise<() => Promise<void>>
}
