import { decompose, type Decomposition } from './decomposition'
import { checkBlock, Fault } from './fault'
import { roundingOfVariance, type RiskModel } from './risk-model'

/**
 * Where the money of a trade comes from or goes to: nothing else moves but cash; the rest of the book in proportion to its weights; or
 * one position.
 */
export type Financing =
  | { readonly kind: 'cash' }
  | { readonly kind: 'pro rata' }
  | { readonly kind: 'position'; readonly position: number }

/** Changes of weights with their financing. */
export interface Financed {
  /** n; wanted changes and those that finance them */
  readonly changes: Float64Array
  /** what is left to cash: less the sum of the changes; exactly 0 unless financed by cash */
  readonly cash: number
  /** what the weights of the rest of the book are multiplied by; null unless financed pro rata */
  readonly factor: number | null
}

/**
 * Net of the rest of the book beside its gross, below which it does not finance pro rata: each unit of money would move ten and more units of
 * positions. Our own convention.
 */
export const LEAST_NET_SHARE = 0.1

const NONE: ReadonlySet<number> = new Set()

/** Changes whose sum is no more than their last digits need no financing. */
const sumsToNothing = (sum: number, gross: number, count: number) =>
  Math.abs(sum) <= count * Number.EPSILON * gross

/**
 * Gives wanted changes their financing. With S the sum of the wanted changes:
 *
 *   cash       nothing else moves; cash takes -S
 *   pro rata   every position without a wanted change is multiplied by f = 1 - S / W, where W is the sum of their weights, signs kept: longs and
 *              shorts grow or shrink alike, their net changes by -S. Refused where |W| is less than a tenth of the sum without signs.
 *              f below 0 turns long into short; it is in the result
 *   position   that position changes by -S
 *
 * Changes that add up to 0 finance each other, and nothing else moves.
 *
 * @param weights   n
 * @param changes   n; 0 where no change is wanted
 * @param kept      positions whose weights are to stay, however the trades are paid for; left out: none
 * @throws Fault    "shape" | "not-a-number" | "out-of-range" (no such position; a rest that cannot finance) | "twice" (a
 *                  financing position with a change of its own)
 * @source          common practice, no source
 * @cost            O(n)
 * @example         financed(Float64Array.of(.5, .3, .2), Float64Array.of(.1, 0, 0), { kind: 'pro rata' }).changes // [0.1, -0.06, -0.04]
 * @example         financed(Float64Array.of(.5, .3, .2), Float64Array.of(.1, 0, 0), { kind: 'pro rata' }, new Set([1])).changes // [0.1, 0, -0.1]
 * @example         financed(Float64Array.of(.5, .3, .2), Float64Array.of(.1, 0, 0), { kind: 'cash' }).cash // -0.1
 * @example         financed(Float64Array.of(.5, .3, -.3), Float64Array.of(.1, 0, 0), { kind: 'pro rata' }) // Fault "out-of-range"
 */
export function financed(
  weights: Float64Array,
  changes: Float64Array,
  financing: Financing,
  kept: ReadonlySet<number> = NONE,
): Financed {
  const size = weights.length
  checkBlock(weights, size, 1, 'weights')
  checkBlock(changes, size, 1, 'changes')
  let sum = 0
  let gross = 0
  for (const change of changes) {
    sum += change
    gross += Math.abs(change)
  }
  if (financing.kind === 'position') checkFinancingPosition(changes, financing.position, kept)
  const all = changes.slice()
  if (financing.kind === 'cash') return { changes: all, cash: sum === 0 ? 0 : -sum, factor: null }
  if (sumsToNothing(sum, gross, size))
    return { changes: all, cash: 0, factor: financing.kind === 'pro rata' ? 1 : null }
  if (financing.kind === 'position') {
    all[financing.position] = -sum
    return { changes: all, cash: 0, factor: null }
  }
  let net = 0
  let restGross = 0
  for (let i = 0; i < size; i++) {
    if (changes[i] !== 0 || kept.has(i)) continue
    net += weights[i]!
    restGross += Math.abs(weights[i]!)
  }
  if (!canFinance(net, restGross)) {
    throw new Fault(
      'out-of-range',
      restGross === 0
        ? 'financing pro rata: nothing else is held'
        : `financing pro rata: the weights of the rest of the book add up to ${rounded(net)}, without their signs to ${rounded(restGross)}`,
      'cash or one position to finance the trade is needed',
      { argument: 'financing' },
    )
  }
  for (let i = 0; i < size; i++) if (changes[i] === 0 && !kept.has(i)) all[i] = (-sum * weights[i]!) / net
  return { changes: all, cash: 0, factor: 1 - sum / net }
}

