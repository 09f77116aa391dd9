import {
  annualise,
  correlation,
  covariance,
  Fault,
  groupDecomposition,
  leastRiskWeights,
  logReturns,
  simpleReturns,
  standardErrors,
  tailRisk,
  type Decomposition,
  type EstimatedModel,
  type Estimator,
  type RiskModel,
  type TailRisk,
} from '../core'
import {
  cellsOf,
  columnsNamed,
  confidenceOf,
  estimatorOf,
  kindOf,
  labelsOf,
  panelOf,
  periodsAheadOf,
  periodsOf,
  refuseHiddenBlanks,
  tailMethodOf,
  vectorOf,
  type Panel,
} from './blocks'
import { attempt } from './explain'
import { groupsOf } from './names'
import { blockMemo } from './memo'
import { countOf, POSITION_HEADS } from './wording'

/**
 * The bodies of the worksheet functions. Signatures and comments are what the host shows: the description of each function, its
 * arguments by the names given here, and a block of cells wherever the type is unknown[][]. Each takes raw cells and returns numbers,
 * or throws a Fault that names argument, row and column.
 *
 * weights and risk, everywhere: weights are one row or one column of n fractions of capital, of any sign and sum. risk is T x n returns
 * per period (fractions, newest row last), or an n x n covariance matrix; it may carry a first row of names and then also a first
 * column of dates, and dated rows are put in order. Columns belong to weights by place; BREAKDOWN alone goes by name. Figures come
 * back per period, or by the year where periods_per_year is given (square root of time), as fractions. Vectors come back in the
 * orientation of weights. The estimator is "sample" (divisor T-1; the default), "exponential" or "exponential 0.97" (decay factor, 0.94
 * where none is given; weighted mean taken off, weights scaled to sum 1), "shrink identity" (Ledoit & Wolf 2004), "shrink correlation" (toward
 * constant correlation, Ledoit & Wolf 2004), "shrink oas" (Chen et al. 2010) or "lagged 1" to "lagged 10" (Newey & West 1987); the latter
 * four divide by T.
 *
 * All are estimates from the numbers given, no advice.
 */

const keptBlock = blockMemo()

interface Book {
  readonly panel: Panel
  readonly model: RiskModel
  /** the model of the returns behind it; null for a covariance matrix */
  readonly estimated: EstimatedModel | null
  /** one weight a column of risk, 0 where none is given */
  readonly weights: Float64Array
  readonly decomposition: Decomposition
  /** the column of risk that each weight belongs to */
  readonly columnOf: Int32Array
  readonly across: boolean
}

function modelOf(argument: string, risk: unknown, estimator: unknown, returnsOnly = false) {
  const how: Estimator = estimatorOf(estimator)
  const kept = keptBlock(argument, cellsOf(argument, risk))
  if (returnsOnly && kept.panel.kind === 'covariance') {
    throw new Fault(
      'shape',
      'found a covariance matrix, which does not tell how many dates it rests on',
      'returns are needed, one row a date',
      { argument },
    )
  }
  if (kept.panel.kind === 'covariance' && how.kind !== 'sample') {
    throw new Fault(
      'unknown-choice',
      'found an estimator for a covariance matrix, which is taken as given',
      'no estimator is needed',
      { argument: 'estimator' },
    )
  }
  return { kept, how }
}

function bookOf(
  weights: unknown,
  risk: unknown,
  periods: unknown,
  estimator: unknown,
  names?: unknown,
  returnsOnly = false,
): Book {
  const { values, across } = vectorOf('weights', weights)
  const periodsPerYear = periodsOf(periods)
  const argument = returnsOnly ? 'returns' : 'risk'
  const { kept, how } = modelOf(argument, risk, estimator, returnsOnly)
  const { panel } = kept
  const columnOf = names === undefined ? inPlace(argument, values, panel) : byName(values, panel, names)
  refuseHiddenBlanks(argument, panel, columnOf)

  const placed = new Float64Array(panel.columns)
  columnOf.forEach((column, k) => (placed[column] = values[k]!))
  const decomposition = annualise(kept.decomposition(how, placed), periodsPerYear)
  return {
    panel,
    model: kept.model(how),
    estimated: kept.estimated(how),
    weights: placed,
    decomposition,
    columnOf,
    across,
  }
}

function inPlace(argument: string, weights: Float64Array, panel: Panel): Int32Array {
  if (weights.length !== panel.columns) {
    const turned = weights.length === panel.rows ? ' (its rows are as many: TRANSPOSE turns it)' : ''
    throw new Fault(
      'shape',
      `found ${countOf(panel.columns, 'column')} for ${countOf(weights.length, 'weight')}`,
      `one column for each weight is needed${turned}`,
      { argument },
    )
  }
  return Int32Array.from(weights, (_, k) => k)
}

function byName(weights: Float64Array, panel: Panel, names: unknown): Int32Array {
  const { labels, whereOf } = labelsOf('names', names)
  if (labels.length !== weights.length) throw uneven('names', 'name', labels.length, weights.length)
  const told = labels.map((label, k) => {
    if (label !== null) return label
    throw new Fault('blank', 'found a blank cell', 'a name is needed', whereOf(k))
  })
  return panel.names ? columnsNamed(told, panel.names, whereOf) : inPlace('risk', weights, panel)
}

