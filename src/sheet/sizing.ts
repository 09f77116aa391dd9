import { courseOf, Fault, financed, loweringPairs, loweringTrades, removals } from '../core'
import type { Course, Financing, LoweringTrade, RiskModel, Shorting } from '../core'
import type { Limit } from './limits'
import { LIMIT_MEASURES, limitOn } from './limits'
import { percentText, quote } from './wording'

/** What sizing needs to know of a book; series that are not held stand among the positions with weight 0. */
export interface SizingInputs {
  readonly names: readonly string[]
  readonly model: RiskModel
  readonly weights: Float64Array
  /** periods in a year the figures are scaled to; 1: per period */
  readonly periods: number
}

/** Portfolio risk at one weight of the position. */
export interface SizingPoint {
  readonly weight: number
  readonly volatility: number
  /** of the position; null where there is no risk */
  readonly share: number | null
}

/** A point of the curve that has a name. */
export interface SizingMark extends SizingPoint {
  readonly kind: 'today' | 'least risk' | 'removed' | 'soft limit' | 'hard limit'
  readonly label: string
  /** whether it lies on the stretch that the curve shows */
  readonly shown: boolean
}

/** Portfolio risk against the weight of one position, everything else moving as its financing says. */
export interface Sizing {
  readonly name: string
  readonly financing: string
  /** by weight, from the left end of the picture to the right; every mark that is shown is a point of it */
  readonly curve: readonly SizingPoint[]
  readonly marks: readonly SizingMark[]
  /** change of volatility if the position is removed; 0 for one that is not held */
  readonly changeIfRemoved: number
  /** change of volatility for a unit of weight at today's, its financing included; null where the book has no risk */
  readonly slope: number | null
  /** what has to be said beside the picture */
  readonly notes: readonly string[]
}

const POINTS = 60

/** Where nothing sets a scale, the curve reaches this weight. Our own convention. */
const USUAL_REACH = 0.05

/** The least-risk weight is shown while it lies no more than this many times the rest of the picture away. Our own convention. */
const FARTHEST = 3

/** What takes the difference of a trade, in words. */
export function financingText(financing: Financing, names: readonly string[]): string {
  switch (financing.kind) {
    case 'cash':
      return 'cash beyond the holdings (nothing else moves)'
    case 'pro rata':
      return 'the rest of the book, in proportion to its weights'
    case 'position':
      return quote(names[financing.position] ?? '')
  }
}

/**
 * Portfolio volatility against the weight of one position, with the weights that mean something: today's, the one of least risk, 0, and those
 * at which a limit is reached.
 *
 *   s(x)^2 = w'Cw + 2 (x - w_i) d'Cw + (x - w_i)^2 d'Cd,   d: a unit of the position and its financing
 *
 * Of the limits, those on the position's weight, stand-alone risk and share of risk, on the share of its groups, and on the book's volatility have
 * such weights.
 *
 * @param limits   of the book; scaled as the figures are
 * @throws Fault   those of core's financed and courseOf
 * @cost           four passes of the model, a few more for each limit
 */
