import { Fault } from '../core'
import type { ImpliedChoice } from '../core'
import type { Blocks, BookModel } from './book-model'
import { modelChoices, modelOf } from './book-model'
import type { Breakdown } from './breakdown'
import type { Calculator, Work } from './calculator'
import { unheldSeries, withCandidates } from './candidates'
import type { Area, CellValue, Culture } from './cells'
import { addressOf, isFormula, sameArea } from './cells'
import { plainName } from './names'
import type { ProfileBasis } from './profile'
import { profileBasis } from './profile'
import { attempt, explain } from './explain'
import type { ImpliedReturns } from './implied'
import { impliedReturnsOf } from './implied'
import type { Settings } from './settings'
import type { RiskLowerings, Sizing, SizingInputs } from './sizing'
import { riskLowering, sizingOf } from './sizing'
import type { Scenario, StressComparison } from './stress'
import { stressInputs, stressOf, worstStretch } from './stress'
import { stressTable } from './stress-table'
import type { Table } from './table'
import type { Target } from './targets'
import { proposalFor } from './targets'
import { tradesLine, tradesTable } from './trades-table'
import type { Applied, Financing, Position, TradeChange, TradeGround, TradesState, WriteLine } from './trades'
import { appliedText, financingOf, positionsOf, Trades } from './trades'
import type { Workbook } from './workbook'
import { countOf, listOf, numberText, percentText, quote } from './wording'

/** What stands when a list of trades is worked out: the blocks, with the series that may be traded, and the model over them. */
export interface Standing {
  readonly blocks: Blocks
  readonly book: BookModel
  readonly settings: Settings
  readonly breakdown: Breakdown
  /** the cell of the capital, where it holds a formula */
  readonly capitalFormula: Area | null
}

/** The cells of the holdings as they were typed when last looked at. */
export interface TypedCells {
  readonly area: Area
  readonly formulas: readonly (readonly CellValue[])[]
}

const inputsOf = ({ basis, positions }: TradeGround): SizingInputs => ({
  names: basis.names,
  model: basis.model,
  weights: Float64Array.from(positions, ({ weight }) => weight),
  periods: basis.periods,
})

const sameLines = (a: readonly WriteLine[], b: readonly WriteLine[]): boolean =>
  a.length === b.length && a.every(({ area, to }, k) => sameArea(area, b[k]?.area ?? null) && to === b[k]?.to)

/** Volatilities nearer to each other than this, of themselves, differ by rounding. */
const SAME_RISK = 1e-9

const NOTHING_COMPUTED = 'Nothing is computed yet: Compute comes first.'

/**
 * The trades of one book from the first keystroke to the cells: the list, the series added to it, what a search proposes, writing the weights,
 * and taking that back. Nothing of it is saved with the workbook.
 */
export class Trading {
  readonly #list: Trades
  readonly #workbook: Workbook
  readonly #calculator: Calculator
  #candidates: readonly string[] = []
  #wide: { readonly base: BookModel; readonly names: string; readonly book: BookModel } | null = null
  /** the figures as the book has them */
  #given: Standing | null = null
  /** the same with the candidates */
  #standing: Standing | null = null
  #ground: TradeGround | null = null
  #typed: TypedCells | null = null
  #applied: readonly Applied[] = []

  constructor(workbook: Workbook, culture: Culture, calculator: Calculator, onChange: () => void) {
    this.#workbook = workbook
    this.#calculator = calculator
    this.#list = new Trades(culture, onChange)
  }

  /** null until there are figures */
  get state(): TradesState | null {
    return this.#ground && this.#list.stateOn(this.#ground)
  }

  /** What the list stands on; null until there are figures. */
  get standing(): Standing | null {
    return this.#standing
  }

  get ground(): TradeGround | null {
    return this.#ground
  }

