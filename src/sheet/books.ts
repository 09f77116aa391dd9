import { Fault } from '../core'
import type { BootstrapChoice, ImpliedChoice } from '../core'
import type { Breakdown } from './breakdown'
import type { Calculator, Work } from './calculator'
import { steppingCalculator } from './calculator'
import type { Area, Culture } from './cells'
import { addressOf, overlap } from './cells'
import { explain } from './explain'
import type { ImpliedReturns } from './implied'
import type { LimitsReading } from './limits'
import { areaOf, byGravity, sentenceOf } from './findings'
import type { HoldingsReading } from './holdings'
import type { CheckLine } from './inspection'
import type { Cause, Field, Proposal, Status } from './linked-book'
import { LinkedBook } from './linked-book'
import type { CommitteeChoice, ReportingState } from './reporting'
import type { ReturnsReading } from './returns'
import type { Role, Settings } from './settings'
import type { RiskLowerings, Sizing } from './sizing'
import type { Scenario, StressComparison } from './stress'
import type { BacktestChoice, Studies } from './studies'
import type { Target } from './targets'
import type { Financing, TradeChange, TradesState } from './trades'
import type { Json, Workbook, WorkbookEvent } from './workbook'
import { countOf, listOf, quote } from './wording'

/** A long action under way; share is 0 to 1, or null while there is nothing to measure it by. */
export interface Working {
  readonly what: string
  readonly share: number | null
  cancel(): void
}

/** A question the pane puts to the user. */
export interface Offer {
  readonly sentence: string
  readonly button: string
  accept(): Promise<void>
  decline(): void
}

/** Everything the pane shows; a new object whenever anything in it changes. */
export interface BooksState {
  readonly books: readonly { readonly id: string; readonly title: string }[]
  readonly current: string
  readonly title: string
  readonly holdings: HoldingsReading | null
  readonly returns: ReturnsReading | null
  readonly factors: ReturnsReading | null
  readonly limits: LimitsReading | null
  readonly settings: Settings
  /** the mark before decimals in what is typed for this workbook */
  readonly decimal: Culture['decimal']
  readonly breakdown: Breakdown | null
  /** what was found about the data; null while there is nothing to look over */
  readonly checks: readonly CheckLine[] | null
  readonly studies: Studies
  /** null until there are figures */
  readonly trades: TradesState | null
  /** whether names in the workbook hold the blocks of this book */
  readonly linked: boolean
  /** where the linked table lies */
  readonly table: Area | null
  /** what else of the book has left the pane, and the results that are kept */
  readonly reporting: ReportingState
  readonly status: Status
  readonly working: Working | null
  /** the one sentence at the field concerned */
  readonly faults: { readonly [F in Field]?: string }
  readonly offers: readonly Offer[]
  /** what just happened, or what the host makes us wait for */
  readonly notice: string | null
}

