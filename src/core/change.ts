import { CholeskyDecomposition, WrapperMatrix1D } from 'ml-matrix'
import { decompose } from './decomposition'
import { checkBlock, Fault } from './fault'
import { smallestEigenvalue } from './nearest-correlation'
import { matrixModel, type RiskModel } from './risk-model'

/**
 * The three things a volatility is made of.
 *
 *   s = sqrt(x'R x),   x_i = w_i sigma_i
 */
export interface RiskState {
  /** w, n; decimals of capital, of any sign and sum */
  readonly weights: Float64Array
  /** sigma, n; of one unit of each position, 0 or more */
  readonly volatilities: Float64Array
  /** R, n x n row-major; of a riskless position 0 but for the diagonal */
  readonly correlations: Float64Array
}

/** What of a change of volatility comes from which cause. Arrays have one entry for each position: parts of the change of its contribution. */
export interface RiskChangeSplit {
  /** the volatility before */
  readonly from: number
  /** and after */
  readonly to: number
  readonly positions: Float64Array
  readonly volatilities: Float64Array
  readonly correlations: Float64Array
  /** What of `positions` is drift with returns; null where no drifted weights were given. */
  readonly drift: Float64Array | null
  /** The rest of `positions`; null likewise. */
  readonly trades: Float64Array | null
}

/**
 * Splits a change of volatility, and of each position's contribution to it, exactly into what the weights, the volatilities and the correlations
 * have done: the part of each cause is what it does when it is moved first, second or last, averaged over all six orders (Shapley value).
 *
 *   c(w, sigma, R)_i = x_i (R x)_i / s,   the sum over i is s
 *   positions = sum over the other two, each as before or after, of k (c(w after, ...) - c(w before, ...)),
 *               k = 1/3 where both are before or both after, 1/6 where one is; the other causes likewise
 *
 * Parts of all causes add up to the change of each contribution; over positions, to the change of volatility. A cause that did not change has parts of
 * exactly 0. Where a mix has no volatility its contributions are 0, as those of `decompose`.
 *
 * With weights as they would have drifted, `positions` is split once more into drift and trades, averaged over the two orders of these within each of
 * the six (Owen's value for a pair within a group). Trades without drift lead to w + (w after - w drifted); to 0 where the position was sold, as
 * what is sold has nothing left to drift.
 *
 * @param to       of the same positions in the same order; see `joinStates`
 * @param drifted  n; `from`'s weights after the returns between the dates, before any trade
 * @throws Fault   "shape" | "not-a-number" | "out-of-range" (a volatility below 0, with its row) | "not-symmetric" | "negative-variance" (a mix that is no
 *                 covariance)
 * @source         Shorrocks (2013), Decomposition procedures for distributional analysis: a unified framework based on the Shapley value, Journal of
 *                 Economic Inequality 11(1), 99-126; Owen (1977), Values of games with a priori unions, in Henn & Moeschlin (eds.), Mathematical
 *                 Economics and Game Theory (formulas of both from memory)
 * @cost           8 products of a matrix and weights, 16 with drift: O(n^2)
 * @example        splitChange({ weights: Float64Array.of(1), volatilities: Float64Array.of(.1), correlations: Float64Array.of(1) }, { weights: Float64Array.of(2), volatilities: Float64Array.of(.3), correlations: Float64Array.of(1) }).positions // [0.2]
 * @example        splitChange({ weights: Float64Array.of(1), volatilities: Float64Array.of(.1), correlations: Float64Array.of(1) }, { weights: Float64Array.of(2), volatilities: Float64Array.of(.3), correlations: Float64Array.of(1) }).volatilities // [0.3]
 * @example        splitChange({ weights: Float64Array.of(1), volatilities: Float64Array.of(.1), correlations: Float64Array.of(1) }, { weights: Float64Array.of(2), volatilities: Float64Array.of(.1), correlations: Float64Array.of(1) }, Float64Array.of(1.2)).drift // [0.02]
 */
