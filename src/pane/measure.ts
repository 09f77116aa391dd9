import { percentText, type Bands, type Breakdown } from '../sheet'

/** The figure that positions are ranked and drawn by. */
export interface Measure {
  readonly label: 'Share of risk' | 'Contribution to risk'
  readonly values: Float64Array
  /** standard errors of the values; null where they are not known */
  readonly errors: Float64Array | null
  readonly digits: number
  /** whether it is measured on the scale of weights, so that the two can be drawn side by side */
  readonly comparable: boolean
}

/** Decimals of a percentage: small parts of a large book need one more to be told apart. */
export const digitsFor = (positions: number): number => (positions > 60 ? 2 : 1)

/** A difference of two percentages, in points of a hundred, with its sign. */
export function pointsText(difference: number, digits: number): string {
  const shown = percentText(difference, digits).replace('%', '')
  return /[1-9]/.test(shown) && difference > 0 ? `+${shown}` : shown
}

const MOST_DIGITS = 4
const apart = (digits: number, a: number, b: number): boolean =>
  percentText(a, digits) !== percentText(b, digits)

/** Decimals of percentages that stand side by side: two, or as many as tell those apart that four decimals can. */
export function digitsApart(...figures: readonly (number | null)[]): number {
  const shown = figures.filter((figure) => figure !== null)
  const pairs = shown.flatMap((a, i) => shown.slice(i + 1).map((b) => [a, b] as const))
  const unlike = pairs.filter(([a, b]) => apart(MOST_DIGITS, a, b))
  const digits = [2, 3].find((few) => unlike.every(([a, b]) => apart(few, a, b)))
  return digits ?? MOST_DIGITS
}

/** Shares of risk; contributions where shares are withheld or there is no risk to share. */
export function measureOf(breakdown: Breakdown): Measure {
  const { decomposition: d } = breakdown
  const shares = sharesOf(breakdown)
  const bands = bandsOf(breakdown)
  return shares
    ? {
        label: 'Share of risk',
        values: shares,
        errors: bands?.share ?? null,
        digits: digitsFor(d.weights.length),
        comparable: true,
      }
    : {
        label: 'Contribution to risk',
        values: d.contribution,
        errors: bands?.contribution ?? null,
        digits: digitsFor(d.weights.length) + 1,
        comparable: false,
      }
}

/** Shares as they may be shown, or null with the reason told elsewhere. */
export const sharesOf = ({ decomposition, sharesWithheld }: Breakdown): Float64Array | null =>
  sharesWithheld === null ? decomposition.share : null

/** The error bands, or null where there are none and the reason is told elsewhere. */
export const bandsOf = ({ bands }: Breakdown): Bands | null => (typeof bands === 'string' ? null : bands)
