import { Fault } from '../core'
import type { Work } from './calculator'
import type { Area, Block, Culture } from './cells'
import { addressOf, isBlank, isFormula, overlap, sameArea } from './cells'
import { PlacedFault } from './findings'
import type { HoldingsReading } from './holdings'
import { readHoldings } from './holdings'
import type { LimitsReading } from './limits'
import { readLimits } from './limits'
import type { Match } from './matching'
import { matchHoldings } from './matching'
import { numberInCell } from './numbers'
import type { ReturnsReading } from './returns'
import { readReturns } from './returns'
import type { Settings } from './settings'
import type { TypedCells } from './trading'
import type { Seen, Want, Workbook } from './workbook'
import { countOf, quote } from './wording'

/** A block whose rows are dates. */
export type SeriesPart = 'returns' | 'factors'

/** What a book reads from the sheet. */
export type SourcePart = 'holdings' | SeriesPart | 'limits' | 'capital'

export const SERIES: readonly SeriesPart[] = ['returns', 'factors']
const SOURCES: readonly SourcePart[] = ['holdings', 'returns', 'factors', 'limits', 'capital']

export const PART_WORDS = {
  holdings: 'holdings',
  returns: 'returns',
  factors: 'factor returns',
  limits: 'limits',
} as const

/** Factors are returns or prices as the content says, whatever the user has said of the other block. */
export const FACTOR_SETTINGS = { content: null, orientation: null, returnKind: 'simple' } as const

/** What a look found that differs from what was read. */
export interface News {
  readonly seen: { readonly [P in SourcePart]: Seen | null }
  readonly holdings: boolean
  readonly returns: boolean
  readonly factors: boolean
  readonly limits: boolean
  /** the figure in the cell of the capital, where it is another one; undefined where it is not */
  readonly capital: number | undefined
  /** whether there was a table of limits that is not there any more */
  readonly limitsGone: boolean
}

/**
 * The blocks of one book in the sheet: where they lie, what was read from them, and what of that has changed since. Reads and matches; what
 * follows from it is its owner's business. Its methods throw Faults.
 */
export class LinkedBlocks {
  holdings: HoldingsReading | null = null
  returns: ReturnsReading | null = null
  factors: ReturnsReading | null = null
  limits: LimitsReading | null = null
  /** which series each holding goes with, as soon as both blocks are read */
  match: Match | null = null
  /** what was typed in the cells of the holdings, when last looked at */
  typed: TypedCells | null = null
  /** the cell that the capital is followed in */
  capital: Area | null = null

  readonly #workbook: Workbook
  readonly #culture: Culture
  #holdingsBlock: Block | null = null
  #limitsBlock: Block | null = null
  readonly #areFormulas = { holdings: false, returns: false, factors: false, limits: false, capital: false }
  /** the block being read, whose edits count although it is not known yet */
  #reading: { part: SeriesPart; area: Area } | null = null
  /** what has changed in the sheet since it was read */
  readonly #changed = { holdings: false, returns: false, factors: false }

  constructor(workbook: Workbook, culture: Culture) {
    this.#workbook = workbook
    this.#culture = culture
  }

  areaOf(part: SourcePart): Area | null {
    switch (part) {
      case 'capital':
        return this.capital
      case 'limits':
        return this.#limitsBlock?.area ?? null
      default:
        return this[part]?.area ?? null
    }
  }

  /** The cell of the capital, where it holds a formula. */
  get capitalFormula(): Area | null {
    return this.#areFormulas.capital ? this.capital : null
  }

  hasChanged(part: 'holdings' | SeriesPart): boolean {
    return this.#changed[part]
  }

  // ---- what the sheet's events mean

