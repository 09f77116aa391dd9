import { LuDecomposition, CholeskyDecomposition, Matrix } from 'ml-matrix'
import {
  addCurvature,
  columnOf,
  FEASIBLE,
  gradientOf,
  limitedBook,
  limitsHold,
  pointAt,
  residualsOf,
  sumOf,
  totalChange,
  turnoverOf,
  type ChangeProblem,
  type LimitedBook,
  type LimitResidual,
  type Point,
} from './change-limits'
import { leastCost, type LeastCost } from './linear-program'
import type { RiskModel } from './risk-model'
import { partOf } from './steps'

export interface ChangeResult {
  /**
   * "met": all limits hold, and no small further move would change less. "not found": some limit is still over at the best point that was
   * found. "stopped": the bound on iterations was reached before either was certain; the residuals say which limits hold.
   */
  readonly status: 'met' | 'not found' | 'stopped'
  /** "met": that no smaller change exists. "not found": that no weights meet all limits. False: unknown. */
  readonly proven: boolean
  readonly weights: Float64Array
  /** Sum of absolute changes of all positions. */
  readonly change: number
  /** One way: the larger of what is bought and what is sold; change / 2 where the sum of weights is kept. */
  readonly turnover: number
  /** What was minimised: `change`, without that of a chosen financing position. */
  readonly minimised: number
  /** No weights that meet all limits can have less of what was minimised; often well below what can be reached. */
  readonly leastPossible: number
  /** For each limit, in their order. */
  readonly residuals: readonly LimitResidual[]
  /** What is left over turnover's cap and the sum that is kept; 0, or rounding. */
  readonly turnoverExcess: number
  readonly sumError: number
  /** How far the weights are from a stationary point: what a small move would still save, a unit of its largest weight change. */
  readonly stationarity: number
  /** What one unit more of each limit would save of what was minimised, to first order; 0 where a limit does not bind. */
  readonly savings: Float64Array
  /** Linear programs that were solved. */
  readonly iterations: number
  /** A sentence. */
  readonly method: string
  /** What is known of the result; a sentence or two. */
  readonly note: string
}

/** A change of a weight below this is none. */
const NO_CHANGE = 1e-9
const STATIONARY = 1e-7
const MOST_ITERATIONS = 150
const MOST_CUTS = 80
/** From where else the search begins where the first end may not be the best. */
const MOST_STARTS = 4
const MOST_PUSHED = 6
/** Multiplications in linear programs (some seconds) after which no other start is made, and after which all ends. */
const ENOUGH_WORK = 2e8
const MOST_WORK = 2e10
/** Newton steps solve dense equations of as many unknowns. */
const MOST_FREE = 250

/** A book with its limits, and what the search has taken so far. */
interface Search extends LimitedBook {
  /** Linear programs, and multiplications in them. */
  readonly effort: { programs: number; work: number }
}

/**
 * The smallest total change of weights that meets all limits: a proposal to look at, no advice.
 *
 *   minimise sum |w_i - w0_i|  over  g_k(w) <= L_k,  lower <= w <= upper,  the sum of w kept (or not),  turnover <= its cap
 *
 * The sum of absolute changes is minimised because few positions move then. A sequence of linear programs in a trust region finds which limits bind and which
 * positions move; Newton steps on the conditions of a stationary point finish. Limits are added as they come into play. Points are taken or
 * refused by a filter of what is over the limits and of what changes. The search is begun from several points; the best end is returned.
 *
 * Volatility, stand-alone risk, tracking error and weight have convex limits: under them alone a stationary point is the smallest change of all, and cutting
 * planes prove it. Shares and contributions are not convex: there the result is a local optimum, and `leastPossible` a bound that ignores those limits.
 *
 * Limits are aimed at from `LIMIT_MARGIN` below. Weights that change by less than 1e-9 come back bit for bit.
 *
 * @param model   n positions
 * @returns       yields the share done; not finding any is in the result
 * @throws Fault  "shape" | "not-a-number" | "negative-variance" | "out-of-range" (bounds that cross, members, a negative turnover, a matrix with variances too
 *                large) | "unknown-choice" | "missing-data" (a limit on tracking error without benchmark) | "zero-risk" (limits on shares of a book without risk)
 * @source        Fletcher & Sainz de la Maza (1989), Nonlinear programming and nonsmooth optimization by successive linear programming,
 *                Mathematical Programming 43, 235-256; Chin & Fletcher (2003), On the global convergence of an SLP-filter algorithm that takes EQP steps,
 *                Mathematical Programming 96, 161-177; cutting planes: Kelley (1960), J. SIAM 8(4), 703-712 (all from memory)
 * @cost          a linear program and a few passes of the model for each of some tens of iterations, from a handful of starting points
 * @example       inOneGo(smallestChange(matrixModel(Float64Array.of(.04, 0, 0, .04), 2), { weights: Float64Array.of(.6, .4), limits: [{ measure: 'share', members: Int32Array.of(0), most: .5 }], financing: { kind: 'book' } })).weights // [0.5, 0.5]
 */
