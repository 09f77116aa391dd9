import { checkBlock, Fault } from './fault'
import { kernelForm, openBlock, type KernelForm, type Sums } from './kernel/block'

/**
 * A covariance C of n positions as a linear operator: what it does to weights matters, not how it is stored.
 * All figures are per period, as the returns are.
 */
export interface RiskModel {
  /** n */
  readonly size: number
  /**
   * How much of (sum of stand-alone volatilities)^2 rounding alone can make of a variance that is truly zero.
   * A computed variance up to this is not told apart from zero.
   */
  readonly rounding: number
  /**
   * C w and w'C w.
   *
   * @param into   n; where C w goes, for whoever has room ready; left out: a new array
   * @throws Fault "shape" | "not-a-number" | "negative-variance"
   */
  apply(weights: Float64Array, into?: Float64Array): Applied
  /** The diagonal of C; n, a copy. */
  variances(): Float64Array
  /** C in full; n x n row-major, a copy. Formed only when asked for: O(T n^2) for a returns model. */
  matrix(): Float64Array
}

export interface Applied {
  /** C w; n */
  readonly marginals: Float64Array
  /** w'C w */
  readonly variance: number
}

/** The model a block of returns gives, with what error bands and tail figures need of the returns themselves. */
export interface ReturnsModel extends RiskModel {
  /** T */
  readonly dates: number
  readonly weighting: Weighting
  /** Which form of the kernel this block runs on. */
  readonly form: KernelForm
  /** (Weighted) mean return; n. */
  readonly means: Float64Array
  /** omega_t, the weight of each date; T, sum 1. */
  readonly rowWeights: Float64Array
  /** C = divisor sum_t omega_t z_t z_t': T/(T-1) for "sample", 1 for the others. */
  readonly correction: number
  /** z_t, the centred returns of one date; n, a copy. */
  centredRow(date: number, into?: Float64Array): Float64Array
  /**
   * y_t = z_t'w, the centred returns of the portfolio; T. Add w'means for the returns themselves.
   *
   * @param marginalsInto  n; where C w of the same pass goes, when it is wanted too
   */
  portfolioReturns(weights: Float64Array, marginalsInto?: Float64Array): Float64Array
  /**
   * sum over dates of a_t z_ti, one for each position: Z'a. With a_t = correction omega_t y_t it is C w.
   *
   * @param perDate  T; any finite numbers
   * @param into     n; where the sums go, for whoever has room ready; left out: a new array
   * @throws Fault   "shape" | "not-a-number"
   */
  weigh(perDate: Float64Array, into?: Float64Array): Float64Array
  /**
   * sum over dates of q_t z_ti^2 and of a_t z_ti, one of each for every position, in one pass.
   *
   * @param perDateOfSquares  q, T
   * @param perDate           a, T
   * @throws Fault            "shape" | "not-a-number"
   */
  squares(perDateOfSquares: Float64Array, perDate: Float64Array): Sums
}

/**
 * What rounding alone can make of the variance of these weights: a variance up to this is not told apart from zero.
 *
 * @throws Fault "out-of-range" where the sum of stand-alone volatilities is too large to be squared
 */
export function roundingOfVariance(model: RiskModel, weights: Float64Array): number {
  const variances = model.variances()
  let gross = 0
  for (let i = 0; i < variances.length; i++) gross += Math.abs(weights[i]!) * Math.sqrt(variances[i]!)
  if (Number.isFinite(gross * gross)) return model.rounding * gross * gross
  throw new Fault(
    'out-of-range',
    'the variance is too large to be a number',
    'smaller weights or returns are needed (decimals, such as 0.05 for 5%)',
  )
}

/**
 * How dates are weighted: all alike, with divisor T-1 ("sample") or T ("population", what shrinkage and lagged terms
 * start from), or decay^age (newest row last, weights scaled to sum 1).
 */
export type Weighting =
  | { readonly kind: 'sample' }
  | { readonly kind: 'population' }
  | { readonly kind: 'exponential'; readonly decay: number }

/**
 * The risk model of a block of returns. The covariance is never formed: the centred block is kept, and every
 * question about the portfolio is one streaming pass over it.
 *
 *   C = divisor sum_t omega_t (r_t - m)(r_t - m)',   m = sum_t omega_t r_t
 *   sample:       omega_t = 1/T,  divisor T/(T-1)
 *   population:   omega_t = 1/T,  divisor 1
 *   exponential:  omega_t proportional to decay^(T-1-t), sum 1, divisor 1
 *
 * Means are taken in two passes (the mean, then the mean of what is left): returns riding on a large constant
 * keep every digit doubles allow. A column that never changes is riskless exactly.
 *
 * @param returns   T x n row-major, decimals per period; not kept, not changed
 * @param dates     T, at least 2
 * @param size      n
 * @param weighting default: sample
 * @param form      of the kernel; default: the fastest this host allows
 * @throws Fault    "shape" | "not-a-number" (with row and column) | "too-few" | "out-of-range" (decay)
 * @source          Chan, Golub & LeVeque (1983), Algorithms for Computing the Sample Variance, The American
 *                  Statistician 37(3), 242-247 (two-pass form; from memory)
 * @cost            O(T n) time, 8 T n bytes
 * @example         returnsModel(Float64Array.of(.01, .02, .03, -.02), 2, 2).apply(Float64Array.of(.5, .5)).variance // 0.0001
 * @example         returnsModel(Float64Array.of(.01, .02, .03, -.02), 2, 2, { kind: 'exponential', decay: .5 }).means // [0.02333, -0.00667]
 */