  /** Notes an edit; tells whether it touches any of the blocks. */
  heedEdit(area: Area | null, sheet: string): boolean {
    const touches = (part: Area | null): boolean =>
      part !== null && (area ? overlap(area, part) !== null : part.sheet === sheet)
    const holdings = (['holdings', 'capital', 'limits'] as const).some((part) => touches(this.areaOf(part)))
    if (holdings) this.#changed.holdings = true
    const series = SERIES.filter(
      (part) => touches(this.areaOf(part)) || (this.#reading?.part === part && touches(this.#reading.area)),
    )
    for (const part of series) this.#changed[part] = true
    return holdings || series.length > 0
  }

  /** Whether an edit lies just beyond the holdings, the returns or the limits, where they may have grown. */
  isBeside(area: Area): boolean {
    return (['holdings', 'returns', 'limits'] as const).some((part) => {
      const own = this.areaOf(part)
      return own !== null && overlap({ ...own, rows: own.rows + 1, columns: own.columns + 1 }, area) !== null
    })
  }

  /** Notes a recalculation of a sheet; tells whether formulas among the blocks may have changed by it. */
  heedCalculation(sheet: string): boolean {
    const recalculated = SOURCES.filter(
      (part) => this.#areFormulas[part] && this.areaOf(part)?.sheet === sheet,
    )
    for (const part of SERIES) if (recalculated.includes(part)) this.#changed[part] = true
    return recalculated.length > 0
  }

  /** Cells, rows, columns or a sheet came, went or got another name; tells whether any of the blocks lies there. */
  heedMove(sheet: string): boolean {
    // cells that close a gap leave the block where it was, with other numbers in it
    for (const part of SERIES)
      if (
        this.areaOf(part)?.sheet === sheet ||
        (this.#reading?.part === part && this.#reading.area.sheet === sheet)
      )
        this.#changed[part] = true
    return SOURCES.some((part) => this.areaOf(part)?.sheet === sheet)
  }

  // ---- reading what the user points at

  /** @returns whether the block lies elsewhere than the one before */
  async readHoldings(area: Area, settings: Settings, work: Work): Promise<boolean> {
    const block = await this.#workbook.read(area, { shape: true, signal: work.signal })
    const isOther = !sameArea(this.#holdingsBlock?.area ?? null, area)
    this.#holdingsBlock = block
    this.#changed.holdings = false
    this.interpret(settings)
    return isOther
  }

  /** Makes sense of the holdings' cells, and of the limits, which name them. */
  interpret(settings: Settings): void {
    if (!this.#holdingsBlock) return
    this.holdings = readHoldings(this.#holdingsBlock, settings, this.#culture)
    this.#interpretLimits()
    this.matchAnew(settings)
  }

  /** Without holdings the names of limits say nothing yet. */
  #interpretLimits(): void {
    this.limits =
      this.#limitsBlock && this.holdings ? readLimits(this.#limitsBlock, this.holdings, this.#culture) : null
  }

  matchAnew({ riskless, currency }: Settings): void {
    const { holdings, returns } = this
    this.match = holdings && returns ? matchHoldings(holdings, returns, riskless, currency) : null
  }

  async readLimits(area: Area, work: Work): Promise<void> {
    this.#limitsBlock = await this.#workbook.read(area, { shape: true, signal: work.signal })
    this.#interpretLimits()
  }

  dropLimits(): void {
    this.#limitsBlock = null
    this.limits = null
  }

  async readSeries(part: SeriesPart, area: Area, settings: Settings, work: Work): Promise<void> {
    // what is edited from now on may miss the reading
    this.#changed[part] = false
    this.#reading = { part, area }
    try {
      const block = await this.#workbook.read(area, {
        shape: true,
        signal: work.signal,
        progress: (share) => {
          work.progress(part === 'returns' ? 'Reading the returns' : 'Reading the factor returns', share)
        },
      })
      this[part] = readReturns(block, part === 'returns' ? settings : FACTOR_SETTINGS, this.#culture)
    } catch (fault) {
      this.#changed[part] = true
      throw fault
    } finally {
      this.#reading = null
    }
    if (part === 'returns') this.matchAnew(settings)
    // formulas are looked for along the newest and the oldest row only: a block is filled one way
    const row = (k: number): Area => ({ ...area, row: area.row + k, rows: 1 })
    const edges = await this.#workbook.look([
      { at: row(area.rows - 1), formulas: true },
      { at: row(Math.min(1, area.rows - 1)), formulas: true },
    ])
    this.#areFormulas[part] = edges.some((edge) => hasFormula(edge))
  }

  /** The capital in a cell the user points at. */
  async capitalIn(area: Area, work: Work): Promise<number> {
    const isOne = area.rows * area.columns === 1
    const value = isOne ? (await this.#workbook.read(area, { signal: work.signal })).values[0]?.[0] : ''
    const capital = numberInCell(value ?? '', this.#culture)
    if (!isOne || capital === null || capital <= 0)
      throw new Fault(
        'selection',
        isOne
          ? `found ${isBlank(value) ? 'a blank' : quote(value)}`
          : `found ${countOf(area.rows * area.columns, 'cell')}`,
        'one cell with a number above 0 is needed',
        { argument: 'capital' },
      )
    return capital
  }

  // ---- following what is linked

  /** What to look at to see whether anything has changed; the answers go to `compare` in this order. */
  wants(kept: (part: SourcePart) => string): readonly Want[] {
    const at = (part: SourcePart): Pick<Want, 'at'> => ({ at: { kept: kept(part) } })
    return [
      { ...at('holdings'), values: true, shape: true, formulas: true, region: true },
      { ...at('returns'), region: true },
      at('factors'),
      { ...at('limits'), values: true, shape: true, formulas: true, region: true },
      { ...at('capital'), values: true, formulas: true },
    ]
  }

  /**
   * Holds what a look found against what was read.
   *
   * @throws Fault "missing" for a block that is gone; where the cell of the capital holds none
   */
  compare(looked: readonly (Seen | null)[], settings: Settings): News {
    const [holdings = null, returns = null, factors = null, limits = null, capital = null] = looked
    if (!holdings) throw goneFault('holdings')
    if (!returns) throw goneFault('returns')
    if (!factors && settings.estimator.kind === 'factors') throw goneFault('factors')
    if (!capital && this.capital)
      throw new Fault(
        'missing',
        `the cell of the capital, ${addressOf(this.capital)}, is gone`,
        'point at another cell or type the capital',
        { argument: 'capital' },
      )
    const isOther = (part: SeriesPart, seen: Seen | null): boolean =>
      seen ? !this[part] || !sameArea(this[part].area, seen.area) || this.#changed[part] : this[part] !== null
    const figure = capital && this.#figureOf(capital, settings)
    const isOtherBlock = (before: Block | null, now: Seen | null): boolean =>
      before === null || now === null
        ? before !== now
        : !sameArea(before.area, now.area) || !sameValues(before.values, now.values ?? [])
    return {
      seen: { holdings, returns, factors, limits, capital },
      holdings: isOtherBlock(this.#holdingsBlock, holdings),
      returns: isOther('returns', returns),
      factors: isOther('factors', factors),
      limits: isOtherBlock(this.#limitsBlock, limits),
      capital: figure ?? undefined,
      limitsGone: limits === null && this.#limitsBlock !== null,
    }
  }

  /** The capital as its cell has it, or null where it is that of the settings. */
  #figureOf(seen: Seen, { capital }: Settings): number | null {
    const typed = seen.values?.[0]?.[0] ?? ''
    const figure = numberInCell(typed, this.#culture)
    if (figure === capital) return null
    if (figure === null || figure <= 0)
      throw new PlacedFault(
        {
          weight: 'stops',
          sentence: `${addressOf(seen.area)}: found ${quote(typed)} as the capital; a number above 0 is needed.`,
          area: seen.area,
        },
        'capital',
      )
    return figure
  }

  /** Notes where things lie and which of them are formulas; nothing is read yet. */
  place({ seen: { holdings, limits, capital } }: News): void {
    this.typed = holdings?.formulas ? { area: holdings.area, formulas: holdings.formulas } : null
    this.#areFormulas.holdings = hasFormula(holdings)
    this.#areFormulas.limits = hasFormula(limits)
    this.#areFormulas.capital = hasFormula(capital)
    this.capital = capital?.area ?? null
  }

  /** Reads what a look found to be new. */
  async follow({ seen, returns, factors }: News, settings: Settings, work: Work): Promise<void> {
    if (seen.holdings) this.#holdingsBlock = blockOf(seen.holdings)
    this.#limitsBlock = seen.limits && blockOf(seen.limits)
    this.#changed.holdings = false
    this.interpret(settings)
    if (returns && seen.returns) await this.readSeries('returns', seen.returns.area, settings, work)
    if (!seen.factors) this.factors = null
    else if (factors) await this.readSeries('factors', seen.factors.area, settings, work)
  }
}

const hasFormula = (seen: Seen | null): boolean =>
  seen?.formulas?.some((cells) => cells.some(isFormula)) ?? false

const blockOf = ({ area, values, hiddenRows, merged }: Seen): Block => ({
  area,
  values: values ?? [],
  ...(hiddenRows ? { hiddenRows } : {}),
  ...(merged ? { merged } : {}),
})

const goneFault = (part: 'holdings' | SeriesPart): Fault =>
  new Fault(
    'missing',
    `the range of the ${PART_WORDS[part]} is gone: its cells or its sheet were deleted`,
    `select the ${PART_WORDS[part]} again and use the selection`,
    { argument: part },
  )

const sameValues = (a: Block['values'], b: Block['values']): boolean =>
  a.length === b.length &&
  a.every((row, r) => row.length === b[r]?.length && row.every((value, c) => value === b[r]?.[c]))