export function splitChange(from: RiskState, to: RiskState, drifted?: Float64Array): RiskChangeSplit {
  const size = from.weights.length
  checkState(from, size)
  checkState(to, size)
  if (drifted) checkBlock(drifted, size, 1, 'drifted weights')
  const models = [matrixModel(from.correlations, size), matrixModel(to.correlations, size)] as const
  const volatilities = [from.volatilities, to.volatilities] as const
  const none = (): Float64Array => new Float64Array(size)
  const parts = { positions: none(), volatilities: none(), correlations: none() }
  const nested = drifted ? { drift: none(), trades: none() } : null
  const traded = drifted && tradedAlone(from.weights, to.weights, drifted)

  /** contributions where the other two are as before (0) or after (1) */
  const at = (weights: Float64Array, b: 0 | 1, c: 0 | 1): Corner =>
    contributionsOf(weights, volatilities[b], models[c])
  const corners = SIDES.map((b) => SIDES.map((c) => [at(from.weights, b, c), at(to.weights, b, c)] as const))
  const corner = (a: 0 | 1, b: 0 | 1, c: 0 | 1): Float64Array => corners[b]![c]![a].contribution
  for (const p of SIDES) {
    for (const q of SIDES) {
      const k = p === q ? 1 / 3 : 1 / 6
      addChange(parts.positions, k, corner(0, p, q), corner(1, p, q))
      addChange(parts.volatilities, k, corner(p, 0, q), corner(p, 1, q))
      addChange(parts.correlations, k, corner(p, q, 0), corner(p, q, 1))
      if (!nested || !drifted || !traded) continue
      const [first, last] = [at(drifted, p, q).contribution, at(traded, p, q).contribution]
      addChange(nested.drift, k / 2, corner(0, p, q), first)
      addChange(nested.drift, k / 2, last, corner(1, p, q))
      addChange(nested.trades, k / 2, corner(0, p, q), last)
      addChange(nested.trades, k / 2, first, corner(1, p, q))
    }
  }
  return {
    from: corners[0]![0]![0].volatility,
    to: corners[1]![1]![1].volatility,
    ...parts,
    drift: nested?.drift ?? null,
    trades: nested?.trades ?? null,
  }
}

const SIDES = [0, 1] as const

interface Corner {
  readonly volatility: number
  readonly contribution: Float64Array
}

function checkState({ weights, volatilities, correlations }: RiskState, size: number): void {
  checkBlock(weights, size, 1, 'weights')
  checkBlock(volatilities, size, 1, 'volatilities')
  checkBlock(correlations, size, size, 'correlations')
  const row = volatilities.findIndex((volatility) => volatility < 0)
  if (row >= 0)
    throw new Fault('out-of-range', `volatility ${volatilities[row]}`, 'a number of 0 or more is needed', {
      argument: 'volatilities',
      row,
    })
}

/** Contributions of the exposures x to risk under a covariance of unit variances: those of w under D R D. */
const contributionsOf = (weights: Float64Array, volatilities: Float64Array, model: RiskModel): Corner =>
  decompose(
    model,
    weights.map((w, i) => w * volatilities[i]!),
  )

/** The weights that the trades alone lead to. Written so that what did not drift, and what was not traded, comes out to the last bit. */
const tradedAlone = (from: Float64Array, to: Float64Array, drifted: Float64Array): Float64Array =>
  drifted.every((d, i) => d === to[i])
    ? from
    : from.map((was, i) => (drifted[i] === was ? to[i]! : to[i] === 0 ? 0 : was + (to[i]! - drifted[i]!)))

function addChange(into: Float64Array, factor: number, before: Float64Array, after: Float64Array): void {
  for (let i = 0; i < into.length; i++) into[i] = into[i]! + factor * (after[i]! - before[i]!)
}

/** Two dates brought to one list of positions. */
export interface JoinedStates {
  readonly from: RiskState
  readonly to: RiskState
  /**
   * Where correlations of a date, mixed with some of the other, are none (no covariance has them, so that there is no split): their least eigenvalue,
   * below 0. null where they are some, up to rounding.
   */
  readonly smallest: { readonly from: number | null; readonly to: number | null }
  /** Two positions that a mix would hold together and whose correlation neither date knows: then there is no split either. */
  readonly unknown: { readonly i: number; readonly j: number } | null
}

/**
 * Brings two dates with positions of their own to one list. A position that is not held on a date has weight 0 there, and takes its
 * volatility and its correlations from the other date; so do the correlations of one that is riskless on a date.
 *
 * The correlation of a new position with one that is gone is never asked for, as no mix holds both: it is left at 0, and has no part in `smallest`.
 * Correlations are looked at among the positions with a weight on the one date, and among those with a weight on the other.
 *
 * @param fromPlaces  m; the place of each position of the list in `from`, -1 where it is not held
 * @param toPlaces    m; likewise; each position is held on one of the dates at least
 * @throws Fault      "shape" | "not-a-number" | "out-of-range" (a place that is none, or a position on neither date) and what `smallestEigenvalue` throws
 * @source            common practice, no source; the least eigenvalue as `smallestEigenvalue`
 * @cost              O(m^2); O(m^3) where correlations are taken from the other date
 * @example           joinStates({ weights: Float64Array.of(1), volatilities: Float64Array.of(.1), correlations: Float64Array.of(1) }, { weights: Float64Array.of(.5, .5), volatilities: Float64Array.of(.2, .3), correlations: Float64Array.of(1, .4, .4, 1) }, Int32Array.of(0, -1), Int32Array.of(0, 1)).from // {"weights": [1, 0], "volatilities": [0.1, 0.3], "correlations": [1, 0.4, 0.4, 1]}
 */
