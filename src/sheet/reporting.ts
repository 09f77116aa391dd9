import { Fault } from '../core'
import type { Calculator, Work } from './calculator'
import { changeTable } from './change-table'
import { committeePage } from './committee-page'
import type { Area } from './cells'
import { explain } from './explain'
import { growthBetween, History, remakeFrom, snapshotOf } from './history'
import type { CheckLine } from './inspection'
import { liveTable } from './live-table'
import type { ProofInput } from './proof'
import { proofTable } from './proof'
import type { RiskChange } from './risk-change'
import { riskChangeOf } from './risk-change'
import type { Snapshot, SnapshotHead } from './snapshot'
import type { PageSetup, Table } from './table'
import type { Json, Seen, Want, Workbook, WritePlan } from './workbook'
import type { Place, Sources } from './written-table'
import { WrittenTable } from './written-table'

/** Tables on sheets of their own that stay as they are until they are written again, and what a new sheet for each is called. The keys go into names of the workbook. */
const SHEETS = {
  checks: 'Data checks',
  trades: 'Trades',
  stress: 'Stress',
  backtest: 'Back-test',
  bootstrap: 'Bootstrap',
  live: 'Risk, live',
  proof: 'Proof',
  committee: 'Committee page',
  change: 'What changed',
} as const

export type ReportPart = keyof typeof SHEETS

export const REPORT_PARTS = Object.keys(SHEETS) as readonly ReportPart[]

/** Those whose place the pane shows. */
const SHOWN = ['proof', 'live'] as const

/** The proof as it lies in the workbook. */
export interface ProofState {
  readonly area: Area
  /** whether our figures in it are those that stand now; null while nobody knows, as after opening a workbook */
  readonly isCurrent: boolean | null
}

/** What has left the pane, or is kept to be compared. */
export interface ReportingState {
  readonly proof: ProofState | null
  /** where the table of live functions lies */
  readonly live: Area | null
  /** kept results, oldest first */
  readonly kept: readonly SnapshotHead[]
  /** what of them could not be read or is not in the workbook any more, as sentences */
  readonly lost: readonly string[]
  /** the comparison asked for last */
  readonly change: RiskChange | null
}

/** How the committee page is printed, and whose name stands on it. */
export interface CommitteeChoice {
  readonly paper: PageSetup['paper']
  readonly preparedBy: string
}

/** The id that stands for the figures as they are now where a kept result may be named. */
export const NOW = 'now'

const NOTHING_COMPUTED = 'nothing is computed yet'

/** All that a proof holds as constants of ours: equal texts, equal proofs. */
function provenOf({ title, settings, breakdown }: ProofInput): string {
  const { names, groups, decomposition: d, active, tails } = breakdown
  return JSON.stringify([
    [title, settings, names, groups, d.volatility],
    [d.weights, d.standAlone, d.contribution].map((values) => Array.from(values)),
    active && [active.risk.trackingError, Array.from(active.benchmark), Array.from(active.risk.contribution)],
    typeof tails === 'string' ? tails : [tails.risk.valueAtRisk, tails.risk.shortfall],
  ])
}

/**
 * What of one book leaves the pane and has to stand without it: the tables on sheets of their own, the proof, the committee page, the
 * results that are kept and what changed between two of them. Knows where each lies; when the figures are good enough to be written is its
 * owner's business.
 */
export class Reporting {
  readonly #workbook: Workbook
  readonly #calculator: Calculator
  readonly #tables: { readonly [P in ReportPart]: WrittenTable }
  readonly #nameOf: (part: ReportPart) => string
  readonly #history: History
  #figures: ProofInput | null = null
  /** what of the figures a proof would hold, and what of them it was written with; null where nobody knows */
  #provable: string | null = null
  #proven: string | null = null
  #change: RiskChange | null = null
  /** the figures that were "now" in it */
  #compared: ProofInput | null = null
  #lost: readonly string[] = []

