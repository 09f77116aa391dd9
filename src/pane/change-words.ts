import {
  changeSteps,
  dateText,
  percentText,
  quote,
  type BooksState,
  type ChangeLine,
  type RiskChange,
  type SnapshotHead,
} from '../sheet'
import { digitsApart, pointsText } from './measure'

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

/** Decimals that show a volatility per day as well as one by the year, and tell the two sides apart where four can. */
export function digitsOf({ from, to }: Pick<RiskChange, 'from' | 'to'>): number {
  const larger = Math.max(from.volatility, to.volatility)
  return Math.max(larger >= 0.02 ? 2 : larger >= 0.002 ? 3 : 4, digitsApart(from.volatility, to.volatility))
}

/** Both volatilities and what lies between them. */
export function movedText(change: RiskChange): string {
  const digits = digitsOf(change)
  const { from, to } = change
  return `${percentText(from.volatility, digits)} → ${percentText(to.volatility, digits)}: ${pointsText(change.change, digits)} points`
}

/** The change and its parts, as one sentence. */
export function changeSentence(change: RiskChange): string {
  const parts = changeSteps(change)
    .filter(({ isLevel }) => !isLevel)
    .map(({ label, start, end }) => `${label.toLowerCase()} ${pointsText(end - start, digitsOf(change))}`)
  return `${movedText(change)}${parts.length > 1 ? `, of which ${parts.join(', ')}` : ''}.`
}

/** What a line's contribution to risk changed by. */
export const changeOf = ({ contributionFrom, contributionTo }: ChangeLine): number =>
  contributionTo - contributionFrom

/** What the last comparison came to, or what is needed for one. */
export const changeHeadline = ({ kept, change }: BooksState['reporting']): string =>
  change ? movedText(change) : kept.length === 0 ? 'Needs a kept result' : 'Not compared yet'
