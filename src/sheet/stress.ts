import {
  annualise,
  decompose,
  moveCorrelations,
  replay,
  returnsModel,
  scaleVolatilities,
  worstStretch as findWorst,
} from '../core'
import type { Replay, RiskModel } from '../core'
import type { Blocks, BookModel } from './book-model'
import { attempt, explain } from './explain'
import { groupsOf, plainName } from './names'
import type { ReturnsReading } from './returns'
import type { Settings } from './settings'
import { countOf, dateText, listOf, numberText, percentText, quote } from './wording'

/** What volatilities are multiplied by: one number for all, or one for each of some groups of a group column, while the others stay. */
export type VolatilityFactor =
  | number
  | { readonly header: string; readonly factors: readonly (readonly [label: string, factor: number])[] }

/** What a book is put through. A stretch goes by dates (serial numbers) or, counted from the oldest as 1, by rows of the returns; both ends count. */
export type Scenario =
  | { readonly kind: 'volatilities'; readonly factor: VolatilityFactor }
  /** theta: the part of the way to 1 that every correlation goes, 0 to 1 */
  | { readonly kind: 'correlations'; readonly theta: number }
  | { readonly kind: 'both'; readonly factor: VolatilityFactor; readonly theta: number }
  | { readonly kind: 'stretch'; readonly by: 'dates' | 'rows'; readonly from: number; readonly to: number }

/** What scenarios need to know of a book. */
export interface StressInputs {
  readonly names: readonly string[]
  readonly groups: readonly {
    readonly header: string
    readonly labels: readonly string[]
    /** the group of each position */
    readonly groupOf: Int32Array
  }[]
  readonly book: Pick<BookModel, 'model' | 'data' | 'window'>
  /** 1: per period */
  readonly periodsPerYear: number
  readonly horizon: 'a year' | 'per period'
  /** what the returns of the block are: a replay needs simple ones */
  readonly returnKind: ReturnsReading['returnKind']
}

export function stressInputs(
  { holdings, returns }: Pick<Blocks, 'holdings' | 'returns'>,
  book: StressInputs['book'],
  settings: Pick<Settings, 'periodsPerYear'>,
): StressInputs {
  const held = holdings.holdings
  const periods = settings.periodsPerYear ?? returns.proposedPeriodsPerYear
  return {
    names: held.map(({ name }) => name),
    groups: holdings.groupHeaders.map((header, k) => ({
      header,
      ...groupsOf(held.map(({ groups }) => groups[k])),
    })),
    book,
    periodsPerYear: periods ?? 1,
    horizon: periods === null ? 'per period' : 'a year',
    returnKind: returns.returnKind,
  }
}

/** An amount that adds up by position: its parts, and those of the groups of each group column. */
export interface Parts {
  readonly total: number
  /** one a position */
  readonly parts: Float64Array
  /** one array a group column */
  readonly byGroup: readonly Float64Array[]
  /** sum of parts less total: rounding */
  readonly difference: number
}

/** A book in one scenario at given weights. */
export interface StressFigures {
  /** volatility and contributions, scaled as the book's other figures; null where one date alone is replayed, which has none */
  readonly volatility: Parts | null
  /** what a replayed stretch returns, as a sum over its dates; null for the other kinds of scenarios */
  readonly stretch: (Parts & Pick<Replay, 'compounded'> & { readonly worstFall: DatedFall | null }) | null
}

/** The largest fall of value on the way, as a share of the value at the peak. */
export interface DatedFall {
  readonly share: number
  /** null where it never falls */
  readonly between: readonly [peak: string, trough: string] | null
}

export interface StressCase {
  /** made of the scenario's parameters */
  readonly name: string
  /** null: the book as it is estimated */
  readonly scenario: Scenario | null
  /** or why there are none */
  readonly figures: { readonly before: StressFigures; readonly after: StressFigures | null } | string
  /** the dates a stretch replays; null for the other kinds */
  readonly dates: {
    readonly first: string
    readonly last: string
    readonly used: number
    /** between them, for want of some holding's return */
    readonly leftOut: number
  } | null
  /** what has to be said beside the figures */
  readonly notes: readonly string[]
}

/** A book in several scenarios side by side. */
export interface StressComparison {
  readonly names: readonly string[]
  readonly groups: StressInputs['groups']
  readonly horizon: StressInputs['horizon']
  /** the dates the estimate rests on; null for a covariance matrix */
  readonly window: BookModel['window']
  readonly before: Float64Array
  /** null while there are no trades */
  readonly after: Float64Array | null
  /** the first: the book as it is estimated */
  readonly cases: readonly StressCase[]
}

