import type { Decomposition } from './decomposition'
import { checkBlock, Fault } from './fault'

/**
 * What ties implied returns to a scale: how many units of return a unit of variance must earn (risk aversion), or the excess return that the
 * whole book is expected to earn.
 */
export type ImpliedChoice =
  | { readonly kind: 'risk aversion'; readonly value: number }
  | { readonly kind: 'total'; readonly value: number }

/** Returns beyond the riskless rate that would make the weights optimal; for the time the decomposition is scaled to. */
export interface ImpliedReturns {
  /** n */
  readonly implied: Float64Array
  /** w'implied */
  readonly total: number
  /** units of return for each unit of variance; null where the book has no risk, as every one would do */
  readonly riskAversion: number | null
}

/**
 * The excess returns for which today's weights maximise return less half the risk aversion times variance (reverse optimisation).
 *
 *   implied_i = risk aversion x (C w)_i;   with a given total: total x beta_i, since w'implied = risk aversion x w'C w
 *
 * The weights are taken as the best of all, without limits on them, with cash at the riskless rate in any amount.
 *
 * @param d        the book; returns are by the year where it is annualised
 * @param choice   a value above 0
 * @throws Fault   "out-of-range" | "zero-risk" (a total without risk to earn it)
 * @source         Sharpe (1974), Imputing Expected Security Returns from Portfolio Composition, Journal of Financial and Quantitative Analysis 9(3)
 *                 (from memory); Black & Litterman (1992), Global Portfolio Optimization, Financial Analysts Journal 48(5) (from memory)
 * @cost           O(n)
 * @example        impliedReturns(decompose(matrixModel(Float64Array.of(.04, 0, 0, .01), 2), Float64Array.of(.5, .5)), { kind: 'risk aversion', value: 3 }).implied // [0.06, 0.015]
 * @example        impliedReturns(decompose(matrixModel(Float64Array.of(.04, 0, 0, .01), 2), Float64Array.of(.5, .5)), { kind: 'total', value: .05 }).riskAversion // 4
 */
export function impliedReturns(d: Decomposition, choice: ImpliedChoice): ImpliedReturns {
  const { kind, value } = choice
  if (!(value > 0 && Number.isFinite(value)))
    throw new Fault(
      'out-of-range',
      `${kind === 'total' ? 'total excess return' : kind}: ${value}`,
      'a number above 0 is needed',
      {
        argument: kind,
      },
    )
  const { marginal, volatility, variance } = d
  if (marginal === null) {
    if (kind === 'total')
      throw new Fault(
        'zero-risk',
        'the total risk is 0',
        'a book with risk is needed to earn an excess return',
        {
          argument: kind,
        },
      )
    return { implied: new Float64Array(d.weights.length), total: 0, riskAversion: null }
  }
  // marginal x volatility = C w
  const perMarginal = kind === 'total' ? value / volatility : value * volatility
  return {
    implied: marginal.map((m) => m * perMarginal),
    total: kind === 'total' ? value : value * variance,
    riskAversion: kind === 'total' ? value / variance : value,
  }
}

/**
 * Expected excess return for each unit of marginal contribution to risk. At an optimum without limits it is the same for all positions, and equal
 * to that of the whole book, return / volatility.
 *
 * @param expected  n; excess returns for the time the decomposition is scaled to; NaN where there is none
 * @returns         n; NaN where the marginal contribution is 0 by rounding, or nothing is expected
 * @throws Fault    "shape"
 * @source          first-order condition of mean-variance optimisation, as in Sharpe (1974) (from memory)
 * @cost            O(n)
 * @example         returnPerMarginal(decompose(matrixModel(Float64Array.of(.04, 0, 0, .01), 2), Float64Array.of(.5, .5)), Float64Array.of(.06, .015)) // [0.3354, 0.3354]
 */
export function returnPerMarginal(d: Decomposition, expected: Float64Array): Float64Array {
  const size = d.weights.length
  checkBlock(
    expected.map((value) => (Number.isNaN(value) ? 0 : value)),
    size,
    1,
    'expected returns',
  )
  const { marginal, correlation } = d
  return expected.map((value, i) =>
    // a correlation of no more than rounding, or none at all
    marginal && Math.abs(correlation![i]!) > size * Number.EPSILON ? value / marginal[i]! : NaN,
  )
}
