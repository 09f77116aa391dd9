import { impliedReturns, returnPerMarginal } from '../core'
import type { Decomposition, ImpliedChoice } from '../core'
import { numberText, percentText } from './wording'

/** What implied returns need to know of a book. */
export interface ImpliedInputs {
  readonly names: readonly string[]
  /** scaled to a year where the periods per year are known */
  readonly decomposition: Decomposition
  /** the user's own expected returns; null for one that is not given, or altogether where there is no such column */
  readonly expected: readonly (number | null)[] | null
  /** the riskless rate that expected returns include, for the time the decomposition is scaled to; 0 where they are excess returns already */
  readonly risklessRate: number
}

/** One position, or the whole book. Returns are beyond the riskless rate. */
export interface ImpliedRow {
  readonly name: string
  readonly weight: number
  /** the return at which today's weight would be the best */
  readonly implied: number
  /** the user's own, less the riskless rate */
  readonly expected: number | null
  /** expected - implied */
  readonly difference: number | null
  /** expected for each unit of marginal contribution to risk; of the whole book for each unit of volatility; null where that is 0 */
  readonly perUnitOfMarginal: number | null
}

/** Implied returns beside the user's own. */
export interface ImpliedReturns {
  readonly rows: readonly ImpliedRow[]
  readonly total: ImpliedRow
  /** units of return for each unit of variance; null where there is no risk */
  readonly riskAversion: number | null
  /** how to read the figures, a sentence each */
  readonly conventions: readonly string[]
}

/**
 * The returns that positions would have to earn for today's weights to be the best, beside the expected ones.
 *
 *   implied_i = risk aversion x (Cw)_i,   or scaled so that they add up to a stated total: total x beta_i
 *
 * @throws Fault  those of core's impliedReturns
 * @cost          O(n)
 */
export function impliedReturnsOf(
  { names, decomposition, expected, risklessRate }: ImpliedInputs,
  choice: ImpliedChoice,
): ImpliedReturns {
  const { weights, volatility, periodsPerYear } = decomposition
  const { implied, total, riskAversion } = impliedReturns(decomposition, choice)
  const excess = Float64Array.from(weights, (_, i) => {
    const own = expected?.[i] ?? null
    return own === null ? NaN : own - risklessRate
  })
  const perUnit = returnPerMarginal(decomposition, excess)
  const rows = names.map((name, i): ImpliedRow => {
    const own = orNull(excess[i]!)
    return {
      name,
      weight: weights[i]!,
      implied: implied[i]!,
      expected: own,
      difference: own === null ? null : own - implied[i]!,
      perUnitOfMarginal: orNull(perUnit[i]!),
    }
  })
  // what has no weight earns nothing, so a blank there leaves the sum whole
  const whole = expected !== null && rows.every(({ weight, expected: own }) => weight === 0 || own !== null)
  const expectedTotal = whole ? rows.reduce((sum, row) => sum + row.weight * (row.expected ?? 0), 0) : null
  const time = periodsPerYear === 1 ? 'per period' : 'a year'
  const blank = expected ? rows.filter((row) => row.weight !== 0 && row.expected === null).length : 0
  return {
    rows,
    total: {
      name: 'Total',
      weight: weights.reduce((sum, weight) => sum + weight, 0),
      implied: total,
      expected: expectedTotal,
      difference: expectedTotal === null ? null : expectedTotal - total,
      perUnitOfMarginal: expectedTotal === null || volatility === 0 ? null : expectedTotal / volatility,
    },
    riskAversion,
    conventions: [
      `All returns are those beyond the riskless rate, ${time}. ${risklessRate === 0 ? 'Expected returns are taken as they stand: they must not include the riskless rate.' : `Expected returns are shown less a riskless rate of ${percentText(risklessRate, 2)}.`}`,
      choice.kind === 'total'
        ? `Scaled so that the whole book earns the stated ${percentText(choice.value, 2)}: ${riskAversion === null ? 'no risk aversion follows' : `a risk aversion of ${numberText(riskAversion, 2)} follows`}.`
        : `At the stated risk aversion of ${numberText(choice.value, 2)}: return less half of it times variance is greatest at today’s weights.`,
      'Today’s weights are taken as the best without limits on them; where a limit binds, an implied return says less.',
      'An implied return is what the weights ask for, not a forecast. Where the expected one is below it, return less half the risk aversion times variance is greater at a slightly smaller weight, other weights held.',
      'Expected return for each unit of marginal contribution to risk: alike for all positions where weights are the best for these expectations. Of a negative marginal contribution it is no measure of merit.',
      ...(blank > 0 ? ['The total of the expected returns is left out: not every holding has one.'] : []),
    ],
  }
}

const orNull = (value: number) => (Number.isNaN(value) ? null : value)
