import { splitRatio } from '../../core'
import type { SplitRatio } from '../../core'
import { countOf, numberText, percentText, quote } from '../wording'
import type { Correction } from './corrections'
import { withReturns } from './corrections'
import type { Evidence, Held } from './evidence'
import { dayOf, isQuiet, whenOf } from './evidence'
import type { FarReturn, SeriesFact } from './series-facts'
import { NEAREST_FAR } from './series-facts'
import type { Advice, Check, Found, Suspicion, Told } from './telling'
import { lineOf, told } from './telling'

// Missed splits, single returns far out, and dates on which the whole market moved. The thresholds are our own conventions.

/**
 * A return is far out beyond so many robust scales (median, 1.4826 x median distance from it), and more likely wrong than wild beyond so
 * many: of Student t with 5 degrees, fat tails for weekly returns, 1 in 8,400 lies beyond 10 and 1 in 250,000 beyond 20. Three faults show
 * already at NEAREST_FAR: a split, as its size says what it is, a move that is taken back, and one of many on the same date.
 */
const FAR = 10
const LIKELY_WRONG = 20
/** So many holdings far out on one date are the market. */
const FEWEST_FOR_A_MARKET = 3
const LEAST_SHARE_FOR_A_MARKET = 0.2
/** A move is taken back where so many robust scales at most are left of both returns. */
const MOST_LEFT = 4
/** How far a return may be from what a split alone would make of it: the share moved that day as well, by about its scale. */
const LEAST_ROOM = 0.02
const MOST_ROOM = 0.05

interface FarOne {
  readonly held: Held
  readonly far: FarReturn
}

/** A suspicion about one far return, with what to put in its place. */
interface FarSuspicion extends Suspicion, FarOne {
  readonly kind: 'missed split' | 'outlier'
  readonly mended: readonly (readonly [row: number, value: number])[]
}

export function farReturns(evidence: Evidence, open: readonly Held[]): Found {
  const all = open
    .flatMap((held) => held.fact.far.map((far) => ({ held, far })))
    // what is wild in cash is nothing beside the others
    .filter(
      ({ held, far }) =>
        !isQuiet(evidence, held) || Math.abs(far.value - held.fact.median) > evidence.usualScale,
    )
  const byDate = new Map<number, FarOne[]>()
  for (const one of all) {
    const movers = byDate.get(one.far.row)
    if (movers) movers.push(one)
    else byDate.set(one.far.row, [one])
  }
  const isMarket = ({ length }: readonly FarOne[]): boolean =>
    length >= FEWEST_FOR_A_MARKET && length >= LEAST_SHARE_FOR_A_MARKET * evidence.held.length
  const single = all.filter(({ far }) => !isMarket(byDate.get(far.row) ?? []))
  const suspicions = single.flatMap((one) => suspicionOf(evidence, one) ?? [])
  const of = (kind: FarSuspicion['kind']): readonly FarSuspicion[] =>
    suspicions.filter((suspicion) => suspicion.kind === kind)
  const noun = ['return', 'returns'] as const
  return {
    checks: [
      ...told('missed split', of('missed split'), (about) => adviceOnSplits(evidence, about), noun),
      ...told('outlier', of('outlier'), (about) => adviceOnOutliers(evidence, about), noun),
      ...marketMoves(
        evidence,
        [...byDate].filter(([, movers]) => isMarket(movers)),
      ),
    ],
  }
}

/** Null for a return that is not far enough out to be told, or that takes the one before it back: then that one is told. */
function suspicionOf(evidence: Evidence, { held, far }: FarOne): FarSuspicion | null {
  const { returns } = evidence
  const { fact, series } = held
  const isLog = returns.content === 'prices' && evidence.settings.returnKind === 'log'
  const [before, after] = [-1, 1].map((step) => fact.far.find(({ row }) => row === far.row + step))
  if (before && isTakenBack(before, far, fact, isLog)) return null

  const area = returns.cell(far.row, series)
  const size = `${percentText(far.value)}, ${numberText(Math.abs(far.multiple), 0)} robust standard deviations from its median`
  const start = `the return of ${quote(held.name)} ${whenOf(evidence, far.row)} is ${size}`
  const suspicion = { held, far, weight: 'warns', areas: [area] } as const
  if (after && isTakenBack(far, after, fact, isLog)) {
    const half = halfOf(far, after, isLog)
    return {
      ...suspicion,
      kind: 'outlier',
      text: `${start}, and the next one takes it back: a wrong price?`,
      areas: [area, returns.cell(after.row, series)],
      mended: [
        [far.row, half],
        [after.row, half],
      ],
    }
  }
  const split = splitOf(far, fact, isLog)
  if (split)
    return {
      ...suspicion,
      kind: 'missed split',
      text: `${start}: what a split of ${split.fresh} for ${split.old} that was not adjusted for would leave.`,
      mended: [[far.row, isLog ? Math.log1p(split.rest) : split.rest]],
    }
  if (Math.abs(far.multiple) <= FAR) return null
  return {
    ...suspicion,
    kind: 'outlier',
    weight: Math.abs(far.multiple) > LIKELY_WRONG ? 'warns' : 'notes',
    text: `${start}.`,
    mended: [[far.row, fact.median]],
  }
}