const uneven = (argument: string, noun: string, found: number, weights: number): Fault =>
  new Fault(
    'shape',
    `found ${countOf(found, noun)} for ${countOf(weights, 'weight')}`,
    `one ${noun} for each weight is needed`,
    {
      argument,
    },
  )

/** A figure that divides by the total risk, or the fault where there is none to divide by. */
function defined<T>(figure: T | null, argument = 'risk'): T {
  if (figure !== null) return figure
  throw new Fault(
    'zero-risk',
    'found a portfolio without risk',
    'a volatility above 0 is needed to divide by',
    { argument },
  )
}

/** What a cell can hold: overflow is a fault rather than an error cell without a reason. */
function finite(value: number): number {
  if (Number.isFinite(value)) return value
  throw new Fault(
    'out-of-range',
    'found a result too large for a cell',
    'numbers small enough for their squares to be held are needed',
  )
}

function spilled(values: Float64Array, { columnOf, across }: Book): number[][] {
  const picked = Array.from(columnOf, (column) => finite(values[column]!))
  return across ? [picked] : picked.map((value) => [value])
}

const rowsOf = (values: Float64Array, columns: number): number[][] =>
  Array.from({ length: values.length / columns }, (_, row) =>
    Array.from(values.subarray(row * columns, (row + 1) * columns), finite),
  )

/**
 * Returns of each period from prices.
 *
 * @customfunction RETURNS
 * @helpurl https://localhost:3000/help.html#returns
 * @param prices Prices above 0: one row a date, newest last, one column a position; names and dates may come along
 * @param kind "simple" (the default) or "log"
 * @returns (T-1) x n returns as fractions, oldest first, without names and dates
 * @formula simple: r_t = P_t / P_{t-1} - 1
 * @formula log: r_t = ln(P_t / P_{t-1})
 * @remarks A first row of names and a first column of dates are left out of the result; dated rows are put in order, oldest first.
 * @throws Fault "blank" | "text" | "not-a-number" | "shape" | "out-of-range" | "twice" | "too-few" | "unknown-choice"
 * @source common practice, no source
 * @cost O(T n)
 * @example worksheetFunctions.RETURNS([[100], [110], [99]]) // [[0.1], [-0.1]]
 */
export function returns(prices: unknown[][], kind?: unknown): number[][] {
  const form = kindOf(kind) === 'log' ? logReturns : simpleReturns
  const panel = panelOf('prices', cellsOf('prices', prices), 'prices')
  return rowsOf(form(panel.values, panel.rows, panel.columns), panel.columns)
}

/**
 * Covariance matrix of returns.
 *
 * @customfunction COVARIANCE
 * @helpurl https://localhost:3000/help.html#covariance
 * @param returns Returns as fractions: one row a period, newest last, one column a position; names and dates may come along
 * @param periods_per_year Periods in a year to scale to, such as 252 or 52; 1 where left out
 * @param estimator "sample" (the default), "exponential 0.97", "shrink correlation", "shrink identity", "shrink oas" or "lagged 2"
 * @returns n x n covariances
 * @formula C_{ij} = h sum_t z_{ti} z_{tj} / (T - 1), h the periods per year
 * @throws Fault "blank" | "text" | "not-a-number" | "shape" | "twice" | "too-few" | "missing-data" | "unknown-choice" | "out-of-range"
 * @source sample: NIST/SEMATECH e-Handbook of Statistical Methods, section 6.5.4.1 (from memory); exponential: J.P. Morgan/Reuters,
 *         Technical Document, 4th ed. (1996), chapter 5 (from memory), here with the weighted mean taken off
 * @cost O(T n^2)
 * @example worksheetFunctions.COVARIANCE([[.01, .02], [.03, -.02]]) // [[0.0002, -0.0004], [-0.0004, 0.0008]]
 */
export function covarianceMatrix(
  returns: unknown[][],
  periods_per_year?: unknown,
  estimator?: unknown,
): number[][] {
  const periods = periodsOf(periods_per_year)
  const { kept, how } = modelOf('returns', returns, estimator)
  refuseHiddenBlanks('returns', kept.panel)
  const matrix = covariance(kept.model(how))
  return rowsOf(
    matrix.map((value) => value * periods),
    kept.panel.columns,
  )
}

/**
 * Correlation matrix of returns.
 *
 * @customfunction CORRELATION
 * @helpurl https://localhost:3000/help.html#correlation
 * @param returns Returns as fractions: one row a period, newest last, one column a position; names and dates may come along
 * @param estimator "sample" (the default), "exponential 0.97", "shrink correlation", "shrink identity", "shrink oas" or "lagged 2"
 * @returns n x n correlations; blank in the row and column of a position that never moves
 * @formula C_{ij} / sqrt(C_{ii} C_{jj})
 * @throws Fault as COVARIANCE
 * @source Pearson correlation: NIST/SEMATECH e-Handbook of Statistical Methods (from memory)
 * @cost O(T n^2)
 * @example worksheetFunctions.CORRELATION([[.04, .03], [.03, .09]]) // [[1, 0.5], [0.5, 1]]
 */
export function correlationMatrix(returns: unknown[][], estimator?: unknown): unknown[][] {
  const { kept, how } = modelOf('returns', returns, estimator)
  refuseHiddenBlanks('returns', kept.panel)
  const { columns } = kept.panel
  const matrix = correlation(kept.model(how))
  return Array.from({ length: columns }, (_, row) =>
    Array.from(matrix.subarray(row * columns, (row + 1) * columns), orBlank),
  )
}