/** The books of one workbook and what a user can do with them. No command ever rejects: what goes wrong arrives in the state. */
export interface Books {
  state(): BooksState
  subscribe(listener: () => void): () => void
  takeSelection(field: 'holdings' | 'returns' | 'factors' | 'limits' | 'capital'): Promise<void>
  /** Lets go of the block of factor returns. */
  dropFactors(): Promise<void>
  /** Lets go of the table of limits. */
  dropLimits(): Promise<void>
  assignRole(header: string, role: Role): Promise<void>
  markRiskless(name: string, riskless: boolean): Promise<void>
  choose(change: Partial<Settings>): Promise<void>
  compute(): Promise<void>
  bootstrap(choice: BootstrapChoice): Promise<void>
  /** Changes the list of trades, at once. */
  trade(change: TradeChange): void
  /** Drops all trades that are not in the sheet. */
  discardTrades(): void
  /** Begins the comparison anew at the weights in the sheet. */
  compareFromHere(): void
  /** Adds a series that is not held to what can be traded, at weight 0. */
  addCandidate(name: string): Promise<void>
  dropCandidate(name: string): Promise<void>
  /** Looks for weights that reach a target; they take the place of the list. */
  propose(target: Target): Promise<void>
  /** Writes the weights of the list to the cells of the holdings. */
  applyTrades(choice: { readonly replaceFormulas: boolean }): Promise<void>
  /** Puts back what stood there before the last Apply. */
  undoTrades(): Promise<void>
  /** @param of the book's own past at today's weights, or a selected block of returns and forecasts */
  backtest(choice: BacktestChoice, of: 'this book' | 'selection'): Promise<void>
  writeTable(where: { readonly kind: 'new sheet' | 'selection' | 'where it was' }): Promise<void>
  /** Writes a table of functions that are live in cells, beside the linked one. */
  writeLive(where: { readonly kind: 'new sheet' | 'selection' | 'where it was' }): Promise<void>
  /** Writes the formulas that recompute the figures, or brings them along where they lie. */
  writeProof(): Promise<void>
  /** Writes one printable page. */
  writeCommittee(choice: CommitteeChoice): Promise<void>
  /** Keeps the figures with their date; an offer asks where that would replace a kept result. */
  keepResult(note: string): Promise<void>
  removeResult(id: string): Promise<void>
  /** Splits the change of risk between two kept results. @param to of a kept result, or 'now' */
  compareResults(from: string, to: string): Promise<void>
  /** Writes the comparison asked for last to a sheet of its own. */
  writeChange(): Promise<void>
  /** Writes what was found about the data, cells as links, to a sheet of its own. */
  writeChecks(): Promise<void>
  /** Writes the back-test or the bootstrap that was run last to a sheet of its own. */
  writeStudy(kind: 'back-test' | 'bootstrap'): Promise<void>
  /** Writes the comparison of the trades to a sheet of its own. */
  writeTrades(): Promise<void>
  /** Writes scenarios side by side to a sheet of their own. */
  writeStress(scenarios: readonly Scenario[]): Promise<void>
  /** Risk against the weight of one position, at once; or why there is none. */
  sizingOf(key: string, financing: Financing): Sizing | string
  /** The trades that lower risk most for each unit of turnover, at once; or why there are none. */
  riskLowering(financing: Financing): RiskLowerings | string
  /** @param risklessRate what the user's expected returns include of it, a year; 0 where they are excess returns */
  impliedReturns(choice: ImpliedChoice, risklessRate: number): ImpliedReturns | string
  /** The book in scenarios, before and after the trades, at once; or why not. */
  stressOf(scenarios: readonly Scenario[]): StressComparison | string
  /** The stretch of so many dates with the largest loss at the weights in the sheet; or why there is none. */
  worstStretch(dates: number): { readonly scenario: Scenario; readonly sentence: string } | string
  reveal(area: Area): Promise<void>
  addBook(): Promise<void>
  switchTo(id: string): Promise<void>
  rename(title: string): Promise<void>
  /** Forgets the link; the user's cells stay, the written table included. */
  removeBook(): Promise<void>
  /** Stops listening to the workbook. */
  close(): Promise<void>
}

/** What happens beside the figures: a fault there leaves them as good as they were. */
const ASIDE: ReadonlySet<Field> = new Set(['study', 'trades', 'proof', 'report', 'history'])

/** Edits that come in quick succession are one refresh. */
const SETTLING_MS = 120

/** Where several causes are due at once, the first of these does what the others would, or must keep them from it. */
const CAUSES: readonly Cause[] = ['compute', 'edit', 'look', 'calculation']

/**
 * Opens the books a workbook holds: puts right what an interrupted write left, follows the workbook from then on, and begins to
 * read what is linked. Commands and refreshes run one after another.
 *
 * @throws Fault where the workbook cannot be asked for its books: going on without them would write over their links
 */
export async function openBooks(
  workbook: Workbook,
  calculator: Calculator = steppingCalculator,
): Promise<Books> {
  const books = new OpenBooks(workbook, calculator)
  await books.open()
  return books
}

class OpenBooks implements Books {
  readonly #workbook: Workbook
  readonly #calculator: Calculator
  #culture: Culture = { decimal: '.', group: ',', dateOrder: 'ymd' }
  #books: LinkedBook[] = []
  #current = '1'
  #state: BooksState | null = null
  readonly #listeners = new Set<() => void>()
  #working: Working | null = null
  #notice: string | null = null
  #waiting = false
  #queue: Promise<void> = Promise.resolve()
  /** actions that are under way or wait for their turn */
  #waitingActions = 0
  #closed = false
  readonly #due = new Map<LinkedBook, Cause>()
  #timer: ReturnType<typeof setTimeout> | null = null
  #unwatch: (() => Promise<void>) | null = null