const percents = (share: number): string => `${Number((share * 100).toFixed(4))}%`
const times = (factor: number): string => `× ${Number(factor.toFixed(6))}`.replace('-', '\u2212')

function factorText(factor: VolatilityFactor): string {
  if (typeof factor === 'number') return `Volatilities ${times(factor)}`
  const groups = factor.factors.map(([label, value]) => `${label} ${times(value)}`)
  return `Volatilities by ${factor.header}: ${groups.join(', ')}`
}

/**
 * A scenario by its parameters.
 * @example scenarioName({ kind: 'both', factor: 1.5, theta: 0.25 }) // 'Volatilities × 1.5, correlations moved 25% toward 1'
 */
export function scenarioName(scenario: Scenario): string {
  switch (scenario.kind) {
    case 'volatilities':
      return factorText(scenario.factor)
    case 'correlations':
      return `Correlations moved ${percents(scenario.theta)} toward 1`
    case 'both':
      return `${factorText(scenario.factor)}, correlations moved ${percents(scenario.theta)} toward 1`
    case 'stretch':
      return scenario.by === 'dates'
        ? `${dateText(scenario.from)} to ${dateText(scenario.to)} replayed`
        : `Dates ${scenario.from} to ${scenario.to} of the returns replayed`
  }
}

/**
 * Puts a book in each of several scenarios, at its weights before and after trades. The book as it is estimated comes first. A scenario that
 * cannot be made says why in its place; the others stand.
 *
 * @param before  one a position
 * @param after   the same after the trades; null while there are none
 * @returns       or the sentence why there is nothing to compare with
 * @cost          for each scenario and each set of weights one pass of the model, or of the dates of the stretch
 */
export function stressOf(
  inputs: StressInputs,
  scenarios: readonly Scenario[],
  before: Float64Array,
  after: Float64Array | null,
): StressComparison | string {
  const { names, groups, horizon, book } = inputs
  const { value: base, fault } = attempt(() =>
    bothOf(before, after, (weights) => riskOf(inputs, book.model, weights)),
  )
  if (fault) return explain(fault, () => '')
  const estimated: StressCase = {
    name: 'As estimated',
    scenario: null,
    figures: base,
    dates: null,
    notes: [],
  }
  return {
    names,
    groups,
    horizon,
    window: book.window,
    before,
    after,
    cases: [estimated, ...scenarios.map((scenario) => caseOf(inputs, scenario, before, after))],
  }
}

function caseOf(
  inputs: StressInputs,
  scenario: Scenario,
  before: Float64Array,
  after: Float64Array | null,
): StressCase {
  const named = { name: scenarioName(scenario), scenario }
  const { value, fault } = attempt(() =>
    scenario.kind === 'stretch'
      ? replayed(inputs, scenario, before, after)
      : bent(inputs, scenario, before, after),
  )
  if (fault) return { ...named, figures: explain(fault, () => ''), dates: null, notes: [] }
  return typeof value === 'string'
    ? { ...named, figures: value, dates: null, notes: [] }
    : { ...named, ...value }
}

type Outcome = Pick<StressCase, 'figures' | 'dates' | 'notes'>

/** When a note of one set of weights holds; nothing while there is only one. */
type When = '' | ' before the trades' | ' after the trades'

const bothOf = (
  before: Float64Array,
  after: Float64Array | null,
  figures: (weights: Float64Array, when: When) => StressFigures,
): { before: StressFigures; after: StressFigures | null } => ({
  before: figures(before, after ? ' before the trades' : ''),
  after: after && figures(after, ' after the trades'),
})

// ---- covariances that are bent

function riskOf(inputs: StressInputs, model: RiskModel, weights: Float64Array): StressFigures {
  return { volatility: volatilityOf(inputs, model, weights), stretch: null }
}

function volatilityOf(inputs: StressInputs, model: RiskModel, weights: Float64Array): Parts {
  const d = annualise(decompose(model, weights), inputs.periodsPerYear)
  return partsOf(inputs, d.volatility, d.contribution)
}

function partsOf({ groups }: StressInputs, total: number, parts: Float64Array): Parts {
  const byGroup = groups.map(({ labels, groupOf }) => {
    const sums = new Float64Array(labels.length)
    groupOf.forEach((group, i) => (sums[group]! += parts[i]!))
    return sums
  })
  return { total, parts, byGroup, difference: parts.reduce((sum, part) => sum + part, 0) - total }
}