export function returnsModel(
  returns: Float64Array,
  dates: number,
  size: number,
  weighting: Weighting = { kind: 'sample' },
  form: KernelForm = kernelForm,
): ReturnsModel {
  checkBlock(returns, dates, size, 'returns')
  if (dates < 2) {
    throw new Fault('too-few', `returns: ${dates} date`, 'at least 2 dates are needed', {
      argument: 'returns',
    })
  }
  const rowWeights = dateWeights(dates, weighting)
  const correction = weighting.kind === 'sample' ? dates / (dates - 1) : 1
  const { means, remainders, constant } = columnMeans(returns, rowWeights, size)

  const block = openBlock(dates, size, form)
  const variances = new Float64Array(size)
  const lost = new Float64Array(size)
  const z = new Float64Array(size)
  for (let t = 0; t < dates; t++) {
    const row = returns.subarray(t * size, (t + 1) * size)
    const multiplier = rowWeights[t]! * correction
    for (let i = 0; i < size; i++) {
      // the two subtractions in this order: means + remainders may not be a double
      const centred = constant[i] ? 0 : row[i]! - means[i]! - remainders[i]!
      z[i] = centred
      // compensated (Kahan 1965): plain sums of a thousand squares lose two digits
      const term = multiplier * centred * centred - lost[i]!
      const sum = variances[i]! + term
      lost[i] = sum - variances[i]! - term
      variances[i] = sum
    }
    block.write(t, z, multiplier)
  }
  for (let i = 0; i < size; i++) means[i] = constant[i] ? returns[i]! : means[i]! + remainders[i]!

  const checked = (weights: Float64Array) => {
    checkBlock(weights, size, 1, 'weights')
    return weights
  }
  const checkedDates = (perDate: Float64Array) => {
    // as one row: the fault then counts numbers, not positions
    checkBlock(perDate, 1, dates, 'numbers of dates')
    return perDate
  }
  return {
    size,
    dates,
    weighting,
    form: block.form,
    means,
    rowWeights,
    correction,
    // y is a sum of n terms, each good to one rounding of its stand-alone volatility
    rounding: (size * Number.EPSILON) ** 2,
    apply: (weights, into) => block.pass(checked(weights), into),
    variances: () => variances.slice(),
    matrix: () => columnByColumn(variances, (weights) => block.pass(weights).marginals),
    centredRow: (date, into) => block.read(date, into),
    portfolioReturns: (weights, marginalsInto) => block.portfolio(checked(weights), marginalsInto),
    weigh: (perDate, into) => block.weigh(checkedDates(perDate), into),
    squares: (perDateOfSquares, perDate) =>
      block.squares(checkedDates(perDateOfSquares), checkedDates(perDate)),
  }
}

/** Means by two passes: the mean, and the mean of what it leaves, which rounding hid from the first. */
function columnMeans(returns: Float64Array, rowWeights: Float64Array, size: number) {
  const means = new Float64Array(size)
  const remainders = new Float64Array(size)
  const constant = new Uint8Array(size).fill(1)
  for (let t = 0; t < rowWeights.length; t++) {
    const row = returns.subarray(t * size, (t + 1) * size)
    const omega = rowWeights[t]!
    for (let i = 0; i < size; i++) {
      means[i] = means[i]! + omega * row[i]!
      if (row[i] !== returns[i]) constant[i] = 0
    }
  }
  for (let t = 0; t < rowWeights.length; t++) {
    const row = returns.subarray(t * size, (t + 1) * size)
    const omega = rowWeights[t]!
    for (let i = 0; i < size; i++) remainders[i] = remainders[i]! + omega * (row[i]! - means[i]!)
  }
  return { means, remainders, constant }
}

function dateWeights(dates: number, weighting: Weighting): Float64Array {
  if (weighting.kind !== 'exponential') return new Float64Array(dates).fill(1 / dates)
  const { decay } = weighting
  if (!(decay > 0 && decay < 1)) {
    throw new Fault(
      'out-of-range',
      `decay factor ${decay}`,
      'a number between 0 and 1 is needed, such as 0.94',
      {
        argument: 'decay',
      },
    )
  }
  const weights = Float64Array.from({ length: dates }, (_, t) => decay ** (dates - 1 - t))
  // smallest first: weights grow with t
  const total = weights.reduce((sum, weight) => sum + weight, 0)
  return weights.map((weight) => weight / total)
}