  constructor(workbook: Workbook, calculator: Calculator) {
    this.#workbook = workbook
    this.#calculator = calculator
  }

  async open(): Promise<void> {
    const recovery = await this.#workbook.recover()
    const notices: string[] = []
    if (recovery) {
      const where = recovery.areas.length > 0 ? listOf(recovery.areas.map(addressOf)) : 'this workbook'
      notices.push(
        recovery.outcome === 'restored'
          ? `A write was cut short the last time; ${where} stands as it was before.`
          : `A write was cut short the last time and could not be undone yet: ${where} may be half written.`,
      )
    }
    this.#culture = await this.#workbook.culture()
    const saved = await this.#workbook.recall()
    const ids = Object.keys(saved)
      .flatMap((key) => /^book\.(\d+)$/.exec(key)?.[1] ?? [])
      .sort((a, b) => Number(a) - Number(b))
    this.#books = ids.map((id) => this.#newBook(id, saved))
    this.#unwatch = await this.#workbook.watch((event) => {
      this.#heed(event)
    })
    if (this.#books.length === 0) this.#books = [this.#newBook('1')]
    this.#current = this.#books[0]?.id ?? '1'
    notices.push(...this.#books.flatMap(({ unread }) => unread ?? []))
    if (notices.length > 0) this.#notice = notices.join(' ')
    this.#publish()
    // not waited for: whoever shows the books shows how far the first reading is
    for (const book of this.#books)
      if (book.linked) void this.#enqueue(book, (work) => book.refresh('look', work))
  }

  async close(): Promise<void> {
    this.#closed = true
    if (this.#timer) clearTimeout(this.#timer)
    this.#listeners.clear()
    const unwatch = this.#unwatch
    this.#unwatch = null
    await unwatch?.()
    await this.#queue
  }

  #newBook(id: string, saved: { readonly [key: string]: Json } = {}): LinkedBook {
    const { [`book.${id}`]: book = null, [`history.${id}`]: history = null } = saved
    return new LinkedBook(id, this.#workbook, this.#culture, this.#calculator, { book, history }, () => {
      this.#publish()
    })
  }

  get #book(): LinkedBook {
    const book = this.#books.find(({ id }) => id === this.#current) ?? this.#books[0]
    if (book) return book
    const fresh = this.#newBook('1')
    this.#books = [fresh]
    return fresh
  }

  // ---- the state

  state(): BooksState {
    return (this.#state ??= this.#snapshot())
  }

  subscribe(listener: () => void): () => void {
    this.#listeners.add(listener)
    return () => this.#listeners.delete(listener)
  }

  #snapshot(): BooksState {
    const book = this.#book
    return {
      books: this.#books.map(({ id, title }) => ({ id, title })),
      current: book.id,
      title: book.title,
      holdings: book.holdings && {
        ...book.holdings,
        findings: byGravity([...book.holdings.findings, ...(book.match?.findings ?? [])]),
      },
      returns: book.returns,
      factors: book.factors,
      limits: book.limits,
      settings: book.settings,
      decimal: this.#culture.decimal,
      breakdown: book.breakdown,
      checks: book.checks,
      studies: book.studies,
      trades: book.trading.state,
      linked: book.linked,
      table: book.table,
      reporting: book.reporting.state,
      status: book.status,
      working: this.#working,
      faults: book.faults,
      offers: book.proposals.map((proposal) => ({
        sentence: proposal.sentence,
        button: proposal.button,
        accept: () => this.#accept(book, proposal),
        decline: () => {
          book.settle(proposal, true)
          this.#publish()
        },
      })),
      notice: this.#waiting
        ? 'Waiting for the workbook. If a cell is being edited, finish it with Enter or Escape.'
        : this.#notice,
    }
  }

  #publish(): void {
    this.#state = null
    for (const listener of this.#listeners) listener()
  }

  // ---- one thing at a time

  /**
   * Runs an action after those before it. A Fault becomes the sentence at its field and, where figures depend on it, the status; any
   * other error is a mistake of ours and is told as such rather than leaving "up to date" on the screen.
   */
  #enqueue(book: LinkedBook | null, action: (work: Work) => Promise<void>, field?: Field): Promise<void> {
    this.#waitingActions++
    const run = this.#queue.then(async () => {
      const stop = new AbortController()
      const cancel = (): void => {
        stop.abort()
      }
      const work: Work = {
        signal: stop.signal,
        progress: (what, share) => {
          this.#working = { what, share, cancel }
          this.#publish()
        },
      }
      this.#working = { what: 'Working', share: null, cancel }
      this.#publish()
      try {
        await action(work)
      } catch (error) {
        this.#tell(error, book ?? this.#book, field)
      } finally {
        this.#working = null
        this.#waitingActions--
        this.#publish()
      }
    })
    this.#queue = run
    void run.then(() => this.#inspect(book))
    return run
  }

  /** Looks over the data once nothing else waits: the figures come first. */
  #inspect(book: LinkedBook | null): void {
    if (this.#closed || !book?.inspectionDue || this.#waitingActions > 0 || !this.#books.includes(book))
      return
    void this.#enqueue(book, async (work) => {
      try {
        await book.inspect(work)
      } catch (error) {
        // a look that was cancelled, or that met bad data, says nothing about the figures
        if (!(error instanceof Fault)) throw error
      }
    })
  }

  #tell(error: unknown, book: LinkedBook, field?: Field): void {
    if (!(error instanceof Fault)) {
      book.status = {
        kind: 'failed',
        sentence: `Counterpoise met an error of its own: ${error instanceof Error ? error.message : String(error)}`,
        area: null,
      }
      return
    }
    if (error.code === 'cancelled') {
      this.#notice = 'Cancelled; nothing was changed.'
      // figures that a cancelled study stands beside are as good as they were
      if (field && ASIDE.has(field)) return
      if (book.status.kind === 'up to date' || (book.linked && book.status.kind === 'nothing linked'))
        book.status = { kind: 'stale', since: null, sentence: 'Stale: the reading was cancelled.' }
      return
    }
    // what a study stumbles over says nothing about the blocks
    const place = field && ASIDE.has(field) ? field : (fieldOf(error) ?? field)
    const sentence = sentenceOf(error)
    if (place) book.faults = { ...book.faults, [place]: sentence }
    // a table that could not be written leaves the figures as good as they were, and so do limits and trades
    if (place === 'table' || place === 'limits' || place === 'trades') return
    if (field === 'table' || (field && ASIDE.has(field))) return
    if (book.breakdown || field === undefined) book.status = { kind: 'failed', sentence, area: areaOf(error) }
  }

  // ---- following the workbook

  #heed(event: WorkbookEvent): void {
    if (event.kind === 'waiting') {
      this.#waiting = event.waiting
      this.#publish()
      return
    }
    if (event.kind === 'selected' || (event.kind === 'edited' && event.ours)) return
    for (const book of this.#books) {
      this.#note(book, causeOf(event, book))
    }
    this.#publish()
    this.#refreshSoon()
  }

  #note(book: LinkedBook, cause: Cause | null): void {
    if (cause === null || !book.linked) return
    const due = this.#due.get(book)
    if (due === undefined || CAUSES.indexOf(cause) < CAUSES.indexOf(due)) this.#due.set(book, cause)
  }

  #refreshSoon(): void {
    if (this.#due.size === 0) return
    if (this.#timer) clearTimeout(this.#timer)
    this.#timer = setTimeout(() => {
      this.#timer = null
      const due = [...this.#due]
      this.#due.clear()
      for (const [book, cause] of due)
        void this.#enqueue(book, async (work) => {
          // it may have been removed, or given other blocks, while this waited its turn
          if (!book.linked || !this.#books.includes(book)) return
          const stood = book.table
          await book.refresh(cause, work)
          if (stood && !book.table)
            this.#notice = `The table written to ${addressOf(stood)} is gone: its cells or its sheet were deleted. Report writes it anew.`
        })
    }, SETTLING_MS)
  }

  // ---- commands

  #command(field: Field | undefined, action: (book: LinkedBook, work: Work) => Promise<void>): Promise<void> {
    const book = this.#book
    this.#notice = null
    book.dropQuestions()
    return this.#enqueue(
      book,
      async (work) => {
        if (field) dropFault(book, field)
        await action(book, work)
      },
      field,
    )
  }

  #accept(book: LinkedBook, proposal: Proposal): Promise<void> {
    book.settle(proposal, false)
    return this.#enqueue(
      book,
      async (work) => {
        dropFault(book, proposal.field)
        await proposal.accept(work, (sentence) => (this.#notice = sentence))
        const parted = await this.#partTables(book)
        if (parted !== '') this.#notice = parted
      },
      proposal.field,
    )
  }

  /** Two books that wrote to the same cells would undo each other's table at every edit: the one written over lets go of it. */
  async #partTables(book: LinkedBook): Promise<string> {
    const parted: string[] = []
    for (const other of this.#books) {
      if (other === book || !book.table || !other.table || !overlap(other.table, book.table)) continue
      await other.releaseTable()
      parted.push(`The table of ${quote(other.title)} was written over and no longer follows its book.`)
    }
    return parted.join(' ')
  }

  takeSelection(field: 'holdings' | 'returns' | 'factors' | 'limits' | 'capital'): Promise<void> {
    return this.#command(field, async (book, work) => {
      await book.take(field, await this.#workbook.selection(), work)
    })
  }

  dropFactors(): Promise<void> {
    return this.#command('factors', (book, work) => book.dropFactors(work))
  }

  dropLimits(): Promise<void> {
    return this.#command('limits', (book, work) => book.dropLimits(work))
  }

  // ---- trades: the list changes at once, whatever is under way

  trade(change: TradeChange): void {
    this.#book.trading.edit(change)
    dropFault(this.#book, 'trades')
    this.#publish()
  }

  discardTrades(): void {
    this.#book.trading.discard()
    dropFault(this.#book, 'trades')
    this.#publish()
  }

  compareFromHere(): void {
    this.#book.trading.compareFromHere()
    this.#publish()
  }

  addCandidate(name: string): Promise<void> {
    return this.#command('trades', (book, work) => book.trading.addCandidate(name, work))
  }

  dropCandidate(name: string): Promise<void> {
    return this.#command('trades', (book, work) => book.trading.dropCandidate(name, work))
  }

  propose(target: Target): Promise<void> {
    return this.#command('trades', (book, work) => book.trading.propose(target, work))
  }

  applyTrades({ replaceFormulas }: { readonly replaceFormulas: boolean }): Promise<void> {
    const shown = this.#book.trading.state?.preview.lines ?? []
    return this.#command('trades', async (book, work) => {
      const areas = await book.applyTrades(shown, replaceFormulas, work)
      this.#tellOthers(book, areas)
      this.#notice = `${countOf(areas.length, 'weight')} written to the sheet. Undo in the view Trades puts back what stood there.`
    })
  }

  undoTrades(): Promise<void> {
    return this.#command('trades', async (book, work) => {
      const areas = await book.undoTrades(work)
      this.#tellOthers(book, areas)
      this.#notice = `${countOf(areas.length, 'cell')} put back as ${areas.length === 1 ? 'it was' : 'they were'}.`
    })
  }

  /** Cells written for one book may belong to others too; the workbook takes them for an echo. */
  #tellOthers(book: LinkedBook, areas: readonly Area[]): void {
    for (const other of this.#books) {
      if (other === book || !other.linked) continue
      for (const area of areas) this.#note(other, other.heedEdit(area, area.sheet))
    }
    this.#refreshSoon()
  }

  assignRole(header: string, role: Role): Promise<void> {
    return this.#command('holdings', (book, work) => {
      const proposed = book.holdings?.columns.find((column) => column.header === header)?.proposed
      const { [header]: earlier, ...others } = book.settings.roles
      void earlier
      return book.choose({ roles: role === proposed ? others : { ...others, [header]: role } }, work)
    })
  }

  markRiskless(name: string, riskless: boolean): Promise<void> {
    return this.#command('holdings', (book, work) => {
      const others = book.settings.riskless.filter((other) => other !== name)
      return book.choose({ riskless: riskless ? [...others, name] : others }, work)
    })
  }

  choose(change: Partial<Settings>): Promise<void> {
    const field: Field =
      'estimator' in change || 'gaps' in change || 'repair' in change
        ? 'estimator'
        : 'benchmark' in change || 'convention' in change
          ? 'benchmark'
          : 'tails' in change
            ? 'tails'
            : 'lookBack' in change
              ? 'look-back'
              : 'periodsPerYear' in change
                ? 'periods per year'
                : 'capital' in change
                  ? 'capital'
                  : 'currency' in change
                    ? 'currency'
                    : 'returns'
    return this.#command(field, (book, work) => book.choose(change, work))
  }

  compute(): Promise<void> {
    return this.#command(undefined, (book, work) => book.compute(work))
  }

  bootstrap(choice: BootstrapChoice): Promise<void> {
    return this.#command('study', (book, work) => book.bootstrap(choice, work))
  }

  backtest(choice: BacktestChoice, of: 'this book' | 'selection'): Promise<void> {
    return this.#command('study', async (book, work) => {
      await book.backtest(choice, of === 'selection' ? await this.#workbook.selection() : null, work)
    })
  }

  writeTable(where: { readonly kind: 'new sheet' | 'selection' | 'where it was' }): Promise<void> {
    return this.#command('table', async (book, work) => {
      const earlier = book.table
      const area = await book.writeTable(where.kind, work)
      const left =
        earlier && !overlap(earlier, area)
          ? ` The earlier one in ${addressOf(earlier)} stays as it is and no longer follows.`
          : ''
      const parted = await this.#partTables(book)
      this.#notice = `Table written to ${addressOf(area)}. It follows the weights.${left} ${parted}`.trim()
    })
  }

  writeChecks(): Promise<void> {
    return this.#command('table', async (book, work) => {
      const area = await book.writeChecks(serialToday(), work)
      this.#notice = `Data checks written to ${addressOf(area)}. The list stays as it is until it is written again.`
    })
  }

  writeLive(where: { readonly kind: 'new sheet' | 'selection' | 'where it was' }): Promise<void> {
    return this.#command('table', async (book, work) => {
      const area = await book.writeLive(where.kind, work)
      this.#notice = `Functions written to ${addressOf(area)}. The workbook keeps them up to date.`
    })
  }

  writeProof(): Promise<void> {
    return this.#command('proof', async (book, work) => {
      const area = await book.writeProof(work)
      this.#notice = `Proof written to ${addressOf(area)}. Its formulas follow your cells; our figures in it stay until it is written again.`
    })
  }

  writeCommittee(choice: CommitteeChoice): Promise<void> {
    return this.#command('report', async (book, work) => {
      const area = await book.writeCommittee(choice, serialToday(), work)
      this.#notice = `Committee page written to ${addressOf(area)}. It stays as it is until it is written again.`
    })
  }

  keepResult(note: string): Promise<void> {
    return this.#command('history', async (book, work) => {
      const area = await book.keepResult(note, serialToday(), work)
      if (area) this.#notice = `Result kept in ${addressOf(area)}. ${book.reporting.left ?? ''}`.trim()
    })
  }

  removeResult(id: string): Promise<void> {
    return this.#command('history', async (book) => {
      await book.reporting.remove(id)
      this.#notice = `Result removed. ${book.reporting.left ?? ''}`.trim()
    })
  }

  compareResults(from: string, to: string): Promise<void> {
    return this.#command('history', (book, work) => book.compareResults(from, to, serialToday(), work))
  }

  writeChange(): Promise<void> {
    return this.#command('history', async (book, work) => {
      const area = await book.writeChange(serialToday(), work)
      this.#notice = `Comparison written to ${addressOf(area)}. It stays as it is until it is written again.`
    })
  }

  writeTrades(): Promise<void> {
    return this.#command('trades', async (book) => {
      const area = await book.writeTrades()
      this.#notice = `Trades written to ${addressOf(area)}. The table stays as it is until it is written again.`
    })
  }

  writeStress(scenarios: readonly Scenario[]): Promise<void> {
    return this.#command('trades', async (book) => {
      const area = await book.writeStress(scenarios)
      this.#notice = `Scenarios written to ${addressOf(area)}. The table stays as it is until it is written again.`
    })
  }

  writeStudy(kind: 'back-test' | 'bootstrap'): Promise<void> {
    return this.#command('study', async (book) => {
      const area = await book.writeStudy(kind, serialToday())
      const what = kind === 'back-test' ? 'Back-test' : 'Bootstrap'
      this.#notice = `${what} written to ${addressOf(area)}. The table stays as it is until it is written again.`
    })
  }

  sizingOf(key: string, financing: Financing): Sizing | string {
    return this.#book.trading.sizingOf(key, financing)
  }

  riskLowering(financing: Financing): RiskLowerings | string {
    return this.#book.trading.riskLowering(financing)
  }

  impliedReturns(choice: ImpliedChoice, risklessRate: number): ImpliedReturns | string {
    return this.#book.trading.impliedReturns(choice, risklessRate)
  }

  stressOf(scenarios: readonly Scenario[]): StressComparison | string {
    return this.#book.trading.stressOf(scenarios)
  }

  worstStretch(dates: number): ReturnType<Books['worstStretch']> {
    return this.#book.trading.worstStretch(dates)
  }

  reveal(area: Area): Promise<void> {
    // no command on the book: its questions stay, and a place that is gone says nothing about its figures
    return this.#enqueue(this.#book, async () => {
      try {
        await this.#workbook.reveal(area)
      } catch (fault) {
        if (!(fault instanceof Fault)) throw fault
        this.#notice = explain(fault)
      }
    })
  }

  addBook(): Promise<void> {
    const id = String(Math.max(0, ...this.#books.map((book) => Number(book.id))) + 1)
    this.#books = [...this.#books, this.#newBook(id)]
    return this.switchTo(id)
  }

  switchTo(id: string): Promise<void> {
    this.#current = id
    this.#notice = null
    this.#publish()
    return Promise.resolve()
  }

  rename(title: string): Promise<void> {
    return this.#command(undefined, (book, work) => book.rename(title, work))
  }

  removeBook(): Promise<void> {
    return this.#command(undefined, async (book) => {
      const { length } = book.reporting.state.kept
      if (book.kept) await this.#workbook.write(await book.forget())
      this.#books = this.#books.filter((other) => other !== book)
      this.#current = this.#book.id
      this.#notice = `${book.title} is no longer linked; its table and your cells stay as they are.${length > 0 ? ` Its ${countOf(length, 'kept result')} ${length === 1 ? 'is' : 'are'} taken away with it; what is written of ${length === 1 ? 'it' : 'them'} to be read stays.` : ''}`
    })
  }
}