function bent(
  inputs: StressInputs,
  scenario: Scenario & { readonly kind: 'volatilities' | 'correlations' | 'both' },
  before: Float64Array,
  after: Float64Array | null,
): Outcome | string {
  const factors = scenario.kind === 'correlations' ? null : factorsOf(inputs, scenario.factor)
  if (typeof factors === 'string') return factors
  const { model } = inputs.book
  const scaled = factors ? scaleVolatilities(model, factors) : model
  const notes: string[] = []
  const figures = bothOf(before, after, (weights, when) => {
    if (scenario.kind === 'volatilities') return riskOf(inputs, scaled, weights)
    const moved = riskOf(inputs, moveCorrelations(scaled, scenario.theta), weights)
    const without = volatilityOf(inputs, scaled, weights).total
    const total = moved.volatility?.total ?? 0
    if (total < without * (1 - LEAST_CHANGE))
      notes.push(
        `Here correlations nearer to 1 lower the risk${when}, from ${percentText(without, 2)} to ${percentText(total, 2)}: positions of opposite sign offset each other more.`,
      )
    return moved
  })
  return { figures, dates: null, notes }
}

/** A fall of risk smaller than this, of the risk, is rounding. */
const LEAST_CHANGE = 1e-9

/** One factor a position, or why there is none. */
function factorsOf({ names, groups }: StressInputs, factor: VolatilityFactor): Float64Array | string {
  if (typeof factor === 'number') return new Float64Array(names.length).fill(factor)
  const column = groups.find(({ header }) => plainName(header) === plainName(factor.header))
  if (!column) return `The holdings have no group column ${quote(factor.header)}.`
  const known = new Map(column.labels.map((label, group) => [plainName(label), group]))
  const byGroup = new Float64Array(column.labels.length).fill(1)
  const seen = new Set<number>()
  for (const [label, value] of factor.factors) {
    const group = known.get(plainName(label))
    if (group === undefined)
      return `No holding stands under ${quote(label)} in the column ${quote(column.header)}.`
    if (seen.has(group)) return `${quote(label)} has two factors: one is needed.`
    seen.add(group)
    byGroup[group] = value
  }
  return Float64Array.from(column.groupOf, (group) => byGroup[group]!)
}

// ---- stretches of the past

type StretchScenario = Scenario & { readonly kind: 'stretch' }
type Data = NonNullable<BookModel['data']>

const NO_MATRIX_DATES = 'A covariance matrix holds no dates to replay: a block of returns is needed.'
const NO_COMMON_DATES = 'Fewer than 2 dates have a return for every holding: there is no stretch to replay.'

/** Dates below which the volatility of a stretch is said to be rough. Our own convention. */
const FEW_DATES = 60

const dataOf = ({ data, window }: StressInputs['book']): Data | string =>
  data ?? (window === null ? NO_MATRIX_DATES : NO_COMMON_DATES)

/** The k-th date of the data as a user knows it. */
const dateOf = ({ serials, rows }: Data, k: number): string =>
  serials ? dateText(serials[k] ?? NaN) : `date ${(rows[k] ?? 0) + 1}`

function replayed(
  inputs: StressInputs,
  scenario: StretchScenario,
  before: Float64Array,
  after: Float64Array | null,
): Outcome | string {
  const data = dataOf(inputs.book)
  if (typeof data === 'string') return data
  const found = placesOf(data, scenario)
  if (typeof found === 'string') return found
  const [start, end] = found
  const { size } = data
  const used = end - start
  const block = data.values.subarray(start * size, end * size)
  const simple = simpleOf(block, inputs.returnKind)
  const model = used < 2 ? null : returnsModel(block, used, size)
  const notes: string[] = []
  const figures = bothOf(before, after, (weights, when) => {
    const { total, parts, portfolio, compounded, worstFall } = replay(simple, used, size, weights)
    const ruin = portfolio.findIndex((y) => y <= -1)
    if (ruin >= 0)
      notes.push(
        `On ${dateOf(data, start + ruin)} the book${when} loses all its value or more (${percentText(portfolio[ruin]!, 1)}), so that nothing is left to compound.`,
      )
    return {
      volatility: model && volatilityOf(inputs, model, weights),
      stretch: {
        ...partsOf(inputs, total, parts),
        compounded,
        worstFall: worstFall && {
          share: worstFall.share,
          between:
            worstFall.trough < 0
              ? null
              : [
                  worstFall.peak < 0 ? `before ${dateOf(data, start)}` : dateOf(data, start + worstFall.peak),
                  dateOf(data, start + worstFall.trough),
                ],
        },
      },
    }
  })
  const leftOut = data.rows[end - 1]! - data.rows[start]! + 1 - used
  return {
    figures,
    dates: { first: dateOf(data, start), last: dateOf(data, end - 1), used, leftOut },
    notes: [...notes, ...stretchNotes(inputs, data, used, leftOut, [before, ...(after ? [after] : [])])],
  }
}