/** The matrix of an operator with this diagonal, from what it does to each unit vector; one half, then mirrored. */
function columnByColumn(
  diagonal: Float64Array,
  apply: (weights: Float64Array) => Float64Array,
): Float64Array {
  const size = diagonal.length
  const matrix = new Float64Array(size * size)
  const unit = new Float64Array(size)
  for (let i = 0; i < size; i++) {
    unit[i] = 1
    const column = apply(unit)
    unit[i] = 0
    matrix[i * size + i] = diagonal[i]!
    for (let j = i + 1; j < size; j++) matrix[i * size + j] = matrix[j * size + i] = column[j]!
  }
  return matrix
}

/**
 * The risk model of a covariance matrix that is given outright.
 *
 * Symmetry and the diagonal are checked here. That a matrix has a negative eigenvalue is not looked for; when the
 * weights at hand meet one, `apply` says so.
 *
 * @param matrix    n x n row-major, decimals squared; not changed, a copy is kept
 * @param size      n
 * @throws Fault    "shape" | "not-a-number" | "negative-variance" | "not-symmetric" beyond 1e-8 sqrt(c_ii c_jj)
 * @cost            O(n^2) for the check and for each question
 * @example         matrixModel(Float64Array.of(.04, .01, .01, .09), 2).apply(Float64Array.of(.5, .5)).variance // 0.0375
 * @example         matrixModel(Float64Array.of(.04, .01, .02, .09), 2) // Fault "not-symmetric"
 */
export function matrixModel(matrix: Float64Array, size: number): RiskModel {
  checkBlock(matrix, size, size, 'risk')
  const variances = new Float64Array(size)
  for (let i = 0; i < size; i++) {
    const variance = (variances[i] = matrix[i * size + i]!)
    if (variance < 0) {
      throw new Fault(
        'negative-variance',
        `risk: ${variance} on the diagonal`,
        'a variance of 0 or more is needed',
        {
          argument: 'risk',
          row: i,
          column: i,
        },
      )
    }
  }
  for (let i = 0; i < size; i++) {
    for (let j = 0; j < i; j++) {
      const below = matrix[i * size + j]!
      const above = matrix[j * size + i]!
      if (Math.abs(below - above) > 1e-8 * Math.sqrt(variances[i]!) * Math.sqrt(variances[j]!)) {
        throw new Fault(
          'not-symmetric',
          `risk: ${below} below the diagonal but ${above} above it`,
          'the same covariance is needed in both places',
          { argument: 'risk', row: i, column: j },
        )
      }
    }
  }
  const kept = matrix.slice()
  const rounding = size * Number.EPSILON

  return {
    size,
    rounding,
    apply(weights, into) {
      checkBlock(weights, size, 1, 'weights')
      const marginals = into ?? new Float64Array(size)
      let variance = 0
      let gross = 0
      for (let i = 0, k = 0; i < size; i++) {
        let sum = 0
        for (let j = 0; j < size; j++, k++) sum += kept[k]! * weights[j]!
        marginals[i] = sum
        variance += weights[i]! * sum
        gross += Math.abs(weights[i]!) * Math.sqrt(variances[i]!)
      }
      if (variance < -rounding * gross * gross) {
        throw new Fault(
          'negative-variance',
          `risk: these weights would have a variance of ${variance.toPrecision(3)}`,
          'a covariance matrix without negative eigenvalues is needed',
          { argument: 'risk' },
        )
      }
      // what is left below zero is rounding of zero
      return { marginals, variance: Math.max(variance, 0) }
    },
    variances: () => variances.slice(),
    matrix: () => kept.slice(),
  }
}

/**
 * The covariance matrix of a model, in full.
 *
 * @returns  n x n row-major, decimals squared per period
 * @cost     O(T n^2) for a returns model
 * @example  covariance(returnsModel(Float64Array.of(.01, .02, .03, -.02), 2, 2)) // [0.0002, -0.0004, -0.0004, 0.0008]
 */
export function covariance(model: RiskModel): Float64Array {
  return model.matrix()
}

/**
 * The correlation matrix of a model: c_ij / sqrt(c_ii c_jj), with ones on its diagonal.
 *
 * @returns  n x n row-major; NaN throughout the row and column of a riskless position, whose correlation is not defined
 * @cost     O(T n^2) for a returns model
 * @example  correlation(matrixModel(Float64Array.of(.04, .03, .03, .09), 2)) // [1, 0.5, 0.5, 1]
 */
export function correlation(model: RiskModel): Float64Array {
  const { size } = model
  const matrix = model.matrix()
  const deviations = model.variances().map(Math.sqrt)
  for (let i = 0; i < size; i++) {
    for (let j = 0; j < size; j++) {
      const scale = deviations[i]! * deviations[j]!
      const at = i * size + j
      matrix[at] = scale === 0 ? NaN : i === j ? 1 : matrix[at]! / scale
    }
  }
  return matrix
}
