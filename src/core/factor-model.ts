import { Matrix, QrDecomposition } from 'ml-matrix'
import { decompose } from './decomposition'
import { checkBlock, Fault } from './fault'
import { returnsModel, type ReturnsModel, type RiskModel } from './risk-model'

/**
 * A risk model that explains returns by factors: C = B F B' + diag(specific variances). Blocks are row-major; B is n x k.
 */
export interface FactorModel extends RiskModel {
  /** k */
  readonly factorCount: number
  /** The returns themselves, divisor T-1: what histories come from. */
  readonly returns: ReturnsModel
  /** Return of each position where all factors return 0; n. */
  readonly intercepts: Float64Array
  readonly interceptErrors: Float64Array
  /** B, the least-squares slopes; n x k. */
  readonly exposures: Float64Array
  /** Their standard errors, taking residuals as independent with one variance a position; n x k. */
  readonly exposureErrors: Float64Array
  /** Share of each position's variance that the factors explain; n; NaN for a riskless position, which has none. */
  readonly rSquared: Float64Array
  /** The same with variances by their degrees of freedom; n; NaN likewise. */
  readonly adjustedRSquared: Float64Array
  /** F, divisor T-1; k x k. */
  readonly factorCovariance: Float64Array
  /** Residual variances, divisor T-k-1; n. */
  readonly specificVariances: Float64Array
  /**
   * Splits the volatility s of a portfolio among factors and what is specific to each position.
   *
   *   x = B'w,   systematic_j = x_j (F x)_j / s,   specific_i = w_i^2 d_i / s,   all adding up to s
   *
   * Where the portfolio has no risk all parts are 0.
   *
   * @param weights  n
   * @throws Fault   "shape" | "not-a-number"
   */
  split(weights: Float64Array): FactorSplit
}

export interface FactorSplit {
  readonly volatility: number
  /** x = B'w, what the portfolio returns for 1 of each factor; k. */
  readonly exposures: Float64Array
  /** k */
  readonly systematic: Float64Array
  /** n */
  readonly specific: Float64Array
}

/**
 * Explains returns by factor returns of the same dates: least squares with an intercept, one regression a position, all by
 * one orthogonal decomposition of the centred factors, scaled to length 1.
 *
 * C is not the sample covariance: residuals of different positions count as uncorrelated, and their variances are divided by
 * T-k-1, so that a stand-alone volatility may lie a little above that of the sample.
 *
 * @param returns      T x n row-major, decimals per period; not kept, not changed
 * @param dates        T, above k+1
 * @param size         n
 * @param factors      T x k row-major
 * @param factorCount  k
 * @throws Fault       "shape" | "not-a-number" | "too-few" (dates) | "collinear" (a factor that never changes, or that those
 *                     before it make up, with its column)
 * @source             least squares by Householder's decomposition: Golub & Van Loan (2013), Matrix Computations, 4th ed.,
 *                     section 5.3; risk split: Euler allocation, Tasche (2008), arXiv:0708.2542; divisors: textbooks on
 *                     regression (from memory)
 * @cost               O(T (n k + k^2)) once, O(n k) a question
 * @example            factorModel(Float64Array.of(1, 3, 5, 8), 4, 1, Float64Array.of(0, 1, 2, 3), 1).exposures // [2.3]
 * @example            factorModel(Float64Array.of(1, 3, 5, 8), 4, 1, Float64Array.of(0, 1, 2, 3), 1).intercepts // [0.8]
 * @example            factorModel(Float64Array.of(1, 3, 5, 8), 4, 1, Float64Array.of(2, 2, 2, 2), 1) // Fault "collinear"
 */
