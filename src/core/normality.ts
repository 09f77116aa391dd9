import erfc from '@stdlib/math-base-special-erfc'
import incompleteGamma from '@stdlib/math-base-special-gammainc'
import { momentsOf } from './moments'
import type { ReturnsModel } from './risk-model'

/** The chance of rejecting what is normal that these verdicts take: 5%. */
export const NORMALITY_LEVEL = 0.05

/** The test of one series; what depends on a spread is null where the series never moves. */
export interface SeriesNormality {
  readonly observations: number
  /** Divisor T. */
  readonly skewness: number | null
  readonly excessKurtosis: number | null
  /** T (S^2/6 + K^2/24) */
  readonly statistic: number | null
  /** Chance of a statistic this large or larger if the series is normal. */
  readonly pValue: number | null
  /**
   * "consistent" with a normal distribution (which proves none), or what speaks most against one: tails that are heavy or light, or a
   * side that is longer, that of losses or that of gains; "not-tested" where the series never moves.
   */
  readonly verdict:
    'consistent' | 'heavy-tailed' | 'light-tailed' | 'skewed-to-losses' | 'skewed-to-gains' | 'not-tested'
}

/**
 * Tests one series of returns for normality by its skewness and kurtosis (Jarque & Bera).
 *
 * The chi-square distribution of the statistic is that of long series: under a hundred dates or so it rejects too seldom. Returns
 * whose volatility changes over time are heavy-tailed to this test, whatever they are on a given day.
 *
 * @param values  T
 * @throws Fault  "shape" | "not-a-number"
 * @source        Jarque & Bera (1987), A Test for Normality of Observations and Regression Residuals, International Statistical Review
 *                55(2), 163-172 (from memory)
 * @cost          O(T)
 * @example       jarqueBera(Float64Array.of(1, 2, 3)).statistic // 0.28125
 * @example       jarqueBera(Float64Array.of(1, 2, 3)).pValue // 0.868815
 * @example       jarqueBera(Float64Array.of(0, 0, 0)).verdict // "not-tested"
 */
export function jarqueBera(values: Float64Array): SeriesNormality {
  const observations = values.length
  const { skewness, excessKurtosis } = momentsOf(values)
  if (skewness === null || excessKurtosis === null) {
    return { observations, skewness, excessKurtosis, statistic: null, pValue: null, verdict: 'not-tested' }
  }
  const asymmetry = (observations * skewness ** 2) / 6
  const peakedness = (observations * excessKurtosis ** 2) / 24
  const statistic = asymmetry + peakedness
  // the upper tail of a chi-square with 2 degrees of freedom
  const pValue = Math.exp(-statistic / 2)
  return { observations, skewness, excessKurtosis, statistic, pValue, verdict: verdict() }

  function verdict() {
    if (pValue >= NORMALITY_LEVEL) return 'consistent'
    if (peakedness >= asymmetry) return excessKurtosis! > 0 ? 'heavy-tailed' : 'light-tailed'
    return skewness! < 0 ? 'skewed-to-losses' : 'skewed-to-gains'
  }
}

/** The test of a block of returns; figures are null where `verdict` says that it was not tested. */
export interface BlockNormality {
  /** T */
  readonly dates: number
  /** m, the positions that move; the others have no part in the test. */
  readonly size: number
  /** b1 = mean over all pairs of dates of (z_t' S^-1 z_s)^3; 0 for symmetric distributions. */
  readonly skewness: number | null
  /** T b1 / 6 */
  readonly skewnessStatistic: number | null
  /** m (m+1) (m+2) / 6 */
  readonly skewnessDegrees: number | null
  readonly skewnessPValue: number | null
  /** b2 = mean over dates of (z_t' S^-1 z_t)^2; m (m+2) for the normal distribution. */
  readonly kurtosis: number | null
  /** (b2 - m (m+2)) / sqrt(8 m (m+2) / T) */
  readonly kurtosisStatistic: number | null
  /** Two-sided. */
  readonly kurtosisPValue: number | null
  /** b2 less its mean over its deviation, both as they are for T normal dates rather than for endlessly many. */
  readonly exactKurtosisStatistic: number | null
  /** Two-sided. */
  readonly exactKurtosisPValue: number | null
  /**
   * "consistent" with a joint normal distribution, or what speaks against one, tails first: heavy tails alone make the test of skewness
   * reject as well, so that it says little beside them. Or why nothing was tested: no more dates than positions, or one position that the
   * others give exactly.
   */
  readonly verdict:
    'consistent' | 'heavy-tailed' | 'light-tailed' | 'asymmetric' | 'too-few-dates' | 'dependent-positions'
  /** "dependent-positions": the first position that those before it give. */
  readonly dependent: number | null
}

