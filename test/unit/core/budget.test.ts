/** Risk budgets: what is refused, what cannot be met and is said, and awkward books against a second way of computing. */
import {
  inOneGo,
  leastRiskWeights,
  matrixModel,
  returnsModel,
  riskBudgetWeights,
  type RiskModel,
} from '../../../src/core'
import { absoluteGap, relativeGap } from '../../closeness'
import { cyclicalBudgetWeights } from '../../cyclical-descent'
import { faultOf } from '../../fault-of'
import { covarianceOf, textbookCovariance } from '../../textbook'

const budgeted = (model: RiskModel, budgets: readonly number[]) =>
  inOneGo(riskBudgetWeights(model, Float64Array.from(budgets)))
const equal = (n: number) => Array.from({ length: n }, () => 1 / n)
const constant = (n: number, rho: number) =>
  Array.from({ length: n }, (_, i) => Array.from({ length: n }, (__, j) => (i === j ? 1 : rho)))
const two = (rho: number, s2 = 0.3) => matrixModel(covarianceOf([0.2, s2], constant(2, rho)), 2)

let state = 1
const uniform = () => (state = (state * 16807) % 2147483647) / 2147483647 - 0.5
/** One factor that the positions load on by `loading`, and noise of their own; volatilities over a range of `decades`. */
const market = (T: number, n: number, loading: () => number, decades = 1) => {
  const loadings = Array.from({ length: n }, loading)
  const scales = Array.from({ length: n }, () => 0.02 * 10 ** (decades * uniform()))
  return Array.from({ length: T }, () => {
    const factor = uniform()
    return scales.map((scale, i) => scale * (loadings[i]! * factor + uniform()))
  })
}
const modelOf = (rows: readonly (readonly number[])[]) =>
  returnsModel(Float64Array.from(rows.flat()), rows.length, rows[0]!.length)

