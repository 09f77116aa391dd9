import {
  bootstrap,
  decompose,
  estimateModel,
  inOneGo,
  logReturns,
  returnsModel,
  shareDifferences,
  simpleReturns,
  standardErrors,
  type BootstrapChoice,
  type BootstrapResult,
  type Estimator,
  type ReturnsModel,
  type Spread,
  type Weighting,
} from '../../src/core'
import { worksheetFunctions } from '../../src/sheet/functions'
import { absoluteGap, relativeGap } from '../closeness'
import { generatedReturns, readCsv, readJson } from './data'

// Expected: standard errors under `intervals` computed with numpy 1.24.2 / scipy 1.10.1 and a second time with R 4.2.2;
// simulations of bootstrap_check.json with numpy 1.24.2; sampling_errors.json with numpy 2.4.6: see README.md beside this file.
// Tolerance of computed figures: 1e-11 relative to the largest entry, as README.md says.
const tolerance = 1e-11

interface Intervals {
  readonly se_vol_kurtosis_robust: { readonly value: number }
  readonly se_pct_hc0: { readonly value: number[] }
}
interface ComputedSet {
  readonly about: {
    readonly T: number
    readonly n: number
    readonly weights: Record<Kind, number[]>
    readonly generator?: { readonly seed: number }
  }
  readonly portfolios: Record<Kind, { readonly intervals: Intervals }>
}
type Kind = 'long' | 'longshort'

interface Computed {
  readonly volatility: number
  readonly contribution: number[]
  readonly share: number[]
  readonly se_volatility: number
  readonly se_contribution: number[]
  readonly se_share: number[]
  readonly pairs: number[][]
  readonly se_difference: number[]
}
interface SamplingErrors {
  readonly cases: Record<string, Record<string, Computed>>
  readonly bootstrap: Record<string, Record<string, BootstrapChoice & Spreads>>
}
interface Spreads {
  readonly volatility: Spread<number>
  readonly contribution: Spread<number[]>
  readonly share: Spread<number[]>
}

const computed = readJson<SamplingErrors>('sampling_errors.json')

function returnsOf(name: string): { set: ComputedSet; returns: Float64Array } {
  const set = readJson<ComputedSet>(`${name}.json`)
  const { generator, n, T } = set.about
  if (generator) return { set, returns: generatedReturns(generator.seed, n, T).returns }
  const { names, rows } = readCsv('eustockmarkets_close.csv')
  const first = names.indexOf('DAX')
  const closes = Float64Array.from(rows.flatMap((row) => row.slice(first, first + n)))
  return { set, returns: (name === 'eu_log' ? logReturns : simpleReturns)(closes, T + 1, n) }
}

/** The settings of sampling_errors.json by their names there. */
const settings: Record<string, { estimator: Estimator; lags: number }> = {
  sample: { estimator: { kind: 'sample' }, lags: 0 },
  'exponential 0.97': { estimator: { kind: 'exponential', decay: 0.97 }, lags: 0 },
  'lagged 1': { estimator: { kind: 'lagged', lags: 1 }, lags: 1 },
  'lagged 7': { estimator: { kind: 'lagged', lags: 7 }, lags: 7 },
}