export function* smallestChange(model: RiskModel, problem: ChangeProblem): Generator<number, ChangeResult> {
  const search: Search = { ...limitedBook(model, problem), effort: { programs: 0, work: 0 } }
  const { origin } = search
  const here = pointAt(search, origin)
  const boundsHold = origin.every((w, i) => w >= search.lower[i]! && w <= search.upper[i]!)
  if (boundsHold && limitsHold(search, here)) {
    return resultOf(search, {
      status: 'met',
      proven: true,
      point: here,
      bound: 0,
      stationarity: 0,
      savings: new Float64Array(search.limits.length),
      starts: 0,
      note: "All limits hold at today's weights.",
    })
  }
  yield 0

  const first = yield* partOf(linearStep(search, [], null, Infinity), 0, 0)
  if (first.hardExcess > NO_CHANGE) {
    return resultOf(search, {
      status: 'not found',
      proven: true,
      point: here,
      bound: Infinity,
      stationarity: Infinity,
      savings: new Float64Array(search.limits.length),
      starts: 0,
      note: 'The bounds, the sum of weights and the turnover leave no weights at all; the figures are those of today.',
    })
  }

  let best = yield* descend(search, first.weights, 0, 0.3)
  let starts = 1
  const moved = movedIn(search, best)
  const outer = yield* partOf(outerBound(search, best.point), 0.3, 0.4)
  const contradiction =
    outer.contradiction ?? ((yield* partOf(sharesContradict(search), 0.4, 0.4)) ? SHARES_CONTRADICT : null)
  const done = () =>
    contradiction !== null ||
    search.effort.work > ENOUGH_WORK ||
    (best.point.over <= FEASIBLE && best.point.change <= outer.bound * (1 + 1e-7) + 1e-12)
  function* alsoFrom(start: Float64Array, from: number, to: number): Generator<number, void> {
    const ended = yield* descend(search, start, from, to - from)
    starts++
    movedIn(search, ended).forEach((by, i) => (moved[i]! += by))
    if (better(ended, best)) best = ended
  }
  for (let k = 0; k < MOST_STARTS && !done(); k++) {
    const [from, to] = [0.4 + (0.3 * k) / MOST_STARTS, 0.4 + (0.3 * (k + 1)) / MOST_STARTS]
    const start =
      k === 0 && outer.weights
        ? outer.weights
        : yield* partOf(elsewhere(search, first.weights, moved), from, from)
    yield* alsoFrom(start, from, to)
  }
  const order = done() ? [] : mostTelling(search, first.weights).slice(0, MOST_PUSHED)
  for (let k = 0; k < 2 * order.length && !done(); k++) {
    const [from, to] = [0.7 + (0.15 * k) / order.length, 0.7 + (0.15 * (k + 1)) / order.length]
    const start = yield* partOf(pushed(search, order[k >> 1]!, k % 2 === 0), from, from)
    if (start) yield* alsoFrom(start, from, to)
  }

  const point = polished(search, best.point)
  const holds = limitsHold(search, point)
  // limits that do not bind might as well not be there, convex or not
  const convex = best.stationary && search.limits.every((limit, k) => limit.convex || best.savings[k] === 0)
  const smallest = holds && (convex || point.change <= outer.bound * (1 + 1e-6) + NO_CHANGE)
  return resultOf(search, {
    status: holds
      ? best.stationary || smallest
        ? 'met'
        : 'stopped'
      : best.stopped && contradiction === null
        ? 'stopped'
        : 'not found',
    proven: holds ? smallest : contradiction !== null,
    point,
    bound: contradiction === null ? Math.min(outer.bound, holds ? point.change : Infinity) : Infinity,
    stationarity: best.stationarity,
    savings: best.savings,
    starts,
    note: noteOn(holds, best, smallest, contradiction),
  })
}

