import { Fault } from '../core'
import type { BootstrapChoice, Decomposition } from '../core'
import type { Breakdown } from './breakdown'
import { breakDown } from './breakdown'
import type { BookModel } from './book-model'
import { modelChoices, modelOf } from './book-model'
import { breakdownTable } from './breakdown-table'
import type { Calculator, Work } from './calculator'
import type { Area, Culture } from './cells'
import { addressOf, overlap } from './cells'
import { currencyKey } from './currency'
import { explain } from './explain'
import { PlacedFault } from './findings'
import type { HoldingsReading } from './holdings'
import type { LimitsReading } from './limits'
import { FACTOR_SETTINGS, LinkedBlocks, PART_WORDS, SERIES } from './linked-blocks'
import type { SeriesPart, SourcePart } from './linked-blocks'
import type { Match } from './matching'
import { checksTable } from './checks-table'
import { growthBeside } from './growth'
import type { CheckLine } from './inspection'
import { Inspection } from './inspection'
import type { CommitteeChoice, ReportPart } from './reporting'
import { NOW, Reporting } from './reporting'
import type { ReturnsReading } from './returns'
import { readReturns } from './returns'
import type { Settings } from './settings'
import { DEFAULT_SETTINGS, settingsFromJson, settingsToJson } from './settings'
import type { Scenario } from './stress'
import type { BacktestChoice, BacktestStudy, Studies } from './studies'
import { afterChange, backtestStudy, bootstrapStudy, givenBacktest, NO_STUDIES } from './studies'
import { backtestTable, bootstrapTable } from './studies-table'
import type { Table } from './table'
import type { Standing } from './trading'
import { Trading } from './trading'
import type { WriteLine } from './trades'
import type { Json, Seen, Workbook, WritePlan } from './workbook'
import type { Place, Sources } from './written-table'
import { areaOfTable, WrittenTable } from './written-table'
import { dateText, listOf } from './wording'

/** Where in the pane a sentence belongs. */
export type Field =
  | 'holdings'
  | 'returns'
  | 'factors'
  | 'estimator'
  | 'look-back'
  | 'periods per year'
  | 'capital'
  | 'currency'
  | 'benchmark'
  | 'tails'
  | 'study'
  | 'limits'
  | 'trades'
  | 'table'
  | 'proof'
  | 'report'
  | 'history'

export type Status =
  | { readonly kind: 'nothing linked' }
  /** both blocks are read, nothing is computed from them yet */
  | { readonly kind: 'ready' }
  | { readonly kind: 'up to date' }
  | { readonly kind: 'stale'; readonly since: Area | null; readonly sentence: string }
  | { readonly kind: 'failed'; readonly sentence: string; readonly area: Area | null }

/** A question put to the user, with what happens on yes. */
export interface Proposal {
  /** what kind of question it is and about which cells: the same one stands but once */
  readonly key: string
  /** where a fault met on the way belongs; an earlier one there is answered */
  readonly field: Field
  readonly sentence: string
  readonly button: string
  /** @param say takes what has to be said of it */
  readonly accept: (work: Work, say: (sentence: string) => void) => Promise<void>
}

type Part = SourcePart | 'table' | ReportPart

/** The blocks that names in the workbook hold. */
const LINKED: readonly SourcePart[] = ['holdings', 'returns', 'factors', 'limits', 'capital']

/** Why a book looks at its sheet again; 'look' writes nothing: at opening, and when the user has edited the written table. */
export type Cause = 'edit' | 'look' | 'calculation' | 'compute'

/** Refreshes that follow recalculations alone, without an edit by the user, before the book takes itself for its own cause. */
const MOST_UNASKED_REFRESHES = 3

/**
 * One book of a workbook: a holdings block, a returns block, the figures computed from them, and the table they were written to.
 * It knows how to read, compute, write and refresh; when to do so is its owner's business. Its methods throw Faults.
 */
export class LinkedBook {
  title: string
  settings: Settings
  breakdown: Breakdown | null = null
  /** what was found about the data, as soon as both blocks are read; null until then */
  checks: readonly CheckLine[] | null = null
  /** what was computed at length about the figures that stand now */
  studies: Studies = NO_STUDIES
  /** trades on the figures that stand now */
  readonly trading: Trading
  /** what of it leaves the pane besides the linked table */
  readonly reporting: Reporting
  status: Status = { kind: 'nothing linked' }
  faults: { readonly [F in Field]?: string } = {}
  proposals: readonly Proposal[] = []
  /** whether names in the workbook hold the ranges, so that they follow inserted rows and survive a save */
  linked = false
  /** whether the workbook keeps anything of this book: names or settings, of an earlier link too */
  kept = false
  /** what of its saved settings could not be read, as a sentence */
  readonly unread: string | null

