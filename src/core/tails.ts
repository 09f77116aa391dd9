import digamma from '@stdlib/math-base-special-digamma'
import gammaRatio from '@stdlib/math-base-special-gamma-delta-ratio'
import normalQuantile from '@stdlib/stats-base-dists-normal-quantile'
import studentQuantile from '@stdlib/stats-base-dists-t-quantile'
import { decompose, type Decomposition } from './decomposition'
import { Fault } from './fault'
import { momentsOf } from './moments'
import type { ReturnsModel, RiskModel } from './risk-model'

/** What the tail of the portfolio's return is taken to look like. */
export type TailMethod =
  | { readonly kind: 'normal' }
  /** degrees of freedom above 2; null: fitted to the portfolio's returns */
  | { readonly kind: 'student'; readonly degrees: number | null }
  | { readonly kind: 'historical' }
  | { readonly kind: 'cornish-fisher' }

export interface TailChoice {
  readonly method: TailMethod
  /** Between 0.5 and 1: 0.99 looks at the worst 1%. */
  readonly confidence: number
  /** How many periods ahead; 1 is the period of the returns. */
  readonly periods: number
}

/** Losses are positive, as decimals of capital. Arrays have one entry for each position. */
export interface TailRisk extends TailChoice {
  /** The loss that is exceeded with probability 1 - confidence only. */
  readonly valueAtRisk: number
  /** Contributions to value at risk, summing to it; null where the method has none that are more than one date's noise. */
  readonly valueAtRiskParts: Float64Array | null
  /** Expected shortfall: the mean of the losses from value at risk on; null for "cornish-fisher". */
  readonly shortfall: number | null
  /** Contributions to expected shortfall, summing to it. */
  readonly parts: Float64Array | null
  /** parts / shortfall, summing to 1; null where there is no loss to share. */
  readonly shares: Float64Array | null
  /** "historical": T p, the number of dates the tail stands for, fractions included. Few of them make a rough figure. */
  readonly tailObservations: number | null
  /**
   * "historical": standard error of value at risk, sqrt(p (1-p) / T) / f with f the normal density at the quantile. From confidences of about
   * 90% on fat tails, which thin the density out there, make it larger: read it as a lower bound. Null where T p is below 1: the value at
   * risk is the largest loss there was, and nothing tells how far it may be off.
   */
  readonly standardError: number | null
  /** "student": degrees of freedom, given or fitted; Infinity where the fit finds no tail fatter than normal. */
  readonly degrees: number | null
  /** "cornish-fisher": of the portfolio's returns, divisor T. */
  readonly skewness: number | null
  readonly excessKurtosis: number | null
}

/**
 * Value at risk and expected shortfall of a portfolio, with contributions.
 *
 *   p = 1 - confidence, s = volatility of the model, h = periods, c_i = contribution of position i to s
 *   normal          VaR = z s sqrt(h),   ES = phi(z)/p s sqrt(h),   z the normal quantile at confidence
 *   student         VaR = u q s sqrt(h), ES = u f(q)/p (v + q^2)/(v - 1) s sqrt(h),   q, f quantile and density of Student's t with v
 *                   degrees of freedom, u = sqrt((v-2)/v), so that the volatility is the model's
 *   both            parts of either figure are in proportion to c_i: shares equal the shares of risk
 *   historical      losses l_t = -sum_i w_i r_ti at today's weights, largest first; VaR = l_(ceil(T p)),
 *                   ES = (l_(1) + .. + l_(k) + (T p - k) l_(k+1)) / (T p),   k = floor(T p);
 *                   parts: the same weights on -w_i r_ti; dates that tie at the cut share what weight is left
 *   cornish-fisher  VaR = -x s,   x = z + (z^2-1) S/6 + (z^3-3z) K/24 - (2z^3-5z) S^2/36,   z the normal quantile at p
 *
 * "normal", "student" and "cornish-fisher" take the mean as zero; "historical" keeps it. Returns weigh the same on all dates in
 * "historical", in a fit and in S and K, whatever the weighting of the model. p of "historical" is rounded to 10 digits, since 1 - 0.95
 * is not 0.05 in binary. S and K are the moments of the sample, not the parameters that would reproduce them.
 *
 * @param model    n positions, per period
 * @param weights  n; decimals of capital
 * @param history  the returns behind the model, T x n; null where there are none (a covariance matrix)
 * @throws Fault   "out-of-range" (confidence, periods, degrees of freedom; a fit at 2 degrees of freedom or fewer; S and K outside the
 *                 domain of Cornish-Fisher) | "unknown-choice" (a method that needs returns, without any) | "zero-risk" (a fit to a
 *                 series that never moves) | "shape" | those of `decompose`
 * @source         contributions: Tasche (2008), arXiv:0708.2542; expected shortfall of a sample: Acerbi & Tasche (2002), On the
 *                 Coherence of Expected Shortfall, JBF 26(7), 1487-1503 (from memory); Student: McNeil, Frey & Embrechts (2005),
 *                 Quantitative Risk Management, section 2.2 (from memory); Cornish & Fisher (1937), Moments and Cumulants in the
 *                 Specification of Distributions; its domain: Maillard (2012), SSRN 1997178 (from memory); standard error: Kupiec
 *                 (1995), Journal of Derivatives 3(2), equation (9)
 * @cost           that of `decompose`; "historical" one pass and a sort more; a fit some hundred passes over T numbers
 * @example        tailRisk(matrixModel(Float64Array.of(.04, 0, 0, .01), 2), Float64Array.of(.5, .5), { method: { kind: 'normal' }, confidence: .99, periods: 1 }, null).parts // [0.23838, 0.0596]
 * @example        tailRisk(matrixModel(Float64Array.of(.04), 1), Float64Array.of(1), { method: { kind: 'student', degrees: 5 }, confidence: .99, periods: 1 }, null).valueAtRisk // 0.52129
 * @example        ((m) => tailRisk(m, Float64Array.of(1), { method: { kind: 'historical' }, confidence: .6, periods: 1 }, m).shortfall)(returnsModel(Float64Array.of(-.04, -.01, .02, .03), 4, 1)) // 0.02875
 */
