import { estimateModel, factorModel, Fault, matrixModel, returnsModel } from '../core'
import type { Estimator, FactorModel, ReturnsModel, RiskModel } from '../core'
import type { Calculator, ModelRecipe, SetUp, Work } from './calculator'
import type { Area } from './cells'
import { addressOf } from './cells'
import type { CurrencyModel } from './currency'
import { currencyModel, currencySeries, inBaseCurrency } from './currency'
import type { Finding } from './findings'
import type { HoldingsReading } from './holdings'
import type { Match } from './matching'
import { plainName } from './names'
import type { ReturnsReading } from './returns'
import type { GapRule, Settings } from './settings'
import { countOf, dateText, listOf, numberText, percentText, quote } from './wording'

/** The dates a model rests on. */
export interface Window {
  /** dates that were used: those with a return for every holding, or all of the look-back under another rule for gaps */
  readonly used: number
  /** dates within the look-back left out because some holding has a gap there */
  readonly dropped: number
  readonly first: number | null
  readonly last: number | null
}

/** Returns of the dates all holdings share, and what dates these are. */
export interface CommonReturns {
  readonly values: Float64Array
  readonly rows: readonly number[]
  readonly size: number
  /** serial numbers of the dates; null where the block has none */
  readonly serials: readonly number[] | null
}

/** The returns that error bands come from, and what has to be said beside them. */
export interface Precision {
  readonly model: ReturnsModel
  readonly lags: number
  readonly note: string | null
}

export interface BookModel {
  /** over the holdings, in their order; riskless ones have zero variance */
  readonly model: RiskModel
  /** how to make it again elsewhere */
  readonly recipe: ModelRecipe
  /** the returns of the dates all holdings share; null for a covariance matrix, or where fewer than two dates are shared */
  readonly history: ReturnsModel | null
  /** the returns behind `history`, as they were read */
  readonly data: CommonReturns | null
  /** or why there are no error bands */
  readonly precision: Precision | string
  /** where the benchmark is one series: a model of its own, with that series as the last position */
  readonly benchmark: { readonly model: RiskModel; readonly name: string } | null
  /** with the series of the currencies as further positions, or why there is none; null where risk is not split by currency */
  readonly currency: CurrencyModel | string | null
  readonly factors: { readonly model: FactorModel; readonly names: readonly string[] } | null
  readonly window: Window | null
  /** the rule for gaps that had a part in it; 'common dates' where there were none */
  readonly rule: GapRule
  /** what the model rests on, as label and value */
  readonly quality: readonly (readonly [string, string])[]
  readonly normality: SetUp['normality']
  readonly findings: readonly Finding[]
}

/** What of the settings a model depends on, besides the blocks themselves. */
export type ModelChoices = Pick<Settings, 'estimator' | 'gaps' | 'repair' | 'lookBack' | 'benchmark'>

export const modelChoices = ({ estimator, gaps, repair, lookBack, benchmark }: Settings): ModelChoices => ({
  estimator,
  gaps,
  repair,
  lookBack,
  benchmark,
})

/** The blocks of one book, as read. */
export interface Blocks {
  readonly match: Match
  readonly holdings: HoldingsReading
  readonly returns: ReturnsReading
  readonly factors: ReturnsReading | null
}

/**
 * Builds the risk model of a book's holdings: the look-back, the rule for gaps, the estimator. What is heavy is left to the calculator.
 *
 * @param extent 'model alone' leaves out what is only told beside the figures: the condition number and the tests of normality
 * @throws Fault "too-few" when fewer than 2 dates are left, naming the series that leaves the fewest; "zero-risk" when nothing moves;
 *               "unknown-choice" for choices that do not go together; what the estimators throw
 * @cost         O(T n) here once, and the estimator's set-up in the calculator; later weight changes cost one pass
 */
export async function modelOf(
  blocks: Blocks,
  choices: ModelChoices,
  calculator: Calculator,
  work: Work,
  extent: 'whole' | 'model alone' = 'whole',
): Promise<BookModel> {
  return blocks.returns.content === 'covariance'
    ? givenModel(blocks, choices)
    : new Estimation(blocks, choices, calculator, work).model(extent)
}

type Matrix = ModelRecipe & { readonly kind: 'matrix' }

