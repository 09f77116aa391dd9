import {
  decompose,
  estimateModel,
  inOneGo,
  leastRiskWeights,
  leastVariance,
  logReturns,
  matrixModel,
  returnsModel,
  riskBudgetWeights,
  type RiskModel,
} from '../../src/core'
import { absoluteGap, relativeGap } from '../closeness'
import { covarianceOf } from '../textbook'
import { generatedReturns, readCsv, readJson } from './data'

// Expected: computed with scipy 1.10.1 and a second time, by other algorithms, with R 4.2.2; see README.md beside this file.
// Tolerance: 1e-11 relative to the largest weight; the two computations behind the file agree to 1e-15.
const tolerance = 1e-11

interface Optimum {
  readonly weights: number[]
  readonly vol: number
  readonly budget?: number[]
  readonly support?: number[]
}
interface Case {
  readonly n: number
  readonly cov?: number[][]
  readonly [name: string]: Optimum | unknown
}

const { cases } = readJson<{ readonly cases: Readonly<Record<string, Case>> }>('optimisation.json')
const lcg = (name: string) => {
  const { about } = readJson<{
    about: { T: number; n: number; generator: { seed: number } }
  }>(name)
  const { T, n, generator } = about
  return { T, n, returns: generatedReturns(generator.seed, n, T).returns }
}

const models: Record<string, () => RiskModel> = {
  eu_log: () => {
    const { names, rows } = readCsv('eustockmarkets_close.csv')
    const first = names.indexOf('DAX')
    const closes = Float64Array.from(rows.flatMap((row) => row.slice(first, first + 4)))
    return returnsModel(logReturns(closes, 1860, 4), 1859, 4)
  },
  lcg60: () => {
    const { T, n, returns } = lcg('lcg60.json')
    return returnsModel(returns, T, n)
  },
  lcg120_lw: () => {
    const { T, n, returns } = lcg('lcg120.json')
    return estimateModel(returns, T, n, { kind: 'shrinkage', target: 'identity' })
  },
  three_asset_textbook: () => matrixModel(Float64Array.from(cases['three_asset_textbook']!.cov!.flat()), 3),
  two_asset: () => matrixModel(Float64Array.from(cases['two_asset']!.cov!.flat()), 2),
}

const optimum = (name: string, key: string) => cases[name]![key] as Optimum
const bounds = (size: number, lower: number, upper: number) => ({
  lower: new Float64Array(size).fill(lower),
  upper: new Float64Array(size).fill(upper),
  sum: 1,
})
const feasible = (model: RiskModel, lower: number, upper: number) => {
  const result = inOneGo(leastVariance(model, bounds(model.size, lower, upper)))
  if (!result.feasible) throw new Error('a sum of 1 lies within these bounds')
  return result
}

test('every case of the file is compared', () => {
  expect(Object.keys(models).sort()).toEqual(Object.keys(cases).sort())
})

describe.each(Object.keys(models))('%s', (name) => {
  const model = models[name]!()
  const budgeted = Object.keys(cases[name]!).filter((key) => key.startsWith('rb_'))

  test.each(budgeted)('weights for the risk budgets of %s, and the volatility they give', (key) => {
    const expected = optimum(name, key)
    const result = inOneGo(riskBudgetWeights(model, Float64Array.from(expected.budget!)))
    expect(result.converged).toBe(true)
    expect(relativeGap(result.weights, expected.weights)).toBeLessThan(tolerance)
    expect(relativeGap(decompose(model, result.weights).volatility, expected.vol)).toBeLessThan(tolerance)
    expect(absoluteGap(result.shares!, expected.budget!)).toBeLessThan(1e-10)
  })

  test('the long-only weights of least variance, which positions they leave out, and their volatility', () => {
    const expected = optimum(name, 'minvar_long_only')
    const result = feasible(model, 0, 1)
    expect(result.converged).toBe(true)
    expect(relativeGap(result.weights, expected.weights)).toBeLessThan(tolerance)
    expect(relativeGap(Math.sqrt(result.variance), expected.vol)).toBeLessThan(tolerance)
    const held = Array.from(result.weights.keys()).filter((i) => result.weights[i]! > 0)
    expect(held).toEqual(expected.support)
  })

  test('the weights of least variance without bounds, and their volatility', () => {
    const expected = optimum(name, 'minvar_unconstrained')
    const result = feasible(model, -Infinity, Infinity)
    expect(result.converged).toBe(true)
    expect(relativeGap(result.weights, expected.weights)).toBeLessThan(tolerance)
    expect(relativeGap(Math.sqrt(result.variance), expected.vol)).toBeLessThan(tolerance)
  })
})

test('without correlations, equal risk contribution is inverse volatility (Maillard et al. 2010), and least variance inverse variance', () => {
  // the file's volatilities of lcg60; without correlations both follow from x_i^2 C_ii = b_i and C_ii w_i = m
  const { weights } = optimum('lcg60', 'inverse_vol')
  const deviation = weights.map((w) => 1 / w)
  const uncorrelated = covarianceOf(
    deviation,
    deviation.map((_, i) => deviation.map((__, j) => (i === j ? 1 : 0))),
  )
  const model = matrixModel(uncorrelated, 60)
  const equal = inOneGo(riskBudgetWeights(model, new Float64Array(60).fill(1 / 60)))
  expect(relativeGap(equal.weights, weights)).toBeLessThan(1e-12)
  const total = weights.reduce((sum, w) => sum + w * w, 0)
  expect(
    relativeGap(
      feasible(model, 0, 1).weights,
      weights.map((w) => (w * w) / total),
    ),
  ).toBeLessThan(1e-12)
})

test('the least-risk weight of one of two positions offsets the other by the slope of a regression', () => {
  // Two positions at correlation rho: the least-risk weight of the first is -rho s2/s1 times that of the second (regression slope;
  // common practice, no source)
  const [s1, s2, rho, w2] = [0.2, 0.3, -0.3, 0.7]
  const C = covarianceOf(
    [s1, s2],
    [
      [1, rho],
      [rho, 1],
    ],
  )
  const [first] = leastRiskWeights(matrixModel(C, 2), Float64Array.of(0.1, w2))
  expect(first).toBeCloseTo((-rho * s2 * w2) / s1, 14)
})