/** A return as the change of a price in proportion. */
const changeOf = ({ value }: FarReturn, isLog: boolean): number => (isLog ? Math.expm1(value) : value)

/** What is left of both, as new price over old. */
const growthOf = (first: FarReturn, second: FarReturn, isLog: boolean): number =>
  (1 + changeOf(first, isLog)) * (1 + changeOf(second, isLog))

/** Whether a second return takes a first one back but for what the series usually moves. */
const isTakenBack = (first: FarReturn, second: FarReturn, { scale }: SeriesFact, isLog: boolean): boolean =>
  first.value * second.value < 0 && Math.abs(growthOf(first, second, isLog) - 1) <= MOST_LEFT * scale

/** The return that, twice, leaves what is left of both. */
function halfOf(first: FarReturn, second: FarReturn, isLog: boolean): number {
  const growth = growthOf(first, second, isLog)
  return isLog ? Math.log(growth) / 2 : Math.sqrt(growth) - 1
}

function splitOf(far: FarReturn, { scale }: SeriesFact, isLog: boolean): SplitRatio | null {
  const change = changeOf(far, isLog)
  return change > -1 ? splitRatio(change, Math.min(MOST_ROOM, Math.max(LEAST_ROOM, scale))) : null
}

const adviceOnSplits = (evidence: Evidence, about: Told<FarSuspicion>): Advice => ({
  effect: `${shareText(about)}; if it is a split, that part of its risk is not there.`,
  remedy: 'Look the split up; adjust the prices before it, or put the return right.',
  corrections: [withMended(evidence, about, 'With the split undone', 'With these splits undone')],
})

function adviceOnOutliers(evidence: Evidence, about: Told<FarSuspicion>): Advice {
  const spread = 'With the move and its return spread evenly'
  const one = about[0].mended.length > 1 ? spread : 'With the median in its place'
  return {
    effect: `${shareText(about)}, and so of much that is said about its risk.`,
    remedy:
      'Check it against another source and put it right if it is wrong; if it is right it belongs in the figures.',
    corrections: [withMended(evidence, about, one, 'With medians in their place')],
  }
}

const shareText = ([{ held, far }]: Told<FarSuspicion>): string =>
  `This one return makes up ${percentText(far.share, 0)} of the variance of ${quote(held.name)}`

function withMended(evidence: Evidence, about: Told<FarSuspicion>, one: string, many: string): Correction {
  const label = about.length === 1 ? `${one} (${dayOf(evidence, about[0].far.row)})` : many
  return withReturns(evidence, label, about, (x, held) => {
    for (const suspicion of about)
      if (suspicion.held === held) for (const [row, value] of suspicion.mended) x[row] = value
    return x
  })
}

/** One line for all dates on which many moved at once. */
function marketMoves(
  evidence: Evidence,
  market: readonly (readonly [row: number, movers: readonly FarOne[]])[],
): readonly Check[] {
  const days = [...market].sort(([a], [b]) => a - b)
  const [first, ...others] = days
  if (!first) return []
  const [row, movers] = first
  const more = others.length > 0 ? `, and so on ${countOf(others.length, 'more date')}` : ''
  return [
    lineOf({
      kind: 'outlier',
      weight: 'notes',
      text: `${countOf(movers.length, 'holding')} moved more than ${NEAREST_FAR} robust standard deviations from their median ${whenOf(evidence, row)}${more}.`,
      areas: days.flatMap(([day, those]) => those.map(({ held }) => evidence.returns.cell(day, held.series))),
      effect:
        'Moves of many at once are the market’s as a rule: they make the tails of the book, which normal figures understate.',
      remedy: 'Nothing to mend unless a whole row is wrong; compare historical value at risk and shortfall.',
    }),
  ]
}