/** Today as a workbook counts days. */
function serialToday(): number {
  const now = new Date()
  return Date.UTC(now.getFullYear(), now.getMonth(), now.getDate()) / 86400000 + 25569
}

/** How a book has to look again at its sheet after an event, if at all. */
function causeOf(event: WorkbookEvent, book: LinkedBook): Cause | null {
  switch (event.kind) {
    case 'calculated':
      return book.heedCalculation(event.sheet) ? 'calculation' : null
    case 'edited':
      return book.heedEdit(event.area, event.sheet)
    case 'moved':
    case 'sheet-removed':
      return book.heedMove(event.sheet) ? 'edit' : null
    default:
      return null
  }
}

function dropFault(book: LinkedBook, field: Field): void {
  const { [field]: answered, ...others } = book.faults
  void answered
  book.faults = others
}

/** The field of the pane a fault belongs to, where its argument names one. */
function fieldOf(fault: Fault): Field | null {
  switch (fault.where.argument) {
    case 'holdings':
    case 'weights':
      return 'holdings'
    case 'returns':
    case 'risk':
    case 'prices':
      return 'returns'
    case 'decay':
    case 'estimator':
      return 'estimator'
    case 'look-back':
    case 'capital':
    case 'factors':
    case 'benchmark':
    case 'currency':
    case 'study':
    case 'limits':
    case 'trades':
    case 'table':
    case 'proof':
    case 'report':
    case 'history':
      return fault.where.argument
    case 'periods_per_year':
      return 'periods per year'
    default:
      return null
  }
}