const SHARES_CONTRADICT = 'Shares of risk add up to 1; what these limits allow adds up to less.'

function noteOn(holds: boolean, best: Descent, smallest: boolean, contradiction: string | null): string {
  if (holds && smallest) return 'All limits hold; no smaller change meets them.'
  if (holds && best.stationary)
    return 'All limits hold; no smaller change was found nearby. Limits on shares of or contributions to risk can leave smaller ones elsewhere.'
  if (holds) return 'All limits hold; a smaller change may exist nearby: the search was stopped.'
  if (contradiction !== null) return contradiction
  if (best.stopped) return 'The search was stopped before all limits held.'
  return 'No weights that meet all limits were found; that there are none is not proven.'
}

// One step: the linear program of the limits in play ---------------------------------------------------------------------------------

/** A limit as a row: slope'w <= most, for w near where it was taken. */
interface Row {
  readonly slope: Float64Array
  readonly most: number
}

interface LinearStep {
  readonly weights: Float64Array
  readonly cost: number
  /** Left over of the rows; of the sum and the turnover. */
  readonly excess: number
  readonly hardExcess: number
  /** For each row. */
  readonly savings: Float64Array
  readonly capBinds: boolean
  readonly solved: LeastCost['status']
}

/** The smallest change within rows, bounds, sum and turnover, no weight further than a radius from where it is. */
function* linearStep(
  search: Search,
  rows: readonly Row[],
  centre: Float64Array | null,
  radius: number,
  prices: Float64Array = search.counts,
): Generator<number, LinearStep> {
  search.effort.programs++
  const { origin, lower, upper, cap, keepsSum } = search
  const n = origin.length
  const moving: number[] = []
  for (let i = 0; i < n; i++) if (lower[i]! < upper[i]!) moving.push(i)
  const capped = cap < Infinity
  const m = rows.length + (keepsSum ? 1 : 0) + (capped ? 2 : 0)
  const count = moving.length
  const columns = new Float64Array(2 * count * m)
  const costs = new Float64Array(2 * count)
  const low = new Float64Array(2 * count)
  const high = new Float64Array(2 * count)
  const most = new Float64Array(m)
  const equal = new Uint8Array(m)
  const first = new Uint8Array(m)
  const weights = origin.slice()
  let sumOfFixed = 0
  let bought = 0
  let sold = 0
  for (let i = 0; i < n; i++) {
    if (lower[i] !== upper[i]) continue
    weights[i] = lower[i]!
    sumOfFixed += lower[i]! - origin[i]!
    bought += Math.max(0, lower[i]! - origin[i]!)
    sold += Math.max(0, origin[i]! - lower[i]!)
  }
  rows.forEach(({ slope, most: limit }, r) => {
    // rows are of w, columns of changes up and down from today
    let left = limit
    for (let i = 0; i < n; i++) left -= slope[i]! * weights[i]!
    most[r] = left
  })
  const sumRow = keepsSum ? rows.length : -1
  // purchases; sales stand in the row behind
  const capRow = capped ? m - 2 : -1
  if (sumRow >= 0) {
    most[sumRow] = -sumOfFixed
    equal[sumRow] = first[sumRow] = 1
  }
  if (capRow >= 0) {
    most[capRow] = cap - bought
    most[capRow + 1] = cap - sold
    first[capRow] = first[capRow + 1] = 1
  }
  moving.forEach((i, at) => {
    const today = origin[i]!
    const floor = Math.max(lower[i]!, centre ? centre[i]! - radius : -Infinity) - today
    const ceiling = Math.min(upper[i]!, centre ? centre[i]! + radius : Infinity) - today
    low[at] = Math.max(0, floor)
    high[at] = Math.max(0, ceiling)
    low[count + at] = Math.max(0, -ceiling)
    high[count + at] = Math.max(0, -floor)
    costs[at] = costs[count + at] = prices[i]!
    const [up, down] = [at * m, (count + at) * m]
    for (let r = 0; r < rows.length; r++) {
      columns[up + r] = rows[r]!.slope[i]!
      columns[down + r] = -rows[r]!.slope[i]!
    }
    if (sumRow >= 0) {
      columns[up + sumRow] = 1
      columns[down + sumRow] = -1
    }
    if (capRow >= 0) columns[up + capRow] = columns[down + capRow + 1] = 1
  })
  const solved = yield* leastCost({ rows: m, columns, costs, lower: low, upper: high, most, equal, first })
  search.effort.work += solved.pivots * m * (2 * count + 2 * m)
  moving.forEach((i, at) => {
    const d = solved.x[at]! - solved.x[count + at]!
    weights[i] = Math.min(upper[i]!, Math.max(lower[i]!, origin[i]! + d))
  })
  let excess = 0
  let hardExcess = 0
  solved.excess.forEach((over, r) => {
    if (r < rows.length) excess += over
    else hardExcess += over
  })
  return {
    weights,
    cost: solved.cost,
    excess,
    hardExcess,
    savings: solved.savings.slice(0, rows.length),
    capBinds: capRow >= 0 && solved.savings[capRow]! + solved.savings[capRow + 1]! > 1e-9,
    solved: solved.status,
  }
}