export function tailRisk(
  model: RiskModel,
  weights: Float64Array,
  choice: TailChoice,
  history: ReturnsModel | null,
): TailRisk {
  const { method, confidence } = choice
  checkChoice(choice)
  const d = decompose(model, weights)
  const tail = 1 - confidence
  switch (method.kind) {
    case 'normal':
      return elliptical(choice, d, normalFactors(tail), null)
    case 'student': {
      const degrees = method.degrees ?? fittedDegrees(behind(history, model, 'student'), weights, d)
      return elliptical(choice, d, studentFactors(tail, degrees ?? Infinity), degrees)
    }
    case 'historical':
      return historical(choice, behind(history, model, 'historical'), weights)
    case 'cornish-fisher':
      return cornishFisher(choice, behind(history, model, 'cornish-fisher'), weights, d)
  }
}

function checkChoice({ method, confidence, periods }: TailChoice): void {
  const refused = (argument: string, found: string, needed: string) =>
    new Fault('out-of-range', `${argument}: ${found}`, needed, { argument })
  if (!(confidence > 0.5 && confidence < 1)) {
    throw refused('confidence', `${confidence}`, 'a number above 0.5 and below 1 is needed, such as 0.99')
  }
  if (!(periods > 0 && Number.isFinite(periods))) {
    throw refused('periods', `${periods}`, 'a number above 0 is needed, such as 10')
  }
  if (periods !== 1 && (method.kind === 'historical' || method.kind === 'cornish-fisher')) {
    throw refused(
      'periods',
      `${periods} for “${method.kind}”`,
      '1 is needed: the square root of time holds for “normal” and “student” alone',
    )
  }
  if (method.kind === 'historical' && tailShare(confidence) === 0) {
    throw refused('confidence', `${confidence}`, 'a number below 1 by 1e-10 or more is needed')
  }
  if (method.kind === 'student' && method.degrees !== null && !(method.degrees > 2)) {
    throw refused(
      'method',
      `${method.degrees} degrees of freedom`,
      'more than 2 are needed to have a volatility',
    )
  }
}

/** The returns a method cannot do without. */
function behind(history: ReturnsModel | null, model: RiskModel, kind: TailMethod['kind']): ReturnsModel {
  if (!history) {
    throw new Fault(
      'unknown-choice',
      `method: “${kind}” without returns`,
      'returns are needed: a covariance matrix serves “normal” and “student” with degrees of freedom given, such as “student 5”',
      { argument: 'method' },
    )
  }
  if (history.size === model.size) return history
  throw new Fault(
    'shape',
    `risk: returns of ${history.size} positions`,
    `returns of ${model.size} are needed, those of the model`,
    { argument: 'risk' },
  )
}

/** Value at risk and expected shortfall of a return with mean 0 and volatility 1. */
interface Factors {
  readonly quantile: number
  readonly beyond: number
}

function normalFactors(tail: number): Factors {
  const quantile = -normalQuantile(tail, 0, 1)
  return { quantile, beyond: normalDensity(quantile) / tail }
}