/** A riskless position correlates with nothing. */
const orBlank = (value: number): number | string => (Number.isNaN(value) ? '' : value)

/**
 * Volatility of the portfolio: the standard deviation of its return.
 *
 * @customfunction VOLATILITY
 * @helpurl https://localhost:3000/help.html#volatility
 * @param weights Weights as fractions: one row or one column
 * @param risk Returns (one row a period, newest last, one column a weight) or a covariance matrix
 * @param periods_per_year Periods in a year to scale to, such as 252 or 52; 1 where left out
 * @param estimator "sample" (the default), "exponential 0.97", "shrink correlation", "shrink identity", "shrink oas" or "lagged 2"
 * @returns Volatility as a fraction
 * @formula s = sqrt(w' C w)
 * @throws Fault "blank" | "text" | "not-a-number" | "shape" | "twice" | "too-few" | "missing-data" | "not-symmetric" |
 *         "correlation-matrix" | "negative-variance" | "unknown-choice" | "out-of-range"
 * @source Markowitz (1952), Portfolio Selection, Journal of Finance 7(1), 77-91 (from memory)
 * @cost O(T n); on a block seen a moment ago, one comparison of its cells
 * @example worksheetFunctions.VOLATILITY([[.5], [.5]], [[.04, 0], [0, .01]]) // 0.1118
 */
export function volatility(
  weights: unknown[][],
  risk: unknown[][],
  periods_per_year?: unknown,
  estimator?: unknown,
): number {
  return finite(bookOf(weights, risk, periods_per_year, estimator).decomposition.volatility)
}

/**
 * Stand-alone risk of each position: absolute weight times its own volatility.
 *
 * @customfunction STANDALONE
 * @helpurl https://localhost:3000/help.html#standalone
 * @param weights Weights as fractions: one row or one column
 * @param risk Returns (one row a period, newest last, one column a weight) or a covariance matrix
 * @param periods_per_year Periods in a year to scale to, such as 252 or 52; 1 where left out
 * @param estimator "sample" (the default), "exponential 0.97", "shrink correlation", "shrink identity", "shrink oas" or "lagged 2"
 * @returns n volatilities as fractions
 * @formula |w_i| sqrt(C_{ii})
 * @throws Fault as VOLATILITY
 * @source Tasche (2008), Capital Allocation to Business Units and Sub-Portfolios: the Euler Principle, arXiv:0708.2542
 * @cost as VOLATILITY
 * @example worksheetFunctions.STANDALONE([[.5], [-.5]], [[.04, 0], [0, .01]]) // [[0.1], [0.05]]
 */
export function standalone(
  weights: unknown[][],
  risk: unknown[][],
  periods_per_year?: unknown,
  estimator?: unknown,
): number[][] {
  const book = bookOf(weights, risk, periods_per_year, estimator)
  return spilled(book.decomposition.standAlone, book)
}

/**
 * Marginal contribution to risk of each position: how fast volatility rises with its weight.
 *
 * @customfunction MARGINAL
 * @helpurl https://localhost:3000/help.html#marginal
 * @param weights Weights as fractions: one row or one column
 * @param risk Returns (one row a period, newest last, one column a weight) or a covariance matrix
 * @param periods_per_year Periods in a year to scale to, such as 252 or 52; 1 where left out
 * @param estimator "sample" (the default), "exponential 0.97", "shrink correlation", "shrink identity", "shrink oas" or "lagged 2"
 * @returns n fractions of volatility per unit of weight
 * @formula (C w)_i / s
 * @throws Fault as VOLATILITY | "zero-risk"
 * @source Maillard, Roncalli & Teiletche (2010), The Properties of Equally Weighted Risk Contribution Portfolios, JPM 36(4)
 * @cost as VOLATILITY
 * @example worksheetFunctions.MARGINAL([[.5], [.5]], [[.04, 0], [0, .01]]) // [[0.17889], [0.04472]]
 */
export function marginal(
  weights: unknown[][],
  risk: unknown[][],
  periods_per_year?: unknown,
  estimator?: unknown,
): number[][] {
  const book = bookOf(weights, risk, periods_per_year, estimator)
  return spilled(defined(book.decomposition.marginal), book)
}

/**
 * Contribution to risk of each position; the contributions sum to the volatility.
 *
 * @customfunction CONTRIBUTION
 * @helpurl https://localhost:3000/help.html#contribution
 * @param weights Weights as fractions: one row or one column
 * @param risk Returns (one row a period, newest last, one column a weight) or a covariance matrix
 * @param periods_per_year Periods in a year to scale to, such as 252 or 52; 1 where left out
 * @param estimator "sample" (the default), "exponential 0.97", "shrink correlation", "shrink identity", "shrink oas" or "lagged 2"
 * @returns n fractions; 0 throughout where the portfolio has no risk
 * @formula c_i = w_i (C w)_i / s
 * @throws Fault as VOLATILITY
 * @source Tasche (2008), Capital Allocation to Business Units and Sub-Portfolios: the Euler Principle, arXiv:0708.2542
 * @cost as VOLATILITY
 * @example worksheetFunctions.CONTRIBUTION([[.5], [.5]], [[.04, 0], [0, .01]]) // [[0.08944], [0.02236]]
 */