const rounded = (value: number) => Number(value.toPrecision(4))

const canFinance = (net: number, gross: number) => gross > 0 && Math.abs(net) >= LEAST_NET_SHARE * gross

function checkFinancingPosition(
  changes: Float64Array,
  position: number,
  kept: ReadonlySet<number> = NONE,
): void {
  checkPosition(changes.length, position, 'financing')
  if (changes[position] !== 0 || kept.has(position))
    throw new Fault(
      'twice',
      'financing: the position that finances has a weight or a change of its own',
      'a position without one is needed',
      { argument: 'financing', row: position },
    )
}

function checkPosition(size: number, position: number, argument: string): void {
  if (!Number.isInteger(position) || position < 0 || position >= size)
    throw new Fault(
      'out-of-range',
      `${argument}: number ${position}`,
      `a number from 0 to ${size - 1} is needed`,
      {
        argument,
      },
    )
}

/**
 * Turnover of changes of weights, one way: the larger of what is bought and what is sold, as a fraction of capital.
 *
 *   (sum of |change_i| + |change of cash|) / 2,   change of cash = -sum of change_i
 *
 * A sale of 1% for cash and a switch of 1% from one position to another both count 1%.
 *
 * @source   common practice, no source; funds' reports that take the smaller of purchases and sales count no trade against cash
 * @cost     O(n)
 * @example  turnover(Float64Array.of(-.1, .04)) // 0.1
 */
export function turnover(changes: Float64Array): number {
  let bought = 0
  let sold = 0
  for (const change of changes) {
    if (change > 0) bought += change
    else sold -= change
  }
  return Math.max(bought, sold)
}

/** Where a figure along a course takes a given value. */
export interface Reach {
  /** every t, ascending; each was found in closed form and then confirmed on the model at w + t d */
  readonly at: readonly number[]
  /** whether the figure has the value all along, as far as rounding can tell; `at` is empty then */
  readonly everywhere: boolean
}

/** A straight line of weights w(t) = w + t d and everything about risk along it. Per period. */
export interface Course {
  readonly weights: Float64Array
  readonly direction: Float64Array
  /** w + t d; n */
  weightsAt(t: number): Float64Array
  /** s(t) */
  volatilityAt(t: number): number
  /** t of least risk, -d'Cw / d'Cd; null where d'Cd is 0 by rounding: risk is the same all along */
  readonly leastAt: number | null
  /** ds/dt at t = 0; null where the book there has no risk: there it has a corner */
  readonly slope: number | null
  /** Sum of the contributions of these positions at t; 0 where there is no risk. */
  contributionAt(members: ArrayLike<number>, t: number): number
  /** The same as a share of the volatility; null where there is no risk. */
  shareAt(members: ArrayLike<number>, t: number): number | null
  /** All t at which these positions have this share of risk. */
  sharesReach(members: ArrayLike<number>, share: number): Reach
  /** All t at which the volatility is this: at most one to either side of the least. */
  volatilityReach(volatility: number): Reach
}

/**
 * A sum of terms that cancel below this share of their size has lost four of its sixteen digits: the model is asked again, at the weights
 * themselves, where it adds up squares and loses none.
 */
const CANCELLED = 1e-4

/** Weights, or changes of them, with what the model makes of them; nothing where rounding alone could have made it. */
interface Side {
  readonly values: Float64Array
  /** C x */
  readonly marginals: Float64Array
  /** x'C x */
  readonly variance: number
}

function sideOf(model: RiskModel, values: Float64Array): Side {
  const kept = values.slice()
  const { marginals, variance } = model.apply(kept)
  if (variance > roundingOfVariance(model, kept)) return { values: kept, marginals, variance }
  return { values: kept, marginals: marginals.fill(0), variance: 0 }
}

const dot = (a: Float64Array, b: Float64Array) => {
  let sum = 0
  for (let i = 0; i < a.length; i++) sum += a[i]! * b[i]!
  return sum
}

