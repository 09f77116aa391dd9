import { activeRisk, logReturns, matrixModel, returnsModel, type ActiveConvention } from '../../src/core'
import { absoluteGap, relativeGap } from '../closeness'
import { generatedReturns, readCsv, readJson } from './data'

interface Figure {
  readonly value: number & number[]
}
interface ComputedSet {
  readonly about: {
    readonly T: number
    readonly n: number
    readonly weights: Record<'long' | 'longshort', number[]>
    readonly benchmark: number[]
    readonly generator?: { readonly seed: number }
  }
  readonly portfolios: Record<'long' | 'longshort', { readonly active: Record<string, Figure> }>
}

const closes = () => {
  const { names, rows } = readCsv('eustockmarkets_close.csv')
  const first = names.indexOf('DAX')
  return Float64Array.from(rows.flatMap((row) => row.slice(first, first + 4)))
}

// Expected: computed with numpy 1.24.2 / scipy 1.10.1 and a second time with R 4.2.2. Tolerance 1e-11 relative to the largest entry.
describe.each(['eu_log.json', 'lcg60.json', 'lcg120.json'])('active risk of %s', (file) => {
  const set = readJson<ComputedSet>(file)
  const { T, n, weights, benchmark, generator } = set.about
  const returns = generator ? generatedReturns(generator.seed, n, T).returns : logReturns(closes(), T + 1, n)
  const model = returnsModel(returns, T, n)

  test.each(['long', 'longshort'] as const)('the portfolio %s', (kind) => {
    const a = activeRisk(model, Float64Array.from(weights[kind]), Float64Array.from(benchmark))
    const { decomposition: d } = a
    const expected = set.portfolios[kind].active
    for (const [figure, actual] of [
      ['active_weight', d.weights],
      ['tracking_error', a.trackingError],
      ['active_marginal', d.marginal],
      ['active_rc', a.contribution],
      ['active_pct', a.share],
      ['active_corr', d.correlation],
      ['beta_to_benchmark', a.beta],
      ['corr_to_benchmark', a.correlation],
      ['benchmark_vol', a.benchmarkVolatility],
    ] as const)
      expect(relativeGap(actual!, expected[figure]!.value)).toBeLessThan(1e-11)
  })
})

// CFA Institute, Level III, Active Equity Investing: Portfolio Construction, exhibit on relative risk attribution (read in a forum thread
// that quotes it; published.json, cfa-l3-active-cash): benchmark 50/50 in A and B, portfolio 40/40/20 in A, B and cash. The variance
// of A is not printed and is solved for.
test('cash has all of the active risk by benchmark-relative returns, none by own returns', () => {
  const { inputs, outputs, tolerance } = readJson<{
    readonly checks: readonly {
      readonly id: string
      readonly inputs: { readonly varB: number; readonly covAB: number }
      readonly outputs: { readonly relative: readonly number[]; readonly total: { readonly cash: number } }
      readonly tolerance: { readonly relative: number }
    }[]
  }>('published.json').checks.find(({ id }) => id === 'cfa-l3-active-cash')!
  const { varB, covAB } = inputs
  const of = (varA: number, convention: ActiveConvention) =>
    activeRisk(
      matrixModel(Float64Array.of(varA, covAB, 0, covAB, varB, 0, 0, 0, 0), 3),
      Float64Array.of(0.4, 0.4, 0.2),
      Float64Array.of(0.5, 0.5, 0),
      convention,
    )
  let [low, high] = [0.0045, 0.2]
  for (let k = 0; k < 100; k++) {
    const middle = (low + high) / 2
    if (of(middle, 'benchmark-relative returns').share![0]! < outputs.relative[0]!) low = middle
    else high = middle
  }
  const relative = of(low, 'benchmark-relative returns')
  expect(absoluteGap(relative.share!, outputs.relative)).toBeLessThan(tolerance.relative)
  expect(relative.netContribution).toBeCloseTo(0, 12)
  const total = of(low, 'own returns')
  expect(total.share![2]).toBe(outputs.total.cash)
  expect(total.share![0]! + total.share![1]!).toBeCloseTo(1, 12)
})