export function contribution(
  weights: unknown[][],
  risk: unknown[][],
  periods_per_year?: unknown,
  estimator?: unknown,
): number[][] {
  const book = bookOf(weights, risk, periods_per_year, estimator)
  return spilled(book.decomposition.contribution, book)
}

/**
 * Share of risk of each position; the shares sum to 1. A position 1% larger changes volatility by its share in percent.
 *
 * @customfunction RISKSHARE
 * @helpurl https://localhost:3000/help.html#riskshare
 * @param weights Weights as fractions: one row or one column
 * @param risk Returns (one row a period, newest last, one column a weight) or a covariance matrix
 * @param estimator "sample" (the default), "exponential 0.97", "shrink correlation", "shrink identity", "shrink oas" or "lagged 2"
 * @returns n fractions; negative for a position that reduces risk
 * @formula p_i = w_i (C w)_i / s^2
 * @throws Fault as VOLATILITY | "zero-risk"
 * @source Qian (2006), On the Financial Interpretation of Risk Contribution, Journal of Investment Management 4(4) (from memory)
 * @cost as VOLATILITY
 * @example worksheetFunctions.RISKSHARE([[.5, .5]], [[.04, 0], [0, .01]]) // [[0.8, 0.2]]
 */
export function riskshare(weights: unknown[][], risk: unknown[][], estimator?: unknown): number[][] {
  const book = bookOf(weights, risk, null, estimator)
  return spilled(defined(book.decomposition.share), book)
}

/**
 * Standard error of each share of risk: a share and 1.96 of its errors either way make a band of 95%.
 *
 * @customfunction RISKSHAREERROR
 * @helpurl https://localhost:3000/help.html#riskshareerror
 * @param weights Weights as fractions: one row or one column
 * @param returns Returns as fractions: one row a period, newest last, one column a weight; names and dates may come along
 * @param estimator "sample" (the default), "exponential 0.97", "shrink correlation", "shrink identity", "shrink oas" or "lagged 2"
 * @returns n fractions; 0 for the share of an only position
 * @formula sqrt(sum_t omega_t^2 u_t^2), where u_t = (w_i z_{ti} y_t - p_i y_t^2) / v
 * @remarks u is how far a date moves the share; y is the return of the portfolio less its mean, v the mean of its square. No normal distribution
 * is assumed. Dates count as independent; "lagged" takes neighbouring dates together. With shrinkage it is the error of the shares before
 * shrinkage. An estimate that runs small where dates are few.
 * @throws Fault as VOLATILITY | "zero-risk" | "shape" (a covariance matrix)
 * @source White (1980), A Heteroskedasticity-Consistent Covariance Matrix Estimator, Econometrica 48(4), 817-838; "lagged": Newey & West (1987),
 *         Econometrica 55(3), 703-708 (both from memory)
 * @cost O(T n), a few times that of VOLATILITY; O(T n L) for L lags
 * @example worksheetFunctions.RISKSHAREERROR([[.5], [.5]], [[.01, 0], [-.02, .01], [.01, -.01]]) // [[0.35355], [0.35355]]
 */
export function riskshareerror(weights: unknown[][], returns: unknown[][], estimator?: unknown): number[][] {
  const book = bookOf(weights, returns, null, estimator, undefined, true)
  // a covariance matrix, which has none, was refused
  const { returns: history, estimator: how } = book.estimated!
  const { share } = standardErrors(history, book.weights, how.kind === 'lagged' ? how.lags : 0)
  return spilled(defined(share, 'returns'), book)
}

/**
 * Beta of each position to the portfolio; betas times weights sum to 1.
 *
 * @customfunction BETA
 * @helpurl https://localhost:3000/help.html#beta
 * @param weights Weights as fractions: one row or one column
 * @param risk Returns (one row a period, newest last, one column a weight) or a covariance matrix
 * @param estimator "sample" (the default), "exponential 0.97", "shrink correlation", "shrink identity", "shrink oas" or "lagged 2"
 * @returns n betas
 * @formula beta_i = (C w)_i / s^2
 * @throws Fault as VOLATILITY | "zero-risk"
 * @source Maillard, Roncalli & Teiletche (2010), The Properties of Equally Weighted Risk Contribution Portfolios, JPM 36(4)
 * @cost as VOLATILITY
 * @example worksheetFunctions.BETA([[.5], [.5]], [[.04, 0], [0, .01]]) // [[1.6], [0.4]]
 */
export function beta(weights: unknown[][], risk: unknown[][], estimator?: unknown): number[][] {
  const book = bookOf(weights, risk, null, estimator)
  return spilled(defined(book.decomposition.beta), book)
}

/**
 * Diversification ratio: sum of the stand-alone risks over the volatility of the portfolio.
 *
 * @customfunction DIVERSIFICATION
 * @helpurl https://localhost:3000/help.html#diversification
 * @param weights Weights as fractions: one row or one column
 * @param risk Returns (one row a period, newest last, one column a weight) or a covariance matrix
 * @param estimator "sample" (the default), "exponential 0.97", "shrink correlation", "shrink identity", "shrink oas" or "lagged 2"
 * @returns One number, at least 1
 * @formula sum_i |w_i| sqrt(C_{ii}) / s
 * @throws Fault as VOLATILITY | "zero-risk"
 * @source Choueifaty & Coignard (2008), Toward Maximum Diversification, JPM 35(1) (from memory); here with absolute weights
 * @cost as VOLATILITY
 * @example worksheetFunctions.DIVERSIFICATION([[.5], [.5]], [[.04, 0], [0, .01]]) // 1.34164
 */