/**
 * The risk along a line of weights, in closed form.
 *
 *   s(t)^2 = w'Cw + 2 t d'Cw + t^2 d'Cd
 *   share of a set M at t = sum over M of (w_i + t d_i)(Cw + t Cd)_i / s(t)^2, a ratio of two quadratics
 *
 * So the weight of least risk, those of a given volatility and those at which a set has a given share are roots of quadratics.
 *
 * @param weights    n; at t = 0
 * @param direction  n; change of weights for each unit of t, financing included
 * @throws Fault     "shape" | "not-a-number" | "negative-variance" | "out-of-range"; its questions: "not-a-number" (t or a share that is no
 *                   number) | "out-of-range" (a volatility below 0, a member that is no position)
 * @source           definition; roots by the form that does not subtract: Press, Teukolsky, Vetterling & Flannery (2007), Numerical Recipes, section
 *                   5.6 (from memory)
 * @cost             two passes of the model; a question is O(n), with one to four passes more for each root it confirms or wherever risk cancels
 * @example          courseOf(matrixModel(Float64Array.of(.04, .01, .01, .09), 2), Float64Array.of(.5, .5), Float64Array.of(1, -1)).leastAt // 0.2273
 * @example          courseOf(matrixModel(Float64Array.of(.04, 0, 0, .04), 2), Float64Array.of(.5, .5), Float64Array.of(1, 0)).sharesReach([0], .2).at // [-0.75, -0.25]
 */