function givenModel({ match, returns }: Blocks, { estimator, benchmark }: ModelChoices): BookModel {
  inBaseCurrency(returns, match.seriesOf, match.currencies)
  const recipeOfSeries = (series: readonly number[]): Matrix => {
    const size = series.length
    const matrix = new Float64Array(size * size)
    series.forEach((a, i) =>
      series.forEach((b, j) => {
        if (a >= 0 && b >= 0) matrix[i * size + j] = returns.values[a * returns.columns + b] ?? NaN
      }),
    )
    return { kind: 'matrix', matrix, size }
  }
  const own = recipeOfSeries([...match.seriesOf])
  const { currencies } = match
  const foreign = currencies && currencySeries(currencies)
  const withCurrencies = (): RiskModel => {
    const { matrix, size } = recipeOfSeries([...match.seriesOf, ...(foreign ?? [])])
    return matrixModel(matrix, size)
  }
  const findings: Finding[] = []
  if (estimator.kind !== 'sample')
    findings.push({
      weight: 'notes',
      sentence: 'The estimator has no part here: the covariance matrix is taken as given.',
      area: null,
    })
  if (benchmark.kind === 'series')
    findings.push({
      weight: 'warns',
      sentence: 'A benchmark series needs returns: beside a covariance matrix it is not used.',
      area: null,
    })
  return {
    model: matrixModel(own.matrix, own.size),
    recipe: own,
    history: null,
    data: null,
    precision: 'A covariance matrix does not tell how many dates it rests on.',
    benchmark: null,
    currency:
      currencies &&
      foreign &&
      (foreign.length === 0
        ? nothingForeign(currencies.base)
        : currencyModel(withCurrencies(), currencies, foreign)),
    factors: null,
    window: null,
    rule: 'common dates',
    quality: [],
    normality: null,
    findings,
  }
}

/** Returns of some dates, row-major; NaN where there is a gap. */
interface Returns {
  readonly values: Float64Array
  readonly rows: readonly number[]
}

/** One run from the blocks to the model, and what is found on the way. */
class Estimation {
  readonly #blocks: Blocks
  readonly #choices: ModelChoices
  readonly #calculator: Calculator
  readonly #work: Work
  readonly #findings: Finding[] = []
  /** the holdings with returns; the others are marked riskless */
  readonly #risky: readonly number[]

  constructor(blocks: Blocks, choices: ModelChoices, calculator: Calculator, work: Work) {
    const { match, returns } = blocks
    this.#blocks = { ...blocks, returns: inBaseCurrency(returns, match.seriesOf, match.currencies) }
    this.#choices = choices
    this.#calculator = calculator
    this.#work = work
    this.#risky = [...blocks.match.seriesOf.keys()].filter((i) => (blocks.match.seriesOf[i] ?? -1) >= 0)
  }

