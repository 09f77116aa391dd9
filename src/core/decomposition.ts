import { checkBlock, Fault } from './fault'
import type { RiskModel } from './risk-model'

/**
 * How much risk a portfolio runs and where it comes from. Arrays have one entry for each position.
 *
 * Where the portfolio has no risk at all, contributions are 0 and whatever would divide by its risk is null.
 */
export interface Decomposition {
  /** The periods in a year the figures are scaled to; 1: per period. */
  readonly periodsPerYear: number
  readonly weights: Float64Array
  /** s = sqrt(w'C w) */
  readonly volatility: number
  readonly variance: number
  /** |w_i| sigma_i, the volatility of the position alone. */
  readonly standAlone: Float64Array
  /** (C w)_i / s = ds/dw_i */
  readonly marginal: Float64Array | null
  /** w_i (C w)_i / s; adds up to s. */
  readonly contribution: Float64Array
  /** contribution / s; adds up to 1, and is the elasticity of risk to the size of the position. */
  readonly share: Float64Array | null
  /** (C w)_i / s^2 */
  readonly beta: Float64Array | null
  /** (C w)_i / (sigma_i s); NaN where sigma_i is 0: a riskless position correlates with nothing. */
  readonly correlation: Float64Array | null
  /** Sum of stand-alone volatilities / s. */
  readonly diversificationRatio: number | null
  /** Sum of stand-alone volatilities - s. */
  readonly diversificationBenefit: number
  /** 1 / sum of squared shares. */
  readonly effectiveNumber: number | null
  readonly sumOfContributions: number
  /** sumOfContributions - volatility: rounding, shown so that totals can be seen to tie out. */
  readonly difference: number
}

/**
 * Splits volatility among positions (Euler allocation).
 *
 *   s = sqrt(w'C w),   contribution c_i = w_i (C w)_i / s,   sum of c_i = s,   share p_i = c_i / s
 *
 * A variance that rounding alone could have made of zero (see `RiskModel.rounding`) counts as zero: its digits
 * carry no information, and neither would shares of it.
 *
 * @param weights  n; decimals of capital, of any sign and sum
 * @returns        per period, in the unit of the returns; contributions add up to the volatility to rounding
 * @throws Fault   "shape" | "not-a-number" | "negative-variance" | "out-of-range" (a variance too large for a double)
 * @source         Tasche (2008), Capital Allocation to Business Units and Sub-Portfolios: the Euler Principle,
 *                 arXiv:0708.2542; share as weight x beta: Maillard, Roncalli & Teiletche (2010), JPM 36(4);
 *                 diversification ratio: Choueifaty & Coignard (2008), JPM 35(1) (from memory)
 * @cost           O(T n) for a returns model, O(n^2) for a matrix
 * @example        decompose(matrixModel(Float64Array.of(.04, 0, 0, .01), 2), Float64Array.of(.5, .5)).contribution // [0.08944, 0.02236]
 * @example        decompose(matrixModel(Float64Array.of(.04, 0, 0, .01), 2), Float64Array.of(.5, .5)).share // [0.8, 0.2]
 * @example        decompose(matrixModel(Float64Array.of(.04, 0, 0, .01), 2), Float64Array.of(0, 0)).share // null
 */
export function decompose(model: RiskModel, weights: Float64Array): Decomposition {
  const columns = columnsOf(model.size)
  const { variance: computed } = model.apply(weights, columns.marginal)
  const { standAlone, marginal, contribution, share, beta, correlation } = columns
  const { deviations, inverses } = deviationsOf(model)
  const gross = fillStandAlone(standAlone, weights, deviations)
  columns.weights.set(weights)
  if (!Number.isFinite(computed) || !Number.isFinite(gross * gross)) {
    throw new Fault(
      'out-of-range',
      'the variance is too large to be a number',
      'smaller weights or returns are needed (decimals, such as 0.05 for 5%)',
    )
  }
  if (computed <= model.rounding * gross * gross) {
    return {
      periodsPerYear: 1,
      weights: columns.weights,
      standAlone,
      volatility: 0,
      variance: 0,
      marginal: null,
      contribution,
      share: null,
      beta: null,
      correlation: null,
      diversificationRatio: null,
      diversificationBenefit: gross,
      effectiveNumber: null,
      sumOfContributions: 0,
      difference: 0,
    }
  }
  const volatility = Math.sqrt(computed)
  const { sumOfContributions, squares } = fillColumns(columns, inverses, volatility)
  return {
    periodsPerYear: 1,
    weights: columns.weights,
    standAlone,
    volatility,
    variance: computed,
    marginal,
    contribution,
    share,
    beta,
    correlation,
    diversificationRatio: gross / volatility,
    diversificationBenefit: gross - volatility,
    effectiveNumber: 1 / squares,
    sumOfContributions,
    difference: sumOfContributions - volatility,
  }
}

// Beside one pass over the block of returns, a callback for every number or an allocation for every column would show: the two
// loops have functions of their own, columns share one allocation, and square roots are taken once a model.

interface Deviations {
  /** sigma_i, the volatility of each position */
  readonly deviations: Float64Array
  /** 1 / sigma_i; NaN where sigma_i is 0 */
  readonly inverses: Float64Array
}

const deviationsByModel = new WeakMap<RiskModel, Deviations>()

function deviationsOf(model: RiskModel): Deviations {
  const known = deviationsByModel.get(model)
  if (known) return known
  const deviations = model.variances().map(Math.sqrt)
  const made = { deviations, inverses: deviations.map((sigma) => (sigma === 0 ? NaN : 1 / sigma)) }
  deviationsByModel.set(model, made)
  return made
}

