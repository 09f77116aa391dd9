import { checkBlock, Fault } from './fault'
import type { RiskModel } from './risk-model'

/** Long-only weights whose shares of risk are to be given ones, and how near they came. */
export interface BudgetWeights {
  /** n; none negative, sum 1; 0 exactly where the budget is 0 */
  readonly weights: Float64Array
  /** Share of risk of each position at these weights; null where they have no risk to share. */
  readonly shares: Float64Array | null
  /** Largest |share - budget|; Infinity where there are no shares. */
  readonly residual: number
  /** Whether the residual is at most 1e-10. */
  readonly converged: boolean
  /**
   * Why it is not: a long-only mix was met with less than 1e-7 of its stand-alone risks ("riskless-mix": the search would only come
   * closer and closer to one without any risk, where nothing is left to share); rounding left nothing to gain ("rounding"); or the bound on the work was reached ("limit").
   */
  readonly stopped: 'riskless-mix' | 'rounding' | 'limit' | null
  /** Steps of Newton's method. */
  readonly iterations: number
  /** Questions put to the model, which is what the time goes to; at most 10000. */
  readonly passes: number
  readonly method: 'newton'
}

/** Shares of risk that are this near their budgets meet them. */
const MET = 1e-10
/** Worth going on for: a last step takes most residuals below this, and small shares to nine digits of themselves. */
const WANTED = 1e-12
const WANTED_OF_EACH = 1e-9
/** A variance this small beside the squared sum of stand-alone risks leaves no shares worth a budget. */
const RISKLESS = 1e-14
const MOST_STEPS = 200
const MOST_PASSES = 10000
/** Steps that lower neither the function nor the residual, after which rounding is taken to have the last word. */
const PATIENCE = 4
/** How much of itself an x may lose in one step: from far too small it comes back by doubling. */
const SHRINK = 0.9

/**
 * Long-only weights whose shares of risk equal given budgets; with equal budgets, equal risk contribution. They are x / sum x for the
 * one x > 0 that minimises
 *
 *   1/2 x'C x - sum_i b_i ln x_i,   where x_i (C x)_i = b_i
 *
 * by Newton's method along lines on which the minimum is found exactly. The system of a step,
 *
 *   (X C X + diag(h)) s = b - x o Cx,   h_i = max(b_i, x_i (C x)_i),   X = diag(x)
 *
 * is solved by conjugate gradients, so that C is asked and never formed. At the solution h = b, and diag(b)^-1 X C X has the eigenvalue 1 with the
 * eigenvector of ones; without negative covariances it is the largest (Perron), and a step takes about a dozen questions whatever n is. h
 * is larger than the second derivative of the logarithms where x is too large: those x then fall by whole factors rather than to the edge.
 *
 * @param budgets  n, 0 or more, sum 1 within 1e-9 (what is left of that is scaled off); a position with a budget of 0 gets a
 *                 weight of 0, although other weights with a share of 0 may exist
 * @returns        yields the share done, by the digits of the residual. Always ends; not converging is in the result
 * @throws Fault   "shape" | "not-a-number" | "out-of-range" (budgets, the first negative one with its row) | "zero-risk" (a position that
 *                 never moves cannot have a share: argument "risk", with its column) | "negative-variance" (what `apply` throws)
 * @source         Spinu (2013), An Algorithm for Computing Risk Parity Weights, SSRN 2297383; Maillard, Roncalli & Teiletche (2010), JPM
 *                 36(4), 60-70; Bruder & Roncalli (2012), Managing Risk Exposures Using the Risk Budgeting Approach (all from memory)
 * @cost           some hundred questions to the model and as many passes over n numbers
 * @example        inOneGo(riskBudgetWeights(matrixModel(Float64Array.of(.04, -.018, -.018, .09), 2), Float64Array.of(.5, .5))).weights // [0.6, 0.4]
 * @example        inOneGo(riskBudgetWeights(matrixModel(Float64Array.of(.04, 0, 0, .01), 2), Float64Array.of(.8, .2))).weights // [0.5, 0.5]
 */
