import type { Matrix } from 'ml-matrix'
import { activeWeights } from './active'
import { checkBlock, Fault } from './fault'
import { roundingOfVariance, type RiskModel } from './risk-model'
import { turnover } from './trade'

// Limits on a book as functions of its weights: figures, slopes and curvature, and the checks at the door.

/**
 * What a limit holds: the share of risk, the contribution to risk (volatility units per period) or the stand-alone risk (the volatility of the sub-portfolio) of its
 * members, their weight (the sum; of one position alone, its absolute weight), the volatility of the whole book or its tracking error.
 */
export type LimitMeasure =
  'share' | 'contribution' | 'volatility' | 'stand-alone' | 'tracking error' | 'weight'

export interface ChangeLimit {
  readonly measure: LimitMeasure
  /** Positions; null: the whole book, as "volatility" and "tracking error" always are. */
  readonly members: Int32Array | null
  /** Met while the figure is no more than this. */
  readonly most: number
}

/**
 * What takes up the difference between purchases and sales: "book": nothing, the sum of weights stays; "cash": cash, which is no position; or one
 * chosen position, whose own change is then not among those that are minimised.
 */
export type ChangeFinancing =
  | { readonly kind: 'book' }
  | { readonly kind: 'cash' }
  | { readonly kind: 'position'; readonly position: number }

export interface ChangeProblem {
  /** Today's; n, of any sign and sum */
  readonly weights: Float64Array
  readonly limits: readonly ChangeLimit[]
  readonly financing: ChangeFinancing
  /** n; left out: 0 where long, no bound where short, so that long stays long and short stays short */
  readonly lower?: Float64Array
  /**
   * n; left out: no bound where long, 0 where short or not held (a chosen financing position without weight may be bought). Both
   * bounds at today's weight: frozen
   */
  readonly upper?: Float64Array
  /** n; for limits on tracking error */
  readonly benchmark?: Float64Array
  /** The most that turnover may be: one way, the larger of what is bought and what is sold. */
  readonly turnover?: number
}

export interface LimitResidual {
  /** At the weights of the result; NaN where a share of no risk is asked for. */
  readonly figure: number
  readonly most: number
  /** figure - most; 0 or less: met */
  readonly excess: number
}

/** Limits are aimed at from this far below, relative to the limit, so that weights shown with ten digits do not breach them again. */
export const LIMIT_MARGIN = 1e-9

/** What rounding may leave a figure over its limit, relative to the limit; it is met all the same. */
const ROUNDING = 1e-12
/** Excess over the aim, relative, that is left to the margin. */
export const FEASIBLE = 1e-10

/** A limit with what does not change while weights are looked for. */
export interface Limit extends ChangeLimit {
  /** What the search keeps the figure to. */
  readonly aim: number
  /** Excess is counted in these. */
  readonly scale: number
  /** 1 for members, n; null: the whole book */
  readonly mask: Uint8Array | null
  /** whether every point between two that meet it meets it too */
  readonly convex: boolean
}

/** A book with its limits: what stays while weights are looked for. */
export interface LimitedBook {
  readonly model: RiskModel
  readonly deviations: Float64Array
  readonly origin: Float64Array
  readonly lower: Float64Array
  readonly upper: Float64Array
  readonly benchmark: Float64Array | null
  /** What a unit of change of each position counts: 1, or 0 for the one that takes up the difference */
  readonly counts: Float64Array
  readonly keepsSum: boolean
  /** On turnover; Infinity: none */
  readonly cap: number
  readonly limits: readonly Limit[]
  /** Columns of C that were asked for, kept. */
  readonly columns: Map<number, Float64Array>
}

/** Weights with their figures. */
export interface Point {
  readonly weights: Float64Array
  readonly marginals: Float64Array
  readonly variance: number
  readonly figures: Float64Array
  /** (figure - aim) / scale */
  readonly excess: Float64Array
  /** Sum of what is over; Infinity where a figure has no value */
  readonly over: number
  /** What is minimised. */
  readonly change: number
}

