/**
 * Marginal contributions are derivatives: here the volatility is written out as an expression and differentiated symbolically by
 * mathjs, a library that knows nothing of portfolios.
 *
 * Inputs: three positions of Roncalli (2013), Introduction to Risk Parity and Budgeting, table 2.2 (weights and outputs read; volatilities
 * and correlations from memory, they reproduce every printed figure), and the same book with a short position.
 */
import { derivative, evaluate, parse } from 'mathjs'
import { decompose, matrixModel } from '../../src/core'

const VOLATILITIES = [0.3, 0.2, 0.15]
const CORRELATIONS = [
  [1, 0.8, 0.5],
  [0.8, 1, 0.3],
  [0.5, 0.3, 1],
]
const covariances = CORRELATIONS.map((row, i) =>
  row.map((rho, j) => rho * VOLATILITIES[i]! * VOLATILITIES[j]!),
)
const names = ['a', 'b', 'c']
const volatility = `sqrt(${covariances
  .flatMap((row, i) => row.map((c, j) => `${c} * ${names[i]!} * ${names[j]!}`))
  .join(' + ')})`

test.each([[[0.5, 0.2, 0.3]], [[0.5, -0.2, 0.7]]])(
  'the marginal contributions of %j are the symbolic derivatives of the volatility, to 1e-14',
  (weights) => {
    const at = Object.fromEntries(names.map((name, i) => [name, weights[i]!]))
    const ours = decompose(matrixModel(Float64Array.from(covariances.flat()), 3), Float64Array.from(weights))
    expect(ours.volatility).toBeCloseTo(Number(evaluate(volatility, at)), 14)
    names.forEach((name, i) => {
      const slope = Number(derivative(parse(volatility), name, { simplify: false }).evaluate(at))
      expect(ours.marginal?.[i]).toBeCloseTo(slope, 14)
    })
  },
)