function rowAt(search: Search, k: number, point: Point, gradient = gradientOf(search, k, point)): Row {
  let most = -point.excess[k]!
  for (let i = 0; i < gradient.length; i++) most += gradient[i]! * point.weights[i]!
  return { slope: gradient, most }
}

// What can be proven ------------------------------------------------------------------------------------------------------------------

interface Outer {
  /** On what is minimised. */
  readonly bound: number
  /** Weights that meet the convex limits; null: not looked for to the end */
  readonly weights: Float64Array | null
  readonly contradiction: string | null
}

/**
 * Cutting planes on the convex limits: a bound on the change from below, and where the search has not met all limits, a point that meets these, or that there is none.
 * The first planes are those at the end of the search, which prove it at once where all limits are convex.
 */
function* outerBound(search: Search, ended: Point): Generator<number, Outer> {
  const convex = search.limits.flatMap((limit, k) => (limit.convex ? [k] : []))
  const cuts: Row[] = []
  for (const k of convex) if (ended.excess[k]! > -1e-6) cuts.push(rowAt(search, k, ended))
  const found = ended.over <= FEASIBLE
  const rounds = found && convex.length < search.limits.length ? 10 : MOST_CUTS
  let bound = 0
  for (let round = 0; round < rounds; round++) {
    const step = yield* partOf(linearStep(search, cuts, null, Infinity), round / rounds, round / rounds)
    if (step.solved !== 'optimal') break
    if (step.excess > 1e-7)
      return {
        bound,
        weights: null,
        contradiction:
          'Limits on volatility, stand-alone risk, tracking error or weight cannot hold together within the bounds.',
      }
    bound = step.cost
    if (found && ended.change <= bound * (1 + 1e-7)) break
    const point = pointAt(search, step.weights)
    const before = cuts.length
    for (const k of convex) if (point.excess[k]! > FEASIBLE) cuts.push(rowAt(search, k, point))
    if (cuts.length === before) return { bound, weights: step.weights, contradiction: null }
    yield round / rounds
  }
  return { bound, weights: null, contradiction: null }
}

