import type { Breakdown } from './breakdown'
import type { Settings } from './settings'

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
  /** 1 where figures are per period */
  readonly periodsPerYear: number
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
  readonly positions: number
  /** of all inputs: names, weights, returns and settings. Equal hashes: the same result */
  readonly inputsHash: string
}
