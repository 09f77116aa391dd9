// node test/bench/sampling-error.mjs: what error bands and the bootstrap cost beside one decomposition of the same block.
// Runs take turns, so that a noisy machine slows all alike.
import { createRequire } from 'node:module'

const require = createRequire(import.meta.url)
require('./typescript.cjs')
const {
  bootstrap,
  decompose,
  returnsModel,
  shareDifferences,
  standardErrors,
} = require('../../src/core/index.ts')

const T = 1260
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

for (const n of [100, 500, 1000, 5000]) {
  const returns = Float64Array.from({ length: T * n }, () => 0.04 * uniform())
  const weights = Float64Array.from({ length: n }, uniform)
  const sample = returnsModel(returns, T, n)
  const exponential = returnsModel(returns, T, n, { kind: 'exponential', decay: 0.97 })
  // ranks next to each other
  const pairs = Int32Array.from({ length: 2 * n - 2 }, (_, k) => (k >> 1) + (k & 1))

  const quick = {
    decomposition: () => decompose(sample, weights),
    'standard errors': () => standardErrors(sample, weights),
    'standard errors, exponential weights': () => standardErrors(exponential, weights),
  }
  const slow = {
    'standard errors, 5 lags': () => standardErrors(sample, weights, 5),
    'errors of differences, n - 1 pairs': () => shareDifferences(sample, weights, pairs),
    'bootstrap, 2000 replicates': () => {
      for (const done of bootstrap(sample, weights, { replicates: 2000, seed: 1, blockLength: 1 })) void done
    },
  }
  const medians = {}
  for (const [rows, turns, repeats] of [
    [quick, 31, Math.max(5, Math.round(10000 / n))],
    [slow, 3, 1],
  ]) {
    const times = Object.fromEntries(Object.keys(rows).map((name) => [name, []]))
    for (let turn = 0; turn < turns; turn++) {
      for (const [name, work] of Object.entries(rows)) {
        times[name].push(median(Array.from({ length: repeats }, () => timed(work))))
      }
    }
    for (const [name, values] of Object.entries(times)) {
      medians[name] = median(values)
      print({ name, n, T, median_ms: round(medians[name]) })
    }
  }
  print({
    ratio: 'standard errors to one decomposition',
    n,
    T,
    equal: round(medians['standard errors'] / medians.decomposition),
    exponential: round(medians['standard errors, exponential weights'] / medians.decomposition),
  })
}
