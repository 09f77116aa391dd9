import {
  completedMoments,
  decompose,
  historyLengths,
  inOneGo,
  matrixModel,
  nearestCorrelation,
  pairwiseCovariance,
  repairCovariance,
  smallestEigenvalue,
} from '../../src/core'
import { absoluteGap, relativeGap } from '../closeness'
import { textbookMoments, type Rows } from '../unequal-histories'
import { generatedReturns, readJson } from './data'

// Gaps: computed with pandas 1.5.3 (DataFrame.cov with min_periods), a second time with R 4.2.2
// (cov(use = "pairwise.complete.obs")); both agree to 15 digits (r_agree_digits_cov in missing_data.json).
const tolerance = 1e-11

interface Case {
  readonly n: number
  readonly T: number
  readonly overlap: number[][]
  readonly min_overlap: number
  readonly min_periods: number
  readonly cov_pairwise: (number | null)[][]
  readonly cor_pairwise: number[][]
  readonly cov_eig?: number[]
  readonly cor_from_cov_eig?: number[]
  readonly cov_repaired?: number[][]
  readonly sd_available?: number[]
  readonly repaired_equal_weight_vol?: number
  readonly repaired_equal_weight_rc?: number[]
  readonly statsmodels_cov_nearest?: number[][]
}

const { cases } = readJson<{ readonly cases: Record<string, Case> }>('missing_data.json')

/** Which values are missing: `rule` of each case in missing_data.json, t and i from 0. */
const rules: Record<string, (t: number, i: number) => boolean> = {
  missing_b: (t, i) => (3 * t + 7 * i + t * i) % 5 < 2,
  missing_a_too_few: (t, i) => (t * t + 3 * t * i + 5 * i * i) % 7 < 3,
  missing_e_late_start: (t, i) => t < 40 * i || (7 * t + 13 * i) % 11 === 0,
}

/** The first dates and series of the set of 60 series (seed 20240601), with the gaps of a case. */
function gappy(name: string): { returns: Float64Array; n: number; T: number } {
  const { n, T } = cases[name]!
  const all = generatedReturns(20240601, 60, 500).returns
  const missing = rules[name]!
  const returns = new Float64Array(T * n)
  for (let t = 0; t < T; t++) {
    for (let i = 0; i < n; i++) returns[t * n + i] = missing(t, i) ? NaN : all[t * 60 + i]!
  }
  return { returns, n, T }
}

describe.each(Object.entries(cases))('%s', (name, expected) => {
  const { returns, n, T } = gappy(name)
  const pairwise = inOneGo(pairwiseCovariance(returns, T, n))

  it('has the common dates of every pair', () => {
    expect(Array.from(pairwise.overlaps)).toEqual(expected.overlap.flat())
    expect(pairwise.smallestOverlap.dates).toBe(expected.min_overlap)
    const { i, j } = pairwise.smallestOverlap
    expect(expected.overlap[i]![j]).toBe(expected.min_overlap)
  })

  it('has the covariance of every pair that is given', () => {
    const given = expected.cov_pairwise.flat()
    const pick = (values: ArrayLike<number | null>) =>
      Array.from(values, (x, k) => (given[k] === null ? 0 : x!))
    expect(given.filter((x) => x !== null).length).toBeGreaterThan(n)
    expect(relativeGap(pick(pairwise.matrix), pick(given))).toBeLessThan(tolerance)
  })

  if (expected.cov_eig) {
    it('has the smallest eigenvalue', () => {
      // numpy.linalg.eigvalsh; relative to the largest eigenvalue, which is what an eigenvalue's rounding goes by
      const eigenvalues = expected.cov_eig!
      const smallest = Math.min(...eigenvalues)
      expect(Math.abs(smallestEigenvalue(pairwise.matrix, n) - smallest)).toBeLessThan(
        tolerance * eigenvalues[0]!,
      )
    })
  }
})

describe('pairs of missing_a_too_few', () => {
  const { returns, n, T } = gappy('missing_a_too_few')
  const { min_periods: least, min_overlap: found } = cases['missing_a_too_few']!

  it('are refused where a pair has fewer common dates than the least wanted', () => {
    expect(() => inOneGo(pairwiseCovariance(returns, T, n, least))).toThrow(
      expect.objectContaining({ code: 'missing-data', needed: `at least ${least} are needed` }),
    )
    expect(() => inOneGo(pairwiseCovariance(returns, T, n, found))).not.toThrow()
  })
})