export function diversification(weights: unknown[][], risk: unknown[][], estimator?: unknown): number {
  return finite(defined(bookOf(weights, risk, null, estimator).decomposition.diversificationRatio))
}

/**
 * Effective number of positions by risk: how many positions of equal share of risk would be as concentrated.
 *
 * @customfunction EFFECTIVE
 * @helpurl https://localhost:3000/help.html#effective
 * @param weights Weights as fractions: one row or one column
 * @param risk Returns (one row a period, newest last, one column a weight) or a covariance matrix
 * @param estimator "sample" (the default), "exponential 0.97", "shrink correlation", "shrink identity", "shrink oas" or "lagged 2"
 * @returns One number; below 1 where large shares of risk offset each other
 * @formula 1 / sum_i p_i^2
 * @throws Fault as VOLATILITY | "zero-risk"
 * @source Herfindahl index of the shares, after Meucci (2009), Managing Diversification, Risk 22(5), 74-79 (from memory)
 * @cost as VOLATILITY
 * @example worksheetFunctions.EFFECTIVE([[.5], [.5]], [[.04, 0], [0, .01]]) // 1.47059
 */
export function effective(weights: unknown[][], risk: unknown[][], estimator?: unknown): number {
  return finite(defined(bookOf(weights, risk, null, estimator).decomposition.effectiveNumber))
}

/**
 * Least-risk weight of each position: the weight at which its marginal contribution to risk is zero, all others held.
 *
 * @customfunction LEASTRISKWEIGHT
 * @helpurl https://localhost:3000/help.html#leastriskweight
 * @param weights Weights as fractions: one row or one column
 * @param risk Returns (one row a period, newest last, one column a weight) or a covariance matrix
 * @param estimator "sample" (the default), "exponential 0.97", "shrink correlation", "shrink identity", "shrink oas" or "lagged 2"
 * @returns n weights as fractions; negative where a short position would give the least risk; blank for a position that never moves
 * @formula w_i - (C w)_i / C_{ii}
 * @remarks Each on its own, with cash taking up the difference. An estimate from the numbers given, and no advice: moved all at once, positions
 * end elsewhere.
 * @throws Fault as VOLATILITY | "zero-risk" (none of the positions moves)
 * @source Litterman (1996), Hot Spots and Hedges, JPM special issue, 52-75 (from memory)
 * @cost as VOLATILITY
 * @example worksheetFunctions.LEASTRISKWEIGHT([[.5], [.5]], [[.04, .01], [.01, .09]]) // [[-0.125], [-0.05556]]
 */
export function leastriskweight(weights: unknown[][], risk: unknown[][], estimator?: unknown): unknown[][] {
  const { model, weights: placed, columnOf, across } = bookOf(weights, risk, null, estimator)
  const least = leastRiskWeights(model, placed)
  if (least.every(Number.isNaN)) {
    throw new Fault('zero-risk', 'found no position that moves', 'a volatility above 0 is needed', {
      argument: 'risk',
    })
  }
  const picked = Array.from(columnOf, (column) => orBlank(least[column]!))
  return across ? [picked] : picked.map((value) => [value])
}

/**
 * Long-only weights, adding up to 1, whose shares of risk equal given budgets; equal risk contribution where none are given.
 *
 * @customfunction BUDGETWEIGHTS
 * @helpurl https://localhost:3000/help.html#budgetweights
 * @param risk Returns (one row a period, newest last, one column a position) or a covariance matrix
 * @param budgets Shares of risk as fractions that add up to 1: one row or one column; equal ones where left out
 * @param estimator "sample" (the default), "exponential 0.97", "shrink correlation", "shrink identity", "shrink oas" or "lagged 2"
 * @returns n weights as fractions, lying as budgets do, else one column
 * @formula w_i (C w)_i / s^2 = b_i, with w_i >= 0 and sum_i w_i = 1
 * @remarks Budgets b are met to 1e-10; a budget of 0 gives a weight of 0. #N/A where no weights are found, as when some long-only mix has no
 * risk at all. An estimate from the numbers given, and no advice.
 * @throws Fault "blank" | "text" | "not-a-number" | "shape" | "twice" | "too-few" | "missing-data" | "not-symmetric" | "correlation-matrix" |
 *         "negative-variance" | "unknown-choice" | "out-of-range" (budgets) | "zero-risk" (a position that never moves; none found)
 * @source Maillard, Roncalli & Teiletche (2010), JPM 36(4); Bruder & Roncalli (2012), Managing Risk Exposures Using the Risk Budgeting Approach;
 *         method: Spinu (2013), SSRN 2297383 (the latter two from memory)
 * @cost some hundred times that of VOLATILITY; on a block and budgets seen a moment ago, one comparison
 * @example worksheetFunctions.BUDGETWEIGHTS([[.04, -.018], [-.018, .09]]) // [[0.6], [0.4]]
 * @example worksheetFunctions.BUDGETWEIGHTS([[.04, 0], [0, .01]], [[.8, .2]]) // [[0.5, 0.5]]
 */