describe('risk budgets are met', () => {
  test('by a single position', () => {
    const { weights, shares, residual, converged } = budgeted(matrixModel(Float64Array.of(0.04), 1), [1])
    expect([weights[0], shares![0], residual, converged]).toEqual([1, 1, 0, true])
  })

  test.each([
    ['of 1, which no long-only mix can offset', 1],
    ['of 0', 0],
    ['of -0.999', -0.999],
  ])('by two positions at a correlation %s, in closed form', (_, rho) => {
    // with x_i = u_i/s_i: u1^2 + rho u1 u2 = b1 and u2^2 + rho u1 u2 = b2, so that with q = u2/u1: b1 q^2 - rho (b2 - b1) q - b2 = 0
    // (two lines of algebra from the definition)
    const [b1, b2] = [0.3, 0.7]
    const q = (rho * (b2 - b1) + Math.sqrt((rho * (b2 - b1)) ** 2 + 4 * b1 * b2)) / (2 * b1)
    const w1 = 1 / 0.2 / (1 / 0.2 + q / 0.3)
    const { weights, converged } = budgeted(two(rho), [b1, b2])
    expect(converged).toBe(true)
    expect(absoluteGap(weights, [w1, 1 - w1])).toBeLessThan(1e-13)
  })

  test('near the most negative correlation that ten positions can share, where all are alike', () => {
    const n = 10
    const C = covarianceOf(equal(n), constant(n, -1 / (n - 1) + 1e-6))
    const { weights, converged } = budgeted(matrixModel(C, n), equal(n))
    expect(converged).toBe(true)
    expect(absoluteGap(weights, equal(n))).toBeLessThan(1e-10)
  })

  test.each([
    ['the market in all of them', () => 1 + uniform()],
    ['loadings of both signs', () => 6 * uniform()],
  ])('by 40 positions with %s, as cyclical descent has it', (_, loading) => {
    const rows = market(120, 40, loading)
    const raw = Array.from({ length: 40 }, () => 0.6 + uniform())
    const total = raw.reduce((a, b) => a + b, 0)
    const budgets = raw.map((b) => b / total)
    const { weights, shares, residual, converged } = budgeted(modelOf(rows), budgets)
    expect(converged).toBe(true)
    expect(residual).toBeLessThan(1e-10)
    expect(absoluteGap(shares!, budgets)).toBeLessThan(1e-10)
    expect(relativeGap(weights, cyclicalBudgetWeights(textbookCovariance(rows), budgets))).toBeLessThan(1e-10)
  })

  test('by more positions than dates', () => {
    const { residual, converged, weights } = budgeted(modelOf(market(30, 90, () => 1 + uniform())), equal(90))
    expect(converged).toBe(true)
    expect(residual).toBeLessThan(1e-10)
    expect(Math.min(...weights)).toBeGreaterThan(0)
  })

  test('by weights a million times apart, to nine digits of the smallest', () => {
    // uncorrelated: x_i^2 C_ii = b_i (from the definition)
    const deviations = [1e-3, 1, 1e3]
    const budgets = [0.5, 0.3, 0.2]
    const expected = budgets.map((b, i) => Math.sqrt(b) / deviations[i]!)
    const total = expected.reduce((a, b) => a + b, 0)
    const { weights, converged } = budgeted(matrixModel(covarianceOf(deviations, constant(3, 0)), 3), budgets)
    expect(converged).toBe(true)
    weights.forEach((w, i) => expect(relativeGap(w, expected[i]! / total)).toBeLessThan(1e-9))
    // and where it is the correlations that set them apart
    const correlated = budgeted(
      matrixModel(covarianceOf(deviations, constant(3, 0.9)), 3),
      [1e-6, 0.5, 0.499999],
    )
    expect(correlated.converged).toBe(true)
    expect(absoluteGap(correlated.shares!, [1e-6, 0.5, 0.499999])).toBeLessThan(1e-15)
  })

  test('by a weight of exactly 0 for a budget of 0, whether it moves or not', () => {
    const three = matrixModel(
      covarianceOf(
        [0.2, 0.15, 0.3],
        [
          [1, 0.4, -0.3],
          [0.4, 1, 0.2],
          [-0.3, 0.2, 1],
        ],
      ),
      3,
    )
    const { weights } = budgeted(three, [0.3, 0, 0.7])
    expect(weights[1]).toBe(0)
    expect(
      absoluteGap(
        weights.filter((w) => w > 0),
        budgeted(two(-0.3), [0.3, 0.7]).weights,
      ),
    ).toBeLessThan(1e-14)
    const riskless = budgeted(matrixModel(Float64Array.of(0, 0, 0, 0.04), 2), [0, 1])
    expect([Array.from(riskless.weights), riskless.converged]).toEqual([[0, 1], true])
  })

  test('budgets that miss a sum of 1 by less than 1e-9 are taken as they relate', () => {
    const third = 0.3333333333
    const { shares, converged } = budgeted(matrixModel(covarianceOf([1, 2, 3], constant(3, 0)), 3), [
      third,
      third,
      third,
    ])
    expect(converged).toBe(true)
    expect(absoluteGap(shares!, equal(3))).toBeLessThan(1e-12)
  })
})

describe('what cannot be met is said', () => {
  test('a long-only mix without any risk leaves no shares: two positions that offset each other exactly', () => {
    const result = budgeted(two(-1), [0.5, 0.5])
    expect(result).toMatchObject({
      converged: false,
      stopped: 'riskless-mix',
      shares: null,
      residual: Infinity,
    })
    // the mix it is: weights in the inverse ratio of volatilities
    expect(absoluteGap(result.weights, [0.6, 0.4])).toBeLessThan(1e-6)
  })

  test('nor does one among many series on few dates', () => {
    const result = budgeted(modelOf(market(20, 90, () => 6 * uniform())), equal(90))
    expect(result).toMatchObject({ converged: false, stopped: 'riskless-mix', shares: null })
  })

  test('two that almost do leave shares of rounding, whose gap is told', () => {
    const result = budgeted(two(-1 + 1e-12), [0.3, 0.7])
    expect(result).toMatchObject({ converged: false, stopped: 'rounding' })
    expect(result.residual).toBeGreaterThan(1e-10)
    // each share is a difference of terms 1e12 times the variance, of which rounding leaves 1e-16
    expect(result.residual).toBeLessThan(1e-3)
  })

  test('a model whose answers do not settle ends within the bound on questions', () => {
    const honest = two(0.5)
    let asked = 0
    const noisy: RiskModel = {
      ...honest,
      apply(weights, into) {
        const { marginals, variance } = honest.apply(weights, into)
        return { marginals: marginals.map((m) => m * (1 + 0.3 * Math.sin(97 * ++asked))), variance }
      },
    }
    const result = inOneGo(riskBudgetWeights(noisy, Float64Array.of(0.2, 0.8)))
    expect(result.converged).toBe(false)
    expect(result.stopped).not.toBeNull()
    // each question is one call, which counts each of two positions
    expect(asked / 2).toBe(result.passes)
    expect(result.passes).toBeLessThanOrEqual(10_000)
  })
})