const normalDensity = (z: number): number => Math.exp(-0.5 * z * z) / Math.sqrt(2 * Math.PI)

function studentFactors(tail: number, degrees: number): Factors {
  if (degrees === Infinity) return normalFactors(tail)
  const q = -studentQuantile(tail, degrees)
  // the ratio of gamma functions taken as one keeps its digits at thousands of degrees
  const density =
    Math.exp((-(degrees + 1) / 2) * Math.log1p((q * q) / degrees)) /
    (gammaRatio(degrees / 2, 0.5) * Math.sqrt(degrees * Math.PI))
  const unit = Math.sqrt((degrees - 2) / degrees)
  return { quantile: unit * q, beyond: (unit * density * (degrees + q * q)) / ((degrees - 1) * tail) }
}

function elliptical(
  choice: TailChoice,
  d: Decomposition,
  { quantile, beyond }: Factors,
  degrees: number | null,
): TailRisk {
  const scale = Math.sqrt(choice.periods)
  return {
    ...choice,
    ...NOTHING,
    valueAtRisk: quantile * scale * d.volatility,
    valueAtRiskParts: d.contribution.map((c) => quantile * scale * c),
    shortfall: beyond * scale * d.volatility,
    parts: d.contribution.map((c) => beyond * scale * c),
    shares: d.share,
    degrees,
  }
}

const NOTHING = {
  valueAtRiskParts: null,
  shortfall: null,
  parts: null,
  shares: null,
  tailObservations: null,
  standardError: null,
  degrees: null,
  skewness: null,
  excessKurtosis: null,
} as const

/** 1 - confidence in units of 1e-10, a whole number, so that products with whole numbers are exact. */
const tailShare = (confidence: number): number => Math.round((1 - confidence) * 1e10)

function historical(choice: TailChoice, history: ReturnsModel, weights: Float64Array): TailRisk {
  const { dates, size, means } = history
  const { losses, rounding } = lossesOf(history, weights)
  const order = Uint32Array.from(losses, (_, t) => t).sort((a, b) => losses[b]! - losses[a]! || a - b)
  const tail = tailShare(choice.confidence) / 1e10
  const observations = (dates * tailShare(choice.confidence)) / 1e10
  const valueAtRisk = losses[order[Math.ceil(observations) - 1]!]!

  // what is above the cut counts in full; what ties there shares the rest
  let above = 0
  while (losses[order[above]!]! > valueAtRisk + rounding) above++
  let end = above
  while (end < dates && losses[order[end]!]! >= valueAtRisk - rounding) end++
  const shared = (observations - above) / (end - above)
  let shortfall = 0
  const parts = new Float64Array(size)
  for (let k = 0; k < end; k++) {
    const date = order[k]!
    const omega = (k < above ? 1 : shared) / observations
    shortfall += omega * losses[date]!
    const row = history.centredRow(date)
    for (let i = 0; i < size; i++) parts[i] = parts[i]! - omega * weights[i]! * (row[i]! + means[i]!)
  }
  const { variance } = momentsOf(losses)
  const density = normalDensity(normalQuantile(tail, 0, 1)) / Math.sqrt((variance * dates) / (dates - 1))
  return {
    ...choice,
    ...NOTHING,
    valueAtRisk,
    shortfall,
    parts,
    shares: shortfall > rounding ? parts.map((part) => part / shortfall) : null,
    tailObservations: observations,
    standardError: observations < 1 ? null : Math.sqrt((tail * (1 - tail)) / dates) / density,
  }
}

/** -w'r_t of every date, and by how much rounding alone can set two of them apart. */
function lossesOf(history: ReturnsModel, weights: Float64Array): { losses: Float64Array; rounding: number } {
  const { means, size } = history
  const centred = history.portfolioReturns(weights)
  let mean = 0
  let gross = 0
  history.variances().forEach((variance, i) => {
    mean += weights[i]! * means[i]!
    gross += Math.abs(weights[i]!) * (Math.sqrt(variance) + Math.abs(means[i]!))
  })
  return { losses: centred.map((y) => -(y + mean)), rounding: 8 * size * Number.EPSILON * gross }
}

/**
 * The normal quantile z at a probability, corrected for skewness S and excess kurtosis K; the third-order form.
 *
 *   x = z + (z^2-1) S/6 + (z^3-3z) K/24 - (2z^3-5z) S^2/36
 *
 * @param probability  between 0 and 1
 * @returns            in units of the standard deviation; only within the domain (`inCornishFisherDomain`) the quantile of anything
 * @source             Cornish & Fisher (1937), Moments and Cumulants in the Specification of Distributions, Revue de l'Institut
 *                     International de Statistique 5, 307-320 (from memory)
 * @cost               O(1)
 * @example            cornishFisherQuantile(.99, .1, 1) // 2.629904
 */