  async model(extent: 'whole' | 'model alone'): Promise<BookModel> {
    const { returns, match } = this.#blocks
    const size = match.seriesOf.length
    const factors = this.#choices.estimator.kind === 'factors' ? this.#factors() : null
    const { all, used, common, rule } = this.#dates(factors)
    this.#lookForStillSeries(used, size)
    this.#lookForCurrencyGaps(all)

    const { estimator } = this.#choices
    const made = await this.#calculator.run(
      'set up',
      {
        rule,
        bare: extent === 'model alone',
        repair: this.#choices.repair,
        estimator: estimator.kind === 'factors' ? null : estimator,
        returns: used.values,
        dates: used.rows.length,
        common: rule === 'common dates' ? null : common.values,
        size,
      },
      this.#work,
    )
    const estimate =
      made.matrix !== null
        ? this.#fromPairs(made.matrix, size, rule, used.rows.length, made)
        : factors !== null
          ? this.#fromFactors(used, size, factors)
          : this.#fromEstimator(used, size, estimator as Estimator, made)
    // means and past returns are those of dates that count alike; a model that has them is not made twice
    const { precision } = estimate
    const has = typeof precision !== 'string' && precision.model.weighting.kind !== 'exponential'
    const history = has
      ? precision.model
      : common.rows.length < 2
        ? null
        : returnsModel(common.values, common.rows.length, size)
    return {
      ...estimate,
      history,
      data: history && {
        ...common,
        size,
        serials: returns.dates && common.rows.map((t) => returns.dates?.[t] ?? NaN),
      },
      benchmark: this.#benchmark(used, rule),
      currency: extent === 'whole' ? this.#currency(used, rule) : null,
      window: {
        used: used.rows.length,
        dropped: all.length - used.rows.length,
        first: returns.dates?.[used.rows[0] ?? 0] ?? null,
        last: returns.dates?.[used.rows.at(-1) ?? 0] ?? null,
      },
      rule,
      normality: made.normality,
      findings: this.#findings,
    }
  }

  #nameOf(i: number): string {
    return quote(this.#blocks.holdings.holdings[i]?.name ?? '')
  }

  #cellOf(i: number): Area {
    return this.#blocks.returns.seriesCell(this.#blocks.match.seriesOf[i] ?? 0)
  }

  #returnsOf(rows: readonly number[]): Returns {
    const { returns, match } = this.#blocks
    const size = match.seriesOf.length
    const values = new Float64Array(rows.length * size)
    rows.forEach((t, k) => {
      for (const i of this.#risky)
        values[k * size + i] = returns.values[t * returns.columns + (match.seriesOf[i] ?? 0)] ?? NaN
    })
    return { values, rows }
  }

  /** The dates of the look-back, those common to all holdings, and the rule that holds about the others. */
  #dates(factors: FactorRows | null): {
    all: readonly number[]
    used: Returns
    common: Returns
    rule: GapRule
  } {
    const { returns, match } = this.#blocks
    const start = lookBackStart(returns, this.#choices.lookBack, this.#findings)
    const inView = returns.rows - start
    if (inView < 2 && returns.rows >= 2)
      throw new Fault(
        'too-few',
        `found ${countOf(inView, 'date')} of returns within the look-back`,
        `at least 2 of the ${returns.rows} there are${spanText(returns.dates)} are needed`,
        { argument: 'look-back' },
      )
    const all = Array.from({ length: inView }, (_, k) => start + k)
    const gapsOf = new Map<number, number>()
    let withoutFactors = 0
    const common = all.filter((t) => {
      let complete = true
      for (const i of this.#risky) {
        if (!Number.isNaN(returns.values[t * returns.columns + (match.seriesOf[i] ?? 0)])) continue
        complete = false
        gapsOf.set(i, (gapsOf.get(i) ?? 0) + 1)
      }
      if (!complete || !factors || factors.rowOf(t) >= 0) return complete
      withoutFactors++
      return false
    })
    const [shortest, gaps] = [...gapsOf].sort((a, b) => b[1] - a[1])[0] ?? []
    const shortestText =
      shortest === undefined
        ? ''
        : `${this.#nameOf(shortest)} has the most gaps: ${gaps ?? 0} of ${inView} dates`
    // without gaps the rules are all the same
    const rule = shortest === undefined ? 'common dates' : this.#choices.gaps
    if (rule !== 'common dates' && this.#choices.estimator.kind !== 'sample')
      throw new Fault(
        'unknown-choice',
        `the rule for gaps is “${GAP_WORDS[rule]}”, which goes with the sample covariance alone`,
        'choose the sample estimator, or the dates common to all holdings',
        { argument: 'estimator' },
      )
    if (rule !== 'common dates')
      return { all, used: this.#returnsOf(all), common: this.#returnsOf(common), rule }

    if (common.length < 2)
      throw new Fault(
        'too-few',
        `found ${countOf(common.length, 'date')} with a return for every holding${shortestText ? ` (${shortestText})` : ''}${withoutFactors > 0 ? ` and for the factors (${withoutFactors} without)` : ''}`,
        'at least 2 are needed',
        { argument: 'returns' },
      )
    if (common.length < inView) {
      const reasons = [
        ...(shortestText ? [`where a holding has no return; ${shortestText}`] : []),
        ...(withoutFactors > 0 ? [`${withoutFactors} for want of factor returns`] : []),
      ]
      this.#findings.push({
        weight: 'warns',
        sentence: `${inView - common.length} of ${inView} dates left out, ${reasons.join('; ')}.`,
        area: shortest === undefined ? null : this.#cellOf(shortest),
      })
    }
    if (common.length <= this.#risky.length && this.#choices.estimator.kind !== 'factors')
      this.#findings.push({
        weight: 'warns',
        sentence: `${countOf(common.length, 'date')} for ${countOf(this.#risky.length, 'holding')}: too few to tell all the correlations apart; some mixes of these holdings look riskless without being so.`,
        area: null,
      })
    const used = this.#returnsOf(common)
    return { all, used, common: used, rule }
  }

  /** Series that never change count as riskless, and it is said; nothing at all that moves is a fault. */
  #lookForStillSeries({ values, rows }: Returns, size: number): void {
    const still = this.#risky.filter((i) => {
      let seen = NaN
      for (let k = 0; k < rows.length; k++) {
        const value = values[k * size + i] ?? NaN
        if (Number.isNaN(value)) continue
        if (!Number.isNaN(seen) && value !== seen) return false
        seen = value
      }
      return true
    })
    if (this.#risky.length > 0 && still.length === this.#risky.length)
      throw new Fault(
        'zero-risk',
        'found returns that never change in any series',
        'at least one series that moves is needed',
        { argument: 'returns' },
      )
    for (const i of still)
      this.#findings.push({
        weight: 'warns',
        sentence: `${addressOf(this.#cellOf(i))}: the returns of ${this.#nameOf(i)} never change, so it counts as riskless.`,
        area: this.#cellOf(i),
      })
  }

  /** Dates that foreign holdings lose for want of their currency's return: the rule for gaps knows them by the holdings alone. */
  #lookForCurrencyGaps(rows: readonly number[]): void {
    const { match, returns } = this.#blocks
    const { currencies } = match
    if (currencies?.returnsIn !== 'local') return
    for (const series of currencySeries(currencies)) {
      const gaps = rows.filter((t) => Number.isNaN(returns.values[t * returns.columns + series])).length
      const label = currencies.labels[currencies.seriesOf.indexOf(series)] ?? ''
      if (gaps > 0)
        this.#findings.push({
          weight: 'warns',
          sentence: `${quote(label)} has no return on ${gaps} of ${countOf(rows.length, 'date')}: holdings in ${label} have none in ${currencies.base} there.`,
          area: returns.seriesCell(series),
        })
    }
  }

  // ---- the three kinds of model

  #fromEstimator(
    { values, rows }: Returns,
    size: number,
    estimator: Estimator,
    { shrinkage, condition }: SetUp,
  ): Estimate {
    const model = estimateModel(values, rows.length, size, estimator, shrinkage ?? undefined)
    const moving = [...model.variances()].filter((variance) => variance > 0).map(Math.sqrt)
    const spread = Math.max(...moving) / Math.min(...moving)
    const towardsMean = estimator.kind === 'shrinkage' && estimator.target !== 'correlation'
    if (towardsMean) {
      const own = [...model.returns.variances()].filter((variance) => variance > 0).map(Math.sqrt)
      const ownSpread = Math.max(...own) / Math.min(...own)
      if (own.length > 1 && ownSpread > 3)
        this.#findings.push({
          weight: 'warns',
          sentence: `The volatilities of the holdings differ ${numberText(ownSpread, 1)}-fold (${numberText(spread, 1)}-fold after shrinkage): this target pulls every variance toward their mean, calm holdings up and lively ones down. The target of constant correlation leaves variances as they are.`,
          area: null,
        })
    }
    return {
      model,
      recipe: { kind: 'estimated', returns: values, dates: rows.length, size, estimator, shrinkage },
      factors: null,
      precision: {
        model: model.returns,
        lags: estimator.kind === 'lagged' ? estimator.lags : 0,
        note:
          estimator.kind === 'shrinkage'
            ? 'Error of the covariance before shrinkage; the shrunk figures vary less and are pulled to one side.'
            : null,
      },
      quality: [
        this.#counts(moving.length, rows.length),
        ...(shrinkage ? ([['Shrinkage intensity', numberText(shrinkage.intensity, 4)]] as const) : []),
        ...conditionLine(condition),
      ],
    }
  }

  #fromFactors({ values, rows }: Returns, size: number, factors: FactorRows): Estimate {
    const count = factors.names.length
    const block = new Float64Array(rows.length * count)
    rows.forEach((t, k) => block.set(factors.at(t), k * count))
    const model = factorModel(values, rows.length, size, block, count)
    return {
      model,
      recipe: { kind: 'factors', returns: values, dates: rows.length, size, factors: block, count },
      factors: { model, names: factors.names },
      precision: {
        model: model.returns,
        lags: 0,
        note: 'Error of the sample covariance of the same dates, not of the factor model.',
      },
      quality: [this.#counts(this.#risky.length, rows.length), ['Factors', factors.names.join(', ')]],
    }
  }

  #fromPairs(
    matrix: Float64Array,
    size: number,
    rule: GapRule,
    inAll: number,
    { pairs, completed, condition }: SetUp,
  ): Estimate {
    const quality: (readonly [string, string])[] = [this.#counts(this.#risky.length, inAll)]
    if (pairs?.overlap) {
      const { i, j, dates } = pairs.overlap
      quality.push([
        'Shortest overlap',
        `${countOf(dates, 'date')}: ${this.#nameOf(i)} and ${this.#nameOf(j)}`,
      ])
    }
    if (pairs?.repair) quality.push(['Eigenvalue check', this.#repaired(pairs.repair)])
    if (pairs?.overlap && pairs.overlap.dates < FEW_IN_COMMON) {
      const { i, j, dates } = pairs.overlap
      this.#findings.push({
        weight: 'warns',
        sentence:
          i === j
            ? `${this.#nameOf(i)} has ${countOf(dates, 'date')} only: its volatility is little more than an accident of them.`
            : `${this.#nameOf(i)} and ${this.#nameOf(j)} have ${countOf(dates, 'date')} in common: their correlation is little more than an accident of them.`,
        area: this.#cellOf(j),
      })
    }
    for (const { columns, dates, longer, redundant } of completed?.slice(1) ?? []) {
      const names = listOf(Array.from(columns, (i) => this.#nameOf(i)))
      const used = longer - redundant.length
      const without =
        redundant.length === 0
          ? ''
          : `; left out of it, as the others give them: ${listOf(Array.from(redundant, (i) => this.#nameOf(i)))}`
      quality.push([
        'Completed',
        `${names}: ${countOf(dates, 'date')}, the others by regression on ${countOf(longer, 'longer series', 'longer series')} (Stambaugh 1997)${without}`,
      ])
      // residuals of T dates have T - k - 1 degrees of freedom, and their likeliest variance the divisor T
      const free = (dates - used - 1) / dates
      if (free < LEAST_FREE)
        this.#findings.push({
          weight: 'warns',
          sentence: `${names}: ${countOf(dates, 'date')} for a regression on ${countOf(used, 'series', 'series')}, which fits the past too well: the risk these do not explain is understated, to some ${percentText(Math.sqrt(free), 0)} of what it is.`,
          area: this.#cellOf(columns[0]!),
        })
    }
    return {
      model: matrixModel(matrix, size),
      recipe: { kind: 'matrix', matrix, size },
      factors: null,
      precision: `The rule for gaps “${GAP_WORDS[rule]}” has no error bands here; choose the dates common to all holdings for them.`,
      quality: [...quality, ...conditionLine(condition)],
    }
  }

  /** What was found about the eigenvalues of a matrix of pairs, and what was done about it. */
  #repaired({ how, changed, smallestBefore, largestChange, converged }: PairRepair): string {
    const before = `Smallest eigenvalue of the correlations ${smallestBefore.toPrecision(2).replaceAll('-', '\u2212')}`
    if (!changed || largestChange === null) return `${before}: nothing to mend`
    const { i, j, before: was, after } = largestChange
    const method =
      how === 'nearest'
        ? `replaced by the nearest ones that do (Higham 2002${converged ? '' : '; not quite the nearest, as the search ended early'})`
        : 'shrunk toward none until they do (Higham, Strabić & Šego 2016)'
    const change = `the largest change is from ${numberText(was, 3)} to ${numberText(after, 3)}, between ${this.#nameOf(i)} and ${this.#nameOf(j)}`
    this.#findings.push({
      weight: 'warns',
      sentence: `Correlations from each pair’s own overlap do not hold together and were ${method}; ${change}.`,
      area: null,
    })
    return `${before}; ${method}; ${change}`
  }

  #counts(positions: number, dates: number): readonly [string, string] {
    return [
      'Positions and dates',
      `${countOf(positions, 'holding')} that move, ${countOf(dates, 'date')}: ${numberText(dates / Math.max(1, positions), 1)} dates a holding`,
    ]
  }

  // ---- what else enters by name or by date

  #factors(): FactorRows {
    const { factors, returns } = this.#blocks
    if (!factors)
      throw new Fault(
        'missing',
        'no block of factor returns is selected',
        'select the factor returns and use the selection',
        { argument: 'factors' },
      )
    const { columns, values } = factors
    const names = factors.names ?? Array.from({ length: columns }, (_, k) => `Factor ${k + 1}`)
    const usable = (row: number): number =>
      row >= 0 &&
      row < factors.rows &&
      values.subarray(row * columns, (row + 1) * columns).every(Number.isFinite)
        ? row
        : -1
    let rowOf: (t: number) => number
    if (returns.dates && factors.dates) {
      const places = new Map(factors.dates.map((date, row) => [Math.floor(date), row]))
      const dates = returns.dates
      if (factors.frequency !== returns.frequency)
        this.#findings.push({
          weight: 'warns',
          sentence: `Factor returns are ${factors.frequency}, the returns of the holdings ${returns.frequency}: on one date they do not tell of the same span of time.`,
          area: factors.area,
        })
      rowOf = (t) => usable(places.get(Math.floor(dates[t] ?? NaN)) ?? -1)
    } else {
      if (factors.rows !== returns.rows)
        throw new Fault(
          'shape',
          `found ${countOf(factors.rows, 'row')} of factor returns for ${countOf(returns.rows, 'row')} of returns`,
          'dates on both blocks, or as many rows in the same order, are needed',
          { argument: 'factors' },
        )
      this.#findings.push({
        weight: 'warns',
        sentence: 'No dates on both blocks: factor returns are matched to returns by their place.',
        area: factors.area,
      })
      rowOf = usable
    }
    return { names, rowOf, at: (t) => values.subarray(rowOf(t) * columns, (rowOf(t) + 1) * columns) }
  }

  /** The benchmark's series as one more position, on the dates used where it has a return as well. */
  #benchmark({ rows }: Returns, rule: GapRule): BookModel['benchmark'] {
    const { benchmark, estimator } = this.#choices
    if (benchmark.kind !== 'series') return null
    const { returns, match } = this.#blocks
    const column = returns.names?.findIndex((name) => plainName(name) === plainName(benchmark.name)) ?? -1
    if (column < 0)
      throw new Fault(
        'unmatched',
        `found no series ${quote(benchmark.name)} among the returns`,
        'choose a series of theirs as the benchmark',
        { argument: 'benchmark' },
      )
    const size = match.seriesOf.length + 1
    const own = (t: number): number => returns.values[t * returns.columns + column] ?? NaN
    const complete = rows.filter(
      (t) =>
        !Number.isNaN(own(t)) &&
        this.#risky.every(
          (i) => !Number.isNaN(returns.values[t * returns.columns + (match.seriesOf[i] ?? 0)]),
        ),
    )
    if (complete.length < 2)
      throw new Fault(
        'too-few',
        `found ${countOf(complete.length, 'date')} with a return of the benchmark and of every holding`,
        'at least 2 are needed',
        { argument: 'benchmark' },
      )
    if (complete.length < rows.length)
      this.#findings.push({
        weight: 'warns',
        sentence: `Risk against the benchmark rests on ${complete.length} of ${countOf(rows.length, 'date')}: the others have no return of ${quote(benchmark.name)} or of a holding.`,
        area: returns.seriesCell(column),
      })
    const values = new Float64Array(complete.length * size)
    complete.forEach((t, k) => {
      for (const i of this.#risky)
        values[k * size + i] = returns.values[t * returns.columns + (match.seriesOf[i] ?? 0)] ?? NaN
      values[k * size + size - 1] = own(t)
    })
    // A factor model or a rule for gaps has no part in one more series. Shrinkage would pull that series away from the holdings it is made of: an
    // intensity of 0.01 makes several times the tracking error of a book that follows its benchmark closely.
    const known =
      estimator.kind === 'factors' || estimator.kind === 'shrinkage'
        ? ({ kind: 'sample' } as const)
        : estimator
    if (known !== estimator || rule !== 'common dates')
      this.#findings.push({
        weight: 'warns',
        sentence:
          'Risk against the benchmark series is the sample covariance’s, on the dates it shares with all holdings, whatever the other figures are estimated by.',
        area: null,
      })
    return { model: estimateModel(values, complete.length, size, known), name: returns.names?.[column] ?? '' }
  }

  /**
   * The series of the currencies as further positions, on the same dates: there their parts add up to the figures. What more positions would
   * change the estimate of the others, or of dates without a currency's return, is no such model.
   */
  #currency({ values, rows }: Returns, rule: GapRule): BookModel['currency'] {
    const { match, returns } = this.#blocks
    const { estimator } = this.#choices
    const { currencies } = match
    if (!currencies) return null
    const foreign = currencySeries(currencies)
    if (foreign.length === 0) return nothingForeign(currencies.base)
    if (estimator.kind === 'shrinkage' || estimator.kind === 'factors' || rule !== 'common dates')
      return `The split by currency goes with the sample covariance, exponential weighting and lagged terms, on the dates common to all holdings. ${rule !== 'common dates' ? `Under the rule for gaps “${GAP_WORDS[rule]}”` : estimator.kind === 'factors' ? 'In a factor model' : 'With shrinkage'} the parts would not add up to the figures shown.`
    const of = (t: number, series: number): number => returns.values[t * returns.columns + series] ?? NaN
    const gappy = foreign.find((series) => rows.some((t) => Number.isNaN(of(t, series))))
    if (gappy !== undefined)
      return `The split by currency needs a return of every currency on every date used: ${quote(returns.names?.[gappy] ?? '')} has none on ${rows.filter((t) => Number.isNaN(of(t, gappy))).length} of ${countOf(rows.length, 'date')}.`
    const held = match.seriesOf.length
    const size = held + foreign.length
    const block = new Float64Array(rows.length * size)
    rows.forEach((t, k) => {
      block.set(values.subarray(k * held, (k + 1) * held), k * size)
      foreign.forEach((series, f) => (block[k * size + held + f] = of(t, series)))
    })
    return currencyModel(estimateModel(block, rows.length, size, estimator), currencies, foreign)
  }
}