export function courseOf(model: RiskModel, weights: Float64Array, direction: Float64Array): Course {
  const { size } = model
  checkBlock(weights, size, 1, 'weights')
  checkBlock(direction, size, 1, 'direction')
  const w = sideOf(model, weights)
  const d = sideOf(model, direction)
  const deviations = model.variances().map(Math.sqrt)
  const across = d.variance === 0 ? 0 : dot(d.values, w.marginals)
  // n products, each to one rounding
  const blur = size * Number.EPSILON

  const weightsAt = (t: number) => w.values.map((weight, i) => weight + t * d.values[i]!)
  const figuresAt = (t: number) => {
    checkNumber(t, 'the change')
    const twice = 2 * t * across
    const square = t * t * d.variance
    const variance = w.variance + twice + square
    if (variance > CANCELLED * (w.variance + Math.abs(twice) + square)) {
      const volatility = Math.sqrt(variance)
      const part = (i: number) => (w.values[i]! + t * d.values[i]!) * (w.marginals[i]! + t * d.marginals[i]!)
      return { volatility, contribution: (members: ArrayLike<number>) => sumOver(members, part) / volatility }
    }
    const { volatility, contribution } = decompose(model, weightsAt(t))
    return {
      volatility,
      contribution: (members: ArrayLike<number>) => sumOver(members, (i) => contribution[i]!),
    }
  }
  const shareAt = (members: ArrayLike<number>, t: number) => {
    const { volatility, contribution } = figuresAt(t)
    return volatility === 0 ? null : contribution(members) / volatility
  }
  const checked = (members: ArrayLike<number>) => {
    for (let k = 0; k < members.length; k++) checkPosition(size, members[k]!, 'members')
    return members
  }
  /** The sum of stand-alone risks of weights, which is what rounding is measured beside. */
  const grossOf = (values: Float64Array, members?: ArrayLike<number>) => {
    const part = (i: number) => Math.abs(values[i]!) * deviations[i]!
    return members ? sumOver(members, part) : values.reduce((sum, _, i) => sum + part(i), 0)
  }

  return {
    weights: w.values,
    direction: d.values,
    weightsAt: (t) => weightsAt(checkNumber(t, 'the change')),
    volatilityAt: (t) => figuresAt(t).volatility,
    leastAt: d.variance === 0 ? null : w.variance === 0 ? 0 : -across / d.variance,
    slope: w.variance === 0 ? (d.variance === 0 ? 0 : null) : across / Math.sqrt(w.variance),
    contributionAt: (members, t) => figuresAt(t).contribution(checked(members)),
    shareAt: (members, t) => shareAt(checked(members), t),

    sharesReach(members, share) {
      checked(members)
      checkNumber(share, 'the share')
      const term = (a: Float64Array, b: Float64Array) => sumOver(members, (i) => a[i]! * b[i]!)
      const [allW, allD] = [grossOf(w.values), grossOf(d.values)]
      const [setW, setD] = [grossOf(w.values, members), grossOf(d.values, members)]
      const L = Math.abs(share)
      // sum over the set less share x variance; what is no more than rounding of its terms is none
      const coefficient = (value: number, size: number) => (Math.abs(value) <= blur * size ? 0 : value)
      const square = coefficient(term(d.values, d.marginals) - share * d.variance, (setD + L * allD) * allD)
      const linear = coefficient(
        term(d.values, w.marginals) + term(w.values, d.marginals) - 2 * share * across,
        setD * allW + setW * allD + 2 * L * allD * allW,
      )
      const constant = coefficient(term(w.values, w.marginals) - share * w.variance, (setW + L * allW) * allW)
      if (square === 0 && linear === 0 && constant === 0)
        return { at: [], everywhere: w.variance > 0 || d.variance > 0 }
      const missedBy = (t: number) => {
        const found = shareAt(members, t)
        return found === null ? Infinity : found - share
      }
      const at = rootsOf(square, linear, constant, blur).flatMap((root) => {
        const t = refined(root, missedBy, (t, missed) => {
          const variance = w.variance + 2 * t * across + t * t * d.variance
          return (missed * variance) / (2 * square * t + linear)
        })
        const values = weightsAt(t)
        // a share is known to the rounding of its parts, which stand-alone risks measure
        const hedged = Math.max(1, grossOf(values) / Math.max(figuresAt(t).volatility, Number.MIN_VALUE))
        return Math.abs(missedBy(t)) <= 1e-11 * hedged * (1 + L) ? [t] : []
      })
      return { at: ascending(at), everywhere: false }
    },

    volatilityReach(volatility) {
      if (!(checkNumber(volatility, 'the volatility') >= 0))
        throw new Fault('out-of-range', `volatility ${volatility}`, 'a volatility of 0 or more is needed')
      const today = Math.sqrt(w.variance)
      // a difference of squares that keeps its digits
      const constant = (today - volatility) * (today + volatility)
      if (d.variance === 0)
        return {
          at: [],
          everywhere: Math.abs(today - volatility) <= blur * Math.max(today, volatility),
        }
      const at = rootsOf(d.variance, 2 * across, constant, blur).flatMap((root) => {
        const missedBy = (t: number) => figuresAt(t).volatility - volatility
        const t = refined(root, missedBy, (t, missed) => (missed * volatility) / (across + t * d.variance))
        const gross = grossOf(weightsAt(t))
        const missed = Math.abs(missedBy(t))
        // near no risk at all, what counts as none is the model's own rounding
        return missed <= 1e-11 * volatility + 1e-13 * gross || missed <= 2 * Math.sqrt(model.rounding) * gross
          ? [t]
          : []
      })
      return { at: ascending(at), everywhere: false }
    },
  }
}

function sumOver(members: ArrayLike<number>, part: (i: number) => number): number {
  let sum = 0
  for (let k = 0; k < members.length; k++) sum += part(members[k]!)
  return sum
}

function checkNumber(value: number, what: string): number {
  if (Number.isFinite(value)) return value
  throw new Fault('not-a-number', `${what}: ${value}`, 'a finite number is needed')
}

const ascending = (values: readonly number[]) =>
  [...values].sort((a, b) => a - b).filter((value, k, sorted) => k === 0 || value !== sorted[k - 1])

/** The real roots of a t^2 + b t + c; a discriminant below zero by no more than rounding is a double root. */
function rootsOf(a: number, b: number, c: number, blur: number): number[] {
  const scale = Math.max(Math.abs(a), Math.abs(b), Math.abs(c))
  const [A, B, C] = [a / scale, b / scale, c / scale]
  if (A === 0) return B === 0 ? [] : [-C / B]
  const discriminant = B * B - 4 * A * C
  if (discriminant < -4 * blur * (B * B + Math.abs(4 * A * C))) return []
  // both terms of one sign, so that nothing is subtracted
  const q = -(B + (B < 0 ? -1 : 1) * Math.sqrt(Math.max(discriminant, 0))) / 2
  return (q === 0 ? [0] : [q / A, C / q]).filter(Number.isFinite)
}