describe.each(['eu_log', 'eu_simple', 'lcg60', 'lcg120'])('%s', (name) => {
  const { set, returns } = returnsOf(name)
  const { T, n } = set.about

  describe.each(['long', 'longshort'] as const)('the portfolio %s', (kind) => {
    const weights = Float64Array.from(set.about.weights[kind])

    test('errors without normality: of the volatility by its kurtosis, of shares by White (1980)', () => {
      const { volatility, share } = standardErrors(returnsModel(returns, T, n), weights)
      const { intervals } = set.portfolios[kind]
      expect(relativeGap(volatility, intervals.se_vol_kurtosis_robust.value)).toBeLessThan(tolerance)
      expect(relativeGap(share!, intervals.se_pct_hc0.value)).toBeLessThan(tolerance)
    })

    const cases = Object.entries(computed.cases[`${name}.${kind}`] ?? {})
    if (name !== 'eu_simple') {
      test('has a computed case for every setting', () => {
        expect(cases.map(([setting]) => setting)).toEqual(Object.keys(settings))
      })
    }
    for (const [setting, expected] of cases) {
      test(`volatility, contributions, shares and differences of shares: ${setting}`, () => {
        const { estimator, lags } = settings[setting]!
        const estimated = estimateModel(returns, T, n, estimator)
        const model = estimated.returns
        // the figures whose errors these are
        const figures = decompose(estimated, weights)
        expect(relativeGap(figures.volatility, expected.volatility)).toBeLessThan(tolerance)
        expect(relativeGap(figures.contribution, expected.contribution)).toBeLessThan(tolerance)
        expect(relativeGap(figures.share!, expected.share)).toBeLessThan(tolerance)
        const { volatility, contribution, share } = standardErrors(model, weights, lags)
        expect(relativeGap(volatility, expected.se_volatility)).toBeLessThan(tolerance)
        expect(relativeGap(contribution, expected.se_contribution)).toBeLessThan(tolerance)
        expect(relativeGap(share!, expected.se_share)).toBeLessThan(tolerance)
        const pairs = Int32Array.from(expected.pairs.flat())
        expect(
          relativeGap(shareDifferences(model, weights, pairs, lags)!, expected.se_difference),
        ).toBeLessThan(tolerance)
      })
    }
  })
})

interface Simulated {
  readonly T: number
  readonly n: number
  readonly replications_nonparametric: number
  readonly se_pct_nonparametric_bootstrap: number[]
  readonly se_vol_nonparametric_bootstrap: number
}
const { cases: simulations } = readJson<{ readonly cases: Record<string, Simulated> }>('bootstrap_check.json')

describe.each(Object.entries(simulations))('the simulation of %s', (id, simulated) => {
  const [name, kind] = id.split('.') as [string, Kind]
  const { set, returns } = returnsOf(name)
  const model = returnsModel(returns, simulated.T, simulated.n)
  const weights = Float64Array.from(set.about.weights[kind])

  test('agrees with the closed form but for its own noise and terms of order 1/T', () => {
    const { volatility, share } = standardErrors(model, weights)
    // 4 standard deviations of a simulated one, 1/sqrt(2B), and what a first-order form leaves out: of the order of 1/sqrt(T)
    const reach = 4 / Math.sqrt(2 * simulated.replications_nonparametric) + 0.5 / Math.sqrt(simulated.T)
    expect(Math.abs(volatility / simulated.se_vol_nonparametric_bootstrap - 1)).toBeLessThan(reach)
    share!.forEach((error, i) => {
      expect(Math.abs(error / simulated.se_pct_nonparametric_bootstrap[i]! - 1)).toBeLessThan(reach)
    })
  })

  test('agrees with the bootstrap here but for the noise of both', () => {
    const replicates = 600
    const drawn = inOneGo(bootstrap(model, weights, { replicates, seed: 7, blockLength: 1 }))
    // 4.5 standard deviations: the largest of the 180 shares compared here is seldom beyond 3.5; bootstrap distributions with
    // an excess kurtosis up to 1 make those of a deviation sqrt(1.5) as large
    const noise = Math.sqrt((1 / replicates + 1 / simulated.replications_nonparametric) / 2)
    const reach = 4.5 * noise * Math.sqrt(1.5)
    expect(Math.abs(drawn.volatility.deviation / simulated.se_vol_nonparametric_bootstrap - 1)).toBeLessThan(
      reach,
    )
    drawn.share!.deviation.forEach((deviation, i) => {
      expect(Math.abs(deviation / simulated.se_pct_nonparametric_bootstrap[i]! - 1)).toBeLessThan(reach)
    })
  })
})