/** Whether shares within their limits can add up to 1 at all, whatever the risk model. */
function* sharesContradict({ limits, origin }: Search): Generator<number, boolean> {
  const n = origin.length
  const shares = limits.filter(({ measure }) => measure === 'share')
  if (shares.length === 0) return false
  const m = shares.length
  const columns = new Float64Array(n * m)
  shares.forEach(({ mask }, r) => {
    for (let i = 0; i < n; i++) if (!mask || mask[i]) columns[i * m + r] = 1
  })
  const { status, cost } = yield* leastCost({
    rows: m,
    columns,
    costs: new Float64Array(n).fill(-1),
    lower: new Float64Array(n).fill(-Infinity),
    upper: new Float64Array(n).fill(Infinity),
    most: Float64Array.from(shares, ({ most }) => most),
    equal: new Uint8Array(m),
    first: new Uint8Array(m),
  })
  return status === 'optimal' && -cost < 1 - 1e-9
}

// The search from one point -----------------------------------------------------------------------------------------------------------

interface Descent {
  readonly point: Point
  readonly stationary: boolean
  /** By the bound on iterations. */
  readonly stopped: boolean
  readonly stationarity: number
  readonly savings: Float64Array
}

function better(a: Descent, b: Descent): boolean {
  const [aOver, bOver] = [a, b].map(({ point }) => (point.over <= FEASIBLE ? 0 : point.over)) as [
    number,
    number,
  ]
  if (aOver !== bOver) return aOver < bOver
  return (
    a.point.change < b.point.change - 1e-12 ||
    (a.point.change <= b.point.change && a.stationary && !b.stationary)
  )
}

const movedIn = ({ origin }: Search, { point }: Descent): Float64Array =>
  point.weights.map((w, i) => (Math.abs(w - origin[i]!) > NO_CHANGE ? 1 : 0))

/** Where the first linear program leads when positions that have moved before are dear: to begin elsewhere. */
function* elsewhere(
  search: Search,
  from: Float64Array,
  moved: Float64Array,
): Generator<number, Float64Array> {
  const point = pointAt(search, from)
  const rows: Row[] = []
  for (let k = 0; k < search.limits.length; k++)
    if (point.excess[k]! > FEASIBLE) rows.push(rowAt(search, k, point))
  const prices = search.counts.map((count, i) => count * (1 + 4 * moved[i]!))
  return (yield* linearStep(search, rows, null, Infinity, prices)).weights
}

/** Positions that may move, those first that a limit that is over today answers to most. */
function mostTelling(search: Search, from: Float64Array): number[] {
  const point = pointAt(search, from)
  const telling = new Float64Array(from.length)
  search.limits.forEach((_, k) => {
    if (!(point.excess[k]! > FEASIBLE)) return
    gradientOf(search, k, point).forEach((slope, i) => (telling[i] = Math.max(telling[i]!, Math.abs(slope))))
  })
  return [...from.keys()]
    .filter((i) => search.lower[i]! < search.upper[i]!)
    .sort((a, b) => telling[b]! - telling[a]!)
}

/** One position far from today, up or down, and others no more than that takes: where shares fall only after they have risen, or fall to it alone. */
function* pushed(search: Search, i: number, up: boolean): Generator<number, Float64Array | null> {
  const { origin } = search
  const by = 2 * origin.reduce((most, w) => Math.max(most, Math.abs(w)), 0)
  const lower = search.lower.slice()
  const upper = search.upper.slice()
  lower[i] = upper[i] = Math.min(upper[i]!, Math.max(lower[i]!, origin[i]! + (up ? by : -by)))
  const { weights, hardExcess } = yield* linearStep({ ...search, lower, upper }, [], null, Infinity)
  return hardExcess > NO_CHANGE ? null : weights
}