  /**
   * Takes the figures of the book as they stand now.
   *
   * @param typed what is typed in the cells of the holdings; null where they were not looked at
   * @throws Fault those of the model with the candidates; "cancelled"
   */
  async stand(standing: Standing, typed: TypedCells | null, work: Work): Promise<void> {
    const { blocks, book, settings } = standing
    this.#given = standing
    this.#typed = typed
    const wide = withCandidates(blocks, this.#candidates, settings)
    const names = wide.holdings.holdings.slice(blocks.holdings.holdings.length).map(({ name }) => name)
    this.#candidates = names
    if (names.length === 0) return this.#standOn(blocks, book)
    try {
      this.#standOn(wide, await this.#wideModel(wide, book, settings, names, work))
    } catch (fault) {
      // the holdings are traded on without them
      this.#candidates = []
      this.#standOn(blocks, book)
      throw fault
    }
  }

  #standOn(blocks: Blocks, book: BookModel): void {
    const { breakdown, settings, blocks: own, capitalFormula } = this.#asked()
    const positions = positionsOf(blocks.holdings, own.holdings.holdings.length)
    this.#standing = { blocks, book, settings, breakdown, capitalFormula }
    const basis = profileBasis(blocks, book, settings)
    const ground: TradeGround = {
      holdings: own.holdings,
      // exposures are divided by the sum of the amounts, which trades leave alone
      bySum:
        own.holdings.capital !== null &&
        settings.capital === null &&
        own.holdings.columns.every(({ role }) => role !== 'exposure'),
      capitalFormula,
      positions,
      basis,
      limits: breakdown.limits.map(({ limit }) => limit),
      benchmark:
        settings.benchmark.kind === 'column' && positions.some(({ benchmark }) => (benchmark ?? 0) !== 0)
          ? Float64Array.from(positions, ({ benchmark }) => benchmark ?? 0)
          : null,
      formulaOf: (cell) => {
        const text = this.#typedIn(cell)
        return isFormula(text) ? String(text) : null
      },
      candidates: unheldSeries(blocks),
      notes: blocks === own ? [] : this.#ofCandidates(basis, positions, book),
    }
    this.#ground = ground
    if (this.#list.hasLostItsPlaces(ground)) {
      this.restart()
      this.#ground = {
        ...ground,
        notes: [
          'The holdings have no names and are others in number than before: the list of trades begins anew.',
        ],
      }
    }
    this.#list.beginAt(this.#ground)
  }

  /** Where series that are not held change the estimate of what is held: figures here are not those of the book itself. */
  #ofCandidates(basis: ProfileBasis, positions: readonly Position[], book: BookModel): readonly string[] {
    const { breakdown, book: own } = this.#asked()
    const wider = basis.profileOf(Float64Array.from(positions, ({ weight }) => weight)).decomposition
      .volatility
    const without = breakdown.decomposition.volatility
    if (Math.abs(wider - without) <= SAME_RISK * without) return []
    const added = positions.flatMap(({ candidate, name }) => (candidate ? [quote(name)] : []))
    const dates = [book, own].map(({ window }) => window?.used ?? 0)
    return [
      `With ${listOf(added)} the estimate is another${dates[0] === dates[1] ? '' : `, from ${countOf(dates[0] ?? 0, 'date')} instead of ${numberText(dates[1] ?? 0, 0)}`}: the weights in the sheet have a volatility of ${percentText(wider, 2)} here and of ${percentText(without, 2)} in the view Risk.`,
    ]
  }

  /** Begins anew with another block of holdings. */
  restart(): void {
    this.#candidates = []
    this.#applied = []
    this.#list.restart()
    this.#tell()
  }

  async #wideModel(
    wide: Blocks,
    base: BookModel,
    settings: Settings,
    names: readonly string[],
    work: Work,
  ): Promise<BookModel> {
    const key = names.join('\n')
    const known = this.#wide
    if (known?.base === base && known.names === key) return known.book
    const stop = wide.match.findings.find(({ weight }) => weight === 'stops')
    if (stop) throw new Fault('unmatched', stop.sentence, '', { argument: 'trades' })
    const book = await modelOf(wide, modelChoices(settings), this.#calculator, work, 'model alone')
    this.#wide = { base, names: key, book }
    return book
  }

  #typedIn(cell: Area): CellValue | undefined {
    const { area, formulas } = this.#typed ?? {}
    return area?.sheet === cell.sheet
      ? formulas?.[cell.row - area.row]?.[cell.column - area.column]
      : undefined
  }

  // ---- the list

  edit(change: TradeChange): void {
    this.#list.edit(change)
  }

  discard(): void {
    this.#list.discard()
  }

  compareFromHere(): void {
    if (this.#ground) this.#list.compareFrom(this.#ground)
  }

  /** Adds a series that is not held; takes it off again where no model can be made with it. */
  async addCandidate(name: string, work: Work): Promise<void> {
    const given = this.#asked()
    const earlier = this.#candidates
    if (!earlier.some((other) => plainName(other) === plainName(name))) this.#candidates = [...earlier, name]
    try {
      await this.stand(given, this.#typed, work)
    } catch (fault) {
      // those added before stay; their model is known
      this.#candidates = earlier
      await this.stand(given, this.#typed, work)
      throw fault
    }
  }

  async dropCandidate(name: string, work: Work): Promise<void> {
    const given = this.#asked()
    this.#candidates = this.#candidates.filter((other) => other !== name)
    this.#list.forget(name)
    await this.stand(given, this.#typed, work)
  }

  #asked(): Standing {
    if (this.#given) return this.#given
    throw new Fault('missing', 'nothing is computed yet', 'Compute comes first', { argument: 'trades' })
  }

  /** Looks for weights that reach a target and puts them into the list in place of what is typed. */
  async propose(target: Target, work: Work): Promise<void> {
    this.#asked()
    const ground = this.#ground
    if (!ground || !this.#standing) return
    const listed = this.#list.listed()
    const { proposal, weights } = await proposalFor(
      target,
      ground,
      this.#standing,
      this.#list.financing,
      this.#calculator,
      work,
    )
    this.#list.take(proposal, weights, ground, listed)
  }

  // ---- questions about the figures that stand

  /** The weights compared, before and, where trades change any, after. */
  #compared(ground: TradeGround): { before: Float64Array; after: Float64Array | null } {
    const { comparison } = this.#list.stateOn(ground)
    return typeof comparison === 'string'
      ? { before: Float64Array.from(ground.positions, ({ weight }) => weight), after: null }
      : {
          before: comparison.before.decomposition.weights,
          after: comparison.after.decomposition.weights,
        }
  }

  /** The book in scenarios, before and after the trades; or why not. */
  stressOf(scenarios: readonly Scenario[]): StressComparison | string {
    if (!this.#ground || !this.#standing) return NOTHING_COMPUTED
    const { blocks, book, settings } = this.#standing
    const { before, after } = this.#compared(this.#ground)
    return stressOf(stressInputs(blocks, book, settings), scenarios, before, after)
  }

  /** The stretch of so many dates with the largest loss at the weights in the sheet; or why there is none. */
  worstStretch(dates: number): ReturnType<typeof worstStretch> {
    if (!this.#ground || !this.#standing) return NOTHING_COMPUTED
    const { blocks, book, settings } = this.#standing
    const weights = Float64Array.from(this.#ground.positions, ({ weight }) => weight)
    return worstStretch(stressInputs(blocks, book, settings), weights, dates)
  }

  /** Risk against the weight of one position, at the weights in the sheet; or why there is none. */
  sizingOf(key: string, financing: Financing): Sizing | string {
    return this.#answer((ground) => {
      const position = ground.positions.findIndex((other) => other.key === key)
      return sizingOf(inputsOf(ground), position, financingOf(ground.positions, financing), ground.limits)
    })
  }

  /** The trades that lower risk most for each unit of turnover, at the weights in the sheet; or why there are none. */
  riskLowering(financing: Financing): RiskLowerings | string {
    return this.#answer((ground) => riskLowering(inputsOf(ground), financingOf(ground.positions, financing)))
  }

  /** What each holding would have to earn for the weights in the sheet to be optimal; or why that is not defined. */
  impliedReturns(choice: ImpliedChoice, risklessRate: number): ImpliedReturns | string {
    return this.#answer((_, { breakdown, blocks }) => {
      const expected = blocks.holdings.columns.some(({ role }) => role === 'expected return')
      return impliedReturnsOf(
        {
          names: breakdown.names,
          decomposition: breakdown.decomposition,
          expected: expected
            ? blocks.holdings.holdings.slice(0, breakdown.names.length).map((holding) => holding.expected)
            : null,
          risklessRate,
        },
        choice,
      )
    })
  }

  /** A question answered from what stands, or the sentence why it cannot be. */
  #answer<T>(question: (ground: TradeGround, standing: Standing) => T): T | string {
    const [ground, standing] = [this.#ground, this.#standing]
    if (!ground || !standing) return NOTHING_COMPUTED
    const { value, fault } = attempt(() => question(ground, standing))
    return fault ? explain(fault, () => '') : value
  }

  /** The comparison as a table to be written. */
  tradesTable(title: string): Table {
    const { breakdown } = this.#asked()
    const table = this.state && tradesTable(title, this.state, breakdown)
    if (table) return table
    throw new Fault('missing', 'no weight differs from those compared from', 'there is nothing to write', {
      argument: 'trades',
    })
  }

  /** The book in scenarios as a table to be written. */
  stressTable(title: string, scenarios: readonly Scenario[]): Table {
    const { breakdown } = this.#asked()
    const comparison = this.stressOf(scenarios)
    if (typeof comparison === 'string')
      throw new Fault('missing', comparison.replace(/\.$/, ''), 'nothing was written', { argument: 'trades' })
    return stressTable(title, comparison, breakdown, comparison.after && this.state && tradesLine(this.state))
  }

  // ---- the cells

  /**
   * Writes the weights of the list into the cells of the holdings, all or none.
   *
   * @param shown  what was shown to be written
   * @returns      the cells written
   * @throws Fault "changed" where that is not what the list says now; the first reason why they cannot be written; those of the workbook
   */
  async apply(shown: readonly WriteLine[], replaceFormulas: boolean): Promise<readonly Area[]> {
    const state = this.state
    const { holdings, positions } = this.#ground ?? {}
    if (!state || !holdings || !positions) throw this.#asked()
    const { lines, refusals } = state.preview
    const [refusal] = refusals
    if (refusal !== undefined)
      throw new Fault('selection', refusal.replace(/\.$/, ''), 'nothing was written', { argument: 'trades' })
    if (lines.length === 0)
      throw new Fault('missing', 'no weight differs from the sheet', 'there is nothing to write', {
        argument: 'trades',
      })
    if (!sameLines(lines, shown))
      throw new Fault(
        'changed',
        'what Apply would write is not what it was when it was asked for',
        'look at it again; nothing was written',
        { argument: 'trades' },
      )
    const formulas = lines.filter(({ formula }) => formula !== null)
    if (formulas.length > 0 && !replaceFormulas)
      throw new Fault(
        'occupied',
        `found ${formulas.length === 1 ? 'a formula' : 'formulas'} in ${listOf(formulas.map(({ area }) => addressOf(area)))}`,
        'say that numbers may take their place',
        { argument: 'trades' },
      )
    const listed = this.#list.listed()
    const entries = lines.map(({ area, to }) => ({ at: area, value: to, seen: this.#typedIn(area) ?? '' }))
    await this.#workbook.write({ patches: [], entries })
    this.#applied = entries.map(({ at, value, seen }) => ({
      key: positions.find(({ cell }) => sameArea(cell, at))?.key ?? '',
      was: seen,
      now: value,
    }))
    // what was typed while the cells were written stays in the list
    this.#list.discard(listed)
    this.#tell()
    return lines.map(({ area }) => area)
  }

  /**
   * Puts back what stood in the cells before the last Apply, formulas included; refuses where one of them was edited since.
   *
   * @returns the cells written
   */
  async undo(): Promise<readonly Area[]> {
    const { positions } = this.#ground ?? {}
    if (!positions || this.#applied.length === 0)
      throw new Fault('missing', 'nothing was applied', 'there is nothing to take back', {
        argument: 'trades',
      })
    const entries = this.#applied.map(({ key, was, now }) => {
      const cell = positions.find((position) => position.key === key)?.cell
      if (!cell)
        throw new Fault(
          'missing',
          `${quote(key)} is not in the holdings any more`,
          'its weight cannot be put back, and nothing was',
          { argument: 'trades' },
        )
      return { at: cell, value: was, seen: now }
    })
    await this.#workbook.write({ patches: [], entries })
    this.#applied = []
    this.#tell()
    return entries.map(({ at }) => at)
  }

  #tell(): void {
    this.#list.applied = this.#applied.length === 0 ? null : appliedText(this.#applied.length)
    this.#list.touch()
  }
}
