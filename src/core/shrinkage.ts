import { Fault } from './fault'
import { openBlock, type Block } from './kernel/block'
import type { ReturnsModel, RiskModel } from './risk-model'

/**
 * What a covariance is drawn toward: "identity" and "oas" toward one variance for all and no correlation, with the
 * intensity of Ledoit & Wolf (2004) or of Chen et al. (2010); "correlation" toward one correlation for every pair.
 */
export type ShrinkageTarget = 'identity' | 'correlation' | 'oas'

/** How far a covariance is drawn toward which target: (1 - intensity) S + intensity F, S with divisor T. */
export interface Shrinkage {
  readonly target: ShrinkageTarget
  /** 0: S itself, 1: the target. */
  readonly intensity: number
  /** The positions whose returns move: the n of the formulas. */
  readonly moving: number
  /** The positions whose returns never change: they stay outside, and riskless. */
  readonly excluded: number
  /** Mean variance of what moves, divisor T: the target's diagonal under "identity" and "oas". */
  readonly meanVariance: number
  /** Mean correlation over the pairs of what moves: the target's under "correlation"; 0 where there is no pair. */
  readonly meanCorrelation: number
  /**
   * Largest over smallest volatility of what moves; 1 where nothing does. One variance for all is a poor target when
   * volatilities lie far apart.
   */
  readonly volatilityRatio: number
}

/**
 * The intensity a block of returns calls for. With x_t the centred returns of the n positions that move, S = X'X/T and
 * mu = tr(S)/n:
 *
 *   identity      F = mu I,  intensity = min(b, d)/d,  b = sum_t |x_t x_t' - S|^2 / T^2,  d = |S - F|^2
 *   oas           F = mu I,  intensity = min(1, ((1-2/n) tr(S^2) + tr(S)^2) / ((T+1-2/n) (tr(S^2) - tr(S)^2/n)))
 *   correlation   f_ii = s_ii, f_ij = r sqrt(s_ii s_jj), r the mean correlation,
 *                 intensity = max(0, min(1, (pi - rho) / (T d))),  d = |S - F|^2,
 *                 pi = sum_ij pi_ij,  pi_ij = mean_t (x_ti x_tj - s_ij)^2,
 *                 rho = sum_i pi_ii + r/2 sum_(i!=j) (sqrt(s_jj/s_ii) theta_i,ij + sqrt(s_ii/s_jj) theta_j,ij),
 *                 theta_i,ij = mean_t (x_ti^2 - s_ii)(x_ti x_tj - s_ij)
 *
 * |.| is the Frobenius norm. Where S is its target already (a single position that moves, or pairs all correlated
 * alike) the intensity makes no difference and is 0.
 *
 * @param returns  of equally weighted dates; divisor T-1 or T makes no difference here
 * @returns        yields the share done
 * @throws Fault   "unknown-choice" (dates weighted unequally: the formulas are not for them)
 * @source         Ledoit & Wolf (2004), A Well-Conditioned Estimator for Large-Dimensional Covariance Matrices, J. Multivariate
 *                 Analysis 88(2), 365-411; Ledoit & Wolf (2004), Honey, I Shrunk the Sample Covariance Matrix, J. Portfolio
 *                 Management 30(4), appendix; Chen, Wiesel, Eldar & Hero (2010), Shrinkage Algorithms for MMSE Covariance
 *                 Estimation, IEEE Trans. Signal Processing 58(10), eq. 23 (all from memory)
 * @cost           O(T n min(T, n)) time, 8 T n bytes while it runs
 * @example        inOneGo(shrinkageOf(returnsModel(Float64Array.of(.1, .1, -.2, -.1, .3, .2, -.2, -.2), 4, 2), 'identity')).intensity // 0.19324
 */
export function* shrinkageOf(returns: ReturnsModel, target: ShrinkageTarget): Generator<number, Shrinkage> {
  if (returns.weighting.kind === 'exponential') {
    throw new Fault(
      'unknown-choice',
      'shrinkage of exponentially weighted returns',
      'equally weighted dates are needed',
    )
  }
  const T = returns.dates
  const variances = returns.variances().map((variance) => variance / returns.correction)
  const columns = Int32Array.from(variances.keys()).filter((i) => variances[i]! > 0)
  const n = columns.length
  const deviations = Float64Array.from(columns, (i) => Math.sqrt(variances[i]!))
  const trace = columns.reduce((sum, i) => sum + variances[i]!, 0)

  const moments = yield* momentsOf(returns, columns, deviations)
  const { meanCorrelation } = moments
  const { squares, distance, resolution } = yield* normsOf(moments, deviations, T, target, trace)

  /** sum_ij mean_t (x_ti x_tj - s_ij)^2: no double loop is needed for a sum over all pairs */
  const noise = Math.max(moments.fourth / T - squares, 0)
  const quotient = {
    identity: noise / T / distance,
    oas: ((1 - 2 / n) * squares + trace * trace) / ((T + 1 - 2 / n) * distance),
    correlation: Math.max(noise - moments.targetNoise, 0) / T / distance,
  }[target]
  return {
    target,
    // a distance that rounding alone makes of S = F would give a quotient of roundings
    intensity: distance <= resolution ? 0 : Math.min(quotient, 1),
    moving: n,
    excluded: returns.size - n,
    meanVariance: n === 0 ? 0 : trace / n,
    meanCorrelation,
    volatilityRatio: n === 0 ? 1 : extreme(deviations, Math.max) / extreme(deviations, Math.min),
  }
}