/** A root brought nearer by Newton's steps for as long as they help, four at most. */
function refined(
  root: number,
  missedBy: (t: number) => number,
  step: (t: number, missed: number) => number,
): number {
  let t = root
  let missed = missedBy(t)
  for (let k = 0; k < 4 && missed !== 0 && Number.isFinite(missed); k++) {
    const next = t - step(t, missed)
    if (!Number.isFinite(next)) break
    const missedNext = missedBy(next)
    if (!(Math.abs(missedNext) < Math.abs(missed))) break
    t = next
    missed = missedNext
  }
  return t
}

/** What sensitivities of the book before a trade make of it, to stand beside the figures after it. Scaled as the decompositions are. */
export interface FirstOrder {
  readonly volatility: number
  /** n; adds up to the volatility */
  readonly contribution: Float64Array
}

/**
 * First-order estimate of volatility and contributions after a trade, from the book before it. With δ the changes of weights, m the marginal
 * contributions and s the volatility before:
 *
 *   volatility     s + m'δ
 *   contribution   c_i + δ_i m_i + w_i (Cδ)_i / s - c_i m'δ / s
 *
 * Cδ is the difference of C w after and before, so that no pass is needed beyond the two decompositions.
 *
 * @param after    of the same model, scaled alike
 * @returns        null where the book before has no risk: there risk has no slope
 * @throws Fault   "shape" | "out-of-range" (scaled differently)
 * @source         Taylor's theorem on Euler's contributions, Tasche (2008), arXiv:0708.2542
 * @cost           O(n)
 * @example        firstOrder(decompose(matrixModel(Float64Array.of(.04, 0, 0, .01), 2), Float64Array.of(.5, .5)), decompose(matrixModel(Float64Array.of(.04, 0, 0, .01), 2), Float64Array.of(.6, .5))).volatility // 0.12969
 */
export function firstOrder(before: Decomposition, after: Decomposition): FirstOrder | null {
  const size = before.weights.length
  checkBlock(after.weights, size, 1, 'weights')
  if (before.periodsPerYear !== after.periodsPerYear)
    throw new Fault(
      'out-of-range',
      `figures scaled to ${before.periodsPerYear} and to ${after.periodsPerYear} periods in a year`,
      'both scaled alike are needed',
    )
  const { marginal, volatility } = before
  if (marginal === null) return null
  const contribution = new Float64Array(size)
  let change = 0
  for (let i = 0; i < size; i++) change += (after.weights[i]! - before.weights[i]!) * marginal[i]!
  for (let i = 0; i < size; i++) {
    const m = marginal[i]!
    const w = before.weights[i]!
    const ofChanges = (after.marginal ? after.marginal[i]! * after.volatility : 0) - m * volatility
    contribution[i] =
      before.contribution[i]! +
      (after.weights[i]! - w) * m +
      (w * ofChanges - before.contribution[i]! * change) / volatility
  }
  return { volatility: volatility + change, contribution }
}

/**
 * The courses of every position with one financing: t is the change of its weight, d_i = 1. Quadratics for all n from one pass (two where one
 * position finances).
 */
interface Courses {
  readonly book: Side
  /** s */
  readonly volatility: number
  /** d'C w for each position; NaN where the financing cannot serve it */
  readonly across: Float64Array
  /** d'C d, likewise */
  readonly square: Float64Array
  /** turnover of one unit of t */
  readonly turnover: Float64Array
  /** how far a sale can go (t down to less this) before a position that is held long, or not at all, turns short */
  readonly saleUntilShort: Float64Array
  /** the same for a purchase, whose financing sells */
  readonly purchaseUntilShort: Float64Array
  /** exact volatility at t along the course of a position, and its change from today's, both careful where they cancel */
  at(position: number, t: number): { readonly volatility: number; readonly change: number }
}

