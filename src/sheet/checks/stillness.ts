import { MOST_LAGS, shareBroughtBack, withoutRuns } from '../../core'
import { countOf, ordinal, percentText, quote } from '../wording'
import { mostLags, withLags, withReturns } from './corrections'
import type { Evidence, Held } from './evidence'
import { cellsOf, dayOf, range } from './evidence'
import type { Advice, Found, Suspicion, Told } from './telling'
import { suspect, told } from './telling'

// Series that never change, and prices that are not renewed. The thresholds are our own conventions.

/** Zeros in a row that are no chance, and the share of all returns that shorter rows of them may have. */
const LONG_STILL = 5
const SHORT_STILL = 3
const MOST_STILL = 0.1
/** Lagged terms are worth offering when they bring back this much of what moves holdings together. */
const LEAST_BROUGHT_BACK = 0.5

export function constantSeries(evidence: Evidence): Found {
  const still = evidence.held.filter(({ fact }) => fact.count > 1 && fact.isConstant)
  return {
    explains: still,
    checks: told(
      'constant',
      still.map((held) =>
        suspect(
          evidence,
          held,
          `the returns of ${quote(held.name)} never change (${percentText(held.fact.median, 2)} on ${countOf(held.fact.count, 'date')}).`,
        ),
      ),
      () => ({
        effect: 'It counts as riskless: no risk is put down to it, whatever its weight.',
        remedy: 'Put in its returns; if it really has no risk, mark the holding as riskless.',
      }),
    ),
  }
}

export function stalePrices(evidence: Evidence, open: readonly Held[]): Found {
  const stale = open.filter(
    ({ fact: { still, stillShare, every } }) =>
      still.length >= LONG_STILL ||
      (every !== null && still.length >= every - 1) ||
      (still.length >= SHORT_STILL && stillShare >= MOST_STILL),
  )
  const suspicions = (isRhythmic: boolean): readonly Suspicion[] =>
    stale
      .filter(({ fact }) => (fact.every !== null) === isRhythmic)
      .map((held) => suspicionOf(evidence, held))
  return {
    explains: stale,
    checks: [
      ...told('stale prices', suspicions(true), (about) => adviceOnRhythm(evidence, about)),
      ...told('stale prices', suspicions(false), (about) => adviceOnRests(evidence, about)),
    ],
  }
}

function suspicionOf(evidence: Evidence, held: Held): Suspicion {
  const { still, every, count, stillShare } = held.fact
  const end = still.start + still.length
  const span = `${dayOf(evidence, still.start)} to ${dayOf(evidence, end - 1)}`
  const more =
    stillShare * count > still.length
      ? `; ${percentText(stillShare, 0)} of its returns are zeros in a row`
      : ''
  return {
    held,
    weight: 'warns',
    text:
      every !== null
        ? `${quote(held.name)} moves every ${ordinal(every)} ${evidence.period} only; its return is exactly 0 in between (here ${span}).`
        : `${quote(held.name)} has a return of exactly 0 on ${countOf(still.length, 'date')} in a row (${span})${more}.`,
    areas: cellsOf(evidence, held.series, range(still.start, end)),
  }
}

function adviceOnRhythm(evidence: Evidence, about: Told): Advice {
  const { period } = evidence
  const every = Math.max(...about.map(({ held }) => held.fact.every ?? 1))
  const lags = mostLags(evidence, 2 * every - 1)
  const back = shareBroughtBack(every, lags)
  const corrections = back >= LEAST_BROUGHT_BACK ? withLags(evidence, lags) : []
  const offer =
    corrections.length > 0
      ? `; ${countOf(lags, 'lagged term')} bring back about ${percentText(back, 0)} of what it shares`
      : ''
  return {
    effect: `What happens in between shows late and all at once: about ${percentText(1 / every, 0)} of what it shares with other holdings falls on the same date, so its correlations with them look closer to 0 than they are.`,
    remedy: `Use prices of every ${period} where there are any, or returns over ${every} ${period}s for the whole book${offer}.`,
    corrections,
  }
}

function adviceOnRests(evidence: Evidence, about: Told): Advice {
  const longest = Math.max(...about.map(({ held }) => held.fact.still.length))
  const asGaps = withReturns(evidence, `With ${LONG_STILL} or more zeros in a row as gaps`, about, (x) =>
    withoutRuns(x, LONG_STILL),
  )
  return {
    effect:
      'Zeros in a row are prices that were not renewed, or blanks filled with 0: correlations look closer to 0 than they are, and where no later return makes up for them so does the volatility.',
    remedy: 'Renew the prices, or leave the cells blank so that they count as gaps.',
    corrections: [
      ...(longest >= LONG_STILL ? [asGaps] : []),
      // fewer lagged terms than the longest rest would not reach across it
      ...(longest <= MOST_LAGS ? withLags(evidence, longest) : []),
    ],
  }
}
