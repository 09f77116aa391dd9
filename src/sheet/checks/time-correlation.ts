import { jointLimit, unsmoothedReturns, unsmoothingFactor, usualLags } from '../../core'
import { numberText, percentText, quote } from '../wording'
import { withLags, withReturns } from './corrections'
import type { Evidence, Held } from './evidence'
import type { TimeCorrelation } from './series-facts'
import type { Advice, Found, Suspicion, Told } from './telling'
import { suspect, told } from './telling'

// Returns that go with their own last ones, or with the others' of the day before or after. The thresholds are our own conventions.

/** Chance that any series of a book is told for a correlation over time it does not have; shared out among the series. */
const CHANCE = 0.01
/** Correlations over time below this change little whatever chance says. */
const LEAST_CORRELATION = 0.1

/** What chance makes of correlations in a book of so many series. */
function chanceIn({ held }: Evidence) {
  const limit = jointLimit(held.length, CHANCE)
  return {
    isBeyond: (found: TimeCorrelation | null): found is TimeCorrelation =>
      found !== null &&
      Math.abs(found.value) > limit * found.standardError &&
      Math.abs(found.value) >= LEAST_CORRELATION,
    /** a correlation, called by its name, beside what chance alone would make of it */
    text: (name: string, { value, standardError }: TimeCorrelation): string =>
      `${name} ${numberText(value)}, where by chance all ${held.length} series would stay within ${numberText(limit * standardError)} of 0 in at least ${percentText(1 - CHANCE, 0)} of cases.`,
  }
}

/** A series with its own last return: smoothed or late prices, or such as jump back and forth. */
export function serialCorrelation(evidence: Evidence, open: readonly Held[]): Found {
  const chance = chanceIn(evidence)
  const found = open.flatMap((held) => {
    const { serial } = held.fact
    return chance.isBeyond(serial) ? [{ held, serial }] : []
  })
  const suspicions = (isSmooth: boolean): readonly Suspicion[] =>
    found
      .filter(({ serial }) => serial.value > 0 === isSmooth)
      .map(({ held, serial }) =>
        suspect(
          evidence,
          held,
          `the returns of ${quote(held.name)} ${isSmooth ? 'go on as the last one went' : 'take back part of the last one'}: ${chance.text('autocorrelation', serial)}`,
        ),
      )
  return {
    explains: found.map(({ held }) => held),
    checks: [
      ...told('serial correlation', suspicions(true), (about) => adviceOnSmoothing(evidence, about)),
      ...told('serial correlation', suspicions(false), () => ({
        effect:
          'Part of each move is taken back on the next date: its volatility scaled to a longer horizon is too large.',
        remedy:
          'Look for prices that jump back and forth; returns over longer periods, or lagged terms, show the lasting moves.',
        corrections: withLags(evidence, usualLags(evidence.inView)),
      })),
    ],
  }
}

function adviceOnSmoothing(evidence: Evidence, about: Told): Advice {
  const rhoOf = ({ fact }: Held): number => fact.serial?.value ?? 0
  const first = about[0].held
  return {
    effect: `Prices that are smoothed or late look calmer than they are: if that is it, the volatility of ${quote(first.name)} is about ${numberText(unsmoothingFactor(rhoOf(first)))} times what its returns show, and its correlations with the others are too small.`,
    remedy:
      'Use traded prices where there are any, count lagged terms, or look at the figures with the smoothing undone.',
    corrections: [
      ...withLags(evidence, usualLags(evidence.inView)),
      withReturns(evidence, 'With the smoothing undone', about, (x, held) =>
        unsmoothedReturns(x, rhoOf(held)),
      ),
    ],
  }
}

/** A series with the others a day before or after. One direction only: what lags behind the others, or else what runs ahead of them. */
export function closingTimes(evidence: Evidence, open: readonly Held[]): Found {
  const chance = chanceIn(evidence)
  const suspicions = (direction: 'follows' | 'leads'): readonly Suspicion[] =>
    open.flatMap((held) => {
      const found = held.fact[direction]
      const opposite = held.fact[direction === 'follows' ? 'leads' : 'follows']
      if (!chance.isBeyond(found) || found.value <= 0 || chance.isBeyond(opposite)) return []
      const what =
        direction === 'follows' ? 'follow the others’ of the day before' : 'run a day ahead of the others’'
      return [
        suspect(
          evidence,
          held,
          `daily returns of ${quote(held.name)} ${what}: ${chance.text('correlation', found)}`,
        ),
      ]
    })
  // where some lag behind, the rest run ahead: one fault
  const behind = suspicions('follows')
  return {
    checks: told('closing times', behind.length > 0 ? behind : suspicions('leads'), () => ({
      effect:
        'Its market seems to close at another time: what it shares with the others falls on two dates, so daily correlations look too small and diversification too good.',
      remedy: 'Use weekly returns or prices of one time of day for the whole book, or count one lagged term.',
      corrections: withLags(evidence, 1),
    })),
  }
}