/** Fills the stand-alone risks and returns their sum. */
function fillStandAlone(standAlone: Float64Array, weights: Float64Array, deviations: Float64Array): number {
  let gross = 0
  for (let i = 0; i < weights.length; i++) gross += standAlone[i] = Math.abs(weights[i]!) * deviations[i]!
  return gross
}

/** Fills the other columns; `marginal` holds C w on entry. */
function fillColumns(
  { weights, marginal, contribution, share, beta, correlation }: Columns,
  inverses: Float64Array,
  volatility: number,
) {
  const perUnit = 1 / volatility
  let sumOfContributions = 0
  let squares = 0
  for (let i = 0; i < weights.length; i++) {
    const w = weights[i]!
    const m = marginal[i]! * perUnit
    const b = m * perUnit
    const c = w * m
    const p = w * b
    marginal[i] = m
    contribution[i] = c
    share[i] = p
    beta[i] = b
    correlation[i] = m * inverses[i]!
    sumOfContributions += c
    squares += p * p
  }
  return { sumOfContributions, squares }
}

/** Columns of a decomposition, n each, in one allocation. */
function columnsOf(size: number) {
  const { buffer } = new Float64Array(7 * size)
  const column = (k: number) => new Float64Array(buffer, k * size * 8, size)
  return {
    weights: column(0),
    standAlone: column(1),
    marginal: column(2),
    contribution: column(3),
    share: column(4),
    beta: column(5),
    correlation: column(6),
  }
}

type Columns = ReturnType<typeof columnsOf>

/**
 * The same figures scaled to a year by the square root of time; ratios (shares, betas, correlations) stay.
 *
 * Holds for returns without autocorrelation only: Lo (2002), The Statistics of Sharpe Ratios, FAJ 58(4).
 *
 * @param periodsPerYear  more than 0; scales from whatever the figures are scaled to now, 1 leads back
 * @throws Fault          "out-of-range"
 * @source                square root of time: common practice
 * @cost                  O(n)
 * @example               annualise(decompose(matrixModel(Float64Array.of(.0004), 1), Float64Array.of(1)), 252).volatility // 0.31749
 */
export function annualise(d: Decomposition, periodsPerYear: number): Decomposition {
  if (!(periodsPerYear > 0 && Number.isFinite(periodsPerYear))) {
    throw new Fault(
      'out-of-range',
      `periods per year: ${periodsPerYear}`,
      'a number above 0 is needed, such as 252',
      {
        argument: 'periods_per_year',
      },
    )
  }
  const factor = Math.sqrt(periodsPerYear / d.periodsPerYear)
  const scaled = (values: Float64Array) => values.map((value) => value * factor)
  return {
    ...d,
    periodsPerYear,
    volatility: d.volatility * factor,
    variance: d.variance * (periodsPerYear / d.periodsPerYear),
    standAlone: scaled(d.standAlone),
    marginal: d.marginal && scaled(d.marginal),
    contribution: scaled(d.contribution),
    diversificationBenefit: d.diversificationBenefit * factor,
    sumOfContributions: d.sumOfContributions * factor,
    difference: d.difference * factor,
  }
}

/** The decomposition by group; arrays have one entry for each group, scaled as the decomposition is. */
export interface GroupDecomposition {
  readonly weight: Float64Array
  /** The volatility of the group's positions held alone, at their weights. */
  readonly standAlone: Float64Array
  /** Sum of the members' contributions; adds up to the volatility. */
  readonly contribution: Float64Array
  readonly share: Float64Array | null
}

/**
 * Adds positions up to groups. Contributions add; stand-alone volatilities do not, each is a sub-portfolio's own.
 *
 * @param d        of the same model
 * @param groupOf  n; the group of each position, 0 .. groups-1
 * @throws Fault   "shape" | "out-of-range" (with the row of the position)
 * @source         Coleman & Litterman (2012), Quantitative Risk Management, appendix 10.1 (from memory)
 * @cost           one pass of the model for each group
 * @example        groupDecomposition(matrixModel(Float64Array.of(.04, 0, 0, .01), 2), decompose(matrixModel(Float64Array.of(.04, 0, 0, .01), 2), Float64Array.of(.5, .5)), Int32Array.of(0, 0), 1).standAlone // [0.1118]
 */
export function groupDecomposition(
  model: RiskModel,
  d: Decomposition,
  groupOf: Int32Array,
  groups: number,
): GroupDecomposition {
  checkBlock(d.weights, model.size, 1, 'weights')
  checkBlock(Float64Array.from(groupOf), model.size, 1, 'groups')
  const weight = new Float64Array(groups)
  const contribution = new Float64Array(groups)
  groupOf.forEach((group, i) => {
    if (group < 0 || group >= groups) {
      throw new Fault(
        'out-of-range',
        `groups: number ${group}`,
        `a number from 0 to ${groups - 1} is needed`,
        {
          argument: 'groups',
          row: i,
        },
      )
    }
    weight[group]! += d.weights[i]!
    contribution[group]! += d.contribution[i]!
  })
  const scale = Math.sqrt(d.periodsPerYear)
  const standAlone = Float64Array.from({ length: groups }, (_, group) => {
    const members = d.weights.map((w, i) => (groupOf[i] === group ? w : 0))
    return decompose(model, members).volatility * scale
  })
  return {
    weight,
    standAlone,
    contribution,
    share: d.share && contribution.map((c) => c / d.volatility),
  }
}
