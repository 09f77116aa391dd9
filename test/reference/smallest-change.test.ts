import {
  decompose,
  inOneGo,
  matrixModel,
  smallestChange,
  type ChangeLimit,
  type RiskModel,
} from '../../src/core'
import { absoluteGap } from '../closeness'
import { readJson } from './data'

// What the smallest change must lead to where the limits leave one book alone: the risk budgets and the least variances of optimisation.json,
// computed with scipy 1.10.1 and R 4.2.2 (see README.md beside this file). Tolerances are beside the limits that make them.

interface Optimum {
  readonly weights: number[]
  readonly vol: number
  readonly budget?: number[]
}
interface Case {
  readonly n: number
  readonly cov: number[][]
  readonly rb_equal: Optimum
  readonly minvar_long_only: Optimum
  readonly [name: string]: unknown
}
const { cases } = readJson<{ readonly cases: Readonly<Record<string, Case>> }>('optimisation.json')
const names = ['eu_log', 'three_asset_textbook', 'two_asset'] as const
const modelOf = (name: string): RiskModel =>
  matrixModel(Float64Array.from(cases[name]!.cov.flat()), cases[name]!.n)

/** Some book that is neither: the first position alone holds a half. */
const start = (n: number) => Float64Array.from({ length: n }, (_, i) => (i === 0 ? 0.5 : 0.5 / (n - 1)))

describe.each(names)('limits that leave one book of %s', (name) => {
  const model = modelOf(name)
  const { n, rb_equal, minvar_long_only } = cases[name]!

  const budgets = Object.entries(cases[name]!)
    .filter(([key]) => key.startsWith('rb_'))
    .map(([key, value]) => [key, value as Optimum] as const)
  test.each(budgets)(
    'shares no larger than %s allows lead to the weights of that risk budget',
    (_, { budget, weights }) => {
      // a millionth more than the budget each, so that there is room for the margin; weights answer to shares about one for one
      const limits = budget!.map((b, i): ChangeLimit => ({
        measure: 'share',
        members: Int32Array.of(i),
        most: b * (1 + 1e-6),
      }))
      const result = inOneGo(
        smallestChange(model, { weights: start(n), limits, financing: { kind: 'book' } }),
      )
      expect(result.status).toBe('met')
      expect(absoluteGap(result.weights, weights)).toBeLessThan(3e-6)
    },
  )

  test('a volatility no larger than the least leads to the weights of least variance', () => {
    // the variance is flat at its least: a volatility 1e-8 above it, relative, leaves about its root of room to the weights
    const most = minvar_long_only.vol * (1 + 1e-8)
    const limit: ChangeLimit = { measure: 'volatility', members: null, most }
    const result = inOneGo(
      smallestChange(model, { weights: start(n), limits: [limit], financing: { kind: 'book' } }),
    )
    expect([result.status, result.proven]).toEqual(['met', true])
    expect(absoluteGap(result.weights, minvar_long_only.weights)).toBeLessThan(5e-4)
  })

  test('a volatility below the least is proven impossible', () => {
    const limit: ChangeLimit = {
      measure: 'volatility',
      members: null,
      most: minvar_long_only.vol * (1 - 1e-4),
    }
    const result = inOneGo(
      smallestChange(model, { weights: start(n), limits: [limit], financing: { kind: 'book' } }),
    )
    expect([result.status, result.proven]).toEqual(['not found', true])
    // the best point found is the least there is
    expect(result.residuals[0]!.figure / minvar_long_only.vol - 1).toBeLessThan(1e-6)
  })

  test('the volatility of the equal budget can be had for no more than the way to that budget', () => {
    const limit: ChangeLimit = { measure: 'volatility', members: null, most: rb_equal.vol }
    const weights = start(n)
    const result = inOneGo(smallestChange(model, { weights, limits: [limit], financing: { kind: 'book' } }))
    const way = rb_equal.weights.reduce((sum, w, i) => sum + Math.abs(w - weights[i]!), 0)
    expect(result.change).toBeLessThanOrEqual(way + 1e-8)
    expect(decompose(model, result.weights).volatility).toBeLessThanOrEqual(rb_equal.vol)
  })
})
