import { countOf, listOf, ordinal, quote } from '../wording'
import { withGaps } from './corrections'
import type { Evidence, Held } from './evidence'
import { cellsOf, dayOf, lowerMiddle, range, upperMiddle, whenOf } from './evidence'
import type { Advice, Check, Found, Suspicion } from './telling'
import { lineOf, told } from './telling'

// Returns that are not there: at the head of a series, at its end, or within it. The thresholds are our own conventions.

/** A history is short below this share of what the holdings usually have. */
const SHORT = 0.75
/** Gaps of more dates than this share change what the figures rest on. */
const MANY_GAPS = 0.05

/** Series that start later or end earlier than the others, and those with far fewer returns. */
export function histories(evidence: Evidence): Found {
  const { held, returns, settings } = evidence
  const filled = held.filter(({ fact }) => fact.count > 0)
  const usual: Usual = {
    first: lowerMiddle(filled.map(({ fact }) => fact.first)),
    last: upperMiddle(filled.map(({ fact }) => fact.last)),
    count: upperMiddle(filled.map(({ fact }) => fact.count)),
  }
  const late = filled.filter(({ fact }) => fact.first > usual.first)
  const isShort = ({ fact }: Held): boolean => fact.count < SHORT * usual.count
  const early = filled.filter(({ fact }) => fact.last < usual.last)
  const ofMissing = (): Advice => ({
    effect: effectOf(evidence),
    remedy:
      'Choose another way to treat the dates it does not have, or put in the returns of something alike.',
    corrections: withGaps(evidence),
  })
  const short = held
    .filter((one) => one.fact.count === 0 || (late.includes(one) && isShort(one)))
    .map((one) => (one.fact.count === 0 ? empty(evidence, one) : startsLate(evidence, one, usual, true)))
  return {
    checks: [
      ...told('short history', short, ofMissing),
      ...told(
        'starts late',
        late.filter((one) => !isShort(one)).map((one) => startsLate(evidence, one, usual, false)),
        ofMissing,
      ),
      ...told(
        'ends early',
        early.map((one) => endsEarly(evidence, one, usual)),
        () => ({
          effect:
            settings.gaps === 'common dates'
              ? `The newest dates are left out for every holding: the figures are those of ${evidence.lastCommon < 0 ? 'an earlier time' : dayOf(evidence, evidence.lastCommon)}.`
              : 'Its newest returns are missing from the figures, which are the older for it.',
          remedy: 'Bring the series up to date; if it is not held any more, take it out of the holdings.',
          corrections: withGaps(evidence),
        }),
      ),
      // the other way round: a row begun for a few series only
      ...(filled.length > 1 && usual.last < returns.rows - 1 ? goOn(evidence, filled, usual) : []),
    ],
  }
}

/** Where most series start and end, and how many returns they have. */
interface Usual {
  readonly first: number
  readonly last: number
  readonly count: number
}

function empty({ returns, facts }: Evidence, held: Held): Suspicion {
  return {
    held,
    weight: 'warns',
    text: `${quote(held.name)} has no return${facts.from > 0 ? ' within the look-back' : ''}.`,
    areas: [returns.seriesCell(held.series)],
  }
}

function startsLate(evidence: Evidence, held: Held, usual: Usual, isShort: boolean): Suspicion {
  const { first, count } = held.fact
  // a price comes before the first return: the blanks are one row up
  const shift = evidence.returns.content === 'prices' ? 1 : 0
  const start = `${quote(held.name)} starts ${whenOf(evidence, first)}`
  return {
    held,
    weight: isShort ? 'warns' : 'notes',
    text: isShort
      ? `${start} and has ${countOf(count, 'return')} where the others have ${usual.count}.`
      : `${start}, ${countOf(first - usual.first, evidence.period)} after the others.`,
    areas: cellsOf(evidence, held.series, range(evidence.facts.from - shift, first - shift)),
  }
}