export function* riskBudgetWeights(
  model: RiskModel,
  budgets: Float64Array,
): Generator<number, BudgetWeights> {
  const problem = problemOf(model, budgets)
  let here = startOf(problem)
  let best = here
  let least = here.value
  let iterations = 0
  let passes = 1
  let stale = 0
  let share = 0
  let stopped: BudgetWeights['stopped'] = null
  const digits = Math.log(Math.max(here.residual / WANTED, 2))
  yield share

  while (stopped === null && !(here.residual <= WANTED && here.relative <= WANTED_OF_EACH)) {
    if (here.riskless) stopped = 'riskless-mix'
    else if (stale >= PATIENCE) stopped = 'rounding'
    else if (iterations === MOST_STEPS || passes >= MOST_PASSES) stopped = 'limit'
    else {
      const step = yield* newtonStep(problem, here, MOST_PASSES - passes - 1, share)
      const length = lineMinimum(problem, here, step)
      const { direction } = step
      const next = pointAt(
        problem,
        here.x.map((x, i) => x * (1 + length * direction[i]!)),
      )
      iterations++
      passes += step.passes + 1
      const lower = next.value < least - Number.EPSILON * Math.max(1, Math.abs(least))
      const nearer = next.residual < best.residual || next.riskless
      stale = lower || nearer ? 0 : stale + 1
      least = Math.min(least, next.value)
      if (nearer) best = next
      here = next
      share = Math.max(share, Math.min(0.99, 1 - Math.log(best.residual / WANTED) / digits))
      yield share
    }
  }

  const converged = best.residual <= MET
  const total = best.x.reduce((sum, x) => sum + x, 0)
  return {
    weights: best.x.map((x) => x / total),
    shares: best.riskless ? null : best.shares,
    residual: best.residual,
    converged,
    stopped: converged ? null : stopped,
    iterations,
    passes,
    method: 'newton',
  }
}

interface Problem {
  readonly model: RiskModel
  readonly variances: Float64Array
  /** b, sum 1 */
  readonly budgets: Float64Array
}

function problemOf(model: RiskModel, given: Float64Array): Problem {
  checkBlock(given, model.size, 1, 'budgets')
  const negative = given.findIndex((budget) => budget < 0)
  if (negative >= 0) {
    throw new Fault('out-of-range', `budgets: ${given[negative]}`, 'shares of 0 or more are needed', {
      argument: 'budgets',
      row: negative,
    })
  }
  const total = given.reduce((sum, budget) => sum + budget, 0)
  if (!(Math.abs(total - 1) <= 1e-9)) {
    throw new Fault(
      'out-of-range',
      `budgets: they add up to ${Number(total.toPrecision(10))}`,
      'shares of risk that add up to 1 are needed',
      { argument: 'budgets' },
    )
  }
  const variances = model.variances()
  const still = given.findIndex((budget, i) => budget > 0 && variances[i] === 0)
  if (still >= 0) {
    throw new Fault(
      'zero-risk',
      `risk: column ${still + 1} never moves and cannot have a share of the risk`,
      'a budget of 0 is needed for it, or returns that move',
      { argument: 'risk', column: still },
    )
  }
  return { model, variances, budgets: given.map((budget) => budget / total) }
}

/** Weights in any unit, scaled so that x'C x = 1, with what the search needs of them. */
interface Point {
  readonly x: Float64Array
  /** x_i (C x)_i; sum 1 */
  readonly shares: Float64Array
  /** Largest |share - budget|; Infinity where there is no risk. */
  readonly residual: number
  /** Largest |share / budget - 1|; likewise. */
  readonly relative: number
  /** The function to be minimised, less its constant 1/2. */
  readonly value: number
  /** Less than 1e-7 of the stand-alone risks is left, or what rounding could have made. */
  readonly riskless: boolean
}

/** Uncorrelated positions would be budgeted so. */
const startOf = (problem: Problem): Point =>
  pointAt(
    problem,
    problem.budgets.map((budget, i) =>
      budget > 0 ? Math.sqrt(budget) / Math.sqrt(problem.variances[i]!) : 0,
    ),
  )

function pointAt({ model, variances, budgets }: Problem, weights: Float64Array): Point {
  const { marginals, variance } = model.apply(weights)
  let gross = 0
  for (let i = 0; i < weights.length; i++) gross += weights[i]! * Math.sqrt(variances[i]!)
  // written so that what is not a number any more counts as riskless too
  if (!(variance > Math.max(model.rounding, RISKLESS) * gross * gross && gross < Infinity)) {
    const undefinedGaps = { residual: Infinity, relative: Infinity, value: Infinity }
    return { x: weights, shares: marginals, ...undefinedGaps, riskless: true }
  }
  const scale = 1 / Math.sqrt(variance)
  let residual = 0
  let relative = 0
  let value = 0
  const x = weights.map((weight) => weight * scale)
  const shares = x.map((weight, i) => {
    const share = weight * (marginals[i]! * scale)
    const budget = budgets[i]!
    const gap = Math.abs(share - budget)
    residual = Math.max(residual, gap)
    if (budget > 0) {
      relative = Math.max(relative, gap / budget)
      value -= budget * Math.log(weight)
    }
    return share
  })
  return { x, shares, residual, relative, value, riskless: false }
}