const extreme = (values: Float64Array, of: (a: number, b: number) => number) =>
  values.reduce((a, b) => of(a, b))

/** How much of the work it is, about, to read the returns by dates and to turn them over. */
const MOMENTS_PART = 0.2

/** What is summed over dates in one pass, and the returns in the order in which `normsOf` multiplies them. */
interface Moments {
  /** The shorter side of the block row by row: the columns of returns (n), or their dates (T) where those are fewer. */
  readonly lines: Block
  /** sum_t |x_t|^4 */
  readonly fourth: number
  readonly meanCorrelation: number
  /** rho: how much of the noise of S the target under "correlation" has too */
  readonly targetNoise: number
  /** sum_ij s_ij sqrt(s_ii s_jj) */
  readonly weighted: number
}

function* momentsOf(
  returns: ReturnsModel,
  columns: Int32Array,
  deviations: Float64Array,
): Generator<number, Moments> {
  const T = returns.dates
  const n = columns.length
  const transposed = n <= T
  const lines = openBlock(Math.max(Math.min(n, T), 1), Math.max(n, T), returns.form)
  const x = new Float64Array(n)
  const quartic = new Float64Array(n)
  const cubic = new Float64Array(n)
  const crossed = new Float64Array(n)
  let fourth = 0
  let correlated = 0
  const row = new Float64Array(returns.size)
  for (let t = 0; t < T; t++) {
    returns.centredRow(t, row)
    let square = 0
    let standardised = 0
    let weighted = 0
    for (let i = 0; i < n; i++) {
      const value = (x[i] = row[columns[i]!]!)
      square += value * value
      standardised += value / deviations[i]!
      weighted += value * deviations[i]!
    }
    if (!transposed) lines.write(t, x, 1)
    fourth += square * square
    correlated += standardised * standardised
    for (let i = 0; i < n; i++) {
      const value = x[i]!
      const power = value * value * value
      quartic[i] = quartic[i]! + power * value
      cubic[i] = cubic[i]! + power * weighted
      crossed[i] = crossed[i]! + value * weighted
    }
    if ((t & 15) === 0) yield ((MOMENTS_PART / 2) * t) / T
  }
  if (transposed) yield* writeColumns(lines, returns, columns)

  const meanCorrelation = n < 2 ? 0 : (correlated / T - n) / (n * (n - 1))
  let own = 0
  let pairs = 0
  let weighted = 0
  for (let i = 0; i < n; i++) {
    const deviation = deviations[i]!
    const variance = deviation * deviation
    const ownNoise = quartic[i]! / T - variance * variance
    own += ownNoise
    // sum over j != i of sqrt(s_jj/s_ii) theta_i,ij; the other half of rho is the same with i and j in each other's place
    pairs += (cubic[i]! - variance * crossed[i]!) / T / deviation - ownNoise
    weighted += (deviation * crossed[i]!) / T
  }
  return { lines, fourth, meanCorrelation, targetNoise: own + meanCorrelation * pairs, weighted }
}

/** The block turned over, some columns at a time: one more copy of all returns would take longer than reading them again. */
function* writeColumns(lines: Block, returns: ReturnsModel, columns: Int32Array): Generator<number, void> {
  const T = returns.dates
  const AT_ONCE = 64
  const turned = new Float64Array(AT_ONCE * T)
  const row = new Float64Array(returns.size)
  for (let from = 0; from < columns.length; from += AT_ONCE) {
    const some = columns.subarray(from, from + AT_ONCE)
    for (let t = 0; t < T; t++) {
      returns.centredRow(t, row)
      for (let k = 0; k < some.length; k++) turned[k * T + t] = row[some[k]!]!
    }
    for (let k = 0; k < some.length; k++) lines.write(from + k, turned.subarray(k * T, (k + 1) * T), 1)
    yield (MOMENTS_PART / 2) * (1 + from / columns.length)
  }
}

/**
 * |S|^2 and d = |S - F|^2. With more positions than dates |S|^2 is had from products of rows, |XX'| = |X'X|, and d from
 * it; otherwise d is summed entry by entry, which keeps its digits when S is close to F.
 *
 * `resolution` is a d that rounding could make of S = F.
 */
