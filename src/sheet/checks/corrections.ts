import { MOST_LAGS } from '../../core'
import type { ReturnsReading } from '../returns'
import type { EstimatorChoice, GapRule, Settings } from '../settings'
import { countOf } from '../wording'
import type { Evidence, Held } from './evidence'

/** How the figures would be with a fault mended: by a choice that a press can apply, or from a copy of the returns. */
export interface Correction {
  readonly label: string
  readonly change: Partial<Settings> | null
  /** the returns as they would be; made when asked for, while the user's own stay as they are */
  readonly returns: (() => ReturnsReading) | null
}

/** Another estimator. It goes with the dates common to all: the choice of both, where another rule holds. */
export function withEstimator({ settings }: Evidence, label: string, estimator: EstimatorChoice): Correction {
  return settings.gaps === 'common dates'
    ? { label, change: { estimator }, returns: null }
    : {
        label: `${label}, on the dates common to all`,
        change: { estimator, gaps: 'common dates' },
        returns: null,
      }
}

/** So many lagged terms can be counted at most: beside what is allowed, a quarter of the dates. */
export const mostLags = ({ common }: Evidence, lags: number): number =>
  Math.min(lags, MOST_LAGS, Math.floor(common / 4))

/** Lagged terms, as many as can be counted; none where no more would be than are chosen. */
export function withLags(evidence: Evidence, lags: number): readonly Correction[] {
  const { estimator } = evidence.settings
  const most = mostLags(evidence, lags)
  if (most < 1 || (estimator.kind === 'lagged' && estimator.lags >= most)) return []
  return [withEstimator(evidence, `With ${countOf(most, 'lagged term')}`, { kind: 'lagged', lags: most })]
}

/** Other ways to treat dates that not every holding has, as far as they can be computed from. */
export function withGaps(evidence: Evidence): readonly Correction[] {
  const facts = evidence.held.map(({ fact }) => fact)
  const longer = (count: number): number => facts.filter((other) => other.count > count).length
  const canComplete = facts.every(
    ({ gaps, last, count }) =>
      gaps.length === 0 && last === evidence.returns.rows - 1 && count > longer(count) + 1,
  )
  const canPair = Math.max(...facts.map(({ first }) => first)) < Math.min(...facts.map(({ last }) => last))
  return [
    ...(canPair ? withGapRule(evidence, 'With each pair’s own overlap', 'own overlap') : []),
    ...(canComplete ? withGapRule(evidence, 'Completed from the longer histories', 'completed') : []),
  ]
}

/** Another rule for gaps. It goes with the sample covariance: the choice of both, where another estimator is chosen. */
function withGapRule({ settings }: Evidence, label: string, gaps: GapRule): readonly Correction[] {
  if (settings.gaps === gaps) return []
  return [
    settings.estimator.kind === 'sample'
      ? { label, change: { gaps }, returns: null }
      : {
          label: `${label}, sample covariance`,
          change: { gaps, estimator: { kind: 'sample' } },
          returns: null,
        },
  ]
}

/**
 * A copy of the returns with other numbers in the series of some suspicions.
 *
 * @param changed gives those of one series, all rows of the block; may write into what it is given
 */
export function withReturns(
  { returns }: Evidence,
  label: string,
  about: readonly { readonly held: Held }[],
  changed: (x: Float64Array, held: Held) => Float64Array,
): Correction {
  const { rows, columns } = returns
  return {
    label,
    change: null,
    returns: () => {
      const values = returns.values.slice()
      // a series with several suspicions is changed once, for all of them
      for (const held of new Set(about.map((suspicion) => suspicion.held))) {
        const { series } = held
        const x = Float64Array.from({ length: rows }, (_, t) => values[t * columns + series]!)
        changed(x, held).forEach((value, t) => (values[t * columns + series] = value))
      }
      return { ...returns, values }
    },
  }
}