function endsEarly(evidence: Evidence, held: Held, usual: Usual): Suspicion {
  const { last } = held.fact
  return {
    held,
    weight: 'warns',
    text: `the last return of ${quote(held.name)} is ${evidence.returns.dates ? 'on ' : ''}${dayOf(evidence, last)}, ${countOf(usual.last - last, evidence.period)} before the others’.`,
    areas: cellsOf(evidence, held.series, range(last + 1, evidence.returns.rows)),
  }
}

function goOn(evidence: Evidence, filled: readonly Held[], { last }: Usual): readonly Check[] {
  const ahead = filled.filter(({ fact }) => fact.last > last)
  const [first] = ahead
  if (!first) return []
  return [
    lineOf({
      kind: 'dates',
      weight: 'notes',
      at: evidence.returns.cell(last + 1, first.series),
      text: `after ${dayOf(evidence, last)} only ${listOf(ahead.map(({ name }) => quote(name)))} ${ahead.length === 1 ? 'goes' : 'go'} on.`,
      areas: ahead.flatMap(({ series, fact }) => cellsOf(evidence, series, range(last + 1, fact.last + 1))),
      effect: effectOf(evidence),
      remedy: 'Complete the newest dates for all series.',
    }),
  ]
}

/** Dates without a return between the first and the last of a series. */
export function gaps(evidence: Evidence): Found {
  const { held, returns, settings } = evidence
  const holed = held.filter(({ fact }) => fact.gaps.length > 0)
  const dates = new Set(holed.flatMap(({ fact }) => [...fact.gaps])).size
  const isGrave = dates > MANY_GAPS * evidence.inView || settings.gaps === 'completed'
  const isPrices = returns.content === 'prices'
  const suspicion = (one: Held): Suspicion => {
    const { gaps, every, count } = one.fact
    // two returns hang on one price: the later one's cell holds a price
    const blank = [...gaps].filter((row, k) => !isPrices || gaps[k + 1] === row + 1)
    const rest = blank.length - 1
    const more = rest > 0 ? ` and at ${countOf(rest, 'more date')} within its history` : ''
    const often =
      every !== null && gaps.length > count
        ? ` It has one every ${ordinal(every)} ${evidence.period} only.`
        : ''
    return {
      held: one,
      weight: isGrave ? 'warns' : 'notes',
      text: `${quote(one.name)} has no ${isPrices ? 'price' : 'return'} ${whenOf(evidence, blank[0] ?? 0)}${more}.${often}`,
      areas: cellsOf(evidence, one.series, blank),
    }
  }
  return {
    checks: told('gaps', holed.map(suspicion), () => ({
      effect: effectOfGaps(evidence, dates),
      remedy: 'Fill in what is known; a blank stays a gap, and a 0 in its place would be a return of 0.',
      corrections: withGaps(evidence),
    })),
  }
}

function effectOfGaps(evidence: Evidence, dates: number): string {
  const { settings, returns, common, inView } = evidence
  switch (settings.gaps) {
    case 'common dates':
      return `${returns.content === 'prices' ? 'A missing price costs the returns on both sides of it. ' : ''}${countOf(dates, 'date')} with such a gap ${dates === 1 ? 'is' : 'are'} left out for every holding: ${common} of ${inView} count.`
    case 'own overlap':
      return effectOf(evidence)
    case 'completed':
      return 'Histories can be completed only where a series has no gap once it has begun: the figures cannot be computed this way.'
  }
}

/** What dates that not every holding has do to the figures. */
function effectOf({ settings, common, inView }: Evidence): string {
  switch (settings.gaps) {
    case 'common dates':
      return `${common} of ${countOf(inView, 'date')} have a return for every holding; the figures rest on these alone, and what the other holdings did on the rest is left out.`
    case 'own overlap':
      return 'Each pair of holdings rests on the dates it shares: correlations with a shorter series are the less sure, and may have to be mended to fit together.'
    case 'completed':
      return 'What is missing is carried over from the longer series by regression: as sure as that relation is.'
  }
}
