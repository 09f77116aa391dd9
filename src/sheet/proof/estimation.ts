import type { Shrinkage } from '../../core'
import type { Blocks, BookModel } from '../book-model'
import { GAP_WORDS } from '../book-model'
import { currencySeries } from '../currency'
import type { Settings } from '../settings'
import { ReturnCells } from './return-cells'

/** How a book's covariances become formulas. */
export type Estimation =
  /** they do not, and stand as constants */
  | { readonly kind: 'taken over'; readonly why: string }
  /** rows of a covariance matrix in the sheet */
  | { readonly kind: 'matrix' }
  | {
      readonly kind: 'dates'
      /** null: every date counts alike */
      readonly decay: number | null
      /** dates less one, or the sum of the weights of the dates */
      readonly divisor: 'less one' | 'sum'
      readonly shrinkage: Shrinkage | null
      readonly lags: number
    }

/** What of a book formulas can take from its cells. */
export interface Reach {
  readonly cells: ReturnCells | null
  /** rows of the returns that all holdings share; null where the return of the whole book on a date cannot be formed from cells */
  readonly rows: readonly number[] | null
  /** why not, where that is so */
  readonly why: string | null
  readonly estimation: Estimation
  /** whether the dates lie one after the other in order of time, without gaps */
  readonly isWhole: boolean
}

const TEXT = 'some of the returns are numbers typed as text, which formulas do not read'
const STRETCHES =
  'so many gaps lie among the returns that a formula would need more ranges than anyone can read'

/** Finds out what formulas can recompute, and what they have to take over. */
export function reachOf({ match, returns }: Blocks, book: BookModel, settings: Settings): Reach {
  const held = [...new Set(match.seriesOf)].filter((series) => series >= 0)
  const nothing = (why: string): Reach => ({
    cells: null,
    rows: null,
    why,
    estimation: { kind: 'taken over', why },
    isWhole: false,
  })
  if (held.length === 0) return nothing('no holding has returns')
  const isMatrix = returns.content === 'covariance'
  const { currencies } = match
  if (!isMatrix && currencies?.returnsIn === 'local' && currencySeries(currencies).length > 0)
    return nothing(
      `returns of foreign holdings are brought to ${currencies.base} before anything is estimated, and do not stand in the sheet in that form`,
    )
  const rows = isMatrix ? held : (book.data?.rows ?? [])
  if (rows.length === 0) return nothing('fewer than two dates are common to all holdings')

  const cells = new ReturnCells(returns, rows, held)
  if (cells.holdsText(rows, held)) return nothing(TEXT)
  if (rows.some((row) => cells.alongSeries(row, () => '') === null)) return nothing(STRETCHES)
  if (isMatrix) return { cells, rows: null, why: null, estimation: { kind: 'matrix' }, isWhole: false }

  const isWhole = cells.isWhole(rows, held)
  const takenOver = (why: string): Reach => ({
    cells,
    rows,
    why: null,
    estimation: { kind: 'taken over', why },
    isWhole,
  })
  if (book.rule !== 'common dates')
    return takenOver(
      `the rule for gaps is “${GAP_WORDS[book.rule]}”, which is not the covariance of one set of dates`,
    )
  if (book.recipe.kind !== 'estimated')
    return takenOver(
      settings.estimator.kind === 'factors'
        ? 'they come from a factor model, which is a regression for every holding'
        : 'the model is not one of returns',
    )
  if (
    held.some(
      (series) =>
        cells.alongDates(series, () => '') === null ||
        (!cells.takesBlanks &&
          cells.alongDates(
            series,
            () => '',
            (x) => x,
          ) === null),
    )
  )
    return takenOver(STRETCHES)
  const { estimator, shrinkage } = book.recipe
  return {
    cells,
    rows,
    why: null,
    isWhole,
    estimation: {
      kind: 'dates',
      decay: estimator.kind === 'exponential' ? estimator.decay : null,
      divisor: estimator.kind === 'sample' ? 'less one' : 'sum',
      shrinkage,
      lags: estimator.kind === 'lagged' ? estimator.lags : 0,
    },
  }
}
