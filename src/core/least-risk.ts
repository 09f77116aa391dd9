import type { RiskModel } from './risk-model'

/**
 * The weight of each position at which its marginal contribution to risk is zero, all others held and cash taking up the difference: no other weight
 * of this position alone gives the portfolio a lower volatility.
 *
 *   w_i - (C w)_i / C_ii
 *
 * @param weights  n; decimals of capital, of any sign and sum
 * @returns        n; decimals of capital. NaN where C_ii = 0: a position that never moves changes no risk at any weight
 * @throws Fault   what `apply` of the model throws
 * @source         the parabola w'C w has its lowest point in w_i there; after Litterman (1996), Hot Spots and Hedges, JPM special
 *                 issue, 52-75 (from memory)
 * @cost           one question to the model
 * @example        leastRiskWeights(matrixModel(Float64Array.of(.04, .01, .01, .09), 2), Float64Array.of(.5, .5)) // [-0.125, -0.05556]
 */
export function leastRiskWeights(model: RiskModel, weights: Float64Array): Float64Array {
  const { marginals } = model.apply(weights)
  const variances = model.variances()
  return weights.map((weight, i) => (variances[i] === 0 ? NaN : weight - marginals[i]! / variances[i]!))
}