function* descend(
  search: Search,
  start: Float64Array,
  from: number,
  width: number,
): Generator<number, Descent> {
  const { limits, origin } = search
  const none = new Float64Array(limits.length)
  let here = pointAt(search, start)
  let best = here
  let end = { stationary: false, stopped: true, stationarity: Infinity, savings: none }
  // a share of no risk: nothing to set out from
  if (here.over === Infinity) return { point: here, ...end, stopped: false }

  const largest = origin.reduce((most, w) => Math.max(most, Math.abs(w)), 0) || 1
  let radius = largest / 2
  let again = true
  const ceiling = 10 * Math.max(1, here.over)
  let filter: { readonly over: number; readonly change: number }[] = []
  const acceptable = ({ over, change }: Point) =>
    over <= ceiling &&
    filter.every((f) => over <= Math.max(0.99 * f.over, FEASIBLE / 2) || change <= f.change - 0.01 * over)

  // limits come into play when a point is over them, and stay
  const inPlay: number[] = []
  const bringIn = ({ excess }: Point) => {
    const before = inPlay.length
    excess.forEach((e, k) => {
      if (e > FEASIBLE && !inPlay.includes(k)) inPlay.push(k)
    })
    return inPlay.length > before
  }
  bringIn(here)
  let rows: Row[] = []

  for (let iteration = 0; iteration < MOST_ITERATIONS && search.effort.work < MOST_WORK; iteration++) {
    const share = from + width * (1 - 0.9 ** iteration)
    yield share
    for (const k of inPlay.slice(rows.length)) {
      rows.push(rowAt(search, k, here))
      if (rows.length % 8 === 0) yield share
    }
    const step = yield* partOf(linearStep(search, rows, here.weights, radius), share, share)
    const possible = step.hardExcess <= NO_CHANGE && step.excess <= FEASIBLE
    const feasible = here.over <= FEASIBLE
    const saved = here.change - step.cost
    const brought = here.over - step.excess

    if (possible && feasible) {
      const savings = none.slice()
      inPlay.forEach((k, r) => (savings[k] = step.savings[r]! / limits[k]!.scale))
      end = { ...end, stationarity: Math.max(0, saved) / radius, savings }
      if (end.stationarity <= STATIONARY && step.solved === 'optimal') {
        end = { ...end, stationary: true, stopped: false }
        best = here
        break
      }
    } else if (!possible && brought <= NO_CHANGE * Math.min(1, radius) * Math.max(1, here.over)) {
      // no small move lowers what is over: back to where nothing was, if there is such a point, for shorter steps
      if (best.over > FEASIBLE) {
        end = { ...end, stopped: false }
        break
      }
      here = best
      rows = []
      radius /= 16
      continue
    }

    const finished =
      possible && !step.capBinds ? yield* partOf(newton(search, here, step, inPlay), share, share) : null
    // steps of the linear program keep the turnover, Newton's know nothing of it
    const trials =
      finished && turnoverOf(origin, finished.weights) <= search.cap
        ? [finished, pointAt(search, step.weights)]
        : [pointAt(search, step.weights)]
    const enough = (trial: Point) => {
      const lessChange = here.change - trial.change
      if (!possible) return here.over - trial.over >= 0.1 * brought
      if (feasible || saved > here.over) return lessChange > 0 && lessChange >= 0.1 * saved
      return trial.over <= Math.max(FEASIBLE, 0.9 * here.over) || lessChange > 0
    }
    let added = false
    for (const trial of trials) if (trial.over < Infinity) added = bringIn(trial) || added
    const taken = trials.find((trial) => trial.over < Infinity && acceptable(trial) && enough(trial))
    if (taken) {
      if (!feasible || taken.over > FEASIBLE) filter.push({ over: here.over, change: here.change })
      here = taken
      rows = []
      const progress =
        best.over > FEASIBLE ? here.over < best.over : here.over <= FEASIBLE && here.change < best.change
      if (progress) best = here
      radius = Math.min(2 * largest, radius * 2)
      if (!progress && here.over <= FEASIBLE) {
        // back within limits and nothing won: the steps were too long
        here = best
        radius /= 16
      }
    } else if (!added) {
      radius /= 4
      if (radius < 1e-12 * largest) {
        if (!again) {
          end = { ...end, stopped: false }
          break
        }
        again = false
        radius = largest / 100
        filter = []
      }
    }
  }
  return { point: best, ...end }
}

/**
 * Newton's method on the conditions of a stationary point, the binding limits as equations: positions at today's weight or at a bound stay, the others move. A position
 * that reaches either on the way stays there; a limit that pulls the wrong way is let go.
 */