export function sizingOf(
  inputs: SizingInputs,
  position: number,
  financing: Financing,
  limits: readonly Limit[] = [],
): Sizing {
  const { names, model, weights, periods } = inputs
  const name = names[position]
  if (name === undefined)
    throw new Fault('out-of-range', `position: number ${position}`, 'a position of the book is needed')
  const direction = financed(weights, unitOf(weights.length, position), financing).changes
  const course = courseOf(model, weights, direction)
  const scale = Math.sqrt(periods)
  const today = weights[position]!
  const at = (weight: number): SizingPoint => ({
    weight,
    volatility: course.volatilityAt(weight - today) * scale,
    share: course.shareAt([position], weight - today),
  })

  const named: Omit<SizingMark, 'shown'>[] = [
    { ...at(today), kind: 'today', label: today === 0 ? 'Not held' : 'Today' },
  ]
  if (today !== 0) named.push({ ...at(0), kind: 'removed', label: 'Removed' })
  if (course.leastAt !== null)
    named.push({ ...at(today + course.leastAt), kind: 'least risk', label: 'Least-risk weight' })
  for (const limit of limits)
    for (const kind of ['soft', 'hard'] as const) {
      const figure = limit[kind]
      if (figure === null) continue
      for (const change of changesToLimit(limit, figure, position, course, model, scale))
        named.push({ ...at(today + change), kind: `${kind} limit`, label: limitLabel(limit, kind, figure) })
    }

  const [left, right] = stretchOf(named, today)
  const marks = named.map((mark) => ({ ...mark, shown: mark.weight >= left && mark.weight <= right }))
  const grid = Array.from({ length: POINTS }, (_, k) => left + ((right - left) * k) / (POINTS - 1))
  const places = new Set([...grid, ...marks.filter(({ shown }) => shown).map(({ weight }) => weight)])
  return {
    name,
    financing: financingText(financing, names),
    curve: [...places].sort((a, b) => a - b).map(at),
    marks,
    changeIfRemoved: today === 0 ? 0 : removals(model, weights, financing).change[position]! * scale,
    slope: course.slope === null ? null : course.slope * scale,
    notes: notesOf(name, course, [left, right], position, financing),
  }
}

const unitOf = (size: number, position: number) => {
  const unit = new Float64Array(size)
  unit[position] = 1
  return unit
}

/** Changes of the position's weight at which a limit that depends on it in closed form is reached. */
function changesToLimit(
  { scope, measure, members }: Limit,
  figure: number,
  position: number,
  course: Course,
  model: RiskModel,
  scale: number,
): readonly number[] {
  const today = course.weights[position]!
  const own = scope === 'holding' && members?.[0] === position
  // limits hold the size of a position, be it long or short
  const side = today < 0 ? -1 : 1
  if (own && measure === 'weight') return [side * figure - today]
  if (own && measure === 'stand-alone risk') {
    const deviation = Math.sqrt(model.variances()[position]!) * scale
    return deviation === 0 ? [] : [(side * figure) / deviation - today]
  }
  if (measure === 'share of risk' && members?.includes(position))
    return course.sharesReach(members, figure).at
  if (measure === 'volatility' && figure >= 0) return course.volatilityReach(figure / scale).at
  return []
}

const limitLabel = (limit: Limit, kind: 'soft' | 'hard', figure: number) =>
  `${LIMIT_MEASURES[limit.measure].label}${limit.scope === 'group' ? ` of ${limitOn(limit)}` : limit.scope === 'total' ? ' of the book' : ''}, ${kind} limit ${percentText(figure)}`

/** The weights a picture shows: 0, today's, twice today's, and in reach the least-risk weight and limits on today's side of 0. */
function stretchOf(
  named: readonly Omit<SizingMark, 'shown'>[],
  today: number,
): readonly [left: number, right: number] {
  let left = Math.min(0, 2 * today)
  let right = Math.max(0, 2 * today)
  if (left === right) {
    const limit = named.find(({ kind }) => kind === 'hard limit' || kind === 'soft limit')
    right = limit && limit.weight > 0 ? limit.weight : USUAL_REACH
  }
  // the span as it was, so that one far mark does not bring in the next
  const span = right - left
  const [first, last] = [left - FARTHEST * span, right + FARTHEST * span]
  for (const { kind, weight } of named) {
    const otherSide = kind.endsWith('limit') && weight * (today || 1) < 0
    if (otherSide || weight < first || weight > last) continue
    left = Math.min(left, weight)
    right = Math.max(right, weight)
  }
  const margin = 0.05 * (right - left)
  return [left - margin, right + margin]
}

