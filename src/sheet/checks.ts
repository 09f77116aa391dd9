import normalQuantile from '@stdlib/stats-base-dists-normal-quantile'
import { simpleReturns, splitRatio } from '../core'
import type { SplitRatio } from '../core'
import type { Blocks } from './book-model'
import type { Area } from './cells'
import { addressOf } from './cells'
import { currencySeries } from './currency'
import type { Finding } from './findings'
import { byGravity } from './findings'
import { plainName } from './names'
import type { ReturnsReading } from './returns'
import type { FarReturn, SeriesFact, SeriesFacts, TimeCorrelation } from './series-facts'
import type { EstimatorChoice, GapRule, Settings } from './settings'
import { countOf, dateText, listOf, numberText, percentText, quote } from './wording'

/** In the order in which they are told where they weigh alike. */
const KINDS = [
  'prices among returns',
  'percents',
  'constant',
  'short history',
  'ends early',
  'gaps',
  'mixed frequency',
  'missed split',
  'outlier',
  'stale prices',
  'serial correlation',
  'closing times',
  'few dates',
  'starts late',
  'dates',
  'rules on history',
] as const
export type CheckKind = (typeof KINDS)[number]

/** How the figures would be with a fault mended: by a choice that a press can apply, or from a copy of the returns. */
export interface Correction {
  readonly label: string
  readonly change: Partial<Settings> | null
  /** the returns as they would be; made when asked for, while the user's own stay as they are */
  readonly returns: (() => ReturnsReading) | null
}

/** A fault suspected in the data. The sentence says where and what; the area is the first of `areas`. */
export interface Check extends Finding {
  readonly kind: CheckKind
  /** what it does to the figures */
  readonly effect: string
  /** what can be done, in the sheet or with a choice */
  readonly remedy: string
  readonly corrections: readonly Correction[]
  /** all cells concerned, and the holdings or series they belong to */
  readonly areas: readonly Area[]
  readonly names: readonly string[]
}

// What is told and what is not. Our own conventions where no source is named.

/**
 * A return is far out beyond so many robust scales (median, 1.4826 x median distance from it), and more likely wrong than wild beyond so
 * many: of Student t with 5 degrees, fat tails for weekly returns, 1 in 8,400 lies beyond 10 and 1 in 250,000 beyond 20.
 */
const FAR = 10
const LIKELY_WRONG = 20
/** A split shows already at fewer, as its size says what it is; so many holdings far out on one date are the market. */
const FAR_FOR_A_SPLIT = 6
const FEWEST_FOR_A_MARKET = 3
const LEAST_SHARE_FOR_A_MARKET = 0.2
/** Zeros in a row that are no chance, and the share of all returns that shorter rows of them may have. */
const LONG_STILL = 5
const SHORT_STILL = 3
const MOST_STILL = 0.1
/** Chance that any series of a book is told for a correlation over time it does not have; shared out among the series (Bonferroni). */
const CHANCE = 0.01
/** Correlations over time below this change little whatever chance says. */
const LEAST_CORRELATION = 0.1
/** A history is short below this share of what the holdings usually have. */
const SHORT = 0.75
/** Gaps of more dates than this share change what the figures rest on. */
const MANY_GAPS = 0.05
/** Dates a holding below which the covariance is told to be poor. */
const FEWEST_DATES_A_HOLDING = 2
/** An average return of this size is hardly a fraction; a smaller one when the others' are so many times smaller. */
const PERCENTS = 0.2
const LIKELY_PERCENTS = 0.1
const TIMES_THE_OTHERS = 10
/** The setting takes no more. */
const MOST_LAGS = 10
/** A series that moves less than this beside the others usually do, such as cash, is not asked how it moves: it carries no risk to speak of. */
const LEAST_MOVE = 0.02
/** Lagged terms are worth offering when they bring back this much of what moves holdings together. */
const LEAST_BROUGHT_BACK = 0.5

/** Calendar days from one date to the next that need no word: holidays may fall on either end. */
const USUAL_STEPS: { readonly [frequency: string]: readonly [from: number, to: number] } = {
  daily: [1, 10],
  weekly: [5, 10],
  monthly: [25, 36],
  quarterly: [85, 98],
  yearly: [355, 375],
}

const PERIOD_WORDS: { readonly [frequency: string]: string } = {
  daily: 'day',
  weekly: 'week',
  monthly: 'month',
  quarterly: 'quarter',
  yearly: 'year',
}

/** How much history rules ask for, by frequency, in periods; told for information alone. */
const RULES: readonly {
  readonly name: string
  readonly asks: { readonly [frequency: string]: readonly [periods: number, words: string] }
}[] = [
  {
    name: 'CESR/10-788 of 2010',
    asks: { daily: [250, '1 year'] },
  },
  {
    name: 'Regulation (EU) 2017/653, Annex II',
    asks: { daily: [500, '2 years of daily prices'], weekly: [208, '4 years of weekly prices'], monthly: [60, '5 years of monthly prices'] },
  },
  {
    name: 'US Rule 18f-4 of 2020',
    asks: { daily: [750, '3 years'], weekly: [156, '3 years'], monthly: [36, '3 years'] },
  },
  {
    name: 'CESR/10-673 of 2010',
    asks: { weekly: [260, '5 years of weekly returns'], monthly: [60, '5 years of monthly returns'] },
  },
] // prettier-ignore

/**
 * Looks for faults in the data of a book. Nothing is changed by it: what can be mended comes with its corrections, and the user chooses.
 * Only series that are held, the benchmark or a currency of the holdings are told of; many findings of one kind are one line.
 *
 * @param facts of the same returns and look-back
 * @returns     the gravest first; none for a covariance matrix
 * @cost        O(T n)
 */
export function checksOf(blocks: Blocks, settings: Settings, facts: SeriesFacts): readonly Check[] {
  return blocks.returns.content === 'covariance' ? [] : new DataChecks(blocks, settings, facts).all()
}

/** A series that is held, the benchmark, or what a currency of the holdings returns. */
interface Held {
  readonly series: number
  readonly name: string
  readonly fact: SeriesFact
}