describe('the repair of missing_b', () => {
  const { returns, n, T } = gappy('missing_b')
  const expected = cases['missing_b']!
  const { matrix } = inOneGo(pairwiseCovariance(returns, T, n))

  it('is the nearest covariance with the same variances', () => {
    // statsmodels 0.13.5, cov_nearest(method="nearest", threshold=1e-15, n_fact=2000), which repairs the same
    // correlations by alternating projections; 1e-8: an optimum, see README.md
    const repair = inOneGo(repairCovariance(matrix, n, 'nearest'))
    expect(repair).toMatchObject({ changed: true, converged: true })
    expect(relativeGap(repair.matrix, expected.statsmodels_cov_nearest!.flat())).toBeLessThan(1e-8)
    const before = Math.min(...expected.cor_from_cov_eig!)
    expect(Math.abs(repair.smallestBefore - before)).toBeLessThan(tolerance * expected.cor_from_cov_eig![0]!)
    expect(Math.abs(repair.smallestAfter)).toBeLessThan(1e-13)
  })

  it('has the risk contributions of the nearest correlations under the standard deviations of all dates', () => {
    // cov_repaired: the correlations repaired are those with each pair's own standard deviations; numpy 1.24.2
    const { matrix: nearest } = inOneGo(
      nearestCorrelation(Float64Array.from(expected.cor_pairwise.flat()), n),
    )
    const deviations = expected.sd_available!
    const covariance = nearest.map((x, k) => x * deviations[Math.floor(k / n)]! * deviations[k % n]!)
    expect(relativeGap(covariance, expected.cov_repaired!.flat())).toBeLessThan(1e-8)
    const { volatility, contribution } = decompose(
      matrixModel(covariance, n),
      new Float64Array(n).fill(1 / n),
    )
    expect(relativeGap(volatility, expected.repaired_equal_weight_vol!)).toBeLessThan(1e-8)
    expect(relativeGap(contribution, expected.repaired_equal_weight_rc!)).toBeLessThan(1e-8)
  })
})

it('nothing is wrong with the covariance of missing_e_late_start, and it stays as it is', () => {
  const { returns, n, T } = gappy('missing_e_late_start')
  const { matrix } = inOneGo(pairwiseCovariance(returns, T, n))
  for (const how of ['nearest', 'shrunk'] as const) {
    const repair = inOneGo(repairCovariance(matrix, n, how))
    expect(repair).toMatchObject({ changed: false, largestChange: null, distance: 0 })
    expect(repair.matrix).toEqual(matrix)
  }
})

describe('unequal histories', () => {
  interface Check {
    readonly id: string
    readonly citation: string
    readonly status: string
    readonly inputs: { readonly long: number[]; readonly shortLast: number[] }
    readonly outputs: Record<string, number>
    readonly tolerance: Record<string, number>
  }
  const check = readJson<{ readonly checks: readonly Check[] }>('published.json').checks.find(
    ({ id }) => id === 'stambaugh-unequal-history',
  )!

  test(`${check.citation} (${check.status}, figures derived from the formula)`, () => {
    const { long, shortLast } = check.inputs
    const late = long.length - shortLast.length
    const rows = long.map((x, t) => [t < late ? NaN : shortLast[t - late]!, x])
    const { means, matrix, residualVariances, starts, groups } = inOneGo(
      completedMoments(Float64Array.from(rows.flat()), long.length, 2),
    )
    const [varShort, cov, , varLong] = matrix
    const actual: Record<string, number> = {
      meanShort: means[0]!,
      varShort: varShort!,
      cov: cov!,
      varLong: varLong!,
      beta: cov! / varLong!,
    }
    expect(Object.keys(actual).sort()).toEqual(Object.keys(check.outputs).sort())
    for (const [figure, printed] of Object.entries(check.outputs)) {
      expect(absoluteGap(actual[figure]!, printed)).toBeLessThanOrEqual(check.tolerance[figure]!)
    }
    expect(starts).toEqual(Int32Array.of(late, 0))
    expect(groups).toEqual([
      { start: 0, dates: 8, columns: Int32Array.of(1), longer: 0, redundant: Int32Array.of() },
      { start: late, dates: 4, columns: Int32Array.of(0), longer: 1, redundant: Int32Array.of() },
    ])
    // what the regression leaves of the shorter series: var - beta^2 var(long), which the printed figures give
    const { varShort: v, beta, varLong: l } = check.outputs
    expect(absoluteGap(residualVariances[0]!, v! - beta! ** 2 * l!)).toBeLessThan(1e-12)
  })

  it('agrees with regressions one series group at a time, by normal equations, for 12 series in five lengths', () => {
    // the second computation is test/unequal-histories.ts; rounding of normal equations: 1e-9
    const starts = [0, 90, 0, 31, 31, 0, 60, 31, 0, 90, 200, 0]
    const n = starts.length
    const all = generatedReturns(20240601, 60, 500).returns
    const rows: Rows = Array.from({ length: 500 }, (_, t) =>
      starts.map((start, i) => (t < start ? NaN : all[t * 60 + i]!)),
    )
    const result = inOneGo(completedMoments(Float64Array.from(rows.flat()), 500, n))
    const expected = textbookMoments(rows)
    expect(relativeGap(result.means, expected.means)).toBeLessThan(1e-9)
    expect(relativeGap(result.matrix, expected.matrix.flat())).toBeLessThan(1e-9)
    expect(Array.from(historyLengths(Float64Array.from(rows.flat()), 500, n).first)).toEqual(starts)
  })
})
