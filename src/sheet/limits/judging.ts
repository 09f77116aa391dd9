import type { Bands } from '../bands'
import { sharesWithheldOf } from '../benchmark'
import { plainName } from '../names'
import type { Profile } from '../profile'
import { BAND } from '../wording'
import type { Limit, LimitMeasure, LimitState } from './limit'

/** A figure over its limit by no more than this part of it is at it: solvers and sums of fractions leave so much. Our own convention. */
const ROUNDING = 1e-9
/** The same beside a limit of 0. */
const LEAST = 1e-12

const isOver = (figure: number, limit: number | null): boolean =>
  limit !== null && figure - limit > Math.max(ROUNDING * Math.abs(limit), LEAST)

type Figure = number | string

/** The figures of one profile as limits ask for them; what takes a pass of the model is taken once. */
class Gauge {
  readonly #profile: Profile
  readonly #bands: Bands | string | null
  readonly #withheld: string | null
  readonly #kept = new Map<string, unknown>()

  constructor(profile: Profile, bands: Bands | string | null) {
    this.#profile = profile
    this.#bands = bands
    this.#withheld = sharesWithheldOf(profile.decomposition)
  }

  /** The figure, or why there is none. */
  figure({ scope, header, name, measure, members }: Limit): Figure {
    const { decomposition: d } = this.#profile
    if (scope === 'total') return this.#ofTotal(measure)
    if (measure === 'share of risk' && this.#withheld !== null) return this.#withheld
    if (scope === 'holding') {
      const i = members?.[0] ?? -1
      const figure =
        measure === 'weight'
          ? Math.abs(d.weights[i] ?? NaN)
          : measure === 'stand-alone risk'
            ? d.standAlone[i]
            : measure === 'share of risk'
              ? d.share?.[i]
              : d.contribution[i]
      return figure === undefined || Number.isNaN(figure) ? 'It is no holding of the book any more.' : figure
    }
    const place = this.#group(header, name)
    if (!place) return 'It is no group of the book any more.'
    const { group, g } = place
    const figure =
      measure === 'weight'
        ? Math.abs(group.weight[g]!)
        : measure === 'stand-alone risk'
          ? this.#once(`alone ${group.header}`, () => group.standAlone())[g]
          : measure === 'share of risk'
            ? group.share?.[g]
            : group.contribution[g]
    return figure ?? 'It is not defined.'
  }

  /** The standard error of the figure, or why there is none; null where none was asked for. */
  error({ scope, header, name, measure, members }: Limit): Figure | null {
    if (measure === 'weight') return 'A weight is known and has no estimation error.'
    const bands = this.#bands
    if (bands === null || typeof bands === 'string') return bands
    if (scope === 'total') return this.#errorOfTotal(measure, bands)
    if (scope === 'holding') {
      const errors =
        measure === 'stand-alone risk'
          ? this.#once('alone', () => bands.ofStandAlone())
          : measure === 'share of risk'
            ? bands.share
            : bands.contribution
      return errors?.[members?.[0] ?? -1] ?? NO_ERROR
    }
    const place = this.#group(header, name)
    if (!place) return NO_ERROR
    const { group, g } = place
    if (measure === 'stand-alone risk')
      return bands.ofVolatility(
        this.#profile.decomposition.weights.map((weight, k) => (group.groupOf[k] === g ? weight : 0)),
      )
    const errors = this.#once(`errors ${group.header}`, () =>
      bands.ofGroups(group.groupOf, group.labels.length),
    )
    return (measure === 'share of risk' ? errors.share : errors.contribution)?.[g] ?? NO_ERROR
  }

  #ofTotal(measure: LimitMeasure): Figure {
    if (measure === 'volatility') return this.#profile.decomposition.volatility
    if (measure === 'tracking error') return this.#profile.trackingError ?? 'There is no benchmark.'
    const tails = this.#tails
    if (!tails) return 'Large losses are not measured at the present choices; their own section says why.'
    if (measure === 'value at risk') return tails.valueAtRisk
    return tails.shortfall ?? 'The method chosen for large losses gives none.'
  }

  #errorOfTotal(measure: LimitMeasure, bands: Bands): Figure {
    if (measure === 'volatility') return bands.volatility
    if (measure === 'value at risk')
      return this.#tails?.standardError ?? 'The method chosen for large losses has no standard error here.'
    return 'No standard error is computed for it.'
  }

  get #tails(): ReturnType<Profile['tails']> {
    return this.#once('tails', () => this.#profile.tails())
  }

  #group(header: string | null, name: string) {
    const group = this.#profile.groups.find((other) => other.header === header)
    const g = group?.labels.findIndex((label) => plainName(label) === plainName(name)) ?? -1
    return group && g >= 0 ? { group, g } : null
  }

  #once<T>(key: string, make: () => T): T {
    if (!this.#kept.has(key)) this.#kept.set(key, make())
    return this.#kept.get(key) as T
  }
}

const NO_ERROR = 'It has no error band.'

/**
 * Holds figures against their limits. The weight of one holding is compared without its sign, that of a group is its net weight without its sign;
 * shares and contributions keep theirs, so that a position that reduces risk is within any limit above 0.
 *
 *   within      figure <= soft and figure <= hard, as far as they are given; beyond a limit by 1e-9 of it or less is at it
 *   over soft   soft < figure <= hard
 *   breach      hard < figure
 *
 * @param profile  at the weights that are judged
 * @param bands    of the same weights; or why there are none; null where nobody asks
 * @returns        in the order of the limits
 * @cost           O(limits); a pass of the model for each group of a column whose stand-alone risk is limited, one for the tail, and with bands
 *                 what `Bands` says of errors taken when asked for
 */
export function judgeLimits(
  limits: readonly Limit[],
  profile: Profile,
  bands: Bands | string | null,
): readonly LimitState[] {
  const gauge = new Gauge(profile, bands)
  return limits.map((limit): LimitState => {
    const { soft, hard } = limit
    const most = hard ?? soft ?? Infinity
    const figure = gauge.figure(limit)
    if (typeof figure === 'string')
      return {
        limit,
        figure: null,
        most,
        headroom: null,
        used: null,
        status: 'not measured',
        why: figure,
        error: null,
        withinError: null,
        errorWhy: null,
      }
    const error = gauge.error(limit)
    const known = typeof error === 'number'
    return {
      limit,
      figure,
      most,
      headroom: most - figure,
      used: most > 0 && figure >= 0 ? figure / most : null,
      status: isOver(figure, hard) ? 'breach' : isOver(figure, soft) ? 'over soft' : 'within',
      why: null,
      error: known ? error : null,
      withinError: known
        ? [soft, hard].some((edge) => edge !== null && Math.abs(figure - edge) <= BAND * error)
        : null,
      errorWhy: known ? null : error,
    }
  })
}
