import { checkBlock, Fault } from './fault'
import type { RiskModel } from './risk-model'

/** What weights may be: each within its bounds, all together of one sum. */
export interface WeightBounds {
  /** n; -Infinity for none */
  readonly lower: Float64Array
  /** n; Infinity for none */
  readonly upper: Float64Array
  readonly sum: number
}

/** The weights of least variance within bounds, or that no weights lie within them. */
export type LeastVariance =
  | {
      readonly feasible: false
      /** The sums that the bounds allow. */
      readonly lowest: number
      readonly highest: number
    }
  | {
      readonly feasible: true
      /** n; at a bound to the bit where they are at one */
      readonly weights: Float64Array
      readonly variance: number
      /** -1 at the lower bound, 1 at the upper one, 0 between; at both, where they are the same: -1. */
      readonly at: Int8Array
      /** The (C w)_i that all positions between their bounds have in common, m; 0 where no position can move. */
      readonly multiplier: number
      /**
       * How far the conditions of a minimum fail: (C w)_i = m between the bounds, no less than m at a lower and no more at an upper
       * one. The largest amount in units of the position's correlation with the portfolio, (C w)_i / (sigma_i s); beside 1e-5 of the
       * sum of stand-alone risks where s is less than that.
       */
      readonly residual: number
      /** Whether the residual is at most 1e-7. */
      readonly converged: boolean
      /** Why it is not: rounding left nothing to gain, or the bound on the steps was reached. */
      readonly stopped: 'rounding' | 'limit' | null
      /** Steps, each of which frees a position, fixes one at a bound or moves to the minimum between. */
      readonly iterations: number
      readonly method: 'active-set'
    }

/** A residual that counts as none. */
const MET = 1e-7
/** A portfolio hedged to less than this of its stand-alone risks is measured by that: gradients are rounded beside the latter. */
const HEDGED = 1e-5
/** A pivot smaller than this beside its diagonal has lost half its digits, and is computed another way. */
const NEARLY_SINGULAR = 1e-8
const mostSteps = (size: number) => Math.min(20 * size + 100, 20000)

/**
 * The weights of least variance with a given sum and within given bounds; with bounds of 0 and 1 and a sum of 1, the long-only minimum variance.
 *
 *   minimise w'C w,   lower_i <= w_i <= upper_i,   sum of w_i = sum
 *
 * by the primal active-set method: from a corner of the bounds, the variance is minimised exactly over the positions between their bounds; the
 * position whose bound costs most is freed, one that meets a bound is fixed, and so on to the end. A singular C (more positions than
 * dates) is no obstacle: a position whose freeing would make the system singular has no cause to be freed. C is asked for the columns of
 * positions that were free at some time, and never formed.
 *
 * @returns        yields the share done, a guess. Always ends: infeasible bounds and not converging are in the result
 * @throws Fault   "shape" | "not-a-number" | "out-of-range" (a lower bound above the upper one, with its row; a sum that is no number) | what
 *                 `apply` of the model throws
 * @source         Nocedal & Wright (2006), Numerical Optimization, 2nd ed., section 16.5; that no singular system arises: Gill, Murray, Saunders
 *                 & Wright (1991), Inertia-controlling methods for general quadratic programming, SIAM Review 33(1), 1-36 (both from memory)
 * @cost           a question to the model or two and O(k^2) a step, k the positions between their bounds; steps of the order of n
 * @example        inOneGo(leastVariance(matrixModel(Float64Array.of(.04, 0, 0, .01), 2), { lower: Float64Array.of(0, 0), upper: Float64Array.of(1, 1), sum: 1 })).weights // [0.2, 0.8]
 * @example        inOneGo(leastVariance(matrixModel(Float64Array.of(.04, 0, 0, .01), 2), { lower: Float64Array.of(0, 0), upper: Float64Array.of(1, .7), sum: 1 })).weights // [0.3, 0.7]
 * @example        inOneGo(leastVariance(matrixModel(Float64Array.of(.04), 1), { lower: Float64Array.of(0), upper: Float64Array.of(.5), sum: 1 })).feasible // false
 */
