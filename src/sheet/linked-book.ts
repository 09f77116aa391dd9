import { Fault } from '../core'
import type { BootstrapChoice, Decomposition } from '../core'
import type { Breakdown } from './breakdown'
import { breakDown } from './breakdown'
import type { BookModel } from './book-model'
import { modelChoices, modelOf } from './book-model'
import { breakdownTable } from './breakdown-table'
import type { Calculator, Work } from './calculator'
import type { Area, Block, CellValue, Culture } from './cells'
import { addressOf, isBlank, overlap, sameArea } from './cells'
import { currencyKey } from './currency'
import { explain } from './explain'
import type { Finding } from './findings'
import type { HoldingsReading } from './holdings'
import { readHoldings } from './holdings'
import type { LimitsReading } from './limits'
import { readLimits } from './limits'
import type { Match } from './matching'
import { matchHoldings } from './matching'
import { checksTable } from './checks-table'
import { growthBeside } from './growth'
import type { CheckLine } from './inspection'
import { Inspection } from './inspection'
import { numberInCell } from './numbers'
import type { ReturnsReading } from './returns'
import { readReturns } from './returns'
import type { Settings } from './settings'
import { DEFAULT_SETTINGS, settingsFromJson, settingsToJson } from './settings'
import type { Scenario } from './stress'
import type { BacktestChoice, BacktestStudy, Studies } from './studies'
import { afterChange, backtestStudy, bootstrapStudy, givenBacktest, NO_STUDIES } from './studies'
import type { Table } from './table'
import type { Standing, TypedCells } from './trading'
import { Trading } from './trading'
import type { Json, Seen, Workbook, WritePlan } from './workbook'
import type { Place, Sources } from './written-table'
import { areaOfTable, WrittenTable } from './written-table'
import { countOf, listOf, quote } from './wording'

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
  readonly accept: (work: Work) => Promise<void>
}

/** Tables on sheets of their own that stay as they are until they are written again. */
type Apart = 'checks' | 'trades' | 'stress'

type Part = 'holdings' | 'returns' | 'factors' | 'limits' | 'table' | 'capital' | Apart

/** A block whose rows are dates. */
type SeriesPart = 'returns' | 'factors'

/** Why a book looks at its sheet again; 'look' writes nothing: at opening, and when the user has edited the written table. */
export type Cause = 'edit' | 'look' | 'calculation' | 'compute'

/** Refreshes that follow recalculations alone, without an edit by the user, before the book takes itself for its own cause. */
const MOST_UNASKED_REFRESHES = 3

/** A Fault whose place in the sheet is known. */
class PlacedFault extends Fault {
  constructor(
    readonly finding: Finding,
    argument: Field,
  ) {
    super('shape', finding.sentence, '', { argument })
  }
}

/** The sentence for a fault as the pane says it: beside the field concerned, so without the name of that field. */
export const sentenceOf = (fault: Fault): string =>
  fault instanceof PlacedFault ? fault.finding.sentence : explain(fault, () => '')

export const areaOf = (fault: Fault): Area | null =>
  fault instanceof PlacedFault ? fault.finding.area : null

/**
 * One book of a workbook: a holdings block, a returns block, the figures computed from them, and the table they were written to.
 * It knows how to read, compute, write and refresh; when to do so is its owner's business. Its methods throw Faults.
 */
export class LinkedBook {
  title: string
  settings: Settings
  holdings: HoldingsReading | null = null
  returns: ReturnsReading | null = null
  /** the returns of factors, where the book has such a block */
  factors: ReturnsReading | null = null
  /** the table of limits, where the book has one */
  limits: LimitsReading | null = null
  /** which series each holding goes with, as soon as both blocks are read */
  match: Match | null = null
  breakdown: Breakdown | null = null
  /** what was found about the data, as soon as both blocks are read; null until then */
  checks: readonly CheckLine[] | null = null
  /** what was computed at length about the figures that stand now */
  studies: Studies = NO_STUDIES
  /** trades on the figures that stand now */
  readonly trading: Trading
  status: Status = { kind: 'nothing linked' }
  faults: { readonly [F in Field]?: string } = {}
  proposals: readonly Proposal[] = []
  /** whether names in the workbook hold the ranges, so that they follow inserted rows and survive a save */
  linked = false
  /** whether the workbook keeps anything of this book: names or settings, of an earlier link too */
  kept = false
  /** what of its saved settings could not be read, as a sentence */
  readonly unread: string | null