/** One suspicion about one series, before those of a kind are told together. */
interface Suspicion {
  readonly held: Held
  readonly weight: Finding['weight']
  readonly sentence: string
  readonly areas: readonly Area[]
}

type Advice = Pick<Check, 'effect' | 'remedy' | 'corrections'>

class DataChecks {
  readonly #returns: ReturnsReading
  readonly #settings: Settings
  readonly #facts: SeriesFacts
  readonly #held: readonly Held[]
  readonly #checks: Check[] = []
  /** dates of the look-back, those on which every held series has a return, and the frequency as a word for one period */
  readonly #inView: number
  readonly #common: number
  readonly #period: string
  /** robust scale of a return, the middle one of the series */
  readonly #usualScale: number
  /** series that a graver suspicion explains already */
  readonly #explained = new Set<number>()

  constructor({ match, holdings, returns }: Blocks, settings: Settings, facts: SeriesFacts) {
    this.#returns = returns
    this.#settings = settings
    this.#facts = facts
    const names = new Map<number, string>()
    holdings.holdings.forEach(({ name }, k) => {
      const series = match.seriesOf[k] ?? -1
      if (series >= 0) names.set(series, name)
    })
    // a currency's series is in the figures as those of the holdings are
    for (const series of match.currencies ? currencySeries(match.currencies) : [])
      names.set(series, returns.names?.[series] ?? '')
    const { benchmark } = settings
    const benchmarkSeries =
      benchmark.kind === 'series'
        ? (returns.names?.findIndex((name) => plainName(name) === plainName(benchmark.name)) ?? -1)
        : -1
    if (benchmarkSeries >= 0 && !names.has(benchmarkSeries))
      names.set(benchmarkSeries, returns.names?.[benchmarkSeries] ?? '')
    this.#held = [...names]
      .sort(([a], [b]) => a - b)
      .flatMap(([series, name]) => {
        const fact = facts.series[series]
        return fact ? [{ series, name, fact }] : []
      })
    this.#inView = returns.rows - facts.from
    this.#common = this.#commonDates()
    this.#usualScale = -lowerMedian(
      this.#held.filter(({ fact }) => fact.scale > 0).map(({ fact }) => -fact.scale),
    )
    this.#period = PERIOD_WORDS[facts.steps?.usual ?? ''] ?? 'date'
  }

  all(): readonly Check[] {
    if (this.#held.length === 0 || this.#inView < 2) return []
    this.#wrongUnits()
    this.#constants()
    this.#histories()
    this.#gaps()
    this.#dates()
    this.#farReturns()
    for (const { series, fact } of this.#held) if (this.#isQuiet(fact)) this.#explained.add(series)
    this.#stalePrices()
    this.#serialCorrelation()
    this.#closingTimes()
    this.#fewDates()
    this.#rules()
    const order = (kind: CheckKind): number => KINDS.indexOf(kind)
    return byGravity([...this.#checks].sort((a, b) => order(a.kind) - order(b.kind))) as readonly Check[]
  }

  // ---- how suspicions are told

  /** Up to two of a kind are told one by one, more in one line. */
  #tell(
    kind: CheckKind,
    suspicions: readonly Suspicion[],
    noun: readonly [one: string, many: string],
    advise: (about: readonly Suspicion[]) => Advice,
  ): void {
    const lines = suspicions.length < 3 ? suspicions.map((suspicion) => [suspicion]) : [suspicions]
    for (const line of lines) {
      const [first, ...others] = line
      if (!first) continue
      const names = [...new Set(line.map(({ held }) => held.name))]
      const alike =
        others.length > 0 ? ` ${countOf(others.length, `more ${noun[0]}`, `more ${noun[1]}`)} like it.` : ''
      this.#checks.push({
        kind,
        weight:
          byGravity(line.map(({ weight }) => ({ weight, sentence: '', area: null })))[0]?.weight ?? 'notes',
        sentence: first.sentence + alike,
        area: first.areas[0] ?? null,
        areas: line.flatMap(({ areas }) => areas),
        names,
        ...advise(line),
      })
    }
  }

  /** A line about the whole block. */
  #tellOnce(
    kind: CheckKind,
    weight: Finding['weight'],
    sentence: string,
    areas: readonly Area[],
    advice: Advice,
  ): void {
    this.#checks.push({ kind, weight, sentence, area: areas[0] ?? null, areas, names: [], ...advice })
  }

  #cells(rows: readonly number[], series: number): readonly Area[] {
    return joined(rows.map((row) => this.#returns.cell(row, series)))
  }

  #column({ series, fact }: Held): readonly Area[] {
    return this.#cells(range(fact.first, fact.last + 1), series)
  }

  /** "on 27 Nov 2026", or where the block has no dates "in row 12" of the returns. */
  #when(row: number): string {
    const { dates } = this.#returns
    return dates ? `on ${dateText(dates[row] ?? 0)}` : `in return ${row + 1}`
  }

  #day(row: number): string {
    const { dates } = this.#returns
    return dates ? dateText(dates[row] ?? 0) : `return ${row + 1}`
  }

  // ---- corrections

  /** An estimator goes with the dates common to all: the choice of both, where another rule holds. */
  #withEstimator(label: string, estimator: EstimatorChoice): Correction {
    const isCommon = this.#settings.gaps === 'common dates'
    return {
      label: isCommon ? label : `${label}, on the dates common to all`,
      change: isCommon ? { estimator } : { estimator, gaps: 'common dates' },
      returns: null,
    }
  }

  #withGaps(label: string, gaps: GapRule): readonly Correction[] {
    if (this.#settings.gaps === gaps) return []
    const isSample = this.#settings.estimator.kind === 'sample'
    return [
      {
        label: isSample ? label : `${label}, sample covariance`,
        change: isSample ? { gaps } : { gaps, estimator: { kind: 'sample' } },
        returns: null,
      },
    ]
  }

  #withLags(lags: number): readonly Correction[] {
    const { estimator } = this.#settings
    const most = Math.min(lags, MOST_LAGS, Math.floor(this.#common / 4))
    if (most < 1 || (estimator.kind === 'lagged' && estimator.lags >= most)) return []
    return [this.#withEstimator(`With ${countOf(most, 'lagged term')}`, { kind: 'lagged', lags: most })]
  }

  /** A copy of the returns with other numbers in some series. */
  #withReturns(
    label: string,
    series: readonly number[],
    changed: (x: Float64Array, series: number) => Float64Array,
  ): Correction {
    const { rows, columns } = this.#returns
    return {
      label,
      change: null,
      returns: () => {
        const values = this.#returns.values.slice()
        for (const i of series) {
          const x = Float64Array.from({ length: rows }, (_, t) => values[t * columns + i]!)
          changed(x, i).forEach((value, t) => (values[t * columns + i] = value))
        }
        return { ...this.#returns, values }
      },
    }
  }

  /** Choices about dates that not every holding has, as far as they can be computed from. */
  #gapCorrections(): readonly Correction[] {
    const lengths = this.#held.map(({ fact }) => fact.count)
    const canComplete = this.#held.every(
      ({ fact }) =>
        fact.gaps.length === 0 &&
        fact.last === this.#returns.rows - 1 &&
        fact.count > lengths.filter((count) => count > fact.count).length + 1,
    )
    const filled = this.#held.map(({ fact }) => fact)
    const canPair =
      Math.max(...filled.map(({ first }) => first)) < Math.min(...filled.map(({ last }) => last))
    return [
      ...(canPair ? this.#withGaps('With each pair’s own overlap', 'own overlap') : []),
      ...(canComplete ? this.#withGaps('Completed from the longer histories', 'completed') : []),
    ]
  }

  #gapEffect(): string {
    switch (this.#settings.gaps) {
      case 'common dates':
        return `${this.#common} of ${countOf(this.#inView, 'date')} have a return for every holding; the figures rest on these alone, and what the other holdings did on the rest is left out.`
      case 'own overlap':
        return 'Each pair of holdings rests on the dates it shares: correlations with a shorter series are the less sure, and may have to be mended to fit together.'
      case 'completed':
        return 'What is missing is carried over from the longer series by regression: as sure as that relation is.'
    }
  }

  #commonDates(): number {
    const { values, rows, columns } = this.#returns
    const series = Int32Array.from(this.#held, (held) => held.series)
    let common = 0
    for (let t = this.#facts.from; t < rows; t++) {
      let k = 0
      while (k < series.length && !Number.isNaN(values[t * columns + series[k]!])) k++
      if (k === series.length) common++
    }
    return common
  }

  // ---- the checks

  /** Prices among returns, and returns typed as percentages without the sign. */
  #wrongUnits(): void {
    const prices = this.#held.filter(({ fact }) => fact.count > 2 && fact.isPositive && fact.size > 0.5)
    for (const { series } of prices) this.#explained.add(series)
    this.#tell(
      'prices among returns',
      prices.map((held) => ({
        held,
        weight: 'warns',
        sentence: `${addressOf(this.#returns.seriesCell(held.series))}: ${quote(held.name)} looks like prices among returns: always above 0, ${numberText(held.fact.size)} on average.`,
        areas: [this.#returns.seriesCell(held.series), ...this.#column(held)],
      })),
      ['series', 'series'],
      (about) => ({
        effect: 'Levels are taken for returns: no figure that it enters means anything.',
        remedy:
          'Put its returns in the place of its prices (POISE.RETURNS makes them), or select prices for all.',
        corrections: [
          this.#withReturns('With returns made of its prices', seriesIn(about), (x) => {
            const changes = simpleReturns(
              x.map((price) => (Number.isNaN(price) ? 1 : price)),
              x.length,
              1,
            )
            return x.map((price, t) =>
              t === 0 || Number.isNaN(price) || Number.isNaN(x[t - 1]) ? NaN : changes[t - 1]!,
            )
          }),
        ],
      }),
    )

    const others = this.#held.filter(({ series, fact }) => !this.#explained.has(series) && fact.size > 0)
    const sizes = others.map(({ fact }) => fact.size)
    const usual = lowerMedian(sizes)
    const percents = others.filter(
      ({ fact }) =>
        fact.size > PERCENTS || (fact.size > LIKELY_PERCENTS && fact.size > TIMES_THE_OTHERS * usual),
    )
    if (percents.length === 0) return
    const inHundredths = (series: readonly number[], label: string): Correction =>
      this.#withReturns(label, series, (x) => x.map((value) => value / 100))
    if (percents.length * 2 > others.length) {
      const average = sizes.reduce((sum, size) => sum + size, 0) / sizes.length
      this.#tellOnce(
        'percents',
        'warns',
        `${addressOf(this.#returns.area)}: the average size of a return is ${percentText(average, 0)}: are these percentages typed without a percent sign? They are used as fractions.`,
        [this.#returns.area],
        {
          effect:
            'If they are percentages, every risk in units of return is a hundred times too large; shares of risk are not changed.',
          remedy: 'Divide the cells by 100, or type them with a percent sign.',
          corrections: [
            inHundredths(
              others.map(({ series }) => series),
              'With all returns divided by 100',
            ),
          ],
        },
      )
      return
    }
    this.#tell(
      'percents',
      percents.map((held) => ({
        held,
        weight: 'warns',
        sentence: `${addressOf(this.#returns.seriesCell(held.series))}: the returns of ${quote(held.name)} are ${percentText(held.fact.size, 0)} in size on average, the others’ around ${percentText(usual)}: percentages typed without a percent sign? They are used as fractions.`,
        areas: [this.#returns.seriesCell(held.series), ...this.#column(held)],
      })),
      ['series', 'series'],
      (about) => ({
        effect:
          'If so, its risk is a hundred times too large and it seems to carry nearly all the risk of the book.',
        remedy: 'Divide the cells of the series by 100, or type them with a percent sign.',
        corrections: [inHundredths(seriesIn(about), 'With the series divided by 100')],
      }),
    )
  }

  #constants(): void {
    const still = this.#held.filter(({ fact }) => fact.count > 1 && fact.isConstant)
    for (const { series } of still) this.#explained.add(series)
    this.#tell(
      'constant',
      still.map((held) => ({
        held,
        weight: 'warns',
        sentence: `${addressOf(this.#returns.seriesCell(held.series))}: the returns of ${quote(held.name)} never change (${percentText(held.fact.median, 2)} on ${countOf(held.fact.count, 'date')}).`,
        areas: [this.#returns.seriesCell(held.series), ...this.#column(held)],
      })),
      ['series', 'series'],
      () => ({
        effect: 'It counts as riskless: no risk is put down to it, whatever its weight.',
        remedy: 'Put in its returns; if it really has no risk, mark the holding as riskless.',
        corrections: [],
      }),
    )
  }

  /** Series that start later or end earlier than the others, and those with far fewer returns. */
  #histories(): void {
    const { rows } = this.#returns
    const { from } = this.#facts
    const filled = this.#held.filter(({ fact }) => fact.count > 0)
    const usualFirst = lowerMedian(filled.map(({ fact }) => fact.first))
    const usualLast = -lowerMedian(filled.map(({ fact }) => -fact.last))
    const usualCount = -lowerMedian(filled.map(({ fact }) => -fact.count))

    const short: Suspicion[] = []
    const late: Suspicion[] = []
    const early: Suspicion[] = []
    for (const held of this.#held) {
      const { fact, series } = held
      const name = quote(held.name)
      const heading = this.#returns.seriesCell(series)
      if (fact.count === 0) {
        short.push({
          held,
          weight: 'warns',
          sentence: `${addressOf(heading)}: ${name} has no return${from > 0 ? ' within the look-back' : ''}.`,
          areas: [heading],
        })
        continue
      }
      // a price comes before the first return: the blanks are one row up
      const shift = this.#returns.content === 'prices' ? 1 : 0
      if (fact.first > usualFirst) {
        const areas = this.#cells(range(from - shift, fact.first - shift), series)
        const start = `${addressOf(areas[0] ?? heading)}: ${name} starts ${this.#when(fact.first)}`
        if (fact.count < SHORT * usualCount)
          short.push({
            held,
            weight: 'warns',
            sentence: `${start} and has ${countOf(fact.count, 'return')} where the others have ${usualCount}.`,
            areas,
          })
        else
          late.push({
            held,
            weight: 'notes',
            sentence: `${start}, ${countOf(fact.first - usualFirst, this.#period)} after the others.`,
            areas,
          })
      }
      if (fact.last < usualLast) {
        const areas = this.#cells(range(fact.last + 1, rows), series)
        early.push({
          held,
          weight: 'warns',
          sentence: `${addressOf(areas[0] ?? heading)}: the last return of ${name} is ${this.#when(fact.last).replace(/^in /, '')}, ${countOf(usualLast - fact.last, this.#period)} before the others’.`,
          areas,
        })
      }
    }
    const noun = ['series', 'series'] as const
    const filling = 'put in the returns of something alike'
    this.#tell('short history', short, noun, () => ({
      effect: this.#gapEffect(),
      remedy: `Choose another way to treat the dates it does not have, or ${filling}.`,
      corrections: this.#gapCorrections(),
    }))
    this.#tell('starts late', late, noun, () => ({
      effect: this.#gapEffect(),
      remedy: `Choose another way to treat the dates it does not have, or ${filling}.`,
      corrections: this.#gapCorrections(),
    }))
    this.#tell('ends early', early, noun, () => ({
      effect:
        this.#settings.gaps === 'common dates'
          ? `The newest dates are left out for every holding: the figures are those of ${this.#lastCommonDay()}.`
          : 'Its newest returns are missing from the figures, which are the older for it.',
      remedy: 'Bring the series up to date; if it is not held any more, take it out of the holdings.',
      corrections: this.#gapCorrections(),
    }))
    // the other way round: a row begun for a few series only
    if (filled.length > 1 && usualLast < rows - 1) {
      const ahead = filled.filter(({ fact }) => fact.last > usualLast)
      if (ahead.length > 0)
        this.#tellOnce(
          'dates',
          'notes',
          `${addressOf(this.#returns.cell(usualLast + 1, ahead[0]?.series ?? 0))}: after ${this.#day(usualLast)} only ${listOf(ahead.map(({ name }) => quote(name)))} ${ahead.length === 1 ? 'goes' : 'go'} on.`,
          ahead.flatMap(({ series, fact }) => this.#cells(range(usualLast + 1, fact.last + 1), series)),
          {
            effect: this.#gapEffect(),
            remedy: 'Complete the newest dates for all series.',
            corrections: [],
          },
        )
    }
  }

  #lastCommonDay(): string {
    const { values, rows, columns } = this.#returns
    for (let t = rows - 1; t >= this.#facts.from; t--)
      if (this.#held.every(({ series }) => !Number.isNaN(values[t * columns + series]!))) return this.#day(t)
    return 'an earlier time'
  }

  #gaps(): void {
    const holed = this.#held.filter(({ fact }) => fact.gaps.length > 0)
    const dates = new Set(holed.flatMap(({ fact }) => [...fact.gaps]))
    const isGrave = dates.size > MANY_GAPS * this.#inView || this.#settings.gaps === 'completed'
    const isPrices = this.#returns.content === 'prices'
    this.#tell(
      'gaps',
      holed.map((held) => {
        const { gaps, every } = held.fact
        // two returns hang on one price: the later one's cell holds a price
        const blank = [...gaps].filter((row, k) => !isPrices || gaps[k + 1] === row + 1)
        const areas = this.#cells(blank, held.series)
        const rest = blank.length - 1
        const often =
          every !== null && gaps.length > held.fact.count
            ? ` It has one every ${ordinal(every)} ${this.#period} only.`
            : ''
        return {
          held,
          weight: isGrave ? 'warns' : 'notes',
          sentence: `${addressOf(areas[0] ?? this.#returns.seriesCell(held.series))}: ${quote(held.name)} has no ${isPrices ? 'price' : 'return'} ${this.#when(blank[0] ?? 0)}${rest > 0 ? ` and at ${countOf(rest, 'more date')} within its history` : ''}.${often}`,
          areas,
        }
      }),
      ['series', 'series'],
      () => ({
        effect:
          this.#settings.gaps === 'common dates'
            ? `${isPrices ? 'A missing price costs the returns on both sides of it. ' : ''}${countOf(dates.size, 'date')} with such a gap ${dates.size === 1 ? 'is' : 'are'} left out for every holding: ${this.#common} of ${this.#inView} count.`
            : this.#settings.gaps === 'completed'
              ? 'Histories can be completed only where a series has no gap once it has begun: the figures cannot be computed this way.'
              : this.#gapEffect(),
        remedy: 'Fill in what is known; a blank stays a gap, and a 0 in its place would be a return of 0.',
        corrections: this.#gapCorrections(),
      }),
    )
  }

  /** Dates that do not follow one another at one pace. Dates twice or unreadable have stopped the reading already. */
  #dates(): void {
    const { dates } = this.#returns
    const { steps, from } = this.#facts
    if (!dates || !steps || this.#inView < 6) return
    // dates twice leave the others in the wrong place
    if (steps.steps.some((step) => step <= 0)) return
    if (steps.usual === 'other') {
      const known = [...steps.steps].filter((step) => step > 0)
      this.#tellOnce(
        'mixed frequency',
        'warns',
        `${addressOf(this.#returns.cell(from, -1))}: the dates follow no common pace; from one to the next are ${numberText(Math.min(...known), 0)} to ${countOf(Math.max(...known), 'day')}.`,
        this.#cells(range(from, this.#returns.rows), -1),
        {
          effect:
            'Returns over short and long spans count alike, and no number of periods a year fits them all.',
          remedy: 'Bring all series to one frequency, such as month ends.',
          corrections: [],
        },
      )
      return
    }
    const { other } = steps
    if (other !== null && other.frequency !== 'other' && other.length >= 3) {
      // a step leads to the return one row on
      const [start, end] = [from + other.start + 1, from + other.start + other.length]
      const pace = (frequency: string): number => USUAL_STEPS[frequency]?.[0] ?? 0
      const isSlower = pace(other.frequency) > pace(steps.usual)
      const areas = this.#cells(range(start, end + 1), -1)
      this.#tellOnce(
        'mixed frequency',
        'warns',
        `${addressOf(areas[0] ?? this.#returns.area)}: dates are ${other.frequency} from ${this.#day(start)} to ${this.#day(end)}, ${steps.usual} elsewhere.`,
        areas,
        {
          effect: `A return over a ${PERIOD_WORDS[other.frequency] ?? 'span'} counts like one over a ${this.#period}, which makes the volatility ${isSlower ? 'too large' : 'too small'}.`,
          remedy: 'Bring all dates to the slower frequency, or let the look-back leave one part out.',
          corrections:
            other.start === 0 && end + 2 < this.#returns.rows
              ? [
                  {
                    label: `Since ${this.#day(end + 1)}`,
                    change: { lookBack: { kind: 'since', date: dates[end + 1] ?? 0 } },
                    returns: null,
                  },
                ]
              : [],
        },
      )
      return
    }
    const [least, most] = USUAL_STEPS[steps.usual] ?? [0, Infinity]
    const odd = range(from + 1, this.#returns.rows).filter((row) => {
      const step = (dates[row] ?? 0) - (dates[row - 1] ?? 0)
      return step > 0 && (step < least || step > most)
    })
    const [row] = odd
    if (row === undefined) return
    const step = (dates[row] ?? 0) - (dates[row - 1] ?? 0)
    this.#tellOnce(
      'dates',
      'notes',
      `${addressOf(this.#returns.cell(row, -1))}: ${countOf(step, 'day')} from ${this.#day(row - 1)} to ${this.#day(row)} among ${steps.usual} dates.${odd.length > 1 ? ` ${countOf(odd.length - 1, 'more step')} like it.` : ''}`,
      odd.map((place) => this.#returns.cell(place, -1)),
      {
        effect: `Its return counts as that of one ${this.#period}, though it spans ${step > most ? 'more' : 'less'}.`,
        remedy:
          step > most
            ? 'Put in the dates that are missing, if any are.'
            : 'Take the extra date out, or mend it.',
        corrections: [],
      },
    )
  }

  /** Missed splits, single returns far out, and dates on which the whole market moved. */
  #farReturns(): void {
    const candidates = this.#held
      .filter(({ series }) => !this.#explained.has(series))
      .flatMap((held) => held.fact.far.map((far) => ({ held, far })))
      // what is wild in cash is nothing beside the others
      .filter(
        ({ held: { fact }, far }) =>
          !this.#isQuiet(fact) || Math.abs(far.value - fact.median) > this.#usualScale,
      )
    const byDate = new Map<number, number>()
    for (const { far } of candidates) byDate.set(far.row, (byDate.get(far.row) ?? 0) + 1)
    const isMarket = (row: number): boolean => {
      const many = byDate.get(row) ?? 0
      return many >= FEWEST_FOR_A_MARKET && many >= LEAST_SHARE_FOR_A_MARKET * this.#held.length
    }

    const splits: (Suspicion & { readonly rest: number; readonly far: FarReturn })[] = []
    const outliers: (Suspicion & {
      readonly mended: readonly (readonly [row: number, value: number])[]
      readonly far: FarReturn
    })[] = []
    const market = new Map<number, Held[]>()
    for (const { held, far } of candidates) {
      const isFar = Math.abs(far.multiple) > FAR
      if (isMarket(far.row)) {
        market.set(far.row, [...(market.get(far.row) ?? []), held])
        continue
      }
      const { fact, series } = held
      const area = this.#returns.cell(far.row, series)
      const before = fact.far.find(({ row }) => row === far.row - 1)
      if (before && this.#isUndone(before, far, fact)) continue
      const after = fact.far.find(({ row }) => row === far.row + 1)
      const undone = after && this.#isUndone(far, after, fact)
      const size = `${percentText(far.value)}, ${numberText(Math.abs(far.multiple), 0)} times its usual distance from the middle`
      const split = undone ? null : this.#splitOf(far, fact)
      if (split)
        splits.push({
          held,
          weight: 'warns',
          sentence: `${addressOf(area)}: the return of ${quote(held.name)} ${this.#when(far.row)} is ${size}: what a split of ${split.fresh} for ${split.old} that was not adjusted for would leave.`,
          areas: [area],
          rest: this.#isLog() ? Math.log1p(split.rest) : split.rest,
          far,
        })
      else if (isFar || undone)
        outliers.push({
          held,
          weight: undone || Math.abs(far.multiple) > LIKELY_WRONG ? 'warns' : 'notes',
          sentence: `${addressOf(area)}: the return of ${quote(held.name)} ${this.#when(far.row)} is ${size}${undone ? ', and the next one takes it back: a wrong price?' : '.'}`,
          areas: undone ? [area, this.#returns.cell(after.row, series)] : [area],
          mended: undone ? this.#shared(far, after) : [[far.row, fact.median]],
          far,
        })
    }
    const share = (about: readonly { readonly far: FarReturn; readonly held: Held }[]): string => {
      const [first] = about
      return first
        ? `This one return makes up ${percentText(first.far.share, 0)} of the variance of ${quote(first.held.name)}`
        : ''
    }
    this.#tell('missed split', splits, ['return', 'returns'], (about) => {
      const found = about as typeof splits
      return {
        effect: `${share(found)}; if it is a split, that part of its risk is not there.`,
        remedy: 'Look the split up; adjust the prices before it, or put the return right.',
        corrections: [
          this.#withReturns(
            found.length === 1
              ? `With the split undone (${this.#day(found[0]?.far.row ?? 0)})`
              : 'With these splits undone',
            seriesIn(found),
            (x, i) => {
              for (const { held, far, rest } of found) if (held.series === i) x[far.row] = rest
              return x
            },
          ),
        ],
      }
    })
    this.#tell('outlier', outliers, ['return', 'returns'], (about) => {
      const found = about as typeof outliers
      const isUndone = found.some(({ mended }) => mended.length > 1)
      const day = this.#day(found[0]?.far.row ?? 0)
      return {
        effect: `${share(found)}, and so of much that is said about its risk.`,
        remedy:
          'Check it against another source and put it right if it is wrong; if it is right it belongs in the figures.',
        corrections: [
          this.#withReturns(
            isUndone && found.length === 1
              ? `With the move and its return spread evenly (${day})`
              : found.length === 1
                ? `With the median in its place (${day})`
                : 'With medians in their place',
            seriesIn(found),
            (x, i) => {
              for (const { held, mended } of found)
                if (held.series === i) for (const [row, value] of mended) x[row] = value
              return x
            },
          ),
        ],
      }
    })
    const days = [...market].sort(([a], [b]) => a - b)
    const [firstDay] = days
    if (firstDay) {
      const [row, movers] = firstDay
      this.#tellOnce(
        'outlier',
        'notes',
        `${addressOf(this.#returns.cell(row, movers[0]?.series ?? 0))}: ${countOf(movers.length, 'holding')} moved more than ${FAR_FOR_A_SPLIT} times their usual distance from the middle ${this.#when(row)}${days.length > 1 ? `, and so on ${countOf(days.length - 1, 'more date')}` : ''}.`,
        days.flatMap(([day, those]) => those.map(({ series }) => this.#returns.cell(day, series))),
        {
          effect:
            'Moves of many at once are the market’s as a rule: they make the tails of the book, which normal figures understate.',
          remedy:
            'Nothing to mend unless a whole row is wrong; compare historical value at risk and shortfall.',
          corrections: [],
        },
      )
    }
  }

  #isLog(): boolean {
    return this.#returns.content === 'prices' && this.#settings.returnKind === 'log'
  }

  #change(value: number): number {
    return this.#isLog() ? Math.expm1(value) : value
  }

  /** Whether a second return takes a first one back but for what the series usually moves. */
  #isUndone(first: FarReturn, second: FarReturn, { scale }: SeriesFact): boolean {
    const both = (1 + this.#change(first.value)) * (1 + this.#change(second.value)) - 1
    return first.value * second.value < 0 && Math.abs(both) <= 4 * scale
  }

  /** Two returns of which one takes back the other, each with half of what is left of both. */
  #shared(first: FarReturn, second: FarReturn): readonly (readonly [number, number])[] {
    const growth = (1 + this.#change(first.value)) * (1 + this.#change(second.value))
    const half = this.#isLog() ? Math.log(growth) / 2 : Math.sqrt(growth) - 1
    return [
      [first.row, half],
      [second.row, half],
    ]
  }

  #splitOf(far: FarReturn, { scale }: SeriesFact): SplitRatio | null {
    const change = this.#change(far.value)
    // the share moved that day as well; more room than this would fit any change to some ratio
    return change > -1 ? splitRatio(change, Math.min(0.05, Math.max(0.02, scale))) : null
  }

  #isQuiet({ scale }: SeriesFact): boolean {
    return scale < LEAST_MOVE * this.#usualScale
  }

  #stalePrices(): void {
    const isStale = ({ fact }: Held): boolean =>
      fact.still.length >= LONG_STILL ||
      (fact.every !== null && fact.still.length >= fact.every - 1) ||
      (fact.still.length >= SHORT_STILL && fact.stillShare >= MOST_STILL)
    const stale = this.#held.filter((held) => !this.#explained.has(held.series) && isStale(held))
    for (const { series } of stale) this.#explained.add(series)
    const suspicion = (held: Held): Suspicion => {
      const { still, every, count, stillShare } = held.fact
      const areas = this.#cells(range(still.start, still.start + still.length), held.series)
      const place = `${addressOf(areas[0] ?? this.#returns.area)}: `
      const span = `${this.#day(still.start)} to ${this.#day(still.start + still.length - 1)}`
      return {
        held,
        weight: 'warns',
        areas,
        sentence:
          place +
          (every !== null
            ? `${quote(held.name)} moves every ${ordinal(every)} ${this.#period} only; its return is exactly 0 in between (here ${span}).`
            : `${quote(held.name)} has a return of exactly 0 on ${countOf(still.length, 'date')} in a row (${span})${stillShare * count > still.length ? `; ${percentText(stillShare, 0)} of its returns are zeros in a row` : ''}.`),
      }
    }
    const rhythmic = stale.filter(({ fact }) => fact.every !== null)
    const resting = stale.filter(({ fact }) => fact.every === null)
    this.#tell('stale prices', rhythmic.map(suspicion), ['series', 'series'], (about) => {
      const every = Math.max(...about.map(({ held }) => held.fact.every ?? 1))
      const lags = Math.min(2 * every - 1, MOST_LAGS, Math.floor(this.#common / 4))
      const back = broughtBack(every, lags)
      const corrections = back >= LEAST_BROUGHT_BACK ? this.#withLags(lags) : []
      return {
        effect: `What happens in between shows late and all at once: about ${percentText(1 / every, 0)} of what it shares with other holdings falls on the same date, so its correlations with them look closer to 0 than they are.`,
        remedy: `Use prices of every ${this.#period} where there are any, or returns over ${every} ${this.#period}s for the whole book${corrections.length > 0 ? `; ${countOf(lags, 'lagged term')} bring back about ${percentText(back, 0)} of what it shares` : ''}.`,
        corrections,
      }
    })
    this.#tell('stale prices', resting.map(suspicion), ['series', 'series'], (about) => {
      const isLong = about.some(({ held }) => held.fact.still.length >= LONG_STILL)
      const longest = Math.max(...about.map(({ held }) => held.fact.still.length))
      return {
        effect:
          'Zeros in a row are prices that were not renewed, or blanks filled with 0: volatility and correlations look smaller than they are.',
        remedy: 'Renew the prices, or leave the cells blank so that they count as gaps.',
        corrections: [
          ...(isLong
            ? [
                this.#withReturns(
                  `With ${LONG_STILL} or more zeros in a row as gaps`,
                  seriesIn(about),
                  withoutStill,
                ),
              ]
            : []),
          ...(longest <= MOST_LAGS ? this.#withLags(longest) : []),
        ],
      }
    })
  }

  /** How many standard errors are beyond chance in a book of so many series. */
  #limit(): number {
    return normalQuantile(1 - CHANCE / 2 / this.#held.length, 0, 1)
  }

  #isBeyondChance(found: TimeCorrelation | null): found is TimeCorrelation {
    return (
      found !== null &&
      Math.abs(found.value) > this.#limit() * found.standardError &&
      Math.abs(found.value) >= LEAST_CORRELATION
    )
  }

  #chance({ standardError }: TimeCorrelation): string {
    return `by chance all ${this.#held.length} series would stay within ${numberText(this.#limit() * standardError)} of 0 in at least ${percentText(1 - CHANCE, 0)} of cases`
  }

  #serialCorrelation(): void {
    const found = this.#held.flatMap((held) => {
      const { serial } = held.fact
      return !this.#explained.has(held.series) && this.#isBeyondChance(serial) ? [{ held, serial }] : []
    })
    for (const { held } of found) this.#explained.add(held.series)
    // Newey & West (1994), Automatic Lag Selection in Covariance Matrix Estimation, REStud 61(4), 631-653 (from memory)
    const lags = Math.floor(4 * (this.#inView / 100) ** (2 / 9))
    const told = (isSmooth: boolean): readonly Suspicion[] =>
      found
        .filter(({ serial }) => serial.value > 0 === isSmooth)
        .map(({ held, serial }) => ({
          held,
          weight: 'warns',
          sentence: `${addressOf(this.#returns.seriesCell(held.series))}: the returns of ${quote(held.name)} ${isSmooth ? 'go on as the last one went' : 'take back part of the last one'}: autocorrelation ${numberText(serial.value)}, where ${this.#chance(serial)}.`,
          areas: [this.#returns.seriesCell(held.series), ...this.#column(held)],
        }))
    this.#tell('serial correlation', told(true), ['series', 'series'], (about) => {
      const rho = about[0]?.held.fact.serial?.value ?? 0
      return {
        effect: `Prices that are smoothed or late look calmer than they are: if that is it, the volatility of ${quote(about[0]?.held.name)} is about ${numberText(Math.sqrt((1 + rho) / (1 - rho)))} times what its returns show, and its correlations with the others are too small.`,
        remedy:
          'Use traded prices where there are any, count lagged terms, or look at the figures with the smoothing undone.',
        corrections: [
          ...this.#withLags(lags),
          this.#withReturns('With the smoothing undone', seriesIn(about), (x, i) =>
            unsmoothed(x, this.#facts.series[i]?.serial?.value ?? 0),
          ),
        ],
      }
    })
    this.#tell('serial correlation', told(false), ['series', 'series'], () => ({
      effect:
        'Part of each move is taken back on the next date: its volatility scaled to a longer horizon is too large.',
      remedy:
        'Look for prices that jump back and forth; returns over longer periods, or lagged terms, show the lasting moves.',
      corrections: this.#withLags(lags),
    }))
  }

  /** One direction only: what lags behind the others, or else what runs ahead of them. */
  #closingTimes(): void {
    const candidates = this.#held.filter(({ series }) => !this.#explained.has(series))
    const oneWay = (a: TimeCorrelation | null, b: TimeCorrelation | null): TimeCorrelation | null =>
      this.#isBeyondChance(a) && a.value > 0 && !this.#isBeyondChance(b) ? a : null
    const told = (direction: 'follows' | 'leads'): readonly Suspicion[] =>
      candidates.flatMap((held) => {
        const { follows, leads } = held.fact
        const found = direction === 'follows' ? oneWay(follows, leads) : oneWay(leads, follows)
        return found
          ? [
              {
                held,
                weight: 'warns',
                sentence: `${addressOf(this.#returns.seriesCell(held.series))}: daily returns of ${quote(held.name)} ${direction === 'follows' ? 'follow the others’ of the day before' : 'run a day ahead of the others’'}: correlation ${numberText(found.value)}, where ${this.#chance(found)}.`,
                areas: [this.#returns.seriesCell(held.series), ...this.#column(held)],
              },
            ]
          : []
      })
    // where some lag behind, the rest run ahead: one fault
    const behind = told('follows')
    this.#tell('closing times', behind.length > 0 ? behind : told('leads'), ['series', 'series'], () => ({
      effect:
        'Its market seems to close at another time: what it shares with the others falls on two dates, so daily correlations look too small and diversification too good.',
      remedy: 'Use weekly returns or prices of one time of day for the whole book, or count one lagged term.',
      corrections: this.#withLags(1),
    }))
  }

  #fewDates(): void {
    const moving = this.#held.filter(({ fact }) => !fact.isConstant).length
    const dates = this.#settings.gaps === 'common dates' ? this.#common : this.#inView
    const { estimator } = this.#settings
    if (moving < 2 || dates >= FEWEST_DATES_A_HOLDING * moving || estimator.kind === 'factors') return
    const isShrunk = estimator.kind === 'shrinkage'
    this.#tellOnce(
      'few dates',
      isShrunk ? 'notes' : 'warns',
      `${countOf(dates, 'date')} for ${countOf(moving, 'series', 'series')} that move: ${numberText(dates / moving, 1)} dates a series.`,
      [],
      {
        // seen in the data it was chosen from, the least variance of any mix is on average (T - n)/(T - 1) of its true one for normal returns:
        // Muirhead (1982), Aspects of Multivariate Statistical Theory, theorem 3.2.12 (from memory)
        effect:
          dates <= moving
            ? 'Some mixes of these holdings seem to have no risk at all, and no trade that relies on them can be trusted.'
            : `Correlations are told apart poorly: the calmest mix of these holdings would look as if it had ${percentText(Math.sqrt((dates - moving) / (dates - 1)), 0)} of its volatility.`,
        remedy: isShrunk
          ? 'Shrinkage, which is chosen, helps; more dates or fewer holdings help more.'
          : 'Use more dates (a longer look-back, a higher frequency), or shrinkage.',
        corrections: isShrunk
          ? []
          : [
              this.#withEstimator('With shrinkage to constant correlation', {
                kind: 'shrinkage',
                target: 'correlation',
              }),
            ],
      },
    )
  }

  /** For information: how much history some rules ask for. */
  #rules(): void {
    const frequency = this.#facts.steps?.usual ?? ''
    const dates = this.#settings.gaps === 'common dates' ? this.#common : this.#inView
    const short = RULES.flatMap(({ name, asks }) => {
      const [periods, words] = asks[frequency] ?? [0, '']
      // prices are one more than returns
      return dates + 1 < periods ? [`${words} (${name})`] : []
    })
    if (short.length === 0) return
    this.#tellOnce(
      'rules on history',
      'notes',
      `The figures rest on ${countOf(dates, `${frequency} return`)}; some rules ask for more: ${listOf(short, RULES.length)}.`,
      [],
      {
        effect:
          'The figures stand as they are; whether they may be reported under such a rule is another question.',
        remedy:
          'Find out what the rules that hold for this book ask: these are examples, and local rules come first.',
        corrections: [],
      },
    )
  }
}