/** Below this share of its variance, what a position adds to those before it has no digits left to test. */
const LEAST_PIVOT = 1e-10

/**
 * Tests a block of returns for joint normality by its multivariate skewness and kurtosis (Mardia), dates weighing the same.
 *
 * The block is whitened by a Cholesky factor of its correlations, after which both figures are plain sums of products of dates.
 *
 * Skewness and the first form of the kurtosis statistic are those of long series. With m not far below T the one of skewness rejects too
 * seldom, and the one of kurtosis takes normal returns for light-tailed: b2 of T normal dates lies about m / sqrt(2 T) deviations below
 * m (m+2). Its second form goes by the moments that b2 has at T dates, and tails are heavy or light where both forms say so:
 *
 *   mean      m (m+2) (T-1) / (T+1)
 *   variance  8 m (m+2) (T-3) (T-m-1) (T-m+1) / ((T+1)^2 (T+3) (T+5))
 *
 * Where that variance is 0 (T = m+1, when b2 is the same whatever the returns) the second form is 0, and skewness alone decides.
 *
 * @param model    T x n; positions that never move are left out
 * @returns        a run that yields the share of the work done and ends in the result; what cannot be tested is a verdict, no fault
 * @source         Mardia (1970), Measures of Multivariate Skewness and Kurtosis with Applications, Biometrika 57(3), 519-530; moments of b2 at T
 *                 dates: Mardia (1974), Applications of Some Measures of Multivariate Skewness and Kurtosis in Testing Normality and
 *                 Robustness Studies, Sankhya B 36, 115-128 (both from memory)
 * @cost           O(T n^2 + T^2 n) time, T n numbers of memory; p of the skewness to 3 digits once it has thousands of degrees of freedom
 * @example        inOneGo(mardia(returnsModel(Float64Array.of(1, 2, 3), 3, 1))).kurtosis // 1.5
 * @example        inOneGo(mardia(returnsModel(Float64Array.of(1, 2, 3, 5), 2, 2))).verdict // "too-few-dates"
 */