/** Checks at the door, and what does not change during the book. */
export function limitedBook(model: RiskModel, problem: ChangeProblem): LimitedBook {
  const { weights, financing, benchmark, turnover: cap = Infinity } = problem
  const n = model.size
  checkBlock(weights, n, 1, 'weights')
  if (benchmark) checkBlock(benchmark, n, 1, 'benchmark')
  const bound = (
    given: Float64Array | undefined,
    argument: string,
    usual: (w: number, i: number) => number,
  ) => {
    if (given && given.length !== n)
      throw new Fault(
        'shape',
        `${argument}: ${given.length} numbers`,
        `${n} are needed, one for each position`,
        { argument },
      )
    return given?.slice() ?? weights.map(usual)
  }
  const takes = financing.kind === 'position' ? financing.position : -1
  const lower = bound(problem.lower, 'lower', (w) => (w < 0 ? -Infinity : 0))
  const upper = bound(problem.upper, 'upper', (w, i) => (w > 0 || (w === 0 && i === takes) ? Infinity : 0))
  for (let i = 0; i < n; i++) {
    // NaN included
    if (!(lower[i]! <= upper[i]!) || lower[i] === Infinity || upper[i] === -Infinity)
      throw new Fault(
        'out-of-range',
        `bounds: from ${lower[i]} to ${upper[i]}`,
        'a lower bound no higher than the upper one is needed',
        { argument: 'lower', row: i },
      )
  }
  if (!(cap >= 0))
    throw new Fault('out-of-range', `turnover: ${cap}`, 'a number of 0 or more is needed', {
      argument: 'turnover',
    })
  const counts = new Float64Array(n).fill(1)
  if (financing.kind === 'position') {
    if (!(financing.position in counts))
      throw new Fault(
        'out-of-range',
        `financing: position ${financing.position}`,
        `a number from 0 to ${n - 1} is needed`,
        {
          argument: 'financing',
        },
      )
    counts[financing.position] = 0
  } else if (financing.kind !== 'book' && financing.kind !== 'cash')
    throw new Fault(
      'unknown-choice',
      `financing: ${String((financing as { kind: unknown }).kind)}`,
      'book, cash or position is needed',
      {
        argument: 'financing',
      },
    )

  const book: LimitedBook = {
    model,
    deviations: model.variances().map(Math.sqrt),
    origin: weights.slice(),
    lower,
    upper,
    benchmark: benchmark ?? null,
    counts,
    keepsSum: financing.kind !== 'cash',
    cap,
    limits: problem.limits.map((limit, row) => checkedLimit(limit, row, n, benchmark !== undefined)),
    columns: new Map(),
  }
  return { ...book, limits: aimedAt(book) }
}

function checkedLimit(limit: ChangeLimit, row: number, n: number, hasBenchmark: boolean): Limit {
  const { measure, members, most } = limit
  const at = { argument: 'limits', row }
  if (!MEASURES.includes(measure))
    throw new Fault(
      'unknown-choice',
      `limits: ${String(measure)}`,
      `one of ${MEASURES.join(', ')} is needed`,
      at,
    )
  if (!Number.isFinite(most))
    throw new Fault('not-a-number', `limits: ${most}`, 'a finite number is needed', at)
  if (measure === 'tracking error' && !hasBenchmark)
    throw new Fault(
      'missing-data',
      'limits: a tracking error without a benchmark',
      'weights of a benchmark are needed',
      at,
    )
  const whole = members === null || measure === 'volatility' || measure === 'tracking error'
  const mask = whole ? null : new Uint8Array(n)
  if (mask && members) {
    for (const member of members) {
      if (!(member in mask))
        throw new Fault(
          'out-of-range',
          `limits: member ${member}`,
          `a number from 0 to ${n - 1} is needed`,
          at,
        )
      mask[member] = 1
    }
  }
  const convex = measure !== 'share' && measure !== 'contribution'
  // each member once
  const distinct = mask && Int32Array.from(mask.keys()).filter((i) => mask[i] === 1)
  return { measure, members: distinct, most, aim: most, scale: 1, mask, convex }
}

const MEASURES: readonly LimitMeasure[] = [
  'share',
  'contribution',
  'volatility',
  'stand-alone',
  'tracking error',
  'weight',
]

