import {
  annualise,
  correlation,
  covariance,
  decompose,
  groupDecomposition,
  logReturns,
  returnsModel,
  simpleReturns,
} from '../../src/core'
import { relativeGap } from '../closeness'
import { generatedReturns, readCsv, readJson } from './data'

// Expected: computed with numpy 1.24.2 / scipy 1.10.1 and a second time with R 4.2.2; see README.md beside this file.
// Tolerance: 1e-11 relative to the largest entry, as README.md says.
const tolerance = 1e-11

interface Figure {
  readonly value: number & number[] & number[][]
}
interface Digest {
  readonly digest: {
    readonly trace: number
    readonly sum: number
    readonly frobenius: number
    readonly diag: number[]
    readonly row_0: number[]
    readonly row_last: number[]
  }
}
interface Portfolio {
  readonly decomposition: Record<string, Figure>
  readonly groups: Record<string, Figure>
  readonly by_estimator: Record<string, Figure>
}
interface ComputedSet {
  readonly about: {
    readonly T: number
    readonly n: number
    readonly weights: Record<'long' | 'longshort', number[]>
    readonly groups: string[]
    readonly generator?: { readonly seed: number; readonly final_state_x: number }
  }
  readonly estimators: Record<string, Figure & Partial<Digest>>
  readonly portfolios: Record<'long' | 'longshort', Portfolio>
}

const closes = () => {
  const { names, rows } = readCsv('eustockmarkets_close.csv')
  const first = names.indexOf('DAX')
  return Float64Array.from(rows.flatMap((row) => row.slice(first, first + 4)))
}

const sets: [string, (set: ComputedSet) => Float64Array][] = [
  ['eu_log.json', () => logReturns(closes(), 1860, 4)],
  ['eu_simple.json', () => simpleReturns(closes(), 1860, 4)],
  ['lcg60.json', ({ about }) => generatedReturns(about.generator!.seed, about.n, about.T).returns],
  ['lcg120.json', ({ about }) => generatedReturns(about.generator!.seed, about.n, about.T).returns],
]

test.each(['lcg60.json', 'lcg120.json'])('the generator of %s ends in the state that is stated', (name) => {
  const { about } = readJson<ComputedSet>(name)
  expect(generatedReturns(about.generator!.seed, about.n, about.T).state).toBe(about.generator!.final_state_x)
})

describe.each(sets)('%s', (name, returnsOf) => {
  const set = readJson<ComputedSet>(name)
  const { T, n, groups, weights } = set.about
  const returns = returnsOf(set)
  const sample = returnsModel(returns, T, n)
  const exponential = returnsModel(returns, T, n, { kind: 'exponential', decay: 0.94 })

  const compareMatrix = (matrix: Float64Array, expected: Figure & Partial<Digest>) => {
    if (!expected.digest) return expect(relativeGap(matrix, expected.value.flat())).toBeLessThan(tolerance)
    const { digest } = expected
    const diagonal = Float64Array.from({ length: n }, (_, i) => matrix[i * (n + 1)]!)
    const sum = (values: Float64Array) => values.reduce((a, x) => a + x, 0)
    expect(relativeGap(diagonal, digest.diag)).toBeLessThan(tolerance)
    expect(relativeGap(matrix.subarray(0, n), digest.row_0)).toBeLessThan(tolerance)
    expect(relativeGap(matrix.subarray(n * (n - 1)), digest.row_last)).toBeLessThan(tolerance)
    expect(relativeGap(sum(diagonal), digest.trace)).toBeLessThan(tolerance)
    expect(relativeGap(sum(matrix), digest.sum)).toBeLessThan(tolerance)
    expect(relativeGap(Math.sqrt(sum(matrix.map((c) => c * c))), digest.frobenius)).toBeLessThan(tolerance)
  }

  test('means, deviations, covariances and correlations', () => {
    expect(relativeGap(sample.means, set.estimators['mean']!.value)).toBeLessThan(tolerance)
    expect(relativeGap(sample.variances().map(Math.sqrt), set.estimators['sd']!.value)).toBeLessThan(
      tolerance,
    )
    compareMatrix(covariance(sample), set.estimators['cov']!)
    compareMatrix(correlation(sample), set.estimators['cor']!)
  })

  test('exponential weights, decay 0.94', () => {
    expect(relativeGap(exponential.means, set.estimators['ewma_0.94_mean']!.value)).toBeLessThan(tolerance)
    compareMatrix(covariance(exponential), set.estimators['ewma_0.94_demeaned_ml']!)
  })

  describe.each(['long', 'longshort'] as const)('the portfolio %s', (kind) => {
    const w = Float64Array.from(weights[kind])
    const expected = set.portfolios[kind]
    const d = decompose(sample, w)
    const year = (periods: number) => annualise(d, periods)

    const figures: [string, ArrayLike<number> | number | null][] = [
      ['variance', d.variance],
      ['vol', d.volatility],
      ['cw', sample.apply(w).marginals],
      ['marginal', d.marginal],
      ['rc', d.contribution],
      ['pct', d.share],
      ['corr_with_portfolio', d.correlation],
      ['beta_to_portfolio', d.beta],
      ['standalone', d.standAlone],
      ['div_ratio_gross', d.diversificationRatio],
      ['diversification_benefit', d.diversificationBenefit],
      ['enp_risk', d.effectiveNumber],
      ['vol_ann252', year(252).volatility],
      ['rc_ann252', year(252).contribution],
    ]
    // 260 days a year were computed for the index series only
    if (n === 4) figures.push(['vol_ann260', year(260).volatility], ['rc_ann260', year(260).contribution])
    test.each(figures)('%s', (figure, actual) => {
      expect(relativeGap(actual!, expected.decomposition[figure]!.value)).toBeLessThan(tolerance)
    })

    test('groups', () => {
      const labels = [...new Set(groups)].sort()
      const groupOf = Int32Array.from(groups, (label) => labels.indexOf(label))
      const g = groupDecomposition(sample, d, groupOf, labels.length)
      expect(relativeGap(g.weight, expected.groups['group_weight']!.value)).toBeLessThan(tolerance)
      expect(relativeGap(g.contribution, expected.groups['group_rc']!.value)).toBeLessThan(tolerance)
      expect(relativeGap(g.share!, expected.groups['group_pct']!.value)).toBeLessThan(tolerance)
      expect(relativeGap(g.standAlone, expected.groups['group_standalone']!.value)).toBeLessThan(tolerance)
    })

    test('volatility and contributions under exponential weights', () => {
      const { volatility, contribution } = decompose(exponential, w)
      const of = (figure: string) => expected.by_estimator[`${figure}__ewma_0.94_demeaned_ml`]!.value
      expect(relativeGap(volatility, of('vol'))).toBeLessThan(tolerance)
      expect(relativeGap(contribution, of('rc'))).toBeLessThan(tolerance)
    })
  })
})