function coursesOf(model: RiskModel, weights: Float64Array, financing: Financing): Courses {
  const { size } = model
  checkBlock(weights, size, 1, 'weights')
  const book = sideOf(model, weights)
  const { values: w, marginals: g, variance } = book
  const variances = model.variances()
  const volatility = Math.sqrt(variance)
  const across = new Float64Array(size)
  const square = new Float64Array(size)
  const perUnit = new Float64Array(size).fill(1)
  const saleUntilShort = w.map((weight) => (weight < 0 ? Infinity : weight))
  const purchaseUntilShort = new Float64Array(size).fill(Infinity)
  const blur = size * Number.EPSILON
  /** risk of the two sides of a unit, as if nothing between them cancelled */
  const scale = variances.map(Math.sqrt)
  // a square that is rounding of its two sides: risk does not change along this course
  const settle = (i: number, sides: number) => {
    scale[i] = sides
    if (square[i]! > blur * sides * sides) return
    square[i] = 0
    across[i] = 0
  }

  if (financing.kind === 'cash') {
    across.set(g)
    square.set(variances)
  } else if (financing.kind === 'position') {
    const { position: j } = financing
    checkPosition(size, j, 'financing')
    const unit = new Float64Array(size)
    unit[j] = 1
    const { marginals: column } = model.apply(unit)
    for (let i = 0; i < size; i++) {
      across[i] = g[i]! - g[j]!
      square[i] = variances[i]! + variances[j]! - 2 * column[i]!
      purchaseUntilShort[i] = w[j]! < 0 ? Infinity : w[j]!
      settle(i, Math.sqrt(variances[i]!) + Math.sqrt(variances[j]!))
    }
    across[j] = square[j] = NaN
  } else {
    const longOfOthers = sumOfOthers(w.map((weight) => Math.max(weight, 0)))
    const shortOfOthers = sumOfOthers(w.map((weight) => Math.max(-weight, 0)))
    for (let i = 0; i < size; i++) {
      const weight = w[i]!
      const restLong = longOfOthers[i]!
      const restShort = shortOfOthers[i]!
      const net = restLong - restShort
      if (!canFinance(net, restLong + restShort)) {
        across[i] = square[i] = NaN
        continue
      }
      const own = Math.abs(weight) * Math.sqrt(variances[i]!)
      const restVariance = variance - 2 * weight * g[i]! + weight * weight * variances[i]!
      if (restVariance > CANCELLED * (volatility + own) ** 2) {
        across[i] = g[i]! - (variance - weight * g[i]!) / net
        square[i] = variances[i]! - (2 * (g[i]! - weight * variances[i]!)) / net + restVariance / (net * net)
        settle(i, Math.sqrt(variances[i]!) + (volatility + own) / Math.abs(net))
      } else {
        // the position is nearly all of the book's risk, or hedges nearly all of the others': what it leaves has to be asked for
        const unit = new Float64Array(size)
        unit[i] = 1
        const direction = sideOf(model, financed(w, unit, financing).changes)
        across[i] = dot(direction.values, g)
        square[i] = direction.variance
        settle(i, 2 * Math.sqrt(variances[i]!) + Math.sqrt(direction.variance))
      }
      // a unit bought is financed by the rest's longs and shorts, which move against each other
      const [against, along] = net > 0 ? [restLong, restShort] : [restShort, restLong]
      perUnit[i] = Math.max(1 + along / Math.abs(net), against / Math.abs(net))
      if (net > 0) purchaseUntilShort[i] = net
      else if (restLong > 0) saleUntilShort[i] = Math.min(saleUntilShort[i]!, -net)
    }
  }
  return {
    book,
    volatility,
    across,
    square,
    turnover: perUnit,
    saleUntilShort,
    purchaseUntilShort,
    at(position, t) {
      if (variance === 0 && t === 0) return { volatility: 0, change: 0 }
      const difference = t * (2 * across[position]! + t * square[position]!)
      const then = variance + difference
      if (then > CANCELLED * (volatility + Math.abs(t) * scale[position]!) ** 2) {
        const after = Math.sqrt(then)
        // not after - volatility: a small position's change would be rounding
        return { volatility: after, change: difference / (after + volatility) }
      }
      const wanted = new Float64Array(size)
      wanted[position] = t
      const { changes } = financed(w, wanted, financing)
      const after = decompose(
        model,
        changes.map((change, i) => (i === position && t === -w[i]! ? 0 : w[i]! + change)),
      ).volatility
      return { volatility: after, change: after - volatility }
    },
  }
}

/** For each value the sum of all others, without subtracting it from the sum of all. */
function sumOfOthers(values: Float64Array): Float64Array {
  const sums = new Float64Array(values.length)
  for (let i = 1, before = 0; i < values.length; i++) sums[i] = before += values[i - 1]!
  for (let i = values.length - 2, after = 0; i >= 0; i--) sums[i]! += after += values[i + 1]!
  return sums
}

