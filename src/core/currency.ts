import { decompose } from './decomposition'
import { checkBlock, Fault } from './fault'
import type { RiskModel } from './risk-model'

/** Risk in a base currency parted into what holdings do at home and what their currencies do, per period. */
export interface CurrencySplit {
  /** n; what is left of each contribution, the product of local and currency return included */
  readonly local: Float64Array
  /** n; 0 for a position in the base currency */
  readonly currency: Float64Array
  /** The foreign currencies in the order of their first position; their parts add up to those of the positions. */
  readonly byCurrency: readonly CurrencyPart[]
}

export interface CurrencyPart {
  /** the position of its series in the model */
  readonly series: number
  /** sum of the weights that stand in it */
  readonly exposure: number
  readonly contribution: number
}

/**
 * Splits the risk of a book with foreign holdings into local and currency parts. The model holds the series of the currencies (the return of
 * one unit of each in the base currency) as positions of their own, most often at weight 0.
 *
 *   r_i = (1 + l_i)(1 + f_k) - 1 = f_k + (l_i + l_i f_k)
 *   currency part  w_i cov(f_k, r_P) / s,   local part  c_i - currency part,   k the currency of i
 *
 * Local and currency parts of a position add up to its contribution c_i, and so all of them to the volatility. A position that is the
 * currency itself has no local part; where the weights in a currency sum to 0, so do its currency parts.
 *
 * @param weights     n; decimals of capital, of any sign and sum
 * @param currencyOf  n; the position of the series of each position's currency, -1 for the base currency
 * @returns           per period, in the unit of the returns; all 0 where there is no risk
 * @throws Fault      "shape" | "not-a-number" | "negative-variance" | "out-of-range" (a position that is none, with its row)
 * @source            Euler allocation to the terms of the return: Tasche (2008), arXiv:0708.2542; the terms: Eun & Resnick (1988), Exchange
 *                    Rate Uncertainty, Forward Contracts, and International Portfolio Selection, J. Finance 43(1) (from memory)
 * @cost              one pass of the model
 * @example           currencySplit(matrixModel(Float64Array.of(.09, .02, .02, .01), 2), Float64Array.of(1, 0), Int32Array.of(1, -1)).currency // [0.06667, 0]
 */
export function currencySplit(
  model: RiskModel,
  weights: Float64Array,
  currencyOf: Int32Array,
): CurrencySplit {
  const { size } = model
  checkBlock(Float64Array.from(currencyOf), size, 1, 'currencies')
  const row = currencyOf.findIndex((series) => series < -1 || series >= size)
  if (row >= 0) {
    throw new Fault(
      'out-of-range',
      `currencies: position ${currencyOf[row]}`,
      `a position from 0 to ${size - 1}, or -1 for the base currency, is needed`,
      { argument: 'currencies', row },
    )
  }
  const { contribution, marginal } = decompose(model, weights)
  const parts = new Map<number, { series: number; exposure: number; contribution: number }>()
  const currency = Float64Array.from(weights, (weight, i) => {
    const series = currencyOf[i]!
    if (series < 0) return 0
    const part = marginal === null ? 0 : weight * marginal[series]!
    const sum = parts.get(series) ?? { series, exposure: 0, contribution: 0 }
    sum.exposure += weight
    sum.contribution += part
    parts.set(series, sum)
    return part
  })
  return { local: contribution.map((c, i) => c - currency[i]!), currency, byCurrency: [...parts.values()] }
}