  #holdingsBlock: Block | null = null
  /** what was typed in the cells of the holdings, when last looked at */
  #typed: TypedCells | null = null
  #weightsAreFormulas = false
  #limitsBlock: Block | null = null
  readonly #seriesAreFormulas = { returns: false, factors: false }
  #capitalArea: Area | null = null
  #capitalIsFormula = false
  /** the status that only a table left behind has caused: the figures are good, and writing it ends it */
  #tableStatus: Status | null = null
  /** counts the user's edits to the blocks and the moves around them, so that figures read before one are not called up to date after it */
  #edits = 0
  /** the block being read, whose edits count although it is not known yet */
  #reading: { part: SeriesPart; area: Area } | null = null
  #model: {
    match: Match
    returns: ReturnsReading
    factors: ReturnsReading | null
    choices: string
    book: BookModel
  } | null = null
  readonly #table: WrittenTable
  readonly #apart: { readonly [P in Apart]: WrittenTable }
  readonly #inspection = new Inspection()
  #inspected: readonly unknown[] = []
  #unasked = 0
  readonly #asked = new Set<string>()
  /** what has changed in the sheet since it was read */
  readonly #changed = { holdings: false, returns: false, factors: false }

  constructor(
    readonly id: string,
    readonly workbook: Workbook,
    readonly culture: Culture,
    readonly calculator: Calculator,
    saved?: Json,
    onChange: () => void = () => undefined,
  ) {
    this.trading = new Trading(workbook, culture, calculator, onChange)
    this.#table = new WrittenTable(workbook, this.keptName('table'), 'Risk')
    this.#apart = {
      checks: new WrittenTable(workbook, this.keptName('checks'), 'Data checks'),
      trades: new WrittenTable(workbook, this.keptName('trades'), 'Trades'),
      stress: new WrittenTable(workbook, this.keptName('stress'), 'Stress'),
    }
    const entry = typeof saved === 'object' && saved !== null && 'settings' in saved ? saved : null
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
    const touches = (part: Area | null | undefined): boolean =>
      part !== null && part !== undefined && (area ? overlap(area, part) !== null : part.sheet === sheet)
    // any edit may be what the next recalculation comes from
    this.#unasked = 0
    const holdings =
      touches(this.holdings?.area) || touches(this.#capitalArea) || touches(this.#limitsBlock?.area)
    const touched = (part: SeriesPart): boolean =>
      touches(this[part]?.area) || (this.#reading?.part === part && touches(this.#reading.area))
    const [returns, factors] = [touched('returns'), touched('factors')]
    const beside =
      area !== null &&
      this.linked &&
      (this.#isJustBeyond(this.holdings?.area, area) || this.#isJustBeyond(this.returns?.area, area))
    if (holdings) this.#changed.holdings = true
    if (returns) this.#changed.returns = true
    if (factors) this.#changed.factors = true
    if (!holdings && !returns && !factors) return beside ? 'edit' : touches(this.table) ? 'look' : null
    this.#edits++
    if (this.breakdown) {
      const place = area ? addressOf(area) : sheet
      this.status = { kind: 'stale', since: area, sentence: `Stale since ${place} was edited.` }
    }
    return 'edit'
  }

  #isJustBeyond(part: Area | undefined, area: Area): boolean {
    if (!part) return false
    const wider = { ...part, rows: part.rows + 1, columns: part.columns + 1 }
    return overlap(wider, area) !== null
  }

  /** Notes a recalculation of a sheet; tells whether formulas of this book may have changed by it. */
  heedCalculation(sheet: string): boolean {
    if (!this.linked || !this.breakdown || this.#unasked > MOST_UNASKED_REFRESHES) return false
    const weights = this.#weightsAreFormulas && this.holdings?.area.sheet === sheet
    const capital = this.#capitalIsFormula && this.#capitalArea?.sheet === sheet
    const recalculated = SERIES.filter(
      (part) => this.#seriesAreFormulas[part] && this[part]?.area.sheet === sheet,
    )
    for (const part of recalculated) this.#changed[part] = true
    return weights || capital || recalculated.length > 0
  }

  /** Cells, rows, columns or a sheet came, went or got another name: everything has to be looked at again. */
  heedMove(sheet: string): boolean {
    // cells that close a gap leave the block where it was, with other numbers in it
    for (const part of SERIES)
      if (
        this[part]?.area.sheet === sheet ||
        (this.#reading?.part === part && this.#reading.area.sheet === sheet)
      )
        this.#changed[part] = true
    const parts = [
      this.holdings?.area,
      this.returns?.area,
      this.factors?.area,
      this.#limitsBlock?.area,
      this.table,
      this.#capitalArea,
    ]
    const concerned = this.linked && parts.some((part) => part?.sheet === sheet)
    if (concerned) this.#edits++
    return concerned
  }

  // ---- reading

  /** Takes an area the user points at as the holdings or the returns. */
  async take(part: 'holdings' | SeriesPart | 'limits' | 'capital', area: Area, work: Work): Promise<void> {
    if (part === 'capital') return this.#takeCapital(area, work)
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
      const block = await this.workbook.read(area, { shape: true, signal: work.signal })
      if (this.holdings === null && this.title === `Book ${this.id}`) this.title = area.sheet
      if (!sameArea(this.#holdingsBlock?.area ?? null, area)) this.trading.restart()
      this.#holdingsBlock = block
      this.#changed.holdings = false
      this.#readHoldings()
    } else if (part === 'limits') return this.#takeLimits(area, work)
    else await this.#readSeries(part, area, work)
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
    this.factors = null
    if (this.linked) await this.#save({ [this.keptName('factors')]: null })
    if (this.settings.estimator.kind === 'factors') await this.choose({ estimator: { kind: 'sample' } }, work)
  }

  /** Takes an area as the table of limits: figures stay, and are held against them. */
  async #takeLimits(area: Area, work: Work): Promise<void> {
    this.#limitsBlock = await this.workbook.read(area, { shape: true, signal: work.signal })
    this.#readLimits()
    const stop = this.limits?.findings.find(({ weight }) => weight === 'stops')
    if (this.linked) {
      await this.#save({ [this.keptName('limits')]: area })
      await this.refresh('compute', work)
    } else if (this.breakdown) await this.compute(work)
    else if (stop) throw new PlacedFault(stop, 'limits')
  }

  /** Lets go of the table of limits. */
  async dropLimits(work: Work): Promise<void> {
    this.#limitsBlock = null
    this.limits = null
    if (this.linked) {
      await this.#save({ [this.keptName('limits')]: null })
      await this.refresh('compute', work)
    } else if (this.breakdown) await this.compute(work)
  }

  /** Reads the limits against the holdings there are; without holdings their names say nothing yet. */
  #readLimits(): void {
    this.limits =
      this.#limitsBlock && this.holdings ? readLimits(this.#limitsBlock, this.holdings, this.culture) : null
  }

  async #takeCapital(area: Area, work: Work): Promise<void> {
    const isOne = area.rows * area.columns === 1
    const value = isOne ? (await this.workbook.read(area, { signal: work.signal })).values[0]?.[0] : ''
    const capital = numberInCell(value ?? '', this.culture)
    if (!isOne || capital === null || capital <= 0)
      throw new Fault(
        'selection',
        isOne
          ? `found ${isBlank(value) ? 'a blank' : quote(value)}`
          : `found ${countOf(area.rows * area.columns, 'cell')}`,
        'one cell with a number above 0 is needed',
        { argument: 'capital' },
      )
    await this.#chooseCapital(capital, area, work)
  }

  /** Takes a figure of capital and the cell it is followed in, or null where it stands by itself. */
  async #chooseCapital(capital: number | null, area: Area | null, work: Work): Promise<void> {
    this.settings = { ...this.settings, capital }
    this.#capitalArea = area
    this.#readHoldings()
    if (this.holdings) this.#settle('holdings')
    if (this.linked) {
      await this.#save({ [this.keptName('capital')]: area })
      await this.refresh('compute', work)
    } else if (this.breakdown) await this.compute(work)
  }

  #readHoldings(): void {
    if (!this.#holdingsBlock) return
    this.holdings = readHoldings(this.#holdingsBlock, this.settings, this.culture)
    this.#readLimits()
    this.#match()
  }

  #match(): void {
    const { holdings, returns } = this
    const { riskless, currency } = this.settings
    this.match = holdings && returns ? matchHoldings(holdings, returns, riskless, currency) : null
  }

  async #readSeries(part: SeriesPart, area: Area, work: Work): Promise<void> {
    // what is edited from now on may miss the reading
    this.#changed[part] = false
    this.#reading = { part, area }
    try {
      const block = await this.workbook.read(area, {
        shape: true,
        signal: work.signal,
        progress: (share) => {
          work.progress(part === 'returns' ? 'Reading the returns' : 'Reading the factor returns', share)
        },
      })
      // factors are returns or prices as the content says, whatever the user has said of the other block
      const settings = part === 'returns' ? this.settings : FACTOR_SETTINGS
      this[part] = readReturns(block, settings, this.culture)
    } catch (fault) {
      this.#changed[part] = true
      throw fault
    } finally {
      this.#reading = null
    }
    if (part === 'returns') this.#match()
    // formulas are looked for along the newest and the oldest row only: a block is filled one way
    const row = (k: number): Area => ({ ...area, row: area.row + k, rows: 1 })
    const edges = await this.workbook.look([
      { at: row(area.rows - 1), formulas: true },
      { at: row(Math.min(1, area.rows - 1)), formulas: true },
    ])
    this.#seriesAreFormulas[part] = edges.some((edge) =>
      edge?.formulas?.some((cells) => cells.some(isFormula)),
    )
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
    if ('riskless' in change || 'currency' in change) this.#match()
    const missing =
      'currency' in change && this.match?.currencies?.findings.find(({ weight }) => weight === 'stops')
    if (missing) this.faults = { ...this.faults, currency: missing.sentence }
    if ('roles' in change) {
      this.#readHoldings()
      if (this.holdings) this.#settle('holdings')
    }
    if (this.returns && ('content' in change || 'orientation' in change || 'returnKind' in change)) {
      await this.#readSeries('returns', this.returns.area, work)
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
    const { riskless, currency } = this.settings
    const match = (this.match ??= matchHoldings(holdings, returns, riskless, currency))
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
    const { factors, limits } = this
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
    await this.#standForTrades({ blocks, book, settings: this.settings, breakdown: this.breakdown }, work)
  }

  /** Figures stand whether or not series that are not held can be added to them. */
  async #standForTrades(standing: Standing, work: Work): Promise<void> {
    try {
      await this.trading.stand(standing, this.#typed, work)
    } catch (fault) {
      if (!(fault instanceof Fault) || fault.code === 'cancelled') throw fault
      this.faults = { ...this.faults, trades: explain(fault, () => '') }
    }
  }

  /** Writes the weights of the list of trades to the sheet, and follows them. */
  async applyTrades(replaceFormulas: boolean, work: Work): Promise<readonly Area[]> {
    this.#heedBehind()
    return this.#follow(await this.trading.apply(replaceFormulas), work)
  }

  /** Puts back what stood in the cells before. */
  async undoTrades(work: Work): Promise<readonly Area[]> {
    return this.#follow(await this.trading.undo(), work)
  }

  async #follow(areas: readonly Area[], work: Work): Promise<readonly Area[]> {
    this.#edits++
    await this.refresh('compute', work)
    return areas
  }

  /** Trades are worked out from the weights of the sheet, so they wait until these are read. */
  #heedBehind(): void {
    if (!this.linked || (this.status.kind !== 'up to date' && this.status !== this.#tableStatus))
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
    if (this.#changed.holdings && this.holdings) await this.take('holdings', this.holdings.area, work)
    for (const part of SERIES) {
      const block = this[part]
      if (this.#changed[part] && block) await this.take(part, block.area, work)
    }
    await this.#compute(work)
    await this.#save({
      [this.keptName('holdings')]: this.holdings?.area ?? null,
      [this.keptName('returns')]: this.returns?.area ?? null,
      [this.keptName('factors')]: this.factors?.area ?? null,
      [this.keptName('limits')]: this.#limitsBlock?.area ?? null,
      [this.keptName('capital')]: this.#capitalArea,
    })
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
    const kept = (part: Part): { at: Area | { kept: string } } => ({ at: { kept: this.keptName(part) } })
    const [holdings, returns, table, capital, factors, limits] = await this.workbook.look([
      { ...kept('holdings'), values: true, shape: true, formulas: true, region: true },
      { ...kept('returns'), region: true },
      { ...kept('table'), formulas: true },
      { ...kept('capital'), values: true, formulas: true },
      kept('factors'),
      { ...kept('limits'), values: true, shape: true },
    ])
    if (!holdings) throw goneFault('holdings')
    if (!returns) throw goneFault('returns')
    if (!factors && this.settings.estimator.kind === 'factors') throw goneFault('factors')
    if (!capital && this.#capitalArea)
      throw new Fault(
        'missing',
        `the cell of the capital, ${addressOf(this.#capitalArea)}, is gone`,
        'point at another cell or type the capital',
        { argument: 'capital' },
      )

    const before = this.#holdingsBlock
    this.#typed = holdings.formulas ? { area: holdings.area, formulas: holdings.formulas } : null
    this.#weightsAreFormulas = holdings.formulas?.some((cells) => cells.some(isFormula)) ?? false
    const capitalValue = capital?.values ? numberInCell(capital.values[0]?.[0] ?? '', this.culture) : null
    const capitalMoved = capital !== null && capital !== undefined && capitalValue !== this.settings.capital
    if (capital && capitalMoved) {
      if (capitalValue === null || capitalValue <= 0)
        throw new PlacedFault(
          {
            weight: 'stops',
            sentence: `${addressOf(capital.area)}: found ${quote(capital.values?.[0]?.[0] ?? '')} as the capital; a number above 0 is needed.`,
            area: capital.area,
          },
          'capital',
        )
      this.settings = { ...this.settings, capital: capitalValue }
    }
    this.#capitalArea = capital?.area ?? null
    this.#capitalIsFormula = capital?.formulas?.some((cells) => cells.some(isFormula)) ?? false
    const sameHoldings =
      before !== null &&
      sameArea(before.area, holdings.area) &&
      sameValues(before.values, holdings.values ?? []) &&
      !capitalMoved
    const stands = (part: SeriesPart, seen: Seen | null | undefined): boolean =>
      seen
        ? this[part] !== null && sameArea(this[part].area, seen.area) && !this.#changed[part]
        : this[part] === null
    const sameReturns = stands('returns', returns)
    const sameFactors = stands('factors', factors)
    if (cause === 'calculation' && sameHoldings && sameReturns && sameFactors) return
    if (cause === 'calculation' && ++this.#unasked > MOST_UNASKED_REFRESHES) {
      this.status = {
        kind: 'failed',
        sentence: `The weights changed ${MOST_UNASKED_REFRESHES} times without an edit of yours: it seems that the written table feeds its own weights. Refreshing has stopped; Compute starts it again.`,
        area: holdings.area,
      }
      return
    }
    this.#holdingsBlock = blockOf(holdings)
    const limitsGone = limits === null && this.#limitsBlock !== null
    this.#limitsBlock = limits ? blockOf(limits) : null
    this.#changed.holdings = false
    this.#readHoldings()
    if (!sameReturns) await this.#readSeries('returns', returns.area, work)
    if (!factors) this.factors = null
    else if (!sameFactors) await this.#readSeries('factors', factors.area, work)
    this.#table.area = table?.area ?? null
    await this.#compute(work)
    if (limitsGone)
      this.faults = {
        ...this.faults,
        limits:
          'The table of limits is gone: its cells or its sheet were deleted. Select it again and use the selection.',
      }
    this.#tableStatus = table ? await this.#bringTableAlong(table, cause) : null
    // after an edit that came meanwhile the status stays stale: a refresh of its own is on the way
    if (edits === this.#edits) this.status = this.#tableStatus ?? { kind: 'up to date' }
    await this.#lookBeyond(holdings, returns)
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
      this.#proposeOver('grow', 'where it was', seen.area, table)
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
    if (!this.breakdown)
      throw new Fault('missing', 'nothing is computed yet', 'Compute comes first', { argument: 'table' })
    if (this.status.kind !== 'up to date' && this.status !== this.#tableStatus) await this.compute(work)
    const table = breakdownTable(this.title, this.breakdown)
    const target = at ?? (await this.#table.corner(where))
    try {
      const area = await this.#table.write(where, target, table, over, this.#sources())
      this.#tableFollows()
      return area
    } catch (fault) {
      if (fault instanceof Fault && fault.code === 'occupied') this.#proposeOver('over', where, target, table)
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
  #proposeOver(kind: 'over' | 'grow', where: Place, target: Area, table: Table): void {
    this.#propose({
      key: `${kind} ${addressOf(areaOfTable(target, table))}`,
      field: 'table',
      sentence: `Write over what stands in ${addressOf(areaOfTable(target, table))}?`,
      button: 'Write over it',
      accept: async (work) => {
        await this.writeTable(where, work, 'replace', target)
      },
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
    return this.#writeApart('checks', checksTable(this.title, this.checks, this.breakdown, today))
  }

  /** Writes the comparison of the trades to a sheet of its own. */
  writeTrades(): Promise<Area> {
    return this.#writeApart('trades', this.trading.tradesTable(this.title))
  }

  /** Writes scenarios side by side to a sheet of their own. */
  writeStress(scenarios: readonly Scenario[]): Promise<Area> {
    return this.#writeApart('stress', this.trading.stressTable(this.title, scenarios))
  }

  /** Writes a table that does not follow to a sheet of its own, where an earlier one of its kind gives way to it. */
  async #writeApart(part: Apart, table: Table): Promise<Area> {
    const [earlier] = await this.workbook.look([{ at: { kept: this.keptName(part) } }])
    const written = this.#apart[part]
    written.area = earlier?.area ?? null
    const place = written.area ? 'where it was' : 'new sheet'
    const area = await written.write(place, await written.corner(place), table, 'blank', this.#sources())
    this.kept = true
    return area
  }

  #sources(): Sources {
    return [
      ['holdings', this.holdings?.area],
      ['returns', this.returns?.area],
      ['factor returns', this.factors?.area],
      ['limits', this.#limitsBlock?.area],
      ['capital', this.#capitalArea],
    ]
  }

  /** Lets go of a table that another book was written over. */
  releaseTable(): Promise<void> {
    return this.#table.release()
  }

  /** Names that this book keeps in the workbook, to be taken away with it. */
  forget(): WritePlan {
    const parts: Part[] = [
      'holdings',
      'returns',
      'factors',
      'limits',
      'table',
      'capital',
      'checks',
      'trades',
      'stress',
    ]
    return {
      patches: [],
      keep: Object.fromEntries(parts.map((part) => [this.keptName(part), null])),
      remember: { [`book.${this.id}`]: null },
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

  async #lookBeyond(holdings: Seen, returns: Seen): Promise<void> {
    this.proposals = this.proposals.filter(({ key }) => !key.startsWith('include '))
    const keyOf = (area: Area): string => `include ${addressOf(area)}`
    const growths = await growthBeside(
      this.workbook,
      { holdings, returns, table: this.table },
      { holdings: this.holdings, returns: this.returns, settings: this.settings, culture: this.culture },
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

  async #include(part: 'holdings' | 'returns', wider: Area, work: Work): Promise<void> {
    await this.workbook.write({ patches: [], keep: { [this.keptName(part)]: wider } })
    await this.refresh('compute', work)
  }
}

const isFormula = (value: CellValue): boolean =>
  typeof value === 'string' && value.startsWith('=') && value.length > 1

const blockOf = ({ area, values, hiddenRows, merged }: Seen): Block => ({
  area,
  values: values ?? [],
  ...(hiddenRows ? { hiddenRows } : {}),
  ...(merged ? { merged } : {}),
})

const SERIES: readonly SeriesPart[] = ['returns', 'factors']

const PART_WORDS = {
  holdings: 'holdings',
  returns: 'returns',
  factors: 'factor returns',
  limits: 'limits',
} as const

const FACTOR_SETTINGS = { content: null, orientation: null, returnKind: 'simple' } as const

const goneFault = (part: 'holdings' | SeriesPart): Fault =>
  new Fault(
    'missing',
    `the range of the ${PART_WORDS[part]} is gone: its cells or its sheet were deleted`,
    `select the ${PART_WORDS[part]} again and use the selection`,
    { argument: part },
  )

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

const sameValues = (a: Block['values'], b: Block['values']): boolean =>
  a.length === b.length &&
  a.every((row, r) => row.length === b[r]?.length && row.every((value, c) => value === b[r]?.[c]))