export function factorModel(
  returns: Float64Array,
  dates: number,
  size: number,
  factors: Float64Array,
  factorCount: number,
): FactorModel {
  checkBlock(returns, dates, size, 'returns')
  checkBlock(factors, dates, factorCount, 'factors')
  const freedom = dates - factorCount - 1
  if (freedom < 1) {
    throw new Fault(
      'too-few',
      `returns: ${dates} dates for ${factorCount} ${factorCount === 1 ? 'factor' : 'factors'}`,
      `at least ${factorCount + 2} dates are needed`,
      { argument: 'factors' },
    )
  }
  const model = returnsModel(returns, dates, size)
  const factorReturns = returnsModel(factors, dates, factorCount)
  const basis = basisOf(factorReturns)
  const { exposures, residualSquares } = regressions(model, factorReturns, basis)
  const specificVariances = residualSquares.map((squares) => squares / freedom)
  const totalVariances = model.variances()
  const rSquared = totalVariances.map((variance, i) =>
    variance === 0 ? NaN : 1 - residualSquares[i]! / (variance * (dates - 1)),
  )

  // sqrt of the diagonal of (X'X)^-1, X with a first column of ones: what residual deviations are multiplied by
  const spread = new Float64Array(factorCount)
  for (let j = 0; j < factorCount; j++) {
    spread[j] = Math.hypot(...basis.inverse.subarray(j * factorCount, (j + 1) * factorCount))
  }
  const atMeans = multiply(factorReturns.means, basis.inverse, factorCount)
  const interceptSpread = Math.hypot(1 / Math.sqrt(dates), ...atMeans)
  const deviations = specificVariances.map(Math.sqrt)
  const root = basis.root.map((r) => r / Math.sqrt(dates - 1))
  return {
    ...factorOperator(exposures, root, specificVariances),
    factorCount,
    returns: model,
    intercepts: model.means.map((mean, i) => {
      let intercept = mean
      for (let j = 0; j < factorCount; j++) {
        intercept -= exposures[i * factorCount + j]! * factorReturns.means[j]!
      }
      return intercept
    }),
    interceptErrors: deviations.map((deviation) => deviation * interceptSpread),
    exposures,
    exposureErrors: exposures.map(
      (_, at) => deviations[Math.floor(at / factorCount)]! * spread[at % factorCount]!,
    ),
    rSquared,
    adjustedRSquared: rSquared.map((r) => 1 - ((1 - r) * (dates - 1)) / freedom),
    factorCovariance: crossProduct(root, factorCount),
    specificVariances,
  }
}

/** The centred factors as Q R; `root` = R in the factors' own units, upper triangular, and its inverse. */
interface Basis {
  /** Orthonormal columns; T x k. */
  readonly orthogonal: Float64Array
  readonly root: Float64Array
  readonly inverse: Float64Array
}

function basisOf(factors: ReturnsModel): Basis {
  const { dates, size: k } = factors
  const rows = Array.from({ length: dates }, (_, t) => factors.centredRow(t))
  const lengths = factors.variances().map((variance) => Math.sqrt(variance * (dates - 1)))
  const fixed = lengths.indexOf(0)
  if (fixed >= 0) {
    throw new Fault(
      'collinear',
      `factors: column ${fixed + 1} never changes`,
      'a factor whose returns move is needed',
      {
        argument: 'factors',
        column: fixed,
      },
    )
  }
  const decomposition = new QrDecomposition(new Matrix(rows.map((row) => row.map((f, j) => f / lengths[j]!))))
  const upper = decomposition.upperTriangularMatrix
  for (let j = 0; j < k; j++) {
    // columns have length 1: the diagonal is what is left of it beside the columns before
    if (Math.abs(upper.get(j, j)) <= dates * Number.EPSILON) {
      throw new Fault(
        'collinear',
        `factors: column ${j + 1} is made up of the columns before it`,
        'factors are needed of which none follows from the others',
        { argument: 'factors', column: j },
      )
    }
  }
  const root = new Float64Array(k * k)
  const inverse = new Float64Array(k * k)
  for (let j = 0; j < k; j++) {
    for (let i = 0; i <= j; i++) root[i * k + j] = upper.get(i, j) * lengths[j]!
    inverse[j * k + j] = 1 / root[j * k + j]!
    for (let i = j - 1; i >= 0; i--) {
      let sum = 0
      for (let l = i + 1; l <= j; l++) sum += root[i * k + l]! * inverse[l * k + j]!
      inverse[i * k + j] = -sum / root[i * k + i]!
    }
  }
  return { orthogonal: Float64Array.from(decomposition.orthogonalMatrix.to1DArray()), root, inverse }
}

/** Slopes, n x k, and sums of squared residuals, n; residuals are taken one by one, not as a difference of squares. */
function regressions(model: ReturnsModel, factors: ReturnsModel, { orthogonal, inverse }: Basis) {
  const { dates, size } = model
  const k = factors.size
  const projections = Array.from({ length: k }, (_, j) =>
    model.weigh(Float64Array.from({ length: dates }, (_, t) => orthogonal[t * k + j]!)),
  )
  const exposures = new Float64Array(size * k)
  /** the same, one factor after the other */
  const slopes = Array.from({ length: k }, (_, j) =>
    model.means.map((_, i) => {
      let slope = 0
      for (let l = j; l < k; l++) slope += inverse[j * k + l]! * projections[l]![i]!
      return (exposures[i * k + j] = slope)
    }),
  )
  const residualSquares = new Float64Array(size)
  const residuals = new Float64Array(size)
  const f = new Float64Array(k)
  for (let t = 0; t < dates; t++) {
    model.centredRow(t, residuals)
    factors.centredRow(t, f)
    // position by position, each sum would wait for itself
    for (let j = 0; j < k; j++) subtract(residuals, f[j]!, slopes[j]!)
    for (let i = 0; i < size; i++) {
      residualSquares[i] = residualSquares[i]! + residuals[i]! * residuals[i]!
    }
  }
  return { exposures, residualSquares }
}