/** What removing each position does to risk; n each, per period. */
export interface Removals {
  /** volatility without the position; NaN where the financing cannot serve */
  readonly volatility: Float64Array
  /** that less today's volatility */
  readonly change: Float64Array
}

/**
 * Change in risk if each position is removed, its proceeds going where the financing says.
 *
 *   s'^2 = w'Cw - 2 w_i d'Cw + w_i^2 d'Cd,   with cash: w'Cw - 2 w_i (Cw)_i + w_i^2 C_ii
 *
 * NaN where the rest of the book cannot take the proceeds (see `financed`), and for the position that finances.
 *
 * @throws Fault   "shape" | "not-a-number" | "negative-variance" | "out-of-range"
 * @source         Tasche (2008), arXiv:0708.2542 (with-and-without principle); Jorion (2007), Value at Risk, ch. 7 (from memory)
 * @cost           one pass of the model and O(n) for all positions, a second pass where one position finances; one more for each position
 *                 that hedges almost all of the others' risk or carries almost all of it
 * @example        removals(matrixModel(Float64Array.of(.04, 0, 0, .01), 2), Float64Array.of(.5, .5), { kind: 'cash' }).volatility // [0.05, 0.1]
 * @example        removals(matrixModel(Float64Array.of(.04, 0, 0, .01), 2), Float64Array.of(.5, .5), { kind: 'pro rata' }).volatility // [0.1, 0.2]
 */
export function removals(model: RiskModel, weights: Float64Array, financing: Financing): Removals {
  const courses = coursesOf(model, weights, financing)
  const volatility = new Float64Array(model.size)
  const change = new Float64Array(model.size)
  for (let i = 0; i < model.size; i++) {
    const without = Number.isNaN(courses.across[i]!)
      ? { volatility: NaN, change: NaN }
      : courses.at(i, -weights[i]!)
    volatility[i] = without.volatility
    change[i] = without.change
  }
  return { volatility, change }
}

/** A trade that lowers risk, with how much it does at once and how far it can go. Per period. */
export interface LoweringTrade {
  readonly position: number
  /** the position on the other side of a pair; null where the financing is the other side */
  readonly against: number | null
  /** ds for each unit of turnover, at once; below 0 */
  readonly perTurnover: number
  /** change of the position's weight where risk stops falling or the trade has to end; above 0 a purchase */
  readonly change: number
  /** turnover until there */
  readonly turnover: number
  /** volatility there */
  readonly volatility: number
  /** that less today's; below 0 */
  readonly volatilityChange: number
  /** why it ends there: more would raise risk again, or a long position would turn short */
  readonly end: 'least risk' | 'weight 0'
}

/** Whether a position that is long, or not held, may turn short. */
export type Shorting = 'no shorting' | 'shorting'

/**
 * The trade in each position that lowers risk, by risk lowered for each unit of turnover.
 *
 *   ds/dt = d'Cw / s,   per unit of turnover: -|ds/dt| / turnover of d;   risk stops falling at t = -d'Cw / d'Cd
 *
 * with t the change of the position's weight and d what it and its financing change for each unit; a purchase where ds/dt is below 0, a
 * sale where it is above.
 *
 * @param shorting   "no shorting": trades that would open a short position are left out, others end where a weight reaches 0
 * @returns          steepest first, with the positions that this financing cannot serve; none where the book has no risk
 * @throws Fault     "shape" | "not-a-number" | "negative-variance" | "out-of-range"
 * @source           slope: Maillard, Roncalli & Teiletche (2010), JPM 36(4) (marginal contribution); order by turnover: common practice, no source
 * @cost             one pass of the model and O(n log n), a second pass where one position finances
 * @example          loweringTrades(matrixModel(Float64Array.of(.04, 0, 0, .01), 2), Float64Array.of(.5, .5), { kind: 'cash' }, 'no shorting').trades.map(({ perTurnover }) => perTurnover) // [-0.17889, -0.04472]
 */