export function budgetweights(risk: unknown[][], budgets?: unknown[][], estimator?: unknown): number[][] {
  const given = budgets === undefined || budgets === null ? null : vectorOf('budgets', budgets)
  const { kept, how } = modelOf('risk', risk, estimator)
  const { panel } = kept
  const { columns } = panel
  if (given && given.values.length !== columns) {
    throw new Fault(
      'shape',
      `found ${countOf(given.values.length, 'budget')} for ${countOf(columns, 'column')} of risk`,
      'one budget for each column is needed',
      { argument: 'budgets' },
    )
  }
  refuseHiddenBlanks('risk', panel)
  const { value: found, fault } = attempt(() =>
    kept.budgetWeights(how, given?.values ?? new Float64Array(columns).fill(1 / columns)),
  )
  if (fault) throw inCells(fault, panel, given?.across ?? false)
  if (!found.converged) {
    throw new Fault(
      'zero-risk',
      found.stopped === 'riskless-mix'
        ? 'found a long-only mix with hardly any risk, beside which no shares of risk can be held to a budget'
        : `found no weights that meet the budgets: the nearest miss one by ${found.residual.toPrecision(2)}`,
      'positions that do not offset each other so closely are needed',
      { argument: 'risk' },
    )
  }
  const weights = Array.from(found.weights, finite)
  return given?.across ? [weights] : weights.map((weight) => [weight])
}

/** The same fault with its place as the cells lie: core counts the columns of numbers, and budgets down. */
function inCells(fault: Fault, panel: Panel, across: boolean): Fault {
  const { argument, row, column } = fault.where
  const place =
    argument === 'risk' && column !== undefined
      ? panel.placeOf(panel.kind === 'covariance' ? column : 0, column)
      : argument === 'budgets' && row !== undefined
        ? { row: across ? 0 : row, column: across ? row : 0 }
        : {}
  return new Fault(fault.code, fault.found, fault.needed, { ...fault.where, ...place })
}

/** Where the portfolio has no risk, whatever would divide by it. */
const UNDEFINED = 'not defined'

/**
 * Table of risk by position, with headings and a total.
 *
 * @customfunction BREAKDOWN
 * @helpurl https://localhost:3000/help.html#breakdown
 * @param names Names of the positions: one row or one column
 * @param weights Weights as fractions: one row or one column
 * @param risk Returns (one row a period, newest last) or a covariance matrix; columns go by name where it has a first row of names, else by place
 * @param periods_per_year Periods in a year to scale to, such as 252 or 52; 1 where left out
 * @param estimator "sample" (the default), "exponential 0.97", "shrink correlation", "shrink identity", "shrink oas" or "lagged 2"
 * @returns (n+2) x 8: headings, one row a position, total
 * @formula stand-alone risk: |w_i| sqrt(C_{ii})
 * @formula marginal contribution: (C w)_i / s
 * @formula contribution: c_i = w_i (C w)_i / s
 * @formula share of risk: p_i = c_i / s
 * @formula beta: (C w)_i / s^2
 * @formula correlation: (C w)_i / (s sqrt(C_{ii}))
 * @remarks Names find their columns by the first row of risk where it has one (case and spacing do not count; columns that are not held may be
 * there), else by place. The total of the stand-alone column is the sum before diversification, that of the contributions the
 * volatility of the portfolio. A correlation with a position that never moves is blank.
 * @throws Fault as VOLATILITY | "unmatched"
 * @source Tasche (2008), arXiv:0708.2542; Maillard, Roncalli & Teiletche (2010), JPM 36(4)
 * @cost as VOLATILITY
 * @example worksheetFunctions.BREAKDOWN([['A'], ['B']], [[.5], [.5]], [[.04, 0], [0, .01]])[1] // ["A", 0.5, 0.1, 0.17889, 0.08944, 0.8, 1.6, 0.89443]
 */
export function breakdown(
  names: unknown[][],
  weights: unknown[][],
  risk: unknown[][],
  periods_per_year?: unknown,
  estimator?: unknown,
): unknown[][] {
  const { decomposition: d, columnOf } = bookOf(weights, risk, periods_per_year, estimator, names ?? null)
  const { labels } = labelsOf('names', names)
  const rows = Array.from(columnOf, (column, k) => [
    labels[k],
    d.weights[column]!,
    finite(d.standAlone[column]!),
    d.marginal ? finite(d.marginal[column]!) : UNDEFINED,
    finite(d.contribution[column]!),
    d.share ? finite(d.share[column]!) : UNDEFINED,
    d.beta ? finite(d.beta[column]!) : UNDEFINED,
    d.correlation ? orBlank(d.correlation[column]!) : UNDEFINED,
  ])
  return [
    ['Holding', ...POSITION_HEADS],
    ...rows,
    [
      'Total',
      sum(d.weights),
      sum(d.standAlone),
      '',
      finite(d.volatility),
      d.share ? sum(d.share) : UNDEFINED,
      '',
      '',
    ],
  ]
}