  /** the status that only a table left behind has caused: the figures are good, and writing it ends it */
  #tableStatus: Status | null = null
  /** counts the user's edits to the blocks and the moves around them, so that figures read before one are not called up to date after it */
  #edits = 0
  /** how many of them the figures that stand have seen */
  #readEdits = 0
  readonly #blocks: LinkedBlocks
  #model: {
    match: Match
    returns: ReturnsReading
    factors: ReturnsReading | null
    choices: string
    book: BookModel
  } | null = null
  readonly #table: WrittenTable
  readonly #inspection = new Inspection()
  #inspected: readonly unknown[] = []
  #unasked = 0
  readonly #asked = new Set<string>()
  constructor(
    readonly id: string,
    readonly workbook: Workbook,
    readonly culture: Culture,
    readonly calculator: Calculator,
    saved: { readonly book?: Json; readonly history?: Json } = {},
    onChange: () => void = () => undefined,
  ) {
    this.#blocks = new LinkedBlocks(workbook, culture)
    this.trading = new Trading(workbook, culture, calculator, onChange)
    this.#table = new WrittenTable(workbook, this.keptName('table'), 'Risk')
    this.reporting = new Reporting(workbook, calculator, {
      id,
      nameOf: (part) => this.keptName(part),
      ...(saved.history === undefined ? {} : { history: saved.history }),
    })
    const { book = null } = saved
    const entry = typeof book === 'object' && book !== null && 'settings' in book ? book : null
    this.title = entry && typeof entry.title === 'string' ? entry.title : `Book ${id}`
    this.linked = entry !== null
    this.kept = this.linked
    if (this.linked)
      this.status = { kind: 'stale', since: null, sentence: 'The linked blocks are not read yet.' }
    const { settings, unread } = entry
      ? settingsFromJson(entry.settings as Json)
      : { settings: DEFAULT_SETTINGS, unread: [] }
    this.settings = settings
    this.unread =
      unread.length > 0
        ? `${this.title}: settings saved with this workbook could not be read and stand at their defaults: ${listOf(unread)}.`
        : null
  }

  get holdings(): HoldingsReading | null {
    return this.#blocks.holdings
  }

  get returns(): ReturnsReading | null {
    return this.#blocks.returns
  }

  /** the returns of factors, where the book has such a block */
  get factors(): ReturnsReading | null {
    return this.#blocks.factors
  }

  /** the table of limits, where the book has one */
  get limits(): LimitsReading | null {
    return this.#blocks.limits
  }

  /** which series each holding goes with, as soon as both blocks are read */
  get match(): Match | null {
    return this.#blocks.match
  }

  /** Where the written table lies. */
  get table(): Area | null {
    return this.#table.area
  }

  /** What is saved with the workbook about this book. */
  toJson(): Json {
    return { title: this.title, settings: settingsToJson(this.settings) }
  }

  keptName(part: Part): string {
    return `${this.id}_${part}`
  }

  // ---- what the sheet's events mean

  /** Notes an edit by the user; tells how this book has to look again, if it concerns it. */
  heedEdit(area: Area | null, sheet: string): Cause | null {
    // any edit may be what the next recalculation comes from
    this.#unasked = 0
    if (!this.#blocks.heedEdit(area, sheet)) {
      if (area !== null && this.linked && this.#blocks.isBeside(area)) return 'edit'
      const { table } = this
      const touches = table !== null && (area ? overlap(area, table) !== null : table.sheet === sheet)
      return touches ? 'look' : null
    }
    this.#edits++
    if (this.breakdown) {
      const place = area ? addressOf(area) : sheet
      this.status = { kind: 'stale', since: area, sentence: `Stale since ${place} was edited.` }
    }
    return 'edit'
  }

  /** Notes a recalculation of a sheet; tells whether formulas of this book may have changed by it. */
  heedCalculation(sheet: string): boolean {
    if (!this.linked || !this.breakdown || this.#unasked > MOST_UNASKED_REFRESHES) return false
    return this.#blocks.heedCalculation(sheet)
  }

  /** Cells, rows, columns or a sheet came, went or got another name: everything has to be looked at again. */
  heedMove(sheet: string): boolean {
    const reads = this.#blocks.heedMove(sheet)
    const { proof, live } = this.reporting.state
    const written = [this.table, proof?.area, live].some((area) => area?.sheet === sheet)
    const concerned = this.linked && (reads || written)
    if (concerned) this.#edits++
    return concerned
  }

  // ---- reading

  /** Takes an area the user points at as the holdings or the returns. */
  async take(part: SourcePart, area: Area, work: Work): Promise<void> {
    if (part === 'capital') return this.#chooseCapital(await this.#blocks.capitalIn(area, work), area, work)
    if (area.rows * area.columns === 1) {
      const [seen] = await this.workbook.look([{ at: area, region: true }])
      const region = seen?.region
      if (region && region.rows * region.columns > 1)
        this.#propose({
          key: `${part} ${addressOf(region)}`,
          field: part,
          sentence: `Use the filled cells around it, ${addressOf(region)}, as the ${PART_WORDS[part]}?`,
          button: 'Use them',
          accept: (later) => this.take(part, region, later),
        })
      throw new Fault(
        'selection',
        'found one cell',
        `a block is needed, with all rows and columns of the ${PART_WORDS[part]}`,
        {
          argument: part,
        },
      )
    }
    if (part === 'holdings') {
      const isFirst = this.holdings === null
      if (await this.#blocks.readHoldings(area, this.settings, work)) this.trading.restart()
      if (isFirst && this.title === `Book ${this.id}`) this.title = area.sheet
    } else if (part === 'limits') return this.#takeLimits(area, work)
    else await this.#blocks.readSeries(part, area, this.settings, work)
    if (part === 'factors' && this.linked && this.settings.estimator.kind !== 'factors') {
      // no figure rests on them: the book stays as it is, and knows where they are
      this.#heedStops(part)
      await this.#save({ [this.keptName('factors')]: area })
      return
    }
    // names still hold the earlier ranges until the next compute
    this.linked = false
    this.#settle(part)
  }

  /** Lets go of the block of factor returns. */
  async dropFactors(work: Work): Promise<void> {
    this.#blocks.factors = null
    if (this.linked) await this.#save({ [this.keptName('factors')]: null })
    if (this.settings.estimator.kind === 'factors') await this.choose({ estimator: { kind: 'sample' } }, work)
  }

  /** Takes an area as the table of limits: figures stay, and are held against them. */
  async #takeLimits(area: Area, work: Work): Promise<void> {
    await this.#blocks.readLimits(area, work)
    const stop = this.limits?.findings.find(({ weight }) => weight === 'stops')
    if (this.linked) {
      await this.#save({ [this.keptName('limits')]: area })
      await this.refresh('compute', work)
    } else if (this.breakdown) await this.compute(work)
    else if (stop) throw new PlacedFault(stop, 'limits')
  }

  /** Lets go of the table of limits. */
  async dropLimits(work: Work): Promise<void> {
    this.#blocks.dropLimits()
    if (this.linked) {
      await this.#save({ [this.keptName('limits')]: null })
      await this.refresh('compute', work)
    } else if (this.breakdown) await this.compute(work)
  }

  /** Takes a figure of capital and the cell it is followed in, or null where it stands by itself. */
  async #chooseCapital(capital: number | null, area: Area | null, work: Work): Promise<void> {
    this.settings = { ...this.settings, capital }
    this.#blocks.capital = area
    this.#blocks.interpret(this.settings)
    if (this.holdings) this.#settle('holdings')
    if (this.linked) {
      await this.#save({ [this.keptName('capital')]: area })
      await this.refresh('compute', work)
    } else if (this.breakdown) await this.compute(work)
  }

  /** After a block was read: what keeps it from being used stands at its field. */
  #heedStops(part: 'holdings' | SeriesPart): void {
    const stop = this[part]?.findings.find(({ weight }) => weight === 'stops')
    const { [part]: gone, ...others } = this.faults
    void gone
    this.faults = stop ? { ...others, [part]: stop.sentence } : others
  }

  /** After a block was read: what the pane says, and whether there is enough to compute from. */
  #settle(part: 'holdings' | SeriesPart): void {
    this.#heedStops(part)
    if (!this.holdings || !this.returns) return
    this.status = this.breakdown
      ? {
          kind: 'stale',
          since: null,
          sentence: `Stale: the ${PART_WORDS[part]} were read anew. Compute brings the figures up to date.`,
        }
      : { kind: 'ready' }
  }

  // ---- choices

  /** Applies a change of settings; where there are figures they are computed anew, from the blocks as they are taken now. */
  async choose(change: Partial<Settings>, work: Work): Promise<void> {
    this.settings = { ...this.settings, ...change }
    if (change.capital !== undefined) return this.#chooseCapital(change.capital, null, work)
    if ('riskless' in change || 'currency' in change) this.#blocks.matchAnew(this.settings)
    const missing =
      'currency' in change && this.match?.currencies?.findings.find(({ weight }) => weight === 'stops')
    if (missing) this.faults = { ...this.faults, currency: missing.sentence }
    if ('roles' in change) {
      this.#blocks.interpret(this.settings)
      if (this.holdings) this.#settle('holdings')
    }
    if (this.returns && ('content' in change || 'orientation' in change || 'returnKind' in change)) {
      await this.#blocks.readSeries('returns', this.returns.area, this.settings, work)
      this.#settle('returns')
    }
    if (this.linked) {
      await this.#save()
      await this.refresh('compute', work)
    } else if (this.breakdown) await this.compute(work)
  }

  /** Gives the book another title; a written table carries it. */
  async rename(title: string, work: Work): Promise<void> {
    this.title = title.trim() === '' ? `Book ${this.id}` : title.trim()
    if (!this.linked) return
    await this.#save()
    await this.refresh('compute', work)
  }

  // ---- the data

  /** Whether the data have changed, or the choices about them, since they were looked over. */
  get inspectionDue(): boolean {
    const now = this.#inspectable()
    return now.length !== this.#inspected.length || now.some((part, k) => part !== this.#inspected[k])
  }

  #inspectable(): readonly unknown[] {
    return [this.holdings, this.returns, this.factors, this.match, this.settings]
  }

  /** Looks over the data: what may be wrong with them, and what the volatility would be with it mended. */
  async inspect(work: Work): Promise<void> {
    const { holdings, returns, factors, match } = this
    this.#inspected = this.#inspectable()
    const unfit = [holdings, returns, match].some(
      (part) => part === null || part.findings.some(({ weight }) => weight === 'stops'),
    )
    this.checks =
      unfit || !holdings || !returns || !match
        ? null
        : await this.#inspection.lines(
            { holdings, returns, factors, match },
            this.settings,
            this.calculator,
            work,
          )
  }

  // ---- computing

  /**
   * Computes from what is read; the model is kept until the returns, the matching or the settings behind it change, so that a new
   * weight costs one pass.
   *
   * @throws Fault with the first finding that stops
   */
  async #compute(work: Work): Promise<void> {
    const { holdings, returns } = this
    if (!holdings)
      throw new Fault(
        'missing',
        'no holdings are selected',
        'select the holdings block and use the selection',
        { argument: 'holdings' },
      )
    if (!returns)
      throw new Fault(
        'missing',
        'no returns are selected',
        'select the returns block and use the selection',
        { argument: 'returns' },
      )
    if (!this.match) this.#blocks.matchAnew(this.settings)
    const { match, factors, limits } = this
    if (!match) throw new Error('holdings and returns are there, and no match of them')
    for (const [field, findings] of [
      ['holdings', holdings.findings],
      ['returns', returns.findings],
      ['factors', (this.settings.estimator.kind === 'factors' && this.factors?.findings) || []],
      ['holdings', match.findings],
      ['currency', match.currencies?.findings ?? []],
    ] as const) {
      const stop = findings.find(({ weight }) => weight === 'stops')
      if (stop) throw new PlacedFault(stop, field)
    }
    const blocks = { match, holdings, returns, factors, limits }
    const wanted = modelChoices(this.settings)
    const choices = JSON.stringify(wanted)
    const known = this.#model
    const book =
      known?.returns === returns &&
      known.factors === factors &&
      known.choices === choices &&
      sameSeries(known.match, match)
        ? known.book
        : await modelOf(blocks, wanted, this.calculator, work)
    this.#model = { match, returns, factors, choices, book }
    const checks = await this.#inspection.checks(blocks, this.settings, this.calculator, work)
    const earlier = this.breakdown?.decomposition
    this.breakdown = breakDown(blocks, book, this.settings, checks)
    if (known?.book !== book || !sameFigures(earlier, this.breakdown.decomposition))
      this.studies = afterChange(this.studies)
    // a limit that cannot be read leaves the figures as good as they are
    const stop = limits?.findings.find(({ weight }) => weight === 'stops')
    // and what was said of the trades is answered by the next word about them
    const { trades } = this.faults
    this.faults = {
      ...(stop ? { limits: stop.sentence } : {}),
      ...(trades === undefined ? {} : { trades }),
    }
    const { settings, breakdown } = this
    const { capital, capitalFormula } = this.#blocks
    this.reporting.stand({ title: this.title, blocks, book, settings, breakdown, capital })
    await this.#standForTrades({ blocks, book, settings, breakdown, capitalFormula }, work)
  }

  /** Figures stand whether or not series that are not held can be added to them. */
  async #standForTrades(standing: Standing, work: Work): Promise<void> {
    try {
      await this.trading.stand(standing, this.#blocks.typed, work)
    } catch (fault) {
      if (!(fault instanceof Fault) || fault.code === 'cancelled') throw fault
      this.faults = { ...this.faults, trades: explain(fault, () => '') }
    }
  }

  /**
   * Writes the weights of the list of trades to the sheet, and follows them.
   *
   * @param shown what was to be written when this was asked for; the list may have moved on while it waited its turn
   */
  async applyTrades(
    shown: readonly WriteLine[],
    replaceFormulas: boolean,
    work: Work,
  ): Promise<readonly Area[]> {
    this.#heedBehind()
    return this.#follow(await this.trading.apply(shown, replaceFormulas), work)
  }

  /** Puts back what stood in the cells before. */
  async undoTrades(work: Work): Promise<readonly Area[]> {
    // rows may have come or gone: where the cells lie now is looked up first
    if (this.#isBehind)
      try {
        await this.refresh('edit', work)
      } catch (fault) {
        // a sheet that cannot be computed from may be just what is to be taken back; the cells are looked at again in any case
        if (!(fault instanceof Fault) || fault.code === 'cancelled') throw fault
      }
    return this.#follow(await this.trading.undo(), work)
  }

  async #follow(areas: readonly Area[], work: Work): Promise<readonly Area[]> {
    this.#edits++
    await this.refresh('compute', work)
    return areas
  }

  /** Whether the sheet has changed, or moved, since it was read. */
  get #isBehind(): boolean {
    return this.#edits !== this.#readEdits
  }

  /** Trades are worked out from the weights of the sheet, so they wait until these are read. */
  #heedBehind(): void {
    const isGood = this.status.kind === 'up to date' || this.status === this.#tableStatus
    if (!this.linked || !isGood || this.#isBehind)
      throw new Fault(
        'changed',
        'the figures are behind the sheet',
        'Compute comes first; nothing was written',
        { argument: 'trades' },
      )
  }

  /** Draws the history anew, to see how sure the figures are. */
  async bootstrap(choice: BootstrapChoice, work: Work): Promise<void> {
    const { book, breakdown } = this.#computed()
    const study = await bootstrapStudy(
      book,
      breakdown.decomposition,
      breakdown.bands,
      choice,
      this.calculator,
      work,
    )
    const { outdated } = this.studies
    this.studies = { ...this.studies, bootstrap: study, outdated: { ...outdated, bootstrap: false } }
  }

  /** Forecasts the past at today's weights, or tests the forecasts in a block. */
  async backtest(choice: BacktestChoice, given: Area | null, work: Work): Promise<void> {
    if (given) {
      const block = await this.workbook.read(given, { shape: true, signal: work.signal })
      const reading = readReturns(block, { ...FACTOR_SETTINGS, content: 'returns' }, this.culture)
      const stop = reading.findings.find(({ weight }) => weight === 'stops')
      if (stop) throw new PlacedFault(stop, 'study')
      this.#keepBacktest(givenBacktest(reading, choice.confidence))
      return
    }
    const { book, breakdown } = this.#computed()
    const study = await backtestStudy(
      book,
      breakdown.decomposition,
      choice,
      this.settings,
      this.calculator,
      work,
    )
    this.#keepBacktest(study)
  }

  #keepBacktest(backtest: BacktestStudy): void {
    const { outdated } = this.studies
    this.studies = { ...this.studies, backtest, outdated: { ...outdated, backtest: false } }
  }

  #computed(): { book: BookModel; breakdown: Breakdown } {
    if (this.#model && this.breakdown) return { book: this.#model.book, breakdown: this.breakdown }
    throw new Fault('missing', 'nothing is computed yet', 'Compute comes first', { argument: 'study' })
  }

  /** Computes on the user's word, links the ranges, and brings a written table along. */
  async compute(work: Work): Promise<void> {
    this.#unasked = 0
    if (this.linked) {
      await this.refresh('compute', work)
      return
    }
    if (this.#blocks.hasChanged('holdings') && this.holdings)
      await this.take('holdings', this.holdings.area, work)
    for (const part of SERIES) {
      const block = this[part]
      if (this.#blocks.hasChanged(part) && block) await this.take(part, block.area, work)
    }
    await this.#compute(work)
    await this.#save(
      Object.fromEntries(LINKED.map((part) => [this.keptName(part), this.#blocks.areaOf(part)])),
    )
    this.linked = true
    // a look now finds formulas among the weights, brings an earlier table along and sees what lies beyond the blocks
    await this.refresh('compute', work)
  }

  async #save(keep?: WritePlan['keep']): Promise<void> {
    await this.workbook.write({
      patches: [],
      ...(keep ? { keep } : {}),
      remember: { [`book.${this.id}`]: this.toJson() },
    })
    this.kept = true
  }

  /**
   * Looks at the sheet again in one request, reads anew what has changed, recomputes, and rewrites the table in one request when its
   * values differ.
   *
   * @param cause 'edit' by the user, 'calculation' of formulas, 'look' (nothing is written), 'compute' on the user's word
   */
  async refresh(cause: Cause, work: Work): Promise<void> {
    if (cause === 'compute') this.#unasked = 0
    const edits = this.#edits
    const { wants } = this.reporting
    const [table = null, ...others] = await this.workbook.look([
      { at: { kept: this.keptName('table') }, formulas: true },
      ...wants,
      ...this.#blocks.wants((part) => this.keptName(part)),
    ])
    this.reporting.place(others.slice(0, wants.length))
    const looked = others.slice(wants.length)
    const news = this.#blocks.compare(looked, this.settings)
    if (news.capital !== undefined) this.settings = { ...this.settings, capital: news.capital }
    this.#blocks.place(news)
    const { holdings, returns } = news.seen
    const isSame =
      !news.holdings && !news.returns && !news.factors && !news.limits && news.capital === undefined
    if (cause === 'calculation' && isSame) return
    if (cause === 'calculation' && ++this.#unasked > MOST_UNASKED_REFRESHES) {
      this.status = {
        kind: 'failed',
        sentence: `The weights changed ${MOST_UNASKED_REFRESHES} times without an edit of yours: it seems that the written table feeds its own weights. Refreshing has stopped; Compute starts it again.`,
        area: holdings?.area ?? null,
      }
      return
    }
    await this.#blocks.follow(news, this.settings, work)
    this.#table.area = table?.area ?? null
    await this.#compute(work)
    if (news.limitsGone)
      this.faults = {
        ...this.faults,
        limits:
          'The table of limits is gone: its cells or its sheet were deleted. Select it again and use the selection.',
      }
    this.#tableStatus = table ? await this.#bringTableAlong(table, cause) : null
    // after an edit that came meanwhile the status stays stale: a refresh of its own is on the way
    if (edits === this.#edits) this.status = this.#tableStatus ?? { kind: 'up to date' }
    this.#readEdits = edits
    if (cause === 'look') await this.reporting.checkKept()
    if (holdings && returns) await this.#lookBeyond(holdings, returns, news.seen.limits)
  }

  /** @returns what keeps the table behind the figures, or null */
  async #bringTableAlong(seen: Seen, cause: Cause): Promise<Status | null> {
    this.proposals = this.proposals.filter(({ key }) => !key.startsWith('grow '))
    if (!this.breakdown) return null
    const table = breakdownTable(this.title, this.breakdown)
    if (this.#table.stands(seen, table)) return null
    if (cause === 'look')
      return {
        kind: 'stale',
        since: seen.area,
        sentence: `The table in ${addressOf(seen.area)} differs from the figures computed now. Compute brings it up to date.`,
      }
    try {
      await this.#table.rewrite(seen, table, this.#sources())
      this.#tableFollows()
      return null
    } catch (fault) {
      if (!(fault instanceof Fault)) throw fault
      this.faults = { ...this.faults, table: explain(fault) }
      if (fault.code !== 'occupied') return { kind: 'failed', sentence: explain(fault), area: seen.area }
      this.#proposeOver('grow', seen.area, table, async (later) => {
        await this.writeTable('where it was', later, 'replace', seen.area)
      })
      return {
        kind: 'stale',
        since: seen.area,
        sentence: `The table in ${addressOf(seen.area)} has to grow and cannot. ${explain(fault)}`,
      }
    }
  }

  // ---- writing

  /** Writes the table to a new sheet, at the selection, or where it was; figures that are behind the sheet are computed first. */
  async writeTable(where: Place, work: Work, over: 'blank' | 'replace' = 'blank', at?: Area): Promise<Area> {
    const table = breakdownTable(this.title, await this.#current('table', work))
    const target = at ?? (await this.#table.corner(where))
    try {
      const area = await this.#table.write(where, target, table, over, this.#sources())
      this.#tableFollows()
      return area
    } catch (fault) {
      if (fault instanceof Fault && fault.code === 'occupied')
        this.#proposeOver('over', target, table, async (later) => {
          await this.writeTable(where, later, 'replace', target)
        })
      throw fault
    }
  }

  /** After a write: figures that only waited for their table are up to date with it. */
  #tableFollows(): void {
    this.kept = true
    if (this.status === this.#tableStatus) this.status = { kind: 'up to date' }
    this.#tableStatus = null
  }

  /** @param kind 'over' for a write the user asked for, 'grow' for a refresh that needs more room */
  #proposeOver(kind: 'over' | 'grow', target: Area, table: Table, accept: Proposal['accept']): void {
    this.#propose({
      key: `${kind} ${addressOf(areaOfTable(target, table))}`,
      field: 'table',
      sentence: `Write over what stands in ${addressOf(areaOfTable(target, table))}?`,
      button: 'Write over it',
      accept,
    })
  }

  /** Writes what was found about the data to a sheet of its own; an earlier list of this book gives way to it. */
  async writeChecks(today: number, work: Work): Promise<Area> {
    if (this.checks === null || this.inspectionDue) await this.inspect(work)
    if (this.checks === null)
      throw new Fault(
        'missing',
        'the data are not looked over yet',
        'holdings and returns without faults that stop are needed',
        { argument: 'table' },
      )
    return this.reporting.write(
      'checks',
      checksTable(this.title, this.checks, this.breakdown, today),
      this.#sources(),
    )
  }

  /** Writes the comparison of the trades to a sheet of its own. */
  writeTrades(): Promise<Area> {
    return this.reporting.write('trades', this.trading.tradesTable(this.title), this.#sources())
  }

  /** Writes scenarios side by side to a sheet of their own. */
  writeStress(scenarios: readonly Scenario[]): Promise<Area> {
    return this.reporting.write('stress', this.trading.stressTable(this.title, scenarios), this.#sources())
  }

  /** Writes the back-test or the bootstrap that was run last to a sheet of its own. */
  writeStudy(kind: 'back-test' | 'bootstrap', today: number): Promise<Area> {
    const { title, breakdown, studies } = this
    const { backtest, bootstrap } = studies
    const table =
      kind === 'back-test'
        ? backtest && backtestTable(title, backtest, breakdown, today)
        : bootstrap && breakdown && bootstrapTable(title, bootstrap, breakdown, today)
    if (table) return this.reporting.write(kind === 'back-test' ? 'backtest' : kind, table, this.#sources())
    throw new Fault('missing', `no ${kind} stands beside these figures`, 'run it first', {
      argument: 'study',
    })
  }

  /** The figures, computed first where they are behind the sheet: what is written is never known to be old. */
  async #current(argument: Field, work: Work): Promise<Breakdown> {
    const isGood = this.status.kind === 'up to date' || this.status === this.#tableStatus
    if (this.breakdown && !isGood) await this.compute(work)
    if (this.breakdown) return this.breakdown
    throw new Fault('missing', 'nothing is computed yet', 'Compute comes first', { argument })
  }

  /** Writes the table of functions that are live in cells. */
  async writeLive(where: Place, work: Work, over: 'blank' | 'replace' = 'blank', at?: Area): Promise<Area> {
    await this.#current('table', work)
    const target = at ?? (await this.reporting.cornerOfLive(where))
    try {
      return await this.reporting.writeLive(where, over, target, this.#sources())
    } catch (fault) {
      if (fault instanceof Fault && fault.code === 'occupied')
        this.#proposeOver('over', target, this.reporting.liveTable(target), async (later) => {
          await this.writeLive(where, later, 'replace', target)
        })
      throw fault
    }
  }

  /** Writes the formulas that recompute the figures, or brings them along. */
  async writeProof(work: Work): Promise<Area> {
    await this.#current('proof', work)
    return this.reporting.writeProof(this.#sources())
  }

  /** Writes one printable page. */
  async writeCommittee(choice: CommitteeChoice, today: number, work: Work): Promise<Area> {
    await this.#current('report', work)
    if (this.checks === null || this.inspectionDue) await this.inspect(work)
    return this.reporting.writeCommittee(choice, this.checks, today, this.#sources(), work)
  }

  /** Keeps the figures with their date; asks first where that would replace a kept result. */
  async keepResult(note: string, today: number, work: Work): Promise<Area | null> {
    await this.#current('history', work)
    const earlier = this.reporting.replacedNow()
    if (earlier === null) return this.reporting.keep(note, today, null)
    const date = earlier.dataDate === null ? 'without a date' : `of ${dateText(earlier.dataDate)}`
    this.#propose({
      key: `keep ${earlier.id}`,
      field: 'history',
      sentence: `A result ${date} is kept already (on ${dateText(earlier.keptOn)}); once replaced, it can no longer be compared. Replace it?`,
      button: 'Replace it',
      accept: async (later, say) => {
        // the sheet may have moved on since it was asked
        await this.#current('history', later)
        if (this.reporting.replacedNow()?.id !== earlier.id)
          throw new Fault(
            'changed',
            `the data of this book are of another date than when it was asked whether to replace the result ${date}`,
            'keep the result again',
            { argument: 'history' },
          )
        const area = await this.reporting.keep(note, today, earlier.id)
        say(`Result kept in ${addressOf(area)}. ${this.reporting.left ?? ''}`.trim())
      },
    })
    return null
  }

  /** Splits the change of risk between two kept results, or a kept one and now. */
  async compareResults(from: string, to: string, today: number, work: Work): Promise<void> {
    if (to === NOW) await this.#current('history', work)
    await this.reporting.compare(from, to, today, work)
  }

  /** Writes the comparison asked for last to a sheet of its own. */
  async writeChange(today: number, work: Work): Promise<Area> {
    if (this.reporting.state.change?.to.isNow) await this.#current('history', work)
    return this.reporting.writeChange(this.title, today, this.#sources(), work)
  }

  #sources(): Sources {
    const words = (part: SourcePart): string => (part === 'capital' ? part : PART_WORDS[part])
    return LINKED.map((part) => [words(part), this.#blocks.areaOf(part) ?? undefined])
  }

  /** Lets go of a table that another book was written over. */
  releaseTable(): Promise<void> {
    return this.#table.release()
  }

  /** What this book keeps in the workbook, to be taken away with it. */
  async forget(): Promise<WritePlan> {
    const parts: readonly Part[] = [...LINKED, 'table']
    const { patches, keep, remember } = await this.reporting.forget()
    return {
      patches,
      keep: { ...keep, ...Object.fromEntries(parts.map((part) => [this.keptName(part), null])) },
      remember: { ...remember, [`book.${this.id}`]: null },
    }
  }

  /** Takes off the questions that belonged to an earlier action. */
  dropQuestions(): void {
    this.proposals = this.proposals.filter(({ key }) => key.startsWith('include '))
  }

  // ---- what has grown beyond the linked blocks

  #propose(proposal: Proposal): void {
    if (this.#asked.has(proposal.key)) return
    this.proposals = [...this.proposals.filter(({ key }) => key !== proposal.key), proposal]
  }

  /** Takes a question off; one that came of a refresh and was declined is not asked again, one that answers a command is. */
  settle(proposal: Proposal, declined: boolean): void {
    if (declined && /^(include|grow) /.test(proposal.key)) this.#asked.add(proposal.key)
    this.proposals = this.proposals.filter(({ key }) => key !== proposal.key)
  }

  async #lookBeyond(holdings: Seen, returns: Seen, limits: Seen | null): Promise<void> {
    this.proposals = this.proposals.filter(({ key }) => !key.startsWith('include '))
    const keyOf = (area: Area): string => `include ${addressOf(area)}`
    const growths = await growthBeside(
      this.workbook,
      { holdings, returns, limits, table: this.table },
      {
        holdings: this.holdings,
        returns: this.returns,
        limits: this.limits,
        settings: this.settings,
        culture: this.culture,
      },
      (wider) => this.#asked.has(keyOf(wider)),
    )
    for (const { part, wider, sentence } of growths)
      this.#propose({
        key: keyOf(wider),
        field: part,
        sentence,
        button: 'Include',
        accept: (work) => this.#include(part, wider, work),
      })
  }

  async #include(part: 'holdings' | 'returns' | 'limits', wider: Area, work: Work): Promise<void> {
    await this.workbook.write({ patches: [], keep: { [this.keptName(part)]: wider } })
    await this.refresh('compute', work)
  }
}

const sameSeries = (a: Match, b: Match): boolean =>
  a.seriesOf.length === b.seriesOf.length &&
  a.seriesOf.every((series, i) => series === b.seriesOf[i]) &&
  currencyKey(a.currencies) === currencyKey(b.currencies)

/** Whether two decompositions are of the same weights, scaled alike. */
const sameFigures = (a: Decomposition | undefined, b: Decomposition): boolean =>
  a !== undefined &&
  a.periodsPerYear === b.periodsPerYear &&
  a.weights.length === b.weights.length &&
  a.weights.every((weight, i) => weight === b.weights[i])