/** Limits with their scale, and the margin where there is room for one. */
function aimedAt(book: LimitedBook): Limit[] {
  const { limits, origin, model } = book
  const today = pointAt(book, origin)
  const whole = Math.sqrt(today.variance)
  return limits.map((limit, k) => {
    const { measure, most } = limit
    const now = today.figures[k]!
    if (Number.isNaN(now))
      throw new Fault(
        'zero-risk',
        'limits: a share of the risk of a book that has none',
        'weights with some risk, or limits that are no shares, are needed',
        { argument: 'limits', row: k },
      )
    const natural = measure === 'share' || measure === 'weight' ? 1 : whole
    const scale = Math.abs(most) || natural || Math.sqrt(Math.max(...model.variances())) || 1
    // no lower than today's figure where that holds: what is frozen, or a sum that is kept, could not give way
    const margin = LIMIT_MARGIN * Math.abs(most)
    return { ...limit, scale, aim: now <= most ? Math.max(now, most - margin) : most - margin }
  })
}

export const sumOf = (values: Float64Array) => values.reduce((sum, value) => sum + value, 0)

/** The weights a limit looks at, others 0. */
function part(book: LimitedBook, { measure, mask }: Limit, weights: Float64Array): Float64Array {
  if (measure === 'tracking error') return activeWeights(weights, book.benchmark!)
  return mask ? weights.map((w, i) => (mask[i] ? w : 0)) : weights
}

export function pointAt(book: LimitedBook, weights: Float64Array): Point {
  const { model, limits, origin, counts } = book
  const { marginals, variance: computed } = model.apply(weights)
  const variance = computed <= roundingOfVariance(model, weights) ? 0 : computed
  const figures = Float64Array.from(limits, (limit) => figureOf(book, limit, weights, marginals, variance))
  const excess = figures.map((figure, k) => (figure - limits[k]!.aim) / limits[k]!.scale)
  let over = 0
  for (const e of excess) over += Number.isNaN(e) ? Infinity : Math.max(0, e)
  let change = 0
  for (let i = 0; i < weights.length; i++) change += counts[i]! * Math.abs(weights[i]! - origin[i]!)
  return { weights, marginals, variance, figures, excess, over, change }
}

function figureOf(
  book: LimitedBook,
  limit: Limit,
  weights: Float64Array,
  marginals: Float64Array,
  variance: number,
): number {
  const { measure, members } = limit
  const alone = members?.length === 1 ? members[0]! : null
  switch (measure) {
    case 'weight':
      return alone === null
        ? members
          ? members.reduce((sum, i) => sum + weights[i]!, 0)
          : sumOf(weights)
        : Math.abs(weights[alone]!)
    case 'share':
    case 'contribution': {
      if (variance === 0) return measure === 'share' ? NaN : 0
      if (!members) return measure === 'share' ? 1 : Math.sqrt(variance)
      let sum = 0
      for (const i of members) sum += weights[i]! * marginals[i]!
      return sum / (measure === 'share' ? variance : Math.sqrt(variance))
    }
    case 'volatility':
      return Math.sqrt(variance)
    case 'stand-alone':
    case 'tracking error': {
      if (measure === 'stand-alone' && !members) return Math.sqrt(variance)
      if (measure === 'stand-alone' && alone !== null)
        return Math.abs(weights[alone]!) * book.deviations[alone]!
      const own = part(book, limit, weights)
      const { variance: square } = book.model.apply(own)
      return square <= roundingOfVariance(book.model, own) ? 0 : Math.sqrt(square)
    }
  }
}

/** Whether all limits hold, rounding allowed for; bounds, sum and turnover are kept by every step. */
export function limitsHold({ limits, cap, origin }: LimitedBook, { figures, weights }: Point): boolean {
  const held = figures.every((figure, k) => figure - limits[k]!.most <= ROUNDING * limits[k]!.scale)
  return held && turnoverOf(origin, weights) <= cap * (1 + ROUNDING)
}

export const turnoverOf = (origin: Float64Array, weights: Float64Array) =>
  turnover(weights.map((w, i) => w - origin[i]!))

export function totalChange(origin: Float64Array, weights: Float64Array): number {
  return weights.reduce((sum, w, i) => sum + Math.abs(w - origin[i]!), 0)
}