/**
 * Table of risk by group, with headings and a total.
 *
 * @customfunction GROUPED
 * @helpurl https://localhost:3000/help.html#grouped
 * @param groups Group of each position: one row or one column
 * @param weights Weights as fractions: one row or one column
 * @param risk Returns (one row a period, newest last, one column a weight) or a covariance matrix
 * @param periods_per_year Periods in a year to scale to, such as 252 or 52; 1 where left out
 * @param estimator "sample" (the default), "exponential 0.97", "shrink correlation", "shrink identity", "shrink oas" or "lagged 2"
 * @returns (g+2) x 5: headings, one row a group, total
 * @formula weight: w_g = sum_{i in g} w_i
 * @formula stand-alone risk: sqrt(x' C x), where x_i = w_i within the group and 0 elsewhere
 * @formula contribution: c_g = sum_{i in g} c_i
 * @formula share of risk: c_g / s
 * @remarks Groups stand in the order of their first position; case and spacing do not tell groups apart; positions without a group stand
 * together as "Unassigned". A group's stand-alone risk is the volatility of its positions held alone; the total of that column is the
 * sum before diversification between groups, that of the contributions the volatility of the portfolio.
 * @throws Fault as VOLATILITY
 * @source Coleman & Litterman (2012), Quantitative Risk Management, appendix 10.1 (from memory)
 * @cost as VOLATILITY, and one pass of the returns for each group
 * @example worksheetFunctions.GROUPED([['X'], ['X']], [[.5], [.5]], [[.04, 0], [0, .01]])[1] // ["X", 1, 0.1118, 0.1118, 1]
 */
export function grouped(
  groups: unknown[][],
  weights: unknown[][],
  risk: unknown[][],
  periods_per_year?: unknown,
  estimator?: unknown,
): unknown[][] {
  const { labels } = labelsOf('groups', groups)
  const { decomposition: d, model } = bookOf(weights, risk, periods_per_year, estimator)
  if (labels.length !== d.weights.length) throw uneven('groups', 'group', labels.length, d.weights.length)
  const { groupOf, labels: shown } = groupsOf(labels)
  const g = groupDecomposition(model, d, groupOf, shown.length)
  return [
    ['Group', 'Weight', 'Stand-alone risk', 'Contribution to risk', 'Share of risk'],
    ...shown.map((label, k) => [
      label,
      g.weight[k]!,
      finite(g.standAlone[k]!),
      finite(g.contribution[k]!),
      g.share ? finite(g.share[k]!) : UNDEFINED,
    ]),
    ['Total', sum(g.weight), sum(g.standAlone), finite(d.volatility), g.share ? sum(g.share) : UNDEFINED],
  ]
}

interface Tail {
  readonly book: Book
  readonly risk: TailRisk
}

function tailOf(
  weights: unknown,
  risk: unknown,
  confidence: unknown,
  periods: unknown,
  method: unknown,
  estimator: unknown,
): Tail {
  const choice = {
    confidence: confidenceOf(confidence),
    periods: periodsAheadOf(periods),
    method: tailMethodOf(method),
  }
  const book = bookOf(weights, risk, null, estimator)
  return { book, risk: tailRisk(book.model, book.weights, choice, book.estimated?.returns ?? null) }
}

/** What only a method with an expected shortfall has. */
function ofShortfall<T>(figure: T | null): T {
  if (figure !== null) return figure
  throw new Fault(
    'unknown-choice',
    'found “cornish-fisher”, which corrects a quantile and gives no mean beyond it',
    '“normal”, “student”, “student 5” or “historical” is needed',
    { argument: 'method' },
  )
}

/**
 * Value at risk of the portfolio: the loss that is exceeded with probability 1 - confidence only.
 *
 * @customfunction VALUEATRISK
 * @helpurl https://localhost:3000/help.html#valueatrisk
 * @param weights Weights as fractions: one row or one column
 * @param risk Returns (one row a period, newest last, one column a weight), or a covariance matrix for "normal" and "student 5"
 * @param confidence Level of confidence above 50% and below 100%, such as 99%
 * @param periods Periods ahead, such as 10 (square root of time); 1 where left out and with "historical" and "cornish-fisher"
 * @param method "normal" (the default), "student" (degrees of freedom fitted), "student 5", "historical" or "cornish-fisher"
 * @param estimator "sample" (the default), "exponential 0.97", "shrink correlation", "shrink identity", "shrink oas" or "lagged 2"
 * @returns A loss as a fraction, positive
 * @formula normal: z s sqrt(h), z the normal quantile of the confidence, h the periods
 * @formula student: t_v s sqrt(h (v - 2) / v), v the degrees of freedom
 * @formula historical: the k-th largest loss, k = T (1 - confidence) rounded up
 * @formula cornish-fisher: s (z - (z^2 - 1) S / 6 + (z^3 - 3 z) K / 24 - (2 z^3 - 5 z) S^2 / 36)
 * @remarks S and K are the skewness and the excess kurtosis of the portfolio's returns. "normal", "student" and "cornish-fisher" take the mean as zero and
 * the volatility of the estimator; "historical" applies today's
 * weights to the returns as they were and takes the loss number T (1 - confidence), rounded up, of the T dates: under ten such dates it
 * is a rough figure. "cornish-fisher" is refused where skewness and excess kurtosis lie outside its domain. An estimate from the
 * numbers given, not the largest loss there can be.
 * @throws Fault as VOLATILITY | "out-of-range" (confidence, periods, degrees of freedom, the domain of "cornish-fisher") | "zero-risk"
 * @source Jorion (2007), Value at Risk, 3rd ed., chapter 5 (from memory); Cornish & Fisher (1937) and Maillard (2012), SSRN 1997178 (from
 *         memory)
 * @cost as VOLATILITY; "historical" sorts T numbers, "student" fits in some hundred passes over T numbers
 * @example worksheetFunctions.VALUEATRISK([[.5], [.5]], [[.04, 0], [0, .01]], .99) // 0.26009
 * @example worksheetFunctions.VALUEATRISK(1, [[-.04], [-.01], [.02], [.03], [.01]], .8, 1, 'historical') // 0.04
 */
