import type { Area } from '../cells'
import { countOf, listOf, quote } from '../wording'

/** What a limit stands on: the whole book, one holding, or one group of a group column. */
export type LimitScope = 'total' | 'holding' | 'group'

interface MeasureOf {
  readonly label: string
  readonly scopes: readonly LimitScope[]
}

/** The figures a limit can hold, and what each of them is a figure of. */
export const LIMIT_MEASURES = {
  weight: { label: 'Weight', scopes: ['holding', 'group'] },
  'share of risk': { label: 'Share of risk', scopes: ['holding', 'group'] },
  'contribution to risk': { label: 'Contribution to risk', scopes: ['holding', 'group'] },
  'stand-alone risk': { label: 'Stand-alone risk', scopes: ['holding', 'group'] },
  volatility: { label: 'Volatility', scopes: ['total'] },
  'tracking error': { label: 'Tracking error', scopes: ['total'] },
  'value at risk': { label: 'Value at risk', scopes: ['total'] },
  'expected shortfall': { label: 'Expected shortfall', scopes: ['total'] },
} as const satisfies { readonly [measure: string]: MeasureOf }

export type LimitMeasure = keyof typeof LIMIT_MEASURES

/** The most a figure may be. At least one of `soft` and `hard` is a number; both are fractions, as figures are. */
export interface Limit {
  readonly scope: LimitScope
  /** the group column, for a group */
  readonly header: string | null
  /** the holding, or the label of the group; '' for the total */
  readonly name: string
  readonly measure: LimitMeasure
  readonly soft: number | null
  readonly hard: number | null
  /** where it was typed */
  readonly cell: Area | null
  /** the holdings it stands on, by their place in the book; null for the total */
  readonly members: Int32Array | null
}

/** What the limit stands on, in words. */
export const limitOn = ({ scope, header, name }: Limit): string =>
  scope === 'total' ? 'Total' : scope === 'holding' ? name : `${header ?? ''}: ${name}`

/**
 * The figure that is limited, as a part of a sentence: "share of risk of “Meadow”", "volatility of the book".
 */
export const limitText = (limit: Limit): string =>
  `${limit.measure} of ${limit.scope === 'total' ? 'the book' : quote(limitOn(limit))}`

export type LimitStatus = 'within' | 'over soft' | 'breach' | 'not measured'

/** How a status is told: a word, and a mark that differs by its shape. */
export const LIMIT_STATUS: {
  readonly [S in LimitStatus]: { readonly word: string; readonly mark: string }
} = {
  within: { word: 'Within', mark: '\u25cb' },
  'over soft': { word: 'Over soft limit', mark: '\u25d0' },
  breach: { word: 'Breach', mark: '\u25cf' },
  'not measured': { word: 'Not measured', mark: '\u2013' },
}

/** A limit and the figure it holds. */
export interface LimitState {
  readonly limit: Limit
  /** in the unit of the measure; null where it is not measured */
  readonly figure: number | null
  /** the hard limit, or the soft one where there is no other: what headroom and use are counted to */
  readonly most: number
  /** most - figure: below 0 by how much it is exceeded */
  readonly headroom: number | null
  /** figure / most; null where `most` is not above 0 */
  readonly used: number | null
  /** from the figure alone, however sure it is */
  readonly status: LimitStatus
  /** why it is not measured, or null */
  readonly why: string | null
  /** standard error of the figure; null where there is none */
  readonly error: number | null
  /** whether the 95% band of the figure holds one of the limits, so that its status might be another; null where there is no band */
  readonly withinError: boolean | null
  /** why there is no band, or null */
  readonly errorWhy: string | null
}

const HOW_MANY: readonly (readonly [LimitStatus, string])[] = [
  ['breach', 'breached'],
  ['over soft', 'over the soft limit only'],
  ['not measured', 'not measured'],
  ['within', 'within'],
]

/**
 * How many limits stand how, the gravest first.
 * @example limitsSummary([]) // 'no limits'
 */
export function limitsSummary(states: readonly LimitState[]): string {
  if (states.length === 0) return 'no limits'
  const parts = HOW_MANY.flatMap(([status, words]) => {
    const count = states.filter((state) => state.status === status).length
    return count === 0 ? [] : [`${count.toLocaleString('en-US')} ${words}`]
  })
  return `${countOf(states.length, 'limit')}: ${listOf(parts, parts.length)}`
}