export function joinStates(
  from: RiskState,
  to: RiskState,
  fromPlaces: Int32Array,
  toPlaces: Int32Array,
): JoinedStates {
  const states = [from, to] as const
  const places = [fromPlaces, toPlaces] as const
  const size = fromPlaces.length
  if (toPlaces.length !== size)
    throw new Fault('shape', `places: ${toPlaces.length}`, `${size} are needed, one for each position`, {
      argument: 'places',
    })
  for (const side of SIDES) {
    const held = states[side].weights.length
    checkState(states[side], held)
    places[side].forEach((place, row) => {
      if (place >= -1 && place < held && (place >= 0 || places[other(side)][row]! >= 0)) return
      throw new Fault('out-of-range', `place ${place}`, 'a position held on one date at least is needed', {
        argument: 'places',
        row,
      })
    })
  }
  const weights = SIDES.map((side) =>
    Float64Array.from(places[side], (place) => (place < 0 ? 0 : states[side].weights[place]!)),
  )
  const volatilities = SIDES.map((side) =>
    Float64Array.from(places[side], (place, i) =>
      place < 0
        ? states[other(side)].volatilities[places[other(side)][i]!]!
        : states[side].volatilities[place]!,
    ),
  )
  // what a date knows correlations of
  const moves = SIDES.map((side) =>
    Array.from(places[side], (place) => place >= 0 && states[side].volatilities[place]! > 0),
  )
  const known = (side: 0 | 1, i: number, j: number): boolean => moves[side]![i]! && moves[side]![j]!
  /** positions with an exposure where the weights are those of one date and the volatilities those of one */
  const exposed = SIDES.flatMap((a) =>
    SIDES.map((b) => weights[a]!.map((weight, i) => weight * volatilities[b]![i]!)),
  )
  let unknown: JoinedStates['unknown'] = null
  const mixed = SIDES.map((side) => {
    const matrix = new Float64Array(size * size)
    for (let i = 0; i < size; i++) {
      matrix[i * size + i] = 1
      for (let j = 0; j < i; j++) {
        const source = known(side, i, j) ? side : known(other(side), i, j) ? other(side) : null
        if (source === null) {
          if (exposed.some((x) => x[i] !== 0 && x[j] !== 0)) unknown ??= { i, j }
          continue
        }
        const held = states[source].weights.length
        const [p, q] = [places[source][i]!, places[source][j]!]
        matrix[i * size + j] = matrix[j * size + i] = states[source].correlations[p * held + q]!
      }
    }
    return matrix
  })

  /** Least eigenvalue among the positions that weights of one date hold, where it is below 0 and correlations of both dates are among them. */
  const smallestAmong = (side: 0 | 1, weighted: Float64Array): number | null => {
    const members = [...weighted.keys()].filter((i) => weighted[i] !== 0 && (moves[0]![i]! || moves[1]![i]!))
    const isMixed = members.some((i) => members.some((j) => j < i && !known(side, i, j)))
    if (!isMixed) return null
    const n = members.length
    const matrix = new Float64Array(n * n)
    members.forEach((i, a) => {
      members.forEach((j, b) => {
        matrix[a * n + b] = mixed[side]![i * size + j]!
      })
    })
    // a tenth of the time that eigenvalues take, and the rule
    if (new CholeskyDecomposition(new WrapperMatrix1D(matrix, { rows: n })).isPositiveDefinite()) return null
    const least = smallestEigenvalue(matrix, n)
    return least < 0 ? least : null
  }
  const smallest = SIDES.map((side) => {
    const found = weights.map((held) => smallestAmong(side, held)).filter((value) => value !== null)
    return found.length === 0 ? null : Math.min(...found)
  })
  return {
    from: { weights: weights[0]!, volatilities: volatilities[0]!, correlations: mixed[0]! },
    to: { weights: weights[1]!, volatilities: volatilities[1]!, correlations: mixed[1]! },
    smallest: { from: smallest[0] ?? null, to: smallest[1] ?? null },
    unknown,
  }
}

const other = (side: 0 | 1): 0 | 1 => (side === 0 ? 1 : 0)