/** The dates of a stretch within the data, as [start, end). */
function placesOf(
  data: Data,
  { by, from, to }: StretchScenario,
): readonly [start: number, end: number] | string {
  const { serials, rows } = data
  if (by === 'dates' && !serials)
    return 'The returns carry no dates: a stretch is chosen by their number, the oldest being 1.'
  if (!(from <= to)) return 'The stretch begins after it ends.'
  const places = by === 'dates' && serials ? serials.map(Math.floor) : rows.map((row) => row + 1)
  const start = places.findIndex((place) => place >= from)
  const after = places.findIndex((place) => place > to)
  const end = after < 0 ? places.length : after
  if (start < 0 || start >= end)
    return `No date with a return for every holding lies within the stretch: those of the look-back run from ${dateOf(data, 0)} to ${dateOf(data, places.length - 1)}.`
  return [start, end]
}

const simpleOf = (block: Float64Array, kind: StressInputs['returnKind']): Float64Array =>
  kind === 'log' ? block.map(Math.expm1) : block

function stretchNotes(
  { names }: StressInputs,
  { values, size }: Data,
  used: number,
  leftOut: number,
  books: readonly Float64Array[],
): readonly string[] {
  const notes: string[] = []
  if (used < 2) notes.push('One date has no volatility: its return and the parts of it are shown alone.')
  else if (used < FEW_DATES)
    notes.push(
      `The volatility of ${countOf(used, 'date')} is a rough figure: for normal returns its standard error is about ${percentText(1 / Math.sqrt(2 * used), 0)} of it.`,
    )
  if (leftOut > 0)
    notes.push(
      `${countOf(leftOut, 'date')} within the stretch ${leftOut === 1 ? 'is' : 'are'} left out, where some holding has no return: what the book made there is not in the figures.`,
    )
  const flat = names.filter((_, i) => {
    if (books.every((weights) => weights[i] === 0)) return false
    for (let k = i; k < values.length; k += size) if (values[k] !== 0) return false
    return true
  })
  if (flat.length > 0)
    notes.push(`${listOf(flat.map(quote))} ${flat.length === 1 ? 'counts' : 'count'} at a return of 0.`)
  return notes
}

/**
 * The stretch of so many dates over which the book would have lost most at these weights, by the sum of its returns.
 *
 * @param weights  one a position
 * @param dates    of the stretch, among those with a return for every holding
 * @returns        the scenario, and what it is found by; or the sentence why there is none
 * @cost           one pass over the returns
 */
export function worstStretch(
  inputs: StressInputs,
  weights: Float64Array,
  dates: number,
): { readonly scenario: Scenario; readonly sentence: string } | string {
  const data = dataOf(inputs.book)
  if (typeof data === 'string') return data
  const { values, rows, size, serials } = data
  const all = rows.length
  const { value: worst, fault } = attempt(() =>
    findWorst(simpleOf(values, inputs.returnKind), all, size, weights, dates),
  )
  if (fault) return explain(fault, () => '')
  const last = worst.start + dates - 1
  const place = (k: number): number => (serials ? Math.floor(serials[k] ?? NaN) : (rows[k] ?? 0) + 1)
  const scenario: Scenario = {
    kind: 'stretch',
    by: serials ? 'dates' : 'rows',
    from: place(worst.start),
    to: place(last),
  }
  const span = `${dateOf(data, worst.start)} to ${dateOf(data, last)}`
  const sum = percentText(worst.total, 2)
  return {
    scenario,
    sentence:
      worst.total < 0
        ? `Of all stretches of ${countOf(dates, 'date')} among ${numberText(all, 0)}, ${span} has the largest loss at these weights: a sum of returns of ${sum}.`
        : `No stretch of ${countOf(dates, 'date')} among ${numberText(all, 0)} was a loss at these weights. The one with the smallest gain is ${span}: a sum of returns of ${sum}.`,
  }
}