function* newton(
  search: Search,
  here: Point,
  step: LinearStep,
  rowsOf: readonly number[],
): Generator<number, Point | null> {
  const { origin, lower, upper, counts, keepsSum } = search
  const n = origin.length
  let binding = rowsOf.filter((_, r) => step.savings[r]! > 1e-9)
  let multipliers = step.savings.filter((value) => value > 1e-9)
  if (binding.length === 0) return null
  const weights = step.weights.slice()
  const sign = new Float64Array(n)
  let free: number[] = []
  const atBound = (w: number, i: number) => w <= lower[i]! || w >= upper[i]!
  for (let i = 0; i < n; i++) {
    const [before, after] = [here.weights[i]!, step.weights[i]!]
    const moved = (w: number) => (counts[i] === 0 || w !== origin[i]) && !atBound(w, i)
    if (!moved(after) && !moved(before)) continue
    if (moved(before)) weights[i] = before
    sign[i] = counts[i]! * Math.sign(weights[i]! - origin[i]!)
    free.push(i)
  }
  const start = sumOf(origin)
  for (let round = 0; round < 40; round++) {
    yield 0
    const extra = keepsSum ? 1 : 0
    if (free.length > MOST_FREE || free.length < binding.length + extra) return null
    const point = pointAt(search, weights)
    if (!Number.isFinite(point.over)) return null
    const size = free.length + binding.length + extra
    const equations = Matrix.zeros(size, size)
    const right = Matrix.zeros(size, 1)
    const curvature = Matrix.zeros(free.length, free.length)
    const slopes = Matrix.zeros(binding.length + extra, free.length)
    // a pass of the model for each column not asked for before
    for (let f = 0; f < free.length; f++) {
      columnOf(search, free[f]!)
      if (f % 16 === 15) yield 0
    }
    for (let r = 0; r < binding.length; r++) {
      if (r % 8 === 7) yield 0
      const k = binding[r]!
      const gradient = gradientOf(search, k, point)
      addCurvature(search, k, point, gradient, free, multipliers[r]!, curvature)
      free.forEach((i, at) => slopes.set(r, at, gradient[i]!))
      right.set(free.length + r, 0, -point.excess[k]!)
    }
    if (extra) {
      free.forEach((_, at) => slopes.set(binding.length, at, 1))
      right.set(size - 1, 0, start - sumOf(weights))
    }
    if (free.length > binding.length + extra && !bendsUp(curvature, slopes)) return null
    equations.setSubMatrix(curvature, 0, 0)
    equations.setSubMatrix(slopes, free.length, 0)
    equations.setSubMatrix(slopes.transpose(), 0, free.length)
    free.forEach((i, at) => right.set(at, 0, -sign[i]!))
    const factored = new LuDecomposition(equations)
    if (factored.isSingular()) return null
    const solution = factored.solve(right)
    if (!solution.to1DArray().every(Number.isFinite)) return null
    multipliers = Float64Array.from(binding, (_, r) => solution.get(free.length + r, 0))

    // as far as no position passes today's weight or a bound
    let reach = 1
    let blocked = -1
    let at = 0
    free.forEach((i, f) => {
      const move = solution.get(f, 0)
      const stops = [lower[i]!, upper[i]!, ...(sign[i] === 0 ? [] : [origin[i]!])]
      for (const stop of stops) {
        const distance = stop - weights[i]!
        if (move * distance > 0 && distance / move < reach) {
          reach = distance / move
          blocked = f
          at = stop
        } else if (
          distance === 0 &&
          move !== 0 &&
          (stop === origin[i] ? move * sign[i]! < 0 : stop === lower[i] ? move < 0 : move > 0)
        ) {
          reach = 0
          blocked = f
          at = stop
        }
      }
    })
    let largest = 0
    free.forEach((i, f) => {
      const move = reach * solution.get(f, 0)
      largest = Math.max(largest, Math.abs(move))
      weights[i] = weights[i]! + move
    })
    if (blocked >= 0) {
      weights[free[blocked]!] = at
      free = free.filter((_, f) => f !== blocked)
      continue
    }
    if (largest > 1e-13) continue
    const worst = multipliers.reduce((least, value, r) => (value < multipliers[least]! ? r : least), 0)
    if (multipliers[worst]! < -1e-10) {
      binding = binding.filter((_, r) => r !== worst)
      multipliers = multipliers.filter((_, r) => r !== worst)
      if (binding.length === 0) return null
      continue
    }
    return pointAt(search, weights)
  }
  return null
}