/** The gradient of a limit's excess; n. Shares and contributions in the form that is quadratic: w_S'Cw - L w'Cw <= 0, over w'Cw. */
export function gradientOf(book: LimitedBook, k: number, point: Point): Float64Array {
  const limit = book.limits[k]!
  const { measure, members, mask, aim, scale } = limit
  const { weights, marginals, variance } = point
  const n = weights.length
  const gradient = new Float64Array(n)
  if (measure === 'weight') {
    if (members?.length === 1) gradient[members[0]!] = (weights[members[0]!]! < 0 ? -1 : 1) / scale
    else for (let i = 0; i < n; i++) if (!mask || mask[i]) gradient[i] = 1 / scale
    return gradient
  }
  const volatility = Math.sqrt(variance)
  if (measure === 'share' || measure === 'contribution') {
    if (variance === 0 || (measure === 'share' && !mask)) return gradient
    const own = mask ? marginalsOf(book, limit, weights) : marginals
    const [unit, both] = measure === 'share' ? [variance, 2 * aim] : [volatility, aim / volatility]
    for (let i = 0; i < n; i++) {
      const inside = !mask || mask[i] ? marginals[i]! : 0
      gradient[i] = (inside + own[i]! - both * marginals[i]!) / (unit * scale)
    }
    return gradient
  }
  const own = part(book, limit, weights)
  const { marginals: g, variance: square } = own === weights ? point : book.model.apply(own)
  const size = square <= roundingOfVariance(book.model, own) ? 0 : Math.sqrt(square)
  // at its lowest point a norm has no slope
  if (size > 0) for (let i = 0; i < n; i++) if (!mask || mask[i]) gradient[i] = g[i]! / (size * scale)
  return gradient
}

/** C w_S; of one position, its column of C, which is kept. */
function marginalsOf(book: LimitedBook, limit: Limit, weights: Float64Array): Float64Array {
  const { members } = limit
  if (members?.length !== 1) return book.model.apply(part(book, limit, weights)).marginals
  return columnOf(book, members[0]!).map((c) => c * weights[members[0]!]!)
}

/** Adds factor x (second derivatives of a limit's excess) for the free positions. */
export function addCurvature(
  book: LimitedBook,
  k: number,
  point: Point,
  gradient: Float64Array,
  free: readonly number[],
  factor: number,
  into: Matrix,
): void {
  const { measure, mask, aim, scale } = book.limits[k]!
  if (measure === 'weight') return
  const { marginals, variance } = point
  const volatility = Math.sqrt(variance)
  const quadratic = measure === 'share' || measure === 'contribution'
  if (quadratic && (variance === 0 || (measure === 'share' && !mask))) return
  let size = volatility
  if (!quadratic && (mask || measure === 'tracking error')) {
    size = point.figures[k]!
    if (size === 0) return
  }
  for (let a = 0; a < free.length; a++) {
    const i = free[a]!
    const column = columnOf(book, i)
    const inI = !mask || mask[i] ? 1 : 0
    for (let b = 0; b <= a; b++) {
      const j = free[b]!
      const inJ = !mask || mask[j] ? 1 : 0
      const c = column[j]!
      let second: number
      if (measure === 'share') second = ((inI + inJ - 2 * aim) * c) / variance
      else if (measure === 'contribution')
        second =
          ((inI + inJ) * c - (aim * (c - (marginals[i]! * marginals[j]!) / variance)) / volatility) /
          volatility
      else second = inI * inJ * (c / size - (gradient[i]! * scale * gradient[j]! * scale) / size)
      const value = (factor * second) / scale
      into.set(a, b, into.get(a, b) + value)
      if (a !== b) into.set(b, a, into.get(b, a) + value)
    }
  }
}

/** A column of C: one pass of the model, once. */
export function columnOf({ model, columns }: LimitedBook, i: number): Float64Array {
  const known = columns.get(i)
  if (known) return known
  const unit = new Float64Array(model.size)
  unit[i] = 1
  const column = model.apply(unit).marginals
  columns.set(i, column)
  return column
}

/** Of each limit, against what was asked for, not what the search aims at. */
export function residualsOf({ limits }: LimitedBook, { figures }: Point): LimitResidual[] {
  return limits.map(({ most }, k) => ({ figure: figures[k]!, most, excess: figures[k]! - most }))
}