const range = (from: number, end: number): readonly number[] =>
  Array.from({ length: Math.max(0, end - from) }, (_, k) => from + k)

const seriesIn = (about: readonly Suspicion[]): readonly number[] => [
  ...new Set(about.map(({ held }) => held.series)),
]

/** The middle one, the lower of two. */
const lowerMedian = (values: readonly number[]): number =>
  [...values].sort((a, b) => a - b)[(values.length - 1) >> 1] ?? NaN

const ordinal = (k: number): string =>
  k === 2
    ? 'second'
    : k === 3
      ? 'third'
      : `${k}${k % 10 === 1 && k % 100 !== 11 ? 'st' : k % 10 === 2 && k % 100 !== 12 ? 'nd' : k % 10 === 3 && k % 100 !== 13 ? 'rd' : 'th'}`

/** Cells that touch, in a column or a row, as one area. */
function joined(cells: readonly Area[]): readonly Area[] {
  const areas: Area[] = []
  for (const cell of cells) {
    const last = areas.at(-1)
    if (
      last &&
      last.sheet === cell.sheet &&
      last.column === cell.column &&
      last.columns === 1 &&
      cell.row === last.row + last.rows
    )
      areas[areas.length - 1] = { ...last, rows: last.rows + 1 }
    else if (
      last &&
      last.sheet === cell.sheet &&
      last.row === cell.row &&
      last.rows === 1 &&
      cell.column === last.column + last.columns
    )
      areas[areas.length - 1] = { ...last, columns: last.columns + 1 }
    else areas.push(cell)
  }
  return areas
}

/**
 * How much of the covariance with others comes back, where a series shows every k dates what happened in all of them: a share 1/k falls on
 * each of the lags 0 to k - 1, and a lag counts with its weight 1 - lag/(L + 1).
 */
function broughtBack(every: number, lags: number): number {
  let sum = 0
  for (let lag = 0; lag < Math.min(every, lags + 1); lag++) sum += 1 - lag / (lags + 1)
  return sum / every
}

function withoutStill(x: Float64Array): Float64Array {
  for (let t = 0; t < x.length; t++) {
    const start = t
    while (t < x.length && x[t] === 0) t++
    if (t - start >= LONG_STILL) x.fill(NaN, start, t)
  }
  return x
}

/**
 * Returns without smoothing, where each reported one takes a share rho of the one reported before: u_t = (r_t - rho r_(t-1)) / (1 - rho).
 * Geltner (1993), J. of Real Estate Research 8(3), 325-345 (from memory).
 */
const unsmoothed = (x: Float64Array, rho: number): Float64Array =>
  x.map((value, t) => (t === 0 ? NaN : (value - rho * x[t - 1]!) / (1 - rho)))