export function loweringTrades(
  model: RiskModel,
  weights: Float64Array,
  financing: Financing,
  shorting: Shorting,
): { readonly trades: readonly LoweringTrade[]; readonly unfinanced: readonly number[] } {
  const courses = coursesOf(model, weights, financing)
  const trades: LoweringTrade[] = []
  const unfinanced: number[] = []
  for (let i = 0; i < model.size; i++) {
    const across = courses.across[i]!
    if (financing.kind === 'position' && financing.position === i) continue
    if (Number.isNaN(across)) unfinanced.push(i)
    // what is no slope: rounding of a marginal contribution that is 0
    else if (
      Math.abs(across) >
      model.size * Number.EPSILON * courses.volatility * Math.sqrt(courses.square[i]!)
    ) {
      const least = -across / courses.square[i]!
      const until = least < 0 ? courses.saleUntilShort[i]! : courses.purchaseUntilShort[i]!
      const free = shorting === 'shorting' || Math.abs(least) <= until
      const change = free ? least : Math.sign(least) * until
      if (change === 0) continue
      const { volatility, change: volatilityChange } = courses.at(i, change)
      trades.push({
        position: i,
        against: null,
        perTurnover: -Math.abs(across) / (courses.volatility * courses.turnover[i]!),
        change,
        turnover: Math.abs(change) * courses.turnover[i]!,
        volatility,
        volatilityChange,
        end: free ? 'least risk' : 'weight 0',
      })
    }
  }
  return { trades: steepestFirst(trades), unfinanced }
}

const steepestFirst = (trades: LoweringTrade[]) => trades.sort((a, b) => a.perTurnover - b.perTurnover)

/**
 * The pairs, one position sold and another bought for the same amount, that lower risk most for each unit of turnover.
 *
 *   ds / dt = m_j - m_i for t sold of i and bought of j;   d'Cd = C_ii + C_jj - 2 C_ij
 *
 * @param most       how many pairs, a whole number
 * @param shorting   "no shorting": only what is held long is sold, down to weight 0
 * @returns          steepest first: `position` is sold (its change is below 0), `against` bought; none where the book has no risk
 * @throws Fault     "shape" | "not-a-number" | "negative-variance" | "out-of-range"
 * @source           as loweringTrades
 * @cost             one pass of the model, and one for each position sold
 * @example          loweringPairs(matrixModel(Float64Array.of(.04, 0, 0, .01), 2), Float64Array.of(.5, .5), 'no shorting', 3)[0].change // -0.3
 */
export function loweringPairs(
  model: RiskModel,
  weights: Float64Array,
  shorting: Shorting,
  most: number,
): readonly LoweringTrade[] {
  if (!Number.isInteger(most) || most < 1)
    throw new Fault('out-of-range', `pairs: ${most}`, 'a whole number of 1 or more is needed')
  const { marginal } = decompose(model, weights)
  if (marginal === null) return []
  const order = Array.from(marginal.keys()).sort((a, b) => marginal[b]! - marginal[a]!)
  // the steepest pairs are among these, since every other sale has `most` sales at least as steep before it, and every other purchase likewise
  const sold = order.filter((i) => shorting === 'shorting' || weights[i]! > 0).slice(0, most)
  const bought = order.slice(-most)
  const pairs = sold
    .flatMap((i) => bought.map((j) => ({ i, j, slope: marginal[j]! - marginal[i]! })))
    .filter(({ slope }) => slope < 0)
    .sort((a, b) => a.slope - b.slope)
    .slice(0, most)
  const coursesAgainst = new Map<number, Courses>()
  return steepestFirst(
    pairs.flatMap(({ i, j }): LoweringTrade[] => {
      const courses = coursesAgainst.get(i) ?? coursesOf(model, weights, { kind: 'position', position: i })
      coursesAgainst.set(i, courses)
      // the course of j, financed by i
      const [across, square] = [courses.across[j]!, courses.square[j]!]
      if (!(across < 0)) return []
      const least = -across / square
      const free = shorting === 'shorting' || least <= weights[i]!
      const change = free ? least : weights[i]!
      const { volatility, change: volatilityChange } = courses.at(j, change)
      return [
        {
          position: i,
          against: j,
          perTurnover: across / courses.volatility,
          change: -change,
          turnover: change,
          volatility,
          volatilityChange,
          end: free ? 'least risk' : 'weight 0',
        },
      ]
    }),
  )
}