type Estimate = Pick<BookModel, 'model' | 'recipe' | 'factors' | 'precision' | 'quality'>

type PairRepair = NonNullable<NonNullable<SetUp['pairs']>['repair']>

/** The factors' returns by row of the returns; rowOf is -1 where there are none. */
interface FactorRows {
  readonly names: readonly string[]
  readonly rowOf: (t: number) => number
  readonly at: (t: number) => Float64Array
}

export const GAP_WORDS: { readonly [R in GapRule]: string } = {
  'common dates': 'dates common to all holdings',
  'own overlap': 'each pair’s own overlap',
  completed: 'completed from the longer histories',
}

/** Dates in common below which a pair is warned of. Our own convention. */
const FEW_IN_COMMON = 20

/** Degrees of freedom over dates below which a completed history is warned of. Our own convention. */
const LEAST_FREE = 0.75

const nothingForeign = (base: string): string =>
  `Every holding stands in ${base}, the base currency: there is nothing to split.`

const conditionLine = (condition: SetUp['condition']): readonly (readonly [string, string])[] =>
  condition?.condition === null || condition === null
    ? []
    : [
        [
          'Condition number',
          Number.isFinite(condition.condition)
            ? `${condition.condition < 1e5 ? numberText(condition.condition, condition.condition < 100 ? 1 : 0) : condition.condition.toExponential(1)} (largest over smallest eigenvalue of the covariance)`
            : 'Infinite: some mixes of the holdings have no risk in these dates',
        ],
      ]

const spanText = (dates: readonly number[] | null): string =>
  dates && dates.length > 0 ? `, ${dateText(dates[0] ?? 0)} to ${dateText(dates.at(-1) ?? 0)},` : ''

/** The first row of the look-back. */
function lookBackStart(returns: ReturnsReading, lookBack: Settings['lookBack'], findings: Finding[]): number {
  if (lookBack.kind === 'all') return 0
  if (lookBack.kind === 'last') {
    if (lookBack.dates > returns.rows)
      findings.push({
        weight: 'warns',
        sentence: `The look-back of ${countOf(lookBack.dates, 'date')} reaches further than the ${returns.rows} there are.`,
        area: null,
      })
    return Math.max(0, returns.rows - Math.floor(lookBack.dates))
  }
  if (!returns.dates)
    throw new Fault(
      'blank',
      `the look-back starts at ${dateText(lookBack.date)} but the returns carry no dates`,
      'a number of dates is needed instead',
      { argument: 'look-back' },
    )
  const start = returns.dates.findIndex((date) => date >= lookBack.date)
  return start < 0 ? returns.rows : start
}
