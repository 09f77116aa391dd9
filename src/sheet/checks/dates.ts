import { countOf, numberText } from '../wording'
import type { Evidence } from './evidence'
import { cellsOf, dayOf, periodWord, range } from './evidence'
import type { Check, Found } from './telling'
import { lineOf } from './telling'

// Dates that do not follow one another at one pace. Dates twice or unreadable have stopped the reading already.

/** Fewer dates show no pace. */
const FEWEST_DATES = 6
/** So many steps of another pace in a row are no holiday. */
const FEWEST_OF_ANOTHER = 3

/** Calendar days from one date to the next that need no word: holidays may fall on either end. */
const USUAL_STEPS: { readonly [frequency: string]: readonly [from: number, to: number] } = {
  daily: [1, 10],
  weekly: [5, 10],
  monthly: [25, 36],
  quarterly: [85, 98],
  yearly: [355, 375],
}

/** The gravest of what the dates show: no pace at all, two of them, or single steps out of it. */
export function paceOfDates(evidence: Evidence): Found {
  const { dates } = evidence.returns
  const { steps } = evidence.facts
  if (!dates || !steps || evidence.inView < FEWEST_DATES) return { checks: [] }
  // dates twice leave the others in the wrong place
  if (steps.steps.some((step) => step <= 0)) return { checks: [] }
  const { usual, other } = steps
  const check =
    usual === 'other'
      ? noPace(evidence, steps.steps)
      : other !== null && other.frequency !== 'other' && other.length >= FEWEST_OF_ANOTHER
        ? twoPaces(evidence, dates, usual, other)
        : oddSteps(evidence, dates, usual)
  return { checks: check ? [check] : [] }
}

function noPace(evidence: Evidence, steps: Float64Array): Check {
  const { returns, facts } = evidence
  return lineOf({
    kind: 'mixed frequency',
    weight: 'warns',
    at: returns.cell(facts.from, -1),
    text: `the dates follow no common pace; from one to the next are ${numberText(Math.min(...steps), 0)} to ${countOf(Math.max(...steps), 'day')}.`,
    areas: cellsOf(evidence, -1, range(facts.from, returns.rows)),
    effect: 'Returns over short and long spans count alike, and no number of periods a year fits them all.',
    remedy: 'Bring all series to one frequency, such as month ends.',
  })
}

function twoPaces(
  evidence: Evidence,
  dates: readonly number[],
  usual: string,
  other: { readonly frequency: string; readonly start: number; readonly length: number },
): Check {
  const { facts, returns, period } = evidence
  // a step leads to the return one row on
  const start = facts.from + other.start + 1
  const end = facts.from + other.start + other.length
  const pace = (frequency: string): number => USUAL_STEPS[frequency]?.[0] ?? 0
  const isAtHead = other.start === 0 && end + 2 < returns.rows
  return lineOf({
    kind: 'mixed frequency',
    weight: 'warns',
    text: `dates are ${other.frequency} from ${dayOf(evidence, start)} to ${dayOf(evidence, end)}, ${usual} elsewhere.`,
    areas: cellsOf(evidence, -1, range(start, end + 1)),
    effect: `A return over a ${periodWord(other.frequency) ?? 'span'} counts like one over a ${period}, which makes the volatility ${pace(other.frequency) > pace(usual) ? 'too large' : 'too small'}.`,
    remedy: 'Bring all dates to the slower frequency, or let the look-back leave one part out.',
    corrections: isAtHead
      ? [
          {
            label: `Since ${dayOf(evidence, end + 1)}`,
            change: { lookBack: { kind: 'since', date: dates[end + 1] ?? 0 } },
            returns: null,
          },
        ]
      : [],
  })
}

function oddSteps(evidence: Evidence, dates: readonly number[], usual: string): Check | null {
  const { facts, returns, period } = evidence
  const [least, most] = USUAL_STEPS[usual] ?? [0, Infinity]
  const stepTo = (row: number): number => (dates[row] ?? 0) - (dates[row - 1] ?? 0)
  const odd = range(facts.from + 1, returns.rows).filter((row) => stepTo(row) < least || stepTo(row) > most)
  const [row] = odd
  if (row === undefined) return null
  const isLong = stepTo(row) > most
  const alike = odd.length > 1 ? ` ${countOf(odd.length - 1, 'more step')} like it.` : ''
  return lineOf({
    kind: 'dates',
    weight: 'notes',
    text: `${countOf(stepTo(row), 'day')} from ${dayOf(evidence, row - 1)} to ${dayOf(evidence, row)} among ${usual} dates.${alike}`,
    areas: odd.map((place) => returns.cell(place, -1)),
    effect: `Its return counts as that of one ${period}, though it spans ${isLong ? 'more' : 'less'}.`,
    remedy: isLong
      ? 'Put in the dates that are missing, if any are.'
      : 'Take the extra date out, or mend it.',
  })
}