export function* leastVariance(model: RiskModel, bounds: WeightBounds): Generator<number, LeastVariance> {
  checkBounds(model.size, bounds)
  const { lower, upper, sum } = bounds
  const lowest = lower.reduce((total, bound) => total + bound, 0)
  const highest = upper.reduce((total, bound) => total + bound, 0)
  const rounding = model.size * Number.EPSILON * (Math.abs(sum) + finiteSum(lower) + finiteSum(upper))
  if (lowest > sum + rounding || highest < sum - rounding) return { feasible: false, lowest, highest }

  const system = new FreeSystem(model, unitsOf(model.variances()))
  const weights = cornerOf(bounds, system.units)
  const pivot = firstFree(weights, bounds, system.units)
  if (pivot >= 0) system.add(pivot)
  let here = faceOf(system, pointAt(system, weights, sum))
  let largest = here.point.gross
  let iterations = 0
  /** steps of no length since the last one of some: only they could go round in circles */
  let still = 0
  let before = Infinity
  let stopped: 'rounding' | 'limit' | null = null
  const nothingLeft = ({ variance, gross }: Point) =>
    // a variance that rounding alone could have made, or weights that are rounding of those there were (with a sum of 0)
    variance <= model.rounding * gross * gross || gross <= model.size * Number.EPSILON * largest
  yield 0

  while (pivot >= 0 && !nothingLeft(here.point)) {
    const { uneven, point } = here
    if (iterations === mostSteps(model.size)) {
      stopped = 'limit'
      break
    }
    iterations++
    // a step over the same free positions that does not halve what the last one left is rounding at work
    if (uneven > point.rounding && uneven < before / 2) {
      before = uneven
      const { blocking, length } = moveInPlace(weights, system, here.step, bounds)
      if (blocking >= 0) {
        system.remove(blocking)
        before = Infinity
        still = length === 0 ? still + 1 : 0
      }
      here = faceOf(system, pointAt(system, weights, sum))
      largest = Math.max(largest, here.point.gross)
    } else {
      const costs = costsOf(here, system, weights, bounds)
      if (!freeOne(system, costs, point.rounding, still > model.size)) break
      before = Infinity
      here = faceOf(system, point)
    }
    yield iterations / (iterations + model.size)
  }

  const { point, slope } = here
  const worst = costsOf(here, system, weights, bounds).reduce(
    (most, cost) => Math.max(most, cost),
    here.uneven,
  )
  const reference = Math.max(Math.sqrt(point.variance), HEDGED * point.gross)
  const residual = pivot < 0 || nothingLeft(point) ? 0 : worst / reference
  const converged = residual <= MET
  return {
    feasible: true,
    weights,
    variance: point.variance,
    at: Int8Array.from(weights, (weight, i) => (weight === lower[i] ? -1 : weight === upper[i] ? 1 : 0)),
    multiplier: slope / system.length,
    residual,
    converged,
    stopped: converged ? null : (stopped ?? 'rounding'),
    iterations,
    method: 'active-set',
  }
}

function checkBounds(size: number, { lower, upper, sum }: WeightBounds): void {
  for (const [argument, values] of Object.entries({ lower, upper })) {
    // infinite bounds are none
    checkBlock(
      values.map((bound) => (Math.abs(bound) === Infinity ? 0 : bound)),
      size,
      1,
      argument,
    )
  }
  for (let row = 0; row < size; row++) {
    if (lower[row]! <= upper[row]! && lower[row]! < Infinity && upper[row]! > -Infinity) continue
    throw new Fault(
      'out-of-range',
      `lower: ${lower[row]} with an upper bound of ${upper[row]}`,
      'a lower bound that is no more than the upper one is needed',
      { argument: 'lower', row },
    )
  }
  if (!Number.isFinite(sum)) {
    throw new Fault('not-a-number', `sum: ${sum}`, 'a finite number is needed', { argument: 'sum' })
  }
}

