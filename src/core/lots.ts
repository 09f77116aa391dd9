import {
  gradientOf,
  limitedBook,
  limitsHold,
  pointAt,
  residualsOf,
  sumOf,
  totalChange,
  turnoverOf,
  type ChangeProblem,
  type LimitResidual,
  type Point,
} from './change-limits'
import { checkBlock, Fault } from './fault'
import type { RiskModel } from './risk-model'

/** Changes of weights in whole lots, and what that does. */
export interface LotsResult {
  readonly weights: Float64Array
  /** Of each position, above 0 bought; 0 where it stays, and where any size is allowed */
  readonly lots: Float64Array
  /** Whether all limits hold at these weights, turnover and bounds included. */
  readonly holds: boolean
  /** For each limit, in their order. */
  readonly residuals: readonly LimitResidual[]
  /** Sum of absolute changes. */
  readonly change: number
  /** One way: the larger of what is bought and what is sold. */
  readonly turnover: number
  /** What the changes leave to cash beyond those asked for: whole lots seldom add up to the same sum. */
  readonly toCash: number
  /** The largest difference from the weight asked for, and its position; -1: none */
  readonly largest: number
  readonly position: number
  /** Lots that were added or taken off the nearest number for the sake of limits. */
  readonly moved: number
}

/** Of lots added or taken off beyond the nearest number. */
const MOST_MOVES = 400
/** Choices tried, in the order in which slopes promise most, before there is said to be none. */
const MOST_TRIALS = 8

/**
 * Rounds changes of weights to whole lots: each to the nearest number of them, then, while a limit is over, one lot more or less where that brings down what
 * is over most. Positions that do not change are left alone. Finding the best of all roundings is another problem; this one says what its own does.
 *
 *   w_i = w0_i + k_i lot_i
 *
 * @param model    n positions
 * @param problem  today's weights, limits and bounds
 * @param weights  n; a proposal for it, as of `smallestChange`
 * @param lots     n; the size of a lot in weight; 0: no lots
 * @returns        yields the share done; limits that lots cannot hold are in the result
 * @throws Fault   "shape" | "not-a-number" | "out-of-range" (a lot below 0) and those of `smallestChange`
 * @source         common practice, no source
 * @cost           a few passes of the model for each lot that is moved
 * @example        inOneGo(roundToLots(matrixModel(Float64Array.of(.04, 0, 0, .04), 2), { weights: Float64Array.of(.6, .4), limits: [{ measure: 'share', members: Int32Array.of(0), most: .5 }], financing: { kind: 'book' } }, Float64Array.of(.5, .5), Float64Array.of(.03, .03))).lots // [-4, 3]
 */
export function* roundToLots(
  model: RiskModel,
  problem: ChangeProblem,
  weights: Float64Array,
  lots: Float64Array,
): Generator<number, LotsResult> {
  const book = limitedBook(model, problem)
  const { origin, lower, upper, limits, cap } = book
  checkBlock(weights, model.size, 1, 'weights')
  checkBlock(lots, model.size, 1, 'lots')
  const negative = lots.findIndex((lot) => lot < 0)
  if (negative >= 0)
    throw new Fault('out-of-range', `lots: ${lots[negative]}`, 'a size of 0 or more is needed', {
      argument: 'lots',
      row: negative,
    })

  const within = (w: number, i: number) => w >= lower[i]! && w <= upper[i]!
  const counts = new Float64Array(model.size)
  const at = (count: number, i: number) => origin[i]! + count * lots[i]!
  const rounded = weights.slice()
  weights.forEach((w, i) => {
    const lot = lots[i]!
    if (lot === 0 || w === origin[i]) return
    const exact = (w - origin[i]!) / lot
    const nearest = Math.round(exact)
    const choices = [nearest, nearest > exact ? nearest - 1 : nearest + 1]
    counts[i] = choices.find((count) => within(at(count, i), i)) ?? nearest
    rounded[i] = at(counts[i]!, i)
  })
  const changing = [...weights.keys()].filter((i) => lots[i]! > 0 && weights[i] !== origin[i])

  let here = pointAt(book, rounded)
  // turnover counts as one limit more
  const beyond = (point: Point) => turnoverOf(origin, point.weights) - cap
  const over = (point: Point) =>
    point.figures.reduce(
      (sum, figure, k) => sum + Math.max(0, (figure - limits[k]!.most) / limits[k]!.scale),
      0,
    ) + Math.max(0, beyond(point))
  let moved = 0
  for (; moved < MOST_MOVES && !limitsHold(book, here); moved++) {
    yield 1 - 0.99 ** moved
    const left = over(here)
    // within a lot or two every limit may come to bind, so all count
    const slopes = limits.map((_, k) => gradientOf(book, k, here))
    const promises = changing
      .flatMap((i) => [1, -1].map((by) => ({ i, by, value: at(counts[i]! + by, i) })))
      .filter(({ i, value }) => within(value, i))
      .map((choice) => {
        const step = choice.value - here.weights[choice.i]!
        const promised = slopes.reduce(
          (sum, slope, k) =>
            sum +
            Math.max(0, (here.figures[k]! - limits[k]!.most) / limits[k]!.scale + slope[choice.i]! * step),
          0,
        )
        return { ...choice, promised }
      })
      .sort((a, b) => a.promised - b.promised)
    const next = promises.slice(0, MOST_TRIALS).find(({ i, value }) => {
      const trial = pointAt(
        book,
        here.weights.map((w, j) => (j === i ? value : w)),
      )
      if (!(over(trial) < left)) return false
      here = trial
      return true
    })
    if (!next) break
    counts[next.i]! += next.by
  }

  let position = -1
  let largest = 0
  here.weights.forEach((w, i) => {
    const gap = Math.abs(w - weights[i]!)
    if (gap <= largest) return
    largest = gap
    position = i
  })
  return {
    weights: here.weights.slice(),
    lots: counts,
    holds: limitsHold(book, here) && here.weights.every(within),
    residuals: residualsOf(book, here),
    change: totalChange(origin, here.weights),
    turnover: turnoverOf(origin, here.weights),
    toCash: sumOf(weights) - sumOf(here.weights),
    largest,
    position,
    moved,
  }
}