describe('what is no budget is refused', () => {
  const C = two(0.2)
  test.each<[string, RiskModel, number[], object]>([
    ['too few', C, [1], { code: 'shape', where: { argument: 'budgets' } }],
    [
      'one that is not a number',
      C,
      [0.5, NaN],
      { code: 'not-a-number', where: { argument: 'budgets', row: 1, column: 0 } },
    ],
    [
      'a negative one, with its row',
      C,
      [1.25, -0.25],
      {
        code: 'out-of-range',
        message: 'budgets: -0.25; shares of 0 or more are needed',
        where: { argument: 'budgets', row: 1 },
      },
    ],
    [
      'a sum of 0.999',
      C,
      [0.333, 0.666],
      {
        code: 'out-of-range',
        message: 'budgets: they add up to 0.999; shares of risk that add up to 1 are needed',
      },
    ],
    ['no budget at all', C, [0, 0], { code: 'out-of-range', found: 'budgets: they add up to 0' }],
    [
      'a share for a position that never moves, with its column',
      matrixModel(Float64Array.of(0.04, 0, 0, 0), 2),
      [0.5, 0.5],
      { code: 'zero-risk', where: { argument: 'risk', column: 1 } },
    ],
  ])('%s', (_, model, budgets, expected) => {
    expect(faultOf(() => budgeted(model, budgets))).toMatchObject(expected)
  })

  test('and a matrix with a negative eigenvalue that the search meets', () => {
    const indefinite = matrixModel(covarianceOf([1, 1, 1], constant(3, -0.9)), 3)
    expect(faultOf(() => budgeted(indefinite, equal(3)))).toMatchObject({ code: 'negative-variance' })
  })
})

test('the search tells how far it is after every question and leaves its input alone', () => {
  const model = modelOf(market(60, 30, () => 6 * uniform()))
  let asked = 0
  const counted: RiskModel = { ...model, apply: (weights, into) => (asked++, model.apply(weights, into)) }
  const budgets = Float64Array.from(equal(30))
  const steps = riskBudgetWeights(counted, budgets)
  const shares: number[] = []
  let before = 0
  for (let step = steps.next(); !step.done; step = steps.next()) {
    shares.push(step.value)
    // the last question of a step and the first of the next stand together
    expect(asked - before).toBeLessThanOrEqual(2)
    before = asked
  }
  expect(shares.length).toBeGreaterThan(5)
  expect(shares).toEqual([...shares].sort((a, b) => a - b))
  expect(shares[0]).toBe(0)
  expect(shares.at(-1)).toBeLessThan(1)
  expect(Array.from(budgets)).toEqual(equal(30))
})

describe('the least-risk weight', () => {
  test('of each position is where its own marginal contribution is zero', () => {
    const model = modelOf(market(50, 6, () => 6 * uniform()))
    const weights = Float64Array.of(0.3, -0.2, 0.4, 0.1, 0, 0.4)
    leastRiskWeights(model, weights).forEach((least, i) => {
      const { marginals } = model.apply(weights.map((w, j) => (j === i ? least : w)))
      expect(Math.abs(marginals[i]!)).toBeLessThan(1e-15)
    })
  })

  test('is not defined for a position that never moves', () => {
    const least = leastRiskWeights(matrixModel(Float64Array.of(0.04, 0, 0, 0), 2), Float64Array.of(0.5, 0.5))
    expect(Array.from(least)).toEqual([0, NaN])
  })

  test('is refused for weights of another number', () => {
    expect(faultOf(() => leastRiskWeights(two(0), Float64Array.of(1)))).toMatchObject({ code: 'shape' })
  })
})