export function* mardia(model: ReturnsModel): Generator<number, BlockNormality> {
  const { dates } = model
  const deviations = model.variances().map(Math.sqrt)
  const moving = Int32Array.from(deviations.keys()).filter((i) => deviations[i]! > 0)
  const size = moving.length
  if (dates <= size || size === 0) return untested(dates, size, 'too-few-dates', null)

  // multiplications, shared among: correlations, factor, whitening, pairs of dates
  const work =
    (dates * size * size) / 2 + size ** 3 / 6 + (dates * size * size) / 2 + (dates * dates * size) / 2
  let done = 0
  let told = 0
  const isLong = (multiplications: number): boolean => {
    done += multiplications
    if (done - told < 5e6) return false
    told = done
    return true
  }

  const z = standardised(model, moving, deviations)
  const factor = new Float64Array(size * size)
  for (let t = 0; t < dates; t++) {
    const row = z.subarray(t * size, (t + 1) * size)
    for (let i = 0; i < size; i++) {
      const scaled = row[i]! / dates
      for (let j = 0, k = i * size; j <= i; j++, k++) factor[k] = factor[k]! + scaled * row[j]!
    }
    if (isLong((size * size) / 2)) yield done / work
  }
  for (let i = 0; i < size; i++) {
    const scale = factor[i * size + i]!
    for (let j = 0; j <= i; j++) {
      const rest = factor[i * size + j]! - dot(factor, i * size, j * size, j)
      if (j < i) factor[i * size + j] = rest / factor[j * size + j]!
      else if (rest > LEAST_PIVOT * scale) factor[i * size + i] = Math.sqrt(rest)
      else return untested(dates, size, 'dependent-positions', moving[i]!)
    }
    if (isLong((i * i) / 2)) yield done / work
  }
  for (let t = 0; t < dates; t++) {
    const row = z.subarray(t * size, (t + 1) * size)
    for (let i = 0; i < size; i++) {
      let rest = row[i]!
      for (let j = 0, k = i * size; j < i; j++, k++) rest -= factor[k]! * row[j]!
      row[i] = rest / factor[i * size + i]!
    }
    if (isLong((size * size) / 2)) yield done / work
  }
  let cubes = 0
  let squares = 0
  for (let t = 0; t < dates; t++) {
    const own = dot(z, t * size, t * size, size)
    squares += own * own
    let pairs = 0
    for (let s = 0; s < t; s++) pairs += dot(z, t * size, s * size, size) ** 3
    cubes += own ** 3 + 2 * pairs
    if (isLong(t * size)) yield done / work
  }

  const skewness = cubes / dates / dates
  const skewnessStatistic = (dates * skewness) / 6
  const skewnessDegrees = (size * (size + 1) * (size + 2)) / 6
  const skewnessPValue = incompleteGamma(skewnessStatistic / 2, skewnessDegrees / 2, true, true)
  const kurtosis = squares / dates
  const normal = size * (size + 2)
  const kurtosisStatistic = (kurtosis - normal) / Math.sqrt((8 * normal) / dates)
  const kurtosisPValue = twoSided(kurtosisStatistic)
  const spread =
    (8 * normal * (dates - 3) * (dates - size - 1) * (dates - size + 1)) /
    ((dates + 1) ** 2 * (dates + 3) * (dates + 5))
  const exactKurtosisStatistic =
    spread > 0 ? (kurtosis - (normal * (dates - 1)) / (dates + 1)) / Math.sqrt(spread) : 0
  const exactKurtosisPValue = twoSided(exactKurtosisStatistic)
  return {
    dates,
    size,
    skewness,
    skewnessStatistic,
    skewnessDegrees,
    skewnessPValue,
    kurtosis,
    kurtosisStatistic,
    kurtosisPValue,
    exactKurtosisStatistic,
    exactKurtosisPValue,
    verdict:
      Math.max(kurtosisPValue, exactKurtosisPValue) < NORMALITY_LEVEL &&
      kurtosisStatistic > 0 === exactKurtosisStatistic > 0
        ? kurtosisStatistic > 0
          ? 'heavy-tailed'
          : 'light-tailed'
        : skewnessPValue < NORMALITY_LEVEL
          ? 'asymmetric'
          : 'consistent',
    dependent: null,
  }
}

const twoSided = (statistic: number): number => erfc(Math.abs(statistic) / Math.SQRT2)

/** The columns that move, each in units of its deviation and about its plain mean, whatever the weighting of the model. */
function standardised(model: ReturnsModel, moving: Int32Array, deviations: Float64Array): Float64Array {
  const { dates } = model
  const size = moving.length
  const z = new Float64Array(dates * size)
  const means = new Float64Array(size)
  for (let t = 0; t < dates; t++) {
    const row = model.centredRow(t)
    for (let i = 0; i < size; i++) {
      const column = moving[i]!
      means[i] = means[i]! + (z[t * size + i] = row[column]! / deviations[column]!) / dates
    }
  }
  for (let t = 0, k = 0; t < dates; t++) for (let i = 0; i < size; i++, k++) z[k] = z[k]! - means[i]!
  return z
}

function dot(values: Float64Array, from: number, other: number, count: number): number {
  // two sums at a time: each addition has to wait for the one before it
  let even = 0
  let odd = 0
  let k = 0
  for (; k + 1 < count; k += 2) {
    even += values[from + k]! * values[other + k]!
    odd += values[from + k + 1]! * values[other + k + 1]!
  }
  return k < count ? even + odd + values[from + k]! * values[other + k]! : even + odd
}

const untested = (
  dates: number,
  size: number,
  verdict: 'too-few-dates' | 'dependent-positions',
  dependent: number | null,
): BlockNormality => ({
  dates,
  size,
  skewness: null,
  skewnessStatistic: null,
  skewnessDegrees: null,
  skewnessPValue: null,
  kurtosis: null,
  kurtosisStatistic: null,
  kurtosisPValue: null,
  exactKurtosisStatistic: null,
  exactKurtosisPValue: null,
  verdict,
  dependent,
})