function subtract(from: Float64Array, times: number, values: Float64Array): void {
  for (let i = 0; i < from.length; i++) from[i] = from[i]! - times * values[i]!
}

/** x'A for A k x k. */
function multiply(x: Float64Array, matrix: Float64Array, k: number): Float64Array {
  const product = new Float64Array(k)
  for (let i = 0; i < k; i++) {
    for (let j = 0; j < k; j++) product[j] = product[j]! + x[i]! * matrix[i * k + j]!
  }
  return product
}

/** A'A for A k x k; symmetric to the bit. */
function crossProduct(matrix: Float64Array, k: number): Float64Array {
  const product = new Float64Array(k * k)
  for (let i = 0; i < k; i++) {
    for (let j = 0; j <= i; j++) {
      let sum = 0
      for (let l = 0; l < k; l++) sum += matrix[l * k + i]! * matrix[l * k + j]!
      product[i * k + j] = product[j * k + i] = sum
    }
  }
  return product
}

/** C = B root'root B' + diag(specific): every variance is a sum of squares. */
function factorOperator(exposures: Float64Array, root: Float64Array, specific: Float64Array) {
  const size = specific.length
  const k = exposures.length / size
  /** B root', n x k: the exposures to uncorrelated factors of variance 1 */
  const loadings = new Float64Array(size * k)
  for (let i = 0; i < size; i++) {
    for (let j = 0; j < k; j++) {
      let sum = 0
      for (let l = j; l < k; l++) sum += root[j * k + l]! * exposures[i * k + l]!
      loadings[i * k + j] = sum
    }
  }
  const covariance = (i: number, j: number) => {
    let sum = i === j ? specific[i]! : 0
    for (let l = 0; l < k; l++) sum += loadings[i * k + l]! * loadings[j * k + l]!
    return sum
  }
  const variances = specific.map((_, i) => covariance(i, i))
  /** sum over positions of w_i times their row of an n x k block */
  const total = (weights: Float64Array, block: Float64Array) => {
    const sums = new Float64Array(k)
    for (let i = 0; i < size; i++) {
      for (let j = 0; j < k; j++) sums[j] = sums[j]! + weights[i]! * block[i * k + j]!
    }
    return sums
  }

  const apply = (weights: Float64Array, into?: Float64Array) => {
    checkBlock(weights, size, 1, 'weights')
    const common = total(weights, loadings)
    const marginals = into ?? new Float64Array(size)
    let variance = 0
    for (let j = 0; j < k; j++) variance += common[j]! * common[j]!
    for (let i = 0; i < size; i++) {
      const own = specific[i]! * weights[i]!
      variance += own * weights[i]!
      let marginal = own
      for (let j = 0; j < k; j++) marginal += loadings[i * k + j]! * common[j]!
      marginals[i] = marginal
    }
    return { marginals, variance }
  }
  const model: RiskModel = {
    size,
    // a loading is no larger than the volatility of its position, and k of them are squared
    rounding: k * (size * Number.EPSILON) ** 2,
    apply,
    variances: () => variances.slice(),
    matrix() {
      const matrix = new Float64Array(size * size)
      for (let i = 0; i < size; i++) {
        for (let j = 0; j <= i; j++) matrix[i * size + j] = matrix[j * size + i] = covariance(i, j)
      }
      return matrix
    },
  }
  return {
    ...model,
    split(weights: Float64Array): FactorSplit {
      const { volatility } = decompose(model, weights)
      const held = total(weights, exposures)
      // F x = root'(root x)
      const covariances = multiply(total(weights, loadings), root, k)
      const part = (product: number) => (volatility === 0 ? 0 : product / volatility)
      return {
        volatility,
        exposures: held,
        systematic: held.map((x, j) => part(x * covariances[j]!)),
        specific: specific.map((variance, i) => part(variance * weights[i]! * weights[i]!)),
      }
    },
  }
}