const finiteSum = (bounds: Float64Array) =>
  bounds.reduce((total, bound) => total + (Number.isFinite(bound) ? Math.abs(bound) : 0), 0)

/** What weights are counted in: each position's volatility, so that all are alike; for riskless ones the smallest there is. */
function unitsOf(variances: Float64Array): Float64Array {
  const smallest = variances.reduce((least, v) => (v > 0 ? Math.min(least, v) : least), Infinity)
  return variances.map((v) => Math.sqrt(v > 0 ? v : smallest < Infinity ? smallest : 1))
}

/** From the least volatile position on. */
const inOrder = (units: Float64Array) =>
  Int32Array.from(units.keys()).sort((a, b) => units[a]! - units[b]! || a - b)

/** Weights at their bounds but for one at most (and 0 where there are none), with the right sum: the least volatile positions filled first. */
function cornerOf({ lower, upper, sum }: WeightBounds, units: Float64Array): Float64Array {
  const weights = lower.map((bound, i) => (bound > -Infinity ? bound : Math.min(0, upper[i]!)))
  let gap = sum - weights.reduce((total, weight) => total + weight, 0)
  for (const i of inOrder(units)) {
    const bound = gap > 0 ? upper[i]! : lower[i]!
    if (Math.abs(bound - weights[i]!) >= Math.abs(gap)) {
      weights[i] = weights[i]! + gap
      break
    }
    gap -= bound - weights[i]!
    weights[i] = bound
  }
  return weights
}

/** The position between its bounds, else the least volatile that can move at all; -1: none. */
function firstFree(weights: Float64Array, { lower, upper }: WeightBounds, units: Float64Array): number {
  const between = weights.findIndex((weight, i) => weight > lower[i]! && weight < upper[i]! && weight !== 0)
  return between >= 0 ? between : (inOrder(units).find((i) => lower[i]! < upper[i]!) ?? -1)
}

/**
 * The positions between their bounds, in units x_i = u_i w_i, and what solves A x = b over them: A = R + c c', R = C in these units and c the
 * direction of the sum. With the sum fixed, c c' changes no variance and makes A regular wherever the minimum is unique. Its Cholesky factor
 * follows each position that comes or goes.
 */
class FreeSystem {
  readonly free: number[] = []
  /** c_i = a_i / |a|, a_i = 1 / u_i: a'x is the sum of the weights */
  readonly direction: Float64Array
  readonly length: number
  readonly #variances: Float64Array
  /** lower triangle; row k has k + 1 numbers */
  readonly #rows: Float64Array[] = []
  /** columns of C asked for so far */
  readonly #columns = new Map<number, Float64Array>()

  constructor(
    readonly model: RiskModel,
    readonly units: Float64Array,
  ) {
    this.#variances = model.variances()
    // scaled: the inverse of a small volatility may be large
    const smallest = units.reduce((least, unit) => Math.min(least, unit), Infinity)
    const relative = units.map((unit) => smallest / unit)
    const length = Math.sqrt(relative.reduce((total, r) => total + r * r, 0))
    this.direction = relative.map((r) => r / length)
    this.length = length / smallest
  }

  /** Frees a position; false where A would be singular, which leaves all as it was. */
  add(position: number): boolean {
    const { units, direction } = this
    const column = this.#column(position)
    const unit = units[position]!
    const row = new Float64Array(this.free.length + 1)
    this.free.forEach((other, k) => {
      row[k] = column[other]! / unit / units[other]! + direction[position]! * direction[other]!
    })
    const own = this.#variances[position]! / (unit * unit) + direction[position]! ** 2
    let pivot = own
    for (let k = 0; k < this.free.length; k++) {
      const known = this.#rows[k]!
      let left = row[k]!
      for (let l = 0; l < k; l++) left -= known[l]! * row[l]!
      left /= known[k]!
      row[k] = left
      pivot -= left * left
    }
    if (pivot < NEARLY_SINGULAR * own) pivot = this.#curvature(position, row.subarray(0, -1))
    if (!(pivot > 0)) return false
    row[row.length - 1] = Math.sqrt(pivot)
    this.free.push(position)
    this.#rows.push(row)
    return true
  }

