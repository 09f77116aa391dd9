import {
  dateText,
  percentText,
  quote,
  type BooksState,
  type ChangeLine,
  type ChangeParts,
  type RiskChange,
  type SnapshotHead,
} from '../sheet'
import { digitsApart, pointsText } from './measure'

/** One step on the way from the volatility before to the volatility after. */
export interface Step {
  readonly label: string
  /** where it begins and ends, as volatilities; equal for a level */
  readonly from: number
  readonly to: number
  readonly isLevel: boolean
}

/** The parts of a change in the order they are told; positions by what moved them, where that is known. */
export const partsOf = (parts: ChangeParts): readonly (readonly [label: string, value: number])[] => [
  ...(parts.drift === null || parts.trades === null
    ? [['Positions', parts.positions] as const]
    : [['Drift of weights', parts.drift] as const, ['Trades', parts.trades] as const]),
  ['Volatilities', parts.volatilities],
  ['Correlations', parts.correlations],
]

/** The day a result stands for, with its volatility. */
export const sideText = (side: SnapshotHead & { readonly isNow?: boolean }): string =>
  [
    side.isNow ? 'Now' : null,
    side.dataDate === null
      ? side.isNow
        ? null
        : `kept on ${dateText(side.keptOn)}`
      : `data to ${dateText(side.dataDate)}`,
    percentText(side.volatility, 2),
    side.note === '' ? null : quote(side.note),
  ]
    .filter((part) => part !== null)
    .join(', ')
    .replace(/^./, (letter) => letter.toUpperCase())

/** Decimals that tell the two volatilities apart where four can. */
export const digitsOf = ({ from, to }: RiskChange): number => digitsApart(from.volatility, to.volatility)

/** The change and its parts, as one sentence. */
export function changeSentence(change: RiskChange): string {
  const digits = digitsOf(change)
  const { from, to, total, settings } = change
  const moved = `${percentText(from.volatility, digits)} → ${percentText(to.volatility, digits)}: ${pointsText(change.change, digits)} points`
  const effect = typeof settings?.effect === 'number' ? [['Settings', settings.effect] as const] : []
  if (typeof total === 'string') return `${moved}.`
  const parts = [...effect, ...partsOf(total)].map(
    ([label, value]) => `${label.toLowerCase()} ${pointsText(value, digits)}`,
  )
  return `${moved}, of which ${parts.join(', ')}.`
}

/** From the volatility before, cause by cause, to the volatility after; the two levels alone where the change is not split. */
export function stepsOf({ from, to, total, settings }: RiskChange): readonly Step[] {
  const steps: Step[] = [{ label: 'From', from: from.volatility, to: from.volatility, isLevel: true }]
  let at = from.volatility
  const go = (label: string, by: number): void => {
    steps.push({ label, from: at, to: at + by, isLevel: false })
    at += by
  }
  if (typeof settings?.effect === 'number') go('Settings', settings.effect)
  if (typeof total !== 'string') for (const [label, by] of partsOf(total)) go(label, by)
  steps.push({ label: 'To', from: to.volatility, to: to.volatility, isLevel: true })
  return steps
}

/** What a line's contribution to risk changed by. */
export const changeOf = ({ contributionFrom, contributionTo }: ChangeLine): number =>
  contributionTo - contributionFrom

/** What the last comparison came to, or what is needed for one. */
export const changeHeadline = ({ kept, change }: BooksState['reporting']): string =>
  change
    ? `${percentText(change.from.volatility, digitsOf(change))} → ${percentText(change.to.volatility, digitsOf(change))}: ${pointsText(change.change, digitsOf(change))} points`
    : kept.length === 0
      ? 'Needs a kept result'
      : 'Not compared yet'