/** Whether x'Hx > 0 for every x that the slopes leave where it is. */
function bendsUp(curvature: Matrix, slopes: Matrix): boolean {
  const top = Math.max(curvature.max(), -curvature.min())
  if (top === 0) return false
  const scaled = slopes.clone()
  for (let r = 0; r < scaled.rows; r++) {
    const length = Math.hypot(...scaled.getRow(r))
    if (length > 0) scaled.mulRow(r, 1 / length)
  }
  const added = scaled
    .transpose()
    .mmul(scaled)
    .mul(1e4 * top)
  return new CholeskyDecomposition(Matrix.add(curvature, added)).isPositiveDefinite()
}

// The end -----------------------------------------------------------------------------------------------------------------------------

/**
 * Weights within rounding of today's, or of a bound, are set to it, where limits and the sum still hold then. A limit of 0 may hold at a bound or
 * at the benchmark alone, which is a kink or the floor of a square: nearing it, figures stop to tell, and what is near is set to it from further away.
 */
function polished(search: Search, point: Point): Point {
  const held = limitsHold(search, point)
  if (!held && point.over > FEASIBLE) return snapped(search, point, NO_CHANGE) ?? point
  for (const width of held ? [NO_CHANGE] : [NO_CHANGE, 1e-6, 1e-4]) {
    const cleaned = snapped(search, point, width)
    if (cleaned && limitsHold(search, cleaned)) return cleaned
  }
  return point
}

/** Null where the sum that is kept would be lost. */
function snapped(search: Search, point: Point, width: number): Point | null {
  const { origin, lower, upper, benchmark, keepsSum } = search
  const weights = point.weights.map((w, i) => {
    const near = [
      origin[i]!,
      lower[i]!,
      upper[i]!,
      ...(width > NO_CHANGE && benchmark ? [benchmark[i]!] : []),
    ]
    const to = near.find((value) => Math.abs(w - value) < width)
    return to === undefined ? w : Math.min(upper[i]!, Math.max(lower[i]!, to))
  })
  if (keepsSum && Math.abs(sumOf(weights) - sumOf(origin)) > Number.EPSILON) {
    // what that took from the sum goes to the position that moves most, and can
    let widest = -1
    let most = 0
    weights.forEach((w, i) => {
      const moved = Math.abs(w - origin[i]!)
      if (moved <= most || Math.min(w - lower[i]!, upper[i]! - w) < 10 * width) return
      most = moved
      widest = i
    })
    if (widest >= 0) weights[widest] = weights[widest]! - (sumOf(weights) - sumOf(origin))
    else if (Math.abs(sumOf(weights) - sumOf(origin)) > 1e-14 * weights.length) return null
  }
  return pointAt(search, weights)
}

interface Ending {
  readonly status: ChangeResult['status']
  readonly proven: boolean
  readonly point: Point
  readonly bound: number
  readonly stationarity: number
  readonly savings: Float64Array
  readonly starts: number
  readonly note: string
}

function resultOf(search: Search, ending: Ending): ChangeResult {
  const { origin, cap, keepsSum } = search
  const { point, starts } = ending
  const change = totalChange(origin, point.weights)
  return {
    status: ending.status,
    proven: ending.proven,
    weights: point.weights.slice(),
    change,
    turnover: turnoverOf(origin, point.weights),
    minimised: point.change,
    leastPossible: ending.bound,
    residuals: residualsOf(search, point),
    turnoverExcess: Math.max(0, turnoverOf(origin, point.weights) - cap),
    sumError: keepsSum ? Math.abs(sumOf(point.weights) - sumOf(origin)) : 0,
    stationarity: ending.stationarity,
    savings: ending.savings,
    iterations: search.effort.programs,
    method:
      starts === 0
        ? 'No search was needed.'
        : `Sequential linear programs in a trust region with Newton steps, from ${starts} starting point${starts === 1 ? '' : 's'}.`,
    note: ending.note,
  }
}