  /**
   * @param nameOf  the name in the workbook that holds the place of a table
   * @param history the list of kept results as it was saved with the workbook
   */
  constructor(
    workbook: Workbook,
    calculator: Calculator,
    book: { readonly id: string; readonly nameOf: (part: ReportPart) => string; readonly history?: Json },
  ) {
    this.#workbook = workbook
    this.#calculator = calculator
    this.#nameOf = book.nameOf
    this.#tables = Object.fromEntries(
      REPORT_PARTS.map((part) => [part, new WrittenTable(workbook, book.nameOf(part), SHEETS[part])]),
    ) as { [P in ReportPart]: WrittenTable }
    this.#history = new History(workbook, book.id)
    this.#history.open(book.history)
  }

  get state(): ReportingState {
    const { area } = this.#tables.proof
    return {
      proof: area && {
        area,
        isCurrent: this.#proven === null ? null : this.#proven === this.#provable,
      },
      live: this.#tables.live.area,
      kept: this.#history.heads,
      lost: this.#lost,
      change: this.#change,
    }
  }

  /** Takes the figures of the book as they stand now. */
  stand(figures: ProofInput): void {
    this.#figures = figures
    this.#provable = provenOf(figures)
  }

  /** What to look at to know where the tables lie whose place is shown. */
  get wants(): readonly Want[] {
    return SHOWN.map((part) => ({ at: { kept: this.#nameOf(part) } }))
  }

  /** @param seen what was found at `wants` */
  place(seen: readonly (Seen | null)[]): void {
    SHOWN.forEach((part, k) => (this.#tables[part].area = seen[k]?.area ?? null))
  }

  /** Writes a table to a sheet of its own, where an earlier one of its kind gives way to it. */
  async write(part: ReportPart, table: Table | ((at: Area) => Table), sources: Sources): Promise<Area> {
    const [earlier] = await this.#workbook.look([{ at: { kept: this.#nameOf(part) } }])
    const written = this.#tables[part]
    written.area = earlier?.area ?? null
    const place = written.area ? 'where it was' : 'new sheet'
    const at = await written.corner(place)
    return written.write(place, at, typeof table === 'function' ? table(at) : table, 'blank', sources)
  }

  /** Writes the formulas that recompute the figures, or brings them along where they lie. */
  async writeProof(sources: Sources): Promise<Area> {
    const figures = this.#standing('proof')
    const area = await this.write('proof', (at) => proofTable(figures, at), sources)
    this.#proven = this.#provable
    return area
  }

  /**
   * Writes the table of functions that are live in cells.
   *
   * @throws Fault "unknown-choice" with the reason where cells cannot do it
   */
  writeLive(place: Place, over: 'blank' | 'replace', at: Area, sources: Sources): Promise<Area> {
    const figures = this.#standing('table')
    const written = this.#tables.live
    const { page, ...table } = liveTableAt(figures, at)
    // among a user's own cells the page is the user's
    const own = place === 'new sheet' && page ? { ...table, page } : table
    return written.write(place, at, own, over, sources)
  }

  /** What `writeLive` would fill from a corner on. */
  liveTable(at: Area): Table {
    return liveTableAt(this.#standing('table'), at)
  }

  /** Where a table of live functions would go. */
  cornerOfLive(place: Place): Promise<Area> {
    return this.#tables.live.corner(place)
  }

  async writeCommittee(
    choice: CommitteeChoice,
    checks: readonly CheckLine[] | null,
    today: number,
    sources: Sources,
    work: Work,
  ): Promise<Area> {
    const { title, breakdown } = this.#standing('report')
    const change = await this.#sinceLast(work)
    const page = committeePage({
      title,
      ...choice,
      today,
      breakdown,
      checks,
      history: this.#history.heads,
      change,
    })
    return this.write('committee', page, sources)
  }

  // ---- results that are kept

  /** The kept result that one of the figures as they are now would take the place of; null where there is none. */
  replacedNow(): SnapshotHead | null {
    return this.#history.sameDate(this.#standing('history').breakdown.dates?.last ?? null)
  }

  /** @param replaces id of a kept result whose place it takes */
  async keep(note: string, today: number, replaces: string | null): Promise<Area> {
    const snapshot = await this.#snapshot(note, today, 'kept')
    const area = await this.#history.keep(snapshot, replaces)
    this.#dropChangeOf(replaces)
    return area
  }

  /** What the last `keep` or `remove` left standing of an earlier block, as a sentence. */
  get left(): string | null {
    return this.#history.left
  }

  async remove(id: string): Promise<void> {
    await this.#history.remove(id)
    this.#dropChangeOf(id)
    await this.checkKept()
  }

  /** A comparison with a result that is kept no more goes with it. */
  #dropChangeOf(id: string | null): void {
    const { from, to } = this.#change ?? {}
    if (from?.id === id || (to?.id === id && !to?.isNow)) this.#change = null
  }

  /** Looks whether what is kept is still in the workbook. */
  async checkKept(): Promise<void> {
    const { unread } = this.#history
    this.#lost = [...(unread === null ? [] : [unread]), ...(await this.#history.check())]
  }

  /** What takes away all that is kept out of sight, and the names of what is in sight. */
  async forget(): Promise<WritePlan> {
    const { patches, keep, remember } = await this.#history.forget()
    const names = Object.fromEntries(REPORT_PARTS.map((part) => [this.#nameOf(part), null]))
    return { patches, keep: { ...keep, ...names }, ...(remember ? { remember } : {}) }
  }

  /** Splits the change between two kept results, or a kept one and now. */
  async compare(from: string, to: string, today: number, work: Work): Promise<void> {
    this.#change = null
    if (from === to)
      throw new Fault('unknown-choice', 'both sides are the same result', 'choose two results', {
        argument: 'history',
      })
    if (from === NOW)
      throw new Fault('unknown-choice', 'it is compared from what stands now', 'choose a kept result', {
        argument: 'history',
      })
    this.#compared = this.#figures
    this.#change = await this.#changeBetween(
      await this.#result(from, today),
      await this.#result(to, today),
      work,
    )
  }

  /** Writes the comparison asked for last; one with figures that stood and do so no more is made again first. */
  async writeChange(title: string, today: number, sources: Sources, work: Work): Promise<Area> {
    const asked = this.#change
    if (asked?.to.isNow && this.#compared !== this.#figures)
      await this.compare(asked.from.id, NOW, today, work)
    if (!this.#change)
      throw new Fault('missing', 'nothing is compared yet', 'Compare comes first', { argument: 'history' })
    return this.write('change', changeTable(title, this.#change), sources)
  }

  async #result(id: string, today: number): Promise<Snapshot & { readonly isNow?: boolean }> {
    return id === NOW
      ? { ...(await this.#snapshot('', today, 'whole')), isNow: true }
      : this.#history.read(id)
  }

  #snapshot(note: string, today: number, extent: 'kept' | 'whole'): Promise<Snapshot> {
    return snapshotOf({ ...this.#standing('history'), note, keptOn: today, id: this.#history.nextId }, extent)
  }

  #changeBetween(
    from: Snapshot,
    to: Snapshot & { readonly isNow?: boolean },
    work: Work,
  ): Promise<RiskChange> {
    const blocks = this.#figures?.blocks ?? null
    const none = 'The blocks of this book are not read.'
    return riskChangeOf(from, to, {
      remake: (of, under) =>
        blocks ? remakeFrom(of, under, blocks, this.#calculator, work) : Promise.resolve(none),
      growth: (names, fromDate, toDate) => (blocks ? growthBetween(blocks, names, fromDate, toDate) : none),
    })
  }

  /** What changed since the last kept result that is another than the figures now; or why that cannot be told, or null where none is kept. */
  async #sinceLast(work: Work): Promise<RiskChange | string | null> {
    const heads = this.#history.heads
    if (heads.length === 0) return null
    try {
      const now = { ...(await this.#snapshot('', 0, 'whole')), isNow: true }
      const last = [...heads].reverse().find(({ inputsHash }) => inputsHash !== now.inputsHash)
      if (!last) return 'The only result kept is this one.'
      return await this.#changeBetween(await this.#history.read(last.id), now, work)
    } catch (fault) {
      if (!(fault instanceof Fault) || fault.code === 'cancelled') throw fault
      return explain(fault)
    }
  }

  #standing(argument: 'proof' | 'report' | 'history' | 'table'): ProofInput {
    if (this.#figures) return this.#figures
    throw new Fault('missing', NOTHING_COMPUTED, 'Compute comes first', { argument })
  }
}

function liveTableAt(figures: ProofInput, at: Area): Table {
  const table = liveTable(figures, at)
  if (typeof table !== 'string') return table
  // one sentence: what is needed follows
  throw new Fault('unknown-choice', table.replace(/\.$/, ''), 'values, or the proof, can be written', {
    argument: 'table',
  })
}