  /**
   * A pivot by what it means: the curvature along the step that frees the position while all others stay at their minimum. A model of returns
   * tells the variance of such a step far better than a difference of covariances would; 0 where it cannot tell it from none.
   */
  #curvature(position: number, row: Float64Array): number {
    const { model, units, direction, free } = this
    const step = new Float64Array(model.size)
    const others = this.#backward(row.slice())
    free.forEach((other, k) => (step[other] = -others[k]! / units[other]!))
    step[position] = 1 / units[position]!
    const { variance } = model.apply(step)
    const gross = others.reduce((total, x) => total + Math.abs(x), 1)
    const along = free.reduce(
      (total, other, k) => total - others[k]! * direction[other]!,
      direction[position]!,
    )
    const told = variance > model.rounding * gross * gross ? variance : 0
    const ofSum = Math.abs(along) > model.size * Number.EPSILON * gross ? along * along : 0
    return told + ofSum
  }

  remove(position: number): void {
    const at = this.free.indexOf(position)
    this.free.splice(at, 1)
    const rows = this.#rows
    rows.splice(at, 1)
    // each row below has one number too many: rotations of neighbouring columns take it away (Golub & Van Loan 2013, 6.5.4)
    for (let k = at; k < rows.length; k++) {
      const [a, b] = [rows[k]![k]!, rows[k]![k + 1]!]
      const radius = Math.hypot(a, b)
      const [cosine, sine] = [a / radius, b / radius]
      for (let r = k; r < rows.length; r++) {
        const row = rows[r]!
        const [left, right] = [row[k]!, row[k + 1]!]
        row[k] = cosine * left + sine * right
        row[k + 1] = cosine * right - sine * left
      }
    }
    for (let k = at; k < rows.length; k++) rows[k] = rows[k]!.slice(0, k + 1)
  }

  /** A^-1 b over the free positions, b and the result one number for each of these. */
  solve(b: Float64Array): Float64Array {
    const x = b.slice()
    for (let k = 0; k < x.length; k++) {
      const row = this.#rows[k]!
      let left = x[k]!
      for (let l = 0; l < k; l++) left -= row[l]! * x[l]!
      x[k] = left / row[k]!
    }
    return this.#backward(x)
  }

  /** The second half of it; x is used up. */
  #backward(x: Float64Array): Float64Array {
    for (let k = x.length - 1; k >= 0; k--) {
      const row = this.#rows[k]!
      const value = (x[k] = x[k]! / row[k]!)
      for (let l = 0; l < k; l++) x[l] = x[l]! - row[l]! * value
    }
    return x
  }

  #column(position: number): Float64Array {
    const known = this.#columns.get(position)
    if (known) return known
    const unit = new Float64Array(this.model.size)
    unit[position] = 1
    const column = this.model.apply(unit).marginals
    this.#columns.set(position, column)
    return column
  }
}

/** What the model says at some weights. */
interface Point {
  readonly variance: number
  /** Sum of stand-alone volatilities. */
  readonly gross: number
  /** What the weights lack of their sum. */
  readonly missing: number
  /** C w in the units of the system. */
  readonly gradient: Float64Array
  /** What rounding can make of a difference between gradients. */
  readonly rounding: number
}