export function cornishFisherQuantile(probability: number, skewness: number, excessKurtosis: number): number {
  const z = normalQuantile(probability, 0, 1)
  return (
    z +
    ((z * z - 1) * skewness) / 6 +
    ((z ** 3 - 3 * z) * excessKurtosis) / 24 -
    ((2 * z ** 3 - 5 * z) * skewness ** 2) / 36
  )
}

/**
 * Whether the expansion rises with z throughout, and so is the quantile function of a distribution.
 *
 *   S^2/9 <= 4 (K/8 - S^2/6) (1 - K/8 + 5 S^2/36)   and   |S| <= 6 (sqrt(2) - 1)
 *
 * Negative excess kurtosis lies outside, as does any skewness without enough of it.
 *
 * @source   Maillard (2012), A User's Guide to the Cornish Fisher Expansion, SSRN 1997178 (from memory; derived again from dx/dz >= 0)
 * @cost     O(1)
 * @example  inCornishFisherDomain(0, 8) // true
 * @example  inCornishFisherDomain(0, 8.1) // false
 */
export function inCornishFisherDomain(skewness: number, excessKurtosis: number): boolean {
  const square = skewness * skewness
  // dx/dz = a z^2 + S/3 z + c; the bound on S keeps out a and c that are both negative
  const a = excessKurtosis / 8 - square / 6
  const c = 1 - excessKurtosis / 8 + (5 * square) / 36
  return square / 9 <= 4 * a * c && Math.abs(skewness) <= 6 * (Math.SQRT2 - 1)
}

function cornishFisher(
  choice: TailChoice,
  history: ReturnsModel,
  weights: Float64Array,
  { volatility }: Decomposition,
): TailRisk {
  if (volatility === 0) return { ...choice, ...NOTHING, valueAtRisk: 0 }
  const { skewness, excessKurtosis } = momentsOf(history.portfolioReturns(weights))
  if (skewness === null || excessKurtosis === null) throw motionless()
  if (!inCornishFisherDomain(skewness, excessKurtosis)) {
    throw new Fault(
      'out-of-range',
      `method: skewness ${skewness.toPrecision(3)} and excess kurtosis ${excessKurtosis.toPrecision(3)}, outside the domain of “cornish-fisher”`,
      'another method is needed: out there the expansion is no distribution (Maillard 2012)',
      { argument: 'method' },
    )
  }
  const x = cornishFisherQuantile(1 - choice.confidence, skewness, excessKurtosis)
  return { ...choice, ...NOTHING, valueAtRisk: -x * volatility, skewness, excessKurtosis }
}

const motionless = () =>
  new Fault('zero-risk', 'risk: portfolio returns that never move', 'returns that move are needed', {
    argument: 'risk',
  })

function fittedDegrees(history: ReturnsModel, weights: Float64Array, d: Decomposition): number | null {
  if (d.volatility === 0) return null
  const fit = fitStudent(history.portfolioReturns(weights))
  if (fit) return fit.degrees
  throw new Fault(
    'out-of-range',
    'method: portfolio returns whose likeliest Student t has 2 degrees of freedom or fewer, and so no volatility',
    'another method or degrees of freedom of your own are needed, such as “student 3”',
    { argument: 'method' },
  )
}

/** A Student t distribution: location + scale x, x with so many degrees of freedom. */
export interface StudentFit {
  /** Above 2; Infinity: the normal distribution is likelier than any. */
  readonly degrees: number
  readonly location: number
  /** Not the standard deviation, which is scale sqrt(degrees / (degrees - 2)). */
  readonly scale: number
  readonly logLikelihood: number
}

/** Where the likelihood is looked at before the search goes into detail. Beyond the last, Student's t passes for normal. */
const DEGREES = [2, 2.5, 3, 3.5, 4, 5, 6, 8, 11, 16, 25, 50, 100, 300, 1000, 10000]