describe('the bootstrap draws the dates that MT19937 gives in numpy, and takes the figures that numpy takes', () => {
  const { set, returns } = returnsOf('eu_log')
  const weights = Float64Array.from(set.about.weights.long)
  const compare = (actual: Spread<number | Float64Array>, expected: Spread<number | number[]>) => {
    for (const figure of ['deviation', 'lower', 'upper'] as const) {
      expect(relativeGap(actual[figure], expected[figure])).toBeLessThan(tolerance)
    }
  }

  test.each(Object.entries(computed.bootstrap['eu_log.long']!))('%s', (setting, expected) => {
    const weighting: Weighting = setting.startsWith('exponential')
      ? { kind: 'exponential', decay: 0.97 }
      : { kind: 'sample' }
    const result = inOneGo(bootstrap(returnsModel(returns, set.about.T, 4, weighting), weights, expected))
    compare(result.volatility, expected.volatility)
    compare(result.contribution, expected.contribution)
    compare(result.share!, expected.share)
  })
})

test('RISKSHAREERROR gives in cells what was computed for the index returns, estimator by estimator', () => {
  const { set, returns } = returnsOf('eu_log')
  const block = Array.from({ length: set.about.T }, (_, t) => Array.from(returns.subarray(4 * t, 4 * t + 4)))
  const call = worksheetFunctions['RISKSHAREERROR'] as (...cells: unknown[]) => number[][]
  for (const [setting, expected] of Object.entries(computed.cases['eu_log.long']!)) {
    const found = call([set.about.weights.long], block, setting)
    expect(found).toHaveLength(1)
    expect(relativeGap(found.flat(), expected.se_share)).toBeLessThan(tolerance)
  }
})

/** The largest difference between errors of the bootstrap and of the closed form, in standard deviations of the former. */
function furthest(result: BootstrapResult, model: ReturnsModel, weights: Float64Array): number {
  const errors = standardErrors(model, weights)
  const noise = 1 / Math.sqrt(2 * result.replicates)
  const apart = (drawn: number, closed: number) => Math.abs(drawn / closed - 1) / noise
  return Math.max(
    apart(result.volatility.deviation, errors.volatility),
    ...result.contribution.deviation.map((drawn, i) => apart(drawn, errors.contribution[i]!)),
    ...result.share!.deviation.map((drawn, i) => apart(drawn, errors.share![i]!)),
  )
}

test('the bootstrap and the closed form agree on the index returns within the noise of 2000 replicates', () => {
  const { set, returns } = returnsOf('eu_log')
  const weights = Float64Array.from(set.about.weights.long)
  const model = returnsModel(returns, set.about.T, 4)
  const result = inOneGo(bootstrap(model, weights, { replicates: 2000, seed: 1, blockLength: 1 }))
  // nine figures: the largest of them is beyond 3.5 in one seed of two hundred; this seed is fixed
  expect(furthest(result, model, weights)).toBeLessThan(3.5)
  const { share } = decompose(model, weights)
  share!.forEach((p, i) => {
    expect(result.share!.lower[i]!).toBeLessThan(p)
    expect(result.share!.upper[i]!).toBeGreaterThan(p)
  })
})

test('Kendall & Stuart: the error of a volatility is 1/sqrt(2T) of it where kurtosis is that of the normal, 3 (memory)', () => {
  const { checks } = readJson<{
    readonly checks: {
      readonly id: string
      readonly inputs: { readonly T: number[] }
      readonly outputs: { readonly relative: number[] }
      readonly tolerance: { readonly relative: number }
    }[]
  }>('published.json')
  const { inputs, outputs, tolerance: printed } = checks.find(({ id }) => id === 'vol-standard-error')!
  const relative = inputs.T.map((T) => {
    // 1 and -1 in every tenth row or so, f of them, b and -b in the others: f + (1-f) b^4 = 3 (f + (1-f) b^2)^2
    const large = 2 * Math.round(T / 20)
    const f = large / T
    const [a, b, c] = [(1 - f) * (2 - 3 * f), 6 * f * (1 - f), f * (3 * f - 1)]
    const size = Math.sqrt((-b + Math.sqrt(b * b - 4 * a * c)) / (2 * a))
    const returns = Float64Array.from({ length: T }, (_, t) => (t < large ? 1 : size) * (t % 2 ? 1 : -1))
    const model = returnsModel(returns, T, 1)
    const one = Float64Array.of(1)
    return standardErrors(model, one).volatility / decompose(model, one).volatility
  })
  expect(absoluteGap(relative, outputs.relative)).toBeLessThan(printed.relative)
})
