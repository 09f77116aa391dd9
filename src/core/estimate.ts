import { Fault } from './fault'
import { laggedModel } from './lagged'
import { returnsModel, type ReturnsModel, type RiskModel, type Weighting } from './risk-model'
import { shrinkageOf, shrunkModel, type Shrinkage, type ShrinkageTarget } from './shrinkage'
import { inOneGo } from './steps'

/** How a covariance is estimated from returns. "lagged": a whole number of dates, 1 to 10. */
export type Estimator =
  | Weighting
  | { readonly kind: 'shrinkage'; readonly target: ShrinkageTarget }
  | { readonly kind: 'lagged'; readonly lags: number }

/** One risk model estimated from returns, with the plain model of the same block. */
export interface EstimatedModel extends RiskModel {
  readonly estimator: Estimator
  /** The block without shrinkage or lagged terms (with either, divisor T): what error figures and histories come from. */
  readonly returns: ReturnsModel
  readonly shrinkage: Shrinkage | null
}

/**
 * The risk model that an estimator makes of a block of returns. Shrinkage asks for its intensity first; give it where it was
 * computed already (`shrinkageOf`, which can be followed and left), else it is computed here in one go.
 *
 * @param returns    T x n row-major, decimals per period, newest row last; not kept, not changed
 * @param dates      T, at least 2
 * @param size       n
 * @param shrinkage  of the same block, with the estimator's target
 * @throws Fault     "shape" | "not-a-number" | "too-few" | "out-of-range" (decay, lags) | "unknown-choice" (a shrinkage
 *                   that is not the estimator's)
 * @source           as for each estimator
 * @cost             O(T n); with shrinkage O(T n min(T, n)) where it is not given
 * @example          estimateModel(Float64Array.of(.01, -.01, .03, -.03), 4, 1, { kind: 'lagged', lags: 1 }).apply(Float64Array.of(1)).variance // 0.000175
 * @example          estimateModel(Float64Array.of(.01, .02, .03, -.02, -.01, 0), 3, 2, { kind: 'shrinkage', target: 'identity' }).shrinkage.intensity // 1
 */
export function estimateModel(
  returns: Float64Array,
  dates: number,
  size: number,
  estimator: Estimator,
  shrinkage?: Shrinkage,
): EstimatedModel {
  if (shrinkage && (estimator.kind !== 'shrinkage' || estimator.target !== shrinkage.target)) {
    throw new Fault(
      'unknown-choice',
      `a shrinkage toward “${shrinkage.target}”`,
      'one of the estimator’s own is needed',
    )
  }
  const plain = (weighting: Weighting) => returnsModel(returns, dates, size, weighting)
  switch (estimator.kind) {
    case 'shrinkage': {
      const base = plain({ kind: 'population' })
      const known = shrinkage ?? inOneGo(shrinkageOf(base, estimator.target))
      return { ...shrunkModel(base, known), estimator, returns: base, shrinkage: known }
    }
    case 'lagged': {
      const base = plain({ kind: 'population' })
      return { ...laggedModel(base, estimator.lags), estimator, returns: base, shrinkage: null }
    }
    default: {
      const base = plain(estimator)
      return { ...base, estimator, returns: base, shrinkage: null }
    }
  }
}