/**
 * The likeliest Student t distribution with more than 2 degrees of freedom.
 *
 * Location and scale at given degrees of freedom come from the EM iteration in the fast form of Kent, Tyler & Vardi; with them the
 * degrees of freedom have one equation left, psi((v+1)/2) - psi(v/2) = mean of ln(1 + x_t^2/v), solved wherever the likelihood
 * passes a maximum on a grid from 2 to 10,000, of which the highest is taken.
 *
 * @param values  T
 * @returns       null where the likelihood rises towards 2 degrees of freedom and below
 * @throws Fault  "zero-risk" (a series that never moves) | "shape" | "not-a-number"
 * @source        Liu & Rubin (1995), ML Estimation of the t Distribution Using EM and Its Extensions, Statistica Sinica 5, 19-39; Kent,
 *                Tyler & Vardi (1994), Communications in Statistics - Simulation 23(2), 441-453 (both from memory)
 * @cost          some hundred passes over the values
 * @example       fitStudent(Float64Array.of(-3, -1, -.5, 0, .5, 1, 3)).location // 0
 * @example       fitStudent(Float64Array.of(1, 2, 3, 4)).degrees // Infinity
 */
export function fitStudent(values: Float64Array): StudentFit | null {
  const { mean, variance } = momentsOf(values)
  if (variance === 0) throw motionless()
  const deviation = Math.sqrt(variance)
  const x = values.map((value) => (value - mean) / deviation)

  let near = NORMAL(x.length)
  // signs and ranks need few digits
  const at = DEGREES.map((degrees) => (near = located(x, degrees, near, 1e-6)))
  const candidates: Located[] = []
  at.slice(1).forEach((upper, k) => {
    const lower = at[k]!
    if (lower.score > 0 && upper.score <= 0) candidates.push(zeroBetween(x, lower, upper))
  })
  const [lowest, highest] = [at[0]!, at.at(-1)!]
  if (lowest.score <= 0) candidates.push(lowest)
  if (highest.score > 0) candidates.push(NORMAL(x.length))
  const best = candidates.reduce((a, b) => (b.logLikelihood > a.logLikelihood ? b : a))
  if (best.degrees <= 2) return null
  return {
    degrees: best.degrees,
    location: mean + deviation * best.location,
    scale: deviation * best.scale,
    logLikelihood: best.logLikelihood - x.length * Math.log(deviation),
  }
}

/** Of a series with a deviation of 1: below this, most of its numbers are one and the same, and no scale is the best. */
const NO_SCALE = 1e-8

/** The best location and scale at given degrees of freedom. */
interface Located extends StudentFit {
  /** Positive where more degrees of freedom are likelier. */
  readonly score: number
}

/** Of a series with mean 0 and variance 1. */
const NORMAL = (count: number): Located => ({
  degrees: Infinity,
  location: 0,
  scale: 1,
  logLikelihood: (-count / 2) * (1 + Math.log(2 * Math.PI)),
  score: 0,
})

function located(x: Float64Array, degrees: number, start: Located, precision: number): Located {
  let { location, scale } = start
  // linear convergence, a few dozen rounds
  for (let round = 0; round < 500 && scale > NO_SCALE; round++) {
    let total = 0
    let sum = 0
    let squares = 0
    for (const value of x) {
      const away = value - location
      const weight = 1 / (degrees + (away / scale) ** 2)
      total += weight
      sum += weight * away
      squares += weight * away * away
    }
    const step = sum / total
    const before = scale
    location += step
    // about the new location, with the weights of the old one
    scale = Math.sqrt(squares / total - step * step)
    if (Math.abs(step) + Math.abs(scale - before) <= precision * scale) break
  }
  let logs = 0
  for (const value of x) {
    const z = (value - location) / scale
    logs += Math.log1p((z * z) / degrees)
  }
  return {
    degrees,
    location,
    scale,
    logLikelihood:
      -x.length * Math.log(scale * gammaRatio(degrees / 2, 0.5) * Math.sqrt(degrees * Math.PI)) -
      ((degrees + 1) / 2) * logs,
    score: digamma((degrees + 1) / 2) - digamma(degrees / 2) - logs / x.length,
  }
}

/** The degrees of freedom between two of opposite scores where the score is 0; regula falsi in the Illinois form. */
function zeroBetween(x: Float64Array, lower: Located, upper: Located): Located {
  let [a, b] = [lower, upper]
  let [scoreA, scoreB] = [a.score, b.score]
  let kept: 'a' | 'b' | null = null
  let found = a
  for (let round = 0; round < 100; round++) {
    const before = found.degrees
    found = located(x, (a.degrees * scoreB - b.degrees * scoreA) / (scoreB - scoreA), found, 1e-15)
    if (found.score === 0 || Math.abs(found.degrees - before) <= 1e-13 * before) break
    if (found.score > 0) {
      a = found
      scoreA = a.score
      if (kept === 'b') scoreB /= 2
      kept = 'b'
    } else {
      b = found
      scoreB = b.score
      if (kept === 'a') scoreA /= 2
      kept = 'a'
    }
  }
  return found
}
