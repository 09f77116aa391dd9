import type { Breakdown } from '../sheet'

/** The figure that positions are ranked and drawn by. */
export interface Measure {
  readonly label: 'Share of risk' | 'Contribution to risk'
  readonly values: Float64Array
  readonly digits: number
  /** whether it is measured on the scale of weights, so that the two can be drawn side by side */
  readonly comparable: boolean
}

/** Decimals of a percentage: small parts of a large book need one more to be told apart. */
export const digitsFor = (positions: number): number => (positions > 60 ? 2 : 1)

/** Shares of risk; contributions where shares are withheld or there is no risk to share. */
export function measureOf({ decomposition: d, sharesWithheld }: Breakdown): Measure {
  return d.share && sharesWithheld === null
    ? { label: 'Share of risk', values: d.share, digits: digitsFor(d.weights.length), comparable: true }
    : {
        label: 'Contribution to risk',
        values: d.contribution,
        digits: digitsFor(d.weights.length) + 1,
        comparable: false,
      }
}

/** Shares as they may be shown, or null with the reason told elsewhere. */
export const sharesOf = ({ decomposition, sharesWithheld }: Breakdown): Float64Array | null =>
  sharesWithheld === null ? decomposition.share : null