export function valueatrisk(
  weights: unknown[][],
  risk: unknown[][],
  confidence: unknown,
  periods?: unknown,
  method?: unknown,
  estimator?: unknown,
): number {
  return finite(tailOf(weights, risk, confidence, periods, method, estimator).risk.valueAtRisk)
}

/**
 * Expected shortfall of the portfolio: the mean of the losses from value at risk on.
 *
 * @customfunction SHORTFALL
 * @helpurl https://localhost:3000/help.html#shortfall
 * @param weights Weights as fractions: one row or one column
 * @param risk Returns (one row a period, newest last, one column a weight), or a covariance matrix for "normal" and "student 5"
 * @param confidence Level of confidence above 50% and below 100%, such as 97.5%
 * @param periods Periods ahead, such as 10 (square root of time); 1 where left out and with "historical"
 * @param method "normal" (the default), "student" (degrees of freedom fitted), "student 5" or "historical"
 * @param estimator "sample" (the default), "exponential 0.97", "shrink correlation", "shrink identity", "shrink oas" or "lagged 2"
 * @returns A loss as a fraction, positive
 * @formula normal: s sqrt(h) phi(z) / (1 - confidence), phi the normal density
 * @formula student: s sqrt(h (v - 2) / v) f_v(t_v) (v + t_v^2) / ((v - 1) (1 - confidence)), f_v the density
 * @formula historical: the mean of the T (1 - confidence) largest losses
 * @remarks Means and volatility as VALUEATRISK. "historical" is the mean of the worst T (1 - confidence) of T dates, the last of them by the
 * fraction that is left: under ten such dates it is a rough figure.
 * @throws Fault as VALUEATRISK | "unknown-choice" ("cornish-fisher", which gives value at risk alone)
 * @source Acerbi & Tasche (2002), On the Coherence of Expected Shortfall, JBF 26(7), 1487-1503 (from memory)
 * @cost as VALUEATRISK
 * @example worksheetFunctions.SHORTFALL([[.5], [.5]], [[.04, 0], [0, .01]], .99) // 0.29798
 */
export function shortfall(
  weights: unknown[][],
  risk: unknown[][],
  confidence: unknown,
  periods?: unknown,
  method?: unknown,
  estimator?: unknown,
): number {
  return finite(ofShortfall(tailOf(weights, risk, confidence, periods, method, estimator).risk.shortfall))
}

/**
 * Contribution of each position to expected shortfall; the contributions sum to SHORTFALL.
 *
 * @customfunction SHORTFALLPARTS
 * @helpurl https://localhost:3000/help.html#shortfallparts
 * @param weights Weights as fractions: one row or one column
 * @param risk Returns (one row a period, newest last, one column a weight), or a covariance matrix for "normal" and "student 5"
 * @param confidence Level of confidence above 50% and below 100%, such as 97.5%
 * @param periods Periods ahead, such as 10 (square root of time); 1 where left out and with "historical"
 * @param method "normal" (the default), "student" (degrees of freedom fitted), "student 5" or "historical"
 * @param estimator "sample" (the default), "exponential 0.97", "shrink correlation", "shrink identity", "shrink oas" or "lagged 2"
 * @returns n losses as fractions; negative for a position that gains when the portfolio loses most
 * @formula normal, student: SHORTFALL c_i / s
 * @formula historical: -w_i times the mean of r_{ti} over the dates that SHORTFALL is the mean of
 * @remarks "historical": the position's own mean loss on the dates that SHORTFALL is the
 * mean of; dates that tie for the last place share it; under ten such dates the parts are the accident of a few of them.
 * @throws Fault as SHORTFALL
 * @source Tasche (2008), Capital Allocation to Business Units and Sub-Portfolios: the Euler Principle, arXiv:0708.2542
 * @cost as VALUEATRISK
 * @example worksheetFunctions.SHORTFALLPARTS([[.5], [.5]], [[.04, 0], [0, .01]], .99) // [[0.23838], [0.0596]]
 */
export function shortfallparts(
  weights: unknown[][],
  risk: unknown[][],
  confidence: unknown,
  periods?: unknown,
  method?: unknown,
  estimator?: unknown,
): number[][] {
  const tail = tailOf(weights, risk, confidence, periods, method, estimator)
  return spilled(ofShortfall(tail.risk.parts), tail.book)
}

const sum = (values: Float64Array): number => finite(values.reduce((total, value) => total + value, 0))

/** Every worksheet function by its id. */
export const worksheetFunctions: Readonly<Record<string, (...args: never[]) => unknown>> = {
  RETURNS: returns,
  COVARIANCE: covarianceMatrix,
  CORRELATION: correlationMatrix,
  VOLATILITY: volatility,
  STANDALONE: standalone,
  MARGINAL: marginal,
  CONTRIBUTION: contribution,
  RISKSHARE: riskshare,
  RISKSHAREERROR: riskshareerror,
  BETA: beta,
  DIVERSIFICATION: diversification,
  EFFECTIVE: effective,
  LEASTRISKWEIGHT: leastriskweight,
  BUDGETWEIGHTS: budgetweights,
  BREAKDOWN: breakdown,
  GROUPED: grouped,
  VALUEATRISK: valueatrisk,
  SHORTFALL: shortfall,
  SHORTFALLPARTS: shortfallparts,
}
