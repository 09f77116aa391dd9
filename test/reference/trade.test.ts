import { courseOf, decompose, impliedReturns, matrixModel, removals } from '../../src/core'
import { absoluteGap } from '../closeness'
import { covarianceOf } from '../textbook'
import { readJson } from './data'

interface Check {
  readonly id: string
  readonly citation: string
  readonly status: string
  readonly inputs: {
    readonly values?: number[]
    readonly weights?: number[]
    readonly vol: number[]
    readonly corr: number[][]
  }
  readonly outputs: Record<string, number | number[]>
  readonly tolerance: Record<string, number>
}
const checks = readJson<{ readonly checks: readonly Check[] }>('published.json').checks

/** Normal quantile at 95%, computed with scipy 1.10.1, norm.ppf(0.95). */
const z95 = 1.6448536269514722

// Incremental risk as printed (total less the total without the position), per position of the example: figure, multiple of volatility.
// The statuses are those of published.json: read in pages that quote the sources; Tasche's figures were derived from the printed inequalities' inputs.
test.each([
  ['jorion-2ccy-exact-z', z95, { incrementalCad: 0, incrementalEur: 1 }],
  ['frm-cad-usd-component', z95, { incrementalCad: 0 }],
  ['tasche-inequalities', 1, { withWithout: [0, 1, 2] }],
] as const)('removing a position for cash loses the risk printed in %s', (id, multiple, figures) => {
  const { inputs, outputs, tolerance } = checks.find((check) => check.id === id)!
  const values = Float64Array.from(inputs.values ?? inputs.weights!)
  const model = matrixModel(covarianceOf(inputs.vol, inputs.corr), values.length)
  const { change } = removals(model, values, { kind: 'cash' })
  for (const [figure, positions] of Object.entries(figures)) {
    const lost = [positions].flat().map((i: number) => -multiple * change[i]!)
    const printed = [outputs[figure]!].flat()
    expect(absoluteGap(lost, printed)).toBeLessThanOrEqual(tolerance[figure]!)
  }
})

// The long-only minimum variance of this table holds no position 2 (published.json, mrt-mv: read in part): along a switch between any two of the
// positions it holds, risk is least right there.
test('no switch between positions of the printed minimum-variance weights has less risk (Maillard, Roncalli & Teiletche 2010)', () => {
  const { inputs } = checks.find(({ id }) => id === 'mrt-mv')!
  const { recomputed } = checks.find(({ id }) => id === 'mrt-mv') as unknown as {
    recomputed: { weights: number[] }
  }
  const model = matrixModel(covarianceOf(inputs.vol, inputs.corr), 4)
  for (const [i, j] of [
    [0, 2],
    [0, 3],
    [2, 3],
  ] as const) {
    const direction = new Float64Array(4)
    direction[i] = 1
    direction[j] = -1
    const { leastAt } = courseOf(model, Float64Array.from(recomputed.weights), direction)
    // the weights are given to 13 digits
    expect(Math.abs(leastAt!)).toBeLessThanOrEqual(1e-12)
  }
})

// He & Litterman (1999), The Intuition Behind Black-Litterman Model Portfolios, tables 1 and 2 (from memory): correlations, volatilities and
// market weights of seven countries' shares, and the excess returns that make those weights optimal at a risk aversion of 2.5, in percent with one
// decimal. All seven come out as printed, which speaks for the memory of the inputs.
const COUNTRIES = {
  correlations: [
    [1],
    [0.488, 1],
    [0.478, 0.664, 1],
    [0.515, 0.655, 0.861, 1],
    [0.439, 0.31, 0.355, 0.354, 1],
    [0.512, 0.608, 0.783, 0.777, 0.405, 1],
    [0.491, 0.779, 0.668, 0.653, 0.306, 0.652, 1],
  ],
  volatilities: [16.0, 20.3, 24.8, 27.1, 21.0, 20.0, 18.7],
  weights: [1.6, 2.2, 5.2, 5.5, 11.6, 12.4, 61.5],
  implied: [3.9, 6.9, 8.4, 9.0, 4.3, 6.8, 7.6],
}

test('implied returns are those printed for seven countries (He & Litterman 1999, from memory)', () => {
  const { correlations, volatilities, weights, implied } = COUNTRIES
  const full = volatilities.map((_, i) =>
    volatilities.map((_, j) => correlations[Math.max(i, j)]![Math.min(i, j)]!),
  )
  const model = matrixModel(
    covarianceOf(
      volatilities.map((v) => v / 100),
      full,
    ),
    7,
  )
  const d = decompose(
    model,
    Float64Array.from(weights, (w) => w / 100),
  )
  const found = impliedReturns(d, { kind: 'risk aversion', value: 2.5 })
  // half a unit of the printed digit
  expect(
    absoluteGap(
      found.implied.map((r) => 100 * r),
      implied,
    ),
  ).toBeLessThanOrEqual(0.05)
  // and scaled to the total that these add up to, the same risk aversion comes back
  expect(impliedReturns(d, { kind: 'total', value: found.total }).riskAversion).toBeCloseTo(2.5, 12)
})
