import { correlation } from '../core'
import type { Blocks, BookModel } from './book-model'
import type { Breakdown } from './breakdown'
import { inBaseCurrency } from './currency'
import type { HashPart } from './history-hash'
import { hashOf, sortedJson } from './history-hash'
import type { Settings } from './settings'
import { settingsToJson } from './settings'

/**
 * A result kept with its date: all that is needed to compare it with another one later, whatever has become of the blocks meanwhile.
 * Arrays have one entry for each holding, in their order then.
 */
export interface Snapshot extends SnapshotHead {
  readonly names: readonly string[]
  readonly groupHeaders: readonly string[]
  /** a holding's labels, one a group column */
  readonly groups: readonly (readonly string[])[]
  /** a holding's label of its currency, '' where it has none; absent where nobody kept it */
  readonly currencies?: readonly string[]
  readonly weights: Float64Array
  /** volatility of one unit of each holding, scaled as the result is; 0 for a riskless one */
  readonly volatilities: Float64Array
  /** to the volatility, scaled; sums to it */
  readonly contribution: Float64Array
  /** n x n row-major; the row and column of a riskless holding hold 0 but for its diagonal. null where they were too many to be kept */
  readonly correlations: Float64Array | null
  readonly horizon: Breakdown['horizon']
  readonly dates: Breakdown['dates']
  /** last date of the block of returns then, whether it was used or not; null where it has no dates, absent where nobody kept it */
  readonly readTo?: number | null
  readonly settings: Settings
  /** the same as printed */
  readonly settingLines: Breakdown['settings']
  /** of the returns (or the covariance matrix) the model rests on, holdings in their order: whether they are still there */
  readonly returnsHash: string
}

/** What a list of kept results says of each. */
export interface SnapshotHead {
  /** numbered as they are kept; never used twice for a book */
  readonly id: string
  /** of the book, then */
  readonly title: string
  /** what the user wrote to it, or '' */
  readonly note: string
  /** day it was kept, as a workbook counts days */
  readonly keptOn: number
  /** last date of the data; null where they have none */
  readonly dataDate: number | null
  readonly volatility: number
  readonly trackingError: number | null
  /** the periods in a year that both are scaled to; 1 where they are per period */
  readonly periodsPerYear: number
  readonly positions: number
  /** of all inputs: names, weights, returns and settings. Equal hashes: the same result */
  readonly inputsHash: string
}

/** What a list says of a result, without the rest of it. */
export function headOf(of: SnapshotHead): SnapshotHead {
  const { id, title, note, keptOn, dataDate, volatility, trackingError, periodsPerYear } = of
  const { positions, inputsHash } = of
  return {
    id,
    title,
    note,
    keptOn,
    dataDate,
    volatility,
    trackingError,
    periodsPerYear,
    positions,
    inputsHash,
  }
}

/**
 * Correlations are kept with a result up to this many holdings: 11,175 numbers, about 0.14 MB of a saved workbook for each result. For 500 holdings
 * they would be 125,000 numbers and 1.5 MB. Our own convention.
 */
export const MOST_KEPT = 150

/** The figures a result is made of, as they stand. */
export interface SnapshotInput extends Pick<SnapshotHead, 'id' | 'title' | 'note' | 'keptOn'> {
  readonly blocks: Blocks
  readonly book: BookModel
  readonly settings: Settings
  readonly breakdown: Pick<
    Breakdown,
    'names' | 'groups' | 'groupHeaders' | 'decomposition' | 'active' | 'horizon' | 'dates' | 'settings'
  >
}

/**
 * A result to be kept, or to be compared with one that is.
 *
 * @param extent 'kept': without correlations beyond MOST_KEPT holdings; 'whole': with them in any case
 * @throws Fault "host" where no hash can be taken
 * @cost         O(T n) for the hashes; the correlations O(T n^2)
 */
export async function snapshotOf(input: SnapshotInput, extent: 'kept' | 'whole'): Promise<Snapshot> {
  const { id, title, note, keptOn, blocks, book, settings, breakdown } = input
  const { names, groups, groupHeaders, decomposition: d, active, horizon, dates } = breakdown
  const returnsHash = await hashOf(returnsParts(blocks, book))
  return {
    id,
    title,
    note,
    keptOn,
    dataDate: dates?.last ?? null,
    volatility: d.volatility,
    trackingError: active?.risk.trackingError ?? null,
    periodsPerYear: d.periodsPerYear,
    positions: names.length,
    inputsHash: await hashOf([
      'inputs',
      ...names,
      d.weights,
      returnsHash,
      sortedJson(settingsToJson(settings)),
    ]),
    names,
    groupHeaders,
    groups,
    currencies: blocks.holdings.holdings.map(({ currency }) => currency),
    weights: d.weights.slice(),
    volatilities: book.model.variances().map((variance) => Math.sqrt(variance * d.periodsPerYear)),
    contribution: d.contribution.slice(),
    correlations: extent === 'whole' || names.length <= MOST_KEPT ? correlationsOf(book) : null,
    horizon,
    dates,
    readTo: blocks.returns.dates?.at(-1) ?? null,
    settings,
    settingLines: breakdown.settings,
    returnsHash,
  }
}

/** As a snapshot has them: the half below the diagonal holds for both, and a riskless holding has none. */
function correlationsOf({ model }: BookModel): Float64Array {
  const { size } = model
  const matrix = correlation(model)
  for (let i = 0; i < size; i++) {
    for (let j = 0; j < i; j++) {
      const below = matrix[i * size + j]!
      matrix[i * size + j] = matrix[j * size + i] = Number.isNaN(below) ? 0 : below
    }
    matrix[i * size + i] = 1
  }
  return matrix
}

/**
 * What the hash of the returns is taken of. Returns: the text "returns", how many dates and holdings, the serial numbers of the dates (none
 * where there are none), the returns date by date with the holdings in their order, in the base currency; riskless holdings at 0. Of a factor model
 * thereafter the text "factors" and the factors' returns of the same dates. A covariance matrix: the text "covariance", how many holdings, the matrix
 * row by row.
 */
function returnsParts(blocks: Blocks, book: BookModel): readonly HashPart[] {
  const { recipe } = book
  const { returns } = blocks
  if (returns.content === 'covariance')
    return [
      'covariance',
      Float64Array.of(book.model.size),
      recipe.kind === 'matrix' ? recipe.matrix : book.model.matrix(),
    ]
  const { values, rows, serials } = usedReturns(blocks, book)
  return [
    'returns',
    Float64Array.of(rows, book.model.size),
    Float64Array.from(serials ?? []),
    values,
    ...(recipe.kind === 'factors' ? ['factors', recipe.factors] : []),
  ]
}

/** The returns a model rests on: those of the dates all holdings share, or with gaps those of the look-back. */
function usedReturns(
  { returns: read, match }: Blocks,
  { rule, data, window }: BookModel,
): { values: Float64Array; rows: number; serials: readonly number[] | null } {
  if (rule === 'common dates' && data) return { ...data, rows: data.rows.length }
  const returns = inBaseCurrency(read, match.seriesOf, match.currencies)
  const size = match.seriesOf.length
  const rows = window?.used ?? returns.rows
  const first = returns.rows - rows
  const values = new Float64Array(rows * size)
  match.seriesOf.forEach((series, i) => {
    if (series < 0) return
    for (let t = 0; t < rows; t++)
      values[t * size + i] = returns.values[(first + t) * returns.columns + series]!
  })
  return { values, rows, serials: returns.dates?.slice(first) ?? null }
}
