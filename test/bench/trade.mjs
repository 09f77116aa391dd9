// node test/bench/trade.mjs: what a key typed into a list of trades costs the engine: one pass at the new weights with its decomposition, the
// first-order estimate beside it and the sums of its groups, against one pass of the same block. Runs take turns, so that a noisy
// machine slows all alike. A frame is 16 ms; no covariance is formed.
import { createRequire } from 'node:module'

const require = createRequire(import.meta.url)
require('./typescript.cjs')
const {
  courseOf,
  decompose,
  financed,
  firstOrder,
  loweringTrades,
  removals,
  returnsModel,
} = require('../../src/core/index.ts')

const T = 1260
const GROUPS = 12
const NEEDED = { 500: 16, 5000: 100 }
const median = (values) => values.toSorted((a, b) => a - b)[values.length >> 1]
const round = (value) => Number(value.toPrecision(4))
const print = (row) => console.log(JSON.stringify(row))

let state = 1
const uniform = () => (state = (state * 16807) % 2147483647) / 2147483647 - 0.5

function timed(work) {
  const start = performance.now()
  work()
  return performance.now() - start
}

for (const n of [500, 5000]) {
  const returns = Float64Array.from({ length: T * n }, () => 0.04 * uniform())
  const weights = Float64Array.from({ length: n }, () => (0.5 + uniform()) / n)
  const model = returnsModel(returns, T, n)
  const groupOf = Int32Array.from({ length: n }, (_, i) => i % GROUPS)
  const before = decompose(model, weights)
  const marginals = new Float64Array(n)

  function typing() {
    const wanted = new Float64Array(n)
    wanted[7] = 0.01
    const { changes } = financed(weights, wanted, { kind: 'pro rata' })
    const after = decompose(
      model,
      weights.map((weight, i) => weight + changes[i]),
    )
    const estimate = firstOrder(before, after)
    const sums = new Float64Array(3 * GROUPS)
    for (let i = 0; i < n; i++) {
      sums[groupOf[i]] += after.weights[i]
      sums[GROUPS + groupOf[i]] += after.contribution[i]
      sums[2 * GROUPS + groupOf[i]] += estimate.contribution[i]
    }
    return sums
  }

  const unit = new Float64Array(n)
  unit[7] = 1
  const rows = {
    'one pass': () => model.apply(weights, marginals),
    typing,
    'course of one position, 60 points': () => {
      const course = courseOf(model, weights, unit)
      for (let k = 0; k < 60; k++) course.volatilityAt((k - 30) / 1000)
    },
    'every position removed': () => removals(model, weights, { kind: 'cash' }),
    'trades that lower risk': () => loweringTrades(model, weights, { kind: 'cash' }, 'no shorting'),
  }
  const times = Object.fromEntries(Object.keys(rows).map((name) => [name, []]))
  const repeats = Math.max(5, Math.round(10000 / n))
  for (let turn = 0; turn < 31; turn++)
    for (const [name, work] of Object.entries(rows))
      times[name].push(median(Array.from({ length: repeats }, () => timed(work))))
  const medians = Object.fromEntries(Object.entries(times).map(([name, values]) => [name, median(values)]))
  for (const [name, median_ms] of Object.entries(medians)) print({ name, n, T, median_ms: round(median_ms) })
  print({
    ratio: 'typing to one pass',
    n,
    T,
    ratio_of_medians: round(medians.typing / medians['one pass']),
    needed_ms: NEEDED[n],
    met: medians.typing < NEEDED[n],
  })
}