interface Step {
  /** s: the change of each x, as a share of it */
  readonly direction: Float64Array
  /** (x o s)'C (x o s) */
  readonly curvature: number
  readonly passes: number
}

/** The system of one step by conjugate gradients with its diagonal as preconditioner, as exactly as the residual is worth. */
function* newtonStep(
  { model, variances, budgets }: Problem,
  { x, shares }: Point,
  mostPasses: number,
  share: number,
): Generator<number, Step> {
  const n = x.length
  const direction = new Float64Array(n)
  const h = budgets.map((budget, i) => Math.max(budget, shares[i]!))
  // a position without a budget has x = 0 and stays there
  const inverse = h.map((value, i) => (value > 0 ? 1 / (value + x[i]! * x[i]! * variances[i]!) : 0))
  const left = budgets.map((budget, i) => budget - shares[i]!)
  const conjugate = left.map((value, i) => inverse[i]! * value)
  const moved = new Float64Array(n)
  const marginals = new Float64Array(n)
  /** C (x o s), gathered from the passes */
  const gathered = new Float64Array(n)

  let square = dot(left, conjugate)
  const enough = square * Math.min(0.01, square)
  let passes = 0
  while (square > enough && passes < mostPasses && passes < n + 20) {
    for (let i = 0; i < n; i++) moved[i] = x[i]! * conjugate[i]!
    model.apply(moved, marginals)
    passes++
    yield share
    let denominator = 0
    for (let i = 0; i < n; i++) {
      denominator += conjugate[i]! * (x[i]! * marginals[i]! + h[i]! * conjugate[i]!)
    }
    if (!(denominator > 0)) break
    const length = square / denominator
    const before = square
    square = 0
    for (let i = 0; i < n; i++) {
      direction[i] = direction[i]! + length * conjugate[i]!
      gathered[i] = gathered[i]! + length * marginals[i]!
      left[i] = left[i]! - length * (x[i]! * marginals[i]! + h[i]! * conjugate[i]!)
      square += left[i]! * left[i]! * inverse[i]!
    }
    for (let i = 0; i < n; i++) {
      conjugate[i] = inverse[i]! * left[i]! + (square / before) * conjugate[i]!
    }
  }
  let curvature = 0
  for (let i = 0; i < n; i++) curvature += x[i]! * direction[i]! * gathered[i]!
  return { direction, curvature: Math.max(curvature, 0), passes }
}

/**
 * The t > 0 where the function is least at x o (1 + t s): t (curvature + sum b s^2 / (1 + t s)) = s'(b - shares), whose left side rises from 0.
 * Newton's method within a bracket that halves or doubles where it leaves it; 0 where rounding leaves no way down.
 */
function lineMinimum({ budgets }: Problem, { shares }: Point, { direction, curvature }: Step): number {
  let wanted = 0
  let edge = Infinity
  for (let i = 0; i < direction.length; i++) {
    const s = direction[i]!
    wanted += s * (budgets[i]! - shares[i]!)
    if (s < 0) edge = Math.min(edge, -1 / s)
  }
  if (!(wanted > 0)) return 0
  let [low, high] = [0, SHRINK * edge]
  let t = Math.min(1, high / 2)
  for (let k = 0; k < 100; k++) {
    let value = curvature
    let slope = curvature
    for (let i = 0; i < direction.length; i++) {
      const s = direction[i]!
      const part = 1 / (1 + t * s)
      value += budgets[i]! * s * s * part
      slope += budgets[i]! * s * s * part * part
    }
    const beyond = t * value - wanted
    if (Math.abs(beyond) <= 1e-9 * wanted) break
    if (beyond > 0) high = t
    else low = t
    const next = t - beyond / slope
    t = next > low && next < high ? next : high < Infinity ? low + (high - low) / 2 : 2 * t
  }
  return t
}

function dot(a: Float64Array, b: Float64Array): number {
  let sum = 0
  for (let i = 0; i < a.length; i++) sum += a[i]! * b[i]!
  return sum
}
