// node test/bench/budget.mjs: what weights for risk budgets and of least variance cost beside one covariance matrix of the same block, ours and numpy's.
// Runs take turns, so that a noisy machine slows all alike.
import { createRequire } from 'node:module'
import { numpy } from './numpy.mjs'

const require = createRequire(import.meta.url)
require('./typescript.cjs')
const {
  covariance,
  inOneGo,
  leastVariance,
  returnsModel,
  riskBudgetWeights,
} = require('../../src/core/index.ts')

const T = 1260
const print = (row) => console.log(JSON.stringify(row))
const median = (values) => values.toSorted((a, b) => a - b)[values.length >> 1]
const round = (value, digits = 3) => Number(value.toPrecision(digits))

let state = 1
const uniform = () => (state = (state * 16807) % 2147483647) / 2147483647 - 0.5

/** Returns of one market and of their own, loadings about `loading`, volatilities within a factor of ten. */
function block(n, loading) {
  const scales = Float64Array.from({ length: n }, () => 0.02 * 10 ** uniform())
  const loadings = Float64Array.from({ length: n }, () => loading + uniform())
  const returns = new Float64Array(T * n)
  for (let t = 0, k = 0; t < T; t++) {
    const market = uniform()
    for (let i = 0; i < n; i++) returns[k++] = scales[i] * (loadings[i] * market + uniform())
  }
  return returnsModel(returns, T, n)
}

function budgets(n, decades) {
  const raw = Float64Array.from({ length: n }, () => 10 ** (decades * uniform()))
  const total = raw.reduce((a, b) => a + b)
  return raw.map((b) => b / total)
}

function timed(work) {
  const start = performance.now()
  const result = work()
  return { ms: performance.now() - start, result }
}

const reference = await numpy('decomposition.py')
print({ node: process.version, numpy: reference?.version ?? 'none: no ratios', T })

for (const [n, turns] of [
  [500, 15],
  [5000, 3],
]) {
  const shares = block(n, 1)
  const mixed = block(n, 0)
  const within = (lower, upper) => ({
    lower: new Float64Array(n).fill(lower),
    upper: new Float64Array(n).fill(upper),
    sum: 1,
  })
  const [equal, uneven] = [budgets(n, 0), budgets(n, 4)]
  const runs = {
    'equal risk contribution': () => inOneGo(riskBudgetWeights(shares, equal)),
    'equal risk contribution, loadings of both signs': () => inOneGo(riskBudgetWeights(mixed, equal)),
    'risk budgets over four decades': () => inOneGo(riskBudgetWeights(shares, uneven)),
    'least variance, 0 to 1': () => inOneGo(leastVariance(shares, within(0, 1))),
    ...(n === 500 && {
      'least variance, -2% to 2%': () => inOneGo(leastVariance(shares, within(-0.02, 0.02))),
      covariance: () => covariance(shares),
    }),
  }
  const times = Object.fromEntries(Object.keys(runs).map((name) => [name, []]))
  const results = {}
  const theirs = []
  // compilers finish in the background
  if (n === 500) for (const run of Object.values(runs)) for (let k = 0; k < 3; k++) run()
  for (let turn = 0; turn < turns; turn++) {
    for (const [name, run] of Object.entries(runs)) {
      const { ms, result } = timed(run)
      times[name].push(ms)
      results[name] = result
    }
    if (reference && n === 500) theirs.push(...(await reference.time('numpy covariance', n, T, 1)))
  }
  for (const [name, values] of Object.entries(times)) {
    const { residual, iterations, passes, converged } = results[name]
    print({
      name,
      n,
      median_ms: round(median(values)),
      ...(converged !== undefined && { converged, residual: round(residual), iterations, passes }),
      ...(n === 500 && { to_covariance: round(median(values) / median(times.covariance)) }),
      ...(theirs.length && { to_numpy_covariance: round(median(values) / median(theirs)) }),
    })
  }
}
reference?.close()