function notesOf(
  name: string,
  { leastAt, weights, direction }: Course,
  [left, right]: readonly [number, number],
  position: number,
  financing: Financing,
): string[] {
  const notes: string[] = []
  if (leastAt === null)
    notes.push(
      `The weight of ${quote(name)} changes nothing about the portfolio’s risk with this financing, so that no weight has least risk.`,
    )
  if (financing.kind === 'pro rata') {
    const net = weights.reduce((sum, weight, i) => (i === position ? sum : sum + weight), 0)
    const shorts = weights.some((weight, i) => i !== position && weight < 0)
    if (shorts)
      notes.push(
        `The rest of the book holds shorts: longs and shorts alike grow or shrink with it, ${percentText(
          direction.reduce((sum, d, i) => (i === position ? sum : sum + Math.abs(d)), 0),
          0,
        )} of positions for 100% of money.`,
      )
    // the factor of the rest, 1 - t / net, is 0 there
    const usedUp = weights[position]! + net
    if (usedUp > left && usedUp < right)
      notes.push(
        `At ${percentText(usedUp)} the rest of the book is used up: beyond, its longs turn into shorts.`,
      )
  }
  return notes
}

/** A trade that lowers risk, as plain figures by name. */
export interface RiskLowering {
  readonly kind: 'buy' | 'sell' | 'switch'
  readonly name: string
  /** what is bought with the proceeds; null unless it is a switch */
  readonly into: string | null
  readonly weight: number
  /** the weight where it ends */
  readonly weightAfter: number
  /** change of volatility for each 100% of turnover, at today's weights; below 0 */
  readonly perTurnover: number
  readonly turnover: number
  readonly volatility: number
  /** volatility there less today's; below 0 */
  readonly change: number
  /** why it ends there: more would raise risk again, or a position would turn from long to short */
  readonly end: 'least risk' | 'weight 0'
}

/** What turnover is, wherever it stands. */
export const TURNOVER_READING =
  'Turnover is one way: the larger of what is bought and what is sold, as a part of capital.'

/** What the list is and is not. */
export const LOWERING_READING =
  'What each trade alone would do to the estimated risk, nothing else: neither costs, nor returns, nor limits are looked at.'

/** Trades by risk lowered for each unit of turnover, steepest first. */
export interface RiskLowerings {
  readonly financing: string
  /** one position and its financing */
  readonly trades: readonly RiskLowering[]
  /** one position sold and another bought */
  readonly switches: readonly RiskLowering[]
  /** positions that this financing cannot serve */
  readonly unfinanced: readonly string[]
  readonly shorting: Shorting
}

/**
 * The trades that lower risk most for each unit of turnover, and how far each goes before risk stops falling.
 *
 * @param shorting  left out: "no shorting", unless the book holds shorts already
 * @param switches  how many pairs at most
 * @throws Fault    those of core's loweringTrades
 * @cost            O(n log n) after one or two passes, and one pass for each position that a switch sells
 */
export function riskLowering(
  { names, model, weights, periods }: SizingInputs,
  financing: Financing,
  shorting: Shorting = weights.some((weight) => weight < 0) ? 'shorting' : 'no shorting',
  switches = 10,
): RiskLowerings {
  const scale = Math.sqrt(periods)
  const line = (trade: LoweringTrade): RiskLowering => {
    const weight = weights[trade.position]!
    // sold to nothing is 0, whatever the last digits of the two say
    const sold = trade.end === 'weight 0' && trade.change === -weight
    return {
      kind: trade.against !== null ? 'switch' : trade.change > 0 ? 'buy' : 'sell',
      name: names[trade.position]!,
      into: trade.against === null ? null : names[trade.against]!,
      weight,
      weightAfter: sold ? 0 : weight + trade.change,
      perTurnover: trade.perTurnover * scale,
      turnover: trade.turnover,
      volatility: trade.volatility * scale,
      change: trade.volatilityChange * scale,
      end: trade.end,
    }
  }
  const { trades, unfinanced } = loweringTrades(model, weights, financing, shorting)
  return {
    financing: financingText(financing, names),
    trades: trades.map(line),
    switches: loweringPairs(model, weights, shorting, switches).map(line),
    unfinanced: unfinanced.map((i) => names[i]!),
    shorting,
  }
}