function pointAt({ model, units }: FreeSystem, weights: Float64Array, sum: number): Point {
  const { marginals, variance } = model.apply(weights)
  let gross = 0
  let missing = sum
  for (let i = 0; i < weights.length; i++) {
    gross += Math.abs(weights[i]!) * units[i]!
    missing -= weights[i]!
  }
  return {
    variance,
    gross,
    missing,
    gradient: marginals.map((marginal, i) => marginal / units[i]!),
    rounding: 1e-13 * Math.sqrt(variance) + weights.length * Number.EPSILON * gross,
  }
}

/** A point seen from the positions that are free. */
interface Face {
  readonly point: Point
  /** What all gradients have in common, as a multiple of the direction of the sum. */
  readonly slope: number
  /** The step to the minimum over the free positions, one number for each. */
  readonly step: Float64Array
  /** Largest difference of a free position's gradient from what all have in common. */
  readonly uneven: number
}

function faceOf(system: FreeSystem, point: Point): Face {
  const { free, direction } = system
  const gradient = Float64Array.from(free, (i) => point.gradient[i]!)
  const ofSum = Float64Array.from(free, (i) => direction[i]!)
  const [y, z] = [system.solve(gradient), system.solve(ofSum)]
  // A step = m c - gradient with c'step = what is missing of the sum, in its unit
  const missing = point.missing / system.length
  const m = (missing + dot(ofSum, y)) / dot(ofSum, z)
  const slope = free.length === 0 ? 0 : m - missing
  return {
    point,
    slope,
    step: y.map((value, k) => m * z[k]! - value),
    uneven: gradient.reduce((most, g, k) => Math.max(most, Math.abs(g - slope * ofSum[k]!)), 0),
  }
}

/** Goes the step, or as far as the first bound, whose position is then exactly there. */
function moveInPlace(
  weights: Float64Array,
  { free, units }: FreeSystem,
  steps: Float64Array,
  { lower, upper }: WeightBounds,
): { blocking: number; length: number } {
  let length = 1
  let blocking = -1
  free.forEach((i, k) => {
    const step = steps[k]! / units[i]!
    if (step === 0) return
    const room = Math.max(0, ((step > 0 ? upper[i]! : lower[i]!) - weights[i]!) / step)
    if (room < length) [length, blocking] = [room, i]
  })
  free.forEach((i, k) => {
    const weight = weights[i]! + length * (steps[k]! / units[i]!)
    // past a bound by rounding only: its own room was at least the length gone
    weights[i] = Math.min(upper[i]!, Math.max(lower[i]!, weight))
    if (i === blocking) weights[i] = steps[k]! > 0 ? upper[i]! : lower[i]!
  })
  return { blocking, length }
}

/** What each bound costs: the slope of risk in the direction it shuts off, less what all have in common; 0 where it costs nothing. */
function costsOf(
  { point: { gradient }, slope }: Face,
  { direction, free }: FreeSystem,
  weights: Float64Array,
  { lower, upper }: WeightBounds,
): Float64Array {
  const costs = weights.map((weight, i) => {
    const beyond = gradient[i]! - slope * direction[i]!
    const up = weight < upper[i]! ? -beyond : 0
    const down = weight > lower[i]! ? beyond : 0
    return Math.max(up, down, 0)
  })
  for (const i of free) costs[i] = 0
  return costs
}

/** Frees the position whose bound costs most, or the first that costs anything; false where there is none that can be freed. */
function freeOne(system: FreeSystem, costs: Float64Array, rounding: number, first: boolean): boolean {
  const left = costs.slice()
  for (;;) {
    let most = rounding
    let found = -1
    for (let i = 0; i < left.length && !(first && found >= 0); i++) {
      if (left[i]! > most) [most, found] = [left[i]!, i]
    }
    if (found < 0) return false
    if (system.add(found)) return true
    left[found] = 0
  }
}

function dot(a: Float64Array, b: Float64Array): number {
  let sum = 0
  for (let k = 0; k < a.length; k++) sum += a[k]! * b[k]!
  return sum
}