function* normsOf(
  { lines, meanCorrelation, weighted }: Moments,
  deviations: Float64Array,
  T: number,
  target: ShrinkageTarget,
  trace: number,
): Generator<number, { squares: number; distance: number; resolution: number }> {
  const n = deviations.length
  const toCorrelation = target === 'correlation'
  let squares = 0
  if (n <= T) {
    let distance = 0
    yield* eachProduct(lines, n, (i, j, product) => {
      const s = product / T
      if (i === j) {
        squares += s * s
        // under "correlation" the diagonal of the target is that of S
        if (!toCorrelation) distance += (s - trace / n) ** 2
      } else {
        const f = toCorrelation ? meanCorrelation * deviations[i]! * deviations[j]! : 0
        squares += 2 * s * s
        distance += 2 * (s - f) ** 2
      }
    })
    return { squares, distance, resolution: (T * Number.EPSILON * trace) ** 2 }
  }
  yield* eachProduct(lines, T, (i, j, product) => {
    squares += (i === j ? 1 : 2) * (product / T) ** 2
  })
  const diagonal = deviations.reduce((sum, deviation) => sum + deviation ** 4, 0)
  const distance = toCorrelation
    ? squares -
      diagonal -
      2 * meanCorrelation * (weighted - diagonal) +
      meanCorrelation ** 2 * (trace * trace - diagonal)
    : squares - (trace * trace) / n
  return { squares, distance, resolution: n * Number.EPSILON * squares }
}

/** The product of every pair of lines, i >= j, from tiles of 4 x 4; a few columns of tiles at a time, which stay in the cache. */
function* eachProduct(
  lines: Block,
  count: number,
  visit: (i: number, j: number, product: number) => void,
): Generator<number, void> {
  const tiles = Math.ceil(count / 4)
  for (let panel = 0; panel < tiles; panel += 4) {
    for (let first = panel; first < tiles; first++) {
      for (let second = panel; second < panel + 4 && second <= first; second++) {
        const products = lines.products(first, second)
        for (let k = 0; k < 16; k++) {
          const i = 4 * first + (k >> 2)
          const j = 4 * second + (k & 3)
          if (j <= i && i < count) visit(i, j, products[k]!)
        }
      }
      // what is left are the pairs of the columns to come
      yield 1 - (1 - MOMENTS_PART) * ((tiles - panel) / tiles) ** 2
    }
  }
}

/**
 * The risk model of returns drawn toward a target, S with divisor T. Nothing is formed: what the target does to weights
 * is added to what the returns do.
 *
 *   identity, oas:  C w = (1-a) S w + a mu w over what moves
 *   correlation:    C w = (1-a) S w + a (r d (d'w) + (1-r) d^2 w),   d the volatilities, a the intensity
 *
 * A position whose returns never change stays riskless.
 *
 * @param returns    of equally weighted dates
 * @param shrinkage  of the same block
 * @throws Fault     "shape" (the shrinkage of another number of positions)
 * @source           as for the intensity
 * @cost             beside the returns model O(n) a question
 */
export function shrunkModel(returns: ReturnsModel, shrinkage: Shrinkage): RiskModel {
  const { size } = returns
  const { intensity, target, meanVariance } = shrinkage
  if (shrinkage.moving + shrinkage.excluded !== size) {
    throw new Fault(
      'shape',
      `shrinkage of ${shrinkage.moving + shrinkage.excluded} positions`,
      `one of these ${size} is needed`,
    )
  }
  /** S = keep C of the returns model */
  const keep = (1 - intensity) / returns.correction
  const own = returns.variances().map((variance) => variance / returns.correction)
  const toCorrelation = target === 'correlation'
  const r = toCorrelation ? shrinkage.meanCorrelation : 0
  // intensity F = d r d' + diag(e)
  const d = own.map((variance) => Math.sqrt(intensity * variance))
  const e = own.map((variance) =>
    variance === 0 ? 0 : intensity * (toCorrelation ? (1 - r) * variance : meanVariance),
  )
  const variances = own.map((variance, i) => (1 - intensity) * variance + r * d[i]! * d[i]! + e[i]!)

  return {
    size,
    // all terms are squares, but for a negative r: what it takes off is rounded with the rest
    rounding: returns.rounding + (r < 0 ? 4 * intensity * Number.EPSILON : 0),
    apply(weights, into) {
      const { marginals, variance } = returns.apply(weights, into)
      let common = 0
      let separate = 0
      for (let i = 0; i < size; i++) {
        const weight = weights[i]!
        common += d[i]! * weight
        separate += e[i]! * weight * weight
      }
      for (let i = 0; i < size; i++) {
        marginals[i] = keep * marginals[i]! + r * common * d[i]! + e[i]! * weights[i]!
      }
      // the target has no negative eigenvalue, because r is at least -1/(n-1); what is left below zero is rounding
      return { marginals, variance: Math.max(keep * variance + r * common * common + separate, 0) }
    },
    variances: () => variances.slice(),
    matrix() {
      const matrix = returns.matrix()
      for (let i = 0; i < size; i++) {
        const row = matrix.subarray(i * size, (i + 1) * size)
        for (let j = 0; j < size; j++) row[j] = keep * row[j]! + r * (d[i]! * d[j]!)
        row[i] = variances[i]!
      }
      return matrix
    },
  }
}
