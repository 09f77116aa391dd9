import { activeWeights, annualise, decompose, groupDecomposition, tailRisk } from '../core'
import type { Decomposition, RiskModel, TailRisk } from '../core'
import type { Blocks, BookModel } from './book-model'
import { attempt } from './explain'
import { groupsOf } from './names'
import { scalesWithTime } from './tail-section'
import type { Settings } from './settings'

/** One group column of a profile; arrays have one entry for each label. */
export interface GroupProfile {
  readonly header: string
  readonly labels: readonly string[]
  /** the group of each position */
  readonly groupOf: Int32Array
  readonly weight: Float64Array
  readonly contribution: Float64Array
  readonly share: Float64Array | null
  /** volatility of the group's positions alone; one pass of the model for each group, taken when asked for */
  standAlone(): Float64Array
}

/**
 * The figures of a book at given weights that trades move and limits hold: one light pass, so that they can follow every key typed. Scaled as the
 * book's breakdown is.
 */
export interface Profile {
  readonly names: readonly string[]
  readonly decomposition: Decomposition
  readonly groups: readonly GroupProfile[]
  /** null while there is no benchmark */
  readonly trackingError: number | null
  readonly net: number
  readonly gross: number
  /** for the horizon and the confidence chosen; null where the method gives none. Taken when asked for */
  tails(): Pick<TailRisk, 'valueAtRisk' | 'shortfall' | 'standardError'> | null
}

/** What profiles of one book share, whatever the weights. */
export interface ProfileBasis {
  readonly names: readonly string[]
  readonly model: RiskModel
  /** periods in a year the figures are scaled to; 1: per period */
  readonly periods: number
  /** volatility of one unit of each position, scaled */
  readonly volatilities: Float64Array
  profileOf(weights: Float64Array): Profile
}

/**
 * Prepares profiles of a book: what does not depend on weights is looked up once.
 *
 * @cost of a profile: one pass of the model, a second where there is a benchmark
 */
export function profileBasis(
  { holdings, returns }: Pick<Blocks, 'holdings' | 'returns'>,
  book: BookModel,
  settings: Pick<Settings, 'periodsPerYear' | 'benchmark' | 'tails'>,
): ProfileBasis {
  const held = holdings.holdings
  const names = held.map(({ name }) => name)
  const periods = settings.periodsPerYear ?? returns.proposedPeriodsPerYear ?? 1
  const { model, history } = book
  const groupings = holdings.groupHeaders.map((header, k) => ({
    header,
    ...groupsOf(held.map(({ groups }) => groups[k])),
  }))
  const column =
    settings.benchmark.kind === 'column' && held.some(({ benchmark }) => (benchmark ?? 0) !== 0)
      ? Float64Array.from(held, ({ benchmark }) => benchmark ?? 0)
      : null
  const series = settings.benchmark.kind === 'series' ? book.benchmark : null
  const trackingError = (weights: Float64Array): number | null => {
    if (series) return decompose(series.model, Float64Array.of(...weights, -1)).volatility
    return column && decompose(model, activeWeights(weights, column)).volatility
  }

  const profileOf = (weights: Float64Array): Profile => {
    const decomposition = annualise(decompose(model, weights), periods)
    const scale = Math.sqrt(periods)
    const active = trackingError(weights)
    return {
      names,
      decomposition,
      groups: groupings.map(({ header, labels, groupOf }) => {
        const weight = new Float64Array(labels.length)
        const contribution = new Float64Array(labels.length)
        groupOf.forEach((group, i) => {
          weight[group]! += weights[i]!
          contribution[group]! += decomposition.contribution[i]!
        })
        return {
          header,
          labels,
          groupOf,
          weight,
          contribution,
          share: decomposition.share && contribution.map((part) => part / decomposition.volatility),
          standAlone: () => groupDecomposition(model, decomposition, groupOf, labels.length).standAlone,
        }
      }),
      trackingError: active && active * scale,
      net: weights.reduce((sum, weight) => sum + weight, 0),
      gross: weights.reduce((sum, weight) => sum + Math.abs(weight), 0),
      tails: () => {
        const { tails } = settings
        if (tails.periods !== 1 && !scalesWithTime(tails)) return null
        return attempt(() => tailRisk(model, weights, tails, history)).value ?? null
      },
    }
  }
  const volatilities = model.variances().map((variance) => Math.sqrt(variance * periods))
  return { names, model, periods, volatilities, profileOf }
}
